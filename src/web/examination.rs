//! What an examination looks like from JavaScript.

use std::f64::consts::PI;

use serde::ser::SerializeMap;
use serde::{Serialize, Serializer};

use crate::coherency::{PassivityVerdict, Verdict};
use crate::convention::Convention;
use crate::decompose::{Differential, MixedComponent, PolarFactors, PureComponent};
use crate::examine::Examination;
use crate::figures::{Figure, FigureName, FigureTable, Method, Unit};
use crate::mueller::{Jones, Mueller};
use crate::noise::Measurement;

/// A request's convention, and what it does to everything that leaves.
struct Writer<'a>(&'a Convention);

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub struct ExaminationTwin {
    realizability: RealizabilityTwin,
    nearest: NearestTwin,
    figures: FiguresTwin,
    decompositions: DecompositionsTwin,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct RealizabilityTwin {
    verdict: &'static str,
    eigenvalues: Option<[f64; 4]>,
    eigenvalue_se: Option<[f64; 4]>,
    violation: Option<f64>,
    statistic: Option<f64>,
    p_value: Option<f64>,
    simulations: Option<u32>,
    reason: Option<&'static str>,
    rounding_decimals: Option<u32>,
    rounding_sigma: Option<f64>,
    consistent_with_rounding: bool,
    explaining_sigma: Option<f64>,
    stokes_condition: bool,
    stokes_margin: Option<f64>,
    passivity: Option<PassivityTwin>,
}

#[derive(Serialize)]
struct PassivityTwin {
    margin: FigureTwin,
    verdict: &'static str,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct NearestTwin {
    mueller: Option<[f64; 16]>,
    change: Option<[f64; 16]>,
    change_in_sigma: Option<[f64; 16]>,
    reason: Option<&'static str>,
}

#[derive(Serialize, Default)]
struct FigureTwin {
    value: Option<f64>,
    se: Option<f64>,
    low: Option<f64>,
    high: Option<f64>,
    method: Option<&'static str>,
    bias: Option<f64>,
    debiased: Option<f64>,
    unit: &'static str,
    reason: Option<&'static str>,
}

/// By name, in reading order.
struct FiguresTwin(Vec<(&'static str, FigureTwin)>);

impl Serialize for FiguresTwin {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(Some(self.0.len()))?;
        for (name, figure) in &self.0 {
            map.serialize_entry(name, figure)?;
        }
        map.end()
    }
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct DecompositionsTwin {
    polar_forward: Option<PolarTwin>,
    polar_reverse: Option<PolarTwin>,
    differential: Option<DifferentialTwin>,
    spectral: Vec<SpectralTwin>,
    characteristic: Vec<CharacteristicTwin>,
    isotropic: Option<IsotropicTwin>,
    reason: Option<&'static str>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct PolarTwin {
    depolarizer: Option<[f64; 16]>,
    retarder: Option<[f64; 16]>,
    diattenuator: [f64; 16],
    retarder_axis: Option<[f64; 3]>,
    residual: Option<f64>,
    reason: Option<&'static str>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct DifferentialTwin {
    mean: Option<[f64; 16]>,
    depolarizing: Option<[f64; 16]>,
    linear_birefringence: Option<f64>,
    #[serde(rename = "linearBirefringence45")]
    linear_birefringence_45: Option<f64>,
    circular_birefringence: Option<f64>,
    linear_dichroism: Option<f64>,
    #[serde(rename = "linearDichroism45")]
    linear_dichroism_45: Option<f64>,
    circular_dichroism: Option<f64>,
    reason: Option<&'static str>,
}

#[derive(Serialize)]
struct CharacteristicTwin {
    weight: f64,
    mueller: [f64; 16],
}

#[derive(Serialize)]
struct SpectralTwin {
    weight: f64,
    jones: [[f64; 2]; 4],
    mueller: [f64; 16],
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct IsotropicTwin {
    alpha: FigureTwin,
    jones: Option<[[f64; 2]; 4]>,
    mueller: [f64; 16],
    chi_square: Option<f64>,
    degrees_of_freedom: u32,
    p_value: Option<f64>,
    reason: Option<&'static str>,
}

impl ExaminationTwin {
    pub fn new(found: &Examination, measurement: &Measurement, convention: &Convention) -> Self {
        let writer = Writer(convention);
        Self {
            realizability: realizability(found),
            nearest: writer.nearest(found, measurement),
            figures: writer.figures(&found.figures),
            decompositions: writer.decompositions(found, measurement),
        }
    }
}

fn realizability(found: &Examination) -> RealizabilityTwin {
    let r = &found.realizability;
    RealizabilityTwin {
        verdict: match r.verdict {
            Verdict::Realizable => "realizable",
            Verdict::WithinNoise => "withinNoise",
            Verdict::BeyondNoise => "beyondNoise",
            Verdict::NotRealizable => "notRealizable",
        },
        eigenvalues: r.eigenvalues,
        eigenvalue_se: r.eigenvalue_se,
        violation: r.violation,
        statistic: r.significance.map(|test| test.statistic),
        p_value: r.significance.map(|test| test.p_value),
        simulations: r.significance.map(|test| test.simulations),
        reason: r.reason,
        rounding_decimals: r.rounding_decimals,
        rounding_sigma: r.rounding_sigma,
        consistent_with_rounding: r.consistent_with_rounding,
        explaining_sigma: r.explaining_sigma,
        stokes_condition: r.stokes_condition,
        stokes_margin: r.stokes_margin,
        passivity: r.passivity.map(|passivity| PassivityTwin {
            margin: FigureTwin {
                value: Some(passivity.margin),
                se: passivity.margin_se,
                low: passivity.margin_low,
                method: passivity.margin_low.map(|_| "one-sided"),
                unit: "matrix",
                reason: passivity
                    .margin_se
                    .is_none()
                    .then_some("no noise was stated"),
                ..FigureTwin::default()
            },
            verdict: match passivity.verdict {
                PassivityVerdict::Passive => "passive",
                PassivityVerdict::NotBeyondNoise => "notBeyondNoise",
                PassivityVerdict::NotPassive => "notPassive",
            },
        }),
    }
}

impl Writer<'_> {
    fn mueller(&self, mueller: &Mueller) -> [f64; 16] {
        self.0.mueller(mueller).row_major()
    }

    fn jones(&self, jones: &Jones) -> [[f64; 2]; 4] {
        self.0
            .jones(jones)
            .phase_fixed()
            .row_major()
            .map(|entry| [entry.re, entry.im])
    }

    fn nearest(&self, found: &Examination, measurement: &Measurement) -> NearestTwin {
        let nearest = found.nearest.as_ref();
        let change = nearest.map(|nearest| {
            let (to, from) = (
                self.mueller(&nearest.mueller),
                self.mueller(measurement.mueller()),
            );
            std::array::from_fn(|k| to[k] - from[k])
        });
        NearestTwin {
            mueller: nearest.map(|nearest| self.mueller(&nearest.mueller)),
            change,
            change_in_sigma: change
                .zip(measurement.element_sigma())
                .map(|(change, sigma)| {
                    std::array::from_fn(|k| {
                        if sigma[k] > 0.0 {
                            change[k] / sigma[k]
                        } else {
                            0.0
                        }
                    })
                }),
            reason: if nearest.is_none() {
                found.realizability.reason
            } else {
                (!measurement.has_noise()).then_some("no noise was stated")
            },
        }
    }

    fn figures(&self, table: &FigureTable) -> FiguresTwin {
        FiguresTwin(
            table
                .iter()
                .map(|(name, figure)| (key(name), self.figure(name.unit(), figure)))
                .collect(),
        )
    }

    fn figure(&self, unit: Unit, figure: &Figure) -> FigureTwin {
        let convert = |value: f64| match unit {
            Unit::One | Unit::Transmittance => value,
            Unit::Angle => value.to_degrees(),
            Unit::CircularSign => self.0.circular(value),
            Unit::Ellipticity => self.0.circular(value).to_degrees(),
            Unit::Azimuth => self.0.azimuth(value).to_degrees(),
            Unit::Rotation => self.0.rotation(value).to_degrees(),
        };
        let (factor, name) = match unit {
            Unit::One | Unit::CircularSign => (1.0, "1"),
            Unit::Transmittance => (1.0, "matrix"),
            _ => (180.0 / PI, "deg"),
        };
        // A convention may turn the figure over, and its ends with it. An azimuth is
        // folded, so its ends are counted from the value.
        let sense = match unit {
            Unit::Azimuth | Unit::Rotation => self.0.rotation(1.0),
            Unit::CircularSign | Unit::Ellipticity => self.0.circular(1.0),
            _ => 1.0,
        };
        let ends = figure.value.zip(figure.interval).map(|(value, interval)| {
            let end =
                |end: Option<f64>| end.map(|end| convert(value) + sense * factor * (end - value));
            let (low, high) = (end(interval.low), end(interval.high));
            if sense < 0.0 {
                (high, low)
            } else {
                (low, high)
            }
        });
        FigureTwin {
            value: figure.value.map(convert),
            se: figure.se.map(|se| se * factor),
            low: ends.and_then(|(low, _)| low),
            high: ends.and_then(|(_, high)| high),
            method: figure.interval.map(|interval| match interval.method {
                Method::FirstOrder => "first-order",
                Method::Percentile => "percentile",
                Method::NoncentralChiSquared => "noncentral",
                Method::UpperLimit => "upper-limit",
                Method::OneSided => "one-sided",
            }),
            bias: figure
                .value
                .zip(figure.debiased)
                .map(|(value, debiased)| factor * (value - debiased)),
            debiased: figure.debiased.map(|debiased| factor * debiased),
            unit: name,
            reason: figure.reason,
        }
    }

    fn decompositions(&self, found: &Examination, measurement: &Measurement) -> DecompositionsTwin {
        let alpha = found.figures.get(FigureName::IsotropicAlpha);
        DecompositionsTwin {
            polar_forward: found
                .polar_forward
                .as_ref()
                .map(|factors| self.polar(factors)),
            polar_reverse: found
                .polar_reverse
                .as_ref()
                .map(|factors| self.polar(factors)),
            differential: found
                .differential
                .as_ref()
                .map(|parts| self.differential(parts)),
            characteristic: found
                .characteristic
                .iter()
                .flatten()
                .map(|component| self.characteristic(component))
                .collect(),
            spectral: found
                .spectral
                .iter()
                .flatten()
                .map(|component| self.spectral(component))
                .collect(),
            isotropic: found.isotropic.map(|model| IsotropicTwin {
                alpha: self.figure(Unit::One, alpha),
                jones: model.jones.as_ref().map(|jones| self.jones(jones)),
                mueller: self.mueller(&model.mueller),
                chi_square: model.chi_square,
                degrees_of_freedom: model.degrees_of_freedom,
                p_value: model.p_value,
                reason: if model.jones.is_none() {
                    Some("an ideal depolarizer has no pure part")
                } else {
                    model.chi_square.is_none().then_some(if measurement.has_noise() {
                        "the closed form takes all errors as equal, so its χ² does not judge these"
                    } else {
                        "no noise was stated"
                    })
                },
            }),
            reason: alpha.value.is_none().then_some(alpha.reason).flatten(),
        }
    }

    fn polar(&self, factors: &PolarFactors) -> PolarTwin {
        PolarTwin {
            depolarizer: factors.depolarizer.map(|factor| self.mueller(&factor)),
            retarder: factors.retarder.map(|factor| self.mueller(&factor)),
            diattenuator: self.mueller(&factors.diattenuator),
            retarder_axis: factors
                .parameters
                .and_then(|parameters| parameters.axis)
                .map(|axis| self.0.axis(&axis)),
            residual: factors.residual,
            reason: factors.reason,
        }
    }

    /// The six scalars keep their meaning, such as "positive: x is fast", and not
    /// their cell of the matrix: K M K has other signs there.
    fn differential(&self, parts: &Differential) -> DifferentialTwin {
        let birefringence = parts.properties.map(|p| self.0.axis(&p.birefringence));
        let dichroism = parts.properties.map(|p| self.0.axis(&p.dichroism));
        DifferentialTwin {
            mean: parts.mean.map(|mean| self.mueller(&mean)),
            depolarizing: parts.depolarizing.map(|part| self.mueller(&part)),
            linear_birefringence: birefringence.map(|b| b[0]),
            linear_birefringence_45: birefringence.map(|b| b[1]),
            circular_birefringence: birefringence.map(|b| b[2]),
            linear_dichroism: dichroism.map(|d| d[0]),
            linear_dichroism_45: dichroism.map(|d| d[1]),
            circular_dichroism: dichroism.map(|d| d[2]),
            reason: parts.reason,
        }
    }

    fn characteristic(&self, component: &MixedComponent) -> CharacteristicTwin {
        CharacteristicTwin {
            weight: component.weight,
            mueller: self.mueller(&component.mueller),
        }
    }

    fn spectral(&self, component: &PureComponent) -> SpectralTwin {
        SpectralTwin {
            weight: component.weight,
            jones: self.jones(&component.jones),
            mueller: self.mueller(&component.mueller),
        }
    }
}

/// The name of a figure at the interface, its unit there, and what a difference of it
/// is multiplied by.
pub fn unit_of(name: FigureName, convention: &Convention) -> (&'static str, &'static str, f64) {
    let degrees = 180.0 / PI;
    let (unit, factor) = match name.unit() {
        Unit::One => ("1", 1.0),
        Unit::CircularSign => ("1", convention.circular(1.0)),
        Unit::Transmittance => ("matrix", 1.0),
        Unit::Angle => ("deg", degrees),
        Unit::Azimuth | Unit::Rotation => ("deg", convention.rotation(degrees)),
        Unit::Ellipticity => ("deg", convention.circular(degrees)),
    };
    (key(name), unit, factor)
}

/// The name of a figure at the interface.
fn key(name: FigureName) -> &'static str {
    match name {
        FigureName::Diattenuation => "diattenuation",
        FigureName::LinearDiattenuation => "linearDiattenuation",
        FigureName::CircularDiattenuation => "circularDiattenuation",
        FigureName::DiattenuationAzimuth => "diattenuationAzimuthDeg",
        FigureName::Polarizance => "polarizance",
        FigureName::LinearPolarizance => "linearPolarizance",
        FigureName::CircularPolarizance => "circularPolarizance",
        FigureName::PolarizanceAzimuth => "polarizanceAzimuthDeg",
        FigureName::TransmittanceMax => "transmittanceMax",
        FigureName::TransmittanceMin => "transmittanceMin",
        FigureName::DepolarizationIndex => "depolarizationIndex",
        FigureName::SphericalPurity => "sphericalPurity",
        FigureName::PurityIndex1 => "purityIndex1",
        FigureName::PurityIndex2 => "purityIndex2",
        FigureName::PurityIndex3 => "purityIndex3",
        FigureName::Entropy => "entropy",
        FigureName::IsotropicAlpha => "isotropicAlpha",
        FigureName::Retardance => "retardanceDeg",
        FigureName::LinearRetardance => "linearRetardanceDeg",
        FigureName::Rotation => "rotationDeg",
        FigureName::FastAxis => "fastAxisDeg",
        FigureName::RetarderAzimuth => "retarderAzimuthDeg",
        FigureName::RetarderEllipticity => "retarderEllipticityDeg",
        FigureName::DepolarizationPower => "depolarizationPower",
    }
}
