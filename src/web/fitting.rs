//! What fits of models look like from JavaScript.

use num_complex::Complex64;
use serde::Serialize;
use serde_json::Value;

use super::request::{items, measurement_of};
use crate::convention::{Convention, TimeSign};
use crate::error::Result;
use crate::fit::{
    Fit, Fitter, Model, Name, Parameter, Recommendation, Rule, Side, Stop, recommend, remarks,
};
use crate::json::Fields;
use crate::mueller::Jones;
use crate::noise::Measurement;
use crate::text::python_recipe;

/// More samples than this at once leave no chance to stop.
const MOST_SAMPLES: u64 = 10_000;

const MODELS: [(&str, Model); 12] = [
    ("linearRetarder", Model::LinearRetarder),
    ("linearDiattenuator", Model::LinearDiattenuator),
    (
        "alignedDiattenuatingRetarder",
        Model::AlignedDiattenuatingRetarder,
    ),
    ("ellipticalRetarder", Model::EllipticalRetarder),
    ("ellipticalDiattenuator", Model::EllipticalDiattenuator),
    ("pure", Model::Pure),
    ("pureIsotropic", Model::PureIsotropic),
    ("pureLinearCircular", Model::PureLinearCircular),
    ("pureDiagonal", Model::PureDiagonal),
    ("rankTwo", Model::RankTwo),
    ("rankThree", Model::RankThree),
    ("rankFour", Model::RankFour),
];

const SIDES: [(&str, Side); 3] = [
    ("parallel", Side::Parallel),
    ("after", Side::After),
    ("before", Side::Before),
];

/// What every question about fits shares.
pub struct FitRequest {
    measurement: Measurement,
    convention: Convention,
    models: Vec<Model>,
    side: Side,
    seed: u64,
}

impl FitRequest {
    /// `more`: what else the request may have.
    fn of<'a>(request: &'a Value, more: &[&str]) -> Result<(Self, Fields<'a>)> {
        let mut known = vec!["target", "side", "seed"];
        known.extend(more);
        let fields = Fields::of(request, "", &known)?;
        let target = ["mueller", "normalised", "absolute", "convention", "noise"];
        let target = fields.required("target", fields.object("target", &target)?)?;
        let (measurement, convention) = measurement_of(&target)?;
        let mut models = Vec::new();
        if more.contains(&"models") {
            for (k, item) in items(&fields, "models")?.iter().enumerate() {
                let known = MODELS.iter().find(|(name, _)| Some(*name) == item.as_str());
                models.push(known.map(|(_, model)| *model).ok_or_else(|| {
                    fields.error(
                        "bad-request",
                        &format!("models[{k}]"),
                        "There is no model of this name.",
                    )
                })?);
            }
        }
        if models.is_empty() {
            models = Model::ALL.to_vec();
        }
        Ok((
            Self {
                measurement,
                convention,
                models,
                side: fields.choice("side", &SIDES)?.unwrap_or_default(),
                seed: fields.whole("seed")?.unwrap_or(1),
            },
            fields,
        ))
    }
}

/// All models of a request, and which of them to take.
pub fn fits(request: &Value) -> Result<FitsTwin> {
    let (request, _) = FitRequest::of(request, &["models"])?;
    let fitter = Fitter::new(&request.measurement, request.seed)?;
    let mut fits = Vec::new();
    for &model in &request.models {
        fits.push(fitter.fit(model, request.side)?);
    }
    Ok(FitsTwin {
        recommended: recommend(&fits)?.map(|found| RecommendedTwin::new(&found, &fits)),
        fits: fits
            .iter()
            .map(|fit| FitTwin::new(fit, &request.convention))
            .collect(),
    })
}

/// A fit as a Python text that computes its matrix again.
pub fn recipe(request: &Value) -> Result<String> {
    let (request, fields) = FitRequest::of(request, &["model"])?;
    let model = fields.required("model", fields.choice("model", &MODELS)?)?;
    let fit = Fitter::new(&request.measurement, request.seed)?.fit(model, request.side)?;
    Ok(python_recipe(&fit, &request.convention))
}

/// The curve of χ² over one parameter.
pub fn profile(request: &Value) -> Result<ProfileTwin> {
    let (request, fields) = FitRequest::of(request, &["model", "parameter"])?;
    let model = fields.required("model", fields.choice("model", &MODELS)?)?;
    let fitter = Fitter::new(&request.measurement, request.seed)?;
    let fit = fitter.fit(model, request.side)?;
    let asked = fields.required("parameter", fields.text("parameter")?)?;
    let writer = Writer(&request.convention);
    let name = fit
        .parameters
        .iter()
        .chain(&fit.derived)
        .map(|parameter| parameter.name)
        .find(|name| writer.key(*name) == asked && !matches!(name, Name::Jones(..)))
        .ok_or_else(|| {
            fields.error(
                "bad-request",
                "parameter",
                "This fit has no such parameter.",
            )
        })?;
    let found = fitter.profile(&fit, name)?;
    let (factor, unit) = (writer.factor(name), unit_of(name));
    let written = |value: f64| match name {
        Name::Axis => request.convention.azimuth(value).to_degrees(),
        _ => factor * value,
    };
    let mut pairs: Vec<(f64, f64)> = found
        .values
        .iter()
        .map(|&value| written(value))
        .zip(found.rises)
        .collect();
    let ends = (found.low.map(written), found.high.map(written));
    let (low, high) = if factor < 0.0 { (ends.1, ends.0) } else { ends };
    pairs.sort_by(|a, b| a.0.total_cmp(&b.0));
    Ok(ProfileTwin {
        values: pairs.iter().map(|pair| pair.0).collect(),
        rises: pairs.iter().map(|pair| pair.1).collect(),
        low,
        high,
        unit,
    })
}

/// A slice of simulated measurements, fitted again.
pub fn bootstrap(request: &Value) -> Result<SamplesTwin> {
    let (request, fields) = FitRequest::of(request, &["model", "first", "count"])?;
    let model = fields.required("model", fields.choice("model", &MODELS)?)?;
    let first = fields.whole("first")?.unwrap_or_default();
    let count = fields.whole("count")?.unwrap_or(200).min(MOST_SAMPLES) as u32;
    let fitter = Fitter::new(&request.measurement, request.seed)?;
    let fit = fitter.fit(model, request.side)?;
    let found = fitter.bootstrap(&fit, first, count)?;
    let writer = Writer(&request.convention);
    Ok(SamplesTwin {
        samples: found
            .names
            .iter()
            .zip(found.values)
            .enumerate()
            .filter(|(_, (name, _))| !matches!(name, Name::Jones(..)))
            .map(|(place, (&name, values))| {
                let factor = writer.factor(name);
                let shift = match name {
                    // Periodic values stay around the estimate, as the person counts it.
                    Name::Axis => {
                        let centre = fit
                            .parameters
                            .iter()
                            .chain(&fit.derived)
                            .nth(place)
                            .map_or(0.0, |parameter| parameter.value);
                        request.convention.azimuth(centre).to_degrees() - factor * centre
                    }
                    _ => 0.0,
                };
                SampleTwin {
                    name: writer.key(name),
                    unit: unit_of(name),
                    values: values
                        .into_iter()
                        .map(|value| value.map(|value| factor * value + shift))
                        .collect(),
                }
            })
            .collect(),
        chi_square: found.chi_square,
    })
}

#[derive(Serialize)]
pub struct FitsTwin {
    fits: Vec<FitTwin>,
    recommended: Option<RecommendedTwin>,
}

#[derive(Serialize)]
struct RecommendedTwin {
    model: &'static str,
    rule: &'static str,
    sentence: String,
}

impl RecommendedTwin {
    fn new(found: &Recommendation, fits: &[Fit]) -> Self {
        Self {
            model: fits.get(found.index).map_or("", |fit| name_of(fit.model)),
            rule: match found.rule {
                Rule::PValue => "p-value",
                Rule::Criterion => "criterion",
            },
            sentence: found.sentence.clone(),
        }
    }
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct FitTwin {
    model: &'static str,
    side: Option<&'static str>,
    parameter_count: usize,
    parameters: Vec<ParameterTwin>,
    derived: Vec<ParameterTwin>,
    covariance: Vec<Vec<f64>>,
    correlation: Vec<Vec<Option<f64>>>,
    null_directions: Vec<Vec<String>>,
    equivalents: Vec<Vec<ValueTwin>>,
    jones: Option<[[f64; 2]; 4]>,
    chi_square: Option<f64>,
    degrees_of_freedom: u32,
    p_value: Option<f64>,
    simulations: u32,
    aic: Option<f64>,
    bic: Option<f64>,
    mueller: [f64; 16],
    residuals: [f64; 16],
    rms: f64,
    stop: &'static str,
    gradient_cosine: f64,
    evaluations: usize,
    remarks: Vec<&'static str>,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct ParameterTwin {
    name: String,
    value: f64,
    se: Option<f64>,
    low: Option<f64>,
    high: Option<f64>,
    unit: &'static str,
    at_bound: bool,
}

#[derive(Serialize)]
struct ValueTwin {
    name: String,
    value: f64,
}

#[derive(Serialize)]
pub struct ProfileTwin {
    values: Vec<f64>,
    rises: Vec<f64>,
    low: Option<f64>,
    high: Option<f64>,
    unit: &'static str,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
pub struct SamplesTwin {
    samples: Vec<SampleTwin>,
    chi_square: Vec<f64>,
}

#[derive(Serialize)]
struct SampleTwin {
    name: String,
    unit: &'static str,
    values: Vec<Option<f64>>,
}

impl FitTwin {
    fn new(fit: &Fit, convention: &Convention) -> Self {
        let writer = Writer(convention);
        let signs = convention.element_signs();
        let (parameters, from) = writer.parameters(&fit.parameters);
        let (derived, _) = writer.parameters(&fit.derived);
        // Where the covariance has no row, as for the shares of a mixture, there is none.
        let size = fit.covariance.nrows();
        let entry = |i: usize, j: usize| {
            let ((a, fa), (b, fb)) = (from[i], from[j]);
            fa * fb * fit.covariance[(a, b)]
        };
        let square = |f: &dyn Fn(usize, usize) -> f64| -> Vec<Vec<f64>> {
            (0..size)
                .map(|i| (0..size).map(|j| f(i, j)).collect())
                .collect()
        };
        let correlation = (0..size)
            .map(|i| {
                (0..size)
                    .map(|j| {
                        let scale = (entry(i, i) * entry(j, j)).sqrt();
                        (scale > 0.0).then(|| (entry(i, j) / scale).clamp(-1.0, 1.0))
                    })
                    .collect()
            })
            .collect();
        let residuals = std::array::from_fn(|k| signs[k] * fit.residuals[k]);
        Self {
            model: name_of(fit.model),
            side: fit.side.map(side_name),
            parameter_count: fit.model.parameter_count(),
            covariance: square(&entry),
            correlation,
            null_directions: fit
                .null_directions
                .iter()
                .map(|direction| writer.involved(fit, direction))
                .collect(),
            equivalents: equivalents(&parameters),
            jones: jones_of(&fit.parameters)
                .map(|jones| convention.jones(&jones).phase_fixed().row_major())
                .map(|entries| entries.map(|entry| [entry.re, entry.im])),
            parameters,
            derived,
            chi_square: fit.chi_square,
            degrees_of_freedom: fit.degrees_of_freedom,
            p_value: fit.p_value,
            simulations: fit.simulations,
            aic: fit.aic,
            bic: fit.bic,
            mueller: convention.mueller(&fit.mueller).row_major(),
            residuals,
            rms: fit.rms,
            stop: match fit.stop {
                Stop::Minimum => "minimum",
                Stop::Stalled => "stalled",
                Stop::Patience => "patience",
            },
            gradient_cosine: fit.gradient_cosine,
            evaluations: fit.evaluations,
            remarks: remarks(fit),
        }
    }
}

/// A request's convention, and what it does to parameters.
struct Writer<'a>(&'a Convention);

impl Writer<'_> {
    fn key(&self, name: Name) -> String {
        match name {
            Name::Transmittance => "transmittance".to_owned(),
            Name::Diattenuation => "diattenuation".to_owned(),
            Name::Axis => "axisDeg".to_owned(),
            Name::Retardance => "retardanceDeg".to_owned(),
            Name::RetarderVector(k) => format!("retarderVectorDeg{k}"),
            Name::DiattenuationVector(k) => format!("diattenuationVector{k}"),
            Name::Alpha => "alpha".to_owned(),
            Name::DepolarizationLinear => "depolarizationLinear".to_owned(),
            Name::DepolarizationCircular => "depolarizationCircular".to_owned(),
            Name::Depolarization(k) => format!("depolarization{k}"),
            Name::Jones(k, is_real) => {
                let part = if is_real { "re" } else { "im" };
                format!("jones.{}{}.{part}", k / 2, k % 2)
            }
            Name::Weight(k) => format!("weight{k}"),
            Name::Ellipticity => "ellipticityDeg".to_owned(),
        }
    }

    /// What a change of the engine's parameter is to the person's.
    fn factor(&self, name: Name) -> f64 {
        let degrees = if name.is_angle() {
            1f64.to_degrees()
        } else {
            1.0
        };
        let sign = match name {
            Name::Axis => self.0.rotation(1.0),
            Name::Ellipticity => self.0.circular(1.0),
            Name::RetarderVector(k) | Name::DiattenuationVector(k) => {
                let mut unit = [0.0; 3];
                unit[k] = 1.0;
                self.0.axis(&unit)[k]
            }
            _ => 1.0,
        };
        sign * degrees
    }

    /// In the person's convention, and where each comes from with its factor.
    fn parameters(&self, all: &[Parameter]) -> (Vec<ParameterTwin>, Vec<(usize, f64)>) {
        let jones = all.iter().any(|p| matches!(p.name, Name::Jones(..)));
        let mut from: Vec<(usize, f64, Name)> = all
            .iter()
            .enumerate()
            .map(|(k, parameter)| (k, self.factor(parameter.name), parameter.name))
            .collect();
        if jones {
            from = self.jones_entries(all, from);
        }
        let twins = from
            .iter()
            .map(|&(source, factor, name)| {
                let parameter = &all[source];
                let value = match name {
                    Name::Axis => self.0.azimuth(parameter.value).to_degrees(),
                    _ => factor * parameter.value,
                };
                let half = parameter
                    .interval
                    .map(|(low, high)| 0.5 * (high - low) * factor.abs());
                ParameterTwin {
                    name: self.key(name),
                    value,
                    se: parameter.se.map(|se| factor.abs() * se),
                    low: half.map(|half| value - half),
                    high: half.map(|half| value + half),
                    unit: unit_of(name),
                    at_bound: parameter.at_bound,
                }
            })
            .collect();
        (
            twins,
            from.into_iter()
                .map(|(source, factor, _)| (source, factor))
                .collect(),
        )
    }

    /// Entries of a Jones matrix change places and signs with the convention; the largest
    /// stays real and positive.
    fn jones_entries(
        &self,
        all: &[Parameter],
        from: Vec<(usize, f64, Name)>,
    ) -> Vec<(usize, f64, Name)> {
        // What becomes of each entry: found by its own image.
        let image = |entry: usize| {
            let mut unit = [Complex64::ZERO; 4];
            unit[entry] = Complex64::ONE;
            Jones::from_rows([[unit[0], unit[1]], [unit[2], unit[3]]])
                .map(|jones| self.0.jones(&jones).row_major())
                .ok()
                .and_then(|entries| {
                    let place = entries.iter().position(|value| value.norm() > 0.5)?;
                    Some((place, entries[place].re))
                })
                .unwrap_or((entry, 1.0))
        };
        let conjugate = if self.0.time == TimeSign::Minus {
            -1.0
        } else {
            1.0
        };
        let largest = all
            .iter()
            .filter_map(|parameter| match parameter.name {
                Name::Jones(entry, true) => Some((entry, parameter.value.abs())),
                _ => None,
            })
            .find(|(entry, _)| {
                // The one without an imaginary part.
                !all.iter()
                    .any(|other| other.name == Name::Jones(*entry, false))
            })
            .map_or(0, |(entry, _)| entry);
        let turn = image(largest).1;
        let mut turned: Vec<(usize, f64, Name)> = from
            .into_iter()
            .map(|(source, factor, name)| match name {
                Name::Jones(entry, is_real) => {
                    let (place, sign) = image(entry);
                    let part = if is_real { 1.0 } else { conjugate };
                    (
                        source,
                        factor * sign * turn * part,
                        Name::Jones(place, is_real),
                    )
                }
                other => (source, factor, other),
            })
            .collect();
        turned.sort_by_key(|(source, _, name)| match name {
            Name::Jones(entry, is_real) => 2 * entry + usize::from(!is_real),
            _ => 100 + source,
        });
        turned
    }

    /// The parameters that a direction moves.
    fn involved(&self, fit: &Fit, direction: &[f64]) -> Vec<String> {
        let names: Vec<Name> = fit.parameters.iter().map(|p| p.name).collect();
        let is_jones = names.iter().any(|name| matches!(name, Name::Jones(..)));
        let shift = direction.len() as isize - names.len() as isize;
        let mut all: Vec<String> = Vec::new();
        for (k, part) in direction.iter().enumerate() {
            if part.abs() < 0.1 {
                continue;
            }
            let place = (k as isize - shift).max(0) as usize;
            let key = match names.get(place) {
                Some(name) if !(is_jones && matches!(name, Name::Jones(..))) => self.key(*name),
                _ => "jones".to_owned(),
            };
            if !all.contains(&key) {
                all.push(key);
            }
        }
        all
    }
}

/// The Jones matrix that the parameters of a fit spell.
fn jones_of(all: &[Parameter]) -> Option<Jones> {
    let mut entries = [Complex64::ZERO; 4];
    let mut found = false;
    for parameter in all {
        if let Name::Jones(entry, is_real) = parameter.name {
            found = true;
            entries[entry] += if is_real {
                Complex64::new(parameter.value, 0.0)
            } else {
                Complex64::new(0.0, parameter.value)
            };
        }
    }
    Jones::from_rows([[entries[0], entries[1]], [entries[2], entries[3]]])
        .ok()
        .filter(|_| found)
}

/// The same element with other numbers.
fn equivalents(parameters: &[ParameterTwin]) -> Vec<Vec<ValueTwin>> {
    let find = |name: &str| parameters.iter().find(|p| p.name == name).map(|p| p.value);
    let value = |name: &str, value: f64| ValueTwin {
        name: name.to_owned(),
        value,
    };
    let mut all = Vec::new();
    if let (Some(retardance), Some(axis)) = (find("retardanceDeg"), find("axisDeg")) {
        // With a diattenuation the axes are told apart; only whole turns are not.
        if find("diattenuation").is_none() {
            all.push(vec![
                value("retardanceDeg", 360.0 - retardance),
                value("axisDeg", (axis + 90.0) % 180.0),
            ]);
        }
        all.push(vec![
            value("retardanceDeg", retardance + 360.0),
            value("axisDeg", axis),
        ]);
    }
    let vector = [0, 1, 2].map(|k| find(&format!("retarderVectorDeg{k}")));
    if let [Some(a), Some(b), Some(c)] = vector {
        let length = a.hypot(b).hypot(c);
        if length > 0.0 {
            let factor = (length - 360.0) / length;
            all.push(
                [a, b, c]
                    .iter()
                    .enumerate()
                    .map(|(k, part)| value(&format!("retarderVectorDeg{k}"), factor * part))
                    .collect(),
            );
        }
    }
    all
}

fn name_of(model: Model) -> &'static str {
    MODELS
        .iter()
        .find(|(_, other)| *other == model)
        .map_or("", |(name, _)| name)
}

fn side_name(side: Side) -> &'static str {
    match side {
        Side::Parallel => "parallel",
        Side::After => "after",
        Side::Before => "before",
    }
}

fn unit_of(name: Name) -> &'static str {
    match name {
        Name::Transmittance => "matrix",
        Name::Jones(..) => "root",
        _ if name.is_angle() => "deg",
        _ => "1",
    }
}
