//! Integrals over rapidity without oscillation: the contour of steepest descent and its trapezoid rule.
//!
//! # Contours
//!
//! The integrals have the form `Int exp(-w cosh zeta) W(zeta) dzeta` over the real line, `W` even.
//!
//! * *Spacelike*, `w = z > 0`: the real line itself, `zeta = s`. With `X = cosh s - 1` the exponential is
//!   `e^-z e^(-z X)`.
//! * *Timelike*, `w = i z`, `z > 0`: the integral over the real line is meant as the limit `w -> i z + 0`. The contour
//!   may then be tilted so that `Im zeta` is negative at the right end and positive at the left end, where
//!   `|exp(-i z cosh zeta)| = exp(z sinh(Re zeta) sin(Im zeta))` falls. Of these,
//!
//!   ```text
//!   sinh(zeta/2) = e^(-i pi/4) sinh(s/2),   s real:     cosh zeta = 1 - i X,   X = cosh s - 1,
//!   exp(-i z cosh zeta) = e^(-i z) e^(-z X),            dzeta/ds = e^(-i pi/4) cosh(s/2) / sqrt(1 - i X/2)
//!   ```
//!
//!   is the contour of steepest descent: nothing oscillates. (`cosh zeta - 1 = 2 sinh^2(zeta/2)`; the derivative from
//!   `cosh(zeta/2) dzeta = e^(-i pi/4) cosh(s/2) ds` and `cosh^2(zeta/2) = 1 - i X/2`, whose real part is one on the
//!   contour, so that the principal root is the continuous one.)
//!
//! # Bounds in a strip
//!
//! **Lemma D1.** For `s = x + iy` and `w = a + ib`:
//! `|cosh s - cosh w| >= (1/2) |cos b - cos y| (cosh x + cosh a)`. *Proof.* The left side is
//! `2 |sinh((s-w)/2)| |sinh((s+w)/2)|`, and `|sinh(p+iq)|^2 = sinh^2 p + sin^2 q >= sin^2 q cosh^2 p`; finally
//! `2 |sin((y-b)/2) sin((y+b)/2)| = |cos b - cos y|` and `2 cosh((x-a)/2) cosh((x+a)/2) = cosh x + cosh a`. ∎
//!
//! **Lemma D2.** For `P > 0` the solutions of `cosh w = 1 + iP` with `|Im w| < pi` are `±(a + ib)`, `a > 0`, with
//! `cosh a = (P + sqrt(P^2 + 4))/2`, `sinh a = sqrt(P cosh a)`, `tan b = sinh a`, `cos b = 1/cosh a`; those of
//! `cosh w = 1 - iP` are their conjugates. *Proof.* `cosh a cos b = 1`, `sinh a sin b = P` hold as
//! `sin b = tanh a` and `sinh^2 a / cosh a = cosh a - 1/cosh a = P`. ∎ `b` grows with `P`.
//!
//! **Lemma D3.** `dzeta/ds` is analytic for `|Im s| <= d` if `cos d > sqrt 2 - 1`, and there
//! `|dzeta/ds|^2 <= 2/(cos d + 1 - sqrt 2)`. *Proof.* `1 - iX/2 = 0` means `cosh s = 1 - 2i`, where `cosh a = 1 + sqrt 2` and
//! `cos b = sqrt 2 - 1` (Lemma D2). `|1 - iX/2| = |cosh s - (1 - 2i)|/2 >= (cos d + 1 - sqrt 2)(cosh x + 1 + sqrt 2)/4`
//! (Lemma D1) and `|cosh(s/2)|^2 = (cosh x + cos y)/2 <= (cosh x + 1)/2`. ∎
//!
//! In the strip `|exp(-z X)| = exp(-z (cosh x cos y - 1))`.
//!
//! # Trapezoid rule
//!
//! Nodes `s_k = k h + delta` for all integers `k`, `delta = 0` or `h/2`, `f` even and analytic for `|Im s| <= d` but for
//! poles at `±s_p` with residues `±rho`, `0 < Im s_p < d`. Then
//!
//! ```text
//! Int f ds = h Sum f(s_k) + 4 pi i rho mu + E,    mu = 1/(1 - exp(-2 pi i (s_p - delta)/h)),
//! |E| <= 2 M/(exp(2 pi d/h) - 1),                 M = Int |f(x + id)| dx
//! ```
//!
//! by the residue theorem with the kernel `mu(s)` between the lines `Im s = ±d` (Trefethen and Weideman, SIAM Review 56
//! (2014), section 5; both lines have the same `M` as `f` is even, and the two poles contribute equally since
//! `1 - mu(-s) = mu(s)` for these `delta`).

use super::{Effort, RouteFailure};
use crate::arithmetic::{Bits, Complex, Magnitude, Real, rounding};
use crate::functions::complex_elementary;
use crate::functions::elementary::{cos, exp, exp_m1, pi, sinh, sqrt};
use rug::float::Round;
use std::f64::consts::PI;

/// Precision in which error bounds are evaluated; they need few digits.
pub(super) const BOUND_BITS: Bits = 64;
/// More nodes than this are refused.
const MOST_NODES: f64 = 2e6;

/// Step, strip, offset and number of nodes of one sum; any values give a valid bound.
pub(super) struct Rule {
    /// Half-width `d` of the strip, exact.
    pub(super) strip: Real,
    /// Step `h`, exact.
    pub(super) step: Real,
    /// Whether `delta = h/2`.
    pub(super) offset: bool,
    /// Index of the last node.
    pub(super) last: u64,
}

/// What steers the choice of a rule, in doubles.
pub(super) struct Aim<'a> {
    /// The factor `z` in the exponent.
    pub(super) decay: f64,
    /// Logarithm of the error allowed, negative: relative to the sum's size.
    pub(super) ln_goal: f64,
    /// Widest strip allowed.
    pub(super) widest: f64,
    /// Logarithm of `2 M` relative to the sum's size for a strip, infinite if it must not be used.
    pub(super) ln_bound: &'a dyn Fn(f64) -> f64,
    /// Logarithm of the rest of the integrand relative to the sum's size, at a point far out.
    pub(super) ln_rest: &'a dyn Fn(f64) -> f64,
    /// The pole's real part, if there is one.
    pub(super) pole: Option<f64>,
}

impl Rule {
    /// The rule with the largest step.
    pub(super) fn choose(aim: &Aim) -> Result<Rule, RouteFailure> {
        const STRIPS: i32 = 48;
        let mut best = (0.0, 0.0);
        // Geometric, as large exponents need narrow strips.
        for i in 0..STRIPS {
            let narrow = (aim.widest * 0.5).min(2.0 / (1.0 + aim.decay).sqrt());
            let strip = aim.widest * (narrow / (4.0 * aim.widest)).powf(f64::from(i) / f64::from(STRIPS));
            let needed = (aim.ln_bound)(strip) - aim.ln_goal;
            let step = 2.0 * PI * strip / needed.max(1.0);
            if needed.is_finite() && step > best.1 {
                best = (strip, step);
            }
        }
        let (strip, step) = best;
        let end = last_node(aim);
        let count = (end / step).ceil() + 1.0;
        let usable = step > 0.0 && count < MOST_NODES;
        if !usable {
            return Err(RouteFailure::OutOfReach {
                reason: "the contour integral would need too many nodes".to_owned(),
            });
        }
        let exact = |value: f64| Real::from_float(rounding::down(24, value));
        let step = exact(step);
        // The pole stays a quarter of a step away from every node.
        let offset = aim.pole.is_some_and(|place| {
            let part = (place / step.to_f64()).rem_euclid(1.0);
            !(0.25..=0.75).contains(&part)
        });
        Ok(Rule { strip: exact(strip), step, offset, last: count as u64 })
    }

    /// Bound of `|E|` from the bound `M`; infinite if the strip reaches the branch point or beyond.
    pub(super) fn discretisation_error(&self, line_integral: Magnitude) -> Magnitude {
        if crate::spoil::is_active(crate::spoil::Fault::DescentErrorForgotten) {
            return Magnitude::ZERO;
        }
        let bits = BOUND_BITS;
        let exponent = pi(bits).shift(1).mul(&self.strip, bits).div(&self.step, bits);
        line_integral.shift(1).div(exp_m1(&exponent, bits).abs_lower())
    }

    /// `cos d` as a ball.
    pub(super) fn strip_cosine(&self) -> Real {
        cos(&self.strip, BOUND_BITS)
    }

    /// Bound of `|dzeta/ds|` for `|Im s| <= d` (Lemma D3), infinite where the lemma does not apply.
    pub(super) fn slope_bound(&self) -> Magnitude {
        let room = branch_room(&self.strip_cosine());
        if !room.certainly_positive() || !self.strip.certainly_less(&pi(BOUND_BITS).shift(-1)) {
            return Magnitude::INFINITY;
        }
        Magnitude::from_u64(2).div(room.abs_lower()).sqrt()
    }

    /// `cosh s - 1` and `sinh s` at the last node.
    pub(super) fn end(&self) -> (Real, Real) {
        let bits = BOUND_BITS;
        let twice = 2 * self.last as i64 + i64::from(self.offset);
        let point = self.step.mul_i64(twice, 128).shift(-1);
        let half = sinh(&point.shift(-1), bits);
        (half.square(bits).shift(1), sinh(&point, bits))
    }

    /// Visits the nodes `s_k >= 0` with the weights that an even integrand gives them, times `h`.
    pub(super) fn for_each_node(
        &self,
        bits: Bits,
        effort: &Effort,
        mut visit: impl FnMut(&Node),
    ) -> Result<(), RouteFailure> {
        let quarter = self.step.shift(-2);
        let start = if self.offset { quarter.clone() } else { Real::zero() };
        let (mut up, mut down) = (exp(&start, bits), exp(&start.neg(), bits));
        let half = self.step.shift(-1);
        let (ratio, inverse_ratio) = (exp(&half, bits), exp(&half.neg(), bits));
        for k in 0..=self.last {
            if k > 0 {
                up = up.mul(&ratio, bits);
                down = down.mul(&inverse_ratio, bits);
            }
            if k.is_multiple_of(64) {
                effort.check()?;
            }
            let half_sinh = up.sub(&down, bits).shift(-1);
            visit(&Node {
                half_cosh: up.add(&down, bits).shift(-1),
                rise: half_sinh.square(bits).shift(1),
                doubled: k > 0 || self.offset,
            });
        }
        Ok(())
    }
}

/// `cos d + 1 - sqrt 2`.
pub(super) fn branch_room(cosine: &Real) -> Real {
    let bits = BOUND_BITS;
    cosine.add(&Real::from_i64(1), bits).sub(&sqrt(&Real::from_i64(2), bits), bits)
}

/// One node `s >= 0`.
pub(super) struct Node {
    /// `cosh(s/2)`.
    pub(super) half_cosh: Real,
    /// `X = cosh s - 1`.
    pub(super) rise: Real,
    /// Whether `-s` is a node as well.
    pub(super) doubled: bool,
}

impl Node {
    /// `sqrt(1 - i X/2)`: `e^(i pi/4) dzeta/ds` is `cosh(s/2)` divided by it.
    pub(super) fn root(&self, bits: Bits) -> Complex {
        complex_elementary::sqrt(&Complex::new(Real::from_i64(1), self.rise.shift(-1).neg()), bits)
    }

    /// `e^(i pi/4) dzeta/ds`.
    pub(super) fn turned_slope(&self, bits: Bits) -> Complex {
        Complex::from_real(self.half_cosh.clone()).div(&self.root(bits), bits)
    }

    /// `e^(-z X)`, doubled where `-s` is a node as well.
    pub(super) fn weight(&self, decay: &Real, bits: Bits) -> Real {
        let value = exp(&decay.mul(&self.rise, bits).neg(), bits);
        if self.doubled { value.shift(1) } else { value }
    }
}

/// `e^(-i pi/4)`.
pub(super) fn eighth_turn(bits: Bits) -> Complex {
    let part = sqrt(&Real::from_i64(2), bits).shift(-1);
    Complex::new(part.clone(), part.neg())
}

/// `e^(-i angle)`.
pub(super) fn minus_phase(angle: &Real, bits: Bits) -> Complex {
    complex_elementary::exp(&Complex::new(Real::zero(), angle.neg()), bits)
}

/// Where the integrand has fallen below the goal.
fn last_node(aim: &Aim) -> f64 {
    let mut end: f64 = 1e-3;
    for _ in 0..6 {
        let exponent = ((aim.ln_rest)(end) - aim.ln_goal).max(1.0);
        end = 2.0 * (exponent / (2.0 * aim.decay)).sqrt().asinh();
    }
    end
}

/// Bits that an exponent of this size costs.
pub(super) fn exponent_bits(size: f64) -> Bits {
    (1.0 + size.abs()).log2().ceil().clamp(0.0, 1e6) as Bits
}

/// The step as a short decimal for a witness, rounded up.
pub(super) fn shown(value: &Real) -> String {
    crate::arithmetic::decimal::upper_decimal(&rug::Float::with_val_round(53, value.midpoint(), Round::Up).0, 6)
}
