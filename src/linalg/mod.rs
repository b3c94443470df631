//! Guarded, bounded and sorted factorisations of small matrices.
//!
//! Only this folder calls nalgebra's iterations: they do not end on a NaN, come
//! unsorted, and report failure as `None`.

mod columns;
mod dynamic;
mod eigen;
mod inverse;
mod logarithm;
mod svd;
mod symmetric;

pub use columns::{ColumnSvd, column_svd};
pub use dynamic::{RightSingular, right_singular};
pub use eigen::{HermitianEigen, hermitian_eigen};
pub use inverse::{Svd4, svd4};
pub use logarithm::principal_logarithm;
pub use svd::{Svd3, svd3};
pub use symmetric::{
    eigen_of_symmetric16, inverse_positive4, inverse_symmetric3, is_positive4, solve_positive16,
};

use crate::error::Error;

/// Sweeps that an iteration may take. Four by four matrices need about ten.
const MOST_ITERATIONS: usize = 500;

fn not_finite() -> Error {
    Error::new(
        "not-finite",
        "The matrix holds a value that is not a finite number.",
    )
}

fn no_convergence() -> Error {
    Error::new(
        "no-convergence",
        "The iteration did not settle; the matrix is out of range.",
    )
}
