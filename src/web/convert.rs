//! Results, errors and notes on their way to JavaScript.

use js_sys::Reflect;
use serde::Serialize;
use wasm_bindgen::JsValue;

use crate::error::{Error, Note, Place, Severity};
use crate::text::{Alternative, DecimalMark, Delimiter, MatricesRead, MatrixRead, ReadingDescription};

/// Plain objects and arrays; `None` as `null`.
pub fn to_js<T: Serialize>(value: &T) -> Result<JsValue, JsValue> {
    let serializer = serde_wasm_bindgen::Serializer::new()
        .serialize_missing_as_null(true)
        .serialize_maps_as_objects(true);
    value.serialize(&serializer).map_err(JsValue::from)
}

/// A JavaScript `Error` with `code`, `message` and `at`.
pub fn to_js_error(error: &Error) -> JsValue {
    let thrown = js_sys::Error::new(&error.message);
    let at = error
        .at
        .as_ref()
        .and_then(|place| to_js(&PlaceTwin::from(place)).ok())
        .unwrap_or(JsValue::NULL);
    for (name, value) in [("code", JsValue::from_str(error.code)), ("at", at)] {
        // Setting a member of a fresh object does not fail.
        let _ = Reflect::set(&thrown, &JsValue::from_str(name), &value);
    }
    thrown.into()
}

#[derive(Serialize)]
#[serde(untagged)]
enum PlaceTwin {
    Field {
        field: String,
    },
    Text {
        line: usize,
        character: usize,
        length: usize,
    },
}

impl From<&Place> for PlaceTwin {
    fn from(place: &Place) -> Self {
        match place {
            Place::Field(field) => Self::Field { field: field.clone() },
            &Place::Text { line, character, length } => Self::Text { line, character, length },
        }
    }
}

#[derive(Serialize)]
struct NoteTwin {
    severity: &'static str,
    code: &'static str,
    message: String,
    at: Option<PlaceTwin>,
}

impl From<&Note> for NoteTwin {
    fn from(note: &Note) -> Self {
        Self {
            severity: match note.severity {
                Severity::Information => "information",
                Severity::Warning => "warning",
                Severity::Refusal => "refusal",
            },
            code: note.code,
            message: note.message.clone(),
            at: note.at.as_ref().map(PlaceTwin::from),
        }
    }
}
