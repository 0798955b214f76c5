//! With the feature `spoil`: each fault on the massless path is noticed by comparison of the two routes.
#![cfg(feature = "spoil")]
#![allow(clippy::unwrap_used, reason = "helpers of tests fail loudly")]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::routes::kernel::KERNEL;
use coneproof::routes::spectral::SPECTRAL;
use coneproof::routes::{Effort, Route, TailProblem};
use coneproof::spoil::{Fault, activate};

const INPUTS: [(&str, &str); 8] =
    [("1", "0"), ("7/3", "0"), ("1e-5", "0"), ("1e7", "0"), ("1", "3/2"), ("1/9", "5"), ("20", "1/1000"), ("3", "200")];

/// Inputs for which the route's interval misses a narrow one found without a fault by the other route.
fn missed(fault: Option<Fault>, spoilt: &dyn Route, other: &dyn Route, digits: u32) -> usize {
    let number = |text: &str| text.parse::<ExactInput>().unwrap().lower().clone();
    let find = |route: &dyn Route, problem: &TailProblem, digits: u32| -> Interval {
        route.evaluate(problem, digits, &Effort::default()).unwrap().interval
    };
    INPUTS
        .iter()
        .filter(|(time, distance)| {
            let problem =
                TailProblem { half_width: number("1"), time: number(time), distance: number(distance), massless: true };
            activate(None);
            let truth = find(other, &problem, digits + 15);
            activate(fault);
            let found = find(spoilt, &problem, digits);
            activate(None);
            !found.contains(&truth)
        })
        .count()
}

// One test only: the fault is a global switch.
#[test]
fn spoilt_bounds_are_noticed() {
    let (kernel, spectral): (&dyn Route, &dyn Route) = (&KERNEL, &SPECTRAL);
    // The bounds of the trapezoid rule and its cut-offs are tested one by one in the route's own tests: here
    // each is hidden behind the others.
    for (fault, spoilt, other) in [
        (Fault::FarFieldSign, spectral, kernel),
        (Fault::KernelTailForgotten, kernel, spectral),
        (Fault::DilogarithmSeriesCut, kernel, spectral),
    ] {
        for digits in [15, 25] {
            assert!(missed(Some(fault), spoilt, other, digits) > 0, "{fault:?} goes unnoticed at {digits} digits");
        }
    }
    assert_eq!(missed(None, spectral, kernel, 15) + missed(None, kernel, spectral, 15), 0);
}
