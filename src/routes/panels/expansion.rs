//! Functions on a panel: a polynomial, or a polynomial with a second one that multiplies a logarithm.
//!
//! An [`Expansion`] stands for a function `f` with
//!
//! ```text
//! |component of f(x) - A(x) - B(x) ln x| <= error * (1 + |ln x|),
//! ```
//!
//! for the real and the imaginary component separately: on `0 < x <= 1` at the cone, and on `|x| <= 1` with `B = 0`
//! and without the logarithm in the bound elsewhere. Coefficients are integers in units of `2^-scale`. The size of a
//! list is the sum of the absolute values of its coefficients; it bounds the polynomial.
//!
//! **Integration** (`f -> Int_x^1 f`, anchored at `x = 1` by a known value). The computed polynomials are integrated
//! term by term: `n B'_n = -B_(n-1)`, `n A'_n = -A_(n-1) - B'_n`, with fewer than two units of rounding in `A'_n` and
//! one in `B'_n`. The error of `f` contributes `Int_x^1 error (1 + |ln|) <= 2 error`, and so does a constant error on
//! a panel of length two. The roundings contribute at most `2 + 2` units for each `A'_n` (at `x` and at 1) and one
//! for each `B'_n`, as `x^n |ln x| < 1` for `n >= 1`; five units for each index cover both.
//!
//! **Product** with a series `E` that is off by `e` in each component: a component of the product is the sum of two
//! real products, off by at most `(|A.re| + |A.im|) e + (|E.re| + |E.im|) error + 2 e error`, and a unit for each
//! coefficient.

use crate::arithmetic::{Complex, Magnitude, Real};
use crate::routes::RouteFailure;
use crate::routes::kernel::panel::fixed;
use crate::routes::kernel::squares::signed_product;
use rug::{Float, Integer};

/// Two real lists; an empty one is zero.
#[derive(Clone, Debug, Default)]
pub(super) struct ComplexList {
    pub re: Vec<Integer>,
    pub im: Vec<Integer>,
}

impl ComplexList {
    pub(super) fn real(re: Vec<Integer>) -> ComplexList {
        ComplexList { re, im: Vec::new() }
    }

    /// Upper bound of the sizes of both lists together, in units.
    pub(super) fn size(&self) -> Magnitude {
        size(&self.re).add(size(&self.im))
    }

    /// Bits of the largest coefficient.
    pub(super) fn bits(&self) -> u32 {
        self.re.iter().chain(&self.im).map(Integer::significant_bits).max().unwrap_or(0)
    }

    pub(super) fn len(&self) -> usize {
        self.re.len().max(self.im.len())
    }

    fn times(&self, other: &ComplexList) -> ComplexList {
        let mut re = signed_product(&self.re, &other.re);
        subtract(&mut re, &signed_product(&self.im, &other.im));
        let mut im = signed_product(&self.re, &other.im);
        add(&mut im, &signed_product(&self.im, &other.re));
        ComplexList { re, im }
    }

    fn shifted_down(mut self, bits: u32) -> ComplexList {
        self.re.iter_mut().chain(self.im.iter_mut()).for_each(|value| *value >>= bits);
        self
    }

    /// Without zeros at the end.
    fn trimmed(mut self) -> ComplexList {
        for list in [&mut self.re, &mut self.im] {
            let kept = list.iter().rposition(|value| *value != 0).map_or(0, |last| last + 1);
            list.truncate(kept);
        }
        self
    }
}

/// Upper bound of the sum of absolute values.
pub(super) fn size(list: &[Integer]) -> Magnitude {
    let mut sum = Integer::new();
    for value in list {
        if *value < 0 { sum -= value } else { sum += value }
    }
    Magnitude::from_float(&Float::with_val_round(64, &sum, rug::float::Round::Up).0)
}

fn subtract(target: &mut Vec<Integer>, list: &[Integer]) {
    if target.len() < list.len() {
        target.resize(list.len(), Integer::new());
    }
    target.iter_mut().zip(list).for_each(|(x, y)| *x -= y);
}

fn add(target: &mut Vec<Integer>, list: &[Integer]) {
    if target.len() < list.len() {
        target.resize(list.len(), Integer::new());
    }
    target.iter_mut().zip(list).for_each(|(x, y)| *x += y);
}

/// `target += weight * list`.
pub(super) fn add_weighted(target: &mut Vec<Integer>, list: &[Integer], weight: &Integer) {
    if *weight == 0 {
        return;
    }
    if target.len() < list.len() {
        target.resize(list.len(), Integer::new());
    }
    target.iter_mut().zip(list).for_each(|(x, y)| *x += y * weight);
}

/// A series for a bounded function without logarithm, with its own unit.
pub(super) struct Factor {
    pub list: ComplexList,
    pub scale: u32,
    /// Bound of the error of each component.
    pub error: Magnitude,
}

/// See the module's documentation.
#[derive(Clone, Debug)]
pub(super) struct Expansion {
    pub regular: ComplexList,
    pub logarithm: ComplexList,
    pub error: Magnitude,
}

impl Expansion {
    /// Exactly zero.
    pub(super) fn zero() -> Expansion {
        Expansion { regular: ComplexList::default(), logarithm: ComplexList::default(), error: Magnitude::ZERO }
    }

    /// Bound of each component over `1 + |ln x|`, without the error.
    pub(super) fn bound(&self, scale: u32) -> Magnitude {
        self.regular.size().max(self.logarithm.size()).shift(-i64::from(scale))
    }

    /// `Int_x^1 f`, plus `right`.
    pub(super) fn integrated(&self, right: &Complex, scale: u32) -> Result<Expansion, RouteFailure> {
        let unit = Magnitude::power_of_two(-i64::from(scale));
        let (re, re_error) = fixed(&right.re, scale)?;
        let (im, im_error) = fixed(&right.im, scale)?;
        let mut result = Expansion::zero();
        (result.regular.re, result.logarithm.re) = integrated(&self.regular.re, &self.logarithm.re, re);
        if !self.regular.im.is_empty() || !self.logarithm.im.is_empty() || im != 0 {
            (result.regular.im, result.logarithm.im) = integrated(&self.regular.im, &self.logarithm.im, im);
        }
        let count = result.regular.len().max(result.logarithm.len()) as u64;
        let rounding = Magnitude::from_u64(5 * count).add(re_error.max(im_error));
        result.error = self.error.shift(1).add(rounding.mul(unit));
        Ok(result)
    }

    /// The value at `x = -1`, for expansions without logarithm.
    pub(super) fn at_left(&self, scale: u32) -> Complex {
        let value = |list: &[Integer]| {
            let mut sum = Integer::new();
            for (n, coefficient) in list.iter().enumerate() {
                if n % 2 == 0 { sum += coefficient } else { sum -= coefficient }
            }
            Real::from_scaled(&sum, -i64::from(scale)).widen(self.error)
        };
        Complex::new(value(&self.regular.re), value(&self.regular.im))
    }

    /// The product with a bounded function.
    pub(super) fn times(&self, factor: &Factor, scale: u32) -> Expansion {
        let regular = self.regular.times(&factor.list).shifted_down(factor.scale).trimmed();
        let logarithm = self.logarithm.times(&factor.list).shifted_down(factor.scale).trimmed();
        let count = regular.len().max(logarithm.len()).max(self.regular.len() + factor.list.len()) as u64;
        let factor_size = factor.list.size().shift(-i64::from(factor.scale));
        let error = self
            .bound(scale)
            .mul(factor.error)
            .add(factor_size.mul(self.error))
            .add(factor.error.mul(self.error).shift(1))
            .add(Magnitude::from_u64(count).shift(-i64::from(scale)));
        Expansion { regular, logarithm, error }
    }

    /// The real part.
    pub(super) fn real_part(mut self) -> Expansion {
        self.regular.im.clear();
        self.logarithm.im.clear();
        self
    }
}

fn integrated(regular: &[Integer], logarithm: &[Integer], right: Integer) -> (Vec<Integer>, Vec<Integer>) {
    let mut with_log = Vec::new();
    if !logarithm.is_empty() {
        with_log.push(Integer::new());
        with_log.extend(logarithm.iter().zip(1u64..).map(|(value, n)| -Integer::from(value / n)));
    }
    let count = regular.len().max(logarithm.len());
    let none = Integer::new();
    let mut list = Vec::with_capacity(count + 1);
    list.push(Integer::new());
    let mut sum = Integer::new();
    for n in 1..=count {
        let mut value = Integer::from(regular.get(n - 1).unwrap_or(&none) + with_log.get(n).unwrap_or(&none));
        value /= n as u64;
        value = -value;
        sum += &value;
        list.push(value);
    }
    list[0] = right - sum;
    (list, with_log)
}
