//! The plots: what is drawn, apart from where it is drawn.
//!
//! Every plot is one function over any plotters back end, so the canvas of the
//! page and the SVG of an export show the same. Three rules hold throughout:
//!
//! - A drawing area is measured in sixteenths of a CSS pixel ([`UNITS`]), because
//!   plotters counts in whole units and whole pixels make stair-stepped curves.
//! - Every value is checked and every range is made finite and wide enough before
//!   anything is drawn, so no finite input can hang or panic.
//! - Colour never carries a meaning alone, and each plot has a description in
//!   words that states the finding with its numbers.
//!
//! | plot | data | draw | SVG | words |
//! | --- | --- | --- | --- | --- |
//! | coherency eigenvalues | [`EigenvaluePlot`] | [`draw_eigenvalues`] | [`eigenvalues_svg`] | [`eigenvalues_description`] |
//! | Poincaré sphere | [`SpherePlot`] | [`draw_sphere`] | [`sphere_svg`] | [`sphere_description`] |
//! | polarization ellipses | [`EllipsesPlot`] | [`draw_ellipses`] | [`ellipses_svg`] | [`ellipses_description`] |
//! | curves over one axis | [`CurvesPlot`] | [`draw_curves`] | [`curves_svg`] | [`curves_description`] |
//!
//! On a canvas each is drawn by [`on_canvas`].

#[macro_use]
mod delegate;

mod canvas;
mod curves;
mod eigenvalues;
mod ellipses;
mod number;
mod pen;
mod sphere;
mod surface;
mod svg;
mod theme;
mod ticks;

pub use canvas::{Canvas, on_canvas};
pub use curves::{
    Curve, CurvesPlot, Named, curves_description, curves_height, curves_svg, draw_curves,
};
pub use eigenvalues::{
    EigenvaluePlot, draw_eigenvalues, eigenvalues_description, eigenvalues_height, eigenvalues_svg,
};
pub use ellipses::{
    EllipsePair, EllipsesPlot, draw_ellipses, ellipses_description, ellipses_height, ellipses_svg,
};
pub use sphere::{
    SphereMark, SpherePlot, View, draw_sphere, sphere_description, sphere_height, sphere_marks,
    sphere_svg,
};
pub use surface::{Surface, UNITS};
pub use theme::{Rgb, Theme};
