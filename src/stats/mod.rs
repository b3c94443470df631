//! Distributions, seeded draws and rounding to the uncertainty.

mod covariance;
mod draws;
mod noncentral;
mod rounding;

pub use covariance::Covariance;
pub use draws::NormalDraws;
pub use noncentral::{chi_squared_95, noncentral_chi_squared, noncentrality_at};
pub use rounding::{RoundedValue, printed_decimals, rounded, rounding_sigma};

use statrs::distribution::{ChiSquared, ContinuousCDF, FisherSnedecor, StudentsT};

/// The probability that chi-squared with `degrees_of_freedom` exceeds `value`.
///
/// `None` unless there are degrees of freedom.
#[must_use]
pub fn chi_squared_tail(value: f64, degrees_of_freedom: u32) -> Option<f64> {
    let distribution = ChiSquared::new(f64::from(degrees_of_freedom)).ok()?;
    Some(distribution.sf(value.max(0.0)).clamp(0.0, 1.0))
}

/// Half of the central 95 % of a normal distribution, in standard deviations.
#[must_use]
pub fn normal_95() -> f64 {
    1.959_963_984_540_054
}

/// The same of Student's t with these degrees of freedom; `None` without any.
#[must_use]
pub fn student_95(freedom: f64) -> Option<f64> {
    let distribution = StudentsT::new(0.0, 1.0, freedom).ok()?;
    Some(distribution.inverse_cdf(0.975)).filter(|value| value.is_finite())
}

/// The probability that F with these degrees of freedom exceeds `value`.
///
/// `None` unless there are degrees of freedom.
#[must_use]
pub fn f_tail(value: f64, numerator: f64, denominator: f64) -> Option<f64> {
    let distribution = FisherSnedecor::new(numerator, denominator).ok()?;
    Some(distribution.sf(value.max(0.0)).clamp(0.0, 1.0))
}

/// Half of the width of a 95 % interval in standard errors: Student's t with these degrees
/// of freedom, the normal one for `None`.
#[must_use]
pub fn student_quantile(freedom: Option<f64>) -> f64 {
    const NORMAL: f64 = 1.959_963_984_540_054;
    freedom
        .and_then(|freedom| StudentsT::new(0.0, 1.0, freedom).ok())
        .map_or(NORMAL, |distribution| distribution.inverse_cdf(0.975))
}
