//! What is known of the noise, and the measurement that carries it.

use std::sync::Arc;

use crate::error::{Error, Result};
use crate::mueller::Mueller;
use crate::stats::{Covariance, NormalDraws, rounding_sigma};
use crate::tolerance;

/// What the person says of the noise. It refers to the matrix as given.
#[derive(Debug, Clone, PartialEq)]
pub enum Noise {
    /// Nothing.
    None,
    /// One standard deviation for every element that is not exact.
    Uniform {
        /// In the unit of the matrix.
        sigma: f64,
    },
    /// One standard deviation, as a share of M00.
    Relative {
        /// σ over |M00|.
        fraction: f64,
    },
    /// A standard deviation for each element, row by row; zero for an exact one.
    PerElement {
        /// In the unit of the matrix.
        sigma: [f64; 16],
    },
    /// The covariance of the elements, row by row; rows of zeros for exact ones.
    Covariance {
        /// 16×16 numbers, row by row.
        covariance: Box<[f64; 256]>,
    },
    /// The matrix is the mean of measurements of the same sample, whose scatter, pooled
    /// over the elements, is the noise: see [`Measurement::of_replicates`].
    Replicates {
        /// At least two.
        matrices: Vec<Mueller>,
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
}

/// What the statement makes of the errors of one matrix.
#[derive(Debug, Clone, PartialEq)]
enum Errors {
    /// Nothing was said.
    Unknown,
    /// Independent, of this σ, but for an exact M00.
    Equal(f64),
    /// The same, but σ is an estimate with so many degrees of freedom.
    Pooled(f64, f64),
    /// Anything else.
    General(Arc<Covariance>),
}

/// A measured matrix with what is known of it, canonical convention.
#[derive(Debug, Clone, PartialEq)]
pub struct Measurement {
    mueller: Mueller,
    m00_is_exact: bool,
    absolute: bool,
    noise: Noise,
    errors: Errors,
}

impl Measurement {
    /// `m00_is_exact`: the matrix was divided by M00, which therefore has no
    /// error, whatever the noise statement says of it. `absolute`: M00 is a
    /// transmittance or reflectance, not relative.
    ///
    /// # Errors
    /// `bad-sigma` for a sigma that is not positive, finite and in range (an exact
    /// element may have zero); `bad-decimals` for more than [`Noise::MOST_DECIMALS`];
    /// those of [`Covariance::new`].
    pub fn new(mueller: Mueller, m00_is_exact: bool, absolute: bool, noise: Noise) -> Result<Self> {
        let errors = match &noise {
            Noise::None => Errors::Unknown,
            &Noise::Uniform { sigma } => Errors::Equal(in_range(sigma, "noise.sigma")?),
            &Noise::Relative { fraction } => {
                Errors::Equal(in_range(fraction * mueller.m00().abs(), "noise.fraction")?)
            }
            Noise::PerElement { sigma } => {
                let mut sigma = *sigma;
                if m00_is_exact {
                    sigma[0] = 0.0;
                }
                for (k, &value) in sigma.iter().enumerate() {
                    if value != 0.0 {
                        in_range(value, &format!("noise.sigma[{k}]"))?;
                    }
                }
                errors_of(Covariance::diagonal(&sigma)?)?
            }
            Noise::Covariance { covariance } => {
                let covariance = Covariance::new(covariance)?;
                errors_of(if m00_is_exact && !covariance.is_held(0) {
                    covariance.holding(0)?
                } else {
                    covariance
                })?
            }
            Noise::Replicates { matrices } => pooled(matrices, &mueller, m00_is_exact)?,
            &Noise::Rounding { decimals } if decimals <= Noise::MOST_DECIMALS => {
                Errors::Equal(rounding_sigma(decimals))
            }
            Noise::Rounding { .. } => {
                return Err(Error::new(
                    "bad-decimals",
                    format!(
                        "The number of decimals must lie between 0 and {}.",
                        Noise::MOST_DECIMALS
                    ),
                )
                .at_field("noise.decimals"));
            }
        };
        Ok(Self {
            mueller,
            m00_is_exact,
            absolute,
            noise,
            errors,
        })
    }

    /// The mean of measurements of the same sample.
    ///
    /// Their standard deviation is pooled over the elements that are not exact, so that
    /// it has 16 (n − 1) degrees of freedom, or 15 (n − 1) where M00 is exact; tests
    /// account for it being an estimate.
    ///
    /// # Errors
    /// `too-few` for less than two; `bad-sigma` where they do not scatter.
    pub fn of_replicates(
        matrices: Vec<Mueller>,
        m00_is_exact: bool,
        absolute: bool,
    ) -> Result<Self> {
        let sum = matrices
            .iter()
            .fold(nalgebra::Matrix4::zeros(), |sum, one| sum + one.matrix());
        let mean = Mueller::from_matrix(sum / matrices.len().max(1) as f64);
        Self::new(mean, m00_is_exact, absolute, Noise::Replicates { matrices })
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

    /// Whether anything was said of the noise.
    #[must_use]
    pub fn has_noise(&self) -> bool {
        self.errors != Errors::Unknown
    }

    /// The σ of independent equal errors; `None` for all others.
    #[must_use]
    pub fn equal_sigma(&self) -> Option<f64> {
        match self.errors {
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => Some(sigma),
            _ => None,
        }
    }

    /// The degrees of freedom of σ, where that is an estimate.
    #[must_use]
    pub fn sigma_freedom(&self) -> Option<f64> {
        match self.errors {
            Errors::Pooled(_, freedom) => Some(freedom),
            _ => None,
        }
    }

    /// The covariance of errors that are not independent and equal.
    #[must_use]
    pub fn covariance(&self) -> Option<&Covariance> {
        match &self.errors {
            Errors::General(covariance) => Some(covariance),
            _ => None,
        }
    }

    /// The standard deviation of each element, zero for an exact one; `None` where
    /// nothing was said.
    #[must_use]
    pub fn element_sigma(&self) -> Option<[f64; 16]> {
        match &self.errors {
            Errors::Unknown => None,
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => Some(std::array::from_fn(|k| {
                if k == 0 && self.m00_is_exact {
                    0.0
                } else {
                    *sigma
                }
            })),
            Errors::General(covariance) => Some(std::array::from_fn(|k| covariance.sigma(k))),
        }
    }

    /// The root mean square of the standard deviations of the elements that are not
    /// exact.
    #[must_use]
    pub fn typical_sigma(&self) -> Option<f64> {
        match &self.errors {
            Errors::Unknown => None,
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => Some(*sigma),
            Errors::General(covariance) => Some(covariance.typical_sigma()),
        }
    }

    /// The first-order standard error of a quantity with this gradient with respect to
    /// the elements, row by row.
    #[must_use]
    pub fn standard_error(&self, gradient: &[f64; 16]) -> Option<f64> {
        let variance = match &self.errors {
            Errors::Unknown => return None,
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => {
                let first = usize::from(self.m00_is_exact);
                // Each term scaled by itself: squares of tiny gradients must not vanish.
                return Some(
                    gradient[first..]
                        .iter()
                        .fold(0.0_f64, |length, g| length.hypot(g * sigma)),
                );
            }
            Errors::General(covariance) => covariance.variance(gradient),
        };
        Some(variance.max(0.0).sqrt())
    }

    /// The covariance of two quantities with these gradients, to first order.
    #[must_use]
    pub fn covariance_of(&self, one: &[f64; 16], other: &[f64; 16]) -> Option<f64> {
        match &self.errors {
            Errors::Unknown => None,
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => {
                let first = usize::from(self.m00_is_exact);
                let pairs = one[first..].iter().zip(&other[first..]);
                Some(pairs.map(|(a, b)| (a * sigma) * (b * sigma)).sum())
            }
            Errors::General(covariance) => Some(covariance.covariance_of(one, other)),
        }
    }

    /// One draw of the errors; zeros where nothing was said.
    pub(crate) fn draw(&self, draws: &mut NormalDraws) -> [f64; 16] {
        match &self.errors {
            Errors::Unknown => [0.0; 16],
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => {
                // An estimated σ may as well be larger: then the errors follow Student's t.
                let scale = match self.sigma_freedom() {
                    Some(freedom) => sigma / draws.draw_sigma_ratio(freedom),
                    None => *sigma,
                };
                let mut errors = draws.draw_matrix().map(|draw| draw * scale);
                if self.m00_is_exact {
                    errors[0] = 0.0;
                }
                errors
            }
            Errors::General(covariance) => covariance.draw(draws),
        }
    }

    /// The same measurement with the sign of elements changed, and their errors with them.
    ///
    /// # Errors
    /// `not-finite`, which a measured matrix can't be.
    pub(crate) fn with_signs(&self, signs: &[f64; 16]) -> Result<Self> {
        let elements = self.mueller.row_major();
        let mueller = Mueller::from_row_major(&std::array::from_fn(|k| signs[k] * elements[k]))?;
        let errors = match &self.errors {
            Errors::General(covariance) => Errors::General(Arc::new(covariance.with_signs(signs))),
            other => other.clone(),
        };
        Ok(Self {
            mueller,
            errors,
            ..self.clone()
        })
    }

    /// The same measurement of another matrix.
    pub(crate) fn with_mueller(&self, mueller: Mueller) -> Self {
        Self {
            mueller,
            ..self.clone()
        }
    }
}

/// The σ of the mean, pooled over the elements, with its degrees of freedom.
fn pooled(matrices: &[Mueller], mean: &Mueller, m00_is_exact: bool) -> Result<Errors> {
    let field = "noise.matrices";
    if matrices.len() < 2 {
        return Err(Error::new("too-few", "Repeats are at least two matrices.").at_field(field));
    }
    let first = usize::from(m00_is_exact);
    let centre = mean.row_major();
    let squares: f64 = matrices
        .iter()
        .flat_map(|one| {
            let elements = one.row_major();
            (first..16).map(move |k| (elements[k] - centre[k]).powi(2))
        })
        .sum();
    let count = matrices.len() as f64;
    let freedom = (16 - first) as f64 * (count - 1.0);
    let sigma = (squares / freedom / count).sqrt();
    // The mean of equal numbers may differ from them by its rounding.
    if sigma <= tolerance::ZERO * mean.largest() {
        return Err(Error::new(
            "bad-sigma",
            "The repeats are equal to the last digit, so their scatter says nothing of the noise.",
        )
        .at_field(field));
    }
    Ok(Errors::Pooled(in_range(sigma, field)?, freedom))
}

fn in_range(sigma: f64, field: &str) -> Result<f64> {
    let range = 1.0 / tolerance::LARGEST_NUMBER..=tolerance::LARGEST_NUMBER;
    if range.contains(&sigma) {
        return Ok(sigma);
    }
    Err(Error::new(
        "bad-sigma",
        "σ must be a positive number, in the unit of the matrix.",
    )
    .at_field(field))
}

fn errors_of(covariance: Covariance) -> Result<Errors> {
    if (0..16).all(|k| covariance.is_held(k)) {
        return Err(Error::new(
            "bad-sigma",
            "At least one element must have an error, or no noise be stated.",
        )
        .at_field("noise"));
    }
    Ok(Errors::General(Arc::new(covariance)))
}
