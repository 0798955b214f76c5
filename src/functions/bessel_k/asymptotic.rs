//! `e^x K_0(x)` and `e^x K_1(x)` by the series for large arguments, in fixed-point arithmetic.
//!
//! DLMF 10.40.2 with 10.17.1: for `x > 0`, `e^x K_nu(x) ~ sqrt(pi/(2x)) (1 + a_1(nu)/x + ...)`,
//!
//! ```text
//! a_k(0)/x^k = (-1)^k b_k,    b_k = (1 3 5 ... (2k-1))^2 / (k! (8x)^k) = b_{k-1} (2k-1)^2/(8 x k),
//! a_k(1)/x^k = (-1)^{k-1} b_k (2k+1)/(2k-1)   for k >= 1,
//! ```
//!
//! the last line from `a_k(nu) = (4nu^2 - 1)(4nu^2 - 9)...(4nu^2 - (2k-1)^2)/(k! 8^k)`, where
//! `4 - (2j-1)^2 = -(2j-3)(2j+1)`.
//!
//! # Remainder
//!
//! After `l >= 1` terms the remainder is between zero and the next term (DLMF 10.40(ii) states
//! this for `l >= nu - 1/2`). It is seen directly from DLMF 10.32.8, which with `t = 1 + s` reads
//!
//! ```text
//! e^x K_nu(x) = sqrt(pi) (x/2)^nu / Gamma(nu + 1/2)
//!               integral_0^inf e^{-xs} (2s)^{nu-1/2} (1 + s/2)^{nu-1/2} ds.
//! ```
//!
//! The expansion of `(1 + s/2)^{nu-1/2}` in powers of `s`, integrated term by term, is the series.
//! By Taylor's theorem in Lagrange's form its remainder after `l` terms is the next term times
//! `(1 + theta s/2)^{nu-1/2-l}`, `0 < theta < 1`: for `l >= nu - 1/2` a factor in `(0, 1]`. The
//! weight is positive, so the same holds after integration.
//!
//! # Rounding errors
//!
//! `B_k` are integers in units of `2^-p`, rounded down; `d_k` is by how much `b_k` is above. With
//! the step error of [`super::factor`], `d_k <= r_k d_{k-1} + (B_{k-1} (2k-1)^2 2^-f + 1)/k + 1`,
//! `r_k = (2k-1)^2/(8 x k)`. The loop never goes beyond `k = floor(2x)`; up to there
//! `r_k <= 4k^2/(8xk) <= 1`, so `b_k <= 1` and, as `f` is chosen with `(2k-1)^2 <= 2^(f-p)` and
//! later shortened no further than to the length of `B (2k-1)^2`, `d_k <= d_{k-1} + 3`: `d_k <= 3 k`.
//! A term of `K_1` is rounded down once more and short by at most
//! `3 k (2k+1)/(2k-1) + 1 <= 10 k`. The sums with terms up to `N` are off by at most
//! `3 N(N+1)/2` and `5 N(N+1)` units.

use super::argument::Argument;
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary;
use rug::{Assign, Integer};

/// The two sums `1 + a_1(nu)/x + ...` in units of `2^-p`.
struct Sums {
    order_0: Integer,
    order_1: Integer,
    /// Bounds of their errors in units.
    errors: (Magnitude, Magnitude),
}

/// `e^x K_0(x)` and `e^x K_1(x)`; `None` for `x < 1`, where the series says nothing useful.
///
/// The relative error is about `2^-bits` if `e^{-2x}` is smaller than that, else about `e^{-2x}`.
pub(super) fn scaled_values(x: &Argument, bits: Bits) -> Option<(Real, Real)> {
    // An argument too large for a word has more terms than are ever needed.
    let most = x.whole_double().unwrap_or(u64::MAX).min(u64::from(bits) + 64);
    if most < 2 {
        return None;
    }
    let count_bits = u64::BITS - most.leading_zeros();
    let fraction_bits = bits.checked_add(2 * count_bits + 6)?;
    let sums = sum(x, fraction_bits, most, 2 * (count_bits + 1));

    let short = bits + 12;
    let ball = x.ball(short);
    let root = elementary::sqrt(&elementary::pi(short).div(&ball, short).shift(-1), short);
    let unit = -i64::from(fraction_bits);
    let value = |sum: &Integer, error: Magnitude| {
        Real::from_scaled(sum, unit).widen(error.shift(unit)).mul(&root, short).round(bits + 8)
    };
    Some((value(&sums.order_0, sums.errors.0), value(&sums.order_1, sums.errors.1)))
}

/// Adds terms until they are negligible or `most` is reached; `square_bits` bounds the length of
/// `(2k-1)^2` for all `k <= most`.
fn sum(x: &Argument, fraction_bits: Bits, most: u64, square_bits: Bits) -> Sums {
    let mut factor = x.eighth_of_inverse(fraction_bits + square_bits);
    let mut term = Integer::from(1) << fraction_bits;
    let (mut order_0, mut order_1, mut scratch) = (term.clone(), term.clone(), Integer::new());
    let mut k = 0;
    loop {
        k += 1;
        let odd = 2 * k - 1;
        factor.apply(&mut term, odd * odd, k, &mut scratch);
        if term <= k || k >= most {
            break;
        }
        term_of_order_1(&mut scratch, &term, k);
        if k % 2 == 0 {
            order_0 += &term;
            order_1 -= &scratch;
        } else {
            order_0 -= &term;
            order_1 += &scratch;
        }
        factor.shorten(term.significant_bits() + square_bits);
    }
    // Terms up to k - 1 are summed. The first one left out has at most this size, three times as
    // much for K_1 as (2k+1)/(2k-1) <= 3.
    let next = Magnitude::from_u64(3 * k).add(magnitude(&term));
    let rounding = Magnitude::from_u64(k).mul(Magnitude::from_u64(k));
    let errors = (
        rounding.mul(Magnitude::from_u64(2)).add(next),
        rounding.mul(Magnitude::from_u64(5)).add(next.mul(Magnitude::from_u64(3))),
    );
    Sums { order_0, order_1, errors }
}

/// `term * (2k+1)/(2k-1)`, rounded down.
fn term_of_order_1(target: &mut Integer, term: &Integer, k: u64) {
    target.assign(term * (2 * k + 1));
    *target /= 2 * k - 1;
}

fn magnitude(value: &Integer) -> Magnitude {
    Magnitude::power_of_two(i64::from(value.significant_bits()))
}
