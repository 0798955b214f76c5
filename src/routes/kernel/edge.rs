//! The panel at the cone, where `F` has a logarithm.
//!
//! # Series
//!
//! With `s = sigma y`, `tau = sigma/(2t)`, `chi = t sigma/2` one has `D = 2 t sigma y (1 + tau y)` and `v = t (1 + 2 tau y)`. Put
//! `F~ = 2 t F`, `g~ = 2 t sigma g`, `k~ = t sigma k`; then
//!
//! ```text
//! y (1 + tau y) g~' = -(1 + 2 tau y)(k~ + g~),     k~' = -chi (1 + 2 tau y) g~,     F~' = -g~.
//! ```
//!
//! Each function is `a(y) + b(y) ln y` with power series `a`, `b` (`g~` has the extra term `1/y`); comparing
//! coefficients, with `ga_(-1) = 1` and all other entries of negative index zero:
//!
//! ```text
//! n kb_n = -chi (gb_(n-1) + 2 tau gb_(n-2)),           kb_0 = -chi,
//! n ka_n = -kb_n - chi (ga_(n-1) + 2 tau ga_(n-2)),    ka_0 = -chi (ln chi + 2 gamma),
//! (n+1) gb_n = -[(n+1) tau gb_(n-1) + kb_n + 2 tau kb_(n-1)],
//! (n+1) ga_n = -[(n+1) tau ga_(n-1) + ka_n + 2 tau ka_(n-1) + tau gb_(n-1) + gb_n],
//! n B_n = -gb_(n-1),  B_0 = -1,     n A_n = -ga_(n-1) - B_n,
//! ```
//!
//! (`ka_0` from `K_0(r) = -ln(r/2) - gamma + O(r^2 ln r)`, DLMF 10.31.2, and `r^2 = 4 chi y (1 + tau y)`.) `A_0` follows from the
//! value of `F` handed over at `y = 1`. `F(v + 2a)` is regular and uses an ordinary series about `s = 2a`.
//!
//! # Integral
//!
//! `Int_0^1 (C + B ln y)^2 dy` with `Int y^(M-1) = 1/M`, `Int y^(M-1) ln y = -1/M^2`, `Int y^(M-1) ln^2 y = 2/M^3`; for a region
//! that begins at `y_0 > 0` the antiderivatives at `y_0` are taken off.
//!
//! # Bounds
//!
//! **Rounding** is carried along: every coefficient has its own bound, from the recurrence with absolute values and one
//! unit for each division.
//!
//! **Truncation** (Cauchy on `|s| = R < 2t`, `rho = sqrt(R (R + 2t)) >= |r|`). By DLMF 10.25.2 and 10.31.1, writing
//! `ln(r/2) = (ln y)/2 + ln(sigma (s + 2t)/4)/2`,
//!
//! ```text
//! gb = I_1(r)/(2r),
//! ga = 1/D + (1/2) ln(sigma (s + 2t)/4) I_1(r)/r - (1/4) Sum_k [psi(k+1) + psi(k+2)] (D/4)^k/(k! (k+1)!).
//! ```
//!
//! `|I_1(r)/r| <= I_0(rho)/2 <= e^rho/2`, so `|gb| <= e^rho/4`. As `|psi(k+1) + psi(k+2)| <= 2 (k+1)`, the last term is
//! at most `I_0(rho)/2 <= e^rho/2`. Hence
//!
//! ```text
//! |ga| <= M := 1/(R (2t - R)) + e^rho (L/4 + 1/2),   L = max over R' = -R, R of |ln(sigma (2t + R')/4)|, plus pi/2,
//! Sum_(n>=N) |A_n| sigma^n <= (sigma/R)^N R (M + e^rho/4)/(N (1 - sigma/R)),   and with e^rho/4 alone for B.
//! ```
//!
//! **Squares.** If `C` and `B` are off by at most `e` each and bounded by `c`, the integral is off by at most
//! `e (2c + e) Int (1 + |ln y|)^2 = 5 e (2c + e)`.

use super::panel::{PanelSeries, fixed};
use super::plan::{EdgePlan, best_ratio};
use super::squares::signed_product;
use super::{BOUND_BITS, Carry};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::{euler_gamma, exp, ln, pi, sqrt};
use crate::routes::estimate::dyadic;
use crate::routes::{Effort, RouteFailure, TailProblem};
use rug::{Integer, Rational};

/// Extra bits below the unit when moments are summed.
const GUARD: u32 = 16;

/// `Int q^2 dv` over the panel.
pub(super) fn integral(
    problem: &TailProblem,
    plan: &EdgePlan,
    carry: &Carry,
    effort: &Effort,
) -> Result<Real, RouteFailure> {
    let mut parts = logarithmic(&problem.time, &plan.to, (plan.terms, plan.scale), &carry.near, effort)?;
    subtract_shifted(&mut parts, problem, plan, carry, effort)?;
    let unit = Magnitude::power_of_two(-i64::from(plan.scale));
    let size = |list: &[Integer]| {
        let sum: Integer = list.iter().map(|c| Integer::from(c.abs_ref())).sum();
        Real::from_scaled(&sum, -i64::from(plan.scale)).abs_upper()
    };
    let error = parts.regular_error.max(parts.logarithm_error).mul(unit).add(parts.truncation);
    let bound = size(&parts.regular).max(size(&parts.logarithm));
    let slack = bound.shift(1).add(error).mul(error).mul(Magnitude::from_u64(5));
    let bits = plan.scale + 64;
    let start = Rational::from(&plan.from / &plan.to);
    let moments = moments(&parts.regular, &parts.logarithm, &start, plan.scale, bits).widen(slack);
    let weight = (&plan.to / Rational::from(problem.time.square_ref())) / 4;
    Ok(moments.mul(&Real::from_rational(&weight, bits), bits))
}

/// `C` and `B` in units of `2^-scale`.
pub(in crate::routes) struct Parts {
    pub regular: Vec<Integer>,
    pub logarithm: Vec<Integer>,
    /// Bound of the sum of the errors of `regular`, in units.
    pub regular_error: Magnitude,
    /// The same for `logarithm`.
    pub logarithm_error: Magnitude,
    /// Bound of everything cut off, in absolute terms.
    pub truncation: Magnitude,
}

/// An integer and the bound of its error, both in units.
#[derive(Clone)]
struct Coefficient {
    value: Integer,
    error: Magnitude,
}

impl Coefficient {
    fn zero() -> Coefficient {
        Coefficient { value: Integer::new(), error: Magnitude::ZERO }
    }

    /// `-sum/divisor`, rounded; `error` is that of the quotient before rounding.
    fn quotient(mut sum: Integer, divisor: &Integer, error: Magnitude) -> Coefficient {
        sum /= divisor;
        sum = -sum;
        Coefficient { value: sum, error: error.add(Magnitude::ONE) }
    }

    fn from_real(value: &Real, scale: u32) -> Result<Coefficient, RouteFailure> {
        let (value, error) = fixed(value, scale)?;
        Ok(Coefficient { value, error })
    }
}

/// The rational numbers of the recurrence as integers, and bounds of them for the errors.
struct Ratios {
    /// `2 tau`.
    tau: (Integer, Integer),
    /// `chi`.
    chi: (Integer, Integer),
    /// `(denominator of 2 tau) * (denominator of chi)` and the two products that go with it.
    common: Integer,
    first_weight: Integer,
    second_weight: Integer,
    /// Upper bound of `tau`.
    tau_bound: Magnitude,
    /// Upper bound of `chi`.
    chi_bound: Magnitude,
}

impl Ratios {
    fn new(time: &Rational, sigma: &Rational) -> Ratios {
        let twice_tau = Rational::from(sigma / time);
        let chi = Rational::from(time * sigma) / 2i32;
        let (tau_bound, chi_bound) = (magnitude_of(&twice_tau).shift(-1), magnitude_of(&chi));
        let (tau, chi): ((Integer, Integer), (Integer, Integer)) =
            (twice_tau.into_numer_denom(), chi.into_numer_denom());
        Ratios {
            common: Integer::from(&tau.1 * &chi.1),
            first_weight: Integer::from(&chi.0 * &tau.1),
            second_weight: Integer::from(&chi.0 * &tau.0),
            tau,
            chi,
            tau_bound,
            chi_bound,
        }
    }

    /// `-(extra + chi (first + 2 tau second))/n`.
    fn next_k(&self, first: &Coefficient, second: &Coefficient, extra: &Coefficient, n: u64) -> Coefficient {
        let mut sum = Integer::from(&self.first_weight * &first.value);
        sum += &self.second_weight * &second.value;
        sum += &self.common * &extra.value;
        let inner = self.tau_bound.shift(1).mul(second.error).add(first.error);
        let error = self.chi_bound.mul(inner).add(extra.error).div(Magnitude::from_u64(n));
        Coefficient::quotient(sum, &Integer::from(&self.common * n), error)
    }

    /// `-[tau before + (k + b + tau (2 k_before + b_before))/(n+1)]`.
    fn next_g(&self, before: &Coefficient, others: [&Coefficient; 4], n: u64) -> Coefficient {
        let [k, k_before, b_before, b] = others;
        let mut inner = Integer::from(&k_before.value << 1);
        inner += &b_before.value;
        inner += &before.value * (n + 1);
        let mut sum = inner * &self.tau.0;
        let twice = Integer::from(&self.tau.1 << 1);
        sum += Integer::from(&k.value + &b.value) * &twice;
        let fresh = k.error.add(b.error).add(self.tau_bound.mul(k_before.error.shift(1).add(b_before.error)));
        let error = self.tau_bound.mul(before.error).add(fresh.div(Magnitude::from_u64(n + 1)));
        Coefficient::quotient(sum, &(twice * (n + 1)), error)
    }

    /// `chi value`, negated.
    fn minus_chi(&self, value: &Coefficient) -> Coefficient {
        Coefficient::quotient(Integer::from(&self.chi.0 * &value.value), &self.chi.1, self.chi_bound.mul(value.error))
    }
}

/// The series of `2 t F` in `y = s/width`, with its constant: the value `right` of `F` at `y = 1`.
pub(in crate::routes) fn logarithmic(
    time: &Rational,
    width: &Rational,
    (terms, scale): (usize, u32),
    right: &Real,
    effort: &Effort,
) -> Result<Parts, RouteFailure> {
    let ratios = Ratios::new(time, width);
    let one = Coefficient { value: Integer::from(1) << scale, error: Magnitude::ZERO };
    let zero = Coefficient::zero();
    let bits = scale + 64;
    let chi = Real::from_rational(&(Rational::from(time * width) / 2), bits);
    let start = chi.mul(&ln(&chi, bits).add(&euler_gamma(bits).shift(1), bits), bits).neg();
    // Entries (n-2, n-1) of g and n-1 of k, for the regular (a) and logarithmic (b) parts.
    let (mut ga, mut gb) = ([zero.clone(), one.clone()], [zero.clone(), zero.clone()]);
    let (mut ka, mut kb) = (zero.clone(), zero.clone());
    let mut series = [Vec::with_capacity(terms), Vec::with_capacity(terms)];
    let mut errors = [Magnitude::ZERO, Magnitude::ZERO];
    for n in 0..terms as u64 {
        if n % 64 == 0 {
            effort.check()?;
        }
        if n == 0 {
            series[0].push(Integer::new());
            series[1].push(Integer::from(-&one.value));
        } else {
            let (divisor, count) = (Integer::from(n), Magnitude::from_u64(n));
            let b = Coefficient::quotient(gb[1].value.clone(), &divisor, gb[1].error.div(count));
            let both = Integer::from(&ga[1].value + &b.value);
            let a = Coefficient::quotient(both, &divisor, ga[1].error.add(b.error).div(count));
            errors[0] = errors[0].add(a.error);
            errors[1] = errors[1].add(b.error);
            series[0].push(a.value);
            series[1].push(b.value);
        }
        let (next_ka, next_kb) = if n == 0 {
            (Coefficient::from_real(&start, scale)?, ratios.minus_chi(&one))
        } else {
            let b = ratios.next_k(&gb[1], &gb[0], &zero, n);
            (ratios.next_k(&ga[1], &ga[0], &b, n), b)
        };
        let next_gb = ratios.next_g(&gb[1], [&next_kb, &kb, &zero, &zero], n);
        let next_ga = ratios.next_g(&ga[1], [&next_ka, &ka, &gb[1], &next_gb], n);
        (ka, kb) = (next_ka, next_kb);
        advance(&mut ga, next_ga);
        advance(&mut gb, next_gb);
    }
    let [mut regular, logarithm] = series;
    let truncation = truncation(time, width, terms).mul(magnitude_of(time).shift(1));
    let right = Coefficient::from_real(&doubled(right, time, bits), scale)?;
    let sum: Integer = regular.iter().sum();
    regular[0] = right.value - sum;
    Ok(Parts {
        regular,
        logarithm,
        regular_error: errors[0].shift(1).add(right.error),
        logarithm_error: errors[1],
        truncation: truncation.shift(1),
    })
}

fn advance(pair: &mut [Coefficient; 2], next: Coefficient) {
    pair.swap(0, 1);
    pair[1] = next;
}

fn magnitude_of(value: &Rational) -> Magnitude {
    Real::from_rational(value, BOUND_BITS).abs_upper()
}

/// `2 t value`.
fn doubled(value: &Real, time: &Rational, bits: Bits) -> Real {
    value.mul(&Real::from_rational(time, bits), bits).shift(1)
}

/// Takes the series of `2 t F(v + 2a)` off the regular part.
fn subtract_shifted(
    parts: &mut Parts,
    problem: &TailProblem,
    plan: &EdgePlan,
    carry: &Carry,
    effort: &Effort,
) -> Result<(), RouteFailure> {
    let scale = plan.shifted_scale;
    let centre = Rational::from(&problem.half_width * 2);
    let series = PanelSeries::about(&problem.time, &centre, &plan.to, scale, plan.shifted_terms, effort)?;
    let anchored = series.anchored(&carry.shifted, scale)?;
    let (numerator, denominator) = Rational::from(&problem.time * 2).into_numer_denom();
    let drop = scale - plan.scale;
    let divisor = denominator << drop;
    for (n, coefficient) in anchored.coefficients.iter().enumerate() {
        let value = Integer::from(coefficient * &numerator) / &divisor;
        match parts.regular.get_mut(n) {
            Some(target) => *target -= value,
            None => parts.regular.push(-value),
        }
    }
    let rounding = Magnitude::from_u64(anchored.coefficients.len() as u64);
    parts.regular_error = parts.regular_error.add(rounding);
    parts.truncation = parts.truncation.add(anchored.error.mul(magnitude_of(&problem.time).shift(1)));
    Ok(())
}

/// `Int_start^1 (C + B ln y)^2 dy` for the coefficients as they are, in units of `2^-scale`.
pub(in crate::routes) fn moments(
    regular: &[Integer],
    logarithm: &[Integer],
    start: &Rational,
    scale: u32,
    bits: Bits,
) -> Real {
    let kept = logarithm.iter().rposition(|b| *b != 0).map_or(0, |last| last + 1);
    let logarithm = &logarithm[..kept];
    let squares = signed_product(regular, regular);
    let mixed = signed_product(regular, logarithm);
    let logs = signed_product(logarithm, logarithm);
    let none = Integer::new();
    let mut total = Integer::new();
    for (index, square) in squares.iter().enumerate() {
        let m = index as u64 + 1;
        let mut sum = Integer::from(square * m);
        sum -= Integer::from(mixed.get(index).unwrap_or(&none) << 1);
        sum *= m;
        sum += Integer::from(logs.get(index).unwrap_or(&none) << 1);
        total += (sum << GUARD) / (Integer::from(m).square() * m);
    }
    let unit = -2 * i64::from(scale) - i64::from(GUARD);
    let cuts = Magnitude::from_u64(squares.len() as u64).shift(unit);
    let whole = Real::from_scaled(&total, unit).round(bits).widen(cuts);
    if *start == 0 {
        return whole;
    }
    let start = Real::from_rational(start, bits);
    let log = ln(&start, bits);
    let mut power = start.clone();
    let mut below = Real::zero();
    for (index, square) in squares.iter().enumerate() {
        let m = index as u64 + 1;
        let scaled = |value: &Integer| Real::from_scaled(value, -2 * i64::from(scale)).round(bits);
        let first = log.sub(&Real::from_i64(1).div_u64(m, bits), bits);
        let second = log.mul(&first, bits).add(&first.sub(&log, bits).div_u64(m, bits).neg().shift(1), bits);
        let second = second.sub(&log.div_u64(m, bits), bits);
        let mut sum = scaled(square);
        sum = sum.add(&scaled(mixed.get(index).unwrap_or(&none)).shift(1).mul(&first, bits), bits);
        sum = sum.add(&scaled(logs.get(index).unwrap_or(&none)).mul(&second, bits), bits);
        below = below.add(&sum.mul(&power, bits).div_u64(m, bits), bits);
        power = power.mul(&start, bits);
    }
    whole.sub(&below, bits)
}

/// Bound of the terms of `A`, and of `B`, from `terms` on (in units of `F`).
fn truncation(time: &Rational, sigma: &Rational, terms: usize) -> Magnitude {
    let bits = BOUND_BITS;
    let (t, width) = (time.to_f64(), sigma.to_f64());
    let double = Rational::from(time * 2);
    let radius = dyadic(best_radius(t, width, terms as f64), 20);
    if radius >= double || radius <= *sigma {
        return Magnitude::INFINITY;
    }
    let real = |value: &Rational| Real::from_rational(value, bits);
    let (inner, outer) = (Rational::from(&double - &radius), Rational::from(&double + &radius));
    let rho = sqrt(&real(&Rational::from(&outer * &radius)), bits);
    let growth = exp(&rho, bits).abs_upper();
    let log = |value: &Rational| ln(&real(&(Rational::from(value * sigma) / 4)), bits).abs_upper();
    let logs = log(&inner).max(log(&outer)).add(pi(bits).abs_upper().shift(-1));
    let pole = Magnitude::ONE.div(real(&Rational::from(&inner * &radius)).abs_lower());
    let half = Magnitude::ONE.shift(-1);
    let bound = pole.add(growth.mul(logs.shift(-2).add(half))).add(growth.shift(-2));
    let ratio = real(&Rational::from(sigma / &radius));
    let below = Real::from_i64(1).sub(&ratio, bits).abs_lower();
    let power = ratio.abs_upper().pow(terms as u64).mul(real(&radius).abs_upper());
    power.mul(bound).div(below).div(Real::from_i64(terms as i64).abs_lower())
}

/// Logarithm of the truncation bound in double precision.
fn log_truncation(t: f64, sigma: f64, radius: f64, terms: f64) -> f64 {
    let rho = radius.sqrt() * (radius + 2.0 * t).sqrt();
    let logs = (sigma * (2.0 * t - radius) / 4.0).ln().abs().max((sigma * (2.0 * t + radius) / 4.0).ln().abs()) + 1.6;
    let pole = -radius.ln() - (2.0 * t - radius).ln();
    let waves = rho + (logs / 4.0 + 0.75).ln();
    let bound = pole.max(waves) + (-(pole - waves).abs()).exp().ln_1p();
    radius.ln() + bound - terms * (radius / sigma).ln() - terms.ln() - (-(sigma / radius)).ln_1p()
}

/// A good radius for the truncation bound, between `sigma` and `2t`.
fn best_radius(t: f64, sigma: f64, terms: f64) -> f64 {
    // Large ratios need a search on a logarithmic scale; there the optimum is far below 2t.
    let widest = 2.0 * t / sigma;
    if widest > 64.0 {
        let power = best_ratio(widest.ln(), |u| log_truncation(t, sigma, sigma * u.exp(), terms));
        return sigma * power.exp().min(0.999 * widest);
    }
    sigma * best_ratio(widest, |ratio| log_truncation(t, sigma, sigma * ratio, terms))
}

/// Number of terms after which the truncation bound of `2 t F` is below `exp(goal)`.
pub(in crate::routes) fn terms_for(t: f64, sigma: f64, goal: f64) -> usize {
    let goal = goal - (2.0 * t).ln();
    let reached = |terms: f64| log_truncation(t, sigma, best_radius(t, sigma, terms), terms) < goal;
    let mut high = 8.0;
    while !reached(high) && high < 1e7 {
        high *= 2.0;
    }
    let mut low = 0.5 * high;
    while high - low > 1.0 {
        let middle = (0.5 * (low + high)).ceil();
        if middle >= high {
            break;
        }
        if reached(middle) { high = middle } else { low = middle }
    }
    high as usize
}
