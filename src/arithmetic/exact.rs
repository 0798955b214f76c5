//! Numbers read exactly: integers, decimals, fractions and intervals of these.
//!
//! | form | example | meaning |
//! |---|---|---|
//! | integer | `12`, `-3` | itself |
//! | decimal | `0.1`, `2.5e-9` | exactly one tenth, exactly 25/10^10 |
//! | fraction | `1/3`, `0.1/7` | the exact quotient of two decimals |
//! | interval | `[0.99, 1.01]` | every number between the two ends, ends included |
//!
//! Nothing passes through floating point. The text read is kept, so that a result can show the
//! exact strings it rests on.

use crate::error::Error;
use rug::{Integer, Rational};
use std::fmt;

/// Longest text accepted for one number.
pub const MAX_CHARACTERS: usize = 20_000;
/// Largest absolute value of a decimal exponent.
pub const MAX_EXPONENT: i64 = 1_000_000;

/// What is wrong with a text that should be a number, and what would be right.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NotANumber {
    /// The text as read (shortened if very long).
    pub was: String,
    /// What would be right.
    pub wanted: String,
}

impl fmt::Display for NotANumber {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "\"{}\" is not a number that can be read exactly; {}", self.was, self.wanted)
    }
}

impl std::error::Error for NotANumber {}

/// A number, or an interval of numbers, exactly as written.
///
/// ```
/// use coneproof::arithmetic::ExactInput;
/// let tenth: ExactInput = "0.1".parse()?;
/// assert_eq!(tenth.lower(), &rug::Rational::from((1, 10)));
/// assert!(tenth.is_point());
/// # Ok::<(), coneproof::arithmetic::exact::NotANumber>(())
/// ```
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ExactInput {
    text: String,
    lower: Rational,
    upper: Rational,
}

impl ExactInput {
    /// Reads the text of a field of a request.
    ///
    /// # Errors
    /// [`Error::BadInput`] naming the field, what it was and what would be right.
    pub fn of_field(field: &str, text: &str) -> Result<ExactInput, Error> {
        text.parse().map_err(|error: NotANumber| Error::bad_input(field, text, &error.wanted))
    }

    /// The text it was read from, without surrounding blanks.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The exact lower end.
    pub fn lower(&self) -> &Rational {
        &self.lower
    }

    /// The exact upper end.
    pub fn upper(&self) -> &Rational {
        &self.upper
    }

    /// Whether this is one number.
    pub fn is_point(&self) -> bool {
        self.lower == self.upper
    }

    /// An exact rational as an input, for use from Rust.
    pub fn from_rational(value: Rational) -> ExactInput {
        ExactInput { text: value.to_string(), lower: value.clone(), upper: value }
    }
}

impl std::str::FromStr for ExactInput {
    type Err = NotANumber;

    fn from_str(text: &str) -> Result<ExactInput, NotANumber> {
        let trimmed = text.trim();
        if trimmed.chars().count() > MAX_CHARACTERS {
            return Err(refuse(trimmed, &format!("give at most {MAX_CHARACTERS} characters")));
        }
        let (lower, upper) = match trimmed.strip_prefix('[') {
            Some(rest) => parse_interval(trimmed, rest)?,
            None => {
                let value = parse_fraction(trimmed, trimmed)?;
                (value.clone(), value)
            }
        };
        Ok(ExactInput { text: trimmed.to_owned(), lower, upper })
    }
}

fn refuse(was: &str, wanted: &str) -> NotANumber {
    const SHOWN: usize = 60;
    let mut shown: String = was.chars().take(SHOWN).collect();
    if was.chars().count() > SHOWN {
        shown.push('…');
    }
    NotANumber { was: shown, wanted: wanted.to_owned() }
}

fn parse_interval(whole: &str, rest: &str) -> Result<(Rational, Rational), NotANumber> {
    let wanted = "write an interval as [lower, upper], such as [0.99, 1.01]";
    let inner = rest.strip_suffix(']').ok_or_else(|| refuse(whole, wanted))?;
    let (left, right) = inner.split_once(',').ok_or_else(|| refuse(whole, wanted))?;
    let lower = parse_fraction(whole, left.trim())?;
    let upper = parse_fraction(whole, right.trim())?;
    if lower > upper {
        return Err(refuse(whole, "the lower end of an interval must not be above the upper end"));
    }
    Ok((lower, upper))
}

fn parse_fraction(whole: &str, text: &str) -> Result<Rational, NotANumber> {
    match text.split_once('/') {
        None => parse_decimal(whole, text),
        Some((above, below)) => {
            let numerator = parse_decimal(whole, above.trim())?;
            let denominator = parse_decimal(whole, below.trim())?;
            if denominator == 0 {
                return Err(refuse(whole, "the denominator must not be zero"));
            }
            Ok(numerator / denominator)
        }
    }
}

/// `[+-]digits[.digits][e[+-]digits]`, at least one digit before the exponent.
fn parse_decimal(whole: &str, text: &str) -> Result<Rational, NotANumber> {
    let wanted = "write an integer, a decimal or a fraction, such as 2, 0.1, 2.5e-9 or 1/3";
    let bad = || refuse(whole, wanted);
    let (negative, unsigned) = match text.as_bytes().first() {
        Some(b'-') => (true, &text[1..]),
        Some(b'+') => (false, &text[1..]),
        _ => (false, text),
    };
    let (body, exponent) = match unsigned.split_once(['e', 'E']) {
        None => (unsigned, 0),
        Some((body, exponent)) => (body, parse_exponent(whole, exponent)?),
    };
    let (integral, fractional) = body.split_once('.').unwrap_or((body, ""));
    let is_digits = |part: &str| part.bytes().all(|b| b.is_ascii_digit());
    if integral.len() + fractional.len() == 0 || !is_digits(integral) || !is_digits(fractional) {
        return Err(bad());
    }
    let digits = Integer::parse(format!("{integral}{fractional}")).map_err(|_| bad())?;
    let mut value = Rational::from(Integer::from(digits));
    let power = exponent - fractional.len() as i64;
    let ten = Rational::from(Integer::from(Integer::u_pow_u(10, power.unsigned_abs() as u32)));
    if power >= 0 {
        value *= ten
    } else {
        value /= ten
    }
    Ok(if negative { -value } else { value })
}

fn parse_exponent(whole: &str, text: &str) -> Result<i64, NotANumber> {
    let digits = text.strip_prefix(['-', '+']).unwrap_or(text);
    if digits.is_empty() || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return Err(refuse(whole, "an exponent needs digits after the e, such as 1e-9"));
    }
    match text.parse::<i64>() {
        Ok(value) if value.abs() <= MAX_EXPONENT => Ok(value),
        _ => Err(refuse(whole, &format!("exponents may reach from -{MAX_EXPONENT} to {MAX_EXPONENT}"))),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Rational {
        text.parse::<ExactInput>().unwrap().lower
    }

    #[test]
    fn reads_every_form_exactly() {
        assert_eq!(read("0.1"), Rational::from((1, 10)));
        assert_eq!(read("-.5"), Rational::from((-1, 2)));
        assert_eq!(read(" 1/3 "), Rational::from((1, 3)));
        assert_eq!(read("2.5e-3"), Rational::from((1, 400)));
        assert_eq!(read("+4E2"), 400);
        assert_eq!(read("0.1/0.3"), Rational::from((1, 3)));
        let interval: ExactInput = "[0.99, 1.01]".parse().unwrap();
        assert_eq!((interval.lower, interval.upper), (Rational::from((99, 100)), Rational::from((101, 100))));
    }

    #[test]
    fn refuses_everything_else() {
        for text in [
            "",
            "e",
            "1e",
            "1e+",
            ".",
            "-",
            "nan",
            "NaN",
            "inf",
            "1/0",
            "1/2/3",
            "0x10",
            "1_000",
            "[1]",
            "[2,1]",
            "[1,2",
            "1,2",
            "1e9999999",
            "--1",
            "1.2.3",
            "٣",
            "1e1.5",
            "[1/0, 2]",
            "１",
        ] {
            assert!(text.parse::<ExactInput>().is_err(), "{text:?} was accepted");
        }
    }

    proptest::proptest! {
        #[test]
        fn never_panics(text in "\\PC{0,40}") {
            let _ = text.parse::<ExactInput>();
        }

        #[test]
        fn never_panics_on_number_like_text(text in "[-+0-9./eE, \\[\\]]{0,24}") {
            if let Ok(input) = text.parse::<ExactInput>() {
                proptest::prop_assert!(input.lower <= input.upper);
            }
        }

        #[test]
        fn decimals_round_trip(mantissa in proptest::num::i64::ANY, exponent in -300i64..300) {
            let expected = Rational::from(mantissa)
                * if exponent >= 0 { Rational::from(Integer::from(Integer::u_pow_u(10, exponent as u32))) }
                  else { Rational::from((1, Integer::from(Integer::u_pow_u(10, -exponent as u32)))) };
            proptest::prop_assert_eq!(read(&format!("{mantissa}e{exponent}")), expected);
        }
    }
}
