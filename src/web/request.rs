//! What comes from JavaScript.

use serde_json::{Map, Value};
use wasm_bindgen::JsValue;

use super::value;
use crate::convention::{AngleSense, Convention, PositiveS3, TimeSign, ZeroAngle};
use crate::error::Result;
use crate::json::Fields;
use crate::mueller::Mueller;
use crate::noise::{Measurement, Noise};
use crate::text::{DecimalMark, Delimiter, ReadOptions, Stacking};

/// A request as a plain value; `undefined` and `null` are an empty one.
pub fn plain(value: &JsValue) -> Result<Value> {
    if value.is_undefined() || value.is_null() {
        return Ok(Value::Object(Map::new()));
    }
    value::from_js(value)
}

/// A person's convention and the order of the sixteen numbers.
#[derive(Clone, Copy)]
pub struct ConventionRead {
    pub convention: Convention,
    by_columns: bool,
}

impl ConventionRead {
    /// The member `convention`, with what is left out as in the canonical one.
    pub fn of(request: &Fields) -> Result<Self> {
        let known = ["angles", "positiveS3", "zeroAngle", "time", "order"];
        let Some(fields) = request.object("convention", &known)? else {
            return Ok(Self {
                convention: Convention::default(),
                by_columns: false,
            });
        };
        let angles = [
            ("counterclockwise", AngleSense::Counterclockwise),
            ("clockwise", AngleSense::Clockwise),
        ];
        let senses = [
            ("clockwise", PositiveS3::Clockwise),
            ("counterclockwise", PositiveS3::Counterclockwise),
        ];
        let convention = Convention {
            angles: fields.choice("angles", &angles)?.unwrap_or_default(),
            positive_s3: fields.choice("positiveS3", &senses)?.unwrap_or_default(),
            zero_angle: fields
                .choice("zeroAngle", &[("x", ZeroAngle::X), ("y", ZeroAngle::Y)])?
                .unwrap_or_default(),
            time: fields
                .choice(
                    "time",
                    &[("plus", TimeSign::Plus), ("minus", TimeSign::Minus)],
                )?
                .unwrap_or_default(),
        };
        let by_columns = fields.choice("order", &[("rows", false), ("columns", true)])?;
        Ok(Self {
            convention,
            by_columns: by_columns.unwrap_or_default(),
        })
    }

    /// The member `mueller`, laid out as the convention says, in the canonical one.
    pub fn mueller(&self, request: &Fields) -> Result<Mueller> {
        let elements = request.required("mueller", request.numbers("mueller")?)?;
        let given = Mueller::from_row_major(&elements)?;
        let rows = if self.by_columns {
            given.transpose()
        } else {
            given
        };
        Ok(self.convention.mueller(&rows))
    }
}

/// What `examine` is asked.
pub struct ExamineRequest {
    pub measurement: Measurement,
    pub convention: Convention,
    /// `None` where no draws were asked for.
    pub seed: Option<u64>,
}

impl ExamineRequest {
    pub fn of(request: &Value) -> Result<Self> {
        let known = [
            "mueller",
            "normalised",
            "absolute",
            "convention",
            "noise",
            "draws",
            "seed",
        ];
        let fields = Fields::of(request, "", &known)?;
        let read = ConventionRead::of(&fields)?;
        let draws = fields.whole("draws")?.unwrap_or(2000);
        let seed = fields.whole("seed")?.unwrap_or(1);
        Ok(Self {
            measurement: Measurement::new(
                read.mueller(&fields)?,
                fields.flag("normalised")?.unwrap_or_default(),
                fields.flag("absolute")?.unwrap_or_default(),
                noise(&fields)?,
            )?,
            convention: read.convention,
            seed: (draws > 0).then_some(seed),
        })
    }
}

fn noise(request: &Fields) -> Result<Noise> {
    #[derive(Clone, Copy)]
    enum Kind {
        None,
        Uniform,
        Rounding,
    }
    let Some(fields) = request.object("noise", &["kind", "sigma", "decimals"])? else {
        return Ok(Noise::None);
    };
    let kinds = [
        ("none", Kind::None),
        ("uniform", Kind::Uniform),
        ("rounding", Kind::Rounding),
    ];
    Ok(
        match fields.required("kind", fields.choice("kind", &kinds)?)? {
            Kind::None => Noise::None,
            Kind::Uniform => Noise::Uniform {
                sigma: fields.required("sigma", fields.number("sigma")?)?,
            },
            Kind::Rounding => {
                let decimals = fields.required("decimals", fields.whole("decimals")?)?;
                Noise::Rounding {
                    decimals: u32::try_from(decimals).unwrap_or(u32::MAX),
                }
            }
        },
    )
}

/// A value and, perhaps, its standard error.
pub fn format_request(request: &Value) -> Result<(f64, Option<f64>)> {
    let fields = Fields::of(request, "", &["value", "se"])?;
    let value = fields.required("value", fields.number("value")?)?;
    Ok((value, fields.number("se")?))
}

/// What is settled about a text.
pub fn read_options(request: &Value) -> Result<ReadOptions> {
    let fields = Fields::of(request, "", &["decimal", "delimiter", "stacking"])?;
    Ok(ReadOptions {
        decimal: fields.choice(
            "decimal",
            &[("point", DecimalMark::Point), ("comma", DecimalMark::Comma)],
        )?,
        delimiter: fields.choice(
            "delimiter",
            &[
                ("tab", Delimiter::Tab),
                ("semicolon", Delimiter::Semicolon),
                ("comma", Delimiter::Comma),
                ("space", Delimiter::Space),
            ],
        )?,
        stacking: fields.choice(
            "stacking",
            &[("first", Stacking::First), ("last", Stacking::Last)],
        )?,
    })
}
