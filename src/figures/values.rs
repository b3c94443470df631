use std::f64::consts::PI;

use crate::coherency::{Coherency, Nearest, nearest_to};
use crate::decompose::{PolarFactors, RetarderParameters, isotropic, polar_forward};
use crate::error::Result;
use crate::linalg::HermitianEigen;
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::state::half_turn;
use crate::tolerance;

/// The figures, in the order in which a person reads them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum FigureName {
    /// `D = |(m01, m02, m03)|`.
    Diattenuation,
    /// `hypot(m01, m02)`.
    LinearDiattenuation,
    /// `m03`, signed.
    CircularDiattenuation,
    /// `½ atan2(m02, m01)`: the axis of largest transmittance.
    DiattenuationAzimuth,
    /// `P = |(m10, m20, m30)|`.
    Polarizance,
    /// `hypot(m10, m20)`.
    LinearPolarizance,
    /// `m30`, signed.
    CircularPolarizance,
    /// `½ atan2(m20, m10)`.
    PolarizanceAzimuth,
    /// `M00 (1 + D)`.
    TransmittanceMax,
    /// `M00 (1 - D)`.
    TransmittanceMin,
    /// `sqrt((Σ m_ij² - 1) / 3)` (Gil & Bernabéu 1986).
    DepolarizationIndex,
    /// `|m 3×3| / √3` (Gil 2011).
    SphericalPurity,
    /// `(λ1 - λ2) / t` (San José & Gil 2011).
    PurityIndex1,
    /// `(λ1 + λ2 - 2 λ3) / t`.
    PurityIndex2,
    /// `(λ1 + λ2 + λ3 - 3 λ4) / t`.
    PurityIndex3,
    /// `-Σ λ log4 λ` of the nearest realizable matrix (Cloude & Pottier 1995).
    Entropy,
    /// α of a pure element with isotropic depolarization, closed form.
    IsotropicAlpha,
    /// Of the retarder of the forward polar decomposition (Lu & Chipman 1996), in
    /// [0, π].
    Retardance,
    /// Of its linear part, in [0, π].
    LinearRetardance,
    /// Of its circular part: counter-clockwise rotation of the azimuth.
    Rotation,
    /// Of its linear part, which follows the rotator.
    FastAxis,
    /// Azimuth of its fast eigenstate.
    RetarderAzimuth,
    /// Ellipticity of its fast eigenstate.
    RetarderEllipticity,
    /// `1 - |tr mΔ| / 3`.
    DepolarizationPower,
}

/// What kind of quantity a figure is: it decides unit and convention.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Unit {
    /// A pure number.
    One,
    /// A pure number with the sign of S3.
    CircularSign,
    /// In the unit of the matrix.
    Transmittance,
    /// An angle in radians without a sense.
    Angle,
    /// An azimuth in radians, in [0, π).
    Azimuth,
    /// A sense of rotation in radians, in (-π/2, π/2].
    Rotation,
    /// An ellipticity in radians.
    Ellipticity,
}

impl FigureName {
    /// All of them.
    pub const ALL: [Self; 24] = [
        Self::Diattenuation,
        Self::LinearDiattenuation,
        Self::CircularDiattenuation,
        Self::DiattenuationAzimuth,
        Self::Polarizance,
        Self::LinearPolarizance,
        Self::CircularPolarizance,
        Self::PolarizanceAzimuth,
        Self::TransmittanceMax,
        Self::TransmittanceMin,
        Self::DepolarizationIndex,
        Self::SphericalPurity,
        Self::PurityIndex1,
        Self::PurityIndex2,
        Self::PurityIndex3,
        Self::Entropy,
        Self::IsotropicAlpha,
        Self::Retardance,
        Self::LinearRetardance,
        Self::Rotation,
        Self::FastAxis,
        Self::RetarderAzimuth,
        Self::RetarderEllipticity,
        Self::DepolarizationPower,
    ];

    /// Its kind.
    #[must_use]
    pub fn unit(self) -> Unit {
        match self {
            Self::CircularDiattenuation | Self::CircularPolarizance => Unit::CircularSign,
            Self::TransmittanceMax | Self::TransmittanceMin => Unit::Transmittance,
            Self::DiattenuationAzimuth
            | Self::PolarizanceAzimuth
            | Self::FastAxis
            | Self::RetarderAzimuth => Unit::Azimuth,
            Self::Retardance | Self::LinearRetardance => Unit::Angle,
            Self::Rotation => Unit::Rotation,
            Self::RetarderEllipticity => Unit::Ellipticity,
            _ => Unit::One,
        }
    }

    /// The period of a periodic figure.
    pub(crate) fn period(self) -> Option<f64> {
        matches!(self.unit(), Unit::Azimuth | Unit::Rotation).then_some(PI)
    }

    /// Whether it is a length that noise can only push away from zero.
    pub(crate) fn is_length(self) -> bool {
        matches!(
            self,
            Self::Diattenuation
                | Self::LinearDiattenuation
                | Self::Polarizance
                | Self::LinearPolarizance
                | Self::Retardance
                | Self::LinearRetardance
        )
    }

    /// Whether it orders the eigenvalues, so that it has no derivative where two
    /// of them meet.
    pub(crate) fn orders_eigenvalues(self) -> bool {
        matches!(
            self,
            Self::PurityIndex1 | Self::PurityIndex2 | Self::PurityIndex3 | Self::Entropy
        )
    }
}

/// What several answers about one measurement share.
#[derive(Debug, Clone)]
pub(crate) struct Analysis {
    pub measurement: Measurement,
    /// Of H of the measured matrix.
    pub eigen: HermitianEigen,
    pub nearest: Option<Nearest>,
    /// The nearest matrix over its M00, and the standard error of its elements.
    pub normalised_nearest: Option<Mueller>,
    pub normalised_sigma: Option<f64>,
    pub polar: Option<PolarFactors>,
}

impl Analysis {
    pub fn of(measurement: &Measurement) -> Result<Self> {
        let mueller = measurement.mueller();
        let exact = measurement.m00_is_exact();
        let eigen = Coherency::from_mueller(mueller).eigen()?;
        let nearest = nearest_to(measurement, &eigen)?;
        let normalised_nearest = nearest
            .as_ref()
            .filter(|nearest| nearest.mueller.m00() > 0.0)
            .and_then(|nearest| nearest.mueller.normalised());
        // Dividing by a noisy M00 adds its error: at most as much again, for an
        // element of size one.
        let growth = if exact { 1.0 } else { 2f64.sqrt() };
        let normalised_sigma = measurement
            .typical_sigma()
            .zip(nearest.as_ref())
            .map(|(sigma, nearest)| growth * sigma / nearest.mueller.m00().abs())
            .filter(|sigma| sigma.is_finite());
        let polar = normalised_nearest
            .map(|m| polar_forward(&m, normalised_sigma))
            .transpose()?;
        Ok(Self {
            measurement: measurement.clone(),
            eigen,
            nearest,
            normalised_nearest,
            normalised_sigma,
            polar,
        })
    }

    /// The retarder of the forward polar decomposition, where it is determined.
    pub fn retarder(&self) -> Option<&RetarderParameters> {
        self.polar.as_ref()?.parameters.as_ref()
    }

    /// One figure, or why it is not determined. Radians.
    pub fn value(&self, name: FigureName) -> std::result::Result<f64, &'static str> {
        const NO_M00: &str = "M00 is not positive, so nothing can be given relative to it";
        let m00 = self.measurement.mueller().m00();
        let Some(m) = self
            .measurement
            .mueller()
            .normalised()
            .filter(|_| m00 > 0.0)
        else {
            return Err(NO_M00);
        };
        let m = m.matrix();
        let row = [m[(0, 1)], m[(0, 2)], m[(0, 3)]];
        let column = [m[(1, 0)], m[(2, 0)], m[(3, 0)]];
        let length = |v: [f64; 3]| v[0].hypot(v[1]).hypot(v[2]);
        let squares = m.fixed_view::<3, 3>(1, 1).norm_squared();
        let lambda = self.eigen.values.map(|value| value / m00);
        let polar = || self.polar.as_ref().ok_or(NO_M00);
        let retarder = || {
            let polar = polar()?;
            polar
                .parameters
                .ok_or(polar.reason.unwrap_or("the retarder is not determined"))
        };
        match name {
            FigureName::Diattenuation => Ok(length(row)),
            FigureName::LinearDiattenuation => Ok(row[0].hypot(row[1])),
            FigureName::CircularDiattenuation => Ok(row[2]),
            FigureName::DiattenuationAzimuth => {
                azimuth(row, "there is no linear diattenuation, so it has no azimuth")
            }
            FigureName::Polarizance => Ok(length(column)),
            FigureName::LinearPolarizance => Ok(column[0].hypot(column[1])),
            FigureName::CircularPolarizance => Ok(column[2]),
            FigureName::PolarizanceAzimuth => {
                azimuth(column, "there is no linear polarizance, so it has no azimuth")
            }
            FigureName::TransmittanceMax => Ok(m00 * (1.0 + length(row))),
            FigureName::TransmittanceMin => Ok(m00 * (1.0 - length(row))),
            FigureName::DepolarizationIndex => {
                let vectors = length(row).powi(2) + length(column).powi(2);
                Ok(((vectors + squares) / 3.0).sqrt())
            }
            FigureName::SphericalPurity => Ok((squares / 3.0).sqrt()),
            FigureName::PurityIndex1 => Ok(lambda[0] - lambda[1]),
            FigureName::PurityIndex2 => Ok(lambda[0] + lambda[1] - 2.0 * lambda[2]),
            FigureName::PurityIndex3 => Ok(lambda[0] + lambda[1] + lambda[2] - 3.0 * lambda[3]),
            FigureName::Entropy => {
                let values = self.nearest.as_ref().ok_or(NO_M00)?.eigen.values;
                let sum: f64 = values.iter().sum();
                Ok(values
                    .iter()
                    .map(|value| value / sum)
                    .filter(|&share| share > 0.0)
                    .map(|share| -share * share.log2() / 2.0)
                    .sum())
            }
            FigureName::IsotropicAlpha => isotropic(&self.measurement, &self.eigen)
                .map(|model| model.alpha)
                .ok_or(NO_M00),
            FigureName::Retardance => Ok(retarder()?.retardance),
            FigureName::LinearRetardance => Ok(retarder()?.linear_retardance),
            FigureName::Rotation => retarder()?
                .rotation
                .ok_or("the linear part is a half-wave retarder, where rotation and axis can't be told apart"),
            FigureName::FastAxis => retarder()?
                .fast_axis
                .ok_or("the linear part has no axis of its own at zero or half a wave"),
            FigureName::RetarderAzimuth => retarder()?
                .azimuth
                .ok_or("the retardance is zero or purely circular, so it has no azimuth"),
            FigureName::RetarderEllipticity => retarder()?
                .ellipticity
                .ok_or("the retardance is zero, so it has no axis"),
            FigureName::DepolarizationPower => {
                let polar = polar()?;
                polar
                    .depolarization_power
                    .ok_or(polar.reason.unwrap_or("the depolarizer is not determined"))
            }
        }
    }
}

fn azimuth(vector: [f64; 3], otherwise: &'static str) -> std::result::Result<f64, &'static str> {
    if vector[0].hypot(vector[1]) > tolerance::ZERO {
        Ok(half_turn(0.5 * vector[1].atan2(vector[0])))
    } else {
        Err(otherwise)
    }
}
