//! Fits of the candidate models: truths given back, closed forms, fits by SciPy, hard cases.

mod common;

use common::candidates::{depolarized, difference, find, models_and_sides, noisy, scale, truth};
use common::{any_matrix, diagonal, measurement, mueller};
use halfshade::coherency::Coherency;
use halfshade::decompose::isotropic;
use halfshade::fit::{Fit, Fitter, Model, Name, Rule, Side, Stop, recommend, remarks};
use halfshade::mueller::{Jones, Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::NormalDraws;
use num_complex::Complex64;
use proptest::prelude::*;
use serde_json::Value;

fn fitted(measurement: &Measurement, model: Model, side: Side) -> Fit {
    Fitter::new(measurement, 1)
        .unwrap()
        .fit(model, side)
        .unwrap()
}

fn all_fits(measurement: &Measurement) -> Vec<Fit> {
    let fitter = Fitter::new(measurement, 1).unwrap();
    Model::ALL
        .map(|model| fitter.fit(model, Side::Parallel).unwrap())
        .to_vec()
}

/// No number of a fit is NaN or infinite, and nothing is claimed that nothing determines.
#[track_caller]
fn is_sound(fit: &Fit) {
    let mut numbers = vec![fit.rms, fit.gradient_cosine];
    numbers.extend(fit.mueller.row_major());
    numbers.extend(fit.residuals);
    numbers.extend(fit.covariance.iter());
    numbers.extend(fit.null_directions.iter().flatten());
    numbers.extend(
        [fit.chi_square, fit.p_value, fit.aic, fit.bic]
            .iter()
            .flatten(),
    );
    for parameter in fit.parameters.iter().chain(&fit.derived) {
        numbers.push(parameter.value);
        numbers.extend(parameter.se);
        numbers.extend(
            parameter
                .interval
                .iter()
                .flat_map(|(low, high)| [low, high]),
        );
        assert!(
            parameter.se.is_some() || parameter.interval.is_none(),
            "{parameter:?}"
        );
    }
    assert!(numbers.iter().all(|v| v.is_finite()), "{fit:#?}");
    assert!(fit.p_value.is_none_or(|p| (0.0..=1.0).contains(&p)));
}

fn recover(count: usize) {
    for (model, side) in models_and_sides() {
        let mut draws = NormalDraws::new(11);
        for trial in 0..count {
            let (exact, names) = truth(model, side, &mut draws);
            let measurement = noisy(&exact, 1e-6, &mut draws);
            let fit = fitted(&measurement, model, side);
            let distance = fit.mueller.distance(&exact);
            assert!(
                distance < 1e-5,
                "{model:?} {side:?} {trial}: {distance}, χ² {:?} {:?}\n{exact:?}",
                fit.chi_square,
                fit.stop
            );
            assert_eq!(fit.stop, Stop::Minimum, "{model:?} {side:?} {trial}");
            for (name, expected) in names {
                let parameter = find(&fit, name);
                let off = difference(name, parameter.value, expected).abs();
                let se = parameter.se.unwrap();
                assert!(
                    off < 5.0 * se,
                    "{model:?} {side:?} {trial} {name:?}: {} ± {se}, truth {expected}",
                    parameter.value
                );
            }
        }
    }
}

/// *Derived*: 200 truths with four parameters each, of eighteen kinds, leave a chance of one
/// in a hundred for a single parameter beyond five standard errors.
#[test]
fn small_noise_gives_the_truth_back() {
    recover(12);
}

#[test]
#[ignore = "a minute; small_noise_gives_the_truth_back is the same with fewer truths"]
fn small_noise_gives_the_truth_back_in_full() {
    recover(200);
}

/// *Recomputed* by SciPy (`tests/reference/fitting.py`).
#[test]
fn sixty_fits_by_scipy() {
    let file: Value = serde_json::from_str(include_str!("reference/fitting.json")).unwrap();
    let cases = file["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 60);
    let mut compared = 0;
    for (number, case) in cases.iter().enumerate() {
        let array = |value: &Value| -> Vec<f64> {
            let values = value.as_array().unwrap();
            values.iter().map(|v| v.as_f64().unwrap()).collect()
        };
        let model = model_of(case["model"].as_str().unwrap());
        let side = match case["side"].as_str() {
            Some("after") => Side::After,
            Some("before") => Side::Before,
            _ => Side::Parallel,
        };
        let noise = match case["noise"]["kind"].as_str().unwrap() {
            "uniform" => Noise::Uniform {
                sigma: case["noise"]["sigma"].as_f64().unwrap(),
            },
            "perElement" => Noise::PerElement {
                sigma: array(&case["noise"]["sigma"]).try_into().unwrap(),
            },
            _ => Noise::Covariance {
                covariance: Box::new(array(&case["noise"]["covariance"]).try_into().unwrap()),
            },
        };
        let elements: [f64; 16] = array(&case["mueller"]).try_into().unwrap();
        let is_normalised = case["normalised"].as_bool().unwrap();
        let measured = measurement(
            Mueller::from_row_major(&elements).unwrap(),
            is_normalised,
            noise,
        );
        let fit = fitted(&measured, model, side);
        let label = format!("{number}: {model:?} {side:?} {:?}", case["noise"]["kind"]);
        let expected = case["chiSquare"].as_f64().unwrap();
        let chi_square = fit.chi_square.unwrap();
        assert!(
            (chi_square - expected).abs() < 1e-8 * expected,
            "{label}: χ² {chi_square}, not {expected}"
        );
        assert_eq!(
            u64::from(fit.degrees_of_freedom),
            case["degreesOfFreedom"].as_u64().unwrap(),
            "{label}"
        );
        let (matrix, errors) = (array(&case["fitted"]), array(&case["fittedErrors"]));
        for (k, found) in fit.mueller.row_major().into_iter().enumerate() {
            let tolerance = 1e-3 * errors[k] + 1e-9;
            assert!(
                (found - matrix[k]).abs() < tolerance,
                "{label}: element {k}"
            );
        }
        for (key, value) in case["parameters"].as_object().unwrap() {
            let name = name_of(key);
            let expected = value.as_f64().unwrap();
            let error = case["standardErrors"][key].as_f64().unwrap();
            let found = find(&fit, name);
            // M00 that is exact weighs a million times as much as the rest.
            if is_normalised && name == Name::Transmittance {
                continue;
            }
            let off = difference(name, found.value, expected).abs();
            assert!(
                off < 1e-3 * error,
                "{label} {key}: {} and not {expected} ± {error}",
                found.value
            );
            let se = found.se.unwrap();
            assert!(
                (se - error).abs() < 0.01 * error,
                "{label} {key}: se {se} and not {error}"
            );
            compared += 1;
        }
    }
    assert!(compared > 150, "{compared}");
}

fn model_of(name: &str) -> Model {
    match name {
        "linearRetarder" => Model::LinearRetarder,
        "linearDiattenuator" => Model::LinearDiattenuator,
        "alignedDiattenuatingRetarder" => Model::AlignedDiattenuatingRetarder,
        "ellipticalRetarder" => Model::EllipticalRetarder,
        "ellipticalDiattenuator" => Model::EllipticalDiattenuator,
        "pure" => Model::Pure,
        "pureIsotropic" => Model::PureIsotropic,
        "pureLinearCircular" => Model::PureLinearCircular,
        "pureDiagonal" => Model::PureDiagonal,
        other => panic!("{other}"),
    }
}

fn name_of(key: &str) -> Name {
    let component = || key[key.len() - 1..].parse().unwrap();
    match key {
        "transmittance" | "m00" => Name::Transmittance,
        "diattenuation" => Name::Diattenuation,
        "axis" => Name::Axis,
        "retardance" => Name::Retardance,
        "alpha" => Name::Alpha,
        "depolarizationLinear" => Name::DepolarizationLinear,
        "depolarizationCircular" => Name::DepolarizationCircular,
        _ if key.starts_with("retarderVector") => Name::RetarderVector(component()),
        _ if key.starts_with("diattenuationVector") => Name::DiattenuationVector(component()),
        _ if key.starts_with("depolarization") => Name::Depolarization(component()),
        _ => panic!("{key}"),
    }
}

/// The sum of the Mueller matrices of `sqrt(2λ) h` (Cloude 1986).
fn mixture(values: &[f64; 4], vectors: &[[Complex64; 4]; 4]) -> Mueller {
    let mut sum = [0.0; 16];
    for (value, vector) in values.iter().zip(vectors) {
        let [a, b, c, d] = vector.map(|entry| entry * (2.0 * value).sqrt());
        let jones = Jones::from_rows([[a, b], [c, d]]).unwrap();
        for (total, part) in sum.iter_mut().zip(jones.mueller().row_major()) {
            *total += part;
        }
    }
    Mueller::from_row_major(&sum).unwrap()
}

/// What equal errors give in closed form: the eigenvalues of H that stay (*derived*: M ↔ H is
/// an isometry up to a factor).
fn closed_forms(measured: &Mueller, is_exact: bool) {
    let sigma = 0.01;
    let measured = measurement(*measured, is_exact, Noise::Uniform { sigma });
    let eigen = Coherency::from_mueller(measured.mueller()).eigen().unwrap();
    let m00 = measured.mueller().m00();
    let [first, _, _, last] = eigen.values;
    let scale = measured
        .mueller()
        .row_major()
        .map(f64::abs)
        .iter()
        .sum::<f64>();
    let same = |found: &Mueller, expected: &Mueller, what: &str| {
        for (a, b) in found.row_major().iter().zip(expected.row_major()) {
            assert!(
                (a - b).abs() < 1e-9 * scale,
                "{what} {is_exact}: {found:?}\nis not\n{expected:?}"
            );
        }
    };
    // Where both ends of the spectrum are equally far, both are best.
    if ((first - m00 / 4.0) - (m00 / 4.0 - last)).abs() > 1e-3 * scale {
        let closed = isotropic(&measured, &eigen).unwrap();
        let fit = fitted(&measured, Model::PureIsotropic, Side::Parallel);
        same(&fit.mueller, &closed.mueller, "pureIsotropic");
        let alpha = find(&fit, Name::Alpha).value;
        assert!(
            (alpha - closed.alpha).abs() < 1e-9 * scale / m00,
            "{alpha} and not {}",
            closed.alpha
        );
        let (found, expected) = (fit.chi_square.unwrap(), closed.chi_square.unwrap());
        assert!((found - expected).abs() < 1e-9 * expected.max(1.0));
    }
    if is_exact {
        return;
    }
    for (rank, model) in [(1, Model::Pure), (2, Model::RankTwo), (3, Model::RankThree)] {
        let gap = eigen.values[rank - 1].max(0.0) - eigen.values[rank].max(0.0);
        if gap < 1e-2 * scale / 16.0 || first <= 0.0 {
            continue;
        }
        let kept = std::array::from_fn(|k| {
            if k < rank {
                eigen.values[k].max(0.0)
            } else {
                0.0
            }
        });
        let expected = mixture(&kept, &eigen.vectors.map(Into::into));
        let fit = fitted(&measured, model, Side::Parallel);
        let left: f64 = (0..4).map(|k| (eigen.values[k] - kept[k]).powi(2)).sum();
        let (found, least) = (fit.chi_square.unwrap(), 4.0 * left / (sigma * sigma));
        assert!(
            (found - least).abs() < 1e-9 * least.max(1.0),
            "{model:?}: χ² {found} and not {least}"
        );
        // An eigenvalue that is clipped is approached by a square root: half the digits.
        if eigen.values[rank - 1] > 1e-3 * scale {
            same(&fit.mueller, &expected, "mixture");
        }
    }
}

/// Past the ideal depolarizer the smallest eigenvector wins; a gain of M00 that is too low
/// leaves α below zero.
#[test]
fn equal_errors_give_the_closed_form() {
    let mut draws = NormalDraws::new(3);
    let (mut below_zero, mut above_one) = (0, 0);
    for trial in 0..200 {
        let (pure, _) = truth(Model::Pure, Side::Parallel, &mut draws);
        let alpha = [-0.05, 0.0, 0.3, 0.9, 1.1, 1.25][trial % 6];
        let exact = depolarized(&scale(&pure, 1.0), alpha, Side::Parallel);
        let measured = noisy(&exact, 0.004, &mut draws);
        let found = fitted(&measured, Model::PureIsotropic, Side::Parallel);
        let found = find(&found, Name::Alpha).value;
        below_zero += u32::from(found < 0.0);
        above_one += u32::from(found > 1.0);
        closed_forms(measured.mueller(), false);
        closed_forms(measured.mueller(), true);
    }
    assert!(
        below_zero > 20 && above_one > 40,
        "{below_zero} {above_one}"
    );
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 40, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn any_matrix_gets_the_closed_form(matrix in any_matrix(), is_exact: bool) {
        prop_assume!(matrix.m00() > 0.2);
        closed_forms(&matrix, is_exact);
    }

    /// Whatever is measured: finite numbers, and no model with more freedom fits worse
    /// (*derived*: each of these contains the one before).
    #[test]
    fn any_matrix_gets_sound_fits(matrix in any_matrix(), kind in 0..4_usize) {
        prop_assume!(matrix.m00() > 0.05);
        let noise = match kind {
            0 => Noise::None,
            1 => Noise::Uniform { sigma: 0.01 },
            2 => Noise::Rounding { decimals: 2 },
            _ => Noise::PerElement {
                sigma: std::array::from_fn(|k| 0.002 * (1.0 + k as f64)),
            },
        };
        let fits = all_fits(&measurement(matrix, kind == 2, noise));
        for fit in &fits {
            is_sound(fit);
            prop_assert!(fit.chi_square.is_some() == (kind > 0));
            prop_assert!(fit.p_value.is_none() || kind > 0);
        }
        let misfit = |model: Model| {
            let fit = fits.iter().find(|fit| fit.model == model).unwrap();
            fit.chi_square.unwrap_or(fit.rms * fit.rms)
        };
        for (small, large) in [
            (Model::LinearRetarder, Model::AlignedDiattenuatingRetarder),
            (Model::LinearDiattenuator, Model::AlignedDiattenuatingRetarder),
            (Model::LinearRetarder, Model::EllipticalRetarder),
            (Model::LinearDiattenuator, Model::EllipticalDiattenuator),
            (Model::EllipticalRetarder, Model::PureIsotropic),
            (Model::EllipticalDiattenuator, Model::PureIsotropic),
            (Model::Pure, Model::PureIsotropic),
            (Model::Pure, Model::RankTwo),
            (Model::PureLinearCircular, Model::PureDiagonal),
            (Model::RankTwo, Model::RankThree),
            (Model::RankThree, Model::RankFour),
        ] {
            let (small_misfit, large_misfit) = (misfit(small), misfit(large));
            prop_assert!(
                large_misfit <= small_misfit * (1.0 + 1e-6) + 1e-12,
                "{:?} {} and {:?} {}", small, small_misfit, large, large_misfit
            );
        }
        if let Some(found) = recommend(&fits).unwrap() {
            prop_assert!(!found.sentence.is_empty());
            prop_assert!(kind > 0 || found.rule == Rule::Criterion);
        }
    }
}

/// Nothing is left to see of an element behind an ideal depolarizer.
#[test]
fn a_parameter_without_effect() {
    let measured = measurement(
        diagonal([1.0, 0.0, 0.0, 0.0]),
        false,
        Noise::Uniform { sigma: 0.004 },
    );
    for model in Model::ALL {
        let fit = fitted(&measured, model, Side::Parallel);
        is_sound(&fit);
        let alpha = fit.parameters.iter().find(|p| p.name == Name::Alpha);
        if let Some(alpha) = alpha {
            assert!((alpha.value - 1.0).abs() < 1e-6, "{model:?} {alpha:?}");
        }
        for name in [Name::Retardance, Name::Axis, Name::RetarderVector(0)] {
            for parameter in fit.parameters.iter().filter(|p| p.name == name) {
                assert_eq!(parameter.se, None, "{model:?} {parameter:?}");
            }
        }
    }
    let retarder = fitted(&measured, Model::LinearRetarder, Side::Parallel);
    assert_eq!(retarder.null_directions.len(), 2, "{retarder:#?}");
    // Two of four parameters do nothing: what they leave is no misfit.
    assert_eq!(retarder.degrees_of_freedom, 14);
}

/// Air: a retarder of zero has no axis, a diattenuator of zero neither.
#[test]
fn elements_that_do_nothing_have_no_axis() {
    let mut draws = NormalDraws::new(8);
    for exact in [true, false] {
        let air = diagonal([1.0; 4]);
        let measured = if exact {
            measurement(air, false, Noise::Uniform { sigma: 0.003 })
        } else {
            noisy(&air, 0.003, &mut draws)
        };
        for model in [Model::LinearRetarder, Model::LinearDiattenuator] {
            let fit = fitted(&measured, model, Side::Parallel);
            is_sound(&fit);
            let axis = find(&fit, Name::Axis);
            if exact {
                assert_eq!(axis.se, None, "{fit:#?}");
            }
            let size = match model {
                Model::LinearRetarder => find(&fit, Name::Retardance),
                _ => find(&fit, Name::Diattenuation),
            };
            assert!((0.0..0.02).contains(&size.value), "{size:?}");
        }
        let fits = all_fits(&measured);
        let found = recommend(&fits).unwrap().unwrap();
        assert_eq!(fits[found.index].model.parameter_count(), 4);
    }
}

/// A half-wave plate lies at the end of [0, π]; the retardance never leaves it.
#[test]
fn a_half_wave_plate() {
    let mut draws = NormalDraws::new(9);
    for retardance in [std::f64::consts::PI, 3.13, 0.0, 0.01] {
        for _ in 0..20 {
            let exact = elements::linear_retarder(retardance, 0.4).unwrap();
            let measured = noisy(&exact, 0.004, &mut draws);
            let fit = fitted(&measured, Model::LinearRetarder, Side::Parallel);
            is_sound(&fit);
            let found = find(&fit, Name::Retardance);
            assert!((0.0..=std::f64::consts::PI).contains(&found.value));
            assert!((found.value - retardance).abs() < 0.03, "{found:?}");
            assert!(fit.p_value.unwrap() > 1e-5);
            let vector = fitted(&measured, Model::EllipticalRetarder, Side::Parallel);
            is_sound(&vector);
            let length = (0..3)
                .map(|k| find(&vector, Name::RetarderVector(k)).value.powi(2))
                .sum::<f64>()
                .sqrt();
            assert!(length <= std::f64::consts::PI + 1e-9);
            assert!((length - retardance).abs() < 0.03, "{length}");
        }
    }
}

/// A polarizer measures D > 1 half of the time: then D is held at one and has no error; what
/// is behind it no one knows.
#[test]
fn a_polarizer() {
    let mut draws = NormalDraws::new(10);
    let exact = scale(&elements::linear_diattenuator(1.0, 0.0, 0.3).unwrap(), 0.5);
    let (mut held, mut count) = (0, 0);
    for _ in 0..40 {
        let measured = noisy(&exact, 0.003, &mut draws);
        let fit = fitted(&measured, Model::LinearDiattenuator, Side::Parallel);
        is_sound(&fit);
        let d = find(&fit, Name::Diattenuation);
        assert!(d.value <= 1.0 && d.value > 0.99, "{d:?}");
        assert_eq!(d.at_bound, d.value == 1.0);
        assert!(!d.at_bound || d.se.is_none());
        held += u32::from(d.at_bound);
        count += 1;
        let vector = fitted(&measured, Model::EllipticalDiattenuator, Side::Parallel);
        is_sound(&vector);
        let length = (0..3)
            .map(|k| find(&vector, Name::DiattenuationVector(k)).value.powi(2))
            .sum::<f64>()
            .sqrt();
        assert!(length < 1.0 + 1e-9 && length > 0.99);
        for model in Model::ALL {
            is_sound(&fitted(&measured, model, Side::After));
        }
    }
    assert!(
        held > count / 5 && held < count * 4 / 5,
        "{held} of {count}"
    );
    // The factors of a depolarizer behind a polarizer: only one combination of three acts.
    let clean = measurement(exact, false, Noise::Uniform { sigma: 0.003 });
    let fit = fitted(&clean, Model::PureDiagonal, Side::After);
    is_sound(&fit);
    assert!(!fit.null_directions.is_empty());
    assert!(
        fit.parameters
            .iter()
            .any(|p| matches!(p.name, Name::Depolarization(_)) && p.se.is_none()),
        "{fit:#?}"
    );
}

/// α at both ends, and outside: never held, and said in words outside.
#[test]
fn alpha_is_not_limited() {
    let mut draws = NormalDraws::new(12);
    let pure = elements::elliptical_retarder(1.2, 0.3, 0.2).unwrap();
    for alpha in [-0.05, 0.0, 1.0, 1.2] {
        let exact = depolarized(&pure, alpha, Side::Parallel);
        for _ in 0..10 {
            let measured = noisy(&exact, 0.003, &mut draws);
            let fit = fitted(&measured, Model::PureIsotropic, Side::Parallel);
            is_sound(&fit);
            let found = find(&fit, Name::Alpha);
            assert!(!found.at_bound);
            let se = found.se.unwrap();
            // *Derived*: α = (4/3)(1 − r), r = λ/M00, with var λ = cov(λ, M00) = σ²/4 and
            // var M00 = σ²; for r = 1 that is 2σ/√3. Near α = 1 eigenvalues repel each other.
            if alpha != 1.0 {
                let r = 1.0 - 0.75 * alpha;
                let expected = 4.0 / 3.0 * 0.003 * (r * r - r / 2.0 + 0.25_f64).sqrt();
                assert!((se - expected).abs() < 0.03 * se, "{se} {expected}");
                assert!((found.value - alpha).abs() < 5.0 * se);
            }
            let words = remarks(&fit).join(" ");
            if alpha < 0.0 {
                assert!(words.contains("background"), "{words}");
            }
            if alpha > 1.0 {
                assert!(words.contains("above 1"), "{words}");
            }
            assert!(words.contains("stray light"), "{words}");
        }
    }
}

/// With M00 exact the error of α is σ/√3 (*derived*: that of an eigenvalue is σ√3/4).
#[test]
fn alpha_with_an_exact_m00() {
    let pure = elements::elliptical_retarder(1.2, 0.3, 0.2).unwrap();
    for alpha in [0.1, 0.6] {
        let mut elements = noisy(
            &depolarized(&pure, alpha, Side::Parallel),
            0.003,
            &mut NormalDraws::new(18),
        )
        .mueller()
        .row_major();
        elements[0] = 1.0;
        let measured = measurement(
            Mueller::from_row_major(&elements).unwrap(),
            true,
            Noise::Uniform { sigma: 0.003 },
        );
        let found = find(
            &fitted(&measured, Model::PureIsotropic, Side::Parallel),
            Name::Alpha,
        );
        let (se, expected) = (found.se.unwrap(), 0.003 / 3_f64.sqrt());
        assert!((se / expected - 1.0).abs() < 0.02, "{se} {expected}");
        assert!((found.value - alpha).abs() < 5.0 * expected);
    }
}

/// Exact elements besides M00 leave their model alone and their fit to the others: SciPy has
/// no such case, so two noise statements of the same meaning are compared.
#[test]
fn exact_rows_of_a_covariance() {
    let mut draws = NormalDraws::new(19);
    let exact = depolarized(
        &elements::linear_retarder(1.0, 0.4).unwrap(),
        0.2,
        Side::Parallel,
    );
    let mut elements = noisy(&exact, 0.004, &mut draws).mueller().row_major();
    let mut sigma = [0.004_f64; 16];
    // A retarder has neither diattenuation nor polarizance.
    for k in [0, 1, 2, 3, 4, 8, 12] {
        elements[k] = exact.row_major()[k];
        sigma[k] = 0.0;
    }
    let covariance: [f64; 256] = std::array::from_fn(|k| {
        if k % 17 == 0 {
            sigma[k / 17].powi(2)
        } else {
            0.0
        }
    });
    let m = Mueller::from_row_major(&elements).unwrap();
    let listed = measurement(m, false, Noise::PerElement { sigma });
    let full = measurement(
        m,
        false,
        Noise::Covariance {
            covariance: Box::new(covariance),
        },
    );
    for model in [
        Model::LinearRetarder,
        Model::EllipticalRetarder,
        Model::Pure,
        Model::PureIsotropic,
    ] {
        let (a, b) = (
            fitted(&listed, model, Side::Parallel),
            fitted(&full, model, Side::Parallel),
        );
        is_sound(&a);
        is_sound(&b);
        let (x, y) = (a.chi_square.unwrap(), b.chi_square.unwrap());
        assert!((x - y).abs() < 1e-6 * x.max(1.0), "{model:?}: {x} {y}");
        for k in [0, 1, 2, 3, 4, 8, 12] {
            let off = (a.mueller.row_major()[k] - elements[k]).abs();
            assert!(off < 1e-7, "{model:?} {k}: {off}");
        }
    }
    // χ² of three parameters on nine elements (M00 exact, so no transmittance).
    let fit = fitted(&listed, Model::LinearRetarder, Side::Parallel);
    let p = fit.p_value.unwrap();
    assert!(p > 1e-4 && fit.degrees_of_freedom < 16, "{p}");
}

/// One side counted the other way round. *Derived*: of a retarder all polarization is turned
/// over, and together with α = 2 that is a retarder again, which no sample can be.
#[test]
fn a_mirrored_retarder() {
    let mirror = diagonal([1.0, 1.0, 1.0, -1.0]);
    let exact = mirror * elements::linear_retarder(1.0, 0.4).unwrap();
    let measured = noisy(&exact, 0.004, &mut NormalDraws::new(14));
    let fits = all_fits(&measured);
    let found = recommend(&fits).unwrap().unwrap();
    let alpha = find(&fits[found.index], Name::Alpha);
    assert!((alpha.value - 2.0).abs() < 0.02, "{alpha:?}");
    assert!(remarks(&fits[found.index]).join(" ").contains("beyond 4/3"));
    assert!(found.sentence.contains("beyond 4/3"), "{}", found.sentence);
    let whole = fits.last().unwrap();
    assert!(whole.p_value.unwrap() < 0.01);
}

/// With a diattenuation no α makes up for it, and no pure element explains it.
#[test]
fn a_mirrored_diattenuating_retarder_is_explained_by_nothing() {
    let mirror = diagonal([1.0, 1.0, 1.0, -1.0]);
    let exact = mirror
        * elements::linear_diattenuator(1.0, 0.5, 0.9).unwrap()
        * elements::linear_retarder(1.0, 0.4).unwrap();
    let measured = noisy(&exact, 0.004, &mut NormalDraws::new(13));
    let fits = all_fits(&measured);
    // A negative factor of a diagonal depolarizer is a mirror of its own.
    let fits: Vec<Fit> = fits
        .into_iter()
        .filter(|fit| !matches!(fit.model, Model::PureDiagonal | Model::PureLinearCircular))
        .collect();
    for fit in &fits {
        is_sound(fit);
        let p = fit.p_value.unwrap();
        let limit = match fit.simulations {
            0 => 1e-6,
            count => 1.01 / f64::from(1 + count),
        };
        assert!(p < limit, "{:?}: p = {p}", fit.model);
    }
    let found = recommend(&fits).unwrap().unwrap();
    assert_eq!(found.rule, Rule::Criterion);
    assert!(
        found.sentence.starts_with("None of these models"),
        "{}",
        found.sentence
    );
}

/// Without a noise statement nothing is tested, and the criterion decides.
#[test]
fn unknown_noise() {
    let mut draws = NormalDraws::new(14);
    let exact = depolarized(
        &elements::linear_retarder(1.0, 0.4).unwrap(),
        0.2,
        Side::Parallel,
    );
    let with = noisy(&exact, 0.004, &mut draws);
    let without = measurement(*with.mueller(), false, Noise::None);
    let (known, unknown) = (all_fits(&with), all_fits(&without));
    for (known, unknown) in known.iter().zip(&unknown) {
        is_sound(unknown);
        assert_eq!((unknown.chi_square, unknown.p_value), (None, None));
        // *Derived*: the formulas with RSS = σ² χ² over sixteen elements.
        let rss = 0.004_f64.powi(2) * known.chi_square.unwrap();
        let k = known.model.parameter_count() as f64 + 1.0;
        let misfit = 16.0 * (rss / 16.0).ln();
        let relative = |found: f64, expected: f64| (found - expected).abs() < 1e-3;
        let all = unknown.model == Model::RankFour;
        if let Some(aic) = unknown.aic {
            let unit = without.mueller().m00().powi(2);
            let shift = 16.0 * unit.ln();
            let expected = misfit + 2.0 * k + 2.0 * k * (k + 1.0) / (16.0 - k - 1.0);
            assert!(
                all || relative(aic + shift, expected),
                "{:?}: {aic} {expected}",
                known.model
            );
        }
        assert_eq!(
            unknown.aic.is_some(),
            16.0 - k - 1.0 >= 1.0,
            "{:?}",
            known.model
        );
        let chi_square = known.chi_square.unwrap();
        assert!(relative(known.aic.unwrap(), chi_square + 2.0 * (k - 1.0)));
        assert!(relative(
            known.bic.unwrap(),
            chi_square + (k - 1.0) * 16_f64.ln()
        ));
    }
    let found = recommend(&unknown).unwrap().unwrap();
    assert_eq!(found.rule, Rule::Criterion);
    assert_eq!(unknown[found.index].model, Model::LinearRetarder);
    assert!(found.sentence.starts_with("No noise is stated"));
}

#[test]
fn no_light_is_an_error() {
    for m00 in [0.0, -1.0] {
        let measured = measurement(
            diagonal([m00, 0.5, 0.5, 0.5]),
            false,
            Noise::Uniform { sigma: 0.01 },
        );
        assert_eq!(Fitter::new(&measured, 1).err().unwrap().code, "no-m00");
    }
}

/// Elements that are exact stay where they are; freedom is counted without them.
#[test]
fn exact_elements_are_held() {
    let mut draws = NormalDraws::new(15);
    let exact = depolarized(
        &elements::aligned_diattenuating_retarder(0.8, 0.3, 1.0, 0.4).unwrap(),
        0.2,
        Side::Parallel,
    );
    let normalised = scale(&exact, 1.0);
    let mut elements = noisy(&normalised, 0.004, &mut draws).mueller().row_major();
    elements[0] = 1.0;
    let measured = Mueller::from_row_major(&elements).unwrap();
    let mut sigma = [0.004_f64; 16];
    sigma[0] = 0.0;
    let uniform = measurement(measured, true, Noise::Uniform { sigma: 0.004 });
    let listed = measurement(measured, false, Noise::PerElement { sigma });
    for model in Model::ALL {
        let (a, b) = (
            fitted(&uniform, model, Side::Parallel),
            fitted(&listed, model, Side::Parallel),
        );
        is_sound(&a);
        is_sound(&b);
        assert!((a.mueller.m00() - 1.0).abs() < 1e-9, "{model:?}");
        assert_eq!(a.residuals[0], 0.0);
        let (x, y) = (a.chi_square.unwrap(), b.chi_square.unwrap());
        assert!((x - y).abs() < 1e-6 * x.max(1.0), "{model:?}: {x} {y}");
        assert_eq!(a.degrees_of_freedom, b.degrees_of_freedom, "{model:?}");
        if model != Model::RankFour {
            let expected = 16 - model.parameter_count();
            assert_eq!(a.degrees_of_freedom as usize, expected, "{model:?}");
        }
    }
}

/// A sample of few repeats is judged by F: its p is larger than that of χ² (*derived*).
#[test]
fn repeats_are_judged_by_f() {
    let mut draws = NormalDraws::new(16);
    let exact = elements::linear_retarder(1.0, 0.4).unwrap();
    let matrices = (0..3)
        .map(|_| *noisy(&exact, 0.004, &mut draws).mueller())
        .collect();
    let measured = Measurement::of_replicates(matrices, false, false).unwrap();
    let fit = fitted(&measured, Model::LinearRetarder, Side::Parallel);
    is_sound(&fit);
    let f = fit.chi_square.unwrap() / 12.0;
    let expected = halfshade::stats::f_tail(f, 12.0, 32.0).unwrap();
    assert!((fit.p_value.unwrap() - expected).abs() < 1e-9);
    let alpha = find(&fit, Name::Alpha);
    let (low, high) = alpha.interval.unwrap();
    // Student's t with 32 degrees of freedom: 2.0369 (*from memory*, any table).
    assert!(((high - low) / 2.0 / alpha.se.unwrap() - 2.0369).abs() < 1e-3);
    assert!(alpha.value.abs() < 5.0 * alpha.se.unwrap());
}

#[test]
fn an_example_in_words() {
    let mut draws = NormalDraws::new(17);
    let pure = mueller([
        [1.0, 0.3, 0.0, 0.0],
        [0.3, 1.0, 0.0, 0.0],
        [0.0, 0.0, 0.0, 0.91_f64.sqrt()],
        [0.0, 0.0, -(0.91_f64.sqrt()), 0.0],
    ]) * elements::elliptical_retarder(0.9, 0.5, 0.4).unwrap();
    let measured = noisy(
        &depolarized(&pure, 0.132, Side::Parallel),
        0.003,
        &mut draws,
    );
    let fits = all_fits(&measured);
    let found = recommend(&fits).unwrap().unwrap();
    assert_eq!(found.rule, Rule::PValue);
    assert!(
        found
            .sentence
            .starts_with("Eight parameters suffice: a pure element with α = 0.1"),
        "{}",
        found.sentence
    );
    assert!(
        found.sentence.contains(" does not: p < 1e-6"),
        "{}",
        found.sentence
    );
}
