//! Checking a certificate without trusting it.
//!
//! The question is built anew from the inputs and computed again to more digits than the certificate states, by every
//! route, so with other nodes and another working precision. Let `R` be the interval found and `[lower, upper]` the
//! certificate's.
//!
//! * If `R` lies in `[lower, upper]`, then so does the probability: confirmed.
//! * If they have no common point, the bounds are wrong.
//! * If they overlap, `R` is computed again to still more digits ([`EXTRA_DIGITS`]); what stays undecided is not
//!   confirmed. With inputs that are intervals `R` encloses the whole range, and `[lower, upper]` has to contain it.
//!
//! Every route's own bounds have to meet `R`, and what each route finds by itself in the new computation has to meet
//! `[lower, upper]`. For the largest value over time the routes' bounds belong to one time, which is in the witness data,
//! and are compared with the tail at this time. Bounds found are compared as decimals rounded outward, stated
//! ones exactly as written.
//!
//! What needs no computation (hash, order of bounds, `value`, `digits`, `status`) is checked as well. Witness data other
//! than the time named are guarded by the hash alone: the bounds are confirmed without them.

use super::{Bounds, Certificate, RouteCertificate, file};
use crate::arithmetic::{ExactInput, Interval, decimal, written};
use crate::error::Error;
use crate::quantities::question::{Inputs, Question};
use crate::quantities::tail::{DEFAULT_MAX_BITS, MAX_DIGITS, Status, TailResult};
use crate::quantities::{peak, restore};
use rug::Rational;
use std::cmp::Ordering;
use std::path::Path;

/// How many digits more than stated are computed, until the bounds are decided.
pub const EXTRA_DIGITS: [u32; 3] = [7, 25, 60];

/// What became of one certificate.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// Everything that it states is confirmed.
    Confirmed,
    /// Something is wrong, or could not be confirmed.
    NotConfirmed,
    /// It is not a certificate that can be read.
    Unreadable,
}

impl Verdict {
    /// The name in reports.
    pub fn name(self) -> &'static str {
        match self {
            Verdict::Confirmed => "confirmed",
            Verdict::NotConfirmed => "not confirmed",
            Verdict::Unreadable => "unreadable",
        }
    }
}

/// The verdict on one file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Recheck {
    /// The path as given.
    pub file: String,
    /// The verdict.
    pub verdict: Verdict,
    /// What was found: which member, what it was, what would be right.
    pub reasons: Vec<String>,
}

/// Checks the certificate in one file.
pub fn file(path: &Path) -> Recheck {
    let (verdict, reasons) = match file::text(path).and_then(|text| Certificate::parse(&text)) {
        Err(error) => (Verdict::Unreadable, vec![error.to_string()]),
        Ok(certificate) => {
            let reasons = findings(&certificate);
            (if reasons.is_empty() { Verdict::Confirmed } else { Verdict::NotConfirmed }, reasons)
        }
    };
    Recheck { file: path.display().to_string(), verdict, reasons }
}

/// Everything that is wrong with a certificate, or cannot be confirmed; empty if it is confirmed.
pub fn findings(certificate: &Certificate) -> Vec<String> {
    let mut found = Findings::default();
    found.hash(certificate);
    // Without decimals in order nothing can be compared.
    if !found.order(certificate) {
        return found.list;
    }
    match restore::question(&certificate.inputs) {
        Err(error) => found.add_text(format!("inputs: {error}")),
        Ok(question) => {
            found.statements(certificate, question.as_ref());
            found.computation(certificate);
        }
    }
    found.list
}

#[derive(Default)]
struct Findings {
    list: Vec<String>,
}

/// An interval computed anew, as decimals rounded outward.
struct Computed {
    lower: String,
    upper: String,
}

impl Computed {
    fn new(interval: &Interval, digits: u32) -> Computed {
        let digits = digits.saturating_add(20);
        Computed {
            lower: decimal::lower_decimal(interval.lower(), digits),
            upper: decimal::upper_decimal(interval.upper(), digits),
        }
    }

    fn lies_in(&self, lower: &str, upper: &str) -> bool {
        is_at_most(lower, &self.lower) && is_at_most(&self.upper, upper)
    }
}

/// Whether the first of two decimals is certainly not above the second.
fn is_at_most(left: &str, right: &str) -> bool {
    decimal::compare(left, right).is_some_and(Ordering::is_le)
}

fn is_below(left: &str, right: &str) -> bool {
    decimal::compare(left, right).is_some_and(Ordering::is_lt)
}

impl Findings {
    fn add(&mut self, field: &str, was: impl std::fmt::Display, found: &str) {
        self.list.push(format!("{field}: was {was}; {found}"));
    }

    fn add_text(&mut self, text: String) {
        self.list.push(text);
    }

    fn hash(&mut self, certificate: &Certificate) {
        match certificate.content_hash() {
            Ok(hash) if hash == certificate.sha256 => {}
            Ok(hash) => {
                let found = format!("the content has {hash}: the content or the hash was changed");
                self.add("sha256", &certificate.sha256, &found);
            }
            Err(error) => self.add_text(format!("sha256: {error}")),
        }
    }

    /// Whether all bounds are decimals in order.
    fn order(&mut self, certificate: &Certificate) -> bool {
        let before = self.list.len();
        self.pair("", &certificate.lower, &certificate.upper);
        if let Some(at) = &certificate.at {
            self.pair("at.", &at.lower, &at.upper);
        }
        for route in &certificate.routes {
            match (&route.lower, &route.upper) {
                (Some(lower), Some(upper)) => self.pair(&prefix(route), lower, upper),
                (None, None) => {}
                (Some(lower), None) => self.add(&format!("{}lower", prefix(route)), lower, "there is no upper bound"),
                (None, Some(upper)) => self.add(&format!("{}upper", prefix(route)), upper, "there is no lower bound"),
            }
        }
        self.list.len() == before
    }

    fn pair(&mut self, prefix: &str, lower: &str, upper: &str) {
        let order = decimal::compare(lower, upper);
        if order.is_none_or(Ordering::is_gt) || lower.starts_with('-') {
            let found = format!("{prefix}upper was {upper}; they must be decimals from 0 up, the lower one first");
            self.add(&format!("{prefix}lower"), lower, &found);
        }
    }

    /// What follows from the stated bounds alone.
    fn statements(&mut self, certificate: &Certificate, question: &dyn Question) {
        let (lower, upper, asked) = (&certificate.lower, &certificate.upper, question.digits());
        if certificate.quantity != question.formula() {
            let found = format!("the inputs are those of {}", question.formula());
            self.add("quantity", &certificate.quantity, &found);
        }
        if certificate.digits > asked {
            self.add("digits", certificate.digits, &format!("only {asked} were asked"));
        } else if written::has_relative_digits(lower, upper, certificate.digits) != Some(true) {
            self.add("digits", certificate.digits, "the bounds are too far apart for that");
        }
        let reached = if certificate.digits >= asked { Status::Certified } else { Status::FewerDigits };
        if certificate.status != reached.name() {
            let found = format!("{} of {asked} digits make it \"{}\"", certificate.digits, reached.name());
            self.add("status", format!("\"{}\"", certificate.status), &found);
        }
        if let Some(value) = &certificate.value {
            let near = |bound: &str| written::within_one_unit(value, bound) == Some(true);
            if !near(lower) || !near(upper) {
                let found = format!("it is not within one unit of its last digit of {lower} and {upper}");
                self.add("value", value, &found);
            }
        } else if certificate.digits > 0 {
            self.add("value", "null", "the bounds fix at least one digit");
        }
    }

    /// Computes the quantity again, to more digits until the stated bounds are decided.
    fn computation(&mut self, certificate: &Certificate) {
        let mut last = Findings::default();
        for extra in EXTRA_DIGITS {
            let inputs = goal(certificate, extra);
            let result = match restore::question(&inputs).and_then(|question| question.certify()) {
                Ok(result) => result,
                Err(error) => {
                    self.add_text(format!("the computation cannot be repeated: {error}"));
                    return;
                }
            };
            last = Findings::default();
            let digits = goal_digits(certificate, extra);
            let undecided = last.bounds("", &certificate.lower, &certificate.upper, &result.interval, digits);
            let undecided_at = last.place(certificate.at.as_ref(), result.at.as_ref(), digits);
            if certificate.at.is_some() {
                last.routes_at_one_time(certificate, digits);
            } else {
                last.routes(certificate, &result, &inputs, digits);
            }
            if !undecided && !undecided_at {
                break;
            }
        }
        self.list.append(&mut last.list);
    }

    /// Compares stated bounds with those found; `true` if it takes more digits to decide.
    fn bounds(&mut self, prefix: &str, lower: &str, upper: &str, found: &Interval, digits: u32) -> bool {
        let found = Computed::new(found, digits);
        if found.lies_in(lower, upper) {
            return false;
        }
        if is_below(&found.upper, lower) {
            self.add(&format!("{prefix}lower"), lower, &format!("the value is at most {}", found.upper));
            return false;
        }
        if is_below(upper, &found.lower) {
            self.add(&format!("{prefix}upper"), upper, &format!("the value is at least {}", found.lower));
            return false;
        }
        if !is_at_most(lower, &found.lower) {
            let proven = format!("not confirmed: what is proven is at least {}", found.lower);
            self.add(&format!("{prefix}lower"), lower, &proven);
        }
        if !is_at_most(&found.upper, upper) {
            let proven = format!("not confirmed: what is proven is at most {}", found.upper);
            self.add(&format!("{prefix}upper"), upper, &proven);
        }
        true
    }

    /// Where an extremum is taken.
    fn place(&mut self, stated: Option<&Bounds>, found: Option<&Interval>, digits: u32) -> bool {
        match (stated, found) {
            (None, None) => false,
            (Some(stated), Some(found)) => self.bounds("at.", &stated.lower, &stated.upper, found, digits),
            (Some(stated), None) => {
                self.add("at.lower", &stated.lower, "the value is taken at no place of its own");
                false
            }
            (None, Some(_)) => {
                self.add("at", "missing", "the place where the value is taken has to be stated");
                false
            }
        }
    }

    /// Each route by itself, both ways.
    fn routes(&mut self, certificate: &Certificate, result: &TailResult, inputs: &Inputs, digits: u32) {
        for report in &result.routes {
            if let Some(own) = &report.interval {
                self.apart(
                    "",
                    &certificate.lower,
                    &certificate.upper,
                    own,
                    digits,
                    &format!("by {} alone ", report.name),
                );
            }
        }
        for route in &certificate.routes {
            let Some((lower, upper)) = route.lower.as_ref().zip(route.upper.as_ref()) else { continue };
            self.apart(&prefix(route), lower, upper, &result.interval, digits, "");
            if result.routes.iter().any(|report| report.name == route.name) {
                continue;
            }
            // A route that the others make unnecessary, or one that does not exist.
            let alone = inputs.clone().with("route", &*route.name);
            match restore::question(&alone).and_then(|question| question.certify()) {
                Ok(own) => {
                    let how = format!("by {} alone ", route.name);
                    self.apart("", &certificate.lower, &certificate.upper, &own.interval, digits, &how);
                }
                Err(error) => self.add("routes", &route.name, &format!("it cannot be repeated: {error}")),
            }
        }
    }

    /// The routes' bounds of a maximum belong to one time, which the witness data name.
    fn routes_at_one_time(&mut self, certificate: &Certificate, digits: u32) {
        let result = match tail_at_witness(certificate, digits) {
            Ok(result) => result,
            Err(error) => return self.add_text(format!("routes[spectral].witness: {error}")),
        };
        for route in &certificate.routes {
            if let Some((lower, upper)) = route.lower.as_ref().zip(route.upper.as_ref()) {
                self.apart(&prefix(route), lower, upper, &result.interval, digits, "");
            }
        }
    }

    /// Adds a finding if stated bounds and an interval found exclude each other.
    fn apart(&mut self, prefix: &str, lower: &str, upper: &str, found: &Interval, digits: u32, how: &str) {
        let found = Computed::new(found, digits);
        if is_below(&found.upper, lower) {
            self.add(&format!("{prefix}lower"), lower, &format!("the value is {how}at most {}", found.upper));
        } else if is_below(upper, &found.lower) {
            self.add(&format!("{prefix}upper"), upper, &format!("the value is {how}at least {}", found.lower));
        }
    }
}

fn prefix(route: &RouteCertificate) -> String {
    format!("routes[{}].", route.name)
}

/// Digits for a new computation: more than stated, unless that is more than can be asked for.
fn goal_digits(certificate: &Certificate, extra: u32) -> u32 {
    let inputs = &certificate.inputs;
    let most = if inputs.get("over").is_some() { peak::MAX_DIGITS } else { MAX_DIGITS };
    // A certificate that states more digits than were asked is wrong already and must not cost hours.
    let asked = inputs.get("digits").and_then(|text| text.parse::<u32>().ok()).unwrap_or(most);
    certificate.digits.min(asked).saturating_add(extra).min(most)
}

/// The inputs with a goal of their own: more digits, every route, no limits but the usual ones.
fn goal(certificate: &Certificate, extra: u32) -> Inputs {
    let stated = &certificate.inputs;
    let digits = goal_digits(certificate, extra);
    let mut inputs = stated.clone().without("time_limit").without("max_bits").with("digits", digits.to_string());
    if stated.get("route").is_some() {
        inputs.set("route", "both");
    }
    let bits = stated.get("max_bits").and_then(|text| text.parse::<u32>().ok());
    inputs.with_optional("max_bits", bits.filter(|bits| *bits > DEFAULT_MAX_BITS).map(|bits| bits.to_string()))
}

/// The tail of the box at the time at which the routes of a maximum were evaluated.
fn tail_at_witness(certificate: &Certificate, digits: u32) -> Result<TailResult, Error> {
    const NAME: &str = "m t of the value";
    let witness = certificate.routes.iter().flat_map(|route| &route.witness).find(|witness| witness.name == NAME);
    let missing = || Error::Missing { field: NAME.to_owned(), wanted: "the routes have to name their time".to_owned() };
    let text = &witness.ok_or_else(missing)?.value;
    let refuse = || Error::bad_input(NAME, text, "it has to be a fraction");
    let mass = certificate.inputs.get("mass").and_then(|text| text.parse::<ExactInput>().ok()).ok_or_else(refuse)?;
    let scaled: ExactInput = text.parse().map_err(|_| refuse())?;
    if !scaled.is_point() || *mass.lower() <= 0 {
        return Err(refuse());
    }
    let time = Rational::from(scaled.lower() / mass.lower());
    let inputs = certificate.inputs.clone().without("over").without("time_limit");
    let digits = digits.min(MAX_DIGITS).to_string();
    let inputs = inputs.with("time", time.to_string()).with("route", "both").with("digits", digits);
    restore::question(&inputs)?.certify()
}
