//! The only place where MPFR results are rounded.
//!
//! [`nearest`] returns a result together with a proven bound of its rounding error; [`down`] and
//! [`up`] round in a direction. All elementary operations of MPFR are correctly rounded in the
//! requested direction (MPFR manual, "Rounding"), which is all that is used here: for a result
//! `y = m * 2^e` with `1/2 <= |m| < 1` and `p` bits, rounding to nearest errs by at most
//! `2^(e - p - 1)`. A result at the bottom of the exponent range may err by the smallest number.
//!
//! Plain operators of `rug` round to nearest and forget the error. They are not used on the
//! certified path; a test looks for them in the sources.

use super::{Bits, Magnitude};
use rug::Float;
use rug::float::Round;
use rug::ops::AssignRound;
use std::cmp::Ordering;

/// Smallest working precision; below it, balls are useless and bounds get in each other's way.
pub const MIN_BITS: Bits = 32;

/// Rounds `source` to the nearest number of `bits` bits and bounds the error made.
pub fn nearest<T>(bits: Bits, source: T) -> (Float, Magnitude)
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    let (value, order) = Float::with_val_round(bits.max(MIN_BITS), source, Round::Nearest);
    let error = rounding_error(&value, order);
    (value, error)
}

/// As [`nearest`], into an existing number whose precision is kept.
pub fn nearest_into<T>(target: &mut Float, source: T) -> Magnitude
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    let order = target.assign_round(source, Round::Nearest);
    rounding_error(target, order)
}

/// Adds `term` to `target`, rounding to nearest at the precision of `target`.
pub fn add_into(target: &mut Float, term: &Float) -> Magnitude {
    let order = rug::ops::AddAssignRound::add_assign_round(target, term, Round::Nearest);
    rounding_error(target, order)
}

/// Multiplies `target` by `factor`, rounding to nearest at the precision of `target`.
pub fn mul_into(target: &mut Float, factor: &Float) -> Magnitude {
    let order = rug::ops::MulAssignRound::mul_assign_round(target, factor, Round::Nearest);
    rounding_error(target, order)
}

/// The largest number of `bits` bits that is not above `source`.
pub fn down<T>(bits: Bits, source: T) -> Float
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    Float::with_val_round(bits.max(MIN_BITS), source, Round::Down).0
}

/// The smallest number of `bits` bits that is not below `source`.
pub fn up<T>(bits: Bits, source: T) -> Float
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    Float::with_val_round(bits.max(MIN_BITS), source, Round::Up).0
}

/// Bound of the error of rounding to nearest, from the result and MPFR's ternary value.
fn rounding_error(value: &Float, order: Ordering) -> Magnitude {
    if value.is_nan() || value.is_infinite() {
        return Magnitude::INFINITY;
    }
    if order == Ordering::Equal {
        return Magnitude::ZERO;
    }
    let smallest = i64::from(rug::float::exp_min());
    match value.get_exp() {
        Some(exponent) if i64::from(exponent) > smallest + 1 => {
            Magnitude::power_of_two(i64::from(exponent) - i64::from(value.prec()) - 1)
        }
        _ => Magnitude::power_of_two(smallest),
    }
}

/// Sets `target` to plus infinity.
pub(super) fn set_infinite(target: &mut Float) {
    let _ = target.assign_round(rug::float::Special::Infinity, Round::Up);
}

/// Sets `target` (32 bits) to `mantissa * 2^exponent`, exactly or rounded up.
pub(super) fn set_scaled(target: &mut Float, mantissa: u32, exponent: i64) {
    use rug::ops::MulAssignRound;
    let _ = target.assign_round(mantissa, Round::Up);
    let exponent = exponent.clamp(-i64::from(i32::MAX), i64::from(i32::MAX)) as i32;
    let power = Float::with_val_round(2, Float::i_exp(1, exponent), Round::Up).0;
    let _ = target.mul_assign_round(&power, Round::Up);
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_of_rounding_are_half_a_unit() {
        let third = rug::Rational::from((1, 3));
        let (value, error) = nearest(53, &third);
        let difference = (rug::Rational::from(&third) - value.to_rational().unwrap_or_default()).abs();
        assert!(difference <= error.to_float().to_rational().unwrap_or_default());
        assert_eq!(nearest(53, 1).1, Magnitude::ZERO);
        assert!(down(53, &third) < up(53, &third));
    }

    #[test]
    fn underflow_is_bounded() {
        let tiny = Float::with_val(53, Float::i_exp(1, rug::float::exp_min()));
        let (value, error) = nearest(53, tiny.square_ref());
        assert!(value.is_zero() && !error.is_zero());
    }

    #[test]
    fn magnitudes_far_outside_mpfr_round_up() {
        assert!(Magnitude::power_of_two(1 << 40).to_float().is_infinite());
        assert!(!Magnitude::power_of_two(-(1 << 40)).to_float().is_zero());
    }
}
