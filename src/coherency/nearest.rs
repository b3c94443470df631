use super::{Coherency, weighted_nearest};
use crate::error::Result;
use crate::linalg::HermitianEigen;
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::tolerance;

/// The nearest realizable matrix.
#[derive(Debug, Clone, PartialEq)]
pub struct Nearest {
    /// The matrix itself; the measured one where that is realizable.
    pub mueller: Mueller,
    /// Of its H; no eigenvalue is negative.
    pub eigen: HermitianEigen,
    /// The Frobenius distance from the measured matrix.
    pub distance: f64,
    /// `(m̂ − m)ᵀ Σ⁻¹ (m̂ − m)`, where the errors are not equal and independent.
    pub statistic: Option<f64>,
}

/// The realizable matrix of least Frobenius distance.
///
/// `M → H` is an isometry up to a factor, so the spectrum of H is clipped at zero;
/// with M00 exact it is projected on the spectra of that trace (Zander & Beyerer
/// 2020 for the isometry). `None` where no matrix of that exact M00 is realizable:
/// M00 < 0.
///
/// # Errors
/// As [`Coherency::eigen`].
pub fn nearest(mueller: &Mueller, m00_is_exact: bool) -> Result<Option<Nearest>> {
    let eigen = Coherency::from_mueller(mueller).eigen()?;
    Ok(nearest_of(mueller, &eigen, m00_is_exact))
}

/// The nearest realizable matrix under the stated noise; equal errors where none is
/// stated. `None` where no realizable matrix has the exact elements.
///
/// # Errors
/// As [`Coherency::eigen`] and [`weighted_nearest`].
pub(crate) fn nearest_to(
    measurement: &Measurement,
    eigen: &HermitianEigen,
) -> Result<Option<Nearest>> {
    let mueller = measurement.mueller();
    let Some(covariance) = measurement.covariance() else {
        return Ok(nearest_of(mueller, eigen, measurement.m00_is_exact()));
    };
    if eigen.values[3] >= -tolerance::ZERO * mueller.m00().abs() {
        let nearest = nearest_of(mueller, eigen, false);
        return Ok(nearest.map(|nearest| Nearest {
            statistic: Some(0.0),
            ..nearest
        }));
    }
    if mueller.m00() < 0.0 && covariance.is_held(0) {
        return Ok(None);
    }
    let Some(found) = weighted_nearest(&mueller.row_major(), covariance)? else {
        return Ok(None);
    };
    let nearest = Mueller::from_row_major(&found.elements)?;
    let mut eigen = Coherency::from_mueller(&nearest).eigen()?;
    // What the iteration left above or below zero is rounding.
    let rounding = 1e-10 * eigen.values[0].abs();
    eigen.values = eigen
        .values
        .map(|value| if value < rounding { 0.0 } else { value });
    Ok(Some(Nearest {
        distance: (mueller.matrix() - nearest.matrix()).norm(),
        mueller: nearest,
        eigen,
        statistic: Some(found.statistic),
    }))
}

pub(crate) fn nearest_of(
    mueller: &Mueller,
    eigen: &HermitianEigen,
    m00_is_exact: bool,
) -> Option<Nearest> {
    if m00_is_exact && mueller.m00() < 0.0 {
        return None;
    }
    if eigen.values[3] >= -tolerance::ZERO * mueller.m00().abs() {
        return Some(Nearest {
            mueller: *mueller,
            eigen: HermitianEigen {
                values: eigen.values.map(|value| value.max(0.0)),
                vectors: eigen.vectors,
            },
            distance: 0.0,
            statistic: None,
        });
    }
    let eigenvalues = realizable_spectrum(&eigen.values, m00_is_exact.then(|| mueller.m00()));
    let nearest = Coherency::from_spectrum(&eigenvalues, eigen).mueller();
    let nearest = match (m00_is_exact, nearest.m00()) {
        (true, m00) if m00 > 0.0 => with_m00(&nearest, mueller.m00()),
        _ => nearest,
    };
    Some(Nearest {
        mueller: nearest,
        distance: distance(&eigen.values, &eigenvalues),
        eigen: HermitianEigen {
            values: eigenvalues,
            vectors: eigen.vectors,
        },
        statistic: None,
    })
}

/// The nearest spectrum without a negative value, and with the given sum (≥ 0) if
/// one is given. `values` descend.
pub(crate) fn realizable_spectrum(values: &[f64; 4], sum: Option<f64>) -> [f64; 4] {
    let Some(sum) = sum else {
        return values.map(|value| value.max(0.0));
    };
    let mut shift = 0.0;
    let mut head = 0.0;
    for (count, value) in (1..=4).zip(values) {
        head += value;
        let candidate = (head - sum) / f64::from(count);
        if count == 1 || value - candidate > 0.0 {
            shift = candidate;
        }
    }
    values.map(|value| (value - shift).max(0.0))
}

/// The distance of two matrices whose H have the same eigenvectors.
pub(crate) fn distance(from: &[f64; 4], to: &[f64; 4]) -> f64 {
    let scale = from.iter().fold(0.0_f64, |a, b| a.max(b.abs()));
    if scale == 0.0 {
        return 0.0;
    }
    let squares: f64 = from
        .iter()
        .zip(to)
        .map(|(a, b)| ((a - b) / scale).powi(2))
        .sum();
    2.0 * scale * squares.sqrt()
}

/// M00 to the last digit: rounding must not touch what is exact.
fn with_m00(mueller: &Mueller, m00: f64) -> Mueller {
    let mut matrix = *mueller.matrix();
    matrix[(0, 0)] = m00;
    Mueller::from_matrix(matrix)
}
