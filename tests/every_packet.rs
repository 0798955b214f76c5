//! Every packet of the catalogue through the same request as the command line: values from outside, identities, and
//! random requests in which the routes have to meet (a disagreement is an error and fails the test).

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::quantities::catalogue;
use coneproof::quantities::packet_tail::PacketTail;
use coneproof::quantities::question::Question;
use coneproof::quantities::tail::{Side, Status};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Integer, Rational};
use serde_json::Value;
use std::collections::BTreeMap;

fn request(kind: &str, parameters: &[(&str, &str)], mass: &str, time: &str) -> PacketTail {
    let given: BTreeMap<String, String> =
        parameters.iter().map(|(name, text)| ((*name).to_owned(), (*text).to_owned())).collect();
    PacketTail::new(catalogue::packet(kind, &given).unwrap(), mass.parse().unwrap(), time.parse().unwrap())
}

fn certified(request: &PacketTail) -> Interval {
    let result = request.certify().unwrap();
    assert_eq!(result.status, Status::Certified, "{request:?}: {result:?}");
    result.interval
}

/// The values of `references/check-values.json` for packets; its digits beyond the agreed ones do not count.
#[test]
fn check_values() {
    let text = std::fs::read_to_string("references/check-values.json").unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    let mut seen = 0;
    for value in all["values"].as_array().unwrap() {
        let (id, params) = (value["id"].as_str().unwrap(), &value["params"]);
        let text = |name: &str| params[name].as_str().unwrap();
        let mut question = match id.split('_').next().unwrap() {
            "A" | "A0" => {
                let mut question = request("gaussian", &[("sigma", text("s"))], text("m"), text("t"));
                question.beyond = Some(text("X").parse().unwrap());
                question
            }
            "B" => request("ball", &[("radius", text("a"))], text("m"), text("t")),
            "B0" if text("t") != "inf" => request("ball", &[("radius", text("a"))], "0", text("t")),
            "C" => request("cosine", &[("half-width", text("a"))], text("m"), text("t")),
            "D+" | "D-" => {
                let parameters = [("half-width", text("a")), ("momentum", text("k"))];
                let mut question = request("box", &parameters, text("m"), text("t"));
                question.side = if id.starts_with("D+") { Side::Right } else { Side::Left };
                question
            }
            _ => continue,
        };
        seen += 1;
        question.digits = 20;
        let found = certified(&question);
        let decimals = value["digits_agreed_by_two_methods"].as_u64().unwrap() as u32;
        let known = value["value"].as_str().unwrap().parse::<ExactInput>().unwrap().lower().clone();
        // Values below 1e-20 are given with relative digits.
        let unit = Rational::from((1, 1)) / Integer::from(Integer::u_pow_u(10, decimals));
        let slack = if known < 1e-20 { Rational::from(&known * &unit) } else { unit };
        let (low, high) = (Rational::from(&known - &slack), Rational::from(&known + &slack));
        assert!(*found.lower() <= high && *found.upper() >= low, "{id}: {found:?}");
    }
    assert!(seen >= 27, "{seen} values");
}

/// A spline of order one is the box, and so is a box of momentum zero.
#[test]
fn the_box_by_other_names() {
    let plain = certified(&request("box", &[("half-width", "2/3")], "1", "5/4"));
    let spline = certified(&request("bspline", &[("half-width", "2/3"), ("order", "1")], "1", "5/4"));
    let still = certified(&request("box", &[("half-width", "2/3"), ("momentum", "0")], "1", "5/4"));
    assert!(plain.intersection(&spline).and_then(|both| both.intersection(&still)).is_some());
}

/// A triangle by pieces is the spline of order two, wherever it stands; two half boxes are a box; a common phase is nothing.
#[test]
fn pieces_of_other_packets() {
    let pieces =
        |knots: &str, pieces: &str| certified(&request("piecewise", &[("knots", knots), ("pieces", pieces)], "1", "1"));
    let spline = certified(&request("bspline", &[("half-width", "1"), ("order", "2")], "1", "1"));
    assert!(spline.intersection(&pieces("-1, 0, 1", "0, 1; 1, -1")).is_some());
    assert!(spline.intersection(&pieces("4, 5, 6", "0, 2i; 2i, -2i")).is_some());
    let plain = certified(&request("box", &[("half-width", "1")], "1", "1"));
    assert!(plain.intersection(&pieces("-1, 1/3, 1", "3; 3")).is_some());
    assert!(plain.intersection(&pieces("-1, 1/3, 1", "3; 2")).is_none());
}

/// Both sides of a moving box have the same tail (an exact identity: outside the cone the kernel is imaginary and even).
#[test]
fn a_moving_box_leaks_alike_on_both_sides() {
    let mut question = request("box", &[("half-width", "1/2"), ("momentum", "3")], "1", "2");
    question.side = Side::Left;
    let left = certified(&question);
    question.side = Side::Right;
    assert!(left.intersection(&certified(&question)).is_some());
}

/// Mass zero, late times: the ball tends to `1/6 - 1/pi^2` (an exact identity) from below.
#[test]
fn the_massless_ball_late() {
    let found = certified(&request("ball", &[("radius", "1")], "0", "1000000"));
    let limit = 1.0 / 6.0 - 1.0 / std::f64::consts::PI.powi(2);
    assert!(found.upper().to_f64() < limit && found.lower().to_f64() > limit - 1e-5);
}

fn number(low: f64, high: f64) -> impl Strategy<Value = String> {
    (low..high).prop_map(|power| Rational::from_f64(10f64.powf(power)).unwrap().to_string())
}

/// Kind and parameters over moderate ranges.
fn packet() -> impl Strategy<Value = (&'static str, Vec<(&'static str, String)>)> {
    let width = || number(-1.5, 1.0);
    prop_oneof![
        (width(), 0u32..60).prop_map(|(a, k)| ("box", vec![("half-width", a), ("momentum", format!("{k}/10"))])),
        (width(), 1u32..4).prop_map(|(a, n)| ("cosine", vec![("half-width", a), ("mode", n.to_string())])),
        (width(), 1u32..5).prop_map(|(a, p)| ("bspline", vec![("half-width", a), ("order", p.to_string())])),
        width().prop_map(|a| ("ball", vec![("radius", a)])),
        (number(-1.0, 0.5), -20i32..20)
            .prop_map(|(s, k)| ("gaussian", vec![("sigma", s), ("momentum", format!("{k}/10"))])),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 2000, rng_seed: RngSeed::Fixed(303), failure_persistence: None, ..ProptestConfig::default()
    })]

    #[test]
    fn the_routes_meet((kind, parameters) in packet(), time in number(-1.0, 1.0), distance in prop::option::of(number(-2.0, 0.7))) {
        let parameters: Vec<(&str, &str)> = parameters.iter().map(|(name, text)| (*name, text.as_str())).collect();
        let mut question = request(kind, &parameters, "1", &time);
        question.digits = 10;
        question.time_limit = Some(std::time::Duration::from_secs(20));
        let number = |text: &str| text.parse::<ExactInput>().unwrap().lower().clone();
        let edge = question.packet.edge().unwrap_or_default();
        let cone = edge + number(&time);
        question.beyond = match (distance, kind) {
            (Some(distance), _) => Some(ExactInput::from_rational(cone + number(&distance))),
            (None, "gaussian") => Some(ExactInput::from_rational(cone + 1)),
            (None, _) => None,
        };
        let result = question.certify();
        prop_assert!(result.is_ok(), "{question:?}: {result:?}");
        let result = result.unwrap();
        prop_assert_eq!(result.status, Status::Certified, "{:?}: {:?}", question, result);
        let answered = result.routes.iter().filter(|route| route.interval.is_some()).count();
        prop_assert!(answered == 2, "{:?}: {} routes", question, answered);
    }
}
