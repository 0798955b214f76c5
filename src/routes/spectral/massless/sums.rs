//! The finite sums of the massless spectral route, in fixed point.
//!
//! **Near sum** `Sum_{k,l} C_(k-l) v_k v_l = C_0 A_0 + 2 Sum_{m>=1} C_m A_m`, `A_m = Sum_k v_k v_(k+m)`.
//! Integer products and sums are exact. Let the `n` integers for `v` be off by at most `e` units `u`, those for
//! `C <= 1/2` by at most two units `u'`, and let `V` be the sum of the integers for `v`. Then `v_k v_l` is off
//! by at most `e (V_k + V_l) + e^2` units `u^2`, so the sum is off by at most `(n e V + n^2 e^2/2) u^2` through
//! `v` and `2 V^2 u^2 u'` through `C`.
//!
//! **Near-far sum** `1/2 Sum_k r_k U_(K-k)`, `r_k = w_k/kappa_k`: with the integers for `r` off by at most `e`
//! units `u` and adding up to `R`, those for `U` off by at most `f` units `u'` and all at most `U_0`, it is off
//! by at most `(R f + n e (U_0 + f))/2` units `u u'`.

use super::plan::Plan;
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::exp;
use crate::routes::spectral::near_field::{pack, unpack};
use crate::routes::spectral::nodes::one_minus_exp;
use crate::routes::{Effort, RouteFailure, TailProblem};
use rug::{Float, Integer};

/// Integers with a common unit and a common bound of their errors in units.
struct FixedList {
    values: Vec<Integer>,
    error: Magnitude,
    scale: i64,
}

impl FixedList {
    fn with_capacity(count: usize, scale: i64) -> FixedList {
        FixedList { values: Vec::with_capacity(count), error: Magnitude::ZERO, scale }
    }

    fn push(&mut self, value: &Real) -> Result<(), RouteFailure> {
        let (integer, error) = fixed(value, self.scale)?;
        self.error = self.error.max(error);
        // All numbers here are positive: a negative integer is rounding noise, and zero is nearer.
        self.values.push(if integer < 0 { Integer::new() } else { integer });
        Ok(())
    }

    fn total(&self) -> Magnitude {
        magnitude(&self.values.iter().sum())
    }
}

fn fixed(value: &Real, scale: i64) -> Result<(Integer, Magnitude), RouteFailure> {
    value.to_fixed(scale).ok_or_else(|| RouteFailure::OutOfReach {
        reason: "a number of the massless spectral sum has no finite enclosure".to_owned(),
    })
}

fn magnitude(value: &Integer) -> Magnitude {
    Magnitude::from_float(&Float::with_val_round(64, value, rug::float::Round::AwayZero).0)
}

/// The weights at the nodes `first..=last`.
pub(super) struct Nodes {
    /// `v_k = w_k kappa_k^(-1/2)`
    weights: FixedList,
    /// `w_k/kappa_k`, only with a far field
    ratios: FixedList,
}

impl Nodes {
    pub(super) fn new(problem: &TailProblem, plan: &Plan, effort: &Effort) -> Result<Nodes, RouteFailure> {
        let bits = plan.bits;
        let step = Real::from_rational(&plan.step, bits);
        let (time, distance) = (Real::from_rational(&problem.time, bits), Real::from_rational(&problem.distance, bits));
        let growth = exp(&step, bits);
        let half_decay = exp(&step.shift(-1).neg(), bits);
        let mut kappa = exp(&step.mul_i64(plan.first, bits), bits);
        let mut half = exp(&step.mul_i64(-plan.first, bits).shift(-1), bits);
        let count = plan.count();
        let mut weights = FixedList::with_capacity(count, plan.weight_scale);
        let mut ratios = FixedList::with_capacity(count, plan.ratio_scale);
        for _ in 0..count {
            effort.check()?;
            let mut w = one_minus_exp(&kappa.shift(1), bits, bits);
            w = w.mul(&one_minus_exp(&kappa.mul(&time, bits).shift(1), bits, bits), bits).shift(-2);
            if !plan.far_field {
                w = w.mul(&exp(&kappa.mul(&distance, bits).neg(), bits), bits);
            }
            let v = w.mul(&half, bits);
            weights.push(&v)?;
            if plan.far_field {
                ratios.push(&v.mul(&half, bits))?;
            }
            kappa = kappa.mul(&growth, bits);
            half = half.mul(&half_decay, bits);
        }
        Ok(Nodes { weights, ratios })
    }
}

/// `C_m` and `T_m` for `m = 0, 1, ...` in units of `2^-coupling_scale`.
///
/// From `y = e^(-mh/2)` by repeated fixed-point products with 32 extra bits: each step shrinks the error it has
/// and adds at most one small unit for the rounding and less than two for the factor, so `y` is off by at most
/// `3 m` small units, below one unit for fewer than `2^30` steps. `C = y/(1 + y^2)` has a derivative at most
/// one in `y`, so with one rounding down it is off by less than two units, and `T = y C` by less
/// than `2 + 1/2 + 1 < 4`.
pub(super) struct Couplings {
    cosh: Vec<Integer>,
    fermi: Vec<Integer>,
    scale: i64,
}

impl Couplings {
    pub(super) fn new(plan: &Plan, effort: &Effort) -> Result<Couplings, RouteFailure> {
        let fine = plan.coupling_scale + 32;
        let half_step = Real::from_rational(&plan.step, fine + 32).shift(-1);
        let (factor, _) = fixed(&exp(&half_step.neg(), fine + 32), i64::from(fine))?;
        let one = Integer::from(1) << (2 * fine);
        let mut power = Integer::from(1) << fine;
        let count = plan.count();
        let (mut cosh, mut fermi) = (Vec::with_capacity(count), Vec::new());
        for index in 0..count {
            if index % 64 == 0 {
                effort.check()?;
            }
            let below = Integer::from(power.square_ref()) + &one;
            let value = (Integer::from(&power << fine) << plan.coupling_scale) / below;
            if plan.far_field {
                fermi.push(Integer::from(&value * &power) >> fine);
            }
            cosh.push(value);
            power *= &factor;
            power >>= fine;
        }
        Ok(Couplings { cosh, fermi, scale: i64::from(plan.coupling_scale) })
    }
}

/// The near sum, without `h^2`.
pub(super) fn near(nodes: &Nodes, couplings: &Couplings, plan: &Plan, effort: &Effort) -> Result<Real, RouteFailure> {
    let list = &nodes.weights;
    let count = list.values.len();
    let widest = list.values.iter().map(Integer::significant_bits).max().unwrap_or(0);
    let room = usize::BITS - count.leading_zeros();
    // Each A_m is below count * 2^(2 widest), so the slots never overlap.
    let slot = (2 * widest + room).div_ceil(64).max(1) as usize;
    let forward = pack(list.values.iter(), slot);
    let backward = pack(list.values.iter().rev(), slot);
    effort.check()?;
    let product = unpack(&(forward * backward), slot);
    effort.check()?;
    let mut total = Integer::new();
    for (m, coupling) in couplings.cosh.iter().enumerate() {
        // The coefficient count - 1 + m holds A_m; slots of zeros at the top are not stored.
        let Some(correlation) = product.get(count - 1 + m) else { break };
        let term = Integer::from(correlation * coupling);
        total += if m == 0 { term } else { term << 1u32 };
    }
    let (n, e, sum) = (Magnitude::from_u64(count as u64), list.error, list.total());
    let from_weights = n.mul(e).mul(sum).add(n.mul(n).mul(e).mul(e).shift(-1)).shift(-2 * list.scale);
    let from_couplings = sum.mul(sum).shift(1 - 2 * list.scale - couplings.scale);
    let value = Real::from_scaled(&total, -2 * list.scale - couplings.scale).round(plan.bits);
    Ok(value.widen(from_weights).widen(from_couplings))
}

/// The near-far sum, from `U_0`.
///
/// `U_n = U_0 - T_1 - ... - T_n` is off by at most the error of `U_0` plus `4 n` units.
pub(super) fn near_far(nodes: &Nodes, couplings: &Couplings, whole: &Real, plan: &Plan) -> Result<Real, RouteFailure> {
    let list = &nodes.ratios;
    let count = list.values.len() as u64;
    let (mut rest, error) = fixed(whole, couplings.scale)?;
    let largest = magnitude(&rest);
    let mut total = Integer::new();
    for (n, ratio) in list.values.iter().rev().enumerate() {
        if let (1.., Some(term)) = (n, couplings.fermi.get(n)) {
            rest -= term;
        }
        total += ratio * &rest;
    }
    let error = error.add(Magnitude::from_u64(4 * count));
    let through_rest = list.total().mul(error);
    let through_ratios = Magnitude::from_u64(count).mul(list.error).mul(largest.add(error));
    let scale = list.scale + couplings.scale + 1;
    let value = Real::from_scaled(&total, -scale).round(plan.bits);
    Ok(value.widen(through_rest.add(through_ratios).shift(-scale)))
}
