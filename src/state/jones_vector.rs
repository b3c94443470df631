use nalgebra::Vector2;
use num_complex::Complex64;

use super::Stokes;

/// The complex amplitudes along x and y, time dependence exp(+iωt).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct JonesVector(pub(crate) Vector2<Complex64>);

impl JonesVector {
    /// From Ex and Ey.
    #[must_use]
    pub fn new(x: Complex64, y: Complex64) -> Self {
        Self(Vector2::new(x, y))
    }

    /// Ex and Ey.
    #[must_use]
    pub fn components(&self) -> [Complex64; 2] {
        self.0.into()
    }

    /// Its Stokes vector, with `S3 = 2 Im(Ex* Ey)`.
    #[must_use]
    pub fn stokes(&self) -> Stokes {
        let [x, y] = self.components();
        let cross = x.conj() * y;
        let (xx, yy) = (x.norm_sqr(), y.norm_sqr());
        Stokes::from_vector([xx + yy, xx - yy, 2.0 * cross.re, 2.0 * cross.im].into())
    }
}
