use base64ct::{Base64UrlUnpadded, Encoding};
use crc::{CRC_32_ISO_HDLC, Crc, NoTable};
use miniz_oxide::deflate::compress_to_vec;
use miniz_oxide::inflate::{TINFLStatus, decompress_to_vec_with_limit};

use crate::error::{Error, Result};

/// The version of the envelope; it stands outside of the compression, so that an
/// older page can tell a newer link from a damaged one.
const VERSION: &str = "v1";

/// A fragment may be no longer than this.
const LONGEST_FRAGMENT: usize = 64 * 1024;

/// A payload may inflate to no more than this: deflate reaches 1000 to 1.
const LARGEST_CONTENT: usize = 1 << 20;

/// Digits of the checksum: 35 bits hold the 32 of CRC-32.
const CHECKSUM_DIGITS: usize = 7;

const DIGITS: &[u8; 32] = b"abcdefghijklmnopqrstuvwxyz234567";

/// Packs a text: raw deflate (RFC 1951), base64url without padding (RFC 4648),
/// CRC-32 of the packed bytes in base 32. The last character is a letter or a
/// digit: chat programs trim others.
///
/// # Errors
/// `link-too-large` where the fragment would be refused on opening.
pub fn seal(content: &str) -> Result<String> {
    if content.len() > LARGEST_CONTENT {
        return Err(too_large());
    }
    let packed = compress_to_vec(content.as_bytes(), 9);
    let fragment = format!(
        "{VERSION}.{}.{}",
        Base64UrlUnpadded::encode_string(&packed),
        checksum(&packed)
    );
    if fragment.len() > LONGEST_FRAGMENT {
        return Err(too_large());
    }
    Ok(fragment)
}

/// Unpacks what [`seal`] packed. A whole address is taken as well as its fragment.
///
/// # Errors
/// `link-empty`, `link-not-ours`, `link-newer`, `link-too-large`, `link-truncated`,
/// `link-damaged`.
pub fn open(fragment: &str) -> Result<String> {
    let fragment = fragment
        .split_once('#')
        .map_or(fragment, |(_, behind)| behind);
    if fragment.len() > LONGEST_FRAGMENT {
        return Err(too_large());
    }
    let fragment = cleaned(fragment);
    if fragment.is_empty() {
        return Err(Error::new(
            "link-empty",
            "There is nothing behind the # of this link.",
        ));
    }
    let mut parts = fragment.split('.');
    let version = parts.next().unwrap_or_default();
    let number = version
        .strip_prefix('v')
        .filter(|digits| digits.bytes().all(|digit| digit.is_ascii_digit()))
        .and_then(|digits| digits.parse::<u32>().ok());
    match number {
        _ if version == VERSION => {}
        Some(number) if number > 1 => {
            return Err(Error::new(
                "link-newer",
                "This link was made by a newer version of Halfshade than this page.",
            ));
        }
        _ if fragment == "v" => return Err(truncated()),
        _ => {
            return Err(Error::new(
                "link-not-ours",
                "What stands behind the # of this link was not made by Halfshade.",
            ));
        }
    }
    let payload = parts.next().unwrap_or_default();
    let sum = parts.next().unwrap_or_default();
    if payload.is_empty() || sum.len() < CHECKSUM_DIGITS {
        return Err(truncated());
    }
    if parts.next().is_some() || sum.len() > CHECKSUM_DIGITS {
        return Err(damaged());
    }
    let packed = Base64UrlUnpadded::decode_vec(payload).map_err(|_| damaged())?;
    if checksum(&packed) != sum {
        return Err(damaged());
    }
    let content = decompress_to_vec_with_limit(&packed, LARGEST_CONTENT).map_err(|error| {
        if error.status == TINFLStatus::HasMoreOutput {
            too_large()
        } else {
            damaged()
        }
    })?;
    String::from_utf8(content).map_err(|_| damaged())
}

/// Without what mail and chat programs add: white space, marks of quotation,
/// characters of no width, percent signs, and the end of the sentence.
fn cleaned(fragment: &str) -> String {
    let visible = |c: &char| {
        !c.is_whitespace()
            && !matches!(
                c,
                '>' | '\u{200b}'..='\u{200f}' | '\u{2060}' | '\u{feff}' | '\u{ad}'
            )
    };
    let mut clean: String = fragment.chars().filter(visible).collect();
    if clean.contains('%')
        && let Ok(decoded) = String::from_utf8(percent_decoded(clean.as_bytes()))
    {
        let behind = decoded.strip_prefix('#').unwrap_or(&decoded);
        clean = behind.chars().filter(visible).collect();
    }
    let end = clean
        .trim_end_matches(|c: char| !c.is_ascii_alphanumeric())
        .len();
    clean.truncate(end);
    clean
}

/// Once; what is no percent encoding stays (RFC 3986, section 2.1).
fn percent_decoded(bytes: &[u8]) -> Vec<u8> {
    let hex = |byte: u8| char::from(byte).to_digit(16);
    let mut out = Vec::with_capacity(bytes.len());
    let mut rest = bytes;
    while let [first, behind @ ..] = rest {
        let pair = match behind {
            [high, low, ..] if *first == b'%' => hex(*high).zip(hex(*low)),
            _ => None,
        };
        match pair.and_then(|(high, low)| u8::try_from(16 * high + low).ok()) {
            Some(byte) => {
                out.push(byte);
                rest = &behind[2..];
            }
            None => {
                out.push(*first);
                rest = behind;
            }
        }
    }
    out
}

fn checksum(bytes: &[u8]) -> String {
    // A link is short, and a table would be 16 kB of every download.
    let sum = Crc::<u32, NoTable>::new(&CRC_32_ISO_HDLC).checksum(bytes);
    (0..CHECKSUM_DIGITS)
        .map(|k| {
            // 35 bits, the highest five first.
            let shift = 5 * (CHECKSUM_DIGITS - 1 - k);
            char::from(DIGITS[(u64::from(sum) >> shift & 31) as usize])
        })
        .collect()
}

fn truncated() -> Error {
    Error::new(
        "link-truncated",
        "This link is cut off: its end is missing. Ask for it again, as a file or in full.",
    )
}

fn damaged() -> Error {
    Error::new(
        "link-damaged",
        "This link is damaged: some of its characters were changed on the way.",
    )
}

fn too_large() -> Error {
    Error::new("link-too-large", "This is more than a link can hold.")
}
