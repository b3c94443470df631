//! Intervals of 95 %: how often they hold the truth, simulated. The bounds are those of a
//! binomial count: *derived*.

use halfshade::examine::examine_with;
use halfshade::figures::{FigureName, Method, figures_of};
use halfshade::mueller::{Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::{NormalDraws, noncentral_chi_squared};

struct Truth {
    name: &'static str,
    mueller: Mueller,
}

fn depolarized(mueller: Mueller, alpha: f64) -> Mueller {
    let mut elements = mueller.row_major();
    let m00 = elements[0];
    for element in &mut elements {
        *element *= 1.0 - alpha;
    }
    elements[0] = m00;
    Mueller::from_row_major(&elements).unwrap()
}

fn truths() -> Vec<Truth> {
    let retarder = |deg: f64| elements::linear_retarder(deg.to_radians(), 0.6).unwrap();
    let diattenuator =
        |d: f64| elements::linear_diattenuator((1.0 + d) / 2.0, (1.0 - d) / 2.0, 0.3).unwrap();
    [
        ("retarder 5°", retarder(5.0)),
        ("retarder 90°", retarder(90.0)),
        ("retarder 175°", retarder(175.0)),
        ("retarder 178.5°", retarder(178.5)),
        ("D = 0.01", diattenuator(0.01)),
        ("D = 0.02", diattenuator(0.02)),
        ("D = 0.6", diattenuator(0.6) * retarder(60.0)),
        (
            "α = 0.02",
            depolarized(diattenuator(0.1) * retarder(40.0), 0.02),
        ),
        (
            "α = 0.4",
            depolarized(diattenuator(0.3) * retarder(120.0), 0.4),
        ),
    ]
    .into_iter()
    .map(|(name, mueller)| Truth { name, mueller })
    .collect()
}

const FIGURES: [FigureName; 9] = [
    FigureName::IsotropicAlpha,
    FigureName::Diattenuation,
    FigureName::Polarizance,
    FigureName::Retardance,
    FigureName::LinearRetardance,
    FigureName::DepolarizationIndex,
    FigureName::Rotation,
    FigureName::TransmittanceMax,
    FigureName::TransmittanceMin,
];

/// Shares of intervals that hold the truth: two-sided ones, one-sided ones, and how many
/// of each there were.
fn coverage(truth: &Truth, repeats: u32, draws: u32, sigma: f64) -> Vec<(FigureName, [u32; 4])> {
    let exact = Measurement::new(truth.mueller, false, false, Noise::None).unwrap();
    let exact = examine_with(&exact, None).unwrap();
    let mut counts: Vec<_> = FIGURES.map(|name| (name, [0; 4])).into();
    let mut noise = NormalDraws::new(17);
    for repeat in 0..repeats {
        let errors = noise.draw_matrix();
        let elements = truth.mueller.row_major();
        let measured = std::array::from_fn(|k| elements[k] + sigma * errors[k]);
        let measurement = Measurement::new(
            Mueller::from_row_major(&measured).unwrap(),
            false,
            false,
            Noise::Uniform { sigma },
        )
        .unwrap();
        let found = figures_of(&measurement, draws, u64::from(repeat)).unwrap();
        for (name, count) in &mut counts {
            let Some(value) = exact.figures.get(*name).value else {
                continue;
            };
            let Some(interval) = found.get(*name).interval else {
                continue;
            };
            let one_sided = matches!(interval.method, Method::UpperLimit | Method::OneSided);
            let holds = interval.low.is_none_or(|low| low <= value)
                && interval.high.is_none_or(|high| value <= high);
            count[2 * usize::from(one_sided)] += u32::from(holds);
            count[2 * usize::from(one_sided) + 1] += 1;
        }
    }
    counts
}

fn check(repeats: u32, draws: u32, slack: f64) {
    let mut bad = Vec::new();
    for truth in truths() {
        for (name, [held, two_sided, held_one, one_sided]) in
            coverage(&truth, repeats, draws, 0.005)
        {
            let share = f64::from(held) / f64::from(two_sided.max(1));
            let share_one = f64::from(held_one) / f64::from(one_sided.max(1));
            println!(
                "{:14} {name:?}: {share:.3} of {two_sided}, one-sided {share_one:.3} of {one_sided}",
                truth.name
            );
            if two_sided + one_sided < repeats * 9 / 10 && name != FigureName::Rotation {
                bad.push(format!(
                    "{}, {name:?}: {two_sided} + {one_sided} intervals",
                    truth.name
                ));
            }
            // A limit on one side, where it is what such a sample usually gets.
            if one_sided > repeats / 2 && share_one < 0.94 - slack {
                bad.push(format!(
                    "{}, {name:?}: {share_one:.3} one-sided",
                    truth.name
                ));
            }
            // Together they are what a person sees of such a sample.
            let all = f64::from(held + held_one) / f64::from((two_sided + one_sided).max(1));
            if two_sided + one_sided > repeats / 2 && !(0.92 - slack..=0.985 + slack).contains(&all)
            {
                bad.push(format!("{}, {name:?}: {all:.3}", truth.name));
            }
        }
    }
    assert!(bad.is_empty(), "{}", bad.join("\n"));
}

#[test]
fn intervals_hold_the_truth_often_enough() {
    check(150, 120, 0.035);
}

#[test]
#[ignore = "several minutes"]
fn intervals_hold_the_truth_in_full() {
    check(2000, 400, 0.0);
}

/// Derived: a noncentral χ² with an even number of degrees of freedom and no
/// noncentrality is an exponential; and its mean is freedom plus noncentrality, so that
/// the integral of what is above comes to that.
#[test]
fn noncentral_chi_squared_is_what_it_says() {
    for value in [0.1, 1.0, 5.991, 20.0] {
        let tail = 1.0 - noncentral_chi_squared(value, 2, 0.0).unwrap();
        assert!((tail - (-0.5 * value).exp()).abs() < 1e-12);
    }
    for (freedom, noncentrality) in [(2, 3.0), (3, 0.5), (3, 40.0), (2, 300.0)] {
        let step = 0.05;
        let mean: f64 = (0..40_000)
            .map(|k| {
                step * (1.0
                    - noncentral_chi_squared((f64::from(k) + 0.5) * step, freedom, noncentrality)
                        .unwrap())
            })
            .sum();
        assert!(
            (mean - f64::from(freedom) - noncentrality).abs() < 1e-3,
            "{freedom} {noncentrality}: {mean}"
        );
    }
}

/// Derived, `published.md` table of the Rice distribution: mean bias of a length of two
/// components and of its debiased value (Wardle & Kronberg 1974), in units of σ, and the
/// standard deviation of its angle in degrees.
#[test]
fn lengths_and_angles_follow_rice() {
    const SIGMA: f64 = 1e-3;
    for (length, bias, debiased_bias, angle) in [
        (0.0, 1.2533, 0.76017, 51.9615),
        (1.0, 0.5486, 0.11780, 32.0154),
        (2.0, 0.2724, -0.02356, 17.3785),
        (3.0, 0.1726, -0.01605, 10.3999),
        (5.0, 0.1011, -0.00245, 5.8581),
    ] {
        let mut elements = Mueller::identity().row_major();
        elements[1] = length * SIGMA;
        let mut draws = NormalDraws::new(8);
        let count = 700;
        let (mut sum, mut debiased, mut squares) = (0.0, 0.0, 0.0);
        for _ in 0..count {
            let errors = draws.draw_matrix();
            let measured = std::array::from_fn(|k| {
                elements[k] + SIGMA * errors[k] * f64::from(u8::from(k == 1 || k == 2))
            });
            let measurement = Measurement::new(
                Mueller::from_row_major(&measured).unwrap(),
                true,
                false,
                Noise::Uniform { sigma: SIGMA },
            )
            .unwrap();
            let found = figures_of(&measurement, 0, 1).unwrap();
            let figure = found.get(FigureName::LinearDiattenuation);
            let (value, without) = (figure.value.unwrap(), figure.debiased.unwrap());
            sum += value / SIGMA - length;
            debiased += without / SIGMA - length;
            let azimuth = 0.5 * measured[2].atan2(measured[1]);
            squares += azimuth.to_degrees().powi(2);
        }
        let n = f64::from(count);
        // Four standard errors of a mean.
        let allowed = 4.0 / n.sqrt();
        assert!((sum / n - bias).abs() < allowed, "{length}: {}", sum / n);
        assert!(
            (debiased / n - debiased_bias).abs() < allowed,
            "{length}: {}",
            debiased / n
        );
        assert!(
            ((squares / n).sqrt() / angle - 1.0).abs() < 0.11,
            "{length}: {}",
            (squares / n).sqrt()
        );
    }
}
