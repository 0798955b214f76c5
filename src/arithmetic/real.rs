//! Real balls: an MPFR midpoint and a [`Magnitude`] radius.
//!
//! Every operation takes the working precision in bits as its last argument. With midpoints
//! `a, b`, radii `r, s` and `e` the rounding error of the new midpoint (from
//! [`super::rounding`]), the radii are
//!
//! * sum, difference: `r + s + e`;
//! * product: `|a| s + |b| r + r s + e`, from `(a+x)(b+y) - ab = ay + bx + xy`;
//! * quotient: `(|a| s + |b| r) / (|b| (|b| - s)) + e`, from
//!   `(a+x)/(b+y) - a/b = (bx - ay) / (b (b+y))`; infinite if the divisor contains zero.
//!
//! Elementary functions of balls are in [`crate::functions::elementary`].

use super::{Bits, Interval, Magnitude, rounding};
use rug::{Float, Integer, Rational};
use std::cmp::Ordering;

/// A set of real numbers `|x - midpoint| <= radius`.
///
/// There is deliberately no `==`, no `<` and no conversion from `f64`: a question about an
/// enclosure is either [certain](Real::certainly_less) or [possible](Real::possibly_less).
///
/// ```
/// use coneproof::arithmetic::Real;
/// use rug::Rational;
/// let third = Real::from_rational(&Rational::from((1, 3)), 100);
/// let one = third.mul(&Real::from_i64(3), 100);
/// assert!(one.contains_rational(&Rational::from(1)));
/// ```
#[derive(Clone, Debug)]
pub struct Real {
    midpoint: Float,
    radius: Magnitude,
}

impl Real {
    /// A ball from its parts; a midpoint that is not finite makes the ball the whole line.
    pub fn new(midpoint: Float, radius: Magnitude) -> Real {
        if midpoint.is_finite() { Real { midpoint, radius } } else { Real::whole_line() }
    }

    /// The set of all reals: nothing known.
    pub fn whole_line() -> Real {
        Real { midpoint: Float::new(rounding::MIN_BITS), radius: Magnitude::INFINITY }
    }

    /// Exactly zero.
    pub fn zero() -> Real {
        Real { midpoint: Float::new(rounding::MIN_BITS), radius: Magnitude::ZERO }
    }

    /// Exactly `value`.
    pub fn from_i64(value: i64) -> Real {
        let (midpoint, radius) = rounding::nearest(64, value);
        Real { midpoint, radius }
    }

    /// The float itself, exactly.
    pub fn from_float(value: Float) -> Real {
        Real::new(value, Magnitude::ZERO)
    }

    /// `value` rounded to `bits` bits, with the rounding error.
    pub fn from_integer(value: &Integer, bits: Bits) -> Real {
        let (midpoint, radius) = rounding::nearest(bits, value);
        Real::new(midpoint, radius)
    }

    /// `value` rounded to `bits` bits, with the rounding error.
    pub fn from_rational(value: &Rational, bits: Bits) -> Real {
        let (midpoint, radius) = rounding::nearest(bits, value);
        Real::new(midpoint, radius)
    }

    /// The smallest ball of the given precision around a closed interval.
    pub fn from_interval(interval: &Interval, bits: Bits) -> Real {
        let (lower, upper) = (interval.lower(), interval.upper());
        if !lower.is_finite() || !upper.is_finite() {
            return Real::whole_line();
        }
        let (sum, _) = rounding::nearest(bits, lower + upper);
        let (midpoint, _) = rounding::nearest(bits, &sum >> 1u32);
        let above = Magnitude::from_float(&rounding::up(32, upper - &midpoint));
        let below = Magnitude::from_float(&rounding::up(32, &midpoint - lower));
        Real::new(midpoint, above.max(below))
    }

    /// `mantissa * 2^exponent` exactly.
    pub fn from_scaled(mantissa: &Integer, exponent: i64) -> Real {
        let bits = mantissa.significant_bits().max(rounding::MIN_BITS);
        let (midpoint, radius) = rounding::nearest(bits, mantissa);
        Real::new(midpoint, radius).shift(exponent)
    }

    /// The midpoint.
    pub fn midpoint(&self) -> &Float {
        &self.midpoint
    }

    /// The radius.
    pub fn radius(&self) -> Magnitude {
        self.radius
    }

    /// The same ball made wider by `extra`.
    pub fn widen(mut self, extra: Magnitude) -> Real {
        self.radius = self.radius.add(extra);
        self
    }

    /// The ball with its midpoint rounded to `bits` bits.
    pub fn round(&self, bits: Bits) -> Real {
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint);
        Real::new(midpoint, self.radius.add(error))
    }

    /// Whether something is known about the number.
    pub fn is_bounded(&self) -> bool {
        !self.radius.is_infinite()
    }

    /// Whether the ball is a single point.
    pub fn is_exact(&self) -> bool {
        self.radius.is_zero()
    }

    // ----- arithmetic -------------------------------------------------------------------------

    /// Minus the ball.
    pub fn neg(&self) -> Real {
        Real { midpoint: -self.midpoint.clone(), radius: self.radius }
    }

    /// Sum.
    pub fn add(&self, other: &Real, bits: Bits) -> Real {
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint + &other.midpoint);
        Real::new(midpoint, self.radius.add(other.radius).add(error))
    }

    /// Difference.
    pub fn sub(&self, other: &Real, bits: Bits) -> Real {
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint - &other.midpoint);
        Real::new(midpoint, self.radius.add(other.radius).add(error))
    }

    /// Product.
    pub fn mul(&self, other: &Real, bits: Bits) -> Real {
        let (midpoint, mut error) = rounding::nearest(bits, &self.midpoint * &other.midpoint);
        if crate::spoil::is_active(crate::spoil::Fault::ProductRoundingForgotten) {
            error = Magnitude::ZERO;
        }
        Real::new(midpoint, product_radius(self, other).add(error))
    }

    /// Adds `other` to this ball in place, keeping this ball's precision.
    pub fn add_in_place(&mut self, other: &Real, bits: Bits) {
        if self.midpoint.prec() < bits {
            self.midpoint.set_prec(bits);
        }
        let sum = rounding::add_into(&mut self.midpoint, &other.midpoint);
        self.radius = self.radius.add(other.radius).add(sum);
        self.settle();
    }

    /// Multiplies this ball by `other` in place, keeping this ball's precision.
    pub fn mul_in_place(&mut self, other: &Real, bits: Bits) {
        let spread = product_radius(self, other);
        if self.midpoint.prec() < bits {
            self.midpoint.set_prec(bits);
        }
        let error = rounding::mul_into(&mut self.midpoint, &other.midpoint);
        self.radius = spread.add(error);
        self.settle();
    }

    fn settle(&mut self) {
        if !self.midpoint.is_finite() {
            *self = Real::whole_line();
        }
    }

    /// Square; tighter than the product with itself.
    pub fn square(&self, bits: Bits) -> Real {
        let (midpoint, error) = rounding::nearest(bits, self.midpoint.square_ref());
        let size = Magnitude::from_float(&self.midpoint);
        let spread = size.shift(1).mul(self.radius).add(self.radius.mul(self.radius));
        Real::new(midpoint, if self.radius.is_zero() { error } else { spread.add(error) })
    }

    /// Quotient; the whole line if the divisor may be zero.
    pub fn div(&self, other: &Real, bits: Bits) -> Real {
        let size = Magnitude::from_float_down(&other.midpoint);
        let smallest = size.sub_down(other.radius);
        if smallest.is_zero() {
            return Real::whole_line();
        }
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint / &other.midpoint);
        let spread = if self.radius.is_zero() && other.radius.is_zero() {
            Magnitude::ZERO
        } else {
            let quotient = Magnitude::from_float(&self.midpoint).div(size);
            quotient.mul(other.radius).add(self.radius).div(smallest)
        };
        Real::new(midpoint, spread.add(error))
    }

    /// Product with a small integer.
    pub fn mul_i64(&self, factor: i64, bits: Bits) -> Real {
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint * factor);
        Real::new(midpoint, self.radius.mul(Magnitude::from_u64(factor.unsigned_abs())).add(error))
    }

    /// Quotient by a small positive integer (zero gives the whole line).
    pub fn div_u64(&self, divisor: u64, bits: Bits) -> Real {
        if divisor == 0 {
            return Real::whole_line();
        }
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint / divisor);
        // A divisor above 2^32 is not exact as a magnitude: round it down.
        let below = Magnitude::from_float_down(&rounding::down(64, divisor));
        Real::new(midpoint, self.radius.div(below).add(error))
    }

    /// Exact product with `2^shift`, the whole line if the exponent does not fit.
    pub fn shift(&self, shift: i64) -> Real {
        if !self.is_bounded() {
            return Real::whole_line();
        }
        let Ok(by) = i32::try_from(shift) else {
            return Real::whole_line();
        };
        let bits = self.midpoint.prec();
        let (midpoint, error) = rounding::nearest(bits, &self.midpoint << by);
        Real::new(midpoint, self.radius.shift(shift).add(error))
    }

    /// Absolute value.
    pub fn abs(&self) -> Real {
        if self.midpoint.is_sign_negative() { self.neg() } else { self.clone() }
    }

    // ----- bounds and questions ---------------------------------------------------------------

    /// Upper bound of `|x|`.
    pub fn abs_upper(&self) -> Magnitude {
        Magnitude::from_float(&self.midpoint).add(self.radius)
    }

    /// Lower bound of `|x|`, zero if the ball contains zero.
    pub fn abs_lower(&self) -> Magnitude {
        Magnitude::from_float_down(&self.midpoint).sub_down(self.radius)
    }

    /// A number not above any point of the ball.
    pub fn lower(&self, bits: Bits) -> Float {
        rounding::down(bits, &self.midpoint - &self.radius.to_float())
    }

    /// A number not below any point of the ball.
    pub fn upper(&self, bits: Bits) -> Float {
        rounding::up(bits, &self.midpoint + &self.radius.to_float())
    }

    /// The ball as a directed interval of the given precision.
    pub fn to_interval(&self, bits: Bits) -> Interval {
        Interval::new(self.lower(bits), self.upper(bits))
    }

    /// Whether every point is above zero.
    pub fn certainly_positive(&self) -> bool {
        self.midpoint.is_sign_positive() && !self.abs_lower().is_zero()
    }

    /// Whether every point is below zero.
    pub fn certainly_negative(&self) -> bool {
        self.midpoint.is_sign_negative() && !self.abs_lower().is_zero()
    }

    /// Whether every point of this ball is below every point of the other.
    pub fn certainly_less(&self, other: &Real) -> bool {
        let bits = self.midpoint.prec().max(other.midpoint.prec()).max(64);
        self.is_bounded() && other.is_bounded() && self.upper(bits) < other.lower(bits)
    }

    /// Whether some point of this ball is below some point of the other.
    pub fn possibly_less(&self, other: &Real) -> bool {
        let bits = self.midpoint.prec().max(other.midpoint.prec()).max(64);
        !(self.is_bounded() && other.is_bounded() && self.lower(bits) >= other.upper(bits))
    }

    /// Whether the two balls may share a point.
    pub fn overlaps(&self, other: &Real) -> bool {
        !self.certainly_less(other) && !other.certainly_less(self)
    }

    /// Whether the number is in the ball.
    pub fn contains_rational(&self, value: &Rational) -> bool {
        match (self.midpoint.to_rational(), self.radius.to_float().to_rational()) {
            (Some(midpoint), Some(radius)) => (midpoint - value).abs() <= radius,
            _ => true,
        }
    }

    /// Whether the ball contains zero (or may do so).
    pub fn may_be_zero(&self) -> bool {
        self.abs_lower().is_zero()
    }

    /// Bits of relative accuracy, for steering only: `log2(|midpoint| / radius)`.
    pub fn accuracy_estimate(&self) -> f64 {
        if self.radius.is_zero() {
            f64::INFINITY
        } else {
            Magnitude::from_float(&self.midpoint).log2_estimate() - self.radius.log2_estimate()
        }
    }

    /// The midpoint as a double, for steering only.
    pub fn to_f64(&self) -> f64 {
        self.midpoint.to_f64()
    }

    /// `floor(x * 2^scale)` of the midpoint, and the bound of `|x * 2^scale - floor|` in units.
    pub fn to_fixed(&self, scale: i64) -> Option<(Integer, Magnitude)> {
        if !self.is_bounded() {
            return None;
        }
        let shifted = self.shift(scale);
        let value = shifted.midpoint.to_integer_round(rug::float::Round::Down)?.0;
        Some((value, shifted.radius.add(Magnitude::ONE)))
    }

    /// Compares midpoints, for steering only.
    pub fn steer_cmp(&self, other: &Real) -> Ordering {
        self.midpoint.partial_cmp(&other.midpoint).unwrap_or(Ordering::Equal)
    }
}

/// `|a| s + |b| r + r s` without touching large numbers when both balls are exact.
fn product_radius(x: &Real, y: &Real) -> Magnitude {
    if x.radius.is_zero() && y.radius.is_zero() {
        return Magnitude::ZERO;
    }
    let left = Magnitude::from_float(&x.midpoint);
    let right = Magnitude::from_float(&y.midpoint);
    left.mul(y.radius).add(right.mul(x.radius)).add(x.radius.mul(y.radius))
}
