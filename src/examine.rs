//! Everything about one measured matrix.

use crate::coherency::{Nearest, Realizability, realizability};
use crate::decompose::{
    Differential, Isotropic, MixedComponent, PolarFactors, PureComponent, characteristic,
    differential, isotropic, polar_reverse, spectral,
};
use crate::error::Result;
use crate::figures::{Analysis, FigureTable, figures};
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

/// Examines a measured matrix.
///
/// `seed` starts the simulation of the significance test and asks for standard
/// errors; `None` leaves both out and answers at once.
///
/// # Errors
/// `no-convergence`, which no matrix is known to cause.
pub fn examine(measurement: &Measurement, seed: Option<u64>) -> Result<Examination> {
    let analysis = Analysis::of(measurement)?;
    let nearest = analysis.nearest.as_ref();
    let components = nearest.and_then(|nearest| spectral(&nearest.eigen.values, &nearest.eigen));
    Ok(Examination {
        realizability: realizability(measurement, &analysis.eigen, nearest, seed)?,
        figures: figures(&analysis, seed.is_some())?,
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
