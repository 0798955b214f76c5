//! The density `|psi(x, t)|^2` and the amplitude `psi(x, t)` at exact points: requests and results.
//!
//! See [`crate::routes::density`] for the formulas. Special places:
//!
//! * `x = ±a ± t`, `t != 0`: the light cones of the packet's jumps. The amplitude has a logarithm there: no number is
//!   given, the answer is [`PointValue::Unbounded`].
//! * `t = 0`, `x = ±a`: the jumps themselves, where `|psi|^2` has different limits from both sides:
//!   [`PointValue::Jump`].
//! * `t = 0` elsewhere: the packet itself, exactly.
//!
//! A real `psi0` gives `psi(x, -t) = conj psi(x, t)`.

use super::pointwise::{self, Aim, PointRoute, Rectangle};
use super::tail::Status;
use crate::arithmetic::{ExactInput, Interval, Real};
use crate::error::Error;
use crate::functions::elementary::sqrt;
use crate::packets::BoxPacket;
use crate::routes::Effort;
use crate::routes::density::DensityProblem;
use rayon::prelude::*;
use rug::{Float, Rational};
use std::time::Instant;

/// A question for values of `|psi(x, t)|^2`.
///
/// ```
/// use coneproof::packets::BoxPacket;
/// use coneproof::quantities::density::{DensityRequest, PointValue};
/// let packet = BoxPacket::new("1".parse()?)?;
/// let request = DensityRequest::new(packet, "1".parse()?, "5".parse()?, vec!["3".parse()?, "4".parse()?])?;
/// let result = request.certify()?;
/// let PointValue::Known(known) = &result.points[0].value else { panic!() };
/// assert!(*known.density.lower() > 0.1147320 && *known.density.upper() < 0.1147321);
/// assert!(matches!(result.points[1].value, PointValue::Unbounded));
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Clone, Debug)]
pub struct DensityRequest {
    /// The packet released at time zero.
    pub packet: BoxPacket,
    /// Mass, not negative.
    pub mass: ExactInput,
    /// Time, of either sign.
    pub time: ExactInput,
    /// Positions, of either sign.
    pub at: Vec<ExactInput>,
    /// Relative digits asked for the density, `1..=MAX_DIGITS`.
    pub digits: u32,
    /// Whether the parts of the amplitude should have the digits asked as well.
    pub amplitude: bool,
}

/// Enclosures at one point.
#[derive(Clone, Debug)]
pub struct Known {
    /// `|psi|^2`.
    pub density: Interval,
    /// `psi`.
    pub amplitude: Rectangle,
    /// Relative digits reached.
    pub digits: u32,
    /// Whether these are as many as asked.
    pub status: Status,
    /// What each route found.
    pub routes: Vec<PointRoute>,
}

/// The density at one point.
#[derive(Clone, Debug)]
pub enum PointValue {
    /// A number, enclosed.
    Known(Box<Known>),
    /// The point is on the light cone of a jump: the density grows beyond every bound.
    Unbounded,
    /// The point is a jump of the packet at time zero: there is no single value.
    Jump,
}

/// One point of the answer.
#[derive(Clone, Debug)]
pub struct DensityPoint {
    /// The position as read.
    pub position: ExactInput,
    /// What is known there.
    pub value: PointValue,
}

/// Certified values of the density.
#[derive(Clone, Debug)]
pub struct DensityResult {
    /// One for each position asked, in the same order.
    pub points: Vec<DensityPoint>,
    /// Remarks for the reader.
    pub notes: Vec<String>,
    /// Total time taken.
    pub seconds: f64,
}

impl DensityResult {
    /// Whether every point that has a value has the digits asked.
    pub fn status(&self) -> Status {
        let short = |point: &DensityPoint| match &point.value {
            PointValue::Known(known) => known.status == Status::FewerDigits,
            _ => false,
        };
        if self.points.iter().any(short) { Status::FewerDigits } else { Status::Certified }
    }
}

impl DensityRequest {
    /// A request at 15 digits, without the amplitude.
    ///
    /// # Errors
    /// [`Error::BadInput`] or [`Error::Missing`] naming the first field that cannot be used.
    pub fn new(
        packet: BoxPacket,
        mass: ExactInput,
        time: ExactInput,
        at: Vec<ExactInput>,
    ) -> Result<DensityRequest, Error> {
        let request = DensityRequest { packet, mass, time, at, digits: 15, amplitude: false };
        request.validate()?;
        Ok(request)
    }

    /// Checks all fields together.
    ///
    /// # Errors
    /// As for [`DensityRequest::new`].
    pub fn validate(&self) -> Result<(), Error> {
        pointwise::digits_and_points(self.digits, &self.at)?;
        pointwise::mass(&self.mass)?;
        pointwise::point("half-width", self.packet.half_width())?;
        pointwise::point("time", &self.time)?;
        self.at.iter().try_for_each(|position| pointwise::point("at", position).map(|_| ()))
    }

    /// Computes the certified enclosures.
    ///
    /// # Errors
    /// [`Error::BadInput`] for a request that cannot be used, [`Error::RoutesDisagree`] for a defect of this program.
    pub fn certify(&self) -> Result<DensityResult, Error> {
        self.validate()?;
        let start = Instant::now();
        let one = |position: &ExactInput| -> Result<DensityPoint, Error> {
            Ok(DensityPoint { position: position.clone(), value: self.at_point(position.lower())? })
        };
        let points = self.at.par_iter().map(one).collect::<Result<Vec<_>, _>>()?;
        let mut notes = Vec::new();
        if *self.time.lower() == 0 {
            notes.push("at time zero the amplitude is the packet itself, exactly".to_owned());
        } else if *self.mass.lower() == 0 {
            notes.push("for mass zero one route: the closed form with logarithms".to_owned());
        }
        Ok(DensityResult { points, notes, seconds: start.elapsed().as_secs_f64() })
    }

    fn at_point(&self, position: &Rational) -> Result<PointValue, Error> {
        let half_width = self.packet.half_width().lower();
        let place = Rational::from(position.abs_ref());
        let time = Rational::from(self.time.lower().abs_ref());
        if time == 0 {
            return Ok(self.at_release(half_width, &place));
        }
        let from_edge = Rational::from(&place - half_width).abs();
        if from_edge == time || Rational::from(&place + half_width) == time {
            return Ok(PointValue::Unbounded);
        }
        let problem = scale(half_width, self.mass.lower(), &time, &place);
        let aim = if self.amplitude { Aim::Parts } else { Aim::Square };
        let mut met = pointwise::meet(&problem.routes(), aim, self.digits, &Effort::default())?;
        if *self.time.lower() < 0 {
            met.amplitude = met.amplitude.conjugate();
            for route in &mut met.routes {
                route.amplitude = route.amplitude.as_ref().map(Rectangle::conjugate);
            }
        }
        Ok(PointValue::Known(Box::new(Known {
            density: met.density,
            amplitude: met.amplitude,
            digits: met.digits,
            status: met.status,
            routes: met.routes,
        })))
    }

    /// The packet itself.
    fn at_release(&self, half_width: &Rational, place: &Rational) -> PointValue {
        if place == half_width {
            return PointValue::Jump;
        }
        let bits = (f64::from(self.digits) * std::f64::consts::LOG2_10) as u32 + 64;
        let density = if place < half_width { Rational::from(half_width * 2).recip() } else { Rational::new() };
        let root = sqrt(&Real::from_rational(&density, bits), bits);
        PointValue::Known(Box::new(Known {
            density: Interval::from_rationals(&density, &density, bits),
            amplitude: Rectangle {
                real: root.to_interval(bits).clamp_non_negative(),
                imaginary: Interval::new(Float::new(64), Float::new(64)),
            },
            digits: self.digits,
            status: Status::Certified,
            routes: Vec::new(),
        }))
    }
}

/// The exactly scaled problem: unit `1/m`, or the half-width for mass zero.
fn scale(half_width: &Rational, mass: &Rational, time: &Rational, place: &Rational) -> DensityProblem {
    let massless = *mass == 0;
    let unit = if massless { Rational::from(half_width.recip_ref()) } else { mass.clone() };
    DensityProblem {
        half_width: Rational::from(half_width * &unit),
        time: Rational::from(time * &unit),
        position: Rational::from(place * &unit),
        massless,
        unit,
    }
}
