//! The nodes of the two trapezoid rules: positions `K` on the cut and weights without the factor `h`.

use super::Setting;
use super::plan::Plan;
use crate::arithmetic::{Bits, Real};
use crate::functions::elementary::{cosh, exp, exp_m1, sinh, sqrt, tanh};
use crate::routes::{Effort, RouteFailure};

/// A point measure on the cut.
pub(super) struct Node {
    /// `K >= 1`
    pub position: Real,
    /// With its sign.
    pub weight: Real,
}

/// `e^s`, `e^(s+theta)` and what is made of them.
struct Point {
    near: Real,
    far: Real,
    /// `k = cosh s`
    k: Real,
    /// `l = cosh(s+theta)`
    l: Real,
}

impl Point {
    fn new(setting: &Setting, exp_sigma: &Real, bits: Bits) -> Point {
        let near = exp_sigma.div(&setting.frame.root, bits);
        let far = exp_sigma.mul(&setting.frame.root, bits);
        let half_sum = |x: &Real| x.add(&Real::from_i64(1).div(x, bits), bits).shift(-1);
        Point { k: half_sum(&near), l: half_sum(&far), near, far }
    }

    /// `exp(-Y1) (1 - exp(-2al))/l`
    fn direct(&self, setting: &Setting, bits: Bits) -> Real {
        let gap = gap(&setting.distance_root, &setting.lead_root, &self.near, bits);
        fall(&gap, &self.l, &setting.half_width, bits)
    }

    /// `exp(-Y2) (1 - exp(-2ak))/k`
    fn mirrored(&self, setting: &Setting, bits: Bits) -> Real {
        let gap = gap(&setting.lead_root, &setting.distance_root, &self.far, bits);
        fall(&gap, &self.k, &setting.half_width, bits)
    }
}

/// `u sqrt(x) - v / sqrt(x)`, whose square is the exponent `Y`.
fn gap(u: &Real, v: &Real, x: &Real, bits: Bits) -> Real {
    let root = sqrt(x, bits);
    u.mul(&root, bits).sub(&v.div(&root, bits), bits)
}

fn fall(gap: &Real, position: &Real, half_width: &Real, bits: Bits) -> Real {
    let exponent = position.mul(half_width, bits).shift(1).neg();
    // Far out the exponential is tiny, and so is its spread: a difference from one keeps that, `exp_m1` does not.
    let growth = if exponent.to_f64() < -1.0 {
        Real::from_i64(1).sub(&exp(&exponent, bits), bits)
    } else {
        exp_m1(&exponent, bits).neg()
    };
    exp(&gap.square(bits).neg(), bits).mul(&growth, bits).div(position, bits)
}

/// Both exponents `Y1`, `Y2` at the outer point `w`, for bounds.
pub(super) fn outer_exponents(setting: &Setting, w: &Real, bits: Bits) -> (Real, Real) {
    let sinh_sigma = setting.frame.q.mul(&cosh(w, bits), bits);
    let point = Point::new(setting, &exp_asinh(&sinh_sigma, bits), bits);
    let first = gap(&setting.distance_root, &setting.lead_root, &point.near, bits);
    let second = gap(&setting.lead_root, &setting.distance_root, &point.far, bits);
    (first.square(bits), second.square(bits))
}

/// `r1 e^(s/2) - r2 e^(-s/2)` at the outer point `w`: negative on the left of the least exponent.
pub(super) fn outer_gap(setting: &Setting, w: &Real, bits: Bits) -> Real {
    let sinh_sigma = setting.frame.q.mul(&cosh(w, bits), bits);
    let point = Point::new(setting, &exp_asinh(&sinh_sigma, bits), bits);
    gap(&setting.distance_root, &setting.lead_root, &point.near, bits)
}

/// The same at the inner point `z`.
pub(super) fn inner_gap(setting: &Setting, z: &Real, bits: Bits) -> Real {
    let point = Point::new(setting, &exp_inner(setting, z, bits), bits);
    gap(&setting.distance_root, &setting.lead_root, &point.near, bits)
}

/// `e^sigma` for `sinh sigma` given.
fn exp_asinh(sinh_sigma: &Real, bits: Bits) -> Real {
    sinh_sigma.add(&sqrt(&sinh_sigma.square(bits).add(&Real::from_i64(1), bits), bits), bits)
}

/// `e^sigma = sqrt((1+y)/(1-y))`, `y = T tanh z`; `1 - |y| >= 1 - T` is formed without harm as `T < 1`.
fn exp_inner(setting: &Setting, z: &Real, bits: Bits) -> Real {
    let y = setting.frame.q.div(&setting.frame.c, bits).mul(&tanh(z, bits), bits);
    let one = Real::from_i64(1);
    sqrt(&one.add(&y, bits).div(&one.sub(&y, bits), bits), bits)
}

/// Nodes of `A`: two for each `w = k h`.
pub(super) fn outer(setting: &Setting, plan: &Plan, effort: &Effort) -> Result<Vec<Node>, RouteFailure> {
    let bits = plan.bits;
    let step = Real::from_rational(&plan.step, bits);
    let mut nodes = Vec::with_capacity(2 * (plan.outer_last + 1 - plan.outer_first).max(0) as usize);
    for index in plan.outer_first..=plan.outer_last {
        effort.check()?;
        let w = step.mul_i64(index, bits);
        let sinh_sigma = setting.frame.q.mul(&cosh(&w, bits), bits);
        let point = Point::new(setting, &exp_asinh(&sinh_sigma, bits), bits);
        let cosh_sigma = sqrt(&sinh_sigma.square(bits).add(&Real::from_i64(1), bits), bits);
        let density = setting.frame.q.mul(&sinh(&w, bits), bits).square(bits).div(&cosh_sigma, bits);
        let direct = density.mul(&point.direct(setting, bits), bits);
        let mirrored = density.mul(&point.mirrored(setting, bits), bits).neg();
        nodes.push(Node { position: point.k, weight: direct });
        nodes.push(Node { position: point.l, weight: mirrored });
    }
    Ok(nodes)
}

/// Nodes of `B`.
pub(super) fn inner(setting: &Setting, plan: &Plan, effort: &Effort) -> Result<Vec<Node>, RouteFailure> {
    let bits = plan.bits;
    let step = Real::from_rational(&plan.step, bits);
    let square = setting.frame.c.square(bits);
    let scale = setting.frame.q.square(bits).mul(&square, bits);
    let mut nodes = Vec::with_capacity((plan.inner_last + 1 - plan.inner_first).max(0) as usize);
    for index in plan.inner_first..=plan.inner_last {
        effort.check()?;
        let z = step.mul_i64(index, bits);
        let point = Point::new(setting, &exp_inner(setting, &z, bits), bits);
        let bell = sinh(&z, bits).square(bits).add(&square, bits);
        let density = scale.div(&bell.mul(&sqrt(&bell, bits), bits), bits);
        nodes.push(Node { weight: density.mul(&point.direct(setting, bits), bits), position: point.k });
    }
    Ok(nodes)
}
