//! The sum for mass zero: trapezoid rule in the logarithm of `kappa`.
//!
//! # Formula
//!
//! The cut begins at `kappa = 0`. Let `V` be a power of two not below the variation, `L >= sqrt(2a)`, and take `V/L` as the unit of
//! `kappa`: `kappa = (V/L) u`, `T = t V/L`, `D = d V/L`. With `u = e^x`, `P = 1/pi^2 Sum_j V L S_j`,
//!
//! ```text
//! S = Int Int w(x) w(y)/(e^x + e^y) dx dy over the plane,     w(x) = 1/2 (1 - exp(-2 T u)) exp(-D u) (kappa F(kappa)/V).
//! ```
//!
//! # Bounds
//!
//! For `|Im x| <= b <= pi/2`, `Re u >= cos b |u| >= 0`: `|1 - exp(-2Tu)|/2 <= min(1, T |u|)` and `|kappa F/V| <= min(1, |u|)` (from `|F| <= L` and
//! `|kappa F| <= V`). So `|w(s + ib')| <= min(1, e^s) min(1, T e^s) exp(-D cos b e^s)`: this is Lemma A of the massless box with time `T`
//! and distance `D`, whose Lemmas B to D, Theorem E and left cut-off bound rest on nothing else (they are about absolute
//! values) and are used as they are ([`Bounds`]).
//!
//! **Right end.** Beyond the last node, at `u_K = e^X >= 1`, let `|w| <= U exp(-D u_K)`, `U = min(1/2, tail/(2V))` by the packet's
//! tail bound. For `k > K`, `h Sum_l |w_l|/(u_k + u_l) <= (1 + h)/u_k + (x_k + h)/u_k + (1 + h)/u_k`: nodes with `u_l <= 1`, where `|w_l| <= u_l`
//! and `h Sum u_l <= h/(1 - e^-h) <= 1 + h`; with `1 < u_l <= u_k`; and above, where `h Sum 1/u_l <= (1 + h)/u_k`. As `(x + 2 + 3h) e^-x` falls, pairs
//! with a node beyond add at most `2 U exp(-D u_K) Int_X^inf (x + 2 + 3h) e^-x dx = 2 U exp(-D u_K) (X + 3 + 3h) e^-X`.
//!
//! # Sum
//!
//! With `v_k = w_k u_k^(-1/2)`, `|v_k| <= 1`, the double sum is `Sum_{k,l} C_(k-l) v_k v_l`, `C_m = 1/(2 cosh(m h/2))`: the autocorrelation of
//! `v`, one product of big integers. With the `n` integers for `v` off by at most `e` units `2^-s` and those for `C <= 1/2` by at most
//! two, the `n^2` products are each off by at most `(e (2 + e 2^-s)/2 + 2 (1 + e 2^-s)^2) 2^-s`.

use super::amplitude::{CutAmplitude, PreparedAmplitude};
use super::massive::{MAX_NODES, coarse_bisect, no_enclosure};
use super::{Problem, SideSum, exponent_above, shown, size_bound};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::{cos, exp};
use crate::routes::estimate::dyadic;
use crate::routes::spectral::massless::bounds::Bounds;
use crate::routes::spectral::massless::plan::Plan as BoxPlan;
use crate::routes::spectral::massless::sums::Couplings;
use crate::routes::spectral::near_field::{pack_signed, unpack_signed};
use crate::routes::spectral::{BOUND_BITS, one_minus_exp};
use crate::routes::{Effort, RouteFailure, TailProblem};
use rug::{Integer, Rational};
use std::f64::consts::{FRAC_PI_2, LN_2, PI};

/// The packet in the units of the sum.
struct Setting {
    /// `V = 2^exponent`
    exponent: i64,
    /// `V/L`
    unit: Rational,
    /// The box problem with `T` and `D`.
    equivalent: TailProblem,
    tail: Box<dyn PreparedAmplitude>,
}

pub(super) fn sum(
    amplitude: &dyn CutAmplitude,
    problem: &Problem,
    goal: f64,
    effort: &Effort,
) -> Result<SideSum, RouteFailure> {
    let setting = Setting::new(amplitude, problem)?;
    let plan = setting.plan(goal)?;
    effort.allow_bits(plan.bits)?;
    let bounds = Bounds::new(&setting.equivalent, &plan);
    let errors = [
        ("discretisation bound", bounds.discretisation(&plan)),
        ("left cut-off bound", bounds.left_cut(&plan)),
        ("right cut-off bound", setting.right_cut(&plan)),
    ];
    let couplings = Couplings::new(&plan.step, plan.count(), plan.coupling_scale, false, effort)?;
    let square = Real::from_rational(&plan.step, plan.bits).square(plan.bits);
    let mut total = Real::zero();
    for (list, error) in setting.nodes(amplitude, &plan, effort)? {
        let found = autocorrelation(&list, error, &couplings, &plan, effort)?.mul(&square, plan.bits);
        let widened = errors.iter().fold(found, |sum, (_, error)| sum.widen(*error));
        total = total.add(&widened, plan.bits);
    }
    // V L = V^2/(V/L)
    let factor = Real::from_rational(&Rational::from(setting.unit.recip_ref()), plan.bits).shift(2 * setting.exponent);
    let mut witness = vec![
        ("step h", plan.step.to_string()),
        ("strip half-width b", plan.strip.as_ref().map_or("pi/2".to_owned(), ToString::to_string)),
        ("first node", plan.first.to_string()),
        ("last node", plan.last.to_string()),
        ("unit of kappa", setting.unit.to_string()),
    ];
    witness.extend(errors.iter().map(|(name, bound)| (*name, shown(*bound))));
    Ok(SideSum {
        unit: super::ln_estimate(&factor) - 2.0 * PI.ln(),
        value: total.mul(&factor, plan.bits),
        bits: plan.bits,
        nodes: plan.count(),
        witness,
    })
}

impl Setting {
    fn new(amplitude: &dyn CutAmplitude, problem: &Problem) -> Result<Setting, RouteFailure> {
        let tail = amplitude.prepare(BOUND_BITS)?;
        let exponent = exponent_above(tail.variation());
        let size = size_bound(problem).to_float().to_rational().filter(|size| *size > 0).ok_or_else(no_enclosure)?;
        if tail.variation().is_infinite() || exponent.unsigned_abs() > 1 << 20 {
            return Err(no_enclosure());
        }
        let power = Rational::from(1) << exponent as i32;
        let unit = power / size;
        let equivalent = TailProblem {
            half_width: Rational::from(1),
            time: Rational::from(&problem.time * &unit),
            distance: Rational::from(&problem.distance * &unit),
            massless: true,
        };
        Ok(Setting { exponent, unit, equivalent, tail })
    }

    /// `min(1/2, tail/(2V))` from `u = e^x` on.
    fn tail_weight(&self, x: &Real) -> Magnitude {
        let kappa = exp(x, BOUND_BITS).mul(&Real::from_rational(&self.unit, BOUND_BITS), BOUND_BITS);
        self.tail.tail(&kappa).shift(-self.exponent - 1).min(Magnitude::power_of_two(-1))
    }

    fn right_cut(&self, plan: &BoxPlan) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::CutOffForgotten) {
            return Magnitude::ZERO;
        }
        let bits = BOUND_BITS;
        if plan.last < 0 {
            return Magnitude::INFINITY;
        }
        let step = Real::from_rational(&plan.step, bits);
        let x = step.mul_i64(plan.last, bits);
        let distance = Real::from_rational(&self.equivalent.distance, bits);
        let exponent = distance.mul(&exp(&x, bits), bits).add(&x, bits);
        let factor = x.add(&Real::from_i64(3), bits).add(&step.mul_i64(3, bits), bits);
        factor.mul(&exp(&exponent.neg(), bits), bits).abs_upper().shift(1).mul(self.tail_weight(&x))
    }

    fn plan(&self, goal: f64) -> Result<BoxPlan, RouteFailure> {
        let ln = |value: Magnitude| value.log2_estimate() * LN_2;
        let (time, distance) = (self.equivalent.time.to_f64(), self.equivalent.distance.to_f64());
        let probe = BoxPlan {
            step: Rational::from(1),
            strip: None,
            first: 0,
            last: 0,
            far_field: false,
            bits: 0,
            weight_scale: 0,
            ratio_scale: 0,
            coupling_scale: 0,
        };
        let bounds = Bounds::new(&self.equivalent, &probe);
        let ends = ln(bounds.majorant(&Real::from_i64(1)));
        let step_for = |b: f64| {
            let cosine = cos(&Real::from_float(rug::Float::with_val(53, b)), BOUND_BITS);
            let size = ln(bounds.majorant(&cosine)) + ends + 4f64.ln();
            2.0 * PI * b / (size + goal).max(1.0)
        };
        let mut best = (step_for(FRAC_PI_2), None);
        if distance > 0.0 {
            for index in 1..40 {
                let b = (-0.3 * f64::from(index)).exp().acos();
                let step = step_for(b);
                if step > best.0 {
                    best = (step, Some(b));
                }
            }
        }
        let step = dyadic(best.0.min(1.0), 24);
        let h = step.to_f64();
        // Q T u^2 (1 + 2h) below the goal on the left.
        let left = -0.5 * (goal + ln(bounds.weighted_majorant()) + time.ln() + (1.0 + 2.0 * h).ln());
        let enough = |x: f64| {
            let weight = ln(self.tail_weight(&Real::from_float(rug::Float::with_val(53, x))));
            weight + (2.0 * (x + 3.0 + 3.0 * h)).ln() - x - distance * x.exp() < -goal
        };
        let right = coarse_bisect(0.0, goal + (goal + 6.0).ln() + 3.0, h, enough);
        let (first, last) = ((left / h).floor(), (right / h).ceil() + 1.0);
        let count = last - first + 1.0;
        if count > MAX_NODES {
            let reason = format!("the massless spectral sum would need {count:.0} nodes, more than {MAX_NODES:.0}");
            return Err(RouteFailure::OutOfReach { reason });
        }
        let scale = goal / LN_2 + 2.0 * count.log2() + 10.0;
        let bits = scale + 2.0 * count.log2() + (2.0 + goal).log2() + 16.0;
        Ok(BoxPlan {
            step,
            strip: best.1.map(|b| dyadic(b, 40)),
            first: first as i64,
            last: last as i64,
            bits: bits as u32,
            weight_scale: scale as i64,
            coupling_scale: scale as u32,
            ..probe
        })
    }

    /// The integers for `v_k` of each part, and the bound of their errors in units.
    fn nodes(
        &self,
        amplitude: &dyn CutAmplitude,
        plan: &BoxPlan,
        effort: &Effort,
    ) -> Result<Vec<(Vec<Integer>, Magnitude)>, RouteFailure> {
        let count = if amplitude.is_real() { 1 } else { 2 };
        let mut lists = vec![(Vec::with_capacity(plan.count()), Magnitude::ZERO); count];
        let mut bits = plan.bits;
        let mut prepared = amplitude.prepare(bits)?;
        for k in plan.first..=plan.last {
            effort.check()?;
            loop {
                let value = self.weight(prepared.as_ref(), plan, k, bits);
                let radius = value.re.radius().max(value.im.radius()).shift(plan.weight_scale).log2_estimate();
                if radius > 3.0 && bits < 64 * plan.bits + 4096 {
                    let missing = if radius.is_finite() { radius.min(1e6) as u32 } else { bits };
                    bits = (bits + missing + 32).max(bits + bits / 4);
                    effort.allow_bits(bits)?;
                    prepared = amplitude.prepare(bits)?;
                    continue;
                }
                for ((list, error), part) in lists.iter_mut().zip([&value.re, &value.im]) {
                    let (integer, units) = part.to_fixed(plan.weight_scale).ok_or_else(no_enclosure)?;
                    *error = error.max(units);
                    list.push(integer);
                }
                break;
            }
        }
        Ok(lists)
    }

    /// `v_k`
    fn weight(&self, amplitude: &dyn PreparedAmplitude, plan: &BoxPlan, index: i64, bits: Bits) -> Complex {
        let x = Real::from_rational(&plan.step, bits + 32).mul_i64(index, bits + 32);
        let half = exp(&x.shift(-1), bits);
        let u = half.square(bits);
        let kappa = u.mul(&Real::from_rational(&self.unit, bits), bits);
        let time = Real::from_rational(&self.equivalent.time, bits);
        let mut base =
            one_minus_exp(&time.mul(&u, bits).shift(1), bits, bits).div(&half, bits).shift(-1 - self.exponent);
        if self.equivalent.distance != 0 {
            let distance = Real::from_rational(&self.equivalent.distance, bits);
            base = base.mul(&exp(&distance.mul(&u, bits).neg(), bits), bits);
        }
        amplitude.value(&kappa).mul_real(&base.mul(&kappa, bits), bits)
    }
}

/// `Sum_{k,l} C_(k-l) v_k v_l`.
fn autocorrelation(
    list: &[Integer],
    error: Magnitude,
    couplings: &Couplings,
    plan: &BoxPlan,
    effort: &Effort,
) -> Result<Real, RouteFailure> {
    let count = list.len();
    let widest = list.iter().map(Integer::significant_bits).max().unwrap_or(0);
    let room = usize::BITS - count.leading_zeros();
    // Each coefficient is below count * 2^(2 widest) in size; one bit more for the sign.
    let slot = (2 * widest + room + 2).div_ceil(64).max(1) as usize;
    let product = pack_signed(list.iter(), slot) * pack_signed(list.iter().rev(), slot);
    effort.check()?;
    let coefficients = unpack_signed(&product, slot);
    let mut total = Integer::new();
    for (m, coupling) in couplings.cosh.iter().enumerate() {
        let Some(correlation) = coefficients.get(count - 1 + m) else { break };
        let term = Integer::from(correlation * coupling);
        total += if m == 0 { term } else { term << 1u32 };
    }
    let unit = Magnitude::power_of_two(-plan.weight_scale);
    let two = Magnitude::from_u64(2);
    let through_weights = error.mul(two.add(error.mul(unit))).shift(-1);
    let larger = Magnitude::ONE.add(error.mul(unit));
    let each = through_weights.add(two.mul(larger).mul(larger)).mul(unit);
    let pairs = Magnitude::from_u64(count as u64);
    let scale = 2 * plan.weight_scale + i64::from(plan.coupling_scale);
    Ok(Real::from_scaled(&total, -scale).round(plan.bits).widen(pairs.mul(pairs).mul(each)))
}
