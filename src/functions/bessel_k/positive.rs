//! `K_nu` on balls of positive numbers: scaling, higher orders and the spread over a ball.
//!
//! Write `F_nu(x) = e^x K_nu(x)`. With `c = cosh u - 1` the integral DLMF 10.32.9 becomes
//!
//! ```text
//! F_nu(x) = integral_0^inf e^{-xc} p(c) dc,   p = cosh(nu u)/sinh u,
//! c p'(c)/p(c) = tanh(u/2) (nu tanh(nu u) - coth u) <= nu - 1  (nu >= 1),   <= -1/2  (nu = 0),
//! ```
//!
//! the last as `tanh(u/2) coth u = (1 + tanh^2(u/2))/2`. So `F_nu`, `-F_nu'` and, as products of
//! such functions with `e^{-x}`, `K_nu` and `-K_nu'` are positive and decreasing. Integration by
//! parts of `integral x e^{-xc} c^n p dc`, with `(c^n p)' = c^{n-1} p (n + c p'/p)`, gives
//!
//! ```text
//! -x F_nu' <= max(nu, 1/2) F_nu,        -x F_nu'' / F_nu' <= nu + 1  (3/2 for nu = 0).
//! ```
//!
//! # Narrow balls
//!
//! On a ball `m ± r` with `d = r/(m - r)` a function changes by at most `r` times its steepest
//! slope, that at the lower end. Integrating the last inequality from there to `m`,
//!
//! ```text
//! |F_nu(x) - F_nu(m)| <= r (1+d)^{nu+2} |F_nu'(m)|,     |F_nu'(m)| <= F_nu(m) max(nu, 1/2)/m,
//! |K_nu(x) - K_nu(m)| <= r (1+d)^{nu+2} e^r |K_nu'(m)|,
//! |K_nu'| = K_{nu-1} + (nu/x) K_nu  (K_1 for nu = 0),     |F_nu'| = |K_nu'| e^x - F_nu,
//! ```
//!
//! with DLMF 10.29.2 and 10.29.3. For `K`, each term of `|K_nu'|` is bounded separately: `K_mu(m-r)
//! <= e^r (1+d)^{max(mu, 1/2)} K_mu(m)`, and `1/x` costs another `1 + d`.
//!
//! Wide balls are evaluated at both ends.

use super::argument::Argument;
use super::{FEWEST_BITS, GUARD_BITS, MOST_BITS, Method, asymptotic, series, short_series, trapezoid};
use crate::arithmetic::{Bits, Complex, Interval, Magnitude, Real};
use crate::functions::elementary;
use rug::Float;
use std::cmp::Ordering;

/// Balls with a larger relative spread than `2^-WIDE_BITS` are evaluated at their ends.
const WIDE_BITS: i64 = 10;

/// Whether `K_nu(x)` or `e^x K_nu(x)` is meant.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Scaling {
    Plain,
    Scaled,
}

/// What is wanted besides `K_0(x)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum SecondValue {
    /// `K_1(x)`.
    OrderOne,
    /// `K_1(x)/x`.
    QuotientByArgument,
}

/// How values are wanted.
#[derive(Clone, Copy, Debug)]
pub(super) struct Request {
    pub(super) bits: Bits,
    pub(super) scaling: Scaling,
    /// `None` for the best one.
    pub(super) method: Option<Method>,
}

impl Request {
    pub(super) fn new(bits: Bits, scaling: Scaling) -> Request {
        Request { bits: bits.clamp(FEWEST_BITS, MOST_BITS), scaling, method: None }
    }
}

fn nothing_known() -> (Real, Real) {
    (Real::whole_line(), Real::whole_line())
}

/// `K_0(x)` and the other value wanted, scaled alike, at an exact argument.
pub(super) fn exact_pair(x: &Argument, request: Request, second: SecondValue) -> (Real, Real) {
    let bits = request.bits;
    if matches!(request.method, None | Some(Method::ShortSeries)) {
        if let Some(values) = short_series::values(x, bits) {
            return from_series(values, x, request, second);
        }
        if request.method.is_some() {
            return nothing_known();
        }
    }
    match request.method.unwrap_or_else(|| Method::for_size(x.estimate(), bits)) {
        Method::ShortSeries | Method::Series => {
            let values = series::values(x, bits);
            from_series((values.k0, values.k1_over_x), x, request, second)
        }
        Method::Asymptotic => {
            let Some(values) = asymptotic::scaled_values(x, bits) else { return nothing_known() };
            let (k0, k1) = rescale(values, x, bits, request.scaling == Scaling::Plain, -1);
            match second {
                SecondValue::OrderOne => (k0, k1),
                SecondValue::QuotientByArgument => (k0, k1.div(&x.ball(bits + GUARD_BITS), bits + 8)),
            }
        }
        Method::Trapezoid => {
            let z = Complex::from_real(x.ball(bits + GUARD_BITS));
            let values = (trapezoid::value(0, &z, bits).re, trapezoid::value(1, &z, bits).re);
            let (k0, k1) = rescale(values, x, bits, request.scaling == Scaling::Scaled, 1);
            match second {
                SecondValue::OrderOne => (k0, k1),
                SecondValue::QuotientByArgument => (k0, k1.div(&z.re, bits + 8)),
            }
        }
    }
}

/// From `K_0(x)` and `K_1(x)/x` to what is wanted.
fn from_series(values: (Real, Real), x: &Argument, request: Request, second: SecondValue) -> (Real, Real) {
    let bits = request.bits;
    let (k0, quotient) = rescale(values, x, bits, request.scaling == Scaling::Scaled, 1);
    match second {
        SecondValue::OrderOne => (k0, quotient.mul(&x.ball(bits + GUARD_BITS), bits + 8)),
        SecondValue::QuotientByArgument => (k0, quotient),
    }
}

/// Both values times `e^{sign x}`, if wanted.
fn rescale(values: (Real, Real), x: &Argument, bits: Bits, wanted: bool, sign: i64) -> (Real, Real) {
    if !wanted {
        return values;
    }
    let short = bits + GUARD_BITS;
    // An absolute error of x is a relative one of e^x.
    let whole_bits = x.log2_estimate().clamp(0.0, 128.0).ceil() as Bits;
    let exponent = x.ball(short + whole_bits).mul_i64(sign, short + whole_bits);
    let power = elementary::exp(&exponent, short);
    (values.0.mul(&power, bits + 8), values.1.mul(&power, bits + 8))
}

/// `K_order` at an exact argument together with its neighbour: the order below, one for order zero.
struct WithNeighbour {
    value: Real,
    neighbour: Real,
}

/// Orders above one from orders zero and one upwards.
fn exact_order(order: u32, x: &Float, request: Request) -> WithNeighbour {
    let bits = request.bits;
    let argument = Argument::Number(x);
    if order < 2 {
        let (k0, k1) = exact_pair(&argument, request, SecondValue::OrderOne);
        let (value, neighbour) = if order == 0 { (k0, k1) } else { (k1, k0) };
        return WithNeighbour { value, neighbour };
    }
    if request.method == Some(Method::Trapezoid) {
        let z = Complex::from_real(Real::from_float(x.clone()));
        let values = (trapezoid::value(order, &z, bits).re, trapezoid::value(order - 1, &z, bits).re);
        let (value, neighbour) = rescale(values, &argument, bits, request.scaling == Scaling::Scaled, 1);
        return WithNeighbour { value, neighbour };
    }
    let short = bits + 4 + u32::BITS - order.leading_zeros();
    let (mut before, mut current) = exact_pair(&argument, Request { bits: short, ..request }, SecondValue::OrderOne);
    let two_over_x = Real::from_i64(2).div(&Real::from_float(x.clone()), short + GUARD_BITS);
    for n in 1..order {
        let step = two_over_x.mul(&current, short + GUARD_BITS).mul_i64(i64::from(n), short + GUARD_BITS);
        let next = before.add(&step, short + GUARD_BITS);
        before = std::mem::replace(&mut current, next);
    }
    WithNeighbour { value: current.round(bits + 8), neighbour: before }
}

/// `K_0` and `K_1` on a ball.
pub(super) fn pair_on_ball(x: &Real, request: Request) -> (Real, Real) {
    if !is_positive_and_bounded(x) {
        return nothing_known();
    }
    let at = |point: &Float| exact_pair(&Argument::Number(point), request, SecondValue::OrderOne);
    if x.is_exact() {
        return at(x.midpoint());
    }
    if let Some(narrow) = NarrowBall::new(x, request.scaling) {
        let (k0, k1) = at(x.midpoint());
        let spreads = (narrow.spread(0, &k0, &k1), narrow.spread(1, &k1, &k0));
        return (k0.widen(spreads.0), k1.widen(spreads.1));
    }
    let Some((left, right)) = positive_ends(x, request.bits) else { return nothing_known() };
    let (above, below) = (at(&left), at(&right));
    (between(&below.0, &above.0, request.bits), between(&below.1, &above.1, request.bits))
}

/// `K_order` on a ball.
pub(super) fn order_on_ball(order: u32, x: &Real, request: Request) -> Real {
    if !is_positive_and_bounded(x) {
        return Real::whole_line();
    }
    let at = |point: &Float| exact_order(order, point, request);
    if x.is_exact() {
        return at(x.midpoint()).value;
    }
    if let Some(narrow) = NarrowBall::new(x, request.scaling) {
        let found = at(x.midpoint());
        let spread = narrow.spread(order, &found.value, &found.neighbour);
        return found.value.widen(spread);
    }
    positive_ends(x, request.bits)
        .map_or_else(Real::whole_line, |(left, right)| between(&at(&right).value, &at(&left).value, request.bits))
}

fn is_positive_and_bounded(x: &Real) -> bool {
    x.is_bounded() && x.certainly_positive()
}

/// The ends of a positive ball, rounded outward; `None` if the lower one would not be positive.
fn positive_ends(x: &Real, bits: Bits) -> Option<(Float, Float)> {
    let precision = bits.max(x.midpoint().prec()) + 32;
    let (left, right) = (x.lower(precision), x.upper(precision));
    (left > 0 && right.is_finite()).then_some((left, right))
}

/// The ball of all numbers between two balls, the lower one given first.
fn between(below: &Real, above: &Real, bits: Bits) -> Real {
    if !below.is_bounded() || !above.is_bounded() {
        return Real::whole_line();
    }
    Real::from_interval(&Interval::new(below.lower(bits + 16), above.upper(bits + 16)), bits + 16)
}

/// A ball on which functions are evaluated at the midpoint only.
struct NarrowBall<'a> {
    x: &'a Real,
    scaling: Scaling,
    /// `d = r/(m - r)`.
    relative: Magnitude,
}

impl NarrowBall<'_> {
    /// `None` for balls that are better evaluated at their ends.
    fn new(x: &Real, scaling: Scaling) -> Option<NarrowBall<'_>> {
        let relative = x.radius().div(x.abs_lower());
        let limit = Magnitude::power_of_two(-WIDE_BITS);
        let decisive = if scaling == Scaling::Plain { relative.max(x.radius()) } else { relative };
        (decisive.cmp_value(limit) != Ordering::Greater).then_some(NarrowBall { x, scaling, relative })
    }

    /// By how much a function may differ from its value at the midpoint.
    fn spread(&self, order: u32, value: &Real, neighbour: &Real) -> Magnitude {
        let radius = self.x.radius();
        let spread = radius.mul(self.slope(order, value, neighbour));
        let spread = spread.mul(Magnitude::ONE.add(self.relative).pow(u64::from(order) + 2));
        match self.scaling {
            // The radius is below one here, so that e^r <= 1 + r + r^2.
            Scaling::Plain => spread.mul(Magnitude::ONE.add(radius).add(radius.mul(radius))),
            Scaling::Scaled => spread,
        }
    }

    /// Bound of the absolute value of the derivative at the midpoint.
    fn slope(&self, order: u32, value: &Real, neighbour: &Real) -> Magnitude {
        const BITS: Bits = 64;
        let midpoint = Real::from_float(self.x.midpoint().clone());
        let plain = match order {
            0 => neighbour.clone(),
            _ => neighbour.add(&value.mul_i64(i64::from(order), BITS).div(&midpoint, BITS), BITS),
        };
        if self.scaling == Scaling::Plain {
            return plain.abs_upper();
        }
        // The difference loses bits at large arguments, where the other bound is not far off.
        let twice_order = Magnitude::from_u64((2 * u64::from(order)).max(1));
        let logarithmic = value.abs_upper().mul(twice_order).shift(-1).div(midpoint.abs_lower());
        plain.sub(value, BITS).abs_upper().min(logarithmic)
    }
}
