//! From rows of numbers to matrices.

use super::MatrixRead;
use super::number::{NumberProblem, PrintedNumber};
use crate::error::{Error, Note, Place, Severity};

/// More complaints are counted and not listed.
const MOST_REFUSALS: usize = 20;

/// A number with its place.
#[derive(Debug, Clone, Copy)]
pub(super) struct Placed {
    pub number: PrintedNumber,
    pub line: usize,
    pub character: usize,
    pub length: usize,
}

impl Placed {
    fn place(&self) -> Place {
        Place::Text {
            line: self.line,
            character: self.character,
            length: self.length,
        }
    }
}

/// What stands where a number should.
struct BadSpot {
    /// In the row, counted from one.
    column: usize,
    error: Error,
}

/// What stands in one row of the text.
#[derive(Default)]
pub(super) struct Row {
    pub numbers: Vec<Placed>,
    /// The first of those that are no numbers.
    bad: Vec<BadSpot>,
    bad_count: usize,
    pub label: Option<String>,
    pub line: usize,
    /// What refers to the row as a whole.
    pub character: usize,
    pub length: usize,
}

impl Row {
    pub fn at(line: usize, character: usize, length: usize) -> Self {
        Self {
            line,
            character,
            length,
            ..Self::default()
        }
    }

    pub fn width(&self) -> usize {
        self.numbers.len() + self.bad_count
    }

    /// `column` is counted from one; `place` is line, character and length.
    pub fn spoil(
        &mut self,
        column: usize,
        problem: &NumberProblem,
        token: &str,
        place: (usize, usize, usize),
    ) {
        if self.bad.len() < MOST_REFUSALS {
            let (line, character, length) = place;
            self.bad.push(BadSpot {
                column,
                error: problem.error(token).at_text(line, character, length.max(1)),
            });
        }
        self.bad_count += 1;
    }

    /// Takes the numbers of another row behind its own.
    pub fn join(&mut self, right: Self) {
        self.numbers.extend(right.numbers);
        self.bad.extend(right.bad);
        self.bad_count += right.bad_count;
    }

    pub fn is_good(&self) -> bool {
        self.bad_count == 0
    }

    pub fn error(&self, code: &'static str, message: String) -> Error {
        Error::new(code, message).at_text(self.line, self.character, self.length.max(1))
    }
}

/// Rows that belong together, without a gap between them.
#[derive(Default)]
pub(super) struct Block {
    pub rows: Vec<Row>,
    pub label: Option<String>,
    /// Whether a single row goes on with the block before.
    pub joins: bool,
    /// Whether these are the uncertainties of the matrix before.
    pub is_sigma: bool,
    /// Why there are no rows.
    pub failed: Option<Error>,
}

/// What the rows of a text make.
#[derive(Default)]
pub(super) struct Assembly {
    pub matrices: Vec<MatrixRead>,
    pub refusals: Vec<Error>,
    /// Refusals that are not listed.
    pub surplus: usize,
    pub notes: Vec<Note>,
    pub underflows: usize,
    /// How many tokens were numbers.
    pub numbers: usize,
    /// Matrices begun, good and bad.
    begun: usize,
}

impl Assembly {
    /// Rows of four in fours, rows of sixteen, a column or a run of sixteens.
    pub fn of(blocks: Vec<Block>) -> Self {
        let mut assembly = Self::default();
        for block in blocks {
            assembly.block(block);
        }
        assembly
    }

    pub fn refuse(&mut self, error: Error) {
        if self.refusals.len() < MOST_REFUSALS {
            self.refusals.push(error);
        } else {
            self.surplus += 1;
        }
    }

    /// All complaints as notes.
    pub fn into_notes(self) -> Vec<Note> {
        let mut notes = self.notes;
        let listed = notes.iter().filter(|note| note.code == "underflow").count();
        if self.underflows > listed {
            notes.push(Note {
                severity: Severity::Warning,
                code: "underflow",
                message: format!(
                    "And {} more numbers that are too small for a double.",
                    self.underflows - listed
                ),
                at: None,
            });
        }
        notes.extend(self.refusals.into_iter().map(|error| Note {
            severity: Severity::Refusal,
            code: error.code,
            message: error.message,
            at: error.at,
        }));
        if self.surplus > 0 {
            notes.push(Note {
                severity: Severity::Refusal,
                code: "more-refusals",
                message: format!("And {} more places that could not be read.", self.surplus),
                at: None,
            });
        }
        notes
    }

    fn block(&mut self, block: Block) {
        let Block {
            rows,
            label,
            failed,
            is_sigma,
            ..
        } = block;
        let before = self.matrices.len();
        if let Some(error) = failed {
            self.begun += 1;
            let name = self.name();
            self.refuse(named(error, &name));
        }
        let Some(first) = rows.first() else {
            return;
        };
        self.numbers += rows.iter().map(|row| row.numbers.len()).sum::<usize>();
        let width = first.width();
        let usual = |width| 2 * rows.iter().filter(|row| row.width() == width).count() > rows.len();
        if rows.len() == 1 && !matches!(width, 4 | 16 | 17) || is_wrapped(&rows) {
            self.run(rows, label);
        } else if usual(16) {
            self.rows_of_sixteen(rows, label, false);
        } else if usual(17) {
            self.rows_of_sixteen(rows, label, true);
        } else if usual(1) && rows.len() > 1 {
            self.column(rows, label);
        } else {
            self.rows_of_four(rows, label);
        }
        self.take_sigma(before, is_sigma);
    }

    /// A matrix that is said to hold uncertainties, or is named like the one before with
    /// `_sigma`, belongs to that one.
    fn take_sigma(&mut self, before: usize, is_sigma: bool) {
        let [.., measured, sigma] = self.matrices.as_mut_slice() else {
            return;
        };
        let name = sigma
            .label
            .as_deref()
            .and_then(|name| name.strip_suffix("_sigma"));
        let named = name.is_some() && name == measured.label.as_deref();
        let may_be = sigma.mueller.iter().all(|&value| value >= 0.0);
        if before + 1 == self.matrices.len() && may_be && (is_sigma || named) {
            self.matrices[before - 1].sigma = self.matrices.pop().map(|sigma| sigma.mueller);
            self.begun -= 1;
        }
    }

    fn name(&self) -> String {
        format!("Matrix {}", self.begun)
    }

    /// Numbers one after the other, in one line or wrapped.
    fn run(&mut self, rows: Vec<Row>, label: Option<String>) {
        if rows.iter().any(|row| !row.is_good()) {
            self.begun += 1;
            let name = self.name();
            for row in rows {
                self.refuse_spots(row, &name);
            }
            return;
        }
        let total: usize = rows.iter().map(Row::width).sum();
        if !total.is_multiple_of(16) {
            self.begun += 1;
            let name = self.name();
            self.refuse(rows[0].error(
                "wrong-count",
                format!(
                    "{name}: expected 16 numbers, or 4 rows of 4, found {total} {}.",
                    if total == 1 {
                        "number"
                    } else {
                        "numbers in a row"
                    }
                ),
            ));
            return;
        }
        let mut label = label.or_else(|| rows[0].label.clone());
        let numbers: Vec<Placed> = rows.into_iter().flat_map(|row| row.numbers).collect();
        for sixteen in numbers.chunks(16) {
            self.begun += 1;
            self.matrix(sixteen, label.take());
        }
    }

    /// One number a line.
    fn column(&mut self, rows: Vec<Row>, label: Option<String>) {
        let mut label = label;
        if !rows.len().is_multiple_of(16) {
            self.begun += 1;
            let name = self.name();
            let message = format!(
                "{name}: expected 16 numbers, one a line, found {}.",
                rows.len()
            );
            self.refuse(rows[0].error("wrong-count", message));
            return;
        }
        let mut rows = rows.into_iter();
        while rows.len() > 0 {
            self.begun += 1;
            let name = self.name();
            let mut numbers = Vec::with_capacity(16);
            for (k, row) in rows.by_ref().take(16).enumerate() {
                if row.width() == 1 {
                    numbers.extend_from_slice(&row.numbers);
                } else {
                    let message = format!(
                        "{name}, number {}: expected 1 number in the line, found {}.",
                        k + 1,
                        row.width()
                    );
                    self.refuse(row.error("ragged-row", message));
                }
                self.refuse_spots(row, &format!("{name}, number {}", k + 1));
            }
            self.matrix(&numbers, label.take());
        }
    }

    /// Sixteen numbers a line; perhaps with one before them that says where each matrix
    /// was taken.
    fn rows_of_sixteen(&mut self, rows: Vec<Row>, label: Option<String>, with_coordinate: bool) {
        let mut label = label;
        let width = 16 + usize::from(with_coordinate);
        for mut row in rows {
            self.begun += 1;
            let own = row.label.take().or(label.take());
            let name = self.name();
            if !row.is_good() {
                self.refuse_spots(row, &name);
            } else if row.width() == width {
                let coordinate = with_coordinate.then(|| row.numbers[0].number.value);
                let made = self.matrices.len();
                self.matrix(&row.numbers[width - 16..], own);
                if let Some(matrix) = self.matrices.get_mut(made) {
                    matrix.coordinate = coordinate;
                }
            } else {
                let message = format!(
                    "{name}: expected {width} numbers in the row, found {}.",
                    row.width()
                );
                self.refuse(row.error("ragged-row", message));
            }
        }
    }

    fn rows_of_four(&mut self, rows: Vec<Row>, label: Option<String>) {
        let mut label = label;
        let count = rows.len();
        // With a row too many or too few nobody knows where a matrix begins.
        let whole = count.is_multiple_of(4);
        let complaint = rows[0].error(
            "wrong-count",
            if count < 4 {
                format!("expected 4 rows, found {count}.")
            } else {
                format!("{count} rows do not make matrices of 4 rows: one is missing or too many.")
            },
        );
        let refused = self.refusals.len() + self.surplus;
        let mut rows = rows.into_iter();
        let mut number = 0;
        while rows.len() > 0 {
            self.begun += usize::from(whole || number == 0);
            let name = self.name();
            let mut numbers = Vec::with_capacity(16);
            for _ in 0..rows.len().min(4) {
                let Some(row) = rows.next() else {
                    break;
                };
                number += 1;
                let place = format!(
                    "{name}, row {}",
                    if whole { (number - 1) % 4 + 1 } else { number }
                );
                if row.width() == 4 {
                    numbers.extend_from_slice(&row.numbers);
                } else {
                    let message = format!("{place}: expected 4 numbers, found {}.", row.width());
                    // A spoilt row says why it is too long or too short.
                    if row.is_good() {
                        self.refuse(row.error("ragged-row", message));
                    }
                }
                self.refuse_spots(row, &place);
            }
            if whole {
                self.matrix(&numbers, label.take());
            }
        }
        if !whole && self.refusals.len() + self.surplus == refused {
            let name = self.name();
            self.refuse(named(complaint, &name));
        }
    }

    fn refuse_spots(&mut self, row: Row, place: &str) {
        self.surplus += row.bad_count - row.bad.len();
        for spot in row.bad {
            let place = format!("{place}, column {}", spot.column);
            self.refuse(named(spot.error, &place));
        }
    }

    /// The printed uncertainties. An exact M00 has none; where others lack theirs, that
    /// is said and none is used.
    fn sigma(&mut self, numbers: &[Placed; 16]) -> Option<[f64; 16]> {
        let printed = numbers.map(|placed| placed.number.sigma);
        if printed.iter().all(Option::is_none) {
            return None;
        }
        let missing =
            (0..16).find(|&k| printed[k].is_none() && !(k == 0 && numbers[0].number.value == 1.0));
        if let Some(k) = missing {
            self.notes.push(Note {
                severity: Severity::Warning,
                code: "uncertainty-missing",
                message: "Some numbers carry an uncertainty and this one does not, so none of them is used."
                    .to_owned(),
                at: Some(numbers[k].place()),
            });
            return None;
        }
        Some(printed.map(|sigma| sigma.unwrap_or_default()))
    }

    /// Does nothing where a number is missing: that was said.
    fn matrix(&mut self, sixteen: &[Placed], label: Option<String>) {
        let Ok(numbers) = <&[Placed; 16]>::try_from(sixteen) else {
            return;
        };
        for placed in numbers.iter().filter(|placed| placed.number.underflows) {
            self.underflows += 1;
            if self.notes.len() < MOST_REFUSALS {
                self.notes.push(Note {
                    severity: Severity::Warning,
                    code: "underflow",
                    message: "This number is too small for a double and was read as zero."
                        .to_owned(),
                    at: Some(placed.place()),
                });
            }
        }
        let sigma = self.sigma(numbers);
        self.matrices.push(MatrixRead {
            mueller: numbers.map(|placed| placed.number.value),
            sigma,
            coordinate: label.as_deref().and_then(coordinate),
            label,
            line: numbers[0].line,
            decimals: resolution(numbers),
        });
    }
}

/// `450 nm` and `12.5` say where in a series a matrix belongs.
fn coordinate(label: &str) -> Option<f64> {
    let end = label
        .find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | '-' | '+')))
        .unwrap_or(label.len());
    let (number, unit) = label.split_at(end);
    let plain_unit = unit.chars().count() <= 8 && !unit.contains(|c: char| c.is_ascii_digit());
    number.parse().ok().filter(|_| plain_unit)
}

/// Sixteen numbers, or sixteens, that a printer broke where its line was full: all
/// lines but the last are as long, and too long for a row of a matrix.
fn is_wrapped(rows: &[Row]) -> bool {
    let [first, middle @ .., last] = rows else {
        return false;
    };
    let width = first.width();
    let total = width + middle.iter().map(Row::width).sum::<usize>() + last.width();
    width > 4
        && width != 16
        && middle.iter().all(|row| row.width() == width)
        && last.width() <= width
        && total.is_multiple_of(16)
        && (total == 16 || last.width() < width)
}

/// The complaint, with the matrix, row and column that it is about.
fn named(mut error: Error, place: &str) -> Error {
    error.message = format!("{place}: {}", error.message);
    error
}

/// Plain decimals may have lost their trailing zeros, so the finest counts; numbers
/// with exponents say how fine each is, so the coarsest counts. Whole numbers beside
/// decimals say nothing, nor do zero and one alone.
fn resolution(numbers: &[Placed; 16]) -> Option<u32> {
    let printed = || numbers.iter().map(|placed| placed.number);
    let plain = printed()
        .filter(|number| !number.has_exponent && number.decimals > 0)
        .map(|number| number.decimals)
        .max();
    let scientific = printed()
        .filter(|number| number.has_exponent && number.value != 0.0)
        .map(|number| number.decimals)
        .min();
    let decimals = match (plain, scientific) {
        (Some(plain), Some(scientific)) => plain.min(scientific),
        (Some(one), None) | (None, Some(one)) => one,
        (None, None) if printed().all(|number| number.value.abs() <= 1.0) => return None,
        (None, None) => 0,
    };
    u32::try_from(decimals)
        .ok()
        .filter(|&decimals| decimals <= 15)
}
