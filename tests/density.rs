//! Densities of the box against values from the definition, and against the identities that they obey.
//!
//! `references/density_from_definition.json` comes from `tests/oracles/points_from_definition.py`: momentum integrals
//! on rotated paths, which share no formula with the program. `references/check-values.json` names its methods.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::BoxPacket;
use coneproof::quantities::density::{DensityRequest, Known, PointValue};
use coneproof::quantities::tail::Status;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Integer, Rational};
use serde_json::Value;

fn exact(value: &Rational) -> ExactInput {
    ExactInput::from_rational(value.clone())
}

fn read(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn answer(a: &Rational, mass: &Rational, t: &Rational, x: &Rational, digits: u32, amplitude: bool) -> PointValue {
    let packet = BoxPacket::new(exact(a)).unwrap();
    let mut request = DensityRequest::new(packet, exact(mass), exact(t), vec![exact(x)]).unwrap();
    request.digits = digits;
    request.amplitude = amplitude;
    request.certify().unwrap().points[0].value.clone()
}

fn known(a: &Rational, mass: &Rational, t: &Rational, x: &Rational, digits: u32, amplitude: bool) -> Known {
    match answer(a, mass, t, x, digits, amplitude) {
        PointValue::Known(known) => {
            assert_eq!(known.status, Status::Certified, "a {a} m {mass} t {t} x {x}: {known:?}");
            *known
        }
        other => panic!("{other:?}"),
    }
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

#[test]
fn values_from_the_definition() {
    let text = std::fs::read_to_string("references/density_from_definition.json").unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    let values = all["values"].as_array().unwrap();
    assert!(values.len() >= 19);
    for value in values {
        let field = |key: &str| value[key].as_str().unwrap();
        assert!(value["digits"].as_u64().unwrap() >= 25, "{value}");
        let [a, m, t, x] = ["half_width", "mass", "time", "x"].map(|key| read(field(key)));
        let found = known(&a, &m, &t, &x, 34, true);
        assert!(found.routes.iter().all(|route| route.amplitude.is_some()));
        assert_eq!(found.routes.len(), if m == 0 { 1 } else { 2 });
        assert!(meets(&found.amplitude.real, &rounding_range(field("real"))), "{value}: {found:?}");
        assert!(meets(&found.amplitude.imaginary, &rounding_range(field("imaginary"))), "{value}: {found:?}");
        assert!(meets(&found.density, &rounding_range(field("square"))), "{value}: {found:?}");
    }
}

#[test]
fn values_computed_elsewhere() {
    let text = std::fs::read_to_string("references/check-values.json").unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    let values = all["values"].as_array().unwrap();
    let densities: Vec<&Value> = values.iter().filter(|v| v["quantity"] == "|psi(x,t)|^2 box 1D").collect();
    assert!(densities.len() >= 5);
    for value in densities {
        let [a, m, t, x] = ["a", "m", "t", "x"].map(|key| read(value["params"][key].as_str().unwrap()));
        let found = known(&a, &m, &t, &x, 36, false);
        let middle = read(value["value"].as_str().unwrap());
        let digits = value["digits_agreed_by_two_methods"].as_u64().unwrap();
        let slack = &middle * read(&format!("1e-{}", digits - 1));
        let range = (Rational::from(&middle - &slack), Rational::from(&middle + &slack));
        assert!(meets(&found.density, &range), "{value}: {found:?}");
    }
}

/// At time zero: the packet; at its jumps no single value.
#[test]
fn release() {
    let (zero, one) = (Rational::new(), Rational::from(1));
    let inside = known(&Rational::from((3, 2)), &one, &zero, &Rational::from(-1), 15, true);
    assert!(inside.density.contains_rational(&Rational::from((1, 3))));
    let outside = known(&one, &zero, &zero, &Rational::from(2), 15, true);
    assert!(*outside.density.upper() == 0 && *outside.amplitude.real.upper() == 0);
    assert!(matches!(answer(&one, &one, &zero, &Rational::from(-1), 15, false), PointValue::Jump));
}

/// On the light cones of the edges the answer is a word, also where two of them meet.
#[test]
fn logarithmic_edges() {
    let at = |a: &str, m: &str, t: &str, x: &str| answer(&read(a), &read(m), &read(t), &read(x), 15, false);
    for x in ["6", "-6", "4", "-4", "4.0"] {
        for (mass, t) in [("1", "5"), ("0", "-5")] {
            assert!(matches!(at("1", mass, t, x), PointValue::Unbounded), "{x}");
        }
    }
    assert!(matches!(at("1", "1", "1", "0"), PointValue::Unbounded));
    assert!(matches!(at("1/3", "1", "1/7", "10/21"), PointValue::Unbounded));
    // Beside the edge the density grows without a bound, with the square of a logarithm.
    let beside = |power: i32| {
        known(&read("1"), &read("1"), &read("5"), &read(&format!("4.{:0>1$}", 1, power as usize)), 15, false)
    };
    let (near, nearer, nearest) = (beside(10), beside(20), beside(40));
    assert!(nearer.density.lower() > near.density.upper() && nearest.density.lower() > nearer.density.upper());
}

/// Early: `psi(x, t) -> psi0(x)`.
#[test]
fn early_times_show_the_packet() {
    let t = Rational::from((1, 1_000_000_000));
    let one = Rational::from(1);
    let inside = known(&one, &one, &t, &Rational::from((1, 3)), 15, true);
    let gap = inside.density.lower().to_rational().unwrap() - Rational::from((1, 2));
    assert!(gap.abs() < Rational::from((1, 100_000_000)));
    let outside = known(&one, &one, &t, &Rational::from(2), 15, true);
    assert!(*outside.density.upper() < 1e-17);
}

#[test]
fn refusals_name_the_field() {
    let make = |a: &str, m: &str, t: &str, at: &[&str]| {
        let points = at.iter().map(|text| text.parse().unwrap()).collect();
        let packet = BoxPacket::new(a.parse().unwrap()).unwrap();
        DensityRequest::new(packet, m.parse().unwrap(), t.parse().unwrap(), points)
            .map(|_| ())
            .map_err(|error| error.to_string())
    };
    assert!(make("1", "-1", "1", &["0"]).unwrap_err().starts_with("mass:"));
    assert!(make("1", "1", "[1, 2]", &["0"]).unwrap_err().starts_with("time:"));
    assert!(make("[1, 2]", "1", "1", &["0"]).unwrap_err().starts_with("half-width:"));
    assert!(make("1", "1", "1", &["[0, 1]"]).unwrap_err().starts_with("at:"));
    assert!(make("1", "1", "1", &[]).unwrap_err().starts_with("at is missing"));
}

fn fraction(low: f64, high: f64) -> impl Strategy<Value = Rational> {
    (low..high).prop_map(|power| Rational::from_f64(10f64.powf(power)).unwrap())
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 500, rng_seed: RngSeed::Fixed(23), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// Both routes meet (else the request fails), few digits contain many, signs and units do what they must.
    #[test]
    fn routes_meet_and_symmetries_hold(
        a in fraction(-2.0, 1.5), t in fraction(-2.0, 1.5), place in 0.0..2.5f64, unit in fraction(-3.0, 3.0),
        beside in prop::option::of((-12.0..-1.0f64, any::<bool>(), any::<bool>())), massless in any::<bool>()
    ) {
        let mass = Rational::from(u32::from(!massless));
        // Anywhere up to two and a half times the cone, or beside an edge's light cone.
        let mut x = Rational::from(&a + &t) * Rational::from_f64(place).unwrap();
        if let Some((power, outer, left)) = beside {
            let gap = &t * Rational::from_f64(10f64.powf(power)).unwrap();
            x = if outer { Rational::from(&a + &t) } else { Rational::from(&t - &a) };
            if left { x -= gap } else { x += gap }
        }
        prop_assume!(x != 0u32);
        let coarse = known(&a, &mass, &t, &x, 10, false);
        let fine = known(&a, &mass, &t, &x, 40, false);
        prop_assert_eq!(coarse.routes.iter().filter(|route| route.density.is_some()).count(), if massless { 1 } else { 2 });
        prop_assert!(coarse.density.contains(&fine.density), "{:?} {:?}", coarse, fine);
        prop_assert!(coarse.amplitude.real.contains(&fine.amplitude.real));
        let mirrored = known(&a, &mass, &t, &Rational::from(-&x), 10, false);
        prop_assert_eq!(&mirrored.amplitude, &coarse.amplitude);
        let reversed = known(&a, &mass, &Rational::from(-&t), &x, 10, false);
        prop_assert_eq!(&reversed.density, &coarse.density);
        prop_assert_eq!(&reversed.amplitude, &coarse.amplitude.conjugate());
        let [long, late, far] = [&a, &t, &x].map(|value| Rational::from(value * &unit));
        let scaled = known(&long, &(mass / &unit), &late, &far, 12, false);
        let back = |end: &rug::Float| end.to_rational().unwrap() * &unit;
        prop_assert!(meets(&coarse.density, &(back(scaled.density.lower()), back(scaled.density.upper()))));
    }

    /// The propagator integrated over the box: a midpoint rule far outside the cone, where the integrand is smooth.
    #[test]
    fn far_outside_the_density_is_that_of_the_propagator(t in fraction(-1.0, 0.5), x in 4.0..9.0f64) {
        use coneproof::quantities::propagator::{Dimension, PropagatorRequest};
        const PARTS: i64 = 40;
        let (a, one) = (Rational::from((1, 4)), Rational::from(1));
        let x = Rational::from_f64(x).unwrap();
        prop_assume!(Rational::from(&x - &t) > 1u32);
        let points: Vec<ExactInput> =
            (0..PARTS).map(|k| exact(&(&x + Rational::from((2 * k + 1 - PARTS, 4 * PARTS))))).collect();
        let request = PropagatorRequest::new(Dimension::One, exact(&one), exact(&t), points).unwrap();
        let mean: f64 = request.certify().unwrap().points.iter().map(|p| p.value.imaginary.lower().to_f64()).sum::<f64>()
            / PARTS as f64;
        // psi = sqrt(2a) times the mean over the box.
        let found = known(&a, &one, &t, &x, 15, true);
        let imaginary = found.amplitude.imaginary.lower().to_f64();
        prop_assert!((mean * 0.5f64.sqrt() / imaginary - 1.0).abs() < 2e-3, "{} {}", mean, imaginary);
    }
}

/// The command: exact positions back as read, bounds as strings, words where there is no number.
#[test]
fn command_line() {
    let run = |line: &str| {
        let (mut out, mut err) = (Vec::new(), Vec::new());
        let code = coneproof::command::run(line.split(' '), &mut out, &mut err);
        (code, String::from_utf8(out).unwrap(), String::from_utf8(err).unwrap())
    };
    let (code, out, _) =
        run("coneproof density box --half-width 1 --time 5 --at 9/2 --at 4 --at -3 --amplitude --format json");
    assert_eq!(code, 0);
    let answer: Value = serde_json::from_str(&out).unwrap();
    let points = answer["points"].as_array().unwrap();
    assert_eq!(points[0]["x"], "9/2");
    assert!(points[0]["lower"].as_str().unwrap().starts_with("0.03849344"));
    assert!(points[0]["imaginary"]["upper"].is_string() && points[0]["routes"].as_array().unwrap().len() == 2);
    assert_eq!((&points[1]["unbounded"], &points[1]["lower"]), (&Value::Bool(true), &Value::Null));
    assert!(points[2]["upper"].as_str().unwrap().starts_with("0.1147320897"));
    let (code, out, _) = run("coneproof density box --half-width 1 --time 5 --at 6");
    assert!(code == 0 && out.contains("unbounded here"), "{out}");
    let refused = [
        ("coneproof density box --half-width 1 --time 5", "at is missing"),
        ("coneproof density box --half-width 0 --time 5 --at 1", "half-width: \"0\""),
        ("coneproof density box --half-width 1 --time soon --at 1", "time: \"soon\""),
        ("coneproof density box --half-width 1 --time 1 --at 1/0", "at: \"1/0\""),
        ("coneproof density box --half-width 1 --time 1 --at 2 --digits 0", "digits: \"0\""),
    ];
    for (line, sentence) in refused {
        let (code, _, err) = run(line);
        assert!(code == 2 && err.contains(sentence) && err.lines().count() == 1, "{line}: {err}");
    }
}
