use nalgebra::{DMatrix, DVector};

use super::candidate::{Fit, Fitter, Parameter};
use super::derived;
use super::least_squares::{Problem, minimise};
use super::models::Shape;
use super::parameters::{Name, reported};
use super::target::{ModelProblem, Target};
use crate::error::{Error, Result};

/// Points on each side of the estimate.
const POINTS: u32 = 24;

/// How far the curve goes, in standard errors.
const REACH: f64 = 4.0;

/// χ² rises by this at the ends of 95 %.
const RISE_95: f64 = 3.841_458_820_694_124;

/// The held parameter weighs as if its error were this share of what it has.
const HOLD: f64 = 1e-4;

/// How χ² rises where one parameter is held and all others are fitted again.
#[derive(Debug, Clone, PartialEq)]
pub struct Profile {
    /// The held value, ascending.
    pub values: Vec<f64>,
    /// χ² less its minimum; without noise in units of the residual variance.
    pub rises: Vec<f64>,
    /// Where it has risen by 3.84; `None` where it does not on that side.
    pub low: Option<f64>,
    /// The same above.
    pub high: Option<f64>,
}

/// A model with one quantity held.
struct Held<'a> {
    model: ModelProblem<'a>,
    name: Name,
    value: f64,
    weight: f64,
    unit: f64,
}

impl Problem for Held<'_> {
    fn evaluate(&self, x: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let (residuals, jacobian) = self.model.evaluate(x)?;
        let (value, slopes) = quantity(&self.model.shape, x, self.unit, self.name)?;
        let mut off = value - self.value;
        if let Some(period) = self.name.period() {
            off -= period * (off / period).round();
        }
        let rows = residuals.len();
        let mut residuals = residuals.insert_row(rows, 0.0);
        let mut jacobian = jacobian.insert_row(rows, 0.0);
        residuals[rows] = self.weight * off;
        for (k, slope) in slopes.iter().enumerate() {
            jacobian[(rows, k)] = self.weight * slope;
        }
        Some((residuals, jacobian))
    }
}

/// One reported or derived quantity with its derivatives.
fn quantity(shape: &Shape, x: &[f64], unit: f64, name: Name) -> Option<(f64, Vec<f64>)> {
    let report = reported(shape, x, unit);
    if let Some(place) = report.names.iter().position(|&other| other == name) {
        let slopes = report.derivatives.row(place).iter().copied().collect();
        return Some((report.values[place], slopes));
    }
    let own = x.len() - shape.model.depolarizations();
    let value = |x: &[f64]| {
        let all = derived::quantities(shape, &x[..own], unit).ok()?;
        all.into_iter()
            .find(|&(other, _)| other == name)
            .map(|(_, value)| value)
    };
    const STEP: f64 = 1e-6;
    let centre = value(x)?;
    let mut slopes = vec![0.0; x.len()];
    for (k, slope) in slopes.iter_mut().enumerate().take(own) {
        let mut moved = x.to_vec();
        moved[k] += STEP;
        let above = value(&moved)?;
        moved[k] -= 2.0 * STEP;
        let mut difference = above - value(&moved)?;
        if let Some(period) = name.period() {
            difference -= period * (difference / period).round();
        }
        *slope = difference / (2.0 * STEP);
    }
    Some((centre, slopes))
}

impl Fitter<'_> {
    /// The profile of one quantity of a fit.
    ///
    /// # Errors
    /// `no-profile` where the fit has no such quantity, or nothing determines it.
    pub fn profile(&self, fit: &Fit, name: Name) -> Result<Profile> {
        let refuse = || {
            Error::new(
                "no-profile",
                "This fit does not determine that parameter, so χ² has no curve over it.",
            )
            .at_field("parameter")
        };
        let found: &Parameter = fit
            .parameters
            .iter()
            .chain(&fit.derived)
            .find(|parameter| parameter.name == name)
            .ok_or_else(refuse)?;
        let se = found.se.filter(|se| *se > 0.0).ok_or_else(refuse)?;
        let (shape, unit) = (fit.solved.shape, self.target.unit);
        let scale = self.scale_of(fit).ok_or_else(refuse)?;
        let least = self.misfit(&self.target, shape, &fit.solved.x);
        let stages = self.target.stages();
        let mut points = vec![(found.value, 0.0)];
        for side in [-1.0, 1.0] {
            let mut start = fit.solved.x.clone();
            for k in 1..=POINTS {
                let value = found.value + side * REACH * se * f64::from(k) / f64::from(POINTS);
                if !in_range(name, value) {
                    break;
                }
                let found = stages.iter().try_fold(start.clone(), |start, target| {
                    let problem = Held {
                        model: ModelProblem {
                            target,
                            shape,
                            fixed: None,
                        },
                        name,
                        value,
                        weight: scale.sqrt() / (HOLD * se),
                        unit,
                    };
                    minimise(&problem, &start)
                        .map(|minimum| problem.model.to_scale(&minimum.parameters))
                });
                let Some(found) = found else {
                    break;
                };
                start = found;
                // The row that holds the parameter is not a misfit.
                let sum = self.misfit(&self.target, shape, &start);
                points.push((value, ((sum - least) / scale).max(0.0)));
            }
        }
        points.sort_by(|a, b| a.0.total_cmp(&b.0));
        let centre = points
            .iter()
            .position(|&(value, _)| value == found.value)
            .unwrap_or_default();
        let low = crossing(points[..=centre].windows(2).rev().map(|w| (w[1], w[0])));
        let high = crossing(points[centre..].windows(2).map(|w| (w[0], w[1])));
        Ok(Profile {
            values: points.iter().map(|point| point.0).collect(),
            rises: points.iter().map(|point| point.1).collect(),
            low,
            high,
        })
    }

    fn misfit(&self, target: &Target, shape: Shape, x: &[f64]) -> f64 {
        let evaluated = shape.evaluate(x);
        target.residuals(&evaluated.matrix, &[]).0.norm_squared()
    }

    /// The variance of the residuals: one where the noise is stated.
    pub(super) fn scale_of(&self, fit: &Fit) -> Option<f64> {
        if self.measurement.has_noise() {
            return Some(1.0);
        }
        let sum = self.misfit(&self.target, fit.solved.shape, &fit.solved.x);
        (fit.degrees_of_freedom > 0 && sum > 0.0).then(|| sum / f64::from(fit.degrees_of_freedom))
    }
}

fn in_range(name: Name, value: f64) -> bool {
    match name {
        Name::Diattenuation => (0.0..=1.0).contains(&value),
        Name::Retardance => (0.0..=std::f64::consts::PI).contains(&value),
        Name::Transmittance | Name::DepolarizationLinear => value > 0.0,
        _ => true,
    }
}

/// Where the root of the rise, which is nearly straight, passes that of 95 %.
fn crossing(mut pairs: impl Iterator<Item = ((f64, f64), (f64, f64))>) -> Option<f64> {
    let (near, far) = pairs.find(|(near, far)| near.1 < RISE_95 && far.1 >= RISE_95)?;
    let (a, b, c) = (near.1.sqrt(), far.1.sqrt(), RISE_95.sqrt());
    Some(near.0 + (far.0 - near.0) * (c - a) / (b - a))
}
