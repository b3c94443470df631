//! Reading files. The samples under `samples/files/` were written by `samples/make.py`
//! (NumPy and Python's encoders); the expected numbers are what NumPy holds.

use std::fs;
use std::path::PathBuf;

use halfshade::text::{MatricesRead, ReadOptions, Stacking, parse_file};
use proptest::prelude::*;
use serde_json::Value;

fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/samples/files")
}

fn sample(name: &str) -> Vec<u8> {
    fs::read(folder().join(name)).unwrap()
}

fn read(bytes: &[u8]) -> MatricesRead {
    parse_file(bytes, &ReadOptions::default()).unwrap_or_else(|error| panic!("{error}"))
}

#[track_caller]
fn refused(bytes: &[u8], code: &str, sentence: &str) {
    let error = parse_file(bytes, &ReadOptions::default()).expect_err("was read");
    assert_eq!(error.code, code, "{error}");
    assert!(error.message.contains(sentence), "{error}");
}

/// Seen: every number bit for bit as NumPy holds it.
#[test]
fn every_file_is_read_exactly() {
    let expected = fs::read_to_string(folder().join("expected.json")).unwrap();
    let expected: Value = serde_json::from_str(&expected).unwrap();
    let expected = expected.as_object().unwrap();
    assert!(expected.len() >= 17);
    for (name, matrices) in expected {
        let read = read(&sample(name));
        assert!(read.alternatives.is_empty(), "{name}");
        let found: Vec<[u64; 16]> = read
            .matrices
            .iter()
            .map(|one| one.mueller.map(f64::to_bits))
            .collect();
        let numbers: Vec<[u64; 16]> = matrices
            .as_array()
            .unwrap()
            .iter()
            .map(|one| std::array::from_fn(|k| one[k].as_f64().unwrap().to_bits()))
            .collect();
        assert_eq!(found, numbers, "{name}");
    }
}

/// An array file as NumPy Enhancement Proposal 1 describes it.
fn array(header: &str, numbers: &[f64]) -> Vec<u8> {
    let mut bytes = b"\x93NUMPY\x01\x00".to_vec();
    bytes.extend(u16::try_from(header.len()).unwrap().to_le_bytes());
    bytes.extend(header.as_bytes());
    bytes.extend(numbers.iter().flat_map(|number| number.to_le_bytes()));
    bytes
}

fn header(descr: &str, shape: &str) -> String {
    format!("{{'descr': '{descr}', 'fortran_order': False, 'shape': {shape}, }}\n")
}

#[test]
fn two_ways_to_stack_are_asked_about() {
    let numbers: Vec<f64> = (0..64).map(f64::from).collect();
    let bytes = array(&header("<f8", "(4, 4, 4)"), &numbers);
    let both = read(&bytes);
    assert_eq!(both.alternatives.len(), 1);
    assert_eq!(both.notes[0].code, "ambiguous-reading");
    let first = parse_file(
        &bytes,
        &ReadOptions {
            stacking: Some(Stacking::First),
            ..ReadOptions::default()
        },
    )
    .unwrap();
    let last = parse_file(
        &bytes,
        &ReadOptions {
            stacking: Some(Stacking::Last),
            ..ReadOptions::default()
        },
    )
    .unwrap();
    assert!(first.alternatives.is_empty() && last.alternatives.is_empty());
    // Derived: the place of element (i, j) of matrix n is 16 n + 4 i + j, or 16 i + 4 j + n.
    assert_eq!(first.matrices[1].mueller[6], 22.0);
    assert_eq!(last.matrices[1].mueller[6], 25.0);
}

#[test]
fn bad_files_are_refused() {
    let sixteen = [1.0; 16];
    let good = array(&header("<f8", "(4, 4)"), &sixteen);
    assert_eq!(read(&good).matrices.len(), 1);
    for length in 6..good.len() {
        let error = parse_file(&good[..length], &ReadOptions::default()).expect_err("was read");
        assert_eq!(error.code, "bad-file", "{length}: {error}");
    }
    refused(
        &array(&header("<f8", "(3, 5)"), &[0.0; 15]),
        "form-not-read",
        "(3, 5)",
    );
    refused(
        &array(&header("<c16", "(4, 4)"), &[0.0; 32]),
        "form-not-read",
        "<c16",
    );
    refused(
        &array(&header("|O", "(4, 4)"), &sixteen),
        "form-not-read",
        "|O",
    );
    refused(
        &array(&header("|b1", "(4, 4)"), &[0.0; 2]),
        "form-not-read",
        "|b1",
    );
    refused(
        &array(
            "{'descr': [('a', '<f8')], 'fortran_order': False, 'shape': (4, 4)}",
            &sixteen,
        ),
        "form-not-read",
        "records",
    );
    refused(
        &array("{'descr': '<f8', 'shape': (4, 4)}", &sixteen),
        "bad-file",
        "header",
    );
    refused(&array("{'descr'", &sixteen), "bad-file", "header");
    refused(
        &array(&header("<f8", "(4, 4)"), &[0.0; 17]),
        "bad-file",
        "128 bytes",
    );
    refused(
        &array(&header("<f8", "(99999999999, 4, 4)"), &sixteen),
        "too-large",
        "two million",
    );
    refused(
        &array(&header("<f8", "(18446744073709551615, 16)"), &sixteen),
        "too-large",
        "two million",
    );
    refused(
        &array(&header("<f8", "(0, 16)"), &[]),
        "form-not-read",
        "(0, 16)",
    );
    refused(b"\x93NUMPY\x09\x00aaaaaaaa", "form-not-read", "version 9");
    refused(
        b"\x93NUMPY\x02\x00\xff\xff\xff\xffaaaa",
        "bad-file",
        "longer",
    );
    let mut nan = sixteen;
    nan[6] = f64::NAN;
    refused(
        &array(&header("<f8", "(4, 4)"), &nan),
        "not-finite",
        "Matrix 1, row 2, column 3",
    );
    let two: Vec<f64> = sixteen.into_iter().chain(nan).collect();
    let read = read(&array(&header("<f8", "(2, 16)"), &two));
    assert_eq!(read.matrices.len(), 1);
    assert!(
        read.notes
            .iter()
            .any(|note| note.message.contains("Matrix 2, row 2"))
    );
    refused(
        b"PK\x03\x04 a zip file \x00\x01",
        "form-not-read",
        "binary file",
    );
    refused(&[0xff, 0xfe, 0x00, 0xd8], "form-not-read", "not text");
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(common_cases()))]

    #[test]
    fn no_file_breaks_the_reader(bytes in prop::collection::vec(any::<u8>(), 0..400), array_file in any::<bool>(), shape in "[(][0-9, ]{0,12}[)]", descr in "[<>|=][fiucO][0-9]{1,2}") {
        let bytes = if array_file {
            let mut file = array(&header(&descr, &shape), &[]);
            file.extend(bytes);
            file
        } else {
            bytes
        };
        if let Ok(read) = parse_file(&bytes, &ReadOptions::default()) {
            prop_assert!(read.matrices.iter().all(|one| one.mueller.iter().all(|value| value.is_finite())));
        }
    }
}

/// `PROPTEST_CASES` asks for more.
fn common_cases() -> u32 {
    std::env::var("PROPTEST_CASES")
        .ok()
        .and_then(|cases| cases.parse().ok())
        .unwrap_or(20_000)
}
