//! What several test files share.
#![allow(dead_code)] // each file uses its own part

pub mod candidates;

use halfshade::examine::{Examination, examine};
use halfshade::mueller::{Jones, Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use num_complex::Complex64;
use proptest::prelude::*;

pub fn mueller(rows: [[f64; 4]; 4]) -> Mueller {
    Mueller::from_rows(rows).unwrap()
}

pub fn diagonal(values: [f64; 4]) -> Mueller {
    Mueller::from_row_major(&std::array::from_fn(|k| {
        if k % 5 == 0 { values[k / 5] } else { 0.0 }
    }))
    .unwrap()
}

pub fn measurement(mueller: Mueller, m00_is_exact: bool, noise: Noise) -> Measurement {
    Measurement::new(mueller, m00_is_exact, false, noise).unwrap()
}

/// Without noise or simulation.
pub fn examined(mueller: Mueller) -> Examination {
    examine(&measurement(mueller, false, Noise::None), None).unwrap()
}

#[track_caller]
pub fn close(actual: f64, expected: f64, tolerance: f64) {
    assert!(
        (actual - expected).abs() <= tolerance,
        "{actual} is not {expected} within {tolerance}"
    );
}

#[track_caller]
pub fn close_matrix(actual: &Mueller, expected: &Mueller, tolerance: f64) {
    let distance = actual
        .row_major()
        .iter()
        .zip(expected.row_major())
        .fold(0.0_f64, |most, (a, b)| most.max((a - b).abs()));
    assert!(
        distance <= tolerance,
        "{actual:?}\nis not\n{expected:?}\nwithin {tolerance}: {distance}"
    );
}

pub fn complex() -> impl Strategy<Value = Complex64> {
    (-1.0..1.0, -1.0..1.0).prop_map(|(re, im)| Complex64::new(re, im))
}

pub fn any_jones() -> impl Strategy<Value = Jones> {
    [complex(), complex(), complex(), complex()]
        .prop_map(|[a, b, c, d]| Jones::from_rows([[a, b], [c, d]]).unwrap())
}

/// A mixture of one to four Jones matrices, as its Mueller matrix.
pub fn any_mixture() -> impl Strategy<Value = Mueller> {
    prop::collection::vec((any_jones(), 0.05..1.0), 1..5).prop_map(|parts| {
        let mut sum = [0.0; 16];
        for (jones, weight) in parts {
            for (total, part) in sum.iter_mut().zip(jones.mueller().row_major()) {
                *total += weight * part;
            }
        }
        Mueller::from_row_major(&sum).unwrap()
    })
}

pub fn any_matrix() -> impl Strategy<Value = Mueller> {
    prop::array::uniform16(-1.0..1.0_f64).prop_map(|m| Mueller::from_row_major(&m).unwrap())
}

/// Polarizer, diattenuator, depolarizer and retarder in series: determined factors.
pub fn polarizing_series() -> impl Strategy<Value = (Mueller, Mueller, Mueller)> {
    (
        (0.05..0.95, 0.0..3.1),
        (0.1..3.0, 0.0..3.1, -0.7..0.7),
        (0.3..0.9, 0.3..0.9, 0.3..0.9),
    )
        .prop_map(
            |((low, axis), (retardance, azimuth, ellipticity), (a, b, c))| {
                (
                    elements::linear_diattenuator(1.0, low, axis).unwrap(),
                    elements::elliptical_retarder(retardance, azimuth, ellipticity).unwrap(),
                    elements::diagonal_depolarizer(a, b, c).unwrap(),
                )
            },
        )
}

/// Panics on a NaN or an infinity anywhere in the answer.
#[track_caller]
pub fn all_finite(found: &Examination) {
    let mut numbers = Vec::new();
    let r = &found.realizability;
    numbers.extend(r.eigenvalues.into_iter().flatten());
    numbers.extend(r.eigenvalue_se.into_iter().flatten());
    numbers.extend(
        [
            r.violation,
            r.rounding_sigma,
            r.stokes_margin,
            r.explaining_sigma,
        ]
        .into_iter()
        .flatten(),
    );
    numbers.extend(
        r.significance
            .iter()
            .flat_map(|test| [test.statistic, test.p_value]),
    );
    numbers.extend(found.nearest.iter().flat_map(|n| n.mueller.row_major()));
    numbers.extend(found.nearest.iter().flat_map(|n| n.eigen.values));
    for (_, figure) in found.figures.iter() {
        numbers.extend(
            [
                figure.value,
                figure.se,
                figure.interval.and_then(|interval| interval.low),
                figure.interval.and_then(|interval| interval.high),
            ]
            .into_iter()
            .flatten(),
        );
        assert!(figure.value.is_some() || figure.reason.is_some());
    }
    for factors in [&found.polar_forward, &found.polar_reverse]
        .into_iter()
        .flatten()
    {
        assert!(factors.retarder.is_some() || factors.reason.is_some());
        for factor in [
            factors.depolarizer,
            factors.retarder,
            Some(factors.diattenuator),
        ]
        .into_iter()
        .flatten()
        {
            numbers.extend(factor.row_major());
        }
        numbers.extend(
            [factors.residual, factors.depolarization_power]
                .into_iter()
                .flatten(),
        );
        numbers.extend(factors.parameters.iter().flat_map(|p| p.axis).flatten());
    }
    for component in found.spectral.iter().flatten() {
        numbers.push(component.weight);
        numbers.extend(component.mueller.row_major());
        numbers.extend(
            component
                .jones
                .row_major()
                .iter()
                .flat_map(|z| [z.re, z.im]),
        );
    }
    for component in found.characteristic.iter().flatten() {
        numbers.push(component.weight);
        numbers.extend(component.mueller.row_major());
    }
    if let Some(parts) = &found.differential {
        assert!(parts.mean.is_some() != parts.reason.is_some());
        for part in [parts.mean, parts.depolarizing].into_iter().flatten() {
            numbers.extend(part.row_major());
        }
    }
    if let Some(model) = &found.isotropic {
        numbers.extend(model.mueller.row_major());
        numbers.push(model.alpha);
        numbers.extend([model.chi_square, model.p_value].into_iter().flatten());
        numbers.extend(
            model
                .jones
                .iter()
                .flat_map(|j| j.row_major())
                .flat_map(|z| [z.re, z.im]),
        );
    }
    assert!(numbers.iter().all(|v| v.is_finite()), "{found:#?}");
}

/// The name of a figure in the reference files, which is that of the interface.
pub fn key(name: halfshade::figures::FigureName) -> &'static str {
    use halfshade::figures::FigureName as F;
    match name {
        F::Diattenuation => "diattenuation",
        F::LinearDiattenuation => "linearDiattenuation",
        F::CircularDiattenuation => "circularDiattenuation",
        F::DiattenuationAzimuth => "diattenuationAzimuthDeg",
        F::Polarizance => "polarizance",
        F::LinearPolarizance => "linearPolarizance",
        F::CircularPolarizance => "circularPolarizance",
        F::PolarizanceAzimuth => "polarizanceAzimuthDeg",
        F::TransmittanceMax => "transmittanceMax",
        F::TransmittanceMin => "transmittanceMin",
        F::DepolarizationIndex => "depolarizationIndex",
        F::SphericalPurity => "sphericalPurity",
        F::PurityIndex1 => "purityIndex1",
        F::PurityIndex2 => "purityIndex2",
        F::PurityIndex3 => "purityIndex3",
        F::Entropy => "entropy",
        F::IsotropicAlpha => "isotropicAlpha",
        F::Retardance => "retardanceDeg",
        F::LinearRetardance => "linearRetardanceDeg",
        F::Rotation => "rotationDeg",
        F::FastAxis => "fastAxisDeg",
        F::RetarderAzimuth => "retarderAzimuthDeg",
        F::RetarderEllipticity => "retarderEllipticityDeg",
        F::DepolarizationPower => "depolarizationPower",
    }
}
