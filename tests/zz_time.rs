#![allow(clippy::unwrap_used)]
use coneproof::packets::{Boost, BoostedBox};
use coneproof::routes::boost::*;
use coneproof::routes::{Effort, Evaluation};
#[test]
fn t() {
    let n = |s: &str| s.parse::<coneproof::arithmetic::ExactInput>().unwrap();
    let which = std::env::var("W").unwrap();
    let digits: u32 = std::env::var("D").unwrap().parse().unwrap();
    let p = BoostedBox::new(&n("1"), &n("1"), Boost::from_rapidity(&n("1/2")).unwrap()).unwrap();
    let region = if which.ends_with('i') { Region::Beyond(1.into()) } else { Region::Cone };
    let q = BoostProblem::new(&p, &0.into(), region).unwrap();
    let r: Box<dyn Evaluation> = match &which[..2] { "cu" => Box::new(Cut::new(q)), "co" => Box::new(Contour::new(q)), _ => Box::new(Complement::new(q)) };
    let o = r.evaluate(digits, &Effort::default()).unwrap();
    println!("{which} {digits}: bits {} nodes {} reached {} {:?}", o.bits, o.nodes, o.interval.relative_digits(200), o.witness);
}
