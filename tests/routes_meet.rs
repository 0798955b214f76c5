//! The two routes on random inputs over the whole range: their intervals meet and are as narrow as asked.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use coneproof::arithmetic::Interval;
use coneproof::routes::{Effort, Route, RouteFailure, TailProblem, kernel::KERNEL, spectral::SPECTRAL};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use rug::Rational;

fn rational(value: f64) -> Rational {
    Rational::from_f64(value).expect("finite")
}

/// `m a` and `t/a` log-uniform from `1e-9` to `1e9`; half of the regions begin at the cone, the others at a distance
/// that is log-uniform up to tails of about `1e-100000`.
fn problem() -> impl Strategy<Value = TailProblem> {
    (-9.0..9.0f64, -9.0..9.0f64, prop::option::of(-12.0..5.0f64)).prop_map(|(mass, ratio, distance)| {
        let half_width = 10f64.powf(mass);
        let time = half_width * 10f64.powf(ratio);
        // E = sqrt(d (d + 2t)), so d = E^2/(t + sqrt(t^2 + E^2)).
        let proper = distance.map_or(0.0, |e| 10f64.powf(e));
        let distance = proper * proper / (time + time.hypot(proper));
        TailProblem {
            half_width: rational(half_width),
            time: rational(time),
            distance: rational(distance),
            massless: false,
        }
    })
}

/// The route's enclosure, which has the digits asked, or `None` where it declines.
fn enclosure(route: &dyn Route, problem: &TailProblem, digits: u32) -> Option<Interval> {
    match route.evaluate(problem, digits, &Effort::default()) {
        Ok(outcome) => {
            let reached = outcome.interval.has_relative_digits(digits);
            if !reached {
                println!(
                    "{}: {} of {digits} digits for {problem:?}",
                    route.name(),
                    outcome.interval.relative_digits(digits)
                );
            }
            Some(outcome.interval)
        }
        Err(RouteFailure::OutOfReach { reason }) => {
            println!("{}: {reason}", route.name());
            None
        }
        Err(other) => panic!("{}: {other}", route.name()),
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 1000, rng_seed: RngSeed::Fixed(20_261), failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn massive(problem in problem(), digits in 1u32..40) {
        let kernel = enclosure(&KERNEL, &problem, digits);
        let spectral = enclosure(&SPECTRAL, &problem, digits);
        prop_assert!(kernel.is_some() || spectral.is_some(), "both routes decline {problem:?}");
        if let (Some(kernel), Some(spectral)) = (kernel, spectral) {
            prop_assert!(kernel.intersection(&spectral).is_some(), "{problem:?}: {kernel:?} and {spectral:?}");
        }
    }
}
