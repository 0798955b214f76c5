//! Mass zero: the closed form in position space against the sum in momentum space, and both against
//! outside values and exact statements.

#![allow(clippy::unwrap_used, reason = "helpers of tests fail loudly")]

use coneproof::arithmetic::{ExactInput, Interval, Magnitude, Real};
use coneproof::functions::dilogarithm;
use coneproof::functions::elementary::{ln, ln_2, pi};
use coneproof::routes::kernel::KERNEL;
use coneproof::routes::spectral::SPECTRAL;
use coneproof::routes::{Effort, Route, RouteFailure, TailProblem};
use proptest::prelude::*;
use rug::{Float, Rational};
use std::time::Instant;

const ROUTES: [&dyn Route; 2] = [&KERNEL, &SPECTRAL];

fn rational(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn problem(time: Rational, distance: Rational) -> TailProblem {
    TailProblem { half_width: Rational::from(1), time, distance, massless: true }
}

fn find(route: &dyn Route, problem: &TailProblem, digits: u32) -> Interval {
    route.evaluate(problem, digits, &Effort::default()).unwrap().interval
}

/// Both intervals, checked to be narrow and to meet.
fn both(problem: &TailProblem, digits: u32) -> [Interval; 2] {
    let found = ROUTES.map(|route| {
        let interval = find(route, problem, digits);
        assert!(interval.has_relative_digits(digits), "{} is too wide for {problem:?}", route.name());
        interval
    });
    assert!(found[0].intersection(&found[1]).is_some(), "the routes do not meet for {problem:?}: {found:?}");
    found
}

/// A short exact number of any size, from its decimal logarithm.
fn sized(exponent: f64) -> Rational {
    let power = exponent.floor();
    let mantissa = (10f64.powf(exponent - power) * 1e6).round() as i64;
    rational(&format!("{mantissa}e{}", power as i64 - 6))
}

/// Times from 1e-9 to 1e9; distances zero or from 1e-9 to 1e12.
fn problems() -> impl Strategy<Value = TailProblem> {
    let distance = prop_oneof![1 => Just(Rational::new()), 3 => (-9.0f64..12.0).prop_map(sized)];
    ((-9.0f64..9.0).prop_map(sized), distance).prop_map(|(time, distance)| problem(time, distance))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(240))]

    #[test]
    fn routes_meet(problem in problems()) {
        let coarse = both(&problem, 15);
        let fine = both(&problem, 40);
        for (wide, narrow) in coarse.iter().zip(&fine) {
            prop_assert!(wide.intersection(narrow).is_some());
        }
    }

    /// Half-width and time may be exchanged: P(a, t, d) a = P(t, a, d) t. In momentum space the two sides
    /// are sums over different nodes.
    #[test]
    fn half_width_and_time_may_be_exchanged(problem in problems()) {
        let inverse = Rational::from(problem.time.recip_ref());
        let other = self::problem(inverse.clone(), Rational::from(&problem.distance * &inverse));
        let time = Real::from_rational(&problem.time, 200);
        for route in ROUTES {
            let exchanged = find(route, &other, 20).to_real(200).mul(&time, 200);
            prop_assert!(exchanged.overlaps(&find(route, &problem, 20).to_real(200)));
        }
    }

    /// `4t/x^2 < L(x) < 4t/(x^2 - u^2)` encloses the probability by elementary integrals.
    #[test]
    fn far_regions_obey_elementary_bounds(problem in problems()) {
        let u = Rational::from(&problem.time + 1);
        let region = Rational::from(&u + &problem.distance);
        let lead = Rational::from(&problem.time * &problem.time) * 4 / 3 / Rational::from(&region * &region) / &region;
        let low = Real::from_rational(&lead, 100).div(&pi(100).square(100), 100);
        let shrink = Rational::from(1) - Rational::from(&u / &region) * Rational::from(&u / &region);
        let high = low.div(&Real::from_rational(&shrink, 100).square(100), 100);
        for interval in both(&problem, 15) {
            let value = interval.to_real(100);
            prop_assert!(low.possibly_less(&value) && (problem.distance == 0 || value.possibly_less(&high)));
            prop_assert!(problem.distance != 0 || !high.is_bounded());
        }
    }
}

#[test]
fn values_from_the_definition() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/references/box_tail_from_definition.json");
    let table: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let mut count = 0;
    for entry in table["values"].as_array().unwrap().iter().filter(|entry| entry["mass"] == "0") {
        count += 1;
        let number = |name: &str| entry[name].as_str().map(rational);
        let (a, t) = (number("half_width").unwrap(), number("time").unwrap());
        let distance = number("beyond").map_or_else(Rational::new, |region| region - &a - &t) / &a;
        let value = number("value").unwrap();
        let slack = Magnitude::power_of_two(-100).mul(Magnitude::from_float(&Float::with_val(64, &value)));
        // 30 digits: well inside the 40 digits kept in the file.
        for interval in both(&problem(t / &a, distance), 30) {
            assert!(interval.to_real(200).overlaps(&Real::from_rational(&value, 200).widen(slack)), "{entry}");
        }
    }
    assert!(count >= 8);
}

#[test]
fn dilogarithm_reference_values() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/references/dilogarithm.json");
    let table: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let entries = table["values"].as_array().unwrap();
    assert!(entries.len() >= 20);
    for entry in entries {
        let (x, value) = (rational(entry["x"].as_str().unwrap()), rational(entry["value"].as_str().unwrap()));
        // Rounded to nearest at 50 significant digits: half a unit is below 10^-49 of the value.
        let slack = Magnitude::from_float(&Float::with_val(64, &value)).mul(Magnitude::power_of_two(-162));
        let known = Real::from_rational(&value, 300).widen(slack);
        let found = dilogarithm::dilogarithm_of_rational(&x, 220);
        assert!(found.overlaps(&known) && found.accuracy_estimate() > 215.0, "{entry}");
        assert!(dilogarithm::dilogarithm(&Real::from_rational(&x, 220), 220).overlaps(&known), "{entry}");
    }
}

/// `t = a` at the cone: the dilogarithms drop out and `P = 1/6 - 2 ln^2(2)/pi^2`.
#[test]
fn time_equal_to_the_half_width() {
    let term = ln_2(400).square(400).shift(1).div(&pi(400).square(400), 400);
    let known = Real::from_rational(&Rational::from((1, 6)), 400).sub(&term, 400).to_interval(400);
    for interval in both(&problem(Rational::from(1), Rational::new()), 100) {
        assert!(interval.contains(&known));
    }
}

/// `P = 1/6 - (2 ln t + 1)/(2 pi^2 t) + O(ln t / t^2)` for late times: expand the closed form in `r = 1/t`.
#[test]
fn late_times_reach_one_sixth() {
    for power in [3, 6, 9, 30] {
        let time = rational(&format!("1e{power}"));
        let t = Real::from_rational(&time, 300);
        let fall =
            ln(&t, 300).shift(1).add(&Real::from_i64(1), 300).div(&pi(300).square(300).mul(&t, 300).shift(1), 300);
        let known = Real::from_rational(&Rational::from((1, 6)), 300).sub(&fall, 300);
        let slack = Magnitude::from_float(&Float::with_val(64, &time)).pow(2);
        let known = known.widen(Magnitude::from_u64(100).div(slack.shift(-1)));
        for interval in both(&problem(time, Rational::new()), 60) {
            assert!(known.overlaps(&interval.to_real(300)));
        }
    }
}

/// Where factors of the logarithm coincide or nearly do, and far outside the usual range.
#[test]
fn coincident_and_extreme_inputs() {
    let times = ["1", "1.000000000000001", "0.999999999999999", "1e-40", "1e40", "2", "1/2"];
    let distances = ["0", "1e-40", "1e-15", "1", "2", "4", "1e15", "1e40"];
    for time in times {
        let mut last: Option<[Interval; 2]> = None;
        for distance in distances {
            let found = both(&problem(rational(time), rational(distance)), 25);
            if let Some(nearer) = last {
                // The probability falls with the distance.
                assert!(nearer.iter().zip(&found).all(|(near, far)| near.upper() >= far.lower()));
            }
            last = Some(found);
        }
    }
    // A region that begins just beyond the cone tends to the one at the cone.
    let near = both(&problem(Rational::from(3), rational("1e-60")), 30);
    let at = both(&problem(Rational::from(3), Rational::new()), 30);
    assert!(near.iter().zip(&at).all(|(a, b)| a.intersection(b).is_some()));
}

#[test]
fn many_digits() {
    for (time, distance) in [("1", "0"), ("7/3", "0"), ("1/9", "5/4"), ("20", "1/1000")] {
        both(&problem(rational(time), rational(distance)), 100);
    }
    both(&problem(rational("7/3"), Rational::new()), 200);
    find(&KERNEL, &problem(rational("7/3"), rational("1/7")), 3000);
}

#[test]
fn limits_are_answered_with_reasons() {
    let far = problem(rational("7/3"), rational("1/7"));
    match SPECTRAL.evaluate(&far, 2000, &Effort::default()) {
        Err(RouteFailure::OutOfReach { reason }) => assert!(reason.contains("nodes"), "{reason}"),
        other => panic!("{other:?}"),
    }
    assert!(find(&KERNEL, &far, 2000).has_relative_digits(2000));
    let absurd = problem(rational("1e-900000"), Rational::from(1));
    for route in ROUTES {
        let refused = route.evaluate(&absurd, 15, &Effort::default());
        assert!(matches!(refused, Err(RouteFailure::OutOfReach { .. })), "{refused:?}");
        let few = Effort { max_bits: Some(64), deadline: None };
        assert!(matches!(route.evaluate(&far, 50, &few), Err(RouteFailure::BitLimit { needed }) if needed > 64));
        let late = Effort { max_bits: None, deadline: Some(Instant::now()) };
        assert!(matches!(route.evaluate(&far, 15, &late), Err(RouteFailure::TimeLimit)));
    }
}

#[test]
fn witnesses_fix_the_computation() {
    let names = |route: &dyn Route, time: &str, distance: &str| {
        let outcome = route.evaluate(&problem(rational(time), rational(distance)), 15, &Effort::default()).unwrap();
        outcome.witness.into_iter().map(|(name, _)| name).collect::<Vec<_>>().join(" | ")
    };
    for (route, time, distance, wanted) in [
        (ROUTES[0], "2", "0", "Li_2(r^2), lower"),
        (ROUTES[0], "2", "1/2", "Li_2(r/w), upper"),
        (ROUTES[0], "2", "1000", "series tail bound"),
        (ROUTES[1], "2", "0", "far-field replacement bound"),
        (ROUTES[1], "2", "1/2", "right cut-off bound"),
        (ROUTES[1], "2", "0", "discretisation bound"),
    ] {
        let list = names(route, time, distance);
        assert!(list.contains(wanted), "{list}");
    }
}
