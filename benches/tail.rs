//! Time of one box tail by each route, and the growth with the digits asked.
//!
//! Absolute times say little between machines: compare the routes, the digits and `one exponential` of one run.
//! `benches/ratio_table.py` sets them beside other programs.

use coneproof::arithmetic::{ExactInput, Real};
use coneproof::functions::elementary::exp;
use coneproof::routes::{Effort, Route, TailProblem, kernel::KERNEL, spectral::SPECTRAL};
use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use std::hint::black_box;

const CASES: [(&str, &str); 5] = [("1", "1"), ("1/10", "100"), ("20", "20"), ("1/1000000", "1"), ("2", "1000")];

fn problem(half_width: &str, time: &str) -> TailProblem {
    let number = |text: &str| text.parse::<ExactInput>().unwrap().lower().clone();
    TailProblem { half_width: number(half_width), time: number(time), distance: number("0"), massless: false }
}

fn routes(criterion: &mut Criterion) {
    for (name, route) in [("kernel", &KERNEL as &dyn Route), ("spectral", &SPECTRAL)] {
        let mut group = criterion.benchmark_group(name);
        for (half_width, time) in CASES {
            for digits in [15u32, 30, 100] {
                let id = BenchmarkId::new(format!("a={half_width} t={time}"), digits);
                let problem = problem(half_width, time);
                group
                    .bench_function(id, |b| b.iter(|| route.evaluate(black_box(&problem), digits, &Effort::default())));
            }
        }
        group.finish();
    }
    let mut group = criterion.benchmark_group("thousand digits");
    group.sample_size(10);
    group.bench_function("kernel", |b| {
        b.iter(|| KERNEL.evaluate(black_box(&problem("1", "1")), 1000, &Effort::default()))
    });
    group.finish();
}

/// The peer: one exponential of the arithmetic library at the precision of 15, 30 and 100 digits.
fn peer(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("one exponential");
    for (digits, bits) in [(15u32, 100u32), (30, 155), (100, 395)] {
        let x = Real::from_i64(1).div_u64(3, bits);
        group.bench_function(BenchmarkId::from_parameter(digits), |b| b.iter(|| exp(black_box(&x), bits)));
    }
    group.finish();
}

criterion_group! {
    name = benches;
    config = Criterion::default().sample_size(20).measurement_time(std::time::Duration::from_secs(2));
    targets = routes, peer
}
criterion_main!(benches);
