//! States of light and what makes them.

mod common;

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, PI};

use common::{close, close_matrix, diagonal};
use halfshade::mueller::{Jones, Mueller, elements};
use halfshade::state::{JonesVector, Stokes};
use num_complex::Complex64;
use proptest::prelude::*;

fn stokes(components: [f64; 4]) -> Stokes {
    Stokes::new(components).unwrap()
}

/// Source: definitions (design, physics section 2), evaluated by hand.
#[test]
fn degrees_and_ellipse() {
    let state = stokes([2.0, 0.6, 0.8, 1.0]);
    close(
        state.degree_of_polarization().unwrap(),
        2f64.sqrt() / 2.0,
        1e-15,
    );
    close(state.degree_of_linear_polarization().unwrap(), 0.5, 1e-15);
    close(state.degree_of_circular_polarization().unwrap(), 0.5, 1e-15);
    let ellipse = state.ellipse();
    close(ellipse.azimuth.unwrap(), 0.5 * 0.8f64.atan2(0.6), 1e-15);
    close(ellipse.ellipticity.unwrap(), PI / 8.0, 1e-15);

    let circular = stokes([1.0, 0.0, 0.0, -1.0]).ellipse();
    assert_eq!(circular.azimuth, None);
    close(circular.ellipticity.unwrap(), -FRAC_PI_4, 1e-15);
    let unpolarized = stokes([1.0, 0.0, 0.0, 0.0]).ellipse();
    assert_eq!((unpolarized.azimuth, unpolarized.ellipticity), (None, None));
    close(
        stokes([1.0, -1.0, 0.0, 0.0]).ellipse().azimuth.unwrap(),
        FRAC_PI_2,
        1e-15,
    );
    assert_eq!(stokes([0.0; 4]).degree_of_polarization(), None);
}

#[test]
fn physical_states_only() {
    assert!(stokes([1.0, 0.6, 0.0, 0.8]).physical().is_some());
    assert!(stokes([1.0, 0.7, 0.0, 0.8]).physical().is_none());
    assert!(stokes([-1.0, 0.0, 0.0, 0.0]).physical().is_none());
    let state = stokes([1.0, 0.1, 0.2, 0.3]);
    assert_eq!(state.physical().unwrap().stokes(), state);
    assert_eq!(
        Stokes::new([1.0, f64::NAN, 0.0, 0.0]).unwrap_err().code,
        "not-finite"
    );
}

#[test]
fn parameters_out_of_range_are_refused() {
    for (element, field) in [
        (
            elements::linear_diattenuator(0.3, 0.5, 0.0),
            "transmittanceMin",
        ),
        (
            elements::linear_diattenuator(0.3, -0.1, 0.0),
            "transmittanceMin",
        ),
        (elements::linear_retarder(f64::NAN, 0.0), "retardance"),
        (elements::elliptical_retarder(1.0, 0.0, 1.0), "ellipticity"),
        (elements::rotator(f64::INFINITY), "angle"),
        (elements::isotropic_depolarizer(f64::NAN), "alpha"),
        (elements::diagonal_depolarizer(0.5, f64::NAN, 0.5), "d2"),
    ] {
        let error = element.unwrap_err();
        assert_eq!(error.code, "bad-parameter");
        assert_eq!(
            error.at,
            Some(halfshade::error::Place::Field(field.to_owned()))
        );
    }
    assert_eq!(
        Mueller::from_rows([[f64::INFINITY; 4]; 4])
            .unwrap_err()
            .code,
        "not-finite"
    );
    assert_eq!(
        Mueller::from_rows([[1e151; 4]; 4]).unwrap_err().code,
        "too-large"
    );
    let huge = Complex64::new(1e80, 0.0);
    assert_eq!(
        Jones::from_rows([[huge, huge], [huge, huge]])
            .unwrap_err()
            .code,
        "not-finite"
    );
}

#[test]
fn special_cases_of_elements() {
    close_matrix(
        &elements::isotropic_depolarizer(0.25).unwrap(),
        &diagonal([1.0, 0.75, 0.75, 0.75]),
        0.0,
    );
    close_matrix(
        &elements::diagonal_depolarizer(0.5, 0.25, -0.125).unwrap(),
        &diagonal([1.0, 0.5, 0.25, -0.125]),
        0.0,
    );
    // A circular retarder turns the azimuth by minus half of its retardance.
    close_matrix(
        &elements::circular_retarder(0.8).unwrap(),
        &elements::rotator(-0.4).unwrap(),
        1e-15,
    );
    // An elliptical one without ellipticity is linear; at π/4 it is circular.
    close_matrix(
        &elements::elliptical_retarder(1.1, 0.4, 0.0).unwrap(),
        &elements::linear_retarder(1.1, 0.4).unwrap(),
        1e-15,
    );
    close_matrix(
        &elements::elliptical_retarder(1.1, 0.4, FRAC_PI_4).unwrap(),
        &elements::circular_retarder(1.1).unwrap(),
        1e-15,
    );
}

proptest! {
    /// The Jones and the Mueller route agree: the state behind a retarder.
    #[test]
    fn jones_and_mueller_agree(
        retardance in -7.0..7.0_f64, azimuth in 0.0..3.1_f64, ellipticity in -0.78..0.78_f64,
        x in (-1.0..1.0_f64, -1.0..1.0_f64), y in (-1.0..1.0_f64, -1.0..1.0_f64),
    ) {
        let (s2, c2) = (2.0 * azimuth).sin_cos();
        let (s3, c3) = (2.0 * ellipticity).sin_cos();
        let jones = Jones::retarder(retardance, [c2 * c3, s2 * c3, s3]);
        let mueller = elements::elliptical_retarder(retardance, azimuth, ellipticity).unwrap();
        close_matrix(&jones.mueller(), &mueller, 1e-14);
        let state = JonesVector::new(Complex64::new(x.0, x.1), Complex64::new(y.0, y.1));
        let (by_jones, by_mueller) = (jones.apply(&state).stokes(), mueller.apply(&state.stokes()));
        for (a, b) in by_jones.components().iter().zip(by_mueller.components()) {
            close(*a, b, 1e-13);
        }
    }

    /// A product of Jones matrices has the product of the Mueller matrices.
    #[test]
    fn products_agree(first in common::any_jones(), second in common::any_jones()) {
        close_matrix(&(second * first).mueller(), &(second.mueller() * first.mueller()), 1e-13);
    }

    /// The global phase means nothing, and fixing it makes the largest entry real.
    #[test]
    fn phase_is_fixed(jones in common::any_jones(), phase in -3.0..3.0_f64) {
        let turned = Jones::from_rows({
            let e = jones.row_major().map(|entry| entry * Complex64::from_polar(1.0, phase));
            [[e[0], e[1]], [e[2], e[3]]]
        }).unwrap();
        let (a, b) = (jones.phase_fixed(), turned.phase_fixed());
        for (a, b) in a.row_major().iter().zip(b.row_major()) {
            close((a - b).norm(), 0.0, 1e-12);
        }
        let largest = a.row_major().into_iter().max_by(|x, y| x.norm().total_cmp(&y.norm())).unwrap();
        prop_assert!(largest.re >= 0.0 && largest.im.abs() <= 1e-12);
    }
}
