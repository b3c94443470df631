use nalgebra::Matrix4;

use crate::linalg::principal_logarithm;
use crate::mueller::Mueller;

/// The logarithm of a normalised Mueller matrix, in its two parts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Differential {
    /// `Lm = ½(L - G Lᵀ G)`: birefringence and dichroism, accumulated along the
    /// path. `None` where there is no logarithm.
    pub mean: Option<Mueller>,
    /// `Lu - (Lu)00 I` with `Lu = ½(L + G Lᵀ G)`: zero for a pure element. `None`
    /// where there is no logarithm.
    pub depolarizing: Option<Mueller>,
    /// Of the mean part. `None` where there is no logarithm.
    pub properties: Option<Properties>,
    /// Why there is no logarithm.
    pub reason: Option<&'static str>,
}

/// The elementary properties of a medium in which they act all at once, summed up
/// along the path.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Properties {
    /// Linear at 0° (positive: x is fast), linear at 45° (+45° is fast), circular
    /// (the state of positive S3 is fast), as the three components of a direction
    /// on the Poincaré sphere. Differences of phase, radians.
    pub birefringence: [f64; 3],
    /// The same three, positive where x, +45° and the state of positive S3 are
    /// more transmitted. Each is half of the logarithm of a ratio of transmittances.
    pub dichroism: [f64; 3],
}

const SINGULAR: &str = "the matrix is singular, as that of a polarizer, and has no logarithm";
const NEGATIVE: &str = "an eigenvalue of the matrix is real and negative, as of a half-wave retarder, so that it has no principal real logarithm";
const UNSETTLED: &str = "the logarithm did not settle; the matrix is out of range";

/// The differential decomposition (Ossikovski 2011): the principal real logarithm
/// of a measured matrix with M00 = 1, split into the part that changes sign under
/// the metric `G = diag(1, -1, -1, -1)` and the part that does not.
#[must_use]
pub fn differential(normalised: &Mueller) -> Differential {
    match principal_logarithm(normalised.matrix()) {
        Ok(logarithm) => parts(&logarithm),
        Err(error) => Differential {
            mean: None,
            depolarizing: None,
            properties: None,
            reason: Some(match error.code {
                "singular" => SINGULAR,
                "negative-eigenvalue" => NEGATIVE,
                _ => UNSETTLED,
            }),
        },
    }
}

fn parts(logarithm: &Matrix4<f64>) -> Differential {
    let metric = Matrix4::from_diagonal(&[1.0, -1.0, -1.0, -1.0].into());
    let mirrored = metric * logarithm.transpose() * metric;
    let mean = (logarithm - mirrored) * 0.5;
    let rest = (logarithm + mirrored) * 0.5;
    Differential {
        mean: Some(Mueller::from_matrix(mean)),
        depolarizing: Some(Mueller::from_matrix(
            rest - Matrix4::identity() * rest[(0, 0)],
        )),
        properties: Some(Properties {
            birefringence: [mean[(2, 3)], mean[(3, 1)], mean[(1, 2)]],
            dichroism: [mean[(0, 1)], mean[(0, 2)], mean[(0, 3)]],
        }),
        reason: None,
    }
}
