//! Moments of the packet, for regions farther away than its own size.
//!
//! With `z = y_c - y` the distance to the left of the middle, `M_k = Int z^k psi0 dz = a^(k+1) M~_k`. For polynomial
//! pieces, by the differences `E_ki` of the coefficients left and right of each knot (those of `(y/a)^i`, with
//! `eta_k = y_k/a`),
//!
//! ```text
//! m~_l = a^(-l-1) Int y^l p(y) dy = Sum_k Sum_i E_ki eta_k^(l+i+1)/(l+i+1),
//! M~_k = (-1)^k Sum_j (i kappa a)^j/j! m~_(k+j),
//! ```
//!
//! for a wave `e^(i kappa y)`; cosine and sine keep the even and the odd `j`. As `|y| <= a`, both are at most
//! `B = (2 N'/a)^(1/2)` with `N' = Int |p|^2`.
//!
//! **Rounding.** `eta^n` in fixed point is off by at most `n` units (each step rounds once and multiplies by
//! `|eta| <= 1`), which the division by `n` takes back: `m~_l` is off by at most `Sum |E|` units, one for each term
//! and one for the common denominator. The factors `omega_j = (kappa a)^j/j!` are balls; those beyond
//! `J >= 2 kappa a` sum to at most `2 omega_J`.

use super::expansion::ComplexList;
use super::shape::Shape;
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::sqrt;
use crate::packets::piecewise::{Carrier, ExactComplex, expanded_about};
use crate::routes::kernel::BOUND_BITS;
use crate::routes::kernel::panel::fixed;
use crate::routes::{Effort, RouteFailure};
use rug::{Integer, Rational};

/// `M~_0, M~_1, ...` in units of `2^-scale`.
pub(super) struct Moments {
    pub list: ComplexList,
    pub scale: u32,
    /// Bound of the error of each component.
    pub error: Magnitude,
    /// Bound of all moments.
    pub size: Magnitude,
}

/// `Int |psi0| / a`, at most `sqrt(2 norm/a)`.
pub(super) fn size_bound(shape: &Shape, times: u32) -> Magnitude {
    let ratio = Rational::from(&shape.norm / &shape.half_width) * (2 * times);
    sqrt(&Real::from_rational(&ratio, BOUND_BITS), BOUND_BITS).abs_upper()
}

impl Moments {
    /// The first `count` moments; `kappa` is the wave number of the carrier.
    pub(super) fn new(
        shape: &Shape,
        kappa: Option<&Real>,
        count: usize,
        scale: u32,
        effort: &Effort,
    ) -> Result<Moments, RouteFailure> {
        let size = size_bound(shape, 1);
        let Some(kappa) = kappa else {
            let (mut list, error) = polynomial_moments(shape, count, scale, effort)?;
            alternate(&mut list);
            return Ok(Moments { list, scale, error, size });
        };
        let bits = kappa.midpoint().prec();
        let angle = kappa.mul(&Real::from_rational(&shape.half_width, bits), bits).abs();
        let (factors, factor_error, rest) = exponential_terms(&angle, scale)?;
        // A standing wave has half of the norm of its envelope.
        let envelope = size_bound(shape, 2);
        let (plain, plain_error) = polynomial_moments(shape, count + factors.len(), scale, effort)?;
        let turns = Turns::of(&shape.carrier);
        let mut list = ComplexList::default();
        for k in 0..count {
            let (re, im) = turns.sum(&factors, &plain, k);
            list.re.push(re >> scale);
            list.im.push(im >> scale);
        }
        if matches!(shape.carrier, Carrier::Standing(_)) {
            list.im.clear();
        }
        alternate(&mut list);
        let total = super::expansion::size(&factors).shift(-i64::from(scale));
        let terms = Magnitude::from_u64(factors.len() as u64);
        let error = total
            .mul(plain_error)
            .add(terms.mul(factor_error).mul(envelope.add(plain_error)))
            .add(rest.mul(envelope))
            .add(Magnitude::power_of_two(-i64::from(scale)));
        Ok(Moments { list, scale, error, size })
    }
}

/// Changes the sign of every odd entry.
fn alternate(list: &mut ComplexList) {
    for part in [&mut list.re, &mut list.im] {
        part.iter_mut().skip(1).step_by(2).for_each(|value| *value = -std::mem::take(value));
    }
}

/// `omega_j` in units of `2^-scale`, the bound of the error of each, and the bound of the sum of the others.
fn exponential_terms(angle: &Real, scale: u32) -> Result<(Vec<Integer>, Magnitude, Magnitude), RouteFailure> {
    let bits = scale + 64 + (1.5 * angle.to_f64()).clamp(0.0, 1e7) as u32;
    let unit = Magnitude::power_of_two(-i64::from(scale));
    let (mut list, mut error, mut term) = (Vec::new(), Magnitude::ZERO, Real::from_i64(1));
    for j in 0u64.. {
        let size = term.abs_upper();
        if size.cmp_value(unit).is_lt() && Magnitude::from_u64(j).cmp_value(angle.abs_upper().shift(1)).is_ge() {
            return Ok((list, error, size.shift(1)));
        }
        let (value, radius) = fixed(&term, scale)?;
        list.push(value);
        error = error.max(radius.mul(unit));
        term = term.mul(angle, bits).div_u64(j + 1, bits);
    }
    Ok((list, error, Magnitude::INFINITY))
}

/// Which powers of `i` multiply the terms of the carrier's power series.
enum Turns {
    /// `i^j`, or `(-i)^j` for a negative wave number.
    Wave { forward: bool },
    /// `(-1)^(j/2)` for even `j`.
    Cosine,
    /// `(-1)^((j-1)/2)` for odd `j`.
    Sine,
}

impl Turns {
    fn of(carrier: &Carrier) -> Turns {
        match carrier {
            Carrier::Still => Turns::Wave { forward: true },
            Carrier::Travelling(momentum) => Turns::Wave { forward: *momentum > 0 },
            Carrier::Standing(mode) if mode % 2 == 1 => Turns::Cosine,
            Carrier::Standing(_) => Turns::Sine,
        }
    }

    /// `Sum_j turn_j factors_j plain_(k+j)`, in squared units.
    fn sum(&self, factors: &[Integer], plain: &ComplexList, k: usize) -> (Integer, Integer) {
        let (mut re, mut im) = (Integer::new(), Integer::new());
        let none = Integer::new();
        for (j, factor) in factors.iter().enumerate() {
            let x = plain.re.get(k + j).unwrap_or(&none);
            let y = plain.im.get(k + j).unwrap_or(&none);
            let quarter = match self {
                Turns::Wave { forward: true } => j % 4,
                Turns::Wave { forward: false } => (4 - j % 4) % 4,
                Turns::Cosine if j % 2 == 0 => j % 4,
                Turns::Sine if j % 2 == 1 => j % 4 - 1,
                _ => continue,
            };
            match quarter {
                0 => (re, im) = (re + factor * x, im + factor * y),
                1 => (re, im) = (re - factor * y, im + factor * x),
                2 => (re, im) = (re - factor * x, im - factor * y),
                _ => (re, im) = (re + factor * y, im - factor * x),
            }
        }
        (re, im)
    }
}

/// `m~_0, m~_1, ...` in units of `2^-scale`, with the bound of the error of each.
fn polynomial_moments(
    shape: &Shape,
    count: usize,
    scale: u32,
    effort: &Effort,
) -> Result<(ComplexList, Magnitude), RouteFailure> {
    let differences: Vec<(Rational, Vec<ExactComplex>)> =
        shape.knots.iter().map(|knot| scaled_jumps(shape, knot)).collect();
    let mut common = Integer::from(1);
    let (mut size, mut terms) = (Rational::new(), 0u64);
    for jump in differences.iter().flat_map(|(_, list)| list) {
        common.lcm_mut(jump.re.denom());
        common.lcm_mut(jump.im.denom());
        size += Rational::from(jump.re.abs_ref()) + Rational::from(jump.im.abs_ref());
        terms += 1;
    }
    let size = Real::from_rational(&size, BOUND_BITS).abs_upper();
    let guard = size.add(Magnitude::from_u64(terms)).log2_estimate().max(0.0) as u32 + 4;
    let inner = scale + guard;
    let zeros = || vec![Integer::new(); count];
    let mut list = ComplexList { re: zeros(), im: zeros() };
    for (eta, jumps) in &differences {
        effort.check()?;
        let mut power = Integer::from(1) << inner;
        let mut powers = Vec::with_capacity(count + jumps.len() + 1);
        for _ in 0..count + jumps.len() + 1 {
            let next = Integer::from(&power * eta.numer()) / eta.denom();
            powers.push(std::mem::replace(&mut power, next));
        }
        for (i, jump) in jumps.iter().enumerate() {
            let weight = |value: &Rational| Integer::from(&common / value.denom()) * value.numer();
            for (target, weight) in [(&mut list.re, weight(&jump.re)), (&mut list.im, weight(&jump.im))] {
                if weight == 0 {
                    continue;
                }
                for (l, entry) in target.iter_mut().enumerate() {
                    if let Some(power) = powers.get(l + i + 1) {
                        *entry += Integer::from(power * &weight) / (l + i + 1) as u64;
                    }
                }
            }
        }
    }
    let divisor = common << guard;
    list.re.iter_mut().chain(list.im.iter_mut()).for_each(|value| *value /= &divisor);
    if list.im.iter().all(|value| *value == 0) && differences.iter().all(|(_, jumps)| jumps.iter().all(|c| c.im == 0)) {
        list.im.clear();
    }
    // In inner units: the powers, one cut for each term, then one outer unit.
    let inner_error = size.add(Magnitude::from_u64(terms)).shift(-i64::from(inner));
    Ok((list, inner_error.add(Magnitude::power_of_two(-i64::from(scale)))))
}

/// `eta_k` and `E_k0, E_k1, ...`.
fn scaled_jumps(shape: &Shape, knot: &super::shape::Knot) -> (Rational, Vec<ExactComplex>) {
    let place = Rational::from(&shape.half_width - &knot.depth);
    let mut factor = Rational::from(1);
    let mut about_knot = Vec::with_capacity(knot.jumps.len());
    for (j, jump) in knot.jumps.iter().enumerate() {
        if j > 0 {
            factor /= j as u64;
        }
        about_knot.push(jump.times(&factor));
    }
    let mut power = Rational::from(1);
    let about_middle = expanded_about(&about_knot, &Rational::from(-&place));
    let list = about_middle
        .iter()
        .map(|c| {
            let scaled = c.times(&power);
            power *= &shape.half_width;
            scaled
        })
        .collect();
    (place / &shape.half_width, list)
}
