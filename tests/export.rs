//! Numbers that leave. What each form must look like: RFC 4180 (CSV), RFC 8259 (JSON),
//! the grammars of Python, MATLAB and TeX, *common practice* for TSV; all written by
//! hand. That every form reads back to the same bits is an identity.

use halfshade::text::{
    Column, Content, Entry, NamedMatrix, NamedTable, OutputForm, ReadOptions, export_text,
    parse_matrices,
};
use proptest::prelude::*;

const FORMS: [OutputForm; 7] = [
    OutputForm::Tsv,
    OutputForm::Csv,
    OutputForm::CsvEuropean,
    OutputForm::Json,
    OutputForm::Latex,
    OutputForm::Python,
    OutputForm::Matlab,
];

fn named(name: &str, mueller: [f64; 16]) -> NamedMatrix {
    NamedMatrix {
        name: name.to_owned(),
        unit: None,
        mueller,
        sigma: None,
    }
}

const SIMPLE: [f64; 16] = [
    1.0, -0.5, 0.0, 1e-17, 2.5e-7, 1e300, -0.0, 0.1, 5e-324, 1.0, 1.0, 1.0, 12345.678, 0.0, 0.0,
    0.3,
];

fn content() -> Content {
    Content {
        title: "Kelp, \"film\" A; = 1 2 3 4".to_owned(),
        notes: vec!["two\nlines \u{202e}5 6 7 8\t9".to_owned()],
        matrices: vec![
            named("film A", SIMPLE),
            named("film A", SIMPLE.map(|x| x * 0.5)),
            named("lambda", SIMPLE),
        ],
        tables: vec![NamedTable {
            name: "figures".to_owned(),
            columns: vec![
                Column {
                    name: "figure".to_owned(),
                    unit: None,
                    values: vec![
                        Entry::Text("=1+2".to_owned()),
                        Entry::Text("a, \"b\" & c_1's".to_owned()),
                    ],
                },
                Column {
                    name: "value".to_owned(),
                    unit: Some("deg".to_owned()),
                    values: vec![Entry::Number(-1.5), Entry::Nothing],
                },
            ],
        }],
    }
}

#[test]
fn each_form_is_that_of_its_program() {
    let text = |form| export_text(form, &content()).unwrap();
    let tsv = text(OutputForm::Tsv);
    assert!(tsv.starts_with("# Kelp, \"film\" A; = 1 2 3 4\n# two lines 5 6 7 8 9\n# film A\n1\t-0.5\t0\t1e-17\n2.5e-7\t1e300\t-0\t0.1\n5e-324\t1\t1\t1\n12345.678\t0\t0\t0.3\n"), "{tsv}");
    assert!(
        tsv.ends_with("# figures\nfigure\tvalue (deg)\n'=1+2\t-1.5\na, \"b\" & c_1's\t\n"),
        "{tsv}"
    );
    let csv = text(OutputForm::Csv);
    assert!(
        csv.starts_with("\"# Kelp, \"\"film\"\" A; = 1 2 3 4\"\r\n"),
        "{csv}"
    );
    assert!(csv.contains("\r\n1,-0.5,0,1e-17\r\n"), "{csv}");
    assert!(
        csv.ends_with("'=1+2,-1.5\r\n\"a, \"\"b\"\" & c_1's\",\r\n"),
        "{csv}"
    );
    let european = text(OutputForm::CsvEuropean);
    assert!(
        european.contains("\r\n1;-0,5;0;1e-17\r\n2,5e-7;1e300;-0;0,1\r\n"),
        "{european}"
    );
    let latex = text(OutputForm::Latex);
    assert!(
        latex.contains("\\begin{pmatrix}\n1 & -0.5 & 0 & 1 \\times 10^{-17} \\\\\n"),
        "{latex}"
    );
    assert!(
        latex.contains("a, \"b\" \\& c\\_1's & -- \\\\\n\\end{tabular}"),
        "{latex}"
    );
    let python = text(OutputForm::Python);
    assert!(
        python.starts_with("import numpy as np\n# Kelp")
            && python.contains("\nfilm_A = np.array([[1.0, -0.5, 0.0, 1e-17],\n")
            && python.contains("[2.5e-7, 1e300, -0.0, 0.1]"),
        "{python}"
    );
    assert!(
        python.contains("film_A_2 = ") && python.contains("lambda_2 = "),
        "{python}"
    );
    assert!(python.ends_with("figures_figure = ['=1+2', 'a, \"b\" & c_1\\'s']\n# figures_value in deg\nfigures_value = [-1.5, None]\n"), "{python}");
    let matlab = text(OutputForm::Matlab);
    assert!(matlab.contains("film_A = [1 -0.5 0 1e-17;\n"), "{matlab}");
    assert!(matlab.ends_with("figures_figure = {'=1+2'; 'a, \"b\" & c_1''s'};\n% figures_value in deg\nfigures_value = [-1.5; NaN];\n"), "{matlab}");
    let json: serde_json::Value = serde_json::from_str(&text(OutputForm::Json)).unwrap();
    assert_eq!(
        json["matrices"][0]["mueller"][3][0].as_f64(),
        Some(12345.678)
    );
    assert_eq!(
        json["tables"][0]["columns"][1]["values"][1],
        serde_json::Value::Null
    );
    assert_eq!(json["title"], "Kelp, \"film\" A; = 1 2 3 4");
}

/// PEP 263, TeX's optional arguments, formulas behind a space, names that meet: each
/// would change what the other program reads.
#[test]
fn nothing_is_read_as_something_else() {
    let table = |values: Vec<Entry>| NamedTable {
        name: "t".to_owned(),
        columns: vec![Column {
            name: "x".to_owned(),
            unit: None,
            values,
        }],
    };
    let text = |words: &str| Entry::Text(words.to_owned());
    let content = Content {
        title: "coding: rot13".to_owned(),
        matrices: vec![
            NamedMatrix {
                sigma: Some([0.5; 16]),
                ..named("film", SIMPLE)
            },
            named("film sigma", SIMPLE),
            named("None", SIMPLE),
        ],
        tables: vec![table(vec![text("[1pt]"), text("\t=1"), Entry::Nothing])],
        ..Content::default()
    };
    let write = |form| export_text(form, &content).unwrap();
    let python = write(OutputForm::Python);
    assert!(
        python.starts_with("import numpy as np\n# coding"),
        "{python}"
    );
    assert!(
        python.contains("\nfilm_sigma = ")
            && python.contains("\nfilm_sigma_2 = ")
            && python.contains("\nNone_2 = "),
        "{python}"
    );
    assert!(write(OutputForm::Latex).contains("\n{}[1pt] \\\\\n"));
    assert!(write(OutputForm::Csv).ends_with("x\r\n[1pt]\r\n' =1\r\n\"\"\r\n"));
    assert!(write(OutputForm::Matlab).ends_with("{'[1pt]'; ' =1'; ''};\n"));
    // Equal names by the thousand take no time.
    let many = Content {
        matrices: vec![named("a", SIMPLE); 20_000],
        ..Content::default()
    };
    assert!(
        export_text(OutputForm::Python, &many)
            .unwrap()
            .contains("\na_20000 = ")
    );
}

#[test]
fn what_cannot_be_written_is_refused() {
    let check = |content: &Content, code: &str, field: &str| {
        for form in FORMS {
            let error = export_text(form, content).expect_err("was written");
            assert_eq!(error.code, code);
            assert!(error.to_string().contains(field), "{error}");
        }
    };
    check(&Content::default(), "bad-request", "matrices");
    let mut uneven = content();
    uneven.tables[0].columns[1].values.pop();
    check(&uneven, "bad-request", "tables[0].columns[1].values");
    let mut nan = content();
    nan.matrices[1].mueller[5] = f64::NAN;
    check(&nan, "not-finite", "matrices[1]");
    let mut empty = content();
    empty.tables[0].columns.clear();
    check(&empty, "bad-request", "tables[0]");
}

#[track_caller]
fn reads_back(form: OutputForm, content: &Content) {
    let text = export_text(form, content).unwrap();
    let read = parse_matrices(&text, &ReadOptions::default())
        .unwrap_or_else(|error| panic!("{form:?}: {error}\n{text}"));
    assert!(read.alternatives.is_empty(), "{form:?}: {text}");
    let found: Vec<_> = read
        .matrices
        .iter()
        .map(|one| one.mueller.map(f64::to_bits))
        .collect();
    let given: Vec<_> = content
        .matrices
        .iter()
        .map(|one| one.mueller.map(f64::to_bits))
        .collect();
    assert_eq!(found, given, "{form:?}: {text}");
    if matches!(
        form,
        OutputForm::Json | OutputForm::Python | OutputForm::Matlab
    ) {
        let found: Vec<_> = read.matrices.iter().map(|one| one.sigma).collect();
        let given: Vec<_> = content.matrices.iter().map(|one| one.sigma).collect();
        assert_eq!(found, given, "{form:?}: {text}");
    }
}

fn element() -> impl Strategy<Value = f64> {
    prop_oneof![
        4 => -1.0..1.0_f64,
        1 => any::<f64>().prop_filter("finite", |x| x.is_finite()),
        1 => prop::sample::select(vec![0.0, -0.0, 1.0, 1e-17, 1e300, 5e-324, 123.0, 0.5]),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(500))]

    #[test]
    fn every_form_reads_back_to_the_same_bits(
        matrices in prop::collection::vec((prop::array::uniform16(element()), prop::option::of(prop::array::uniform16(0.0..1.0_f64))), 1..4),
        title in "\\PC{0,20}",
        name in "[A-Za-z][A-Za-z0-9 ]{0,8}",
    ) {
        let content = Content {
            title,
            matrices: matrices
                .into_iter()
                .map(|(mueller, sigma)| NamedMatrix { sigma, ..named(&name, mueller) })
                .collect(),
            ..Content::default()
        };
        for form in FORMS {
            reads_back(form, &content);
        }
    }
}
