//! Reading matrices from what people paste.
//!
//! The shape decides, not statistics of separators: every combination of decimal
//! mark and delimiter is tried, and those stay in which every token is a number and
//! the numbers make 4×4 matrices.

mod literal;
mod number;
mod source;
mod table;

pub use number::{DecimalMark, NumberProblem, PrintedNumber, parse_number};

use crate::error::{Error, Note, Place, Result, Severity};
use source::Source;

/// A longer text is refused: ten thousand matrices take a quarter of it.
const LARGEST_TEXT: usize = 16 << 20;

/// More complaints are counted and not listed.
const MOST_REFUSALS: usize = 20;

/// What a person may settle about a text.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct ReadOptions {
    /// `None`: found out.
    pub decimal: Option<DecimalMark>,
    /// `None`: found out. Means nothing in bracketed forms.
    pub delimiter: Option<Delimiter>,
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
}

/// One matrix of a text.
#[derive(Debug, Clone, PartialEq)]
pub struct MatrixRead {
    /// Sixteen numbers in the order of the text.
    pub mueller: [f64; 16],
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
/// nested lists, NumPy prints, bracketed rows with semicolons, JSON arrays; 4×4,
/// 1×16, n×16, n×4 and columns of sixteen.
///
/// # Errors
/// Where no matrix can be read: the reason, with line and character. Where some
/// can, the others are refusals among the notes.
pub fn parse_matrices(text: &str, options: &ReadOptions) -> Result<MatricesRead> {
    if text.len() > LARGEST_TEXT {
        return Err(Error::new(
            "too-large",
            "This text is larger than 16 MiB, which is more than is read at once.",
        ));
    }
    let source = Source::new(text);
    source.refuse_unread_forms()?;
    let mut attempts = if source.is_bracketed() {
        literal::attempts(&source, options)
    } else {
        table::attempts(&source, options)
    };
    // First the readings without a complaint, then those that got farthest; the
    // order of trying decides between equals.
    attempts.sort_by_key(|attempt| {
        (
            !attempt.is_clean(),
            std::cmp::Reverse(attempt.matrices.len()),
            std::cmp::Reverse(attempt.numbers),
            attempt.refusals.len(),
        )
    });
    let mut attempts = attempts.into_iter();
    let Some(best) = attempts.next() else {
        return Err(Error::new(
            "no-numbers",
            "There are no numbers in this text.",
        ));
    };
    if best.matrices.is_empty() {
        return Err(best
            .refusals
            .into_iter()
            .next()
            .unwrap_or_else(|| Error::new("no-numbers", "There are no numbers in this text.")));
    }
    let mut alternatives: Vec<Alternative> = Vec::new();
    if best.is_clean() {
        for other in attempts.take_while(Attempt::is_clean) {
            let differs = |matrices: &[MatrixRead]| !same_numbers(matrices, &other.matrices);
            if differs(&best.matrices) && alternatives.iter().all(|a| differs(&a.matrices)) {
                alternatives.push(Alternative {
                    reading: other.reading,
                    matrices: other.matrices,
                });
            }
        }
    }
    let mut notes = best.notes;
    if !alternatives.is_empty() {
        notes.push(Note {
            severity: Severity::Warning,
            code: "ambiguous-reading",
            message: "These numbers can be read in more than one way; choose the right one."
                .to_owned(),
            at: None,
        });
    }
    let surplus = best.refusals.len().saturating_sub(MOST_REFUSALS);
    notes.extend(
        best.refusals
            .into_iter()
            .take(MOST_REFUSALS)
            .map(|error| Note {
                severity: Severity::Refusal,
                code: error.code,
                message: error.message,
                at: error.at,
            }),
    );
    if surplus > 0 {
        notes.push(Note {
            severity: Severity::Refusal,
            code: "more-refusals",
            message: format!("And {surplus} more places that could not be read."),
            at: None,
        });
    }
    Ok(MatricesRead {
        matrices: best.matrices,
        reading: best.reading,
        alternatives,
        notes,
    })
}

/// One way to read a text, and how far it got.
struct Attempt {
    reading: ReadingDescription,
    matrices: Vec<MatrixRead>,
    /// How many tokens were numbers.
    numbers: usize,
    refusals: Vec<Error>,
    notes: Vec<Note>,
}

impl Attempt {
    fn is_clean(&self) -> bool {
        self.refusals.is_empty() && !self.matrices.is_empty()
    }
}

fn same_numbers(a: &[MatrixRead], b: &[MatrixRead]) -> bool {
    a.len() == b.len() && a.iter().zip(b).all(|(a, b)| a.mueller == b.mueller)
}

/// A number with its place.
#[derive(Debug, Clone, Copy)]
struct Placed {
    number: PrintedNumber,
    line: usize,
    character: usize,
    length: usize,
}

/// A row: numbers, or why it is none.
struct Row {
    numbers: std::result::Result<Vec<Placed>, Error>,
    label: Option<String>,
    line: usize,
    /// What refers to the row as a whole.
    length: usize,
}

/// Rows that belong together, without a blank line between them.
#[derive(Default)]
struct Block {
    rows: Vec<Row>,
    label: Option<String>,
}

/// What the rows of a text make.
struct Assembled {
    matrices: Vec<MatrixRead>,
    refusals: Vec<Error>,
    notes: Vec<Note>,
    numbers: usize,
}

/// Rows of four in fours, rows of sixteen, or sixteen numbers in any lines.
fn assemble(blocks: Vec<Block>) -> Assembled {
    let mut out = Assembled {
        matrices: Vec::new(),
        refusals: Vec::new(),
        notes: Vec::new(),
        numbers: 0,
    };
    let count = blocks.iter().map(|block| block.rows.len()).sum::<usize>();
    // Four lines apart by blank lines are one matrix with air in it.
    let blocks =
        if count == 4 && blocks.len() > 1 && blocks.iter().all(|block| block.rows.len() < 4) {
            let label = blocks.iter().find_map(|block| block.label.clone());
            vec![Block {
                rows: blocks.into_iter().flat_map(|block| block.rows).collect(),
                label,
            }]
        } else {
            blocks
        };
    for block in blocks {
        out.block(block);
    }
    out
}

impl Assembled {
    fn block(&mut self, block: Block) {
        let Block { rows, label } = block;
        let widths: Vec<usize> = rows
            .iter()
            .filter_map(|row| row.numbers.as_ref().ok().map(Vec::len))
            .collect();
        let total: usize = widths.iter().sum();
        self.numbers += total;
        let usual = |width| 2 * widths.iter().filter(|&&w| w == width).count() > widths.len();
        let whole = widths.len() == rows.len();
        let run = whole
            && total.is_multiple_of(16)
            && total > 0
            && !usual(4)
            && !usual(16)
            && (usual(1) || total == 16 || rows.len() == 1);
        if run {
            self.run(rows, label);
        } else if usual(16) || (widths.is_empty() && rows.len() != 4) {
            self.rows_of_sixteen(rows, label);
        } else {
            self.rows_of_four(rows, label);
        }
    }

    /// Numbers one after the other, wherever the lines break.
    fn run(&mut self, rows: Vec<Row>, label: Option<String>) {
        let numbers: Vec<Placed> = rows
            .into_iter()
            .flat_map(|row| row.numbers.unwrap_or_default())
            .collect();
        let several = numbers.len() > 16;
        for (k, sixteen) in numbers.chunks_exact(16).enumerate() {
            let label = label.clone().filter(|_| !several || k == 0);
            self.matrix(sixteen, label);
        }
    }

    fn rows_of_sixteen(&mut self, rows: Vec<Row>, label: Option<String>) {
        let mut label = label;
        for row in rows {
            let name = self.matrices.len() + self.refusals.len() + 1;
            match row.numbers {
                Ok(numbers) if numbers.len() == 16 => {
                    let own = row.label.or(label.take());
                    self.matrix(&numbers, own);
                }
                Ok(numbers) => self.refusals.push(
                    Error::new(
                        "wrong-count",
                        format!(
                            "Matrix {name}: expected 16 numbers in a row, found {}.",
                            numbers.len()
                        ),
                    )
                    .at_text(row.line, 1, row.length),
                ),
                Err(error) => self.refusals.push(named(error, &format!("Matrix {name}"))),
            }
        }
    }

    fn rows_of_four(&mut self, mut rows: Vec<Row>, label: Option<String>) {
        let mut label = label;
        while !rows.is_empty() {
            let rest = rows.split_off(rows.len().min(4));
            let four = std::mem::replace(&mut rows, rest);
            let name = self.matrices.len() + 1;
            let (line, length) = (four[0].line, four[0].length);
            if four.len() < 4 && four.iter().all(|row| row.numbers.is_ok()) {
                self.refusals.push(
                    Error::new(
                        "wrong-count",
                        format!("Matrix {name}: expected 4 rows, found {}.", four.len()),
                    )
                    .at_text(line, 1, length),
                );
                return;
            }
            let mut numbers = Vec::with_capacity(16);
            let refused = self.refusals.len();
            for (k, row) in four.into_iter().enumerate() {
                let place = format!("Matrix {name}, row {}", k + 1);
                match row.numbers {
                    Ok(found) if found.len() == 4 => numbers.extend(found),
                    Ok(found) => self.refusals.push(
                        Error::new(
                            "ragged-row",
                            format!("{place}: expected 4 numbers, found {}.", found.len()),
                        )
                        .at_text(row.line, 1, row.length),
                    ),
                    Err(error) => self.refusals.push(named(error, &place)),
                }
            }
            let own = label.take();
            if self.refusals.len() == refused {
                self.matrix(&numbers, own);
            }
        }
    }

    fn matrix(&mut self, sixteen: &[Placed], label: Option<String>) {
        let Ok(numbers) = <&[Placed; 16]>::try_from(sixteen) else {
            return;
        };
        for placed in numbers.iter().filter(|placed| placed.number.underflows) {
            self.notes.push(Note {
                severity: Severity::Warning,
                code: "underflow",
                message: "This number is too small for a double and was read as zero.".to_owned(),
                at: Some(Place::Text {
                    line: placed.line,
                    character: placed.character,
                    length: placed.length,
                }),
            });
        }
        self.matrices.push(MatrixRead {
            mueller: numbers.map(|placed| placed.number.value),
            label: label.filter(|label| !label.is_empty()),
            line: numbers[0].line,
            decimals: resolution(numbers),
        });
    }
}

/// The complaint, with the matrix and row it is about.
fn named(mut error: Error, place: &str) -> Error {
    error.message = format!("{place}: {}", error.message);
    error
}

/// Plain decimals may have lost their trailing zeros, so the finest counts; numbers
/// with exponents say how fine each is, so the coarsest counts.
fn resolution(numbers: &[Placed; 16]) -> Option<u32> {
    let scientific = numbers.iter().any(|placed| placed.number.has_exponent);
    let others = numbers
        .iter()
        .filter(|placed| placed.number.value != 0.0)
        .map(|placed| placed.number.decimals);
    let decimals = if scientific {
        others.min()
    } else {
        others.max()
    };
    decimals
        .and_then(|decimals| u32::try_from(decimals.max(0)).ok())
        .filter(|&decimals| decimals <= 15)
}
