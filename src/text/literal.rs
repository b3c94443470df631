//! Numbers in brackets: nested lists, NumPy prints, rows with semicolons, JSON.

use super::assembly::{Assembly, Block, Placed, Row};
use super::number::{DecimalMark, NumberProblem, parse_number};
use super::source::{ELIDED, NOTHING, Source, is_blank, label, visible};
use super::{Attempt, Form, ReadOptions, ReadingDescription};
use crate::error::Error;

pub(super) fn attempts(source: &Source, options: &ReadOptions) -> impl Iterator<Item = Attempt> {
    decimal_marks(source, options).filter_map(|decimal| Reader::new(source, decimal).read())
}

/// Rows with semicolons whose brackets were not copied.
pub(super) fn bare_attempts(
    source: &Source,
    options: &ReadOptions,
) -> impl Iterator<Item = Attempt> {
    let applies = options.delimiter.is_none() && source.contains(';');
    decimal_marks(source, options)
        .filter(move |_| applies)
        .filter_map(|decimal| {
            let mut reader = Reader::new(source, decimal);
            reader.bare = true;
            reader.push(Kind::List, '\n');
            reader.read()
        })
}

fn decimal_marks(
    source: &Source,
    options: &ReadOptions,
) -> impl Iterator<Item = DecimalMark> + use<> {
    let wanted = options.decimal;
    let commas = source.contains(',');
    [DecimalMark::Point, DecimalMark::Comma]
        .into_iter()
        .filter(move |&decimal| match wanted {
            Some(wanted) => wanted == decimal,
            None => decimal == DecimalMark::Point || commas,
        })
}

/// Lists that can't be used beyond these are counted and not kept.
const MOST_FAILURES: usize = 100;

#[derive(Clone, Copy, PartialEq, Eq)]
enum Kind {
    /// Holds numbers or lists.
    List,
    /// Of a function that leaves its numbers as they are.
    Call,
    /// With named members: what stands in it directly says nothing of its own.
    Object,
    /// A member that holds no matrices.
    Skipped,
    /// Of another function.
    ForeignCall,
    /// Of an aside.
    Aside,
}

/// A bracket that is open.
struct Open {
    kind: Kind,
    close: char,
    /// Whether what is in it makes rows, and not one row.
    has_rows: bool,
    /// How many lists were open around an object.
    depth_around: usize,
}

/// What stood before, in the same line.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Previous {
    Nothing,
    /// Where it began and ended.
    Word(usize, usize),
    /// Where it ended.
    Number(usize),
    /// A list, or a function that leaves it as it is, was closed.
    Value,
    Index,
    Comma,
    Continuation,
    Other,
}

/// Goes through the characters once; nesting is a stack, not a recursion.
struct Reader<'a> {
    source: &'a Source,
    decimal: DecimalMark,
    /// Tuples nest too where there is no other bracket.
    round_brackets: bool,
    /// Whether the outermost brackets are only thought.
    bare: bool,
    open: Vec<Open>,
    /// How many of the open brackets are lists.
    depth: usize,
    line: usize,
    character: usize,
    previous: Previous,
    /// Whether something is calculated with what comes next.
    operator: bool,
    semicolons: bool,
    /// Numbers of this line outside of the brackets.
    outside: usize,
    /// The name of what comes next.
    label: Option<String>,
    /// Whether the text is an object, where names are in quotes.
    in_object: bool,
    /// The member that comes next.
    key: String,
    /// What the present object calls itself.
    object_name: Option<String>,
    /// Lists of an object that are no matrices, if that is all there is.
    other_lists: Option<Error>,
    /// Whether a list of one row may go on with the next one.
    joins: bool,
    row: Row,
    block: Block,
    blocks: Vec<Block>,
    /// How many blocks there were before the outermost list.
    mark: usize,
    /// Why the outermost list can't be used.
    spoilt: Option<Error>,
    /// Lists that can't be used.
    failures: usize,
    /// What was passed over beside the lists.
    aside: Vec<Error>,
}

impl<'a> Reader<'a> {
    fn new(source: &'a Source, decimal: DecimalMark) -> Self {
        Self {
            source,
            decimal,
            round_brackets: source.is_in_parentheses(),
            bare: false,
            open: Vec::new(),
            depth: 0,
            line: 0,
            character: 0,
            previous: Previous::Nothing,
            operator: false,
            semicolons: false,
            outside: 0,
            label: None,
            in_object: source.is_object(),
            key: String::new(),
            object_name: None,
            other_lists: None,
            joins: false,
            row: Row::default(),
            block: Block::default(),
            blocks: Vec::new(),
            mark: 0,
            spoilt: None,
            failures: 0,
            aside: Vec::new(),
        }
    }

    fn read(mut self) -> Option<Attempt> {
        for line in 0..self.source.line_count() {
            self.line = line;
            self.begin_line();
            while let Some(&c) = self.rest().first() {
                if is_blank(c) {
                    self.character += 1;
                } else {
                    self.step(c);
                }
            }
            self.end_line();
        }
        if self.bare {
            self.depth = 0;
            self.end_row();
            self.end_block();
            self.end_value();
        } else if self.depth > 0 {
            self.depth = 0;
            self.row = Row::default();
            self.block = Block::default();
            self.spoilt.get_or_insert(
                Error::new(
                    "open-bracket",
                    "A bracket is opened and not closed: the end of the text is missing.",
                )
                .at_text(self.source.line_count(), 1, 1),
            );
            self.end_value();
        }
        let mut assembly = Assembly::of(joined(self.blocks));
        if assembly.matrices.is_empty()
            && let Some(error) = self.other_lists
        {
            assembly.refuse(error);
        }
        assembly.surplus += self.failures.saturating_sub(MOST_FAILURES);
        for error in self.aside {
            assembly.refuse(error);
        }
        (assembly.numbers > 0 || !assembly.refusals.is_empty()).then_some(Attempt {
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
                stacking: None,
            },
            assembly,
        })
    }

    fn characters(&self) -> &'a [char] {
        self.source.line(self.line)
    }

    fn rest(&self) -> &'a [char] {
        &self.characters()[self.character..]
    }

    fn begin_line(&mut self) {
        self.character = 0;
        self.previous = Previous::Nothing;
        self.operator = false;
        self.outside = 0;
        if self.depth > 0 || self.in_object {
            return;
        }
        let line = self.characters();
        let blank = line.iter().all(|&c| is_blank(c));
        if blank {
            self.open.retain(|open| open.kind != Kind::ForeignCall);
        }
        let in_call = self.open.iter().any(|open| open.kind == Kind::Call);
        let comment = self.source.comment(self.line);
        if let Some(name) = comment.or_else(|| name_in(line)).filter(|_| !in_call) {
            self.label = Some(name);
            self.joins = false;
        } else if blank {
            self.joins = false;
        }
    }

    /// A line ends a row of a matrix in single brackets, if no comma says otherwise.
    fn end_line(&mut self) {
        let more = matches!(self.previous, Previous::Comma | Previous::Continuation);
        if self.depth == 1 && self.row.width() > 0 && !more {
            self.end_row();
            self.set_has_rows();
        }
        self.open.retain(|open| open.kind != Kind::Aside);
    }

    /// One token, which begins with `c`.
    fn step(&mut self, c: char) {
        let start = self.character;
        if self.previous == Previous::Value && self.ends_in_calculation(c) {
            return;
        }
        if self.skips(c) {
            return;
        }
        match c {
            '[' | '{' | '(' => self.opening(c),
            ']' | '}' | ')' => self.closing(c),
            '.' | '…' if self.points() > 0 => self.ellipsis(),
            '-' | '+' | '.' | '0'..='9' => self.number(),
            c if c.is_alphabetic() || c == '_' => self.word(),
            ',' | '&' => {
                let gap = self.previous == Previous::Comma || (c == '&' && self.row.width() == 0);
                if self.depth > 0 && gap {
                    self.bad_token(&NumberProblem::EMPTY, "", start, start + 1);
                }
                self.character += 1;
                self.previous = Previous::Comma;
                self.operator &= self.depth > 0;
            }
            ';' => {
                self.character += 1;
                self.previous = Previous::Other;
                self.operator &= self.depth > 0;
                if self.depth > 0 {
                    self.semicolons = true;
                    self.end_row();
                    self.set_has_rows();
                }
            }
            '"' | '\'' if self.in_object => self.string(c),
            '"' | '\'' => self.character += 1,
            '=' => self.equals(),
            _ => {
                self.character += 1;
                self.previous = Previous::Other;
                self.operator |= matches!(c, '*' | '/' | '^' | '@' | '\\');
                self.operator &= c != ':';
                if self.depth > 0 {
                    self.bad_spot(start, self.character);
                }
            }
        }
    }

    /// Whether what follows a closed bracket changes its numbers: then they are
    /// dropped with the rest of the line.
    fn ends_in_calculation(&mut self, c: char) -> bool {
        let calculated = match c {
            '.' if self.depth == 0 && self.points() == 0 => {
                if is_plain_reshape(self.rest()) {
                    self.character = self.characters().len();
                    return true;
                }
                true
            }
            '*' | '/' | '+' | '-' | '^' | '@' | '\'' => true,
            _ => false,
        };
        if calculated {
            self.spoil(calculation(self.line, self.character));
            if self.depth == 0 {
                self.end_value();
                self.character = self.characters().len();
            } else {
                self.character += 1;
            }
            self.previous = Previous::Other;
        }
        calculated
    }

    fn push(&mut self, kind: Kind, close: char) {
        self.depth += usize::from(kind == Kind::List);
        self.open.push(Open {
            kind,
            close,
            has_rows: false,
            depth_around: self.depth,
        });
    }

    /// Goes past a member that holds no matrices.
    fn skips(&mut self, c: char) -> bool {
        let inside = self
            .open
            .last()
            .is_some_and(|open| open.kind == Kind::Skipped);
        let begins = self.in_object && self.key == "tables" && matches!(c, '[' | '{');
        if !(inside || begins) || matches!(c, '"' | '\'') {
            return false;
        }
        self.key.clear();
        match c {
            '[' => self.push(Kind::Skipped, ']'),
            '{' => self.push(Kind::Skipped, '}'),
            ']' | '}' => {
                self.open.pop();
            }
            _ => {}
        }
        self.character += 1;
        self.previous = Previous::Other;
        true
    }

    /// A name or a text in an object; numbers in quotes are numbers.
    fn string(&mut self, quote: char) {
        let line = self.characters();
        let start = self.character + 1;
        let mut end = start;
        while let Some(&c) = line.get(end).filter(|&&c| c != quote) {
            end += if c == '\\' { 2 } else { 1 };
        }
        let text = &line[start..end.min(line.len())];
        let is_member = self
            .open
            .last()
            .is_some_and(|open| open.kind == Kind::Object);
        let number = text
            .first()
            .is_some_and(|c| c.is_ascii_digit() || matches!(c, '-' | '+'));
        if number && !is_member && self.depth > 0 {
            self.character += 1;
            return;
        }
        self.character = (end + 1).min(line.len());
        let is_name = self.next_visible() == Some(':');
        if is_member && is_name {
            self.key = visible(text);
        } else if is_member && matches!(self.key.as_str(), "name" | "label" | "title") {
            self.object_name = label(text);
        }
        self.previous = Previous::Other;
    }

    fn opening(&mut self, c: char) {
        let start = self.character;
        if c == '[' && self.depth == 0 && self.skip_index() {
            return;
        }
        let kind = match (c, self.previous) {
            ('{', _) if self.in_object => Kind::Object,
            ('(', Previous::Word(from, to)) => self.kind_of_call(from, to),
            ('(', Previous::Number(end)) if self.depth > 0 && end == start => {
                self.bad_spot(start, start + 1);
                Kind::ForeignCall
            }
            ('(', Previous::Number(end)) if end == start => Kind::ForeignCall,
            ('(', _) if self.depth == 0 && !self.round_brackets => Kind::Aside,
            _ => Kind::List,
        };
        let factor = match self.previous {
            Previous::Number(end) => end == start || self.source.is_typeset,
            _ => false,
        };
        self.character += 1;
        self.previous = Previous::Nothing;
        if kind == Kind::List {
            // A list inside a list is a row of its own.
            self.end_row();
            if self.depth == 0 {
                self.begin_value(start, factor);
            }
        }
        self.push(
            kind,
            match c {
                '[' => ']',
                '{' => '}',
                _ => ')',
            },
        );
        if kind == Kind::Object {
            self.end_row();
            self.depth = 0;
            self.object_name = None;
        }
    }

    /// Before a list that is in no other; `factor`: a number stands before it.
    fn begin_value(&mut self, start: usize, factor: bool) {
        self.mark = self.blocks.len();
        self.spoilt = None;
        let name = match self.key.as_str() {
            _ if !self.in_object => self.label.take(),
            "" | "mueller" | "matrix" | "values" | "data" => self.object_name.clone(),
            key => self.object_name.clone().or_else(|| Some(key.to_owned())),
        };
        self.block = Block {
            label: name,
            joins: self.joins,
            is_sigma: self.in_object && self.key == "sigma",
            ..Block::default()
        };
        self.joins = !self.in_object;
        let applied =
            !self.in_object && self.open.iter().any(|open| open.kind == Kind::ForeignCall);
        if self.operator || applied || factor {
            self.spoil(calculation(self.line, start));
        }
    }

    /// After it.
    fn end_value(&mut self) {
        self.operator = false;
        if self.in_object && self.spoilt.is_none() {
            self.drop_other_lists();
        }
        if let Some(error) = self.spoilt.take() {
            self.blocks.truncate(self.mark);
            self.failures += 1;
            if self.failures <= MOST_FAILURES {
                self.blocks.push(Block {
                    failed: Some(error),
                    ..Block::default()
                });
            }
            self.mark = self.blocks.len();
            self.block = Block::default();
            self.joins = false;
        }
    }

    /// An object may hold lists that are no matrices.
    fn drop_other_lists(&mut self) {
        let rows = self.blocks[self.mark.min(self.blocks.len())..]
            .iter()
            .flat_map(|block| &block.rows);
        let (good, width) = rows.fold((true, 0), |(good, width), row| {
            (good && row.is_good(), width + row.width())
        });
        if good && !width.is_multiple_of(16) {
            self.blocks.truncate(self.mark);
            self.other_lists.get_or_insert_with(|| {
                Error::new(
                    "json-object",
                    "No list in this object holds the sixteen numbers of a matrix.",
                )
                .at_text(self.line + 1, self.character.max(1), 1)
            });
        }
    }

    /// The first complaint about a value stands.
    fn spoil(&mut self, error: Error) {
        self.spoilt.get_or_insert(error);
    }

    /// `name[3]` outside of a list.
    fn skip_index(&mut self) -> bool {
        let named = match self.previous {
            Previous::Word(_, end) => end == self.character,
            Previous::Index => true,
            _ => false,
        };
        let digits = self.rest()[1..]
            .iter()
            .take_while(|c| c.is_ascii_digit())
            .count();
        let skips = named && digits > 0 && self.rest().get(digits + 1) == Some(&']');
        if skips {
            self.character += digits + 2;
            self.previous = Previous::Index;
        }
        skips
    }

    fn kind_of_call(&self, from: usize, to: usize) -> Kind {
        let word = visible(&self.characters()[from..to]);
        let name = word.rsplit('.').next().unwrap_or_default();
        if is_harmless(name) {
            Kind::Call
        } else if self.depth == 0 && to < self.character {
            Kind::Aside
        } else {
            Kind::ForeignCall
        }
    }

    /// The next character that is not blank, in this line or the next one.
    fn next_visible(&self) -> Option<char> {
        let next_line = self.source.line(self.line + 1);
        self.rest()
            .iter()
            .chain(next_line)
            .copied()
            .find(|&c| !is_blank(c))
    }

    fn closing(&mut self, c: char) {
        let start = self.character;
        self.character += 1;
        self.previous = Previous::Other;
        if self.open.last().is_none_or(|open| open.close != c) {
            if self.depth == 0 && c == ')' {
                // Of an aside, or of a function that was not copied.
                return;
            }
            let error = Error::new(
                "open-bracket",
                format!("'{c}' closes a bracket that was not opened, or another one."),
            )
            .at_text(self.line + 1, start + 1, 1);
            self.spoil(error);
            if self.depth == 0 {
                self.mark = self.blocks.len();
                self.end_value();
            }
            return;
        }
        let Some(closed) = self.open.pop() else {
            return;
        };
        if closed.kind != Kind::List {
            if closed.kind == Kind::Object {
                self.depth = closed.depth_around;
                self.object_name = None;
            }
            if closed.kind == Kind::Call {
                self.previous = Previous::Value;
            }
            return;
        }
        self.previous = Previous::Value;
        self.end_row();
        self.depth -= 1;
        if closed.has_rows || self.depth == 0 {
            self.end_block();
        } else {
            self.set_has_rows();
        }
        if self.depth == 0 {
            self.end_value();
        }
    }

    fn set_has_rows(&mut self) {
        if let Some(list) = self
            .open
            .iter_mut()
            .rev()
            .find(|open| open.kind == Kind::List)
        {
            list.has_rows = true;
        }
    }

    /// How many characters here are three points.
    fn points(&self) -> usize {
        match self.rest() {
            ['.', '.', '.', ..] => 3,
            ['…', ..] => 1,
            _ => 0,
        }
    }

    /// Three points end a line that goes on, or stand for numbers that are missing.
    fn ellipsis(&mut self) {
        let start = self.character;
        self.character += self.points();
        let nothing_after = self.rest().iter().all(|&c| is_blank(c));
        let something_before = self.previous != Previous::Nothing;
        if self.depth > 0 && !(nothing_after && something_before && self.depth == 1) {
            self.spoil(Error::new("elided-print", ELIDED).at_text(
                self.line + 1,
                start + 1,
                self.character - start,
            ));
        }
        self.previous = Previous::Continuation;
    }

    /// Everything up to the next separator is one token: what stands in it beside a
    /// number is not passed over.
    fn number(&mut self) {
        let line = self.characters();
        let start = self.character;
        let mut end = start;
        while let Some(&c) = line.get(end) {
            let digit = |c: Option<&char>| c.is_some_and(char::is_ascii_digit);
            let decimal_comma = c == ','
                && self.decimal == DecimalMark::Comma
                && digit(line[start..end].iter().rfind(|&&c| c != NOTHING))
                && digit(line[end + 1..].iter().find(|&&c| c != NOTHING));
            let separates = c.is_whitespace()
                || matches!(
                    c,
                    ',' | ';' | '&' | '[' | ']' | '{' | '}' | '(' | ')' | '"' | '\''
                );
            let uncertainty =
                if c == '(' && self.depth > 0 && end > start && line[end - 1].is_ascii_digit() {
                    uncertainty_length(&line[end..])
                } else {
                    0
                };
            if separates && !decimal_comma && uncertainty == 0 {
                break;
            }
            end += uncertainty.max(1);
        }
        self.character = end;
        self.previous = Previous::Number(end);
        if self.depth == 0 {
            self.outside(start, end);
            return;
        }
        let token = visible(&line[start..end]);
        match parse_number(&token, self.decimal, false) {
            Ok(number) => {
                if self.in_numbers() {
                    self.begin_row(start);
                    self.row.numbers.push(Placed {
                        number,
                        line: self.line + 1,
                        character: start + 1,
                        length: end - start,
                    });
                }
            }
            Err(problem) => self.bad_token(&problem, &token, start, end),
        }
    }

    /// Whether numbers here are elements.
    fn in_numbers(&self) -> bool {
        self.open
            .last()
            .is_some_and(|open| matches!(open.kind, Kind::List | Kind::Call))
    }

    /// A number that is in no list. A few belong to a title, four are a row.
    fn outside(&mut self, start: usize, end: usize) {
        let last = self.characters()[end - 1];
        self.operator |= matches!(last, '*' | '/' | '^' | '@' | '+' | '-');
        self.operator &= last != ':';
        if !self.open.is_empty() {
            return;
        }
        self.outside += 1;
        if self.outside == 4 && self.aside.len() < 20 {
            self.aside.push(
                Error::new(
                    "outside-brackets",
                    "The numbers of this line stand outside of the brackets and were not read.",
                )
                .at_text(self.line + 1, start + 1, end - start),
            );
        }
    }

    /// Names of functions are passed over; words in place of numbers are not.
    fn word(&mut self) {
        let line = self.characters();
        let start = self.character;
        let length = line[start..]
            .iter()
            .take_while(|c| c.is_alphanumeric() || matches!(c, '_' | '.'))
            .count();
        let end = start + length;
        self.character = end;
        self.previous = Previous::Word(start, end);
        if self.depth == 0 {
            return;
        }
        let calls = line.get(end) == Some(&'(');
        let word = visible(&line[start..end]);
        if calls && is_harmless(word.rsplit('.').next().unwrap_or_default()) {
            return;
        }
        self.bad_spot(start, end);
    }

    /// `name = …` outside of lists; of an option the value is passed over.
    fn equals(&mut self) {
        let start = self.character;
        self.character += 1;
        self.previous = Previous::Other;
        if self.depth > 0 {
            self.bad_spot(start, start + 1);
            return;
        }
        self.operator = false;
        if self.open.is_empty() {
            return;
        }
        let mut nested = 0_usize;
        while let Some(&c) = self.rest().first() {
            match c {
                '[' | '{' => return,
                '(' => nested += 1,
                ')' | ',' if nested == 0 => return,
                ')' => nested -= 1,
                _ => {}
            }
            self.character += 1;
        }
    }

    fn bad_spot(&mut self, start: usize, end: usize) {
        let token = visible(&self.characters()[start..end]);
        let problem = match parse_number(&token, self.decimal, false) {
            Err(problem) => problem,
            Ok(_) => NumberProblem::NOT_A_NUMBER,
        };
        self.bad_token(&problem, &token, start, end);
    }

    fn bad_token(&mut self, problem: &NumberProblem, token: &str, start: usize, end: usize) {
        self.begin_row(start);
        let column = self.row.width() + 1;
        let place = (self.line + 1, start + 1, end - start);
        self.row.spoil(column, problem, token, place);
    }

    fn begin_row(&mut self, start: usize) {
        if self.row.width() == 0 {
            self.row.line = self.line + 1;
            self.row.character = start + 1;
        }
        if self.row.line == self.line + 1 {
            self.row.length = self.character.max(start + 1) - (self.row.character - 1);
        }
    }

    fn end_row(&mut self) {
        let row = std::mem::take(&mut self.row);
        if row.width() > 0 && self.spoilt.is_none() {
            self.block.rows.push(row);
        }
    }

    fn end_block(&mut self) {
        let block = std::mem::take(&mut self.block);
        if !block.rows.is_empty() {
            self.blocks.push(block);
        } else if block.label.is_some() {
            // The lists inside were blocks of their own.
            self.block.label = block.label.filter(|_| self.depth > 0);
        }
    }
}

/// `(4)` or `(0.004)` at the start; zero where something else stands in the brackets.
fn uncertainty_length(rest: &[char]) -> usize {
    let inside = rest[1..]
        .iter()
        .take_while(|c| c.is_ascii_digit() || matches!(c, '.' | ','))
        .count();
    if inside > 0 && rest.get(inside + 1) == Some(&')') {
        inside + 2
    } else {
        0
    }
}

fn calculation(line: usize, character: usize) -> Error {
    Error::new(
        "calculation",
        "Something is calculated with this matrix; paste the result instead.",
    )
    .at_text(line + 1, character + 1, 1)
}

/// Functions that leave the numbers as they are.
fn is_harmless(name: &str) -> bool {
    matches!(
        name,
        "array"
            | "asarray"
            | "matrix"
            | "Matrix"
            | "list"
            | "tuple"
            | "print"
            | "disp"
            | "double"
            | "single"
            | "float"
            | "float64"
            | "float32"
            | "float16"
            | "int64"
            | "int32"
    )
}

/// `.reshape(4, 4)` keeps the order; with a word in it, it may not.
fn is_plain_reshape(rest: &[char]) -> bool {
    let name: Vec<char> = ".reshape(".chars().collect();
    rest.starts_with(&name)
        && rest[name.len()..]
            .iter()
            .all(|&c| c.is_ascii_digit() || is_blank(c) || matches!(c, '(' | ')' | ',' | '-' | ';'))
}

/// What a line says before its first bracket, as the name of what comes next.
fn name_in(line: &[char]) -> Option<String> {
    let end = (0..line.len())
        .find(|&k| match line[k] {
            '[' | '{' | '=' => true,
            '(' => k > 0 && line[k - 1].is_alphanumeric(),
            _ => false,
        })
        .unwrap_or(line.len());
    let before = &line[..end];
    let start = before.iter().position(|c| c.is_alphabetic())?;
    let name = label(&before[start..])?;
    let says_nothing = line.get(end) == Some(&'(') || matches!(name.as_str(), "ans" | "In" | "Out");
    (!says_nothing).then_some(name)
}

/// Lists of one row each, line after line, are the rows of one list.
fn joined(blocks: Vec<Block>) -> Vec<Block> {
    let mut out: Vec<Block> = Vec::new();
    let mut open = false;
    for block in blocks {
        let single = block.rows.len() == 1 && block.rows[0].width() <= 5;
        match out.last_mut() {
            Some(last) if open && single && block.joins => last.rows.extend(block.rows),
            _ => out.push(block),
        }
        open = single;
    }
    out
}
