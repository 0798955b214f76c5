//! Elementary functions of real balls.
//!
//! MPFR rounds `exp`, `log`, `sin`, ... correctly, so at an exact argument the only error is the
//! rounding error bounded in [`crate::arithmetic::rounding`]. For an argument ball `m ± r` the
//! spread of the function is added:
//!
//! | function | bound of `abs(f(x) - f(m))` for `abs(x - m) <= r` | why |
//! |---|---|---|
//! | `exp`, `exp_m1` | `e^m (e^r - 1)`, with `e^r - 1 <= r (1 + r)` for `r <= 1` | `e^x - e^m = e^m (e^(x-m) - 1)`; `(e^r - 1)/r` is below `1 + r` on `(0, 1]` |
//! | `ln` | `r / (m - r)` for `m > r` | mean value theorem, `1/x` decreasing |
//! | `ln_1p` | `r / (1 + m - r)` | the same at `1 + x` |
//! | `sin`, `cos` | `min(r, 2)` | derivative at most one |
//! | `atan`, `tanh`, `asinh` | `r` | derivative at most one |
//! | `sqrt` | `r / sqrt(m)` | `abs(sqrt x - sqrt m) = abs(x - m)/(sqrt x + sqrt m)` |
//!
//! Wide arguments of the increasing functions are evaluated at both ends with directed rounding
//! instead (the macro `increasing`). `sinh`, `cosh`, `acosh` always use their ends and monotonicity.
//! Constants come from stored words (`constants`) or, if more bits are wanted, from MPFR.

use super::constants::{self, Leading};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, rounding};
use rug::float::{Constant, Round};
use rug::integer::Order;
use rug::ops::AssignRound;
use rug::{Float, Integer};
use std::cmp::Ordering;

/// Evaluates an increasing function at the two ends of the ball with directed rounding.
macro_rules! increasing {
    ($x:expr, $bits:expr, $method:ident) => {{
        let ends = $x.to_interval($bits.max($x.midpoint().prec()) + 32);
        if $x.is_bounded() {
            let lower = rounding::down($bits + 8, ends.lower().$method());
            let upper = rounding::up($bits + 8, ends.upper().$method());
            Real::from_interval(&Interval::new(lower, upper), $bits)
        } else {
            Real::whole_line()
        }
    }};
}

/// `(e^r - 1)` bounded by `r + r^2`, for `r <= 1`.
fn exp_m1_bound(r: Magnitude) -> Magnitude {
    r.add(r.mul(r))
}

fn at_midpoint<T>(bits: Bits, source: T, spread: Magnitude) -> Real
where
    Float: AssignRound<T, Round = Round, Ordering = Ordering>,
{
    let (midpoint, error) = rounding::nearest(bits, source);
    Real::new(midpoint, spread.add(error))
}

fn is_wide(x: &Real) -> bool {
    x.radius().cmp_value(Magnitude::ONE) == Ordering::Greater
}

/// `e^x`.
pub fn exp(x: &Real, bits: Bits) -> Real {
    if is_wide(x) {
        return increasing!(x, bits, exp_ref);
    }
    let (midpoint, error) = rounding::nearest(bits, x.midpoint().exp_ref());
    let size = Magnitude::from_float(&midpoint).add(error);
    Real::new(midpoint, size.mul(exp_m1_bound(x.radius())).add(error))
}

/// `e^x - 1` without cancellation near zero.
pub fn exp_m1(x: &Real, bits: Bits) -> Real {
    if is_wide(x) {
        return increasing!(x, bits, exp_m1_ref);
    }
    let (midpoint, error) = rounding::nearest(bits, x.midpoint().exp_m1_ref());
    let size = Magnitude::from_float(&midpoint).add(error).add(Magnitude::ONE);
    Real::new(midpoint, size.mul(exp_m1_bound(x.radius())).add(error))
}

/// Natural logarithm; the whole line unless the argument is certainly positive.
pub fn ln(x: &Real, bits: Bits) -> Real {
    if !x.certainly_positive() {
        return Real::whole_line();
    }
    at_midpoint(bits, x.midpoint().ln_ref(), x.radius().div(x.abs_lower()))
}

/// `ln(1 + x)` without cancellation near zero; the whole line unless `x > -1` certainly.
pub fn ln_1p(x: &Real, bits: Bits) -> Real {
    let shifted = x.add(&Real::from_i64(1), bits.max(64));
    if !shifted.certainly_positive() {
        return Real::whole_line();
    }
    at_midpoint(bits, x.midpoint().ln_1p_ref(), x.radius().div(shifted.abs_lower()))
}

/// Square root; the whole line if the argument may be negative.
pub fn sqrt(x: &Real, bits: Bits) -> Real {
    if x.certainly_negative() || !x.is_bounded() {
        return Real::whole_line();
    }
    if x.may_be_zero() && !x.is_exact() {
        // [lower, upper] with lower <= 0: the roots of the admissible points lie in [0, sqrt(upper)].
        let upper = rounding::up(bits, x.upper(bits).sqrt_ref());
        return Real::from_interval(&Interval::new(Float::new(bits), upper), bits);
    }
    let spread = if x.is_exact() { Magnitude::ZERO } else { x.radius().div(lower_root(x)) };
    at_midpoint(bits, x.midpoint().sqrt_ref(), spread)
}

fn lower_root(x: &Real) -> Magnitude {
    Magnitude::from_float_down(&rounding::down(64, x.midpoint().sqrt_ref()))
}

/// Sine.
pub fn sin(x: &Real, bits: Bits) -> Real {
    at_midpoint(bits, x.midpoint().sin_ref(), x.radius().min(Magnitude::power_of_two(1)))
}

/// Cosine.
pub fn cos(x: &Real, bits: Bits) -> Real {
    at_midpoint(bits, x.midpoint().cos_ref(), x.radius().min(Magnitude::power_of_two(1)))
}

/// Arc tangent.
pub fn atan(x: &Real, bits: Bits) -> Real {
    if is_wide(x) && x.is_bounded() {
        return increasing!(x, bits, atan_ref);
    }
    at_midpoint(bits, x.midpoint().atan_ref(), x.radius().min(Magnitude::power_of_two(2)))
}

/// Hyperbolic tangent.
pub fn tanh(x: &Real, bits: Bits) -> Real {
    at_midpoint(bits, x.midpoint().tanh_ref(), x.radius().min(Magnitude::power_of_two(1)))
}

/// Hyperbolic sine.
pub fn sinh(x: &Real, bits: Bits) -> Real {
    increasing!(x, bits, sinh_ref)
}

/// Inverse hyperbolic sine.
pub fn asinh(x: &Real, bits: Bits) -> Real {
    at_midpoint(bits, x.midpoint().asinh_ref(), x.radius())
}

/// Hyperbolic cosine, even and increasing in `|x|`.
pub fn cosh(x: &Real, bits: Bits) -> Real {
    if !x.is_bounded() {
        return Real::whole_line();
    }
    let ends = x.abs().to_interval(bits.max(x.midpoint().prec()) + 32);
    // A ball that reaches below zero has its minimum at zero; its largest |x| is the upper end,
    // since the midpoint of `x.abs()` is not negative.
    let nearest_zero = ends.clone().clamp_non_negative();
    let lower = rounding::down(bits + 8, nearest_zero.lower().cosh_ref());
    let upper = rounding::up(bits + 8, ends.upper().cosh_ref());
    Real::from_interval(&Interval::new(lower, upper), bits)
}

/// Inverse hyperbolic cosine for arguments certainly not below one, else the whole line.
pub fn acosh(x: &Real, bits: Bits) -> Real {
    let ends = x.to_interval(bits.max(x.midpoint().prec()) + 32);
    if !x.is_bounded() || *ends.lower() < 1 {
        return Real::whole_line();
    }
    increasing!(x, bits, acosh_ref)
}

/// The circle constant.
pub fn pi(bits: Bits) -> Real {
    constant(&constants::PI, Constant::Pi, bits)
}

/// Natural logarithm of two.
pub fn ln_2(bits: Bits) -> Real {
    constant(&constants::LN_2, Constant::Log2, bits)
}

/// Euler's constant.
pub fn euler_gamma(bits: Bits) -> Real {
    constant(&constants::EULER_GAMMA, Constant::Euler, bits)
}

/// A constant from its leading words, short by at most one unit of the last word taken, or from MPFR.
fn constant(leading: &Leading, source: Constant, bits: Bits) -> Real {
    let words = bits as usize / 64 + 2;
    let Some(fraction) = leading.fraction.get(..words) else {
        // MPFR keeps what it has computed and starts again if more is wanted: ask for a little more.
        let (long, error) = rounding::nearest(bits.checked_next_multiple_of(512).unwrap_or(bits), source);
        let (midpoint, rounding_error) = rounding::nearest(bits, &long);
        return Real::new(midpoint, error.add(rounding_error));
    };
    let mut scaled = Integer::from_digits(fraction, Order::Msf);
    scaled += Integer::from(leading.whole) << (64 * words as u32);
    Real::from_integer(&scaled, bits).widen(Magnitude::ONE).shift(-64 * words as i64)
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    /// Every function at a random point of a random ball must lie in the ball of the function.
    macro_rules! containment {
        ($name:ident, $method:ident, $low:expr, $high:expr) => {
            mod $name {
            use super::*;
            proptest::proptest! {
                #[test]
                fn contains_and_is_tight(m in $low..$high, r in 0.0f64..4.0, scale in 0u32..60, at in -1.0f64..1.0, bits in 40u32..400) {
                    let r = r / 2f64.powi(scale as i32);
                    let radius = Magnitude::from_float(&Float::with_val(53, r));
                    let ball = Real::new(Float::with_val(53, m), radius);
                    let point = Float::with_val(200, m) + Float::with_val(200, r) * at;
                    let image = crate::functions::elementary::$name(&ball, bits);
                    let value = Float::with_val(1200, &point).$method();
                    if value.is_finite() && image.is_bounded() {
                        let slack: Rational = Rational::from(1) >> 1000u32;
                        let value = value.to_rational().unwrap();
                        let inside = image.clone().widen(Magnitude::from_float(&Float::with_val(64, &slack)));
                        proptest::prop_assert!(inside.contains_rational(&value));
                    }
                    // Tightness: an exact argument gives nearly full accuracy.
                    let exact = crate::functions::elementary::$name(&Real::from_float(point), bits);
                    if exact.is_bounded() {
                        proptest::prop_assert!(exact.accuracy_estimate() >= f64::from(bits) - 4.0);
                    }
                }
            }
            }
        };
    }
    containment!(exp, exp, -50.0, 50.0);
    containment!(exp_m1, exp_m1, -50.0, 50.0);
    containment!(ln, ln, 0.01, 50.0);
    containment!(ln_1p, ln_1p, -0.9, 50.0);
    containment!(sqrt, sqrt, 0.01, 50.0);
    containment!(sin, sin, -50.0, 50.0);
    containment!(cos, cos, -50.0, 50.0);
    containment!(atan, atan, -50.0, 50.0);
    containment!(tanh, tanh, -50.0, 50.0);
    containment!(sinh, sinh, -50.0, 50.0);
    containment!(asinh, asinh, -50.0, 50.0);
    containment!(cosh, cosh, -50.0, 50.0);
    containment!(acosh, acosh, 1.0, 50.0);

    // Against MPFR, which computes each constant itself (MPFR manual, `mpfr_const_euler` and so on).
    #[test]
    fn constants_contain_the_values_of_mpfr() {
        type Function = fn(Bits) -> Real;
        let all: [(Function, Constant); 3] =
            [(pi, Constant::Pi), (ln_2, Constant::Log2), (euler_gamma, Constant::Euler)];
        for (function, constant) in all {
            let exact = Float::with_val(4000, constant).to_rational().unwrap();
            for bits in (32..760).chain([1000, 1024, 1025, 3500]) {
                let ball = function(bits);
                assert!(ball.contains_rational(&exact), "{constant:?} at {bits} bits");
                assert!(ball.accuracy_estimate() >= f64::from(bits), "{constant:?} at {bits} bits");
            }
        }
    }

    #[test]
    fn domains_are_guarded() {
        assert!(!ln(&Real::from_i64(-1), 64).is_bounded());
        assert!(!ln(&Real::zero(), 64).is_bounded());
        assert!(!sqrt(&Real::from_i64(-1), 64).is_bounded());
        assert!(!acosh(&Real::zero(), 64).is_bounded());
        assert!(sqrt(&Real::zero(), 64).contains_rational(&Rational::new()));
    }
}
