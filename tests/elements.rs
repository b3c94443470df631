//! The elements against identities and against each other; values from outside are
//! in `tests/reference/published.json`.

mod common;

use common::{close, close_matrix};
use halfshade::mueller::{Interface, Jones, elements};
use proptest::prelude::*;

fn amplitudes(jones: &Jones) -> [num_complex::Complex64; 2] {
    let [along, _, _, across] = jones.row_major();
    [along, across]
}

proptest! {
    /// What is not reflected passes (derived: conservation of energy, for each of
    /// the two principal states).
    #[test]
    fn reflectance_and_transmittance_add_up(before in 0.3..4.0_f64, after in 0.3..4.0_f64, incidence in 0.0..1.57_f64) {
        let interface = Interface::new(before, after, 0.0, incidence).unwrap();
        let reflected = amplitudes(&interface.reflection()).map(|r| r.norm_sqr());
        match interface.transmission() {
            Ok(transmission) => {
                for (r, t) in reflected.into_iter().zip(amplitudes(&transmission)) {
                    close(r + t.norm_sqr(), 1.0, 1e-12);
                }
            }
            // Snell's law has no solution: no power may be missing.
            Err(error) => {
                prop_assert_eq!(error.code, "total-reflection");
                prop_assert!(before * incidence.sin() > after);
                for r in reflected {
                    close(r, 1.0, 1e-12);
                }
            }
        }
    }

    /// Backwards through the interface at the refracted angle: the amplitudes change
    /// sign and the transmitted power is the same (G. G. Stokes 1849, from memory).
    #[test]
    fn stokes_relations(after in 1.0..4.0_f64, incidence in 0.0..1.5_f64) {
        let forward = Interface::new(1.0, after, 0.0, incidence).unwrap();
        let back = Interface::new(after, 1.0, 0.0, (incidence.sin() / after).asin()).unwrap();
        for (r, other) in amplitudes(&forward.reflection()).into_iter().zip(amplitudes(&back.reflection())) {
            close((r + other).norm(), 0.0, 1e-12);
        }
        for (t, other) in amplitudes(&forward.transmission().unwrap()).into_iter().zip(amplitudes(&back.transmission().unwrap())) {
            close((t - other).norm(), 0.0, 1e-12);
        }
    }

    /// `tan Ψ exp(iΔ) = rp / rs` and the mean reflectance say all (definition).
    #[test]
    fn an_interface_is_an_isotropic_reflector(index in 0.1..5.0_f64, absorption in 0.0..8.0_f64, incidence in 0.0..1.56_f64, plane in 0.0..3.1_f64) {
        let interface = Interface::new(1.0, index, absorption, incidence).unwrap();
        let [along, across] = amplitudes(&interface.reflection());
        prop_assume!(across.norm() > 1e-6);
        let ratio = along / across;
        let reflectance = (along.norm_sqr() + across.norm_sqr()) / 2.0;
        let reflector = elements::isotropic_reflector(ratio.norm().atan(), ratio.arg(), reflectance, plane).unwrap();
        close_matrix(&reflector, &elements::fresnel_reflection(&interface, plane).unwrap(), 1e-12);
        prop_assert!(reflectance <= 1.0 + 1e-12);
    }

    /// A diattenuator along x, +45° or y is the linear one; on one axis the order of
    /// diattenuator and retarder doesn't matter (derived).
    #[test]
    fn diattenuators_agree(low in 0.0..1.0_f64, axis in 0.0..3.1_f64, retardance in 0.0..6.2_f64) {
        let (mean, d) = (f64::midpoint(1.0, low), (1.0 - low) / (1.0 + low));
        let linear = elements::linear_diattenuator(1.0, low, axis).unwrap();
        let (s, c) = (2.0 * axis).sin_cos();
        // Near D = 1 the square root loses half of the digits.
        close_matrix(&elements::elliptical_diattenuator(mean, [d * c, d * s, 0.0]).unwrap(), &linear, 1e-7);
        let retarder = elements::linear_retarder(retardance, axis).unwrap();
        let both = elements::aligned_diattenuating_retarder(mean, d, retardance, axis).unwrap();
        close_matrix(&both, &(linear * retarder), 1e-7);
        close_matrix(&both, &(retarder * linear), 1e-7);
    }

    /// No input gives what is not a number.
    #[test]
    fn interfaces_are_finite_or_refused(
        numbers in prop::array::uniform4(prop_oneof![
            Just(0.0), Just(1.0), Just(1e-6), Just(1e6), Just(f64::NAN), Just(f64::INFINITY), Just(-1.0),
            Just(std::f64::consts::FRAC_PI_2), Just(std::f64::consts::FRAC_PI_2 - 1e-15), 0.0..2.0_f64,
        ]),
    ) {
        let [before, after, absorption, incidence] = numbers;
        if let Ok(interface) = Interface::new(before, after, absorption, incidence) {
            let finite = |jones: Jones| jones.row_major().iter().all(|z| z.is_finite());
            prop_assert!(finite(interface.reflection()));
            prop_assert!(interface.transmission().is_err() || finite(interface.transmission().unwrap()));
        }
    }
}

#[test]
fn transmission_that_has_no_power_says_why() {
    let metal = Interface::new(1.0, 1.4, 7.0, 0.3).unwrap();
    assert_eq!(
        elements::fresnel_transmission(&metal, 0.0)
            .unwrap_err()
            .code,
        "absorbing-medium"
    );
    // asin(1/1.5) is 41.8 degrees, recomputed.
    let below = Interface::new(1.5, 1.0, 0.0, 41.7_f64.to_radians()).unwrap();
    assert!(below.transmission().is_ok());
    let beyond = Interface::new(1.5, 1.0, 0.0, 41.9_f64.to_radians()).unwrap();
    assert_eq!(beyond.transmission().unwrap_err().code, "total-reflection");
}

#[test]
fn parameters_out_of_range_are_refused() {
    let codes = [
        elements::elliptical_diattenuator(-0.1, [0.0; 3]).unwrap_err(),
        elements::elliptical_diattenuator(0.5, [0.8, 0.8, 0.0]).unwrap_err(),
        elements::elliptical_diattenuator(0.5, [f64::NAN, 0.0, 0.0]).unwrap_err(),
        elements::aligned_diattenuating_retarder(0.5, 1.1, 1.0, 0.0).unwrap_err(),
        elements::aligned_diattenuating_retarder(0.5, 0.1, f64::INFINITY, 0.0).unwrap_err(),
        elements::isotropic_reflector(1.6, 0.0, 0.5, 0.0).unwrap_err(),
        elements::isotropic_reflector(0.6, 0.0, -0.5, 0.0).unwrap_err(),
        Interface::new(0.0, 1.5, 0.0, 0.5).unwrap_err(),
        Interface::new(1.0, -1.5, 0.0, 0.5).unwrap_err(),
        Interface::new(1.0, 1.5, -0.1, 0.5).unwrap_err(),
        Interface::new(1.0, 1.5, 0.0, 1.58).unwrap_err(),
        Interface::new(1.0, 1.5, f64::NAN, 0.5).unwrap_err(),
    ];
    for error in codes {
        assert_eq!(error.code, "bad-parameter");
        assert!(error.at.is_some());
    }
}
