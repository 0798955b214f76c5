//! Statements about decimals as they are written, decided exactly with whole numbers.

use rug::Integer;
use rug::ops::Pow;

/// Largest difference of decimal exponents; decimals further apart are not of one certificate.
const MAX_SHIFT: i64 = 1_000_000;

/// A decimal `mantissa * 10^exponent`, where `10^exponent` is one unit of the last digit written.
struct Written {
    mantissa: Integer,
    exponent: i64,
}

impl Written {
    /// Reads `digits[.digits][e[-]digits]`.
    fn read(text: &str) -> Option<Written> {
        let (body, exponent) = text.split_once('e').unwrap_or((text, "0"));
        let (whole, fraction) = body.split_once('.').unwrap_or((body, ""));
        let digits = format!("{whole}{fraction}");
        let plain = !digits.is_empty() && digits.bytes().all(|byte| byte.is_ascii_digit());
        let places = i64::try_from(fraction.len()).ok()?;
        let exponent = exponent.parse::<i64>().ok()?.checked_sub(places)?;
        let mantissa = if plain { digits.parse().ok()? } else { return None };
        Some(Written { mantissa, exponent })
    }

    /// The number in units of `10^exponent`, which is not above its own.
    fn in_units(&self, exponent: i64) -> Option<Integer> {
        if self.mantissa == 0 {
            return Some(Integer::new());
        }
        let shift = self.exponent.checked_sub(exponent).filter(|shift| (0..=MAX_SHIFT).contains(shift))?;
        Some(Integer::from(10).pow(u32::try_from(shift).ok()?) * &self.mantissa)
    }
}

/// The smallest exponent of numbers that are not zero.
fn common(list: &[&Written]) -> i64 {
    list.iter().filter(|number| number.mantissa != 0).map(|number| number.exponent).min().unwrap_or(0)
}

/// Whether `value` differs from `bound` by less than one unit of the last digit of `value`; `None` unless both are
/// decimals from zero up that can be compared.
pub fn within_one_unit(value: &str, bound: &str) -> Option<bool> {
    let (value, bound) = (Written::read(value)?, Written::read(bound)?);
    let unit = Written { mantissa: Integer::from(1), exponent: value.exponent };
    let exponent = common(&[&value, &bound, &unit]);
    let difference = value.in_units(exponent)? - bound.in_units(exponent)?;
    Some(difference.abs() < unit.in_units(exponent)?)
}

/// Whether `upper - lower <= 10^-digits * lower`, or `upper = lower`; `None` unless both are decimals from zero up that
/// can be compared.
pub fn has_relative_digits(lower: &str, upper: &str, digits: u32) -> Option<bool> {
    let (lower, upper) = (Written::read(lower)?, Written::read(upper)?);
    if lower.mantissa == 0 {
        // Nothing is known about the ratio, unless both are zero.
        return Some(upper.mantissa == 0 || digits == 0);
    }
    let exponent = common(&[&lower, &upper]);
    let (lower, upper) = match (lower.in_units(exponent), upper.in_units(exponent)) {
        (Some(lower), Some(upper)) => (lower, upper),
        // A ratio of more than 10^MAX_SHIFT.
        _ => return Some(digits == 0),
    };
    // With no digits nothing is stated.
    Some(digits == 0 || (upper - &lower) * Integer::from(10).pow(digits) <= lower)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_of_the_last_digit() {
        assert_eq!(within_one_unit("0.021", "0.0219999"), Some(true));
        assert_eq!(within_one_unit("0.021", "0.022"), Some(false));
        assert_eq!(within_one_unit("1.25e-40", "1.2400001e-40"), Some(true));
        assert_eq!(within_one_unit("1.25e-40", "1.26e-40"), Some(false));
        assert_eq!(within_one_unit("0", "0"), Some(true));
        assert_eq!(within_one_unit("0.1", "-1"), None);
        assert_eq!(within_one_unit("1e-99999999999", "1"), None);
    }

    #[test]
    fn relative_digits() {
        assert_eq!(has_relative_digits("1", "1.001", 3), Some(true));
        assert_eq!(has_relative_digits("1", "1.00100001", 3), Some(false));
        assert_eq!(has_relative_digits("0", "0", 15), Some(true));
        assert_eq!(has_relative_digits("0", "1", 1), Some(false));
        assert_eq!(has_relative_digits("2e-300000000", "2.0001e-300000000", 4), Some(true));
    }
}
