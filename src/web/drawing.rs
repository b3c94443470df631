//! Plots on a canvas, and the same as SVG text.

use serde::{Deserialize, Serialize};
use wasm_bindgen::prelude::*;
use web_sys::HtmlCanvasElement;

use super::convert::{to_js, to_js_error};
use super::request::{ConventionTwin, from_js};
use crate::convention::{Convention, PositiveS3, ZeroAngle};
use crate::error::Result as EngineResult;
use crate::mueller::Mueller;
use crate::plot::{
    self, EigenvaluePlot, EllipsePair, EllipsesPlot, SpherePlot, Surface, Theme, View,
};
use crate::state::Stokes;

/// Size and colours, alike for every plot.
#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
struct Frame {
    width: f64,
    height: Option<f64>,
    #[serde(default = "one")]
    ratio: f64,
    #[serde(default)]
    theme: ThemeTwin,
}

#[derive(Deserialize, Default, Clone, Copy)]
#[serde(rename_all = "lowercase")]
enum ThemeTwin {
    #[default]
    Light,
    Dark,
    Print,
}

fn one() -> f64 {
    1.0
}

impl Frame {
    fn surface(&self, natural_height: fn(f64) -> f64) -> Surface {
        Surface {
            width: self.width,
            height: self.height.unwrap_or_else(|| natural_height(self.width)),
            ratio: self.ratio,
        }
    }

    fn theme(&self) -> Theme {
        match self.theme {
            ThemeTwin::Light => Theme::light(),
            ThemeTwin::Dark => Theme::dark(),
            ThemeTwin::Print => Theme::print(),
        }
    }
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
struct EigenvaluesRequest {
    eigenvalues: [f64; 4],
    #[serde(default)]
    eigenvalue_se: Option<[f64; 4]>,
    frame: Frame,
}

impl EigenvaluesRequest {
    fn plot(&self) -> EigenvaluePlot {
        EigenvaluePlot {
            eigenvalues: self.eigenvalues,
            standard_error: self.eigenvalue_se,
        }
    }
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
struct SphereRequest {
    mueller: [f64; 16],
    #[serde(default)]
    convention: ConventionTwin,
    azimuth_deg: f64,
    elevation_deg: f64,
    frame: Frame,
}

impl SphereRequest {
    fn plot(&self) -> EngineResult<SpherePlot> {
        let convention = self.convention.convention();
        let canonical = self.convention.canonical(&self.mueller)?;
        let mut labels = ["H", "V", "+45°", "\u{2212}45°", "R", "L"].map(str::to_owned);
        if convention.zero_angle == ZeroAngle::Y {
            labels.swap(0, 1);
        }
        if convention.positive_s3 == PositiveS3::Counterclockwise {
            labels.swap(4, 5);
        }
        Ok(SpherePlot {
            mueller: convention.mueller(&canonical).row_major(),
            view: View {
                azimuth: self.azimuth_deg.to_radians(),
                elevation: self.elevation_deg.to_radians(),
            },
            labels,
        })
    }
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
struct EllipsesRequest {
    mueller: [f64; 16],
    #[serde(default)]
    convention: ConventionTwin,
    frame: Frame,
}

impl EllipsesRequest {
    fn plot(&self) -> EngineResult<EllipsesPlot> {
        let convention = self.convention.convention();
        let canonical = self.convention.canonical(&self.mueller)?;
        let states = standard_states(&convention)
            .into_iter()
            .map(|(label, input)| pair(label, input, &canonical))
            .collect::<EngineResult<_>>()?;
        Ok(EllipsesPlot { states })
    }
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

fn thrown<T>(result: EngineResult<T>) -> Result<T, JsValue> {
    result.map_err(|error| to_js_error(&error))
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
    let request: EigenvaluesRequest = from_js(request)?;
    let (plot, theme) = (request.plot(), request.frame.theme());
    let surface = request.frame.surface(plot::eigenvalues_height);
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
    let request: EigenvaluesRequest = from_js(request)?;
    let plot = request.plot();
    let surface = request.frame.surface(plot::eigenvalues_height);
    let description = thrown(plot::eigenvalues_description(&plot))?;
    thrown(plot::eigenvalues_svg(
        &plot,
        &surface,
        &request.frame.theme(),
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
    let request: SphereRequest = from_js(request)?;
    let (plot, theme) = (thrown(request.plot())?, request.frame.theme());
    let surface = request.frame.surface(plot::sphere_height);
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
    let request: SphereRequest = from_js(request)?;
    let plot = thrown(request.plot())?;
    let surface = request.frame.surface(plot::sphere_height);
    let description = thrown(plot::sphere_description(&plot))?;
    thrown(plot::sphere_svg(
        &plot,
        &surface,
        &request.frame.theme(),
        "Poincaré sphere",
        &description,
    ))
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
    let request: EllipsesRequest = from_js(request)?;
    let (plot, theme) = (thrown(request.plot())?, request.frame.theme());
    let surface = request.frame.surface(plot::ellipses_height);
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
    let request: EllipsesRequest = from_js(request)?;
    let plot = thrown(request.plot())?;
    let surface = request.frame.surface(plot::ellipses_height);
    let description = thrown(plot::ellipses_description(&plot))?;
    thrown(plot::ellipses_svg(
        &plot,
        &surface,
        &request.frame.theme(),
        "Polarization ellipses",
        &description,
    ))
}
