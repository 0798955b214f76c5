//! Usual slips: other quantities that a refuted statement would be right about.
//!
//! "Would be upheld if ..." is help for the author, never a verdict; each slip reported is certified like an answer.

use super::file::{Claim, Text};
use super::question::{self, Asked};
use super::statement::{Standing, Statement};
use crate::arithmetic::{Interval, Real};
use crate::error::Error;
use crate::functions::elementary::sqrt;
use crate::quantities::tail::TailResult;
use crate::report::DecimalBounds;
use rug::Rational;

/// Digits with which slips are computed.
const DIGITS: u32 = 15;
const BITS: u32 = 160;

/// A slip under which the statement would be upheld.
#[derive(Clone, Debug)]
pub struct Slip {
    /// What was mistaken for what.
    pub slip: String,
    /// Bounds of the quantity under the slip.
    pub bounds: DecimalBounds,
}

/// All slips that fit; those that cannot be computed are left out.
pub fn find(claim: &Claim, statement: &Statement, asked: &Asked, result: &TailResult) -> Vec<Slip> {
    let mut candidates: Vec<(String, Option<Interval>)> = arithmetic(asked, result);
    for (slip, changed) in changed_claims(claim) {
        candidates.push((slip, compute(&changed).ok()));
    }
    let fits = |interval: &Interval| statement.readings.iter().any(|r| r.standing(interval) == Standing::Inside);
    candidates
        .into_iter()
        .filter_map(|(slip, interval)| interval.filter(fits).map(|interval| (slip, interval)))
        .map(|(slip, interval)| Slip { slip, bounds: DecimalBounds::new(&interval, DIGITS) })
        .collect()
}

/// Slips that change the number itself.
fn arithmetic(asked: &Asked, result: &TailResult) -> Vec<(String, Option<Interval>)> {
    let ball = result.interval.to_real(BITS);
    let times = |numerator: u32, denominator: u32| {
        let factor = Real::from_rational(&Rational::from((numerator, denominator)), BITS);
        Some(ball.mul(&factor, BITS).to_interval(BITS))
    };
    let both = asked.question().inputs().get("side") == Some("both");
    let mut list = vec![
        (
            "the absolute amplitude was given instead of the probability".to_owned(),
            Some(sqrt(&ball, BITS).to_interval(BITS)),
        ),
        ("the square of the probability was given".to_owned(), Some(ball.square(BITS).to_interval(BITS))),
        ("percent were given without the sign".to_owned(), times(100, 1)),
        ("a fraction was written as percent".to_owned(), times(1, 100)),
        (
            "the probability of the opposite was given".to_owned(),
            Some(Real::from_i64(1).sub(&ball, BITS).to_interval(BITS)),
        ),
    ];
    if both {
        list.push(("one side was counted instead of both".to_owned(), times(1, 2)));
    } else {
        list.push(("both sides were counted instead of one".to_owned(), times(2, 1)));
    }
    list
}

/// Slips that change an input.
fn changed_claims(claim: &Claim) -> Vec<(String, Claim)> {
    let mut list = Vec::new();
    for (name, slip, factor) in [
        ("half-width", "the half-width was taken for the width", Rational::from((1, 2))),
        ("half-width", "the width was taken for the half-width", Rational::from(2)),
        ("radius", "the radius was taken for the diameter", Rational::from((1, 2))),
        ("radius", "the diameter was taken for the radius", Rational::from(2)),
    ] {
        if let Some(changed) = with_parameter(claim, name, &factor) {
            list.push((slip.to_owned(), changed));
        }
    }
    if claim.mass.as_ref().is_none_or(|mass| mass.0 != "0") {
        let massless = Claim { mass: Some(Text("0".to_owned())), ..claim.clone() };
        list.push(("the massless dispersion was used".to_owned(), massless));
    }
    if claim.quantity.is_none() && claim.region.as_deref().is_none_or(|region| region == "beyond cone") {
        let largest = Claim { quantity: Some("largest over time".to_owned()), ..claim.clone() };
        list.push(("the largest value over all times was given".to_owned(), largest));
    }
    for (slip, factor) in
        [("twice the time was used", Rational::from(2)), ("half the time was used", Rational::from((1, 2)))]
    {
        if let Some(time) = claim.time.as_ref().and_then(|text| scaled(&text.0, &factor)) {
            list.push((slip.to_owned(), Claim { time: Some(Text(time)), ..claim.clone() }));
        }
    }
    list
}

fn with_parameter(claim: &Claim, name: &str, factor: &Rational) -> Option<Claim> {
    let changed = scaled(&claim.packet.get(name)?.0, factor)?;
    let mut claim = claim.clone();
    claim.packet.insert(name.to_owned(), Text(changed));
    Some(claim)
}

/// The exact product as text, for a single number.
fn scaled(text: &str, factor: &Rational) -> Option<String> {
    let value: crate::arithmetic::ExactInput = text.parse().ok()?;
    value.is_point().then(|| Rational::from(value.lower() * factor).to_string())
}

fn compute(claim: &Claim) -> Result<Interval, Error> {
    let mut asked = question::read(claim)?;
    asked.set_effort(DIGITS, None);
    Ok(asked.certify()?.interval)
}
