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
//! |q_n| ((l^n if n > 0) + |b| l^(n+1)/(n+1))` over waves and pieces, all times `N`.
//!
//! **Tail.** As `|c| >= kappa`, `kappa |F| <= N Sum |J_jn| E_j kappa^-n`, which falls with `kappa`; without the last knot it bounds
//! what the right edge alone leaves out.
//!
//! **Norm.** `1/N^2 = Sum_pieces Sum_{b, b'} Int q_b conj(q_b') exp(i (b - b') x) dx`, by the same moments with an imaginary `c`;
//! for one wave it is a rational.

use super::amplitude::{CutAmplitude, EdgeWave, PreparedAmplitude};
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
        Box::new(ExactWaves::new(WavePacket::scaled(self, factor)))
    }

    fn mirrored(&self) -> Box<dyn CutAmplitude> {
        Box::new(ExactWaves::new(WavePacket::mirrored(self)))
    }

    fn is_symmetric(&self) -> bool {
        WavePacket::is_symmetric(self)
    }

    fn is_real(&self) -> bool {
        WavePacket::is_real(self)
    }

    fn prepare(&self, bits: Bits) -> Result<Box<dyn PreparedAmplitude>, RouteFailure> {
        ExactWaves::new(self.clone()).prepare(bits)
    }
}

/// A packet with all that is exact and needed at every precision.
struct ExactWaves {
    packet: WavePacket,
    real: bool,
    /// `l_j`
    lengths: Vec<Rational>,
    /// `J_jn` without the phase, for each wave and knot.
    jumps: Vec<Vec<Polynomial>>,
    /// `Int Sum_b |q_b|^2`
    diagonal_norm: Rational,
    /// `q_b conj(q_b')` on the pieces, and `b - b'`, for each pair of different waves.
    products: Vec<(WaveNumber, Vec<Polynomial>)>,
}

impl ExactWaves {
    fn new(packet: WavePacket) -> ExactWaves {
        let knots = packet.knots();
        let lengths: Vec<Rational> = knots.windows(2).map(|ends| Rational::from(&ends[1] - &ends[0])).collect();
        let jumps_of = |wave: &Wave| -> Vec<Polynomial> {
            let at = |knot: usize| {
                let left = knot.checked_sub(1).and_then(|index| wave.pieces.get(index));
                jumps(left, wave.pieces.get(knot).zip(lengths.get(knot)))
            };
            (0..knots.len()).map(at).collect()
        };
        let mut diagonal_norm = Rational::new();
        let mut products = Vec::new();
        for (j, left) in packet.waves().iter().enumerate() {
            for right in &packet.waves()[..j] {
                let pieces = left.pieces.iter().zip(&right.pieces).map(|(x, y)| product_with_conjugate(x, y));
                products.push((left.number.minus(&right.number), pieces.collect()));
            }
            for (piece, length) in left.pieces.iter().zip(&lengths) {
                let mut power = Rational::from(1);
                for (n, value) in product_with_conjugate(piece, piece).iter().enumerate() {
                    power *= length;
                    diagonal_norm += Rational::from(&value.re * &power) / (n as u64 + 1);
                }
            }
        }
        ExactWaves {
            real: packet.is_real(),
            jumps: packet.waves().iter().map(jumps_of).collect(),
            lengths,
            diagonal_norm,
            products,
            packet,
        }
    }

    /// `1/N^2` to nearly `bits` bits.
    fn norm(&self, bits: Bits) -> Result<Real, RouteFailure> {
        const MOST_BITS: Bits = 1 << 16;
        let mut fine = bits + 32;
        while fine < MOST_BITS + bits {
            let found = self.norm_once(fine);
            if found.certainly_positive() && found.accuracy_estimate() >= f64::from(bits) {
                return Ok(found);
            }
            fine *= 2;
        }
        let reason = "the terms of the packet nearly cancel: its norm is too small".to_owned();
        Err(RouteFailure::OutOfReach { reason })
    }

    fn norm_once(&self, bits: Bits) -> Real {
        let mut total = Real::from_rational(&self.diagonal_norm, bits);
        for (number, pieces) in &self.products {
            let c = Complex::new(Real::zero(), wave_number(number, bits));
            for ((piece, length), end) in pieces.iter().zip(&self.lengths).zip(&self.packet.knots()[1..]) {
                let Some(degree) = piece.len().checked_sub(1) else { continue };
                let decay = phase(number, &Rational::from(-length), bits);
                let moments = moments(&c, &Real::from_rational(length, bits), &decay, degree, bits);
                let mut sum = Complex::zero();
                for (coefficient, moment) in piece.iter().zip(moments) {
                    sum = sum.add(&exact(coefficient, bits).mul(&moment, bits), bits);
                }
                // Each pair occurs twice, conjugate to each other.
                total = total.add(&sum.mul(&phase(number, end, bits), bits).re.shift(1), bits);
            }
        }
        total
    }
}

impl CutAmplitude for ExactWaves {
    fn half_width(&self) -> Rational {
        self.packet.half_width()
    }

    fn scaled(&self, factor: &Rational) -> Box<dyn CutAmplitude> {
        CutAmplitude::scaled(&self.packet, factor)
    }

    fn mirrored(&self) -> Box<dyn CutAmplitude> {
        CutAmplitude::mirrored(&self.packet)
    }

    fn is_symmetric(&self) -> bool {
        self.packet.is_symmetric()
    }

    fn is_real(&self) -> bool {
        self.real
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
    /// The different lengths of pieces.
    lengths: Vec<Real>,
    /// Which of them each piece has.
    class: Vec<usize>,
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
    /// `exp(-i b l)` for the different lengths.
    back_phases: Vec<Complex>,
    /// `q_j`
    pieces: Vec<Vec<Complex>>,
    /// `J_jn`
    jumps: Vec<Vec<Complex>>,
}

impl PreparedWaves {
    fn new(exact: &ExactWaves, bits: Bits) -> Result<PreparedWaves, RouteFailure> {
        let real = |value: &Rational| Real::from_rational(value, bits);
        let factor = sqrt(&Real::from_i64(1).div(&exact.norm(bits)?, bits), bits);
        let knots = exact.packet.knots();
        let end = knots.last().cloned().unwrap_or_default();
        let mut different: Vec<Rational> = Vec::new();
        let mut class = Vec::with_capacity(exact.lengths.len());
        for length in &exact.lengths {
            let known = different.iter().position(|other| other == length);
            class.push(known.unwrap_or(different.len()));
            if known.is_none() {
                different.push(length.clone());
            }
        }
        let waves = exact.packet.waves().iter().zip(&exact.jumps);
        let waves = waves.map(|(wave, jumps)| PreparedWave::new(wave, jumps, knots, &different, bits)).collect();
        let lengths: Vec<Real> = different.iter().map(real).collect();
        let shortest = lengths.iter().map(Real::to_f64).fold(f64::INFINITY, f64::min);
        let gaps = knots.iter().map(|knot| real(&Rational::from(&end - knot))).collect();
        let mut prepared =
            PreparedWaves { bits, factor, gaps, lengths, class, shortest, waves, variation: Magnitude::INFINITY };
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
            for (piece, class) in wave.pieces.iter().zip(&self.class) {
                let length = self.lengths[*class].abs_upper();
                let mut power = Magnitude::ONE;
                for (n, coefficient) in piece.iter().enumerate() {
                    let slope = if n == 0 { Magnitude::ZERO } else { power };
                    power = power.mul(length);
                    let turn = number.mul(power).div(Magnitude::from_u64(n as u64 + 1));
                    total = total.add(coefficient.abs_upper().mul(slope.add(turn)));
                }
            }
        }
        total.mul(self.factor.abs_upper())
    }

    /// `N Sum |J_jn| E_j kappa^-n` over the first knots.
    fn tail_of(&self, kappa: &Real, knots: usize) -> Magnitude {
        let inverse = Magnitude::ONE.div(kappa.abs_lower());
        let mut total = Magnitude::ZERO;
        for (knot, gap) in self.gaps.iter().enumerate().take(knots) {
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

    /// `exp(-kappa l)` for the different lengths; those that vanish at the working precision become small balls about zero.
    fn steps(&self, kappa: &Real) -> Vec<Real> {
        let negligible = Magnitude::power_of_two(-i64::from(self.bits) - 64);
        let decay = |length: &Real| {
            let exponent = length.mul(kappa, self.bits);
            let small = exp_minus_upper(&exponent);
            if small.cmp_value(negligible).is_lt() {
                Real::zero().widen(small)
            } else {
                exp(&exponent.neg(), self.bits)
            }
        };
        self.lengths.iter().map(decay).collect()
    }

    /// `E_j`
    fn decays(&self, steps: &[Real]) -> Vec<Real> {
        let mut list = vec![Real::from_i64(1)];
        for (index, class) in self.class.iter().rev().enumerate() {
            let next = if index == 0 { steps[*class].clone() } else { list[index].mul(&steps[*class], self.bits) };
            list.push(next);
        }
        list.reverse();
        list
    }
}

impl PreparedAmplitude for PreparedWaves {
    fn value(&self, kappa: &Real) -> Complex {
        let bits = self.bits;
        let steps = self.steps(kappa);
        let decays = self.decays(&steps);
        let mut total = Complex::zero();
        for wave in &self.waves {
            let c = Complex::new(kappa.clone(), wave.number.clone());
            let reach = c.re.to_f64().hypot(c.im.to_f64()) * self.shortest;
            let part = if reach > wave.degree as f64 + 2.0 {
                wave.by_jumps(&c, &decays, bits)
            } else {
                wave.by_moments(&c, &steps, &decays, self)
            };
            total = total.add(&part, bits);
        }
        total.mul_real(&self.factor, bits)
    }

    fn variation(&self) -> Magnitude {
        self.variation
    }

    fn tail(&self, kappa: &Real) -> Magnitude {
        self.tail_of(kappa, self.gaps.len())
    }

    fn edge(&self) -> Vec<EdgeWave> {
        let at_edge = |wave: &PreparedWave| EdgeWave {
            number: wave.number.clone(),
            jumps: wave.jumps.last().into_iter().flatten().map(|j| j.mul_real(&self.factor, self.bits)).collect(),
        };
        self.waves.iter().map(at_edge).collect()
    }

    fn inner_tail(&self, kappa: &Real) -> Magnitude {
        self.tail_of(kappa, self.gaps.len() - 1)
    }
}

impl PreparedWave {
    fn new(wave: &Wave, jumps: &[Polynomial], knots: &[Rational], lengths: &[Rational], bits: Bits) -> PreparedWave {
        let complex = |value: &ExactComplex| exact(value, bits);
        let phases: Vec<Complex> = knots.iter().map(|place| phase(&wave.number, place, bits)).collect();
        let back = |length: &Rational| phase(&wave.number, &Rational::from(-length), bits);
        let with_phase = |(list, phase): (&Polynomial, &Complex)| -> Vec<Complex> {
            list.iter().map(|jump| complex(jump).mul(phase, bits)).collect()
        };
        PreparedWave {
            jumps: jumps.iter().zip(&phases).map(with_phase).collect(),
            number: wave_number(&wave.number, bits),
            still: wave.number.is_zero(),
            degree: wave.pieces.iter().map(Vec::len).max().unwrap_or(1).max(1) - 1,
            back_phases: lengths.iter().map(back).collect(),
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

    fn by_moments(&self, c: &Complex, steps: &[Real], decays: &[Real], all: &PreparedWaves) -> Complex {
        let bits = all.bits;
        let lists: Vec<Vec<Complex>> = (0..steps.len())
            .map(|class| {
                let decay = self.back_phases[class].mul_real(&steps[class], bits);
                moments(c, &all.lengths[class], &decay, self.degree, bits)
            })
            .collect();
        let mut total = Complex::zero();
        for (index, piece) in self.pieces.iter().enumerate() {
            let mut sum = Complex::zero();
            for (coefficient, moment) in piece.iter().zip(&lists[all.class[index]]) {
                sum = sum.add(&coefficient.mul(moment, bits), bits);
            }
            if !self.still {
                sum = sum.mul(&self.phases[index + 1], bits);
            }
            total = total.add(&sum.mul_real(&decays[index + 1], bits), bits);
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

fn product_with_conjugate(left: &[ExactComplex], right: &[ExactComplex]) -> Polynomial {
    let mut list = vec![ExactComplex::default(); (left.len() + right.len()).saturating_sub(1)];
    for (i, x) in left.iter().enumerate() {
        for (j, y) in right.iter().enumerate() {
            list[i + j] = list[i + j].plus(&x.product(&y.conj()));
        }
    }
    if left.is_empty() || right.is_empty() { Vec::new() } else { list }
}
