//! What may have gone wrong where a violation is beyond the noise.

use super::{Coherency, eigenvalue_gradient, nearest_to, weighted_significance};
use crate::error::Result;
use crate::mueller::Mueller;
use crate::noise::{Measurement, Noise};
use crate::stats::Covariance;
use crate::tolerance;

/// A larger lack of M00 is no small error of it.
const LARGEST_LACK: f64 = 0.1;

/// A statistic above this is never explained; it is not worth a simulation. For a pure
/// sample the 95 % point is near 11.
const HOPELESS: f64 = 30.0;

/// An element that is free has so many times the error of the others.
const FREE: f64 = 1e3;

/// What may have gone wrong.
#[derive(Debug, Clone, PartialEq)]
pub enum Cause {
    /// One side was counted the other way round: a sign, three signs, or two rows or
    /// columns exchanged. The spectrum is the same for all of them.
    MirrorOneSide,
    /// M00 is too small by this much.
    M00TooSmall {
        /// To be added to M00.
        delta: f64,
    },
    /// One element is wrong.
    OneElement {
        /// Row by row.
        element: usize,
        /// What would explain it.
        value: f64,
    },
    /// A row, that is the analyser's side, is wrong by a factor.
    RowGain {
        /// 1 to 3.
        row: usize,
        /// What the row is to be multiplied by.
        factor: f64,
    },
    /// A column, that is the generator's side, is wrong by a factor.
    ColumnGain {
        /// 1 to 3.
        column: usize,
        /// What the column is to be multiplied by.
        factor: f64,
    },
    /// The sign of everything.
    OverallSign,
}

/// A cause with what the test says after it has been taken back.
#[derive(Debug, Clone, PartialEq)]
pub struct Candidate {
    /// What.
    pub cause: Cause,
    /// Of the violation that is left.
    pub p_value: f64,
    /// The measured matrix without it.
    pub mended: Mueller,
}

/// The causes after which noise is enough of an explanation, the likeliest first. Empty
/// where the violation is explained as it is, or where no noise is stated.
///
/// # Errors
/// As [`weighted_significance`].
pub fn likely_causes(measurement: &Measurement, seed: u64) -> Result<Vec<Candidate>> {
    if !measurement.has_noise() || p_value(measurement, seed)? >= tolerance::SIGNIFICANCE {
        return Ok(Vec::new());
    }
    let search = Search { measurement, seed };
    let mut found = Vec::new();
    found.extend(search.overall_sign()?);
    found.extend(search.mirror()?);
    found.extend(search.m00()?);
    for line in 1..4 {
        for is_row in [true, false] {
            found.extend(search.gain(line, is_row)?);
        }
    }
    for element in 0..16 {
        found.extend(search.element(element)?);
    }
    found.sort_by(|a, b| b.p_value.total_cmp(&a.p_value));
    Ok(found)
}

/// Whether a mirror of one side would be seen, of this measurement or of its mirror image:
/// not with a polarizer, where neither has a negative eigenvalue beyond its error.
///
/// # Errors
/// `no-convergence`.
pub fn mirror_is_visible(measurement: &Measurement) -> Result<bool> {
    for one in [measurement, &measurement.with_signs(&mirror_signs())?] {
        let eigen = Coherency::from_mueller(one.mueller()).eigen()?;
        let error = one
            .standard_error(&eigenvalue_gradient(&eigen.vectors[3]))
            .unwrap_or_default()
            .max(tolerance::ZERO * one.mueller().m00().abs());
        if eigen.values[3] < -tolerance::STANDARD_ERRORS * error {
            return Ok(true);
        }
    }
    Ok(false)
}

fn mirror_signs() -> [f64; 16] {
    std::array::from_fn(|k| if k / 4 == 3 { -1.0 } else { 1.0 })
}

/// Of the test; 1 where there is nothing to test, 0 where it is hopeless.
fn p_value(measurement: &Measurement, seed: u64) -> Result<f64> {
    let eigen = Coherency::from_mueller(measurement.mueller()).eigen()?;
    let Some(nearest) = nearest_to(measurement, &eigen)? else {
        return Ok(0.0);
    };
    let statistic = nearest.statistic.unwrap_or_else(|| {
        let sigma = measurement.equal_sigma().unwrap_or(f64::INFINITY);
        (nearest.distance / sigma).powi(2)
    });
    if statistic > HOPELESS {
        return Ok(0.0);
    }
    let test = weighted_significance(measurement, Some(&nearest), seed)?;
    Ok(test.map_or(0.0, |test| test.p_value))
}

struct Search<'a> {
    measurement: &'a Measurement,
    seed: u64,
}

impl Search<'_> {
    /// The cause, if noise explains what is left without it.
    fn judge(&self, cause: Cause, mended: &Measurement) -> Result<Option<Candidate>> {
        let p_value = p_value(mended, self.seed)?;
        Ok((p_value >= tolerance::SIGNIFICANCE).then(|| Candidate {
            cause,
            p_value,
            mended: *mended.mueller(),
        }))
    }

    fn overall_sign(&self) -> Result<Option<Candidate>> {
        if self.measurement.mueller().m00() >= 0.0 {
            return Ok(None);
        }
        let mended = self.measurement.with_signs(&[-1.0; 16])?;
        self.judge(Cause::OverallSign, &mended)
    }

    fn mirror(&self) -> Result<Option<Candidate>> {
        let mended = self.measurement.with_signs(&mirror_signs())?;
        self.judge(Cause::MirrorOneSide, &mended)
    }

    /// A fourth of what is added to M00 lifts each eigenvalue.
    fn m00(&self) -> Result<Option<Candidate>> {
        let mueller = self.measurement.mueller();
        let least = Coherency::from_mueller(mueller).eigen()?.values[3];
        let delta = -4.0 * least;
        if mueller.m00() <= 0.0 || delta <= 0.0 || delta > LARGEST_LACK * mueller.m00() {
            return Ok(None);
        }
        let mut elements = mueller.row_major();
        elements[0] += delta;
        let mended = self
            .measurement
            .with_mueller(Mueller::from_row_major(&elements)?);
        self.judge(Cause::M00TooSmall { delta }, &mended)
    }

    /// With an error of its own that is large, an element follows the others.
    fn element(&self, element: usize) -> Result<Option<Candidate>> {
        let sigma = self.measurement.element_sigma().unwrap_or_default();
        if sigma[element] == 0.0 {
            return Ok(None);
        }
        let mut covariance = match self.measurement.covariance() {
            Some(covariance) => covariance.row_major(),
            None => Covariance::diagonal(&sigma)?.row_major(),
        };
        for k in 0..16 {
            covariance[16 * element + k] = 0.0;
            covariance[16 * k + element] = 0.0;
        }
        covariance[17 * element] = (FREE * sigma[element]).powi(2);
        let freed = Measurement::new(
            *self.measurement.mueller(),
            self.measurement.m00_is_exact(),
            self.measurement.absolute(),
            Noise::Covariance {
                covariance: Box::new(covariance),
            },
        )?;
        let eigen = Coherency::from_mueller(freed.mueller()).eigen()?;
        let Some(nearest) = nearest_to(&freed, &eigen)? else {
            return Ok(None);
        };
        let value = nearest.mueller.row_major()[element];
        let mut elements = freed.mueller().row_major();
        elements[element] = value;
        let candidate = self.judge(Cause::OneElement { element, value }, &freed)?;
        let mended = Mueller::from_row_major(&elements)?;
        Ok(candidate.map(|candidate| Candidate {
            mended,
            ..candidate
        }))
    }

    /// The factor of least distance, by golden sections.
    fn gain(&self, line: usize, is_row: bool) -> Result<Option<Candidate>> {
        let scaled = |factor: f64| {
            let mut elements = self.measurement.mueller().row_major();
            for k in 0..4 {
                elements[if is_row { 4 * line + k } else { 4 * k + line }] *= factor;
            }
            Mueller::from_row_major(&elements).map(|mueller| self.measurement.with_mueller(mueller))
        };
        let distance = |factor: f64| -> Result<f64> {
            let scaled = scaled(factor)?;
            let eigen = Coherency::from_mueller(scaled.mueller()).eigen()?;
            let nearest = nearest_to(&scaled, &eigen)?;
            // Where several factors do, the one nearest to 1.
            Ok(nearest.map_or(f64::MAX, |nearest| {
                nearest.statistic.unwrap_or(nearest.distance)
            }) + 1e-9 * (factor - 1.0).abs())
        };
        let golden = 0.5 * (5f64.sqrt() - 1.0);
        let (mut low, mut high) = (0.5, 2.0);
        let (mut left, mut right) = (high - golden * (high - low), low + golden * (high - low));
        let (mut at_left, mut at_right) = (distance(left)?, distance(right)?);
        for _ in 0..22 {
            if at_left < at_right {
                (high, right, at_right) = (right, left, at_left);
                left = high - golden * (high - low);
                at_left = distance(left)?;
            } else {
                (low, left, at_left) = (left, right, at_right);
                right = low + golden * (high - low);
                at_right = distance(right)?;
            }
        }
        let factor = 0.5 * (low + high);
        let cause = if is_row {
            Cause::RowGain { row: line, factor }
        } else {
            Cause::ColumnGain {
                column: line,
                factor,
            }
        };
        self.judge(cause, &scaled(factor)?)
    }
}
