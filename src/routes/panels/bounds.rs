//! The bounds of Lemmas N2 and N3 (see [`super`]).

use super::Side;
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::{exp, pi, sqrt};
use crate::routes::kernel::{BOUND_BITS, separation};
use rug::Rational;

/// `e^(-r) (1 + 1/(2r)) sqrt(pi/(2r))`: Lemma N2 at `v = t + s`, with `r`.
fn k1_bound(time: &Rational, s: &Rational) -> (Real, Real) {
    let bits = BOUND_BITS;
    let r = separation(time, s);
    let correction = Real::from_i64(1).add(&Real::from_i64(1).div(&r.shift(1), bits), bits);
    let root = sqrt(&pi(bits).div(&r.shift(1), bits), bits);
    (exp(&r.neg(), bits).mul(&root, bits).mul(&correction, bits), r)
}

/// `2 a N`.
fn mass_bound(side: &Side) -> Real {
    Real::from_rational(&(Rational::from(&side.shape.half_width * 2) * &side.shape.norm), BOUND_BITS)
}

/// Bound of `g` at `v = t + s`, infinite if `s` is not positive.
pub(super) fn kernel_bound(time: &Rational, s: &Rational) -> Magnitude {
    if *s <= 0 {
        return Magnitude::INFINITY;
    }
    let (k1, r) = k1_bound(time, s);
    k1.div(&r, BOUND_BITS).abs_upper()
}

/// Lemma N3 for `|Q|` at `s` and beyond.
pub(super) fn size_bound(side: &Side, s: &Rational) -> Magnitude {
    sqrt(&mass_bound(side), BOUND_BITS).abs_upper().mul(kernel_bound(&side.time, s))
}

/// Lemma N3 for the integral of `|Q|^2` beyond `s`.
pub(super) fn tail_bound(side: &Side, s: &Rational) -> Magnitude {
    if crate::spoil::is_active(crate::spoil::Fault::PiecewiseTailForgotten) {
        return Magnitude::ZERO;
    }
    let bits = BOUND_BITS;
    let (k1, r) = k1_bound(&side.time, s);
    let v = Real::from_rational(&Rational::from(&side.time + s), bits);
    // K_1^2/2 over r v.
    k1.square(bits).shift(-1).div(&r.mul(&v, bits), bits).mul(&mass_bound(side), bits).abs_upper()
}
