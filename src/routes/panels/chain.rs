//! `Q` on one panel from all its knots, and the constants of integration handed to the next panel.
//!
//! On a panel `s = s_c + h x` put `Phi~_j = Phi_j / h^(j-1)`; then `Phi~_(j+1) = Int_x^1 Phi~_j` plus its value at
//! the right end, a division for each coefficient. `Phi~_1 = F e^(-i kappa v)` needs no constant besides that of `F`.
//! Each knot hands `F` and `Phi_2, Phi_3, ...` at the left end of its panel to the next one. With the weights
//!
//! ```text
//! W_kj = (-1)^j h^j c_kj,    V_kj = (-1)^j h^j i c_k(j-1),
//! Q = Sum W_kj Phi~_(j+1)(x - y_k) + kappa Sum V_kj Phi~_(j+1)(x - y_k),
//! ```
//!
//! exact over a common denominator, a component of `Q` is off by at most `Sum |W| error` (absolute values of both
//! parts added) and one unit for each coefficient. At the cone the outermost knot carries `2 t F` instead of `F`, and
//! its weights are divided by `2 t`.

use super::Side;
use super::expansion::{ComplexList, Expansion, Factor, add_weighted};
use super::shape::Knot;
use crate::arithmetic::{Complex, Magnitude, Real};
use crate::packets::piecewise::ExactComplex;
use crate::routes::RouteFailure;
use crate::routes::kernel::BOUND_BITS;
use crate::routes::kernel::panel::fixed;
use rug::{Integer, Rational};

/// Values of one knot's functions at a point.
#[derive(Clone)]
pub(super) struct Carried {
    /// `F`.
    pub base: Real,
    /// `Phi_2, Phi_3, ...`.
    pub upper: Vec<Complex>,
}

/// The geometry of one panel.
pub(super) struct Frame<'a> {
    /// `ds/dx`.
    pub stretch: &'a Rational,
    /// Units are `2^-scale`.
    pub scale: u32,
}

/// `Phi~_1, Phi~_2, ...` of one knot, all multiplied by `factor`.
pub(super) struct Levels {
    pub list: Vec<Expansion>,
    pub factor: Rational,
}

/// All functions of a knot from `F` times `factor` on the panel.
pub(super) fn levels(
    first: Expansion,
    wave: Option<&Factor>,
    (carried, factor): (&Carried, Rational),
    frame: &Frame<'_>,
) -> Result<Levels, RouteFailure> {
    let bits = frame.scale + 64;
    let mut list = vec![match wave {
        Some(wave) => first.times(wave, frame.scale),
        None => first,
    }];
    let inverse = Rational::from(frame.stretch.recip_ref());
    let mut ratio = factor.clone();
    for value in &carried.upper {
        ratio *= &inverse;
        let right = value.mul_real(&Real::from_rational(&ratio, bits), bits);
        let next = match list.last() {
            Some(previous) => previous.integrated(&right, frame.scale)?,
            None => Expansion::zero(),
        };
        list.push(next);
    }
    Ok(Levels { list, factor })
}

/// The values of `Phi_2, ...` at the left end, for levels whose factor is one.
pub(super) fn at_left(levels: &Levels, frame: &Frame<'_>) -> Vec<Complex> {
    let bits = frame.scale + 64;
    let mut power = Rational::from(1);
    let mut list = Vec::with_capacity(levels.list.len());
    for level in levels.list.iter().skip(1) {
        power *= frame.stretch;
        list.push(level.at_left(frame.scale).mul_real(&Real::from_rational(&power, bits), bits));
    }
    list
}

/// `Q` on the panel.
pub(super) fn combined(
    side: &Side,
    knots: &[Levels],
    kappa: Option<&Real>,
    frame: &Frame<'_>,
) -> Result<Expansion, RouteFailure> {
    let plain = weighted(knots, &weights(&side.shape.knots, knots, frame.stretch, false), frame.scale);
    let Some(kappa) = kappa else { return Ok(plain) };
    let turned = weighted(knots, &weights(&side.shape.knots, knots, frame.stretch, true), frame.scale);
    let scale = frame.scale + 32;
    let (number, number_error) = fixed(kappa, scale)?;
    let error = turned.bound(frame.scale).mul(number_error.shift(-i64::from(scale)));
    let error = error.add(kappa.abs_upper().mul(turned.error));
    let mut sum = plain;
    let pairs: [(&mut Vec<Integer>, Vec<Integer>); 4] = [
        (&mut sum.regular.re, turned.regular.re),
        (&mut sum.regular.im, turned.regular.im),
        (&mut sum.logarithm.re, turned.logarithm.re),
        (&mut sum.logarithm.im, turned.logarithm.im),
    ];
    let mut count = 0;
    for (target, list) in pairs {
        let scaled: Vec<Integer> = list.into_iter().map(|value| (value * &number) >> scale).collect();
        count = count.max(scaled.len() as u64);
        add_weighted(target, &scaled, &Integer::from(1));
    }
    let rounding = Magnitude::from_u64(count).shift(-i64::from(frame.scale));
    sum.error = sum.error.add(error).add(rounding);
    Ok(sum)
}

/// `W_kj`, or `V_kj` if `turned`, divided by the factor of the knot.
fn weights(knots: &[Knot], levels: &[Levels], stretch: &Rational, turned: bool) -> Vec<Vec<ExactComplex>> {
    let minus = Rational::from(-stretch);
    let of_knot = |(knot, levels): (&Knot, &Levels)| {
        let mut power = Rational::from(levels.factor.recip_ref());
        let mut list = Vec::with_capacity(levels.list.len());
        for j in 0..levels.list.len() {
            let jump = if turned { j.checked_sub(1).and_then(|i| knot.jumps.get(i)) } else { knot.jumps.get(j) };
            let jump = jump.cloned().unwrap_or_default();
            // i (x + i y) = -y + i x.
            let jump = if turned { ExactComplex::new(-jump.im, jump.re) } else { jump };
            list.push(jump.times(&power));
            power *= &minus;
        }
        list
    };
    knots.iter().zip(levels).map(of_knot).collect()
}

/// `Sum weight * level`.
fn weighted(knots: &[Levels], weights: &[Vec<ExactComplex>], scale: u32) -> Expansion {
    let mut common = Integer::from(1);
    for weight in weights.iter().flatten() {
        common.lcm_mut(weight.re.denom());
        common.lcm_mut(weight.im.denom());
    }
    let scaled = |value: &Rational| Integer::from(&common / value.denom()) * value.numer();
    let mut sum = Expansion::zero();
    for (level, weight) in knots.iter().zip(weights).flat_map(|(levels, list)| levels.list.iter().zip(list)) {
        if weight.is_zero() {
            continue;
        }
        let (re, im) = (scaled(&weight.re), scaled(&weight.im));
        let size = |value: &Rational| Real::from_rational(value, BOUND_BITS).abs_upper();
        sum.error = sum.error.add(size(&weight.re).add(size(&weight.im)).mul(level.error));
        for (target, list) in [(&mut sum.regular, &level.regular), (&mut sum.logarithm, &level.logarithm)] {
            add_product(target, list, &re, &im);
        }
    }
    let mut count = 0;
    for list in [&mut sum.regular, &mut sum.logarithm] {
        list.re.iter_mut().chain(list.im.iter_mut()).for_each(|value| *value /= &common);
        count = count.max(list.len() as u64);
    }
    sum.error = sum.error.add(Magnitude::from_u64(count).shift(-i64::from(scale)));
    sum
}

/// `target += (re + i im) list`.
fn add_product(target: &mut ComplexList, list: &ComplexList, re: &Integer, im: &Integer) {
    add_weighted(&mut target.re, &list.re, re);
    add_weighted(&mut target.re, &list.im, &Integer::from(-im));
    add_weighted(&mut target.im, &list.im, re);
    add_weighted(&mut target.im, &list.re, im);
}
