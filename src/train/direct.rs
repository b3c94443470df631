use nalgebra::Vector4;
use num_complex::Complex64;

use crate::coherency::{Coherency, eigenvalue_errors, eigenvalue_gradient, nearest_to};
use crate::error::{Error, Result};
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::tolerance;

/// How much of a known pure component is in a mixture.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DirectWeight {
    /// The largest share of M00 that it can have, `1 / (h† H⁺ h)` over M00; zero where its
    /// state is not in the mixture at all.
    pub weight: f64,
    /// First-order standard error; `None` without noise, or where an eigenvalue of H is
    /// within its noise, so that first order says nothing.
    pub se: Option<f64>,
    /// How many eigenvalues of H stand out of the noise.
    pub rank: usize,
}

/// The largest weight with which a known pure component, such as direct light that passes
/// a scattering sample unchanged, can be part of it: `H - w h h†` stays realizable up to
/// `w = 1 / (h† H⁺ h)`, h in the range of H (J. J. Gil 2007, arbitrary decomposition).
///
/// Computed on the nearest realizable matrix; eigenvalues within three standard errors
/// count as zero.
///
/// # Errors
/// `not-pure` for a component that depolarizes; `no-convergence`.
pub fn direct_weight(sample: &Measurement, component: &Mueller) -> Result<DirectWeight> {
    let eigen = Coherency::from_mueller(component).eigen()?;
    let [first, rest @ ..] = eigen.values;
    if first <= 0.0
        || rest
            .iter()
            .any(|value| value.abs() > tolerance::NOT_DETERMINED.sqrt() * first)
    {
        return Err(Error::new(
            "not-pure",
            "The direct component must not depolarize: its coherency matrix has one eigenvalue other than zero.",
        )
        .at_field("direct"));
    }
    let h = eigen.vectors[0];
    let measured = Coherency::from_mueller(sample.mueller()).eigen()?;
    let errors = eigenvalue_errors(sample, &measured);
    let m00 = sample.mueller().m00();
    let nothing = DirectWeight {
        weight: 0.0,
        se: None,
        rank: 0,
    };
    let Some(near) = nearest_to(sample, &measured)?.filter(|_| m00 > 0.0) else {
        return Ok(nothing);
    };
    let floor = |k: usize| {
        let error = errors.map_or(0.0, |errors| errors[k]);
        (tolerance::STANDARD_ERRORS * error).max(tolerance::NOT_DETERMINED * m00)
    };
    let (mut inside, mut outside, mut rank) = (0.0, 0.0, 0);
    let mut turned = Vector4::<Complex64>::zeros();
    for k in 0..4 {
        let vector = near.eigen.vectors[k];
        let value = near.eigen.values[k];
        let part = vector.dotc(&h);
        if value > floor(k) {
            inside += part.norm_sqr() / value;
            turned += vector * (part / value);
            rank += 1;
        } else {
            outside += part.norm_sqr();
        }
    }
    // The range itself is as uncertain as its vectors: error over the gap.
    let least = (0..rank)
        .map(|k| near.eigen.values[k])
        .fold(f64::INFINITY, f64::min);
    let blur = (0..4).map(floor).fold(0.0, f64::max) / least;
    if rank == 0 || inside <= 0.0 || outside > (4.0 * blur * blur).max(tolerance::NOT_DETERMINED) {
        return Ok(DirectWeight { rank, ..nothing });
    }
    let weight = 1.0 / (inside * m00);
    // w = W/M00 with 1/W = h†H⁻¹h, so dW = W² h†H⁻¹ dH H⁻¹h.
    let gradient = eigenvalue_gradient(&(turned / Complex64::from(inside)));
    let mut relative = gradient.map(|part| part / m00);
    relative[0] -= weight / m00;
    Ok(DirectWeight {
        weight,
        se: sample
            .standard_error(&relative)
            .filter(|_| rank == 4)
            .filter(|se| se.is_finite()),
        rank,
    })
}
