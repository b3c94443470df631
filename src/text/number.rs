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
    /// The uncertainty printed with it: `0.123(4)`, `0.123 ± 0.004`.
    pub sigma: Option<f64>,
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

    pub(super) const EMPTY: Self = Self {
        code: "empty-cell",
        what: "is empty",
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

/// Reads one number: sign, digits, decimal mark, exponent with e, E, d or D, perhaps
/// with its uncertainty behind it: `(4)` in units of the last digit, `(0.004)` and
/// `±0.004` in full. The value is the double nearest to what is written. `grouped` also
/// takes thousands in threes, such as `1,234.5` beside a decimal point.
///
/// # Errors
/// What is wrong with it. Hexadecimal, `1_000`, complex, infinite numbers and words
/// are refused.
pub fn parse_number(
    token: &str,
    decimal: DecimalMark,
    grouped: bool,
) -> Result<PrintedNumber, NumberProblem> {
    parse_scaled(token, decimal, grouped, 0)
}

/// The same times `10^power`, still exact: the exponent is shifted, not the double
/// multiplied.
pub(super) fn parse_scaled(
    token: &str,
    decimal: DecimalMark,
    grouped: bool,
    power: i32,
) -> Result<PrintedNumber, NumberProblem> {
    let refuse = || problem(token, decimal);
    if let Some((value, sigma)) = token.split_once('\u{b1}') {
        let digits =
            |text: &str| text.starts_with(|c: char| c.is_ascii_digit() || c == decimal.char());
        let sigma = Some(sigma)
            .filter(|sigma| digits(sigma))
            .and_then(|sigma| parts(sigma, decimal, grouped))
            .ok_or_else(refuse)?;
        let number = parts(value, decimal, grouped)
            .ok_or_else(refuse)?
            .number(power)?;
        return Ok(PrintedNumber {
            sigma: Some(sigma.number(power)?.value),
            ..number
        });
    }
    let Some((mantissa, rest)) = token.split_once('(') else {
        return parts(token, decimal, grouped)
            .ok_or_else(refuse)?
            .number(power);
    };
    let (sigma, exponent) = rest.split_once(')').ok_or_else(refuse)?;
    let number = parts(&format!("{mantissa}{exponent}"), decimal, grouped)
        .filter(|number| {
            mantissa.ends_with(|c: char| c.is_ascii_digit()) && number.sigma_fits(exponent)
        })
        .ok_or_else(refuse)?;
    let sigma = parts(sigma, decimal, false)
        .filter(|sigma| !sigma.negative && sigma.exponent.is_none())
        .ok_or_else(refuse)?;
    // Digits alone count in the last place of the value.
    let last_place = if sigma.has_mark {
        0
    } else {
        i32::try_from(number.fraction.len()).map_err(|_| refuse())?
    };
    let shift = number
        .power()
        .saturating_sub(last_place)
        .saturating_add(power);
    Ok(PrintedNumber {
        sigma: Some(sigma.number(shift)?.value),
        ..number.number(power)?
    })
}

/// The pieces of a number in decimal digits.
struct Parts {
    negative: bool,
    whole: String,
    fraction: String,
    has_mark: bool,
    /// With its sign.
    exponent: Option<String>,
}

/// `None` where something else stands among them.
fn parts(token: &str, decimal: DecimalMark, grouped: bool) -> Option<Parts> {
    let unsigned = token.strip_prefix(['-', '+']).unwrap_or(token);
    let (mantissa, exponent) = match unsigned.find(['e', 'E', 'd', 'D']) {
        Some(at) => (&unsigned[..at], Some(unsigned[at + 1..].to_owned())),
        None => (unsigned, None),
    };
    let (whole, fraction) = mantissa
        .split_once(decimal.char())
        .unwrap_or((mantissa, ""));
    let mark = [decimal.grouping(), ' ', '\'']
        .into_iter()
        .find(|&mark| whole.contains(mark));
    let whole = match mark {
        Some(mark) if grouped && exponent.is_none() => ungrouped(whole, mark)?,
        _ => whole.to_owned(),
    };
    let digits = |text: &str| text.bytes().all(|byte| byte.is_ascii_digit());
    let good_exponent = exponent.as_ref().is_none_or(|exponent| {
        let magnitude = exponent.strip_prefix(['-', '+']).unwrap_or(exponent);
        !magnitude.is_empty() && digits(magnitude)
    });
    (digits(&whole) && digits(fraction) && whole.len() + fraction.len() > 0 && good_exponent).then(
        || Parts {
            negative: token.starts_with('-'),
            whole,
            fraction: fraction.to_owned(),
            has_mark: mantissa.contains(decimal.char()),
            exponent,
        },
    )
}

impl Parts {
    /// Beyond a hundred thousand every double is zero or infinite.
    fn power(&self) -> i32 {
        let exponent = self.exponent.as_deref().unwrap_or("0");
        exponent.parse().unwrap_or(if exponent.starts_with('-') {
            -99_999
        } else {
            99_999
        })
    }

    /// Whether what stood behind the uncertainty is the exponent, all of it.
    fn sigma_fits(&self, behind: &str) -> bool {
        self.exponent
            .as_ref()
            .map_or(0, |exponent| exponent.len() + 1)
            == behind.len()
    }

    fn number(&self, shift: i32) -> Result<PrintedNumber, NumberProblem> {
        let power = self.power().saturating_add(shift);
        let sign = if self.negative { "-" } else { "" };
        // Digits and an exponent alone: the standard library reads all of them.
        let value: f64 = format!("{sign}{}.{}e{power}", self.whole, self.fraction)
            .parse()
            .map_err(|_| NumberProblem::NOT_A_NUMBER)?;
        if !value.is_finite() {
            return Err(NumberProblem {
                code: "number-too-large",
                what: "is larger than a double can hold",
            });
        }
        let nonzero = self
            .whole
            .bytes()
            .chain(self.fraction.bytes())
            .any(|digit| digit != b'0');
        Ok(PrintedNumber {
            value,
            sigma: None,
            decimals: i32::try_from(self.fraction.len())
                .unwrap_or(i32::MAX / 2)
                .saturating_sub(power),
            has_exponent: self.exponent.is_some(),
            underflows: value == 0.0 && nonzero,
        })
    }
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
            "carries an uncertainty that is not like 0.123(4) or 0.123 ± 0.004",
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
    } else {
        ("bad-number", "is not a number")
    };
    NumberProblem { code, what }
}
