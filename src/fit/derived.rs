use nalgebra::DVector;

use super::candidate::{Judge, Parameter};
use super::models::{Shape, columns_of};
use super::parameters::Name;
use super::starts::pure_mueller;
use crate::decompose::polar_forward;
use crate::error::Result;

/// Steps of the derivatives, in the root of M00.
const STEP: f64 = 1e-6;

/// What follows from a Jones matrix.
pub(super) fn of_jones(
    shape: &Shape,
    x: &[f64],
    unit: f64,
    judge: &Judge<'_>,
) -> Result<Vec<Parameter>> {
    let own = x.len() - shape.model.depolarizations();
    let values = |x: &[f64]| quantities(shape, &x[..own], unit);
    let centre = values(x)?;
    let mut slopes = vec![DVector::zeros(x.len()); centre.len()];
    for k in 0..own {
        let moved = |by: f64| {
            let mut x = x.to_vec();
            x[k] += by;
            values(&x)
        };
        let (above, below) = (moved(STEP)?, moved(-STEP)?);
        for (place, (name, _)) in centre.iter().enumerate() {
            let find =
                |all: &[(Name, f64)]| all.iter().find(|(other, _)| other == name).map(|(_, v)| *v);
            let (Some(high), Some(low)) = (find(&above), find(&below)) else {
                continue;
            };
            let mut difference = high - low;
            if let Some(period) = name.period() {
                difference -= period * (difference / period).round();
            }
            slopes[place][k] = difference / (2.0 * STEP);
        }
    }
    Ok(centre
        .into_iter()
        .zip(slopes)
        .map(|((name, value), slopes)| judge.parameter(name, value, &slopes, false))
        .collect())
}

/// Transmittance, diattenuation, retardance and the azimuth and ellipticity of the fast
/// eigenstate, as far as they are determined.
pub(super) fn quantities(shape: &Shape, own: &[f64], unit: f64) -> Result<Vec<(Name, f64)>> {
    let Some(mueller) = pure_mueller(&columns_of(own, 1, &shape.pivots)) else {
        return Ok(Vec::new());
    };
    let m = mueller.row_major();
    let mut all = vec![(Name::Transmittance, unit * m[0])];
    let Some(normalised) = mueller.normalised() else {
        return Ok(all);
    };
    all.push((
        Name::Diattenuation,
        (m[1] / m[0]).hypot(m[2] / m[0]).hypot(m[3] / m[0]).min(1.0),
    ));
    if let Some(parameters) = polar_forward(&normalised, None)?.parameters {
        all.push((Name::Retardance, parameters.retardance));
        all.extend(parameters.azimuth.map(|azimuth| (Name::Axis, azimuth)));
        all.extend(
            parameters
                .ellipticity
                .map(|value| (Name::Ellipticity, value)),
        );
    }
    Ok(all)
}
