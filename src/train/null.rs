use nalgebra::DMatrix;

use super::sequence::Place;
use super::{Quantity, Train};
use crate::convention::Convention;
use crate::linalg::column_svd;

/// Parameters of which only some combinations are determined.
#[derive(Debug, Clone, PartialEq)]
pub struct NullDirection {
    /// The parameters.
    pub places: Vec<Place>,
    /// Directions in which they can change together, in the order of `places`: each leaves
    /// the matrix as it is, to first order.
    pub directions: Vec<Vec<f64>>,
    /// Whether the matrix does change, but by less than its noise.
    pub within_noise: bool,
    /// The one combination that is determined, where there is exactly one.
    pub determined: Option<Combination>,
    titles: Vec<String>,
    quantities: Vec<Quantity>,
}

/// What is determined of several parameters.
#[derive(Debug, Clone, PartialEq)]
pub enum Combination {
    /// `Σ weight · value`, the first weight one.
    Sum(Vec<f64>),
    /// `Π valueʷ`, of powers, the first exponent one.
    Product(Vec<f64>),
    /// The product of the shares `1 - α` that depolarizers leave.
    RetainedShares,
}

/// A part below this is rounding.
pub(super) const NOTHING: f64 = 1e-3;

/// A weight this near to ±1 is that.
const EVEN: f64 = 1e-3;

/// Groups undetermined directions by the parameters that they share. `vectors` are in
/// the fit's own variables, with whether they are merely within noise; `slopes` lead from
/// those to the values.
pub(super) fn null_directions(
    train: &Train,
    places: &[Place],
    vectors: &[(Vec<f64>, bool)],
    slopes: &[f64],
) -> Vec<NullDirection> {
    let reduced = sparse(vectors);
    let mut groups: Vec<(Vec<usize>, Vec<usize>)> = Vec::new();
    for (which, (vector, _)) in reduced.iter().enumerate() {
        let largest = vector
            .iter()
            .fold(0.0_f64, |most, part| most.max(part.abs()));
        let mut members: Vec<usize> = (0..vector.len())
            .filter(|&k| vector[k].abs() > NOTHING * largest)
            .collect();
        let mut directions = vec![which];
        groups.retain(|(others, also)| {
            let shared = others.iter().any(|other| members.contains(other));
            if shared {
                members.extend(others);
                directions.extend(also);
            }
            !shared
        });
        members.sort_unstable();
        members.dedup();
        groups.push((members, directions));
    }
    groups
        .into_iter()
        .map(|(members, directions)| {
            let rows: Vec<Vec<f64>> = directions
                .iter()
                .map(|&which| {
                    members
                        .iter()
                        .map(|&k| reduced[which].0[k] * slopes[k])
                        .collect()
                })
                .collect();
            let group: Vec<Place> = members.iter().map(|&k| places[k]).collect();
            let definitions: Vec<_> = group
                .iter()
                .filter_map(|&place| train.definition(place))
                .collect();
            let quantities: Vec<Quantity> = definitions
                .iter()
                .map(|definition| definition.quantity)
                .collect();
            let values: Vec<f64> = group.iter().map(|&place| train.value(place)).collect();
            let names: Vec<&str> = definitions
                .iter()
                .map(|definition| definition.name)
                .collect();
            NullDirection {
                determined: (rows.len() + 1 == group.len())
                    .then(|| combination(&rows, &values, &quantities, &names))
                    .flatten(),
                titles: group.iter().map(|&place| train.title(place)).collect(),
                within_noise: directions.iter().any(|&which| reduced[which].1),
                directions: rows,
                places: group,
                quantities,
            }
        })
        .collect()
}

/// The same space by directions with as many zeros as there are others (Gauss and Jordan).
fn sparse(vectors: &[(Vec<f64>, bool)]) -> Vec<(Vec<f64>, bool)> {
    let mut rows: Vec<(Vec<f64>, bool)> = vectors.to_vec();
    let width = rows.first().map_or(0, |(row, _)| row.len());
    let mut used: Vec<usize> = Vec::new();
    for k in 0..rows.len() {
        let pivot = (0..width)
            .filter(|column| !used.contains(column))
            .max_by(|&a, &b| rows[k].0[a].abs().total_cmp(&rows[k].0[b].abs()));
        let Some(pivot) = pivot.filter(|&column| rows[k].0[column] != 0.0) else {
            continue;
        };
        used.push(pivot);
        let value = rows[k].0[pivot];
        let row: Vec<f64> = rows[k].0.iter().map(|part| part / value).collect();
        for (i, (other, _)) in rows.iter_mut().enumerate() {
            if i == k {
                other.clone_from(&row);
                continue;
            }
            let factor = other[pivot];
            for (part, own) in other.iter_mut().zip(&row) {
                *part -= factor * own;
            }
        }
    }
    rows
}

/// The row at right angles to all directions, in the values or in their logarithms.
fn combination(
    rows: &[Vec<f64>],
    values: &[f64],
    quantities: &[Quantity],
    names: &[&str],
) -> Option<Combination> {
    let powers = quantities
        .iter()
        .all(|quantity| *quantity == Quantity::Power);
    let shares = names.iter().all(|name| *name == "alpha");
    let turned = |divide: &dyn Fn(usize) -> f64| -> Option<Vec<f64>> {
        let columns = values.len();
        let matrix = DMatrix::from_fn(columns, columns, |row, column| {
            rows.get(row)
                .map_or(0.0, |row| row[column] / divide(column))
        });
        let factors = column_svd(&matrix).ok()?;
        let weights: Vec<f64> = factors.right.column(columns - 1).iter().copied().collect();
        let first = *weights.first().filter(|weight| weight.abs() > EVEN)?;
        Some(weights.into_iter().map(|weight| weight / first).collect())
    };
    if powers && values.iter().all(|value| *value != 0.0) {
        return turned(&|k| values[k]).map(Combination::Product);
    }
    if shares && values.iter().all(|value| *value != 1.0) {
        let weights = turned(&|k| 1.0 - values[k])?;
        return even(&weights).then_some(Combination::RetainedShares);
    }
    let angles = quantities
        .iter()
        .filter(|quantity| quantity.is_angle())
        .count();
    (angles == 0 || angles == quantities.len())
        .then(|| turned(&|_| 1.0).map(Combination::Sum))
        .flatten()
}

fn even(weights: &[f64]) -> bool {
    weights.iter().all(|weight| (weight - 1.0).abs() < EVEN)
}

fn opposite(weights: &[f64]) -> bool {
    matches!(weights, [first, second] if (first - 1.0).abs() < EVEN && (second + 1.0).abs() < EVEN)
}

impl NullDirection {
    /// What cannot be told apart, in words, for someone with this convention.
    #[must_use]
    pub fn sentence(&self, convention: &Convention) -> String {
        let all = list(&self.titles, "the ");
        let within = if self.within_noise {
            " within this noise"
        } else {
            ""
        };
        let count = self.titles.len();
        if self.directions.len() >= count {
            let verb = if count == 1 { "has" } else { "have" };
            let changes = if self.within_noise {
                format!("{verb} no effect beyond the noise")
            } else {
                format!("{verb} no effect on the matrix")
            };
            return capital(&format!("the {all} {changes}: not determined."));
        }
        let signed = |weights: &[f64]| -> Vec<f64> {
            let signs: Vec<f64> = self
                .quantities
                .iter()
                .map(|quantity| quantity.sign(convention))
                .collect();
            weights
                .iter()
                .zip(&signs)
                .map(|(weight, sign)| weight * sign * signs[0])
                .collect()
        };
        match &self.determined {
            Some(Combination::Sum(weights)) => {
                let weights = signed(weights);
                if even(&weights) {
                    format!("Only the sum of the {all} is determined{within}.")
                } else if opposite(&weights) {
                    format!("Only the difference of the {all} is determined{within}.")
                } else {
                    let terms: Vec<String> = weights
                        .iter()
                        .zip(&self.titles)
                        .map(|(weight, title)| format!("{} times the {title}", short(*weight)))
                        .collect();
                    format!(
                        "Only one combination is determined{within}, here the sum of {}.",
                        list(&terms, "")
                    )
                }
            }
            Some(Combination::Product(weights)) if even(weights) => {
                format!("Only the product of the {all} is determined{within}.")
            }
            Some(Combination::Product(weights)) if opposite(weights) => {
                format!("Only the ratio of the {all} is determined{within}.")
            }
            Some(Combination::RetainedShares) => format!(
                "Only the product of the shares 1 − α that are left is determined{within}, not each {all}."
            ),
            _ => {
                let left = count - self.directions.len();
                let combinations = if left == 1 {
                    "one combination".to_owned()
                } else {
                    format!("{left} combinations")
                };
                format!("Of the {all} only {combinations} can be determined{within}.")
            }
        }
    }
}

/// `a, the b and the c`, the article from outside.
fn list(words: &[String], article: &str) -> String {
    match words {
        [] => String::new(),
        [one] => one.clone(),
        [rest @ .., last] => {
            format!("{} and {article}{last}", rest.join(&format!(", {article}")))
        }
    }
}

fn short(weight: f64) -> String {
    let text = format!("{weight:.3}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    text.replace('-', "−")
}

fn capital(sentence: &str) -> String {
    let mut letters = sentence.chars();
    letters
        .next()
        .map(|first| first.to_uppercase().chain(letters).collect())
        .unwrap_or_default()
}
