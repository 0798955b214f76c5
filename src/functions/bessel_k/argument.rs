//! Exact positive arguments, given by themselves or by their squares.
//!
//! The fixed-point series need few facts about an argument `x`: `x^2/4`, `1/(8x)`, their
//! logarithms and the whole part of `2x`. All of them come from `x = m 2^e` or from `x^2 = p/q` by
//! exact integer arithmetic rounded down once, which for a root rests on
//! `floor(sqrt(floor(y))) = floor(sqrt(y))`.

use super::factor::{Factor, shifted};
use super::limbs::Limbs;
use crate::arithmetic::{Bits, Real};
use crate::functions::elementary;
use rug::integer::Order;
use rug::{Float, Integer, Rational};

/// An exact positive number.
#[derive(Clone, Copy, Debug)]
pub(super) enum Argument<'a> {
    /// The number itself: finite and positive.
    Number(&'a Float),
    /// The square root of a positive number.
    RootOf(&'a Rational),
}

/// `numerator / denominator * 2^shift`.
struct Ratio {
    numerator: Integer,
    denominator: Integer,
    shift: i64,
}

/// `x^2/4 = fraction * 2^exponent` in few words.
pub(super) struct QuarterSquare<const N: usize> {
    pub(super) exponent: i64,
    /// In `[1/2, 1)`, rounded down.
    pub(super) fraction: Limbs<N>,
    /// Whether nothing was lost by rounding; if something was, less than one unit.
    pub(super) is_exact: bool,
}

impl Argument<'_> {
    /// `x^2/4` in few words.
    ///
    /// For `p/q` normalise both to `2^63 <= p', q' < 2^64` (words), or divide integers with enough
    /// zeros appended; each word of the quotient is exact and the remainder tells whether more follow.
    pub(super) fn short_quarter_square<const N: usize>(&self) -> QuarterSquare<N> {
        if let Argument::RootOf(square) = self
            && let (Some(p), Some(q)) = (square.numer().to_u64(), square.denom().to_u64())
        {
            return quotient_of_words(p, q);
        }
        let square = self.square();
        let (above, below) = (square.numerator.significant_bits(), square.denominator.significant_bits());
        // The quotient below has as many bits as a fraction, or one more.
        let appended = i64::from(Limbs::<N>::FRACTION_BITS) + i64::from(below) - i64::from(above);
        let (mut quotient, rest) = if square.denominator == 1 {
            let quotient = shifted(&square.numerator, appended);
            let lost = appended < 0 && square.numerator.find_one(0).map(i64::from) < Some(-appended);
            (quotient, lost)
        } else if appended >= 0 {
            let (quotient, rest) = shifted(&square.numerator, appended).div_rem(square.denominator);
            (quotient, rest != 0)
        } else {
            let (quotient, _) = shifted(&square.numerator, appended).div_rem(square.denominator);
            (quotient, true)
        };
        let extra = quotient.significant_bits().saturating_sub(Limbs::<N>::FRACTION_BITS);
        let lost = rest || (extra > 0 && quotient.find_one(0) < Some(extra));
        quotient >>= extra;
        let mut fraction = [0; N];
        quotient.write_digits(&mut fraction, Order::Lsf);
        let exponent = square.shift - appended + i64::from(extra) + i64::from(Limbs::<N>::FRACTION_BITS) - 2;
        QuarterSquare { exponent, fraction: Limbs(fraction), is_exact: !lost }
    }

    /// `log2(x)`, for choosing methods and precisions only.
    pub(super) fn log2_estimate(&self) -> f64 {
        match self {
            Argument::Number(x) => {
                let (fraction, exponent) = x.to_f64_exp();
                fraction.log2() + f64::from(exponent)
            }
            Argument::RootOf(square) => (log2_of(square.numer()) - log2_of(square.denom())) / 2.0,
        }
    }

    /// `x` as a double, for choosing methods and precisions only; may be zero or infinite.
    pub(super) fn estimate(&self) -> f64 {
        self.log2_estimate().exp2()
    }

    /// `x^2` with odd numerator and denominator.
    fn square(&self) -> Ratio {
        match self {
            Argument::Number(x) => {
                let (mantissa, exponent) = x.to_integer_exp().unwrap_or_default();
                let (odd, zeros) = odd_part(&mantissa);
                Ratio {
                    numerator: odd.square(),
                    denominator: Integer::from(1),
                    shift: 2 * (i64::from(exponent) + zeros),
                }
            }
            Argument::RootOf(square) => {
                let (numerator, above) = odd_part(square.numer());
                let (denominator, below) = odd_part(square.denom());
                Ratio { numerator, denominator, shift: above - below }
            }
        }
    }

    /// The factor `x^2/4`, short by at most `2^-fraction_bits`.
    pub(super) fn quarter_square(&self, fraction_bits: Bits) -> Factor {
        let square = self.square();
        Factor::new(&square.numerator, &square.denominator, square.shift - 2, fraction_bits)
    }

    /// The factor `1/(8x)`, short by at most `2^-fraction_bits`.
    pub(super) fn eighth_of_inverse(&self, fraction_bits: Bits) -> Factor {
        match self {
            Argument::Number(x) => {
                let (mantissa, exponent) = x.to_integer_exp().unwrap_or_default();
                let (odd, zeros) = odd_part(&mantissa);
                Factor::new(&Integer::from(1), &odd, -3 - i64::from(exponent) - zeros, fraction_bits)
            }
            Argument::RootOf(square) => {
                let radicand = shifted(square.denom(), 2 * i64::from(fraction_bits) - 6) / square.numer();
                Factor::from_floor(radicand.sqrt(), fraction_bits)
            }
        }
    }

    /// `floor(x^2)` if that fits a word.
    pub(super) fn whole_square(&self) -> Option<u64> {
        if self.log2_estimate() > 33.0 {
            return None;
        }
        let square = self.square();
        let length = i64::from(square.numerator.significant_bits()) + square.shift;
        if length < i64::from(square.denominator.significant_bits()) {
            return Some(0);
        }
        (shifted(&square.numerator, square.shift.max(0)) / shifted(&square.denominator, (-square.shift).max(0)))
            .to_u64()
    }

    /// `floor(2x)`, or `None` if that does not fit a word.
    pub(super) fn whole_double(&self) -> Option<u64> {
        match self {
            _ if self.log2_estimate() > 61.0 => None,
            Argument::Number(x) => {
                let (mantissa, exponent) = x.to_integer_exp()?;
                shifted(&mantissa, i64::from(exponent) + 1).to_u64()
            }
            Argument::RootOf(square) => (shifted(square.numer(), 2) / square.denom()).sqrt().to_u64(),
        }
    }

    /// `x` as a ball.
    pub(super) fn ball(&self, bits: Bits) -> Real {
        match self {
            Argument::Number(x) => Real::from_float((*x).clone()),
            Argument::RootOf(square) => elementary::sqrt(&Real::from_rational(square, bits + 2), bits + 2),
        }
    }

    /// `1/x^2` as a ball.
    pub(super) fn inverse_square(&self, bits: Bits) -> Real {
        match self {
            Argument::Number(x) => {
                let inverse = Real::from_i64(1).div(&Real::from_float((*x).clone()), bits + 4);
                inverse.square(bits + 4)
            }
            Argument::RootOf(square) => Real::from_integer(square.denom(), bits + 4)
                .div(&Real::from_integer(square.numer(), bits + 4), bits + 4),
        }
    }

    /// `ln(x/2)` as a ball.
    pub(super) fn ln_half(&self, bits: Bits) -> Real {
        match self {
            Argument::Number(x) => elementary::ln(&Real::from_float((*x).clone()).shift(-1), bits),
            Argument::RootOf(square) => {
                elementary::ln(&Real::from_rational(square, bits + 2).shift(-2), bits).shift(-1)
            }
        }
    }
}

/// `p/(4q)` for positive words.
fn quotient_of_words<const N: usize>(p: u64, q: u64) -> QuarterSquare<N> {
    let (p_zeros, q_zeros) = (p.leading_zeros(), q.leading_zeros());
    let (top, divisor) = (p << p_zeros, q << q_zeros);
    // The quotient of the normalised words is in (1/2, 2); below one it is what is wanted.
    let halved = top >= divisor;
    let mut rest = u128::from(top) << 63 << u32::from(!halved);
    let mut fraction = [0; N];
    for word in fraction.iter_mut().rev().skip(1) {
        *word = (rest / u128::from(divisor)) as u64;
        rest = (rest % u128::from(divisor)) << 64;
    }
    let exponent = i64::from(q_zeros) - i64::from(p_zeros) + i64::from(halved) - 2;
    QuarterSquare { exponent, fraction: Limbs(fraction), is_exact: rest == 0 }
}

fn log2_of(value: &Integer) -> f64 {
    let (fraction, exponent) = value.to_f64_exp();
    fraction.log2() + f64::from(exponent)
}

/// The odd factor of a positive number and the exponent of the power of two left.
fn odd_part(value: &Integer) -> (Integer, i64) {
    let zeros = value.find_one(0).unwrap_or(0);
    (Integer::from(value >> zeros), i64::from(zeros))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn check<const N: usize>(x: &Argument, square: &Rational) {
        let found = x.short_quarter_square::<N>();
        assert!(found.fraction.whole() == 0 && found.fraction.first_fraction_word() >> 63 == 1);
        // x^2/4 in units of the last place of the fraction.
        let scale = i64::from(Limbs::<N>::FRACTION_BITS) - found.exponent - 2;
        let scaled = (square.clone() << scale.max(0) as u32) >> (-scale).max(0) as u32;
        let short = scaled - found.fraction.to_integer();
        assert!((0..1).contains(&short) && found.is_exact == (short == 0), "{square} {short}");
    }

    proptest::proptest! {
        #[test]
        fn quarter_squares(
            p in 1u128.., q in 1u128.., cut in 0u32..128, up in 0u32..300, down in 0u32..300, odd in 0u32..128
        ) {
            let (p, q) = ((p >> cut).max(1), (q >> odd).max(1));
            let square = (Rational::from((Integer::from(p), Integer::from(q))) << up) >> down;
            check::<3>(&Argument::RootOf(&square), &square);
            check::<7>(&Argument::RootOf(&square), &square);
            let number = (Float::with_val(128, p) << up) >> down;
            let exact = number.to_rational().unwrap().square();
            check::<3>(&Argument::Number(&number), &exact);
            check::<6>(&Argument::Number(&number), &exact);
        }
    }
}
