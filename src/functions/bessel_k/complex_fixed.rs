//! Complex numbers in fixed point, for the series with complex arguments.
//!
//! A number is a pair of integers in units of the last place. Exact integer operations are
//! followed by one rounding of each part by less than a unit, so that a result is off by less
//! than `sqrt(2)` units *in absolute value*. Errors are counted as absolute values of complex
//! numbers: products of rectangles would make them grow by `sqrt(2)` each time.

use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use rug::{Assign, Integer};
use std::cmp::Ordering;

/// `(re + i im)` units of the last place.
#[derive(Clone, Debug)]
pub(super) struct FixedComplex {
    pub(super) re: Integer,
    pub(super) im: Integer,
}

impl FixedComplex {
    pub(super) fn zero() -> FixedComplex {
        FixedComplex { re: Integer::new(), im: Integer::new() }
    }

    /// `2^fraction_bits` units: the number one.
    pub(super) fn one(fraction_bits: Bits) -> FixedComplex {
        FixedComplex { re: Integer::from(1) << fraction_bits, im: Integer::new() }
    }

    /// Exact sum in place.
    pub(super) fn add(&mut self, other: &FixedComplex) {
        self.re += &other.re;
        self.im += &other.im;
    }

    /// Exact difference in place.
    pub(super) fn sub(&mut self, other: &FixedComplex) {
        self.re -= &other.re;
        self.im -= &other.im;
    }

    /// Exact product with an integer, in place.
    pub(super) fn mul_u64(&mut self, factor: u64) {
        self.re *= factor;
        self.im *= factor;
    }

    /// Quotient by a positive integer, off by less than `sqrt(2)` units.
    pub(super) fn div_u64(&mut self, divisor: u64) {
        self.re /= divisor;
        self.im /= divisor;
    }

    /// Sets this to `other / divisor`, off by less than `sqrt(2)` units.
    pub(super) fn assign_quotient(&mut self, other: &FixedComplex, divisor: u64) {
        self.re.assign(&other.re / divisor);
        self.im.assign(&other.im / divisor);
    }

    /// Drops trailing bits, off by less than `sqrt(2)` of the new units.
    pub(super) fn drop_bits(&mut self, bits: Bits) {
        self.re >>= bits;
        self.im >>= bits;
    }

    /// An `n` with `|self| < 2^n`.
    pub(super) fn length(&self) -> Bits {
        self.re.significant_bits().max(self.im.significant_bits()) + 1
    }

    /// Whether both parts are at most `limit` in absolute value.
    pub(super) fn is_small(&self, limit: u64) -> bool {
        self.re.cmp_abs(&Integer::from(limit)) != Ordering::Greater
            && self.im.cmp_abs(&Integer::from(limit)) != Ordering::Greater
    }

    /// `self * 2^-fraction_bits` with an error of so many units, as a complex ball.
    pub(super) fn to_complex(&self, fraction_bits: Bits, error: Magnitude) -> Complex {
        let unit = -i64::from(fraction_bits);
        let part = |value: &Integer| Real::from_scaled(value, unit);
        Complex::new(part(&self.re), part(&self.im)).widen(error.shift(unit))
    }
}

/// A complex number that multiplies fixed-point numbers.
///
/// The stored number differs from the one meant by less than `3 * 2^-fraction_bits`: two units in
/// each part at first, and after bits are dropped `3 * 2^-64 + sqrt(2)` of the new units.
#[derive(Clone, Debug)]
pub(super) struct ComplexFactor {
    value: FixedComplex,
    fraction_bits: Bits,
}

impl ComplexFactor {
    /// From a ball with radii far below `2^-fraction_bits`; `None` if they are not.
    pub(super) fn new(number: &Complex, fraction_bits: Bits) -> Option<ComplexFactor> {
        let scale = i64::from(fraction_bits);
        let ((re, re_error), (im, im_error)) = (number.re.to_fixed(scale)?, number.im.to_fixed(scale)?);
        // Two units in each part: less than 3 together.
        let allowed = Magnitude::power_of_two(1);
        let fits = re_error.max(im_error).cmp_value(allowed) != Ordering::Greater;
        fits.then_some(ComplexFactor { value: FixedComplex { re, im }, fraction_bits })
    }

    /// `term * self` in place: off by less than `3 |term| 2^-fraction_bits + sqrt(2)` units.
    pub(super) fn apply(&self, term: &mut FixedComplex, scratch: &mut FixedComplex) {
        scratch.re.assign(&term.re * &self.value.re);
        scratch.re -= &term.im * &self.value.im;
        scratch.im.assign(&term.re * &self.value.im);
        scratch.im += &term.im * &self.value.re;
        term.re.assign(&scratch.re >> self.fraction_bits);
        term.im.assign(&scratch.im >> self.fraction_bits);
    }

    /// Drops bits that no longer matter for the term computed last, below `2^term_bits` with its
    /// multiplier below `2^multiplier_bits`, and for those after it: for these,
    /// `3 |term| multiplier 2^-fraction_bits <= 1` still holds.
    ///
    /// Exact terms fall from there on, but computed ones need not: with errors up to `4k + 2` units
    /// each, a later one may be larger by `8k + 4`, which is below `2^40` for `k < 2^36`. So a term
    /// counts as `2^40` at least, its successors are below twice that power, and
    /// `3 * 2 * 2^-3 <= 1`.
    pub(super) fn shorten(&mut self, term_bits: Bits, multiplier_bits: Bits) {
        const LIMB: u32 = 64;
        const LEAST_BITS: Bits = 40;
        let needed = term_bits.max(LEAST_BITS) + multiplier_bits + 3;
        let spare = self.fraction_bits.saturating_sub(needed) / LIMB * LIMB;
        if spare > 0 {
            self.value.drop_bits(spare);
            self.fraction_bits -= spare;
        }
    }
}
