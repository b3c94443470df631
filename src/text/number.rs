use crate::error::Error;

/// What separates whole from fraction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DecimalMark {
    /// `0.5`
    Point,
    /// `0,5`
    Comma,
}

impl DecimalMark {
    /// The character.
    #[must_use]
    pub fn char(self) -> char {
        match self {
            Self::Point => '.',
            Self::Comma => ',',
        }
    }

    /// The character that may group thousands beside it.
    pub(super) fn grouping(self) -> char {
        match self {
            Self::Point => ',',
            Self::Comma => '.',
        }
    }
}

/// A number as printed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PrintedNumber {
    /// The nearest double.
    pub value: f64,
    /// The last printed digit stands for `10^-decimals`.
    pub decimals: i32,
    /// Whether it was written with an exponent.
    pub has_exponent: bool,
    /// Whether it is not zero as printed but as a double.
    pub underflows: bool,
}

/// Why a token is no number.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NumberProblem {
    /// Stable.
    pub code: &'static str,
    /// What follows "'0,5.2' " in a sentence.
    pub what: &'static str,
}

impl NumberProblem {
    pub(super) const NOT_A_NUMBER: Self = Self {
        code: "bad-number",
        what: "is not a number",
    };

    /// As an error about `token`.
    pub(super) fn error(&self, token: &str) -> Error {
        let shown: String = token.chars().take(24).collect();
        let more = if token.chars().count() > 24 {
            "…"
        } else {
            ""
        };
        Error::new(self.code, format!("'{shown}{more}' {}.", self.what))
    }
}

/// Reads one number: sign, digits, decimal mark, exponent with e or E. The value is
/// the double nearest to what is written. `grouped` also takes thousands in threes,
/// such as `1,234.5` beside a decimal point.
///
/// # Errors
/// What is wrong with it. Hexadecimal, `1_000`, complex, infinite numbers and words
/// are refused.
pub fn parse_number(
    token: &str,
    decimal: DecimalMark,
    grouped: bool,
) -> Result<PrintedNumber, NumberProblem> {
    let mut plain = String::with_capacity(token.len());
    let mut rest = token;
    if let Some(unsigned) = rest.strip_prefix(['-', '+']) {
        if token.starts_with('-') {
            plain.push('-');
        }
        rest = unsigned;
    }
    let (mantissa, exponent) = match rest.find(['e', 'E']) {
        Some(at) => (&rest[..at], Some(&rest[at + 1..])),
        None => (rest, None),
    };
    let (whole, fraction) = match mantissa.split_once(decimal.char()) {
        Some((whole, fraction)) => (whole, fraction),
        None => (mantissa, ""),
    };
    let whole = if grouped && whole.contains(decimal.grouping()) {
        ungrouped(whole, decimal.grouping()).ok_or_else(|| problem(token, decimal))?
    } else {
        whole.to_owned()
    };
    let digits = |text: &str| text.bytes().all(|byte| byte.is_ascii_digit());
    if !digits(&whole) || !digits(fraction) || whole.len() + fraction.len() == 0 {
        return Err(problem(token, decimal));
    }
    plain.push_str(if whole.is_empty() { "0" } else { &whole });
    plain.push('.');
    plain.push_str(if fraction.is_empty() { "0" } else { fraction });
    let mut power = 0_i32;
    if let Some(exponent) = exponent {
        let magnitude = exponent.strip_prefix(['-', '+']).unwrap_or(exponent);
        if magnitude.is_empty() || !digits(magnitude) {
            return Err(problem(token, decimal));
        }
        plain.push('e');
        plain.push_str(exponent);
        // Beyond this every double is zero or infinite.
        power = exponent.parse().unwrap_or(if exponent.starts_with('-') {
            -99_999
        } else {
            99_999
        });
    }
    let value: f64 = plain.parse().map_err(|_| problem(token, decimal))?;
    if !value.is_finite() {
        return Err(NumberProblem {
            code: "number-too-large",
            what: "is larger than a double can hold",
        });
    }
    let nonzero = whole
        .bytes()
        .chain(fraction.bytes())
        .any(|digit| digit != b'0');
    Ok(PrintedNumber {
        value,
        decimals: i32::try_from(fraction.len())
            .unwrap_or(i32::MAX / 2)
            .saturating_sub(power),
        has_exponent: exponent.is_some(),
        underflows: value == 0.0 && nonzero,
    })
}

/// `1,234,567` without its marks. A group never begins with a zero alone: `0,123` is
/// not a grouped number.
fn ungrouped(whole: &str, mark: char) -> Option<String> {
    let mut groups = whole.split(mark);
    let first = groups.next()?;
    let good_first = (1..=3).contains(&first.len()) && !first.starts_with('0');
    (good_first && groups.all(|group| group.len() == 3)).then(|| whole.replace(mark, ""))
}

fn problem(token: &str, decimal: DecimalMark) -> NumberProblem {
    let lower = token.trim_start_matches(['-', '+']).to_ascii_lowercase();
    let marks = token.chars().filter(|&c| c == '.' || c == ',').count();
    let begins_like_a_number = lower.starts_with(|c: char| c.is_ascii_digit() || c == '.');
    let (code, what) = if token.is_empty() {
        ("empty-cell", "is empty")
    } else if matches!(
        lower.as_str(),
        "nan" | "inf" | "infinity" | "none" | "null" | "na" | "n/a"
    ) {
        ("not-finite", "is not a finite number")
    } else if lower.starts_with("0x") {
        ("bad-number", "is hexadecimal")
    } else if begins_like_a_number && lower.contains('_') {
        ("bad-number", "has an underscore")
    } else if begins_like_a_number && lower.ends_with(['i', 'j']) {
        (
            "complex-number",
            "is complex, and Mueller elements are real",
        )
    } else if begins_like_a_number && (lower.contains('\u{b1}') || lower.contains('(')) {
        (
            "bad-number",
            "carries an uncertainty, which this version does not read: paste the values, and state the noise beside them",
        )
    } else if begins_like_a_number && marks > 1 {
        ("bad-number", "has two decimal marks")
    } else if begins_like_a_number && marks == 1 && !token.contains(decimal.char()) {
        (
            "bad-number",
            match decimal {
                DecimalMark::Point => "has a decimal comma among decimal points",
                DecimalMark::Comma => "has a decimal point among decimal commas",
            },
        )
    } else if begins_like_a_number && lower.contains('d') {
        ("bad-number", "has an exponent with D: write E")
    } else {
        ("bad-number", "is not a number")
    };
    NumberProblem { code, what }
}
