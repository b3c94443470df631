use nalgebra::SMatrix;

use super::{Errors, in_range};
use crate::error::{Error, Result};
use crate::mueller::Mueller;
use crate::stats::Covariance;
use crate::tolerance;

/// From more repeats than this their whole covariance is estimated: fewer leave it too
/// uncertain beside one pooled σ.
const MOST_POOLED: usize = 40;

/// The errors of the mean of repeats, an estimate with its degrees of freedom.
pub(super) fn errors_of_mean(
    matrices: &[Mueller],
    mean: &Mueller,
    m00_is_exact: bool,
) -> Result<Errors> {
    let pooled = pooled(matrices, mean, m00_is_exact)?;
    if matrices.len() <= MOST_POOLED {
        return Ok(pooled);
    }
    // Where some combination does not scatter at all, the pooled σ is what is left.
    Ok(match sampled(matrices, mean, m00_is_exact) {
        Ok(covariance) => Errors::Sampled(covariance.into(), (matrices.len() - 1) as f64),
        Err(_) => pooled,
    })
}

/// The covariance of the mean.
fn sampled(matrices: &[Mueller], mean: &Mueller, m00_is_exact: bool) -> Result<Covariance> {
    let centre = mean.row_major();
    let count = matrices.len() as f64;
    let mut sum = SMatrix::<f64, 16, 16>::zeros();
    for one in matrices {
        let elements = one.row_major();
        let difference = SMatrix::<f64, 16, 1>::from_fn(|k, _| {
            if k == 0 && m00_is_exact {
                0.0
            } else {
                elements[k] - centre[k]
            }
        });
        sum += difference * difference.transpose();
    }
    sum /= (count - 1.0) * count;
    Covariance::new(&std::array::from_fn(|k| sum[(k / 16, k % 16)]))
}

/// The σ of the mean, pooled over the elements, with its degrees of freedom.
fn pooled(matrices: &[Mueller], mean: &Mueller, m00_is_exact: bool) -> Result<Errors> {
    let field = "noise.matrices";
    if matrices.len() < 2 {
        return Err(Error::new("too-few", "Repeats are at least two matrices.").at_field(field));
    }
    let first = usize::from(m00_is_exact);
    let centre = mean.row_major();
    let squares: f64 = matrices
        .iter()
        .flat_map(|one| {
            let elements = one.row_major();
            (first..16).map(move |k| (elements[k] - centre[k]).powi(2))
        })
        .sum();
    let count = matrices.len() as f64;
    let freedom = (16 - first) as f64 * (count - 1.0);
    let sigma = (squares / freedom / count).sqrt();
    // The mean of equal numbers may differ from them by its rounding.
    if sigma <= tolerance::ZERO * mean.largest() {
        return Err(Error::new(
            "bad-sigma",
            "The repeats are equal to the last digit, so their scatter says nothing of the noise.",
        )
        .at_field(field));
    }
    Ok(Errors::Pooled(in_range(sigma, field)?, freedom))
}
