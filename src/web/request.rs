//! What comes from JavaScript.

use serde_json::{Map, Value};
use wasm_bindgen::JsValue;

use super::value;
use crate::convention::{AngleSense, Convention, PositiveS3, TimeSign, ZeroAngle};
use crate::error::Result;
use crate::examine::Simulation;
use crate::json::Fields;
use crate::mueller::Mueller;
use crate::noise::{Measurement, Noise, Side, Systematic};
use crate::text::{
    Column, Content, DecimalMark, Delimiter, Entry, NamedMatrix, NamedTable, OutputForm,
    ReadOptions, Stacking,
};

/// What a noise statement of some kind may have.
const NOISE_PARTS: &[&str] = &[
    "kind",
    "sigma",
    "fraction",
    "covariance",
    "decimals",
    "matrices",
    "systematic",
];

/// Draws that take no longer than a minute.
const MOST_DRAWS: u32 = 100_000;

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

    /// Where the element number `k` of a matrix row by row stands in the person's
    /// sixteen.
    fn place(&self, k: usize) -> usize {
        if self.by_columns {
            4 * (k % 4) + k / 4
        } else {
            k
        }
    }

    /// The member `mueller`, laid out as the convention says, in the canonical one.
    pub fn mueller(&self, request: &Fields) -> Result<Mueller> {
        let elements = request.required("mueller", request.numbers("mueller")?)?;
        self.canonical(&elements)
    }

    fn canonical(&self, elements: &[f64; 16]) -> Result<Mueller> {
        let given = Mueller::from_row_major(elements)?;
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
    pub simulation: Option<Simulation>,
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
        let draws = u32::try_from(fields.whole("draws")?.unwrap_or(2000))
            .ok()
            .filter(|&draws| draws <= MOST_DRAWS)
            .ok_or_else(|| {
                fields.error(
                    "too-large",
                    "draws",
                    &format!("At most {MOST_DRAWS} draws can be asked for."),
                )
            })?;
        let seed = fields.whole("seed")?.unwrap_or(1);
        let (measurement, convention) = measurement_of(&fields)?;
        Ok(Self {
            measurement,
            convention,
            simulation: (draws > 0).then_some(Simulation { seed, draws }),
        })
    }
}

/// A measured matrix in the canonical convention, and the convention that it came in.
pub fn measurement_of(fields: &Fields) -> Result<(Measurement, Convention)> {
    let read = ConventionRead::of(fields)?;
    if let Some(matrices) = replicates(fields, &read)? {
        let measurement = Measurement::of_replicates(
            matrices,
            fields.flag("normalised")?.unwrap_or_default(),
            fields.flag("absolute")?.unwrap_or_default(),
        )?;
        return Ok((
            with_systematic(measurement, fields, &read)?,
            read.convention,
        ));
    }
    let measurement = Measurement::new(
        read.mueller(fields)?,
        fields.flag("normalised")?.unwrap_or_default(),
        fields.flag("absolute")?.unwrap_or_default(),
        noise(fields, &read)?,
    )?;
    Ok((
        with_systematic(measurement, fields, &read)?,
        read.convention,
    ))
}

/// With what the noise statement says of the instrument.
fn with_systematic(
    measurement: Measurement,
    request: &Fields,
    read: &ConventionRead,
) -> Result<Measurement> {
    let Some(noise) = request.object("noise", NOISE_PARTS)? else {
        return Ok(measurement);
    };
    let Some(fields) = noise.object("systematic", &["generator", "analyser", "darkSigma"])? else {
        return Ok(measurement);
    };
    measurement.with_systematic(Systematic {
        generator: side(&fields, "generator", read)?,
        analyser: side(&fields, "analyser", read)?,
        dark: fields.number("darkSigma")?.unwrap_or_default(),
    })
}

fn side(fields: &Fields, name: &str, read: &ConventionRead) -> Result<Side> {
    let known = [
        "retardanceDeg",
        "polarizerDeg",
        "retardanceSigmaDeg",
        "azimuthSigmaDeg",
        "contrastSigma",
    ];
    let usual = Side::default();
    let Some(side) = fields.object(name, &known)? else {
        return Ok(usual);
    };
    let radians = |name| Ok(side.number(name)?.map(f64::to_radians));
    let polarizer = radians("polarizerDeg")?.unwrap_or_default();
    Ok(Side {
        retardance: radians("retardanceDeg")?.unwrap_or(usual.retardance),
        polarizer: read.convention.azimuth(polarizer),
        retardance_error: radians("retardanceSigmaDeg")?.unwrap_or_default(),
        azimuth_error: radians("azimuthSigmaDeg")?.unwrap_or_default(),
        contrast_error: side.number("contrastSigma")?.unwrap_or_default(),
    })
}

/// The repeats of a measurement, whose own matrix is then `null`: their mean is meant.
fn replicates(fields: &Fields, read: &ConventionRead) -> Result<Option<Vec<Mueller>>> {
    let kind = fields.get("noise").and_then(|noise| noise.get("kind"));
    if kind.and_then(Value::as_str) != Some("replicates") {
        return Ok(None);
    }
    if !fields.get("mueller").is_none_or(Value::is_null) {
        return Err(fields.error(
            "bad-request",
            "mueller",
            "With repeats the matrix is their mean, and 'mueller' must be null.",
        ));
    }
    let known = ["kind", "matrices", "systematic"];
    let noise = fields.required("noise", fields.object("noise", &known)?)?;
    let given = noise.required("matrices", noise.get("matrices"))?;
    let wrong = || {
        noise.error(
            "bad-request",
            "matrices",
            "'matrices' must be a list of lists of 16 numbers.",
        )
    };
    let items = given.as_array().ok_or_else(wrong)?;
    items
        .iter()
        .map(|item| {
            let numbers: Vec<f64> = item
                .as_array()
                .into_iter()
                .flatten()
                .filter_map(Value::as_f64)
                .collect();
            let elements: [f64; 16] = numbers.try_into().map_err(|_| wrong())?;
            read.canonical(&elements)
        })
        .collect::<Result<_>>()
        .map(Some)
}

/// Two measurements, and the convention of the first.
pub fn compare_request(request: &Value) -> Result<(Measurement, Measurement, Convention)> {
    let known = ["mueller", "normalised", "absolute", "convention", "noise"];
    let fields = Fields::of(request, "", &["first", "second"])?;
    let one = |name| {
        let fields = fields.required(name, fields.object(name, &known)?)?;
        measurement_of(&fields)
    };
    let (first, convention) = one("first")?;
    let (second, _) = one("second")?;
    Ok((first, second, convention))
}

/// The noise statement, its elements laid out and signed as the person's, in the
/// canonical convention.
fn noise(request: &Fields, read: &ConventionRead) -> Result<Noise> {
    let known = [
        "kind",
        "sigma",
        "fraction",
        "covariance",
        "decimals",
        "systematic",
    ];
    let Some(fields) = request.object("noise", &known)? else {
        return Ok(Noise::None);
    };
    let kinds = [
        ("none", ""),
        ("uniform", "sigma"),
        ("relative", "fraction"),
        ("perElement", "sigma"),
        ("covariance", "covariance"),
        ("rounding", "decimals"),
    ];
    let kind = fields.choice("kind", &kinds.map(|(kind, part)| (kind, (kind, part))))?;
    let (kind, part) = fields.required("kind", kind)?;
    if let Some(other) = known
        .iter()
        .find(|&&name| !["kind", "systematic", part].contains(&name) && fields.get(name).is_some())
    {
        return Err(fields.error(
            "unknown-field",
            other,
            &format!("Noise of the kind '{kind}' has no '{other}'."),
        ));
    }
    Ok(match kind {
        "none" => Noise::None,
        "uniform" => Noise::Uniform {
            sigma: fields.required(part, fields.number(part)?)?,
        },
        "relative" => Noise::Relative {
            fraction: fields.required(part, fields.number(part)?)?,
        },
        "perElement" => {
            let given: [f64; 16] = fields.required(part, fields.numbers(part)?)?;
            Noise::PerElement {
                sigma: std::array::from_fn(|k| given[read.place(k)]),
            }
        }
        "covariance" => {
            let given: [f64; 256] = fields.required(part, fields.numbers(part)?)?;
            let signs = read.convention.element_signs();
            Noise::Covariance {
                covariance: Box::new(std::array::from_fn(|k| {
                    let (i, j) = (k / 16, k % 16);
                    signs[i] * signs[j] * given[16 * read.place(i) + read.place(j)]
                })),
            }
        }
        _ => {
            let decimals = fields.required(part, fields.whole(part)?)?;
            Noise::Rounding {
                decimals: u32::try_from(decimals).unwrap_or(u32::MAX),
            }
        }
    })
}

/// A value and, perhaps, its standard error.
pub fn format_request(request: &Value) -> Result<(f64, Option<f64>)> {
    let fields = Fields::of(request, "", &["value", "se"])?;
    let value = fields.required("value", fields.number("value")?)?;
    Ok((value, fields.number("se")?))
}

/// A σ over M00, and whether M00 is exact.
pub fn detect_request(request: &Value) -> Result<(f64, bool)> {
    let fields = Fields::of(request, "", &["sigma", "normalised"])?;
    let sigma = fields.required("sigma", fields.number("sigma")?)?;
    Ok((sigma, fields.flag("normalised")?.unwrap_or_default()))
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

/// What is to be written, and how.
pub fn export_request(request: &Value) -> Result<(OutputForm, Content)> {
    let fields = Fields::of(
        request,
        "",
        &["form", "title", "notes", "matrices", "tables"],
    )?;
    let forms = [
        ("tsv", OutputForm::Tsv),
        ("csv", OutputForm::Csv),
        ("csvEuropean", OutputForm::CsvEuropean),
        ("json", OutputForm::Json),
        ("latex", OutputForm::Latex),
        ("python", OutputForm::Python),
        ("matlab", OutputForm::Matlab),
    ];
    let form = fields.required("form", fields.choice("form", &forms)?)?;
    let mut content = Content {
        title: fields.text("title")?.unwrap_or_default().to_owned(),
        ..Content::default()
    };
    for (k, note) in items(&fields, "notes")?.iter().enumerate() {
        let note = note.as_str();
        let wrong = || {
            fields.error(
                "bad-request",
                &format!("notes[{k}]"),
                "This must be a text.",
            )
        };
        content.notes.push(note.ok_or_else(wrong)?.to_owned());
    }
    for (k, matrix) in items(&fields, "matrices")?.iter().enumerate() {
        let path = format!("matrices[{k}]");
        let matrix = Fields::of(matrix, &path, &["name", "unit", "mueller", "sigma"])?;
        content.matrices.push(NamedMatrix {
            name: matrix.required("name", matrix.text("name")?)?.to_owned(),
            unit: matrix.text("unit")?.map(str::to_owned),
            mueller: matrix.required("mueller", matrix.numbers("mueller")?)?,
            sigma: matrix.numbers("sigma")?,
        });
    }
    for (k, table) in items(&fields, "tables")?.iter().enumerate() {
        let path = format!("tables[{k}]");
        let table = Fields::of(table, &path, &["name", "columns"])?;
        let mut columns = Vec::new();
        for (i, column) in items(&table, "columns")?.iter().enumerate() {
            let path = format!("{path}.columns[{i}]");
            let column = Fields::of(column, &path, &["name", "unit", "values"])?;
            let mut values = Vec::new();
            for (j, value) in items(&column, "values")?.iter().enumerate() {
                let wrong = || {
                    column.error(
                        "bad-request",
                        &format!("values[{j}]"),
                        "This must be a number, a text or null.",
                    )
                };
                values.push(match value {
                    Value::Null => Entry::Nothing,
                    Value::String(text) => Entry::Text(text.clone()),
                    _ => Entry::Number(value.as_f64().ok_or_else(wrong)?),
                });
            }
            columns.push(Column {
                name: column.required("name", column.text("name")?)?.to_owned(),
                unit: column.text("unit")?.map(str::to_owned),
                values,
            });
        }
        content.tables.push(NamedTable {
            name: table.required("name", table.text("name")?)?.to_owned(),
            columns,
        });
    }
    Ok((form, content))
}

/// The items of a list; none where it is left out.
pub fn items<'a>(fields: &Fields<'a>, name: &str) -> Result<&'a [Value]> {
    match fields.get(name) {
        None | Some(Value::Null) => Ok(&[]),
        Some(Value::Array(items)) => Ok(items),
        Some(_) => Err(fields.error("bad-request", name, &format!("'{name}' must be a list."))),
    }
}
