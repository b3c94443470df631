//! The nearest realizable matrix under any covariance.

use halfshade::coherency::{Coherency, nearest, weighted_nearest};
use halfshade::examine::examine;
use halfshade::mueller::Mueller;
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::{Covariance, NormalDraws};

fn noisy(truth: &Mueller, sigma: f64, draws: &mut NormalDraws) -> [f64; 16] {
    let noise = draws.draw_matrix();
    let elements = truth.row_major();
    std::array::from_fn(|k| elements[k] + sigma * noise[k])
}

/// Identity: under equal errors the closed form gives the same, with and without an
/// exact M00.
#[test]
fn equal_errors_give_the_closed_form() {
    let mut draws = NormalDraws::new(3);
    let truth = halfshade::mueller::elements::linear_retarder(1.2, 0.4).unwrap();
    for case in 0..200 {
        let sigma = [0.001, 0.01, 0.05][case % 3];
        let held = case % 2 == 1;
        let mut measured = noisy(&truth, sigma, &mut draws);
        let mut errors = [sigma; 16];
        if held {
            measured[0] = 1.0;
            errors[0] = 0.0;
        }
        let covariance = Covariance::diagonal(&errors).unwrap();
        let mueller = Mueller::from_row_major(&measured).unwrap();
        let closed = nearest(&mueller, held).unwrap().unwrap();
        let found = weighted_nearest(&measured, &covariance).unwrap().unwrap();
        let expected = closed.mueller.row_major();
        for (found, expected) in found.elements.iter().zip(&expected) {
            assert!(
                (found - expected).abs() < 1e-6 * sigma,
                "{case}: {found} {expected}"
            );
        }
        assert!(
            (found.statistic - (closed.distance / sigma).powi(2)).abs()
                < 1e-7 * (1.0 + found.statistic)
        );
        assert!(
            found.complementarity.abs() < 1e-9 && found.gradient_residual < 1e-7,
            "{case}: {found:?}"
        );
        let least = Coherency::from_mueller(&Mueller::from_row_major(&found.elements).unwrap())
            .eigen()
            .unwrap()
            .values[3];
        assert!(least > -1e-12, "{least}");
    }
}

/// Derived: 60 cases from the definition by another method, `reference/weighted.py`
/// (NumPy): covariances of condition 1 to 1e6, of a four-state analyser, exact elements.
#[test]
fn the_reference_cases_agree() {
    let text = include_str!("reference/weighted.json");
    let cases: serde_json::Value = serde_json::from_str(text).unwrap();
    let cases = cases["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 60);
    for case in cases {
        let label = case["label"].as_str().unwrap();
        let numbers = |name: &str| -> Vec<f64> {
            case[name]
                .as_array()
                .unwrap()
                .iter()
                .map(|x| x.as_f64().unwrap())
                .collect()
        };
        let measured: [f64; 16] = numbers("mueller").try_into().unwrap();
        let covariance = Covariance::new(&numbers("covariance").try_into().unwrap()).unwrap();
        let expected = numbers("nearest");
        let statistic = case["statistic"].as_f64().unwrap();
        let mueller = Mueller::from_row_major(&measured).unwrap();
        let noise = Noise::Covariance {
            covariance: Box::new(covariance.row_major()),
        };
        let measurement = Measurement::new(mueller, false, false, noise).unwrap();
        // The squared distance has its digits from the front: far out, fewer of them are left.
        let nearest = examine(&measurement, None).unwrap().nearest.unwrap();
        assert!(
            (nearest.statistic.unwrap() - statistic).abs() <= 1e-7 * (1.0 + statistic),
            "{label}: {:?}, expected {statistic}",
            nearest.statistic
        );
        for (k, (found, expected)) in nearest
            .mueller
            .row_major()
            .iter()
            .zip(&expected)
            .enumerate()
        {
            let allowed = 1e-6 * covariance.sigma(k) * (1.0 + 0.01 * statistic) + 1e-13;
            assert!(
                (found - expected).abs() <= allowed,
                "{label}, {k}: {found}, expected {expected}"
            );
        }
        if statistic > 0.0 {
            let proof = weighted_nearest(&measured, &covariance).unwrap().unwrap();
            assert!(proof.complementarity.abs() <= 1e-8, "{label}: {proof:?}");
            assert!(proof.gradient_residual <= 1e-4, "{label}: {proof:?}");
        }
    }
}
