//! The Newton-Wigner propagator at exact points: requests and results.
//!
//! See [`crate::routes::propagator`] for the formulas. At time zero the propagator is the delta function: zero
//! away from the source. Negative times give the complex conjugate.

use super::pointwise::{self, Aim, PointRoute, Rectangle};
use super::tail::Status;
use crate::arithmetic::{ExactInput, Interval};
use crate::error::Error;
use crate::routes::Effort;
use crate::routes::propagator::PropagatorProblem;
use rayon::prelude::*;
use rug::{Float, Rational};
use std::time::Instant;

pub use crate::routes::propagator::Dimension;

/// A question for values of the propagator `G(x, t)`.
///
/// ```
/// use coneproof::quantities::propagator::{Dimension, PropagatorRequest};
/// let request = PropagatorRequest::new(Dimension::Three, "1".parse()?, "1".parse()?, vec!["2".parse()?])?;
/// let result = request.certify()?;
/// // i/(2 pi^2) K_2(sqrt 3)/3 is near 0.00659 i.
/// let imaginary = &result.points[0].value.imaginary;
/// assert!(*imaginary.lower() > 0.00658 && *imaginary.upper() < 0.00660);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Clone, Debug)]
pub struct PropagatorRequest {
    /// Dimension of space.
    pub dimension: Dimension,
    /// Mass, not negative.
    pub mass: ExactInput,
    /// Time, of either sign.
    pub time: ExactInput,
    /// Positions: `x` on the line, the distance `r >= 0` from the source otherwise.
    pub at: Vec<ExactInput>,
    /// Relative digits asked for each part, `1..=MAX_DIGITS`.
    pub digits: u32,
}

/// The propagator at one point.
#[derive(Clone, Debug)]
pub struct PropagatorPoint {
    /// The position as read.
    pub position: ExactInput,
    /// The proven enclosure.
    pub value: Rectangle,
    /// Relative digits reached by both parts.
    pub digits: u32,
    /// Whether these are as many as asked.
    pub status: Status,
    /// What each route found.
    pub routes: Vec<PointRoute>,
}

/// Certified values of the propagator.
#[derive(Clone, Debug)]
pub struct PropagatorResult {
    /// One for each position asked, in the same order.
    pub points: Vec<PropagatorPoint>,
    /// Remarks for the reader.
    pub notes: Vec<String>,
    /// Total time taken.
    pub seconds: f64,
}

impl PropagatorResult {
    /// Whether every point has the digits asked.
    pub fn status(&self) -> Status {
        let all = self.points.iter().all(|point| point.status == Status::Certified);
        if all { Status::Certified } else { Status::FewerDigits }
    }
}

impl PropagatorRequest {
    /// A request at 15 digits.
    ///
    /// # Errors
    /// [`Error::BadInput`] or [`Error::Missing`] naming the first field that cannot be used.
    pub fn new(
        dimension: Dimension,
        mass: ExactInput,
        time: ExactInput,
        at: Vec<ExactInput>,
    ) -> Result<PropagatorRequest, Error> {
        let request = PropagatorRequest { dimension, mass, time, at, digits: 15 };
        request.validate()?;
        Ok(request)
    }

    /// Checks all fields together.
    ///
    /// # Errors
    /// As for [`PropagatorRequest::new`]; a position on the light cone `|x| = |t|` is one of them.
    pub fn validate(&self) -> Result<(), Error> {
        pointwise::digits_and_points(self.digits, &self.at)?;
        pointwise::mass(&self.mass)?;
        let time = Rational::from(pointwise::point("time", &self.time)?.abs_ref());
        for position in &self.at {
            let x = pointwise::point("at", position)?;
            if *x < 0 && self.dimension != Dimension::One {
                let wanted = "give the distance from the source, not negative, in two and three dimensions";
                return Err(Error::bad_input("at", position.text(), wanted));
            }
            if Rational::from(x.abs_ref()) == time {
                let wanted =
                    format!("the kernel is singular on the light cone |x| = |t| = {time}; give a point beside it");
                return Err(Error::bad_input("at", position.text(), &wanted));
            }
        }
        Ok(())
    }

    /// Computes the certified enclosures.
    ///
    /// # Errors
    /// [`Error::BadInput`] for a request that cannot be used, [`Error::RoutesDisagree`] for a defect of this program.
    pub fn certify(&self) -> Result<PropagatorResult, Error> {
        self.validate()?;
        let start = Instant::now();
        let points = self.at.par_iter().map(|position| self.at_point(position)).collect::<Result<Vec<_>, _>>()?;
        let mut notes = Vec::new();
        if *self.time.lower() == 0 {
            notes.push("at time zero the propagator is the delta function: zero away from the source".to_owned());
        } else if *self.mass.lower() == 0 {
            notes.push("for mass zero one route: the elementary closed form".to_owned());
        }
        Ok(PropagatorResult { points, notes, seconds: start.elapsed().as_secs_f64() })
    }

    fn at_point(&self, position: &ExactInput) -> Result<PropagatorPoint, Error> {
        let time = self.time.lower();
        if *time == 0 {
            let zero = || Interval::new(Float::new(64), Float::new(64));
            let value = Rectangle { real: zero(), imaginary: zero() };
            let (digits, routes) = (self.digits, Vec::new());
            return Ok(PropagatorPoint {
                position: position.clone(),
                value,
                digits,
                status: Status::Certified,
                routes,
            });
        }
        let problem = PropagatorProblem {
            dimension: self.dimension,
            mass: self.mass.lower().clone(),
            time: Rational::from(time.abs_ref()),
            distance: Rational::from(position.lower().abs_ref()),
        };
        let mut met = pointwise::meet(&problem.routes(), Aim::Parts, self.digits, &Effort::default())?;
        if *time < 0 {
            met.amplitude = met.amplitude.conjugate();
            for route in &mut met.routes {
                route.amplitude = route.amplitude.as_ref().map(Rectangle::conjugate);
            }
        }
        Ok(PropagatorPoint {
            position: position.clone(),
            value: met.amplitude,
            digits: met.digits,
            status: met.status,
            routes: met.routes,
        })
    }
}
