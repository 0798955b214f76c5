//! `K_0(z)` and `K_1(z)` by power series in fixed-point arithmetic, for complex `z` not too large.
//!
//! Notation and rearrangement as for real arguments ([`super::series`]): `w = z^2/4`,
//! `t_k = w^k/(k!)^2`, `s_k = t_k/(k+1)`, partial sums `P_k` of `t` and `A_k` of `s`, all sums cut
//! after `N`. The Wronskian is no help here since `I_0` has zeros on the imaginary axis; instead,
//! DLMF 10.31.1 with `psi(k+1) = H_k - gamma` reads
//!
//! ```text
//! K_1(z)/z = 1/z^2 - (1/2) sum s_k (H_k - gamma - ln(z/2) + 1/(2k+2)),
//! K_0(z)   = P_N L - Q_N + R,                          L = H_N - gamma - ln(z/2),
//! K_1(z)/z = 1/z^2 - (1/2) (A_N L - Q'_N + B_N/2 + R'),
//! Q_N = sum_{j=1}^N P_{j-1}/j,   Q'_N = sum_{j=1}^N A_{j-1}/j,   B_N = sum_{k<=N} s_k/(k+1).
//! ```
//!
//! The principal logarithm is meant, so this holds for all `z` off the negative real axis.
//!
//! # The sums cut off
//!
//! For `N + 1 >= |z|`, `|t_{k+1}| <= |t_k|/4` from `k = N` on. As `H_k - H_N <= k - N`,
//!
//! ```text
//! |R| <= |t_N| sum_{m>=1} 4^{-m} (|L| + m) = |t_N| (|L|/3 + 4/9),
//! |R'| <= |t_N| (|L|/3 + 4/9 + 1/6),
//! ```
//!
//! both at most `|t_N| (|L| + 2)/3`.
//!
//! # Rounding errors
//!
//! `e_k` bounds the absolute value of the complex error of the computed `t_k`. With
//! [`super::complex_fixed`], `e_k <= (|w|/k^2) e_{k-1} + (3 |T| 2^-f + sqrt 2)/k^2 + sqrt 2`. The
//! unit changes once as for real arguments, after `M = floor(sqrt|w|)`; `|w|` is known to a
//! relative `2^-50`, and if that leaves two choices, the larger one is taken.
//!
//! *Up to `M`* the unit is `2^-(p+g)` and `f = p + g + 2`, so `3 |T| 2^-f <= |t_{k-1}|`, computed
//! and exact terms differing by much less than a third (`p >= 64`, `k < 2^31`). Terms grow
//! up to `M`, `|t_k| >= 1 - 2^-50` and `|w| >= 1 - 2^-50`, so `e_k/|t_k|` grows by at most
//! `(1 + 2 sqrt 2)(1 + 2^-49) < 4`: `e_k <= 4 k |t_k|`. With `S = |t_0| + ... + |t_M|` the errors
//! of `P_k, Q_k, A_k, Q'_k, B_k` are at most `4kS`, `4kS + 2k`, `4S + 2(k+1)`, `k(4S + 3)`,
//! `4S + 3(k+1)`. (For `Q'`: `A_0` is exact and `A_{j-1}` off by `4S + sqrt(2) (j-1)`, so that the
//! terms are off by `sqrt 2` for `j = 1` and `4S/j + 2 sqrt(2)` after it.)
//!
//! *The change* divides by `2^g >= e^{|z|} >= S` and adds `sqrt 2`.
//!
//! *From `M` on* `|w|/k^2 <= 1` and `3 |T| 2^-f <= 1` (at first as `|t_k| <= S <= 2^g`, later by
//! `ComplexFactor::shorten`), so `e_k <= 4k + 2`, and by summation the
//! errors are at most
//!
//! ```text
//! P: 2 (k+1)^2      (sum of 4j + 2)
//! Q: 4 (k+1)^2      (2j + 2 for each j after M, at most 6M + 2 before)
//! A: 7 (k+1)        (6 for each j after M, at most 2M + 8 before)
//! Q': 9 (k+1)       (9 for each j after M, at most 7M + 2 before)
//! B: 9 (k+1)        (5 for each j after M, at most 3M + 9 before).
//! ```

use super::complex_fixed::{ComplexFactor, FixedComplex};
use super::series::{growth_bits, harmonic_number};
use crate::arithmetic::{Bits, Complex, Magnitude, Real, rounding};
use crate::functions::{complex_elementary, elementary};
use crate::spoil::{Fault, is_active};
use std::f64::consts::LOG2_E;

/// The precisions of one evaluation, as for real arguments.
struct Plan {
    fraction_bits: Bits,
    growth_bits: Bits,
    peak: u64,
    ceiling: u64,
}

impl Plan {
    fn new(z: &Complex, bits: Bits) -> Option<Plan> {
        // |z|^2 with a relative error below 2^-60, as z is exact.
        let norm = z.norm_squared(64).upper(64);
        let size = rounding::up(64, norm.sqrt_ref());
        let ceiling = whole(&size)?.checked_add(1)?;
        let peak = whole(&size)? / 2;
        let growth_bits = if peak == 0 { 0 } else { growth_bits(ceiling)? };
        let size = size.to_f64();
        let terms = f64::from(bits) / 4.0 + 2.2 * size + 4.0;
        let smallness = LOG2_E * z.re.to_f64() + 1.5 * (1.0 + size).log2();
        let fraction_bits = f64::from(bits) + smallness + 2.0 * terms.log2() + 8.0;
        let fits = fraction_bits < f64::from(u32::MAX / 8);
        fits.then(|| Plan { fraction_bits: (fraction_bits.ceil() as Bits).max(64), growth_bits, peak, ceiling })
    }
}

/// `floor(value)` of a non-negative number if it fits a word.
fn whole(value: &rug::Float) -> Option<u64> {
    value.to_integer_round(rug::float::Round::Down)?.0.to_u64().filter(|&found| found < 1 << 31)
}

/// The sums of the module documentation in units of `2^-p`.
struct Sums {
    /// `P`, `Q`, `A`, `Q'`, `B`.
    p: FixedComplex,
    q: FixedComplex,
    a: FixedComplex,
    q_of_a: FixedComplex,
    b: FixedComplex,
    /// The last index summed (`N`).
    last: u64,
    /// Bound of `|t_N|`, in units.
    last_term: Magnitude,
}

fn sum(plan: &Plan, mut factor: ComplexFactor) -> Sums {
    let mut term = FixedComplex::one(plan.fraction_bits + plan.growth_bits);
    let (mut p, mut a, mut b) = (term.clone(), term.clone(), term.clone());
    let (mut q, mut q_of_a, mut scratch) = (FixedComplex::zero(), FixedComplex::zero(), FixedComplex::zero());
    let mut k = 0u64;
    loop {
        k += 1;
        scratch.assign_quotient(&p, k);
        q.add(&scratch);
        scratch.assign_quotient(&a, k);
        q_of_a.add(&scratch);
        factor.apply(&mut term, &mut scratch);
        term.div_u64(k * k);
        p.add(&term);
        scratch.assign_quotient(&term, k + 1);
        a.add(&scratch);
        scratch.div_u64(k + 1);
        b.add(&scratch);
        if k == plan.peak {
            for number in [&mut term, &mut p, &mut q, &mut a, &mut q_of_a, &mut b] {
                number.drop_bits(plan.growth_bits);
            }
        }
        if k < plan.peak {
            continue;
        }
        if term.is_small(k) && k + 1 >= plan.ceiling {
            // Parts up to k and an error of 4k + 2.
            return Sums { p, q, a, q_of_a, b, last: k, last_term: Magnitude::from_u64(6 * k + 2) };
        }
        if is_active(Fault::BesselSeriesCut) && term.length() < plan.fraction_bits / 2 {
            return Sums { p, q, a, q_of_a, b, last: k, last_term: Magnitude::ZERO };
        }
        factor.shorten(term.length(), 0);
    }
}

/// `K_0(z)` and `K_1(z)` for exact `z` off the negative real axis, not zero.
///
/// Errors are about `2^-bits |K|`. An argument beyond all reason (above `2^27`) gives the whole
/// plane.
pub(super) fn values(z: &Complex, bits: Bits) -> (Complex, Complex) {
    evaluate(z, bits).unwrap_or_else(|| (complex_elementary::whole_plane(), complex_elementary::whole_plane()))
}

fn evaluate(z: &Complex, bits: Bits) -> Option<(Complex, Complex)> {
    let plan = Plan::new(z, bits)?;
    let unit_bits = plan.fraction_bits;
    let full_bits = unit_bits + plan.growth_bits;
    // w = (x^2 - y^2)/4 + i xy/2 to the absolute accuracy of the factor, and to spare.
    let size_bits = 2 * (u64::BITS - plan.ceiling.leading_zeros());
    let quarter_square = z.square(full_bits + size_bits + 16).shift(-2);
    let sums = sum(&plan, ComplexFactor::new(&quarter_square, full_bits + 2)?);

    let count = Magnitude::from_u64(sums.last + 1);
    let linear = |factor: u64| count.mul(Magnitude::from_u64(factor));
    let p = sums.p.to_complex(unit_bits, count.mul(linear(2)));
    let q = sums.q.to_complex(unit_bits, count.mul(linear(4)));
    let a = sums.a.to_complex(unit_bits, linear(7));
    let q_of_a = sums.q_of_a.to_complex(unit_bits, linear(9));
    let half_b = sums.b.to_complex(unit_bits, linear(9)).shift(-1);

    let logarithm = logarithm(z, sums.last, full_bits);
    // A third is bounded by 3/8.
    let rest = logarithm.abs_upper().add(Magnitude::from_u64(2)).mul(Magnitude::from_u64(3)).shift(-3);
    let rest = rest.mul(sums.last_term).shift(-i64::from(unit_bits));
    let wide = full_bits + 8;
    let k0 = p.mul(&logarithm, wide).sub(&q, wide).widen(rest);
    let sum_1 = a.mul(&logarithm, wide).sub(&q_of_a, wide).add(&half_b, wide).widen(rest);
    let inverse_square = Complex::from_real(Real::from_i64(1)).div(&z.square(wide), wide);
    let k1 = inverse_square.sub(&sum_1.shift(-1), wide).mul(z, bits + 12);
    Some((rounded(&k0, bits + 8), rounded(&k1, bits + 8)))
}

fn rounded(value: &Complex, bits: Bits) -> Complex {
    Complex::new(value.re.round(bits), value.im.round(bits))
}

/// `L = H_n - gamma - ln(z/2)` with an absolute error of about `2^-fraction_bits`.
fn logarithm(z: &Complex, n: u64, fraction_bits: Bits) -> Complex {
    let size = (z.abs_upper().log2_estimate().abs() + 4.0).log2().ceil() as Bits;
    let bits = fraction_bits + size + 4;
    let (harmonic, error) = harmonic_number(n, fraction_bits + 4);
    let unit = -i64::from(fraction_bits + 4);
    let harmonic = Real::from_scaled(&harmonic, unit).widen(Magnitude::from_u64(error).shift(unit));
    let constant = harmonic.sub(&elementary::euler_gamma(bits), bits);
    Complex::from_real(constant).sub(&complex_elementary::ln(&z.shift(-1), bits), bits)
}
