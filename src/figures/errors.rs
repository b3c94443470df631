use super::values::{Analysis, FigureName};
use crate::error::Result;
use crate::mueller::Mueller;

const COUNT: usize = FigureName::ALL.len();

/// The derivatives of every figure, and of the retarder's vectors, with respect to the
/// elements, row by row; `None` where a figure is not determined next to the matrix.
pub(super) struct Gradients {
    pub figures: [Option<[f64; 16]>; COUNT],
    /// Of retardance times axis.
    pub retarder: Option<[[f64; 16]; 3]>,
    /// Of the same of the linear part.
    pub linear: Option<[[f64; 16]; 2]>,
}

impl Gradients {
    /// By central differences, over the elements that have errors.
    pub fn of(analysis: &Analysis) -> Result<Self> {
        let measurement = &analysis.measurement;
        let elements = measurement.mueller().row_major();
        let sigma = measurement.element_sigma().unwrap_or_default();
        let step = 1e-6 * measurement.mueller().m00().abs();
        let mut gradients = Self {
            figures: [Some([0.0; 16]); COUNT],
            retarder: Some([[0.0; 16]; 3]),
            linear: Some([[0.0; 16]; 2]),
        };
        if step == 0.0 {
            return Ok(Self {
                figures: [None; COUNT],
                retarder: None,
                linear: None,
            });
        }
        for k in (0..16).filter(|&k| sigma[k] > 0.0) {
            let moved = |by: f64| {
                let mut elements = elements;
                elements[k] += by;
                let mueller = Mueller::from_matrix(nalgebra::Matrix4::from_row_slice(&elements));
                Analysis::of(&measurement.with_mueller(mueller))
            };
            let (above, below) = (moved(step)?, moved(-step)?);
            for (gradient, name) in gradients.figures.iter_mut().zip(FigureName::ALL) {
                match (gradient.as_mut(), above.value(name), below.value(name)) {
                    (Some(gradient), Ok(high), Ok(low)) => {
                        let mut difference = high - low;
                        if let Some(period) = name.period() {
                            difference -= period * (difference / period).round();
                        }
                        gradient[k] = difference / (2.0 * step);
                    }
                    _ => *gradient = None,
                }
            }
            let vectors = above.retarder().zip(below.retarder());
            gradients.retarder =
                gradients
                    .retarder
                    .zip(vectors)
                    .map(|(mut gradient, (above, below))| {
                        for (i, row) in gradient.iter_mut().enumerate() {
                            row[k] = (above.vector[i] - below.vector[i]) / (2.0 * step);
                        }
                        gradient
                    });
            gradients.linear =
                gradients
                    .linear
                    .zip(vectors)
                    .map(|(mut gradient, (above, below))| {
                        for (i, row) in gradient.iter_mut().enumerate() {
                            row[k] =
                                (above.linear_vector[i] - below.linear_vector[i]) / (2.0 * step);
                        }
                        gradient
                    });
        }
        Ok(gradients)
    }
}
