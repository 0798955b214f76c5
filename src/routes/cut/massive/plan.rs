//! Nodes, strip and precision of the massive sum, chosen in double precision.
//!
//! Nothing here decides containment: all bounds are evaluated afterwards for whatever was chosen.

use super::super::Problem;
use super::{Place, Sizes};
use crate::arithmetic::Real;
use crate::routes::RouteFailure;
use crate::routes::estimate::{bisect, dyadic, proper_distance};
use crate::routes::spectral::BOUND_BITS;
use crate::routes::spectral::far_field::FarWeights;
use crate::routes::spectral::near_field::Lattice;
use rug::Rational;
use std::f64::consts::{FRAC_PI_2, LN_2, PI};

/// More nodes than this are refused.
pub(in crate::routes::cut) const MAX_NODES: f64 = 60_000.0;

/// From this many nodes on, the double sum is done by one big-integer product.
const PRODUCT_FROM: usize = 64;

/// Nodes, strip and precision, chosen in double precision.
pub(super) struct Plan {
    /// Nodes and precision.
    pub lattice: Lattice,
    /// `None` stands for `pi/2`.
    pub strip: Option<Rational>,
    /// Terms of the two series of the far field, if it is used.
    pub far: Option<(usize, usize)>,
}

/// Where the far field begins, and its series.
struct FarChoice {
    near: f64,
    last: f64,
    series_terms: usize,
    cross_terms: usize,
}

impl Sizes {
    pub(super) fn plan(&self, problem: &Problem, place: &Place, goal: f64) -> Result<Plan, RouteFailure> {
        let (t, d) = (problem.time.to_f64(), problem.distance.to_f64());
        let distance = proper_distance(t, d);
        let (width, strip) = self.choose_step(distance, goal);
        // At the cone whole fractions of ln 2, for the far field.
        let step = if d == 0.0 {
            Rational::from((1, (LN_2 / width).ceil().clamp(1.0, 1e9) as u32))
        } else {
            dyadic(width / LN_2, 24)
        };
        let h = step.to_f64() * LN_2;
        let (left, right) = self.range(place, d == 0.0, goal, h);
        let far = if d == 0.0 { self.far_plan(problem, goal, h, right) } else { None };
        let (near, last) = far.as_ref().map_or((right, right), |far| (far.near, far.last));
        let first = (left / h).floor().max(1.0);
        let (near, last) = ((near / h).ceil() + 1.0, (last / h).ceil() + 1.0);
        let count = last.max(first) - first + 1.0;
        if count.is_nan() || count > MAX_NODES {
            let reason = format!("the spectral sum would need {count:.0} nodes, more than {MAX_NODES:.0}");
            return Err(RouteFailure::OutOfReach { reason });
        }
        let scale = (goal / LN_2 + 2.0 * count.log2() + 8.0).max(48.0);
        // Exponents of size up to E lose log2(E) bits, huge times a few more, the recurrence of the nodes their number.
        let bits = scale + distance.max(1.0).log2() + (1.0 + t).log2() + count.log2() + 20.0;
        let lattice = Lattice {
            step,
            first: first as usize,
            near: near.max(first) as usize,
            last: last.max(first) as usize,
            bits: bits as u32,
            scale: scale as u32,
            product_from: PRODUCT_FROM,
        };
        Ok(Plan {
            lattice,
            strip: strip.map(|b| dyadic(b, 30)),
            far: far.map(|far| (far.series_terms, far.cross_terms)),
        })
    }

    /// Where the cut-off bounds reach the goal on the left and on the right.
    fn range(&self, place: &Place, at_cone: bool, goal: f64, h: f64) -> (f64, f64) {
        let (fall, rise) = (place.left_root.to_f64(), place.right_root.to_f64());
        let exponent = |x: f64| (fall * (-x / 2.0).exp() - rise * (x / 2.0).exp()).powi(2);
        let centre = if at_cone { f64::INFINITY } else { (fall / rise).ln() };
        let left = if at_cone {
            (place.time.to_f64() / goal).ln().max(0.0)
        } else {
            bisect(0.0, centre, |x| exponent(x) < goal)
        };
        let enough = |x: f64| {
            let beyond = if x > centre { exponent(x) } else { 0.0 };
            let weight = self.tail_weight(&Real::from_float(rug::Float::with_val(53, x))).log2_estimate() * LN_2;
            weight + (x + 1.0).ln() - x - beyond < -goal
        };
        let low = left.max(if at_cone { 0.0 } else { centre.max(0.0) });
        let high = low + goal + (goal + low + 2.0).ln() + 4.0;
        let right = coarse_bisect(low, high, h, enough);
        let cut = if crate::spoil::is_active(crate::spoil::Fault::CutOffForgotten) { 0.2 * (right - low) } else { 0.0 };
        (left, right - cut)
    }

    /// Where the closed form can begin, if it saves nodes.
    fn far_plan(&self, problem: &Problem, goal: f64, h: f64, right: f64) -> Option<FarChoice> {
        let edge = self.tail.edge();
        let series = self.edge_series(&edge, problem, BOUND_BITS, false);
        let lowest = problem.time.to_f64().ln().max(1.0 - series.radius().ln());
        let good = |x: f64| {
            let z = Real::from_float(rug::Float::with_val(53, (-x).exp()));
            series.error(&z).log2_estimate() * LN_2 < -goal
        };
        if lowest >= right || !good(right) {
            return None;
        }
        let near = coarse_bisect(lowest, right, h, good);
        // More near nodes make the cross series short: balance their number against its terms.
        let last = near + 2.5 + 0.005 * goal;
        let (series_terms, _) = series.series_length(near + h, goal);
        let cross_terms = ((goal + 6.0) / (last - near + h)).ceil() + 2.0;
        let worthwhile = last + 1.0 < right && (series_terms as f64) < 40.0 + 4.0 * goal;
        worthwhile.then_some(FarChoice { near, last, series_terms, cross_terms: cross_terms as usize })
    }

    /// The largest step for which Theorem 3 reaches `exp(-goal)`, with the strip that allows it.
    fn choose_step(&self, distance: f64, goal: f64) -> (f64, Option<f64>) {
        let wide = self.constant(&Real::zero()).log2_estimate() * LN_2;
        let narrow = self.variation.log2_estimate() * LN_2;
        let step_for =
            |b: f64, constant: f64| 2.0 * PI * b / (goal + 6f64.ln() + constant + distance * (1.0 - b.cos())).max(1.0);
        let mut best = (step_for(FRAC_PI_2, wide), None);
        for index in 1..240 {
            let b = FRAC_PI_2 * 1.03f64.powi(-index);
            let step = step_for(b, (narrow - b.cos().ln()).min(wide));
            if step > best.0 {
                best = (step, Some(b));
            }
        }
        (best.0.min(2.0), best.1)
    }
}

/// As [`bisect`], but no finer than `width`.
pub(in crate::routes::cut) fn coarse_bisect(
    mut low: f64,
    mut high: f64,
    width: f64,
    holds: impl Fn(f64) -> bool,
) -> f64 {
    if holds(low) {
        return low;
    }
    while high - low > 0.5 * width {
        let middle = 0.5 * (low + high);
        if holds(middle) { high = middle } else { low = middle }
    }
    high
}
