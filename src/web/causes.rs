//! What diagnoses and comparisons look like from JavaScript.

use serde::Serialize;

use super::examination::unit_of;
use crate::coherency::{Candidate, Cause};
use crate::convention::Convention;
use crate::figures::Comparison;

/// Every improper map of one side that is a likely slip.
const MIRRORS: [&str; 14] = [
    "row-1-sign",
    "row-2-sign",
    "row-3-sign",
    "three-row-signs",
    "rows-1-2",
    "rows-1-3",
    "rows-2-3",
    "column-1-sign",
    "column-2-sign",
    "column-3-sign",
    "three-column-signs",
    "columns-1-2",
    "columns-1-3",
    "columns-2-3",
];

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub struct DiagnosisTwin {
    pub explaining_sigma: Option<f64>,
    pub mirror_visible: bool,
    pub causes: Vec<CauseTwin>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub struct CauseTwin {
    cause: &'static str,
    p_value: f64,
    candidates: Option<[&'static str; 14]>,
    delta: Option<f64>,
    element: Option<[usize; 2]>,
    line: Option<usize>,
    factor: Option<f64>,
    mueller: [f64; 16],
}

impl CauseTwin {
    pub fn new(candidate: &Candidate, convention: &Convention) -> Self {
        let mut twin = Self {
            cause: "",
            p_value: candidate.p_value,
            candidates: None,
            delta: None,
            element: None,
            line: None,
            factor: None,
            mueller: convention.mueller(&candidate.mended).row_major(),
        };
        twin.cause = match candidate.cause {
            Cause::MirrorOneSide => {
                twin.candidates = Some(MIRRORS);
                "mirror-one-side"
            }
            Cause::M00TooSmall { delta } => {
                twin.delta = Some(delta);
                "m00-too-small"
            }
            Cause::OneElement { element, .. } => {
                twin.element = Some([element / 4, element % 4]);
                "one-element"
            }
            Cause::RowGain { row, factor } => {
                (twin.line, twin.factor) = (Some(row), Some(factor));
                "row-gain"
            }
            Cause::ColumnGain { column, factor } => {
                (twin.line, twin.factor) = (Some(column), Some(factor));
                "column-gain"
            }
            Cause::OverallSign => "overall-sign",
        };
        twin
    }
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub struct ComparisonTwin {
    difference: [f64; 16],
    difference_in_sigma: Option<[f64; 16]>,
    chi_square: Option<f64>,
    degrees_of_freedom: u32,
    p_value: Option<f64>,
    figures: Vec<DifferenceTwin>,
    reason: Option<&'static str>,
}

#[derive(Serialize)]
struct DifferenceTwin {
    name: &'static str,
    value: Option<f64>,
    se: Option<f64>,
    unit: &'static str,
}

impl ComparisonTwin {
    pub fn new(found: &Comparison, convention: &Convention) -> Self {
        let signs = convention.element_signs();
        let signed = |elements: [f64; 16]| std::array::from_fn(|k| signs[k] * elements[k]);
        Self {
            difference: signed(found.difference),
            difference_in_sigma: found.in_sigma.map(signed),
            chi_square: found.chi_square,
            degrees_of_freedom: found.degrees_of_freedom,
            p_value: found.p_value,
            figures: found
                .figures
                .iter()
                .map(|(name, difference)| {
                    let (key, unit, factor) = unit_of(*name, convention);
                    DifferenceTwin {
                        name: key,
                        value: difference.value.map(|value| factor * value),
                        se: difference.se.map(|se| factor.abs() * se),
                        unit,
                    }
                })
                .collect(),
            reason: found
                .chi_square
                .is_none()
                .then_some("the noise of both measurements is needed"),
        }
    }
}
