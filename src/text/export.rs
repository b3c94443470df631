//! Matrices and tables as text for other programs, at full precision: the shortest
//! decimals that read back to the same bits.

use std::collections::BTreeMap;
use std::fmt::Write;

use crate::error::{Error, Result};

/// The schema of the JSON form.
const SCHEMA: u32 = 1;
const MOST_VALUES: usize = 1_000_000;

/// What a program on the other side reads.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum OutputForm {
    /// Fields between tabs, as spreadsheets paste them.
    Tsv,
    /// RFC 4180, decimal points between commas.
    Csv,
    /// The same with decimal commas between semicolons.
    CsvEuropean,
    /// RFC 8259.
    Json,
    /// `pmatrix` and `tabular` environments.
    Latex,
    /// NumPy arrays and lists.
    Python,
    /// Matrices in brackets.
    Matlab,
}

/// A matrix with its name.
#[derive(Debug, Clone, PartialEq)]
pub struct NamedMatrix {
    /// What it is.
    pub name: String,
    /// Of its elements.
    pub unit: Option<String>,
    /// Row by row.
    pub mueller: [f64; 16],
    /// Standard uncertainties, row by row. Left out of TSV, CSV and LaTeX.
    pub sigma: Option<[f64; 16]>,
}

/// A cell of a table.
#[derive(Debug, Clone, PartialEq)]
pub enum Entry {
    /// A number.
    Number(f64),
    /// Text.
    Text(String),
    /// Not determined.
    Nothing,
}

/// A column of a table.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// What it is.
    pub name: String,
    /// Of its numbers.
    pub unit: Option<String>,
    /// As many as in the other columns.
    pub values: Vec<Entry>,
}

/// A table with its name.
#[derive(Debug, Clone, PartialEq)]
pub struct NamedTable {
    /// What it is.
    pub name: String,
    /// From left to right.
    pub columns: Vec<Column>,
}

/// What is to leave.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Content {
    /// For all of it.
    pub title: String,
    /// What it stands on.
    pub notes: Vec<String>,
    /// Matrices.
    pub matrices: Vec<NamedMatrix>,
    /// Tables.
    pub tables: Vec<NamedTable>,
}

/// Writes matrices and tables. All forms but CSV with `;` are ASCII in their numbers.
///
/// # Errors
/// `bad-request` where there is nothing to write or columns differ in length,
/// `not-finite`, `too-large`.
pub fn export_text(form: OutputForm, content: &Content) -> Result<String> {
    check(content)?;
    Ok(match form {
        OutputForm::Tsv => Delimited {
            between: "\t",
            comma: false,
            end: "\n",
        }
        .write(content),
        OutputForm::Csv => Delimited {
            between: ",",
            comma: false,
            end: "\r\n",
        }
        .write(content),
        OutputForm::CsvEuropean => Delimited {
            between: ";",
            comma: true,
            end: "\r\n",
        }
        .write(content),
        OutputForm::Json => json(content),
        OutputForm::Latex => latex(content),
        OutputForm::Python => program(content, &PYTHON),
        OutputForm::Matlab => program(content, &MATLAB),
    })
}

fn check(content: &Content) -> Result<()> {
    let refuse =
        |code, sentence: &str, field: String| Err(Error::new(code, sentence).at_field(field));
    if content.matrices.is_empty() && content.tables.is_empty() {
        return refuse(
            "bad-request",
            "There is nothing to write.",
            "matrices".to_owned(),
        );
    }
    let mut values = 0;
    for (k, matrix) in content.matrices.iter().enumerate() {
        values += if matrix.sigma.is_some() { 32 } else { 16 };
        if matrix
            .mueller
            .iter()
            .chain(matrix.sigma.iter().flatten())
            .any(|x| !x.is_finite())
        {
            return refuse(
                "not-finite",
                "This is not a finite number.",
                format!("matrices[{k}]"),
            );
        }
    }
    for (k, table) in content.tables.iter().enumerate() {
        let length = table
            .columns
            .first()
            .map_or(0, |column| column.values.len());
        for (i, column) in table.columns.iter().enumerate() {
            let field = format!("tables[{k}].columns[{i}].values");
            values += length;
            if column.values.len() != length {
                return refuse(
                    "bad-request",
                    "The columns of a table have different lengths.",
                    field,
                );
            }
            if column
                .values
                .iter()
                .any(|entry| matches!(entry, Entry::Number(x) if !x.is_finite()))
            {
                return refuse("not-finite", "This is not a finite number.", field);
            }
        }
        if table.columns.is_empty() {
            return refuse(
                "bad-request",
                "This table has no columns.",
                format!("tables[{k}]"),
            );
        }
    }
    if values > MOST_VALUES {
        return refuse(
            "too-large",
            "This is more than a million numbers.",
            "matrices".to_owned(),
        );
    }
    Ok(())
}

/// The shortest decimal that reads back to the same bits.
fn number(value: f64) -> String {
    let size = value.abs();
    if size != 0.0 && !(1e-5..1e16).contains(&size) {
        format!("{value:e}")
    } else {
        format!("{value}")
    }
}

/// The same as a number that programs do not take for an integer: they lose the sign of
/// zero.
fn float(value: f64) -> String {
    let text = number(value);
    if text.contains(['.', 'e']) {
        text
    } else {
        format!("{text}.0")
    }
}

/// Text in one line, without control characters and those that turn the direction of
/// writing.
fn line(text: &str) -> String {
    text.chars()
        .map(|c| if c.is_whitespace() { ' ' } else { c })
        .filter(|c| !c.is_control() && !matches!(c, '\u{61c}' | '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}'))
        .collect()
}

fn with_unit(name: &str, unit: Option<&String>) -> String {
    unit.filter(|unit| !unit.is_empty())
        .map_or_else(|| line(name), |unit| line(&format!("{name} ({unit})")))
}

/// The lines that go before everything.
fn remarks(content: &Content) -> impl Iterator<Item = String> {
    std::iter::once(&content.title)
        .filter(|title| !title.is_empty())
        .chain(&content.notes)
        .map(|text| line(text))
}

/// The entries of a row of a table.
fn row(table: &NamedTable, k: usize) -> impl Iterator<Item = &Entry> {
    table
        .columns
        .iter()
        .filter_map(move |column| column.values.get(k))
}

fn length(table: &NamedTable) -> usize {
    table
        .columns
        .first()
        .map_or(0, |column| column.values.len())
}

/// Spreadsheets: TSV and the two dialects of CSV.
struct Delimited {
    between: &'static str,
    comma: bool,
    end: &'static str,
}

impl Delimited {
    fn write(&self, content: &Content) -> String {
        let mut out = String::new();
        for remark in remarks(content) {
            self.remark(&mut out, &remark);
        }
        for matrix in &content.matrices {
            self.remark(&mut out, &with_unit(&matrix.name, matrix.unit.as_ref()));
            for numbers in matrix.mueller.chunks(4) {
                self.row(&mut out, numbers.iter().map(|&x| self.number(x)));
            }
        }
        for table in &content.tables {
            self.remark(&mut out, &line(&table.name));
            self.row(
                &mut out,
                table
                    .columns
                    .iter()
                    .map(|column| self.text(&with_unit(&column.name, column.unit.as_ref()))),
            );
            for k in 0..length(table) {
                self.row(
                    &mut out,
                    row(table, k).map(|entry| match entry {
                        Entry::Number(x) => self.number(*x),
                        Entry::Text(text) => self.text(text),
                        Entry::Nothing => String::new(),
                    }),
                );
            }
        }
        out
    }

    fn remark(&self, out: &mut String, text: &str) {
        // One field, so that no program takes a remark for numbers.
        let text = format!("# {text}");
        let quoted = text.contains([',', ';', '"']) && self.between != "\t";
        out.push_str(&if quoted { self.quoted(&text) } else { text });
        out.push_str(self.end);
    }

    fn row(&self, out: &mut String, fields: impl Iterator<Item = String>) {
        let fields: Vec<String> = fields.collect();
        let row = fields.join(self.between);
        // A blank line is no row.
        out.push_str(if row.is_empty() { "\"\"" } else { &row });
        out.push_str(self.end);
    }

    fn number(&self, value: f64) -> String {
        let text = number(value);
        if self.comma {
            text.replace('.', ",")
        } else {
            text
        }
    }

    /// A spreadsheet would calculate what begins like a formula (OWASP, CSV injection).
    fn text(&self, text: &str) -> String {
        let text = line(text);
        let text = if text.trim_start().starts_with(['=', '+', '-', '@']) {
            format!("'{text}")
        } else {
            text
        };
        if self.between != "\t" && text.contains([',', ';', '"']) {
            self.quoted(&text)
        } else {
            text
        }
    }

    fn quoted(&self, text: &str) -> String {
        format!("\"{}\"", text.replace('"', "\"\""))
    }
}

fn json(content: &Content) -> String {
    let text = |text: &str| {
        // Control characters are gone by now.
        let escaped = line(text).replace('\\', "\\\\").replace('"', "\\\"");
        format!("\"{escaped}\"")
    };
    let list = |items: Vec<String>| format!("[{}]", items.join(", "));
    let matrix = |elements: &[f64; 16]| {
        list(
            elements
                .chunks(4)
                .map(|row| list(row.iter().map(|&x| float(x)).collect()))
                .collect(),
        )
    };
    let unit = |unit: &Option<String>| unit.as_deref().map_or("null".to_owned(), text);
    let matrices: Vec<String> = content
        .matrices
        .iter()
        .map(|one| {
            format!(
                "{{\"name\": {}, \"unit\": {}, \"mueller\": {}, \"sigma\": {}}}",
                text(&one.name),
                unit(&one.unit),
                matrix(&one.mueller),
                one.sigma.as_ref().map_or("null".to_owned(), matrix)
            )
        })
        .collect();
    let entry = |entry: &Entry| match entry {
        Entry::Number(x) => float(*x),
        Entry::Text(words) => text(words),
        Entry::Nothing => "null".to_owned(),
    };
    let tables: Vec<String> = content
        .tables
        .iter()
        .map(|table| {
            let columns: Vec<String> = table
                .columns
                .iter()
                .map(|column| {
                    format!(
                        "{{\"name\": {}, \"unit\": {}, \"values\": {}}}",
                        text(&column.name),
                        unit(&column.unit),
                        list(column.values.iter().map(entry).collect())
                    )
                })
                .collect();
            format!(
                "{{\"name\": {}, \"columns\": [\n{}\n]}}",
                text(&table.name),
                columns.join(",\n")
            )
        })
        .collect();
    format!(
        "{{\n\"schema\": {SCHEMA},\n\"app\": \"{}\",\n\"title\": {},\n\"notes\": {},\n\"matrices\": [\n{}\n],\n\"tables\": [\n{}\n]\n}}\n",
        env!("CARGO_PKG_VERSION"),
        text(&content.title),
        list(content.notes.iter().map(|note| text(note)).collect()),
        matrices.join(",\n"),
        tables.join(",\n")
    )
}

fn latex(content: &Content) -> String {
    let mut out = String::new();
    for remark in remarks(content) {
        let _ = writeln!(out, "% {remark}");
    }
    for matrix in &content.matrices {
        let rows: Vec<String> = matrix
            .mueller
            .chunks(4)
            .map(|row| {
                row.iter()
                    .map(|&x| typeset(x))
                    .collect::<Vec<_>>()
                    .join(" & ")
            })
            .collect();
        let _ = writeln!(
            out,
            "% {}\n\\begin{{pmatrix}}\n{} \\\\\n\\end{{pmatrix}}",
            with_unit(&matrix.name, matrix.unit.as_ref()),
            rows.join(" \\\\\n")
        );
    }
    for table in &content.tables {
        let heads: Vec<String> = table
            .columns
            .iter()
            .map(|column| cell(&with_unit(&column.name, column.unit.as_ref())))
            .collect();
        let _ = writeln!(
            out,
            "% {}\n\\begin{{tabular}}{{{}}}\n{} \\\\\n\\hline",
            line(&table.name),
            "l".repeat(table.columns.len()),
            heads.join(" & ")
        );
        for k in 0..length(table) {
            let cells: Vec<String> = row(table, k)
                .map(|entry| match entry {
                    Entry::Number(x) => format!("${}$", typeset(*x)),
                    Entry::Text(text) => cell(&line(text)),
                    Entry::Nothing => "--".to_owned(),
                })
                .collect();
            let _ = writeln!(out, "{} \\\\", cells.join(" & "));
        }
        out.push_str("\\end{tabular}\n");
    }
    out
}

/// At the start of a row a bracket or a star would belong to the `\\\\` before it.
fn cell(text: &str) -> String {
    let text = escaped(text);
    if text.trim_start().starts_with(['[', '*']) {
        format!("{{}}{text}")
    } else {
        text
    }
}

fn typeset(value: f64) -> String {
    let text = number(value);
    match text.split_once('e') {
        Some((mantissa, exponent)) => format!("{mantissa} \\times 10^{{{exponent}}}"),
        None => text,
    }
}

fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' | '%' | '$' | '#' | '_' | '{' | '}' => {
                out.push('\\');
                out.push(c);
            }
            '\\' => out.push_str("\\textbackslash{}"),
            '~' => out.push_str("\\textasciitilde{}"),
            '^' => out.push_str("\\textasciicircum{}"),
            _ => out.push(c),
        }
    }
    out
}

/// How a programming language writes things.
struct Language {
    comment: &'static str,
    head: &'static str,
    matrix: fn(&[f64; 16]) -> String,
    list: fn(&[Entry]) -> String,
    reserved: &'static [&'static str],
}

const PYTHON: Language = Language {
    comment: "#",
    head: "import numpy as np\n",
    matrix: |elements| {
        let rows: Vec<String> = elements
            .chunks(4)
            .map(|row| {
                format!(
                    "[{}]",
                    row.iter().map(|&x| float(x)).collect::<Vec<_>>().join(", ")
                )
            })
            .collect();
        format!("np.array([{}])", rows.join(",\n    "))
    },
    list: |entries| {
        let entries: Vec<String> = entries
            .iter()
            .map(|entry| match entry {
                Entry::Number(x) => float(*x),
                Entry::Text(text) => format!(
                    "'{}'",
                    line(text).replace('\\', "\\\\").replace('\'', "\\'")
                ),
                Entry::Nothing => "None".to_owned(),
            })
            .collect();
        format!("[{}]", entries.join(", "))
    },
    reserved: &[
        "False", "None", "True", "and", "as", "assert", "async", "await", "break", "class",
        "continue", "def", "del", "elif", "else", "except", "finally", "for", "from", "global",
        "if", "import", "in", "is", "lambda", "nonlocal", "not", "np", "or", "pass", "raise",
        "return", "try", "while", "with", "yield",
    ],
};

const MATLAB: Language = Language {
    comment: "%",
    head: "",
    matrix: |elements| {
        let rows: Vec<String> = elements
            .chunks(4)
            .map(|row| row.iter().map(|&x| number(x)).collect::<Vec<_>>().join(" "))
            .collect();
        format!("[{}];", rows.join(";\n    "))
    },
    list: |entries| {
        // A cell where there is text, numbers with NaN for what is not determined else.
        let is_text = entries.iter().any(|entry| matches!(entry, Entry::Text(_)));
        let entries: Vec<String> = entries
            .iter()
            .map(|entry| match entry {
                Entry::Number(x) => number(*x),
                Entry::Text(text) => format!("'{}'", line(text).replace('\'', "''")),
                Entry::Nothing if is_text => "''".to_owned(),
                Entry::Nothing => "NaN".to_owned(),
            })
            .collect();
        if is_text {
            format!("{{{}}};", entries.join("; "))
        } else {
            format!("[{}];", entries.join("; "))
        }
    },
    reserved: &[
        "break",
        "case",
        "catch",
        "classdef",
        "continue",
        "else",
        "elseif",
        "end",
        "for",
        "function",
        "global",
        "if",
        "otherwise",
        "parfor",
        "persistent",
        "return",
        "spmd",
        "switch",
        "try",
        "while",
    ],
};

fn program(content: &Content, language: &Language) -> String {
    // A remark in the first line of a Python file could name its encoding.
    let mut out = language.head.to_owned();
    let mut names = Names::default();
    for remark in remarks(content) {
        let _ = writeln!(out, "{} {remark}", language.comment);
    }
    for matrix in &content.matrices {
        let name = names.free(&matrix.name, language);
        if let Some(unit) = &matrix.unit {
            let _ = writeln!(out, "{} {name} in {}", language.comment, line(unit));
        }
        let _ = writeln!(out, "{name} = {}", (language.matrix)(&matrix.mueller));
        if let Some(sigma) = &matrix.sigma {
            let _ = writeln!(out, "{name}_sigma = {}", (language.matrix)(sigma));
        }
    }
    for table in &content.tables {
        for column in &table.columns {
            let name = names.free(&format!("{} {}", table.name, column.name), language);
            if let Some(unit) = &column.unit {
                let _ = writeln!(out, "{} {name} in {}", language.comment, line(unit));
            }
            let _ = writeln!(out, "{name} = {}", (language.list)(&column.values));
        }
    }
    out
}

/// The names that a program has already, with the number that the next equal one gets.
#[derive(Default)]
struct Names(BTreeMap<String, usize>);

impl Names {
    /// Letters, digits and underscores, not taken yet and no word of the language; the
    /// same with `_sigma` behind it is taken too.
    fn free(&mut self, name: &str, language: &Language) -> String {
        let mut plain = String::new();
        for c in name.chars().take(60) {
            if c.is_ascii_alphanumeric() {
                plain.push(c);
            } else if !plain.ends_with('_') {
                plain.push('_');
            }
        }
        let mut plain = plain.trim_matches('_').to_owned();
        if !plain.starts_with(|c: char| c.is_ascii_alphabetic()) {
            plain.insert_str(0, "m_");
        }
        let mut free = plain.clone();
        while self.0.contains_key(&free) || language.reserved.contains(&free.as_str()) {
            let next = self.0.entry(plain.clone()).or_insert(1);
            *next += 1;
            free = format!("{plain}_{next}");
        }
        self.0.insert(free.clone(), 1);
        self.0.insert(format!("{free}_sigma"), 1);
        free
    }
}
