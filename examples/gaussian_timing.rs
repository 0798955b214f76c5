//! Times the two routes for gaussian packets: `cargo run --example gaussian_timing`.

use coneproof::arithmetic::{ExactInput, decimal};
use coneproof::routes::Effort;
use coneproof::routes::gaussian::{GaussianProblem, Region};
use rug::Rational;
use std::time::Instant;

fn read(text: &str) -> Rational {
    text.parse::<ExactInput>().map(|input| input.lower().clone()).unwrap_or_default()
}

fn main() {
    let cases = [
        ("1/2", "0", "1", "2"),
        ("1/2", "0", "1", "6"),
        ("1/10", "0", "1", "2"),
        ("1/2", "0", "5", "12"),
        ("1/2", "1", "2", "3"),
        ("1/10", "5", "20", "10"),
        ("10", "3", "100", "150"),
        ("1/100", "0", "1", "5"),
        ("1/2", "0", "1", "225"),
        ("2", "0", "0", "30"),
    ];
    for digits in [15u32, 60] {
        for (sigma, momentum, time, beyond) in cases {
            let region = Region::Outside(read(beyond));
            let one = Rational::from(1);
            let Ok(problem) = GaussianProblem::new(&read(sigma), &read(momentum), &one, &read(time), &region) else {
                continue;
            };
            for way in problem.evaluations() {
                let start = Instant::now();
                let found = way.evaluate(digits, &Effort::default());
                let milliseconds = start.elapsed().as_secs_f64() * 1e3;
                print!(
                    "s={sigma} k={momentum} t={time} R={beyond} D={digits} {:<12} {milliseconds:8.2} ms  ",
                    way.name()
                );
                match found {
                    Ok(outcome) => println!(
                        "{} digits, {} bits, {} nodes: [{}, {}]",
                        outcome.interval.relative_digits(digits),
                        outcome.bits,
                        outcome.nodes,
                        decimal::lower_decimal(outcome.interval.lower(), 18),
                        decimal::upper_decimal(outcome.interval.upper(), 18)
                    ),
                    Err(failure) => println!("{failure}"),
                }
            }
        }
    }
}
