//! Rechecking finds and names what was changed; citing never says more than was certified.
//!
//! The outside reference of the numbers is the definition of the documents, `references/certificate-format.md`; what is
//! cited is compared with exact rational arithmetic.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::ExactInput;
use coneproof::certificate::Certificate;
use coneproof::certificate::recheck::{self, Verdict, findings};
use coneproof::quantities::question::Inputs;
use coneproof::quantities::restore;
use rug::Rational;
use serde_json::Value;
use std::fs;
use std::path::Path;
use std::process::{Command, Output};

/// Certificates of every kind of question, by their inputs as `name=text`.
const KINDS: [&str; 13] = [
    "packet=box half_width=1 mass=1 time=1 beyond=cone side=both digits=15 route=both",
    "packet=box half_width=1/3 mass=0 time=-3 beyond=cone side=right digits=20 route=spectral",
    "packet=box half_width=1 mass=1 time=1 beyond=300 side=left digits=12 route=kernel",
    "packet=box half_width=[0.99,1.01] mass=1 time=1 beyond=cone side=both digits=15 route=both",
    "packet=box half_width=1 mass=[0.5,0.6] time=1 beyond=5 side=both digits=15 route=both",
    "packet=box half_width=1 mass=1 time=0 beyond=cone side=both digits=15 route=both",
    "packet=box half_width=1 mass=1 time=1 beyond=cone side=both digits=120 route=both max_bits=128",
    "packet=box half_width=1 momentum=2 mass=1 time=2 beyond=cone side=right digits=12 route=both",
    "packet=cosine half_width=2 mass=1 time=2 beyond=cone side=both digits=12 route=both",
    "packet=ball radius=1 mass=1 time=1 beyond=cone side=both digits=12 route=both",
    "packet=gaussian sigma=1/2 momentum=0 mass=1 time=5 beyond=12 side=both digits=12 route=both",
    "packet=box half_width=5 mass=1 rapidity=1/2 time=0 beyond=5 side=both digits=10 route=both",
    "packet=box half_width=1/2 mass=3/7 over=time beyond=cone side=both digits=12",
];

fn inputs(text: &str) -> Inputs {
    let pairs = text.split(' ').map(|pair| pair.split_once('=').unwrap());
    pairs.fold(Inputs::default(), |inputs, (name, text)| inputs.with(name, text))
}

fn certificate(text: &str) -> Certificate {
    let question = restore::question(&inputs(text)).unwrap_or_else(|error| panic!("{text}: {error}"));
    Certificate::new(question.as_ref(), &question.certify().unwrap()).unwrap()
}

/// A changed certificate whose hash was computed anew.
fn forged(document: &Certificate, change: impl FnOnce(&mut Certificate)) -> Certificate {
    let mut other = document.clone();
    change(&mut other);
    assert_ne!(&other, document, "nothing was changed");
    other.sha256 = other.content_hash().unwrap();
    other
}

fn run(args: &[&str]) -> Output {
    Command::new(assert_cmd::cargo::cargo_bin("coneproof")).args(args).output().unwrap()
}

fn json(output: &Output) -> Value {
    serde_json::from_slice(&output.stdout).unwrap()
}

/// One unit up in the digit at `place` counted from the first significant one.
fn bumped(number: &str, place: usize) -> String {
    let mut bytes = number.as_bytes().to_vec();
    let first = bytes.iter().position(|b| (b'1'..=b'9').contains(b)).unwrap();
    let digits: Vec<usize> =
        (first..bytes.len()).take_while(|i| bytes[*i] != b'e').filter(|i| bytes[*i] != b'.').collect();
    let place = digits[place];
    bytes[place] = if bytes[place] == b'9' { b'0' } else { bytes[place] + 1 };
    String::from_utf8(bytes).unwrap()
}

#[test]
fn fresh_certificates_are_confirmed() {
    for kind in KINDS {
        let document = certificate(kind);
        assert_eq!(findings(&document), Vec::<String>::new(), "{kind}");
        assert_eq!(restore::question(&document.inputs).unwrap().inputs(), document.inputs, "{kind}");
    }
}

#[test]
fn without_a_new_hash_every_change_is_found() {
    let document = certificate(KINDS[0]);
    let changes: [fn(&mut Certificate); 6] = [
        |c| c.lower = bumped(&c.lower, 16),
        |c| c.inputs.set("mass", "1.0"),
        |c| c.routes[0].witness[0].value.push('1'),
        |c| c.notes.push("remark".to_owned()),
        |c| c.sha256.replace_range(0..1, if c.sha256.starts_with('0') { "1" } else { "0" }),
        |c| c.routes[1].nodes += 1,
    ];
    for change in changes {
        let mut other = document.clone();
        change(&mut other);
        assert!(findings(&other)[0].starts_with("sha256: was "), "{:?}", findings(&other));
    }
}

/// As it stands in the file: another digit anywhere, each with its reason.
#[test]
fn every_changed_digit_of_a_file_is_found() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json");
    let text = certificate(KINDS[0]).to_json().unwrap();
    for (place, byte) in text.bytes().enumerate().filter(|(_, byte)| byte.is_ascii_digit()).step_by(3) {
        let mut other = text.clone().into_bytes();
        other[place] = if byte == b'9' { b'0' } else { byte + 1 };
        fs::write(&file, other).unwrap();
        let found = recheck::file(&file);
        assert!(found.verdict != Verdict::Confirmed && !found.reasons.is_empty(), "byte {place}: {found:?}");
    }
}

#[test]
fn absurd_statements_cost_nothing() {
    let document = certificate(KINDS[0]);
    let found = findings(&forged(&document, |c| c.digits = u32::MAX));
    assert!(found.iter().any(|f| f.starts_with("digits: was 4294967295")), "{found:?}");
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json");
    forged(&document, |c| c.digits = u32::MAX).write(&file).unwrap();
    let cited = json(&run(&["cite", &file.display().to_string(), "--format", "json"]));
    assert!(significant(cited["number"].as_str().unwrap()) <= 20, "{cited}");
    let found = findings(&forged(&document, |c| c.value = Some("1e-99999999999".to_owned())));
    assert!(found[0].starts_with("value: was "), "{found:?}");
}

#[test]
fn changed_bounds_are_named_even_with_a_new_hash() {
    for kind in [KINDS[0], KINDS[1], KINDS[4], KINDS[7], KINDS[12]] {
        let document = certificate(kind);
        for place in 0..significant(&document.lower).min(significant(&document.upper)).min(9) {
            // The digit goes up, or from 9 down to 0: the lower bound is wrong in the first case, too wide in the second.
            let (lower, upper) = (bumped(&document.lower, place), bumped(&document.upper, place));
            let both = findings(&forged(&document, |c| (c.lower, c.upper) = (lower, upper)));
            assert!(
                both.iter().any(|f| f.starts_with("lower: was ") || f.starts_with("upper: was ")),
                "{kind}: {both:?}"
            );
        }
    }
    let document = certificate(KINDS[0]);
    let swapped = findings(&forged(&document, |c| std::mem::swap(&mut c.lower, &mut c.upper)));
    assert!(swapped[0].starts_with("lower: was ") && swapped[0].contains("the lower one first"), "{swapped:?}");
    // One part in 10^18 above the value: much narrower than the certified digits need.
    let narrow = forged(&document, |c| c.lower = c.upper.clone());
    assert!(findings(&narrow).iter().any(|f| f.starts_with("lower: was ")), "{:?}", findings(&narrow));
}

#[test]
fn changed_inputs_are_found_by_the_computation() {
    for (kind, name, text) in [
        (KINDS[0], "mass", "1.0000000000001"),
        (KINDS[0], "half_width", "2"),
        (KINDS[0], "time", "1.5"),
        (KINDS[1], "side", "both"),
        (KINDS[3], "half_width", "[0.99,1.02]"),
        (KINDS[7], "momentum", "2.00001"),
        (KINDS[9], "radius", "1.1"),
        (KINDS[11], "rapidity", "0.51"),
        (KINDS[12], "half_width", "1/3"),
    ] {
        let found = findings(&forged(&certificate(kind), |c| c.inputs.set(name, text)));
        let named = |f: &String| f.starts_with("lower: was ") || f.starts_with("upper: was ");
        assert!(found.iter().any(named), "{name} {text}: {found:?}");
    }
    for (kind, name, text) in
        [(KINDS[0], "speed", "3"), (KINDS[0], "mass", "-1"), (KINDS[11], "side", "left"), (KINDS[12], "over", "mass")]
    {
        let found = findings(&forged(&certificate(kind), |c| c.inputs.set(name, text)));
        assert!(found[0].starts_with(&format!("inputs: {name}: ")), "{found:?}");
    }
}

#[test]
fn other_statements_are_checked_and_named() {
    let document = certificate(KINDS[0]);
    let value = document.value.clone().unwrap();
    type Change<'a> = Box<dyn Fn(&mut Certificate) + 'a>;
    let changes: [(&str, Change); 9] = [
        ("value", Box::new(|c| c.value = Some(bumped(&bumped(&value, 14), 14)))),
        ("value", Box::new(|c| c.value = None)),
        ("digits", Box::new(|c| c.digits = 16)),
        ("digits", Box::new(|c| (c.lower, c.digits) = ("0.0213".to_owned(), 15))),
        ("status", Box::new(|c| c.status = "fewer digits".to_owned())),
        ("quantity", Box::new(|c| c.quantity = "P(x > half_width + |time|)".to_owned())),
        ("routes[kernel].lower", Box::new(|c| c.routes[0].lower = c.routes[0].upper.as_ref().map(|u| bumped(u, 8)))),
        ("routes", Box::new(|c| c.routes[1].name = "guess".to_owned())),
        (
            "at.lower",
            Box::new(|c| c.at = Some(coneproof::certificate::Bounds { lower: "0".into(), upper: "1".into() })),
        ),
    ];
    for (field, change) in changes {
        let found = findings(&forged(&document, |c| change(c)));
        assert!(found.iter().any(|f| f.starts_with(&format!("{field}: was "))), "{field}: {found:?}");
    }
}

#[test]
fn a_maximum_is_checked_in_value_place_and_routes() {
    let document = certificate(KINDS[12]);
    let at = document.at.clone().unwrap();
    let moved = findings(&forged(&document, |c| c.at.as_mut().unwrap().lower = at.upper.clone()));
    assert!(moved.iter().any(|f| f.starts_with("at.lower: was ")), "{moved:?}");
    let gone = findings(&forged(&document, |c| c.at = None));
    assert!(gone.iter().any(|f| f.starts_with("at: was missing")), "{gone:?}");
    let other = findings(&forged(&document, |c| {
        let witness = c.routes.iter_mut().flat_map(|r| &mut r.witness).find(|w| w.name == "m t of the value");
        witness.unwrap().value = "1/2".to_owned();
    }));
    assert!(other.iter().any(|f| f.starts_with("routes[")), "{other:?}");
}

#[test]
fn directories_verdicts_and_exit_codes() {
    let folder = tempfile::tempdir().unwrap();
    let path = |name: &str| folder.path().join(name).display().to_string();
    let document = certificate(KINDS[0]);
    document.write(Path::new(&path("good.json"))).unwrap();
    fs::write(path("ignored.txt"), "no certificate").unwrap();
    let shown = folder.path().display().to_string();
    let output = run(&["recheck", &shown]);
    assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
    assert!(String::from_utf8_lossy(&output.stdout).contains("1 confirmed"));

    forged(&document, |c| c.inputs.set("mass", "2")).write(Path::new(&path("bad.json"))).unwrap();
    let output = run(&["recheck", &shown, "--format", "json"]);
    assert_eq!((output.status.code(), output.stderr.len()), (Some(1), 0));
    let list = json(&output)["certificates"].as_array().unwrap().clone();
    let verdicts: Vec<(&str, &str)> =
        list.iter().map(|c| (c["file"].as_str().unwrap(), c["verdict"].as_str().unwrap())).collect();
    assert_eq!(verdicts, [(&*path("bad.json"), "not confirmed"), (&*path("good.json"), "confirmed")]);
    assert!(
        list[0]["reasons"][0].as_str().unwrap().starts_with("upper: was ")
            || list[0]["reasons"][0].as_str().unwrap().starts_with("lower: was ")
    );
    assert_eq!(list[1]["reasons"], Value::Array(Vec::new()));

    fs::write(path("broken.json"), "{").unwrap();
    let output = run(&["recheck", &shown, &path("missing.json"), "--format", "json"]);
    assert_eq!(output.status.code(), Some(2));
    let list = json(&output)["certificates"].as_array().unwrap().clone();
    assert_eq!(list.iter().filter(|c| c["verdict"] == "unreadable").count(), 2);
    let empty = tempfile::tempdir().unwrap();
    for args in [&["recheck"][..], &["recheck", &empty.path().display().to_string()]] {
        let output = run(args);
        assert_eq!((output.status.code(), output.stdout.len()), (Some(2), 0));
    }
}

fn read(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn significant(text: &str) -> usize {
    let body = text.split('e').next().unwrap().replace('.', "");
    body.trim_start_matches('0').len()
}

#[test]
fn citations_never_say_more_than_is_certified() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json").display().to_string();
    for kind in [KINDS[0], KINDS[2], KINDS[3], KINDS[6], KINDS[12]] {
        let document = certificate(kind);
        document.write(Path::new(&file)).unwrap();
        let (lower, upper) = (read(&document.lower), read(&document.upper));
        for digits in [1, 2, 3, 5, 9, 40, 9999] {
            let output = run(&["cite", &file, "--digits", &digits.to_string(), "--format", "json"]);
            assert_eq!(output.status.code(), Some(0), "{kind}");
            let cited = json(&output);
            let Some(number) = cited["number"].as_str() else {
                assert!(document.digits < 2, "{kind}");
                continue;
            };
            assert!(significant(number) <= digits.min(document.digits.max(1) as usize), "{kind} {digits}: {number}");
            let places = |t: &str| t.split('e').next().unwrap().split_once('.').map_or(0, |(_, f)| f.len()) as i64;
            let exponent = number.split_once('e').map_or(0, |(_, e)| e.parse::<i64>().unwrap()) - places(number);
            let unit = read(&format!("1e{exponent}"));
            // Half a unit where the interval is far narrower than the last digit (no certificate here is near a tie).
            let narrow = (digits as u32) + 3 < document.digits;
            let allowed = if narrow { unit / 2 } else { unit };
            for bound in [&lower, &upper] {
                assert!((bound - read(number)).abs() <= allowed, "{kind} {digits}: {number}");
            }
            for form in ["sentence", "latex", "markdown"] {
                assert!(cited[form].as_str().unwrap().contains(number), "{form}");
            }
            for form in ["sentence", "bibtex", "markdown", "sha256"] {
                assert!(cited[form].as_str().unwrap().contains(&document.sha256), "{form}");
            }
            for form in ["sentence", "latex", "bibtex", "markdown", "interval"] {
                assert!(cited[form].as_str().unwrap().contains(&document.upper), "{form}");
            }
        }
    }
}

#[test]
fn citing_needs_an_unchanged_certificate() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("c.json").display().to_string();
    let document = certificate(KINDS[0]);
    fs::write(&file, document.to_json().unwrap().replacen("\"mass\": \"1\"", "\"mass\": \"2\"", 1)).unwrap();
    let output = run(&["cite", &file]);
    assert_eq!((output.status.code(), output.stdout.len()), (Some(2), 0));
    document.write(Path::new(&file)).unwrap();
    for args in [&["cite"][..], &["cite", &file, "--digits", "0"], &["cite", "no such file"]] {
        assert_eq!(run(args).status.code(), Some(2), "{args:?}");
    }
    let text = String::from_utf8(run(&["cite", &file, "--digits", "4"]).stdout).unwrap();
    for part in ["Number:\n0.02138\n", "\\num{0.02138}", "@misc{coneproof-", "half\\_width"] {
        assert!(text.contains(part), "{part}: {text}");
    }
}
