//! Decimal output rounded outward, and the guaranteed-digits form.
//!
//! MPFR converts to decimal with correct directed rounding at any number of digits (MPFR manual,
//! `mpfr_get_str`), so the only work left is the layout. Numbers with a decimal exponent between
//! -5 and 20 are printed plainly, others in the form `1.25e-40`.

use super::{Bits, Interval, rounding};
use rug::Float;
use rug::float::Round;
use std::cmp::Ordering;

/// The largest decimal of `digits` significant digits that is not above `value`.
pub fn lower_decimal(value: &Float, digits: u32) -> String {
    let spoilt = crate::spoil::is_active(crate::spoil::Fault::LowerBoundRoundedUp);
    directed(value, digits, if spoilt { Round::Up } else { Round::Down })
}

/// The smallest decimal of `digits` significant digits that is not below `value`.
pub fn upper_decimal(value: &Float, digits: u32) -> String {
    directed(value, digits, Round::Up)
}

fn directed(value: &Float, digits: u32, direction: Round) -> String {
    if value.is_zero() {
        return "0".to_owned();
    }
    if !value.is_finite() {
        return if value.is_sign_negative() { "-inf".to_owned() } else { "inf".to_owned() };
    }
    let count = Some(digits.max(1) as usize);
    let (negative, text, exponent) = value.to_sign_string_exp_round(10, count, direction);
    // MPFR gives 0.DIGITS * 10^exponent.
    layout(negative, &text, i64::from(exponent.unwrap_or(0)) - 1)
}

/// Prints `d.ddd * 10^exponent` for the digits given.
fn layout(negative: bool, digits: &str, exponent: i64) -> String {
    let sign = if negative { "-" } else { "" };
    let count = digits.len() as i64;
    if (-5..0).contains(&exponent) {
        return format!("{sign}0.{}{digits}", "0".repeat((-exponent - 1) as usize));
    }
    if (0..20).contains(&exponent) {
        if count <= exponent + 1 {
            return format!("{sign}{digits}{}", "0".repeat((exponent + 1 - count) as usize));
        }
        let (whole, fraction) = digits.split_at((exponent + 1) as usize);
        return format!("{sign}{whole}.{fraction}");
    }
    let (first, rest) = digits.split_at(1);
    let point = if rest.is_empty() { "" } else { "." };
    format!("{sign}{first}{point}{rest}e{exponent}")
}

/// A decimal all of whose digits are guaranteed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct GuaranteedDecimal {
    /// The decimal, for example `0.021375`.
    pub text: String,
    /// Its number of significant digits.
    pub digits: u32,
}

/// The longest decimal `v` of at most `limit` significant digits such that **every** point of the
/// interval differs from `v` by less than one unit in the last digit printed.
///
/// `None` when not even one digit is guaranteed (zero inside, or an infinite bound); an interval
/// that is exactly zero gives `0`.
pub fn guaranteed_decimal(interval: &Interval, limit: u32) -> Option<GuaranteedDecimal> {
    let (low, high) = (interval.lower(), interval.upper());
    if low.is_zero() && high.is_zero() {
        return Some(GuaranteedDecimal { text: "0".to_owned(), digits: 1 });
    }
    if !low.is_finite() || !high.is_finite() || (*low <= 0 && *high >= 0) {
        return None;
    }
    // One more digit than the relative width allows is worth a try, never two.
    let most = if *low > 0 {
        interval.relative_digits(limit.saturating_add(2))
    } else {
        Interval::new(-high.clone(), -low.clone()).relative_digits(limit.saturating_add(2))
    };
    let start = most.saturating_add(1).clamp(1, limit.max(1));
    (1..=start).rev().take(4).find_map(|digits| try_digits(interval, digits))
}

/// The decimal of `digits` significant digits nearest to **every** point of the interval; `None` if its ends round to
/// different decimals.
pub fn rounded(interval: &Interval, digits: u32) -> Option<String> {
    let nearest =
        |value: &Float| (value.is_finite() && !value.is_zero()).then(|| directed(value, digits, Round::Nearest));
    // Rounding is monotone, so what both ends round to is what all between them do.
    let (low, high) = (nearest(interval.lower())?, nearest(interval.upper())?);
    (low == high).then_some(low)
}

fn try_digits(interval: &Interval, digits: u32) -> Option<GuaranteedDecimal> {
    let bits = interval.lower().prec().max(interval.upper().prec()) + 8;
    let middle = Float::with_val_round(bits, interval.lower() + interval.upper(), Round::Nearest).0 >> 1u32;
    let (negative, text, exponent) = middle.to_sign_string_exp_round(10, Some(digits as usize), Round::Nearest);
    let exponent = i64::from(exponent?) - 1;
    let unit_exponent = exponent - i64::from(digits) + 1;
    let sign = if negative { "-" } else { "" };
    let bits = bits.max(digits.saturating_mul(4)).saturating_add(64);
    let (below, above) = directed_values(&format!("{sign}{text}e{unit_exponent}"), bits)?;
    let (unit, _) = directed_values(&format!("1e{unit_exponent}"), bits)?;
    // Directed rounding makes the differences larger and the unit smaller than they are.
    let fits =
        rounding::up(bits, interval.upper() - &below) < unit && rounding::up(bits, &above - interval.lower()) < unit;
    fits.then(|| GuaranteedDecimal { text: layout(negative, &text, exponent), digits })
}

/// The decimal as binary numbers not above and not below it.
fn directed_values(text: &str, bits: Bits) -> Option<(Float, Float)> {
    let read = |text| Float::parse(text).ok();
    Some((rounding::down(bits, read(text)?), rounding::up(bits, read(text)?)))
}

/// Compares two decimals exactly as written, at any exponent; `None` unless both are of the form
/// `[-]digits[.digits][e[-]digits]`.
pub fn compare(left: &str, right: &str) -> Option<Ordering> {
    let (left, right) = (Written::read(left)?, Written::read(right)?);
    Some(match (left.sign(), right.sign()) {
        (-1, -1) => right.compare_size(&left),
        (1, 1) => left.compare_size(&right),
        (left, right) => left.cmp(&right),
    })
}

/// A decimal taken apart: `+-0.DIGITS * 10^exponent`, without zeros at either end of the digits.
struct Written {
    negative: bool,
    digits: String,
    exponent: i64,
}

impl Written {
    fn read(text: &str) -> Option<Written> {
        let (negative, unsigned) = text.strip_prefix('-').map_or((false, text), |rest| (true, rest));
        let (body, exponent) = unsigned.split_once('e').unwrap_or((unsigned, "0"));
        let (whole, fraction) = body.split_once('.').unwrap_or((body, "0"));
        let digits_only = |part: &str| !part.is_empty() && part.bytes().all(|byte| byte.is_ascii_digit());
        let plain = exponent.strip_prefix('-').unwrap_or(exponent);
        if ![whole, fraction, plain].into_iter().all(digits_only) {
            return None;
        }
        let all = format!("{whole}{fraction}");
        let digits = all.trim_start_matches('0');
        let leading = all.len() - digits.len();
        let point = i64::try_from(whole.len()).ok()?.checked_sub(i64::try_from(leading).ok()?)?;
        let exponent = exponent.parse::<i64>().ok()?.checked_add(point)?;
        Some(Written { negative, digits: digits.trim_end_matches('0').to_owned(), exponent })
    }

    fn sign(&self) -> i32 {
        match (self.digits.is_empty(), self.negative) {
            (true, _) => 0,
            (false, true) => -1,
            (false, false) => 1,
        }
    }

    /// For numbers that are not zero.
    fn compare_size(&self, other: &Written) -> Ordering {
        self.exponent.cmp(&other.exponent).then_with(|| self.digits.cmp(&other.digits))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::arithmetic::ExactInput;
    use rug::{Integer, Rational};

    fn read(text: &str) -> Rational {
        text.parse::<ExactInput>().unwrap().lower().clone()
    }

    #[test]
    fn layouts() {
        let third = Interval::from_rationals(&Rational::from((1, 3)), &Rational::from((1, 3)), 200);
        assert_eq!(lower_decimal(third.lower(), 5), "0.33333");
        assert_eq!(upper_decimal(third.upper(), 5), "0.33334");
        let cases = [("1e-7", "1e-7"), ("0.00001", "0.00001"), ("12345", "12345"), ("1e25", "1e25"), ("-0.5", "-0.5")];
        for (text, printed) in cases {
            let v = read(text);
            let guaranteed = guaranteed_decimal(&Interval::from_rationals(&v, &v, 300), 1).map(|g| g.text);
            if text.len() < 7 && text != "12345" {
                assert_eq!(guaranteed.as_deref(), Some(printed));
            }
        }
    }

    #[test]
    fn comparison_reads_any_exponent() {
        assert_eq!(compare("1e-99999999999", "2e-99999999999"), Some(Ordering::Less));
        assert_eq!(compare("-1e5", "-100000.0"), Some(Ordering::Equal));
        assert_eq!(compare("0.00", "-0"), Some(Ordering::Equal));
        for text in ["", "1.", ".5", "1e", "+1", "inf", "1e+5", "1 ", "0x1", "1e99999999999999999999"] {
            assert_eq!(compare(text, "1"), None, "{text:?}");
        }
    }

    proptest::proptest! {
        #[test]
        fn comparison_is_that_of_the_numbers(a in "-?[0-9]{1,4}(\\.[0-9]{1,4})?(e-?[0-9]{1,2})?", b in "-?[0-9]{1,4}(\\.[0-9]{1,4})?(e-?[0-9]{1,2})?") {
            proptest::prop_assert_eq!(compare(&a, &b), Some(read(&a).cmp(&read(&b))));
        }

        #[test]
        fn printed_bounds_reparse_to_a_superset(n in 1i64.., d in 1i64.., e in -400i32..400, digits in 1u32..40) {
            let value = Rational::from((n, d)) * if e >= 0 { Rational::from(1) << e as u32 } else { Rational::from(1) >> (-e) as u32 };
            let i = Interval::from_rationals(&value, &value, 100);
            proptest::prop_assert!(read(&lower_decimal(i.lower(), digits)) <= value);
            proptest::prop_assert!(read(&upper_decimal(i.upper(), digits)) >= value);
        }

        #[test]
        fn guaranteed_digits_are_within_one_unit(n in 1i64.., d in 1i64.., width in 1u32..60, at in 0u32..=16) {
            let low = Rational::from((n, d));
            let high = low.clone() + (low.clone() >> width);
            let inside = low.clone() + (high.clone() - &low) * Rational::from((at, 16));
            let interval = Interval::from_rationals(&low, &high, 120);
            if let Some(found) = guaranteed_decimal(&interval, 40) {
                let printed = read(&found.text);
                let digits_after = |t: &str| -> Rational {
                    let (body, exponent) = t.split_once('e').unwrap_or((t, "0"));
                    let places = body.split_once('.').map_or(0, |(_, f)| f.len()) as i64 - exponent.parse::<i64>().unwrap();
                    read(&format!("1e{}", -places))
                };
                let unit = digits_after(&found.text);
                // Integers with trailing zeros have a unit above one; the count of digits tells.
                let unit = if found.text.contains('.') || found.text.contains('e') { unit } else {
                    let length = found.text.len() as u32;
                    unit * Rational::from(Integer::from(Integer::u_pow_u(10, length - found.digits.min(length))))
                };
                proptest::prop_assert!((printed - inside).abs() < unit);
            } else {
                // An eighth of its value across a power of ten can leave no digit: 0.894 to 1.006.
                proptest::prop_assert!(width <= 3, "no digit found for a narrow interval");
            }
        }
    }
}
