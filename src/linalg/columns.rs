use nalgebra::{DMatrix, DVector};

use super::not_finite;
use crate::error::Result;

/// `U diag(s) Vᵀ` of a matrix of any shape, thin.
#[derive(Debug, Clone, PartialEq)]
pub struct ColumnSvd {
    /// Descending, not negative; as many as the matrix has columns.
    pub values: Vec<f64>,
    /// Left singular vectors as columns; zero for a value of zero.
    pub left: DMatrix<f64>,
    /// Right singular vectors as columns.
    pub right: DMatrix<f64>,
}

/// Sweeps over the pairs of columns; convergence is quadratic, eight are many.
const MOST_SWEEPS: usize = 60;

/// The singular value decomposition by one-sided Jacobi rotations (Hestenes 1958): small
/// singular values keep their digits, which decides what a fit can tell apart.
///
/// # Errors
/// `not-finite`.
pub fn column_svd(matrix: &DMatrix<f64>) -> Result<ColumnSvd> {
    if matrix.iter().any(|value| !value.is_finite()) {
        return Err(not_finite());
    }
    let count = matrix.ncols();
    let scale = matrix.amax();
    let mut columns = if scale > 0.0 {
        matrix / scale
    } else {
        matrix.clone()
    };
    let mut right = DMatrix::<f64>::identity(count, count);
    for _ in 0..MOST_SWEEPS {
        let mut rotated = false;
        for p in 0..count {
            for q in p + 1..count {
                rotated |= orthogonalise(&mut columns, &mut right, p, q);
            }
        }
        if !rotated {
            break;
        }
    }
    let norms: Vec<f64> = (0..count).map(|k| columns.column(k).norm()).collect();
    let mut order: Vec<usize> = (0..count).collect();
    order.sort_by(|&a, &b| norms[b].total_cmp(&norms[a]));
    let rows = matrix.nrows();
    Ok(ColumnSvd {
        values: order.iter().map(|&k| norms[k] * scale).collect(),
        left: DMatrix::from_fn(rows, count, |row, column| {
            let norm = norms[order[column]];
            if norm > 0.0 {
                columns[(row, order[column])] / norm
            } else {
                0.0
            }
        }),
        right: DMatrix::from_fn(count, count, |row, column| right[(row, order[column])]),
    })
}

impl ColumnSvd {
    /// The step `-(AᵀA + damping I)⁻¹ Aᵀ r`.
    #[must_use]
    pub fn damped_step(&self, residuals: &DVector<f64>, damping: f64) -> DVector<f64> {
        let mut turned = self.left.transpose() * residuals;
        for (part, value) in turned.iter_mut().zip(&self.values) {
            let denominator = value * value + damping;
            *part = if denominator > 0.0 {
                -*part * value / denominator
            } else {
                0.0
            };
        }
        &self.right * turned
    }
}

fn orthogonalise(columns: &mut DMatrix<f64>, right: &mut DMatrix<f64>, p: usize, q: usize) -> bool {
    let (a, b) = (
        columns.column(p).norm_squared(),
        columns.column(q).norm_squared(),
    );
    let c = columns.column(p).dot(&columns.column(q));
    if c.abs() <= f64::EPSILON * (a * b).sqrt() || c.abs() < f64::MIN_POSITIVE {
        return false;
    }
    let zeta = (b - a) / (2.0 * c);
    let tangent = zeta.signum() / (zeta.abs() + zeta.hypot(1.0));
    let cosine = 1.0 / tangent.hypot(1.0);
    let sine = cosine * tangent;
    for m in [columns, right] {
        for row in 0..m.nrows() {
            let (x, y) = (m[(row, p)], m[(row, q)]);
            m[(row, p)] = cosine * x - sine * y;
            m[(row, q)] = sine * x + cosine * y;
        }
    }
    true
}
