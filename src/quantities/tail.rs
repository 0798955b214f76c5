//! The tail probability: requests, the meeting of the routes, results.
//!
//! A request with exact inputs is scaled exactly to a [`TailProblem`]; each route chosen is driven
//! until its interval has the digits asked, or its effort ends; the intervals must meet and their
//! intersection is the answer. Requests with interval inputs are reduced to exact ones by the
//! monotonicity lemmas in [`super::tail_range`].

use super::tail_range;
use crate::arithmetic::{Bits, ExactInput, Interval, decimal, rounding};
use crate::error::Error;
use crate::packets::BoxPacket;
use crate::routes::{Effort, Route, RouteFailure, RouteOutcome, TailProblem, kernel, spectral};
use rug::{Float, Rational};
use std::time::{Duration, Instant};

/// Largest number of digits that can be asked for.
pub const MAX_DIGITS: u32 = 10_000;

/// Which side of the packet counts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// `x < -R`.
    Left,
    /// `x > R`.
    Right,
    /// `|x| > R`.
    Both,
}

impl Side {
    /// The name on the command line and in certificates.
    pub fn name(self) -> &'static str {
        match self {
            Side::Left => "left",
            Side::Right => "right",
            Side::Both => "both",
        }
    }
}

/// Which routes run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RouteChoice {
    /// Position space only.
    Kernel,
    /// Momentum space only.
    Spectral,
    /// Both; their intervals must meet.
    Both,
}

impl RouteChoice {
    /// The name on the command line and in certificates.
    pub fn name(self) -> &'static str {
        match self {
            RouteChoice::Kernel => "kernel",
            RouteChoice::Spectral => "spectral",
            RouteChoice::Both => "both",
        }
    }
}

/// A question for a tail probability.
///
/// ```
/// use coneproof::packets::BoxPacket;
/// use coneproof::quantities::tail::TailRequest;
/// let packet = BoxPacket::new("1".parse()?)?;
/// let result = TailRequest::new(packet, "1".parse()?, "1".parse()?)?.certify()?;
/// assert!(result.value.is_some_and(|v| v.text.starts_with("0.0213751908423")));
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Clone, Debug)]
pub struct TailRequest {
    /// The packet released at time zero.
    pub packet: BoxPacket,
    /// Mass, not negative.
    pub mass: ExactInput,
    /// Time, of either sign.
    pub time: ExactInput,
    /// The distance `R >= a + |t|`; `None` stands for the light cone `a + |t|` itself.
    pub beyond: Option<ExactInput>,
    /// Which side counts.
    pub side: Side,
    /// Relative digits asked, `1..=MAX_DIGITS`.
    pub digits: u32,
    /// Which routes run.
    pub routes: RouteChoice,
    /// Largest working precision in bits.
    pub max_bits: Option<Bits>,
    /// Longest time to spend.
    pub time_limit: Option<Duration>,
}

/// Whether the digits asked were reached.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Status {
    /// `(upper - lower) <= 10^-digits * lower` is proven.
    Certified,
    /// The interval is proven, but wider than asked.
    FewerDigits,
}

impl Status {
    /// The name in reports and certificates.
    pub fn name(self) -> &'static str {
        match self {
            Status::Certified => "certified",
            Status::FewerDigits => "fewer digits",
        }
    }
}

/// What one route contributed.
#[derive(Clone, Debug)]
pub struct RouteReport {
    /// Name of the route.
    pub name: &'static str,
    /// One sentence on the method.
    pub method: &'static str,
    /// Its own enclosure, if it has one.
    pub interval: Option<Interval>,
    /// Working precision in bits.
    pub bits: Bits,
    /// Number of nodes.
    pub nodes: usize,
    /// Time taken.
    pub seconds: f64,
    /// Why it has no enclosure, or fewer digits than asked.
    pub note: Option<String>,
    /// Named numbers that fix the computation.
    pub witness: Vec<(String, String)>,
}

/// A certified tail probability.
#[derive(Clone, Debug)]
pub struct TailResult {
    /// The proven enclosure.
    pub interval: Interval,
    /// The value with all printed digits guaranteed, if at least one is.
    pub value: Option<decimal::GuaranteedDecimal>,
    /// Relative digits reached.
    pub digits: u32,
    /// Whether these are as many as asked.
    pub status: Status,
    /// What each route found.
    pub routes: Vec<RouteReport>,
    /// Remarks for the reader, such as what limits the digits.
    pub notes: Vec<String>,
    /// Total time taken.
    pub seconds: f64,
}

impl TailRequest {
    /// A request for both sides beyond the cone at 15 digits by both routes.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the mass may be negative.
    pub fn new(packet: BoxPacket, mass: ExactInput, time: ExactInput) -> Result<TailRequest, Error> {
        let request = TailRequest {
            packet,
            mass,
            time,
            beyond: None,
            side: Side::Both,
            digits: 15,
            routes: RouteChoice::Both,
            max_bits: None,
            time_limit: None,
        };
        request.validate()?;
        Ok(request)
    }

    /// Checks all fields together.
    ///
    /// # Errors
    /// [`Error::BadInput`] naming the first field that cannot be used.
    pub fn validate(&self) -> Result<(), Error> {
        if *self.mass.lower() < 0 {
            return Err(Error::bad_input("mass", self.mass.text(), "give a mass that is not negative, such as 0 or 1"));
        }
        if self.digits == 0 || self.digits > MAX_DIGITS {
            return Err(Error::bad_input("digits", self.digits, "give a whole number from 1 to 10000"));
        }
        if self.max_bits.is_some_and(|bits| bits < 64) {
            let was = self.max_bits.unwrap_or(0);
            return Err(Error::bad_input("max-bits", was, "give a working precision of at least 64 bits"));
        }
        let (_, latest) = tail_range::absolute(&self.time);
        let edge = self.packet.half_width().upper() + latest;
        match &self.beyond {
            Some(region) if *region.lower() < edge => {
                let edge = readable(&edge);
                let wanted = format!("the light cone ends at half-width + |time| = {edge}; give that or more");
                Err(Error::bad_input("beyond", region.text(), &wanted))
            }
            _ => Ok(()),
        }
    }

    /// Computes the certified enclosure.
    ///
    /// # Errors
    /// [`Error::BadInput`] for a request that cannot be used, [`Error::RoutesDisagree`] or
    /// [`Error::Internal`] for a defect of this program.
    pub fn certify(&self) -> Result<TailResult, Error> {
        self.validate()?;
        let start = Instant::now();
        let mut result = tail_range::certify(self)?;
        if self.side != Side::Both {
            // Both sides are equal: |psi(x,t)| = |psi(-x,t)| for the real even packet.
            result.interval = halve(&result.interval);
            for route in &mut result.routes {
                route.interval = route.interval.as_ref().map(halve);
            }
        }
        result.digits = result.interval.relative_digits(self.digits);
        result.status =
            if result.interval.has_relative_digits(self.digits) { Status::Certified } else { Status::FewerDigits };
        result.value = decimal::guaranteed_decimal(&result.interval, self.digits);
        result.seconds = start.elapsed().as_secs_f64();
        Ok(result)
    }

    /// The effort limits, counted from now.
    pub(super) fn effort(&self) -> Effort {
        Effort { max_bits: self.max_bits, deadline: self.time_limit.map(|limit| Instant::now() + limit) }
    }
}

/// An exact number for a sentence: as a fraction if that is short, else rounded up.
fn readable(value: &Rational) -> String {
    if value.numer().significant_bits().max(value.denom().significant_bits()) <= 64 {
        return value.to_string();
    }
    decimal::upper_decimal(&rounding::up(128, value), 17)
}

/// Exact half of an interval.
fn halve(interval: &Interval) -> Interval {
    Interval::new(interval.lower().clone() >> 1u32, interval.upper().clone() >> 1u32)
}

/// The exactly scaled problem for exact inputs; `None` when the time is zero, where the
/// probability of any region outside the packet is exactly zero.
pub fn scale(
    half_width: &Rational,
    mass: &Rational,
    time: &Rational,
    beyond: Option<&Rational>,
) -> Option<TailProblem> {
    if *time == 0 {
        return None;
    }
    let time = Rational::from(time.abs_ref());
    let distance = beyond.map_or_else(Rational::new, |r| Rational::from(r - half_width) - &time);
    let massless = *mass == 0;
    let unit = if massless { Rational::from(half_width.recip_ref()) } else { mass.clone() };
    Some(TailProblem {
        half_width: Rational::from(half_width * &unit),
        time: time * &unit,
        distance: distance * &unit,
        massless,
    })
}

/// Runs the chosen routes on one exact problem and intersects their intervals.
pub(super) fn run_routes(
    problem: &TailProblem,
    choice: RouteChoice,
    digits: u32,
    effort: &Effort,
) -> Result<(Interval, Vec<RouteReport>), Error> {
    let chosen: Vec<&dyn Route> = match choice {
        RouteChoice::Kernel => vec![&kernel::KERNEL],
        RouteChoice::Spectral => vec![&spectral::SPECTRAL],
        RouteChoice::Both => vec![&kernel::KERNEL, &spectral::SPECTRAL],
    };
    let reports: Vec<RouteReport> = chosen.into_iter().map(|route| drive(route, problem, digits, effort)).collect();
    let mut meeting: Option<Interval> = None;
    for interval in reports.iter().filter_map(|report| report.interval.as_ref()) {
        meeting = Some(match meeting {
            None => interval.clone(),
            Some(so_far) => so_far.intersection(interval).ok_or_else(|| disagreement(&reports))?,
        });
    }
    // With no route at all, a probability still lies between zero and one.
    let unknown = || Interval::new(Float::new(64), Float::with_val(64, 1));
    Ok((meeting.unwrap_or_else(unknown), reports))
}

fn disagreement(reports: &[RouteReport]) -> Error {
    let shown = |report: &RouteReport| {
        report.interval.as_ref().map(|interval| {
            let lower = decimal::lower_decimal(interval.lower(), 30);
            (report.name.to_owned(), lower, decimal::upper_decimal(interval.upper(), 30))
        })
    };
    Error::RoutesDisagree { intervals: reports.iter().filter_map(shown).collect() }
}

/// Raises the goal of one route until its interval has the digits asked or the effort ends.
fn drive(route: &dyn Route, problem: &TailProblem, digits: u32, effort: &Effort) -> RouteReport {
    const ATTEMPTS: usize = 5;
    let start = Instant::now();
    let mut best: Option<RouteOutcome> = None;
    let mut note = None;
    // Under a time limit, a quick first answer makes sure that there is an honest interval.
    let quick = effort.deadline.is_some() && digits > 30;
    let mut goal = if quick { 15 } else { digits };
    for _ in 0..ATTEMPTS {
        match evaluate_within(route, problem, goal, effort) {
            Ok((outcome, cut)) => {
                let reached = outcome.interval.relative_digits(digits);
                let improves = best.as_ref().is_none_or(|b| b.interval.relative_digits(digits) < reached);
                if improves || best.is_none() {
                    best = Some(outcome);
                }
                if reached >= digits || cut {
                    note = (reached < digits).then(|| "the limit on bits was reached".to_owned());
                    break;
                }
                note = Some("the interval did not become narrow enough".to_owned());
                goal = if goal < digits { digits } else { goal + (digits - reached) + 3 };
            }
            Err(failure) => {
                note = Some(failure.to_string());
                break;
            }
        }
    }
    let reached = best.as_ref().is_some_and(|b| b.interval.has_relative_digits(digits));
    report(route, best, if reached { None } else { note }, start.elapsed())
}

/// One evaluation; when bits are short, the largest goal that the limit allows (flagged `true`).
fn evaluate_within(
    route: &dyn Route,
    problem: &TailProblem,
    goal: u32,
    effort: &Effort,
) -> Result<(RouteOutcome, bool), RouteFailure> {
    let mut goal = goal;
    let mut cut = false;
    loop {
        match route.evaluate(problem, goal, effort) {
            Err(RouteFailure::BitLimit { needed }) if goal > 1 => {
                let excess = needed.saturating_sub(effort.max_bits.unwrap_or(needed));
                goal = goal.saturating_sub((f64::from(excess) * std::f64::consts::LOG10_2) as u32 + 1).max(1);
                cut = true;
            }
            Err(failure) => return Err(failure),
            Ok(outcome) => return Ok((outcome, cut)),
        }
    }
}

fn report(route: &dyn Route, best: Option<RouteOutcome>, note: Option<String>, elapsed: Duration) -> RouteReport {
    let (interval, bits, nodes, witness) = match best {
        Some(outcome) => (Some(outcome.interval), outcome.bits, outcome.nodes, outcome.witness),
        None => (None, 0, 0, Vec::new()),
    };
    let seconds = elapsed.as_secs_f64();
    RouteReport { name: route.name(), method: route.method(), interval, bits, nodes, seconds, note, witness }
}
