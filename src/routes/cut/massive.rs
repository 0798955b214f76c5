//! The sum for positive mass (unit mass): trapezoid rule in the rapidity.
//!
//! # Formula
//!
//! With `kappa = cosh x`, `P = 1/pi^2 Sum_j S_j`, `S = Int_0^inf Int_0^inf w(x) w(y)/(cosh x + cosh y) dx dy`,
//!
//! ```text
//! w(x) = F(cosh x) sinh(t sinh x) exp(-(t + d) cosh x) sinh x
//!      = exp(-E) 1/2 exp(-Y(x)) (1 - exp(-2 t sinh x)) F(cosh x) sinh x,
//! E = sqrt(d (d + 2t)),     Y(x) = (sqrt(t + d/2) e^(-x/2) - sqrt(d/2) e^(x/2))^2,
//! ```
//!
//! even and entire in `x` (`F` is entire and real on the real line). The factor `exp(-E)` is taken out of every weight, and the
//! weights are divided by a power of two `W >= 4V`, so that with `|z F| <= V`
//!
//! ```text
//! |w(x)| <= 1/8 exp(-Y(x)) tanh x,     |w(x)/(2 sinh x)| <= 1/16 exp(-Y(x)) / cosh x     on the real line.
//! ```
//!
//! # Discretisation
//!
//! **Lemma 1.** For `0 <= b <= pi/2` and real `s`, `y`: `|cosh(s + ib) + cosh y| >= (cosh s + cosh y)/2`. *Proof.* The square of the
//! left side is `cosh^2 s - sin^2 b + 2 cosh s cosh y cos b + cosh^2 y >= cosh^2 s + cosh^2 y - 1 >= (cosh^2 s + cosh^2 y)/2`. ∎
//!
//! **Lemma 2.** For `|b'| <= b <= pi/2`, with the factors `exp(-E)` and `1/W` taken out, `|w(s + ib')| <= C exp(E (1 - cos b))`,
//! `C = min(V/cos b, max(V coth 1, L cosh 1))/W`. *Proof.* Let `z = cosh(s + ib')`, `Re z = cosh s cos b' >= 0`. Then `|sinh(t
//! sinh x) e^(-tz)| = |exp(-t e^-x) - exp(-t e^x)|/2 <= exp(-t e^-|s| cos b')` and `|e^(-dz)| = exp(-d cosh s cos b')`, and `t e^-|s| +
//! d cosh s >= E` by the inequality of arithmetic and geometric means. What remains is `|F(z)| |sinh x| <= min(L, V/|z|) cosh s`. As
//! `|z| >= cosh s cos b'` it is at most `V/cos b'`; as `|z| >= |sinh s|` it is at most `V coth 1` for `|s| >= 1`, and at most
//! `L cosh 1` below. ∎
//!
//! **Theorem 3.** `S_h = h^2 Sum_{k,l>=1} w(kh) w(lh)/(cosh kh + cosh lh)` obeys `|S - S_h| <= e^(E (1 - cos b)) C (pi^2 + h)/(2 (exp(2
//! pi b/h) - 1))`. *Proof.* `w` vanishes on the axes, so `4 S_h` is the trapezoid sum over the plane. For `f` analytic in `|Im x| <=
//! b`, falling at both ends, with `Int |f(s ± ib')| ds <= M` for `b' <= b`, the rule errs by at most `2M/(exp(2 pi b/h) - 1)`
//! (Trefethen and Weideman, SIAM Review 56 (2014), theorem 5.1). In `x` for each `y = lh`: `M <= 2 C e^.. Int ds/(cosh s + cosh y) = 4 C
//! e^.. y/sinh y`; the weights `h |w(lh)| <= h/4` and `h Sum_l y/sinh y <= pi^2/2 + h` (unimodal) give at most `C e^.. (pi^2 + 2h)/(exp - 1)`.
//! In `y` for `w(y) Int w(x)/(cosh x + cosh y) dx`: `M <= C e^.. (1/4) 2 Int Int ds dx/(cosh s + cosh x) = C e^.. pi^2/2`, hence `C e^..
//! pi^2/(exp - 1)`. Only absolute values of weights enter. ∎
//!
//! # Ends
//!
//! * Left: pairs with a node below the first one add at most `2 (1/4)^2 exp(-Y) h^2 Sum Sum 1/(cosh + cosh) <= (pi^2/32) exp(-Y)`, `Y` at
//!   the last node left out, since `Y` falls up to the centre and the terms fall in both directions (`Int Int = pi^2/4`).
//! * Right: beyond the last node, at `X`, let `|w| <= U <= 1/4`: by the packet's tail bound `kappa |F| <= T` from there on, `U = min(1/4,
//!   T/(2W)) exp(-Y(X))` (the exponential only beyond the centre). Pairs with a node there add at most `2 (1/4) U h^2 Sum_{k>K}
//!   Sum_l 1/(cosh + cosh) <= (U/2) Int_X^inf x/sinh x dx <= U (X+1) e^-X/(1 - e^(-2X))`.
//!
//! * At the cone, if that is shorter, the nodes beyond some place are summed in closed form instead: [`super::edge`].
//!
//! Rounding: balls, and the bound of the near field of the box (which is about absolute values).

mod nodes;
mod plan;

use super::amplitude::{CutAmplitude, EdgeWave, PreparedAmplitude};
use super::edge::EdgeSeries;
use super::{Problem, SideSum, exponent_above, shown, size_bound};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{cos, exp, exp_m1, pi, sqrt};
use crate::routes::spectral::BOUND_BITS;
use crate::routes::spectral::far_field::{self, FarPlan};
use crate::routes::spectral::near_field::{self, Lattice, Tangents};
use crate::routes::{Effort, RouteFailure};
use nodes::Nodes;
use plan::Plan;
use rug::Rational;
use std::f64::consts::{LN_2, PI};

pub(super) use nodes::no_enclosure;
pub(super) use plan::{MAX_NODES, coarse_bisect};

/// What the bounds need, in few bits.
struct Sizes {
    /// `V/W`
    variation: Magnitude,
    /// `L/W`
    size: Magnitude,
    /// `W = 2^exponent`
    exponent: i64,
    /// `E`
    proper_distance: Real,
    tail: Box<dyn PreparedAmplitude>,
}

pub(super) fn sum(
    amplitude: &dyn CutAmplitude,
    problem: &Problem,
    goal: f64,
    effort: &Effort,
) -> Result<SideSum, RouteFailure> {
    let sizes = Sizes::new(amplitude, problem)?;
    let place = Place::new(problem, BOUND_BITS);
    let plan = sizes.plan(problem, &place, goal)?;
    let lattice = &plan.lattice;
    effort.allow_bits(lattice.bits)?;
    let tangents = Tangents::new(lattice, effort)?;
    let mut errors =
        vec![("discretisation bound", sizes.discretisation(&plan)), ("left cut-off bound", place.left_cut(lattice))];
    if plan.far.is_none() {
        errors.push(("right cut-off bound", sizes.right_cut(&place, lattice)));
    }
    let step = lattice.step_ball(lattice.bits).square(lattice.bits);
    let nodes = Nodes::new(amplitude, problem, &sizes, lattice, effort)?;
    let edge = if plan.far.is_some() { amplitude.prepare(lattice.bits)?.edge() } else { Vec::new() };
    let mut total = Real::zero();
    for (index, part) in nodes.parts().enumerate() {
        let mut found = near_field::sum(&part, lattice, &tangents, effort)?;
        if let Some((series_terms, cross_terms)) = plan.far {
            let series = sizes.edge_series(&edge, problem, lattice.bits, index == 1);
            let far_plan = FarPlan { lattice: lattice.clone(), series_terms, cross_terms };
            let far = far_field::sum(&series, &part, &far_plan, effort)?;
            found = found.add(&far.sum, lattice.bits);
            if index == 0 {
                // The bound covers both parts.
                errors.push(("far-field replacement bound", far.replacement_error));
            }
        }
        let integral = found.mul(&step, lattice.bits);
        let widened = errors.iter().fold(integral, |sum, (_, error)| sum.widen(*error));
        total = total.add(&widened, lattice.bits);
    }
    let mut witness = vec![
        ("step h, in units of ln 2", lattice.step.to_string()),
        ("strip half-width b", plan.strip.as_ref().map_or("pi/2".to_owned(), ToString::to_string)),
        ("first node", lattice.first.to_string()),
        ("last node of those that all pair", lattice.near.to_string()),
        ("last node", lattice.last.to_string()),
        ("far field in closed form", plan.far.is_some().to_string()),
        ("binary logarithm of the unit of the weights", sizes.exponent.to_string()),
    ];
    witness.extend(errors.iter().map(|(name, bound)| (*name, shown(*bound))));
    Ok(SideSum {
        value: total.shift(2 * sizes.exponent),
        unit: 2.0 * sizes.exponent as f64 * LN_2 - 2.0 * PI.ln(),
        bits: lattice.bits,
        nodes: lattice.last - lattice.first + 1,
        witness,
    })
}

/// The numbers of the exponent `Y`.
struct Place {
    time: Real,
    /// `sqrt(t + d/2)`
    left_root: Real,
    /// `sqrt(d/2)`
    right_root: Real,
}

impl Place {
    fn new(problem: &Problem, bits: Bits) -> Place {
        let half = Rational::from(&problem.distance / 2);
        Place {
            time: Real::from_rational(&problem.time, bits),
            left_root: sqrt(&Real::from_rational(&Rational::from(&problem.time + &half), bits), bits),
            right_root: sqrt(&Real::from_rational(&half, bits), bits),
        }
    }

    /// `sqrt(t + d/2) e^(-x/2) - sqrt(d/2) e^(x/2)` from `e^(x/2)`.
    fn gap(&self, half: &Real, bits: Bits) -> Real {
        self.left_root.div(half, bits).sub(&self.right_root.mul(half, bits), bits)
    }

    fn left_cut(&self, lattice: &Lattice) -> Magnitude {
        if lattice.first <= 1 {
            return Magnitude::ZERO;
        }
        let x = lattice.step_ball(BOUND_BITS).mul_i64(lattice.first as i64 - 1, BOUND_BITS);
        let gap = self.gap(&exp(&x.shift(-1), BOUND_BITS), BOUND_BITS);
        if !gap.certainly_positive() {
            return Magnitude::INFINITY;
        }
        // pi^2/32 < 1/2.
        exp(&gap.square(BOUND_BITS).neg(), BOUND_BITS).abs_upper().shift(-1)
    }
}

impl Sizes {
    fn new(amplitude: &dyn CutAmplitude, problem: &Problem) -> Result<Sizes, RouteFailure> {
        let tail = amplitude.prepare(BOUND_BITS)?;
        let variation = tail.variation();
        if variation.is_infinite() {
            let reason = "the variation of the packet has no finite bound".to_owned();
            return Err(RouteFailure::OutOfReach { reason });
        }
        let exponent = exponent_above(variation) + 2;
        let squared = Real::from_rational(&problem.squared_distance(), BOUND_BITS);
        Ok(Sizes {
            variation: variation.shift(-exponent),
            size: size_bound(problem).shift(-exponent),
            exponent,
            proper_distance: sqrt(&squared, BOUND_BITS),
            tail,
        })
    }

    fn edge_series<'a>(
        &'a self,
        waves: &'a [EdgeWave],
        problem: &Problem,
        bits: Bits,
        imaginary: bool,
    ) -> EdgeSeries<'a> {
        let time = Real::from_rational(&problem.time, bits);
        EdgeSeries { waves, amplitude: self.tail.as_ref(), time, exponent: self.exponent, imaginary }
    }

    /// `C` of Lemma 2.
    fn constant(&self, cosine: &Real) -> Magnitude {
        let e = exp(&Real::from_i64(1), BOUND_BITS);
        let square = e.square(BOUND_BITS);
        let one = Real::from_i64(1);
        let coth = square.add(&one, BOUND_BITS).div(&square.sub(&one, BOUND_BITS), BOUND_BITS).abs_upper();
        let cosh = e.add(&one.div(&e, BOUND_BITS), BOUND_BITS).shift(-1).abs_upper();
        let wide = self.variation.mul(coth).max(self.size.mul(cosh));
        if cosine.certainly_positive() { self.variation.div(cosine.abs_lower()).min(wide) } else { wide }
    }

    /// Theorem 3.
    fn discretisation(&self, plan: &Plan) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::TrapezoidErrorForgotten) {
            return Magnitude::ZERO;
        }
        let bits = BOUND_BITS;
        let step = plan.lattice.step_ball(bits);
        let (strip, cosine) = match &plan.strip {
            None => (pi(bits).shift(-1), Real::zero()),
            Some(b) => {
                let b = Real::from_rational(b, bits);
                let cosine = cos(&b, bits);
                (b, cosine)
            }
        };
        let decay = exp_m1(&pi(bits).mul(&strip, bits).shift(1).div(&step, bits), bits);
        let loss = exp(&Real::from_i64(1).sub(&cosine, bits).mul(&self.proper_distance, bits), bits);
        let size = pi(bits).square(bits).add(&step, bits).abs_upper().shift(-1);
        size.mul(self.constant(&cosine)).mul(loss.abs_upper()).div(decay.abs_lower())
    }

    /// `min(1/4, T/(2W))` from the rapidity `x` on.
    fn tail_weight(&self, x: &Real) -> Magnitude {
        let half = exp(x, BOUND_BITS);
        let kappa = half.add(&Real::from_i64(1).div(&half, BOUND_BITS), BOUND_BITS).shift(-1);
        self.tail.tail(&kappa).shift(-self.exponent - 1).min(Magnitude::power_of_two(-2))
    }

    fn right_cut(&self, place: &Place, lattice: &Lattice) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::CutOffForgotten) {
            return Magnitude::ZERO;
        }
        let bits = BOUND_BITS;
        let x = lattice.step_ball(bits).mul_i64(lattice.last as i64, bits);
        let gap = place.gap(&exp(&x.shift(-1), bits), bits);
        let exponent = if gap.certainly_negative() { gap.square(bits).add(&x, bits) } else { x.clone() };
        let one = Real::from_i64(1);
        let below = one.sub(&exp(&x.shift(1).neg(), bits), bits);
        let factor = x.add(&one, bits).mul(&exp(&exponent.neg(), bits), bits).div(&below, bits);
        factor.abs_upper().mul(self.tail_weight(&x))
    }
}
