//! The dilogarithm `Li_2(x) = Sum_{k>=1} x^k/k^2 = -Int_0^x ln(1-y)/y dy` for real `x <= 1`.
//!
//! # Reduction to the series
//!
//! The identities hold on all of the stated ranges (NIST Digital Library of Mathematical Functions, section
//! 25.12, equations 25.12.3, 25.12.4 and 25.12.6, numbers cited from memory; each follows by differentiation),
//! so the choice between them by the size of the midpoint concerns cost only:
//!
//! ```text
//! x < 0:      Li_2(x) = -pi^2/6 - ln^2(-x)/2 - Li_2(1/x)
//! x < 1:      Li_2(x) = -ln^2(1-x)/2 - Li_2(x/(x-1))
//! 0 < x < 1:  Li_2(x) = pi^2/6 - ln(x) ln(1-x) - Li_2(1-x)
//! ```
//!
//! The complement `1 - x` is carried beside `x`, so nothing is lost next to `x = 1`.
//!
//! # The series and its error
//!
//! For `|x| <= 7/10` the sum `s(x) = Li_2(x)/x = Sum_{k>=1} x^(k-1)/k^2` is done in fixed point, in units
//! `2^-p`. Let `X` be the integer for `x`, off by at most `e` units (its ball and one rounding down), and
//! `|X| <= 3/4 * 2^p`.
//!
//! * Argument: `|s'| <= Sum_{k>=2} (k-1)/k^2 (3/4)^(k-2) <= (1/4) Sum_{j>=0} (3/4)^j = 1`, so it costs `e` units.
//! * Powers: one step multiplies what was off by at most `3/4`, adds one unit for rounding and `2^-8` for
//!   the argument, which is cut to eight bits more than the running power; so powers are off by less
//!   than five units.
//! * Terms: `5/k^2 + 1` units each, together less than `K + 4` for `K` terms.
//! * Tail: the sum stops before the first power of at most four units in size, whose true value is
//!   below nine units; the rest is at most `9/k^2 * 1/(1 - 3/4) <= 9` units for `k >= 2`.
//!
//! Together `e + K + 13` units, relative to `s(x) > 1/2`.
//!
//! # Balls
//!
//! `D(x) = Li_2'(x) = -ln(1-x)/x = Int_0^1 dy/(1-xy)` increases with `x`, so over a ball with upper end `u < 1`
//! the value moves by at most the radius times `D(u)`. For `u <= 0`, `D(u) <= 1` and, for `u <= -1`,
//! `D(u) = ln(1+|u|)/|u| <= log2(2|u|)/|u|`; for `0 < u < 1`, `D(u) <= 1 + ln(1/(1-u))`, because
//! `-c ln c <= 1 - c` for `0 < c <= 1`.

use super::elementary::{ln, pi};
use crate::arithmetic::{Bits, Magnitude, Real};
use rug::{Assign, Integer, Rational};
use std::cmp::Ordering;

/// Extra bits for the few operations around the series.
const GUARD: Bits = 12;

/// `Li_2(x)` for a ball; the whole line unless all of it lies below one (or it is exactly one).
///
/// ```
/// use coneproof::arithmetic::Real;
/// use coneproof::functions::dilogarithm::dilogarithm;
/// use coneproof::functions::elementary::pi;
/// let value = dilogarithm(&Real::from_i64(-1), 100);
/// let known = pi(100).square(100).div_u64(12, 100).neg();
/// assert!(value.overlaps(&known) && value.accuracy_estimate() > 98.0);
/// ```
pub fn dilogarithm(x: &Real, bits: Bits) -> Real {
    if !x.is_bounded() {
        return Real::whole_line();
    }
    let middle = Real::from_float(x.midpoint().clone());
    let complement = Real::from_i64(1).sub(&middle, bits + GUARD);
    let slope = if x.is_exact() { Magnitude::ZERO } else { largest_slope(x, &complement) };
    if slope.is_infinite() {
        return Real::whole_line();
    }
    value(&middle, &complement, bits).widen(slope.mul(x.radius()))
}

/// `Li_2(x)` for an exact argument; the whole line if it is above one.
pub fn dilogarithm_of_rational(x: &Rational, bits: Bits) -> Real {
    let complement = Rational::from(1 - x);
    let wide = bits + GUARD;
    value(&Real::from_rational(x, wide), &Real::from_rational(&complement, wide), bits)
}

/// Upper bound of `D` at the upper end of the ball, infinite unless that is below one.
fn largest_slope(x: &Real, complement: &Real) -> Magnitude {
    let distance = complement.abs_lower().sub_down(x.radius());
    if complement.certainly_negative() || distance.is_zero() {
        return Magnitude::INFINITY;
    }
    if x.certainly_negative() {
        // |u| is at least the lower bound, where log2(2|u|)/|u| is larger.
        let size = x.abs_lower();
        return match size.exponent() {
            // size >= 2^(e-1) and log2(2 size) < e + 1; from 4 on the quotient falls with |u|.
            Some(e) if e >= 3 => Magnitude::from_u64(e.unsigned_abs() + 1).div(size).min(Magnitude::ONE),
            _ => Magnitude::ONE,
        };
    }
    // ln(1/c) <= log2(1/c) <= 1 - e for c >= 2^(e-1).
    match distance.exponent() {
        Some(e) if e < 1 => Magnitude::from_u64(2 + e.unsigned_abs()),
        _ => Magnitude::ONE,
    }
}

/// `Li_2` of a narrow ball whose complement `1 - x` is given.
fn value(x: &Real, complement: &Real, bits: Bits) -> Real {
    let wide = bits + GUARD;
    let sixth = || pi(wide).square(wide).div_u64(6, wide);
    if complement.is_exact() && complement.may_be_zero() {
        return sixth().round(bits);
    }
    if !complement.certainly_positive() {
        return Real::whole_line();
    }
    let at = x.to_f64();
    let result = if at < -1.0 {
        let inverse = Real::from_i64(1).div(x, wide);
        let rest = value(&inverse, &Real::from_i64(1).sub(&inverse, wide), wide);
        let square = ln(&x.neg(), wide).square(wide).shift(-1);
        sixth().add(&square, wide).add(&rest, wide).neg()
    } else if at < -0.5 {
        let square = ln(complement, wide).square(wide).shift(-1);
        series(&x.div(complement, wide).neg(), wide).add(&square, wide).neg()
    } else if at <= 0.5 {
        series(x, wide)
    } else {
        let product = ln(x, wide).mul(&ln(complement, wide), wide);
        sixth().sub(&product, wide).sub(&series(complement, wide), wide)
    };
    result.round(bits)
}

/// `x s(x)` for `|x| <= 7/10`, else the whole line.
fn series(x: &Real, bits: Bits) -> Real {
    let most = Magnitude::from_u64(7).div(Magnitude::from_u64(10));
    if x.abs_upper().cmp_value(most) == Ordering::Greater {
        return Real::whole_line();
    }
    let scale = bits + 8 + Bits::BITS - bits.leading_zeros();
    let Some((mut argument, error)) = x.to_fixed(i64::from(scale)) else {
        return Real::whole_line();
    };
    let mut kept = scale;
    let mut sum = Integer::from(1) << scale;
    let mut power = argument.clone();
    let mut term = Integer::new();
    let mut k = 2u64;
    let spoilt = crate::spoil::is_active(crate::spoil::Fault::DilogarithmSeriesCut);
    let smallest = if spoilt { scale / 2 } else { 2 };
    while power.significant_bits() > smallest {
        term.assign(&power / (k * k));
        sum += &term;
        let used = power.significant_bits() + 8;
        if used < kept {
            argument >>= kept - used;
            kept = used;
        }
        power *= &argument;
        power >>= kept;
        k += 1;
    }
    let units = error.add(Magnitude::from_u64(k + 13));
    Real::from_scaled(&sum, -i64::from(scale)).widen(units.shift(-i64::from(scale))).mul(x, bits)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::functions::elementary::ln_2;
    use proptest::prelude::*;
    use rug::Float;

    fn rational(n: i64, d: i64) -> Rational {
        Rational::from((n, d))
    }

    /// Two enclosures of one number must meet, and the second must be narrow to `bits`.
    fn meets(known: &Real, found: &Real, bits: f64) -> bool {
        known.overlaps(found) && found.accuracy_estimate() > bits
    }

    // Special values: L. Lewin, Polylogarithms and Associated Functions, North-Holland 1981, section 1
    // (cited from memory): Li_2(1) = pi^2/6, Li_2(-1) = -pi^2/12, Li_2(1/2) = pi^2/12 - ln^2(2)/2.
    #[test]
    fn special_values() {
        for bits in [40, 53, 200, 1000, 4000] {
            let square = pi(bits + 20).square(bits + 20);
            let twelfth = square.div_u64(12, bits + 20);
            let half = twelfth.sub(&ln_2(bits + 20).square(bits + 20).shift(-1), bits + 20);
            let at = |n, d| dilogarithm_of_rational(&rational(n, d), bits);
            let wanted = f64::from(bits) - 3.0;
            assert!(meets(&square.div_u64(6, bits + 20), &at(1, 1), wanted));
            assert!(meets(&twelfth.neg(), &at(-1, 1), wanted));
            assert!(meets(&half, &at(1, 2), wanted));
            assert!(at(0, 1).contains_rational(&Rational::new()));
        }
    }

    #[test]
    fn outside_the_domain_nothing_is_known() {
        assert!(!dilogarithm_of_rational(&rational(3, 2), 64).is_bounded());
        assert!(!dilogarithm(&Real::from_i64(2), 64).is_bounded());
        assert!(!dilogarithm(&Real::whole_line(), 64).is_bounded());
        assert!(!dilogarithm(&Real::from_i64(1).widen(Magnitude::power_of_two(-40)), 64).is_bounded());
        assert!(dilogarithm(&Real::zero(), 64).contains_rational(&Rational::new()));
    }

    #[test]
    fn extreme_sizes() {
        for exponent in [-100_000, -2000, 2000, 100_000] {
            let x = Real::from_float(Float::with_val(53, Float::i_exp(-3, exponent)));
            let inverse = Real::from_i64(1).div(&x, 200);
            let sum = dilogarithm(&x, 100).add(&dilogarithm(&inverse, 100), 120);
            let known = pi(120).square(120).div_u64(6, 120).add(&ln(&x.neg(), 120).square(120).shift(-1), 120).neg();
            assert!(meets(&known, &sum, 95.0));
        }
        // Next to one: Li_2(1 - y) = pi^2/6 - y (1 - ln y) + O(y^2 ln y).
        let y = Rational::from(1) >> 300u32;
        let value = dilogarithm_of_rational(&Rational::from(1 - &y), 400);
        let small = Real::from_rational(&y, 400);
        let slope = Real::from_i64(1).sub(&ln(&small, 400), 400);
        let known = pi(420).square(420).div_u64(6, 420).sub(&small.mul(&slope, 400), 420);
        assert!(meets(&known.widen(Magnitude::power_of_two(-580)), &value, 395.0));
    }

    proptest! {
        /// Duplication, DLMF 25.12.5 with m = 2 (number cited from memory): not used by the code.
        #[test]
        fn duplication(n in 1i64..1_000_000, d in 1i64..1_000_000, bits in 40u32..600) {
            let x = rational(n.min(d), n.max(d));
            let at = |y: &Rational| dilogarithm_of_rational(y, bits);
            let sum = at(&x).add(&at(&Rational::from(-&x)), bits).shift(1);
            prop_assert!(sum.overlaps(&at(&Rational::from(&x * &x))));
        }

        /// The five-term relation (Lewin 1981, section 1.5, cited from memory) ties far-apart arguments together.
        #[test]
        fn five_terms(a in 1i64..999, b in 1i64..999, bits in 60u32..500) {
            let (x, y) = (rational(a, 1000), rational(b, 1000));
            let one = Rational::from(1);
            let below = &one - Rational::from(&x * &y);
            let u = &x * Rational::from(&one - &y) / &below;
            let v = &y * Rational::from(&one - &x) / &below;
            let at = |z: &Rational| dilogarithm_of_rational(z, bits);
            let log = |z: &Rational| ln(&Real::from_rational(&Rational::from(&one - z), bits), bits);
            // Li(x) + Li(y) - Li(xy) = Li(u) + Li(v) + ln(1-u) ln(1-v), with 1-u = (1-x)/(1-xy).
            let left = at(&x).add(&at(&y), bits).sub(&at(&Rational::from(&x * &y)), bits);
            let right = at(&u).add(&at(&v), bits).add(&log(&u).mul(&log(&v), bits), bits);
            prop_assert!(left.overlaps(&right));
        }

        /// The value at a point of a ball lies in the value of the ball.
        #[test]
        fn balls_contain_their_points(size in -30f64..30.0, negative: bool, spread in 2u32..80, at in -1.0f64..1.0) {
            let middle = if negative { -size.exp() } else { 1.0 / (1.0 + size.exp()) };
            let radius = if negative { -middle } else { middle.min(1.0 - middle) } / 2f64.powi(spread as i32);
            let ball = Real::new(Float::with_val(53, middle), Magnitude::from_float(&Float::with_val(53, radius)));
            let point = Float::with_val(300, middle) + Float::with_val(300, radius) * at;
            let wide = dilogarithm(&ball, 150);
            let narrow = dilogarithm(&Real::from_float(point), 250);
            prop_assert!(wide.is_bounded() && narrow.accuracy_estimate() > 245.0);
            prop_assert!(wide.to_interval(300).contains(&narrow.to_interval(300)));
            // Not much wider than the spread of the argument makes it.
            prop_assert!(wide.accuracy_estimate() > f64::from(spread).min(145.0) - 8.0);
        }
    }
}
