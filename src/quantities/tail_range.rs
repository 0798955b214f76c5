//! Tail probabilities for interval inputs, reduced to exact ones.
//!
//! Write `P(m, a, t, R)` for the two-sided tail of the box. Outside the cone the amplitude is
//! `psi = i (2a)^(-1/2) Int_{-a}^{a} g(x - y) dy` with `g(x) = (m t / pi) K_1(m s)/s > 0`,
//! `s = sqrt(x^2 - t^2)`.
//!
//! **Lemma 1** (region fixed). `P` increases with `t` and with `a`, and decreases with `m` and
//! with `R`. *Proof.* `z K_1(z)` decreases (its derivative is `-z K_0(z)`, DLMF 10.29.4), so
//! `g = t (m s K_1(m s)) / (pi s^2)` decreases with `m`, and increases with `t` since `s` falls as
//! `t` grows. As a Laplace transform of a positive measure, `g(x) = (1/pi) Int_m^inf
//! exp(-kappa x) sinh(t sqrt(kappa^2 - m^2)) dkappa`, `g` is convex on `x > t`, so its mean over `|y| <= a`
//! grows with `a`, and `psi = i sqrt(2a) * mean`. `R` only changes the range of integration. ∎
//!
//! **Lemma 2** (at the cone, `R = a + t`). With the double integral of the spectral route,
//! `a P = c Int Int s s' f f' / (kappa + kappa')`, where `f = 1 - exp(-2 a kappa)` (over `kappa`) and
//! `s(t) = (exp(-m t e^-eta) - exp(-m t e^eta))/2`, all positive:
//! `a P` increases with `a` as `f` does; `P / a` decreases with `a` as `f / a` does; `P` decreases
//! with `m` at fixed `a, t` by Lemma 1; `P / t^2` decreases with `t`, as
//! `d ln(s/t)/dt = sigma coth(t sigma) - 1/t - cosh eta < 0` (unit mass, `sigma = sinh eta`, because
//! `coth z - 1/z < 1`); `P exp(2 m t)` increases with `t`, as
//! `d ln(s e^t)/dt >= sigma - cosh eta + 1 = 1 - exp(-eta) >= 0`; and `P` decreases with `t` once
//! `m t >= 1`, as `d s/dt = 0` only at `t = eta / sinh eta <= 1`. ∎
//!
//! The box of `(a, t)` is cut into pieces and the pieces' bounds are joined, so that the factors
//! of Lemma 2 cost little width. The reduction is carried out for the intersections of the routes'
//! intervals and for each route by itself, so that what is shown for a route is an enclosure that
//! rests on this route alone.

use super::tail::{RouteReport, TailRequest, run_routes, scale, without_routes};
use crate::arithmetic::{Bits, ExactInput, Interval, Real, decimal, rounding};
use crate::error::Error;
use crate::functions::elementary;
use crate::routes::Effort;
use rug::{Float, Rational};
use std::collections::BTreeMap;

/// Pieces into which an interval of times or half-widths at the cone is cut.
const PIECES: u32 = 12;
/// Digits of the exact problems in the first round; few intervals deserve more.
const FIRST_DIGITS: u32 = 18;

/// The smallest and largest absolute value of an input.
pub(super) fn absolute(input: &ExactInput) -> (Rational, Rational) {
    let low = Rational::from(input.lower().abs_ref());
    let high = Rational::from(input.upper().abs_ref());
    let across = *input.lower() <= 0 && *input.upper() >= 0;
    let largest = if low > high { low.clone() } else { high.clone() };
    let smallest = if across {
        Rational::new()
    } else if low < high {
        low
    } else {
        high
    };
    (smallest, largest)
}

/// Encloses the answer to a valid request, for both sides together, and says what each route found.
pub(super) fn enclose(request: &TailRequest) -> Result<(Interval, Vec<RouteReport>), Error> {
    let effort = request.effort();
    if is_exact(request) {
        let known = Corner::first(request).evaluate(request, request.digits, &effort)?;
        return Ok((known.meeting, known.routes));
    }
    let first = request.digits.min(FIRST_DIGITS);
    let reduction = Reduction::new(request, first);
    let found = reduction.carry_out(request, first, &effort)?;
    // The inputs are so narrow that the exact problems limit the digits: solve them better.
    if first < request.digits && found.0.has_relative_digits(first - 3) {
        let digits = request.digits + 2;
        return Reduction::new(request, digits).carry_out(request, digits, &effort);
    }
    Ok(found)
}

/// Whether all inputs are single numbers.
pub(super) fn is_exact(request: &TailRequest) -> bool {
    let points = request.packet.half_width().is_point() && request.mass.is_point() && request.time.is_point();
    points && request.beyond.as_ref().is_none_or(ExactInput::is_point)
}

/// One exact set of inputs.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord)]
struct Corner {
    half_width: Rational,
    mass: Rational,
    time: Rational,
    beyond: Option<Rational>,
}

/// What was found for one exact set of inputs.
struct Known {
    meeting: Interval,
    routes: Vec<RouteReport>,
    /// What holds without any route.
    general: Interval,
}

impl Corner {
    /// The lower ends of all inputs, at the smallest time.
    fn first(request: &TailRequest) -> Corner {
        Corner {
            half_width: request.packet.half_width().lower().clone(),
            mass: request.mass.lower().clone(),
            time: absolute(&request.time).0,
            beyond: request.beyond.as_ref().map(|region| region.lower().clone()),
        }
    }

    fn evaluate(&self, request: &TailRequest, digits: u32, effort: &Effort) -> Result<Known, Error> {
        let Some(problem) = scale(&self.half_width, &self.mass, &self.time, self.beyond.as_ref()) else {
            let zero = Interval::new(Float::new(64), Float::new(64));
            return Ok(Known { meeting: zero.clone(), routes: Vec::new(), general: zero });
        };
        let (meeting, routes) = run_routes(&problem, request.routes, digits, effort)?;
        Ok(Known { meeting, routes, general: without_routes(&problem) })
    }

    fn in_words(&self) -> String {
        let region = self.beyond.as_ref().map_or("cone".to_owned(), ToString::to_string);
        format!("half-width {}, mass {}, time {}, beyond {region}", self.half_width, self.mass, self.time)
    }
}

/// A bound: the value at a corner, times the factor for an upper bound, divided by it for a lower.
type Bound = (Corner, Float);

/// A part of the inputs' box with its bounds, of which the best ones count.
struct Piece {
    lower: Vec<Bound>,
    upper: Vec<Bound>,
}

/// An interval problem as exact ones.
struct Reduction {
    /// The lemma and the ends of the pieces, for certificates.
    witness: Vec<(String, String)>,
    pieces: Vec<Piece>,
    bits: Bits,
}

impl Reduction {
    fn new(request: &TailRequest, digits: u32) -> Reduction {
        let bits = 64 + 4 * digits;
        match &request.beyond {
            Some(region) => fixed_region(request, region, bits),
            None => at_the_cone(request, bits),
        }
    }

    /// Solves the exact problems, each once, and joins the bounds.
    fn carry_out(
        &self,
        request: &TailRequest,
        digits: u32,
        effort: &Effort,
    ) -> Result<(Interval, Vec<RouteReport>), Error> {
        let mut solved: BTreeMap<&Corner, Known> = BTreeMap::new();
        for (corner, _) in self.pieces.iter().flat_map(|piece| piece.lower.iter().chain(&piece.upper)) {
            if !solved.contains_key(corner) {
                solved.insert(corner, corner.evaluate(request, digits, effort)?);
            }
        }
        let meeting = self.join(|corner| solved.get(corner).map(|known| known.meeting.clone()));
        let meeting = meeting.ok_or_else(|| Error::Internal { found: "an interval without pieces".to_owned() })?;
        let count = solved.values().map(|known| known.routes.len()).max().unwrap_or(0);
        let routes = (0..count).filter_map(|index| self.report(index, &solved)).collect();
        Ok((meeting, routes))
    }

    /// The hull of all pieces; `None` if a value is missing.
    fn join(&self, value: impl Fn(&Corner) -> Option<Interval>) -> Option<Interval> {
        let mut hull: Option<Interval> = None;
        for piece in &self.pieces {
            let mut lower = Float::new(self.bits);
            for (corner, factor) in &piece.lower {
                let bound = rounding::down(self.bits, value(corner)?.lower() / factor);
                lower = if bound > lower { bound } else { lower };
            }
            let mut upper = rounding::up(self.bits, rug::float::Special::Infinity);
            for (corner, factor) in &piece.upper {
                let bound = rounding::up(self.bits, value(corner)?.upper() * factor);
                upper = if bound < upper { bound } else { upper };
            }
            let interval = Interval::new(lower, upper);
            hull = Some(hull.map_or(interval.clone(), |so_far| so_far.hull(&interval)));
        }
        hull
    }

    /// What one route found: its own enclosure, and the exact problems that it rests on.
    fn report(&self, index: usize, solved: &BTreeMap<&Corner, Known>) -> Option<RouteReport> {
        // At time zero no route has to run. Where a route has no bounds, the general ones remain.
        let own = |known: &Known| known.routes.get(index).and_then(|route| route.interval.clone());
        let interval_of = |known: &Known| own(known).unwrap_or_else(|| known.general.clone());
        let reports: Vec<&RouteReport> = solved.values().filter_map(|known| known.routes.get(index)).collect();
        let mut witness = self.witness.clone();
        for (number, (corner, known)) in solved.iter().enumerate() {
            let shown = shown(&interval_of(known));
            let effort =
                known.routes.get(index).map_or(String::new(), |r| format!(", {} bits, {} nodes", r.bits, r.nodes));
            witness.push((format!("exact problem {}", number + 1), format!("{}: {shown}{effort}", corner.in_words())));
        }
        let first = reports.first()?;
        let note = reports.iter().find_map(|report| report.note.as_ref());
        let joined = || self.join(|corner| solved.get(corner).map(interval_of));
        Some(RouteReport {
            name: first.name,
            method: first.method,
            interval: reports.iter().any(|report| report.interval.is_some()).then(joined).flatten(),
            bits: reports.iter().map(|report| report.bits).max().unwrap_or(0),
            nodes: reports.iter().map(|report| report.nodes).sum(),
            seconds: reports.iter().map(|report| report.seconds).sum(),
            note: note.map(|note| format!("in one of {} exact problems: {note}", solved.len())),
            witness,
        })
    }
}

fn shown(interval: &Interval) -> String {
    let digits = interval.relative_digits(FIRST_DIGITS) + 3;
    let (lower, upper) = (interval.lower(), interval.upper());
    format!("[{}, {}]", decimal::lower_decimal(lower, digits), decimal::upper_decimal(upper, digits))
}

/// Lemma 1: two corners bound everything.
fn fixed_region(request: &TailRequest, region: &ExactInput, bits: Bits) -> Reduction {
    let (first, last) = absolute(&request.time);
    let smallest = Corner {
        half_width: request.packet.half_width().lower().clone(),
        mass: request.mass.upper().clone(),
        time: first,
        beyond: Some(region.upper().clone()),
    };
    let largest = Corner {
        half_width: request.packet.half_width().upper().clone(),
        mass: request.mass.lower().clone(),
        time: last,
        beyond: Some(region.lower().clone()),
    };
    let one = Float::with_val(bits, 1);
    let piece = Piece { lower: vec![(smallest, one.clone())], upper: vec![(largest, one)] };
    let lemma = "Lemma 1: P increases with time and half-width, decreases with mass and distance";
    Reduction { witness: vec![("interval inputs".to_owned(), lemma.to_owned())], pieces: vec![piece], bits }
}

/// Lemma 2 on pieces of the box of half-widths and times.
fn at_the_cone(request: &TailRequest, bits: Bits) -> Reduction {
    let widths = ends(request.packet.half_width().lower(), request.packet.half_width().upper());
    let (first, last) = absolute(&request.time);
    let times = ends(&first, &last);
    let mut list = Vec::new();
    for width in pairs(&widths) {
        list.extend(pairs(&times).into_iter().map(|time| piece(request, width, time, bits)));
    }
    let lemma = "Lemma 2: P times a power of half-width or time, or times exp(2 m t), is monotone";
    let listed = |values: &[Rational]| values.iter().map(ToString::to_string).collect::<Vec<_>>().join(", ");
    let witness = vec![
        ("interval inputs".to_owned(), lemma.to_owned()),
        ("ends of the pieces of the half-width".to_owned(), listed(&widths)),
        ("ends of the pieces of the time".to_owned(), listed(&times)),
    ];
    Reduction { witness, pieces: list, bits }
}

/// Ends of the pieces of `[low, high]`: one end for a point, ratios alike for a wide interval.
fn ends(low: &Rational, high: &Rational) -> Vec<Rational> {
    if low == high {
        return vec![low.clone()];
    }
    let step = Rational::from(high - low) / PIECES;
    let even = |k: u32| Rational::from(&step * k) + low;
    let ratio = if *low == 0 { 1.0 } else { Rational::from(high / low).to_f64() };
    let inner = |k: u32| {
        if !(4.0..1e300).contains(&ratio) {
            return even(k);
        }
        // Any increasing ends will do, so the power may be rough.
        let power = Rational::from_f64(ratio.powf(f64::from(k) / f64::from(PIECES))).unwrap_or_default();
        low * power
    };
    let mut ends = vec![low.clone()];
    for end in (1..PIECES).map(inner).chain([high.clone()]) {
        if ends.last().is_some_and(|last| *last < end) && end <= *high {
            ends.push(end);
        }
    }
    ends
}

/// Neighbouring ends; a single end is a piece of its own.
fn pairs(ends: &[Rational]) -> Vec<(&Rational, &Rational)> {
    match ends {
        [point] => vec![(point, point)],
        _ => ends.iter().zip(ends.iter().skip(1)).collect(),
    }
}

/// Bounds on one piece: values at its corners times the factors of Lemma 2.
fn piece(
    request: &TailRequest,
    (narrow, wide): (&Rational, &Rational),
    (early, late): (&Rational, &Rational),
    bits: Bits,
) -> Piece {
    let corner = |mass: &Rational, time: &Rational| Corner {
        half_width: narrow.clone(),
        mass: mass.clone(),
        time: time.clone(),
        beyond: None,
    };
    // From the left half-width a1: P(a) lies between P(a1) a1/a and P(a1) a/a1.
    let stretch = Rational::from(wide / narrow);
    let stretched = |factor: &Real| factor.mul(&Real::from_rational(&stretch, bits), bits).upper(bits);
    let (light, heavy) = (request.mass.lower(), request.mass.upper());
    let growth = |mass: &Rational| {
        // exp(2 m (t2 - t1)).
        let exponent = Rational::from(late - early) * mass * 2;
        elementary::exp(&Real::from_rational(&exponent, bits), bits)
    };
    let mut upper = vec![(corner(light, late), stretched(&growth(light)))];
    let mut lower = vec![(corner(heavy, early), stretched(&growth(heavy)))];
    if *early != 0 && early != late {
        let square = Real::from_rational(&Rational::from(late / early).square(), bits);
        let factor = |mass: &Rational| {
            let falling = Rational::from(mass * early) >= 1;
            if falling { stretched(&Real::from_i64(1)) } else { stretched(&square) }
        };
        upper.push((corner(light, early), factor(light)));
        lower.push((corner(heavy, late), factor(heavy)));
    }
    Piece { lower, upper }
}
