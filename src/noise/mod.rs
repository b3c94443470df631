//! What is known of the noise, and the measurement that carries it.

mod repeats;
mod systematic;

pub use systematic::{Side, Systematic};

use std::sync::Arc;

use crate::error::{Error, Result};
use crate::mueller::Mueller;
use crate::stats::{Covariance, NormalDraws, chi_squared_tail, f_tail, rounding_sigma};
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
    /// The matrix is the mean of measurements of the same sample, whose scatter is the
    /// noise: see [`Measurement::of_replicates`].
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
    /// The same, but the covariance is an estimate with so many degrees of freedom.
    Sampled(Arc<Covariance>, f64),
}

/// A systematic part beside the random one.
#[derive(Debug, Clone, PartialEq)]
struct Common {
    stated: Systematic,
    /// What one standard uncertainty of each quantity does to the elements.
    columns: Vec<[f64; 16]>,
    /// Of both parts together.
    covariance: Arc<Covariance>,
}

/// A measured matrix with what is known of it, canonical convention.
#[derive(Debug, Clone, PartialEq)]
pub struct Measurement {
    mueller: Mueller,
    m00_is_exact: bool,
    absolute: bool,
    noise: Noise,
    errors: Errors,
    systematic: Option<Common>,
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
            Noise::Replicates { matrices } => {
                repeats::errors_of_mean(matrices, &mueller, m00_is_exact)?
            }
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
            systematic: None,
        })
    }

    /// With uncertainties of the instrument beside the random noise. They are the same in
    /// every repeat, and add `Σ u² (∂M/∂q)(∂M/∂q)ᵀ` to the covariance; elements that are
    /// exact stay so.
    ///
    /// # Errors
    /// `bad-systematic` for values out of range, or where the noise itself is not stated;
    /// those of [`Covariance::new`].
    pub fn with_systematic(mut self, stated: Systematic) -> Result<Self> {
        let Some(sigma) = self.element_sigma() else {
            return Err(Error::new(
                "bad-systematic",
                "A systematic part stands beside a random one: state the noise as well.",
            )
            .at_field("noise.systematic"));
        };
        let mut columns = stated.columns(&self.mueller, self.m00_is_exact)?;
        if columns.is_empty() {
            return Ok(self);
        }
        for column in &mut columns {
            for (value, sigma) in column.iter_mut().zip(sigma) {
                if sigma == 0.0 {
                    *value = 0.0;
                }
            }
        }
        let random = self.random_covariance()?.row_major();
        let covariance = Arc::new(Covariance::new(&with_columns(&random, &columns))?);
        self.systematic = Some(Common {
            stated,
            columns,
            covariance,
        });
        Ok(self)
    }

    /// Of the random part alone.
    fn random_covariance(&self) -> Result<Covariance> {
        match &self.errors {
            Errors::General(covariance) | Errors::Sampled(covariance, _) => {
                Ok(covariance.as_ref().clone())
            }
            _ => Covariance::diagonal(&self.element_sigma().unwrap_or_default()),
        }
    }

    /// The mean of measurements of the same sample.
    ///
    /// Up to 40 of them have one σ, pooled over the elements that are not exact, so that
    /// it has 16 (n − 1) degrees of freedom, or 15 (n − 1) where M00 is exact; more have
    /// their whole covariance, with n − 1. Tests account for both being estimates.
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
            _ if self.systematic.is_some() => None,
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => Some(sigma),
            _ => None,
        }
    }

    /// The degrees of freedom of [`Measurement::equal_sigma`], where that is an estimate.
    #[must_use]
    pub fn sigma_freedom(&self) -> Option<f64> {
        match self.errors {
            Errors::Pooled(_, freedom) if self.systematic.is_none() => Some(freedom),
            _ => None,
        }
    }

    /// The covariance of errors that are not independent and equal.
    #[must_use]
    pub fn covariance(&self) -> Option<&Covariance> {
        match (&self.systematic, &self.errors) {
            (Some(common), _) => Some(&common.covariance),
            (None, Errors::General(covariance) | Errors::Sampled(covariance, _)) => {
                Some(covariance)
            }
            _ => None,
        }
    }

    /// What other repeats would make of [`Measurement::covariance`]: one draw. `None`
    /// where it is no estimate.
    ///
    /// # Errors
    /// Those of [`Covariance::new`].
    pub(crate) fn draw_covariance(&self, draws: &mut NormalDraws) -> Result<Option<Covariance>> {
        let columns = self
            .systematic
            .as_ref()
            .map_or(&[][..], |common| &common.columns);
        let random = match (&self.errors, columns) {
            (Errors::Sampled(covariance, freedom), _) => covariance.draw_estimate(draws, *freedom),
            (Errors::Pooled(_, freedom), [_, ..]) => {
                let ratio = draws.draw_sigma_ratio(*freedom);
                let sigma = self.element_sigma_of_noise().unwrap_or_default();
                Covariance::diagonal(&sigma.map(|sigma| ratio * sigma))?.row_major()
            }
            _ => return Ok(None),
        };
        Covariance::new(&with_columns(&random, columns)).map(Some)
    }

    /// The probability that `statistic`, a squared distance over the covariance with so
    /// many degrees of freedom, is larger by chance: χ² for a known noise, F for a pooled
    /// σ, Hotelling's distribution for a covariance of repeats. A systematic part is
    /// known, so that the degrees of freedom of both together follow from their shares
    /// (Welch 1947).
    #[must_use]
    pub fn tail(&self, statistic: f64, degrees_of_freedom: u32) -> Option<f64> {
        self.freedom()
            .map_or(Freedom::KNOWN, |freedom| freedom)
            .tail(statistic, degrees_of_freedom)
    }

    /// How well the noise is known; `None` where nothing was said.
    pub(crate) fn freedom(&self) -> Option<Freedom> {
        let whole = self.typical_sigma()?.powi(2);
        let (degrees, is_matrix, random) = match &self.errors {
            Errors::Unknown => return None,
            Errors::Equal(_) | Errors::General(_) => return Some(Freedom::KNOWN),
            Errors::Pooled(sigma, degrees) => (*degrees, false, sigma * sigma),
            Errors::Sampled(covariance, degrees) => {
                (*degrees, true, covariance.typical_sigma().powi(2))
            }
        };
        Some(Freedom {
            share: random / whole,
            degrees,
            is_matrix,
        })
    }

    /// The systematic part of each element's standard deviation; `None` where there is none.
    #[must_use]
    pub fn systematic_sigma(&self) -> Option<[f64; 16]> {
        let common = self.systematic.as_ref()?;
        Some(std::array::from_fn(|k| {
            common
                .columns
                .iter()
                .fold(0.0_f64, |length, column| length.hypot(column[k]))
        }))
    }

    /// The standard deviation of each element, zero for an exact one; `None` where
    /// nothing was said.
    #[must_use]
    pub fn element_sigma(&self) -> Option<[f64; 16]> {
        match &self.systematic {
            Some(common) => Some(std::array::from_fn(|k| common.covariance.sigma(k))),
            None => self.element_sigma_of_noise(),
        }
    }

    /// The same of the random part alone.
    fn element_sigma_of_noise(&self) -> Option<[f64; 16]> {
        match &self.errors {
            Errors::Unknown => None,
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => Some(std::array::from_fn(|k| {
                if k == 0 && self.m00_is_exact {
                    0.0
                } else {
                    *sigma
                }
            })),
            Errors::General(covariance) | Errors::Sampled(covariance, _) => {
                Some(std::array::from_fn(|k| covariance.sigma(k)))
            }
        }
    }

    /// The root mean square of the standard deviations of the elements that are not
    /// exact.
    #[must_use]
    pub fn typical_sigma(&self) -> Option<f64> {
        match (self.covariance(), &self.errors) {
            (Some(covariance), _) => Some(covariance.typical_sigma()),
            (None, Errors::Equal(sigma) | Errors::Pooled(sigma, _)) => Some(*sigma),
            _ => None,
        }
    }

    /// The first-order standard error of a quantity with this gradient with respect to
    /// the elements, row by row.
    #[must_use]
    pub fn standard_error(&self, gradient: &[f64; 16]) -> Option<f64> {
        if let Some(covariance) = self.covariance() {
            return Some(covariance.variance(gradient).max(0.0).sqrt());
        }
        let sigma = self.equal_sigma()?;
        let first = usize::from(self.m00_is_exact);
        // Each term scaled by itself: squares of tiny gradients must not vanish.
        Some(
            gradient[first..]
                .iter()
                .fold(0.0_f64, |length, g| length.hypot(g * sigma)),
        )
    }

    /// The covariance of two quantities with these gradients, to first order.
    #[must_use]
    pub fn covariance_of(&self, one: &[f64; 16], other: &[f64; 16]) -> Option<f64> {
        if let Some(covariance) = self.covariance() {
            return Some(covariance.covariance_of(one, other));
        }
        let sigma = self.equal_sigma()?;
        let first = usize::from(self.m00_is_exact);
        let pairs = one[first..].iter().zip(&other[first..]);
        Some(pairs.map(|(a, b)| (a * sigma) * (b * sigma)).sum())
    }

    /// The covariance of the second minus this one, and how well it is known; `None`
    /// unless the noise of both is stated. The random parts are independent; the same
    /// systematic statement is that of one instrument, whose errors both share.
    ///
    /// # Errors
    /// Those of [`Covariance::new`].
    pub(crate) fn of_difference(&self, second: &Self) -> Result<Option<(Covariance, Freedom)>> {
        let (Some(one), Some(other)) = (self.freedom(), second.freedom()) else {
            return Ok(None);
        };
        let random = (
            self.random_covariance()?.row_major(),
            second.random_covariance()?.row_major(),
        );
        let sum = std::array::from_fn(|k| random.0[k] + random.1[k]);
        let columns = self.columns_of_difference(second);
        let variances = [self, second].map(|each| each.typical_sigma().unwrap_or_default().powi(2));
        Ok(Some((
            Covariance::new(&with_columns(&sum, &columns))?,
            one.of_sum(variances[0], other, variances[1]),
        )))
    }

    /// What the systematic parts do to the second minus this one.
    fn columns_of_difference(&self, second: &Self) -> Vec<[f64; 16]> {
        match (&self.systematic, &second.systematic) {
            (Some(one), Some(other)) if one.stated == other.stated => one
                .columns
                .iter()
                .zip(&other.columns)
                .map(|(one, other)| std::array::from_fn(|k| other[k] - one[k]))
                .collect(),
            (one, other) => [one, other]
                .into_iter()
                .flatten()
                .flat_map(|common| common.columns.iter().copied())
                .collect(),
        }
    }

    /// The first-order standard error of a quantity of the second minus the same of this
    /// one, from its gradients at both.
    pub(crate) fn standard_error_of_difference(
        &self,
        gradient: &[f64; 16],
        second: &Self,
        second_gradient: &[f64; 16],
    ) -> Option<f64> {
        let (Some(one), Some(other)) = (&self.systematic, &second.systematic) else {
            return Some(
                self.standard_error(gradient)?
                    .hypot(second.standard_error(second_gradient)?),
            );
        };
        let random = |measurement: &Self, gradient| {
            Self {
                systematic: None,
                ..measurement.clone()
            }
            .standard_error(gradient)
        };
        let along = |columns: &[[f64; 16]], gradient: &[f64; 16]| -> Vec<f64> {
            let product =
                |column: &[f64; 16]| column.iter().zip(gradient).map(|(a, b)| a * b).sum();
            columns.iter().map(product).collect()
        };
        let parts = (
            along(&one.columns, gradient),
            along(&other.columns, second_gradient),
        );
        let systematic = if one.stated == other.stated {
            parts.0.iter().zip(&parts.1).map(|(a, b)| b - a).collect()
        } else {
            [parts.0, parts.1].concat()
        };
        let noise = random(self, gradient)?.hypot(random(second, second_gradient)?);
        Some(systematic.into_iter().fold(noise, f64::hypot))
    }

    /// One draw of the errors; zeros where nothing was said.
    pub(crate) fn draw(&self, draws: &mut NormalDraws) -> [f64; 16] {
        let mut errors = self.draw_noise(draws);
        if let Some(common) = &self.systematic {
            for column in &common.columns {
                let scale = draws.draw();
                for (error, value) in errors.iter_mut().zip(column) {
                    *error += scale * value;
                }
            }
        }
        errors
    }

    /// One draw of the errors as if what is estimated of them were true.
    pub(crate) fn draw_known(&self, draws: &mut NormalDraws) -> [f64; 16] {
        if let Some(covariance) = self.covariance() {
            return covariance.draw(draws);
        }
        let sigma = self.element_sigma().unwrap_or_default();
        let draw = draws.draw_matrix();
        std::array::from_fn(|k| sigma[k] * draw[k])
    }

    /// One draw of the random part.
    fn draw_noise(&self, draws: &mut NormalDraws) -> [f64; 16] {
        // An estimated σ may as well be larger: then the errors follow Student's t.
        let mut student = |freedom: &f64| 1.0 / draws.draw_sigma_ratio(*freedom);
        match &self.errors {
            Errors::Unknown => [0.0; 16],
            Errors::Equal(sigma) | Errors::Pooled(sigma, _) => {
                let scale = match &self.errors {
                    Errors::Pooled(_, freedom) => sigma * student(freedom),
                    _ => *sigma,
                };
                let mut errors = draws.draw_matrix().map(|draw| draw * scale);
                if self.m00_is_exact {
                    errors[0] = 0.0;
                }
                errors
            }
            Errors::General(covariance) => covariance.draw(draws),
            Errors::Sampled(covariance, freedom) => {
                let scale = student(freedom);
                covariance.draw(draws).map(|error| scale * error)
            }
        }
    }

    /// The same measurement with the sign of elements changed, and their errors with them.
    ///
    /// # Errors
    /// `not-finite`, which a measured matrix can't be.
    pub(crate) fn with_signs(&self, signs: &[f64; 16]) -> Result<Self> {
        let elements = self.mueller.row_major();
        let mueller = Mueller::from_row_major(&std::array::from_fn(|k| signs[k] * elements[k]))?;
        let turned = |covariance: &Covariance| Arc::new(covariance.with_signs(signs));
        let errors = match &self.errors {
            Errors::General(covariance) => Errors::General(turned(covariance)),
            Errors::Sampled(covariance, freedom) => Errors::Sampled(turned(covariance), *freedom),
            other => other.clone(),
        };
        let systematic = self.systematic.as_ref().map(|common| Common {
            stated: common.stated,
            columns: common
                .columns
                .iter()
                .map(|column| std::array::from_fn(|k| signs[k] * column[k]))
                .collect(),
            covariance: turned(&common.covariance),
        });
        Ok(Self {
            mueller,
            errors,
            systematic,
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

/// How well a noise is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Freedom {
    /// Of the part that is an estimate in the whole variance.
    share: f64,
    /// Of that part.
    degrees: f64,
    /// Whether a whole covariance is estimated, and not one σ.
    is_matrix: bool,
}

impl Freedom {
    const KNOWN: Self = Self {
        share: 0.0,
        degrees: 1.0,
        is_matrix: false,
    };

    /// Of the sum of two independent errors with these typical variances.
    pub(crate) fn of_sum(self, variance: f64, other: Self, other_variance: f64) -> Self {
        let whole = variance + other_variance;
        let parts = [(self, variance), (other, other_variance)]
            .map(|(one, variance)| (one.share * variance / whole, one.degrees));
        let share: f64 = parts.iter().map(|(share, _)| share).sum();
        let spread: f64 = parts
            .iter()
            .map(|(share, degrees)| share * share / degrees)
            .sum();
        Self {
            share,
            degrees: if spread > 0.0 {
                share * share / spread
            } else {
                1.0
            },
            is_matrix: self.is_matrix || other.is_matrix,
        }
    }

    /// See [`Measurement::tail`].
    pub(crate) fn tail(self, statistic: f64, degrees_of_freedom: u32) -> Option<f64> {
        if self.share == 0.0 {
            return chi_squared_tail(statistic, degrees_of_freedom);
        }
        let numerator = f64::from(degrees_of_freedom);
        let degrees = self.degrees / (self.share * self.share);
        if self.is_matrix {
            let denominator = degrees - numerator + 1.0;
            return f_tail(
                statistic * denominator / (numerator * degrees),
                numerator,
                denominator,
            );
        }
        f_tail(statistic / numerator, numerator, degrees)
    }
}

/// `Σ + Σ_j d_j d_jᵀ`.
fn with_columns(covariance: &[f64; 256], columns: &[[f64; 16]]) -> [f64; 256] {
    std::array::from_fn(|k| {
        let (i, j) = (k / 16, k % 16);
        covariance[k] + columns.iter().map(|d| d[i] * d[j]).sum::<f64>()
    })
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
