//! The weights for a region that begins at the cone, in fixed point.
//!
//! There (`d = 0`), with `z = e^-x`,
//!
//! ```text
//! w = 1/4 (exp(-t z) - exp(-t/z)) (1 - exp(-a z) exp(-a/z)) (1 - z^2)/(1 + z^2),
//! w/(2 sinh x) = 1/4 (exp(-t z) - exp(-t/z)) (1 - exp(-a z) exp(-a/z)) z/(1 + z^2).
//! ```
//!
//! The step is `ln 2 / p` with an integer `p`, so `z_k = 2^(-k/p)` and `exp(-t z_(k-p)) = exp(-t z_k)^2`,
//! `exp(-t/z_(k+p)) = exp(-t/z_k)^2`: only `p` exponentials of each kind are evaluated, all others are squares.
//!
//! **Rounding.** Unit `2^-f`, all values in `[0, 1]`. Squaring and rounding down takes an error of `e` units to at most
//! `2e + 1 + e^2 2^-f`; with `e < 2^(f-40)` the sum `e + 1` grows by at most `2 + 2^-40` each time, so after `n` octaves
//! `e + 1 <= 1.001 * 2^n (e_0 + 1) =: eps`. The powers `z_k` are off by at most two units. Following the products (each
//! adds the errors of its factors and one unit, `1/(1 + z^2) <= 1` has slope at most one in `z^2`) gives at most
//! `5 eps + 20` units for either weight before the factor 1/4. With `n + 16` guard bits that is a small part of a unit
//! of the double sum.

use super::nodes::fixed;
use super::plan::Plan;
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::exp;
use crate::routes::{Effort, RouteFailure, TailProblem};
use rug::{Integer, Rational};

/// `floor(2^(-k/p) 2^bits)` for all `k >= 0`, each off by less than two units.
pub(super) struct Powers {
    base: Vec<Integer>,
}

impl Powers {
    pub(super) fn new(plan: &Plan, bits: u32) -> Result<Powers, RouteFailure> {
        let parts = plan.octave_parts();
        let step = plan.step_ball(bits + 8);
        let base = (0..parts)
            .map(|j| {
                let value = exp(&step.mul_i64(-(j as i64), bits + 8), bits + 8);
                Ok(fixed(&value, bits)?.0)
            })
            .collect::<Result<Vec<Integer>, RouteFailure>>()?;
        Ok(Powers { base })
    }

    /// `2^(-k/p)` in fixed point.
    pub(super) fn at(&self, k: usize) -> Integer {
        let parts = self.base.len();
        Integer::from(&self.base[k % parts] >> (k / parts) as u32)
    }
}

/// Weights and ratios `w/(2 sinh x)` of the nodes in units of `2^-scale`, and the bound of their errors.
pub(super) struct ConeWeights {
    pub weights: Vec<Integer>,
    pub ratios: Vec<Integer>,
    pub error_units: Magnitude,
}

/// Exponentials `exp(-rate e^(±x_k))` for all nodes.
struct Exponentials {
    list: Vec<Integer>,
    /// Error of the ones evaluated directly.
    start: Magnitude,
}

impl Exponentials {
    /// `exp(-rate 2^(k/p))` for `k` from `from`, counting upward (`sign = 1`) or downward (`sign = -1`), `count` of them.
    fn new(plan: &Plan, rate: &Rational, from: i64, sign: i64, count: usize, fine: u32) -> Result<Self, RouteFailure> {
        let parts = plan.octave_parts();
        // exp(-y) to an absolute 2^-fine needs log2(y) more bits for y.
        let bits = fine + 16 + size_bits(rate) + (from.unsigned_abs() / parts as u64).min(1 << 16) as u32;
        let step = plan.step_ball(bits);
        let rate = Real::from_rational(rate, bits).neg();
        let mut list: Vec<Integer> = Vec::with_capacity(count);
        let mut start = Magnitude::ZERO;
        for index in 0..count {
            if index < parts {
                let place = from + sign * index as i64;
                // Both families grow in the direction of the list.
                let power = exp(&step.mul_i64(place * sign, bits), bits);
                let (value, error) = fixed(&exp(&rate.mul(&power, bits), bits), fine)?;
                start = start.max(error);
                list.push(value);
            } else {
                let square = Integer::from(list[index - parts].square_ref());
                list.push(square >> fine);
            }
        }
        Ok(Exponentials { list, start })
    }
}

fn size_bits(rate: &Rational) -> u32 {
    let bits = i64::from(rate.numer().significant_bits()) - i64::from(rate.denom().significant_bits());
    bits.clamp(0, 4096) as u32 + 1
}

impl ConeWeights {
    pub(super) fn new(problem: &TailProblem, plan: &Plan, effort: &Effort) -> Result<ConeWeights, RouteFailure> {
        let parts = plan.octave_parts();
        let count = plan.last - plan.first + 1;
        let octaves = count.div_ceil(parts) as u32;
        let guard = octaves + 16;
        let fine = plan.scale + guard;
        let rising = |rate| Exponentials::new(plan, rate, plan.first as i64, 1, count, fine);
        let falling = |rate| Exponentials::new(plan, rate, plan.last as i64, -1, count, fine);
        let families = [
            rising(&problem.time)?,
            falling(&problem.time)?,
            rising(&problem.half_width)?,
            falling(&problem.half_width)?,
        ];
        effort.check()?;
        let start = families.iter().fold(Magnitude::ZERO, |m, f| m.max(f.start));
        let [time_up, time_down, width_up, width_down] = families.map(|family| family.list);
        let powers = Powers::new(plan, fine)?;
        let one = Integer::from(1) << fine;
        let whole = Integer::from(1) << (2 * fine);
        let mut result = ConeWeights {
            weights: Vec::with_capacity(count),
            ratios: Vec::with_capacity(count),
            error_units: Magnitude::ZERO,
        };
        for index in 0..count {
            let mirror = count - 1 - index;
            let mut both = Integer::from(&width_up[index] * &width_down[mirror]);
            both >>= fine;
            both = &one - both;
            let mut rise = Integer::from(&time_down[mirror] - &time_up[index]);
            rise *= both;
            rise >>= fine + 2;
            let z = powers.at(plan.first + index);
            let square = Integer::from(z.square_ref()) >> fine;
            let inverse = &whole / Integer::from(&one + &square);
            rise *= inverse;
            rise >>= fine;
            let weight = (&one - square) * &rise;
            result.weights.push(weight >> (fine + guard));
            result.ratios.push((rise * z) >> (fine + guard));
        }
        // 1.001 * 2^octaves (e_0 + 1) <= 2^octaves (e_0 + 1) * 1025/1024.
        let grown = start.add(Magnitude::ONE).shift(i64::from(octaves)).mul(Magnitude::from_u64(1025)).shift(-10);
        if grown.cmp_value(Magnitude::power_of_two(i64::from(fine) - 40)).is_ge() {
            let reason = "the exponentials of the spectral sum are too inaccurate".to_owned();
            return Err(RouteFailure::OutOfReach { reason });
        }
        let units = grown.mul(Magnitude::from_u64(5)).add(Magnitude::from_u64(20)).shift(-i64::from(guard));
        result.error_units = units.add(Magnitude::ONE);
        Ok(result)
    }
}
