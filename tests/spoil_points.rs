//! Deliberate faults in the routes to propagators and densities are noticed by checks that pass without them.
//!
//! Run with `cargo test --features spoil --test spoil_points`. One fault at a time, in one test: the switch is global.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]
#![cfg(feature = "spoil")]

use coneproof::arithmetic::{ExactInput, Interval};
use coneproof::packets::BoxPacket;
use coneproof::quantities::density::{DensityRequest, PointValue};
use coneproof::quantities::propagator::{Dimension, PropagatorRequest};
use coneproof::spoil::{Fault, activate};

const POINTS: [&str; 6] = ["0", "1/2", "3", "9/2", "11/2", "8"];

fn densities(digits: u32) -> Option<Vec<Vec<Interval>>> {
    let at = POINTS.iter().map(|text| text.parse::<ExactInput>().unwrap()).collect();
    let packet = BoxPacket::new("1".parse().unwrap()).unwrap();
    let mut request = DensityRequest::new(packet, "1".parse().unwrap(), "5".parse().unwrap(), at).unwrap();
    request.digits = digits;
    // Routes that exclude each other are an error, which is a way of noticing.
    let result = request.certify().ok()?;
    let intervals = |value: &PointValue| match value {
        PointValue::Known(known) => known.routes.iter().filter_map(|route| route.density.clone()).collect(),
        _ => Vec::new(),
    };
    Some(result.points.iter().map(|point| intervals(&point.value)).collect())
}

fn propagators(digits: u32) -> Option<Vec<Vec<Interval>>> {
    let mut all = Vec::new();
    for dimension in [Dimension::One, Dimension::Two, Dimension::Three] {
        let at = POINTS.iter().map(|text| text.parse::<ExactInput>().unwrap()).collect();
        let mut request = PropagatorRequest::new(dimension, "1".parse().unwrap(), "5".parse().unwrap(), at).unwrap();
        request.digits = digits;
        for point in request.certify().ok()?.points {
            let parts = point.routes.iter().filter_map(|route| route.amplitude.clone());
            all.push(parts.flat_map(|value| [value.real, value.imaginary]).collect());
        }
    }
    Some(all)
}

/// Whether every route's coarse interval contains the fine one computed before.
fn contains_the_truth(truth: &[Vec<Interval>], found: impl Fn(u32) -> Option<Vec<Vec<Interval>>>) -> bool {
    [1u32, 2, 3, 5, 8, 13, 21].iter().all(|digits| {
        found(*digits).is_some_and(|all| {
            all.iter()
                .zip(truth)
                .all(|(one, other)| one.len() == other.len() && one.iter().zip(other).all(|(i, j)| i.contains(j)))
        })
    })
}

#[test]
fn every_fault_is_noticed() {
    let (density, propagator) = (densities(60).unwrap(), propagators(60).unwrap());
    let by_density = || contains_the_truth(&density, densities);
    let by_propagator = || contains_the_truth(&propagator, propagators);
    let checks: [(Fault, &dyn Fn() -> bool); 5] = [
        (Fault::DescentErrorForgotten, &by_density),
        (Fault::DescentErrorForgotten, &by_propagator),
        (Fault::DescentPoleForgotten, &by_density),
        (Fault::IntervalSeriesCut, &by_density),
        (Fault::PropagatorBranch, &by_propagator),
    ];
    for (fault, check) in checks {
        activate(None);
        assert!(check(), "{fault:?}: the check fails without the fault");
        activate(Some(fault));
        assert!(!check(), "{fault:?} goes unnoticed");
    }
    activate(None);
}
