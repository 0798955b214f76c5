//! `K_0(x)` and `K_1(x)/x` by power series in fixed-point arithmetic, for `x` not too large.
//!
//! With `w = x^2/4`, `t_k = w^k/(k!)^2` and `H_k = 1 + 1/2 + ... + 1/k` (DLMF 10.25.2, 10.31.2)
//!
//! ```text
//! I_0(x) = sum t_k,     I_1(x) = (x/2) A,  A = sum t_k/(k+1),
//! K_0(x) = sum t_k (H_k - gamma - ln(x/2)),
//! ```
//!
//! and `K_1(x)` follows from the Wronskian `I_0 K_1 + I_1 K_0 = 1/x` (DLMF 10.28.2):
//! `K_1/x = (1/x^2 - (A/2) K_0)/I_0`. Both products in `I_0 K_1 + I_1 K_0` are positive and the
//! first is the larger (`I_1 < I_0`, `K_0 < K_1`), so that this loses at most one bit.
//!
//! # No product with a harmonic number per term
//!
//! Let `P_j = t_0 + ... + t_j` and cut all sums after `k = N`. Writing `H_N - H_k` as a sum of
//! `1/j` over `k < j <= N` and exchanging the sums,
//!
//! ```text
//! sum_{k<=N} t_k H_k = H_N P_N - Q_N,     Q_N = sum_{j=1}^{N} P_{j-1}/j,
//! K_0 = P_N L - Q_N + R,   L = H_N - gamma - ln(x/2),   R = sum_{k>N} t_k (H_k - gamma - ln(x/2)).
//! ```
//!
//! # The sums cut off
//!
//! The loop stops at an `N` with `(N+1)^2 >= 4w`, so that `t_{k+1} <= t_k/4` for `k >= N`, and
//! `t_k <= 4^{-(k-N)} t_N` there. From `H_n - gamma > ln n` (the sequence `H_n - ln n` decreases to
//! `gamma`) every factor in `R` is positive as `N + 1 >= 2 sqrt(w) = x`, and it is at most
//! `L + (k - N)`. Therefore
//!
//! ```text
//! 0 <= R <= t_N sum_{m>=1} 4^{-m} (L + m) = t_N (L/3 + 4/9),
//! 0 <= sum_{k>N} t_k <= t_N/3,     0 <= sum_{k>N} t_k/(k+1) <= t_N/3.
//! ```
//!
//! # Rounding errors
//!
//! All terms and sums are integers, rounded down at each step, in units of the last place; `e_k`
//! is by how many units the exact `t_k` is above the computed one. With the step error of
//! [`super::factor`], `e_k <= (w/k^2) e_{k-1} + (T 2^-f + 1)/k^2 + 1`, `T` the computed term
//! before. Relative accuracy is needed while terms grow, absolute accuracy afterwards, so the loop
//! changes its unit once, after the term `M = floor(sqrt(w))`, the last with `w/k^2 >= 1`.
//!
//! *Up to `M`* the unit is `2^-(p+g)` and `f = p + g`, so `T 2^-f <= t_{k-1} = t_k k^2/w`. As
//! `t_k >= 1` and `w >= 1` there, `e_k/t_k <= e_{k-1}/t_{k-1} + 3`, hence `e_k <= 3 k t_k`.
//! Sums inherit: `P_k` is short by at most `3 k P`, `A_k` by `3 P + k`, `Q_k` by `3 k P + k`
//! with `P = t_0 + ... + t_M`.
//!
//! *The change* drops `g` bits from all numbers, which costs one more unit. The integer `g` is at
//! least `1.4427 x > x log2(e)`, so `P <= I_0(x) <= e^x <= 2^g`. Afterwards `e_M <= 3M + 1` and
//! `P_M`, `A_M`, `Q_M` are short by at most `3M + 1`, `M + 4`, `4M + 1` units of `2^-p`.
//!
//! *From `M` on* `w/k^2 < 1`, and `T 2^-f <= 1`: at first because `t_k <= 2^g`, later because the
//! stored factor is shortened no further than to the length of the term. A step adds at most 3
//! units, so `e_k <= 3 k + 1`, and by summation, for all `k`,
//!
//! ```text
//! P_k and Q_k are short by at most 2 (k+1)^2 units,   A_k by at most 4 (k+1) units:
//! P:  sum_{j<=k} (3 j + 1);    A:  M + 4 + sum_{M<j<=k} ((3 j + 1)/(j + 1) + 1);
//! Q:  4 M + 1 + sum_{M<j<=k} ((3 j (j-1)/2 + j)/j + 1).
//! ```
//!
//! Without growing terms (`w < 1`) the same holds with `M = g = 0`.
//!
//! `K_0` is as small as `e^-x` while `P_N` is as large as `e^x`: `p` has `x/ln 2` bits more than
//! asked for, and `g` another `x/ln 2`. How many bits `p` gets is decided with doubles; the bounds
//! above hold for every `p`.

use super::argument::Argument;
use super::factor::Factor;
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary;
use crate::spoil::{Fault, is_active};
use rug::{Assign, Integer};
use std::f64::consts::LOG2_E;

/// What the power series give.
pub(super) struct SeriesValues {
    /// `K_0(x)`.
    pub(super) k0: Real,
    /// `K_1(x)/x`.
    pub(super) k1_over_x: Real,
    /// `I_0(x)`.
    #[cfg_attr(not(test), allow(dead_code))]
    pub(super) i0: Real,
    /// `I_1(x)/x`.
    #[cfg_attr(not(test), allow(dead_code))]
    pub(super) i1_over_x: Real,
}

/// The precisions of one evaluation.
struct Plan {
    /// Bits after the point once terms fall (`p`).
    fraction_bits: Bits,
    /// Additional bits while terms grow (`g`).
    growth_bits: Bits,
    /// The last index with growing terms (`M`).
    peak: u64,
    /// An integer not below `x`; the loop runs until `N + 1` reaches it.
    ceiling: u64,
}

impl Plan {
    fn new(x: &Argument, bits: Bits) -> Option<Plan> {
        let whole_square = x.whole_square()?;
        let peak = (whole_square / 4).isqrt();
        let ceiling = whole_square.isqrt() + 1;
        let growth_bits = if peak == 0 { 0 } else { growth_bits(ceiling)? };
        let size = x.estimate();
        let terms = f64::from(bits) / 4.0 + 2.2 * size + 4.0;
        let smallness = LOG2_E * size + 0.5 * (1.0 + size).log2();
        let fraction_bits = f64::from(bits) + smallness + 2.0 * terms.log2() + 4.0;
        let fits = fraction_bits < f64::from(u32::MAX / 8);
        fits.then(|| Plan { fraction_bits: fraction_bits.ceil() as Bits, growth_bits, peak, ceiling })
    }
}

/// An integer `g` with `e^y <= 2^g`, from `1.4427 > log2(e)`; `None` if it is beyond all reason.
pub(super) fn growth_bits(y: u64) -> Option<Bits> {
    let bits = y.checked_mul(14_427)? / 10_000 + 1;
    Bits::try_from(bits).ok().filter(|&bits| bits < Bits::MAX / 8)
}

/// The sums `P`, `A`, `Q` of the module documentation, in units of `2^-p`.
struct Sums {
    p: Integer,
    a: Integer,
    q: Integer,
    /// The last index summed (`N`).
    last: u64,
    /// Bound of the term `t_N`, in units.
    last_term: Magnitude,
}

impl Sums {
    /// All sums after the term with index zero.
    fn start(term: &Integer) -> Sums {
        let (p, a, q) = (term.clone(), term.clone(), Integer::new());
        Sums { p, a, q, last: 0, last_term: Magnitude::INFINITY }
    }

    fn drop_bits(&mut self, bits: Bits) {
        for number in [&mut self.p, &mut self.a, &mut self.q] {
            *number >>= bits;
        }
    }
}

/// Consecutive quotients `P_{k-1}/k` and `t_k/(k+1)` over a common denominator, so that there is
/// one long division for several of them, rounding down once.
struct Block {
    /// The product of `first, ..., last + 1` where the block is for `first <= k <= last`.
    denominator: u64,
    last: u64,
    p_part: Integer,
    t_part: Integer,
}

impl Block {
    /// More terms than this are not worth while.
    const LONGEST: u64 = 6;

    fn new() -> Block {
        Block { denominator: 1, last: 0, p_part: Integer::new(), t_part: Integer::new() }
    }

    /// Prepares an empty block for the indices from `first` on. Indices are below `2^32`.
    fn restart(&mut self, first: u64) {
        self.denominator = first * (first + 1);
        self.last = first;
        while self.last + 1 < first + Block::LONGEST {
            let Some(more) = self.denominator.checked_mul(self.last + 2) else { break };
            self.denominator = more;
            self.last += 1;
        }
    }

    /// Adds the quotients collected to the sums and leaves the block empty.
    fn finish(&mut self, sums: &mut Sums) {
        self.p_part /= self.denominator;
        self.t_part /= self.denominator;
        sums.q += &self.p_part;
        sums.a += &self.t_part;
        self.p_part.assign(0);
        self.t_part.assign(0);
    }
}

fn sum(plan: &Plan, mut factor: Factor) -> Sums {
    let mut term = Integer::from(1) << (plan.fraction_bits + plan.growth_bits);
    let mut sums = Sums::start(&term);
    let (mut block, mut scratch) = (Block::new(), Integer::new());
    let mut k = 0u64;
    loop {
        k += 1;
        if k > block.last {
            block.finish(&mut sums);
            block.restart(k);
        }
        block.p_part += &sums.p * (block.denominator / k);
        factor.apply(&mut term, 1, k * k, &mut scratch);
        sums.p += &term;
        block.t_part += &term * (block.denominator / (k + 1));
        if k == plan.peak {
            block.finish(&mut sums);
            block.restart(k + 1);
            sums.drop_bits(plan.growth_bits);
            term >>= plan.growth_bits;
        }
        if k < plan.peak {
            continue;
        }
        let complete = term <= k && k + 1 >= plan.ceiling;
        let cut_early = is_active(Fault::BesselSeriesCut) && term.significant_bits() < plan.fraction_bits / 2;
        if complete || cut_early {
            block.finish(&mut sums);
            let last_term = if complete { Magnitude::from_u64(4 * k + 1) } else { Magnitude::ZERO };
            return Sums { last: k, last_term, ..sums };
        }
        factor.shorten(term.significant_bits());
    }
}

/// `K_0(x)`, `K_1(x)/x`, `I_0(x)` and `I_1(x)/x` with relative errors of about `2^-bits`.
///
/// Valid for every positive argument. The work grows with `x`, and an argument beyond all reason
/// (above `2^27`) gives the whole line.
pub(super) fn values(x: &Argument, bits: Bits) -> SeriesValues {
    let Some(plan) = Plan::new(x, bits) else {
        let nothing = Real::whole_line;
        return SeriesValues { k0: nothing(), k1_over_x: nothing(), i0: nothing(), i1_over_x: nothing() };
    };
    let full_bits = plan.fraction_bits + plan.growth_bits;
    let sums = sum(&plan, x.quarter_square(full_bits));
    let unit = -i64::from(plan.fraction_bits);
    let count = Magnitude::from_u64(sums.last + 1).shift(1);
    // 2 (N+1)^2 units, and half of 4 (N+1) units.
    let error = count.mul(count).shift(unit - 1);
    let half_a_error = count.shift(unit);
    let last_term = sums.last_term.shift(unit);

    let p = Real::from_scaled(&sums.p, unit).widen(error);
    let q = Real::from_scaled(&sums.q, unit).widen(error);
    let logarithm = logarithm(x, sums.last, full_bits);
    // The rest R is at most t_N (L + 2)/3, as 4/9 < 2/3; a third is bounded by 3/8.
    let rest_factor = logarithm.abs_upper().add(Magnitude::from_u64(2)).mul(Magnitude::from_u64(3)).shift(-3);
    let k0 = p.mul(&logarithm, full_bits + 8).sub(&q, full_bits + 8).widen(last_term.mul(rest_factor)).round(bits + 8);

    let short = bits + 12;
    let i0 = p.widen(last_term).round(short);
    let half_a = Real::from_scaled(&sums.a, unit - 1).widen(half_a_error.add(last_term)).round(short);
    let k1_over_x = x.inverse_square(short).sub(&half_a.mul(&k0, short), short).div(&i0, short).round(bits + 8);
    SeriesValues { k0, k1_over_x, i0, i1_over_x: half_a }
}

/// `L = H_n - gamma - ln(x/2)` with an absolute error of about `2^-fraction_bits`.
fn logarithm(x: &Argument, n: u64, fraction_bits: Bits) -> Real {
    let size = (x.log2_estimate().abs() + 4.0).log2().ceil() as Bits;
    let bits = fraction_bits + size + 4;
    let (harmonic, error) = harmonic_number(n, fraction_bits + 4);
    let unit = -i64::from(fraction_bits + 4);
    let harmonic = Real::from_scaled(&harmonic, unit).widen(Magnitude::from_u64(error).shift(unit));
    harmonic.sub(&elementary::euler_gamma(bits), bits).sub(&x.ln_half(bits), bits)
}

/// `H_n 2^fraction_bits` rounded down, and by how much the exact number is above it at most.
///
/// Consecutive `1/j` are added as quotients of machine words for as long as these fit, so that
/// there are few divisions of long numbers; each rounds down by less than one.
pub(super) fn harmonic_number(n: u64, fraction_bits: Bits) -> (Integer, u64) {
    let (mut total, mut quotients) = (Integer::new(), 0);
    let mut j = 1;
    while j <= n {
        let (mut numerator, mut denominator) = (1u64, j);
        j += 1;
        while j <= n {
            let both = numerator.checked_mul(j).and_then(|left| left.checked_add(denominator));
            let (Some(above), Some(below)) = (both, denominator.checked_mul(j)) else { break };
            (numerator, denominator) = (above, below);
            j += 1;
        }
        total += (Integer::from(numerator) << fraction_bits) / denominator;
        quotients += 1;
    }
    (total, quotients)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::functions::bessel_k::{Method, k_by};
    use rug::Float;

    proptest::proptest! {
        // DLMF 10.28.2, I_0 K_1 + I_1 K_0 = 1/x, with K from the trapezoid rule.
        #[test]
        fn wronskian(ln_size in -20.0f64..5.0, bits in 20u32..400) {
            let x = Float::with_val(53, ln_size.exp());
            let own = values(&Argument::Number(&x), bits);
            let x = Real::from_float(x);
            let (k0, k1) = (k_by(Method::Trapezoid, 0, &x, bits), k_by(Method::Trapezoid, 1, &x, bits));
            let i1 = own.i1_over_x.mul(&x, bits + 10);
            let sum = own.i0.mul(&k1, bits + 10).add(&i1.mul(&k0, bits + 10), bits + 10);
            let inverse = Real::from_i64(1).div(&x, bits + 50);
            proptest::prop_assert!(sum.overlaps(&inverse));
            proptest::prop_assert!(sum.accuracy_estimate() >= f64::from(bits) - 6.0);
        }

        #[test]
        fn harmonic_numbers(n in 0u64..300, fraction_bits in 0u32..200) {
            let (found, error) = harmonic_number(n, fraction_bits);
            let exact = (1..=n).fold(rug::Rational::new(), |sum, j| sum + rug::Rational::from((1, j)));
            let scaled = exact << fraction_bits;
            proptest::prop_assert!(scaled >= found && scaled <= found + error);
        }
    }

    #[test]
    fn growth_bits_bound_the_exponential() {
        for y in [1u64, 2, 10, 1000, 100_000] {
            let power = Float::with_val(64, 1) << growth_bits(y).unwrap();
            assert!(Float::with_val(64, y).exp() <= power);
        }
        assert_eq!(growth_bits(u64::MAX), None);
    }
}
