use std::ops::Mul;

use nalgebra::{Matrix2, Matrix4};
use num_complex::Complex64;

use super::Mueller;
use crate::error::{Error, Result};
use crate::state::JonesVector;
use crate::tolerance;

/// A Jones matrix, time dependence exp(+iωt). `a * b` is `b` followed by `a`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Jones(pub(crate) Matrix2<Complex64>);

impl Jones {
    /// From `[[xx, xy], [yx, yy]]`.
    ///
    /// # Errors
    /// `not-finite`, at `jones[k]`.
    pub fn from_rows(rows: [[Complex64; 2]; 2]) -> Result<Self> {
        for (k, value) in rows.as_flattened().iter().enumerate() {
            // Squares of the entries are Mueller elements.
            let limit = tolerance::LARGEST_NUMBER.sqrt();
            if !(value.re.abs() <= limit && value.im.abs() <= limit) {
                return Err(Error::new(
                    "not-finite",
                    "A Jones entry must be a finite number below 1e75.",
                )
                .at_field(format!("jones[{k}]")));
            }
        }
        Ok(Self(Matrix2::new(
            rows[0][0], rows[0][1], rows[1][0], rows[1][1],
        )))
    }

    /// The four entries, row by row.
    #[must_use]
    pub fn row_major(&self) -> [Complex64; 4] {
        [
            self.0[(0, 0)],
            self.0[(0, 1)],
            self.0[(1, 0)],
            self.0[(1, 1)],
        ]
    }

    /// A retarder of any kind: retardance in radians, and the unit vector of the
    /// fast eigenstate on the Poincaré sphere: `exp(i δ/2 a·(σ1, σ2, σ3))`.
    #[must_use]
    pub fn retarder(retardance: f64, axis: [f64; 3]) -> Self {
        let (s, c) = (retardance / 2.0).sin_cos();
        let i = Complex64::i();
        let [a1, a2, a3] = axis.map(|component| component * s);
        Self(Matrix2::new(
            c + i * a1,
            i * a2 + a3,
            i * a2 - a3,
            c - i * a1,
        ))
    }

    /// What the element makes of a fully polarized state.
    #[must_use]
    pub fn apply(&self, state: &JonesVector) -> JonesVector {
        JonesVector(self.0 * state.0)
    }

    /// Its Mueller matrix, `½ tr(σi J σj J†)`.
    #[must_use]
    pub fn mueller(&self) -> Mueller {
        Mueller::from_matrix(Matrix4::from_fn(|i, j| {
            let product = PAULI[i].matrix() * self.0 * PAULI[j].matrix() * self.0.adjoint();
            0.5 * product.trace().re
        }))
    }

    /// How its Mueller matrix changes with it, to first order.
    pub(crate) fn mueller_change(&self, change: &Self) -> Matrix4<f64> {
        Matrix4::from_fn(|i, j| {
            let product = PAULI[i].matrix() * change.0 * PAULI[j].matrix() * self.0.adjoint();
            product.trace().re
        })
    }

    /// The same element with the largest entry real and positive: the global
    /// phase means nothing.
    #[must_use]
    pub fn phase_fixed(&self) -> Self {
        let largest = self
            .row_major()
            .into_iter()
            .reduce(|a, b| {
                if b.norm() > a.norm() * (1.0 + tolerance::ZERO) {
                    b
                } else {
                    a
                }
            })
            .unwrap_or_default();
        if largest.norm() == 0.0 {
            return *self;
        }
        Self(self.0 * (largest.conj() / largest.norm()))
    }
}

impl Mul for Jones {
    type Output = Self;

    fn mul(self, first: Self) -> Self {
        Self(self.0 * first.0)
    }
}

/// A Pauli matrix in Stokes order: one entry in each row, in column `row ^ flip`.
pub(crate) struct Pauli {
    pub flip: usize,
    pub values: [Complex64; 2],
}

impl Pauli {
    pub(crate) fn matrix(&self) -> Matrix2<Complex64> {
        Matrix2::from_fn(|row, column| {
            if column == row ^ self.flip {
                self.values[row]
            } else {
                Complex64::ZERO
            }
        })
    }
}

const ONE: Complex64 = Complex64::new(1.0, 0.0);
const I: Complex64 = Complex64::new(0.0, 1.0);
const MINUS_ONE: Complex64 = Complex64::new(-1.0, 0.0);
const MINUS_I: Complex64 = Complex64::new(0.0, -1.0);

/// σ0 to σ3.
pub(crate) const PAULI: [Pauli; 4] = [
    Pauli {
        flip: 0,
        values: [ONE, ONE],
    },
    Pauli {
        flip: 0,
        values: [ONE, MINUS_ONE],
    },
    Pauli {
        flip: 1,
        values: [ONE, ONE],
    },
    Pauli {
        flip: 1,
        values: [MINUS_I, I],
    },
];
