//! What comes from JavaScript.

use serde::Deserialize;
use serde::de::DeserializeOwned;
use serde_json::{Map, Value};
use wasm_bindgen::JsValue;

use super::convert::to_js_error;
use super::value;
use crate::convention::{AngleSense, Convention, PositiveS3, TimeSign, ZeroAngle};
use crate::error::{Error, Result};
use crate::mueller::Mueller;
use crate::noise::{Measurement, Noise};
use crate::text::{DecimalMark, Delimiter, ReadOptions};

/// Decodes a request; `undefined` and `null` are an empty one.
pub fn from_js<T: DeserializeOwned>(value: &JsValue) -> std::result::Result<T, JsValue> {
    decode(value).map_err(|error| to_js_error(&error))
}

fn decode<T: DeserializeOwned>(value: &JsValue) -> Result<T> {
    let value = match value::from_js(value) {
        // `undefined` is no plain value.
        _ if value.is_undefined() || value.is_null() => Value::Object(Map::new()),
        converted => converted?,
    };
    serde_path_to_error::deserialize(value).map_err(|error| {
        let path = error.path().to_string();
        let message = error.inner().to_string();
        let code = if message.starts_with("unknown field") {
            "unknown-field"
        } else if message.starts_with("missing field") {
            "missing-field"
        } else if message.starts_with("unknown variant") {
            "unknown-choice"
        } else {
            "bad-request"
        };
        let error = Error::new(code, format!("The request is not understood: {message}."));
        if path == "." {
            error
        } else {
            error.at_field(path)
        }
    })
}

#[derive(Deserialize, Clone, Copy, Default)]
#[serde(rename_all = "lowercase")]
enum Rotation {
    #[default]
    Counterclockwise,
    Clockwise,
}

#[derive(Deserialize, Clone, Copy, Default)]
#[serde(rename_all = "lowercase")]
enum Axis {
    #[default]
    X,
    Y,
}

#[derive(Deserialize, Clone, Copy, Default)]
#[serde(rename_all = "lowercase")]
enum Sign {
    #[default]
    Plus,
    Minus,
}

#[derive(Deserialize, Clone, Copy, Default, PartialEq)]
#[serde(rename_all = "lowercase")]
enum Order {
    #[default]
    Rows,
    Columns,
}

#[derive(Deserialize, Clone, Copy, Default)]
#[serde(rename_all = "camelCase", deny_unknown_fields, default)]
pub struct ConventionTwin {
    angles: Rotation,
    positive_s3: Option<Rotation>,
    zero_angle: Axis,
    time: Sign,
    order: Order,
}

impl ConventionTwin {
    pub fn convention(self) -> Convention {
        Convention {
            angles: match self.angles {
                Rotation::Counterclockwise => AngleSense::Counterclockwise,
                Rotation::Clockwise => AngleSense::Clockwise,
            },
            positive_s3: match self.positive_s3 {
                Some(Rotation::Counterclockwise) => PositiveS3::Counterclockwise,
                _ => PositiveS3::Clockwise,
            },
            zero_angle: match self.zero_angle {
                Axis::X => ZeroAngle::X,
                Axis::Y => ZeroAngle::Y,
            },
            time: match self.time {
                Sign::Plus => TimeSign::Plus,
                Sign::Minus => TimeSign::Minus,
            },
        }
    }

    /// The sixteen numbers, laid out as the convention says, in the canonical one.
    pub fn canonical(self, elements: &[f64; 16]) -> Result<Mueller> {
        let given = Mueller::from_row_major(elements)?;
        let rows = match self.order {
            Order::Rows => given,
            Order::Columns => given.transpose(),
        };
        Ok(self.convention().mueller(&rows))
    }
}

#[derive(Deserialize, Default)]
#[serde(rename_all = "camelCase", tag = "kind", deny_unknown_fields)]
enum NoiseTwin {
    #[default]
    None,
    Uniform {
        sigma: f64,
    },
    Rounding {
        decimals: u32,
    },
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
pub struct ExamineRequest {
    mueller: [f64; 16],
    #[serde(default)]
    normalised: bool,
    #[serde(default)]
    absolute: bool,
    #[serde(default)]
    convention: ConventionTwin,
    #[serde(default)]
    noise: NoiseTwin,
    #[serde(default = "default_draws")]
    draws: u32,
    #[serde(default = "default_seed")]
    seed: u64,
}

fn default_draws() -> u32 {
    2000
}

fn default_seed() -> u64 {
    1
}

impl ExamineRequest {
    pub fn measurement(&self) -> Result<(Measurement, Convention)> {
        let noise = match self.noise {
            NoiseTwin::None => Noise::None,
            NoiseTwin::Uniform { sigma } => Noise::Uniform { sigma },
            NoiseTwin::Rounding { decimals } => Noise::Rounding { decimals },
        };
        let mueller = self.convention.canonical(&self.mueller)?;
        let measurement = Measurement::new(mueller, self.normalised, self.absolute, noise)?;
        Ok((measurement, self.convention.convention()))
    }

    /// `None` where no draws were asked for.
    pub fn seed(&self) -> Option<u64> {
        (self.draws > 0).then_some(self.seed)
    }
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
pub struct FormatRequest {
    pub value: f64,
    #[serde(default)]
    pub se: Option<f64>,
}

#[derive(Deserialize, Default)]
#[serde(rename_all = "camelCase", deny_unknown_fields, default)]
pub struct ReadRequest {
    decimal: Option<DecimalTwin>,
    delimiter: Option<DelimiterTwin>,
}

#[derive(Deserialize, Clone, Copy)]
#[serde(rename_all = "lowercase")]
enum DecimalTwin {
    Point,
    Comma,
}

#[derive(Deserialize, Clone, Copy)]
#[serde(rename_all = "lowercase")]
enum DelimiterTwin {
    Tab,
    Semicolon,
    Comma,
    Space,
}

impl From<ReadRequest> for ReadOptions {
    fn from(request: ReadRequest) -> Self {
        Self {
            decimal: request.decimal.map(|mark| match mark {
                DecimalTwin::Point => DecimalMark::Point,
                DecimalTwin::Comma => DecimalMark::Comma,
            }),
            delimiter: request.delimiter.map(|delimiter| match delimiter {
                DelimiterTwin::Tab => Delimiter::Tab,
                DelimiterTwin::Semicolon => Delimiter::Semicolon,
                DelimiterTwin::Comma => Delimiter::Comma,
                DelimiterTwin::Space => Delimiter::Space,
            }),
        }
    }
}
