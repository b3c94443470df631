use std::f64::consts::FRAC_PI_2;

use nalgebra::Matrix2;
use num_complex::Complex64;

use super::Jones;
use crate::error::{Error, Result};
use crate::tolerance;

/// A plane interface between two isotropic media, and light that meets it.
///
/// x lies in the plane of incidence (p), y across it (s), and each beam has its own
/// right-handed frame: at normal incidence rp = −rs (M. Born and E. Wolf, *Principles
/// of Optics*, section 1.5, whose signs are the same; from memory).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interface {
    /// Complex index behind it over the index before it, `n - ik`.
    ratio: Complex64,
    sine: f64,
    cosine: f64,
    /// `n2 cosθt / n1`.
    behind: Complex64,
}

impl Interface {
    /// From the index before it, the index `index_behind - i absorption` behind it,
    /// and the angle of incidence in radians.
    ///
    /// # Errors
    /// `bad-parameter` unless the indices are between 1e-6 and 1e6, the absorption is
    /// between 0 and 1e6, and the angle is in [0, π/2).
    pub fn new(
        index_before: f64,
        index_behind: f64,
        absorption: f64,
        incidence: f64,
    ) -> Result<Self> {
        let largest = tolerance::LARGEST_INDEX;
        for (name, index) in [("indexBefore", index_before), ("indexAfter", index_behind)] {
            if !(1.0 / largest..=largest).contains(&index) {
                return Err(bad(name, "A refractive index must be positive."));
            }
        }
        if !(0.0..=largest).contains(&absorption) {
            return Err(bad("absorption", "The absorption must not be negative."));
        }
        if !(0.0..FRAC_PI_2).contains(&incidence) {
            return Err(bad(
                "incidence",
                "The angle of incidence must be at least 0 and below 90 degrees.",
            ));
        }
        let ratio = Complex64::new(index_behind / index_before, -absorption / index_before);
        let (sine, cosine) = incidence.sin_cos();
        // n² - sin²θ, in the form that loses no digits.
        let square = if sine < cosine {
            ratio * ratio - sine * sine
        } else {
            (ratio - 1.0) * (ratio + 1.0) + cosine * cosine
        };
        let root = square.sqrt();
        Ok(Self {
            ratio,
            sine,
            cosine,
            // A wave behind the interface fades away from it: Im ≤ 0.
            behind: if root.im > 0.0 { root.conj() } else { root },
        })
    }

    /// The amplitudes `diag(rp, rs)` of the reflected light.
    #[must_use]
    pub fn reflection(&self) -> Jones {
        let across = (self.cosine - self.behind) / (self.cosine + self.behind);
        let square = self.ratio * self.ratio;
        let along = (square * self.cosine - self.behind) / (square * self.cosine + self.behind);
        diagonal(along, across)
    }

    /// The amplitudes of the transmitted light, in units of power:
    /// `diag(tp, ts) · sqrt(n2 cosθt / (n1 cosθi))`.
    ///
    /// # Errors
    /// `absorbing-medium` for an index that is not real, since power there depends on
    /// depth; `total-reflection` beyond the critical angle, where no power passes.
    pub fn transmission(&self) -> Result<Jones> {
        if self.ratio.im != 0.0 {
            return Err(Error::new(
                "absorbing-medium",
                "The medium behind the interface absorbs, so that the transmitted power depends on depth: give an index without absorption.",
            )
            .at_field("absorption"));
        }
        if self.behind.im != 0.0 {
            return Err(Error::new(
                "total-reflection",
                "The angle of incidence is beyond the critical angle: all light is reflected.",
            )
            .at_field("incidence"));
        }
        let twice = 2.0 * self.cosine;
        let across = twice / (self.cosine + self.behind);
        let along = twice * self.ratio / (self.ratio * self.ratio * self.cosine + self.behind);
        let power = (self.behind / self.cosine).sqrt();
        Ok(diagonal(along * power, across * power))
    }

    /// How [`Interface::reflection`] changes with the index ratio and the angle of
    /// incidence, to first order.
    pub(crate) fn reflection_change(&self, ratio: Complex64, incidence: f64) -> Jones {
        let (cosine, behind) = self.changes(ratio, incidence);
        let (along, along_change) = self.along(ratio, cosine);
        let quotient = |value: Complex64, change: Complex64| {
            2.0 * (self.behind * change - value * behind) / (value + self.behind).powi(2)
        };
        diagonal(
            quotient(along, along_change),
            quotient(self.cosine.into(), cosine.into()),
        )
    }

    /// How [`Interface::transmission`] changes, to first order.
    ///
    /// # Errors
    /// Those of [`Interface::transmission`].
    pub(crate) fn transmission_change(&self, ratio: Complex64, incidence: f64) -> Result<Jones> {
        let [p, _, _, s] = self.transmission()?.row_major();
        let (cosine, behind) = self.changes(ratio, incidence);
        let (along, along_change) = self.along(ratio, cosine);
        let power = 0.5 * (cosine / self.cosine + behind / self.guarded());
        let relative =
            |value: Complex64, change: Complex64| power - (change + behind) / (value + self.behind);
        Ok(diagonal(
            p * (ratio / self.ratio + relative(along, along_change)),
            s * relative(self.cosine.into(), cosine.into()),
        ))
    }

    /// Of `cosθ` and of [`Interface::behind`].
    fn changes(&self, ratio: Complex64, incidence: f64) -> (f64, Complex64) {
        let behind = self.ratio * ratio - self.sine * self.cosine * incidence;
        (-self.sine * incidence, behind / self.guarded())
    }

    /// `n² cosθ` and its change.
    fn along(&self, ratio: Complex64, cosine: f64) -> (Complex64, Complex64) {
        let square = self.ratio * self.ratio;
        let change = 2.0 * self.ratio * ratio * self.cosine + square * cosine;
        (square * self.cosine, change)
    }

    /// At the critical angle itself the derivative is infinite; a step beside it is not.
    fn guarded(&self) -> Complex64 {
        if self.behind.norm() < tolerance::NOT_DETERMINED {
            Complex64::from(tolerance::NOT_DETERMINED)
        } else {
            self.behind
        }
    }
}

fn diagonal(along: Complex64, across: Complex64) -> Jones {
    Jones(Matrix2::new(
        along,
        Complex64::ZERO,
        Complex64::ZERO,
        across,
    ))
}

fn bad(field: &'static str, sentence: &'static str) -> Error {
    Error::new("bad-parameter", sentence).at_field(field)
}
