use nalgebra::SVector;

use super::candidate::{Fit, Fitter, no_fit};
use super::derived;
use super::least_squares::minimise;
use super::parameters::{Name, reported};
use super::target::{ModelProblem, row_major};
use crate::error::{Error, Result};
use crate::stats::NormalDraws;

/// Steps between the seeds of neighbouring samples: an odd number without a pattern.
const STRIDE: u64 = 0x9e37_79b9_7f4a_7c15;

/// A slice of simulated measurements of a fitted matrix, each fitted again.
#[derive(Debug, Clone, PartialEq)]
pub struct Samples {
    /// Parameters of the model, then what follows from them.
    pub names: Vec<Name>,
    /// For each name one value a sample; `None` where the sample does not determine it.
    /// Periodic ones lie around the estimate.
    pub values: Vec<Vec<Option<f64>>>,
    /// χ² of each.
    pub chi_square: Vec<f64>,
}

impl Fitter<'_> {
    /// The samples from `first` on, `count` of them (parametric bootstrap, Efron 1979): each
    /// has a seed of its own, so that slices join to the same numbers however they are cut.
    ///
    /// # Errors
    /// `no-bootstrap` for a mixture, or without noise and degrees of freedom.
    pub fn bootstrap(&self, fit: &Fit, first: u64, count: u32) -> Result<Samples> {
        let refuse = || {
            Error::new(
                "no-bootstrap",
                "Nothing is known of the noise here, or the model is a mixture without parameters of its own.",
            )
            .at_field("model")
        };
        let scale = self
            .scale_of(fit)
            .filter(|_| !fit.model.is_mixture())
            .ok_or_else(refuse)?;
        let (shape, unit) = (fit.solved.shape, self.target.unit);
        let mean = row_major(&shape.evaluate(&fit.solved.x).matrix);
        let centres: Vec<(Name, f64)> = fit
            .parameters
            .iter()
            .chain(&fit.derived)
            .map(|parameter| (parameter.name, parameter.value))
            .collect();
        let mut samples = Samples {
            names: centres.iter().map(|(name, _)| *name).collect(),
            values: vec![Vec::new(); centres.len()],
            chi_square: Vec::new(),
        };
        let own = fit.solved.x.len() - shape.model.depolarizations();
        let shift = fit.parameters.len();
        for k in first..first.saturating_add(u64::from(count)) {
            let seed = self
                .seed
                .wrapping_add(k.wrapping_add(1).wrapping_mul(STRIDE));
            let mut draws = NormalDraws::new(seed);
            let errors = if self.measurement.has_noise() {
                self.measurement.draw_known(&mut draws)
            } else {
                let sigma = scale.sqrt() * unit;
                let mut errors = draws.draw_matrix().map(|draw| sigma * draw);
                if self.target.m00_is_exact {
                    errors[0] = 0.0;
                }
                errors
            };
            let target = self.target.around(mean + SVector::from(errors) / unit);
            let mut x = fit.solved.x.clone();
            let mut sum = 0.0;
            for target in &target.stages() {
                let problem = ModelProblem {
                    target,
                    shape,
                    fixed: None,
                };
                let minimum = minimise(&problem, &x).ok_or_else(no_fit)?;
                (x, sum) = (
                    problem.to_scale(&minimum.parameters),
                    minimum.sum_of_squares,
                );
            }
            let report = reported(&shape, &x, unit);
            let follows = derived::quantities(&shape, &x[..own], unit)?;
            for (place, &(name, centre)) in centres.iter().enumerate() {
                let value = if place < shift {
                    report.values.get(place).copied()
                } else {
                    follows
                        .iter()
                        .find(|(other, _)| *other == name)
                        .map(|(_, value)| *value)
                };
                samples.values[place].push(value.map(|value| match name.period() {
                    Some(period) => value - period * ((value - centre) / period).round(),
                    None => value,
                }));
            }
            samples.chi_square.push(sum / scale);
        }
        Ok(samples)
    }
}
