//! Modified Bessel functions of the second kind, `K_nu` for integer `nu`.
//!
//! For `x > 0`, `K_nu(x) = integral_0^inf e^{-x cosh u} cosh(nu u) du` (DLMF 10.32.9): positive,
//! decreasing in `x`, increasing in `nu`. The *scaled* functions `e^x K_nu(x)` are positive and
//! decreasing too (replace `cosh u` by `cosh u - 1`) and neither underflow nor lose accuracy
//! however large `x` is.
//!
//! # Methods
//!
//! | module | arguments | error bound |
//! |---|---|---|
//! | [`short_series`] | up to 32, up to some 500 bits: the fastest there | geometric tail |
//! | [`series`], [`complex_series`] | best for `2 abs(x) < bits ln 2` | geometric tail |
//! | [`asymptotic`], [`complex_asymptotic`] | `2 abs(x) > bits ln 2` | the first term left out |
//! | [`trapezoid`] | right half-plane, for comparison | integral along the edge of a strip |
//!
//! Doubles choose the method; each one proves its own error bound, so that a wrong choice would
//! only be slow or wide. The series run in fixed point with all roundings counted ([`factor`],
//! [`complex_fixed`], [`limbs`]). Orders above one come from `K_{n+1} = K_{n-1} + (2n/x) K_n`
//! (DLMF 10.29.1), for `x > 0` a sum of positive numbers. How balls are treated is described in
//! [`positive`] and [`complex`].

pub mod argument;
pub mod asymptotic;
pub mod coefficients;
pub mod complex;
pub mod complex_asymptotic;
pub mod complex_fixed;
pub mod complex_series;
pub mod factor;
pub mod limbs;
pub mod positive;
pub mod series;
pub mod short_logarithm;
pub mod short_series;
pub mod trapezoid;

pub use complex::{k_complex, k_complex_by};

use crate::arithmetic::{Bits, Real};
use argument::Argument;
use positive::{Request, Scaling, SecondValue};
use rug::Rational;

/// Additional bits of intermediate results.
const GUARD_BITS: Bits = 12;
/// Fewer bits than this are taken as so many; more than the largest as that.
const FEWEST_BITS: Bits = 8;
const MOST_BITS: Bits = 1 << 26;

/// A way to evaluate `K_nu`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Method {
    /// Power series in a few machine words, for real arguments below 32 and at most some 500 bits.
    ShortSeries,
    /// Power series.
    Series,
    /// Series for large arguments, of absolute value at least one.
    Asymptotic,
    /// Trapezoid rule for an integral, in the open right half-plane and for orders up to two.
    Trapezoid,
}

impl Method {
    /// The faster of the two series for an argument of this size.
    fn for_size(size: f64, bits: Bits) -> Method {
        // The smallest term of the series for large arguments is about e^{-2 size}.
        let large = 2.0 * std::f64::consts::LOG2_E * size >= f64::from(bits) + 6.0;
        if large { Method::Asymptotic } else { Method::Series }
    }
}

/// `(K_0(x), K_1(x))` for `x > 0`, with a relative accuracy of about `2^-bits` at exact arguments.
///
/// A ball that may contain zero or negative numbers gives the whole line twice.
pub fn k0_k1(x: &Real, bits: Bits) -> (Real, Real) {
    positive::pair_on_ball(x, Request::new(bits, Scaling::Plain))
}

/// `(e^x K_0(x), e^x K_1(x))`, otherwise as [`k0_k1`].
pub fn k0_k1_scaled(x: &Real, bits: Bits) -> (Real, Real) {
    positive::pair_on_ball(x, Request::new(bits, Scaling::Scaled))
}

/// `(K_0(r), K_1(r)/r)` for `r` the positive root of `square`, which are functions of `r^2` and
/// `ln(r^2)`: no root is taken unless `r` is large. Relative accuracy about `2^-bits`.
///
/// A square that is not positive gives the whole line twice.
///
/// ```
/// use coneproof::functions::bessel_k;
/// let (k0, k1_over_r) = bessel_k::k0_k1_of_square(&rug::Rational::from((1, 4)), 60);
/// // mpmath 1.4.1, besselk(0, 0.5) and besselk(1, 0.5)/0.5.
/// assert!((k0.to_f64() - 0.924_419_071_227_665_9).abs() < 1e-15);
/// assert!((k1_over_r.to_f64() - 3.312_882_240_006_601_8).abs() < 1e-15);
/// ```
pub fn k0_k1_of_square(square: &Rational, bits: Bits) -> (Real, Real) {
    of_square(square, Request::new(bits, Scaling::Plain))
}

/// `(e^r K_0(r), e^r K_1(r)/r)`, otherwise as [`k0_k1_of_square`].
pub fn k0_k1_of_square_scaled(square: &Rational, bits: Bits) -> (Real, Real) {
    of_square(square, Request::new(bits, Scaling::Scaled))
}

fn of_square(square: &Rational, request: Request) -> (Real, Real) {
    if *square <= 0 {
        return (Real::whole_line(), Real::whole_line());
    }
    positive::exact_pair(&Argument::RootOf(square), request, SecondValue::QuotientByArgument)
}

/// `K_order(x)` for `x > 0`, with a relative accuracy of about `2^-bits` at exact arguments.
///
/// The work grows with the order. A ball that may contain zero or negative numbers gives the
/// whole line.
///
/// ```
/// use coneproof::arithmetic::Real;
/// use coneproof::functions::bessel_k;
/// let value = bessel_k::k(0, &Real::from_i64(1), 60);
/// // mpmath 1.4.1, besselk(0, 1).
/// assert!((value.to_f64() - 0.421_024_438_240_708_3).abs() < 1e-15);
/// ```
pub fn k(order: u32, x: &Real, bits: Bits) -> Real {
    positive::order_on_ball(order, x, Request::new(bits, Scaling::Plain))
}

/// `e^x K_order(x)`, otherwise as [`k`].
pub fn k_scaled(order: u32, x: &Real, bits: Bits) -> Real {
    positive::order_on_ball(order, x, Request::new(bits, Scaling::Scaled))
}

/// `K_order(x)` by the method named, for comparing one with another; otherwise as [`k`].
///
/// Outside the domain of the method the result is the whole line; where the method converges
/// badly the result is wide or slow to get.
pub fn k_by(method: Method, order: u32, x: &Real, bits: Bits) -> Real {
    positive::order_on_ball(order, x, Request { method: Some(method), ..Request::new(bits, Scaling::Plain) })
}
