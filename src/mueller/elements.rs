//! The elements of polarization optics, as Mueller matrices.
//!
//! Angles in radians, counter-clockwise from x facing the source. Every matrix
//! can be found in the textbooks (R. A. Chipman, W.-S. T. Lam and G. Young,
//! *Polarized Light and Optical Systems*, 2018); the retarder's sign is that of
//! the canonical convention: S3 > 0 turns clockwise facing the source, the fast
//! axis is advanced.

use std::f64::consts::FRAC_PI_2;

use nalgebra::{Matrix3, Matrix4, Vector3};

use super::matrix::frame_rotation;
use super::{Interface, Mueller};
use crate::error::{Error, Result};
use crate::tolerance;

/// Partly transmits one linear state more than the crossed one.
///
/// # Errors
/// `bad-parameter` unless `transmittance_max` ≥ `transmittance_min` ≥ 0. Values above
/// one are taken: relative units exist.
pub fn linear_diattenuator(
    transmittance_max: f64,
    transmittance_min: f64,
    axis: f64,
) -> Result<Mueller> {
    let (high, low) = (
        finite("transmittanceMax", transmittance_max)?,
        finite("transmittanceMin", transmittance_min)?,
    );
    if low < 0.0 || low > high {
        return Err(Error::new(
            "bad-parameter",
            "The transmittances must satisfy transmittanceMax ≥ transmittanceMin ≥ 0.",
        )
        .at_field("transmittanceMin"));
    }
    let (a, b, g) = (
        (high + low) / 2.0,
        (high - low) / 2.0,
        high.sqrt() * low.sqrt(),
    );
    let matrix = Matrix4::new(
        a, b, 0.0, 0.0, //
        b, a, 0.0, 0.0, //
        0.0, 0.0, g, 0.0, //
        0.0, 0.0, 0.0, g,
    );
    Ok(Mueller::from_matrix(matrix).turned(finite("axis", axis)?))
}

/// Delays the linear state across its fast axis.
///
/// # Errors
/// `bad-parameter` for a value that is not finite.
pub fn linear_retarder(retardance: f64, fast_axis: f64) -> Result<Mueller> {
    let (s, c) = (2.0 * finite("axis", fast_axis)?).sin_cos();
    retarder(retardance, Vector3::new(c, s, 0.0))
}

/// Turns the azimuth by `-retardance / 2`: fast for the state of positive S3.
///
/// # Errors
/// `bad-parameter` for a value that is not finite.
pub fn circular_retarder(retardance: f64) -> Result<Mueller> {
    retarder(retardance, Vector3::z())
}

/// A retarder whose fast eigenstate has the given azimuth, in radians, and
/// ellipticity in [-π/4, π/4].
///
/// # Errors
/// `bad-parameter` for a value that is not finite or an ellipticity out of range.
pub fn elliptical_retarder(retardance: f64, azimuth: f64, ellipticity: f64) -> Result<Mueller> {
    let quarter = std::f64::consts::FRAC_PI_4;
    if !(-quarter..=quarter).contains(&ellipticity) {
        return Err(Error::new(
            "bad-parameter",
            "The ellipticity must lie between -45 and 45 degrees.",
        )
        .at_field("ellipticity"));
    }
    let (s2, c2) = (2.0 * finite("azimuth", azimuth)?).sin_cos();
    let (s3, c3) = (2.0 * ellipticity).sin_cos();
    retarder(retardance, Vector3::new(c2 * c3, s2 * c3, s3))
}

/// Transmits one elliptical state more than the orthogonal one, without retardance:
/// `transmittance` for unpolarized light, and the diattenuation as a vector toward
/// the favoured state on the Poincaré sphere (Lu & Chipman 1996).
///
/// # Errors
/// `bad-parameter` for a value that is not finite, a negative transmittance, or a
/// vector longer than one.
pub fn elliptical_diattenuator(transmittance: f64, diattenuation: [f64; 3]) -> Result<Mueller> {
    let transmittance = not_negative("transmittance", transmittance)?;
    for component in diattenuation {
        finite("diattenuation", component)?;
    }
    let vector = Vector3::from(diattenuation);
    let length = vector.norm();
    if length > 1.0 + tolerance::ZERO {
        return Err(
            Error::new("bad-parameter", "The diattenuation must not exceed 1.")
                .at_field("diattenuation"),
        );
    }
    // A unit vector may come with a last digit too many.
    let unit = unit_diattenuator(&(vector / length.max(1.0)));
    Ok(Mueller::from_matrix(unit.matrix() * transmittance))
}

/// A linear diattenuator and a linear retarder on one axis, such as a dichroic
/// crystal; the order doesn't matter. A negative diattenuation favours the slow axis.
///
/// # Errors
/// `bad-parameter` for a value that is not finite, a negative transmittance, or a
/// diattenuation outside [-1, 1].
pub fn aligned_diattenuating_retarder(
    transmittance: f64,
    diattenuation: f64,
    retardance: f64,
    fast_axis: f64,
) -> Result<Mueller> {
    let along = linear_retarder(retardance, 0.0)?;
    let diattenuator = elliptical_diattenuator(transmittance, [diattenuation, 0.0, 0.0])?;
    Ok((diattenuator * along).turned(finite("axis", fast_axis)?))
}

/// Reflects like an isotropic surface or stack of films, by the angles of
/// ellipsometry: `tan Ψ exp(iΔ) = rp / rs`, `reflectance` for unpolarized light, and
/// the azimuth of the plane of incidence.
///
/// Each beam has its own right-handed frame, so that Δ = π at normal incidence, and
/// angles after it are counted facing the reflected beam (R. M. A. Azzam and N. M.
/// Bashara, *Ellipsometry and Polarized Light*, 1977).
///
/// # Errors
/// `bad-parameter` for a value that is not finite, Ψ outside [0, π/2], or a negative
/// reflectance.
pub fn isotropic_reflector(psi: f64, delta: f64, reflectance: f64, plane: f64) -> Result<Mueller> {
    if !(0.0..=FRAC_PI_2).contains(&psi) {
        return Err(
            Error::new("bad-parameter", "Psi must lie between 0 and 90 degrees.").at_field("psi"),
        );
    }
    let reflectance = not_negative("reflectance", reflectance)?;
    let (sin_delta, cos_delta) = finite("delta", delta)?.sin_cos();
    let (sin, n) = (2.0 * psi).sin_cos();
    let (c, s) = (sin * cos_delta, sin * sin_delta);
    let matrix = Matrix4::new(
        1.0, -n, 0.0, 0.0, //
        -n, 1.0, 0.0, 0.0, //
        0.0, 0.0, c, s, //
        0.0, 0.0, -s, c,
    );
    Ok(Mueller::from_matrix(matrix * reflectance).turned(finite("plane", plane)?))
}

/// Reflection at a plane interface, `plane` the azimuth of the plane of incidence;
/// see [`Interface`].
///
/// # Errors
/// `bad-parameter` for an azimuth that is not finite.
pub fn fresnel_reflection(interface: &Interface, plane: f64) -> Result<Mueller> {
    Ok(interface
        .reflection()
        .mueller()
        .turned(finite("plane", plane)?))
}

/// Transmission through a plane interface, in units of power, `plane` the azimuth of
/// the plane of incidence; see [`Interface`].
///
/// # Errors
/// `bad-parameter` for an azimuth that is not finite, and as
/// [`Interface::transmission`].
pub fn fresnel_transmission(interface: &Interface, plane: f64) -> Result<Mueller> {
    Ok(interface
        .transmission()?
        .mueller()
        .turned(finite("plane", plane)?))
}

/// Turns every azimuth counter-clockwise by `angle`.
///
/// # Errors
/// `bad-parameter` for a value that is not finite.
pub fn rotator(angle: f64) -> Result<Mueller> {
    Ok(Mueller::from_matrix(frame_rotation(-finite(
        "angle", angle,
    )?)))
}

/// `diag(1, 1-α, 1-α, 1-α)`.
///
/// # Errors
/// `bad-parameter` for a value that is not finite.
pub fn isotropic_depolarizer(alpha: f64) -> Result<Mueller> {
    let retained = 1.0 - finite("alpha", alpha)?;
    Ok(Mueller::from_diagonal([1.0, retained, retained, retained]))
}

/// `diag(1, d1, d2, d3)`.
///
/// # Errors
/// `bad-parameter` for a value that is not finite.
pub fn diagonal_depolarizer(d1: f64, d2: f64, d3: f64) -> Result<Mueller> {
    Ok(Mueller::from_diagonal([
        1.0,
        finite("d1", d1)?,
        finite("d2", d2)?,
        finite("d3", d3)?,
    ]))
}

/// `[[1, Dᵀ], [D, q I + (1 - q) d dᵀ]]`, `q = sqrt(1 - D²)`, `d = D⃗/D`.
pub(crate) fn unit_diattenuator(vector: &Vector3<f64>) -> Mueller {
    let square = vector.norm_squared();
    let q = (1.0 - square).max(0.0).sqrt();
    // (1 - q) / D² without its 0/0: 1 / (1 + q).
    let outer = vector * vector.transpose() / (1.0 + q);
    Mueller::from_parts(vector, vector, &(Matrix3::identity() * q + outer))
}

/// The 3×3 block `I cosδ + (1 - cosδ) a aᵀ + ε_ijk a_k sinδ`.
fn retarder(retardance: f64, axis: Vector3<f64>) -> Result<Mueller> {
    let (s, c) = finite("retardance", retardance)?.sin_cos();
    let block =
        Matrix3::identity() * c + axis * axis.transpose() * (1.0 - c) - axis.cross_matrix() * s;
    Ok(Mueller::from_parts(
        &Vector3::zeros(),
        &Vector3::zeros(),
        &block,
    ))
}

fn finite(name: &'static str, value: f64) -> Result<f64> {
    if value.is_finite() && value.abs() <= tolerance::LARGEST_NUMBER {
        Ok(value)
    } else {
        Err(Error::new("bad-parameter", format!("{name} must be a finite number.")).at_field(name))
    }
}

fn not_negative(name: &'static str, value: f64) -> Result<f64> {
    if finite(name, value)? < 0.0 {
        return Err(
            Error::new("bad-parameter", format!("{name} must not be negative.")).at_field(name),
        );
    }
    Ok(value)
}
