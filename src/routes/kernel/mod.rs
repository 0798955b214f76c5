//! Route "kernel": position space, with the closed form of the Newton-Wigner propagator.
//!
//! # Formula (unit mass)
//!
//! Outside the cone the propagator is `G(v, t) = (i t/pi) K_1(r)/r`, `r = sqrt(v^2 - t^2)`. With
//!
//! ```text
//! g(v) = K_1(r)/r,   k(v) = K_0(r),   F(v) = Int_v^inf g,
//! P(|x| > R) = t^2/(pi^2 a) * Int_{t+d}^inf q(v)^2 dv,     q(v) = F(v) - F(v + 2a),     d = R - a - t,
//! ```
//!
//! because the amplitude at `x` is `(i t/pi) (2a)^(-1/2) (F(x-a) - F(x+a))` and both sides count equally.
//!
//! # Method
//!
//! With `s = v - t` and `D = v^2 - t^2 = s (s + 2t)` the functions obey (DLMF 10.29.2, 10.29.3)
//!
//! ```text
//! D g' = -v (k + 2 g),     k' = -v g,     F' = -g,
//! ```
//!
//! so their Taylor coefficients about any point follow from a three-term recurrence with rational
//! coefficients, exact but for one rounding each. The half-line is cut into panels of geometrically
//! growing width; on each, `q` is a polynomial plus a proven remainder ([`panel`]), and
//! `Int q^2` is a finite sum ([`squares`]). The panels are visited from the far end, where `F` is
//! bounded by `K_0(r)/v`, towards the cone, each handing the value of `F` at its left end to the next: no
//! constant of integration and no cancellation. At the cone itself `F = A(s) + B(s) ln s` with
//! power series `A`, `B`; that panel ([`edge`]) is integrated with the moments of `ln s` and `ln^2 s`.
//!
//! # Bounds used everywhere
//!
//! **Lemma K1.** `g` and `F` are Laplace transforms of positive measures:
//! `g(v) = (1/t) Int_1^inf exp(-kappa v) sinh(t sqrt(kappa^2 - 1)) dkappa` for `v > t`. Hence they extend to
//! `Re v > t` with `|g(v)| <= g(Re v)`, `|F(v)| <= F(Re v)`, and so does `q`, with the factor
//! `1 - exp(-2 a kappa)` in the measure; and `(-1)^n` times the n-th derivative is positive.
//!
//! **Lemma K2.** `F(v) <= K_0(r)/v <= sqrt(pi/(2r)) exp(-r)/v`. *Proof.* `r dr = v dv`, so
//! `F(v) = Int_r^inf K_1(y)/sqrt(y^2 + t^2) dy <= (1/v) Int_r^inf K_1 = K_0(r)/v`;
//! `K_0(r) = Int_0^inf exp(-r cosh u) du <= exp(-r) Int_0^inf exp(-r u^2/2) du`. ∎
//!
//! **Lemma K3.** `Int_v^inf F^2 <= (pi/(4 r v^2)) exp(-2r)`. *Proof.* Square Lemma K2; `1/(r v^2)` falls,
//! and `dv = (r/v) dr <= dr`. ∎ As `0 <= q <= F`, this bounds what is cut off.
//!
//! For mass zero see [`massless`]: closed form with the dilogarithm.

pub(in crate::routes) mod edge;
mod massless;
pub(in crate::routes) mod panel;
pub(in crate::routes) mod plan;
pub(in crate::routes) mod squares;

use super::{Effort, Route, RouteFailure, RouteOutcome, TailProblem};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, decimal};
use crate::functions::elementary::{exp, pi, sqrt};
use panel::PanelSeries;
use plan::{PanelPlan, Plan};
use rayon::prelude::*;
use rug::Rational;

/// The kernel route.
pub struct Kernel;

/// The kernel route, ready to use.
pub const KERNEL: Kernel = Kernel;

/// Precision in which error bounds are evaluated; they need few digits.
pub(in crate::routes) const BOUND_BITS: Bits = 64;
/// From this precision on, panels are worth a thread of their own.
pub(in crate::routes) const PARALLEL_FROM: u32 = 700;

impl Route for Kernel {
    fn name(&self) -> &'static str {
        "kernel"
    }

    fn method(&self, problem: &TailProblem) -> &'static str {
        if problem.massless {
            "Newton-Wigner propagator in position space, closed form with the dilogarithm"
        } else {
            "Newton-Wigner propagator in position space, Taylor panels by recurrence, logarithmic series at the cone"
        }
    }

    fn evaluate(&self, problem: &TailProblem, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        if problem.massless {
            return massless::evaluate(problem, digits, effort);
        }
        let plan = Plan::new(problem, digits)?;
        effort.allow_bits(plan.bits)?;
        let series = all_series(problem, &plan, effort)?;
        let (pieces, carry) = carry_inward(problem, &plan, &series)?;
        let at_edge = || match &plan.edge {
            Some(edge) => edge::integral(problem, edge, &carry, effort),
            None => Ok(Real::zero()),
        };
        let (edge, integrals) = if plan.bits >= PARALLEL_FROM {
            rayon::join(at_edge, || all_squares(&pieces, &plan, effort))
        } else {
            (at_edge(), all_squares(&pieces, &plan, effort))
        };
        let mut total = edge?;
        for integral in &integrals? {
            total = total.add(integral, plan.bits);
        }
        let tail = tail_bound(problem, &plan);
        let half = Real::from_float(tail.to_float()).shift(-1);
        total = total.add(&half, plan.bits).widen(half.abs_upper());
        let probability = prefactor(problem, plan.bits).mul(&total, plan.bits);
        Ok(RouteOutcome {
            interval: probability.to_interval(plan.bits).clamp_non_negative(),
            bits: plan.bits,
            nodes: plan.terms(),
            witness: witness(&plan, tail, &total),
        })
    }
}

/// Value bounds of `F` and `F(. + 2a)` handed from panel to panel.
pub(super) struct Carry {
    /// `F` at the point reached.
    near: Real,
    /// `F` at the point reached plus `2a`.
    shifted: Real,
}

/// Series of both functions on one panel.
struct PanelPair {
    near: PanelSeries,
    shifted: PanelSeries,
}

fn all_series(problem: &TailProblem, plan: &Plan, effort: &Effort) -> Result<Vec<PanelPair>, RouteFailure> {
    let one = |panel: &PanelPlan| -> Result<PanelPair, RouteFailure> {
        let near = PanelSeries::new(&problem.time, &panel.centre(), panel, panel.terms, effort)?;
        let centre = panel.centre() + Rational::from(&problem.half_width * 2);
        let shifted = PanelSeries::new(&problem.time, &centre, panel, panel.shifted_terms, effort)?;
        Ok(PanelPair { near, shifted })
    };
    if plan.bits >= PARALLEL_FROM {
        plan.panels.par_iter().map(one).collect()
    } else {
        plan.panels.iter().map(one).collect()
    }
}

/// A polynomial for `q` on one panel, ready to be squared.
struct Piece {
    /// Coefficients of `(-1)^n q_n`, in units of `2^-scale`.
    coefficients: Vec<rug::Integer>,
    /// Bound of the error of `q` on the panel.
    error: Magnitude,
    /// Bound of `q` on the panel.
    size: Magnitude,
    half_width: Rational,
    scale: u32,
    squared: bool,
}

/// Fixes the constants of integration from the far end inward.
fn carry_inward(problem: &TailProblem, plan: &Plan, series: &[PanelPair]) -> Result<(Vec<Piece>, Carry), RouteFailure> {
    let shift = Rational::from(&problem.half_width * 2);
    let end = plan.far_end();
    let mut carry = Carry {
        near: unknown_below(function_bound(&problem.time, &end)),
        shifted: unknown_below(function_bound(&problem.time, &Rational::from(&end + &shift))),
    };
    let mut pieces = Vec::with_capacity(series.len());
    for (panel, pair) in plan.panels.iter().zip(series).rev() {
        let near = pair.near.anchored(&carry.near, panel.scale)?;
        let shifted = pair.shifted.anchored(&carry.shifted, panel.scale)?;
        carry = Carry { near: near.left_value.clone(), shifted: shifted.left_value.clone() };
        pieces.push(Piece {
            coefficients: squares::difference(near.coefficients, shifted.coefficients),
            error: near.error.add(shifted.error),
            size: carry.near.abs_upper(),
            half_width: panel.half_width(),
            scale: panel.scale,
            squared: panel.squared,
        });
    }
    Ok((pieces, carry))
}

/// A number known to lie in `[0, bound]`.
fn unknown_below(bound: Magnitude) -> Real {
    let half = Real::from_float(bound.to_float()).shift(-1);
    let radius = half.abs_upper();
    half.widen(radius)
}

/// Lemma K2 at `v = t + s`, infinite if `s` is not positive.
pub(in crate::routes) fn function_bound(time: &Rational, s: &Rational) -> Magnitude {
    if *s <= 0 {
        return Magnitude::INFINITY;
    }
    let bits = BOUND_BITS;
    let r = separation(time, s);
    let root = sqrt(&pi(bits).div(&r.shift(1), bits), bits);
    let v = Real::from_rational(&Rational::from(time + s), bits);
    exp(&r.neg(), bits).mul(&root, bits).div(&v, bits).abs_upper()
}

/// `r = sqrt(s (s + 2t))`.
pub(in crate::routes) fn separation(time: &Rational, s: &Rational) -> Real {
    let square = (s + Rational::from(time * 2)) * s;
    sqrt(&Real::from_rational(&square, BOUND_BITS), BOUND_BITS)
}

/// Lemma K3 at the first point that is not squared.
fn tail_bound(problem: &TailProblem, plan: &Plan) -> Magnitude {
    if crate::spoil::is_active(crate::spoil::Fault::KernelTailForgotten) {
        return Magnitude::ZERO;
    }
    let bits = BOUND_BITS;
    let s = plan.squared_end();
    let r = separation(&problem.time, &s);
    let v = Real::from_rational(&Rational::from(&problem.time + &s), bits);
    let below = r.mul(&v.square(bits), bits).shift(2);
    pi(bits).mul(&exp(&r.shift(1).neg(), bits), bits).div(&below, bits).abs_upper()
}

fn all_squares(pieces: &[Piece], plan: &Plan, effort: &Effort) -> Result<Vec<Real>, RouteFailure> {
    let one = |piece: &Piece| -> Result<Real, RouteFailure> {
        effort.check()?;
        if !piece.squared {
            return Ok(Real::zero());
        }
        let half_width = Real::from_rational(&piece.half_width, plan.bits);
        let sum = squares::integral(&piece.coefficients, piece.scale);
        // |p^2 - q^2| <= 2 |q| e + e^2 on an interval of length 2 in the panel variable.
        let slack = piece.size.shift(1).add(piece.error).mul(piece.error).shift(1);
        Ok(sum.widen(slack).mul(&half_width, plan.bits))
    };
    if plan.bits >= PARALLEL_FROM { pieces.par_iter().map(one).collect() } else { pieces.iter().map(one).collect() }
}

/// `t^2/(pi^2 a)`.
fn prefactor(problem: &TailProblem, bits: Bits) -> Real {
    let ratio = Rational::from(&problem.time * &problem.time) / &problem.half_width;
    Real::from_rational(&ratio, bits).div(&pi(bits).square(bits), bits)
}

fn witness(plan: &Plan, tail: Magnitude, total: &Real) -> Vec<(String, String)> {
    let mut list = Vec::new();
    if let Some(edge) = &plan.edge {
        list.push(("logarithmic panel from s".to_owned(), edge.from.to_string()));
        list.push(("logarithmic panel to s".to_owned(), edge.to.to_string()));
        list.push(("logarithmic panel terms".to_owned(), edge.terms.to_string()));
    }
    for (index, panel) in plan.panels.iter().enumerate() {
        let text = format!(
            "s from {} to {}, {} and {} terms, 2^-{} units{}",
            panel.from,
            panel.to,
            panel.terms,
            panel.shifted_terms,
            panel.scale,
            if panel.squared { "" } else { ", for the constant only" }
        );
        list.push((format!("panel {}", index + 1), text));
    }
    list.push(("tail bound".to_owned(), decimal::upper_decimal(&tail.to_float(), 4)));
    let interval: Interval = total.to_interval(plan.bits);
    list.push(("integral of q^2, lower".to_owned(), decimal::lower_decimal(interval.lower(), 20)));
    list.push(("integral of q^2, upper".to_owned(), decimal::upper_decimal(interval.upper(), 20)));
    list
}
