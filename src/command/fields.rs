//! Texts from the command line turned into numbers, with one style of refusal.

use crate::arithmetic::{Bits, ExactInput};
use crate::error::Error;
use crate::quantities::boosted_tail::BoostedRegion;
use crate::quantities::tail::{MAX_DIGITS, RouteChoice};
use rug::Rational;
use std::time::Duration;

/// Largest limit on bits that is accepted.
const MAX_BITS: u32 = 20_000_000;
/// Longest time limit in seconds that is accepted, about 30 years.
const MAX_SECONDS: u32 = 1_000_000_000;

/// A number, fraction or interval that has to be given.
pub(super) fn required(field: &str, text: Option<&str>, example: &str) -> Result<ExactInput, Error> {
    match text {
        Some(text) => exact(field, text),
        None => Err(Error::Missing { field: field.to_owned(), wanted: format!("give it, such as {example}") }),
    }
}

/// A number, fraction or interval.
pub(super) fn exact(field: &str, text: &str) -> Result<ExactInput, Error> {
    ExactInput::of_field(field, text)
}

/// The distance `R`, or `None` for the light cone.
pub(super) fn beyond(text: Option<&str>) -> Result<Option<ExactInput>, Error> {
    match text {
        None | Some("cone") => Ok(None),
        Some(text) => text.parse().map(Some).map_err(|_| {
            let wanted = "give a distance from the origin, such as 12 or 2.5, or the word cone for half-width + |time|";
            Error::bad_input("beyond", text, wanted)
        }),
    }
}

/// The region of a moving observer.
pub(super) fn boosted_region(text: &str) -> Result<BoostedRegion, Error> {
    match text {
        "cone" => Ok(BoostedRegion::Cone),
        "contracted" => Ok(BoostedRegion::Contracted),
        _ => match beyond(Some(text))? {
            Some(distance) => Ok(BoostedRegion::Beyond(distance)),
            None => Ok(BoostedRegion::Cone),
        },
    }
}

/// Which routes of the box run.
pub(super) fn route(text: &str) -> Result<RouteChoice, Error> {
    match text {
        "kernel" => Ok(RouteChoice::Kernel),
        "spectral" => Ok(RouteChoice::Spectral),
        "both" => Ok(RouteChoice::Both),
        _ => Err(Error::bad_input("route", text, "give kernel, spectral or both")),
    }
}

/// How many digits are asked.
pub(super) fn digits(text: &str) -> Result<u32, Error> {
    let wanted = format!("give a whole number from 1 to {MAX_DIGITS}");
    whole(text, 1, MAX_DIGITS).ok_or_else(|| Error::bad_input("digits", text, &wanted))
}

/// The largest working precision.
pub(super) fn max_bits(text: &str) -> Result<Bits, Error> {
    let wanted = format!("give a whole number of bits from 64 to {MAX_BITS}");
    whole(text, 64, MAX_BITS).ok_or_else(|| Error::bad_input("max-bits", text, &wanted))
}

/// The longest time to spend.
pub(super) fn time_limit(text: &str) -> Result<Duration, Error> {
    let wanted = format!("give a number of seconds above 0 and up to {MAX_SECONDS}, such as 2.5");
    let refuse = || Error::bad_input("time-limit", text, &wanted);
    let read: ExactInput = text.parse().map_err(|_| refuse())?;
    let seconds = read.lower();
    if !read.is_point() || *seconds <= 0 || *seconds > MAX_SECONDS {
        return Err(refuse());
    }
    let nanoseconds = Rational::from(seconds * 1_000_000_000u32).ceil();
    nanoseconds.numer().to_u64().map(Duration::from_nanos).ok_or_else(refuse)
}

/// Digits only: no sign, point or exponent.
fn whole(text: &str, least: u32, most: u32) -> Option<u32> {
    let text = text.trim();
    let plain = !text.is_empty() && text.bytes().all(|byte| byte.is_ascii_digit());
    plain.then(|| text.parse().ok()).flatten().filter(|number| (least..=most).contains(number))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn whole_numbers_are_digits_only() {
        assert_eq!(digits("30"), Ok(30));
        for text in ["0", "-3", "+3", "1e3", "abc", "99999999999", "", " ", "1.0", "٣", "10001"] {
            assert!(digits(text).is_err(), "{text:?} was accepted");
        }
    }

    #[test]
    fn time_limits_are_positive_seconds() {
        assert_eq!(time_limit("2.5"), Ok(Duration::from_millis(2500)));
        assert_eq!(time_limit("1e-30"), Ok(Duration::from_nanos(1)));
        for text in ["0", "-1", "1e10", "[1, 2]", "soon", "NaN"] {
            assert!(time_limit(text).is_err(), "{text:?} was accepted");
        }
    }

    #[test]
    fn the_cone_is_a_word() {
        assert_eq!(beyond(Some("cone")), Ok(None));
        assert!(beyond(Some("Cone")).is_err());
        assert!(beyond(Some("5/2")).is_ok_and(|region| region.is_some()));
    }
}
