//! The largest tail of the box over all times.
//!
//! Let `P(t)` be the probability of finding the box packet beyond its light cone at time `t`, unit mass. Claims about
//! "the maximum" are about all times, so sampling proves nothing. What is used:
//!
//! **Lemma P1** (late times). `P` decreases for `t >= 1`. *Proof.* Lemma 2 of [`super::tail_range`]. ∎
//!
//! **Lemma P2** (early times). `P(t) <= P(t_0) exp(2 t_0)` for `0 < t <= t_0`. *Proof.* `P exp(2t)` increases, Lemma 2
//! there. ∎
//!
//! **Lemma P3** (between). If `P'(p) > 0` at one time `p`, then `P' > 0` on `[p - d, p]` as long as
//! `P'(p) - d P''(p) - d^2 M/2 > 0`, where `M` bounds `|P'''|` from `p - d` on; and the same to the right with the
//! signs changed. *Proof.* Taylor's theorem for `P'`. ∎
//!
//! From a bracket `[l, r]` with `P'(l) > 0 > P'(r)`, Lemma P3 is applied in steps to the left until Lemma P2 covers the rest,
//! and to the right until Lemma P1 does. So the maximum over all times lies in `[l, r]`, and inside
//! `P(c) <= max P <= P(c) + e (|P'(c)| + e M_2/2)`, where `e` is the distance from `c` to the ends and `M_2` bounds `|P''|`.
//! `P`, `P'`, `P''` and the bounds come from [`crate::routes::spectral::time_derivatives`]; `P(c)` is computed by both
//! routes as well and has to agree.
//!
//! For mass zero there is no largest value: `P` rises with time towards 1/6.

use super::question::{Inputs, Question};
use super::tail::{RouteChoice, RouteReport, TailResult, run_routes};
use crate::arithmetic::{ExactInput, Interval, Magnitude, Real, decimal, rounding};
use crate::error::Error;
use crate::functions::elementary::exp;
use crate::packets::BoxPacket;
use crate::routes::spectral::time_derivatives::{TimeDerivatives, at, higher_bounds};
use crate::routes::{Effort, RouteFailure, TailProblem};
use rug::{Float, Rational};
use std::time::{Duration, Instant};

/// Largest number of digits that can be asked for.
pub const MAX_DIGITS: u32 = 200;
/// Digits of the derivatives where only a sign counts.
const SIGN_DIGITS: u32 = 14;
/// Largest number of steps of Lemma P3.
const MAX_STEPS: usize = 4000;

/// A question for the largest tail over all times.
#[derive(Clone, Debug)]
pub struct PeakRequest {
    /// The packet, with an exact half-width.
    pub packet: BoxPacket,
    /// Mass, an exact positive number.
    pub mass: ExactInput,
    /// Relative digits of the value.
    pub digits: u32,
    /// Longest time to spend.
    pub time_limit: Option<Duration>,
}

impl PeakRequest {
    /// A request for 15 digits.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the mass is not an exact positive number or the half-width is not exact.
    pub fn new(packet: BoxPacket, mass: ExactInput) -> Result<PeakRequest, Error> {
        let request = PeakRequest { packet, mass, digits: 15, time_limit: None };
        request.validate()?;
        Ok(request)
    }

    /// Checks all fields together.
    ///
    /// # Errors
    /// [`Error::BadInput`] naming the first field that cannot be used.
    pub fn validate(&self) -> Result<(), Error> {
        if !self.packet.half_width().is_point() {
            return Err(Error::bad_input("half-width", self.packet.half_width().text(), "give a single number"));
        }
        if !self.mass.is_point() || *self.mass.lower() <= 0 {
            let wanted =
                "give a single number above 0; for mass 0 the tail rises with time towards 1/6 and has no maximum";
            return Err(Error::bad_input("mass", self.mass.text(), wanted));
        }
        if self.digits == 0 || self.digits > MAX_DIGITS {
            return Err(Error::bad_input(
                "digits",
                self.digits,
                &format!("give a whole number from 1 to {MAX_DIGITS}"),
            ));
        }
        Ok(())
    }

    /// Finds and proves the maximum.
    ///
    /// # Errors
    /// [`Error::BadInput`] for a request that cannot be used or is out of reach, [`Error::RoutesDisagree`] or
    /// [`Error::Internal`] for a defect of this program.
    pub fn certify(&self) -> Result<TailResult, Error> {
        self.validate()?;
        let start = Instant::now();
        let deadline = self.time_limit.and_then(|limit| start.checked_add(limit));
        let effort = Effort { max_bits: None, deadline };
        let half_width = Rational::from(self.packet.half_width().lower() * self.mass.lower());
        let search = Search { half_width, digits: self.digits, effort };
        let found = search.run().map_err(|failure| self.refused(&failure))?;
        let (meeting, routes) = search.by_routes(&found.centre)?;
        let interval = found.value.intersection(&meeting.hull(&found.raised(&meeting))).ok_or_else(|| {
            Error::Internal { found: "the routes and the time derivatives exclude each other".to_owned() }
        })?;
        let bits = 64 + 4 * self.digits;
        let scaled = |end: &Rational| Rational::from(end / self.mass.lower());
        let at = Interval::new(rounding::down(bits, &scaled(&found.left)), rounding::up(bits, &scaled(&found.right)));
        let mut routes = routes;
        if let Some(spectral) = routes.iter_mut().find(|route| route.name == "spectral") {
            spectral.witness.extend(found.witness());
        }
        let notes = vec![
            "the routes' intervals are for one time inside the bracket `at`; the answer is for the maximum".to_owned(),
            "no other time has a larger value: Lemma P1 (late), P2 (early), P3 (between)".to_owned(),
        ];
        let result = TailResult::new(interval, self.digits, routes, notes, start);
        Ok(TailResult { at: Some(at), ..result })
    }

    fn refused(&self, failure: &RouteFailure) -> Error {
        let was = format!("half-width {}, mass {}", self.packet.half_width().text(), self.mass.text());
        Error::bad_input(
            "peak",
            was,
            &format!("no proof was found ({failure}); more time or a larger mass * half-width may help"),
        )
    }
}

impl Question for PeakRequest {
    fn inputs(&self) -> Inputs {
        Inputs::of_packet(BoxPacket::NAME)
            .with("half_width", self.packet.half_width().text())
            .with("mass", self.mass.text())
            .with("over", "time")
            .with("beyond", "cone")
            .with("side", "both")
            .with("digits", self.digits.to_string())
            .with_optional("time_limit", self.time_limit.map(|limit| limit.as_secs_f64().to_string()))
    }

    fn formula(&self) -> String {
        "max over time of P(|x| > half_width + |time|)".to_owned()
    }

    fn words(&self) -> String {
        "Largest probability, over all times, of finding the particle outside its light cone".to_owned()
    }

    fn digits(&self) -> u32 {
        self.digits
    }

    fn certify(&self) -> Result<TailResult, Error> {
        PeakRequest::certify(self)
    }
}

/// The search in units of the mass.
struct Search {
    half_width: Rational,
    digits: u32,
    effort: Effort,
}

/// A proven bracket.
struct Found {
    left: Rational,
    right: Rational,
    centre: Rational,
    /// Enclosure of the maximum by the derivatives alone.
    value: Interval,
    /// How far the maximum can lie above the value at the centre.
    rise: Magnitude,
    steps: usize,
    early: Rational,
}

impl Found {
    /// An enclosure of the value at the centre raised by what the maximum can be above.
    fn raised(&self, interval: &Interval) -> Interval {
        let bits = interval.upper().prec() + 64;
        let rise = self.rise.to_float();
        let upper = rounding::up(bits, interval.upper() + &rise);
        Interval::new(interval.lower().clone(), upper)
    }

    fn witness(&self) -> Vec<(String, String)> {
        vec![
            ("bracket of m t, left".to_owned(), self.left.to_string()),
            ("bracket of m t, right".to_owned(), self.right.to_string()),
            ("m t of the value".to_owned(), self.centre.to_string()),
            ("rise above that value, at most".to_owned(), decimal::upper_decimal(&self.rise.to_float(), 4)),
            ("steps of Lemma P3".to_owned(), self.steps.to_string()),
            ("Lemma P2 covers m t up to".to_owned(), decimal::lower_decimal(&rounding::down(64, &self.early), 6)),
            ("Lemma P1 covers m t from".to_owned(), "1".to_owned()),
        ]
    }
}

/// Why no bracket was proven.
fn failed(reason: &str) -> RouteFailure {
    RouteFailure::OutOfReach { reason: reason.to_owned() }
}

/// A time near `value` with about `bits` bits, as an exact number.
fn near(value: &Rational, bits: u32) -> Rational {
    Float::with_val(bits, value).to_rational().unwrap_or_default()
}

impl Search {
    fn derivatives(&self, time: &Rational, digits: u32) -> Result<TimeDerivatives, RouteFailure> {
        at(&self.half_width, time, digits, &self.effort)
    }

    fn run(&self) -> Result<Found, RouteFailure> {
        let rough = self.rough()?;
        let mut exponent = self.digits / 2 + 3;
        for _ in 0..3 {
            let centre = self.refine(&rough, exponent)?;
            let width = Rational::from((1, 10)) / rug::Integer::from(rug::Integer::u_pow_u(10, exponent - 1));
            let width = near(&width, 8);
            let (left, right) = (Rational::from(&centre - &width), Rational::from(&centre + &width));
            let digits = exponent + 8;
            let at_left = self.derivatives(&left, digits)?;
            let at_right = self.derivatives(&right, digits)?;
            if !at_left.first.certainly_positive() || !at_right.first.certainly_negative() {
                exponent += 2;
                continue;
            }
            let here = self.derivatives(&centre, self.digits + 4)?;
            let (early, to_left) = self.march_left(&left, at_left, &here.value)?;
            let to_right = self.march_right(&right, at_right)?;
            let reach = Real::from_rational(&width, 64).abs_upper();
            let (second, _) = higher_bounds(&self.half_width, &left);
            let rise = here.first.abs_upper().add(second.mul(reach).shift(-1)).mul(reach);
            let bits = 64 + 4 * self.digits;
            let value = here.value.to_interval(bits);
            let found = Found { left, right, centre, rise, steps: to_left + to_right, early, value: value.clone() };
            return Ok(Found { value: found.raised(&value), ..found });
        }
        Err(failed("the sign of the time derivative beside the maximum could not be decided"))
    }

    /// The maximum to a few digits, by bisection for the sign of the derivative on `(0, 1]`.
    fn rough(&self) -> Result<Rational, RouteFailure> {
        let (mut low, mut high) = (Rational::from((1, 1024)), Rational::from(1));
        for _ in 0..14 {
            let middle = near(&(Rational::from(&low + &high) / 2), 24);
            let slope = self.derivatives(&middle, 8)?.first;
            if slope.midpoint().is_sign_positive() { low = middle } else { high = middle }
        }
        Ok(low)
    }

    /// Newton's method for the zero of the derivative, to about `exponent` decimals.
    fn refine(&self, rough: &Rational, exponent: u32) -> Result<Rational, RouteFailure> {
        let bits = 24 + 4 * exponent;
        let mut time = rough.clone();
        for _ in 0..8 {
            let here = self.derivatives(&time, exponent + 6)?;
            let step = here.first.div(&here.second, bits);
            let Some(step) = step.midpoint().to_rational() else {
                return Err(failed("the second time derivative could not be told from zero"));
            };
            let next = near(&Rational::from(&time - &step), bits);
            if next <= 0 || next > 1 {
                return Err(failed("the search for the maximum left the interval (0, 1] of m t"));
            }
            time = next;
            if step.to_f64().abs() < 10f64.powi(-(exponent as i32) - 1) {
                break;
            }
        }
        Ok(time)
    }

    /// Lemma P3 leftward from `start` until Lemma P2 covers the rest: the last point and the number of steps.
    fn march_left(
        &self,
        start: &Rational,
        known: TimeDerivatives,
        peak: &Real,
    ) -> Result<(Rational, usize), RouteFailure> {
        let bits = 128;
        let (mut time, mut here) = (start.clone(), known);
        for steps in 0..MAX_STEPS {
            self.effort.check()?;
            let growth = exp(&Real::from_rational(&Rational::from(&time * 2), bits), bits);
            if here.value.mul(&growth, bits).certainly_less(peak) {
                return Ok((time, steps));
            }
            let earliest = near(&(Rational::from(&time * 3) / 4), 32);
            let (_, third) = higher_bounds(&self.half_width, &earliest);
            let step = safe_step(&here.first, &here.second.neg(), third)?;
            let next = near(&Rational::from(&time - &step), 48);
            time = if next > earliest { next } else { earliest };
            here = self.derivatives(&time, SIGN_DIGITS)?;
            if !here.first.certainly_positive() {
                return Err(failed("the sign of the time derivative could not be decided"));
            }
        }
        Err(failed("too many steps would be needed to exclude other maxima"))
    }

    /// Lemma P3 rightward from `start` until `m t = 1`: the number of steps.
    fn march_right(&self, start: &Rational, known: TimeDerivatives) -> Result<usize, RouteFailure> {
        let (mut time, mut here) = (start.clone(), known);
        for steps in 0..MAX_STEPS {
            self.effort.check()?;
            if time >= 1 {
                return Ok(steps);
            }
            let (_, third) = higher_bounds(&self.half_width, &time);
            let step = safe_step(&here.first.neg(), &here.second.neg(), third)?;
            time = near(&Rational::from(&time + &step), 48);
            if time < 1 {
                here = self.derivatives(&time, SIGN_DIGITS)?;
                if !here.first.certainly_negative() {
                    return Err(failed("the sign of the time derivative could not be decided"));
                }
            }
        }
        Err(failed("too many steps would be needed to exclude other maxima"))
    }

    /// The value at one time by both routes, which have to meet.
    fn by_routes(&self, time: &Rational) -> Result<(Interval, Vec<RouteReport>), Error> {
        let problem = TailProblem {
            half_width: self.half_width.clone(),
            time: time.clone(),
            distance: Rational::new(),
            massless: false,
        };
        run_routes(&problem, RouteChoice::Both, self.digits + 3, &self.effort)
    }
}

/// A step `d > 0` with `slope + d curve - d^2 third/2 > 0`, proven; `slope` is positive.
///
/// Double precision proposes, balls decide.
fn safe_step(slope: &Real, curve: &Real, third: Magnitude) -> Result<Rational, RouteFailure> {
    let bits = 64;
    let (low, bend, worst) = (slope.to_f64(), curve.to_f64(), third.to_float().to_f64());
    let proposal = (bend + (bend * bend + 2.0 * worst * low).sqrt()) / worst;
    let mut step = 0.9 * proposal;
    let third = Real::from_float(third.to_float());
    for _ in 0..20 {
        if !(step.is_finite() && step > 0.0) {
            break;
        }
        // Rounded down so that the next point lies inside what is proven.
        let exact = Rational::from_f64(step).unwrap_or_default();
        let d = Real::from_rational(&exact, bits);
        let bound = slope.add(&d.mul(curve, bits), bits).sub(&third.mul(&d.square(bits), bits).shift(-1), bits);
        if bound.certainly_positive() {
            return Ok(exact * Rational::from((31, 32)));
        }
        step *= 0.7;
    }
    Err(failed("a step of the proof could not be found"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantities::tail::Status;

    fn peak(half_width: &str, digits: u32) -> TailResult {
        let packet = BoxPacket::new(half_width.parse().unwrap()).unwrap();
        let mut request = PeakRequest::new(packet, "1".parse().unwrap()).unwrap();
        request.digits = digits;
        request.certify().unwrap()
    }

    /// The values of `references/check-values.json`, ids `G_tmax_*` and `G_Pmax_*`.
    #[test]
    fn known_maxima() {
        let text = std::fs::read_to_string("references/check-values.json").unwrap();
        let all: serde_json::Value = serde_json::from_str(&text).unwrap();
        let known = |id: &str| {
            let entry = all["values"].as_array().unwrap().iter().find(|v| v["id"] == id).unwrap();
            let decimals = entry["digits_agreed_by_two_methods"].as_u64().unwrap() as u32;
            let value = entry["value"].as_str().unwrap().parse::<ExactInput>().unwrap().lower().clone();
            let slack = Rational::from((1, 1)) / rug::Integer::from(rug::Integer::u_pow_u(10, decimals));
            (Rational::from(&value - &slack), value + slack)
        };
        for half_width in ["1/100", "1/10", "1", "5"] {
            let found = peak(half_width, 15);
            assert_eq!(found.status, Status::Certified, "{found:?}");
            let at = found.at.as_ref().unwrap();
            for (interval, id) in [(&found.interval, "G_Pmax"), (at, "G_tmax")] {
                let (low, high) = known(&format!("{id}_{half_width}"));
                assert!(*interval.lower() <= high && *interval.upper() >= low, "{half_width} {id} {interval:?}");
            }
            assert!(at.upper().to_f64() - at.lower().to_f64() < 1e-8);
        }
    }

    #[test]
    fn the_tail_scales_with_the_mass() {
        let packet = BoxPacket::new("1/2".parse().unwrap()).unwrap();
        let heavy = PeakRequest::new(packet, "2".parse().unwrap()).unwrap().certify().unwrap();
        let light = peak("1", 15);
        assert!(heavy.interval.intersection(&light.interval).is_some());
        assert!((heavy.at.unwrap().lower().to_f64() * 2.0 - light.at.unwrap().lower().to_f64()).abs() < 1e-8);
    }
}
