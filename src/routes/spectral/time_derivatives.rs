//! The box tail at the cone and its first two derivatives in time, and bounds of the second and third.
//!
//! With unit mass, `W(x) = 1/2 (1 - exp(-2 a cosh x)) tanh x` and `s_j` the j-th time derivative of
//! `s = (exp(-t e^-x) - exp(-t e^x))/2`,
//!
//! ```text
//! P = 4/(pi^2 a) S_00,    P' = 8/(pi^2 a) S_01,    P'' = 8/(pi^2 a) (S_02 + S_11),
//! S_jk = Int_0^inf Int_0^inf w_j(x) w_k(y)/(cosh x + cosh y) dx dy,    w_j = W s_j.
//! ```
//!
//! (Differentiation under the integral: all `s_j` are bounded for `t >= t_1 > 0`, see below.)
//!
//! # Bounds
//!
//! Put `B_j(tau) = (j/(e tau))^j` (`B_0 = 1`), the maximum of `u^j exp(-tau u)` over `u > 0`.
//!
//! * Real axis: `s_j` is half the difference of two numbers of one sign in `[0, B_j(t)]`, so `|s_j| <= B_j(t)/2` and
//!   `|w_j| <= c_j = B_j(t)/4`.
//! * Strip `|Im x| <= b < pi/2`, `beta = cos b`: `|z^j exp(-t z)| <= B_j(t beta)` for `z = e^(±x)`, as `Re z >= beta |z|`; so
//!   `|s_j| <= B_j(t beta)`. `|W| <= 1/beta`, as `Re cosh x >= 0` and `|sinh x / cosh x| <= cosh s/(beta cosh s)`. Hence
//!   `|w_j| <= C_j = B_j(t beta)/beta`. The zeros of `cosh` lie outside; `w_j` is even and analytic.
//! * **Discretisation.** The argument of Theorem C of the parent module with these constants: the double trapezoid sum
//!   differs from `S_jk` by at most `[2 C_j c_k (pi^2/2 + h) + C_k c_j pi^2]/(exp(2 pi b/h) - 1)`.
//! * **Cut-off** at `X`, as for the parent: at most `4 c_j c_k (X + 1) e^-X/(1 - e^(-2X))`.
//! * **Higher derivatives** for all `t >= t_1`: `Int Int 1/(cosh + cosh) = pi^2/4` and `W <= 1/2` give, with `B_j = B_j(t_1)`,
//!   `|P''| <= (1/(2a)) (B_2/2 + B_1^2/2)` and `|P'''| <= (1/(2a)) (B_3/2 + 3 B_1 B_2/2)`.
//!
//! **Rounding.** Sums are exact integer products. With `n` nodes, `w_j` and `r_j = w_j/(2 sinh)` off by `e_j` units of
//! `u = 2^-F` (`|r_j| <= c_j` too) and tangents off by two, each of the `n^2` products of the form
//! `r_j w_k (T_(k+l) + T_(k-l))` errs by at most `2 (c_j + e_j u) e_k + 2 (c_k + e_k u) e_j + 4 (c_j + e_j u)(c_k + e_k u)` units.

use super::BOUND_BITS;
use super::nodes::fixed;
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{cos, exp, exp_m1, pi};
use crate::routes::estimate::dyadic;
use crate::routes::{Effort, RouteFailure};
use rug::{Integer, Rational};
use std::f64::consts::{LN_2, LN_10, PI};

/// Half-width of the strip.
const STRIP: (u32, u32) = (27, 20);
/// More nodes than this are refused.
const MAX_NODES: usize = 4000;

/// The tail and its time derivatives at one time, unit mass.
#[derive(Clone, Debug)]
pub struct TimeDerivatives {
    /// `P`.
    pub value: Real,
    /// `dP/dt`.
    pub first: Real,
    /// `d^2P/dt^2`.
    pub second: Real,
}

/// `B_j(tau)` bounded above.
fn largest(j: u64, tau: &Real) -> Magnitude {
    if j == 0 {
        return Magnitude::ONE;
    }
    let bits = BOUND_BITS;
    let e = exp(&Real::from_i64(1), bits);
    Real::from_i64(j as i64).div(&e.mul(tau, bits), bits).abs_upper().pow(j)
}

/// Bounds of `|P''|` and `|P'''|` for all times from `earliest` on.
pub fn higher_bounds(half_width: &Rational, earliest: &Rational) -> (Magnitude, Magnitude) {
    let time = Real::from_rational(earliest, BOUND_BITS);
    let [one, two, three] = [1, 2, 3].map(|j| largest(j, &time));
    let scale = Magnitude::ONE.div(Real::from_rational(half_width, BOUND_BITS).abs_lower()).shift(-2);
    let third = three.add(one.mul(two).mul(Magnitude::from_u64(3)));
    (scale.mul(two.add(one.mul(one))), scale.mul(third))
}

/// The tail at the cone and two derivatives, each to about `digits` digits of the tail's size.
///
/// # Errors
/// [`RouteFailure`] if the effort does not suffice or too many nodes would be needed.
pub fn at(
    half_width: &Rational,
    time: &Rational,
    digits: u32,
    effort: &Effort,
) -> Result<TimeDerivatives, RouteFailure> {
    let plan = Plan::new(half_width, time, digits)?;
    effort.allow_bits(plan.bits)?;
    let weights = Weights::new(half_width, time, &plan, effort)?;
    let sums = weights.sums(&plan, effort)?;
    let bits = plan.bits;
    let factor = Real::from_i64(8).div(&pi(bits).square(bits).mul(&Real::from_rational(half_width, bits), bits), bits);
    let [s00, s01, s02, s11] = sums;
    Ok(TimeDerivatives {
        value: s00.mul(&factor, bits).shift(-1),
        first: s01.mul(&factor, bits),
        second: s02.add(&s11, bits).mul(&factor, bits),
    })
}

struct Plan {
    step: Rational,
    count: usize,
    bits: Bits,
    scale: u32,
}

impl Plan {
    fn new(half_width: &Rational, time: &Rational, digits: u32) -> Result<Plan, RouteFailure> {
        let (a, t) = (half_width.to_f64(), time.to_f64());
        // S is of the order of a for a narrow box and t^2 at early times.
        let size = (a.min(1.0).ln() + 2.0 * t.min(1.0).ln()).max(-1e4);
        let goal = f64::from(digits) * LN_10 - size + 6.0;
        let b = f64::from(STRIP.0) / f64::from(STRIP.1);
        let constant = 2.0 * (1.0 + 2.0 / (t * b.cos())).ln() + 6.0;
        let step = dyadic(2.0 * PI * b / (goal + constant), 20);
        let reach = goal + goal.ln() + 2.0 * (1.0 + 1.0 / t).ln();
        let count = (reach / step.to_f64()).ceil() as usize;
        if !goal.is_finite() || count > MAX_NODES {
            return Err(RouteFailure::OutOfReach {
                reason: "the time derivatives would need too many nodes".to_owned(),
            });
        }
        let spread = 2.0 * (1.0 + 1.0 / t).log2();
        let scale = (goal / LN_2 + 2.0 * (count as f64).log2() + 2.0 * spread + 8.0) as u32;
        Ok(Plan { step, count, bits: scale + spread as u32 + 24, scale })
    }
}

/// `w_j` and `r_j` at the nodes for `j = 0, 1, 2`.
struct Weights {
    w: [Vec<Integer>; 3],
    r: [Vec<Integer>; 2],
    errors: [Magnitude; 3],
    time: Real,
}

impl Weights {
    fn new(half_width: &Rational, time: &Rational, plan: &Plan, effort: &Effort) -> Result<Weights, RouteFailure> {
        let bits = plan.bits;
        let (a, t) = (Real::from_rational(half_width, bits), Real::from_rational(time, bits));
        let one = Real::from_i64(1);
        let mut list =
            Weights { w: Default::default(), r: Default::default(), errors: [Magnitude::ZERO; 3], time: t.clone() };
        for k in 1..=plan.count {
            effort.check()?;
            let x = Real::from_rational(&Rational::from(&plan.step * k as u64), bits);
            let up = exp(&x, bits);
            let down = one.div(&up, bits);
            let cosh = up.add(&down, bits).shift(-1);
            let sinh = up.sub(&down, bits).shift(-1);
            let packet = one_minus_exp(&a.mul(&cosh, bits).shift(1), bits).shift(-1);
            let wide = packet.mul(&sinh, bits).div(&cosh, bits);
            let narrow = packet.div(&cosh.shift(1), bits);
            let (mut slow, mut fast) = (exp(&t.mul(&down, bits).neg(), bits), exp(&t.mul(&up, bits).neg(), bits));
            for j in 0..3 {
                let s = slow.sub(&fast, bits).shift(-1);
                let s = if j % 2 == 1 { s.neg() } else { s };
                let (value, error) = fixed(&wide.mul(&s, bits), plan.scale)?;
                list.w[j].push(value);
                list.errors[j] = list.errors[j].max(error);
                if let Some(r) = list.r.get_mut(j) {
                    let (value, error) = fixed(&narrow.mul(&s, bits), plan.scale)?;
                    r.push(value);
                    list.errors[j] = list.errors[j].max(error);
                }
                slow = slow.mul(&down, bits);
                fast = fast.mul(&up, bits);
            }
        }
        Ok(list)
    }

    /// `S_00, S_01, S_02, S_11` with all errors.
    fn sums(&self, plan: &Plan, effort: &Effort) -> Result<[Real; 4], RouteFailure> {
        let n = plan.count;
        let tangents = tangents(plan)?;
        let mut totals: [Integer; 4] = Default::default();
        let mut both = Integer::new();
        for k in 1..=n {
            effort.check()?;
            let mut brackets: [Integer; 3] = Default::default();
            for l in 1..=n {
                both.clone_from(&tangents[k + l]);
                if k >= l {
                    both += &tangents[k - l]
                } else {
                    both -= &tangents[l - k]
                }
                for (bracket, w) in brackets.iter_mut().zip(&self.w) {
                    *bracket += &both * &w[l - 1];
                }
            }
            for (total, (j, i)) in totals.iter_mut().zip([(0, 0), (0, 1), (0, 2), (1, 1)]) {
                *total += &self.r[j][k - 1] * &brackets[i];
            }
        }
        let step = Real::from_rational(&plan.step, plan.bits).square(plan.bits);
        let list = totals.iter().zip([(0, 0), (0, 1), (0, 2), (1, 1)]).map(|(total, (j, k))| {
            let sum = Real::from_scaled(total, -3 * i64::from(plan.scale)).round(plan.bits);
            let sum = sum.widen(self.rounding(j, k, plan));
            sum.mul(&step, plan.bits).widen(self.truncation(j, k, plan))
        });
        let list: Vec<Real> = list.collect();
        list.try_into().map_err(|_| RouteFailure::OutOfReach { reason: "sums are missing".to_owned() })
    }

    /// Bound of `|w_j|` on the real axis.
    fn size(&self, j: usize) -> Magnitude {
        largest(j as u64, &self.time).shift(-2)
    }

    fn rounding(&self, j: usize, k: usize, plan: &Plan) -> Magnitude {
        let unit = Magnitude::power_of_two(-i64::from(plan.scale));
        let (e_j, e_k) = (self.errors[j], self.errors[k]);
        let (c_j, c_k) = (self.size(j).add(e_j.mul(unit)), self.size(k).add(e_k.mul(unit)));
        let each = c_j.mul(e_k).add(c_k.mul(e_j)).add(c_j.mul(c_k).shift(1)).shift(1);
        let count = Magnitude::from_u64(plan.count as u64);
        each.mul(count).mul(count).mul(unit)
    }

    fn truncation(&self, j: usize, k: usize, plan: &Plan) -> Magnitude {
        let bits = BOUND_BITS;
        let b = Real::from_rational(&Rational::from(STRIP), bits);
        let beta = cos(&b, bits);
        let step = Real::from_rational(&plan.step, bits);
        let strip = |j: usize| largest(j as u64, &self.time.mul(&beta, bits)).div(beta.abs_lower());
        let square = pi(bits).square(bits);
        let decay = exp_m1(&pi(bits).mul(&b, bits).shift(1).div(&step, bits), bits).abs_lower();
        let (c_j, c_k) = (self.size(j), self.size(k));
        let first = strip(j).mul(c_k).mul(square.shift(-1).add(&step, bits).abs_upper()).shift(1);
        let discretisation = first.add(strip(k).mul(c_j).mul(square.abs_upper())).div(decay);
        let x = step.mul_i64(plan.count as i64, bits);
        let one = Real::from_i64(1);
        let below = one.sub(&exp(&x.shift(1).neg(), bits), bits);
        let cut = x.add(&one, bits).mul(&exp(&x.neg(), bits), bits).div(&below, bits).abs_upper();
        discretisation.add(cut.mul(c_j).mul(c_k).shift(2))
    }
}

/// `1 - exp(-y)` without loss at either end.
fn one_minus_exp(y: &Real, bits: Bits) -> Real {
    let one = Real::from_i64(1);
    // A large y has a large radius, which only the exponential itself makes harmless.
    if one.certainly_less(y) { one.sub(&exp(&y.neg(), bits), bits) } else { exp_m1(&y.neg(), bits).neg() }
}

/// `tanh(m h/2)` for `m = 0..=2n`, each off by less than two units.
fn tangents(plan: &Plan) -> Result<Vec<Integer>, RouteFailure> {
    let bits = plan.bits;
    (0..=2 * plan.count)
        .map(|m| {
            let x = Real::from_rational(&Rational::from(&plan.step * m as u64), bits);
            Ok(fixed(&crate::functions::elementary::tanh(&x.shift(-1), bits), plan.scale)?.0)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::routes::{Route, TailProblem, spectral::SPECTRAL};

    fn rational(n: i64, d: i64) -> Rational {
        Rational::from((n, d))
    }

    #[test]
    fn the_value_is_the_tail() {
        for (a, t) in
            [(rational(1, 1), rational(1, 1)), (rational(1, 10), rational(1, 2)), (rational(7, 1), rational(3, 4))]
        {
            let found = at(&a, &t, 20, &Effort::default()).unwrap();
            let problem = TailProblem { half_width: a, time: t, distance: Rational::new(), massless: false };
            let tail = SPECTRAL.evaluate(&problem, 25, &Effort::default()).unwrap().interval;
            let shown = found.value.to_interval(200);
            assert!(shown.intersection(&tail).is_some() && shown.has_relative_digits(18), "{shown:?} {tail:?}");
        }
    }

    /// Taylor's theorem with the bounds of the third derivative: `P(t+d) - P(t) - d P'(t) - d^2 P''(t)/2`.
    #[test]
    fn derivatives_agree_with_differences() {
        let (a, t, d) = (rational(1, 1), rational(7, 10), rational(1, 1000));
        let here = at(&a, &t, 25, &Effort::default()).unwrap();
        let there = at(&a, &Rational::from(&t + &d), 25, &Effort::default()).unwrap();
        let bits = 160;
        let step = Real::from_rational(&d, bits);
        let linear = here.value.add(&here.first.mul(&step, bits), bits);
        let model = linear.add(&here.second.mul(&step.square(bits), bits).shift(-1), bits);
        let (second, third) = higher_bounds(&a, &t);
        let rest = third.mul(step.abs_upper().pow(3)).div(Magnitude::from_u64(6));
        assert!(there.value.overlaps(&model.clone().widen(rest)));
        assert!(!there.value.overlaps(&linear), "the second derivative matters");
        assert!(here.second.abs_upper().cmp_value(second).is_le());
        // The derivative of the first derivative.
        let slope = here.first.add(&here.second.mul(&step, bits), bits);
        assert!(there.first.overlaps(&slope.widen(third.mul(step.abs_upper().pow(2)).shift(-1))));
    }
}
