//! The Poincaré sphere: six standard inputs, what they become, and the image of
//! every fully polarized input.

use std::f64::consts::{FRAC_PI_2, PI, TAU};

use plotters::coord::Shift;
use plotters::drawing::DrawingArea;
use plotters_backend::DrawingBackend;

use super::number::{fixed, power_of_ten};
use super::pen::{Align, Pen, Point, faint, ink};
use super::surface::Surface;
use super::svg::to_svg;
use super::theme::{Rgb, Theme};
use crate::error::{Error, Result};

/// A Mueller matrix seen on the Poincaré sphere.
#[derive(Debug, Clone, PartialEq)]
pub struct SpherePlot {
    /// Row by row, in the convention in which it is to be shown; divided by its
    /// first element here.
    pub mueller: [f64; 16],
    /// Where the viewer stands.
    pub view: View,
    /// Names of the states at +S1, −S1, +S2, −S2, +S3, −S3.
    pub labels: [String; 6],
    /// The state that is being read, counted as the labels: both of its marks are
    /// ringed. A number beyond them rings none.
    pub chosen: Option<usize>,
    /// S1, S2 and S3 over S0 of the states that light goes through, in their order.
    /// Where there are any, they are drawn in place of the standard states and of the
    /// image of all inputs.
    pub path: Vec<[f64; 3]>,
}

/// Where the marks of one standard state are on a picture, CSS pixels from the upper
/// left corner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SphereMark {
    /// The open mark.
    pub input: (f64, f64),
    /// The filled one; `None` where no light comes out.
    pub output: Option<(f64, f64)>,
}

/// Where the viewer of the sphere stands: a turntable, S3 stays up.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct View {
    /// Longitude of the point that faces the viewer, from S1 towards S2, radians.
    pub azimuth: f64,
    /// Its latitude, towards S3, radians in [−π/2, π/2]; more is taken as that.
    pub elevation: f64,
}

impl Default for View {
    /// From between +S1 and −S2, a little above.
    fn default() -> Self {
        Self {
            azimuth: (-55.0_f64).to_radians(),
            elevation: 22.0_f64.to_radians(),
        }
    }
}

impl View {
    /// Right, up and towards the viewer, of a point in S1, S2, S3; an orthographic
    /// projection, so the first two are the place on the picture.
    pub fn project(&self, point: [f64; 3]) -> [f64; 3] {
        let [a, b, c] = point;
        let (sin_az, cos_az) = self.azimuth.sin_cos();
        let (sin_el, cos_el) = self.elevation.clamp(-FRAC_PI_2, FRAC_PI_2).sin_cos();
        let out = a * cos_az + b * sin_az;
        [
            b * cos_az - a * sin_az,
            c * cos_el - out * sin_el,
            out * cos_el + c * sin_el,
        ]
    }
}

/// Draws the sphere, front and back told apart by line and strength.
///
/// Where outputs lie outside the unit sphere it is drawn smaller, so that they fit;
/// beyond 1.5 they are drawn at 1.5.
///
/// # Errors
///
/// `not-finite` for a number that is not finite, also after the division by m00;
/// `no-intensity` when m00 is not positive; `plot-size` for an area that is too
/// small; `drawing-failed` from the back end.
pub fn draw_sphere<DB: DrawingBackend>(
    area: &DrawingArea<DB, Shift>,
    plot: &SpherePlot,
    theme: &Theme,
) -> Result<()> {
    let map = Map::new(plot)?;
    let pen = Pen::new(area)?;
    pen.ground(theme.background)?;
    let scene = Scene::new((pen.width, pen.height), plot.view, &map);
    draw_ball(&pen, &scene, theme)?;
    if !plot.path.is_empty() {
        draw_path(&pen, &scene, plot, theme)?;
        return draw_view(&pen, &scene, theme);
    }
    draw_image(&pen, &scene, &map, theme)?;
    draw_states(&pen, &scene, plot, &map, theme)?;
    draw_legend(&pen, &scene, theme)
}

/// The sphere as an SVG document.
///
/// # Errors
///
/// As [`draw_sphere`], and `plot-size` as [`Surface::in_units`].
pub fn sphere_svg(
    plot: &SpherePlot,
    surface: &Surface,
    theme: &Theme,
    title: &str,
    description: &str,
) -> Result<String> {
    to_svg(surface, title, description, |area| {
        draw_sphere(area, plot, theme)
    })
}

/// A fitting height for a width, CSS pixels.
pub fn sphere_height(width: f64) -> f64 {
    width + LEGEND
}

/// Where [`draw_sphere`] puts the marks, in the order of the labels.
///
/// # Errors
///
/// As [`draw_sphere`], and `plot-size` as [`Surface::in_units`].
pub fn sphere_marks(plot: &SpherePlot, surface: &Surface) -> Result<[SphereMark; 6]> {
    surface.in_units()?;
    let map = Map::new(plot)?;
    let scene = Scene::new((surface.width, surface.height), plot.view, &map);
    Ok(STANDARD.map(|input| SphereMark {
        input: scene.place(input).0,
        output: map.output(input).map(|output| scene.place(output).0),
    }))
}

/// What the plot shows, in words: each output with its degree of polarization.
///
/// # Errors
///
/// `not-finite` and `no-intensity` as [`draw_sphere`].
pub fn sphere_description(plot: &SpherePlot) -> Result<String> {
    let map = Map::new(plot)?;
    if !plot.path.is_empty() {
        return Ok(path_description(&plot.path));
    }
    let mut smallest = f64::INFINITY;
    let mut largest = f64::NEG_INFINITY;
    let mut parts = Vec::new();
    for (input, label) in STANDARD.iter().zip(&plot.labels) {
        parts.push(match map.output(*input) {
            None => format!("{label} is blocked"),
            Some(output) => {
                let degree = norm(output);
                smallest = smallest.min(degree);
                largest = largest.max(degree);
                let [a, b, c] = output.map(readable);
                format!("{label} becomes ({a}, {b}, {c})")
            }
        });
    }
    let degrees = if largest >= smallest {
        format!(
            " Their degrees of polarization lie between {} and {}.",
            readable(smallest),
            readable(largest)
        )
    } else {
        String::new()
    };
    Ok(format!(
        "Poincaré sphere, S1, S2 and S3 of the outputs divided by S0. {}.{degrees}",
        parts.join("; ")
    ))
}

fn path_description(path: &[[f64; 3]]) -> String {
    let states: Vec<String> = path
        .iter()
        .enumerate()
        .map(|(k, state)| {
            let [a, b, c] = state.map(readable);
            format!("{k} at ({a}, {b}, {c})")
        })
        .collect();
    format!(
        "Path on the Poincaré sphere, S1, S2 and S3 divided by S0, from the source, 0: {}.",
        states.join("; ")
    )
}

/// The six standard inputs, in the order of the labels.
const STANDARD: [[f64; 3]; 6] = [
    [1.0, 0.0, 0.0],
    [-1.0, 0.0, 0.0],
    [0.0, 1.0, 0.0],
    [0.0, -1.0, 0.0],
    [0.0, 0.0, 1.0],
    [0.0, 0.0, -1.0],
];

/// Height of the two lines below the sphere.
const LEGEND: f64 = 40.0;

/// Radii beyond this are drawn at it.
const FARTHEST: f64 = 1.5;

fn readable(value: f64) -> String {
    if value.abs() < 1e4 {
        fixed(value, 3)
    } else {
        power_of_ten(value, 3)
    }
}

fn norm([a, b, c]: [f64; 3]) -> f64 {
    a.hypot(b).hypot(c)
}

/// What a matrix does to fully polarized states.
struct Map {
    /// Divided by the first element.
    rows: [[f64; 4]; 4],
}

impl Map {
    fn new(plot: &SpherePlot) -> Result<Self> {
        if let Some(k) = plot.mueller.iter().position(|v| !v.is_finite()) {
            return Err(not_finite().at_field(format!("mueller[{k}]")));
        }
        for (angle, field) in [
            (plot.view.azimuth, "view.azimuth"),
            (plot.view.elevation, "view.elevation"),
        ] {
            if !angle.is_finite() {
                return Err(not_finite().at_field(field));
            }
        }
        if let Some(k) = plot.path.iter().position(|&state| !norm(state).is_finite()) {
            return Err(not_finite().at_field(format!("path[{k}]")));
        }
        let intensity = plot.mueller[0];
        if intensity <= 0.0 {
            return Err(Error::new(
                "no-intensity",
                "The sphere shows outputs relative to their intensity, so m00 must be positive.",
            )
            .at_field("mueller[0]"));
        }
        let rows: [[f64; 4]; 4] =
            std::array::from_fn(|i| std::array::from_fn(|j| plot.mueller[4 * i + j] / intensity));
        // Larger ones could overflow in sums and squares.
        if rows.iter().flatten().any(|v| v.is_nan() || v.abs() > 1e100) {
            return Err(
                Error::new("not-finite", "m00 is too small beside the other elements.")
                    .at_field("mueller[0]"),
            );
        }
        Ok(Self { rows })
    }

    /// S1, S2, S3 of the output over its S0; `None` where no light comes out.
    fn output(&self, input: [f64; 3]) -> Option<[f64; 3]> {
        let stokes = self
            .rows
            .map(|row| row[0] + row[1] * input[0] + row[2] * input[1] + row[3] * input[2]);
        let size = self.rows[0].iter().map(|v| v.abs()).sum::<f64>();
        if stokes[0] <= 1e-9 * size {
            return None;
        }
        Some([1, 2, 3].map(|k| stokes[k] / stokes[0]))
    }

    /// The input that our diattenuation alone turns into the fully polarized `w`.
    ///
    /// The image of all inputs is an ellipsoid, and linear in `w` (the forward polar
    /// decomposition of Lu & Chipman 1996), so even steps in `w` cover it evenly.
    fn even_input(&self, w: [f64; 3]) -> [f64; 3] {
        self.diattenuate(w, -1.0)
    }

    /// The inverse of `even_input`.
    fn even_output(&self, input: [f64; 3]) -> [f64; 3] {
        self.diattenuate(input, 1.0)
    }

    fn diattenuate(&self, state: [f64; 3], sign: f64) -> [f64; 3] {
        let d = [self.rows[0][1], self.rows[0][2], self.rows[0][3]];
        let size = norm(d);
        if size < 1e-12 {
            return state;
        }
        let axis = d.map(|v| v / size);
        // An ideal polarizer has no inverse.
        let size = sign * size.min(0.9999);
        let along = axis[0] * state[0] + axis[1] * state[1] + axis[2] * state[2];
        let scale = 1.0 / (1.0 + size * along);
        let parallel = (along + size) * scale;
        let across = (1.0 - size * size).sqrt() * scale;
        std::array::from_fn(|k| parallel * axis[k] + across * (state[k] - along * axis[k]))
    }

    /// The half axes of the image as a linear map of `w`; `None` for a flat one.
    fn shape(&self) -> Option<Shape> {
        let mut columns = [[0.0; 3]; 3];
        for (k, column) in columns.iter_mut().enumerate() {
            let (plus, minus) = (STANDARD[2 * k], STANDARD[2 * k + 1]);
            let plus = self.output(self.even_input(plus))?;
            let minus = self.output(self.even_input(minus))?;
            *column = std::array::from_fn(|i| (plus[i] - minus[i]) / 2.0);
        }
        let [a, b, c] = columns;
        let cofactors = [cross(b, c), cross(c, a), cross(a, b)];
        let volume = a[0] * cofactors[0][0] + a[1] * cofactors[0][1] + a[2] * cofactors[0][2];
        (volume.abs() > 1e-9).then(|| Shape {
            cofactors: cofactors.map(|column| column.map(|v| v * volume.signum())),
        })
    }

    /// A grid over the image: rows from pole to pole, columns all round.
    fn grid(&self) -> Vec<Vec<Option<[f64; 3]>>> {
        (0..=36)
            .map(|i| {
                let polar = PI * f64::from(i) / 36.0;
                (0..=72)
                    .map(|j| {
                        self.output(self.even_input(on_sphere(polar, TAU * f64::from(j) / 72.0)))
                    })
                    .collect()
            })
            .collect()
    }
}

/// An ellipsoid's orientation.
#[derive(Clone, Copy)]
struct Shape {
    cofactors: [[f64; 3]; 3],
}

impl Shape {
    /// Outwards at the image of `w`, of any length.
    fn normal(&self, w: [f64; 3]) -> [f64; 3] {
        let [a, b, c] = self.cofactors;
        std::array::from_fn(|i| a[i] * w[0] + b[i] * w[1] + c[i] * w[2])
    }
}

fn cross(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

fn not_finite() -> Error {
    Error::new("not-finite", "Only finite numbers can be drawn.")
}

fn on_sphere(polar: f64, longitude: f64) -> [f64; 3] {
    [
        polar.sin() * longitude.cos(),
        polar.sin() * longitude.sin(),
        polar.cos(),
    ]
}

/// Where things are on the picture.
struct Scene {
    centre: Point,
    /// Pixels of the unit sphere's radius.
    radius: f64,
    view: View,
    grid: Vec<Vec<Option<[f64; 3]>>>,
}

impl Scene {
    fn new((width, height): (f64, f64), view: View, map: &Map) -> Self {
        let grid = map.grid();
        let farthest = grid
            .iter()
            .flatten()
            .flatten()
            .map(|&o| norm(o))
            .fold(1.0, f64::max);
        let room = (width.min(height - LEGEND) / 2.0 - 20.0).max(10.0);
        // A little outside is within the margin; noise must not make the sphere jump.
        let radius = room / (farthest - 0.05).clamp(1.0, FARTHEST);
        Self {
            centre: (width / 2.0, (height - LEGEND) / 2.0),
            radius,
            view,
            grid,
        }
    }

    /// The place on the picture, and how near: positive in front.
    fn place(&self, point: [f64; 3]) -> (Point, f64) {
        let far = norm(point);
        let shrink = if far > FARTHEST { FARTHEST / far } else { 1.0 };
        let [right, up, near] = self.view.project(point.map(|v| v * shrink));
        (
            (
                self.centre.0 + self.radius * right,
                self.centre.1 - self.radius * up,
            ),
            near,
        )
    }
}

/// A curve cut where it goes from front to back.
fn pieces(places: impl Iterator<Item = Option<(Point, bool)>>) -> Vec<(Vec<Point>, bool)> {
    let mut pieces: Vec<(Vec<Point>, bool)> = Vec::new();
    let mut last: Option<(Point, bool)> = None;
    for place in places {
        if let Some((point, front)) = place {
            match (last, pieces.last_mut()) {
                (Some((_, was)), Some((piece, _))) if was == front => piece.push(point),
                (Some((before, _)), _) => pieces.push((vec![before, point], front)),
                (None, _) => pieces.push((vec![point], front)),
            }
        }
        last = place;
    }
    pieces
}

fn draw_pieces(
    pen: &Pen<'_>,
    pieces: &[(Vec<Point>, bool)],
    (colour, strength): (Rgb, f64),
) -> Result<()> {
    for (points, front) in pieces {
        if *front {
            pen.line(points, faint(colour, strength), 1.0)?;
        } else {
            pen.dashed(points, (2.0, 3.0), faint(colour, 0.6 * strength), 0.8)?;
        }
    }
    Ok(())
}

fn draw_ball(pen: &Pen<'_>, scene: &Scene, theme: &Theme) -> Result<()> {
    pen.disc(scene.centre, scene.radius, ink(theme.panel))?;
    pen.disc(scene.centre, scene.radius, faint(theme.accent, 0.05))?;
    let circle = |f: &dyn Fn(f64) -> [f64; 3]| {
        pieces((0..=120).map(|k| {
            let (place, near) = scene.place(f(TAU * f64::from(k) / 120.0));
            Some((place, near >= 0.0))
        }))
    };
    for k in 0..4 {
        let longitude = PI * f64::from(k) / 4.0;
        let meridian = circle(&|t| on_sphere(t, longitude));
        draw_pieces(pen, &meridian, (theme.line, 1.0))?;
    }
    for k in [1, 2, 4, 5] {
        let polar = PI * f64::from(k) / 6.0;
        draw_pieces(pen, &circle(&|t| on_sphere(polar, t)), (theme.line, 1.0))?;
    }
    let equator = circle(&|t| on_sphere(FRAC_PI_2, t));
    draw_pieces(pen, &equator, (theme.mute, 0.9))?;
    pen.ring(scene.centre, scene.radius, ink(theme.mute), 1.0)
}

/// The image of all fully polarized inputs: its silhouette, filled, and the images of
/// the three great circles through the standard states.
fn draw_image(pen: &Pen<'_>, scene: &Scene, map: &Map, theme: &Theme) -> Result<()> {
    let places: Vec<Point> = scene
        .grid
        .iter()
        .flatten()
        .flatten()
        .map(|&o| scene.place(o).0)
        .collect();
    let outline = hull(places);
    let (width, height) = size(&outline);
    // A point; the outputs mark it.
    if width.max(height) < 1.5 {
        return Ok(());
    }
    pen.fill(&outline, faint(theme.accent, 0.09))?;
    let closed: Vec<Point> = outline.iter().chain(outline.first()).copied().collect();
    pen.line(&closed, faint(theme.accent, 0.8), 1.1)?;

    let shape = map.shape();
    for axis in 0..3 {
        let places = (0..=180).map(|k| {
            let (s, c) = (TAU * f64::from(k) / 180.0).sin_cos();
            let mut input = [0.0; 3];
            input[(axis + 1) % 3] = c;
            input[(axis + 2) % 3] = s;
            let output = map.output(input)?;
            let near = shape.map_or(0.0, |shape| {
                scene.view.project(shape.normal(map.even_output(input)))[2]
            });
            Some((scene.place(output).0, near >= 0.0))
        });
        draw_pieces(pen, &pieces(places), (theme.accent, 0.75))?;
    }
    Ok(())
}

fn size(points: &[Point]) -> (f64, f64) {
    let range = |f: fn(&Point) -> f64| {
        let (low, high) = points
            .iter()
            .map(f)
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| {
                (l.min(v), h.max(v))
            });
        (high - low).max(0.0)
    };
    (range(|p| p.0), range(|p| p.1))
}

/// The convex hull (monotone chain, Andrew 1979).
fn hull(mut points: Vec<Point>) -> Vec<Point> {
    points.sort_unstable_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
    points.dedup();
    if points.len() < 3 {
        return points;
    }
    let mut chain: Vec<Point> = Vec::new();
    for backwards in [false, true] {
        let start = chain.len();
        let mut walk = |p: Point| {
            while chain.len() >= start + 2 {
                let (a, b) = (chain[chain.len() - 2], chain[chain.len() - 1]);
                let turn = (b.0 - a.0) * (p.1 - a.1) - (b.1 - a.1) * (p.0 - a.0);
                if turn > 0.0 {
                    break;
                }
                chain.pop();
            }
            chain.push(p);
        };
        if backwards {
            points.iter().rev().for_each(|&p| walk(p));
        } else {
            points.iter().for_each(|&p| walk(p));
        }
        chain.pop();
    }
    chain
}

fn draw_states(
    pen: &Pen<'_>,
    scene: &Scene,
    plot: &SpherePlot,
    map: &Map,
    theme: &Theme,
) -> Result<()> {
    let inputs = STANDARD.map(|input| scene.place(input));
    let outputs = STANDARD.map(|input| map.output(input).map(|o| scene.place(o)));
    for ((from, _), to) in inputs.iter().zip(&outputs) {
        if let Some((to, _)) = to {
            pen.line(&[*from, *to], faint(theme.mute, 0.6), 1.0)?;
        }
    }
    // From the back to the front.
    let mut marks: Vec<(Point, f64, bool)> = inputs
        .iter()
        .map(|&(place, near)| (place, near, false))
        .chain(
            outputs
                .iter()
                .flatten()
                .map(|&(place, near)| (place, near, true)),
        )
        .collect();
    marks.sort_by(|a, b| a.1.total_cmp(&b.1));
    for &(place, near, is_output) in &marks {
        let strength = if near < -1e-9 { 0.62 } else { 1.0 };
        if is_output {
            pen.disc(place, 4.6, ink(theme.panel))?;
            pen.disc(place, 4.0, faint(theme.accent, strength))?;
        } else {
            pen.disc(place, 4.2, ink(theme.panel))?;
            pen.ring(place, 3.6, faint(theme.ink, strength), 1.6)?;
        }
    }
    if let Some(chosen) = plot.chosen.filter(|&k| k < inputs.len()) {
        draw_chosen(pen, inputs[chosen].0, outputs[chosen].map(|o| o.0), theme)?;
    }
    let places: Vec<Point> = marks.iter().map(|m| m.0).collect();
    draw_labels(pen, scene, &plot.labels, &inputs, &places, theme)
}

/// The states that light goes through, joined in their order and counted from the source.
fn draw_path(pen: &Pen<'_>, scene: &Scene, plot: &SpherePlot, theme: &Theme) -> Result<()> {
    let axes = STANDARD.map(|state| scene.place(state));
    let places: Vec<(Point, f64)> = plot.path.iter().map(|&state| scene.place(state)).collect();
    let points: Vec<Point> = places.iter().map(|place| place.0).collect();
    draw_labels(pen, scene, &plot.labels, &axes, &points, theme)?;
    if points.len() > 1 {
        pen.line(&points, ink(theme.accent), 1.6)?;
    }
    for (k, &((x, y), near)) in places.iter().enumerate() {
        let strength = if near < -1e-9 { 0.62 } else { 1.0 };
        pen.disc((x, y), 4.6, ink(theme.panel))?;
        if k == 0 {
            pen.ring((x, y), 3.6, faint(theme.ink, strength), 1.6)?;
        } else {
            pen.disc((x, y), 4.0, faint(theme.accent, strength))?;
        }
    }
    // Where light comes back to a place, the numbers stand beside each other there.
    let mut named: Vec<(Point, Vec<String>)> = Vec::new();
    for (k, &(x, y)) in points.iter().enumerate() {
        match named
            .iter_mut()
            .find(|(at, _)| (at.0 - x).hypot(at.1 - y) < LABEL)
        {
            Some((_, names)) => names.push(k.to_string()),
            None => named.push(((x, y), vec![k.to_string()])),
        }
    }
    for ((x, y), names) in &named {
        let text = names.join(", ");
        // Towards the middle, where there is room.
        let shift = if *x > scene.centre.0 {
            -8.0 - pen.text_width(&text, LABEL)?
        } else {
            8.0
        };
        let place = (x + shift, y - 9.0);
        pen.text(&text, place, LABEL, ink(theme.ink), Align::Start)?;
    }
    Ok(())
}

/// A ring about each mark of the state that is being read, and the line between them.
fn draw_chosen(pen: &Pen<'_>, input: Point, output: Option<Point>, theme: &Theme) -> Result<()> {
    let colour = ink(theme.ink);
    pen.ring(input, CHOSEN, colour, 1.6)?;
    let Some(output) = output else {
        return Ok(());
    };
    pen.ring(output, CHOSEN, colour, 1.6)?;
    let (right, down) = (output.0 - input.0, output.1 - input.1);
    let apart = right.hypot(down);
    if apart <= 2.0 * CHOSEN {
        return Ok(());
    }
    // From ring to ring.
    let step = (right / apart * CHOSEN, down / apart * CHOSEN);
    let ends = [
        (input.0 + step.0, input.1 + step.1),
        (output.0 - step.0, output.1 - step.1),
    ];
    pen.line(&ends, colour, 1.6)
}

/// Radius of the ring about a chosen mark.
const CHOSEN: f64 = 6.8;

const LABEL: f64 = 12.0;

/// The names of the inputs, each beside its mark where it covers least.
fn draw_labels(
    pen: &Pen<'_>,
    scene: &Scene,
    labels: &[String; 6],
    inputs: &[(Point, f64); 6],
    marks: &[Point],
    theme: &Theme,
) -> Result<()> {
    let mut taken: Vec<(Point, Point)> = marks
        .iter()
        .map(|&(x, y)| ((x - 5.0, y - 5.0), (x + 5.0, y + 5.0)))
        .collect();
    for (k, label) in labels.iter().enumerate() {
        let axis = AXES[k];
        let name = pen.text_width(label, LABEL)?;
        let gap = if label.is_empty() { 0.0 } else { 5.0 };
        let width = name + gap + pen.text_width(axis, AXIS)?;
        let ((x, y), near) = inputs[k];
        let (right, down) = (x - scene.centre.0, y - scene.centre.1);
        let outward = if right.hypot(down) > 4.0 {
            down.atan2(right)
        } else {
            -PI / 4.0
        };
        let best = (0..16)
            .map(|j| {
                let angle = TAU * f64::from(j) / 16.0;
                let corner = beside((x, y), angle, width);
                let area = (corner, (corner.0 + width, corner.1 + LABEL));
                let covered = taken.iter().filter(|t| overlap(t, &area)).count() as f64;
                let outside = corner.0 < 1.0
                    || corner.0 + width > pen.width - 1.0
                    || corner.1 < 1.0
                    || corner.1 + LABEL > pen.height - LEGEND + 8.0;
                let away = (angle - outward).cos();
                (
                    4.0 * covered + if outside { 20.0 } else { 0.0 } - away,
                    area,
                )
            })
            .min_by(|a, b| a.0.total_cmp(&b.0));
        if let Some((_, area)) = best {
            taken.push(area);
            let middle = area.0.1 + LABEL / 2.0;
            // Lines shine through faintly.
            pen.rectangle(area.0, area.1, faint(theme.background, 0.5))?;
            let colour = if near < -1e-9 { theme.mute } else { theme.ink };
            pen.text(label, (area.0.0, middle), LABEL, ink(colour), Align::Start)?;
            let start = (area.0.0 + name + gap, middle);
            pen.text(axis, start, AXIS, ink(theme.mute), Align::Start)?;
        }
    }
    Ok(())
}

const AXES: [&str; 6] = [
    "(S1)",
    "(\u{2212}S1)",
    "(S2)",
    "(\u{2212}S2)",
    "(S3)",
    "(\u{2212}S3)",
];
const AXIS: f64 = 11.0;

/// The upper left corner of a label that touches a mark from a direction.
fn beside((x, y): Point, angle: f64, width: f64) -> Point {
    let (s, c) = angle.sin_cos();
    (
        x + 8.0 * c + (c - 1.0) / 2.0 * width,
        y + 7.0 * s + (s - 1.0) / 2.0 * LABEL,
    )
}

fn overlap(a: &(Point, Point), b: &(Point, Point)) -> bool {
    a.0.0 < b.1.0 && b.0.0 < a.1.0 && a.0.1 < b.1.1 && b.0.1 < a.1.1
}

fn draw_legend(pen: &Pen<'_>, scene: &Scene, theme: &Theme) -> Result<()> {
    let y = pen.height - LEGEND + 12.0;
    let mute = ink(theme.mute);
    let names = ["input", "output"];
    let widths = [
        pen.text_width(names[0], LABEL)?,
        pen.text_width(names[1], LABEL)?,
    ];
    let (mark, gap) = (13.0, 18.0);
    let mut x = (pen.width - widths[0] - widths[1] - 2.0 * mark - gap) / 2.0;
    for k in 0..2 {
        if k == 0 {
            pen.ring((x + 4.0, y), 3.6, ink(theme.ink), 1.6)?;
        } else {
            pen.disc((x + 4.0, y), 4.0, ink(theme.accent))?;
        }
        pen.text(names[k], (x + mark, y), LABEL, mute, Align::Start)?;
        x += mark + widths[k] + gap;
    }
    draw_view(pen, scene, theme)
}

/// From where the sphere is seen, in words below it.
fn draw_view(pen: &Pen<'_>, scene: &Scene, theme: &Theme) -> Result<()> {
    let y = pen.height - LEGEND + 12.0;
    let mute = ink(theme.mute);
    let azimuth = scene.view.azimuth.to_degrees().rem_euclid(360.0).round();
    let azimuth = if azimuth > 180.0 {
        azimuth - 360.0
    } else {
        azimuth
    };
    let elevation = scene.view.elevation.clamp(-FRAC_PI_2, FRAC_PI_2);
    let view = format!(
        "seen from azimuth {}°, elevation {}°",
        fixed(azimuth, 0),
        fixed(elevation.to_degrees(), 0)
    );
    pen.text(
        &view,
        (pen.width / 2.0, y + 17.0),
        AXIS,
        mute,
        Align::Middle,
    )
}
