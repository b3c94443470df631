//! The canonical convention, and the conversions at the boundary.
//!
//! Inside the engine: right-handed axes x, y, z with z along propagation; the
//! observer faces the source; angles count counter-clockwise from x; time
//! dependence exp(+iωt); `S3 = 2 Im(Ex* Ey)`, so that S3 > 0 turns clockwise for
//! the observer. Four independent switches describe a foreign convention; each is
//! a diagonal matrix K of signs with `M → K M K` and `S → K S`, and each is its
//! own inverse.

use std::f64::consts::{FRAC_PI_2, PI};

use nalgebra::Vector4;
use num_complex::Complex64;

use crate::mueller::{Jones, Mueller};
use crate::state::{Stokes, half_turn};

/// Which way angles count, for an observer who faces the source.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum AngleSense {
    /// The canonical one.
    #[default]
    Counterclockwise,
    /// S2 changes sign.
    Clockwise,
}

/// How the field of a state with S3 > 0 turns, for an observer who faces the
/// source.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum PositiveS3 {
    /// The canonical one.
    #[default]
    Clockwise,
    /// S3 changes sign.
    Counterclockwise,
}

/// From where angles count.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum ZeroAngle {
    /// The canonical one.
    #[default]
    X,
    /// S1 and S2 change sign.
    Y,
}

/// The sign of iωt in the time dependence.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum TimeSign {
    /// exp(+iωt), the canonical one.
    #[default]
    Plus,
    /// exp(−iωt): Jones matrices are conjugate.
    Minus,
}

/// A person's convention, by its four physical facts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Convention {
    /// Which way angles count.
    pub angles: AngleSense,
    /// What S3 > 0 means.
    pub positive_s3: PositiveS3,
    /// Where angles begin.
    pub zero_angle: ZeroAngle,
    /// The sign in the time dependence.
    pub time: TimeSign,
}

impl Convention {
    /// The sixteen of them.
    pub fn all() -> impl Iterator<Item = Self> {
        (0..16_u8).map(|bits| Self {
            angles: [AngleSense::Counterclockwise, AngleSense::Clockwise][usize::from(bits & 1)],
            positive_s3: [PositiveS3::Clockwise, PositiveS3::Counterclockwise]
                [usize::from(bits >> 1 & 1)],
            zero_angle: [ZeroAngle::X, ZeroAngle::Y][usize::from(bits >> 2 & 1)],
            time: [TimeSign::Plus, TimeSign::Minus][usize::from(bits >> 3 & 1)],
        })
    }

    /// A matrix from the canonical convention to this one, or back.
    #[must_use]
    pub fn mueller(&self, mueller: &Mueller) -> Mueller {
        let k = self.signs();
        let mut matrix = *mueller.matrix();
        for row in 0..4 {
            for column in 0..4 {
                // Not a product of both: `-0.0` must not appear from nowhere twice.
                if k[row] != k[column] {
                    matrix[(row, column)] = -matrix[(row, column)];
                }
            }
        }
        Mueller::from_matrix(matrix)
    }

    /// The sign that each element of a matrix takes, row by row.
    #[must_use]
    pub fn element_signs(&self) -> [f64; 16] {
        let k = self.signs();
        std::array::from_fn(|at| k[at / 4] * k[at % 4])
    }

    /// A state from the canonical convention to this one, or back.
    #[must_use]
    pub fn stokes(&self, stokes: &Stokes) -> Stokes {
        Stokes::from_vector(stokes.vector().component_mul(&self.signs()))
    }

    /// A direction on the Poincaré sphere, as [`Convention::stokes`].
    #[must_use]
    pub fn axis(&self, axis: &[f64; 3]) -> [f64; 3] {
        let k = self.signs();
        std::array::from_fn(|i| axis[i] * k[i + 1])
    }

    /// A Jones matrix from the canonical convention to this one, or back.
    #[must_use]
    pub fn jones(&self, jones: &Jones) -> Jones {
        let [mut xx, mut xy, mut yx, mut yy] = jones.row_major();
        if self.angles == AngleSense::Clockwise {
            (xy, yx) = (-xy, -yx);
        }
        if self.zero_angle == ZeroAngle::Y {
            // A frame turned by a quarter, (Ey, -Ex): a bare exchange would be a mirror.
            (xx, xy, yx, yy) = (yy, -yx, -xy, xx);
        }
        let mut entries = [xx, xy, yx, yy];
        if self.time == TimeSign::Minus {
            entries = entries.map(|entry: Complex64| entry.conj());
        }
        let [xx, xy, yx, yy] = entries;
        Jones(nalgebra::Matrix2::new(xx, xy, yx, yy))
    }

    /// The azimuth of a state or axis, in [0, π), from the canonical convention
    /// to this one, or back.
    #[must_use]
    pub fn azimuth(&self, azimuth: f64) -> f64 {
        let turned = match self.angles {
            AngleSense::Counterclockwise => azimuth,
            AngleSense::Clockwise => PI - azimuth,
        };
        half_turn(match self.zero_angle {
            ZeroAngle::X => turned,
            ZeroAngle::Y => turned + FRAC_PI_2,
        })
    }

    /// An angle of rotation, from the canonical convention to this one, or back.
    #[must_use]
    pub fn rotation(&self, angle: f64) -> f64 {
        match self.angles {
            AngleSense::Counterclockwise => angle,
            AngleSense::Clockwise => -angle,
        }
    }

    /// A quantity that has the sign of S3, from the canonical convention to this
    /// one, or back.
    #[must_use]
    pub fn circular(&self, value: f64) -> f64 {
        match self.positive_s3 {
            PositiveS3::Clockwise => value,
            PositiveS3::Counterclockwise => -value,
        }
    }

    /// The diagonal of K.
    fn signs(&self) -> Vector4<f64> {
        let mut k = Vector4::repeat(1.0);
        if self.angles == AngleSense::Clockwise {
            k[2] = -k[2];
        }
        if self.positive_s3 == PositiveS3::Counterclockwise {
            k[3] = -k[3];
        }
        if self.zero_angle == ZeroAngle::Y {
            k[1] = -k[1];
            k[2] = -k[2];
        }
        k
    }
}
