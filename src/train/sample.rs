use nalgebra::{DMatrix, DVector, Matrix2};
use num_complex::Complex64;

use super::remove::{Sample, relative_distance};
use super::solver::{Problem, minimise};
use super::weights::Weights;
use crate::coherency::Coherency;
use crate::decompose::isotropic;
use crate::error::Result;
use crate::linalg::column_svd;
use crate::mueller::{Jones, Mueller};
use crate::noise::Measurement;
use crate::stats::chi_squared_tail;
use crate::tolerance;

/// Eight parts of a Jones matrix, one phase of which means nothing, and α.
const COUNT: usize = 9;

/// A realizable mixture has α in [0, 4/3].
const LARGEST_ALPHA: f64 = 4.0 / 3.0;

struct PureIsotropic {
    weights: Weights,
}

/// The pure sample with isotropic depolarization, in parallel,
/// `M = (1-α) M_J + α M_J00 diag(1, 0, 0, 0)`, that comes nearest under the noise of the
/// measurement, α within what is realizable. `None` where M00 is not positive.
///
/// # Errors
/// `no-convergence`.
pub(super) fn pure_isotropic(
    measurement: &Measurement,
    noise_is_stated: bool,
) -> Result<Option<Sample>> {
    let eigen = Coherency::from_mueller(measurement.mueller()).eigen()?;
    let Some(closed) = isotropic(measurement, &eigen) else {
        return Ok(None);
    };
    let Some(jones) = closed.jones else {
        return Ok(None);
    };
    let problem = PureIsotropic {
        weights: Weights::of(measurement)?,
    };
    let mut low = vec![-tolerance::LARGEST_NUMBER; COUNT];
    let mut high = vec![tolerance::LARGEST_NUMBER; COUNT];
    (low[8], high[8]) = (0.0, LARGEST_ALPHA);
    let size = jones
        .row_major()
        .iter()
        .map(|z| z.norm())
        .fold(0.0, f64::max);
    let mut reach = vec![size; COUNT];
    reach[8] = 1.0;
    let mut best = None;
    // The closed form is the best for equal errors; other weights may prefer another one.
    for alpha in [closed.alpha.clamp(0.0, LARGEST_ALPHA), 0.1, 0.7, 1.2] {
        let mut start: Vec<f64> = jones
            .row_major()
            .iter()
            .flat_map(|z| [z.re, z.im])
            .collect();
        start.push(alpha);
        if let Some(found) = minimise(&problem, &start, &low, &high, &reach, f64::INFINITY)?
            && best
                .as_ref()
                .is_none_or(|other: &super::solver::Minimum| found.squares < other.squares)
        {
            best = Some(found);
        }
    }
    let Some(best) = best else {
        return Ok(None);
    };
    let alpha = best.point[8];
    let gradient = best.jacobian.column(8).dot(&best.residuals);
    let at_bound = (alpha <= 0.0 && gradient >= 0.0) || (alpha >= LARGEST_ALPHA && gradient <= 0.0);
    let Some(compared) = problem.weights.compared(&problem.model(&best.point)) else {
        return Ok(None);
    };
    let Ok(mueller) = Mueller::from_row_major(&compared) else {
        return Ok(None);
    };
    // A bound takes one parameter away.
    let degrees_of_freedom = 8 + u32::from(at_bound);
    let chi_square = noise_is_stated.then_some(best.squares.min(f64::MAX));
    Ok(Some(Sample {
        model: "pureIsotropic",
        distance: relative_distance(&mueller, measurement.mueller()),
        mueller,
        p_value: chi_square.and_then(|value| chi_squared_tail(value, degrees_of_freedom)),
        chi_square,
        degrees_of_freedom: Some(degrees_of_freedom),
        alpha: Some(alpha),
        alpha_se: if noise_is_stated && !at_bound {
            alpha_error(&best.jacobian)?
        } else {
            None
        },
    }))
}

/// From the pseudo-inverse: the phase, and the size where M00 is exact, are left out.
fn alpha_error(jacobian: &DMatrix<f64>) -> Result<Option<f64>> {
    let factors = column_svd(jacobian)?;
    let largest = factors.values.first().copied().unwrap_or_default();
    let variance: f64 = factors
        .values
        .iter()
        .enumerate()
        .filter(|(_, value)| **value > tolerance::NOT_DETERMINED * largest)
        .map(|(k, value)| (factors.right[(8, k)] / value).powi(2))
        .sum();
    Ok(Some(variance.sqrt()).filter(|error| error.is_finite()))
}

impl PureIsotropic {
    fn jones(point: &[f64]) -> Jones {
        let entry = |k: usize| Complex64::new(point[2 * k], point[2 * k + 1]);
        Jones(Matrix2::new(entry(0), entry(1), entry(2), entry(3)))
    }

    fn model(&self, point: &[f64]) -> [f64; 16] {
        mixed(&Self::jones(point).mueller().row_major(), point[8])
    }
}

/// `(1-α) M + α M00 diag(1, 0, 0, 0)`.
fn mixed(pure: &[f64; 16], alpha: f64) -> [f64; 16] {
    std::array::from_fn(|k| {
        if k == 0 {
            pure[0]
        } else {
            (1.0 - alpha) * pure[k]
        }
    })
}

impl Problem for PureIsotropic {
    fn evaluate(&self, point: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let jones = Self::jones(point);
        let pure = jones.mueller().row_major();
        let mut changes: Vec<[f64; 16]> = (0..8)
            .map(|k| {
                let mut unit = [0.0; 8];
                unit[k] = 1.0;
                let change = jones.mueller_change(&Self::jones(&unit));
                mixed(&std::array::from_fn(|k| change[(k / 4, k % 4)]), point[8])
            })
            .collect();
        changes.push(std::array::from_fn(|k| if k == 0 { 0.0 } else { -pure[k] }));
        let model = mixed(&pure, point[8]);
        Some((
            self.weights.residuals(&model)?,
            self.weights.jacobian(&model, &changes)?,
        ))
    }

    fn residuals(&self, point: &[f64]) -> Option<DVector<f64>> {
        self.weights.residuals(&self.model(point))
    }
}
