//! Propagators against values from the definition, and against the identities that they obey.
//!
//! `references/propagator_from_definition.json` comes from `tests/oracles/points_from_definition.py`: momentum integrals
//! on rotated paths, which share no formula with the program.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::quantities::pointwise::Rectangle;
use coneproof::quantities::propagator::{Dimension, PropagatorRequest};
use coneproof::quantities::tail::Status;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Integer, Rational};
use serde_json::Value;

const DIMENSIONS: [Dimension; 3] = [Dimension::One, Dimension::Two, Dimension::Three];

fn exact(value: &Rational) -> ExactInput {
    ExactInput::from_rational(value.clone())
}

fn read(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

/// The value, with the digits asked reached and both routes present unless the mass is zero.
fn value(dimension: Dimension, mass: &Rational, time: &Rational, x: &Rational, digits: u32) -> Rectangle {
    let mut request = PropagatorRequest::new(dimension, exact(mass), exact(time), vec![exact(x)]).unwrap();
    request.digits = digits;
    let result = request.certify().unwrap();
    let point = &result.points[0];
    assert_eq!(point.status, Status::Certified, "{request:?}: {point:?}");
    if *time != 0 && *mass != 0 {
        assert!(point.routes.len() == 2 && point.routes.iter().all(|route| route.amplitude.is_some()), "{point:?}");
    }
    point.value.clone()
}

/// All numbers that round to `mantissa e exponent`: half a unit to either side.
fn rounding_range(text: &str) -> (Rational, Rational) {
    let (mantissa, exponent) = text.split_once('e').unwrap();
    let unit = read(&format!("1e{exponent}"));
    let middle = Rational::from(mantissa.parse::<Integer>().unwrap()) * &unit;
    ((&middle - Rational::from(&unit / 2)), middle + unit / 2)
}

fn meets(interval: &Interval, (low, high): &(Rational, Rational)) -> bool {
    *interval.upper() >= *low && *interval.lower() <= *high
}

fn contains(wide: &Rectangle, narrow: &Rectangle) -> bool {
    wide.real.contains(&narrow.real) && wide.imaginary.contains(&narrow.imaginary)
}

fn overlap(left: &Rectangle, right: &Rectangle) -> bool {
    left.real.intersection(&right.real).is_some() && left.imaginary.intersection(&right.imaginary).is_some()
}

fn times(interval: &Interval, factor: &Rational) -> (Rational, Rational) {
    let ends = [interval.lower(), interval.upper()].map(|end| end.to_rational().unwrap() * factor);
    let [low, high] = ends;
    if low <= high { (low, high) } else { (high, low) }
}

#[test]
fn values_from_the_definition() {
    let text = std::fs::read_to_string("references/propagator_from_definition.json").unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    let values = all["values"].as_array().unwrap();
    assert!(values.len() >= 30);
    for known in values {
        let field = |key: &str| known[key].as_str().unwrap();
        let dimension = DIMENSIONS[known["dimension"].as_u64().unwrap() as usize - 1];
        assert!(known["digits"].as_u64().unwrap() >= 25, "{known}");
        let found = value(dimension, &read(field("mass")), &read(field("time")), &read(field("x")), 34);
        assert!(meets(&found.real, &rounding_range(field("real"))), "{known}: {found:?}");
        assert!(meets(&found.imaginary, &rounding_range(field("imaginary"))), "{known}: {found:?}");
    }
}

/// Massless closed forms, exact fractions of powers of pi.
#[test]
fn massless_values_are_exact() {
    let pi = coneproof::functions::elementary::pi(200).to_interval(200);
    let one = value(Dimension::One, &Rational::new(), &Rational::from(2), &Rational::from(1), 20);
    // (i t/pi)/(x^2 - t^2) = -2i/(3 pi).
    let product = |bound: &rug::Float, end: &rug::Float| bound.to_rational().unwrap() * end.to_rational().unwrap();
    let expected = Rational::from((-2, 3));
    assert!(
        product(one.imaginary.lower(), pi.upper()) <= expected
            && product(one.imaginary.upper(), pi.lower()) >= expected
    );
    assert!(*one.real.lower() == 0 && *one.real.upper() == 0);
    // d = 2 is real inside the cone and imaginary outside, -t/(2 pi u^3) and t/(2 pi s^3) i.
    let inside = value(Dimension::Two, &Rational::new(), &Rational::from(5), &Rational::from(3), 20);
    let product_inside = product(inside.real.lower(), pi.lower());
    assert!((product_inside - Rational::from((-5, 128))).abs() < Rational::from((1, 1u64 << 60)));
    assert!(*inside.imaginary.upper() == 0);
    let outside = value(Dimension::Two, &Rational::new(), &Rational::from(3), &Rational::from(5), 20);
    assert!(*outside.real.upper() == 0 && *outside.imaginary.lower() > 0);
}

/// A small mass tends to the closed forms of mass zero, from either side of the cone.
#[test]
fn small_masses_approach_mass_zero() {
    for dimension in DIMENSIONS {
        for (t, x) in [(2, 1), (1, 2)] {
            let (t, x) = (Rational::from(t), Rational::from(x));
            let light = value(dimension, &Rational::from((1, 1_000_000_000_000u64)), &t, &x, 30);
            let none = value(dimension, &Rational::new(), &t, &x, 30);
            for (one, other) in [(&light.real, &none.real), (&light.imaginary, &none.imaginary)] {
                let gap = one.lower().to_rational().unwrap() - other.upper().to_rational().unwrap();
                assert!(gap.abs() < Rational::from((1, 10_000_000_000u64)), "{dimension:?} {t} {x}");
            }
        }
    }
}

#[test]
fn refusals_name_the_field() {
    let make = |dimension, mass: &str, time: &str, at: &str| {
        PropagatorRequest::new(dimension, mass.parse().unwrap(), time.parse().unwrap(), vec![at.parse().unwrap()])
            .map(|_| ())
            .map_err(|error| error.to_string())
    };
    let singular = make(Dimension::One, "1", "-3/2", "1.5").unwrap_err();
    assert!(singular.starts_with("at:") && singular.contains("singular"), "{singular}");
    assert!(make(Dimension::One, "1", "0", "0").unwrap_err().contains("singular"));
    assert!(make(Dimension::Three, "1", "1", "-2").unwrap_err().starts_with("at:"));
    assert!(make(Dimension::Three, "-1", "1", "2").unwrap_err().starts_with("mass:"));
    assert!(make(Dimension::Three, "1", "[1,2]", "3").unwrap_err().starts_with("time:"));
}

/// At time zero the propagator is the delta function.
#[test]
fn nothing_away_from_the_source_at_time_zero() {
    let found = value(Dimension::Two, &Rational::from(1), &Rational::new(), &Rational::from(3), 15);
    assert!(*found.real.upper() == 0 && *found.imaginary.lower() == 0 && *found.imaginary.upper() == 0);
}

fn fraction(low: f64, high: f64) -> impl Strategy<Value = Rational> {
    (low..high).prop_map(|power| Rational::from_f64(10f64.powf(power)).unwrap())
}

/// `x = t (1 + s)` with `s` from `-1` to far outside, also near the light cone.
fn position() -> impl Strategy<Value = f64> {
    prop_oneof![(-9.0..-0.01f64).prop_map(|p| -10f64.powf(p)), (-9.0..2.0f64).prop_map(|p| 10f64.powf(p)), -1.0..1.0f64]
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 400, rng_seed: RngSeed::Fixed(11), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// Both routes meet (else the request fails), few digits contain many, signs and units do what they must.
    #[test]
    fn routes_meet_and_symmetries_hold(
        which in 0usize..3, mass in fraction(-3.0, 1.5), t in fraction(-2.0, 2.0), s in position(), unit in fraction(-3.0, 3.0)
    ) {
        let dimension = DIMENSIONS[which];
        let x = &t * (Rational::from_f64(s).unwrap() + 1u32);
        prop_assume!(x != t && Rational::from(&mass * &x) < 3000u32);
        let coarse = value(dimension, &mass, &t, &x, 10);
        let fine = value(dimension, &mass, &t, &x, 40);
        prop_assert!(contains(&coarse, &fine), "{:?} {:?}", coarse, fine);
        let reversed = value(dimension, &mass, &Rational::from(-&t), &x, 10);
        prop_assert_eq!(&reversed, &coarse.conjugate());
        if dimension == Dimension::One {
            prop_assert_eq!(&value(dimension, &mass, &t, &Rational::from(-&x), 10), &coarse);
        }
        // G has the dimension of length^-d.
        let (long, late) = (Rational::from(&x * &unit), Rational::from(&t * &unit));
        let scaled = value(dimension, &(mass / &unit), &late, &long, 12);
        let mut power = Rational::from(1);
        for _ in 0..dimension.number() {
            power *= &unit;
        }
        for (one, other) in [(&scaled.real, &coarse.real), (&scaled.imaginary, &coarse.imaginary)] {
            prop_assert!(meets(other, &times(one, &power)), "{:?} {:?}", one, other);
        }
        prop_assert!(overlap(&coarse, &fine));
    }
}

/// The command: both parts with bounds as strings; a refusal on the light cone.
#[test]
fn command_line() {
    let run = |line: &str| {
        let (mut out, mut err) = (Vec::new(), Vec::new());
        let code = coneproof::command::run(line.split(' '), &mut out, &mut err);
        (code, String::from_utf8(out).unwrap(), String::from_utf8(err).unwrap())
    };
    let (code, out, _) = run("coneproof propagator --dimension 3 --time 1 --at 2 --format json");
    assert_eq!(code, 0);
    let answer: Value = serde_json::from_str(&out).unwrap();
    let point = &answer["points"][0];
    assert_eq!(point["real"]["lower"], "0");
    assert!(point["imaginary"]["lower"].as_str().unwrap().starts_with("0.0065903146"));
    let refused = [
        ("coneproof propagator --dimension 3 --time 1 --at 1", "singular"),
        ("coneproof propagator --dimension 4 --time 1 --at 2", "dimension: \"4\""),
        ("coneproof propagator --time 1 --at 2", "dimension is missing"),
        ("coneproof propagator --dimension 2 --time 1 --at -2", "at: \"-2\""),
    ];
    for (line, sentence) in refused {
        let (code, _, err) = run(line);
        assert!(code == 2 && err.contains(sentence) && err.lines().count() == 1, "{line}: {err}");
    }
}
