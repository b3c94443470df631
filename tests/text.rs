//! Reading pasted text.
//!
//! The samples under `samples/` were printed by `samples/make.py` (Python, NumPy);
//! the expected numbers are what Python reads from them. Refusals and hand-written
//! cases: derived from the rules in the module's documentation.

use std::fs;
use std::path::Path;
use std::time::{Duration, Instant};

use halfshade::error::{Error, Place, Severity};
use halfshade::text::{
    DecimalMark, Delimiter, Form, MatricesRead, ReadOptions, parse_matrices, parse_number,
};
use proptest::prelude::*;
use serde_json::Value;

const IDENTITY: &str = "1 0 0 0\n0 1 0 0\n0 0 1 0\n0 0 0 1\n";

#[track_caller]
fn read(text: &str) -> MatricesRead {
    parse_matrices(text, &ReadOptions::default()).unwrap_or_else(|error| panic!("{error}"))
}

#[track_caller]
fn refusal(text: &str) -> Error {
    match parse_matrices(text, &ReadOptions::default()) {
        Err(error) => error,
        Ok(read) => panic!("was read: {read:?}"),
    }
}

fn bits(matrix: &[f64; 16]) -> [u64; 16] {
    matrix.map(f64::to_bits)
}

/// Code, line, character, length.
fn place(code: &'static str, at: Option<&Place>) -> (&'static str, usize, usize, usize) {
    match at {
        Some(&Place::Text {
            line,
            character,
            length,
        }) => (code, line, character, length),
        _ => (code, 0, 0, 0),
    }
}

fn refusals(read: &MatricesRead) -> Vec<(&'static str, usize, usize, usize)> {
    read.notes
        .iter()
        .filter(|note| note.severity == Severity::Refusal)
        .map(|note| place(note.code, note.at.as_ref()))
        .collect()
}

fn samples() -> Vec<(String, String, Value)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/samples");
    let expected = fs::read_to_string(folder.join("expected.json")).unwrap();
    let expected: Value = serde_json::from_str(&expected).unwrap();
    expected
        .as_object()
        .unwrap()
        .iter()
        .map(|(name, expected)| {
            let text = fs::read_to_string(folder.join(format!("{name}.txt"))).unwrap();
            (name.clone(), text, expected.clone())
        })
        .collect()
}

/// Seen: every number bit for bit as Python reads it.
#[test]
fn every_form_is_read_exactly() {
    let samples = samples();
    assert!(samples.len() >= 120);
    let mut bad = Vec::new();
    for (name, text, expected) in &samples {
        let read = match parse_matrices(text, &ReadOptions::default()) {
            Ok(read) => read,
            Err(error) => {
                bad.push(format!("{name}: {error}"));
                continue;
            }
        };
        let numbers: Vec<[f64; 16]> = expected["matrices"]
            .as_array()
            .unwrap()
            .iter()
            .map(|matrix| std::array::from_fn(|k| matrix[k].as_f64().unwrap()))
            .collect();
        let found: Vec<[f64; 16]> = read.matrices.iter().map(|one| one.mueller).collect();
        if found.iter().map(bits).ne(numbers.iter().map(bits)) {
            bad.push(format!("{name}: {found:?}, expected {numbers:?}"));
        }
        if !read.alternatives.is_empty() || !refusals(&read).is_empty() {
            bad.push(format!("{name}: {:?} {:?}", read.alternatives, read.notes));
        }
        if let Some(labels) = expected.get("labels") {
            let found: Vec<Value> = read
                .matrices
                .iter()
                .map(|one| one.label.clone().map_or(Value::Null, Value::String))
                .collect();
            if labels.as_array().unwrap() != &found {
                bad.push(format!("{name}: {found:?}, expected {labels}"));
            }
        }
        if let Some(sigma) = expected.get("sigma") {
            let found: Vec<_> = read.matrices.iter().map(|one| one.sigma).collect();
            let sigma: Vec<Option<[f64; 16]>> = sigma
                .as_array()
                .unwrap()
                .iter()
                .map(|one| Some(std::array::from_fn(|k| one[k].as_f64().unwrap())))
                .collect();
            if found != sigma {
                bad.push(format!("{name}: sigma {found:?}, expected {sigma:?}"));
            }
        } else if read.matrices.iter().any(|one| one.sigma.is_some()) {
            bad.push(format!("{name}: uncertainties from nowhere"));
        }
        if let Some(coordinates) = expected.get("coordinates") {
            let found: Vec<f64> = read
                .matrices
                .iter()
                .filter_map(|one| one.coordinate)
                .collect();
            let coordinates = coordinates
                .as_array()
                .unwrap()
                .iter()
                .map(|x| x.as_f64().unwrap());
            if coordinates.ne(found.iter().copied()) {
                bad.push(format!("{name}: coordinates {found:?}"));
            }
        }
        if let Some(decimals) = expected.get("decimals") {
            let found = read.matrices[0].decimals.map(u64::from);
            if found != decimals.as_u64() {
                bad.push(format!("{name}: decimals {found:?}, expected {decimals}"));
            }
        }
    }
    assert!(bad.is_empty(), "{}", bad.join("\n"));
}

#[test]
fn the_reading_is_described() {
    let check = |text: &str, form, decimal, delimiter, headers| {
        let reading = read(text).reading;
        assert_eq!(reading.form, form, "{text}");
        assert_eq!(reading.decimal, decimal, "{text}");
        assert_eq!(reading.delimiter, delimiter, "{text}");
        assert_eq!(reading.header_row_count, headers, "{text}");
    };
    let tabs = IDENTITY.replace(' ', "\t");
    check(
        &format!("a\tb\tc\td\n{tabs}"),
        Form::Table,
        DecimalMark::Point,
        Some(Delimiter::Tab),
        1,
    );
    check(
        &IDENTITY.replace(' ', ";").replace('1', "0,5"),
        Form::Table,
        DecimalMark::Comma,
        Some(Delimiter::Semicolon),
        0,
    );
    check(
        "[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]]",
        Form::Brackets,
        DecimalMark::Point,
        None,
        0,
    );
    check(
        "[1 0 0 0;0 1 0 0;0 0 1 0;0 0 0 1]",
        Form::BracketsWithSemicolons,
        DecimalMark::Point,
        None,
        0,
    );
}

#[test]
fn refusals_say_where_and_why() {
    let check = |text: &str, code: &str, line, character, length, sentence: &str| {
        let error = refusal(text);
        assert_eq!(
            place(error.code, error.at.as_ref()),
            (error.code, line, character, length),
            "{text}: {error:?}"
        );
        assert_eq!(error.code, code, "{text}: {error:?}");
        assert!(error.message.contains(sentence), "{text}: {error:?}");
    };
    check("", "no-numbers", 0, 0, 0, "no numbers");
    check(" \n\t\n", "no-numbers", 0, 0, 0, "no numbers");
    check("kelp, film A\n", "no-numbers", 0, 0, 0, "no numbers");
    let third = |row: &str| format!("1 0 0 0\n0 1 0 0\n{row}\n0 0 0 1\n");
    check(
        &third("0 0 x 0"),
        "bad-number",
        3,
        5,
        1,
        "Matrix 1, row 3, column 3: 'x' is not a number.",
    );
    check(
        &third("0 0,5.2 1 0"),
        "bad-number",
        3,
        3,
        5,
        "row 3, column 2: '0,5.2' has two decimal marks.",
    );
    check(
        &third("0 0 1"),
        "ragged-row",
        3,
        1,
        5,
        "row 3: expected 4 numbers, found 3.",
    );
    check(
        &third("0 0 1 0 0"),
        "ragged-row",
        3,
        1,
        9,
        "row 3: expected 4 numbers, found 5.",
    );
    check(&third("0 0x1F 1 0"), "bad-number", 3, 3, 4, "hexadecimal");
    check(&third("0 1_000 1 0"), "bad-number", 3, 3, 5, "underscore");
    check(
        &third("0 nan 1 0"),
        "not-finite",
        3,
        3,
        3,
        "not a finite number",
    );
    check(
        &third("nan nan nan nan"),
        "not-finite",
        3,
        1,
        3,
        "not a finite number",
    );
    check(
        &third("0 -Infinity 1 0"),
        "not-finite",
        3,
        3,
        9,
        "not a finite number",
    );
    check(&third("0 1+2j 1 0"), "complex-number", 3, 3, 4, "complex");
    check(&third("0 2i 1 0"), "complex-number", 3, 3, 2, "complex");
    check(
        &third("0 1e400 1 0"),
        "number-too-large",
        3,
        3,
        5,
        "larger than a double",
    );
    check(&third("0 1.0D 1 0"), "bad-number", 3, 3, 4, "not a number");
    for odd in [
        "0.5(1.2.3)",
        "0.5(-1)",
        "0.5(1",
        "0.5(1)x",
        "(0.5±1)",
        "0.5±x",
    ] {
        let length = odd.chars().count();
        let row = format!("0 {odd} 1 0");
        let error = refusal(&third(&row));
        assert_eq!(
            place("", error.at.as_ref()),
            ("", 3, 3, length),
            "{odd}: {error:?}"
        );
    }
    check(&third("0 1-2 1 0"), "bad-number", 3, 3, 3, "not a number");
    check(&third("0 1/2 1 0"), "bad-number", 3, 3, 3, "not a number");
    check(
        "1\t0\t0\t0\n0\t\t0\t0\n0\t0\t1\t0\n0\t0\t0\t1",
        "empty-cell",
        2,
        3,
        1,
        "row 2, column 2",
    );
    check(
        "1 0 0 0\n0 1 0 0\n0 0 1 0\n",
        "wrong-count",
        1,
        1,
        7,
        "expected 4 rows, found 3",
    );
    check("1 0 0 0 0", "wrong-count", 1, 1, 9, "found 5 numbers");
    check("0.5", "wrong-count", 1, 1, 3, "found 1 number.");
    check(
        "1\n2\n3\n",
        "wrong-count",
        1,
        1,
        1,
        "expected 16 numbers, one a line, found 3",
    );
    // A ragged matrix has sixteen numbers too.
    check(
        "1 0 0 0 0\n1 0 0\n0 1 0 0\n0 0 0 1\n",
        "ragged-row",
        1,
        1,
        9,
        "found 5",
    );
    check(
        "[1 0 0 0 0; 1 0 0; 0 1 0 0; 0 0 0 1]",
        "ragged-row",
        1,
        2,
        9,
        "found 5",
    );
    check(
        "[1 0 0 0 0\n 1 0 0\n 0 1 0 0\n 0 0 0 1]",
        "ragged-row",
        1,
        2,
        9,
        "found 5",
    );
    check(
        "[[1,0,0,0,0],[1,0,0],[0,1,0,0],[0,0,0,1]]",
        "ragged-row",
        1,
        3,
        9,
        "found 5",
    );
    check(
        "[(1,0,0,0,0),(1,0,0),(0,1,0,0),(0,0,0,1)]",
        "ragged-row",
        1,
        3,
        9,
        "found 5",
    );
    // Eight values with a sigma each have sixteen numbers too.
    check(&"0.5 0.1\n".repeat(8), "ragged-row", 1, 1, 7, "found 2");
    check(
        &"0 0.5 0.1 0.2 0.3\n".repeat(16),
        "ragged-row",
        1,
        1,
        17,
        "found 5",
    );
    check(
        "[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,x,1]]",
        "bad-number",
        1,
        37,
        1,
        "row 4, column 3: 'x' is not a number.",
    );
    check(
        "[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,null,1]]",
        "not-finite",
        1,
        37,
        4,
        "not a finite",
    );
    check(
        "[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]",
        "open-bracket",
        1,
        1,
        1,
        "not closed",
    );
    check(
        "1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]]",
        "open-bracket",
        1,
        8,
        1,
        "not opened",
    );
    check(
        "{\"mueller\": [1,0,0,0,0,1,0,0,0,0,1,0,0,0,0]}",
        "json-object",
        1,
        43,
        1,
        "No list in this object",
    );
    check(
        "[\n {\n \"m\": [1,0,0,0,0,1,0,0,0,null,1,0,0,0,0,1]}]",
        "not-finite",
        3,
        26,
        4,
        "Matrix 1, column 10: 'null' is not a finite number",
    );
    check(
        "[[[1. 0. 0. 0.]\n  [0. 1. 0. 0.]]\n\n ...\n\n [[1. 0. 0. 0.]\n  [0. 1. 0. 0.]]]",
        "elided-print",
        4,
        2,
        3,
        "numpy.savetxt",
    );
    check(
        "[1. 0. 0. ... 0. 0. 1.]",
        "elided-print",
        1,
        11,
        3,
        "numpy.savetxt",
    );
    check(
        "1 0 0 0\n...\n0 0 0 1\n",
        "elided-print",
        2,
        1,
        3,
        "numpy.savetxt",
    );
    check(
        "  Columns 1 through 2\n\n1 0\n0 1\n0 0\n0 0\n",
        "ragged-row",
        3,
        1,
        3,
        "expected 4 numbers, found 2",
    );
    check(
        "  Columns 1 through 2\n\n1 0\n0 1\n0 0\n0 0\n\n  Columns 3 through 4\n\n1 0\n0 1\n0 0\n",
        "ragged-row",
        6,
        1,
        3,
        "expected 4 numbers, found 2",
    );
    check(
        "\\begin{pmatrix} 1 & 0 & 0 & 0 \\\\",
        "open-bracket",
        1,
        1,
        1,
        "not closed",
    );
    check(
        "1 & 0 & 0 & 0 \\\\\n",
        "wrong-count",
        1,
        1,
        13,
        "expected 4 rows",
    );
    check(
        "\\begin{pmatrix} 1 & & 0 & 0 \\\\ 0 & 1 & 0 & 0 \\\\ 0 & 0 & 1 & 0 \\\\ 0 & 0 & 0 & 1 \\end{pmatrix}",
        "empty-cell",
        1,
        21,
        1,
        "row 1, column 2",
    );
}

/// What is calculated with a matrix changes its numbers: never read as if it did not.
#[test]
fn calculations_are_not_passed_over() {
    let literal = "[1 0 0 0;0 1 0 0;0 0 1 0;0 0 0 1]";
    let lists = "[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]]";
    for text in [
        format!("M = 1e-3*{literal};"),
        format!("M = 0.5 * {literal}"),
        format!("M = -{literal}"),
        format!("M = {literal}'"),
        format!("M = {literal}.'"),
        format!("M = {literal}/2"),
        format!("M = {literal} * 0.1"),
        format!("M = inv({literal})"),
        format!("M = np.linalg.inv({lists})"),
        format!("np.array({lists}).T"),
        format!("np.array({lists}) * 1e-3"),
        format!("2*np.array({lists})"),
        format!("np.array({lists}).reshape(4, 4, order='F')"),
        format!("reshape({literal}, 4, 4)"),
        format!("A = B - {literal}"),
        "\\frac{1}{2}\\begin{pmatrix}1&0&0&0\\\\0&1&0&0\\\\0&0&1&0\\\\0&0&0&1\\end{pmatrix}"
            .to_owned(),
        "10^{-3}\\begin{pmatrix}1&0&0&0\\\\0&1&0&0\\\\0&0&1&0\\\\0&0&0&1\\end{pmatrix}".to_owned(),
        "0.5 \\begin{pmatrix}1&0&0&0\\\\0&1&0&0\\\\0&0&1&0\\\\0&0&0&1\\end{pmatrix}".to_owned(),
    ] {
        let error = refusal(&text);
        assert_eq!(error.code, "calculation", "{text}: {error:?}");
    }
    for element in [
        "sqrt(2)", "1/2", "2*3", "pi", "cos(0.5)", "1 + 2", "1e-3*2", "x0", "1.5(x)",
    ] {
        let text = format!("[1 {element} 0 0;0 1 0 0;0 0 1 0;0 0 0 1]");
        let error = refusal(&text);
        assert!(
            matches!(error.code, "bad-number" | "ragged-row"),
            "{text}: {error:?}"
        );
    }
    // Names and asides are no calculations.
    for text in [
        format!("Film A (3 mm thick), 2 layers:\n{literal}\n"),
        format!("Film - kelp\nM = {literal} % 2 * 3\n"),
        format!("print({lists})"),
        format!("np.array({lists}, dtype=np.float64)"),
        format!("a[0] = {lists}"),
    ] {
        assert_eq!(read(&text).matrices.len(), 1, "{text}");
    }
}

#[test]
fn good_matrices_survive_a_bad_one() {
    let bad = IDENTITY.replacen("0 0 1 0", "0 0 one 0", 1);
    let ragged = IDENTITY.replacen("0 0 1 0", "0 0 1", 1);
    let missing = IDENTITY.replacen("0 0 1 0\n", "", 1);
    for spoilt in [&bad, &ragged, &missing] {
        let found = read(&format!("# A\n{IDENTITY}\n# B\n{spoilt}\n# C\n{IDENTITY}"));
        let labels: Vec<_> = found
            .matrices
            .iter()
            .map(|one| one.label.as_deref())
            .collect();
        assert_eq!(labels, [Some("A"), Some("C")]);
        assert_eq!(refusals(&found).len(), 1);
    }
    let found = read(&format!("{IDENTITY}\n{bad}\n{IDENTITY}"));
    assert_eq!(refusals(&found), [("bad-number", 8, 5, 3)]);
    assert_eq!(
        found.notes[0].message,
        "Matrix 2, row 3, column 3: 'one' is not a number."
    );
    assert_eq!(found.matrices[1].line, 11);

    let lists = "[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]]";
    let short = "[[1,0,0,0],[0,1,0,0],[0,0,0,1]]";
    let found = read(&format!("[{lists},\n{short},\n{lists}]"));
    assert_eq!(found.matrices.len(), 2);
    assert_eq!(refusals(&found), [("wrong-count", 2, 3, 7)]);
    let identity = read(lists).matrices[0].mueller;
    assert!(found.matrices.iter().all(|one| one.mueller == identity));

    // Rows of sixteen: one each.
    let row = "1 0 0 0 0 1 0 0 0 0 1 0 0 0 0 1";
    let found = read(&format!("{row}\n{row} 0\n{row}\nnan {row}\n{row}\n"));
    assert_eq!(found.matrices.len(), 3);
    assert_eq!(
        refusals(&found),
        [("ragged-row", 2, 1, 33), ("not-finite", 4, 1, 3)]
    );

    // Values that are calculated with, or cut off, take no other with them.
    let found = read(&format!(
        "A = {lists}\nB = 2*{lists}\nC = {lists}\nD = [[1,0,0,0],"
    ));
    let labels: Vec<_> = found
        .matrices
        .iter()
        .map(|one| one.label.as_deref())
        .collect();
    assert_eq!(labels, [Some("A"), Some("C")]);
    assert_eq!(
        refusals(&found)
            .iter()
            .map(|refusal| refusal.0)
            .collect::<Vec<_>>(),
        ["calculation", "open-bracket"]
    );
}

/// With a row missing nobody knows where a matrix begins: none is made of the rows
/// of two.
#[test]
fn rows_of_two_matrices_are_not_mixed() {
    let seven: Vec<&str> = IDENTITY.lines().take(3).chain(IDENTITY.lines()).collect();
    let error = refusal(&seven.join("\n"));
    assert_eq!(error.code, "wrong-count");
    assert!(error.message.contains("7 rows"), "{error}");
    let lists = seven
        .iter()
        .map(|row| format!("[{}]", row.replace(' ', ",")));
    let lists = lists.collect::<Vec<_>>();
    assert_eq!(refusal(&lists.join("\n")).code, "wrong-count");
    assert_eq!(
        refusal(&format!("[{}]", lists.join(","))).code,
        "wrong-count"
    );
    // Three and five rows are eight, but not two matrices.
    let apart = format!(
        "{}\n\n{}\n1 1 1 1",
        seven[..3].join("\n"),
        seven[3..].join("\n")
    );
    assert_eq!(refusal(&apart).code, "wrong-count");
}

#[test]
fn numbers_beside_the_brackets_are_not_lost_in_silence() {
    let found = read(&format!(
        "{IDENTITY}\n[[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]]"
    ));
    assert_eq!(found.matrices.len(), 1);
    assert!(
        refusals(&found)
            .iter()
            .all(|refusal| refusal.0 == "outside-brackets")
    );
    assert_eq!(refusals(&found).len(), 4);
}

#[test]
fn brackets_in_a_title_do_no_harm() {
    let found = read(&format!("film A [kelp], lambda [nm] = 550\n{IDENTITY}"));
    assert_eq!(found.reading.form, Form::Table);
    assert_eq!(found.matrices.len(), 1);
}

#[test]
fn thousands_and_decimal_commas_are_asked_about() {
    let text = "1,234\t0\t0\t0\n0\t5,678\t0\t0\n0\t0\t1\t0\n0\t0\t0\t1\n";
    let found = read(text);
    assert_eq!(found.matrices[0].mueller[0], 1.234);
    assert_eq!(found.alternatives.len(), 1);
    assert_eq!(found.alternatives[0].matrices[0].mueller[0], 1234.0);
    assert!(found.alternatives[0].reading.grouped);
    assert_eq!(found.notes[0].code, "ambiguous-reading");
    assert_eq!(found.notes[0].severity, Severity::Warning);
    for (decimal, value) in [(DecimalMark::Comma, 1.234), (DecimalMark::Point, 1234.0)] {
        let options = ReadOptions {
            decimal: Some(decimal),
            delimiter: None,
            ..ReadOptions::default()
        };
        let forced = parse_matrices(text, &options).unwrap();
        assert_eq!(forced.matrices[0].mueller[0], value);
        assert!(forced.alternatives.is_empty());
    }
    // The last of two marks is the decimal one; a leading zero groups nothing.
    for (cell, value) in [
        ("1,234.5", 1234.5),
        ("1.234,5", 1234.5),
        ("0,234", 0.234),
        ("1,23", 1.23),
    ] {
        let found = read(&text.replace("1,234", cell).replace("5,678", "0"));
        assert_eq!(found.matrices[0].mueller[0], value, "{cell}");
        assert!(found.alternatives.is_empty(), "{cell}");
    }
}

#[test]
fn a_delimiter_can_be_settled() {
    let options = ReadOptions {
        decimal: None,
        delimiter: Some(Delimiter::Tab),
        ..ReadOptions::default()
    };
    assert!(parse_matrices(IDENTITY, &options).is_err());
    let found = parse_matrices(&IDENTITY.replace(' ', "\t"), &options).unwrap();
    assert_eq!(found.reading.delimiter, Some(Delimiter::Tab));
}

/// Derived from the rule: the finest of plain decimals, the coarsest of those with
/// exponents.
#[test]
fn decimals_tell_the_printed_resolution() {
    let check = |replacement: &str, decimals: Option<u32>| {
        let text = IDENTITY.replacen("0 1 0 0", replacement, 1);
        assert_eq!(read(&text).matrices[0].decimals, decimals, "{replacement}");
    };
    check("0 1 0 0", None);
    check("0 12 -3 0", Some(0));
    check("0 0.5 0 0", Some(1));
    check("0 0.5 0.25 0.1250", Some(4));
    check("0 1.00e+00 0 0", Some(2));
    check("0 9.99e-01 1.23e-04 0.00e+00", Some(3));
    check("0 0.98765 1.2345e-05 0", Some(5));
    check("0 0.12345678901234567 0 0", None);
    check("0 1.5e3 0 0", None);
}

#[test]
fn underflow_is_noted() {
    let found = read(&IDENTITY.replacen("0 1 0 0", "0 1e-400 -1e-999 0", 1));
    assert_eq!(found.matrices[0].mueller[6].to_bits(), (-0.0_f64).to_bits());
    let notes: Vec<_> = found
        .notes
        .iter()
        .map(|note| (note.severity, place(note.code, note.at.as_ref())))
        .collect();
    assert_eq!(
        notes,
        [
            (Severity::Warning, ("underflow", 2, 3, 6)),
            (Severity::Warning, ("underflow", 2, 10, 7))
        ]
    );
}

#[test]
fn complaints_are_listed_up_to_twenty() {
    let bad = IDENTITY.replace('1', "x");
    let found = read(&format!("{IDENTITY}\n{}", format!("{bad}\n").repeat(30)));
    assert_eq!(found.matrices.len(), 1);
    assert_eq!(refusals(&found).len(), 21);
    assert_eq!(found.notes[20].code, "more-refusals");
    assert_eq!(
        found.notes[20].message,
        "And 100 more places that could not be read."
    );
}

#[test]
fn too_much_is_refused() {
    assert_eq!(refusal(&" ".repeat((16 << 20) + 1)).code, "too-large");
    assert_eq!(refusal(&"\n".repeat(2_000_000)).code, "too-large");
    assert_eq!(refusal(&"1 ".repeat(2_100_000)).code, "too-large");
}

/// Derived: every shape and delimiter holds the same numbers.
#[test]
fn ten_thousand_matrices() {
    let line = "0.9876\t-0.0123\t0.4567\t-0.8765\n";
    let text = format!("{}\n", line.repeat(4)).repeat(10_000);
    let start = Instant::now();
    let found = read(&text);
    assert_eq!(found.matrices.len(), 10_000);
    assert_eq!(found.matrices[9999].line, 5 * 9999 + 1);
    assert!(start.elapsed() < Duration::from_secs(5));
}

#[test]
fn number_grammar() {
    let value =
        |token: &str| parse_number(token, DecimalMark::Point, false).map(|number| number.value);
    for (token, expected) in [
        ("1", 1.0),
        ("+1.", 1.0),
        (".5", 0.5),
        ("-.5e-1", -0.05),
        ("1E+2", 100.0),
        ("00012", 12.0),
    ] {
        assert_eq!(value(token), Ok(expected), "{token}");
    }
    for token in [
        "", ".", "-", "+", "e5", "1e", "1e+", "--1", "+-1", "1 ", " 1", "1.2.3", "1e5.0", "1e5e5",
        "0b1", "0o7", "1f", "1L", "infinity", "1__0", "½", "²", "1²", "٣", "−1", "1e٣", "NaN(1)",
        "1,5", "1'000", "１",
    ] {
        assert!(value(token).is_err(), "{token}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(300) })]

    /// Any double, in any form, comes back bit for bit.
    #[test]
    fn every_bit_is_read(
        patterns in prop::array::uniform16(any::<u64>()),
        form in 0..7_usize,
    ) {
        let numbers = patterns.map(|pattern| {
            let number = f64::from_bits(pattern);
            // Exponents of all ones are no numbers.
            if number.is_finite() { number } else { f64::from_bits(pattern & !(1 << 62)) }
        });
        let rows = |between: &str, comma: bool, scientific: bool| -> Vec<String> {
            numbers.chunks(4).map(|row| {
                let row: Vec<String> = row.iter().map(|x| {
                    let text = if scientific { format!("{x:e}") } else { format!("{x:?}") };
                    if comma { text.replace('.', ",") } else { text }
                }).collect();
                row.join(between)
            }).collect()
        };
        let text = match form {
            0 => rows("\t", false, true).join("\r\n"),
            1 => rows(";", true, true).join("\n"),
            2 => rows(" ", false, false).join("\n"),
            3 => format!("[[{}]]", rows(", ", false, false).join("],\n [")),
            4 => format!("[{}]", rows(" ", false, true).join("; ")),
            5 => rows(",", false, false).join(","),
            _ => rows("\n", false, true).join("\n"),
        };
        let read = parse_matrices(&text, &ReadOptions::default());
        let read = read.map_err(|error| TestCaseError::fail(format!("{text}: {error}")))?;
        prop_assert_eq!(read.matrices.len(), 1);
        prop_assert_eq!(bits(&read.matrices[0].mueller), bits(&numbers));
    }

    /// Whatever is read is finite, and every place is in the text.
    #[test]
    fn any_text_is_survived(text in "[-0-9.,;\\[\\]{}()e \t\n\"'#%=xN+*…]{0,200}") {
        survives(&text);
    }
}

/// Panics where a result breaks a promise.
fn survives(text: &str) {
    let lines: Vec<usize> = text
        .replace("\r\n", "\n")
        .split(['\n', '\r'])
        .map(|line| line.chars().count())
        .collect();
    let inside = |at: Option<&Place>| {
        if let Some(&Place::Text {
            line,
            character,
            length,
        }) = at
        {
            assert!(line >= 1 && line <= lines.len(), "{text:?}: line {line}");
            assert!(character >= 1 && length >= 1, "{text:?}");
            assert!(
                character + length - 1 <= lines[line - 1].max(1),
                "{text:?}: line {line}, character {character}, length {length}"
            );
        }
    };
    match parse_matrices(text, &ReadOptions::default()) {
        Err(error) => {
            assert!(error.message.ends_with('.'));
            inside(error.at.as_ref());
        }
        Ok(read) => {
            assert!(!read.matrices.is_empty());
            assert!(read.notes.len() <= 64);
            for one in read
                .matrices
                .iter()
                .chain(read.alternatives.iter().flat_map(|a| &a.matrices))
            {
                assert!(one.mueller.iter().all(|x| x.is_finite()));
                assert!(one.line >= 1 && one.line <= lines.len());
                assert!(
                    one.label
                        .as_ref()
                        .is_none_or(|label| label.chars().count() <= 80)
                );
            }
            for note in &read.notes {
                assert!(note.message.chars().count() < 300);
                inside(note.at.as_ref());
            }
        }
    }
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

const FRAGMENTS: [&str; 44] = [
    "[", "]", "{", "}", "(", ")", ",", ";", "\n", "\r", "\t", " ", "\"", "'", "...", "…", "-", "+",
    ".", "e", "1e999", "1e-999", "-0.0", "nan", "inf", "0x", "±", "#", "%", "//", "=", "M = [",
    "array(", "sqrt(", "|", "\0", "\u{feff}", "\u{2212}", "\u{660}", "\u{202e}", "😀", "1,234",
    "*", "&",
];

fn mutated(text: &str, draws: &mut Draws) -> String {
    let mut characters: Vec<char> = text.chars().take(600).collect();
    for _ in 0..=draws.below(6) {
        let at = draws.below(characters.len() + 1);
        match draws.below(5) {
            0 => {
                let end = (at + 1 + draws.below(9)).min(characters.len());
                characters.drain(at..end);
            }
            1 => characters.truncate(at),
            2 => {
                let from = draws.below(characters.len() + 1);
                let to = (from + draws.below(80)).min(characters.len());
                let piece: Vec<char> = characters[from..to].to_vec();
                characters.splice(at..at, piece);
            }
            _ => {
                let fragment = FRAGMENTS[draws.below(FRAGMENTS.len())];
                characters.splice(at..at, fragment.chars());
            }
        }
    }
    characters.into_iter().collect()
}

#[test]
fn a_hundred_thousand_hostile_texts() {
    let samples = samples();
    let mut draws = Draws(7);
    for k in 0..100_000 {
        let text = match k % 10 {
            0 => (0..draws.below(60))
                .map(|_| FRAGMENTS[draws.below(FRAGMENTS.len())])
                .collect(),
            1 => (0..draws.below(60))
                .filter_map(|_| char::from_u32(draws.below(0x11_0000) as u32))
                .collect(),
            2 => {
                let bytes: Vec<u8> = (0..draws.below(80)).map(|_| draws.next() as u8).collect();
                String::from_utf8_lossy(&bytes).into_owned()
            }
            _ => mutated(&samples[draws.below(samples.len())].1, &mut draws),
        };
        survives(&text);
    }
}

/// Long ones of every kind that once made a parser slow: each in linear time.
#[test]
fn long_hostile_texts_take_no_long_time() {
    let size = 1 << 20;
    let fill = |unit: &str| unit.repeat(size / unit.len());
    let mut texts: Vec<String> = FRAGMENTS.iter().map(|unit| fill(unit)).collect();
    texts.extend(
        [
            "1",
            "9",
            "0",
            "1 ",
            "1,",
            "1;",
            "x ",
            "x1 ",
            "a: ",
            "a=",
            "a(",
            "np.array(",
            "a[1]",
            "[1",
            "[[",
            "[]",
            "{\"",
            "(1,",
            "1\n",
            "x 1\n",
            "x 1\n\n",
            "x\n",
            "1 0 0 0\n",
            "1 0 0 x\n",
            "x 0 0 0\n\n",
            "#\n",
            "# a\n1\n",
            "[1]\n",
            "[1]*2\n",
            "[1 0 0 0]\n",
            "\"1",
            "... ",
            "1...\n",
            ".reshape(4,4)",
            "].",
            "1,234\t",
            "[1,2 3",
            "1e",
            "1e9",
            "1_",
            "1(",
            "\u{2212}",
            "-\t",
            "1,1,",
            "1;1\n",
            "|",
            "&",
            "\\begin",
            "\\begin{",
            "\\\\",
            "\\left",
            "columns 1\n",
            "sep=;\n",
            "1e3 *\n",
            "5% ",
            "1 \u{b1} ",
            "1 x 10^",
            "10^{-",
            "^{",
            "1(2)",
            "{\"a\":",
            "{\"a\":[1],",
            "[{\"tables\":[",
        ]
        .iter()
        .map(|unit| fill(unit)),
    );
    texts.push(format!("[{}", fill("a 1\n")));
    texts.push(format!("a 1{}", fill("\n")));
    texts.push(format!("{}{}", fill("["), fill("]")));
    texts.push(format!("[{}]", fill("[1,0,0,0],")));
    texts.push(format!("[{}", fill(" ")));
    texts.push(format!("1e{}", fill("9")));
    texts.push(format!("0.{}1", fill("0")));
    for text in &texts {
        let start = Instant::now();
        survives(text);
        let taken = start.elapsed();
        let head: String = text.chars().take(12).collect();
        assert!(taken < Duration::from_secs(10), "{head:?}: {taken:?}");
    }
}
