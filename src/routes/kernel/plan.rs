//! Panels, numbers of terms and precisions of the kernel route, chosen in double precision.
//!
//! Sizes are kept as natural logarithms, so tails like `1e-100000` do not underflow. Nothing here
//! decides containment.

use super::edge::terms_for;
use crate::routes::estimate::{bisect, dyadic, log_probability, proper_distance};
use crate::routes::{RouteFailure, TailProblem};
use rug::Rational;
use std::f64::consts::{LN_2, LN_10, PI};

/// More panels than this are refused.
const MAX_PANELS: usize = 400;
/// More series coefficients than this are refused.
const MAX_TERMS: usize = 20_000_000;

/// An ordinary panel, `s = v - t` from `from` to `to`.
pub(super) struct PanelPlan {
    pub from: Rational,
    pub to: Rational,
    /// Taylor terms for `F`.
    pub terms: usize,
    /// Taylor terms for `F(. + 2a)`.
    pub shifted_terms: usize,
    /// Fixed-point units are `2^-scale`.
    pub scale: u32,
    /// Whether `q^2` is integrated here, or only the constant of integration is carried.
    pub squared: bool,
}

impl PanelPlan {
    pub(super) fn centre(&self) -> Rational {
        Rational::from(&self.from + &self.to) / 2
    }

    pub(super) fn half_width(&self) -> Rational {
        Rational::from(&self.to - &self.from) / 2
    }
}

/// The panel at the cone, where `F` has a logarithm.
pub(super) struct EdgePlan {
    pub from: Rational,
    pub to: Rational,
    pub terms: usize,
    pub shifted_terms: usize,
    /// Fixed-point units of the logarithmic series are `2^-scale`.
    pub scale: u32,
    /// The same for `F(. + 2a)`.
    pub shifted_scale: u32,
}

/// All choices for one evaluation.
pub(super) struct Plan {
    pub edge: Option<EdgePlan>,
    /// From the cone outward.
    pub panels: Vec<PanelPlan>,
    /// Largest precision used.
    pub bits: u32,
}

/// The numbers that all choices rest on.
pub(in crate::routes) struct Sizes {
    pub t: f64,
    pub a: f64,
    /// Logarithm of the tolerance for the integral of `q^2`.
    pub tolerance: f64,
}

impl Sizes {
    pub(in crate::routes) fn separation(&self, s: f64) -> f64 {
        s.sqrt() * (s + 2.0 * self.t).sqrt()
    }

    /// Logarithm of a bound of `F` at `v = t + s`.
    pub(in crate::routes) fn log_function(&self, s: f64) -> f64 {
        let r = self.separation(s);
        (1.3 / (r + 0.5) + (1.0 + 0.2 / r).ln()).ln() - r - (self.t + s).ln() + 0.3
    }

    /// Growth exponent of rounding errors over a panel, see `panel`.
    pub(in crate::routes) fn growth(&self, centre: f64, half: f64) -> f64 {
        let d = centre * (centre + 2.0 * self.t);
        let balance = d.sqrt().max(1.0);
        let at = |x: f64| {
            let denominator = d * (1.0 - x * half / centre) * (1.0 - x * half / (centre + 2.0 * self.t));
            let v = self.t + centre + half * x;
            half * v * ((2.0 + balance) / denominator).max(1.0 / balance)
        };
        (0..8).map(|i| at((f64::from(i) + 0.5) / 8.0) / 8.0).sum::<f64>() * 1.1
    }

    /// Terms after which the Taylor series about `centre` is below `exp(goal)`.
    pub(in crate::routes) fn terms(&self, centre: f64, half: f64, goal: f64) -> usize {
        let widest = centre / half;
        let cost = |ratio: f64| {
            let log = self.log_function(centre - ratio * half) - goal - (1.0 - 1.0 / ratio).ln() + 1.0;
            (log / ratio.ln()).max(1.0)
        };
        let best = best_ratio(widest, cost);
        cost(best).ceil().min(1e9) as usize + 1
    }
}

/// A ratio in `(1, widest)` that makes `cost` small: a golden-section search in `ln((ratio - 1)/(widest - ratio))`.
pub(in crate::routes) fn best_ratio(widest: f64, cost: impl Fn(f64) -> f64) -> f64 {
    const GOLDEN: f64 = 0.618_033_988_749_895;
    let place = |u: f64| (1.0 + widest * u.exp()) / (1.0 + u.exp());
    let (mut low, mut high) = (-9.0, 9.0);
    let (mut left, mut right) = (high - GOLDEN * (high - low), low + GOLDEN * (high - low));
    let (mut at_left, mut at_right) = (cost(place(left)), cost(place(right)));
    for _ in 0..9 {
        if at_left < at_right {
            (high, right, at_right) = (right, left, at_left);
            left = high - GOLDEN * (high - low);
            at_left = cost(place(left));
        } else {
            (low, left, at_left) = (left, right, at_right);
            right = low + GOLDEN * (high - low);
            at_right = cost(place(right));
        }
    }
    place(if at_left < at_right { left } else { right })
}

impl Plan {
    pub(super) fn new(problem: &TailProblem, digits: u32) -> Result<Plan, RouteFailure> {
        let (a, t, d) = (problem.half_width.to_f64(), problem.time.to_f64(), problem.distance.to_f64());
        let sane = |v: f64| v.is_finite() && (1e-290..1e290).contains(&v);
        if !sane(a) || !sane(t) || !(d == 0.0 || sane(d)) || (problem.distance != 0) != (d != 0.0) {
            return Err(refused("the ratios of the inputs are outside 1e-290 to 1e290"));
        }
        let size = log_probability(a, t, d).min(0.0) + (PI * PI * a).ln() - 2.0 * t.ln();
        let tolerance = size - f64::from(digits) * LN_10 - 5.0;
        let sizes = Sizes { t, a, tolerance };
        let goal = f64::from(digits) * LN_10;
        let sigma = edge_width(a, t, goal);
        let mut plan = Plan { edge: None, panels: Vec::new(), bits: 64 };
        let with_edge = d < 0.5 * sigma;
        let start = if with_edge { dyadic(sigma, 1) } else { problem.distance.clone() };
        plan.panels = panels(&sizes, &start, goal, proper_distance(t, d))?;
        if with_edge {
            plan.edge = Some(edge(&sizes, &problem.distance, start, plan.panels.len()));
        }
        let edge_scale = plan.edge.as_ref().map_or(64, |e| e.scale);
        plan.bits = plan.panels.iter().map(|p| p.scale).fold(edge_scale, u32::max);
        // Sums are taken as balls; relative accuracy is what counts there.
        plan.bits = plan.bits.max((goal / LN_2) as u32 + 40);
        if plan.terms() > MAX_TERMS {
            return Err(refused("the kernel route would need too many terms"));
        }
        Ok(plan)
    }

    pub(super) fn far_end(&self) -> Rational {
        self.panels.last().map(|panel| panel.to.clone()).unwrap_or_default()
    }

    pub(super) fn squared_end(&self) -> Rational {
        self.panels.iter().rev().find(|panel| panel.squared).map(|panel| panel.to.clone()).unwrap_or_default()
    }

    /// Number of series coefficients in all.
    pub(super) fn terms(&self) -> usize {
        let edge = self.edge.as_ref().map_or(0, |e| 2 * e.terms + e.shifted_terms);
        edge + self.panels.iter().map(|p| p.terms + p.shifted_terms).sum::<usize>()
    }
}

fn refused(reason: &str) -> RouteFailure {
    RouteFailure::OutOfReach { reason: reason.to_owned() }
}

/// Width of the logarithmic panel: well inside all radii of convergence, and `r` moderate.
fn edge_width(a: f64, t: f64, goal: f64) -> f64 {
    let reach = 1.0 + goal / 24.0;
    (0.5 * a.min(t)).min(reach * reach / (2.0 * t))
}

/// Doubling panels from `start` until the rest is negligible.
fn panels(sizes: &Sizes, start: &Rational, goal: f64, origin: f64) -> Result<Vec<PanelPlan>, RouteFailure> {
    let mut list: Vec<PanelPlan> = Vec::new();
    let mut from = start.clone();
    // The unknown start value of F is multiplied by 2 q and summed over everything.
    let first = start.to_f64();
    let constant_goal = sizes.tolerance - sizes.log_function(first) - (first.max(1.0) * 30.0).ln();
    loop {
        let s = from.to_f64();
        let r = sizes.separation(s);
        // Squared panels must be the first ones without a gap: the tail bound begins where they end.
        let squared = list.last().is_none_or(|before| before.squared && log_tail(sizes, s) > sizes.tolerance - 2.0);
        if !squared && sizes.log_function(s) < constant_goal {
            return Ok(list);
        }
        if list.len() >= MAX_PANELS {
            return Err(refused("the kernel route would need too many panels"));
        }
        let stride = (goal / 5.0).max(16.0) + (r - origin).max(0.0) * 0.25;
        let to = bisect(s, 2.0 * s, |x| sizes.separation(x) - r > stride);
        let to = if to >= 1.99 * s { Rational::from(&from * 2) } else { dyadic(to, 12).max(dyadic(s * 1.001, 40)) };
        if to <= from {
            return Err(refused("the panels of the kernel route do not advance"));
        }
        list.push(panel(sizes, from, to.clone(), squared, constant_goal));
        from = to;
    }
}

/// Lemma K3 as a logarithm.
fn log_tail(sizes: &Sizes, s: f64) -> f64 {
    let r = sizes.separation(s);
    (PI / (4.0 * r)).ln() - 2.0 * (sizes.t + s).ln() - 2.0 * r
}

fn panel(sizes: &Sizes, from: Rational, to: Rational, squared: bool, constant_goal: f64) -> PanelPlan {
    let (low, high) = (from.to_f64(), to.to_f64());
    let (centre, half) = (0.5 * (low + high), 0.5 * (high - low));
    let wanted = sizes.tolerance - sizes.log_function(low) - (half * 200.0).ln();
    let accuracy = if squared { wanted.min(constant_goal) } else { constant_goal } - 2.0;
    let terms = sizes.terms(centre, half, accuracy);
    let shifted = centre + 2.0 * sizes.a;
    let shifted_terms = sizes.terms(shifted, half, accuracy);
    let growth = sizes.growth(centre, half).max(sizes.growth(shifted, half));
    let scale = ((growth - accuracy) / LN_2 + (terms as f64).log2() + 6.0).max(32.0) as u32;
    PanelPlan { from, to, terms, shifted_terms, scale, squared }
}

fn edge(sizes: &Sizes, distance: &Rational, to: Rational, panels: usize) -> EdgePlan {
    let sigma = to.to_f64();
    // In units of 1/(2t): the tolerance for the scaled function.
    let weight = sigma / (4.0 * sizes.t * sizes.t);
    let accuracy = sizes.tolerance - (weight * 100.0 * (panels as f64 + 4.0)).ln() - 3.0;
    let growth = sizes.separation(sigma);
    let terms = terms_for(sizes.t, sigma, accuracy);
    let absolute = accuracy - (2.0 * sizes.t).ln();
    let shifted_terms = sizes.terms(2.0 * sizes.a, sigma, absolute - 2.0);
    let scale = ((-accuracy + 1.5 * growth) / LN_2 + 2.0 * (terms as f64).log2() + 12.0).max(48.0) as u32;
    let shifted_growth = sizes.growth(2.0 * sizes.a, sigma) / LN_2;
    let shifted_scale = scale + (shifted_growth + (2.0 * sizes.t).log2() + 4.0).max(0.0) as u32;
    EdgePlan { from: distance.clone(), to, terms, shifted_terms, scale, shifted_scale }
}
