use serde::Deserialize;
use serde_json::{Map, Value};

use super::envelope::{open, seal};
use crate::error::{Error, Result};

/// The version of the configuration that this engine writes: its `v`.
pub const SCHEMA_VERSION: u32 = 1;

const LONGEST_LABEL: usize = 80;
const LONGEST_TEXT: usize = 200_000;
const DEEPEST: usize = 8;

/// The blocks of a configuration that this version understands. Others are kept as
/// they are.
#[must_use]
pub fn known_blocks() -> &'static [&'static str] {
    &[
        "v",
        "app",
        "task",
        "label",
        "measurement",
        "examine",
        "view",
    ]
}

/// Writes a configuration as a fragment, without the `#`.
///
/// # Errors
/// `bad-configuration` at the field that is wrong; `link-newer` for a `v` of the
/// future; `link-too-large`.
pub fn encode(configuration: &Value) -> Result<String> {
    let configuration = checked(configuration.clone())?;
    seal(&configuration.to_string())
}

/// Reads a fragment: every number as it was written, unknown blocks as they were.
///
/// # Errors
/// Those of [`open`] and [`encode`].
pub fn decode(fragment: &str) -> Result<Value> {
    let content = open(fragment)?;
    let configuration = serde_json::from_str(&content).map_err(|_| {
        Error::new(
            "link-damaged",
            "This link does not hold a Halfshade configuration.",
        )
    })?;
    checked(configuration)
}

/// Validated, labels made safe.
fn checked(configuration: Value) -> Result<Value> {
    let Value::Object(mut blocks) = configuration else {
        return Err(bad("A configuration is an object.", "configuration"));
    };
    match blocks.get("v").and_then(Value::as_f64) {
        Some(1.0) => {}
        Some(version) if version > f64::from(SCHEMA_VERSION) => {
            return Err(Error::new(
                "link-newer",
                "This link was made by a newer version of Halfshade than this page.",
            )
            .at_field("v"));
        }
        _ => return Err(bad("A configuration begins with its version, v: 1.", "v")),
    }
    for (name, block) in &mut blocks {
        match name.as_str() {
            "v" => {}
            "app" | "task" => short_text(block, name)?,
            "label" => {
                short_text(block, name)?;
                *block = Value::String(plain_label(block.as_str().unwrap_or_default()));
            }
            "measurement" => known::<Measurement>(block, name)?,
            "examine" => known::<Examine>(block, name)?,
            "view" => known::<Map<String, Value>>(block, name).and_then(|()| all_numbers(block))?,
            _ => bounded(block, name, 0)?,
        }
    }
    Ok(Value::Object(blocks))
}

/// Checks a block against its twin; the value itself stays, so that no digit moves.
fn known<'a, T: Deserialize<'a> + Checked>(block: &'a Value, name: &str) -> Result<()> {
    let twin: T = serde_path_to_error::deserialize(block).map_err(|error| {
        let path = error.path().to_string();
        let field = if path == "." {
            name.to_owned()
        } else {
            format!("{name}.{path}")
        };
        bad(
            &format!("The configuration is not understood: {}.", error.inner()),
            &field,
        )
    })?;
    twin.check()
        .map_err(|(sentence, field)| bad(sentence, &format!("{name}.{field}")))
}

trait Checked {
    fn check(&self) -> std::result::Result<(), (&'static str, &'static str)> {
        Ok(())
    }
}

impl Checked for Map<String, Value> {}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
#[expect(dead_code, reason = "the types alone are what is checked")]
struct Measurement {
    mueller: Option<[f64; 16]>,
    #[serde(default)]
    normalised: bool,
    #[serde(default)]
    absolute: bool,
    convention: Option<Convention>,
    noise: Option<Noise>,
    text: Option<String>,
    #[serde(default)]
    example: bool,
}

impl Checked for Measurement {
    fn check(&self) -> std::result::Result<(), (&'static str, &'static str)> {
        if self
            .text
            .as_ref()
            .is_some_and(|text| text.len() > LONGEST_TEXT)
        {
            return Err(("The pasted text is too long for a link.", "text"));
        }
        Ok(())
    }
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase", deny_unknown_fields)]
#[expect(dead_code, reason = "the types alone are what is checked")]
struct Convention {
    angles: Option<Sense>,
    positive_s3: Option<Sense>,
    zero_angle: Option<Axis>,
    time: Option<Sign>,
    order: Option<Order>,
}

#[derive(Deserialize)]
#[serde(rename_all = "lowercase")]
enum Sense {
    Clockwise,
    Counterclockwise,
}

#[derive(Deserialize)]
#[serde(rename_all = "lowercase")]
enum Axis {
    X,
    Y,
}

#[derive(Deserialize)]
#[serde(rename_all = "lowercase")]
enum Sign {
    Plus,
    Minus,
}

#[derive(Deserialize)]
#[serde(rename_all = "lowercase")]
enum Order {
    Rows,
    Columns,
}

/// Every statement of the schema, also those that later versions use.
#[derive(Deserialize)]
#[serde(rename_all = "camelCase", tag = "kind", deny_unknown_fields)]
#[expect(dead_code, reason = "the types alone are what is checked")]
enum Noise {
    None,
    Uniform { sigma: f64 },
    Relative { fraction: f64 },
    PerElement { sigma: [f64; 16] },
    Covariance { covariance: Vec<f64> },
    Rounding { decimals: f64 },
    Replicates { matrices: Vec<[f64; 16]> },
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
#[expect(dead_code, reason = "the types alone are what is checked")]
struct Examine {
    draws: f64,
    seed: f64,
}

impl Checked for Examine {}

fn all_numbers(block: &Value) -> Result<()> {
    match block
        .as_object()
        .into_iter()
        .flatten()
        .find(|(_, item)| !item.is_number())
    {
        None => Ok(()),
        Some((key, _)) => Err(bad("A view holds numbers only.", &format!("view.{key}"))),
    }
}

fn short_text(block: &Value, name: &str) -> Result<()> {
    match block.as_str() {
        Some(text) if text.chars().count() <= LONGEST_LABEL => Ok(()),
        _ => Err(bad("This must be a text of at most 80 characters.", name)),
    }
}

/// Without control characters and those that turn the direction of writing.
fn plain_label(label: &str) -> String {
    label
        .chars()
        .filter(|c| !c.is_control() && !matches!(c, '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{200e}' | '\u{200f}'))
        .collect()
}

/// An unknown block is kept, but not without bounds.
fn bounded(block: &Value, path: &str, depth: usize) -> Result<()> {
    if path.ends_with("__proto__") {
        return Err(bad("This name is not allowed.", path));
    }
    if depth > DEEPEST {
        return Err(bad("This block is nested too deeply.", path));
    }
    match block {
        Value::Array(items) => items
            .iter()
            .try_for_each(|item| bounded(item, path, depth + 1)),
        Value::Object(map) => map
            .iter()
            .try_for_each(|(key, item)| bounded(item, &format!("{path}.{key}"), depth + 1)),
        _ => Ok(()),
    }
}

fn bad(sentence: &str, field: &str) -> Error {
    Error::new("bad-configuration", sentence).at_field(field)
}
