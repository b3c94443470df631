use statrs::distribution::{ChiSquared, ContinuousCDF};

/// Terms of the series beyond which nothing is added.
const MOST_TERMS: usize = 4000;

/// The probability that noncentral chi-squared with `degrees_of_freedom` and this
/// noncentrality stays below `value`: a Poisson mixture of central ones (Johnson, Kotz &
/// Balakrishnan 1995, chapter 29).
///
/// `None` unless there are degrees of freedom.
#[must_use]
pub fn noncentral_chi_squared(
    value: f64,
    degrees_of_freedom: u32,
    noncentrality: f64,
) -> Option<f64> {
    let half = 0.5 * noncentrality;
    let central = |extra: usize| {
        let freedom = f64::from(degrees_of_freedom) + 2.0 * extra as f64;
        ChiSquared::new(freedom)
            .ok()
            .map(|distribution| distribution.cdf(value.max(0.0)))
    };
    // From the likeliest term outwards.
    let peak = half.floor() as usize;
    let log_weight = |k: usize| {
        let k = k as f64;
        if half == 0.0 {
            return if k == 0.0 { 0.0 } else { f64::NEG_INFINITY };
        }
        k * half.ln() - half - statrs::function::gamma::ln_gamma(k + 1.0)
    };
    let mut sum = 0.0;
    for k in peak..peak + MOST_TERMS {
        let weight = log_weight(k).exp();
        sum += weight * central(k)?;
        if weight < 1e-17 {
            break;
        }
    }
    for k in (0..peak).rev() {
        let weight = log_weight(k).exp();
        sum += weight * central(k)?;
        if weight < 1e-17 {
            break;
        }
    }
    Some(sum.clamp(0.0, 1.0))
}

/// The noncentrality at which a value would be exceeded with the probability
/// `1 - probability`; zero where even without one it is not.
pub fn noncentrality_at(value: f64, degrees_of_freedom: u32, probability: f64) -> Option<f64> {
    if noncentral_chi_squared(value, degrees_of_freedom, 0.0)? <= probability {
        return Some(0.0);
    }
    let (mut low, mut high) = (0.0, value + 10.0);
    while noncentral_chi_squared(value, degrees_of_freedom, high)? > probability {
        low = high;
        high *= 2.0;
        if high > 1e6 {
            return None;
        }
    }
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if noncentral_chi_squared(value, degrees_of_freedom, middle)? > probability {
            low = middle;
        } else {
            high = middle;
        }
    }
    Some(0.5 * (low + high))
}

/// The central 95 % point.
#[must_use]
pub fn chi_squared_95(degrees_of_freedom: u32) -> Option<f64> {
    Some(
        ChiSquared::new(f64::from(degrees_of_freedom))
            .ok()?
            .inverse_cdf(0.95),
    )
}
