use nalgebra::{Matrix3, Vector3};

use crate::error::Result;
use crate::linalg::svd3;
use crate::mueller::{Mueller, unit_diattenuator};
use crate::state::half_turn;
use crate::tolerance;

/// Depolarizer, retarder and diattenuator of a normalised matrix.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PolarFactors {
    /// `None` where not determined.
    pub depolarizer: Option<Mueller>,
    /// `None` where not determined.
    pub retarder: Option<Mueller>,
    /// Always determined.
    pub diattenuator: Mueller,
    /// Frobenius distance of the product from the matrix.
    pub residual: Option<f64>,
    /// `1 - |tr mΔ| / 3`; `None` where not determined.
    pub depolarization_power: Option<f64>,
    /// Of the retarder; `None` where not determined.
    pub parameters: Option<RetarderParameters>,
    /// Why something is not determined, or what to know about it.
    pub reason: Option<&'static str>,
}

/// A retarder in terms of physical parameters, radians.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RetarderParameters {
    /// In [0, π].
    pub retardance: f64,
    /// Unit vector of the fast eigenstate on the sphere; `None` near zero
    /// retardance. Near π, where fast and slow can't be told apart, the first
    /// component that is not zero is positive.
    pub axis: Option<[f64; 3]>,
    /// Retardance times axis, smooth also where both vanish.
    pub vector: [f64; 3],
    /// The same of the linear part: the two components on the equator.
    pub linear_vector: [f64; 2],
    /// `½ atan2(a1, a0)` in [0, π); `None` also for a circular retarder.
    pub azimuth: Option<f64>,
    /// `½ asin a2`.
    pub ellipticity: Option<f64>,
    /// Of the linear part, in [0, π].
    pub linear_retardance: f64,
    /// Counter-clockwise rotation in (-π/2, π/2]; `None` where the linear part is
    /// a half-wave retarder.
    pub rotation: Option<f64>,
    /// Fast axis of the linear part, where that follows the rotator, in [0, π);
    /// `None` where there is no linear part or it is a half-wave retarder.
    pub fast_axis: Option<f64>,
}

const POLARIZER: &str = "the diattenuation is 1 within its error: a polarizer leaves retarder and depolarizer undetermined";
const ONE_DIMENSION: &str =
    "at most one polarization component survives, so the retarder is not determined";
const MIRROR_AXIS: &str = "the determinant is negative and the two smallest principal depolarization factors agree within their error, so the retarder is not determined";
const MIRROR: &str = "the determinant is negative: the sign was given to the smallest principal depolarization factor, where the original method turns the sign of all three";

/// `m = mΔ mR mD`: the diattenuator acts first, the depolarizer last (Lu & Chipman
/// 1996), for a realizable matrix with M00 = 1.
///
/// `sigma` is the standard error of a normalised element, if known: it decides
/// what is *not determined*. The negative determinant goes to the smallest
/// singular value, which is continuous where that is zero; the original overall
/// sign is not.
///
/// # Errors
/// `no-convergence`.
pub fn polar_forward(normalised: &Mueller, sigma: Option<f64>) -> Result<PolarFactors> {
    let m = normalised.matrix();
    let vector = Vector3::new(m[(0, 1)], m[(0, 2)], m[(0, 3)]);
    let diattenuation = vector.norm().min(1.0);
    let diattenuator = unit_diattenuator(&vector);
    let threshold = sigma.map_or(tolerance::NOT_DETERMINED, |sigma| {
        tolerance::STANDARD_ERRORS * sigma
    });
    let mut factors = PolarFactors {
        depolarizer: None,
        retarder: None,
        diattenuator,
        residual: None,
        depolarization_power: None,
        parameters: None,
        reason: None,
    };
    if 1.0 - diattenuation < threshold {
        factors.reason = Some(POLARIZER);
        return Ok(factors);
    }

    // MD(D)⁻¹ = MD(-D) / (1 - D²)
    let inverse = unit_diattenuator(&-vector).matrix() / (1.0 - diattenuation * diattenuation);
    let product = m * inverse;
    let block = product.fixed_view::<3, 3>(1, 1).into_owned();
    let polarizance = product.fixed_view::<3, 1>(1, 0).into_owned();
    let svd = svd3(&block)?;
    let [s1, s2, s3] = svd.values;
    let sign = svd.left.determinant().signum() * svd.right_transposed.determinant().signum();
    let mirrored = sign < 0.0 && s3 >= threshold;
    factors.depolarization_power = Some(1.0 - (s1 + s2 + sign * s3).abs() / 3.0);

    if mirrored && s2 - s3 < threshold {
        factors.reason = Some(MIRROR_AXIS);
        return Ok(factors);
    }
    let principal = Matrix3::from_diagonal(&Vector3::new(s1, s2, sign * s3));
    let depolarizer = Mueller::from_parts(
        &Vector3::zeros(),
        &polarizance,
        &(svd.left * principal * svd.left.transpose()),
    );
    factors.depolarizer = Some(depolarizer);
    if s2 < threshold {
        factors.reason = Some(ONE_DIMENSION);
        return Ok(factors);
    }
    let rotation =
        svd.left * Matrix3::from_diagonal(&Vector3::new(1.0, 1.0, sign)) * svd.right_transposed;
    let retarder = Mueller::from_parts(&Vector3::zeros(), &Vector3::zeros(), &rotation);
    factors.retarder = Some(retarder);
    factors.parameters = Some(parameters(&rotation, threshold));
    factors.residual = Some((depolarizer * retarder * diattenuator).distance(normalised));
    factors.reason = mirrored.then_some(MIRROR);
    Ok(factors)
}

/// `m = mD mR mΔ`: the depolarizer acts first, the diattenuator last; the transpose
/// of the forward form of the transpose.
///
/// # Errors
/// `no-convergence`.
pub fn polar_reverse(normalised: &Mueller, sigma: Option<f64>) -> Result<PolarFactors> {
    let forward = polar_forward(&normalised.transpose(), sigma)?;
    let retarder = forward.retarder.map(|factor| factor.transpose());
    let threshold = sigma.map_or(tolerance::NOT_DETERMINED, |sigma| {
        tolerance::STANDARD_ERRORS * sigma
    });
    Ok(PolarFactors {
        depolarizer: forward.depolarizer.map(|factor| factor.transpose()),
        retarder,
        diattenuator: forward.diattenuator.transpose(),
        parameters: retarder.map(|factor| parameters(&factor.block(), threshold)),
        ..forward
    })
}

fn parameters(rotation: &Matrix3<f64>, threshold: f64) -> RetarderParameters {
    let r = rotation;
    let sine = Vector3::new(
        0.5 * (r[(1, 2)] - r[(2, 1)]),
        0.5 * (r[(2, 0)] - r[(0, 2)]),
        0.5 * (r[(0, 1)] - r[(1, 0)]),
    );
    let cosine = 0.5 * (r.trace() - 1.0);
    let retardance = sine.norm().atan2(cosine);
    let axis = axis(r, &sine, cosine, threshold);
    let linear_sine = r[(0, 2)].hypot(r[(1, 2)]);
    // Near the ends of its range, acos of the same matrix would lose half of the
    // digits.
    let linear_retardance = linear_sine.atan2(r[(2, 2)]);
    let half_wave = 1.0 + r[(2, 2)] < threshold;
    let vector = match axis {
        Some(axis) => axis.map(|component| component * retardance),
        // Near zero the sine is the angle.
        None => sine.into(),
    };
    let stretch = if linear_sine > 0.0 {
        linear_retardance / linear_sine
    } else {
        1.0
    };
    RetarderParameters {
        vector,
        linear_vector: [r[(1, 2)] * stretch, -r[(0, 2)] * stretch],
        retardance,
        axis,
        azimuth: axis.and_then(|[a0, a1, _]| {
            (a0.hypot(a1) >= threshold).then(|| half_turn(0.5 * a1.atan2(a0)))
        }),
        ellipticity: axis.map(|[a0, a1, a2]| 0.5 * a2.atan2(a0.hypot(a1))),
        linear_retardance,
        rotation: (!half_wave).then(|| 0.5 * (r[(1, 0)] - r[(0, 1)]).atan2(r[(0, 0)] + r[(1, 1)])),
        fast_axis: (!half_wave && linear_sine >= threshold)
            .then(|| half_turn(0.5 * (-r[(0, 2)]).atan2(r[(1, 2)]))),
    }
}

fn axis(r: &Matrix3<f64>, sine: &Vector3<f64>, cosine: f64, threshold: f64) -> Option<[f64; 3]> {
    if cosine > 0.0 {
        return (sine.norm() >= threshold).then(|| sine.normalize().into());
    }
    // Toward a half wave the antisymmetric part vanishes; the symmetric one,
    // I cosδ + (1 - cosδ) a aᵀ, is then at its best.
    let outer = (r + r.transpose()) * 0.5 - Matrix3::identity() * cosine;
    let column = (0..3).max_by(|&a, &b| outer[(a, a)].total_cmp(&outer[(b, b)]))?;
    let direction = outer.column(column).normalize();
    let agrees = if sine.norm() >= threshold {
        direction.dot(sine) > 0.0
    } else {
        direction
            .iter()
            .find(|component| component.abs() > tolerance::NOT_DETERMINED)
            .is_some_and(|&first| first > 0.0)
    };
    Some(if agrees { direction } else { -direction }.into())
}
