//! Route "contour": position space on a contour shifted in rapidity, double sum with everything positive scale known.
//!
//! # Formula (unit mass)
//!
//! With `p = sinh z`, `omega = cosh z` the integrand of `psi(x, t)` is entire in `z`. On the line `z = eta + ic` with
//! `0 < c < pi/4` it falls like a gaussian in `p`, and `Im p = cosh(eta) sin(c) > 0`, so that the integral of `|psi|^2`
//! over `x > R` can be done under the integrals over `z` and, for the conjugate factor, `z'`:
//!
//! ```text
//! P(x > R) = s sqrt(2/pi)/(2 pi) * I,    I = Int Int f(z) conj f(z') i/(sinh z - conj sinh z') d eta d eta',
//! f(z) = cosh(z) exp(-s^2 (sinh z - k)^2 - i t cosh z + i R sinh z).
//! ```
//!
//! No position integral and no cancellation from "one minus" is left. `I` becomes a double trapezoid sum with
//! step `h` (`double_sum`). All other regions follow: `x < -R` is `x > R` for `-k`, the rest are sums and complements.
//!
//! # Bounds
//!
//! Let `R >= 0`, `z = eta + i theta` with `0 <= theta < pi/4`, and `u = sinh(eta)`. Then `|cosh z| <= cosh(eta)` and
//! `|f(z)| <= cosh(eta) exp(E(u))` with
//!
//! ```text
//! E(u) = -s^2 [(u cos theta - k)^2 - (1 + u^2) sin^2 theta] + (t u - R sqrt(1 + u^2)) sin theta.
//! ```
//!
//! **Lemma 1** (envelope). For every real `u0`, with `w0 = sqrt(1 + u0^2)`: `E(u) <= -A u^2 + B u + C`, where
//! `A = s^2 cos(2 theta) > 0`, `B = 2 s^2 k cos theta + (t - R u0/w0) sin theta`,
//! `C = s^2 (sin^2 theta - k^2) - R sin(theta)/w0`; equality at `u = u0`. *Proof.* `sqrt(1 + u^2) >= (1 + u u0)/w0` by
//! Cauchy and Schwarz. ∎ Let `G = exp(B^2/(4A) + C)`, the maximum of the envelope; then
//! `Int cosh(eta) exp(E) d eta = Int exp(E) du <= sqrt(pi/A) G`, and `Int exp(E) d eta` is not larger. Since the envelope
//! has one maximum in `eta`, `h Sum_l exp(E(u_l)) <= (sqrt(pi/A) + h) G`. At `theta = 0` simply `G <= 1`.
//!
//! **Lemma 2** (kernel). For `theta >= 0` and `theta' = c`: `|sinh z - conj sinh z'| >= cosh(eta) sin theta +
//! cosh(eta') sin c >= cosh(eta') sin c`. *Proof.* It is at least the imaginary part. ∎
//!
//! **Theorem 3** (step). For lines `0 <= theta_1 < c < theta_2 < pi/4`, `I` differs from the double trapezoid sum by at
//! most
//!
//! ```text
//! (2 sqrt(pi/A_c) + h) G_c / sin c  *  Sum_{j=1,2} sqrt(pi/A_j) G_j / (exp(2 pi |theta_j - c|/h) - 1).
//! ```
//!
//! *Proof.* For `g` analytic and falling in the strip between the lines, the residue theorem applied to
//! `g(z)/(1 - exp(-+2 pi i (z - ic)/h))` above and below bounds the error of the trapezoid rule on `Im z = c` by
//! `Sum_j Int |g(eta + i theta_j)| d eta/(exp(2 pi |theta_j - c|/h) - 1)` (Trefethen and Weideman, SIAM Review 56
//! (2014), proof of theorem 5.1; from memory). First in `z` for each `z'_l`: the kernel's poles lie at `Im z = -c` and
//! `pi + c` (modulo `2 pi`), outside the strip, and by lemmas 1 and 2 the errors add up to at most
//! `h Sum_l |f(z'_l)|/(cosh(eta'_l) sin c)` times the sum over the lines, with `h Sum_l exp(E_c) <= (sqrt(pi/A_c) + h) G_c`.
//! Then in `z'` for the integral over `z`, where the weight is `Int |f|/(cosh(eta) sin c) d eta <= sqrt(pi/A_c) G_c/sin c`. ∎
//!
//! **Lemma 4** (cut-off). Let `u_J = sinh(J h)`, the envelope of `theta = c` touch at `u0 = u_J`, `D = 2 A u_J - B > 0`,
//! and `sqrt(1 + u_J^2) D >= 1` if `u_J >= 0`, `-B >= 1` if `u_J < 0`. Then `h Sum_{l > J} |f(z_l)| <= exp(E(u_J))/D`.
//! *Proof.* The derivative of the logarithm of `cosh(eta) exp(-A u^2 + B u + C)` is `tanh(eta) - cosh(eta) (2 A u - B)`.
//! For `u >= u_J` the bracket is at least `D`, so the derivative is negative for `u < 0`; for `u >= 0` the second term is
//! at least `sqrt(1 + u_J^2) D` or, if `u_J < 0`, at least `-B`, so not below one. The sum is therefore below
//! `Int_{u_J}^inf exp(-A u^2 + B u + C) du`, where the exponent falls at least at the rate `D`. ∎ The left end is its
//! mirror image (`k -> -k`, `t -> -t`). With `T` the sum of both, all pairs with an index outside contribute at most
//! `2 T (sqrt(pi/A_c) + h) G_c / sin c`.

mod bounds;
mod double_sum;
mod envelope;
mod nodes;
mod plan;

use super::gaussian::{Estimates, GaussianProblem, Pass, Region, allow, refine};
use super::{Effort, Evaluation, RouteFailure, RouteOutcome};
use crate::arithmetic::{Bits, Magnitude, Real, decimal};
use crate::functions::elementary::{pi, sqrt};
use bounds::Bounds;
use nodes::Nodes;
use plan::Plan;
use rug::Rational;

/// The contour route with its problem.
pub struct Contour {
    problem: GaussianProblem,
}

impl Contour {
    /// The route for one problem.
    pub fn new(problem: GaussianProblem) -> Contour {
        Contour { problem }
    }

    /// One enclosure with the absolute error `exp(-goal)` in view.
    fn pass(&self, goal: f64, effort: &Effort) -> Result<Pass, RouteFailure> {
        let zero = Rational::new();
        // For a sum of two, one more bit.
        let goal = goal + std::f64::consts::LN_2;
        let tail = |from: &Rational, mirrored: bool| Tail::new(&self.problem, from, mirrored).pass(goal, effort);
        match self.problem.region() {
            Region::Outside(r) => self.both(r, goal, effort),
            Region::Within(r) => Ok(complement(self.both(r, goal, effort)?)),
            Region::RightOf(x) if *x >= zero => tail(x, false),
            Region::RightOf(x) => Ok(complement(tail(&Rational::from(-x), true)?)),
            Region::LeftOf(x) if *x <= zero => tail(&Rational::from(-x), true),
            Region::LeftOf(x) => Ok(complement(tail(x, false)?)),
            Region::Between(low, high) if *low >= zero => Ok(minus(tail(low, false)?, tail(high, false)?)),
            Region::Between(low, high) if *high <= zero => {
                Ok(minus(tail(&Rational::from(-high), true)?, tail(&Rational::from(-low), true)?))
            }
            Region::Between(low, high) => Ok(complement(plus(tail(&Rational::from(-low), true)?, tail(high, false)?))),
        }
    }

    /// `P(|x| > r)`; a packet at rest is even.
    fn both(&self, r: &Rational, goal: f64, effort: &Effort) -> Result<Pass, RouteFailure> {
        let mut right = Tail::new(&self.problem, r, false).pass(goal, effort)?;
        if *self.problem.momentum() == 0 {
            right.value = right.value.shift(1);
            return Ok(right);
        }
        Ok(plus(right, Tail::new(&self.problem, r, true).pass(goal, effort)?))
    }
}

impl Evaluation for Contour {
    fn name(&self) -> &'static str {
        "contour"
    }

    fn method(&self) -> &'static str {
        "position amplitude on a contour shifted in rapidity, position integral in closed form, double trapezoid sum"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        refine(&self.problem, digits, |goal| self.pass(goal, effort))
    }
}

fn join(left: Pass, right: Pass, value: Real) -> Pass {
    let mut witness = left.witness;
    witness.extend(right.witness.into_iter().map(|(name, text)| (format!("second tail: {name}"), text)));
    Pass { value, bits: left.bits.max(right.bits), nodes: left.nodes + right.nodes, witness }
}

fn plus(left: Pass, right: Pass) -> Pass {
    let value = left.value.add(&right.value, left.bits.max(right.bits));
    join(left, right, value)
}

fn minus(left: Pass, right: Pass) -> Pass {
    let value = left.value.sub(&right.value, left.bits.max(right.bits));
    join(left, right, value)
}

fn complement(mut pass: Pass) -> Pass {
    pass.value = Real::from_i64(1).sub(&pass.value, pass.bits);
    pass
}

/// `P(x > from)` with `from >= 0`, for the packet or its mirror image.
struct Tail {
    sigma: Rational,
    momentum: Rational,
    time: Rational,
    from: Rational,
}

impl Tail {
    fn new(problem: &GaussianProblem, from: &Rational, mirrored: bool) -> Tail {
        let momentum = problem.momentum().clone();
        Tail {
            sigma: problem.sigma().clone(),
            momentum: if mirrored { -momentum } else { momentum },
            time: problem.time().clone(),
            from: from.clone(),
        }
    }

    fn pass(&self, goal: f64, effort: &Effort) -> Result<Pass, RouteFailure> {
        let packet =
            Estimates { sigma: self.sigma.to_f64(), momentum: self.momentum.to_f64(), time: self.time.to_f64() };
        let plan = Plan::new(&packet, self.from.to_f64(), goal)?;
        let bits = allow(effort, plan.count_estimate(), plan.bits_estimate())?;
        let nodes = Nodes::new(self, &plan, bits, effort)?;
        let sum = double_sum::sum(&nodes, &plan, bits, effort)?;
        let bounds = Bounds::new(self, &plan);
        let errors = [("discretisation bound", bounds.discretisation()), ("cut-off bound", bounds.cut_off())];
        let step = Real::from_rational(&plan.step, bits);
        let mut integral = sum.mul(&step.square(bits), bits);
        for (_, error) in &errors {
            integral = integral.widen(*error);
        }
        let root = sqrt(&Real::from_i64(2).div(&pi(bits), bits), bits);
        let prefactor = Real::from_rational(&self.sigma, bits).mul(&root, bits).div(&pi(bits).shift(1), bits);
        Ok(Pass { value: integral.mul(&prefactor, bits), bits, nodes: plan.count(), witness: witness(&plan, &errors) })
    }

    /// The parameters as balls.
    fn balls(&self, bits: Bits) -> Balls {
        let ball = |value: &Rational| Real::from_rational(value, bits);
        Balls {
            width: ball(&self.sigma).square(bits),
            momentum: ball(&self.momentum),
            time: ball(&self.time),
            from: ball(&self.from),
        }
    }
}

/// The parameters of a tail as balls.
struct Balls {
    /// `s^2`
    width: Real,
    momentum: Real,
    time: Real,
    from: Real,
}

fn witness(plan: &Plan, errors: &[(&'static str, Magnitude)]) -> Vec<(String, String)> {
    let mut list = vec![
        ("step h".to_owned(), plan.step.to_string()),
        ("first node".to_owned(), plan.first.to_string()),
        ("last node".to_owned(), plan.last.to_string()),
        ("shift c".to_owned(), plan.shift.to_string()),
        ("line above".to_owned(), plan.above.to_string()),
        ("line below".to_owned(), plan.below.to_string()),
    ];
    for (name, bound) in errors {
        list.push(((*name).to_owned(), decimal::upper_decimal(&bound.to_float(), 4)));
    }
    list
}
