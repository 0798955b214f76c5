//! The directed view of an enclosure: a lower and an upper bound.

use super::{Bits, Real, rounding};
use rug::{Float, Rational};

/// A closed interval `[lower, upper]` with `lower <= upper`; an infinite bound says nothing is
/// known on that side.
#[derive(Clone, Debug, PartialEq)]
pub struct Interval {
    lower: Float,
    upper: Float,
}

impl Interval {
    /// An interval from its bounds; NaN or bounds in the wrong order give the whole line.
    pub fn new(lower: Float, upper: Float) -> Interval {
        if lower <= upper {
            Interval { lower, upper }
        } else {
            let bits = rounding::MIN_BITS;
            let infinity = rounding::up(bits, rug::float::Special::Infinity);
            Interval { lower: rounding::down(bits, -infinity.clone()), upper: infinity }
        }
    }

    /// The tightest interval of the given precision around two exact numbers.
    pub fn from_rationals(lower: &Rational, upper: &Rational, bits: Bits) -> Interval {
        Interval::new(rounding::down(bits, lower), rounding::up(bits, upper))
    }

    /// The lower bound.
    pub fn lower(&self) -> &Float {
        &self.lower
    }

    /// The upper bound.
    pub fn upper(&self) -> &Float {
        &self.upper
    }

    /// The common part, or `None` if there is none.
    pub fn intersection(&self, other: &Interval) -> Option<Interval> {
        let lower = if self.lower < other.lower { &other.lower } else { &self.lower };
        let upper = if self.upper > other.upper { &other.upper } else { &self.upper };
        (lower <= upper).then(|| Interval { lower: lower.clone(), upper: upper.clone() })
    }

    /// The smallest interval containing both.
    pub fn hull(&self, other: &Interval) -> Interval {
        let lower = if self.lower < other.lower { &self.lower } else { &other.lower };
        let upper = if self.upper > other.upper { &self.upper } else { &other.upper };
        Interval { lower: lower.clone(), upper: upper.clone() }
    }

    /// Whether the number lies inside.
    pub fn contains_rational(&self, value: &Rational) -> bool {
        self.lower <= *value && self.upper >= *value
    }

    /// Whether `other` lies inside this interval.
    pub fn contains(&self, other: &Interval) -> bool {
        self.lower <= other.lower && other.upper <= self.upper
    }

    /// Replaces a negative lower bound by zero: for quantities known to be non-negative.
    pub fn clamp_non_negative(self) -> Interval {
        if self.lower < 0 && self.upper >= 0 {
            Interval { lower: Float::new(rounding::MIN_BITS), upper: self.upper }
        } else {
            self
        }
    }

    /// Whether `(upper - lower) <= 10^-digits * lower`, decided by directed rounding.
    ///
    /// `true` is a proof; `false` may be off by a relative `2^-60` of the width.
    pub fn has_relative_digits(&self, digits: u32) -> bool {
        if self.lower == self.upper {
            return true;
        }
        if self.lower <= 0 || !self.upper.is_finite() {
            return false;
        }
        let width = rounding::up(64, &self.upper - &self.lower);
        let power = rounding::up(64, Float::u_pow_u(10, digits));
        rounding::up(64, &width * &power) <= self.lower
    }

    /// The largest `digits <= limit` for which [`Self::has_relative_digits`] holds.
    pub fn relative_digits(&self, limit: u32) -> u32 {
        if self.has_relative_digits(limit) {
            return limit;
        }
        let (mut good, mut bad) = (0, limit);
        while bad - good > 1 {
            let middle = good + (bad - good) / 2;
            if self.has_relative_digits(middle) { good = middle } else { bad = middle }
        }
        good
    }

    /// The interval as a ball.
    pub fn to_real(&self, bits: Bits) -> Real {
        Real::from_interval(self, bits)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn interval(lower: i64, upper: i64) -> Interval {
        Interval::from_rationals(&Rational::from((lower, 1000)), &Rational::from((upper, 1000)), 64)
    }

    #[test]
    fn set_operations() {
        let (a, b, c) = (interval(1, 3), interval(2, 5), interval(4, 6));
        assert!(a.intersection(&b).is_some_and(|i| i.contains_rational(&Rational::from((25, 10_000)))));
        assert!(a.intersection(&c).is_none());
        assert!(a.hull(&c).contains(&b));
        assert!(!interval(3, 1).lower().is_finite());
    }

    #[test]
    fn relative_digits_count_the_width() {
        let v = Interval::from_rationals(&Rational::from((1_000_000, 1)), &Rational::from((1_000_001, 1)), 64);
        assert!(v.has_relative_digits(6) && !v.has_relative_digits(7));
        assert_eq!(v.relative_digits(50), 6);
    }
}
