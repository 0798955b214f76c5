//! The library in a few lines: a certified tail, its verdict on a printed number, and a certificate on the disk.
//!
//! `cargo run --release --example certified_tail`

use coneproof::certificate::Certificate;
use coneproof::claims::statement::Statement;
use coneproof::packets::BoxPacket;
use coneproof::quantities::tail::TailRequest;
use coneproof::report::DecimalBounds;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    // A box of half-width 7/10, unit mass, at time 0.6984 exactly.
    let packet = BoxPacket::new("7/10".parse()?)?;
    let request = TailRequest::new(packet, "1".parse()?, "0.6984".parse()?)?;
    let result = request.certify()?;
    let bounds = DecimalBounds::new(&result.interval, 15);
    println!("P(|x| > a + |t|) lies in [{}, {}]", bounds.lower, bounds.upper);
    let statement = Statement::parse("says", "3.03%")?;
    for reading in &statement.readings {
        println!("\"{}\", {}: {:?}", statement.text, reading.meaning, reading.standing(&result.interval));
    }
    let path = std::env::temp_dir().join("certified_tail.json");
    Certificate::new(&request, &result)?.write(&path)?;
    println!("certificate: {}", path.display());
    Ok(())
}
