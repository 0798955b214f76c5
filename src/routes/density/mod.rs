//! Ways to the amplitude `psi(x, t)` of the box, inside and outside its light cones.
//!
//! # One function for everything
//!
//! With the propagator `G(v, t) = (i t/pi) g(v)`, `g(v) = K_1(r)/r`, `r = sqrt(v^2 - (t - i0)^2)` (unit mass, `t > 0`) and
//! `F(v) = Int_v^inf g`, the contour passing above `v = t` and below `v = -t`,
//!
//! ```text
//! psi(x, t) = Int_{-a}^{a} G(x - y, t) (2a)^(-1/2) dy = (i t/pi) (2a)^(-1/2) (F(x - a) - F(x + a)).
//! ```
//!
//! `Int G dx = exp(-i t)` (the momentum amplitude at `p = 0`), so `F(-inf) = pi e^(-i t)/(i t)`; as `g` is even along that
//! contour, `F(-v) = F(-inf) - F(v)` and `F(0) = F(-inf)/2`. By the symmetry `psi(-x) = psi(x)` only `x >= 0` is needed,
//! and so only `F(y)` for `y > 0`, `y != t`:
//!
//! ```text
//! x > a   F(x-a) - F(x+a)        x = a   F(0) - F(2a)        x < a   F(-inf) - F(a-x) - F(a+x).
//! ```
//!
//! At `y = ±t` the function `F` has a logarithm: `|psi|` is unbounded at `x = ±a ± t`. Near `v = t`, `g = 1/(2t (v - t))`
//! to leading order; where two such points meet (`x = 0`, `t = a`) the two logarithms add up, since
//! `F(-inf) - 2 F(y)` appears.
//!
//! `momentum` finds `F` from the momentum integral, `position` from the series of `g` in powers of the
//! interval `v^2 - t^2`, integrated term by term. They share the arithmetic and the assembly above. `massless` is a
//! closed form.

mod massless;
mod momentum;
mod position;

use super::pointwise::{PointEvaluation, PointOutcome, bits_for};
use super::{Effort, RouteFailure};
use crate::arithmetic::{Bits, Complex, Real};
use crate::functions::elementary::{pi, sqrt};
use crate::routes::descent::minus_phase;
use rug::Rational;
use std::cmp::Ordering;

/// The amplitude of a box at rest at one point, all numbers exact.
///
/// Scaled as [`super::TailProblem`]: unit `1/m`, or the half-width for mass zero.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DensityProblem {
    /// Half-width, positive.
    pub half_width: Rational,
    /// Time, positive.
    pub time: Rational,
    /// `|x|`, not negative, with `|x - a| != t` and `x + a != t`.
    pub position: Rational,
    /// Whether the mass is zero.
    pub massless: bool,
    /// The length unit's inverse: `|psi|^2` is multiplied by it.
    pub unit: Rational,
}

impl DensityProblem {
    /// The routes that can do this problem; with mass zero there is only the closed form.
    pub fn routes(&self) -> Vec<Box<dyn PointEvaluation + '_>> {
        let route = |edge: &'static dyn EdgeFunction| -> Box<dyn PointEvaluation + '_> {
            Box::new(EdgeRoute { problem: self, edge })
        };
        if self.massless {
            vec![Box::new(massless::Massless(self))]
        } else {
            vec![route(&momentum::MOMENTUM), route(&position::POSITION)]
        }
    }
}

/// A way to `F`.
trait EdgeFunction: Sync {
    fn name(&self) -> &'static str;
    fn method(&self) -> &'static str;
    /// `F(y)` for `y > 0`, `y != time`.
    fn value(&self, place: &Place, effort: &Effort) -> Result<EdgeValue, RouteFailure>;
}

/// Where `F` is wanted, and how accurately: about `2^-bits` relative to its size.
struct Place<'a> {
    time: &'a Rational,
    distance: &'a Rational,
    bits: Bits,
}

impl Place<'_> {
    /// `y^2 - t^2`, exactly.
    fn square(&self) -> Rational {
        Rational::from(self.distance - self.time) * Rational::from(self.distance + self.time)
    }

    fn is_timelike(&self) -> bool {
        self.distance < self.time
    }
}

/// `F` at one point.
struct EdgeValue {
    value: Complex,
    bits: Bits,
    nodes: usize,
    witness: Vec<(String, String)>,
}

struct EdgeRoute<'a> {
    problem: &'a DensityProblem,
    edge: &'static dyn EdgeFunction,
}

impl PointEvaluation for EdgeRoute<'_> {
    fn name(&self) -> &'static str {
        self.edge.name()
    }

    fn method(&self) -> &'static str {
        self.edge.method()
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<PointOutcome, RouteFailure> {
        let problem = self.problem;
        let bits = bits_for(digits);
        let (near, far) = (
            Rational::from(&problem.position - &problem.half_width),
            Rational::from(&problem.position + &problem.half_width),
        );
        let mut gathered = Gathered { bits, nodes: 0, witness: Vec::new() };
        let mut at = |distance: &Rational, which: &str| -> Result<Complex, RouteFailure> {
            let found = self.edge.value(&Place { time: &problem.time, distance, bits }, effort)?;
            gathered.bits = gathered.bits.max(found.bits);
            gathered.nodes += found.nodes;
            gathered.witness.extend(found.witness.into_iter().map(|(name, text)| (format!("{which}: {name}"), text)));
            Ok(found.value)
        };
        let beyond = at(&far, "edge at -a")?;
        let total = |bits: Bits| everything(&problem.time, bits);
        let difference = match near.cmp0() {
            Ordering::Greater => {
                let nearer = at(&near, "edge at a")?;
                nearer.sub(&beyond, gathered.bits)
            }
            Ordering::Equal => total(gathered.bits).shift(-1).sub(&beyond, gathered.bits),
            Ordering::Less => {
                let within = at(&Rational::from(-&near), "edge at a")?;
                total(gathered.bits).sub(&within, gathered.bits).sub(&beyond, gathered.bits)
            }
        };
        let Gathered { bits, nodes, witness } = gathered;
        Ok(PointOutcome { value: amplitude(problem, &difference, bits), bits, nodes, witness })
    }
}

struct Gathered {
    bits: Bits,
    nodes: usize,
    witness: Vec<(String, String)>,
}

/// `F(-inf) = -i pi e^(-i t)/t`.
fn everything(time: &Rational, bits: Bits) -> Complex {
    let size = pi(bits).div(&Real::from_rational(time, bits), bits);
    let extra = super::descent::exponent_bits(time.to_f64());
    let phase = minus_phase(&Real::from_rational(time, bits + extra), bits);
    let turned = phase.mul_real(&size, bits);
    Complex::new(turned.im, turned.re.neg())
}

/// `(i t/pi) (unit/(2a))^(1/2) difference`.
fn amplitude(problem: &DensityProblem, difference: &Complex, bits: Bits) -> Complex {
    let square = Rational::from(problem.time.square_ref()) / &problem.half_width * &problem.unit / 2i32;
    let size = sqrt(&Real::from_rational(&square, bits), bits).div(&pi(bits), bits);
    let turned = Complex::new(difference.im.neg(), difference.re.clone());
    turned.mul_real(&size, bits)
}
