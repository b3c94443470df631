use super::nearest::{Nearest, distance, nearest_of, realizable_spectrum};
use super::weighted::weighted_distance;
use super::{Coherency, eigenvalue_gradient};
use crate::error::Result;
use crate::linalg::HermitianEigen;
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::stats::NormalDraws;
use crate::tolerance;

/// How many measurements the test simulates.
pub const SIMULATIONS: u32 = 999;

/// Whether noise explains a violation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Significance {
    /// The squared distance to the nearest realizable matrix over σ².
    pub statistic: f64,
    /// The share of simulated measurements of a realizable sample that lie as far
    /// out or farther: `(1 + count) / (1 + simulations)`.
    pub p_value: f64,
    /// How many were simulated.
    pub simulations: u32,
}

/// The significance of a violation under one σ.
///
/// The reference distribution is simulated under the nearest realizable matrix in
/// which every eigenvalue below three of its own standard errors is zero, the
/// largest excepted (generalised moment selection, Andrews & Soares 2010).
/// `None` where no realizable matrix has the exact M00, or none is near: then
/// there is nothing to simulate.
///
/// # Errors
/// As [`Coherency::eigen`].
pub fn significance(
    mueller: &Mueller,
    m00_is_exact: bool,
    sigma: f64,
    seed: u64,
) -> Result<Option<Significance>> {
    equal_significance(mueller, m00_is_exact, sigma, None, seed)
}

/// The same where σ may be an estimate: then each simulated measurement has an estimate
/// of its own, with these degrees of freedom.
fn equal_significance(
    mueller: &Mueller,
    m00_is_exact: bool,
    sigma: f64,
    freedom: Option<f64>,
    seed: u64,
) -> Result<Option<Significance>> {
    let Some(test) = Test::new(mueller, m00_is_exact)? else {
        return Ok(None);
    };
    let statistic = square_ratio(test.distance, sigma);
    if test.distance == 0.0 {
        return Ok(Some(Significance {
            statistic,
            p_value: 1.0,
            simulations: 0,
        }));
    }
    let mut draws = NormalDraws::new(seed);
    let noise: Vec<_> = (0..SIMULATIONS).map(|_| draws.draw_matrix()).collect();
    let ratios = freedom.map(|freedom| {
        (0..SIMULATIONS)
            .map(|_| draws.draw_sigma_ratio(freedom))
            .collect::<Vec<_>>()
    });
    Ok(Some(Significance {
        statistic,
        p_value: test.p_value(sigma, &noise, ratios.as_deref())?,
        simulations: SIMULATIONS,
    }))
}

/// The same under any noise, from the nearest matrix under it.
///
/// `None` where there is no nearest matrix, or the noise is none.
///
/// # Errors
/// As [`Coherency::eigen`] and `weighted_nearest`.
pub fn weighted_significance(
    measurement: &Measurement,
    nearest: Option<&Nearest>,
    seed: u64,
) -> Result<Option<Significance>> {
    if let Some(sigma) = measurement.equal_sigma() {
        return equal_significance(
            measurement.mueller(),
            measurement.m00_is_exact(),
            sigma,
            measurement.sigma_freedom(),
            seed,
        );
    }
    let (Some(covariance), Some(nearest)) = (measurement.covariance(), nearest) else {
        return Ok(None);
    };
    let statistic = nearest.statistic.unwrap_or_default();
    if statistic == 0.0 {
        return Ok(Some(Significance {
            statistic,
            p_value: 1.0,
            simulations: 0,
        }));
    }
    let errors = eigenvalue_errors(measurement, &nearest.eigen).unwrap_or_default();
    let mut spectrum = nearest.eigen.values;
    for (value, error) in spectrum.iter_mut().zip(errors).skip(1) {
        if *value < tolerance::STANDARD_ERRORS * error {
            *value = 0.0;
        }
    }
    let mut mean = Coherency::from_spectrum(&spectrum, &nearest.eigen)
        .mueller()
        .row_major();
    let m00 = measurement.mueller().m00();
    if covariance.is_held(0) && mean[0] > 0.0 {
        let factor = m00 / mean[0];
        mean = mean.map(|element| element * factor);
    }
    let mut draws = NormalDraws::new(seed);
    let mut beyond = 0_u32;
    for _ in 0..SIMULATIONS {
        let errors = covariance.draw(&mut draws);
        let elements = std::array::from_fn(|k| mean[k] + errors[k]);
        let values = Coherency::from_elements(&elements).eigen()?.values;
        let estimate = measurement.draw_covariance(&mut draws)?;
        // Most of the time there is something to do; where not, the distance is zero.
        let simulated = if values[3] >= 0.0 {
            0.0
        } else {
            weighted_distance(&elements, estimate.as_ref().unwrap_or(covariance))?
                .unwrap_or(f64::MAX)
        };
        beyond += u32::from(simulated >= statistic);
    }
    Ok(Some(Significance {
        statistic,
        p_value: f64::from(1 + beyond) / f64::from(1 + SIMULATIONS),
        simulations: SIMULATIONS,
    }))
}

/// The smallest σ, to one per cent, under which a violation is no longer
/// significant. `None` where there is no violation, or no σ explains it.
///
/// # Errors
/// As [`Coherency::eigen`].
pub fn explaining_sigma(mueller: &Mueller, m00_is_exact: bool, seed: u64) -> Result<Option<f64>> {
    let Some(test) = Test::new(mueller, m00_is_exact)? else {
        return Ok(None);
    };
    // Beyond the range of a stated σ there is none to name.
    if test.distance < 1.0 / tolerance::LARGEST_NUMBER {
        return Ok(None);
    }
    // The same draws for every σ: the answer does not jitter.
    let mut draws = NormalDraws::new(seed);
    let noise: Vec<_> = (0..SIMULATIONS).map(|_| draws.draw_matrix()).collect();
    let explains = |sigma: f64| Ok(test.p_value(sigma, &noise, None)? >= tolerance::SIGNIFICANCE);

    // For a pure sample the 95 % point of distance / σ is near 3.3.
    let mut high = test.distance / 3.3;
    let mut low = high;
    if explains(high)? {
        for _ in 0..12 {
            low /= 1.5;
            if !explains(low)? {
                break;
            }
            high = low;
        }
    } else {
        for _ in 0..12 {
            high *= 1.5;
            if explains(high)? {
                break;
            }
            low = high;
        }
    }
    if low >= high || !explains(high)? {
        return Ok(None);
    }
    while high > 1.01 * low {
        let middle = (low * high).sqrt();
        if explains(middle)? {
            high = middle;
        } else {
            low = middle;
        }
    }
    Ok(Some(high))
}

/// `se / σ` of a simple eigenvalue of H: ½ for sixteen equal errors, √3/4 where
/// M00 is exact.
fn eigenvalue_error(m00_is_exact: bool) -> f64 {
    if m00_is_exact { 3f64.sqrt() / 4.0 } else { 0.5 }
}

/// First-order standard errors of the eigenvalues of H, in the same order: `gᵀ Σ g`
/// with `g_ij = ¼ h†(σi ⊗ σj*) h`. `None` without noise.
pub(crate) fn eigenvalue_errors(
    measurement: &Measurement,
    eigen: &HermitianEigen,
) -> Option<[f64; 4]> {
    if let Some(sigma) = measurement.equal_sigma() {
        return Some([eigenvalue_error(measurement.m00_is_exact()) * sigma; 4]);
    }
    let covariance = measurement.covariance()?;
    Some(std::array::from_fn(|k| {
        covariance
            .variance(&eigenvalue_gradient(&eigen.vectors[k]))
            .max(0.0)
            .sqrt()
    }))
}

struct Test {
    /// Of the measured matrix.
    eigen: HermitianEigen,
    /// Of the nearest realizable one; the eigenvectors are the same.
    nearest: [f64; 4],
    distance: f64,
    exact_m00: Option<f64>,
}

impl Test {
    fn new(mueller: &Mueller, m00_is_exact: bool) -> Result<Option<Self>> {
        let eigen = Coherency::from_mueller(mueller).eigen()?;
        Ok(
            nearest_of(mueller, &eigen, m00_is_exact).map(|nearest| Self {
                nearest: nearest.eigen.values,
                distance: nearest.distance,
                exact_m00: m00_is_exact.then(|| mueller.m00()),
                eigen,
            }),
        )
    }

    /// `ratios`: of the estimated σ of each simulated measurement to the true one.
    fn p_value(&self, sigma: f64, noise: &[[f64; 16]], ratios: Option<&[f64]>) -> Result<f64> {
        // Work in units of σ: then nothing is too large or too small.
        let null = self.null_spectrum(sigma).map(|value| value / sigma);
        let sum = self.exact_m00.map(|m00| m00 / sigma);
        let mean = Coherency::from_spectrum(&null, &self.eigen)
            .mueller()
            .row_major();
        let observed = self.distance / sigma;
        let mut beyond = 0_u32;
        for (k, draw) in noise.iter().enumerate() {
            let mut elements: [f64; 16] = std::array::from_fn(|k| mean[k] + draw[k]);
            if let Some(sum) = sum {
                elements[0] = sum;
            }
            let values = Coherency::from_elements(&elements).eigen()?.values;
            let simulated = distance(&values, &realizable_spectrum(&values, sum));
            let ratio = ratios.and_then(|ratios| ratios.get(k)).unwrap_or(&1.0);
            beyond += u32::from(simulated >= observed * ratio);
        }
        let simulations = u32::try_from(noise.len()).unwrap_or(u32::MAX);
        Ok(f64::from(1 + beyond) / f64::from(1 + simulations))
    }

    fn null_spectrum(&self, sigma: f64) -> [f64; 4] {
        let threshold =
            tolerance::STANDARD_ERRORS * eigenvalue_error(self.exact_m00.is_some()) * sigma;
        let mut spectrum = self.nearest;
        for value in &mut spectrum[1..] {
            if *value < threshold {
                *value = 0.0;
            }
        }
        let sum: f64 = spectrum.iter().sum();
        match self.exact_m00 {
            Some(m00) if sum > 0.0 => spectrum.map(|value| value * (m00 / sum)),
            _ => spectrum,
        }
    }
}

/// `(a / b)²`, kept finite.
fn square_ratio(a: f64, b: f64) -> f64 {
    (a / b).powi(2).min(f64::MAX)
}
