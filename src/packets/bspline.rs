//! The B-spline at rest with equal steps, whose amplitude on the branch cut is a power.

use super::waves::WavePacket;
use super::waves::families::{check_order, positive};
use crate::error::Error;
use rug::{Integer, Rational};

/// `psi0` proportional to the B-spline of order `p` on `|x| <= a`: the `p`-fold convolution of a constant on an interval
/// of length `2a/p`. Order 1 is the box, 2 the triangle; `p - 2` derivatives are continuous.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BSplinePacket {
    half_width: Rational,
    order: u32,
}

impl BSplinePacket {
    /// The packet's name on the command line and in certificates.
    pub const NAME: &'static str = "bspline";

    /// A B-spline of half-width `a > 0` and order `1..=32`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the half-width or the order is not in its range.
    pub fn new(half_width: &Rational, order: u32) -> Result<BSplinePacket, Error> {
        positive("half-width", half_width)?;
        check_order(order)?;
        Ok(BSplinePacket { half_width: half_width.clone(), order })
    }

    /// Half of the length of the support.
    pub fn half_width(&self) -> &Rational {
        &self.half_width
    }

    /// The order.
    pub fn order(&self) -> u32 {
        self.order
    }

    /// The length of one step.
    pub fn step(&self) -> Rational {
        Rational::from(&self.half_width * 2) / self.order
    }

    /// `psi0(x / factor)`, for `factor > 0`.
    pub fn scaled(&self, factor: &Rational) -> BSplinePacket {
        BSplinePacket { half_width: Rational::from(&self.half_width * factor), order: self.order }
    }

    /// `Int B^2 dx` for steps of length one, `Sum_{j<p} (-1)^j C(2p, j) (p - j)^(2p-1) / (2p-1)!`: the value of the
    /// spline of order `2p` in its middle, as `B` is even.
    pub fn unit_norm(&self) -> Rational {
        let (p, degree) = (self.order, 2 * self.order - 1);
        let mut total = Integer::new();
        for j in 0..p {
            let term = Integer::from(2 * p).binomial(j) * Integer::from(Integer::u_pow_u(p - j, degree));
            if j % 2 == 0 { total += term } else { total -= term }
        }
        Rational::from(total) / Rational::from(Integer::from(Integer::factorial(degree)))
    }

    /// The same packet piece by piece.
    ///
    /// # Errors
    /// None for a packet made by [`BSplinePacket::new`].
    pub fn to_waves(&self) -> Result<WavePacket, Error> {
        WavePacket::bspline(&self.half_width, self.order, &Rational::new())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Known norms: 1 for the box, 2/3 for the triangle, 11/20 for order 3, 151/315 for order 4 (values at the middle of
    /// the cardinal splines of even order).
    #[test]
    fn norms() {
        let known = [(1, (1, 1)), (2, (2, 3)), (3, (11, 20)), (4, (151, 315))];
        for (order, value) in known {
            let packet = BSplinePacket::new(&Rational::from(1), order).unwrap();
            assert_eq!(packet.unit_norm(), Rational::from(value));
        }
    }
}
