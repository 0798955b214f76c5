//! Box tails against values from outside, and against the identities that they obey.
//!
//! `references/box_tail_from_definition.json` comes from `tests/oracles/box_tail_from_definition.py`, which starts at
//! the definition of the evolution and shares no formula with the program; `references/check-values.json` names its
//! methods value by value.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::BoxPacket;
use coneproof::quantities::tail::{RouteChoice, Side, Status, TailRequest};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::{Integer, Rational};
use serde_json::Value;

/// A request with exact inputs written as text.
fn request(half_width: &str, mass: &str, time: &str, beyond: Option<&str>) -> TailRequest {
    let packet = BoxPacket::new(half_width.parse().unwrap()).unwrap();
    let mut request = TailRequest::new(packet, mass.parse().unwrap(), time.parse().unwrap()).unwrap();
    request.beyond = beyond.map(|text| text.parse().unwrap());
    request
}

fn interval(request: &TailRequest) -> Interval {
    let result = request.certify().unwrap();
    assert_eq!(result.status, Status::Certified, "{request:?}: {result:?}");
    result.interval
}

/// All numbers that round to the decimal: half a unit of its last digit to either side.
fn rounding_range(decimal: &str) -> (Rational, Rational) {
    let value = decimal.parse::<ExactInput>().unwrap().lower().clone();
    let (mantissa, exponent) = decimal.split_once('e').unwrap_or((decimal, "0"));
    let places = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len() as i32);
    let power = exponent.parse::<i32>().unwrap() - places;
    let unit = Rational::from(Integer::from(10).pow_ref_(power.unsigned_abs()));
    let half = if power < 0 { Rational::from(unit.recip_ref()) } else { unit } / 2;
    (Rational::from(&value - &half), value + half)
}

trait PowRef {
    fn pow_ref_(&self, power: u32) -> Integer;
}

impl PowRef for Integer {
    fn pow_ref_(&self, power: u32) -> Integer {
        use rug::ops::Pow;
        self.clone().pow(power)
    }
}

fn meets(interval: &Interval, (low, high): &(Rational, Rational)) -> bool {
    *interval.upper() >= *low && *interval.lower() <= *high
}

fn reference_values() -> Vec<Value> {
    let text = std::fs::read_to_string("references/box_tail_from_definition.json").unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    all["values"].as_array().unwrap().clone()
}

#[test]
fn values_from_the_definition() {
    let values = reference_values();
    assert!(values.len() >= 30);
    for value in &values {
        let text = |key: &str| value[key].as_str().unwrap();
        let digits = value["digits"].as_u64().unwrap() as u32;
        assert!(digits >= 30);
        let mut request = request(text("half_width"), text("mass"), text("time"), value["beyond"].as_str());
        request.side = if text("side") == "both" { Side::Both } else { Side::Right };
        request.digits = digits + 2;
        for route in [RouteChoice::Kernel, RouteChoice::Spectral] {
            request.routes = route;
            let found = interval(&request);
            assert!(meets(&found, &rounding_range(text("value"))), "{value}: {found:?}");
        }
    }
}

#[test]
fn value_computed_elsewhere() {
    let text = std::fs::read_to_string("references/check-values.json").unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    let values = all["values"].as_array().unwrap();
    let known = values.iter().find(|v| v["quantity"] == "P(|x|>a+t) box 1D").unwrap();
    let decimals = known["digits_agreed_by_two_methods"].as_u64().unwrap() as usize;
    let mut request = request("1", "1", "1", None);
    request.digits = 40;
    let shown = &known["value"].as_str().unwrap()[..2 + decimals];
    let (low, high) = rounding_range(shown);
    // The text is cut, not rounded: allow a whole unit above.
    let high = high.clone() + (high - &low);
    assert!(meets(&interval(&request), &(low, high)));
}

/// `P -> 1/6` for mass zero and late times: `Int_0^inf ln^2(1 + 1/v) dv = pi^2/3` (an exact identity).
#[test]
fn massless_late_limit() {
    let sixth = Rational::from((1, 6));
    let mut before = Rational::new();
    for power in [3u32, 6, 9] {
        let mut request = request("1", "0", &format!("1e{power}"), None);
        request.digits = 20;
        let found = interval(&request);
        let gap = &sixth - found.upper().to_rational().unwrap();
        assert!(gap > 0, "the limit is approached from below");
        // The distance from the limit is of the order a/t ln(t/a): common practice, no source.
        assert!(gap < Rational::from((power, Integer::from(10).pow_ref_(power))));
        assert!(found.lower().to_rational().unwrap() > before);
        before = found.upper().to_rational().unwrap();
    }
}

fn fraction(low: f64, high: f64) -> impl Strategy<Value = Rational> {
    (low..high).prop_map(|power| Rational::from_f64(10f64.powf(power)).unwrap())
}

fn exact(value: &Rational) -> ExactInput {
    ExactInput::from_rational(value.clone())
}

fn rational_request(a: &Rational, m: &Rational, t: &Rational, beyond: Option<&Rational>) -> TailRequest {
    let mut request = TailRequest::new(BoxPacket::new(exact(a)).unwrap(), exact(m), exact(t)).unwrap();
    request.beyond = beyond.map(exact);
    request
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 60, rng_seed: RngSeed::Fixed(7), failure_persistence: None, ..ProptestConfig::default()
    })]

    /// Only `m a`, `t/a` and `R/a` matter; the sign of the time does not; each side has half.
    #[test]
    fn scaling_and_time_reversal(
        a in fraction(-2.0, 2.0), t in fraction(-2.0, 2.0), unit in fraction(-3.0, 3.0), massless in any::<bool>()
    ) {
        let mass = if massless { Rational::new() } else { Rational::from(1) };
        let base = rational_request(&a, &mass, &t, None).certify().unwrap().interval;
        let (a_scaled, t_scaled) = (Rational::from(&a * &unit), Rational::from(&t * &unit));
        let scaled = rational_request(&a_scaled, &(mass.clone() / &unit), &t_scaled, None).certify().unwrap().interval;
        prop_assert_eq!(&base, &scaled);
        let mut reversed = rational_request(&a, &mass, &(-t), None);
        prop_assert_eq!(&base, &reversed.certify().unwrap().interval);
        for side in [Side::Left, Side::Right] {
            reversed.side = side;
            let one = reversed.certify().unwrap().interval;
            prop_assert_eq!(Interval::new(one.lower().clone() * 2u32, one.upper().clone() * 2u32), base.clone());
        }
    }

    /// `P(|x| > R)` falls as `R` grows.
    #[test]
    fn falls_with_distance(a in fraction(-2.0, 2.0), t in fraction(-2.0, 2.0), d in fraction(-3.0, 1.0), massless in any::<bool>()) {
        let mass = if massless { Rational::new() } else { Rational::from(1) };
        let cone = Rational::from(&a + &t);
        let near = rational_request(&a, &mass, &t, None).certify().unwrap().interval;
        let middle = rational_request(&a, &mass, &t, Some(&Rational::from(&cone + &d))).certify().unwrap().interval;
        let far = rational_request(&a, &mass, &t, Some(&(cone + d * 2))).certify().unwrap().interval;
        prop_assert!(near.lower() > middle.upper() && middle.lower() > far.upper());
    }
}

/// A box cannot have left its cone at the moment of its release.
#[test]
fn nothing_outside_at_time_zero() {
    for mass in ["0", "1"] {
        let found = request("1", mass, "0", Some("2")).certify().unwrap();
        assert!(*found.interval.upper() == 0 && *found.interval.lower() == 0);
        assert_eq!(found.status, Status::Certified);
    }
}

/// The largest number of digits in daily use, both routes, ratios where neither is at its best.
#[test]
fn three_hundred_digits() {
    let mut request = request("1/3", "1", "7/5", None);
    request.digits = 300;
    assert!(interval(&request).has_relative_digits(300));
}

/// A tail near `1e-100000`.
#[test]
fn a_tail_far_below_any_double() {
    let request = request("1", "1", "1", Some("115130"));
    let found = interval(&request);
    let exponent = found.lower().get_exp().unwrap();
    assert!((-340_000..-330_000).contains(&exponent), "{exponent}");
}
