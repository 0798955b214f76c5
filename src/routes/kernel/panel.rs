//! Taylor coefficients of `F` on a panel, by recurrence in fixed point.
//!
//! On `v = v_c + w x`, `|x| <= 1`, put `G = w g` and `K = w k`. From `D g' = -v (k + 2g)`, `k' = -v g`, `F' = -g`
//! with `v_c = V/Q`, `w = W/Q`, `D(v_c) = N/Q^2` in integers:
//!
//! ```text
//! G_(n+1) = -W [(m_n + V G_n)(n+1) + l_n] / (N (n+1)),   m_n = V G_n + W G_(n-1),   l_n = V K_n + W K_(n-1),
//! K_(n+1) = -W m_n / (Q^2 (n+1)),                        F_(n+1) = -G_n / (n+1).
//! ```
//!
//! **Rounding.** Each division errs by less than one unit; the products are exact. The errors
//! `e_n` obey the same recurrence with these units as sources. With
//! `1 + alpha x + beta x^2 = (1 + x/rho)(1 + omega x)`, `rho = s_c/w`, `omega = w/(s_c + 2t)`, their generating functions are
//! majorised, coefficient by coefficient, by the solution of
//!
//! ```text
//! E_G' = [w v(x) (E_K + 2 E_G) + D sum (n+1) x^n] / D*(x),   E_K' = w v(x) E_G + sum (n+1) x^n,
//! D*(x) = D(v_c) (1 - x/rho)(1 - omega x),     v(x) = v_c + w x,
//! ```
//!
//! all coefficients being positive. For the pair `(lambda E_G, E_K)` with `lambda = max(1, sqrt(D(v_c)))` the matrix
//! norm is at most `w v max((2 + lambda)/D*, 1/lambda)`, which grows with `x`; so (Gronwall)
//!
//! ```text
//! sum_n |e_G| <= exp(Gamma)/lambda * (lambda (e_G0 + c T) + e_K0 + T),  c = 1/((1 - 1/rho)(1 - omega)),
//! sum_n |e_F| <= sum |e_G| + T,      Gamma = upper sum of the norm on [0, 1],
//! ```
//!
//! in units, for `T` terms. **Truncation.** By Lemma K1 on the circle of radius `rho' w < s_c`,
//! `|F_n| <= F(v_c - rho' w) rho'^-n`, so the terms beyond `T` sum to at most
//! `F(v_c - rho' w) rho'^-(T+1)/(1 - 1/rho')`, with Lemma K2 for `F`.

use super::plan::{PanelPlan, best_ratio};
use super::{BOUND_BITS, function_bound};
use crate::arithmetic::{Magnitude, Real};
use crate::functions::bessel_k::k0_k1_of_square;
use crate::functions::elementary::{exp, sqrt};
use crate::routes::estimate::dyadic;
use crate::routes::{Effort, RouteFailure};
use rug::{Assign, Integer, Rational};

/// `F` on a panel up to its constant.
pub(in crate::routes) struct PanelSeries {
    /// `F_n` in units of `2^-scale`; the entry at zero is zero.
    coefficients: Vec<Integer>,
    /// Bound of the sum of all errors of the other coefficients, truncation included.
    error: Magnitude,
}

/// `F` on a panel with its constant.
pub(in crate::routes) struct Anchored {
    /// `F_n` in units of `2^-scale`.
    pub coefficients: Vec<Integer>,
    /// Bound of the error anywhere on the panel.
    pub error: Magnitude,
    /// `F` at the left end.
    pub left_value: Real,
}

/// Integers `V, W, Q, N` of the recurrence.
struct Integers {
    centre: Integer,
    half: Integer,
    denominator_squared: Integer,
    discriminant: Integer,
}

impl Integers {
    fn new(time: &Rational, s: &Rational, half: &Rational) -> Integers {
        let v = Rational::from(time + s);
        let common = Integer::from(v.denom().lcm_ref(half.denom())).lcm(time.denom());
        let scaled = |value: &Rational| Integer::from(value.numer() * &common) / value.denom();
        let (centre, half, time) = (scaled(&v), scaled(half), scaled(time));
        let discriminant = Integer::from(centre.square_ref()) - time.square();
        Integers { centre, half, denominator_squared: common.square(), discriminant }
    }
}

impl PanelSeries {
    /// The series about `v = time + s` with the half-width and scale of `panel`.
    pub(super) fn new(
        time: &Rational,
        s: &Rational,
        panel: &PanelPlan,
        terms: usize,
        effort: &Effort,
    ) -> Result<PanelSeries, RouteFailure> {
        PanelSeries::about(time, s, &panel.half_width(), panel.scale, terms, effort)
    }

    /// The series about `v = time + s`, `|v - time - s| <= half`.
    pub(in crate::routes) fn about(
        time: &Rational,
        s: &Rational,
        half: &Rational,
        scale: u32,
        terms: usize,
        effort: &Effort,
    ) -> Result<PanelSeries, RouteFailure> {
        let tail = truncation(time, s, half, terms as u64 + 1, function_bound);
        let unit = Magnitude::power_of_two(-i64::from(scale));
        if terms <= 2 && tail.cmp_value(unit).is_le() {
            // Everything is below one unit.
            return Ok(PanelSeries { coefficients: vec![Integer::new()], error: full_size(time, s, half) });
        }
        let mut coefficients = Vec::with_capacity(terms + 1);
        coefficients.push(Integer::new());
        let units = kernel_terms((time, s, half), scale, terms, effort, |g, n| {
            let next = Integer::from(g / (n + 1));
            coefficients.push(-next);
        })?;
        let units = units.add(Magnitude::from_u64(terms as u64));
        Ok(PanelSeries { coefficients, error: units.mul(unit).add(tail) })
    }

    /// Adds the constant that makes the value at the right end equal to `right`.
    pub(in crate::routes) fn anchored(&self, right: &Real, scale: u32) -> Result<Anchored, RouteFailure> {
        let (value, radius) = fixed(right, scale)?;
        let unit = Magnitude::power_of_two(-i64::from(scale));
        let mut coefficients = self.coefficients.clone();
        let mut sum = Integer::new();
        let mut alternating = Integer::new();
        for (n, coefficient) in coefficients.iter().enumerate() {
            sum += coefficient;
            if n % 2 == 0 { alternating += coefficient } else { alternating -= coefficient }
        }
        coefficients[0] = value - sum;
        alternating += &coefficients[0];
        // The constant inherits the errors of the sum and of the value at the right end.
        let constant = self.error.add(radius.mul(unit));
        let error = constant.add(self.error);
        let left_value = Real::from_scaled(&alternating, -i64::from(scale)).widen(error);
        Ok(Anchored { coefficients, error, left_value })
    }
}

/// `half * g` about `v = time + s` in powers of `(v - time - s)/half`: coefficients in units of `2^-scale` and the
/// bound of the sum of their errors, truncation included. `bound` bounds `g` at `v = time + s`; as for `F`,
/// `|g_n| <= g(v_c - rho' w) rho'^-n`.
pub(in crate::routes) fn kernel_series(
    place: (&Rational, &Rational, &Rational),
    scale: u32,
    terms: usize,
    bound: impl Fn(&Rational, &Rational) -> Magnitude,
    effort: &Effort,
) -> Result<(Vec<Integer>, Magnitude), RouteFailure> {
    let (time, s, half) = place;
    let tail = truncation(time, s, half, terms as u64, bound);
    let mut coefficients = Vec::with_capacity(terms);
    let units = kernel_terms(place, scale, terms, effort, |g, _| coefficients.push(g.clone()))?;
    let width = Real::from_rational(half, BOUND_BITS).abs_upper();
    Ok((coefficients, units.shift(-i64::from(scale)).add(tail.mul(width))))
}

/// Shows every coefficient of `half * g` to `visit`, and bounds the sum of their errors in units.
fn kernel_terms(
    (time, s, half): (&Rational, &Rational, &Rational),
    scale: u32,
    terms: usize,
    effort: &Effort,
    visit: impl FnMut(&Integer, u64),
) -> Result<Magnitude, RouteFailure> {
    let square = (s + Rational::from(time * 2)) * s;
    let wide = Real::from_rational(half, scale + 64);
    let (k, g) = start_values(&square, half, scale);
    let (k, k_error) = fixed(&k.mul(&wide, scale + 64), scale)?;
    let (g, g_error) = fixed(&g.mul(&wide, scale + 64), scale)?;
    let integers = Integers::new(time, s, half);
    recurrence(&integers, g, k, terms, effort, visit)?;
    let spread = amplification(time, s, half);
    let count = Magnitude::from_u64(terms as u64);
    let sources = spread.balance.mul(g_error.add(count.mul(spread.sharpness))).add(k_error).add(count);
    Ok(spread.growth.mul(sources).div(spread.balance_below))
}

/// `F` on the whole panel when no coefficient is kept: the variation is at most the value at its
/// left end, which Lemma K2 bounds.
fn full_size(time: &Rational, s: &Rational, half: &Rational) -> Magnitude {
    function_bound(time, &Rational::from(s - half))
}

pub(in crate::routes) fn fixed(value: &Real, scale: u32) -> Result<(Integer, Magnitude), RouteFailure> {
    value.to_fixed(i64::from(scale)).ok_or_else(|| RouteFailure::OutOfReach {
        reason: "a start value of the kernel route has no finite enclosure".to_owned(),
    })
}

/// `(K_0(r), K_1(r)/r)` to an absolute accuracy of about `2^-scale` after the factor `half`.
fn start_values(square: &Rational, half: &Rational, scale: u32) -> (Real, Real) {
    let r2 = square.to_f64();
    let r = r2.sqrt();
    let log2_size = (1.0 / r2 + 1.0).log2() - r * std::f64::consts::LOG2_E + half.to_f64().log2() + 4.0;
    let bits = (f64::from(scale) + log2_size).max(32.0) as u32 + 8;
    k0_k1_of_square(square, bits)
}

/// Runs the recurrence and shows `G_0, ..., G_(terms-1)` with their indices to `visit`.
fn recurrence(
    integers: &Integers,
    g: Integer,
    k: Integer,
    terms: usize,
    effort: &Effort,
    mut visit: impl FnMut(&Integer, u64),
) -> Result<(), RouteFailure> {
    let Integers { centre, half, denominator_squared, discriminant } = integers;
    let (mut g, mut k) = (g, k);
    let (mut g_before, mut k_before) = (Integer::new(), Integer::new());
    let (mut m, mut l, mut product) = (Integer::new(), Integer::new(), Integer::new());
    let mut divisor = Integer::new();
    for n in 0..terms as u64 {
        if n % 64 == 0 {
            effort.check()?;
        }
        visit(&g, n);
        if n + 1 == terms as u64 {
            break;
        }
        product.assign(&g * centre);
        m.assign(&g_before * half);
        m += &product;
        l.assign(&k * centre);
        l += &k_before * half;
        std::mem::swap(&mut k_before, &mut k);
        k.assign(&m * half);
        divisor.assign(denominator_squared * (n + 1));
        k /= &divisor;
        k = -std::mem::take(&mut k);
        m += &product;
        m *= n + 1;
        m += &l;
        m *= half;
        divisor.assign(discriminant * (n + 1));
        m /= &divisor;
        std::mem::swap(&mut g_before, &mut g);
        g.assign(-&m);
    }
    Ok(())
}

/// The constants of the rounding bound.
struct Amplification {
    growth: Magnitude,
    balance: Magnitude,
    balance_below: Magnitude,
    sharpness: Magnitude,
}

fn amplification(time: &Rational, s: &Rational, half: &Rational) -> Amplification {
    const PIECES: u64 = 8;
    let bits = BOUND_BITS;
    let one = Magnitude::ONE;
    let far = s + Rational::from(time * 2);
    let square = Real::from_rational(&Rational::from(&far * s), bits);
    let root = sqrt(&square, bits);
    let (balance, balance_below) = (root.abs_upper().max(one), root.abs_lower().max(one));
    let upper = |value: Rational| Real::from_rational(&value, bits).abs_upper();
    let (first, second) = (upper(Rational::from(half / s)), upper(Rational::from(half / &far)));
    let (width, centre) = (upper(half.clone()), upper(Rational::from(time + s)));
    let square = square.abs_lower();
    let mut gamma = Magnitude::ZERO;
    let mut sharpness = Magnitude::INFINITY;
    for piece in 1..=PIECES {
        let x = Magnitude::from_u64(piece).shift(-3);
        let shape = one.sub_down(first.mul(x)).mul_down(one.sub_down(second.mul(x)));
        let norm = balance.add(one.shift(1)).div(square.mul_down(shape)).max(one.div(balance_below));
        gamma = gamma.add(centre.add(width.mul(x)).mul(width).mul(norm).shift(-3));
        sharpness = one.div(shape);
    }
    let growth = exp(&Real::from_float(gamma.to_float()), bits).abs_upper();
    Amplification { growth, balance, balance_below, sharpness }
}

/// Bound of the sum of all terms from number `first` on, for a function bounded by `bound` as in Lemma K1.
fn truncation(
    time: &Rational,
    s: &Rational,
    half: &Rational,
    first: u64,
    bound: impl Fn(&Rational, &Rational) -> Magnitude,
) -> Magnitude {
    let (t, sf, w) = (time.to_f64(), s.to_f64(), half.to_f64());
    let cost = |ratio: f64| {
        let left = sf - ratio * w;
        let r = (left * (left + 2.0 * t)).sqrt();
        -r - 0.5 * r.ln() - (t + left).ln() - first as f64 * ratio.ln() - (1.0 - 1.0 / ratio).ln()
    };
    let ratio = dyadic(best_ratio(sf / w, cost), 20);
    let left = s - Rational::from(half * &ratio);
    let size = bound(time, &left);
    let ratio = Real::from_rational(&ratio, BOUND_BITS);
    let inverse = Real::from_i64(1).div(&ratio, BOUND_BITS);
    let below = Real::from_i64(1).sub(&inverse, BOUND_BITS);
    if !below.certainly_positive() {
        return Magnitude::INFINITY;
    }
    size.mul(inverse.abs_upper().pow(first)).div(below.abs_lower())
}
