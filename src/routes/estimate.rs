//! Rough sizes in double precision, for choosing steps, cut-offs and precisions.
//!
//! Both routes may look here because nothing here reaches a result: a bad estimate costs time or
//! width, never containment.

use rug::{Float, Rational};
use std::f64::consts::PI;

/// `E = sqrt(d (d + 2 t))`.
pub(super) fn proper_distance(t: f64, d: f64) -> f64 {
    d.sqrt() * (d + 2.0 * t).sqrt()
}

/// The double, rounded down to `bits` bits, as an exact rational.
pub(super) fn dyadic(value: f64, bits: u32) -> Rational {
    Float::with_val_round(bits, value, rug::float::Round::Down).0.to_rational().unwrap_or_default()
}

/// The point where a predicate becomes true on `[low, high]`.
pub(super) fn bisect(mut low: f64, mut high: f64, holds: impl Fn(f64) -> bool) -> f64 {
    if holds(low) {
        return low;
    }
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if holds(middle) { high = middle } else { low = middle }
    }
    high
}

/// A rough natural logarithm of the two-sided probability, unit mass.
///
/// At the cone: `1/P` is near `6 + 21 a/t + 2 pi^2 a t` (interpolates the known limits; found by
/// trial). Beyond it: a coarse trapezoid sum.
pub(super) fn log_probability(a: f64, t: f64, d: f64) -> f64 {
    if d == 0.0 {
        let inverse = 6.0 + 21.0 * a / t + 2.0 * PI * PI * a * t;
        return -inverse.ln();
    }
    let (fall, rise) = ((t + d / 2.0).sqrt(), (d / 2.0).sqrt());
    let exponent = |x: f64| (fall * (-x / 2.0).exp() - rise * (x / 2.0).exp()).powi(2);
    let centre = (fall / rise).ln();
    let low = bisect(0.0, centre, |x| exponent(x) < 40.0);
    let high = bisect(centre, centre + 90.0, |x| exponent(x) > 40.0);
    let count = (((high - low) / 0.25).ceil() as usize).clamp(40, 400);
    let h = (high - low) / count as f64;
    let nodes: Vec<(f64, f64)> = (0..count)
        .map(|k| {
            let x = low + (k as f64 + 0.5) * h;
            let growth = -(-2.0 * t * x.sinh()).exp_m1() * -(-2.0 * a * x.cosh()).exp_m1();
            (x.cosh(), 0.25 * (-exponent(x)).exp() * growth * x.tanh())
        })
        .collect();
    let mut sum = 0.0;
    for (k, (ck, wk)) in nodes.iter().enumerate() {
        let inner: f64 = nodes[..k].iter().map(|(cl, wl)| 2.0 * wl / (ck + cl)).sum();
        sum += wk * (inner + wk / (2.0 * ck));
    }
    (sum * h * h).max(1e-300).ln() - (PI * PI * a / 4.0).ln() - 2.0 * proper_distance(t, d)
}

/// A rough natural logarithm of a positive rational of any size.
pub(super) fn ln_of(value: &Rational) -> f64 {
    Float::with_val(53, value).ln().to_f64()
}

/// A rough natural logarithm of the two-sided probability, mass zero, half-width one.
///
/// With `m = min(1, t)`, `M = max(1, t)`: `P` is near `m/6` at the cone, `m^2/(pi^2 d)` for `m << d << M` and
/// `4 t^2/(3 pi^2 d^3)` far away; their inverses are added, with `8.4 m/M` found by trial.
pub(super) fn massless_log_probability(ln_time: f64, ln_distance: f64) -> f64 {
    let (small, large) = (ln_time.min(0.0), ln_time.max(0.0));
    let near = (6.0 + 8.4 * (small - large).exp()).ln();
    let middle = (PI * PI).ln() + ln_distance - small;
    let far = (0.75 * PI * PI).ln() + 3.0 * ln_distance - small - 2.0 * large;
    let top = near.max(middle).max(far);
    small - top - ((near - top).exp() + (middle - top).exp() + (far - top).exp()).ln()
}
