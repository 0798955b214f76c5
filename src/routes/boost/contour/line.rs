//! The lines in the `eta` plane: nodes on them and proven bounds.
//!
//! `S = e^(|theta|/2)`; `U + iV` is the point of the line or of the edge of its strip; all norms are over the
//! piece.
//!
//! **Lemma 1.** `|w| <= S/max(|sin V|, |tanh(U + theta)|)`. *Proof.* `|cosh(U + iV)| <= cosh U`, and `|sinh(U +
//! theta + iV)|^2 = cosh^2(U+theta) - cos^2 V` is at least `cosh^2(U+theta)` times `sin^2 V` and times
//! `tanh^2(U+theta)`; `cosh U/cosh(U + theta) <= S^2`. ∎
//!
//! **Straight lines** `eta = u ± i alpha`, strip `|Im u| <= delta < alpha`, `alpha + delta <= 25/16 < pi/2`.
//! With `s = sin(alpha - delta)`, on both edges of the strip an edge event's integrand is at most `(S/s)
//! exp(-(s/2)(|X| e^U + |X'| e^-U))`, whose integral is `(S/s) 2 K_0(s sqrt(X X'))` (DLMF 10.32.9). Let `r >= 0`
//! be the distance from the end of the piece nearer to the event, where `E = sqrt(X X')`: both factors grow with
//! `r` at the rate one, so `sqrt(X X') >= E + r`. As `e^y K_0(y)` falls and `Int_0^inf K_0^2 = Int Int_0^inf ds
//! dt/(cosh s + cosh t) = pi^2/4`, the `L2` norm is at most `(S/s) pi e^(-sE) s^(-1/2)`, and that of the rule's
//! error at most twice that over `e^(2 pi delta/h) - 1` (Trefethen and Weideman, SIAM Review 56 (2014), theorem
//! 5.1; the two edges count separately).
//!
//! **Tilted lines** `eta = eta_c + u - i alpha tanh u` for `X < 0 < X'`: see [`super::tilted`].
//!
//! **Nodes left out.** Beyond the last node, at `U_K` on the right, with `y = e^U_K`, `s1` the least `|sin V|`
//! there, `c` the bound of `|w d eta/du|` and `g = exp(X'max/(2y))` on tilted lines, `g = 1` on straight ones:
//! the `L1` norms of the nodes add up to at most `T1 = c g (2/(s1 y)) exp(-s1 |X| y/2)`, the `L2` norms to `T2 =
//! c g (2/sqrt(s1 y)) exp(-s1 |X| y/2)`, with the least `|X|` of the piece, from `Int_0^inf exp(-s1 r e^U/2) dr
//! = 2/(s1 e^U)`, `h Sum_(k>K) e^-U_k <= e^-U_K` and `h Sum_(k>K) e^(-U_k/2) <= 2 e^(-U_K/2)`.

use super::piece::{End, Pair, Place};
use super::sum::Node;
use super::tilted::Tilted;
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::complex_elementary;
use crate::functions::elementary::{cosh, exp, exp_m1, pi, sin, sqrt, tanh};
use crate::routes::{Effort, RouteFailure};
use rug::Rational;

/// Precision of the bounds.
pub(super) const BITS: Bits = 64;

/// The curve.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Shape {
    /// `u + i alpha`
    Up,
    /// `u - i alpha`
    Down,
    /// `eta_c + u - i alpha tanh u`, with the border `n1`
    Tilt { centre: Rational, border: Rational },
}

/// An edge of the box.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Edge {
    Minus,
    Plus,
}

impl Edge {
    fn pair(self, end: &End) -> &Pair {
        match self {
            Edge::Minus => &end.minus,
            Edge::Plus => &end.plus,
        }
    }
}

/// One end of a line.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Way {
    Right,
    Left,
}

/// A curve with its lattice `u = (k + offset) h`.
#[derive(Clone, Debug)]
pub(super) struct Line {
    pub shape: Shape,
    pub edges: Vec<Edge>,
    pub alpha: Rational,
    pub delta: Rational,
    pub step: Rational,
    pub first: i64,
    pub last: i64,
}

/// Norms of what is left out.
#[derive(Clone, Copy, Debug)]
pub(super) struct Tails {
    /// In `L1`.
    pub first: Magnitude,
    /// In `L2`.
    pub second: Magnitude,
}

impl Tails {
    pub(super) const ZERO: Tails = Tails { first: Magnitude::ZERO, second: Magnitude::ZERO };

    pub(super) fn add(self, other: Tails) -> Tails {
        Tails { first: self.first.add(other.first), second: self.second.add(other.second) }
    }
}

pub(super) fn real(value: &Rational) -> Real {
    Real::from_rational(value, BITS)
}

pub(super) fn least(x: &Real, y: &Real) -> Real {
    Real::from_float(x.abs_lower().min(y.abs_lower()).to_float())
}

pub(super) fn largest(x: &Real, y: &Real) -> Real {
    Real::from_float(x.abs_upper().max(y.abs_upper()).to_float())
}

pub(super) fn one() -> Real {
    Real::from_i64(1)
}

impl Line {
    /// Lattices off the real line's own are moved by half a step, so that no two nodes of a piece are conjugate.
    fn offset(&self) -> Rational {
        if self.shape == Shape::Up { Rational::new() } else { Rational::from((1, 2)) }
    }

    fn parameter(&self, index: i64) -> Rational {
        (self.offset() + index) * &self.step
    }

    pub(super) fn describe(&self) -> (String, String) {
        let shape = match &self.shape {
            Shape::Up => "line above".to_owned(),
            Shape::Down => "line below".to_owned(),
            Shape::Tilt { centre, border } => format!("tilted line, centre {centre}, border {border}"),
        };
        let (alpha, delta, step) = (&self.alpha, &self.delta, &self.step);
        (shape, format!("alpha {alpha}, strip {delta}, step {step}, nodes {}..={}", self.first, self.last))
    }

    /// The `L2` norm of the error of the trapezoid rule.
    pub(super) fn discretisation(&self, place: &Place) -> Magnitude {
        let gain = exp_m1(&pi(BITS).mul(&real(&self.delta), BITS).shift(1).div(&real(&self.step), BITS), BITS);
        let least_gain = gain.abs_lower();
        self.strip_constant(place).div(least_gain)
    }

    /// That bound times `e^(2 pi delta/h) - 1`.
    pub(super) fn strip_constant(&self, place: &Place) -> Magnitude {
        match &self.shape {
            Shape::Up | Shape::Down => self.straight_constant(place),
            Shape::Tilt { centre, border } => match Tilted::new(self, centre, border, place) {
                Some(tilted) => tilted.constant(place),
                None => Magnitude::INFINITY,
            },
        }
    }

    fn straight_constant(&self, place: &Place) -> Magnitude {
        let (low, high) = (Rational::from(&self.alpha - &self.delta), Rational::from(&self.alpha + &self.delta));
        if low <= 0 || high > Rational::from((25, 16)) || self.delta <= 0 {
            return Magnitude::INFINITY;
        }
        let s = sin(&real(&low), BITS);
        let scale = pi(BITS).mul(&place.frame.slope, BITS).shift(1).div(&s.mul(&sqrt(&s, BITS), BITS), BITS);
        let [from, to] = place.ends();
        self.edges.iter().fold(Magnitude::ZERO, |sum, edge| {
            let (p, q) = (edge.pair(from), edge.pair(to));
            let product = least(&p.x, &q.x).mul(&least(&p.back, &q.back), BITS);
            let fall = exp(&sqrt(&product, BITS).mul(&s, BITS).neg(), BITS);
            sum.add(scale.mul(&fall, BITS).abs_upper())
        })
    }

    /// Norms of the nodes beyond both ends.
    pub(super) fn tails(&self, place: &Place) -> Tails {
        let right = self.tails_beyond(place, Way::Right, &self.parameter(self.last));
        right.add(self.tails_beyond(place, Way::Left, &self.parameter(self.first)))
    }

    /// Norms of the nodes beyond one end.
    pub(super) fn tails_beyond(&self, place: &Place, way: Way, parameter: &Rational) -> Tails {
        let u = match way {
            Way::Right => real(parameter),
            Way::Left => real(parameter).neg(),
        };
        let mut total = Tails::ZERO;
        let Some(reach) = self.reach(place, way, &u) else {
            return Tails { first: Magnitude::INFINITY, second: Magnitude::INFINITY };
        };
        let [from, to] = place.ends();
        for edge in &self.edges {
            let (p, q) = (edge.pair(from), edge.pair(to));
            let (ahead, behind) = match way {
                Way::Right => (least(&p.x, &q.x), largest(&p.back, &q.back)),
                Way::Left => (least(&p.back, &q.back), largest(&p.x, &q.x)),
            };
            let rate = reach.sine.mul(&reach.growth, BITS);
            let mut exponent = rate.mul(&ahead, BITS).shift(-1).neg();
            if matches!(self.shape, Shape::Tilt { .. }) {
                exponent = exponent.add(&behind.div(&reach.growth, BITS).shift(-1), BITS);
            }
            let size = exp(&exponent, BITS).mul(&reach.size, BITS).shift(1);
            let first = size.div(&rate, BITS).abs_upper();
            let second = size.div(&sqrt(&rate, BITS), BITS).abs_upper();
            total = total.add(Tails { first, second });
        }
        total
    }

    /// `y`, `s1` and `c` at the distance `u` from the middle.
    fn reach(&self, place: &Place, way: Way, u: &Real) -> Option<Reach> {
        let alpha = real(&self.alpha);
        match &self.shape {
            Shape::Up | Shape::Down => {
                let sine = sin(&alpha, BITS);
                Some(Reach { growth: exp(u, BITS), size: place.frame.slope.div(&sine, BITS), sine })
            }
            Shape::Tilt { centre, border } => {
                if !u.certainly_positive() {
                    return None;
                }
                let tilted = Tilted::new(self, centre, border, place)?;
                let shifted = match way {
                    Way::Right => u.add(&real(centre), BITS),
                    Way::Left => u.sub(&real(centre), BITS),
                };
                let speed = alpha.add(&one(), BITS);
                Some(Reach {
                    growth: exp(&shifted, BITS),
                    sine: sin(&alpha.mul(&tanh(u, BITS), BITS), BITS),
                    size: place.frame.slope.div(&tilted.floor, BITS).mul(&speed, BITS),
                })
            }
        }
    }

    /// The nodes, appended.
    pub(super) fn nodes(
        &self,
        place: &Place,
        bits: Bits,
        effort: &Effort,
        list: &mut Vec<Node>,
    ) -> Result<(), RouteFailure> {
        for index in self.first..=self.last {
            effort.check()?;
            list.push(self.node(place, index, bits));
        }
        Ok(())
    }

    fn node(&self, place: &Place, index: i64, bits: Bits) -> Node {
        let u = Real::from_rational(&self.parameter(index), bits);
        let (eta, speed) = self.point(&u, bits);
        let growth = complex_elementary::exp(&eta, bits);
        let unit = Complex::from_real(one());
        let decay = unit.div(&growth, bits);
        let half = |x: Complex| x.shift(-1);
        let shifted = growth.mul_real(&place.frame.growth, bits);
        let shifted_decay = unit.div(&shifted, bits);
        // Both cosines have a positive real part, so the product of the principal roots is the continued root.
        let first = complex_elementary::sqrt(&half(growth.add(&decay, bits)), bits);
        let second = complex_elementary::sqrt(&half(shifted.add(&shifted_decay, bits)), bits);
        let sine = half(shifted.sub(&shifted_decay, bits));
        let step = Real::from_rational(&self.step, bits);
        let weight = first.mul(&second, bits).div(&sine, bits).mul(&speed, bits).mul_real(&step, bits);
        let at = |end: &End| {
            let mut total = Complex::zero();
            for edge in &self.edges {
                let pair = edge.pair(end);
                let difference = growth.mul_real(&pair.x, bits).sub(&decay.mul_real(&pair.back, bits), bits).shift(-1);
                let wave = complex_elementary::exp(&Complex::new(difference.im.neg(), difference.re), bits);
                let term = weight.mul(&wave, bits);
                total = if *edge == Edge::Plus { total.add(&term, bits) } else { total.sub(&term, bits) };
            }
            total
        };
        Node {
            momentum: half(growth.sub(&decay, bits)),
            first: at(&place.from),
            second: place.to.as_ref().map(at),
            wave_length: None,
        }
    }

    /// `eta` and `d eta/du`.
    fn point(&self, u: &Real, bits: Bits) -> (Complex, Complex) {
        let alpha = Real::from_rational(&self.alpha, bits);
        match &self.shape {
            Shape::Up => (Complex::new(u.clone(), alpha), Complex::from_real(one())),
            Shape::Down => (Complex::new(u.clone(), alpha.neg()), Complex::from_real(one())),
            Shape::Tilt { centre, .. } => {
                let re = u.add(&Real::from_rational(centre, bits), bits);
                let im = alpha.mul(&tanh(u, bits), bits).neg();
                let slope = alpha.div(&cosh(u, bits).square(bits), bits).neg();
                (Complex::new(re, im), Complex::new(one(), slope))
            }
        }
    }
}

struct Reach {
    growth: Real,
    sine: Real,
    size: Real,
}
