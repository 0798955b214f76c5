//! Shift, strip, step, cut-offs and precision of the contour route, chosen in double precision.
//!
//! Nothing here decides containment: the bounds are evaluated afterwards for whatever was chosen.

use super::envelope::Rough;
use crate::routes::RouteFailure;
use crate::routes::estimate::{bisect, dyadic};
use crate::routes::gaussian::{Estimates, out_of_reach};
use rug::Rational;
use std::f64::consts::{FRAC_PI_4, LN_2, PI};

/// All choices for one tail.
pub(super) struct Plan {
    /// Height `c` of the contour.
    pub shift: Rational,
    /// Upper line of the strip.
    pub above: Rational,
    /// Lower line of the strip.
    pub below: Rational,
    /// Where the envelopes on the three lines touch.
    pub touch: Rational,
    /// On the upper line.
    pub touch_above: Rational,
    /// On the lower line.
    pub touch_below: Rational,
    /// Step `h`.
    pub step: Rational,
    /// First node.
    pub first: i64,
    /// Last node.
    pub last: i64,
    /// Bits after the binary point in the double sum.
    pub scale: u32,
    /// `|f| < 2^exponent` is expected on the nodes.
    pub exponent: i64,
    count: f64,
    bits: f64,
}

/// A contour height with the lines, the largest step and the cut-offs that it allows.
struct Choice {
    shift: f64,
    above: f64,
    below: f64,
    step: f64,
    low: f64,
    high: f64,
}

impl Choice {
    fn nodes(&self) -> f64 {
        (self.high.asinh() - self.low.asinh()) / self.step + 3.0
    }
}

impl Plan {
    pub(super) fn new(packet: &Estimates, from: f64, goal: f64) -> Result<Plan, RouteFailure> {
        // P = s sqrt(2/pi)/(2 pi) I.
        let prefactor = (packet.sigma * (2.0 / PI).sqrt() / (2.0 * PI)).ln();
        let best = choose(packet, from, goal + prefactor + 1.0)
            .ok_or_else(|| out_of_reach("no height of the contour gives a rule within double-precision planning"))?;
        let count = best.nodes();
        let step = dyadic(best.step, 24);
        let h = step.to_f64();
        let line = Rough::new(packet, from, best.shift);
        let (first, last) = ((best.low.asinh() / h).floor() - 1.0, (best.high.asinh() / h).ceil() + 1.0);
        let (first, last) = (first.clamp(-1e15, 1e15), last.clamp(-1e15, 1e15));
        let early = crate::spoil::is_active(crate::spoil::Fault::ContourCutForgotten);
        let last = if early { (last - (last - first) / 10.0).floor() } else { last };
        let size = log_size(&line, best.low, best.high);
        let pairs = 2.0 * (last - first + 1.0).ln() + (3.0 + 1.0 / best.shift).ln() + 2.0 * h.ln();
        let scale = ((goal + prefactor + 2.0 * size + pairs + 5.0) / LN_2 + 4.0).max(40.0);
        let exponents = 2.0 + goal + phases(packet, from, &best);
        let touch = |theta: f64| dyadic(Rough::new(packet, from, theta).top, 40);
        Ok(Plan {
            shift: dyadic(best.shift, 40),
            above: dyadic(best.above, 40),
            below: dyadic(best.below, 40),
            touch: touch(best.shift),
            touch_above: touch(best.above),
            touch_below: touch(best.below),
            step,
            first: first as i64,
            last: last as i64,
            scale: scale.min(4e9) as u32,
            exponent: (size / LN_2).ceil() as i64 + 1,
            count: count.max(last - first + 1.0),
            bits: scale + exponents.log2() + (2.0 + count).log2() + 16.0,
        })
    }

    pub(super) fn count(&self) -> usize {
        (self.last - self.first + 1).max(1) as usize
    }

    pub(super) fn count_estimate(&self) -> f64 {
        self.count
    }

    pub(super) fn bits_estimate(&self) -> f64 {
        self.bits
    }
}

/// The largest exponent and phase on the nodes, roughly.
fn phases(packet: &Estimates, from: f64, best: &Choice) -> f64 {
    let u = best.low.abs().max(best.high.abs()) + 1.0;
    let offset = u + packet.momentum.abs();
    packet.sigma * packet.sigma * offset * offset + (packet.time.abs() + from) * u
}

/// The logarithm of the largest `|f|` between the cut-offs.
fn log_size(line: &Rough, low: f64, high: f64) -> f64 {
    const POINTS: usize = 200;
    let (left, right) = (low.asinh(), high.asinh());
    (0..=POINTS)
        .map(|i| left + (right - left) * i as f64 / POINTS as f64)
        .chain([line.top.asinh()])
        .map(|eta| line.value(eta.sinh()) + eta.cosh().ln())
        .fold(f64::NEG_INFINITY, f64::max)
}

/// The heights tried: dense near both ends of `(0, pi/4)`.
fn heights() -> Vec<f64> {
    let small = (0..70).map(|i| FRAC_PI_4 * 0.86f64.powi(70 - i));
    let large = [0.9, 0.93, 0.96, 0.98, 0.99, 0.997].map(|part| FRAC_PI_4 * part);
    small.chain(large).collect()
}

/// The choice with the fewest nodes for an error of `exp(-goal)` in `I`.
fn choose(packet: &Estimates, from: f64, goal: f64) -> Option<Choice> {
    let heights = heights();
    let lines: Vec<Rough> = heights.iter().map(|theta| Rough::new(packet, from, *theta)).collect();
    let size: Vec<f64> = lines.iter().map(|line| line.log_peak() + line.spread().ln()).collect();
    let ground = Rough::new(packet, from, 0.0).spread().ln();
    let reversed = Estimates { time: -packet.time, ..packet.mirrored() };
    let mut best: Option<Choice> = None;
    for (index, shift) in heights.iter().enumerate() {
        let line = &lines[index];
        let weight = line.log_peak() - shift.sin().ln() + (4.0 * (line.spread() + 1.0)).ln();
        let rate = |other: usize| {
            let needed: f64 = goal + weight + size[other];
            (needed.max(4.0) / (heights[other] - shift).abs(), heights[other])
        };
        let smaller = |x: (f64, f64), y: (f64, f64)| if y.0 < x.0 { y } else { x };
        let above = (index + 1..heights.len()).map(rate).fold((f64::INFINITY, 0.0), smaller);
        let floor = ((goal + weight + ground).max(4.0) / shift, 0.0);
        let below = (0..index).map(rate).fold(floor, smaller);
        let step = (2.0 * PI / above.0.max(below.0)).min(0.5);
        if !(step > 0.0 && step.is_finite()) {
            continue;
        }
        let high = cut(line, goal + weight);
        let low = -cut(&Rough::new(&reversed, from, *shift), goal + weight);
        let choice = Choice { shift: *shift, above: above.1, below: below.1, step, low, high };
        let better = best.as_ref().is_none_or(|b| choice.nodes() < b.nodes());
        if better && choice.nodes().is_finite() {
            best = Some(choice);
        }
    }
    best
}

/// The point right of the top from which on everything is negligible.
fn cut(line: &Rough, goal: f64) -> f64 {
    let start = line.top;
    let mut width = 0.1 * (1.0 + start.abs());
    while !line.is_negligible_beyond(start + width, goal) && width < 1e200 {
        width *= 2.0;
    }
    bisect(start, start + width, |u| line.is_negligible_beyond(u, goal))
}
