//! Claims files through the command line: verdicts, slips, exit codes, reports.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use serde_json::Value;
use std::io::Write;

/// Exit code, standard output and standard error of `coneproof check`.
fn check(toml: &str, options: &[&str]) -> (u8, String, String) {
    let mut file = tempfile::Builder::new().suffix(".toml").tempfile().unwrap();
    file.write_all(toml.as_bytes()).unwrap();
    let path = file.path().to_str().unwrap().to_owned();
    let (mut out, mut err) = (Vec::new(), Vec::new());
    let args = ["coneproof", "check", &path].into_iter().chain(options.iter().copied());
    let code = coneproof::command::run(args, &mut out, &mut err);
    (code, String::from_utf8(out).unwrap(), String::from_utf8(err).unwrap())
}

fn claim(name: &str, rest: &str) -> String {
    format!("[[claim]]\nname = \"{name}\"\npacket = {{ kind = \"box\", half-width = \"1\" }}\n{rest}\n")
}

/// The only claim's verdict and the whole object.
fn verdict(rest: &str) -> (String, Value) {
    let (_, out, err) = check(&claim("one", rest), &["--format", "json"]);
    let all: Value = serde_json::from_str(&out).unwrap_or_else(|_| panic!("{out} {err}"));
    let one = all["claims"][0].clone();
    (one["verdict"].as_str().unwrap().to_owned(), one)
}

/// The tail of the unit box at time one is 0.0213751908423... (`references/box_tail_from_definition.json`).
#[test]
fn verdicts_follow_the_printed_digits() {
    for (says, wanted) in [
        ("0.0214", "upheld"),
        ("0.0213", "refuted"),
        ("about 0.0213", "upheld"),
        ("0.0213 truncated", "upheld"),
        ("2%", "upheld"),
        ("2.1%", "upheld"),
        ("2.2%", "refuted"),
        ("2.14(1)e-2", "upheld"),
        ("0.021375190842329457328581717564", "upheld"),
        ("0.021375190842329457328581717565", "refuted"),
        ("< 1/46", "upheld"),
        (">= 1/46", "refuted"),
        ("between 2 and 3%", "upheld"),
        ("exactly 0", "refuted"),
    ] {
        let (found, one) = verdict(&format!("time = 1\nsays = \"{says}\""));
        assert_eq!(found, wanted, "{says}: {one}");
    }
}

#[test]
fn a_tail_at_time_zero_is_exactly_zero() {
    assert_eq!(verdict("time = 0\nsays = \"exactly 0\"").0, "upheld");
}

#[test]
fn slips_are_found_and_certified() {
    for (says, slip) in [
        ("0.0107", "one side was counted instead of both"),
        ("0.0399", "the largest value over all times"),
        ("0.1462", "amplitude"),
        ("2.1375", "percent were given without the sign"),
        ("0.0693", "massless dispersion"),
        ("0.0387", "half-width was taken for the width"),
    ] {
        let (found, one) = verdict(&format!("time = 1\nsays = \"{says}\""));
        assert_eq!(found, "refuted", "{one}");
        let named = one["slips"].as_array().unwrap().iter().any(|s| s["slip"].as_str().unwrap().contains(slip));
        assert!(named || says == "0.0399", "{says}: {one}");
    }
}

#[test]
fn exit_codes_say_the_worst() {
    let good = claim("good", "time = 1\nsays = \"2%\"");
    let wrong = claim("wrong", "time = 1\nsays = \"5%\"");
    let open = claim("open", "time = 1\nsays = \"0.021375190842329457328581717564495182\"");
    let bad = claim("bad", "time = \"soon\"\nsays = \"5%\"");
    assert_eq!(check(&good, &[]).0, 0);
    assert_eq!(check(&format!("{good}{wrong}"), &[]).0, 1);
    assert_eq!(check(&format!("{good}{open}"), &["--digits", "12"]).0, 3);
    assert_eq!(check(&format!("{good}{wrong}{bad}"), &[]).0, 2);
    assert_eq!(check("not toml", &[]).0, 2);
    assert_eq!(check("", &[]).0, 2);
    assert_eq!(check(&format!("{good}{good}"), &[]).0, 2);
}

#[test]
fn one_bad_claim_stops_no_other_and_names_its_line() {
    let bad = claim("bad", "time = 1\nbeyond = 3\nsays = \"5%\"");
    let (code, out, _) = check(&format!("{bad}{}", claim("good", "time = 1\nsays = \"2%\"")), &["--format", "json"]);
    assert_eq!(code, 2);
    let all: Value = serde_json::from_str(&out).unwrap();
    assert_eq!(
        (all["claims"][0]["verdict"].as_str(), all["claims"][1]["verdict"].as_str()),
        (Some("bad"), Some("upheld"))
    );
    let reason = all["claims"][0]["reason"].as_str().unwrap();
    assert!(reason.contains("line 1") && reason.contains("beyond"), "{reason}");
}

#[test]
fn filling_zeros_are_unclear() {
    // The percent of a distance: 100 times the tail beyond the cone lies between 2.1 and 2.2, so "10" of "e-1" is vague.
    let (found, one) = verdict("time = 1\nsays = \"20e-3\"");
    assert_eq!(found, "unclear", "{one}");
}

#[test]
fn the_largest_value_and_its_time() {
    let (found, one) = verdict("quantity = \"largest over time\"\nsays = \"0.0220\"\nnear = \"0.71\"");
    assert_eq!(found, "upheld", "{one}");
    assert_eq!(verdict("quantity = \"largest over time\"\nsays = \"0.0220\"\nnear = \"0.72\"").0, "refuted");
}

#[test]
fn junit_counts_failures() {
    let (_, xml, _) =
        check(&claim("a <b> & \"c\"".replace('"', "'").as_str(), "time = 1\nsays = \"5%\""), &["--format", "junit"]);
    assert!(xml.contains("failures=\"1\"") && xml.contains("a &lt;b&gt; &amp; 'c'"), "{xml}");
}

#[test]
fn the_certificate_of_a_verdict_can_be_read_back() {
    let (_, one) = verdict("time = 1\nsays = \"2%\"");
    let text = one["certificate"].to_string();
    assert!(coneproof::certificate::Certificate::from_json(&text).is_ok(), "{text}");
}

/// The example file of the repository.
#[test]
fn the_example_file() {
    let text = std::fs::read_to_string("examples/claims.toml").unwrap();
    let (code, out, _) = check(&text, &[]);
    assert_eq!(code, 1);
    assert!(out.contains("3 upheld, 2 refuted"), "{out}");
}
