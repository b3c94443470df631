use nalgebra::Matrix3;

use super::errors::Gradients;
use super::samples::Samples;
use super::values::{Analysis, FigureName};
use crate::coherency::eigenvalue_errors;
use crate::error::Result;
use crate::linalg::inverse_symmetric3;
use crate::noise::Measurement;
use crate::stats::{chi_squared_95, noncentrality_at, normal_95};
use crate::tolerance;

/// How an interval was found.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Method {
    /// 1.96 standard errors to each side.
    FirstOrder,
    /// The central 95 % of simulated measurements.
    Percentile,
    /// For a length near zero: the noncentral chi-squared distribution of its square,
    /// inverted.
    NoncentralChiSquared,
    /// A length that may be zero: the upper end of its interval by the noncentral
    /// chi-squared distribution alone. Which of the two is given depends on the
    /// measurement, and a limit of 95 % on one side would then hold the truth less often.
    UpperLimit,
    /// A figure at the end of its range: 95 % on one side.
    OneSided,
}

/// An interval of 95 %.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interval {
    /// `None` where there is none on this side.
    pub low: Option<f64>,
    /// `None` where there is none on this side.
    pub high: Option<f64>,
    /// How it was found.
    pub method: Method,
}

/// A figure with its standard error and interval, angles in radians.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Figure {
    /// `None` where not determined.
    pub value: Option<f64>,
    /// First-order standard error; `None` without noise, or where the first order
    /// means nothing.
    pub se: Option<f64>,
    /// `None` where there is none.
    pub interval: Option<Interval>,
    /// A length without what noise adds to it, zero where it may be all noise (Wardle &
    /// Kronberg 1974 for two components, the same for three); `None` for other figures.
    pub debiased: Option<f64>,
    /// Why something is `None`, or how to read it.
    pub reason: Option<&'static str>,
}

/// Beyond so many standard errors from zero a length has the errors of a number.
const FAR_FROM_ZERO: f64 = 6.0;

/// The share of draws that must determine a figure.
const ENOUGH: f64 = 0.98;

/// Every figure, in the order of [`FigureName::ALL`].
#[derive(Debug, Clone, PartialEq)]
pub struct FigureTable([Figure; FigureName::ALL.len()]);

impl FigureTable {
    /// Names and figures.
    pub fn iter(&self) -> impl Iterator<Item = (FigureName, &Figure)> {
        FigureName::ALL.into_iter().zip(&self.0)
    }

    /// One of them.
    #[must_use]
    pub fn get(&self, name: FigureName) -> &Figure {
        &self.0[name as usize]
    }
}

const NO_NOISE: &str = "no noise was stated";
const NOT_ASKED: &str = "no draws were asked for";
const NEAR_ZERO: &str = "within three standard errors of 0: read it as an upper limit";
const UPPER_LIMIT: &str = "not different from 0";
const NEAR_END: &str = "within three standard errors of half a wave";
const AT_ZERO: &str = "not different from 0, where it ends";
const NEAR_EIGENVALUES: &str =
    "two eigenvalues lie within three standard errors, so there is no interval";
const WIDE_ANGLE: &str = "the noise leaves more than half of the period open";
const NOT_SMOOTH: &str =
    "not determined for a slightly different matrix, so there is no first-order error";
const NOT_ALWAYS: &str = "the noise makes it undetermined too often for an interval";

/// All figures of a measurement with their intervals from `draws` simulated ones; none of
/// the other questions.
///
/// # Errors
/// `no-convergence`.
pub fn figures_of(measurement: &Measurement, draws: u32, seed: u64) -> Result<FigureTable> {
    let analysis = Analysis::of(measurement)?;
    let samples = Samples::of(measurement, draws, seed)?;
    figures(&analysis, true, Some(&samples))
}

/// All figures of one analysis; with standard errors and first-order intervals where
/// `with_errors`; with the intervals that suit each of them where there are `samples`.
pub(crate) fn figures(
    analysis: &Analysis,
    with_errors: bool,
    samples: Option<&Samples>,
) -> Result<FigureTable> {
    let without = |reason| {
        FigureName::ALL.map(|name| match analysis.value(name) {
            Ok(value) => figure(Some(value), None, None, Some(reason)),
            Err(reason) => figure(None, None, None, Some(reason)),
        })
    };
    if !analysis.measurement.has_noise() {
        return Ok(FigureTable(without(NO_NOISE)));
    }
    if !with_errors {
        return Ok(FigureTable(without(NOT_ASKED)));
    }
    let judge = Judge {
        analysis,
        gradients: Gradients::of(analysis)?,
    };
    Ok(FigureTable(FigureName::ALL.map(
        |name| match analysis.value(name) {
            Err(reason) => figure(None, None, None, Some(reason)),
            Ok(value) => Figure {
                debiased: judge.length(name).map(|length| length.debiased()),
                ..judge.figure(name, value, samples)
            },
        },
    )))
}

fn figure(
    value: Option<f64>,
    se: Option<f64>,
    interval: Option<Interval>,
    reason: Option<&'static str>,
) -> Figure {
    Figure {
        value,
        se,
        interval,
        debiased: None,
        reason,
    }
}

fn both(low: f64, high: f64, method: Method) -> Option<Interval> {
    Some(Interval {
        low: Some(low),
        high: Some(high),
        method,
    })
}

struct Judge<'a> {
    analysis: &'a Analysis,
    gradients: Gradients,
}

impl Judge<'_> {
    fn figure(&self, name: FigureName, value: f64, samples: Option<&Samples>) -> Figure {
        let se = self.gradients.figures[name as usize]
            .as_ref()
            .and_then(|gradient| self.analysis.measurement.standard_error(gradient))
            .filter(|se| se.is_finite());
        if name.orders_eigenvalues() && !self.distinct_eigenvalues(name) {
            return figure(Some(value), None, None, Some(NEAR_EIGENVALUES));
        }
        let wide = |width: f64| name.period().is_some_and(|period| width > period / 2.0);
        let Some(samples) = samples else {
            let Some(se) = se else {
                return figure(Some(value), None, None, Some(NOT_SMOOTH));
            };
            if wide(2.0 * normal_95() * se) {
                return figure(None, None, None, Some(WIDE_ANGLE));
            }
            if name.is_length() && value < tolerance::STANDARD_ERRORS * se {
                return figure(Some(value), Some(se), None, Some(NEAR_ZERO));
            }
            let interval = both(
                value - normal_95() * se,
                value + normal_95() * se,
                Method::FirstOrder,
            );
            return figure(Some(value), Some(se), interval, None);
        };
        let smooth = if se.is_none() { Some(NOT_SMOOTH) } else { None };
        if let Some(length) = self.length(name) {
            match length.interval() {
                Some(interval) => {
                    let reason = (interval.method == Method::UpperLimit).then_some(UPPER_LIMIT);
                    return figure(Some(value), se, Some(interval), reason.or(smooth));
                }
                None if length.ratio < FAR_FROM_ZERO.powi(2) => {
                    return figure(Some(value), se, None, Some(NOT_ALWAYS));
                }
                None => {}
            }
        }
        if let Some(interval) = self.transmittance(name, value) {
            return figure(Some(value), se, Some(interval), smooth);
        }
        let Some((mut drawn, determined)) = samples.of_figure(name, value) else {
            return figure(Some(value), se, None, Some(NOT_ALWAYS));
        };
        if determined < ENOUGH {
            return figure(Some(value), se, None, Some(NOT_ALWAYS));
        }
        drawn.sort_by(f64::total_cmp);
        let at = |share: f64| percentile(&drawn, share);
        let folded = matches!(name, FigureName::Retardance | FigureName::LinearRetardance)
            && se.is_none_or(|se| std::f64::consts::PI - value < tolerance::STANDARD_ERRORS * se);
        if folded {
            let interval = Interval {
                low: Some(at(0.05)),
                high: None,
                method: Method::OneSided,
            };
            return figure(Some(value), se, Some(interval), Some(NEAR_END));
        }
        // It is of the nearest realizable matrix, which stops at no depolarization.
        let at_zero = se.is_none_or(|se| value < tolerance::STANDARD_ERRORS * se)
            || at(0.025) < tolerance::NOT_DETERMINED;
        if name == FigureName::DepolarizationPower && at_zero {
            let interval = Interval {
                low: None,
                high: Some(at(0.95)),
                method: Method::OneSided,
            };
            return figure(Some(value), se, Some(interval), Some(AT_ZERO));
        }
        let (low, high) = (at(0.025), at(0.975));
        if wide(high - low) {
            return figure(None, None, None, Some(WIDE_ANGLE));
        }
        figure(Some(value), se, both(low, high, Method::Percentile), smooth)
    }

    fn distinct_eigenvalues(&self, name: FigureName) -> bool {
        let values = &self.analysis.eigen.values;
        let Some(errors) = eigenvalue_errors(&self.analysis.measurement, &self.analysis.eigen)
        else {
            return false;
        };
        let apart = (0..3).all(|k| {
            values[k] - values[k + 1] > tolerance::STANDARD_ERRORS * errors[k].max(errors[k + 1])
        });
        // The entropy also turns where an eigenvalue meets zero.
        apart && (name != FigureName::Entropy || values[3] > tolerance::STANDARD_ERRORS * errors[3])
    }

    /// The vector whose length a figure is, with its covariance.
    fn length(&self, name: FigureName) -> Option<Length> {
        let m = self
            .analysis
            .measurement
            .mueller()
            .normalised()?
            .row_major();
        let m00 = self.analysis.measurement.mueller().m00();
        // Of an element over M00.
        let ratio = |k: usize| {
            let mut gradient = [0.0; 16];
            gradient[k] = 1.0 / m00;
            gradient[0] -= m[k] / m00;
            gradient
        };
        let elements = |places: &[usize]| {
            Some((
                places.iter().map(|&k| m[k]).collect(),
                places.iter().map(|&k| ratio(k)).collect(),
            ))
        };
        let (vector, gradients): (Vec<f64>, Vec<[f64; 16]>) = match name {
            FigureName::Diattenuation => elements(&[1, 2, 3]),
            FigureName::LinearDiattenuation => elements(&[1, 2]),
            FigureName::Polarizance => elements(&[4, 8, 12]),
            FigureName::LinearPolarizance => elements(&[4, 8]),
            FigureName::Retardance => {
                let retarder = self.analysis.retarder()?;
                Some((retarder.vector.to_vec(), self.gradients.retarder?.to_vec()))
            }
            FigureName::LinearRetardance => {
                let retarder = self.analysis.retarder()?;
                Some((
                    retarder.linear_vector.to_vec(),
                    self.gradients.linear?.to_vec(),
                ))
            }
            _ => None,
        }?;
        let measurement = &self.analysis.measurement;
        let mut covariance = Matrix3::identity();
        for (i, one) in gradients.iter().enumerate() {
            for (j, other) in gradients.iter().enumerate() {
                covariance[(i, j)] = measurement.covariance_of(one, other)?;
            }
        }
        let count = vector.len();
        if count == 2 {
            covariance[(2, 2)] = covariance[(0, 0)].max(covariance[(1, 1)]);
        }
        let inverse = inverse_symmetric3(&covariance)?;
        let padded = nalgebra::Vector3::from_fn(|k, _| vector.get(k).copied().unwrap_or(0.0));
        let ratio = padded.dot(&(inverse * padded));
        (ratio.is_finite() && ratio >= 0.0).then(|| Length {
            length: padded.norm(),
            ratio,
            freedom: count as u32,
            typical: (0..count)
                .map(|k| covariance[(k, k)] / count as f64)
                .sum::<f64>()
                .max(0.0)
                .sqrt(),
        })
    }

    /// `M00 (1 ± D)`: the interval of D, with the error of M00 beside it.
    fn transmittance(&self, name: FigureName, value: f64) -> Option<Interval> {
        let sign = match name {
            FigureName::TransmittanceMax => 1.0,
            FigureName::TransmittanceMin => -1.0,
            _ => return None,
        };
        let measurement = &self.analysis.measurement;
        let length = self.length(FigureName::Diattenuation)?;
        if length.ratio >= FAR_FROM_ZERO.powi(2) {
            return None;
        }
        let (low, high) = length.two_sided()?;
        let m00 = measurement.mueller().m00();
        let mut gradient = [0.0; 16];
        gradient[0] = 1.0;
        let error = normal_95() * measurement.standard_error(&gradient)?;
        // Towards zero D is no normal error but a bound, so that the two add up.
        let below = m00 * (length.length - low);
        let towards = if low == 0.0 {
            below + error
        } else {
            below.hypot(error)
        };
        let away = (m00 * (high - length.length)).hypot(error);
        let (down, up) = if sign > 0.0 {
            (towards, away)
        } else {
            (away, towards)
        };
        both(value - down, value + up, Method::NoncentralChiSquared)
    }
}

/// A length with the squared ratio to its error.
struct Length {
    length: f64,
    ratio: f64,
    freedom: u32,
    /// The root mean square of the errors of its components.
    typical: f64,
}

impl Length {
    /// Far from zero `None`: there the draws say it.
    fn interval(&self) -> Option<Interval> {
        if self.ratio >= FAR_FROM_ZERO.powi(2) {
            return None;
        }
        let (low, high) = self.two_sided()?;
        if self.ratio <= chi_squared_95(self.freedom)? {
            return Some(Interval {
                low: None,
                high: Some(high),
                method: Method::UpperLimit,
            });
        }
        both(low, high, Method::NoncentralChiSquared)
    }

    /// `sqrt(v² − (k − 1) σ²)` for k components.
    fn debiased(&self) -> f64 {
        let excess = f64::from(self.freedom - 1) * self.typical * self.typical;
        (self.length * self.length - excess).max(0.0).sqrt()
    }

    fn two_sided(&self) -> Option<(f64, f64)> {
        let low = noncentrality_at(self.ratio, self.freedom, 0.975)?;
        let high = noncentrality_at(self.ratio, self.freedom, 0.025)?;
        Some((self.at(low), self.at(high)))
    }

    fn at(&self, noncentrality: f64) -> f64 {
        let unit = if self.ratio > 0.0 {
            self.length / self.ratio.sqrt()
        } else {
            self.typical
        };
        noncentrality.sqrt() * unit
    }
}

/// Of sorted numbers, between neighbours in proportion.
fn percentile(sorted: &[f64], share: f64) -> f64 {
    let place = share * (sorted.len().saturating_sub(1)) as f64;
    let below = place.floor() as usize;
    let low = sorted.get(below).copied().unwrap_or_default();
    let high = sorted.get(below + 1).copied().unwrap_or(low);
    low + (place - place.floor()) * (high - low)
}
