//! Plots on a canvas, and the same as SVG text.

use serde::Serialize;
use serde_json::Value;
use wasm_bindgen::prelude::*;
use web_sys::HtmlCanvasElement;

use super::convert::to_js;
use super::request::{ConventionRead, items, plain};
use super::thrown;
use crate::convention::{Convention, PositiveS3, ZeroAngle};
use crate::error::Result as EngineResult;
use crate::json::Fields;
use crate::mueller::Mueller;
use crate::plot::{
    self, Curve, CurvesPlot, EigenvaluePlot, EllipsePair, EllipsesPlot, Named, SpherePlot, Surface,
    Theme, View,
};
use crate::state::Stokes;
use crate::tolerance;

/// Size and colours, alike for every plot.
struct Frame {
    surface: Surface,
    theme: Theme,
}

impl Frame {
    fn of(request: &Fields, natural_height: fn(f64) -> f64) -> EngineResult<Self> {
        let fields = request.object("frame", &["width", "height", "ratio", "theme", "colours"])?;
        let fields = request.required("frame", fields)?;
        let width = fields.required("width", fields.number("width")?)?;
        let height = fields.number("height")?;
        let theme = fields.choice("theme", &[("light", 0), ("dark", 1), ("print", 2)])?;
        let mut theme = match theme {
            Some(1) => Theme::dark(),
            Some(2) => Theme::print(),
            _ => Theme::light(),
        };
        let names = [
            "background",
            "panel",
            "ink",
            "mute",
            "line",
            "accent",
            "hatch",
        ];
        if let Some(colours) = fields.object("colours", &names)? {
            let places = [
                &mut theme.background,
                &mut theme.panel,
                &mut theme.ink,
                &mut theme.mute,
                &mut theme.line,
                &mut theme.accent,
                &mut theme.hatch,
            ];
            for (name, place) in names.into_iter().zip(places) {
                if let Some(parts) = colours.numbers::<3>(name)? {
                    let [red, green, blue] = parts.map(|part| part.clamp(0.0, 255.0) as u8);
                    *place = (red, green, blue);
                }
            }
        }
        Ok(Self {
            surface: Surface {
                width,
                height: height.unwrap_or_else(|| natural_height(width)),
                ratio: fields.number("ratio")?.unwrap_or(1.0),
            },
            theme,
        })
    }
}

fn eigenvalues_request(request: &JsValue) -> EngineResult<(EigenvaluePlot, Frame)> {
    let request: Value = plain(request)?;
    let fields = Fields::of(&request, "", &["eigenvalues", "eigenvalueSe", "frame"])?;
    let eigenvalues = fields.required("eigenvalues", fields.numbers("eigenvalues")?)?;
    let plot = EigenvaluePlot {
        eigenvalues,
        standard_error: fields.numbers("eigenvalueSe")?,
    };
    Ok((plot, Frame::of(&fields, plot::eigenvalues_height)?))
}

fn sphere_request(request: &JsValue) -> EngineResult<(SpherePlot, Frame)> {
    let request = plain(request)?;
    let known = [
        "mueller",
        "convention",
        "azimuthDeg",
        "elevationDeg",
        "chosen",
        "path",
        "frame",
    ];
    let fields = Fields::of(&request, "", &known)?;
    let read = ConventionRead::of(&fields)?;
    let convention = read.convention;
    let mut labels = ["H", "V", "+45°", "\u{2212}45°", "R", "L"].map(str::to_owned);
    if convention.zero_angle == ZeroAngle::Y {
        labels.swap(0, 1);
    }
    if convention.positive_s3 == PositiveS3::Counterclockwise {
        labels.swap(4, 5);
    }
    let chosen = fields.text("chosen")?;
    let chosen = chosen.and_then(|name| labels.iter().position(|label| label == name));
    let angle = |name| -> EngineResult<f64> {
        Ok(fields.required(name, fields.number(name)?)?.to_radians())
    };
    let plot = SpherePlot {
        mueller: convention.mueller(&read.mueller(&fields)?).row_major(),
        view: View {
            azimuth: angle("azimuthDeg")?,
            elevation: angle("elevationDeg")?,
        },
        labels,
        chosen,
        path: path_of(&fields)?,
    };
    Ok((plot, Frame::of(&fields, plot::sphere_height)?))
}

/// States in the person's convention, in which the sphere is shown.
fn path_of(fields: &Fields) -> EngineResult<Vec<[f64; 3]>> {
    let states = items(fields, "path")?;
    let wrong = |k: usize| {
        let sentence = "A state on the sphere is three numbers.";
        fields.error("bad-request", &format!("path[{k}]"), sentence)
    };
    states
        .iter()
        .enumerate()
        .map(|(k, state)| {
            let parts = state.as_array().ok_or_else(|| wrong(k))?;
            let parts: Vec<f64> = parts.iter().filter_map(Value::as_f64).collect();
            <[f64; 3]>::try_from(parts).map_err(|_| wrong(k))
        })
        .collect()
}

fn ellipses_request(request: &JsValue) -> EngineResult<(EllipsesPlot, Frame)> {
    let request = plain(request)?;
    let fields = Fields::of(&request, "", &["mueller", "convention", "frame"])?;
    let read = ConventionRead::of(&fields)?;
    let canonical = read.mueller(&fields)?;
    let states = standard_states(&read.convention)
        .into_iter()
        .map(|(label, input)| pair(label, input, &canonical))
        .collect::<EngineResult<_>>()?;
    Ok((
        EllipsesPlot {
            states,
            convention: read.convention,
        },
        Frame::of(&fields, plot::ellipses_height)?,
    ))
}

/// The title beside the plot: curves are of many things.
fn curves_request(request: &JsValue) -> EngineResult<(CurvesPlot, String, Frame)> {
    let request = plain(request)?;
    let known = [
        "title", "along", "upwards", "curves", "levels", "places", "frame",
    ];
    let fields = Fields::of(&request, "", &known)?;
    let title = fields.text("title")?.unwrap_or_default().to_owned();
    let text = |name| Ok(fields.required(name, fields.text(name)?)?.to_owned());
    let mut plot = CurvesPlot {
        along: text("along")?,
        upwards: text("upwards")?,
        curves: Vec::new(),
        levels: named(&fields, "levels")?,
        places: named(&fields, "places")?,
    };
    for (k, curve) in items(&fields, "curves")?.iter().enumerate() {
        let path = format!("curves[{k}]");
        let curve = Fields::of(curve, &path, &["name", "x", "y", "dots"])?;
        let (x, y) = (numbers(&curve, "x")?, numbers(&curve, "y")?);
        if x.len() != y.len() {
            return Err(curve.error("bad-request", "y", "There must be a y for each x."));
        }
        plot.curves.push(Curve {
            name: curve.text("name")?.unwrap_or_default().to_owned(),
            points: x.into_iter().zip(y).map(|(x, y)| [x, y]).collect(),
            is_dots: curve.flag("dots")?.unwrap_or_default(),
        });
    }
    Ok((plot, title, Frame::of(&fields, plot::curves_height)?))
}

fn named(fields: &Fields, name: &str) -> EngineResult<Vec<Named>> {
    items(fields, name)?
        .iter()
        .enumerate()
        .map(|(k, item)| {
            let path = format!("{name}[{k}]");
            let item = Fields::of(item, &path, &["name", "value"])?;
            Ok(Named {
                name: item.text("name")?.unwrap_or_default().to_owned(),
                value: item.required("value", item.number("value")?)?,
            })
        })
        .collect()
}

fn numbers(fields: &Fields, name: &str) -> EngineResult<Vec<f64>> {
    items(fields, name)?
        .iter()
        .map(|item| {
            item.as_f64().ok_or_else(|| {
                fields.error(
                    "bad-request",
                    name,
                    &format!("'{name}' must be a list of numbers."),
                )
            })
        })
        .collect()
}

/// Horizontal, vertical, the person's two diagonals, clockwise, counter-clockwise:
/// canonical Stokes vectors.
fn standard_states(convention: &Convention) -> [(&'static str, [f64; 4]); 6] {
    let diagonal = convention.azimuth(std::f64::consts::FRAC_PI_4);
    let plus = if diagonal < std::f64::consts::FRAC_PI_2 {
        1.0
    } else {
        -1.0
    };
    [
        ("H", [1.0, 1.0, 0.0, 0.0]),
        ("V", [1.0, -1.0, 0.0, 0.0]),
        ("+45°", [1.0, 0.0, plus, 0.0]),
        ("\u{2212}45°", [1.0, 0.0, -plus, 0.0]),
        ("R", [1.0, 0.0, 0.0, 1.0]),
        ("L", [1.0, 0.0, 0.0, -1.0]),
    ]
}

fn pair(label: &str, input: [f64; 4], canonical: &Mueller) -> EngineResult<EllipsePair> {
    Ok(EllipsePair {
        label: label.to_owned(),
        input,
        output: canonical.apply(&Stokes::new(input)?).components(),
    })
}

/// What becomes of the six standard inputs, in the person's convention.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(js_name = mapStates, unchecked_return_type = "MappedState[]")]
pub fn map_states(
    #[wasm_bindgen(unchecked_param_type = "MapStatesRequest")] request: &JsValue,
) -> Result<JsValue, JsValue> {
    let mapped = || {
        let request = plain(request)?;
        let fields = Fields::of(&request, "", &["mueller", "convention"])?;
        let read = ConventionRead::of(&fields)?;
        let canonical = read.mueller(&fields)?;
        let [a, b, c, d, ..] = canonical.row_major().map(f64::abs);
        let brightest = a + b + c + d;
        standard_states(&read.convention)
            .into_iter()
            .map(|(label, input)| {
                let input = Stokes::new(input)?;
                let mut output = canonical.apply(&input);
                // What rounding leaves of blocked light has no state.
                if output.intensity().abs() <= tolerance::ZERO * brightest {
                    output = Stokes::new([0.0; 4])?;
                }
                Ok(MappedTwin {
                    label,
                    input: StateTwin::new(&input, &read.convention),
                    output: StateTwin::new(&output, &read.convention),
                })
            })
            .collect::<EngineResult<Vec<_>>>()
    };
    to_js(&thrown(mapped())?)
}

#[derive(Serialize)]
struct MappedTwin {
    label: &'static str,
    input: StateTwin,
    output: StateTwin,
}

/// A state in the person's convention.
#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub struct StateTwin {
    pub stokes: [f64; 4],
    pub degree: Option<f64>,
    pub azimuth_deg: Option<f64>,
    pub ellipticity_deg: Option<f64>,
}

impl StateTwin {
    pub fn new(state: &Stokes, convention: &Convention) -> Self {
        let ellipse = state.ellipse();
        Self {
            stokes: convention.stokes(state).components(),
            degree: state.degree_of_polarization(),
            azimuth_deg: ellipse
                .azimuth
                .map(|azimuth| convention.azimuth(azimuth).to_degrees()),
            ellipticity_deg: ellipse
                .ellipticity
                .map(|ellipticity| convention.circular(ellipticity).to_degrees()),
        }
    }
}

#[derive(Serialize)]
struct Drawn {
    description: String,
    width: f64,
    height: f64,
}

fn drawn(surface: &Surface, description: String) -> Result<JsValue, JsValue> {
    to_js(&Drawn {
        description,
        width: surface.width,
        height: surface.height,
    })
}

/// Draws the coherency eigenvalues.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = drawEigenvalues, unchecked_return_type = "Drawn")]
pub fn draw_eigenvalues(
    canvas: &HtmlCanvasElement,
    #[wasm_bindgen(unchecked_param_type = "EigenvaluesRequest")] request: &JsValue,
) -> Result<JsValue, JsValue> {
    let (plot, Frame { surface, theme }) = thrown(eigenvalues_request(request))?;
    thrown(plot::on_canvas(canvas, &surface, |area| {
        plot::draw_eigenvalues(area, &plot, &theme)
    }))?;
    drawn(&surface, thrown(plot::eigenvalues_description(&plot))?)
}

/// The coherency eigenvalues as SVG.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = eigenvaluesSvg)]
pub fn eigenvalues_svg(
    #[wasm_bindgen(unchecked_param_type = "EigenvaluesRequest")] request: &JsValue,
) -> Result<String, JsValue> {
    let (plot, Frame { surface, theme }) = thrown(eigenvalues_request(request))?;
    let description = thrown(plot::eigenvalues_description(&plot))?;
    thrown(plot::eigenvalues_svg(
        &plot,
        &surface,
        &theme,
        "Coherency eigenvalues",
        &description,
    ))
}

/// Draws the Poincaré sphere.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = drawSphere, unchecked_return_type = "Drawn")]
pub fn draw_sphere(
    canvas: &HtmlCanvasElement,
    #[wasm_bindgen(unchecked_param_type = "SphereRequest")] request: &JsValue,
) -> Result<JsValue, JsValue> {
    let (plot, Frame { surface, theme }) = thrown(sphere_request(request))?;
    thrown(plot::on_canvas(canvas, &surface, |area| {
        plot::draw_sphere(area, &plot, &theme)
    }))?;
    drawn(&surface, thrown(plot::sphere_description(&plot))?)
}

/// The Poincaré sphere as SVG.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = sphereSvg)]
pub fn sphere_svg(
    #[wasm_bindgen(unchecked_param_type = "SphereRequest")] request: &JsValue,
) -> Result<String, JsValue> {
    let (plot, Frame { surface, theme }) = thrown(sphere_request(request))?;
    let description = thrown(plot::sphere_description(&plot))?;
    thrown(plot::sphere_svg(
        &plot,
        &surface,
        &theme,
        "Poincaré sphere",
        &description,
    ))
}

/// Where the marks of the six standard states are on the sphere's picture.
///
/// # Errors
/// As [`draw_sphere`].
#[wasm_bindgen(js_name = sphereMarks, unchecked_return_type = "SphereMark[]")]
pub fn sphere_marks(
    #[wasm_bindgen(unchecked_param_type = "SphereRequest")] request: &JsValue,
) -> Result<JsValue, JsValue> {
    let (plot, Frame { surface, .. }) = thrown(sphere_request(request))?;
    let marks = thrown(plot::sphere_marks(&plot, &surface))?;
    let twins: Vec<MarkTwin> = plot
        .labels
        .into_iter()
        .zip(marks)
        .map(|(label, plot::SphereMark { input, output })| MarkTwin {
            label,
            input,
            output,
        })
        .collect();
    to_js(&twins)
}

#[derive(Serialize)]
struct MarkTwin {
    label: String,
    input: (f64, f64),
    output: Option<(f64, f64)>,
}

/// Draws the polarization ellipses of six standard states, before and after.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = drawEllipses, unchecked_return_type = "Drawn")]
pub fn draw_ellipses(
    canvas: &HtmlCanvasElement,
    #[wasm_bindgen(unchecked_param_type = "EllipsesRequest")] request: &JsValue,
) -> Result<JsValue, JsValue> {
    let (plot, Frame { surface, theme }) = thrown(ellipses_request(request))?;
    thrown(plot::on_canvas(canvas, &surface, |area| {
        plot::draw_ellipses(area, &plot, &theme)
    }))?;
    drawn(&surface, thrown(plot::ellipses_description(&plot))?)
}

/// The polarization ellipses as SVG.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = ellipsesSvg)]
pub fn ellipses_svg(
    #[wasm_bindgen(unchecked_param_type = "EllipsesRequest")] request: &JsValue,
) -> Result<String, JsValue> {
    let (plot, Frame { surface, theme }) = thrown(ellipses_request(request))?;
    let description = thrown(plot::ellipses_description(&plot))?;
    thrown(plot::ellipses_svg(
        &plot,
        &surface,
        &theme,
        "Polarization ellipses",
        &description,
    ))
}

/// Draws curves over one axis.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = drawCurves, unchecked_return_type = "Drawn")]
pub fn draw_curves(
    canvas: &HtmlCanvasElement,
    #[wasm_bindgen(unchecked_param_type = "CurvesRequest")] request: &JsValue,
) -> Result<JsValue, JsValue> {
    let (plot, _, Frame { surface, theme }) = thrown(curves_request(request))?;
    thrown(plot::on_canvas(canvas, &surface, |area| {
        plot::draw_curves(area, &plot, &theme)
    }))?;
    drawn(&surface, thrown(plot::curves_description(&plot))?)
}

/// Curves over one axis as SVG.
///
/// # Errors
/// For values or sizes that can't be drawn.
#[wasm_bindgen(js_name = curvesSvg)]
pub fn curves_svg(
    #[wasm_bindgen(unchecked_param_type = "CurvesRequest")] request: &JsValue,
) -> Result<String, JsValue> {
    let (plot, title, Frame { surface, theme }) = thrown(curves_request(request))?;
    let description = thrown(plot::curves_description(&plot))?;
    thrown(plot::curves_svg(
        &plot,
        &surface,
        &theme,
        &title,
        &description,
    ))
}
