//! Arbitrary requests never panic and end with an exit code that means something; numbers are read
//! exactly as their grammar says.
//!
//! Exit code 4 would be a contradiction inside the program, so here it is a failure.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::ExactInput;
use proptest::prelude::*;
use rug::{Integer, Rational};
use std::ffi::OsString;

/// Runs a command line and checks what holds for every one.
fn check(args: &[OsString]) -> Result<u8, TestCaseError> {
    let (mut out, mut err) = (Vec::new(), Vec::new());
    let code = coneproof::command::run(args, &mut out, &mut err);
    let complaint = String::from_utf8_lossy(&err);
    prop_assert!(matches!(code, 0 | 2 | 3), "exit code {}: {}", code, complaint);
    prop_assert_eq!(code == 2, complaint.starts_with("coneproof: "), "{}", complaint);
    prop_assert!(complaint.lines().count() <= 1, "more than a sentence: {}", complaint);
    let json = args.windows(2).any(|pair| pair[0] == "--format" && pair[1] == "json");
    if json {
        let answer: serde_json::Value = serde_json::from_slice(&out).map_err(|e| TestCaseError::fail(e.to_string()))?;
        prop_assert_eq!(answer["status"] == "error", code == 2);
    } else {
        prop_assert_eq!(out.is_empty(), code == 2);
    }
    Ok(code)
}

/// A request that takes little time, whatever its fields say.
fn request(fields: &[(&str, &str)]) -> Vec<OsString> {
    let mut args: Vec<OsString> = ["coneproof", "tail", "box", "--format", "json"].map(OsString::from).to_vec();
    let has = |name: &str| fields.iter().any(|(field, _)| *field == name);
    let usual = [("half-width", "1"), ("time", "1"), ("digits", "5"), ("time-limit", "0.05"), ("max-bits", "4000")];
    for (name, value) in usual.iter().filter(|(name, _)| !has(name)).chain(fields) {
        args.push(format!("--{name}={value}").into());
    }
    args
}

const FIELDS: [&str; 11] =
    ["half-width", "mass", "time", "beyond", "digits", "side", "route", "max-bits", "time-limit", "format", "scout"];

/// Numbers as people write them, over the whole range and beyond it, and nearly numbers.
fn number() -> impl Strategy<Value = String> {
    let plain = (-99i32..999, -12i32..12).prop_map(|(mantissa, exponent)| format!("{mantissa}e{exponent}"));
    let extreme = (0i32..99, 1_000i32..40_000, "-?")
        .prop_map(|(mantissa, exponent, sign)| format!("{mantissa}e{sign}{exponent}"));
    let large = (1i32..99, -1_000i32..1_000).prop_map(|(mantissa, exponent)| format!("{mantissa}e{exponent}"));
    let fraction = (-9i32..99, 0i32..99).prop_map(|(above, below)| format!("{above}/{below}"));
    let single = prop_oneof![4 => plain, 1 => extreme, 2 => large, 2 => fraction];
    let interval = (single.clone(), single.clone()).prop_map(|(low, high)| format!("[{low}, {high}]"));
    prop_oneof![8 => single, 1 => interval, 1 => "[-+0-9./eE, \\[\\]]{0,24}"]
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, ..ProptestConfig::default() })]

    #[test]
    fn arbitrary_text_in_any_field(field in 0..FIELDS.len(), text in any::<String>()) {
        check(&request(&[(FIELDS[field], &text)]))?;
    }

    #[test]
    fn arbitrary_text_in_the_certificate_field(text in "\\PC{0,300}/|[/\\x00]{1,3}|.{300}") {
        // Only texts that name no file: a test must not litter.
        prop_assert_eq!(check(&request(&[("certificate", &text)]))?, 2);
    }

    #[test]
    fn numbers_of_any_size(half_width in number(), mass in number(), time in number()) {
        check(&request(&[("half-width", &half_width), ("mass", &mass), ("time", &time)]))?;
    }

    #[test]
    fn regions_of_any_size(time in number(), beyond in number(), side in "left|right|both", route in "kernel|spectral|both") {
        check(&request(&[("time", &time), ("beyond", &beyond), ("side", &side), ("route", &route)]))?;
    }

    #[test]
    fn scouts_of_any_size(half_width in number(), mass in number(), time in number(), beyond in number()) {
        let mut args = request(&[("half-width", &half_width), ("mass", &mass), ("time", &time), ("beyond", &beyond)]);
        args.push("--scout".into());
        check(&args)?;
    }

    #[test]
    fn limits_of_any_size(digits in number(), max_bits in "[0-9]{1,9}", limit in "0\\.0[0-9]{1,30}|[0-9]{0,3}e-[0-9]{1,9}") {
        check(&request(&[("digits", &digits), ("max-bits", &max_bits), ("time-limit", &limit)]))?;
    }

    #[test]
    fn arbitrary_words(words in proptest::collection::vec(any::<String>(), 0..6), known in 0usize..4) {
        let mut args: Vec<OsString> = ["coneproof", "tail", "box", "--half-width"][..=known].iter().map(OsString::from).collect();
        args.extend(words.into_iter().map(OsString::from));
        check(&args)?;
    }

    #[test]
    fn decimals_are_read_exactly(
        sign in "[-+]?", whole in "[0-9]{0,30}", point in any::<bool>(), fraction in "[0-9]{0,30}", exponent in proptest::option::of(-500i32..500),
    ) {
        let fraction = if point { fraction } else { String::new() };
        let tail = exponent.map_or(String::new(), |e| format!("e{e}"));
        let text = format!("{sign}{whole}{}{fraction}{tail}", if point { "." } else { "" });
        let read = text.parse::<ExactInput>();
        if whole.is_empty() && fraction.is_empty() {
            prop_assert!(read.is_err(), "{}", text);
            return Ok(());
        }
        // By Horner's rule, digit by digit.
        let mut value = Rational::new();
        for digit in whole.bytes().chain(fraction.bytes()) {
            value = value * 10u32 + u32::from(digit - b'0');
        }
        let power = exponent.unwrap_or(0) - i32::try_from(fraction.len()).unwrap();
        for _ in 0..power.unsigned_abs() {
            value = if power < 0 { value / 10u32 } else { value * 10u32 };
        }
        let value = if sign == "-" { -value } else { value };
        let read = read.unwrap();
        prop_assert_eq!((read.lower(), read.upper(), read.text()), (&value, &value, text.as_str()));
    }

    #[test]
    fn fractions_and_intervals_are_read_exactly(a in -999i64..999, b in 1i64..999, c in -999i64..999, d in 1i64..999) {
        let (x, y) = (Rational::from((a, b)), Rational::from((c, d)));
        let text = format!("[ {a}/{b} ,{c}/{d}]");
        match text.parse::<ExactInput>() {
            Ok(read) => prop_assert_eq!((read.lower(), read.upper()), (&x, &y)),
            Err(_) => prop_assert!(x > y, "{} was refused", text),
        }
        prop_assert!(x <= y || text.parse::<ExactInput>().is_err());
    }

    #[test]
    fn one_foreign_character_spoils_a_number(whole in "[0-9]{1,9}", fraction in "[0-9]{1,9}", place in 0usize..20, foreign in "[^-+0-9./eE,\\[\\]\\s]") {
        let mut text = format!("{whole}.{fraction}");
        let place = place.min(text.len());
        text.insert_str(place, &foreign);
        prop_assert!(text.parse::<ExactInput>().is_err(), "{} was accepted", text);
    }

    #[test]
    fn accepted_text_means_one_number(text in "[-+0-9./eE]{1,12}") {
        // Whatever is accepted agrees with the exact parser of rational numbers where both apply.
        if let Ok(read) = text.parse::<ExactInput>() {
            let plain = text.bytes().all(|byte| byte.is_ascii_digit() || byte == b'/');
            if plain {
                let (above, below) = text.split_once('/').unwrap_or((&text, "1"));
                let integer = |part: &str| part.parse::<Integer>().unwrap();
                prop_assert_eq!(read.lower(), &Rational::from((integer(above), integer(below))));
            }
            prop_assert!(!text.starts_with(['e', 'E', '/']) && !text.ends_with(['e', 'E', '/', '+', '-']));
        }
    }
}
