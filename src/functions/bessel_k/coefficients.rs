//! Tables for [`super::short_series`], computed by the compiler.
//!
//! Power series coefficients are normalised: a mantissa of `WORDS` words with its highest bit
//! set and a binary exponent. Exponential factors and inverse factorials are in fixed point with
//! one word before the point. All are made by a few hundred operations that each round down in the
//! last place of `WORDS` words, so that they are below the exact numbers by a relative
//! `2^(12 - 64 (WORDS - 1))` at most: used with no more than `WORDS - 1` words, entries below
//! `2^48` are short by less than `2^-4` units of the last place, on top of the truncation itself.
//!
//! * `1/(k!)^2` by dividing by `k^2` each time; `H_k/(k!)^2` as the product with
//!   `H_k = 1 + 1/2 + ... + 1/k`, summed in fixed point; `1/(k! (k+1)!)` as the quotient by `k + 1`.
//!   An error of a mantissa is relative, one unit in `2^(64 WORDS - 1)`, and is carried on from `k` to
//!   `k + 1`: `2 COUNT` units at most; `H_k` is off by `k` units of `2^(-64 (WORDS - 1))`.
//! * `e^(i/64)` and `e^(i/4096)` as powers of the first, itself a sum of `1/(k! 64^k)`: each product
//!   at most doubles one unit and adds one, for factors below two and 63 steps at most `2^8` units.

use super::limbs::Limbs;

/// Words of a table entry; numbers of up to `WORDS - 1` words are served.
pub(super) const WORDS: usize = 10;
/// Number of coefficients.
pub(super) const COUNT: usize = 160;
/// Mantissas are followed by words of zeros, so that any window of them can be read.
const PADDED: usize = 2 * WORDS;

type Words = [u64; WORDS];

/// A sequence of positive coefficients (or zero).
pub(super) struct Sequence {
    /// Mantissas in `[2^(64 WORDS - 1), 2^(64 WORDS))`, least significant word first.
    mantissas: [[u64; PADDED]; COUNT],
    /// The exponents `e` of `2^e <= coefficient < 2^(e+1)`.
    exponents: [i32; COUNT],
}

impl Sequence {
    /// The exponent `e` with `coefficient < 2^(e+1)`.
    pub(super) fn exponent(&self, k: usize) -> i32 {
        self.exponents[k]
    }

    /// The coefficient with index `k` times `2^shift`, below `2^48`: short by less than two units.
    #[inline(always)]
    pub(super) fn scaled<const N: usize>(&self, k: usize, shift: i64) -> Limbs<N> {
        // mantissa 2^(e - 64 WORDS + 1) 2^shift in units of 2^-f: what is left of the mantissa.
        let dropped =
            64 * WORDS as i64 - 1 - i64::from(self.exponents[k]) - shift - i64::from(Limbs::<N>::FRACTION_BITS);
        let first = (dropped / 64) as usize;
        let bits = (dropped % 64) as u32;
        let mut words = [0; N];
        let mantissa = &self.mantissas[k];
        if dropped < 0 || first >= WORDS {
            return Limbs::ZERO;
        }
        let window = &mantissa[first..first + N + 1];
        for i in 0..N {
            words[i] = window[i] >> bits | (window[i + 1] << 1) << (63 - bits);
        }
        Limbs(words)
    }
}

/// `1/(k!)^2`.
pub(super) static OF_I0: Sequence = series(0);
/// `H_k/(k!)^2`.
pub(super) static OF_K0: Sequence = series(1);
/// `1/(k! (k+1)!)`.
pub(super) static OF_I1: Sequence = series(2);
/// `e^(i/64)` for `i <= 45`.
static EXP_COARSE: [Words; 46] = powers(64);
/// `e^(i/4096)` for `i <= 63`.
static EXP_FINE: [Words; 64] = powers(4096);
/// `1/k!`.
static INVERSE_FACTORIALS: [Words; 64] = inverse_factorials();

/// `e^(i/64)` for `i <= 45`, short by less than two units.
pub(super) fn exp_coarse<const N: usize>(i: usize) -> Option<Limbs<N>> {
    EXP_COARSE.get(i).map(leading)
}

/// `e^(i/4096)` for `i <= 63`, short by less than two units.
pub(super) fn exp_fine<const N: usize>(i: usize) -> Option<Limbs<N>> {
    EXP_FINE.get(i).map(leading)
}

/// `1/k!` for `k <= 63`, short by less than two units.
pub(super) fn inverse_factorial<const N: usize>(k: usize) -> Option<Limbs<N>> {
    INVERSE_FACTORIALS.get(k).map(leading)
}

fn leading<const N: usize>(words: &Words) -> Limbs<N> {
    let mut leading = [0; N];
    leading.copy_from_slice(&words[WORDS - N..]);
    Limbs(leading)
}

const ONE: Words = {
    let mut words = [0; WORDS];
    words[WORDS - 1] = 1;
    words
};

/// Which of the three sequences: see the statics.
const fn series(kind: u32) -> Sequence {
    let mut sequence = Sequence { mantissas: [[0; PADDED]; COUNT], exponents: [0; COUNT] };
    let mut harmonic = [0; WORDS];
    let mut square = [0; WORDS];
    square[WORDS - 1] = 1 << 63;
    let mut exponent = 0;
    let mut k = 0;
    while k < COUNT {
        if k > 0 {
            (square, exponent) = normalised_quotient(&square, exponent, (k * k) as u64);
            harmonic = sum(&harmonic, &quotient(&ONE, k as u64));
        }
        let (words, e) = match kind {
            0 => (square, exponent),
            1 if k == 0 => ([0; WORDS], 0),
            1 => normalised_product(&square, exponent, &harmonic),
            _ => normalised_quotient(&square, exponent, k as u64 + 1),
        };
        let mut i = 0;
        while i < WORDS {
            sequence.mantissas[k][i] = words[i];
            i += 1;
        }
        sequence.exponents[k] = e;
        k += 1;
    }
    sequence
}

/// `e^(i/divisor)`.
const fn powers<const COUNT: usize>(divisor: u64) -> [Words; COUNT] {
    let mut base = [0; WORDS];
    let mut term = ONE;
    let mut k = 1;
    while k < 100 {
        base = sum(&base, &term);
        term = quotient(&term, divisor * k);
        k += 1;
    }
    let mut list = [ONE; COUNT];
    let mut i = 1;
    while i < COUNT {
        list[i] = product(&list[i - 1], &base);
        i += 1;
    }
    list
}

const fn inverse_factorials() -> [Words; 64] {
    let mut list = [ONE; 64];
    let mut k = 1;
    while k < 64 {
        list[k] = quotient(&list[k - 1], k as u64);
        k += 1;
    }
    list
}

const fn sum(left: &Words, right: &Words) -> Words {
    let mut words = [0; WORDS];
    let mut carry = 0;
    let mut i = 0;
    while i < WORDS {
        let wide = left[i] as u128 + right[i] as u128 + carry as u128;
        words[i] = wide as u64;
        carry = (wide >> 64) as u64;
        i += 1;
    }
    words
}

/// Rounded down.
const fn quotient(value: &Words, divisor: u64) -> Words {
    quotient_and_next(value, divisor).0
}

/// The quotient rounded down, and the word that would follow.
const fn quotient_and_next(value: &Words, divisor: u64) -> (Words, u64) {
    let mut words = [0; WORDS];
    let mut rest = 0;
    let mut i = WORDS;
    while i > 0 {
        i -= 1;
        let wide = (rest as u128) << 64 | value[i] as u128;
        words[i] = (wide / divisor as u128) as u64;
        rest = (wide % divisor as u128) as u64;
    }
    (words, (((rest as u128) << 64) / divisor as u128) as u64)
}

/// The quotient of a normalised number, for divisors below `2^63`.
const fn normalised_quotient(value: &Words, exponent: i32, divisor: u64) -> (Words, i32) {
    let (words, next) = quotient_and_next(value, divisor);
    normalised(&words, next, exponent)
}

/// All words of a product.
const fn whole_product(left: &Words, right: &Words) -> [u64; 2 * WORDS] {
    let mut words = [0; 2 * WORDS];
    let mut i = 0;
    while i < WORDS {
        let mut carry = 0;
        let mut j = 0;
        while j < WORDS {
            let wide = left[i] as u128 * right[j] as u128 + words[i + j] as u128 + carry as u128;
            words[i + j] = wide as u64;
            carry = (wide >> 64) as u64;
            j += 1;
        }
        words[i + WORDS] = carry;
        i += 1;
    }
    words
}

/// The product of fixed-point numbers, rounded down.
const fn product(left: &Words, right: &Words) -> Words {
    let whole = whole_product(left, right);
    let mut words = [0; WORDS];
    let mut i = 0;
    while i < WORDS {
        words[i] = whole[i + WORDS - 1];
        i += 1;
    }
    words
}

/// The product of a normalised number with a fixed-point number in `[1, 2^63)`.
const fn normalised_product(value: &Words, exponent: i32, factor: &Words) -> (Words, i32) {
    let whole = whole_product(value, factor);
    // The factor's point is one word below its top; the top word of the product may be empty.
    let from = if whole[2 * WORDS - 1] == 0 { WORDS - 1 } else { WORDS };
    let mut words = [0; WORDS];
    let mut i = 0;
    while i < WORDS {
        words[i] = whole[i + from];
        i += 1;
    }
    normalised(&words, whole[from - 1], exponent + 64 * (from - (WORDS - 1)) as i32)
}

/// Shifts the highest bit to the top, with the word that follows below; the top word is not zero.
const fn normalised(words: &Words, next: u64, exponent: i32) -> (Words, i32) {
    let shift = words[WORDS - 1].leading_zeros();
    let mut moved = [0; WORDS];
    let mut i = 0;
    while i < WORDS {
        let below = if i == 0 { next } else { words[i - 1] };
        moved[i] = words[i] << shift | (below >> 1) >> (63 - shift);
        i += 1;
    }
    (moved, exponent - shift as i32)
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::{Float, Integer, Rational};

    /// Whether the entry is below the exact number by less than two units.
    fn is_just_below(entry: &Limbs<9>, exact: &Rational) -> bool {
        let units = exact.clone() << Limbs::<9>::FRACTION_BITS;
        let short = units - entry.to_integer();
        (0..2).contains(&short)
    }

    #[test]
    fn series_coefficients() {
        let (mut factorial, mut harmonic) = (Integer::from(1), Rational::new());
        for k in 0..COUNT {
            if k > 0 {
                factorial *= k as u64;
                harmonic += Rational::from((1, k as u64));
            }
            let square = Rational::from((1, factorial.clone().square()));
            for shift in [-700, -3, 0, 41] {
                let power =
                    if shift < 0 { Rational::from(1) >> -shift as u32 } else { Rational::from(1) << shift as u32 };
                let scaled = Rational::from(&square * &power);
                assert!(is_just_below(&OF_I0.scaled(k, shift), &scaled), "{k}");
                assert!(is_just_below(&OF_K0.scaled(k, shift), &Rational::from(&scaled * &harmonic)), "{k}");
                assert!(is_just_below(&OF_I1.scaled(k, shift), &(scaled / (k as u64 + 1))), "{k}");
            }
            let bound = Rational::from(1) >> (-1 - OF_I0.exponent(k)).max(0) as u32;
            assert!(square <= bound && (k == 0 || bound <= square * 2));
        }
    }

    #[test]
    fn exponentials() {
        let mut factorial = Integer::from(1);
        for i in 0..64 {
            let exp =
                |divisor: u64| Float::with_val(900, Rational::from((i as u64, divisor))).exp().to_rational().unwrap();
            if let Some(entry) = exp_coarse(i) {
                assert!(is_just_below(&entry, &exp(64)));
            }
            assert!(is_just_below(&exp_fine(i).unwrap(), &exp(4096)));
            factorial *= (i as u64).max(1);
            assert!(is_just_below(&inverse_factorial(i).unwrap(), &Rational::from((1, factorial.clone()))));
        }
    }
}
