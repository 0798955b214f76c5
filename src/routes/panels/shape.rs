//! A packet as its jumps: what the position-space integral needs to know of it.
//!
//! For `psi0 = e^(i kappa y) p(y)` with polynomial pieces `p` the amplitude right of the cone is
//! `psi(x) = (i t/pi) e^(i kappa x) Q(x)`, `Q(x) = Int g(x - y) e^(-i kappa (x - y)) p(y) dy`. Put
//!
//! ```text
//! Phi_1(v) = e^(-i kappa v) F(v),    Phi_(j+1)(v) = Int_v^inf Phi_j,    c_kj = p^(j)(y_k - 0) - p^(j)(y_k + 0).
//! ```
//!
//! With `Gamma_1(v) = Int_v^inf e^(-i kappa v') g(v') dv' = Phi_1 - i kappa Phi_2` (by parts, `F' = -g`) and
//! `Gamma_(j+1) = Int_v^inf Gamma_j`, repeated integration by parts of every piece gives
//!
//! ```text
//! Q(x) = Sum_k Sum_j (-1)^j c_kj Gamma_(j+1)(x - y_k)
//!      = Sum_k Sum_j (-1)^j (c_kj + i kappa c_k(j-1)) Phi_(j+1)(x - y_k).
//! ```
//!
//! Only `|psi|^2` counts, so the phase `e^(i kappa x)` is left out, except for a standing wave, which is real:
//! `cos(b y) = Re e^(i b y)` and `sin(b y) = Re(-i e^(i b y))` with `g` real, hence the same real parts of
//! `e^(i b x) Q(x)`.

use crate::packets::piecewise::{Carrier, ExactComplex, PiecewisePacket, expanded_about};
use rug::Rational;

/// A knot at which some derivative jumps.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Knot {
    /// Distance from the right end of the support, `a - y_k`.
    pub depth: Rational,
    /// `c_kj` for `j = 0, 1, ...`; the last one is not zero.
    pub jumps: Vec<ExactComplex>,
}

/// The packet seen from the right, in units of the inverse mass.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Shape {
    /// Knots from the right end inward; the first has depth zero.
    pub knots: Vec<Knot>,
    /// `Int |psi0|^2`.
    pub norm: Rational,
    /// Half of the length of the support.
    pub half_width: Rational,
    /// The carrier, its momentum in units of the mass.
    pub carrier: Carrier,
}

impl Shape {
    /// The packet with lengths multiplied by `mass`.
    pub(super) fn new(packet: &PiecewisePacket, mass: &Rational) -> Shape {
        let inverse = Rational::from(mass.recip_ref());
        let mut knots = Vec::new();
        let mut from_right: Vec<ExactComplex> = Vec::new();
        let ends = packet.knots().last().cloned().unwrap_or_default();
        let pieces = packet.pieces().iter().zip(packet.knots().windows(2)).rev();
        for (piece, pair) in pieces {
            let at_right = expanded_about(piece, &Rational::from(&pair[1] - &pair[0]));
            push_knot(&mut knots, Rational::from(&ends - &pair[1]) * mass, &at_right, &from_right, &inverse);
            from_right = piece.clone();
        }
        let half_width = packet.half_width() * mass;
        push_knot(&mut knots, Rational::from(&half_width * 2), &[], &from_right, &inverse);
        let carrier = match packet.carrier() {
            Carrier::Travelling(momentum) => Carrier::Travelling(Rational::from(momentum * &inverse)),
            other => other.clone(),
        };
        Shape { knots, norm: Rational::from(packet.norm_squared() * mass), half_width, carrier }
    }

    /// The packet seen from the left: `psi0(-y)`.
    pub(super) fn reflected(&self) -> Shape {
        let width = Rational::from(&self.half_width * 2);
        // left'^(j) - right'^(j) = (-1)^j (right^(j) - left^(j)).
        let turned = |(j, c): (usize, &ExactComplex)| c.times(&Rational::from(if j % 2 == 0 { -1 } else { 1 }));
        let knot = |knot: &Knot| Knot {
            depth: Rational::from(&width - &knot.depth),
            jumps: knot.jumps.iter().enumerate().map(turned).collect(),
        };
        let carrier = match &self.carrier {
            Carrier::Travelling(momentum) => Carrier::Travelling(Rational::from(-momentum)),
            other => other.clone(),
        };
        Shape { knots: self.knots.iter().rev().map(knot).collect(), carrier, ..self.clone() }
    }

    /// Whether both sides have the same tail for a visible reason: `psi0(-y)` is `psi0(y)` or its conjugate, up to
    /// sign. The kernel is imaginary and even, so that each of these gives `|psi(-x)| = |psi(x)|`.
    pub(super) fn is_symmetric(&self) -> bool {
        let other = self.reflected();
        let same = |negate: bool, conjugate: bool| {
            let sign = Rational::from(if negate { -1 } else { 1 });
            let image = |c: &ExactComplex| (if conjugate { c.conj() } else { c.clone() }).times(&sign);
            self.knots.len() == other.knots.len()
                && self.knots.iter().zip(&other.knots).all(|(x, y)| {
                    x.depth == y.depth
                        && x.jumps.len() == y.jumps.len()
                        && x.jumps.iter().zip(&y.jumps).all(|(c, d)| *c == image(d))
                })
        };
        // A travelling wave changes its direction under reflection, and again under conjugation.
        let plain = !matches!(self.carrier, Carrier::Travelling(_));
        same(false, true) || same(true, true) || (plain && (same(false, false) || same(true, false)))
    }

    /// Number of functions `Phi_1, Phi_2, ...` that a knot needs.
    pub(super) fn levels(&self, knot: &Knot) -> usize {
        knot.jumps.len() + usize::from(self.carrier != Carrier::Still)
    }
}

/// Adds the knot between two pieces, given with their derivatives over factorials there, unless it is none.
fn push_knot(
    knots: &mut Vec<Knot>,
    depth: Rational,
    left: &[ExactComplex],
    right: &[ExactComplex],
    inverse_mass: &Rational,
) {
    let mut factor = Rational::from(1);
    let mut jumps = Vec::new();
    let minus = Rational::from(-1);
    for j in 0..left.len().max(right.len()) {
        if j > 0 {
            factor *= j as u64;
            factor *= inverse_mass;
        }
        let difference = match (left.get(j), right.get(j)) {
            (Some(l), Some(r)) => l.plus(&r.times(&minus)),
            (Some(l), None) => l.clone(),
            (None, Some(r)) => r.times(&minus),
            (None, None) => ExactComplex::default(),
        };
        jumps.push(difference.times(&factor));
    }
    while jumps.last().is_some_and(ExactComplex::is_zero) {
        jumps.pop();
    }
    if !jumps.is_empty() {
        knots.push(Knot { depth, jumps });
    }
}
