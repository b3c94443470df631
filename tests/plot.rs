//! The plots, read back from their SVG and compared with what the geometry says.
//!
//! No picture is compared with an earlier one: places are turned back into values
//! through the tick labels, or computed from rotation matrices and from the field
//! of the light itself, in this file.

use std::f64::consts::{FRAC_PI_2, TAU};

use halfshade::convention::{AngleSense, Convention, PositiveS3, ZeroAngle};
use halfshade::error::Place;
use halfshade::plot::{
    Curve, CurvesPlot, EigenvaluePlot, EllipsePair, EllipsesPlot, Named, SpherePlot, Surface,
    Theme, UNITS, View, curves_description, curves_height, curves_svg, eigenvalues_description,
    eigenvalues_height, eigenvalues_svg, ellipses_description, ellipses_height, ellipses_svg,
    sphere_description, sphere_height, sphere_marks, sphere_svg,
};
use roxmltree::{Document, Node};

/// Invented: a retarding film with a little noise.
const FILM: [f64; 16] = [
    0.9550, 0.0226, 0.0327, 0.0038, 0.0190, 0.6733, 0.2540, -0.6306, 0.0297, 0.2500, 0.7353,
    0.5698, 0.0003, 0.6339, -0.5648, 0.4469,
];

const INPUTS: [[f64; 4]; 6] = [
    [1.0, 1.0, 0.0, 0.0],
    [1.0, -1.0, 0.0, 0.0],
    [1.0, 0.0, 1.0, 0.0],
    [1.0, 0.0, -1.0, 0.0],
    [1.0, 0.0, 0.0, 1.0],
    [1.0, 0.0, 0.0, -1.0],
];

fn labels() -> [String; 6] {
    ["H", "V", "+45°", "−45°", "R", "L"].map(str::to_owned)
}

fn surface(width: f64, height: f64) -> Surface {
    Surface {
        width,
        height,
        ratio: 1.0,
    }
}

fn apply(mueller: &[f64; 16], stokes: &[f64; 4]) -> [f64; 4] {
    std::array::from_fn(|i| (0..4).map(|j| mueller[4 * i + j] * stokes[j]).sum())
}

fn pairs(mueller: &[f64; 16]) -> EllipsesPlot {
    EllipsesPlot {
        states: labels()
            .into_iter()
            .zip(INPUTS)
            .map(|(label, input)| EllipsePair {
                label,
                input,
                output: apply(mueller, &input),
            })
            .collect(),
        convention: Convention::default(),
    }
}

fn sphere(mueller: [f64; 16], azimuth: f64, elevation: f64) -> SpherePlot {
    SpherePlot {
        mueller,
        view: View { azimuth, elevation },
        labels: labels(),
        chosen: None,
        path: Vec::new(),
    }
}

fn eigenvalues(eigenvalues: [f64; 4], standard_error: Option<[f64; 4]>) -> EigenvaluePlot {
    EigenvaluePlot {
        eigenvalues,
        standard_error,
    }
}

fn number(node: &Node<'_, '_>, name: &str) -> f64 {
    node.attribute(name)
        .and_then(|text| text.parse().ok())
        .unwrap_or_else(|| panic!("{name} of {node:?}"))
}

fn nodes<'a>(document: &'a Document<'a>, name: &'a str) -> impl Iterator<Item = Node<'a, 'a>> {
    document
        .descendants()
        .filter(move |node| node.has_tag_name(("http://www.w3.org/2000/svg", name)))
}

fn content(node: &Node<'_, '_>) -> String {
    node.text().unwrap_or_default().trim().to_owned()
}

/// Pixels of the points of a polyline or polygon.
fn points(node: &Node<'_, '_>) -> Vec<(f64, f64)> {
    node.attribute("points")
        .unwrap_or_default()
        .split_whitespace()
        .map(|pair| {
            let (x, y) = pair.split_once(',').expect("x,y");
            let pixel = |text: &str| text.parse::<f64>().expect("a number") / UNITS;
            (pixel(x), pixel(y))
        })
        .collect()
}

/// Centres, in pixels, of the circles of a radius that are filled or not.
fn circles(document: &Document<'_>, radius: f64, filled: bool) -> Vec<(f64, f64)> {
    nodes(document, "circle")
        .filter(|node| (number(node, "r") / UNITS - radius).abs() < 0.1)
        .filter(|node| (node.attribute("fill") != Some("none")) == filled)
        .map(|node| (number(&node, "cx") / UNITS, number(&node, "cy") / UNITS))
        .collect()
}

fn value_of(label: &str) -> Option<f64> {
    label.replace('\u{2212}', "-").parse().ok()
}

/// What holds for every plot: readable text inside the picture, no bad number.
fn check_document(svg: &str, title: &str, description: &str) {
    let document = Document::parse(svg).expect("well-formed XML");
    let root = document.root_element();
    assert_eq!(root.attribute("role"), Some("img"));
    let child = |name: &'static str| nodes(&document, name).next().map(|n| content(&n));
    assert_eq!(child("title").as_deref(), Some(title));
    assert_eq!(child("desc").as_deref(), Some(description));
    let version = format!("Halfshade {}", env!("CARGO_PKG_VERSION"));
    assert_eq!(child("metadata"), Some(version));
    assert!(!svg.contains("NaN") && !svg.contains("inf"));
    let view: Vec<f64> = root
        .attribute("viewBox")
        .expect("a view box")
        .split(' ')
        .map(|v| v.parse().expect("a number"))
        .collect();
    for text in nodes(&document, "text") {
        let shown = content(&text);
        assert!(number(&text, "font-size") / UNITS >= 10.999, "{shown}");
        let (x, y) = (number(&text, "x"), number(&text, "y"));
        assert!(
            x >= 0.0 && x <= view[2] && y >= 0.0 && y <= view[3],
            "{shown}"
        );
        assert_eq!(text.attribute("font-family"), Some("system-ui, sans-serif"));
        assert!(!shown.contains('-'), "ASCII minus in {shown}");
        let zero = shown.strip_prefix('\u{2212}').and_then(value_of);
        assert_ne!(zero, Some(0.0), "negative zero: {shown}");
    }
}

/// Boxes of the texts that begin with one of the given, by a wide guess.
fn boxes(svg: &str, wanted: impl Fn(&str) -> bool) -> Vec<(String, [f64; 4])> {
    let document = Document::parse(svg).expect("well-formed XML");
    nodes(&document, "text")
        .map(|text| {
            let shown = content(&text);
            let size = number(&text, "font-size") / UNITS;
            let width = 0.6 * size * shown.chars().count() as f64;
            let (x, y) = (number(&text, "x") / UNITS, number(&text, "y") / UNITS);
            let left = match text.attribute("text-anchor") {
                Some("middle") => x - width / 2.0,
                Some("end") => x - width,
                _ => x,
            };
            let half = 0.4 * size;
            (shown, [left, y - half, left + width, y + half])
        })
        .filter(|(shown, _)| wanted(shown))
        .collect()
}

fn check_apart(svg: &str, wanted: impl Fn(&str) -> bool) {
    let boxes = boxes(svg, wanted);
    for (i, (a, p)) in boxes.iter().enumerate() {
        for (b, q) in &boxes[..i] {
            let meet = p[0] < q[2] && q[0] < p[2] && p[1] < q[3] && q[1] < p[3];
            assert!(!meet, "{a} lies over {b}");
        }
    }
}

// Source: derived. The view from azimuth 0 and elevation 0 has S2 to the right and S3 up.
#[test]
fn a_path_is_drawn_in_place_of_the_standard_states() {
    let identity = std::array::from_fn(|k| if k % 5 == 0 { 1.0 } else { 0.0 });
    let mut plot = sphere(identity, 0.0, 0.0);
    let states = [[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [0.0, 0.0, 0.5]];
    plot.path = states.to_vec();
    let words = sphere_description(&plot).expect("words");
    assert!(words.contains("0 at (0.000, 1.000, 0.000)"), "{words}");
    assert!(words.contains("2 at (0.000, 0.000, 0.500)"), "{words}");
    let size = surface(300.0, sphere_height(300.0));
    let svg = sphere_svg(&plot, &size, &Theme::light(), "path", &words).expect("a plot");
    check_document(&svg, "path", &words);
    let document = Document::parse(&svg).expect("well-formed XML");
    let names: Vec<String> = nodes(&document, "text").map(|n| content(&n)).collect();
    for name in ["0", "1", "2"] {
        assert!(names.iter().any(|text| text == name), "{name} in {names:?}");
    }
    assert!(!names.iter().any(|text| text == "output"), "{names:?}");
    // The ball is 130 pixels in the middle of 300: to the right, up, half way up.
    let mut drawn = circles(&document, 3.6, false);
    drawn.extend(circles(&document, 4.0, true));
    let places = [(280.0, 150.0), (150.0, 20.0), (150.0, 85.0)];
    assert_eq!(drawn.len(), places.len());
    for (mark, place) in drawn.iter().zip(places) {
        let away = (mark.0 - place.0).hypot(mark.1 - place.1);
        assert!(away < 0.1, "{mark:?}, not {place:?}");
    }
    plot.path = vec![[f64::NAN, 0.0, 0.0]];
    let error = sphere_svg(&plot, &size, &Theme::light(), "path", "").expect_err("NaN");
    assert_eq!(error.code, "not-finite");
}

#[test]
fn eigenvalues_lie_where_the_tick_labels_say() {
    // Derived: places and values through the labels of two ticks of the same axis.
    let (values, error) = ([1.0042, 0.0014, -0.0018, -0.0038], 0.0021);
    let plot = eigenvalues(values, Some([error; 4]));
    let svg =
        eigenvalues_svg(&plot, &surface(820.0, 184.0), &Theme::light(), "t", "d").expect("a plot");
    let document = Document::parse(&svg).expect("well-formed XML");
    let mut ticks: Vec<(f64, f64)> = nodes(&document, "text")
        .filter_map(|t| Some((value_of(&content(&t))?, number(&t, "x") / UNITS)))
        .collect();
    ticks.sort_by(|a, b| a.0.total_cmp(&b.0));
    let dots = circles(&document, 4.5, true);
    assert_eq!(dots.len(), 4);
    let (near, far): (Vec<_>, Vec<_>) = ticks.into_iter().partition(|t| t.0 < 0.5);
    assert!(near.len() >= 3 && far.len() >= 2, "{near:?} {far:?}");
    for (k, value) in values.into_iter().enumerate() {
        let axis = if k == 0 { &far } else { &near };
        let (a, b) = (axis[0], axis[axis.len() - 1]);
        let pixels = (b.1 - a.1) / (b.0 - a.0);
        let expected = a.1 + (value - a.0) * pixels;
        // Ticks are moved to the middle of a pixel.
        assert!((dots[k].0 - expected).abs() < 1.1, "λ{}", k + 1);
        let bar = nodes(&document, "polyline")
            .map(|line| points(&line))
            .filter(|p| p.len() == 2 && p[0].1 == dots[k].1 && p[1].1 == dots[k].1)
            .find(|p| (p[0].0..p[1].0).contains(&dots[k].0))
            .expect("an error bar");
        let width = bar[1].0 - bar[0].0;
        // Each of the two ticks is up to half a pixel off.
        let tolerance = 1.0 / (b.1 - a.1) + 0.002;
        let ratio = width / (2.0 * error * pixels);
        assert!((ratio - 1.0).abs() < tolerance, "λ{}: {ratio}", k + 1);
        assert!(((bar[0].0 + bar[1].0) / 2.0 - dots[k].0).abs() < 0.1);
    }
    let zero = near.iter().find(|t| t.0 == 0.0).expect("a tick at zero").1;
    let hatched = nodes(&document, "rect")
        .nth(1)
        .map(|r| (number(&r, "x") + number(&r, "width")) / UNITS)
        .expect("the forbidden side");
    assert!((hatched - zero).abs() <= 0.5 + 1.0 / UNITS);
    assert!(svg.contains("not realizable") && svg.contains("eigenvalue of H ÷ m00"));
}

#[test]
fn eigenvalues_share_one_axis_when_it_shows_them_all() {
    let plot = eigenvalues([0.6, 0.2, 0.15, 0.05], None);
    let svg =
        eigenvalues_svg(&plot, &surface(820.0, 184.0), &Theme::dark(), "t", "d").expect("a plot");
    let document = Document::parse(&svg).expect("well-formed XML");
    let dots = circles(&document, 4.5, true);
    let per_unit = (dots[0].0 - dots[3].0) / (0.6 - 0.05);
    assert!(((dots[1].0 - dots[2].0) / per_unit - 0.05).abs() < 1e-3);
    // No bars without a standard error: only the two strokes of a break would also
    // be this short and slanted.
    let strokes = nodes(&document, "polyline")
        .map(|line| points(&line))
        .filter(|p| p.len() == 2 && (p[1].0 - p[0].0 - 8.0).abs() < 0.01)
        .filter(|p| (p[1].1 - p[0].1 - 14.0).abs() < 0.01);
    assert_eq!(strokes.count(), 0);
}

#[test]
fn labels_stand_apart() {
    let cases = [
        [1.0042, 0.0014, -0.0018, -0.0038],
        [1.0, 0.0, 0.0, 0.0],
        [0.25, 0.25, 0.25, 0.25],
        [0.93, 0.04, 0.02, 0.01],
        [1.02, -0.004, -0.0065, -0.0095],
        [1.6, 0.1, -0.2, -0.5],
        [1.0, 3e-7, -2e-8, -3e-7],
    ];
    for width in [320.0, 480.0, 820.0] {
        for values in cases {
            for error in [None, Some([0.002; 4]), Some([1e-7; 4])] {
                let plot = eigenvalues(values, error);
                let surface = surface(width, eigenvalues_height(width));
                let svg =
                    eigenvalues_svg(&plot, &surface, &Theme::light(), "t", "d").expect("a plot");
                check_apart(&svg, |_| true);
                for name in ["λ₁", "λ₂", "λ₃", "λ₄"] {
                    assert!(svg.contains(name));
                }
            }
        }
        let plot = pairs(&FILM);
        let surface = surface(width, ellipses_height(width));
        let svg = ellipses_svg(&plot, &surface, &Theme::light(), "t", "d").expect("a plot");
        check_apart(&svg, |_| true);
    }
    for azimuth in 0..12 {
        let plot = sphere(FILM, f64::from(azimuth) * 0.5, 0.4);
        let surface = surface(270.0, sphere_height(270.0));
        let svg = sphere_svg(&plot, &surface, &Theme::light(), "t", "d").expect("a plot");
        check_apart(&svg, |shown| !shown.starts_with('('));
    }
}

/// The picture of a point: turned about S3, then about the axis to the right.
fn projected(point: [f64; 3], azimuth: f64, elevation: f64) -> (f64, f64) {
    let (s, c) = azimuth.sin_cos();
    let turned = [
        c * point[0] + s * point[1],
        -s * point[0] + c * point[1],
        point[2],
    ];
    let (s, c) = elevation.sin_cos();
    let tilted = [
        c * turned[0] + s * turned[2],
        turned[1],
        -s * turned[0] + c * turned[2],
    ];
    // Now the viewer stands on the first axis.
    (tilted[1], tilted[2])
}

fn check_states(mueller: [f64; 16], azimuth: f64, elevation: f64) {
    let plot = sphere(mueller, azimuth, elevation);
    let (width, height) = (300.0, sphere_height(300.0));
    let svg =
        sphere_svg(&plot, &surface(width, height), &Theme::light(), "t", "d").expect("a plot");
    let document = Document::parse(&svg).expect("well-formed XML");
    let ball = nodes(&document, "circle").next().expect("the ball");
    let centre = (number(&ball, "cx") / UNITS, number(&ball, "cy") / UNITS);
    let radius = number(&ball, "r") / UNITS;
    let drawn_inputs = circles(&document, 3.6, false);
    let drawn_outputs = circles(&document, 4.0, true);
    // One more of each stands in the legend.
    assert_eq!((drawn_inputs.len(), drawn_outputs.len()), (7, 7));
    for input in INPUTS {
        let output = apply(&mueller, &input);
        for (stokes, drawn) in [(input, &drawn_inputs), (output, &drawn_outputs)] {
            let point = [1, 2, 3].map(|k| stokes[k] / stokes[0]);
            let (right, up) = projected(point, azimuth, elevation);
            let expected = (centre.0 + radius * right, centre.1 - radius * up);
            let is_there = drawn
                .iter()
                .any(|d| (d.0 - expected.0).hypot(d.1 - expected.1) < 0.15);
            assert!(is_there, "{stokes:?} is not at {expected:?} in {drawn:?}");
        }
    }
}

#[test]
fn states_lie_where_the_rotations_put_them() {
    let identity: [f64; 16] = std::array::from_fn(|k| if k % 5 == 0 { 1.0 } else { 0.0 });
    check_states(identity, 0.0, 0.0);
    for (azimuth, elevation) in [(-0.96, 0.38), (2.5, -1.0), (0.3, FRAC_PI_2), (7.0, 0.0)] {
        check_states(FILM, azimuth, elevation);
        check_states(FILM.map(|v| v * 1234.5), azimuth, elevation);
    }
}

#[test]
fn marks_are_told_where_they_are_drawn_and_the_chosen_one_is_ringed() {
    let (azimuth, elevation) = (-0.96, 0.38);
    let size = surface(300.0, sphere_height(300.0));
    let mut plot = sphere(FILM, azimuth, elevation);
    let marks = sphere_marks(&plot, &size).expect("marks");
    // Recomputed: the unit sphere fills the square above the legend but for 20 pixels
    // all round; outputs that reach out of it by less than 5 % leave it so.
    for (mark, input) in marks.iter().zip(INPUTS) {
        let output = apply(&FILM, &input);
        let told = [(input, Some(mark.input)), (output, mark.output)];
        for (stokes, told) in told {
            let point = [1, 2, 3].map(|k| stokes[k] / stokes[0]);
            let (right, up) = projected(point, azimuth, elevation);
            let expected = (150.0 + 130.0 * right, 150.0 - 130.0 * up);
            let (x, y) = told.expect("light comes out");
            assert!((x - expected.0).hypot(y - expected.1) < 0.02, "{stokes:?}");
        }
    }
    let rings = |plot: &SpherePlot| {
        let svg = sphere_svg(plot, &size, &Theme::light(), "t", "d").expect("a plot");
        circles(&Document::parse(&svg).expect("well-formed XML"), 6.8, false)
    };
    assert!(rings(&plot).is_empty());
    for (k, mark) in marks.iter().enumerate() {
        plot.chosen = Some(k);
        let drawn = rings(&plot);
        let told = [mark.input, mark.output.expect("light comes out")];
        assert_eq!(drawn.len(), 2);
        for (ring, place) in drawn.iter().zip(told) {
            assert!((ring.0 - place.0).hypot(ring.1 - place.1) < 0.1);
        }
    }
    plot.chosen = Some(6);
    assert!(rings(&plot).is_empty());

    // A horizontal polarizer blocks V (definition): one ring, no output.
    let mut polarizer = [0.0; 16];
    for k in [0, 1, 4, 5] {
        polarizer[k] = 0.5;
    }
    let mut plot = sphere(polarizer, azimuth, elevation);
    plot.chosen = Some(1);
    let marks = sphere_marks(&plot, &size).expect("marks");
    assert_eq!(marks[1].output, None);
    assert_eq!(rings(&plot).len(), 1);
    let too_small = sphere_marks(&plot, &surface(10.0, 10.0)).expect_err("no room");
    assert_eq!(too_small.code, "plot-size");
}

#[test]
fn the_front_view_shows_the_first_axis_in_the_middle() {
    // From the definition of the view: at azimuth 0 the viewer stands on +S1, S2 to
    // the right, S3 up.
    let view = View {
        azimuth: 0.0,
        elevation: 0.0,
    };
    let close = |a: [f64; 3], b: [f64; 3]| a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-15);
    assert!(close(view.project([1.0, 0.0, 0.0]), [0.0, 0.0, 1.0]));
    assert!(close(view.project([0.0, 1.0, 0.0]), [1.0, 0.0, 0.0]));
    assert!(close(view.project([0.0, 0.0, 1.0]), [0.0, 1.0, 0.0]));
}

#[test]
fn the_image_of_a_depolarizer_is_drawn_to_scale() {
    // diag(1, 0.5, 0.5, 0.5) shrinks the sphere to half (definition).
    let mut mueller = [0.0; 16];
    for (k, v) in [(0, 1.0), (5, 0.5), (10, 0.5), (15, 0.5)] {
        mueller[k] = v;
    }
    let plot = sphere(mueller, 0.7, 0.4);
    let svg = sphere_svg(&plot, &surface(300.0, 340.0), &Theme::light(), "t", "d").expect("a plot");
    let document = Document::parse(&svg).expect("well-formed XML");
    let ball = nodes(&document, "circle").next().expect("the ball");
    let centre = (number(&ball, "cx") / UNITS, number(&ball, "cy") / UNITS);
    let radius = number(&ball, "r") / UNITS;
    let outline = nodes(&document, "polygon")
        .map(|p| points(&p))
        .max_by_key(Vec::len)
        .expect("a silhouette");
    assert!(outline.len() > 40);
    for (x, y) in outline {
        let ratio = (x - centre.0).hypot(y - centre.1) / radius;
        assert!((ratio - 0.5).abs() < 0.003, "{ratio}");
    }
}

#[test]
fn the_image_of_a_diattenuator_is_the_whole_sphere() {
    // A pure diattenuator maps the fully polarized states onto themselves
    // (Lu & Chipman 1996), however unevenly.
    let d = 0.999_f64;
    let g = (1.0 - d * d).sqrt();
    let mueller = [
        1.0, d, 0.0, 0.0, d, 1.0, 0.0, 0.0, 0.0, 0.0, g, 0.0, 0.0, 0.0, 0.0, g,
    ];
    let svg = sphere_svg(
        &sphere(mueller, 0.7, 0.4),
        &surface(300.0, 340.0),
        &Theme::light(),
        "t",
        "d",
    )
    .expect("a plot");
    let document = Document::parse(&svg).expect("well-formed XML");
    let ball = nodes(&document, "circle").next().expect("the ball");
    let radius = number(&ball, "r") / UNITS;
    let outline = nodes(&document, "polygon")
        .map(|p| points(&p))
        .max_by_key(Vec::len)
        .expect("a silhouette");
    let area: f64 = (0..outline.len())
        .map(|k| {
            let (a, b) = (outline[k], outline[(k + 1) % outline.len()]);
            (a.0 * b.1 - a.1 * b.0) / 2.0
        })
        .sum();
    let whole = std::f64::consts::PI * radius * radius;
    assert!((area.abs() / whole - 1.0).abs() < 0.01, "{}", area / whole);
}

#[test]
fn degenerate_images_are_a_point_or_a_line() {
    let mut blind = [0.0; 16];
    blind[0] = 1.0;
    let mut axis = blind;
    axis[5] = 0.7;
    for (mueller, most) in [(blind, 0.1), (axis, 200.0)] {
        let svg = sphere_svg(
            &sphere(mueller, -0.96, 0.4),
            &surface(300.0, 340.0),
            &Theme::light(),
            "t",
            "d",
        )
        .expect("a plot");
        let document = Document::parse(&svg).expect("well-formed XML");
        let outputs = &circles(&document, 4.0, true)[..6];
        let farthest = outputs
            .iter()
            .flat_map(|a| outputs.iter().map(move |b| (a.0 - b.0).hypot(a.1 - b.1)))
            .fold(0.0, f64::max);
        assert!(farthest < most, "{farthest}");
    }
}

/// The tip of the field at a phase, from the Jones vector of a fully polarized state
/// and `S3 = 2 Im(Ex* Ey)` with exp(+iωt): x to the right, y up.
fn field(stokes: &[f64; 4], phase: f64) -> (f64, f64) {
    let p = stokes[1].hypot(stokes[2]).hypot(stokes[3]);
    let ex = ((p + stokes[1]) / 2.0).max(0.0).sqrt();
    let ey = ((p - stokes[1]) / 2.0).max(0.0).sqrt();
    let delay = stokes[3].atan2(stokes[2]);
    (ex * phase.cos(), ey * (phase + delay).cos())
}

#[test]
fn ellipses_are_the_path_of_the_field_and_heads_point_its_way() {
    let (c2, s2) = (0.9_f64.cos(), 0.9_f64.sin());
    for (azimuth2, ellipticity) in [
        (0.0, 0.3),
        (0.8, -0.25),
        (2.2, 0.6),
        (4.0, -0.7),
        (5.5, 0.78),
    ] {
        let (s, c) = f64::sin_cos(azimuth2);
        let (up, flat) = f64::sin_cos(2.0 * ellipticity);
        let stokes = [2.0, 2.0 * flat * c, 2.0 * flat * s, 2.0 * up];
        let plot = EllipsesPlot {
            states: vec![EllipsePair {
                label: "A".to_owned(),
                input: [1.0, c2, s2, 0.0],
                output: stokes,
            }],
            convention: Convention::default(),
        };
        let svg =
            ellipses_svg(&plot, &surface(200.0, 150.0), &Theme::light(), "t", "d").expect("a plot");
        let document = Document::parse(&svg).expect("well-formed XML");
        let polygons: Vec<_> = nodes(&document, "polygon").map(|p| points(&p)).collect();
        // The output, right of the middle, is the larger outline with its heads.
        let outline = polygons
            .iter()
            .find(|p| p.len() > 50 && p[0].0 > 100.0)
            .expect("an ellipse");
        let count = outline.len() as f64;
        let middle = outline[..outline.len() - 1]
            .iter()
            .fold((0.0, 0.0), |m, p| {
                (m.0 + p.0 / (count - 1.0), m.1 + p.1 / (count - 1.0))
            });
        let size = outline
            .iter()
            .map(|p| (p.0 - middle.0).hypot(p.1 - middle.1))
            .fold(0.0, f64::max);
        let scale = size / (2.0_f64.sqrt() * ellipticity.cos());
        let path: Vec<(f64, f64)> = (0..720)
            .map(|k| field(&stokes, TAU * f64::from(k) / 720.0))
            .map(|(x, y)| (middle.0 + scale * x, middle.1 - scale * y))
            .collect();
        for place in &path {
            let off = outline
                .iter()
                .map(|p| (p.0 - place.0).hypot(p.1 - place.1))
                .fold(f64::INFINITY, f64::min);
            assert!(off < 1.2, "{off} pixels off the path");
        }
        let heads: Vec<_> = polygons
            .iter()
            .filter(|p| p.len() < 8 && p[0].0 > 100.0)
            .collect();
        assert!(!heads.is_empty());
        for head in heads {
            let nearest = (0..720)
                .min_by(|&a, &b| {
                    let off = |k: usize| (path[k].0 - head[2].0).hypot(path[k].1 - head[2].1);
                    off(a).total_cmp(&off(b))
                })
                .expect("a place");
            let (before, after) = (path[nearest], path[(nearest + 1) % 720]);
            let along = (after.0 - before.0) * (head[0].0 - head[2].0)
                + (after.1 - before.1) * (head[0].1 - head[2].1);
            assert!(along > 0.0, "a head points against the field");
        }
    }
}

#[test]
fn degrees_stand_under_the_pairs() {
    let mut weak = [0.0; 16];
    for (k, v) in [(0, 2.0), (5, 1.0), (10, 0.5), (15, 0.25)] {
        weak[k] = v;
    }
    let svg = ellipses_svg(
        &pairs(&weak),
        &surface(820.0, 140.0),
        &Theme::light(),
        "t",
        "d",
    )
    .expect("a plot");
    // Derived: |diagonal| / m00.
    for (shown, times) in [("0.500", 2), ("0.250", 2), ("0.125", 2)] {
        assert_eq!(svg.matches(shown).count(), times, "{shown}");
    }
    let mut blind = [0.0; 16];
    blind[0] = 1.0;
    let svg = ellipses_svg(
        &pairs(&blind),
        &surface(320.0, 220.0),
        &Theme::light(),
        "t",
        "d",
    )
    .expect("a plot");
    assert_eq!(svg.matches("unpolarized").count(), 6);
    let dark = EllipsesPlot {
        states: vec![EllipsePair {
            label: "V".to_owned(),
            input: INPUTS[1],
            output: [0.0; 4],
        }],
        convention: Convention::default(),
    };
    let svg =
        ellipses_svg(&dark, &surface(200.0, 140.0), &Theme::light(), "t", "d").expect("a plot");
    assert!(svg.contains("no light"));
}

#[test]
fn descriptions_state_the_finding() {
    let plot = eigenvalues([1.0042, 0.0014, -0.0018, -0.0038], Some([0.0021; 4]));
    let words = eigenvalues_description(&plot).expect("words");
    assert!(words.contains("λ4 = −0.0038 ± 0.0021"), "{words}");
    assert!(words.contains("Two are negative"), "{words}");
    // 0.0038 / 0.0021 = 1.81.
    assert!(words.contains("1.8 standard errors below zero"), "{words}");
    let words =
        eigenvalues_description(&eigenvalues([1.0, 1e-17, 0.0, -1e-17], None)).expect("words");
    assert!(words.contains("None is negative"), "{words}");

    let words = sphere_description(&sphere(FILM, 0.0, 0.0)).expect("words");
    // (0.0190 + 0.6733)/(0.9550 + 0.0226) = 0.7082.
    assert!(words.contains("H becomes (0.708, "), "{words}");
    // A horizontal polarizer blocks V (definition).
    let mut polarizer = [0.0; 16];
    for k in [0, 1, 4, 5] {
        polarizer[k] = 0.5;
    }
    let words = sphere_description(&sphere(polarizer, 0.0, 0.0)).expect("words");
    assert!(words.contains("V is blocked"), "{words}");
    assert!(
        words.contains("+45° becomes (1.000, 0.000, 0.000)"),
        "{words}"
    );

    // Rounded to zero, a number has no sign.
    let mut blind = [0.0; 16];
    (blind[0], blind[4], blind[8]) = (1.0, -1e-9, -0.0);
    let words = sphere_description(&sphere(blind, 0.0, 0.0)).expect("words");
    assert!(words.contains("H becomes (0.000, 0.000, 0.000)"), "{words}");

    // A quarter-wave retarder, fast axis x: S2 to −S3 (physics of section 3, derived).
    let mut quarter = [0.0; 16];
    for (k, v) in [(0, 1.0), (5, 1.0), (11, 1.0), (14, -1.0)] {
        quarter[k] = v;
    }
    let words = ellipses_description(&pairs(&quarter)).expect("words");
    assert!(
        words.contains("+45° becomes circular, counter-clockwise, degree 1.000"),
        "{words}"
    );
    assert!(words.contains("R becomes linear at 45.0°"), "{words}");
}

#[test]
fn ellipses_are_told_in_the_angles_of_the_person() {
    // Light at 2ψ = 0.8, 2χ = 0.5 in the canonical convention; derived: counted
    // clockwise the azimuth is 180° − ψ, counted from y it is 90° more, and only the
    // sign of S3 turns the sign of χ. The sense is of the field, whoever counts.
    let ((s, c), (up, flat)) = (f64::sin_cos(0.8), f64::sin_cos(0.5));
    let told = |convention| {
        let plot = EllipsesPlot {
            states: vec![EllipsePair {
                label: "A".to_owned(),
                input: INPUTS[0],
                output: [1.0, flat * c, flat * s, up],
            }],
            convention,
        };
        ellipses_description(&plot).expect("words")
    };
    let usual = Convention::default();
    // ψ = 0.4 rad = 22.92°, χ = 0.25 rad = 14.32°.
    for (convention, azimuth, ellipticity) in [
        (usual, "22.9°", "14.3°"),
        (
            Convention {
                angles: AngleSense::Clockwise,
                ..usual
            },
            "157.1°",
            "14.3°",
        ),
        (
            Convention {
                zero_angle: ZeroAngle::Y,
                ..usual
            },
            "112.9°",
            "14.3°",
        ),
        (
            Convention {
                positive_s3: PositiveS3::Counterclockwise,
                ..usual
            },
            "22.9°",
            "−14.3°",
        ),
    ] {
        let expected =
            format!("elliptical at {azimuth}, ellipticity {ellipticity}, clockwise, degree 1.000");
        let words = told(convention);
        assert!(words.contains(&expected), "{words}");
    }
}

#[test]
fn any_finite_input_is_drawn() {
    let spread = [
        0.0,
        -0.0,
        1.0,
        -1.0,
        1e-18,
        5e-324,
        1e-300,
        -1e-300,
        1e300,
        -1e300,
        f64::MAX,
    ];
    let sizes = [(40.0, 40.0), (320.0, 200.0), (820.0, 184.0), (8192.0, 60.0)];
    let mut quads: Vec<[f64; 4]> = Vec::new();
    for a in spread {
        quads.push([a; 4]);
        for b in spread {
            quads.push([a, b, -b, b / 3.0]);
            quads.push([1.0 + a.clamp(-1.0, 1.0) * 1e-15, 1.0, b, a]);
        }
    }
    for (k, quad) in quads.iter().enumerate() {
        let (width, height) = sizes[k % sizes.len()];
        let surface = surface(width, height);
        for error in [
            None,
            Some(quad.map(f64::abs)),
            Some([1e-12, 0.0, 1e300, 1.0]),
        ] {
            let plot = eigenvalues(*quad, error);
            let words = eigenvalues_description(&plot).expect("words");
            assert!(!words.contains("NaN") && !words.contains("inf"), "{words}");
            let svg = eigenvalues_svg(&plot, &surface, &Theme::light(), "t", &words);
            let svg = svg.unwrap_or_else(|e| panic!("{quad:?} {error:?}: {e}"));
            check_document_of_any_size(&svg);
        }
        let pair = EllipsePair {
            label: "A".to_owned(),
            input: *quad,
            output: quad.map(|v| -v),
        };
        let plot = EllipsesPlot {
            states: vec![pair; 1 + k % 7],
            convention: Convention::default(),
        };
        let words = ellipses_description(&plot).expect("words");
        assert!(!words.contains("NaN") && !words.contains("inf"), "{words}");
        let svg = ellipses_svg(&plot, &surface, &Theme::dark(), "t", &words).expect("a plot");
        check_document_of_any_size(&svg);

        let mut mueller: [f64; 16] = std::array::from_fn(|j| quad[(j * 7 + k) % 4]);
        mueller[0] = 1.0;
        let plot = sphere(mueller, quad[0] % 1e9, quad[1]);
        match sphere_svg(&plot, &surface, &Theme::print(), "t", "d") {
            Ok(svg) => check_document_of_any_size(&svg),
            Err(error) => assert_eq!(error.code, "not-finite"),
        }
        if let Ok(words) = sphere_description(&plot) {
            assert!(!words.contains("NaN") && !words.contains("inf"), "{words}");
        }
    }
}

fn check_document_of_any_size(svg: &str) {
    Document::parse(svg).expect("well-formed XML");
    assert!(!svg.contains("NaN") && !svg.contains("inf"));
    assert!(svg.len() < 2_000_000, "{} bytes", svg.len());
}

#[test]
fn what_cannot_be_drawn_is_an_error() {
    let theme = Theme::light();
    let size = surface(400.0, 200.0);
    for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        let plot = eigenvalues([1.0, 0.0, bad, 0.0], None);
        let error = eigenvalues_svg(&plot, &size, &theme, "t", "d").expect_err("not finite");
        assert_eq!(error.code, "not-finite");
        assert_eq!(error.at, Some(Place::Field("eigenvalues[2]".to_owned())));
        let plot = eigenvalues([1.0, 0.0, 0.0, 0.0], Some([0.1, bad, 0.1, 0.1]));
        assert!(eigenvalues_svg(&plot, &size, &theme, "t", "d").is_err());
        assert!(eigenvalues_description(&plot).is_err());
        let mut mueller = FILM;
        mueller[7] = bad;
        let error = sphere_svg(&sphere(mueller, 0.0, 0.0), &size, &theme, "t", "d")
            .expect_err("not finite");
        assert_eq!(error.at, Some(Place::Field("mueller[7]".to_owned())));
        assert!(sphere_svg(&sphere(FILM, bad, 0.0), &size, &theme, "t", "d").is_err());
        let mut plot = pairs(&FILM);
        plot.states[3].output[1] = bad;
        let error = ellipses_svg(&plot, &size, &theme, "t", "d").expect_err("not finite");
        assert_eq!(
            error.at,
            Some(Place::Field("states[3].output[1]".to_owned()))
        );
        for broken in [surface(bad, 200.0), surface(200.0, bad)] {
            let error = ellipses_svg(&pairs(&FILM), &broken, &theme, "t", "d");
            assert_eq!(error.expect_err("no size").code, "plot-size");
        }
    }
    let plot = eigenvalues([1.0, 0.0, 0.0, 0.0], Some([0.1, -0.1, 0.1, 0.1]));
    let error = eigenvalues_svg(&plot, &size, &theme, "t", "d").expect_err("negative");
    assert_eq!(error.code, "negative-error");
    for intensity in [0.0, -1.0] {
        let mut mueller = FILM;
        mueller[0] = intensity;
        let error = sphere_svg(&sphere(mueller, 0.0, 0.0), &size, &theme, "t", "d")
            .expect_err("no intensity");
        assert_eq!(error.code, "no-intensity");
    }
    let none = EllipsesPlot {
        states: Vec::new(),
        convention: Convention::default(),
    };
    let error = ellipses_svg(&none, &size, &theme, "t", "d").expect_err("nothing");
    assert_eq!(error.code, "no-states");
}

#[test]
fn every_document_is_well_formed_and_drawn_alike_twice() {
    let title = "A <b> & \"c\" 'd' \u{0}\u{1f}";
    let shown = "A <b> & \"c\" 'd' \u{fffd}\u{fffd}";
    for theme in [Theme::light(), Theme::dark(), Theme::print()] {
        for width in [320.0, 820.0] {
            let draw = || {
                let plot = eigenvalues([1.0042, 0.0014, -0.0018, -0.0038], Some([0.0021; 4]));
                let first = eigenvalues_svg(
                    &plot,
                    &surface(width, eigenvalues_height(width)),
                    &theme,
                    title,
                    title,
                );
                let mut hostile = pairs(&FILM);
                hostile.states[0].label = title.to_owned();
                let size = surface(width, ellipses_height(width));
                let second = ellipses_svg(&hostile, &size, &theme, title, title);
                let size = surface(width, sphere_height(width));
                let third = sphere_svg(&sphere(FILM, -0.96, 0.4), &size, &theme, title, title);
                [first, second, third].map(|svg| svg.expect("a plot"))
            };
            let documents = draw();
            for svg in &documents {
                check_document(svg, shown, shown);
            }
            assert_eq!(documents, draw());
        }
    }
}

/// Relative luminance contrast (WCAG 2.2, 1.4.3).
fn contrast(a: (u8, u8, u8), b: (u8, u8, u8)) -> f64 {
    let luminance = |(r, g, b): (u8, u8, u8)| {
        let linear = |v: u8| {
            let v = f64::from(v) / 255.0;
            if v <= 0.04045 {
                v / 12.92
            } else {
                ((v + 0.055) / 1.055).powf(2.4)
            }
        };
        0.2126 * linear(r) + 0.7152 * linear(g) + 0.0722 * linear(b)
    };
    let (a, b) = (luminance(a) + 0.05, luminance(b) + 0.05);
    a.max(b) / a.min(b)
}

#[test]
fn text_and_marks_stand_out() {
    for theme in [Theme::light(), Theme::dark(), Theme::print()] {
        for ground in [theme.background, theme.panel] {
            assert!(contrast(theme.ink, ground) >= 4.5);
            assert!(contrast(theme.mute, ground) >= 4.5);
            assert!(contrast(theme.accent, ground) >= 3.0);
            // Common practice, no source: a graticule that is seen, and stays behind.
            let graticule = contrast(theme.line, ground);
            assert!((1.5..3.0).contains(&graticule), "{graticule}");
        }
    }
}

fn curves(points: Vec<[f64; 2]>) -> CurvesPlot {
    CurvesPlot {
        along: "along".to_owned(),
        upwards: "upwards".to_owned(),
        curves: vec![Curve {
            name: String::new(),
            points,
            is_dots: false,
        }],
        levels: vec![Named {
            name: "level".to_owned(),
            value: 3.84,
        }],
        places: Vec::new(),
    }
}

/// *Derived*: two tick labels of each axis give its scale, and the scale gives every point of
/// the curve its value back, to a pixel.
#[test]
fn curves_lie_where_the_tick_labels_say() {
    for (shift, stretch) in [(0.0, 1.0), (250.0, 0.01), (-3.0, 40.0)] {
        let expected: Vec<[f64; 2]> = (-8..=8)
            .map(|k| {
                let t = f64::from(k) / 4.0;
                [shift + stretch * t, t * t]
            })
            .collect();
        let plot = curves(expected.clone());
        let size = surface(600.0, curves_height(600.0));
        let svg = curves_svg(&plot, &size, &Theme::print(), "title", "words").unwrap();
        let document = Document::parse(&svg).unwrap();
        let labels: Vec<(f64, f64, f64)> = nodes(&document, "text")
            .filter_map(|node| {
                let value = value_of(&content(&node))?;
                Some((
                    number(&node, "x") / UNITS,
                    number(&node, "y") / UNITS,
                    value,
                ))
            })
            .collect();
        // Those of the lower axis share a height, those of the other its right edge.
        let lowest = labels.iter().map(|label| label.1).fold(0.0, f64::max);
        let along: Vec<_> = labels
            .iter()
            .filter(|label| lowest - label.1 < 1.0)
            .collect();
        let upwards: Vec<_> = labels
            .iter()
            .filter(|label| lowest - label.1 > 1.0)
            .collect();
        let curve = nodes(&document, "polyline")
            .map(|node| points(&node))
            .find(|points| points.len() == expected.len())
            .unwrap();
        let scale = |at: [f64; 2], value: [f64; 2], place: f64| {
            value[0] + (place - at[0]) / (at[1] - at[0]) * (value[1] - value[0])
        };
        let (left, right) = (along[0], along[along.len() - 1]);
        let (low, high) = (upwards[0], upwards[upwards.len() - 1]);
        for ([x, y], (px, py)) in expected.iter().zip(curve) {
            // Labels are centred on their tick along, and beside it upwards, half a letter low.
            let found = scale([left.0, right.0], [left.2, right.2], px);
            assert!((found - x).abs() < 0.01 * 4.0 * stretch, "{found}, not {x}");
            let found = scale([low.1, high.1], [low.2, high.2], py);
            assert!((found - y).abs() < 0.12, "{found}, not {y}");
        }
        assert!(svg.contains(">\nlevel\n<"));
    }
}

#[test]
fn curves_refuse_what_cannot_be_drawn_and_say_what_they_show() {
    let size = surface(400.0, 220.0);
    let draw = |plot: &CurvesPlot| curves_svg(plot, &size, &Theme::light(), "t", "d");
    let code = |plot: &CurvesPlot| draw(plot).unwrap_err().code;
    assert_eq!(code(&curves(Vec::new())), "nothing-to-draw");
    assert_eq!(code(&curves(vec![[f64::NAN, 0.0]])), "not-finite");
    assert_eq!(code(&curves(vec![[0.0, f64::INFINITY]])), "not-finite");
    let mut many = curves(vec![[0.0, 1.0]]);
    many.curves = vec![many.curves[0].clone(); 9];
    assert_eq!(code(&many), "too-many");
    for points in [
        vec![[0.0, 0.0]],
        vec![[1e300, -1e300], [-1e300, 1e300]],
        vec![[1e-300, 0.0], [2e-300, 1e-320]],
        vec![[5.0, 1e18], [5.0, 1e18]],
    ] {
        check_document_of_any_size(&draw(&curves(points)).unwrap());
    }
    let words = curves_description(&curves(vec![[1.0, 4.0], [2.0, 0.5], [3.0, 6.0]])).unwrap();
    assert!(
        words.contains("least at 2.000 with 0.5000, and largest at 3.000 with 6.000"),
        "{words}"
    );
    assert!(words.contains("level: 3.840"), "{words}");
}
