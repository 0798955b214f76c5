//! `F` from the series of the propagator in powers of the interval, integrated term by term.
//!
//! # Series
//!
//! By DLMF 10.31.1, with `c_k = 1/(4^k k! (k+1)!)`, `psi_k = psi(k+1) + psi(k+2) = 2 H_k + 1/(k+1) - 2 gamma` and
//! `D = r^2 = v^2 - t^2 = -U`,
//!
//! ```text
//! g = K_1(r)/r = 1/D + (1/2) Sum_k c_k D^k (ln(r/2) - psi_k/2).
//! ```
//!
//! Above `v = t`, `r = sqrt(v^2 - (t - i0)^2)` is `e^(i pi/2) sqrt U` for `v < t`, so that `ln r = ln|D|/2`, plus `i pi/2`
//! for `v < t`. From `F(y) = F(0) - Int_0^y g` along that contour, `F(0) = -i pi e^(-i t)/(2t)`, and since `F` is real for
//! `y > t`,
//!
//! ```text
//! Re F(y) = -(pi/(2t)) sin t + (1/(2t)) ln|(y+t)/(y-t)| - (1/2) Sum_k (-1)^k [ l_k/2 - (ln 2 + psi_k/2) p_k ],
//! Im F(y) = -(pi/(2t)) cos t - (pi/4) Sum_k (-1)^k p_k      for y < t, else zero,
//! p_k = c_k Int_0^y (t^2 - w^2)^k dw,      l_k = c_k Int_0^y (t^2 - w^2)^k ln|t^2 - w^2| dw.
//! ```
//!
//! (Beyond `t` the integrals of `1/D` and of the logarithms along the contour have as real parts those with absolute
//! values, the former as a principal value.) With `e_k = c_k U^k`, `U = t^2 - y^2`, integration by parts gives
//!
//! ```text
//! (2k+1) p_k = y e_k + t^2/(2(k+1)) p_{k-1},                                                  p_0 = y,
//! (2k+1) l_k = y e_k ln|U| + t^2/(2(k+1)) (l_{k-1} + p_{k-1}/k) - 2 p_k,    l_0 = y ln|U| - 2y + t ln|(y+t)/(y-t)|,
//! ```
//!
//! from the derivatives of `w (t^2 - w^2)^k` and of the same times the logarithm. One formula serves inside the cone,
//! outside it, and as near to it as one likes.
//!
//! # The terms left out
//!
//! `V = max(t^2, |U|) >= |t^2 - w^2|`. Then `|p_k| <= c_k y V^k`, and as `x^k |ln x| <= V^k (|ln V| + 1/(e k))` for
//! `0 < x <= V` (write `x = V (x/V)`), `|l_k| <= c_k y V^k (|ln V| + 1)` for `k >= 1`. With `ln 2 + |psi_k|/2 <= k + 3`
//! (`H_k <= k`, `gamma < 1`), the terms of both sums are at most
//!
//! ```text
//! T_k = c_k y V^k (|ln V| + k + 4),      T_{k+1} <= (V/(4 (k+1)(k+2))) 2 T_k,
//! ```
//!
//! so that from `4 (N+1)(N+2) >= 4 V` on the terms after `N` sum to at most `T_N`. (The factors of the sums are at
//! most one: `pi/4 < 1`.)
//!
//! # Cancellation
//!
//! Terms grow to about `exp(sqrt V)` and `F` is about `exp(-r)` outside: `(sqrt V + r)/ln 2` more bits are used, and the
//! route declines where that would be too many.

use super::{EdgeFunction, EdgeValue, Place};
use crate::arithmetic::{Bits, Complex, Magnitude, Real, decimal};
use crate::functions::elementary::{cos, euler_gamma, ln, ln_1p, ln_2, pi, sin};
use crate::routes::{Effort, RouteFailure};
use rug::Rational;
use std::f64::consts::LOG2_E;

/// More bits than this for cancellation are refused.
const MOST_EXTRA_BITS: f64 = 20_000.0;

/// The position route.
pub(super) struct Position;

/// The position route, ready to use.
pub(super) static POSITION: Position = Position;

impl EdgeFunction for Position {
    fn name(&self) -> &'static str {
        "position"
    }

    fn method(&self) -> &'static str {
        "Newton-Wigner propagator in position space, its series in powers of the interval integrated over the box"
    }

    fn value(&self, place: &Place, effort: &Effort) -> Result<EdgeValue, RouteFailure> {
        let square = place.square();
        let size = square.to_f64();
        let largest = Rational::from(place.time.square_ref()).max(Rational::from(square.abs_ref()));
        let growth = largest.to_f64().sqrt() + size.max(0.0).sqrt();
        let reason = "the series of the propagator would lose too many digits this far from the light cone's tip";
        if !growth.is_finite() || growth * LOG2_E >= MOST_EXTRA_BITS {
            return Err(RouteFailure::OutOfReach { reason: reason.to_owned() });
        }
        // A logarithm near the cone, and sizes of lengths, cost a few more.
        let span = |value: &Rational| {
            f64::from(value.numer().significant_bits()) - f64::from(value.denom().significant_bits())
        };
        let ranges = span(place.time).abs() + span(place.distance).abs();
        if ranges >= MOST_EXTRA_BITS {
            return Err(RouteFailure::OutOfReach { reason: reason.to_owned() });
        }
        let bits = place.bits + (growth * LOG2_E) as Bits + ranges as Bits + 16;
        effort.allow_bits(bits)?;
        Series::new(place, &largest, bits).sum(effort)
    }
}

struct Series {
    bits: Bits,
    timelike: bool,
    time: Real,
    distance: Real,
    /// `U/4`, `t^2/2` and `V/4`.
    quarter_square: Real,
    half_time_square: Real,
    quarter_largest: Magnitude,
    largest: Rational,
    /// `ln|U|`, `ln|(y+t)/(y-t)|`.
    log_square: Real,
    log_ratio: Real,
}

impl Series {
    fn new(place: &Place, largest: &Rational, bits: Bits) -> Series {
        let (t, y) = (place.time, place.distance);
        let square = -place.square();
        let absolute = Real::from_rational(&Rational::from(square.abs_ref()), bits);
        let smaller = if y < t { y } else { t };
        let ratio = Rational::from(smaller * 2) / Rational::from(y - t).abs();
        Series {
            bits,
            timelike: place.is_timelike(),
            time: Real::from_rational(t, bits),
            distance: Real::from_rational(y, bits),
            quarter_square: Real::from_rational(&(square / 4), bits),
            half_time_square: Real::from_rational(&(Rational::from(t.square_ref()) / 2), bits),
            quarter_largest: Real::from_rational(&Rational::from(largest / 4), bits).abs_upper(),
            largest: largest.clone(),
            log_square: ln(&absolute, bits),
            log_ratio: ln_1p(&Real::from_rational(&ratio, bits), bits),
        }
    }

    fn sum(&self, effort: &Effort) -> Result<EdgeValue, RouteFailure> {
        let bits = self.bits;
        let double = self.distance.shift(1);
        let mut edge = self.distance.clone();
        let mut p = self.distance.clone();
        let mut l = self.distance.mul(&self.log_square, bits).sub(&double, bits);
        l = l.add(&self.time.mul(&self.log_ratio, bits), bits);
        let constant = ln_2(bits).sub(&euler_gamma(bits), bits);
        let mut harmonic = Real::zero();
        let (mut real, mut imaginary) = (Real::zero(), Real::zero());
        let mut bound = self.distance.abs_upper();
        let log_largest = ln(&Real::from_rational(&self.largest, 64), 64).abs_upper();
        let goal = Magnitude::power_of_two(-i64::from(bits) - 8);
        let mut k = 0u64;
        let rest = loop {
            // ln 2 + psi_k/2 = ln 2 - gamma + H_k + 1/(2(k+1)).
            let weight = constant.add(&harmonic, bits).add(&Real::from_i64(1).div_u64(2 * (k + 1), bits), bits);
            let term = l.shift(-1).sub(&weight.mul(&p, bits), bits);
            if k.is_multiple_of(2) {
                real = real.add(&term, bits);
                imaginary = imaginary.add(&p, bits);
            } else {
                real = real.sub(&term, bits);
                imaginary = imaginary.sub(&p, bits);
            }
            let rest = bound.mul(log_largest.add(Magnitude::from_u64(k + 4)));
            // 4 (k+1)(k+2) >= 4 V, with V/4 bounded above.
            let settled = Magnitude::from_u64((k + 1) * (k + 2)).cmp_value(self.quarter_largest.shift(2)).is_ge();
            if settled && rest.cmp_value(goal).is_le() {
                break rest;
            }
            if crate::spoil::is_active(crate::spoil::Fault::IntervalSeriesCut) && k > 5 {
                break Magnitude::ZERO;
            }
            k += 1;
            if k.is_multiple_of(64) {
                effort.check()?;
            }
            let step = k * (k + 1);
            edge = edge.mul(&self.quarter_square, bits).div_u64(step, bits);
            bound = bound.mul(self.quarter_largest).div(Magnitude::from_u64(k)).div(Magnitude::from_u64(k + 1));
            let lifted = l.add(&p.div_u64(k, bits), bits);
            let from_p = self.half_time_square.mul(&p, bits).div_u64(k + 1, bits);
            let from_l = self.half_time_square.mul(&lifted, bits).div_u64(k + 1, bits);
            p = edge.add(&from_p, bits).div_u64(2 * k + 1, bits);
            l = edge.mul(&self.log_square, bits).add(&from_l, bits).sub(&p.shift(1), bits).div_u64(2 * k + 1, bits);
            harmonic = harmonic.add(&Real::from_i64(1).div_u64(k, bits), bits);
        };
        let witness = vec![
            ("terms".to_owned(), (k + 1).to_string()),
            ("bound of the terms left out".to_owned(), decimal::upper_decimal(&rest.to_float(), 4)),
        ];
        let value = self.assemble(&real.widen(rest), &imaginary.widen(rest));
        Ok(EdgeValue { value, bits, nodes: k as usize + 1, witness })
    }

    /// `F` from the two sums.
    fn assemble(&self, real: &Real, imaginary: &Real) -> Complex {
        let bits = self.bits;
        let twice = self.time.shift(1);
        let part = |wave: Real| pi(bits).mul(&wave, bits).neg();
        let logs = part(sin(&self.time, bits)).add(&self.log_ratio, bits).div(&twice, bits);
        let re = logs.sub(&real.shift(-1), bits);
        if !self.timelike {
            return Complex::from_real(re);
        }
        let im = part(cos(&self.time, bits)).div(&twice, bits);
        Complex::new(re, im.sub(&pi(bits).mul(imaginary, bits).shift(-2), bits))
    }
}
