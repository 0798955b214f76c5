//! Route "spectral": direct quadrature in momentum space, turned onto the branch cut.
//!
//! # Formula (unit mass)
//!
//! Outside the cone the contour of the momentum integral can be turned onto the branch cut
//! `p = i cosh(eta)`; integrating `|psi|^2` over the region gives
//!
//! ```text
//! P(|x| > R) = 4/(pi^2 a) * S,     S = Int_0^inf Int_0^inf w(x) w(y) / (cosh x + cosh y) dx dy,
//! w(x) = sinh(t sinh x) sinh(a cosh x) exp(-(a+t+d) cosh x) tanh x,     d = R - a - t >= 0.
//! ```
//!
//! `w` is even and entire. Put `E = sqrt(d (d + 2 t))` (the proper distance of the region's edge from
//! the packet's edge event). By the inequality of arithmetic and geometric means
//! `t e^-x + d cosh x = (t + d/2) e^-x + (d/2) e^x >= E`, so `exp(-E)` is taken out of every `w`
//! and tails of any smallness keep full relative accuracy:
//!
//! ```text
//! w(x) = exp(-E) * 1/4 * exp(-Y(x)) (1 - exp(-2 t sinh x)) (1 - exp(-2 a cosh x)) tanh x,
//! Y(x) = (sqrt(t + d/2) e^(-x/2) - sqrt(d/2) e^(x/2))^2 >= 0,     0 <= w(x) exp(E) <= 1/4.
//! ```
//!
//! # Trapezoid rule and its error
//!
//! With step `h`, `S_h = h^2 Sum_{k,l>=1} w(kh) w(lh) / (cosh kh + cosh lh)`; the axes do not
//! contribute as `w(0) = 0`, and `4 S_h` is the trapezoid sum over the whole plane.
//!
//! **Lemma A.** For `0 <= b <= pi/2`: `|cosh(s + ib) + cosh y| >= (cosh s + cosh y)/2`. *Proof.* The
//! square of the left side is `cosh^2 s - sin^2 b + 2 cosh s cosh y cos b + cosh^2 y >=
//! cosh^2 s + cosh^2 y - 1 >= (cosh^2 s + cosh^2 y)/2 >= ((cosh s + cosh y)/2)^2`. ∎
//!
//! **Lemma B.** For `0 <= b <= pi/2`: `|w(s + ib)| <= C exp(-E cos b)` with
//! `C = min(1/cos b, max(coth 1, a cosh 1))`. *Proof.* With `z = cosh(s + ib)`, `Re z >= 0`:
//! `|sinh(t sinh x) e^(-t z)| = |exp(-t e^-x) - exp(-t e^x)|/2 <= exp(-t e^-|s| cos b)`;
//! `|exp(-d z)| = exp(-d cosh s cos b)`; the exponents add up to at least `E cos b`. The remaining factor is
//! `|(1 - e^(-2 a z))/2| |sinh x|/|z| <= min(1, a |z|) cosh s / |z|`. As `|z| >= cosh s cos b` it is at most
//! `1/cos b`; as `|z| >= |sinh s|` it is at most `coth 1` for `|s| >= 1`, and at most `a cosh 1` for
//! `|s| < 1`. ∎
//!
//! **Theorem C.** `|S - S_h| <= exp(-E (1 + cos b)) C (pi^2 + h) / (2 (exp(2 pi b/h) - 1))`. *Proof.* For `f`
//! analytic in `|Im x| <= b` with `Int |f(s ± i b')| ds <= M` for `b' <= b`, the trapezoid rule on the line errs by
//! at most `2 M/(exp(2 pi b/h) - 1)` (the classical residue argument; see Trefethen and Weideman,
//! SIAM Review 56 (2014), theorem 5.1). Apply it in `x` for each `y = lh`: by the lemmas
//! `M <= 2 C e^(-E cos b) Int ds/(cosh s + cosh y) = 4 C e^(-E cos b) y/sinh y`. The weights
//! `h |w(lh)| <= h e^-E / 4` and `h Sum_l y/sinh y <= Int + h = pi^2/2 + h` (a unimodal function) give at most
//! `C (pi^2 + 2h) e^(-E(1 + cos b))/(exp(2 pi b/h) - 1)`. Apply it in `y` to `w(y) Int w(x)/(cosh x + cosh y) dx`:
//! `M <= C e^(-E cos b) (e^-E/4) 2 Int Int ds dx/(cosh x + cosh s) = C e^(-E(1 + cos b)) pi^2/2`, hence at most
//! `C pi^2 e^(-E(1 + cos b))/(exp(2 pi b/h) - 1)`. The sum bounds the error of `4 S_h`. ∎
//!
//! For `E = 0` the best strip is `b = pi/2`; otherwise `b` is chosen so that the step is largest.
//!
//! # Where the sums end
//!
//! * Left: nodes below the first one used contribute at most `exp(-2E) (pi^2/32) exp(-Y)` with `Y` at
//!   the last node left out, since `Y` falls up to the centre and
//!   `h^2 Sum Sum 1/(cosh + cosh) <= Int Int_0^inf = pi^2/4` (decreasing terms, right end points).
//! * Right, `d > 0`: nodes above the last one, at `X`, contribute at most
//!   `exp(-2E) exp(-Y(X)) (X+1) e^-X / (4 (1 - e^(-2X)))`, from `h Sum_l 1/(cosh x + cosh lh) <= x/sinh x`
//!   and `Int_X^inf x/sinh x dx <= 2 (X+1) e^-X/(1 - e^(-2X))`, once `X` is beyond the centre.
//! * Right, `d = 0`: the sum over all further nodes is done in closed form, see [`far_field`].
//!
//! Rounding is followed by balls and, inside the double sum, by the bound in [`near_field`].

mod cone_nodes;
pub(in crate::routes) mod far_field;
pub(in crate::routes) mod massless;
pub(in crate::routes) mod near_field;
mod nodes;
mod plan;
pub mod time_derivatives;

use super::{Effort, Route, RouteFailure, RouteOutcome, TailProblem};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, decimal};
use crate::functions::elementary::{exp, exp_m1, pi, sqrt};
use nodes::Nodes;
pub(in crate::routes) use nodes::one_minus_exp;
use plan::Plan;

/// The spectral route.
pub struct Spectral;

/// The spectral route, ready to use.
pub const SPECTRAL: Spectral = Spectral;

/// Precision in which error bounds are evaluated; they need few digits.
pub(in crate::routes) const BOUND_BITS: Bits = 64;

impl Route for Spectral {
    fn name(&self) -> &'static str {
        "spectral"
    }

    fn method(&self, _problem: &TailProblem) -> &'static str {
        "trapezoid rule on the branch cut of the momentum integral, double sum over the rapidity nodes k h"
    }

    fn evaluate(&self, problem: &TailProblem, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        if problem.massless {
            return massless::evaluate(problem, digits, effort);
        }
        let plan = Plan::new(problem, digits)?;
        effort.allow_bits(plan.bits)?;
        let setting = Setting::new(problem, &plan);
        let nodes = Nodes::new(problem, &setting, &plan, effort)?;
        let lattice = plan.lattice();
        let tangents = near_field::Tangents::new(&lattice, effort)?;
        let mut sum = near_field::sum(&nodes.all(), &lattice, &tangents, effort)?;
        let mut errors = vec![
            ("discretisation bound", setting.discretisation_error(&plan)),
            ("left cut-off bound", nodes.left_cut_error()),
        ];
        if plan.far_field {
            let (series_terms, cross_terms) = (plan.series_terms, plan.cross_terms);
            let far_plan = far_field::FarPlan { lattice, series_terms, cross_terms };
            let far = far_field::sum(&setting, &nodes.all(), &far_plan, effort)?;
            sum = sum.add(&far.sum, plan.bits);
            errors.push(("far-field replacement bound", far.replacement_error));
        } else {
            errors.push(("right cut-off bound", setting.right_cut_error(&plan)));
        }
        let step = plan.step_ball(plan.bits);
        let mut integral = sum.mul(&step.square(plan.bits), plan.bits);
        for (_, error) in &errors {
            integral = integral.widen(*error);
        }
        let probability = setting.probability(&integral, plan.bits);
        Ok(RouteOutcome {
            interval: probability.to_interval(plan.bits).clamp_non_negative(),
            bits: plan.bits,
            nodes: nodes.len(),
            witness: witness(&plan, &errors, &integral),
        })
    }
}

/// The problem's numbers as balls of the working precision.
pub(super) struct Setting {
    half_width: Real,
    time: Real,
    /// `sqrt(t + d/2)`
    left_root: Real,
    /// `sqrt(d/2)`, exactly zero at the cone
    right_root: Real,
    /// `E = sqrt(d (d + 2 t))`
    proper_distance: Real,
    at_cone: bool,
}

impl Setting {
    fn new(problem: &TailProblem, plan: &Plan) -> Setting {
        let bits = plan.bits;
        let half_distance = rug::Rational::from(&problem.distance / 2);
        let left = rug::Rational::from(&problem.time + &half_distance);
        let squared = rug::Rational::from(&left * &half_distance) * 4;
        Setting {
            half_width: Real::from_rational(&problem.half_width, bits),
            time: Real::from_rational(&problem.time, bits),
            left_root: sqrt(&Real::from_rational(&left, bits), bits),
            right_root: sqrt(&Real::from_rational(&half_distance, bits), bits),
            proper_distance: sqrt(&Real::from_rational(&squared, bits), bits),
            at_cone: problem.distance == 0,
        }
    }

    /// Theorem C, without the factor `exp(-2E)`.
    fn discretisation_error(&self, plan: &Plan) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::TrapezoidErrorForgotten) {
            return Magnitude::ZERO;
        }
        let bits = BOUND_BITS;
        let step = plan.step_ball(bits);
        let one = Real::from_i64(1);
        let e = exp(&one, bits);
        let coth_1 = e.square(bits).add(&one, bits).div(&e.square(bits).sub(&one, bits), bits);
        let cosh_1 = e.add(&one.div(&e, bits), bits).shift(-1);
        let wide = self.half_width.mul(&cosh_1, bits).abs_upper().max(coth_1.abs_upper());
        let (strip, cosine) = match plan.strip {
            None => (pi(bits).shift(-1), Real::zero()),
            Some(ref b) => {
                let b = Real::from_rational(b, bits);
                let cosine = crate::functions::elementary::cos(&b, bits);
                // The lemmas hold for `b <= pi/2`.
                if !cosine.certainly_positive() || !b.certainly_less(&Real::from_i64(2)) {
                    return Magnitude::INFINITY;
                }
                (b, cosine)
            }
        };
        let constant =
            if cosine.certainly_positive() { Magnitude::ONE.div(cosine.abs_lower()).min(wide) } else { wide };
        let decay = exp_m1(&pi(bits).mul(&strip, bits).shift(1).div(&step, bits), bits);
        let loss = exp(&one.sub(&cosine, bits).mul(&self.proper_distance, bits), bits);
        let size = pi(bits).square(bits).add(&step, bits).abs_upper().shift(-1);
        size.mul(constant).mul(loss.abs_upper()).div(decay.abs_lower())
    }

    /// Bound of everything right of the last node, without the factor `exp(-2E)`.
    fn right_cut_error(&self, plan: &Plan) -> Magnitude {
        let bits = BOUND_BITS;
        let step = plan.step_ball(bits);
        let x = step.mul_i64(plan.last as i64, bits);
        let half = exp(&x.shift(-1), bits);
        let fall = self.left_root.div(&half, bits);
        let rise = self.right_root.mul(&half, bits);
        let gap = rise.sub(&fall, bits);
        if !gap.certainly_positive() {
            return Magnitude::INFINITY;
        }
        let one = Real::from_i64(1);
        let small = exp(&gap.square(bits).add(&x, bits).neg(), bits);
        let below = one.sub(&exp(&x.shift(1).neg(), bits), bits);
        x.add(&one, bits).mul(&small, bits).div(&below, bits).abs_upper().shift(-2)
    }

    /// `4/(pi^2 a) exp(-2E) S`.
    fn probability(&self, integral: &Real, bits: Bits) -> Real {
        let square = pi(bits).square(bits).mul(&self.half_width, bits);
        let scaled = integral.shift(2).div(&square, bits);
        if self.at_cone {
            return scaled;
        }
        scaled.mul(&exp(&self.proper_distance.shift(1).neg(), bits), bits)
    }
}

/// `exp(-y)` bounded by a power of two, for `y` whose lower bound is taken: `log2 e > 1.442`.
pub(super) fn exp_minus_upper(y: &Real) -> Magnitude {
    let low = y.abs_lower();
    if !y.certainly_positive() {
        return Magnitude::ONE;
    }
    let scaled = low.mul_down(Magnitude::from_u64(1442)).to_float();
    match scaled.to_integer_round(rug::float::Round::Down).and_then(|(n, _)| (n / 1000u32).to_i64()) {
        Some(power) => Magnitude::power_of_two(-power),
        None => Magnitude::power_of_two(-(1 << 49)),
    }
}

fn witness(plan: &Plan, errors: &[(&'static str, Magnitude)], integral: &Real) -> Vec<(String, String)> {
    let mut list = vec![
        ("step h, in units of ln 2".to_owned(), plan.step.to_string()),
        ("strip half-width b".to_owned(), plan.strip.as_ref().map_or("pi/2".to_owned(), ToString::to_string)),
        ("first node".to_owned(), plan.first.to_string()),
        ("last near node".to_owned(), plan.near.to_string()),
        ("last node".to_owned(), plan.last.to_string()),
        ("far field in closed form".to_owned(), plan.far_field.to_string()),
        ("far-field series terms".to_owned(), plan.series_terms.to_string()),
        ("cross series terms".to_owned(), plan.cross_terms.to_string()),
    ];
    for (name, bound) in errors {
        list.push(((*name).to_owned(), decimal::upper_decimal(&bound.to_float(), 4)));
    }
    let interval: Interval = integral.to_interval(plan.bits);
    list.push(("integral without exp(-2E), lower".to_owned(), decimal::lower_decimal(interval.lower(), 20)));
    list.push(("integral without exp(-2E), upper".to_owned(), decimal::upper_decimal(interval.upper(), 20)));
    list
}
