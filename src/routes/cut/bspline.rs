//! The amplitude of the B-spline at rest.
//!
//! For `p` convolutions of the indicator function of an interval of length `l = 2a/p`, `F(z) = N ((1 - exp(-z l))/z)^p` (the
//! transform of a convolution is a product), with `1/N^2 = l^(2p-1) n_p`, `n_p` the rational norm for steps of one.
//!
//! **Variation.** The spline rises to its maximum, at most `l^(p-1)`, and falls: `V <= 2 N l^(p-1)`.
//! **Tail.** `kappa |F| <= N kappa^(1-p)`, which does not grow with `kappa`; nor is it above the variation.

use super::amplitude::{CutAmplitude, PreparedAmplitude};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::{exp_m1, sqrt};
use crate::packets::BSplinePacket;
use crate::routes::RouteFailure;
use crate::routes::spectral::exp_minus_upper;
use rug::Rational;
use rug::ops::Pow;

impl CutAmplitude for BSplinePacket {
    fn half_width(&self) -> Rational {
        BSplinePacket::half_width(self).clone()
    }

    fn scaled(&self, factor: &Rational) -> Box<dyn CutAmplitude> {
        Box::new(BSplinePacket::scaled(self, factor))
    }

    fn mirrored(&self) -> Box<dyn CutAmplitude> {
        Box::new(self.clone())
    }

    fn is_symmetric(&self) -> bool {
        true
    }

    fn is_real(&self) -> bool {
        true
    }

    fn prepare(&self, bits: Bits) -> Result<Box<dyn PreparedAmplitude>, RouteFailure> {
        let step = self.step();
        let norm = self.unit_norm() * Rational::from((&step).pow(2 * self.order() - 1));
        let factor = sqrt(&Real::from_rational(&Rational::from(norm.recip_ref()), bits), bits);
        let step = Real::from_rational(&step, bits);
        Ok(Box::new(PreparedSpline { bits, order: self.order(), factor, step }))
    }
}

struct PreparedSpline {
    bits: Bits,
    order: u32,
    /// `N`
    factor: Real,
    /// `l`
    step: Real,
}

impl PreparedAmplitude for PreparedSpline {
    fn value(&self, kappa: &Real) -> Complex {
        let exponent = self.step.mul(kappa, self.bits);
        let small = exp_minus_upper(&exponent);
        let rise = if small.cmp_value(Magnitude::power_of_two(-i64::from(self.bits) - 64)).is_lt() {
            Real::from_i64(1).widen(small)
        } else {
            exp_m1(&exponent.neg(), self.bits).neg()
        };
        let base = rise.div(kappa, self.bits);
        let mut value = self.factor.clone();
        for _ in 0..self.order {
            value = value.mul(&base, self.bits);
        }
        Complex::from_real(value)
    }

    fn variation(&self) -> Magnitude {
        self.step.abs_upper().pow(u64::from(self.order) - 1).mul(self.factor.abs_upper()).shift(1)
    }

    fn tail(&self, kappa: &Real) -> Magnitude {
        let power = Magnitude::ONE.div(kappa.abs_lower()).pow(u64::from(self.order) - 1);
        power.mul(self.factor.abs_upper()).min(self.variation())
    }
}
