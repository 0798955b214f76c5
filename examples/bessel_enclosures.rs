//! Enclosures of `K_nu(x)` and `K_nu(z)` for checks by other programs.
//!
//! Reads lines `nu bits x_re x_im` from standard input, the argument as exact dyadic numbers
//! `INT*2^EXP` or plain integers, and answers each with one line: `lo hi` for a real argument
//! (`x_im` zero), else `re_lo re_hi im_lo im_hi`, all in the same exact form, or `error: ...`.

use coneproof::arithmetic::{Complex, Real};
use coneproof::functions::bessel_k;
use rug::{Float, Integer};
use std::io::{self, BufRead, BufWriter, Write};

fn main() -> io::Result<()> {
    let mut output = BufWriter::new(io::stdout().lock());
    for line in io::stdin().lock().lines() {
        match answer(&line?) {
            Ok(text) => writeln!(output, "{text}")?,
            Err(reason) => writeln!(output, "error: {reason}")?,
        }
    }
    output.flush()
}

fn answer(line: &str) -> Result<String, String> {
    let fields: Vec<&str> = line.split_whitespace().collect();
    let [order, bits, re, im] = fields[..] else {
        return Err("four fields are needed: nu bits x_re x_im".to_owned());
    };
    let order: u32 = order.parse().map_err(|_| format!("not an order: {order}"))?;
    let bits: u32 = bits.parse().map_err(|_| format!("not a number of bits: {bits}"))?;
    let (re, im) = (read(re)?, read(im)?);
    if im.midpoint().is_zero() {
        return print(&bessel_k::k(order, &re, bits));
    }
    let value = bessel_k::k_complex(order, &Complex::new(re, im), bits);
    Ok(format!("{} {}", print(&value.re)?, print(&value.im)?))
}

/// `INT*2^EXP` or `INT`, exactly.
fn read(text: &str) -> Result<Real, String> {
    let (mantissa, exponent) = text.split_once("*2^").unwrap_or((text, "0"));
    let mantissa: Integer = mantissa.parse().map_err(|_| format!("not an integer: {mantissa}"))?;
    let exponent: i64 = exponent.parse().map_err(|_| format!("not an exponent: {exponent}"))?;
    Ok(Real::from_scaled(&mantissa, exponent))
}

fn print(ball: &Real) -> Result<String, String> {
    if !ball.is_bounded() {
        return Err("nothing known".to_owned());
    }
    let bits = ball.midpoint().prec() + 32;
    Ok(format!("{} {}", write(&ball.lower(bits))?, write(&ball.upper(bits))?))
}

fn write(value: &Float) -> Result<String, String> {
    let (mantissa, exponent) = value.to_integer_exp().ok_or("not a finite number")?;
    Ok(format!("{mantissa}*2^{exponent}"))
}
