//! The rapidity integral by the trapezoid rule on the contours of [`crate::routes::descent`].
//!
//! With `w = m s`, `factor = K_nu(w)/w^nu = (1/2) w^-nu Int exp(-w cosh zeta) cosh(nu zeta) dzeta`. In `s` the integrand is
//! `e^(-z X) W(s)` times `e^-z` (spacelike, `W = cosh(nu s)`) or `e^(-i z)` (timelike, `C = 1 - i X`):
//!
//! ```text
//! d = 1   W = C dzeta/ds
//! d = 2   W = cosh(3 zeta/2) dzeta/ds = e^(-i pi/4) cosh(s/2) (2 C - 1)     as cosh 3y = cosh y (4 cosh^2 y - 3)
//! d = 3   W = (2 C^2 - 1) dzeta/ds,
//! ```
//!
//! and the same with `C = cosh s` and `dzeta/ds = 1` in the spacelike case. No poles.
//!
//! **Bounds.** For `|Im s| <= d < pi/2`, `c = cosh(Re s)`: `|C| <= c + 1` in both cases, since `|X| = c - cos(Im s) <= c`.
//! Hence `|W| <= w (c + 1)^j` with
//!
//! * `j = 1`, `w = D` in one dimension;
//! * `j = 2`, `w = 3/2` in two, from `|cosh(s/2)| <= sqrt((c+1)/2)`, `|2C - 1| <= 2 (c+1) + 1 <= (5/2)(c+1)` and
//!   `(c+1)^(3/2) <= (c+1)^2/sqrt 2`, since `c + 1 >= 2`;
//! * `j = 2`, `w = (9/4) D` in three, from `|2 C^2 - 1| <= 2 (c+1)^2 + 1 <= (9/4) (c+1)^2`,
//!
//! where `D` bounds `|dzeta/ds|` (Lemma D3), or is one. With `q = z cos d`,
//! `|e^(-z X)| = e^(z - q) e^(-q (c-1))`, and with `v = c - 1`, `dx = dv/sqrt(v (v+2))`:
//!
//! ```text
//! Int (c+1) e^(-q(c-1)) dx   <= 2 Int (sqrt v + sqrt 2) v^(-1/2) e^(-qv) dv         = 2/q + 2 sqrt(2 pi/q),
//! Int (c+1)^2 e^(-q(c-1)) dx <= 2 sqrt 2 Int (v^(3/2) + 2^(3/2)) v^(-1/2) e^(-qv) dv = 2 sqrt 2/q^2 + 8 sqrt(pi/q).
//! ```
//!
//! **Cut-off** after the node `s_n`: `(c+1)^j e^(-z X)` has the logarithmic derivative `sinh s (j/(c+1) - z)`. Where
//! `z (c_n + 1) > j` it falls, the sum left out on both sides is at most
//! `2 w (c_n+1)^j e^(-z X_n) / (sinh s_n (z - j/(c_n+1)))` with the `w` of `d = 0`.

use super::{Dimension, PropagatorProblem, allow, times_i};
use crate::arithmetic::{Bits, Complex, Magnitude, Real, decimal};
use crate::functions::elementary::{exp, pi, sqrt};
use crate::routes::descent::{Aim, BOUND_BITS, Node, Rule, eighth_turn, exponent_bits, minus_phase, shown};
use crate::routes::pointwise::{PointEvaluation, PointOutcome, bits_for};
use crate::routes::{Effort, RouteFailure};
use std::f64::consts::{LN_2, PI};

/// The rapidity integral.
#[derive(Clone, Copy)]
pub struct Momentum<'a>(pub &'a PropagatorProblem);

impl PointEvaluation for Momentum<'_> {
    fn name(&self) -> &'static str {
        "momentum"
    }

    fn method(&self) -> &'static str {
        "momentum integral over rapidity on the contour of steepest descent, trapezoid rule"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<PointOutcome, RouteFailure> {
        let problem = self.0;
        let goal = bits_for(digits);
        let size = problem.argument(64).to_f64();
        if !size.is_finite() || size < 1e-300 {
            return Err(RouteFailure::OutOfReach { reason: "the interval is too near the light cone".to_owned() });
        }
        let rule = choose(problem, size, goal)?;
        // X is computed from exponentials near one: its relative error counts z X, up to the goal.
        let bits = goal + 16 + 2 * exponent_bits(size) + exponent_bits(rule.last as f64);
        allow(effort, bits)?;
        let sum = Sum::new(problem, bits);
        let (integral, errors) = sum.integral(&rule, effort)?;
        let value = problem.assemble(&sum.factor(&integral), bits);
        Ok(PointOutcome { value, bits, nodes: rule.last as usize + 1, witness: witness(&rule, errors) })
    }
}

/// Logarithm of the size of `Int e^(-z X) W`, for steering.
fn ln_size(nu: f64, z: f64) -> f64 {
    let large = 0.5 * (2.0 * PI / z).ln();
    let small = -nu * z.ln();
    large.max(small.max(0.0))
}

fn choose(problem: &PropagatorProblem, z: f64, goal: Bits) -> Result<Rule, RouteFailure> {
    let power = if problem.dimension == Dimension::One { 1.0 } else { 2.0 };
    let nu = f64::from(problem.dimension.number() + 1) / 2.0;
    let size = ln_size(nu, z);
    let timelike = problem.is_timelike();
    let ln_bound = |d: f64| {
        let q = z * d.cos();
        let slope = if timelike { (2.0 / (d.cos() + 1.0 - 2f64.sqrt())).sqrt() } else { 1.0 };
        (z - q) + (slope * (q.powf(-power) * 4.0 + 8.0 / q.sqrt())).ln() - size + 2.0
    };
    let ln_rest = |s: f64| 2.0 + power * (s.cosh() + 1.0).ln() - (z * s.sinh()).ln().min(0.0) - size;
    Rule::choose(&Aim {
        decay: z,
        ln_goal: -f64::from(goal + 4) * LN_2,
        widest: if timelike { 1.05 } else { 1.5 },
        ln_bound: &ln_bound,
        ln_rest: &ln_rest,
        pole: None,
    })
}

/// Bounds of what the sum leaves out.
struct Errors {
    discretisation: Magnitude,
    cut_off: Magnitude,
}

/// The numbers of one sum.
struct Sum {
    dimension: Dimension,
    timelike: bool,
    z: Real,
    bits: Bits,
}

impl Sum {
    fn new(problem: &PropagatorProblem, bits: Bits) -> Sum {
        Sum { dimension: problem.dimension, timelike: problem.is_timelike(), z: problem.argument(bits), bits }
    }

    /// `Int e^(-z X) W ds`.
    fn integral(&self, rule: &Rule, effort: &Effort) -> Result<(Complex, Errors), RouteFailure> {
        let bits = self.bits;
        let mut total = Complex::zero();
        rule.for_each_node(bits, effort, |node| {
            let term = self.shape(node).mul_real(&node.weight(&self.z, bits), bits);
            total = total.add(&term, bits);
        })?;
        let errors =
            Errors { discretisation: rule.discretisation_error(self.line_integral(rule)), cut_off: self.cut_off(rule) };
        if self.timelike {
            total = total.mul(&eighth_turn(bits), bits);
        }
        let value = total.mul_real(&rule.step, bits).widen(errors.discretisation.add(errors.cut_off));
        let value = if self.timelike { value } else { Complex::from_real(value.re) };
        Ok((value, errors))
    }

    /// `W`, without `e^(-i pi/4)` in the timelike case.
    fn shape(&self, node: &Node) -> Complex {
        let bits = self.bits;
        let one = Complex::from_real(Real::from_i64(1));
        let cosine = if self.timelike {
            Complex::new(Real::from_i64(1), node.rise.neg())
        } else {
            Complex::from_real(node.rise.add(&Real::from_i64(1), bits))
        };
        let slope = || if self.timelike { node.turned_slope(bits) } else { one.clone() };
        match self.dimension {
            Dimension::One => cosine.mul(&slope(), bits),
            Dimension::Two => cosine.shift(1).sub(&one, bits).mul_real(&node.half_cosh, bits),
            Dimension::Three => cosine.square(bits).shift(1).sub(&one, bits).mul(&slope(), bits),
        }
    }

    /// `w` and `j` for a bound of `|dzeta/ds|`.
    fn shape_bound(&self, slope: Magnitude) -> (Magnitude, u64) {
        match self.dimension {
            Dimension::One => (slope, 1),
            Dimension::Two => (Magnitude::from_u64(3).shift(-1), 2),
            Dimension::Three => (slope.mul(Magnitude::from_u64(9)).shift(-2), 2),
        }
    }

    /// Bound `M` on the edge of the strip.
    fn line_integral(&self, rule: &Rule) -> Magnitude {
        let bits = BOUND_BITS;
        let cosine = rule.strip_cosine();
        let slope = if self.timelike { rule.slope_bound() } else { Magnitude::ONE };
        let q = self.z.mul(&cosine, bits);
        if !q.certainly_positive() || !rule.strip.certainly_less(&pi(bits).shift(-1)) {
            return Magnitude::INFINITY;
        }
        let (weight, power) = self.shape_bound(slope);
        let loss = exp(&self.z.mul(&Real::from_i64(1).sub(&cosine, bits), bits), bits);
        let near = sqrt(&pi(bits).shift(1).div(&q, bits), bits).shift(1);
        let integral = match power {
            1 => Real::from_i64(2).div(&q, bits).add(&near, bits),
            // 2 sqrt 2 < 3 and 8 sqrt(pi/q) < 3 * 2 sqrt(2 pi/q).
            _ => Real::from_i64(3).div(&q.square(bits), bits).add(&near.mul_i64(3, bits), bits),
        };
        weight.mul(loss.abs_upper()).mul(integral.abs_upper())
    }

    fn cut_off(&self, rule: &Rule) -> Magnitude {
        let bits = BOUND_BITS;
        let flat = Rule { strip: Real::zero(), step: rule.step.clone(), offset: rule.offset, last: rule.last };
        let (weight, power) = self.shape_bound(if self.timelike { flat.slope_bound() } else { Magnitude::ONE });
        let (rise, sinh) = rule.end();
        let base = rise.add(&Real::from_i64(2), bits);
        let fall = self.z.sub(&Real::from_i64(power as i64).div(&base, bits), bits);
        if !fall.certainly_positive() || !sinh.certainly_positive() {
            return Magnitude::INFINITY;
        }
        let top = exp(&self.z.mul(&rise, bits).neg(), bits).abs_upper().mul(base.abs_upper().pow(power));
        weight.shift(1).mul(top).div(sinh.mul(&fall, bits).abs_lower())
    }

    /// `K_nu(w)/w^nu` from the integral.
    fn factor(&self, integral: &Complex) -> Complex {
        let bits = self.bits;
        let power = match self.dimension {
            Dimension::One => self.z.clone(),
            Dimension::Two => self.z.mul(&sqrt(&self.z, bits), bits),
            Dimension::Three => self.z.square(bits),
        };
        let half = integral.shift(-1);
        if !self.timelike {
            return half.mul_real(&exp(&self.z.neg(), bits).div(&power, bits), bits);
        }
        let inverse = Real::from_i64(1).div(&power, bits);
        let value = half.mul(&minus_phase(&self.z, bits), bits).mul_real(&inverse, bits);
        // Times i^-nu.
        match self.dimension {
            Dimension::One => times_i(&value).neg(),
            Dimension::Two => times_i(&value.mul(&eighth_turn(bits), bits)).neg(),
            Dimension::Three => value.neg(),
        }
    }
}

fn witness(rule: &Rule, errors: Errors) -> Vec<(String, String)> {
    let bound = |value: Magnitude| decimal::upper_decimal(&value.to_float(), 4);
    vec![
        ("step h".to_owned(), shown(&rule.step)),
        ("strip half-width d".to_owned(), shown(&rule.strip)),
        ("discretisation bound".to_owned(), bound(errors.discretisation)),
        ("cut-off bound".to_owned(), bound(errors.cut_off)),
    ]
}
