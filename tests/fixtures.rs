//! 200 matrices against `tests/reference/fixtures.json`, which is made from the
//! definitions by NumPy, SciPy and mpmath (its README says how), to 1e-9.

mod common;

use common::{key, measurement};
use halfshade::coherency::Verdict;
use halfshade::decompose::PolarFactors;
use halfshade::examine::{Examination, examine};
use halfshade::figures::Unit;
use halfshade::mueller::Mueller;
use halfshade::noise::Noise;
use serde_json::Value;

const TOLERANCE: f64 = 1e-9;

struct Case<'a> {
    expected: &'a Value,
    label: &'a str,
    found: Examination,
    mueller: Mueller,
    compared: usize,
}

impl<'a> Case<'a> {
    fn number(
        &mut self,
        what: &str,
        found: Option<f64>,
        expected: &Value,
        scale: f64,
        period: Option<f64>,
    ) {
        self.compared += 1;
        let Some(expected) = expected.as_f64() else {
            assert_eq!(found, None, "{}: {what} is not determined", self.label);
            return;
        };
        let found = found.unwrap_or_else(|| panic!("{}: {what} should be {expected}", self.label));
        let mut difference = found - expected;
        if let Some(period) = period {
            difference -= period * (difference / period).round();
        }
        assert!(
            difference.abs() <= TOLERANCE * scale.max(expected.abs()),
            "{}: {what} is {found}, not {expected}",
            self.label
        );
    }

    fn numbers(&mut self, what: &str, found: Option<&[f64]>, expected: &Value, scale: f64) {
        let Some(expected) = expected.as_array() else {
            assert!(found.is_none(), "{}: {what} is not determined", self.label);
            self.compared += 1;
            return;
        };
        let found = found.unwrap_or_else(|| panic!("{}: {what} is missing", self.label));
        assert_eq!(found.len(), expected.len());
        for (k, (found, expected)) in found.iter().zip(expected).enumerate() {
            self.number(&format!("{what}[{k}]"), Some(*found), expected, scale, None);
        }
    }

    fn polar(&mut self, what: &str, factors: Option<PolarFactors>) {
        let Some(expected) = self.expected.get(what) else {
            return;
        };
        for (name, factor) in [
            (
                "depolarizer",
                factors.and_then(|factors| factors.depolarizer),
            ),
            ("retarder", factors.and_then(|factors| factors.retarder)),
            ("diattenuator", factors.map(|factors| factors.diattenuator)),
        ] {
            if let Some(expected) = expected.get(name) {
                let elements = factor.map(|factor| factor.row_major());
                self.numbers(
                    &format!("{what}.{name}"),
                    elements.as_ref().map(|e| e.as_slice()),
                    expected,
                    1.0,
                );
            }
        }
    }

    fn characteristic(&mut self) {
        let parts = self.found.characteristic;
        for (k, expected) in self.list("characteristic").iter().enumerate() {
            let part = parts.map(|parts| parts[k]);
            let weight = part.map(|part| part.weight);
            self.number(
                "characteristic.weight",
                weight,
                &expected["weight"],
                1.0,
                None,
            );
            if let Some(mueller) = expected.get("mueller") {
                let found = part.map(|part| part.mueller.row_major());
                let found = found.as_ref().map(|e| e.as_slice());
                self.numbers("characteristic.mueller", found, mueller, 1.0);
            }
        }
    }

    fn differential(&mut self) {
        let Some(expected) = self.expected.get("differential") else {
            return;
        };
        let found = self.found.differential.unwrap();
        assert_eq!(found.reason.is_some(), expected.is_null(), "{}", self.label);
        for (name, part) in [("mean", found.mean), ("depolarizing", found.depolarizing)] {
            let elements = part.map(|part| part.row_major());
            let elements = elements.as_ref().map(|e| e.as_slice());
            self.numbers(
                &format!("differential.{name}"),
                elements,
                &expected[name],
                1.0,
            );
        }
        let properties = found.properties;
        for (k, names) in [
            ("linearBirefringence", "linearDichroism"),
            ("linearBirefringence45", "linearDichroism45"),
            ("circularBirefringence", "circularDichroism"),
        ]
        .into_iter()
        .enumerate()
        {
            let birefringence = properties.map(|p| p.birefringence[k]);
            self.number(names.0, birefringence, &expected[names.0], 1.0, None);
            let dichroism = properties.map(|p| p.dichroism[k]);
            self.number(names.1, dichroism, &expected[names.1], 1.0, None);
        }
    }

    fn list(&self, what: &str) -> &'a [Value] {
        let list = self.expected.get(what).and_then(Value::as_array);
        list.map_or(&[], Vec::as_slice)
    }

    fn check(&mut self) {
        let expected = self.expected;
        let r = self.found.realizability.clone();
        let scale = self.mueller.largest();
        if let Some(eigenvalues) = expected.get("eigenvalues") {
            let found = r.eigenvalues;
            self.numbers(
                "eigenvalues",
                found.as_ref().map(|e| e.as_slice()),
                eigenvalues,
                1.0,
            );
        }
        if let Some(realizable) = expected.get("realizable") {
            assert_eq!(
                r.verdict == Verdict::Realizable,
                realizable.as_bool().unwrap(),
                "{}",
                self.label
            );
            self.compared += 1;
        }
        if let Some(condition) = expected.get("stokesCondition").and_then(Value::as_bool) {
            assert_eq!(
                r.stokes_condition, condition,
                "{}: {:?}",
                self.label, r.stokes_margin
            );
            self.compared += 1;
        }
        if let Some(violation) = expected.get("violation") {
            self.number("violation", r.violation, violation, 1.0, None);
        }
        if let Some(nearest) = expected.get("nearest") {
            let found = self
                .found
                .nearest
                .as_ref()
                .map(|nearest| nearest.mueller.row_major());
            self.numbers(
                "nearest",
                found.as_ref().map(|e| e.as_slice()),
                nearest,
                scale,
            );
        }
        if let Some(square) = expected.get("distanceSquared").and_then(Value::as_f64) {
            let distance = self.found.nearest.as_ref().map(|nearest| nearest.distance);
            self.number("distance", distance, &square.sqrt().into(), scale, None);
        }
        if let Some(weights) = expected.get("spectralWeights") {
            let found = self
                .found
                .spectral
                .map(|parts| parts.map(|part| part.weight));
            self.numbers(
                "spectralWeights",
                found.as_ref().map(|e| e.as_slice()),
                weights,
                1.0,
            );
        }
        self.characteristic();
        self.differential();
        if let Some(isotropic) = expected.get("isotropic") {
            let found = self.found.isotropic;
            if let Some(alpha) = isotropic.get("alpha") {
                self.number(
                    "isotropic.alpha",
                    found.map(|model| model.alpha),
                    alpha,
                    1.0,
                    None,
                );
            }
            if let Some(mueller) = isotropic.get("mueller") {
                let found = found.map(|model| model.mueller.row_major());
                self.numbers(
                    "isotropic.mueller",
                    found.as_ref().map(|e| e.as_slice()),
                    mueller,
                    scale,
                );
            }
        }
        self.polar("polarForward", self.found.polar_forward);
        self.polar("polarReverse", self.found.polar_reverse);
        let table = self.found.figures.clone();
        for (name, figure) in table.iter() {
            let Some(expected) = expected
                .get("figures")
                .and_then(|figures| figures.get(key(name)))
            else {
                continue;
            };
            let degrees = |value: f64| value.to_degrees();
            let (value, period) = match name.unit() {
                Unit::Azimuth | Unit::Rotation => (figure.value.map(degrees), Some(180.0)),
                Unit::Angle | Unit::Ellipticity => (figure.value.map(degrees), None),
                Unit::One | Unit::CircularSign | Unit::Transmittance => (figure.value, None),
            };
            // An angle near one radian is 57 degrees.
            self.number(key(name), value, expected, 1.0, period);
        }
    }
}

#[test]
fn engine_agrees_with_the_definitions() {
    let file: Value = serde_json::from_str(include_str!("reference/fixtures.json")).unwrap();
    let cases = file["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 200);
    let mut compared = 0;
    for expected in cases {
        let elements = expected["mueller"].as_array().unwrap();
        let mueller =
            Mueller::from_row_major(&std::array::from_fn(|k| elements[k].as_f64().unwrap()))
                .unwrap();
        let exact = expected["normalised"].as_bool().unwrap();
        let mut case = Case {
            expected,
            label: expected["label"].as_str().unwrap(),
            found: examine(&measurement(mueller, exact, Noise::None), None).unwrap(),
            mueller,
            compared: 0,
        };
        case.check();
        compared += case.compared;
    }
    // Missing keys are no expectation; that there are enough is one.
    assert!(compared > 30_000, "{compared}");
}
