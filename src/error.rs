//! The one error of the crate, and the note that is not fatal.

use std::fmt;

/// Why a request could not be answered.
///
/// `code` is stable and meant for programs, `message` is a sentence that a lab
/// user can act on, `at` is the place: a field path such as `mueller[3]`, or a
/// line and character of a pasted text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Error {
    /// Stable, kebab-case.
    pub code: &'static str,
    /// A sentence.
    pub message: String,
    /// Where, if anywhere in particular.
    pub at: Option<Place>,
}

/// The place that an [`Error`] or a [`Note`] speaks of.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Place {
    /// A field of a request, such as `noise.sigma` or `mueller[3]`.
    Field(String),
    /// A spot in a text, both counted from one; `length` in characters.
    Text {
        /// Line, counted from one.
        line: usize,
        /// Character in the line (Unicode scalar values), counted from one.
        character: usize,
        /// How many characters are meant, at least one.
        length: usize,
    },
}

/// How much a [`Note`] matters.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Severity {
    /// What was understood or done.
    Information,
    /// Worth a look; the result stands.
    Warning,
    /// A part of the input was refused; the rest stands.
    Refusal,
}

/// Something to tell the person that did not stop the work.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Note {
    /// How much it matters.
    pub severity: Severity,
    /// Stable, kebab-case.
    pub code: &'static str,
    /// A sentence.
    pub message: String,
    /// Where, if anywhere in particular.
    pub at: Option<Place>,
}

/// The result of everything that can fail here.
pub type Result<T> = std::result::Result<T, Error>;

impl Error {
    /// An error without a place.
    pub fn new(code: &'static str, message: impl Into<String>) -> Self {
        Self {
            code,
            message: message.into(),
            at: None,
        }
    }

    /// The same error, at a field of the request.
    #[must_use]
    pub fn at_field(mut self, field: impl Into<String>) -> Self {
        self.at = Some(Place::Field(field.into()));
        self
    }

    /// The same error, at a spot of the text (counted from one).
    #[must_use]
    pub fn at_text(mut self, line: usize, character: usize, length: usize) -> Self {
        self.at = Some(Place::Text {
            line,
            character,
            length,
        });
        self
    }
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.message)?;
        match &self.at {
            None => Ok(()),
            Some(Place::Field(field)) => write!(f, " (at {field})"),
            Some(Place::Text {
                line, character, ..
            }) => write!(f, " (line {line}, character {character})"),
        }
    }
}

impl std::error::Error for Error {}
