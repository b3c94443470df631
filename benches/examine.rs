//! What the README says of the native speed: `cargo bench`.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use halfshade::error::Result;
use halfshade::examine::{Simulation, examine, examine_with};
use halfshade::fit::{Fitter, Model, Side};
use halfshade::mueller::Mueller;
use halfshade::noise::{Measurement, Noise};

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

fn fitting(criterion: &mut Criterion) {
    let Some(noisy) = film(Noise::Uniform { sigma: 0.004 }) else {
        return;
    };
    criterion.bench_function("fit, all twelve models", |bench| {
        bench.iter(|| {
            let fitter = Fitter::new(black_box(&noisy), 1)?;
            Model::ALL
                .into_iter()
                .map(|model| fitter.fit(model, Side::Parallel))
                .collect::<Result<Vec<_>>>()
        });
    });
}

criterion_group!(benches, examining, fitting);
criterion_main!(benches);
