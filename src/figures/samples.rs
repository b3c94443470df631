use super::values::{Analysis, FigureName};
use crate::error::Result;
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::stats::NormalDraws;

/// Figures of simulated measurements around the measured one.
pub(crate) struct Samples {
    /// For each figure the values that were determined.
    values: Vec<Vec<f64>>,
    draws: usize,
}

impl Samples {
    /// `draws` measurements, seeded.
    pub fn of(measurement: &Measurement, draws: u32, seed: u64) -> Result<Self> {
        let mut normal = NormalDraws::new(seed);
        let elements = measurement.mueller().row_major();
        let mut values = vec![Vec::with_capacity(draws as usize); FigureName::ALL.len()];
        for _ in 0..draws {
            let errors = measurement.draw(&mut normal);
            let moved = nalgebra::Matrix4::from_fn(|i, j| elements[4 * i + j] + errors[4 * i + j]);
            let analysis = Analysis::of(&measurement.with_mueller(Mueller::from_matrix(moved)))?;
            for (values, name) in values.iter_mut().zip(FigureName::ALL) {
                values.extend(analysis.value(name));
            }
        }
        Ok(Self {
            values,
            draws: draws as usize,
        })
    }

    /// The values of one figure, periodic ones unwrapped about `centre`, and the share of
    /// the draws that determined it. `None` without any.
    pub fn of_figure(&self, name: FigureName, centre: f64) -> Option<(Vec<f64>, f64)> {
        let values = &self.values[name as usize];
        let unwrapped = values.iter().map(|&value| match name.period() {
            Some(period) => value - period * ((value - centre) / period).round(),
            None => value,
        });
        let share = values.len() as f64 / self.draws.max(1) as f64;
        (!values.is_empty()).then(|| (unwrapped.collect(), share))
    }
}
