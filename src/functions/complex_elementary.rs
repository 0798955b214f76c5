//! Exponential, logarithm, argument and square root of rectangular complex balls.
//!
//! Principal branches throughout, cut along the negative real axis: `-pi < arg z <= pi`,
//! `ln z = ln |z| + i arg z`, `sqrt z = e^{(ln z)/2}` (DLMF 4.2(i), 4.2(ii), 4.2(iv)).
//!
//! * `exp(x + iy) = e^x (cos y + i sin y)` on balls (DLMF 4.14.1 with 4.2.19).
//! * `arg`: at the midpoint MPFR's `atan2` is correctly rounded. If no point of the ball is on the
//!   cut or zero, the segment from the midpoint `m` to a point `z` of the ball (which is convex)
//!   does not meet the cut either, and along it `arg` changes by at most
//!   `integral |dz|/|z| <= R/(|m| - R)`, where `R` bounds the distance of the points from `m`.
//! * `sqrt(x + iy) = s + i y/(2s)` with `s = sqrt((|z| + x)/2)` for `x >= 0`, and
//!   `|y|/(2t) + i sign(y) t` with `t = sqrt((|z| - x)/2)` for `x < 0`: squaring either gives
//!   `x + iy` as `|z|^2 - x^2 = y^2`, and the real part is not negative. Both hold on either side,
//!   so the midpoint may choose the one that does not cancel.
//!
//! A ball that may meet the cut (or zero) gives the whole plane, except for exact numbers.

use super::elementary;
use crate::arithmetic::{Bits, Complex, Magnitude, Real, rounding};

/// The whole plane: nothing known.
pub fn whole_plane() -> Complex {
    Complex::new(Real::whole_line(), Real::whole_line())
}

/// `e^z`.
pub fn exp(z: &Complex, bits: Bits) -> Complex {
    let size = elementary::exp(&z.re, bits + 4);
    let (cosine, sine) = (elementary::cos(&z.im, bits + 4), elementary::sin(&z.im, bits + 4));
    Complex::new(size.mul(&cosine, bits), size.mul(&sine, bits))
}

/// The principal argument, in `(-pi, pi]`.
///
/// The whole line if the ball may meet the negative real axis or zero without being exact, or is
/// exactly zero.
pub fn arg(z: &Complex, bits: Bits) -> Real {
    let (x, y) = (z.re.midpoint(), z.im.midpoint());
    let radius = z.re.radius().add(z.im.radius());
    if radius.is_zero() {
        if x.is_zero() && y.is_zero() {
            return Real::whole_line();
        }
        // A negative zero would select the other side of the cut.
        let positive_zero = rug::Float::new(rounding::MIN_BITS);
        let y = if y.is_zero() { &positive_zero } else { y };
        let (angle, error) = rounding::nearest(bits, y.atan2_ref(x));
        return Real::new(angle, error);
    }
    if !z.is_bounded() || may_meet_cut(z) {
        return Real::whole_line();
    }
    let (angle, error) = rounding::nearest(bits, y.atan2_ref(x));
    let size = Magnitude::from_float_down(x).max(Magnitude::from_float_down(y));
    let change = radius.div(size.sub_down(radius));
    Real::new(angle, error.add(change))
}

/// Principal logarithm; the whole plane if the ball may meet the cut or zero without being exact.
pub fn ln(z: &Complex, bits: Bits) -> Complex {
    let angle = arg(z, bits);
    if !angle.is_bounded() {
        return whole_plane();
    }
    let size = elementary::ln(&z.norm_squared(bits + 8), bits + 4).shift(-1);
    Complex::new(size.round(bits), angle)
}

/// Principal square root; the whole plane if the ball may meet the cut or zero without being
/// exact. The root of exactly zero is zero.
pub fn sqrt(z: &Complex, bits: Bits) -> Complex {
    let short = bits + 8;
    let exact = z.re.is_exact() && z.im.is_exact();
    if exact && z.im.midpoint().is_zero() {
        let root = elementary::sqrt(&z.re.abs(), bits);
        let negative = z.re.midpoint().is_sign_negative();
        return if negative { Complex::new(Real::zero(), root) } else { Complex::from_real(root) };
    }
    if !z.is_bounded() || (!exact && may_meet_cut(z)) {
        return whole_plane();
    }
    let size = elementary::sqrt(&z.norm_squared(short), short);
    let large = elementary::sqrt(&size.add(&z.re.abs(), short).shift(-1), short);
    let small = z.im.div(&large.shift(1), short);
    if z.re.midpoint().is_sign_positive() {
        return Complex::new(large.round(bits), small.round(bits));
    }
    // Off the cut with a midpoint on the left, the sign of y is the same on the whole ball.
    if z.im.midpoint().is_sign_negative() {
        Complex::new(small.neg().round(bits), large.neg().round(bits))
    } else {
        Complex::new(small.round(bits), large.round(bits))
    }
}

/// Whether the ball may contain zero or a negative real number.
fn may_meet_cut(z: &Complex) -> bool {
    !(z.re.certainly_positive() || z.im.certainly_positive() || z.im.certainly_negative())
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Float;

    fn ball(x: f64, y: f64, radius: f64) -> Complex {
        let radius = Magnitude::from_float(&Float::with_val(53, radius));
        let part = |value: f64| Real::new(Float::with_val(53, value), radius);
        Complex::new(part(x), part(y))
    }

    fn overlap(left: &Complex, right: &Complex) -> bool {
        left.re.overlaps(&right.re) && left.im.overlaps(&right.im)
    }

    proptest::proptest! {
        #[test]
        fn inverse_functions_agree(x in -20.0f64..20.0, y in -20.0f64..20.0, bits in 40u32..300) {
            let z = ball(x, y, 0.0);
            let root = sqrt(&z, bits);
            proptest::prop_assert!(overlap(&root.square(bits), &z));
            proptest::prop_assert!(!root.re.certainly_negative());
            proptest::prop_assert!(overlap(&exp(&ln(&z, bits), bits), &z));
            let half = ln(&z, bits).shift(-1);
            proptest::prop_assert!(overlap(&exp(&half, bits), &root));
            let accurate = |value: &Complex| {
                let radius = value.re.radius().max(value.im.radius()).log2_estimate();
                value.abs_upper().log2_estimate() - radius >= f64::from(bits) - 8.0
            };
            proptest::prop_assert!(accurate(&root) && accurate(&exp(&z, bits)));
        }

        #[test]
        fn balls_contain_their_points(
            x in -5.0f64..5.0, y in -5.0f64..5.0, scale in 0i32..50, right in -1.0f64..1.0, up in -1.0f64..1.0
        ) {
            let radius = 2f64.powi(-scale);
            let wide = ball(x, y, radius);
            // Exact in 200 bits: the radius is a power of two.
            let offset = |at: f64| Float::with_val(200, at) * radius;
            let point = Complex::new(Real::from_float(offset(right) + x), Real::from_float(offset(up) + y));
            proptest::prop_assert!(overlap(&exp(&wide, 80), &exp(&point, 300)));
            if ln(&wide, 80).is_bounded() {
                proptest::prop_assert!(overlap(&ln(&wide, 80), &ln(&point, 300)));
                proptest::prop_assert!(overlap(&sqrt(&wide, 80), &sqrt(&point, 300)));
            }
        }
    }

    #[test]
    fn branches_are_principal() {
        let minus_one = Complex::new(Real::from_i64(-1), Real::zero().neg());
        let root = sqrt(&minus_one, 64);
        assert!(root.im.certainly_positive() && root.re.midpoint().is_zero());
        assert!(arg(&minus_one, 64).overlaps(&elementary::pi(64)));
        assert!(!ln(&ball(-1.0, 0.0, 0.1), 64).is_bounded());
        assert!(!sqrt(&ball(0.0, 0.0, 0.1), 64).is_bounded());
        assert!(!arg(&Complex::zero(), 64).is_bounded());
        assert!(sqrt(&Complex::zero(), 64).re.midpoint().is_zero());
        assert!(sqrt(&ball(-4.0, -0.5, 0.1), 64).im.certainly_negative());
    }
}
