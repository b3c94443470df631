//! The wasm exports: decode, one engine call, encode. No physics here.
//!
//! Degrees, the person's convention and camelCase names live on this side. The
//! types that JavaScript sees stand in `types.d.ts`.

mod causes;
mod convert;
mod drawing;
mod examination;
mod fitting;
mod request;
mod train;
mod value;

use serde::Serialize;
use wasm_bindgen::prelude::*;

use crate::error::Result as EngineResult;
use crate::{coherency, examine, figures, link, stats, text};
use causes::{CauseTwin, ComparisonTwin, DiagnosisTwin};
use convert::{MatricesTwin, to_js, to_js_error};
use examination::ExaminationTwin;
use request::{
    ExamineRequest, compare_request, detect_request, export_request, format_request, plain,
    read_options,
};

#[wasm_bindgen(typescript_custom_section)]
const TYPES: &str = include_str!("types.d.ts");

type JsResult = Result<JsValue, JsValue>;

fn thrown<T>(result: EngineResult<T>) -> Result<T, JsValue> {
    result.map_err(|error| to_js_error(&error))
}

/// After a panic: the message goes to the console, where a trap alone says nothing,
/// and the next call starts a fresh instance.
#[wasm_bindgen(start)]
pub fn start() {
    std::panic::set_hook(Box::new(|info| {
        console_error_panic_hook::hook(info);
        wasm_bindgen::handler::schedule_reinit();
    }));
}

/// Reads matrices from pasted text.
///
/// # Errors
/// Where nothing can be read: the reason with line and character.
#[wasm_bindgen(js_name = parseMatrices, unchecked_return_type = "MatricesRead")]
pub fn parse_matrices(
    text: &str,
    #[wasm_bindgen(unchecked_param_type = "ReadOptions | undefined")] options: &JsValue,
) -> JsResult {
    let options = plain(options).and_then(|options| read_options(&options));
    let read = thrown(options.and_then(|options| text::parse_matrices(text, &options)))?;
    to_js(&MatricesTwin::from(&read))
}

/// Reads matrices from the bytes of a file: text in the usual encodings, or an array
/// that NumPy saved.
///
/// # Errors
/// Where nothing can be read: the reason, with line and character in a text.
#[wasm_bindgen(js_name = parseFile, unchecked_return_type = "MatricesRead")]
pub fn parse_file(
    bytes: &[u8],
    #[wasm_bindgen(unchecked_param_type = "ReadOptions | undefined")] options: &JsValue,
) -> JsResult {
    let options = plain(options).and_then(|options| read_options(&options));
    let read = thrown(options.and_then(|options| text::parse_file(bytes, &options)))?;
    to_js(&MatricesTwin::from(&read))
}

/// The text of a file in UTF-8, UTF-16 or Windows-1252.
///
/// # Errors
/// `form-not-read` for what is no text.
#[wasm_bindgen(js_name = fileText)]
pub fn file_text(bytes: &[u8]) -> Result<String, JsValue> {
    thrown(text::decode(bytes)).map(|(text, _)| text)
}

/// Examines one measured matrix.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(unchecked_return_type = "Examination")]
pub fn examine(
    #[wasm_bindgen(unchecked_param_type = "ExamineRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| ExamineRequest::of(&request));
    let ExamineRequest {
        measurement,
        convention,
        simulation,
    } = thrown(request)?;
    let found = thrown(examine::examine_with(&measurement, simulation))?;
    to_js(&ExaminationTwin::new(&found, &measurement, &convention))
}

/// Looks for what may have gone wrong with a measurement: slow questions, on demand.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(unchecked_return_type = "Diagnosis")]
pub fn diagnose(
    #[wasm_bindgen(unchecked_param_type = "ExamineRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| ExamineRequest::of(&request));
    let ExamineRequest {
        measurement,
        convention,
        simulation,
    } = thrown(request)?;
    let seed = simulation.map_or(1, |simulation| simulation.seed);
    let causes = thrown(coherency::likely_causes(&measurement, seed))?;
    let exact = measurement.m00_is_exact();
    to_js(&DiagnosisTwin {
        explaining_sigma: thrown(coherency::explaining_sigma(
            measurement.mueller(),
            exact,
            seed,
        ))?,
        mirror_visible: thrown(coherency::mirror_is_visible(&measurement))?,
        causes: causes
            .iter()
            .map(|candidate| CauseTwin::new(candidate, &convention))
            .collect(),
    })
}

/// Compares two measurements, element by element and figure by figure.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(unchecked_return_type = "Comparison")]
pub fn compare(
    #[wasm_bindgen(unchecked_param_type = "CompareRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| compare_request(&request));
    let (first, second, convention) = thrown(request)?;
    let found = thrown(figures::compare(&first, &second))?;
    to_js(&ComparisonTwin::new(&found, &convention))
}

/// Fits candidate models to a measured matrix, and says which of them to take.
///
/// # Errors
/// For a request that is not understood, at its field; `no-m00`, `no-fit`.
#[wasm_bindgen(unchecked_return_type = "Fits")]
pub fn fit(#[wasm_bindgen(unchecked_param_type = "FitRequest")] request: &JsValue) -> JsResult {
    let request = plain(request).and_then(|request| fitting::fits(&request));
    to_js(&thrown(request)?)
}

/// How χ² rises where one parameter of a fit is held and the others are fitted again.
///
/// # Errors
/// As [`fit`], and `no-profile`.
#[wasm_bindgen(unchecked_return_type = "Profile")]
pub fn profile(
    #[wasm_bindgen(unchecked_param_type = "ProfileRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| fitting::profile(&request));
    to_js(&thrown(request)?)
}

/// A fit as a Python text that computes the fitted matrix again, with NumPy alone.
///
/// # Errors
/// As [`fit`].
#[wasm_bindgen(js_name = fitRecipe)]
pub fn fit_recipe(
    #[wasm_bindgen(unchecked_param_type = "RecipeRequest")] request: &JsValue,
) -> Result<String, JsValue> {
    thrown(plain(request).and_then(|request| fitting::recipe(&request)))
}

/// Simulated measurements of a fitted matrix, each fitted again: a slice of them.
///
/// # Errors
/// As [`fit`], and `no-bootstrap`.
#[wasm_bindgen(unchecked_return_type = "BootstrapSamples")]
pub fn bootstrap(
    #[wasm_bindgen(unchecked_param_type = "BootstrapRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| fitting::bootstrap(&request));
    to_js(&thrown(request)?)
}

/// What a noise can show, before anything is measured.
///
/// # Errors
/// For a σ that is not positive.
#[wasm_bindgen(unchecked_return_type = "Detectable")]
pub fn detectable(
    #[wasm_bindgen(unchecked_param_type = "DetectRequest")] request: &JsValue,
) -> JsResult {
    #[derive(Serialize)]
    #[serde(rename_all = "camelCase")]
    struct Twin {
        alpha_se: f64,
        alpha: f64,
        diattenuation: f64,
        mirror_margin: f64,
    }
    let request = plain(request).and_then(|request| detect_request(&request));
    let (sigma, exact) = thrown(request)?;
    let found = thrown(figures::detectable(sigma, exact))?;
    to_js(&Twin {
        alpha_se: found.alpha_se,
        alpha: found.alpha,
        diattenuation: found.diattenuation,
        mirror_margin: found.mirror_margin,
    })
}

/// Writes a value with its standard error, two digits of it.
///
/// # Errors
/// For values that are not finite.
#[wasm_bindgen(js_name = formatValue, unchecked_return_type = "FormattedValue")]
pub fn format_value(
    #[wasm_bindgen(unchecked_param_type = "FormatRequest")] request: &JsValue,
) -> JsResult {
    #[derive(Serialize)]
    struct Formatted {
        text: String,
        plain: String,
    }
    let request = plain(request).and_then(|request| format_request(&request));
    let value = thrown(request.and_then(|(value, se)| stats::rounded(value, se)))?;
    to_js(&Formatted {
        text: value.text,
        plain: value.plain,
    })
}

/// Writes matrices and tables for other programs, at full precision.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(js_name = exportText)]
pub fn export_text(
    #[wasm_bindgen(unchecked_param_type = "ExportRequest")] request: &JsValue,
) -> Result<String, JsValue> {
    let request = plain(request).and_then(|request| export_request(&request));
    thrown(request.and_then(|(form, content)| text::export_text(form, &content)))
}

/// Writes a configuration as the text behind the `#` of a link.
///
/// # Errors
/// For a configuration that is not valid, at its field.
#[wasm_bindgen(js_name = encodeLink)]
pub fn encode_link(
    #[wasm_bindgen(unchecked_param_type = "Configuration")] configuration: &JsValue,
) -> Result<String, JsValue> {
    thrown(value::from_js(configuration).and_then(|configuration| link::encode(&configuration)))
}

/// Reads what [`encode_link`] wrote, every bit of every number.
///
/// # Errors
/// For a fragment that is cut, damaged, foreign or newer, each with its code.
#[wasm_bindgen(js_name = decodeLink, unchecked_return_type = "Configuration")]
pub fn decode_link(fragment: &str) -> JsResult {
    thrown(link::decode(fragment)).map(|configuration| value::to_js(&configuration))
}

/// Writes a configuration as the text of a file.
///
/// # Errors
/// For a configuration that is not valid, at its field.
#[wasm_bindgen(js_name = encodeFile)]
pub fn encode_file(
    #[wasm_bindgen(unchecked_param_type = "Configuration")] configuration: &JsValue,
) -> Result<String, JsValue> {
    thrown(value::from_js(configuration).and_then(|read| link::write_file(&read)))
}

/// Reads what [`encode_file`] wrote, every bit of every number.
///
/// # Errors
/// For a text that is no configuration, with line and character, or is a newer one.
#[wasm_bindgen(js_name = decodeFile, unchecked_return_type = "Configuration")]
pub fn decode_file(text: &str) -> JsResult {
    thrown(link::read_file(text)).map(|configuration| value::to_js(&configuration))
}

/// Which engine this is.
///
/// # Errors
/// None in practice.
#[wasm_bindgen(js_name = engineInfo, unchecked_return_type = "EngineInfo")]
pub fn engine_info() -> JsResult {
    #[derive(Serialize)]
    struct Info {
        version: &'static str,
        schema: u32,
        blocks: &'static [&'static str],
    }
    to_js(&Info {
        version: env!("CARGO_PKG_VERSION"),
        schema: link::SCHEMA_VERSION,
        blocks: link::known_blocks(),
    })
}
