use super::errors::Gradients;
use super::values::{Analysis, FigureName};
use crate::error::Result;
use crate::noise::Measurement;

/// How two measurements differ.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    /// The second minus the first, row by row.
    pub difference: [f64; 16],
    /// The same in standard deviations of the difference; `None` where a noise is not
    /// stated, zero for an element that is exact in both.
    pub in_sigma: Option<[f64; 16]>,
    /// `dᵀ Σ⁻¹ d` over the elements that are not exact in both, Σ that of the difference.
    pub chi_square: Option<f64>,
    /// How many these are.
    pub degrees_of_freedom: u32,
    /// Of that: χ², or what takes its place where a noise is an estimate
    /// ([`Measurement::tail`]).
    pub p_value: Option<f64>,
    /// Differences of the figures with their standard errors, angles in radians.
    pub figures: Vec<(FigureName, Difference)>,
}

/// How a figure differs.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Difference {
    /// The second minus the first; `None` where one is not determined.
    pub value: Option<f64>,
    /// First-order standard error.
    pub se: Option<f64>,
}

/// Compares two measurements with independent noise. The same systematic statement for both
/// is that of one instrument: its errors are shared, and mostly cancel.
///
/// # Errors
/// `no-convergence`; those of [`Covariance::new`](crate::stats::Covariance::new).
pub fn compare(first: &Measurement, second: &Measurement) -> Result<Comparison> {
    let (a, b) = (first.mueller().row_major(), second.mueller().row_major());
    let difference: [f64; 16] = std::array::from_fn(|k| b[k] - a[k]);
    let (covariance, freedom) = first.of_difference(second)?.unzip();
    let in_sigma = covariance.as_ref().map(|covariance| {
        std::array::from_fn(|k| {
            if covariance.is_held(k) {
                0.0
            } else {
                difference[k] / covariance.sigma(k)
            }
        })
    });
    let free = covariance.as_ref().map_or(0, |covariance| {
        (0..16).filter(|&k| !covariance.is_held(k)).count()
    });
    let degrees_of_freedom = u32::try_from(free).unwrap_or_default();
    let chi_square = covariance
        .as_ref()
        .map(|covariance| covariance.squared_distance(&difference).min(f64::MAX));
    let analyses = (Analysis::of(first)?, Analysis::of(second)?);
    let gradients = match &covariance {
        Some(_) => Some((Gradients::of(&analyses.0)?, Gradients::of(&analyses.1)?)),
        None => None,
    };
    let figures = FigureName::ALL.map(|name| {
        let values = analyses.0.value(name).ok().zip(analyses.1.value(name).ok());
        let value = values.map(|(first, second)| {
            let difference = second - first;
            let period = name.period().unwrap_or(f64::INFINITY);
            if period.is_finite() {
                difference - period * (difference / period).round()
            } else {
                difference
            }
        });
        let se = gradients.as_ref().and_then(|(one, other)| {
            let of = |gradients: &Gradients| gradients.figures[name as usize];
            first
                .standard_error_of_difference(&of(one)?, second, &of(other)?)
                .filter(|se| se.is_finite())
        });
        (
            name,
            Difference {
                value,
                se: value.and(se),
            },
        )
    });
    Ok(Comparison {
        difference,
        in_sigma,
        p_value: chi_square
            .zip(freedom)
            .and_then(|(value, freedom)| freedom.tail(value, degrees_of_freedom)),
        chi_square,
        degrees_of_freedom,
        figures: figures.to_vec(),
    })
}
