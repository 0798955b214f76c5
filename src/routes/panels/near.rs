//! Panels near the packet, knot by knot: Taylor series of `F` about every knot, constants from outside inward, and
//! the logarithmic panel at the cone.

use super::bounds::size_bound;
use super::chain::{self, Carried, Frame, Levels};
use super::expansion::{ComplexList, Expansion, Factor};
use super::plan::{Panel, Plan};
use super::shape::Knot;
use super::{Side, squares, wave, wave_number};
use crate::arithmetic::{Complex, Magnitude, Real};
use crate::functions::elementary::pi;
use crate::packets::piecewise::Carrier;
use crate::routes::kernel::panel::{Anchored, PanelSeries};
use crate::routes::kernel::{PARALLEL_FROM, edge, function_bound};
use crate::routes::{Effort, RouteFailure};
use rayon::prelude::*;
use rug::Rational;

/// `Int |Q|^2` over the panels that are treated knot by knot.
pub(super) fn integral(side: &Side, plan: &Plan, effort: &Effort) -> Result<Real, RouteFailure> {
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

/// The series of `F` about every knot on every panel.
pub(super) fn all_series(side: &Side, plan: &Plan, effort: &Effort) -> Result<Vec<Vec<PanelSeries>>, RouteFailure> {
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
pub(super) fn at_far_end(side: &Side, plan: &Plan) -> Vec<Carried> {
    let end = plan.far_end();
    let of_knot = |knot: &Knot| {
        let bound = function_bound(&side.time, &Rational::from(&end + &knot.depth));
        let upper = Complex::zero().widen(bound);
        Carried { base: Real::zero().widen(bound), upper: vec![upper; side.shape.levels(knot).saturating_sub(1)] }
    };
    side.shape.knots.iter().map(of_knot).collect()
}

/// All functions at the outer end of the near panels, when their constants are free: zero at the point `t + s + 2a`
/// that the last knot reaches there.
///
/// `Q` does not depend on the constants as long as all knots use the same functions `F, Phi_1, Phi_2, ...`, each of
/// them minus the derivative of the next (`Phi_1` being `e^(-i kappa v) F`): integration by parts needs nothing else.
pub(super) fn at_common_point(side: &Side, plan: &Plan, effort: &Effort) -> Result<Vec<Carried>, RouteFailure> {
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

/// `Q` from the functions of all knots. For a standing wave, which is real, the real part of `e^(i kappa x) Q`, or of
/// `-i` times it for even modes.
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
pub(super) fn on_panel(
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
pub(super) fn at_cone(
    side: &Side,
    panel: &Panel,
    carried: &[Carried],
    effort: &Effort,
) -> Result<Expansion, RouteFailure> {
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
