//! Lines, steps, cut-offs and precision. The constants come from the bounds themselves; doubles choose among
//! them.

use super::line::{Edge, Line, Shape, Way};
use super::piece::{Place, Zone};
use crate::arithmetic::{Bits, Magnitude};
use crate::routes::RouteFailure;
use crate::routes::boost::out_of_reach;
use crate::routes::estimate::{bisect, dyadic, log_probability};
use rug::Rational;
use std::f64::consts::{LN_2, LN_10, PI};

/// Most nodes of all lines of a piece.
const MOST_NODES: i64 = 40_000;

/// How a piece is computed.
pub(super) struct Plan {
    pub bits: Bits,
    pub lines: Vec<Line>,
}

impl Plan {
    pub(super) fn new(place: &Place, digits: u32) -> Result<Plan, RouteFailure> {
        let goals = Goals::new(place, digits);
        let mut lines = match place.zone {
            Zone::Beyond => vec![goals.best(place, (4..=49).map(outside))?],
            Zone::Between => vec![far_edge(), goals.best(place, tilted(place))?],
            Zone::Within => vec![far_edge(), line(Shape::Down, &[Edge::Minus], (25, 32), (19, 32))],
        };
        let mut constants: f64 = 0.0;
        for line in &mut lines {
            let constant = ln(line.strip_constant(place));
            constants = constants.max(constant);
            line.step = dyadic(goals.step(line, constant), 16);
            goals.cut(line, place, constant)?;
        }
        let nodes: i64 = lines.iter().map(|line| line.last - line.first + 1).sum();
        if nodes > MOST_NODES {
            return Err(out_of_reach("the lines off the cut would need more than 40000 nodes"));
        }
        let size = |end: &super::piece::End| end.minus.x.to_f64().abs() + end.minus.back.to_f64().abs();
        let [from, to] = place.ends();
        let waves = (1.0 + size(from).max(size(to))).log2();
        let bits = (2.0 * constants - goals.square) / LN_2 + 3.0 * (nodes as f64).log2() + waves + 16.0;
        if bits.is_nan() || bits >= 1e7 {
            return Err(out_of_reach("the lines off the cut would need too many bits"));
        }
        Ok(Plan { bits: bits.ceil().max(64.0) as Bits, lines })
    }
}

fn ln(value: Magnitude) -> f64 {
    value.log2_estimate() * LN_2
}

fn line(shape: Shape, edges: &[Edge], alpha: (i64, i64), delta: (i64, i64)) -> Line {
    Line {
        shape,
        edges: edges.to_vec(),
        alpha: Rational::from(alpha),
        delta: Rational::from(delta),
        step: Rational::from(1),
        first: 0,
        last: 0,
    }
}

/// The line for the edge whose cone is far away.
fn far_edge() -> Line {
    line(Shape::Up, &[Edge::Plus], (31, 32), (19, 32))
}

/// Both edges, strip up to `Im eta = 25/16`.
fn outside(part: i64) -> Line {
    line(Shape::Up, &[Edge::Minus, Edge::Plus], (100 - part, 64), (part, 64))
}

/// Tilted lines of several strips and centres.
fn tilted(place: &Place) -> impl Iterator<Item = Line> {
    let theta = place.frame.growth.to_f64().ln();
    let strips = [12i64, 24, 32, 38];
    strips.into_iter().flat_map(move |part| {
        [0.0, 0.6, 1.5, 3.0, 5.0].into_iter().map(move |extra| {
            let (alpha, delta) = (25.0 / 32.0, part as f64 / 64.0);
            let border = dyadic(((alpha + delta) / (2.0 * alpha)).atanh(), 12);
            let centre = dyadic_signed(extra + 0.4 - theta + alpha * delta.tan() + border.to_f64());
            line(Shape::Tilt { centre, border }, &[Edge::Minus], (25, 32), (part, 64))
        })
    })
}

fn dyadic_signed(value: f64) -> Rational {
    if value < 0.0 { -dyadic(-value, 12) } else { dyadic(value, 12) }
}

/// Logarithms of the errors wanted, in units of the sum.
struct Goals {
    /// Of the square.
    square: f64,
    /// Of the norm.
    norm: f64,
}

impl Goals {
    fn new(place: &Place, digits: u32) -> Goals {
        let a = place.half_width.to_f64();
        let d = if place.zone == Zone::Beyond { place.from.minus.x.to_f64() } else { 0.0 };
        let theta = place.frame.growth.to_f64().ln().abs();
        let lead = place.lead.to_f64().max(1e-3 * a * theta).max(1e-9 * a);
        let unit = (8.0 * PI * PI * a).ln();
        let reference = log_probability(a, lead, d).min(0.0) + unit - theta.min(2.0);
        let square = reference - (f64::from(digits) + 1.0) * LN_10;
        let whole = if place.zone == Zone::Beyond { reference + 3.0 } else { unit };
        Goals { square, norm: square - 0.5 * whole - 1.0 }
    }

    fn step(&self, line: &Line, constant: f64) -> f64 {
        let step = 2.0 * PI * line.delta.to_f64() / (constant - self.norm).max(1.0);
        step.min(0.5)
    }

    fn best(&self, place: &Place, lines: impl Iterator<Item = Line>) -> Result<Line, RouteFailure> {
        let mut best: Option<(f64, Line)> = None;
        for line in lines {
            let constant = line.strip_constant(place);
            if constant.is_infinite() {
                continue;
            }
            let step = self.step(&line, ln(constant));
            if best.as_ref().is_none_or(|(before, _)| step > *before) {
                best = Some((step, line));
            }
        }
        best.map(|(_, line)| line).ok_or_else(|| out_of_reach("no line off the cut fits between the edge's cones"))
    }

    /// Chooses the ends of the lattice.
    fn cut(&self, line: &mut Line, place: &Place, constant: f64) -> Result<(), RouteFailure> {
        let enough = |way: Way, u: f64| {
            let parameter = dyadic(u, 24);
            let parameter = if way == Way::Right { parameter } else { -parameter };
            let tails = line.tails_beyond(place, way, &parameter);
            let first = ln(tails.first) + constant.max(0.0) + 5.0;
            first.max(2.0 * ln(tails.second)) < self.square
        };
        let step = line.step.to_f64();
        let ends = [Way::Right, Way::Left].map(|way| bisect(0.1, 700.0, |u| enough(way, u)));
        if ends.iter().any(|end| *end >= 699.0) {
            return Err(out_of_reach("the lines off the cut would be too long"));
        }
        line.last = (ends[0] / step).ceil() as i64;
        line.first = -(ends[1] / step).ceil() as i64 - 1;
        Ok(())
    }
}
