//! The factorisations, against what defines them.

mod common;

use common::{any_matrix, close};
use halfshade::coherency::Coherency;
use halfshade::linalg::{hermitian_eigen, svd3};
use nalgebra::{Matrix3, Matrix4};
use num_complex::Complex64;
use proptest::prelude::*;

/// Entries that meet, vanish and span many decades.
fn entry() -> impl Strategy<Value = f64> {
    prop_oneof![
        -1.0..1.0_f64,
        Just(0.0),
        Just(0.5),
        Just(-0.5),
        Just(0.500_000_001),
        -1e-9..1e-9_f64
    ]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(4000))]

    #[test]
    fn svd_recomposes_with_orthogonal_factors(entries in prop::array::uniform9(entry())) {
        let m = Matrix3::from_row_slice(&entries);
        let svd = svd3(&m).unwrap();
        let [a, b, c] = svd.values;
        prop_assert!(a >= b && b >= c && c >= 0.0);
        let product = svd.left * Matrix3::from_diagonal(&svd.values.into()) * svd.right_transposed;
        close((product - m).amax(), 0.0, 1e-14);
        close((svd.left.transpose() * svd.left - Matrix3::identity()).amax(), 0.0, 1e-14);
        close((svd.right_transposed * svd.right_transposed.transpose() - Matrix3::identity()).amax(), 0.0, 1e-14);
    }

    #[test]
    fn hermitian_eigenvectors_recompose(m in any_matrix(), near in any::<bool>()) {
        // Near a depolarizer the eigenvalues almost meet.
        let elements = m.row_major().map(|v| if near { v * 1e-9 } else { v });
        let mut elements = elements;
        elements[0] += 1.0;
        let m = halfshade::mueller::Mueller::from_row_major(&elements).unwrap();
        let h = Matrix4::from_row_slice(&Coherency::from_mueller(&m).row_major());
        let eigen = Coherency::from_mueller(&m).eigen().unwrap();
        let mut sum = Matrix4::zeros();
        for (value, vector) in eigen.values.iter().zip(&eigen.vectors) {
            sum += vector * vector.adjoint() * Complex64::from(*value);
        }
        prop_assert!(eigen.values.is_sorted_by(|a, b| a >= b));
        close((sum - h).map(|z| z.norm()).amax(), 0.0, 1e-14);
    }
}

#[test]
fn values_that_are_not_finite_are_refused() {
    let infinite = Matrix4::repeat(Complex64::new(0.0, f64::INFINITY));
    assert_eq!(hermitian_eigen(&infinite).unwrap_err().code, "not-finite");
    assert_eq!(
        svd3(&Matrix3::repeat(f64::NAN)).unwrap_err().code,
        "not-finite"
    );
}
