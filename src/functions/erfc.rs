//! The complementary error function of a real ball.
//!
//! `erfc(x) = (2/sqrt pi) Int_x^inf exp(-u^2) du` (DLMF 7.2.2) decreases, so its values on a ball lie between those at
//! the two ends. MPFR rounds `erfc` correctly in any direction at an exact argument (MPFR manual, "Special Functions"),
//! as it does for the elementary functions.

use crate::arithmetic::{Bits, Interval, Real, rounding};

/// `erfc(x)`; `[0, 2]` if nothing is known about `x`.
pub fn erfc(x: &Real, bits: Bits) -> Real {
    if !x.is_bounded() {
        let ends = Interval::new(rounding::down(bits, 0), rounding::up(bits, 2));
        return Real::from_interval(&ends, bits);
    }
    let ends = x.to_interval(bits.max(x.midpoint().prec()) + 32);
    let lower = rounding::down(bits + 8, ends.upper().erfc_ref());
    let upper = rounding::up(bits + 8, ends.lower().erfc_ref());
    Real::from_interval(&Interval::new(lower, upper), bits)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::arithmetic::Magnitude;
    use crate::functions::elementary::{exp, pi, sqrt};
    use rug::{Float, Rational};

    /// The bounds of DLMF 7.8.2, `1/(x + sqrt(x^2 + 2)) < sqrt(pi)/2 e^(x^2) erfc(x) <= 1/(x + sqrt(x^2 + 4/pi))`.
    #[test]
    fn lies_between_the_handbook_bounds() {
        let bits = 200;
        for n in 1..400 {
            let x = Real::from_rational(&Rational::from((n, 7)), bits);
            let square = x.square(bits);
            let scaled = erfc(&x, bits).mul(&exp(&square, bits), bits).mul(&sqrt(&pi(bits), bits), bits).shift(-1);
            let one = Real::from_i64(1);
            let bound = |extra: &Real| one.div(&x.add(&sqrt(&square.add(extra, bits), bits), bits), bits);
            assert!(bound(&Real::from_i64(2)).certainly_less(&scaled), "{n}");
            assert!(scaled.certainly_less(&bound(&Real::from_i64(4).div(&pi(bits), bits))), "{n}");
        }
    }

    proptest::proptest! {
        #[test]
        fn contains_its_points(x in -6.0f64..30.0, scale in 0i32..60, at in -1.0f64..1.0, bits in 40u32..200) {
            let radius = 2f64.powi(-scale);
            let ball = Real::new(Float::with_val(53, x), Magnitude::power_of_two(-i64::from(scale)));
            let point = Float::with_val(200, at) * radius + x;
            let value = Float::with_val(600, point.erfc_ref()).to_rational().unwrap();
            let image = erfc(&ball, bits).widen(Magnitude::power_of_two(-2000));
            proptest::prop_assert!(image.contains_rational(&value));
            // erfc(-x) = 2 - erfc(x), DLMF 7.4.2.
            let mirrored = Real::from_i64(2).sub(&erfc(&ball.neg(), bits), bits);
            proptest::prop_assert!(mirrored.overlaps(&erfc(&ball, bits)));
        }
    }
}
