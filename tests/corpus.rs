//! Ten thousand random matrices, printed in random forms, locales and wrappings, read
//! back to the bits that Rust's standard library reads from each number, or asked about;
//! never read as something else.
//!
//! The forms are those of spreadsheets, programs and typesetting: common practice, no
//! source. Numbers: what `str::parse` makes of the plain digits.

use halfshade::text::{ReadOptions, parse_matrices};
use rand_xoshiro::Xoshiro256PlusPlus;
use rand_xoshiro::rand_core::{RngCore, SeedableRng};

const CASES: usize = 10_000;

/// Draws what a person's program might print.
struct Printer(Xoshiro256PlusPlus);

/// One number as its plain digits, and as printed.
struct Number {
    value: f64,
    text: String,
}

#[derive(Clone, Copy, PartialEq)]
struct Locale {
    comma: bool,
    unicode_minus: bool,
    exponent: Exponent,
}

#[derive(Clone, Copy, PartialEq)]
enum Exponent {
    None,
    Small,
    Large,
    Fortran,
    Times,
    Raised,
}

#[derive(Clone, Copy)]
enum Size {
    Unit(usize),
    Shortest,
    Counts,
}

impl Printer {
    fn below(&mut self, limit: usize) -> usize {
        (self.0.next_u64() % limit as u64) as usize
    }

    fn one_in(&mut self, chance: usize) -> bool {
        self.below(chance) == 0
    }

    fn pick<'a>(&mut self, choices: &[&'a str]) -> &'a str {
        choices[self.below(choices.len())]
    }

    fn uniform(&mut self) -> f64 {
        (self.0.next_u64() >> 11) as f64 / (1_u64 << 53) as f64 * 2.0 - 1.0
    }

    fn number(&mut self, size: Size, locale: Locale) -> Number {
        let x = match self.below(12) {
            0 => 0.0,
            1 => 1.0,
            2 => -0.0,
            _ => self.uniform(),
        };
        let plain = match (size, locale.exponent) {
            (Size::Counts, _) => format!("{:.0}", x * 60_000.0),
            (Size::Unit(decimals), Exponent::None) => format!("{x:.decimals$}"),
            (Size::Unit(decimals), _) => format!("{:.decimals$e}", x / 50.0),
            (Size::Shortest, Exponent::None) => format!("{x}"),
            (Size::Shortest, _) => format!("{:e}", x * 1e-3),
        };
        let value = plain.parse().unwrap();
        let (mantissa, power) = plain.split_once('e').unwrap_or((&plain, "0"));
        let with_exponent = locale.exponent != Exponent::None && !matches!(size, Size::Counts);
        let text = match locale.exponent {
            _ if !with_exponent => mantissa.to_owned(),
            Exponent::Large => format!("{mantissa}E{power}"),
            Exponent::Fortran => format!("{mantissa}D{power}"),
            Exponent::Times => format!("{mantissa}\u{b7}10^{power}"),
            Exponent::Raised => format!("{mantissa}\u{d7}10^{{{power}}}"),
            _ => format!("{mantissa}e{power}"),
        };
        let text = if locale.comma {
            text.replace('.', ",")
        } else {
            text
        };
        let text = if locale.unicode_minus {
            text.replace('-', "\u{2212}")
        } else {
            text
        };
        Number { value, text }
    }

    fn locale(&mut self, may_be_comma: bool) -> Locale {
        Locale {
            comma: may_be_comma && self.one_in(2),
            unicode_minus: self.one_in(6),
            exponent: [
                Exponent::None,
                Exponent::None,
                Exponent::None,
                Exponent::Small,
                Exponent::Large,
                Exponent::Fortran,
                Exponent::Times,
                Exponent::Raised,
            ][self.below(8)],
        }
    }

    fn size(&mut self) -> Size {
        match self.below(8) {
            0 => Size::Shortest,
            1 => Size::Counts,
            _ => Size::Unit(1 + self.below(9)),
        }
    }

    fn line_end(&mut self) -> &'static str {
        self.pick(&["\n", "\n", "\r\n", "\r"])
    }

    /// A text and the matrices in it.
    fn case(&mut self) -> (String, Vec<[f64; 16]>) {
        match self.below(4) {
            0 | 1 => self.table(),
            2 => self.brackets(),
            _ => self.special(),
        }
    }

    fn numbers(&mut self, count: usize, locale: Locale) -> (Vec<Vec<String>>, Vec<[f64; 16]>) {
        let size = self.size();
        let numbers: Vec<Number> = (0..16 * count).map(|_| self.number(size, locale)).collect();
        let truth = numbers
            .chunks(16)
            .map(|sixteen| std::array::from_fn(|k| sixteen[k].value))
            .collect();
        let texts = numbers
            .chunks(16)
            .map(|sixteen| sixteen.iter().map(|number| number.text.clone()).collect())
            .collect();
        (texts, truth)
    }

    fn table(&mut self) -> (String, Vec<[f64; 16]>) {
        let between = self.pick(&[
            "\t", ";", "; ", ",", ", ", " ", "   ", "\u{a0}", " \t ", " | ",
        ]);
        let locale = self.locale(between != ",");
        let count = 1 + self.below(3) * self.below(3);
        let (matrices, truth) = self.numbers(count, locale);
        let quoted = matches!(between, "\t" | ";" | ",") && self.one_in(5);
        let cell = |text: &String| {
            if quoted {
                format!("\"{text}\"")
            } else {
                text.clone()
            }
        };
        let end = self.line_end();
        let mut text = String::new();
        if self.one_in(8) {
            text.push('\u{feff}');
        }
        if self.one_in(6) {
            text.push_str(self.pick(&["# film", "% kelp", "// tunicate", "Kelp film"]));
            text.push_str(end);
        }
        let width = [4, 4, 4, 16][self.below(4)];
        if width == 16 && between == "\t" && self.one_in(2) {
            let names: Vec<String> = (0..16).map(|k| format!("m{}{}", k / 4, k % 4)).collect();
            text.push_str(&(names.join("\t") + end));
        }
        let gap = width == 4 && self.one_in(2);
        for (at, matrix) in matrices.iter().enumerate() {
            if at > 0 && gap {
                text.push_str(end);
            }
            for row in matrix.chunks(width) {
                let cells: Vec<String> = row.iter().map(cell).collect();
                text.push_str(&cells.join(between));
                text.push_str(end);
            }
        }
        if self.one_in(3) {
            text = text.trim_end().to_owned();
        }
        (text, truth)
    }

    fn brackets(&mut self) -> (String, Vec<[f64; 16]>) {
        let locale = Locale {
            comma: false,
            ..self.locale(false)
        };
        let count = 1 + self.below(3) * self.below(2);
        let (matrices, truth) = self.numbers(count, locale);
        let comma = self.pick(&[", ", ",", ",\n "]);
        let list = |matrix: &Vec<String>| {
            let rows: Vec<String> = matrix
                .chunks(4)
                .map(|row| format!("[{}]", row.join(", ")))
                .collect();
            format!("[{}]", rows.join(comma))
        };
        let text = match self.below(6) {
            0 if count == 1 => list(&matrices[0]),
            1 if count == 1 => format!("M = np.array({})\n", list(&matrices[0])),
            2 => {
                let lists: Vec<String> = matrices.iter().map(list).collect();
                format!("[{}]", lists.join(",\n"))
            }
            3 => matrices
                .iter()
                .map(|matrix| {
                    let rows: Vec<String> = matrix.chunks(4).map(|row| row.join(" ")).collect();
                    format!("M = [{}];\n", rows.join("; "))
                })
                .collect(),
            4 => matrices
                .iter()
                .map(|matrix| {
                    let rows: Vec<String> = matrix
                        .chunks(4)
                        .map(|row| format!(" [{}]", row.join(" ")))
                        .collect();
                    format!("[{}]\n\n", rows.join("\n").trim_start())
                })
                .collect(),
            _ => matrices
                .iter()
                .map(|matrix| format!("[{}]\n", matrix.join(", ")))
                .collect(),
        };
        (text, truth)
    }

    fn special(&mut self) -> (String, Vec<[f64; 16]>) {
        let locale = self.locale(false);
        let (matrices, truth) = self.numbers(1, locale);
        let matrix = &matrices[0];
        let rows = |between: &str, end: &str| -> String {
            let rows: Vec<String> = matrix.chunks(4).map(|row| row.join(between)).collect();
            rows.join(end)
        };
        let text = match self.below(6) {
            0 => format!(
                "\\begin{{pmatrix}}\n{}\n\\end{{pmatrix}}",
                rows(" & ", " \\\\\n")
            ),
            1 => format!(
                "$\\left[\\begin{{array}}{{cccc}} {}\\end{{array}}\\right]$",
                rows("&", "\\\\")
            ),
            2 => format!("{{{{{}}}}}", rows(", ", "}, {")),
            3 => {
                let split = 1 + self.below(3);
                let part = |from: usize, to: usize| {
                    let rows: Vec<String> = matrix
                        .chunks(4)
                        .map(|row| row[from..to].join("   "))
                        .collect();
                    rows.join("\n")
                };
                format!(
                    "M =\n\n  Columns 1 through {split}\n\n{}\n\n  Columns {} through 4\n\n{}\n\n",
                    part(0, split),
                    split + 1,
                    part(split, 4)
                )
            }
            4 => format!(
                "{{\"name\": \"film, [A]\", \"mueller\": [{}]}}",
                matrix.join(", ")
            ),
            _ => rows("\n", "\n"),
        };
        (text, truth)
    }
}

#[test]
fn ten_thousand_printed_matrices_are_read_exactly_or_asked_about() {
    let mut printer = Printer(Xoshiro256PlusPlus::seed_from_u64(20_261));
    let mut asked = 0;
    for case in 0..CASES {
        let (text, truth) = printer.case();
        let read = parse_matrices(&text, &ReadOptions::default())
            .unwrap_or_else(|error| panic!("{case}: {error}\n{text:?}"));
        let is_truth = |matrices: &[halfshade::text::MatrixRead]| {
            matrices.len() == truth.len()
                && matrices
                    .iter()
                    .zip(&truth)
                    .all(|(read, truth)| read.mueller.map(f64::to_bits) == truth.map(f64::to_bits))
        };
        if read.alternatives.is_empty() {
            assert!(
                is_truth(&read.matrices),
                "{case}: {text:?}\n{:?}",
                read.matrices
            );
        } else {
            asked += 1;
            let among = is_truth(&read.matrices)
                || read
                    .alternatives
                    .iter()
                    .any(|other| is_truth(&other.matrices));
            assert!(among, "{case}: {text:?}\n{:?}", read.alternatives);
        }
    }
    // To ask about everything would be as bad.
    assert!(asked < CASES / 50, "{asked} asked about");
}
