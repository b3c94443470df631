use crate::error::{Error, Result};

/// A text as lines of characters, made plain one for one, so that places stay.
pub(super) struct Source {
    /// Without comments.
    pub lines: Vec<Vec<char>>,
    /// The comment of each line, if it has one.
    pub comments: Vec<Option<String>>,
}

/// Stands for characters of no width.
const NOTHING: char = '\0';

impl Source {
    pub fn new(text: &str) -> Self {
        let mut lines = Vec::new();
        let mut comments = Vec::new();
        for line in text.split('\n') {
            let line = line.strip_suffix('\r').unwrap_or(line);
            for line in line.split('\r') {
                let mut characters = plain(line);
                comments.push(cut_comment(&mut characters));
                lines.push(characters);
            }
        }
        // A spreadsheet's line that names its delimiter.
        if let Some(first) = lines.first_mut() {
            let text: String = first.iter().filter(|&&c| c != NOTHING).collect();
            if text.trim().len() == 5 && text.trim().starts_with("sep=") {
                first.clear();
            }
        }
        Self { lines, comments }
    }

    /// Whether brackets hold the numbers.
    pub fn is_bracketed(&self) -> bool {
        self.lines.iter().flatten().any(|c| matches!(c, '[' | '{')) || self.is_in_parentheses()
    }

    /// Whether round brackets are all there is: tuples.
    pub fn is_in_parentheses(&self) -> bool {
        let mut all = self
            .lines
            .iter()
            .flatten()
            .filter(|c| !c.is_whitespace() && **c != NOTHING);
        all.next() == Some(&'(') && !self.lines.iter().flatten().any(|c| matches!(c, '[' | '{'))
    }

    /// Forms that would be read wrongly are refused, not guessed.
    pub fn refuse_unread_forms(&self) -> Result<()> {
        for (k, line) in self.lines.iter().enumerate() {
            let text: String = line.iter().filter(|&&c| c != NOTHING).collect();
            let trimmed = text.trim();
            let refuse = |code, message: &str| {
                Err(Error::new(code, message).at_text(k + 1, 1, line.len().max(1)))
            };
            let lower = trimmed.to_ascii_lowercase();
            if lower.starts_with("columns ") || lower.starts_with("column ") {
                return refuse(
                    "form-not-read",
                    "A matrix printed in blocks of columns is not read by this version; print it in full width.",
                );
            }
            if trimmed.ends_with('*') && trimmed.starts_with(|c: char| c.is_ascii_digit()) {
                return refuse(
                    "form-not-read",
                    "This line is a common factor, which this version does not apply; print the numbers in full.",
                );
            }
            if trimmed.contains("\\begin") || trimmed.contains('&') {
                return refuse(
                    "form-not-read",
                    "LaTeX is not read by this version; paste the numbers in rows.",
                );
            }
        }
        Ok(())
    }
}

fn plain(line: &str) -> Vec<char> {
    line.chars()
        .map(|c| match c {
            '\u{2212}' | '\u{fe63}' | '\u{ff0d}' | '\u{2013}' | '\u{2014}' | '\u{2012}' => '-',
            '\u{a0}' | '\u{2007}' | '\u{2009}' | '\u{202f}' | '\u{2002}' | '\u{2003}'
            | '\u{3000}' => ' ',
            '\u{feff}' | '\u{200b}'..='\u{200f}' | '\u{2060}' => NOTHING,
            other => other,
        })
        .collect()
}

/// Takes `# …`, `% …` and `// …` off the line.
fn cut_comment(line: &mut Vec<char>) -> Option<String> {
    let at = (0..line.len()).find(|&k| {
        matches!(line[k], '#' | '%') || (line[k] == '/' && line.get(k + 1) == Some(&'/'))
    })?;
    let comment: String = line[at..]
        .iter()
        .filter(|&&c| c != NOTHING)
        .collect::<String>()
        .trim_start_matches(['#', '%', '/'])
        .trim()
        .to_owned();
    line.truncate(at);
    Some(comment)
}

/// The visible characters of a piece of a line.
pub(super) fn visible(characters: &[char]) -> String {
    characters.iter().filter(|&&c| c != NOTHING).collect()
}
