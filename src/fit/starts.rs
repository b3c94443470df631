use std::f64::consts::{FRAC_PI_2, FRAC_PI_4};

use nalgebra::{SVector, Vector3};
use num_complex::Complex64;

use super::models::{Model, Side, triangular};
use super::target::Target;
use crate::coherency::Coherency;
use crate::decompose::{PolarFactors, polar_forward};
use crate::error::Result;
use crate::linalg::HermitianEigen;
use crate::mueller::Mueller;
use crate::stats::NormalDraws;

/// Random starts of the models that may have several minima.
const RANDOM: usize = 3;

/// A diattenuation to start with that is not at its end.
const MOST_DIATTENUATION: f64 = 0.98;

/// What a measured matrix suggests, in units of its M00.
pub(super) struct Guide {
    pub eigen: HermitianEigen,
    /// The pure part of the best pure element with isotropic depolarization.
    pure: [Complex64; 4],
    alpha: f64,
    /// Of that part.
    factors: Option<PolarFactors>,
    /// Of the whole, the depolarizer last, and of its transpose.
    whole: Option<PolarFactors>,
    reverse: Option<PolarFactors>,
    diattenuation: Vector3<f64>,
    m00: f64,
}

impl Guide {
    pub fn of(target: &Target) -> Result<Self> {
        let elements: [f64; 16] = target.elements.into();
        let eigen = Coherency::from_elements(&elements).eigen()?;
        let m00 = elements[0];
        let from_top = eigen.values[0] - m00 / 4.0 >= m00 / 4.0 - eigen.values[3];
        let leading = if from_top { 0 } else { 3 };
        let rest = (m00 - eigen.values[leading]) / 3.0;
        let pure = column(&eigen, leading, m00.abs());
        let mueller = |elements: &[f64; 16]| Mueller::from_row_major(elements).ok();
        let of_pure = pure_mueller(&[pure]);
        let normalised = of_pure.and_then(|m| m.normalised());
        let factors = normalised.map(|m| polar_forward(&m, None)).transpose()?;
        let clipped = eigen.values.map(|value| value.max(0.0));
        let realizable = Coherency::from_spectrum(&clipped, &eigen).mueller();
        let realizable = realizable.normalised().filter(|_| realizable.m00() > 0.0);
        let diattenuation = mueller(&elements)
            .and_then(|m| m.normalised())
            .map(|m| m.row_major())
            .map_or_else(Vector3::zeros, |m| {
                Vector3::new(m[1] + m[4], m[2] + m[8], m[3] + m[12]) * 0.5
            });
        Ok(Self {
            pure,
            alpha: if m00 == 0.0 { 0.0 } else { 4.0 * rest / m00 },
            factors,
            whole: realizable.map(|m| polar_forward(&m, None)).transpose()?,
            reverse: realizable
                .map(|m| polar_forward(&m.transpose(), None))
                .transpose()?,
            diattenuation,
            m00,
            eigen,
        })
    }

    /// Where to start a model, and the order of its Jones entries.
    pub fn starts(&self, model: Model, side: Side, seed: u64) -> (Vec<Vec<f64>>, [usize; 4]) {
        let retarder = self
            .factors
            .and_then(|factors| factors.parameters)
            .map_or([0.0; 3], |parameters| parameters.vector);
        let alpha = self.alpha;
        let t = self.m00;
        let fast = 0.5 * retarder[1].atan2(retarder[0]);
        let linear = retarder[0].hypot(retarder[1]);
        let d = self.diattenuation;
        let bright = 0.5 * d[1].atan2(d[0]);
        let lean = d.norm().min(MOST_DIATTENUATION).asin();
        let angles = (0..4).map(|k| FRAC_PI_4 * f64::from(k) + 0.2);
        let simple = [0, 1, 2, 3];
        match model {
            Model::LinearRetarder => {
                let mut starts = vec![vec![t, linear, fast, alpha]];
                starts.extend(angles.map(|angle| vec![t, FRAC_PI_2, angle, alpha]));
                (starts, simple)
            }
            Model::LinearDiattenuator => {
                let mut starts = vec![vec![t, lean, bright, alpha]];
                starts.extend(angles.map(|angle| vec![t, 0.5, angle, alpha]));
                (starts, simple)
            }
            Model::AlignedDiattenuatingRetarder => {
                let mut starts = vec![
                    vec![t, lean, linear, fast, alpha],
                    vec![t, -lean, linear, fast, alpha],
                    vec![t, lean, linear, bright, alpha],
                    vec![t, lean, -linear, bright, alpha],
                ];
                starts.extend(angles.map(|angle| vec![t, 0.3, 1.0, angle, alpha]));
                (starts, simple)
            }
            Model::EllipticalRetarder => {
                let [a, b, c] = retarder;
                let mut starts = vec![vec![t, a, b, c, alpha]];
                starts.extend((0..3).map(|k| {
                    let unit = Vector3::ith(k, FRAC_PI_2);
                    vec![t, unit[0], unit[1], unit[2], alpha]
                }));
                (starts, simple)
            }
            Model::EllipticalDiattenuator => {
                let w = d.try_normalize(1e-12).unwrap_or_else(Vector3::x) * lean;
                let mut starts = vec![vec![t, w[0], w[1], w[2], alpha]];
                starts.extend((0..6).map(|k| {
                    let unit = Vector3::ith(k % 3, if k < 3 { 0.4 } else { -0.4 });
                    vec![t, unit[0], unit[1], unit[2], alpha]
                }));
                (starts, simple)
            }
            Model::Pure => {
                let (x, pivots) = triangular(&[column(&self.eigen, 0, self.eigen.values[0])]);
                (vec![x], pivots)
            }
            Model::PureIsotropic if side != Side::Parallel => {
                self.with_depolarizer(model, side, seed)
            }
            Model::PureIsotropic => {
                let (mut x, pivots) = triangular(&[self.pure]);
                x.push(alpha);
                let mut starts = vec![x.clone()];
                // The other end of the spectrum, should the weights prefer it.
                let other = if alpha > 1.0 { 0 } else { 3 };
                let (mut second, other_pivots) =
                    triangular(&[column(&self.eigen, other, self.m00.abs())]);
                if other_pivots == pivots {
                    second.push(4.0 / 3.0 * (1.0 - self.eigen.values[other] / self.m00));
                    starts.push(second);
                }
                (starts, pivots)
            }
            Model::PureLinearCircular | Model::PureDiagonal => {
                self.with_depolarizer(model, side, seed)
            }
            Model::RankTwo | Model::RankThree | Model::RankFour => {
                let (x, pivots) = mixture_start(&self.eigen, model.rank().unwrap_or(4));
                (vec![x], pivots)
            }
        }
    }

    fn with_depolarizer(&self, model: Model, side: Side, seed: u64) -> (Vec<Vec<f64>>, [usize; 4]) {
        let (factors, is_reverse) = match side {
            Side::Before => (&self.reverse, true),
            _ => (&self.whole, false),
        };
        let from_factors = factors.as_ref().and_then(|factors| {
            let product = factors.retarder? * factors.diattenuator;
            let product = if is_reverse {
                product.transpose()
            } else {
                product
            };
            let eigen = Coherency::from_mueller(&product).eigen().ok()?;
            let d = factors.depolarizer?.row_major();
            Some((
                column(&eigen, 0, eigen.values[0] * self.m00.abs()),
                [d[5], d[10], d[15]],
            ))
        });
        let (guide, d) = from_factors.unwrap_or((self.pure, [1.0 - self.alpha; 3]));
        let (own, pivots) = triangular(&[guide]);
        let with = |own: &[f64], d: [f64; 3]| {
            let mut x = own.to_vec();
            match model {
                Model::PureIsotropic => x.push(1.0 - (d[0] + d[1] + d[2]) / 3.0),
                Model::PureLinearCircular => x.extend([0.5 * (d[0] + d[1]), d[2]]),
                _ => x.extend(d),
            }
            x
        };
        let mut starts = vec![with(&own, d), with(&own, [1.0 - self.alpha; 3])];
        let mut draws = NormalDraws::new(seed);
        for k in 0..RANDOM {
            let moved: Vec<f64> = own.iter().map(|value| value + 0.3 * draws.draw()).collect();
            let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
            starts.push(with(&moved, [d[0], d[1], sign * d[2]]));
        }
        (starts, pivots)
    }
}

/// The largest eigenvalues, none of them zero: what is zero could not grow.
pub(super) fn mixture_start(eigen: &HermitianEigen, rank: usize) -> (Vec<f64>, [usize; 4]) {
    let least = 1e-4 * eigen.values[0].abs();
    let columns: Vec<_> = (0..rank)
        .map(|k| column(eigen, k, eigen.values[k].max(least)))
        .collect();
    triangular(&columns)
}

/// `sqrt(2λ)` times an eigenvector: the entries of a Jones matrix.
fn column(eigen: &HermitianEigen, k: usize, value: f64) -> [Complex64; 4] {
    let scale = (2.0 * value.max(0.0)).sqrt();
    std::array::from_fn(|i| eigen.vectors[k][i] * scale)
}

/// The Mueller matrix of a mixture of Jones matrices.
pub(super) fn pure_mueller(columns: &[[Complex64; 4]]) -> Option<Mueller> {
    let mut h = nalgebra::Matrix4::<Complex64>::zeros();
    for column in columns {
        h += nalgebra::Matrix4::from_fn(|i, j| 0.5 * column[i] * column[j].conj());
    }
    let mueller = Coherency::from_matrix(h).mueller();
    let elements = SVector::<f64, 16>::from(mueller.row_major());
    elements.iter().all(|v| v.is_finite()).then_some(mueller)
}
