//! Outside the cones: the momentum integral on its branch cut.
//!
//! # From the definition to the cut
//!
//! Beyond the cone of its side (see [`super`]) `X±` and `X'±` are positive, so `|exp(i (X e^eta - X' e^-eta)/2)|
//! <= 1` for `0 <= Im eta <= pi` and the line of integration can be raised to `eta = s + i pi/2`, where `p = i
//! cosh(s)`: both lips of the cut `p = i kappa`, `kappa >= 1`, are met, one for `s > 0`, one for `s < 0`. There
//!
//! ```text
//! cosh(eta) cosh(eta+theta) = -sinh(s) sinh(s+theta),     sin(a sinh(eta+theta))/sinh(eta+theta) = sinh(a l)/l,
//! ```
//!
//! with `l = cosh(s+theta)`. The square root is continued from the real axis: at `Re eta = -theta/2` its square
//! is `(cosh 2 Im eta + cosh theta)/2` with `cos` for `cosh` of an imaginary number, positive all the way up, so
//! between the two square-root points `s = 0` and `s = -theta` the root is positive; to the right of both,
//! `cosh(eta)` and `cosh(eta+theta)` come from the first quadrant, so it is `+i` times a positive number, to the
//! left `-i` times one. The point `s = -theta` is the zero of `omega(Lp)`, at `kappa = cosh(theta)`. Let `sigma
//! = s + theta/2` and
//!
//! ```text
//! q = sinh(|theta|/2),  c = cosh(theta/2),    -sinh(s) sinh(s+theta) = q^2 - sinh^2(sigma).
//! ```
//!
//! Joining the two outer pieces (`sigma` and `-sigma`), `psi' = N (B + i A)` up to the sign of `A`,
//!
//! ```text
//! A = Int_{|theta|/2}^inf sqrt(sinh^2 sigma - q^2) [g(sigma) - g(-sigma)] dsigma,
//! B = Int_{-|theta|/2}^{|theta|/2} sqrt(q^2 - sinh^2 sigma) g(sigma) dsigma,
//! g(sigma) = exp(-x cosh s + t sinh s) 2 sinh(a l)/l.
//! ```
//!
//! # Substitutions that remove the square-root points
//!
//! * `A`: `sinh sigma = q cosh w`, `w >= 0`: `sqrt(...) dsigma = rho dw`, `rho = q^2 sinh^2 w / cosh sigma`,
//!   even in `w` and analytic for `|Im w| < pi/2`, for every `q > 0`.
//! * `B`: `tanh sigma = T tanh z`, `T = q/c`: `sqrt(...) dsigma = rho_B dz`, `rho_B = q^2 c^2/(c^2 + sinh^2
//!   z)^(3/2)`, analytic for `|Im z| < pi/2`.
//!
//! # The probability
//!
//! With `k = cosh(sigma - theta/2)`, `l = cosh(sigma + theta/2)`, the lead `L = a sinh(theta) + t`, the distance
//! `d` of the region from the cone and `E = sqrt(d (d + 2L))`, collecting the exponents at `x = a e^theta + t +
//! d` gives `g(sigma) = exp(-E) exp(-Y1) (1 - exp(-2al))/l` and `g(-sigma) = exp(-E) exp(-Y2) (1 - exp(-2ak))/k`
//! with
//!
//! ```text
//! Y1 = (r1 e^(s/2) - r2 e^(-s/2))^2,    s = sigma - theta/2,    r1 = sqrt(d/2),    r2 = sqrt(d/2 + L),
//! Y2 = (r2 e^(y/2) - r1 e^(-y/2))^2,    y = sigma + theta/2.
//! ```
//!
//! The integral over `x` acts on `exp(-x (k + k'))` alone, so for one side
//!
//! ```text
//! P = (I_A + I_B)/(8 pi^2 a) exp(-2E),     I = Int Int dmu(K) dmu(K')/(K + K'),
//! ```
//!
//! where `mu` of `A` has the density `f1 = rho exp(-Y1)(1 - exp(-2al))/l` at `K = k` and `-f2`, `f2 = rho
//! exp(-Y2)(1 - exp(-2ak))/k`, at `K = l`, and `mu` of `B` has `rho_B exp(-Y1) (1 - exp(-2al))/l` at `K = k`.
//! The cross terms of `A` and `B` are imaginary in `|B + iA|^2` and drop out. The trapezoid rule in `w` and `z`
//! is used; bounds in [`bounds`].

mod bounds;
mod nodes;
mod plan;
mod sum;

use super::side::{Frame, Side};
use super::{BoostProblem, Region, out_of_reach};
use crate::arithmetic::{Bits, Interval, Magnitude, Real, decimal};
use crate::functions::elementary::{exp, pi, sqrt};
use crate::routes::{Effort, Evaluation, RouteFailure, RouteOutcome};
use plan::Plan;
use rug::Rational;

/// Rounds of evaluation before a width above the goal is returned as it is.
const ROUNDS: usize = 3;

/// The route on the branch cut.
#[derive(Clone, Debug)]
pub struct Cut {
    problem: BoostProblem,
}

impl Cut {
    /// The route for a problem.
    pub fn new(problem: BoostProblem) -> Cut {
        Cut { problem }
    }
}

impl Evaluation for Cut {
    fn name(&self) -> &'static str {
        "cut"
    }

    fn method(&self) -> &'static str {
        "trapezoid rules on the branch cut of the momentum integral, square-root points removed by substitution"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        let sides = self.problem.sides()?;
        let mut total: Option<RouteOutcome> = None;
        for (index, (side, weight)) in sides.iter().enumerate() {
            let found = evaluate_side(side, &self.problem.region, digits + 1, effort)?;
            let name = if sides.len() == 1 { "each side" } else { ["right", "left"][index.min(1)] };
            total = Some(join(total, found, i64::from(*weight), name));
        }
        total.ok_or_else(|| out_of_reach("no side is asked for"))
    }
}

/// Adds the weighted outcome of one side to what was found before.
pub(super) fn join(before: Option<RouteOutcome>, found: RouteOutcome, weight: i64, name: &str) -> RouteOutcome {
    let bits = found.bits.max(before.as_ref().map_or(0, |outcome| outcome.bits));
    let mut interval = found.interval.to_real(bits + 8).mul_i64(weight, bits + 8);
    let mut nodes = found.nodes;
    let mut witness = Vec::new();
    if let Some(outcome) = before {
        interval = interval.add(&outcome.interval.to_real(bits + 8), bits + 8);
        nodes += outcome.nodes;
        witness = outcome.witness;
    }
    witness.extend(found.witness.into_iter().map(|(key, value)| (format!("{name}: {key}"), value)));
    RouteOutcome { interval: interval.to_interval(bits).clamp_non_negative(), bits, nodes, witness }
}

/// The probability beyond `d` of one side, repeated with more digits while it is too wide.
pub(super) fn evaluate_side(
    side: &Side,
    region: &Region,
    digits: u32,
    effort: &Effort,
) -> Result<RouteOutcome, RouteFailure> {
    if side.boost.is_rest() && side.time == 0 {
        return nothing(side, region);
    }
    if side.boost.is_rest() {
        return Err(out_of_reach("without a boost the routes of the box at rest apply"));
    }
    let mut goal = digits;
    let mut outcome = evaluate_once(side, region, goal, effort)?;
    for _ in 1..ROUNDS {
        let reached = outcome.interval.relative_digits(digits);
        if reached >= digits {
            break;
        }
        goal += digits - reached + 2;
        outcome = evaluate_once(side, region, goal, effort)?;
    }
    Ok(outcome)
}

/// At `t = 0` in its rest frame the packet is compact: exactly zero beyond its edges.
fn nothing(side: &Side, region: &Region) -> Result<RouteOutcome, RouteFailure> {
    if matches!(region, Region::Beyond(r) if *r < side.half_width) {
        return Err(out_of_reach("the region reaches inside the cone"));
    }
    let interval = Real::zero().to_interval(64);
    Ok(RouteOutcome { interval, bits: 64, nodes: 0, witness: Vec::new() })
}

fn evaluate_once(side: &Side, region: &Region, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
    let rough = Setting::new(side, region, 64)?;
    let plan = Plan::new(&rough, digits)?;
    effort.allow_bits(plan.bits)?;
    let setting = Setting::new(side, region, plan.bits)?;
    let (sum, nodes) = lattice_sum(&setting, &plan, effort)?;
    let errors = bounds::errors(&setting, &plan);
    let integral = errors.iter().fold(sum, |sum, (_, error)| sum.widen(*error));
    let bits = plan.bits;
    let scale = pi(bits).square(bits).mul(&setting.half_width, bits).shift(3);
    let mut probability = integral.div(&scale, bits);
    if !setting.at_cone {
        probability = probability.mul(&exp(&setting.proper_distance.shift(1).neg(), bits), bits);
    }
    let interval = probability.to_interval(bits).clamp_non_negative();
    Ok(RouteOutcome { interval, bits, nodes, witness: witness(&plan, &errors, &integral) })
}

/// The two double sums without the errors of discretisation and cutting.
fn lattice_sum(setting: &Setting, plan: &Plan, effort: &Effort) -> Result<(Real, usize), RouteFailure> {
    let outer = nodes::outer(setting, plan, effort)?;
    let inner = nodes::inner(setting, plan, effort)?;
    let sum = sum::cauchy(&outer, plan.bits, effort)?.add(&sum::cauchy(&inner, plan.bits, effort)?, plan.bits);
    let step = Real::from_rational(&plan.step, plan.bits);
    Ok((sum.mul(&step.square(plan.bits), plan.bits), outer.len() + inner.len()))
}

/// One side's numbers as balls of the working precision.
struct Setting {
    frame: Frame,
    half_width: Real,
    /// `r1 = sqrt(d/2)`
    distance_root: Real,
    /// `r2 = sqrt(d/2 + L)`
    lead_root: Real,
    /// `E = sqrt(d (d + 2L))`
    proper_distance: Real,
    at_cone: bool,
}

impl Setting {
    fn new(side: &Side, region: &Region, bits: Bits) -> Result<Setting, RouteFailure> {
        let work = bits + 16;
        let lead = side.lead(work)?;
        let distance = side.distance_beyond(region, work)?;
        let half = distance.shift(-1);
        let product = distance.mul(&distance.add(&lead.shift(1), work), work);
        Ok(Setting {
            frame: Frame::new(&side.boost, bits),
            half_width: Real::from_rational(&side.half_width, bits),
            distance_root: sqrt(&half, work),
            lead_root: sqrt(&half.add(&lead, work), work),
            proper_distance: sqrt(&product, work),
            at_cone: distance.is_exact() && distance.may_be_zero(),
        })
    }
}

impl Side {
    /// `d`, the distance of the region from this side's cone.
    ///
    /// # Errors
    /// [`RouteFailure::OutOfReach`] if the region reaches inside.
    fn distance_beyond(&self, region: &Region, bits: Bits) -> Result<Real, RouteFailure> {
        let distance = match region {
            Region::Cone => Real::zero(),
            Region::BeyondCone(distance) => Real::from_rational(distance, bits),
            Region::Beyond(r) => {
                self.distance(&Rational::from(r - &self.time), -1, super::side::Factor::Growth, bits)?
            }
            Region::Contracted if self.boost.is_rest() => Real::zero(),
            Region::Contracted => return Err(out_of_reach("the contracted interval lies inside the cones")),
        };
        if distance.certainly_negative() {
            return Err(out_of_reach("the region reaches inside the light cones of the edge events"));
        }
        Ok(distance)
    }
}

fn witness(plan: &Plan, errors: &[(&'static str, Magnitude)], integral: &Real) -> Vec<(String, String)> {
    let mut list = vec![
        ("step h".to_owned(), plan.step.to_string()),
        ("strip half-width b".to_owned(), plan.strip.to_string()),
        ("outer nodes".to_owned(), format!("{}..={}", plan.outer_first, plan.outer_last)),
        ("inner nodes".to_owned(), format!("{}..={}", plan.inner_first, plan.inner_last)),
    ];
    for (name, bound) in errors {
        list.push(((*name).to_owned(), decimal::upper_decimal(&bound.to_float(), 4)));
    }
    let interval: Interval = integral.to_interval(plan.bits);
    list.push(("integrals without exp(-2E), lower".to_owned(), decimal::lower_decimal(interval.lower(), 20)));
    list.push(("integrals without exp(-2E), upper".to_owned(), decimal::upper_decimal(interval.upper(), 20)));
    list
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::packets::Boost;

    /// Half-width, rapidity, time, distance.
    const CASES: [(i64, i64, i64, i64); 5] =
        [(1000, 500, 0, 0), (100, 1000, 0, 0), (3000, 1500, 0, 400), (1000, -500, 1500, 0), (2000, -700, 4000, 900)];

    /// The lattice sum, its bounds and the true integrals of a case with a spoilt plan.
    type Found = (Real, Vec<(&'static str, Magnitude)>, Real);

    fn find(case: (i64, i64, i64, i64), spoil: impl Fn(&mut Plan, &Setting)) -> Found {
        let number = |n: i64| Rational::from((n, 1000));
        let side = Side::new(&number(case.0), &Boost::Rapidity(number(case.1)), &number(case.2)).unwrap();
        let region = Region::BeyondCone(number(case.3));
        let rough = Setting::new(&side, &region, 64).unwrap();
        let effort = Effort::default();
        let fine = Plan::new(&rough, 36).unwrap();
        let setting = Setting::new(&side, &region, fine.bits).unwrap();
        let all = |list: &[(&str, Magnitude)]| list.iter().fold(Magnitude::ZERO, |sum, (_, error)| sum.add(*error));
        let truth = lattice_sum(&setting, &fine, &effort).unwrap().0.widen(all(&bounds::errors(&setting, &fine)));
        let mut plan = Plan::new(&rough, 30).unwrap();
        spoil(&mut plan, &rough);
        let sum = lattice_sum(&setting, &plan, &effort).unwrap().0;
        (sum, bounds::errors(&setting, &plan), truth)
    }

    /// Some bounds made large: they hold, forgetting them is noticed, and they are at most `excess` times the error.
    fn bounds_alone(spoilt: &[usize], excess: f64, spoil: impl Fn(&mut Plan, &Setting)) {
        for case in CASES {
            let (sum, errors, truth) = find(case, &spoil);
            let total = |kept: &dyn Fn(usize) -> bool| {
                let list = errors.iter().enumerate().filter(|(place, _)| kept(*place));
                list.fold(Magnitude::ZERO, |sum, (_, (_, error))| sum.add(*error))
            };
            let name = errors[spoilt[0]].0;
            assert!(sum.clone().widen(total(&|_| true)).overlaps(&truth), "{name} does not hold for {case:?}");
            let noticed = !sum.clone().widen(total(&|place| !spoilt.contains(&place))).overlaps(&truth);
            let error = truth.sub(&sum, 200).abs_lower().log2_estimate();
            let ratio = (total(&|place| spoilt.contains(&place)).log2_estimate() - error).exp2();
            println!("{name} {case:?}: {ratio:.1} times the error");
            assert!(noticed, "{name} could be forgotten for {case:?}");
            assert!(ratio < excess, "{name} is {ratio} times the error for {case:?}");
        }
    }

    /// The same ends with the step and the strip of a few digits.
    fn coarser(plan: &mut Plan, rough: &Setting) {
        let coarse = Plan::new(rough, 5).unwrap();
        let factor = Rational::from(&coarse.step / &plan.step).to_f64();
        let scaled = |index: i64| index as f64 / factor;
        plan.outer_first = (scaled(plan.outer_first).floor() as i64).max(1);
        plan.outer_last = scaled(plan.outer_last).ceil() as i64;
        plan.inner_first = scaled(plan.inner_first).floor() as i64;
        plan.inner_last = scaled(plan.inner_last).ceil() as i64;
        (plan.step, plan.strip) = (coarse.step, coarse.strip);
    }

    #[test]
    fn discretisation_bound() {
        bounds_alone(&[0, 1], 1e11, coarser);
    }

    #[test]
    fn outer_cut_bound() {
        bounds_alone(&[2], 1e4, |plan, _| plan.outer_last = plan.outer_last / 4 + plan.outer_first);
    }

    #[test]
    fn inner_cut_bound() {
        bounds_alone(&[3], 1e8, |plan, _| {
            plan.inner_last /= 3;
            plan.inner_first /= 3;
        });
    }
}
