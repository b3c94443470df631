//! Size and power of the test for noise.

mod common;

use common::{close, diagonal, measurement, mueller};
use halfshade::coherency::{Coherency, Verdict, explaining_sigma, significance};
use halfshade::examine::examine;
use halfshade::mueller::{Jones, Mueller, elements};
use halfshade::noise::Noise;
use halfshade::stats::NormalDraws;
use num_complex::Complex64;

const SIGMA: f64 = 0.005;

/// Kinds of truths, the first four pure.
const KINDS: usize = 6;
const PURE_KINDS: usize = 4;

/// Samples of six kinds, another one for every k.
fn truth(kind: usize, draws: &mut NormalDraws) -> Mueller {
    let angle = draws.draw();
    match kind {
        0 => elements::elliptical_retarder(1.0 + angle, angle, 0.3).unwrap(),
        1 => elements::linear_diattenuator(1.0, 0.0, angle).unwrap(),
        2 => elements::linear_diattenuator(0.9, 0.4, angle).unwrap(),
        4 => {
            elements::isotropic_depolarizer(0.01).unwrap()
                * elements::linear_retarder(1.3, angle).unwrap()
        }
        5 => {
            let parts = [
                elements::linear_retarder(1.3, angle).unwrap().row_major(),
                elements::linear_diattenuator(0.9, 0.4, 0.3)
                    .unwrap()
                    .row_major(),
            ];
            Mueller::from_row_major(&std::array::from_fn(|k| {
                0.8 * parts[0][k] + 0.2 * parts[1][k]
            }))
            .unwrap()
        }
        _ => {
            let mut entry = || Complex64::new(draws.draw(), draws.draw()) * 0.5;
            Jones::from_rows([[entry(), entry()], [entry(), entry()]])
                .unwrap()
                .mueller()
        }
    }
}

fn noisy(truth: &Mueller, sigma: f64, m00_is_exact: bool, draws: &mut NormalDraws) -> Mueller {
    let noise = draws.draw_matrix();
    let truth = truth.row_major();
    let first = usize::from(m00_is_exact);
    Mueller::from_row_major(&std::array::from_fn(|k| {
        truth[k] + if k >= first { sigma * noise[k] } else { 0.0 }
    }))
    .unwrap()
}

fn rejected(count: u32, kind: usize, m00_is_exact: bool) -> f64 {
    let mut draws = NormalDraws::new(40 + kind as u64);
    let mut rejections = 0;
    for k in 0..count {
        let truth = truth(kind, &mut draws);
        // Relative to the transmittance, as a bench has it.
        let sigma = SIGMA * truth.m00();
        let measured = noisy(&truth, sigma, m00_is_exact, &mut draws);
        let test = significance(&measured, m00_is_exact, sigma, u64::from(k))
            .unwrap()
            .unwrap();
        rejections += u32::from(test.p_value < 0.05);
    }
    f64::from(rejections) / f64::from(count)
}

/// Rejection at 5 % never above 7 %, and not below 3 % for pure samples, over 2000 truths of
/// each kind. *Derived*: 5 % is what the test promises; 2000 leave a standard deviation of
/// 0.5 %. Mixtures may be rejected less often.
#[test]
#[ignore = "takes a minute: cargo test --release --test significance -- --ignored"]
fn size_of_the_test_in_full() {
    for kind in 0..KINDS {
        for m00_is_exact in [false, true] {
            let share = rejected(2000, kind, m00_is_exact);
            println!(
                "kind {kind}, M00 exact {m00_is_exact}: {:.2} %",
                100.0 * share
            );
            let least = if kind < PURE_KINDS { 0.03 } else { 0.0 };
            assert!(
                (least..=0.07).contains(&share),
                "{kind} {m00_is_exact}: {share}"
            );
        }
    }
}

/// The same with 200 of each: all kinds together within three standard errors of
/// 3 % to 7 %.
#[test]
fn size_of_the_test() {
    for m00_is_exact in [false, true] {
        let share = (0..PURE_KINDS)
            .map(|kind| rejected(200, kind, m00_is_exact))
            .sum::<f64>()
            / PURE_KINDS as f64;
        assert!((0.03..=0.07).contains(&share), "{m00_is_exact}: {share}");
        // Four standard deviations of a count of 200 with 5 %.
        for kind in PURE_KINDS..KINDS {
            let share = rejected(200, kind, m00_is_exact);
            assert!(share <= 0.11, "{kind} {m00_is_exact}: {share}");
        }
    }
}

/// *Derived* from the purpose: M00 low by 3 % at σ = 0.005 is six standard deviations of
/// M00, and at least 90 in 100 such measurements of a pure sample are told from noise.
#[test]
fn a_gain_error_of_three_per_cent_is_seen() {
    let trials = 200;
    for kind in 0..PURE_KINDS {
        let mut draws = NormalDraws::new(7);
        let mut seen = 0;
        for k in 0..trials {
            let truth = truth(kind, &mut draws);
            let sigma = SIGMA * truth.m00();
            let mut elements = truth.row_major();
            elements[0] *= 0.97;
            let wrong = Mueller::from_row_major(&elements).unwrap();
            let measured = noisy(&wrong, sigma, false, &mut draws);
            let test = significance(&measured, false, sigma, k).unwrap().unwrap();
            seen += u32::from(test.p_value < 0.05);
        }
        assert!(seen >= 180, "{kind}: {seen} of {trials}");
    }
}

/// Reference section 9, derived (60 000 draws): the smallest eigenvalue of a pure
/// sample has mean -0.951 σ and sd 0.390 σ; 0.55 % are not negative.
#[test]
fn smallest_eigenvalue_of_a_pure_sample() {
    let truth = elements::linear_retarder(1.0, 0.3).unwrap();
    let mut draws = NormalDraws::new(3);
    let count = 20_000;
    let (mut sum, mut squares, mut realizable) = (0.0, 0.0, 0);
    for _ in 0..count {
        let measured = noisy(&truth, SIGMA, false, &mut draws);
        let smallest = Coherency::from_mueller(&measured).eigen().unwrap().values[3] / SIGMA;
        sum += smallest;
        squares += smallest * smallest;
        realizable += u32::from(smallest >= 0.0);
    }
    let mean = sum / f64::from(count);
    let sd = (squares / f64::from(count) - mean * mean).sqrt();
    // Five standard errors of this sample and of the source's.
    close(mean, -0.951, 0.02);
    close(sd, 0.390, 0.012);
    close(f64::from(realizable) / f64::from(count), 0.0055, 0.004);
}

#[test]
fn a_wrong_sign_on_one_side_is_beyond_noise() {
    let retarder = elements::linear_retarder(1.0, 0.3).unwrap();
    let mirrored = diagonal([1.0, 1.0, 1.0, -1.0]) * retarder;
    let found = examine(
        &measurement(mirrored, false, Noise::Uniform { sigma: SIGMA }),
        Some(1),
    )
    .unwrap();
    assert_eq!(found.realizability.verdict, Verdict::BeyondNoise);
    // The least p that 999 simulations can give.
    close(
        found.realizability.significance.unwrap().p_value,
        1e-3,
        1e-12,
    );
}

#[test]
fn verdicts_without_and_with_noise() {
    let measured = mueller([
        [0.9550, 0.0226, 0.0327, 0.0038],
        [0.0190, 0.6733, 0.2540, -0.6306],
        [0.0297, 0.2500, 0.7353, 0.5698],
        [0.0003, 0.6339, -0.5648, 0.4469],
    ]);
    let verdict = |noise, seed| {
        examine(&measurement(measured, false, noise), seed)
            .unwrap()
            .realizability
    };
    assert_eq!(verdict(Noise::None, None).verdict, Verdict::NotRealizable);
    assert_eq!(
        verdict(Noise::Uniform { sigma: 0.004 }, None).verdict,
        Verdict::NotRealizable
    );
    assert_eq!(
        verdict(Noise::Uniform { sigma: 0.004 }, Some(1)).verdict,
        Verdict::WithinNoise
    );
    assert_eq!(
        verdict(Noise::Rounding { decimals: 4 }, Some(1)).verdict,
        Verdict::BeyondNoise
    );
    // The smallest σ that explains it splits the two.
    let explaining = verdict(Noise::None, Some(1)).explaining_sigma.unwrap();
    assert!(
        verdict(
            Noise::Uniform {
                sigma: explaining * 1.02
            },
            Some(1)
        )
        .verdict
            == Verdict::WithinNoise
    );
    assert!(
        verdict(
            Noise::Uniform {
                sigma: explaining / 1.03
            },
            Some(1)
        )
        .verdict
            == Verdict::BeyondNoise
    );
}

#[test]
fn zeros_and_ones_are_not_taken_for_rounded_numbers() {
    let air_with_a_sign = diagonal([1.0, 1.0, 1.0, -1.0]);
    let found = examine(&measurement(air_with_a_sign, false, Noise::None), Some(1)).unwrap();
    assert_eq!(found.realizability.rounding_decimals, None);
    assert!(!found.realizability.consistent_with_rounding);
    // Counts of a detector are whole numbers and were rounded to them.
    let counts = diagonal([30_000.0, 20_001.0, 20_002.0, 20_003.0]);
    let found = examine(&measurement(counts, false, Noise::None), None).unwrap();
    assert_eq!(found.realizability.rounding_decimals, Some(0));
}

#[test]
fn same_seed_same_digits() {
    let measured = noisy(
        &elements::rotator(0.3).unwrap(),
        SIGMA,
        false,
        &mut NormalDraws::new(9),
    );
    let p = |seed| {
        significance(&measured, false, SIGMA, seed)
            .unwrap()
            .unwrap()
            .p_value
    };
    assert_eq!(p(5).to_bits(), p(5).to_bits());
    assert!((1..20).any(|seed| p(seed) != p(5)));
    assert_eq!(
        explaining_sigma(&measured, false, 5).unwrap(),
        explaining_sigma(&measured, false, 5).unwrap()
    );
}

/// Design, physics section 5: a textbook retarder printed to 4, 3, 2 decimals has a
/// smallest eigenvalue near -3e-5, -2.5e-4, -2.5e-3; rounding explains it.
#[test]
fn textbook_matrices_are_consistent_with_their_rounding() {
    let mut beyond = 0;
    for (decimals, size) in [(4, 3e-5), (3, 2.5e-4), (2, 2.5e-3)] {
        let mut typical = 0.0;
        for k in 0..20 {
            let exact =
                elements::linear_retarder(0.5 + 0.1 * f64::from(k), 0.2 + 0.07 * f64::from(k))
                    .unwrap();
            let scale = 10f64.powi(decimals);
            let printed = exact.row_major().map(|v| (v * scale).round() / scale);
            let printed = Mueller::from_row_major(&printed).unwrap();
            typical += Coherency::from_mueller(&printed).eigen().unwrap().values[3] / 20.0;
            for seed in [None, Some(1)] {
                let found = examine(&measurement(printed, false, Noise::None), seed)
                    .unwrap()
                    .realizability;
                assert_eq!(
                    found.rounding_decimals,
                    Some(u32::try_from(decimals).unwrap())
                );
                assert!(
                    seed.is_none() || found.consistent_with_rounding,
                    "{decimals} {k}"
                );
            }
            let stated = Noise::Rounding {
                decimals: u32::try_from(decimals).unwrap(),
            };
            let found = examine(&measurement(printed, true, stated), Some(1))
                .unwrap()
                .realizability;
            beyond += u32::from(found.verdict == Verdict::BeyondNoise);
        }
        assert!(
            (-typical / size) > 0.4 && (-typical / size) < 2.5,
            "{decimals}: {typical}"
        );
    }
    // Sixty tests at 5 %.
    assert!(beyond <= 6, "{beyond}");
}
