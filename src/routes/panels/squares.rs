//! `Int |Q|^2` over a panel.
//!
//! If a component of `Q` is the computed `P`, bounded by `c`, up to an error `e`, its square is off by at most
//! `e (2 c + e)`; over a panel of length two that is twice as much, and at the cone `Int_0^1 (1 + |ln y|)^2 dy = 5`
//! times as much.

use super::expansion::Expansion;
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::routes::kernel::edge;
use crate::routes::kernel::squares::signed_integral;
use rug::{Integer, Rational};

/// `Int_(-1)^1 |Q|^2 dx`, where each component of `Q` is at most `size`.
pub(super) fn on_panel(q: &Expansion, size: Magnitude, scale: u32) -> Real {
    let bound = q.bound(scale).min(size.add(q.error));
    let slack = bound.shift(1).add(q.error).mul(q.error).shift(1);
    let mut total = Real::zero();
    for list in [&q.regular.re, &q.regular.im] {
        if list.is_empty() {
            // The component is zero up to the error.
            total = total.widen(q.error.mul(q.error).shift(1));
        } else {
            total = total.add(&signed_integral(list, scale).widen(slack), scale + 64);
        }
    }
    total
}

/// `Int_start^1 |Q|^2 dy` at the cone.
pub(super) fn at_cone(q: &Expansion, start: &Rational, scale: u32, bits: Bits) -> Real {
    let bound = q.bound(scale);
    let slack = bound.shift(1).add(q.error).mul(q.error).mul(Magnitude::from_u64(5));
    let mut total = Real::zero();
    let components: [(&[Integer], &[Integer]); 2] =
        [(&q.regular.re, &q.logarithm.re), (&q.regular.im, &q.logarithm.im)];
    for (regular, logarithm) in components {
        if regular.is_empty() && logarithm.is_empty() {
            total = total.widen(q.error.mul(q.error).mul(Magnitude::from_u64(5)));
        } else {
            total = total.add(&edge::moments(regular, logarithm, start, scale, bits).widen(slack), bits);
        }
    }
    total
}
