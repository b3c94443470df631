//! Published, recomputed and derived values, each with its source beside it in
//! `tests/reference/published.json`.

mod common;

use common::{key, measurement};
use halfshade::coherency::{Coherency, Verdict};
use halfshade::convention::{AngleSense, Convention, PositiveS3, TimeSign, ZeroAngle};
use halfshade::examine::{Examination, examine};
use halfshade::figures::Unit;
use halfshade::mueller::{Interface, Jones, Mueller, elements};
use halfshade::noise::{Measurement, Noise};
use halfshade::state::Stokes;
use halfshade::stats::NormalDraws;
use num_complex::Complex64;
use serde_json::Value;

struct Entry<'a> {
    id: &'a str,
    input: &'a Value,
    expect: &'a Value,
    tolerance: f64,
}

fn numbers(value: &Value) -> Vec<f64> {
    value
        .as_array()
        .unwrap()
        .iter()
        .map(|v| v.as_f64().unwrap())
        .collect()
}

fn matrix(value: &Value) -> Mueller {
    Mueller::from_row_major(&numbers(value).try_into().unwrap()).unwrap()
}

fn element(value: &Value) -> Mueller {
    let parameter = |name: &str| value["parameters"][name]["value"].as_f64().unwrap();
    let angle = |name: &str| parameter(name).to_radians();
    match value["kind"].as_str().unwrap() {
        "linearDiattenuator" => elements::linear_diattenuator(
            parameter("transmittanceMax"),
            parameter("transmittanceMin"),
            angle("axisDeg"),
        ),
        "linearRetarder" => elements::linear_retarder(angle("retardanceDeg"), angle("axisDeg")),
        "circularRetarder" => elements::circular_retarder(angle("retardanceDeg")),
        "ellipticalRetarder" => elements::elliptical_retarder(
            angle("retardanceDeg"),
            angle("azimuthDeg"),
            angle("ellipticityDeg"),
        ),
        "ellipticalDiattenuator" => {
            let (s2, c2) = (2.0 * angle("azimuthDeg")).sin_cos();
            let (s3, c3) = (2.0 * angle("ellipticityDeg")).sin_cos();
            elements::elliptical_diattenuator(
                parameter("transmittance"),
                [c3 * c2, c3 * s2, s3].map(|v| parameter("diattenuation") * v),
            )
        }
        "alignedDiattenuatingRetarder" => elements::aligned_diattenuating_retarder(
            parameter("transmittance"),
            parameter("diattenuation"),
            angle("retardanceDeg"),
            angle("axisDeg"),
        ),
        "isotropicReflector" => elements::isotropic_reflector(
            angle("psiDeg"),
            angle("deltaDeg"),
            parameter("reflectance"),
            angle("planeDeg"),
        ),
        kind @ ("fresnelReflection" | "fresnelTransmission") => {
            let interface = Interface::new(
                parameter("indexBefore"),
                parameter("indexAfter"),
                parameter("absorption"),
                angle("incidenceDeg"),
            )
            .unwrap();
            if kind == "fresnelReflection" {
                elements::fresnel_reflection(&interface, angle("planeDeg"))
            } else {
                elements::fresnel_transmission(&interface, angle("planeDeg"))
            }
        }
        "rotator" => elements::rotator(angle("angleDeg")),
        "isotropicDepolarizer" => elements::isotropic_depolarizer(parameter("alpha")),
        "diagonalDepolarizer" => {
            elements::diagonal_depolarizer(parameter("d1"), parameter("d2"), parameter("d3"))
        }
        kind => panic!("{kind}"),
    }
    .unwrap()
}

fn train(value: &Value) -> Mueller {
    value
        .as_array()
        .unwrap()
        .iter()
        .fold(Mueller::identity(), |before, next| element(next) * before)
}

fn convention(value: &Value) -> Convention {
    let is = |name: &str, word: &str| value[name] == word;
    Convention {
        angles: if is("angles", "clockwise") {
            AngleSense::Clockwise
        } else {
            AngleSense::Counterclockwise
        },
        positive_s3: if is("positiveS3", "counterclockwise") {
            PositiveS3::Counterclockwise
        } else {
            PositiveS3::Clockwise
        },
        zero_angle: if is("zeroAngle", "y") {
            ZeroAngle::Y
        } else {
            ZeroAngle::X
        },
        time: if is("time", "minus") {
            TimeSign::Minus
        } else {
            TimeSign::Plus
        },
    }
}

impl Entry<'_> {
    fn mueller(&self) -> Mueller {
        match self.input.get("mueller") {
            Some(elements) => matrix(elements),
            None => train(&self.input["train"]),
        }
    }

    fn examined(&self, noise: Noise, absolute: bool) -> Examination {
        let exact = self.input["normalised"].as_bool().unwrap_or(false);
        let measurement = Measurement::new(self.mueller(), exact, absolute, noise).unwrap();
        examine(&measurement, None).unwrap()
    }

    fn close(&self, what: &str, found: f64, expected: f64) {
        assert!(
            // Half of a printed digit is itself rounded in binary.
            (found - expected).abs() <= self.tolerance * (1.0 + 1e-9),
            "{}: {what} is {found}, not {expected} ± {}",
            self.id,
            self.tolerance
        );
    }

    fn all_close(&self, what: &str, found: &[f64], expected: &Value) {
        let expected = numbers(expected);
        assert_eq!(found.len(), expected.len());
        for (k, (found, expected)) in found.iter().zip(expected).enumerate() {
            self.close(&format!("{what}[{k}]"), *found, expected);
        }
    }

    /// Everything that is expected, by name.
    fn each(&self, mut compare: impl FnMut(&str, &Value)) {
        let map = self.expect.as_object().unwrap();
        assert!(!map.is_empty());
        for (name, expected) in map {
            compare(name, expected);
        }
    }

    fn figure(&self, name: &str) -> (Option<f64>, bool) {
        let found = self.examined(Noise::None, false);
        let (which, figure) = found
            .figures
            .iter()
            .find(|(which, _)| key(*which) == name)
            .unwrap();
        let degrees = !matches!(
            which.unit(),
            Unit::One | Unit::CircularSign | Unit::Transmittance
        );
        let value = figure
            .value
            .map(|value| if degrees { value.to_degrees() } else { value });
        (
            value,
            matches!(which.unit(), Unit::Azimuth | Unit::Rotation),
        )
    }

    fn check(&self, kind: &str) {
        match kind {
            "element-matrix" => self.all_close(
                "mueller",
                &element(self.input).row_major(),
                &self.expect["mueller"],
            ),
            "stokes-through-train" => self.stokes_through_train(),
            "figures" => self.each(|name, expected| {
                let (value, periodic) = self.figure(name);
                let Some(expected) = expected.as_f64() else {
                    return assert_eq!(value, None, "{}: {name}", self.id);
                };
                let mut value = value.unwrap_or_else(|| panic!("{}: {name}", self.id));
                if periodic {
                    value -= 180.0 * ((value - expected) / 180.0).round();
                }
                self.close(name, value, expected);
            }),
            "figure-bounds" => self.each(|name, bounds| {
                let value = self.figure(name).0.unwrap();
                let range =
                    bounds["atLeast"].as_f64().unwrap()..=bounds["atMost"].as_f64().unwrap();
                assert!(range.contains(&value), "{}: {name} is {value}", self.id);
            }),
            "nested-indices" => {
                let names = self.expect["order"].as_array().unwrap();
                let values: Vec<f64> = names
                    .iter()
                    .map(|name| self.figure(name.as_str().unwrap()).0.unwrap())
                    .collect();
                assert!(
                    values.is_sorted() && values[0] >= 0.0 && values[values.len() - 1] <= 1.0,
                    "{}: {values:?}",
                    self.id
                );
            }
            "eigenvalues" => {
                let found = self
                    .examined(Noise::None, false)
                    .realizability
                    .eigenvalues
                    .unwrap();
                self.all_close("eigenvalues", &found, &self.expect["eigenvalues"]);
            }
            "realizability" => {
                let found = self.examined(Noise::None, false).realizability;
                self.each(|name, expected| {
                    let found = match name {
                        "realizable" => found.verdict == Verdict::Realizable,
                        "stokesCondition" => found.stokes_condition,
                        name => panic!("{name}"),
                    };
                    assert_eq!(found, expected.as_bool().unwrap(), "{}: {name}", self.id);
                });
            }
            "nearest" => {
                let found = self.examined(Noise::None, false).nearest.unwrap();
                self.each(|name, expected| match name {
                    "mueller" => self.all_close(name, &found.mueller.row_major(), expected),
                    "distance" => self.close(name, found.distance, expected.as_f64().unwrap()),
                    name => panic!("{name}"),
                });
            }
            "polar" => {
                let found = self.examined(Noise::None, false).polar_forward.unwrap();
                self.each(|name, expected| {
                    let factor = match name {
                        "depolarizer" => found.depolarizer,
                        "retarder" => found.retarder,
                        "diattenuator" => Some(found.diattenuator),
                        name => panic!("{name}"),
                    };
                    if expected.is_null() {
                        assert!(factor.is_none(), "{}: {name}", self.id);
                    } else {
                        self.all_close(name, &factor.unwrap().row_major(), expected);
                    }
                });
            }
            "polar-product" => {
                let found = self.examined(Noise::None, false).polar_forward.unwrap();
                let product =
                    found.depolarizer.unwrap() * found.retarder.unwrap() * found.diattenuator;
                self.all_close("product", &product.row_major(), &self.expect["mueller"]);
            }
            "differential" => {
                let found = self.examined(Noise::None, false).differential.unwrap();
                let properties = found.properties.unwrap();
                self.each(|name, expected| match name {
                    "mean" => self.all_close(name, &found.mean.unwrap().row_major(), expected),
                    "depolarizing" => {
                        self.all_close(name, &found.depolarizing.unwrap().row_major(), expected);
                    }
                    name => {
                        let value = match name {
                            "linearBirefringence" => properties.birefringence[0],
                            "linearBirefringence45" => properties.birefringence[1],
                            "circularBirefringence" => properties.birefringence[2],
                            "linearDichroism" => properties.dichroism[0],
                            "linearDichroism45" => properties.dichroism[1],
                            "circularDichroism" => properties.dichroism[2],
                            name => panic!("{name}"),
                        };
                        self.close(name, value, expected.as_f64().unwrap());
                    }
                });
            }
            "spectral" => {
                let parts = self.examined(Noise::None, false).spectral.unwrap();
                self.each(|name, expected| match name {
                    "weights" => self.all_close(name, &parts.map(|part| part.weight), expected),
                    "mueller" => {
                        let sum: [f64; 16] = std::array::from_fn(|k| {
                            parts
                                .iter()
                                .map(|part| part.weight * part.mueller.row_major()[k])
                                .sum()
                        });
                        self.all_close(name, &sum, expected);
                    }
                    name => panic!("{name}"),
                });
            }
            "coherency-norm" => {
                let h = Coherency::from_mueller(&self.mueller()).row_major();
                let square = 4.0 * h.iter().map(|entry| entry.norm_sqr()).sum::<f64>();
                self.close(
                    "4 |H|²",
                    square,
                    self.expect["squaredNorm"].as_f64().unwrap(),
                );
            }
            "passivity" => {
                let found = self
                    .examined(Noise::None, true)
                    .realizability
                    .passivity
                    .unwrap();
                self.close(
                    "margin",
                    found.margin,
                    self.expect["margin"].as_f64().unwrap(),
                );
            }
            "jones-to-mueller" => {
                let entries: Vec<Complex64> = self.input["jones"]
                    .as_array()
                    .unwrap()
                    .iter()
                    .map(|entry| Complex64::new(numbers(entry)[0], numbers(entry)[1]))
                    .collect();
                let jones =
                    Jones::from_rows([[entries[0], entries[1]], [entries[2], entries[3]]]).unwrap();
                self.all_close(
                    "mueller",
                    &jones.mueller().row_major(),
                    &self.expect["mueller"],
                );
            }
            "state-in-convention" => {
                let state =
                    Stokes::new(numbers(&self.input["stokes"]).try_into().unwrap()).unwrap();
                let canonical = convention(&self.input["convention"]).stokes(&state);
                self.all_close("stokes", &canonical.components(), &self.expect["stokes"]);
            }
            "matrix-in-convention" => {
                let canonical = convention(&self.input["convention"]).mueller(&self.mueller());
                self.all_close("mueller", &canonical.row_major(), &self.expect["mueller"]);
            }
            "eigenvalue-error" => {
                let sigma = self.input["sigma"].as_f64().unwrap();
                let se = self
                    .examined(Noise::Uniform { sigma }, false)
                    .realizability
                    .eigenvalue_se
                    .unwrap();
                self.all_close("eigenvalueSe", &se, &self.expect["eigenvalueSe"]);
            }
            "noise-on-pure" => self.noise_on_pure(),
            "rounding" => self.rounding(),
            kind => panic!("no check of the kind {kind}"),
        }
    }

    fn stokes_through_train(&self) {
        let theirs = convention(&self.input["convention"]);
        let state = Stokes::new(numbers(&self.input["stokes"]).try_into().unwrap()).unwrap();
        let out = theirs.stokes(&train(&self.input["train"]).apply(&theirs.stokes(&state)));
        self.each(|name, expected| match name {
            "stokes" => self.all_close(name, &out.components(), expected),
            "intensity" => self.close(name, out.intensity(), expected.as_f64().unwrap()),
            "degree" => self.close(
                name,
                out.degree_of_polarization().unwrap(),
                expected.as_f64().unwrap(),
            ),
            "azimuthDeg" => {
                let (found, expected) = (
                    out.ellipse().azimuth.unwrap().to_degrees(),
                    expected.as_f64().unwrap(),
                );
                self.close(
                    name,
                    found - 180.0 * ((found - expected) / 180.0).round(),
                    expected,
                );
            }
            name => panic!("{name}"),
        });
    }

    /// A simulation of the same size as the source's; the tolerance is its own.
    fn noise_on_pure(&self) {
        let sigma = self.input["sigma"].as_f64().unwrap();
        let truth = self.mueller().row_major();
        let mut draws = NormalDraws::new(60);
        let mut smallest: Vec<f64> = (0..self.input["draws"].as_u64().unwrap())
            .map(|_| {
                let noise = draws.draw_matrix();
                let measured =
                    Mueller::from_row_major(&std::array::from_fn(|k| truth[k] + sigma * noise[k]))
                        .unwrap();
                Coherency::from_mueller(&measured).eigen().unwrap().values[3] / sigma
            })
            .collect();
        smallest.sort_by(f64::total_cmp);
        let count = smallest.len() as f64;
        let mean = smallest.iter().sum::<f64>() / count;
        self.each(|name, expected| {
            let found = match name {
                "mean" => mean,
                "standardDeviation" => {
                    (smallest.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / count).sqrt()
                }
                "quantile05" => smallest[smallest.len() / 20],
                "shareRealizable" => smallest.iter().filter(|v| **v >= 0.0).count() as f64 / count,
                name => panic!("{name}"),
            };
            self.close(name, found, expected.as_f64().unwrap());
        });
    }

    fn rounding(&self) {
        let decimals = u32::try_from(self.input["decimals"].as_u64().unwrap()).unwrap();
        let exact = self.input["normalised"].as_bool().unwrap_or(false);
        let found = examine(&measurement(self.mueller(), exact, Noise::None), Some(1))
            .unwrap()
            .realizability;
        assert_eq!(found.rounding_decimals, Some(decimals), "{}", self.id);
        self.each(|name, expected| match name {
            "smallestEigenvalue" => self.close(
                name,
                found.eigenvalues.unwrap()[3],
                expected.as_f64().unwrap(),
            ),
            "roundingSigma" => self.close(
                name,
                found.rounding_sigma.unwrap(),
                expected.as_f64().unwrap(),
            ),
            "consistentWithRounding" => assert_eq!(
                found.consistent_with_rounding,
                expected.as_bool().unwrap(),
                "{}",
                self.id
            ),
            name => panic!("{name}"),
        });
    }
}

#[test]
fn engine_agrees_with_what_was_published() {
    let file: Value = serde_json::from_str(include_str!("reference/published.json")).unwrap();
    let entries = file.as_array().unwrap();
    for value in entries {
        assert!(
            value["source"]
                .as_str()
                .is_some_and(|source| source.len() > 10)
        );
        Entry {
            id: value["id"].as_str().unwrap(),
            input: &value["input"],
            expect: &value["expect"],
            tolerance: value["tolerance"].as_f64().unwrap(),
        }
        .check(value["check"].as_str().unwrap());
    }
    let of_kind = |kind: &str| entries.iter().filter(|value| value["kind"] == kind).count();
    assert!(of_kind("seen") >= 12);
    assert!(of_kind("recomputed") + of_kind("derived") >= 15);
}
