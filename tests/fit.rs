//! Fits of the candidate models. Truths are made from the definitions of the elements; what a
//! fit must give back is *derived* from them, bounds on statistics from their own spread.

use halfshade::fit::{Fit, Fitter, Model, Name, Side};
use halfshade::mueller::{Jones, Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::NormalDraws;
use num_complex::Complex64;

/// A random sample of a model, with its named parameters.
fn truth(model: Model, side: Side, draws: &mut NormalDraws) -> (Mueller, Vec<(Name, f64)>) {
    let mut uniform = |low: f64, high: f64| {
        // The normal distribution's own tails, folded.
        let u = 0.5 * (1.0 + (draws.draw() * 0.8).tanh());
        low + (high - low) * u
    };
    let t = uniform(0.4, 0.9);
    let (d, delta, theta) = (uniform(0.2, 0.8), uniform(0.4, 2.6), uniform(0.1, 3.0));
    let alpha = uniform(0.05, 0.5);
    let scaled = |m: Mueller, t: f64| scale(&m, t);
    let diattenuator =
        |d: f64| elements::linear_diattenuator((1.0 + d) / 1.0, 1.0 - d, theta).unwrap();
    match model {
        Model::LinearRetarder => {
            let m = scaled(elements::linear_retarder(delta, theta).unwrap(), t);
            (
                depolarized(&m, alpha, side),
                vec![
                    (Name::Transmittance, t),
                    (Name::Retardance, delta),
                    (Name::Axis, theta),
                    (Name::Alpha, alpha),
                ],
            )
        }
        Model::LinearDiattenuator => (
            depolarized(&scaled(diattenuator(d), t), alpha, side),
            vec![
                (Name::Transmittance, t),
                (Name::Diattenuation, d),
                (Name::Axis, theta),
                (Name::Alpha, alpha),
            ],
        ),
        Model::AlignedDiattenuatingRetarder => {
            let m = diattenuator(d) * elements::linear_retarder(delta, theta).unwrap();
            (
                depolarized(&scaled(m, t), alpha, side),
                vec![
                    (Name::Transmittance, t),
                    (Name::Diattenuation, d),
                    (Name::Retardance, delta),
                    (Name::Axis, theta),
                    (Name::Alpha, alpha),
                ],
            )
        }
        Model::EllipticalRetarder => {
            let axis = [uniform(-1.0, 1.0), uniform(-1.0, 1.0), uniform(-1.0, 1.0)];
            let length = axis.iter().map(|a| a * a).sum::<f64>().sqrt();
            let axis = axis.map(|a| a / length);
            let m = Jones::retarder(delta, axis).mueller();
            let mut names = vec![(Name::Transmittance, t)];
            names.extend((0..3).map(|k| (Name::RetarderVector(k), delta * axis[k])));
            names.push((Name::Alpha, alpha));
            (depolarized(&scaled(m, t), alpha, side), names)
        }
        Model::EllipticalDiattenuator => {
            let axis = [uniform(-1.0, 1.0), uniform(-1.0, 1.0), uniform(-1.0, 1.0)];
            let length = axis.iter().map(|a| a * a).sum::<f64>().sqrt();
            let vector = axis.map(|a| d * a / length);
            // exp(κ a·σ): a diattenuator with tanh 2κ = D.
            let m = elliptical_diattenuator(vector);
            let mut names = vec![(Name::Transmittance, t)];
            names.extend((0..3).map(|k| (Name::DiattenuationVector(k), vector[k])));
            names.push((Name::Alpha, alpha));
            (depolarized(&scaled(m, t), alpha, side), names)
        }
        _ => {
            let mut pure = || {
                let mut entry = || Complex64::new(uniform(-1.0, 1.0), uniform(-1.0, 1.0)) * 0.7;
                Jones::from_rows([[entry(), entry()], [entry(), entry()]])
                    .unwrap()
                    .mueller()
            };
            let first = pure();
            match model {
                Model::Pure => (first, Vec::new()),
                Model::PureIsotropic => {
                    (depolarized(&first, alpha, side), vec![(Name::Alpha, alpha)])
                }
                Model::PureLinearCircular | Model::PureDiagonal => {
                    let d = if model == Model::PureDiagonal {
                        [1.0 - alpha, 0.9 - alpha, 0.3 + 0.5 * alpha]
                    } else {
                        [1.0 - alpha, 1.0 - alpha, 0.5 - 0.5 * alpha]
                    };
                    let depolarizer = elements::diagonal_depolarizer(d[0], d[1], d[2]).unwrap();
                    let m = if side == Side::Before {
                        first * depolarizer
                    } else {
                        depolarizer * first
                    };
                    let names = if model == Model::PureDiagonal {
                        (0..3).map(|k| (Name::Depolarization(k), d[k])).collect()
                    } else {
                        vec![
                            (Name::DepolarizationLinear, d[0]),
                            (Name::DepolarizationCircular, d[2]),
                        ]
                    };
                    (m, names)
                }
                _ => {
                    let rank = model.rank().unwrap();
                    let mut sum = first.row_major();
                    for _ in 1..rank {
                        for (a, b) in sum.iter_mut().zip(pure().row_major()) {
                            *a += 0.4 * b;
                        }
                    }
                    (Mueller::from_row_major(&sum).unwrap(), Vec::new())
                }
            }
        }
    }
}

fn scale(m: &Mueller, t: f64) -> Mueller {
    Mueller::from_row_major(&m.row_major().map(|v| v * t / m.m00())).unwrap()
}

fn elliptical_diattenuator(d: [f64; 3]) -> Mueller {
    let length = (d[0] * d[0] + d[1] * d[1] + d[2] * d[2]).sqrt();
    let kappa = 0.5 * length.atanh();
    let (s, c) = (kappa.sinh(), kappa.cosh());
    let a = d.map(|v| v / length * s);
    let i = Complex64::i();
    Jones::from_rows([
        [Complex64::from(c + a[0]), a[1] - i * a[2]],
        [a[1] + i * a[2], Complex64::from(c - a[0])],
    ])
    .unwrap()
    .mueller()
}

fn depolarized(m: &Mueller, alpha: f64, side: Side) -> Mueller {
    let depolarizer = elements::isotropic_depolarizer(alpha).unwrap();
    match side {
        Side::After => depolarizer * *m,
        Side::Before => *m * depolarizer,
        Side::Parallel => {
            let mut elements = m.row_major().map(|v| v * (1.0 - alpha));
            elements[0] = m.m00();
            Mueller::from_row_major(&elements).unwrap()
        }
    }
}

fn noisy(m: &Mueller, sigma: f64, draws: &mut NormalDraws) -> Measurement {
    let errors = draws.draw_matrix();
    let elements = m.row_major();
    let moved = std::array::from_fn(|k| elements[k] + sigma * errors[k]);
    Measurement::new(
        Mueller::from_row_major(&moved).unwrap(),
        false,
        false,
        Noise::Uniform { sigma },
    )
    .unwrap()
}

fn find(fit: &Fit, name: Name) -> halfshade::fit::Parameter {
    *fit.parameters
        .iter()
        .chain(&fit.derived)
        .find(|parameter| parameter.name == name)
        .unwrap_or_else(|| panic!("{name:?} of {:?}", fit.model))
}

/// The difference in its own period; for a fast axis near half a wave the two orders are one.
fn difference(name: Name, found: f64, expected: f64) -> f64 {
    let difference = found - expected;
    match name.period() {
        Some(period) => difference - period * (difference / period).round(),
        None => difference,
    }
}

fn recover(count: usize) {
    for model in Model::ALL {
        let sides: &[Side] = match model.side(Side::Parallel) {
            None => &[Side::Parallel],
            Some(Side::Parallel) => &[Side::Parallel, Side::After, Side::Before],
            Some(_) => &[Side::After, Side::Before],
        };
        for &side in sides {
            let mut draws = NormalDraws::new(11);
            for trial in 0..count {
                let (exact, names) = truth(model, side, &mut draws);
                let measurement = noisy(&exact, 1e-6, &mut draws);
                let fit = Fitter::new(&measurement, 1)
                    .unwrap()
                    .fit(model, side)
                    .unwrap();
                let distance = fit.mueller.distance(&exact);
                assert!(
                    distance < 1e-5,
                    "{model:?} {side:?} {trial}: {distance}, χ² {:?} {:?}\n{exact:?}",
                    fit.chi_square,
                    fit.stop
                );
                for (name, expected) in names {
                    let parameter = find(&fit, name);
                    let off = difference(name, parameter.value, expected).abs();
                    let se = parameter.se.unwrap();
                    assert!(
                        off < 5.5 * se,
                        "{model:?} {side:?} {trial} {name:?}: {} ± {se}, truth {expected}",
                        parameter.value
                    );
                }
            }
        }
    }
}

#[test]
fn small_noise_gives_the_truth_back() {
    recover(12);
}

#[test]
#[ignore = "a minute"]
fn small_noise_gives_the_truth_back_in_full() {
    recover(200);
}

/// The largest distance of an empirical distribution from the uniform one, times √n: beyond
/// 1.95 once in a thousand (Kolmogorov 1933, *from memory*).
fn kolmogorov(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len() as f64;
    let off = |(k, &v): (usize, &f64)| ((k as f64 + 1.0) / n - v).max(v - k as f64 / n);
    values.iter().enumerate().map(off).fold(0.0, f64::max) * n.sqrt()
}

/// *Derived*: normalised errors have the standard deviation one, and p is uniform.
fn errors_at_usual_noise(count: usize, slack: f64) {
    for model in &Model::ALL[..9] {
        let side = model.side(Side::Parallel).unwrap_or_default();
        let mut draws = NormalDraws::new(21);
        let (mut squares, mut errors, mut p) = (0.0, 0.0, Vec::new());
        for _ in 0..count {
            let (exact, names) = truth(*model, side, &mut draws);
            // Relative to the transmittance, as a bench has it.
            let measurement = noisy(&exact, 0.005 * exact.m00(), &mut draws);
            let fit = Fitter::new(&measurement, 1)
                .unwrap()
                .fit(*model, side)
                .unwrap();
            for (name, expected) in names {
                let parameter = find(&fit, name);
                // A random Jones matrix may be nearly a polarizer, which no depolarizer shows.
                let Some(se) = parameter.se.filter(|se| *se < 0.05) else {
                    continue;
                };
                errors += 1.0;
                squares += (difference(name, parameter.value, expected) / se).powi(2);
            }
            p.push(fit.p_value.unwrap());
        }
        let deviation = if errors > 0.0 {
            f64::sqrt(squares / errors)
        } else {
            1.0
        };
        let distance = kolmogorov(p);
        println!("{model:?}: {deviation:.3}, p {distance:.2}");
        assert!((deviation - 1.0).abs() < slack, "{model:?}: {deviation}");
        assert!(distance < 1.95, "{model:?}: {distance}");
    }
}

#[test]
fn errors_are_normal_and_p_is_uniform() {
    errors_at_usual_noise(150, 0.2);
}

#[test]
#[ignore = "a minute, with --release"]
fn errors_are_normal_and_p_is_uniform_in_full() {
    errors_at_usual_noise(1000, 0.1);
}

/// Derived: 60 fits from the definitions by another method, `reference/fitting.py` (SciPy).
#[test]
fn the_reference_fits_agree() {
    let text = std::fs::read_to_string("tests/reference/fitting.json").unwrap();
    let all: serde_json::Value = serde_json::from_str(&text).unwrap();
    let numbers = |value: &serde_json::Value| -> Vec<f64> {
        value
            .as_array()
            .unwrap()
            .iter()
            .map(|v| v.as_f64().unwrap())
            .collect()
    };
    let cases = all["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 60);
    for (place, case) in cases.iter().enumerate() {
        let model = Model::ALL
            .into_iter()
            .find(|model| {
                let name = format!("{model:?}");
                case["model"].as_str().unwrap() == name[..1].to_lowercase() + &name[1..]
            })
            .unwrap();
        let side = match case["side"].as_str() {
            Some("after") => Side::After,
            Some("before") => Side::Before,
            _ => Side::Parallel,
        };
        let noise = &case["noise"];
        let noise = match noise["kind"].as_str().unwrap() {
            "uniform" => Noise::Uniform {
                sigma: noise["sigma"].as_f64().unwrap(),
            },
            "perElement" => Noise::PerElement {
                sigma: numbers(&noise["sigma"]).try_into().unwrap(),
            },
            _ => Noise::Covariance {
                covariance: Box::new(numbers(&noise["covariance"]).try_into().unwrap()),
            },
        };
        let mueller: [f64; 16] = numbers(&case["mueller"]).try_into().unwrap();
        let exact = case["normalised"].as_bool().unwrap();
        let mueller = Mueller::from_row_major(&mueller).unwrap();
        let measurement = Measurement::new(mueller, exact, false, noise).unwrap();
        let fit = Fitter::new(&measurement, 1)
            .unwrap()
            .fit(model, side)
            .unwrap();
        let expected = case["chiSquare"].as_f64().unwrap();
        let found = fit.chi_square.unwrap();
        assert!(
            (found / expected - 1.0).abs() < 1e-8,
            "{place} {model:?}: {found}, {expected}"
        );
        assert_eq!(
            u64::from(fit.degrees_of_freedom),
            case["degreesOfFreedom"].as_u64().unwrap()
        );
        let errors = numbers(&case["fittedErrors"]);
        for ((found, expected), error) in fit
            .mueller
            .row_major()
            .iter()
            .zip(numbers(&case["fitted"]))
            .zip(errors)
        {
            assert!(
                (found - expected).abs() < 1e-3 * error + 1e-9,
                "{place} {model:?}"
            );
        }
        for (key, expected) in case["parameters"].as_object().unwrap() {
            let name = match key.as_str() {
                "transmittance" | "m00" => Name::Transmittance,
                "diattenuation" => Name::Diattenuation,
                "retardance" => Name::Retardance,
                "axis" => Name::Axis,
                "alpha" => Name::Alpha,
                "depolarizationLinear" => Name::DepolarizationLinear,
                "depolarizationCircular" => Name::DepolarizationCircular,
                other => {
                    let k = other[other.len() - 1..].parse().unwrap();
                    match &other[..other.len() - 1] {
                        "retarderVector" => Name::RetarderVector(k),
                        "diattenuationVector" => Name::DiattenuationVector(k),
                        _ => Name::Depolarization(k),
                    }
                }
            };
            let parameter = find(&fit, name);
            let (value, se) = (parameter.value, parameter.se.unwrap());
            let error = case["standardErrors"][key].as_f64().unwrap();
            let off = difference(name, value, expected.as_f64().unwrap());
            assert!(
                off.abs() < 1e-3 * error,
                "{place} {model:?} {key}: {off}, {error}"
            );
            assert!(
                (se / error - 1.0).abs() < 0.01,
                "{place} {model:?} {key}: {se}, {error}"
            );
        }
    }
}
