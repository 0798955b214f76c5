//! Fixed-point terms multiplied by a constant factor and by small integers.
//!
//! The terms of both series of this module come from the one before by `term * multiplier *
//! factor / divisor`, with a positive `factor` that stays the same and integers that fit a machine
//! word. Terms are non-negative integers counting units in the last place, and every step rounds
//! down, so computed terms are never above the exact ones.
//!
//! # Error of one step
//!
//! For a term `T >= 0` the exact result `T m F / d` is above the computed one by less than
//! `(T m 2^-f + 1)/d + 1` units, where `2^-f` bounds how much the stored factor is below `F`:
//! once the stored factor is short by at most `2^-f`, which costs `T m 2^-f / d`; once the product
//! is rounded down to an integer, which costs `1/d`; once the quotient is rounded down. A factor
//! that is a quotient of word-sized integers is applied without the first of these.

use rug::{Assign, Integer};

/// A positive number, applied to fixed-point terms.
#[derive(Clone, Debug)]
pub(super) enum Factor {
    /// `numerator / divisor / 2^shift` exactly.
    Small { numerator: u64, divisor: u64, shift: u32 },
    /// `value / 2^fraction_bits`, below the factor by less than `2^-fraction_bits`.
    Fixed { value: Integer, fraction_bits: u32 },
}

impl Factor {
    /// The factor `numerator / denominator * 2^shift` for positive integers, kept exactly if the
    /// integers are small and else rounded down to `fraction_bits` bits after the point.
    pub(super) fn new(numerator: &Integer, denominator: &Integer, shift: i64, fraction_bits: u32) -> Factor {
        let scaled = if (1..64).contains(&shift) { shifted(numerator, shift).to_u64() } else { numerator.to_u64() };
        let right = if (1..64).contains(&shift) { Ok(0) } else { u32::try_from(-shift) };
        if let (Some(numerator), Some(divisor), Ok(shift)) = (scaled, denominator.to_u64(), right) {
            return Factor::Small { numerator, divisor, shift };
        }
        let mut value = shifted(numerator, shift.saturating_add(i64::from(fraction_bits)));
        value /= denominator;
        Factor::Fixed { value, fraction_bits }
    }

    /// The factor `value / 2^fraction_bits`, found by rounding down.
    pub(super) fn from_floor(value: Integer, fraction_bits: u32) -> Factor {
        Factor::Fixed { value, fraction_bits }
    }

    /// `term * multiplier * factor / divisor` in place of `term`, rounded down as described above.
    pub(super) fn apply(&self, term: &mut Integer, multiplier: u64, divisor: u64, scratch: &mut Integer) {
        if multiplier != 1 {
            *term *= multiplier;
        }
        match self {
            Factor::Small { numerator, divisor: own, shift } => {
                *term *= *numerator;
                *term >>= *shift;
                match own.checked_mul(divisor) {
                    Some(both) => *term /= both,
                    None => {
                        *term /= *own;
                        *term /= divisor;
                    }
                }
            }
            Factor::Fixed { value, fraction_bits } => {
                scratch.assign(&*term * value);
                term.assign(&*scratch >> *fraction_bits);
                *term /= divisor;
            }
        }
    }

    /// Drops trailing bits that no longer matter once all terms times multipliers to come are
    /// below `2^term_bits`: afterwards `T m 2^-f <= 1` still holds for them.
    pub(super) fn shorten(&mut self, term_bits: u32) {
        const LIMB: u32 = 64;
        if let Factor::Fixed { value, fraction_bits } = self {
            let spare = fraction_bits.saturating_sub(term_bits) / LIMB * LIMB;
            if spare > 0 {
                *value >>= spare;
                *fraction_bits -= spare;
            }
        }
    }
}

/// `floor(value * 2^shift)` for a non-negative value.
pub(super) fn shifted(value: &Integer, shift: i64) -> Integer {
    // A shift beyond 2^31 in either direction is out of reach of memory or leaves nothing.
    let by = u32::try_from(shift.unsigned_abs()).unwrap_or(u32::MAX).min(u32::MAX / 2);
    if shift >= 0 { Integer::from(value << by) } else { Integer::from(value >> by) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    proptest::proptest! {
        // The error of a step, against exact rational arithmetic.
        #[test]
        fn one_step(
            n in 1u128.., d in 1u64.., shift in -200i64..3, f in 20u32..300, t in 0u128.., m in 1u64..1000,
            divisor in 1u64..1000, shorten in 0u32..300
        ) {
            let (n, d) = (Integer::from(n), Integer::from(d));
            let exact = Rational::from((shifted(&n, shift.max(0)), shifted(&d, (-shift).max(0))));
            let mut factor = Factor::new(&n, &d, shift, f);
            factor.shorten(shorten);
            let short_by = match factor {
                Factor::Small { .. } => Rational::new(),
                Factor::Fixed { fraction_bits, .. } => Rational::from(1) >> fraction_bits,
            };
            let (mut term, mut scratch) = (Integer::from(t), Integer::new());
            factor.apply(&mut term, m, divisor, &mut scratch);
            let product = Rational::from(t) * m;
            let wanted = exact * &product / divisor;
            let allowed = (product * short_by + 1) / divisor + 1;
            proptest::prop_assert!(term <= wanted);
            proptest::prop_assert!(wanted - term < allowed);
        }
    }

    #[test]
    fn small_factors_stay_exact() {
        let small = |n: u64, d: u64, shift: i64| Factor::new(&Integer::from(n), &Integer::from(d), shift, 64);
        assert!(matches!(small(3, 7, -2), Factor::Small { numerator: 3, divisor: 7, shift: 2 }));
        assert!(matches!(small(3, 7, 4), Factor::Small { numerator: 48, divisor: 7, shift: 0 }));
        assert!(matches!(small(u64::MAX, 7, 1), Factor::Fixed { .. }));
    }
}
