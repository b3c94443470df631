//! Numbers as the plots and their descriptions print them: U+2212 for minus, and
//! no negative zero.

/// With a fixed count of decimals.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{:.*}", decimals, value.abs());
    let is_zero = text.bytes().all(|b| b == b'0' || b == b'.');
    if value < 0.0 && !is_zero {
        format!("\u{2212}{text}")
    } else {
        text
    }
}

/// With `digits` significant digits; in powers of ten when very large or small.
pub(super) fn significant(value: f64, digits: usize) -> String {
    let digits = digits.max(1);
    if value == 0.0 {
        return "0".to_owned();
    }
    let exponent = value.abs().log10().floor() as i32;
    if (-5..6).contains(&exponent) {
        let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
        fixed(value, decimals)
    } else {
        power_of_ten(value, digits - 1)
    }
}

/// As mantissa and power of ten, the mantissa with a fixed count of decimals.
pub(super) fn power_of_ten(value: f64, decimals: usize) -> String {
    let text = format!("{:.*e}", decimals, value.abs());
    let (mantissa, exponent) = text.split_once('e').unwrap_or((&text, "0"));
    let sign = if value < 0.0 { "\u{2212}" } else { "" };
    let exponent: String = exponent.chars().map(superscript).collect();
    format!("{sign}{mantissa}×10{exponent}")
}

/// Rounded to the second significant digit of its standard error.
pub(super) fn with_error(value: f64, standard_error: f64) -> String {
    if standard_error > 0.0 {
        let place = 1 - standard_error.log10().floor() as i32;
        if (0..12).contains(&place) && value.abs() < 1e6 {
            let decimals = place as usize;
            return format!(
                "{} ± {}",
                fixed(value, decimals),
                fixed(standard_error, decimals)
            );
        }
    }
    format!(
        "{} ± {}",
        significant(value, 4),
        significant(standard_error, 2)
    )
}

/// A small count as a word, to open a sentence with.
pub(super) fn count(n: usize) -> String {
    match n {
        0 => "None".to_owned(),
        1 => "One".to_owned(),
        2 => "Two".to_owned(),
        3 => "Three".to_owned(),
        4 => "Four".to_owned(),
        5 => "Five".to_owned(),
        6 => "Six".to_owned(),
        _ => n.to_string(),
    }
}

fn superscript(c: char) -> char {
    match c {
        '-' => '\u{207b}',
        '1' => '\u{b9}',
        '2' => '\u{b2}',
        '3' => '\u{b3}',
        '0' => '\u{2070}',
        '4'..='9' => char::from_u32(0x2070 + (c as u32 - '0' as u32)).unwrap_or(c),
        other => other,
    }
}
