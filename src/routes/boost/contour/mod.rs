//! Position space: the amplitude as a lattice sum on lines off the cut, outside and inside the cones.
//!
//! # The amplitude on lines
//!
//! `psi' = M (E+ - E-)` with `|M| = 1/(2 pi sqrt(2a))`,
//!
//! ```text
//! E± = Int deta w(eta) exp((i/2) (X± e^eta - X'± e^-eta)),   w = sqrt(cosh(eta) cosh(eta+theta))/sinh(eta+theta),
//! ```
//!
//! both passing the pole `eta = -theta` on the same side, here above it. Each edge's integral may be moved,
//! within `|Im eta| < pi/2` where the square root is analytic, to a line on which it decays at both ends: the
//! right end wants `Im eta` to have the sign of `X`, the left end that of `X'` ([`mod@line`]):
//!
//! * `X, X' > 0`: `eta = u + i alpha`. So is `E+` everywhere in `x >= 0` at `t = 0`, and both outside the cone.
//! * `X < 0 < X'` (between the two lines of an edge's cone): `eta = eta_c + u - i alpha tanh u`, with the pole
//!   on the left.
//! * `X, X' < 0`: `eta = u - i alpha`, below the pole; `E- = Int - 2 pi i Res`, where the residue is the plane
//!   wave `sqrt(cosh theta) exp(-i x sinh(theta) - i t cosh(theta))`: the contracted box in motion.
//!
//! # The probability of an interval
//!
//! On an interval `[x1, x2]` between the singular points of `x` the same lines serve for all `x`. The trapezoid
//! rule gives `psi'/M = Sum_k v_k(x) + e(x)`, `v_k(x)` being proportional to `exp(i p_k x)`, so the square of
//! the sum is integrated in closed form ([`sum`]),
//!
//! ```text
//! Q = Sum_kl [v_k conj(v_l)]_{x1}^{x2} / (i (p_k - conj p_l)),
//! ```
//!
//! and with `|| e || <= eps` in `L2(x1, x2)` ([`mod@line`]) the norm of `psi'/M` differs from `sqrt Q` by at most
//! `eps`: no logarithm at an edge of the interval, where the amplitude is infinite, is ever evaluated.
//!
//! **Nodes left out.** With `T1`, `T2` bounds of the `L1` and `L2` norms of the nodes left out and `V = Sum_k
//! sup |v_k|` over the nodes kept (each `|v_k|` is an exponential of `x`, so the supremum is at an end), `Q`
//! changes by at most `2 V T1 + T2^2`.

mod line;
mod piece;
mod plan;
mod sum;
mod tilted;

use super::cut::join;
use super::side::Side;
use super::{BoostProblem, out_of_reach};
use crate::arithmetic::{Interval, Magnitude, Real, decimal};
use crate::functions::elementary::{pi, sqrt};
use crate::routes::{Effort, Evaluation, RouteFailure, RouteOutcome};
use piece::{Piece, Place};
use plan::Plan;

/// Rounds of evaluation before a width above the goal is returned as it is.
const ROUNDS: usize = 4;

/// The route on lines off the cut.
#[derive(Clone, Debug)]
pub struct Contour {
    problem: BoostProblem,
}

impl Contour {
    /// The route for a problem.
    pub fn new(problem: BoostProblem) -> Contour {
        Contour { problem }
    }
}

/// One minus the probability of the positions that do not count.
#[derive(Clone, Debug)]
pub struct Complement {
    problem: BoostProblem,
}

impl Complement {
    /// The route for a problem.
    pub fn new(problem: BoostProblem) -> Complement {
        Complement { problem }
    }
}

impl Evaluation for Contour {
    fn name(&self) -> &'static str {
        "contour"
    }

    fn method(&self) -> &'static str {
        "trapezoid rule for the amplitude on lines off the branch cut, its square integrated over x in closed form"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        let mut total: Option<RouteOutcome> = None;
        let sides = self.problem.sides()?;
        for (index, (side, weight)) in sides.iter().enumerate() {
            let name = if sides.len() == 1 { "each side" } else { ["right", "left"][index.min(1)] };
            let found = repeated(digits + 1, |goal| {
                add_pieces(&piece::outside(side, &self.problem.region)?, side, goal, effort)
            })?;
            total = Some(join(total, found, i64::from(*weight), name));
        }
        total.ok_or_else(|| out_of_reach("no side is asked for"))
    }
}

impl Evaluation for Complement {
    fn name(&self) -> &'static str {
        "complement"
    }

    fn method(&self) -> &'static str {
        "one minus the probability of the interval between, from the amplitude on lines off the branch cut"
    }

    fn evaluate(&self, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
        if self.problem.time != 0 {
            return Err(out_of_reach("the probability inside the cones is offered at the observer's time 0 only"));
        }
        let side = Side::new(&self.problem.half_width, &self.problem.boost, &self.problem.time)?;
        let pieces = piece::inside(&side, &self.problem.region)?;
        repeated(digits, |goal| {
            let inside = join(None, add_pieces(&pieces, &side, goal + 1, effort)?, 2, "each side");
            let bits = inside.bits + 8;
            let rest = Real::from_i64(1).sub(&inside.interval.to_real(bits), bits);
            Ok(RouteOutcome { interval: rest.to_interval(bits).clamp_non_negative(), ..inside })
        })
    }
}

/// Repeats with more digits while the result is too wide.
fn repeated(
    digits: u32,
    evaluate: impl Fn(u32) -> Result<RouteOutcome, RouteFailure>,
) -> Result<RouteOutcome, RouteFailure> {
    let mut goal = digits;
    let mut outcome = evaluate(goal)?;
    for _ in 1..ROUNDS {
        let reached = outcome.interval.relative_digits(digits);
        if reached >= digits {
            break;
        }
        goal += digits - reached + 2;
        outcome = evaluate(goal)?;
    }
    Ok(outcome)
}

/// The probability of some pieces of one side.
fn add_pieces(pieces: &[Piece], side: &Side, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
    let mut total: Option<RouteOutcome> = None;
    for piece in pieces {
        let found = evaluate_piece(piece, side, digits, effort)?;
        total = Some(join(total, found, 1, piece.name()));
    }
    let nothing = RouteOutcome { interval: Real::zero().to_interval(64), bits: 64, nodes: 0, witness: Vec::new() };
    Ok(total.unwrap_or(nothing))
}

fn evaluate_piece(piece: &Piece, side: &Side, digits: u32, effort: &Effort) -> Result<RouteOutcome, RouteFailure> {
    let rough = Place::new(piece, side, 64)?;
    let plan = Plan::new(&rough, digits)?;
    effort.allow_bits(plan.bits)?;
    let place = Place::new(piece, side, plan.bits)?;
    let bits = plan.bits;
    let (mut discretisation, mut cut) = (Magnitude::ZERO, line::Tails::ZERO);
    let mut nodes = Vec::new();
    for line in &plan.lines {
        discretisation = discretisation.add(line.discretisation(&place));
        cut = cut.add(line.tails(&place));
        line.nodes(&place, bits, effort, &mut nodes)?;
    }
    nodes.extend(place.plane_wave(bits));
    let sum = sum::hermitian(&nodes, bits, effort)?;
    let kept = nodes.iter().fold(Magnitude::ZERO, |sum, node| sum.add(node.largest()));
    let cut_error = kept.mul(cut.first).shift(1).add(cut.second.mul(cut.second));
    let square = sum.clone().widen(cut_error).to_interval(bits).clamp_non_negative().to_real(bits);
    let root = Real::new(square.upper(bits), Magnitude::ZERO);
    let twice = sqrt(&root, bits).abs_upper().mul(discretisation).shift(1);
    let whole = square.widen(twice.add(discretisation.mul(discretisation)));
    let scale = pi(bits).square(bits).mul(&place.half_width, bits).shift(3);
    let interval = whole.div(&scale, bits).to_interval(bits).clamp_non_negative();
    let witness = witness(&plan, discretisation, cut_error, &sum.to_interval(bits));
    Ok(RouteOutcome { interval, bits, nodes: nodes.len(), witness })
}

fn witness(plan: &Plan, discretisation: Magnitude, cut: Magnitude, sum: &Interval) -> Vec<(String, String)> {
    let mut list: Vec<(String, String)> = plan.lines.iter().map(line::Line::describe).collect();
    list.push(("discretisation bound, L2".to_owned(), decimal::upper_decimal(&discretisation.to_float(), 4)));
    list.push(("cut-off bound".to_owned(), decimal::upper_decimal(&cut.to_float(), 4)));
    list.push(("double sum, lower".to_owned(), decimal::lower_decimal(sum.lower(), 20)));
    list.push(("double sum, upper".to_owned(), decimal::upper_decimal(sum.upper(), 20)));
    list
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::packets::Boost;
    use crate::routes::boost::Region;
    use rug::Rational;

    /// The double sum, the discretisation bound and the cut-off bound of a plan.
    fn find(place: &Place, plan: &Plan) -> (Real, Magnitude, Magnitude) {
        let mut nodes = Vec::new();
        let (mut norm, mut cut) = (Magnitude::ZERO, line::Tails::ZERO);
        for line in &plan.lines {
            norm = norm.add(line.discretisation(place));
            cut = cut.add(line.tails(place));
            line.nodes(place, plan.bits, &Effort::default(), &mut nodes).unwrap();
        }
        nodes.extend(place.plane_wave(plan.bits));
        let sum = sum::hermitian(&nodes, plan.bits, &Effort::default()).unwrap();
        let kept = nodes.iter().fold(Magnitude::ZERO, |sum, node| sum.add(node.largest()));
        let cut_error = kept.mul(cut.first).shift(1).add(cut.second.mul(cut.second));
        let root = sqrt(&Real::from_float(sum.upper(64)), 64).abs_upper();
        (sum, root.mul(norm).shift(1).add(norm.mul(norm)), cut_error)
    }

    /// Every zone with a spoilt plan: the spoilt bound holds and is noticed when forgotten.
    fn noticed(excess: f64, discretisation: bool, spoil: impl Fn(&mut line::Line)) {
        for (half_width, theta, at) in [(1000, 500, 300), (400, 1000, 100), (2000, 300, 1500)] {
            let number = |n: i64| Rational::from((n, 1000));
            let side = Side::new(&number(half_width), &Boost::Rapidity(number(theta)), &Rational::new()).unwrap();
            for piece in piece::outside(&side, &Region::Beyond(number(at))).unwrap() {
                let place = Place::new(&piece, &side, 160).unwrap();
                let fine = Plan::new(&place, 16).unwrap();
                let (truth, first, second) = find(&place, &fine);
                let truth = truth.widen(first.add(second));
                // Each line in turn.
                for index in 0..fine.lines.len() {
                    let mut plan = Plan::new(&place, 13).unwrap();
                    spoil(&mut plan.lines[index]);
                    let (sum, norm, cut) = find(&place, &plan);
                    let (bound, rest) = if discretisation { (norm, cut) } else { (cut, norm) };
                    let name = format!("{} line {index} of {half_width} {theta}", piece.name());
                    assert!(sum.clone().widen(bound.add(rest)).overlaps(&truth), "{name}: the bound does not hold");
                    assert!(!sum.clone().widen(rest).overlaps(&truth), "{name}: the bound could be forgotten");
                    let error = truth.sub(&sum, 300).abs_lower().log2_estimate();
                    let ratio = (bound.log2_estimate() - error).exp2();
                    println!("{name}: {ratio:.1e} times the error");
                    assert!(ratio < excess, "{name}: {ratio} times the error");
                }
            }
        }
    }

    #[test]
    fn discretisation_bound() {
        noticed(1e6, true, |line| {
            line.step *= 5;
            line.first = line.first.div_euclid(5);
            line.last = line.last / 5 + 1;
        });
    }

    #[test]
    fn cut_off_bound() {
        noticed(1e6, false, |line| line.last = line.last * 2 / 5);
        noticed(1e6, false, |line| line.first = line.first * 2 / 5);
    }
}
