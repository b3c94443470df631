//! The plots on a canvas of the page.

use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, IntoDrawingArea};
use plotters_backend::text_anchor::HPos;
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind,
};
use plotters_canvas::CanvasBackend;
use web_sys::wasm_bindgen::JsCast;
use web_sys::{CanvasRenderingContext2d, HtmlCanvasElement};

use super::surface::{Surface, UNITS};
use crate::error::{Error, Result};

/// Sizes the canvas for its surface and draws on it.
///
/// The canvas gets `width × ratio` by `height × ratio` pixels; its size on the page
/// is left to the style sheet. No element is made and no style is set.
///
/// # Errors
///
/// `plot-size` as [`Surface::in_units`]; `no-canvas` when the browser gives no
/// drawing context; what `draw` returns.
pub fn on_canvas(
    canvas: &HtmlCanvasElement,
    surface: &Surface,
    draw: impl FnOnce(&DrawingArea<Canvas, Shift>) -> Result<()>,
) -> Result<()> {
    let size = surface.in_units()?;
    let (width, height) = surface.in_device_pixels()?;
    let missing = || Error::new("no-canvas", "The browser gives no canvas to draw on.");
    let context: CanvasRenderingContext2d = canvas
        .get_context("2d")
        .ok()
        .flatten()
        .and_then(|context| context.dyn_into().ok())
        .ok_or_else(missing)?;
    let inner = CanvasBackend::with_canvas_object(canvas.clone()).ok_or_else(missing)?;
    // Also clears the canvas and whatever state an earlier drawing left.
    canvas.set_width(width);
    canvas.set_height(height);
    let scale = (
        f64::from(width) / f64::from(size.0),
        f64::from(height) / f64::from(size.1),
    );
    let backend = Canvas(
        inner,
        Context {
            context,
            size,
            scale,
        },
    );
    backend.1.scale(1.0);
    draw(&backend.into_drawing_area())
}

/// A back end that counts in sixteenths of a CSS pixel over plotters' canvas.
///
/// Text is set and measured by the canvas itself. The library's way of measuring
/// adds an element with a style attribute to the page, which its policy forbids.
pub struct Canvas(CanvasBackend, Context);

struct Context {
    context: CanvasRenderingContext2d,
    size: (u32, u32),
    scale: (f64, f64),
}

impl Context {
    /// Lets one unit of the context be `units` of ours.
    fn scale(&self, units: f64) {
        let (x, y) = (self.scale.0 * units, self.scale.1 * units);
        // Fails for no finite numbers.
        let _ = self.context.set_transform(x, 0.0, 0.0, y, 0.0, 0.0);
    }

    fn set_font<S: BackendTextStyle>(&self, style: &S) {
        self.context.set_font(&format!(
            "{} {}px {}",
            style.style().as_str(),
            style.size() / UNITS,
            style.family().as_str()
        ));
    }
}

impl DrawingBackend for Canvas {
    type ErrorType = <CanvasBackend as DrawingBackend>::ErrorType;

    delegate_shapes!();

    fn get_size(&self) -> (u32, u32) {
        self.1.size
    }

    fn draw_text<S: BackendTextStyle>(
        &mut self,
        text: &str,
        style: &S,
        at: BackendCoord,
    ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
        let Context { context, .. } = &self.1;
        let BackendColor {
            rgb: (r, g, b),
            alpha,
        } = style.color();
        self.1.set_font(style);
        context.set_fill_style_str(&format!("rgba({r},{g},{b},{alpha})"));
        context.set_text_baseline("alphabetic");
        context.set_text_align(match style.anchor().h_pos {
            HPos::Left => "left",
            HPos::Right => "right",
            HPos::Center => "center",
        });
        // Centred on small letters, as the SVG back end does it with 0.5ex.
        let baseline = f64::from(at.1) + 0.265 * style.size();
        self.1.scale(UNITS);
        let drawn = context.fill_text(text, f64::from(at.0) / UNITS, baseline / UNITS);
        self.1.scale(1.0);
        // A text that the browser can't set leaves the plot complete but for it.
        drawn.or(Ok(()))
    }

    fn estimate_text_size<S: BackendTextStyle>(
        &self,
        text: &str,
        style: &S,
    ) -> std::result::Result<(u32, u32), DrawingErrorKind<Self::ErrorType>> {
        self.1.set_font(style);
        let width = self
            .1
            .context
            .measure_text(text)
            .map_or_else(|_| super::pen::guessed_width(text), |m| m.width());
        Ok((
            (width * UNITS).ceil() as u32,
            (style.size() * 1.2).ceil() as u32,
        ))
    }
}
