use nalgebra::{Matrix4, SMatrix, SVector};

use super::sample::pure_isotropic;
use super::{Element, Train};
use crate::coherency::{nearest, weighted_nearest};
use crate::error::{Error, Place, Result};
use crate::linalg::svd4;
use crate::mueller::Mueller;
use crate::noise::{Measurement, Noise};
use crate::tolerance;

type Matrix16 = SMatrix<f64, 16, 16>;

/// What is to be taken away from what.
#[derive(Debug, Clone, Copy)]
pub struct Removal<'a> {
    /// The sample with the optics before and behind it.
    pub measured: &'a Measurement,
    /// What the light meets before the sample.
    pub pre: &'a Train,
    /// What it meets after the sample.
    pub post: &'a Train,
    /// Whether the sample reflects or scatters back: then `diag(1, 1, -1, -1)`, which is
    /// that of a mirror at normal incidence, is taken out too.
    pub reflection: bool,
}

/// The sample alone.
#[derive(Debug, Clone, PartialEq)]
pub struct Removed {
    /// `Post⁻¹ M Pre⁻¹`; divided by its M00 where that of the measurement is exact.
    pub mueller: Mueller,
    /// Of its elements, to first order, from the noise of the measurement and that of the
    /// optics; `None` where neither is stated.
    pub covariance: Option<Box<[f64; 256]>>,
    /// Whether M00 is exact: it was so in the measurement.
    pub m00_is_exact: bool,
    /// The same as a measurement; `None` where its M00 is zero or the covariance is too
    /// singular for a statement of noise.
    pub measurement: Option<Measurement>,
    /// Of the map from measured to removed matrices, in the 2-norm: the worst growth of a
    /// relative error.
    pub condition_number: f64,
    /// The σ of each element over its matrix's M00, over the same of the measurement (root
    /// mean square of its elements). Without stated noise: for equal errors.
    pub sigma_growth: Option<[f64; 16]>,
    /// Realizable samples that explain the measurement best: these never leave what is
    /// physical.
    pub samples: Vec<Sample>,
}

/// A fitted sample with the optics held as they are.
#[derive(Debug, Clone, PartialEq)]
pub struct Sample {
    /// As in the interface.
    pub model: &'static str,
    /// The sample.
    pub mueller: Mueller,
    /// The weighted squared distance to the measurement; `None` without noise.
    pub chi_square: Option<f64>,
    /// Of χ²; `None` for a model that takes up every degree of freedom.
    pub degrees_of_freedom: Option<u32>,
    /// Of χ²; `None` without noise.
    pub p_value: Option<f64>,
    /// The isotropic depolarization of a pure sample, in parallel.
    pub alpha: Option<f64>,
    /// Its first-order standard error.
    pub alpha_se: Option<f64>,
    /// The distance from the removed matrix, over its M00.
    pub distance: f64,
}

/// Takes known optics away: `S = Post⁻¹ M Pre⁻¹`, with
/// `δS = Post⁻¹ δM Pre⁻¹ - Post⁻¹ δPost S - S δPre Pre⁻¹` (derived).
///
/// # Errors
/// `singular-element` for one that can't be taken away, since it lets some state vanish
/// or, measured, can't be told from one that does: at `pre[k]` or `post[k]`; those of the
/// trains.
pub fn remove_optics(request: &Removal) -> Result<Removed> {
    let pre = Side::of(request.pre, "pre")?;
    let post = Side::of(request.post, "post")?;
    let measured = request.measured;
    let matrix = *measured.mueller().matrix();
    let mut sample = post.inverse * matrix * pre.inverse;
    let map = kronecker(&post.inverse, &pre.inverse.transpose());
    let noise = covariance_of(measured)?.map(|covariance| map * covariance * map.transpose());
    let mut total = noise;
    for (element, covariance) in &pre.uncertain {
        let jacobian = kronecker(
            &(sample * element.left),
            &(element.right * pre.inverse).transpose(),
        );
        add(&mut total, &(jacobian * covariance * jacobian.transpose()));
    }
    for (element, covariance) in &post.uncertain {
        let jacobian = kronecker(
            &(post.inverse * element.left),
            &(element.right * sample).transpose(),
        );
        add(&mut total, &(jacobian * covariance * jacobian.transpose()));
    }
    // Equal errors stand in for noise that is not stated: growth and weights need some.
    let equal = Matrix16::from_diagonal(&SVector::from_fn(|k, _| {
        if k == 0 && measured.m00_is_exact() {
            0.0
        } else {
            1.0
        }
    }));
    let mut weights = total.unwrap_or_else(|| map * equal * map.transpose());
    if request.reflection {
        let signs = SVector::<f64, 16>::from_fn(|k, _| if k < 8 { 1.0 } else { -1.0 });
        let signs = Matrix16::from_diagonal(&signs);
        sample = Matrix4::from_diagonal(&[1.0, 1.0, -1.0, -1.0].into()) * sample;
        weights = signs * weights * signs;
    }
    let absolute = measured.absolute() && !measured.m00_is_exact();
    let out_of_range = || {
        Error::new(
            "too-large",
            "Without the optics the sample has elements beyond 1e150.",
        )
        .at_field("pre")
    };
    let mut mueller = in_range(&sample).map_err(|_| out_of_range())?;
    let mut m00_is_exact = false;
    if measured.m00_is_exact()
        && let Some(normalised) = mueller.normalised()
    {
        weights = divided(&mueller, &normalised, &weights);
        mueller = normalised;
        m00_is_exact = true;
    }
    let noise_is_stated = total.is_some();
    let values: Box<[f64; 256]> = Box::new(std::array::from_fn(|k| weights[(k / 16, k % 16)]));
    if values.iter().any(|value| !value.is_finite()) {
        return Err(out_of_range());
    }
    let measurement = Measurement::new(
        mueller,
        m00_is_exact,
        absolute,
        Noise::Covariance {
            covariance: values.clone(),
        },
    )
    .ok();
    let before = match measured.typical_sigma() {
        Some(sigma) if noise_is_stated => sigma,
        _ => 1.0,
    };
    let has_reference = measured.has_noise() || !noise_is_stated;
    let growth = (has_reference
        && mueller.normalised().is_some()
        && measured.mueller().normalised().is_some())
    .then(|| {
        let relative = measured.mueller().m00().abs() / before / mueller.m00().abs();
        std::array::from_fn(|k| weights[(k, k)].max(0.0).sqrt() * relative)
    })
    .filter(|growth: &[f64; 16]| growth.iter().all(|value| value.is_finite()));
    let samples = match &measurement {
        Some(measurement) => realizable(measurement, noise_is_stated)?,
        None => Vec::new(),
    };
    let measurement = match measurement {
        Some(_) if !noise_is_stated => Some(Measurement::new(
            mueller,
            m00_is_exact,
            absolute,
            Noise::None,
        )?),
        other => other,
    };
    Ok(Removed {
        mueller,
        covariance: noise_is_stated.then_some(values),
        m00_is_exact,
        measurement,
        condition_number: pre.condition * post.condition,
        sigma_growth: growth,
        samples,
    })
}

/// A side of the sample, ready to be taken away.
struct Side {
    inverse: Matrix4<f64>,
    condition: f64,
    uncertain: Vec<(Around, Matrix16)>,
}

/// What stands around a measured element on its side.
struct Around {
    left: Matrix4<f64>,
    right: Matrix4<f64>,
}

impl Side {
    fn of(train: &Train, name: &str) -> Result<Self> {
        let at = |error: Error| match &error.at {
            Some(Place::Field(path)) => {
                let path = format!("{name}{path}");
                error.at_field(path)
            }
            _ => error,
        };
        let whole = train.mueller().map_err(at)?;
        for (k, element) in train.elements().iter().enumerate() {
            if element.disabled() {
                continue;
            }
            let matrix = train.matrix_of(k).map_err(at)?;
            if !can_be_undone(&matrix, element)? {
                return Err(Error::new(
                    "singular-element",
                    format!(
                        "{} can't be taken away: it lets some of the light vanish for good, or can't be told from an element that does.",
                        element.title(k)
                    ),
                )
                .at_field(format!("{name}[{k}]")));
            }
        }
        let factors = svd4(whole.matrix())?;
        let inverse = factors.inverse(tolerance::SINGULAR).ok_or_else(|| {
            Error::new(
                "singular-element",
                "The elements can each be taken away, but not all of them together: too little is left of some state.",
            )
            .at_field(name)
        })?;
        Ok(Self {
            inverse,
            condition: factors.values[0] / factors.values[3],
            uncertain: uncertain_elements(train).map_err(at)?,
        })
    }
}

/// Whether the smallest singular value is more than rounding, and more than the noise of
/// a measured element makes of zero.
fn can_be_undone(matrix: &Mueller, element: &Element) -> Result<bool> {
    let factors = svd4(matrix.matrix())?;
    if factors.inverse(tolerance::SINGULAR).is_none() {
        return Ok(false);
    }
    let gradient = std::array::from_fn(|k| factors.left[3][k / 4] * factors.right[3][k % 4]);
    let error = element
        .measurement()
        .and_then(|measurement| measurement.standard_error(&gradient));
    Ok(error.is_none_or(|error| factors.values[3] >= tolerance::STANDARD_ERRORS * error))
}

/// The samples within the physical that come nearest, under the covariance.
///
/// `(M - Post S Pre)ᵀ Σ⁻¹ (…)` is the same number as the distance of S from the removed
/// matrix under the covariance of that, so no fit through the optics is needed.
fn realizable(measurement: &Measurement, noise_is_stated: bool) -> Result<Vec<Sample>> {
    let mueller = measurement.mueller();
    let mut samples = Vec::new();
    samples.extend(pure_isotropic(measurement, noise_is_stated)?);
    let Some(covariance) = measurement.covariance() else {
        return Ok(samples);
    };
    let found = weighted_nearest(&mueller.row_major(), covariance)
        .ok()
        .flatten();
    let near = found
        .as_ref()
        .and_then(|found| Mueller::from_row_major(&found.elements).ok());
    if let (Some(found), Some(near)) = (found, near)
        // What rounding left below zero goes.
        && let Some(exact) = nearest(&near, measurement.m00_is_exact())?
    {
        samples.push(Sample {
            model: "realizable",
            distance: relative_distance(&exact.mueller, mueller),
            mueller: exact.mueller,
            chi_square: noise_is_stated.then_some(found.statistic),
            degrees_of_freedom: None,
            p_value: None,
            alpha: None,
            alpha_se: None,
        });
    }
    Ok(samples)
}

pub(super) fn relative_distance(one: &Mueller, other: &Mueller) -> f64 {
    one.distance(other) / other.m00().abs().max(f64::MIN_POSITIVE)
}

/// The measurement with the noise of a train's measured elements added to its own; `None`
/// where there is none, or nothing is said of the measurement's own.
pub(super) fn with_noise_of_elements(
    measurement: &Measurement,
    train: &Train,
) -> Result<Option<Measurement>> {
    let Some(mut total) = covariance_of(measurement)? else {
        return Ok(None);
    };
    let whole = train.mueller()?;
    let Some(normalised) = whole.normalised() else {
        return Ok(None);
    };
    let parts = uncertain_elements(train)?;
    if parts.is_empty() {
        return Ok(None);
    }
    for (around, covariance) in parts {
        let jacobian = kronecker(&around.left, &around.right.transpose());
        let part = jacobian * covariance * jacobian.transpose();
        total += if measurement.m00_is_exact() {
            // The model is brought to the exact M00.
            let scale = measurement.mueller().m00();
            divided(&whole, &normalised, &part) * (scale * scale)
        } else {
            part
        };
    }
    let covariance = Box::new(std::array::from_fn(|k| total[(k / 16, k % 16)]));
    Measurement::new(
        *measurement.mueller(),
        measurement.m00_is_exact(),
        measurement.absolute(),
        Noise::Covariance { covariance },
    )
    .map(Some)
}

/// The measured elements in the beam whose noise is stated, with what stands around them.
fn uncertain_elements(train: &Train) -> Result<Vec<(Around, Matrix16)>> {
    let mut uncertain = Vec::new();
    for (k, element) in train.elements().iter().enumerate() {
        let covariance = element.measurement().map(covariance_of).transpose()?;
        let Some(covariance) = covariance.flatten().filter(|_| !element.disabled()) else {
            continue;
        };
        let part = |range: std::ops::Range<usize>| -> Result<Matrix4<f64>> {
            range
                .into_iter()
                .try_fold(Matrix4::identity(), |product, i| {
                    Ok(train.matrix_of(i)?.matrix() * product)
                })
        };
        let around = Around {
            left: part(k + 1..train.elements().len())?,
            right: part(0..k)?,
        };
        uncertain.push((around, covariance));
    }
    Ok(uncertain)
}

/// `J Σ Jᵀ` with `J = (I - m e00ᵀ) / M00`.
fn divided(mueller: &Mueller, normalised: &Mueller, covariance: &Matrix16) -> Matrix16 {
    let m = SVector::<f64, 16>::from(normalised.row_major());
    let mut jacobian = Matrix16::identity();
    let mut column = jacobian.column_mut(0);
    column -= m;
    jacobian /= mueller.m00();
    let mut covariance = jacobian * covariance * jacobian.transpose();
    // Exactly, not to rounding.
    covariance.row_mut(0).fill(0.0);
    covariance.column_mut(0).fill(0.0);
    covariance
}

/// `vec(A X B)` of a matrix row by row is `(A ⊗ Bᵀ) vec(X)`; here from A and Bᵀ.
fn kronecker(a: &Matrix4<f64>, b_transposed: &Matrix4<f64>) -> Matrix16 {
    Matrix16::from_fn(|row, column| a[(row / 4, column / 4)] * b_transposed[(row % 4, column % 4)])
}

fn add(total: &mut Option<Matrix16>, part: &Matrix16) {
    *total = Some(match total {
        Some(total) => *total + part,
        None => *part,
    });
}

/// `None` where nothing was said of the noise.
pub(super) fn covariance_of(measurement: &Measurement) -> Result<Option<Matrix16>> {
    if let Some(covariance) = measurement.covariance() {
        return Ok(Some(Matrix16::from_row_slice(&covariance.row_major())));
    }
    Ok(measurement
        .element_sigma()
        .map(|sigma| Matrix16::from_diagonal(&SVector::from_fn(|k, _| sigma[k] * sigma[k]))))
}

fn in_range(matrix: &Matrix4<f64>) -> Result<Mueller> {
    Mueller::from_row_major(&std::array::from_fn(|k| matrix[(k / 4, k % 4)]))
}
