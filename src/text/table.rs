//! Lines of numbers with a delimiter.

use super::assembly::{Assembly, Block, Placed, Row};
use super::number::{DecimalMark, NumberProblem, PrintedNumber, parse_scaled};
use super::source::{Source, is_blank, label, visible};
use super::{Attempt, Delimiter, Form, ReadOptions, ReadingDescription};

pub(super) fn attempts(source: &Source, options: &ReadOptions) -> impl Iterator<Item = Attempt> {
    dialects(source, options)
        .into_iter()
        .filter_map(|dialect| Reader { source, dialect }.read())
}

#[derive(Clone, Copy)]
struct Dialect {
    decimal: DecimalMark,
    delimiter: Delimiter,
    /// Whether thousands are grouped.
    grouped: bool,
}

/// What may be meant, the likelier first: elements of a thousand and more are rare.
fn dialects(source: &Source, options: &ReadOptions) -> Vec<Dialect> {
    let [tabs, semicolons, commas, points, quotes] =
        ['\t', ';', ',', '.', '"'].map(|c| source.contains(c));
    let mut dialects = Vec::new();
    for grouped in [false, true] {
        for decimal in [DecimalMark::Point, DecimalMark::Comma] {
            for (delimiter, present) in [
                (Delimiter::Tab, tabs),
                (Delimiter::Semicolon, semicolons),
                (Delimiter::Comma, commas),
                (Delimiter::Space, true),
            ] {
                let settled = options
                    .delimiter
                    .map_or(present, |wanted| wanted == delimiter)
                    && options
                        .decimal
                        .map_or(commas || decimal == DecimalMark::Point, |wanted| {
                            wanted == decimal
                        });
                // Points group thousands only where a number shows both marks:
                // `0.123` alone never means 123.
                let may_group = match delimiter {
                    Delimiter::Comma => decimal == DecimalMark::Point && quotes,
                    Delimiter::Space => commas && (decimal == DecimalMark::Point || points),
                    Delimiter::Tab | Delimiter::Semicolon => true,
                };
                if settled && (may_group || !grouped) {
                    dialects.push(Dialect {
                        decimal,
                        delimiter,
                        grouped,
                    });
                }
            }
        }
    }
    dialects
}

/// A field of a line, trimmed.
struct Field {
    start: usize,
    end: usize,
    number: Result<PrintedNumber, NumberProblem>,
    looks_numeric: bool,
}

enum Line {
    Blank,
    /// A header or a name.
    Text,
    Row(Row),
}

struct Reader<'a> {
    source: &'a Source,
    dialect: Dialect,
}

impl Reader<'_> {
    /// `None` where there is not one number.
    fn read(&self) -> Option<Attempt> {
        let mut blocks: Vec<Block> = Vec::new();
        let mut fields = Vec::new();
        let mut open = false;
        let mut name = None;
        let mut header_row_count = 0;
        let mut columns = None;
        for k in 0..self.source.line_count() {
            if let Some((first, last)) = self.source.columns(k) {
                columns = Some(Columns {
                    block: if first == 1 {
                        blocks.len()
                    } else {
                        blocks.len().saturating_sub(1)
                    },
                    row: 0,
                    first,
                    last,
                });
                open = false;
                continue;
            }
            self.split(k, &mut fields);
            match self.line(k, &fields) {
                Line::Blank => {
                    open = false;
                    if self.source.has_comment(k) {
                        name = self.source.comment(k).or(name);
                    }
                }
                Line::Text => {
                    open = false;
                    columns = None;
                    header_row_count += usize::from(blocks.is_empty());
                    if !self.names_columns(&fields) {
                        name = label(self.source.line(k)).or(name);
                    }
                }
                Line::Row(row) => {
                    if let Some(columns) = columns.as_mut().filter(|columns| columns.first > 1) {
                        columns.take(&mut blocks, row);
                        continue;
                    }
                    if !open {
                        blocks.push(Block {
                            label: name.take(),
                            ..Block::default()
                        });
                        open = true;
                    }
                    if let Some(block) = blocks.last_mut() {
                        block.rows.push(row);
                    }
                }
            }
        }
        if blocks.is_empty() {
            return None;
        }
        Some(Attempt {
            reading: ReadingDescription {
                form: Form::Table,
                decimal: self.dialect.decimal,
                grouped: self.dialect.grouped,
                delimiter: Some(self.dialect.delimiter),
                header_row_count,
                stacking: None,
            },
            assembly: Assembly::of(with_air(blocks)),
        })
    }

    fn line(&self, k: usize, fields: &[Field]) -> Line {
        let Some(first) = fields.first() else {
            return Line::Blank;
        };
        let numeric = fields.iter().filter(|field| field.looks_numeric).count();
        let words = fields.len() - numeric;
        if numeric == 0 || words >= numeric && self.is_title(k, words, numeric) {
            return Line::Text;
        }
        let line = self.source.line(k);
        // A word before the numbers names the row.
        let named = !first.looks_numeric && fields.len() > 1;
        let elements = &fields[usize::from(named)..];
        // A word behind a whole row is a unit or a remark.
        let elements = match elements.split_last() {
            Some((unit, rest)) if is_remark(unit) && matches!(rest.len(), 1 | 4 | 16 | 17) => rest,
            _ => elements,
        };
        let last = elements.last().unwrap_or(first);
        let mut row = Row::at(k + 1, first.start + 1, last.end - first.start);
        if named {
            row.label = label(&line[first.start..first.end]);
        }
        for (column, field) in elements.iter().enumerate() {
            let length = (field.end - field.start).max(1);
            match &field.number {
                Ok(number) => row.numbers.push(Placed {
                    number: *number,
                    line: k + 1,
                    character: field.start + 1,
                    length,
                }),
                Err(problem) => {
                    let token = visible(&line[field.start..field.end]);
                    row.spoil(
                        column + 1,
                        problem,
                        &token,
                        (k + 1, field.start + 1, length),
                    );
                }
            }
        }
        Line::Row(row)
    }

    /// `Film 3` and `450 nm` before a matrix; in a list of names with one number each
    /// the next line is as short.
    fn is_title(&self, k: usize, words: usize, numeric: usize) -> bool {
        if numeric >= 4 {
            return false;
        }
        if words > 1 || numeric > 1 {
            return true;
        }
        let mut next = Vec::new();
        for line in k + 1..self.source.line_count() {
            self.split(line, &mut next);
            if !next.is_empty() {
                return next.len() >= 4;
            }
        }
        false
    }

    /// `M00 M01 …`: one word above each column is no name of a matrix.
    fn names_columns(&self, fields: &[Field]) -> bool {
        fields.len() >= 4
            && (self.dialect.delimiter != Delimiter::Space
                || fields.iter().all(|field| field.end - field.start <= 4))
    }

    /// The fields of a line, without empty ones at its end.
    fn split(&self, k: usize, fields: &mut Vec<Field>) {
        fields.clear();
        let line = self.source.line(k);
        let mut start = 0;
        let mut quoted = false;
        for at in 0..=line.len() {
            if line.get(at) == Some(&'"') {
                quoted = !quoted;
            }
            if at == line.len() || (!quoted && self.cuts(line, at)) {
                let field = self.field(line, start, at, self.source.power(k));
                if self.dialect.delimiter != Delimiter::Space || field.end > field.start {
                    fields.push(field);
                }
                start = at + 1;
            }
        }
        while fields.last().is_some_and(|field| field.end == field.start) {
            fields.pop();
        }
    }

    fn cuts(&self, line: &[char], at: usize) -> bool {
        match self.dialect.delimiter {
            Delimiter::Tab => line[at] == '\t',
            Delimiter::Semicolon => line[at] == ';',
            Delimiter::Space => line[at].is_whitespace(),
            Delimiter::Comma => {
                let outside = |c: Option<&char>| c.is_none_or(|&c| is_blank(c) || c == '"');
                line[at] == ','
                    && (self.dialect.decimal == DecimalMark::Point
                        || outside(line.get(at + 1))
                        || at > 0 && outside(line.get(at - 1)))
            }
        }
    }

    fn field(&self, line: &[char], start: usize, end: usize, power: i32) -> Field {
        let blank = |c: char| is_blank(c) || c == '"';
        let mut from = start;
        let mut to = end;
        while from < to && blank(line[from]) {
            from += 1;
        }
        while to > from && blank(line[to - 1]) {
            to -= 1;
        }
        let text = visible(&line[from..to]);
        let number = parse_scaled(&text, self.dialect.decimal, self.dialect.grouped, power);
        let looks_numeric = match &number {
            Ok(_) => true,
            Err(problem) => {
                problem.code == "not-finite"
                    || text == "-"
                    || text
                        .trim_start_matches(['-', '+', '.', ','])
                        .starts_with(|c: char| c.is_ascii_digit())
            }
        };
        Field {
            start: from,
            end: to,
            number,
            looks_numeric,
        }
    }
}

/// The part of a matrix that a heading announces: `Columns 5 through 8`.
struct Columns {
    /// The block that its rows go on.
    block: usize,
    /// The next row of it.
    row: usize,
    first: usize,
    last: usize,
}

impl Columns {
    /// Joins a row to the one on its left.
    fn take(&mut self, blocks: &mut [Block], row: Row) {
        let Some(block) = blocks.get_mut(self.block) else {
            return;
        };
        let width = self.last + 1 - self.first;
        match block.rows.get_mut(self.row) {
            Some(left) if left.width() + 1 == self.first && row.width() <= width => {
                left.join(row);
                self.row += 1;
            }
            _ => {
                let message = format!(
                    "the rows under columns {} to {} do not go on with those before.",
                    self.first, self.last
                );
                block.rows.clear();
                block.failed = Some(row.error("ragged-row", message));
            }
        }
    }
}

/// A word that neither is nor should be a number.
fn is_remark(field: &Field) -> bool {
    matches!(&field.number, Err(problem) if problem.code == "bad-number") && !field.looks_numeric
}

/// Four lines apart by blank lines are one matrix with air in it.
fn with_air(blocks: Vec<Block>) -> Vec<Block> {
    let rows = blocks.iter().map(|block| block.rows.len()).sum::<usize>();
    let named = blocks.iter().skip(1).any(|block| block.label.is_some());
    let fours = blocks
        .iter()
        .flat_map(|block| &block.rows)
        .all(|row| row.width() == 4);
    if rows != 4 || blocks.len() == 1 || named || !fours {
        return blocks;
    }
    let label = blocks.first().and_then(|block| block.label.clone());
    vec![Block {
        rows: blocks.into_iter().flat_map(|block| block.rows).collect(),
        label,
        ..Block::default()
    }]
}
