//! Logarithms of fractions in a few machine words.
//!
//! For `1/2 <= u < 1` a double gives `v`, a multiple of `2^-53` near `ln(1/u)`, and
//!
//! ```text
//! ln(1/u) = v - ln(1 + d),     1 + d = u e^v,
//! e^v = e^(i/64) e^(i'/4096) e^h,   v = i/64 + i'/4096 + h,   0 <= h < 2^-12,
//! ```
//!
//! exactly, for whatever `v`; that `|d| < 2^-48` is found by computing it.
//!
//! # Errors, in units of the last place
//!
//! * `e^h`: Horner's rule for the sum of `h^k/k!` up to `k = m`; each step adds less than three
//!   units, and multiplies what was there by `h < 2^-12`. `m` is the first index for which the
//!   table's `1/(m+1)!` shifted by `12 (m+1)` bits is zero, so that `h^(m+1)/(m+1)!` is below one
//!   unit but for the error of the table; each further term is below `2^-12` times the one before.
//!   In all below five units; counted as six.
//! * `e^(i/64) <= e^(45/64) < 2.03` and `e^(i'/4096) < 1.02`, short by two each: the product by at most
//!   `2 2.03 + 2 1.02 + 1 < 8`; times `e^h` by `8 1.001 + 6 2.1 + 1 < 22`; times `u` by `23`.
//! * `ln(1 + d)` changes by no more than `24` for that.
//! * Its series up to `d^m/m`, `48 (m + 1) >= f`: powers are rounded down, each short by less than
//!   two units as `|d| < 2^-48`, quotients by less than one more: `3 (m - 1)`. The rest is below one unit.

use super::coefficients::{exp_coarse, exp_fine, inverse_factorial};
use super::limbs::Limbs;
use crate::functions::constants::{LN_2, Leading};

/// A number and the bound of its error in units of the last place.
pub(super) struct WithError<const N: usize> {
    pub(super) value: Limbs<N>,
    pub(super) error: u64,
}

/// Bits that `d` is below one.
const CLOSENESS: u32 = 48;

/// The leading words of a constant, short by less than one unit.
pub(super) fn leading<const N: usize>(constant: &Leading) -> Limbs<N> {
    let mut words = [constant.whole; N];
    for (word, source) in words.iter_mut().rev().skip(1).zip(&constant.fraction) {
        *word = *source;
    }
    Limbs(words)
}

/// `factor * ln 2` for factors below `2^60`, short by less than two units.
///
/// One more word of the constant is used, whose truncation costs `factor 2^-64`.
pub(super) fn multiple_of_ln_2<const N: usize>(factor: u64) -> Limbs<N> {
    let mut words = [0; N];
    let mut carry = 0;
    for (place, source) in LN_2.fraction[..N].iter().rev().enumerate() {
        let wide = u128::from(*source) * u128::from(factor) + u128::from(carry);
        if place > 0 {
            words[place - 1] = wide as u64;
        }
        carry = (wide >> 64) as u64;
    }
    words[N - 1] = carry;
    Limbs(words)
}

/// `ln(1/u)` for a fraction `u` in `[1/2, 1)`, in two's complement; `None` if the double was bad.
pub(super) fn of_inverse<const N: usize>(u: &Limbs<N>) -> Option<WithError<N>> {
    let estimate = -((u.first_fraction_word() as f64) / 18_446_744_073_709_551_616.0).ln();
    // v 2^53
    let v = (estimate * 9_007_199_254_740_992.0).round() as u64;
    let coarse = exp_coarse::<N>((v >> 47) as usize)?;
    let fine = exp_fine::<N>((v >> 41) as usize & 63)?;
    let power = coarse.times(&fine).times(&small_exponential((v & ((1 << 41) - 1)) << 11)?);
    let d = power.times_fraction(u).minus(&Limbs::ONE);
    let (logarithm, terms) = logarithm_near_one(&d)?;
    let mut v_words = [0; N];
    v_words[N - 2] = v << 11;
    v_words[N - 1] = v >> 53;
    Some(WithError { value: Limbs(v_words).minus(&logarithm), error: 25 + 3 * terms })
}

/// `e^h` for `h = word/2^64 < 2^-12`.
fn small_exponential<const N: usize>(word: u64) -> Option<Limbs<N>> {
    let mut last = 0;
    while inverse_factorial::<N>(last + 1)?.shifted(-12 * (last as i64 + 1)) != Limbs::ZERO {
        last += 1;
    }
    let mut sum = Limbs::ZERO;
    for k in (0..=last).rev() {
        sum = sum.times_word(word).plus(&inverse_factorial(k)?);
    }
    Some(sum)
}

/// `ln(1 + d)` in two's complement, and the number of terms; `None` unless `|d| < 2^-48`.
fn logarithm_near_one<const N: usize>(d: &Limbs<N>) -> Option<(Limbs<N>, u64)> {
    let size = d.absolute();
    if size.whole() != 0 || size.first_fraction_word() >> (64 - CLOSENESS) != 0 {
        return None;
    }
    let terms = u64::from(Limbs::<N>::FRACTION_BITS.div_ceil(CLOSENESS));
    let mut power = size;
    let mut sum = *d;
    for k in 2..=terms {
        power = power.times_fraction(&size);
        let term = power.over_word(k);
        // d^k/k has the sign of d for odd k and enters with that of -1 for even k.
        sum = if k % 2 == 0 || d.is_negative() { sum.minus(&term) } else { sum.plus(&term) };
    }
    Some((sum, terms))
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::{Float, Rational};

    fn check<const N: usize>(u: &Limbs<N>) {
        let found = of_inverse(u).unwrap();
        let scale = Limbs::<N>::FRACTION_BITS;
        let exact = Float::with_val(900, u.to_integer()) >> scale;
        let exact = -exact.ln();
        let exact = exact.to_rational().unwrap() << scale;
        let value = found.value.absolute().to_integer() * if found.value.is_negative() { -1 } else { 1 };
        assert!((exact - Rational::from(value)).abs() <= found.error);
    }

    proptest::proptest! {
        #[test]
        fn logarithms(words: [u64; 8], short: bool) {
            let word = words[0] | 1 << 63;
            if short {
                check(&Limbs([0, 0, word, 0]));
                check(&Limbs([0, 0, word >> 40 << 40, 0]));
            }
            check(&Limbs([words[1], word, 0]));
            check(&Limbs([words[1], words[2], words[3], word, 0]));
            check(&Limbs([words[1], words[2], words[3], words[4], words[5], words[6], words[7], word, 0]));
        }

        #[test]
        fn multiples(factor in 0u64..1 << 60) {
            let exact = (Float::with_val(900, rug::float::Constant::Log2) * factor).to_rational().unwrap();
            let short = (exact << Limbs::<5>::FRACTION_BITS) - multiple_of_ln_2::<5>(factor).to_integer();
            proptest::prop_assert!((0..2).contains(&short));
        }
    }

    #[test]
    fn ends_of_the_range() {
        check(&Limbs([0, 0, 1 << 63, 0]));
        check(&Limbs([1, 0, 1 << 63, 0]));
        check(&Limbs([u64::MAX, u64::MAX, u64::MAX, 0]));
        check(&Limbs([0, 0, u64::MAX, 0]));
        let pi = Float::with_val(900, rug::float::Constant::Pi) << 192u32;
        let floor = pi.to_integer_round(rug::float::Round::Down).unwrap().0;
        assert_eq!(leading::<4>(&crate::functions::constants::PI).to_integer(), floor);
    }
}
