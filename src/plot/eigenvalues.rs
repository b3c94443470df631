//! The coherency eigenvalues on one axis, the negative side marked.

use plotters::coord::Shift;
use plotters::drawing::DrawingArea;
use plotters_backend::DrawingBackend;

use super::number::{count, significant, with_error};
use super::pen::{Align, Pen, crisp, faint, ink};
use super::surface::Surface;
use super::svg::to_svg;
use super::theme::Theme;
use super::ticks::{Scale, ticks};
use crate::error::{Error, Result};

/// The four eigenvalues of `H / M00`, in descending order.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct EigenvaluePlot {
    /// λ1 to λ4, dimensionless.
    pub eigenvalues: [f64; 4],
    /// The standard error of each, if noise was stated; none is negative.
    pub standard_error: Option<[f64; 4]>,
}

/// Draws the eigenvalues.
///
/// The leading one gets an axis of its own, behind a break, where it is so far from
/// the others that these would fall on one spot. Bars are ±1 standard error.
///
/// # Errors
///
/// `not-finite` for a number that is not finite, `negative-error` for a negative
/// standard error, `plot-size` for an area that is too small, `drawing-failed` from
/// the back end.
pub fn draw_eigenvalues<DB: DrawingBackend>(
    area: &DrawingArea<DB, Shift>,
    plot: &EigenvaluePlot,
    theme: &Theme,
) -> Result<()> {
    let marks = marks(plot)?;
    let pen = Pen::new(area)?;
    pen.ground(theme.background)?;
    let layout = Layout::new(&pen, &marks)?;
    draw_ground(&pen, &layout, theme)?;
    draw_axes(&pen, &layout, theme, plot.standard_error.is_some())?;
    for mark in marks.iter().enumerate() {
        draw_mark(&pen, &layout, mark, theme)?;
    }
    Ok(())
}

/// The eigenvalues as an SVG document; errors as [`draw_eigenvalues`].
///
/// # Errors
///
/// As [`draw_eigenvalues`], and `plot-size` as [`Surface::in_units`].
pub fn eigenvalues_svg(
    plot: &EigenvaluePlot,
    surface: &Surface,
    theme: &Theme,
    title: &str,
    description: &str,
) -> Result<String> {
    to_svg(surface, title, description, |area| {
        draw_eigenvalues(area, plot, theme)
    })
}

/// A fitting height for a width, both in CSS pixels.
pub fn eigenvalues_height(width: f64) -> f64 {
    if width < NARROW { 168.0 } else { 184.0 }
}

/// Below this width the text is one size smaller.
const NARROW: f64 = 480.0;

/// What the plot shows, in words.
///
/// An eigenvalue counts as negative below −1e-12, the tolerance of a zero.
///
/// # Errors
///
/// `not-finite` and `negative-error` as [`draw_eigenvalues`].
pub fn eigenvalues_description(plot: &EigenvaluePlot) -> Result<String> {
    marks(plot)?;
    let values: Vec<String> = plot
        .eigenvalues
        .iter()
        .enumerate()
        .map(|(k, &value)| match plot.standard_error {
            Some(errors) => format!("λ{} = {}", k + 1, with_error(value, errors[k])),
            None => format!("λ{} = {}", k + 1, significant(value, 4)),
        })
        .collect();
    let errors = if plot.standard_error.is_some() {
        ", each with its standard error"
    } else {
        ""
    };
    let negative = plot.eigenvalues.iter().filter(|&&v| v < -1e-12).count();
    let smallest = (0..4)
        .min_by(|&a, &b| plot.eigenvalues[a].total_cmp(&plot.eigenvalues[b]))
        .unwrap_or(3);
    let value = plot.eigenvalues[smallest];
    let depth = plot
        .standard_error
        .map(|errors| -value / errors[smallest])
        .filter(|depth| depth.is_finite());
    let verb = if negative == 1 { "is" } else { "are" };
    let finding = match (negative, depth) {
        (0, _) => "None is negative.".to_owned(),
        (_, Some(depth)) => format!(
            "{} {verb} negative; the smallest lies {} standard errors below zero.",
            count(negative),
            significant(depth, 2)
        ),
        (_, None) => format!(
            "{} {verb} negative; the smallest is {}.",
            count(negative),
            significant(value, 4)
        ),
    };
    Ok(format!(
        "Coherency eigenvalues, as fractions of m00{errors}: {}. {finding}",
        values.join(", ")
    ))
}

/// One eigenvalue with the ends of its bar.
struct Mark {
    label: String,
    value: f64,
    low: f64,
    high: f64,
    has_bar: bool,
}

/// Beyond this, sums of a value and its error could overflow.
const LARGEST: f64 = 1e300;

/// Spans below this can't be divided by safely; they are drawn as one spot.
const SMALLEST: f64 = 1e-290;

fn marks(plot: &EigenvaluePlot) -> Result<[Mark; 4]> {
    for (k, value) in plot.eigenvalues.iter().enumerate() {
        if !value.is_finite() {
            return Err(not_finite(format!("eigenvalues[{k}]")));
        }
    }
    for (k, error) in plot.standard_error.iter().flatten().enumerate() {
        let field = format!("standardError[{k}]");
        if !error.is_finite() {
            return Err(not_finite(field));
        }
        if *error < 0.0 {
            return Err(
                Error::new("negative-error", "A standard error can't be negative.").at_field(field),
            );
        }
    }
    Ok(std::array::from_fn(|k| {
        let value = plot.eigenvalues[k].clamp(-LARGEST, LARGEST);
        let error = plot
            .standard_error
            .map_or(0.0, |errors| errors[k].min(LARGEST));
        Mark {
            label: ["λ₁", "λ₂", "λ₃", "λ₄"][k].to_owned(),
            value,
            low: value - error,
            high: value + error,
            has_bar: plot.standard_error.is_some(),
        }
    }))
}

fn not_finite(field: String) -> Error {
    Error::new("not-finite", "Only finite numbers can be drawn.").at_field(field)
}

struct Layout {
    font: f64,
    top: f64,
    axis: f64,
    rows: [f64; 4],
    main: Scale,
    /// The axis of the leading eigenvalue alone, where there is a break.
    leading: Option<Scale>,
    leader: usize,
}

impl Layout {
    fn new(pen: &Pen<'_>, marks: &[Mark; 4]) -> Result<Self> {
        let font = if pen.width < NARROW { 12.0 } else { 13.0 };
        let (top, axis) = (8.0, crisp(pen.height - 48.0));
        let (left, right) = (crisp(10.0), crisp(pen.width - 11.0));
        let leader = (0..4)
            .max_by(|&a, &b| marks[a].value.total_cmp(&marks[b].value))
            .unwrap_or(0);
        let others = |k: &usize| *k != leader;
        let (low, high) = extent(marks, (0..4).filter(others));
        let is_far = marks[leader].low > high
            && marks[leader].high - low > 6.0 * (high - low)
            && high - low > 1e-9 * marks[leader].value;

        let label = pen.text_width("λ₄", font + 1.0)?;
        let sign = pen.text_width(FORBIDDEN, font)? + 14.0;
        let split = left + 0.68 * (right - left);
        let (main, leading, rows) = if is_far {
            let main = zero_scale((low, high), (left, split), sign, label + 22.0);
            let rows = three_rows(leader, top + 2.0 * font, axis);
            let leading = own_scale(&marks[leader], (split + 34.0, right));
            (main, Some(leading), rows)
        } else {
            let range = extent(marks, 0..4);
            let main = zero_scale(range, (left, right), sign, label + 16.0);
            let gap = (axis - top - 2.0 * font) / 4.0;
            let rows = std::array::from_fn(|k| top + 2.0 * font + gap * (k as f64 + 0.45));
            (main, None, rows)
        };
        Ok(Self {
            font,
            top,
            axis,
            rows,
            main,
            leading,
            leader,
        })
    }

    fn scale(&self, k: usize) -> &Scale {
        match &self.leading {
            Some(scale) if k == self.leader => scale,
            _ => &self.main,
        }
    }
}

const FORBIDDEN: &str = "not realizable";

fn extent(marks: &[Mark; 4], which: impl Iterator<Item = usize>) -> (f64, f64) {
    which.fold((0.0, 0.0), |(low, high), k| {
        (marks[k].low.min(low), marks[k].high.max(high))
    })
}

/// The leading one in the middle row of its own panel, the others one under another.
fn three_rows(leader: usize, top: f64, axis: f64) -> [f64; 4] {
    let gap = (axis - top) / 3.0;
    let mut next = 0;
    std::array::from_fn(|k| {
        let row = if k == leader {
            1.0
        } else {
            next += 1;
            f64::from(next - 1)
        };
        top + gap * (row + 0.45)
    })
}

/// A scale for values about zero that leaves `negative` pixels at least on the
/// negative side and `label` pixels beyond the largest value.
fn zero_scale((low, high): (f64, f64), (from, to): (f64, f64), negative: f64, label: f64) -> Scale {
    let room = to - from;
    let margin = 10.0 + 0.06 * room;
    let (below, above) = (-low, high);
    let span = below + above;
    let least = negative.min(0.6 * room);
    let balanced = if span > SMALLEST {
        // Shares first, so that no product overflows.
        (above / span) * margin + (below / span) * (room - label)
    } else {
        least
    };
    let left = balanced.clamp(least, (0.72 * room).max(least));
    let right = room - left;
    // Value per pixel on each side; the larger one fits both.
    let per_pixel = (below / (left - margin).max(1.0)).max(above / (right - label).max(1.0));
    let per_pixel = if per_pixel > SMALLEST {
        per_pixel
    } else {
        1.0 / right
    };
    Scale {
        low: -per_pixel * left,
        high: per_pixel * right,
        from,
        to,
    }
}

fn own_scale(mark: &Mark, (from, to): (f64, f64)) -> Scale {
    let bar = mark.high - mark.value;
    let half = if bar > 0.0 {
        (2.4 * bar).max(1e-3 * mark.value.abs())
    } else {
        0.01 * mark.value.abs()
    };
    Scale {
        low: mark.value - half,
        high: mark.value + half,
        from,
        to,
    }
}

fn draw_ground(pen: &Pen<'_>, layout: &Layout, theme: &Theme) -> Result<()> {
    let (left, right) = (layout.main.from, layout.main.at(0.0));
    let (top, bottom) = (layout.top, layout.axis);
    pen.rectangle((left, top), (right, bottom), faint(theme.hatch, 0.25))?;
    // Lines x + y = c, cut to the rectangle.
    let mut c = left + top + 8.0;
    while c < right + bottom {
        let start = ((c - top).min(right), (c - right).max(top));
        let end = ((c - bottom).max(left), (c - left).min(bottom));
        pen.line(&[start, end], ink(theme.hatch), 1.0)?;
        c += 9.0;
    }
    pen.text(
        FORBIDDEN,
        (left + 7.0, top + layout.font),
        layout.font,
        ink(theme.mute),
        Align::Start,
    )?;
    let zero = crisp(right);
    pen.line(&[(zero, top), (zero, bottom)], ink(theme.ink), 1.4)
}

fn draw_axes(pen: &Pen<'_>, layout: &Layout, theme: &Theme, has_errors: bool) -> Result<()> {
    let mute = ink(theme.mute);
    let y = layout.axis;
    for scale in [Some(&layout.main), layout.leading.as_ref()]
        .into_iter()
        .flatten()
    {
        pen.line(&[(scale.from, y), (scale.to, y)], mute, 1.0)?;
        // Over the end of an axis, but not as far as a label of the next one.
        let reach = if layout.leading.is_some() { 11.0 } else { 9.0 };
        for (value, label) in ticks(scale, reach, |text| pen.text_width(text, layout.font))? {
            let x = crisp(scale.at(value));
            pen.line(&[(x, y), (x, y + 5.0)], mute, 1.0)?;
            let at = (x, y + 7.0 + layout.font * 0.75);
            pen.text(&label, at, layout.font, mute, Align::Middle)?;
        }
    }
    if let Some(leading) = &layout.leading {
        let middle = (layout.main.to + leading.from) / 2.0;
        for x in [middle - 8.0, middle] {
            pen.line(&[(x, y - 7.0), (x + 8.0, y + 7.0)], mute, 1.0)?;
        }
    }
    let name = "eigenvalue of H ÷ m00";
    let with_bars = format!("{name}, bars ±1 standard error");
    let fits = pen.text_width(&with_bars, layout.font)? < pen.width - 16.0;
    let title = if has_errors && fits { &with_bars } else { name };
    pen.text(
        title,
        (pen.width / 2.0, pen.height - 10.0),
        layout.font,
        mute,
        Align::Middle,
    )
}

fn draw_mark(
    pen: &Pen<'_>,
    layout: &Layout,
    (k, mark): (usize, &Mark),
    theme: &Theme,
) -> Result<()> {
    let accent = ink(theme.accent);
    let scale = layout.scale(k);
    let y = layout.rows[k];
    let (low, x, high) = (
        scale.at(mark.low),
        scale.at(mark.value),
        scale.at(mark.high),
    );
    if mark.has_bar {
        pen.line(&[(low, y), (high, y)], accent, 1.6)?;
        for end in [low, high] {
            pen.line(&[(end, y - 4.5), (end, y + 4.5)], accent, 1.6)?;
        }
    }
    pen.disc((x, y), 4.5, accent)?;

    let size = layout.font + 1.0;
    let width = pen.text_width(&mark.label, size)?;
    let zero = layout.main.at(0.0);
    let (before, after) = (low.min(x - 4.5) - 7.0 - width, high.max(x + 4.5) + 7.0);
    let is_main = scale.from == layout.main.from;
    let start = if after + width > pen.width - 2.0 {
        before
    } else if is_main && after < zero + 5.0 && after + width > zero - 5.0 {
        // Not across the line at zero: before the bar, or else beyond the line.
        if before > scale.from + 4.0 {
            before
        } else {
            zero + 6.0
        }
    } else {
        after
    };
    pen.text(
        &mark.label,
        (start.max(2.0), y),
        size,
        ink(theme.ink),
        Align::Start,
    )
}
