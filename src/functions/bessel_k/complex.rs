//! `K_nu(z)` for complex arguments in the closed right half-plane without zero.
//!
//! | module | arguments |
//! |---|---|
//! | [`super::complex_series`] | best for `2 abs(z) < bits ln 2` |
//! | [`super::complex_asymptotic`] | `2 abs(z) > bits ln 2` |
//! | [`super::trapezoid`] | `Re z > 0`, not too close to the imaginary axis: for comparison |
//!
//! On the imaginary axis these are Hankel functions: `K_nu(iy) = -(pi i/2) e^{-i nu pi/2}
//! H_nu^{(2)}(y)` for `y > 0` (DLMF 10.27.8). Orders above one come from
//! `K_{n+1} = K_{n-1} + (2n/z) K_n` (DLMF 10.29.1).
//!
//! Errors are relative to `|K_nu(z)|`: a part that is much smaller than the other has fewer
//! accurate bits. `K_nu` has no zeros in the half-plane (DLMF 10.42).
//!
//! # Balls as arguments
//!
//! The convex ball is assumed to lie in `Re z >= 0` without zero. With `R` a bound of the distance
//! from its midpoint, `s` and `x` lower bounds of `|z|` and `Re z` on the ball, the values differ
//! from that at the midpoint by at most `R` times a bound of `|K_nu'|` from DLMF 10.29.2 and
//! 10.29.3,
//!
//! ```text
//! |K_0'| = |K_1| <= B_1,   |K_nu'| = |K_{nu-1} + (nu/z) K_nu| <= B_{nu-1} + (nu/s) B_nu,
//! ```
//!
//! where `B_nu >= |K_nu|` on the ball: from the first one or two terms of the series for large
//! arguments with their remainders ([`super::complex_asymptotic`]),
//!
//! ```text
//! B_0 = sqrt(pi/(2s)) e^{-x},     B_1 = min( B_0 (1 + 3/(8s)),  1/s + s^{1/2} ),
//! B_{n+1} = B_{n-1} + (2n/s) B_n.
//! ```
//!
//! The second bound in `B_1` is used for `s <= 1`; it comes from `(z K_1)' = -z K_0` (DLMF 10.29.4)
//! and `z K_1 -> 1` at zero: along the ray, `|z K_1 - 1| <= integral_0^|z| t (pi/(2t))^{1/2} dt <=
//! |z|^{3/2}`, hence `|K_1| <= 1/|z| + |z|^{1/2}`, which decreases up to `|z| = 4^{1/3}`. For larger
//! `|z|` on the ball the first bound of `B_1` at that point is at most
//! `(pi/2)^{1/2} (1 + 3/8) < 2 <= 1/s + s^{1/2}`.

use super::{FEWEST_BITS, GUARD_BITS, MOST_BITS, Method, complex_asymptotic, complex_series, trapezoid};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::complex_elementary::{self, whole_plane};
use crate::functions::elementary;
use std::cmp::Ordering;

/// `K_order(z)` for `Re z >= 0`, `z != 0`, with an error of about `2^-bits |K|` at exact arguments.
///
/// The work grows with the order. A ball that is not certainly in this domain gives the whole
/// plane.
///
/// ```
/// use coneproof::arithmetic::{Complex, Real};
/// use coneproof::functions::bessel_k;
/// let i = Complex::new(Real::zero(), Real::from_i64(1));
/// let value = bessel_k::k_complex(0, &i, 60);
/// // K_0(i) = -(pi/2) (Y_0(1) + i J_0(1)); mpmath 1.4.1, besselk(0, 1j).
/// assert!((value.re.to_f64() + 0.138_633_715_204_053_99).abs() < 1e-15);
/// assert!((value.im.to_f64() + 1.201_969_715_317_206_5).abs() < 1e-15);
/// ```
pub fn k_complex(order: u32, z: &Complex, bits: Bits) -> Complex {
    if z.im.is_exact() && z.im.midpoint().is_zero() {
        return Complex::from_real(super::k(order, &z.re, bits));
    }
    let size = z.norm_squared(64).to_f64().sqrt();
    k_complex_by(Method::for_size(size, bits.clamp(FEWEST_BITS, MOST_BITS)), order, z, bits)
}

/// `K_order(z)` by the method named, for comparisons; otherwise as [`k_complex`].
///
/// Outside the domain of the method the result is the whole plane; where it converges badly the
/// result is wide. [`Method::Trapezoid`] works for orders up to two, [`Method::ShortSeries`] never.
pub fn k_complex_by(method: Method, order: u32, z: &Complex, bits: Bits) -> Complex {
    let bits = bits.clamp(FEWEST_BITS, MOST_BITS);
    if !is_in_domain(z) {
        return whole_plane();
    }
    let middle = midpoint(z);
    let value = match method {
        Method::ShortSeries => whole_plane(),
        Method::Trapezoid => trapezoid::value(order, &middle, bits),
        Method::Series => upwards(order, complex_series::values(&middle, order_bits(order, bits)), &middle, bits),
        Method::Asymptotic => match complex_asymptotic::scaled_values(&middle, order_bits(order, bits)) {
            Some(scaled) => upwards(order, unscaled(scaled, &middle, bits), &middle, bits),
            None => whole_plane(),
        },
    };
    value.widen(spread(order, z))
}

/// Whether all points have `Re z >= 0` and are not zero.
fn is_in_domain(z: &Complex) -> bool {
    let re_is_zero = z.re.is_exact() && z.re.midpoint().is_zero();
    let off_axis = z.re.certainly_positive();
    let off_zero = off_axis || z.im.certainly_positive() || z.im.certainly_negative();
    z.is_bounded() && off_zero && (off_axis || re_is_zero || z.re.lower(64) >= 0)
}

fn midpoint(z: &Complex) -> Complex {
    Complex::new(Real::from_float(z.re.midpoint().clone()), Real::from_float(z.im.midpoint().clone()))
}

/// Bits for orders zero and one so that the recurrence leaves enough.
fn order_bits(order: u32, bits: Bits) -> Bits {
    bits.saturating_add(4).saturating_add(order.saturating_mul(2)).min(2 * MOST_BITS)
}

/// From scaled to plain values.
fn unscaled(scaled: (Complex, Complex), z: &Complex, bits: Bits) -> (Complex, Complex) {
    let power = complex_elementary::exp(&z.neg(), bits + GUARD_BITS);
    (scaled.0.mul(&power, bits + GUARD_BITS), scaled.1.mul(&power, bits + GUARD_BITS))
}

/// `K_order` from `K_0` and `K_1` by the recurrence.
fn upwards(order: u32, (k0, k1): (Complex, Complex), z: &Complex, bits: Bits) -> Complex {
    let short = order_bits(order, bits) + GUARD_BITS;
    if order == 0 {
        return k0;
    }
    let (mut before, mut current) = (k0, k1);
    let two_over_z = Complex::from_real(Real::from_i64(2)).div(z, short);
    for n in 1..order {
        let step = two_over_z.mul(&current, short).mul_real(&Real::from_i64(i64::from(n)), short);
        let next = before.add(&step, short);
        before = std::mem::replace(&mut current, next);
    }
    current
}

/// How much `K_order` may differ from its value at the midpoint of a ball in the domain.
fn spread(order: u32, z: &Complex) -> Magnitude {
    let radius = z.re.radius().add(z.im.radius());
    if radius.is_zero() {
        return Magnitude::ZERO;
    }
    // A lower bound of |z| over the ball, closer than the larger of the two parts.
    let size = Magnitude::from_float_down(&elementary::sqrt(&midpoint(z).norm_squared(64), 64).lower(64));
    let size = size.sub_down(radius);
    if size.is_zero() {
        return Magnitude::INFINITY;
    }
    let decay = elementary::exp(&Real::from_float(z.re.lower(64)).neg(), 64).abs_upper();
    let inverse = Magnitude::ONE.div(size);
    // pi/2 < 2 - 3/8.
    let half_pi = Magnitude::from_u64(13).shift(-3);
    let b0 = half_pi.mul(inverse).sqrt().mul(decay);
    let mut b1 = b0.mul(Magnitude::ONE.add(Magnitude::from_u64(3).mul(inverse).shift(-3)));
    if size.cmp_value(Magnitude::ONE) != Ordering::Greater {
        b1 = b1.min(inverse.add(size.sqrt()));
    }
    let (mut before, mut current) = (b0, b1);
    for n in 1..order {
        let next = before.add(Magnitude::from_u64(2 * u64::from(n)).mul(inverse).mul(current));
        before = std::mem::replace(&mut current, next);
    }
    let slope = match order {
        0 => b1,
        _ => before.add(Magnitude::from_u64(u64::from(order)).mul(inverse).mul(current)),
    };
    radius.mul(slope)
}
