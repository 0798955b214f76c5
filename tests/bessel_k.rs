//! The K functions: independent methods against each other, identities, tables, balls.
#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use coneproof::arithmetic::{Bits, Complex, ExactInput, Magnitude, Real};
use coneproof::functions::bessel_k::{self, Method};
use proptest::prelude::*;
use rug::{Float, Integer, Rational};

/// `mantissa * 2^exponent` exactly.
fn dyadic(mantissa: i64, exponent: i32) -> Real {
    Real::from_scaled(&Integer::from(mantissa), i64::from(exponent))
}

fn rational(text: &str) -> Rational {
    text.parse::<ExactInput>().unwrap().lower().clone()
}

fn real(text: &str) -> Real {
    Real::from_rational(&rational(text), 4000)
}

/// Whether all of `inner` lies in `outer`. For two enclosures of the same number, the inner one
/// much narrower, this fails only if the outer one is wrong (or its bound is sharp to all digits).
fn contains(outer: &Real, inner: &Real) -> bool {
    let bits = outer.midpoint().prec().max(inner.midpoint().prec()) + 64;
    outer.is_bounded() && outer.to_interval(bits).contains(&inner.to_interval(bits))
}

fn contains_complex(outer: &Complex, inner: &Complex) -> bool {
    contains(&outer.re, &inner.re) && contains(&outer.im, &inner.im)
}

/// Bits of accuracy relative to the absolute value.
fn complex_accuracy(value: &Complex) -> f64 {
    let radius = value.re.radius().max(value.im.radius());
    value.abs_upper().log2_estimate() - radius.log2_estimate()
}

/// A 53-bit number of about this size.
fn near(ln_size: f64) -> Real {
    Real::from_float(Float::with_val(53, ln_size.exp()))
}

proptest! {
    #[test]
    fn methods_agree(order in 0u32..3, ln_size in -7.0f64..8.0, bits in 10u32..500) {
        let x = near(ln_size);
        let value = bessel_k::k(order, &x, bits);
        prop_assert!(value.accuracy_estimate() >= f64::from(bits) - 1.0);
        prop_assert!(contains(&value, &bessel_k::k_by(Method::Series, order, &x, bits + 60)));
        prop_assert!(contains(&value, &bessel_k::k_by(Method::Trapezoid, order, &x, bits + 60)));
        let short = bessel_k::k_by(Method::ShortSeries, order, &x, bits);
        prop_assert!(!short.is_bounded() || contains(&short, &bessel_k::k_by(Method::Series, order, &x, bits + 60)));
        let asymptotic = bessel_k::k_by(Method::Asymptotic, order, &x, bits);
        let long = bessel_k::k(order, &x, bits + 60);
        prop_assert!(!asymptotic.is_bounded() || contains(&asymptotic, &long));
        prop_assert!(asymptotic.is_bounded() || ln_size < 0.0);
    }

    // The words' series against general integers and, not too slow there, the trapezoid rule.
    #[test]
    fn short_series(
        order in 0u32..3, ln_size in -690.0f64..3.6, far: bool, mantissa_bits in 2u32..300, bits in 10u32..520
    ) {
        // Half of the arguments where the series has many terms, with mantissas of all lengths.
        let ln_size = if far || ln_size > 0.0 { ln_size } else { 3.6 + ln_size / 150.0 };
        let size = Rational::from_f64(ln_size.exp()).unwrap() * Rational::from((7, 5));
        let x = Real::from_float(Float::with_val(mantissa_bits, &size));
        let value = bessel_k::k_by(Method::ShortSeries, order, &x, bits);
        // Order two asks for a few bits more.
        let fits = x.to_f64() < 31.9 && f64::from(bits) + 2.886 * x.to_f64() + 11.0 <= 500.0;
        prop_assert!(value.is_bounded() || !fits);
        if value.is_bounded() {
            prop_assert!(value.accuracy_estimate() >= f64::from(bits) - 1.0);
            prop_assert!(contains(&value, &bessel_k::k_by(Method::Series, order, &x, bits + 60)));
            prop_assert!(contains(&value, &bessel_k::k_by(Method::Trapezoid, order, &x, bits + 60)));
        }
    }

    // Squares of any length: short ones are divided as words, long ones rounded to a fraction.
    #[test]
    fn roots_of_long_fractions(p in 1u128.., q in 1u128.., cut in 0u32..128, power in 0u32..3, bits in 10u32..450) {
        let (p, q) = (Integer::from(p) * (p >> 100 | 1), Integer::from((q >> cut).max(1)));
        let square = (Rational::from((p, q)) >> (28 - cut.min(28)) >> 110u32) * Rational::from((3, 7u32.pow(power)));
        let root = coneproof::functions::elementary::sqrt(&Real::from_rational(&square, bits + 200), bits + 200);
        let (k0, over_r) = bessel_k::k0_k1_of_square(&square, bits);
        let long = |order| bessel_k::k_by(Method::Series, order, &root, bits + 60);
        if root.to_f64() < 1000.0 {
            prop_assert!(contains(&k0, &long(0)));
            prop_assert!(contains(&over_r, &long(1).div(&root, bits + 60)));
        }
        prop_assert!(k0.accuracy_estimate().min(over_r.accuracy_estimate()) >= f64::from(bits) - 1.0);
    }

    #[test]
    fn small_integers_and_their_roots(square in 1u64..2000, divisor in 1u64..50, bits in 10u32..400) {
        let square = Rational::from((square, divisor));
        let root = coneproof::functions::elementary::sqrt(&Real::from_rational(&square, bits + 100), bits + 100);
        let (k0, k1) = bessel_k::k0_k1(&root, bits + 50);
        let (of_square_0, of_square_1) = bessel_k::k0_k1_of_square(&square, bits);
        prop_assert!(contains(&of_square_0, &k0));
        prop_assert!(contains(&of_square_1, &k1.div(&root, bits + 60)));
        prop_assert!(of_square_0.accuracy_estimate() >= f64::from(bits) - 1.0);
        prop_assert!(of_square_1.accuracy_estimate() >= f64::from(bits) - 1.0);
        let scaled = bessel_k::k0_k1_of_square_scaled(&square, bits);
        let power = coneproof::functions::elementary::exp(&root, bits + 60);
        prop_assert!(contains(&scaled.0, &k0.mul(&power, bits + 60)));
        prop_assert!(contains(&scaled.1, &k1.mul(&power, bits + 60).div(&root, bits + 60)));
    }

    // DLMF 10.29.1: K_{n+1} - K_{n-1} = (2n/x) K_n; order two by the trapezoid rule, which does
    // not use it.
    #[test]
    fn recurrence(ln_size in -20.0f64..6.0, bits in 20u32..300) {
        let x = near(ln_size);
        let orders: Vec<Real> =
            (0..3).map(|order| bessel_k::k_by(Method::Trapezoid, order, &x, bits)).collect();
        let right = orders[1].div(&x, bits + 10).shift(1);
        prop_assert!(right.overlaps(&orders[2].sub(&orders[0], bits + 10)));
        prop_assert!(orders.iter().all(|value| value.accuracy_estimate() >= f64::from(bits) - 6.0));
        let third = bessel_k::k(3, &x, bits);
        prop_assert!(third.overlaps(&orders[2].div(&x, bits + 10).shift(2).add(&orders[1], bits + 10)));
    }

    #[test]
    fn balls_contain_their_points(
        order in 0u32..4, ln_size in -30.0f64..7.0, spread in 0.5f64..60.0, at in -16i64..=16, bits in 20u32..200
    ) {
        let middle = near(ln_size);
        let radius = Magnitude::from_float(&Float::with_val(53, middle.to_f64() * (-spread).exp2()));
        let ball = middle.clone().widen(radius);
        let radius = Real::from_float(radius.to_float());
        let point = middle.add(&radius.mul_i64(at, 300).shift(-4), 300);
        prop_assert!(point.is_exact());
        prop_assert!(contains(&bessel_k::k(order, &ball, bits), &bessel_k::k(order, &point, 300)));
        prop_assert!(contains(&bessel_k::k_scaled(order, &ball, bits), &bessel_k::k_scaled(order, &point, 300)));
        // Tightness: hardly wider than the values at the ends require.
        let (left, right) = (middle.sub(&radius, 300), middle.add(&radius, 300));
        for function in [bessel_k::k, bessel_k::k_scaled] {
            let image = function(order, &ball, bits);
            let needed = function(order, &left, 300).sub(&function(order, &right, 300), 300).abs_upper().shift(-1);
            let rounding = image.abs_upper().shift(1 - i64::from(bits));
            let allowed = needed.mul(Magnitude::from_u64(65)).shift(-6).add(rounding);
            prop_assert!(image.radius().log2_estimate() <= allowed.log2_estimate());
        }
    }

    #[test]
    fn complex_methods_agree(
        order in 0u32..3, ln_size in -7.0f64..6.0, angle in -1.5f64..1.5, bits in 10u32..300
    ) {
        let part = |value: f64| Real::from_float(Float::with_val(53, value));
        let z = Complex::new(part(ln_size.exp() * angle.cos()), part(ln_size.exp() * angle.sin()));
        let value = bessel_k::k_complex(order, &z, bits);
        prop_assert!(complex_accuracy(&value) >= f64::from(bits) - 1.0);
        prop_assert!(contains_complex(&value, &bessel_k::k_complex_by(Method::Series, order, &z, bits + 60)));
        prop_assert!(contains_complex(&value, &bessel_k::k_complex_by(Method::Trapezoid, order, &z, bits + 60)));
        let asymptotic = bessel_k::k_complex_by(Method::Asymptotic, order, &z, bits);
        let long = bessel_k::k_complex(order, &z, bits + 60);
        prop_assert!(!asymptotic.re.is_bounded() || contains_complex(&asymptotic, &long));
        // K(conj z) = conj K(z), DLMF 10.34.7.
        let mirrored = bessel_k::k_complex(order, &z.conj(), bits).conj();
        prop_assert!(contains_complex(&mirrored, &long));
    }

    #[test]
    fn imaginary_axis(order in 0u32..3, ln_size in -30.0f64..7.0, bits in 10u32..300, negative: bool) {
        let y = near(ln_size);
        let z = Complex::new(Real::zero(), if negative { y.neg() } else { y });
        let value = bessel_k::k_complex(order, &z, bits);
        prop_assert!(complex_accuracy(&value) >= f64::from(bits) - 1.0);
        prop_assert!(contains_complex(&value, &bessel_k::k_complex_by(Method::Series, order, &z, bits + 60)));
    }

    #[test]
    fn complex_balls_contain_their_points(
        order in 0u32..4, ln_size in -10.0f64..6.0, angle in -1.57f64..1.57, spread in 2.0f64..60.0,
        right in -11i64..=11, up in -11i64..=11
    ) {
        let size = ln_size.exp();
        let part = |value: f64| Real::from_float(Float::with_val(53, value));
        let middle = Complex::new(part(size * angle.cos()), part(size * angle.sin()));
        let radius = Magnitude::from_float(&Float::with_val(53, size * (-spread).exp2()));
        let ball = middle.clone().widen(radius);
        let step = Real::from_float(radius.to_float()).shift(-4);
        let offset = Complex::new(step.mul_i64(right, 300), step.mul_i64(up, 300));
        let value = bessel_k::k_complex(order, &ball, 100);
        let point = bessel_k::k_complex(order, &middle.add(&offset, 300), 300);
        prop_assert!(!value.is_bounded() || contains_complex(&value, &point));
        // Bounded wherever the ball stays off the imaginary axis, and then not much too wide.
        prop_assert!(value.is_bounded() || ball.re.lower(64) < 0);
        if value.is_bounded() {
            prop_assert!(complex_accuracy(&value) >= (spread.min(90.0) - 4.0 - size.log2().max(0.0) - order as f64));
        }
    }
}

#[test]
fn methods_agree_at_high_precision() {
    let bits = 3500;
    for (mantissa, exponent) in [(21, -6), (59, -3), (300, 0), (4847, -2), (4855, -2), (100_003, -4)] {
        let x = dyadic(mantissa, exponent);
        for order in 0..3 {
            let value = bessel_k::k(order, &x, bits);
            assert!(value.accuracy_estimate() >= f64::from(bits));
            assert!(contains(&value, &bessel_k::k_by(Method::Series, order, &x, bits + 100)));
            if order == 1 {
                assert!(contains(&value, &bessel_k::k_by(Method::Trapezoid, order, &x, bits + 100)));
            }
        }
    }
}

#[test]
fn very_small_and_very_large_arguments() {
    for bits in [20, 53, 300] {
        for exponent in [-1000, -500, -130, -30] {
            let x = dyadic(5, exponent);
            for order in 0..3 {
                let value = bessel_k::k(order, &x, bits);
                assert!(value.accuracy_estimate() >= f64::from(bits));
                assert!(contains(&value, &bessel_k::k_by(Method::Trapezoid, order, &x, bits + 60)));
            }
        }
        // The scaled values tend to sqrt(pi/(2x)).
        for exponent in [40, 60, 200, 1000, 100_001] {
            let x = dyadic(5, exponent);
            for order in 0..3 {
                let value = bessel_k::k_scaled(order, &x, bits);
                assert!(value.accuracy_estimate() >= f64::from(bits));
                let limit = coneproof::functions::elementary::pi(400).div(&x, 400).shift(-1);
                let limit = coneproof::functions::elementary::sqrt(&limit, 400);
                let near_limit = limit.clone().widen(limit.abs_upper().shift(1 - i64::from(exponent)));
                assert!(near_limit.overlaps(&value));
            }
        }
    }
    // Far below the smallest MPFR number: not accurate, but still an enclosure of something positive.
    let tiny = bessel_k::k(0, &dyadic(1, 60), 64);
    assert!(tiny.is_bounded() && tiny.contains_rational(&Rational::new()));
    assert!(bessel_k::k(1, &dyadic(1_000_000, 0), 64).accuracy_estimate() >= 64.0);
}

#[test]
fn outside_the_domain_nothing_is_known() {
    let wide = Real::from_i64(1).widen(Magnitude::ONE);
    for x in [Real::zero(), Real::from_i64(-1), wide.clone(), Real::whole_line()] {
        assert!(!bessel_k::k(0, &x, 64).is_bounded());
        assert!(!bessel_k::k(2, &x, 64).is_bounded());
        assert!(!bessel_k::k0_k1(&x, 64).1.is_bounded());
        assert!(!bessel_k::k_complex(1, &Complex::from_real(x), 64).is_bounded());
    }
    assert!(!bessel_k::k0_k1_of_square(&Rational::from(-1), 64).0.is_bounded());
    assert!(!bessel_k::k0_k1_of_square(&Rational::new(), 64).0.is_bounded());
    let left = Complex::new(Real::from_i64(-1), Real::from_i64(1));
    assert!(!bessel_k::k_complex(0, &left, 64).is_bounded());
    let around_zero = Complex::new(wide.sub(&Real::from_i64(1), 64), wide);
    assert!(!bessel_k::k_complex(0, &around_zero, 64).is_bounded());
}

/// Decimals rounded to nearest, as printed by mpmath, contain the value to half a unit.
fn agrees_with_decimal(value: &Real, decimal: &str) -> bool {
    let (digits, exponent) = decimal.split_once('e').unwrap_or((decimal, "0"));
    let places = digits.split_once('.').map_or(0, |(_, fraction)| fraction.len()) as i64;
    let power = exponent.parse::<i64>().unwrap() - places;
    let half_unit = rational(&format!("5e{}", power - 1));
    let table = Real::from_rational(&rational(decimal), 400);
    value.overlaps(&table.widen(Magnitude::from_float(&Float::with_val(64, &half_unit))))
}

// Source: mpmath 1.4.1, besselk at 80 digits, printed to 50.
const KNOWN: [(u32, &str, &str); 9] = [
    (0, "0.1", "2.4270690247020166125185060204280618998260116853843"),
    (1, "0.1", "9.853844780870606134848546596678817151324487697654"),
    (2, "0.1", "199.50396464211413930948943795400440492631576563846"),
    (0, "1", "0.42102443824070833333562737921260903613621974822666"),
    (1, "1", "0.60190723019723457473754000153561733926158688996811"),
    (2, "7.5", "0.0003199235870561915959448016328279707658409963293196"),
    (0, "100", "4.6566282291759020189390052894838863558075394854421e-45"),
    (1, "1000.25", "1.5671583217520004160853654118623852935862916260699e-436"),
    (0, "1e-300", "690.89145941387211765420815643668503641736378738705"),
];

// Source: mpmath 1.4.1, besselk at 80 digits, printed to 40.
const KNOWN_COMPLEX: [(u32, &str, &str, &str, &str); 4] = [
    (0, "0", "1", "-0.1386337152040539996810990857549921961745", "-1.201969715317206499136662446295755611892"),
    (1, "0.5", "3", "-0.353283458835481062492342264814522028728", "0.2815601498116768613228377773225357825016"),
    (2, "40", "-300", "1.980726555981477998200489533339676342817e-19", "-2.3365661606225104980096885901839647655e-19"),
    (1, "0", "-0.001", "-0.0007853980652226819755499712844183986372683", "1000.003761842880214872716526321575439868"),
];

#[test]
fn known_values() {
    for (order, x, decimal) in KNOWN {
        let value = bessel_k::k(order, &real(x), 250);
        assert!(agrees_with_decimal(&value, decimal), "K_{order}({x})");
        assert!(value.accuracy_estimate() > 240.0);
    }
    for (order, re, im, re_decimal, im_decimal) in KNOWN_COMPLEX {
        let value = bessel_k::k_complex(order, &Complex::new(real(re), real(im)), 200);
        assert!(agrees_with_decimal(&value.re, re_decimal), "Re K_{order}({re} + {im} i)");
        assert!(agrees_with_decimal(&value.im, im_decimal), "Im K_{order}({re} + {im} i)");
    }
}

#[test]
fn handbook_table() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/references/bessel_k_handbook.json");
    let table: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let entries = table["values"].as_array().unwrap();
    assert!(!entries.is_empty());
    for entry in entries {
        let text = |name: &str| entry[name].as_str().unwrap();
        let order = entry["order"].as_u64().unwrap() as u32;
        let x = real(text("x"));
        let bits: Bits = 200;
        let value = match text("quantity") {
            "exp(x) K_0(x)" | "exp(x) K_1(x)" | "exp(x) K_2(x)" => bessel_k::k_scaled(order, &x, bits),
            "x^2 K_2(x)" => bessel_k::k(order, &x, bits).mul(&x.square(bits), bits),
            other => panic!("unknown quantity {other}"),
        };
        assert!(agrees_with_decimal(&value, text("value")), "{entry}");
    }
}
