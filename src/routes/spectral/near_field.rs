//! The double sum over the near nodes, in fixed point.
//!
//! Also used for other packets, whose weights may have either sign.
//!
//! With `T_m = tanh(m h/2)` and `1/(cosh x + cosh y) = (T((x+y)/h) + T((x-y)/h)) / (2 sinh x)` the sum over
//! all pairs with at least one index up to `near` is
//!
//! ```text
//! Sum_k r_k [ w_k T_2k (if k <= near) + 2 Sum_{l < k, l <= near} w_l (T_{k+l} + T_{k-l}) ],   r_k = w_k/(2 sinh kh),
//! ```
//!
//! every term positive for the box. For many nodes the full sum over the near block is done as one product of
//! two big integers (the coefficients of polynomials, packed side by side) for `k + l`, and one with the order of
//! the `w` reversed for `k - l`.
//!
//! **Rounding.** Let all `w`, `r` be off by at most `e` units of `u = 2^-scale` and all `T` by at most
//! two units, `|w|, |r| <= 1/4`, `T <= 1`, and `e u <= 1/8` (checked). Integer products and sums are exact, so with `n`
//! nodes the bracket, a sum of at most `4n + 1` products, is off by at most `(4n + 1)(e + 2)(1 + 2u) u`, and the whole
//! by at most `n (4n + 1) [(1/4 + e u)(e + 2)(1 + 2u) + e/4] u <= n (4n + 1) (2e + 3) u` (as the bracket is at most
//! `(4n+1)/4`). The packed product sums `2n^2` triple products, each off by at most `(2e + 2) u`, which is less.

use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::ln_2;
use crate::routes::{Effort, RouteFailure};
use rug::integer::Order;
use rug::{Integer, Rational};

/// The nodes of a double sum and its precision.
#[derive(Clone)]
pub(in crate::routes) struct Lattice {
    /// Step `h` as a multiple of `ln 2`.
    pub step: Rational,
    /// First node.
    pub first: usize,
    /// Last node of those that all pair with each other.
    pub near: usize,
    /// Last node; those beyond `near` pair with the near ones only.
    pub last: usize,
    /// Working precision.
    pub bits: Bits,
    /// The sums are done in units of `2^-scale`.
    pub scale: u32,
    /// From this many near nodes on, the double sum is done by one big-integer product.
    pub product_from: usize,
}

impl Lattice {
    /// The step as a ball.
    pub(in crate::routes) fn step_ball(&self, bits: Bits) -> Real {
        Real::from_rational(&self.step, bits).mul(&ln_2(bits), bits)
    }

    /// Number of steps in `ln 2`, where it is a whole number.
    pub(in crate::routes) fn octave_parts(&self) -> usize {
        self.step.denom().to_usize().unwrap_or(usize::MAX)
    }
}

/// Weights of the nodes `first..=last` in units of `2^-scale`.
#[derive(Clone, Copy)]
pub(in crate::routes) struct Weights<'a> {
    /// `w_k`, absolutely at most one quarter.
    pub weights: &'a [Integer],
    /// `w_k/(2 sinh kh)`, absolutely at most one quarter.
    pub ratios: &'a [Integer],
    /// Bound of the error of all of them, in units.
    pub error_units: Magnitude,
}

/// The near sum (without `h^2`) as a ball.
pub(in crate::routes) fn sum(
    nodes: &Weights<'_>,
    plan: &Lattice,
    table: &Tangents,
    effort: &Effort,
) -> Result<Real, RouteFailure> {
    let eighth = Magnitude::power_of_two(i64::from(plan.scale) - 3);
    if nodes.error_units.cmp_value(eighth).is_gt() {
        return Err(RouteFailure::OutOfReach {
            reason: "the weights of the spectral sum are too inaccurate".to_owned(),
        });
    }
    let total = if plan.near.saturating_sub(plan.first) >= plan.product_from {
        by_product(nodes, plan, table, effort)?
    } else {
        by_pairs(nodes, plan, table, effort)?
    };
    let count = nodes.weights.len() as u64;
    let units = Magnitude::from_u64(count).mul(Magnitude::from_u64(4 * count + 1));
    let each = nodes.error_units.shift(1).add(Magnitude::from_u64(3));
    let scale = i64::from(plan.scale);
    let value = Real::from_scaled(&total, -3 * scale).round(plan.bits);
    Ok(value.widen(units.mul(each).shift(-scale)))
}

/// `floor(T_m 2^scale)` for the small and for the large indices that occur.
pub(in crate::routes) struct Tangents {
    small: Vec<Integer>,
    large: Vec<Integer>,
    offset: usize,
}

impl Tangents {
    pub(in crate::routes) fn new(plan: &Lattice, effort: &Effort) -> Result<Tangents, RouteFailure> {
        let span = plan.last - plan.first;
        let offset = 2 * plan.first;
        let top = plan.last + plan.near;
        if offset <= span + 1 {
            // One table serves both ranges.
            return Ok(Tangents { small: run(plan, 0, top, effort)?, large: Vec::new(), offset: 0 });
        }
        let small = run(plan, 0, span, effort)?;
        Ok(Tangents { small, large: run(plan, offset, top, effort)?, offset })
    }

    fn at(&self, index: usize) -> &Integer {
        if self.large.is_empty() || index < self.small.len() {
            &self.small[index]
        } else {
            &self.large[index - self.offset]
        }
    }
}

/// `T_m` for `m` in `from..=to`: `(1 - q^m)/(1 + q^m)` with `q^m` by repeated fixed-point products.
///
/// `q^m` is kept with 32 extra bits. The start and the factor `q` are off by at most two of the small units
/// (checked), so each step shrinks the error it has and adds at most two for the factor and one for rounding down: at most
/// `3n + 3` after `n` steps. `T_m`, with derivative at most two in `q^m` and one rounding down, is therefore off by
/// less than two units of `2^-scale` for fewer than `2^29` steps.
fn run(plan: &Lattice, from: usize, to: usize, effort: &Effort) -> Result<Vec<Integer>, RouteFailure> {
    let fine = plan.scale + 32;
    let one = Integer::from(1) << fine;
    let bits = plan.bits.max(plan.scale) + 96;
    let step = plan.step_ball(bits);
    let start = crate::functions::elementary::exp(&step.mul_i64(-(from as i64), bits), bits);
    let decay = crate::functions::elementary::exp(&step.neg(), bits);
    let two_units = |value: Real| {
        let found =
            value.to_fixed(i64::from(fine)).filter(|(_, error)| error.cmp_value(Magnitude::from_u64(2)).is_le());
        let reason = || "the step of the spectral sum is not known well enough".to_owned();
        found.map(|(value, _)| value).ok_or_else(|| RouteFailure::OutOfReach { reason: reason() })
    };
    let (mut power, factor) = (two_units(start)?, two_units(decay)?);
    if to - from >= 1 << 29 {
        return Err(RouteFailure::OutOfReach { reason: "the spectral sum would need too many nodes".to_owned() });
    }
    let mut table = Vec::with_capacity(to - from + 1);
    for index in from..=to {
        if index % 64 == 0 {
            effort.check()?;
        }
        let numerator = Integer::from(&one - &power) << plan.scale;
        table.push(numerator / Integer::from(&one + &power));
        power *= &factor;
        power >>= fine;
    }
    Ok(table)
}

/// The sum pair by pair.
fn by_pairs(nodes: &Weights<'_>, plan: &Lattice, table: &Tangents, effort: &Effort) -> Result<Integer, RouteFailure> {
    let mut total = Integer::new();
    let mut bracket = Integer::new();
    let mut both = Integer::new();
    for k in plan.first..=plan.last {
        effort.check()?;
        bracket.assign_zero();
        for l in plan.first..k.min(plan.near + 1) {
            both.clone_from(table.at(k + l));
            both += table.at(k - l);
            bracket += &both * &nodes.weights[l - plan.first];
        }
        bracket <<= 1;
        if k <= plan.near {
            bracket += &nodes.weights[k - plan.first] * table.at(2 * k);
        }
        total += &bracket * &nodes.ratios[k - plan.first];
    }
    Ok(total)
}

trait AssignZero {
    fn assign_zero(&mut self);
}

impl AssignZero for Integer {
    fn assign_zero(&mut self) {
        rug::Assign::assign(self, 0);
    }
}

/// The same sum with the near block as one packed product.
fn by_product(nodes: &Weights<'_>, plan: &Lattice, table: &Tangents, effort: &Effort) -> Result<Integer, RouteFailure> {
    let near = plan.near - plan.first + 1;
    // Each coefficient of the product is below near * 2^(2 scale - 4) in size, so 64-bit aligned slots never overlap, and
    // half a slot is left for the sign.
    let slot = (2 * plan.scale as usize + 64).div_ceil(64);
    let ratios = pack_signed(nodes.ratios[..near].iter(), slot);
    let mut total = Integer::new();
    for (weights, base) in [
        // Coefficient j of the first product belongs to k + l = 2 first + j, of the second to k - l = j + first - near.
        (pack_signed(nodes.weights[..near].iter(), slot), 2 * plan.first as i64),
        (pack_signed(nodes.weights[..near].iter().rev(), slot), plan.first as i64 - plan.near as i64),
    ] {
        effort.check()?;
        for (index, coefficient) in unpack_signed(&(&ratios * weights), slot).iter().enumerate() {
            let m = base + index as i64;
            let tangent = table.at(m.unsigned_abs() as usize);
            if m < 0 { total -= coefficient * tangent } else { total += coefficient * tangent }
        }
    }
    total += outer_rows(nodes, plan, table, effort)?;
    Ok(total)
}

/// Rows `k > near` of the pair sum.
fn outer_rows(nodes: &Weights<'_>, plan: &Lattice, table: &Tangents, effort: &Effort) -> Result<Integer, RouteFailure> {
    let mut total = Integer::new();
    for k in plan.near + 1..=plan.last {
        effort.check()?;
        let mut bracket = Integer::new();
        for l in plan.first..=plan.near {
            let both = Integer::from(table.at(k + l) + table.at(k - l));
            bracket += both * &nodes.weights[l - plan.first];
        }
        total += (bracket << 1u32) * &nodes.ratios[k - plan.first];
    }
    Ok(total)
}

/// Non-negative integers side by side, `slot` words of 64 bits for each.
pub(super) fn pack<'a>(values: impl Iterator<Item = &'a Integer>, slot: usize) -> Integer {
    let mut limbs: Vec<u64> = Vec::new();
    for value in values {
        let end = limbs.len() + slot;
        limbs.extend(value.to_digits::<u64>(Order::Lsf));
        limbs.resize(end, 0);
    }
    Integer::from_digits(&limbs, Order::Lsf)
}

/// The integers of [`pack`].
pub(super) fn unpack(value: &Integer, slot: usize) -> Vec<Integer> {
    value.to_digits::<u64>(Order::Lsf).chunks(slot).map(|part| Integer::from_digits(part, Order::Lsf)).collect()
}

/// The value at `2^(64 slot)` of the polynomial with these coefficients, of either sign.
pub(in crate::routes) fn pack_signed<'a>(
    values: impl DoubleEndedIterator<Item = &'a Integer> + Clone,
    slot: usize,
) -> Integer {
    if values.clone().all(|value| *value >= 0) {
        return pack(values, slot);
    }
    let zero = Integer::new();
    let part = |positive: bool| pack(values.clone().map(|v| if (*v > 0) == positive { v } else { &zero }), slot);
    part(true) - part(false)
}

/// The coefficients from [`pack_signed`], each below half a slot in size.
pub(in crate::routes) fn unpack_signed(value: &Integer, slot: usize) -> Vec<Integer> {
    let mut list = unpack(value, slot);
    let negative = *value < 0;
    let width = 64 * slot as u32;
    let mut carry = false;
    for digit in &mut list {
        if carry {
            *digit += 1;
        }
        // A digit in the upper half stands for a negative coefficient that borrowed from the next slot.
        carry = digit.significant_bits() >= width;
        if carry {
            *digit -= Integer::from(1) << width;
        }
        if negative {
            *digit *= -1;
        }
    }
    if carry {
        list.push(Integer::from(if negative { -1 } else { 1 }));
    }
    list
}

#[cfg(test)]
mod tests {
    use super::*;

    proptest::proptest! {
        #[test]
        fn packed_products_have_signs(
            left in proptest::collection::vec(-9i64..10, 1..12), right in proptest::collection::vec(-9i64..10, 1..12)
        ) {
            let integers = |list: &[i64]| -> Vec<Integer> { list.iter().map(|v| Integer::from(*v)).collect() };
            let product = pack_signed(integers(&left).iter(), 1) * pack_signed(integers(&right).iter(), 1);
            let found = unpack_signed(&product, 1);
            for n in 0..left.len() + right.len() {
                let term = |i: usize| left.get(i).copied().unwrap_or(0) * right.get(n.wrapping_sub(i)).copied().unwrap_or(0);
                let expected: i64 = (0..=n).map(term).sum();
                proptest::prop_assert_eq!(found.get(n).cloned().unwrap_or_default(), expected);
            }
        }
    }
}
