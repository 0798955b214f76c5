//! The amplitude of polynomials times plane waves.
//!
//! For one wave `b` put `c = kappa + i b` and let the pieces be `q_j(y)`, `y` the distance from the right knot of the piece.
//! With `E_j = exp(-kappa (x_R - x_j))`:
//!
//! ```text
//! F(kappa) = N Sum_waves Sum_pieces exp(i b x_(j+1)) E_(j+1) Int_0^(l_j) q_j(y) exp(-c y) dy            (moments)
//!          = N Sum_waves Sum_knots E_j Sum_n J_jn / c^(n+1),                                              (jumps)
//! J_jn = exp(i b x_j) [n! q_(j-1),n - q_j^(n)(l_j)],
//! ```
//!
//! the second by repeated integration by parts. `J_jn` is formed exactly before its phase is multiplied, so that what is
//! smooth cancels without loss. Jumps are used where `|c|` times the shortest piece exceeds the degree, moments elsewhere;
//! both are enclosures everywhere.
//!
//! **Variation.** The total variation of `psi0` is at most the sum of its jumps `|Sum_waves J_j0|` and of `Int |psi0'| <= Sum_n
//! |q_n| (n l^n + |b| l^(n+1)/(n+1))` over waves and pieces, all times `N`.
//!
//! **Tail.** As `|c| >= kappa`, `kappa |F| <= N Sum |J_jn| E_j kappa^-n`, which falls with `kappa`.
//!
//! **Norm.** `1/N^2 = Sum_pieces Sum_{b, b'} Int q_b conj(q_b') exp(i (b - b') x) dx`, by the same moments with an imaginary `c`;
//! for one wave it is a rational.

use super::amplitude::{CutAmplitude, PreparedAmplitude};
use super::moments::moments;
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::{cos, exp, pi, sin, sqrt};
use crate::packets::waves::{ExactComplex, Polynomial, Wave, WaveNumber, WavePacket};
use crate::routes::RouteFailure;
use crate::routes::spectral::exp_minus_upper;
use rug::{Integer, Rational};

impl CutAmplitude for WavePacket {
    fn half_width(&self) -> Rational {
        WavePacket::half_width(self)
    }

    fn scaled(&self, factor: &Rational) -> Box<dyn CutAmplitude> {
        Box::new(WavePacket::scaled(self, factor))
    }

    fn mirrored(&self) -> Box<dyn CutAmplitude> {
        Box::new(WavePacket::mirrored(self))
    }

    fn is_symmetric(&self) -> bool {
        WavePacket::is_symmetric(self)
    }

    fn is_real(&self) -> bool {
        WavePacket::is_real(self)
    }

    fn prepare(&self, bits: Bits) -> Result<Box<dyn PreparedAmplitude>, RouteFailure> {
        Ok(Box::new(PreparedWaves::new(self, bits)?))
    }
}

struct PreparedWaves {
    bits: Bits,
    /// `N`
    factor: Real,
    /// `x_R - x_j`
    gaps: Vec<Real>,
    /// `l_j`
    lengths: Vec<Real>,
    shortest: f64,
    waves: Vec<PreparedWave>,
    variation: Magnitude,
}

struct PreparedWave {
    /// `b`
    number: Real,
    still: bool,
    degree: usize,
    /// `exp(i b x_j)`
    phases: Vec<Complex>,
    /// `exp(-i b l_j)`
    back_phases: Vec<Complex>,
    /// `q_j`
    pieces: Vec<Vec<Complex>>,
    /// `J_jn`
    jumps: Vec<Vec<Complex>>,
}

impl PreparedWaves {
    fn new(packet: &WavePacket, bits: Bits) -> Result<PreparedWaves, RouteFailure> {
        let real = |value: &Rational| Real::from_rational(value, bits);
        let knots = packet.knots();
        let exact_lengths: Vec<Rational> = knots.windows(2).map(|ends| Rational::from(&ends[1] - &ends[0])).collect();
        let norm = norm(packet, &exact_lengths, bits)?;
        let factor = sqrt(&Real::from_i64(1).div(&norm, bits), bits);
        let end = knots.last().cloned().unwrap_or_default();
        let waves: Vec<PreparedWave> =
            packet.waves().iter().map(|wave| PreparedWave::new(wave, knots, &exact_lengths, bits)).collect();
        let lengths: Vec<Real> = exact_lengths.iter().map(real).collect();
        let shortest = lengths.iter().map(Real::to_f64).fold(f64::INFINITY, f64::min);
        let gaps = knots.iter().map(|knot| real(&Rational::from(&end - knot))).collect();
        let mut prepared =
            PreparedWaves { bits, factor, gaps, lengths, shortest, waves, variation: Magnitude::INFINITY };
        prepared.variation = prepared.bounded_variation();
        Ok(prepared)
    }

    fn bounded_variation(&self) -> Magnitude {
        let mut total = Magnitude::ZERO;
        for knot in 0..self.gaps.len() {
            let mut jump = Complex::zero();
            for wave in &self.waves {
                if let Some(first) = wave.jumps[knot].first() {
                    jump = jump.add(first, self.bits);
                }
            }
            total = total.add(jump.abs_upper());
        }
        for wave in &self.waves {
            let number = wave.number.abs_upper();
            for (piece, length) in wave.pieces.iter().zip(&self.lengths) {
                let length = length.abs_upper();
                let mut power = Magnitude::ONE;
                for (n, coefficient) in piece.iter().enumerate() {
                    let n = n as u64;
                    let slope = power.mul(Magnitude::from_u64(n));
                    power = power.mul(length);
                    let turn = number.mul(power).div(Magnitude::from_u64(n + 1));
                    total = total.add(coefficient.abs_upper().mul(slope.add(turn)));
                }
            }
        }
        total.mul(self.factor.abs_upper())
    }

    /// `E_j`; those that vanish at the working precision become small balls about zero.
    fn decays(&self, kappa: &Real) -> Vec<Real> {
        let negligible = Magnitude::power_of_two(-i64::from(self.bits) - 64);
        let decay = |gap: &Real| {
            let exponent = gap.mul(kappa, self.bits);
            let small = exp_minus_upper(&exponent);
            if small.cmp_value(negligible).is_lt() {
                Real::zero().widen(small)
            } else {
                exp(&exponent.neg(), self.bits)
            }
        };
        self.gaps.iter().map(decay).collect()
    }
}

impl PreparedAmplitude for PreparedWaves {
    fn value(&self, kappa: &Real) -> Complex {
        let bits = self.bits;
        let decays = self.decays(kappa);
        let mut total = Complex::zero();
        for wave in &self.waves {
            let c = Complex::new(kappa.clone(), wave.number.clone());
            let reach = c.re.to_f64().hypot(c.im.to_f64()) * self.shortest;
            let part = if reach > wave.degree as f64 + 2.0 {
                wave.by_jumps(&c, &decays, bits)
            } else {
                wave.by_moments(&c, kappa, &decays, &self.lengths, bits)
            };
            total = total.add(&part, bits);
        }
        total.mul_real(&self.factor, bits)
    }

    fn variation(&self) -> Magnitude {
        self.variation
    }

    fn tail(&self, kappa: &Real) -> Magnitude {
        let inverse = Magnitude::ONE.div(kappa.abs_lower());
        let mut total = Magnitude::ZERO;
        for (knot, gap) in self.gaps.iter().enumerate() {
            let decay = exp_minus_upper(&gap.mul(kappa, self.bits));
            for wave in &self.waves {
                let mut power = decay;
                for jump in &wave.jumps[knot] {
                    total = total.add(jump.abs_upper().mul(power));
                    power = power.mul(inverse);
                }
            }
        }
        total.mul(self.factor.abs_upper())
    }
}

impl PreparedWave {
    fn new(wave: &Wave, knots: &[Rational], lengths: &[Rational], bits: Bits) -> PreparedWave {
        let complex = |value: &ExactComplex| exact(value, bits);
        let phase = |place: &Rational| phase(&wave.number, place, bits);
        let phases: Vec<Complex> = knots.iter().map(phase).collect();
        let jumps = (0..knots.len()).zip(&phases).map(|(knot, phase)| {
            let left = knot.checked_sub(1).and_then(|index| wave.pieces.get(index));
            let right = wave.pieces.get(knot).zip(lengths.get(knot));
            jumps(left, right).iter().map(|jump| complex(jump).mul(phase, bits)).collect()
        });
        PreparedWave {
            jumps: jumps.collect(),
            number: wave_number(&wave.number, bits),
            still: wave.number.is_zero(),
            degree: wave.pieces.iter().map(Vec::len).max().unwrap_or(1).max(1) - 1,
            back_phases: lengths.iter().map(|length| phase(&Rational::from(-length))).collect(),
            pieces: wave.pieces.iter().map(|piece| piece.iter().map(complex).collect()).collect(),
            phases,
        }
    }

    fn by_jumps(&self, c: &Complex, decays: &[Real], bits: Bits) -> Complex {
        let inverse = if self.still {
            Complex::from_real(Real::from_i64(1).div(&c.re, bits))
        } else {
            Complex::from_real(Real::from_i64(1)).div(c, bits)
        };
        let mut total = Complex::zero();
        for (jumps, decay) in self.jumps.iter().zip(decays) {
            let mut sum = Complex::zero();
            for jump in jumps.iter().rev() {
                sum = sum.add(jump, bits).mul(&inverse, bits);
            }
            total = total.add(&sum.mul_real(decay, bits), bits);
        }
        total
    }

    fn by_moments(&self, c: &Complex, kappa: &Real, decays: &[Real], lengths: &[Real], bits: Bits) -> Complex {
        let mut total = Complex::zero();
        for (index, piece) in self.pieces.iter().enumerate() {
            let Some(degree) = piece.len().checked_sub(1) else { continue };
            let length = &lengths[index];
            let decay = self.back_phases[index].mul_real(&exp(&kappa.mul(length, bits).neg(), bits), bits);
            let mut sum = Complex::zero();
            for (coefficient, moment) in piece.iter().zip(moments(c, length, &decay, degree, bits)) {
                sum = sum.add(&coefficient.mul(&moment, bits), bits);
            }
            total = total.add(&sum.mul(&self.phases[index + 1], bits).mul_real(&decays[index + 1], bits), bits);
        }
        total
    }
}

/// `J_jn` without its phase, for `n = 0, 1, ...`; empty where everything is smooth.
fn jumps(left: Option<&Polynomial>, right: Option<(&Polynomial, &Rational)>) -> Polynomial {
    let mut list = left.cloned().unwrap_or_default();
    if let Some((piece, length)) = right {
        // q(l - z) has the derivatives (-1)^n q^(n)(l) at z = 0.
        let derivatives = crate::packets::waves::about_left_knot(piece, length);
        list.resize(list.len().max(derivatives.len()), ExactComplex::default());
        for (n, value) in derivatives.iter().enumerate() {
            list[n] = if n % 2 == 0 { list[n].plus(&value.neg()) } else { list[n].plus(value) };
        }
    }
    let mut factorial = Integer::from(1);
    for (n, value) in list.iter_mut().enumerate() {
        factorial *= (n as u64).max(1);
        *value = value.times(&Rational::from(&factorial));
    }
    while list.last().is_some_and(ExactComplex::is_zero) {
        list.pop();
    }
    list
}

fn exact(value: &ExactComplex, bits: Bits) -> Complex {
    Complex::new(Real::from_rational(&value.re, bits), Real::from_rational(&value.im, bits))
}

/// The wave number as a ball.
fn wave_number(number: &WaveNumber, bits: Bits) -> Real {
    let plain = Real::from_rational(&number.plain, bits);
    if number.pi_part == 0 {
        return plain;
    }
    plain.add(&pi(bits).mul(&Real::from_rational(&number.pi_part, bits), bits), bits)
}

/// `exp(i b x)`.
fn phase(number: &WaveNumber, place: &Rational, bits: Bits) -> Complex {
    if number.is_zero() {
        return Complex::from_real(Real::from_i64(1));
    }
    // Bits before the binary point of the angle are lost to the reduction.
    let turned = number.times(place);
    let size = |value: &Rational| value.numer().significant_bits().saturating_sub(value.denom().significant_bits());
    let fine = bits + 8 + size(&turned.plain).max(size(&turned.pi_part)).min(1 << 16);
    let angle = wave_number(&turned, fine);
    Complex::new(cos(&angle, bits), sin(&angle, bits))
}

/// `Int |psi|^2 dx` before normalisation, to nearly `bits` bits.
fn norm(packet: &WavePacket, lengths: &[Rational], bits: Bits) -> Result<Real, RouteFailure> {
    const MOST_BITS: Bits = 1 << 16;
    let mut fine = bits + 32;
    while fine < MOST_BITS + bits {
        let found = norm_once(packet, lengths, fine);
        if found.certainly_positive() && found.accuracy_estimate() >= f64::from(bits) {
            return Ok(found);
        }
        fine *= 2;
    }
    Err(RouteFailure::OutOfReach { reason: "the terms of the packet nearly cancel: its norm is too small".to_owned() })
}

fn norm_once(packet: &WavePacket, lengths: &[Rational], bits: Bits) -> Real {
    let mut total = Real::zero();
    for (j, left) in packet.waves().iter().enumerate() {
        // Pairs of different waves occur twice, conjugate to each other.
        for (index, right) in packet.waves()[..=j].iter().enumerate() {
            let number = left.number.minus(&right.number);
            let mut sum = Real::zero();
            for (i, length) in lengths.iter().enumerate() {
                let product = product_with_conjugate(&left.pieces[i], &right.pieces[i]);
                sum = sum.add(&integral(&product, &number, &packet.knots()[i + 1], length, bits).re, bits);
            }
            total = total.add(&if index == j { sum } else { sum.shift(1) }, bits);
        }
    }
    total
}

fn product_with_conjugate(left: &[ExactComplex], right: &[ExactComplex]) -> Polynomial {
    let mut list = vec![ExactComplex::default(); (left.len() + right.len()).saturating_sub(1)];
    for (i, x) in left.iter().enumerate() {
        for (j, y) in right.iter().enumerate() {
            list[i + j] = list[i + j].plus(&x.product(&y.conj()));
        }
    }
    if left.is_empty() || right.is_empty() { Vec::new() } else { list }
}

/// `Int q(x_R - x) exp(i b x) dx` over one piece.
fn integral(piece: &[ExactComplex], number: &WaveNumber, end: &Rational, length: &Rational, bits: Bits) -> Complex {
    let Some(degree) = piece.len().checked_sub(1) else { return Complex::zero() };
    let real_length = Real::from_rational(length, bits);
    let c = Complex::new(Real::zero(), wave_number(number, bits));
    let decay = phase(number, &Rational::from(-length), bits);
    let list =
        if number.is_zero() { powers(length, degree, bits) } else { moments(&c, &real_length, &decay, degree, bits) };
    let mut sum = Complex::zero();
    for (coefficient, moment) in piece.iter().zip(list) {
        sum = sum.add(&exact(coefficient, bits).mul(&moment, bits), bits);
    }
    sum.mul(&phase(number, end, bits), bits)
}

/// `Int_0^l y^n dy`.
fn powers(length: &Rational, degree: usize, bits: Bits) -> Vec<Complex> {
    let mut power = Rational::from(1);
    let mut list = Vec::with_capacity(degree + 1);
    for n in 0..=degree {
        power *= length;
        list.push(Complex::from_real(Real::from_rational(&Rational::from(&power / (n as u64 + 1)), bits)));
    }
    list
}
