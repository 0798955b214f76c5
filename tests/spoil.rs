//! The proofs can fail: each deliberate fault is noticed by a containment check that passes without it.
//!
//! Run with `cargo test --features spoil --test spoil`. One fault at a time, in one test, because the switch is global.
#![cfg(feature = "spoil")]

use coneproof::arithmetic::{ExactInput, Interval, Real, decimal};
use coneproof::routes::{Effort, Route, TailProblem, kernel::KERNEL, spectral::SPECTRAL};
use coneproof::spoil::{Fault, activate};
use rug::{Float, Rational};

/// Problems in which no single bound is hidden behind another.
fn problems() -> Vec<TailProblem> {
    let value = |text: &str| text.parse::<ExactInput>().unwrap().lower().clone();
    [("1", "1", "0"), ("1/10", "3", "0"), ("5", "5", "0"), ("1", "1", "3"), ("2", "1/3", "1/7")]
        .iter()
        .map(|(a, t, d)| TailProblem { half_width: value(a), time: value(t), distance: value(d), massless: false })
        .collect()
}

fn enclosure(route: &dyn Route, problem: &TailProblem, digits: u32) -> Interval {
    route.evaluate(problem, digits, &Effort::default()).unwrap().interval
}

/// Whether every coarse interval of the route contains the fine one computed before.
fn contains_the_truth(route: &dyn Route, truths: &[(TailProblem, Interval)]) -> bool {
    truths.iter().all(|(problem, truth)| {
        [1u32, 2, 3, 5, 8, 13, 21, 30].iter().all(|digits| enclosure(route, problem, *digits).contains(truth))
    })
}

/// Ball arithmetic against exact rationals: powers of fractions, products of wide balls.
fn arithmetic_contains() -> bool {
    let bits = 24;
    (3u32..200).all(|n| {
        let exact = Rational::from((n * n + 1, 7 * n + 3));
        let ball = Real::from_rational(&exact, bits);
        let mut power = exact.clone();
        let mut balls = ball.clone();
        (0..6).all(|_| {
            power *= &exact;
            balls = balls.mul(&ball, bits);
            balls.contains_rational(&power)
        }) && {
            let wide = ball.clone().widen(coneproof::arithmetic::Magnitude::power_of_two(-3));
            let corner =
                Rational::from(&wide.upper(200).to_rational().unwrap() * &wide.upper(200).to_rational().unwrap());
            wide.mul(&wide, 200).contains_rational(&corner)
        }
    })
}

fn printed_bounds_hold() -> bool {
    (1u32..200).all(|n| {
        let value = Float::with_val(80, n) / 7u32;
        let low: ExactInput = decimal::lower_decimal(&value, 9).parse().unwrap();
        let high: ExactInput = decimal::upper_decimal(&value, 9).parse().unwrap();
        let exact = value.to_rational().unwrap();
        *low.lower() <= exact && *high.lower() >= exact
    })
}

#[test]
fn every_fault_is_noticed() {
    let truths: Vec<(TailProblem, Interval)> =
        problems().into_iter().map(|p| (p.clone(), enclosure(&KERNEL, &p, 60))).collect();
    for (_, truth) in &truths {
        assert!(truth.has_relative_digits(58));
    }
    let kernel = || contains_the_truth(&KERNEL, &truths);
    let spectral = || contains_the_truth(&SPECTRAL, &truths);
    let checks: [(Fault, &dyn Fn() -> bool); 6] = [
        (Fault::RadiusRoundedDown, &arithmetic_contains),
        (Fault::ProductRoundingForgotten, &arithmetic_contains),
        (Fault::TrapezoidErrorForgotten, &spectral),
        (Fault::FarFieldSign, &spectral),
        (Fault::KernelTailForgotten, &kernel),
        (Fault::LowerBoundRoundedUp, &printed_bounds_hold),
    ];
    for (fault, check) in checks {
        activate(None);
        assert!(check(), "{fault:?}: the check fails without the fault");
        activate(Some(fault));
        assert!(!check(), "{fault:?} goes unnoticed");
    }
    activate(None);
}
