//! Results as decimals, for people ([`text`]) and for programs ([`json`]).
//!
//! A [`TailReport`] is the one place where an interval of binary numbers becomes decimal strings:
//! bounds are rounded outward, and get as many digits as are needed for the decimal interval
//! itself to satisfy `upper - lower <= 10^-digits * lower`. Certificates use the same strings.

pub mod citation;
pub mod claims;
pub mod json;
pub mod points;
pub mod recheck;
pub mod text;

use crate::arithmetic::{Interval, decimal, rounding};
use crate::quantities::question::{Inputs, Question};
use crate::quantities::tail::{RouteReport, Status, TailResult};
use rug::Float;

/// The program's name in reports and certificates.
pub const PROGRAM: &str = env!("CARGO_PKG_NAME");
/// The program's version in reports and certificates.
pub const VERSION: &str = env!("CARGO_PKG_VERSION");
/// What every reader of a number should bear in mind.
pub const CAUTION: &str =
    "the numbers describe an idealised free particle; do not base decisions about hardware or safety on them alone";

/// An interval as two decimals, rounded outward.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DecimalBounds {
    /// Not above the exact lower bound.
    pub lower: String,
    /// Not below the exact upper bound.
    pub upper: String,
}

impl DecimalBounds {
    /// Outward decimals that keep the relative digits of the interval, at most `limit` of them.
    pub fn new(interval: &Interval, limit: u32) -> DecimalBounds {
        // Two units in the last place are lost by rounding: five more digits nearly always do.
        const EXTRA: [u32; 3] = [5, 10, 40];
        let digits = interval.relative_digits(limit);
        let mut bounds = DecimalBounds::rounded(interval, digits + EXTRA[0]);
        for extra in &EXTRA[1..] {
            if digits == 0 || bounds.has_relative_digits(digits) {
                break;
            }
            bounds = DecimalBounds::rounded(interval, digits + extra);
        }
        bounds
    }

    fn rounded(interval: &Interval, digits: u32) -> DecimalBounds {
        // Nothing but 0 <= P <= 1 is known: no digits that look like a measurement.
        let upper = if *interval.upper() == 1 { 1 } else { digits };
        DecimalBounds {
            lower: decimal::lower_decimal(interval.lower(), digits),
            upper: decimal::upper_decimal(interval.upper(), upper),
        }
    }

    /// Whether the decimals themselves, read back, satisfy the criterion.
    pub fn has_relative_digits(&self, digits: u32) -> bool {
        let bits = digits.saturating_mul(4).saturating_add(128);
        let (Ok(lower), Ok(upper)) = (Float::parse(&self.lower), Float::parse(&self.upper)) else {
            return false;
        };
        Interval::new(rounding::down(bits, lower), rounding::up(bits, upper)).has_relative_digits(digits)
    }
}

/// What one route contributed, in decimals.
#[derive(Clone, Debug)]
pub struct RouteLine {
    /// Name of the route.
    pub name: &'static str,
    /// Its bounds, if it has any.
    pub bounds: Option<DecimalBounds>,
    /// Working precision in bits.
    pub bits: u32,
    /// Number of nodes.
    pub nodes: usize,
    /// Time taken.
    pub seconds: f64,
    /// Why it has no bounds, or fewer digits than asked.
    pub note: Option<String>,
}

/// A result in decimals.
#[derive(Clone, Debug)]
pub struct TailReport {
    /// The quantity as a formula.
    pub quantity: String,
    /// The quantity in words.
    pub words: String,
    /// The inputs as read.
    pub inputs: Inputs,
    /// Proven bounds.
    pub bounds: DecimalBounds,
    /// The value with all digits guaranteed, if at least one is.
    pub value: Option<decimal::GuaranteedDecimal>,
    /// Relative digits reached, at most as many as asked.
    pub digits: u32,
    /// Relative digits asked.
    pub digits_asked: u32,
    /// Whether the digits asked were reached.
    pub status: Status,
    /// What each route found.
    pub routes: Vec<RouteLine>,
    /// Remarks for the reader.
    pub notes: Vec<String>,
    /// Where the value is taken, for an extremum or a crossing.
    pub at: Option<DecimalBounds>,
    /// Total time taken.
    pub seconds: f64,
}

impl TailReport {
    /// The result of a question in decimals.
    pub fn new(question: &dyn Question, result: &TailResult) -> TailReport {
        let digits = question.digits();
        TailReport {
            quantity: question.formula(),
            words: question.words(),
            inputs: question.inputs(),
            bounds: DecimalBounds::new(&result.interval, digits),
            value: result.value.clone(),
            digits: result.digits,
            digits_asked: digits,
            status: result.status,
            routes: result.routes.iter().map(|route| RouteLine::new(route, digits)).collect(),
            notes: result.notes.clone(),
            at: result.at.as_ref().map(|at| DecimalBounds::new(at, digits)),
            seconds: result.seconds,
        }
    }
}

impl RouteLine {
    fn new(route: &RouteReport, digits: u32) -> RouteLine {
        RouteLine {
            name: route.name,
            bounds: route.interval.as_ref().map(|interval| DecimalBounds::new(interval, digits)),
            bits: route.bits,
            nodes: route.nodes,
            seconds: route.seconds,
            note: route.note.clone(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    fn third(relative_width: u32) -> Interval {
        let low = Rational::from((1, 3));
        let high =
            low.clone() + low.clone() / Rational::from(rug::Integer::from(rug::Integer::u_pow_u(10, relative_width)));
        Interval::from_rationals(&low, &high, 200)
    }

    #[test]
    fn decimals_keep_the_digits() {
        for digits in 1..40 {
            let bounds = DecimalBounds::new(&third(digits + 1), digits);
            assert!(bounds.has_relative_digits(digits), "{bounds:?}");
            let exact = |text: &str| text.parse::<crate::arithmetic::ExactInput>().unwrap().lower().clone();
            assert!(exact(&bounds.lower) <= Rational::from((1, 3)) && exact(&bounds.upper) >= Rational::from((1, 3)));
        }
    }

    #[test]
    fn an_unknown_probability_stays_readable() {
        let bounds = DecimalBounds::new(&Interval::new(Float::new(64), Float::with_val(64, 1)), 15);
        assert_eq!((bounds.lower.as_str(), bounds.upper.as_str()), ("0", "1"));
        assert!(!bounds.has_relative_digits(1));
    }
}
