use nalgebra::{DMatrix, DVector, SMatrix};

use crate::error::Result;
use crate::linalg::eigen_of_symmetric16;
use crate::noise::Measurement;
use crate::tolerance;

/// An element without any error counts as one with this share of the usual σ, so that a
/// fit holds it, and says so where it can't.
const HELD: f64 = 1e-4;

/// A measurement as residuals of unit variance.
pub(super) struct Weights {
    rows: Rows,
    measured: [f64; 16],
    /// Of M00 where that is exact: a model is brought to it.
    exact_m00: Option<f64>,
}

/// Residuals from differences of the elements, row by row.
enum Rows {
    /// Independent errors: each element from the first on over its σ.
    Diagonal(usize, [f64; 16]),
    Full(DMatrix<f64>),
}

impl Rows {
    fn times(&self, differences: &DMatrix<f64>) -> DMatrix<f64> {
        match self {
            Self::Full(rows) => rows * differences,
            Self::Diagonal(first, sigma) => {
                DMatrix::from_fn(16 - first, differences.ncols(), |row, column| {
                    differences[(row + first, column)] / sigma[row + first]
                })
            }
        }
    }
}

impl Weights {
    /// Without stated noise the unit is the largest element.
    pub fn of(measurement: &Measurement) -> Result<Self> {
        let measured = measurement.mueller().row_major();
        let exact = measurement.m00_is_exact();
        let first = usize::from(exact);
        let typical = measurement
            .typical_sigma()
            .filter(|sigma| *sigma > 0.0)
            .unwrap_or_else(|| measurement.mueller().largest().max(f64::MIN_POSITIVE));
        let sigma: [f64; 16] = measurement.element_sigma().map_or([typical; 16], |sigma| {
            sigma.map(|sigma| if sigma > 0.0 { sigma } else { typical * HELD })
        });
        let rows = match measurement.covariance() {
            None => Rows::Diagonal(first, sigma),
            Some(covariance) => {
                let values = covariance.row_major();
                let correlation = SMatrix::<f64, 16, 16>::from_fn(|i, j| {
                    match (i == j, covariance.is_held(i) || covariance.is_held(j)) {
                        (true, _) => 1.0,
                        (false, true) => 0.0,
                        _ => values[16 * i + j] / sigma[i] / sigma[j],
                    }
                });
                let (eigenvalues, vectors) = eigen_of_symmetric16(&correlation)?;
                let whole = SMatrix::<f64, 16, 16>::from_fn(|row, column| {
                    let value = eigenvalues[row].max(tolerance::SINGULAR_COVARIANCE);
                    vectors[(column, row)] / value.sqrt() / sigma[column]
                });
                // An exact M00 is alone in its eigenvector, and no residual.
                let kept: Vec<usize> = (0..16)
                    .filter(|&row| !(exact && vectors[(0, row)].abs() > 0.5))
                    .collect();
                Rows::Full(DMatrix::from_fn(kept.len(), 16, |row, column| {
                    whole[(kept[row], column)]
                }))
            }
        };
        Ok(Self {
            rows,
            measured,
            exact_m00: exact.then_some(measured[0]),
        })
    }

    pub fn count(&self) -> usize {
        match &self.rows {
            Rows::Diagonal(first, _) => 16 - first,
            Rows::Full(rows) => rows.nrows(),
        }
    }

    /// The model as it is compared: brought to the exact M00 where there is one.
    pub fn compared(&self, model: &[f64; 16]) -> Option<[f64; 16]> {
        match self.exact_m00 {
            None => Some(*model),
            Some(exact) => (model[0].abs() > f64::MIN_POSITIVE)
                .then(|| model.map(|element| element * exact / model[0])),
        }
    }

    pub fn residuals(&self, model: &[f64; 16]) -> Option<DVector<f64>> {
        let model = self.compared(model)?;
        let difference = DMatrix::from_fn(16, 1, |k, _| model[k] - self.measured[k]);
        Some(self.rows.times(&difference).column(0).into_owned())
    }

    /// From the derivatives of the model's elements.
    pub fn jacobian(&self, model: &[f64; 16], changes: &[[f64; 16]]) -> Option<DMatrix<f64>> {
        let columns = DMatrix::from_fn(16, changes.len(), |k, column| {
            let change = &changes[column];
            match self.exact_m00 {
                None => change[k],
                Some(exact) => (change[k] - model[k] * change[0] / model[0]) * exact / model[0],
            }
        });
        Some(self.rows.times(&columns))
            .filter(|jacobian| jacobian.iter().all(|entry| entry.is_finite()))
    }
}
