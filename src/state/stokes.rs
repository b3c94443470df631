use std::f64::consts::PI;

use nalgebra::Vector4;

use crate::error::{Error, Result};
use crate::tolerance;

/// A Stokes vector, physical or not, in the canonical convention.
///
/// S1 > 0 is along x, S2 > 0 at +45° (counter-clockwise from x, facing the
/// source), S3 > 0 turns clockwise, facing the source.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stokes(Vector4<f64>);

/// A Stokes vector whose polarized part does not exceed its intensity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PhysicalStokes(Stokes);

/// The polarization ellipse, angles in radians.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ellipse {
    /// Direction of the long axis in [0, π), counter-clockwise from x; `None` for
    /// circular and for unpolarized light.
    pub azimuth: Option<f64>,
    /// In [-π/4, π/4], positive where the field turns clockwise facing the source;
    /// `None` for unpolarized light.
    pub ellipticity: Option<f64>,
}

impl Stokes {
    /// From its four components.
    ///
    /// # Errors
    /// `not-finite` with the component's place.
    pub fn new(components: [f64; 4]) -> Result<Self> {
        for (k, value) in components.iter().enumerate() {
            if !value.is_finite() || value.abs() > tolerance::LARGEST_NUMBER {
                return Err(Error::new(
                    "not-finite",
                    "A Stokes component must be a finite number below 1e150.",
                )
                .at_field(format!("stokes[{k}]")));
            }
        }
        Ok(Self(Vector4::from(components)))
    }

    pub(crate) fn from_vector(vector: Vector4<f64>) -> Self {
        Self(vector)
    }

    pub(crate) fn vector(&self) -> Vector4<f64> {
        self.0
    }

    /// S0 to S3.
    #[must_use]
    pub fn components(&self) -> [f64; 4] {
        self.0.into()
    }

    /// S0.
    #[must_use]
    pub fn intensity(&self) -> f64 {
        self.0[0]
    }

    /// `sqrt(S1² + S2² + S3²) / S0`; `None` unless S0 is positive.
    #[must_use]
    pub fn degree_of_polarization(&self) -> Option<f64> {
        self.relative(self.linear().hypot(self.0[3]))
    }

    /// `sqrt(S1² + S2²) / S0`; `None` unless S0 is positive.
    #[must_use]
    pub fn degree_of_linear_polarization(&self) -> Option<f64> {
        self.relative(self.linear())
    }

    /// `S3 / S0`, signed; `None` unless S0 is positive.
    #[must_use]
    pub fn degree_of_circular_polarization(&self) -> Option<f64> {
        self.relative(self.0[3])
    }

    /// The ellipse of the polarized part.
    #[must_use]
    pub fn ellipse(&self) -> Ellipse {
        let linear = self.linear();
        let polarized = linear.hypot(self.0[3]);
        let unpolarized = polarized <= tolerance::ZERO * self.0[0].abs() || polarized == 0.0;
        let circular = linear <= tolerance::ZERO * polarized;
        Ellipse {
            azimuth: (!unpolarized && !circular)
                .then(|| half_turn(0.5 * self.0[2].atan2(self.0[1]))),
            ellipticity: (!unpolarized).then(|| 0.5 * self.0[3].atan2(linear)),
        }
    }

    /// The same state with the guarantee, where it holds:
    /// `S0 ≥ sqrt(S1² + S2² + S3²)` up to rounding.
    #[must_use]
    pub fn physical(&self) -> Option<PhysicalStokes> {
        let polarized = self.linear().hypot(self.0[3]);
        (self.0[0] >= polarized * (1.0 - tolerance::ZERO)).then_some(PhysicalStokes(*self))
    }

    fn linear(&self) -> f64 {
        self.0[1].hypot(self.0[2])
    }

    fn relative(&self, part: f64) -> Option<f64> {
        (self.0[0] > 0.0)
            .then(|| part / self.0[0])
            .filter(|ratio| ratio.is_finite())
    }
}

impl PhysicalStokes {
    /// The state.
    #[must_use]
    pub fn stokes(&self) -> Stokes {
        self.0
    }
}

/// An axis angle brought to [0, π).
pub(crate) fn half_turn(angle: f64) -> f64 {
    let angle = angle.rem_euclid(PI);
    // A tiny negative angle rounds up to π itself.
    if angle >= PI { 0.0 } else { angle }
}
