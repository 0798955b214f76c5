//! The proofs for piecewise packets can fail: a forgotten tail is noticed by a containment check that passes without
//! it.
//!
//! Run with `cargo test --features spoil --test spoil_packets`. One fault at a time, in one test, because the switch
//! is global.
#![cfg(feature = "spoil")]
#![allow(clippy::unwrap_used, clippy::panic, reason = "helpers of tests fail loudly")]

use coneproof::arithmetic::Interval;
use coneproof::packets::PiecewisePacket;
use coneproof::routes::panels::{PiecewiseKernel, Sides};
use coneproof::routes::{Effort, Evaluation};
use coneproof::spoil::{Fault, activate};
use rug::Rational;

fn q(n: i64, d: i64) -> Rational {
    Rational::from((n, d))
}

/// Problems in which no single bound is hidden behind another.
fn problems() -> Vec<PiecewiseKernel> {
    let mut list = Vec::new();
    for (a, t, d) in [(q(1, 1), q(1, 1), q(0, 1)), (q(1, 10), q(3, 1), q(0, 1)), (q(1, 7), q(1, 5), q(2, 3))] {
        let packets = [
            PiecewisePacket::bspline(&a, 1),
            PiecewisePacket::bspline(&a, 3),
            PiecewisePacket::uniform_ball(&a),
            PiecewisePacket::cosine(&a, 2),
            PiecewisePacket::bspline(&a, 2).and_then(|packet| packet.with_momentum(&q(5, 2))),
        ];
        for packet in packets {
            list.push(PiecewiseKernel::new(&packet.unwrap(), &q(1, 1), &t, &d, Sides::Both).unwrap());
        }
    }
    list
}

fn enclosure(kernel: &PiecewiseKernel, digits: u32) -> Interval {
    kernel.evaluate(digits, &Effort::default()).unwrap().interval
}

#[test]
fn forgotten_tail_is_noticed() {
    let truths: Vec<(PiecewiseKernel, Interval)> = problems()
        .into_iter()
        .map(|kernel| {
            let truth = enclosure(&kernel, 50);
            (kernel, truth)
        })
        .collect();
    let holds =
        || truths.iter().all(|(kernel, truth)| (1u32..=30).all(|digits| enclosure(kernel, digits).contains(truth)));
    assert!(holds(), "the check fails without a fault");
    // The other bounds are tested one by one in the route's own tests: here each is hidden behind the others.
    activate(Some(Fault::PiecewiseTailForgotten));
    assert!(!holds(), "a forgotten tail goes unnoticed");
    activate(None);
}
