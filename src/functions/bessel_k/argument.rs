//! Exact positive arguments, given by themselves or by their squares.
//!
//! The fixed-point series need few facts about an argument `x`: `x^2/4`, `1/(8x)`, their
//! logarithms and the whole part of `2x`. All of them come from `x = m 2^e` or from `x^2 = p/q` by
//! exact integer arithmetic rounded down once, which for a root rests on
//! `floor(sqrt(floor(y))) = floor(sqrt(y))`.

use super::factor::{Factor, shifted};
use crate::arithmetic::{Bits, Real};
use crate::functions::elementary;
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

impl Argument<'_> {
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

fn log2_of(value: &Integer) -> f64 {
    let (fraction, exponent) = value.to_f64_exp();
    fraction.log2() + f64::from(exponent)
}

/// The odd factor of a positive number and the exponent of the power of two left.
fn odd_part(value: &Integer) -> (Integer, i64) {
    let zeros = value.find_one(0).unwrap_or(0);
    (Integer::from(value >> zeros), i64::from(zeros))
}
