//! Prints one tail by one route and the time it took: `tail_timing kernel|spectral A T DIGITS [D] [massless]`.
use coneproof::arithmetic::{ExactInput, decimal};
use coneproof::routes::{Effort, Route, TailProblem, kernel::KERNEL, spectral::SPECTRAL};
use std::time::Instant;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let args: Vec<String> = std::env::args().collect();
    let number = |i: usize| args.get(i).map_or("0", String::as_str).parse::<ExactInput>().map(|v| v.lower().clone());
    let massless = args.get(6).is_some();
    let problem = TailProblem { half_width: number(2)?, time: number(3)?, distance: number(5)?, massless };
    let digits: u32 = args[4].parse()?;
    let route: &dyn Route = if args[1] == "kernel" { &KERNEL } else { &SPECTRAL };
    let mut best = f64::INFINITY;
    let mut outcome = None;
    let begin = Instant::now();
    while begin.elapsed().as_secs_f64() < 1.0 {
        let start = Instant::now();
        outcome = Some(route.evaluate(&problem, digits, &Effort::default()));
        best = best.min(start.elapsed().as_secs_f64());
    }
    match outcome {
        Some(Ok(o)) => {
            println!("{}", decimal::lower_decimal(o.interval.lower(), digits + 5));
            println!("{}", decimal::upper_decimal(o.interval.upper(), digits + 5));
            println!(
                "digits {} bits {} nodes {} best ms {:.4}",
                o.interval.relative_digits(digits + 50),
                o.bits,
                o.nodes,
                best * 1e3
            );
            if std::env::var("WITNESS").is_ok() {
                for (n, v) in o.witness {
                    println!("  {n}: {v}");
                }
            }
        }
        Some(Err(e)) => println!("{e}"),
        None => {}
    }
    Ok(())
}
