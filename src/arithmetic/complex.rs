//! Rectangular complex balls: a real ball for each part.
//!
//! Sums act on the parts. The product is `(ac - bd) + i(ad + bc)` on balls, so inclusion follows
//! from that of [`Real`]. The quotient multiplies by the conjugate over `|z|^2`.

use super::{Bits, Magnitude, Real};

/// The set of all `x + iy` with `x` and `y` in two real balls.
#[derive(Clone, Debug)]
pub struct Complex {
    /// Real part.
    pub re: Real,
    /// Imaginary part.
    pub im: Real,
}

impl Complex {
    /// From the two parts.
    pub fn new(re: Real, im: Real) -> Complex {
        Complex { re, im }
    }

    /// A real ball as a complex one.
    pub fn from_real(re: Real) -> Complex {
        Complex { re, im: Real::zero() }
    }

    /// Exactly zero.
    pub fn zero() -> Complex {
        Complex::from_real(Real::zero())
    }

    /// Sum.
    pub fn add(&self, other: &Complex, bits: Bits) -> Complex {
        Complex::new(self.re.add(&other.re, bits), self.im.add(&other.im, bits))
    }

    /// Difference.
    pub fn sub(&self, other: &Complex, bits: Bits) -> Complex {
        Complex::new(self.re.sub(&other.re, bits), self.im.sub(&other.im, bits))
    }

    /// Minus the number.
    pub fn neg(&self) -> Complex {
        Complex::new(self.re.neg(), self.im.neg())
    }

    /// Complex conjugate.
    pub fn conj(&self) -> Complex {
        Complex::new(self.re.clone(), self.im.neg())
    }

    /// Product.
    pub fn mul(&self, other: &Complex, bits: Bits) -> Complex {
        let re = self.re.mul(&other.re, bits).sub(&self.im.mul(&other.im, bits), bits);
        let im = self.re.mul(&other.im, bits).add(&self.im.mul(&other.re, bits), bits);
        Complex::new(re, im)
    }

    /// Product with a real ball.
    pub fn mul_real(&self, factor: &Real, bits: Bits) -> Complex {
        Complex::new(self.re.mul(factor, bits), self.im.mul(factor, bits))
    }

    /// Square.
    pub fn square(&self, bits: Bits) -> Complex {
        let re = self.re.square(bits).sub(&self.im.square(bits), bits);
        Complex::new(re, self.re.mul(&self.im, bits).shift(1))
    }

    /// Quotient; unbounded if the divisor may be zero.
    pub fn div(&self, other: &Complex, bits: Bits) -> Complex {
        let size = other.re.square(bits).add(&other.im.square(bits), bits);
        let product = self.mul(&other.conj(), bits);
        Complex::new(product.re.div(&size, bits), product.im.div(&size, bits))
    }

    /// Upper bound of the absolute value.
    pub fn abs_upper(&self) -> Magnitude {
        let (x, y) = (self.re.abs_upper(), self.im.abs_upper());
        x.mul(x).add(y.mul(y)).sqrt()
    }

    /// Lower bound of the absolute value: the larger of the two parts.
    pub fn abs_lower(&self) -> Magnitude {
        self.re.abs_lower().max(self.im.abs_lower())
    }

    /// `|z|^2` as a ball.
    pub fn norm_squared(&self, bits: Bits) -> Real {
        self.re.square(bits).add(&self.im.square(bits), bits)
    }

    /// Exact product with `2^shift`.
    pub fn shift(&self, shift: i64) -> Complex {
        Complex::new(self.re.shift(shift), self.im.shift(shift))
    }

    /// Wider in both directions by `extra`: contains the disc of that radius around every point.
    pub fn widen(self, extra: Magnitude) -> Complex {
        Complex::new(self.re.widen(extra), self.im.widen(extra))
    }

    /// Whether something is known about both parts.
    pub fn is_bounded(&self) -> bool {
        self.re.is_bounded() && self.im.is_bounded()
    }
}
