//! Sixteen conventions, checked by what light does and not by formulas: the field
//! is followed in time.

mod common;

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, PI};

use common::{close, close_matrix};
use halfshade::convention::{AngleSense, Convention, PositiveS3, TimeSign, ZeroAngle};
use halfshade::mueller::{Jones, elements};
use halfshade::state::{JonesVector, Stokes};
use num_complex::Complex64;

/// Positive where the real field of exp(±iωt) turns counter-clockwise, x to the
/// right and y up, for the observer whom the light meets.
fn turns_counterclockwise(state: JonesVector, time: TimeSign) -> f64 {
    let sign = if time == TimeSign::Plus { 1.0 } else { -1.0 };
    let at = |phase: f64| {
        let factor = Complex64::from_polar(1.0, sign * phase);
        state.components().map(|amplitude| (amplitude * factor).re)
    };
    let (now, soon) = (at(0.3), at(0.301));
    (now[0] * soon[1] - now[1] * soon[0]).signum()
}

fn stokes(components: [f64; 4]) -> Stokes {
    Stokes::new(components).unwrap()
}

/// The angle a person reads for a direction at `angle` counter-clockwise from x.
fn read_by(convention: &Convention, angle: f64) -> f64 {
    let from_zero = match convention.zero_angle {
        ZeroAngle::X => angle,
        ZeroAngle::Y => angle - FRAC_PI_2,
    };
    let counted = match convention.angles {
        AngleSense::Counterclockwise => from_zero,
        AngleSense::Clockwise => -from_zero,
    };
    counted.rem_euclid(PI)
}

#[test]
fn there_are_sixteen() {
    let all: Vec<_> = Convention::all().collect();
    assert_eq!(all.len(), 16);
    for (k, one) in all.iter().enumerate() {
        assert!(!all[..k].contains(one));
    }
    assert_eq!(all[0], Convention::default());
}

/// Source: derived (the field followed in time); S3 of both time factors agrees
/// with reference section 6.3, derived.
#[test]
fn positive_s3_turns_clockwise_facing_the_source() {
    let circular = JonesVector::new(Complex64::new(1.0, 0.0), Complex64::new(0.0, 1.0));
    close(circular.stokes().components()[3], 2.0, 1e-15);
    assert!(turns_counterclockwise(circular, TimeSign::Plus) < 0.0);
}

/// Source: derived (the field followed in time). The element that advances x makes
/// counter-clockwise light of light at +45°.
#[test]
fn quarter_wave_with_fast_x_turns_plus_45_counterclockwise() {
    let plate = Jones::retarder(FRAC_PI_2, [1.0, 0.0, 0.0]);
    let diagonal = JonesVector::new(Complex64::new(0.5, 0.0), Complex64::new(0.5, 0.0));
    let out = plate.apply(&diagonal);
    assert!(turns_counterclockwise(out, TimeSign::Plus) > 0.0);
    let by_mueller = elements::linear_retarder(FRAC_PI_2, 0.0)
        .unwrap()
        .apply(&diagonal.stokes());
    for (a, b) in by_mueller.components().iter().zip([0.5, 0.0, 0.0, -0.5]) {
        close(*a, b, 1e-15);
    }
}

#[test]
fn circular_light_keeps_its_sense_and_diagonal_light_flips_where_it_must() {
    for convention in Convention::all() {
        // Clockwise light, facing the source, is S3 > 0 inside.
        let person = convention
            .stokes(&stokes([1.0, 0.0, 0.0, 1.0]))
            .components();
        let expected = match convention.positive_s3 {
            PositiveS3::Clockwise => 1.0,
            PositiveS3::Counterclockwise => -1.0,
        };
        assert_eq!(person, [1.0, 0.0, 0.0, expected], "{convention:?}");

        // Light at +45° counter-clockwise from x.
        let person = convention
            .stokes(&stokes([1.0, 0.0, 1.0, 0.0]))
            .components();
        let reading = read_by(&convention, FRAC_PI_4);
        close(person[2], (2.0 * reading).sin(), 1e-15);
        close(person[1], (2.0 * reading).cos(), 1e-15);

        // Light along x.
        let person = convention
            .stokes(&stokes([1.0, 1.0, 0.0, 0.0]))
            .components();
        close(person[1], (2.0 * read_by(&convention, 0.0)).cos(), 1e-15);
    }
}

#[test]
fn azimuths_and_rotations_are_read_as_the_person_counts() {
    for convention in Convention::all() {
        for angle in [0.0, 0.3, FRAC_PI_4, 1.2, FRAC_PI_2, 2.0, 3.1] {
            let read = convention.azimuth(angle);
            close(
                (read - read_by(&convention, angle) + 0.5).rem_euclid(PI),
                0.5,
                1e-14,
            );
            assert!((0.0..PI).contains(&read));
            // A rotator takes x to `angle`; the person sees the same difference.
            let turned = read_by(&convention, 0.2 + 0.1) - read_by(&convention, 0.2);
            close((convention.rotation(0.1) - turned).sin(), 0.0, 1e-14);
        }
    }
}

/// What the person writes of an element acts on what the person writes of a state.
#[test]
fn matrices_act_alike_in_every_convention_and_convert_back() {
    let element = elements::linear_diattenuator(0.8, 0.3, 0.4).unwrap()
        * elements::elliptical_retarder(1.1, 0.7, 0.2).unwrap();
    let state = stokes([1.0, 0.3, -0.5, 0.6]);
    for convention in Convention::all() {
        let theirs = convention.mueller(&element);
        let out = theirs.apply(&convention.stokes(&state)).components();
        let expected = convention.stokes(&element.apply(&state)).components();
        for (a, b) in out.iter().zip(expected) {
            close(*a, b, 1e-15);
        }
        close_matrix(&convention.mueller(&theirs), &element, 0.0);
    }
}

/// Each convention's Jones matrix, written with that person's axes and time factor,
/// turns real fields alike.
#[test]
fn jones_matrices_follow_axes_and_time_factor() {
    let plate = Jones::retarder(1.1, [0.36, 0.48, 0.8]);
    let input = [Complex64::new(0.6, 0.1), Complex64::new(-0.2, 0.7)];
    let ours = plate
        .apply(&JonesVector::new(input[0], input[1]))
        .components();
    for convention in Convention::all() {
        let theirs = convention.jones(&plate);
        // The person's first axis is their zero angle, the second a quarter turn
        // on in their sense of counting.
        let write = |field: [Complex64; 2]| {
            let [x, y] = field;
            let axes = match (convention.zero_angle, convention.angles) {
                (ZeroAngle::X, AngleSense::Counterclockwise) => [x, y],
                (ZeroAngle::X, AngleSense::Clockwise) => [x, -y],
                (ZeroAngle::Y, AngleSense::Counterclockwise) => [y, -x],
                (ZeroAngle::Y, AngleSense::Clockwise) => [y, x],
            };
            match convention.time {
                TimeSign::Plus => axes,
                TimeSign::Minus => axes.map(|amplitude| amplitude.conj()),
            }
        };
        let [first, second] = write(input);
        let out = theirs.apply(&JonesVector::new(first, second)).components();
        let expected = write(ours);
        for (a, b) in out.iter().zip(expected) {
            close((a - b).norm(), 0.0, 1e-14);
        }
    }
}

/// Source: reference section 6.3, derived: under exp(-iωt) a fast x axis is
/// diag(exp(-iδ/2), exp(+iδ/2)).
#[test]
fn fast_x_under_the_other_time_factor() {
    let convention = Convention {
        time: TimeSign::Minus,
        ..Convention::default()
    };
    let [xx, xy, yx, yy] = convention
        .jones(&Jones::retarder(0.8, [1.0, 0.0, 0.0]))
        .row_major();
    close((xx - Complex64::from_polar(1.0, -0.4)).norm(), 0.0, 1e-15);
    close((yy - Complex64::from_polar(1.0, 0.4)).norm(), 0.0, 1e-15);
    assert_eq!((xy.norm(), yx.norm()), (0.0, 0.0));
}
