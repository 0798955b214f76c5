//! The bounds of the gaussian routes can fail: each deliberate fault is noticed by a containment check.
//!
//! Run with `cargo test --features spoil --test gaussian_spoil`. One test, because the switch is global.
#![cfg(feature = "spoil")]
#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::routes::contour::Contour;
use coneproof::routes::gaussian::{GaussianProblem, Region};
use coneproof::routes::lattice::Lattice;
use coneproof::routes::{Effort, Evaluation};
use coneproof::spoil::{Fault, activate};
use rug::Rational;

fn problems() -> Vec<GaussianProblem> {
    let value = |text: &str| text.parse::<ExactInput>().unwrap().lower().clone();
    [
        ("1/2", "0", "1", "2"),
        ("1/2", "0", "1", "6"),
        ("1", "2", "1", "5"),
        ("1/10", "0", "1", "2"),
        ("3", "1", "10", "12"),
    ]
    .iter()
    .flat_map(|(sigma, momentum, time, from)| {
        [Region::RightOf(value(from)), Region::Within(value(from)), Region::Outside(value(from))].map(|region| {
            let one = Rational::from(1);
            GaussianProblem::new(&value(sigma), &value(momentum), &one, &value(time), &region).unwrap()
        })
    })
    .collect()
}

fn enclosure(way: &dyn Evaluation, digits: u32) -> Interval {
    way.evaluate(digits, &Effort::default()).unwrap().interval
}

/// Whether every coarse interval of the route contains the fine one computed before.
fn contains_the_truth<W: Evaluation>(
    route: impl Fn(GaussianProblem) -> W,
    truths: &[(GaussianProblem, Interval)],
) -> bool {
    truths.iter().all(|(problem, truth)| {
        let way = route(problem.clone());
        (1u32..24).all(|digits| enclosure(&way, digits).contains(truth))
    })
}

#[test]
fn every_fault_is_noticed() {
    activate(None);
    let fine = |p: GaussianProblem| (p.clone(), enclosure(&Contour::new(p), 50));
    let truths: Vec<(GaussianProblem, Interval)> = problems().into_iter().map(fine).collect();
    assert!(truths.iter().all(|(_, truth)| truth.has_relative_digits(50)));
    let lattice = || contains_the_truth(Lattice::new, &truths);
    let contour = || contains_the_truth(Contour::new, &truths);
    let checks: [(Fault, &dyn Fn() -> bool); 3] = [
        (Fault::LatticeErrorForgotten, &lattice),
        (Fault::ContourStripForgotten, &contour),
        (Fault::ContourCutForgotten, &contour),
    ];
    for (fault, check) in checks {
        activate(None);
        assert!(check(), "{fault:?}: the check fails without the fault");
        activate(Some(fault));
        assert!(!check(), "{fault:?} goes unnoticed");
    }
    activate(None);
}
