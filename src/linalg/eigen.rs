use nalgebra::{Matrix4, SymmetricEigen, Vector4};
use num_complex::Complex64;

use super::{MOST_ITERATIONS, no_convergence, not_finite};
use crate::error::Result;

/// Eigenvalues, descending, and the unit eigenvectors in the same order.
#[derive(Debug, Clone, PartialEq)]
pub struct HermitianEigen {
    /// Descending.
    pub values: [f64; 4],
    /// Orthonormal.
    pub vectors: [Vector4<Complex64>; 4],
}

/// The eigenvalues and eigenvectors of a Hermitian matrix.
///
/// # Errors
/// `not-finite`, `no-convergence`.
pub fn hermitian_eigen(matrix: &Matrix4<Complex64>) -> Result<HermitianEigen> {
    let scale = largest(matrix)?;
    if scale == 0.0 {
        return Ok(HermitianEigen {
            values: [0.0; 4],
            vectors: std::array::from_fn(|k| {
                Vector4::from_fn(|row, _| Complex64::new(f64::from(u8::from(row == k)), 0.0))
            }),
        });
    }
    // Entries this far below rounding only make the iteration divide 0 by 0.
    let flushed = |part: f64| if part.abs() < 1e-40 { 0.0 } else { part };
    let scaled =
        matrix.map(|entry| Complex64::new(flushed(entry.re / scale), flushed(entry.im / scale)));
    let eigen = SymmetricEigen::try_new(scaled, f64::EPSILON, MOST_ITERATIONS)
        .filter(|eigen| eigen.eigenvectors.iter().all(|entry| entry.is_finite()))
        .ok_or_else(no_convergence)?;
    let mut order = [0, 1, 2, 3];
    order.sort_by(|&a, &b| eigen.eigenvalues[b].total_cmp(&eigen.eigenvalues[a]));
    Ok(HermitianEigen {
        values: order.map(|k| eigen.eigenvalues[k] * scale),
        vectors: order.map(|k| eigen.eigenvectors.column(k).into_owned()),
    })
}

fn largest(matrix: &Matrix4<Complex64>) -> Result<f64> {
    let mut largest = 0.0_f64;
    for value in matrix {
        if !(value.re.is_finite() && value.im.is_finite()) {
            return Err(not_finite());
        }
        largest = largest.max(value.re.abs()).max(value.im.abs());
    }
    Ok(largest)
}
