use std::ops::Mul;

use nalgebra::{Matrix3, Matrix4, Vector3};

use crate::error::{Error, Result};
use crate::state::Stokes;
use crate::tolerance;

/// A Mueller matrix, physical or not, in the canonical convention.
///
/// Every element is finite. `a * b` is the element `b` followed by `a`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Mueller(Matrix4<f64>);

impl Mueller {
    /// From sixteen numbers, row by row.
    ///
    /// # Errors
    /// `not-finite` or `too-large`, at `mueller[k]`.
    pub fn from_row_major(elements: &[f64; 16]) -> Result<Self> {
        for (k, value) in elements.iter().enumerate() {
            let problem = if !value.is_finite() {
                Error::new("not-finite", "An element is not a finite number.")
            } else if value.abs() > tolerance::LARGEST_NUMBER {
                Error::new(
                    "too-large",
                    format!("An element is {value:e}; no more than 1e150 is taken."),
                )
            } else {
                continue;
            };
            return Err(problem.at_field(format!("mueller[{k}]")));
        }
        Ok(Self(Matrix4::from_row_slice(elements)))
    }

    /// From four rows.
    ///
    /// # Errors
    /// As [`Mueller::from_row_major`].
    pub fn from_rows(rows: [[f64; 4]; 4]) -> Result<Self> {
        Self::from_row_major(&std::array::from_fn(|k| rows[k / 4][k % 4]))
    }

    /// `diag(a, b, c, d)`, for entries known to be finite.
    pub(crate) fn from_diagonal(diagonal: [f64; 4]) -> Self {
        Self(Matrix4::from_diagonal(&diagonal.into()))
    }

    /// For matrices that the engine made from finite numbers.
    pub(crate) fn from_matrix(matrix: Matrix4<f64>) -> Self {
        Self(matrix)
    }

    /// `m00 · [[1, dᵀ], [p, block]]` with m00 = 1.
    pub(crate) fn from_parts(
        diattenuation: &Vector3<f64>,
        polarizance: &Vector3<f64>,
        block: &Matrix3<f64>,
    ) -> Self {
        let mut matrix = Matrix4::identity();
        matrix
            .fixed_view_mut::<1, 3>(0, 1)
            .copy_from(&diattenuation.transpose());
        matrix.fixed_view_mut::<3, 1>(1, 0).copy_from(polarizance);
        matrix.fixed_view_mut::<3, 3>(1, 1).copy_from(block);
        Self(matrix)
    }

    pub(crate) fn matrix(&self) -> &Matrix4<f64> {
        &self.0
    }

    pub(crate) fn block(&self) -> Matrix3<f64> {
        self.0.fixed_view::<3, 3>(1, 1).into_owned()
    }

    /// The identity: air.
    #[must_use]
    pub fn identity() -> Self {
        Self(Matrix4::identity())
    }

    /// Sixteen numbers, row by row.
    #[must_use]
    pub fn row_major(&self) -> [f64; 16] {
        std::array::from_fn(|k| self.0[(k / 4, k % 4)])
    }

    /// One element; `None` outside 0 to 3.
    #[must_use]
    pub fn get(&self, row: usize, column: usize) -> Option<f64> {
        self.0.get((row, column)).copied()
    }

    /// M00: the transmittance for unpolarized light.
    #[must_use]
    pub fn m00(&self) -> f64 {
        self.0[(0, 0)]
    }

    /// The largest absolute value.
    #[must_use]
    pub fn largest(&self) -> f64 {
        self.0.amax()
    }

    /// Divided by M00; `None` where M00 is zero or so small beside the other
    /// elements that the quotient means nothing.
    #[must_use]
    pub fn normalised(&self) -> Option<Self> {
        let m00 = self.m00();
        (m00.abs() > tolerance::ZERO * self.largest()).then(|| Self(self.0 / m00))
    }

    /// The transpose: the element seen backwards, but for the frame.
    #[must_use]
    pub fn transpose(&self) -> Self {
        Self(self.0.transpose())
    }

    /// The element turned counter-clockwise by `angle` (radians):
    /// `R(-θ) M R(θ)`.
    #[must_use]
    pub fn turned(&self, angle: f64) -> Self {
        let rotation = frame_rotation(angle);
        Self(rotation.transpose() * self.0 * rotation)
    }

    /// What the element makes of a state.
    #[must_use]
    pub fn apply(&self, state: &Stokes) -> Stokes {
        Stokes::from_vector(self.0 * state.vector())
    }

    /// The Frobenius distance to another matrix.
    #[must_use]
    pub fn distance(&self, other: &Self) -> f64 {
        let scale = self.largest().max(other.largest());
        if scale == 0.0 {
            return 0.0;
        }
        // Scaled first: squares of tiny elements would vanish.
        ((self.0 - other.0) / scale).norm() * scale
    }
}

impl Mul for Mueller {
    type Output = Self;

    fn mul(self, first: Self) -> Self {
        Self(self.0 * first.0)
    }
}

/// `R(θ)`: Stokes components in a frame turned counter-clockwise by θ.
pub(crate) fn frame_rotation(angle: f64) -> Matrix4<f64> {
    let (s, c) = (2.0 * angle).sin_cos();
    Matrix4::new(
        1.0, 0.0, 0.0, 0.0, //
        0.0, c, s, 0.0, //
        0.0, -s, c, 0.0, //
        0.0, 0.0, 0.0, 1.0,
    )
}
