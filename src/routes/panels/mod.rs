//! Route "kernel" for packets made of polynomial pieces, with or without a carrier wave.
//!
//! # Formula (unit mass)
//!
//! Right of the cone the Newton-Wigner propagator is `(i t/pi) g(x - y)`, `g(v) = K_1(r)/r`, `r = sqrt(v^2 - t^2)`,
//! so that
//!
//! ```text
//! psi(x) = (i t/pi) Q(x),    P(x > a + t + d) = t^2/(pi^2 N) Int_d^inf |Q|^2 ds,    s = x - a - t,    N = Int |psi0|^2,
//! ```
//!
//! and `Q` is a finite sum of iterated integrals of `g` over the knots (module `shape`); the left side is the right
//! side of the reflected packet. For a box the sum is the `q` of [`super::kernel`], whose panels, recurrences and
//! logarithmic series serve here too.
//!
//! # Method
//!
//! On panels that grow geometrically with `s`, `F = Int_v^inf g` about every knot comes from the recurrence of
//! its module `panel`; iterated integrals are term-by-term integrals, their constants carried inward from the far end
//! (module `chain`). A carrier wave multiplies `F` by a power series (module `wave`). At the cone the functions of
//! the outermost knot have a logarithm. `Q` is a polynomial with a proven error on every panel (module `expansion`),
//! and `|Q|^2` is integrated exactly (module `squares`). Farther away than the packet's own size the knots would
//! nearly cancel, and a carrier would need short panels; there one Taylor series of `g` and the packet's moments take
//! over (module `far`).
//!
//! # Bounds
//!
//! **Lemma N1.** Put `G_1 = F`, `G_(j+1)(v) = Int_v^inf G_j`. Then `|Phi_j(v)| <= G_j(v) <= K_0(r)/v` for all
//! `j >= 1`. *Proof.* As `v >= r`, `r(v + z)^2 = r^2 + 2 v z + z^2 >= (r + z)^2`; and `K_0(y) e^y` falls (DLMF
//! 10.32.9). So by Lemma K2 `F(v + z) <= K_0(r + z)/(v + z) <= e^(-z) K_0(r)/v`, and
//! `G_j(v) = Int_0^inf z^(j-2)/(j-2)! F(v + z) dz <= K_0(r)/v`. ∎ This bounds the constants at the far end.
//!
//! **Lemma N2.** `K_1(r) <= sqrt(pi/(2r)) e^(-r) (1 + 1/(2r))`. *Proof.* Put `x = 2 sinh(u/2)` in
//! `Int_0^inf e^(-r cosh u) cosh u du`: `e^(-r) Int_0^inf e^(-r x^2/2) (1 + x^2/2)/sqrt(1 + x^2/4) dx`, and leave out
//! the root. ∎
//!
//! **Lemma N3.** `|Q| <= g(t + s) Int |psi0| <= g(t + s) sqrt(2 a N)` as `g` falls, and
//! `Int_S^inf |Q|^2 ds <= 2 a N pi/(4 v r^2) e^(-2r) (1 + 1/(2r))^2` with `v`, `r` at `S`. *Proof.*
//! `Int g^2 dv = Int K_1^2/(r v) dr <= (1/(r v)) Int_r^inf K_1^2`, and `Int_r^inf K_1^2 <= K_1(r)^2/2` as
//! `K_1(y) e^y` falls; then Lemma N2. ∎

mod bounds;
mod chain;
mod expansion;
mod far;
mod moments;
mod near;
mod plan;
mod profile;
mod shape;
mod squares;
#[cfg(test)]
mod tests;
mod wave;

use super::kernel::PARALLEL_FROM;
use super::{Effort, Evaluation, RouteFailure, RouteOutcome};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, decimal};
use crate::error::Error;
use crate::functions::elementary::pi;
use crate::packets::piecewise::{Carrier, PiecewisePacket};
use bounds::{size_bound, tail_bound};
use moments::Moments;
use plan::{FarPanel, Panel, Plan};
use rayon::prelude::*;
use rug::{Float, Rational};
use shape::Shape;

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
/// With the packet's support `|x - c| <= a` the region is `|x - c| > a + |t| + distance`, or one side of it; for a
/// ball of radius `a` it is `r > a + |t| + distance`.
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
    let mut total = near::integral(side, &plan, effort)?;
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
