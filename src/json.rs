//! Strict reading of plain JSON values: every member is asked for by name, a member
//! that nobody asks for is an error, and every error has its path.
//!
//! Requests and configurations are small and come from anywhere. Derived
//! deserialisers with paths cost 150 kB of wasm; this does the same in one copy.

use serde_json::{Map, Value};

use crate::error::{Error, Result};

/// The members of one object.
pub struct Fields<'a> {
    members: &'a Map<String, Value>,
    path: String,
}

impl<'a> Fields<'a> {
    /// The members of `value`, which stands at `path` (empty for the whole request).
    ///
    /// # Errors
    /// `bad-request` unless it is an object; `unknown-field` for a member that is not
    /// among `known`.
    pub fn of(value: &'a Value, path: &str, known: &[&str]) -> Result<Self> {
        let Value::Object(members) = value else {
            return Err(located(
                Error::new(
                    "bad-request",
                    "An object with named members is expected here.",
                ),
                path,
            ));
        };
        let fields = Self {
            members,
            path: path.to_owned(),
        };
        match members.keys().find(|name| !known.contains(&name.as_str())) {
            None => Ok(fields),
            Some(name) => Err(fields.error(
                "unknown-field",
                name,
                &format!("There is no '{name}' here, only {}.", known.join(", ")),
            )),
        }
    }

    /// The path of a member.
    #[must_use]
    pub fn path(&self, name: &str) -> String {
        if self.path.is_empty() {
            name.to_owned()
        } else {
            format!("{}.{name}", self.path)
        }
    }

    /// A member; `null` is as good as none.
    #[must_use]
    pub fn get(&self, name: &str) -> Option<&'a Value> {
        self.members.get(name).filter(|value| !value.is_null())
    }

    /// An error at a member.
    #[must_use]
    pub fn error(&self, code: &'static str, name: &str, sentence: &str) -> Error {
        Error::new(code, sentence).at_field(self.path(name))
    }

    /// A number.
    ///
    /// # Errors
    /// `bad-request` for anything else.
    pub fn number(&self, name: &str) -> Result<Option<f64>> {
        self.get(name)
            .map(|value| number(value).ok_or_else(|| self.expected(name, "a number")))
            .transpose()
    }

    /// A whole number that is not negative.
    ///
    /// # Errors
    /// `bad-request` for anything else.
    pub fn whole(&self, name: &str) -> Result<Option<u64>> {
        self.get(name)
            .map(|value| {
                value
                    .as_u64()
                    .ok_or_else(|| self.expected(name, "a whole number, zero or more"))
            })
            .transpose()
    }

    /// `true` or `false`.
    ///
    /// # Errors
    /// `bad-request` for anything else.
    pub fn flag(&self, name: &str) -> Result<Option<bool>> {
        self.get(name)
            .map(|value| {
                value
                    .as_bool()
                    .ok_or_else(|| self.expected(name, "true or false"))
            })
            .transpose()
    }

    /// A text.
    ///
    /// # Errors
    /// `bad-request` for anything else.
    pub fn text(&self, name: &str) -> Result<Option<&'a str>> {
        self.get(name)
            .map(|value| value.as_str().ok_or_else(|| self.expected(name, "a text")))
            .transpose()
    }

    /// One of several words.
    ///
    /// # Errors
    /// `unknown-choice` for any other.
    pub fn choice<T: Copy>(&self, name: &str, choices: &[(&str, T)]) -> Result<Option<T>> {
        let Some(word) = self.text(name)? else {
            return Ok(None);
        };
        match choices.iter().find(|(choice, _)| *choice == word) {
            Some((_, meaning)) => Ok(Some(*meaning)),
            None => {
                let words: Vec<&str> = choices.iter().map(|(word, _)| *word).collect();
                Err(self.error(
                    "unknown-choice",
                    name,
                    &format!("'{name}' is one of {}.", words.join(", ")),
                ))
            }
        }
    }

    /// So many numbers.
    ///
    /// # Errors
    /// `bad-request` for another count, or anything but numbers.
    pub fn numbers<const N: usize>(&self, name: &str) -> Result<Option<[f64; N]>> {
        let Some(value) = self.get(name) else {
            return Ok(None);
        };
        let mut numbers = [0.0; N];
        self.fill(name, value, &mut numbers)?;
        Ok(Some(numbers))
    }

    fn fill(&self, name: &str, value: &Value, numbers: &mut [f64]) -> Result<()> {
        let count = numbers.len();
        let items = value
            .as_array()
            .filter(|items| items.len() == count)
            .ok_or_else(|| self.expected(name, &format!("a list of {count} numbers")))?;
        for (k, item) in items.iter().enumerate() {
            numbers[k] =
                number(item).ok_or_else(|| self.expected(&format!("{name}[{k}]"), "a number"))?;
        }
        Ok(())
    }

    /// An object inside.
    ///
    /// # Errors
    /// As [`Fields::of`].
    pub fn object(&self, name: &str, known: &[&str]) -> Result<Option<Self>> {
        self.get(name)
            .map(|value| Fields::of(value, &self.path(name), known))
            .transpose()
    }

    /// Turns a member that is not there into an error.
    ///
    /// # Errors
    /// `missing-field`.
    pub fn required<T>(&self, name: &str, member: Option<T>) -> Result<T> {
        member.ok_or_else(|| self.error("missing-field", name, &format!("'{name}' is missing.")))
    }

    fn expected(&self, name: &str, what: &str) -> Error {
        self.error("bad-request", name, &format!("'{name}' must be {what}."))
    }
}

fn number(value: &Value) -> Option<f64> {
    value.as_f64().filter(|number| number.is_finite())
}

fn located(error: Error, path: &str) -> Error {
    if path.is_empty() {
        error
    } else {
        error.at_field(path)
    }
}
