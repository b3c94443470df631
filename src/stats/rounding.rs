use crate::error::{Error, Result};

/// A number written with its uncertainty.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RoundedValue {
    /// For reading: U+2212 as the minus.
    pub text: String,
    /// For programs: the same in ASCII.
    pub plain: String,
}

/// Writes a value with its standard error in the short form `0.1230(41)`.
///
/// Two significant digits of the standard error are kept (GUM 7.2.6); without
/// one, six significant digits of the value. Outside 1e-5 to 1e7 a power of ten
/// is split off.
///
/// # Errors
/// `not-finite`, `bad-sigma` for a negative standard error.
pub fn rounded(value: f64, standard_error: Option<f64>) -> Result<RoundedValue> {
    if !value.is_finite() || standard_error.is_some_and(|se| !se.is_finite()) {
        return Err(Error::new(
            "not-finite",
            "Only finite numbers can be written.",
        ));
    }
    if standard_error.is_some_and(|se| se < 0.0) {
        return Err(Error::new(
            "bad-sigma",
            "A standard error can't be negative.",
        ));
    }
    let plain = match standard_error {
        Some(se) if se > 0.0 => with_error(value, se),
        _ => alone(value),
    };
    Ok(RoundedValue {
        text: plain.replace('-', "\u{2212}"),
        plain,
    })
}

/// How many decimals are needed to write all of the numbers: the printed
/// resolution, less trailing zeros. `None` above eight, which is no rounding that
/// a person chose, and where no number is other than zero.
#[must_use]
pub fn printed_decimals(values: &[f64]) -> Option<u32> {
    let mut most = 0;
    for value in values {
        // The shortest decimal that reads back as the same number.
        let text = format!("{value}");
        let decimals = text.split_once('.').map_or(0, |(_, tail)| tail.len());
        most = most.max(decimals);
    }
    let any = values.iter().any(|&value| value != 0.0);
    u32::try_from(most).ok().filter(|&most| any && most <= 8)
}

/// The standard deviation that rounding to `decimals` decimals leaves: the width
/// of the interval over √12 (JCGM 100:2008, 4.3.7).
#[must_use]
pub fn rounding_sigma(decimals: u32) -> f64 {
    10f64.powi(-i32::try_from(decimals.min(300)).unwrap_or(300)) / 12f64.sqrt()
}

/// The exponent of ten of the leading digit.
fn exponent(value: f64) -> i32 {
    let text = format!("{value:e}");
    text.split_once('e')
        .and_then(|(_, exponent)| exponent.parse().ok())
        .unwrap_or(0)
}

fn with_error(value: f64, se: f64) -> String {
    // Rounding may carry 9.96 to 10: take the exponent after rounding.
    let rounded_se: f64 = format!("{se:.1e}").parse().unwrap_or(se);
    let last = exponent(rounded_se) - 1;
    let digits = format!("{se:.1e}");
    let digits = digits
        .split('e')
        .next()
        .unwrap_or_default()
        .replace('.', "");
    let steps = (value / 10f64.powi(last)).round();
    if !steps.is_finite() || steps.abs() > 1e16 {
        // The error lies below the resolution of a double.
        return alone(value);
    }
    let leading = if steps == 0.0 {
        last
    } else {
        exponent(steps) + last
    };
    let largest = leading.max(last + 1);
    if (-5..7).contains(&largest) && last <= 0 {
        let decimals = usize::try_from(-last).unwrap_or(0);
        return format!("{}({digits})", without_minus_zero(value, decimals));
    }
    let decimals = largest - last;
    let mantissa = steps / 10f64.powi(decimals);
    let mantissa = without_minus_zero(mantissa, usize::try_from(decimals).unwrap_or(0));
    format!("{mantissa}({digits})e{largest}")
}

fn alone(value: f64) -> String {
    if value == 0.0 {
        return "0".to_owned();
    }
    let text = format!("{value:.5e}");
    let power = exponent(text.parse().unwrap_or(value));
    if (-5..7).contains(&power) {
        let decimals = usize::try_from(5 - power).unwrap_or(0);
        let text = format!("{value:.decimals$}");
        return if text.contains('.') {
            text.trim_end_matches('0').trim_end_matches('.').to_owned()
        } else {
            text
        };
    }
    let (mantissa, power) = text.split_once('e').unwrap_or((&text, "0"));
    format!(
        "{}e{power}",
        mantissa.trim_end_matches('0').trim_end_matches('.')
    )
}

fn without_minus_zero(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    if text
        .bytes()
        .any(|byte| byte.is_ascii_digit() && byte != b'0')
    {
        text
    } else {
        text.replace('-', "")
    }
}
