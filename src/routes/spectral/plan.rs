//! Cut-offs, step and precision of the spectral route, chosen in double precision.
//!
//! Nothing here decides containment: a bad choice makes the interval wide, never wrong, because all
//! error bounds are evaluated afterwards for whatever was chosen.

use super::near_field::Lattice;
use crate::arithmetic::{Bits, Real};
use crate::functions::elementary::ln_2;
use crate::routes::estimate::{bisect, dyadic, log_probability, proper_distance};
use crate::routes::{RouteFailure, TailProblem};
use rug::Rational;
use std::f64::consts::{FRAC_PI_2, LN_2, LN_10, PI};

/// More nodes than this are refused.
const MAX_NODES: f64 = 60_000.0;
/// From this many near nodes on, the double sum is done by one big-integer product.
pub(super) const PRODUCT_FROM: usize = 220;

/// All choices for one evaluation.
pub(super) struct Plan {
    /// Step `h` as a multiple of `ln 2`: `1/p` with an integer `p` at the cone, else a dyadic rational.
    pub step: Rational,
    /// Half-width of the strip of analyticity used; `None` stands for `pi/2`.
    pub strip: Option<Rational>,
    /// First node used.
    pub first: usize,
    /// Last node whose weight is not replaced by the far-field series.
    pub near: usize,
    /// Last node that enters the near sum.
    pub last: usize,
    /// Whether the nodes beyond `near` follow in closed form.
    pub far_field: bool,
    /// Terms of the far-field power series, as the largest `i + j`.
    pub series_terms: usize,
    /// Terms of the expansion that couples near and far nodes.
    pub cross_terms: usize,
    /// Working precision.
    pub bits: u32,
    /// Precision of the fixed-point double sum.
    pub scale: u32,
}

/// A rational as a double; the exponent range suffices for all legal inputs.
pub(super) fn to_f64(value: &Rational) -> f64 {
    value.to_f64()
}

impl Plan {
    pub(super) fn new(problem: &TailProblem, digits: u32) -> Result<Plan, RouteFailure> {
        let (a, t, d) = (to_f64(&problem.half_width), to_f64(&problem.time), to_f64(&problem.distance));
        let sane = |v: f64| v.is_finite() && (1e-290..1e290).contains(&v);
        if !sane(a) || !sane(t) || !(d == 0.0 || sane(d)) || (problem.distance != 0) != (d != 0.0) {
            return Err(out_of_reach("the ratios of the inputs are outside 1e-290 to 1e290"));
        }
        // S exp(2E) = P exp(2E) pi^2 a / 4.
        let size = log_probability(a, t, d) + 2.0 * proper_distance(t, d) + (PI * PI * a / 4.0).ln();
        let goal = f64::from(digits) * LN_10 - size.min(0.0) + 2.5;
        let (width, strip) = choose_step(a, proper_distance(t, d), goal);
        let mut plan = if d == 0.0 { at_cone(a, t, goal, width) } else { beyond(t, d, goal, width)? };
        plan.strip = strip.map(|b| dyadic(b, 30));
        let count = (plan.last - plan.first + 1) as f64;
        if count > MAX_NODES {
            return Err(out_of_reach("the spectral sum would need too many nodes"));
        }
        plan.scale = (goal / LN_2 + 2.0 * count.log2() + 6.0).max(48.0) as u32;
        // Exponents of size up to E lose log2(E) bits; huge times and widths lose a few more.
        let spread = proper_distance(t, d).max(1.0).log2() + (1.0 + t).log2().max(0.0) + 2.0 * count.log2();
        plan.bits = (f64::from(plan.scale) + spread + 16.0) as u32;
        Ok(plan)
    }
}

impl Plan {
    /// What the near sum has to know.
    pub(super) fn lattice(&self) -> Lattice {
        Lattice {
            step: self.step.clone(),
            first: self.first,
            near: self.near,
            last: self.last,
            bits: self.bits,
            scale: self.scale,
        }
    }

    /// The step as a ball.
    pub(super) fn step_ball(&self, bits: Bits) -> Real {
        let ratio = Real::from_rational(&self.step, bits);
        ratio.mul(&ln_2(bits), bits)
    }

    /// The step in double precision.
    pub(super) fn step_estimate(&self) -> f64 {
        to_f64(&self.step) * LN_2
    }

    /// Number of steps in `ln 2`, for a region that begins at the cone.
    pub(super) fn octave_parts(&self) -> usize {
        self.step.denom().to_usize().unwrap_or(usize::MAX)
    }
}

fn out_of_reach(reason: &str) -> RouteFailure {
    RouteFailure::OutOfReach { reason: reason.to_owned() }
}

/// The largest step for which Theorem C reaches `exp(-goal)`, with the strip that allows it.
fn choose_step(a: f64, distance: f64, goal: f64) -> (f64, Option<f64>) {
    let wide = (a * 1f64.cosh()).max(1.0 / 1f64.tanh());
    let step_for = |b: f64, constant: f64| 2.0 * PI * b / (goal + (5.0 * constant).ln() + distance * (1.0 - b.cos()));
    let mut best = (step_for(FRAC_PI_2, wide), None);
    for index in 1..240 {
        let b = FRAC_PI_2 * 1.03f64.powi(-index);
        let step = step_for(b, (1.0 / b.cos()).min(wide));
        if step > best.0 {
            best = (step, Some(b));
        }
    }
    best
}

/// Nodes and series for a region that begins at the cone.
fn at_cone(a: f64, t: f64, goal: f64, width: f64) -> Plan {
    let parts = (LN_2 / width).ceil().clamp(1.0, 1e9);
    let (step, h) = (Rational::from((1, parts as u32)), LN_2 / parts);
    let first = ((t / goal).ln() / h).floor().max(1.0);
    // Beyond this rapidity the two vanishing exponentials are negligible and t e^-x is below one.
    let near = (goal / t.min(a)).ln().max(t.ln()).max(1.0);
    let near_nodes = (near / h).ceil();
    // Extra nodes make the cross series short: balance their number against its terms.
    let extra = 2.5 + 0.005 * goal;
    let last = ((near + extra) / h).ceil();
    let ratio = (last + 1.0 - near_nodes) * h;
    let cross_terms = ((goal + 6.0) / ratio).ceil() + 2.0;
    let (series_terms, _) = far_series_length(t, (near_nodes + 1.0) * h, goal);
    Plan {
        step,
        strip: None,
        first: first as usize,
        near: near_nodes as usize,
        last: last as usize,
        far_field: true,
        series_terms,
        cross_terms: cross_terms as usize,
        bits: 0,
        scale: 0,
    }
}

/// Length of the far-field series from rapidity `x`, and the ratio `lambda` that proves it.
pub(super) fn far_series_length(t: f64, x: f64, goal: f64) -> (usize, f64) {
    let z = (-x).exp();
    let mut best = (f64::INFINITY, 2.0);
    for index in 1..60 {
        let lambda = 1.5f64.powi(index);
        if lambda * z > 0.9 {
            break;
        }
        let growth = 2.0 * t * lambda * z + 2.0 * (2.0 / (1.0 - lambda * z)).ln() + 6.0;
        let terms = (goal + growth) / lambda.ln();
        if terms < best.0 {
            best = (terms, lambda);
        }
    }
    (best.0.min(1e6) as usize + 2, best.1)
}

/// Nodes for a region that begins beyond the cone.
fn beyond(t: f64, d: f64, goal: f64, width: f64) -> Result<Plan, RouteFailure> {
    let step = dyadic(width / LN_2, 24);
    let h = to_f64(&step) * LN_2;
    let (fall, rise) = ((t + d / 2.0).sqrt(), (d / 2.0).sqrt());
    let exponent = |x: f64| (fall * (-x / 2.0).exp() - rise * (x / 2.0).exp()).powi(2);
    let centre = (fall / rise).ln();
    let first = bisect(0.0, centre, |x| exponent(x) < goal);
    let reach = 4.0 + centre + 2.0 * ((goal + 1.0).sqrt() / fall.max(rise) + 2.0).ln() + goal;
    let last = bisect(centre, reach, |x| exponent(x) + x - (x + 1.0).ln() > goal);
    let nodes = (last - first) / h;
    if nodes > MAX_NODES {
        return Err(out_of_reach("the spectral sum would need too many nodes"));
    }
    let last = (last / h).ceil() as usize + 1;
    let first = (first / h).floor().max(1.0) as usize;
    Ok(Plan {
        step,
        strip: None,
        first,
        near: last.max(first),
        last: last.max(first),
        far_field: false,
        series_terms: 0,
        cross_terms: 0,
        bits: 0,
        scale: 0,
    })
}
