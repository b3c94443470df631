use std::f64::consts::{FRAC_PI_2, PI, TAU};

use nalgebra::{DMatrix, Vector3};
use num_complex::Complex64;

use super::models::{Model, Shape, columns_of, places_of};
use crate::state::half_turn;

/// What a parameter is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Name {
    /// For unpolarized light, M00.
    Transmittance,
    /// D.
    Diattenuation,
    /// Azimuth of the fast, or of the more transmitting axis, radians in [0, π).
    Axis,
    /// Radians.
    Retardance,
    /// A component of retardance times axis, radians.
    RetarderVector(usize),
    /// A component of the diattenuation vector.
    DiattenuationVector(usize),
    /// What is lost of the polarization.
    Alpha,
    /// What is retained of the linear polarization.
    DepolarizationLinear,
    /// What is retained of the circular polarization.
    DepolarizationCircular,
    /// What is retained of one component.
    Depolarization(usize),
    /// An entry of the Jones matrix, row by row: real part, or imaginary part.
    Jones(usize, bool),
    /// The share of one Jones matrix in a mixture.
    Weight(usize),
    /// ½ asin of the circular component of the fast eigenstate, radians.
    Ellipticity,
}

impl Name {
    /// Radians, and not a pure number or the unit of the matrix.
    #[must_use]
    pub fn is_angle(self) -> bool {
        matches!(
            self,
            Self::Axis | Self::Retardance | Self::RetarderVector(_) | Self::Ellipticity
        )
    }

    /// Of an angle that comes back to itself.
    #[must_use]
    pub fn period(self) -> Option<f64> {
        match self {
            Self::Axis => Some(PI),
            _ => None,
        }
    }
}

/// Parameters as a person knows them, and their derivatives with respect to the fitted ones.
pub(super) struct Reported {
    pub names: Vec<Name>,
    pub values: Vec<f64>,
    /// A row for each.
    pub derivatives: DMatrix<f64>,
}

impl Reported {
    fn push(&mut self, name: Name, value: f64, derivative: &[(usize, f64)]) {
        let row = self.names.len();
        self.names.push(name);
        self.values.push(value);
        for &(column, slope) in derivative {
            self.derivatives[(row, column)] = slope;
        }
    }
}

/// The fitted parameters `x` as a person knows them; `unit` is that of the matrix.
pub(super) fn reported(shape: &Shape, x: &[f64], unit: f64) -> Reported {
    let count = x.len();
    let mut all = Reported {
        names: Vec::new(),
        values: Vec::new(),
        derivatives: DMatrix::zeros(count, count),
    };
    let own = count - shape.model.depolarizations();
    let transmittance =
        |all: &mut Reported| all.push(Name::Transmittance, unit * x[0], &[(0, unit)]);
    match shape.model {
        Model::LinearRetarder => {
            transmittance(&mut all);
            let (retardance, axis, sign) = folded(x[1], x[2]);
            all.push(Name::Retardance, retardance, &[(1, sign)]);
            all.push(Name::Axis, axis, &[(2, 1.0)]);
        }
        Model::LinearDiattenuator => {
            transmittance(&mut all);
            let turned = x[1].sin() < 0.0;
            let sign = if turned { -1.0 } else { 1.0 };
            all.push(
                Name::Diattenuation,
                sign * x[1].sin(),
                &[(1, sign * x[1].cos())],
            );
            all.push(Name::Axis, quarter(x[2], turned), &[(2, 1.0)]);
        }
        Model::AlignedDiattenuatingRetarder => {
            transmittance(&mut all);
            let turned = x[1].sin() < 0.0;
            let sign = if turned { -1.0 } else { 1.0 };
            // A negative cosine is half a wave more.
            let half = if x[1].cos() < 0.0 { PI } else { 0.0 };
            all.push(
                Name::Diattenuation,
                sign * x[1].sin(),
                &[(1, sign * x[1].cos())],
            );
            all.push(
                Name::Retardance,
                within_turn(sign * (x[2] + half)),
                &[(2, sign)],
            );
            all.push(Name::Axis, quarter(x[3], turned), &[(3, 1.0)]);
        }
        Model::EllipticalRetarder => {
            transmittance(&mut all);
            let vector = Vector3::new(x[1], x[2], x[3]);
            let length = vector.norm();
            // The same retarder with the shortest vector.
            let turns = (length / TAU).round();
            let factor = if length > 0.0 {
                1.0 - turns * TAU / length
            } else {
                1.0
            };
            for k in 0..3 {
                let slopes: Vec<_> = (0..3)
                    .map(|i| {
                        let along = if length > 0.0 {
                            turns * TAU * vector[k] * vector[i] / length.powi(3)
                        } else {
                            0.0
                        };
                        (1 + i, along + if i == k { factor } else { 0.0 })
                    })
                    .collect();
                all.push(Name::RetarderVector(k), factor * vector[k], &slopes);
            }
        }
        Model::EllipticalDiattenuator => {
            transmittance(&mut all);
            let vector = Vector3::new(x[1], x[2], x[3]);
            let length = vector.norm().max(f64::MIN_POSITIVE);
            let (sine, cosine) = if shape.is_polarizer {
                (1.0, 0.0)
            } else {
                length.sin_cos()
            };
            let ratio = if length > 1e-8 { sine / length } else { 1.0 };
            for k in 0..3 {
                let slopes: Vec<_> = (0..3)
                    .map(|i| {
                        let along = if length > 1e-8 {
                            (cosine - ratio) * vector[k] * vector[i] / (length * length)
                        } else {
                            0.0
                        };
                        (1 + i, along + if i == k { ratio } else { 0.0 })
                    })
                    .collect();
                all.push(Name::DiattenuationVector(k), ratio * vector[k], &slopes);
            }
        }
        _ if shape.model.rank() == Some(1) => jones(&mut all, shape, &x[..own], unit),
        _ => {}
    }
    match shape.model {
        Model::PureLinearCircular => {
            let (l, c) = (x[own], x[own + 1]);
            // Only the sizes and the sign of the product are determined.
            all.push(Name::DepolarizationLinear, l.abs(), &[(own, l.signum())]);
            all.push(Name::DepolarizationCircular, c, &[(own + 1, 1.0)]);
        }
        Model::PureDiagonal => {
            let signs = [0, 1, 2].map(|k| x[own + k].signum());
            for k in 0..3 {
                let sign = if k < 2 { signs[k] } else { signs[0] * signs[1] };
                all.push(
                    Name::Depolarization(k),
                    sign * x[own + k],
                    &[(own + k, sign)],
                );
            }
        }
        _ if own < count => all.push(Name::Alpha, x[own], &[(own, 1.0)]),
        _ => {}
    }
    let rows = all.names.len();
    all.derivatives = all.derivatives.rows(0, rows).into_owned();
    all
}

/// The seven numbers of a Jones matrix whose largest entry is real and positive.
fn jones(all: &mut Reported, shape: &Shape, own: &[f64], unit: f64) {
    let [entries] = columns_of(own, 1, &shape.pivots)[..] else {
        return;
    };
    let places = places_of(1, &shape.pivots);
    let scale = unit.sqrt();
    let largest = (0..4).fold(0, |best, k| {
        if entries[k].norm() > entries[best].norm() * (1.0 + 1e-12) {
            k
        } else {
            best
        }
    });
    let reference = entries[largest];
    if reference.norm() == 0.0 {
        return;
    }
    let turn = reference.conj() / reference.norm();
    for (row, entry_value) in entries.into_iter().enumerate() {
        let value = entry_value * turn;
        let slopes: Vec<(usize, Complex64)> = places
            .iter()
            .enumerate()
            .map(|(column, &(_, entry, phase))| {
                // v e^{-iφ}, φ the argument of the largest entry.
                let angle = if entry == largest {
                    (phase / reference).im
                } else {
                    0.0
                };
                let own = if entry == row { phase } else { Complex64::ZERO };
                (column, (own - Complex64::I * entry_value * angle) * turn)
            })
            .collect();
        let part = |take: fn(&Complex64) -> f64| -> Vec<(usize, f64)> {
            slopes
                .iter()
                .map(|(column, slope)| (*column, scale * take(slope)))
                .collect()
        };
        all.push(Name::Jones(row, true), scale * value.re, &part(|z| z.re));
        if row != largest {
            all.push(Name::Jones(row, false), scale * value.im, &part(|z| z.im));
        }
    }
}

/// δ in [0, π] with the axis that goes with it, and the sign of the change.
fn folded(retardance: f64, axis: f64) -> (f64, f64, f64) {
    let retardance = within_turn(retardance);
    if retardance < 0.0 {
        (-retardance, quarter(axis, true), -1.0)
    } else {
        (retardance, quarter(axis, false), 1.0)
    }
}

/// In (-π, π].
fn within_turn(angle: f64) -> f64 {
    let rest = angle - TAU * (angle / TAU).round();
    if rest <= -PI { rest + TAU } else { rest }
}

fn quarter(axis: f64, turned: bool) -> f64 {
    half_turn(if turned { axis + FRAC_PI_2 } else { axis })
}
