//! What the README says of the native speed: `cargo bench`.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use halfshade::error::Result;
use halfshade::examine::{Simulation, examine, examine_with};
use halfshade::fit::{Fitter, Model, Side};
use halfshade::mueller::Mueller;
use halfshade::noise::{Measurement, Noise};
use halfshade::state::Stokes;
use halfshade::train::{Element, FitOptions, Kind, Parameter, Train, fit_train, follow};

/// An invented kelp film, not realizable but within its noise.
const FILM: [[f64; 4]; 4] = [
    [0.9550, 0.0226, 0.0327, 0.0038],
    [0.0190, 0.6733, 0.2540, -0.6306],
    [0.0297, 0.2500, 0.7353, 0.5698],
    [0.0003, 0.6339, -0.5648, 0.4469],
];

fn film(noise: Noise) -> Option<Measurement> {
    let mueller = Mueller::from_rows(FILM).ok()?;
    Measurement::new(mueller, false, false, noise).ok()
}

fn examining(criterion: &mut Criterion) {
    let (Some(plain), Some(noisy)) = (film(Noise::None), film(Noise::Uniform { sigma: 0.004 }))
    else {
        return;
    };
    criterion.bench_function("examine, no draws", |bench| {
        bench.iter(|| examine(black_box(&noisy), None));
    });
    criterion.bench_function("examine, simulated p and standard errors", |bench| {
        bench.iter(|| examine(black_box(&noisy), Some(1)));
    });
    let simulation = Some(Simulation {
        seed: 1,
        draws: 2000,
    });
    criterion.bench_function("examine, 2000 draws with all intervals", |bench| {
        bench.iter(|| examine_with(black_box(&noisy), simulation));
    });
    criterion.bench_function(
        "examine, no noise stated: the σ that explains it",
        |bench| {
            bench.iter(|| examine(black_box(&plain), Some(1)));
        },
    );
}

/// Errors of neighbouring elements go together, as a drift of the lamp makes them.
fn covariance() -> Box<[f64; 256]> {
    Box::new(std::array::from_fn(|k| {
        let (i, j) = (k / 16, k % 16);
        let sigma = |k: usize| 0.003 + 0.0002 * k as f64;
        let distance = i32::try_from(i.abs_diff(j)).unwrap_or(i32::MAX);
        sigma(i) * sigma(j) * 0.3_f64.powi(distance)
    }))
}

fn fitting(criterion: &mut Criterion) {
    let noises = [
        ("one σ", Noise::Uniform { sigma: 0.004 }),
        (
            "a covariance",
            Noise::Covariance {
                covariance: covariance(),
            },
        ),
    ];
    let mut group = criterion.benchmark_group("fit");
    group.sample_size(10);
    for (name, noise) in noises {
        let Some(film) = film(noise) else {
            continue;
        };
        group.bench_function(format!("all twelve models, {name}"), |bench| {
            bench.iter(|| {
                let fitter = Fitter::new(black_box(&film), 1)?;
                Model::ALL
                    .into_iter()
                    .map(|model| fitter.fit(model, Side::Parallel))
                    .collect::<Result<Vec<_>>>()
            });
        });
    }
}

fn trains(criterion: &mut Criterion) {
    let part = |kind: Kind, values: &[f64], free: bool| {
        let parameter = if free {
            Parameter::free
        } else {
            Parameter::fixed
        };
        Element::new(kind, values.iter().map(|&value| parameter(value)).collect())
    };
    let long: Result<Vec<Element>> = (0..50)
        .map(|k| {
            let angle = 0.1 * f64::from(k);
            match k % 3 {
                0 => part(Kind::LinearRetarder, &[1.0, angle], false),
                1 => part(
                    Kind::EllipticalDiattenuator,
                    &[0.95, 0.1, angle, 0.2],
                    false,
                ),
                _ => part(Kind::IsotropicDepolarizer, &[0.01], false),
            }
        })
        .collect();
    // Six free parameters; the film is what they are fitted to.
    let short = |away: f64| {
        let film = part(
            Kind::AlignedDiattenuatingRetarder,
            &[0.95 - away, 0.03 + away, 1.0 + away, 0.6 - away],
            true,
        );
        let turn = part(Kind::CircularRetarder, &[0.1 + away], true);
        let haze = part(Kind::IsotropicDepolarizer, &[0.05 + away], true);
        [film, turn, haze].into_iter().collect::<Result<Vec<_>>>()
    };
    let source = Stokes::new([1.0, 0.5, 0.0, 0.0]);
    let (Ok(source), Ok(long), Ok(start)) = (
        source,
        long.and_then(Train::new),
        short(0.1).and_then(Train::new),
    ) else {
        return;
    };
    criterion.bench_function("follow, 50 elements", |bench| {
        bench.iter(|| follow(black_box(&source), black_box(&long)));
    });
    let Some(noisy) = film(Noise::Uniform { sigma: 0.004 }) else {
        return;
    };
    let options = FitOptions {
        seed: 1,
        starts: None,
    };
    criterion.bench_function("train fit, six parameters, 60 starts", |bench| {
        bench.iter(|| fit_train(black_box(&noisy), black_box(&start), options));
    });
}

criterion_group!(benches, examining, fitting, trains);
criterion_main!(benches);
