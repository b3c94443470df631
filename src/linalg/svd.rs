use nalgebra::{Matrix3, Vector3};

use super::not_finite;
use crate::error::Result;

/// `U diag(s) Vᵀ` of a 3×3 matrix.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Svd3 {
    /// Left singular vectors, as columns.
    pub left: Matrix3<f64>,
    /// Descending, not negative.
    pub values: [f64; 3],
    /// Right singular vectors, as rows.
    pub right_transposed: Matrix3<f64>,
}

/// Sweeps over the three pairs of columns; convergence is quadratic, five are many.
const MOST_SWEEPS: usize = 40;

/// The singular value decomposition of a 3×3 matrix, by one-sided Jacobi rotations
/// (Hestenes 1958; Demmel & Veselić 1992 for their accuracy).
///
/// Our own because of accuracy: nalgebra 0.34 goes through `MᵀM` for 3×3 matrices,
/// and its general iteration leaves errors of 1e-8 in the vectors where two
/// singular values are near each other.
///
/// # Errors
/// `not-finite`.
pub fn svd3(matrix: &Matrix3<f64>) -> Result<Svd3> {
    if matrix.iter().any(|value| !value.is_finite()) {
        return Err(not_finite());
    }
    let scale = matrix.amax();
    if scale == 0.0 {
        return Ok(Svd3 {
            left: Matrix3::identity(),
            values: [0.0; 3],
            right_transposed: Matrix3::identity(),
        });
    }
    let mut columns = matrix / scale;
    let mut right = Matrix3::identity();
    for _ in 0..MOST_SWEEPS {
        let mut rotated = false;
        for (p, q) in [(0, 1), (0, 2), (1, 2)] {
            rotated |= orthogonalise(&mut columns, &mut right, p, q);
        }
        if !rotated {
            break;
        }
    }
    let norms = [0, 1, 2].map(|k| columns.column(k).norm());
    let mut order = [0, 1, 2];
    order.sort_by(|&a, &b| norms[b].total_cmp(&norms[a]));
    let values = order.map(|k| norms[k] * scale);
    Ok(Svd3 {
        left: completed(order.map(|k| columns.column(k).into_owned())),
        values,
        right_transposed: Matrix3::from_fn(|row, column| right[(column, order[row])]),
    })
}

/// Rotates two columns until they are orthogonal; false where they were.
fn orthogonalise(columns: &mut Matrix3<f64>, right: &mut Matrix3<f64>, p: usize, q: usize) -> bool {
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
        for row in 0..3 {
            let (x, y) = (m[(row, p)], m[(row, q)]);
            m[(row, p)] = cosine * x - sine * y;
            m[(row, q)] = sine * x + cosine * y;
        }
    }
    true
}

/// Unit vectors from orthogonal columns of descending length; where one has no
/// length, any that completes the frame.
fn completed(columns: [Vector3<f64>; 3]) -> Matrix3<f64> {
    let unit = |vector: Vector3<f64>| vector.try_normalize(f64::MIN_POSITIVE);
    let first = unit(columns[0]).unwrap_or_else(Vector3::x);
    let second = unit(columns[1]).unwrap_or_else(|| {
        let helper = Vector3::ith(first.iamin(), 1.0);
        first.cross(&helper).normalize()
    });
    // Rounding leaves a column of length 1e-17 with no direction of its own.
    let third = first.cross(&second);
    let side = unit(columns[2]).map_or(
        1.0,
        |column| if column.dot(&third) < 0.0 { -1.0 } else { 1.0 },
    );
    Matrix3::from_columns(&[first, second, third * side])
}
