//! What may have gone wrong: put in, it must be found. Truths are textbook elements with
//! seeded noise: *derived*.

use halfshade::coherency::{Candidate, Cause, likely_causes, mirror_is_visible};
use halfshade::mueller::{Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::stats::NormalDraws;

const SIGMA: f64 = 0.004;

fn film() -> Mueller {
    elements::linear_retarder(1.1, 0.4).unwrap()
        * elements::linear_diattenuator(0.8, 0.5, 0.2).unwrap()
}

fn measured(truth: &Mueller, seed: u64, spoil: impl Fn(&mut [f64; 16])) -> Measurement {
    let noise = NormalDraws::new(seed).draw_matrix();
    let elements = truth.row_major();
    let mut noisy = std::array::from_fn(|k| elements[k] + SIGMA * noise[k]);
    spoil(&mut noisy);
    let mueller = Mueller::from_row_major(&noisy).unwrap();
    Measurement::new(mueller, false, false, Noise::Uniform { sigma: SIGMA }).unwrap()
}

fn found(
    truth: &Mueller,
    spoil: impl Fn(&mut [f64; 16]) + Copy,
    is: impl Fn(&Candidate) -> bool,
) -> usize {
    (0..5)
        .filter(|&seed| {
            let causes = likely_causes(&measured(truth, seed, spoil), 1).unwrap();
            causes.iter().any(&is)
        })
        .count()
}

#[test]
fn each_cause_is_found_when_it_was_put_in() {
    let film = film();
    let row =
        |line: usize, by: f64| move |m: &mut [f64; 16]| (0..4).for_each(|k| m[4 * line + k] *= by);
    let column =
        |line: usize, by: f64| move |m: &mut [f64; 16]| (0..4).for_each(|k| m[4 * k + line] *= by);
    for spoil in [row(3, -1.0), row(1, -1.0), row(2, -1.0)] {
        assert!(found(&film, spoil, |one| one.cause == Cause::MirrorOneSide) >= 4);
    }
    assert!(
        found(&film, column(3, -1.0), |one| one.cause
            == Cause::MirrorOneSide)
            >= 4
    );
    // Two rows exchanged are a mirror as well.
    let exchange = |m: &mut [f64; 16]| (0..4).for_each(|k| m.swap(4 + k, 8 + k));
    assert!(found(&film, exchange, |one| one.cause == Cause::MirrorOneSide) >= 4);
    let low = |m: &mut [f64; 16]| m[0] -= 0.03;
    assert!(
        found(
            &film,
            low,
            |one| matches!(one.cause, Cause::M00TooSmall { delta } if (delta - 0.03).abs() < 0.04)
        ) >= 4
    );
    let typo = |m: &mut [f64; 16]| m[6] += 0.3;
    assert!(
        found(
            &film,
            typo,
            |one| matches!(one.cause, Cause::OneElement { element: 6, value } if (value - film.row_major()[6]).abs() < 0.05)
        ) >= 4
    );
    assert!(
        found(
            &film,
            row(2, 1.2),
            |one| matches!(one.cause, Cause::RowGain { row: 2, factor } if (factor * 1.2 - 1.0).abs() < 0.05)
        ) >= 4
    );
    assert!(
        found(
            &film,
            column(1, 1.2),
            |one| matches!(one.cause, Cause::ColumnGain { column: 1, factor } if (factor * 1.2 - 1.0).abs() < 0.05)
        ) >= 4
    );
    let negative = |m: &mut [f64; 16]| m.iter_mut().for_each(|x| *x = -*x);
    assert!(found(&film, negative, |one| one.cause == Cause::OverallSign) >= 4);
}

#[test]
fn nothing_is_offered_where_noise_is_enough() {
    for seed in 0..20 {
        let causes = likely_causes(&measured(&film(), seed, |_| ()), 1).unwrap();
        // One in twenty is beyond the noise by chance.
        assert!(causes.is_empty() || seed == 0 || causes.iter().all(|one| one.p_value >= 0.05));
    }
    let plain = Measurement::new(film(), false, false, Noise::None).unwrap();
    assert!(likely_causes(&plain, 1).unwrap().is_empty());
}

#[test]
fn a_polarizer_does_not_show_a_mirror() {
    let polarizer = elements::linear_diattenuator(1.0, 0.0, 0.5).unwrap();
    assert!(!mirror_is_visible(&measured(&polarizer, 1, |_| ())).unwrap());
    assert!(mirror_is_visible(&measured(&film(), 1, |_| ())).unwrap());
}
