//! Files: what their bytes say, as text or as an array.

use super::{MatricesRead, ReadOptions, npy, parse_matrices};
use crate::error::{Error, Note, Result, Severity};

/// Reads every 4×4 matrix of a file: text in UTF-8, UTF-16 or Windows-1252, or an array
/// that NumPy saved.
///
/// # Errors
/// As [`parse_matrices`]; for arrays `bad-file`, `form-not-read`, `too-large`.
pub fn parse_file(bytes: &[u8], options: &ReadOptions) -> Result<MatricesRead> {
    if bytes.starts_with(npy::MAGIC) {
        return npy::parse(bytes, options);
    }
    let (text, note) = decode(bytes)?;
    let mut read = parse_matrices(&text, options)?;
    read.notes.extend(note);
    Ok(read)
}

/// The text of a file, and what to know about how it was found.
///
/// # Errors
/// `form-not-read` for what is no text.
pub fn decode(bytes: &[u8]) -> Result<(String, Option<Note>)> {
    let (text, encoding) = match bytes {
        [0xff, 0xfe, rest @ ..] => (utf16(rest, u16::from_le_bytes), "UTF-16"),
        [0xfe, 0xff, rest @ ..] => (utf16(rest, u16::from_be_bytes), "UTF-16"),
        [_, 0, _, 0, ..] => (utf16(bytes, u16::from_le_bytes), "UTF-16"),
        [0, _, 0, _, ..] => (utf16(bytes, u16::from_be_bytes), "UTF-16"),
        _ => match std::str::from_utf8(bytes) {
            Ok(text) => return plain(text.to_owned(), None),
            Err(_) => (
                Some(bytes.iter().map(|&byte| windows_1252(byte)).collect()),
                "Windows-1252",
            ),
        },
    };
    let text =
        text.ok_or_else(|| Error::new("form-not-read", "This file is not text that can be read."))?;
    let note = Note {
        severity: Severity::Information,
        code: "encoding",
        message: format!("The file was read as {encoding}."),
        at: None,
    };
    plain(text, Some(note))
}

/// Files of other programs hold characters that no text has.
fn plain(text: String, note: Option<Note>) -> Result<(String, Option<Note>)> {
    let strange = text
        .chars()
        .take(4096)
        .any(|c| c.is_control() && !matches!(c, '\t' | '\n' | '\r' | '\u{b}' | '\u{c}'));
    if strange {
        return Err(Error::new(
            "form-not-read",
            "This is a binary file and not text. Text, CSV and NumPy's .npy files are read; other programs can export one of these.",
        ));
    }
    Ok((text, note))
}

fn utf16(bytes: &[u8], word: fn([u8; 2]) -> u16) -> Option<String> {
    let words: Vec<u16> = bytes
        .chunks_exact(2)
        .map(|pair| word([pair[0], pair[1]]))
        .collect();
    (bytes.len().is_multiple_of(2)).then(|| String::from_utf16(&words).ok())?
}

/// Latin-1, but for signs and quotes where that has control characters (WHATWG
/// Encoding Standard, index windows-1252).
fn windows_1252(byte: u8) -> char {
    const SIGNS: [char; 32] = [
        '\u{20ac}', '\u{81}', '\u{201a}', '\u{192}', '\u{201e}', '\u{2026}', '\u{2020}',
        '\u{2021}', '\u{2c6}', '\u{2030}', '\u{160}', '\u{2039}', '\u{152}', '\u{8d}', '\u{17d}',
        '\u{8f}', '\u{90}', '\u{2018}', '\u{2019}', '\u{201c}', '\u{201d}', '\u{2022}', '\u{2013}',
        '\u{2014}', '\u{2dc}', '\u{2122}', '\u{161}', '\u{203a}', '\u{153}', '\u{9d}', '\u{17e}',
        '\u{178}',
    ];
    match byte {
        0x80..=0x9f => SIGNS[usize::from(byte - 0x80)],
        _ => char::from(byte),
    }
}
