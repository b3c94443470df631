//! Fits of trains: recovery, what cannot be told apart, equivalents, hostile requests.

mod common;

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, PI};

use common::{close, close_matrix, measurement};
use halfshade::convention::Convention;
use halfshade::mueller::{Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::NormalDraws;
use halfshade::text::{ReadOptions, parse_matrices};
use halfshade::train::{
    Combination, Element, FitOptions, Kind, Parameter, ParameterPlace, Removal, Role, Train,
    TrainFit, fit_train, remove_optics,
};

const OPTIONS: FitOptions = FitOptions {
    seed: 1,
    starts: None,
};

fn element(kind: Kind, parameters: &[Parameter]) -> Element {
    Element::new(kind, parameters.to_vec()).unwrap()
}

fn free(value: f64) -> Parameter {
    Parameter::free(value)
}

fn fixed(value: f64) -> Parameter {
    Parameter::fixed(value)
}

fn noisy(truth: &Mueller, sigma: f64, draws: &mut NormalDraws) -> Measurement {
    let errors = draws.draw_matrix();
    let elements = truth.row_major();
    let drawn = std::array::from_fn(|k| elements[k] + sigma * errors[k]);
    measurement(
        Mueller::from_row_major(&drawn).unwrap(),
        false,
        Noise::Uniform { sigma },
    )
}

fn sentences(fit: &TrainFit) -> Vec<String> {
    let canonical = Convention::default();
    fit.null_directions
        .iter()
        .map(|direction| direction.sentence(&canonical))
        .collect()
}

/// A uniform number from normal ones: their fractional part at a fine scale.
fn uniform(draws: &mut NormalDraws, low: f64, high: f64) -> f64 {
    low + (high - low) * (1e3 * draws.draw()).rem_euclid(1.0)
}

fn below(draws: &mut NormalDraws, count: usize) -> usize {
    (uniform(draws, 0.0, count as f64) as usize).min(count - 1)
}

/// Values of a kind, away from the edges of its range.
fn random_values(kind: Kind, draws: &mut NormalDraws) -> Vec<f64> {
    let mut values: Vec<f64> = kind
        .definitions()
        .iter()
        .map(|definition| match definition.name {
            "transmittance" | "transmittanceMax" | "reflectance" => uniform(draws, 0.5, 1.0),
            "transmittanceMin" => uniform(draws, 0.05, 0.4),
            "diattenuation" => uniform(draws, 0.1, 0.8),
            "alpha" => uniform(draws, 0.05, 0.5),
            "d1" | "d2" | "d3" => uniform(draws, 0.3, 0.95),
            "ellipticity" => uniform(draws, -0.6, 0.6),
            "psi" => uniform(draws, 0.3, 1.2),
            "indexBefore" => 1.0,
            "indexAfter" => uniform(draws, 1.3, 2.0),
            "absorption" => 0.0,
            "incidence" => uniform(draws, 0.3, 1.1),
            "retardance" | "delta" => uniform(draws, 0.2, 2.9),
            _ => uniform(draws, 0.0, PI),
        })
        .collect();
    if kind == Kind::FresnelReflection {
        values[2] = uniform(draws, 0.5, 3.0);
    }
    values
}

/// Singular values of the derivatives at the truth, by differences, over σ: what the
/// measurement knows of unit changes.
fn knowledge(train: &Train, sigma: f64) -> Vec<f64> {
    let places = train.free();
    let step = 1e-5;
    let matrix = nalgebra::DMatrix::from_fn(16, places.len(), |row, column| {
        let at = |shift: f64| {
            let value = train.value(places[column]) + shift;
            let moved = train.with_values(&[places[column]], &[value]);
            moved.mueller().unwrap().row_major()[row]
        };
        (at(step) - at(-step)) / (2.0 * step) / sigma
    });
    let mut values: Vec<f64> = matrix
        .svd(false, false)
        .singular_values
        .iter()
        .copied()
        .collect();
    // More parameters than elements: the rest is known not at all.
    values.resize(places.len(), 0.0);
    values
}

/// Whether a solution has these values, whole periods apart.
fn is_truth(train: &Train, places: &[ParameterPlace], values: &[f64], errors: &[f64]) -> bool {
    places
        .iter()
        .zip(values)
        .zip(errors)
        .all(|((&place, value), error)| {
            let mut apart = value - train.value(place);
            let period = train.definition(place).unwrap().period;
            if period.is_finite() {
                apart -= period * (apart / period).round();
            }
            apart.abs() <= 7.0 * error + 1e-9
        })
}

struct Outcome {
    recovered: usize,
    degenerate: usize,
    weak: usize,
    equivalent: usize,
}

fn random_trains(count: usize, seed: u64) -> Outcome {
    let mut draws = NormalDraws::new(seed);
    let sigma = 1e-6;
    let mut outcome = Outcome {
        recovered: 0,
        degenerate: 0,
        weak: 0,
        equivalent: 0,
    };
    let kinds: Vec<Kind> = Kind::ALL
        .into_iter()
        .filter(|kind| *kind != Kind::Measured)
        .collect();
    for round in 0..count {
        let length = 1 + below(&mut draws, 5);
        let mut parts: Vec<(Kind, Vec<f64>)> = (0..length)
            .map(|_| {
                let kind = kinds[below(&mut draws, kinds.len())];
                (kind, random_values(kind, &mut draws))
            })
            .collect();
        // Sometimes neighbours share an axis, which makes true degeneracies.
        if length > 1 && below(&mut draws, 3) == 0 {
            parts[1] = parts[0].clone();
        }
        let all: Vec<(usize, usize)> = parts
            .iter()
            .enumerate()
            .flat_map(|(k, (_, values))| (0..values.len()).map(move |i| (k, i)))
            .filter(|&(k, i)| {
                let name = parts[k].0.definitions()[i].name;
                // An absorption of zero is an edge, and no transmission has another.
                !(name == "absorption" && parts[k].0 == Kind::FresnelTransmission)
            })
            .collect();
        let wanted = 1 + below(&mut draws, 6);
        let mut chosen = vec![];
        for _ in 0..wanted {
            let one = all[below(&mut draws, all.len())];
            if !chosen.contains(&one) {
                chosen.push(one);
            }
        }
        let build = |draws: &mut NormalDraws, away: f64| -> Train {
            let elements = parts
                .iter()
                .enumerate()
                .map(|(k, (kind, values))| {
                    let parameters: Vec<Parameter> = values
                        .iter()
                        .zip(kind.definitions())
                        .enumerate()
                        .map(|(i, (&value, definition))| {
                            if !chosen.contains(&(k, i)) {
                                return fixed(value);
                            }
                            let start = value * (1.0 + away * draws.draw());
                            free(start.clamp(definition.low, definition.high))
                        })
                        .collect();
                    element(*kind, &parameters)
                })
                .collect();
            Train::new(elements).unwrap()
        };
        let truth = build(&mut draws, 0.0);
        let start = build(&mut draws, 0.2);
        let measured = noisy(&truth.mueller().unwrap(), sigma, &mut draws);
        let fit = fit_train(&measured, &start, OPTIONS).unwrap();
        let says = || {
            format!(
                "round {round}: {parts:?}, free {chosen:?}: {:?}, {:?}, χ² {:?}",
                sentences(&fit),
                fit.parameters
                    .iter()
                    .map(|one| one.value)
                    .collect::<Vec<_>>(),
                fit.chi_square
            )
        };
        // The lowest minimum is always found.
        assert!(fit.p_value.is_none_or(|p| p > 1e-6), "{}", says());
        let places = truth.free();
        let known = knowledge(&truth, sigma);
        let (most, least) = (known[0], known[known.len() - 1]);
        if least <= 1e-7 * most {
            outcome.degenerate += 1;
            // Where two solutions meet, the truth may be beside the fit among the others.
            let wide = vec![0.003; places.len()];
            let other = fit
                .equivalents
                .iter()
                .any(|one| is_truth(&truth, &places, &one.values, &wide));
            assert!(!fit.null_directions.is_empty() || other, "{}", says());
        } else if least > 1e-2 / sigma {
            // Every derivative is well above what its own change over seven standard
            // errors, 1e-4 each, is: first order holds.
            assert!(fit.null_directions.is_empty(), "{}", says());
            let errors: Vec<f64> = fit
                .parameters
                .iter()
                .map(|one| one.se.unwrap_or(1e-4))
                .collect();
            let found: Vec<f64> = fit.parameters.iter().map(|one| one.value).collect();
            let best = is_truth(&truth, &places, &found, &errors);
            // Errors of another solution are its own: what is near enough is the truth.
            let loose: Vec<f64> = errors.iter().map(|error| error.max(2e-3 / 7.0)).collect();
            let other = fit
                .equivalents
                .iter()
                .any(|one| is_truth(&truth, &places, &one.values, &loose));
            assert!(best || other, "{}", says());
            outcome.recovered += usize::from(best);
            outcome.equivalent += usize::from(!best);
        } else {
            outcome.weak += 1;
        }
        // What is said to be undetermined is so: a step along it is of second order.
        for direction in fit.null_directions.iter().filter(|one| !one.within_noise) {
            for along in &direction.directions {
                let length = along.iter().map(|part| part * part).sum::<f64>().sqrt();
                let step = 1e-5;
                let values: Vec<f64> = direction
                    .places
                    .iter()
                    .zip(along)
                    .map(|(&place, part)| fit.train.value(place) + step * part / length)
                    .collect();
                let moved = fit.train.with_values(&direction.places, &values);
                if let Ok(moved) = moved.mueller() {
                    let change = moved.distance(&fit.train.mueller().unwrap());
                    // The curvature of an index is of order a hundred.
                    assert!(change < 4e-3 * step, "{change} {}", says());
                }
            }
        }
    }
    outcome
}

#[test]
fn random_trains_come_back_or_are_said_to_be_degenerate() {
    let outcome = random_trains(60, 1);
    assert!(outcome.recovered > 20, "{}", outcome.recovered);
    assert!(outcome.degenerate > 3, "{}", outcome.degenerate);
}

/// In full; a few seconds.
#[test]
#[ignore = "slow"]
fn three_hundred_random_trains() {
    let outcome = random_trains(300, 2);
    println!(
        "recovered {}, by an equivalent {}, degenerate {}, weakly determined {}",
        outcome.recovered, outcome.equivalent, outcome.degenerate, outcome.weak
    );
    assert!(outcome.recovered > 120);
    assert!(outcome.degenerate > 30);
    // Neither class may swallow the test.
    assert!(outcome.weak < 45, "{}", outcome.weak);
}

/// Retardances on one axis add, transmittances and retained shares multiply, a rotator
/// turns what follows (derived from the matrices).
#[test]
fn what_cannot_be_told_apart_is_named() {
    let check = |parts: Vec<Element>, expected: &str| {
        let train = Train::new(parts).unwrap();
        let truth = train.mueller().unwrap();
        let measured = noisy(&truth, 1e-4, &mut NormalDraws::new(4));
        let fit = fit_train(&measured, &train, OPTIONS).unwrap();
        assert_eq!(sentences(&fit), [expected]);
        // Nothing pretends to be known.
        for parameter in &fit.parameters {
            let named = fit.null_directions[0].places.contains(&parameter.place);
            assert_eq!(parameter.se.is_none(), named);
            assert_eq!(parameter.reason.is_some(), named);
        }
        fit
    };
    let retarder = |delta, axis: f64| element(Kind::LinearRetarder, &[free(delta), fixed(axis)]);
    let fit = check(
        vec![
            retarder(0.4, 0.3).labelled("window"),
            retarder(0.7, 0.3).labelled("film"),
        ],
        "Only the sum of the retardance of window (element 1) and the retardance of film (element 2) is determined.",
    );
    let Some(Combination::Sum(weights)) = &fit.null_directions[0].determined else {
        panic!("{:?}", fit.null_directions)
    };
    close(weights[1], 1.0, 1e-6);
    check(
        vec![retarder(0.4, 0.3), retarder(0.7, 0.3 + FRAC_PI_2)],
        "Only the difference of the retardance of linear retarder (element 1) and the retardance of linear retarder (element 2) is determined.",
    );
    check(
        vec![retarder(0.4, 0.3), retarder(0.7, 0.3), retarder(0.2, 0.3)],
        "Only the sum of the retardance of linear retarder (element 1), the retardance of linear retarder (element 2) and the retardance of linear retarder (element 3) is determined.",
    );
    let haze = |alpha| element(Kind::IsotropicDepolarizer, &[free(alpha)]);
    check(
        vec![haze(0.2), haze(0.3)],
        "Only the product of the shares 1 − α that are left is determined, not each depolarization α of isotropic depolarizer (element 1) and the depolarization α of isotropic depolarizer (element 2).",
    );
    let film = |t| {
        element(
            Kind::AlignedDiattenuatingRetarder,
            &[free(t), fixed(0.2), fixed(1.0), fixed(0.4)],
        )
    };
    check(
        vec![film(0.5), film(0.8)],
        "Only the product of the transmittance of diattenuating retarder (element 1) and the transmittance of diattenuating retarder (element 2) is determined.",
    );
    // ψ of a rotator and δ of optical activity: the azimuth turns by ψ - δ/2.
    check(
        vec![
            element(Kind::CircularRetarder, &[free(0.4)]),
            element(Kind::Rotator, &[free(0.3)]),
        ],
        "Only one combination is determined, here the sum of 1 times the retardance of circular retarder (element 1) and −2 times the angle of rotator (element 2).",
    );
    // The axis of a depolarizing disc does not exist: a retarder without retardance.
    check(
        vec![element(Kind::LinearRetarder, &[fixed(0.0), free(0.3)])],
        "The axis of linear retarder (element 1) has no effect on the matrix: not determined.",
    );
}

/// The sentence keeps its meaning in another convention: signs of S3 turn a sum into a
/// difference (derived).
#[test]
fn sentences_speak_the_persons_convention() {
    let train = Train::new(vec![
        element(Kind::CircularRetarder, &[free(0.4)]),
        element(Kind::Rotator, &[free(0.3)]),
    ])
    .unwrap();
    let measured = noisy(&train.mueller().unwrap(), 1e-4, &mut NormalDraws::new(4));
    let fit = fit_train(&measured, &train, OPTIONS).unwrap();
    let other = Convention {
        positive_s3: halfshade::convention::PositiveS3::Counterclockwise,
        ..Convention::default()
    };
    let sentence = fit.null_directions[0].sentence(&other);
    assert!(sentence.contains(" and 2 times the angle"), "{sentence}");
}

/// A train with an exchange of fast and slow fits as well: it is an equivalent (physics of
/// retarders; derived), and the fit is the one near to the start.
#[test]
fn exchanged_axes_are_equivalents() {
    let train = |delta, axis| {
        Train::new(vec![element(
            Kind::LinearRetarder,
            &[free(delta), free(axis)],
        )])
        .unwrap()
    };
    let measured = noisy(
        &train(1.2, 0.4).mueller().unwrap(),
        1e-4,
        &mut NormalDraws::new(8),
    );
    let fit = fit_train(&measured, &train(1.0, 0.5), OPTIONS).unwrap();
    close(fit.parameters[0].value, 1.2, 1e-3);
    close(fit.parameters[1].value, 0.4, 1e-3);
    assert_eq!(fit.equivalents.len(), 1, "{:?}", fit.equivalents);
    let other = &fit.equivalents[0];
    assert_eq!(other.chi_square_difference, 0.0);
    close(
        (other.values[0] + 1.2)
            .rem_euclid(2.0 * PI)
            .min(2.0 * PI - (other.values[0] + 1.2).rem_euclid(2.0 * PI)),
        0.0,
        1e-3,
    );
    close((other.values[1] - 0.4).rem_euclid(PI), FRAC_PI_2, 1e-3);
    let near = fit_train(&measured, &train(-1.0, 2.0), OPTIONS).unwrap();
    close(near.parameters[0].value, -1.2, 1e-3);
    // Bounds leave only one.
    let bounded = Train::new(vec![element(
        Kind::LinearRetarder,
        &[
            Parameter {
                value: 1.0,
                role: Role::Free {
                    low: Some(0.0),
                    high: Some(PI),
                },
            },
            free(0.5),
        ],
    )])
    .unwrap();
    let fit = fit_train(&measured, &bounded, OPTIONS).unwrap();
    assert!(fit.equivalents.is_empty(), "{:?}", fit.equivalents);
}

/// Standard errors against the scatter of 400 fits (3.5 % by sampling; five standard
/// deviations are allowed), coverage of the 95 % intervals, and p uniform, under three
/// statements of noise.
#[test]
fn errors_intervals_and_p_are_what_they_say() {
    let sigma = 0.002;
    let train = |start: bool| {
        let v = |value: f64| free(if start { value * 1.1 } else { value });
        Train::new(vec![
            element(
                Kind::AlignedDiattenuatingRetarder,
                &[v(0.8), v(0.2), v(1.1), v(0.5)],
            ),
            element(Kind::IsotropicDepolarizer, &[v(0.1)]),
        ])
        .unwrap()
    };
    let truth = train(false).mueller().unwrap();
    let mut covariance = Box::new([0.0; 256]);
    for i in 0..16 {
        for j in 0..16 {
            covariance[16 * i + j] = sigma * sigma * if i == j { 1.0 } else { 0.5 };
        }
    }
    for kind in 0..4 {
        let mut draws = NormalDraws::new(21 + kind);
        let count = 400;
        let (mut values, mut inside) = (vec![vec![]; 5], [0; 5]);
        let (mut low_p, mut mean_p) = (0, 0.0);
        let mut errors = [0.0; 5];
        for _ in 0..count {
            let mut draw = |base: &Mueller| {
                let errors = draws.draw_matrix();
                let common = draws.draw();
                let elements = base.row_major();
                Mueller::from_row_major(&std::array::from_fn(|k| {
                    let error = if kind == 1 {
                        (errors[k] + common) / 2.0_f64.sqrt()
                    } else {
                        errors[k]
                    };
                    elements[k] + sigma * error
                }))
                .unwrap()
            };
            let measured = match kind {
                0 => measurement(draw(&truth), false, Noise::Uniform { sigma }),
                1 => measurement(
                    draw(&truth),
                    false,
                    Noise::Covariance {
                        covariance: covariance.clone(),
                    },
                ),
                2 => Measurement::of_replicates(vec![draw(&truth), draw(&truth)], false, false)
                    .unwrap(),
                _ => measurement(draw(&truth), false, Noise::None),
            };
            let options = FitOptions {
                seed: 1,
                starts: Some(4),
            };
            let fit = fit_train(&measured, &train(true), options).unwrap();
            assert_eq!(fit.degrees_of_freedom, 11);
            for (k, parameter) in fit.parameters.iter().enumerate() {
                let expected = train(false).value(parameter.place);
                values[k].push(parameter.value - expected);
                errors[k] += parameter.se.unwrap() / f64::from(count);
                let (low, high) = (parameter.low.unwrap(), parameter.high.unwrap());
                inside[k] += usize::from((low..=high).contains(&expected));
            }
            match fit.p_value {
                Some(p) => {
                    low_p += usize::from(p < 0.05);
                    mean_p += p / f64::from(count);
                }
                None => assert_eq!(kind, 3),
            }
        }
        for k in 0..5 {
            let spread = (values[k].iter().map(|v| v * v).sum::<f64>() / f64::from(count)).sqrt();
            close(errors[k] / spread, 1.0, 0.18);
            // 95 % of 400 is 380, give or take 4.4.
            assert!((358..=398).contains(&inside[k]), "kind {kind}: {inside:?}");
        }
        if kind < 3 {
            // 5 % of 400 is 20 ± 4.4; the mean 0.5 ± 0.0144.
            assert!((3..=42).contains(&low_p), "kind {kind}: {low_p}");
            close(mean_p, 0.5, 0.07);
        }
    }
}

/// With M00 exact a common transmittance has no effect, and the rest comes back.
#[test]
fn exact_m00_leaves_the_transmittance_open() {
    let train = Train::new(vec![element(
        Kind::AlignedDiattenuatingRetarder,
        &[free(0.7), free(0.3), free(1.0), free(0.4)],
    )])
    .unwrap();
    let truth = train.mueller().unwrap().normalised().unwrap();
    let errors = NormalDraws::new(2).draw_matrix();
    let elements = truth.row_major();
    let drawn = std::array::from_fn(|k| elements[k] + if k == 0 { 0.0 } else { 1e-4 * errors[k] });
    let measured = measurement(
        Mueller::from_row_major(&drawn).unwrap(),
        true,
        Noise::Uniform { sigma: 1e-4 },
    );
    let fit = fit_train(&measured, &train, OPTIONS).unwrap();
    assert_eq!(fit.degrees_of_freedom, 15 - 3);
    assert_eq!(
        sentences(&fit),
        [
            "The transmittance of diattenuating retarder (element 1) has no effect on the matrix: not determined."
        ]
    );
    for (parameter, expected) in fit.parameters[1..].iter().zip([0.3, 1.0, 0.4]) {
        close(parameter.value, expected, 7.0 * parameter.se.unwrap());
    }
    assert_eq!(fit.mueller.m00(), 1.0);
}

/// A perfect polarizer lies on the edge of what a diattenuator can be: its small
/// transmittance stops at zero or close to it, with an interval that holds zero.
#[test]
fn a_perfect_polarizer_is_fitted_at_its_edge() {
    let sheet = |max, min, axis| {
        Train::new(vec![element(
            Kind::LinearDiattenuator,
            &[free(max), free(min), free(axis)],
        )])
        .unwrap()
    };
    let truth = elements::linear_diattenuator(0.8, 0.0, 0.3).unwrap();
    let mut draws = NormalDraws::new(6);
    for _ in 0..50 {
        let measured = noisy(&truth, 0.002, &mut draws);
        let fit = fit_train(&measured, &sheet(0.9, 0.1, 0.2), OPTIONS).unwrap();
        let [max, min, axis] = [0, 1, 2].map(|k| fit.parameters[k]);
        close(max.value, 0.8, 6.0 * max.se.unwrap());
        close(axis.value, 0.3, 6.0 * axis.se.unwrap());
        assert!(min.value >= 0.0 && min.value < 1e-4, "{min:?}");
        assert!(
            min.low.unwrap() <= 1e-5 && min.high.unwrap() > 0.0,
            "{min:?}"
        );
        assert!(min.se.is_some() || (min.at_bound && min.reason.is_some()));
    }
}

/// Ties hold in the fit: two halves of one plate.
#[test]
fn ties_are_kept() {
    let half = |retardance| element(Kind::LinearRetarder, &[retardance, fixed(0.0)]);
    let train = |value| {
        Train::new(vec![
            half(free(value)),
            element(Kind::LinearRetarder, &[fixed(0.5), fixed(FRAC_PI_4)]),
            half(Parameter {
                value: 0.0,
                role: Role::Tied {
                    element: 0,
                    parameter: 0,
                    factor: 2.0,
                    offset: -0.1,
                },
            }),
        ])
        .unwrap()
    };
    let measured = noisy(
        &train(0.6).mueller().unwrap(),
        1e-5,
        &mut NormalDraws::new(2),
    );
    let fit = fit_train(&measured, &train(0.5), OPTIONS).unwrap();
    assert_eq!(fit.parameters.len(), 1);
    close(fit.parameters[0].value, 0.6, 1e-4);
    let last = ParameterPlace {
        element: 2,
        parameter: 0,
    };
    close(fit.train.value(last), 1.1, 2e-4);
    close_matrix(&fit.mueller, &fit.train.mueller().unwrap(), 1e-15);
}

/// What asks for nothing or too much is answered in words, and no number is infinite.
#[test]
fn hostile_fits() {
    let air = measurement(Mueller::identity(), false, Noise::Uniform { sigma: 0.01 });
    // Nothing to fit: a χ² of the train as it is.
    let none = Train::new(vec![element(Kind::Rotator, &[fixed(0.0)])]).unwrap();
    let fit = fit_train(&air, &none, OPTIONS).unwrap();
    assert_eq!((fit.parameters.len(), fit.chi_square), (0, Some(0.0)));
    assert_eq!(fit.degrees_of_freedom, 16);
    let nothing = fit_train(&air, &Train::new(vec![]).unwrap(), OPTIONS).unwrap();
    assert_eq!(nothing.chi_square, Some(0.0));
    let many = vec![element(Kind::Rotator, &[free(0.1)]); 25];
    let error = fit_train(&air, &Train::new(many).unwrap(), OPTIONS).unwrap_err();
    assert_eq!(error.code, "too-large");
    // More free parameters than elements.
    let twenty = vec![element(Kind::Rotator, &[free(0.1)]); 20];
    let fit = fit_train(&air, &Train::new(twenty).unwrap(), OPTIONS).unwrap();
    assert_eq!(fit.degrees_of_freedom, 15);
    assert_eq!(fit.null_directions.len(), 1);
    assert_eq!(fit.null_directions[0].directions.len(), 19);
    let zero = Mueller::from_row_major(&[0.0; 16]).unwrap();
    let tiny = Mueller::from_row_major(&[1e-150; 16]).unwrap();
    let huge = Mueller::from_row_major(&[1e149; 16]).unwrap();
    for matrix in [zero, tiny, huge] {
        for exact in [false, true] {
            for noise in [
                Noise::None,
                Noise::Uniform { sigma: 1e-140 },
                Noise::Uniform { sigma: 1e140 },
            ] {
                for kind in Kind::ALL {
                    if kind == Kind::Measured {
                        continue;
                    }
                    let values = random_values(kind, &mut NormalDraws::new(1));
                    let parameters: Vec<Parameter> = values.iter().map(|&v| free(v)).collect();
                    let train = Train::new(vec![element(kind, &parameters)]).unwrap();
                    let options = FitOptions {
                        seed: 3,
                        starts: Some(3),
                    };
                    let one = measurement(matrix, exact, noise.clone());
                    if let Ok(fit) = fit_train(&one, &train, options) {
                        finite(&fit);
                    }
                }
            }
        }
    }
}

#[track_caller]
fn finite(fit: &TrainFit) {
    let mut numbers: Vec<f64> = fit.mueller.row_major().to_vec();
    numbers.extend(fit.residuals.iter().flatten());
    numbers.extend(
        [fit.chi_square, fit.p_value, fit.aic, fit.bic]
            .into_iter()
            .flatten(),
    );
    for one in &fit.parameters {
        numbers.push(one.value);
        numbers.extend([one.se, one.low, one.high].into_iter().flatten());
        assert!(one.se.is_some() || one.reason.is_some());
    }
    numbers.extend(fit.covariance.iter().flatten().flatten());
    numbers.extend(fit.correlation.iter().flatten().flatten());
    numbers.extend(fit.equivalents.iter().flat_map(|one| one.values.clone()));
    numbers.extend(fit.equivalents.iter().map(|one| one.chi_square_difference));
    assert!(numbers.iter().all(|number| number.is_finite()), "{fit:?}");
}

/// A file of the demo data, as a measurement of equal errors.
fn demo(file: &str) -> Measurement {
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/demo-data/train/");
    let read = |name: &str| std::fs::read_to_string(format!("{folder}{name}")).unwrap();
    let index: serde_json::Value = serde_json::from_str(&read("index.json")).unwrap();
    let entry = index
        .as_array()
        .unwrap()
        .iter()
        .find(|entry| entry["file"] == file)
        .unwrap();
    let sigma = entry["noise"]["sigma"].as_f64().unwrap();
    let parsed = parse_matrices(&read(file), &ReadOptions::default()).unwrap();
    let matrix = Mueller::from_row_major(&parsed.matrices[0].mueller).unwrap();
    Measurement::new(matrix, false, true, Noise::Uniform { sigma }).unwrap()
}

fn film_between(before: Option<Measurement>, after: Option<Measurement>) -> Train {
    let mut elements: Vec<Element> = before.into_iter().map(Element::measured).collect();
    elements.push(element(
        Kind::AlignedDiattenuatingRetarder,
        &[free(0.8), free(0.1), free(1.0), free(0.5)],
    ));
    elements.push(element(Kind::IsotropicDepolarizer, &[free(0.1)]));
    elements.extend(after.map(Element::measured));
    Train::new(elements).unwrap()
}

/// The invented film of `tests/reference/train.py`: truth and bias are NumPy's and SciPy's.
#[test]
fn the_film_behind_the_window_comes_back_and_is_biased_without_it() {
    let expected: serde_json::Value =
        serde_json::from_str(include_str!("reference/train.json")).unwrap();
    let list = |name: &str| -> Vec<f64> {
        let values = expected[name].as_array().unwrap().iter().enumerate();
        values
            .map(|(k, value)| {
                let value = value.as_f64().unwrap();
                if (2..4).contains(&k) {
                    value.to_radians()
                } else {
                    value
                }
            })
            .collect()
    };
    let (truth, bias) = (list("truth"), list("bias"));
    let (whole, window, mirror) = (
        demo("film-with-window-and-mirror.txt"),
        demo("window-alone.txt"),
        demo("mirror-alone.txt"),
    );
    let sides = |before: Option<Measurement>| {
        let train = |one: Option<Measurement>| {
            Train::new(one.into_iter().map(Element::measured).collect()).unwrap()
        };
        let (pre, post) = (train(before), train(Some(mirror.clone())));
        let removed = remove_optics(&Removal {
            measured: &whole,
            pre: &pre,
            post: &post,
            reflection: false,
        });
        removed.unwrap().measurement.unwrap()
    };
    let after_removal = fit_train(
        &sides(Some(window.clone())),
        &film_between(None, None),
        OPTIONS,
    )
    .unwrap();
    let through = film_between(Some(window.clone()), Some(mirror.clone()));
    let at_once = fit_train(&whole, &through, OPTIONS).unwrap();
    for fit in [&after_removal, &at_once] {
        assert!(fit.p_value.unwrap() > 0.05, "{:?}", fit.p_value);
        for (parameter, truth) in fit.parameters.iter().zip(&truth) {
            close(parameter.value, *truth, 2.0 * parameter.se.unwrap());
        }
    }
    // Two ways to one answer: the noise of window and mirror counts in both.
    for (one, other) in after_removal.parameters.iter().zip(&at_once.parameters) {
        close(one.value, other.value, 0.1 * one.se.unwrap());
        close(one.se.unwrap() / other.se.unwrap(), 1.0, 0.02);
    }
    // Without the window the fit looks as good, and is wrong by what was computed: the
    // transmittance and α by dozens of standard errors.
    let without = fit_train(&sides(None), &film_between(None, None), OPTIONS).unwrap();
    for ((parameter, truth), bias) in without.parameters.iter().zip(&truth).zip(&bias) {
        close(parameter.value - truth, *bias, 3.0 * parameter.se.unwrap());
    }
    for k in [0, 4] {
        let parameter = without.parameters[k];
        assert!((parameter.value - truth[k]).abs() > 24.0 * parameter.se.unwrap());
    }
}

/// The noise of a measured element counts in a fit: the scatter of α over draws of it
/// agrees with the standard error (300 draws know it to 4 %).
#[test]
fn noise_of_measured_elements_counts() {
    let window = elements::isotropic_depolarizer(0.1).unwrap();
    let haze = elements::isotropic_depolarizer(0.2).unwrap();
    for exact in [false, true] {
        let mut draws = NormalDraws::new(30);
        let (mut squares, mut errors) = (0.0, 0.0);
        for _ in 0..300 {
            let mut one = |matrix: Mueller, sigma: f64, exact: bool| {
                let errors = draws.draw_matrix();
                let elements = matrix.row_major();
                let drawn = std::array::from_fn(|k| {
                    elements[k]
                        + if k == 0 && exact {
                            0.0
                        } else {
                            sigma * errors[k]
                        }
                });
                measurement(
                    Mueller::from_row_major(&drawn).unwrap(),
                    exact,
                    Noise::Uniform { sigma },
                )
            };
            let measured = one(haze * window, 0.001, exact);
            let before = one(window, 0.003, false);
            let train = Train::new(vec![
                Element::measured(before),
                element(Kind::IsotropicDepolarizer, &[free(0.15)]),
            ])
            .unwrap();
            let options = FitOptions {
                seed: 1,
                starts: Some(2),
            };
            let fit = fit_train(&measured, &train, options).unwrap();
            squares += (fit.parameters[0].value - 0.2).powi(2) / 300.0;
            errors += fit.parameters[0].se.unwrap() / 300.0;
        }
        close(squares.sqrt() / errors, 1.0, 0.16);
    }
}

/// The same bench drawn 200 times: each parameter is off by its standard error on average
/// (root mean square, known to 5 %), after removal and in one fit.
#[test]
fn the_film_is_off_by_its_standard_errors() {
    let window = Mueller::from_row_major(
        &(elements::isotropic_depolarizer(0.08).unwrap()
            * elements::linear_retarder(5_f64.to_radians(), 75_f64.to_radians()).unwrap())
        .row_major()
        .map(|part| 0.91 * part),
    )
    .unwrap();
    let mirror =
        elements::isotropic_reflector(43.2_f64.to_radians(), 171_f64.to_radians(), 0.87, 0.0)
            .unwrap();
    let truth = [0.83, 0.06, 64_f64.to_radians(), 31_f64.to_radians(), 0.05];
    let film = elements::isotropic_depolarizer(truth[4]).unwrap()
        * elements::aligned_diattenuating_retarder(truth[0], truth[1], truth[2], truth[3]).unwrap();
    let mut draws = NormalDraws::new(40);
    let mut squares = [[0.0; 5]; 2];
    let options = FitOptions {
        seed: 1,
        starts: Some(2),
    };
    for _ in 0..200 {
        let whole = noisy(&(mirror * film * window), 0.0015, &mut draws);
        let before = noisy(&window, 0.0008, &mut draws);
        let after = noisy(&mirror, 0.0008, &mut draws);
        let side = |one: &Measurement| Train::of_one(Element::measured(one.clone()));
        let removed = remove_optics(&Removal {
            measured: &whole,
            pre: &side(&before),
            post: &side(&after),
            reflection: false,
        })
        .unwrap();
        let alone = removed.measurement.unwrap();
        let fits = [
            fit_train(&alone, &film_between(None, None), options).unwrap(),
            fit_train(&whole, &film_between(Some(before), Some(after)), options).unwrap(),
        ];
        for (squares, fit) in squares.iter_mut().zip(&fits) {
            for k in 0..5 {
                let one = fit.parameters[k];
                squares[k] += ((one.value - truth[k]) / one.se.unwrap()).powi(2) / 200.0;
            }
        }
    }
    for square in squares.into_iter().flatten() {
        close(square.sqrt(), 1.0, 0.2);
    }
}
