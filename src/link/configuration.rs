use serde_json::Value;

use super::envelope::{open, seal};
use crate::error::{Error, Result};
use crate::json::Fields;
use crate::train::{Definition, Kind, Train};

/// The version of the configuration that this engine writes: its `v`.
pub const SCHEMA_VERSION: u32 = 1;

const LONGEST_LABEL: usize = 80;
const LONGEST_TEXT: usize = 200_000;
const LARGEST_FILE: usize = 16 << 20;
/// In a link; a file may hold more.
const MOST_VALUES: usize = 20_000;
const DEEPEST: usize = 8;
const MOST_MEMBERS: usize = 100;

/// Means something else than a name to JavaScript.
const FORBIDDEN: &str = "__proto__";

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
        "compareWith",
        "series",
        "dataFile",
        "examine",
        "fit",
        "train",
        "source",
        "pre",
        "post",
        "removal",
        "view",
    ]
}

/// Writes a configuration as a fragment, without the `#`.
///
/// # Errors
/// At the field that is wrong, with the codes of [`Fields`]; `link-newer` for a `v`
/// of the future; `link-too-large`.
pub fn encode(configuration: &Value) -> Result<String> {
    let content = checked(configuration.clone())?.to_string();
    few_values(&content)?;
    seal(&content)
}

/// Reads a fragment: every number as it was written, unknown blocks as they were.
///
/// # Errors
/// Those of [`open`] and [`encode`].
pub fn decode(fragment: &str) -> Result<Value> {
    let content = open(fragment)?;
    few_values(&content)?;
    let configuration = serde_json::from_str(&content).map_err(|_| {
        Error::new(
            "link-damaged",
            "This link does not hold a Halfshade configuration.",
        )
    })?;
    checked(configuration)
}

/// Writes a configuration as the text of a file: the same values, for people to read.
///
/// # Errors
/// Those of [`encode`].
pub fn write_file(configuration: &Value) -> Result<String> {
    let configuration = checked(configuration.clone())?;
    Ok(format!("{configuration:#}\n"))
}

/// Reads what [`write_file`] wrote.
///
/// # Errors
/// `file-damaged` for what is no JSON, `too-large`; else those of [`decode`].
pub fn read_file(text: &str) -> Result<Value> {
    if text.len() > LARGEST_FILE {
        return Err(Error::new(
            "too-large",
            "This file is larger than 16 MiB, which is more than is read at once.",
        ));
    }
    let configuration =
        serde_json::from_str(text.trim_start_matches('\u{feff}')).map_err(|error| {
            Error::new(
                "file-damaged",
                "This file does not hold a Halfshade configuration: here it stops being JSON.",
            )
            .at_text(error.line(), error.column().max(1), 1)
        })?;
    checked(configuration)
}

/// Values take memory and time each, and a few bytes may unpack to very many.
fn few_values(content: &str) -> Result<()> {
    let separators = content
        .bytes()
        .filter(|byte| matches!(byte, b',' | b'{' | b'['));
    if separators.count() > MOST_VALUES {
        return Err(Error::new(
            "link-too-large",
            "This is more than fits into a link: more than twenty thousand values.",
        ));
    }
    Ok(())
}

/// Validated, labels made safe. The values themselves stay, so that no digit moves.
fn checked(mut configuration: Value) -> Result<Value> {
    check(&configuration)?;
    if let Some(Value::String(label)) = configuration.get_mut("label") {
        *label = plain_label(label);
    }
    Ok(configuration)
}

fn check(configuration: &Value) -> Result<()> {
    let names: Vec<&str> = configuration
        .as_object()
        .into_iter()
        .flatten()
        .map(|(name, _)| name.as_str())
        .collect();
    few(&names, "configuration")?;
    let blocks = Fields::of(configuration, "", &names)?;
    match blocks.number("v")? {
        Some(1.0) => {}
        Some(version) if version > f64::from(SCHEMA_VERSION) => {
            return Err(blocks.error(
                "link-newer",
                "v",
                "This link was made by a newer version of Halfshade than this page.",
            ));
        }
        _ => {
            return Err(blocks.error(
                "bad-request",
                "v",
                "A configuration begins with its version, v: 1.",
            ));
        }
    }
    for name in ["app", "task", "label"] {
        if blocks
            .text(name)?
            .is_some_and(|text| text.chars().count() > LONGEST_LABEL)
        {
            return Err(blocks.error(
                "too-large",
                name,
                "This must be a text of at most 80 characters.",
            ));
        }
    }
    for name in ["measurement", "compareWith"] {
        measurement(&blocks, name)?;
    }
    series(&blocks)?;
    if let Some(file) = blocks.object("dataFile", &["name", "sha256"])? {
        file.text("name")?;
        file.text("sha256")?;
    }
    if let Some(examine) = blocks.object("examine", &["draws", "seed"])? {
        examine.whole("draws")?;
        examine.whole("seed")?;
    }
    fit(&blocks)?;
    optics(&blocks)?;
    if let Some(view) = blocks.get("view") {
        let names: Vec<&str> = view
            .as_object()
            .into_iter()
            .flatten()
            .map(|(name, _)| name.as_str())
            .collect();
        few(&names, "view")?;
        let view = Fields::of(view, "view", &names)?;
        for name in names {
            view.number(name)?;
        }
    }
    for name in names {
        if let Some(block) = blocks.get(name) {
            bounded(block, name)?;
        }
    }
    Ok(())
}

/// Trains, what stands around a sample, and a source.
fn optics(blocks: &Fields) -> Result<()> {
    blocks.numbers::<4>("source")?;
    train(blocks, "train")?;
    for side in ["pre", "post"] {
        match blocks.get(side) {
            Some(Value::Array(_)) => train(blocks, side)?,
            _ => measurement(blocks, side)?,
        }
    }
    if let Some(removal) = blocks.object("removal", &["reflection", "direct"])? {
        removal.flag("reflection")?;
        removal.numbers::<16>("direct")?;
    }
    Ok(())
}

/// A train as it is being written: values may be missing, names may not be foreign.
fn train(blocks: &Fields, name: &str) -> Result<()> {
    let Some(block) = blocks.get(name) else {
        return Ok(());
    };
    let wrong = |sentence: &str| Err(blocks.error("bad-request", name, sentence));
    let Some(elements) = block.as_array() else {
        return wrong("A train is a list of elements.");
    };
    if elements.len() > Train::MOST_ELEMENTS {
        return wrong("This train has too many elements.");
    }
    for (k, element) in elements.iter().enumerate() {
        let known = ["kind", "label", "disabled", "parameters", "measurement"];
        let element = Fields::of(element, &format!("{name}[{k}]"), &known)?;
        let kinds = Kind::ALL.map(|kind| (kind.name(), kind));
        let kind = element.required("kind", element.choice("kind", &kinds)?)?;
        element.flag("disabled")?;
        if element
            .text("label")?
            .is_some_and(|text| text.chars().count() > LONGEST_LABEL)
        {
            return Err(element.error(
                "too-large",
                "label",
                "This must be a text of at most 80 characters.",
            ));
        }
        measurement(&element, "measurement")?;
        let names: Vec<String> = kind.definitions().iter().map(name_with_unit).collect();
        let names: Vec<&str> = names.iter().map(String::as_str).collect();
        let Some(parameters) = element.object("parameters", &names)? else {
            continue;
        };
        for parameter in names {
            let known = ["value", "free", "low", "high", "tie"];
            let Some(fields) = parameters.object(parameter, &known)? else {
                continue;
            };
            for number in ["value", "low", "high"] {
                fields.number(number)?;
            }
            fields.flag("free")?;
            let tie = ["element", "name", "factor", "offset"];
            if let Some(tie) = fields.object("tie", &tie)? {
                tie.whole("element")?;
                tie.text("name")?;
                tie.number("factor")?;
                tie.number("offset")?;
            }
        }
    }
    Ok(())
}

/// Members that are all allowed, but not without bounds.
fn few(names: &[&str], path: &str) -> Result<()> {
    if names.len() > MOST_MEMBERS {
        return Err(Error::new(
            "bad-request",
            format!("There are more than {MOST_MEMBERS} names here."),
        )
        .at_field(path));
    }
    Ok(())
}

/// The model that was chosen by hand, and where its depolarization stands.
fn fit(blocks: &Fields) -> Result<()> {
    if let Some(fit) = blocks.object("fit", &["model", "side"])? {
        fit.text("model")?;
        fit.choice(
            "side",
            &["parallel", "after", "before"].map(|side| (side, ())),
        )?;
    }
    Ok(())
}

/// Several matrices and what they are to each other.
fn series(blocks: &Fields) -> Result<()> {
    let known = ["use", "matrices", "labels", "coordinates"];
    let Some(series) = blocks.object("series", &known)? else {
        return Ok(());
    };
    let uses = ["ask", "pick", "series", "repeats", "pair"].map(|name| (name, ()));
    series.choice("use", &uses)?;
    let count = match series.get("matrices") {
        None => None,
        Some(_) => Some(matrices(&series, "matrices")?),
    };
    let wrong = |name, sentence| Err(series.error("bad-request", name, sentence));
    for (name, fits) in [
        ("labels", Value::is_string as fn(&Value) -> bool),
        ("coordinates", is_finite),
    ] {
        let Some(items) = series.get(name) else {
            continue;
        };
        match items.as_array() {
            Some(items) if Some(items.len()) == count && items.iter().all(fits) => {}
            _ => return wrong(name, "There must be one for each of the matrices."),
        }
    }
    Ok(())
}

/// A list of matrices; how many.
fn matrices(fields: &Fields, name: &str) -> Result<usize> {
    let items = fields.required(name, fields.get(name))?.as_array();
    items
        .filter(|items| items.iter().all(is_matrix))
        .map(Vec::len)
        .ok_or_else(|| {
            fields.error(
                "bad-request",
                name,
                &format!("'{name}' must be a list of lists of 16 numbers."),
            )
        })
}

fn measurement(blocks: &Fields, name: &str) -> Result<()> {
    let known = [
        "mueller",
        "normalised",
        "absolute",
        "convention",
        "noise",
        "text",
        "example",
    ];
    let Some(measurement) = blocks.object(name, &known)? else {
        return Ok(());
    };
    measurement.numbers::<16>("mueller")?;
    for name in ["normalised", "absolute", "example"] {
        measurement.flag(name)?;
    }
    if measurement
        .text("text")?
        .is_some_and(|text| text.len() > LONGEST_TEXT)
    {
        return Err(measurement.error(
            "too-large",
            "text",
            "The pasted text is too long for a link.",
        ));
    }
    convention(&measurement)?;
    noise(&measurement)
}

fn convention(measurement: &Fields) -> Result<()> {
    let known = ["angles", "positiveS3", "zeroAngle", "time", "order"];
    let Some(convention) = measurement.object("convention", &known)? else {
        return Ok(());
    };
    for (name, words) in [
        ("angles", ["counterclockwise", "clockwise"]),
        ("positiveS3", ["clockwise", "counterclockwise"]),
        ("zeroAngle", ["x", "y"]),
        ("time", ["plus", "minus"]),
        ("order", ["rows", "columns"]),
    ] {
        convention.choice(name, &words.map(|word| (word, ())))?;
    }
    Ok(())
}

/// Every statement of the schema, also those that only later versions use.
fn noise(measurement: &Fields) -> Result<()> {
    let known = [
        "kind",
        "sigma",
        "fraction",
        "covariance",
        "decimals",
        "matrices",
        "systematic",
    ];
    let Some(noise) = measurement.object("noise", &known)? else {
        return Ok(());
    };
    let kinds = [
        ("none", ""),
        ("uniform", "sigma"),
        ("relative", "fraction"),
        ("perElement", "sigma"),
        ("covariance", "covariance"),
        ("rounding", "decimals"),
        ("replicates", "matrices"),
    ];
    let kind = noise.choice("kind", &kinds.map(|(kind, part)| (kind, (kind, part))))?;
    let (kind, part) = noise.required("kind", kind)?;
    if let Some(other) = known
        .iter()
        .find(|&&name| !["kind", "systematic", part].contains(&name) && noise.get(name).is_some())
    {
        return Err(noise.error(
            "unknown-field",
            other,
            &format!("Noise of the kind '{kind}' has no '{other}'."),
        ));
    }
    systematic(&noise)?;
    match kind {
        "none" => Ok(()),
        "uniform" | "relative" | "rounding" => noise.required(part, noise.number(part)?).map(drop),
        "perElement" => noise.required(part, noise.numbers::<16>(part)?).map(drop),
        "covariance" => noise.required(part, noise.numbers::<256>(part)?).map(drop),
        _ => matrices(&noise, part).map(drop),
    }
}

/// The uncertainties of the instrument.
fn systematic(noise: &Fields) -> Result<()> {
    let known = ["generator", "analyser", "darkSigma"];
    let Some(stated) = noise.object("systematic", &known)? else {
        return Ok(());
    };
    stated.number("darkSigma")?;
    let parts = [
        "retardanceDeg",
        "polarizerDeg",
        "retardanceSigmaDeg",
        "azimuthSigmaDeg",
        "contrastSigma",
    ];
    for name in ["generator", "analyser"] {
        if let Some(side) = stated.object(name, &parts)? {
            for part in parts {
                side.number(part)?;
            }
        }
    }
    Ok(())
}

fn is_matrix(value: &Value) -> bool {
    value
        .as_array()
        .is_some_and(|items| items.len() == 16 && items.iter().all(is_finite))
}

fn is_finite(value: &Value) -> bool {
    value.as_f64().is_some_and(f64::is_finite)
}

/// Without control characters and those that turn the direction of writing.
fn plain_label(label: &str) -> String {
    label
        .chars()
        .filter(|c| {
            !c.is_control()
                && !matches!(c, '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{200e}' | '\u{200f}')
        })
        .collect()
}

/// A block that is kept, but not without bounds. A stack, and no path for each
/// value: names may be long and many.
fn bounded(block: &Value, name: &str) -> Result<()> {
    let refuse = |sentence: &str| {
        let shown: String = name.chars().take(LONGEST_LABEL).collect();
        Err(Error::new("bad-request", sentence).at_field(shown))
    };
    if name == FORBIDDEN {
        return refuse("This name is not allowed.");
    }
    let mut waiting = vec![(block, 0)];
    while let Some((value, depth)) = waiting.pop() {
        if depth > DEEPEST {
            return refuse("This block is nested too deeply.");
        }
        match value {
            Value::Array(items) => waiting.extend(items.iter().map(|item| (item, depth + 1))),
            Value::Object(map) if map.contains_key(FORBIDDEN) => {
                return refuse("A name in this block is not allowed: __proto__.");
            }
            Value::Object(map) => waiting.extend(map.values().map(|item| (item, depth + 1))),
            Value::Number(_) if !is_finite(value) => {
                return refuse("A number in this block is larger than a double can hold.");
            }
            _ => {}
        }
    }
    Ok(())
}

/// The name of a parameter in requests and configurations.
pub(crate) fn name_with_unit(definition: &Definition) -> String {
    let unit = if definition.quantity.is_angle() {
        "Deg"
    } else {
        ""
    };
    format!("{}{unit}", definition.name)
}
