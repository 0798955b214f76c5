//! The double sum `S = Sum_j Sum_l f_j conj(f_l) i/(sinh z_j - conj sinh z_l)` in fixed point.
//!
//! With `a = z_j`, `b = conj z_l`: `sinh a - sinh b = 2 cosh((a+b)/2) sinh((a-b)/2)`, and since
//! `tanh((a+b)/2) + coth((a-b)/2) = cosh(a)/(cosh((a+b)/2) sinh((a-b)/2))`, with `e = f/cosh`,
//!
//! ```text
//! S = (i/2) Sum_{j,l} e_j conj(f_l) (T_{j+l} + C_{j-l}),   T_m = tanh(m h/2),
//! C_n = coth(n h/2 + ic) = (sinh(nh) - i sin(2c))/(cosh(nh) - cos(2c)).
//! ```
//!
//! Exchanging `j` and `l` shows that `S` is real, so
//! `S = -(1/2) Im [Sum_m T_m H_m + Sum_n C_n D_n]` with the diagonal sums `H_m = Sum_{j+l=m} e_j conj f_l` and
//! `D_n = Sum_{j-l=n} e_j conj f_l`, six products of packed big integers.
//!
//! **Rounding.** In units of `v = 2^-scale` of the scaled numbers let the parts of `e`, `f` be off by `u_e`, `u_f` and at
//! most `M_e`, `M_f` in size (as rounded, as plain numbers), those of `T`, `C` off by `u_T`, `u_C` and at most `1 + u_T v`,
//! `M_C` in size. A part of `e conj f` is a sum of two products: off by at most
//! `d = 2 (M_e u_f + M_f u_e + u_e u_f v)` units and at most `2 M_e M_f` in size as rounded. Each of the `N^2` pairs
//! enters once with `T` and twice with `C`, so the sum in brackets is off by at most
//! `N^2 [d (1 + u_T v + 2 M_C) + (u_T + 2 u_C) (2 M_e M_f + d v)]` units: products are off by the error of one factor
//! times the size of the other as rounded, and the error of that times the exact size of the first.

use super::nodes::{Fixed, Nodes};
use super::plan::Plan;
use crate::arithmetic::convolution::{Packing, length};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::{cos, exp, sin};
use crate::routes::gaussian::out_of_reach;
use crate::routes::{Effort, RouteFailure};
use rug::Integer;

/// `S` as a ball.
pub(super) fn sum(nodes: &Nodes, plan: &Plan, bits: Bits, effort: &Effort) -> Result<Real, RouteFailure> {
    let count = plan.count();
    let tangents = tangents(plan, bits, effort)?;
    let cotangents = cotangents(plan, bits, effort)?;
    let diagonals = Diagonals::new(nodes, effort)?;
    let mut total = Integer::new();
    for (tangent, part) in tangents.re.iter().zip(&diagonals.sums_im) {
        total += Integer::from(tangent * part);
    }
    for (index, (re, im)) in diagonals.differences_re.iter().zip(&diagonals.differences_im).enumerate() {
        // The index belongs to n = index - (count - 1); the real part of C is odd and its imaginary part even in n.
        let n = index.abs_diff(count - 1);
        let odd = Integer::from(&cotangents.re[n] * im);
        if index + 1 < count {
            total -= odd
        } else {
            total += odd
        }
        total += Integer::from(&cotangents.im[n] * re);
    }
    let scale = i64::from(plan.scale);
    let error = rounding(nodes, &tangents, &cotangents, count, scale);
    let value = Real::from_scaled(&total, -3 * scale).widen(error.shift(-scale));
    // Two factors were scaled by 2^-exponent.
    Ok(value.neg().shift(2 * plan.exponent - 1).round(bits))
}

/// The bound derived above, in units of `2^-scale`.
fn rounding(nodes: &Nodes, tangents: &Fixed, cotangents: &Fixed, count: usize, scale: i64) -> Magnitude {
    let (u_e, u_f) = (nodes.e.error_units, nodes.f.error_units);
    let (m_e, m_f) = (nodes.e.largest().shift(-scale), nodes.f.largest().shift(-scale));
    let (u_t, u_c) = (tangents.error_units, cotangents.error_units);
    let m_c = cotangents.largest().add(u_c).shift(-scale);
    let product = m_e.mul(u_f).add(m_f.mul(u_e)).add(u_e.mul(u_f).shift(-scale)).shift(1);
    let factor = Magnitude::ONE.add(u_t.shift(-scale)).add(m_c.shift(1));
    let rest = u_t.add(u_c.shift(1)).mul(m_e.mul(m_f).shift(1).add(product.shift(-scale)));
    let pairs = Magnitude::from_u64(count as u64);
    pairs.mul(pairs).mul(product.mul(factor).add(rest))
}

/// Sums of `e_j conj f_l` along the diagonals, in units of `2^-(2 scale)`.
struct Diagonals {
    sums_im: Vec<Integer>,
    differences_re: Vec<Integer>,
    differences_im: Vec<Integer>,
}

impl Diagonals {
    fn new(nodes: &Nodes, effort: &Effort) -> Result<Diagonals, RouteFailure> {
        let count = nodes.e.re.len();
        let size = |fixed: &Fixed| length(&fixed.re).max(length(&fixed.im));
        let packing = Packing::new(size(&nodes.e), size(&nodes.f), count, 2);
        let (e_re, e_im) = (packing.pack(nodes.e.re.iter()), packing.pack(nodes.e.im.iter()));
        let (f_re, f_im) = (packing.pack(nodes.f.re.iter()), packing.pack(nodes.f.im.iter()));
        let all = 2 * count - 1;
        let sums_im = packing.unpack(&(Integer::from(&e_im * &f_re) - Integer::from(&e_re * &f_im)), all);
        effort.check()?;
        let (f_re, f_im) = (packing.pack(nodes.f.re.iter().rev()), packing.pack(nodes.f.im.iter().rev()));
        let re = Integer::from(&e_re * &f_re) + Integer::from(&e_im * &f_im);
        effort.check()?;
        let im = e_im * f_re - e_re * f_im;
        Ok(Diagonals { sums_im, differences_re: packing.unpack(&re, all), differences_im: packing.unpack(&im, all) })
    }
}

/// `T_m` for `m` from twice the first to twice the last node, as real parts; the imaginary parts are left at zero.
fn tangents(plan: &Plan, bits: Bits, effort: &Effort) -> Result<Fixed, RouteFailure> {
    let step = Real::from_rational(&plan.step, bits);
    let factor = exp(&step, bits);
    let mut power = exp(&step.mul_i64(2 * plan.first, bits), bits);
    let one = Real::from_i64(1);
    let all = 2 * plan.count() - 1;
    let mut table = Fixed::with_capacity(all);
    for index in 0..all {
        if index % 256 == 0 {
            effort.check()?;
        }
        let value = power.sub(&one, bits).div(&power.add(&one, bits), bits);
        table.push(&Complex::from_real(value), i64::from(plan.scale)).ok_or_else(broken)?;
        power = power.mul(&factor, bits);
    }
    Ok(table)
}

/// `C_n` for `n` from zero to the number of nodes.
fn cotangents(plan: &Plan, bits: Bits, effort: &Effort) -> Result<Fixed, RouteFailure> {
    let step = Real::from_rational(&plan.step, bits);
    let factor = exp(&step, bits);
    let double = Real::from_rational(&plan.shift, bits).shift(1);
    let (sine, cosine) = (sin(&double, bits), cos(&double, bits));
    let one = Real::from_i64(1);
    let mut power = one.clone();
    let mut table = Fixed::with_capacity(plan.count());
    for index in 0..plan.count() {
        if index % 256 == 0 {
            effort.check()?;
        }
        let inverse = one.div(&power, bits);
        let sinh = power.sub(&inverse, bits).shift(-1);
        let cosh = power.add(&inverse, bits).shift(-1);
        let below = cosh.sub(&cosine, bits);
        let value = Complex::new(sinh.div(&below, bits), sine.neg().div(&below, bits));
        table.push(&value, i64::from(plan.scale)).ok_or_else(broken)?;
        power = power.mul(&factor, bits);
    }
    Ok(table)
}

fn broken() -> RouteFailure {
    out_of_reach("the kernel of the double sum is not finite")
}
