//! The question about a gaussian packet, what may be asked of its routes, and their common loop.
//!
//! Unlike a compact packet, a gaussian has no light cone of its own: regions are stated by positions. Positions, times
//! and `sigma` are in units of `1/m`, momenta in units of `m`, so that the mass is one.

mod closed_form;
mod estimate;

pub use closed_form::AtRelease;
pub(super) use estimate::log_right_tail;

use super::{Effort, Evaluation, RouteFailure, RouteOutcome, contour::Contour, lattice::Lattice};
use crate::arithmetic::{Bits, Real};
use crate::error::Error;
use rug::Rational;
use std::f64::consts::{LN_2, LN_10};

/// Where the particle is looked for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Region {
    /// `|x| > R`, with `R > 0`.
    Outside(Rational),
    /// `|x| < R`, with `R > 0`.
    Within(Rational),
    /// `x > x1`.
    RightOf(Rational),
    /// `x < x1`.
    LeftOf(Rational),
    /// `x1 < x < x2`.
    Between(Rational, Rational),
}

impl Region {
    fn validate(&self) -> Result<(), Error> {
        let positive = "give a distance from the centre greater than 0, such as 2, 0.5 or 7/3";
        match self {
            Region::Outside(r) if *r <= 0 => Err(Error::bad_input("beyond", r, positive)),
            Region::Within(r) if *r <= 0 => Err(Error::bad_input("within", r, positive)),
            Region::Between(low, high) if low >= high => {
                let wanted = "give the left end first and the right end second, such as -1 2";
                Err(Error::bad_input("between", format!("{low} {high}"), wanted))
            }
            _ => Ok(()),
        }
    }

    fn times(&self, factor: &Rational) -> Region {
        let scaled = |x: &Rational| Rational::from(x * factor);
        match self {
            Region::Outside(r) => Region::Outside(scaled(r)),
            Region::Within(r) => Region::Within(scaled(r)),
            Region::RightOf(x) => Region::RightOf(scaled(x)),
            Region::LeftOf(x) => Region::LeftOf(scaled(x)),
            Region::Between(low, high) => Region::Between(scaled(low), scaled(high)),
        }
    }
}

/// The probability of a region for a gaussian packet, in units of the mass, all numbers exact.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct GaussianProblem {
    sigma: Rational,
    momentum: Rational,
    time: Rational,
    region: Region,
}

impl GaussianProblem {
    /// A packet of standard deviation `sigma > 0` and mean momentum `momentum`, of mass `mass > 0`, at `time` (of either
    /// sign), all in one system of units with `hbar = c = 1`.
    ///
    /// # Errors
    /// [`Error::BadInput`] naming the field: `sigma`, `mass`, or the region's `beyond`, `within` or `between`.
    pub fn new(
        sigma: &Rational,
        momentum: &Rational,
        mass: &Rational,
        time: &Rational,
        region: &Region,
    ) -> Result<GaussianProblem, Error> {
        if *sigma <= 0 {
            let wanted = "give a standard deviation of |psi0|^2 greater than 0, such as 1, 0.5 or 1/3";
            return Err(Error::bad_input("sigma", sigma, wanted));
        }
        if *mass <= 0 {
            return Err(Error::bad_input("mass", mass, "the gaussian packet needs a mass greater than 0, such as 1"));
        }
        region.validate()?;
        Ok(GaussianProblem {
            sigma: Rational::from(sigma * mass),
            momentum: Rational::from(momentum / mass),
            time: Rational::from(time * mass),
            region: region.times(mass),
        })
    }

    /// The standard deviation, in units of `1/m`.
    pub fn sigma(&self) -> &Rational {
        &self.sigma
    }

    /// The mean momentum, in units of `m`.
    pub fn momentum(&self) -> &Rational {
        &self.momentum
    }

    /// The time, in units of `1/m`.
    pub fn time(&self) -> &Rational {
        &self.time
    }

    /// The region, in units of `1/m`.
    pub fn region(&self) -> &Region {
        &self.region
    }

    /// The ways to this probability: two unrelated routes, and before them the closed form where there is one.
    pub fn evaluations(&self) -> Vec<Box<dyn Evaluation>> {
        let mut ways: Vec<Box<dyn Evaluation>> = Vec::new();
        if self.time == 0 {
            ways.push(Box::new(AtRelease::new(self.clone())));
        }
        ways.push(Box::new(Lattice::new(self.clone())));
        ways.push(Box::new(Contour::new(self.clone())));
        ways
    }

    /// The inputs as doubles, if the double range suffices for choosing steps.
    pub(super) fn estimates(&self) -> Result<Estimates, RouteFailure> {
        let ends = match &self.region {
            Region::Outside(r) | Region::Within(r) => vec![r.clone()],
            Region::RightOf(x) | Region::LeftOf(x) => vec![x.clone()],
            Region::Between(low, high) => vec![low.clone(), high.clone()],
        };
        let sane = |value: &Rational| *value == 0 || (1e-60..1e60).contains(&value.to_f64().abs());
        if ![&self.sigma, &self.momentum, &self.time].into_iter().chain(&ends).all(sane) {
            return Err(out_of_reach("the inputs in units of the mass are outside 1e-60 to 1e60"));
        }
        Ok(Estimates { sigma: self.sigma.to_f64(), momentum: self.momentum.to_f64(), time: self.time.to_f64() })
    }

    /// A rough natural logarithm of the probability.
    pub(super) fn log_probability(&self) -> Result<f64, RouteFailure> {
        let packet = self.estimates()?;
        let right = |x: &Rational| log_right_tail(packet, x.to_f64());
        let left = |x: &Rational| log_right_tail(packet.mirrored(), -x.to_f64());
        Ok(match &self.region {
            Region::Outside(r) => right(r).max(left(&Rational::from(-r))),
            Region::Within(r) => right(&Rational::from(-r)).min(left(r)),
            Region::RightOf(x) => right(x),
            Region::LeftOf(x) => left(x),
            Region::Between(low, high) => right(low).min(left(high)),
        })
    }
}

/// The packet in double precision, for choices only.
#[derive(Clone, Copy, Debug)]
pub(super) struct Estimates {
    /// Standard deviation.
    pub sigma: f64,
    /// Mean momentum.
    pub momentum: f64,
    /// Time.
    pub time: f64,
}

impl Estimates {
    /// The packet seen in a mirror.
    pub fn mirrored(self) -> Estimates {
        Estimates { momentum: -self.momentum, ..self }
    }
}

pub(super) fn out_of_reach(reason: &str) -> RouteFailure {
    RouteFailure::OutOfReach { reason: reason.to_owned() }
}

/// What one pass of a route found.
pub(super) struct Pass {
    /// The probability.
    pub value: Real,
    /// Working precision.
    pub bits: Bits,
    /// Nodes used.
    pub nodes: usize,
    /// Named numbers that fix the computation.
    pub witness: Vec<(String, String)>,
}

/// Repeats a route's pass, which gets the absolute error to aim at as `exp(-goal)`, until the relative width is reached.
///
/// The probability is not known in advance, only roughly estimated; the interval of one pass gives the goal of the next.
/// Every pass is an enclosure by itself, so nothing here decides containment.
pub(super) fn refine(
    problem: &GaussianProblem,
    digits: u32,
    pass: impl Fn(f64) -> Result<Pass, RouteFailure>,
) -> Result<RouteOutcome, RouteFailure> {
    const PASSES: usize = 5;
    let relative = f64::from(digits) * LN_10 + 1.5;
    let mut goal = relative - problem.log_probability()?.min(0.0);
    let mut best: Option<RouteOutcome> = None;
    for _ in 0..PASSES {
        let found = match pass(goal) {
            Ok(found) => found,
            Err(failure) => return best.filter(|found| found.interval.has_relative_digits(1)).ok_or(failure),
        };
        let interval = found.value.to_interval(found.bits).clamp_non_negative();
        let size = -crate::arithmetic::Magnitude::from_float(interval.lower()).log2_estimate() * LN_2;
        let done = interval.has_relative_digits(digits);
        best = Some(RouteOutcome { interval, bits: found.bits, nodes: found.nodes, witness: found.witness });
        if done {
            break;
        }
        goal = if size.is_finite() { (relative + size).max(goal + 2.0) } else { 1.6 * goal + 20.0 };
    }
    best.ok_or_else(|| out_of_reach("no pass was made"))
}

/// Stops when the limits of the effort or of sense are passed.
pub(super) fn allow(effort: &Effort, nodes: f64, bits: f64) -> Result<Bits, RouteFailure> {
    const MAX_NODES: f64 = 120_000.0;
    const MAX_TOTAL: f64 = 2e8;
    if !(nodes <= MAX_NODES && nodes * bits <= MAX_TOTAL) {
        return Err(out_of_reach("too many nodes would be needed"));
    }
    let bits = bits.ceil() as Bits;
    effort.allow_bits(bits)?;
    effort.check()?;
    Ok(bits)
}
