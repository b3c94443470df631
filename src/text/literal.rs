//! Numbers in brackets: nested lists, NumPy prints, rows with semicolons, JSON.

use super::number::{DecimalMark, parse_number};
use super::source::{Source, visible};
use super::{Attempt, Block, Form, Placed, ReadOptions, ReadingDescription, Row, assemble};
use crate::error::Error;

pub(super) fn attempts(source: &Source, options: &ReadOptions) -> Vec<Attempt> {
    [DecimalMark::Point, DecimalMark::Comma]
        .into_iter()
        .filter(|&decimal| options.decimal.is_none_or(|wanted| wanted == decimal))
        .filter_map(|decimal| Reader::new(source, decimal).read())
        .collect()
}

/// Goes through the characters once; nesting is a count, not a recursion.
struct Reader<'a> {
    source: &'a Source,
    decimal: DecimalMark,
    /// Tuples nest too where there is no other bracket.
    round_brackets: bool,
    depth: usize,
    line: usize,
    character: usize,
    semicolons: bool,
    /// The name of what comes next.
    label: Option<String>,
    blocks: Vec<Block>,
    /// Of the outermost bracket that is open.
    block: Block,
    row: Vec<Placed>,
    row_line: usize,
    /// The first thing that was wrong in the row.
    row_error: Option<Error>,
    /// What makes the whole text unreadable.
    fatal: Option<Error>,
}

impl<'a> Reader<'a> {
    fn new(source: &'a Source, decimal: DecimalMark) -> Self {
        Self {
            source,
            decimal,
            round_brackets: source.is_in_parentheses(),
            depth: 0,
            line: 0,
            character: 0,
            semicolons: false,
            label: None,
            blocks: Vec::new(),
            block: Block::default(),
            row: Vec::new(),
            row_line: 1,
            row_error: None,
            fatal: None,
        }
    }

    fn read(mut self) -> Option<Attempt> {
        while self.line < self.source.lines.len() && self.fatal.is_none() {
            if self.depth == 0
                && let Some(comment) = &self.source.comments[self.line]
            {
                self.label = Some(comment.clone());
            }
            self.character = 0;
            self.read_line();
            self.line += 1;
        }
        if self.depth > 0 && self.fatal.is_none() {
            let line = self.source.lines.len();
            self.fatal = Some(
                Error::new(
                    "open-bracket",
                    "A bracket is opened and not closed: the end of the text is missing.",
                )
                .at_text(line, 1, 1),
            );
        }
        self.end_row();
        self.end_block();
        let assembled = assemble(joined(self.blocks));
        let mut refusals = assembled.refusals;
        let mut matrices = assembled.matrices;
        if let Some(error) = self.fatal {
            // What an elided or cut text holds may be the wrong matrices.
            matrices.clear();
            refusals.insert(0, error);
        }
        (assembled.numbers > 0 || !refusals.is_empty()).then_some(Attempt {
            reading: ReadingDescription {
                form: if self.semicolons {
                    Form::BracketsWithSemicolons
                } else {
                    Form::Brackets
                },
                decimal: self.decimal,
                grouped: false,
                delimiter: None,
                header_row_count: 0,
            },
            matrices,
            numbers: assembled.numbers,
            refusals,
            notes: assembled.notes,
        })
    }

    fn peek(&self) -> Option<char> {
        self.source.lines[self.line].get(self.character).copied()
    }

    fn read_line(&mut self) {
        while let Some(c) = self.peek() {
            if self.fatal.is_some() {
                return;
            }
            match c {
                '[' | '{' => self.open(),
                ']' | '}' => self.close(),
                '(' if self.round_brackets => self.open(),
                ')' if self.round_brackets => self.close(),
                ';' => {
                    if self.depth > 0 {
                        self.semicolons = true;
                        self.end_row();
                    }
                    self.character += 1;
                }
                '.' if self.rest_starts_with("...") => self.ellipsis(),
                '-' | '+' | '.' | '0'..='9' => self.number(),
                c if c.is_alphabetic() || c == '_' => self.word(),
                ',' | '(' | ')' | '=' | '\0' | '"' | '\'' | '|' => self.character += 1,
                c if c.is_whitespace() => self.character += 1,
                _ => {
                    if self.depth > 0 {
                        self.refuse(
                            Error::new("bad-character", format!("'{c}' is not part of a number.")),
                            1,
                        );
                    }
                    self.character += 1;
                }
            }
        }
    }

    fn rest_starts_with(&self, what: &str) -> bool {
        let rest = &self.source.lines[self.line][self.character..];
        what.chars()
            .enumerate()
            .all(|(k, c)| rest.get(k) == Some(&c))
    }

    fn open(&mut self) {
        // A list inside a list is a row of its own.
        self.end_row();
        if self.depth == 0 {
            self.block.label = self.label.take();
        }
        let next = self.source.lines[self.line][self.character + 1..]
            .iter()
            .find(|c| !c.is_whitespace());
        if self.peek() == Some('{')
            && (next == Some(&'"') || self.object_on_next_line(next.is_none()))
        {
            self.fatal = Some(
                Error::new(
                    "json-object",
                    "This is a JSON object; paste the array of numbers in it.",
                )
                .at_text(self.line + 1, self.character + 1, 1),
            );
        }
        self.depth += 1;
        self.character += 1;
    }

    fn object_on_next_line(&self, line_is_over: bool) -> bool {
        line_is_over
            && self
                .source
                .lines
                .get(self.line + 1)
                .and_then(|line| line.iter().find(|c| !c.is_whitespace()))
                == Some(&'"')
    }

    fn close(&mut self) {
        self.end_row();
        if self.depth == 0 {
            self.fatal = Some(
                Error::new(
                    "open-bracket",
                    "A bracket is closed that was not opened: the start of the text is missing.",
                )
                .at_text(self.line + 1, self.character + 1, 1),
            );
        }
        self.depth = self.depth.saturating_sub(1);
        if self.depth == 0 {
            self.end_block();
        }
        self.character += 1;
    }

    /// Three points end a line that goes on, or stand for numbers that are missing.
    fn ellipsis(&mut self) {
        let line = &self.source.lines[self.line];
        let nothing_after = line[self.character + 3..].iter().all(|c| c.is_whitespace());
        let something_before = line[..self.character].iter().any(|c| !c.is_whitespace());
        if !(nothing_after && something_before && self.depth == 1) {
            self.fatal = Some(
                Error::new(
                    "elided-print",
                    "The three points stand for numbers that were not printed; print the array in full (numpy.set_printoptions(threshold=numpy.inf)) and paste again.",
                )
                .at_text(self.line + 1, self.character + 1, 3),
            );
        }
        self.character += 3;
    }

    fn number(&mut self) {
        let line = &self.source.lines[self.line];
        let start = self.character;
        let mut end = start;
        while let Some(&c) = line.get(end) {
            let comma_inside = c == ','
                && self.decimal == DecimalMark::Comma
                && end > start
                && line.get(end + 1).is_some_and(char::is_ascii_digit);
            let sign = matches!(c, '-' | '+')
                && (end == start || matches!(line[end - 1], 'e' | 'E' | 'd' | 'D'));
            if !(c.is_alphanumeric()
                || matches!(c, '.' | '_' | '\0' | '\u{b1}')
                || comma_inside
                || sign)
            {
                break;
            }
            end += 1;
        }
        let token = visible(&line[start..end]);
        // A sign on its own, or one that joins two numbers.
        let end = end.max(start + 1);
        self.character = end;
        if self.depth == 0 {
            return;
        }
        match parse_number(&token, self.decimal, false) {
            Ok(number) => {
                if self.row.is_empty() {
                    self.row_line = self.line + 1;
                }
                self.row.push(Placed {
                    number,
                    line: self.line + 1,
                    character: start + 1,
                    length: end - start,
                });
            }
            Err(problem) => {
                let error = problem
                    .error(&token)
                    .at_text(self.line + 1, start + 1, end - start);
                if self.row_error.is_none() {
                    self.row_error = Some(error);
                }
            }
        }
    }

    /// Names of functions and arrays are passed over; words in place of numbers are
    /// not.
    fn word(&mut self) {
        let line = &self.source.lines[self.line];
        let start = self.character;
        let mut end = start;
        while line
            .get(end)
            .is_some_and(|c| c.is_alphanumeric() || matches!(c, '_' | '.'))
        {
            end += 1;
        }
        let word = visible(&line[start..end]);
        let next = line[end..].iter().copied().find(|c| !c.is_whitespace());
        self.character = end;
        if next == Some('(') {
            return;
        }
        if next == Some('=') {
            if self.depth == 0 {
                self.label = Some(word);
            }
            // The value of an option such as `dtype=float32`.
            let rest = &line[end..];
            let skipped = rest
                .iter()
                .take_while(|c| !matches!(c, '[' | '{' | '(' | ',' | ')' | ';'))
                .count();
            self.character = end + skipped;
            return;
        }
        if self.depth == 0 {
            if next == Some(':') || next.is_none() {
                self.label = Some(visible(line).trim().trim_end_matches(':').to_owned());
            }
            return;
        }
        let error = parse_number(&word, self.decimal, false)
            .err()
            .map(|problem| problem.error(&word));
        if let Some(error) = error {
            self.character = start;
            self.refuse(error, end - start);
            self.character = end;
        }
    }

    /// Marks the row as bad at the present place.
    fn refuse(&mut self, error: Error, length: usize) {
        if self.row.is_empty() && self.row_error.is_none() {
            self.row_line = self.line + 1;
        }
        if self.row_error.is_none() {
            self.row_error = Some(error.at_text(self.line + 1, self.character + 1, length.max(1)));
        }
    }

    fn end_row(&mut self) {
        let numbers = std::mem::take(&mut self.row);
        let error = self.row_error.take();
        if numbers.is_empty() && error.is_none() {
            return;
        }
        let length = self
            .source
            .lines
            .get(self.row_line - 1)
            .map_or(1, |line| line.len().max(1));
        self.block.rows.push(Row {
            numbers: error.map_or(Ok(numbers), Err),
            label: None,
            line: self.row_line,
            length,
        });
    }

    fn end_block(&mut self) {
        let block = std::mem::take(&mut self.block);
        if !block.rows.is_empty() {
            self.blocks.push(block);
        }
    }
}

/// Lists of one row each, one after the other, are the rows of one list.
fn joined(blocks: Vec<Block>) -> Vec<Block> {
    let single = |block: &Block| {
        block.rows.len() == 1
            && block.rows[0]
                .numbers
                .as_ref()
                .is_ok_and(|row| row.len() == 4)
    };
    let mut out: Vec<Block> = Vec::new();
    let mut open = false;
    for block in blocks {
        let joins = single(&block);
        match out.last_mut() {
            Some(last) if open && joins => last.rows.extend(block.rows),
            _ => out.push(block),
        }
        open = joins;
    }
    out
}
