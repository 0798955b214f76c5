//! The spectral route for mass zero: trapezoid sum over `kappa = e^x`.
//!
//! # Formula (half-width one)
//!
//! ```text
//! P = 4/pi^2 * S,    S = Int Int w(x) w(y)/(e^x + e^y) dx dy over the whole plane,
//! w(x) = 1/4 (1 - exp(-2 kappa)) (1 - exp(-2 t kappa)) exp(-d kappa),    kappa = e^x.
//! ```
//!
//! It is the massive formula with the cut from `kappa = 0`: there `P = 4/pi^2 Int Int g g'/(kappa + kappa')`,
//! `g = sinh(kappa)/kappa sinh(t kappa) exp(-(1+t+d) kappa) = w/kappa`, and `dkappa = kappa dx`.
//!
//! # Majorants
//!
//! With `m = min(1, t)`, `M = max(1, t)` let `W_c(x) = min(1, kappa) min(1, t kappa) exp(-c d kappa)`, which is
//! `t kappa^2` up to `1/M`, `m kappa` up to `1/m` and one beyond, times the exponential.
//!
//! **Lemma A.** For `|b'| <= b <= pi/2` and `c = cos b`: `|w(s + i b')| <= W_c(s)`; and `w <= W_1` on the real line. *Proof.* With
//! `z = e^(s + i b')`, `Re z >= c e^s >= 0`, so `|1 - e^(-2z)| <= min(2, 2|z|)`, the same for `tz`, and
//! `|e^(-dz)| <= exp(-c d e^s)`. ∎
//!
//! **Lemma B.** `Int W_c(x) e^(-x/2) dx <= B_c = min(4 sqrt m, m sqrt(pi/(c d)), t (sqrt pi/2) (c d)^(-3/2))`. *Proof.* In `kappa`
//! the integral is `Int min min kappa^(-3/2) e^(-c d kappa) dkappa`. Without the exponential, the three pieces add up to
//! `4 sqrt m - (4/3) m/sqrt M`; with `min min <= m kappa` or `<= t kappa^2` they are Gamma integrals. ∎
//!
//! **Lemma C.** `h Sum_k W_1(kh) e^(-kh/2) <= B_1 (1 + h/2)`, over any set of integers `k`. *Proof.* The logarithm of the function
//! has the falling slopes `3/2, 1/2, -1/2` minus `d kappa`, so it is unimodal and the sum is at most its integral plus `h` times
//! its maximum. That is at most `min(sqrt m, m (2 e d)^(-1/2), t (3/(2 e d))^(3/2)) <= B_1/2`: the ratios to the bounds of
//! Lemma B are `1/4`, `< 0.25` and `< 0.47`. ∎
//!
//! **Lemma D.** `h Sum_k W_1(kh) e^(-kh) <= Q = min(m (2 + h + ln(M/m)), (t/d)(1 + h/2))`. *Proof.* As before: slopes `1, 0, -1` minus
//! `d kappa`; the integral is at most `t/M + m ln(M/m) + m = m (2 + ln(M/m))` and the maximum `m`; with `min min <= t kappa^2` they are
//! `t/d` and `t/(e d) < t/(2 d)`. ∎
//!
//! # Trapezoid rule
//!
//! `S_h = h^2 Sum_{k,l} w(kh) w(lh)/(e^(kh) + e^(lh))` over all integers.
//!
//! **Theorem E.** `|S - S_h| <= sqrt2 B_c B_1 (2 + h/2)/(exp(2 pi b/h) - 1)`. *Proof.* For `f` analytic in `|Im x| <= b` and tending to zero
//! at both ends, with `Int |f(s ± i b')| ds <= A` for `b' <= b`, the trapezoid rule on the line errs by at most
//! `2 A/(exp(2 pi b/h) - 1)` (Trefethen and Weideman, SIAM Review 56 (2014), theorem 5.1). For real `y` and `|b'| <= pi/2`,
//! `|e^(s+ib') + e^y|^2 >= e^(2s) + e^(2y) >= (e^s + e^y)^2/2 >= 2 e^(s+y)`. So for the sum over `x` at fixed `y`,
//! `A <= W(y) e^(-y/2) B_c/sqrt2` by Lemmas A and B; the sum over `y = lh` of these errors is at most
//! `sqrt2 B_c B_1 (1 + h/2)/(exp(2 pi b/h) - 1)` by Lemma C. Then for the sum over `y` of `w(y) Int w(x)/(e^x + e^y) dx`:
//! `A <= B_c B_1/sqrt2`, which adds `sqrt2 B_c B_1/(exp(2 pi b/h) - 1)`. ∎
//!
//! `B_c B_1` is of the size of `S` for all `t` and `d`, so a small probability needs no smaller step.
//! At the cone `b = pi/2`; beyond it `b` is chosen so that the step is largest.
//!
//! # Where the sums end
//!
//! * Left: pairs with a node below the first one add at most `2 h Sum_{l<first} t kappa_l^2 * h Sum_k w_k/kappa_k <= Q t kappa^2 (1 + 2h)`
//!   with `kappa` at the last node left out, as `1/(kappa + kappa') <= 1/kappa'` and `2h/(1 - e^(-2h)) <= 1 + 2h`.
//! * Right, `d > 0`: pairs with a node above the last one add at most
//!   `2 h^2 Sum Sum w w'/(2 sqrt(kappa kappa')) <= B_1 (1 + h/2) (1/4) exp(-d kappa) kappa^(-1/2) (2 + h)` with `kappa` at the first node left
//!   out, as `h/(1 - e^(-h/2)) <= 2 + h`.
//! * Right, `d = 0`: for all nodes above `K` the weight is replaced by `1/4`. Where `kappa >= 1/m`, this changes the weight by at most
//!   `exp(-2 m kappa)/2` and keeps it below `W_1`, so as before it changes `S_h` by at most
//!   `h Sum_{l>K} exp(-2 m kappa_l) kappa_l^(-1/2)/2 * 4 sqrt m (1 + h/2) <= m (2 + h)^2 exp(-2 m kappa)`, with `kappa` at the node after `K`.
//!
//! # The sums
//!
//! With `v_k = w_k kappa_k^(-1/2)`, `1/(kappa + kappa') = (kappa kappa')^(-1/2)/(2 cosh((x - x')/2))`, so the near sum is
//! `Sum_m C_m A_m`, `C_m = 1/(2 cosh(m h/2))` and `A_m` the autocorrelation of `v`: one product of big integers ([`sums`]).
//! The far field is in closed form. With `T_i = 1/(e^(ih) + 1)` and `U_n = Sum_{i>n} T_i`,
//!
//! ```text
//! near-far:  2 Sum_{k<=K} w_k Sum_{l>K} (1/4)/(kappa_k + kappa_l) = 1/2 Sum_{k<=K} (w_k/kappa_k) U_(K-k),
//! far-far:   Sum_{k,l>K} (1/16)/(kappa_k + kappa_l) = (1/2 + 2 U_0)/(16 kappa_(K+1) (1 - e^-h)),
//! ```
//!
//! from `1/(kappa_k + kappa_l) = T_(l-k)/kappa_k` and by splitting the double sum at `k = l`; `U_0` is a Lambert series
//! ([`alternating_lambert`]).

mod bounds;
mod plan;
mod sums;

use super::far_field::alternating_lambert;
use crate::arithmetic::{Magnitude, Real, decimal};
use crate::functions::elementary::{exp, pi};
use crate::routes::{Effort, RouteFailure, RouteOutcome, TailProblem};
use bounds::Bounds;
use plan::Plan;
use sums::{Couplings, Nodes};

pub(super) fn evaluate(problem: &TailProblem, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
    let plan = Plan::new(problem, digits)?;
    effort.allow_bits(plan.bits)?;
    let bounds = Bounds::new(problem, &plan);
    let nodes = Nodes::new(problem, &plan, effort)?;
    let couplings = Couplings::new(&plan, effort)?;
    let mut sum = sums::near(&nodes, &couplings, &plan, effort)?;
    let mut errors =
        vec![("discretisation bound", bounds.discretisation(&plan)), ("left cut-off bound", bounds.left_cut(&plan))];
    if plan.far_field {
        let far = far_field(&nodes, &couplings, &plan)?;
        sum = sum.add(&far, plan.bits);
        errors.push(("far-field replacement bound", bounds.replacement(&plan)));
    } else {
        errors.push(("right cut-off bound", bounds.right_cut(&plan)));
    }
    let step = Real::from_rational(&plan.step, plan.bits);
    let mut integral = sum.mul(&step.square(plan.bits), plan.bits);
    for (_, error) in &errors {
        integral = integral.widen(*error);
    }
    let probability = integral.shift(2).div(&pi(plan.bits).square(plan.bits), plan.bits);
    Ok(RouteOutcome {
        interval: probability.to_interval(plan.bits).clamp_non_negative(),
        bits: plan.bits,
        nodes: nodes.len(),
        witness: witness(&plan, &errors, &integral),
    })
}

/// The near-far and the far-far block.
fn far_field(nodes: &Nodes, couplings: &Couplings, plan: &Plan) -> Result<Real, RouteFailure> {
    let bits = plan.bits;
    let step = Real::from_rational(&plan.step, bits);
    let decay = exp(&step.neg(), bits);
    let whole = alternating_lambert(&decay, bits);
    let cross = sums::near_far(nodes, couplings, &whole, plan)?;
    let half = Real::from_i64(1).shift(-1);
    let inverse = exp(&step.mul_i64(-(plan.last + 1), bits), bits);
    let gap = Real::from_i64(1).sub(&decay, bits);
    let far = whole.shift(1).add(&half, bits).mul(&inverse, bits).div(&gap, bits).shift(-4);
    let total = cross.add(&far, bits);
    Ok(if crate::spoil::is_active(crate::spoil::Fault::FarFieldSign) { total.neg() } else { total })
}

fn witness(plan: &Plan, errors: &[(&'static str, Magnitude)], integral: &Real) -> Vec<(String, String)> {
    let mut list = vec![
        ("step h".to_owned(), plan.step.to_string()),
        ("strip half-width b".to_owned(), plan.strip.as_ref().map_or("pi/2".to_owned(), ToString::to_string)),
        ("first node".to_owned(), plan.first.to_string()),
        ("last node".to_owned(), plan.last.to_string()),
        ("far field in closed form".to_owned(), plan.far_field.to_string()),
    ];
    for (name, bound) in errors {
        list.push(((*name).to_owned(), decimal::upper_decimal(&bound.to_float(), 4)));
    }
    let interval = integral.to_interval(plan.bits);
    list.push(("integral S, lower".to_owned(), decimal::lower_decimal(interval.lower(), 20)));
    list.push(("integral S, upper".to_owned(), decimal::upper_decimal(interval.upper(), 20)));
    list
}
