//! The gaussian packet: values from outside, identities, and the two routes against each other.
//!
//! `references/gaussian_from_definition.json` comes from `tests/oracles/gaussian_from_definition.py`, which integrates
//! the definition and shares no formula with the program; `references/check-values.json` names its methods value by
//! value.
#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use coneproof::arithmetic::{ExactInput, Interval, Real};
use coneproof::error::Error;
use coneproof::functions::erfc::erfc;
use coneproof::packets::GaussianPacket;
use coneproof::quantities::packet_tail::PacketTail;
use coneproof::quantities::question::Question;
use coneproof::quantities::tail::{Side, Status};
use coneproof::routes::contour::Contour;
use coneproof::routes::gaussian::{AtRelease, GaussianProblem, Region};
use coneproof::routes::lattice::Lattice;
use coneproof::routes::{Effort, Evaluation, RouteFailure};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Integer, Rational, ops::Pow};
use serde_json::Value;
use std::time::{Duration, Instant};

fn read(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn rational(value: f64) -> Rational {
    Rational::from_f64(value).unwrap()
}

/// Unit mass.
fn problem(sigma: &Rational, momentum: &Rational, time: &Rational, region: Region) -> GaussianProblem {
    GaussianProblem::new(sigma, momentum, &Rational::from(1), time, &region).unwrap()
}

/// The enclosure, which has the digits asked; `None` where the route declines.
fn enclosure(way: &dyn Evaluation, digits: u32) -> Option<Interval> {
    match way.evaluate(digits, &Effort::default()) {
        Ok(outcome) => {
            let reached = outcome.interval.relative_digits(digits);
            assert_eq!(reached, digits, "{}: {:?}", way.name(), outcome);
            Some(outcome.interval)
        }
        Err(RouteFailure::OutOfReach { .. }) => None,
        Err(other) => panic!("{}: {other}", way.name()),
    }
}

fn by_lattice(problem: &GaussianProblem, digits: u32) -> Option<Interval> {
    enclosure(&Lattice::new(problem.clone()), digits)
}

fn by_contour(problem: &GaussianProblem, digits: u32) -> Option<Interval> {
    enclosure(&Contour::new(problem.clone()), digits)
}

fn meet(left: &Interval, right: &Interval) -> bool {
    left.intersection(right).is_some()
}

/// All numbers within one unit of the so many-th significant digit of a decimal.
fn around(decimal: &str, digits: u32) -> Interval {
    let value = read(decimal);
    let exponent = value.to_f64().abs().log10();
    // Values far below any double: the exponent is in the text.
    let exponent = if exponent.is_finite() {
        exponent.floor() as i32
    } else {
        decimal.split_once('e').unwrap().1.parse::<i32>().unwrap()
    };
    let power = exponent - digits as i32 + 1;
    let unit = Rational::from(Integer::from(10).pow(power.unsigned_abs()));
    let unit = if power < 0 { unit.recip() } else { unit };
    Interval::from_rationals(&Rational::from(&value - &unit), &(value + unit), 400)
}

fn document(path: &str) -> Vec<Value> {
    let text = std::fs::read_to_string(path).unwrap();
    serde_json::from_str::<Value>(&text).unwrap()["values"].as_array().unwrap().clone()
}

#[test]
fn check_values() {
    let mut met = 0;
    for entry in document("references/check-values.json") {
        let id = entry["id"].as_str().unwrap();
        if !(id.starts_with("A_") || id.starts_with("A0_")) {
            continue;
        }
        let parameter = |name: &str| read(entry["params"][name].as_str().unwrap());
        assert_eq!(parameter("m"), 1);
        let region = Region::Outside(parameter("X"));
        let asked = problem(&parameter("s"), &Rational::new(), &parameter("t"), region);
        // The values give so many decimals; as many significant digits, two less for caution with the notion.
        let digits = entry["digits_agreed_by_two_methods"].as_u64().unwrap() as u32 - 2;
        let expected = around(entry["value"].as_str().unwrap(), digits);
        let ways = asked.evaluations();
        assert_eq!(ways.len(), if id.starts_with("A0_") { 3 } else { 2 });
        for way in &ways {
            match enclosure(way.as_ref(), digits + 2) {
                Some(found) => assert!(meet(&found, &expected), "{id}, {}: {found:?}", way.name()),
                None => assert!(id == "A0_1/10_20" && way.name() != "closed-form", "{id}: {} declines", way.name()),
            }
        }
        met += 1;
    }
    assert_eq!(met, 9);
}

#[test]
fn values_from_the_definition() {
    let values = document("references/gaussian_from_definition.json");
    assert!(values.len() >= 20);
    for entry in values {
        let field = |name: &str| read(entry[name].as_str().unwrap());
        let beyond = field("beyond");
        let region = match entry["side"].as_str().unwrap() {
            "right" => Region::RightOf(beyond),
            "left" => Region::LeftOf(-beyond),
            other => panic!("unknown side {other}"),
        };
        let asked = GaussianProblem::new(&field("sigma"), &field("momentum"), &field("mass"), &field("time"), &region);
        let asked = asked.unwrap();
        let digits = entry["digits"].as_u64().unwrap() as u32;
        assert!(digits >= 20);
        let expected = around(entry["value"].as_str().unwrap(), digits);
        for found in [by_lattice(&asked, digits + 2), by_contour(&asked, digits + 2)] {
            let found = found.unwrap();
            assert!(meet(&found, &expected), "{entry}: {found:?}");
        }
    }
}

/// `sigma`, momentum, time and a position, over the range in daily use.
fn packet() -> impl Strategy<Value = (Rational, Rational, Rational, Rational)> {
    (-1.7..1.0f64, -4.0..4.0f64, prop::bool::ANY, -1.5..1.2f64, prop::bool::ANY, -1.0..1.4f64).prop_map(
        |(sigma, momentum, at_rest, time, past, position)| {
            let momentum = if at_rest { 0.0 } else { momentum };
            let time = 10f64.powf(time) * if past { -1.0 } else { 1.0 };
            (rational(10f64.powf(sigma)), rational(momentum), rational(time), rational(10f64.powf(position)))
        },
    )
}

fn region(kind: u32, from: &Rational) -> Region {
    let minus = Rational::from(-from);
    match kind {
        0 => Region::Outside(from.clone()),
        1 => Region::Within(from.clone()),
        2 => Region::RightOf(from.clone()),
        3 => Region::LeftOf(minus),
        4 => Region::RightOf(minus),
        5 => Region::Between(minus, Rational::from(from * 2)),
        _ => Region::Between(from.clone(), Rational::from(from * 3)),
    }
}

/// Sum of two enclosures.
fn sum(left: &Interval, right: &Interval) -> Interval {
    let bits = 400;
    left.to_real(bits).add(&right.to_real(bits), bits).to_interval(bits)
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 400, rng_seed: RngSeed::Fixed(20_262), failure_persistence: None, ..ProptestConfig::default()
    })]

    #[test]
    fn routes_meet((sigma, momentum, time, from) in packet(), kind in 0u32..7, digits in 1u32..30) {
        let asked = problem(&sigma, &momentum, &time, region(kind, &from));
        let (lattice, contour) = (by_lattice(&asked, digits), by_contour(&asked, digits));
        prop_assert!(lattice.is_some() || contour.is_some(), "both routes decline {asked:?}");
        if let (Some(lattice), Some(contour)) = (lattice, contour) {
            prop_assert!(meet(&lattice, &contour), "{asked:?}: {lattice:?} and {contour:?}");
        }
    }
}

/// A quick enclosure of any width, or none.
fn quick(way: &dyn Evaluation, digits: u32) -> Option<Interval> {
    let effort = Effort { deadline: Some(Instant::now() + Duration::from_secs(1)), max_bits: None };
    match way.evaluate(digits, &effort) {
        Ok(outcome) => Some(outcome.interval),
        Err(RouteFailure::OutOfReach { .. } | RouteFailure::TimeLimit) => None,
        Err(other) => panic!("{}: {other}", way.name()),
    }
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 100, rng_seed: RngSeed::Fixed(20_264), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// Far outside the range in daily use a route may decline, but never be wrong.
    #[test]
    fn routes_meet_far_out(
        sigma in -9.0..6.0f64, momentum in prop::option::of(-3.0..3.0f64), time in -9.0..6.0f64,
        position in -6.0..4.0f64, kind in 0u32..7, digits in 1u32..12
    ) {
        let power = |x: f64| rational(10f64.powf(x));
        let momentum = momentum.map_or(Rational::new(), power);
        let asked = problem(&power(sigma), &momentum, &power(time), region(kind, &power(position)));
        let lattice = quick(&Lattice::new(asked.clone()), digits);
        let contour = quick(&Contour::new(asked.clone()), digits);
        println!("{} {} {asked:?}", lattice.is_some(), contour.is_some());
        if let (Some(lattice), Some(contour)) = (lattice, contour) {
            prop_assert!(meet(&lattice, &contour), "{asked:?}: {lattice:?} and {contour:?}");
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 40, rng_seed: RngSeed::Fixed(20_263), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// `P(|x| < R) + P(|x| > R) = 1` and the one-sided parts add up, with the parts from different routes.
    #[test]
    fn parts_add_up((sigma, momentum, time, from) in packet()) {
        let ask = |kind| problem(&sigma, &momentum, &time, region(kind, &from));
        let digits = 18;
        let outside = by_contour(&ask(0), digits);
        if let (Some(outside), Some(inside)) = (&outside, by_lattice(&ask(1), digits)) {
            prop_assert!(sum(outside, &inside).contains_rational(&Rational::from(1)));
        }
        if let (Some(outside), Some(right), Some(left)) = (&outside, by_lattice(&ask(2), digits), by_contour(&ask(3), digits)) {
            prop_assert!(meet(outside, &sum(&right, &left)));
        }
    }

    /// A mirror exchanges the sides and turns the momentum round; so does a reversal of time.
    #[test]
    fn mirror_and_time_reversal((sigma, momentum, time, from) in packet()) {
        let minus = |value: &Rational| Rational::from(-value);
        let original = problem(&sigma, &momentum, &time, region(2, &from));
        let mirrored = problem(&sigma, &minus(&momentum), &time, region(3, &from));
        let reversed = problem(&sigma, &minus(&momentum), &minus(&time), region(2, &from));
        for route in [by_lattice, by_contour] {
            if let (Some(first), Some(second), Some(third)) = (route(&original, 15), route(&mirrored, 15), route(&reversed, 15)) {
                prop_assert!(meet(&first, &second), "mirror: {original:?}");
                prop_assert!(meet(&first, &third), "time reversal: {original:?}");
            }
        }
    }

    /// A coarse interval contains a fine one.
    #[test]
    fn coarse_contains_fine((sigma, momentum, time, from) in packet(), kind in 0u32..7) {
        let asked = problem(&sigma, &momentum, &time, region(kind, &from));
        for route in [by_lattice, by_contour] {
            if let (Some(coarse), Some(fine)) = (route(&asked, 10), route(&asked, 40)) {
                prop_assert!(coarse.contains(&fine), "{asked:?}: {coarse:?} and {fine:?}");
            }
        }
    }

    /// Only ratios matter.
    #[test]
    fn scaling((sigma, momentum, time, from) in packet(), mass in 1u32..1000) {
        let mass = Rational::from((mass, 37));
        let by_mass = |value: &Rational| Rational::from(value / &mass);
        let scaled = GaussianProblem::new(
            &by_mass(&sigma), &Rational::from(&momentum * &mass), &mass, &by_mass(&time), &region(0, &by_mass(&from)),
        );
        prop_assert_eq!(scaled.unwrap(), problem(&sigma, &momentum, &time, region(0, &from)));
    }

    /// The norm on a half line falls with the distance, and obeys `P(|x| > R) <= 2 exp(2 s^2 - 2 (R - |t|))`.
    #[test]
    fn falls_with_distance((sigma, momentum, time, from) in packet()) {
        let at = |from: &Rational| by_contour(&problem(&sigma, &momentum, &time, region(0, from)), 15);
        if let (Some(near), Some(far)) = (at(&from), at(&Rational::from(&from * 2))) {
            prop_assert!(near.lower() > far.upper());
            let exponent = 2.0 * (sigma.to_f64().powi(2) - from.to_f64() + time.to_f64().abs());
            prop_assert!(*near.lower() <= 2.0 * (exponent * (1.0 + 1e-12)).exp());
        }
    }
}

#[test]
fn at_release_the_position_is_normally_distributed() {
    for (sigma, momentum, kind, from) in [
        ("1/2", "0", 0, "2"),
        ("1/2", "3", 0, "1"),
        ("2", "-1/3", 1, "1/10"),
        ("1", "2", 2, "4"),
        ("1", "2", 3, "4"),
        ("3", "0", 5, "2"),
        ("3", "1", 6, "5"),
    ] {
        let asked = problem(&read(sigma), &read(momentum), &Rational::new(), region(kind, &read(from)));
        let exact = enclosure(&AtRelease::new(asked.clone()), 50).unwrap();
        for found in [by_lattice(&asked, 30), by_contour(&asked, 30)] {
            assert!(found.unwrap().contains(&exact), "{asked:?}");
        }
    }
    let later = problem(&read("1"), &read("0"), &read("1"), region(0, &read("1")));
    assert!(matches!(AtRelease::new(later).evaluate(15, &Effort::default()), Err(RouteFailure::OutOfReach { .. })));
}

/// `|P(t) - P'(t)| <= 2 || psi - psi' ||` for normalised amplitudes.
fn differ_by_at_most(found: &Interval, other: &Real, bound: f64) -> bool {
    let bits = 200;
    let difference = found.to_real(bits).sub(other, bits);
    difference.abs_upper().to_float() <= bound
}

/// Shortly after release: `|| (exp(-i (omega - 1) t) - 1) phi || <= |t| || p^2/2 phi || = |t| sqrt(3)/(8 s^2)` for `k = 0`,
/// from `omega - 1 <= p^2/2` and the fourth moment `3/(2s)^4` of the normal distribution.
#[test]
fn soon_after_release() {
    let bits = 200;
    let sigma = read("1/2");
    let root = coneproof::functions::elementary::sqrt(&Real::from_i64(2), bits);
    for time in ["1e-6", "-1e-12", "1e-20"] {
        let asked = problem(&sigma, &Rational::new(), &read(time), region(0, &read("1")));
        let initial = erfc(&Real::from_i64(2).div(&root, bits), bits);
        let bound = 2.0 * read(time).to_f64().abs() * 3f64.sqrt() / (8.0 * 0.25);
        for found in [by_lattice(&asked, 30), by_contour(&asked, 30)] {
            assert!(differ_by_at_most(&found.unwrap(), &initial, bound), "{time}");
        }
    }
}

/// Slow packets spread as in Schroedinger's equation: `0 <= p^2/2 - (omega - 1) <= p^4/8`, so that the amplitudes differ
/// by at most `t || p^4/8 phi || = t sqrt(105) (2s)^-4/8`. The free Schroedinger packet stays normal, with the variance
/// `s^2 + t^2/(4 s^2)` (in any textbook; from memory).
#[test]
fn nonrelativistic_limit() {
    let bits = 200;
    let asked = problem(&read("1000"), &Rational::new(), &read("1e6"), region(0, &read("1500")));
    let deviation = coneproof::functions::elementary::sqrt(&Real::from_i64(1_250_000 * 2), bits);
    let slow = erfc(&Real::from_i64(1500).div(&deviation, bits), bits);
    let bound = 2.0 * 1e6 * 105f64.sqrt() / 2000f64.powi(4) / 8.0;
    assert!(bound < 1e-6);
    for found in [by_lattice(&asked, 15), by_contour(&asked, 15)] {
        assert!(differ_by_at_most(&found.unwrap(), &slow, bound));
    }
}

#[test]
fn a_tail_near_1e_203_by_both_routes() {
    let asked = problem(&read("1/2"), &Rational::new(), &read("1"), region(0, &read("225")));
    let (lattice, contour) = (by_lattice(&asked, 20).unwrap(), by_contour(&asked, 20).unwrap());
    assert!(meet(&lattice, &contour));
    assert!(*contour.upper() < read("1e-202") && *contour.lower() > read("1e-204"));
}

#[test]
fn a_hundred_digits() {
    let asked = problem(&read("1"), &read("1/3"), &read("2"), region(0, &read("4")));
    assert!(meet(&by_lattice(&asked, 100).unwrap(), &by_contour(&asked, 100).unwrap()));
}

/// `P(x > 0)` for a moving packet at release is one half, and both routes may sit on the boundary of their cases.
#[test]
fn half_lines_from_the_origin() {
    let at = |time: &str, momentum: &str, region: Region| problem(&read("1"), &read(momentum), &read(time), region);
    for way in [by_lattice, by_contour] {
        let half = way(&at("0", "5/2", Region::RightOf(Rational::new())), 20).unwrap();
        assert!(half.contains_rational(&Rational::from((1, 2))));
        let right = way(&at("2", "1", Region::RightOf(Rational::new())), 20).unwrap();
        let left = way(&at("2", "1", Region::LeftOf(Rational::new())), 20).unwrap();
        assert!(sum(&right, &left).contains_rational(&Rational::from(1)));
        assert!(*right.lower() > 0.5);
    }
}

#[test]
fn limits_are_kept() {
    let asked = problem(&read("1/2"), &Rational::new(), &read("1"), region(0, &read("2")));
    let (now, bits) =
        (Effort { deadline: Some(Instant::now()), max_bits: None }, Effort { deadline: None, max_bits: Some(64) });
    for way in asked.evaluations() {
        assert_eq!(way.evaluate(15, &now).unwrap_err(), RouteFailure::TimeLimit);
        assert!(matches!(way.evaluate(15, &bits), Err(RouteFailure::BitLimit { needed }) if needed > 64));
    }
    // Far too many momenta, and inputs outside of any sense.
    for (sigma, time) in [("1e-9", "1e9"), ("1e-90", "1"), ("1", "1e90")] {
        let asked = problem(&read(sigma), &Rational::new(), &read(time), region(0, &read("2")));
        let declined = Lattice::new(asked).evaluate(15, &Effort::default());
        assert!(matches!(declined, Err(RouteFailure::OutOfReach { .. })), "{declined:?}");
    }
}

/// The request that serves all packets.
#[test]
fn asked_like_any_other_packet() {
    let ask = |sigma: &str, momentum: &str, time: &str, beyond: Option<&str>, side| {
        let packet = GaussianPacket::new(sigma.parse().unwrap()).unwrap().with_momentum(momentum.parse().unwrap());
        let mut request = PacketTail::new(Box::new(packet), "1".parse().unwrap(), time.parse().unwrap());
        request.beyond = beyond.map(|text| text.parse().unwrap());
        request.side = side;
        request.certify()
    };
    let found = ask("1/2", "0", "1", Some("2"), Side::Both).unwrap();
    assert_eq!((found.status, found.routes.len()), (Status::Certified, 2));
    assert!(meet(&found.interval, &around("0.0120482089973415846945", 20)));
    let (right, left) = (ask("1/2", "1", "2", Some("3"), Side::Right), ask("1/2", "1", "2", Some("3"), Side::Left));
    let both = ask("1/2", "1", "2", Some("3"), Side::Both).unwrap().interval;
    assert!(meet(&both, &sum(&right.unwrap().interval, &left.unwrap().interval)));
    let released = ask("1/2", "1", "0", Some("2"), Side::Both).unwrap();
    assert_eq!((released.status, released.routes.len()), (Status::Certified, 3));
    assert!(matches!(ask("1/2", "0", "1", None, Side::Both), Err(Error::Missing { field, .. }) if field == "beyond"));
    for (sigma, momentum, wrong) in [("[1, 2]", "0", "sigma"), ("1", "[0, 1]", "momentum")] {
        let refused = ask(sigma, momentum, "1", Some("2"), Side::Both);
        assert!(matches!(refused, Err(Error::BadInput { field, .. }) if field == wrong));
    }
}

#[test]
fn bad_input_names_its_field() {
    let field = |error: Error| match error {
        Error::BadInput { field, .. } => field,
        other => panic!("{other}"),
    };
    for sigma in ["0", "-1", "[0, 1]"] {
        assert_eq!(field(GaussianPacket::new(sigma.parse().unwrap()).unwrap_err()), "sigma");
    }
    let packet = GaussianPacket::new("1/2".parse().unwrap()).unwrap().with_momentum("-3".parse().unwrap());
    assert_eq!((packet.sigma().text(), packet.momentum().text()), ("1/2", "-3"));
    let one = Rational::from(1);
    let ask = |sigma: &str, mass: &str, region: Region| {
        field(GaussianProblem::new(&read(sigma), &one, &read(mass), &one, &region).unwrap_err())
    };
    assert_eq!(ask("0", "1", region(0, &one)), "sigma");
    assert_eq!(ask("1", "0", region(0, &one)), "mass");
    assert_eq!(ask("1", "-1", region(0, &one)), "mass");
    assert_eq!(ask("1", "1", Region::Outside(Rational::new())), "beyond");
    assert_eq!(ask("1", "1", Region::Within(read("-1"))), "within");
    assert_eq!(ask("1", "1", Region::Between(one.clone(), one.clone())), "between");
}
