//! Compact packets made of polynomial pieces, all numbers exact.
//!
//! `psi0` is a polynomial between each two neighbouring knots, zero outside the outer ones, and may carry a factor
//! `exp(i k x)` or `cos(b x)`; it need not be normalised, since its norm is an exact rational here. Many packets are
//! of this kind:
//!
//! | constructor | packet |
//! |---|---|
//! | [`PiecewisePacket::uniform`] | constant on an interval: jump edges |
//! | [`PiecewisePacket::bspline`] | B-spline of any order with equal steps: order 1 jumps, order 2 is a triangle, order `p` has `p - 2` continuous derivatives |
//! | [`PiecewisePacket::real`], [`PiecewisePacket::complex`] | any knots and coefficients |
//! | [`PiecewisePacket::uniform_ball`], [`PiecewisePacket::radial`] | s-waves in three dimensions |
//! | [`PiecewisePacket::cosine`] | eigenstates of the interval with hard walls |
//! | [`PiecewisePacket::with_momentum`] | any of the first three, moving |
//!
//! A spherically symmetric amplitude `psi(r)` in three dimensions evolves as the odd amplitude `u(x) = x psi(|x|)` on
//! the line does, and `4 pi r^2 |psi|^2` is twice `2 pi |u|^2`: after normalisation, `P(r > R)` is `P(|x| > R)`.

use crate::error::Error;
use rug::{Integer, Rational};

/// Largest number of pieces.
pub const MAX_PIECES: usize = 1000;
/// Largest degree of a piece.
pub const MAX_DEGREE: usize = 40;
/// Largest order of a B-spline.
pub const MAX_ORDER: u32 = 32;
/// Largest mode number of a cosine packet.
pub const MAX_MODE: u32 = 1_000_000;

pub use super::waves::ExactComplex;

/// A factor in front of the polynomials.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Carrier {
    /// None.
    Still,
    /// `exp(i k x)` with this mean momentum `k`.
    Travelling(Rational),
    /// `cos(n pi x/(2a))` for odd and `sin(n pi x/(2a))` for even mode numbers `n`.
    Standing(u32),
}

/// Polynomial pieces between knots, with an optional carrier.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct PiecewisePacket {
    knots: Vec<Rational>,
    pieces: Vec<Vec<ExactComplex>>,
    carrier: Carrier,
    norm: Rational,
}

impl PiecewisePacket {
    /// Complex pieces: `pieces[i][n]` multiplies `(x - knots[i])^n` between `knots[i]` and `knots[i+1]`.
    ///
    /// Pieces that vanish at either end are dropped: the support is what remains.
    ///
    /// # Errors
    /// [`Error::BadInput`] for knots that do not increase, for a number of pieces that is not one less than that of
    /// the knots, for a packet that is zero everywhere, and beyond [`MAX_PIECES`] and [`MAX_DEGREE`].
    pub fn complex(knots: Vec<Rational>, pieces: Vec<Vec<ExactComplex>>) -> Result<PiecewisePacket, Error> {
        if knots.len() < 2 || knots.len() > MAX_PIECES + 1 {
            let wanted = format!("give from 2 to {} knots", MAX_PIECES + 1);
            return Err(Error::bad_input("knots", format!("{} knots", knots.len()), &wanted));
        }
        if let Some(pair) = knots.windows(2).find(|pair| pair[0] >= pair[1]) {
            let was = format!("{} before {}", pair[0], pair[1]);
            return Err(Error::bad_input("knots", was, "give knots that increase strictly from left to right"));
        }
        if pieces.len() + 1 != knots.len() {
            let wanted = format!("give one piece for each of the {} intervals between knots", knots.len() - 1);
            return Err(Error::bad_input("pieces", format!("{} pieces", pieces.len()), &wanted));
        }
        let (knots, pieces) = trimmed(knots, pieces);
        if pieces.is_empty() {
            let wanted = "give at least one coefficient that is not zero: the norm must be positive";
            return Err(Error::bad_input("pieces", "zero everywhere", wanted));
        }
        if let Some(long) = pieces.iter().find(|piece| piece.len() > MAX_DEGREE + 1) {
            let wanted = format!("give polynomials up to degree {MAX_DEGREE}");
            return Err(Error::bad_input("pieces", format!("degree {}", long.len() - 1), &wanted));
        }
        let norm = norm_squared(&knots, &pieces);
        Ok(PiecewisePacket { knots, pieces, carrier: Carrier::Still, norm })
    }

    /// Real pieces, otherwise as [`PiecewisePacket::complex`].
    ///
    /// # Errors
    /// As [`PiecewisePacket::complex`].
    pub fn real(knots: Vec<Rational>, pieces: Vec<Vec<Rational>>) -> Result<PiecewisePacket, Error> {
        let pieces = pieces.into_iter().map(|piece| piece.into_iter().map(ExactComplex::from).collect()).collect();
        PiecewisePacket::complex(knots, pieces)
    }

    /// Constant on `|x| <= half_width`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not positive.
    pub fn uniform(half_width: &Rational) -> Result<PiecewisePacket, Error> {
        PiecewisePacket::bspline(half_width, 1)
    }

    /// The B-spline of the given order with equal steps on `|x| <= half_width`: the `order`-fold convolution of a
    /// constant with itself.
    ///
    /// With `n` steps of length `h` it is, up to a factor, `sum_l (-1)^l C(n, l) (x/h + n/2 - l)_+^(n-1)`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not positive or the order is not in `1..=MAX_ORDER`.
    pub fn bspline(half_width: &Rational, order: u32) -> Result<PiecewisePacket, Error> {
        positive("half-width", half_width)?;
        if order == 0 || order > MAX_ORDER {
            return Err(Error::bad_input("order", order, &format!("give an order from 1 to {MAX_ORDER}")));
        }
        let step = Rational::from(half_width * 2) / order;
        let degree = order - 1;
        let knots = (0..=order).map(|i| Rational::from(&step * i) - half_width).collect();
        let inverse = Rational::from(step.recip_ref());
        let piece = |index: u32| -> Vec<Rational> {
            let mut scale = Rational::from(1);
            let mut list = Vec::new();
            for power in 0..=degree {
                // Coefficient of z^power in sum_l (-1)^l C(n, l) (z/h + index - l)^degree.
                let mut sum = Integer::new();
                for l in 0..=index {
                    let shifted = Integer::u_pow_u(index - l, degree - power);
                    let term = Integer::from(order).binomial(l) * Integer::from(shifted);
                    if l % 2 == 0 { sum += term } else { sum -= term }
                }
                list.push(Rational::from(sum * Integer::from(degree).binomial(power)) * &scale);
                scale *= &inverse;
            }
            list
        };
        PiecewisePacket::real(knots, (0..order).map(piece).collect())
    }

    /// Uniform in the ball of this radius in three dimensions, zero outside.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the radius is not positive.
    pub fn uniform_ball(radius: &Rational) -> Result<PiecewisePacket, Error> {
        positive("radius", radius)?;
        let one = vec![ExactComplex::from(Rational::from(1))];
        PiecewisePacket::radial(vec![Rational::new(), radius.clone()], vec![one])
    }

    /// A spherically symmetric packet in three dimensions: `psi(r) = sum_n pieces[i][n] (r - radii[i])^n` between
    /// `radii[i]` and `radii[i+1]`, zero beyond the last radius. It is kept as the odd packet `x psi(|x|)` on the
    /// line.
    ///
    /// # Errors
    /// As [`PiecewisePacket::complex`]; the first radius must be 0.
    pub fn radial(radii: Vec<Rational>, pieces: Vec<Vec<ExactComplex>>) -> Result<PiecewisePacket, Error> {
        match radii.first() {
            Some(first) if *first == 0 => {}
            other => {
                let was = other.map_or_else(|| "no radii".to_owned(), Rational::to_string);
                return Err(Error::bad_input("radii", was, "give radii that begin at 0"));
            }
        }
        if pieces.len() + 1 != radii.len() {
            let wanted = format!("give one piece for each of the {} shells", radii.len() - 1);
            return Err(Error::bad_input("pieces", format!("{} pieces", pieces.len()), &wanted));
        }
        let outward: Vec<Vec<ExactComplex>> =
            pieces.iter().zip(&radii).map(|(piece, left)| times_distance(piece, left)).collect();
        let inward = outward.iter().zip(radii.windows(2)).rev().map(|(piece, ends)| {
            // u(-x) = -u(x): about the left knot -ends[1], x = -ends[1] + z, u = -outward(ends[1] - z).
            let length = Rational::from(&ends[1] - &ends[0]);
            let about_right = expanded_about(piece, &length);
            let sign = |n: usize| Rational::from(if n.is_multiple_of(2) { -1 } else { 1 });
            about_right.iter().enumerate().map(|(n, c)| c.times(&sign(n))).collect::<Vec<ExactComplex>>()
        });
        let all_pieces: Vec<Vec<ExactComplex>> = inward.chain(outward.iter().cloned()).collect();
        let negative = radii.iter().skip(1).rev().map(|r| Rational::from(-r));
        let all_knots: Vec<Rational> = negative.chain(radii.iter().cloned()).collect();
        PiecewisePacket::complex(all_knots, all_pieces)
    }

    /// The eigenstate number `mode >= 1` of the interval `|x| <= half_width` with hard walls:
    /// `cos(b x)` for odd and `sin(b x)` for even modes, `b = mode pi/(2 half_width)`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width is not positive or the mode is not in `1..=MAX_MODE`.
    pub fn cosine(half_width: &Rational, mode: u32) -> Result<PiecewisePacket, Error> {
        if mode == 0 || mode > MAX_MODE {
            return Err(Error::bad_input("mode", mode, &format!("give a mode number from 1 to {MAX_MODE}")));
        }
        let mut packet = PiecewisePacket::uniform(half_width)?;
        // The mean of the squared cosine or sine over whole half-waves is one half.
        packet.norm /= 2;
        packet.carrier = Carrier::Standing(mode);
        Ok(packet)
    }

    /// The packet times `exp(i k x)`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if there is a carrier already.
    pub fn with_momentum(mut self, momentum: &Rational) -> Result<PiecewisePacket, Error> {
        if self.carrier != Carrier::Still {
            let wanted = "only a packet without a carrier wave can be given a momentum";
            return Err(Error::bad_input("momentum", momentum, wanted));
        }
        if *momentum != 0 {
            self.carrier = Carrier::Travelling(momentum.clone());
        }
        Ok(self)
    }

    /// The knots, increasing.
    pub fn knots(&self) -> &[Rational] {
        &self.knots
    }

    /// The pieces: `pieces()[i][n]` multiplies `(x - knots()[i])^n`.
    pub fn pieces(&self) -> &[Vec<ExactComplex>] {
        &self.pieces
    }

    /// The factor in front of the polynomials.
    pub fn carrier(&self) -> &Carrier {
        &self.carrier
    }

    /// `Int |psi0|^2 dx` of the packet as given, exact and positive.
    pub fn norm_squared(&self) -> &Rational {
        &self.norm
    }

    /// Half of the length of the support.
    pub fn half_width(&self) -> Rational {
        match (self.knots.first(), self.knots.last()) {
            (Some(first), Some(last)) => Rational::from(last - first) / 2,
            _ => Rational::new(),
        }
    }

    /// Middle of the support.
    pub fn centre(&self) -> Rational {
        match (self.knots.first(), self.knots.last()) {
            (Some(first), Some(last)) => Rational::from(last + first) / 2,
            _ => Rational::new(),
        }
    }
}

fn positive(field: &str, value: &Rational) -> Result<(), Error> {
    if *value > 0 {
        return Ok(());
    }
    Err(Error::bad_input(field, value, &format!("give a {field} greater than 0, such as 1, 0.5 or 1/3")))
}

/// Without zeros at the ends of the polynomials and zero pieces at the ends of the packet.
fn trimmed(knots: Vec<Rational>, pieces: Vec<Vec<ExactComplex>>) -> (Vec<Rational>, Vec<Vec<ExactComplex>>) {
    let short = |mut piece: Vec<ExactComplex>| {
        while piece.last().is_some_and(ExactComplex::is_zero) {
            piece.pop();
        }
        piece
    };
    let pieces: Vec<Vec<ExactComplex>> = pieces.into_iter().map(short).collect();
    let first = pieces.iter().position(|piece| !piece.is_empty());
    let last = pieces.iter().rposition(|piece| !piece.is_empty());
    match (first, last) {
        (Some(first), Some(last)) => (knots[first..=last + 1].to_vec(), pieces[first..=last].to_vec()),
        _ => (Vec::new(), Vec::new()),
    }
}

/// Coefficients of the polynomial in `x` as one in `x - shift`.
pub(crate) fn expanded_about(piece: &[ExactComplex], shift: &Rational) -> Vec<ExactComplex> {
    let mut list = piece.to_vec();
    for start in 0..list.len() {
        for n in (start..list.len().saturating_sub(1)).rev() {
            list[n] = list[n].plus(&list[n + 1].times(shift));
        }
    }
    list
}

/// `(left + z) p(z)`.
fn times_distance(piece: &[ExactComplex], left: &Rational) -> Vec<ExactComplex> {
    let mut list = vec![ExactComplex::default(); piece.len() + 1];
    for (n, value) in piece.iter().enumerate() {
        list[n] = list[n].plus(&value.times(left));
        list[n + 1] = list[n + 1].plus(value);
    }
    list
}

/// `sum over pieces of Int_0^length |p(z)|^2 dz`.
fn norm_squared(knots: &[Rational], pieces: &[Vec<ExactComplex>]) -> Rational {
    let mut total = Rational::new();
    for (piece, ends) in pieces.iter().zip(knots.windows(2)) {
        let length = Rational::from(&ends[1] - &ends[0]);
        let mut power = length.clone();
        for sum in 0..(2 * piece.len()).saturating_sub(1) {
            let mut coefficient = Rational::new();
            for i in sum.saturating_sub(piece.len() - 1)..=sum.min(piece.len() - 1) {
                let (x, y) = (&piece[i], &piece[sum - i]);
                coefficient += Rational::from(&x.re * &y.re) + Rational::from(&x.im * &y.im);
            }
            total += coefficient * &power / (sum as u64 + 1);
            power *= &length;
        }
    }
    total
}

#[cfg(test)]
mod tests {
    use super::*;

    fn q(n: i64, d: i64) -> Rational {
        Rational::from((n, d))
    }

    #[test]
    fn bspline_pieces_and_norms() {
        // Int of the squared triangle of height 1 and half-width 1 is 2/3.
        let triangle = PiecewisePacket::bspline(&q(1, 1), 2).unwrap();
        assert_eq!(*triangle.norm_squared(), q(2, 3));
        // Cardinal cubic spline times 6: squared norm 36 * 151/315 (de Boor's recurrence at the centre of order 8).
        let cubic = PiecewisePacket::bspline(&q(2, 1), 4).unwrap();
        assert_eq!(*cubic.norm_squared(), q(36 * 151, 315));
        // Continuity up to the second derivative at an inner knot.
        let about_right = expanded_about(&cubic.pieces()[0], &q(1, 1));
        assert_eq!(about_right[..3], cubic.pieces()[1][..3]);
    }

    #[test]
    fn balls_are_odd_packets() {
        let ball = PiecewisePacket::uniform_ball(&q(2, 1)).unwrap();
        // Int x^2 over |x| <= 2.
        assert_eq!(*ball.norm_squared(), q(16, 3));
        assert_eq!(ball.half_width(), 2);
        assert_eq!(ball.pieces()[0], vec![ExactComplex::from(q(-2, 1)), ExactComplex::from(q(1, 1))]);
    }

    #[test]
    fn bad_packets_are_refused() {
        let one = || vec![vec![q(1, 1)]];
        assert!(PiecewisePacket::real(vec![q(1, 1), q(0, 1)], one()).is_err());
        assert!(PiecewisePacket::real(vec![q(0, 1)], vec![]).is_err());
        assert!(PiecewisePacket::real(vec![q(0, 1), q(1, 1), q(2, 1)], one()).is_err());
        assert!(PiecewisePacket::real(vec![q(0, 1), q(1, 1)], vec![vec![q(0, 1)]]).is_err());
        assert!(PiecewisePacket::bspline(&q(0, 1), 2).is_err());
        assert!(PiecewisePacket::bspline(&q(1, 1), 0).is_err());
        assert!(PiecewisePacket::cosine(&q(1, 1), 0).is_err());
        assert!(PiecewisePacket::radial(vec![q(1, 1), q(2, 1)], vec![vec![]]).is_err());
        let moving = PiecewisePacket::cosine(&q(1, 1), 1).unwrap().with_momentum(&q(1, 1));
        assert!(moving.is_err());
    }
}
