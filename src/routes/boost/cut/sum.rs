//! The double sum `Sum_ij W_i W_j/(K_i + K_j)` of a point measure.
//!
//! It is formed from the midpoints with plain rounding to `p` bits; the error is bounded once for all. By the
//! inequality of arithmetic and geometric means `1/(K + K') <= 1/(2 sqrt(K K'))`, so with `B = Sum
//! |W_i|/sqrt(K_i)` (upper bounds over the balls) the sum of the absolute values is at most `B^2/2`.
//!
//! * Rounding: each term passes one addition (of positive numbers), one reciprocal, two products and at most
//!   `2n` additions of partial sums, each partial sum being bounded by the sum of absolute values: together at
//!   most `2 (2n + 8) 2^-p B^2/2` for `n < 2^20`, `p >= 32`, the factor two covering the higher orders. Numbers
//!   below MPFR's range (`2^-(2^62)`) are flushed to zero, which `2^-(2^40)` covers.
//! * Weights with radii `r_i`, or dropped as `|W_i| <= r_i`: at most `B R + R^2/2` with `R = Sum r_i/sqrt(K_i)`.
//! * Positions with relative radii at most `e <= 1/4`: each quotient changes by at most the factor `1/(1 - e) -
//!   1 <= 2e`, so at most `e B^2`.

use super::nodes::Node;
use crate::arithmetic::{Bits, Magnitude, Real, rounding};
use crate::routes::{Effort, RouteFailure};
use rayon::prelude::*;
use rug::{Assign, Float};

/// The sum as a ball.
pub(super) fn cauchy(nodes: &[Node], bits: Bits, effort: &Effort) -> Result<Real, RouteFailure> {
    let (sizes, whole) = sizes(nodes);
    // A node this small counts as a ball around zero.
    let least = whole.shift(-i64::from(bits) - 4);
    let mut kept = Vec::with_capacity(nodes.len());
    let mut dropped = Magnitude::ZERO;
    for (node, size) in nodes.iter().zip(&sizes) {
        if size.cmp_value(least).is_gt() {
            kept.push(node);
        } else {
            dropped = dropped.add(*size);
        }
    }
    let nodes = kept.as_slice();
    let rows: Vec<Float> = (0..nodes.len())
        .into_par_iter()
        .map(|index| {
            effort.check()?;
            Ok(row(nodes, index, bits))
        })
        .collect::<Result<_, RouteFailure>>()?;
    let mut total = Float::new(bits);
    for value in &rows {
        total += value;
    }
    Ok(Real::from_float(total).widen(error(nodes, whole, dropped, bits)))
}

/// `W_i (W_i/(2 K_i) + 2 Sum_{j<i} W_j/(K_i + K_j))`, rounded.
fn row(nodes: &[&Node], index: usize, bits: Bits) -> Float {
    let mut inner = Float::new(bits);
    let Some((node, before)) = nodes.get(..=index).and_then(<[&Node]>::split_last) else {
        return inner;
    };
    let position = node.position.midpoint();
    let mut quotient = Float::new(bits);
    for other in before {
        quotient.assign(position + other.position.midpoint());
        quotient.recip_mut();
        quotient *= other.weight.midpoint();
        inner += &quotient;
    }
    quotient.assign(node.weight.midpoint() / position);
    inner <<= 1u32;
    quotient >>= 1u32;
    inner += &quotient;
    inner *= node.weight.midpoint();
    inner
}

/// `|W_i|/sqrt(K_i)` and their sum, from above.
fn sizes(nodes: &[Node]) -> (Vec<Magnitude>, Magnitude) {
    let sizes: Vec<Magnitude> = nodes.iter().map(|node| node.weight.abs_upper().div(root_below(node))).collect();
    let whole = sizes.iter().fold(Magnitude::ZERO, |sum, size| sum.add(*size));
    (sizes, whole)
}

fn root_below(node: &Node) -> Magnitude {
    Magnitude::from_float_down(&rounding::down(64, node.position.lower(64).sqrt_ref()))
}

/// The bound derived above; `dropped` counts like radii.
fn error(nodes: &[&Node], whole: Magnitude, dropped: Magnitude, bits: Bits) -> Magnitude {
    let (mut spread, mut position) = (dropped, Magnitude::ZERO);
    for node in nodes {
        spread = spread.add(node.weight.radius().div(root_below(node)));
        position = position.max(node.position.radius().div(node.position.abs_lower()));
    }
    let quarter = Magnitude::power_of_two(-2);
    if position.cmp_value(quarter).is_gt() || nodes.len() >= 1 << 20 || bits < 32 {
        return Magnitude::INFINITY;
    }
    let square = whole.mul(whole);
    let count = Magnitude::from_u64(2 * nodes.len() as u64 + 8);
    let rounding = square.mul(count).shift(-i64::from(bits));
    let from_weights = whole.mul(spread).add(spread.mul(spread).shift(-1));
    let flushed = Magnitude::power_of_two(-(1 << 40));
    rounding.add(from_weights).add(square.mul(position)).add(flushed)
}
