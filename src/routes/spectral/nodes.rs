//! The weights `w(kh)` as balls and as fixed-point integers.

use super::cone_nodes::ConeWeights;
use super::plan::Plan;
use super::{BOUND_BITS, Setting, exp_minus_upper};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{exp, exp_m1};
use crate::routes::{Effort, RouteFailure, TailProblem};
use rug::Integer;

/// Weights of the nodes `first..=last`, with `exp(-E)` taken out.
pub(super) struct Nodes {
    /// `floor(w_k 2^scale)`.
    pub weights: Vec<Integer>,
    /// `floor(w_k / (2 sinh kh) 2^scale)`.
    pub ratios: Vec<Integer>,
    /// Bound of the error of all weights and ratios, in units of `2^-scale`.
    pub error_units: Magnitude,
    left_cut: Magnitude,
}

impl Nodes {
    pub(super) fn new(
        problem: &TailProblem,
        setting: &Setting,
        plan: &Plan,
        effort: &Effort,
    ) -> Result<Nodes, RouteFailure> {
        if setting.at_cone {
            let ConeWeights { weights, ratios, error_units } = ConeWeights::new(problem, plan, effort)?;
            return Ok(Nodes { weights, ratios, error_units, left_cut: left_cut(setting, plan) });
        }
        Nodes::beyond_cone(setting, plan, effort)
    }

    fn beyond_cone(setting: &Setting, plan: &Plan, effort: &Effort) -> Result<Nodes, RouteFailure> {
        let bits = plan.bits;
        let step = plan.step_ball(bits);
        let half_step = exp(&step.shift(-1), bits);
        let growth = half_step.square(bits);
        let half_at_first = exp(&step.shift(-1).mul_i64(plan.first as i64, bits), bits);
        let mut half = half_at_first;
        let count = plan.last - plan.first + 1;
        let mut nodes = Nodes {
            weights: Vec::with_capacity(count),
            ratios: Vec::with_capacity(count),
            error_units: Magnitude::ZERO,
            left_cut: Magnitude::ZERO,
        };
        let mut whole = half.square(bits);
        for _ in plan.first..=plan.last {
            effort.check()?;
            let (weight, sinh) = weight(setting, &half, &whole, plan);
            let ratio = weight.div(&sinh.shift(1), bits);
            nodes.push(&weight, &ratio, plan.scale)?;
            whole = whole.mul(&growth, bits);
            half = half.mul(&half_step, bits);
        }
        nodes.left_cut = left_cut(setting, plan);
        Ok(nodes)
    }

    fn push(&mut self, weight: &Real, ratio: &Real, scale: u32) -> Result<(), RouteFailure> {
        let (weight, weight_error) = fixed(weight, scale)?;
        let (ratio, ratio_error) = fixed(ratio, scale)?;
        self.error_units = self.error_units.max(weight_error).max(ratio_error);
        self.weights.push(weight);
        self.ratios.push(ratio);
        Ok(())
    }

    /// Number of nodes.
    pub(super) fn len(&self) -> usize {
        self.weights.len()
    }

    /// Bound of what the nodes below the first would add to `S`.
    pub(super) fn left_cut_error(&self) -> Magnitude {
        self.left_cut
    }
}

/// A ball in units of `2^-scale`, with the bound of its error in units.
pub(super) fn fixed(value: &Real, scale: u32) -> Result<(Integer, Magnitude), RouteFailure> {
    value
        .to_fixed(i64::from(scale))
        .ok_or(RouteFailure::OutOfReach { reason: "a term of the spectral sum has no finite enclosure".to_owned() })
}

/// `(w(x), sinh x)` from `e^(x/2)` and `e^x`.
fn weight(setting: &Setting, half: &Real, whole: &Real, plan: &Plan) -> (Real, Real) {
    let bits = plan.bits;
    let one = Real::from_i64(1);
    let inverse = one.div(whole, bits);
    let sinh = whole.sub(&inverse, bits).shift(-1);
    let cosh = whole.add(&inverse, bits).shift(-1);
    let exponent = setting.left_root.div(half, bits).sub(&setting.right_root.mul(half, bits), bits).square(bits);
    let mut value = exp(&exponent.neg(), bits).shift(-2);
    for rate in [setting.time.mul(&sinh, bits), setting.half_width.mul(&cosh, bits)] {
        value = value.mul(&one_minus_exp(&rate.shift(1), plan.scale + 8, bits), bits);
    }
    (value.mul(&sinh.div(&cosh, bits), bits), sinh)
}

/// `1 - exp(-y)`; where `exp(-y) < 2^-fine`, the ball around one that is as wide as a power of two.
pub(super) fn one_minus_exp(y: &Real, fine: Bits, bits: Bits) -> Real {
    let small = exp_minus_upper(y);
    if small.cmp_value(Magnitude::power_of_two(-i64::from(fine))).is_lt() {
        return Real::from_i64(1).widen(small);
    }
    exp_m1(&y.neg(), bits).neg()
}

/// `(pi^2/32) exp(-Y)` at the last node left out; `pi^2/32 < 0.32 < 2^-1`.
fn left_cut(setting: &Setting, plan: &Plan) -> Magnitude {
    if plan.first <= 1 {
        return Magnitude::ZERO;
    }
    let bits = BOUND_BITS;
    let x = plan.step_ball(plan.bits).mul_i64(plan.first as i64 - 1, plan.bits);
    let half = exp(&x.shift(-1), plan.bits);
    let gap = setting.left_root.div(&half, plan.bits).sub(&setting.right_root.mul(&half, plan.bits), plan.bits);
    if !gap.certainly_positive() {
        return Magnitude::INFINITY;
    }
    exp(&gap.square(bits).neg(), bits).abs_upper().shift(-1)
}
