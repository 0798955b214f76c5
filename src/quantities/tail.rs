//! The tail probability: requests, the meeting of the routes, results.
//!
//! A request with exact inputs is scaled exactly to a [`TailProblem`]; each route chosen is driven
//! until its interval has the digits asked, or its effort ends; the intervals must meet and their
//! intersection is the answer. Requests with interval inputs are reduced to exact ones by the
//! monotonicity lemmas in [`super::tail_range`].

use super::meeting::meet;
pub use super::meeting::{RouteReport, Status};
use super::question::{Inputs, Question};
use super::tail_range;
use crate::arithmetic::{Bits, ExactInput, Interval, decimal, rounding};
use crate::error::Error;
use crate::packets::BoxPacket;
use crate::routes::{Bound, Effort, Evaluation, Route, TailProblem, kernel, spectral};
use rug::{Float, Rational};
use std::time::{Duration, Instant};

/// Largest number of digits that can be asked for.
pub const MAX_DIGITS: u32 = 10_000;

/// Largest working precision unless a request states another: tails of 1e-2000000 need less, and
/// what needs more would fill the memory of a small machine.
pub const DEFAULT_MAX_BITS: Bits = 4_000_000;
/// Largest number of bits of an input's numerator or denominator.
const MAX_INPUT_BITS: u32 = 100_000;

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
    /// Largest working precision in bits; `None` stands for [`DEFAULT_MAX_BITS`].
    pub max_bits: Option<Bits>,
    /// Longest time to spend.
    pub time_limit: Option<Duration>,
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
    /// Where the value is taken, for an extremum or a crossing.
    pub at: Option<Interval>,
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
        check_size("half-width", self.packet.half_width())?;
        check_size("mass", &self.mass)?;
        check_size("time", &self.time)?;
        self.beyond.as_ref().map_or(Ok(()), |region| check_size("beyond", region))?;
        if *self.mass.lower() < 0 {
            return Err(Error::bad_input("mass", self.mass.text(), "give a mass that is not negative, such as 0 or 1"));
        }
        if self.digits == 0 || self.digits > MAX_DIGITS {
            let wanted = format!("give a whole number from 1 to {MAX_DIGITS}");
            return Err(Error::bad_input("digits", self.digits, &wanted));
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
        let (interval, mut routes) = tail_range::enclose(self)?;
        let mut interval = as_probability(&interval)?;
        for route in &mut routes {
            route.interval = route.interval.as_ref().map(as_probability).transpose()?;
        }
        if self.side != Side::Both {
            // Both sides are equal: |psi(x,t)| = |psi(-x,t)| for the real even packet.
            interval = halve(&interval);
            for route in &mut routes {
                route.interval = route.interval.as_ref().map(halve);
            }
        }
        let certified = interval.has_relative_digits(self.digits);
        let notes = self.notes(&routes, &interval, certified);
        Ok(TailResult::new(interval, self.digits, routes, notes, start))
    }

    /// What a reader should know beside the numbers.
    fn notes(&self, routes: &[RouteReport], interval: &Interval, certified: bool) -> Vec<String> {
        let note = if routes.is_empty() {
            "at time zero the packet lies inside its box: the probability is exactly zero"
        } else if routes.iter().all(|route| route.interval.is_none()) && *interval.upper() < 1e-9 {
            "no route has bounds: shown is the bound exp(-2E)/(16 m a), E^2 = m^2 ((R - a)^2 - t^2), rounded up"
        } else if routes.iter().all(|route| route.interval.is_none()) {
            "no route has bounds: all that is known is that a probability lies between 0 and 1"
        } else if !certified && routes.iter().all(|route| route.note.is_none()) {
            "the width of the inputs limits the digits"
        } else {
            return Vec::new();
        };
        vec![note.to_owned()]
    }

    /// The effort limits, counted from now.
    pub(super) fn effort(&self) -> Effort {
        let max_bits = Some(self.max_bits.unwrap_or(DEFAULT_MAX_BITS));
        Effort { max_bits, deadline: self.time_limit.and_then(|limit| Instant::now().checked_add(limit)) }
    }
}

impl TailResult {
    /// The result with everything that follows from its interval.
    pub(super) fn new(
        interval: Interval,
        digits: u32,
        routes: Vec<RouteReport>,
        notes: Vec<String>,
        start: Instant,
    ) -> TailResult {
        let certified = interval.has_relative_digits(digits);
        TailResult {
            value: decimal::guaranteed_decimal(&interval, digits),
            digits: interval.relative_digits(digits),
            status: if certified { Status::Certified } else { Status::FewerDigits },
            notes,
            interval,
            routes,
            at: None,
            seconds: start.elapsed().as_secs_f64(),
        }
    }
}

/// The region of the positions that count, in the names given for its edge.
pub(super) fn region(side: Side, at_cone: bool, edge: &str) -> String {
    match side {
        Side::Both => format!("|x| > {edge}"),
        Side::Right => format!("x > {edge}"),
        Side::Left if at_cone => format!("x < -({edge})"),
        Side::Left => format!("x < -{edge}"),
    }
}

impl Question for TailRequest {
    fn inputs(&self) -> Inputs {
        Inputs::of_packet(BoxPacket::NAME)
            .with("half_width", self.packet.half_width().text())
            .with("mass", self.mass.text())
            .with("time", self.time.text())
            .with("beyond", self.beyond.as_ref().map_or("cone", |region| region.text()))
            .with("side", self.side.name())
            .with("digits", self.digits.to_string())
            .with("route", self.routes.name())
            .with_optional("max_bits", self.max_bits.map(|bits| bits.to_string()))
            .with_optional("time_limit", self.time_limit.map(|limit| limit.as_secs_f64().to_string()))
    }

    fn formula(&self) -> String {
        let edge = if self.beyond.is_some() { "beyond" } else { "half_width + |time|" };
        format!("P({})", region(self.side, self.beyond.is_none(), edge))
    }

    fn words(&self) -> String {
        let (place, edge) = match self.beyond {
            None => ("outside its light cone", "a + |t|"),
            Some(_) => ("beyond a given distance outside its light cone", "R"),
        };
        let region = region(self.side, self.beyond.is_none(), edge);
        format!("Probability of finding the particle {place}: {region}")
    }

    fn digits(&self) -> u32 {
        self.digits
    }

    fn certify(&self) -> Result<TailResult, Error> {
        TailRequest::certify(self)
    }
}

/// Exact arithmetic on numbers of a million digits would take minutes.
pub(super) fn check_size(field: &str, input: &ExactInput) -> Result<(), Error> {
    let small = |end: &Rational| end.numer().significant_bits().max(end.denom().significant_bits()) <= MAX_INPUT_BITS;
    if small(input.lower()) && small(input.upper()) {
        return Ok(());
    }
    let wanted = "give a number with at most 30000 digits before and behind the point, between 1e-30000 and 1e30000";
    Err(Error::bad_input(field, input.text(), wanted))
}

/// An exact number for a sentence: as a fraction if that is short, else rounded up.
pub(super) fn readable(value: &Rational) -> String {
    if value.numer().significant_bits().max(value.denom().significant_bits()) <= 64 {
        return value.to_string();
    }
    decimal::upper_decimal(&rounding::up(128, value), 17)
}

/// The part of an enclosure that can be a probability.
pub(super) fn as_probability(interval: &Interval) -> Result<Interval, Error> {
    let unit = Interval::new(Float::new(64), Float::with_val(64, 1));
    let found = || format!("the enclosure [{}, {}] of a probability", interval.lower(), interval.upper());
    interval.intersection(&unit).ok_or_else(|| Error::Internal { found: found() })
}

/// Runs routes to a probability: their meeting, which is all of `[0, 1]` if no route has bounds, and their reports.
pub(super) fn meet_probability(
    routes: &[Box<dyn Evaluation>],
    digits: u32,
    effort: &Effort,
) -> Result<(Interval, Vec<RouteReport>), Error> {
    let list: Vec<&dyn Evaluation> = routes.iter().map(AsRef::as_ref).collect();
    let (meeting, mut reports) = meet(&list, digits, effort)?;
    for report in &mut reports {
        report.interval = report.interval.as_ref().map(as_probability).transpose()?;
    }
    let unknown = || Interval::new(Float::new(64), Float::with_val(64, 1));
    Ok((as_probability(&meeting.unwrap_or_else(unknown))?, reports))
}

/// Exact half of an interval.
fn halve(interval: &Interval) -> Interval {
    let (lower, upper) = (interval.lower(), interval.upper());
    // Exact but for underflow, which has to go outward too.
    Interval::new(rounding::down(lower.prec(), lower >> 1u32), rounding::up(upper.prec(), upper >> 1u32))
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
    if below_arithmetic(problem) {
        let reports =
            chosen.iter().map(|route| RouteReport::idle(route.name(), route.method(problem), BELOW_ARITHMETIC));
        return Ok((without_routes(problem), reports.collect()));
    }
    let bound: Vec<Bound> = chosen.into_iter().map(|route| Bound { route, problem }).collect();
    let evaluations: Vec<&dyn Evaluation> = bound.iter().map(|bound| bound as &dyn Evaluation).collect();
    let (meeting, reports) = meet(&evaluations, digits, effort)?;
    Ok((meeting.unwrap_or_else(|| without_routes(problem)), reports))
}

/// Why a route does not run.
const BELOW_ARITHMETIC: &str = "the probability is below 1e-300000000, outside the range of the arithmetic";

/// Whether `exp(-2E)`, `E^2 = d (d + 2t)`, is below the smallest binary number: the exponents of
/// MPFR's numbers reach down to `-2^30` by default, and `2 * 3.7e8 / ln 2` is just under `2^30`.
fn below_arithmetic(problem: &TailProblem) -> bool {
    let (t, d) = (&problem.time, &problem.distance);
    !problem.massless && (d + Rational::from(t * 2)) * d > Rational::from(370_000_000u64).square()
}

/// What is known without a route: a probability lies between zero and one, and further
/// `P <= exp(-2E)/(16 a)` (unit mass). In the double integral of the spectral route each factor `w`
/// is at most `exp(-E)/4`, and `Int Int_0^inf dx dy/(cosh x + cosh y) = pi^2/4`, so
/// `P = 4/(pi^2 a) S <= 4/(pi^2 a) exp(-2E) pi^2/64`. If `E >= 3.7e8`, `exp(-2E) < 1e-321000000`;
/// the width `a` is above `1e-1000000` as the inputs have at most [`MAX_INPUT_BITS`] bits, so `P`
/// is below `1e-300000000`.
pub(super) fn without_routes(problem: &TailProblem) -> Interval {
    let mut upper = Float::with_val(64, 1);
    if below_arithmetic(problem) {
        let power = rounding::down(64, Float::u_pow_u(10, 300_000_000));
        upper = rounding::up(64, power.recip_ref());
    }
    Interval::new(Float::new(64), upper)
}
