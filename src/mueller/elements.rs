//! The elements of polarization optics, as Mueller matrices.
//!
//! Angles in radians, counter-clockwise from x facing the source. Every matrix
//! can be found in the textbooks (R. A. Chipman, W.-S. T. Lam and G. Young,
//! *Polarized Light and Optical Systems*, 2018); the retarder's sign is that of
//! the canonical convention: S3 > 0 turns clockwise facing the source, the fast
//! axis is advanced.

use nalgebra::{Matrix3, Matrix4, Vector3};

use super::Mueller;
use super::matrix::frame_rotation;
use crate::error::{Error, Result};

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
    if value.is_finite() && value.abs() <= crate::tolerance::LARGEST_NUMBER {
        Ok(value)
    } else {
        Err(Error::new("bad-parameter", format!("{name} must be a finite number.")).at_field(name))
    }
}
