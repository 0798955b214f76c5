//! The meeting of unrelated routes.
//!
//! Each route is driven until its interval has the digits asked or its effort ends. All intervals contain the same
//! number, so they must have a common part, which is the answer; if they have none, the program contradicts itself and
//! gives no answer.

use crate::arithmetic::{Bits, Interval, decimal};
use crate::error::Error;
use crate::routes::{Effort, Evaluation, RouteFailure, RouteOutcome};
use std::thread;
use std::time::{Duration, Instant};

/// From this many digits on, routes are worth a thread each.
const PARALLEL_FROM: u32 = 40;

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

impl RouteReport {
    /// The report of a route that does not run.
    pub(super) fn idle(name: &'static str, method: &'static str, reason: &str) -> RouteReport {
        let note = Some(reason.to_owned());
        RouteReport { name, method, interval: None, bits: 0, nodes: 0, seconds: 0.0, note, witness: Vec::new() }
    }
}

/// Runs the routes and intersects their intervals: `None` if no route has one.
///
/// # Errors
/// [`Error::RoutesDisagree`] if two intervals exclude each other.
pub(super) fn meet(
    routes: &[&dyn Evaluation],
    digits: u32,
    effort: &Effort,
) -> Result<(Option<Interval>, Vec<RouteReport>), Error> {
    // Under a time limit the routes run side by side, so that a slow one takes no time from the others.
    let side_by_side = routes.len() > 1 && (effort.deadline.is_some() || digits >= PARALLEL_FROM);
    let reports: Vec<RouteReport> = if side_by_side {
        in_threads(routes, digits, effort)?
    } else {
        routes.iter().map(|route| drive(*route, digits, effort)).collect()
    };
    let mut meeting: Option<Interval> = None;
    for interval in reports.iter().filter_map(|report| report.interval.as_ref()) {
        meeting = Some(match meeting {
            None => interval.clone(),
            Some(so_far) => so_far.intersection(interval).ok_or_else(|| disagreement(&reports))?,
        });
    }
    Ok((meeting, reports))
}

/// Drives every route in a thread of its own.
fn in_threads(routes: &[&dyn Evaluation], digits: u32, effort: &Effort) -> Result<Vec<RouteReport>, Error> {
    thread::scope(|scope| {
        let threads: Vec<_> = routes.iter().map(|route| scope.spawn(|| drive(*route, digits, effort))).collect();
        let joined = threads.into_iter().map(|thread| thread.join());
        joined.map(|report| report.map_err(|_| Error::Internal { found: "a route panicked".to_owned() })).collect()
    })
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
fn drive(route: &dyn Evaluation, digits: u32, effort: &Effort) -> RouteReport {
    const ATTEMPTS: usize = 5;
    let start = Instant::now();
    let mut best: Option<RouteOutcome> = None;
    let mut note = None;
    // Under a time limit, a quick first answer makes sure that there is an honest interval.
    let quick = effort.deadline.is_some() && digits > 30;
    let mut goal = if quick { 15 } else { digits };
    for _ in 0..ATTEMPTS {
        match evaluate_within(route, goal, effort) {
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
fn evaluate_within(route: &dyn Evaluation, goal: u32, effort: &Effort) -> Result<(RouteOutcome, bool), RouteFailure> {
    let mut goal = goal;
    let mut cut = false;
    loop {
        match route.evaluate(goal, effort) {
            Err(RouteFailure::BitLimit { needed }) if goal > 1 => {
                // Bits grow by at most needed / goal for each digit, so this never gives up too much.
                let excess = needed.saturating_sub(effort.max_bits.unwrap_or(needed));
                let digits = u64::from(excess) * u64::from(goal) / u64::from(needed.max(1));
                goal = goal.saturating_sub(u32::try_from(digits).unwrap_or(goal).max(1)).max(1);
                cut = true;
            }
            Err(failure) => return Err(failure),
            Ok(outcome) => return Ok((outcome, cut)),
        }
    }
}

fn report(route: &dyn Evaluation, best: Option<RouteOutcome>, note: Option<String>, elapsed: Duration) -> RouteReport {
    let (interval, bits, nodes, witness) = match best {
        Some(outcome) => (Some(outcome.interval), outcome.bits, outcome.nodes, outcome.witness),
        None => (None, 0, 0, Vec::new()),
    };
    let seconds = elapsed.as_secs_f64();
    RouteReport { name: route.name(), method: route.method(), interval, bits, nodes, seconds, note, witness }
}
