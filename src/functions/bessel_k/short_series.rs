//! `K_0(x)` and `K_1(x)/x` by power series in a few machine words, for `x` below some 32.
//!
//! Notation of [`super::series`]: `w = x^2/4`, `t_k = w^k/(k!)^2`. With `w = u 2^j`, `1/2 <= u < 1`,
//!
//! ```text
//! P = sum c_k u^k,          c_k = 2^(jk)/(k!)^2,          the function I_0(x),
//! S = sum c_k H_k u^k,
//! A = sum c_k/(k+1) u^k,    I_1(x) = (x/2) A,
//! K_0 = S + P (-gamma - ln(w)/2),     2 K_0 = 2 S + P G,   G = -2 gamma - j ln 2 + ln(1/u),
//! K_1/x = M/(4 w P),                  M = 1 - 2 w A K_0,
//! ```
//!
//! the last from the Wronskian as there, with `M = x I_0 K_1` in `(1/2, 1]`. The coefficients are
//! shifted table entries ([`super::coefficients`]), the sums are evaluated by Horner's rule from
//! `k = n` down, side by side, and `ln(1/u)` comes from [`super::short_logarithm`].
//!
//! Numbers are `Limbs<N>` with unit `2^-f`. All of them fit: for `j <= 8` the sums and the
//! intermediate values of Horner's rule are at most those at `u = 1`, where the largest,
//! `S <= H_n I_0(2^{j/2 + 1}) <= 6 e^32 < 2^49`. `|G|` is below 9 for `|j| <= 8`, and below `2^20`
//! for smaller `j >= -2^20`, where `P` and `A` are below two. `2 w A K_0 = x I_1 K_0 < 1/2`, so that
//! `2 A K_0` is below two for `w >= 1/4` and below `2^22` for smaller `w`.
//!
//! # Errors, in units
//!
//! *Argument.* The evaluation is for `u` rounded down to a fraction, at a point `y <= x` with
//! `x/y <= (1 + 2^(1-f))^{1/2} <= 1 + 2^-f`. By DLMF 10.29.3 and 10.29.4, `K_0' = -K_1` and
//! `(K_1/x)' = -K_2/x`, all decreasing in absolute value, so that
//!
//! ```text
//! 0 <= K_0(y) - K_0(x) <= (x - y) K_1(y) <= 2^-f y K_1(y) = 2^-f 4 w_y (K_1/y),
//! 0 <= K_1(y)/y - K_1(x)/x <= (x - y) K_2(y)/y <= 2^-f K_2(y) = 2^-f (K_0(y) + 2 K_1(y)/y).
//! ```
//!
//! *Sums.* A step of Horner's rule multiplies by `u < 1`, rounds down and adds a coefficient short
//! by less than two units: a sum is short by at most `e = 3 (n + 1)` units.
//!
//! *Terms left out.* `n` is such that `(n + 1)^2 >= 2^{j+2} >= 4 w` and `t_n <= 1` unit, proven with
//! magnitudes. As in [`super::series`] the rests of `P` and `A` are at most `t_n/3`, and that of `2 K_0` is at
//! most `2 t_n (|L|/3 + 4/9)` with `|L| <= H_n + |G|/2 <= 6 + |G|/2` (as `n < 160`), in all at most
//! `|G| + 5` units. There are `n + 1` coefficients but only `n` products, so that `e` covers the
//! thirds of a unit.
//!
//! *`K_0`.* `2 K_0` is off by at most `E = 2 e + |G| e + P e_G + 1 + (|G| + 5)`, `e_G` the error
//! of `G`. Computed numbers stand for `P`, `|G|`: their whole parts, plus one, are upper bounds as
//! `e`, `e_G` are far below a unit of the whole part.
//!
//! *`M`.* With `B = 2 K_0`: `A B` is off by at most `A E + B e + E e 2^-f + 1`, where the third is
//! below one; multiplied with `u` it is rounded once more; shifted by `j`, which multiplies by `2^j` and
//! may round. `M` is off by at most `2^j (A E + B e + 3) + 1` and the divisor `u P` by `e + 1`.
//! The quotient is one of balls.

use super::argument::{Argument, QuarterSquare};
use super::coefficients::{COUNT, OF_I0, OF_I1, OF_K0};
use super::limbs::Limbs;
use super::short_logarithm::{self, WithError};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::constants::EULER_GAMMA;
use crate::spoil::{Fault, is_active};
use std::cmp::Ordering;
use std::f64::consts::LOG2_E;

/// Largest exponent `j` for which all numbers fit.
const LARGEST_EXPONENT: i64 = 8;
/// Smallest exponent, of no importance but for being finite.
const SMALLEST_EXPONENT: i64 = -(1 << 20);
/// Bits lost to the error bounds.
const GUARD_BITS: f64 = 11.0;

/// `K_0(x)` and `K_1(x)/x` with relative errors of about `2^-bits`; `None` if the argument is too
/// large or the precision too high for this method.
pub(super) fn values(x: &Argument, bits: Bits) -> Option<(Real, Real)> {
    let size = x.estimate();
    if size >= 32.0 {
        return None;
    }
    // K_0 is smaller than I_0, whose errors it inherits, by a factor of about e^{2x}.
    let fraction_bits = f64::from(bits) + 2.0 * LOG2_E * size + GUARD_BITS;
    match (fraction_bits / 64.0).ceil() as u32 {
        0..=2 => evaluate::<3>(x, bits),
        3 => evaluate::<4>(x, bits),
        4 => evaluate::<5>(x, bits),
        5 => evaluate::<6>(x, bits),
        6 => evaluate::<7>(x, bits),
        7 => evaluate::<8>(x, bits),
        8 => evaluate::<9>(x, bits),
        _ => None,
    }
}

/// The three sums.
struct Sums<const N: usize> {
    p: Limbs<N>,
    s: Limbs<N>,
    a: Limbs<N>,
    /// The last index.
    last: usize,
}

fn evaluate<const N: usize>(x: &Argument, bits: Bits) -> Option<(Real, Real)> {
    let w = x.short_quarter_square::<N>();
    if !(SMALLEST_EXPONENT..=LARGEST_EXPONENT).contains(&w.exponent) {
        return None;
    }
    let sums = sums(&w, last_index(&w)?);
    let g = factor_of_i0(&w)?;
    let (size, is_negative) = (g.value.absolute(), g.value.is_negative());
    let product = size.times(&sums.p);
    let twice = sums.s.plus(&sums.s);
    let b = if is_negative { twice.minus(&product) } else { twice.plus(&product) };
    if b.is_negative() {
        return None;
    }

    let e = 3 * (sums.last as u64 + 1);
    let (size, p_size) = (size.whole() + 1, sums.p.whole() + 1);
    let b_error = 2 * e + size * e + p_size * g.error + 1 + size + 5;

    let m = Limbs::ONE.minus(&sums.a.times(&b).times_fraction(&w.fraction).shifted(w.exponent));
    let in_a = Magnitude::from_u64(sums.a.whole() + 1).mul(Magnitude::from_u64(b_error));
    let in_b = Magnitude::from_u64(b.whole() + 1).mul(Magnitude::from_u64(e));
    let m_error = in_a.add(in_b).add(Magnitude::from_u64(3)).shift(w.exponent).add(Magnitude::ONE);
    if m.is_negative() {
        return None;
    }
    let divisor = sums.p.times_fraction(&w.fraction);

    let unit = i64::from(Limbs::<N>::FRACTION_BITS);
    let k0 = ball(&b, bits + 8, Magnitude::from_u64(b_error)).shift(-unit - 1);
    let above = ball(&m, bits + 12, m_error);
    let below = ball(&divisor, bits + 12, Magnitude::from_u64(e + 1));
    let quotient = above.div(&below, bits + 8).shift(-w.exponent - 2);
    if w.is_exact {
        return Some((k0, quotient));
    }
    let slopes = (quotient.abs_upper().shift(w.exponent + 2), k0.abs_upper().add(quotient.abs_upper().shift(1)));
    Some((k0.widen(slopes.0.shift(-unit)), quotient.widen(slopes.1.shift(-unit))))
}

/// The number in units of the last place, as a ball.
fn ball<const N: usize>(value: &Limbs<N>, bits: Bits, error: Magnitude) -> Real {
    Real::from_integer(&value.to_integer(), bits).widen(error)
}

/// The last index `n` of the module documentation.
fn last_index<const N: usize>(w: &QuarterSquare<N>) -> Option<usize> {
    let fraction_bits = f64::from(Limbs::<N>::FRACTION_BITS);
    let log2 = w.exponent as f64 + (w.fraction.first_fraction_word() as f64).log2() - 64.0;
    let peak = (log2 / 2.0).exp2();
    let is_large = |k: usize| f64::from(OF_I0.exponent(k)) + 1.0 + k as f64 * log2 > -fraction_bits - 1e-6;
    let (mut low, mut high) = (peak as usize, COUNT - 1);
    while low < high {
        let middle = (low + high) / 2;
        if is_large(middle) { low = middle + 1 } else { high = middle }
    }
    if is_active(Fault::BesselSeriesCut) {
        return Some(low / 2);
    }
    // u < (top + 1)/2^32 for the leading half word.
    let u = Magnitude::from_u64((w.fraction.first_fraction_word() >> 32) + 1).shift(-32);
    let term = u.pow(low as u64).shift(w.exponent * low as i64 + i64::from(OF_I0.exponent(low)) + 1);
    let is_small = term.cmp_value(Magnitude::power_of_two(-i64::from(Limbs::<N>::FRACTION_BITS))) != Ordering::Greater;
    let falls = ((low as u64 + 1) * (low as u64 + 1)).ilog2() as i64 >= w.exponent + 2;
    (is_small && falls).then_some(low)
}

/// Horner's rule for the three sums at once.
fn sums<const N: usize>(w: &QuarterSquare<N>, last: usize) -> Sums<N> {
    let is_short = w.fraction.0[..N - 2].iter().all(|&word| word == 0);
    let word = w.fraction.first_fraction_word();
    let step = |sum: &Limbs<N>, coefficient: Limbs<N>| {
        let product = if is_short { sum.times_word(word) } else { sum.times_fraction(&w.fraction) };
        product.plus(&coefficient)
    };
    let (mut p, mut s, mut a) = (Limbs::ZERO, Limbs::ZERO, Limbs::ZERO);
    for k in (0..=last).rev() {
        let shift = w.exponent * k as i64;
        p = step(&p, OF_I0.scaled(k, shift));
        s = step(&s, OF_K0.scaled(k, shift));
        a = step(&a, OF_I1.scaled(k, shift));
    }
    Sums { p, s, a, last }
}

/// `G = -2 gamma - j ln 2 + ln(1/u)` in two's complement.
fn factor_of_i0<const N: usize>(w: &QuarterSquare<N>) -> Option<WithError<N>> {
    let logarithm = short_logarithm::of_inverse(&w.fraction)?;
    let gamma = short_logarithm::leading::<N>(&EULER_GAMMA);
    // Twice the constant: short by less than two units.
    let rest = logarithm.value.minus(&gamma.plus(&gamma));
    let multiple = short_logarithm::multiple_of_ln_2::<N>(w.exponent.unsigned_abs());
    let value = if w.exponent < 0 { rest.plus(&multiple) } else { rest.minus(&multiple) };
    Some(WithError { value, error: logarithm.error + 4 })
}
