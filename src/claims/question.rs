//! From a claim to the question that it is about.

use super::file::Claim;
use crate::arithmetic::ExactInput;
use crate::error::Error;
use crate::packets::BoxPacket;
use crate::quantities::catalogue;

use crate::quantities::packet_tail::PacketTail;
use crate::quantities::peak::PeakRequest;
use crate::quantities::question::Question;
use crate::quantities::tail::{Side, TailRequest, TailResult};
use std::collections::BTreeMap;
use std::time::Instant;

/// A question that a claim can be about.
#[derive(Debug)]
pub enum Asked {
    /// The tail of the box at rest.
    Box(TailRequest),
    /// The tail of another packet.
    Packet(PacketTail),
    /// The largest tail of the box over time.
    Peak(PeakRequest),
}

impl Asked {
    /// The question itself.
    pub fn question(&self) -> &dyn Question {
        match self {
            Asked::Box(request) => request,
            Asked::Packet(request) => request,
            Asked::Peak(request) => request,
        }
    }

    /// Sets digits and the moment at which to stop.
    pub fn set_effort(&mut self, digits: u32, deadline: Option<Instant>) {
        let left = deadline.map(|deadline| deadline.saturating_duration_since(Instant::now()));
        match self {
            Asked::Box(request) => (request.digits, request.time_limit) = (digits, left),
            Asked::Packet(request) => (request.digits, request.time_limit) = (digits, left),
            Asked::Peak(request) => (request.digits, request.time_limit) = (digits, left),
        }
    }

    /// The certified enclosure.
    ///
    /// # Errors
    /// As for [`Question::certify`].
    pub fn certify(&self) -> Result<TailResult, Error> {
        self.question().certify()
    }
}

/// The question of a claim.
///
/// # Errors
/// [`Error::BadInput`] or [`Error::Missing`] naming the member that cannot be used.
pub fn read(claim: &Claim) -> Result<Asked, Error> {
    let mass = number("mass", claim.mass.as_ref().map_or("1", |text| &text.0))?;
    let parameters: BTreeMap<String, String> = claim
        .packet
        .iter()
        .filter(|(name, _)| *name != "kind")
        .map(|(name, text)| (name.clone(), text.0.clone()))
        .collect();
    let kind = claim.packet.get("kind").map(|text| text.0.as_str());
    let kind = kind.ok_or_else(|| missing("packet", "write its kind, such as kind = \"box\""))?;
    let (side, beyond) = region(claim.region.as_deref().unwrap_or("beyond cone"))?;
    let plain_box = kind == BoxPacket::NAME && parameters.len() == 1 && parameters.contains_key("half-width");
    match claim.quantity.as_deref().unwrap_or("probability") {
        "probability" => {
            let time = claim.time.as_ref().ok_or_else(|| missing("time", "write the time, such as time = \"1\""))?;
            let time = number("time", &time.0)?;
            if plain_box {
                let mut request = TailRequest::new(box_packet(&parameters)?, mass, time)?;
                (request.side, request.beyond) = (side, beyond);
                request.validate()?;
                return Ok(Asked::Box(request));
            }
            let mut request = PacketTail::new(catalogue::packet(kind, &parameters)?, mass, time);
            (request.side, request.beyond) = (side, beyond);
            request.validate()?;
            Ok(Asked::Packet(request))
        }
        "largest over time" if plain_box && side == Side::Both && beyond.is_none() => {
            Ok(Asked::Peak(PeakRequest::new(box_packet(&parameters)?, mass)?))
        }
        "largest over time" => Err(Error::bad_input(
            "quantity",
            "largest over time",
            "this is known for the box at rest beyond its cone, both sides",
        )),
        other => Err(Error::bad_input("quantity", other, "write \"probability\" or \"largest over time\"")),
    }
}

fn box_packet(parameters: &BTreeMap<String, String>) -> Result<BoxPacket, Error> {
    let text = parameters.get("half-width").ok_or_else(|| missing("half-width", "write it, such as \"1\""))?;
    BoxPacket::new(number("half-width", text)?)
}

fn missing(field: &str, wanted: &str) -> Error {
    Error::Missing { field: field.to_owned(), wanted: wanted.to_owned() }
}

fn number(field: &str, text: &str) -> Result<ExactInput, Error> {
    ExactInput::of_field(field, text)
}

/// `beyond cone`, `beyond R`, `right of cone`, `left of R`.
fn region(text: &str) -> Result<(Side, Option<ExactInput>), Error> {
    let wanted = "write \"beyond cone\" or \"beyond R\" for both sides, \"right of ...\" or \"left of ...\" for one";
    let forms = [("beyond ", Side::Both), ("right of ", Side::Right), ("left of ", Side::Left)];
    let found = forms.iter().find_map(|(words, side)| text.trim().strip_prefix(words).map(|edge| (*side, edge.trim())));
    let (side, edge) = found.ok_or_else(|| Error::bad_input("region", text, wanted))?;
    match edge {
        "cone" => Ok((side, None)),
        number => match number.parse::<ExactInput>() {
            Ok(edge) => Ok((side, Some(edge))),
            Err(_) => Err(Error::bad_input("region", text, wanted)),
        },
    }
}
