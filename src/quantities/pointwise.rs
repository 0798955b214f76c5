//! The meeting of routes at one point: shared by propagators and densities.

use crate::arithmetic::{Bits, Complex, ExactInput, Interval, decimal};
use crate::error::Error;
use crate::quantities::tail::{MAX_DIGITS, Status};
use crate::routes::Effort;
use crate::routes::pointwise::{PointEvaluation, PointOutcome};
use rug::{Float, Rational};
use std::time::Instant;

/// A complex number known to lie in a rectangle.
#[derive(Clone, Debug, PartialEq)]
pub struct Rectangle {
    /// Bounds of the real part.
    pub real: Interval,
    /// Bounds of the imaginary part.
    pub imaginary: Interval,
}

impl Rectangle {
    pub(super) fn new(value: &Complex, bits: Bits) -> Rectangle {
        Rectangle { real: value.re.to_interval(bits), imaginary: value.im.to_interval(bits) }
    }

    fn intersection(&self, other: &Rectangle) -> Option<Rectangle> {
        Some(Rectangle {
            real: self.real.intersection(&other.real)?,
            imaginary: self.imaginary.intersection(&other.imaginary)?,
        })
    }

    /// The complex conjugate.
    pub fn conjugate(&self) -> Rectangle {
        Rectangle { real: self.real.clone(), imaginary: negative(&self.imaginary) }
    }

    /// Relative digits of both parts, at most `limit`; a part that is exactly zero has all of them.
    pub fn relative_digits(&self, limit: u32) -> u32 {
        signed_digits(&self.real, limit).min(signed_digits(&self.imaginary, limit))
    }
}

/// Relative digits of an interval of either sign.
pub fn signed_digits(interval: &Interval, limit: u32) -> u32 {
    if *interval.upper() < 0 { negative(interval).relative_digits(limit) } else { interval.relative_digits(limit) }
}

fn negative(interval: &Interval) -> Interval {
    Interval::new(-interval.upper().clone(), -interval.lower().clone())
}

/// What one route found at one point.
#[derive(Clone, Debug)]
pub struct PointRoute {
    /// Name of the route.
    pub name: &'static str,
    /// One sentence on the method.
    pub method: &'static str,
    /// Its own enclosure of the complex number, if it has one.
    pub amplitude: Option<Rectangle>,
    /// Its own enclosure of the absolute square.
    pub density: Option<Interval>,
    /// Working precision in bits.
    pub bits: Bits,
    /// Number of nodes or terms.
    pub nodes: usize,
    /// Time taken.
    pub seconds: f64,
    /// Why it has no enclosure, or fewer digits than asked.
    pub note: Option<String>,
    /// Named numbers that fix the computation.
    pub witness: Vec<(String, String)>,
}

/// What is asked to have the digits.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Aim {
    /// Both parts of the complex number.
    Parts,
    /// The absolute square.
    Square,
}

/// The meeting of all routes that reached anything.
pub(super) struct Meeting {
    pub(super) amplitude: Rectangle,
    pub(super) density: Interval,
    pub(super) digits: u32,
    pub(super) status: Status,
    pub(super) routes: Vec<PointRoute>,
}

/// Runs all routes and intersects what they found.
pub(super) fn meet(
    routes: &[Box<dyn PointEvaluation + '_>],
    aim: Aim,
    digits: u32,
    effort: &Effort,
) -> Result<Meeting, Error> {
    let reports: Vec<PointRoute> = routes.iter().map(|route| drive(route.as_ref(), aim, digits, effort)).collect();
    let mut amplitude: Option<Rectangle> = None;
    let mut density: Option<Interval> = None;
    for report in &reports {
        let (Some(found), Some(square)) = (&report.amplitude, &report.density) else {
            continue;
        };
        amplitude = Some(match amplitude {
            None => found.clone(),
            Some(so_far) => so_far.intersection(found).ok_or_else(|| disagreement(&reports))?,
        });
        density = Some(match density {
            None => square.clone(),
            Some(so_far) => so_far.intersection(square).ok_or_else(|| disagreement(&reports))?,
        });
    }
    let amplitude = amplitude.unwrap_or_else(|| Rectangle { real: whole_line(), imaginary: whole_line() });
    let density = density.unwrap_or_else(|| Interval::new(Float::new(64), whole_line().upper().clone()));
    let reached = reached(aim, &amplitude, &density, digits);
    let status = if reached >= digits { Status::Certified } else { Status::FewerDigits };
    Ok(Meeting { amplitude, density, digits: reached, status, routes: reports })
}

fn reached(aim: Aim, amplitude: &Rectangle, density: &Interval, digits: u32) -> u32 {
    match aim {
        Aim::Parts => amplitude.relative_digits(digits),
        Aim::Square => density.relative_digits(digits),
    }
}

fn whole_line() -> Interval {
    crate::arithmetic::Real::whole_line().to_interval(64)
}

fn disagreement(reports: &[PointRoute]) -> Error {
    let part = |name: String, interval: &Interval| {
        (name, decimal::lower_decimal(interval.lower(), 30), decimal::upper_decimal(interval.upper(), 30))
    };
    let mut intervals = Vec::new();
    for report in reports {
        if let Some(found) = &report.amplitude {
            intervals.push(part(format!("{}, real", report.name), &found.real));
            intervals.push(part(format!("{}, imaginary", report.name), &found.imaginary));
        }
    }
    Error::RoutesDisagree { intervals }
}

/// Raises the goal of one route until it has the digits asked or the effort ends.
fn drive(route: &dyn PointEvaluation, aim: Aim, digits: u32, effort: &Effort) -> PointRoute {
    const ATTEMPTS: usize = 7;
    let start = Instant::now();
    let mut best: Option<(u32, PointOutcome)> = None;
    let mut note = None;
    let mut goal = digits.saturating_add(2);
    for _ in 0..ATTEMPTS {
        match route.evaluate(goal, effort) {
            Ok(outcome) => {
                let (amplitude, density) = shown(&outcome);
                let found = reached(aim, &amplitude, &density, digits);
                if best.as_ref().is_none_or(|(before, _)| *before <= found) {
                    best = Some((found, outcome));
                }
                note = (found < digits).then(|| "the interval did not become narrow enough".to_owned());
                if found >= digits {
                    break;
                }
                goal = if found == 0 { goal.saturating_mul(2) } else { goal + (digits - found) + 3 };
            }
            Err(failure) => {
                note = Some(failure.to_string());
                break;
            }
        }
    }
    let seconds = start.elapsed().as_secs_f64();
    let (name, method) = (route.name(), route.method());
    match best {
        Some((_, outcome)) => {
            let (amplitude, density) = shown(&outcome);
            let PointOutcome { bits, nodes, witness, .. } = outcome;
            let (amplitude, density) = (Some(amplitude), Some(density));
            PointRoute { name, method, amplitude, density, bits, nodes, seconds, note, witness }
        }
        None => PointRoute {
            name,
            method,
            amplitude: None,
            density: None,
            bits: 0,
            nodes: 0,
            seconds,
            note,
            witness: Vec::new(),
        },
    }
}

fn shown(outcome: &PointOutcome) -> (Rectangle, Interval) {
    let square = outcome.value.norm_squared(outcome.bits).to_interval(outcome.bits);
    (Rectangle::new(&outcome.value, outcome.bits), square.clamp_non_negative())
}

/// One exact number, not an interval.
pub(super) fn point<'a>(field: &str, input: &'a ExactInput) -> Result<&'a Rational, Error> {
    if input.is_point() {
        return Ok(input.lower());
    }
    Err(Error::bad_input(field, input.text(), "give one exact number, such as 2, 0.1 or 9/2, not an interval"))
}

/// A mass that is one number and not negative.
pub(super) fn mass(input: &ExactInput) -> Result<&Rational, Error> {
    let value = point("mass", input)?;
    if *value < 0 {
        return Err(Error::bad_input("mass", input.text(), "give a mass that is not negative, such as 0 or 1"));
    }
    Ok(value)
}

/// A number of digits that can be asked for, and at least one point.
pub(super) fn digits_and_points(digits: u32, points: &[ExactInput]) -> Result<(), Error> {
    if digits == 0 || digits > MAX_DIGITS {
        return Err(Error::bad_input("digits", digits, &format!("give a whole number from 1 to {MAX_DIGITS}")));
    }
    if points.is_empty() {
        let wanted = "give at least one position, such as --at 9/2".to_owned();
        return Err(Error::Missing { field: "at".to_owned(), wanted });
    }
    Ok(())
}
