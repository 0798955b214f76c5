//! The moment of release: the normal distribution.
//!
//! At `t = 0` the position density is `|psi0|^2`, the normal density of standard deviation `s` for every mean momentum,
//! so `P(x > x1) = erfc(x1/(s sqrt 2))/2` (DLMF 7.2.2 and 7.18(i)). Where that is close to one the complement is used,
//! by `erfc(-y) = 2 - erfc(y)` (DLMF 7.4.2), and an interval on one side of the centre is a difference of two tails.

use super::{GaussianProblem, Region, out_of_reach};
use crate::arithmetic::{Bits, Real};
use crate::functions::elementary::sqrt;
use crate::functions::erfc::erfc;
use crate::routes::{Effort, Evaluation, RouteFailure, RouteOutcome};
use rug::Rational;

/// The closed form at time zero.
pub struct AtRelease {
    problem: GaussianProblem,
}

impl AtRelease {
    /// The closed form for a problem; [`Evaluation::evaluate`] declines times other than zero.
    pub fn new(problem: GaussianProblem) -> AtRelease {
        AtRelease { problem }
    }

    /// `P(x > from)` for `from >= 0`.
    fn tail(&self, from: &Rational, bits: Bits) -> Real {
        let ratio = Real::from_rational(&Rational::from(from / &self.problem.sigma), bits);
        erfc(&ratio.div(&sqrt(&Real::from_i64(2), bits), bits), bits).shift(-1)
    }

    fn probability(&self, bits: Bits) -> Real {
        let one = Real::from_i64(1);
        let beyond = |x: &Rational| {
            if *x >= 0 { self.tail(x, bits) } else { one.sub(&self.tail(&Rational::from(-x), bits), bits) }
        };
        match &self.problem.region {
            Region::Outside(r) => self.tail(r, bits).shift(1),
            Region::Within(r) => one.sub(&self.tail(r, bits).shift(1), bits),
            Region::RightOf(x) => beyond(x),
            Region::LeftOf(x) => beyond(&Rational::from(-x)),
            Region::Between(low, high) if *high <= 0 => {
                self.tail(&Rational::from(-high), bits).sub(&self.tail(&Rational::from(-low), bits), bits)
            }
            Region::Between(low, high) => beyond(low).sub(&beyond(high), bits),
        }
    }
}

impl Evaluation for AtRelease {
    fn name(&self) -> &'static str {
        "closed-form"
    }

    fn method(&self) -> &'static str {
        "at time zero the position is normally distributed: complementary error function"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        const DOUBLINGS: usize = 8;
        if self.problem.time != 0 {
            return Err(out_of_reach("the closed form holds at time zero only"));
        }
        let mut bits = (f64::from(digits) * std::f64::consts::LOG2_10) as Bits + 48;
        for last in (0..DOUBLINGS).map(|pass| pass + 1 == DOUBLINGS) {
            effort.allow_bits(bits)?;
            effort.check()?;
            let interval = self.probability(bits).to_interval(bits).clamp_non_negative();
            if last || interval.has_relative_digits(digits) {
                return Ok(RouteOutcome { interval, bits, nodes: 1, witness: Vec::new() });
            }
            bits = 2 * bits + 64;
        }
        Err(out_of_reach("the error function did not become accurate enough"))
    }
}
