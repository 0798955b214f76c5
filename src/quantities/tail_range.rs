//! Tail probabilities for interval inputs, reduced to exact ones.
//!
//! Write `P(m, a, t, R)` for the two-sided tail of the box. Outside the cone the amplitude is
//! `psi = i (2a)^(-1/2) Int_{-a}^{a} g(x - y) dy` with `g(x) = (m t / pi) K_1(m s)/s > 0`,
//! `s = sqrt(x^2 - t^2)`.
//!
//! **Lemma 1** (region fixed). `P` increases with `t` and with `a`, and decreases with `m` and
//! with `R`. *Proof.* `z K_1(z)` decreases (its derivative is `-z K_0(z)`, DLMF 10.29.4), so
//! `g = t (m s K_1(m s)) / (pi s^2)` decreases with `m`, and increases with `t` since `s` falls as
//! `t` grows. As a Laplace transform of a positive measure, `g(x) = (1/pi) Int_m^inf
//! exp(-kappa x) sinh(t sqrt(kappa^2 - m^2)) dkappa`, `g` is convex on `x > t`, so its mean over `|y| <= a`
//! grows with `a`, and `psi = i sqrt(2a) * mean`. `R` only changes the range of integration. ∎
//!
//! **Lemma 2** (at the cone, `R = a + t`). With the double integral of the spectral route,
//! `a P = c Int Int s s' f f' / (kappa + kappa')`, where `f = 1 - exp(-2 a kappa)` (over `kappa`) and
//! `s(t) = (exp(-m t e^-eta) - exp(-m t e^eta))/2`, all positive:
//! `a P` increases with `a` as `f` does; `P / a` decreases with `a` as `f / a` does; `P` decreases
//! with `m` at fixed `a, t` by Lemma 1; `P / t^2` decreases with `t`, as
//! `d ln(s/t)/dt = sigma coth(t sigma) - 1/t - cosh eta < 0` (unit mass, `sigma = sinh eta`, because
//! `coth z - 1/z < 1`); `P exp(2 m t)` increases with `t`, as
//! `d ln(s e^t)/dt >= sigma - cosh eta + 1 = 1 - exp(-eta) >= 0`; and `P` decreases with `t` once
//! `m t >= 1`, as `d s/dt = 0` only at `t = eta / sinh eta <= 1`. ∎
//!
//! The box of `(a, t)` is cut into pieces and the pieces' bounds are joined, so that the factors
//! of Lemma 2 cost little width.

use super::tail::{RouteReport, Status, TailRequest, TailResult, run_routes, scale};
use crate::arithmetic::{ExactInput, Interval, Real, rounding};
use crate::error::Error;
use crate::functions::elementary;
use crate::routes::Effort;
use rug::{Float, Rational};

/// Pieces into which an interval of times or half-widths at the cone is cut.
const PIECES: u32 = 12;
/// Digits of the exact problems that bound an interval problem.
const CORNER_DIGITS: u32 = 18;

/// The smallest and largest absolute value of an input.
pub(super) fn absolute(input: &ExactInput) -> (Rational, Rational) {
    let low = Rational::from(input.lower().abs_ref());
    let high = Rational::from(input.upper().abs_ref());
    let across = *input.lower() <= 0 && *input.upper() >= 0;
    let largest = if low > high { low.clone() } else { high.clone() };
    let smallest = if across {
        Rational::new()
    } else if low < high {
        low
    } else {
        high
    };
    (smallest, largest)
}

/// Certifies a valid request, for both sides together.
pub(super) fn certify(request: &TailRequest) -> Result<TailResult, Error> {
    let effort = request.effort();
    let points = request.packet.half_width().is_point() && request.mass.is_point() && request.time.is_point();
    let (interval, routes, notes) = if points && request.beyond.as_ref().is_none_or(ExactInput::is_point) {
        let (interval, routes) = exact(request, &effort)?;
        (interval, routes, Vec::new())
    } else {
        let (interval, routes) = match &request.beyond {
            Some(region) => fixed_region(request, region, &effort)?,
            None => at_the_cone(request, &effort)?,
        };
        (interval, routes, vec!["the width of the inputs limits the digits".to_owned()])
    };
    let mut result =
        TailResult { interval, value: None, digits: 0, status: Status::Certified, routes, notes, seconds: 0.0 };
    if request.time.is_point() && *request.time.lower() == 0 {
        result.notes = vec!["at time zero the packet lies inside its box: the probability is exactly zero".to_owned()];
    }
    Ok(result)
}

type Found = (Interval, Vec<RouteReport>);

fn exact(request: &TailRequest, effort: &Effort) -> Result<Found, Error> {
    let corner = Corner {
        half_width: request.packet.half_width().lower().clone(),
        mass: request.mass.lower().clone(),
        time: Rational::from(request.time.lower().abs_ref()),
        beyond: request.beyond.as_ref().map(|r| r.lower().clone()),
    };
    corner.evaluate(request, request.digits, effort)
}

/// One exact set of inputs.
struct Corner {
    half_width: Rational,
    mass: Rational,
    time: Rational,
    beyond: Option<Rational>,
}

impl Corner {
    fn evaluate(&self, request: &TailRequest, digits: u32, effort: &Effort) -> Result<Found, Error> {
        match scale(&self.half_width, &self.mass, &self.time, self.beyond.as_ref()) {
            None => Ok((Interval::new(Float::new(64), Float::new(64)), Vec::new())),
            Some(problem) => run_routes(&problem, request.routes, digits, effort),
        }
    }
}

/// Lemma 1: two corners bound everything.
fn fixed_region(request: &TailRequest, region: &ExactInput, effort: &Effort) -> Result<Found, Error> {
    let (first, last) = absolute(&request.time);
    let digits = request.digits.min(CORNER_DIGITS);
    let smallest = Corner {
        half_width: request.packet.half_width().lower().clone(),
        mass: request.mass.upper().clone(),
        time: first,
        beyond: Some(region.upper().clone()),
    };
    let largest = Corner {
        half_width: request.packet.half_width().upper().clone(),
        mass: request.mass.lower().clone(),
        time: last,
        beyond: Some(region.lower().clone()),
    };
    let low = smallest.evaluate(request, digits, effort)?;
    let high = largest.evaluate(request, digits, effort)?;
    Ok((low.0.hull(&high.0), join_reports(low.1, high.1)))
}

/// Lemma 2 on pieces of the box of half-widths and times.
fn at_the_cone(request: &TailRequest, effort: &Effort) -> Result<Found, Error> {
    let widths = pieces(request.packet.half_width().lower(), request.packet.half_width().upper());
    let (first, last) = absolute(&request.time);
    let times = pieces(&first, &last);
    let mut found: Option<Found> = None;
    for width in &widths {
        for time in &times {
            let next = piece(request, width, time, effort)?;
            found = Some(match found {
                None => next,
                Some(so_far) => (so_far.0.hull(&next.0), join_reports(so_far.1, next.1)),
            });
        }
    }
    found.ok_or_else(|| Error::Internal { found: "an interval without pieces".to_owned() })
}

/// Cuts `[low, high]` into pieces, geometrically where possible so that ratios are small.
fn pieces(low: &Rational, high: &Rational) -> Vec<(Rational, Rational)> {
    if low == high {
        return vec![(low.clone(), high.clone())];
    }
    let step = Rational::from(high - low) / PIECES;
    let mut ends: Vec<Rational> = (0..PIECES).map(|k| Rational::from(&step * k) + low).collect();
    ends.push(high.clone());
    ends.windows(2).map(|pair| (pair[0].clone(), pair[1].clone())).collect()
}

/// Bounds on one piece: values at its corners times the factors of Lemma 2.
fn piece(
    request: &TailRequest,
    width: &(Rational, Rational),
    time: &(Rational, Rational),
    effort: &Effort,
) -> Result<Found, Error> {
    const BITS: u32 = 128;
    let digits = request.digits.min(CORNER_DIGITS);
    let at = |mass: &Rational, time: &Rational| {
        let corner = Corner { half_width: width.0.clone(), mass: mass.clone(), time: time.clone(), beyond: None };
        corner.evaluate(request, digits, effort)
    };
    // From the left half-width a1: P(a) lies between P(a1) a1/a and P(a1) a/a1.
    let stretch = Real::from_rational(&Rational::from(&width.1 / &width.0), BITS);
    let (light, heavy) = (request.mass.lower(), request.mass.upper());
    let (high_late, reports_high) = at(light, &time.1)?;
    let (low_early, reports_low) = at(heavy, &time.0)?;
    let grow = growth(light, time, BITS);
    let fall = growth(heavy, time, BITS);
    let mut upper = scaled_upper(&high_late, &grow, BITS);
    let mut lower = scaled_lower(&low_early, &fall, BITS);
    if time.0 != 0 && time.0 != time.1 {
        let ratio = Real::from_rational(&Rational::from(&time.1 / &time.0).square(), BITS);
        let (high_early, _) = at(light, &time.0)?;
        let (low_late, _) = at(heavy, &time.1)?;
        let falling = |mass: &Rational| Rational::from(mass * &time.0) >= 1;
        let one = Real::from_i64(1);
        let bound = scaled_upper(&high_early, if falling(light) { &one } else { &ratio }, BITS);
        upper = if bound < upper { bound } else { upper };
        let bound = scaled_lower(&low_late, if falling(heavy) { &one } else { &ratio }, BITS);
        lower = if bound > lower { bound } else { lower };
    }
    let upper = rounding::up(BITS, &upper * &stretch.upper(BITS));
    let lower = rounding::down(BITS, &lower / &stretch.upper(BITS));
    Ok((Interval::new(lower, upper), join_reports(reports_low, reports_high)))
}

/// `exp(2 m (t2 - t1))`.
fn growth(mass: &Rational, time: &(Rational, Rational), bits: u32) -> Real {
    let exponent = Rational::from(&time.1 - &time.0) * mass * 2;
    elementary::exp(&Real::from_rational(&exponent, bits), bits)
}

fn scaled_upper(interval: &Interval, factor: &Real, bits: u32) -> Float {
    rounding::up(bits, interval.upper() * &factor.upper(bits))
}

fn scaled_lower(interval: &Interval, factor: &Real, bits: u32) -> Float {
    rounding::down(bits, interval.lower() / &factor.upper(bits))
}

/// Joins the reports of several exact problems: the hull of each route's intervals.
fn join_reports(left: Vec<RouteReport>, right: Vec<RouteReport>) -> Vec<RouteReport> {
    if left.is_empty() {
        return right;
    }
    if right.is_empty() {
        return left;
    }
    let join = |(one, two): (RouteReport, RouteReport)| RouteReport {
        interval: match (&one.interval, &two.interval) {
            (Some(x), Some(y)) => Some(x.hull(y)),
            _ => None,
        },
        bits: one.bits.max(two.bits),
        nodes: one.nodes + two.nodes,
        seconds: one.seconds + two.seconds,
        note: one.note.or(two.note),
        ..one
    };
    left.into_iter().zip(right).map(join).collect()
}
