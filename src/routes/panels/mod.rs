//! Route "kernel" for packets made of polynomial pieces, with or without a carrier wave.
//!
//! # Formula (unit mass)
//!
//! Right of the cone the Newton-Wigner propagator is `(i t/pi) g(x - y)`, `g(v) = K_1(r)/r`, `r = sqrt(v^2 - t^2)`, so that
//!
//! ```text
//! psi(x) = (i t/pi) Q(x),    P(x > a + t + d) = t^2/(pi^2 N) Int_d^inf |Q|^2 ds,    s = x - a - t,    N = Int |psi0|^2,
//! ```
//!
//! and `Q` is a finite sum of iterated integrals of `g` over the knots ([`shape`]); the left side is the right side of the
//! reflected packet. For a box the sum is the `q` of [`super::kernel`], whose panels, recurrences and logarithmic series serve here too.
//!
//! # Method
//!
//! On panels that grow geometrically with `s`, `F = Int_v^inf g` about every knot comes from the recurrence of
//! [`super::kernel::panel`]; iterated integrals are term-by-term integrals, their constants carried inward from the far end ([`chain`]).
//! A carrier wave multiplies `F` by a power series ([`wave`]). At the cone the functions of the outermost knot have a logarithm. `Q` is
//! a polynomial with a proven error on every panel ([`expansion`]), and `|Q|^2` is integrated exactly ([`squares`]).
//! Farther away than the packet's own size the knots would nearly cancel, and a carrier would need short panels; there one Taylor series of
//! `g` and the packet's moments take over ([`far`]).
//!
//! # Bounds
//!
//! **Lemma N1.** Put `G_1 = F`, `G_(j+1)(v) = Int_v^inf G_j`. Then `|Phi_j(v)| <= G_j(v) <= K_0(r)/v` for all `j >= 1`. *Proof.* As `v >= r`,
//! `r(v + z)^2 = r^2 + 2 v z + z^2 >= (r + z)^2`; and `K_0(y) e^y` falls (DLMF 10.32.9). So by Lemma K2
//! `F(v + z) <= K_0(r + z)/(v + z) <= e^(-z) K_0(r)/v`, and `G_j(v) = Int_0^inf z^(j-2)/(j-2)! F(v + z) dz <= K_0(r)/v`. ∎
//! This bounds the constants at the far end.
//!
//! **Lemma N2.** `K_1(r) <= sqrt(pi/(2r)) e^(-r) (1 + 1/(2r))`. *Proof.* Put `x = 2 sinh(u/2)` in `Int_0^inf e^(-r cosh u) cosh u du`:
//! `e^(-r) Int_0^inf e^(-r x^2/2) (1 + x^2/2)/sqrt(1 + x^2/4) dx`, and leave out the root. ∎
//!
//! **Lemma N3.** `|Q| <= g(t + s) Int |psi0| <= g(t + s) sqrt(2 a N)` as `g` falls, and
//! `Int_S^inf |Q|^2 ds <= 2 a N pi/(4 v r^2) e^(-2r) (1 + 1/(2r))^2` with `v`, `r` at `S`. *Proof.* `Int g^2 dv = Int K_1^2/(r v) dr <= (1/(r v)) Int_r^inf K_1^2`,
//! and `Int_r^inf K_1^2 <= K_1(r)^2/2` as `K_1(y) e^y` falls; then Lemma N2. ∎

mod chain;
mod expansion;
mod far;
mod moments;
mod plan;
mod profile;
mod shape;
mod squares;
#[cfg(test)]
mod tests;
mod wave;

use super::kernel::panel::{Anchored, PanelSeries};
use super::kernel::{BOUND_BITS, PARALLEL_FROM, edge, function_bound, separation};
use super::{Effort, Evaluation, RouteFailure, RouteOutcome};
use crate::arithmetic::{Bits, Complex, Interval, Magnitude, Real, decimal};
use crate::error::Error;
use crate::functions::elementary::{exp, pi, sqrt};
use crate::packets::piecewise::{Carrier, PiecewisePacket};
use chain::{Carried, Frame, Levels};
use expansion::{ComplexList, Expansion, Factor};
use moments::Moments;
use plan::{FarPanel, Panel, Plan};
use rayon::prelude::*;
use rug::{Float, Rational};
use shape::{Knot, Shape};

/// Which sides of the packet count.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sides {
    /// Left of the support and its light cone.
    Left,
    /// Right of the support and its light cone.
    Right,
    /// Both.
    Both,
}

/// One side of a problem, seen from the right, in units of the inverse mass.
struct Side {
    shape: Shape,
    time: Rational,
    distance: Rational,
    /// How often its probability counts.
    times: u32,
}

/// The probability of finding a piecewise packet outside its light cone, by the kernel route.
///
/// With the packet's support `|x - c| <= a` the region is `|x - c| > a + |t| + distance`, or one side of it; for a ball of radius `a`
/// it is `r > a + |t| + distance`.
///
/// ```
/// use coneproof::packets::PiecewisePacket;
/// use coneproof::routes::{Effort, Evaluation, panels::{PiecewiseKernel, Sides}};
/// use rug::Rational;
/// let one = Rational::from(1);
/// let packet = PiecewisePacket::uniform_ball(&one)?;
/// let kernel = PiecewiseKernel::new(&packet, &one, &one, &Rational::new(), Sides::Both)?;
/// let found = kernel.evaluate(15, &Effort::default()).expect("within reach");
/// assert!((found.interval.lower().to_f64() - 0.0374042436235204).abs() < 1e-16);
/// # Ok::<(), coneproof::error::Error>(())
/// ```
pub struct PiecewiseKernel {
    sides: Vec<Side>,
}

impl PiecewiseKernel {
    /// A problem with exact inputs: `mass > 0`, `time` of either sign, `distance >= 0` from the light cone.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the mass is not positive or the distance is negative.
    pub fn new(
        packet: &PiecewisePacket,
        mass: &Rational,
        time: &Rational,
        distance: &Rational,
        sides: Sides,
    ) -> Result<PiecewiseKernel, Error> {
        if *mass <= 0 {
            let wanted = "give a mass greater than 0: this route has no series for mass zero";
            return Err(Error::bad_input("mass", mass, wanted));
        }
        if *distance < 0 {
            let wanted = "give a distance from the light cone that is not negative, such as 0 or 1/2";
            return Err(Error::bad_input("distance", distance, wanted));
        }
        if *time == 0 {
            // Nothing has left the support.
            return Ok(PiecewiseKernel { sides: Vec::new() });
        }
        let right = Shape::new(packet, mass);
        let side = |shape: Shape, times: u32| Side {
            shape,
            time: Rational::from(time.abs_ref()) * mass,
            distance: Rational::from(distance * mass),
            times,
        };
        let list = match sides {
            Sides::Right => vec![side(right, 1)],
            Sides::Left => vec![side(right.reflected(), 1)],
            Sides::Both if right.is_symmetric() => vec![side(right, 2)],
            Sides::Both => {
                let left = right.reflected();
                vec![side(right, 1), side(left, 1)]
            }
        };
        Ok(PiecewiseKernel { sides: list })
    }
}

impl Evaluation for PiecewiseKernel {
    fn name(&self) -> &'static str {
        "kernel"
    }

    fn method(&self) -> &'static str {
        "Newton-Wigner propagator in position space, Taylor panels by recurrence and iterated integrals about every \
         knot, logarithmic series at the cone"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        let mut total = Real::zero();
        let (mut bits, mut nodes, mut witness) = (64, 0, Vec::new());
        for (index, side) in self.sides.iter().enumerate() {
            let found = probability(side, digits, effort)?;
            bits = bits.max(found.bits);
            nodes += found.nodes;
            total = total.add(&found.value.mul_i64(i64::from(side.times), bits), bits);
            let name = if index == 0 { "" } else { "other side, " };
            witness.extend(found.witness.into_iter().map(|(key, value)| (format!("{name}{key}"), value)));
        }
        let whole = Interval::new(Float::new(64), Float::with_val(64, 1));
        let interval = total.to_interval(bits).clamp_non_negative();
        Ok(RouteOutcome { interval: interval.intersection(&whole).unwrap_or(interval), bits, nodes, witness })
    }
}

/// What one side contributes.
struct OneSide {
    value: Real,
    bits: Bits,
    nodes: usize,
    witness: Vec<(String, String)>,
}

fn probability(side: &Side, digits: u32, effort: &Effort) -> Result<OneSide, RouteFailure> {
    let plan = Plan::new(side, digits)?;
    effort.allow_bits(plan.bits)?;
    let mut total = near_integral(side, &plan, effort)?;
    for integral in far_integrals(side, &plan, effort)? {
        total = total.add(&integral, plan.bits);
    }
    let tail = tail_bound(side, &plan.squared_end());
    let half = Real::from_float(tail.to_float()).shift(-1);
    total = total.add(&half, plan.bits).widen(half.abs_upper());
    let ratio = Rational::from(side.time.square_ref()) / &side.shape.norm;
    let prefactor = Real::from_rational(&ratio, plan.bits).div(&pi(plan.bits).square(plan.bits), plan.bits);
    Ok(OneSide {
        value: total.mul(&prefactor, plan.bits),
        bits: plan.bits,
        nodes: plan.terms(),
        witness: witness(&plan, tail),
    })
}

/// `Int |Q|^2` over the panels that are treated knot by knot.
fn near_integral(side: &Side, plan: &Plan, effort: &Effort) -> Result<Real, RouteFailure> {
    if plan.panels.is_empty() && plan.cone.is_none() {
        return Ok(Real::zero());
    }
    let series = all_series(side, plan, effort)?;
    let mut carried = if plan.far.is_empty() { at_far_end(side, plan) } else { at_common_point(side, plan, effort)? };
    let mut pieces = Vec::with_capacity(plan.panels.len());
    for (panel, list) in plan.panels.iter().zip(&series).rev() {
        effort.check()?;
        let (piece, next) = on_panel(side, panel, list, &carried)?;
        carried = next;
        if panel.squared {
            pieces.push((piece, panel));
        }
    }
    let square = |(piece, panel): &(Expansion, &Panel)| -> Real {
        let sum = squares::on_panel(piece, size_bound(side, &panel.from), panel.scale);
        sum.mul(&Real::from_rational(&panel.half_width(), plan.bits), plan.bits)
    };
    let integrals: Vec<Real> = if plan.bits >= PARALLEL_FROM {
        pieces.par_iter().map(square).collect()
    } else {
        pieces.iter().map(square).collect()
    };
    let mut total = Real::zero();
    if let Some(cone) = &plan.cone {
        let q = at_cone(side, cone, &carried, effort)?;
        let start = Rational::from(&cone.from / &cone.to);
        let sum = squares::at_cone(&q, &start, cone.scale, cone.scale + 64);
        total = sum.mul(&Real::from_rational(&cone.to, plan.bits), plan.bits);
    }
    for integral in &integrals {
        total = total.add(integral, plan.bits);
    }
    Ok(total)
}

/// `Int |Q|^2` over each panel that is treated by moments.
fn far_integrals(side: &Side, plan: &Plan, effort: &Effort) -> Result<Vec<Real>, RouteFailure> {
    let Some(count) = plan.far.iter().map(|panel| panel.moments).max() else { return Ok(Vec::new()) };
    let scale = plan.moment_scale;
    let kappa = wave_number(side, scale + 96);
    let moments = Moments::new(&side.shape, kappa.as_ref(), count, scale, effort)?;
    let one = |panel: &FarPanel| -> Result<Real, RouteFailure> {
        let q = far::on_panel(side, panel, &moments, effort)?;
        let sum = squares::on_panel(&q, size_bound(side, &panel.from), panel.scale);
        Ok(sum.mul(&Real::from_rational(&panel.half_width(), plan.bits), plan.bits))
    };
    if plan.bits >= PARALLEL_FROM { plan.far.par_iter().map(one).collect() } else { plan.far.iter().map(one).collect() }
}

/// The series of `F` about every knot on every panel.
fn all_series(side: &Side, plan: &Plan, effort: &Effort) -> Result<Vec<Vec<PanelSeries>>, RouteFailure> {
    let one = |panel: &Panel| -> Result<Vec<PanelSeries>, RouteFailure> {
        let (centre, half) = (panel.centre(), panel.half_width());
        let knots = side.shape.knots.iter().zip(&panel.terms);
        knots
            .map(|(knot, terms)| {
                let s = Rational::from(&centre + &knot.depth);
                PanelSeries::about(&side.time, &s, &half, panel.scale, *terms, effort)
            })
            .collect()
    };
    if plan.bits >= PARALLEL_FROM {
        plan.panels.par_iter().map(one).collect()
    } else {
        plan.panels.iter().map(one).collect()
    }
}

/// Lemma N1 at the far end, for every knot.
fn at_far_end(side: &Side, plan: &Plan) -> Vec<Carried> {
    let end = plan.far_end();
    let of_knot = |knot: &Knot| {
        let bound = function_bound(&side.time, &Rational::from(&end + &knot.depth));
        let upper = Complex::zero().widen(bound);
        Carried { base: Real::zero().widen(bound), upper: vec![upper; side.shape.levels(knot).saturating_sub(1)] }
    };
    side.shape.knots.iter().map(of_knot).collect()
}

/// All functions at the outer end of the near panels, when their constants are free: zero at the point `t + s + 2a` that the
/// last knot reaches there.
///
/// `Q` does not depend on the constants as long as all knots use the same functions `F, Phi_1, Phi_2, ...`, each of them minus
/// the derivative of the next (`Phi_1` being `e^(-i kappa v) F`): integration by parts needs nothing else.
fn at_common_point(side: &Side, plan: &Plan, effort: &Effort) -> Result<Vec<Carried>, RouteFailure> {
    let mut all = Vec::with_capacity(side.shape.knots.len());
    for (knot, panels) in side.shape.knots.iter().zip(&plan.extensions) {
        let count = side.shape.levels(knot).saturating_sub(1);
        let mut carried = vec![Carried { base: Real::zero(), upper: vec![Complex::zero(); count] }];
        for panel in panels.iter().rev() {
            effort.check()?;
            let (half, s) = (panel.half_width(), panel.centre() + &knot.depth);
            let terms = panel.terms.first().copied().unwrap_or(1);
            let series = PanelSeries::about(&side.time, &s, &half, panel.scale, terms, effort)?;
            carried = on_knots(side, std::slice::from_ref(knot), panel, (&[series], &carried))?.next;
        }
        all.append(&mut carried);
    }
    Ok(all)
}

/// The wave number of the carrier.
fn wave_number(side: &Side, bits: Bits) -> Option<Real> {
    match &side.shape.carrier {
        Carrier::Still => None,
        Carrier::Travelling(momentum) => Some(Real::from_rational(momentum, bits)),
        Carrier::Standing(mode) => {
            let twice = Real::from_rational(&Rational::from(&side.shape.half_width * 2), bits);
            Some(pi(bits).mul_i64(i64::from(*mode), bits).div(&twice, bits))
        }
    }
}

/// The carrier on a panel.
struct Waves {
    kappa: Real,
    /// `exp(-i kappa (s - centre))`.
    series: Factor,
    centre: Rational,
}

impl Waves {
    /// Precise enough for a product with any of the given functions.
    fn new<'e>(
        side: &Side,
        centre: &Rational,
        frame: &Frame<'_>,
        firsts: impl Iterator<Item = &'e Expansion>,
    ) -> Result<Option<Waves>, RouteFailure> {
        let scale = frame.scale + firsts.map(|first| excess(first, frame.scale)).max().unwrap_or(0);
        let bits = scale + 96;
        let Some(kappa) = wave_number(side, bits) else { return Ok(None) };
        let rate = kappa.mul(&Real::from_rational(frame.stretch, bits), bits).neg();
        let series = wave::wave(&rate, scale)?;
        Ok(Some(Waves { kappa, series, centre: centre.clone() }))
    }

    /// `kappa` times a length.
    fn phase(&self, length: &Rational) -> Real {
        let bits = self.kappa.midpoint().prec();
        self.kappa.mul(&Real::from_rational(length, bits), bits)
    }

    /// `exp(-i kappa (s + depth))`.
    fn at(&self, depth: &Rational) -> Result<Factor, RouteFailure> {
        self.series.turned(&self.phase(&Rational::from(&self.centre + depth)).neg())
    }
}

/// `Q` from the functions of all knots. For a standing wave, which is real, the real part of `e^(i kappa x) Q`, or of `-i` times it for
/// even modes.
fn total(side: &Side, all: &[Levels], waves: Option<&Waves>, frame: &Frame<'_>) -> Result<Expansion, RouteFailure> {
    let q = chain::combined(side, all, waves.map(|waves| &waves.kappa), frame)?;
    let (Some(waves), Carrier::Standing(mode)) = (waves, &side.shape.carrier) else { return Ok(q) };
    let mut phase = waves.phase(&Rational::from(&side.shape.half_width + &waves.centre));
    if mode % 2 == 0 {
        let bits = phase.midpoint().prec();
        phase = phase.sub(&pi(bits).shift(-1), bits);
    }
    let factor = waves.series.conj().turned(&phase)?;
    Ok(q.times(&factor, frame.scale).real_part())
}

/// Bits by which coefficients exceed one.
fn excess(series: &Expansion, scale: u32) -> u32 {
    series.regular.bits().max(series.logarithm.bits()).saturating_sub(scale) + 4
}

/// Lists on which `F` is known on a panel.
fn first_level(anchored: Anchored) -> Expansion {
    let regular = ComplexList::real(anchored.coefficients);
    Expansion { regular, logarithm: ComplexList::default(), error: anchored.error }
}

/// The functions of some knots on a panel, what is carried on to the next, and the carrier.
struct OnKnots {
    levels: Vec<Levels>,
    next: Vec<Carried>,
    waves: Option<Waves>,
}

/// Fills an [`OnKnots`].
fn on_knots(
    side: &Side,
    knots: &[Knot],
    panel: &Panel,
    (series, carried): (&[PanelSeries], &[Carried]),
) -> Result<OnKnots, RouteFailure> {
    let (centre, stretch, scale) = (panel.centre(), panel.half_width(), panel.scale);
    let frame = Frame { stretch: &stretch, scale };
    let mut firsts = Vec::with_capacity(knots.len());
    let mut bases = Vec::with_capacity(knots.len());
    for (series, before) in series.iter().zip(carried) {
        let anchored = series.anchored(&before.base, scale)?;
        bases.push(anchored.left_value.clone());
        firsts.push(first_level(anchored));
    }
    let waves = Waves::new(side, &centre, &frame, firsts.iter())?;
    let mut all = Vec::with_capacity(knots.len());
    let mut next = Vec::with_capacity(knots.len());
    for (((knot, first), base), before) in knots.iter().zip(firsts).zip(bases).zip(carried) {
        let wave = waves.as_ref().map(|waves| waves.at(&knot.depth)).transpose()?;
        let levels = chain::levels(first, wave.as_ref(), (before, Rational::from(1)), &frame)?;
        next.push(Carried { base, upper: chain::at_left(&levels, &frame) });
        all.push(levels);
    }
    Ok(OnKnots { levels: all, next, waves })
}

/// `Q` on a panel, and what is carried on to the next.
fn on_panel(
    side: &Side,
    panel: &Panel,
    series: &[PanelSeries],
    carried: &[Carried],
) -> Result<(Expansion, Vec<Carried>), RouteFailure> {
    let OnKnots { levels, next, waves } = on_knots(side, &side.shape.knots, panel, (series, carried))?;
    if !panel.squared {
        return Ok((Expansion::zero(), next));
    }
    let stretch = panel.half_width();
    let frame = Frame { stretch: &stretch, scale: panel.scale };
    Ok((total(side, &levels, waves.as_ref(), &frame)?, next))
}

/// `Q` on the panel at the cone, in powers of `y = s/width` and `ln y`.
fn at_cone(side: &Side, panel: &Panel, carried: &[Carried], effort: &Effort) -> Result<Expansion, RouteFailure> {
    let (stretch, scale) = (&panel.to, panel.scale);
    let frame = Frame { stretch, scale };
    let mut firsts = Vec::with_capacity(carried.len());
    for (index, ((knot, terms), before)) in side.shape.knots.iter().zip(&panel.terms).zip(carried).enumerate() {
        firsts.push(if index == 0 {
            let parts = edge::logarithmic(&side.time, stretch, (*terms, scale), &before.base, effort)?;
            let unit = Magnitude::power_of_two(-i64::from(scale));
            let error = parts.regular_error.max(parts.logarithm_error).mul(unit).add(parts.truncation);
            let (regular, logarithm) = (ComplexList::real(parts.regular), ComplexList::real(parts.logarithm));
            Expansion { regular, logarithm, error }
        } else {
            let series = PanelSeries::about(&side.time, &knot.depth, stretch, scale, *terms, effort)?;
            first_level(series.anchored(&before.base, scale)?)
        });
    }
    let waves = Waves::new(side, &Rational::new(), &frame, firsts.iter())?;
    let mut all: Vec<Levels> = Vec::with_capacity(carried.len());
    for (index, ((knot, first), before)) in side.shape.knots.iter().zip(firsts).zip(carried).enumerate() {
        let factor = if index == 0 { Rational::from(&side.time * 2) } else { Rational::from(1) };
        let wave = waves.as_ref().map(|waves| waves.at(&knot.depth)).transpose()?;
        all.push(chain::levels(first, wave.as_ref(), (before, factor), &frame)?);
    }
    total(side, &all, waves.as_ref(), &frame)
}

/// `e^(-r) (1 + 1/(2r)) sqrt(pi/(2r))`: Lemma N2 at `v = t + s`, with `r`.
fn k1_bound(time: &Rational, s: &Rational) -> (Real, Real) {
    let bits = BOUND_BITS;
    let r = separation(time, s);
    let correction = Real::from_i64(1).add(&Real::from_i64(1).div(&r.shift(1), bits), bits);
    let root = sqrt(&pi(bits).div(&r.shift(1), bits), bits);
    (exp(&r.neg(), bits).mul(&root, bits).mul(&correction, bits), r)
}

/// `2 a N`.
fn mass_bound(side: &Side) -> Real {
    Real::from_rational(&(Rational::from(&side.shape.half_width * 2) * &side.shape.norm), BOUND_BITS)
}

/// Bound of `g` at `v = t + s`, infinite if `s` is not positive.
fn kernel_bound(time: &Rational, s: &Rational) -> Magnitude {
    if *s <= 0 {
        return Magnitude::INFINITY;
    }
    let (k1, r) = k1_bound(time, s);
    k1.div(&r, BOUND_BITS).abs_upper()
}

/// Lemma N3 for `|Q|` at `s` and beyond.
fn size_bound(side: &Side, s: &Rational) -> Magnitude {
    sqrt(&mass_bound(side), BOUND_BITS).abs_upper().mul(kernel_bound(&side.time, s))
}

/// Lemma N3 for the integral of `|Q|^2` beyond `s`.
fn tail_bound(side: &Side, s: &Rational) -> Magnitude {
    if crate::spoil::is_active(crate::spoil::Fault::PiecewiseTailForgotten) {
        return Magnitude::ZERO;
    }
    let bits = BOUND_BITS;
    let (k1, r) = k1_bound(&side.time, s);
    let v = Real::from_rational(&Rational::from(&side.time + s), bits);
    // K_1^2/2 over r v.
    k1.square(bits).shift(-1).div(&r.mul(&v, bits), bits).mul(&mass_bound(side), bits).abs_upper()
}

fn witness(plan: &Plan, tail: Magnitude) -> Vec<(String, String)> {
    let mut list = Vec::new();
    let mut describe = |name: String, panel: &Panel| {
        let terms: Vec<String> = panel.terms.iter().map(usize::to_string).collect();
        let note = if panel.squared { "" } else { ", for the constants only" };
        let range = format!("s from {} to {}", panel.from, panel.to);
        list.push((name, format!("{range}, {} terms, 2^-{} units{note}", terms.join(" and "), panel.scale)));
    };
    if let Some(cone) = &plan.cone {
        describe("logarithmic panel".to_owned(), cone);
    }
    for (index, panel) in plan.panels.iter().enumerate() {
        describe(format!("panel {}", index + 1), panel);
    }
    for (index, panel) in plan.far.iter().enumerate() {
        let text = format!(
            "s from {} to {}, {} terms and {} moments, 2^-{} units",
            panel.from, panel.to, panel.terms, panel.moments, panel.scale
        );
        list.push((format!("panel {}, by moments", plan.panels.len() + index + 1), text));
    }
    list.push(("tail bound".to_owned(), decimal::upper_decimal(&tail.to_float(), 4)));
    list
}
