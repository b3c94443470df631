use nalgebra::{Matrix4, RowVector4};

use crate::error::{Error, Result};
use crate::mueller::{Mueller, frame_rotation};

/// The least |sin δ| of a retarder whose side can measure S3 at all.
const LEAST_SINE: f64 = 1e-3;

/// How far the sides of the instrument are from what the reduction took them for: standard
/// uncertainties that do not average out.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Systematic {
    /// Of the side before the sample.
    pub generator: Side,
    /// Of the side behind the sample.
    pub analyser: Side,
    /// Of the constant light in every reading, as a share of M00.
    pub dark: f64,
}

/// One side: a polarizer at rest and a retarder that turns.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Side {
    /// What the retardance was taken for, radians.
    pub retardance: f64,
    /// Where the polarizer stands, radians, counted as in the canonical convention.
    pub polarizer: f64,
    /// Standard uncertainty of the retardance, radians.
    pub retardance_error: f64,
    /// Standard uncertainty of the azimuth of the side as a whole, radians.
    pub azimuth_error: f64,
    /// Standard uncertainty of the factor on its degree of polarization.
    pub contrast_error: f64,
}

impl Default for Side {
    /// A quarter-wave retarder behind a polarizer along x, without error.
    fn default() -> Self {
        Self {
            retardance: std::f64::consts::FRAC_PI_2,
            polarizer: 0.0,
            retardance_error: 0.0,
            azimuth_error: 0.0,
            contrast_error: 0.0,
        }
    }
}

impl Systematic {
    /// What one standard uncertainty of each does to the elements, row by row: the columns
    /// `u ∂M/∂q` of which the covariance is the sum of squares. Where M00 is exact, the
    /// matrix was divided by an M00 that was wrong as well.
    ///
    /// # Errors
    /// `bad-systematic` for an uncertainty that is negative or not finite, or a retarder
    /// that measures no S3.
    pub(super) fn columns(&self, mueller: &Mueller, m00_is_exact: bool) -> Result<Vec<[f64; 16]>> {
        let m = mueller.matrix();
        let mut columns = Vec::new();
        for error in self.generator.errors("generator")? {
            columns.push(m * error);
        }
        for error in self.analyser.errors("analyser")? {
            columns.push(error.transpose() * m);
        }
        if in_range(self.dark, "darkSigma")? > 0.0 {
            let mut constant = Matrix4::zeros();
            constant[(0, 0)] = self.dark * mueller.m00();
            columns.push(constant);
        }
        let m00 = mueller.m00();
        Ok(columns
            .into_iter()
            .map(|column| {
                let column = if m00_is_exact && m00 != 0.0 {
                    column - m * (column[(0, 0)] / m00)
                } else {
                    column
                };
                std::array::from_fn(|k| column[(k / 4, k % 4)])
            })
            .collect())
    }
}

impl Side {
    /// The changes of its states, `X` in `(1 + X) s`, by one standard uncertainty of each.
    /// With a polarizer along x and the retarder at any angle, `s = (1, ½(1 + cos δ) + …)`
    /// gives `∂s/∂δ = X s` with the same X for all angles (derived).
    fn errors(&self, name: &str) -> Result<Vec<Matrix4<f64>>> {
        let [retardance_error, azimuth_error, contrast_error] = [
            in_range(self.retardance_error, name)?,
            in_range(self.azimuth_error, name)?,
            in_range(self.contrast_error, name)?,
        ];
        let mut errors = Vec::new();
        if retardance_error > 0.0 {
            let (sine, cosine) = self.retardance.sin_cos();
            if !self.polarizer.is_finite() || !sine.is_finite() || sine.abs() < LEAST_SINE {
                return Err(refuse(
                    "A retarder of this retardance measures no circular part; state the one that was used.",
                    name,
                ));
            }
            let half = sine / (1.0 - cosine);
            let change = Matrix4::from_rows(&[
                RowVector4::zeros(),
                RowVector4::new(-half, half, 0.0, 0.0),
                RowVector4::new(0.0, 0.0, half, 0.0),
                RowVector4::new(0.0, 0.0, 0.0, cosine / sine),
            ]);
            let frame = frame_rotation(self.polarizer);
            errors.push(frame.transpose() * change * frame * retardance_error);
        }
        if azimuth_error > 0.0 {
            let mut turn = Matrix4::zeros();
            turn[(1, 2)] = -2.0 * azimuth_error;
            turn[(2, 1)] = 2.0 * azimuth_error;
            errors.push(turn);
        }
        if contrast_error > 0.0 {
            let loss = RowVector4::new(0.0, 1.0, 1.0, 1.0) * -contrast_error;
            errors.push(Matrix4::from_diagonal(&loss.transpose()));
        }
        Ok(errors)
    }
}

/// No error is larger than what it is an error of.
fn in_range(value: f64, field: &str) -> Result<f64> {
    if (0.0..=1.0).contains(&value) {
        return Ok(value);
    }
    Err(refuse(
        "A systematic uncertainty must lie between 0 and 1, or between 0° and 57°.",
        field,
    ))
}

fn refuse(sentence: &str, field: &str) -> Error {
    Error::new("bad-systematic", sentence).at_field(format!("noise.systematic.{field}"))
}
