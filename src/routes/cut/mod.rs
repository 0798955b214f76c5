//! Route "spectral" for every compact packet in closed form: quadrature on the branch cut, weights of either sign.
//!
//! # Formula
//!
//! Let the support of `psi0` end at `x_R`, and `F(z) = Int psi0(x) exp(z (x - x_R)) dx` (see [`CutAmplitude`]). Outside the
//! cone the contour of the momentum integral can be turned onto the branch cut `p = i kappa`, `kappa >= m`, which gives
//! `psi(x_R + t + s) = (i/pi) Int_m^inf dkappa exp(-kappa (t + s)) sinh(q t) F(kappa)`, `q = sqrt(kappa^2 - m^2)`. For real `kappa`
//! the real and imaginary parts of `F` are the transforms `F_j` of the real and imaginary part of `psi0`; the rest is real up
//! to the factor `i`, so their squares add up. Integrating over `s > d`:
//!
//! ```text
//! P(x > x_R + t + d) = 1/pi^2 Sum_j Int Int dkappa dkappa' g_j(kappa) g_j(kappa')/(kappa + kappa'),
//! g_j = F_j(kappa) sinh(q t) exp(-kappa (t + d)).
//! ```
//!
//! The left side is the right side of `psi0(-x)`; both are equal if `psi0(-x) = ± conj psi0(x)`, as `F` then changes at most to `±
//! conj F` for real `kappa`. Each of these sums is positive, since `1/(kappa + kappa')` is a positive kernel, though `g_j` may
//! change its sign.
//!
//! # What is used of a packet
//!
//! Two bounds for `Re z >= 0`, with `|exp(z (x - x_R))| <= 1` on the support: `|F(z)| <= Int |psi0| <= sqrt(2a) =: L` by the
//! inequality of Cauchy and Schwarz, and `|z F(z)| <= V`, the total variation of `psi0`. Both hold for `F_j` too, and are all
//! that the discretisation bounds rest on. Smoothness at the right edge shortens the sums through a bound of `kappa |F|` on
//! the real line ([`PreparedAmplitude::tail`]).
//!
//! The sums and their bounds: [`massive`], [`massless`]. The precision of a sum follows from a first one with few digits.

mod amplitude;
mod bspline;
mod massive;
mod massless;
mod moments;
mod waves;

pub use amplitude::{CutAmplitude, PreparedAmplitude};

use super::{Effort, Evaluation, RouteFailure, RouteOutcome};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, decimal};
use crate::error::Error;
use crate::functions::elementary::{exp, pi, sqrt};
use rug::{Float, Rational};
use std::f64::consts::LN_10;

/// Which side of the packet counts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum CutSide {
    /// Left of the support.
    Left,
    /// Right of the support.
    Right,
    /// Both.
    Both,
}

/// The probability of finding a packet beyond its light cone, ready for evaluation.
///
/// With the support `[x_L, x_R]` of `psi0` the region is `x > x_R + |t| + d`, `x < x_L - |t| - d`, or both: `|x| > R`
/// (`r > R` for a radial packet) with `R = a + |t| + d` if the support is centred.
///
/// ```
/// use coneproof::packets::WavePacket;
/// use coneproof::routes::cut::{CutSide, CutTail};
/// use coneproof::routes::{Effort, Evaluation};
/// use rug::Rational;
/// let one = Rational::from(1);
/// let ball = WavePacket::ball(&one)?;
/// let tail = CutTail::new(&ball, &one, &one, &Rational::new(), CutSide::Both)?;
/// let found = tail.evaluate(15, &Effort::default())?.interval;
/// assert!(found.has_relative_digits(15) && (found.lower().to_f64() - 0.0374042436235204).abs() < 1e-15);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub struct CutTail {
    /// Amplitudes whose right sides add up, and how often each counts.
    sides: Vec<Box<dyn CutAmplitude>>,
    doubled: bool,
    problem: Problem,
}

/// The dimensionless setting: the unit of length is `1/m`, or the half-width for mass zero.
struct Problem {
    time: Rational,
    distance: Rational,
    half_width: Rational,
    massless: bool,
}

impl CutTail {
    /// The tail of `packet` for this mass, time and distance `d` of the region from the light cone.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the mass or the distance is negative.
    pub fn new(
        packet: &dyn CutAmplitude,
        mass: &Rational,
        time: &Rational,
        distance: &Rational,
        side: CutSide,
    ) -> Result<CutTail, Error> {
        for (field, value) in [("mass", mass), ("distance", distance)] {
            if *value < 0 {
                return Err(Error::bad_input(
                    field,
                    value,
                    &format!("give a {field} that is not negative, such as 0 or 1"),
                ));
            }
        }
        let massless = *mass == 0;
        let half_width = packet.half_width();
        if half_width <= 0 {
            return Err(Error::bad_input("half-width", half_width, "give a packet on an interval of positive length"));
        }
        let unit = if massless { Rational::from(half_width.recip_ref()) } else { mass.clone() };
        let symmetric = packet.is_symmetric();
        let right = packet.scaled(&unit);
        let sides = match side {
            CutSide::Right => vec![right],
            CutSide::Both if symmetric => vec![right],
            CutSide::Left => vec![right.mirrored()],
            CutSide::Both => vec![right.mirrored(), right],
        };
        let problem = Problem {
            time: Rational::from(time.abs_ref()) * &unit,
            distance: Rational::from(distance * &unit),
            half_width: half_width * unit,
            massless,
        };
        Ok(CutTail { sides, doubled: symmetric && side == CutSide::Both, problem })
    }

    /// The probability without the factor `exp(-2E)`, with all errors below about `exp(-goal)` in the units of the sums.
    fn sum(&self, goal: f64, effort: &Effort) -> Result<Total, RouteFailure> {
        let mut total = Total { value: Real::zero(), unit: f64::NEG_INFINITY, bits: 64, nodes: 0, witness: Vec::new() };
        for (index, amplitude) in self.sides.iter().enumerate() {
            effort.check()?;
            let found = if self.problem.massless {
                massless::sum(amplitude.as_ref(), &self.problem, goal, effort)?
            } else {
                massive::sum(amplitude.as_ref(), &self.problem, goal, effort)?
            };
            total.bits = total.bits.max(found.bits);
            total.nodes += found.nodes;
            total.unit = total.unit.max(found.unit);
            total.value = total.value.add(&found.value, total.bits);
            let name =
                |text: &str| if self.sides.len() > 1 { format!("{text}, side {}", index + 1) } else { text.to_owned() };
            total.witness.extend(found.witness.into_iter().map(|(text, value)| (name(text), value)));
        }
        if self.doubled {
            total.value = total.value.shift(1);
        }
        let square = pi(total.bits).square(total.bits);
        total.value = total.value.div(&square, total.bits);
        Ok(total)
    }

    /// Digits of precision, in natural units, that the sums need beyond those asked.
    fn shortage(&self, effort: &Effort) -> Result<f64, RouteFailure> {
        const MOST: f64 = 20_000.0;
        let mut goal = 14.0;
        while goal < MOST {
            let rough = self.sum(goal, effort)?;
            if rough.value.accuracy_estimate() > 2.0 && rough.value.certainly_positive() {
                return Ok(rough.unit - ln_estimate(&rough.value));
            }
            goal *= 2.0;
        }
        let reason = "the packet's spectral sum is too small compared with its terms".to_owned();
        Err(RouteFailure::OutOfReach { reason })
    }

    fn outcome(&self, total: &Total, witness: Vec<(String, String)>) -> RouteOutcome {
        let probability = total.value.mul(&self.far_factor(total.bits), total.bits);
        RouteOutcome {
            interval: probability.to_interval(total.bits).clamp_non_negative(),
            bits: total.bits,
            nodes: total.nodes,
            witness,
        }
    }

    /// `exp(-2E)`, `E = sqrt(d (d + 2t))`; one for mass zero, where nothing is taken out.
    fn far_factor(&self, bits: Bits) -> Real {
        if self.problem.massless || self.problem.distance == 0 {
            return Real::from_i64(1);
        }
        exp(&sqrt(&Real::from_rational(&self.problem.squared_distance(), bits), bits).shift(1).neg(), bits)
    }
}

impl Problem {
    /// `E^2`
    fn squared_distance(&self) -> Rational {
        (Rational::from(&self.time * 2) + &self.distance) * &self.distance
    }
}

/// One side or all: the sum without `exp(-2E)` and without `1/pi^2` (with it in the total).
struct Total {
    value: Real,
    /// Logarithm of what an error of one in the units of the goal is.
    unit: f64,
    bits: Bits,
    nodes: usize,
    witness: Vec<(String, String)>,
}

/// One side.
struct SideSum {
    value: Real,
    unit: f64,
    bits: Bits,
    nodes: usize,
    witness: Vec<(&'static str, String)>,
}

impl Evaluation for CutTail {
    fn name(&self) -> &'static str {
        "spectral"
    }

    fn method(&self) -> &'static str {
        "trapezoid rule on the branch cut of the momentum integral, double sum of the packet's amplitude over the nodes k h"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        const ATTEMPTS: usize = 4;
        if self.problem.time == 0 {
            return Ok(RouteOutcome { interval: nothing(), bits: 64, nodes: 0, witness: Vec::new() });
        }
        self.problem.check_range()?;
        let mut goal = f64::from(digits) * LN_10 + self.shortage(effort)?.max(0.0) + 4.0;
        let mut best = None;
        for _ in 0..ATTEMPTS {
            let mut total = self.sum(goal, effort)?;
            effort.allow_bits(total.bits)?;
            let witness = std::mem::take(&mut total.witness);
            let outcome = self.outcome(&total, witness);
            let reached = outcome.interval.relative_digits(digits);
            best = Some(outcome);
            if reached >= digits {
                break;
            }
            goal += f64::from(digits - reached + 1) * LN_10;
        }
        best.ok_or_else(|| RouteFailure::OutOfReach { reason: "no attempt was made".to_owned() })
    }
}

impl Problem {
    /// Plans are made in double precision.
    fn check_range(&self) -> Result<(), RouteFailure> {
        let sane = |value: &Rational| {
            let value = value.to_f64();
            value.is_finite() && (1e-290..1e290).contains(&value)
        };
        if sane(&self.time) && sane(&self.half_width) && (self.distance == 0 || sane(&self.distance)) {
            return Ok(());
        }
        Err(RouteFailure::OutOfReach { reason: "the ratios of the inputs are outside 1e-290 to 1e290".to_owned() })
    }
}

/// A compact packet has not left its support at the moment of its release.
fn nothing() -> Interval {
    Interval::new(Float::new(64), Float::new(64))
}

/// Natural logarithm, for steering only.
fn ln_estimate(value: &Real) -> f64 {
    Magnitude::from_float(value.midpoint()).log2_estimate() * std::f64::consts::LN_2
}

/// The smallest power of two found that is at least `value`, as its exponent.
fn exponent_above(value: Magnitude) -> i64 {
    let mut exponent = value.log2_estimate().ceil().clamp(-1e9, 1e9) as i64;
    while value.cmp_value(Magnitude::power_of_two(exponent)).is_gt() && exponent < 1 << 40 {
        exponent += 1;
    }
    exponent
}

/// `sqrt(2a)`, the bound of `|F|`.
fn size_bound(problem: &Problem) -> Magnitude {
    let width = Real::from_rational(&Rational::from(&problem.half_width * 2), 64);
    width.abs_upper().sqrt()
}

fn shown(bound: Magnitude) -> String {
    decimal::upper_decimal(&bound.to_float(), 4)
}
