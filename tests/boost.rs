//! The boosted box against values from the definition, identities, and route against route.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::{Boost, BoostedBox};
use coneproof::routes::boost::{BoostProblem, Cut, Region};
use coneproof::routes::{Effort, Evaluation};
use rug::Rational;

fn exact(text: &str) -> ExactInput {
    text.parse().unwrap()
}

fn problem(half_width: &str, rapidity: &str, time: &str, region: Region) -> BoostProblem {
    let boost = Boost::from_rapidity(&exact(rapidity)).unwrap();
    let packet = BoostedBox::new(&exact(half_width), &exact("1"), boost).unwrap();
    BoostProblem::new(&packet, exact(time).lower(), region).unwrap()
}

fn found(route: &dyn Evaluation, digits: u32) -> Interval {
    let outcome = route.evaluate(digits, &Effort::default()).unwrap();
    assert!(
        outcome.interval.has_relative_digits(digits),
        "{} reaches {} of {digits} digits",
        route.name(),
        outcome.interval.relative_digits(digits)
    );
    outcome.interval
}

/// Whether the interval meets the value within half a unit of its last digit.
fn agrees(interval: &Interval, value: &str) -> bool {
    let number = exact(value).lower().clone();
    let places = value.split('.').nth(1).map_or(0, str::len) as u32;
    let half = Rational::from((1, 2)) / rug::Integer::from(rug::Integer::u_pow_u(10, places));
    let upper = Rational::from(&number + &half);
    let lower = number - half;
    *interval.upper() >= lower && *interval.lower() <= upper
}

#[test]
fn check_values_outside() {
    for (half_width, rapidity, value) in [
        ("1", "1/2", "0.016698241879125717749150350786535145339"),
        ("1", "1", "0.0098349167536766374913495330903250725648"),
        ("1/10", "1", "0.064318000458825012877351044326781010879"),
    ] {
        for digits in [5, 15, 30, 40] {
            let start = std::time::Instant::now();
            let interval = found(&Cut::new(problem(half_width, rapidity, "0", Region::Cone)), digits);
            println!("{half_width} {rapidity} {digits}: {:?} {}", start.elapsed(), interval.lower());
            assert!(agrees(&interval, value), "{half_width} {rapidity}: {interval:?}");
        }
    }
}
