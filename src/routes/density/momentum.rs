//! `F` from the momentum integral, on the contours of [`crate::routes::descent`].
//!
//! # Formula
//!
//! With `p = sinh eta` the momentum integral of the box is `psi = K(x + a) - K(x - a)`,
//! `K(y) = (2 pi i sqrt(2a))^(-1) Int coth(eta) exp(i (y sinh eta - t cosh eta)) deta`, the contour above the pole `eta = 0`, and
//! `F(y) = -(pi/(i t)) sqrt(2a) K(y)` for `y > 0`.
//!
//! * `y > t`: `y = r cosh chi`, `t = r sinh chi`, `eta = chi + i pi/2 + zeta` makes the exponential `exp(-r cosh zeta)` and `coth eta`
//!   into `tanh(chi + zeta)`. Its even part is `sinh chi cosh chi/(sinh^2 chi + cosh^2 zeta)`:
//!
//!   ```text
//!   F(y) = (y/2) Int exp(-r cosh zeta)/(t^2 + r^2 cosh^2 zeta) dzeta = (y/2) e^-r Int e^(-r X)/(y^2 + r^2 X (X + 2)) ds.
//!   ```
//!
//! * `y < t`: `t = u cosh chi`, `y = u sinh chi`, `eta = chi + zeta` makes it `exp(-i u cosh zeta)`, and the tilted contour passes above
//!   `zeta = -chi`, where the pole is. The even part of `coth(chi + zeta)` is `sinh chi cosh chi/(cosh^2 chi - cosh^2 zeta)`:
//!
//!   ```text
//!   F(y) = (y/2) e^(-i u) Int f(s) ds,    f = e^(-u X) (dzeta/ds)/(y^2 + u^2 X (X + 2i)),    X = cosh s - 1.
//!   ```
//!
//! # Poles near the contour
//!
//! `t^2 - u^2 C^2` with `C = cosh zeta = 1 - iX` vanishes at `C = ±cosh chi`. `C = cosh chi` means `cosh s = 1 + iQ` with
//! `Q = cosh chi - 1 = y^2/(u (t + u))`: poles at `±s_p`, `s_p = a + ib` of Lemma D2. There `dzeta/ds = -i sinh s/sinh zeta`, and the
//! denominator has the derivative `2 i u^2 cosh chi sinh s_p`, so that the residue is `-e^(-i (t - u))/(2 y t)`, and the
//! correction `4 pi i rho mu` contributes `F(-inf) mu` to `F`: at `y = 0`, where `mu = 1/2`, it is all there is.
//! `C = -cosh chi` means `cosh s = 1 - iQ'`, `Q' = cosh chi + 1 >= 2`, outside the strip of Lemma D3.
//!
//! # Bounds
//!
//! *Inside.* By Lemma D1, with `a', b'` belonging to `Q'`: `cosh a' >= Q'`, `cos b' <= sqrt 2 - 1`,
//!
//! ```text
//! |y^2 + u^2 X (X + 2i)| = u^2 |cosh s - (1+iQ)| |cosh s - (1-iQ')|
//!                       >= (u^2/4) |cos b - cos d| (cos d + 1 - sqrt 2) (c + cosh a)(c + cosh a')     on Im s = ±d,
//! M <= D e^(u (1 - cos d)) (4/(|cos b - cos d| (cos d + 1 - sqrt 2))) (1/(u (t + u))) (2a/sinh a),
//! ```
//!
//! since `|e^(-u X)| <= e^(u (1 - cos d))`, `u^2 cosh a' >= u (t + u)` and `Int dx/(cosh x + cosh a) = 2a/sinh a`. The strip keeps
//! away from the pole on either side; the bound itself says how far it has to.
//!
//! *Outside.* `t^2 + r^2 cosh^2 s = r^2 (cosh s - i tau)(cosh s + i tau)`, `tau = t/r = sinh chi`, zeros at `±chi ± i pi/2`, and by Lemma D1
//! with `b = pi/2` each factor is at least `(cos d/2)(c + cosh chi)`. As `r^2 (1 + cosh chi) = r (r + y)`,
//!
//! ```text
//! M <= e^(r (1 - cos d)) (4/cos^2 d) (1/(r (r + y))) (2 chi/sinh chi).
//! ```
//!
//! *Cut-off* after the node `s_n`, both sides: in absolute value the denominators are at least `y^2 + w^2 X^2` with
//! `w = r` or `u` (outside trivially; inside its square is `(y^2 + u^2 X^2)^2 + 4 u^4 X^2`), so with
//! `Int_s^inf e^(-w X) <= e^(-w X_n)/(w sinh s_n)` the sum left out is at most
//! `2 D e^(-w X_n)/((y^2 + w^2 X_n^2) w sinh s_n)`, `D` for `d = 0`.

use super::{EdgeFunction, EdgeValue, Place, everything};
use crate::arithmetic::{Bits, Complex, Magnitude, Real, decimal};
use crate::functions::complex_elementary;
use crate::functions::elementary::{asinh, atan, exp, pi, sqrt};
use crate::routes::descent::{Aim, BOUND_BITS, Rule, branch_room, eighth_turn, exponent_bits, minus_phase, shown};
use crate::routes::{Effort, RouteFailure};
use rug::Rational;
use std::f64::consts::LN_2;

/// The momentum route.
pub(super) struct Momentum;

/// The momentum route, ready to use.
pub(super) static MOMENTUM: Momentum = Momentum;

impl EdgeFunction for Momentum {
    fn name(&self) -> &'static str {
        "momentum"
    }

    fn method(&self) -> &'static str {
        "momentum integral over rapidity on the contour of steepest descent, trapezoid rule, pole by residue"
    }

    fn value(&self, place: &Place, effort: &Effort) -> Result<EdgeValue, RouteFailure> {
        let rough = Numbers::new(place, BOUND_BITS);
        let size = rough.interval.to_f64();
        if !size.is_finite() || size < 1e-300 {
            return Err(RouteFailure::OutOfReach { reason: "the point is too near an edge's light cone".to_owned() });
        }
        let rule = rough.choose(place)?;
        let bits = place.bits + 16 + 2 * exponent_bits(size) + exponent_bits(rule.last as f64);
        effort.allow_bits(bits)?;
        let numbers = Numbers::new(place, bits);
        let (integral, errors) = numbers.integral(&rule, effort)?;
        let value = numbers.assemble(place, &rule, &integral);
        Ok(EdgeValue { value, bits, nodes: rule.last as usize + 1, witness: witness(&rule, errors) })
    }
}

/// What the sum leaves out, as bounds.
struct Errors {
    discretisation: Magnitude,
    cut_off: Magnitude,
}

/// The place in balls.
struct Numbers {
    bits: Bits,
    timelike: bool,
    time: Real,
    distance: Real,
    /// `w = u` or `r`.
    interval: Real,
    /// `w^2` and `y^2`.
    interval_square: Real,
    distance_square: Real,
    /// Inside: `sinh a` of the pole, which is its `tan b` as well. Outside: `sinh chi`.
    pole_sinh: Real,
    /// `a`, or `chi`.
    pole_real: Real,
}

impl Numbers {
    fn new(place: &Place, bits: Bits) -> Numbers {
        let timelike = place.is_timelike();
        let square = Real::from_rational(&place.square().abs(), bits);
        let interval = sqrt(&square, bits);
        let time = Real::from_rational(place.time, bits);
        let distance_square = Real::from_rational(&Rational::from(place.distance.square_ref()), bits);
        let pole_sinh = if timelike {
            // Q and cosh a = (Q + sqrt(Q^2 + 4))/2, sinh a = sqrt(Q cosh a).
            let q = distance_square.div(&interval.mul(&time.add(&interval, bits), bits), bits);
            let root = sqrt(&q.square(bits).add(&Real::from_i64(4), bits), bits);
            sqrt(&q.mul(&q.add(&root, bits), bits).shift(-1), bits)
        } else {
            time.div(&interval, bits)
        };
        Numbers {
            bits,
            timelike,
            distance: Real::from_rational(place.distance, bits),
            pole_real: asinh(&pole_sinh, bits),
            time,
            interval,
            interval_square: square,
            distance_square,
            pole_sinh,
        }
    }

    /// Step and strip; a rough size of the integral is `1/(y (t + y))`.
    fn choose(&self, place: &Place) -> Result<Rule, RouteFailure> {
        let (w, t, y) = (self.interval.to_f64(), self.time.to_f64(), self.distance.to_f64());
        let (tangent, real) = (self.pole_sinh.to_f64(), self.pole_real.to_f64());
        let pole = tangent.atan();
        let ln_size = -(y * (t + y)).ln() - 0.5 * (1.0 + w).ln();
        let spread = if tangent > 0.0 { (2.0 * real / tangent).min(2.0) } else { 2.0 };
        let inside = |d: f64| {
            if (d - pole).abs() < 0.25 * d {
                return f64::INFINITY;
            }
            let room = d.cos() + 1.0 - 2f64.sqrt();
            let away = (pole.cos() - d.cos()).abs();
            let top = 8.0 * spread * (2.0 / room).sqrt() / (away * room * w * (t + w));
            w * (1.0 - d.cos()) + top.ln() - ln_size
        };
        let outside = |d: f64| {
            let top = 8.0 * spread / (d.cos() * d.cos() * w * (w + y));
            w * (1.0 - d.cos()) + top.ln() - ln_size
        };
        let ln_rest = |s: f64| {
            let rise = 2.0 * (0.5 * s).sinh().powi(2);
            2.0 - (y * y + (w * rise).powi(2)).ln() - (w * s.sinh()).ln().min(0.0) - ln_size
        };
        let aim = Aim {
            decay: w,
            ln_goal: -f64::from(place.bits + 4) * LN_2,
            widest: if self.timelike { 1.05 } else { 1.5 },
            ln_bound: if self.timelike { &inside } else { &outside },
            ln_rest: &ln_rest,
            pole: self.timelike.then_some(real),
        };
        Rule::choose(&aim)
    }

    /// The integral over `s`, without the correction for the pole.
    fn integral(&self, rule: &Rule, effort: &Effort) -> Result<(Complex, Errors), RouteFailure> {
        let bits = self.bits;
        let mut total = Complex::zero();
        rule.for_each_node(bits, effort, |node| {
            let rise = &node.rise;
            let weight = node.weight(&self.interval, bits);
            let rising = self.interval_square.mul(rise, bits);
            let term = if self.timelike {
                let re = rising.mul(rise, bits).add(&self.distance_square, bits);
                let below = Complex::new(re, rising.shift(1));
                // One division for both the slope and the denominator.
                let top = Complex::from_real(weight.mul(&node.half_cosh, bits));
                top.div(&below.mul(&node.root(bits), bits), bits)
            } else {
                let sum = rise.add(&Real::from_i64(2), bits);
                let below = rising.mul(&sum, bits).add(&self.distance_square, bits);
                Complex::from_real(weight.div(&below, bits))
            };
            total = total.add(&term, bits);
        })?;
        if self.timelike {
            total = total.mul(&eighth_turn(bits), bits);
        }
        let errors =
            Errors { discretisation: rule.discretisation_error(self.line_integral(rule)), cut_off: self.cut_off(rule) };
        let value = total.mul_real(&rule.step, bits).widen(errors.discretisation.add(errors.cut_off));
        Ok((if self.timelike { value } else { Complex::from_real(value.re) }, errors))
    }

    /// The bound `M`.
    fn line_integral(&self, rule: &Rule) -> Magnitude {
        let bits = BOUND_BITS;
        let cosine = rule.strip_cosine();
        if !cosine.certainly_positive() || !rule.strip.certainly_less(&pi(bits).shift(-1)) {
            return Magnitude::INFINITY;
        }
        let loss = exp(&Real::from_i64(1).sub(&cosine, bits).mul(&self.interval, bits), bits).abs_upper();
        let spread = self.pole_real.shift(1).div(&self.pole_sinh, bits).abs_upper().min(Magnitude::from_u64(2));
        let other = if self.timelike { &self.time } else { &self.distance };
        let length = self.interval.mul(&self.interval.add(other, bits), bits).abs_lower();
        let top = loss.mul(spread).shift(2);
        if !self.timelike {
            return top.div(cosine.square(bits).abs_lower()).div(length);
        }
        let away = self.pole_cosine().sub(&cosine, bits).abs_lower();
        let room = branch_room(&cosine);
        if !room.certainly_positive() {
            return Magnitude::INFINITY;
        }
        top.mul(rule.slope_bound()).div(away).div(room.abs_lower()).div(length)
    }

    /// `cos b = 1/cosh a`.
    fn pole_cosine(&self) -> Real {
        let bits = BOUND_BITS;
        let square = self.pole_sinh.square(bits).add(&Real::from_i64(1), bits);
        Real::from_i64(1).div(&sqrt(&square, bits), bits)
    }

    fn cut_off(&self, rule: &Rule) -> Magnitude {
        let bits = BOUND_BITS;
        let (rise, sinh) = rule.end();
        if !sinh.certainly_positive() {
            return Magnitude::INFINITY;
        }
        let fall = exp(&self.interval.mul(&rise, bits).neg(), bits).abs_upper();
        // D for d = 0: sqrt(2/(2 - sqrt 2)) < 2.
        let slope = if self.timelike { Magnitude::from_u64(2) } else { Magnitude::ONE };
        let square = self.interval.mul(&rise, bits).square(bits).add(&self.distance_square, bits);
        let below = square.mul(&self.interval, bits).mul(&sinh, bits);
        slope.shift(1).mul(fall).div(below.abs_lower())
    }

    /// `F` from the integral, with the pole inside.
    fn assemble(&self, place: &Place, rule: &Rule, integral: &Complex) -> Complex {
        let bits = self.bits;
        let half = self.distance.shift(-1);
        let value = integral.mul_real(&half, bits);
        if !self.timelike {
            return value.mul_real(&exp(&self.interval.neg(), bits), bits);
        }
        let value = value.mul(&minus_phase(&self.interval, bits), bits);
        if !self.pole_inside(rule) || crate::spoil::is_active(crate::spoil::Fault::DescentPoleForgotten) {
            return value;
        }
        value.add(&everything(place.time, bits).mul(&self.pole_share(rule), bits), bits)
    }

    /// Whether `b < d`. If that is not certain, the bound `M` is infinite and either answer is right.
    fn pole_inside(&self, rule: &Rule) -> bool {
        rule.strip_cosine().certainly_less(&self.pole_cosine())
    }

    /// `mu = 1/(1 - exp(-2 pi i (s_p - delta)/h))`.
    fn pole_share(&self, rule: &Rule) -> Complex {
        let bits = self.bits;
        let height = atan(&self.pole_sinh, bits);
        let shift = if rule.offset { rule.step.shift(-1) } else { Real::zero() };
        let turn = pi(bits).shift(1).div(&rule.step, bits);
        let across = self.pole_real.sub(&shift, bits).mul(&turn, bits).neg();
        let exponent = Complex::new(height.mul(&turn, bits), across);
        let one = Complex::from_real(Real::from_i64(1));
        one.div(&one.sub(&complex_elementary::exp(&exponent, bits), bits), bits)
    }
}

fn witness(rule: &Rule, errors: Errors) -> Vec<(String, String)> {
    let bound = |value: Magnitude| decimal::upper_decimal(&value.to_float(), 4);
    vec![
        ("step h".to_owned(), shown(&rule.step)),
        ("strip half-width d".to_owned(), shown(&rule.strip)),
        ("discretisation bound".to_owned(), bound(errors.discretisation)),
        ("cut-off bound".to_owned(), bound(errors.cut_off)),
    ]
}
