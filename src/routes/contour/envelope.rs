//! The envelope of lemma 1: once in double precision for the plan, once in balls for the bounds.

use super::Balls;
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{cos, exp, pi, sin, sqrt};
use crate::routes::gaussian::Estimates;
use rug::Rational;

/// `E(u)` on one line in double precision: `-a u^2 + b u + c - r sqrt(1 + u^2)`.
#[derive(Clone, Copy, Debug)]
pub(super) struct Rough {
    a: f64,
    b: f64,
    c: f64,
    r: f64,
    /// Where `E` is largest.
    pub top: f64,
}

impl Rough {
    pub fn new(packet: &Estimates, from: f64, theta: f64) -> Rough {
        let (sine, cosine) = theta.sin_cos();
        let width = packet.sigma * packet.sigma;
        let k = packet.momentum;
        let mut line = Rough {
            a: width * (2.0 * theta).cos(),
            b: 2.0 * width * k * cosine + packet.time * sine,
            c: width * (sine * sine - k * k),
            r: from * sine,
            top: 0.0,
        };
        line.top = line.maximum();
        line
    }

    /// `E` is concave: bisection for the zero of its derivative between zero and the top of the parabola.
    fn maximum(&self) -> f64 {
        let (mut low, mut high) = (0.0, self.b / (2.0 * self.a));
        for _ in 0..50 {
            let middle = 0.5 * (low + high);
            let towards_high = -self.fall(middle) * high.signum();
            if towards_high > 0.0 { low = middle } else { high = middle }
        }
        0.5 * (low + high)
    }

    pub fn value(&self, u: f64) -> f64 {
        -self.a * u * u + self.b * u + self.c - self.r * u.hypot(1.0)
    }

    /// Minus the derivative.
    pub fn fall(&self, u: f64) -> f64 {
        2.0 * self.a * u - self.b + self.r * u / u.hypot(1.0)
    }

    /// Whether the sum beyond `u` is below `exp(-goal)` by lemma 4.
    pub fn is_negligible_beyond(&self, u: f64, goal: f64) -> bool {
        let fall = self.fall(u);
        let steep = if u >= 0.0 { fall * u.hypot(1.0) } else { fall - 2.0 * self.a * u };
        fall > 0.0 && steep > 1.1 && self.value(u) - fall.ln() < -goal
    }

    /// `ln G`.
    pub fn log_peak(&self) -> f64 {
        self.value(self.top)
    }

    /// `sqrt(pi/A)`
    pub fn spread(&self) -> f64 {
        (std::f64::consts::PI / self.a).sqrt()
    }
}

/// `-A u^2 + B u + C` in balls.
pub(super) struct Envelope {
    a: Real,
    b: Real,
    c: Real,
}

impl Envelope {
    /// On the line `theta`, touching at `touch`.
    pub fn new(balls: &Balls, theta: &Rational, touch: &Rational, bits: Bits) -> Envelope {
        let theta = Real::from_rational(theta, bits);
        let (sine, cosine) = (sin(&theta, bits), cos(&theta, bits));
        let u0 = Real::from_rational(touch, bits);
        let w0 = sqrt(&u0.square(bits).add(&Real::from_i64(1), bits), bits);
        let drift = balls.time.sub(&balls.from.mul(&u0, bits).div(&w0, bits), bits).mul(&sine, bits);
        let tilt = balls.width.mul(&balls.momentum, bits).mul(&cosine, bits).shift(1);
        let fixed = balls.width.mul(&sine.square(bits).sub(&balls.momentum.square(bits), bits), bits);
        Envelope {
            a: balls.width.mul(&cos(&theta.shift(1), bits), bits),
            b: tilt.add(&drift, bits),
            c: fixed.sub(&balls.from.mul(&sine, bits).div(&w0, bits), bits),
        }
    }

    /// An upper bound of `G = exp(B^2/(4A) + C)`.
    pub fn peak(&self, bits: Bits) -> Magnitude {
        if !self.a.certainly_positive() {
            return Magnitude::INFINITY;
        }
        let top = self.b.square(bits).div(&self.a.shift(2), bits).add(&self.c, bits);
        exp(&top, bits).abs_upper()
    }

    /// An upper bound of `sqrt(pi/A)`.
    pub fn spread(&self, bits: Bits) -> Magnitude {
        if !self.a.certainly_positive() {
            return Magnitude::INFINITY;
        }
        sqrt(&pi(bits).div(&self.a, bits), bits).abs_upper()
    }

    /// Lemma 4 for the point where the envelope touches.
    pub fn beyond(&self, touch: &Rational, bits: Bits) -> Magnitude {
        let u = Real::from_rational(touch, bits);
        let fall = self.a.mul(&u, bits).shift(1).sub(&self.b, bits);
        let w = sqrt(&u.square(bits).add(&Real::from_i64(1), bits), bits);
        let one = Real::from_i64(1);
        let steep = if *touch >= 0 { fall.mul(&w, bits) } else { self.b.neg() };
        if !(fall.certainly_positive() && one.certainly_less(&steep) && self.a.certainly_positive()) {
            return Magnitude::INFINITY;
        }
        let exponent = self.b.sub(&self.a.mul(&u, bits), bits).mul(&u, bits).add(&self.c, bits);
        exp(&exponent, bits).abs_upper().div(fall.abs_lower())
    }
}
