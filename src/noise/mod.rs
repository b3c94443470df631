//! What is known of the noise, and the measurement that carries it.

use crate::error::{Error, Result};
use crate::mueller::Mueller;
use crate::stats::rounding_sigma;
use crate::tolerance;

/// What the person says of the noise. It refers to the matrix as given.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Noise {
    /// Nothing.
    None,
    /// One standard deviation for every element that is not exact.
    Uniform {
        /// In the unit of the matrix.
        sigma: f64,
    },
    /// The numbers were rounded to so many decimals, and nothing else.
    Rounding {
        /// At most [`Noise::MOST_DECIMALS`].
        decimals: u32,
    },
}

impl Noise {
    /// More decimals than a double holds are no statement.
    pub const MOST_DECIMALS: u32 = 17;

    /// The standard deviation of an element that is not exact; `None` where
    /// nothing was said.
    #[must_use]
    pub fn sigma(&self) -> Option<f64> {
        match *self {
            Self::None => None,
            Self::Uniform { sigma } => Some(sigma),
            Self::Rounding { decimals } => Some(rounding_sigma(decimals)),
        }
    }
}

/// A measured matrix with what is known of it, canonical convention.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Measurement {
    mueller: Mueller,
    m00_is_exact: bool,
    absolute: bool,
    noise: Noise,
}

impl Measurement {
    /// `m00_is_exact`: the matrix was divided by M00, which therefore has no
    /// error. `absolute`: M00 is a transmittance or reflectance, not relative.
    ///
    /// # Errors
    /// `bad-sigma` for a sigma that is not positive, finite and in range;
    /// `bad-decimals` for more than [`Noise::MOST_DECIMALS`].
    pub fn new(mueller: Mueller, m00_is_exact: bool, absolute: bool, noise: Noise) -> Result<Self> {
        match noise {
            Noise::Uniform { sigma }
                if !(1.0 / tolerance::LARGEST_NUMBER..=tolerance::LARGEST_NUMBER)
                    .contains(&sigma) =>
            {
                Err(Error::new(
                    "bad-sigma",
                    "σ must be a positive number, in the unit of the matrix.",
                )
                .at_field("noise.sigma"))
            }
            Noise::Rounding { decimals } if decimals > Noise::MOST_DECIMALS => Err(Error::new(
                "bad-decimals",
                format!(
                    "The number of decimals must lie between 0 and {}.",
                    Noise::MOST_DECIMALS
                ),
            )
            .at_field("noise.decimals")),
            _ => Ok(Self {
                mueller,
                m00_is_exact,
                absolute,
                noise,
            }),
        }
    }

    /// The matrix as given.
    #[must_use]
    pub fn mueller(&self) -> &Mueller {
        &self.mueller
    }

    /// Whether M00 has no error.
    #[must_use]
    pub fn m00_is_exact(&self) -> bool {
        self.m00_is_exact
    }

    /// Whether M00 is a transmittance or reflectance.
    #[must_use]
    pub fn absolute(&self) -> bool {
        self.absolute
    }

    /// What is known of the noise.
    #[must_use]
    pub fn noise(&self) -> &Noise {
        &self.noise
    }

    /// The standard deviation of an element that is not exact.
    #[must_use]
    pub fn sigma(&self) -> Option<f64> {
        self.noise.sigma()
    }

    /// The same measurement of another matrix.
    pub(crate) fn with_mueller(&self, mueller: Mueller) -> Self {
        Self { mueller, ..*self }
    }
}
