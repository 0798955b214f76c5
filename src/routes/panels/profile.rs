//! The packet in double precision, for choosing panels and precisions. Nothing here decides containment.

use super::shape::Shape;
use crate::packets::piecewise::Carrier;
use crate::routes::estimate::{bisect, proper_distance};
use rug::{Float, Rational};
use std::f64::consts::{PI, TAU};

/// Sizes outside this range are refused.
const SANE: std::ops::RangeInclusive<f64> = 1e-60..=1e60;

/// A knot with its jumps, normalised to a packet of norm one.
struct Knot {
    depth: f64,
    jumps: Vec<(f64, f64)>,
    /// Absolute value of `c_j`, plus that of `kappa c_(j-1)`.
    sizes: Vec<f64>,
}

/// Sizes that all choices rest on.
pub(super) struct Profile {
    pub t: f64,
    pub d: f64,
    /// Length of the support.
    pub width: f64,
    /// Wave number of the carrier.
    pub kappa: f64,
    pub standing: bool,
    knots: Vec<Knot>,
}

impl Profile {
    /// `None` if a size is out of range.
    pub(super) fn new(shape: &Shape, time: &Rational, distance: &Rational) -> Option<Profile> {
        let width = 2.0 * shape.half_width.to_f64();
        let (kappa, standing) = match &shape.carrier {
            Carrier::Still => (0.0, false),
            Carrier::Travelling(momentum) => (momentum.to_f64(), false),
            Carrier::Standing(mode) => (f64::from(*mode) * PI / width, true),
        };
        let root = Float::with_val(53, &shape.norm).sqrt();
        let normalised = |value: &Rational| (Float::with_val(53, value) / &root).to_f64();
        let knots: Vec<Knot> = shape
            .knots
            .iter()
            .map(|knot| {
                let jumps: Vec<(f64, f64)> =
                    knot.jumps.iter().map(|c| (normalised(&c.re), normalised(&c.im))).collect();
                let mut sizes = vec![0.0; jumps.len() + usize::from(kappa != 0.0)];
                for (j, c) in jumps.iter().enumerate() {
                    let size = c.0.hypot(c.1);
                    sizes[j] += size;
                    if kappa != 0.0 {
                        sizes[j + 1] += kappa.abs() * size;
                    }
                }
                Knot { depth: knot.depth.to_f64(), jumps, sizes }
            })
            .collect();
        let (t, d) = (time.to_f64(), distance.to_f64());
        let sane = |v: f64| SANE.contains(&v);
        let fits = sane(t)
            && sane(width)
            && (*distance == 0 || sane(d))
            && (kappa == 0.0 || sane(kappa.abs()))
            && knots.iter().skip(1).all(|knot| sane(knot.depth))
            && knots.iter().all(|knot| knot.sizes.iter().all(|size| size.is_finite()));
        fits.then_some(Profile { t, d, width, kappa: kappa.abs(), standing, knots })
    }

    /// Depth of the second knot.
    pub(super) fn gap(&self) -> f64 {
        self.knots.get(1).map_or(self.width, |knot| knot.depth)
    }

    /// Number of functions that all knots need together.
    pub(super) fn functions(&self) -> f64 {
        self.knots.iter().map(|knot| knot.sizes.len() as f64).sum()
    }

    /// Logarithm of `sum |c_kj + i kappa c_k(j-1)| reach^j`: what an error of `F` does to `Q` within `reach`.
    pub(super) fn log_weight(&self, reach: f64) -> f64 {
        let at = |knot: &Knot| knot.sizes.iter().rev().fold(0.0, |sum, size| sum * reach + size);
        self.knots.iter().map(at).sum::<f64>().ln()
    }

    /// `psi0`, up to a phase, at the distance `u` from the right end.
    fn amplitude(&self, u: f64) -> (f64, f64) {
        let mut total = (0.0, 0.0);
        for knot in self.knots.iter().take_while(|knot| knot.depth <= u) {
            let y = knot.depth - u;
            let mut power = 1.0;
            for (j, c) in knot.jumps.iter().enumerate() {
                if j > 0 {
                    power *= y / j as f64;
                }
                total = (total.0 + power * c.0, total.1 + power * c.1);
            }
        }
        if self.kappa == 0.0 {
            return total;
        }
        let y = self.kappa * (0.5 * self.width - u);
        if self.standing {
            let half_waves = (self.kappa * self.width / PI).round();
            let wave = if half_waves % 2.0 == 1.0 { y.cos() } else { y.sin() };
            return (total.0 * wave, total.1 * wave);
        }
        let (sin, cos) = (y % TAU).sin_cos();
        (total.0 * cos - total.1 * sin, total.0 * sin + total.1 * cos)
    }

    /// `K_1(r)/r`, within some percent, times `exp(start)`.
    fn kernel(&self, s: f64, start: f64) -> f64 {
        let square = s * (s + 2.0 * self.t);
        let r = square.sqrt();
        (start - r).exp() * (1.0 + 0.5 * PI * r).sqrt() / square
    }

    /// `|Q|^2 exp(2 start)` at `x = a + t + s`, by three-point rules on growing intervals.
    fn density(&self, s: f64, start: f64) -> f64 {
        const NODES: [(f64, f64); 3] =
            [(-0.774_596_669, 0.277_777_778), (0.0, 0.444_444_444), (0.774_596_669, 0.277_777_778)];
        let longest = if self.kappa == 0.0 { f64::INFINITY } else { 2.0 / self.kappa };
        let mut total = (0.0, 0.0);
        let mut u = 0.0;
        let mut depths = self.knots.iter().map(|knot| knot.depth).skip(1).peekable();
        for _ in 0..400 {
            let r = proper_distance(self.t, s + u);
            if u >= self.width * (1.0 - 1e-12) || r > start + 45.0 {
                break;
            }
            while depths.peek().is_some_and(|depth| *depth <= u * (1.0 + 1e-12)) {
                depths.next();
            }
            let falls = 3.0 * (r + 1.0) / (self.t + s + u);
            let step = (1.5 * (s + u)).min(longest).min(falls);
            let end = (u + step).min(depths.peek().copied().unwrap_or(self.width));
            let (centre, half) = (0.5 * (u + end), 0.5 * (end - u));
            for (x, w) in NODES {
                let at = centre + half * x;
                let value = w * 2.0 * half * self.kernel(s + at, start);
                let psi = self.amplitude(at);
                total = (total.0 + value * psi.0, total.1 + value * psi.1);
            }
            u = end;
        }
        total.0 * total.0 + total.1 * total.1
    }

    /// A rough logarithm of `Int |Q|^2` over the region.
    pub(super) fn log_integral(&self) -> f64 {
        const STEP: f64 = 0.6;
        let start = proper_distance(self.t, self.d);
        let mut first = self.gap().min(self.t).min(1.0).min(1.0 / self.t);
        if self.d > 0.0 {
            first = first.min(self.d).min((start + 1.0) / (self.t + self.d));
        }
        first *= 0.03;
        let last = bisect(first, (1e3 + self.d + self.t) * 1e3, |z| proper_distance(self.t, self.d + z) > start + 20.0);
        let count = ((last / first).ln() / STEP).ceil().clamp(4.0, 400.0);
        let mut total = self.density(self.d + first, start) * first;
        for k in 0..=count as u32 {
            let z = first * (STEP * f64::from(k)).exp();
            total += STEP * z * self.density(self.d + z, start);
        }
        total.max(1e-290).ln() - 2.0 * start
    }
}
