use super::candidate::Fit;
use super::models::{Model, Side};
use super::parameters::Name;
use crate::error::Result;
use crate::stats::{normal_95, rounded};
use crate::tolerance;

/// A p below this is written as such.
const LEAST_P: f64 = 1e-6;

/// The share of the squared residuals that names their place.
const MOST_OF_IT: f64 = 0.6;

/// The α beyond which no parallel mixture is realizable: 4/3.
const MOST_ALPHA: f64 = 4.0 / 3.0;

const NEGATIVE: &str = "α lies below 0 by more than its error, which no sample has: the gain of the first element is low, or too much background was subtracted.";

const MIRRORED: &str = "α lies beyond 4/3, which no sample has: the polarization that is left is turned over, so one side is counted the other way round.";

/// What decided.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Rule {
    /// The fewest parameters with p of 0.05 or more, ties by the lower χ².
    PValue,
    /// Akaike's criterion: the noise is unknown, or no model passes.
    Criterion,
}

/// Which of several fits to take, and why.
#[derive(Debug, Clone, PartialEq)]
pub struct Recommendation {
    /// Among the fits.
    pub index: usize,
    /// What decided.
    pub rule: Rule,
    /// Why, in words, angles left out.
    pub sentence: String,
}

/// The smallest model that explains the measurement; `None` where nothing can be compared.
///
/// # Errors
/// `not-finite`, which a fit can't hold.
pub fn recommend(fits: &[Fit]) -> Result<Option<Recommendation>> {
    let passes = |fit: &Fit| fit.p_value.is_some_and(|p| p >= tolerance::SIGNIFICANCE);
    let size = |fit: &Fit| fit.model.parameter_count();
    let misfit = |fit: &Fit| fit.chi_square.unwrap_or(fit.rms);
    let smallest = (0..fits.len())
        .filter(|&k| passes(&fits[k]))
        .min_by(|&a, &b| {
            size(&fits[a])
                .cmp(&size(&fits[b]))
                .then(misfit(&fits[a]).total_cmp(&misfit(&fits[b])))
        });
    let (index, rule) = match smallest {
        Some(index) => (index, Rule::PValue),
        None => {
            let lowest = (0..fits.len())
                .filter_map(|k| Some((k, fits[k].aic?)))
                .min_by(|a, b| a.1.total_cmp(&b.1));
            match lowest {
                Some((index, _)) => (index, Rule::Criterion),
                None => return Ok(None),
            }
        }
    };
    Ok(Some(Recommendation {
        index,
        rule,
        sentence: sentence(fits, index, rule)?,
    }))
}

fn sentence(fits: &[Fit], index: usize, rule: Rule) -> Result<String> {
    let fit = &fits[index];
    let described = described(fit)?;
    if rule == Rule::Criterion {
        return Ok(if fit.p_value.is_none() && fit.chi_square.is_none() {
            format!(
                "No noise is stated, so no model can be tested. Of these, {described} has the lowest criterion (AIC)."
            )
        } else {
            format!(
                "None of these models explains the matrix within the stated noise. {} has the lowest criterion (AIC); the misfit sits in {}.",
                capital(&described),
                place_of(&fit.residuals)
            )
        });
    }
    let count = fit.model.parameter_count();
    if fit.model == Model::RankFour {
        return Ok(format!(
            "No smaller model explains the matrix within its noise. It is realizable, {}, and needs all of its sixteen numbers.",
            p_text(fit)
        ));
    }
    let mut words = format!(
        "{} parameters suffice: {described}, {}.",
        number(count),
        p_text(fit)
    );
    // The one that comes nearest with fewer parameters says why these are needed.
    let simpler = fits
        .iter()
        .filter(|other| other.model.parameter_count() < count && other.chi_square.is_some())
        .min_by(|a, b| {
            let key = |fit: &Fit| fit.chi_square.unwrap_or(f64::INFINITY);
            key(a).total_cmp(&key(b))
        });
    if let Some(simpler) = simpler {
        words.push_str(&format!(
            " {} does not: {}; the misfit sits in {}.",
            capital(name_of(simpler.model)),
            p_text(simpler),
            place_of(&simpler.residuals)
        ));
    }
    // A recommendation of what can't be says so.
    for remark in remarks(fit) {
        if [NEGATIVE, MIRRORED].contains(&remark) {
            words.push_str(&format!(" But {remark}"));
        }
    }
    Ok(words)
}

/// What a fit should be read with, in words.
#[must_use]
pub fn remarks(fit: &Fit) -> Vec<&'static str> {
    let mut remarks = Vec::new();
    let alpha = fit
        .parameters
        .iter()
        .find(|parameter| parameter.name == Name::Alpha);
    if let Some(alpha) = alpha {
        let reach = alpha.se.map_or(0.0, |se| normal_95() * se);
        if alpha.value < -reach && alpha.value < 0.0 {
            remarks.push(NEGATIVE);
        } else if alpha.value < 0.0 {
            remarks.push("α lies below 0, within its error: no depolarization is seen.");
        } else if alpha.value - reach > MOST_ALPHA && fit.side == Some(Side::Parallel) {
            remarks.push(MIRRORED);
        } else if alpha.value - reach > 1.0 {
            remarks.push("α lies above 1: nearly all polarization is lost and what is left is turned over, as it is where one side is counted the other way round.");
        }
        if fit.side == Some(Side::Parallel) {
            remarks.push(
                "Constant stray light looks the same as α; only a measurement without it tells.",
            );
        }
    }
    remarks
}

fn described(fit: &Fit) -> Result<String> {
    let name = name_of(fit.model);
    let alpha = fit
        .parameters
        .iter()
        .find(|parameter| parameter.name == Name::Alpha);
    Ok(match alpha {
        Some(alpha) => format!("{name} with α = {}", rounded(alpha.value, alpha.se)?.text),
        None => name.to_owned(),
    })
}

fn name_of(model: Model) -> &'static str {
    match model {
        Model::LinearRetarder => "a linear retarder",
        Model::LinearDiattenuator => "a linear diattenuator",
        Model::AlignedDiattenuatingRetarder => "an aligned diattenuating retarder",
        Model::EllipticalRetarder => "an elliptical retarder",
        Model::EllipticalDiattenuator => "an elliptical diattenuator",
        Model::Pure => "a pure element without depolarization",
        Model::PureIsotropic => "a pure element",
        Model::PureLinearCircular => {
            "a pure element with one depolarization of linear and one of circular light"
        }
        Model::PureDiagonal => "a pure element with a diagonal depolarizer",
        Model::RankTwo => "a mixture of two pure elements",
        Model::RankThree => "a mixture of three pure elements",
        Model::RankFour => "any realizable matrix",
    }
}

fn p_text(fit: &Fit) -> String {
    match fit.p_value {
        None => "without a test".to_owned(),
        Some(p) if fit.simulations > 0 && p <= 1.01 / f64::from(1 + fit.simulations) => {
            format!("p ≤ {p:.3}")
        }
        Some(p) if p < LEAST_P => "p < 1e-6".to_owned(),
        Some(p) if p < 0.001 => format!("p = {p:.0e}"),
        Some(p) if p < 0.095 => format!("p = {p:.3}"),
        Some(p) => format!("p = {p:.2}"),
    }
}

/// Where most of the misfit is.
fn place_of(residuals: &[f64; 16]) -> &'static str {
    let whole: f64 = residuals.iter().map(|r| r * r).sum();
    let share = |places: &[usize]| {
        places
            .iter()
            .map(|&k| residuals[k] * residuals[k])
            .sum::<f64>()
            / whole.max(f64::MIN_POSITIVE)
    };
    let places: [(&[usize], &str); 6] = [
        (&[15], "the last element, of circular light"),
        (&[13, 14, 7, 11, 15], "the circular row and column"),
        (&[1, 2, 3], "the first row, the diattenuation"),
        (&[4, 8, 12], "the first column, the polarizance"),
        (
            &[1, 2, 3, 4, 8, 12],
            "the first row and column, diattenuation and polarizance",
        ),
        (&[5, 6, 9, 10], "the block of linear light"),
    ];
    places
        .iter()
        .find(|(elements, _)| share(elements) > MOST_OF_IT)
        .map_or("all parts of the matrix", |(_, words)| words)
}

fn number(count: usize) -> &'static str {
    match count {
        4 => "Four",
        5 => "Five",
        7 => "Seven",
        8 => "Eight",
        9 => "Nine",
        10 => "Ten",
        12 => "Twelve",
        15 => "Fifteen",
        _ => "Sixteen",
    }
}

fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters
        .next()
        .map(|first| first.to_uppercase().chain(letters).collect())
        .unwrap_or_default()
}
