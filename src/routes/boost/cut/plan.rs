//! Steps, strips, cut-offs and precision, chosen in double precision: a bad choice costs width, never
//! containment.

use super::Setting;
use crate::arithmetic::Bits;
use crate::routes::RouteFailure;
use crate::routes::boost::out_of_reach;
use crate::routes::estimate::{bisect, dyadic};
use rug::Rational;
use std::f64::consts::{FRAC_PI_2, LN_2, LN_10, PI};

/// Most nodes of a rule.
const MOST_NODES: f64 = 60_000.0;

/// How the sums are formed.
pub(super) struct Plan {
    pub bits: Bits,
    pub step: Rational,
    /// Half-width `b` of the strip.
    pub strip: Rational,
    pub outer_first: i64,
    pub outer_last: i64,
    pub inner_first: i64,
    pub inner_last: i64,
}

impl Plan {
    pub(super) fn new(setting: &Setting, digits: u32) -> Result<Plan, RouteFailure> {
        let rough = Rough::new(setting);
        let (size, whole) = rough.pilot();
        let digits = f64::from(digits);
        let goal = size.ln() - (digits + 0.5) * LN_10 - 2.0;
        if !goal.is_finite() || !rough.e.is_finite() {
            return Err(out_of_reach("the probability is beyond the range of the route on the cut"));
        }
        let (strip, step) = rough.strip_and_step(goal);
        let (outer_first, outer_last) = rough.outer_ends(goal, step);
        let (inner_first, inner_last) = rough.inner_ends(goal, step);
        let nodes = (outer_last - outer_first).max(inner_last - inner_first);
        if nodes.is_nan() || nodes >= MOST_NODES {
            return Err(out_of_reach("the route on the cut would need more than 60000 nodes"));
        }
        let lost = (whole * whole / size).max(1.0).log2() + (1.0 + rough.e).log2() + 2.0 * (nodes + 2.0).log2();
        let bits = (digits * LN_10 / LN_2 + lost + 24.0).ceil();
        Ok(Plan {
            bits: bits as Bits,
            step: dyadic(step, 20),
            strip: dyadic(strip, 16),
            outer_first: outer_first as i64,
            outer_last: outer_last as i64,
            inner_first: inner_first as i64,
            inner_last: inner_last as i64,
        })
    }
}

/// The setting in doubles.
struct Rough {
    q: f64,
    c: f64,
    half_theta: f64,
    slope: f64,
    r1: f64,
    r2: f64,
    e: f64,
    a: f64,
}

impl Rough {
    fn new(setting: &Setting) -> Rough {
        Rough {
            q: setting.frame.q.to_f64(),
            c: setting.frame.c.to_f64(),
            half_theta: setting.frame.root.to_f64().ln(),
            slope: setting.frame.slope.to_f64(),
            r1: setting.distance_root.to_f64(),
            r2: setting.lead_root.to_f64(),
            e: setting.proper_distance.to_f64(),
            a: setting.half_width.to_f64(),
        }
    }

    fn outer_sigma(&self, w: f64) -> f64 {
        (self.q * w.cosh()).asinh()
    }

    fn inner_sigma(&self, z: f64) -> f64 {
        (self.q / self.c * z.tanh()).atanh()
    }

    /// `r1 e^(s/2) - r2 e^(-s/2)`
    fn gap(&self, sigma: f64) -> f64 {
        let half = (sigma - self.half_theta) / 2.0;
        self.r1 * half.exp() - self.r2 * (-half).exp()
    }

    fn mirrored_gap(&self, sigma: f64) -> f64 {
        let half = (sigma + self.half_theta) / 2.0;
        self.r2 * half.exp() - self.r1 * (-half).exp()
    }

    /// Far enough for the weight to be at its limit.
    fn far(&self) -> f64 {
        (2.0 / self.q).ln().max(0.0) + 1.0
    }

    /// The first outer point where the direct exponent has fallen to `cap`.
    fn outer_low(&self, cap: f64) -> f64 {
        let high = self.far() + 700.0;
        bisect(0.0, high.min(700.0), |w| self.gap(self.outer_sigma(w)) > -cap.sqrt())
    }

    /// A rough value of the integrals in units of `exp(-2E)`, and of `Sum |W|/sqrt K`.
    fn pilot(&self) -> (f64, f64) {
        let low = self.outer_low(40.0);
        let top = self.far() + 40.0 + 2.0 * (1.0 + self.a + self.r2).ln();
        let high = bisect(low, top.max(low + 1.0).min(690.0), |w| self.gap(self.outer_sigma(w)) > 40f64.sqrt());
        let outer_step = (high - low) / 160.0;
        let mut outer = Vec::new();
        for index in 0..160 {
            let w = low + (f64::from(index) + 0.5) * outer_step;
            let sigma = self.outer_sigma(w);
            let density = outer_step * (self.q * w.sinh()).powi(2) / sigma.cosh();
            outer.push(self.node(sigma, -self.half_theta, density, self.gap(sigma)));
            outer.push(self.node(sigma, self.half_theta, -density, self.mirrored_gap(sigma)));
        }
        let mut inner = Vec::new();
        for index in 0..80 {
            let z = -8.0 + (f64::from(index) + 0.5) * 0.2;
            let sigma = self.inner_sigma(z);
            let density = 0.2 * (self.q * self.c).powi(2) / (self.c * self.c + z.sinh().powi(2)).powf(1.5);
            inner.push(self.node(sigma, -self.half_theta, density, self.gap(sigma)));
        }
        let (first, first_whole) = double_sum(&outer);
        let (second, second_whole) = double_sum(&inner);
        (first.max(0.0) + second, first_whole + second_whole)
    }

    /// Position `cosh(sigma + shift)`, and the weight with `l = cosh(sigma - shift)` in `(1 - e^(-2al))/l`.
    fn node(&self, sigma: f64, shift: f64, density: f64, gap: f64) -> (f64, f64) {
        let other = (sigma - shift).cosh();
        ((sigma + shift).cosh(), density * (-gap * gap).exp() * -(-2.0 * self.a * other).exp_m1() / other)
    }

    fn strip_and_step(&self, goal: f64) -> (f64, f64) {
        let outer = (16.0 * PI * PI * self.slope.powi(3) / self.q).ln();
        let inner = (8.0 * PI * PI).ln() + 4.0 * (self.q * self.c).ln();
        let mut best = (0.0, 0.0);
        for part in 1..128 {
            let strip = FRAC_PI_2 * f64::from(part) / 128.0;
            let excess = outer.max(inner) + self.e * (1.0 - strip.cos()) - 5.5 * strip.cos().ln() - goal;
            let step = 2.0 * PI * strip / excess.max(1.0);
            if step > best.1 {
                best = (strip, step);
            }
        }
        (best.0, best.1.min(0.5))
    }

    fn outer_ends(&self, goal: f64, step: f64) -> (f64, f64) {
        let constant = (8.0 * self.slope.powi(3) / self.q).ln();
        let enough = |w: f64| {
            let sigma = self.outer_sigma(w);
            let gap = self.gap(sigma);
            let fall = if gap > 0.0 { (gap * gap).min(self.mirrored_gap(sigma).powi(2)) } else { 0.0 };
            constant + (2.0 * (w + 1.0)).ln() - w - fall < goal
        };
        let last = (bisect(0.0, 690.0, enough) / step).ceil().max(1.0);
        let cap = constant + 1.0 - goal;
        let mirrored = self.mirrored_gap(self.outer_sigma(0.0));
        let first = if mirrored * mirrored > cap { (self.outer_low(cap.max(1.0)) / step).floor() } else { 1.0 };
        (first.clamp(1.0, last), last)
    }

    fn inner_ends(&self, goal: f64, step: f64) -> (f64, f64) {
        let log_constant = 6f64.ln() + 4.0 * (self.q * self.c).ln() - goal;
        let last = (log_constant / 3.0 / step).ceil().max(0.0);
        let falls_at = |z: f64| self.gap(self.inner_sigma(z)) > -log_constant.max(0.0).sqrt();
        let first = (bisect(-last * step, last * step, falls_at) / step).floor();
        (first.min(last), last)
    }
}

fn double_sum(nodes: &[(f64, f64)]) -> (f64, f64) {
    let mut sum = 0.0;
    let mut whole = 0.0;
    for (index, (position, weight)) in nodes.iter().enumerate() {
        let before: f64 = nodes[..index].iter().map(|(other, value)| 2.0 * value / (position + other)).sum();
        sum += weight * (before + weight / (2.0 * position));
        whole += weight.abs() / position.sqrt();
    }
    (sum, whole)
}
