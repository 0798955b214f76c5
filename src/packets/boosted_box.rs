//! The box as a moving observer sees it.
//!
//! In its rest frame the packet is the box of [`super::BoxPacket`] at time zero, of positive mass. An observer
//! of rapidity `theta` assigns it the momentum amplitude
//!
//! ```text
//! phi'(p) = sqrt(omega(Lp)/omega(p)) phi(Lp),     Lp = p cosh(theta) + omega(p) sinh(theta),
//! ```
//!
//! the unitary representation of the boost on Newton-Wigner amplitudes: a state at rest (`Lp = 0`) has the
//! momentum `p = -m sinh(theta)`, so it moves to the left for `theta > 0`. The observer's velocity in units of
//! `c` is `v = tanh(theta)`.

use crate::arithmetic::{Bits, ExactInput, Real};
use crate::error::Error;
use crate::functions::elementary::{exp, exp_m1, sqrt};
use rug::Rational;

/// Largest rapidity that is accepted; `tanh(20) = 1 - 8.5e-18`.
pub const MAX_RAPIDITY: u32 = 20;

/// How fast the observer moves, one exact number.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Boost {
    /// The rapidity `theta`.
    Rapidity(Rational),
    /// The velocity in units of `c`, `tanh(theta)`.
    Velocity(Rational),
}

impl Boost {
    /// An observer of rapidity `theta`, `|theta| <= 20`.
    ///
    /// # Errors
    /// [`Error::BadInput`] if it is not one number or too large.
    pub fn from_rapidity(rapidity: &ExactInput) -> Result<Boost, Error> {
        let value = point("rapidity", rapidity)?;
        if value.clone().abs() > MAX_RAPIDITY {
            return Err(Error::bad_input("rapidity", rapidity.text(), "give a rapidity between -20 and 20"));
        }
        Ok(Boost::Rapidity(value))
    }

    /// An observer of velocity `v/c`, `|v/c| < 1` and of rapidity at most 20.
    ///
    /// # Errors
    /// [`Error::BadInput`] if it is not one number, not below the speed of light, or too close to it.
    pub fn from_velocity(velocity: &ExactInput) -> Result<Boost, Error> {
        let value = point("boost-velocity", velocity)?;
        // 1 - tanh(20) = 8.4967e-18 (DLMF 4.35.11 with exponentials); 9/10^18 keeps the rapidity below 20.
        if value.clone().abs() > Rational::from(1) - Rational::from((9u64, 1_000_000_000_000_000_000u64)) {
            let wanted = "give the velocity as a fraction of c, between -1 and 1, with a rapidity of at most 20";
            return Err(Error::bad_input("boost-velocity", velocity.text(), wanted));
        }
        Ok(Boost::Velocity(value))
    }

    /// Whether there is no motion.
    pub fn is_rest(&self) -> bool {
        *self.number() == 0
    }

    /// Whether the rapidity is negative.
    pub fn is_negative(&self) -> bool {
        *self.number() < 0
    }

    /// The boost the other way round.
    pub fn reversed(&self) -> Boost {
        match self {
            Boost::Rapidity(value) => Boost::Rapidity(Rational::from(-value)),
            Boost::Velocity(value) => Boost::Velocity(Rational::from(-value)),
        }
    }

    fn number(&self) -> &Rational {
        match self {
            Boost::Rapidity(value) | Boost::Velocity(value) => value,
        }
    }

    /// `e^theta` and `e^theta - 1`, both with full relative accuracy.
    ///
    /// With `v = tanh(theta)`: `e^theta = sqrt((1+v)/(1-v))`, `e^theta - 1 = (2v/(1-v))/(e^theta + 1)`.
    pub fn growth(&self, bits: Bits) -> (Real, Real) {
        let one = Real::from_i64(1);
        match self {
            Boost::Rapidity(theta) => {
                let theta = Real::from_rational(theta, bits + 8);
                (exp(&theta, bits), exp_m1(&theta, bits))
            }
            Boost::Velocity(v) => {
                let below = Rational::from(1) - v;
                let square = Real::from_rational(&((Rational::from(1) + v) / &below), bits + 8);
                let growth = sqrt(&square, bits + 8);
                let excess = Real::from_rational(&(Rational::from(2) * v / below), bits + 8);
                let excess = excess.div(&growth.add(&one, bits + 8), bits);
                (growth.round(bits), excess)
            }
        }
    }

    /// `(e^theta)^2` where that is rational.
    pub fn growth_squared(&self) -> Option<Rational> {
        match self {
            Boost::Rapidity(theta) => (*theta == 0).then(|| Rational::from(1)),
            Boost::Velocity(v) => Some((Rational::from(1) + v) / (Rational::from(1) - v)),
        }
    }
}

/// The boosted box, its half-width in units of the Compton length `1/m`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BoostedBox {
    half_width: Rational,
    mass: Rational,
    boost: Boost,
}

impl BoostedBox {
    /// A box of half-width `a > 0` in its rest frame and mass `m > 0` for an observer of the given boost.
    ///
    /// # Errors
    /// [`Error::BadInput`] unless half-width and mass are single positive numbers.
    pub fn new(half_width: &ExactInput, mass: &ExactInput, boost: Boost) -> Result<BoostedBox, Error> {
        let width = point("half-width", half_width)?;
        if width <= 0 {
            let wanted = "give a half-width greater than 0, such as 1, 0.5 or 1/3";
            return Err(Error::bad_input("half-width", half_width.text(), wanted));
        }
        let exact_mass = point("mass", mass)?;
        if exact_mass <= 0 {
            let wanted = "give a mass greater than 0: a boosted box without mass is not offered";
            return Err(Error::bad_input("mass", mass.text(), wanted));
        }
        Ok(BoostedBox { half_width: width, mass: exact_mass, boost })
    }

    /// `m a`.
    pub fn scaled_half_width(&self) -> Rational {
        Rational::from(&self.half_width * &self.mass)
    }

    /// A length or a time in units of `1/m`.
    pub fn scaled(&self, length: &Rational) -> Rational {
        Rational::from(length * &self.mass)
    }

    /// The observer.
    pub fn boost(&self) -> &Boost {
        &self.boost
    }
}

/// The one number of an exact input.
fn point(field: &str, input: &ExactInput) -> Result<Rational, Error> {
    if input.is_point() {
        return Ok(input.lower().clone());
    }
    Err(Error::bad_input(field, input.text(), "give one exact number, not an interval"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn velocity_and_rapidity_agree() {
        // tanh(ln 2) = 3/5 exactly.
        let (growth, excess) = Boost::Velocity(Rational::from((3, 5))).growth(100);
        assert!(growth.contains_rational(&Rational::from(2)) && excess.contains_rational(&Rational::from(1)));
        assert_eq!(Boost::Velocity(Rational::from((3, 5))).growth_squared(), Some(Rational::from(4)));
        let tiny = Boost::Velocity(Rational::from((1, 1_000_000_000))).growth(100).1;
        assert!(tiny.accuracy_estimate() > 90.0);
    }

    fn refused<T>(result: Result<T, Error>, name: &str) -> bool {
        matches!(result, Err(Error::BadInput { field, .. }) if field == name)
    }

    #[test]
    fn bad_input_names_the_field() {
        let number = |text: &str| text.parse::<ExactInput>().unwrap();
        assert!(refused(Boost::from_velocity(&number("1")), "boost-velocity"));
        assert!(refused(Boost::from_velocity(&number("-3/2")), "boost-velocity"));
        assert!(refused(Boost::from_rapidity(&number("21")), "rapidity"));
        let still = || Boost::from_rapidity(&number("0")).unwrap();
        for (width, mass, field) in [("0", "1", "half-width"), ("1", "0", "mass"), ("1", "-1", "mass")] {
            assert!(refused(BoostedBox::new(&number(width), &number(mass), still()), field));
        }
    }
}
