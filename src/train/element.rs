use std::f64::consts::FRAC_PI_2;

use nalgebra::{Matrix3, Matrix4, Vector3};
use num_complex::Complex64;

use super::{Definition, Kind};
use crate::error::{Error, Result};
use crate::mueller::{Interface, Mueller, elements};
use crate::noise::Measurement;

/// A transmittance below this has no derivative of its square root worth having.
const LEAST_POWER: f64 = 1e-30;

/// What may become of a parameter in a fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Role {
    /// It stays.
    Fixed,
    /// It is fitted, from its value on.
    Free {
        /// It does not go below.
        low: Option<f64>,
        /// It does not go above.
        high: Option<f64>,
    },
    /// It follows another one: `factor · other + offset`.
    Tied {
        /// Position of the other element in the train.
        element: usize,
        /// Position of the parameter in that element.
        parameter: usize,
        /// Not zero.
        factor: f64,
        /// In the unit of this parameter.
        offset: f64,
    },
}

/// A value and its role.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Parameter {
    /// In radians where it is an angle; a tied one has that of its tie instead.
    pub value: f64,
    /// What a fit does with it.
    pub role: Role,
}

impl Parameter {
    /// One that stays.
    #[must_use]
    pub fn fixed(value: f64) -> Self {
        Self {
            value,
            role: Role::Fixed,
        }
    }

    /// One that is fitted, without bounds but those of its kind.
    #[must_use]
    pub fn free(value: f64) -> Self {
        Self {
            value,
            role: Role::Free {
                low: None,
                high: None,
            },
        }
    }
}

/// An element of a train.
#[derive(Debug, Clone, PartialEq)]
pub struct Element {
    kind: Kind,
    label: Option<String>,
    disabled: bool,
    parameters: Vec<Parameter>,
    measurement: Option<Measurement>,
}

impl Element {
    /// Of a kind with parameters, in the order of [`Kind::definitions`].
    ///
    /// # Errors
    /// `bad-parameter` for another number of them.
    pub fn new(kind: Kind, parameters: Vec<Parameter>) -> Result<Self> {
        if kind == Kind::Measured || parameters.len() != kind.definitions().len() {
            return Err(Error::new(
                "bad-parameter",
                format!(
                    "The {} has {} parameters.",
                    kind.words(),
                    kind.definitions().len()
                ),
            ));
        }
        Ok(Self {
            kind,
            label: None,
            disabled: false,
            parameters,
            measurement: None,
        })
    }

    /// One whose matrix was measured.
    #[must_use]
    pub fn measured(measurement: Measurement) -> Self {
        Self {
            kind: Kind::Measured,
            label: None,
            disabled: false,
            parameters: Vec::new(),
            measurement: Some(measurement),
        }
    }

    /// The same element with a name of its own.
    #[must_use]
    pub fn labelled(mut self, label: impl Into<String>) -> Self {
        self.label = Some(label.into());
        self
    }

    /// The same element, taken out of the beam or put back.
    #[must_use]
    pub fn set_disabled(mut self, disabled: bool) -> Self {
        self.disabled = disabled;
        self
    }

    /// What it is.
    #[must_use]
    pub fn kind(&self) -> Kind {
        self.kind
    }

    /// The name that a person gave it.
    #[must_use]
    pub fn label(&self) -> Option<&str> {
        self.label.as_deref()
    }

    /// Whether it stands outside of the beam.
    #[must_use]
    pub fn disabled(&self) -> bool {
        self.disabled
    }

    /// In the order of [`Kind::definitions`].
    #[must_use]
    pub fn parameters(&self) -> &[Parameter] {
        &self.parameters
    }

    /// Of a measured one.
    #[must_use]
    pub fn measurement(&self) -> Option<&Measurement> {
        self.measurement.as_ref()
    }

    /// Its name in a sentence; `position` counts from zero.
    #[must_use]
    pub fn title(&self, position: usize) -> String {
        let name = self.label().filter(|label| !label.trim().is_empty());
        format!(
            "{} (element {})",
            name.unwrap_or(self.kind.words()),
            position + 1
        )
    }

    pub(super) fn set_value(&mut self, parameter: usize, value: f64) {
        if let Some(parameter) = self.parameters.get_mut(parameter) {
            parameter.value = value;
        }
    }

    pub(super) fn definitions(&self) -> &'static [Definition] {
        self.kind.definitions()
    }

    /// Its matrix with these values of its parameters.
    ///
    /// The two transmittances of a linear diattenuator may stand in either order here: a
    /// fit passes through both.
    ///
    /// # Errors
    /// `bad-parameter` at the parameter, and those of [`Interface::transmission`].
    pub(super) fn matrix(&self, values: &[f64]) -> Result<Mueller> {
        match (self.kind, values) {
            (Kind::LinearDiattenuator, &[max, min, axis]) if max < min => {
                elements::linear_diattenuator(min, max, axis + FRAC_PI_2)
            }
            (Kind::LinearDiattenuator, &[max, min, axis]) => {
                elements::linear_diattenuator(max, min, axis)
            }
            (Kind::LinearRetarder, &[retardance, axis]) => {
                elements::linear_retarder(retardance, axis)
            }
            (Kind::CircularRetarder, &[retardance]) => elements::circular_retarder(retardance),
            (Kind::EllipticalRetarder, &[retardance, azimuth, ellipticity]) => {
                elements::elliptical_retarder(retardance, azimuth, ellipticity)
            }
            (
                Kind::EllipticalDiattenuator,
                &[transmittance, diattenuation, azimuth, ellipticity],
            ) => {
                if !(0.0..=1.0).contains(&diattenuation) {
                    return Err(bad(
                        "diattenuation",
                        "The diattenuation must lie between 0 and 1.",
                    ));
                }
                // Checks azimuth and ellipticity too.
                elements::elliptical_retarder(0.0, azimuth, ellipticity)?;
                let vector = direction(azimuth, ellipticity) * diattenuation;
                elements::elliptical_diattenuator(transmittance, vector.into())
            }
            (
                Kind::AlignedDiattenuatingRetarder,
                &[transmittance, diattenuation, retardance, axis],
            ) => elements::aligned_diattenuating_retarder(
                transmittance,
                diattenuation,
                retardance,
                axis,
            ),
            (Kind::Rotator, &[angle]) => elements::rotator(angle),
            (Kind::IsotropicReflector, &[psi, delta, reflectance, plane]) => {
                elements::isotropic_reflector(psi, delta, reflectance, plane)
            }
            (Kind::FresnelReflection, &[before, after, absorption, incidence, plane]) => {
                let interface = Interface::new(before, after, absorption, incidence)?;
                elements::fresnel_reflection(&interface, plane)
            }
            (Kind::FresnelTransmission, &[before, after, absorption, incidence, plane]) => {
                let interface = Interface::new(before, after, absorption, incidence)?;
                elements::fresnel_transmission(&interface, plane)
            }
            (Kind::IsotropicDepolarizer, &[alpha]) => elements::isotropic_depolarizer(alpha),
            (Kind::DiagonalDepolarizer, &[d1, d2, d3]) => {
                elements::diagonal_depolarizer(d1, d2, d3)
            }
            _ => match &self.measurement {
                Some(measurement) => Ok(*measurement.mueller()),
                None => Err(bad("kind", "The parameters are not those of the element.")),
            },
        }
    }

    /// The derivative of [`Element::matrix`] with respect to one parameter.
    ///
    /// # Errors
    /// As [`Element::matrix`].
    pub(super) fn derivative(&self, values: &[f64], which: usize) -> Result<Matrix4<f64>> {
        let zero = Matrix4::zeros();
        Ok(match (self.kind, values) {
            (Kind::LinearDiattenuator, &[max, min, axis]) => match which {
                0 => diattenuator_change(min, max, 0.5).turned_by(axis),
                1 => diattenuator_change(max, min, -0.5).turned_by(axis),
                _ => turning(self.matrix(values)?.matrix()),
            },
            (Kind::LinearRetarder, &[retardance, axis]) => match which {
                0 => retarder_change(retardance, &direction(axis, 0.0)),
                _ => turning(self.matrix(values)?.matrix()),
            },
            (Kind::CircularRetarder, &[retardance]) => retarder_change(retardance, &Vector3::z()),
            (Kind::EllipticalRetarder, &[retardance, azimuth, ellipticity]) => match which {
                0 => retarder_change(retardance, &direction(azimuth, ellipticity)),
                1 => turning(self.matrix(values)?.matrix()),
                _ => {
                    let (s, c) = retardance.sin_cos();
                    let axis = direction(azimuth, ellipticity);
                    let change = direction_change(azimuth, ellipticity);
                    let outer = change * axis.transpose() + axis * change.transpose();
                    block(&(outer * (1.0 - c) - change.cross_matrix() * s))
                }
            },
            (
                Kind::EllipticalDiattenuator,
                &[transmittance, diattenuation, azimuth, ellipticity],
            ) => {
                let axis = direction(azimuth, ellipticity);
                match which {
                    0 => unit_diattenuator(diattenuation, &axis),
                    1 => unit_diattenuator_change(diattenuation, &axis) * transmittance,
                    2 => turning(self.matrix(values)?.matrix()),
                    _ => {
                        let change = direction_change(azimuth, ellipticity);
                        let outer = change * axis.transpose() + axis * change.transpose();
                        let mut matrix = block(&(outer * (1.0 - across(diattenuation))));
                        set_first(&mut matrix, &(change * diattenuation));
                        matrix * transmittance
                    }
                }
            }
            (
                Kind::AlignedDiattenuatingRetarder,
                &[transmittance, diattenuation, retardance, axis],
            ) => {
                let x = Vector3::x();
                let retarder = elements::linear_retarder(retardance, 0.0)?;
                let diattenuator = unit_diattenuator(diattenuation, &x);
                match which {
                    0 => (diattenuator * retarder.matrix()).turned_by(axis),
                    1 => {
                        let change = unit_diattenuator_change(diattenuation, &x);
                        (change * retarder.matrix() * transmittance).turned_by(axis)
                    }
                    2 => (diattenuator * retarder_change(retardance, &x) * transmittance)
                        .turned_by(axis),
                    _ => turning(self.matrix(values)?.matrix()),
                }
            }
            (Kind::Rotator, &[_]) => {
                // R(-ψ), and R(θ) = exp(2θ K).
                -2.0 * generator() * self.matrix(values)?.matrix()
            }
            (Kind::IsotropicReflector, &[psi, delta, reflectance, plane]) => {
                let ((s2, c2), (sd, cd)) = ((2.0 * psi).sin_cos(), delta.sin_cos());
                match which {
                    0 => reflector_part(0.0, -2.0 * s2, 2.0 * c2 * cd, 2.0 * c2 * sd)
                        .turned_by(plane)
                        .scaled(reflectance),
                    1 => reflector_part(0.0, 0.0, -s2 * sd, s2 * cd)
                        .turned_by(plane)
                        .scaled(reflectance),
                    2 => reflector_part(1.0, c2, s2 * cd, s2 * sd).turned_by(plane),
                    _ => turning(self.matrix(values)?.matrix()),
                }
            }
            (
                Kind::FresnelReflection | Kind::FresnelTransmission,
                &[before, after, absorption, incidence, plane],
            ) => {
                if which > 3 {
                    return Ok(turning(self.matrix(values)?.matrix()));
                }
                let interface = Interface::new(before, after, absorption, incidence)?;
                let (ratio, angle) = match which {
                    0 => (-Complex64::new(after, -absorption) / before / before, 0.0),
                    1 => (Complex64::from(1.0 / before), 0.0),
                    2 => (Complex64::new(0.0, -1.0 / before), 0.0),
                    _ => (Complex64::ZERO, 1.0),
                };
                if self.kind == Kind::FresnelReflection {
                    let change = interface.reflection_change(ratio, angle);
                    interface.reflection().mueller_change(&change)
                } else if which == 2 {
                    // Power is not defined beside an absorption of zero.
                    zero
                } else {
                    let change = interface.transmission_change(ratio, angle)?;
                    interface.transmission()?.mueller_change(&change)
                }
                .turned_by(plane)
            }
            (Kind::IsotropicDepolarizer, &[_]) => {
                Matrix4::from_diagonal(&[0.0, -1.0, -1.0, -1.0].into())
            }
            (Kind::DiagonalDepolarizer, _) => {
                let mut matrix = zero;
                if which < 3 {
                    matrix[(which + 1, which + 1)] = 1.0;
                }
                matrix
            }
            _ => zero,
        })
    }
}

trait Turn {
    /// At the azimuth θ instead of at x.
    fn turned_by(self, angle: f64) -> Self;
    fn scaled(self, factor: f64) -> Self;
}

impl Turn for Matrix4<f64> {
    fn turned_by(self, angle: f64) -> Self {
        *Mueller::from_matrix(self).turned(angle).matrix()
    }

    fn scaled(self, factor: f64) -> Self {
        self * factor
    }
}

/// K of `R(θ) = exp(2θ K)`.
fn generator() -> Matrix4<f64> {
    let mut matrix = Matrix4::zeros();
    matrix[(1, 2)] = 1.0;
    matrix[(2, 1)] = -1.0;
    matrix
}

/// The derivative of `R(-θ) M R(θ)` with respect to θ, from the turned matrix.
fn turning(turned: &Matrix4<f64>) -> Matrix4<f64> {
    (turned * generator() - generator() * turned) * 2.0
}

/// With respect to the transmittance `own`, whose half of the difference has the sign of
/// `half`.
fn diattenuator_change(other: f64, own: f64, half: f64) -> Matrix4<f64> {
    let g = 0.5 * (other / own.max(LEAST_POWER)).sqrt();
    reflector_part(0.5, -half, g, 0.0)
}

/// `[[a, -n, 0, 0], [-n, a, 0, 0], [0, 0, c, s], [0, 0, -s, c]]`.
fn reflector_part(a: f64, n: f64, c: f64, s: f64) -> Matrix4<f64> {
    Matrix4::new(
        a, -n, 0.0, 0.0, //
        -n, a, 0.0, 0.0, //
        0.0, 0.0, c, s, //
        0.0, 0.0, -s, c,
    )
}

/// The point of the Poincaré sphere.
fn direction(azimuth: f64, ellipticity: f64) -> Vector3<f64> {
    let ((s2, c2), (s3, c3)) = ((2.0 * azimuth).sin_cos(), (2.0 * ellipticity).sin_cos());
    Vector3::new(c2 * c3, s2 * c3, s3)
}

/// How it moves with the ellipticity.
fn direction_change(azimuth: f64, ellipticity: f64) -> Vector3<f64> {
    let ((s2, c2), (s3, c3)) = ((2.0 * azimuth).sin_cos(), (2.0 * ellipticity).sin_cos());
    Vector3::new(-c2 * s3, -s2 * s3, c3) * 2.0
}

fn retarder_change(retardance: f64, axis: &Vector3<f64>) -> Matrix4<f64> {
    let (s, c) = retardance.sin_cos();
    let outer = axis * axis.transpose();
    block(&((outer - Matrix3::identity()) * s - axis.cross_matrix() * c))
}

/// `sqrt(1 - D²)`.
fn across(diattenuation: f64) -> f64 {
    ((1.0 - diattenuation) * (1.0 + diattenuation))
        .max(0.0)
        .sqrt()
}

fn unit_diattenuator(diattenuation: f64, axis: &Vector3<f64>) -> Matrix4<f64> {
    *elements::unit_diattenuator(&(axis * diattenuation)).matrix()
}

fn unit_diattenuator_change(diattenuation: f64, axis: &Vector3<f64>) -> Matrix4<f64> {
    let slope = -diattenuation / across(diattenuation).max(LEAST_POWER.sqrt());
    let mut matrix = block(&((Matrix3::identity() - axis * axis.transpose()) * slope));
    set_first(&mut matrix, axis);
    matrix
}

fn block(block: &Matrix3<f64>) -> Matrix4<f64> {
    let mut matrix = Matrix4::zeros();
    matrix.fixed_view_mut::<3, 3>(1, 1).copy_from(block);
    matrix
}

/// The first row and column of a diattenuator.
fn set_first(matrix: &mut Matrix4<f64>, vector: &Vector3<f64>) {
    matrix
        .fixed_view_mut::<1, 3>(0, 1)
        .copy_from(&vector.transpose());
    matrix.fixed_view_mut::<3, 1>(1, 0).copy_from(vector);
}

fn bad(field: &'static str, sentence: &'static str) -> Error {
    Error::new("bad-parameter", sentence).at_field(field)
}
