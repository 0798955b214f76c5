//! The boosted box against values from the definition, identities, and route against route.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::{Boost, BoostedBox};
use coneproof::routes::boost::{BoostProblem, Complement, Contour, Cut, Region};
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
        ("1", "1", "0.009834916753676637491349533090325073"),
        ("1/10", "1", "0.0643180004588250128773510443267810"),
    ] {
        for digits in [5, 15, 25] {
            let start = std::time::Instant::now();
            let interval = found(&Cut::new(problem(half_width, rapidity, "0", Region::Cone)), digits);
            println!("{half_width} {rapidity} {digits}: {:?}", start.elapsed());
            assert!(agrees(&interval, value), "{half_width} {rapidity}: {interval:?}");
            let start = std::time::Instant::now();
            let contour = found(&Contour::new(problem(half_width, rapidity, "0", Region::Cone)), digits);
            println!("  contour: {:?}", start.elapsed());
            assert!(agrees(&contour, value), "{half_width} {rapidity}: {contour:?}");
            assert!(contour.intersection(&interval).is_some());
        }
    }
}

#[test]
fn check_values_inside() {
    let inside = |text: &str| Region::Beyond(exact(text).lower().clone());
    for (half_width, rapidity, region, value) in [
        ("1", "1/2", Region::Contracted, "0.146081861679035369080878511"),
        ("1", "1/2", inside("1"), "0.124266871494954365447138090"),
        ("1/10", "1", Region::Contracted, "0.320523743180104488774536727"),
        ("1/10", "1", inside("1/10"), "0.270665193589466090466007911"),
    ] {
        for digits in [5, 12] {
            let start = std::time::Instant::now();
            let contour = found(&Contour::new(problem(half_width, rapidity, "0", region.clone())), digits);
            println!("{half_width} {rapidity} {digits}: contour: {:?}", start.elapsed());
            assert!(agrees(&contour, value), "{half_width} {rapidity}: {contour:?}");
            let start = std::time::Instant::now();
            let rest = found(&Complement::new(problem(half_width, rapidity, "0", region.clone())), digits);
            println!("  complement: {:?}", start.elapsed());
            assert!(agrees(&rest, value), "{half_width} {rapidity}: {rest:?}");
        }
    }
}
