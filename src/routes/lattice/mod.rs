//! Route "lattice": the momentum integral as a sum over a lattice, the position integral in closed form.
//!
//! # Formula (unit mass)
//!
//! With `Phi(p) = phi(p) exp(-i omega(p) t)` and the lattice `p_j = k + j h` put
//!
//! ```text
//! psi_h(x) = (h/sqrt(2 pi)) Sum_{|j| <= J} Phi(p_j) exp(i p_j x).
//! ```
//!
//! `|psi_h|^2` is a trigonometric polynomial, so its integral over `W = [x1, x2]` is exact:
//!
//! ```text
//! P_h(W) = (h^2 / 2 pi) Sum_n R_n W_n,   R_n = Sum_j Phi(p_{j+n}) conj Phi(p_j),   W_n = Int_W exp(i n h x) dx,
//! ```
//!
//! with the autocorrelation `R_n` of the samples from one product of big integers (`window`).
//!
//! # How far `P_h(W)` is from `P(W)`
//!
//! **Lemma 1.** For `|Im p| <= 1`: `|Im omega| <= |Im p|`. *Proof.* Let `p = u + iq`, `omega = a + ib`, so
//! `a^2 - b^2 = 1 + u^2 - q^2` and `a b = u q`. If `b^2 > q^2` then `a^2 > 1 + u^2`, hence
//! `a^2 b^2 > (1 + u^2) q^2 >= u^2 q^2`, a contradiction. ∎
//!
//! **Lemma 2.** For `0 <= q <= 1` and every real `Y`: `Int_Y^inf |psi|^2 dx <= exp(2 q^2 s^2 - 2 q (Y - |t|))`, and the
//! same for `x < -Y`. *Proof.* `Phi` is analytic for `|Im p| < 1`, continuous up to the boundary and falls like a
//! gaussian, so for `q < 1` the contour can be shifted to `Im p = q` and Plancherel's theorem gives
//! `Int |psi|^2 exp(2qx) dx = Int |Phi(u + iq)|^2 du`; the case `q = 1` follows by monotone convergence. By lemma 1
//! `|Phi(u + iq)|^2 <= (2 s^2/pi)^(1/2) exp(-2 s^2 ((u-k)^2 - q^2) + 2 q |t|)`, whose integral is
//! `exp(2 q^2 s^2 + 2 q |t|)`. ∎
//!
//! **Lemma 3** (aliasing). Without the cut-off `J`, Poisson's summation formula gives `psi_h = psi + Sum_{n != 0} d_n`
//! with `|d_n(x)| = |psi(x - n L)|` and the period `L = 2 pi/h`. For `0 <= q <= 1`
//!
//! ```text
//! 2 Sum_n Int |psi d_n| dx <= 4 e^(2 q^2 s^2 + 2 q |t|) / (e^(qL) - 1),
//! ||Sum_n d_n||_{L^2(W)}   <= e^(q^2 s^2 + q |t|) (e^(-q (L - x2)) + e^(-q (L + x1))) / (1 - e^(-qL)).
//! ```
//!
//! *Proof.* For `n >= 1`, `|psi(x) psi(x - nL)| = e^(-qnL) |psi(x)| e^(qx) |psi(x - nL)| e^(-q (x - nL))`. By Cauchy and
//! Schwarz its integral is at most `e^(-qnL)` times the two norms in the proof of lemma 2, `e^(q^2 s^2 + q |t|)` each. The
//! norm of `d_n` on `W` is at most that of `psi` left of `x2 - nL`, see lemma 2. Both for `n <= -1` alike; sum over `n`. ∎
//!
//! **Lemma 4** (cut-off). If `x2 - x1 <= L`, the samples with `|j| > J` make in `L^2(W)` at most what they make on
//! a whole period, by Parseval's theorem `(h Sum_{|j|>J} |Phi(p_j)|^2)^(1/2)`, and as the gaussian falls
//! `h Sum_{|j|>J} |Phi|^2 <= 2 (2 s^2/pi)^(1/2) Int_{Jh}^inf exp(-2 s^2 u^2) du <= (2/pi)^(1/2) exp(-2 s^2 J^2 h^2)/(2 s J h)`.
//!
//! **Theorem.** With `A` and `a` the two bounds of lemma 3, `c` that of lemma 4 and `N = ||psi||_{L^2(W)}`,
//! `|P_h(W) - P(W)| <= A + 2 N c + (a + c)^2`. For `N` the smaller of one and lemma 2 is used. *Proof.* Expand
//! `|psi + d|^2` with `d` the sum of all copies and of what is cut off. ∎
//!
//! # Regions
//!
//! `|x| > R` is one minus the window `[-R, R]`, so that small tails need as many more bits, which the goal provides.
//! A half line `x > x1` is the window `[x1, Y]` and the rest beyond `Y`, which lies between zero and lemma 2.

mod plan;
mod samples;
mod window;

use super::gaussian::{GaussianProblem, Pass, Region, allow, refine};
use super::{Effort, Evaluation, RouteFailure, RouteOutcome};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, decimal, rounding};
use crate::functions::elementary::{exp, pi, sqrt};
use plan::Plan;
use rug::Rational;

/// The lattice route with its problem.
pub struct Lattice {
    problem: GaussianProblem,
}

/// Precision in which error bounds are evaluated; they need few digits.
const BOUND_BITS: Bits = 64;

impl Lattice {
    /// The route for one problem.
    pub fn new(problem: GaussianProblem) -> Lattice {
        Lattice { problem }
    }

    /// One enclosure with the absolute error `exp(-goal)` in view.
    fn pass(&self, goal: f64, effort: &Effort) -> Result<Pass, RouteFailure> {
        let packet = self.problem.estimates()?;
        let plan = Plan::new(&packet, self.problem.region(), goal);
        let bits = allow(effort, plan.count_estimate(), plan.bits_estimate())?;
        let samples = samples::Samples::new(&self.problem, &plan, bits, effort)?;
        let inside = window::integral(&self.problem, &plan, &samples, bits, effort)?;
        let bounds = Bounds::new(&self.problem, &plan);
        let (product, copies) = bounds.aliasing();
        let cut_off = bounds.cut_off();
        let errors = [
            ("aliasing bound A", product),
            ("aliasing bound a", copies),
            ("cut-off bound c", cut_off),
            ("probability beyond the window, bound", bounds.remainder()),
        ];
        let amplitude = copies.add(cut_off);
        let mut total = product.add(cut_off.mul(bounds.norm()).shift(1)).add(amplitude.mul(amplitude));
        if crate::spoil::is_active(crate::spoil::Fault::LatticeErrorForgotten) {
            total = Magnitude::ZERO;
        }
        let window = inside.widen(total);
        let value = match self.problem.region() {
            Region::Outside(_) => Real::from_i64(1).sub(&window, bits),
            Region::RightOf(_) | Region::LeftOf(_) => {
                let rest = Interval::new(rounding::down(BOUND_BITS, 0), errors[3].1.to_float());
                window.add(&Real::from_interval(&rest, BOUND_BITS), bits)
            }
            Region::Within(_) | Region::Between(..) => window,
        };
        Ok(Pass { value, bits, nodes: 2 * plan.last + 1, witness: witness(&plan, &errors) })
    }
}

impl Evaluation for Lattice {
    fn name(&self) -> &'static str {
        "lattice"
    }

    fn method(&self) -> &'static str {
        "momentum integral on a lattice, position integral in closed form through the autocorrelation of the samples"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        refine(&self.problem, digits, |goal| self.pass(goal, effort))
    }
}

/// The bounds of the module's lemmas for one plan.
struct Bounds<'a> {
    plan: &'a Plan,
    sigma: Real,
    time: Real,
    left: Real,
    right: Real,
    region: &'a Region,
}

impl<'a> Bounds<'a> {
    fn new(problem: &'a GaussianProblem, plan: &'a Plan) -> Bounds<'a> {
        let ball = |value: &Rational| Real::from_rational(value, BOUND_BITS);
        Bounds {
            plan,
            sigma: ball(problem.sigma()),
            time: ball(problem.time()).abs(),
            left: ball(&plan.left),
            right: ball(&plan.right),
            region: problem.region(),
        }
    }

    /// `exp(q^2 s^2 - q (y - |t|))`: the norm of `psi` on either half line beyond `y`, for any `0 <= q <= 1`.
    fn half_line(&self, rate: &Rational, y: &Real) -> Magnitude {
        let bits = BOUND_BITS;
        if *rate < 0 || *rate > 1 {
            return Magnitude::INFINITY;
        }
        let q = Real::from_rational(rate, bits);
        let width = q.mul(&self.sigma, bits).square(bits);
        exp(&width.sub(&q.mul(&y.sub(&self.time, bits), bits), bits), bits).abs_upper()
    }

    /// Lemma 3, `A` and `a`; nothing is known when the window is wider than a period.
    fn aliasing(&self) -> (Magnitude, Magnitude) {
        let bits = BOUND_BITS;
        let step = Real::from_rational(&self.plan.step, bits);
        let period = pi(bits).shift(1).div(&step, bits);
        if !self.right.sub(&self.left, bits).certainly_less(&period) {
            return (Magnitude::INFINITY, Magnitude::INFINITY);
        }
        let rate = &self.plan.rate;
        let first = self.half_line(rate, &period.sub(&self.right, bits));
        let second = self.half_line(rate, &period.add(&self.left, bits));
        let ratio = exp(&Real::from_rational(rate, bits).mul(&period, bits).neg(), bits);
        let rest = Real::from_i64(1).sub(&ratio, bits).abs_lower();
        // exp(q^2 s^2 + q |t|)
        let norm = self.half_line(rate, &Real::zero());
        let product = norm.mul(norm).mul(ratio.abs_upper()).shift(2);
        (product.div(rest), first.add(second).div(rest))
    }

    /// Lemma 4; its condition on the window is checked with lemma 3.
    fn cut_off(&self) -> Magnitude {
        let bits = BOUND_BITS;
        let edge = Real::from_rational(&Rational::from(&self.plan.step * self.plan.last as u64), bits);
        let scaled = edge.mul(&self.sigma, bits);
        let size = exp(&scaled.square(bits).shift(1).neg(), bits);
        let factor = sqrt(&Real::from_i64(2).div(&pi(bits), bits), bits);
        factor.mul(&size, bits).div(&scaled.shift(1), bits).abs_upper().sqrt()
    }

    /// An upper bound of the norm of `psi` on the window.
    fn norm(&self) -> Magnitude {
        let rate = &self.plan.window_rate;
        self.half_line(rate, &self.left).min(self.half_line(rate, &self.right.neg())).min(Magnitude::ONE)
    }

    /// An upper bound of the probability beyond the window's far end.
    fn remainder(&self) -> Magnitude {
        let amplitude = match self.region {
            Region::RightOf(_) => self.half_line(&self.plan.end_rate, &self.right),
            Region::LeftOf(_) => self.half_line(&self.plan.end_rate, &self.left.neg()),
            _ => Magnitude::ZERO,
        };
        amplitude.mul(amplitude)
    }
}

fn witness(plan: &Plan, errors: &[(&'static str, Magnitude)]) -> Vec<(String, String)> {
    let mut list = vec![
        ("step h".to_owned(), plan.step.to_string()),
        ("last node J".to_owned(), plan.last.to_string()),
        ("window, left end".to_owned(), plan.left.to_string()),
        ("window, right end".to_owned(), plan.right.to_string()),
        ("decay rate q".to_owned(), plan.rate.to_string()),
    ];
    for (name, bound) in errors {
        list.push(((*name).to_owned(), decimal::upper_decimal(&bound.to_float(), 4)));
    }
    list
}
