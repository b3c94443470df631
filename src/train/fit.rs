use std::cell::RefCell;
use std::f64::consts::{FRAC_PI_2, PI};

use nalgebra::{DMatrix, DVector};

use super::null::{NOTHING, NullDirection, null_directions};
use super::remove::with_noise_of_elements;
use super::sequence::Place;
use super::solver::{Minimum, Problem, Stop, minimise};
use super::weights::Weights;
use super::{Definition, Kind, Quantity, Role, Train};
use crate::error::{Error, Result};
use crate::linalg::column_svd;
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::stats::{NormalDraws, chi_squared_tail, f_tail, student_quantile};

/// More free parameters than this can't be told apart by sixteen numbers.
const MOST_FREE: usize = 24;

/// More searches than this take too long.
const MOST_STARTS: usize = 2000;

/// Fits whose χ² differ by less, relative to one and χ², are equally good.
const EQUALLY_GOOD: f64 = 1e-6;

/// A χ² that is larger by less than this is within the noise: 95 % of one parameter.
const NEARLY_AS_GOOD: f64 = 3.84;

/// A bound counts where the gradient presses against it: the cosine between residuals and
/// their derivative.
const PRESSED: f64 = 1e-7;

/// A share of the linear change that its curvature may take away within the interval.
const BENT: f64 = 0.15;

/// How often an interval is halved until it fits between bounds.
const MOST_HALVES: i32 = 6;

/// Solutions that are listed beside the best.
const MOST_EQUIVALENTS: usize = 12;

/// How a train is fitted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct FitOptions {
    /// Of the searches' starting points.
    pub seed: u64,
    /// How many searches, the first from the values of the train; by the number of free
    /// parameters where left out.
    pub starts: Option<usize>,
}

/// A fitted parameter.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FittedParameter {
    /// Which one.
    pub place: Place,
    /// In radians where it is an angle; near the start where it is periodic.
    pub value: f64,
    /// First-order standard error; `None` where it is not determined or at its bound.
    pub se: Option<f64>,
    /// Lower end of the 95 % interval.
    pub low: Option<f64>,
    /// Upper end.
    pub high: Option<f64>,
    /// Whether a bound stopped it.
    pub at_bound: bool,
    /// Why something is `None`.
    pub reason: Option<&'static str>,
}

/// Another solution.
#[derive(Debug, Clone, PartialEq)]
pub struct Equivalent {
    /// In the order of the parameters.
    pub values: Vec<f64>,
    /// Its χ² minus that of the fit; zero where it is the same matrix.
    pub chi_square_difference: f64,
    /// What it is.
    pub sentence: String,
}

/// The free parameters of a train, fitted to a measured matrix.
#[derive(Debug, Clone, PartialEq)]
pub struct TrainFit {
    /// In the order of [`Train::free`].
    pub parameters: Vec<FittedParameter>,
    /// Of the parameters; `None` in the rows and columns of those without standard error.
    pub covariance: Vec<Vec<Option<f64>>>,
    /// The same over the standard errors.
    pub correlation: Vec<Vec<Option<f64>>>,
    /// What cannot be told apart.
    pub null_directions: Vec<NullDirection>,
    /// Other solutions that are as good.
    pub equivalents: Vec<Equivalent>,
    /// `None` without noise.
    pub chi_square: Option<f64>,
    /// Residuals less determined parameters.
    pub degrees_of_freedom: u32,
    /// Of χ², or of F where σ is an estimate.
    pub p_value: Option<f64>,
    /// `χ² + 2k`, or the corrected one of the residual sum without noise.
    pub aic: Option<f64>,
    /// `χ² + k ln n`, or that of the residual sum without noise.
    pub bic: Option<f64>,
    /// The fitted matrix, brought to the exact M00 where there is one.
    pub mueller: Mueller,
    /// Measured minus fitted in σ, row by row; without noise in the σ that the residuals
    /// themselves have; `None` where that is zero or unknown. Zero for exact elements.
    pub residuals: Option<[f64; 16]>,
    /// Why the best search ended.
    pub stop: Stop,
    /// Of all searches.
    pub evaluations: usize,
    /// The train with the fitted values.
    pub train: Train,
}

/// Fits the free parameters of a train to a measured matrix by weighted least squares,
/// from several seeded starts, the train's own values first. The noise of measured elements
/// adds to that of the matrix, to first order. Among equally good solutions
/// the one nearest to those values is the fit; the others are its equivalents.
///
/// Where M00 is exact, the train is compared after bringing its M00 to that.
///
/// # Errors
/// `too-large` for more than 24 free parameters or 2000 starts; `no-solution` where no
/// start gives a matrix; those of the train.
pub fn fit_train(
    measurement: &Measurement,
    train: &Train,
    options: FitOptions,
) -> Result<TrainFit> {
    let places = train.free();
    if places.len() > MOST_FREE || options.starts.is_some_and(|starts| starts > MOST_STARTS) {
        return Err(Error::new(
            "too-large",
            format!(
                "At most {MOST_FREE} parameters can be free, and {MOST_STARTS} starts be asked for."
            ),
        ));
    }
    train.mueller()?;
    let problem = TrainProblem::new(measurement, train, places.clone())?;
    let mut search = problem.search(options)?;
    let best = problem.nearest_to_start(&mut search)?;
    // The noise of measured elements reaches the whole through the others, as these are.
    let Some(with_elements) = with_noise_of_elements(measurement, &problem.at(&best.point))? else {
        return problem.report(measurement, best, search);
    };
    let before = search.evaluations;
    let problem = TrainProblem::new(&with_elements, train, places)?;
    let mut search = problem.search(options)?;
    search.evaluations += before;
    let best = problem.nearest_to_start(&mut search)?;
    problem.report(&with_elements, best, search)
}

/// How a parameter is varied: by what its element is smooth in, also at its limits.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Inner {
    /// As it is.
    Value,
    /// By its root: the transmittances of a diattenuator.
    Root,
    /// By its arc sine: a diattenuation.
    Sine,
}

impl Inner {
    fn of(definition: &Definition, kind: Kind) -> Self {
        match definition.name {
            "diattenuation" => Self::Sine,
            "transmittanceMax" | "transmittanceMin" if kind == Kind::LinearDiattenuator => {
                Self::Root
            }
            _ => Self::Value,
        }
    }

    fn inward(self, value: f64) -> f64 {
        match self {
            Self::Value => value,
            Self::Root => value.max(0.0).sqrt(),
            Self::Sine => value.clamp(-1.0, 1.0).asin(),
        }
    }

    fn outward(self, inner: f64) -> f64 {
        match self {
            Self::Value => inner,
            Self::Root => inner * inner,
            Self::Sine => inner.clamp(-FRAC_PI_2, FRAC_PI_2).sin(),
        }
    }

    /// d value / d inner; never quite zero, where the element's own derivative is infinite.
    fn slope(self, inner: f64) -> f64 {
        match self {
            Self::Value => 1.0,
            Self::Root => 2.0 * inner.abs().max(1e-15),
            Self::Sine => inner.cos().max(1e-15),
        }
    }

    /// The spread of the value where the inner one has this standard error, the curvature
    /// included: it is what is left where the slope is zero.
    fn spread(self, inner: f64, se: f64) -> f64 {
        let second = match self {
            Self::Value => 0.0,
            Self::Root => 2.0,
            Self::Sine => inner.sin(),
        };
        (self.slope(inner) * se).hypot(second * se * se / 2.0_f64.sqrt())
    }
}

struct Free {
    place: Place,
    definition: &'static Definition,
    inner: Inner,
    start: f64,
    /// Of the inner value.
    low: f64,
    high: f64,
    /// What a change of order one is, in the inner value.
    scale: f64,
    /// Where random starts lie.
    range: (f64, f64),
}

struct TrainProblem<'a> {
    train: &'a Train,
    places: Vec<Place>,
    /// The train with the values that are tried: a copy each time would cost more than
    /// its matrix.
    tried: RefCell<Train>,
    free: Vec<Free>,
    weights: Weights,
}

impl Problem for TrainProblem<'_> {
    fn evaluate(&self, point: &[f64]) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let (model, mut changes) = self
            .trying(point, |train| train.derivatives(&self.places))?
            .ok()?;
        for ((change, free), &inner) in changes.iter_mut().zip(&self.free).zip(point) {
            let slope = free.inner.slope(inner);
            *change = change.map(|part| part * slope);
        }
        let model = model.row_major();
        Some((
            self.weights.residuals(&model)?,
            self.weights.jacobian(&model, &changes)?,
        ))
    }

    fn residuals(&self, point: &[f64]) -> Option<DVector<f64>> {
        let model = self.trying(point, Train::mueller)?.ok()?;
        self.weights.residuals(&model.row_major())
    }
}

/// What becomes of a parameter where an element stands with its axes exchanged.
type Change = (&'static str, fn(f64) -> f64);

struct Search {
    /// The best first.
    minima: Vec<Minimum>,
    /// What each one is, beside the best.
    words: Vec<String>,
    evaluations: usize,
}

impl<'a> TrainProblem<'a> {
    fn new(measurement: &Measurement, train: &'a Train, places: Vec<Place>) -> Result<Self> {
        let power = measurement.mueller().m00().abs();
        let free: Vec<Free> = places
            .into_iter()
            .filter_map(|place| {
                let definition = train.definition(place)?;
                let element = train.elements().get(place.element)?;
                let parameter = element.parameters().get(place.parameter)?;
                let Role::Free { low, high } = parameter.role else {
                    return None;
                };
                let inner = Inner::of(definition, element.kind());
                let start = parameter.value;
                let low_value = low.unwrap_or(definition.low);
                let high_value = high.unwrap_or(definition.high);
                let (usual_low, usual_high) = usual(definition, start, power);
                Some(Free {
                    place,
                    definition,
                    inner,
                    start,
                    low: inner.inward(low_value),
                    high: inner.inward(high_value),
                    scale: match definition.quantity {
                        Quantity::Power => {
                            inner.inward(start.abs().max(power).max(f64::MIN_POSITIVE))
                        }
                        _ if definition.name.starts_with("index") => start.abs().max(0.1),
                        _ if definition.name == "absorption" => start.abs().max(1.0),
                        _ => 1.0,
                    },
                    range: (
                        inner.inward(low.unwrap_or(usual_low.clamp(low_value, high_value))),
                        inner.inward(high.unwrap_or(usual_high.clamp(low_value, high_value))),
                    ),
                })
            })
            .collect();
        Ok(Self {
            train,
            places: free.iter().map(|free| free.place).collect(),
            tried: RefCell::new(train.clone()),
            free,
            weights: Weights::of(measurement)?,
        })
    }

    /// What the train with these values gives.
    fn trying<T>(&self, point: &[f64], ask: impl FnOnce(&Train) -> T) -> Option<T> {
        let mut train = self.tried.try_borrow_mut().ok()?;
        for (free, &inner) in self.free.iter().zip(point) {
            train.set_value(free.place, free.inner.outward(inner));
        }
        Some(ask(&train))
    }

    fn values(&self, point: &[f64]) -> Vec<f64> {
        self.free
            .iter()
            .zip(point)
            .map(|(free, &inner)| free.inner.outward(inner))
            .collect()
    }

    fn at(&self, point: &[f64]) -> Train {
        self.train.with_values(&self.places, &self.values(point))
    }

    fn bounds(&self) -> (Vec<f64>, Vec<f64>) {
        let low = self.free.iter().map(|free| free.low).collect();
        let high = self.free.iter().map(|free| free.high).collect();
        (low, high)
    }

    /// Searches from the own values and from points spread evenly over the usual ranges.
    fn search(&self, options: FitOptions) -> Result<Search> {
        let count = self.free.len();
        let starts = options
            .starts
            .unwrap_or_else(|| (10 * count).clamp(1, 64))
            .max(1);
        let (low, high) = self.bounds();
        let mut draws = NormalDraws::new(options.seed);
        let offsets: Vec<f64> = (0..count)
            .map(|_| (draws.draw() * 1e3).rem_euclid(1.0))
            .collect();
        let ratio = golden(count);
        let reach: Vec<f64> = self.free.iter().map(|free| free.scale).collect();
        let mut minima: Vec<Minimum> = Vec::new();
        let (mut evaluations, mut best) = (0, f64::INFINITY);
        for round in 0..starts {
            let start: Vec<f64> = self
                .free
                .iter()
                .enumerate()
                .map(|(k, free)| {
                    if round == 0 {
                        return free.inner.inward(free.start);
                    }
                    let step = ratio.powi(-(k as i32) - 1);
                    let share = (offsets[k] + round as f64 * step).rem_euclid(1.0);
                    free.range.0 + (free.range.1 - free.range.0) * share
                })
                .collect();
            let Some(found) = minimise(self, &start, &low, &high, &reach, best)? else {
                continue;
            };
            evaluations += found.evaluations;
            best = best.min(found.squares);
            minima.push(found);
        }
        minima.sort_by(|a, b| a.squares.total_cmp(&b.squares));
        if minima.is_empty() {
            return Err(Error::new(
                "no-solution",
                "No start within the bounds gives a matrix.",
            ));
        }
        Ok(Search {
            words: vec![String::new(); minima.len()],
            minima,
            evaluations,
        })
    }

    /// Adds what the symmetries of single elements make of the best solutions, and takes
    /// out the one nearest to the start among the equally good.
    fn nearest_to_start(&self, search: &mut Search) -> Result<Minimum> {
        let least = search.minima[0].squares;
        let limit = least + self.equally_good(least);
        let best: Vec<Minimum> = search
            .minima
            .iter()
            .filter(|minimum| minimum.squares <= limit)
            .cloned()
            .collect();
        let mut seeds = best.clone();
        seeds.truncate(MOST_EQUIVALENTS);
        let (low, high) = self.bounds();
        for seed in seeds {
            for (point, words) in self.turned(&seed.point) {
                let inside = point
                    .iter()
                    .enumerate()
                    .all(|(k, &value)| (low[k]..=high[k]).contains(&value));
                if !inside {
                    continue;
                }
                if let Some((residuals, jacobian)) = self.evaluate(&point)
                    && residuals.norm_squared() <= limit
                {
                    search.minima.push(Minimum {
                        squares: residuals.norm_squared(),
                        point,
                        residuals,
                        jacobian,
                        stop: seed.stop,
                        evaluations: 0,
                    });
                    search.words.push(words);
                }
            }
        }
        let nearest = (0..search.minima.len())
            .filter(|&k| search.minima[k].squares <= limit)
            .min_by(|&a, &b| {
                let distance = |k: usize| self.distance(&search.minima[k].point);
                distance(a).total_cmp(&distance(b))
            })
            .unwrap_or_default();
        let mut minimum = search.minima[nearest].clone();
        minimum.point = self.near_start(&minimum.point);
        Ok(minimum)
    }

    fn equally_good(&self, squares: f64) -> f64 {
        EQUALLY_GOOD * squares.max(1e-12)
    }

    /// Periodic values as near to the start as whole periods bring them, within the bounds.
    fn near_start(&self, point: &[f64]) -> Vec<f64> {
        self.free
            .iter()
            .zip(point)
            .map(|(free, &value)| {
                let period = free.definition.period;
                if !period.is_finite() {
                    return value;
                }
                let moved = value - period * ((value - free.start) / period).round();
                if (free.low..=free.high).contains(&moved) {
                    moved
                } else {
                    value
                }
            })
            .collect()
    }

    /// From the start, whole periods apart.
    fn distance(&self, point: &[f64]) -> f64 {
        self.near_start(point)
            .iter()
            .zip(&self.free)
            .map(|(&value, free)| ((value - free.inner.inward(free.start)) / free.scale).powi(2))
            .sum()
    }

    /// The values of other parameters that leave one element's matrix as it is.
    fn turned(&self, point: &[f64]) -> Vec<(Vec<f64>, String)> {
        let mut found = Vec::new();
        for (k, element) in self.train.elements().iter().enumerate() {
            let index = |name: &str| {
                self.free
                    .iter()
                    .position(|free| free.place.element == k && free.definition.name == name)
            };
            let changes: &[Change] = match element.kind() {
                Kind::LinearRetarder => &[("retardance", |x| -x), ("axis", |x| x + FRAC_PI_2)],
                Kind::EllipticalRetarder => &[
                    ("retardance", |x| -x),
                    ("azimuth", |x| x + FRAC_PI_2),
                    ("ellipticity", |x| -x),
                ],
                Kind::AlignedDiattenuatingRetarder => &[
                    ("retardance", |x| -x),
                    ("diattenuation", |x| -x),
                    ("axis", |x| x + FRAC_PI_2),
                ],
                Kind::IsotropicReflector => &[
                    ("psi", |x| FRAC_PI_2 - x),
                    ("delta", |x| -x),
                    ("plane", |x| x + FRAC_PI_2),
                ],
                Kind::LinearDiattenuator => &[("axis", |x| x + FRAC_PI_2)],
                _ => continue,
            };
            let mut turned = point.to_vec();
            for (name, change) in changes {
                if let Some(i) = index(name) {
                    turned[i] = change(point[i]);
                }
            }
            if element.kind() == Kind::LinearDiattenuator
                && let (Some(max), Some(min)) =
                    (index("transmittanceMax"), index("transmittanceMin"))
            {
                turned.swap(max, min);
            }
            // Back into the range, by whole periods.
            for (free, value) in self.free.iter().zip(&mut turned) {
                let period = free.definition.period;
                if period.is_finite() && *value > free.high {
                    *value -= period * ((*value - free.high) / period).ceil();
                } else if period.is_finite() && *value < free.low {
                    *value += period * ((free.low - *value) / period).ceil();
                }
            }
            let turned = self.near_start(&turned);
            if turned != point {
                found.push((
                    turned,
                    format!(
                        "The two axes of {} exchanged, with the values that go with it, give the same matrix.",
                        element.title(k)
                    ),
                ));
            }
        }
        found
    }

    fn report(&self, measurement: &Measurement, best: Minimum, search: Search) -> Result<TrainFit> {
        let count = self.free.len();
        let residual_count = self.weights.count();
        // A bound that nothing presses against takes nothing away from what is free.
        let length = best.residuals.norm();
        let at_bound: Vec<bool> = (0..count)
            .map(|k| {
                let margin = 1e-9 * self.free[k].scale;
                let column = best.jacobian.column(k);
                let cosine =
                    column.dot(&best.residuals) / (column.norm() * length).max(f64::MIN_POSITIVE);
                (best.point[k] <= self.free[k].low + margin && cosine > PRESSED)
                    || (best.point[k] >= self.free[k].high - margin && cosine < -PRESSED)
            })
            .collect();
        let inner: Vec<usize> = (0..count).filter(|&k| !at_bound[k]).collect();
        let scaled = DMatrix::from_fn(residual_count, inner.len(), |row, column| {
            best.jacobian[(row, inner[column])] * self.free[inner[column]].scale
        });
        let factors = column_svd(&scaled)?;
        let largest = factors.values.first().copied().unwrap_or_default();
        // Below this, rounding.
        let numeric = 1e-8 * largest;
        let rank = factors
            .values
            .iter()
            .filter(|&&value| value > numeric && value > 0.0)
            .count()
            .min(residual_count);
        let freedom = residual_count - rank;
        let stated = measurement.has_noise();
        // Of a residual.
        let unit = if stated {
            1.0
        } else if freedom > 0 {
            (best.squares / freedom as f64).sqrt()
        } else {
            0.0
        };
        // A combination whose error is as large as its whole range is not determined.
        let limit = numeric.max(unit);
        let quantile = match (stated, measurement.sigma_freedom()) {
            (true, None) => student_quantile(None),
            (true, freedom) => student_quantile(freedom),
            (false, _) => student_quantile((freedom > 0).then_some(freedom as f64)),
        };
        let known = stated || freedom > 0;
        let determined: Vec<bool> = (0..inner.len())
            .map(|k| {
                let value = factors.values[k];
                if k >= rank || value <= limit {
                    return false;
                }
                let mut direction = vec![0.0; count];
                for (i, &a) in inner.iter().enumerate() {
                    direction[a] = factors.right[(i, k)] * self.free[a].scale;
                }
                let reach = quantile * unit / value;
                !self.turns_back(
                    &best,
                    &direction,
                    &factors.left.column(k).into_owned(),
                    value,
                    reach,
                )
            })
            .collect();
        let mut covariance = DMatrix::<f64>::zeros(count, count);
        let mut null = vec![0.0_f64; count];
        let mut vectors: Vec<(Vec<f64>, bool)> = Vec::new();
        for (k, &is_determined) in determined.iter().enumerate() {
            let direction = factors.right.column(k);
            if is_determined {
                let variance = (unit / factors.values[k]).powi(2);
                for (i, &a) in inner.iter().enumerate() {
                    for (j, &b) in inner.iter().enumerate() {
                        covariance[(a, b)] += variance
                            * direction[i]
                            * direction[j]
                            * self.free[a].scale
                            * self.free[b].scale;
                    }
                }
            } else {
                let mut whole = vec![0.0; count];
                for (i, &a) in inner.iter().enumerate() {
                    null[a] = null[a].hypot(direction[i]);
                    whole[a] = direction[i] * self.free[a].scale;
                }
                vectors.push((whole, k < rank && factors.values[k] > numeric));
            }
        }
        let loose: Vec<bool> = null.iter().map(|part| *part > NOTHING).collect();
        let slopes: Vec<f64> = (0..count)
            .map(|k| self.free[k].inner.slope(best.point[k]))
            .collect();
        let parameters: Vec<FittedParameter> = (0..count)
            .map(|k| {
                let se = covariance[(k, k)].max(0.0).sqrt();
                self.parameter(
                    k,
                    &best,
                    at_bound[k],
                    (known && !loose[k]).then_some(se),
                    loose[k],
                    quantile,
                    unit,
                )
            })
            .collect();
        let errors: Vec<Option<f64>> = parameters.iter().map(|one| one.se).collect();
        let matrix = |value: &dyn Fn(usize, usize) -> f64| -> Vec<Vec<Option<f64>>> {
            (0..count)
                .map(|i| {
                    (0..count)
                        .map(|j| {
                            errors[i]
                                .and(errors[j])
                                .map(|_| value(i, j))
                                .filter(|entry| entry.is_finite())
                        })
                        .collect()
                })
                .collect()
        };
        let in_values = |i: usize, j: usize| covariance[(i, j)] * slopes[i] * slopes[j];
        let correlation = matrix(&|i, j| {
            let scale = (covariance[(i, i)] * covariance[(j, j)]).sqrt();
            if i == j {
                1.0
            } else if scale > 0.0 {
                covariance[(i, j)] / scale
            } else {
                0.0
            }
        });
        let covariance_in_values = matrix(&|i, j| match (i == j, errors[i]) {
            (true, Some(se)) => se * se,
            _ => in_values(i, j),
        });
        let train = self.at(&best.point);
        let mueller = train.mueller()?;
        let compared = self
            .weights
            .compared(&mueller.row_major())
            .unwrap_or(mueller.row_major());
        let directions = null_directions(&train, &self.places, &vectors, &slopes);
        let equivalents = self.equivalents(&best, &search, &loose, &covariance, stated, unit);
        let chi_square = stated.then_some(best.squares.min(f64::MAX));
        let degrees_of_freedom = u32::try_from(freedom).unwrap_or_default();
        let p_value = chi_square.and_then(|value| match measurement.sigma_freedom() {
            Some(of_sigma) => {
                let numerator = f64::from(degrees_of_freedom);
                f_tail(value / numerator, numerator, of_sigma)
            }
            None => chi_squared_tail(value, degrees_of_freedom),
        });
        let (aic, bic) = criteria(stated, best.squares, residual_count as f64, rank as f64);
        Ok(TrainFit {
            parameters,
            covariance: covariance_in_values,
            correlation,
            null_directions: directions,
            equivalents,
            chi_square,
            degrees_of_freedom,
            p_value,
            aic,
            bic,
            residuals: residuals_of(measurement, &compared, freedom),
            mueller: Mueller::from_row_major(&compared)?,
            stop: best.stop,
            evaluations: search.evaluations,
            train,
        })
    }

    /// Whether the residuals bend back within the interval of a combination, as they do
    /// beside a point where two solutions meet: first order would claim too much there.
    fn turns_back(
        &self,
        best: &Minimum,
        direction: &[f64],
        along: &DVector<f64>,
        value: f64,
        reach: f64,
    ) -> bool {
        [reach, -reach].into_iter().any(|whole| {
            // As far as the bounds allow; beyond them lies nothing.
            let step = (0..MOST_HALVES)
                .map(|halves| whole * 0.5_f64.powi(halves))
                .find(|step| {
                    self.free.iter().enumerate().all(|(k, free)| {
                        let value = best.point[k] + step * direction[k];
                        (free.low..=free.high).contains(&value)
                    })
                });
            let Some(step) = step else {
                return false;
            };
            let point: Vec<f64> = (0..direction.len())
                .map(|k| best.point[k] + step * direction[k])
                .collect();
            self.residuals(&point).is_some_and(|residuals| {
                let moved = along.dot(&(residuals - &best.residuals));
                (moved - step * value).abs() > BENT * (step * value).abs()
            })
        })
    }

    #[allow(clippy::too_many_arguments)] // one place computes them all
    fn parameter(
        &self,
        k: usize,
        best: &Minimum,
        at_bound: bool,
        se: Option<f64>,
        loose: bool,
        quantile: f64,
        unit: f64,
    ) -> FittedParameter {
        let free = &self.free[k];
        let point = best.point[k];
        let mut fitted = FittedParameter {
            place: free.place,
            value: free.inner.outward(point),
            se: None,
            low: None,
            high: None,
            at_bound,
            reason: None,
        };
        let ends = |low: f64, high: f64| {
            let limit = |value: f64| {
                free.inner
                    .outward(value.clamp(free.low.max(-1e150), free.high.min(1e150)))
            };
            (Some(limit(low)), Some(limit(high)))
        };
        if loose {
            fitted.reason = Some("it can't be told apart from others");
        } else if at_bound {
            fitted.reason = Some("it is at its bound");
            // One side of the interval is the bound, the other as if nothing else was free.
            let error = unit / best.jacobian.column(k).norm();
            if error.is_finite() && unit > 0.0 {
                (fitted.low, fitted.high) =
                    ends(point - quantile * error, point + quantile * error);
            }
        } else if let Some(se) = se {
            let spread = free.inner.spread(point, se);
            if !spread.is_finite() {
                fitted.reason = Some("its error is out of range");
            } else if 2.0 * quantile * se > free.definition.period / 2.0 {
                fitted.se = Some(spread);
                fitted.reason = Some("its interval exceeds half of its period");
            } else {
                fitted.se = Some(spread);
                (fitted.low, fitted.high) = ends(point - quantile * se, point + quantile * se);
            }
        } else {
            fitted.reason = Some("no noise is stated and no residual is left to estimate it");
        }
        fitted
    }

    /// Solutions as good as the best, but elsewhere in what is determined.
    fn equivalents(
        &self,
        best: &Minimum,
        search: &Search,
        loose: &[bool],
        covariance: &DMatrix<f64>,
        stated: bool,
        unit: f64,
    ) -> Vec<Equivalent> {
        let least = best.squares;
        let equal = self.equally_good(least);
        let nearly = if stated {
            NEARLY_AS_GOOD
        } else {
            NEARLY_AS_GOOD * unit * unit
        };
        let mut order: Vec<usize> = (0..search.minima.len()).collect();
        // Those with words of their own first.
        order.sort_by(|&a, &b| {
            let class = |k: usize| {
                let difference = search.minima[k].squares - least;
                (difference > equal, search.words[k].is_empty())
            };
            class(a).cmp(&class(b)).then(
                self.distance(&search.minima[a].point)
                    .total_cmp(&self.distance(&search.minima[b].point)),
            )
        });
        let mut kept: Vec<Vec<f64>> = vec![best.point.clone()];
        let mut found = Vec::new();
        for k in order {
            let minimum = &search.minima[k];
            let difference = (minimum.squares - least).max(0.0);
            if difference > nearly.max(equal) || found.len() >= MOST_EQUIVALENTS {
                continue;
            }
            let point = self.near_start(&minimum.point);
            let same = |other: &Vec<f64>| {
                (0..point.len()).filter(|&i| !loose[i]).all(|i| {
                    let period = self.free[i].definition.period;
                    let mut apart = point[i] - other[i];
                    if period.is_finite() {
                        apart -= period * (apart / period).round();
                    }
                    let error = covariance[(i, i)].max(0.0).sqrt();
                    apart.abs() <= (1e-4 * self.free[i].scale).max(3.0 * error)
                })
            };
            if kept.iter().any(same) {
                continue;
            }
            let sentence = match (search.words[k].as_str(), difference <= equal) {
                ("", true) => "Other values give the same matrix.",
                ("", false) => "Other values fit nearly as well, within the noise.",
                (words, _) => words,
            };
            found.push(Equivalent {
                values: self.values(&point),
                chi_square_difference: if difference <= equal { 0.0 } else { difference },
                sentence: sentence.to_owned(),
            });
            kept.push(point);
        }
        found
    }
}

/// Where a parameter usually lies, for random starts.
fn usual(definition: &Definition, start: f64, power: f64) -> (f64, f64) {
    match (definition.quantity, definition.name) {
        (Quantity::Power, _) => (0.0, 1.2 * power.max(start.abs()).max(f64::MIN_POSITIVE)),
        (_, "alpha") => (0.0, 1.0),
        (_, "indexBefore" | "indexAfter") => (0.5 * start, 2.0 * start),
        (_, "absorption") => (0.0, 2.0 * start.max(1.0)),
        _ if definition.period.is_finite() => (
            start - definition.period / 2.0,
            start + definition.period / 2.0,
        ),
        _ => (definition.low.max(-PI), definition.high.min(PI)),
    }
}

/// The root of `x^(n+1) = x + 1`: its powers spread points evenly (M. Roberts 2018).
fn golden(count: usize) -> f64 {
    let mut x: f64 = 2.0;
    for _ in 0..40 {
        x = (1.0 + x).powf(1.0 / (count as f64 + 1.0));
    }
    x
}

/// Akaike's and the Bayesian criterion.
fn criteria(stated: bool, squares: f64, n: f64, k: f64) -> (Option<f64>, Option<f64>) {
    let finite = |value: f64| Some(value).filter(|value| value.is_finite());
    if stated {
        return (finite(squares + 2.0 * k), finite(squares + k * n.ln()));
    }
    // σ is one more parameter.
    let with_sigma = k + 1.0;
    let room = n - with_sigma - 1.0;
    let likelihood = n * (squares / n).ln();
    let aic = likelihood + 2.0 * with_sigma + 2.0 * with_sigma * (with_sigma + 1.0) / room;
    (
        finite(aic).filter(|_| room >= 1.0),
        finite(likelihood + with_sigma * n.ln()),
    )
}

/// Measured minus fitted, in standard deviations.
fn residuals_of(
    measurement: &Measurement,
    fitted: &[f64; 16],
    freedom: usize,
) -> Option<[f64; 16]> {
    let measured = measurement.mueller().row_major();
    let difference: [f64; 16] = std::array::from_fn(|k| measured[k] - fitted[k]);
    let sigma = match measurement.element_sigma() {
        Some(sigma) => sigma,
        None => {
            let squares: f64 = difference.iter().map(|part| part * part).sum();
            [(squares / freedom.max(1) as f64).sqrt(); 16]
        }
    };
    if sigma.iter().all(|sigma| *sigma == 0.0) {
        return None;
    }
    Some(std::array::from_fn(|k| {
        if sigma[k] > 0.0 {
            difference[k] / sigma[k]
        } else {
            0.0
        }
    }))
    .filter(|residuals: &[f64; 16]| residuals.iter().all(|value| value.is_finite()))
}
