//! Numbers as they are read: rounded to two digits of the uncertainty.

use halfshade::stats::{printed_decimals, rounded, rounding_sigma};

/// Source: JCGM 100:2008, 7.2.2 and 7.2.6 (the short form with the uncertainty in
/// units of the last digit, at most two digits of it), from memory; the first line
/// is its example of a 100 g mass, u = 0.35 mg.
#[test]
fn short_form() {
    for (value, se, expected) in [
        (100.021_47, 0.000_35, "100.02147(35)"),
        (0.123_04, 0.0041, "0.1230(41)"),
        (-0.0038, 0.002_06, "-0.0038(21)"),
        (62.163, 0.17, "62.16(17)"),
        (0.0418, 0.0042, "0.0418(42)"),
        // 0.0996 carries to 0.10.
        (1.234_56, 0.0996, "1.23(10)"),
        (-0.000_01, 0.002, "0.0000(20)"),
        (0.0, 0.002, "0.0000(20)"),
        (12.0, 3.0, "12.0(30)"),
        (5.0, 30.0, "5(30)"),
        (34_567.0, 120.0, "3.457(12)e4"),
        (1.5e8, 2.3e6, "1.500(23)e8"),
        (-1.234e-7, 1.2e-9, "-1.234(12)e-7"),
        (1e-9, 2e-7, "0.0(20)e-7"),
        (99.996, 0.023, "99.996(23)"),
        (9.9996e8, 2.3e5, "9.9996(23)e8"),
    ] {
        let got = rounded(value, Some(se)).unwrap();
        assert_eq!(got.plain, expected, "{value} {se}");
        assert_eq!(got.text, expected.replace('-', "\u{2212}"));
    }
}

#[test]
fn without_an_uncertainty() {
    for (value, expected) in [
        (0.0, "0"),
        (-0.0, "0"),
        (1.0, "1"),
        (0.123_456_78, "0.123457"),
        (-12.5, "-12.5"),
        (1_234_567.0, "1234567"),
        (12_345_678.0, "1.23457e7"),
        (1e-7, "1e-7"),
        (0.1 + 0.2, "0.3"),
        (999_999.6, "1000000"),
    ] {
        for se in [None, Some(0.0)] {
            assert_eq!(rounded(value, se).unwrap().plain, expected);
        }
    }
}

#[test]
fn extremes_are_short_and_finite() {
    for value in [f64::MAX, f64::MIN_POSITIVE, 5e-324, -1e300, 1.0] {
        for se in [f64::MAX, 5e-324, 1e-300, 1e300, 1.0] {
            let text = rounded(value, Some(se)).unwrap().plain;
            assert!(
                text.len() < 32 && !text.contains("NaN") && !text.contains("inf"),
                "{value} {se}: {text}"
            );
        }
    }
    assert_eq!(rounded(f64::NAN, None).unwrap_err().code, "not-finite");
    assert_eq!(
        rounded(1.0, Some(f64::INFINITY)).unwrap_err().code,
        "not-finite"
    );
    assert_eq!(rounded(1.0, Some(-1.0)).unwrap_err().code, "bad-sigma");
}

#[test]
fn decimals_of_printed_numbers() {
    assert_eq!(printed_decimals(&[1.0, 0.7321, -0.5]), Some(4));
    assert_eq!(printed_decimals(&[1.0, 0.0]), Some(0));
    assert_eq!(printed_decimals(&[0.0]), None);
    assert_eq!(printed_decimals(&[1.0 / 3.0]), None);
    assert_eq!(printed_decimals(&[1e-150]), None);
    // The standard deviation of a uniform distribution of width 1e-4: JCGM
    // 100:2008, 4.3.7, from memory.
    assert!((rounding_sigma(4) - 2.886_751e-5).abs() < 1e-11);
}
