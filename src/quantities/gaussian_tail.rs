//! Tails of the gaussian packet: a packet without an edge, whose region is a distance from its centre.

use super::packet_tail::{ExactTail, TailPacket};
use super::tail::Side;
use crate::arithmetic::ExactInput;
use crate::error::Error;
use crate::packets::GaussianPacket;
use crate::routes::Evaluation;
use crate::routes::gaussian::{GaussianProblem, Region};
use rug::Rational;

impl TailPacket for GaussianPacket {
    fn kind(&self) -> &'static str {
        GaussianPacket::NAME
    }

    fn parameters(&self) -> Vec<(&'static str, String)> {
        vec![("sigma", self.sigma().text().to_owned()), ("momentum", self.momentum().text().to_owned())]
    }

    fn edge(&self) -> Option<Rational> {
        None
    }

    fn routes(&self, problem: &ExactTail) -> Result<Vec<Box<dyn Evaluation>>, Error> {
        let region = match problem.side {
            Side::Both => Region::Outside(problem.beyond.clone()),
            Side::Right => Region::RightOf(problem.beyond.clone()),
            Side::Left => Region::LeftOf(Rational::from(-&problem.beyond)),
        };
        let (sigma, momentum) = (point("sigma", self.sigma())?, point("momentum", self.momentum())?);
        Ok(GaussianProblem::new(sigma, momentum, &problem.mass, &problem.time, &region)?.evaluations())
    }
}

/// A single exact number.
fn point<'a>(field: &str, input: &'a ExactInput) -> Result<&'a Rational, Error> {
    if !input.is_point() {
        return Err(Error::bad_input(field, input.text(), "give a single number, such as 1/2"));
    }
    Ok(input.lower())
}
