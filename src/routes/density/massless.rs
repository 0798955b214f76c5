//! Mass zero in closed form: `g(v) = 1/(v^2 - t^2)` and
//!
//! ```text
//! F(v) = (1/(2t)) (ln|(v + t)/(v - t)| + i pi n(v)),     n = 0 for v > t,  -1 for |v| < t,  -2 for v < -t,
//! ```
//!
//! since the contour passes above `v = t`, where `v - t` turns into `e^(i pi) (t - v)`, and below `v = -t`. Hence
//!
//! ```text
//! psi(x, t) = (2 pi)^-1 (2a)^(-1/2) (i L - pi N),     N = n(x - a) - n(x + a),
//! L = ln |(x - a + t)(x + a - t)| / |(x - a - t)(x + a + t)|.
//! ```

use super::DensityProblem;
use crate::arithmetic::{Complex, Real};
use crate::functions::elementary::{ln, ln_1p, pi, sqrt};
use crate::routes::pointwise::{PointEvaluation, PointOutcome, bits_for};
use crate::routes::{Effort, RouteFailure};
use rug::Rational;

/// The closed form.
pub(super) struct Massless<'a>(pub(super) &'a DensityProblem);

impl PointEvaluation for Massless<'_> {
    fn name(&self) -> &'static str {
        "closed form"
    }

    fn method(&self) -> &'static str {
        "logarithm of an exact fraction, for mass zero"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<PointOutcome, RouteFailure> {
        let bits = bits_for(digits);
        effort.allow_bits(bits)?;
        let DensityProblem { half_width: a, time: t, position: x, unit, .. } = self.0;
        let (near, far) = (Rational::from(x - a), Rational::from(x + a));
        let above = Rational::from(&near + t) * Rational::from(&far - t);
        let below = Rational::from(&near - t) * Rational::from(&far + t);
        let quotient = (above / below).abs();
        let apart = Rational::from(&quotient - 1u32);
        let close = Rational::from(apart.abs_ref()) * 2 < 1;
        let logarithm = if close {
            ln_1p(&Real::from_rational(&apart, bits), bits)
        } else {
            ln(&Real::from_rational(&quotient, bits), bits)
        };
        let turns = half_turns(&near, t) - half_turns(&far, t);
        let real = pi(bits).mul_i64(-turns, bits);
        let root = sqrt(&Real::from_rational(&(Rational::from(unit / a) / 2u32), bits), bits);
        let size = root.div(&pi(bits).shift(1), bits);
        let value = Complex::new(real, logarithm).mul_real(&size, bits);
        Ok(PointOutcome { value, bits, nodes: 1, witness: Vec::new() })
    }
}

/// `n(v)`.
fn half_turns(v: &Rational, t: &Rational) -> i64 {
    if v > t {
        0
    } else if Rational::from(-v) > *t {
        -2
    } else {
        -1
    }
}
