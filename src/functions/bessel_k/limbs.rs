//! Fixed-point numbers of a few machine words.
//!
//! `Limbs<N>` is `N` words, least significant first: the last is the whole part, the others are
//! the fraction, so that the unit in the last place is `2^-f` with `f = 64 (N - 1)`. Sums,
//! differences and negation are exact modulo `2^64`; products and quotients of non-negative numbers are
//! rounded down. Who calls makes sure that results fit: numbers are below `2^64`, or below `2^63`
//! in absolute value where they are read as two's complement (`Limbs::is_negative`).
//!
//! At up to some 500 bits these loops, of known length and without memory to allocate, take a
//! fraction of the time of general integers.

use rug::Integer;
use rug::integer::Order;

/// A fixed-point number: `N - 1` words of fraction and one before the point.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Limbs<const N: usize>(pub(super) [u64; N]);

impl<const N: usize> Limbs<N> {
    pub(super) const ZERO: Limbs<N> = Limbs([0; N]);

    /// The number one.
    pub(super) const ONE: Limbs<N> = {
        let mut words = [0; N];
        words[N - 1] = 1;
        Limbs(words)
    };

    /// The bits after the point.
    pub(super) const FRACTION_BITS: u32 = 64 * (N as u32 - 1);

    /// The whole part, rounded down.
    pub(super) fn whole(&self) -> u64 {
        self.0[N - 1]
    }

    /// The first word after the point.
    pub(super) fn first_fraction_word(&self) -> u64 {
        self.0[N - 2]
    }

    /// Whether the number is negative when read as two's complement.
    pub(super) fn is_negative(&self) -> bool {
        self.whole() >> 63 != 0
    }

    /// Exact sum modulo `2^64`.
    #[inline(always)]
    pub(super) fn plus(&self, other: &Limbs<N>) -> Limbs<N> {
        let mut sum = [0; N];
        let mut carry = 0;
        for ((word, &left), &right) in sum.iter_mut().zip(&self.0).zip(&other.0) {
            let wide = u128::from(left) + u128::from(right) + u128::from(carry);
            *word = wide as u64;
            carry = (wide >> 64) as u64;
        }
        Limbs(sum)
    }

    /// Exact difference modulo `2^64`.
    #[inline(always)]
    pub(super) fn minus(&self, other: &Limbs<N>) -> Limbs<N> {
        let mut difference = [0; N];
        let mut borrow = false;
        for ((word, &left), &right) in difference.iter_mut().zip(&self.0).zip(&other.0) {
            let (partial, first) = left.overflowing_sub(right);
            let (rest, second) = partial.overflowing_sub(u64::from(borrow));
            *word = rest;
            borrow = first | second;
        }
        Limbs(difference)
    }

    /// The absolute value of a number in two's complement.
    pub(super) fn absolute(&self) -> Limbs<N> {
        if self.is_negative() { Limbs::ZERO.minus(self) } else { *self }
    }

    /// One row of a product: `(row + self * word)`, exactly, over `2^64` and rounded down.
    #[inline(always)]
    fn row(&self, row: &[u64; N], word: u64) -> [u64; N] {
        let mut next = [0; N];
        let mut carry = 0;
        for i in 0..N {
            // At most (2^64 - 1)^2 + 2 (2^64 - 1) = 2^128 - 1.
            let wide = u128::from(self.0[i]) * u128::from(word) + u128::from(row[i]) + u128::from(carry);
            if i > 0 {
                next[i - 1] = wide as u64;
            }
            carry = (wide >> 64) as u64;
        }
        next[N - 1] = carry;
        next
    }

    /// `self * word / 2^64`, rounded down.
    #[inline(always)]
    pub(super) fn times_word(&self, word: u64) -> Limbs<N> {
        Limbs(self.row(&[0; N], word))
    }

    /// The product with a number below one, rounded down.
    #[inline(always)]
    pub(super) fn times_fraction(&self, fraction: &Limbs<N>) -> Limbs<N> {
        let mut row = [0; N];
        for j in 0..N - 1 {
            row = self.row(&row, fraction.0[j]);
        }
        Limbs(row)
    }

    /// The product, rounded down.
    pub(super) fn times(&self, other: &Limbs<N>) -> Limbs<N> {
        let mut product = self.times_fraction(other);
        let mut carry = 0;
        for i in 0..N {
            let wide = u128::from(self.0[i]) * u128::from(other.whole()) + u128::from(product.0[i]) + u128::from(carry);
            product.0[i] = wide as u64;
            carry = (wide >> 64) as u64;
        }
        product
    }

    /// The quotient by a word that is not zero, rounded down.
    pub(super) fn over_word(&self, divisor: u64) -> Limbs<N> {
        let mut quotient = [0; N];
        let mut rest = 0;
        for i in (0..N).rev() {
            let wide = u128::from(rest) << 64 | u128::from(self.0[i]);
            quotient[i] = (wide / u128::from(divisor)) as u64;
            rest = (wide % u128::from(divisor)) as u64;
        }
        Limbs(quotient)
    }

    /// `self * 2^shift`, rounded down.
    pub(super) fn shifted(&self, shift: i64) -> Limbs<N> {
        let words = usize::try_from(shift.unsigned_abs() / 64).unwrap_or(usize::MAX);
        let bits = (shift.unsigned_abs() % 64) as u32;
        let at = |index: Option<usize>| index.and_then(|i| self.0.get(i)).copied().unwrap_or(0);
        let mut result = [0; N];
        for (i, word) in result.iter_mut().enumerate() {
            *word = if shift >= 0 {
                let (high, low) = (at(i.checked_sub(words)), at(i.checked_sub(words.saturating_add(1))));
                high << bits | low.checked_shr(64 - bits).unwrap_or(0)
            } else {
                let (low, high) = (at(i.checked_add(words)), at(i.checked_add(words.saturating_add(1))));
                low >> bits | high.checked_shl(64 - bits).unwrap_or(0)
            };
        }
        Limbs(result)
    }

    /// The number in units of the last place.
    pub(super) fn to_integer(self) -> Integer {
        Integer::from_digits(&self.0, Order::Lsf)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const F: u32 = Limbs::<4>::FRACTION_BITS;

    fn integer(value: &Limbs<4>) -> Integer {
        value.to_integer()
    }

    proptest::proptest! {
        // Every operation against integers of any length; whole parts are small so that results fit.
        #[test]
        fn exact_integer_arithmetic(
            a: [u64; 3], b: [u64; 3], high in proptest::array::uniform2(0u64..1 << 30), word in 1u64..,
            shift in -300i64..30
        ) {
            let x = Limbs([a[0], a[1], a[2], high[0]]);
            let y = Limbs([b[0], b[1], b[2], high[1]]);
            let fraction = Limbs([b[0], b[1], b[2], 0]);
            let (ix, iy) = (integer(&x), integer(&y));
            proptest::prop_assert_eq!(integer(&x.plus(&y)), Integer::from(&ix + &iy));
            let difference = x.minus(&y);
            proptest::prop_assert_eq!(difference.is_negative(), ix < iy);
            proptest::prop_assert_eq!(integer(&difference.absolute()), Integer::from(&ix - &iy).abs());
            proptest::prop_assert_eq!(integer(&x.times(&y)), Integer::from(&ix * &iy) >> F);
            proptest::prop_assert_eq!(integer(&x.times_fraction(&fraction)), (ix.clone() * integer(&fraction)) >> F);
            proptest::prop_assert_eq!(integer(&x.times_word(word)), (ix.clone() * word) >> 64);
            proptest::prop_assert_eq!(integer(&x.over_word(word)), ix.clone() / word);
            let moved = if shift >= 0 { ix << shift as u32 } else { ix >> (-shift) as u32 };
            proptest::prop_assert_eq!(integer(&x.shifted(shift)), moved);
        }
    }
}
