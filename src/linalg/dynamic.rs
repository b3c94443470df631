use nalgebra::{DMatrix, SVD};

use super::{MOST_ITERATIONS, no_convergence, not_finite};
use crate::error::Result;

/// Singular values, descending, and the right singular vectors in the same order.
#[derive(Debug, Clone, PartialEq)]
pub struct RightSingular {
    /// As many as there are columns; zero beyond the number of rows.
    pub values: Vec<f64>,
    /// Orthonormal, as columns.
    pub vectors: DMatrix<f64>,
}

/// The singular values of a matrix of any shape, and the right singular vectors, those of
/// the null space among them.
///
/// # Errors
/// `not-finite`, `no-convergence`.
pub fn right_singular(matrix: &DMatrix<f64>) -> Result<RightSingular> {
    if matrix.iter().any(|value| !value.is_finite()) {
        return Err(not_finite());
    }
    let columns = matrix.ncols();
    // Rows of zeros: a thin decomposition would leave the null space out.
    let rows = matrix.nrows().max(columns);
    let padded = matrix.clone().resize(rows, columns, 0.0);
    let found = SVD::try_new(padded, false, true, f64::EPSILON, MOST_ITERATIONS)
        .ok_or_else(no_convergence)?;
    let right = found.v_t.ok_or_else(no_convergence)?;
    let mut order: Vec<usize> = (0..columns).collect();
    order.sort_by(|&a, &b| found.singular_values[b].total_cmp(&found.singular_values[a]));
    Ok(RightSingular {
        values: order.iter().map(|&k| found.singular_values[k]).collect(),
        vectors: DMatrix::from_fn(columns, columns, |row, column| right[(order[column], row)]),
    })
}
