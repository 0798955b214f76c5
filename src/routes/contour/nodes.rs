//! The values on the contour in fixed point: `e(z) = f(z)/cosh(z)` and `f(z)` at `z_j = j h + i c`.
//!
//! Both are kept in units of `2^(x - scale)`, where `2^x` is near the largest `|f|`.

use super::plan::Plan;
use super::{Balls, Tail};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::complex_elementary;
use crate::functions::elementary::{cos, exp, sin};
use crate::routes::gaussian::out_of_reach;
use crate::routes::{Effort, RouteFailure};
use rug::Integer;

/// Complex numbers in fixed point with common error bounds.
pub(super) struct Fixed {
    /// Real parts.
    pub re: Vec<Integer>,
    /// Imaginary parts.
    pub im: Vec<Integer>,
    /// Bound of the parts' errors, in units.
    pub error_units: Magnitude,
}

impl Fixed {
    pub fn with_capacity(count: usize) -> Fixed {
        Fixed { re: Vec::with_capacity(count), im: Vec::with_capacity(count), error_units: Magnitude::ONE }
    }

    pub fn push(&mut self, value: &Complex, scale: i64) -> Option<()> {
        let ((re, re_error), (im, im_error)) = (value.re.to_fixed(scale)?, value.im.to_fixed(scale)?);
        self.re.push(re);
        self.im.push(im);
        self.error_units = self.error_units.max(re_error).max(im_error);
        Some(())
    }

    /// Upper bound of the parts, in units.
    pub fn largest(&self) -> Magnitude {
        let bits = crate::arithmetic::convolution::length(&self.re);
        Magnitude::power_of_two(i64::from(bits.max(crate::arithmetic::convolution::length(&self.im))))
    }
}

/// The values at all nodes from the first to the last.
pub(super) struct Nodes {
    /// `e(z_j)`
    pub e: Fixed,
    /// `f(z_j)`
    pub f: Fixed,
}

impl Nodes {
    pub(super) fn new(tail: &Tail, plan: &Plan, bits: Bits, effort: &Effort) -> Result<Nodes, RouteFailure> {
        let balls = tail.balls(bits);
        let shift = Real::from_rational(&plan.shift, bits);
        let (sine, cosine) = (sin(&shift, bits), cos(&shift, bits));
        let step = Real::from_rational(&plan.step, bits);
        let factor = exp(&step, bits);
        let mut growth = exp(&step.mul_i64(plan.first, bits), bits);
        let one = Real::from_i64(1);
        let count = plan.count();
        let mut nodes = Nodes { e: Fixed::with_capacity(count), f: Fixed::with_capacity(count) };
        let scale = i64::from(plan.scale) - plan.exponent;
        let broken = || out_of_reach("the values on the contour are not finite");
        for index in 0..count {
            if index % 64 == 0 {
                effort.check()?;
            }
            let fall = one.div(&growth, bits);
            let (u, w) = (growth.sub(&fall, bits).shift(-1), growth.add(&fall, bits).shift(-1));
            let p = Complex::new(u.mul(&cosine, bits), w.mul(&sine, bits));
            let energy = Complex::new(w.mul(&cosine, bits), u.mul(&sine, bits));
            let e = complex_elementary::exp(&exponent(&balls, &p, &energy, bits), bits);
            let f = e.mul(&energy, bits);
            nodes.e.push(&e, scale).ok_or_else(broken)?;
            nodes.f.push(&f, scale).ok_or_else(broken)?;
            growth = growth.mul(&factor, bits);
        }
        Ok(nodes)
    }
}

/// `-s^2 (p - k)^2 - i t omega + i R p`
fn exponent(balls: &Balls, p: &Complex, energy: &Complex, bits: Bits) -> Complex {
    let offset = Complex::new(p.re.sub(&balls.momentum, bits), p.im.clone());
    let gauss = offset.square(bits).mul_real(&balls.width, bits);
    let phase = p.mul_real(&balls.from, bits).sub(&energy.mul_real(&balls.time, bits), bits);
    Complex::new(phase.im.neg().sub(&gauss.re, bits), phase.re.sub(&gauss.im, bits))
}
