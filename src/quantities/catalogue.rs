//! The packets that commands and claims files can name, each with its parameters and its routes.
//!
//! A further packet is one entry of [`KINDS`] with its constructor here, its shape in [`crate::packets`] and, if its
//! routes are new, a folder in [`crate::routes`].

use super::packet_tail::{ExactTail, TailPacket};
use super::piecewise_text;
use super::tail::Side;
use crate::arithmetic::ExactInput;
use crate::error::Error;
use crate::packets::{BSplinePacket, GaussianPacket, PiecewisePacket, WavePacket};
use crate::routes::Evaluation;
use crate::routes::cut::{CutAmplitude, CutSide, CutTail};
use crate::routes::panels::{PiecewiseKernel, Sides};
use rug::Rational;
use std::collections::BTreeMap;
use std::fmt;

/// A kind of packet: its name, its parameters (those after the first `needed` may be left out), its constructor.
struct Kind {
    name: &'static str,
    parameters: &'static [&'static str],
    needed: usize,
    build: fn(&Parameters) -> Result<Box<dyn TailPacket>, Error>,
}

const KINDS: [Kind; 7] = [
    Kind { name: "box", parameters: &["half-width", "momentum"], needed: 1, build: moving_box },
    Kind { name: "cosine", parameters: &["half-width", "mode", "momentum"], needed: 1, build: cosine },
    Kind { name: "bspline", parameters: &["half-width", "order", "momentum"], needed: 2, build: bspline },
    Kind { name: "ball", parameters: &["radius"], needed: 1, build: ball },
    Kind { name: "well", parameters: &["radius", "mode"], needed: 1, build: well },
    Kind { name: "piecewise", parameters: &["knots", "pieces"], needed: 2, build: piecewise },
    Kind { name: "gaussian", parameters: &["sigma", "momentum"], needed: 1, build: gaussian },
];

/// The packet of this kind with these parameters, by the names of the command line.
///
/// # Errors
/// [`Error::BadInput`] or [`Error::Missing`] naming the kind or parameter that cannot be used.
pub fn packet(kind: &str, parameters: &BTreeMap<String, String>) -> Result<Box<dyn TailPacket>, Error> {
    let Some(found) = KINDS.iter().find(|known| known.name == kind) else {
        let known: Vec<&str> = KINDS.iter().map(|known| known.name).collect();
        return Err(Error::bad_input("packet", kind, &format!("known are: {}", known.join(", "))));
    };
    if let Some(name) = parameters.keys().find(|name| !found.parameters.contains(&name.as_str())) {
        let wanted = format!("a {kind} packet takes: {}", found.parameters.join(", "));
        return Err(Error::bad_input("packet", name, &wanted));
    }
    for name in &found.parameters[..found.needed] {
        if !parameters.contains_key(*name) {
            let wanted = format!("give it for a {kind} packet, such as 1");
            return Err(Error::Missing { field: (*name).to_owned(), wanted });
        }
    }
    (found.build)(&Parameters { given: parameters })
}

/// The parameters as read.
struct Parameters<'a> {
    given: &'a BTreeMap<String, String>,
}

impl Parameters<'_> {
    fn text<'a>(&'a self, name: &str, default: &'a str) -> &'a str {
        self.given.get(name).map_or(default, String::as_str)
    }

    /// A single exact number.
    fn number(&self, name: &str, default: &str) -> Result<Rational, Error> {
        let text = self.text(name, default);
        let read = ExactInput::of_field(name, text)?;
        super::tail::check_size(name, &read)?;
        if !read.is_point() {
            return Err(Error::bad_input(name, text, "give a single number for this packet"));
        }
        Ok(read.lower().clone())
    }

    /// A small whole number from one up.
    fn whole(&self, name: &str, default: &str, most: u32) -> Result<u32, Error> {
        let text = self.text(name, default);
        let read = self.number(name, default)?;
        let whole = if read.is_integer() { read.numer().to_u32() } else { None };
        let wanted = format!("give a whole number from 1 to {most}");
        whole.filter(|number| (1..=most).contains(number)).ok_or_else(|| Error::bad_input(name, text, &wanted))
    }

    /// The parameters with their texts, for reports; those left out are left out.
    fn shown(&self, names: &[&'static str]) -> Vec<(&'static str, String)> {
        let given = |name: &&'static str| self.given.get(*name).map(|text| (report_name(name), text.clone()));
        names.iter().filter_map(given).collect()
    }
}

/// The name in reports and certificates.
fn report_name(name: &'static str) -> &'static str {
    if name == "half-width" { "half_width" } else { name }
}

/// A compact packet with its two views.
struct Compact {
    kind: &'static str,
    parameters: Vec<(&'static str, String)>,
    edge: Rational,
    radial: bool,
    waves: Box<dyn CutAmplitude>,
    /// The view of the kernel route, where it has one.
    pieces: Option<PiecewisePacket>,
    remarks: Vec<String>,
}

impl fmt::Debug for Compact {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct(self.kind).field("parameters", &self.parameters).finish()
    }
}

impl TailPacket for Compact {
    fn kind(&self) -> &'static str {
        self.kind
    }

    fn parameters(&self) -> Vec<(&'static str, String)> {
        self.parameters.clone()
    }

    fn edge(&self) -> Option<Rational> {
        Some(self.edge.clone())
    }

    fn is_radial(&self) -> bool {
        self.radial
    }

    fn remarks(&self) -> Vec<String> {
        self.remarks.clone()
    }

    fn routes(&self, problem: &ExactTail) -> Result<Vec<Box<dyn Evaluation>>, Error> {
        let mut list: Vec<Box<dyn Evaluation>> = Vec::new();
        let (mass, time, distance) = (&problem.mass, &problem.time, &problem.distance);
        let (panels, cut) = match problem.side {
            Side::Left => (Sides::Left, CutSide::Left),
            Side::Right => (Sides::Right, CutSide::Right),
            Side::Both => (Sides::Both, CutSide::Both),
        };
        if let Some(pieces) = self.pieces.as_ref().filter(|_| *mass > 0) {
            list.push(Box::new(PiecewiseKernel::new(pieces, mass, time, distance, panels)?));
        }
        list.push(Box::new(CutTail::new(self.waves.as_ref(), mass, time, distance, cut)?));
        Ok(list)
    }
}

fn moving_box(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let (half_width, momentum) = (given.number("half-width", "1")?, given.number("momentum", "0")?);
    Ok(Box::new(Compact {
        kind: "box",
        parameters: given.shown(&["half-width", "momentum"]),
        radial: false,
        waves: Box::new(WavePacket::moving_box(&half_width, &momentum)?),
        pieces: Some(PiecewisePacket::uniform(&half_width)?.with_momentum(&momentum)?),
        edge: half_width,
        remarks: Vec::new(),
    }))
}

fn cosine(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let (half_width, mode) = (given.number("half-width", "1")?, given.whole("mode", "1", 1000)?);
    let momentum = given.number("momentum", "0")?;
    // The kernel route carries one wave at a time: a cosine at rest.
    let pieces = if momentum == 0 { Some(PiecewisePacket::cosine(&half_width, mode)?) } else { None };
    Ok(Box::new(Compact {
        kind: "cosine",
        parameters: given.shown(&["half-width", "mode", "momentum"]),
        radial: false,
        waves: Box::new(WavePacket::cosine(&half_width, mode, &momentum)?),
        pieces,
        edge: half_width,
        remarks: Vec::new(),
    }))
}

fn bspline(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let (half_width, order) = (given.number("half-width", "1")?, given.whole("order", "1", 20)?);
    let momentum = given.number("momentum", "0")?;
    // At rest the transform is a power of one sinc, which is cheaper than a sum over knots.
    let waves: Box<dyn CutAmplitude> = if momentum == 0 {
        Box::new(BSplinePacket::new(&half_width, order)?)
    } else {
        Box::new(WavePacket::bspline(&half_width, order, &momentum)?)
    };
    Ok(Box::new(Compact {
        kind: "bspline",
        parameters: given.shown(&["half-width", "order", "momentum"]),
        radial: false,
        waves,
        pieces: Some(PiecewisePacket::bspline(&half_width, order)?.with_momentum(&momentum)?),
        edge: half_width,
        remarks: Vec::new(),
    }))
}

fn piecewise(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let (knots, coefficients) = piecewise_text::read(given.text("knots", ""), given.text("pieces", ""))?;
    let pieces = PiecewisePacket::complex(knots.clone(), coefficients.clone())?;
    let remarks = vec![format!(
        "the packet was normalised: the integral of its absolute square was {}; distances count from {}",
        super::tail::readable(pieces.norm_squared()),
        super::tail::readable(&pieces.centre())
    )];
    Ok(Box::new(Compact {
        kind: "piecewise",
        parameters: given.shown(&["knots", "pieces"]),
        radial: false,
        waves: Box::new(WavePacket::piecewise(knots, &coefficients)?),
        edge: pieces.half_width(),
        pieces: Some(pieces),
        remarks,
    }))
}

fn ball(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let radius = given.number("radius", "1")?;
    Ok(Box::new(Compact {
        kind: "ball",
        parameters: given.shown(&["radius"]),
        radial: true,
        waves: Box::new(WavePacket::ball(&radius)?),
        pieces: Some(PiecewisePacket::uniform_ball(&radius)?),
        edge: radius,
        remarks: Vec::new(),
    }))
}

fn well(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let (radius, mode) = (given.number("radius", "1")?, given.whole("mode", "1", 1000)?);
    Ok(Box::new(Compact {
        kind: "well",
        parameters: given.shown(&["radius", "mode"]),
        radial: true,
        waves: Box::new(WavePacket::spherical_well(&radius, mode)?),
        pieces: None,
        edge: radius,
        remarks: Vec::new(),
    }))
}

fn gaussian(given: &Parameters<'_>) -> Result<Box<dyn TailPacket>, Error> {
    let exact = |name: &str, default: &str| -> Result<ExactInput, Error> {
        given.number(name, default)?;
        ExactInput::of_field(name, given.text(name, default))
    };
    Ok(Box::new(GaussianPacket::new(exact("sigma", "1")?)?.with_momentum(exact("momentum", "0")?)))
}
