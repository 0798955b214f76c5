//! Broken bounds of the spectral route for general packets are noticed.
//!
//! Run with `cargo test --features spoil --test spoil_cut`. One fault at a time, in one test, because the switch is global.
#![cfg(feature = "spoil")]
#![allow(clippy::unwrap_used, reason = "helpers of tests fail loudly")]

use coneproof::arithmetic::Interval;
use coneproof::packets::WavePacket;
use coneproof::routes::cut::{CutSide, CutTail};
use coneproof::routes::{Effort, Evaluation};
use coneproof::spoil::{Fault, activate};
use rug::Rational;

fn q(n: i64, d: i64) -> Rational {
    Rational::from((n, d))
}

fn tails(massless: bool) -> Vec<CutTail> {
    let zero = Rational::new();
    let packets = [
        WavePacket::moving_box(&q(1, 1), &q(3, 1)).unwrap(),
        WavePacket::cosine(&q(1, 1), 2, &zero).unwrap(),
        WavePacket::ball(&q(1, 3)).unwrap(),
        WavePacket::bspline(&q(1, 1), 2, &q(1, 2)).unwrap(),
    ];
    let mass = if massless { zero } else { q(1, 1) };
    let place = |packet: &WavePacket, d: Rational| CutTail::new(packet, &mass, &q(3, 2), &d, CutSide::Both).unwrap();
    packets.iter().flat_map(|packet| [place(packet, q(0, 1)), place(packet, q(1, 2))]).collect()
}

/// `None` where the route gives up: a sum of the wrong sign is no probability.
fn enclosure(tail: &CutTail, digits: u32) -> Option<Interval> {
    tail.evaluate(digits, &Effort::default()).ok().map(|outcome| outcome.interval)
}

#[test]
fn every_fault_is_noticed() {
    for massless in [false, true] {
        let tails = tails(massless);
        let truths: Vec<Interval> = tails.iter().map(|tail| enclosure(tail, 50).unwrap()).collect();
        let contains = || {
            tails.iter().zip(&truths).all(|(tail, truth)| {
                [1u32, 2, 3, 5, 8, 13, 21, 30]
                    .iter()
                    .all(|digits| enclosure(tail, *digits).is_some_and(|found| found.contains(truth)))
            })
        };
        for fault in [Fault::TrapezoidErrorForgotten, Fault::CutOffForgotten, Fault::FarFieldSign] {
            if massless && fault == Fault::FarFieldSign {
                // There is no far field in that sum.
                continue;
            }
            activate(None);
            assert!(contains(), "{fault:?}: the check fails without the fault");
            activate(Some(fault));
            assert!(!contains(), "{fault:?} goes unnoticed, massless {massless}");
        }
        activate(None);
    }
}
