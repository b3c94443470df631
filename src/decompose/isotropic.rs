use crate::coherency::{Coherency, jones_of};
use crate::linalg::HermitianEigen;
use crate::mueller::{Jones, Mueller};
use crate::noise::Measurement;
use crate::tolerance;

/// A pure element with isotropic depolarization, in parallel:
/// `M = (1-α) M_J + α M_J00 diag(1, 0, 0, 0)`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Isotropic {
    /// Not limited to [0, 4/3]: outside, the matrix is not realizable.
    pub alpha: f64,
    /// Of M_J, with M00 in it; `None` where α = 1 leaves no direction.
    pub jones: Option<Jones>,
    /// The fitted matrix.
    pub mueller: Mueller,
    /// Squared residual over σ²; `None` without equal errors, for which alone the closed
    /// form is the best fit.
    pub chi_square: Option<f64>,
    /// 16 − 8, or 15 − 7 where M00 is exact.
    pub degrees_of_freedom: u32,
    /// Of χ², or of F where σ is an estimate.
    pub p_value: Option<f64>,
}

/// The least-squares fit for equal errors, in closed form.
///
/// H of the model has one eigenvalue `a + b` and three `b`. With the pure part
/// along the eigenvector k, b is the mean of the others; the residual is least for
/// the eigenvalue farthest from t/4: the largest, or, past the ideal depolarizer,
/// the smallest (then α > 1). `None` unless M00 is positive.
#[must_use]
pub fn isotropic(measurement: &Measurement, eigen: &HermitianEigen) -> Option<Isotropic> {
    let trace = measurement.mueller().m00();
    measurement.mueller().normalised().filter(|_| trace > 0.0)?;
    let values = &eigen.values;
    let pure = if values[0] - trace / 4.0 >= trace / 4.0 - values[3] {
        0
    } else {
        3
    };
    let rest = (0..4)
        .filter(|&k| k != pure)
        .map(|k| values[k])
        .sum::<f64>()
        / 3.0;
    let amplitude = values[pure] - rest;
    let spectrum = std::array::from_fn(|k| if k == pure { rest + amplitude } else { rest });
    let mueller = Coherency::from_spectrum(&spectrum, eigen).mueller();
    let degrees_of_freedom = 8;
    let chi_square = measurement.equal_sigma().map(|sigma| {
        let residual: f64 = values
            .iter()
            .zip(&spectrum)
            .map(|(a, b)| ((a - b) / sigma).powi(2))
            .sum();
        (4.0 * residual).min(f64::MAX)
    });
    Some(Isotropic {
        alpha: 4.0 * rest / trace,
        jones: (amplitude.abs() > tolerance::NOT_DETERMINED * trace)
            .then(|| jones_of(trace, &eigen.vectors[pure])),
        mueller,
        chi_square,
        degrees_of_freedom,
        p_value: chi_square.and_then(|value| measurement.tail(value, degrees_of_freedom)),
    })
}
