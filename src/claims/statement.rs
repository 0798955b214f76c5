//! What a printed statement allows.
//!
//! A statement such as `about 3%` or `0.02138(2)` is read as text, digit by digit; trailing zeros count. It allows a set
//! of numbers between two exact bounds. Where a text can be read in more than one way (`1500`: are the zeros digits?)
//! every reading is kept and judged.

use crate::arithmetic::{ExactInput, Interval};
use crate::error::Error;
use rug::ops::Pow;
use rug::{Integer, Rational};
use std::cmp::Ordering;

/// One end of an allowed set.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct End {
    /// The exact bound.
    pub value: Rational,
    /// Whether the bound itself is allowed.
    pub included: bool,
}

/// One way to read a statement: the numbers it allows.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Reading {
    /// The reading in words.
    pub meaning: String,
    /// Lower end; `None` if there is none.
    pub low: Option<End>,
    /// Upper end; `None` if there is none.
    pub high: Option<End>,
}

/// How a certified interval stands to an allowed set.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Standing {
    /// The interval lies inside the set.
    Inside,
    /// The interval and the set have no point in common.
    Disjoint,
    /// Neither is proven.
    Overlapping,
}

/// A statement about one number.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Statement {
    /// The text as given.
    pub text: String,
    /// All ways to read it, at least one.
    pub readings: Vec<Reading>,
}

/// Words before a value that widen it to one whole unit of its last digit.
const ABOUT: [&str; 8] = ["approximately", "about", "roughly", "around", "circa", "ca.", "~", "≈"];
/// Comparisons, the longer spellings first: text, whether the value is an upper bound, whether it is included.
const COMPARISONS: [(&str, bool, bool); 16] = [
    ("less than or equal to", true, true),
    ("greater than or equal to", false, true),
    ("no more than", true, true),
    ("not more than", true, true),
    ("no less than", false, true),
    ("less than", true, false),
    ("more than", false, false),
    ("greater than", false, false),
    ("at most", true, true),
    ("at least", false, true),
    ("below", true, false),
    ("above", false, false),
    ("<=", true, true),
    (">=", false, true),
    ("<", true, false),
    (">", false, false),
];

const WANTED: &str = "write a value as printed (\"0.0214\", \"3%\", \"2.14e-2\", \"0.02138(2)\", \"about 3%\", \"0.021 truncated\", \
    \"0.0214 +- 0.0001\"), a bound (\"< 1e-20\", \">= 1/6\"), a range (\"between 0.02 and 0.03\") or \"exactly 0\"";

impl Statement {
    /// Reads a statement; `field` names it in errors.
    ///
    /// # Errors
    /// [`Error::BadInput`] if it cannot be read.
    pub fn parse(field: &str, text: &str) -> Result<Statement, Error> {
        let refused = || Error::bad_input(field, text, WANTED);
        let normal = text.trim().to_lowercase().replace('≤', "<=").replace('≥', ">=").replace('−', "-");
        let readings = readings(&normal).ok_or_else(refused)?;
        Ok(Statement { text: text.to_owned(), readings })
    }
}

fn readings(text: &str) -> Option<Vec<Reading>> {
    if text.chars().count() > 4000 {
        return None;
    }
    if let Some(rest) = text.strip_prefix("exactly ").or((text == "zero").then_some("0")) {
        return Some(vec![exact(&plain(rest)?)]);
    }
    for (words, upper, included) in COMPARISONS {
        if let Some(rest) = text.strip_prefix(words) {
            return Some(vec![bound(&plain(rest)?, upper, included)]);
        }
    }
    if let Some((low, high)) = range(text) {
        return between(low, high);
    }
    for separator in ["+-", "+/-", "±"] {
        if let Some((value, tolerance)) = text.split_once(separator) {
            return with_tolerance(value, tolerance);
        }
    }
    if let Some(rest) = text.strip_suffix("truncated").or_else(|| text.strip_suffix("(truncated)")) {
        return truncated(rest);
    }
    for word in ABOUT {
        if let Some(rest) = text.strip_prefix(word) {
            return printed(rest, 1, "to one unit of the last digit");
        }
    }
    printed(text, 2, "rounded to the last digit")
}

/// The two ends of `between A and B`, `A to B`, `[A, B]`.
fn range(text: &str) -> Option<(&str, &str)> {
    if let Some(inner) = text.strip_prefix('[').and_then(|rest| rest.strip_suffix(']')) {
        return inner.split_once(',');
    }
    if let Some(inner) = text.strip_prefix("between ") {
        return inner.split_once(" and ");
    }
    text.strip_prefix("from ").unwrap_or(text).split_once(" to ")
}

/// A plain number: a fraction or decimal, percent allowed.
fn plain(text: &str) -> Option<Rational> {
    let (number, scale) = percent(text);
    let value: ExactInput = number.parse().ok()?;
    value.is_point().then(|| Rational::from(value.lower() * &scale))
}

/// Takes a percent sign off: the number's text and the factor.
fn percent(text: &str) -> (&str, Rational) {
    let text = text.trim();
    for sign in ["%", "percent", "per cent"] {
        if let Some(number) = text.strip_suffix(sign) {
            return (number.trim(), Rational::from((1, 100)));
        }
    }
    (text, Rational::from(1))
}

fn exact(value: &Rational) -> Reading {
    let end = End { value: value.clone(), included: true };
    Reading { meaning: format!("exactly {value}"), low: Some(end.clone()), high: Some(end) }
}

fn bound(value: &Rational, upper: bool, included: bool) -> Reading {
    let end = Some(End { value: value.clone(), included });
    let sign = match (upper, included) {
        (true, true) => "<=",
        (true, false) => "<",
        (false, true) => ">=",
        (false, false) => ">",
    };
    let (low, high) = if upper { (None, end) } else { (end, None) };
    Reading { meaning: format!("{sign} {value}"), low, high }
}

fn between(low: &str, high: &str) -> Option<Vec<Reading>> {
    // A percent sign after the second number belongs to both.
    let (_, scale) = percent(high);
    let (own, own_scale) = percent(low);
    let low = plain(own)? * if own_scale == 1 { scale } else { own_scale };
    let high = plain(high)?;
    (low <= high).then(|| {
        let meaning = format!("from {low} to {high}, ends included");
        let end = |value| Some(End { value, included: true });
        vec![Reading { meaning, low: end(low), high: end(high) }]
    })
}

fn with_tolerance(value: &str, tolerance: &str) -> Option<Vec<Reading>> {
    let (_, scale) = percent(tolerance);
    let (own, own_scale) = percent(value);
    let value = plain(own)? * if own_scale == 1 { scale } else { own_scale };
    let tolerance = plain(tolerance)?;
    (tolerance >= 0).then(|| vec![around(&value, &tolerance, "with the stated tolerance")])
}

fn around(value: &Rational, half: &Rational, meaning: &str) -> Reading {
    let end = |value| Some(End { value, included: true });
    Reading {
        meaning: meaning.to_owned(),
        low: end(Rational::from(value - half)),
        high: end(Rational::from(value + half)),
    }
}

/// A decimal as printed: its value, the unit of its last digit, and the uncertainty in brackets if there is one.
struct Printed {
    value: Rational,
    unit: Rational,
    uncertainty: Option<Rational>,
    /// Further units that the digits may have: trailing zeros before a missing decimal point.
    coarser: Vec<Rational>,
}

fn decimal(text: &str) -> Option<Printed> {
    let (number, scale) = percent(text);
    let (number, uncertainty, exponent) = split(number)?;
    let digits = |part: &str| !part.is_empty() && part.bytes().all(|b| b.is_ascii_digit());
    let unsigned = number.strip_prefix(['+', '-']).unwrap_or(number);
    let (whole, fraction) = unsigned.split_once('.').unwrap_or((unsigned, ""));
    let sound = digits(whole) && (fraction.is_empty() || digits(fraction)) && !unsigned.ends_with('.');
    if !sound || exponent.unsigned_abs() > 1_000_000 {
        return None;
    }
    let unit = power_of_ten(exponent - i64::try_from(fraction.len()).ok()?) * &scale;
    let mut mantissa: Integer = format!("{whole}{fraction}").parse().ok()?;
    if number.starts_with('-') {
        mantissa = -mantissa;
    }
    let zeros = if fraction.is_empty() { whole.len() - whole.trim_end_matches('0').len() } else { 0 };
    let ambiguous = if uncertainty.is_none() && mantissa != 0 { zeros.min(40) } else { 0 };
    let coarser = (1..=ambiguous).map(|n| Rational::from(&unit * Integer::from(10).pow(n as u32))).collect();
    let uncertainty = match uncertainty {
        Some(digits) => Some(Rational::from(&unit * digits.parse::<Integer>().ok()?)),
        None => None,
    };
    Some(Printed { value: Rational::from(&unit * mantissa), unit, uncertainty, coarser })
}

/// `number`, digits of an uncertainty in brackets, exponent.
fn split(text: &str) -> Option<(&str, Option<&str>, i64)> {
    let (mantissa, exponent) = match text.split_once('e') {
        Some((mantissa, exponent)) => (mantissa, exponent.parse().ok()?),
        None => (text, 0),
    };
    match mantissa.split_once('(') {
        None => Some((mantissa.trim(), None, exponent)),
        Some((number, rest)) => {
            let digits = rest.trim_end().strip_suffix(')')?;
            let sound = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_digit());
            sound.then_some((number, Some(digits), exponent))
        }
    }
}

fn power_of_ten(exponent: i64) -> Rational {
    let size = u32::try_from(exponent.unsigned_abs()).unwrap_or(u32::MAX);
    let power = Rational::from(Integer::from(10).pow(size));
    if exponent < 0 { power.recip() } else { power }
}

/// A printed value to `1/parts` of its last unit, or to its own uncertainty.
fn printed(text: &str, parts: u32, meaning: &str) -> Option<Vec<Reading>> {
    let Some(found) = decimal(text.trim()) else {
        // A fraction has no last digit: it is meant exactly.
        return text.contains('/').then(|| plain(text).map(|value| vec![exact(&value)]))?;
    };
    if let Some(half) = &found.uncertainty {
        return Some(vec![around(&found.value, half, "within the uncertainty in brackets")]);
    }
    let mut list = vec![around(&found.value, &Rational::from(&found.unit / parts), meaning)];
    for unit in &found.coarser {
        let meaning = format!("{meaning} that is not a filling zero, {unit} units");
        list.push(around(&found.value, &Rational::from(unit / parts), &meaning));
    }
    Some(list)
}

fn truncated(text: &str) -> Option<Vec<Reading>> {
    let found = decimal(text.trim())?;
    let far = if found.value < 0 {
        Rational::from(&found.value - &found.unit)
    } else {
        Rational::from(&found.value + &found.unit)
    };
    let (inner, outer) = (End { value: found.value.clone(), included: true }, End { value: far, included: false });
    let (low, high) = if found.value < 0 { (outer, inner) } else { (inner, outer) };
    Some(vec![Reading { meaning: "digits cut off after the last one".to_owned(), low: Some(low), high: Some(high) }])
}

impl Reading {
    /// How a certified interval stands to this reading; exact comparisons throughout.
    pub fn standing(&self, interval: &Interval) -> Standing {
        let (lower, upper) = (interval.lower(), interval.upper());
        let above_low = |end: &End| match lower.partial_cmp(&end.value) {
            Some(Ordering::Greater) => true,
            Some(Ordering::Equal) => end.included,
            _ => false,
        };
        let below_high = |end: &End| match upper.partial_cmp(&end.value) {
            Some(Ordering::Less) => true,
            Some(Ordering::Equal) => end.included,
            _ => false,
        };
        if self.low.as_ref().is_none_or(above_low) && self.high.as_ref().is_none_or(below_high) {
            return Standing::Inside;
        }
        let beyond_high = self.high.as_ref().is_some_and(|end| match lower.partial_cmp(&end.value) {
            Some(Ordering::Greater) => true,
            Some(Ordering::Equal) => !end.included,
            _ => false,
        });
        let before_low = self.low.as_ref().is_some_and(|end| match upper.partial_cmp(&end.value) {
            Some(Ordering::Less) => true,
            Some(Ordering::Equal) => !end.included,
            _ => false,
        });
        if beyond_high || before_low { Standing::Disjoint } else { Standing::Overlapping }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ends(text: &str) -> (String, String) {
        let statement = Statement::parse("says", text).unwrap();
        let shown = |end: &Option<End>| {
            end.as_ref()
                .map_or("none".to_owned(), |e| format!("{}{}", e.value, if e.included { "" } else { " excluded" }))
        };
        (shown(&statement.readings[0].low), shown(&statement.readings[0].high))
    }

    #[test]
    fn printed_values_allow_half_a_unit_of_the_last_digit() {
        assert_eq!(ends("0.0214"), ("427/20000".into(), "429/20000".into()));
        assert_eq!(ends("2.14e-2"), ends("0.0214"));
        assert_eq!(ends("3%"), ("1/40".into(), "7/200".into()));
        assert_eq!(ends("3.0%"), ("59/2000".into(), "61/2000".into()));
        assert_eq!(ends("about 3%"), ("1/50".into(), "1/25".into()));
        assert_eq!(ends("0.02138(2)"), ("267/12500".into(), "107/5000".into()));
        assert_eq!(ends("0.021 truncated"), ("21/1000".into(), "11/500 excluded".into()));
        assert_eq!(ends("0.02 +- 0.001"), ("19/1000".into(), "21/1000".into()));
    }

    #[test]
    fn bounds_and_ranges() {
        assert_eq!(ends("< 1e-20"), ("none".into(), "1/100000000000000000000 excluded".into()));
        assert_eq!(ends(">= 1/6"), ("1/6".into(), "none".into()));
        assert_eq!(ends("at most 3%"), ("none".into(), "3/100".into()));
        assert_eq!(ends("between 2 and 3%"), ("1/50".into(), "3/100".into()));
        assert_eq!(ends("[0.02, 0.03]"), ("1/50".into(), "3/100".into()));
        assert_eq!(ends("exactly 0"), ("0".into(), "0".into()));
        assert_eq!(ends("1/6"), ("1/6".into(), "1/6".into()));
    }

    #[test]
    fn filling_zeros_are_a_second_reading() {
        assert_eq!(Statement::parse("says", "1500").unwrap().readings.len(), 3);
        assert!(Statement::parse("says", "1500.").is_err());
        assert_eq!(Statement::parse("says", "0.1500").unwrap().readings.len(), 1);
    }

    #[test]
    fn nonsense_is_refused() {
        for text in ["", "three", "1e", "0.02(", "< ", "between 3 and 2", "1/0", "nan", "inf", "0.02()", "--1", "%"] {
            assert!(Statement::parse("says", text).is_err(), "{text}");
        }
    }

    #[test]
    fn standings_respect_open_ends() {
        use rug::Float;
        let point = |v: f64| Interval::new(Float::with_val(53, v), Float::with_val(53, v));
        let reading = |text: &str| Statement::parse("says", text).unwrap().readings.remove(0);
        assert_eq!(reading("< 0.5").standing(&point(0.5)), Standing::Disjoint);
        assert_eq!(reading("<= 0.5").standing(&point(0.5)), Standing::Inside);
        assert_eq!(reading("> 0.5").standing(&point(0.25)), Standing::Disjoint);
        let wide = Interval::new(Float::with_val(53, 0.25), Float::with_val(53, 0.75));
        assert_eq!(reading("< 0.5").standing(&wide), Standing::Overlapping);
    }
}
