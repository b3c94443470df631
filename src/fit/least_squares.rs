use levenberg_marquardt::{LeastSquaresProblem, LevenbergMarquardt, TerminationReason};
use nalgebra::{DMatrix, DVector, Dyn, Owned};

use crate::error::Result;
use crate::linalg::right_singular;

/// Singular values of the scaled Jacobian below this share of the largest are those of
/// directions in which nothing changes.
const RANK: f64 = 1e-7;

/// The cosine between residuals and any column of the Jacobian, at a minimum.
pub(super) const ORTHOGONAL: f64 = 1e-6;

/// Below this cosine nothing is left to settle.
const SETTLED: f64 = 1e-9;

/// A sum of squares is known to this share: errors of a millionth are residuals with ten digits.
pub(super) const ROUNDING: f64 = 1e-9;

/// Gauss-Newton steps after the search.
const MOST_STEPS: usize = 8;

/// Searches that follow one that ended on its way.
const RENEWALS: usize = 4;

/// Evaluations for each parameter.
const PATIENCE: usize = 60;

/// What is to be made small.
pub trait Problem {
    /// The residuals, in their own standard errors, and their derivatives with respect to
    /// the parameters; `None` outside of the range of the parameters.
    fn evaluate(&self, parameters: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)>;
}

/// Why a minimisation ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stop {
    /// The residuals are orthogonal to what the parameters can change, or are zero.
    Minimum,
    /// Steps changed nothing any more, and the residuals are not orthogonal: a parameter is
    /// at the edge of its range, or rounding hides the way down.
    Stalled,
    /// As many evaluations as were allowed.
    Patience,
}

/// Where a minimisation ended.
#[derive(Debug, Clone, PartialEq)]
pub struct Minimum {
    /// Of the parameters.
    pub parameters: Vec<f64>,
    /// In their own standard errors.
    pub residuals: DVector<f64>,
    /// At the end.
    pub jacobian: DMatrix<f64>,
    /// Of the squares of the residuals.
    pub sum_of_squares: f64,
    /// The largest cosine between the residuals and a column of the Jacobian.
    pub gradient_cosine: f64,
    /// Judged by that, and not by what the iteration says of itself.
    pub stop: Stop,
    /// Of the residuals.
    pub evaluations: usize,
}

/// What a Jacobian says of its parameters.
#[derive(Debug, Clone, PartialEq)]
pub struct Determination {
    /// `(JᵀJ)⁻¹` over the directions that change something.
    pub covariance: DMatrix<f64>,
    /// How many of them there are.
    pub rank: usize,
    /// Unit vectors of the others, each parameter in units of its own effect.
    pub null_directions: Vec<Vec<f64>>,
}

struct Adapter<'a, P> {
    problem: &'a P,
    parameters: DVector<f64>,
    /// At these parameters.
    evaluated: Option<(DVector<f64>, DMatrix<f64>)>,
}

impl<P: Problem> LeastSquaresProblem<f64, Dyn, Dyn> for Adapter<'_, P> {
    type ResidualStorage = Owned<f64, Dyn>;
    type JacobianStorage = Owned<f64, Dyn, Dyn>;
    type ParameterStorage = Owned<f64, Dyn>;

    fn set_params(&mut self, parameters: &DVector<f64>) {
        self.parameters.copy_from(parameters);
        self.evaluated =
            self.problem
                .evaluate(parameters.as_slice())
                .filter(|(residuals, jacobian)| {
                    residuals
                        .iter()
                        .chain(jacobian.iter())
                        .all(|v| v.is_finite())
                });
    }

    fn params(&self) -> DVector<f64> {
        self.parameters.clone()
    }

    fn residuals(&self) -> Option<DVector<f64>> {
        self.evaluated
            .as_ref()
            .map(|(residuals, _)| residuals.clone())
    }

    fn jacobian(&self) -> Option<DMatrix<f64>> {
        self.evaluated
            .as_ref()
            .map(|(_, jacobian)| jacobian.clone())
    }
}

/// The least sum of squares near `start` (Levenberg 1944; Marquardt 1963). `None` where the
/// problem can't be evaluated there.
pub fn minimise(problem: &impl Problem, start: &[f64]) -> Option<Minimum> {
    let method = LevenbergMarquardt::new()
        .with_ftol(1e-14)
        .with_xtol(1e-11)
        .with_gtol(1e-12)
        .with_patience(PATIENCE);
    minimise_by(&method, problem, start).map(|found| settled(problem, found))
}

/// The same to about six digits of the sum, for what is simulated many times.
pub fn minimise_roughly(problem: &impl Problem, start: &[f64]) -> Option<Minimum> {
    let method = LevenbergMarquardt::new()
        .with_ftol(1e-5)
        .with_xtol(1e-6)
        .with_gtol(1e-6)
        .with_patience(2);
    minimise_by(&method, problem, start)
}

/// Where the trust region has shrunk on rounding, plain Gauss-Newton steps still lead to the
/// minimum: each must bring the residuals nearer to orthogonal and not raise their sum.
fn settled(problem: &impl Problem, mut found: Minimum) -> Minimum {
    for _ in 0..MOST_STEPS {
        if found.gradient_cosine < SETTLED {
            break;
        }
        let Ok(determined) = determination(&found.jacobian) else {
            break;
        };
        let step = determined.covariance * (found.jacobian.transpose() * &found.residuals);
        let parameters: Vec<f64> = found
            .parameters
            .iter()
            .zip(step.iter())
            .map(|(value, step)| value - step)
            .collect();
        let Some((residuals, jacobian)) = problem.evaluate(&parameters) else {
            break;
        };
        found.evaluations += 1;
        let sum_of_squares = residuals.norm_squared();
        let gradient_cosine = largest_cosine(&residuals, &jacobian, 0.0);
        let is_better = gradient_cosine < found.gradient_cosine
            && sum_of_squares <= found.sum_of_squares * (1.0 + ROUNDING);
        if !is_better {
            break;
        }
        found = Minimum {
            parameters,
            residuals,
            jacobian,
            sum_of_squares,
            gradient_cosine,
            stop: if gradient_cosine < ORTHOGONAL {
                Stop::Minimum
            } else {
                found.stop
            },
            evaluations: found.evaluations,
        };
    }
    found
}

fn minimise_by(
    method: &LevenbergMarquardt<f64>,
    problem: &impl Problem,
    start: &[f64],
) -> Option<Minimum> {
    let mut adapter = Adapter {
        problem,
        parameters: DVector::zeros(start.len()),
        evaluated: None,
    };
    adapter.set_params(&DVector::from_row_slice(start));
    adapter.evaluated.as_ref()?;
    let (ended, report) = if start.is_empty() {
        (adapter, None)
    } else {
        let (ended, report) = method.minimize(adapter);
        (ended, Some(report))
    };
    let parameters = ended.parameters.as_slice().to_vec();
    let (residuals, jacobian) = problem.evaluate(&parameters)?;
    let gradient_cosine = largest_cosine(&residuals, &jacobian, 0.0);
    let is_out = matches!(
        report.as_ref().map(|report| &report.termination),
        Some(TerminationReason::LostPatience)
    );
    Some(Minimum {
        parameters,
        sum_of_squares: residuals.norm_squared(),
        stop: if gradient_cosine < ORTHOGONAL {
            Stop::Minimum
        } else if is_out {
            Stop::Patience
        } else {
            Stop::Stalled
        },
        gradient_cosine,
        residuals,
        jacobian,
        evaluations: report.map_or(1, |report| report.number_of_evaluations),
    })
}

/// The best of several starts.
pub fn minimise_from(problem: &impl Problem, starts: &[Vec<f64>]) -> Option<Minimum> {
    let mut evaluations = 0;
    let mut best: Option<Minimum> = None;
    for found in starts.iter().filter_map(|start| minimise(problem, start)) {
        evaluations += found.evaluations;
        // A later start must be better by more than rounding: the answer does not hop.
        let limit = best
            .as_ref()
            .map_or(f64::INFINITY, |best| best.sum_of_squares * (1.0 - ROUNDING));
        if found.sum_of_squares < limit {
            best = Some(found);
        }
    }
    // The best way may be a slow one, along a valley.
    for _ in 0..RENEWALS {
        let Some(slow) = best.as_ref().filter(|best| best.stop != Stop::Minimum) else {
            break;
        };
        let Some(found) = minimise(problem, &slow.parameters) else {
            break;
        };
        evaluations += found.evaluations;
        if found.sum_of_squares > slow.sum_of_squares {
            break;
        }
        best = Some(found);
    }
    best.map(|best| Minimum {
        evaluations,
        ..best
    })
}

/// Over the columns whose effect is at least this share of the largest.
pub(super) fn largest_cosine(residuals: &DVector<f64>, jacobian: &DMatrix<f64>, share: f64) -> f64 {
    let largest = jacobian.column_iter().fold(0.0_f64, |a, b| a.max(b.norm()));
    let length = residuals.norm();
    // Residuals of a fit that is exact are rounding, with no direction of their own.
    if length < 1e-7 {
        return 0.0;
    }
    jacobian
        .column_iter()
        .filter(|column| column.norm() >= share * largest)
        .map(|column| {
            let scale = column.norm() * length;
            if scale > 0.0 {
                column.dot(residuals).abs() / scale
            } else {
                0.0
            }
        })
        .fold(0.0, f64::max)
}

/// The covariance of the parameters, and the combinations that nothing determines.
///
/// # Errors
/// As [`right_singular`].
pub fn determination(jacobian: &DMatrix<f64>) -> Result<Determination> {
    let count = jacobian.ncols();
    let lengths: Vec<f64> = jacobian
        .column_iter()
        .map(|column| {
            let length = column.norm();
            if length > 0.0 { length } else { 1.0 }
        })
        .collect();
    let scaled = DMatrix::from_fn(jacobian.nrows(), count, |row, column| {
        jacobian[(row, column)] / lengths[column]
    });
    let found = right_singular(&scaled)?;
    let largest = found.values.first().copied().unwrap_or_default();
    let rank = found
        .values
        .iter()
        .filter(|&&value| value > RANK * largest && value > 0.0)
        .count();
    let mut covariance = DMatrix::zeros(count, count);
    for k in 0..rank {
        let vector = found.vectors.column(k);
        let scaled = DVector::from_fn(count, |i, _| vector[i] / lengths[i] / found.values[k]);
        covariance += &scaled * scaled.transpose();
    }
    Ok(Determination {
        covariance,
        rank,
        null_directions: (rank..count)
            .map(|k| found.vectors.column(k).iter().copied().collect())
            .collect(),
    })
}
