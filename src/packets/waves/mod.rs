//! Compact packets made of polynomials times plane waves, all numbers exact.
//!
//! ```text
//! psi0(x) = N Sum_j p_j(x) exp(i b_j x)   between neighbouring knots,   0 outside the outer ones,
//! ```
//!
//! with `N > 0` such that the norm is one. Each wave `j` has one polynomial for each interval between knots; wave numbers
//! are distinct, so `psi0` is zero only if all polynomials are. Packets of this kind are closed under superposition,
//! translation (without waves) and reflection; [`families`] builds the common ones.
//!
//! A spherically symmetric amplitude `psi(r)` in three dimensions evolves as the odd amplitude `u(x) = x psi(|x|)` does
//! on the line, and `P(r > R)` is `P(|x| > R)` of the normalised `u`.

pub mod families;
mod number;

pub use number::{ExactComplex, Polynomial, WaveNumber, mirrored as about_left_knot};

use crate::error::Error;
use number::{mirrored, shifted, sum, trimmed};
use rug::Rational;

/// Largest number of pieces after superposition.
pub const MAX_PIECES: usize = 1000;
/// Largest degree of a polynomial.
pub const MAX_DEGREE: usize = 40;
/// Largest number of different wave numbers.
pub const MAX_WAVES: usize = 64;

/// One plane wave with its polynomials.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Wave {
    /// The wave number `b`.
    pub number: WaveNumber,
    /// `pieces[i][n]` multiplies `(knots[i+1] - x)^n` between `knots[i]` and `knots[i+1]`.
    pub pieces: Vec<Polynomial>,
}

/// Polynomials times plane waves between knots.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct WavePacket {
    knots: Vec<Rational>,
    waves: Vec<Wave>,
}

impl WavePacket {
    /// One wave with the polynomials in powers of the distance from the left knot.
    fn from_left(knots: Vec<Rational>, pieces: &[Polynomial], number: WaveNumber) -> Result<WavePacket, Error> {
        check_knots(&knots, pieces.len())?;
        if let Some(long) = pieces.iter().find(|piece| piece.len() > MAX_DEGREE + 1) {
            let wanted = format!("give polynomials up to degree {MAX_DEGREE}");
            return Err(Error::bad_input("pieces", format!("degree {}", long.len() - 1), &wanted));
        }
        let pieces = pieces.iter().zip(knots.windows(2)).map(|(piece, ends)| {
            let length = Rational::from(&ends[1] - &ends[0]);
            trimmed(mirrored(piece, &length))
        });
        let wave = Wave { number, pieces: pieces.collect() };
        WavePacket { knots, waves: vec![wave] }.cleaned()
    }

    /// The sum of `weight * packet`, before normalisation; each packet counts with the height its constructor states.
    ///
    /// # Errors
    /// [`Error::BadInput`] if nothing is left, and beyond [`MAX_PIECES`] and [`MAX_WAVES`].
    pub fn superposition(terms: &[(ExactComplex, WavePacket)]) -> Result<WavePacket, Error> {
        let mut knots: Vec<Rational> = terms.iter().flat_map(|(_, packet)| packet.knots.iter().cloned()).collect();
        knots.sort();
        knots.dedup();
        if knots.len() > MAX_PIECES + 1 {
            let wanted = format!("give terms with at most {} different knots together", MAX_PIECES + 1);
            return Err(Error::bad_input("terms", format!("{} knots", knots.len()), &wanted));
        }
        let mut waves: Vec<Wave> = Vec::new();
        for (weight, packet) in terms {
            for wave in &packet.waves {
                let pieces = packet.refined(wave, &knots, weight);
                match waves.iter_mut().find(|known| known.number == wave.number) {
                    Some(known) => {
                        for (old, new) in known.pieces.iter_mut().zip(&pieces) {
                            *old = sum(old, new);
                        }
                    }
                    None => waves.push(Wave { number: wave.number.clone(), pieces }),
                }
            }
        }
        if waves.len() > MAX_WAVES {
            let wanted = format!("give terms with at most {MAX_WAVES} different wave numbers together");
            return Err(Error::bad_input("terms", format!("{} wave numbers", waves.len()), &wanted));
        }
        WavePacket { knots, waves }.cleaned()
    }

    /// The wave's polynomials times `weight` on a finer list of knots.
    fn refined(&self, wave: &Wave, knots: &[Rational], weight: &ExactComplex) -> Vec<Polynomial> {
        knots
            .windows(2)
            .map(|ends| {
                let place = self.knots.windows(2).position(|own| own[0] <= ends[0] && ends[1] <= own[1]);
                let Some(index) = place else { return Vec::new() };
                let back = Rational::from(&self.knots[index + 1] - &ends[1]);
                shifted(&wave.pieces[index], &back).iter().map(|c| c.product(weight)).collect()
            })
            .collect()
    }

    /// Without waves and outer pieces that are zero.
    fn cleaned(mut self) -> Result<WavePacket, Error> {
        for wave in &mut self.waves {
            wave.pieces = std::mem::take(&mut wave.pieces).into_iter().map(trimmed).collect();
        }
        self.waves.retain(|wave| wave.pieces.iter().any(|piece| !piece.is_empty()));
        let filled = |i: usize| self.waves.iter().any(|wave| !wave.pieces[i].is_empty());
        let count = self.knots.len().saturating_sub(1);
        let (Some(first), Some(last)) = ((0..count).find(|i| filled(*i)), (0..count).rfind(|i| filled(*i))) else {
            let wanted = "give at least one coefficient that is not zero: the norm must be positive";
            return Err(Error::bad_input("pieces", "zero everywhere", wanted));
        };
        self.knots = self.knots[first..=last + 1].to_vec();
        for wave in &mut self.waves {
            wave.pieces = wave.pieces[first..=last].to_vec();
        }
        Ok(self)
    }

    /// The packet moved to the right.
    ///
    /// # Errors
    /// [`Error::BadInput`] if it has a wave: its phase after the translation would not be an exact number here. Move
    /// first and add the momentum afterwards.
    pub fn translated(&self, by: &Rational) -> Result<WavePacket, Error> {
        if self.waves.iter().any(|wave| !wave.number.is_zero()) {
            return Err(Error::bad_input("translation", by, "translate the packet before giving it a momentum"));
        }
        let knots = self.knots.iter().map(|knot| Rational::from(knot + by)).collect();
        Ok(WavePacket { knots, waves: self.waves.clone() })
    }

    /// The packet times `exp(i k x)`.
    pub fn with_momentum(mut self, momentum: &Rational) -> WavePacket {
        for wave in &mut self.waves {
            wave.number.plain += momentum;
        }
        self
    }

    /// The packet `psi0(x / factor)`, for `factor > 0`.
    pub fn scaled(&self, factor: &Rational) -> WavePacket {
        let inverse = Rational::from(factor.recip_ref());
        let scale = |piece: &Polynomial| {
            let mut power = Rational::from(1);
            let mut list = Vec::with_capacity(piece.len());
            for coefficient in piece {
                list.push(coefficient.times(&power));
                power *= &inverse;
            }
            list
        };
        let waves = self
            .waves
            .iter()
            .map(|wave| Wave { number: wave.number.times(&inverse), pieces: wave.pieces.iter().map(scale).collect() });
        WavePacket {
            waves: waves.collect(),
            knots: self.knots.iter().map(|knot| Rational::from(knot * factor)).collect(),
        }
    }

    /// The packet `psi0(-x)`.
    pub fn mirrored(&self) -> WavePacket {
        let lengths: Vec<Rational> = self.knots.windows(2).map(|ends| Rational::from(&ends[1] - &ends[0])).collect();
        let waves = self.waves.iter().map(|wave| Wave {
            number: wave.number.neg(),
            pieces: wave.pieces.iter().zip(&lengths).rev().map(|(piece, length)| mirrored(piece, length)).collect(),
        });
        WavePacket {
            waves: waves.collect(),
            knots: self.knots.iter().rev().map(|knot| Rational::from(-knot)).collect(),
        }
    }

    /// The packet `conj psi0(x)`.
    fn conjugate(&self) -> WavePacket {
        let waves = self.waves.iter().map(|wave| Wave {
            number: wave.number.neg(),
            pieces: wave.pieces.iter().map(|piece| piece.iter().map(ExactComplex::conj).collect()).collect(),
        });
        WavePacket { waves: waves.collect(), knots: self.knots.clone() }
    }

    /// Whether the two are the same function up to the sign given (`negative`), with the same pieces.
    fn equals(&self, other: &WavePacket, negative: bool) -> bool {
        let same = |mine: &Polynomial, theirs: &Polynomial| {
            mine.len() == theirs.len()
                && mine.iter().zip(theirs).all(|(x, y)| if negative { *x == y.neg() } else { x == y })
        };
        self.knots == other.knots
            && self.waves.len() == other.waves.len()
            && self.waves.iter().all(|wave| {
                let partner = other.waves.iter().find(|candidate| candidate.number == wave.number);
                partner.is_some_and(|p| wave.pieces.iter().zip(&p.pieces).all(|(x, y)| same(x, y)))
            })
    }

    /// Whether `psi0` is certainly real.
    pub fn is_real(&self) -> bool {
        self.equals(&self.conjugate(), false)
    }

    /// Whether certainly `psi0(-x) = conj psi0(x)` or `psi0(-x) = -conj psi0(x)`, about the middle if there is no wave:
    /// then both sides outside the cone have the same probability.
    pub fn is_symmetric(&self) -> bool {
        let back = Rational::from(-self.centre());
        let centred = self.translated(&back).unwrap_or_else(|_| self.clone());
        let (left, right) = (centred.mirrored(), centred.conjugate());
        left.equals(&right, false) || left.equals(&right, true)
    }

    /// The knots, increasing.
    pub fn knots(&self) -> &[Rational] {
        &self.knots
    }

    /// The waves, with distinct wave numbers.
    pub fn waves(&self) -> &[Wave] {
        &self.waves
    }

    /// Half of the length of the support.
    pub fn half_width(&self) -> Rational {
        self.ends().map_or_else(Rational::new, |(first, last)| Rational::from(last - first) / 2)
    }

    /// Middle of the support.
    pub fn centre(&self) -> Rational {
        self.ends().map_or_else(Rational::new, |(first, last)| Rational::from(last + first) / 2)
    }

    fn ends(&self) -> Option<(&Rational, &Rational)> {
        Some((self.knots.first()?, self.knots.last()?))
    }
}

fn check_knots(knots: &[Rational], pieces: usize) -> Result<(), Error> {
    if knots.len() < 2 || knots.len() > MAX_PIECES + 1 {
        let wanted = format!("give from 2 to {} knots", MAX_PIECES + 1);
        return Err(Error::bad_input("knots", format!("{} knots", knots.len()), &wanted));
    }
    if let Some(pair) = knots.windows(2).find(|pair| pair[0] >= pair[1]) {
        let was = format!("{} before {}", pair[0], pair[1]);
        return Err(Error::bad_input("knots", was, "give knots that increase strictly from left to right"));
    }
    if pieces + 1 != knots.len() {
        let wanted = format!("give one piece for each of the {} intervals between knots", knots.len() - 1);
        return Err(Error::bad_input("pieces", format!("{pieces} pieces"), &wanted));
    }
    Ok(())
}
