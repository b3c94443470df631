//! Configurations in links.
//!
//! The golden link was made by `samples/link.py` (Python's zlib, base64), not by the
//! code under test. Refusals: derived from the rules in the module's documentation.

use base64::Engine;
use base64::engine::general_purpose::URL_SAFE_NO_PAD;
use halfshade::error::{Error, Place};
use halfshade::link::{decode, encode, known_blocks, open, read_file, seal, write_file};
use miniz_oxide::deflate::compress_to_vec;
use proptest::prelude::*;
use serde_json::{Value, json};
use std::time::{Duration, Instant};

fn configuration() -> Value {
    json!({
        "v": 1,
        "app": "0.1.0",
        "task": "realizability",
        "label": "kelp film 3, α ≈ 0.1",
        "measurement": {
            "mueller": [1, -0.0, 5e-324, 1.797_693_134_862_315_7e308, 0.1, 0.955, -0.0226, 1e-7,
                        0.333_333_333_333_333_3, 0.25, 0.5, 0.75, 2.0, 3.0, -1.0, 0.0],
            "normalised": false,
            "absolute": true,
            "convention": { "angles": "clockwise", "positiveS3": "counterclockwise",
                            "zeroAngle": "y", "time": "minus", "order": "columns" },
            "noise": { "kind": "uniform", "sigma": 0.004 },
            "text": "1\t0,5\r\n",
            "example": false
        },
        "examine": { "draws": 2000, "seed": 7 },
        "view": { "azimuthDeg": -30.5, "elevationDeg": 20 },
        "train": [{ "kind": "linearRetarder", "parameters": { "axisDeg": { "value": 45.5 } } }]
    })
}

#[track_caller]
fn refused(fragment: &str) -> Error {
    match decode(fragment) {
        Err(error) => error,
        Ok(value) => panic!("{fragment:?} was read: {value}"),
    }
}

#[track_caller]
fn refused_configuration(configuration: &Value) -> (&'static str, Option<String>) {
    let error = encode(configuration).expect_err("a refusal");
    let field = match error.at {
        Some(Place::Field(field)) => Some(field),
        _ => None,
    };
    (error.code, field)
}

/// A fragment with a true checksum over any bytes, by an independent CRC-32: the
/// bitwise definition (polynomial 0xEDB88320, as in RFC 1952, section 8).
fn sealed_bytes(packed: &[u8]) -> String {
    let mut sum = u32::MAX;
    for &byte in packed {
        sum ^= u32::from(byte);
        for _ in 0..8 {
            sum = (sum >> 1) ^ (0xedb8_8320 & 0_u32.wrapping_sub(sum & 1));
        }
    }
    let sum = u64::from(!sum);
    let digits: String = (0..7)
        .map(|k| {
            char::from(b"abcdefghijklmnopqrstuvwxyz234567"[(sum >> (5 * (6 - k)) & 31) as usize])
        })
        .collect();
    format!("v1.{}.{digits}", URL_SAFE_NO_PAD.encode(packed))
}

#[test]
fn a_configuration_comes_back() {
    let configuration = configuration();
    let fragment = encode(&configuration).unwrap();
    let back = decode(&fragment).unwrap();
    assert_eq!(back, configuration);
    let bits = |value: &Value| -> Vec<u64> {
        let mueller = value["measurement"]["mueller"].as_array().unwrap();
        mueller
            .iter()
            .map(|x| x.as_f64().unwrap().to_bits())
            .collect()
    };
    assert_eq!(bits(&back), bits(&configuration));
    assert_eq!(encode(&back).unwrap(), fragment);
    let parts: Vec<&str> = fragment.split('.').collect();
    assert_eq!((parts.len(), parts[0], parts[2].len()), (3, "v1", 7));
    assert!(
        fragment
            .bytes()
            .all(|b| b.is_ascii_alphanumeric() || matches!(b, b'.' | b'_' | b'-')),
        "{fragment}"
    );
    assert!(fragment.ends_with(|c: char| c.is_ascii_alphanumeric()));
}

#[test]
fn the_envelope_is_that_of_the_definition() {
    let text = configuration().to_string();
    assert_eq!(
        seal(&text).unwrap(),
        sealed_bytes(&compress_to_vec(text.as_bytes(), 9))
    );
    assert_eq!(
        open(&sealed_bytes(&compress_to_vec(text.as_bytes(), 1))).unwrap(),
        text
    );
}

/// Seen: the link of the first schema is read for ever.
#[test]
fn the_golden_link_is_read() {
    let fragment = include_str!("samples/link_v1.txt").trim();
    let expected: Value = serde_json::from_str(include_str!("samples/link_v1.json")).unwrap();
    assert_eq!(decode(fragment).unwrap(), expected);
}

/// The choice of a model is read strictly.
#[test]
fn a_chosen_model_is_read() {
    let mut configuration = configuration();
    configuration["fit"] = json!({ "model": "pureIsotropic", "side": "before" });
    let back = decode(&encode(&configuration).unwrap()).unwrap();
    assert_eq!(back.to_string(), configuration.to_string());
    for (wrong, field) in [
        (json!({ "model": 3 }), "fit.model"),
        (json!({ "side": "left" }), "fit.side"),
        (json!({ "other": 1 }), "fit.other"),
        (json!([1]), "fit"),
    ] {
        configuration["fit"] = wrong;
        let at = encode(&configuration).unwrap_err().at;
        assert_eq!(at, Some(Place::Field(field.to_owned())));
    }
}

#[test]
fn blocks_of_later_versions_survive() {
    let mut configuration = configuration();
    for later in ["settings", "readings", "instrument", "neverHeardOf"] {
        assert!(!known_blocks().contains(&later));
        configuration[later] = json!({ "deep": [1, { "er": [null, true, "text", -0.0, 1e-300] }] });
    }
    let back = decode(&encode(&configuration).unwrap()).unwrap();
    assert_eq!(back.to_string(), configuration.to_string());
}

/// A train that is being written may lack values; names that no element has are refused.
#[test]
fn trains_are_read_strictly() {
    let matrix: Vec<f64> = vec![0.5; 16];
    let plate = json!({ "kind": "linearRetarder", "label": "plate", "disabled": true, "parameters": {
        "retardanceDeg": { "value": 90, "free": true, "low": 0, "high": null },
        "axisDeg": { "tie": { "element": 0, "name": "retardanceDeg", "factor": 0.5, "offset": -0.0 } },
    } });
    let window =
        json!({ "kind": "measured", "measurement": { "mueller": matrix, "normalised": true } });
    let fine = json!({ "v": 1, "source": [1, 0, 0.5, 0], "train": [plate, window, { "kind": "rotator" }],
                       "pre": { "mueller": matrix }, "post": [window],
                       "removal": { "reflection": true, "direct": matrix } });
    let back = decode(&encode(&fine).unwrap()).unwrap();
    assert_eq!(back.to_string(), fine.to_string());
    let refused =
        |block: &str, value: Value| refused_configuration(&json!({ "v": 1, block: value }));
    let at = |code, field: &str| (code, Some(field.to_owned()));
    assert_eq!(refused("train", json!({})), at("bad-request", "train"));
    assert_eq!(
        refused("train", json!([{}])),
        at("missing-field", "train[0].kind")
    );
    assert_eq!(
        refused("train", json!([{ "kind": "lens" }])),
        at("unknown-choice", "train[0].kind")
    );
    assert_eq!(
        refused(
            "train",
            json!([{ "kind": "rotator", "parameters": { "axisDeg": {} } }])
        ),
        at("unknown-field", "train[0].parameters.axisDeg")
    );
    assert_eq!(
        refused(
            "post",
            json!([{ "kind": "rotator", "parameters": { "angleDeg": { "value": "1" } } }])
        ),
        at("bad-request", "post[0].parameters.angleDeg.value")
    );
    assert_eq!(
        refused("pre", json!({ "mueller": [1] })),
        at("bad-request", "pre.mueller")
    );
    assert_eq!(
        refused("source", json!([1, 0])),
        at("bad-request", "source")
    );
    assert_eq!(
        refused("removal", json!({ "mirror": true })),
        at("unknown-field", "removal.mirror")
    );
    let long = json!([{ "kind": "rotator", "label": "x".repeat(81) }]);
    assert_eq!(refused("train", long), at("too-large", "train[0].label"));
    let many = Value::Array(vec![json!({ "kind": "rotator" }); 501]);
    assert_eq!(refused("train", many), at("bad-request", "train"));
}

#[test]
fn every_kind_of_noise_is_taken() {
    let matrix: Vec<f64> = vec![0.5; 16];
    for noise in [
        json!({ "kind": "none" }),
        json!({ "kind": "uniform", "sigma": 0.01 }),
        json!({ "kind": "relative", "fraction": 0.01 }),
        json!({ "kind": "perElement", "sigma": matrix }),
        json!({ "kind": "covariance", "covariance": vec![0.0; 256] }),
        json!({ "kind": "rounding", "decimals": 4 }),
        json!({ "kind": "replicates", "matrices": [matrix, matrix] }),
    ] {
        let configuration = json!({ "v": 1, "measurement": { "mueller": null, "noise": noise } });
        let fragment = encode(&configuration).unwrap_or_else(|error| panic!("{noise}: {error}"));
        assert_eq!(decode(&fragment).unwrap(), configuration);
    }
}

#[test]
fn what_is_wrong_is_named() {
    let check = |configuration: Value, code: &str, field: &str| {
        let found = refused_configuration(&configuration);
        assert_eq!(found, (found.0, Some(field.to_owned())), "{configuration}");
        assert_eq!(found.0, code, "{configuration}");
        // A link that holds it is refused alike.
        let error = refused(&seal(&configuration.to_string()).unwrap());
        assert_eq!(error.code, code, "{configuration}");
    };
    let measurement = |name: &str, value: Value| {
        let mut configuration = configuration();
        configuration["measurement"][name] = value;
        configuration
    };
    let with = |name: &str, value: Value| {
        let mut configuration = configuration();
        configuration[name] = value;
        configuration
    };
    check(json!({ "task": "realizability" }), "bad-request", "v");
    check(with("v", json!("1")), "bad-request", "v");
    check(with("v", json!(0)), "bad-request", "v");
    check(with("v", json!(2)), "link-newer", "v");
    check(with("label", json!("x".repeat(81))), "too-large", "label");
    check(with("app", json!(1)), "bad-request", "app");
    check(with("measurement", json!([])), "bad-request", "measurement");
    check(
        measurement("mueller", json!([1, 2, 3])),
        "bad-request",
        "measurement.mueller",
    );
    let mut sixteen = vec![json!(0.5); 16];
    sixteen[3] = json!("0.5");
    check(
        measurement("mueller", json!(sixteen)),
        "bad-request",
        "measurement.mueller[3]",
    );
    check(
        measurement("normalized", json!(true)),
        "unknown-field",
        "measurement.normalized",
    );
    check(
        measurement("normalised", json!(1)),
        "bad-request",
        "measurement.normalised",
    );
    check(
        measurement("text", json!("x".repeat(200_001))),
        "too-large",
        "measurement.text",
    );
    check(
        measurement("noise", json!({ "kind": "loud" })),
        "unknown-choice",
        "measurement.noise.kind",
    );
    check(
        measurement("noise", json!({})),
        "missing-field",
        "measurement.noise.kind",
    );
    check(
        measurement("noise", json!({ "kind": "uniform" })),
        "missing-field",
        "measurement.noise.sigma",
    );
    check(
        measurement("noise", json!({ "kind": "none", "sigma": 1 })),
        "unknown-field",
        "measurement.noise.sigma",
    );
    check(
        measurement("noise", json!({ "kind": "covariance", "covariance": [1] })),
        "bad-request",
        "measurement.noise.covariance",
    );
    check(
        measurement("convention", json!({ "angles": "left" })),
        "unknown-choice",
        "measurement.convention.angles",
    );
    check(
        measurement("convention", json!({ "hand": 1 })),
        "unknown-field",
        "measurement.convention.hand",
    );
    check(
        with("examine", json!({ "draws": 0.5 })),
        "bad-request",
        "examine.draws",
    );
    check(
        with("examine", json!({ "seed": -1 })),
        "bad-request",
        "examine.seed",
    );
    check(
        with("view", json!({ "azimuthDeg": "30" })),
        "bad-request",
        "view.azimuthDeg",
    );
    check(
        with("view", json!({ "__proto__": 1 })),
        "bad-request",
        "view",
    );
    check(with("__proto__", json!({})), "bad-request", "__proto__");
    check(
        with("later", json!([{ "__proto__": {} }])),
        "bad-request",
        "later",
    );
    check(
        with("later", json!([[[[[[[[[[1]]]]]]]]]])),
        "bad-request",
        "later",
    );
    // Names that only end like it are names.
    assert!(encode(&with("my__proto__", json!(1))).is_ok());
    // Numbers that no double holds.
    for json in [
        r#"{"v":1,"later":{"x":1e400}}"#,
        r#"{"v":1,"view":{"x":-1e400}}"#,
        r#"{"v":1,"measurement":{"mueller":null,"noise":{"kind":"replicates","matrices":[[1e400,0,0,0,0,0,0,0,0,0,0,0,0,0,0,0]]}}}"#,
    ] {
        assert!(
            matches!(
                refused(&seal(json).unwrap()).code,
                "bad-request" | "link-damaged"
            ),
            "{json}"
        );
    }
    for text in [
        "",
        "x",
        "[]",
        "1",
        "{\"v\":1",
        "{\"v\":NaN}",
        "{'v':1}",
        "{\"v\":1}}",
    ] {
        let code = refused(&seal(text).unwrap()).code;
        assert!(
            matches!(code, "link-damaged" | "bad-request"),
            "{text}: {code}"
        );
    }
}

#[test]
fn labels_are_made_safe() {
    let configuration = json!({ "v": 1, "label": "a\u{202e}b\u{0}c\u{2066}d\ne\u{7f}f" });
    let back = decode(&encode(&configuration).unwrap()).unwrap();
    assert_eq!(back["label"], "abcdef");
    let back = decode(&seal(&configuration.to_string()).unwrap()).unwrap();
    assert_eq!(back["label"], "abcdef");
}

#[test]
fn links_come_as_people_paste_them() {
    let configuration = configuration();
    let fragment = encode(&configuration).unwrap();
    let half = fragment.len() / 2;
    let (head, tail) = fragment.split_at(half);
    for pasted in [
        format!("#{fragment}"),
        format!("https://example.org/halfshade/#{fragment}"),
        format!("file:///home/lab/halfshade.html#{fragment}"),
        format!("  {fragment}\r\n"),
        format!("{head}\r\n> {tail}"),
        format!("> {head}\u{200b}{tail}\u{feff}"),
        format!("<https://example.org/#{fragment}>"),
        format!("(see https://example.org/#{fragment})."),
        fragment.replace('.', "%2E"),
        fragment.replace('-', "%2d").replace('_', "%5F"),
        format!("https://example.org/#%23{fragment}"),
    ] {
        assert_eq!(
            decode(&pasted).unwrap_or_else(|error| panic!("{pasted}: {error}")),
            configuration
        );
    }
}

#[test]
fn refusals_tell_cut_from_wrong_from_newer() {
    let fragment = encode(&configuration()).unwrap();
    for (link, code) in [
        (String::new(), "link-empty"),
        ("#".to_owned(), "link-empty"),
        (" \n".to_owned(), "link-empty"),
        ("https://example.org/#".to_owned(), "link-empty"),
        ("section-2".to_owned(), "link-not-ours"),
        (".a.b".to_owned(), "link-not-ours"),
        ("v+2.a.b".to_owned(), "link-not-ours"),
        ("v0.a.b".to_owned(), "link-not-ours"),
        ("%%%".to_owned(), "link-empty"),
        (fragment.replacen("v1", "v2", 1), "link-newer"),
        ("v17.something.else.entirely".to_owned(), "link-newer"),
        ("v1".to_owned(), "link-truncated"),
        ("v1.".to_owned(), "link-truncated"),
        ("v1..".to_owned(), "link-truncated"),
        (format!("{fragment}a"), "link-damaged"),
        (format!("{fragment}.a"), "link-damaged"),
        (fragment.replacen("v1.", "v1.*", 1), "link-damaged"),
        (
            fragment.to_uppercase().replacen("V1", "v1", 1),
            "link-damaged",
        ),
        ("v1.".to_owned() + &"a".repeat(70_000), "link-too-large"),
        // True checksums over what is no deflate stream, a cut one, no text.
        (sealed_bytes(b"\xff\xff\xff"), "link-damaged"),
        (sealed_bytes(b""), "link-truncated"),
        (
            sealed_bytes(&compress_to_vec(b"{\"v\":1}", 9)[..4]),
            "link-damaged",
        ),
        (
            sealed_bytes(&compress_to_vec(b"\xff\xfe", 9)),
            "link-damaged",
        ),
    ] {
        assert_eq!(refused(&link).code, code, "{:.60}", link);
    }
}

#[test]
fn a_cut_link_is_never_another_one() {
    let fragment = encode(&configuration()).unwrap();
    for end in 0..fragment.len() {
        let code = refused(&fragment[..end]).code;
        let expected = if end == 0 {
            "link-empty"
        } else {
            "link-truncated"
        };
        assert_eq!(code, expected, "{end} of {}", fragment.len());
    }
    for start in 1..fragment.len() {
        refused(&fragment[start..]);
    }
}

#[test]
fn one_wrong_character_is_always_seen() {
    let fragment = encode(&configuration()).unwrap();
    for at in 0..fragment.len() {
        for other in ["A", "b", "7", "-", "_", "*", "é"] {
            if fragment[at..].starts_with(other) {
                continue;
            }
            let wrong = format!("{}{other}{}", &fragment[..at], &fragment[at + 1..]);
            refused(&wrong);
        }
    }
}

#[test]
fn bombs_are_stopped() {
    let start = Instant::now();
    for size in [1 << 20, 1 << 24, 1 << 26] {
        let bomb = sealed_bytes(&compress_to_vec(&vec![b' '; size], 9));
        let error = refused(&bomb);
        assert!(
            matches!(error.code, "link-too-large" | "link-damaged"),
            "{}",
            error.code
        );
    }
    // As large as may be: many names, long names, deep nesting.
    let hostile = [
        format!(
            "{{\"v\":1{}}}",
            (0..60_000)
                .map(|k| format!(",\"{k}\":0"))
                .collect::<String>()
        ),
        format!(
            "{{\"v\":1,\"view\":{{\"a\":1{}}}}}",
            (0..60_000)
                .map(|k| format!(",\"{k}\":0"))
                .collect::<String>()
        ),
        format!(
            "{{\"v\":1,\"later\":{{\"{}\":{{{}\"a\":0}}}}}}",
            "n".repeat(400_000),
            (0..50_000)
                .map(|k| format!("\"{k}\":0,"))
                .collect::<String>()
        ),
        format!("{{\"v\":1,\"later\":{}}}", "[".repeat(500_000)),
        format!(
            "{{\"v\":1,\"later\":{}1{}}}",
            "[".repeat(400_000),
            "]".repeat(400_000)
        ),
        format!("{{\"v\":1,\"later\":{}}}", "9".repeat(900_000)),
        format!("{{\"v\":1,\"later\":[{}0]}}", "0,".repeat(400_000)),
    ];
    for content in hostile {
        // Sealed by hand: the checks of `encode` are those that are tested.
        let fragment = sealed_bytes(&compress_to_vec(content.as_bytes(), 9));
        let _ = decode(&fragment);
        let _ = serde_json::from_str::<Value>(&content).map(|value| encode(&value));
    }
    let taken = start.elapsed();
    assert!(taken < Duration::from_secs(6), "{taken:?}");
}

#[test]
fn more_than_a_link_holds_is_refused() {
    let mut draws = Draws(3);
    let text: String = (0..100_000)
        .map(|_| char::from(33 + (draws.next() % 90) as u8))
        .collect();
    assert_eq!(
        encode(&json!({ "v": 1, "measurement": { "text": text } }))
            .unwrap_err()
            .code,
        "link-too-large"
    );
    let long = json!({ "v": 1, "later": "x".repeat(2 << 20) });
    assert_eq!(encode(&long).unwrap_err().code, "link-too-large");
    // What may be sealed can be opened, behind a long address too.
    let text: String = text.chars().take(52_000).collect();
    let fragment = seal(&text).unwrap();
    assert!(fragment.len() > 50_000);
    assert_eq!(
        open(&format!(
            "{}#{fragment}",
            "https://example.org/".repeat(900)
        ))
        .unwrap(),
        text
    );
}

/// splitmix64 (Steele, Lea and Flood 2014): the same inputs on every run.
struct Draws(u64);

impl Draws {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    fn below(&mut self, end: usize) -> usize {
        (self.next() % end.max(1) as u64) as usize
    }
}

/// A link, random bytes with a true checksum, hostile JSON, noise: all refused or
/// read, none survives as something that cannot be written again.
#[test]
fn a_hundred_thousand_hostile_links() {
    let valid = encode(&configuration()).unwrap();
    let content = configuration().to_string();
    let mut draws = Draws(11);
    for k in 0..100_000 {
        let link = match k % 4 {
            0 => {
                let mut link = valid.clone().into_bytes();
                for _ in 0..=draws.below(4) {
                    let at = draws.below(link.len());
                    match draws.below(3) {
                        0 => link[at] = draws.next() as u8,
                        1 => link.truncate(at.max(1)),
                        _ => link.insert(at, b"v1.-_%#\n "[draws.below(9)]),
                    }
                }
                String::from_utf8_lossy(&link).into_owned()
            }
            1 => {
                let bytes: Vec<u8> = (0..draws.below(200)).map(|_| draws.next() as u8).collect();
                sealed_bytes(&bytes)
            }
            2 => {
                let mut content = content.clone().into_bytes();
                for _ in 0..=draws.below(4) {
                    let at = draws.below(content.len());
                    match draws.below(4) {
                        0 => content[at] = b"\"{}[]:,0e-.\\nt\xff"[draws.below(15)],
                        1 => content.truncate(at.max(4)),
                        2 => drop(content.splice(at..at + 1, [])),
                        _ => content.insert(at, b"\"{}[]:,0e-.\\nt\xff"[draws.below(15)]),
                    }
                }
                sealed_bytes(&compress_to_vec(&content, 1))
            }
            _ => (0..draws.below(80))
                .filter_map(|_| char::from_u32(draws.below(0x3000) as u32))
                .collect(),
        };
        match decode(&link) {
            Ok(value) => {
                let again = encode(&value).unwrap();
                assert_eq!(decode(&again).unwrap(), value);
            }
            Err(error) => assert!(error.message.ends_with('.'), "{error}"),
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(500) })]

    /// Every finite double travels bit for bit.
    #[test]
    fn every_bit_travels(patterns in prop::array::uniform16(any::<u64>())) {
        let numbers = patterns.map(|pattern| {
            let number = f64::from_bits(pattern);
            if number.is_finite() { number } else { f64::from_bits(pattern & !(1 << 62)) }
        });
        let configuration = json!({ "v": 1, "measurement": { "mueller": numbers }, "later": numbers });
        let back = decode(&encode(&configuration).unwrap()).unwrap();
        for block in [&back["measurement"]["mueller"], &back["later"]] {
            for (k, number) in numbers.iter().enumerate() {
                prop_assert_eq!(block[k].as_f64().unwrap().to_bits(), number.to_bits());
            }
        }
    }

    /// Any text travels in the envelope.
    #[test]
    fn any_text_travels(text in ".{0,300}") {
        prop_assert_eq!(open(&seal(&text).unwrap()).unwrap(), text);
    }
}

#[test]
fn several_matrices_travel_and_are_checked() {
    let one: Vec<f64> = (0..16).map(|k| f64::from(k) / 7.0).collect();
    let mut configuration = configuration();
    configuration["compareWith"] =
        json!({ "mueller": one, "noise": { "kind": "uniform", "sigma": 0.01 } });
    configuration["dataFile"] = json!({ "name": "film.npy", "sha256": "00ff" });
    configuration["series"] = json!({ "use": "series", "matrices": [one, one], "labels": ["a", "b"], "coordinates": [450, 500.5] });
    let back = decode(&encode(&configuration).unwrap()).unwrap();
    assert_eq!(back.to_string(), configuration.to_string());
    for (path, bad, field) in [
        ("series", json!({ "use": "other" }), "series.use"),
        (
            "series",
            json!({ "use": "pick", "matrices": [[1, 2]] }),
            "series.matrices",
        ),
        (
            "series",
            json!({ "matrices": [one], "labels": ["a", "b"] }),
            "series.labels",
        ),
        (
            "series",
            json!({ "matrices": [one], "coordinates": ["a"] }),
            "series.coordinates",
        ),
        ("series", json!({ "more": 1 }), "series.more"),
        (
            "compareWith",
            json!({ "mueller": [1] }),
            "compareWith.mueller",
        ),
        ("dataFile", json!({ "name": 1 }), "dataFile.name"),
    ] {
        let mut configuration = configuration.clone();
        configuration[path] = bad;
        let error = encode(&configuration).expect_err(field);
        assert!(error.to_string().contains(field), "{field}: {error}");
    }
}

#[test]
fn a_file_holds_what_a_link_holds() {
    let configuration = configuration();
    let text = write_file(&configuration).unwrap();
    assert_eq!(
        read_file(&text).unwrap().to_string(),
        configuration.to_string()
    );
    assert_eq!(
        read_file(&format!("\u{feff}{text}")).unwrap(),
        configuration
    );
    for (bad, code) in [
        ("", "file-damaged"),
        (&text[..text.len() - 5], "file-damaged"),
        ("[1]", "bad-request"),
        ("{\"v\": 2}", "link-newer"),
        ("{}", "bad-request"),
    ] {
        assert_eq!(read_file(bad).expect_err(bad).code, code, "{bad}");
    }
}
