//! The box as a moving observer finds it.
//!
//! The region is `|x| > R` at the observer's time `t'`: beyond the cones of the two edge events (`cone`, at `t' = 0` this
//! is `a e^|theta|`), outside the contracted interval (`contracted`, `a / cosh(theta)`), or beyond any `R`.

use super::question::{Inputs, Question};
use super::tail::{DEFAULT_MAX_BITS, MAX_DIGITS, TailResult, check_size, meet_probability};
use crate::arithmetic::{Bits, ExactInput};
use crate::error::Error;
use crate::packets::{Boost, BoostedBox, BoxPacket};
use crate::routes::boost::{BoostProblem, Complement, Contour, Cut, Region};
use crate::routes::{Effort, Evaluation};
use std::time::{Duration, Instant};

/// The region that counts.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum BoostedRegion {
    /// Beyond the light cones of the edge events.
    Cone,
    /// Outside the Lorentz-contracted interval, at the observer's time zero.
    Contracted,
    /// `|x| > R`.
    Beyond(ExactInput),
}

impl BoostedRegion {
    /// The name or number as read.
    pub fn text(&self) -> &str {
        match self {
            BoostedRegion::Cone => "cone",
            BoostedRegion::Contracted => "contracted",
            BoostedRegion::Beyond(distance) => distance.text(),
        }
    }
}

/// A question for the tail that a moving observer finds.
#[derive(Clone, Debug)]
pub struct BoostedTail {
    /// Half-width in the rest frame, a single number above zero.
    pub half_width: ExactInput,
    /// Mass, a single number above zero.
    pub mass: ExactInput,
    /// The observer.
    pub boost: Boost,
    /// `rapidity` or `boost_velocity`, and its text.
    pub boost_read: (&'static str, String),
    /// The observer's time, a single number.
    pub time: ExactInput,
    /// The region.
    pub region: BoostedRegion,
    /// Relative digits asked.
    pub digits: u32,
    /// Name of the only route to run, or `both`.
    pub route: String,
    /// Largest working precision in bits.
    pub max_bits: Option<Bits>,
    /// Longest time to spend.
    pub time_limit: Option<Duration>,
}

impl BoostedTail {
    /// Checks all fields and gives the exact problem.
    ///
    /// # Errors
    /// [`Error::BadInput`] naming the first field that cannot be used.
    pub fn validate(&self) -> Result<BoostProblem, Error> {
        for (field, input) in [("half-width", &self.half_width), ("mass", &self.mass), ("time", &self.time)] {
            check_size(field, input)?;
            if !input.is_point() {
                return Err(Error::bad_input(field, input.text(), "give a single number for a moving observer"));
            }
        }
        if self.digits == 0 || self.digits > MAX_DIGITS {
            let wanted = format!("give a whole number from 1 to {MAX_DIGITS}");
            return Err(Error::bad_input("digits", self.digits, &wanted));
        }
        let packet = BoostedBox::new(&self.half_width, &self.mass, self.boost.clone())?;
        let region = match &self.region {
            BoostedRegion::Cone => Region::Cone,
            BoostedRegion::Contracted => Region::Contracted,
            BoostedRegion::Beyond(distance) => {
                check_size("beyond", distance)?;
                if !distance.is_point() || *distance.lower() <= 0 {
                    let wanted = "give a single distance above 0, or one of the words cone and contracted";
                    return Err(Error::bad_input("beyond", distance.text(), wanted));
                }
                Region::Beyond(distance.lower().clone())
            }
        };
        BoostProblem::new(&packet, self.time.lower(), region)
    }

    fn routes(&self, problem: &BoostProblem) -> Result<Vec<Box<dyn Evaluation>>, Error> {
        let mut routes: Vec<Box<dyn Evaluation>> = vec![
            Box::new(Cut::new(problem.clone())),
            Box::new(Contour::new(problem.clone())),
            Box::new(Complement::new(problem.clone())),
        ];
        match self.route.as_str() {
            // The complement repeats the contour's method and costs as much: it serves where the cut cannot.
            "both" if self.region == BoostedRegion::Cone => routes.truncate(2),
            "both" => {}
            name => {
                routes.retain(|route| route.name() == name);
                if routes.is_empty() {
                    let wanted = "for a moving observer there is: cut, contour, complement, both";
                    return Err(Error::bad_input("route", name, wanted));
                }
            }
        }
        Ok(routes)
    }
}

impl Question for BoostedTail {
    fn inputs(&self) -> Inputs {
        Inputs::of_packet(BoxPacket::NAME)
            .with("half_width", self.half_width.text())
            .with("mass", self.mass.text())
            .with(self.boost_read.0, &*self.boost_read.1)
            .with("time", self.time.text())
            .with("beyond", self.region.text())
            .with("side", "both")
            .with("digits", self.digits.to_string())
            .with("route", &*self.route)
            .with_optional("max_bits", self.max_bits.map(|bits| bits.to_string()))
            .with_optional("time_limit", self.time_limit.map(|limit| limit.as_secs_f64().to_string()))
    }

    fn formula(&self) -> String {
        match self.region {
            BoostedRegion::Cone => "P(beyond the cones of both edge events)".to_owned(),
            BoostedRegion::Contracted => "P(|x| > half_width / cosh(rapidity))".to_owned(),
            BoostedRegion::Beyond(_) => "P(|x| > beyond)".to_owned(),
        }
    }

    fn words(&self) -> String {
        format!("Probability that a moving observer finds the particle outside a region: {}", self.formula())
    }

    fn digits(&self) -> u32 {
        self.digits
    }

    fn certify(&self) -> Result<TailResult, Error> {
        let start = Instant::now();
        let problem = self.validate()?;
        let routes = self.routes(&problem)?;
        let deadline = self.time_limit.and_then(|limit| start.checked_add(limit));
        let effort = Effort { max_bits: Some(self.max_bits.unwrap_or(DEFAULT_MAX_BITS)), deadline };
        let (interval, reports) = meet_probability(&routes, self.digits, &effort)?;
        let answered: Vec<&str> = reports.iter().filter(|r| r.interval.is_some()).map(|r| r.name).collect();
        let mut notes = Vec::new();
        if answered.is_empty() {
            notes.push("no route has bounds: all that is known is that a probability lies between 0 and 1".to_owned());
        } else if !answered.contains(&"cut") && self.route == "both" {
            notes.push(
                "inside the cones both routes rest on contours of one kind, for complementary regions".to_owned(),
            );
        } else if answered.len() == 1 && self.route == "both" {
            notes.push("only one route answered; nothing independent confirms the interval".to_owned());
        }
        Ok(TailResult::new(interval, self.digits, reports, notes, start))
    }
}

/// The observer, with the name and text of the input that was read.
pub type Observer = (Boost, (&'static str, String));

/// The observer from texts: exactly one of rapidity and velocity.
///
/// # Errors
/// [`Error::BadInput`] if both are given or one cannot be used.
pub fn observer(rapidity: Option<&ExactInput>, velocity: Option<&ExactInput>) -> Result<Option<Observer>, Error> {
    match (rapidity, velocity) {
        (None, None) => Ok(None),
        (Some(theta), None) => Ok(Some((Boost::from_rapidity(theta)?, ("rapidity", theta.text().to_owned())))),
        (None, Some(v)) => Ok(Some((Boost::from_velocity(v)?, ("boost_velocity", v.text().to_owned())))),
        (Some(_), Some(v)) => {
            let wanted = "give either a rapidity or a velocity, not both";
            Err(Error::bad_input("boost-velocity", v.text(), wanted))
        }
    }
}
