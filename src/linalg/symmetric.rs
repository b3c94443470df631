use nalgebra::{Cholesky, Matrix3, Matrix4, SMatrix, SVector, SymmetricEigen};
use num_complex::Complex64;

use super::{MOST_ITERATIONS, no_convergence};
use crate::error::Result;

type Matrix16 = SMatrix<f64, 16, 16>;

/// Eigenvalues, unsorted, and the orthonormal eigenvectors as columns, of a symmetric
/// matrix with finite entries of order one.
///
/// # Errors
/// `no-convergence`.
pub fn eigen_of_symmetric16(matrix: &Matrix16) -> Result<(SVector<f64, 16>, Matrix16)> {
    let eigen = SymmetricEigen::try_new(*matrix, f64::EPSILON, MOST_ITERATIONS)
        .filter(|eigen| eigen.eigenvectors.iter().all(|entry| entry.is_finite()))
        .ok_or_else(no_convergence)?;
    Ok((eigen.eigenvalues, eigen.eigenvectors))
}

/// The solution of `A x = b` for a symmetric positive definite A; `None` where it is not.
#[must_use]
pub fn solve_positive16(matrix: &Matrix16, right: &SVector<f64, 16>) -> Option<SVector<f64, 16>> {
    let solution = Cholesky::new(*matrix)?.solve(right);
    solution
        .iter()
        .all(|value| value.is_finite())
        .then_some(solution)
}

/// The inverse of a Hermitian positive definite matrix; `None` where it is not.
#[must_use]
pub fn inverse_positive4(matrix: &Matrix4<Complex64>) -> Option<Matrix4<Complex64>> {
    let inverse = Cholesky::new(*matrix)?.inverse();
    // Rounding leaves imaginary parts on the diagonal, which no later step forgives.
    let inverse = (inverse + inverse.adjoint()) * Complex64::from(0.5);
    inverse
        .iter()
        .all(|entry| entry.is_finite())
        .then_some(inverse)
}

/// Whether a Hermitian matrix is positive definite.
#[must_use]
pub fn is_positive4(matrix: &Matrix4<Complex64>) -> bool {
    (0..4).all(|k| matrix[(k, k)].re > 0.0)
        && Cholesky::new(*matrix).is_some_and(|factor| {
            (0..4).all(|k| factor.l_dirty()[(k, k)].re > 0.0 && factor.l_dirty()[(k, k)].im == 0.0)
        })
}

/// The inverse of a symmetric positive definite 3×3 matrix; `None` where it is not.
#[must_use]
pub fn inverse_symmetric3(matrix: &Matrix3<f64>) -> Option<Matrix3<f64>> {
    let inverse = Cholesky::new(*matrix)?.inverse();
    inverse
        .iter()
        .all(|entry| entry.is_finite())
        .then_some(inverse)
}
