//! The plots as SVG text.

use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, IntoDrawingArea};
use plotters::prelude::SVGBackend;
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind,
    FontFamily, FontStyle, FontTransform, text_anchor::Pos,
};

use super::pen::guessed_width;
use super::surface::Surface;
use crate::error::{Error, Result};

/// What `draw` draws, as a well-formed SVG document with a title and a description.
pub(super) fn to_svg(
    surface: &Surface,
    title: &str,
    description: &str,
    draw: impl FnOnce(&DrawingArea<Svg<'_>, Shift>) -> Result<()>,
) -> Result<String> {
    let size = surface.in_units()?;
    let mut buffer = String::new();
    {
        let area = Svg(SVGBackend::with_string(&mut buffer, size)).into_drawing_area();
        draw(&area)?;
        area.present()
            .map_err(|e| Error::new("drawing-failed", format!("No SVG was made: {e}.")))?;
    }
    // The library's opening tag knows neither the size on the page nor a title.
    let body = buffer.split_once('\n').map_or("", |(_, body)| body);
    Ok(format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" role=\"img\" \
         width=\"{}\" height=\"{}\" viewBox=\"0 0 {} {}\">\n\
         <title>{}</title>\n<desc>{}</desc>\n<metadata>Halfshade {}</metadata>\n{body}",
        surface.width,
        surface.height,
        size.0,
        size.1,
        escaped(title),
        escaped(description),
        env!("CARGO_PKG_VERSION"),
    ))
}

/// The library's SVG back end, with text of the size that was asked for.
pub(super) struct Svg<'a>(SVGBackend<'a>);

impl DrawingBackend for Svg<'_> {
    type ErrorType = std::io::Error;

    delegate_shapes!();

    fn get_size(&self) -> (u32, u32) {
        self.0.get_size()
    }

    fn draw_text<S: BackendTextStyle>(
        &mut self,
        text: &str,
        style: &S,
        at: BackendCoord,
    ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
        self.0
            .draw_text(&legal(text), &FullSize::from_style(style), at)
    }

    fn estimate_text_size<S: BackendTextStyle>(
        &self,
        text: &str,
        style: &S,
    ) -> std::result::Result<(u32, u32), DrawingErrorKind<Self::ErrorType>> {
        let size = style.size();
        Ok((
            (guessed_width(text) * size).round() as u32,
            (size * 1.2).round() as u32,
        ))
    }
}

/// A text style that undoes the back end's division of every size by 1.24.
struct FullSize<'a, S> {
    style: &'a S,
}

impl<'a, S: BackendTextStyle> FullSize<'a, S> {
    fn from_style(style: &'a S) -> Self {
        Self { style }
    }
}

impl<S: BackendTextStyle> BackendTextStyle for FullSize<'_, S> {
    type FontError = S::FontError;

    fn color(&self) -> BackendColor {
        self.style.color()
    }

    fn size(&self) -> f64 {
        self.style.size() * 1.24
    }

    fn transform(&self) -> FontTransform {
        self.style.transform()
    }

    fn style(&self) -> FontStyle {
        self.style.style()
    }

    fn anchor(&self) -> Pos {
        self.style.anchor()
    }

    fn family(&self) -> FontFamily<'_> {
        self.style.family()
    }

    fn layout_box(
        &self,
        text: &str,
    ) -> std::result::Result<((i32, i32), (i32, i32)), Self::FontError> {
        self.style.layout_box(text)
    }

    fn draw<E, F: FnMut(i32, i32, BackendColor) -> std::result::Result<(), E>>(
        &self,
        text: &str,
        at: (i32, i32),
        draw: F,
    ) -> std::result::Result<std::result::Result<(), E>, Self::FontError> {
        self.style.draw(text, at, draw)
    }
}

fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in legal(text).chars() {
        match c {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            other => out.push(other),
        }
    }
    out
}

/// The text without the characters that XML 1.0 forbids.
fn legal(text: &str) -> String {
    text.chars()
        .map(|c| match c {
            '\t' | '\n' | '\r' => ' ',
            '\0'..='\u{1f}' | '\u{fffe}' | '\u{ffff}' => '\u{fffd}',
            other => other,
        })
        .collect()
}
