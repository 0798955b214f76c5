//! The far nodes in closed form, for a region that begins at the cone.
//!
//! Far out only the right edge of the packet counts: with `z = e^-x`, `kappa + i b = (1 + 2 i b z + z^2)/(2z)` and `sinh x = (1 -
//! z^2)/(2z)`, the weight in units of `W` is `v/4` up to an error, where
//!
//! ```text
//! v(z) = (2/W) exp(-t z) (1 - z^2) Sum_waves Sum_n J_n (2z)^n / (1 + 2 i b z + z^2)^(n+1) = Sum alpha_i z^i
//! ```
//!
//! or its imaginary part. The double sum over the far nodes is then that of the box with other coefficients
//! ([`crate::routes::spectral`], module `far_field`).
//!
//! **Coefficients.** Those of `exp(-tz)(1 - z^2)` are elementary; division by `1 + 2 i b z + z^2` is `a_i = b_i - 2 i b a_(i-1) - a_(i-2)`;
//! the sum over `n` is done from the last term inwards. All are scaled by the powers of the first far `z`.
//!
//! **Majorant.** With all signs positive, `V(r) = (2/W) exp(t r) (1 + r^2) Sum |J_n| (2r)^n / (1 - 2 |b| r - r^2)^(n+1)`.
//!
//! **Replacement.** The weight is `1/(2W) exp(-tz) (1 - exp(-2 t sinh x)) F sinh x`. With `|kappa F| <= V <= W/4` and the bound `T'` of what the
//! edge leaves out, `|w - v/4| <= exp(-t/z)/8 + T'/(2W) =: rho`, as `t z + 2 t sinh x = t/z`; it falls with `x`. As `|w| <= 1/8`, `|v/4| <= 1/4`
//! for `rho <= 1/8`, and replacing all far weights changes `S` by at most `2 rho (1/4) h^2 Sum Sum 1/(cosh + cosh) <= rho pi^2/8 < 5/4 rho`.

use super::amplitude::{EdgeWave, PreparedAmplitude};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::exp;
use crate::routes::spectral::far_field::FarWeights;
use crate::routes::spectral::{BOUND_BITS, exp_minus_upper};
use std::f64::consts::LN_2;

/// One part (real or imaginary) of the far weights.
pub(super) struct EdgeSeries<'a> {
    pub waves: &'a [EdgeWave],
    /// For the bounds.
    pub amplitude: &'a dyn PreparedAmplitude,
    pub time: Real,
    /// `W = 2^exponent`
    pub exponent: i64,
    pub imaginary: bool,
}

impl EdgeSeries<'_> {
    /// The radius within which the series converges, in double precision.
    pub(super) fn radius(&self) -> f64 {
        let number = self.waves.iter().map(|wave| wave.number.to_f64().abs()).fold(0.0, f64::max);
        1.0 / (number + number.hypot(1.0))
    }

    /// Ratios `lambda` to try from rapidity `x`, and about `ln V(lambda Z)` once or twice, whichever is larger.
    fn ratios(&self, x: f64) -> impl Iterator<Item = (f64, f64)> {
        let z = (-x).exp();
        let most = 0.9 * self.radius();
        let ratios = (1..40).map(|index| 1.5f64.powi(index)).take_while(move |lambda| lambda * z <= most);
        ratios.map(move |lambda| {
            let radius = Real::from_float(rug::Float::with_val(53, lambda * z));
            let size = self.majorant(&radius).log2_estimate() * LN_2;
            (lambda, size.max(2.0 * size) + 8.0)
        })
    }

    /// `rho` from `z` on.
    pub(super) fn error(&self, start: &Real) -> Magnitude {
        let bits = BOUND_BITS;
        let inverse = Real::from_i64(1).div(start, bits);
        let kappa = inverse.add(start, bits).shift(-1);
        let late = exp_minus_upper(&self.time.mul(&inverse, bits)).shift(-3);
        late.add(self.amplitude.inner_tail(&kappa).shift(-1 - self.exponent))
    }
}

impl FarWeights for EdgeSeries<'_> {
    fn coefficients(&self, start: &Real, count: usize, bits: Bits) -> Vec<Real> {
        let square = start.square(bits);
        let ratio = self.time.mul(start, bits).neg();
        let mut exponential = vec![Real::from_i64(1)];
        for i in 1..count {
            exponential.push(exponential[i - 1].mul(&ratio, bits).div_u64(i as u64, bits));
        }
        let numerator: Vec<Real> = (0..count)
            .map(|i| match i.checked_sub(2) {
                Some(back) => exponential[i].sub(&exponential[back].mul(&square, bits), bits),
                None => exponential[i].clone(),
            })
            .collect();
        let mut total = vec![Real::zero(); count];
        for wave in self.waves {
            for (sum, value) in total.iter_mut().zip(wave_series(wave, &numerator, start, &square, bits)) {
                let part = if self.imaginary { value.im } else { value.re };
                *sum = sum.add(&part.shift(1 - self.exponent), bits);
            }
        }
        total
    }

    fn majorant(&self, radius: &Real) -> Magnitude {
        let bits = BOUND_BITS;
        let one = Real::from_i64(1);
        let square = radius.square(bits);
        let mut total = Magnitude::ZERO;
        for wave in self.waves {
            let below = one.sub(&wave.number.abs().mul(radius, bits).shift(1), bits).sub(&square, bits);
            if !below.certainly_positive() {
                return Magnitude::INFINITY;
            }
            let inverse = Magnitude::ONE.div(below.abs_lower());
            let ratio = radius.abs_upper().shift(1).mul(inverse);
            let mut power = inverse;
            for jump in &wave.jumps {
                total = total.add(jump.abs_upper().mul(power));
                power = power.mul(ratio);
            }
        }
        let growth = exp(&self.time.mul(radius, bits), bits).mul(&one.add(&square, bits), bits);
        total.mul(growth.abs_upper()).shift(1 - self.exponent)
    }

    fn series_length(&self, x: f64, goal: f64) -> (usize, f64) {
        let mut best = (f64::INFINITY, 2.0);
        for (lambda, growth) in self.ratios(x) {
            let terms = ((goal + growth) / lambda.ln()).max(2.0);
            if terms < best.0 {
                best = (terms, lambda);
            }
        }
        (best.0.min(1e6) as usize + 2, best.1)
    }

    fn ratio_for(&self, x: f64, _goal: f64, terms: usize) -> f64 {
        let bound = |(lambda, growth): (f64, f64)| (growth - terms as f64 * lambda.ln(), lambda);
        self.ratios(x).map(bound).fold((f64::INFINITY, 2.0), |best, new| if new.0 < best.0 { new } else { best }).1
    }

    fn replacement_error(&self, start: &Real) -> Magnitude {
        let rho = self.error(start);
        if rho.cmp_value(Magnitude::power_of_two(-3)).is_gt() {
            return Magnitude::INFINITY;
        }
        rho.mul(Magnitude::from_u64(5)).shift(-2)
    }
}

/// The series of one wave times the numerator, without the factor `2/W`.
fn wave_series(wave: &EdgeWave, numerator: &[Real], start: &Real, square: &Real, bits: Bits) -> Vec<Complex> {
    // 2 i b Z
    let turn = wave.number.mul(start, bits).shift(1);
    let double = start.shift(1);
    let mut series = vec![Complex::zero(); numerator.len()];
    for jump in wave.jumps.iter().rev() {
        let mut next: Vec<Complex> = Vec::with_capacity(numerator.len());
        for (i, value) in numerator.iter().enumerate() {
            let mut term = jump.mul_real(value, bits);
            if i >= 1 {
                term = term.add(&series[i - 1].mul_real(&double, bits), bits);
                // - 2 i b Z a = 2 b Z (Im a - i Re a)
                let turned = Complex::new(next[i - 1].im.clone(), next[i - 1].re.neg());
                term = term.add(&turned.mul_real(&turn, bits), bits);
            }
            if i >= 2 {
                term = term.sub(&next[i - 2].mul_real(square, bits), bits);
            }
            next.push(term);
        }
        series = next;
    }
    series
}
