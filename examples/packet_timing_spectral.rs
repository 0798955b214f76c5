//! Prints packet tails by the spectral route and the time each took: `packet_timing MASS A T D DIGITS...`.
use coneproof::arithmetic::{ExactInput, decimal};
use coneproof::packets::{BSplinePacket, WavePacket};
use coneproof::routes::cut::{CutAmplitude, CutSide, CutTail};
use coneproof::routes::{Effort, Evaluation};
use rug::Rational;
use std::time::Instant;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let args: Vec<String> = std::env::args().collect();
    let number = |i: usize| args.get(i).map_or("1", String::as_str).parse::<ExactInput>().map(|v| v.lower().clone());
    let (mass, a, time, distance) = (number(1)?, number(2)?, number(3)?, number(4)?);
    let zero = Rational::new();
    let q = |n: i64, d: i64| Rational::from((n, d));
    let packets: Vec<(&str, Box<dyn CutAmplitude>)> = vec![
        ("box", Box::new(BSplinePacket::new(&a, 1)?)),
        ("box as wave", Box::new(WavePacket::moving_box(&a, &zero)?)),
        ("moving box k=5", Box::new(WavePacket::moving_box(&a, &q(5, 1))?)),
        ("cosine 1", Box::new(WavePacket::cosine(&a, 1, &zero)?)),
        ("cosine 3 k=2", Box::new(WavePacket::cosine(&a, 3, &q(2, 1))?)),
        ("bspline 2", Box::new(BSplinePacket::new(&a, 2)?)),
        ("bspline 4", Box::new(BSplinePacket::new(&a, 4)?)),
        ("bspline 4 by pieces", Box::new(WavePacket::bspline(&a, 4, &zero)?)),
        ("bspline 4 k=2", Box::new(WavePacket::bspline(&a, 4, &q(2, 1))?)),
        ("bspline 12 by pieces", Box::new(WavePacket::bspline(&a, 12, &zero)?)),
        ("ball", Box::new(WavePacket::ball(&a)?)),
        ("spherical well 1", Box::new(WavePacket::spherical_well(&a, 1)?)),
    ];
    for (name, packet) in packets {
        for digits in args.iter().skip(5) {
            let digits: u32 = digits.parse()?;
            let tail = CutTail::new(packet.as_ref(), &mass, &time, &distance, CutSide::Both)?;
            let mut best = f64::INFINITY;
            let begin = Instant::now();
            let mut found = tail.evaluate(digits, &Effort::default());
            best = best.min(begin.elapsed().as_secs_f64());
            while begin.elapsed().as_secs_f64() < 0.3 {
                let start = Instant::now();
                found = tail.evaluate(digits, &Effort::default());
                best = best.min(start.elapsed().as_secs_f64());
            }
            match found {
                Ok(o) => println!(
                    "{name:<22} {} reached {} bits {} nodes {} best ms {:.3}",
                    decimal::lower_decimal(o.interval.lower(), digits.min(40)),
                    o.interval.relative_digits(digits),
                    o.bits,
                    o.nodes,
                    best * 1e3
                ),
                Err(e) => println!("{name:<22} {e}"),
            }
        }
    }
    Ok(())
}
