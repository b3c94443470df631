//! What the README says of the native speed of fits: `cargo bench --bench fit`.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use halfshade::error::Result;
use halfshade::fit::{Fit, Fitter, Model, Side};
use halfshade::mueller::Mueller;
use halfshade::noise::{Measurement, Noise};

/// An invented kelp film, not realizable but within its noise.
const FILM: [[f64; 4]; 4] = [
    [0.9550, 0.0226, 0.0327, 0.0038],
    [0.0190, 0.6733, 0.2540, -0.6306],
    [0.0297, 0.2500, 0.7353, 0.5698],
    [0.0003, 0.6339, -0.5648, 0.4469],
];

/// Of neighbouring elements, as a common drift of the lamp makes them.
const CORRELATION: f64 = 0.3;

fn film(noise: Noise) -> Result<Measurement> {
    Measurement::new(Mueller::from_rows(FILM)?, false, false, noise)
}

fn covariance() -> Box<[f64; 256]> {
    Box::new(std::array::from_fn(|k| {
        let (i, j) = (k / 16, k % 16);
        let sigma = |k: usize| 0.003 + 0.0002 * k as f64;
        let distance = i32::try_from(i.abs_diff(j)).unwrap_or(i32::MAX);
        sigma(i) * sigma(j) * CORRELATION.powi(distance)
    }))
}

fn all(measurement: &Measurement, models: &[Model]) -> Result<Vec<Fit>> {
    let fitter = Fitter::new(measurement, 1)?;
    models
        .iter()
        .map(|&model| fitter.fit(model, Side::Parallel))
        .collect()
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
    for (name, noise) in noises {
        let Ok(film) = film(noise) else {
            continue;
        };
        criterion.bench_function(
            &format!("fit, all twelve models with simulated p, {name}"),
            |bench| bench.iter(|| all(black_box(&film), &Model::ALL)),
        );
        criterion.bench_function(&format!("fit, a pure element with α, {name}"), |bench| {
            bench.iter(|| all(black_box(&film), &[Model::PureIsotropic]));
        });
    }
}

criterion_group! {
    name = benches;
    config = Criterion::default().sample_size(10);
    targets = fitting
}
criterion_main!(benches);
