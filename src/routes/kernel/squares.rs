//! `Int_{-1}^{1} q(x)^2 dx` for a polynomial in fixed point.
//!
//! By Lemma K1 the numbers `b_n = (-1)^n q_n` are positive. Writing `q` as an even and an odd part,
//!
//! ```text
//! Int_{-1}^{1} q^2 dx = Sum_j 2/(2j+1) (E^2)_j + Sum_j 2/(2j+3) (O^2)_j,    E_j = b_2j,  O_j = b_(2j+1).
//! ```
//!
//! Computed coefficients that come out negative are rounding noise about a positive number; setting
//! them to zero brings them nearer to the truth. Short lists are multiplied out; long ones are
//! squared as one big integer with the coefficients packed side by side. There the coefficients
//! below half the precision (`high`) are paired only with the upper half of the bits of the others
//! (`low`), and their own square is bounded instead of computed:
//! dropping `h` bits of every `low` changes `2 Sum low high` by at most `2 * 2^h * count * Sum high`, and
//! `Sum high^2 <= (Sum high)^2`; all weights are at most two.

use crate::arithmetic::{Magnitude, Real};
use rug::integer::Order;
use rug::{Float, Integer};

/// From this many coefficients on, packed products are used.
const PACK_FROM: usize = 96;

/// `(-1)^n (near_n - shifted_n)`, negative results set to zero.
pub(super) fn difference(near: Vec<Integer>, shifted: Vec<Integer>) -> Vec<Integer> {
    let mut list = near;
    for (value, other) in list.iter_mut().zip(&shifted) {
        *value -= other;
    }
    // A longer shifted series would be cut here; its terms are part of its truncation bound only
    // if it is not longer, so extend instead.
    for extra in shifted.iter().skip(list.len()) {
        list.push(Integer::from(-extra));
    }
    for (n, value) in list.iter_mut().enumerate() {
        if n % 2 == 1 {
            *value = -std::mem::take(value);
        }
        if *value < 0 {
            *value = Integer::new();
        }
    }
    list
}

/// The integral for coefficients in units of `2^-scale`.
pub(super) fn integral(coefficients: &[Integer], scale: u32) -> Real {
    weighted(coefficients, scale, square)
}

/// The same for coefficients of either sign.
pub(in crate::routes) fn signed_integral(coefficients: &[Integer], scale: u32) -> Real {
    weighted(coefficients, scale, |list| {
        if list.len() < PACK_FROM {
            return (by_pairs(list), Magnitude::ZERO);
        }
        let list: Vec<Integer> = list.iter().map(|value| (*value).clone()).collect();
        (signed_product(&list, &list), Magnitude::ZERO)
    })
}

/// The two sums over the squares that `square` computes, with its bound of the sum of their errors.
fn weighted(coefficients: &[Integer], scale: u32, square: impl Fn(&[&Integer]) -> (Vec<Integer>, Magnitude)) -> Real {
    let even: Vec<&Integer> = coefficients.iter().step_by(2).collect();
    let odd: Vec<&Integer> = coefficients.iter().skip(1).step_by(2).collect();
    // Fractions are cut to `guard` bits below the unit: one unit for each of them at most.
    const GUARD: u32 = 16;
    let mut total = Integer::new();
    let mut cuts = 0u64;
    let mut error = Magnitude::ZERO;
    for (list, offset) in [(even, 1u64), (odd, 3u64)] {
        let (square, slack) = square(&list);
        error = error.add(slack);
        for (j, value) in square.into_iter().enumerate() {
            total += (value << (GUARD + 1)) / (2 * j as u64 + offset);
            cuts += 1;
        }
    }
    let unit = -2 * i64::from(scale);
    let bits = total.significant_bits().clamp(64, 2 * scale.max(64));
    let value = Real::from_scaled(&total, unit - i64::from(GUARD)).round(bits.min(scale + 64));
    let cut = Magnitude::from_u64(cuts).shift(-i64::from(GUARD));
    value.widen(error.shift(1).add(cut).shift(unit))
}

/// Coefficients of the square, and a bound of the sum of their errors.
fn square(list: &[&Integer]) -> (Vec<Integer>, Magnitude) {
    if list.len() < PACK_FROM { (by_pairs(list), Magnitude::ZERO) } else { packed(list) }
}

fn by_pairs(list: &[&Integer]) -> Vec<Integer> {
    let count = list.len();
    if count == 0 {
        return Vec::new();
    }
    (0..2 * count - 1)
        .map(|sum| {
            let first = (sum + 1).saturating_sub(count);
            let mut value = Integer::new();
            for i in first..sum.div_ceil(2) {
                value += list[i] * list[sum - i];
            }
            value <<= 1;
            if sum % 2 == 0 {
                value += list[sum / 2].square_ref();
            }
            value
        })
        .collect()
}

fn packed(list: &[&Integer]) -> (Vec<Integer>, Magnitude) {
    let widest = list.iter().map(|v| v.significant_bits()).max().unwrap_or(0);
    let bound = (widest / 2).saturating_sub(12);
    let split = list.iter().rposition(|v| v.significant_bits() > bound).map_or(0, |index| index + 1);
    let (low, high) = list.split_at(split);
    let room = 64 - (list.len() as u64).leading_zeros();
    let slot = (2 * widest + room).div_ceil(64) as usize;
    let packed_low = pack(low.iter().copied(), slot);
    let mut result = unpack(&packed_low.square(), slot);
    result.resize(2 * list.len() - 1, Integer::new());
    if high.is_empty() {
        return (result, Magnitude::ZERO);
    }
    let cut = widest / 2;
    let slot = (widest - cut + bound + room).div_ceil(64) as usize;
    let shortened: Vec<Integer> = low.iter().map(|v| Integer::from(*v >> cut)).collect();
    let product = pack(shortened.iter(), slot) * pack(high.iter().copied(), slot);
    for (index, value) in unpack(&product, slot).into_iter().enumerate() {
        if let Some(target) = result.get_mut(split + index) {
            *target += value << (cut + 1);
        }
    }
    let sum: Integer = high.iter().copied().sum();
    let sum = Magnitude::from_float(&Float::with_val_round(64, &sum, rug::float::Round::Up).0);
    let dropped = sum.mul(Magnitude::from_u64(low.len() as u64)).shift(i64::from(cut) + 1);
    (result, dropped.add(sum.mul(sum)))
}

/// Coefficients of the product of two polynomials with coefficients of either sign.
pub(in crate::routes) fn signed_product(first: &[Integer], second: &[Integer]) -> Vec<Integer> {
    if first.is_empty() || second.is_empty() {
        return Vec::new();
    }
    if first.len().min(second.len()) < PACK_FROM {
        return product_by_pairs(first, second);
    }
    let widest = |list: &[Integer]| list.iter().map(|v| v.significant_bits()).max().unwrap_or(0);
    let count = first.len() + second.len() - 1;
    let room = 66 - (count as u64).leading_zeros();
    let slot = (widest(first) + widest(second) + room).div_ceil(64) as usize;
    // One list given twice is squared, which is cheaper than a product.
    let product = if std::ptr::eq(first, second) {
        pack_signed(first, slot).square()
    } else {
        pack_signed(first, slot) * pack_signed(second, slot)
    };
    // An offset of half a slot makes every slot non-negative.
    let half = Integer::from(1) << (64 * slot as u32 - 1);
    let offset = pack((0..count).map(|_| &half), slot);
    let mut list = unpack(&(product + offset), slot);
    list.resize(count, Integer::new());
    list.iter_mut().for_each(|value| *value -= &half);
    list
}

fn product_by_pairs(first: &[Integer], second: &[Integer]) -> Vec<Integer> {
    let mut list = vec![Integer::new(); first.len() + second.len() - 1];
    for (i, x) in first.iter().enumerate() {
        for (target, y) in list[i..].iter_mut().zip(second) {
            *target += x * y;
        }
    }
    list
}

/// The packed polynomial; slots borrow from the next where coefficients are negative.
fn pack_signed(list: &[Integer], slot: usize) -> Integer {
    let zero = Integer::new();
    let positive = pack(list.iter().map(|v| if *v > 0 { v } else { &zero }), slot);
    let negated: Vec<Integer> = list.iter().map(|v| if *v < 0 { Integer::from(-v) } else { Integer::new() }).collect();
    positive - pack(negated.iter(), slot)
}

fn pack<'a>(values: impl Iterator<Item = &'a Integer>, slot: usize) -> Integer {
    let mut limbs: Vec<u64> = Vec::new();
    for value in values {
        let end = limbs.len() + slot;
        limbs.extend(value.to_digits::<u64>(Order::Lsf));
        limbs.resize(end, 0);
    }
    Integer::from_digits(&limbs, Order::Lsf)
}

fn unpack(value: &Integer, slot: usize) -> Vec<Integer> {
    value.to_digits::<u64>(Order::Lsf).chunks(slot).map(|part| Integer::from_digits(part, Order::Lsf)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn packed_squares_agree_with_pairs() {
        let values: Vec<Integer> =
            (0..150u32).map(|n| (Integer::from(1) << (600 - 4 * n.min(149))) / (3 * n + 7) + n).collect();
        let list: Vec<&Integer> = values.iter().collect();
        let (fast, slack) = packed(&list);
        let slow = by_pairs(&list);
        let mut difference = Integer::new();
        for (x, y) in fast.iter().zip(&slow) {
            difference += Integer::from(x - y).abs();
        }
        let bound = slack.to_float();
        assert!(bound >= difference, "{difference} exceeds {bound}");
    }
}
