//! The samples `c_j = exp(-s^2 h^2 j^2 - i omega(k + j h) t)`, `|j| <= J`, in fixed point.
//!
//! They are the `Phi(p_j)` without the factor `(2 s^2/pi)^(1/4)`, so that `|c_j| <= 1`. For `k = 0` they are even in
//! `j`, and half of them are computed.

use super::plan::Plan;
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::{cos, exp, sin, sqrt};
use crate::routes::gaussian::{GaussianProblem, out_of_reach};
use crate::routes::{Effort, RouteFailure};
use rug::{Integer, Rational};

/// Real and imaginary parts, `j` from `-J` to `J`, in units of `2^-scale`.
pub(super) struct Samples {
    /// Real parts.
    pub re: Vec<Integer>,
    /// Imaginary parts.
    pub im: Vec<Integer>,
    /// No part is off by more than so many units.
    pub error_units: Magnitude,
    /// Whether the samples are even in `j`.
    pub even: bool,
}

impl Samples {
    pub(super) fn new(
        problem: &GaussianProblem,
        plan: &Plan,
        bits: Bits,
        effort: &Effort,
    ) -> Result<Samples, RouteFailure> {
        let even = *problem.momentum() == 0;
        let setting = Setting {
            momentum: Real::from_rational(problem.momentum(), bits),
            time: Real::from_rational(problem.time(), bits),
            step: Real::from_rational(&plan.step, bits),
            width: Real::from_rational(&Rational::from(problem.sigma() * &plan.step).square(), bits),
            bits,
        };
        let count = 2 * plan.last + 1;
        let (mut re, mut im) = (vec![Integer::new(); count], vec![Integer::new(); count]);
        let mut error_units = Magnitude::ONE;
        let scale = i64::from(plan.scale);
        let broken = || out_of_reach("the samples of the momentum amplitude are not finite");
        for j in 0..=plan.last {
            if j % 64 == 0 {
                effort.check()?;
            }
            let weight = setting.weight(j as i64);
            for index in if even { vec![j as i64] } else { vec![j as i64, -(j as i64)] } {
                let sample = setting.sample(index, &weight);
                let (x, x_error) = sample.re.to_fixed(scale).ok_or_else(broken)?;
                let (y, y_error) = sample.im.to_fixed(scale).ok_or_else(broken)?;
                error_units = error_units.max(x_error).max(y_error);
                let place = (plan.last as i64 + index) as usize;
                if even {
                    re[plan.last - j].clone_from(&x);
                    im[plan.last - j].clone_from(&y);
                }
                (re[place], im[place]) = (x, y);
            }
        }
        Ok(Samples { re, im, error_units, even })
    }
}

struct Setting {
    momentum: Real,
    time: Real,
    step: Real,
    /// `s^2 h^2`
    width: Real,
    bits: Bits,
}

impl Setting {
    /// `exp(-s^2 h^2 j^2)`
    fn weight(&self, j: i64) -> Real {
        exp(&self.width.mul_i64(j * j, self.bits).neg(), self.bits)
    }

    fn sample(&self, j: i64, weight: &Real) -> Complex {
        let bits = self.bits;
        let p = self.momentum.add(&self.step.mul_i64(j, bits), bits);
        let energy = sqrt(&p.square(bits).add(&Real::from_i64(1), bits), bits);
        let phase = energy.mul(&self.time, bits);
        Complex::new(weight.mul(&cos(&phase, bits), bits), weight.mul(&sin(&phase, bits), bits).neg())
    }
}
