//! `M_n(c) = Int_0^l y^n exp(-c y) dy` for complex `c` with `Re c >= 0`.
//!
//! Integration by parts gives `c M_n = n M_(n-1) - l^n exp(-c l)`. For `|c| l` above the degree it is used forward from
//! `M_0 = (1 - exp(-c l))/c`; otherwise backward from the highest one, which comes from
//!
//! ```text
//! M_N = l^(N+1) exp(-c l)/(N+1) Sum_{i>=0} (c l)^i / ((N+2)(N+3)...(N+1+i)),
//! ```
//!
//! the power series of `Int_0^1 u^N exp(c l (1-u)) du` term by term (Euler's beta integral, DLMF 5.12.1). Its terms shrink by
//! `|c| l/(N+2+i)` each, so those from `i = I` on are at most `|term_I|/(1 - |c| l/(N+2+I))`.
//!
//! The recurrences are on balls: nothing but width depends on the direction chosen.

use crate::arithmetic::{Bits, Complex, Magnitude, Real};
use crate::functions::complex_elementary::whole_plane;

/// The moments `0..=degree`; `decay` is `exp(-c l)`.
pub(super) fn moments(c: &Complex, length: &Real, decay: &Complex, degree: usize, bits: Bits) -> Vec<Complex> {
    let reach = c.re.to_f64().hypot(c.im.to_f64()) * length.to_f64();
    if reach > degree as f64 + 2.0 {
        forward(c, length, decay, degree, bits)
    } else {
        backward(c, length, decay, degree, bits)
    }
}

fn forward(c: &Complex, length: &Real, decay: &Complex, degree: usize, bits: Bits) -> Vec<Complex> {
    let one = Complex::from_real(Real::from_i64(1));
    let mut list = vec![one.sub(decay, bits).div(c, bits)];
    let mut edge = decay.clone();
    for n in 1..=degree {
        edge = edge.mul_real(length, bits);
        let before = list[n - 1].mul_real(&Real::from_i64(n as i64), bits);
        list.push(before.sub(&edge, bits).div(c, bits));
    }
    list
}

fn backward(c: &Complex, length: &Real, decay: &Complex, degree: usize, bits: Bits) -> Vec<Complex> {
    // edges[n] = l^n exp(-c l)
    let mut edges = vec![decay.clone()];
    for n in 0..degree {
        edges.push(edges[n].mul_real(length, bits));
    }
    let top = edges[degree].mul_real(length, bits).mul(&series(&c.mul_real(length, bits), degree, bits), bits);
    let mut list = vec![top];
    for n in (1..=degree).rev() {
        let above = list[degree - n].mul(c, bits).add(&edges[n], bits);
        let inverse = Real::from_i64(1).div_u64(n as u64, bits);
        list.push(above.mul_real(&inverse, bits));
    }
    list.reverse();
    list
}

/// `1/(N+1) Sum_i z^i/((N+2)...(N+1+i))`.
fn series(z: &Complex, degree: usize, bits: Bits) -> Complex {
    const MOST_TERMS: u64 = 100_000;
    let start = degree as u64 + 1;
    let goal = Magnitude::power_of_two(-i64::from(bits));
    let mut term = Complex::from_real(Real::from_i64(1).div_u64(start, bits));
    let mut total = term.clone();
    for i in 1..MOST_TERMS {
        let inverse = Real::from_i64(1).div_u64(start + i, bits);
        term = term.mul(z, bits).mul_real(&inverse, bits);
        // Ratio of the terms from here on.
        let ratio = z.abs_upper().div(Magnitude::from_u64(start + i + 1));
        let below = Magnitude::ONE.sub_down(ratio);
        if term.abs_upper().cmp_value(goal).is_lt() && !below.is_zero() {
            return total.widen(term.abs_upper().div(below));
        }
        total = total.add(&term, bits);
        if !total.is_bounded() {
            break;
        }
    }
    whole_plane()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::functions::complex_elementary::exp;
    use rug::{Float, Rational};

    proptest::proptest! {
        /// Both directions meet, and so does a midpoint rule with the error `l^3 max|f''|/(24 n^2)`.
        #[test]
        fn directions_and_definition_agree(
            x in 0.0f64..12.0, y in -12.0f64..12.0, l in 0.1f64..2.0, degree in 0usize..6, bits in 60u32..200
        ) {
            let real = |v: f64| Real::from_float(Float::with_val(53, v));
            let (c, length) = (Complex::new(real(x), real(y)), real(l));
            let decay = exp(&c.mul_real(&length, bits + 20).neg(), bits + 20);
            let lists = [forward(&c, &length, &decay, degree, bits), backward(&c, &length, &decay, degree, bits)];
            for n in 0..=degree {
                let (left, right) = (&lists[0][n], &lists[1][n]);
                proptest::prop_assert!(left.re.overlaps(&right.re) && left.im.overlaps(&right.im));
                const POINTS: usize = 400;
                let (mut re, mut im) = (0.0, 0.0);
                for k in 0..POINTS {
                    let at = l * (k as f64 + 0.5) / POINTS as f64;
                    let size = at.powi(n as i32) * (-x * at).exp() * l / POINTS as f64;
                    re += size * (y * at).cos();
                    im -= size * (y * at).sin();
                }
                let size = c.abs_upper().to_float().to_f64();
                let m = n as f64;
                let second = l.powf(m) * size * size + 2.0 * m * l.powf((m - 1.0).max(0.0)) * size
                    + m * (m - 1.0) * l.powf((m - 2.0).max(0.0));
                let error = l.powi(3) * second / (24.0 * (POINTS * POINTS) as f64) + 1e-12;
                let near = |ball: &Real, value: f64| {
                    ball.to_interval(bits).contains_rational(&Rational::from_f64(value).unwrap())
                        || (ball.to_f64() - value).abs() <= error
                };
                proptest::prop_assert!(near(&right.re, re) && near(&right.im, im));
            }
        }
    }
}
