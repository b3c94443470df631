use super::values::{Analysis, FigureName};
use crate::coherency::eigenvalue_errors;
use crate::error::Result;
use crate::mueller::Mueller;
use crate::tolerance;

/// A figure with its standard error, angles in radians.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Figure {
    /// `None` where not determined.
    pub value: Option<f64>,
    /// First-order standard error; `None` without noise, or where the first order
    /// means nothing.
    pub se: Option<f64>,
    /// Why something is `None`, or how to read it; `None` where the error stands
    /// for an interval.
    pub reason: Option<&'static str>,
}

impl Figure {
    /// The half width of the first-order interval of 95 %, where there is one.
    #[must_use]
    pub fn half_width(&self) -> Option<f64> {
        self.se
            .filter(|_| self.reason.is_none())
            .map(|se| NORMAL_95 * se)
    }
}

/// Half of the central 95 % of a normal distribution, in standard deviations.
const NORMAL_95: f64 = 1.959_963_984_540_054;

/// Every figure, in the order of [`FigureName::ALL`].
#[derive(Debug, Clone, PartialEq)]
pub struct FigureTable([Figure; FigureName::ALL.len()]);

impl FigureTable {
    /// Names and figures.
    pub fn iter(&self) -> impl Iterator<Item = (FigureName, &Figure)> {
        FigureName::ALL.into_iter().zip(&self.0)
    }

    /// One of them.
    #[must_use]
    pub fn get(&self, name: FigureName) -> &Figure {
        &self.0[name as usize]
    }
}

const NO_NOISE: &str = "no noise was stated";
const NOT_ASKED: &str = "no draws were asked for";
const NEAR_ZERO: &str = "within three standard errors of 0: read it as an upper limit";
const NEAR_EIGENVALUES: &str =
    "two eigenvalues lie within three standard errors, so there is no first-order error";
const WIDE_ANGLE: &str = "the noise leaves more than half of the period open";
const NOT_SMOOTH: &str =
    "not determined for a slightly different matrix, so there is no first-order error";

/// All figures of one analysis; with their standard errors where `with_errors`.
pub(crate) fn figures(analysis: &Analysis, with_errors: bool) -> Result<FigureTable> {
    let values = FigureName::ALL.map(|name| analysis.value(name));
    let errors = if with_errors && analysis.measurement.has_noise() {
        Some(standard_errors(analysis)?)
    } else {
        None
    };
    let none = if analysis.measurement.has_noise() {
        NOT_ASKED
    } else {
        NO_NOISE
    };
    Ok(FigureTable(std::array::from_fn(|k| {
        let value = match values[k] {
            Ok(value) => value,
            Err(reason) => {
                return Figure {
                    value: None,
                    se: None,
                    reason: Some(reason),
                };
            }
        };
        match &errors {
            None => Figure {
                value: Some(value),
                se: None,
                reason: Some(none),
            },
            Some(errors) => judge(FigureName::ALL[k], value, errors[k], analysis),
        }
    })))
}

fn judge(name: FigureName, value: f64, error: Option<f64>, analysis: &Analysis) -> Figure {
    let figure = |value, se, reason| Figure { value, se, reason };
    let Some(se) = error else {
        return figure(Some(value), None, Some(NOT_SMOOTH));
    };
    if name.orders_eigenvalues() && !distinct_eigenvalues(analysis) {
        return figure(Some(value), None, Some(NEAR_EIGENVALUES));
    }
    if name
        .period()
        .is_some_and(|period| 2.0 * NORMAL_95 * se > period / 2.0)
    {
        return figure(None, None, Some(WIDE_ANGLE));
    }
    if name.is_length() && value < tolerance::STANDARD_ERRORS * se {
        return figure(Some(value), Some(se), Some(NEAR_ZERO));
    }
    figure(Some(value), Some(se), None)
}

fn distinct_eigenvalues(analysis: &Analysis) -> bool {
    let Some(errors) = eigenvalue_errors(&analysis.measurement, &analysis.eigen) else {
        return false;
    };
    (0..3).all(|k| {
        let gap = analysis.eigen.values[k] - analysis.eigen.values[k + 1];
        gap > tolerance::STANDARD_ERRORS * errors[k].max(errors[k + 1])
    })
}

/// `sqrt(gᵀ Σ g)` with the gradient g by central differences.
fn standard_errors(analysis: &Analysis) -> Result<[Option<f64>; FigureName::ALL.len()]> {
    let measurement = &analysis.measurement;
    let elements = measurement.mueller().row_major();
    let sigma = measurement.element_sigma().unwrap_or_default();
    let step = 1e-6 * measurement.mueller().m00().abs();
    let mut gradients = [Some([0.0; 16]); FigureName::ALL.len()];
    if step == 0.0 {
        return Ok([None; FigureName::ALL.len()]);
    }
    for k in (0..16).filter(|&k| sigma[k] > 0.0) {
        let moved = |by: f64| {
            let mut elements = elements;
            elements[k] += by;
            let mueller = Mueller::from_matrix(nalgebra::Matrix4::from_row_slice(&elements));
            Analysis::of(&measurement.with_mueller(mueller))
        };
        let (above, below) = (moved(step)?, moved(-step)?);
        for (gradient, name) in gradients.iter_mut().zip(FigureName::ALL) {
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
    }
    Ok(gradients.map(|gradient| {
        gradient
            .and_then(|gradient| measurement.standard_error(&gradient))
            .filter(|se| se.is_finite())
    }))
}
