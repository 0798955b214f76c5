//! Shows that the containment checks of the K functions can fail: with `--features spoil` the power
//! series are cut too early without their tail bound, and the checks must notice it.
#![cfg(feature = "spoil")]
#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use coneproof::arithmetic::{Bits, Complex, Real};
use coneproof::functions::bessel_k::{self, Method};
use coneproof::spoil::{self, Fault};
use rug::{Float, Rational};
use std::sync::{Mutex, MutexGuard, PoisonError};

/// A fault is switched on for the whole process, so that one test runs at a time.
static ONE_AT_A_TIME: Mutex<()> = Mutex::new(());

fn alone() -> MutexGuard<'static, ()> {
    ONE_AT_A_TIME.lock().unwrap_or_else(PoisonError::into_inner)
}

/// The fault, until it goes out of scope, also by a panic.
struct Spoilt;

impl Spoilt {
    fn with(fault: Fault) -> Spoilt {
        spoil::activate(Some(fault));
        Spoilt
    }
}

impl Drop for Spoilt {
    fn drop(&mut self) {
        spoil::activate(None);
    }
}

/// The containment check of `tests/bessel_k.rs`.
fn contains(outer: &Real, inner: &Real) -> bool {
    let bits = outer.midpoint().prec().max(inner.midpoint().prec()) + 64;
    outer.is_bounded() && outer.to_interval(bits).contains(&inner.to_interval(bits))
}

const BITS: Bits = 150;

fn arguments() -> Vec<Real> {
    ["1e-3", "0.5", "1", "7.25", "20"]
        .iter()
        .map(|x| Real::from_float(Float::with_val(60, Float::parse(x).unwrap())))
        .collect()
}

/// How many of the cases pass, without and with the fault.
fn passed(check: impl Fn(&Real, bool) -> bool) -> (usize, usize) {
    let arguments = arguments();
    let honest = arguments.iter().filter(|x| check(x, false)).count();
    let spoilt = arguments.iter().filter(|x| check(x, true)).count();
    (honest, spoilt)
}

/// The value with or without the fault against the honest trapezoid rule.
fn check_real(method: Method, order: u32, x: &Real, spoilt: bool) -> bool {
    let reference = bessel_k::k_by(Method::Trapezoid, order, x, BITS + 60);
    let fault = spoilt.then(|| Spoilt::with(Fault::BesselSeriesCut));
    let value = bessel_k::k_by(method, order, x, BITS);
    drop(fault);
    contains(&value, &reference)
}

#[test]
fn the_real_series_cut_short_are_noticed() {
    let _guard = alone();
    for method in [Method::Series, Method::ShortSeries] {
        for order in 0..3 {
            assert_eq!(passed(|x, spoilt| check_real(method, order, x, spoilt)), (5, 0), "{method:?}, K_{order}");
        }
    }
}

#[test]
fn roots_are_noticed_too() {
    let _guard = alone();
    let square = Rational::from((5, 3));
    let honest = bessel_k::k0_k1_of_square(&square, BITS + 60);
    let fault = Spoilt::with(Fault::BesselSeriesCut);
    let spoilt = bessel_k::k0_k1_of_square(&square, BITS);
    drop(fault);
    assert!(!contains(&spoilt.0, &honest.0) && !contains(&spoilt.1, &honest.1));
    let again = bessel_k::k0_k1_of_square(&square, BITS);
    assert!(contains(&again.0, &honest.0) && contains(&again.1, &honest.1));
}

#[test]
fn the_complex_series_cut_short_is_noticed() {
    let _guard = alone();
    for order in 0..3 {
        let check = |x: &Real, spoilt: bool| {
            let z = Complex::new(x.clone(), x.shift(-1));
            let reference = bessel_k::k_complex_by(Method::Trapezoid, order, &z, BITS + 60);
            let fault = spoilt.then(|| Spoilt::with(Fault::BesselSeriesCut));
            let value = bessel_k::k_complex_by(Method::Series, order, &z, BITS);
            drop(fault);
            contains(&value.re, &reference.re) && contains(&value.im, &reference.im)
        };
        assert_eq!(passed(check), (5, 0), "K_{order}");
    }
}
