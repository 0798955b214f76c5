//! The error bounds of the massless spectral sum, evaluated for whatever the plan chose.
//!
//! Statements and proofs are in the parent module. Whatever cannot be bounded comes out infinite.

use super::plan::Plan;
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::{cos, exp, exp_m1, ln, pi, sqrt};
use crate::routes::TailProblem;
use crate::routes::spectral::BOUND_BITS;
use rug::Rational;

const BITS: u32 = BOUND_BITS;

/// The problem's numbers as balls of low precision.
pub(super) struct Bounds {
    time: Real,
    distance: Real,
    /// `m = min(1, t)`
    small: Real,
    /// `M/m`
    quotient: Real,
    step: Real,
}

impl Bounds {
    pub(super) fn new(problem: &TailProblem, plan: &Plan) -> Bounds {
        let real = |value: &Rational| Real::from_rational(value, BITS);
        let time = real(&problem.time);
        let late = problem.time > 1;
        let quotient = if late { problem.time.clone() } else { Rational::from(problem.time.recip_ref()) };
        let small = if late { Real::from_i64(1) } else { time.clone() };
        Bounds { small, quotient: real(&quotient), time, distance: real(&problem.distance), step: real(&plan.step) }
    }

    /// `a + n h`.
    fn plus_steps(&self, a: i64, n: i64) -> Real {
        Real::from_i64(a).add(&self.step.mul_i64(n, BITS), BITS)
    }

    /// `kappa = e^(kh)`.
    fn kappa(&self, index: i64) -> Real {
        exp(&self.step.mul_i64(index, BITS), BITS)
    }

    /// `B_c` of Lemma B; `cosine` is `c`, possibly zero.
    fn majorant(&self, cosine: &Real) -> Magnitude {
        let plain = sqrt(&self.small, BITS).shift(2).abs_upper();
        let rate = cosine.mul(&self.distance, BITS);
        if !rate.certainly_positive() {
            return plain;
        }
        let root = sqrt(&rate, BITS);
        let root_pi = sqrt(&pi(BITS), BITS);
        let middle = self.small.mul(&root_pi, BITS).div(&root, BITS).abs_upper();
        let far = self.time.mul(&root_pi, BITS).shift(-1).div(&rate.mul(&root, BITS), BITS).abs_upper();
        plain.min(middle).min(far)
    }

    /// `B_1 (1 + h/2)` of Lemma C.
    fn lattice_majorant(&self) -> Magnitude {
        self.majorant(&Real::from_i64(1)).mul(self.plus_steps(2, 1).shift(-1).abs_upper())
    }

    /// `Q` of Lemma D.
    fn weighted_majorant(&self) -> Magnitude {
        let plain = self.plus_steps(2, 1).add(&ln(&self.quotient, BITS), BITS).mul(&self.small, BITS).abs_upper();
        let far = self.time.div(&self.distance, BITS).mul(&self.plus_steps(2, 1).shift(-1), BITS).abs_upper();
        plain.min(far)
    }

    /// Theorem E.
    pub(super) fn discretisation(&self, plan: &Plan) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::TrapezoidErrorForgotten) {
            return Magnitude::ZERO;
        }
        let (strip, cosine) = match &plan.strip {
            None => (pi(BITS).shift(-1), Real::zero()),
            Some(b) => {
                let b = Real::from_rational(b, BITS);
                let cosine = cos(&b, BITS);
                (b, cosine)
            }
        };
        let decay = exp_m1(&pi(BITS).mul(&strip, BITS).shift(1).div(&self.step, BITS), BITS).abs_lower();
        let factor = self.plus_steps(4, 1).shift(-1).mul(&sqrt(&Real::from_i64(2), BITS), BITS).abs_upper();
        let product = self.majorant(&cosine).mul(self.majorant(&Real::from_i64(1)));
        product.mul(factor).div(decay)
    }

    /// What the nodes below the first one would add.
    pub(super) fn left_cut(&self, plan: &Plan) -> Magnitude {
        let small = self.time.mul(&self.kappa(plan.first - 1).square(BITS), BITS).mul(&self.plus_steps(1, 2), BITS);
        self.weighted_majorant().mul(small.abs_upper())
    }

    /// What the nodes above the last one would add, beyond the cone.
    pub(super) fn right_cut(&self, plan: &Plan) -> Magnitude {
        let kappa = self.kappa(plan.last + 1);
        let small = exp(&self.distance.mul(&kappa, BITS).neg(), BITS).div(&sqrt(&kappa, BITS), BITS);
        self.lattice_majorant().mul(small.mul(&self.plus_steps(2, 1), BITS).abs_upper()).shift(-2)
    }

    /// What replacing the weights above the last node by `1/4` changes, at the cone.
    pub(super) fn replacement(&self, plan: &Plan) -> Magnitude {
        let rate = self.kappa(plan.last + 1).mul(&self.small, BITS);
        if rate.possibly_less(&Real::from_i64(1)) {
            return Magnitude::INFINITY;
        }
        let factor = self.plus_steps(2, 1).square(BITS).mul(&self.small, BITS);
        exp(&rate.shift(1).neg(), BITS).mul(&factor, BITS).abs_upper()
    }
}
