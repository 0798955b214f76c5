//! The command line as a user meets it: answers, refusals, exit codes, and output that cannot be written.
//!
//! Snapshots mask what depends on the machine or on a route's plan: times, bits, nodes, and digits
//! beyond the fourteenth.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use assert_cmd::Command;
use rug::{Integer, Rational};
use serde_json::Value;
use std::fmt::Write as _;
use std::process::Output;

fn run(args: &[&str]) -> Output {
    Command::cargo_bin("coneproof").unwrap().args(args).output().unwrap()
}

fn tail(args: &str) -> Output {
    let mut all = vec!["tail", "box"];
    all.extend(args.split(' ').filter(|word| !word.is_empty()).map(|word| word.trim_matches('\'')));
    run(&all)
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

fn json(output: &Output) -> Value {
    serde_json::from_slice(&output.stdout).unwrap_or_else(|error| panic!("{error}: {}", text(&output.stdout)))
}

/// The answer without what may differ between machines and versions of a route.
fn masked(answer: &str) -> String {
    let line = |line: &str| {
        let effort = line.find(" bits, ").map(|_| format!("{:14}(bits, nodes, time)", ""));
        let time = line.strip_prefix("time taken").map(|_| format!("{:14}(time)", "time taken"));
        effort.or(time).unwrap_or_else(|| line.split(' ').map(short).collect::<Vec<_>>().join(" "))
    };
    answer.lines().map(line).collect::<Vec<_>>().join("\n")
}

/// A decimal with at most 14 significant digits, the others as one sign.
fn short(word: &str) -> String {
    let (body, exponent) = word.split_once('e').map_or((word, None), |(body, exponent)| (body, Some(exponent)));
    let digits = body.chars().filter(char::is_ascii_digit).collect::<String>();
    let leading = digits.len() - digits.trim_start_matches('0').len();
    if digits.len() - leading <= 14 || !body.chars().all(|c| c.is_ascii_digit() || c == '.') {
        return word.to_owned();
    }
    let kept = body.chars().take(leading + 14 + 1).collect::<String>();
    format!("{kept}…{}", exponent.map_or(String::new(), |e| format!("e{e}")))
}

/// A printed decimal as an exact number.
fn exact(decimal: &str) -> Rational {
    let (body, exponent) = decimal.split_once('e').unwrap_or((decimal, "0"));
    let (whole, fraction) = body.split_once('.').unwrap_or((body, ""));
    let mantissa = Rational::from(format!("{whole}{fraction}").parse::<Integer>().unwrap());
    let power = exponent.parse::<i32>().unwrap() - fraction.len() as i32;
    let ten = Rational::from(Integer::from(Integer::u_pow_u(10, power.unsigned_abs())));
    if power < 0 { mantissa / ten } else { mantissa * ten }
}

fn schema(name: &str) -> jsonschema::Validator {
    let printed = run(&["schema", name]);
    assert_eq!(printed.status.code(), Some(0));
    let schema = json(&printed);
    assert!(jsonschema::meta::is_valid(&schema), "{name} is no schema");
    jsonschema::validator_for(&schema).unwrap()
}

fn assert_valid(validator: &jsonschema::Validator, document: &Value) {
    let errors: Vec<String> =
        validator.iter_errors(document).map(|e| format!("{} at {}", e, e.instance_path)).collect();
    assert!(errors.is_empty(), "{errors:?} in {document}");
}

const ANSWERS: [&str; 13] = [
    "--half-width 1 --time 1",
    "--half-width 1 --time 1 --digits 30 --side left",
    "--half-width 1/2 --mass 3 --time -2.5 --route kernel",
    "--half-width 1 --time 1 --beyond 12 --route spectral --time-limit 100",
    "--half-width 1 --time 1 --beyond 115133",
    "--half-width 1 --time 1 --digits 50 --max-bits 100",
    "--half-width 1 --time 0",
    "--half-width 1 --time -0 --beyond 7/2 --side right",
    "--half-width '[0.99,1.01]' --time 1",
    "--half-width '[0.99,1.01]' --time '[-1,2]' --mass '[0.5,1]' --beyond '[5,6]'",
    "--half-width 1 --time 1 --time-limit 1e-9",
    "--half-width '[1,3]' --time '[0,1000]' --route kernel",
    "--half-width 1 --time 1 --beyond 1e9",
];

#[test]
fn answers_for_people() {
    let shown = ANSWERS.iter().fold(String::new(), |mut shown, args| {
        let output = tail(args);
        assert_eq!(text(&output.stderr), "", "{args}");
        let _ = writeln!(shown, "$ {args}\n{}\n=> {:?}\n", masked(&text(&output.stdout)), output.status.code());
        shown
    });
    insta::assert_snapshot!(shown);
}

#[test]
fn a_thousand_digits_can_be_copied() {
    let output = tail("--half-width 1 --time 1 --digits 1000 --route kernel");
    let shown = text(&output.stdout);
    let value = shown.lines().find(|line| line.starts_with("0.0213751908423294573285817175644951821931")).unwrap();
    assert_eq!(value.len(), "0.0".len() + 1000);
    assert!(shown.lines().all(|line| line == value || line.chars().count() <= 90));
}

#[test]
fn json_answers_fit_the_schema_and_themselves() {
    let result = schema("tail-result");
    for args in ANSWERS {
        let output = tail(&format!("{args} --format json"));
        let answer = json(&output);
        assert_valid(&result, &answer);
        let (lower, upper) = (exact(answer["lower"].as_str().unwrap()), exact(answer["upper"].as_str().unwrap()));
        assert!(lower <= upper && upper <= 1, "{args}: no probability");
        let digits = answer["digits"].as_u64().unwrap() as u32;
        let width = Rational::from(&upper - &lower) * Rational::from(Integer::from(Integer::u_pow_u(10, digits)));
        assert!(digits == 0 || width <= lower, "{args}: the decimals do not have {digits} digits");
        for route in answer["routes"].as_array().unwrap() {
            let ends = route["lower"].as_str().zip(route["upper"].as_str());
            // The answer is the intersection: it lies in what is shown for each route.
            assert!(ends.is_none_or(|(low, high)| exact(low) <= lower && upper <= exact(high)), "{args}: {route}");
        }
        let asked: u32 = answer["inputs"]["digits"].as_str().unwrap().parse().unwrap();
        let expected = if digits >= asked { ("certified", 0) } else { ("fewer digits", 3) };
        assert_eq!((answer["status"].as_str().unwrap(), output.status.code().unwrap()), expected, "{args}");
    }
}

#[test]
fn json_repeats_the_strings_read() {
    let answer = json(&tail("--half-width 1.50 --mass 2/4 --time -01 --beyond 1e1 --time-limit 2.5 --format json"));
    let read = |name: &str| answer["inputs"][name].as_str().unwrap().to_owned();
    let found = ["half_width", "mass", "time", "beyond", "time_limit"].map(read);
    assert_eq!(found, ["1.50", "2/4", "-01", "1e1", "2.5"]);
}

#[test]
fn answers_contain_values_from_the_definition() {
    // references/box_tail_from_definition.json: computed from the definition by another program.
    let references: Value = serde_json::from_str(include_str!("../references/box_tail_from_definition.json")).unwrap();
    let mut compared = 0;
    for reference in references["values"].as_array().unwrap() {
        let field = |name: &str| reference[name].as_str().unwrap_or("cone").to_owned();
        if field("mass") == "0" {
            continue;
        }
        let (a, m, t) = (field("half_width"), field("mass"), field("time"));
        let (beyond, side) = (field("beyond"), field("side"));
        let output = tail(&format!(
            "--half-width {a} --mass {m} --time {t} --beyond {beyond} --side {side} --digits 25 --format json"
        ));
        let answer = json(&output);
        let (lower, upper) = (exact(answer["lower"].as_str().unwrap()), exact(answer["upper"].as_str().unwrap()));
        let value = exact(reference["value"].as_str().unwrap());
        let digits = reference["digits"].as_u64().unwrap() as u32;
        let unit = Rational::from(&value * 10) / Rational::from(Integer::from(Integer::u_pow_u(10, digits)));
        assert!(Rational::from(&lower - &unit) <= value && value <= upper + unit, "{reference}");
        compared += 1;
    }
    assert!(compared >= 20, "only {compared} values compared");
}

#[test]
fn intervals_of_inputs_contain_their_points() {
    let ends = |args: &str| {
        let answer = json(&tail(&format!("{args} --format json --digits 12")));
        (exact(answer["lower"].as_str().unwrap()), exact(answer["upper"].as_str().unwrap()))
    };
    for region in ["cone", "6"] {
        let whole = ends(&format!("--half-width '[0.5,2]' --mass '[0.25,1.5]' --time '[-0.5,3]' --beyond {region}"));
        for (a, m, t) in [("0.5", "1.5", "0.001"), ("2", "0.25", "3"), ("1", "1", "-0.5"), ("2", "1.5", "0.6")] {
            let point = ends(&format!("--half-width {a} --mass {m} --time {t} --beyond {region}"));
            assert!(whole.0 <= point.0 && point.1 <= whole.1, "{region} {a} {m} {t}");
        }
    }
}

#[test]
fn narrow_intervals_of_inputs_keep_the_digits() {
    let output = tail("--half-width '[1,1.00000000000000000000000000000000000000001]' --time 1 --digits 40");
    assert!(text(&output.stdout).contains("certified: 40 relative digits"));
    // The leading digits of the value in references/box_tail_from_definition.json.
    assert!(text(&output.stdout).contains("0.021375190842329457328581717564495"));
}

#[test]
fn every_route_gets_its_share_of_the_time() {
    // Two and a half thousand digits take seconds, fifteen take milliseconds.
    let answer = json(&tail("--half-width 1 --time 1 --digits 2500 --time-limit 1 --format json"));
    for route in answer["routes"].as_array().unwrap() {
        assert!(route["lower"].is_string(), "{route}");
        assert_eq!(route["note"], "the time limit was reached");
    }
    assert!(answer["seconds"].as_f64().unwrap() < 60.0);
}

#[test]
fn a_limit_on_bits_is_used_up() {
    let answer = json(&tail("--half-width 1 --time 1 --digits 100 --max-bits 200 --format json"));
    for route in answer["routes"].as_array().unwrap() {
        let bits = route["bits"].as_u64().unwrap();
        assert!((180..=200).contains(&bits), "{route}");
    }
}

#[test]
fn a_route_that_would_fill_the_memory_says_so() {
    let output = tail("--half-width 1 --time 1 --beyond 1e7 --format json");
    let answer = json(&output);
    let routes = answer["routes"].as_array().unwrap();
    assert!(routes[0]["lower"].is_null() && routes[0]["note"].as_str().unwrap().contains("bits would be needed"));
    assert!(routes[1]["lower"].is_string());
    assert_eq!((output.status.code(), &answer["status"]), (Some(0), &"certified".into()));
}

#[test]
fn an_estimate_is_marked_as_such() {
    let shown = tail("--half-width 1 --time 1 --scout");
    insta::assert_snapshot!(masked(&text(&shown.stdout)));
    let estimate = schema("tail-estimate");
    for args in ["--time 1", "--time 0", "--time 1 --beyond 115133 --side left", "--time 1 --mass 0"] {
        let output = tail(&format!("--half-width 1 {args} --scout --format json"));
        assert_valid(&estimate, &json(&output));
        assert_eq!(output.status.code(), Some(0));
    }
}

const LONG: &str = "1234567890123456789012345678901234567890123456789012345678901234567890x";

/// Command lines that cannot be used.
const REFUSED: [&str; 60] = [
    "",
    "tails box",
    "tail",
    "tail sphere",
    "tail box",
    "tail box --time 1",
    "tail box --half-width 1",
    "tail box --half-width 0 --time 1",
    "tail box --half-width -1 --time 1",
    "tail box --half-width [0,1] --time 1",
    "tail box --half-width= --time 1",
    "tail box --half-width --time 1",
    "tail box --half-width 1 --time",
    "tail box --half-width 1 --time now",
    "tail box --half-width 1 --time 1e",
    "tail box --half-width 1 --time 1e999999999999",
    "tail box --half-width 1 --time 1e999999",
    "tail box --half-width 1 --time 1/0",
    "tail box --half-width 1 --time [2,1]",
    "tail box --half-width 1 --time [2",
    "tail box --half-width 1 --time 1 --mass -1",
    "tail box --half-width 1 --time 1 --mass [-1,1]",
    "tail box --half-width 1 --time 1 --mass NaN",
    "tail box --half-width 1 --time 1 --mass inf",
    "tail box --half-width 1 --time 1 --mass 0x1",
    "tail box --half-width 1 --time 1 --mass LONG",
    "tail box --half-width 1 --time 1 --beyond 1.5",
    "tail box --half-width 1 --time -1 --beyond -12",
    "tail box --half-width 1 --time [1,2] --beyond 2.5",
    "tail box --half-width 0.1 --time 0.2 --beyond 0.29999999999999999999999999999",
    "tail box --half-width 1 --time 1 --beyond Cone",
    "tail box --half-width 1 --time 1 --beyond",
    "tail box --half-width 1 --time 1 --side up",
    "tail box --half-width 1 --time 1 --side",
    "tail box --half-width 1 --time 1 --route third",
    "tail box --half-width 1 --time 1 --digits 0",
    "tail box --half-width 1 --time 1 --digits -3",
    "tail box --half-width 1 --time 1 --digits 1.5",
    "tail box --half-width 1 --time 1 --digits 10001",
    "tail box --half-width 1 --time 1 --digits 99999999999999999999",
    "tail box --half-width 1 --time 1 --max-bits 63",
    "tail box --half-width 1 --time 1 --max-bits many",
    "tail box --half-width 1 --time 1 --time-limit 0",
    "tail box --half-width 1 --time 1 --time-limit -1",
    "tail box --half-width 1 --time 1 --time-limit 1e10",
    "tail box --half-width 1 --time 1 --format xml",
    "tail box --half-width 1 --time 1 --format",
    "tail box --half-width 1 --time 1 --certificate /",
    "tail box --half-width 1 --time 1 --certificate no/such/directory/c.json",
    "tail box --half-width 1 --time 1 --certificate c.json/",
    "tail box --half-width 1 --time 1 --certificate=",
    "tail box --half-width 1 --time 1 --certificate c.json --scout",
    "tail box --half-width [1,2] --time 1 --scout",
    "tail box --half-width 1 --time 1 --beyond 1e70 --scout",
    "tail box --half-width 1 --time 1 --mass 2 --mass 3",
    "tail box --half-width 1 --time 1 --sides left",
    "tail box --half-width 1 --time 1 --radius 3",
    "tail box --half-width 1 --time 1 17",
    "schema tail",
    "schema error certificate",
];

#[test]
fn refusals_are_one_clear_sentence() {
    let error = schema("error");
    let mut shown = String::new();
    for line in REFUSED {
        let args: Vec<&str> = line.split_whitespace().map(|word| if word == "LONG" { LONG } else { word }).collect();
        let output = run(&args);
        let complaint = text(&output.stderr);
        assert_eq!((output.status.code(), output.stdout.as_slice()), (Some(2), &b""[..]), "{line}");
        assert_eq!(complaint.lines().count(), 1, "{line}: {complaint}");
        let _ = writeln!(shown, "$ {line}\n{complaint}");
        if args.first() == Some(&"tail") && args.len() > 1 && !line.ends_with("--format") {
            let with_json: Vec<&str> =
                args.iter().take(2).chain(&["--format", "json"]).chain(args.iter().skip(2)).copied().collect();
            let output = run(&with_json);
            assert_valid(&error, &json(&output));
            assert_eq!(json(&output)["exit_code"], 2, "{line}");
        }
    }
    insta::assert_snapshot!(shown);
}

#[test]
fn errors_name_the_field_for_programs() {
    let answer = json(&tail("--half-width 1 --time 1 --mass -1 --format json"));
    assert_eq!((&answer["field"], &answer["was"], &answer["status"]), (&"mass".into(), &"-1".into(), &"error".into()));
    let answer = json(&tail("--half-width 1 --format=json"));
    assert_eq!((&answer["field"], &answer["was"]), (&"time".into(), &Value::Null));
}

#[test]
fn help_shows_options_examples_and_exit_codes() {
    for (name, args) in [
        ("help", &["--help"][..]),
        ("help tail", &["tail", "-h"]),
        ("help box", &["tail", "box", "--help"]),
        ("help schema", &["help", "schema"]),
    ] {
        let output = run(args);
        assert_eq!((output.status.code(), text(&output.stderr).as_str()), (Some(0), ""));
        insta::assert_snapshot!(name, text(&output.stdout));
    }
    assert_eq!(text(&run(&["--version"]).stdout), format!("coneproof {}\n", env!("CARGO_PKG_VERSION")));
}

#[test]
fn the_examples_of_the_help_run() {
    let help = text(&run(&["tail", "box", "--help"]).stdout);
    let examples: Vec<&str> = help.lines().filter_map(|line| line.strip_prefix("  coneproof ")).collect();
    assert!(examples.len() >= 5);
    let folder = tempfile::tempdir().unwrap();
    for example in examples {
        let mut command = Command::cargo_bin("coneproof").unwrap();
        let output = command.current_dir(&folder).args(example.split_whitespace()).output().unwrap();
        // A slow machine may get fewer digits within the time limit of an example.
        assert!(matches!(output.status.code(), Some(0 | 3)), "{example}: {}", text(&output.stderr));
    }
    assert!(folder.path().join("tail.json").is_file());
}

#[test]
fn every_schema_is_listed_and_refuses_other_documents() {
    let names = text(&run(&["schema"]).stdout);
    assert_eq!(names.lines().count(), 4);
    for name in names.lines() {
        let validator = schema(name);
        for wrong in ["{}", "[]", "null", "{\"status\": \"certified\"}"] {
            assert!(!validator.is_valid(&serde_json::from_str(wrong).unwrap()), "{name} accepts {wrong}");
        }
    }
    let result = schema("tail-result");
    let answer = json(&tail("--half-width 1 --time 1 --format json"));
    for key in answer.as_object().unwrap().keys() {
        let mut shorter = answer.clone();
        shorter.as_object_mut().unwrap().remove(key);
        assert!(!result.is_valid(&shorter), "{key} may be missing");
        let mut other = answer.clone();
        other[key] = true.into();
        assert!(!result.is_valid(&other), "{key} may be true");
    }
    for wrong in ["-0.1", "inf", "1e", "", "0.1 "] {
        let mut other = answer.clone();
        other["lower"] = wrong.into();
        assert!(!result.is_valid(&other), "a lower bound of {wrong:?}");
    }
}

#[cfg(unix)]
mod unix {
    use super::*;
    use std::fs::OpenOptions;
    use std::io::Read;
    use std::os::unix::ffi::OsStrExt;
    use std::process::{Command as Process, Stdio};

    fn program() -> Process {
        Process::new(assert_cmd::cargo::cargo_bin("coneproof"))
    }

    #[test]
    fn bytes_that_are_not_text_are_refused_by_name() {
        let bytes = std::ffi::OsStr::from_bytes(b"\xff1");
        let output = program().args(["tail", "box", "--half-width", "1", "--time"]).arg(bytes).output().unwrap();
        assert_eq!(output.status.code(), Some(2));
        assert!(text(&output.stderr).starts_with("coneproof: time: \"\u{fffd}1\" cannot be used"));
    }

    #[test]
    fn a_full_disk_is_reported() {
        let full = || OpenOptions::new().write(true).open("/dev/full").unwrap();
        let args = ["tail", "box", "--half-width", "1", "--time", "1"];
        let output = program().args(args).stdout(full()).output().unwrap();
        assert_eq!(output.status.code(), Some(2));
        assert!(text(&output.stderr).starts_with("coneproof: cannot write \"standard output\": "));
        // If even the complaint cannot be written, the exit code still tells.
        let status = program().args(["tail", "cube"]).stderr(full()).stdout(full()).status().unwrap();
        assert_eq!(status.code(), Some(2));
        let status = program().arg("--help").stdout(full()).stderr(Stdio::null()).status().unwrap();
        assert_eq!(status.code(), Some(2));
    }

    #[test]
    fn a_reader_may_leave_early() {
        let args = ["tail", "box", "--half-width", "1", "--time", "1", "--format", "json"];
        let mut child = program().args(args).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
        drop(child.stdout.take());
        let mut complaint = String::new();
        child.stderr.take().unwrap().read_to_string(&mut complaint).unwrap();
        assert_eq!((child.wait().unwrap().code(), complaint.as_str()), (Some(0), ""));
    }
}
