//! What a wrong instrument does to a matrix: against simulated readings of one that is wrong,
//! reduced as if it were not. *Derived*, from the definition of the instrument matrix.

use std::f64::consts::PI;

use halfshade::examine::{Simulation, examine, examine_with};
use halfshade::figures::compare;
use halfshade::mueller::{Mueller, elements};
use halfshade::noise::{Measurement, Noise, Side, Systematic};
use halfshade::state::Stokes;
use halfshade::stats::NormalDraws;
use nalgebra::{DMatrix, DVector};

/// Of a side: its retardance, the azimuth of its polarizer, the offset of the whole, its
/// degree of polarization.
#[derive(Clone, Copy)]
struct Truth {
    retardance: f64,
    polarizer: f64,
    offset: f64,
    contrast: f64,
}

const ANGLES: usize = 9;

fn generator(side: Truth) -> Vec<[f64; 4]> {
    (0..ANGLES)
        .map(|k| {
            let angle = PI * k as f64 / ANGLES as f64;
            let retarder = elements::linear_retarder(side.retardance, angle + side.offset).unwrap();
            let twice = 2.0 * (side.polarizer + side.offset);
            let state = Stokes::new([
                1.0,
                side.contrast * twice.cos(),
                side.contrast * twice.sin(),
                0.0,
            ])
            .unwrap();
            retarder.apply(&state).components()
        })
        .collect()
}

/// The rows of the analyser are the states of a generator that light passes backwards: those
/// of the same retarder with its sense turned round.
fn analyser(side: Truth) -> Vec<[f64; 4]> {
    generator(side)
        .into_iter()
        .map(|[a, b, c, d]| [a, b, c, -d])
        .collect()
}

fn measure(mueller: &Mueller, sides: [Truth; 2], dark: f64) -> DVector<f64> {
    let m = nalgebra::Matrix4::from_row_slice(&mueller.row_major());
    let mut readings = Vec::new();
    for a in analyser(sides[1]) {
        for g in generator(sides[0]) {
            let state = m * nalgebra::Vector4::from(g);
            readings.push(nalgebra::Vector4::from(a).dot(&state) + dark);
        }
    }
    DVector::from_vec(readings)
}

fn reduce(readings: &DVector<f64>, sides: [Truth; 2]) -> [f64; 16] {
    let (a, g) = (analyser(sides[1]), generator(sides[0]));
    let w = DMatrix::from_fn(ANGLES * ANGLES, 16, |k, e| {
        a[k / ANGLES][e / 4] * g[k % ANGLES][e % 4]
    });
    let solution = w.svd(true, true).solve(readings, 1e-12).unwrap();
    std::array::from_fn(|k| solution[k])
}

fn film() -> Mueller {
    elements::linear_retarder(1.1, 0.4).unwrap()
        * elements::linear_diattenuator(0.8, 0.5, 0.9).unwrap()
        * elements::circular_retarder(0.3).unwrap()
}

const SIDES: [Truth; 2] = [
    Truth {
        retardance: 2.3,
        polarizer: 0.3,
        offset: 0.0,
        contrast: 1.0,
    },
    Truth {
        retardance: 1.4,
        polarizer: -0.7,
        offset: 0.0,
        contrast: 1.0,
    },
];

fn stated(which: usize, quantity: usize, size: f64) -> Systematic {
    let side = |k: usize| {
        let of = |q| {
            if k == which && q == quantity {
                size
            } else {
                0.0
            }
        };
        Side {
            retardance: SIDES[k].retardance,
            polarizer: SIDES[k].polarizer,
            retardance_error: of(0),
            azimuth_error: of(1),
            contrast_error: of(2),
        }
    };
    Systematic {
        generator: side(0),
        analyser: side(1),
        dark: if which == 2 { size } else { 0.0 },
    }
}

#[test]
fn each_quantity_moves_the_elements_as_a_wrong_instrument_does() {
    const STEP: f64 = 1e-5;
    let truth = film();
    for normalised in [false, true] {
        let mueller = if normalised {
            truth.normalised().unwrap()
        } else {
            truth
        };
        for (which, quantity) in [(0, 0), (0, 1), (0, 2), (1, 0), (1, 1), (1, 2), (2, 0)] {
            let mut wrong = SIDES;
            if let Some(side) = wrong.get_mut(which) {
                match quantity {
                    0 => side.retardance += STEP,
                    1 => side.offset += STEP,
                    _ => side.contrast -= STEP,
                }
            }
            let dark = if which == 2 {
                STEP * mueller.m00()
            } else {
                0.0
            };
            let mut found = reduce(&measure(&mueller, wrong, dark), SIDES);
            if normalised {
                let m00 = found[0];
                found = found.map(|value| value / m00);
            }
            let measurement =
                Measurement::new(mueller, normalised, false, Noise::Uniform { sigma: 1e-9 })
                    .unwrap()
                    .with_systematic(stated(which, quantity, STEP))
                    .unwrap();
            let sigma = measurement.systematic_sigma().unwrap();
            for (k, exact) in mueller.row_major().into_iter().enumerate() {
                let moved = (found[k] - exact).abs() / STEP;
                // The second order of the step is left.
                assert!(
                    (moved - sigma[k] / STEP).abs() < 2e-4,
                    "{which} {quantity} {k}: {moved}, {}",
                    sigma[k] / STEP
                );
            }
        }
    }
}

fn measured(systematic: Systematic, noise: Noise, mueller: Mueller) -> Measurement {
    Measurement::new(mueller, false, false, noise)
        .unwrap()
        .with_systematic(systematic)
        .unwrap()
}

#[test]
fn standard_errors_and_intervals_hold_both_parts() {
    let noise = Noise::Uniform { sigma: 0.001 };
    let both = measured(stated(0, 1, 0.02), noise.clone(), film());
    let alone = Measurement::new(film(), false, false, noise).unwrap();
    let simulation = Some(Simulation {
        seed: 3,
        draws: 2000,
    });
    let both = examine_with(&both, simulation).unwrap();
    let alone = examine_with(&alone, simulation).unwrap();
    // A generator that is turned by 0.02 turns the matrix from its other side: the azimuth of
    // the diattenuation by as much, its length by nothing.
    let of = |found: &halfshade::examine::Examination, name| *found.figures.get(name);
    use halfshade::figures::FigureName::{Diattenuation, DiattenuationAzimuth};
    let azimuth = of(&both, DiattenuationAzimuth);
    let before = of(&alone, DiattenuationAzimuth).se.unwrap();
    assert!((azimuth.se.unwrap() / before.hypot(0.02) - 1.0).abs() < 1e-9);
    let interval = azimuth.interval.unwrap();
    let half = 0.5 * (interval.high.unwrap() - interval.low.unwrap());
    assert!((half / (1.96 * 0.02_f64.hypot(before)) - 1.0).abs() < 0.06);
    let length = of(&both, Diattenuation).se.unwrap();
    assert!((length / of(&alone, Diattenuation).se.unwrap() - 1.0).abs() < 1e-9);
}

#[test]
fn a_violation_of_the_stated_size_is_explained() {
    // A contrast taken 2 % too low makes everything too polarized.
    let mut elements = film().row_major();
    for (k, element) in elements.iter_mut().enumerate() {
        if k % 4 > 0 {
            *element *= 1.02;
        }
    }
    let mueller = Mueller::from_row_major(&elements).unwrap();
    let noise = Noise::Uniform { sigma: 0.001 };
    let p = |measurement: &Measurement| {
        examine(measurement, Some(1))
            .unwrap()
            .realizability
            .significance
            .unwrap()
            .p_value
    };
    let alone = Measurement::new(mueller, false, false, noise.clone()).unwrap();
    assert!(p(&alone) < 0.01);
    assert!(p(&measured(stated(0, 2, 0.02), noise, mueller)) > 0.05);
}

#[test]
fn one_instrument_errs_alike_in_both_of_a_pair() {
    let noise = Noise::Uniform { sigma: 0.001 };
    // Not a pure film: there the entropy has a corner.
    let depolarizer = elements::isotropic_depolarizer(0.2).unwrap();
    let film = depolarizer * film();
    let one = measured(stated(0, 2, 0.02), noise.clone(), film);
    let alone = Measurement::new(film, false, false, noise.clone()).unwrap();
    // The same matrix twice: all of the systematic part cancels.
    let found = compare(&one, &one).unwrap();
    let plain = compare(&alone, &alone).unwrap();
    for ((_, a), (name, b)) in found.figures.iter().zip(&plain.figures) {
        let (Some(a), Some(b)) = (a.se, b.se) else {
            continue;
        };
        assert!((a / b - 1.0).abs() < 1e-9, "{name:?}: {a} {b}");
    }
    // Another instrument with the same size of error does not.
    let other = measured(stated(1, 2, 0.02), noise, film);
    let figure = halfshade::figures::FigureName::Polarizance as usize;
    let figures = compare(&one, &other).unwrap().figures;
    assert!(figures[figure].1.se > plain.figures[figure].1.se.map(|se| 1.5 * se));
}

/// Derived: a count of 100 with 5 % has a standard deviation of 2.2.
#[test]
fn repeats_with_a_systematic_part_are_not_rejected_too_often() {
    let truth = elements::linear_retarder(1.3, 0.5).unwrap();
    let rejected = (0..100_u64)
        .filter(|&trial| {
            let mut draws = NormalDraws::new(trial);
            let scale = 1.0 + 0.01 * draws.draw();
            let matrices = (0..3)
                .map(|_| {
                    let errors = draws.draw_matrix();
                    let elements = truth.row_major();
                    Mueller::from_row_major(&std::array::from_fn(|k| {
                        elements[k] * if k % 4 > 0 { scale } else { 1.0 } + 0.005 * errors[k]
                    }))
                    .unwrap()
                })
                .collect();
            let measurement = Measurement::of_replicates(matrices, false, false)
                .unwrap()
                .with_systematic(stated(0, 2, 0.01))
                .unwrap();
            let found = examine(&measurement, Some(trial)).unwrap();
            found
                .realizability
                .significance
                .is_some_and(|test| test.p_value < 0.05)
        })
        .count();
    assert!(rejected <= 12, "{rejected} of 100");
}

#[test]
fn what_is_no_uncertainty_is_refused() {
    let noise = Noise::Uniform { sigma: 0.001 };
    let refused = |noise: Noise, systematic| {
        Measurement::new(film(), false, false, noise)
            .unwrap()
            .with_systematic(systematic)
            .expect_err("was taken")
            .code
    };
    for (which, quantity, size) in [(0, 0, -1.0), (0, 1, f64::NAN), (1, 2, 2.0), (2, 0, -0.1)] {
        assert_eq!(
            refused(noise.clone(), stated(which, quantity, size)),
            "bad-systematic"
        );
    }
    let mut half_wave = stated(0, 0, 0.01);
    half_wave.generator.retardance = PI;
    assert_eq!(refused(noise, half_wave), "bad-systematic");
    assert_eq!(refused(Noise::None, stated(0, 0, 0.01)), "bad-systematic");
}
