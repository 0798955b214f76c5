//! The integral of `|psi_h|^2` over the window, in fixed point.
//!
//! With `r_n = Sum_j c_{j+n} conj c_j = conj r_{-n}` and `W_n = (exp(i n h x2) - exp(i n h x1))/(i n h)`,
//!
//! ```text
//! P_h = h^2 s sqrt(2/pi)/(2 pi) [ (x2 - x1) r_0 + (2/h) Sum_{n=1}^{2J} (1/n) (D_n Re r_n + E_n Im r_n) ],
//! D_n = sin(n h x2) - sin(n h x1),   E_n = cos(n h x2) - cos(n h x1).
//! ```
//!
//! **Rounding.** Let `u` bound the errors of the samples' parts in units of `2^-scale`, and `N = 2J + 1`. As `|c_j| <= 1`,
//! each part of `r_n`, a sum of at most `2N` exact products, is off by at most `e = 2N (2u + u^2 2^-scale)` units and at
//! most `N` in size. The parts of `exp(i n h x)` are off by at most two units ([`unit_powers`]), so `D_n`, `E_n` are off
//! by at most four and at most two in size. Each bracket is then off by at most `4e + 8N + 8 e 2^-scale` units, and the
//! sum by that times `Sum 1/n <= 1 + log2(2J + 1)`, and by one of the finest units for every division.

use super::plan::Plan;
use super::samples::Samples;
use crate::arithmetic::convolution::{Packing, length};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{cos, pi, sin, sqrt};
use crate::routes::gaussian::{GaussianProblem, out_of_reach};
use crate::routes::{Effort, RouteFailure};
use rug::{Integer, Rational};

/// `P_h` of the window, without the lemmas' bounds.
pub(super) fn integral(
    problem: &GaussianProblem,
    plan: &Plan,
    samples: &Samples,
    bits: Bits,
    effort: &Effort,
) -> Result<Real, RouteFailure> {
    let (re, im) = autocorrelation(samples, plan.last);
    effort.check()?;
    let right = unit_powers(&Rational::from(&plan.step * &plan.right), 2 * plan.last, plan.scale, effort)?;
    let left = unit_powers(&Rational::from(&plan.step * &plan.left), 2 * plan.last, plan.scale, effort)?;
    let mut sum = Integer::new();
    for n in 1..=2 * plan.last {
        let sines = Integer::from(&right[n].1 - &left[n].1);
        let mut bracket = sines * &re[n];
        if !samples.even {
            bracket += Integer::from(&right[n].0 - &left[n].0) * &im[n];
        }
        sum += bracket / n as u64;
    }
    let scale = i64::from(plan.scale);
    let count = Magnitude::from_u64(2 * plan.last as u64 + 1);
    let u = samples.error_units;
    let each = count.shift(1).mul(u.shift(1).add(u.mul(u).shift(-scale)));
    let bracket = each.shift(2).add(count.shift(3)).add(each.shift(3 - scale));
    let harmonic = Magnitude::from_u64(65 - u64::from((2 * plan.last as u64 + 1).leading_zeros()));
    let divisions = count.shift(-2 * scale);
    let sum = Real::from_scaled(&sum, -3 * scale).widen(bracket.mul(harmonic).add(divisions).shift(-scale));
    let diagonal = Real::from_scaled(&re[0], -2 * scale).widen(each.shift(-scale));
    let step = Real::from_rational(&plan.step, bits);
    let width = Real::from_rational(&Rational::from(&plan.right - &plan.left), bits);
    let total = width.mul(&diagonal, bits).add(&sum.shift(1).div(&step, bits), bits);
    let sigma = Real::from_rational(problem.sigma(), bits);
    let root = sqrt(&Real::from_i64(2).div(&pi(bits), bits), bits);
    let prefactor = step.square(bits).mul(&sigma, bits).mul(&root, bits).div(&pi(bits).shift(1), bits);
    Ok(prefactor.mul(&total, bits))
}

/// Real and imaginary parts of `r_n` for `n` from `0` to `2J`, exactly for the rounded samples.
///
/// With the samples `c` in order and in reverse, coefficient `2J + n` of the product of one with the conjugate of the
/// other is `r_n`. Even samples are their own reverse, and their `r_n` are real.
fn autocorrelation(samples: &Samples, last: usize) -> (Vec<Integer>, Vec<Integer>) {
    let count = 2 * last + 1;
    let size = length(&samples.re).max(length(&samples.im));
    let packing = Packing::new(size, size, count, 2);
    let upper = |product: &Integer| packing.unpack(product, 2 * count - 1).split_off(2 * last);
    let (re, im) = (packing.pack(samples.re.iter()), packing.pack(samples.im.iter()));
    if samples.even {
        return (upper(&(re.square() + im.square())), Vec::new());
    }
    let (re_back, im_back) = (packing.pack(samples.re.iter().rev()), packing.pack(samples.im.iter().rev()));
    let real = Integer::from(&re * &re_back) + Integer::from(&im * &im_back);
    let imaginary = im * re_back - re * im_back;
    (upper(&real), upper(&imaginary))
}

/// `(cos(n a), sin(n a))` for `n` from `0` to `last` in units of `2^-scale`, each off by at most two units.
///
/// By repeated products with `exp(i a)` in units `v = 2^-(scale + 40)`. That factor is off by less than `3v` in absolute
/// value (two units in each part), each product is rounded by less than `1.5 v`, so that the error after `n` steps is
/// at most `e_n <= e_{n-1} (1 + 3v) + 4.5 v <= 5 n v` for `n < 2^30`, hence less than one of the coarse units; rounding
/// down to these adds one more.
fn unit_powers(
    angle: &Rational,
    last: usize,
    scale: u32,
    effort: &Effort,
) -> Result<Vec<(Integer, Integer)>, RouteFailure> {
    const GUARD: u32 = 40;
    let fine = scale + GUARD;
    let broken = || out_of_reach("the phases of the window cannot be represented");
    // Large angles lose bits of their own size.
    let size = angle.numer().significant_bits().saturating_sub(angle.denom().significant_bits());
    let bits = fine + size + 16;
    let ball = Real::from_rational(angle, bits);
    let (cosine, cosine_error) = cos(&ball, bits).to_fixed(i64::from(fine)).ok_or_else(broken)?;
    let (sine, sine_error) = sin(&ball, bits).to_fixed(i64::from(fine)).ok_or_else(broken)?;
    let allowed = Magnitude::power_of_two(1);
    if cosine_error.max(sine_error).cmp_value(allowed) == std::cmp::Ordering::Greater || last >= 1 << 30 {
        return Err(broken());
    }
    let (mut x, mut y) = (Integer::from(1) << fine, Integer::new());
    let mut powers = Vec::with_capacity(last + 1);
    for n in 0..=last {
        if n % 256 == 0 {
            effort.check()?;
        }
        powers.push((Integer::from(&x >> GUARD), Integer::from(&y >> GUARD)));
        let next = Integer::from(&x * &cosine) - Integer::from(&y * &sine);
        y = (Integer::from(&x * &sine) + Integer::from(&y * &cosine)) >> fine;
        x = next >> fine;
    }
    Ok(powers)
}
