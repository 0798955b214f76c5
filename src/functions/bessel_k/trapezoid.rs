//! `K_nu(z)` by the trapezoid rule, for `Re z > 0` and orders up to two: an independent check.
//!
//! DLMF 10.32.9: `K_nu(z) = integral_0^inf f(u) du`, `f(u) = e^{-z cosh u} cosh(nu u)`, half the
//! integral over the line as `f` is even. With step `h` and nodes up to `n h = U`,
//!
//! ```text
//! K_nu(z) = h (f(0)/2 + f(h) + ... + f(nh)) + D + C.
//! ```
//!
//! # Discretisation error `D`
//!
//! Let `z = x + iy` and `0 < d < pi/2 - |arg z|`. In the strip `|Im u| <= d` the entire function `f`
//! tends to zero uniformly at both ends. For `|b| <= d`,
//!
//! ```text
//! Re(z cosh(u + ib)) = x cosh u cos b - y sinh u sin b >= cosh u (x cos d - |y| sin d) = q cosh u,
//! ```
//!
//! with `q > 0` (the bracket is `|z| cos(|arg z| + d)`), and `|cosh(nu (u + ib))| <= cosh(nu u)`,
//! so that the integral of `|f(u + ib)|` over the line is at most `2 K_nu(q)`. By Theorem 5.1 of
//! L. N. Trefethen and J. A. C. Weideman, "The exponentially convergent trapezoidal rule", SIAM
//! Review 56 (2014) 385, the rule over the whole line errs by at most
//! `2 (2 K_nu(q))/(e^{2 pi d/h} - 1)`, and half of it by
//!
//! ```text
//! |D| <= 2 K_nu(q)/(e^{2 pi d/h} - 1).
//! ```
//!
//! `K_nu(q)` is bounded without another evaluation: from `cosh u >= 1 + u^2/2` in the integral,
//! `K_nu(q) <= e^{-q} (pi/(2q))^{1/2} e^{nu^2/(2q)}`; and as `q^nu K_nu(q)` decreases from its limit
//! `2^{nu-1} (nu-1)!` (DLMF 10.29.4, 10.30.2), `K_1(q) <= 1/q` and `K_2(q) <= 2/q^2`.
//!
//! # Cut-off error `C`
//!
//! `|f(u)| <= e^{-x cosh u + nu u}`, where the exponent has the slope `nu - x sinh u`, decreasing.
//! Once it is negative at `U` the bound decreases from there on, a sum of values after `U` times
//! `h` is at most the integral from `U`, and
//!
//! ```text
//! |C| <= integral_U^inf e^{-x cosh u + nu u} du <= e^{-x cosh U + nu U}/(x sinh U - nu).
//! ```
//!
//! All numbers in both bounds are balls; doubles only choose `d`, `h` and `n`.

use crate::arithmetic::{Bits, Complex, Magnitude, Real, rounding};
use crate::functions::complex_elementary::{self, whole_plane};
use crate::functions::elementary;
use std::f64::consts::{FRAC_PI_2, LN_2, PI};

/// Precision of the error bounds.
const BOUND_BITS: Bits = 64;
/// More nodes than this are refused: the strip is too narrow.
const MOST_NODES: f64 = 1e7;

/// Step, nodes and strip of one evaluation; any values give a valid bound.
struct Rule {
    /// Half-width `d` of the strip.
    strip: Real,
    /// Step `h`.
    step: Real,
    /// Number `n` of steps.
    count: u64,
}

impl Rule {
    fn choose(order: u32, z: &Complex, bits: Bits) -> Option<Rule> {
        let (x, y) = (z.re.to_f64(), z.im.to_f64().abs());
        let goal = f64::from(bits + 8) * LN_2;
        let limit = FRAC_PI_2 - y.atan2(x);
        let (mut strip, mut step) = (0.0, 0.0);
        for i in 1..400 {
            let d = limit * f64::from(i) / 400.0;
            let q = x * d.cos() - y * d.sin();
            let excess = ln_size_bound(order, q) - ln_size_estimate(order, x, y);
            let h = 2.0 * PI * d / (goal + excess.max(0.0));
            if h > step {
                (strip, step) = (d, h);
            }
        }
        let mut end = 0.5;
        while x * (f64::cosh(end) - 1.0) - f64::from(order) * end < goal && end < 1e4 {
            end += 0.01;
        }
        let count = (end / step).ceil() + 1.0;
        let exact = |value: f64| Real::from_float(rounding::nearest(53, value).0);
        (count < MOST_NODES).then(|| Rule { strip: exact(strip), step: exact(step), count: count as u64 })
    }
}

/// Logarithm of the bound of `K_order(q)`, for choosing the strip only.
fn ln_size_bound(order: u32, q: f64) -> f64 {
    let nu = f64::from(order);
    let gaussian = -q + 0.5 * (FRAC_PI_2 / q).ln() + nu * nu / (2.0 * q);
    if order == 0 { gaussian } else { gaussian.min(-nu * q.ln() + LN_2) }
}

/// Logarithm of the size of `K_order(x + iy)`, for choosing the step only.
fn ln_size_estimate(order: u32, x: f64, y: f64) -> f64 {
    let ln_size = x.hypot(y).ln();
    match order {
        _ if ln_size > 0.0 => -x - 0.5 * ln_size,
        0 => (-ln_size).ln_1p(),
        _ => -f64::from(order) * ln_size,
    }
}

/// `K_order(z)` for `z` (a point or a narrow ball) with `Re z > 0`, `order <= 2`; otherwise the whole plane.
pub(super) fn value(order: u32, z: &Complex, bits: Bits) -> Complex {
    if order > 2 || !z.re.certainly_positive() {
        return whole_plane();
    }
    let Some(rule) = Rule::choose(order, z, bits) else {
        return whole_plane();
    };
    let (Some(discretisation), Some(cut_off)) = (discretisation_error(order, z, &rule), cut_off_error(order, z, &rule))
    else {
        return whole_plane();
    };
    sum(order, z, &rule, bits).widen(discretisation.add(cut_off))
}

/// `h (f(0)/2 + f(h) + ... + f(nh))`.
fn sum(order: u32, z: &Complex, rule: &Rule, bits: Bits) -> Complex {
    let count_bits = u64::BITS - rule.count.leading_zeros();
    // An absolute error of the exponent is a relative one of the term.
    let largest_exponent = f64::from(bits) + 2.0 * z.abs_upper().log2_estimate().exp2();
    let wide = bits + 16 + count_bits + largest_exponent.log2().ceil() as Bits;
    let term_bits = bits + 16 + count_bits;
    let is_real = z.im.is_exact() && z.im.midpoint().is_zero();
    let ratio = elementary::exp(&rule.step, wide);
    let inverse_ratio = elementary::exp(&rule.step.neg(), wide);
    let (mut power, mut inverse_power) = (Real::from_i64(1), Real::from_i64(1));
    let mut total = Complex::zero();
    for k in 0..=rule.count {
        if k > 0 {
            power = power.mul(&ratio, wide);
            inverse_power = inverse_power.mul(&inverse_ratio, wide);
        }
        let cosh = power.add(&inverse_power, wide).shift(-1);
        let exponent = z.mul_real(&cosh, wide).neg();
        let decay = if is_real {
            Complex::from_real(elementary::exp(&exponent.re, term_bits))
        } else {
            complex_elementary::exp(&exponent, term_bits)
        };
        let weighted = match order {
            0 => decay,
            1 => decay.mul_real(&cosh, term_bits),
            _ => decay.mul_real(&cosh.square(wide).shift(1).sub(&Real::from_i64(1), wide), term_bits),
        };
        total = total.add(&if k == 0 { weighted.shift(-1) } else { weighted }, wide);
    }
    total.mul_real(&rule.step, bits + 8)
}

/// Bound of `|D|`; `None` if the strip is too wide for the argument.
fn discretisation_error(order: u32, z: &Complex, rule: &Rule) -> Option<Magnitude> {
    let bits = BOUND_BITS;
    let (cos, sin) = (elementary::cos(&rule.strip, bits), elementary::sin(&rule.strip, bits));
    let half_pi = elementary::pi(bits).shift(-1);
    let q = z.re.mul(&cos, bits).sub(&z.im.abs().mul(&sin, bits), bits);
    if !q.certainly_positive() || !rule.strip.certainly_positive() || !rule.strip.certainly_less(&half_pi) {
        return None;
    }
    // Lower end: the bounds decrease in q.
    let q = Real::from_float(q.lower(bits));
    let size = size_bound(order, &q);
    let exponent = half_pi.shift(2).mul(&rule.strip, bits).div(&rule.step, bits);
    let decay = elementary::exp_m1(&exponent, bits);
    Some(size.shift(1).div(decay.abs_lower()))
}

/// Bound of `K_order(q)` for `order <= 2`.
fn size_bound(order: u32, q: &Real) -> Magnitude {
    let bits = BOUND_BITS;
    let square = i64::from(order) * i64::from(order);
    let exponent = Real::from_i64(square).div(&q.shift(1), bits).sub(q, bits);
    let root = elementary::sqrt(&elementary::pi(bits).div(&q.shift(1), bits), bits);
    let gaussian = elementary::exp(&exponent, bits).mul(&root, bits).abs_upper();
    let inverse = Magnitude::ONE.div(q.abs_lower());
    match order {
        0 => gaussian,
        1 => gaussian.min(inverse),
        _ => gaussian.min(inverse.mul(inverse).shift(1)),
    }
}

/// Bound of `|C|`; `None` if the terms need not decrease yet.
fn cut_off_error(order: u32, z: &Complex, rule: &Rule) -> Option<Magnitude> {
    let bits = BOUND_BITS;
    let count = Real::from_float(rounding::nearest(64, rule.count).0);
    let end = rule.step.mul(&count, 128);
    let growth = end.mul_i64(i64::from(order), 128);
    let slope = z.re.mul(&elementary::sinh(&end, bits), bits).sub(&Real::from_i64(i64::from(order)), bits);
    if !slope.certainly_positive() {
        return None;
    }
    let exponent = growth.sub(&z.re.mul(&elementary::cosh(&end, 128), 128), 128);
    Some(elementary::exp(&exponent, bits).abs_upper().div(slope.abs_lower()))
}
