//! The kernel route for packets of polynomial pieces, against values from outside and against identities.
//!
//! `references/packets_from_definition.json` comes from `tests/oracles/packets_from_definition.py`, which starts at
//! the definition of the evolution and shares no formula with the program; `references/check-values.json` names its
//! methods value by value.

#![allow(clippy::unwrap_used, clippy::panic, reason = "helpers of tests fail loudly")]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::piecewise::{ExactComplex, PiecewisePacket};
use coneproof::routes::panels::{PiecewiseKernel, Sides};
use coneproof::routes::{Effort, Evaluation, Route, TailProblem, kernel::KERNEL};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Integer, Rational, ops::Pow};
use serde_json::Value;

fn number(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn q(n: i64, d: i64) -> Rational {
    Rational::from((n, d))
}

/// An enclosure with the digits asked, raising the goal as the quantities do.
fn tail_of(kernel: &PiecewiseKernel, digits: u32) -> Interval {
    let mut goal = digits;
    for _ in 0..4 {
        let found = kernel.evaluate(goal, &Effort::default()).unwrap().interval;
        let reached = found.relative_digits(digits);
        if reached >= digits {
            return found;
        }
        goal += digits - reached + 3;
    }
    panic!("not {digits} digits");
}

fn tail(packet: &PiecewisePacket, mass: &str, time: &str, distance: &str, digits: u32) -> Interval {
    let kernel = PiecewiseKernel::new(packet, &number(mass), &number(time), &number(distance), Sides::Both).unwrap();
    tail_of(&kernel, digits)
}

/// All numbers that round, or are cut, to the decimal.
fn decimal_range(decimal: &str) -> (Rational, Rational) {
    let value = number(decimal);
    let (mantissa, exponent) = decimal.split_once('e').unwrap_or((decimal, "0"));
    let places = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len() as i32);
    let power = exponent.parse::<i32>().unwrap() - places;
    let unit = Rational::from(Integer::from(10).pow(power.unsigned_abs()));
    let unit = if power < 0 { unit.recip() } else { unit };
    (&value - Rational::from(&unit / 2), value + unit)
}

fn meets(interval: &Interval, (low, high): &(Rational, Rational)) -> bool {
    *interval.upper() >= *low && *interval.lower() <= *high
}

fn values(file: &str) -> Vec<Value> {
    let all: Value = serde_json::from_str(&std::fs::read_to_string(file).unwrap()).unwrap();
    all["values"].as_array().unwrap().clone()
}

fn pieces_of(value: &Value) -> Vec<Vec<ExactComplex>> {
    let list = |value: &Value| value.as_array().unwrap().clone();
    let coefficient =
        |pair: &Value| ExactComplex::new(number(pair[0].as_str().unwrap()), number(pair[1].as_str().unwrap()));
    list(value).iter().map(|piece| list(piece).iter().map(coefficient).collect()).collect()
}

#[test]
fn values_from_the_definition() {
    let all = values("references/packets_from_definition.json");
    assert!(all.len() >= 9);
    for value in &all {
        let knots: Vec<Rational> =
            value["knots"].as_array().unwrap().iter().map(|k| number(k.as_str().unwrap())).collect();
        let pieces = pieces_of(&value["pieces"]);
        let packet = if value["radial"] == Value::Bool(true) {
            PiecewisePacket::radial(knots, pieces).unwrap()
        } else if let Some(mode) = value["mode"].as_u64() {
            PiecewisePacket::cosine(knots.last().unwrap(), mode as u32).unwrap()
        } else {
            let packet = PiecewisePacket::complex(knots, pieces).unwrap();
            packet.with_momentum(&value["momentum"].as_str().map_or_else(Rational::new, number)).unwrap()
        };
        let text = |key: &str| value[key].as_str().unwrap();
        let digits = value["digits"].as_u64().unwrap() as u32 + 2;
        let found = tail(&packet, text("mass"), text("time"), text("distance"), digits);
        assert!(meets(&found, &decimal_range(text("value"))), "{value}: {found:?}");
    }
}

#[test]
fn values_computed_elsewhere() {
    let mut seen = 0;
    for value in values("references/check-values.json") {
        let text = |key: &str| value["params"][key].as_str().unwrap();
        let id = value["id"].as_str().unwrap();
        let Some(family) = id.split('_').next().filter(|name| ["B", "C", "D+", "D-"].contains(name)) else { continue };
        let a = number(text("a"));
        let (packet, sides) = match family {
            "B" => (PiecewisePacket::uniform_ball(&a), Sides::Both),
            "C" => (PiecewisePacket::cosine(&a, 1), Sides::Both),
            other => {
                let packet = PiecewisePacket::uniform(&a).unwrap().with_momentum(&number(text("k")));
                (packet, if other == "D+" { Sides::Right } else { Sides::Left })
            }
        };
        let kernel =
            PiecewiseKernel::new(&packet.unwrap(), &number(text("m")), &number(text("t")), &q(0, 1), sides).unwrap();
        let decimals = value["digits_agreed_by_two_methods"].as_u64().unwrap() as usize;
        let (mantissa, exponent) = {
            let text = value["value"].as_str().unwrap();
            text.split_once('e').map_or((text, String::new()), |(m, e)| (m, format!("e{e}")))
        };
        let shown = format!("{}{exponent}", &mantissa[..mantissa.len().min(2 + decimals)]);
        let found = tail_of(&kernel, 32);
        assert!(meets(&found, &decimal_range(&shown)), "{id}: {found:?}");
        seen += 1;
    }
    assert_eq!(seen, 12);
}

/// The hard-wall ground state against its Taylor polynomial: evolution and restriction to a region do not increase
/// distances, so that the roots of the probabilities differ by at most the distance of the normalised packets.
#[test]
fn cosine_is_near_its_polynomial() {
    // cos(pi x/2) with pi rounded to 20 decimals and the series cut at x^18; on |x| <= 1 the first term left out is
    // below 4e-15.
    let b = number("1.57079632679489661923");
    let mut coefficients = Vec::new();
    let mut term = q(1, 1);
    for n in 0..19u32 {
        coefficients.push(if n % 2 == 0 { term.clone() } else { q(0, 1) });
        if n % 2 == 1 {
            term = -term;
        }
        term = term * &b / (n + 1);
    }
    // The pieces begin at their left knot, so take the two halves: x from 0 to 1, and its mirror image in powers of x
    // + 1.
    let right: Vec<Rational> = coefficients.clone();
    let mut left = coefficients;
    for start in 0..left.len() {
        for n in (start..left.len() - 1).rev() {
            let next = left[n + 1].clone();
            left[n] -= next;
        }
    }
    let polynomial = PiecewisePacket::real(vec![q(-1, 1), q(0, 1), q(1, 1)], vec![left, right]).unwrap();
    let cosine = PiecewisePacket::cosine(&q(1, 1), 1).unwrap();
    let root = |packet: &PiecewisePacket| tail(packet, "1", "1", "0", 20).lower().clone().sqrt();
    let difference = (root(&polynomial) - root(&cosine)).abs();
    assert!(difference < 1e-13, "{difference}");
    assert!(difference > 1e-19, "the two packets should not be the same");
}

fn log_uniform(low: f64, high: f64) -> impl Strategy<Value = Rational> {
    (low..high).prop_map(|power| {
        // Few digits, so that inputs are the sort that people write.
        let value = 10f64.powf(power);
        let scale = 10f64.powf(power.floor() - 2.0);
        Rational::from_f64((value / scale).round()).unwrap() * Rational::from_f64(scale).unwrap()
    })
}

fn small_fraction() -> impl Strategy<Value = Rational> {
    (-9i64..10, 1i64..8).prop_map(|(n, d)| Rational::from((n, d)))
}

/// Random packets of every kind, of the given half-width at most.
fn packet() -> impl Strategy<Value = PiecewisePacket> {
    let scaled = (
        log_uniform(-3.0, 1.5),
        prop::collection::vec((1u32..9, prop::collection::vec((small_fraction(), small_fraction()), 1..4)), 1..5),
        prop::option::of(small_fraction()),
    )
        .prop_filter_map("zero packet", |(unit, pieces, momentum)| {
            let mut knots = vec![q(0, 1)];
            let mut list = Vec::new();
            for (length, piece) in pieces {
                let next = Rational::from(&unit * length) / 4 + knots.last().unwrap();
                knots.push(next);
                list.push(
                    piece
                        .into_iter()
                        .enumerate()
                        .map(|(n, (re, im))| ExactComplex::new(re, im).times(&Rational::from((&unit).pow(-(n as i32)))))
                        .collect(),
                );
            }
            let packet = PiecewisePacket::complex(knots, list).ok()?;
            packet.with_momentum(&(momentum.unwrap_or_default() / unit)).ok()
        });
    prop_oneof![
        2 => scaled,
        1 => (log_uniform(-4.0, 1.5), 1u32..7).prop_map(|(a, order)| PiecewisePacket::bspline(&a, order).unwrap()),
        1 => log_uniform(-4.0, 1.5).prop_map(|a| PiecewisePacket::uniform_ball(&a).unwrap()),
        1 => (log_uniform(-3.0, 1.0), 1u32..5).prop_map(|(a, mode)| PiecewisePacket::cosine(&a, mode).unwrap()),
    ]
}

fn distance() -> impl Strategy<Value = Rational> {
    prop_oneof![Just(q(0, 1)), log_uniform(-4.0, 1.3)]
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 300, rng_seed: RngSeed::Fixed(41), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// A coarse enclosure contains a fine one.
    #[test]
    fn coarse_contains_fine(packet in packet(), t in log_uniform(-3.0, 3.0), d in distance(), coarse in 1u32..12) {
        let kernel = PiecewiseKernel::new(&packet, &q(1, 1), &t, &d, Sides::Both).unwrap();
        let wide = kernel.evaluate(coarse, &Effort::default()).unwrap().interval;
        let fine = kernel.evaluate(40, &Effort::default()).unwrap().interval;
        prop_assert!(fine.has_relative_digits(25), "{packet:?} {t} {d}: {fine:?}");
        prop_assert!(wide.contains(&fine), "{packet:?} {t} {d} {coarse}: {wide:?} without {fine:?}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 100, rng_seed: RngSeed::Fixed(43), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// The spline of order 1, and any cut of a constant into pieces, is the box of the other code.
    #[test]
    fn order_one_is_the_box(
        a in log_uniform(-5.0, 3.0), t in log_uniform(-5.0, 3.0), d in distance(), cut in -9i64..10, digits in 5u32..35
    ) {
        let problem = TailProblem { half_width: a.clone(), time: t.clone(), distance: d.clone(), massless: false };
        let known = KERNEL.evaluate(&problem, digits, &Effort::default()).unwrap().interval;
        let spline = PiecewisePacket::bspline(&a, 1).unwrap();
        let middle = Rational::from(&a * cut) / 10;
        let constant = ExactComplex::new(q(3, 7), q(-2, 5));
        let halves = PiecewisePacket::complex(
            vec![Rational::from(-&a), middle, a.clone()], vec![vec![constant.clone()], vec![constant]]
        ).unwrap();
        for packet in [spline, halves] {
            let kernel = PiecewiseKernel::new(&packet, &q(1, 1), &t, &d, Sides::Both).unwrap();
            let found = kernel.evaluate(digits, &Effort::default()).unwrap().interval;
            prop_assert!(found.intersection(&known).is_some(), "{a} {t} {d}: {found:?} and {known:?}");
            prop_assert!(found.relative_digits(digits) + 2 >= digits, "{a} {t} {d} {digits}: {found:?}");
        }
    }

    /// Only ratios matter; the place, the sign of the time and a common factor do not; sides add up and change places
    /// when the packet is reflected.
    #[test]
    fn symmetries(packet in packet(), t in log_uniform(-2.0, 2.0), unit in log_uniform(-2.0, 2.0), shift in small_fraction()) {
        let one = q(1, 1);
        let none = q(0, 1);
        let of = |packet: &PiecewisePacket, mass: &Rational, time: &Rational, sides: Sides| {
            let kernel = PiecewiseKernel::new(packet, mass, time, &none, sides).unwrap();
            kernel.evaluate(12, &Effort::default()).unwrap().interval
        };
        let both = of(&packet, &one, &t, Sides::Both);
        prop_assert_eq!(&both, &of(&packet, &one, &Rational::from(-&t), Sides::Both));
        let (left, right) = (of(&packet, &one, &t, Sides::Left), of(&packet, &one, &t, Sides::Right));
        let sum = Interval::new(left.lower().clone() + right.lower(), left.upper().clone() + right.upper());
        prop_assert!(sum.intersection(&both).is_some());
        if let coneproof::packets::piecewise::Carrier::Standing(_) = packet.carrier() {
            return Ok(());
        }
        let momentum = match packet.carrier() {
            coneproof::packets::piecewise::Carrier::Travelling(k) => k.clone(),
            _ => none.clone(),
        };
        // Coefficients of the scaled and shifted packet, with a common factor of 2 - i.
        let knots: Vec<Rational> = packet.knots().iter().map(|k| Rational::from(k * &unit) + &shift).collect();
        let pieces = packet.pieces().iter().map(|piece| {
            piece.iter().enumerate().map(|(n, c)| {
                let c = ExactComplex::new(Rational::from(&c.re * 2) + &c.im, Rational::from(&c.im * 2) - &c.re);
                c.times(&Rational::from((&unit).pow(-(n as i32))))
            }).collect()
        }).collect();
        let scaled = PiecewisePacket::complex(knots, pieces).unwrap()
            .with_momentum(&Rational::from(&momentum / &unit)).unwrap();
        let found = of(&scaled, &Rational::from(unit.recip_ref()), &Rational::from(&t * &unit), Sides::Both);
        prop_assert!(found.intersection(&both).is_some(), "{:?} and {:?}", found, both);
    }
}

/// Reflection by hand: psi0(-x) has its right tail where psi0 has its left one.
#[test]
fn sides_change_places() {
    let knots = vec![q(0, 1), q(1, 1), q(3, 1)];
    let packet = PiecewisePacket::real(knots, vec![vec![q(1, 1), q(2, 1)], vec![q(-1, 1)]]).unwrap();
    let mirrored =
        PiecewisePacket::real(vec![q(-3, 1), q(-1, 1), q(0, 1)], vec![vec![q(-1, 1)], vec![q(3, 1), q(-2, 1)]])
            .unwrap();
    for momentum in [q(0, 1), q(7, 3)] {
        let of = |packet: &PiecewisePacket, momentum: &Rational, sides| {
            let packet = packet.clone().with_momentum(momentum).unwrap();
            let kernel = PiecewiseKernel::new(&packet, &q(1, 1), &q(2, 1), &q(0, 1), sides).unwrap();
            tail_of(&kernel, 25)
        };
        let left = of(&packet, &momentum, Sides::Left);
        let right = of(&packet, &momentum, Sides::Right);
        let turned = Rational::from(-&momentum);
        assert!(left.intersection(&of(&mirrored, &turned, Sides::Right)).is_some());
        assert!(right.intersection(&of(&mirrored, &turned, Sides::Left)).is_some());
        assert!(left.intersection(&right).is_none(), "the packet is lopsided");
    }
}

#[test]
fn impossible_problems_are_refused() {
    let packet = PiecewisePacket::bspline(&q(1, 1), 2).unwrap();
    let of = |mass, time, distance| PiecewiseKernel::new(&packet, &mass, &time, &distance, Sides::Both);
    assert!(of(q(0, 1), q(1, 1), q(0, 1)).is_err());
    assert!(of(q(-1, 1), q(1, 1), q(0, 1)).is_err());
    assert!(of(q(1, 1), q(1, 1), q(-1, 1)).is_err());
    let still = of(q(1, 1), q(0, 1), q(0, 1)).unwrap().evaluate(15, &Effort::default()).unwrap().interval;
    assert!(*still.upper() == 0);
}

/// Two hundred digits, a carrier, and a tail far below any double.
#[test]
fn far_ranges() {
    let ball = PiecewisePacket::uniform_ball(&q(1, 3)).unwrap();
    assert!(tail(&ball, "1", "7/5", "0", 200).has_relative_digits(200));
    let moving = PiecewisePacket::bspline(&q(2, 1), 3).unwrap().with_momentum(&q(20, 1)).unwrap();
    assert!(tail(&moving, "1", "1", "1/10", 60).has_relative_digits(60));
    let found = tail(&moving, "1", "1", "5000", 15);
    assert!((-15_000..-14_000).contains(&found.lower().get_exp().unwrap()), "{found:?}");
}
