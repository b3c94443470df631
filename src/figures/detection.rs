use crate::error::{Error, Result};
use crate::tolerance;

/// What a noise can show, before anything is measured; all relative to M00.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Detectable {
    /// Standard error of the isotropic depolarization α.
    pub alpha_se: f64,
    /// The α that differs from zero at 95 %.
    pub alpha: f64,
    /// A diattenuation or polarizance that stands out of the noise: the 95 % point of the
    /// length of three errors.
    pub diattenuation: f64,
    /// By how many standard errors of an eigenvalue a retarder with one side mirrored
    /// lies beyond realizability.
    pub mirror_margin: f64,
}

/// What equal independent errors of `sigma`, relative to M00, can show.
///
/// α has the standard error 2σ/√3, or σ/√3 where M00 is exact; a mirrored retarder has
/// the eigenvalue -½, whose standard error is σ/2, or σ√3/4.
///
/// # Errors
/// `bad-sigma` for a σ that is not positive, finite and in range.
pub fn detectable(sigma: f64, m00_is_exact: bool) -> Result<Detectable> {
    if !(1.0 / tolerance::LARGEST_NUMBER..=tolerance::LARGEST_NUMBER).contains(&sigma) {
        return Err(Error::new("bad-sigma", "σ must be a positive number.").at_field("sigma"));
    }
    let root = 3f64.sqrt();
    let (alpha_se, eigenvalue_se) = if m00_is_exact {
        (sigma / root, sigma * root / 4.0)
    } else {
        (2.0 * sigma / root, sigma / 2.0)
    };
    Ok(Detectable {
        alpha_se,
        alpha: 1.959_963_984_540_054 * alpha_se,
        // sqrt(7.8147), the 95 % point of χ² with three degrees of freedom.
        diattenuation: 2.795_483_4 * sigma,
        mirror_margin: 0.5 / eigenvalue_se,
    })
}
