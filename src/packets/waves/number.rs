//! Exact numbers of wave packets: complex rationals and wave numbers.

use rug::Rational;

/// A complex number with rational parts.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct ExactComplex {
    /// Real part.
    pub re: Rational,
    /// Imaginary part.
    pub im: Rational,
}

impl ExactComplex {
    /// From the two parts.
    pub fn new(re: Rational, im: Rational) -> ExactComplex {
        ExactComplex { re, im }
    }

    /// Whether the number is zero.
    pub fn is_zero(&self) -> bool {
        self.re == 0 && self.im == 0
    }

    /// Sum.
    pub fn plus(&self, other: &ExactComplex) -> ExactComplex {
        ExactComplex::new(Rational::from(&self.re + &other.re), Rational::from(&self.im + &other.im))
    }

    /// Product with a rational.
    pub fn times(&self, factor: &Rational) -> ExactComplex {
        ExactComplex::new(Rational::from(&self.re * factor), Rational::from(&self.im * factor))
    }

    /// Product.
    pub fn product(&self, other: &ExactComplex) -> ExactComplex {
        let re = Rational::from(&self.re * &other.re) - Rational::from(&self.im * &other.im);
        let im = Rational::from(&self.re * &other.im) + Rational::from(&self.im * &other.re);
        ExactComplex::new(re, im)
    }

    /// Complex conjugate.
    pub fn conj(&self) -> ExactComplex {
        ExactComplex::new(self.re.clone(), Rational::from(-&self.im))
    }

    /// Minus the number.
    pub fn neg(&self) -> ExactComplex {
        ExactComplex::new(Rational::from(-&self.re), Rational::from(-&self.im))
    }
}

impl From<Rational> for ExactComplex {
    fn from(re: Rational) -> ExactComplex {
        ExactComplex { re, im: Rational::new() }
    }
}

/// A wave number `plain + pi_part * pi`, exact: hard walls at rational places give rational multiples of `pi`.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct WaveNumber {
    /// The rational part.
    pub plain: Rational,
    /// What multiplies `pi`.
    pub pi_part: Rational,
}

impl WaveNumber {
    /// Whether there is no wave at all; exact, as `pi` is irrational.
    pub fn is_zero(&self) -> bool {
        self.plain == 0 && self.pi_part == 0
    }

    /// Minus the wave number.
    pub fn neg(&self) -> WaveNumber {
        WaveNumber { plain: Rational::from(-&self.plain), pi_part: Rational::from(-&self.pi_part) }
    }

    /// Difference.
    pub fn minus(&self, other: &WaveNumber) -> WaveNumber {
        WaveNumber {
            plain: Rational::from(&self.plain - &other.plain),
            pi_part: Rational::from(&self.pi_part - &other.pi_part),
        }
    }

    /// Product with a rational.
    pub fn times(&self, factor: &Rational) -> WaveNumber {
        WaveNumber { plain: Rational::from(&self.plain * factor), pi_part: Rational::from(&self.pi_part * factor) }
    }
}

/// A polynomial with exact complex coefficients, the constant first.
pub type Polynomial = Vec<ExactComplex>;

/// `p(length - y)` as a polynomial in `y`.
pub fn mirrored(polynomial: &[ExactComplex], length: &Rational) -> Polynomial {
    let mut list = polynomial.to_vec();
    // Taylor's shift by repeated synthetic division.
    for start in 0..list.len() {
        for n in (start..list.len().saturating_sub(1)).rev() {
            list[n] = list[n].plus(&list[n + 1].times(length));
        }
    }
    for (n, value) in list.iter_mut().enumerate() {
        if n % 2 == 1 {
            *value = value.neg();
        }
    }
    list
}

/// `p(y + shift)` as a polynomial in `y`.
pub fn shifted(polynomial: &[ExactComplex], shift: &Rational) -> Polynomial {
    let mut list = mirrored(polynomial, shift);
    for (n, value) in list.iter_mut().enumerate() {
        if n % 2 == 1 {
            *value = value.neg();
        }
    }
    list
}

/// Sum of two polynomials, without zeros at the end.
pub fn sum(left: &[ExactComplex], right: &[ExactComplex]) -> Polynomial {
    let zero = ExactComplex::default();
    let at = |list: &[ExactComplex], n: usize| list.get(n).unwrap_or(&zero).clone();
    trimmed((0..left.len().max(right.len())).map(|n| at(left, n).plus(&at(right, n))).collect())
}

/// Without zeros at the end.
pub fn trimmed(mut polynomial: Polynomial) -> Polynomial {
    while polynomial.last().is_some_and(ExactComplex::is_zero) {
        polynomial.pop();
    }
    polynomial
}

#[cfg(test)]
mod tests {
    use super::*;

    fn real(values: &[i64]) -> Polynomial {
        values.iter().map(|v| ExactComplex::from(Rational::from(*v))).collect()
    }

    #[test]
    fn polynomials_move_and_turn() {
        // (3 - y)^2 + 2 (3 - y) + 5 = y^2 - 8 y + 20, (y + 3)^2 + 2 (y + 3) + 5 = y^2 + 8 y + 20.
        assert_eq!(mirrored(&real(&[5, 2, 1]), &Rational::from(3)), real(&[20, -8, 1]));
        assert_eq!(shifted(&real(&[5, 2, 1]), &Rational::from(3)), real(&[20, 8, 1]));
        assert_eq!(sum(&real(&[1, 2]), &real(&[3, -2])), real(&[4]));
    }
}
