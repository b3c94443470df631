use nalgebra::{DMatrix, DVector};

use crate::error::Result;
use crate::linalg::column_svd;

/// Steps of one search; good ones need about ten.
const MOST_STEPS: usize = 100;

/// Steps after which a search may be given up: one that falls by less than `CREEPING` of
/// itself where it is `HOPELESS` times the best.
const PATIENCE: usize = 12;
const CREEPING: f64 = 1e-2;
const HOPELESS: f64 = 100.0;

/// A share of the sum of squares that is not worth another step: a point this near is off by
/// a millionth of its standard error.
const SETTLED: f64 = 1e-13;

/// A sum of squares to be made small within bounds.
pub(super) trait Problem {
    /// Residuals, and their derivatives as columns; `None` where the point means nothing.
    fn evaluate(&self, point: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)>;

    /// The residuals alone.
    fn residuals(&self, point: &[f64]) -> Option<DVector<f64>>;
}

/// Why a search ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stop {
    /// The gradient is zero to rounding.
    Gradient,
    /// The steps are.
    Step,
    /// The sum of squares no longer falls.
    Decrease,
    /// After the largest number of steps.
    Steps,
}

/// Where a search ended.
#[derive(Debug, Clone)]
pub(super) struct Minimum {
    pub point: Vec<f64>,
    pub residuals: DVector<f64>,
    pub jacobian: DMatrix<f64>,
    pub squares: f64,
    pub stop: Stop,
    pub evaluations: usize,
}

/// Levenberg and Marquardt's iteration with steps cut at the bounds: a parameter at a
/// bound that the gradient presses against it stays out of the step (projection of
/// Bertsekas 1982). No step moves a parameter by more than its `reach`: where one hardly
/// matters it would go so far that an angle has no digits left. A search that creeps far
/// above the `best` sum of squares that is known is given up.
///
/// `None` where the start means nothing.
///
/// # Errors
/// `not-finite`.
pub(super) fn minimise(
    problem: &impl Problem,
    start: &[f64],
    low: &[f64],
    high: &[f64],
    reach: &[f64],
    best: f64,
) -> Result<Option<Minimum>> {
    let count = start.len();
    let mut point: Vec<f64> = (0..count)
        .map(|k| start[k].clamp(low[k], high[k]))
        .collect();
    let Some((mut residuals, mut jacobian)) = problem.evaluate(&point) else {
        return Ok(None);
    };
    let mut squares = residuals.norm_squared();
    if !squares.is_finite() {
        return Ok(None);
    }
    let mut evaluations = 1;
    // Relative to the largest singular value squared.
    let mut damping = 1e-2;
    let mut stop = Stop::Steps;
    'steps: for round in 0..MOST_STEPS {
        let gradient = jacobian.transpose() * &residuals;
        let free: Vec<usize> = (0..count)
            .filter(|&k| {
                !((point[k] <= low[k] && gradient[k] > 0.0)
                    || (point[k] >= high[k] && gradient[k] < 0.0))
            })
            .collect();
        let length = residuals.norm();
        let steep = free
            .iter()
            .map(|&k| {
                gradient[k].abs() / (jacobian.column(k).norm() * length).max(f64::MIN_POSITIVE)
            })
            .fold(0.0, f64::max);
        if free.is_empty() || length == 0.0 || steep <= 1e-13 {
            stop = Stop::Gradient;
            break;
        }
        // Columns of one length: parameters have units of their own.
        let scale: Vec<f64> = free
            .iter()
            .map(|&k| {
                let norm = jacobian.column(k).norm();
                if norm > 0.0 { 1.0 / norm } else { 0.0 }
            })
            .collect();
        let scaled = DMatrix::from_fn(jacobian.nrows(), free.len(), |row, column| {
            jacobian[(row, free[column])] * scale[column]
        });
        let factors = column_svd(&scaled)?;
        for _ in 0..30 {
            let step = factors.damped_step(&residuals, damping);
            // What is left to gain is at most this.
            let gain: f64 = -free
                .iter()
                .enumerate()
                .map(|(i, &k)| gradient[k] * step[i] * scale[i])
                .sum::<f64>();
            if gain <= SETTLED * squares {
                stop = Stop::Decrease;
                break 'steps;
            }
            let far = free
                .iter()
                .enumerate()
                .map(|(i, &k)| (step[i] * scale[i]).abs() / reach[k])
                .fold(1.0, f64::max);
            let next: Vec<f64> = {
                let mut next = point.clone();
                for (i, &k) in free.iter().enumerate() {
                    next[k] = (point[k] + step[i] * scale[i] / far).clamp(low[k], high[k]);
                }
                next
            };
            let moved = (0..count)
                .map(|k| (next[k] - point[k]).abs() / (1.0 + point[k].abs()))
                .fold(0.0, f64::max);
            if moved <= 1e-15 {
                stop = Stop::Step;
                break 'steps;
            }
            evaluations += 1;
            let trial = problem
                .residuals(&next)
                .map(|trial| trial.norm_squared())
                .filter(|trial| trial.is_finite() && *trial < squares);
            let Some(trial) = trial else {
                damping = (damping * 6.0).min(1e12);
                continue;
            };
            let Some((new_residuals, new_jacobian)) = problem.evaluate(&next) else {
                damping = (damping * 6.0).min(1e12);
                continue;
            };
            let fell = squares - trial;
            let settled = fell <= SETTLED * squares;
            (point, residuals, jacobian, squares) = (next, new_residuals, new_jacobian, trial);
            damping = (damping * 0.15).max(1e-14);
            if round >= PATIENCE && fell <= CREEPING * squares && squares > HOPELESS * best {
                break 'steps;
            }
            if settled {
                stop = Stop::Decrease;
                break 'steps;
            }
            continue 'steps;
        }
        stop = Stop::Decrease;
        break;
    }
    Ok(Some(Minimum {
        point,
        residuals,
        jacobian,
        squares,
        stop,
        evaluations,
    }))
}
