//! The nodes beyond the near ones, summed in closed form (region at the cone, `d = 0`).
//!
//! For `x > x_K` (`K` the last near node) put `z = e^-x`; the weight is
//! `w = v(z)/4 - error`, `v(z) = (1 - z^2)/(1 + z^2) exp(-t z) = Sum alpha_i z^i`, with
//! `|error| <= rho = (exp(-t e^x) + exp(-a e^x))/4` taken at the first far node (both vanishing exponentials
//! fall with `x`; `2 a cosh x > a e^x`). Replacing `w` by `v/4` on all far nodes changes `S` by at most
//! `2 rho (1/4) h^2 Sum Sum 1/(cosh + cosh) <= rho pi^2/8 < 1.25 rho`.
//!
//! **Coefficients.** `(1 + z^2) v = (1 - z^2) e^(-tz)` gives `alpha_i = e_i - e_(i-2) - alpha_(i-2)`,
//! `e_i = (-t)^i/i!`. By Cauchy's estimate with the majorant `V(z) = (1 + z^2)/(1 - z^2) e^(tz)`:
//! `|alpha_i| Z^i <= V(lambda Z) lambda^-i`.
//!
//! **Far-far block.** `1/(cosh x + cosh y) = 2 z z'/((z + z')(1 + z z'))`. With nodes `z = Z q^n`, `q = e^-h`, `n >= 0`:
//!
//! ```text
//! Sum Sum v v'/(cosh + cosh) = Sum_ij f_ij Z^(i+j-1) (s_i + s_j - 1/2)/(1 - q^(i+j-1)),   i, j >= 1,
//! f_ij = 2 alpha_(i-1) alpha_(j-1) - f_(i-1)(j-1),     s_i = Sum_{r>=0} q^(ir)/(1 + q^r),
//! s_(i+1) = 1/(1 - q^i) - s_i,   s_1 = 1/2 + L(q) - 2 L(q^2),   L(x) = Sum_{n>=1} x^(n^2) (1 + x^n)/(1 - x^n),
//! ```
//!
//! from `Sum_{n,m} q^(in+jm)/(q^n + q^m)`, split at `n = m` and `n - m = ± r`; the Lambert series `L` in Clausen's
//! form, and `Sum q^r/(1+q^r) = L(q) - 2 L(q^2)` from `y/(1+y) = y/(1-y) - 2 y^2/(1-y^2)`. Terms with
//! `i + j > J` are at most `(2 s_1/(Z (1-q))) lambda^-(J+1) 2 (lambda Z)^2 V(lambda Z)^2/(1 - (lambda Z)^2)`.
//!
//! **Cross block.** For near `x = x_k <= x_K` and nodes `y > x_last`: `1/(cosh x + cosh y) =
//! Sum_{n>=1} (-1)^(n-1) e^(-ny) (e^(nx) - e^(-nx))/sinh x`, so both orders together give
//! `Sum_k r_k (p(e^(x_k)) - p(e^(-x_k)))`, `p(u) = Sum_n (-1)^(n-1) mu_n u^n`,
//! `mu_n = Sum_i alpha_i Z2^(i+n)/(1 - q^(i+n))`, `Z2 = e^(-x_last - h)`. With `g = e^(x_K) Z2`: the terms beyond `N` are
//! at most `(N+1) g^(N+1) / (4 (1-g)^2 (1-q)^2)`; cutting `mu_n` at `i <= J` errs by at most
//! `Z2^n V(lambda Z2) lambda^-(J+1)/((1 - 1/lambda)(1-q))`, and `r_k e^(n x_k) Z2^n <= g^n/4` sums over `k` and `n`
//! to at most `count * g/(1-g)/2` times the rest.
//!
//! For other packets `v` is another power series with its own majorant ([`FarWeights`]), of either sign; all that is used of
//! it is `|v| <= 1` on the far nodes.

use super::cone_nodes::Powers;
use super::near_field::{Lattice, Weights};
use super::nodes::fixed;
use super::plan::far_series_length;
use super::{BOUND_BITS, Setting, exp_minus_upper};
use crate::arithmetic::{Bits, Magnitude, Real};
use crate::functions::elementary::exp;
use crate::routes::{Effort, RouteFailure};
use rug::Integer;

/// The weights `v/4` beyond the near nodes, as a power series in `z = e^-x`.
pub(in crate::routes) trait FarWeights {
    /// `alpha_i Z^i` for `i < count`.
    fn coefficients(&self, start: &Real, count: usize, bits: Bits) -> Vec<Real>;

    /// `V(r)`, at least `Sum |alpha_i| r^i`; infinite where the series is not known to converge.
    fn majorant(&self, radius: &Real) -> Magnitude;

    /// Length of the series from rapidity `x` for errors near `exp(-goal)`, and a ratio `lambda` that proves it.
    fn series_length(&self, x: f64, goal: f64) -> (usize, f64);

    /// The ratio `lambda` with the best bound for so many terms.
    fn ratio_for(&self, x: f64, goal: f64, _terms: usize) -> f64 {
        self.series_length(x, goal).1
    }

    /// What replacing the weights from `z = Z` on by `v/4` changes at most in `S`.
    fn replacement_error(&self, start: &Real) -> Magnitude;
}

/// Nodes and lengths of the series.
pub(in crate::routes) struct FarPlan {
    /// The nodes; the step is `ln 2 / p`.
    pub lattice: Lattice,
    /// Terms of the far-field power series, as the largest `i + j`.
    pub series_terms: usize,
    /// Terms of the expansion that couples near and far nodes.
    pub cross_terms: usize,
}

/// What the far nodes add.
pub(in crate::routes) struct FarField {
    /// To the double sum, without `h^2`.
    pub sum: Real,
    /// Error of `S` from replacing the weights.
    pub replacement_error: Magnitude,
}

/// Sums the far-far and the cross block.
pub(in crate::routes) fn sum(
    far: &dyn FarWeights,
    nodes: &Weights<'_>,
    plan: &FarPlan,
    effort: &Effort,
) -> Result<FarField, RouteFailure> {
    let geometry = Geometry::new(far, plan);
    let bits = plan.lattice.bits;
    let coefficients = far.coefficients(&geometry.start, plan.series_terms.max(geometry.outer_terms) + 1, bits);
    let block = far_far(&geometry, &coefficients, plan, effort)?;
    let cross = cross(far, &geometry, nodes, plan, effort)?;
    let mut total = block.shift(-4).add(&cross, bits);
    if crate::spoil::is_active(crate::spoil::Fault::FarFieldSign) {
        total = total.neg();
    }
    Ok(FarField { sum: total, replacement_error: far.replacement_error(&geometry.start) })
}

struct Geometry {
    /// `Z`, at the first far node.
    start: Real,
    /// `Z2`, at the first node beyond the last one of the near sum.
    outer: Real,
    /// `e^(x_K)`.
    edge: Real,
    /// `1/(1 - q^i)` for `i = 1, 2, ...` at index `i`; index 0 unused.
    geometric: Vec<Real>,
    /// Chosen ratio of the Cauchy estimates.
    lambda: Real,
    outer_lambda: Real,
    outer_terms: usize,
}

impl Geometry {
    fn new(far: &dyn FarWeights, far_plan: &FarPlan) -> Geometry {
        let plan = &far_plan.lattice;
        let bits = plan.bits;
        let step = plan.step_ball(bits);
        let at = |index: usize| exp(&step.mul_i64(-(index as i64), bits), bits);
        let h = step.to_f64();
        let goal = f64::from(plan.scale) * std::f64::consts::LN_2;
        let lambda = far.ratio_for((plan.near as f64 + 1.0) * h, goal, far_plan.series_terms);
        let (outer_terms, outer_lambda) = far.series_length((plan.last as f64 + 1.0) * h, goal);
        let one = Real::from_i64(1);
        let most = far_plan.series_terms.max(far_plan.cross_terms + outer_terms) + 2;
        let mut geometric = vec![Real::whole_line()];
        let decay = exp(&step.neg(), bits);
        let mut power = decay.clone();
        for _ in 1..=most {
            geometric.push(one.div(&one.sub(&power, bits), bits));
            power = power.mul(&decay, bits);
        }
        let float = |v: f64| Real::from_float(rug::Float::with_val(53, v));
        Geometry {
            start: at(plan.near + 1),
            outer: at(plan.last + 1),
            edge: exp(&step.mul_i64(plan.near as i64, bits), bits),
            geometric,
            lambda: float(lambda),
            outer_lambda: float(outer_lambda),
            outer_terms,
        }
    }
}

impl FarWeights for Setting {
    /// By the recurrence with all terms scaled.
    fn coefficients(&self, start: &Real, count: usize, bits: Bits) -> Vec<Real> {
        let square = start.square(bits);
        let ratio = self.time.mul(start, bits).neg();
        let mut exponential = vec![Real::from_i64(1)];
        let mut alpha: Vec<Real> = Vec::with_capacity(count);
        for i in 0..count {
            let mut next = exponential[i].clone();
            if i >= 2 {
                let back = exponential[i - 2].add(&alpha[i - 2], bits).mul(&square, bits);
                next = next.sub(&back, bits);
            }
            alpha.push(next);
            let term = exponential[i].mul(&ratio, bits).div_u64(i as u64 + 1, bits);
            exponential.push(term);
        }
        alpha
    }

    fn majorant(&self, radius: &Real) -> Magnitude {
        let bits = BOUND_BITS;
        let one = Real::from_i64(1);
        let square = radius.square(bits);
        let below = one.sub(&square, bits);
        if !below.certainly_positive() {
            return Magnitude::INFINITY;
        }
        let growth = exp(&self.time.mul(radius, bits), bits);
        one.add(&square, bits).div(&below, bits).mul(&growth, bits).abs_upper()
    }

    fn series_length(&self, x: f64, goal: f64) -> (usize, f64) {
        far_series_length(self.time.to_f64(), x, goal)
    }

    fn replacement_error(&self, start: &Real) -> Magnitude {
        let at = |rate: &Real| exp_minus_upper(&rate.div(start, BOUND_BITS));
        let rho = at(&self.time).add(at(&self.half_width)).shift(-2);
        rho.mul(Magnitude::from_u64(5)).shift(-2)
    }
}

/// `lambda^-power` bounded above.
fn inverse_power(lambda: &Real, power: usize) -> Magnitude {
    Magnitude::ONE.div(lambda.abs_lower()).pow(power as u64)
}

/// Lower bound of a number that the estimates need to be positive: zero, so that they give nothing, if it may not be.
fn positive_lower(value: &Real) -> Magnitude {
    if value.certainly_positive() { value.abs_lower() } else { Magnitude::ZERO }
}

/// A list of balls as integers in units of `2^-scale`.
struct FixedList {
    values: Vec<Integer>,
    /// Bound of the absolute values.
    size: Magnitude,
    /// Bound of their errors, in units.
    error: Magnitude,
}

impl FixedList {
    fn new(list: &[Real], scale: u32) -> Result<FixedList, RouteFailure> {
        let mut result =
            FixedList { values: Vec::with_capacity(list.len()), size: Magnitude::ZERO, error: Magnitude::ZERO };
        for ball in list {
            let (value, error) = fixed(ball, scale)?;
            result.size = result.size.max(ball.abs_upper());
            result.error = result.error.max(error);
            result.values.push(value);
        }
        Ok(result)
    }
}

/// `Sum Sum v v'/(cosh + cosh)` over the far nodes.
///
/// `g_ij = f_ij Z^(i+j-2)/2` obeys `g_ij = a_(i-1) a_(j-1) - Z^2 g_(i-1)(j-1)`, `a_i = alpha_i Z^i`, along each diagonal.
///
/// **Rounding** (units `2^-s`): with `|a| <= A`, off by `e_a`, and `Z^2` off by `e_z`, every `g` is at most
/// `A^2/(1 - Z^2) =: B` and off by at most `e_g = (2 A e_a + e_a^2 2^-s + 2 + B e_z)/(1 - Z^2 - e_z 2^-s)`. With weights
/// `|s_i + s_j - 1/2| <= 2 S` off by `2 e_s` and `1/(1 - q^n) <= G` off by `e_c`, each of the at most `J^2/4` pairs
/// (counted twice off the diagonal) adds at most `G (2 S e_g + 2 B e_s + 2 e_g e_s 2^-s) + 2 (S + e_s 2^-s)(B + e_g 2^-s) e_c`.
fn far_far(geometry: &Geometry, alpha: &[Real], plan: &FarPlan, effort: &Effort) -> Result<Real, RouteFailure> {
    let (bits, scale, most) = (plan.lattice.bits, plan.lattice.bits, plan.series_terms);
    let square = geometry.start.square(bits);
    let (minus_square, square_error) = fixed(&square.neg(), scale)?;
    let alpha = FixedList::new(&alpha[..most], scale)?;
    let share_balls = shares(geometry, most, plan);
    let shares = FixedList::new(&share_balls[1..], scale)?;
    let geometric = FixedList::new(&geometry.geometric[1..most], scale)?;
    let half = Integer::from(1) << (scale - 1);
    let mut diagonals = vec![Integer::new(); most + 1];
    let mut g = Integer::new();
    for offset in 0..most - 1 {
        effort.check()?;
        rug::Assign::assign(&mut g, 0);
        for i in 1.. {
            let j = i + offset;
            if i + j > most {
                break;
            }
            g *= &minus_square;
            g += &alpha.values[i - 1] * &alpha.values[j - 1];
            g >>= scale;
            let mut weight = Integer::from(&shares.values[i - 1] + &shares.values[j - 1]);
            weight -= &half;
            if offset != 0 {
                weight <<= 1;
            }
            diagonals[i + j] += &g * weight;
        }
    }
    let mut total = Integer::new();
    for (s, diagonal) in diagonals.iter().enumerate().skip(2) {
        total += diagonal * &geometric.values[s - 2];
    }
    let unit = Magnitude::power_of_two(-i64::from(scale));
    let below = Real::from_i64(1).sub(&square, BOUND_BITS).abs_lower();
    let below = below.sub_down(square_error.mul(unit));
    let two = Magnitude::from_u64(2);
    let (a, e_a, e_s, e_c) = (alpha.size, alpha.error, shares.error, geometric.error);
    let bound = a.mul(a).div(below);
    let e_g = a.mul(e_a).mul(two).add(e_a.mul(e_a).mul(unit)).add(two).add(bound.mul(square_error)).div(below);
    let in_weights = shares.size.mul(e_g).add(bound.mul(e_s)).add(e_g.mul(e_s).mul(unit)).mul(two).mul(geometric.size);
    let in_factors = shares.size.add(e_s.mul(unit)).mul(bound.add(e_g.mul(unit))).mul(two).mul(e_c);
    let pairs = Magnitude::from_u64((most as u64).pow(2) / 2 + 1);
    let error = in_weights.add(in_factors).mul(pairs).mul(unit);
    let value = Real::from_scaled(&total, -3 * i64::from(scale)).round(bits).widen(error);
    Ok(value.mul(&geometry.start.shift(1), bits))
}

/// `s_i` for `i = 1..=most` at index `i`.
fn shares(geometry: &Geometry, most: usize, plan: &FarPlan) -> Vec<Real> {
    let bits = plan.lattice.bits;
    let mut list = vec![Real::whole_line(), first_share(geometry, plan)];
    for i in 1..most {
        list.push(geometry.geometric[i].sub(&list[i], bits));
    }
    list
}

/// `s_1 = 1/2 + Sum_{r>=1} q^r/(1 + q^r)`.
fn first_share(geometry: &Geometry, plan: &FarPlan) -> Real {
    let bits = plan.lattice.bits;
    let one = Real::from_i64(1);
    let q = one.sub(&one.div(&geometry.geometric[1], bits), bits);
    alternating_lambert(&q, bits).add(&one.shift(-1), bits)
}

/// `Sum_{r>=1} q^r/(1 + q^r) = L(q) - 2 L(q^2)` for `0 < q < 1`.
pub(super) fn alternating_lambert(q: &Real, bits: Bits) -> Real {
    lambert(q, bits).sub(&lambert(&q.square(bits), bits).shift(1), bits)
}

/// `L(x) = Sum_{n>=1} x^(n^2) (1 + x^n)/(1 - x^n)` for `0 < x < 1`.
///
/// The terms beyond `N` sum to at most `2 x^((N+1)^2)/(1 - x)^2`: each is at most `2 x^(n^2)/(1 - x)`, and
/// `Sum_{n>N} x^(n^2) <= x^((N+1)^2)/(1 - x)`.
fn lambert(x: &Real, bits: Bits) -> Real {
    let one = Real::from_i64(1);
    let square = x.square(bits);
    let goal = Magnitude::power_of_two(-i64::from(bits));
    let mut total = Real::zero();
    // power = x^n, gaussian = x^(n^2), odd = x^(2n+1)
    let (mut power, mut gaussian, mut odd) = (x.clone(), x.clone(), x.mul(&square, bits));
    loop {
        let ratio = one.add(&power, bits).div(&one.sub(&power, bits), bits);
        total = total.add(&gaussian.mul(&ratio, bits), bits);
        gaussian = gaussian.mul(&odd, bits);
        odd = odd.mul(&square, bits);
        power = power.mul(x, bits);
        if gaussian.abs_upper().cmp_value(goal).is_lt() || !gaussian.is_bounded() {
            break;
        }
    }
    let below = one.sub(x, bits).abs_lower();
    total.widen(gaussian.abs_upper().shift(1).div(below.mul_down(below)))
}

impl Geometry {
    /// Tail of the far-far series beyond `i + j = series_terms`.
    fn far_tail(&self, far: &dyn FarWeights, plan: &FarPlan) -> Magnitude {
        let radius = self.lambda.mul(&self.start, BOUND_BITS);
        let growth = far.majorant(&radius);
        let square = radius.square(BOUND_BITS);
        let below = Real::from_i64(1).sub(&square, BOUND_BITS).abs_lower();
        let series = square.abs_upper().shift(1).mul(growth).mul(growth).div(below);
        let first = self.geometric[1].abs_upper();
        // s_1 <= Sum q^r = 1/(1 - q).
        let weight = first.mul(first).shift(1).div(self.start.abs_lower());
        weight.mul(series).mul(inverse_power(&self.lambda, plan.series_terms + 1))
    }
}

/// The cross block, by Horner's rule in fixed point with arguments at most one.
///
/// `p` is written in `u e^(-x_K)`, so its coefficients are `mu_n e^(n x_K)` and its arguments
/// `e^(±x_k - x_K) <= 1`. With values bounded by `size = Sum |c_n|`, one Horner step errs by at most
/// `2 size` units through its argument (off by less than two units), `2^-8` by cutting it, one by rounding down;
/// as arguments do not exceed one, errors only add up, together with those of the coefficients. Terms left out because
/// `u^n < 2^-scale` sum to at most `size` units.
fn cross(
    far: &dyn FarWeights,
    geometry: &Geometry,
    nodes: &Weights<'_>,
    plan: &FarPlan,
    effort: &Effort,
) -> Result<Real, RouteFailure> {
    let (coefficients, errors) = cross_coefficients(far, geometry, plan)?;
    let scale = plan.lattice.scale;
    let arguments = arguments(&plan.lattice)?;
    let mut total = Integer::new();
    for (index, (ratio, pair)) in nodes.ratios.iter().zip(&arguments).enumerate() {
        if index % 16 == 0 {
            effort.check()?;
        }
        let difference = horner(&coefficients, &pair.0, scale) - horner(&coefficients, &pair.1, scale);
        total += ratio * difference;
    }
    let count = arguments.len() as u64;
    let size: Magnitude = coefficients.iter().fold(Magnitude::ZERO, |m, c| {
        m.add(Magnitude::from_float(&rug::Float::with_val_round(64, c, rug::float::Round::AwayZero).0))
    });
    let size = size.shift(-i64::from(scale));
    let each = Magnitude::from_u64(4).add(size.shift(1));
    let steps = Magnitude::from_u64(plan.cross_terms as u64 + 1).mul(each).add(size.shift(1));
    // |p| <= size, so an error e of the ratios gives 2 e size; Horner's error is weighted by r <= 1/4.
    let from_ratios = nodes.error_units.mul(size).shift(1);
    let units = steps.add(errors).add(from_ratios).mul(Magnitude::from_u64(count));
    let value = Real::from_scaled(&total, -2 * i64::from(scale)).round(plan.lattice.bits);
    let tails = geometry.cross_tail(far, plan, count).add(geometry.far_tail(far, plan).shift(-4));
    Ok(value.widen(units.shift(-i64::from(scale))).widen(tails))
}

/// `(-1)^(n-1) mu_n e^(n x_K)` for `n = 1..=cross_terms` in fixed point, and the sum of their errors.
fn cross_coefficients(
    far: &dyn FarWeights,
    geometry: &Geometry,
    plan: &FarPlan,
) -> Result<(Vec<Integer>, Magnitude), RouteFailure> {
    let bits = plan.lattice.bits;
    let alpha = far.coefficients(&geometry.outer, geometry.outer_terms + 1, bits);
    let gap = geometry.outer.mul(&geometry.edge, bits);
    let mut power = gap.clone();
    let mut list = Vec::with_capacity(plan.cross_terms);
    let mut errors = Magnitude::ZERO;
    let terms = geometry.outer_terms + 1;
    let alpha = FixedList::new(&alpha[..terms], bits)?;
    let geometric = FixedList::new(&geometry.geometric[1..plan.cross_terms + terms], bits)?;
    // Each product errs by the usual rule; one unit for all that is below the unit.
    let unit = Magnitude::power_of_two(-i64::from(bits));
    let each = alpha.size.mul(geometric.error).add(geometric.size.add(geometric.error.mul(unit)).mul(alpha.error));
    let product_error = each.mul(Magnitude::from_u64(terms as u64)).mul(unit);
    for n in 1..=plan.cross_terms {
        let mut sum = Integer::new();
        for (coefficient, factor) in alpha.values.iter().zip(&geometric.values[n - 1..]) {
            sum += coefficient * factor;
        }
        let moment = Real::from_scaled(&sum, -2 * i64::from(bits)).round(bits).widen(product_error);
        let value = moment.mul(&power, bits);
        let signed = if n % 2 == 1 { value } else { value.neg() };
        let (fixed, error) = signed.to_fixed(i64::from(plan.lattice.scale)).ok_or(RouteFailure::OutOfReach {
            reason: "a moment of the far field has no finite enclosure".to_owned(),
        })?;
        errors = errors.add(error);
        list.push(fixed);
        power = power.mul(&gap, bits);
    }
    Ok((list, errors))
}

/// `(e^(x_k - x_K), e^(-x_k - x_K))` in fixed point for the near nodes, each off by less than two units.
fn arguments(plan: &Lattice) -> Result<Vec<(Integer, Integer)>, RouteFailure> {
    let powers = Powers::new(plan, plan.scale)?;
    Ok((plan.first..=plan.near).map(|k| (powers.at(plan.near - k), powers.at(plan.near + k))).collect())
}

/// `Sum_n c_n u^n`; the argument is cut to the bits that the running value can use, and terms with
/// `u^n < 2^-scale` are left out.
fn horner(coefficients: &[Integer], argument: &Integer, scale: u32) -> Integer {
    let mut value = Integer::new();
    // u < 2^-(zeros/2): twice the binary logarithm, from the leading bits.
    let length = argument.significant_bits();
    let leading = Integer::from(argument >> length.saturating_sub(16)).to_u32().unwrap_or(u32::MAX);
    // The argument one has more than `scale` bits, and no power of it may be left out.
    let below_one = length <= scale && length > 16 && leading < 46_340;
    let zeros = 2 * scale.saturating_sub(length) + u32::from(below_one);
    let needed = (2 * scale).checked_div(zeros).map_or(coefficients.len(), |terms| terms as usize + 1);
    for coefficient in coefficients.iter().take(needed).rev() {
        value += coefficient;
        let used = value.significant_bits() + 8;
        if used < scale {
            let cut = scale - used;
            value *= Integer::from(argument >> cut);
            value >>= used;
        } else {
            value *= argument;
            value >>= scale;
        }
    }
    value
}

impl Geometry {
    /// Cut-off errors of the cross block.
    fn cross_tail(&self, far: &dyn FarWeights, plan: &FarPlan, count: u64) -> Magnitude {
        let bits = BOUND_BITS;
        let one = Real::from_i64(1);
        let gap = self.outer.mul(&self.edge, bits);
        let below = positive_lower(&one.sub(&gap, bits));
        let first = self.geometric[1].abs_upper();
        let ratio = gap.abs_upper();
        let terms = plan.cross_terms as u64;
        let series = ratio.pow(terms + 1).mul(Magnitude::from_u64(terms + 1)).div(below.mul_down(below));
        let series = series.mul(first).mul(first).shift(-2);
        let radius = self.outer_lambda.mul(&self.outer, bits);
        let growth = far.majorant(&radius);
        let shrink = positive_lower(&one.sub(&one.div(&self.outer_lambda, bits), bits));
        let moments = growth.mul(inverse_power(&self.outer_lambda, self.outer_terms + 1)).mul(first).div(shrink);
        let spread = ratio.div(below).mul(Magnitude::from_u64(count)).shift(-1);
        series.add(moments.mul(spread))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn horner_is_as_near_as_its_bound_says() {
        const SCALE: u32 = 40;
        // More coefficients than the powers of any argument below one could need.
        let coefficients: Vec<Integer> = (0..200u32).map(|n| (Integer::from(1) << (SCALE - 8)) / (n + 3)).collect();
        let size: Integer = coefficients.iter().sum();
        for argument in [Integer::from(1) << SCALE, (Integer::from(1) << SCALE) - 1, Integer::from(46_341) << 24u32] {
            let found = horner(&coefficients, &argument, SCALE);
            let mut exact = rug::Rational::new();
            let u = rug::Rational::from((argument, Integer::from(1) << SCALE));
            for coefficient in coefficients.iter().rev() {
                exact = (exact + coefficient) * &u;
            }
            // Two units for each step and what is left out, see `cross`.
            let bound = 2 * coefficients.len() as u32 + Integer::from(&size >> SCALE) + 1u32;
            assert!((exact - found).abs() <= bound);
        }
    }
}
