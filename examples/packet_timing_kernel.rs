//! Prints one packet's tail by the kernel route and the time it took: `packet_timing KIND A T DIGITS [D]`.
//!
//! Kinds: `box`, `spline2`, `spline4`, `ball`, `moving3` (a box with momentum 3), `cosine1`, `cosine2`, ...
use coneproof::arithmetic::{ExactInput, decimal};
use coneproof::packets::PiecewisePacket;
use coneproof::routes::panels::{PiecewiseKernel, Sides};
use coneproof::routes::{Effort, Evaluation};
use rug::Rational;
use std::time::Instant;

fn packet(kind: &str, a: &Rational) -> Result<PiecewisePacket, Box<dyn std::error::Error>> {
    let number = |prefix: &str| kind.strip_prefix(prefix).and_then(|rest| rest.parse::<u32>().ok());
    Ok(if let Some(order) = number("spline") {
        PiecewisePacket::bspline(a, order)?
    } else if let Some(momentum) = number("moving") {
        PiecewisePacket::uniform(a)?.with_momentum(&Rational::from(momentum))?
    } else if let Some(mode) = number("cosine") {
        PiecewisePacket::cosine(a, mode)?
    } else if kind == "ball" {
        PiecewisePacket::uniform_ball(a)?
    } else {
        PiecewisePacket::uniform(a)?
    })
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let args: Vec<String> = std::env::args().collect();
    let number = |i: usize| args.get(i).map_or("0", String::as_str).parse::<ExactInput>().map(|v| v.lower().clone());
    let packet = packet(args.get(1).map_or("box", String::as_str), &number(2)?)?;
    let digits: u32 = args.get(4).map_or("15", String::as_str).parse()?;
    let kernel = PiecewiseKernel::new(&packet, &Rational::from(1), &number(3)?, &number(5)?, Sides::Both)?;
    let mut best = f64::INFINITY;
    let begin = Instant::now();
    let outcome = loop {
        let start = Instant::now();
        let outcome = kernel.evaluate(digits, &Effort::default());
        best = best.min(start.elapsed().as_secs_f64());
        if begin.elapsed().as_secs_f64() > 0.5 {
            break outcome;
        }
    };
    match outcome {
        Ok(o) => {
            println!("{}", decimal::lower_decimal(o.interval.lower(), digits + 5));
            println!("{}", decimal::upper_decimal(o.interval.upper(), digits + 5));
            let reached = o.interval.relative_digits(digits + 50);
            println!("digits {reached} bits {} nodes {} best ms {:.4}", o.bits, o.nodes, best * 1e3);
            if std::env::var("WITNESS").is_ok() {
                o.witness.iter().for_each(|(name, value)| println!("  {name}: {value}"));
            }
        }
        Err(failure) => println!("{failure}"),
    }
    Ok(())
}
