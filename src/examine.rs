//! Everything about one measured matrix.

use crate::coherency::{Nearest, Realizability, realizability};
use crate::decompose::{
    Differential, Isotropic, MixedComponent, PolarFactors, PureComponent, characteristic,
    differential, isotropic, polar_reverse, spectral,
};
use crate::error::Result;
use crate::figures::{Analysis, FigureTable, Samples, figures};
use crate::noise::Measurement;

/// What [`examine`] finds, canonical convention, radians.
#[derive(Debug, Clone)]
pub struct Examination {
    /// Can it be physical, and how sure is that?
    pub realizability: Realizability,
    /// The nearest realizable matrix; `None` where M00 is exact and negative.
    pub nearest: Option<Nearest>,
    /// The scalar figures.
    pub figures: FigureTable,
    /// Of the nearest matrix; `None` unless its M00 is positive.
    pub polar_forward: Option<PolarFactors>,
    /// Of the nearest matrix; `None` unless its M00 is positive.
    pub polar_reverse: Option<PolarFactors>,
    /// Of the nearest matrix; `None` unless its M00 is positive.
    pub spectral: Option<[PureComponent; 4]>,
    /// Of the nearest matrix; `None` unless its M00 is positive.
    pub characteristic: Option<[MixedComponent; 4]>,
    /// Of the measured matrix; `None` unless M00 is positive.
    pub differential: Option<Differential>,
    /// Of the measured matrix; `None` unless M00 is positive.
    pub isotropic: Option<Isotropic>,
}

/// How much is simulated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Simulation {
    /// Where all draws begin.
    pub seed: u64,
    /// Simulated measurements for the intervals of the figures; without any, intervals
    /// are of first order.
    pub draws: u32,
}

/// Examines a measured matrix, with intervals of first order.
///
/// `seed` starts the simulation of the significance test and asks for standard
/// errors; `None` leaves both out and answers at once.
///
/// # Errors
/// `no-convergence`, which no matrix is known to cause.
pub fn examine(measurement: &Measurement, seed: Option<u64>) -> Result<Examination> {
    examine_with(measurement, seed.map(|seed| Simulation { seed, draws: 0 }))
}

/// The same with simulated intervals.
///
/// # Errors
/// `no-convergence`, which no matrix is known to cause.
pub fn examine_with(
    measurement: &Measurement,
    simulation: Option<Simulation>,
) -> Result<Examination> {
    let seed = simulation.map(|simulation| simulation.seed);
    let analysis = Analysis::of(measurement)?;
    let samples = match simulation {
        Some(Simulation { seed, draws }) if draws > 0 && measurement.has_noise() => {
            Some(Samples::of(measurement, draws, seed)?)
        }
        _ => None,
    };
    let nearest = analysis.nearest.as_ref();
    let components = nearest.and_then(|nearest| spectral(&nearest.eigen.values, &nearest.eigen));
    Ok(Examination {
        realizability: realizability(measurement, &analysis.eigen, nearest, seed)?,
        figures: figures(&analysis, seed.is_some(), samples.as_ref())?,
        polar_forward: analysis.polar,
        polar_reverse: analysis
            .normalised_nearest
            .map(|m| polar_reverse(&m, analysis.normalised_sigma))
            .transpose()?,
        characteristic: components.as_ref().map(characteristic),
        spectral: components,
        differential: measurement
            .mueller()
            .normalised()
            .filter(|_| measurement.mueller().m00() > 0.0)
            .map(|m| differential(&m)),
        isotropic: isotropic(measurement, &analysis.eigen),
        nearest: analysis.nearest,
    })
}
