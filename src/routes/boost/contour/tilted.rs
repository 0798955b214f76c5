//! Bounds on tilted lines, between the two lines of an edge's light cone.
//!
//! **Tilted lines** `eta = eta_c + u - i alpha tanh u` for `X = -Y < 0 < X'`, strip `|Im u| <= delta < alpha`,
//! `alpha + delta < pi/2`, `delta <= pi/4`. For `u = n ± i delta`: `tanh u = r + i j` with `tanh n <= r <= tanh
//! 2n` for `n >= 0`, odd and increasing in `n`, and `|j| <= tan delta` with the sign of `Im u`. So `U = eta_c +
//! n + alpha j`, `V = Im u - alpha r`, and `Re` of the exponent is `(sin V/2)(Y e^U - X' e^-U)`. With a border
//! `n1` let `v1 = alpha tanh n1 - delta > 0`: beyond it `V <= -v1` on the right, `V >= v1` on the left, `|V| <=
//! alpha + delta`.
//!
//! * Pole: with `m = eta_c + theta - alpha tan delta - n1 > 0`, wherever `U + theta < m` one has `n < -n1`, so
//!   `V >= v1`. So the strip passes above the pole and `|w| <= S/m0`, `m0 = min(sin v1, tanh m)`; `|d eta/du| <=
//!   1 + alpha/cos^2 delta`.
//! * Right of `n1`: at most `exp(X' e^-U1/2) E_1(s1 Y e^U1/2)`, `U1 = eta_c + n1 - alpha tan delta`, `s1 = sin
//!   v1`, in `L2` at most `exp(X'max e^-U1/2) sqrt(4 ln 2/(s1 e^U1))` as `Int_0^inf E_1^2 = 2 ln 2`. Left of
//!   `-n1` the same with `Y`, `X'` and `U -> -U` exchanged.
//! * Between: the exponent is bounded on cells of `n`, and the sum over the cells counts `sqrt(x2 - x1)` times.

use super::line::{BITS, Edge, Line, largest, least, one, real};
use super::piece::{Place, Zone};
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::{cos, cosh, exp, ln, ln_2, sin, sinh, sqrt, tanh};
use rug::Rational;

/// Cells between the borders.
const CELLS: i64 = 12;

/// The numbers of a tilted line's bounds.
pub(super) struct Tilted {
    centre: Real,
    border: Real,
    alpha: Real,
    delta: Real,
    /// `alpha tan delta`
    drift: Real,
    /// `sin v1`
    sine: Real,
    /// `m0`
    pub(super) floor: Real,
}

impl Tilted {
    /// `None` unless all conditions hold.
    pub(super) fn new(line: &Line, centre: &Rational, border: &Rational, place: &Place) -> Option<Tilted> {
        if place.zone != Zone::Between || line.delta <= 0 || line.delta > Rational::from((3, 4)) {
            return None;
        }
        if Rational::from(&line.alpha + &line.delta) > Rational::from((25, 16)) || line.edges != [Edge::Minus] {
            return None;
        }
        let (centre, border, alpha, delta) = (real(centre), real(border), real(&line.alpha), real(&line.delta));
        let drift = alpha.mul(&sin(&delta, BITS).div(&cos(&delta, BITS), BITS), BITS);
        let least_angle = alpha.mul(&tanh(&border, BITS), BITS).sub(&delta, BITS);
        let theta = ln(&place.frame.growth, BITS);
        let margin = centre.add(&theta, BITS).sub(&drift, BITS).sub(&border, BITS);
        if !least_angle.certainly_positive() || !margin.certainly_positive() {
            return None;
        }
        let sine = sin(&least_angle, BITS);
        let floor = least(&sine, &tanh(&margin, BITS));
        Some(Tilted { centre, border, alpha, delta, drift, sine, floor })
    }

    pub(super) fn constant(&self, place: &Place) -> Magnitude {
        let Some(length) = place.length(BITS) else {
            return Magnitude::INFINITY;
        };
        let [from, to] = place.ends();
        let lag = largest(&from.minus.x, &to.minus.x);
        let lead = largest(&from.minus.back, &to.minus.back);
        let outward = self.border.sub(&self.drift, BITS);
        let right = self.end(&self.centre.add(&outward, BITS), &lead);
        let left = self.end(&outward.sub(&self.centre, BITS), &lag);
        let root = sqrt(&length, BITS).abs_upper();
        let middle = self.middle(&lag, &lead, true).add(self.middle(&lag, &lead, false)).mul(root);
        let speed = one().add(&self.alpha.div(&cos(&self.delta, BITS).square(BITS), BITS), BITS);
        let scale = speed.mul(&place.frame.slope, BITS).div(&self.floor, BITS).abs_upper();
        right.add(left).shift(1).add(middle).mul(scale)
    }

    /// `exp(z e^-U/2) sqrt(4 ln 2/(s1 e^U))`
    fn end(&self, outward: &Real, other: &Real) -> Magnitude {
        let growth = exp(outward, BITS);
        let bulge = exp(&other.div(&growth, BITS).shift(-1), BITS);
        let square = ln_2(BITS).shift(2).div(&self.sine.mul(&growth, BITS), BITS);
        bulge.mul(&sqrt(&square, BITS), BITS).abs_upper()
    }

    /// The sum over the cells on the upper or the lower edge of the strip.
    fn middle(&self, lag: &Real, lead: &Real, upper: bool) -> Magnitude {
        let width = self.border.shift(1).div_u64(CELLS as u64, BITS);
        let shift = if upper { self.delta.clone() } else { self.delta.neg() };
        let angle = |n: &Real| shift.sub(&self.alpha.mul(&self.turn(n), BITS), BITS);
        let mut total = Magnitude::ZERO;
        for cell in 0..CELLS {
            let low = width.mul_i64(cell, BITS).sub(&self.border, BITS);
            let high = low.add(&width, BITS);
            let mut exponent = Real::zero();
            let mut raise = |candidate: Real| exponent = larger(&exponent, candidate);
            let (most, fewest) = (angle(&low), angle(&high));
            if !most.certainly_negative() {
                let drift = if upper { self.drift.clone() } else { Real::zero() };
                let top = exp(&self.centre.add(&high, BITS).add(&drift, BITS), BITS);
                raise(sin(&most, BITS).mul(&top, BITS).mul(lag, BITS).shift(-1));
            }
            if !fewest.certainly_positive() {
                let drift = if upper { Real::zero() } else { self.drift.clone() };
                let bottom = exp(&self.centre.add(&low, BITS).sub(&drift, BITS), BITS);
                raise(sin(&fewest.neg(), BITS).mul(lead, BITS).div(&bottom, BITS).shift(-1));
            }
            total = total.add(exp(&exponent, BITS).mul(&width, BITS).abs_upper());
        }
        total
    }

    /// `Re tanh(n + i delta) = sinh 2n/(cosh 2n + cos 2 delta)`
    fn turn(&self, n: &Real) -> Real {
        let twice = n.shift(1);
        let below = cosh(&twice, BITS).add(&cos(&self.delta.shift(1), BITS), BITS);
        sinh(&twice, BITS).div(&below, BITS)
    }
}

/// A number not below either.
fn larger(x: &Real, y: Real) -> Real {
    let (first, second) = (x.upper(BITS), y.upper(BITS));
    Real::from_float(if first > second { first } else { second })
}
