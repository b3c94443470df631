use nalgebra::{DMatrix, DVector, Matrix4, SMatrix, SVector};

use super::least_squares::Problem;
use super::models::{Evaluated, Shape};
use crate::noise::Measurement;

type Matrix16 = SMatrix<f64, 16, 16>;

/// An exact element weighs as if its error were this share of the others': then rounding
/// and not the fit decides on its last digits. A search that began so would creep along the
/// narrow valley, so that it begins with the first and ends with the last.
const EXACT: [f64; 3] = [1e-1, 1e-3, 1e-6];

/// A measured matrix with the weights of its elements, in units of its own M00.
#[derive(Debug, Clone)]
pub(super) struct Target {
    pub elements: SVector<f64, 16>,
    /// W with `WᵀW = Σ⁻¹`, exact elements with a large weight.
    whitening: Matrix16,
    /// Rows beyond the sixteen, for exact elements of a covariance.
    held: Vec<usize>,
    /// Of an exact element.
    held_weight: f64,
    /// The root mean square of the errors that are not zero.
    typical: f64,
    /// The exact elements.
    places: Vec<usize>,
    /// |M00| as given.
    pub unit: f64,
    /// How many elements are exact.
    pub exact: usize,
    /// Whether M00 is.
    pub m00_is_exact: bool,
}

impl Target {
    /// `None` where M00 is zero. Without a noise statement every element weighs the same.
    pub fn of(measurement: &Measurement) -> Option<Self> {
        let unit = measurement.mueller().m00().abs();
        measurement.mueller().normalised()?;
        let elements = SVector::from(measurement.mueller().row_major()) / unit;
        let sigma = measurement.element_sigma().unwrap_or_else(|| {
            std::array::from_fn(|k| {
                if k == 0 && measurement.m00_is_exact() {
                    0.0
                } else {
                    unit
                }
            })
        });
        let typical = measurement.typical_sigma().unwrap_or(unit) / unit;
        let is_exact = |k: &usize| sigma[*k] == 0.0;
        let held: Vec<usize> = (0..16).filter(is_exact).collect();
        let (whitening, rows) = match measurement.covariance() {
            Some(covariance) => (covariance.whitening() * unit, held.clone()),
            None => (
                Matrix16::from_diagonal(&SVector::from_fn(|k, _| {
                    if sigma[k] == 0.0 {
                        1.0
                    } else {
                        unit / sigma[k]
                    }
                })),
                Vec::new(),
            ),
        };
        let target = Self {
            elements,
            whitening,
            exact: held.len(),
            m00_is_exact: held.first() == Some(&0),
            held: rows,
            held_weight: 1.0,
            typical,
            places: held,
            unit,
        };
        Some(target.with_exactness(EXACT[2]))
    }

    /// The same from soft to hard in its exact elements, for a search that goes through all;
    /// an exact M00 is met by scaling.
    pub fn stages(&self) -> Vec<Self> {
        if self.exact == usize::from(self.m00_is_exact) {
            return vec![self.clone()];
        }
        EXACT.map(|share| self.with_exactness(share)).to_vec()
    }

    /// With another error of the exact elements, as a share of the others'.
    fn with_exactness(&self, share: f64) -> Self {
        let mut target = self.clone();
        target.held_weight = 1.0 / (share * self.typical);
        if self.held.is_empty() {
            for &k in &self.places {
                target.whitening[(k, k)] = target.held_weight;
            }
        }
        target
    }

    /// The same weights around another matrix, in the same unit.
    pub fn around(&self, elements: SVector<f64, 16>) -> Self {
        Self {
            elements,
            ..self.clone()
        }
    }

    fn rows(&self) -> usize {
        16 + self.held.len()
    }

    /// Of a matrix in the same unit, row by row.
    fn whitened(&self, difference: &SVector<f64, 16>) -> DVector<f64> {
        let sixteen = self.whitening * difference;
        DVector::from_fn(self.rows(), |k, _| {
            if k < 16 {
                sixteen[k]
            } else {
                self.held_weight * difference[self.held[k - 16]]
            }
        })
    }

    /// Residuals and derivatives of a matrix.
    pub fn residuals(
        &self,
        matrix: &Matrix4<f64>,
        derivatives: &[Matrix4<f64>],
    ) -> (DVector<f64>, DMatrix<f64>) {
        let residuals = self.whitened(&(row_major(matrix) - self.elements));
        let mut jacobian = DMatrix::zeros(self.rows(), derivatives.len());
        for (k, derivative) in derivatives.iter().enumerate() {
            jacobian.set_column(k, &self.whitened(&row_major(derivative)));
        }
        (residuals, jacobian)
    }
}

pub(super) fn row_major(matrix: &Matrix4<f64>) -> SVector<f64, 16> {
    SVector::from_fn(|k, _| matrix[(k / 4, k % 4)])
}

/// A model and the matrix that it is to explain.
pub(super) struct ModelProblem<'a> {
    pub target: &'a Target,
    pub shape: Shape,
    /// A parameter that does not move.
    pub fixed: Option<(usize, f64)>,
}

impl ModelProblem<'_> {
    /// Residuals and derivatives with the weight of an exact M00 among the others.
    pub fn weighted(&self, x: &[f64]) -> (DVector<f64>, DMatrix<f64>) {
        let evaluated = self.evaluated(x);
        self.target
            .residuals(&evaluated.matrix, &evaluated.derivatives)
    }

    fn evaluated(&self, x: &[f64]) -> Evaluated {
        let mut evaluated = self.shape.evaluate(&self.whole(x));
        if let Some((place, _)) = self.fixed {
            evaluated.derivatives.remove(place);
        }
        evaluated
    }

    /// The parameters with which M00 is what it must be where it is exact: the search leaves
    /// their scale alone.
    pub fn to_scale(&self, x: &[f64]) -> Vec<f64> {
        let mut x = x.to_vec();
        let m00 = self.evaluated(&x).matrix[(0, 0)];
        let ratio = self.target.elements[0] / m00;
        if !self.target.m00_is_exact || !ratio.is_finite() || ratio <= 0.0 {
            return x;
        }
        match self.shape.model.rank() {
            Some(_) => {
                let own = x.len() - self.shape.model.depolarizations();
                for value in &mut x[..own] {
                    *value *= ratio.sqrt();
                }
            }
            None => x[0] *= ratio,
        }
        x
    }

    /// All parameters from those that move.
    pub fn whole(&self, x: &[f64]) -> Vec<f64> {
        let mut whole = x.to_vec();
        if let Some((place, value)) = self.fixed {
            whole.insert(place, value);
        }
        whole
    }
}

impl Problem for ModelProblem<'_> {
    fn evaluate(&self, x: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)> {
        if !self.target.m00_is_exact {
            return Some(self.weighted(x));
        }
        // An exact M00 is met by scaling; its weight would make a narrow, bent valley of the
        // sum of squares.
        let Evaluated {
            matrix,
            derivatives,
        } = self.evaluated(x);
        let m00 = matrix[(0, 0)];
        let ratio = self.target.elements[0] / m00;
        if !ratio.is_finite() || ratio <= 0.0 {
            return None;
        }
        let derivatives: Vec<_> = derivatives
            .into_iter()
            .map(|derivative| (derivative - matrix * (derivative[(0, 0)] / m00)) * ratio)
            .collect();
        Some(self.target.residuals(&(matrix * ratio), &derivatives))
    }
}
