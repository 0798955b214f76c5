//! `e^z K_0(z)` and `e^z K_1(z)` by the series for large arguments, in fixed-point arithmetic.
//!
//! DLMF 10.40.2 with the coefficients written as in [`super::asymptotic`]:
//! `b_k = b_{k-1} (2k-1)^2/(8 z k)`, now complex.
//!
//! # Remainder
//!
//! For `Re z >= 0`, `z != 0`, the remainder after `l >= max(nu - 1/2, 0)` terms is at most the
//! first term left out, in absolute value. For `Re z > 0` the path of the integral in
//! [`super::asymptotic`] may be turned to `arg s = -arg z`, where `e^{-zs}` is positive: between
//! the two rays `Re(zs) > 0`. On that ray `Re s >= 0`, and Taylor's theorem with the remainder
//!
//! ```text
//! s^l/(l-1)! integral_0^1 (1-t)^{l-1} f^{(l)}(ts) dt,     f(s) = (1 + s/2)^{nu-1/2},
//! ```
//!
//! has `|f^{(l)}(ts)| = |f^{(l)}(0)| |1 + ts/2|^{nu-1/2-l} <= |f^{(l)}(0)|`, so that the remainder
//! of `f` is at most `|f^{(l)}(0) s^l/l!|`; multiplied with the absolute values of the weight and
//! integrated, these are the absolute values of the terms of the series. For `l = 0` and
//! `nu <= 1/2` the bound `|f| <= 1` does the same. Both sides are continuous up to the imaginary
//! axis (without zero), where the bound therefore holds as well. (DLMF 10.40.11 gives twice the
//! term times `exp(|nu^2 - 1/4|/|z|)`.)
//!
//! # Rounding errors
//!
//! `d_k` bounds the absolute value of the complex error of the computed `B_k`. With
//! [`super::complex_fixed`] and `r_k = (2k-1)^2/(8 |z| k)`,
//! `d_k <= r_k d_{k-1} + (3 |B| (2k-1)^2 2^-f + sqrt 2)/k + sqrt 2`. Up to `k = floor(2|z|)`,
//! beyond which the loop never goes, `r_k <= 1` and `|b_k| <= 1`, and `3 |B| (2k-1)^2 2^-f <= 1` by
//! the choice of `f`, also after it is shortened (`ComplexFactor::shorten`): `d_k <= 4k`. A term of
//! `K_1` is rounded once more: off by at most `4k (2k+1)/(2k-1) + sqrt 2 <= 14 k`. The sums with
//! terms up to `N` are off by at most `2 N(N+1)` and `7 N(N+1)` units.

use super::complex_fixed::{ComplexFactor, FixedComplex};
use crate::arithmetic::{Bits, Complex, Magnitude, Real, rounding};
use crate::functions::{complex_elementary, elementary};
use rug::float::Round;

/// `e^z K_0(z)` and `e^z K_1(z)` for exact `z`, `Re z >= 0`, `z != 0`; `None` for `|z| < 1`.
///
/// The error is about `2^-bits |e^z K|` if `e^{-2|z|}` is smaller than that, else about `e^{-2|z|}`.
pub(super) fn scaled_values(z: &Complex, bits: Bits) -> Option<(Complex, Complex)> {
    // floor(2|z|) from below; far beyond the number of terms ever needed its value does not matter.
    let double = rounding::down(64, z.norm_squared(64).shift(2).lower(64).sqrt_ref());
    let enough = u64::from(bits) + 64;
    let most = if double >= enough { enough } else { double.to_integer_round(Round::Down)?.0.to_u64()? };
    if most < 2 {
        return None;
    }
    let count_bits = u64::BITS - most.leading_zeros();
    let square_bits = 2 * (count_bits + 1);
    let fraction_bits = bits.checked_add(2 * count_bits + 8)?;
    let factor_bits = fraction_bits + square_bits + 3;
    let one = Complex::from_real(Real::from_i64(1));
    let factor = ComplexFactor::new(&one.div(z, factor_bits + 8).shift(-3), factor_bits)?;
    let (order_0, order_1) = sum(factor, fraction_bits, most, square_bits);

    let short = bits + 12;
    let half_pi = Complex::from_real(elementary::pi(short).shift(-1));
    let root = complex_elementary::sqrt(&half_pi.div(z, short), short);
    Some((order_0.mul(&root, bits + 8), order_1.mul(&root, bits + 8)))
}

/// The sums `1 + a_1(nu)/z + ...` for orders zero and one.
fn sum(mut factor: ComplexFactor, fraction_bits: Bits, most: u64, square_bits: Bits) -> (Complex, Complex) {
    let mut term = FixedComplex::one(fraction_bits);
    let (mut order_0, mut order_1, mut scratch) = (term.clone(), term.clone(), FixedComplex::zero());
    let mut k = 0;
    loop {
        k += 1;
        term.mul_u64((2 * k - 1) * (2 * k - 1));
        factor.apply(&mut term, &mut scratch);
        term.div_u64(k);
        if term.is_small(k) || k >= most {
            break;
        }
        scratch.re.clone_from(&term.re);
        scratch.im.clone_from(&term.im);
        scratch.mul_u64(2 * k + 1);
        scratch.div_u64(2 * k - 1);
        if k % 2 == 0 {
            order_0.add(&term);
            order_1.sub(&scratch);
        } else {
            order_0.sub(&term);
            order_1.add(&scratch);
        }
        factor.shorten(term.length(), square_bits);
    }
    // Terms up to k - 1 are summed; the first one left out, three times as much for order one.
    let next = Magnitude::power_of_two(i64::from(term.length())).add(Magnitude::from_u64(4 * k));
    let square = Magnitude::from_u64(k).mul(Magnitude::from_u64(k));
    let error_0 = square.mul(Magnitude::from_u64(2)).add(next);
    let error_1 = square.mul(Magnitude::from_u64(7)).add(next.mul(Magnitude::from_u64(3)));
    (order_0.to_complex(fraction_bits, error_0), order_1.to_complex(fraction_bits, error_1))
}
