//! Polarization ellipses: states before and after.

use std::f64::consts::{PI, TAU};

use plotters::coord::Shift;
use plotters::drawing::DrawingArea;
use plotters_backend::DrawingBackend;

use super::number::fixed;
use super::pen::{Align, Pen, Point, faint, ink};
use super::surface::Surface;
use super::svg::to_svg;
use super::theme::Theme;
use crate::convention::Convention;
use crate::error::{Error, Result};

/// Pairs of states, usually the six standard inputs with what each becomes.
#[derive(Debug, Clone, PartialEq)]
pub struct EllipsesPlot {
    /// From left to right, then from top to bottom.
    pub states: Vec<EllipsePair>,
    /// In which the description gives its angles; the drawing shows space itself.
    pub convention: Convention,
}

/// A state before and after, as Stokes vectors in the canonical convention: angles
/// counter-clockwise from x and `S3 > 0` clockwise, for an observer who faces the
/// source. That is also how they are drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct EllipsePair {
    /// Name of the input, such as `+45°`.
    pub label: String,
    /// Stokes vector before, in any unit of intensity.
    pub input: [f64; 4],
    /// Stokes vector after, in any unit of intensity.
    pub output: [f64; 4],
}

/// Draws the pairs, in one row where there is room and in rows of three where not.
///
/// Every ellipse is equally large; the degree of polarization is the number under
/// the pair and the strength of the fill. An unpolarized output is a dotted circle.
///
/// # Errors
///
/// `not-finite` for a number that is not finite, `no-states` and `too-many-states`
/// (over 48), `plot-size` for an area that is too small, `drawing-failed` from the
/// back end.
pub fn draw_ellipses<DB: DrawingBackend>(
    area: &DrawingArea<DB, Shift>,
    plot: &EllipsesPlot,
    theme: &Theme,
) -> Result<()> {
    check(plot)?;
    let pen = Pen::new(area)?;
    pen.ground(theme.background)?;
    let columns = columns(pen.width).min(plot.states.len());
    let rows = plot.states.len().div_ceil(columns);
    let cell = (
        pen.width / columns as f64,
        (pen.height - FOOT) / rows as f64,
    );
    for (k, pair) in plot.states.iter().enumerate() {
        let corner = ((k % columns) as f64 * cell.0, (k / columns) as f64 * cell.1);
        draw_pair(&pen, corner, cell, pair, theme)?;
    }
    draw_foot(&pen, theme)
}

/// The ellipses as an SVG document.
///
/// # Errors
///
/// As [`draw_ellipses`], and `plot-size` as [`Surface::in_units`].
pub fn ellipses_svg(
    plot: &EllipsesPlot,
    surface: &Surface,
    theme: &Theme,
    title: &str,
    description: &str,
) -> Result<String> {
    to_svg(surface, title, description, |area| {
        draw_ellipses(area, plot, theme)
    })
}

/// A fitting height for six pairs at a width, both in CSS pixels.
pub fn ellipses_height(width: f64) -> f64 {
    let columns = columns(width);
    let rows = 6_usize.div_ceil(columns) as f64;
    rows * (2.0 * radius(width / columns as f64) + CAPTION) + FOOT
}

/// What the plot shows, in words.
///
/// # Errors
///
/// `not-finite`, `no-states` and `too-many-states` as [`draw_ellipses`].
pub fn ellipses_description(plot: &EllipsesPlot) -> Result<String> {
    check(plot)?;
    let pairs: Vec<String> = plot
        .states
        .iter()
        .map(|pair| {
            format!(
                "{} becomes {}",
                pair.label,
                in_words(&State::of(&pair.output), &plot.convention)
            )
        })
        .collect();
    Ok(format!(
        "Polarization ellipses, seen facing the source. {}.",
        pairs.join("; ")
    ))
}

/// A Stokes vector taken apart.
#[derive(Debug, Clone, Copy)]
enum State {
    /// The intensity is zero or negative.
    Dark,
    Light {
        degree: f64,
        /// In [0, π), counter-clockwise from x.
        azimuth: f64,
        /// In [−π/4, π/4], positive for clockwise.
        ellipticity: f64,
    },
}

/// Below this, what is left of the ellipse says nothing.
const UNPOLARIZED: f64 = 5e-4;

impl State {
    fn of(stokes: &[f64; 4]) -> Self {
        // The largest first, so that no square overflows.
        let scale = stokes.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        if stokes[0] <= 1e-12 * scale {
            return Self::Dark;
        }
        let [s0, s1, s2, s3] = stokes.map(|v| v / scale);
        let linear = s1.hypot(s2);
        Self::Light {
            degree: linear.hypot(s3) / s0,
            azimuth: (0.5 * s2.atan2(s1)).rem_euclid(PI),
            ellipticity: 0.5 * s3.atan2(linear),
        }
    }
}

fn in_words(state: &State, convention: &Convention) -> String {
    match *state {
        State::Dark => "nothing, it is blocked".to_owned(),
        State::Light { degree, .. } if degree < UNPOLARIZED => {
            format!("unpolarized, degree {}", fixed(degree, 3))
        }
        State::Light {
            degree,
            azimuth,
            ellipticity,
        } => {
            let turn = ellipticity.to_degrees();
            // 179.97° is printed as 0.0°, not as 180.0°.
            let azimuth = convention.azimuth(azimuth).to_degrees();
            let azimuth = if azimuth >= 179.95 { 0.0 } else { azimuth };
            let shape = if turn.abs() >= 44.95 {
                "circular".to_owned()
            } else if turn.abs() < 0.05 {
                format!("linear at {}°", fixed(azimuth, 1))
            } else {
                format!(
                    "elliptical at {}°, ellipticity {}°",
                    fixed(azimuth, 1),
                    fixed(convention.circular(turn), 1)
                )
            };
            let sense = if turn.abs() < 0.05 {
                ""
            } else if turn > 0.0 {
                ", clockwise"
            } else {
                ", counter-clockwise"
            };
            format!("{shape}{sense}, degree {}", fixed(degree, 3))
        }
    }
}

fn check(plot: &EllipsesPlot) -> Result<()> {
    if plot.states.is_empty() {
        return Err(Error::new("no-states", "There is no state to draw.").at_field("states"));
    }
    if plot.states.len() > 48 {
        return Err(
            Error::new("too-many-states", "At most 48 pairs of states are drawn.")
                .at_field("states"),
        );
    }
    for (k, pair) in plot.states.iter().enumerate() {
        for (name, stokes) in [("input", &pair.input), ("output", &pair.output)] {
            if let Some(j) = stokes.iter().position(|v| !v.is_finite()) {
                return Err(
                    Error::new("not-finite", "Only finite numbers can be drawn.")
                        .at_field(format!("states[{k}].{name}[{j}]")),
                );
            }
        }
    }
    Ok(())
}

/// Height of the line below all pairs, and of the two lines below each.
const FOOT: f64 = 26.0;
const CAPTION: f64 = 56.0;

fn columns(width: f64) -> usize {
    if width >= 560.0 {
        6
    } else if width >= 270.0 {
        3
    } else {
        2
    }
}

/// Of an ellipse in a cell so wide: two of them, an arrow and margins.
fn radius(cell: f64) -> f64 {
    ((cell - 34.0) / 4.0).clamp(8.0, 24.0)
}

fn draw_pair(
    pen: &Pen<'_>,
    corner: Point,
    cell: (f64, f64),
    pair: &EllipsePair,
    theme: &Theme,
) -> Result<()> {
    let r = radius(cell.0).min(((cell.1 - CAPTION) / 2.0).max(6.0));
    let x = corner.0 + cell.0 / 2.0;
    let y = corner.1 + r + 8.0;
    let apart = r + 13.0;
    let mute = ink(theme.mute);
    let output = State::of(&pair.output);
    draw_state(pen, (x - apart, y), r, &State::of(&pair.input), theme)?;
    draw_state(pen, (x + apart, y), r, &output, theme)?;
    pen.line(&[(x - 5.0, y), (x + 5.0, y)], mute, 1.2)?;
    pen.line(
        &[(x + 1.5, y - 3.5), (x + 5.0, y), (x + 1.5, y + 3.5)],
        mute,
        1.2,
    )?;

    let base = y + r + 18.0;
    pen.text(&pair.label, (x, base), 13.0, ink(theme.ink), Align::Middle)?;
    let number = match output {
        State::Dark => "no light".to_owned(),
        State::Light { degree, .. } if degree < UNPOLARIZED => {
            let both = format!("{} unpolarized", fixed(degree, 3));
            if pen.text_width(&both, 13.0)? < cell.0 - 6.0 {
                both
            } else {
                "unpolarized".to_owned()
            }
        }
        State::Light { degree, .. } => degree_text(degree),
    };
    pen.text(
        &number,
        (x, base + 17.0),
        13.0,
        ink(theme.ink),
        Align::Middle,
    )
}

fn degree_text(degree: f64) -> String {
    if degree < 1e4 {
        fixed(degree, 3)
    } else {
        super::number::power_of_ten(degree, 3)
    }
}

fn draw_foot(pen: &Pen<'_>, theme: &Theme) -> Result<()> {
    let text = [
        "Seen facing the source; below each pair the degree of polarization of the output",
        "Facing the source; number: degree of polarization",
        "number: degree of polarization",
    ];
    for line in text {
        if pen.text_width(line, 12.0)? <= pen.width - 8.0 {
            let at = (pen.width / 2.0, pen.height - 10.0);
            return pen.text(line, at, 12.0, ink(theme.mute), Align::Middle);
        }
    }
    Ok(())
}

fn draw_state(pen: &Pen<'_>, centre: Point, r: f64, state: &State, theme: &Theme) -> Result<()> {
    let accent = ink(theme.accent);
    match *state {
        State::Dark => {
            let d = r * 0.35;
            let (x, y) = centre;
            pen.line(&[(x - d, y - d), (x + d, y + d)], ink(theme.mute), 1.4)?;
            pen.line(&[(x - d, y + d), (x + d, y - d)], ink(theme.mute), 1.4)
        }
        State::Light { degree, .. } if degree < UNPOLARIZED => {
            let circle = ellipse(centre, r, r, 0.0);
            pen.dashed(&circle, (1.6, 3.0), accent, 1.6)
        }
        State::Light {
            degree,
            azimuth,
            ellipticity,
        } => {
            let (long, short) = (r * ellipticity.cos(), r * ellipticity.sin().abs());
            let outline = ellipse(centre, long, short, azimuth);
            pen.fill(&outline, faint(theme.accent, 0.26 * degree.min(1.0)))?;
            pen.line(&outline, accent, 1.7)?;
            draw_sense(pen, centre, (long, short), azimuth, ellipticity, theme)
        }
    }
}

/// Heads on the ellipse that point the way the field turns.
fn draw_sense(
    pen: &Pen<'_>,
    (x, y): Point,
    (long, short): (f64, f64),
    azimuth: f64,
    ellipticity: f64,
    theme: &Theme,
) -> Result<()> {
    // A flatter one looks like a line and has no sense to show.
    if short < 1.2 {
        return Ok(());
    }
    // On screen y grows downwards, so counter-clockwise is −angle.
    let (c, s) = (azimuth.cos(), -azimuth.sin());
    let place = |u: f64, v: f64| (x + u * c + v * s, y + u * s - v * c);
    let forward = if ellipticity > 0.0 { 1.0 } else { -1.0 };
    let (length, half) = (8.0_f64.min(long * 0.55), 3.6);
    // Where the outline crosses the short axis: at +short, clockwise is towards +u.
    for side in [1.0, -1.0] {
        if side < 0.0 && short < 6.0 {
            continue;
        }
        let towards = forward * side;
        let (tip, v) = (towards * length * 0.5, side * short);
        let head = [
            place(tip, v * drop(tip, long)),
            place(-tip, v + half),
            place(-tip * 0.55, v),
            place(-tip, v - half),
        ];
        pen.fill(&head, ink(theme.accent))?;
    }
    Ok(())
}

/// How far an ellipse has fallen from its short axis at a place along the long one.
fn drop(u: f64, long: f64) -> f64 {
    (1.0 - (u / long).powi(2)).max(0.0).sqrt()
}

/// A closed outline; axes in pixels, azimuth counter-clockwise from x.
fn ellipse((x, y): Point, long: f64, short: f64, azimuth: f64) -> Vec<Point> {
    let (c, s) = (azimuth.cos(), azimuth.sin());
    (0..=96)
        .map(|k| {
            let t = TAU * f64::from(k) / 96.0;
            let (u, v) = (long * t.cos(), short * t.sin());
            (x + u * c - v * s, y - u * s - v * c)
        })
        .collect()
}
