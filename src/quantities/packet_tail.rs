//! Tails of any packet, with exact inputs.
//!
//! A packet that implements [`TailPacket`] says where its light cone begins and which routes know it; everything else, from
//! the meeting of the routes to the certificate, is the same for all. The box at rest has requests of its own
//! ([`super::tail`]), which take intervals as inputs too.

use super::question::{Inputs, Question};
use super::tail::{
    DEFAULT_MAX_BITS, MAX_DIGITS, RouteReport, Side, TailResult, check_size, meet_probability, readable, region,
};
use crate::arithmetic::{Bits, ExactInput, Interval};
use crate::error::Error;
use crate::routes::{Effort, Evaluation};
use rug::{Float, Rational};
use std::fmt;
use std::time::{Duration, Instant};

/// A tail problem with exact numbers.
#[derive(Clone, Debug)]
pub struct ExactTail {
    /// Mass, not negative.
    pub mass: Rational,
    /// Time, of either sign.
    pub time: Rational,
    /// The distance `R` from the packet's centre beyond which the particle is found.
    pub beyond: Rational,
    /// `R - a - |t|` for a packet with an edge `a`, not negative; zero for others.
    pub distance: Rational,
    /// Which side counts; always both for radial packets.
    pub side: Side,
}

/// A packet whose tails can be asked for.
pub trait TailPacket: Send + Sync + fmt::Debug {
    /// The kind's name on the command line and in certificates.
    fn kind(&self) -> &'static str;

    /// The packet's own parameters, as read: name and text.
    fn parameters(&self) -> Vec<(&'static str, String)>;

    /// The distance of the packet's edge from its centre; `None` if it has none.
    fn edge(&self) -> Option<Rational>;

    /// Whether the region is a distance `r > R` from the centre in more than one dimension.
    fn is_radial(&self) -> bool {
        false
    }

    /// What a reader should know of the packet, such as the norm that was found.
    fn remarks(&self) -> Vec<String> {
        Vec::new()
    }

    /// The routes that know this problem.
    ///
    /// # Errors
    /// [`Error::BadInput`] if the problem makes no sense for this packet.
    fn routes(&self, problem: &ExactTail) -> Result<Vec<Box<dyn Evaluation>>, Error>;
}

/// A question for the tail of a packet.
#[derive(Debug)]
pub struct PacketTail {
    /// The packet.
    pub packet: Box<dyn TailPacket>,
    /// Mass, a single number that is not negative.
    pub mass: ExactInput,
    /// Time, a single number of either sign.
    pub time: ExactInput,
    /// `R`; `None` stands for the light cone.
    pub beyond: Option<ExactInput>,
    /// Which side counts.
    pub side: Side,
    /// Relative digits asked.
    pub digits: u32,
    /// Name of the only route to run, or `both`.
    pub route: String,
    /// Largest working precision in bits; `None` stands for [`DEFAULT_MAX_BITS`].
    pub max_bits: Option<Bits>,
    /// Longest time to spend.
    pub time_limit: Option<Duration>,
}

impl PacketTail {
    /// A request for both sides beyond the cone at 15 digits by all routes.
    pub fn new(packet: Box<dyn TailPacket>, mass: ExactInput, time: ExactInput) -> PacketTail {
        PacketTail {
            packet,
            mass,
            time,
            beyond: None,
            side: Side::Both,
            digits: 15,
            route: "both".to_owned(),
            max_bits: None,
            time_limit: None,
        }
    }

    /// Checks all fields together.
    ///
    /// # Errors
    /// [`Error::BadInput`] or [`Error::Missing`] naming the first field that cannot be used.
    pub fn validate(&self) -> Result<ExactTail, Error> {
        let (mass, time) = (point("mass", &self.mass)?, point("time", &self.time)?);
        if mass < 0 {
            return Err(Error::bad_input("mass", self.mass.text(), "give a mass that is not negative, such as 0 or 1"));
        }
        if self.digits == 0 || self.digits > MAX_DIGITS {
            let wanted = format!("give a whole number from 1 to {MAX_DIGITS}");
            return Err(Error::bad_input("digits", self.digits, &wanted));
        }
        if self.packet.is_radial() && self.side != Side::Both {
            let wanted = "a ball or disc has no sides: the region is r > R; leave the option out";
            return Err(Error::bad_input("side", self.side.name(), wanted));
        }
        let cone = self.packet.edge().map(|edge| edge + Rational::from(time.abs_ref()));
        let beyond = match (&self.beyond, &cone) {
            (Some(region), _) => point("beyond", region)?,
            (None, Some(cone)) => cone.clone(),
            (None, None) => {
                let wanted =
                    "a packet without an edge has no light cone of its own; give a distance, such as --beyond 12";
                return Err(Error::Missing { field: "beyond".to_owned(), wanted: wanted.to_owned() });
            }
        };
        let distance = cone.as_ref().map_or_else(Rational::new, |cone| Rational::from(&beyond - cone));
        if distance < 0 {
            let edge = readable(&cone.unwrap_or_default());
            let wanted = format!("the light cone ends at the packet's edge + |time| = {edge}; give that or more");
            return Err(Error::bad_input("beyond", readable(&beyond), &wanted));
        }
        if beyond <= 0 {
            return Err(Error::bad_input("beyond", readable(&beyond), "give a distance above 0"));
        }
        Ok(ExactTail { mass, time, beyond, distance, side: self.side })
    }

    /// The routes chosen.
    fn chosen(&self, problem: &ExactTail) -> Result<Vec<Box<dyn Evaluation>>, Error> {
        let mut routes = self.packet.routes(problem)?;
        if self.route != "both" {
            let known: Vec<&str> = routes.iter().map(|route| route.name()).collect();
            let wanted = format!("for this packet and mass there is: {}, both", known.join(", "));
            routes.retain(|route| route.name() == self.route);
            if routes.is_empty() {
                return Err(Error::bad_input("route", &self.route, &wanted));
            }
        }
        Ok(routes)
    }

    fn notes(&self, routes: &[RouteReport], at_rest: bool) -> Vec<String> {
        let mut notes = self.packet.remarks();
        if at_rest {
            notes.push("at time zero the packet has not left its support: the probability is exactly zero".to_owned());
        } else if routes.iter().all(|route| route.interval.is_none()) {
            notes.push("no route has bounds: all that is known is that a probability lies between 0 and 1".to_owned());
        } else if self.route == "both" && routes.iter().filter(|route| route.interval.is_some()).count() == 1 {
            notes.push("only one route answered; nothing independent confirms the interval".to_owned());
        }
        notes
    }
}

/// A single exact number of bearable size.
fn point(field: &str, input: &ExactInput) -> Result<Rational, Error> {
    check_size(field, input)?;
    if !input.is_point() {
        let wanted = "give a single number: intervals are possible for the box at rest only";
        return Err(Error::bad_input(field, input.text(), wanted));
    }
    Ok(input.lower().clone())
}

impl Question for PacketTail {
    fn inputs(&self) -> Inputs {
        let mut inputs = Inputs::of_packet(self.packet.kind());
        for (name, text) in self.packet.parameters() {
            inputs.set(name, text);
        }
        inputs
            .with("mass", self.mass.text())
            .with("time", self.time.text())
            .with("beyond", self.beyond.as_ref().map_or("cone", |region| region.text()))
            .with("side", self.side.name())
            .with("digits", self.digits.to_string())
            .with("route", &*self.route)
            .with_optional("max_bits", self.max_bits.map(|bits| bits.to_string()))
            .with_optional("time_limit", self.time_limit.map(|limit| limit.as_secs_f64().to_string()))
    }

    fn formula(&self) -> String {
        let edge = if self.beyond.is_some() { "beyond" } else { "edge + |time|" };
        if self.packet.is_radial() {
            return format!("P(r > {edge})");
        }
        format!("P({})", region(self.side, self.beyond.is_none(), edge))
    }

    fn words(&self) -> String {
        let place = match (&self.beyond, self.packet.edge()) {
            (None, _) => "outside its light cone",
            (Some(_), Some(_)) => "beyond a given distance outside its light cone",
            (Some(_), None) => "beyond a given distance",
        };
        format!("Probability of finding the particle {place}: {}", self.formula())
    }

    fn digits(&self) -> u32 {
        self.digits
    }

    fn certify(&self) -> Result<TailResult, Error> {
        let start = Instant::now();
        let problem = self.validate()?;
        let routes = self.chosen(&problem)?;
        if problem.time == 0 && self.packet.edge().is_some() {
            let zero = Interval::new(Float::new(64), Float::new(64));
            return Ok(TailResult::new(zero, self.digits, Vec::new(), self.notes(&[], true), start));
        }
        let deadline = self.time_limit.and_then(|limit| start.checked_add(limit));
        let effort = Effort { max_bits: Some(self.max_bits.unwrap_or(DEFAULT_MAX_BITS)), deadline };
        let (interval, reports) = meet_probability(&routes, self.digits, &effort)?;
        let notes = self.notes(&reports, false);
        Ok(TailResult::new(interval, self.digits, reports, notes, start))
    }
}
