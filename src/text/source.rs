use std::ops::Range;

use super::{MOST_NUMBERS, notation};
use crate::error::{Error, Result};

/// A longer text is refused: ten thousand matrices take a quarter of it.
const LARGEST_TEXT: usize = 16 << 20;

/// More lines are refused: ten thousand matrices, one number a line, are a sixth.
const MOST_LINES: usize = 1_000_000;

/// Stands for characters of no width.
pub(super) const NOTHING: char = '\0';

/// A text as lines of characters, made plain one for one, so that places stay.
pub(super) struct Source {
    characters: Vec<char>,
    lines: Vec<Line>,
    /// Whether it was written for TeX.
    pub is_typeset: bool,
}

struct Line {
    content: Range<usize>,
    /// Behind the mark; empty without one.
    comment: Range<usize>,
    /// The numbers are to be taken times ten to this, as a line above says.
    power: i32,
    /// The columns that the following lines hold, where this line says so.
    columns: Option<(usize, usize)>,
}

impl Source {
    /// # Errors
    /// `too-large`.
    pub fn new(text: &str) -> Result<Self> {
        if text.len() > LARGEST_TEXT {
            return Err(Error::new(
                "too-large",
                "This text is larger than 16 MiB, which is more than is read at once.",
            ));
        }
        let mut source = Self {
            characters: Vec::with_capacity(text.len()),
            lines: Vec::new(),
            is_typeset: false,
        };
        let is_object = begins_object(text);
        let mut start = 0;
        let mut tokens = 0;
        let mut in_token = false;
        let mut characters = text.chars().peekable();
        while let Some(c) = characters.next() {
            if matches!(c, '\r' | '\n') {
                if c == '\r' {
                    characters.next_if_eq(&'\n');
                }
                source.end_line(start, is_object);
                start = source.characters.len();
            } else {
                source.characters.push(plain(c));
            }
            let separates =
                c.is_whitespace() || matches!(c, ',' | ';' | '[' | ']' | '{' | '}' | '(' | ')');
            tokens += usize::from(in_token && separates);
            in_token = !separates;
            if tokens > MOST_NUMBERS || source.lines.len() > MOST_LINES {
                return Err(Error::new(
                    "too-large",
                    "This text has more than a million lines or two million numbers, which is more than is read at once.",
                ));
            }
        }
        source.end_line(start, is_object);
        // A spreadsheet's line that names its delimiter.
        let first = visible(source.line(0));
        if first.trim().len() == 5 && first.trim().starts_with("sep=") {
            source.lines[0].content.end = source.lines[0].content.start;
        }
        source.is_typeset = !is_object && source.has_typesetting();
        source.rewrite();
        source.apply_headings();
        Ok(source)
    }

    /// Takes `# …`, `% …` and `// …` off the line; in an object they are text.
    fn end_line(&mut self, start: usize, is_object: bool) {
        let end = self.characters.len();
        let line = &mut self.characters[start..];
        let per_cent: Vec<usize> = (1..line.len())
            .filter(|&k| line[k] == '%')
            .filter(|&k| {
                let before = line[..k].iter().rfind(|&&c| c != ' ');
                let after = line[k + 1..].iter().find(|&&c| !is_blank(c));
                let ends = after.is_none_or(|&c| {
                    c.is_ascii_digit() || matches!(c, ',' | ';' | '-' | '+' | '.')
                });
                before.is_some_and(char::is_ascii_digit) && ends
            })
            .collect();
        // One alone may begin an empty comment, which changes nothing.
        if per_cent.len() > 1 {
            for k in per_cent {
                line[k] = NOTHING;
            }
        }
        let cut = (0..line.len()).find(|&k| {
            matches!(line[k], '#' | '%') || (line[k] == '/' && line.get(k + 1) == Some(&'/'))
        });
        let content_end = start + cut.filter(|_| !is_object).unwrap_or(line.len());
        self.lines.push(Line {
            content: start..content_end,
            comment: content_end..end,
            power: 0,
            columns: None,
        });
    }

    fn has_typesetting(&self) -> bool {
        (0..self.lines.len()).any(|k| notation::is_typeset(self.line(k)))
    }

    /// Typeset matrices in brackets, powers of ten as exponents, uncertainties without
    /// gaps: all of it character for character.
    fn rewrite(&mut self) {
        for line in &self.lines {
            let content = &mut self.characters[line.content.clone()];
            if self.is_typeset {
                notation::untypeset(content);
            }
            notation::join_numbers(content);
        }
    }

    /// `1.0e-03 *` above a matrix, `Columns 1 through 4` above a part of its columns.
    fn apply_headings(&mut self) {
        let mut power = 0;
        for k in 0..self.lines.len() {
            let line = self.line(k);
            let columns = notation::columns_heading(line);
            let factor = notation::common_factor(line).filter(|_| self.starts_rows_after(k));
            if line.contains(&'=') {
                power = 0;
            }
            if let Some(factor) = factor {
                power = factor;
            }
            let line = &mut self.lines[k];
            if factor.is_some() || columns.is_some() {
                line.content.end = line.content.start;
            }
            line.power = power;
            line.columns = columns;
        }
    }

    /// Whether the next line with anything in it is a heading of columns or begins with
    /// a number.
    fn starts_rows_after(&self, k: usize) -> bool {
        (k + 1..self.lines.len())
            .map(|next| self.line(next))
            .find_map(|line| {
                let first = line.iter().find(|&&c| !is_blank(c))?;
                Some(
                    notation::columns_heading(line).is_some()
                        || first.is_ascii_digit()
                        || matches!(first, '-' | '+' | '.'),
                )
            })
            .unwrap_or(false)
    }

    /// The power of ten that a line above gives to the numbers of this one.
    pub fn power(&self, k: usize) -> i32 {
        self.lines.get(k).map_or(0, |line| line.power)
    }

    /// First and last column of the numbers that follow, where this line is a heading.
    pub fn columns(&self, k: usize) -> Option<(usize, usize)> {
        self.lines.get(k).and_then(|line| line.columns)
    }

    pub fn line_count(&self) -> usize {
        self.lines.len()
    }

    /// Without its comment.
    pub fn line(&self, k: usize) -> &[char] {
        self.lines
            .get(k)
            .map_or(&[], |line| &self.characters[line.content.clone()])
    }

    pub fn has_comment(&self, k: usize) -> bool {
        self.lines
            .get(k)
            .is_some_and(|line| !line.comment.is_empty())
    }

    /// The comment of a line as a label.
    pub fn comment(&self, k: usize) -> Option<String> {
        let line = self.lines.get(k).filter(|line| !line.comment.is_empty())?;
        let comment = &self.characters[line.comment.clone()];
        let marks = comment
            .iter()
            .take_while(|c| matches!(c, '#' | '%' | '/'))
            .count();
        label(&comment[marks..])
    }

    pub fn contains(&self, mark: char) -> bool {
        (0..self.lines.len()).any(|k| self.line(k).contains(&mark))
    }

    /// Whether brackets stand in the text, or tuples are all there is.
    pub fn is_bracketed(&self) -> bool {
        self.contains('[') || self.contains('{') || self.is_in_parentheses()
    }

    /// Whether round brackets are all there is: tuples.
    pub fn is_in_parentheses(&self) -> bool {
        let mut visible = (0..self.lines.len())
            .flat_map(|k| self.line(k))
            .copied()
            .filter(|&c| !is_blank(c));
        let mut before = visible.next();
        let tuples = before == Some('(')
            || visible.any(|c| {
                let twice = c == '(' && before == Some('(');
                before = Some(c);
                twice
            });
        tuples && !self.contains('[') && !self.contains('{')
    }

    /// Whether the text is an object with named members, or a list of such.
    pub fn is_object(&self) -> bool {
        begins_object_with(&mut (0..self.lines.len()).flat_map(|k| self.line(k)).copied())
    }

    /// Numbers that were left out can't be guessed.
    ///
    /// # Errors
    /// `elided-print`.
    pub fn refuse_elided(&self) -> Result<()> {
        for k in 0..self.lines.len() {
            let line = self.line(k);
            let mut seen = line.iter().enumerate().filter(|&(_, &c)| !is_blank(c));
            let Some((start, '.' | '…')) = seen.next() else {
                continue;
            };
            if line.iter().all(|&c| is_blank(c) || matches!(c, '.' | '…')) {
                let end = seen.next_back().map_or(start, |(end, _)| end) + 1;
                return Err(Error::new("elided-print", ELIDED).at_text(
                    k + 1,
                    start + 1,
                    end - start,
                ));
            }
        }
        Ok(())
    }
}

fn begins_object(text: &str) -> bool {
    begins_object_with(&mut text.chars().map(plain))
}

fn begins_object_with(characters: &mut impl Iterator<Item = char>) -> bool {
    let mut visible = characters
        .filter(|&c| !is_blank(c))
        .skip_while(|&c| c == '[');
    visible.next() == Some('{') && matches!(visible.next(), Some('"' | '\''))
}

pub(super) const ELIDED: &str = "The three points stand for numbers that were not printed. Export them all, with numpy.savetxt(\"matrices.csv\", M.reshape(-1, 16), delimiter=\",\"), and paste or open that.";

/// Minus signs, spaces, digits and marks of other scripts, frames around matrices.
fn plain(c: char) -> char {
    const DIGITS: [char; 10] = ['0', '1', '2', '3', '4', '5', '6', '7', '8', '9'];
    let digit = |zero: u32| DIGITS.get((c as u32 - zero) as usize).copied().unwrap_or(c);
    match c {
        '\u{2212}' | '\u{fe63}' | '\u{ff0d}' | '\u{2012}'..='\u{2014}' => '-',
        '\u{ff0b}' => '+',
        '\u{ff0e}' => '.',
        '\u{ff0c}' | '\u{66b}' => ',',
        '\u{a0}' | '\u{2002}'..='\u{200a}' | '\u{202f}' | '\u{205f}' | '\u{3000}' => ' ',
        '\u{feff}'
        | '\u{200b}'..='\u{200f}'
        | '\u{202a}'..='\u{202e}'
        | '\u{2060}'..='\u{2069}' => NOTHING,
        '\u{660}'..='\u{669}' => digit(0x660),
        '\u{6f0}'..='\u{6f9}' => digit(0x6f0),
        '\u{ff10}'..='\u{ff19}' => digit(0xff10),
        '|' | '\u{239b}'..='\u{23ad}' | '\u{2502}' => ' ',
        other => other,
    }
}

pub(super) fn is_blank(c: char) -> bool {
    c.is_whitespace() || c == NOTHING
}

/// The visible characters of a piece of a line.
pub(super) fn visible(characters: &[char]) -> String {
    characters.iter().filter(|&&c| c != NOTHING).collect()
}

/// A piece of a line as the name of a matrix: at most 80 characters.
pub(super) fn label(characters: &[char]) -> Option<String> {
    let start = characters.iter().position(|&c| !is_blank(c))?;
    let text: String = characters[start..]
        .iter()
        .take(400)
        .filter(|c| !c.is_control())
        .take(80)
        .collect();
    let text = text
        .trim()
        .trim_matches(['"', '\''])
        .trim_end_matches([':', '='])
        .trim();
    (!text.is_empty()).then(|| text.to_owned())
}
