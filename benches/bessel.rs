//! Pairs `K_0(r), K_1(r)/r` as the kernel route asks for them, beside one exponential of MPFR at the
//! same precision: the ratio says more than the time, which depends on the machine.
//!
//! `cargo bench --bench bessel` prints the times and, last, the table of ratios of this run.

use coneproof::functions::bessel_k;
use criterion::{BenchmarkId, Criterion};
use rug::{Float, Rational};
use std::hint::black_box;
use std::time::{Duration, Instant};

/// Bits wanted for 15, 30, 100 and 1000 digits.
const PRECISIONS: [u32; 4] = [100, 160, 450, 3500];

/// Squares `r^2 = s (s + 2t)` for twelve `s` up to 13: for `t = 1` short binary fractions, for
/// `t = 1/3` with a denominator.
fn squares(time: &Rational) -> Vec<Rational> {
    let twice = Rational::from(time * 2);
    (0..12).map(|n| Rational::from((13u32 << n, 2048))).map(|s| Rational::from(&s + &twice) * s).collect()
}

fn pairs(squares: &[Rational], bits: u32) {
    for square in squares {
        black_box(bessel_k::k0_k1_of_square(black_box(square), bits));
    }
}

fn exponential(argument: &Float, bits: u32) -> Float {
    Float::with_val(bits, black_box(argument).exp_ref())
}

fn argument(bits: u32) -> Float {
    Float::with_val(bits, Rational::from((10, 7)))
}

fn benchmarks(criterion: &mut Criterion) {
    let (short, long) = (squares(&Rational::from(1)), squares(&Rational::from((1, 3))));
    let mut group = criterion.benchmark_group("bessel");
    for bits in PRECISIONS {
        let x = argument(bits);
        group.bench_function(BenchmarkId::new("exp of MPFR", bits), |b| b.iter(|| exponential(&x, bits)));
        group.bench_function(BenchmarkId::new("12 pairs, t = 1", bits), |b| b.iter(|| pairs(&short, bits)));
        group.bench_function(BenchmarkId::new("12 pairs, t = 1/3", bits), |b| b.iter(|| pairs(&long, bits)));
    }
    group.finish();
}

/// The shortest time of one call in microseconds, over many.
fn shortest(mut call: impl FnMut()) -> f64 {
    let mut best = f64::INFINITY;
    let begin = Instant::now();
    while begin.elapsed() < Duration::from_millis(300) {
        let start = Instant::now();
        call();
        best = best.min(start.elapsed().as_secs_f64());
    }
    best * 1e6
}

fn print_ratios() {
    println!(
        "{:>6} {:>12} {:>16} {:>16} {:>16} {:>16}",
        "bits", "exp, us", "pair t=1, us", "pair/exp", "pair t=1/3, us", "pair/exp"
    );
    for bits in PRECISIONS {
        let x = argument(bits);
        let exp = shortest(|| drop(black_box(exponential(&x, bits))));
        let times = [Rational::from(1), Rational::from((1, 3))].map(|time| {
            let list = squares(&time);
            shortest(|| pairs(&list, bits)) / list.len() as f64
        });
        println!(
            "{bits:>6} {exp:>12.2} {:>16.2} {:>16.1} {:>16.2} {:>16.1}",
            times[0],
            times[0] / exp,
            times[1],
            times[1] / exp
        );
    }
}

fn main() {
    let mut criterion = Criterion::default()
        .warm_up_time(Duration::from_millis(200))
        .measurement_time(Duration::from_millis(800))
        .configure_from_args();
    benchmarks(&mut criterion);
    criterion.final_summary();
    print_ratios();
}
