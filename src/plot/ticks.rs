//! Linear scales and their ticks.

use super::number::{fixed, power_of_ten};
use crate::error::Result;

/// A linear map from values to pixels.
#[derive(Debug, Clone, Copy)]
pub(super) struct Scale {
    /// The values at the two ends, `low < high`.
    pub low: f64,
    pub high: f64,
    /// The pixels at the two ends.
    pub from: f64,
    pub to: f64,
}

impl Scale {
    pub(super) fn at(&self, value: f64) -> f64 {
        let share = (value - self.low) / (self.high - self.low);
        self.from + share.clamp(-0.5, 1.5) * (self.to - self.from)
    }
}

/// Round values inside a scale with their labels, as many as stand apart.
///
/// `width` measures a label in pixels; no label reaches further than `reach` beyond
/// the ends. Where no two stand apart the one nearest the middle is left. At most 24.
pub(super) fn ticks(
    scale: &Scale,
    reach: f64,
    width: impl Fn(&str) -> Result<f64>,
) -> Result<Vec<(f64, String)>> {
    let pixels = scale.to - scale.from;
    let span = scale.high - scale.low;
    let mut denser: Vec<(f64, String)> = Vec::new();
    let mut step = Step::above(span / (pixels / 24.0).clamp(2.0, 20.0));
    for _ in 0..12 {
        let mut marks = Vec::new();
        let mut widest = 0.0_f64;
        for (value, label) in step.marks(scale.low, scale.high) {
            let half = width(&label)? / 2.0;
            let x = scale.at(value);
            if x - half >= scale.from - reach && x + half <= scale.to + reach {
                widest = widest.max(2.0 * half);
                marks.push((value, label));
            }
        }
        if marks.len() > 1 && widest + 14.0 <= step.size() / span * pixels {
            return Ok(marks);
        }
        if marks.len() < 2 && !denser.is_empty() {
            break;
        }
        denser = marks;
        step = step.next();
    }
    let middle = (scale.from + scale.to) / 2.0;
    let off = |mark: &(f64, String)| (scale.at(mark.0) - middle).abs();
    let nearest = denser.into_iter().min_by(|a, b| off(a).total_cmp(&off(b)));
    Ok(nearest.into_iter().collect())
}

/// 1, 2 or 5 times a power of ten.
#[derive(Debug, Clone, Copy)]
struct Step {
    digit: u8,
    exponent: i32,
}

impl Step {
    fn above(size: f64) -> Self {
        let exponent = size.log10().floor() as i32;
        let mut step = Self { digit: 1, exponent };
        for _ in 0..4 {
            if step.size() >= size {
                break;
            }
            step = step.next();
        }
        step
    }

    fn next(self) -> Self {
        match self.digit {
            1 => Self { digit: 2, ..self },
            2 => Self { digit: 5, ..self },
            _ => Self {
                digit: 1,
                exponent: self.exponent + 1,
            },
        }
    }

    fn size(self) -> f64 {
        self.times(1.0)
    }

    /// A multiple, rounded once where the power of ten is exact.
    fn times(self, n: f64) -> f64 {
        let digits = n * f64::from(self.digit);
        if self.exponent < 0 {
            digits / 10f64.powi(-self.exponent)
        } else {
            digits * 10f64.powi(self.exponent)
        }
    }

    fn marks(self, low: f64, high: f64) -> Vec<(f64, String)> {
        let (first, last) = ((low / self.size()).ceil(), (high / self.size()).floor());
        let count = last - first + 1.0;
        if !(1.0..=24.0).contains(&count) {
            return Vec::new();
        }
        let largest = low.abs().max(high.abs());
        (0..count as usize)
            .map(|k| self.times(first + k as f64))
            .map(|value| (value, self.label(value, largest)))
            .collect()
    }

    fn label(self, value: f64, largest: f64) -> String {
        if value == 0.0 {
            return "0".to_owned();
        }
        if (-5..=0).contains(&self.exponent.min(0)) && largest < 1e5 {
            return fixed(value, self.exponent.min(0).unsigned_abs() as usize);
        }
        let leading = value.abs().log10().floor() as i32;
        power_of_ten(value, (leading - self.exponent).clamp(0, 15) as usize)
    }
}
