//! Tails of general packets by the spectral route: values from outside, identities, containment.
//!
//! `references/packet_tail_from_definition.json` comes from `tests/oracles/packet_tail_from_definition.py`, which starts at
//! the definition of the evolution on a tilted momentum contour and shares no formula with the route;
//! `references/check-values.json` names its methods value by value.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval, Real};
use coneproof::packets::waves::Polynomial;
use coneproof::packets::{BSplinePacket, ExactComplex, PiecewisePacket, WavePacket};
use coneproof::routes::cut::{CutAmplitude, CutSide, CutTail};
use coneproof::routes::panels::{PiecewiseKernel, Sides};
use coneproof::routes::spectral::SPECTRAL;
use coneproof::routes::{Effort, Evaluation, Route, TailProblem};
use proptest::prelude::*;
use proptest::test_runner::{RngSeed, TestRunner};
use rug::{Integer, Rational};
use serde_json::Value;

fn q(n: i64, d: i64) -> Rational {
    Rational::from((n, d))
}

fn exact(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn one() -> ExactComplex {
    ExactComplex::from(q(1, 1))
}

fn tail(packet: &dyn CutAmplitude, m: &Rational, t: &Rational, d: &Rational, side: CutSide, digits: u32) -> Interval {
    let tail = CutTail::new(packet, m, t, d, side).unwrap();
    let found = tail.evaluate(digits, &Effort::default()).unwrap().interval;
    assert!(found.has_relative_digits(digits), "m {m} t {t} d {d}: {found:?}");
    found
}

fn both(packet: &dyn CutAmplitude, m: &Rational, t: &Rational, d: &Rational, digits: u32) -> Interval {
    tail(packet, m, t, d, CutSide::Both, digits)
}

fn meet(left: &Interval, right: &Interval) {
    assert!(left.intersection(right).is_some(), "{left:?} and {right:?}");
}

/// The decimal, and one unit of the last of its digits.
fn with_unit(decimal: &str) -> (Rational, Rational) {
    let value = exact(decimal);
    let (mantissa, exponent) = decimal.split_once('e').unwrap_or((decimal, "0"));
    let places = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len() as i32);
    let power = exponent.parse::<i32>().unwrap() - places;
    let unit = Rational::from(Integer::from(Integer::u_pow_u(10, power.unsigned_abs())));
    (value, if power < 0 { unit.recip() } else { unit })
}

fn within_a_unit(found: &Interval, decimal: &str) {
    let (value, unit) = with_unit(decimal);
    let (low, high) = (Rational::from(&value - &unit), value + unit);
    assert!(*found.upper() >= low && *found.lower() <= high, "{decimal}: {found:?}");
}

// ----- values from outside ------------------------------------------------------------------------

fn number(value: &Value) -> ExactComplex {
    match value {
        Value::Object(parts) => {
            let part = |key: &str| exact(parts[key].as_str().unwrap());
            ExactComplex::new(part("re"), part("im"))
        }
        other => ExactComplex::from(exact(other.as_str().unwrap())),
    }
}

fn waves(packet: &Value) -> WavePacket {
    let get = |key: &str| exact(packet[key].as_str().unwrap());
    let whole = |key: &str| packet[key].as_u64().unwrap() as u32;
    let list = |key: &str| -> Vec<Rational> {
        packet[key].as_array().unwrap().iter().map(|v| exact(v.as_str().unwrap())).collect()
    };
    let pieces = || -> Vec<Polynomial> {
        let all = packet["pieces"].as_array().unwrap();
        all.iter().map(|piece| piece.as_array().unwrap().iter().map(number).collect()).collect()
    };
    let found = match packet["kind"].as_str().unwrap() {
        "moving_box" => WavePacket::moving_box(&get("half_width"), &get("momentum")),
        "cosine" => WavePacket::cosine(&get("half_width"), whole("mode"), &get("momentum")),
        "bspline" => WavePacket::bspline(&get("half_width"), whole("order"), &get("momentum")),
        "ball" => WavePacket::ball(&get("radius")),
        "spherical_well" => WavePacket::spherical_well(&get("radius"), whole("mode")),
        "piecewise" => WavePacket::piecewise(list("knots"), &pieces()),
        "radial" => WavePacket::radial(list("radii"), &pieces()),
        "superposition" => {
            let terms = packet["terms"].as_array().unwrap();
            let terms: Vec<_> = terms.iter().map(|t| (number(&t["weight"]), waves(&t["packet"]))).collect();
            WavePacket::superposition(&terms)
        }
        other => panic!("{other}"),
    };
    found.unwrap()
}

fn values(path: &str) -> Vec<Value> {
    let all: Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    all["values"].as_array().unwrap().clone()
}

#[test]
fn values_from_the_definition() {
    let values = values("references/packet_tail_from_definition.json");
    assert!(values.len() >= 20);
    for value in &values {
        let text = |key: &str| value[key].as_str().unwrap();
        let digits = value["digits"].as_u64().unwrap() as u32;
        assert!(digits >= 20);
        let packet = waves(&value["packet"]);
        let side = match text("side") {
            "left" => CutSide::Left,
            "right" => CutSide::Right,
            _ => CutSide::Both,
        };
        let inputs = [exact(text("mass")), exact(text("time")), exact(text("distance"))];
        let found = tail(&packet, &inputs[0], &inputs[1], &inputs[2], side, digits + 2);
        println!("{}", value["packet"]);
        within_a_unit(&found, text("value"));
        if value["packet"]["kind"] == "bspline" && value["packet"]["momentum"] == "0" {
            let order = value["packet"]["order"].as_u64().unwrap() as u32;
            let closed = BSplinePacket::new(&packet.half_width(), order).unwrap();
            within_a_unit(&both(&closed, &inputs[0], &inputs[1], &inputs[2], digits + 2), text("value"));
        }
    }
}

#[test]
fn values_computed_elsewhere() {
    let zero = Rational::new();
    let mut seen = 0;
    for value in &values("references/check-values.json") {
        let get = |key: &str| exact(value["params"][key].as_str().unwrap());
        let id = value["id"].as_str().unwrap();
        let packet = match id.split('_').next().unwrap() {
            "C" => WavePacket::cosine(&get("a"), 1, &zero),
            "D+" | "D-" => WavePacket::moving_box(&get("a"), &get("k")),
            "B" | "B0" if id != "B0_inf" => WavePacket::ball(&get("a")),
            _ => continue,
        };
        let side = match id.get(..2) {
            Some("D+") => CutSide::Right,
            Some("D-") => CutSide::Left,
            _ => CutSide::Both,
        };
        let found = tail(&packet.unwrap(), &get("m"), &get("t"), &zero, side, 40);
        // So many decimals after the point agree; the text goes on.
        let decimals = value["digits_agreed_by_two_methods"].as_u64().unwrap() as usize;
        let text = value["value"].as_str().unwrap();
        let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
        let shift = exponent.parse::<i64>().unwrap();
        let shown = &mantissa[..(2 + decimals as i64 + shift) as usize];
        within_a_unit(&found, &format!("{shown}e{exponent}"));
        seen += 1;
    }
    assert_eq!(seen, 18);
}

// ----- identities ---------------------------------------------------------------------------------

fn box_route(a: &Rational, m: &Rational, t: &Rational, d: &Rational, digits: u32) -> Interval {
    let massless = *m == 0;
    let unit = if massless { Rational::from(a.recip_ref()) } else { m.clone() };
    let scaled = |value: &Rational| Rational::from(value * &unit);
    let problem = TailProblem { half_width: scaled(a), time: scaled(t), distance: scaled(d), massless };
    SPECTRAL.evaluate(&problem, digits, &Effort::default()).unwrap().interval
}

#[test]
fn many_ways_to_the_box() {
    let zero = Rational::new();
    for (a, m, t, d) in [
        (q(1, 1), q(1, 1), q(1, 1), zero.clone()),
        (q(1, 10), q(2, 1), q(3, 1), zero.clone()),
        (q(5, 1), q(1, 1), q(1, 3), q(1, 7)),
        (q(1, 1), q(0, 1), q(1, 2), zero.clone()),
        (q(3, 1), q(0, 1), q(1, 1), q(2, 1)),
        (q(1, 1), q(1, 1), q(2, 1), q(40, 1)),
    ] {
        let known = box_route(&a, &m, &t, &d, 32);
        let half = WavePacket::moving_box(&Rational::from(&a / 2), &zero).unwrap();
        let shift = Rational::from(&a / 2);
        let (left, right) = (half.translated(&Rational::from(-&shift)).unwrap(), half.translated(&shift).unwrap());
        let third = Rational::from(&a / 3);
        let weight = ExactComplex::new(q(3, 7), q(-2, 5));
        let packets: Vec<(&str, Box<dyn CutAmplitude>)> = vec![
            ("spline of order 1", Box::new(BSplinePacket::new(&a, 1).unwrap())),
            ("no momentum", Box::new(WavePacket::moving_box(&a, &zero).unwrap())),
            ("order 1 by pieces", Box::new(WavePacket::bspline(&a, 1, &zero).unwrap())),
            (
                "two pieces",
                Box::new(
                    WavePacket::piecewise(vec![Rational::from(-&a), third, a.clone()], &[vec![one()], vec![one()]])
                        .unwrap(),
                ),
            ),
            ("half boxes", Box::new(WavePacket::superposition(&[(weight.clone(), left), (weight, right)]).unwrap())),
        ];
        for (name, packet) in packets {
            println!("{name} {a} {m} {t} {d}");
            meet(&known, &both(packet.as_ref(), &m, &t, &d, 30));
        }
    }
}

#[test]
fn splines_and_wells_in_other_words() {
    let (zero, m) = (Rational::new(), q(1, 1));
    for order in [2, 3, 5, 8, 12] {
        let closed = BSplinePacket::new(&q(3, 2), order).unwrap();
        let pieces = closed.to_waves().unwrap();
        for (mass, t, d) in [(q(1, 1), q(1, 1), q(0, 1)), (q(1, 1), q(1, 5), q(1, 1)), (q(0, 1), q(2, 1), q(0, 1))] {
            meet(&both(&closed, &mass, &t, &d, 25), &both(&pieces, &mass, &t, &d, 25));
        }
    }
    // sin(n pi r/a)/r in a ball is the hard-wall state number 2 n on the line.
    let well = WavePacket::spherical_well(&q(2, 1), 2).unwrap();
    meet(
        &both(&well, &m, &q(1, 1), &zero, 25),
        &both(&WavePacket::cosine(&q(2, 1), 4, &zero).unwrap(), &m, &q(1, 1), &zero, 25),
    );
    // A ball is the radial packet 1, and u = x on the line.
    let line = WavePacket::piecewise(vec![q(-1, 1), q(1, 1)], &[vec![one().neg(), one()]]).unwrap();
    meet(&both(&WavePacket::ball(&q(1, 1)).unwrap(), &m, &q(1, 1), &zero, 25), &both(&line, &m, &q(1, 1), &zero, 25));
}

#[test]
fn sides_scales_and_sums() {
    let zero = Rational::new();
    let lopsided = WavePacket::piecewise(
        vec![q(-1, 1), q(1, 3), q(2, 1)],
        &[vec![one(), ExactComplex::new(q(0, 1), q(1, 2))], vec![ExactComplex::new(q(2, 1), q(-1, 1))]],
    )
    .unwrap();
    let moving = WavePacket::moving_box(&q(1, 1), &q(5, 2)).unwrap();
    let standing = WavePacket::cosine(&q(1, 1), 2, &q(3, 1)).unwrap();
    for m in [q(1, 1), q(0, 1)] {
        for d in [q(0, 1), q(1, 4)] {
            for (packet, equal) in [(&lopsided, false), (&moving, true), (&standing, true)] {
                let t = q(3, 2);
                let (left, right) =
                    (tail(packet, &m, &t, &d, CutSide::Left, 22), tail(packet, &m, &t, &d, CutSide::Right, 22));
                // Both sides of a packet with psi0(-x) = ± conj psi0(x) are equal.
                assert_eq!(left.intersection(&right).is_some(), equal);
                let (x, y) = (Real::from_interval(&left, 100), Real::from_interval(&right, 100));
                meet(&x.add(&y, 100).to_interval(100), &both(packet, &m, &t, &d, 22));
                // Only ratios matter.
                let unit = q(7, 3);
                let scaled = packet.scaled(&unit);
                let mass = Rational::from(&m / &unit);
                let (time, distance) = (Rational::from(&t * &unit), Rational::from(&d * &unit));
                meet(&tail(packet, &m, &t, &d, CutSide::Both, 22), &both(&scaled, &mass, &time, &distance, 22));
                // The sign of the time does not matter to |psi| outside the cone.
                meet(&both(packet, &m, &Rational::from(-&t), &d, 22), &both(packet, &m, &t, &d, 22));
                // A phase does not matter, nor does a place.
                let turned =
                    WavePacket::superposition(&[(ExactComplex::new(q(0, 1), q(-3, 1)), packet.clone())]).unwrap();
                meet(&both(&turned, &m, &t, &d, 22), &both(packet, &m, &t, &d, 22));
            }
        }
    }
    let moved = lopsided.translated(&q(-11, 3)).unwrap();
    meet(&both(&moved, &q(1, 1), &q(1, 1), &zero, 22), &both(&lopsided, &q(1, 1), &q(1, 1), &zero, 22));
    let still = CutTail::new(&moving, &q(1, 1), &zero, &q(1, 1), CutSide::Both).unwrap();
    assert_eq!(*still.evaluate(15, &Effort::default()).unwrap().interval.upper(), 0);
}

/// `1/6` for the box and `1/6 - 1/pi^2` for the ball: mass zero, late times (exact identities).
#[test]
fn massless_late_limits() {
    let zero = Rational::new();
    let sixth = Real::from_rational(&q(1, 6), 300);
    let pi = coneproof::functions::elementary::pi(300);
    let ball_limit = sixth.sub(&Real::from_i64(1).div(&pi.square(300), 300), 300);
    let packets =
        [(WavePacket::ball(&q(2, 1)).unwrap(), ball_limit), (WavePacket::moving_box(&q(2, 1), &zero).unwrap(), sixth)];
    for (packet, limit) in packets {
        let mut before = Rational::new();
        for power in [3u32, 8, 16] {
            let t = Rational::from(Integer::from(Integer::u_pow_u(10, power)));
            let found = both(&packet, &zero, &t, &zero, 55);
            let gap = limit.to_interval(300).lower().to_rational().unwrap() - found.upper().to_rational().unwrap();
            // Approached from below, with a distance of order a/t ln(t/a) or smaller (common practice, no source).
            assert!(gap > 0 && gap * t < 100 * power);
            assert!(found.lower().to_rational().unwrap() > before);
            before = found.upper().to_rational().unwrap();
        }
    }
}

#[test]
fn many_digits_and_tiny_tails() {
    let zero = Rational::new();
    let moving = WavePacket::moving_box(&q(1, 1), &q(1, 1)).unwrap();
    let ball = WavePacket::ball(&q(1, 1)).unwrap();
    for m in [q(1, 1), q(0, 1)] {
        let fine = both(&moving, &m, &q(1, 1), &zero, 100);
        assert!(both(&moving, &m, &q(1, 1), &zero, 20).contains(&fine));
    }
    // A tail near 1e-10000 with full relative accuracy.
    let far = both(&ball, &q(1, 1), &q(1, 1), &q(11_500, 1), 15);
    let exponent = far.lower().get_exp().unwrap();
    assert!((-34_000..-33_000).contains(&exponent), "{exponent}");
}

#[test]
fn bad_requests_are_refused() {
    let packet = WavePacket::ball(&q(1, 1)).unwrap();
    let minus = q(-1, 1);
    for (m, d, field) in [(&minus, &q(0, 1), "mass"), (&q(1, 1), &minus, "distance")] {
        let error = CutTail::new(&packet, m, &q(1, 1), d, CutSide::Both).err().unwrap();
        assert!(error.to_string().starts_with(field), "{error}");
    }
    let tail = CutTail::new(&packet, &q(1, 1), &q(1, 1), &q(0, 1), CutSide::Both).unwrap();
    let effort = Effort { max_bits: Some(80), deadline: None };
    assert!(tail.evaluate(30, &effort).is_err());
}

// ----- containment --------------------------------------------------------------------------------

fn size(low: f64, high: f64) -> impl Strategy<Value = Rational> {
    (low..high).prop_map(|power| Rational::from_f64(10f64.powf(power)).unwrap())
}

fn momentum() -> impl Strategy<Value = Rational> {
    prop_oneof![1 => Just(Rational::new()), 4 => (-400i64..400, 1i64..20).prop_map(|(n, d)| q(n, d))]
}

fn coefficient() -> impl Strategy<Value = ExactComplex> {
    let part = || (-20i64..21, 1i64..8).prop_map(|(n, d)| q(n, d));
    prop_oneof![part().prop_map(ExactComplex::from), (part(), part()).prop_map(|(re, im)| ExactComplex::new(re, im)),]
}

fn pieces() -> impl Strategy<Value = (Vec<Rational>, Vec<Polynomial>)> {
    prop::collection::vec((1i64..30, prop::collection::vec(coefficient(), 1..5)), 1..5).prop_map(|list| {
        let mut knots = vec![Rational::new()];
        for (length, _) in &list {
            let next = &knots[knots.len() - 1] + q(*length, 10);
            knots.push(next);
        }
        (knots, list.into_iter().map(|(_, piece)| piece).collect())
    })
}

/// Every 10-digit interval must contain the 40-digit one, on many random inputs.
fn contained(cases: u32, packets: impl Strategy<Value = Option<WavePacket>>) {
    let config =
        ProptestConfig { cases, rng_seed: RngSeed::Fixed(31), failure_persistence: None, ..ProptestConfig::default() };
    let mass = prop_oneof![3 => size(-1.5, 1.0), 1 => Just(Rational::new())];
    let distance = prop_oneof![1 => Just(Rational::new()), 1 => size(-3.0, 1.0)];
    let inputs = (packets, mass, size(-2.0, 2.0), distance);
    let result = TestRunner::new(config).run(&inputs, |(packet, m, t, d)| {
        let Some(packet) = packet else { return Ok(()) };
        let tail = CutTail::new(&packet, &m, &t, &d, CutSide::Both).unwrap();
        let [coarse, fine] = [10, 40].map(|digits| tail.evaluate(digits, &Effort::default()).unwrap().interval);
        prop_assert!(coarse.has_relative_digits(10) && fine.has_relative_digits(40), "digits: {coarse:?} {fine:?}");
        prop_assert!(coarse.contains(&fine), "{coarse:?} {fine:?}");
        Ok(())
    });
    result.unwrap();
}

const CASES: u32 = 300;

#[test]
fn moving_boxes_are_contained() {
    contained(CASES, (size(-2.0, 1.0), momentum()).prop_map(|(a, k)| WavePacket::moving_box(&a, &k).ok()));
}

#[test]
fn cosines_are_contained() {
    let packets = (size(-2.0, 1.0), 1u32..9, momentum()).prop_map(|(a, n, k)| WavePacket::cosine(&a, n, &k).ok());
    contained(CASES, packets);
}

#[test]
fn splines_are_contained() {
    let packets = (size(-2.0, 1.0), 1u32..8, momentum()).prop_map(|(a, p, k)| WavePacket::bspline(&a, p, &k).ok());
    contained(CASES, packets);
}

#[test]
fn balls_and_wells_are_contained() {
    let packets = (size(-2.0, 1.0), 0u32..6)
        .prop_map(|(a, n)| if n == 0 { WavePacket::ball(&a).ok() } else { WavePacket::spherical_well(&a, n).ok() });
    contained(CASES, packets);
}

#[test]
fn piecewise_packets_are_contained() {
    contained(CASES, pieces().prop_map(|(knots, list)| WavePacket::piecewise(knots, &list).ok()));
}

#[test]
fn radial_packets_are_contained() {
    contained(CASES, pieces().prop_map(|(radii, list)| WavePacket::radial(radii, &list).ok()));
}

#[test]
fn superpositions_are_contained() {
    let terms = prop::collection::vec((coefficient(), -20i64..20, momentum()), 2..4);
    let packets = terms.prop_map(|list| {
        let placed = |(weight, shift, k): (ExactComplex, i64, Rational)| {
            let still = WavePacket::bspline(&q(1, 1), 2, &Rational::new()).unwrap();
            (weight, still.translated(&q(shift, 10)).unwrap().with_momentum(&k))
        };
        WavePacket::superposition(&list.into_iter().map(placed).collect::<Vec<_>>()).ok()
    });
    contained(CASES, packets);
}

/// Position space and momentum space share the arithmetic and nothing else.
#[test]
fn kernel_and_spectral_routes_meet() {
    let config = ProptestConfig {
        cases: 200,
        rng_seed: RngSeed::Fixed(33),
        failure_persistence: None,
        ..ProptestConfig::default()
    };
    let distance = prop_oneof![1 => Just(Rational::new()), 1 => size(-2.0, 0.7)];
    let inputs = (0u32..4, size(-1.5, 0.7), 1u32..5, momentum(), size(-1.0, 0.5), size(-1.5, 1.5), distance);
    let result = TestRunner::new(config).run(&inputs, |(kind, a, n, k, m, t, d)| {
        let (piecewise, waves) = match kind {
            0 => (PiecewisePacket::cosine(&a, n), WavePacket::cosine(&a, n, &Rational::new())),
            1 => (PiecewisePacket::uniform_ball(&a), WavePacket::ball(&a)),
            2 => (
                PiecewisePacket::bspline(&a, n).and_then(|packet| packet.with_momentum(&k)),
                WavePacket::bspline(&a, n, &k),
            ),
            _ => {
                let knots = vec![Rational::new(), a.clone(), Rational::from(&a * 2)];
                let pieces = vec![vec![q(1, 1), k.clone()], vec![k, q(-1, 3), q(2, 1)]];
                let exact = |piece: &Vec<Rational>| piece.iter().cloned().map(ExactComplex::from).collect();
                let list: Vec<Polynomial> = pieces.iter().map(exact).collect();
                (PiecewisePacket::real(knots.clone(), pieces), WavePacket::piecewise(knots, &list))
            }
        };
        let kernel = PiecewiseKernel::new(&piecewise.unwrap(), &m, &t, &d, Sides::Both).unwrap();
        let spectral = CutTail::new(&waves.unwrap(), &m, &t, &d, CutSide::Both).unwrap();
        let found = spectral.evaluate(18, &Effort::default()).unwrap().interval;
        prop_assert!(found.has_relative_digits(18));
        // The kernel route declines what would cost it too much.
        if let Ok(other) = kernel.evaluate(18, &Effort::default()) {
            prop_assert!(found.intersection(&other.interval).is_some(), "{found:?} {other:?}");
        }
        Ok(())
    });
    result.unwrap();
}

/// The spline in closed form, at rest.
#[test]
fn closed_splines_are_contained() {
    let mut runner = TestRunner::new(ProptestConfig {
        cases: CASES,
        rng_seed: RngSeed::Fixed(32),
        failure_persistence: None,
        ..ProptestConfig::default()
    });
    let mass = prop_oneof![3 => size(-1.5, 1.0), 1 => Just(Rational::new())];
    let distance = prop_oneof![1 => Just(Rational::new()), 1 => size(-3.0, 1.0)];
    let inputs = (size(-2.0, 1.0), 1u32..20, mass, size(-2.0, 2.0), distance);
    let result = runner.run(&inputs, |(a, order, m, t, d)| {
        let packet = BSplinePacket::new(&a, order).unwrap();
        let tail = CutTail::new(&packet, &m, &t, &d, CutSide::Both).unwrap();
        let [coarse, fine] = [10, 40].map(|digits| tail.evaluate(digits, &Effort::default()).unwrap().interval);
        prop_assert!(coarse.has_relative_digits(10) && fine.has_relative_digits(40));
        prop_assert!(coarse.contains(&fine), "{coarse:?} {fine:?}");
        Ok(())
    });
    result.unwrap();
}
