use nalgebra::Matrix4;

use super::PureComponent;
use crate::mueller::Mueller;

/// One of the four parts of the characteristic decomposition.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MixedComponent {
    /// Its share of M00.
    pub weight: f64,
    /// Of this part alone, M00 = 1.
    pub mueller: Mueller,
}

/// `m = P1 m1 + (P2-P1) m2 + (P3-P2) m3 + (1-P3) diag(1, 0, 0, 0)` (Gil 2007), in
/// terms of the indices of polarimetric purity: m1 is the leading pure matrix of
/// the spectral decomposition, m2 and m3 are equal mixtures of the first two and
/// the first three.
///
/// A part whose weight is zero is not unique.
#[must_use]
pub fn characteristic(spectral: &[PureComponent; 4]) -> [MixedComponent; 4] {
    let weights = spectral.map(|component| component.weight);
    let mut sum = Matrix4::zeros();
    std::array::from_fn(|k| {
        sum += spectral[k].mueller.matrix();
        let count = k as f64 + 1.0;
        MixedComponent {
            weight: count * (weights[k] - weights.get(k + 1).unwrap_or(&0.0)),
            mueller: if k == 3 {
                // The four pure matrices add up to this; only rounding differs.
                Mueller::from_diagonal([1.0, 0.0, 0.0, 0.0])
            } else {
                Mueller::from_matrix(sum / count)
            },
        }
    })
}
