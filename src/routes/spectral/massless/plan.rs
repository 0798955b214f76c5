//! Step, cut-offs and precisions of the massless spectral sum, chosen in double precision.
//!
//! Nothing here decides containment: all bounds are evaluated afterwards for whatever was chosen.

use crate::routes::estimate::{bisect, dyadic, ln_of, massless_log_probability};
use crate::routes::{RouteFailure, TailProblem};
use rug::Rational;
use std::f64::consts::{FRAC_PI_2, LN_2, LN_10, PI};

/// More nodes than this are refused.
const MAX_NODES: f64 = 60_000.0;
/// Logarithms of the inputs beyond this are refused (about `10^±4300`): the exponent range of the balls is far
/// wider, but the nodes would only resolve the logarithm.
const MAX_LOGARITHM: f64 = 1e4;

/// All choices for one evaluation.
pub(super) struct Plan {
    /// Step `h`, a dyadic rational.
    pub step: Rational,
    /// Half-width of the strip of analyticity used; `None` stands for `pi/2`.
    pub strip: Option<Rational>,
    /// Index of the first node.
    pub first: i64,
    /// Index of the last node whose weight is evaluated.
    pub last: i64,
    /// Whether the nodes beyond the last one follow in closed form.
    pub far_field: bool,
    /// Working precision.
    pub bits: u32,
    /// The weights `v_k` are kept in units of `2^-weight_scale`.
    pub weight_scale: i64,
    /// The ratios `w_k/kappa_k` are kept in units of `2^-ratio_scale`.
    pub ratio_scale: i64,
    /// The couplings `C_m`, `T_i`, `U_n` are kept in units of `2^-coupling_scale`.
    pub coupling_scale: u32,
}

/// Logarithms of the sizes involved.
struct Sizes {
    time: f64,
    /// Minus infinity at the cone.
    distance: f64,
    /// `ln m`
    small: f64,
    /// `ln S` minus the logarithm of the relative error allowed: the logarithm of the error allowed.
    allowed: f64,
}

impl Plan {
    pub(super) fn new(problem: &TailProblem, digits: u32) -> Result<Plan, RouteFailure> {
        let sizes = Sizes::new(problem, digits)?;
        let (step, strip) = sizes.choose_step();
        let h = step.to_f64();
        let first = (sizes.left_end(h) / h).floor() + 1.0;
        let far_field = problem.distance == 0;
        let end = if far_field { sizes.far_field_start(h) } else { sizes.right_end(h) };
        let last = (end / h).ceil().max(first);
        let count = last - first + 1.0;
        if count > MAX_NODES {
            let reason = format!("the massless spectral sum would need {count:.0} nodes, more than {MAX_NODES:.0}");
            return Err(RouteFailure::OutOfReach { reason });
        }
        // Relative to B_1^2, or to m for the ratios, all that matters is the goal and the number of nodes.
        let goal = 2.0 * sizes.ln_majorant(0.0) - sizes.allowed;
        let (fine, spread) = (goal / LN_2, count.log2());
        let ratio_goal = if far_field { (sizes.small - sizes.allowed) / LN_2 + 8.0 } else { 0.0 };
        let coupling_scale = fine.max(ratio_goal) + spread + 12.0;
        // Exponents of the size of the goal lose its bits, the recurrence of the nodes loses their number.
        let bits = coupling_scale + 2.0 * spread + (2.0 + goal).log2() + 16.0;
        Ok(Plan {
            step,
            strip: strip.map(|b| dyadic(b, 40)),
            first: first as i64,
            last: last as i64,
            far_field,
            bits: bits as u32,
            weight_scale: (fine + spread + 10.0 - sizes.ln_majorant(0.0) / LN_2) as i64,
            ratio_scale: (ratio_goal + spread + 12.0 - sizes.small / LN_2) as i64,
            coupling_scale: coupling_scale as u32,
        })
    }

    /// Number of nodes.
    pub(super) fn count(&self) -> usize {
        (self.last - self.first + 1) as usize
    }
}

impl Sizes {
    fn new(problem: &TailProblem, digits: u32) -> Result<Sizes, RouteFailure> {
        let time = ln_of(&problem.time);
        let distance = if problem.distance == 0 { f64::NEG_INFINITY } else { ln_of(&problem.distance) };
        if time.abs() > MAX_LOGARITHM || (problem.distance != 0 && distance.abs() > MAX_LOGARITHM) {
            let reason = "the ratios of the inputs are outside 1e-4300 to 1e4300".to_owned();
            return Err(RouteFailure::OutOfReach { reason });
        }
        let size = massless_log_probability(time, distance) + (PI * PI / 4.0).ln();
        // The estimate may be off by a factor of ten; five errors share the width.
        let allowed = size - f64::from(digits) * LN_10 - 6.0;
        Ok(Sizes { time, distance, small: time.min(0.0), allowed })
    }

    /// `ln B_c`, from `ln c`.
    fn ln_majorant(&self, ln_cosine: f64) -> f64 {
        let rate = self.distance + ln_cosine;
        let plain = 4f64.ln() + 0.5 * self.small;
        let middle = self.small + 0.5 * (PI.ln() - rate);
        let far = self.time + 0.5 * (PI / 4.0).ln() - 1.5 * rate;
        plain.min(middle).min(far)
    }

    /// The largest step for which Theorem E stays below the error allowed.
    fn choose_step(&self) -> (Rational, Option<f64>) {
        let step_for = |b: f64, ln_cosine: f64| {
            let size = self.ln_majorant(ln_cosine) + self.ln_majorant(0.0) + 4f64.ln();
            2.0 * PI * b / (size - self.allowed).max(1.0)
        };
        let mut best = (step_for(FRAC_PI_2, f64::NEG_INFINITY), None);
        for index in 1..80 {
            let ln_cosine = -0.2 * f64::from(index);
            let b = ln_cosine.exp().acos();
            let step = step_for(b, ln_cosine);
            if step > best.0 {
                best = (step, Some(b));
            }
        }
        (dyadic(best.0.min(1.0), 24), best.1)
    }

    /// Where the left cut-off bound is small enough.
    fn left_end(&self, h: f64) -> f64 {
        let quotient = self.time.abs();
        let plain = self.small + (2.0 + h + quotient).ln();
        let far = self.time - self.distance + (1.0 + 0.5 * h).ln();
        0.5 * (self.allowed - plain.min(far) - self.time - (1.0 + 2.0 * h).ln())
    }

    /// Where the right cut-off bound is small enough, beyond the cone.
    fn right_end(&self, h: f64) -> f64 {
        let need = self.ln_majorant(0.0) + (1.0 + 0.5 * h).ln() + (0.25 * (2.0 + h)).ln() - self.allowed;
        let enough = |x: f64| (x + self.distance).exp() + 0.5 * x > need;
        let high = -self.distance + (need.abs() + self.distance.abs() + 10.0).ln();
        bisect(high.min(-self.distance) - 5.0 - need.abs(), high, enough)
    }

    /// Where the replacement bound is small enough, at the cone.
    fn far_field_start(&self, h: f64) -> f64 {
        let need = self.small + 2.0 * (2.0 + h).ln() - self.allowed;
        (0.5 * need).max(1.0).ln() - self.small
    }
}
