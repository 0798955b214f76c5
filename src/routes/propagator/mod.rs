//! Two ways to the Newton-Wigner propagator `G(x, t)` in one, two and three dimensions.
//!
//! `G(x,t) = (2 pi)^-d Int d^d p exp(i p x - i omega(p) t)`, `omega = sqrt(m^2 + p^2)`, meant as the limit
//! `t -> t - i0`. It solves the free evolution for a point source at time zero; away from `|x| = |t|` it is a smooth
//! function. With `nu = (d+1)/2` and `s = sqrt(x^2 - (t - i0)^2)`
//!
//! ```text
//! G = 2 i t (m/(2 pi))^nu K_nu(m s)/s^nu.
//! ```
//!
//! *Derivation.* For `Re tau > 0` the identity (from DLMF 10.32.10 with `nu = 1/2`)
//! `exp(-omega tau) = (tau/sqrt(4 pi)) Int_0^inf sigma^(-3/2) exp(-tau^2/(4 sigma) - sigma omega^2) dsigma` turns the momentum
//! integral into a Gaussian one, `(2 pi)^-d Int d^d p exp(i p x - sigma p^2) = (4 pi sigma)^(-d/2) exp(-x^2/(4 sigma))`:
//!
//! ```text
//! G = (tau/sqrt(4 pi)) (4 pi)^(-d/2) Int_0^inf sigma^(-1-nu) exp(-(x^2 + tau^2)/(4 sigma) - sigma m^2) dsigma,   tau = i t + 0.
//! ```
//!
//! With `sigma = (s/2m) e^zeta`, `s = sqrt(x^2 + tau^2)`, this is the *rapidity integral*
//!
//! ```text
//! G = i t (m/(2 pi))^nu s^-nu Int exp(-m s cosh zeta) cosh(nu zeta) dzeta,
//! ```
//!
//! and DLMF 10.32.9 gives the closed form. As `tau` turns from the positive axis to `i t + 0`, `x^2 + tau^2` turns from
//! the positive axis to `x^2 - t^2 + i0`: for `|x| < t` the root is `s = i u`, `u = sqrt(t^2 - x^2)`, and `K_nu(i m u)` is a
//! Hankel function of the second kind. `G(x,-t)` is the complex conjugate of `G(x,t)`.
//!
//! `closed_form` evaluates the Bessel functions by their series; `momentum` does the rapidity integral by
//! a trapezoid rule. They share the arithmetic and the factor in front of the integral.

mod closed_form;
mod momentum;

use super::pointwise::PointEvaluation;
use super::{Effort, RouteFailure};
use crate::arithmetic::{Bits, Complex, Real};
use crate::functions::elementary::{pi, sqrt};
use rug::Rational;

pub use closed_form::ClosedForm;
pub use momentum::Momentum;

/// Dimension of space.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimension {
    /// The line.
    One,
    /// The plane.
    Two,
    /// Space.
    Three,
}

impl Dimension {
    /// One, two or three.
    pub fn number(self) -> u32 {
        match self {
            Dimension::One => 1,
            Dimension::Two => 2,
            Dimension::Three => 3,
        }
    }
}

/// A propagator away from its singularity, all numbers exact.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct PropagatorProblem {
    /// Dimension of space.
    pub dimension: Dimension,
    /// Mass, not negative.
    pub mass: Rational,
    /// Time, positive.
    pub time: Rational,
    /// Distance from the source, not negative and not equal to the time.
    pub distance: Rational,
}

impl PropagatorProblem {
    /// `x^2 - t^2`, not zero.
    fn square(&self) -> Rational {
        Rational::from(self.distance.square_ref()) - Rational::from(self.time.square_ref())
    }

    fn is_timelike(&self) -> bool {
        self.distance < self.time
    }

    /// `z = m |s|`, positive, from its exact square.
    fn argument(&self, bits: Bits) -> Real {
        let square = self.square().abs() * Rational::from(self.mass.square_ref());
        sqrt(&Real::from_rational(&square, bits), bits)
    }

    /// The routes that can do this problem; with mass zero there is only the closed form.
    pub fn routes(&self) -> Vec<Box<dyn PointEvaluation + '_>> {
        let mut list: Vec<Box<dyn PointEvaluation + '_>> = vec![Box::new(ClosedForm(self))];
        if self.mass != 0 {
            list.push(Box::new(Momentum(self)));
        }
        list
    }

    /// `2 i t (m/(2 pi))^nu m^nu times factor`, where `factor = K_nu(w)/w^nu`, `w = m s`.
    fn assemble(&self, factor: &Complex, bits: Bits) -> Complex {
        let ratio = Real::from_rational(&Rational::from(self.mass.square_ref()), bits).div(&pi(bits).shift(1), bits);
        let power = match self.dimension {
            Dimension::One => ratio,
            Dimension::Two => ratio.mul(&sqrt(&ratio, bits), bits),
            Dimension::Three => ratio.square(bits),
        };
        let size = power.mul(&Real::from_rational(&self.time, bits), bits).shift(1);
        times_i(factor).mul_real(&size, bits)
    }
}

fn times_i(value: &Complex) -> Complex {
    Complex::new(value.im.neg(), value.re.clone())
}

/// Refuses a precision above the limit.
fn allow(effort: &Effort, bits: Bits) -> Result<(), RouteFailure> {
    effort.check()?;
    effort.allow_bits(bits)
}
