//! Taylor series of `exp(i (theta_0 + theta_1 x))` on `|x| <= 1`.
//!
//! The coefficients `e^(i theta_0) (i theta_1)^n/n!` are computed as balls, whose radii are summed. From `N >= 2 |theta_1|` on each is at
//! most half of the one before, so that those left out sum to at most twice the first of them.

use super::expansion::{ComplexList, Factor};
use crate::arithmetic::{Complex, Magnitude, Real};
use crate::functions::elementary::{cos, sin};
use crate::routes::kernel::panel::fixed;
use crate::routes::{Effort, RouteFailure};

/// The series in units of `2^-scale`.
pub(super) fn wave(theta: [&Real; 2], scale: u32, effort: &Effort) -> Result<Factor, RouteFailure> {
    let [phase, rate] = theta;
    let span = rate.abs_upper();
    let bits = scale + 32 + phase.abs_upper().log2_estimate().clamp(0.0, 1e6) as u32;
    let unit = Magnitude::power_of_two(-i64::from(scale));
    let mut term = Complex::new(cos(phase, bits), sin(phase, bits));
    let mut factor = Factor { list: ComplexList::default(), scale, error: Magnitude::ZERO };
    for n in 0u64.. {
        if n % 64 == 0 {
            effort.check()?;
        }
        let size = term.abs_upper();
        let small = size.cmp_value(unit).is_lt();
        if small && Magnitude::from_u64(n).cmp_value(span.shift(1)).is_ge() {
            factor.error = factor.error.add(size.shift(1));
            break;
        }
        let ((re, re_error), (im, im_error)) = (fixed(&term.re, scale)?, fixed(&term.im, scale)?);
        factor.list.re.push(re);
        factor.list.im.push(im);
        factor.error = factor.error.add(re_error.max(im_error).mul(unit));
        let next = |part: &Real| part.mul(rate, bits).div_u64(n + 1, bits);
        term = Complex::new(next(&term.im).neg(), next(&term.re));
    }
    Ok(factor)
}

#[cfg(test)]
mod tests {
    use super::*;
    use rug::Rational;

    /// At `x = 1` and `x = -1` the series must give the cosine and sine of the sum and the difference.
    #[test]
    fn sums_contain_the_function() {
        for (phase, rate, scale) in [(0, 1, 60), (3, 7, 100), (-5, 20, 200), (1, 0, 64)] {
            let [p, r] = [phase, rate].map(|v| Real::from_rational(&Rational::from((v, 3)), 300));
            let factor = wave([&p, &r], scale, &Effort::default()).unwrap();
            for sign in [1i64, -1] {
                let angle = p.add(&r.mul_i64(sign, 300), 300);
                let sum = |list: &[rug::Integer]| {
                    let signed =
                        |(n, c): (usize, &rug::Integer)| if n % 2 == 1 && sign < 0 { -c.clone() } else { c.clone() };
                    let total: rug::Integer = list.iter().enumerate().map(signed).sum();
                    Real::from_scaled(&total, -i64::from(scale)).widen(factor.error)
                };
                assert!(sum(&factor.list.re).overlaps(&cos(&angle, 300)));
                assert!(sum(&factor.list.im).overlaps(&sin(&angle, 300)));
                let limit = Magnitude::power_of_two(40 - i64::from(scale));
                assert!(factor.error.cmp_value(limit).is_lt());
            }
        }
    }
}
