//! The boosted box against values from the definition, identities, and route against route.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::{Boost, BoostedBox};
use coneproof::routes::boost::{BoostProblem, Complement, Contour, Cut, Region};
use coneproof::routes::spectral::SPECTRAL;
use coneproof::routes::{Effort, Evaluation, Route, RouteFailure, TailProblem};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::Rational;

fn exact(text: &str) -> ExactInput {
    text.parse().unwrap()
}

fn number(text: &str) -> Rational {
    exact(text).lower().clone()
}

fn rapidity(theta: &str) -> Boost {
    Boost::from_rapidity(&exact(theta)).unwrap()
}

fn problem(half_width: &str, boost: Boost, time: &str, region: Region) -> BoostProblem {
    let packet = BoostedBox::new(&exact(half_width), &exact("1"), boost).unwrap();
    BoostProblem::new(&packet, &number(time), region).unwrap()
}

/// The interval, which has the digits asked.
fn found(route: &dyn Evaluation, digits: u32) -> Interval {
    let outcome = route.evaluate(digits, &Effort::default()).unwrap();
    let reached = outcome.interval.relative_digits(digits);
    assert!(reached >= digits, "{} reaches {reached} of {digits} digits", route.name());
    outcome.interval
}

/// Whether the interval meets a decimal of which `digits` significant digits count, within one unit of the last.
fn agrees(interval: &Interval, value: &str, digits: usize) -> bool {
    let value_number = number(value);
    let fraction = value.split('.').nth(1).unwrap();
    let zeros = fraction.len() - fraction.trim_start_matches('0').len();
    let power = rug::Integer::from(rug::Integer::u_pow_u(10, (zeros + digits) as u32));
    let unit = Rational::from((1, power));
    let upper = Rational::from(&value_number + &unit);
    *interval.upper() >= value_number - unit && *interval.lower() <= upper
}

/// The stored check values of moving observers, with the digits on which two methods agreed.
fn check_values(kind: &str) -> Vec<(String, String, String, usize)> {
    let file: serde_json::Value = serde_json::from_str(include_str!("../references/check-values.json")).unwrap();
    let list = file.as_array().or_else(|| file["values"].as_array()).unwrap();
    let text = |value: &serde_json::Value| value.as_str().unwrap().to_owned();
    list.iter()
        .filter(|entry| entry["id"].as_str().is_some_and(|id| id.starts_with(kind)))
        .map(|entry| {
            let params = &entry["params"];
            let digits = entry["digits_agreed_by_two_methods"].as_u64().unwrap() as usize;
            (text(&params["a"]), text(&params["theta"]), text(&entry["value"]), digits)
        })
        .collect()
}

#[test]
fn check_values_outside() {
    let values = check_values("E_out_");
    assert_eq!(values.len(), 3);
    for (half_width, theta, value, known) in values {
        for digits in [3, 15, 24] {
            let ask = || problem(&half_width, rapidity(&theta), "0", Region::Cone);
            let cut = found(&Cut::new(ask()), digits);
            assert!(agrees(&cut, &value, known), "{half_width} {theta}: {cut:?}");
            let contour = found(&Contour::new(ask()), digits);
            assert!(agrees(&contour, &value, known), "{half_width} {theta}: {contour:?}");
            assert!(contour.intersection(&cut).is_some());
        }
    }
    let cut = found(&Cut::new(problem("1", rapidity("1/2"), "0", Region::Cone)), 40);
    assert!(agrees(&cut, "0.016698241879125717749150350786535145339", 32));
}

#[test]
fn check_values_inside() {
    for (kind, contracted) in [("E_cosh_", true), ("E_a_", false)] {
        let values = check_values(kind);
        assert_eq!(values.len(), 2);
        for (half_width, theta, value, known) in values {
            for digits in [4, 13] {
                let region = if contracted { Region::Contracted } else { Region::Beyond(number(&half_width)) };
                let ask = || problem(&half_width, rapidity(&theta), "0", region.clone());
                let contour = found(&Contour::new(ask()), digits);
                assert!(agrees(&contour, &value, known), "{half_width} {theta}: {contour:?}");
                let rest = found(&Complement::new(ask()), digits);
                assert!(agrees(&rest, &value, known), "{half_width} {theta}: {rest:?}");
            }
        }
    }
}

/// At rapidity zero the box's own routes give the answer, at `t = 0` it is zero; near zero there is no jump.
#[test]
fn rest_frame() {
    for (half_width, time, distance) in [("1", "1", "0"), ("1/3", "2", "0"), ("2", "1/2", "1/4"), ("1", "-3", "1")] {
        let tail = TailProblem {
            half_width: number(half_width),
            time: number(time).abs(),
            distance: number(distance),
            massless: false,
        };
        let rest = SPECTRAL.evaluate(&tail, 20, &Effort::default()).unwrap().interval;
        let region = || Region::BeyondCone(number(distance));
        let contour = found(&Contour::new(problem(half_width, rapidity("0"), time, region())), 15);
        assert!(contour.intersection(&rest).is_some(), "{half_width} {time}: {contour:?} {rest:?}");
        // The probability of both sides is even and smooth in the rapidity: the change at 1e-8 is of order 1e-16.
        let near = found(&Cut::new(problem(half_width, rapidity("1e-8"), time, region())), 18);
        let ratio = near.to_real(100).div(&rest.to_real(100), 100).to_f64();
        assert!((ratio - 1.0).abs() < 1e-13, "{half_width} {time}: {ratio}");
    }
    let still = |region| problem("1", rapidity("0"), "0", region);
    assert_eq!(*found(&Cut::new(still(Region::Cone)), 10).upper(), 0);
    let half = Contour::new(still(Region::Beyond(number("1/2")))).evaluate(12, &Effort::default()).unwrap();
    assert!(half.interval.contains_rational(&number("1/2")) && half.interval.has_relative_digits(12));
}

#[test]
fn reflection_and_velocity() {
    for region in [Region::Cone, Region::BeyondCone(number("1/2"))] {
        let plus = found(&Cut::new(problem("1", rapidity("3/4"), "0", region.clone())), 15);
        let minus = found(&Cut::new(problem("1", rapidity("-3/4"), "0", region.clone())), 15);
        assert!(plus.intersection(&minus).is_some());
        let later = found(&Cut::new(problem("1", rapidity("3/4"), "2/3", region.clone())), 15);
        let mirrored = found(&Contour::new(problem("1", rapidity("-3/4"), "-2/3", region)), 15);
        assert!(later.intersection(&mirrored).is_some());
    }
    // tanh(theta) = 3/5 is e^theta = 2: the cone of a box of half-width 1/2 is at 1, exactly.
    let boost = Boost::from_velocity(&exact("3/5")).unwrap();
    let cone = found(&Cut::new(problem("1/2", boost.clone(), "0", Region::Cone)), 20);
    let beyond = found(&Cut::new(problem("1/2", boost.clone(), "0", Region::Beyond(number("1")))), 20);
    assert!(cone.intersection(&beyond).is_some());
    let shifted = found(&Contour::new(problem("1/2", boost.clone(), "0", Region::Beyond(number("1")))), 20);
    assert!(shifted.intersection(&cone).is_some());
    // ln 2 to 20 places as rapidity differs by less than 1e-20.
    let near = found(&Cut::new(problem("1/2", rapidity("0.69314718055994530942"), "0", Region::Cone)), 15);
    let ratio = near.to_real(100).div(&cone.to_real(100), 100).to_f64();
    assert!((ratio - 1.0).abs() < 1e-14);
    // The scale does not matter: mass 2, half-width 1/4.
    let packet = BoostedBox::new(&exact("1/4"), &exact("2"), boost).unwrap();
    let scaled = found(&Cut::new(BoostProblem::new(&packet, &number("0"), Region::Cone).unwrap()), 20);
    assert!(scaled.intersection(&cone).is_some());
}

#[test]
fn narrow_contains_wide_question() {
    for (route, name) in [(true, "cut"), (false, "contour")] {
        let ask = || problem("2/3", rapidity("7/5"), "0", Region::Cone);
        let evaluate = |digits| {
            if route { found(&Cut::new(ask()), digits) } else { found(&Contour::new(ask()), digits) }
        };
        let (wide, narrow) = (evaluate(10), evaluate(30));
        assert!(wide.contains(&narrow), "{name}: {wide:?} {narrow:?}");
    }
}

/// Values of `tests/oracles/boosted_box_from_definition.py`.
#[test]
fn values_from_the_definition() {
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../references/boosted_box_from_definition.json")).unwrap();
    let values = file["values"].as_array().unwrap();
    assert!(values.len() >= 11);
    for entry in values {
        let text = |key: &str| entry[key].as_str().map(str::to_owned);
        let distance = text("distance").map(|d| number(&d));
        let inside = entry["region"] == "inside";
        let region = match (inside, distance) {
            (true, Some(at)) => Region::Beyond(at),
            (_, Some(beyond)) => Region::BeyondCone(beyond),
            _ => Region::Cone,
        };
        let theta = rapidity(&text("rapidity").unwrap());
        let ask = || problem(&text("half_width").unwrap(), theta.clone(), &text("time").unwrap(), region.clone());
        let (value, known) = (text("value").unwrap(), entry["digits"].as_u64().unwrap() as usize);
        let contour = found(&Contour::new(ask()), 20);
        assert!(agrees(&contour, &value, known), "{entry}: {contour:?}");
        let other: Interval =
            if inside { found(&Complement::new(ask()), 20) } else { found(&Cut::new(ask()), known as u32) };
        assert!(agrees(&other, &value, known), "{entry}: {other:?}");
    }
}

/// For `m a -> 0` at a fixed rapidity the probability rises to its massless value.
///
/// Without mass each direction of motion is scaled by itself, so with `L(y) = ln((y+1)/(y-1))` it is
/// `(1/(4 pi^2)) Int_1^inf (L(y) - e^theta L(y e^(2 theta)))^2 dy`; at `theta = 1` by mpmath's quadrature
/// (25 digits): 0.08823617420764574198588972.
#[test]
fn massless_trend() {
    let values: Vec<f64> = ["1e-2", "1e-4", "1e-6", "1e-8"]
        .iter()
        .map(|a| found(&Cut::new(problem(a, rapidity("1"), "0", Region::Cone)), 10).lower().to_f64())
        .collect();
    let limit = 0.088_236_174_207_645_74;
    assert!(values[3] < limit && limit - values[3] < 1e-8 && values[2] < limit && limit - values[2] < 1e-6);
    let steps: Vec<f64> = values.windows(2).map(|pair| pair[1] - pair[0]).collect();
    assert!(steps.iter().all(|step| *step > 0.0) && steps[2] < steps[1] / 50.0 && steps[1] < steps[0] / 20.0);
}

#[test]
fn impossible_requests() {
    let inside = Cut::new(problem("1", rapidity("1/2"), "0", Region::Beyond(number("1"))));
    assert!(matches!(inside.evaluate(10, &Effort::default()), Err(RouteFailure::OutOfReach { .. })));
    let packet = BoostedBox::new(&exact("1"), &exact("1"), rapidity("1/2")).unwrap();
    assert!(BoostProblem::new(&packet, &number("0"), Region::Beyond(number("-1"))).is_err());
    let late = Complement::new(problem("1", rapidity("1/2"), "1", Region::Cone));
    assert!(matches!(late.evaluate(10, &Effort::default()), Err(RouteFailure::OutOfReach { .. })));
    let few = Effort { max_bits: Some(64), deadline: None };
    let cut = Cut::new(problem("1", rapidity("1/2"), "0", Region::Cone));
    assert!(matches!(cut.evaluate(40, &few), Err(RouteFailure::BitLimit { .. })));
}

/// A double as an exact number.
fn rational(value: f64) -> Rational {
    Rational::from_f64(value).unwrap()
}

fn random_problem(width: f64, theta: f64, time: f64, region: Region) -> BoostProblem {
    let boost = Boost::Rapidity(rational(theta));
    let half_width = ExactInput::from_rational(rational(10f64.powf(width)));
    let packet = BoostedBox::new(&half_width, &exact("1"), boost).unwrap();
    BoostProblem::new(&packet, &rational(time), region).unwrap()
}

/// Meets, is as narrow as asked, or says why not.
fn attempt(route: &dyn Evaluation, digits: u32) -> Option<Interval> {
    match route.evaluate(digits, &Effort::default()) {
        Ok(outcome) => {
            let reached = outcome.interval.relative_digits(digits);
            if reached < digits {
                println!("{}: {reached} of {digits} digits", route.name());
            }
            Some(outcome.interval)
        }
        Err(failure) => {
            println!("{}: {failure}", route.name());
            None
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, rng_seed: RngSeed::Fixed(20_262), failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn routes_meet_outside(
        width in -3.0f64..1.2, size in -3.0f64..0.5, left in any::<bool>(), late in prop::option::of(-3.0f64..3.0),
        distance in prop::option::of(-3.0f64..1.0), digits in 2u32..14,
    ) {
        let theta = if left { -10f64.powf(size) } else { 10f64.powf(size) };
        let region = distance.map_or(Region::Cone, |d| Region::BeyondCone(rational(10f64.powf(d))));
        let ask = || random_problem(width, theta, late.unwrap_or(0.0), region.clone());
        let cut = attempt(&Cut::new(ask()), digits);
        let contour = attempt(&Contour::new(ask()), digits);
        prop_assert!(cut.is_some() && contour.is_some(), "a route declines {:?}", ask());
        if let (Some(cut), Some(contour)) = (cut, contour) {
            prop_assert!(cut.intersection(&contour).is_some(), "{:?}: {cut:?} and {contour:?}", ask());
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 60, rng_seed: RngSeed::Fixed(20_263), failure_persistence: None, ..ProptestConfig::default() })]

    /// The probabilities of `|x| > R` and, on other lines, of `|x| < R` add up to one.
    #[test]
    fn norm_is_one(width in -2.0f64..0.7, size in -2.0f64..0.3, at in 0.0f64..1.4, digits in 2u32..8) {
        let theta = 10f64.powf(size);
        let ask = || random_problem(width, theta, 0.0, Region::Beyond(rational(at * 10f64.powf(width) * theta.exp())));
        let outside = attempt(&Contour::new(ask()), digits);
        let rest = attempt(&Complement::new(ask()), digits);
        prop_assert!(outside.is_some() && rest.is_some(), "a route declines {:?}", ask());
        if let (Some(outside), Some(rest)) = (outside, rest) {
            prop_assert!(outside.intersection(&rest).is_some(), "{:?}: {outside:?} and {rest:?}", ask());
        }
    }
}
