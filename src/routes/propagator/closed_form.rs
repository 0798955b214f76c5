//! The closed form with Bessel functions; elementary in the plane and for mass zero.
//!
//! With `z = m |s|` and `w = m s` (`w = z` spacelike, `w = i z` timelike) `factor = K_nu(w)/w^nu` is
//!
//! ```text
//! d = 1   K_1(w)/w
//! d = 2   sqrt(pi/2) (1 + w) e^-w / w^3            (DLMF 10.39.2 and 10.29.1)
//! d = 3   K_2(w)/w^2 = (K_0(w) + 2 K_1(w)/w)/w^2   (DLMF 10.29.1)
//! ```
//!
//! For mass zero the limits `K_nu(m s) (m s)^nu -> 2^(nu-1) Gamma(nu)` (DLMF 10.30.2) leave
//!
//! ```text
//! d = 1   i t/(pi s^2)      d = 2   i t/(2 pi s^3)      d = 3   i t/(pi^2 s^4),
//! s^2 = x^2 - t^2,   s^3 = -i u^3 for |x| < t.
//! ```

use super::{Dimension, PropagatorProblem, allow, times_i};
use crate::arithmetic::{Bits, Complex, Real};
use crate::functions::elementary::{exp, pi, sqrt};
use crate::functions::{bessel_k, complex_elementary};
use crate::routes::descent::exponent_bits;
use crate::routes::pointwise::{PointEvaluation, PointOutcome, bits_for};
use crate::routes::{Effort, RouteFailure};
use rug::Rational;

/// The closed form.
#[derive(Clone, Copy)]
pub struct ClosedForm<'a>(pub &'a PropagatorProblem);

impl PointEvaluation for ClosedForm<'_> {
    fn name(&self) -> &'static str {
        "closed form"
    }

    fn method(&self) -> &'static str {
        "Bessel functions K by power series or the series for large arguments; elementary functions in the plane"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<PointOutcome, RouteFailure> {
        let problem = self.0;
        let size = problem.argument(64).to_f64();
        let bits = bits_for(digits) + exponent_bits(size);
        allow(effort, bits)?;
        let value =
            if problem.mass == 0 { massless(problem, bits) } else { problem.assemble(&factor(problem, bits), bits) };
        Ok(PointOutcome { value, bits, nodes: 1, witness: Vec::new() })
    }
}

fn factor(problem: &PropagatorProblem, bits: Bits) -> Complex {
    let z = problem.argument(bits);
    let square = problem.square() * Rational::from(problem.mass.square_ref());
    if problem.dimension == Dimension::Two {
        return planar(&z, problem.is_timelike(), bits);
    }
    let (k0, k1_over_w) = if problem.is_timelike() {
        let wrong = crate::spoil::is_active(crate::spoil::Fault::PropagatorBranch);
        let w = Complex::new(Real::zero(), if wrong { z.neg() } else { z });
        (bessel_k::k_complex(0, &w, bits), bessel_k::k_complex(1, &w, bits).div(&w, bits))
    } else {
        let (k0, k1) = bessel_k::k0_k1_of_square(&square, bits);
        (Complex::from_real(k0), Complex::from_real(k1))
    };
    match problem.dimension {
        Dimension::One => k1_over_w,
        _ => {
            let inverse = Real::from_rational(&Rational::from(square.recip_ref()), bits);
            k0.add(&k1_over_w.shift(1), bits).mul_real(&inverse, bits)
        }
    }
}

/// `sqrt(pi/2) (1 + w) e^-w / w^3`.
fn planar(z: &Real, timelike: bool, bits: Bits) -> Complex {
    let root = sqrt(&pi(bits).shift(-1), bits);
    let one = Real::from_i64(1);
    let cube = z.square(bits).mul(z, bits);
    let size = root.div(&cube, bits);
    if timelike {
        // 1/w^3 = i/z^3 for w = i z.
        let w = Complex::new(Real::zero(), z.clone());
        let wave = complex_elementary::exp(&w.neg(), bits);
        let sum = Complex::new(one, z.clone());
        times_i(&sum.mul(&wave, bits)).mul_real(&size, bits)
    } else {
        let wave = exp(&z.neg(), bits);
        Complex::from_real(one.add(z, bits).mul(&wave, bits).mul(&size, bits))
    }
}

fn massless(problem: &PropagatorProblem, bits: Bits) -> Complex {
    let square = problem.square();
    let time = &problem.time;
    match problem.dimension {
        Dimension::One => {
            let ratio = Real::from_rational(&Rational::from(time / &square), bits);
            Complex::new(Real::zero(), ratio.div(&pi(bits), bits))
        }
        Dimension::Two => {
            let absolute = Rational::from(square.abs_ref());
            let root = sqrt(&Real::from_rational(&absolute, bits), bits);
            let ratio = Real::from_rational(&(Rational::from(time / &absolute) / 2), bits);
            let size = ratio.div(&pi(bits), bits).div(&root, bits);
            // i/s^3 = i/(-i u^3) = -1/u^3 for |x| < t.
            if problem.is_timelike() { Complex::from_real(size.neg()) } else { Complex::new(Real::zero(), size) }
        }
        Dimension::Three => {
            let ratio = Real::from_rational(&(Rational::from(time / &square) / &square), bits);
            Complex::new(Real::zero(), ratio.div(&pi(bits).square(bits), bits))
        }
    }
}
