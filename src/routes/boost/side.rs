//! One side of the packet, its cones, and lengths such as `R - t - a e^theta` with a certain sign.
//!
//! **Zero or not.** For a velocity `v` the numbers `e^theta` and `sinh(theta)` are square roots of rationals, so
//! `r + s e^theta = 0` is decided by comparing squares. For a rational rapidity other than zero both are
//! transcendental (Lindemann's theorem), so with rational `r` and `s != 0` the sum is never zero, and more bits
//! show its sign.

use super::out_of_reach;
use crate::arithmetic::{Bits, Real};
use crate::functions::elementary::sqrt;
use crate::packets::Boost;
use crate::routes::RouteFailure;
use rug::Rational;
use std::cmp::Ordering;

/// Precision at which an undecided sign is given up.
const SIGN_BITS: Bits = 1 << 15;

/// A right side with `a sinh(theta) + t >= 0`.
#[derive(Clone, Debug)]
pub(super) struct Side {
    pub half_width: Rational,
    pub boost: Boost,
    pub time: Rational,
}

/// An irrational factor of the frame.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Factor {
    /// `e^theta`
    Growth,
    /// `e^-theta`
    Decay,
    /// `sinh(theta)`
    Sinh,
}

impl Factor {
    pub(super) fn value(self, boost: &Boost, bits: Bits) -> Real {
        let bits = bits + 8;
        let (growth, excess) = boost.growth(bits);
        match self {
            Factor::Growth => growth,
            Factor::Decay => Real::from_i64(1).div(&growth, bits),
            Factor::Sinh => excess.mul(&growth.add(&Real::from_i64(1), bits), bits).div(&growth.shift(1), bits),
        }
    }

    /// The square, where it is rational.
    fn square(self, boost: &Boost) -> Option<Rational> {
        let square = boost.growth_squared()?;
        Some(match self {
            Factor::Growth => square,
            Factor::Decay => square.recip(),
            Factor::Sinh => {
                let excess = Rational::from(&square - 1);
                Rational::from(&excess * &excess) / (square * 4)
            }
        })
    }

    fn sign(self, boost: &Boost) -> Ordering {
        match self {
            Factor::Growth | Factor::Decay => Ordering::Greater,
            Factor::Sinh if boost.is_rest() => Ordering::Equal,
            Factor::Sinh if boost.is_negative() => Ordering::Less,
            Factor::Sinh => Ordering::Greater,
        }
    }
}

/// `r + s f`: exactly zero, or a ball of certain sign with `bits` bits of relative accuracy.
pub(super) fn length(
    r: &Rational,
    s: &Rational,
    factor: Factor,
    boost: &Boost,
    bits: Bits,
) -> Result<Real, RouteFailure> {
    let product_sign = factor.sign(boost);
    let opposed = r.cmp0() == combine(s.cmp0(), product_sign).reverse();
    if opposed {
        if r.cmp0() == Ordering::Equal {
            return Ok(Real::zero());
        }
        if factor.square(boost).is_some_and(|square| Rational::from(r * r) == Rational::from(s * s) * square) {
            return Ok(Real::zero());
        }
    }
    let mut precision = bits + 16;
    loop {
        let product = Real::from_rational(s, precision).mul(&factor.value(boost, precision), precision);
        let sum = Real::from_rational(r, precision).add(&product, precision);
        if sum.accuracy_estimate() >= f64::from(bits) && !sum.may_be_zero() {
            return Ok(sum);
        }
        if precision > SIGN_BITS.max(bits.saturating_mul(8)) {
            return Err(out_of_reach("the region's edge is too near a light cone to tell the two apart"));
        }
        precision *= 2;
    }
}

fn combine(left: Ordering, right: Ordering) -> Ordering {
    match left {
        Ordering::Equal => Ordering::Equal,
        Ordering::Greater => right,
        Ordering::Less => right.reverse(),
    }
}

impl Side {
    /// The right side at time `t`, reversed if need be.
    pub(super) fn new(half_width: &Rational, boost: &Boost, time: &Rational) -> Result<Side, RouteFailure> {
        let lead = length(time, half_width, Factor::Sinh, boost, 16)?;
        let half_width = half_width.clone();
        if lead.certainly_negative() {
            return Ok(Side { half_width, boost: boost.reversed(), time: Rational::from(-time) });
        }
        Ok(Side { half_width, boost: boost.clone(), time: time.clone() })
    }

    /// `r + s a f` for `s = ±1`.
    pub(super) fn distance(&self, r: &Rational, s: i32, factor: Factor, bits: Bits) -> Result<Real, RouteFailure> {
        length(r, &Rational::from(&self.half_width * s), factor, &self.boost, bits)
    }

    /// The lead `l = a sinh(theta) + t`, not negative.
    pub(super) fn lead(&self, bits: Bits) -> Result<Real, RouteFailure> {
        self.distance(&self.time, 1, Factor::Sinh, bits)
    }
}

/// Functions of the signed rapidity as balls.
pub(super) struct Frame {
    /// `e^theta`
    pub growth: Real,
    /// `e^(theta/2)`
    pub root: Real,
    /// `q = sinh(|theta|/2)`
    pub q: Real,
    /// `c = cosh(theta/2)`
    pub c: Real,
    /// `e^(|theta|/2)`
    pub slope: Real,
}

impl Frame {
    pub(super) fn new(boost: &Boost, bits: Bits) -> Frame {
        let work = bits + 8;
        let (growth, excess) = boost.growth(work);
        let root = sqrt(&growth, work);
        let one = Real::from_i64(1);
        let q = excess.div(&root.shift(1), work).abs();
        let c = growth.add(&one, work).div(&root.shift(1), work);
        let slope = if boost.is_negative() { one.div(&root, work) } else { root.clone() };
        Frame { growth, root, q, c, slope }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn signs_and_zeros_are_certain() {
        let half = Rational::from((1, 2));
        let velocity = Boost::Velocity(Rational::from((3, 5)));
        // a e^theta = 1/2 * 2, a sinh(theta) = 1/2 * 3/4.
        let zero = length(&Rational::from(-1), &half, Factor::Growth, &velocity, 60).unwrap();
        assert!(zero.is_exact() && zero.may_be_zero());
        let zero = length(&Rational::from((-3, 8)), &half, Factor::Sinh, &velocity, 60).unwrap();
        assert!(zero.is_exact() && zero.may_be_zero());
        let one = length(&Rational::from(1), &half, Factor::Growth, &velocity, 60).unwrap();
        assert!(one.contains_rational(&Rational::from(2)));
        // e = 2.718281828459045235360287471352662497757...
        let near: Rational = "2718281828459045235360287471352662497757".parse().unwrap();
        let near = near / rug::Integer::from(rug::Integer::u_pow_u(10, 39));
        let gap = length(&-near, &Rational::from(1), Factor::Growth, &Boost::Rapidity(Rational::from(1)), 60).unwrap();
        assert!(gap.certainly_positive() && gap.to_f64() < 1e-39 && gap.accuracy_estimate() > 59.0);
        let side = Side::new(&half, &velocity, &Rational::from(-3)).unwrap();
        assert!(side.boost.is_negative() && side.time == 3);
    }
}
