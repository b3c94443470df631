//! Results, errors and notes on their way to JavaScript.

use js_sys::Reflect;
use serde::Serialize;
use wasm_bindgen::JsValue;

use crate::error::{Error, Note, Place, Severity};
use crate::text::{
    Alternative, DecimalMark, Delimiter, Form, MatricesRead, MatrixRead, ReadingDescription,
    Stacking,
};

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
            Place::Field(field) => Self::Field {
                field: field.clone(),
            },
            &Place::Text {
                line,
                character,
                length,
            } => Self::Text {
                line,
                character,
                length,
            },
        }
    }
}

/// Something to tell the person.
#[derive(Serialize)]
pub struct NoteTwin {
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

/// What a text holds.
#[derive(Serialize)]
pub struct MatricesTwin {
    matrices: Vec<MatrixTwin>,
    reading: ReadingTwin,
    alternatives: Vec<AlternativeTwin>,
    notes: Vec<NoteTwin>,
}

#[derive(Serialize)]
struct MatrixTwin {
    mueller: [f64; 16],
    sigma: Option<[f64; 16]>,
    coordinate: Option<f64>,
    label: Option<String>,
    line: usize,
    decimals: Option<u32>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct ReadingTwin {
    form: &'static str,
    decimal_char: char,
    group_char: Option<char>,
    delimiter: Option<&'static str>,
    stacking: Option<&'static str>,
    order: &'static str,
    header_row_count: usize,
    count: usize,
}

#[derive(Serialize)]
struct AlternativeTwin {
    reading: ReadingTwin,
    matrices: Vec<MatrixTwin>,
}

impl From<&MatricesRead> for MatricesTwin {
    fn from(read: &MatricesRead) -> Self {
        Self {
            matrices: matrices(&read.matrices),
            reading: reading(&read.reading, read.matrices.len()),
            alternatives: read
                .alternatives
                .iter()
                .map(|other: &Alternative| AlternativeTwin {
                    reading: reading(&other.reading, other.matrices.len()),
                    matrices: matrices(&other.matrices),
                })
                .collect(),
            notes: read.notes.iter().map(NoteTwin::from).collect(),
        }
    }
}

fn matrices(read: &[MatrixRead]) -> Vec<MatrixTwin> {
    read.iter()
        .map(|one| MatrixTwin {
            mueller: one.mueller,
            sigma: one.sigma,
            coordinate: one.coordinate,
            label: one.label.clone(),
            line: one.line,
            decimals: one.decimals,
        })
        .collect()
}

fn reading(reading: &ReadingDescription, count: usize) -> ReadingTwin {
    ReadingTwin {
        form: match reading.form {
            Form::Table => "table",
            Form::Brackets => "brackets",
            Form::BracketsWithSemicolons => "bracketsWithSemicolons",
            Form::Binary => "binary",
        },
        decimal_char: reading.decimal.char(),
        group_char: reading.grouped.then_some(match reading.decimal {
            DecimalMark::Point => ',',
            DecimalMark::Comma => '.',
        }),
        delimiter: reading.delimiter.map(|delimiter| match delimiter {
            Delimiter::Tab => "tab",
            Delimiter::Semicolon => "semicolon",
            Delimiter::Comma => "comma",
            Delimiter::Space => "space",
        }),
        stacking: reading.stacking.map(|stacking| match stacking {
            Stacking::First => "first",
            Stacking::Last => "last",
        }),
        // A flat sixteen looks the same either way: the convention decides.
        order: "rows",
        header_row_count: reading.header_row_count,
        count,
    }
}
