//! Theorem 3 and lemma 4 for one plan, evaluated in balls.

use super::envelope::Envelope;
use super::plan::Plan;
use super::{Balls, Tail};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{exp_m1, pi, sin};
use rug::{Float, Rational};

/// Precision of the bounds: a few digits after the largest exponent that occurs.
const BOUND_BITS: Bits = 128;

/// The data of the two bounds.
pub(super) struct Bounds<'a> {
    plan: &'a Plan,
    balls: Balls,
    /// Mirror image, for the left cut-off.
    mirrored: Balls,
    step: Real,
    /// `sqrt(pi/A_c)` and `G_c/sin c`
    spread: Magnitude,
    weight: Magnitude,
    /// Whether `R >= 0`, `0 < c`, and all lines lie below `1`, where `cos(2 theta) > 0` means `theta < pi/4`.
    applies: bool,
}

impl<'a> Bounds<'a> {
    pub fn new(tail: &Tail, plan: &'a Plan) -> Bounds<'a> {
        let bits = BOUND_BITS;
        let balls = tail.balls(bits);
        let mut mirrored = tail.balls(bits);
        mirrored.momentum = mirrored.momentum.neg();
        mirrored.time = mirrored.time.neg();
        let centre = Envelope::new(&balls, &plan.shift, &plan.touch, bits);
        let sine = sin(&Real::from_rational(&plan.shift, bits), bits);
        Bounds {
            plan,
            step: Real::from_rational(&plan.step, bits),
            spread: centre.spread(bits),
            weight: centre.peak(bits).div(sine.abs_lower()),
            applies: tail.from >= 0 && plan.shift > 0 && plan.shift < 1 && plan.above < 1,
            balls,
            mirrored,
        }
    }

    /// Theorem 3.
    pub fn discretisation(&self) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::ContourStripForgotten) {
            return Magnitude::ZERO;
        }
        let plan = self.plan;
        let ordered = Rational::new() <= plan.below && plan.below < plan.shift && plan.shift < plan.above;
        if !(self.applies && ordered) {
            return Magnitude::INFINITY;
        }
        let lines = self.line(&plan.above, &plan.touch_above).add(self.line(&plan.below, &plan.touch_below));
        self.spread.shift(1).add(self.step.abs_upper()).mul(self.weight).mul(lines)
    }

    /// `sqrt(pi/A) G / (exp(2 pi |theta - c|/h) - 1)` for one line; beyond `pi/4` the envelope is infinite.
    fn line(&self, theta: &Rational, touch: &Rational) -> Magnitude {
        let bits = BOUND_BITS;
        let envelope = Envelope::new(&self.balls, theta, touch, bits);
        let distance = Real::from_rational(&Rational::from(theta - &self.plan.shift).abs(), bits);
        let decay = exp_m1(&pi(bits).mul(&distance, bits).shift(1).div(&self.step, bits), bits);
        let peak = if *theta == 0 { Magnitude::ONE } else { envelope.peak(bits) };
        envelope.spread(bits).mul(peak).div(decay.abs_lower())
    }

    /// Lemma 4, both ends.
    pub fn cut_off(&self) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::ContourCutForgotten) {
            return Magnitude::ZERO;
        }
        if !self.applies {
            return Magnitude::INFINITY;
        }
        let right = self.end(&self.balls, self.plan.last);
        let left = self.end(&self.mirrored, -self.plan.first);
        let all = self.spread.add(self.step.abs_upper()).mul(self.weight);
        right.add(left).mul(all).shift(1)
    }

    /// The sum beyond node `index`. The envelope touches at a rational just below `sinh(index h)`: the nodes left out
    /// lie beyond that as well.
    fn end(&self, balls: &Balls, index: i64) -> Magnitude {
        let bits = BOUND_BITS;
        let eta = self.step.mul_i64(index, bits);
        let low: Float = crate::functions::elementary::sinh(&eta, bits).lower(bits);
        let Some(touch) = low.to_rational() else {
            return Magnitude::INFINITY;
        };
        Envelope::new(balls, &self.plan.shift, &touch, bits).beyond(&touch, bits)
    }
}
