//! Curves over a common axis, with levels across and places along it.

use plotters::coord::Shift;
use plotters::drawing::DrawingArea;
use plotters_backend::DrawingBackend;

use super::number::significant;
use super::pen::{Align, Pen, Point, crisp, faint, ink};
use super::surface::Surface;
use super::svg::to_svg;
use super::theme::Theme;
use super::ticks::{Scale, ticks};
use crate::error::{Error, Result};

/// Curves in one frame.
#[derive(Debug, Clone, PartialEq)]
pub struct CurvesPlot {
    /// What stands along, with its unit.
    pub along: String,
    /// What stands upwards, with its unit.
    pub upwards: String,
    /// At most eight, each with its own dashes.
    pub curves: Vec<Curve>,
    /// Values across the whole frame, each with its name.
    pub levels: Vec<Named>,
    /// Places along the axis, each with its name.
    pub places: Vec<Named>,
}

/// One curve.
#[derive(Debug, Clone, PartialEq)]
pub struct Curve {
    /// Its name; empty where there is only one.
    pub name: String,
    /// From left to right.
    pub points: Vec<[f64; 2]>,
    /// Dots and no line: what was measured.
    pub is_dots: bool,
}

/// A number with a name.
#[derive(Debug, Clone, PartialEq)]
pub struct Named {
    /// Beside its line.
    pub name: String,
    /// On the axis.
    pub value: f64,
}

/// More curves can't be told apart.
const MOST_CURVES: usize = 8;
/// More points than pixels help nobody.
const MOST_POINTS: usize = 20_000;
/// Beyond this, spans could overflow.
const LARGEST: f64 = 1e290;
const NARROW: f64 = 480.0;

/// Dash and gap of each curve; the first is whole.
const DASHES: [(f64, f64); MOST_CURVES] = [
    (0.0, 0.0),
    (7.0, 4.0),
    (2.0, 3.0),
    (12.0, 4.0),
    (4.0, 4.0),
    (9.0, 2.0),
    (2.0, 6.0),
    (14.0, 7.0),
];

/// Draws the curves.
///
/// # Errors
///
/// `not-finite` for a number that is not finite, `too-many` for more curves or points than
/// can be told apart, `nothing-to-draw` without a point, `plot-size` for an area that is too
/// small, `drawing-failed` from the back end.
pub fn draw_curves<DB: DrawingBackend>(
    area: &DrawingArea<DB, Shift>,
    plot: &CurvesPlot,
    theme: &Theme,
) -> Result<()> {
    let (along, upwards) = ranges(plot)?;
    let pen = Pen::new(area)?;
    pen.ground(theme.background)?;
    let layout = Layout::new(&pen, plot, along, upwards)?;
    draw_axes(&pen, &layout, plot, theme)?;
    for (k, curve) in plot.curves.iter().enumerate() {
        let points: Vec<Point> = curve
            .points
            .iter()
            .map(|&[x, y]| (layout.along.at(x), layout.upwards.at(y)))
            .collect();
        if curve.is_dots {
            for point in points {
                pen.disc(point, 2.6, ink(theme.ink))?;
            }
        } else if k == 0 {
            pen.line(&points, ink(theme.accent), 2.0)?;
        } else {
            pen.dashed(&points, DASHES[k % MOST_CURVES], ink(theme.ink), 1.5)?;
        }
    }
    draw_legend(&pen, &layout, plot, theme)
}

/// The curves as an SVG document.
///
/// # Errors
///
/// As [`draw_curves`], and `plot-size` as [`Surface::in_units`].
pub fn curves_svg(
    plot: &CurvesPlot,
    surface: &Surface,
    theme: &Theme,
    title: &str,
    description: &str,
) -> Result<String> {
    to_svg(surface, title, description, |area| {
        draw_curves(area, plot, theme)
    })
}

/// A fitting height for a width, both in CSS pixels.
pub fn curves_height(width: f64) -> f64 {
    (0.5 * width).clamp(200.0, 320.0)
}

/// What the plot shows, in words.
///
/// # Errors
///
/// As [`draw_curves`].
pub fn curves_description(plot: &CurvesPlot) -> Result<String> {
    ranges(plot)?;
    let mut sentences = vec![format!("{} against {}.", plot.upwards, plot.along)];
    for curve in &plot.curves {
        let least = curve
            .points
            .iter()
            .min_by(|one, other| one[1].total_cmp(&other[1]));
        let most = curve
            .points
            .iter()
            .max_by(|one, other| one[1].total_cmp(&other[1]));
        if let (Some(least), Some(most)) = (least, most) {
            let name = if curve.name.is_empty() {
                "The curve".to_owned()
            } else {
                format!("“{}”", curve.name)
            };
            sentences.push(format!(
                "{name} is least at {} with {}, and largest at {} with {}.",
                significant(least[0], 4),
                significant(least[1], 4),
                significant(most[0], 4),
                significant(most[1], 4)
            ));
        }
    }
    for named in plot.places.iter().chain(&plot.levels) {
        sentences.push(format!("{}: {}.", named.name, significant(named.value, 4)));
    }
    Ok(sentences.join(" "))
}

type Range = (f64, f64);

/// The ends of both axes, a little beyond the numbers and never on one spot.
fn ranges(plot: &CurvesPlot) -> Result<(Range, Range)> {
    let points: usize = plot.curves.iter().map(|curve| curve.points.len()).sum();
    if plot.curves.len() > MOST_CURVES || points > MOST_POINTS {
        return Err(Error::new(
            "too-many",
            format!("At most {MOST_CURVES} curves with {MOST_POINTS} points can be drawn."),
        )
        .at_field("curves"));
    }
    let mut along = Vec::with_capacity(points);
    let mut upwards = Vec::with_capacity(points);
    for (k, curve) in plot.curves.iter().enumerate() {
        for &[x, y] in &curve.points {
            along.push(checked(x, &format!("curves[{k}].points"))?);
            upwards.push(checked(y, &format!("curves[{k}].points"))?);
        }
    }
    if along.is_empty() {
        return Err(Error::new("nothing-to-draw", "There is no point to draw.").at_field("curves"));
    }
    for named in &plot.places {
        along.push(checked(named.value, "places")?);
    }
    for named in &plot.levels {
        upwards.push(checked(named.value, "levels")?);
    }
    let (low, high) = ends(&along);
    Ok((spread(low, high, 0.0), {
        let (low, high) = ends(&upwards);
        spread(low, high, 0.06)
    }))
}

fn checked(value: f64, field: &str) -> Result<f64> {
    if value.is_finite() {
        Ok(value.clamp(-LARGEST, LARGEST))
    } else {
        Err(Error::new("not-finite", "Only finite numbers can be drawn.").at_field(field))
    }
}

fn ends(values: &[f64]) -> Range {
    values
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &value| {
            (low.min(value), high.max(value))
        })
}

fn spread(low: f64, high: f64, share: f64) -> Range {
    let least = 1e-9 * low.abs().max(high.abs()).max(1e-280);
    let span = high - low;
    if span > least {
        (low - share * span, high + share * span)
    } else {
        let half = 0.5 * low.abs().max(high.abs()).max(1e-3);
        (low - half, high + half)
    }
}

struct Layout {
    font: f64,
    along: Scale,
    upwards: Scale,
    legend: f64,
}

impl Layout {
    fn new(pen: &Pen<'_>, plot: &CurvesPlot, along: Range, upwards: Range) -> Result<Self> {
        let font = if pen.width < NARROW { 12.0 } else { 13.0 };
        let legend = if plot.curves.len() > 1 { 24.0 } else { 4.0 };
        let bottom = crisp(pen.height - 46.0);
        let top = crisp(legend + 22.0);
        let mut scale = Scale {
            low: upwards.0,
            high: upwards.1,
            from: bottom,
            to: top,
        };
        let mut widest = 0.0_f64;
        for (_, label) in vertical_ticks(&scale)? {
            widest = widest.max(pen.text_width(&label, font)?);
        }
        scale.from = bottom;
        Ok(Self {
            font,
            along: Scale {
                low: along.0,
                high: along.1,
                from: crisp(14.0 + widest),
                to: crisp(pen.width - 14.0),
            },
            upwards: scale,
            legend,
        })
    }
}

/// The ticks of an axis that goes upwards: as many as lines of text have room.
fn vertical_ticks(scale: &Scale) -> Result<Vec<(f64, String)>> {
    let flat = Scale {
        low: scale.low,
        high: scale.high,
        from: 0.0,
        to: (scale.from - scale.to).abs(),
    };
    ticks(&flat, 0.0, |_| Ok(16.0))
}

fn draw_axes(pen: &Pen<'_>, layout: &Layout, plot: &CurvesPlot, theme: &Theme) -> Result<()> {
    let (mute, line) = (ink(theme.mute), ink(theme.line));
    let (left, right) = (layout.along.from, layout.along.to);
    let (bottom, top) = (layout.upwards.from, layout.upwards.to);
    for (value, label) in vertical_ticks(&layout.upwards)? {
        let y = crisp(layout.upwards.at(value));
        pen.line(&[(left, y), (right, y)], faint(theme.line, 0.6), 1.0)?;
        let width = pen.text_width(&label, layout.font)?;
        pen.text(
            &label,
            (left - 6.0 - width, y),
            layout.font,
            mute,
            Align::Start,
        )?;
    }
    for (value, label) in ticks(&layout.along, 8.0, |text| pen.text_width(text, layout.font))? {
        let x = crisp(layout.along.at(value));
        pen.line(&[(x, bottom), (x, bottom + 5.0)], mute, 1.0)?;
        let at = (x, bottom + 7.0 + layout.font * 0.75);
        pen.text(&label, at, layout.font, mute, Align::Middle)?;
    }
    pen.line(&[(left, top), (left, bottom), (right, bottom)], line, 1.0)?;
    pen.text(
        &plot.along,
        ((left + right) / 2.0, pen.height - 10.0),
        layout.font,
        mute,
        Align::Middle,
    )?;
    pen.text(
        &plot.upwards,
        (4.0, layout.legend + 8.0),
        layout.font,
        mute,
        Align::Start,
    )?;
    for named in &plot.levels {
        let y = crisp(layout.upwards.at(named.value));
        pen.dashed(&[(left, y), (right, y)], (5.0, 4.0), mute, 1.2)?;
        let width = pen.text_width(&named.name, layout.font)?;
        let at = ((right - width - 4.0).max(left), y - layout.font * 0.7);
        pen.text(&named.name, at, layout.font, ink(theme.ink), Align::Start)?;
    }
    for named in &plot.places {
        let x = crisp(layout.along.at(named.value));
        pen.dashed(&[(x, bottom), (x, top)], (2.0, 3.0), ink(theme.ink), 1.2)?;
        let width = pen.text_width(&named.name, layout.font)?;
        let start = (x + 4.0).min(right - width).max(left);
        let at = (start, top + layout.font * 0.7);
        pen.text(&named.name, at, layout.font, ink(theme.ink), Align::Start)?;
    }
    Ok(())
}

fn draw_legend(pen: &Pen<'_>, layout: &Layout, plot: &CurvesPlot, theme: &Theme) -> Result<()> {
    if plot.curves.len() < 2 {
        return Ok(());
    }
    let mut x = 6.0;
    for (k, curve) in plot.curves.iter().enumerate() {
        let width = pen.text_width(&curve.name, layout.font)?;
        if x + 34.0 + width > pen.width {
            break;
        }
        let y = 12.0;
        let ends = [(x, y), (x + 28.0, y)];
        if curve.is_dots {
            pen.disc((x + 14.0, y), 2.6, ink(theme.ink))?;
        } else if k == 0 {
            pen.line(&ends, ink(theme.accent), 2.0)?;
        } else {
            pen.dashed(&ends, DASHES[k % MOST_CURVES], ink(theme.ink), 1.5)?;
        }
        pen.text(
            &curve.name,
            (x + 34.0, y),
            layout.font,
            ink(theme.ink),
            Align::Start,
        )?;
        x += 34.0 + width + 16.0;
    }
    Ok(())
}
