//! The common packets as polynomials times plane waves.
//!
//! | constructor | `psi0` before normalisation | half-width |
//! |---|---|---|
//! | [`WavePacket::moving_box`] | `exp(i k x)` | `a` |
//! | [`WavePacket::cosine`] | `cos(b x)` for odd, `sin(b x)` for even modes, times `exp(i k x)`, `b = n pi/(2 a)` | `a` |
//! | [`WavePacket::bspline`] | the B-spline of order `p` with equal steps `2a/p`, of height at most one, times `exp(i k x)` | `a` |
//! | [`WavePacket::ball`] | `x` (one in a ball) | the radius |
//! | [`WavePacket::spherical_well`] | `sin(n pi x/a)` (`sin(n pi r/a)/r` in a ball) | the radius |
//! | [`WavePacket::piecewise`] | any polynomials | of the knots |
//! | [`WavePacket::radial`] | `x p(|x|)` (any piecewise polynomial `p(r)`) | the last radius |

use super::number::trimmed;
use super::{ExactComplex, Polynomial, WaveNumber, WavePacket};
use crate::error::Error;
use rug::{Integer, Rational};

/// Largest order of a B-spline.
pub const MAX_ORDER: u32 = 32;
/// Largest mode number.
pub const MAX_MODE: u32 = 1_000_000;

impl WavePacket {
    /// Constant amplitude on `|x| <= half_width`, with mean momentum `k`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not positive.
    pub fn moving_box(half_width: &Rational, momentum: &Rational) -> Result<WavePacket, Error> {
        WavePacket::on_interval(half_width, &one(), WaveNumber { plain: momentum.clone(), pi_part: Rational::new() })
    }

    fn on_interval(half_width: &Rational, value: &ExactComplex, number: WaveNumber) -> Result<WavePacket, Error> {
        positive("half-width", half_width)?;
        let knots = vec![Rational::from(-half_width), half_width.clone()];
        WavePacket::from_left(knots, &[vec![value.clone()]], number)
    }

    /// The eigenstate number `mode >= 1` between hard walls at `|x| = half_width`, with mean momentum `k`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not positive or the mode is not in `1..=MAX_MODE`.
    pub fn cosine(half_width: &Rational, mode: u32, momentum: &Rational) -> Result<WavePacket, Error> {
        positive("half-width", half_width)?;
        if mode == 0 || mode > MAX_MODE {
            return Err(Error::bad_input("mode", mode, &format!("give a mode number from 1 to {MAX_MODE}")));
        }
        let number = WaveNumber { plain: Rational::new(), pi_part: Rational::from(mode) / half_width / 2 };
        let half = Rational::from((1, 2));
        // cos = (e+ + e-)/2, sin = -i/2 (e+ - e-).
        let (plus, minus) = if mode % 2 == 1 {
            (ExactComplex::from(half.clone()), ExactComplex::from(half))
        } else {
            let up = ExactComplex::new(Rational::new(), half.clone());
            (up.neg(), up)
        };
        let back = WavePacket::on_interval(half_width, &one(), number.neg())?;
        let forth = WavePacket::on_interval(half_width, &one(), number)?;
        Ok(WavePacket::superposition(&[(plus, forth), (minus, back)])?.with_momentum(momentum))
    }

    /// The B-spline of the given order with equal steps on `|x| <= half_width`, with mean momentum `k`: the
    /// `order`-fold convolution of the indicator function of an interval of length one, stretched. Order 1 is the box, 2
    /// the triangle.
    ///
    /// In units of the step it is `Sum_l (-1)^l C(p, l) (x + p/2 - l)_+^(p-1) / (p-1)!`, at most one.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not positive or the order is not in `1..=MAX_ORDER`.
    pub fn bspline(half_width: &Rational, order: u32, momentum: &Rational) -> Result<WavePacket, Error> {
        positive("half-width", half_width)?;
        check_order(order)?;
        let step = Rational::from(half_width * 2) / order;
        let degree = order - 1;
        let knots = (0..=order).map(|i| Rational::from(&step * i) - half_width).collect();
        let pieces: Vec<Polynomial> = (0..order).map(|index| bspline_piece(order, index, degree, &step)).collect();
        let number = WaveNumber { plain: momentum.clone(), pi_part: Rational::new() };
        WavePacket::from_left(knots, &pieces, number)
    }

    /// Uniform in the ball of this radius in three dimensions, zero outside.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the radius is not positive.
    pub fn ball(radius: &Rational) -> Result<WavePacket, Error> {
        positive("radius", radius)?;
        WavePacket::radial(vec![Rational::new(), radius.clone()], &[vec![one()]])
    }

    /// The s-wave number `mode >= 1` of the spherical well with a hard wall, `sin(n pi r/a)/r`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the radius is not positive or the mode is not in `1..=MAX_MODE/2`.
    pub fn spherical_well(radius: &Rational, mode: u32) -> Result<WavePacket, Error> {
        positive("radius", radius)?;
        if mode == 0 || mode > MAX_MODE / 2 {
            return Err(Error::bad_input("mode", mode, &format!("give a mode number from 1 to {}", MAX_MODE / 2)));
        }
        WavePacket::cosine(radius, 2 * mode, &Rational::new())
    }

    /// Polynomials between knots: `pieces[i][n]` multiplies `(x - knots[i])^n` between `knots[i]` and `knots[i+1]`.
    ///
    /// Pieces that vanish at either end are dropped: the support is what remains.
    ///
    /// # Errors
    /// [`Error::BadInput`] for knots that do not increase, for a number of pieces that is not one less than that of
    /// the knots, and for a packet that is zero everywhere or larger than allowed.
    pub fn piecewise(knots: Vec<Rational>, pieces: &[Polynomial]) -> Result<WavePacket, Error> {
        WavePacket::from_left(knots, pieces, WaveNumber::default())
    }

    /// A spherically symmetric packet in three dimensions: `psi(r) = Sum_n pieces[i][n] (r - radii[i])^n` between
    /// `radii[i]` and `radii[i+1]`, zero beyond the last radius. It is kept as the odd packet `x psi(|x|)` on the line.
    ///
    /// # Errors
    /// As [`WavePacket::piecewise`]; the first radius must be zero.
    pub fn radial(radii: Vec<Rational>, pieces: &[Polynomial]) -> Result<WavePacket, Error> {
        if radii.first().is_none_or(|first| *first != 0) {
            let was = radii.first().map_or_else(|| "no radii".to_owned(), Rational::to_string);
            return Err(Error::bad_input("radii", was, "give radii that begin at 0"));
        }
        let outward: Vec<Polynomial> =
            pieces.iter().zip(&radii).map(|(piece, left)| times_distance(piece, left)).collect();
        let right = WavePacket::from_left(radii, &outward, WaveNumber::default())?;
        let minus = ExactComplex::from(Rational::from(-1));
        WavePacket::superposition(&[(minus, right.mirrored()), (one(), right)])
    }
}

/// One piece of the B-spline, in powers of the distance from its left knot.
fn bspline_piece(order: u32, index: u32, degree: u32, step: &Rational) -> Polynomial {
    let inverse = Rational::from(step.recip_ref());
    let mut scale = Rational::from(1) / Rational::from(Integer::from(Integer::factorial(degree)));
    let mut list = Vec::new();
    for power in 0..=degree {
        let mut coefficient = Integer::new();
        for l in 0..=index {
            let term = Integer::from(order).binomial(l) * Integer::from(Integer::u_pow_u(index - l, degree - power));
            if l % 2 == 0 { coefficient += term } else { coefficient -= term }
        }
        coefficient *= Integer::from(degree).binomial(power);
        list.push(ExactComplex::from(Rational::from(coefficient) * &scale));
        scale *= &inverse;
    }
    trimmed(list)
}

/// `(left + z) p(z)`.
fn times_distance(piece: &[ExactComplex], left: &Rational) -> Polynomial {
    let mut list = vec![ExactComplex::default(); piece.len() + 1];
    for (n, value) in piece.iter().enumerate() {
        list[n] = list[n].plus(&value.times(left));
        list[n + 1] = list[n + 1].plus(value);
    }
    list
}

fn one() -> ExactComplex {
    ExactComplex::from(Rational::from(1))
}

pub(crate) fn positive(field: &str, value: &Rational) -> Result<(), Error> {
    if *value > 0 {
        return Ok(());
    }
    Err(Error::bad_input(field, value, &format!("give a {field} greater than 0, such as 1, 0.5 or 1/3")))
}

pub(crate) fn check_order(order: u32) -> Result<(), Error> {
    if order == 0 || order > MAX_ORDER {
        return Err(Error::bad_input("order", order, &format!("give an order from 1 to {MAX_ORDER}")));
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn q(n: i64, d: i64) -> Rational {
        Rational::from((n, d))
    }

    #[test]
    fn symmetries_are_seen() {
        let zero = Rational::new();
        let moving = WavePacket::moving_box(&q(1, 2), &q(3, 1)).unwrap();
        assert!(moving.is_symmetric() && !moving.is_real());
        for mode in 1..5 {
            let still = WavePacket::cosine(&q(1, 2), mode, &zero).unwrap();
            assert!(still.is_symmetric() && still.is_real());
            assert!(WavePacket::cosine(&q(1, 2), mode, &q(1, 3)).unwrap().is_symmetric());
        }
        let ball = WavePacket::ball(&q(2, 1)).unwrap();
        assert!(ball.is_symmetric() && ball.is_real());
        assert_eq!(ball.half_width(), 2);
        let one_sided = WavePacket::piecewise(vec![q(0, 1), q(1, 1)], &[vec![ExactComplex::default(), one()]]).unwrap();
        assert!(!one_sided.is_symmetric() && one_sided.is_real());
        assert_eq!(one_sided.mirrored().mirrored(), one_sided);
    }

    #[test]
    fn splines_join_smoothly() {
        for order in 1..9 {
            let spline = WavePacket::bspline(&q(order, 2), order as u32, &Rational::new()).unwrap();
            assert!(spline.is_symmetric() && spline.is_real());
            let pieces = &spline.waves()[0].pieces;
            for pair in pieces.windows(2) {
                // p - 2 continuous derivatives: expansions about a knot differ in the highest power alone.
                let about_knot = super::super::number::shifted(&pair[1], &q(1, 1));
                assert_eq!(pair[0][..order as usize - 1], about_knot[..order as usize - 1]);
            }
        }
    }

    #[test]
    fn half_boxes_add_up() {
        let half = WavePacket::moving_box(&q(1, 2), &Rational::new()).unwrap();
        let (left, right) = (half.translated(&q(-1, 2)).unwrap(), half.translated(&q(1, 2)).unwrap());
        let both = WavePacket::superposition(&[(one(), left.clone()), (one(), right)]).unwrap();
        assert_eq!(both.knots().len(), 3);
        assert!(both.is_symmetric());
        assert!(WavePacket::superposition(&[(one(), left.clone()), (one().neg(), left)]).is_err());
    }

    #[test]
    fn bad_packets_are_refused() {
        let unit = || vec![vec![one()]];
        assert!(WavePacket::piecewise(vec![q(1, 1), q(0, 1)], &unit()).is_err());
        assert!(WavePacket::piecewise(vec![q(0, 1)], &[]).is_err());
        assert!(WavePacket::piecewise(vec![q(0, 1), q(1, 1), q(2, 1)], &unit()).is_err());
        assert!(WavePacket::piecewise(vec![q(0, 1), q(1, 1)], &[vec![ExactComplex::default()]]).is_err());
        assert!(WavePacket::radial(vec![q(1, 1), q(2, 1)], &unit()).is_err());
        assert!(WavePacket::bspline(&q(1, 1), 0, &q(0, 1)).is_err());
        assert!(WavePacket::cosine(&q(1, 1), 0, &q(0, 1)).is_err());
        assert!(WavePacket::moving_box(&q(0, 1), &q(0, 1)).is_err());
        let moving = WavePacket::moving_box(&q(1, 1), &q(1, 1)).unwrap();
        assert!(moving.translated(&q(1, 1)).is_err());
    }
}
