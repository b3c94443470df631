use std::ops::Range;

use crate::error::{Error, Result};

/// A longer text is refused: ten thousand matrices take a quarter of it.
const LARGEST_TEXT: usize = 16 << 20;

/// More lines are refused: ten thousand matrices, one number a line, are a sixth.
const MOST_LINES: usize = 1_000_000;

/// More numbers are refused: ten thousand matrices are a twelfth.
const MOST_NUMBERS: usize = 2_000_000;

/// Stands for characters of no width.
const NOTHING: char = '\0';

/// A text as lines of characters, made plain one for one, so that places stay.
pub(super) struct Source {
    characters: Vec<char>,
    lines: Vec<Line>,
}

struct Line {
    content: Range<usize>,
    /// Behind the mark; empty without one.
    comment: Range<usize>,
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
        };
        let mut start = 0;
        let mut tokens = 0;
        let mut in_token = false;
        let mut characters = text.chars().peekable();
        while let Some(c) = characters.next() {
            if matches!(c, '\r' | '\n') {
                if c == '\r' {
                    characters.next_if_eq(&'\n');
                }
                source.end_line(start);
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
        source.end_line(start);
        // A spreadsheet's line that names its delimiter.
        let first = visible(source.line(0));
        if first.trim().len() == 5 && first.trim().starts_with("sep=") {
            source.lines[0].content.end = source.lines[0].content.start;
        }
        Ok(source)
    }

    /// Takes `# …`, `% …` and `// …` off the line.
    fn end_line(&mut self, start: usize) {
        let end = self.characters.len();
        let line = &self.characters[start..];
        let cut = (0..line.len()).find(|&k| {
            matches!(line[k], '#' | '%') || (line[k] == '/' && line.get(k + 1) == Some(&'/'))
        });
        let content_end = start + cut.unwrap_or(line.len());
        self.lines.push(Line {
            content: start..content_end,
            comment: content_end..end,
        });
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

    /// Forms that would be read wrongly are refused, not guessed.
    ///
    /// # Errors
    /// `form-not-read`, `elided-print`.
    pub fn refuse_unread_forms(&self) -> Result<()> {
        for k in 0..self.lines.len() {
            let line = self.line(k);
            let refuse = |code, message: &str| {
                let start = line.iter().position(|&c| !is_blank(c)).unwrap_or(0);
                let length = line[start..].iter().rposition(|&c| !is_blank(c));
                Err(Error::new(code, message).at_text(
                    k + 1,
                    start + 1,
                    length.map_or(1, |last| last + 1),
                ))
            };
            let mut seen = line.iter().copied().filter(|&c| !is_blank(c));
            match seen.next() {
                Some('C' | 'c') => {
                    let lower: String = line
                        .iter()
                        .take(200)
                        .collect::<String>()
                        .to_ascii_lowercase();
                    let mut words = lower.split_whitespace();
                    let columns = matches!(words.next(), Some("columns" | "column"));
                    let number = words.next().is_some_and(|word| {
                        word.trim_end_matches(':')
                            .bytes()
                            .all(|b| b.is_ascii_digit())
                    });
                    if columns && number {
                        return refuse(
                            "form-not-read",
                            "A matrix printed in blocks of columns is not read by this version; print it in full width.",
                        );
                    }
                }
                Some(c) if c.is_ascii_digit() && seen.next_back() == Some('*') => {
                    return refuse(
                        "form-not-read",
                        "This line is a common factor, which this version does not apply; print the numbers in full.",
                    );
                }
                Some('.' | '…') if line.iter().all(|&c| is_blank(c) || matches!(c, '.' | '…')) =>
                {
                    return refuse("elided-print", ELIDED);
                }
                _ => {}
            }
            let begin = ['\\', 'b', 'e', 'g', 'i', 'n'];
            let latex = line.windows(begin.len()).any(|window| window == begin);
            if latex || line.iter().filter(|&&c| c == '&').count() >= 3 {
                return refuse(
                    "form-not-read",
                    "LaTeX is not read by this version; paste the numbers in rows.",
                );
            }
        }
        Ok(())
    }
}

pub(super) const ELIDED: &str = "The three points stand for numbers that were not printed; print the array in full (numpy.set_printoptions(threshold=numpy.inf)) and paste again.";

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
