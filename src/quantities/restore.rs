//! From the inputs of a report or certificate back to the question that they belong to.
//!
//! Every input has to be one that the question shows itself, with the same text: an input that would be ignored is
//! refused.

use super::boosted_tail::{BoostedRegion, BoostedTail, observer};
use super::catalogue;
use super::packet_tail::PacketTail;
use super::peak::PeakRequest;
use super::question::{Inputs, Question};
use super::tail::{MAX_DIGITS, RouteChoice, Side, TailRequest};
use crate::arithmetic::{Bits, ExactInput};
use crate::error::Error;
use crate::packets::BoxPacket;
use rug::Rational;
use std::collections::BTreeMap;
use std::time::Duration;

/// Inputs that are no parameters of a packet.
const COMMON: [&str; 9] = ["packet", "mass", "time", "beyond", "side", "digits", "route", "max_bits", "time_limit"];

/// The question that shows exactly these inputs.
///
/// # Errors
/// [`Error::BadInput`] or [`Error::Missing`] naming the input that is missing, cannot be used or belongs to no question.
pub fn question(inputs: &Inputs) -> Result<Box<dyn Question>, Error> {
    let read = Reader { inputs };
    let restored: Box<dyn Question> = match read.text("packet")? {
        BoxPacket::NAME if inputs.get("over").is_some() => Box::new(read.peak()?),
        BoxPacket::NAME if inputs.get("rapidity").or(inputs.get("boost_velocity")).is_some() => {
            Box::new(read.boosted()?)
        }
        BoxPacket::NAME if inputs.get("momentum").is_none() => Box::new(read.box_at_rest()?),
        kind => Box::new(read.packet(kind)?),
    };
    let shown = restored.inputs();
    // A time limit goes through seconds in double precision.
    let differs = |name: &str, text: &str| name != "time_limit" && shown.get(name) != Some(text);
    if let Some((name, text)) = inputs.iter().find(|(name, text)| differs(name, text)) {
        let wanted = match shown.get(name) {
            Some(other) => format!("for this question it has to be {other}"),
            None => "this question has no such input".to_owned(),
        };
        return Err(Error::bad_input(name, text, &wanted));
    }
    if let Some((name, text)) = shown.iter().find(|(name, _)| inputs.get(name).is_none() && !may_lack(name)) {
        return Err(Error::Missing { field: name.to_owned(), wanted: format!("it would be {text} if left out") });
    }
    Ok(restored)
}

/// Inputs that a certificate may leave out. (The gaussian shows a momentum that was not given.)
fn may_lack(name: &str) -> bool {
    matches!(name, "max_bits" | "time_limit")
}

/// The inputs with typed access.
struct Reader<'a> {
    inputs: &'a Inputs,
}

impl Reader<'_> {
    fn text(&self, name: &str) -> Result<&str, Error> {
        let wanted = "the inputs have to state it".to_owned();
        self.inputs.get(name).ok_or_else(|| Error::Missing { field: name.to_owned(), wanted })
    }

    fn number(&self, name: &str) -> Result<ExactInput, Error> {
        exact(name, self.text(name)?)
    }

    fn optional_number(&self, name: &str) -> Result<Option<ExactInput>, Error> {
        self.inputs.get(name).map(|text| exact(name, text)).transpose()
    }

    fn beyond(&self) -> Result<Option<ExactInput>, Error> {
        match self.text("beyond")? {
            "cone" => Ok(None),
            text => exact("beyond", text).map(Some),
        }
    }

    fn side(&self) -> Result<Side, Error> {
        let text = self.text("side")?;
        let found = [Side::Left, Side::Right, Side::Both].into_iter().find(|side| side.name() == text);
        found.ok_or_else(|| Error::bad_input("side", text, "it has to be left, right or both"))
    }

    fn digits(&self) -> Result<u32, Error> {
        let wanted = format!("it has to be a whole number from 1 to {MAX_DIGITS}");
        let text = self.text("digits")?;
        whole(text).filter(|d| (1..=MAX_DIGITS).contains(d)).ok_or_else(|| Error::bad_input("digits", text, &wanted))
    }

    fn max_bits(&self) -> Result<Option<Bits>, Error> {
        let refuse = |text| Error::bad_input("max_bits", text, "it has to be a whole number from 64 up");
        let read = |text| whole(text).filter(|bits| *bits >= 64).ok_or_else(|| refuse(text));
        self.inputs.get("max_bits").map(read).transpose()
    }

    fn time_limit(&self) -> Result<Option<Duration>, Error> {
        let Some(text) = self.inputs.get("time_limit") else { return Ok(None) };
        let refuse = || Error::bad_input("time_limit", text, "it has to be a number of seconds from 0 to 1000000000");
        let seconds: ExactInput = text.parse().map_err(|_| refuse())?;
        if !seconds.is_point() || *seconds.lower() < 0 || *seconds.upper() > 1_000_000_000 {
            return Err(refuse());
        }
        let nanoseconds = Rational::from(seconds.lower() * 1_000_000_000u32).ceil();
        nanoseconds.numer().to_u64().map(|n| Some(Duration::from_nanos(n))).ok_or_else(refuse)
    }

    fn box_at_rest(&self) -> Result<TailRequest, Error> {
        let packet = BoxPacket::new(self.number("half_width")?)?;
        let mut request = TailRequest::new(packet, self.number("mass")?, self.number("time")?)?;
        let text = self.text("route")?;
        let routes = [RouteChoice::Kernel, RouteChoice::Spectral, RouteChoice::Both];
        let route = routes.into_iter().find(|route| route.name() == text);
        request.routes =
            route.ok_or_else(|| Error::bad_input("route", text, "it has to be kernel, spectral or both"))?;
        (request.beyond, request.side, request.digits) = (self.beyond()?, self.side()?, self.digits()?);
        (request.max_bits, request.time_limit) = (self.max_bits()?, self.time_limit()?);
        request.validate()?;
        Ok(request)
    }

    fn packet(&self, kind: &str) -> Result<PacketTail, Error> {
        let own = self.inputs.iter().filter(|(name, _)| !COMMON.contains(name));
        let parameters: BTreeMap<String, String> =
            own.map(|(name, text)| (name.replace('_', "-"), text.to_owned())).collect();
        let mut request =
            PacketTail::new(catalogue::packet(kind, &parameters)?, self.number("mass")?, self.number("time")?);
        request.route = self.text("route")?.to_owned();
        (request.beyond, request.side, request.digits) = (self.beyond()?, self.side()?, self.digits()?);
        (request.max_bits, request.time_limit) = (self.max_bits()?, self.time_limit()?);
        request.validate()?;
        Ok(request)
    }

    fn boosted(&self) -> Result<BoostedTail, Error> {
        let (rapidity, velocity) = (self.optional_number("rapidity")?, self.optional_number("boost_velocity")?);
        let Some((boost, boost_read)) = observer(rapidity.as_ref(), velocity.as_ref())? else {
            return Err(Error::Internal { found: "an observer without a boost".to_owned() });
        };
        let region = match self.text("beyond")? {
            "cone" => BoostedRegion::Cone,
            "contracted" => BoostedRegion::Contracted,
            text => BoostedRegion::Beyond(exact("beyond", text)?),
        };
        let request = BoostedTail {
            half_width: self.number("half_width")?,
            mass: self.number("mass")?,
            boost,
            boost_read,
            time: self.number("time")?,
            region,
            digits: self.digits()?,
            route: self.text("route")?.to_owned(),
            max_bits: self.max_bits()?,
            time_limit: self.time_limit()?,
        };
        request.validate()?;
        Ok(request)
    }

    fn peak(&self) -> Result<PeakRequest, Error> {
        let mut request = PeakRequest::new(BoxPacket::new(self.number("half_width")?)?, self.number("mass")?)?;
        (request.digits, request.time_limit) = (self.digits()?, self.time_limit()?);
        request.validate()?;
        Ok(request)
    }
}

fn exact(field: &str, text: &str) -> Result<ExactInput, Error> {
    ExactInput::of_field(field, text)
}

/// Digits only: no sign, point or exponent.
fn whole(text: &str) -> Option<u32> {
    let plain = !text.is_empty() && text.bytes().all(|byte| byte.is_ascii_digit());
    plain.then(|| text.parse().ok()).flatten()
}
