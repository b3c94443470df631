//! Noise statements: the size of the test under each, and standard errors against
//! simulation. Bounds are those of a binomial count and of a sample's standard deviation:
//! *derived*.

use halfshade::examine::examine;
use halfshade::figures::FigureName;
use halfshade::mueller::{Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::{Covariance, NormalDraws};

const SIGMA: f64 = 0.005;

fn truths() -> Vec<(&'static str, Mueller)> {
    let retarder = elements::linear_retarder(1.3, 0.5).unwrap();
    let diattenuator = elements::linear_diattenuator(0.9, 0.4, 0.2).unwrap();
    vec![
        ("retarder", retarder),
        (
            "polarizer",
            elements::linear_diattenuator(1.0, 0.0, 0.7).unwrap(),
        ),
        ("diattenuator", diattenuator),
        ("both", retarder * diattenuator),
    ]
}

/// The pure ones, and what else the test has to be fair to.
fn all_truths() -> Vec<(&'static str, Mueller)> {
    let mixed = |one: Mueller, share: f64, other: Mueller| {
        let (one, other) = (one.row_major(), other.row_major());
        Mueller::from_row_major(&std::array::from_fn(|k| {
            (1.0 - share) * one[k] + share * other[k]
        }))
        .unwrap()
    };
    let mut truths = truths();
    let (retarder, diattenuator) = (truths[0].1, truths[2].1);
    let depolarizer = elements::isotropic_depolarizer(1.0).unwrap();
    truths.push(("pure", {
        let turned = elements::elliptical_retarder(2.1, 0.8, 0.4).unwrap();
        turned * diattenuator * elements::circular_retarder(0.7).unwrap()
    }));
    truths.push(("α = 0.01", mixed(retarder, 0.01, depolarizer)));
    truths.push(("rank 2", mixed(retarder, 0.2, diattenuator)));
    truths
}

/// How many of [`all_truths`] are pure.
const PURE: usize = 5;

fn moved(truth: &Mueller, errors: &[f64; 16]) -> Mueller {
    let elements = truth.row_major();
    Mueller::from_row_major(&std::array::from_fn(|k| elements[k] + errors[k])).unwrap()
}

/// A four-state analyser and a four-state generator, tetrahedra a little off: the
/// covariance of the matrix that is reduced from sixteen readings of equal error,
/// `(WᵀW)⁻¹ σ²` with W = A ⊗ G.
fn analyser_covariance() -> [f64; 256] {
    let states = |tilt: f64| {
        let r = 1.0 / 3f64.sqrt();
        nalgebra::Matrix4::from_rows(&[
            nalgebra::RowVector4::new(1.0, r, r, r + tilt),
            nalgebra::RowVector4::new(1.0, r, -r, -r),
            nalgebra::RowVector4::new(1.0, -r, r + tilt, -r),
            nalgebra::RowVector4::new(1.0, -r, -r, r),
        ]) * 0.5
    };
    let inverse = |m: nalgebra::Matrix4<f64>| (m.transpose() * m).try_inverse().unwrap();
    let (a, g) = (inverse(states(0.1)), inverse(states(-0.2)));
    let scale = SIGMA * SIGMA / 4.0 / a[(0, 0)] / g[(0, 0)];
    std::array::from_fn(|k| {
        let (i, j) = (k / 16, k % 16);
        scale * a[(i / 4, j / 4)] * g[(i % 4, j % 4)]
    })
}

/// The share of good measurements that the test rejects at 5 %.
fn size(trials: u64, measure: impl Fn(u64) -> Measurement) -> f64 {
    let rejected = (0..trials)
        .filter(|&trial| {
            let found = examine(&measure(trial), Some(trial)).unwrap();
            found
                .realizability
                .significance
                .is_some_and(|test| test.p_value < 0.05)
        })
        .count();
    rejected as f64 / trials as f64
}

fn replicates_size(trials: u64, most: f64) {
    for count in [2, 3, 5, 20, 60] {
        for (name, truth) in truths() {
            // Each of the simulated measurements of many repeats has a covariance of its own.
            let trials = if count > 40 {
                trials.div_ceil(4)
            } else {
                trials
            };
            let share = size(trials, |trial| {
                let mut draws = NormalDraws::new(1000 * count + trial);
                let matrices = (0..count)
                    .map(|_| moved(&truth, &draws.draw_matrix().map(|draw| SIGMA * draw)))
                    .collect();
                Measurement::of_replicates(matrices, false, false).unwrap()
            });
            println!("{count} repeats of a {name}: {share:.3} of {trials}");
            // Two standard deviations of the count more for fewer trials.
            let most = if count > 40 {
                most + 0.04 * (100.0 / trials as f64).sqrt()
            } else {
                most
            };
            assert!(share <= most, "{count} repeats of a {name}: {share}");
        }
    }
}

/// `range` for pure truths; for the others its upper end counts.
fn covariance_size(trials: u64, range: std::ops::RangeInclusive<f64>) {
    let unequal: [f64; 16] = std::array::from_fn(|k| SIGMA * (0.3 + 0.2 * (k % 5) as f64));
    let mut exact = unequal;
    exact[0] = 0.0;
    for (kind, covariance) in [
        ("unequal", Covariance::diagonal(&unequal).unwrap()),
        ("M00 exact", Covariance::diagonal(&exact).unwrap()),
        ("analyser", Covariance::new(&analyser_covariance()).unwrap()),
    ] {
        for (place, (name, truth)) in all_truths().into_iter().enumerate() {
            let truth = if kind == "M00 exact" {
                truth.normalised().unwrap()
            } else {
                truth
            };
            let share = size(trials, |trial| {
                let errors = covariance.draw(&mut NormalDraws::new(trial));
                let noise = Noise::Covariance {
                    covariance: Box::new(covariance.row_major()),
                };
                Measurement::new(moved(&truth, &errors), false, false, noise).unwrap()
            });
            println!("{kind}, {name}: {share:.3}");
            assert!(share <= *range.end(), "{kind}, {name}: {share}");
            assert!(
                place >= PURE || share >= *range.start(),
                "{kind}, {name}: {share}"
            );
        }
    }
}

#[test]
fn repeats_are_not_rejected_too_often() {
    replicates_size(100, 0.13);
}

#[test]
fn good_measurements_under_a_covariance_are_not_rejected_too_often() {
    covariance_size(12, 0.0..=0.34);
}

#[test]
#[ignore = "half an hour"]
fn the_size_in_full() {
    replicates_size(2000, 0.07);
    // Two standard deviations of 600 trials beside 3 % and 7 %.
    covariance_size(600, 0.016..=0.09);
}

/// First order holds where σ is small beside every figure's own scale.
#[test]
fn standard_errors_are_those_of_simulated_measurements() {
    let truth = elements::linear_retarder(1.3, 0.5).unwrap()
        * elements::linear_diattenuator(0.8, 0.3, 0.2).unwrap();
    let truth = {
        let mut elements = truth.row_major();
        let m00 = elements[0];
        elements.iter_mut().for_each(|element| *element *= 0.8);
        elements[0] = m00;
        Mueller::from_row_major(&elements).unwrap()
    };
    let covariance = analyser_covariance().map(|value| value / 25.0);
    for noise in [
        Noise::Uniform { sigma: 0.001 },
        Noise::Covariance {
            covariance: Box::new(covariance),
        },
    ] {
        let measurement = Measurement::new(truth, false, false, noise.clone()).unwrap();
        let found = examine(&measurement, Some(1)).unwrap();
        let mut draws = NormalDraws::new(5);
        let general = Covariance::new(&covariance).unwrap();
        let mut sums = vec![(0.0, 0.0, 0.0); FigureName::ALL.len()];
        for _ in 0..3000 {
            let errors = match noise {
                Noise::Uniform { sigma } => draws.draw_matrix().map(|draw| sigma * draw),
                _ => general.draw(&mut draws),
            };
            let one = Measurement::new(moved(&truth, &errors), false, false, Noise::None).unwrap();
            let one = examine(&one, None).unwrap();
            for (sum, name) in sums.iter_mut().zip(FigureName::ALL) {
                if let Some(value) = one.figures.get(name).value {
                    sum.0 += 1.0;
                    sum.1 += value;
                    sum.2 += value * value;
                }
            }
        }
        for ((count, sum, squares), name) in sums.into_iter().zip(FigureName::ALL) {
            let deviation = f64::sqrt((squares - sum * sum / count) / (count - 1.0));
            let figure = found.figures.get(name);
            let Some(se) = figure.se.filter(|_| figure.reason.is_none()) else {
                continue;
            };
            // The standard deviation of 3000 draws is known to 1.3 %.
            assert!(
                (se / deviation - 1.0).abs() < 0.05,
                "{name:?}: {se}, simulated {deviation}"
            );
        }
    }
}

#[test]
fn what_is_no_noise_is_refused() {
    let truth = truths()[0].1;
    let refused =
        |noise: Noise| Measurement::new(truth, false, false, noise).expect_err("was taken");
    assert_eq!(refused(Noise::Relative { fraction: 0.0 }).code, "bad-sigma");
    assert_eq!(
        refused(Noise::PerElement { sigma: [0.0; 16] }).code,
        "bad-sigma"
    );
    let mut sigma = [0.1; 16];
    sigma[7] = -0.1;
    assert_eq!(refused(Noise::PerElement { sigma }).code, "bad-sigma");
    assert_eq!(
        Measurement::of_replicates(vec![truth], false, false)
            .expect_err("was taken")
            .code,
        "too-few"
    );
    assert_eq!(
        Measurement::of_replicates(vec![truth; 3], false, false)
            .expect_err("was taken")
            .code,
        "bad-sigma"
    );
    let mut covariance = [0.0; 256];
    for k in 0..16 {
        covariance[17 * k] = 1.0;
    }
    covariance[1] = 1.0;
    covariance[16] = 1.0;
    assert_eq!(
        refused(Noise::Covariance {
            covariance: Box::new(covariance)
        })
        .code,
        "covariance-singular"
    );
    covariance[1] = 1.1;
    covariance[16] = 1.1;
    let error = refused(Noise::Covariance {
        covariance: Box::new(covariance),
    });
    assert_eq!(error.code, "covariance-not-positive");
    assert!(error.message.contains("-1.000e-1"), "{error}");
    covariance[1] = 0.1;
    assert_eq!(
        refused(Noise::Covariance {
            covariance: Box::new(covariance)
        })
        .code,
        "covariance-not-symmetric"
    );
}

/// *Derived*: with an error in one element alone, the standard error is the derivative times
/// σ; here by a stencil of five points over steps 300 times those of the engine.
#[test]
fn standard_errors_are_those_of_finite_differences() {
    let truth = elements::isotropic_depolarizer(0.2).unwrap()
        * elements::linear_retarder(1.3, 0.5).unwrap()
        * elements::linear_diattenuator(0.8, 0.3, 0.2).unwrap()
        * elements::circular_retarder(0.4).unwrap();
    const STEP: f64 = 3e-4;
    let values = |k: usize, by: f64| {
        let mut elements = truth.row_major();
        elements[k] += by;
        let moved = Mueller::from_row_major(&elements).unwrap();
        let moved = Measurement::new(moved, false, false, Noise::None).unwrap();
        let found = examine(&moved, None).unwrap();
        FigureName::ALL.map(|name| found.figures.get(name).value.unwrap())
    };
    for k in 0..16 {
        let mut sigma = [0.0; 16];
        sigma[k] = 1e-5;
        let noise = Noise::PerElement { sigma };
        let measurement = Measurement::new(truth, false, false, noise).unwrap();
        let found = halfshade::figures::figures_of(&measurement, 0, 1).unwrap();
        let [far_above, above, below, far_below] =
            [2.0, 1.0, -1.0, -2.0].map(|n| values(k, n * STEP));
        for (i, name) in FigureName::ALL.into_iter().enumerate() {
            let derivative =
                (8.0 * (above[i] - below[i]) - (far_above[i] - far_below[i])) / (12.0 * STEP);
            let se = found.get(name).se.unwrap() / 1e-5;
            assert!(
                (se - derivative.abs()).abs() < 1e-6 * (1.0 + se),
                "{name:?}, element {k}: {se}, {derivative}"
            );
        }
    }
}
