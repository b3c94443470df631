//! A pen in CSS pixels over a plotters drawing area.
//!
//! Everything that the plots draw goes through here, so this is the one place
//! where pixels become units and where a back end's error becomes ours.

use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, DrawingAreaErrorKind};
use plotters::element::{Circle, DashedPathElement, PathElement, Polygon, Rectangle};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{Color, FontDesc, FontFamily, FontStyle, RGBAColor, ShapeStyle, TextStyle};
use plotters_backend::DrawingBackend;

use super::surface::UNITS;
use super::theme::Rgb;
use crate::error::{Error, Result};

/// A place, CSS pixels from the upper left corner.
pub(super) type Point = (f64, f64);

/// The fonts of all text.
pub(super) const FONTS: &str = "system-ui, sans-serif";

/// How a text lies about its place.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Align {
    Start,
    Middle,
}

/// What a pen asks of a drawing area, in units. Behind this the plots don't depend on
/// the back end, so each is compiled once and not once a back end.
trait Area {
    fn size(&self) -> (u32, u32);
    fn ground(&self, colour: RGBAColor) -> Result<()>;
    fn path(&self, points: Vec<(i32, i32)>, style: ShapeStyle) -> Result<()>;
    fn dashes(&self, points: Vec<(i32, i32)>, dash: (i32, i32), style: ShapeStyle) -> Result<()>;
    fn polygon(&self, points: Vec<(i32, i32)>, style: ShapeStyle) -> Result<()>;
    fn rectangle(&self, corners: [(i32, i32); 2], style: ShapeStyle) -> Result<()>;
    fn circle(&self, centre: (i32, i32), radius: i32, style: ShapeStyle) -> Result<()>;
    fn text(&self, text: &str, style: &TextStyle, at: (i32, i32)) -> Result<()>;
    fn text_width(&self, text: &str, style: &TextStyle) -> Result<u32>;
}

impl<DB: DrawingBackend> Area for DrawingArea<DB, Shift> {
    fn size(&self) -> (u32, u32) {
        self.dim_in_pixel()
    }

    fn ground(&self, colour: RGBAColor) -> Result<()> {
        self.fill(&colour).map_err(failed)
    }

    fn path(&self, points: Vec<(i32, i32)>, style: ShapeStyle) -> Result<()> {
        self.draw(&PathElement::new(points, style)).map_err(failed)
    }

    fn dashes(&self, points: Vec<(i32, i32)>, dash: (i32, i32), style: ShapeStyle) -> Result<()> {
        self.draw(&DashedPathElement::new(points, dash.0, dash.1, style))
            .map_err(failed)
    }

    fn polygon(&self, points: Vec<(i32, i32)>, style: ShapeStyle) -> Result<()> {
        self.draw(&Polygon::new(points, style)).map_err(failed)
    }

    fn rectangle(&self, corners: [(i32, i32); 2], style: ShapeStyle) -> Result<()> {
        self.draw(&Rectangle::new(corners, style)).map_err(failed)
    }

    fn circle(&self, centre: (i32, i32), radius: i32, style: ShapeStyle) -> Result<()> {
        self.draw(&Circle::new(centre, radius, style))
            .map_err(failed)
    }

    fn text(&self, text: &str, style: &TextStyle, at: (i32, i32)) -> Result<()> {
        self.draw_text(text, style, at).map_err(failed)
    }

    fn text_width(&self, text: &str, style: &TextStyle) -> Result<u32> {
        let (width, _) = self.estimate_text_size(text, style).map_err(failed)?;
        Ok(width)
    }
}

pub(super) struct Pen<'a> {
    area: &'a dyn Area,
    pub width: f64,
    pub height: f64,
}

/// An opaque colour.
pub(super) fn ink(rgb: Rgb) -> RGBAColor {
    faint(rgb, 1.0)
}

/// A colour of which the ground shows through.
pub(super) fn faint((r, g, b): Rgb, alpha: f64) -> RGBAColor {
    RGBAColor(r, g, b, alpha)
}

/// The middle of the device pixel that a coordinate falls in, where a thin line is
/// sharp.
pub(super) fn crisp(v: f64) -> f64 {
    v.floor() + 0.5
}

impl<'a> Pen<'a> {
    pub(super) fn new<DB: DrawingBackend>(area: &'a DrawingArea<DB, Shift>) -> Result<Self> {
        let (width, height) = area.size();
        let (width, height) = (f64::from(width) / UNITS, f64::from(height) / UNITS);
        if width < 40.0 || height < 40.0 {
            return Err(Error::new(
                "plot-size",
                "A plot needs at least 40 pixels each way.",
            ));
        }
        Ok(Self {
            area,
            width,
            height,
        })
    }

    pub(super) fn ground(&self, rgb: Rgb) -> Result<()> {
        self.area.ground(ink(rgb))
    }

    pub(super) fn line(&self, points: &[Point], colour: RGBAColor, width: f64) -> Result<()> {
        if points.len() < 2 {
            return Ok(());
        }
        let points: Vec<_> = points.iter().map(|&p| units(p)).collect();
        self.area.path(points, stroke(colour, width))
    }

    /// A line of dashes, `dash` and `gap` in pixels.
    pub(super) fn dashed(
        &self,
        points: &[Point],
        (dash, gap): (f64, f64),
        colour: RGBAColor,
        width: f64,
    ) -> Result<()> {
        if points.len() < 2 {
            return Ok(());
        }
        let points: Vec<_> = points.iter().map(|&p| units(p)).collect();
        self.area
            .dashes(points, (length(dash), length(gap)), stroke(colour, width))
    }

    pub(super) fn fill(&self, points: &[Point], colour: RGBAColor) -> Result<()> {
        if points.len() < 3 {
            return Ok(());
        }
        let points: Vec<_> = points.iter().map(|&p| units(p)).collect();
        self.area.polygon(points, colour.filled())
    }

    pub(super) fn rectangle(&self, from: Point, to: Point, colour: RGBAColor) -> Result<()> {
        self.area
            .rectangle([units(from), units(to)], colour.filled())
    }

    pub(super) fn disc(&self, centre: Point, radius: f64, colour: RGBAColor) -> Result<()> {
        self.area
            .circle(units(centre), length(radius), colour.filled())
    }

    pub(super) fn ring(
        &self,
        centre: Point,
        radius: f64,
        colour: RGBAColor,
        width: f64,
    ) -> Result<()> {
        self.area
            .circle(units(centre), length(radius), stroke(colour, width))
    }

    /// One line of text; `at.1` is the middle of its capitals and digits.
    pub(super) fn text(
        &self,
        text: &str,
        at: Point,
        size: f64,
        colour: RGBAColor,
        align: Align,
    ) -> Result<()> {
        // The back ends centre on small letters, which are lower than capitals.
        let at = units((at.0, at.1 + 0.09 * size));
        let anchor = match align {
            Align::Start => HPos::Left,
            Align::Middle => HPos::Center,
        };
        let style = TextStyle::from(font(size))
            .color(&colour)
            .pos(Pos::new(anchor, VPos::Center));
        self.area.text(text, &style, at)
    }

    pub(super) fn text_width(&self, text: &str, size: f64) -> Result<f64> {
        let style = TextStyle::from(font(size));
        Ok(f64::from(self.area.text_width(text, &style)?) / UNITS)
    }
}

/// A guess of a text's width in units of its size, for back ends that can't measure.
///
/// Made for wide faces, so that a layout built on it has room with any.
pub(super) fn guessed_width(text: &str) -> f64 {
    text.chars()
        .map(|c| match c {
            '\u{300}'..='\u{36f}' => 0.0,
            ' ' | '.' | ',' | ':' | ';' | 'i' | 'j' | 'l' | 'I' | 'f' | 't' | 'r' | '(' | ')' => {
                0.36
            }
            '\u{b2}' | '\u{b3}' | '\u{b9}' | '\u{2070}'..='\u{209c}' => 0.42,
            'm' | 'w' | 'M' | 'W' | '%' => 0.95,
            '\u{2212}' | '+' | '±' | '×' | '÷' | '=' | 'A'..='Z' => 0.72,
            _ => 0.61,
        })
        .sum()
}

fn font(size: f64) -> FontDesc<'static> {
    FontDesc::new(FontFamily::Name(FONTS), size * UNITS, FontStyle::Normal)
}

fn stroke(colour: RGBAColor, width: f64) -> ShapeStyle {
    colour.stroke_width(length(width).unsigned_abs().max(1))
}

fn length(pixels: f64) -> i32 {
    (pixels * UNITS).round().clamp(0.0, FARTHEST) as i32
}

fn units((x, y): Point) -> (i32, i32) {
    let unit = |v: f64| (v * UNITS).round().clamp(-FARTHEST, FARTHEST) as i32;
    (unit(x), unit(y))
}

/// Far outside any surface, and far inside the integers that plotters counts with.
const FARTHEST: f64 = 1_048_576.0;

fn failed<E: std::error::Error + Send + Sync>(error: DrawingAreaErrorKind<E>) -> Error {
    Error::new(
        "drawing-failed",
        format!("The plot could not be drawn: {error}."),
    )
}
