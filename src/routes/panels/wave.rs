//! Power series of `exp(i (theta_0 + theta_1 x))` on `|x| <= 1`.
//!
//! The coefficients `(i theta_1)^n/n!` are computed as balls, whose radii are summed; each is real or imaginary. From
//! `N >= 2 |theta_1|` on each is at most half of the one before, so that those left out sum to at most twice the
//! first of them. The constant phase is multiplied in afterwards: with `cos theta_0` and `sin theta_0` off by
//! `delta`, a component of the product is off by at most `(2 + 2 delta) e + (|re| + |im|) delta` and one unit for
//! each coefficient.

use super::expansion::{ComplexList, Factor};
use crate::arithmetic::{Magnitude, Real};
use crate::functions::elementary::{cos, sin};
use crate::routes::RouteFailure;
use crate::routes::kernel::panel::fixed;
use rug::Integer;

/// `exp(i rate x)` in units of `2^-scale`.
pub(super) fn wave(rate: &Real, scale: u32) -> Result<Factor, RouteFailure> {
    let span = rate.abs_upper();
    let bits = scale + 32;
    let unit = Magnitude::power_of_two(-i64::from(scale));
    let mut term = Real::from_i64(1);
    let mut factor = Factor { list: ComplexList::default(), scale, error: Magnitude::ZERO };
    for n in 0u64.. {
        let size = term.abs_upper();
        if size.cmp_value(unit).is_lt() && Magnitude::from_u64(n).cmp_value(span.shift(1)).is_ge() {
            factor.error = factor.error.add(size.shift(1));
            break;
        }
        let (value, radius) = fixed(&term, scale)?;
        factor.error = factor.error.add(radius.mul(unit));
        let value = if n % 4 < 2 { value } else { -value };
        let (re, im) = if n % 2 == 0 { (value, Integer::new()) } else { (Integer::new(), value) };
        factor.list.re.push(re);
        factor.list.im.push(im);
        term = term.mul(rate, bits).div_u64(n + 1, bits);
    }
    Ok(factor)
}

impl Factor {
    /// The complex conjugate, for real `x`.
    pub(super) fn conj(&self) -> Factor {
        let im = self.list.im.iter().map(|value| Integer::from(-value)).collect();
        Factor { list: ComplexList { re: self.list.re.clone(), im }, ..*self }
    }

    /// The product with `exp(i phase)`.
    pub(super) fn turned(&self, phase: &Real) -> Result<Factor, RouteFailure> {
        let scale = self.scale;
        let bits = scale + 16;
        let unit = Magnitude::power_of_two(-i64::from(scale));
        let ((c, c_error), (s, s_error)) = (fixed(&cos(phase, bits), scale)?, fixed(&sin(phase, bits), scale)?);
        let delta = c_error.max(s_error).mul(unit);
        let mut list = ComplexList::default();
        for (x, y) in self.list.re.iter().zip(&self.list.im) {
            list.re.push((Integer::from(x * &c) - Integer::from(y * &s)) >> scale);
            list.im.push((Integer::from(x * &s) + Integer::from(y * &c)) >> scale);
        }
        let spread = Magnitude::ONE.add(delta).shift(1).mul(self.error);
        let through_phase = self.list.size().shift(-i64::from(scale)).mul(delta);
        let rounding = Magnitude::from_u64(list.len() as u64).mul(unit);
        Ok(Factor { list, scale, error: spread.add(through_phase).add(rounding) })
    }
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
            let factor = wave(&r, scale).unwrap().turned(&p).unwrap();
            for sign in [1i64, -1] {
                let angle = p.add(&r.mul_i64(sign, 300), 300);
                let sum = |list: &[Integer]| {
                    let signed =
                        |(n, c): (usize, &Integer)| if n % 2 == 1 && sign < 0 { -c.clone() } else { c.clone() };
                    let total: Integer = list.iter().enumerate().map(signed).sum();
                    Real::from_scaled(&total, -i64::from(scale)).widen(factor.error)
                };
                assert!(sum(&factor.list.re).overlaps(&cos(&angle, 300)));
                assert!(sum(&factor.list.im).overlaps(&sin(&angle, 300)));
                let back = factor.conj();
                assert!(sum(&back.list.im).overlaps(&sin(&angle, 300).neg()));
                let limit = Magnitude::power_of_two(40 - i64::from(scale));
                assert!(factor.error.cmp_value(limit).is_lt());
            }
        }
    }
}
