//! Intervals of `x` without a singular point inside, and their ends.

use crate::arithmetic::{Bits, Complex, Real};
use crate::functions::complex_elementary;
use crate::functions::elementary::{pi, sqrt};
use crate::routes::RouteFailure;
use crate::routes::boost::side::{Factor, Frame, Side};
use crate::routes::boost::{Region, out_of_reach};
use rug::Rational;

/// Precision at which the order of region and cones is decided (signs are certain at any precision).
const ORDER_BITS: Bits = 32;

/// Where a piece begins or ends.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Mark {
    /// A position.
    At(Rational),
    /// `a/cosh(theta)`, at `t = 0`.
    Contracted,
    /// So far beyond the outer line `x = a e^theta + t`.
    Outer(Rational),
    /// On the inner line `x = a e^-theta - t`.
    Inner,
    /// No end.
    Infinity,
}

/// Signs of `(X-, X'-)` inside the piece.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Zone {
    /// Both positive: outside.
    Beyond,
    /// `X- < 0 < X'-`.
    Between,
    /// Both negative.
    Within,
}

/// An interval in one zone.
#[derive(Clone, Debug)]
pub(super) struct Piece {
    pub zone: Zone,
    pub from: Mark,
    pub to: Mark,
}

impl Piece {
    fn new(zone: Zone, from: &Mark, to: &Mark) -> Piece {
        Piece { zone, from: from.clone(), to: to.clone() }
    }

    pub(super) fn name(&self) -> &'static str {
        match self.zone {
            Zone::Beyond => "beyond the cone",
            Zone::Between => "between the lines of the cone",
            Zone::Within => "within the cone",
        }
    }
}

/// The zone that begins at the mark and lies on its right, and the mark.
fn locate(side: &Side, region: &Region) -> Result<(Zone, Mark), RouteFailure> {
    let outer = |distance: &Rational| (Zone::Beyond, Mark::Outer(distance.clone()));
    match region {
        Region::Cone => Ok(outer(&Rational::new())),
        Region::BeyondCone(distance) => Ok(outer(distance)),
        Region::Contracted if side.boost.is_rest() => Ok(outer(&Rational::new())),
        Region::Contracted if side.time != 0 => {
            Err(out_of_reach("the contracted interval is offered at the observer's time 0 only"))
        }
        Region::Contracted => Ok((Zone::Between, Mark::Contracted)),
        Region::Beyond(r) => {
            let x = side.distance(&Rational::from(r - &side.time), -1, Factor::Growth, ORDER_BITS)?;
            if !x.certainly_negative() {
                let exact = x.is_exact() && x.may_be_zero();
                return Ok((Zone::Beyond, if exact { Mark::Outer(Rational::new()) } else { Mark::At(r.clone()) }));
            }
            let back = side.distance(&Rational::from(r + &side.time), -1, Factor::Decay, ORDER_BITS)?;
            if back.certainly_negative() {
                return Ok((Zone::Within, Mark::At(r.clone())));
            }
            let exact = back.is_exact() && back.may_be_zero();
            Ok((Zone::Between, if exact { Mark::Inner } else { Mark::At(r.clone()) }))
        }
    }
}

/// Whether the two lines of the cone coincide: no zone between them.
fn lines_coincide(side: &Side) -> Result<bool, RouteFailure> {
    let lead = side.lead(ORDER_BITS)?;
    Ok(lead.is_exact() && lead.may_be_zero())
}

/// The pieces of `x` beyond the region's edge.
pub(super) fn outside(side: &Side, region: &Region) -> Result<Vec<Piece>, RouteFailure> {
    let (zone, mark) = locate(side, region)?;
    let outer = Mark::Outer(Rational::new());
    let mut pieces = Vec::new();
    if zone == Zone::Within {
        pieces.push(Piece::new(Zone::Within, &mark, &Mark::Inner));
        if !lines_coincide(side)? {
            pieces.push(Piece::new(Zone::Between, &Mark::Inner, &outer));
        }
    }
    if zone == Zone::Between {
        pieces.push(Piece::new(Zone::Between, &mark, &outer));
    }
    let start = if zone == Zone::Beyond { &mark } else { &outer };
    pieces.push(Piece::new(Zone::Beyond, start, &Mark::Infinity));
    Ok(pieces)
}

/// The pieces from `x = 0` to the region's edge, at `t = 0`.
pub(super) fn inside(side: &Side, region: &Region) -> Result<Vec<Piece>, RouteFailure> {
    let (zone, mark) = locate(side, region)?;
    let origin = Mark::At(Rational::new());
    let outer = Mark::Outer(Rational::new());
    if zone == Zone::Within {
        let empty = mark == origin;
        return Ok(if empty { Vec::new() } else { vec![Piece::new(Zone::Within, &origin, &mark)] });
    }
    let mut pieces = vec![Piece::new(Zone::Within, &origin, &Mark::Inner)];
    if zone == Zone::Between {
        if mark != Mark::Inner {
            pieces.push(Piece::new(Zone::Between, &Mark::Inner, &mark));
        }
        return Ok(pieces);
    }
    if !lines_coincide(side)? {
        pieces.push(Piece::new(Zone::Between, &Mark::Inner, &outer));
    }
    if mark != outer {
        pieces.push(Piece::new(Zone::Beyond, &outer, &mark));
    }
    Ok(pieces)
}

/// `(X, X')` of one edge at one end.
#[derive(Clone, Debug)]
pub(super) struct Pair {
    pub x: Real,
    pub back: Real,
}

/// One end of a piece: both edges.
#[derive(Clone, Debug)]
pub(super) struct End {
    /// `E-`: the edge whose cone is near.
    pub minus: Pair,
    /// `E+`: the other edge.
    pub plus: Pair,
}

/// A piece with its numbers as balls.
pub(super) struct Place {
    pub zone: Zone,
    pub frame: Frame,
    pub half_width: Real,
    pub lead: Real,
    pub from: End,
    /// `None` at infinity.
    pub to: Option<End>,
}

impl Place {
    pub(super) fn new(piece: &Piece, side: &Side, bits: Bits) -> Result<Place, RouteFailure> {
        let work = bits + 16;
        let from = end(side, &piece.from, work)?.ok_or_else(|| out_of_reach("a piece cannot begin at infinity"))?;
        let to = end(side, &piece.to, work)?;
        if !(from.plus.x.certainly_positive() && from.plus.back.certainly_positive()) {
            return Err(out_of_reach("the region reaches into the cone of the other edge; not offered at this time"));
        }
        Ok(Place {
            zone: piece.zone,
            frame: Frame::new(&side.boost, bits),
            half_width: Real::from_rational(&side.half_width, bits),
            lead: side.lead(work)?,
            from,
            to,
        })
    }

    /// `x2 - x1`, `None` if infinite.
    pub(super) fn length(&self, bits: Bits) -> Option<Real> {
        self.to.as_ref().map(|to| to.plus.x.sub(&self.from.plus.x, bits))
    }

    /// The ends, the first one again for infinity.
    pub(super) fn ends(&self) -> [&End; 2] {
        [&self.from, self.to.as_ref().unwrap_or(&self.from)]
    }

    /// The residue of the pole, for the zone within: `2 pi i sqrt(cosh theta) exp((i/2)(X- e^-theta - X'- e^theta))`.
    pub(super) fn plane_wave(&self, bits: Bits) -> Option<super::sum::Node> {
        if self.zone != Zone::Within {
            return None;
        }
        let growth = &self.frame.growth;
        let decay = Real::from_i64(1).div(growth, bits);
        let cosh = growth.add(&decay, bits).shift(-1);
        let momentum = decay.sub(growth, bits).shift(-1);
        let size = pi(bits).shift(1).mul(&sqrt(&cosh, bits), bits);
        let at = |end: &End| {
            let x = end.minus.x.mul(&decay, bits);
            let phase = x.sub(&end.minus.back.mul(growth, bits), bits).shift(-1);
            let wave = complex_elementary::exp(&Complex::new(Real::zero(), phase), bits).mul_real(&size, bits);
            Complex::new(wave.im.neg(), wave.re)
        };
        Some(super::sum::Node {
            momentum: Complex::from_real(momentum),
            first: at(&self.from),
            second: self.to.as_ref().map(at),
            wave_length: self.length(bits),
        })
    }
}

fn end(side: &Side, mark: &Mark, bits: Bits) -> Result<Option<End>, RouteFailure> {
    let growth = Factor::Growth.value(&side.boost, bits);
    let decay = Factor::Decay.value(&side.boost, bits);
    let a = Real::from_rational(&side.half_width, bits);
    let sum = a.mul(&growth.add(&decay, bits), bits);
    let twice_time = Real::from_rational(&side.time, bits).shift(1);
    Ok(Some(match mark {
        Mark::Infinity => return Ok(None),
        Mark::Outer(distance) => {
            let d = Real::from_rational(distance, bits);
            End {
                minus: Pair { x: d.clone(), back: side.lead(bits)?.shift(1).add(&d, bits) },
                plus: Pair {
                    x: a.mul(&growth, bits).shift(1).add(&d, bits),
                    back: sum.add(&twice_time, bits).add(&d, bits),
                },
            }
        }
        Mark::Inner => End {
            minus: Pair { x: side.lead(bits)?.shift(1).neg(), back: Real::zero() },
            plus: Pair { x: sum.sub(&twice_time, bits), back: a.mul(&decay, bits).shift(1) },
        },
        Mark::At(r) => {
            let (late, early) = (Rational::from(r - &side.time), Rational::from(r + &side.time));
            let pair = |sign: i32| -> Result<Pair, RouteFailure> {
                Ok(Pair {
                    x: side.distance(&late, sign, Factor::Growth, bits)?,
                    back: side.distance(&early, sign, Factor::Decay, bits)?,
                })
            };
            End { minus: pair(-1)?, plus: pair(1)? }
        }
        Mark::Contracted => contracted(side, &a, bits),
    }))
}

/// `x = a/cosh(theta)`, `t = 0`: `X- = -a e^theta tanh(theta)`, `X'- = a e^-theta tanh(theta)`.
fn contracted(side: &Side, a: &Real, bits: Bits) -> End {
    let growth = Factor::Growth.value(&side.boost, bits);
    let decay = Factor::Decay.value(&side.boost, bits);
    let cosh = growth.add(&decay, bits).shift(-1);
    let scaled = a.mul(&Factor::Sinh.value(&side.boost, bits), bits).div(&cosh, bits);
    let position = a.div(&cosh, bits);
    End {
        minus: Pair { x: scaled.mul(&growth, bits).neg(), back: scaled.mul(&decay, bits) },
        plus: Pair { x: position.add(&a.mul(&growth, bits), bits), back: position.add(&a.mul(&decay, bits), bits) },
    }
}
