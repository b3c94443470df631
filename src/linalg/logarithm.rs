use nalgebra::{Matrix4, Schur};

use super::{MOST_ITERATIONS, no_convergence, not_finite};
use crate::error::{Error, Result};
use crate::tolerance;

/// Steps of one square root: convergence is quadratic, but an eigenvalue near the
/// negative axis first doubles its distance in each, which 1e-7 does in 24.
const MOST_STEPS: usize = 60;

/// Square roots until the matrix is near the identity; each halves the logarithm,
/// whose eigenvalues stay below 40 for what is not singular.
const MOST_ROOTS: u32 = 40;

/// Largest element of `X - I` at which the series takes over.
const NEAR_IDENTITY: f64 = 0.1;

/// Terms of the series: below 0.1^(2·20) nothing is left of 16 digits.
const SERIES_TERMS: u32 = 20;

/// The principal real logarithm of a 4×4 matrix: the one whose eigenvalues have
/// imaginary parts within (-π, π).
///
/// Inverse scaling and squaring: square roots by the product form of the Denman
/// and Beavers iteration, then `ln X = 2 artanh((X - I)(X + I)⁻¹)` (N. J. Higham,
/// *Functions of Matrices*, 2008, chapters 6 and 11).
///
/// # Errors
/// `singular`; `negative-eigenvalue` where an eigenvalue is real and negative, so
/// that no principal logarithm exists; `not-finite`; `no-convergence`.
pub fn principal_logarithm(matrix: &Matrix4<f64>) -> Result<Matrix4<f64>> {
    if matrix.iter().any(|value| !value.is_finite()) {
        return Err(not_finite());
    }
    let scale = matrix.amax();
    if scale == 0.0 {
        return Err(singular());
    }
    let scaled = matrix / scale;
    let inverse = scaled.try_inverse().ok_or_else(singular)?;
    let condition = scaled.norm() * inverse.norm();
    if condition.is_nan() || condition * tolerance::NOT_DETERMINED > 1.0 {
        return Err(singular());
    }
    if has_negative_eigenvalue(&scaled)? {
        return Err(Error::new(
            "negative-eigenvalue",
            "An eigenvalue is real and negative, so the matrix has no principal logarithm.",
        ));
    }
    let mut root = scaled;
    let mut factor = 2.0;
    for _ in 0..MOST_ROOTS {
        if (root - Matrix4::identity()).amax() <= NEAR_IDENTITY {
            let logarithm =
                inverse_hyperbolic_tangent(&root)? * factor + Matrix4::identity() * scale.ln();
            return if logarithm.iter().all(|value| value.is_finite()) {
                Ok(logarithm)
            } else {
                Err(no_convergence())
            };
        }
        root = square_root(&root)?;
        factor *= 2.0;
    }
    Err(no_convergence())
}

/// Rounding moves a double eigenvalue by the square root of the precision, so
/// what is this near the axis counts as on it.
fn has_negative_eigenvalue(matrix: &Matrix4<f64>) -> Result<bool> {
    // Entries this far below rounding only make the iteration divide 0 by 0.
    let flushed = matrix.map(|entry| if entry.abs() < 1e-40 { 0.0 } else { entry });
    let schur =
        Schur::try_new(flushed, f64::EPSILON, MOST_ITERATIONS).ok_or_else(no_convergence)?;
    let values = schur.complex_eigenvalues();
    if values.iter().any(|value| !value.is_finite()) {
        return Err(no_convergence());
    }
    Ok(values
        .iter()
        .any(|value| value.re <= 0.0 && value.im.abs() <= tolerance::NEGATIVE_AXIS * value.norm()))
}

/// The principal square root. `product` tends to the identity, `root` to the root;
/// the scaling by the determinant brings distant eigenvalues near first.
fn square_root(matrix: &Matrix4<f64>) -> Result<Matrix4<f64>> {
    let identity = Matrix4::identity();
    let (mut product, mut root) = (*matrix, *matrix);
    for _ in 0..MOST_STEPS {
        let distance = (product - identity).amax();
        if distance <= tolerance::ROOT_SETTLED {
            return Ok(root);
        }
        let inverse = product.try_inverse().ok_or_else(no_convergence)?;
        let determinant = product.determinant().abs();
        let scaling = if distance > NEAR_IDENTITY && determinant.is_normal() {
            determinant.powf(-0.125)
        } else {
            1.0
        };
        let squared = scaling * scaling;
        root = root * (identity + inverse / squared) * (0.5 * scaling);
        product = (identity + (product * squared + inverse / squared) * 0.5) * 0.5;
    }
    Err(no_convergence())
}

/// `artanh((X - I)(X + I)⁻¹)`, half of ln X, for X near the identity.
fn inverse_hyperbolic_tangent(near_identity: &Matrix4<f64>) -> Result<Matrix4<f64>> {
    let identity = Matrix4::identity();
    let denominator = (near_identity + identity)
        .try_inverse()
        .ok_or_else(no_convergence)?;
    let argument = (near_identity - identity) * denominator;
    let square = argument * argument;
    let (mut sum, mut power) = (Matrix4::zeros(), argument);
    for term in 0..SERIES_TERMS {
        sum += power / f64::from(2 * term + 1);
        power *= square;
    }
    Ok(sum)
}

fn singular() -> Error {
    Error::new(
        "singular",
        "The matrix is singular, so it has no logarithm.",
    )
}
