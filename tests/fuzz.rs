//! Hostile input at length: pasted texts, files, links and configurations, mutated from
//! the samples by a seed. Nothing panics, stops for 100 ms, takes memory without bound,
//! or gives out a number that is not finite (derived from the invariants in DEVELOPERS.md).
//!
//! A failure names its number: input `k` depends on `k` alone.

use std::alloc::{GlobalAlloc, Layout, System};
use std::cell::Cell;
use std::fmt::Debug;
use std::fs;
use std::panic::catch_unwind;
use std::path::PathBuf;
use std::sync::atomic::{AtomicU64, Ordering};
use std::thread;
use std::time::{Duration, Instant};

use base64::Engine;
use base64::engine::general_purpose::URL_SAFE_NO_PAD;
use halfshade::error::Result;
use halfshade::link::{decode, encode, open, read_file, write_file};
use halfshade::text::{
    DecimalMark, Delimiter, MatricesRead, ReadOptions, Stacking, parse_file, parse_matrices,
};
use miniz_oxide::deflate::compress_to_vec;
use rand_xoshiro::Xoshiro256PlusPlus;
use rand_xoshiro::rand_core::{RngCore, SeedableRng};
use serde_json::Value;

/// Inputs are some kB long.
const LONGEST: usize = 8192;

/// No answer may take longer.
const SLOWEST: Duration = Duration::from_millis(100);

/// An input that takes longer is taken as endless.
const ENDLESS: Duration = Duration::from_secs(20);

/// Bytes in use at once for each byte of input. A number of one digit and its comma are two
/// bytes, and become a place, a value and their text; and while a vector grows it holds
/// three times as much as it needs.
const MEMORY_FACTOR: usize = 600;

/// Whatever the input: the states of deflate, and its output up to its limit of 1 MiB
/// with the vector that it grew from.
const MEMORY_BASE: usize = 3 << 20;

/// Counts what the current thread holds; less than nothing where it frees what another
/// thread took. Reallocation is alloc, copy, free, as the trait has it, so that old and
/// new count together.
struct Counting;

thread_local! {
    static HELD: Cell<isize> = const { Cell::new(0) };
    static PEAK: Cell<isize> = const { Cell::new(0) };
}

// SAFETY: everything is left to the system's allocator; the cells neither allocate nor need dropping.
unsafe impl GlobalAlloc for Counting {
    unsafe fn alloc(&self, layout: Layout) -> *mut u8 {
        let held = HELD.get() + layout.size() as isize;
        HELD.set(held);
        PEAK.set(PEAK.get().max(held));
        unsafe { System.alloc(layout) }
    }

    unsafe fn dealloc(&self, pointer: *mut u8, layout: Layout) {
        HELD.set(HELD.get() - layout.size() as isize);
        unsafe { System.dealloc(pointer, layout) }
    }
}

#[global_allocator]
static COUNTING: Counting = Counting;

/// The most that `work` held at once beside what was held before, and how long it took.
fn measured(work: impl Fn()) -> (usize, Duration) {
    let before = HELD.get();
    PEAK.set(before);
    let start = Instant::now();
    work();
    ((PEAK.get() - before) as usize, start.elapsed())
}

#[rustfmt::skip]
const WORDS: [&str; 66] = [
    "[", "]", "[[", "]]", "{", "}", "(", ")", ",", ";", ":", "=", "\t", "\n", "\r\n", "\n\n", " ",
    "...", "…", "−", "±", "(5)", "%", "#", "&", "\\\\", "\\begin{pmatrix}", "\\end{pmatrix}", "\"",
    "'", "np.array(", "array(", "dtype=float32)", "x", "e", "1e999", "-1e-400", "0", "-0", "1",
    "1,5", "1.5", "1,234.5", "1.234,5", "1 234", "nan", "inf", "1e5", "1·10⁵", "m00", "M =",
    "450 nm", "# label", "sep=;", "Columns 1 through 3", "1.0e+03 *", "+/-", "Error", "\u{feff}",
    "\0", "١", "null", "true", "999999999999999999999", "-", "\u{202e}",
];

#[rustfmt::skip]
const ARRAY_WORDS: [&str; 25] = [
    "(0, 18446744073709551615, 4, 4)",
    "(4, 4)", "(16,)", "(3, 4, 4)", "(4, 4, 3)", "(16, 16)", "(4, 4, 4, 4)", "(0, 4, 4)",
    "(4, 4, 0)", "()", "(1, 1, 1, 1, 16)", "(18446744073709551615, 4, 4)", "(-1, 16)",
    "(4294967296, 4294967296)", "4", "16", "0", "'<f8'", "'>f4'", "'|u1'", "'<i2'", "'|O'", "True",
    "False", "\u{93}NUMPY",
];

#[rustfmt::skip]
const JSON_WORDS: [&str; 40] = [
    "null", "true", "{}", "[]", "\"\"", "0", "-0", "1", "2", "1e999", "1e-400", "-1", "0.5",
    "18446744073709551616", "\"none\"", "\"uniform\"", "\"relative\"", "\"perElement\"",
    "\"covariance\"", "\"rounding\"", "\"replicates\"", "\"kind\":", "\"sigma\":", "\"matrices\":",
    "\"mueller\":", "\"v\":", "\"label\":", "\"noise\":", "\"view\":", "\"__proto__\":",
    "[1,0,0,0,0,1,0,0,0,0,1,0,0,0,0,1]", "[[[[[[[[[", "]]]]]]]]]", "{\"a\":{\"b\":", "}}",
    "\\u202e", "\\ud800", ",", "\"clockwise\"", "\"text\":\"\"",
];

type Random = Xoshiro256PlusPlus;

/// From zero to below `n`, which is not zero.
fn below(n: usize, random: &mut Random) -> usize {
    (random.next_u64() % n as u64) as usize
}

fn pick<'a, T>(items: &'a [T], random: &mut Random) -> &'a T {
    &items[below(items.len(), random)]
}

/// A few changes: flipped bits, splices of another sample, cuts, repetitions, words put
/// in, and words put in the place of others.
fn mutated(samples: &[Vec<u8>], words: &[&str], random: &mut Random) -> Vec<u8> {
    let mut bytes = pick(samples, random).clone();
    for _ in 0..1 + below(5, random) {
        let at = below(bytes.len() + 1, random);
        match below(8, random) {
            0 if at < bytes.len() => bytes[at] ^= 1 << below(8, random),
            1 => {
                let other = pick(samples, random);
                let piece = piece(other, random);
                bytes.splice(at..at, piece.iter().copied());
            }
            2 => bytes.truncate(at.max(bytes.len() / 4)),
            3 => {
                let end = (at + 1 + below(40, random)).min(bytes.len());
                bytes.drain(at.min(end)..end);
            }
            4 => {
                let repeated =
                    piece(&bytes, random).repeat(1 + below(1 << below(9, random), random));
                bytes.splice(at..at, repeated.into_iter().take(LONGEST));
            }
            5 => drop(bytes.splice(at..at, pick(words, random).bytes())),
            _ => {
                let word = |byte: &u8| byte.is_ascii_alphanumeric() || b"+-._'\"".contains(byte);
                let start = at - bytes[..at].iter().rev().take_while(|b| word(b)).count();
                let end = at + bytes[at..].iter().take_while(|b| word(b)).count();
                bytes.splice(start..end, pick(words, random).bytes());
            }
        }
        bytes.truncate(LONGEST);
    }
    bytes
}

/// A part of at most 200 bytes.
fn piece<'a>(bytes: &'a [u8], random: &mut Random) -> &'a [u8] {
    let from = below(bytes.len() + 1, random);
    &bytes[from..(from + below(200, random)).min(bytes.len())]
}

struct Samples {
    texts: Vec<Vec<u8>>,
    files: Vec<Vec<u8>>,
    arrays: Vec<Vec<u8>>,
    links: Vec<Vec<u8>>,
    configurations: Vec<Vec<u8>>,
}

impl Samples {
    fn read() -> Self {
        let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/samples");
        let with = |folder: PathBuf, endings: &[&str]| -> Vec<Vec<u8>> {
            let mut paths: Vec<PathBuf> = fs::read_dir(folder)
                .unwrap()
                .map(|entry| entry.unwrap().path())
                .filter(|path| {
                    endings
                        .iter()
                        .any(|end| path.extension().is_some_and(|e| e == *end))
                })
                .filter(|path| !path.ends_with("link_v1.txt"))
                .collect();
            paths.sort();
            paths.iter().map(|path| fs::read(path).unwrap()).collect()
        };
        let golden = fs::read_to_string(folder.join("link_v1.json")).unwrap();
        let configurations = configurations(&golden);
        let mut links = vec![fs::read(folder.join("link_v1.txt")).unwrap()];
        links.extend(
            configurations
                .iter()
                .map(|content| sealed(&compress_to_vec(content, 6)).into_bytes()),
        );
        Self {
            texts: with(folder.clone(), &["txt"]),
            files: with(folder.join("files"), &["txt", "csv"]),
            arrays: with(folder.join("files"), &["npy"]),
            links,
            configurations,
        }
    }
}

/// The golden one, and others with every kind of noise.
fn configurations(golden: &str) -> Vec<Vec<u8>> {
    let sixteen = format!("[{}]", ["0.5"; 16].join(","));
    let noises = [
        r#"{"kind":"none"}"#.to_owned(),
        r#"{"kind":"relative","fraction":0.01}"#.to_owned(),
        r#"{"kind":"rounding","decimals":4}"#.to_owned(),
        format!(r#"{{"kind":"perElement","sigma":{sixteen}}}"#),
        format!(
            r#"{{"kind":"covariance","covariance":[{}]}}"#,
            ["1e-6"; 256].join(",")
        ),
        format!(r#"{{"kind":"replicates","matrices":[{sixteen},{sixteen}]}}"#),
    ];
    let other = |noise: &String| {
        format!(
            r#"{{"v":1,"task":"realizability","measurement":{{"mueller":{sixteen},"noise":{noise}}},"view":{{"azimuthDeg":3}},"later":[{{"a":[1]}}]}}"#
        )
    };
    let mut all = vec![golden.trim().as_bytes().to_vec()];
    all.extend(noises.iter().map(|noise| other(noise).into_bytes()));
    all
}

/// A fragment with a true checksum, by the bitwise definition of CRC-32 (RFC 1952,
/// section 8), so that mutations reach what lies behind it.
fn sealed(packed: &[u8]) -> String {
    let mut sum = u32::MAX;
    for &byte in packed {
        sum ^= u32::from(byte);
        for _ in 0..8 {
            sum = (sum >> 1) ^ (0xedb8_8320 & 0_u32.wrapping_sub(sum & 1));
        }
    }
    let sum = u64::from(!sum);
    let digit = |k: u32| b"abcdefghijklmnopqrstuvwxyz234567"[(sum >> (5 * (6 - k)) & 31) as usize];
    let digits: String = (0..7).map(|k| char::from(digit(k))).collect();
    format!("v1.{}.{digits}", URL_SAFE_NO_PAD.encode(packed))
}

enum Input {
    Text(String, ReadOptions),
    File(Vec<u8>, ReadOptions),
    Link(String),
    Configuration(String),
}

impl Input {
    /// The input number `k`.
    fn new(k: u64, samples: &Samples) -> Self {
        let random = &mut Random::seed_from_u64(k);
        let options = ReadOptions {
            decimal: *pick(
                &[
                    None,
                    None,
                    Some(DecimalMark::Point),
                    Some(DecimalMark::Comma),
                ],
                random,
            ),
            delimiter: *pick(
                &[
                    None,
                    None,
                    None,
                    None,
                    Some(Delimiter::Tab),
                    Some(Delimiter::Semicolon),
                    Some(Delimiter::Comma),
                    Some(Delimiter::Space),
                ],
                random,
            ),
            stacking: *pick(
                &[None, None, Some(Stacking::First), Some(Stacking::Last)],
                random,
            ),
        };
        match k % 8 {
            0..=2 => {
                let bytes = mutated(&samples.texts, &WORDS, random);
                Self::Text(String::from_utf8_lossy(&bytes).into_owned(), options)
            }
            3 => Self::File(mutated(&samples.files, &WORDS, random), options),
            4 => Self::File(mutated(&samples.arrays, &ARRAY_WORDS, random), options),
            5 => {
                let link = mutated(
                    &samples.links,
                    &["v1.", "v2.", "#", "%", "%2E", ".", ">", "=", "A"],
                    random,
                );
                Self::Link(String::from_utf8_lossy(&link).into_owned())
            }
            6 => Self::Link(Self::sealed(samples, random)),
            _ => {
                let bytes = mutated(&samples.configurations, &JSON_WORDS, random);
                Self::Configuration(String::from_utf8_lossy(&bytes).into_owned())
            }
        }
    }

    /// A link with changes behind its checksum: in what is packed, or in the packed bytes;
    /// rarely a small one that unpacks to about as much as is allowed.
    fn sealed(samples: &Samples, random: &mut Random) -> String {
        if below(200, random) == 0 {
            let word = pick(
                &[
                    "0,",
                    "[],",
                    "[[],[[[]]]],",
                    "\"\",",
                    "{\"a\":1},",
                    "1.5e300,",
                    "[",
                    "0",
                ],
                random,
            );
            let items = word.repeat((1 << below(21, random)) / word.len());
            let content = format!("{{\"v\":1,\"later\":[{items}0]}}");
            return sealed(&compress_to_vec(content.as_bytes(), 1));
        }
        let content = mutated(&samples.configurations, &JSON_WORDS, random);
        if below(3, random) > 0 {
            return sealed(&compress_to_vec(&content, 1));
        }
        sealed(&mutated(
            &[compress_to_vec(&content, 6)],
            &["\0", "A", "zz"],
            random,
        ))
    }

    /// The bytes that memory is measured against: also those that a link unpacks to,
    /// which deflate may make a thousand times as many.
    fn size(&self) -> usize {
        match self {
            Self::Text(text, _) | Self::Configuration(text) => text.len(),
            Self::File(bytes, _) => bytes.len(),
            Self::Link(link) => link.len() + open(link).map_or(0, |content| content.len()),
        }
    }

    /// Reads it, and checks what comes of it.
    fn run(&self) {
        match self {
            Self::Text(text, options) => sound(parse_matrices(text, options)),
            Self::File(bytes, options) => sound(parse_file(bytes, options)),
            Self::Link(link) => match decode(link) {
                Ok(value) => comes_back(&value),
                Err(error) => assert!(error.message.ends_with('.'), "{error}"),
            },
            Self::Configuration(text) => match read_file(text) {
                Ok(value) => {
                    assert_eq!(read_file(&write_file(&value).unwrap()).unwrap(), value);
                    comes_back(&value);
                }
                Err(error) => assert!(error.message.ends_with('.'), "{error}"),
            },
        }
    }
}

impl Debug for Input {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Text(text, options) => write!(f, "text {text:?} with {options:?}"),
            Self::File(bytes, options) => {
                write!(f, "file \"{}\" with {options:?}", bytes.escape_ascii())
            }
            Self::Link(link) => write!(f, "link {link:?}"),
            Self::Configuration(text) => write!(f, "configuration {text:?}"),
        }
    }
}

fn sound(read: Result<MatricesRead>) {
    match read {
        Err(error) => assert!(error.message.ends_with('.'), "{error}"),
        Ok(read) => {
            assert!(!read.matrices.is_empty());
            let others = read.alternatives.iter().flat_map(|other| &other.matrices);
            for one in read.matrices.iter().chain(others) {
                let numbers = one
                    .mueller
                    .iter()
                    .chain(one.sigma.iter().flatten())
                    .chain(&one.coordinate);
                assert!(numbers.copied().all(f64::is_finite), "{one:?}");
            }
        }
    }
}

fn comes_back(value: &Value) {
    // What is read from a link may be written longer than a link may be.
    match encode(value) {
        Ok(link) => assert_eq!(&decode(&link).unwrap(), value),
        Err(error) => assert_eq!(error.code, "link-too-large"),
    }
}

/// The worst of a run, with the inputs' numbers.
#[derive(Default)]
struct Worst {
    time: (Duration, u64),
    /// Bytes held at once for each byte of a text or file; 100 at the least, because the
    /// sentence of an error is longer than a short text.
    memory: (f64, u64),
    /// Of links that unpack to much.
    unpacked_time: (Duration, u64),
    unpacked_memory: (usize, u64),
}

/// Runs the inputs of these numbers; `at` says which one is running.
fn run(numbers: std::ops::Range<u64>, at: &AtomicU64) -> Worst {
    let samples = Samples::read();
    let mut worst = Worst::default();
    for k in numbers {
        at.store(k, Ordering::Relaxed);
        let input = Input::new(k, &samples);
        let size = input.size();
        let is_small = size <= 4 * LONGEST;
        let once = || {
            catch_unwind(std::panic::AssertUnwindSafe(|| measured(|| input.run())))
                .unwrap_or_else(|_| panic!("input {k} fails: {input:?}"))
        };
        let (memory, mut time) = once();
        // A busy computer may stop a test for longer, but hardly each time.
        for _ in 0..10 {
            if time > SLOWEST {
                thread::sleep(SLOWEST);
                time = time.min(once().1);
            }
        }
        assert!(time <= SLOWEST, "input {k} takes {time:?}: {input:?}");
        assert!(
            memory <= MEMORY_FACTOR * size + MEMORY_BASE,
            "input {k} of {size} bytes takes {memory} bytes: {input:?}"
        );
        if is_small {
            worst.time = worst.time.max((time, k));
            // Packing takes 300 kB, which says nothing of links.
            let unpacked = matches!(input, Input::Text(..) | Input::File(..));
            let factor = memory as f64 / size.max(1) as f64;
            if unpacked && size >= 100 && factor > worst.memory.0 {
                worst.memory = (factor, k);
            }
        } else {
            worst.unpacked_time = worst.unpacked_time.max((time, k));
            worst.unpacked_memory = worst.unpacked_memory.max((memory, k));
        }
    }
    worst
}

/// Runs the inputs in a thread of their own, and fails where one does not end.
fn survive(numbers: std::ops::Range<u64>) {
    let at: &'static AtomicU64 = Box::leak(Box::new(AtomicU64::new(0)));
    let count = numbers.end - numbers.start;
    let worker = thread::spawn(move || run(numbers, at));
    let mut seen = (0, Instant::now());
    while !worker.is_finished() {
        thread::sleep(Duration::from_millis(50));
        let now = at.load(Ordering::Relaxed);
        if now != seen.0 {
            seen = (now, Instant::now());
        }
        assert!(
            seen.1.elapsed() < ENDLESS,
            "input {now} does not end: {:?}",
            Input::new(now, &Samples::read())
        );
    }
    match worker.join() {
        Ok(worst) => println!(
            "{count} inputs; the worst, and their numbers: time {:?}, memory {:.0?} times the input; of links that unpack to much: time {:?}, memory {:?} bytes",
            worst.time, worst.memory, worst.unpacked_time, worst.unpacked_memory
        ),
        Err(failure) => std::panic::resume_unwind(failure),
    }
}

#[test]
fn twenty_thousand_inputs() {
    survive(0..20_000);
}

#[test]
#[ignore = "takes minutes: cargo test --release --test fuzz -- --ignored --nocapture"]
fn a_million_inputs() {
    survive(0..1_000_000);
}
