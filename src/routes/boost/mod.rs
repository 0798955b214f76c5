//! The boosted box: probabilities for a moving observer, outside and inside the cones of its edge events.
//!
//! # The amplitude (unit mass)
//!
//! With `p = sinh(eta)`, `omega = cosh(eta)` the definition (see [`crate::packets::boosted_box`]) reads
//!
//! ```text
//! psi'(x,t) = N Int deta sqrt(cosh(eta) cosh(eta+theta)) exp(i x sinh(eta) - i t cosh(eta))
//!                 2 sin(a sinh(eta+theta))/sinh(eta+theta),           N = 1/(2 pi sqrt(2a)),
//! ```
//!
//! from `phi(k) = sin(k a)/(k sqrt(pi a))`, `Lp = sinh(eta+theta)` and `dp = cosh(eta) deta`. Writing the sine
//! as exponentials, each edge of the box is one event of the moving frame:
//!
//! ```text
//! x sinh(eta) - t cosh(eta) ± a sinh(eta+theta) = (X± e^eta - X'± e^-eta)/2,
//! X± = x - t ± a e^theta,      X'± = x + t ± a e^-theta.
//! ```
//!
//! The event of an edge is where its `X` and `X'` vanish together; the lines `X = 0` and `X' = 0` are its light
//! cone.
//!
//! # Symmetries
//!
//! * Reflection: `psi'(-x, t; theta) = psi'(x, t; -theta)` (substitute `eta -> -eta`).
//! * Reversal: `psi'(x, -t; -theta)` is the complex conjugate of `psi'(x, t; theta)` (conjugate the integral and
//!   substitute `eta -> -eta`).
//!
//! So the left side is the right side for `-theta`, and with the reversal each side can be written with a *lead*
//! `l = a sinh(theta) + t >= 0` (module `side`). Then the outermost cone of the right side is `X- = 0`, that is
//! `x = a e^theta + t`, and beyond it by `d`: `X- = d`, `X'- = d + 2 l`. At `t = 0` both sides have the same
//! probability and the cone is `|x| = a e^|theta|`.
//!
//! # Routes
//!
//! * [`Cut`]: momentum space, turned onto the branch cut; outside the cones, any time.
//! * [`Contour`]: the amplitude as a lattice sum on lines off the cut, one for each edge event; outside at any
//!   time, inside at `t = 0`.
//!   The work inside grows with `m a sinh|theta|`: beyond about 30 it takes minutes or is declined.
//! * [`Complement`]: one minus the probability of the interval between, by the contours of the inside; `t = 0`.

mod contour;
mod cut;
mod side;

pub use contour::{Complement, Contour};
pub use cut::Cut;

use crate::packets::{Boost, BoostedBox};
use crate::routes::RouteFailure;
use rug::Rational;

/// Which positions count, always on both sides of the origin.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Region {
    /// Beyond the light cones of the edge events: `|x| > a e^|theta|` at `t = 0`.
    Cone,
    /// Farther than this distance beyond these cones, on either side.
    BeyondCone(Rational),
    /// `|x| > R`.
    Beyond(Rational),
    /// `|x| > a / cosh(theta)`, outside of the contracted interval.
    Contracted,
}

/// A question about the boosted box, in units of `1/m`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BoostProblem {
    half_width: Rational,
    boost: Boost,
    time: Rational,
    region: Region,
}

impl BoostProblem {
    /// The packet at the observer's time `t'` and a region, in the units of the packet.
    ///
    /// # Errors
    /// [`crate::error::Error::BadInput`] for a negative distance.
    pub fn new(packet: &BoostedBox, time: &Rational, region: Region) -> Result<BoostProblem, crate::error::Error> {
        let region = match region {
            Region::BeyondCone(distance) if distance < 0 => {
                return Err(crate::error::Error::bad_input("beyond", distance, "give a distance of at least 0"));
            }
            Region::Beyond(distance) if distance < 0 => {
                return Err(crate::error::Error::bad_input("beyond", distance, "give a distance of at least 0"));
            }
            Region::BeyondCone(distance) => Region::BeyondCone(packet.scaled(&distance)),
            Region::Beyond(distance) => Region::Beyond(packet.scaled(&distance)),
            other => other,
        };
        Ok(BoostProblem {
            half_width: packet.scaled_half_width(),
            boost: packet.boost().clone(),
            time: packet.scaled(time),
            region,
        })
    }

    /// The two sides, each written as a right side; one of them with the weight two where they are equal.
    fn sides(&self) -> Result<Vec<(side::Side, u32)>, RouteFailure> {
        let right = side::Side::new(&self.half_width, &self.boost, &self.time)?;
        if self.time == 0 {
            return Ok(vec![(right, 2)]);
        }
        let left = side::Side::new(&self.half_width, &self.boost.reversed(), &self.time)?;
        Ok(vec![(right, 1), (left, 1)])
    }
}

fn out_of_reach(reason: &str) -> RouteFailure {
    RouteFailure::OutOfReach { reason: reason.to_owned() }
}
