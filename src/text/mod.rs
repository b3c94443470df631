//! Reading matrices from what people paste.
//!
//! The shape decides, not statistics of separators: every combination of decimal
//! mark and delimiter is tried, and those stay in which every token is a number and
//! the numbers make 4×4 matrices.

mod assembly;
mod export;
mod file;
mod literal;
mod notation;
mod npy;
mod number;
mod recipe;
mod source;
mod table;

pub use export::{Column, Content, Entry, NamedMatrix, NamedTable, OutputForm, export_text};
pub use file::{decode, parse_file};
pub use number::{DecimalMark, NumberProblem, PrintedNumber, parse_number};
pub use recipe::python_recipe;

use std::cmp::Reverse;

use assembly::Assembly;
use source::Source;

use crate::error::{Error, Note, Result, Severity};

/// What a person may settle about a text.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct ReadOptions {
    /// `None`: found out.
    pub decimal: Option<DecimalMark>,
    /// `None`: found out. Means nothing in bracketed forms.
    pub delimiter: Option<Delimiter>,
    /// `None`: found out. Means something in saved arrays alone.
    pub stacking: Option<Stacking>,
}

/// More numbers are refused: ten thousand matrices are a twelfth.
const MOST_NUMBERS: usize = 2_000_000;

/// Which axes of a saved array count the matrices.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stacking {
    /// The first: (N, 4, 4), (N, 16).
    First,
    /// The last: (4, 4, N), (16, N).
    Last,
}

/// What stands between the numbers of a row.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Delimiter {
    /// One tab.
    Tab,
    /// One semicolon.
    Semicolon,
    /// One comma; with decimal commas, one that is followed by a space.
    Comma,
    /// Any white space.
    Space,
}

/// How a text is laid out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// Lines of numbers.
    Table,
    /// Nested brackets: Python, NumPy, JSON.
    Brackets,
    /// Brackets with rows that end at semicolons.
    BracketsWithSemicolons,
    /// An array that a program saved.
    Binary,
}

/// One matrix of a text.
#[derive(Debug, Clone, PartialEq)]
pub struct MatrixRead {
    /// Sixteen numbers in the order of the text.
    pub mueller: [f64; 16],
    /// The uncertainties printed with them.
    pub sigma: Option<[f64; 16]>,
    /// Where in a series it belongs: a column before the sixteen, or a title such as
    /// `450 nm`.
    pub coordinate: Option<f64>,
    /// From a comment, a name or a row label beside it.
    pub label: Option<String>,
    /// Where it begins, counted from one.
    pub line: usize,
    /// The printed resolution is `10^-decimals`; `None` where that says nothing.
    pub decimals: Option<u32>,
}

/// How a text was understood.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ReadingDescription {
    /// The layout.
    pub form: Form,
    /// The decimal mark.
    pub decimal: DecimalMark,
    /// Whether marks that group thousands were dropped.
    pub grouped: bool,
    /// `None` in bracketed forms.
    pub delimiter: Option<Delimiter>,
    /// Lines of text before the first numbers.
    pub header_row_count: usize,
    /// `None` but in saved arrays.
    pub stacking: Option<Stacking>,
}

/// A second reading that gives other numbers.
#[derive(Debug, Clone, PartialEq)]
pub struct Alternative {
    /// How.
    pub reading: ReadingDescription,
    /// What.
    pub matrices: Vec<MatrixRead>,
}

/// What a text holds.
#[derive(Debug, Clone, PartialEq)]
pub struct MatricesRead {
    /// At least one.
    pub matrices: Vec<MatrixRead>,
    /// How they were understood.
    pub reading: ReadingDescription,
    /// Other readings with other numbers: then the person must choose.
    pub alternatives: Vec<Alternative>,
    /// What was refused, and what is worth knowing.
    pub notes: Vec<Note>,
}

/// Reads every 4×4 matrix of a text: tables with any delimiter and decimal mark,
/// nested lists, NumPy prints, bracketed rows with semicolons, JSON arrays and objects
/// with arrays in them, TeX matrices, prints in blocks of columns or with a common
/// factor; 4×4, 1×16, n×16, n×17 with a coordinate first, n×4 and columns of sixteen;
/// numbers with their uncertainty.
///
/// # Errors
/// Where no matrix can be read: the reason, with line and character. Where some
/// can, the others are refusals among the notes.
pub fn parse_matrices(text: &str, options: &ReadOptions) -> Result<MatricesRead> {
    let source = Source::new(text)?;
    source.refuse_elided()?;
    let bracketed = source.is_bracketed();
    let mut choice = Choice::default();
    if bracketed {
        choice.take(literal::attempts(&source, options));
    }
    // Brackets without a matrix may be part of a title.
    if !choice.has_matrices() {
        let mut tables = Choice::default();
        tables.take(table::attempts(&source, options));
        if !bracketed {
            tables.take(literal::bare_attempts(&source, options));
        }
        if !bracketed || tables.is_clean() {
            choice = tables;
        }
    }
    choice.into_result()
}

/// One way to read a text, and how far it got.
struct Attempt {
    reading: ReadingDescription,
    assembly: Assembly,
}

impl Attempt {
    fn is_clean(&self) -> bool {
        self.assembly.refusals.is_empty() && !self.assembly.matrices.is_empty()
    }

    /// The smaller the better: first those without a complaint, then those that got
    /// farthest.
    fn rank(&self) -> (bool, Reverse<usize>, Reverse<usize>, usize) {
        let assembly = &self.assembly;
        (
            !self.is_clean(),
            Reverse(assembly.matrices.len()),
            Reverse(assembly.numbers),
            assembly.refusals.len() + assembly.surplus,
        )
    }
}

/// The best attempt so far, and those without a complaint that differ from it.
#[derive(Default)]
struct Choice {
    best: Option<Attempt>,
    others: Vec<Attempt>,
}

impl Choice {
    /// Between equals the order of trying decides.
    fn take(&mut self, attempts: impl Iterator<Item = Attempt>) {
        for attempt in attempts {
            let differs = |other: &Attempt| {
                !same_numbers(&attempt.assembly.matrices, &other.assembly.matrices)
            };
            match &self.best {
                None => self.best = Some(attempt),
                Some(best) if best.is_clean() && attempt.is_clean() => {
                    if differs(best) && self.others.iter().all(differs) {
                        self.others.push(attempt);
                    }
                }
                Some(best) if attempt.rank() < best.rank() => self.best = Some(attempt),
                Some(_) => {}
            }
        }
    }

    fn has_matrices(&self) -> bool {
        self.best
            .as_ref()
            .is_some_and(|best| !best.assembly.matrices.is_empty())
    }

    fn is_clean(&self) -> bool {
        self.best.as_ref().is_some_and(Attempt::is_clean)
    }

    fn into_result(self) -> Result<MatricesRead> {
        let no_numbers = || Error::new("no-numbers", "There are no numbers in this text.");
        let Some(Attempt {
            reading,
            mut assembly,
        }) = self.best
        else {
            return Err(no_numbers());
        };
        let matrices = std::mem::take(&mut assembly.matrices);
        if matrices.is_empty() {
            return Err(assembly
                .refusals
                .into_iter()
                .next()
                .unwrap_or_else(no_numbers));
        }
        let alternatives: Vec<Alternative> = self
            .others
            .into_iter()
            .map(|other| Alternative {
                reading: other.reading,
                matrices: other.assembly.matrices,
            })
            .collect();
        let mut notes = assembly.into_notes();
        if !alternatives.is_empty() {
            notes.insert(0, ambiguous());
        }
        Ok(MatricesRead {
            matrices,
            reading,
            alternatives,
            notes,
        })
    }
}

fn ambiguous() -> Note {
    Note {
        severity: Severity::Warning,
        code: "ambiguous-reading",
        message: "These numbers can be read in more than one way; choose the right one.".to_owned(),
        at: None,
    }
}

fn same_numbers(a: &[MatrixRead], b: &[MatrixRead]) -> bool {
    a.len() == b.len()
        && a.iter()
            .zip(b)
            .all(|(a, b)| a.mueller == b.mueller && a.sigma == b.sigma)
}
