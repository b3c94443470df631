//! The invariants of DEVELOPERS.md that a reading of the source can check.

use std::fs;
use std::path::{Path, PathBuf};

fn sources(folder: &Path, found: &mut Vec<(PathBuf, String)>) {
    for entry in fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            sources(&path, found);
        } else if path.extension().is_some_and(|end| end == "rs") {
            let text = fs::read_to_string(&path).unwrap();
            found.push((path, text));
        }
    }
}

/// Lines of code, without comments, that hold one of the words outside of the
/// allowed places (prefixes below src/).
#[track_caller]
fn only_in(words: &[&str], allowed: &[&str]) {
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Vec::new();
    sources(&src, &mut files);
    assert!(files.len() > 20);
    let mut seen = 0;
    for (path, text) in &files {
        let place = path
            .strip_prefix(&src)
            .unwrap()
            .to_string_lossy()
            .replace('\\', "/");
        for (number, line) in text.lines().enumerate() {
            let code = line.split("//").next().unwrap();
            let Some(word) = words.iter().find(|word| code.contains(**word)) else {
                continue;
            };
            seen += 1;
            assert!(
                allowed.iter().any(|prefix| place.starts_with(prefix)),
                "{place}:{}: {word}",
                number + 1
            );
        }
    }
    assert!(
        seen > 0 || allowed.is_empty(),
        "{words:?} are nowhere: the test sees nothing"
    );
}

#[test]
fn no_input_output_clock_or_chance() {
    only_in(
        &[
            "std::fs",
            "File::",
            "stdin",
            "stdout",
            "std::net",
            "std::env",
            "Instant",
            "SystemTime",
            "println!",
            "thread_rng",
            "from_os_rng",
            "rand::rng",
        ],
        &[],
    );
}

#[test]
fn draws_come_from_one_place() {
    only_in(&["rand_xoshiro", "rand_distr"], &["stats/"]);
}

#[test]
fn only_linalg_factorises() {
    only_in(
        &[
            "SymmetricEigen",
            "SVD",
            ".svd(",
            "symmetric_eigen",
            ".lu()",
            ".qr()",
            "cholesky",
            "Schur",
            "try_inverse",
        ],
        &["linalg/"],
    );
}

#[test]
fn only_the_boundary_knows_the_browser() {
    only_in(
        &["js_sys", "serde_wasm_bindgen", "console_error_panic_hook"],
        &["web/"],
    );
    only_in(&["wasm_bindgen", "web_sys"], &["web/", "plot/canvas.rs"]);
}

#[test]
fn only_plot_draws() {
    only_in(&["plotters"], &["plot/"]);
}

#[test]
fn core_types_are_not_serialisable() {
    only_in(&["serde", "Serialize"], &["web/", "link/", "json.rs"]);
}

#[test]
fn degrees_stay_at_the_boundary() {
    only_in(
        &["to_degrees", "to_radians", "Deg", "_deg"],
        &["web/", "text/", "link/", "plot/"],
    );
}

#[test]
fn nothing_unwraps() {
    only_in(
        &[
            ".unwrap()",
            ".expect(",
            "panic!(",
            "unreachable!(",
            "todo!(",
            "unimplemented!(",
        ],
        &[],
    );
}
