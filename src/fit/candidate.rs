use nalgebra::{DMatrix, DVector, SVector};
use num_complex::Complex64;

use super::derived;
use super::least_squares::{
    Determination, Minimum, ROUNDING, Stop, determination, largest_cosine, minimise, minimise_from,
};
use super::mixtures;
use super::models::{Model, Shape, Side, columns_of, triangular};
use super::parameters::{Name, Reported, reported};
use super::starts::Guide;
use super::target::{ModelProblem, Target, row_major};
use crate::coherency::{Coherency, nearest_to, weighted_significance};
use crate::error::{Error, Result};
use crate::mueller::{Mueller, PAULI};
use crate::noise::Measurement;
use crate::stats::{normal_95, student_95};

/// One parameter with its uncertainty.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Parameter {
    /// Which.
    pub name: Name,
    /// Radians for an angle; transmittance and Jones entries in the unit of the matrix, and
    /// in its root.
    pub value: f64,
    /// First order; `None` where nothing determines it, or without degrees of freedom.
    pub se: Option<f64>,
    /// The ends of 95 %.
    pub interval: Option<(f64, f64)>,
    /// Held at the end of its range.
    pub at_bound: bool,
}

/// A model fitted to a measured matrix.
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// Which.
    pub model: Model,
    /// Of its depolarization, where that makes a difference.
    pub side: Option<Side>,
    /// In the order of the model.
    pub parameters: Vec<Parameter>,
    /// What follows from a Jones matrix: transmittance, diattenuation, retardance and its axis.
    pub derived: Vec<Parameter>,
    /// Of the parameters, row by row.
    pub covariance: DMatrix<f64>,
    /// Combinations of parameters that nothing determines: unit vectors over the parameters.
    pub null_directions: Vec<Vec<f64>>,
    /// Of the squared residuals over their variances; `None` without noise.
    pub chi_square: Option<f64>,
    /// The root mean square of the residuals, in the unit of the matrix.
    pub rms: f64,
    /// Elements less what is determined.
    pub degrees_of_freedom: u32,
    /// Of χ², or simulated for mixtures; `None` without noise or degrees of freedom.
    pub p_value: Option<f64>,
    /// How many measurements were simulated for it.
    pub simulations: u32,
    /// Akaike's criterion, corrected for few elements where the noise is unknown.
    pub aic: Option<f64>,
    /// The Bayesian criterion.
    pub bic: Option<f64>,
    /// The fitted matrix.
    pub mueller: Mueller,
    /// Measured less fitted, in standard errors, row by row; in units of `rms` without noise.
    pub residuals: [f64; 16],
    /// Why the search ended.
    pub stop: Stop,
    /// At the end.
    pub gradient_cosine: f64,
    /// Of the model.
    pub evaluations: usize,
    pub(super) solved: Solved,
}

impl Fit {
    /// The Jones matrices whose incoherent sum the model is, without the depolarization of
    /// its own, entries row by row; none for the models with fewer parameters than one.
    #[must_use]
    pub fn jones_matrices(&self) -> Vec<[Complex64; 4]> {
        let (shape, x) = (&self.solved.shape, &self.solved.x);
        let Some(rank) = self.model.rank() else {
            return Vec::new();
        };
        let own = x.len() - self.model.depolarizations();
        columns_of(&x[..own], rank, &shape.pivots)
            .into_iter()
            .map(|column| column.map(|entry| entry * self.solved.unit.sqrt()))
            .collect()
    }
}

/// What later questions about a fit start from.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Solved {
    pub shape: Shape,
    /// All of them, the fixed one too.
    pub x: Vec<f64>,
    /// |M00| of the measured matrix.
    pub unit: f64,
}

/// A column of less effect than this share of the largest belongs to a Jones matrix of no
/// weight.
const UNUSED: f64 = 1e-3;

/// Where one of them has gone, the others settle to this cosine.
const MIXTURE_ORTHOGONAL: f64 = 1e-4;

/// A minimum with the weight of an exact M00, and judged without it.
fn finished(problem: &ModelProblem<'_>, mut found: Minimum) -> Minimum {
    if problem.shape.model.is_mixture() {
        // A Jones matrix that the mixture does without has no way to be orthogonal.
        found.gradient_cosine = largest_cosine(&found.residuals, &found.jacobian, UNUSED);
        if found.gradient_cosine < MIXTURE_ORTHOGONAL {
            found.stop = Stop::Minimum;
        }
    }
    found.parameters = problem.to_scale(&found.parameters);
    (found.residuals, found.jacobian) = problem.weighted(&found.parameters);
    found
}

/// The place and the value of a parameter that is held.
type Held = Option<(usize, f64)>;

/// A minimum, of what, and the parameter that was held for it.
type Found = (Shape, Minimum, Held);

/// A measurement that models are fitted to.
pub struct Fitter<'a> {
    pub(super) measurement: &'a Measurement,
    pub(super) target: Target,
    pub(super) guide: Guide,
    pub(super) seed: u64,
}

impl<'a> Fitter<'a> {
    /// Of a measured matrix.
    ///
    /// # Errors
    /// `no-m00` where M00 is not positive, `no-convergence`.
    pub fn new(measurement: &'a Measurement, seed: u64) -> Result<Self> {
        let target = Target::of(measurement)
            .filter(|_| measurement.mueller().m00() > 0.0)
            .ok_or_else(|| {
                Error::new(
                    "no-m00",
                    "M00 is not positive, so no model can be fitted: light that comes out is never less than none.",
                )
                .at_field("mueller")
            })?;
        Ok(Self {
            guide: Guide::of(&target)?,
            measurement,
            target,
            seed,
        })
    }

    /// The best of one model.
    ///
    /// # Errors
    /// `no-convergence`.
    pub fn fit(&self, model: Model, side: Side) -> Result<Fit> {
        let side_used = model.side(side);
        let has_equal_errors =
            self.measurement.equal_sigma().is_some() || !self.measurement.has_noise();
        let (shape, minimum, fixed) = if model == Model::RankFour {
            self.whole()?
        } else if model.is_mixture() && has_equal_errors {
            self.closed_mixture(model)
        } else if model.is_mixture() {
            self.weighted_mixture(model)?
        } else {
            self.solve(
                &self.target,
                &self.guide,
                model,
                side_used.unwrap_or_default(),
            )?
        };
        self.report(shape, side_used, minimum, fixed)
    }

    /// Any realizable matrix: the nearest one.
    fn whole(&self) -> Result<Found> {
        Ok(self.known(Model::RankFour, &self.nearest_columns()?))
    }

    /// The nearest realizable matrix as four Jones matrices, in units of M00.
    fn nearest_columns(&self) -> Result<Vec<[Complex64; 4]>> {
        let eigen = &Coherency::from_mueller(self.measurement.mueller()).eigen()?;
        let nearest = nearest_to(self.measurement, eigen)?.ok_or_else(no_fit)?;
        Ok((0..4)
            .map(|k| {
                let value = (nearest.eigen.values[k] / self.target.unit).max(0.0);
                std::array::from_fn(|i| nearest.eigen.vectors[k][i] * (2.0 * value).sqrt())
            })
            .collect())
    }

    /// Under unequal errors: of few Jones matrices the nearest realizable matrix is itself the
    /// best mixture, else it is where to start.
    fn weighted_mixture(&self, model: Model) -> Result<Found> {
        let rank = model.rank().unwrap_or(4);
        let columns = self.nearest_columns()?;
        let weight = |column: &[Complex64; 4]| column.iter().map(Complex64::norm_sqr).sum::<f64>();
        if weight(&columns[rank]) < UNUSED * UNUSED * UNUSED * weight(&columns[0]) {
            return Ok(self.known(model, &columns[..rank]));
        }
        let found = self.solve(&self.target, &self.guide, model, Side::Parallel)?;
        let (start, pivots) = triangular(&columns[..rank]);
        let shape = Shape { pivots, ..found.0 };
        let problem = ModelProblem {
            target: &self.target,
            shape,
            fixed: None,
        };
        Ok(match minimise(&problem, &start) {
            Some(other) if other.sum_of_squares < found.1.sum_of_squares * (1.0 - ROUNDING) => {
                (shape, finished(&problem, other), None)
            }
            _ => found,
        })
    }

    /// For equal errors M ↔ H is an isometry: the largest eigenvalues stay.
    fn closed_mixture(&self, model: Model) -> Found {
        let eigen = &self.guide.eigen;
        let rank = model.rank().unwrap_or(4);
        let exact = self.target.m00_is_exact.then_some(self.target.elements[0]);
        let kept = mixtures::kept_spectrum(&eigen.values, rank, exact);
        let columns: Vec<_> = (0..rank)
            .map(|k| std::array::from_fn(|i| eigen.vectors[k][i] * (2.0 * kept[k]).sqrt()))
            .collect();
        self.known(model, &columns)
    }

    /// A mixture of known Jones matrices as a fit.
    fn known(&self, model: Model, columns: &[[Complex64; 4]]) -> Found {
        let (x, pivots) = triangular(columns);
        let shape = Shape {
            model,
            side: Side::Parallel,
            pivots,
            is_polarizer: false,
        };
        let problem = ModelProblem {
            target: &self.target,
            shape,
            fixed: None,
        };
        let (residuals, jacobian) = problem.weighted(&x);
        let minimum = Minimum {
            parameters: x,
            sum_of_squares: residuals.norm_squared(),
            gradient_cosine: 0.0,
            stop: Stop::Minimum,
            evaluations: 1,
            residuals,
            jacobian,
        };
        (shape, minimum, None)
    }

    pub(super) fn solve(
        &self,
        target: &Target,
        guide: &Guide,
        model: Model,
        side: Side,
    ) -> Result<Found> {
        let (mut starts, pivots) = guide.starts(model, side, self.seed);
        for &special in model.specials() {
            let (shape, found, fixed) = self.solve(target, guide, special, side)?;
            let problem = ModelProblem {
                target,
                shape,
                fixed,
            };
            starts.extend(model.embedding(special, &problem.whole(&found.parameters)));
        }
        let mut shape = Shape {
            model,
            side,
            pivots,
            is_polarizer: false,
        };
        let stages = target.stages();
        let find = |shape, fixed, starts: &[Vec<f64>]| {
            let mut found: Option<Minimum> = None;
            let mut evaluations = 0;
            for target in &stages {
                let problem = ModelProblem {
                    target,
                    shape,
                    fixed,
                };
                let minimum = match &found {
                    None => minimise_from(&problem, starts),
                    Some(before) => minimise(&problem, &before.parameters),
                }
                .map(|found| finished(&problem, found))
                .ok_or_else(no_fit)?;
                evaluations += minimum.evaluations;
                found = Some(minimum);
            }
            let found = found.ok_or_else(no_fit)?;
            Ok::<_, Error>(Minimum {
                evaluations,
                ..found
            })
        };
        if model.has_bound() {
            let mut best: Option<Found> = None;
            let mut evaluations = 0;
            for start in &starts {
                let found = find(shape, None, std::slice::from_ref(start))?;
                evaluations += found.evaluations;
                let (shape, found, fixed) = match beyond(model, &found.parameters) {
                    None => (shape, found, None),
                    Some((bound, fixed, start)) => {
                        let held = Shape {
                            is_polarizer: bound,
                            ..shape
                        };
                        let found = find(held, fixed, &[start])?;
                        evaluations += found.evaluations;
                        (held, found, fixed)
                    }
                };
                let is_better = best.as_ref().is_none_or(|(_, best, _)| {
                    found.sum_of_squares < best.sum_of_squares * (1.0 - ROUNDING)
                });
                if is_better {
                    best = Some((shape, found, fixed));
                }
            }
            let (shape, found, fixed) = best.ok_or_else(no_fit)?;
            return Ok((
                shape,
                Minimum {
                    evaluations,
                    ..found
                },
                fixed,
            ));
        }
        let found = find(shape, None, &starts)?;
        let Some((x, pivots)) = with_positive_factors(&shape, &found.parameters) else {
            return Ok((shape, found, None));
        };
        shape.pivots = pivots;
        Ok((shape, find(shape, None, &[x])?, None))
    }

    fn report(
        &self,
        shape: Shape,
        side: Option<Side>,
        minimum: Minimum,
        fixed: Held,
    ) -> Result<Fit> {
        let model = shape.model;
        let problem = ModelProblem {
            target: &self.target,
            shape,
            fixed,
        };
        let x = problem.whole(&minimum.parameters);
        let matrix = shape.evaluate(&x).matrix;
        let at_bound = usize::from(fixed.is_some() || shape.is_polarizer);
        let mut determined = determination(&minimum.jacobian)?;
        if shape.is_polarizer {
            without_length(&mut determined, &x);
        }
        if let Some((place, _)) = fixed {
            insert_fixed(&mut determined, place);
        }
        let count = model.parameter_count() - at_bound;
        let rank = determined.rank.min(count);
        let freedom = 16_usize.saturating_sub(rank);
        let degrees_of_freedom = if model == Model::RankFour {
            0
        } else {
            u32::try_from(freedom).unwrap_or_default()
        };
        let difference = self.target.elements - row_major(&matrix);
        let sum = minimum.sum_of_squares;
        let has_noise = self.measurement.has_noise();
        // Without a statement the residuals say how large the noise is.
        let scale = if has_noise {
            Some(1.0)
        } else {
            (degrees_of_freedom > 0).then(|| sum / f64::from(degrees_of_freedom))
        };
        let reach = if has_noise {
            self.measurement
                .sigma_freedom()
                .map_or(Some(normal_95()), student_95)
        } else {
            student_95(f64::from(degrees_of_freedom))
        };
        let covariance = determined.covariance * scale.unwrap_or_default();
        let unit = self.target.unit;
        let report = reported(&shape, &x, unit);
        let judge = Judge {
            covariance: &covariance,
            null: &determined.null_directions,
            // The whole of a mixture has no parameters of its own to doubt.
            reach: reach.filter(|_| scale.is_some()),
        };
        let parameters = match model {
            _ if model.is_mixture() => mixtures::weights(&shape, &x, unit, &judge)?,
            _ => judge.parameters(&report, at_bound > 0),
        };
        let derived = match model.rank() {
            Some(1) => derived::of_jones(&shape, &x, unit, &judge)?,
            _ => Vec::new(),
        };
        let outcome = mixtures::Outcome {
            matrix: &matrix,
            sum,
        };
        let (p_value, simulations) = if !has_noise {
            (None, 0)
        } else if model == Model::RankFour {
            self.whole_p()?
        } else if model.is_mixture() {
            mixtures::p_value(self, model, &outcome)?
        } else {
            (self.measurement.tail(sum, degrees_of_freedom), 0)
        };
        let elements = (16 - self.target.exact) as f64;
        let free = (model.parameter_count() - usize::from(self.target.m00_is_exact)) as f64;
        let (aic, bic) = criteria(has_noise, sum, elements, free);
        let rms = (difference.norm_squared() / 16.0).sqrt() * unit;
        let sigma = self.measurement.element_sigma();
        let residuals = std::array::from_fn(|k| {
            let raw = difference[k] * unit;
            match sigma.map(|sigma| sigma[k]) {
                Some(sigma) if sigma > 0.0 => raw / sigma,
                Some(_) => 0.0,
                None if rms > 0.0 => raw / rms,
                None => 0.0,
            }
        });
        Ok(Fit {
            model,
            side,
            covariance: &report.derivatives * &covariance * report.derivatives.transpose(),
            null_directions: if model.is_mixture() {
                Vec::new()
            } else {
                determined.null_directions.clone()
            },
            parameters,
            derived,
            chi_square: has_noise.then_some(sum),
            rms,
            degrees_of_freedom,
            p_value,
            simulations,
            aic,
            bic,
            mueller: Mueller::from_matrix(matrix * unit),
            residuals,
            stop: minimum.stop,
            gradient_cosine: minimum.gradient_cosine,
            evaluations: minimum.evaluations,
            solved: Solved { shape, x, unit },
        })
    }

    /// Of the nearest realizable matrix: the test of realizability.
    fn whole_p(&self) -> Result<(Option<f64>, u32)> {
        let eigen = Coherency::from_mueller(self.measurement.mueller()).eigen()?;
        let nearest = nearest_to(self.measurement, &eigen)?;
        let found = weighted_significance(self.measurement, nearest.as_ref(), self.seed)?;
        Ok(found.map_or((None, 0), |test| (Some(test.p_value), test.simulations)))
    }
}

/// What the covariance of the fitted parameters makes of anything that follows from them.
pub(super) struct Judge<'a> {
    pub covariance: &'a DMatrix<f64>,
    pub null: &'a [Vec<f64>],
    /// Standard errors to each end of 95 %; `None` where there are none.
    pub reach: Option<f64>,
}

impl Judge<'_> {
    /// The standard error of what changes so with the fitted parameters.
    pub fn standard_error(&self, slopes: &DVector<f64>) -> Option<f64> {
        self.reach?;
        // What moves along a direction that nothing determines has no error to give.
        let size = slopes.amax();
        let is_free = self.null.iter().any(|direction| {
            let along: f64 = slopes.iter().zip(direction).map(|(a, b)| a * b).sum();
            along.abs() > 1e-6 * size
        });
        if is_free {
            return None;
        }
        let variance = slopes.dot(&(self.covariance * slopes));
        Some(variance.max(0.0).sqrt()).filter(|se| se.is_finite())
    }

    pub fn parameter(
        &self,
        name: Name,
        value: f64,
        slopes: &DVector<f64>,
        at_bound: bool,
    ) -> Parameter {
        let se = self.standard_error(slopes).filter(|se| {
            // An angle that may be anything has no error.
            name.period().is_none_or(|period| *se < 0.25 * period)
        });
        Parameter {
            name,
            value,
            se: se.filter(|_| !at_bound),
            interval: se
                .zip(self.reach)
                .filter(|_| !at_bound)
                .map(|(se, reach)| (value - reach * se, value + reach * se)),
            at_bound,
        }
    }

    fn parameters(&self, report: &Reported, at_bound: bool) -> Vec<Parameter> {
        (0..report.names.len())
            .map(|k| {
                let name = report.names[k];
                let held = at_bound && name == Name::Diattenuation;
                let slopes = report.derivatives.row(k).transpose();
                self.parameter(name, report.values[k], &slopes, held)
            })
            .collect()
    }
}

/// What to fit instead where the cosine of a diattenuation's parameter, the root of what the
/// dark axis lets through, is below zero: a polarizer, as a shape or as a held parameter, and
/// where to start.
fn beyond(model: Model, x: &[f64]) -> Option<(bool, Held, Vec<f64>)> {
    if model == Model::LinearDiattenuator {
        let held = (1, x[1].sin().signum() * std::f64::consts::FRAC_PI_2);
        let mut start = x.to_vec();
        start.remove(1);
        return (x[1].cos() < 0.0).then_some((false, Some(held), start));
    }
    let length = SVector::<f64, 3>::from_column_slice(&x[1..4]).norm();
    (length.cos() < 0.0).then(|| (true, None, x.to_vec()))
}

/// Akaike's and the Bayesian criterion; with unknown noise from the sum of squares, with the
/// correction for few elements (Hurvich & Tsai 1989).
fn criteria(
    has_noise: bool,
    sum: f64,
    elements: f64,
    parameters: f64,
) -> (Option<f64>, Option<f64>) {
    if has_noise {
        return (
            Some(sum + 2.0 * parameters),
            Some(sum + parameters * elements.ln()),
        );
    }
    let all = parameters + 1.0;
    let left = elements - all - 1.0;
    if sum <= 0.0 {
        return (None, None);
    }
    let misfit = elements * (sum / elements).ln();
    (
        (left >= 1.0).then(|| misfit + 2.0 * all + 2.0 * all * (all + 1.0) / left),
        Some(misfit + all * elements.ln()),
    )
}

/// Two negative factors of a depolarizer are half a turn of the element: the same matrix with
/// the first factors positive. `None` where they are.
fn with_positive_factors(shape: &Shape, x: &[f64]) -> Option<(Vec<f64>, [usize; 4])> {
    let own = x.len() - shape.model.depolarizations();
    let mut factors = x[own..].to_vec();
    let turn = match (
        shape.model,
        factors.first().is_some_and(|d| *d < 0.0),
        factors.get(1).is_some_and(|d| *d < 0.0),
    ) {
        (Model::PureLinearCircular, true, _) => 3,
        (Model::PureDiagonal, true, true) => 3,
        (Model::PureDiagonal, true, false) => 2,
        (Model::PureDiagonal, false, true) => 1,
        _ => return None,
    };
    if shape.model == Model::PureLinearCircular {
        factors[0] = -factors[0];
    } else {
        for (k, factor) in factors.iter_mut().enumerate() {
            if k + 1 != turn {
                *factor = -*factor;
            }
        }
    }
    let [entries] = columns_of(&x[..own], 1, &shape.pivots)[..] else {
        return None;
    };
    let jones = nalgebra::Matrix2::new(entries[0], entries[1], entries[2], entries[3]);
    let turned = if shape.side == Side::Before {
        jones * PAULI[turn].matrix()
    } else {
        PAULI[turn].matrix() * jones
    };
    let (mut x, pivots) = triangular(&[[
        turned[(0, 0)],
        turned[(0, 1)],
        turned[(1, 0)],
        turned[(1, 1)],
    ]]);
    x.extend(factors);
    Some((x, pivots))
}

/// The length of a polarizer's vector means nothing: that it is free is no finding.
fn without_length(determined: &mut Determination, x: &[f64]) {
    let length = x[1].hypot(x[2]).hypot(x[3]);
    determined.null_directions.retain(|direction| {
        let along: f64 = (1..4).map(|k| direction[k] * x[k] / length).sum();
        along.abs() < 0.99
    });
}

/// A parameter that did not move is known.
fn insert_fixed(determined: &mut Determination, place: usize) {
    determined.covariance = determined
        .covariance
        .clone()
        .insert_row(place, 0.0)
        .insert_column(place, 0.0);
    for direction in &mut determined.null_directions {
        direction.insert(place, 0.0);
    }
}

pub(super) fn no_fit() -> Error {
    Error::new(
        "no-fit",
        "The model could not be fitted to this matrix: its exact elements leave no way.",
    )
}
