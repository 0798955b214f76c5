//! The square of a sum of waves, integrated over an interval.
//!
//! For nodes `v_k(x) = v_k exp(i p_k x)` the result is `Sum_kl [v_k conj v_l]/(i (p_k - conj p_l))` between the
//! two ends. The diagonal gives `-[|v|^2]/(2 Im p)`, or `|v|^2` times the length for a real `p`; two conjugate
//! terms give twice the real part of one.
//!
//! **Rounding.** The pairs are summed from midpoints with plain rounding to `p` bits (`u = 2^-p`). With `g =
//! 1/(i (p_k - conj p_l))` as computed, `|g|_1` the sum of the absolute values of its parts, `V` upper bounds of
//! `|v|` over the balls, `r_v`, `r_p` radii (of either part, so that discs have at most twice that): a term `v_k
//! conj(v_l) g` is computed with some ten operations on parts, each with a relative error `u` of a quantity
//! bounded by the product of the norms, and at most `2n` additions follow; so for `n < 2^20` rounding adds at
//! most `(4n + 64) u V_k V_l |g|_1` for each pair and end, the momenta `4 V_k V_l |g|_1^2 (r_pk + r_pl)`
//! provided `|g|_1 (r_pk + r_pl) <= 1/8`, and the amplitudes `2 (V_k r_vl + V_l r_vk) |g|_1`; all twice for the
//! conjugate pair.

use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::routes::{Effort, RouteFailure};
use rayon::prelude::*;
use rug::{Assign, Float};

/// One wave.
#[derive(Clone, Debug)]
pub(super) struct Node {
    /// `p`
    pub momentum: Complex,
    /// `v` at the first end.
    pub first: Complex,
    /// `v` at the second end, `None` for zero.
    pub second: Option<Complex>,
    /// For a real momentum, the length of the interval.
    pub wave_length: Option<Real>,
}

impl Node {
    /// The largest absolute value in the interval.
    pub(super) fn largest(&self) -> Magnitude {
        let second = self.second.as_ref().map_or(Magnitude::ZERO, Complex::abs_upper);
        self.first.abs_upper().max(second)
    }

    /// This node's own term.
    fn diagonal(&self, bits: Bits) -> Real {
        let square = self.first.norm_squared(bits);
        if let Some(length) = &self.wave_length {
            return square.mul(length, bits);
        }
        let end = self.second.as_ref().map_or_else(Real::zero, |value| value.norm_squared(bits));
        square.sub(&end, bits).div(&self.momentum.im.shift(1), bits)
    }
}

/// Midpoints and bounds of one end.
struct Column {
    re: Float,
    im: Float,
    size: Magnitude,
    radius: Magnitude,
}

impl Column {
    fn new(value: &Complex) -> Column {
        Column {
            re: value.re.midpoint().clone(),
            im: value.im.midpoint().clone(),
            size: value.abs_upper(),
            radius: value.re.radius().max(value.im.radius()),
        }
    }
}

struct Row {
    re: Float,
    im: Float,
    radius: Magnitude,
    ends: Vec<Column>,
}

/// The double sum.
pub(super) fn hermitian(nodes: &[Node], bits: Bits, effort: &Effort) -> Result<Real, RouteFailure> {
    let rows: Vec<Row> = nodes
        .iter()
        .map(|node| Row {
            re: node.momentum.re.midpoint().clone(),
            im: node.momentum.im.midpoint().clone(),
            radius: node.momentum.re.radius().max(node.momentum.im.radius()),
            ends: std::iter::once(&node.first).chain(node.second.as_ref()).map(Column::new).collect(),
        })
        .collect();
    let parts: Vec<(Float, Magnitude)> = (0..rows.len())
        .into_par_iter()
        .map(|index| {
            effort.check()?;
            Ok(pairs(&rows, index, bits))
        })
        .collect::<Result<_, RouteFailure>>()?;
    let mut total = Real::zero();
    for ((part, error), node) in parts.into_iter().zip(nodes) {
        total = total.add(&Real::from_float(part).widen(error), bits);
        total = total.add(&node.diagonal(bits), bits);
    }
    Ok(total)
}

/// Twice the real part of the terms of node `index` with all before it, and the bound of the error.
fn pairs(rows: &[Row], index: usize, bits: Bits) -> (Float, Magnitude) {
    let new = || Float::new(bits);
    let Some((row, before)) = rows.get(..=index).and_then(<[Row]>::split_last) else {
        return (new(), Magnitude::INFINITY);
    };
    // Sums of conj(v_l) g at each end.
    let mut sums: Vec<(Float, Float)> = row.ends.iter().map(|_| (new(), new())).collect();
    let (mut x, mut y, mut norm, mut g_re, mut g_im) = (new(), new(), new(), new(), new());
    let mut error = Magnitude::ZERO;
    let unit = Magnitude::from_u64(4 * rows.len() as u64 + 64).shift(-i64::from(bits));
    let eighth = Magnitude::power_of_two(-3);
    for other in before {
        // p_k - conj p_l = x + i y, g = 1/(i x - y) = (-y - i x)/(x^2 + y^2)
        x.assign(&row.re - &other.re);
        y.assign(&row.im + &other.im);
        norm.assign(x.square_ref());
        g_re.assign(y.square_ref());
        norm += &g_re;
        g_re.assign(&y / &norm);
        g_im.assign(&x / &norm);
        let size = Magnitude::from_float(&g_re).add(Magnitude::from_float(&g_im));
        let shaken = size.mul(row.radius.add(other.radius));
        if shaken.cmp_value(eighth).is_gt() {
            return (new(), Magnitude::INFINITY);
        }
        let relative = unit.add(shaken.shift(2));
        for ((sum, mine), theirs) in sums.iter_mut().zip(&row.ends).zip(&other.ends) {
            // conj(v) g with g = -(y + i x)/norm: minus the product is subtracted.
            norm.assign(&theirs.re * &g_re);
            sum.0 -= &norm;
            norm.assign(&theirs.im * &g_im);
            sum.0 -= &norm;
            norm.assign(&theirs.re * &g_im);
            sum.1 -= &norm;
            norm.assign(&theirs.im * &g_re);
            sum.1 += &norm;
            let rounding = mine.size.mul(theirs.size).mul(relative);
            let spread = mine.size.mul(theirs.radius).add(mine.radius.mul(theirs.size)).shift(1);
            error = error.add(size.mul(rounding.add(spread)).shift(1));
        }
    }
    let mut total = new();
    for (place, (sum, mine)) in sums.iter().zip(&row.ends).enumerate() {
        norm.assign(&sum.0 * &mine.re);
        x.assign(&sum.1 * &mine.im);
        norm -= &x;
        // The second end counts positive, the first negative.
        if place == 0 { total -= &norm } else { total += &norm }
    }
    (total << 1u32, error)
}
