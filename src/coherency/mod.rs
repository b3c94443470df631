//! The coherency matrix H of a Mueller matrix, and what it says of
//! realizability.

mod causes;
mod nearest;
mod realizability;
mod significance;
mod weighted;

pub use causes::{Candidate, Cause, likely_causes, mirror_is_visible};
pub(crate) use nearest::nearest_to;
pub use nearest::{Nearest, nearest};
pub use realizability::{
    Passivity, PassivityVerdict, Realizability, Verdict, is_realizable, passivity, realizability,
    stokes_margin,
};
pub(crate) use significance::eigenvalue_errors;
pub use significance::{
    SIMULATIONS, Significance, explaining_sigma, significance, weighted_significance,
};

pub use weighted::{WeightedNearest, weighted_nearest};

use nalgebra::Matrix4;
use num_complex::Complex64;

use crate::error::Result;
use crate::linalg::{HermitianEigen, hermitian_eigen};
use crate::mueller::{Jones, Mueller, PAULI};

/// `H = ¼ Σ_ij M_ij σi ⊗ σj*`, Hermitian, with trace M00 (Cloude 1986).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coherency(Matrix4<Complex64>);

impl Coherency {
    /// Of a Mueller matrix.
    #[must_use]
    pub fn from_mueller(mueller: &Mueller) -> Self {
        Self::from_elements(&mueller.row_major())
    }

    pub(crate) fn from_matrix(matrix: Matrix4<Complex64>) -> Self {
        Self(matrix)
    }

    pub(crate) fn from_elements(elements: &[f64; 16]) -> Self {
        let mut h = Matrix4::zeros();
        each_entry(|k, row, column, phase| h[(row, column)] += phase * (0.25 * elements[k]));
        Self(h)
    }

    /// Back: `M_ij = tr(H σi ⊗ σj*)`.
    #[must_use]
    pub fn mueller(&self) -> Mueller {
        let mut elements = [0.0; 16];
        each_entry(|k, row, column, phase| elements[k] += (self.0[(column, row)] * phase).re);
        Mueller::from_matrix(Matrix4::from_row_slice(&elements))
    }

    /// `Σ λ_k h_k h_k†`.
    pub(crate) fn from_spectrum(values: &[f64; 4], eigen: &HermitianEigen) -> Self {
        let mut h = Matrix4::zeros();
        for (value, vector) in values.iter().zip(&eigen.vectors) {
            h += vector * vector.adjoint() * Complex64::from(*value);
        }
        Self(h)
    }

    /// Eigenvalues, descending, and eigenvectors.
    ///
    /// # Errors
    /// As [`hermitian_eigen`].
    pub fn eigen(&self) -> Result<HermitianEigen> {
        hermitian_eigen(&self.0)
    }

    /// The entries, row by row.
    #[must_use]
    pub fn row_major(&self) -> [Complex64; 16] {
        std::array::from_fn(|k| self.0[(k / 4, k % 4)])
    }
}

/// The Jones matrix of an eigenpair of H: `sqrt(2λ)` times the eigenvector read as
/// two rows, the largest entry real and positive. `transmittance` is λ, not
/// negative.
pub(crate) fn jones_of(transmittance: f64, vector: &nalgebra::Vector4<Complex64>) -> Jones {
    let scaled = vector * Complex64::from((2.0 * transmittance.max(0.0)).sqrt());
    Jones(nalgebra::Matrix2::new(
        scaled[0], scaled[1], scaled[2], scaled[3],
    ))
    .phase_fixed()
}

/// The derivatives of `h† H h` with respect to the elements, row by row:
/// `¼ h†(σi ⊗ σj*) h`.
pub(crate) fn eigenvalue_gradient(vector: &nalgebra::Vector4<Complex64>) -> [f64; 16] {
    let mut gradient = [0.0; 16];
    each_entry(|k, row, column, phase| {
        gradient[k] += 0.25 * (vector[row].conj() * phase * vector[column]).re;
    });
    gradient
}

/// Calls `visit(k, row, column, phase)` for each entry other than zero of
/// `σi ⊗ σj*`, k = 4 i + j.
fn each_entry(mut visit: impl FnMut(usize, usize, usize, Complex64)) {
    for (i, left) in PAULI.iter().enumerate() {
        for (j, right) in PAULI.iter().enumerate() {
            for a in 0..2 {
                for c in 0..2 {
                    let phase = left.values[a] * right.values[c].conj();
                    let (row, column) = (2 * a + c, 2 * (a ^ left.flip) + (c ^ right.flip));
                    visit(4 * i + j, row, column, phase);
                }
            }
        }
    }
}
