//! Upper bounds with a huge exponent range: the radii of all balls.
//!
//! A [`Magnitude`] is `mantissa * 2^exponent` with a mantissa in `[2^31, 2^32)`, or zero, or
//! infinity. Every operation returns a value that is **at least** the exact result (relative
//! excess at most `2^-30`), unless its name ends in `_down`, when it is at most the exact result.
//! Exponents saturate far outside what MPFR can represent: too large becomes infinity, too small
//! becomes the smallest positive magnitude; for `_down`, the largest finite one and zero.

use rug::Float;
use std::cmp::Ordering;

/// Exponents outside `[-EXPONENT_LIMIT, EXPONENT_LIMIT]` saturate.
const EXPONENT_LIMIT: i64 = 1 << 50;

/// A non-negative number used as a proven upper bound.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Magnitude {
    mantissa: u32,
    exponent: i64,
}

// Named methods, not operators: they round up, which an operator would not show.
#[allow(clippy::should_implement_trait)]
impl Magnitude {
    /// Exactly zero.
    pub const ZERO: Magnitude = Magnitude { mantissa: 0, exponent: 0 };
    /// No bound known.
    pub const INFINITY: Magnitude = Magnitude { mantissa: u32::MAX, exponent: i64::MAX };
    /// Exactly one.
    pub const ONE: Magnitude = Magnitude { mantissa: 1 << 31, exponent: -31 };

    /// Exactly `2^exponent` (saturating).
    pub fn power_of_two(exponent: i64) -> Magnitude {
        Magnitude::saturate(1 << 31, exponent.saturating_sub(31))
    }

    /// An upper bound of `value`, exact below `2^32`.
    pub fn from_u64(value: u64) -> Magnitude {
        Magnitude::normalise_up(value, 0)
    }

    /// An upper bound of `|value|`; NaN and infinities give infinity.
    pub fn from_float(value: &Float) -> Magnitude {
        Magnitude::of_float(value, true)
    }

    /// A lower bound of `|value|`; NaN gives zero.
    pub fn from_float_down(value: &Float) -> Magnitude {
        Magnitude::of_float(value, false)
    }

    fn of_float(value: &Float, up: bool) -> Magnitude {
        if !value.is_finite() {
            return if up || value.is_infinite() { Magnitude::INFINITY } else { Magnitude::ZERO };
        }
        if value.is_zero() {
            return Magnitude::ZERO;
        }
        let direction = if up { rug::float::Round::AwayZero } else { rug::float::Round::Zero };
        let (fraction, exponent) = value.to_f64_exp_round(direction);
        // 0.5 <= |fraction| <= 1 has 53 bits, so scaling by 2^53 is exact.
        let scaled = (fraction.abs() * 9_007_199_254_740_992.0) as u64;
        let exponent = i64::from(exponent) - 53;
        if up { Magnitude::normalise_up(scaled, exponent) } else { Magnitude::normalise_down(scaled, exponent) }
    }

    fn saturate(mantissa: u32, exponent: i64) -> Magnitude {
        if exponent > EXPONENT_LIMIT {
            Magnitude::INFINITY
        } else if exponent < -EXPONENT_LIMIT {
            Magnitude { mantissa: 1 << 31, exponent: -EXPONENT_LIMIT }
        } else {
            Magnitude { mantissa, exponent }
        }
    }

    fn normalise_up(value: u64, exponent: i64) -> Magnitude {
        if value == 0 {
            return Magnitude::ZERO;
        }
        let shift = 32 - i64::from(value.leading_zeros());
        if shift <= 0 {
            return Magnitude::saturate((value << -shift) as u32, exponent + shift);
        }
        let kept = value >> shift;
        let lost = value & ((1u64 << shift) - 1) != 0;
        let rounded = kept + u64::from(lost && !crate::spoil::is_active(crate::spoil::Fault::RadiusRoundedDown));
        if rounded >> 32 != 0 {
            Magnitude::saturate(1 << 31, exponent + shift + 1)
        } else {
            Magnitude::saturate(rounded as u32, exponent + shift)
        }
    }

    fn normalise_down(value: u64, exponent: i64) -> Magnitude {
        if value == 0 {
            return Magnitude::ZERO;
        }
        let shift = 32 - i64::from(value.leading_zeros());
        let mantissa = if shift <= 0 { value << -shift } else { value >> shift };
        let exponent = exponent.saturating_add(shift);
        if exponent < -EXPONENT_LIMIT {
            Magnitude::ZERO
        } else if exponent > EXPONENT_LIMIT {
            // Infinity would not be a lower bound of a finite number.
            Magnitude { mantissa: u32::MAX, exponent: EXPONENT_LIMIT }
        } else {
            Magnitude { mantissa: mantissa as u32, exponent }
        }
    }

    /// Whether this is exactly zero.
    pub fn is_zero(self) -> bool {
        self.mantissa == 0
    }

    /// Whether this bounds nothing.
    pub fn is_infinite(self) -> bool {
        self.exponent == i64::MAX
    }

    /// Upper bound of the sum.
    pub fn add(self, other: Magnitude) -> Magnitude {
        let (big, small) = if self.cmp_value(other) == Ordering::Less { (other, self) } else { (self, other) };
        if small.is_zero() || big.is_infinite() {
            return big;
        }
        let gap = big.exponent - small.exponent;
        let tail = if gap >= 62 { 1 } else { ((u64::from(small.mantissa) << 30) >> gap) + 1 };
        Magnitude::normalise_up((u64::from(big.mantissa) << 30) + tail, big.exponent - 30)
    }

    /// Upper bound of the product.
    pub fn mul(self, other: Magnitude) -> Magnitude {
        if self.is_zero() || other.is_zero() {
            // Nothing known times exactly zero is still nothing known.
            return if self.is_infinite() || other.is_infinite() { Magnitude::INFINITY } else { Magnitude::ZERO };
        }
        if self.is_infinite() || other.is_infinite() {
            return Magnitude::INFINITY;
        }
        Magnitude::normalise_up(u64::from(self.mantissa) * u64::from(other.mantissa), self.exponent + other.exponent)
    }

    /// Lower bound of the product.
    pub fn mul_down(self, other: Magnitude) -> Magnitude {
        if self.is_zero() || other.is_zero() {
            return Magnitude::ZERO;
        }
        if self.is_infinite() || other.is_infinite() {
            return Magnitude::INFINITY;
        }
        Magnitude::normalise_down(u64::from(self.mantissa) * u64::from(other.mantissa), self.exponent + other.exponent)
    }

    /// Upper bound of the quotient; `divisor` must be a lower bound of the true divisor.
    pub fn div(self, divisor: Magnitude) -> Magnitude {
        if divisor.is_zero() || self.is_infinite() {
            return Magnitude::INFINITY;
        }
        if self.is_zero() || divisor.is_infinite() {
            return self.min(Magnitude { mantissa: 1 << 31, exponent: -EXPONENT_LIMIT });
        }
        let numerator = u64::from(self.mantissa) << 32;
        let quotient = numerator / u64::from(divisor.mantissa);
        let exact = quotient * u64::from(divisor.mantissa) == numerator;
        Magnitude::normalise_up(quotient + u64::from(!exact), self.exponent - divisor.exponent - 32)
    }

    /// Lower bound of `self - other`, zero if that is negative; `self` must be a lower bound.
    pub fn sub_down(self, other: Magnitude) -> Magnitude {
        if other.is_zero() {
            return self;
        }
        if other.cmp_value(self) != Ordering::Less {
            return Magnitude::ZERO;
        }
        if self.is_infinite() {
            return self;
        }
        let gap = self.exponent - other.exponent;
        let tail = if gap >= 62 { 1 } else { ((u64::from(other.mantissa) << 30) >> gap) + 1 };
        Magnitude::normalise_down((u64::from(self.mantissa) << 30).saturating_sub(tail), self.exponent - 30)
    }

    /// Upper bound of the square root.
    pub fn sqrt(self) -> Magnitude {
        if self.is_zero() || self.is_infinite() {
            return self;
        }
        let odd = self.exponent.rem_euclid(2);
        let scaled = u64::from(self.mantissa) << (30 + odd);
        Magnitude::normalise_up(scaled.isqrt() + 1, (self.exponent - odd - 30) / 2)
    }

    /// Upper bound of the power, by repeated squaring.
    pub fn pow(self, mut power: u64) -> Magnitude {
        let mut base = self;
        let mut result = Magnitude::ONE;
        while power > 0 {
            if power & 1 == 1 {
                result = result.mul(base);
            }
            base = base.mul(base);
            power >>= 1;
        }
        result
    }

    /// Exact product with `2^shift`.
    pub fn shift(self, shift: i64) -> Magnitude {
        if self.is_zero() || self.is_infinite() {
            self
        } else {
            Magnitude::saturate(self.mantissa, self.exponent.saturating_add(shift))
        }
    }

    /// The larger one.
    pub fn max(self, other: Magnitude) -> Magnitude {
        if self.cmp_value(other) == Ordering::Less { other } else { self }
    }

    /// The smaller one.
    pub fn min(self, other: Magnitude) -> Magnitude {
        if self.cmp_value(other) == Ordering::Greater { other } else { self }
    }

    /// Exact comparison of the two stored numbers.
    pub fn cmp_value(self, other: Magnitude) -> Ordering {
        match (self.is_zero(), other.is_zero()) {
            (true, true) => Ordering::Equal,
            (true, false) => Ordering::Less,
            (false, true) => Ordering::Greater,
            (false, false) => (self.exponent, self.mantissa).cmp(&(other.exponent, other.mantissa)),
        }
    }

    /// The exponent `e` with `2^(e-1) <= self < 2^e`; `None` for zero or infinity.
    pub fn exponent(self) -> Option<i64> {
        if self.is_zero() || self.is_infinite() { None } else { Some(self.exponent + 32) }
    }

    /// The exact value as an MPFR number, infinite if it does not fit, never smaller than `self`.
    pub fn to_float(self) -> Float {
        let mut value = Float::new(32);
        if self.is_infinite() {
            super::rounding::set_infinite(&mut value);
        } else if !self.is_zero() {
            super::rounding::set_scaled(&mut value, self.mantissa, self.exponent);
        }
        value
    }

    /// A rough base-2 logarithm, for choosing precisions only (never for containment).
    pub fn log2_estimate(self) -> f64 {
        if self.is_zero() {
            f64::NEG_INFINITY
        } else if self.is_infinite() {
            f64::INFINITY
        } else {
            f64::from(self.mantissa).log2() + self.exponent as f64
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    fn exact(m: Magnitude) -> Rational {
        let mut value = Rational::from(m.mantissa);
        if m.exponent >= 0 {
            value <<= m.exponent as u32
        } else {
            value >>= (-m.exponent) as u32
        }
        value
    }

    proptest::proptest! {
        #[test]
        fn every_operation_bounds_the_exact_result(a in 1u64.., b in 1u64.., s in -90i64..90) {
            let x = Magnitude::from_u64(a).shift(s);
            let y = Magnitude::from_u64(b);
            let (ex, ey) = (exact(x), exact(y));
            let nearly = |bound: Magnitude, value: Rational| {
                let bound = exact(bound);
                let slack = value.clone() * Rational::from((1, 1u64 << 28));
                bound >= value && bound.clone() - value.clone() <= slack
            };
            proptest::prop_assert!(exact(Magnitude::from_u64(a)) >= a);
            proptest::prop_assert!(nearly(x.add(y), ex.clone() + ey.clone()));
            proptest::prop_assert!(nearly(x.mul(y), ex.clone() * ey.clone()));
            proptest::prop_assert!(exact(x.mul_down(y)) <= ex.clone() * ey.clone());
            proptest::prop_assert!(nearly(x.div(y), ex.clone() / ey.clone()));
            let root = exact(x.sqrt());
            proptest::prop_assert!(root.clone() * root >= ex);
            if ex > ey { proptest::prop_assert!(exact(x.sub_down(y)) <= ex.clone() - ey.clone()); }
            proptest::prop_assert!(Magnitude::from_float(&x.to_float()) == x);
        }
    }

    #[test]
    fn lower_bounds_saturate_below() {
        let huge = Magnitude::power_of_two(EXPONENT_LIMIT - 100);
        assert!(huge.mul(huge).is_infinite() && !huge.mul_down(huge).is_infinite());
        let tiny = Magnitude::power_of_two(-EXPONENT_LIMIT);
        assert!(!tiny.mul(tiny).is_zero() && tiny.mul_down(tiny).is_zero());
    }

    #[test]
    fn zero_and_infinity_behave() {
        let one = Magnitude::ONE;
        assert!(one.div(Magnitude::ZERO).is_infinite());
        assert!(Magnitude::INFINITY.mul(Magnitude::ZERO).is_infinite());
        assert!(one.sub_down(one).is_zero());
        assert!(Magnitude::INFINITY.sub_down(Magnitude::INFINITY).is_zero());
        assert!(Magnitude::INFINITY.sub_down(one).is_infinite());
        assert_eq!(one.pow(1000), one);
        assert!(Magnitude::from_float(&rug::Float::with_val(53, rug::float::Special::Nan)).is_infinite());
    }
}
