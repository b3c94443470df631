use nalgebra::{Matrix4, Vector4};

use super::not_finite;
use crate::error::Result;

/// `U diag(s) Vᵀ` of a 4×4 matrix.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Svd4 {
    /// Descending, not negative.
    pub values: [f64; 4],
    /// Left singular vectors; zero for a value of zero.
    pub left: [Vector4<f64>; 4],
    /// Right singular vectors.
    pub right: [Vector4<f64>; 4],
}

/// Sweeps over the six pairs of columns; convergence is quadratic, six are many.
const MOST_SWEEPS: usize = 60;

/// The singular value decomposition of a 4×4 matrix, by one-sided Jacobi rotations
/// (Hestenes 1958), which keep small singular values exact (Demmel & Veselić 1992).
///
/// # Errors
/// `not-finite`.
pub fn svd4(matrix: &Matrix4<f64>) -> Result<Svd4> {
    if matrix.iter().any(|value| !value.is_finite()) {
        return Err(not_finite());
    }
    let scale = matrix.amax();
    let mut columns = if scale > 0.0 { matrix / scale } else { *matrix };
    let mut right = Matrix4::identity();
    for _ in 0..MOST_SWEEPS {
        let mut rotated = false;
        for p in 0..4 {
            for q in p + 1..4 {
                rotated |= orthogonalise(&mut columns, &mut right, p, q);
            }
        }
        if !rotated {
            break;
        }
    }
    let norms: [f64; 4] = std::array::from_fn(|k| columns.column(k).norm());
    let mut order = [0, 1, 2, 3];
    order.sort_by(|&a, &b| norms[b].total_cmp(&norms[a]));
    Ok(Svd4 {
        values: order.map(|k| norms[k] * scale),
        left: order.map(|k| {
            columns
                .column(k)
                .into_owned()
                .try_normalize(f64::MIN_POSITIVE)
                .unwrap_or_default()
        }),
        right: order.map(|k| right.column(k).into_owned()),
    })
}

impl Svd4 {
    /// The inverse; `None` where the smallest value is zero or so small beside the largest.
    #[must_use]
    pub fn inverse(&self, smallest: f64) -> Option<Matrix4<f64>> {
        let [largest, .., least] = self.values;
        if largest <= 0.0 || least <= smallest * largest {
            return None;
        }
        let mut inverse = Matrix4::zeros();
        for k in 0..4 {
            inverse += self.right[k] * self.left[k].transpose() / self.values[k];
        }
        inverse
            .iter()
            .all(|entry| entry.is_finite())
            .then_some(inverse)
    }
}

/// Rotates two columns until they are orthogonal; false where they were.
fn orthogonalise(columns: &mut Matrix4<f64>, right: &mut Matrix4<f64>, p: usize, q: usize) -> bool {
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
        for row in 0..4 {
            let (x, y) = (m[(row, p)], m[(row, q)]);
            m[(row, p)] = cosine * x - sine * y;
            m[(row, q)] = sine * x + cosine * y;
        }
    }
    true
}
