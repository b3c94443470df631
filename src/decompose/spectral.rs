use crate::coherency::jones_of;
use crate::linalg::HermitianEigen;
use crate::mueller::{Jones, Mueller};

/// One of the four pure elements of a mixture.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PureComponent {
    /// Its share of M00.
    pub weight: f64,
    /// Scaled to M00 = 1.
    pub jones: Jones,
    /// The same element, M00 = 1.
    pub mueller: Mueller,
}

/// `H = Σ λ_k h_k h_k†` read as a mixture of pure elements, weights descending
/// (Cloude 1986). `eigenvalues` are those of a realizable matrix, `eigen` gives the
/// vectors. `None` where the sum is zero.
#[must_use]
pub fn spectral(eigenvalues: &[f64; 4], eigen: &HermitianEigen) -> Option<[PureComponent; 4]> {
    let sum: f64 = eigenvalues.iter().sum();
    (sum > 0.0).then(|| {
        std::array::from_fn(|k| {
            let jones = jones_of(1.0, &eigen.vectors[k]);
            PureComponent {
                weight: eigenvalues[k] / sum,
                jones,
                mueller: jones.mueller(),
            }
        })
    })
}
