//! Unrelated ways to the same probability.
//!
//! A [`Route`] gets an exact [`TailProblem`] and a goal in digits and returns an enclosure with the
//! data that an outsider needs to repeat it. Routes share the arithmetic and nothing else.

pub mod boost;
pub mod contour;
pub mod cut;
pub mod density;
mod descent;
mod estimate;
pub mod gaussian;
pub mod kernel;
pub mod lattice;
pub mod panels;
pub mod pointwise;
pub mod propagator;
pub mod spectral;

use crate::arithmetic::{Bits, Interval};
use rug::Rational;
use std::time::Instant;

/// The two-sided tail of a box packet in dimensionless form, all numbers exact.
///
/// Only the ratios of lengths, time and inverse mass matter (with `hbar = c = 1`). For positive
/// mass the unit is `1/m`: `half_width = m a`, `time = m |t|`, `distance = m (R - a - |t|)`. For
/// mass zero the unit is the half-width: `half_width = 1`, `time = |t| / a`,
/// `distance = (R - a - |t|) / a`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct TailProblem {
    /// Half-width, positive.
    pub half_width: Rational,
    /// Time, positive.
    pub time: Rational,
    /// Distance of the region from the light cone, not negative.
    pub distance: Rational,
    /// Whether the mass is zero.
    pub massless: bool,
}

/// Limits on the work that a route may do.
#[derive(Clone, Copy, Debug, Default)]
pub struct Effort {
    /// Largest working precision.
    pub max_bits: Option<Bits>,
    /// Moment at which to stop.
    pub deadline: Option<Instant>,
}

impl Effort {
    /// Fails once the deadline has passed; called in every long loop.
    pub fn check(&self) -> Result<(), RouteFailure> {
        match self.deadline {
            Some(deadline) if Instant::now() >= deadline => Err(RouteFailure::TimeLimit),
            _ => Ok(()),
        }
    }

    /// Fails if the precision needed is above the limit.
    pub fn allow_bits(&self, bits: Bits) -> Result<(), RouteFailure> {
        match self.max_bits {
            Some(limit) if bits > limit => Err(RouteFailure::BitLimit { needed: bits }),
            _ => Ok(()),
        }
    }
}

/// What a route found.
#[derive(Clone, Debug)]
pub struct RouteOutcome {
    /// Enclosure of the two-sided probability.
    pub interval: Interval,
    /// Working precision in bits.
    pub bits: Bits,
    /// Number of nodes (quadrature points or series coefficients).
    pub nodes: usize,
    /// Named numbers that fix the computation: cut-offs, steps, error bounds.
    pub witness: Vec<(String, String)>,
}

/// Why a route gives no enclosure.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum RouteFailure {
    /// The deadline passed.
    TimeLimit,
    /// More bits would be needed than allowed.
    BitLimit {
        /// Bits that would be needed.
        needed: Bits,
    },
    /// The route cannot do this problem within reason.
    OutOfReach {
        /// Why, in one sentence.
        reason: String,
    },
}

impl std::fmt::Display for RouteFailure {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            RouteFailure::TimeLimit => write!(f, "the time limit was reached"),
            RouteFailure::BitLimit { needed } => write!(f, "{needed} bits would be needed, more than the limit"),
            RouteFailure::OutOfReach { reason } => write!(f, "{reason}"),
        }
    }
}

impl std::error::Error for RouteFailure {}

/// One way from a problem to an enclosure.
pub trait Route: Sync {
    /// Name on the command line and in certificates.
    fn name(&self) -> &'static str;

    /// One sentence on the method, for certificates.
    fn method(&self, problem: &TailProblem) -> &'static str;

    /// An enclosure aiming at a relative width of `10^-digits`; the width is the caller's to check.
    ///
    /// # Errors
    /// [`RouteFailure`] if the effort does not suffice or the problem is out of reach.
    fn evaluate(&self, problem: &TailProblem, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure>;
}

/// One way to one probability, with the question built in: what [`crate::quantities`] drives.
///
/// A [`Route`] with its problem is one (see [`Bound`]); routes of other packets implement it directly.
pub trait Evaluation: Sync {
    /// Name on the command line and in certificates: `kernel`, `spectral`, ...
    fn name(&self) -> &'static str;

    /// One sentence on the method, for certificates.
    fn method(&self) -> &'static str;

    /// An enclosure of the probability aiming at a relative width of `10^-digits`; the width is the caller's to check.
    ///
    /// # Errors
    /// [`RouteFailure`] if the effort does not suffice or the problem is out of reach.
    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure>;
}

/// A route with its problem.
#[derive(Clone, Copy)]
pub struct Bound<'a> {
    /// The route.
    pub route: &'a dyn Route,
    /// The problem.
    pub problem: &'a TailProblem,
}

impl Evaluation for Bound<'_> {
    fn name(&self) -> &'static str {
        self.route.name()
    }

    fn method(&self) -> &'static str {
        self.route.method(self.problem)
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        self.route.evaluate(self.problem, digits, effort)
    }
}
