use nalgebra::{SMatrix, SVector};

use crate::error::Result;
use crate::linalg::eigen_of_symmetric16;
use crate::noise::Measurement;
use crate::stats::{chi_squared_tail, f_tail};

/// A symmetry that a sample may have.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Symmetry {
    /// `M = X Mᵀ X`, X = diag(1, 1, 1, -1): the same forwards and backwards, both read in
    /// one frame (R. C. Jones 1941 for Jones matrices; Z. Sekera 1966; from memory).
    ReciprocalSameFrame,
    /// `M = X Mᵀ X`, X = diag(1, 1, -1, 1): the frame of the returning beam is mirrored.
    ReciprocalMirrored,
    /// Neither circular diattenuation nor circular polarizance nor rotation:
    /// M03 = M30 = 0, M12 = M21.
    NoCircularPart,
    /// Two blocks of two: the axes of the frame are those of the sample.
    BlockDiagonal,
}

/// Whether a measurement has a symmetry.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SymmetryTest {
    /// Which one.
    pub symmetry: Symmetry,
    /// The largest violation, over M00; `None` where M00 is zero.
    pub deviation: Option<f64>,
    /// `vᵀ Σ_v⁻¹ v` of the violations; `None` without noise.
    pub chi_square: Option<f64>,
    /// How many violations have an error.
    pub degrees_of_freedom: u32,
    /// Of χ², or of F where σ is an estimate.
    pub p_value: Option<f64>,
}

type Vector16 = SVector<f64, 16>;
type Matrix16 = SMatrix<f64, 16, 16>;

impl Symmetry {
    /// All of them.
    pub const ALL: [Self; 4] = [
        Self::ReciprocalSameFrame,
        Self::ReciprocalMirrored,
        Self::NoCircularPart,
        Self::BlockDiagonal,
    ];

    /// Combinations of elements, row by row, that are zero.
    fn constraints(self) -> Vec<[f64; 16]> {
        let single = |i: usize, j: usize| {
            let mut row = [0.0; 16];
            row[4 * i + j] = 1.0;
            row
        };
        let pair = |i: usize, j: usize, sign: f64| {
            let mut row = single(i, j);
            row[4 * j + i] = -sign;
            row
        };
        let reciprocal = |signs: [f64; 4]| {
            let pairs = [(0, 1), (0, 2), (0, 3), (1, 2), (1, 3), (2, 3)];
            pairs.map(|(i, j)| pair(i, j, signs[i] * signs[j])).to_vec()
        };
        match self {
            Self::ReciprocalSameFrame => reciprocal([1.0, 1.0, 1.0, -1.0]),
            Self::ReciprocalMirrored => reciprocal([1.0, 1.0, -1.0, 1.0]),
            Self::NoCircularPart => vec![single(0, 3), single(3, 0), pair(1, 2, 1.0)],
            Self::BlockDiagonal => [0, 1]
                .into_iter()
                .flat_map(|i| [2, 3].map(|j| [single(i, j), single(j, i)]))
                .flatten()
                .collect(),
        }
    }
}

/// Tests every symmetry under the noise of the measurement.
///
/// # Errors
/// `no-convergence`.
pub fn symmetries(measurement: &Measurement) -> Result<Vec<SymmetryTest>> {
    Symmetry::ALL
        .into_iter()
        .map(|symmetry| test(symmetry, measurement))
        .collect()
}

fn test(symmetry: Symmetry, measurement: &Measurement) -> Result<SymmetryTest> {
    let elements = measurement.mueller().row_major();
    let dot = |row: &[f64; 16]| -> f64 { row.iter().zip(&elements).map(|(a, b)| a * b).sum() };
    let constraints = symmetry.constraints();
    let largest = constraints
        .iter()
        .map(|row| dot(row).abs())
        .fold(0.0, f64::max);
    let m00 = measurement.mueller().m00().abs();
    // Violations in their own standard errors; what is exact can't be tested.
    let uncertain: Vec<(&[f64; 16], f64)> = constraints
        .iter()
        .filter_map(|row| Some((row, measurement.standard_error(row)?)))
        .filter(|&(_, error)| error > 0.0)
        .collect();
    let mut correlation = Matrix16::identity();
    let mut violations = Vector16::zeros();
    for (i, (row, error)) in uncertain.iter().enumerate() {
        violations[i] = dot(row) / error;
        for (j, (other, other_error)) in uncertain.iter().enumerate().take(i) {
            let covariance = measurement.covariance_of(row, other).unwrap_or_default();
            correlation[(i, j)] = covariance / error / other_error;
            correlation[(j, i)] = correlation[(i, j)];
        }
    }
    let degrees_of_freedom = u32::try_from(uncertain.len()).unwrap_or_default();
    let chi_square = if uncertain.is_empty() {
        None
    } else {
        let (values, vectors) = eigen_of_symmetric16(&correlation)?;
        let turned = vectors.transpose() * violations;
        let sum: f64 = turned
            .iter()
            .zip(values.iter())
            .map(|(part, value)| part * part / value.max(f64::EPSILON))
            .sum();
        Some(sum.min(f64::MAX))
    };
    Ok(SymmetryTest {
        symmetry,
        deviation: Some(largest / m00).filter(|deviation| deviation.is_finite()),
        chi_square,
        degrees_of_freedom,
        p_value: chi_square.and_then(|value| match measurement.sigma_freedom() {
            Some(freedom) => {
                let numerator = f64::from(degrees_of_freedom);
                f_tail(value / numerator, numerator, freedom)
            }
            None => chi_squared_tail(value, degrees_of_freedom),
        }),
    })
}
