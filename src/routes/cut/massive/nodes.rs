//! The weights of the massive sum at its nodes.

use super::super::Problem;
use super::super::amplitude::{CutAmplitude, PreparedAmplitude};
use super::{Place, Sizes};
use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::elementary::exp;
use crate::routes::spectral::near_field::{Lattice, Weights};
use crate::routes::spectral::one_minus_exp;
use crate::routes::{Effort, RouteFailure};
use rug::Integer;

/// The weights of all parts of the amplitude in fixed point.
pub(super) struct Nodes {
    weights: [Vec<Integer>; 2],
    ratios: [Vec<Integer>; 2],
    error_units: Magnitude,
    count: usize,
}

impl Nodes {
    pub(super) fn new(
        amplitude: &dyn CutAmplitude,
        problem: &Problem,
        sizes: &Sizes,
        lattice: &Lattice,
        effort: &Effort,
    ) -> Result<Nodes, RouteFailure> {
        let mut nodes = Nodes {
            weights: [Vec::new(), Vec::new()],
            ratios: [Vec::new(), Vec::new()],
            error_units: Magnitude::ZERO,
            count: if amplitude.is_real() { 1 } else { 2 },
        };
        let mut tables = Tables::new(amplitude, problem, lattice, lattice.bits)?;
        for k in lattice.first..=lattice.last {
            effort.check()?;
            loop {
                let (weight, ratio) = tables.weight(sizes, k);
                let scale = i64::from(lattice.scale);
                let radius = weight.re.radius().max(weight.im.radius()).shift(scale).log2_estimate();
                // Cancellation inside the amplitude is met with more bits, within reason.
                if radius > 3.0 && tables.bits < 64 * lattice.bits + 4096 {
                    let missing = if radius.is_finite() { radius.min(1e6) as u32 } else { tables.bits };
                    let more = (tables.bits + missing + 32).max(tables.bits + tables.bits / 4);
                    effort.allow_bits(more)?;
                    tables = Tables::new(amplitude, problem, lattice, more)?;
                    continue;
                }
                nodes.push(&weight, &ratio, scale)?;
                break;
            }
        }
        Ok(nodes)
    }

    fn push(&mut self, weight: &Complex, ratio: &Complex, scale: i64) -> Result<(), RouteFailure> {
        let parts = [(&weight.re, &ratio.re), (&weight.im, &ratio.im)];
        for (index, (weight, ratio)) in parts.into_iter().enumerate().take(self.count) {
            for (list, value) in [(&mut self.weights[index], weight), (&mut self.ratios[index], ratio)] {
                let (integer, error) = value.to_fixed(scale).ok_or_else(no_enclosure)?;
                self.error_units = self.error_units.max(error);
                list.push(integer);
            }
        }
        Ok(())
    }

    pub(super) fn parts(&self) -> impl Iterator<Item = Weights<'_>> {
        (0..self.count).map(|index| Weights {
            weights: &self.weights[index],
            ratios: &self.ratios[index],
            error_units: self.error_units,
        })
    }
}

pub(in crate::routes::cut) fn no_enclosure() -> RouteFailure {
    RouteFailure::OutOfReach { reason: "a term of the spectral sum has no finite enclosure".to_owned() }
}

/// Everything for evaluating weights at one precision.
struct Tables {
    bits: Bits,
    amplitude: Box<dyn PreparedAmplitude>,
    place: Place,
    at_cone: bool,
    /// `h/2`
    half_step: Real,
    /// `e^(h/2)`
    growth: Real,
    /// `e^(kh/2)` at the node reached.
    half: Option<(usize, Real)>,
}

impl Tables {
    fn new(
        amplitude: &dyn CutAmplitude,
        problem: &Problem,
        lattice: &Lattice,
        bits: Bits,
    ) -> Result<Tables, RouteFailure> {
        let half_step = lattice.step_ball(bits + 32).shift(-1);
        Ok(Tables {
            bits,
            amplitude: amplitude.prepare(bits)?,
            place: Place::new(problem, bits),
            at_cone: problem.distance == 0,
            growth: exp(&half_step, bits),
            half_step,
            half: None,
        })
    }

    /// `e^(kh/2)`, by a product from the node before.
    fn half_power(&mut self, index: usize) -> Real {
        let value = match &self.half {
            Some((at, value)) if *at == index => value.clone(),
            Some((at, value)) if at + 1 == index => value.mul(&self.growth, self.bits),
            _ => exp(&self.half_step.mul_i64(index as i64, self.bits + 32), self.bits),
        };
        self.half = Some((index, value.clone()));
        value
    }

    /// `w` and `w/(2 sinh x)` at the node, in units of `W`.
    fn weight(&mut self, sizes: &Sizes, index: usize) -> (Complex, Complex) {
        let bits = self.bits;
        let half = self.half_power(index);
        let whole = half.square(bits);
        let inverse = Real::from_i64(1).div(&whole, bits);
        let sinh = whole.sub(&inverse, bits).shift(-1);
        let cosh = whole.add(&inverse, bits).shift(-1);
        let exponent =
            if self.at_cone { self.place.time.mul(&inverse, bits) } else { self.place.gap(&half, bits).square(bits) };
        let rise = one_minus_exp(&self.place.time.mul(&sinh, bits).shift(1), bits, bits);
        let base = exp(&exponent.neg(), bits).mul(&rise, bits).shift(-2 - sizes.exponent);
        let ratio = self.amplitude.value(&cosh).mul_real(&base, bits);
        (ratio.mul_real(&sinh.shift(1), bits), ratio)
    }
}
