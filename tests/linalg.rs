//! The factorisations, against what defines them.

mod common;

use common::{any_matrix, close};
use halfshade::coherency::Coherency;
use halfshade::linalg::{hermitian_eigen, principal_logarithm, svd3};
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

/// Of a small matrix: `Σ Aᵏ / k!`.
fn exponential(exponent: &Matrix4<f64>) -> Matrix4<f64> {
    let (mut sum, mut term) = (Matrix4::identity(), Matrix4::identity());
    for k in 1..60 {
        term = term * exponent / f64::from(k);
        sum += term;
    }
    sum
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

    /// The exponential, by its power series, is inverse to the logarithm where every
    /// eigenvalue keeps its imaginary part within (-π, π): the norm bounds them.
    #[test]
    fn logarithm_inverts_the_exponential(entries in prop::array::uniform16(-0.75..0.75_f64)) {
        let exponent = Matrix4::from_row_slice(&entries);
        let found = principal_logarithm(&exponential(&exponent)).unwrap();
        close((found - exponent).amax(), 0.0, 1e-12);
    }

    /// A scale, also an extreme one, only adds to the trace.
    #[test]
    fn logarithm_of_a_multiple(entries in prop::array::uniform16(-0.5..0.5_f64), decade in -140..140_i32) {
        let matrix = exponential(&Matrix4::from_row_slice(&entries));
        let scale = 10_f64.powi(decade);
        let expected = principal_logarithm(&matrix).unwrap() + Matrix4::identity() * scale.ln();
        close((principal_logarithm(&(matrix * scale)).unwrap() - expected).amax(), 0.0, 1e-12);
    }

    /// No input hangs it or gives what is not a number.
    #[test]
    fn logarithm_is_finite_or_refused(entries in prop::array::uniform16(prop_oneof![
        Just(0.0), Just(1.0), Just(-1.0), Just(1e150), Just(1e-150), Just(5e-324), -1.0..1.0_f64,
    ])) {
        if let Ok(found) = principal_logarithm(&Matrix4::from_row_slice(&entries)) {
            prop_assert!(found.iter().all(|v| v.is_finite()));
        }
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
    assert_eq!(
        principal_logarithm(&Matrix4::repeat(f64::NAN))
            .unwrap_err()
            .code,
        "not-finite"
    );
}

/// N. J. Higham, *Functions of Matrices* (2008), theorem 1.31 (from memory): the
/// principal logarithm exists unless an eigenvalue lies on the closed negative axis.
#[test]
fn logarithm_says_why_it_does_not_exist() {
    let code = |diagonal: [f64; 4]| {
        principal_logarithm(&Matrix4::from_diagonal(&diagonal.into()))
            .unwrap_err()
            .code
    };
    assert_eq!(code([1.0, 1.0, -1.0, -1.0]), "negative-eigenvalue");
    assert_eq!(code([1.0, 0.5, 0.2, -1e-3]), "negative-eigenvalue");
    assert_eq!(code([1.0, 1.0, 1.0, 0.0]), "singular");
    assert_eq!(code([1.0, 1e-10, 1.0, 1.0]), "singular");
    assert_eq!(code([0.0; 4]), "singular");
}

proptest! {
    /// `U S Vᵀ` is the matrix, V is orthogonal, the inverse is one (definitions); also of
    /// nearly singular matrices.
    #[test]
    fn the_decomposition_of_a_square_matrix(entries in prop::array::uniform16(-1.0..1.0_f64), small in -14.0..0.0_f64) {
        let mut matrix = nalgebra::Matrix4::from_row_slice(&entries);
        let last = matrix.column(0) * 0.5 + matrix.column(3) * 10_f64.powf(small);
        matrix.set_column(3, &last);
        let found = halfshade::linalg::svd4(&matrix).unwrap();
        let mut sum = nalgebra::Matrix4::zeros();
        for k in 0..4 {
            sum += found.left[k] * found.right[k].transpose() * found.values[k];
            for j in 0..4 {
                let expected = f64::from(u8::from(j == k));
                prop_assert!((found.right[k].dot(&found.right[j]) - expected).abs() < 1e-14);
            }
        }
        prop_assert!((sum - matrix).amax() < 1e-14);
        prop_assert!(found.values.is_sorted_by(|a, b| a >= b));
        if let Some(inverse) = found.inverse(1e-12) {
            let condition = found.values[0] / found.values[3];
            prop_assert!((inverse * matrix - nalgebra::Matrix4::identity()).amax() < 1e-14 * condition + 1e-13);
        }
    }

    /// The damped step solves `(AᵀA + λ I) x = -Aᵀ r` (definition), for more rows than
    /// columns and fewer.
    #[test]
    fn the_damped_step(entries in prop::collection::vec(-1.0..1.0_f64, 40), residuals in prop::collection::vec(-1.0..1.0_f64, 8), wide in any::<bool>(), damping in 0.01..1.0_f64) {
        let (rows, columns) = if wide { (5, 8) } else { (8, 5) };
        let matrix = nalgebra::DMatrix::from_row_slice(rows, columns, &entries);
        let right = nalgebra::DVector::from_row_slice(&residuals[..rows]);
        let found = halfshade::linalg::column_svd(&matrix).unwrap();
        let step = found.damped_step(&right, damping);
        let normal = matrix.transpose() * &matrix + nalgebra::DMatrix::identity(columns, columns) * damping;
        prop_assert!((normal * step + matrix.transpose() * right).amax() < 1e-13);
    }
}
