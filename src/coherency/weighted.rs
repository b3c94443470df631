use nalgebra::{Matrix4, SMatrix, SVector};
use num_complex::Complex64;

use super::{Coherency, each_entry};
use crate::error::{Error, Result};
use crate::linalg::{inverse_positive4, is_positive4, solve_positive16};
use crate::stats::Covariance;
use crate::tolerance;

type Matrix16 = SMatrix<f64, 16, 16>;
type Hermitian = Matrix4<Complex64>;

/// Steps of the iteration; it needs about fifteen.
const MOST_STEPS: usize = 80;

/// The realizable matrix of least weighted distance, with what proves it.
#[derive(Debug, Clone, PartialEq)]
pub struct WeightedNearest {
    /// Row by row.
    pub elements: [f64; 16],
    /// `(m̂ − m)ᵀ Σ⁻¹ (m̂ − m)`.
    pub statistic: f64,
    /// The certificate `tr(H Z)`, over the larger of one and the statistic: Z, positive,
    /// is the gradient of the distance as a Hermitian matrix.
    pub complementarity: f64,
    /// The largest element of the difference of gradient and Z, in units of σ.
    pub gradient_residual: f64,
}

/// Minimises `(m̂ − m)ᵀ Σ⁻¹ (m̂ − m)` over `H(m) ⪰ 0`; held elements stay as they are.
/// `None` where no realizable matrix has the held elements.
///
/// A primal-dual interior point iteration (Helmberg, Rendl, Vanderbei & Wolkowicz 1996
/// for the direction): `S = H(m)`, `2 Σ⁻¹(m − m̂) = A*(Z)`, `S Z = μ I`, with μ going to
/// zero. It ends on the certificate, not on small steps.
///
/// # Errors
/// `no-convergence`.
pub fn weighted_nearest(
    measured: &[f64; 16],
    covariance: &Covariance,
) -> Result<Option<WeightedNearest>> {
    Solver::new(measured, covariance, tolerance::COMPLEMENTARITY).solve()
}

/// The least weighted squared distance alone, to about six digits.
pub(super) fn weighted_distance(
    measured: &[f64; 16],
    covariance: &Covariance,
) -> Result<Option<f64>> {
    let solution = Solver::new(measured, covariance, 1e-6).solve()?;
    Ok(solution.map(|solution| solution.statistic))
}

struct Solver<'a> {
    measured: SVector<f64, 16>,
    covariance: &'a Covariance,
    /// `2 Σ⁻¹` in units of `scale`.
    curvature: Matrix16,
    scale: f64,
    enough: f64,
}

/// Where the iteration stands, in units of `scale`.
#[derive(Clone)]
struct State {
    elements: SVector<f64, 16>,
    primal: Hermitian,
    dual: Hermitian,
}

impl<'a> Solver<'a> {
    fn new(measured: &[f64; 16], covariance: &'a Covariance, enough: f64) -> Self {
        let scale = measured.iter().fold(0.0_f64, |a, b| a.max(b.abs()));
        let scale = if scale > 0.0 { scale } else { 1.0 };
        Self {
            measured: SVector::from(*measured) / scale,
            covariance,
            curvature: covariance.inverse() * (2.0 * scale * scale),
            scale,
            enough,
        }
    }

    fn solve(&self) -> Result<Option<WeightedNearest>> {
        let identity = Hermitian::identity();
        // The multipliers are as large as the pull of what must change at least.
        let eigen = Coherency::from_elements(&self.measured.into()).eigen()?;
        let clipped = eigen.values.map(|value| value.max(0.0));
        let clipped = Coherency::from_spectrum(&clipped, &eigen)
            .mueller()
            .row_major();
        let pull = self.curvature * (SVector::<f64, 16>::from(clipped) - self.measured);
        let multiplier = self
            .curvature
            .diagonal()
            .amax()
            .max(1.0)
            .sqrt()
            .max(pull.amax());
        let mut state = State {
            elements: self.measured,
            primal: identity * Complex64::from(0.5),
            dual: identity * Complex64::from(multiplier),
        };
        let mut best = (f64::INFINITY, state.clone());
        let mut stalled = 0;
        for _ in 0..MOST_STEPS {
            let infeasible = self.infeasibility(&state);
            let objective = self.objective(&state.elements);
            let gap = trace_product(&state.primal, &state.dual) / objective.max(1.0);
            if infeasible <= 1e-13 && gap <= self.enough {
                return Ok(Some(self.finish(&state)));
            }
            if infeasible <= 1e-10 && gap < best.0 {
                best = (gap, state.clone());
            }
            match self.step(&mut state, gap) {
                Some(length) if length > 1e-4 => stalled = 0,
                Some(_) => stalled += 1,
                None => stalled = 10,
            }
            if stalled >= 4 {
                break;
            }
        }
        // Not to the last digit, which rounding may keep out of reach, but proved well enough.
        if best.0 <= 1e-8_f64.max(self.enough) {
            return Ok(Some(self.finish(&best.1)));
        }
        if (0..16).any(|k| self.covariance.is_held(k)) {
            return Ok(None);
        }
        Err(Error::new(
            "no-convergence",
            "The nearest realizable matrix under this covariance was not found.",
        ))
    }

    fn objective(&self, elements: &SVector<f64, 16>) -> f64 {
        let difference = elements - self.measured;
        0.5 * difference.dot(&(self.curvature * difference))
    }

    fn infeasibility(&self, state: &State) -> f64 {
        (coherency(&state.elements) - state.primal)
            .iter()
            .fold(0.0_f64, |largest, entry| largest.max(entry.norm()))
    }

    /// One Newton step towards a smaller μ; the shorter of its two lengths.
    fn step(&self, state: &mut State, gap: f64) -> Option<f64> {
        let inverse = inverse_positive4(&state.primal)?;
        let shift = coherency(&state.elements) - state.primal;
        let centre = trace_product(&state.primal, &state.dual) / 4.0;
        // Near the end the path may be followed in long strides.
        let mu = centre * if gap < 1e-2 { 0.05 } else { 0.2 };
        let gradient = self.curvature * (state.elements - self.measured);
        let pull = inverse * Complex64::from(mu) - symmetric(&(state.dual * shift * inverse));
        let mut right = adjoint(&pull) - gradient;
        let mut system = self.curvature + self.coupling(state, &inverse);
        for k in (0..16).filter(|&k| self.covariance.is_held(k)) {
            system.row_mut(k).fill(0.0);
            system.column_mut(k).fill(0.0);
            system[(k, k)] = 1.0;
            right[k] = 0.0;
        }
        let move_elements = solve_positive16(&system, &right)?;
        let move_primal = coherency(&move_elements) + shift;
        let move_dual = inverse * Complex64::from(mu)
            - state.dual
            - symmetric(&(state.dual * move_primal * inverse));
        let primal = longest(&state.primal, &move_primal);
        let dual = longest(&state.dual, &move_dual);
        state.elements += move_elements * primal;
        state.primal += move_primal * Complex64::from(primal);
        state.dual += move_dual * Complex64::from(dual);
        Some(primal.min(dual))
    }

    /// `Re tr(A_i Z A_j S⁻¹)`, symmetric.
    fn coupling(&self, state: &State, inverse: &Hermitian) -> Matrix16 {
        let mut products = [Hermitian::zeros(); 16];
        each_entry(|k, row, column, phase| {
            // Z A_k: column `column` gets column `row` of Z.
            let add = state.dual.column(row) * (phase * 0.25);
            let mut target = products[k].column_mut(column);
            target += add;
        });
        let mut coupling = Matrix16::zeros();
        for (j, product) in products.iter().enumerate() {
            let full = product * inverse;
            coupling.set_column(j, &adjoint_of(&full));
        }
        (coupling + coupling.transpose()) * 0.5
    }

    fn finish(&self, state: &State) -> WeightedNearest {
        let objective = self.objective(&state.elements);
        let gradient = self.curvature * (state.elements - self.measured) - adjoint(&state.dual);
        let residual = (0..16)
            .filter(|&k| !self.covariance.is_held(k))
            .map(|k| (gradient[k] / self.scale * self.covariance.sigma(k)).abs())
            .fold(0.0, f64::max);
        WeightedNearest {
            elements: std::array::from_fn(|k| {
                let held = self.covariance.is_held(k);
                self.scale
                    * if held {
                        self.measured[k]
                    } else {
                        state.elements[k]
                    }
            }),
            statistic: objective,
            complementarity: trace_product(&state.primal, &state.dual) / objective.max(1.0),
            gradient_residual: residual,
        }
    }
}

fn coherency(elements: &SVector<f64, 16>) -> Hermitian {
    Coherency::from_elements(&(*elements).into()).0
}

/// `Re tr(A_i X)` for a Hermitian X.
fn adjoint(x: &Hermitian) -> SVector<f64, 16> {
    adjoint_of(x)
}

fn adjoint_of(x: &Hermitian) -> SVector<f64, 16> {
    let mut out = SVector::zeros();
    each_entry(|k, row, column, phase| out[k] += 0.25 * (phase * x[(column, row)]).re);
    out
}

fn symmetric(x: &Hermitian) -> Hermitian {
    (x + x.adjoint()) * Complex64::from(0.5)
}

fn trace_product(a: &Hermitian, b: &Hermitian) -> f64 {
    (0..4)
        .flat_map(|i| (0..4).map(move |j| (i, j)))
        .map(|(i, j)| (a[(i, j)] * b[(j, i)]).re)
        .sum()
}

/// The longest step, at most one, that stays well inside of the positive matrices.
fn longest(from: &Hermitian, step: &Hermitian) -> f64 {
    let mut length = 1.0;
    for _ in 0..60 {
        let ahead = length * (if length < 1.0 { 1.0 / 0.95 } else { 1.02 });
        if is_positive4(&(from + step * Complex64::from(ahead))) {
            return length;
        }
        length *= 0.8;
    }
    0.0
}
