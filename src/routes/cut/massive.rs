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
//! weights are divided by a power of two `W >= 2V`, so that with `|z F| <= V`
//!
//! ```text
//! |w(x)| <= 1/4 exp(-Y(x)) tanh x,     |w(x)/(2 sinh x)| <= 1/8 exp(-Y(x)) / cosh x     on the real line.
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
//! Rounding: balls, and the bound of the near field of the box (which is about absolute values).

use super::amplitude::{CutAmplitude, PreparedAmplitude};
use super::{Problem, SideSum, exponent_above, shown, size_bound};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::{cos, exp, exp_m1, pi, sqrt};
use crate::routes::estimate::{bisect, dyadic, proper_distance};
use crate::routes::spectral::near_field::{self, Lattice, Tangents, Weights};
use crate::routes::spectral::{BOUND_BITS, one_minus_exp};
use crate::routes::{Effort, RouteFailure};
use rug::{Integer, Rational};
use std::f64::consts::{FRAC_PI_2, LN_2, PI};

/// More nodes than this are refused.
pub(super) const MAX_NODES: f64 = 60_000.0;

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

/// Nodes, strip and precision, chosen in double precision.
struct Plan {
    lattice: Lattice,
    /// `None` stands for `pi/2`.
    strip: Option<Rational>,
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
    let errors = [
        ("discretisation bound", sizes.discretisation(&plan)),
        ("left cut-off bound", place.left_cut(lattice)),
        ("right cut-off bound", sizes.right_cut(&place, lattice)),
    ];
    let step = lattice.step_ball(lattice.bits).square(lattice.bits);
    let mut total = Real::zero();
    for part in Nodes::new(amplitude, problem, &sizes, lattice, effort)?.parts() {
        let found = near_field::sum(&part, lattice, &tangents, effort)?.mul(&step, lattice.bits);
        let widened = errors.iter().fold(found, |sum, (_, error)| sum.widen(*error));
        total = total.add(&widened, lattice.bits);
    }
    let mut witness = vec![
        ("step h, in units of ln 2", lattice.step.to_string()),
        ("strip half-width b", plan.strip.as_ref().map_or("pi/2".to_owned(), ToString::to_string)),
        ("first node", lattice.first.to_string()),
        ("last node", lattice.last.to_string()),
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
        let exponent = exponent_above(variation) + 1;
        let squared = Real::from_rational(&problem.squared_distance(), BOUND_BITS);
        Ok(Sizes {
            variation: variation.shift(-exponent),
            size: size_bound(problem).shift(-exponent),
            exponent,
            proper_distance: sqrt(&squared, BOUND_BITS),
            tail,
        })
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

    fn plan(&self, problem: &Problem, place: &Place, goal: f64) -> Result<Plan, RouteFailure> {
        let (t, d) = (problem.time.to_f64(), problem.distance.to_f64());
        let distance = proper_distance(t, d);
        let (width, strip) = self.choose_step(distance, goal);
        let step = dyadic(width / LN_2, 24);
        let h = step.to_f64() * LN_2;
        let (fall, rise) = (place.left_root.to_f64(), place.right_root.to_f64());
        let exponent = |x: f64| (fall * (-x / 2.0).exp() - rise * (x / 2.0).exp()).powi(2);
        let centre = if d == 0.0 { f64::INFINITY } else { (fall / rise).ln() };
        let left = if d == 0.0 { (t / goal).ln().max(0.0) } else { bisect(0.0, centre, |x| exponent(x) < goal) };
        let enough = |x: f64| {
            let beyond = if x > centre { exponent(x) } else { 0.0 };
            let weight = self.tail_weight(&Real::from_float(rug::Float::with_val(53, x))).log2_estimate() * LN_2;
            weight + (x + 1.0).ln() - x - beyond < -goal
        };
        let low = left.max(if d == 0.0 { 0.0 } else { centre.max(0.0) });
        let high = low + goal + (goal + low + 2.0).ln() + 4.0;
        let right = coarse_bisect(low, high, h, enough);
        let (first, last) = ((left / h).floor().max(1.0), (right / h).ceil() + 1.0);
        let count = last - first + 1.0;
        if count > MAX_NODES {
            let reason = format!("the spectral sum would need {count:.0} nodes, more than {MAX_NODES:.0}");
            return Err(RouteFailure::OutOfReach { reason });
        }
        let scale = (goal / LN_2 + 2.0 * count.log2() + 8.0).max(48.0);
        // Exponents of size up to E lose log2(E) bits; huge times lose a few more.
        let bits = scale + distance.max(1.0).log2() + (1.0 + t).log2() + 24.0;
        let (first, last) = (first as usize, last as usize);
        let lattice = Lattice { step, first, near: last, last, bits: bits as u32, scale: scale as u32 };
        Ok(Plan { lattice, strip: strip.map(|b| dyadic(b, 30)) })
    }

    /// The largest step for which Theorem 3 reaches `exp(-goal)`, with the strip that allows it.
    fn choose_step(&self, distance: f64, goal: f64) -> (f64, Option<f64>) {
        let wide = self.constant(&Real::zero()).log2_estimate() * LN_2;
        let narrow = self.variation.log2_estimate() * LN_2;
        let step_for =
            |b: f64, constant: f64| 2.0 * PI * b / (goal + 6f64.ln() + constant + distance * (1.0 - b.cos())).max(1.0);
        let mut best = (step_for(FRAC_PI_2, wide), None);
        for index in 1..240 {
            let b = FRAC_PI_2 * 1.03f64.powi(-index);
            let step = step_for(b, (narrow - b.cos().ln()).min(wide));
            if step > best.0 {
                best = (step, Some(b));
            }
        }
        (best.0.min(2.0), best.1)
    }
}

/// As [`bisect`], but no finer than `width`.
pub(super) fn coarse_bisect(mut low: f64, mut high: f64, width: f64, holds: impl Fn(f64) -> bool) -> f64 {
    if holds(low) {
        return low;
    }
    while high - low > 0.5 * width {
        let middle = 0.5 * (low + high);
        if holds(middle) { high = middle } else { low = middle }
    }
    high
}

/// The weights of all parts of the amplitude in fixed point.
struct Nodes {
    weights: [Vec<Integer>; 2],
    ratios: [Vec<Integer>; 2],
    error_units: Magnitude,
    count: usize,
}

impl Nodes {
    fn new(
        amplitude: &dyn CutAmplitude,
        problem: &Problem,
        sizes: &Sizes,
        lattice: &Lattice,
        effort: &Effort,
    ) -> Result<Nodes, RouteFailure> {
        let mut nodes = Nodes {
            weights: [Vec::new(), Vec::new()],
            ratios: [Vec::new(), Vec::new()],
            error_units: Magnitude::ZERO,
            count: if amplitude.is_real() { 1 } else { 2 },
        };
        let mut tables = Tables::new(amplitude, problem, lattice.bits)?;
        for k in lattice.first..=lattice.last {
            effort.check()?;
            loop {
                let (weight, ratio) = tables.weight(lattice, sizes, k);
                let scale = i64::from(lattice.scale);
                let radius = weight.re.radius().max(weight.im.radius()).shift(scale).log2_estimate();
                // Cancellation inside the amplitude is met with more bits, within reason.
                if radius > 3.0 && tables.bits < 64 * lattice.bits + 4096 {
                    let missing = if radius.is_finite() { radius.min(1e6) as u32 } else { tables.bits };
                    let more = (tables.bits + missing + 32).max(tables.bits + tables.bits / 4);
                    effort.allow_bits(more)?;
                    tables = Tables::new(amplitude, problem, more)?;
                    continue;
                }
                nodes.push(&weight, &ratio, scale)?;
                break;
            }
        }
        Ok(nodes)
    }

    fn push(&mut self, weight: &Complex, ratio: &Complex, scale: i64) -> Result<(), RouteFailure> {
        let parts = [(&weight.re, &ratio.re), (&weight.im, &ratio.im)];
        for (index, (weight, ratio)) in parts.into_iter().enumerate().take(self.count) {
            for (list, value) in [(&mut self.weights[index], weight), (&mut self.ratios[index], ratio)] {
                let (integer, error) = value.to_fixed(scale).ok_or_else(no_enclosure)?;
                self.error_units = self.error_units.max(error);
                list.push(integer);
            }
        }
        Ok(())
    }

    fn parts(&self) -> impl Iterator<Item = Weights<'_>> {
        (0..self.count).map(|index| Weights {
            weights: &self.weights[index],
            ratios: &self.ratios[index],
            error_units: self.error_units,
        })
    }
}

pub(super) fn no_enclosure() -> RouteFailure {
    RouteFailure::OutOfReach { reason: "a term of the spectral sum has no finite enclosure".to_owned() }
}

/// Everything for evaluating weights at one precision.
struct Tables {
    bits: Bits,
    amplitude: Box<dyn PreparedAmplitude>,
    place: Place,
    at_cone: bool,
}

impl Tables {
    fn new(amplitude: &dyn CutAmplitude, problem: &Problem, bits: Bits) -> Result<Tables, RouteFailure> {
        Ok(Tables {
            bits,
            amplitude: amplitude.prepare(bits)?,
            place: Place::new(problem, bits),
            at_cone: problem.distance == 0,
        })
    }

    /// `w` and `w/(2 sinh x)` at the node, in units of `W`.
    fn weight(&self, lattice: &Lattice, sizes: &Sizes, index: usize) -> (Complex, Complex) {
        let bits = self.bits;
        let x = lattice.step_ball(bits + 32).mul_i64(index as i64, bits + 32);
        let half = exp(&x.shift(-1), bits);
        let whole = half.square(bits);
        let inverse = Real::from_i64(1).div(&whole, bits);
        let sinh = whole.sub(&inverse, bits).shift(-1);
        let cosh = whole.add(&inverse, bits).shift(-1);
        let exponent =
            if self.at_cone { self.place.time.mul(&inverse, bits) } else { self.place.gap(&half, bits).square(bits) };
        let rise = one_minus_exp(&self.place.time.mul(&sinh, bits).shift(1), bits, bits);
        let base = exp(&exponent.neg(), bits).mul(&rise, bits).shift(-2 - sizes.exponent);
        let ratio = self.amplitude.value(&cosh).mul_real(&base, bits);
        (ratio.mul_real(&sinh.shift(1), bits), ratio)
    }
}
