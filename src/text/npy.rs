//! Arrays as NumPy saves them: the `.npy` format, versions 1 to 3 (NumPy Enhancement
//! Proposal 1; numpy.lib.format).

use super::{
    Alternative, DecimalMark, Form, MOST_NUMBERS, MatricesRead, MatrixRead, ReadOptions,
    ReadingDescription, Stacking,
};
use crate::error::{Error, Note, Result, Severity};

/// What such a file begins with.
pub(super) const MAGIC: &[u8] = b"\x93NUMPY";

/// A longer header is refused: NumPy itself stops at 10,000 bytes.
const LONGEST_HEADER: usize = 1 << 16;

/// More complaints are counted and not listed.
const MOST_REFUSALS: usize = 20;

/// Reads the matrices of an array of shape (4, 4), (16), (…, 4, 4), (…, 16), (4, 4, …) or
/// (16, …).
///
/// # Errors
/// `bad-file` for a damaged file, `form-not-read` for contents or shapes that hold no
/// Mueller matrices, `too-large`.
pub(super) fn parse(bytes: &[u8], options: &ReadOptions) -> Result<MatricesRead> {
    let (header, data) = split(bytes)?;
    let header = Header::parse(header)?;
    let count = header
        .shape
        .iter()
        .try_fold(1_usize, |product, &size| product.checked_mul(size))
        .filter(|&count| count <= MOST_NUMBERS)
        .ok_or_else(|| {
            Error::new(
                "too-large",
                "This array has more than two million numbers, which is more than is read at once.",
            )
        })?;
    if count * header.item.size != data.len() {
        return Err(bad_file(format!(
            "its header promises {} bytes of numbers and {} follow",
            count * header.item.size,
            data.len()
        )));
    }
    let numbers: Vec<f64> = data
        .chunks_exact(header.item.size)
        .map(|bytes| header.item.number(bytes))
        .collect();
    let stackings: Vec<Stacking> = [Stacking::First, Stacking::Last]
        .into_iter()
        .filter(|&stacking| options.stacking.is_none_or(|wanted| wanted == stacking))
        .filter(|&stacking| element_axes(&header.shape, stacking).is_some())
        .collect();
    let mut notes = vec![Note {
        severity: Severity::Information,
        code: "array",
        message: format!(
            "An array of shape {}, {}.",
            header.shape_in_words(),
            header.item.in_words()
        ),
        at: None,
    }];
    let mut read = stackings
        .into_iter()
        .map(|stacking| Alternative {
            reading: ReadingDescription {
                form: Form::Binary,
                decimal: DecimalMark::Point,
                grouped: false,
                delimiter: None,
                header_row_count: 0,
                stacking: Some(stacking),
            },
            matrices: header.matrices(&numbers, stacking, &mut notes),
        })
        .filter(|read| !read.matrices.is_empty());
    let Some(first) = read.next() else {
        let refusal = notes
            .into_iter()
            .find(|note| note.severity == Severity::Refusal);
        return Err(refusal.map_or_else(
            || {
                Error::new(
                    "form-not-read",
                    format!(
                        "An array of shape {} holds no 4×4 matrices: (4, 4), (N, 4, 4), (4, 4, N), (N, 16) and (16, N) do.",
                        header.shape_in_words()
                    ),
                )
            },
            |note| Error::new(note.code, note.message),
        ));
    };
    let alternatives: Vec<Alternative> = read
        .filter(|other| !super::same_numbers(&other.matrices, &first.matrices))
        .collect();
    if !alternatives.is_empty() {
        notes.insert(0, super::ambiguous());
    }
    Ok(MatricesRead {
        matrices: first.matrices,
        reading: first.reading,
        alternatives,
        notes,
    })
}

fn bad_file(what: impl std::fmt::Display) -> Error {
    Error::new("bad-file", format!("This NumPy file is damaged: {what}."))
}

/// Header and numbers.
fn split(bytes: &[u8]) -> Result<(&str, &[u8])> {
    let cut = || bad_file("it ends within its header");
    let version = *bytes.get(MAGIC.len()).ok_or_else(cut)?;
    let (length, start) = match version {
        1 => (
            bytes
                .get(8..10)
                .map(|b| usize::from(u16::from_le_bytes([b[0], b[1]]))),
            10,
        ),
        2 | 3 => (
            bytes
                .get(8..12)
                .map(|b| u32::from_le_bytes([b[0], b[1], b[2], b[3]]) as usize),
            12,
        ),
        _ => {
            return Err(Error::new(
                "form-not-read",
                format!(
                    "This is version {version} of NumPy's file format, which is not read; versions 1 to 3 are."
                ),
            ));
        }
    };
    let length = length.ok_or_else(cut)?;
    if length > LONGEST_HEADER {
        return Err(bad_file("its header is longer than any header should be"));
    }
    let header = bytes.get(start..start + length).ok_or_else(cut)?;
    let header = std::str::from_utf8(header).map_err(|_| bad_file("its header is not text"))?;
    Ok((header, &bytes[start + length..]))
}

/// Which axes hold the elements: how many, and whether they are the last or first.
fn element_axes(shape: &[usize], stacking: Stacking) -> Option<usize> {
    let (near, nearer) = match (shape, stacking) {
        ([.., a, b], Stacking::First) | ([b, a, ..], Stacking::Last) => (Some(*a), *b),
        ([b], Stacking::First) => (None, *b),
        _ => return None,
    };
    match (near, nearer) {
        (Some(4), 4) => Some(2),
        (_, 16) => Some(1),
        _ => None,
    }
}

#[derive(Clone, Copy)]
enum Kind {
    Float,
    Signed,
    Unsigned,
}

/// How one number is stored.
struct Item {
    kind: Kind,
    size: usize,
    big_endian: bool,
}

impl Item {
    fn parse(descr: &str) -> Result<Self> {
        let refuse = || {
            let shown: String = descr.chars().take(20).collect();
            Error::new(
                "form-not-read",
                format!(
                    "Numbers of the type '{shown}' are not read; real numbers of two, four or eight bytes and integers are."
                ),
            )
        };
        let mut characters = descr.chars();
        let big_endian = match characters.next() {
            Some('<' | '|' | '=') => false,
            Some('>') => true,
            _ => return Err(refuse()),
        };
        let kind = match characters.next() {
            Some('f') => Kind::Float,
            Some('i') => Kind::Signed,
            Some('u') => Kind::Unsigned,
            _ => return Err(refuse()),
        };
        let size = match (kind, characters.as_str()) {
            (Kind::Signed | Kind::Unsigned, "1") => 1,
            (_, "2") => 2,
            (_, "4") => 4,
            (_, "8") => 8,
            _ => return Err(refuse()),
        };
        Ok(Self {
            kind,
            size,
            big_endian,
        })
    }

    fn number(&self, bytes: &[u8]) -> f64 {
        let mut word = [0; 8];
        for (to, k) in word.iter_mut().zip(0..self.size) {
            *to = bytes[if self.big_endian {
                self.size - 1 - k
            } else {
                k
            }];
        }
        let bits = u64::from_le_bytes(word);
        let unused = 64 - 8 * self.size;
        match (self.kind, self.size) {
            (Kind::Float, 8) => f64::from_bits(bits),
            (Kind::Float, 4) => f64::from(f32::from_bits(bits as u32)),
            (Kind::Float, _) => half(bits as u16),
            (Kind::Signed, _) => ((bits << unused) as i64 >> unused) as f64,
            (Kind::Unsigned, _) => bits as f64,
        }
    }

    fn in_words(&self) -> String {
        let name = match self.kind {
            Kind::Float if self.size == 8 => return "double precision".to_owned(),
            Kind::Float if self.size == 4 => return "single precision: seven digits".to_owned(),
            Kind::Float => return "half precision: three digits".to_owned(),
            Kind::Signed => "integers",
            Kind::Unsigned => "integers without sign",
        };
        format!("{name} of {} bits", 8 * self.size)
    }
}

/// Sign, five bits of exponent, ten of fraction (IEEE 754 binary16).
fn half(bits: u16) -> f64 {
    let sign = if bits >> 15 == 1 { -1.0 } else { 1.0 };
    let fraction = f64::from(bits & 0x3ff);
    match (bits >> 10) & 0x1f {
        0 => sign * fraction * 2_f64.powi(-24),
        0x1f if fraction == 0.0 => sign * f64::INFINITY,
        0x1f => f64::NAN,
        exponent => sign * (1024.0 + fraction) * 2_f64.powi(i32::from(exponent) - 25),
    }
}

struct Header {
    item: Item,
    by_columns: bool,
    shape: Vec<usize>,
}

impl Header {
    /// The three members of a Python dictionary, in any order.
    fn parse(text: &str) -> Result<Self> {
        let odd = || bad_file("its header is not that of an array");
        let mut rest = text.trim().strip_prefix('{').ok_or_else(odd)?;
        let (mut descr, mut by_columns, mut shape) = (None, None, None);
        loop {
            rest = rest.trim_start_matches([' ', ',', '\n']);
            if rest == "}" {
                break;
            }
            let (key, value) = rest
                .strip_prefix('\'')
                .and_then(|rest| rest.split_once("':"))
                .ok_or_else(odd)?;
            let value = value.trim_start();
            let end = match value.chars().next().ok_or_else(odd)? {
                '\'' => value[1..].find('\'').map(|end| end + 2),
                '(' => value.find(')').map(|end| end + 1),
                _ => value.find([',', '}']),
            };
            let (value, behind) = value.split_at(end.ok_or_else(odd)?);
            match key {
                "descr" if value.starts_with('\'') => descr = Some(value.trim_matches('\'')),
                "descr" => {
                    return Err(Error::new(
                        "form-not-read",
                        "This array has records and not plain numbers, which are not read.",
                    ));
                }
                "fortran_order" if value == "True" => by_columns = Some(true),
                "fortran_order" if value == "False" => by_columns = Some(false),
                "shape" => shape = Some(sizes(value).ok_or_else(odd)?),
                _ => return Err(odd()),
            }
            rest = behind;
        }
        Ok(Self {
            item: Item::parse(descr.ok_or_else(odd)?)?,
            by_columns: by_columns.ok_or_else(odd)?,
            shape: shape.ok_or_else(odd)?,
        })
    }

    fn shape_in_words(&self) -> String {
        let sizes: Vec<String> = self.shape.iter().map(usize::to_string).collect();
        format!("({})", sizes.join(", "))
    }

    /// Distance of neighbours along each axis.
    fn strides(&self) -> Vec<usize> {
        let mut strides = vec![1; self.shape.len()];
        let mut step = 1_usize;
        for k in 0..strides.len() {
            let axis = if self.by_columns {
                k
            } else {
                strides.len() - 1 - k
            };
            strides[axis] = step;
            // Where the array is empty the sizes may be anything.
            step = step.saturating_mul(self.shape[axis].max(1));
        }
        strides
    }

    /// The matrices one after the other, the last of the other axes fastest; those with
    /// numbers that are not finite are refused.
    fn matrices(
        &self,
        numbers: &[f64],
        stacking: Stacking,
        notes: &mut Vec<Note>,
    ) -> Vec<MatrixRead> {
        let Some(axes) = element_axes(&self.shape, stacking) else {
            return Vec::new();
        };
        let strides = self.strides();
        let axis: Vec<(usize, usize)> = self.shape.iter().copied().zip(strides).collect();
        let (stack, element) = match stacking {
            Stacking::First => axis.split_at(axis.len() - axes),
            Stacking::Last => {
                let (element, stack) = axis.split_at(axes);
                (stack, element)
            }
        };
        let count: usize = stack.iter().map(|&(size, _)| size).product();
        let mut refused = 0;
        let mut matrices = Vec::with_capacity(count);
        for n in 0..count {
            let base = offset(stack, n);
            let mueller: [f64; 16] = std::array::from_fn(|k| numbers[base + offset(element, k)]);
            match mueller.iter().position(|value| !value.is_finite()) {
                None => matrices.push(MatrixRead {
                    mueller,
                    sigma: None,
                    coordinate: None,
                    label: None,
                    line: n + 1,
                    decimals: None,
                }),
                Some(k) => {
                    refused += 1;
                    if refused <= MOST_REFUSALS {
                        notes.push(Note {
                            severity: Severity::Refusal,
                            code: "not-finite",
                            message: format!(
                                "Matrix {}, row {}, column {}: this is not a finite number.",
                                n + 1,
                                k / 4 + 1,
                                k % 4 + 1
                            ),
                            at: None,
                        });
                    }
                }
            }
        }
        if refused > MOST_REFUSALS {
            notes.push(Note {
                severity: Severity::Refusal,
                code: "more-refusals",
                message: format!(
                    "And {} more matrices that are not finite.",
                    refused - MOST_REFUSALS
                ),
                at: None,
            });
        }
        matrices
    }
}

/// `(3, 4, 4)`.
fn sizes(text: &str) -> Option<Vec<usize>> {
    let inside = text.strip_prefix('(')?.strip_suffix(')')?.trim();
    let inside = inside.strip_suffix(',').unwrap_or(inside);
    if inside.is_empty() {
        return Some(Vec::new());
    }
    inside
        .split(',')
        .map(|size| size.trim().trim_end_matches('L').parse().ok())
        .collect()
}

/// Where the item number `n` of these axes stands, the last axis fastest.
fn offset(axes: &[(usize, usize)], mut n: usize) -> usize {
    let mut place = 0;
    for &(size, stride) in axes.iter().rev() {
        place += n % size.max(1) * stride;
        n /= size.max(1);
    }
    place
}
