use nalgebra::{Matrix4, Vector4};
use num_complex::Complex64;

use super::nearest::Nearest;
use super::significance::{
    Significance, eigenvalue_errors, explaining_sigma, significance, weighted_significance,
};
use crate::error::Result;
use crate::linalg::{HermitianEigen, hermitian_eigen};
use crate::mueller::Mueller;
use crate::noise::{Measurement, Noise};
use crate::stats::{printed_decimals, rounding_sigma};
use crate::tolerance;

/// Can the measured matrix be physical?
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// H has no negative eigenvalue.
    Realizable,
    /// It has, but noise puts a realizable sample there often enough.
    WithinNoise,
    /// It has, and noise does not explain it.
    BeyondNoise,
    /// It has, and no noise was stated or tested.
    NotRealizable,
}

/// Everything that was found about realizability.
#[derive(Debug, Clone, PartialEq)]
pub struct Realizability {
    /// In a word.
    pub verdict: Verdict,
    /// Of H / |M00|, descending; `None` where M00 is zero.
    pub eigenvalues: Option<[f64; 4]>,
    /// Standard errors of the eigenvalues, if they are simple, over |M00|.
    pub eigenvalue_se: Option<[f64; 4]>,
    /// Frobenius distance to the nearest realizable matrix over |M00|; `None` where
    /// M00 is zero or there is no such matrix.
    pub violation: Option<f64>,
    /// The test; `None` without noise or draws, with the reason.
    pub significance: Option<Significance>,
    /// Why something above is `None`.
    pub reason: Option<&'static str>,
    /// The printed resolution of the numbers, where they look printed.
    pub rounding_decimals: Option<u32>,
    /// The standard deviation that this rounding leaves.
    pub rounding_sigma: Option<f64>,
    /// Whether rounding alone explains the violation.
    pub consistent_with_rounding: bool,
    /// Whether every physical state maps to a physical state.
    pub stokes_condition: bool,
    /// As [`stokes_margin`].
    pub stokes_margin: Option<f64>,
    /// Without a noise statement: the smallest σ that would explain the violation.
    pub explaining_sigma: Option<f64>,
    /// For absolute matrices.
    pub passivity: Option<Passivity>,
}

/// Whether the element gives out no more than it gets.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Passivity {
    /// `M00 (1 + max(D, P)) - 1`; positive is too much.
    pub margin: f64,
    /// Its first-order standard error.
    pub margin_se: Option<f64>,
    /// The one-sided lower limit of 95 %.
    pub margin_low: Option<f64>,
    /// In a word.
    pub verdict: PassivityVerdict,
}

/// Whether the element gives out no more than it gets.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PassivityVerdict {
    /// The margin is not positive.
    Passive,
    /// It is, within the one-sided 95 % of the noise.
    NotBeyondNoise,
    /// It is.
    NotPassive,
}

/// `H ⪰ 0` (Cloude 1986), up to the rounding of the arithmetic.
#[must_use]
pub fn is_realizable(mueller: &Mueller, eigen: &HermitianEigen) -> bool {
    eigen.values[3] >= -tolerance::ZERO * mueller.m00().abs()
}

/// All of the checks on one measurement. `eigen` and `nearest` belong to its
/// matrix; without a `seed` nothing is simulated.
///
/// # Errors
/// `no-convergence`.
pub fn realizability(
    measurement: &Measurement,
    eigen: &HermitianEigen,
    nearest: Option<&Nearest>,
    seed: Option<u64>,
) -> Result<Realizability> {
    let mueller = measurement.mueller();
    let exact = measurement.m00_is_exact();
    let m00 = Some(mueller.m00().abs()).filter(|&m00| m00 > tolerance::ZERO * mueller.largest());
    let realizable = is_realizable(mueller, eigen);

    let test = match seed {
        Some(seed) => weighted_significance(measurement, nearest, seed)?,
        None => None,
    };
    let rounding_decimals = match measurement.noise() {
        &Noise::Rounding { decimals } => Some(decimals),
        // A matrix of zeros and ones was hardly rounded to whole numbers.
        _ => printed_decimals(&mueller.row_major())
            .filter(|&decimals| rounding_sigma(decimals) <= 0.03 * mueller.m00().abs()),
    };
    let consistent_with_rounding = realizable
        || match (rounding_decimals, nearest) {
            (Some(decimals), Some(nearest)) => {
                prints_alike(mueller, &nearest.mueller, decimals)
                    || match (measurement.noise(), seed, test) {
                        (Noise::Rounding { .. }, _, Some(test)) => is_noise(&test),
                        (Noise::None, Some(seed), _) => {
                            significance(mueller, exact, rounding_sigma(decimals), seed)?
                                .is_some_and(|test| is_noise(&test))
                        }
                        _ => false,
                    }
            }
            _ => false,
        };
    let explaining_sigma = match (measurement.noise(), seed) {
        (Noise::None, Some(seed)) if !realizable => explaining_sigma(mueller, exact, seed)?,
        _ => None,
    };
    let verdict = match (measurement.has_noise(), test) {
        _ if realizable => Verdict::Realizable,
        (true, Some(test)) if is_noise(&test) => Verdict::WithinNoise,
        (true, Some(_)) => Verdict::BeyondNoise,
        // M00 is exact and negative: no noise touches it.
        (true, None) if nearest.is_none() => Verdict::BeyondNoise,
        _ => Verdict::NotRealizable,
    };
    let reason = if m00.is_none() {
        Some("M00 is zero, so nothing can be given relative to it")
    } else if nearest.is_none() {
        Some(if mueller.m00() < 0.0 {
            "M00 is exact and negative, and no realizable matrix has a negative M00"
        } else {
            "no realizable matrix has the elements that are exact"
        })
    } else if !measurement.has_noise() {
        Some("no noise was stated")
    } else if test.is_none() {
        Some("no simulation was asked for")
    } else {
        None
    };
    let margin = stokes_margin(mueller)?;
    Ok(Realizability {
        verdict,
        eigenvalues: m00.map(|m00| eigen.values.map(|value| value / m00)),
        eigenvalue_se: eigenvalue_errors(measurement, eigen)
            .zip(m00)
            .map(|(errors, m00)| errors.map(|se| se / m00))
            .filter(|errors| errors.iter().all(|se| se.is_finite())),
        violation: nearest
            .zip(m00)
            .map(|(nearest, m00)| nearest.distance / m00),
        significance: test,
        reason,
        rounding_decimals,
        rounding_sigma: rounding_decimals.map(rounding_sigma),
        consistent_with_rounding,
        stokes_condition: stokes_condition(mueller, margin),
        stokes_margin: margin,
        explaining_sigma,
        passivity: passivity(measurement),
    })
}

/// `max over μ ≥ 0 of λmin(mᵀ G m - μ G)`, m = M/M00: not negative where every
/// state of positive intensity keeps a degree of polarization of at most one
/// (Givens & Kostinski 1993; in this form, which also holds for perfect retarders
/// and polarizers, after the S-lemma). `None` unless M00 is positive.
///
/// # Errors
/// `no-convergence`.
pub fn stokes_margin(mueller: &Mueller) -> Result<Option<f64>> {
    let Some(m) = mueller.normalised().filter(|_| mueller.m00() > 0.0) else {
        return Ok(None);
    };
    let metric = Matrix4::from_diagonal(&Vector4::new(1.0, -1.0, -1.0, -1.0));
    let form = m.matrix().transpose() * metric * m.matrix();
    let at = |mu: f64| -> Result<(f64, f64)> {
        let eigen = hermitian_eigen(&(form - metric * mu).map(Complex64::from))?;
        let weights = eigen.vectors[3].map(|entry| entry.norm_sqr());
        Ok((eigen.values[3], 1.0 - 2.0 * weights[0]))
    };
    let (start, _) = at(0.0)?;
    let mut best = start;
    // The function is concave and below `form00 - μ`, so its maximum lies in here;
    // its slope is `-v† G v`, which for a unit vector is `1 - 2 |v0|²`.
    let (mut low, mut high) = (0.0, (form[(0, 0)] - start).max(0.0));
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        let (value, slope) = at(middle)?;
        best = best.max(value);
        if slope > 0.0 {
            low = middle;
        } else {
            high = middle;
        }
    }
    Ok(Some(best))
}

fn stokes_condition(mueller: &Mueller, margin: Option<f64>) -> bool {
    let Some(m) = mueller.normalised().filter(|_| mueller.m00() > 0.0) else {
        return mueller.largest() == 0.0;
    };
    let scale = m.largest().powi(2).max(1.0);
    diattenuation(&m) <= 1.0 + tolerance::ZERO
        && margin.is_some_and(|margin| margin >= -tolerance::ZERO * scale)
}

/// `M00 (1 + max(D, P)) ≤ 1` for absolute matrices (San José & Gil 2020); `None`
/// for relative ones.
#[must_use]
pub fn passivity(measurement: &Measurement) -> Option<Passivity> {
    let mueller = measurement.mueller();
    if !measurement.absolute() {
        return None;
    }
    let matrix = mueller.matrix();
    let first_row = matrix.fixed_view::<1, 3>(0, 1).norm();
    let first_column = matrix.fixed_view::<3, 1>(1, 0).norm();
    let margin = mueller.m00() + first_row.max(first_column) - 1.0;
    let margin_se = measurement.standard_error(&margin_gradient(mueller));
    // The one-sided 95 % point of the normal distribution.
    let margin_low = margin_se.map(|se| margin - 1.644_853_626_951_472_7 * se);
    let verdict = if margin <= tolerance::ZERO {
        PassivityVerdict::Passive
    } else if margin_low.is_some_and(|low| low <= 0.0) {
        PassivityVerdict::NotBeyondNoise
    } else {
        PassivityVerdict::NotPassive
    };
    Some(Passivity {
        margin,
        margin_se,
        margin_low,
        verdict,
    })
}

/// The derivatives of the margin: one for M00, the direction of the longer vector.
fn margin_gradient(mueller: &Mueller) -> [f64; 16] {
    let elements = mueller.row_major();
    let length = |places: [usize; 3]| {
        places
            .iter()
            .fold(0.0_f64, |sum, &k| sum.hypot(elements[k]))
    };
    let (row, column) = ([1, 2, 3], [4, 8, 12]);
    let places = if length(row) >= length(column) {
        row
    } else {
        column
    };
    let longest = length(places);
    let mut gradient = [0.0; 16];
    gradient[0] = 1.0;
    for k in places {
        gradient[k] = if longest > 0.0 {
            elements[k] / longest
        } else {
            3f64.sqrt().recip()
        };
    }
    gradient
}

/// Whether a realizable matrix prints as the same digits.
fn prints_alike(measured: &Mueller, nearest: &Mueller, decimals: u32) -> bool {
    let half_a_digit = 0.5 * 10f64.powi(-i32::try_from(decimals).unwrap_or(i32::MAX));
    (measured.matrix() - nearest.matrix()).amax() <= half_a_digit
}

fn is_noise(test: &Significance) -> bool {
    test.p_value >= tolerance::SIGNIFICANCE
}

fn diattenuation(normalised: &Mueller) -> f64 {
    normalised.matrix().fixed_view::<1, 3>(0, 1).norm()
}
