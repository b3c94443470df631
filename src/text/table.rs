//! Lines of numbers with a delimiter.

use super::number::{DecimalMark, parse_number};
use super::source::{Source, visible};
use super::{
    Attempt, Block, Delimiter, Form, Placed, ReadOptions, ReadingDescription, Row, assemble,
};
use crate::error::Error;

/// A field of a line, trimmed, and where it stands.
struct Field {
    text: String,
    start: usize,
    length: usize,
}

pub(super) fn attempts(source: &Source, options: &ReadOptions) -> Vec<Attempt> {
    let mut attempts = Vec::new();
    for decimal in [DecimalMark::Point, DecimalMark::Comma] {
        for delimiter in [
            Delimiter::Tab,
            Delimiter::Semicolon,
            Delimiter::Comma,
            Delimiter::Space,
        ] {
            let settled = options.decimal.is_none_or(|wanted| wanted == decimal)
                && options.delimiter.is_none_or(|wanted| wanted == delimiter);
            if !settled || !applies(source, delimiter) {
                continue;
            }
            for grouped in [false, true] {
                if grouped && !may_group(source, decimal, delimiter) {
                    continue;
                }
                attempts.extend(attempt(source, decimal, delimiter, grouped));
            }
        }
    }
    attempts
}

fn applies(source: &Source, delimiter: Delimiter) -> bool {
    let mark = match delimiter {
        Delimiter::Tab => '\t',
        Delimiter::Semicolon => ';',
        Delimiter::Comma => ',',
        Delimiter::Space => return true,
    };
    source.lines.iter().flatten().any(|&c| c == mark)
}

/// Points group thousands only where a number shows both marks: `0.123` alone never
/// means 123.
fn may_group(source: &Source, decimal: DecimalMark, delimiter: Delimiter) -> bool {
    let present = |mark| source.lines.iter().flatten().any(|&c| c == mark);
    match decimal {
        DecimalMark::Point => delimiter != Delimiter::Comma && present(','),
        DecimalMark::Comma => delimiter != Delimiter::Comma && present('.') && present(','),
    }
}

/// `None` where there is not one number.
fn attempt(
    source: &Source,
    decimal: DecimalMark,
    delimiter: Delimiter,
    grouped: bool,
) -> Option<Attempt> {
    let mut blocks: Vec<Block> = Vec::new();
    let mut open = false;
    let mut label = None;
    let mut header_row_count = 0;
    for (k, line) in source.lines.iter().enumerate() {
        let fields = split(line, delimiter, decimal);
        if let Some(comment) = &source.comments[k]
            && fields.is_empty()
        {
            label = Some(comment.clone());
            open = false;
            continue;
        }
        if fields.is_empty() {
            open = false;
            continue;
        }
        match row(&fields, k + 1, line.len(), decimal, grouped) {
            Line::Text => {
                header_row_count += usize::from(blocks.is_empty());
                label = Some(visible(line).trim().trim_end_matches(':').to_owned());
                open = false;
            }
            Line::Row(row) => {
                if !open {
                    blocks.push(Block {
                        rows: Vec::new(),
                        label: label.take(),
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
    let assembled = assemble(blocks);
    Some(Attempt {
        reading: ReadingDescription {
            form: Form::Table,
            decimal,
            grouped,
            delimiter: Some(delimiter),
            header_row_count,
        },
        matrices: assembled.matrices,
        numbers: assembled.numbers,
        refusals: assembled.refusals,
        notes: assembled.notes,
    })
}

enum Line {
    /// A header or a name.
    Text,
    Row(Row),
}

fn row(fields: &[Field], line: usize, length: usize, decimal: DecimalMark, grouped: bool) -> Line {
    let numbers: Vec<_> = fields
        .iter()
        .map(|field| {
            parse_number(&field.text, decimal, grouped)
                .map(|number| Placed {
                    number,
                    line,
                    character: field.start + 1,
                    length: field.length.max(1),
                })
                .map_err(|problem| {
                    problem
                        .error(&field.text)
                        .at_text(line, field.start + 1, field.length.max(1))
                })
        })
        .collect();
    let good = numbers.iter().filter(|number| number.is_ok()).count();
    if good == 0 && !fields.iter().any(|field| looks_numeric(&field.text)) {
        return Line::Text;
    }
    // A word before the numbers names the row.
    let labelled = numbers.len() > 1
        && good + 1 == numbers.len()
        && numbers[0].is_err()
        && !looks_numeric(&fields[0].text);
    let label = labelled.then(|| fields[0].text.clone());
    let numbers: std::result::Result<Vec<Placed>, Error> =
        numbers.into_iter().skip(usize::from(labelled)).collect();
    Line::Row(Row {
        numbers,
        label,
        line,
        length: length.max(1),
    })
}

fn looks_numeric(text: &str) -> bool {
    text.trim_start_matches(['-', '+', '.', ','])
        .starts_with(|c: char| c.is_ascii_digit())
}

/// The fields of a line, without empty ones at its end.
fn split(line: &[char], delimiter: Delimiter, decimal: DecimalMark) -> Vec<Field> {
    let mut fields = Vec::new();
    let mut start = 0;
    let mut quoted = false;
    for k in 0..=line.len() {
        let at_end = k == line.len();
        if !at_end && line[k] == '"' {
            quoted = !quoted;
        }
        let cut = at_end
            || (!quoted
                && match delimiter {
                    Delimiter::Tab => line[k] == '\t',
                    Delimiter::Semicolon => line[k] == ';',
                    Delimiter::Comma => {
                        line[k] == ','
                            && (decimal == DecimalMark::Point
                                || line.get(k + 1).is_none_or(|next| next.is_whitespace()))
                    }
                    Delimiter::Space => line[k].is_whitespace(),
                });
        if cut {
            let field = trimmed(line, start, k);
            if delimiter != Delimiter::Space || !field.text.is_empty() {
                fields.push(field);
            }
            start = k + 1;
        }
    }
    while fields.last().is_some_and(|field| field.text.is_empty()) {
        fields.pop();
    }
    fields
}

fn trimmed(line: &[char], start: usize, end: usize) -> Field {
    let blank = |c: char| c.is_whitespace() || c == '\0' || c == '"';
    let mut from = start;
    let mut to = end;
    while from < to && blank(line[from]) {
        from += 1;
    }
    while to > from && blank(line[to - 1]) {
        to -= 1;
    }
    Field {
        text: visible(&line[from..to]),
        start: from,
        length: to - from,
    }
}
