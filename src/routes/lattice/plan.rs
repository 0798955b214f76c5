//! Window, step, cut-off and precision of the lattice route, chosen in double precision.
//!
//! Nothing here decides containment: the bounds are evaluated afterwards for whatever was chosen.

use crate::routes::estimate::dyadic;
use crate::routes::gaussian::{Estimates, Region};
use rug::Rational;
use std::f64::consts::{LN_2, PI};

/// All choices for one pass.
pub(super) struct Plan {
    /// Left end of the window.
    pub left: Rational,
    /// Right end of the window.
    pub right: Rational,
    /// Step `h` of the lattice.
    pub step: Rational,
    /// Last index `J`.
    pub last: usize,
    /// Decay rate `q` for aliasing.
    pub rate: Rational,
    /// Decay rate for the norm on the window.
    pub window_rate: Rational,
    /// Decay rate for the remainder beyond the window.
    pub end_rate: Rational,
    /// Bits after the binary point of the samples.
    pub scale: u32,
    /// Further bits for the phases.
    spread: f64,
    /// `J` as a double, which may be far beyond any sense.
    last_estimate: f64,
}

/// The `q` in `[0, 1]` that makes `q^2 s^2 - q y` least.
fn best_rate(sigma: f64, y: f64) -> f64 {
    (y / (2.0 * sigma * sigma)).clamp(0.0, 1.0)
}

impl Plan {
    pub(super) fn new(packet: &Estimates, region: &Region, goal: f64) -> Plan {
        let (s, t) = (packet.sigma, packet.time.abs());
        // With this decay rate, copies at the distance `copies` make less than exp(-goal) in lemma 3.
        let rate = ((0.5 * goal + 2.0).sqrt() / s).min(1.0);
        let copies = 2.0 * t + (goal + 4.0) / rate + 2.0 * rate * s * s;
        // Half of that is where a remainder of the probability is as small.
        let end = dyadic(0.5 * copies, 24);
        let (left, right) = match region {
            Region::Outside(r) | Region::Within(r) => (Rational::from(-r), r.clone()),
            Region::Between(low, high) => (low.clone(), high.clone()),
            Region::RightOf(x) => (x.clone(), end.max(x.clone() + 1)),
            Region::LeftOf(x) => ((-end).min(x.clone() - 1), x.clone()),
        };
        let nearest = left.to_f64().max(-right.to_f64());
        let window_rate = best_rate(s, nearest - t);
        let norm = (window_rate * window_rate * s * s - window_rate * (nearest - t)).min(0.0);
        let (far, width) = (right.to_f64().max(-left.to_f64()), right.to_f64() - left.to_f64());
        let amplitude = (goal + norm + 3.0).max(2.0);
        let period = copies.max(far + 0.5 * copies).max(1.001 * width);
        let step = dyadic(2.0 * PI / (period * 1.000_01), 24);
        let h = step.to_f64();
        let edge = amplitude.sqrt() / s;
        let last_estimate = (edge / h).ceil() + 1.0;
        let end_distance = if matches!(region, Region::RightOf(_)) { right.to_f64() } else { -left.to_f64() };
        let count = 2.0 * last_estimate + 1.0;
        let prefactor = (h * s * count * (1.0 + (2.0 * count).ln())).ln();
        Plan {
            left,
            right,
            step,
            last: last_estimate.min(1e15) as usize,
            rate: dyadic(rate, 24),
            window_rate: dyadic(window_rate, 24),
            end_rate: dyadic(best_rate(s, end_distance - t), 24),
            scale: ((goal + prefactor + 4.0) / LN_2 + 4.0).clamp(40.0, 4e9) as u32,
            spread: (2.0 + (packet.momentum.abs() + edge + 1.0) * t).log2(),
            last_estimate,
        }
    }

    pub(super) fn count_estimate(&self) -> f64 {
        2.0 * self.last_estimate + 1.0
    }

    /// Working precision.
    pub(super) fn bits_estimate(&self) -> f64 {
        f64::from(self.scale) + self.spread + 16.0
    }
}
