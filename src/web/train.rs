//! Trains of elements, as JavaScript sees them.

use std::f64::consts::FRAC_PI_2;

use serde::Serialize;
use serde_json::Value;
use wasm_bindgen::prelude::*;

use super::convert::{NoteTwin, to_js};
use super::drawing::StateTwin;
use super::request::{ConventionRead, measurement_of, plain};
use super::{JsResult, thrown};
use crate::convention::{Convention, ZeroAngle};
use crate::error::{Error, Note, Place, Result};
use crate::json::Fields;
use crate::link::name_with_unit;
use crate::mueller::Mueller;
use crate::noise::Measurement;
use crate::state::Stokes;
use crate::train::{
    self, Definition, DirectWeight, Element, FitOptions, Followed, Kind, Parameter, ParameterPlace,
    Quantity, Removal, Removed, Role, Stop, Symmetry, SymmetryTest, Train, TrainFit,
};

/// The members of a measurement.
const MEASUREMENT: [&str; 5] = ["mueller", "normalised", "absolute", "convention", "noise"];

/// Follows a state through a train.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(unchecked_return_type = "Followed")]
pub fn follow(
    #[wasm_bindgen(unchecked_param_type = "FollowRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| follow_request(&request));
    let (source, train, convention) = thrown(request)?;
    let found = train::follow(&source, &train).map_err(|error| placed(error, "train", &train));
    to_js(&FollowedTwin::new(&thrown(found)?, &convention))
}

/// Takes known optics away from a measurement.
///
/// # Errors
/// For a request that is not understood, and for optics that can't be taken away, at
/// their place.
#[wasm_bindgen(js_name = removeOptics, unchecked_return_type = "RemovedOptics")]
pub fn remove_optics(
    #[wasm_bindgen(unchecked_param_type = "RemoveRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| RemoveRequest::of(&request));
    to_js(&thrown(request.and_then(|request| request.answer()))?)
}

/// Fits the free parameters of a train to a measured matrix.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(js_name = fitTrain, unchecked_return_type = "TrainFit")]
pub fn fit_train(
    #[wasm_bindgen(unchecked_param_type = "FitTrainRequest")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| fit_request(&request));
    let (target, convention, train, options) = thrown(request)?;
    let found =
        train::fit_train(&target, &train, options).map_err(|error| placed(error, "train", &train));
    to_js(&FitTwin::new(&thrown(found)?, &convention))
}

/// Tests the symmetries that a sample may have.
///
/// # Errors
/// For a request that is not understood, at its field.
#[wasm_bindgen(unchecked_return_type = "SymmetryTest[]")]
pub fn symmetries(
    #[wasm_bindgen(unchecked_param_type = "Measurement")] request: &JsValue,
) -> JsResult {
    let request = plain(request).and_then(|request| {
        let fields = Fields::of(&request, "", &MEASUREMENT)?;
        measurement_of(&fields)
    });
    let (measurement, _) = thrown(request)?;
    let tests = thrown(train::symmetries(&measurement))?;
    to_js(&tests.iter().map(SymmetryTwin::from).collect::<Vec<_>>())
}

/// How a parameter as the person writes it becomes the engine's: `slope · x + shift`.
pub(super) struct Scale {
    pub slope: f64,
    pub shift: f64,
}

impl Scale {
    pub fn of(definition: &Definition, convention: &Convention) -> Self {
        let quantity = definition.quantity;
        let shift = match convention.zero_angle {
            ZeroAngle::Y if quantity == Quantity::Azimuth => FRAC_PI_2,
            _ => 0.0,
        };
        let unit = if quantity.is_angle() {
            1.0_f64.to_radians()
        } else {
            1.0
        };
        Self {
            slope: quantity.sign(convention) * unit,
            shift,
        }
    }

    pub fn inward(&self, value: f64) -> f64 {
        self.slope * value + self.shift
    }

    pub fn outward(&self, value: f64) -> f64 {
        (value - self.shift) / self.slope
    }
}

/// The train at a member of a request; none is an empty one.
pub(super) fn train_of(fields: &Fields, name: &str, convention: &Convention) -> Result<Train> {
    let items = match fields.get(name) {
        None => &[],
        Some(Value::Array(items)) => items.as_slice(),
        Some(_) => {
            return Err(fields.error(
                "bad-request",
                name,
                &format!("'{name}' must be a list of elements."),
            ));
        }
    };
    let path = fields.path(name);
    let kinds = kinds_of(items, &path)?;
    let elements = items
        .iter()
        .enumerate()
        .map(|(k, item)| element_of(item, &format!("{path}[{k}]"), &kinds, convention))
        .collect::<Result<Vec<_>>>()?;
    Train::new(elements.clone()).map_err(|error| {
        let kinds: Vec<Kind> = elements.iter().map(Element::kind).collect();
        outer_place(error, &path, &kinds)
    })
}

/// One side of the sample: a train, or a measurement of the whole side.
fn side_of(fields: &Fields, name: &str, convention: &Convention) -> Result<Train> {
    match fields.get(name) {
        Some(Value::Object(_)) => {
            let inner = fields.required(name, fields.object(name, &MEASUREMENT)?)?;
            let (measurement, _) =
                measurement_of(&inner).map_err(|error| below(error, &fields.path(name)))?;
            Ok(Train::of_one(Element::measured(measurement)))
        }
        _ => train_of(fields, name, convention),
    }
}

fn kinds_of(items: &[Value], path: &str) -> Result<Vec<Kind>> {
    let choices = Kind::ALL.map(|kind| (kind.name(), kind));
    items
        .iter()
        .enumerate()
        .map(|(k, item)| {
            let known = ["kind", "label", "disabled", "parameters", "measurement"];
            let fields = Fields::of(item, &format!("{path}[{k}]"), &known)?;
            fields.required("kind", fields.choice("kind", &choices)?)
        })
        .collect()
}

fn element_of(
    item: &Value,
    path: &str,
    kinds: &[Kind],
    convention: &Convention,
) -> Result<Element> {
    let known = ["kind", "label", "disabled", "parameters", "measurement"];
    let fields = Fields::of(item, path, &known)?;
    let choices = Kind::ALL.map(|kind| (kind.name(), kind));
    let kind = fields.required("kind", fields.choice("kind", &choices)?)?;
    let names: Vec<String> = kind.definitions().iter().map(name_with_unit).collect();
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    let parameters = fields.object("parameters", &names)?;
    let element = if kind == Kind::Measured {
        let inner = fields.required("measurement", fields.object("measurement", &MEASUREMENT)?)?;
        let read = measurement_of(&inner).map_err(|error| below(error, &inner.path("")))?;
        Element::measured(read.0)
    } else {
        if fields.get("measurement").is_some() {
            return Err(fields.error(
                "unknown-field",
                "measurement",
                "Only an element of the kind 'measured' has a measurement.",
            ));
        }
        let parameters = fields.required("parameters", parameters)?;
        let read = kind
            .definitions()
            .iter()
            .zip(&names)
            .map(|(definition, name)| {
                parameter_of(&parameters, name, definition, kinds, convention)
            })
            .collect::<Result<Vec<_>>>()?;
        Element::new(kind, read).map_err(|error| error.at_field(path))?
    };
    let disabled = fields.flag("disabled")?.unwrap_or_default();
    Ok(match fields.text("label")? {
        Some(label) => element.labelled(label),
        None => element,
    }
    .set_disabled(disabled))
}

fn parameter_of(
    parameters: &Fields,
    name: &str,
    definition: &Definition,
    kinds: &[Kind],
    convention: &Convention,
) -> Result<Parameter> {
    let known = ["value", "free", "low", "high", "tie"];
    let fields = parameters.required(name, parameters.object(name, &known)?)?;
    let scale = Scale::of(definition, convention);
    let free = fields.flag("free")?.unwrap_or_default();
    let (low, high) = (fields.number("low")?, fields.number("high")?);
    let tie = fields.object("tie", &["element", "name", "factor", "offset"])?;
    let value = fields.number("value")?;
    let Some(tie) = tie else {
        let value = scale.inward(fields.required("value", value)?);
        let (low, high) = (low.map(|x| scale.inward(x)), high.map(|x| scale.inward(x)));
        let (low, high) = if scale.slope < 0.0 {
            (high, low)
        } else {
            (low, high)
        };
        let role = if free {
            Role::Free { low, high }
        } else {
            Role::Fixed
        };
        return Ok(Parameter { value, role });
    };
    if free {
        return Err(fields.error(
            "bad-tie",
            "free",
            "A parameter is either free or tied, not both.",
        ));
    }
    let element = tie.required("element", tie.whole("element")?)?;
    let element = usize::try_from(element).unwrap_or(usize::MAX);
    let other = tie.required("name", tie.text("name")?)?;
    let found = kinds
        .get(element)
        .and_then(|kind| {
            kind.definitions()
                .iter()
                .enumerate()
                .find(|(_, definition)| name_with_unit(definition) == other)
        })
        .ok_or_else(|| {
            tie.error(
                "bad-tie",
                "name",
                "There is no such parameter to be tied to.",
            )
        })?;
    // As the person writes both: y = factor · x + offset.
    let factor = tie.number("factor")?.unwrap_or(1.0);
    let offset = tie.number("offset")?.unwrap_or(0.0);
    let other = Scale::of(found.1, convention);
    Ok(Parameter {
        value: scale.inward(value.unwrap_or_default()),
        role: Role::Tied {
            element,
            parameter: found.0,
            factor: scale.slope * factor / other.slope,
            offset: scale.slope * (offset - factor * other.shift / other.slope) + scale.shift,
        },
    })
}

/// An engine's error at a path such as `[2].parameters.axis`, at that of the request.
fn outer_place(error: Error, path: &str, kinds: &[Kind]) -> Error {
    let Some(Place::Field(field)) = error.at.clone() else {
        return error.at_field(path);
    };
    let mut field = field;
    if let Some((front, name)) = field.split_once(".parameters.") {
        let (name, rest) = name.split_once('.').unwrap_or((name, ""));
        let element: Option<usize> = front
            .trim_start_matches(|letter| letter != '[')
            .trim_matches(['[', ']'])
            .parse()
            .ok();
        let definition = element
            .and_then(|k| kinds.get(k))
            .and_then(|kind| kind.definitions().iter().find(|one| one.name == name));
        let outer = definition.map_or_else(|| name.to_owned(), name_with_unit);
        let dot = if rest.is_empty() { "" } else { "." };
        field = format!("{front}.parameters.{outer}{dot}{rest}");
    }
    if field.starts_with('[') {
        field = format!("{path}{field}");
    }
    error.at_field(field)
}

fn placed(error: Error, path: &str, train: &Train) -> Error {
    match &error.at {
        Some(Place::Field(field)) if !field.starts_with('[') => error,
        _ => {
            let kinds: Vec<Kind> = train.elements().iter().map(Element::kind).collect();
            outer_place(error, path, &kinds)
        }
    }
}

/// An error of a part of the request, at its place in the whole.
fn below(error: Error, path: &str) -> Error {
    let path = path.trim_end_matches('.');
    match error.at.clone() {
        Some(Place::Field(field)) if field.starts_with(path) => error,
        Some(Place::Field(field)) => error.at_field(format!("{path}.{field}")),
        _ => error.at_field(path),
    }
}

fn follow_request(request: &Value) -> Result<(Stokes, Train, Convention)> {
    let fields = Fields::of(request, "", &["source", "train", "convention"])?;
    let convention = ConventionRead::of(&fields)?.convention;
    let source = fields.required("source", fields.numbers("source")?)?;
    let source = Stokes::new(source).map_err(|error| error.at_field("source"))?;
    let train = train_of(&fields, "train", &convention)?;
    Ok((convention.stokes(&source), train, convention))
}

#[derive(Serialize)]
struct FollowedTwin {
    states: Vec<StepTwin>,
    mueller: [f64; 16],
    notes: Vec<NoteTwin>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct StepTwin {
    stokes: [f64; 4],
    degree: Option<f64>,
    azimuth_deg: Option<f64>,
    ellipticity_deg: Option<f64>,
    power: f64,
}

impl FollowedTwin {
    fn new(found: &Followed, convention: &Convention) -> Self {
        Self {
            states: found
                .steps
                .iter()
                .map(|step| {
                    let state = StateTwin::new(&step.stokes, convention);
                    StepTwin {
                        stokes: state.stokes,
                        degree: state.degree,
                        azimuth_deg: state.azimuth_deg,
                        ellipticity_deg: state.ellipticity_deg,
                        power: step.power,
                    }
                })
                .collect(),
            mueller: convention.mueller(&found.mueller).row_major(),
            notes: found
                .notes
                .iter()
                .map(|note| NoteTwin::from(&in_train(note)))
                .collect(),
        }
    }
}

/// A note at an element, at its path in the request.
fn in_train(note: &Note) -> Note {
    let mut note = note.clone();
    if let Some(Place::Field(field)) = &mut note.at {
        *field = format!("train{field}");
    }
    note
}

fn fit_request(request: &Value) -> Result<(Measurement, Convention, Train, FitOptions)> {
    let fields = Fields::of(request, "", &["target", "train", "seed", "starts"])?;
    let target = fields.required("target", fields.object("target", &MEASUREMENT)?)?;
    let (measurement, convention) =
        measurement_of(&target).map_err(|error| below(error, "target"))?;
    let train = train_of(&fields, "train", &convention)?;
    let options = FitOptions {
        seed: fields.whole("seed")?.unwrap_or(1),
        starts: fields
            .whole("starts")?
            .map(|starts| usize::try_from(starts).unwrap_or(usize::MAX)),
    };
    Ok((measurement, convention, train, options))
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct FitTwin {
    parameters: Vec<ParameterTwin>,
    covariance: Vec<Vec<Option<f64>>>,
    correlation: Vec<Vec<Option<f64>>>,
    null_directions: Vec<NullTwin>,
    equivalents: Vec<EquivalentTwin>,
    chi_square: Option<f64>,
    degrees_of_freedom: u32,
    p_value: Option<f64>,
    aic: Option<f64>,
    bic: Option<f64>,
    mueller: [f64; 16],
    residuals: Option<[f64; 16]>,
    stop: &'static str,
    evaluations: usize,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct ParameterTwin {
    element: usize,
    name: String,
    title: String,
    value: f64,
    se: Option<f64>,
    low: Option<f64>,
    high: Option<f64>,
    unit: &'static str,
    at_bound: bool,
    reason: Option<&'static str>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct NullTwin {
    /// Positions in the list of parameters.
    parameters: Vec<usize>,
    directions: Vec<Vec<f64>>,
    within_noise: bool,
    sentence: String,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct EquivalentTwin {
    values: Vec<f64>,
    chi_square_difference: f64,
    sentence: String,
}

impl FitTwin {
    fn new(fit: &TrainFit, convention: &Convention) -> Self {
        let definitions: Vec<&Definition> = fit
            .parameters
            .iter()
            .filter_map(|one| fit.train.definition(one.place))
            .collect();
        let scales: Vec<Scale> = definitions
            .iter()
            .map(|definition| Scale::of(definition, convention))
            .collect();
        // An azimuth without bounds lies in [0, 180), as everywhere else.
        let wraps = |k: usize| {
            let place = fit.parameters[k].place;
            definitions[k].quantity == Quantity::Azimuth
                && fit.train.elements()[place.element].parameters()[place.parameter].role
                    == Role::Free {
                        low: None,
                        high: None,
                    }
        };
        let shift = |k: usize, value: f64| {
            let outer = scales[k].outward(value);
            if wraps(k) {
                let wrapped = outer.rem_euclid(180.0);
                (if wrapped >= 180.0 { 0.0 } else { wrapped }) - outer
            } else {
                0.0
            }
        };
        let signs = convention.element_signs();
        let position =
            |place: &ParameterPlace| fit.parameters.iter().position(|one| one.place == *place);
        Self {
            parameters: fit
                .parameters
                .iter()
                .enumerate()
                .map(|(k, one)| {
                    let shift = shift(k, one.value);
                    let outer = |value: Option<f64>| value.map(|x| scales[k].outward(x) + shift);
                    let (low, high) = (outer(one.low), outer(one.high));
                    let (low, high) = if scales[k].slope < 0.0 {
                        (high, low)
                    } else {
                        (low, high)
                    };
                    ParameterTwin {
                        element: one.place.element,
                        name: name_with_unit(definitions[k]),
                        title: fit.train.title(one.place),
                        value: scales[k].outward(one.value) + shift,
                        se: one.se.map(|se| se / scales[k].slope.abs()),
                        low,
                        high,
                        unit: if definitions[k].quantity.is_angle() {
                            "deg"
                        } else {
                            "1"
                        },
                        at_bound: one.at_bound,
                        reason: one.reason,
                    }
                })
                .collect(),
            covariance: scaled(&fit.covariance, |i, j| {
                1.0 / (scales[i].slope * scales[j].slope)
            }),
            correlation: scaled(&fit.correlation, |i, j| {
                (scales[i].slope * scales[j].slope).signum()
            }),
            null_directions: fit
                .null_directions
                .iter()
                .map(|one| {
                    let parameters: Vec<usize> = one.places.iter().filter_map(position).collect();
                    let outer = |direction: &Vec<f64>| {
                        direction
                            .iter()
                            .zip(&parameters)
                            .map(|(part, &k)| part / scales[k].slope)
                            .collect()
                    };
                    NullTwin {
                        directions: one.directions.iter().map(outer).collect(),
                        within_noise: one.within_noise,
                        sentence: one.sentence(convention),
                        parameters,
                    }
                })
                .collect(),
            equivalents: fit
                .equivalents
                .iter()
                .map(|one| EquivalentTwin {
                    values: one
                        .values
                        .iter()
                        .enumerate()
                        .map(|(k, &value)| scales[k].outward(value) + shift(k, value))
                        .collect(),
                    chi_square_difference: one.chi_square_difference,
                    sentence: one.sentence.clone(),
                })
                .collect(),
            chi_square: fit.chi_square,
            degrees_of_freedom: fit.degrees_of_freedom,
            p_value: fit.p_value,
            aic: fit.aic,
            bic: fit.bic,
            mueller: convention.mueller(&fit.mueller).row_major(),
            residuals: fit
                .residuals
                .map(|residuals| std::array::from_fn(|k| signs[k] * residuals[k])),
            stop: match fit.stop {
                Stop::Gradient => "gradient",
                Stop::Step => "step",
                Stop::Decrease => "decrease",
                Stop::Steps => "steps",
            },
            evaluations: fit.evaluations,
        }
    }
}

fn scaled(
    matrix: &[Vec<Option<f64>>],
    factor: impl Fn(usize, usize) -> f64,
) -> Vec<Vec<Option<f64>>> {
    matrix
        .iter()
        .enumerate()
        .map(|(i, row)| {
            row.iter()
                .enumerate()
                .map(|(j, entry)| entry.map(|entry| entry * factor(i, j)))
                .collect()
        })
        .collect()
}

struct RemoveRequest {
    measured: Measurement,
    convention: Convention,
    pre: Train,
    post: Train,
    reflection: bool,
    direct: Option<Mueller>,
}

impl RemoveRequest {
    fn of(request: &Value) -> Result<Self> {
        let known = ["measured", "pre", "post", "reflection", "direct"];
        let fields = Fields::of(request, "", &known)?;
        let measured = fields.required("measured", fields.object("measured", &MEASUREMENT)?)?;
        let (measurement, convention) =
            measurement_of(&measured).map_err(|error| below(error, "measured"))?;
        let direct = fields
            .numbers::<16>("direct")?
            .map(|elements| {
                let read = Mueller::from_row_major(&elements);
                read.map(|mueller| convention.mueller(&mueller))
                    .map_err(|error| error.at_field("direct"))
            })
            .transpose()?;
        Ok(Self {
            measured: measurement,
            convention,
            pre: side_of(&fields, "pre", &convention)?,
            post: side_of(&fields, "post", &convention)?,
            reflection: fields.flag("reflection")?.unwrap_or_default(),
            direct,
        })
    }

    fn answer(&self) -> Result<RemovedTwin> {
        let removed = train::remove_optics(&Removal {
            measured: &self.measured,
            pre: &self.pre,
            post: &self.post,
            reflection: self.reflection,
        })
        .map_err(|error| match &error.at {
            Some(Place::Field(field)) if field.starts_with("post") => {
                placed(error, "post", &self.post)
            }
            _ => placed(error, "pre", &self.pre),
        })?;
        let direct = match (&self.direct, &removed.measurement) {
            (Some(component), Some(sample)) => match train::direct_weight(sample, component) {
                // The rest of the answer stands.
                Err(error) if error.code == "no-convergence" => None,
                found => Some(found?),
            },
            _ => None,
        };
        Ok(RemovedTwin::new(&removed, direct, &self.convention))
    }
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct RemovedTwin {
    mueller: [f64; 16],
    covariance: Option<Vec<f64>>,
    normalised: bool,
    condition_number: f64,
    sigma_growth: Option<[f64; 16]>,
    samples: Vec<SampleTwin>,
    direct: Option<DirectTwin>,
    reason: Option<&'static str>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct SampleTwin {
    model: &'static str,
    mueller: [f64; 16],
    chi_square: Option<f64>,
    degrees_of_freedom: Option<u32>,
    p_value: Option<f64>,
    alpha: Option<f64>,
    alpha_se: Option<f64>,
    distance: f64,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct DirectTwin {
    weight: f64,
    se: Option<f64>,
    rank: usize,
    reason: Option<&'static str>,
}

impl RemovedTwin {
    fn new(removed: &Removed, direct: Option<DirectWeight>, convention: &Convention) -> Self {
        let signs = convention.element_signs();
        Self {
            mueller: convention.mueller(&removed.mueller).row_major(),
            covariance: removed.covariance.as_ref().map(|values| {
                let sign = |k: usize| signs[k / 16] * signs[k % 16];
                (0..256).map(|k| sign(k) * values[k]).collect()
            }),
            normalised: removed.m00_is_exact,
            condition_number: removed.condition_number,
            sigma_growth: removed.sigma_growth,
            samples: removed
                .samples
                .iter()
                .map(|sample| SampleTwin {
                    model: sample.model,
                    mueller: convention.mueller(&sample.mueller).row_major(),
                    chi_square: sample.chi_square,
                    degrees_of_freedom: sample.degrees_of_freedom,
                    p_value: sample.p_value,
                    alpha: sample.alpha,
                    alpha_se: sample.alpha_se,
                    distance: sample.distance,
                })
                .collect(),
            direct: direct.map(|found| DirectTwin {
                weight: found.weight,
                se: found.se,
                rank: found.rank,
                reason: match found {
                    DirectWeight { weight, .. } if weight <= 0.0 => {
                        Some("the state of the component is not part of the sample")
                    }
                    DirectWeight { se: None, rank, .. } if rank < 4 => {
                        Some("the sample has fewer than four parts beyond its noise")
                    }
                    DirectWeight { se: None, .. } => Some("no noise is stated"),
                    _ => None,
                },
            }),
            reason: removed
                .measurement
                .is_none()
                .then_some("the covariance is too singular for a statement of noise"),
        }
    }
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct SymmetryTwin {
    symmetry: &'static str,
    deviation: Option<f64>,
    chi_square: Option<f64>,
    degrees_of_freedom: u32,
    p_value: Option<f64>,
    reason: Option<&'static str>,
}

impl From<&SymmetryTest> for SymmetryTwin {
    fn from(test: &SymmetryTest) -> Self {
        Self {
            symmetry: match test.symmetry {
                Symmetry::ReciprocalSameFrame => "reciprocalSameFrame",
                Symmetry::ReciprocalMirrored => "reciprocalMirrored",
                Symmetry::NoCircularPart => "noCircularPart",
                Symmetry::BlockDiagonal => "blockDiagonal",
            },
            deviation: test.deviation,
            chi_square: test.chi_square,
            degrees_of_freedom: test.degrees_of_freedom,
            p_value: test.p_value,
            reason: test
                .chi_square
                .is_none()
                .then_some("no noise is stated, or the elements are exact"),
        }
    }
}
