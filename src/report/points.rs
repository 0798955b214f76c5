//! Reports of values at points: densities and propagators, for people and for programs.
//!
//! Decimals are rounded outward. In JSON each point has its position as read; a density has `lower` and `upper` (and
//! `real`, `imaginary` if the amplitude was asked), a propagator has `real` and `imaginary`. Where there is no number
//! the point says so with `unbounded` or `jump`.

use super::text::{duration, entry, one_line, shortened};
use super::{CAUTION, DecimalBounds, PROGRAM, VERSION};
use crate::arithmetic::{Interval, decimal};
use crate::error::Error;
use crate::packets::BoxPacket;
use crate::quantities::density::{DensityPoint, DensityRequest, DensityResult, PointValue};
use crate::quantities::pointwise::{PointRoute, Rectangle, signed_digits};
use crate::quantities::propagator::{PropagatorPoint, PropagatorRequest, PropagatorResult};
use crate::quantities::tail::Status;
use serde::Serialize;

/// What an unbounded density is called.
pub const UNBOUNDED: &str = "unbounded here";
/// What a jump is called.
pub const JUMP: &str = "jump here: the limits from both sides differ";

/// Outward decimals of an interval of either sign.
#[derive(Clone, Debug, Serialize)]
struct Bounds {
    lower: String,
    upper: String,
}

impl Bounds {
    fn new(interval: &Interval, digits: u32) -> Bounds {
        if *interval.lower() >= 0 {
            let DecimalBounds { lower, upper } = DecimalBounds::new(interval, digits);
            return Bounds { lower, upper };
        }
        let shown = signed_digits(interval, digits) + 5;
        Bounds {
            lower: decimal::lower_decimal(interval.lower(), shown),
            upper: decimal::upper_decimal(interval.upper(), shown),
        }
    }
}

#[derive(Serialize)]
struct Answer<'a, I: Serialize> {
    quantity: &'a str,
    inputs: I,
    points: Vec<Point<'a>>,
    status: &'a str,
    notes: &'a [String],
    caution: &'a str,
    seconds: f64,
    program: &'a str,
    version: &'a str,
}

#[derive(Serialize)]
struct DensityInputs<'a> {
    packet: &'a str,
    half_width: &'a str,
    mass: &'a str,
    time: &'a str,
    digits: String,
}

#[derive(Serialize)]
struct PropagatorInputs<'a> {
    dimension: u32,
    mass: &'a str,
    time: &'a str,
    digits: String,
}

/// One point; absent entries are left out.
#[derive(Default, Serialize)]
struct Point<'a> {
    x: &'a str,
    #[serde(skip_serializing_if = "Option::is_none")]
    lower: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    upper: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    real: Option<Bounds>,
    #[serde(skip_serializing_if = "Option::is_none")]
    imaginary: Option<Bounds>,
    #[serde(skip_serializing_if = "Option::is_none")]
    unbounded: Option<bool>,
    #[serde(skip_serializing_if = "Option::is_none")]
    jump: Option<bool>,
    #[serde(skip_serializing_if = "Option::is_none")]
    digits: Option<u32>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    routes: Vec<Route<'a>>,
}

#[derive(Serialize)]
struct Route<'a> {
    name: &'a str,
    #[serde(skip_serializing_if = "Option::is_none")]
    lower: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    upper: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    real: Option<Bounds>,
    #[serde(skip_serializing_if = "Option::is_none")]
    imaginary: Option<Bounds>,
    bits: u32,
    nodes: usize,
    seconds: f64,
    note: Option<&'a str>,
}

/// What a point shows.
#[derive(Clone, Copy)]
struct Shown {
    density: bool,
    amplitude: bool,
    digits: u32,
}

impl Shown {
    fn split(self, density: Option<&Interval>) -> (Option<String>, Option<String>) {
        let bounds = density.filter(|_| self.density).map(|interval| Bounds::new(interval, self.digits));
        bounds.map_or((None, None), |bounds| (Some(bounds.lower), Some(bounds.upper)))
    }

    fn parts(self, amplitude: Option<&Rectangle>) -> (Option<Bounds>, Option<Bounds>) {
        let found = amplitude.filter(|_| self.amplitude);
        let bounds = |interval: &Interval| Bounds::new(interval, self.digits);
        (found.map(|value| bounds(&value.real)), found.map(|value| bounds(&value.imaginary)))
    }

    fn route(self, route: &PointRoute) -> Route<'_> {
        let (lower, upper) = self.split(route.density.as_ref());
        let (real, imaginary) = self.parts(route.amplitude.as_ref());
        Route {
            name: route.name,
            lower,
            upper,
            real,
            imaginary,
            bits: route.bits,
            nodes: route.nodes,
            seconds: (route.seconds * 1e6).round() / 1e6,
            note: route.note.as_deref(),
        }
    }
}

fn density_point<'a>(point: &'a DensityPoint, shown: Shown) -> Point<'a> {
    let x = point.position.text();
    match &point.value {
        PointValue::Unbounded => Point { x, unbounded: Some(true), ..Point::default() },
        PointValue::Jump => Point { x, jump: Some(true), ..Point::default() },
        PointValue::Known(known) => {
            let (lower, upper) = shown.split(Some(&known.density));
            let (real, imaginary) = shown.parts(Some(&known.amplitude));
            let routes = known.routes.iter().map(|route| shown.route(route)).collect();
            let digits = Some(known.digits);
            Point { x, lower, upper, real, imaginary, digits, routes, ..Point::default() }
        }
    }
}

fn propagator_point(point: &PropagatorPoint, shown: Shown) -> Point<'_> {
    let (real, imaginary) = shown.parts(Some(&point.value));
    let routes = point.routes.iter().map(|route| shown.route(route)).collect();
    Point { x: point.position.text(), real, imaginary, digits: Some(point.digits), routes, ..Point::default() }
}

const DENSITY: &str = "|psi(x, time)|^2";
const PROPAGATOR: &str = "G(x, time)";

fn density_shown(request: &DensityRequest) -> Shown {
    Shown { density: true, amplitude: request.amplitude, digits: request.digits }
}

fn propagator_shown(request: &PropagatorRequest) -> Shown {
    Shown { density: false, amplitude: true, digits: request.digits }
}

/// Densities as one JSON object.
///
/// # Errors
/// [`Error::Internal`] if the object cannot be written as JSON, which its types exclude.
pub fn density_json(request: &DensityRequest, result: &DensityResult) -> Result<String, Error> {
    let shown = density_shown(request);
    super::json::line(&Answer {
        quantity: DENSITY,
        inputs: DensityInputs {
            packet: BoxPacket::NAME,
            half_width: request.packet.half_width().text(),
            mass: request.mass.text(),
            time: request.time.text(),
            digits: request.digits.to_string(),
        },
        points: result.points.iter().map(|point| density_point(point, shown)).collect(),
        status: result.status().name(),
        notes: &result.notes,
        caution: CAUTION,
        seconds: (result.seconds * 1e6).round() / 1e6,
        program: PROGRAM,
        version: VERSION,
    })
}

/// Propagators as one JSON object.
///
/// # Errors
/// As for [`density_json`].
pub fn propagator_json(request: &PropagatorRequest, result: &PropagatorResult) -> Result<String, Error> {
    let shown = propagator_shown(request);
    super::json::line(&Answer {
        quantity: PROPAGATOR,
        inputs: PropagatorInputs {
            dimension: request.dimension.number(),
            mass: request.mass.text(),
            time: request.time.text(),
            digits: request.digits.to_string(),
        },
        points: result.points.iter().map(|point| propagator_point(point, shown)).collect(),
        status: result.status().name(),
        notes: &result.notes,
        caution: CAUTION,
        seconds: (result.seconds * 1e6).round() / 1e6,
        program: PROGRAM,
        version: VERSION,
    })
}

/// Densities as text.
pub fn density_text(request: &DensityRequest, result: &DensityResult) -> String {
    let mut text = "Density |psi(x, t)|^2 of finding the particle at x\n".to_owned();
    text += "Free particle released at time 0, Newton-Wigner position, units with hbar = c = 1\n\n";
    text += &entry("packet", BoxPacket::NAME);
    text += &input("half-width a", request.packet.half_width().text());
    text += &input("mass m", request.mass.text());
    text += &input("time t", request.time.text());
    text += &entry("digits", &format!("{} asked", request.digits));
    let shown = density_shown(request);
    let points = result.points.iter().map(|point| density_point(point, shown)).collect::<Vec<_>>();
    text + &body("density", &points, &result.notes) + &foot(result.status(), result.seconds)
}

/// Propagators as text.
pub fn propagator_text(request: &PropagatorRequest, result: &PropagatorResult) -> String {
    let mut text = "Newton-Wigner propagator G(x, t), a complex number\n".to_owned();
    text += "Free particle, units with hbar = c = 1\n\n";
    text += &entry("dimension", &request.dimension.number().to_string());
    text += &input("mass m", request.mass.text());
    text += &input("time t", request.time.text());
    text += &entry("digits", &format!("{} asked", request.digits));
    let shown = propagator_shown(request);
    let points = result.points.iter().map(|point| propagator_point(point, shown)).collect::<Vec<_>>();
    text + &body("G", &points, &result.notes) + &foot(result.status(), result.seconds)
}

fn input(name: &str, read: &str) -> String {
    entry(name, &shortened(&one_line(read)))
}

fn body(name: &str, points: &[Point], notes: &[String]) -> String {
    let mut text = String::new();
    for point in points {
        text.push('\n');
        text += &input("x", point.x);
        if point.unbounded.is_some() {
            text += &entry(name, UNBOUNDED);
        }
        if point.jump.is_some() {
            text += &entry(name, JUMP);
        }
        if let (Some(lower), Some(upper)) = (&point.lower, &point.upper) {
            text += &(entry("lower", lower) + &entry("upper", upper));
        }
        for (part, bounds) in [("Re", &point.real), ("Im", &point.imaginary)] {
            if let Some(bounds) = bounds {
                text += &entry(&format!("{part} lower"), &bounds.lower);
                text += &entry(&format!("{part} upper"), &bounds.upper);
            }
        }
        for route in &point.routes {
            let effort = format!("{} bits, {} nodes, {}", route.bits, route.nodes, duration(route.seconds));
            let found = if route.bits > 0 { effort } else { "no bounds".to_owned() };
            let note = route.note.map(|note| format!(": {note}")).unwrap_or_default();
            text += &entry(route.name, &format!("{found}{note}"));
        }
    }
    text.push('\n');
    for note in notes {
        text += &entry("note", note);
    }
    text
}

fn foot(status: Status, seconds: f64) -> String {
    let sentence = match status {
        Status::Certified => "certified: every interval is proven and has the digits asked",
        Status::FewerDigits => "fewer digits than asked at some points; every interval is proven all the same",
    };
    entry("status", sentence) + &entry("time taken", &duration(seconds)) + &entry("caution", CAUTION)
}
