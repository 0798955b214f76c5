//! The kernel route for mass zero: closed form with the dilogarithm, or a series far away.
//!
//! # Formula
//!
//! The propagator is `G(v, t) = (i t/pi)/(v^2 - t^2) = (i/(2 pi)) (1/(v-t) - 1/(v+t))`, the limit of the
//! massive one for small mass (`K_1(r)/r -> 1/r^2`). With half-width one, `u = 1 + t`, `s = |1 - t|` and
//! `R = u + d`,
//!
//! ```text
//! psi(x) = 2^(-1/2) Int_(x-1)^(x+1) G dv = (i/(2 pi sqrt 2)) L(x),
//! L(x) = ln[(x+1-t)(x-1+t) / ((x+1+t)(x-1-t))] = ln[(x^2 - s^2)/(x^2 - u^2)] > 0,
//! P = 2 Int_R^inf |psi|^2 dx = I/(4 pi^2),     I = Int_R^inf L^2 dx.
//! ```
//!
//! Put `m = min(1, t)`, `M = max(1, t)`: then `u = M + m`, `s = M - m`, and `I/M` depends only on `r = m/M <=
//! 1` and `delta = d/M` (half-width and time may be exchanged). From here on `M = 1`: `u = 1 + r`, `s = 1 - r`.
//!
//! # Closed form
//!
//! By parts, with `x L' = 2 s^2/(x^2-s^2) - 2 u^2/(x^2-u^2)` and `x L^2 -> 0` at infinity,
//!
//! ```text
//! I = -R L(R)^2 + 2u J_u - 2s J_s,     J_c = Int_R^inf L(x) 2c/(x^2 - c^2) dx.
//! ```
//!
//! * `y = (x-u)/(x+u)` turns `J_u` into `Int_z^1 L dy/y`, `z = delta/(2u + delta)`, where
//!   `L = C - ln y + ln(1 + y/r) + ln(1 + r y)`, `C = ln r - 2 ln(1+r)`; since `dLi_2(-y)/dy = -ln(1+y)/y` and
//!   `Li_2(-1/r) + Li_2(-r) = -pi^2/6 - ln^2(r)/2` (DLMF 25.12.4, number cited from memory),
//!   `J_u = pi^2/6 + ln^2(r)/2 + Li_2(-z/r) + Li_2(-r z) + ln^2(z)/2 - C ln z`.
//! * `y = (x-s)/(x+s)` turns `J_s` into `Int_w^1 L dy/y`, `w = (delta + 2r)/(delta + 2) >= r`, where `L = 2
//!   ln(1-r) - ln(1 - r/y) - ln(1 - r y)`, so `J_s = Li_2(r/w) - Li_2(r w) - 2 ln(1-r) ln w`.
//!
//! With `e = ln(1 + z/r) + ln(1 + r z)`, so that `ln z = C + e - L` at `x = R`, the squares that grow towards
//! the cone cancel in algebra, and with `p = ln(1+r)`, `n = ln(1-r)`
//!
//! ```text
//! I = u [pi^2/3 + 4 p (ln r - p) + 2 Li_2(-z/r) + 2 Li_2(-r z) - e (2L - e)] - delta L^2
//!     - 2s [Li_2(r/w) - Li_2(r w) - 2 n ln w],          L = ln(1 + 4r/(delta (2u + delta))).
//! ```
//!
//! At the cone (`delta = z = 0`, `w = r`; `delta L^2`, `e L -> 0`) the terms `pi^2/3` cancel as well:
//!
//! ```text
//! I = 2 pi^2 r/3 + 4 [(1+r) p (ln r - p) + (1-r) n ln r] + 2 (1-r) Li_2(r^2).
//! ```
//!
//! For `r = 1` (`t` equal to the half-width) `s = 0` and the terms with `n` are absent. All arguments of the
//! dilogarithm are exact rationals not above one. As `r -> 0` the last line gives `I -> 2 pi^2 r/3`, hence
//! `P -> 1/6` for late times.
//!
//! The terms are of size one where `I` may be tiny. The working precision starts from an estimate of `I` and is
//! raised until the enclosure is as narrow as asked; nothing but balls decides what is contained.
//!
//! # Far series
//!
//! For `rho = u/R` small, `L = Sum_{k>=1} (u^(2k) - s^(2k))/(k x^(2k))`. With `y = (s/u)^2`, `u^2 - s^2 = 4r`,
//!
//! ```text
//! I = (16 r^2/R^3) Sum_{n>=2} b_n rho^(2n-4)/(2n-1),
//! b_n = Sum_{k=1}^{n-1} a_k a_(n-k),     a_k = (1 + y + ... + y^(k-1))/k.
//! ```
//!
//! All terms are positive and `a_k <= 1`, so `b_n <= n - 1` and the terms beyond `N` are at most `Sum_{n>N}
//! (n-1)/(2n-1) rho^(2n-4) <= rho^(2N-2)/(2 (1 - rho^2))`, to be added to a sum of at least `1/3`.

use crate::arithmetic::{Bits, Magnitude, Real, decimal};
use crate::functions::dilogarithm::dilogarithm_of_rational;
use crate::functions::elementary::{ln, ln_1p, pi};
use crate::routes::estimate::{ln_of, massless_log_probability};
use crate::routes::{Effort, RouteFailure, RouteOutcome, TailProblem};
use rayon::prelude::*;
use rug::Rational;
use std::f64::consts::{LN_2, LOG2_10, PI};

/// Precision in which the tail bound is evaluated.
const BOUND_BITS: Bits = 64;
/// Precisions above this are refused.
const MAX_BITS: f64 = 120_000.0;
/// Attempts at a higher precision before the interval is given as it is.
const MAX_ROUNDS: usize = 12;
/// From this precision on, each dilogarithm is worth a thread of its own.
const PARALLEL_FROM: Bits = 3000;

pub(super) fn evaluate(problem: &TailProblem, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
    let shape = Shape::new(problem);
    let series = shape.series_length(digits);
    let series = (series <= 24.0 + f64::from(digits) / 6.0).then_some(series as usize);
    let mut bits = shape.first_bits(digits, series.is_some());
    let mut best: Option<RouteOutcome> = None;
    for _ in 0..MAX_ROUNDS {
        let allowed = if bits > MAX_BITS { Err(too_many_bits()) } else { effort.allow_bits(bits as Bits) };
        if let Err(failure) = allowed.and_then(|()| effort.check()) {
            // An enclosure already found is proven, only wider than asked.
            return best.ok_or(failure);
        }
        let (value, outcome) = shape.outcome(series, bits as Bits, effort)?;
        if outcome.interval.has_relative_digits(digits) {
            return Ok(outcome);
        }
        best = Some(outcome);
        let accuracy = value.accuracy_estimate();
        let missing = f64::from(digits) * LOG2_10 + 8.0 - accuracy;
        bits += if accuracy > 8.0 { missing.max(8.0) } else { bits + missing.clamp(8.0, bits) };
    }
    best.ok_or_else(too_many_bits)
}

fn too_many_bits() -> RouteFailure {
    RouteFailure::OutOfReach { reason: "the closed form would need more than 120000 bits".to_owned() }
}

/// The problem in units of `M = max(1, t)`.
struct Shape {
    /// `M`
    unit: Rational,
    /// `r`, in `(0, 1]`
    ratio: Rational,
    /// `delta`, not negative
    distance: Rational,
}

/// The named pieces of one evaluation.
struct Pieces {
    /// `I/M`
    integral: Real,
    /// Dilogarithms, or terms of the series.
    nodes: usize,
    named: Vec<(&'static str, Real)>,
    tail: Option<Magnitude>,
}

impl Shape {
    fn new(problem: &TailProblem) -> Shape {
        let late = problem.time > 1;
        let unit = if late { problem.time.clone() } else { Rational::from(1) };
        let ratio = if late { Rational::from(problem.time.recip_ref()) } else { problem.time.clone() };
        Shape { distance: Rational::from(&problem.distance / &unit), unit, ratio }
    }

    /// `u = 1 + r`.
    fn outer(&self) -> Rational {
        Rational::from(&self.ratio + 1)
    }

    /// `s = 1 - r`.
    fn inner(&self) -> Rational {
        Rational::from(1 - &self.ratio)
    }

    /// `R = u + delta`.
    fn region(&self) -> Rational {
        self.outer() + &self.distance
    }

    /// Steering only: terms that the far series would need.
    fn series_length(&self, digits: u32) -> f64 {
        let gain = 2.0 * (ln_of(&self.region()) - ln_of(&self.outer())) / LN_2;
        ((f64::from(digits) * LOG2_10 + 6.0) / gain + 2.0).ceil()
    }

    /// Steering only: precision for the first attempt.
    fn first_bits(&self, digits: u32, series: bool) -> f64 {
        let wanted = f64::from(digits) * LOG2_10 + 16.0;
        if series {
            return (wanted + 8.0).ceil();
        }
        // I/M against terms as large as ln^2 r and ln^2 delta.
        let ln_distance = if self.distance == 0 { f64::NEG_INFINITY } else { ln_of(&self.distance) };
        let size = massless_log_probability(ln_of(&self.ratio), ln_distance) + (4.0 * PI * PI).ln();
        let near = if self.distance == 0 { 0.0 } else { ln_distance.abs() };
        let terms = 2.0 * (2.0 + near.max(-ln_of(&self.ratio))).log2();
        (wanted + terms + (-size / LN_2).max(0.0)).ceil()
    }

    fn outcome(
        &self,
        series: Option<usize>,
        bits: Bits,
        effort: &Effort,
    ) -> Result<(Real, RouteOutcome), RouteFailure> {
        let pieces = match series {
            Some(terms) => self.far_series(terms, bits, effort)?,
            None if self.distance == 0 => self.at_cone(bits),
            None => self.beyond(bits, effort)?,
        };
        let unit = Real::from_rational(&self.unit, bits);
        let value = pieces.integral.mul(&unit, bits).div(&pi(bits).square(bits), bits).shift(-2);
        let interval = value.to_interval(bits).clamp_non_negative();
        let nodes = pieces.nodes;
        Ok((value, RouteOutcome { interval, bits, nodes, witness: self.witness(pieces, bits) }))
    }

    /// `I` for a region that begins at the cone.
    fn at_cone(&self, bits: Bits) -> Pieces {
        let r = Real::from_rational(&self.ratio, bits);
        let plus = ln_1p(&r, bits);
        let ln_r = ln(&r, bits);
        let outer = Real::from_rational(&self.outer(), bits);
        let mut bracket = outer.mul(&plus, bits).mul(&ln_r.sub(&plus, bits), bits);
        let mut total = pi(bits).square(bits).mul(&r, bits).div_u64(3, bits).shift(1);
        let mut named = vec![("ln(1+r)", plus), ("ln r", ln_r)];
        let inner = self.inner();
        if inner != 0 {
            let minus = ln(&Real::from_rational(&inner, bits), bits);
            let factor = Real::from_rational(&inner, bits);
            bracket = bracket.add(&factor.mul(&minus, bits).mul(&named[1].1, bits), bits);
            let dilogarithm = dilogarithm_of_rational(&Rational::from(&self.ratio * &self.ratio), bits);
            total = total.add(&factor.mul(&dilogarithm, bits).shift(1), bits);
            named.extend([("ln(1-r)", minus), ("Li_2(r^2)", dilogarithm)]);
        }
        Pieces { integral: total.add(&bracket.shift(2), bits), nodes: usize::from(inner != 0), named, tail: None }
    }

    /// `I` for a region that begins beyond the cone.
    fn beyond(&self, bits: Bits, effort: &Effort) -> Result<Pieces, RouteFailure> {
        let real = |value: &Rational| Real::from_rational(value, bits);
        let (u, s, r, delta) = (self.outer(), self.inner(), &self.ratio, &self.distance);
        let reach = Rational::from(&u * 2) + delta;
        let z = Rational::from(delta / &reach);
        let w = (Rational::from(r * 2) + delta) / Rational::from(delta + 2);
        let (z_over, z_times) = (Rational::from(&z / r), Rational::from(&z * r));
        let mut arguments = vec![Rational::from(-&z_over), Rational::from(-&z_times)];
        if s != 0 {
            arguments.extend([Rational::from(r / &w), Rational::from(r * &w)]);
        }
        let values = dilogarithms(&arguments, bits, effort)?;
        let (plus, ln_r) = (ln_1p(&real(r), bits), ln(&real(r), bits));
        let e = ln_1p(&real(&z_over), bits).add(&ln_1p(&real(&z_times), bits), bits);
        let log = ln_1p(&real(&(Rational::from(r * 4) / Rational::from(delta * &reach))), bits);
        let mut bracket = pi(bits).square(bits).div_u64(3, bits);
        bracket = bracket.add(&plus.mul(&ln_r.sub(&plus, bits), bits).shift(2), bits);
        bracket = bracket.add(&values[0].add(&values[1], bits).shift(1), bits);
        bracket = bracket.sub(&e.mul(&log.shift(1).sub(&e, bits), bits), bits);
        let mut total = bracket.mul(&real(&u), bits).sub(&real(delta).mul(&log.square(bits), bits), bits);
        let mut named = vec![("L(R)", log), ("Li_2(-z/r)", values[0].clone()), ("Li_2(-r z)", values[1].clone())];
        if s != 0 {
            let logs = ln(&real(&s), bits).mul(&ln(&real(&w), bits), bits);
            let inner = values[2].sub(&values[3], bits).sub(&logs.shift(1), bits);
            total = total.sub(&inner.mul(&real(&s), bits).shift(1), bits);
            named.extend([("Li_2(r/w)", values[2].clone()), ("Li_2(r w)", values[3].clone())]);
        }
        Ok(Pieces { integral: total, nodes: arguments.len(), named, tail: None })
    }

    /// `I` by the series in `1/R`, of the terms `n = 2..=last`.
    fn far_series(&self, last: usize, bits: Bits, effort: &Effort) -> Result<Pieces, RouteFailure> {
        let real = |value: &Rational| Real::from_rational(value, bits);
        let (u, s, region) = (self.outer(), self.inner(), self.region());
        let y = real(&Rational::from(&s / &u)).square(bits);
        let rho_squared = real(&Rational::from(&u / &region)).square(bits);
        let mut coefficients = Vec::with_capacity(last);
        let (mut sum, mut power) = (Real::zero(), Real::from_i64(1));
        for k in 1..=last as u64 {
            sum = sum.add(&power, bits);
            power = power.mul(&y, bits);
            coefficients.push(sum.div_u64(k, bits));
        }
        let (mut total, mut power) = (Real::zero(), Real::from_i64(1));
        for n in 2..=last {
            effort.check()?;
            let term = convolved(&coefficients[..n - 1], bits).mul(&power, bits);
            total = total.add(&term.div_u64(2 * n as u64 - 1, bits), bits);
            power = power.mul(&rho_squared, bits);
        }
        let tail = if crate::spoil::is_active(crate::spoil::Fault::KernelTailForgotten) {
            Magnitude::ZERO
        } else {
            series_tail(&rho_squared, last)
        };
        // The rest lies in [0, tail].
        let half = Real::from_float(tail.to_float()).shift(-1);
        let total = total.add(&half, bits).widen(half.abs_upper());
        let lead = Rational::from(&self.ratio * &self.ratio) * 16 / Rational::from(&region * &region) / &region;
        let integral = total.mul(&real(&lead), bits);
        Ok(Pieces { integral, nodes: last, named: vec![("series", total)], tail: Some(tail) })
    }

    fn witness(&self, pieces: Pieces, bits: Bits) -> Vec<(String, String)> {
        let form = match (&pieces.tail, self.distance == 0) {
            (Some(_), _) => "series in 1/R",
            (None, true) => "dilogarithms, at the cone",
            (None, false) => "dilogarithms, beyond the cone",
        };
        let mut list = vec![
            ("form".to_owned(), form.to_owned()),
            ("M = max(half-width, time) in half-widths".to_owned(), self.unit.to_string()),
            ("r = min/max of half-width and time".to_owned(), self.ratio.to_string()),
            ("delta = distance / M".to_owned(), self.distance.to_string()),
        ];
        if let Some(tail) = pieces.tail {
            list.push(("series terms up to n".to_owned(), pieces.nodes.to_string()));
            list.push(("series tail bound".to_owned(), decimal::upper_decimal(&tail.to_float(), 4)));
        }
        for (name, value) in pieces.named.iter().chain([&("integral of L^2 over M", pieces.integral)]) {
            let interval = value.to_interval(bits);
            list.push((format!("{name}, lower"), decimal::lower_decimal(interval.lower(), 20)));
            list.push((format!("{name}, upper"), decimal::upper_decimal(interval.upper(), 20)));
        }
        list
    }
}

fn dilogarithms(arguments: &[Rational], bits: Bits, effort: &Effort) -> Result<Vec<Real>, RouteFailure> {
    let one = |x: &Rational| -> Result<Real, RouteFailure> {
        effort.check()?;
        Ok(dilogarithm_of_rational(x, bits))
    };
    if bits >= PARALLEL_FROM { arguments.par_iter().map(one).collect() } else { arguments.iter().map(one).collect() }
}

/// `Sum_{k=1}^{n-1} a_k a_(n-k)` for the list `a_1, ..., a_(n-1)`.
fn convolved(list: &[Real], bits: Bits) -> Real {
    let mut total = Real::zero();
    for (left, right) in list.iter().zip(list.iter().rev()).take(list.len() / 2) {
        total = total.add(&left.mul(right, bits), bits);
    }
    total = total.shift(1);
    if list.len() % 2 == 1 {
        total = total.add(&list[list.len() / 2].square(bits), bits);
    }
    total
}

/// `rho^(2N-2)/(2 (1 - rho^2))` from `rho^2`.
fn series_tail(rho_squared: &Real, last: usize) -> Magnitude {
    let below = Real::from_i64(1).sub(rho_squared, BOUND_BITS).abs_lower();
    rho_squared.abs_upper().pow(last as u64 - 1).div(below).shift(-1)
}
