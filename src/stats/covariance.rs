use nalgebra::{SMatrix, SVector};

use super::NormalDraws;
use crate::error::{Error, Result};
use crate::linalg::eigen_of_symmetric16;
use crate::tolerance;

type Matrix16 = SMatrix<f64, 16, 16>;

/// The covariance of the sixteen elements of a matrix, row by row. Elements whose
/// variance is exactly zero are *held*: they have no error at all.
#[derive(Debug, Clone, PartialEq)]
pub struct Covariance {
    matrix: Matrix16,
    /// Of the free elements; zero at the held ones.
    inverse: Matrix16,
    /// `inverse_root inverse_rootᵀ = inverse`.
    inverse_root: Matrix16,
    /// `root rootᵀ = matrix`.
    root: Matrix16,
    held: [bool; 16],
}

impl Covariance {
    /// `values` are 16×16 numbers, row by row.
    ///
    /// # Errors
    /// `covariance-not-symmetric` with the entry, `covariance-not-positive` with the
    /// entry or eigenvalue, `covariance-singular` for a dependence between elements that
    /// are not held, `not-finite`.
    pub fn new(values: &[f64; 256]) -> Result<Self> {
        let given = Matrix16::from_row_slice(values);
        if given.iter().any(|value| !value.is_finite()) {
            return Err(refuse(
                "not-finite",
                "The covariance holds a value that is not a finite number.".to_owned(),
            ));
        }
        let held: [bool; 16] = std::array::from_fn(|k| {
            given
                .row(k)
                .iter()
                .chain(given.column(k).iter())
                .all(|&value| value == 0.0)
        });
        for (i, held) in held.into_iter().enumerate() {
            let variance = given[(i, i)];
            if !held
                && (variance <= 0.0
                    || !(1.0 / tolerance::LARGEST_NUMBER..=tolerance::LARGEST_NUMBER)
                        .contains(&variance.sqrt()))
            {
                return Err(refuse(
                    "covariance-not-positive",
                    format!(
                        "The variance in row and column {} is {variance}, and must be positive.",
                        i + 1
                    ),
                ));
            }
        }
        let sigma = SVector::<f64, 16>::from_fn(|k, _| given[(k, k)].sqrt());
        for i in 0..16 {
            for j in 0..i {
                let allowed = tolerance::SYMMETRY * sigma[i] * sigma[j];
                if (given[(i, j)] - given[(j, i)]).abs() > allowed {
                    return Err(refuse(
                        "covariance-not-symmetric",
                        format!(
                            "The covariance is not symmetric: row {}, column {} holds {}, and row {}, column {} holds {}.",
                            i + 1,
                            j + 1,
                            given[(i, j)],
                            j + 1,
                            i + 1,
                            given[(j, i)]
                        ),
                    ));
                }
            }
        }
        // Correlations have no scale; a held element stands alone.
        let correlation = Matrix16::from_fn(|i, j| match (held[i] || held[j], i == j) {
            (true, true) => 1.0,
            (true, false) => 0.0,
            _ => 0.5 * (given[(i, j)] + given[(j, i)]) / (sigma[i] * sigma[j]),
        });
        let (eigenvalues, vectors) = eigen_of_symmetric16(&correlation)?;
        let least = eigenvalues.min();
        if least < -tolerance::SYMMETRY {
            return Err(refuse(
                "covariance-not-positive",
                format!(
                    "The covariance is not positive: its correlations have the eigenvalue {least:.3e}."
                ),
            ));
        }
        if least < tolerance::SINGULAR_COVARIANCE {
            return Err(refuse(
                "covariance-singular",
                "The covariance is singular: some combination of elements would have no error at all. Rows of zeros say which elements are exact.".to_owned(),
            ));
        }
        let scale = SVector::<f64, 16>::from_fn(|k, _| if held[k] { 0.0 } else { sigma[k] });
        let inverse_scale = scale.map(|sigma| if sigma > 0.0 { 1.0 / sigma } else { 0.0 });
        let root = Matrix16::from_diagonal(&scale)
            * vectors
            * Matrix16::from_diagonal(&eigenvalues.map(f64::sqrt));
        let inverse_root = Matrix16::from_diagonal(&inverse_scale)
            * vectors
            * Matrix16::from_diagonal(&eigenvalues.map(|value| 1.0 / value.sqrt()));
        Ok(Self {
            matrix: root * root.transpose(),
            inverse: inverse_root * inverse_root.transpose(),
            inverse_root,
            root,
            held,
        })
    }

    /// Independent errors; elements of σ = 0 are held.
    ///
    /// # Errors
    /// As [`Covariance::new`].
    pub fn diagonal(sigma: &[f64; 16]) -> Result<Self> {
        let mut values = [0.0; 256];
        for (k, sigma) in sigma.iter().enumerate() {
            values[17 * k] = sigma * sigma;
        }
        Self::new(&values)
    }

    /// Row by row.
    #[must_use]
    pub fn row_major(&self) -> [f64; 256] {
        std::array::from_fn(|k| self.matrix[(k / 16, k % 16)])
    }

    /// Whether an element has no error.
    #[must_use]
    pub fn is_held(&self, k: usize) -> bool {
        self.held[k]
    }

    /// The standard deviation of one element.
    #[must_use]
    pub fn sigma(&self, k: usize) -> f64 {
        self.matrix[(k, k)].sqrt()
    }

    /// The root mean square of the standard deviations that are not zero; zero where
    /// all elements are held.
    #[must_use]
    pub fn typical_sigma(&self) -> f64 {
        let free = self.held.iter().filter(|&&held| !held).count();
        (self.matrix.trace() / (free.max(1) as f64)).sqrt()
    }

    /// `gᵀ Σ g`.
    #[must_use]
    pub fn variance(&self, gradient: &[f64; 16]) -> f64 {
        let gradient = SVector::<f64, 16>::from(*gradient);
        (self.root.transpose() * gradient).norm_squared()
    }

    /// `aᵀ Σ b`.
    #[must_use]
    pub fn covariance_of(&self, one: &[f64; 16], other: &[f64; 16]) -> f64 {
        let turned = self.root.transpose();
        (turned * SVector::from(*one)).dot(&(turned * SVector::from(*other)))
    }

    /// `vᵀ Σ⁻¹ v` over the free elements.
    #[must_use]
    pub fn squared_distance(&self, difference: &[f64; 16]) -> f64 {
        let difference = SVector::<f64, 16>::from(*difference);
        difference.dot(&(self.inverse * difference)).max(0.0)
    }

    /// A matrix W with `WᵀW = Σ⁻¹` over the free elements; nothing of the held ones.
    pub(crate) fn whitening(&self) -> Matrix16 {
        self.inverse_root.transpose()
    }

    /// `Σ⁻¹` over the free elements, zero at the held ones.
    pub(crate) fn inverse(&self) -> &Matrix16 {
        &self.inverse
    }

    /// One draw of the errors.
    pub fn draw(&self, draws: &mut NormalDraws) -> [f64; 16] {
        let standard = SVector::<f64, 16>::from(draws.draw_matrix());
        (self.root * standard).into()
    }

    /// One draw of what an estimate of this covariance from a sample with so many degrees
    /// of freedom would be, row by row (Bartlett 1933).
    pub(crate) fn draw_estimate(&self, draws: &mut NormalDraws, freedom: f64) -> [f64; 256] {
        let mut factor = Matrix16::zeros();
        for i in 0..16 {
            for j in 0..i {
                factor[(i, j)] = draws.draw();
            }
            let left = freedom - i as f64;
            factor[(i, i)] = draws.draw_sigma_ratio(left) * left.sqrt();
        }
        let root = self.root * factor / freedom.sqrt();
        let estimate = root * root.transpose();
        std::array::from_fn(|k| estimate[(k / 16, k % 16)])
    }

    /// With one element held.
    ///
    /// # Errors
    /// As [`Covariance::new`].
    pub fn holding(&self, k: usize) -> Result<Self> {
        let mut values = self.row_major();
        for i in 0..16 {
            values[16 * k + i] = 0.0;
            values[16 * i + k] = 0.0;
        }
        Self::new(&values)
    }

    /// Of the elements after `element → signs[element] · element`.
    #[must_use]
    pub fn with_signs(&self, signs: &[f64; 16]) -> Self {
        let signs = Matrix16::from_diagonal(&SVector::<f64, 16>::from(*signs));
        Self {
            matrix: signs * self.matrix * signs,
            inverse: signs * self.inverse * signs,
            inverse_root: signs * self.inverse_root,
            root: signs * self.root,
            held: self.held,
        }
    }
}

fn refuse(code: &'static str, sentence: String) -> Error {
    Error::new(code, sentence).at_field("noise.covariance")
}
