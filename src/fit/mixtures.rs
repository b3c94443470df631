use nalgebra::{DVector, Matrix4, SVector};

use super::candidate::{Fitter, Judge, Parameter};
use super::least_squares::minimise_roughly;
use super::models::{Model, Shape, Side};
use super::parameters::Name;
use super::starts::mixture_start;
use super::target::{ModelProblem, row_major};
use crate::coherency::{Coherency, eigenvalue_errors, eigenvalue_gradient};
use crate::error::Result;
use crate::stats::NormalDraws;
use crate::tolerance;

/// Simulated measurements where each takes an eigendecomposition.
const MANY: u32 = 999;

/// Simulated measurements where each takes a fit of its own.
const FEW: u32 = 99;

/// What a fit left.
pub(super) struct Outcome<'a> {
    /// In units of M00.
    pub matrix: &'a Matrix4<f64>,
    /// Of squares.
    pub sum: f64,
}

/// The transmittance, and the shares of the Jones matrices in the spectral decomposition of
/// the mixture.
pub(super) fn weights(
    shape: &Shape,
    x: &[f64],
    unit: f64,
    judge: &Judge<'_>,
) -> Result<Vec<Parameter>> {
    let evaluated = shape.evaluate(x);
    let elements: [f64; 16] = row_major(&evaluated.matrix).into();
    let eigen = Coherency::from_elements(&elements).eigen()?;
    let trace = elements[0];
    let along = |gradient: &[f64; 16]| {
        DVector::from_iterator(
            x.len(),
            evaluated.derivatives.iter().map(|derivative| {
                row_major(derivative)
                    .iter()
                    .zip(gradient)
                    .map(|(a, b)| a * b)
                    .sum::<f64>()
            }),
        )
    };
    let mut first = [0.0; 16];
    first[0] = unit;
    // The redundancy of the triangle is no doubt about the matrix.
    let judge = Judge {
        null: &[],
        ..*judge
    };
    let mut all = vec![judge.parameter(Name::Transmittance, unit * trace, &along(&first), false)];
    if trace <= 0.0 {
        return Ok(all);
    }
    for k in 0..shape.model.rank().unwrap_or(1) {
        let share = eigen.values[k] / trace;
        let mut gradient = eigenvalue_gradient(&eigen.vectors[k]).map(|value| value / trace);
        gradient[0] -= share / trace;
        let at_bound = share < tolerance::NOT_DETERMINED;
        all.push(judge.parameter(Name::Weight(k), share.max(0.0), &along(&gradient), at_bound));
    }
    Ok(all)
}

/// The share of simulated measurements of the fitted mixture that such a mixture explains no
/// better. Eigenvalues of the mixture below three of their standard errors are zero in it, the
/// largest excepted (generalised moment selection, Andrews & Soares 2010): χ² would reject
/// three Jones matrices half of the time where one is enough.
pub(super) fn p_value(
    fitter: &Fitter<'_>,
    model: Model,
    outcome: &Outcome<'_>,
) -> Result<(Option<f64>, u32)> {
    let measurement = fitter.measurement;
    let rank = model.rank().unwrap_or(4);
    let elements: [f64; 16] = row_major(outcome.matrix).into();
    let eigen = Coherency::from_elements(&elements).eigen()?;
    let errors = eigenvalue_errors(measurement, &eigen).unwrap_or_default();
    let unit = fitter.target.unit;
    let mut spectrum = eigen.values;
    for (value, error) in spectrum.iter_mut().zip(errors).skip(1) {
        if *value < tolerance::STANDARD_ERRORS * error / unit {
            *value = 0.0;
        }
    }
    let m00 = fitter.target.elements[0];
    let sum: f64 = spectrum.iter().sum();
    if fitter.target.m00_is_exact && sum > 0.0 {
        spectrum = spectrum.map(|value| value * m00 / sum);
    }
    let mean = Coherency::from_spectrum(&spectrum, &eigen)
        .mueller()
        .row_major();
    let mut draws = NormalDraws::new(fitter.seed);
    let mut beyond = 0_u32;
    let simulations = if measurement.equal_sigma().is_some() {
        MANY
    } else {
        FEW
    };
    for _ in 0..simulations {
        let ratio = measurement
            .sigma_freedom()
            .map_or(1.0, |freedom| draws.draw_sigma_ratio(freedom));
        let errors = measurement.draw_known(&mut draws);
        let simulated: [f64; 16] = std::array::from_fn(|k| mean[k] + errors[k] / unit);
        let least = match measurement.equal_sigma() {
            Some(sigma) => {
                let exact = fitter.target.m00_is_exact.then_some(m00);
                distance(&simulated, rank, exact)? * (unit / sigma).powi(2)
            }
            None => {
                let target = fitter.target.around(SVector::from(simulated));
                let eigen = Coherency::from_elements(&simulated).eigen()?;
                let (x, pivots) = mixture_start(&eigen, rank);
                let shape = Shape {
                    model,
                    side: Side::Parallel,
                    pivots,
                    is_polarizer: false,
                };
                let mut found = (x, f64::INFINITY);
                for target in &target.stages() {
                    let problem = ModelProblem {
                        target,
                        shape,
                        fixed: None,
                    };
                    if let Some(minimum) = minimise_roughly(&problem, &found.0) {
                        found = (minimum.parameters, minimum.sum_of_squares);
                    }
                }
                found.1
            }
        };
        beyond += u32::from(least >= outcome.sum * ratio * ratio);
    }
    Ok((
        Some(f64::from(1 + beyond) / f64::from(1 + simulations)),
        simulations,
    ))
}

/// The squared distance to the nearest mixture of so many Jones matrices, for equal errors:
/// the largest eigenvalues stay, clipped at zero, or projected on an exact sum.
fn distance(elements: &[f64; 16], rank: usize, exact: Option<f64>) -> Result<f64> {
    let values = Coherency::from_elements(elements).eigen()?.values;
    let kept = kept_spectrum(&values, rank, exact);
    Ok(4.0
        * values
            .iter()
            .zip(kept)
            .map(|(a, b)| (a - b).powi(2))
            .sum::<f64>())
}

/// The nearest spectrum with only so many values that are not zero.
pub(super) fn kept_spectrum(values: &[f64; 4], rank: usize, exact: Option<f64>) -> [f64; 4] {
    match exact {
        Some(sum) => head_spectrum(values, rank, sum),
        None => std::array::from_fn(|k| if k < rank { values[k].max(0.0) } else { 0.0 }),
    }
}

/// The nearest spectrum of this sum with only so many values that are not zero.
fn head_spectrum(values: &[f64; 4], rank: usize, sum: f64) -> [f64; 4] {
    let mut shift = 0.0;
    let mut head = 0.0;
    for (count, value) in (1..=rank).zip(values) {
        head += value;
        let candidate = (head - sum) / count as f64;
        if count == 1 || value - candidate > 0.0 {
            shift = candidate;
        }
    }
    std::array::from_fn(|k| {
        if k < rank {
            (values[k] - shift).max(0.0)
        } else {
            0.0
        }
    })
}
