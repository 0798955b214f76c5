//! Piecewise polynomials as text: `knots` such as `-1, 0, 1` and `pieces` such as `0, 1; 1, -1`.
//!
//! Between two knots `x_i` and `x_(i+1)` the amplitude is `Sum_n c_n (x - x_i)^n`; the coefficients of a piece are separated
//! by commas, the pieces by semicolons. Numbers are exact: decimals, fractions, and complex ones such as `1/2-3i`.

use crate::arithmetic::ExactInput;
use crate::error::Error;
use crate::packets::ExactComplex;
use rug::Rational;

/// Knots and coefficients.
pub(super) type Pieces = (Vec<Rational>, Vec<Vec<ExactComplex>>);

/// Reads both texts.
///
/// # Errors
/// [`Error::BadInput`] naming `knots` or `pieces`.
pub(super) fn read(knots: &str, pieces: &str) -> Result<Pieces, Error> {
    let knots: Result<Vec<Rational>, Error> = knots.split(',').map(|text| real("knots", text)).collect();
    let piece = |text: &str| text.split(',').map(coefficient).collect::<Result<Vec<ExactComplex>, Error>>();
    let pieces: Result<Vec<Vec<ExactComplex>>, Error> = pieces.split(';').map(piece).collect();
    Ok((knots?, pieces?))
}

fn real(field: &str, text: &str) -> Result<Rational, Error> {
    let wanted = "give exact numbers separated by commas, such as -1, 0, 1/2 (pieces: 0, 1; 1, -1)";
    let read: ExactInput = text.trim().parse().map_err(|_| Error::bad_input(field, text.trim(), wanted))?;
    super::tail::check_size(field, &read)?;
    if !read.is_point() {
        return Err(Error::bad_input(field, text.trim(), wanted));
    }
    Ok(read.lower().clone())
}

/// A real number, or `a+bi`, `a-bi`, `bi`.
fn coefficient(text: &str) -> Result<ExactComplex, Error> {
    let text = text.trim();
    let Some(body) = text.strip_suffix('i') else {
        return Ok(ExactComplex::from(real("pieces", text)?));
    };
    let bytes = body.as_bytes();
    // The sign of the imaginary part: not the first character, and not that of an exponent.
    let split = (1..bytes.len())
        .rev()
        .find(|&k| matches!(bytes.get(k), Some(b'+' | b'-')) && !matches!(bytes.get(k - 1), Some(b'e' | b'E' | b'/')));
    let (re, im) = split.map_or(("0", body), |k| body.split_at(k));
    let im = match im.trim() {
        "" | "+" => "1",
        "-" => "-1",
        number => number,
    };
    Ok(ExactComplex::new(real("pieces", re)?, real("pieces", im.trim_start_matches('+'))?))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn complex_coefficients() {
        let shown = |text: &str| {
            let number = coefficient(text).unwrap();
            (number.re.to_string(), number.im.to_string())
        };
        assert_eq!(shown("1/2-3i"), ("1/2".into(), "-3".into()));
        assert_eq!(shown("1e-1+2e-1i"), ("1/10".into(), "1/5".into()));
        assert_eq!(shown("-i"), ("0".into(), "-1".into()));
        assert_eq!(shown("i"), ("0".into(), "1".into()));
        assert_eq!(shown("-2"), ("-2".into(), "0".into()));
        assert!(coefficient("1+").is_err() && coefficient("x").is_err() && coefficient("1++2i").is_err());
    }

    #[test]
    fn the_field_is_named() {
        assert!(read("0, a", "1").unwrap_err().to_string().starts_with("knots"));
        assert!(read("0, 1", "1, b").unwrap_err().to_string().starts_with("pieces"));
    }
}
