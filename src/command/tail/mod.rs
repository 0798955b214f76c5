//! `coneproof tail PACKET`: the options that all packets share, and the answer.
//!
//! A further packet has its options in [`packets`] and one line in [`PacketCommand`].

mod box_packet;
mod packets;

use super::{Answer, fields};
use crate::arithmetic::ExactInput;
use crate::certificate::{self, Certificate};
use crate::error::{EXIT_CERTIFIED, EXIT_FEWER_DIGITS, Error};
use crate::packets::Boost;
use crate::quantities::boosted_tail::BoostedTail;
use crate::quantities::packet_tail::{PacketTail, TailPacket};
use crate::quantities::question::Question;
use crate::quantities::tail::{Side, Status, TailRequest, TailResult};
use crate::report::{TailReport, json, text};
use crate::scout;
use clap::{Args, Subcommand, ValueEnum};
use std::path::PathBuf;

const AFTER_HELP: &str = concat!(
    "\
Example:
  coneproof tail box --half-width 1 --mass 1 --time 1 --digits 30

",
    exit_codes!()
);

/// `coneproof tail`.
#[derive(Args)]
#[command(arg_required_else_help = false, after_help = AFTER_HELP)]
pub(super) struct TailCommand {
    #[command(subcommand)]
    packet: PacketCommand,
}

#[derive(Subcommand)]
enum PacketCommand {
    /// Constant amplitude for |x| <= half-width, zero elsewhere
    Box(box_packet::BoxArguments),
    /// Hard-wall eigenstate: cosine or sine for |x| <= half-width
    Cosine(packets::CosineArguments),
    /// B-spline on |x| <= half-width
    Bspline(packets::BsplineArguments),
    /// Piecewise polynomial between knots, real or complex
    Piecewise(packets::PiecewiseArguments),
    /// Uniform in a ball, three dimensions
    Ball(packets::BallArguments),
    /// Eigenstate of a spherical well, s-wave, three dimensions
    Well(packets::WellArguments),
    /// Gaussian, without an edge
    Gaussian(packets::GaussianArguments),
}

/// Options of every packet.
#[derive(Args)]
struct TailArguments {
    /// Mass, not negative
    #[arg(long, value_name = "M", default_value = "1", allow_hyphen_values = true)]
    mass: String,
    /// Time since the packet was released, of either sign
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    time: Option<String>,
    /// Relative digits, 1 to 10000: upper - lower <= 10^-D * lower
    #[arg(long, value_name = "D", default_value = "15", allow_hyphen_values = true)]
    digits: String,
    /// Distance from the origin beyond which the particle is found, half-width + |time| or more;
    /// "cone" is half-width + |time|
    #[arg(long, value_name = "R|cone", default_value = "cone", allow_hyphen_values = true)]
    beyond: String,
    /// Which side counts
    #[arg(long, value_enum, value_name = "SIDE", default_value = "both")]
    side: SideName,
    /// Which of the unrelated computations runs (kernel or spectral for compact packets); with both, their intervals must
    /// meet
    #[arg(long, value_name = "ROUTE", default_value = "both")]
    route: String,
    /// Largest working precision in bits, 64 to 20000000 [default: 4000000]
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    max_bits: Option<String>,
    /// Longest time to spend, in seconds; past it the best proven interval is printed
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    time_limit: Option<String>,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
    /// Write the answer with everything that a re-check needs to this file
    #[arg(long, value_name = "FILE", conflicts_with = "scout")]
    certificate: Option<PathBuf>,
    /// Only estimate, in double precision: quick and not certified
    #[arg(long)]
    scout: bool,
}

#[derive(Clone, Copy, ValueEnum)]
enum SideName {
    Left,
    Right,
    Both,
}

#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum FormatName {
    Text,
    Json,
}

impl SideName {
    fn side(self) -> Side {
        match self {
            SideName::Left => Side::Left,
            SideName::Right => Side::Right,
            SideName::Both => Side::Both,
        }
    }
}

impl FormatName {
    /// The answer in this form; `trouble` is what went wrong after it was found.
    pub(super) fn answer(
        self,
        question: &dyn Question,
        result: &TailResult,
        trouble: Option<Error>,
    ) -> Result<Answer, Error> {
        let mut report = TailReport::new(question, result);
        report.notes.extend(trouble.as_ref().map(|error| format!("no certificate was written: {error}")));
        let text = match self {
            FormatName::Text => text::result(&report),
            FormatName::Json => json::result(&report)?,
        };
        let exit_code = match result.status {
            Status::Certified => EXIT_CERTIFIED,
            Status::FewerDigits => EXIT_FEWER_DIGITS,
        };
        Ok(Answer { text, exit_code, trouble })
    }
}

impl TailCommand {
    /// Reads the request, checks everything that can be checked, computes, reports.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        match &self.packet {
            PacketCommand::Box(arguments) => arguments.answer(),
            PacketCommand::Cosine(arguments) => arguments.answer(),
            PacketCommand::Bspline(arguments) => arguments.answer(),
            PacketCommand::Piecewise(arguments) => arguments.answer(),
            PacketCommand::Ball(arguments) => arguments.answer(),
            PacketCommand::Well(arguments) => arguments.answer(),
            PacketCommand::Gaussian(arguments) => arguments.answer(),
        }
    }
}

impl TailArguments {
    /// Fills in the options that all packets share.
    fn complete(&self, mut request: TailRequest) -> Result<TailRequest, Error> {
        request.beyond = fields::beyond(Some(&self.beyond))?;
        request.side = self.side.side();
        request.routes = fields::route(&self.route)?;
        request.digits = fields::digits(&self.digits)?;
        request.max_bits = self.max_bits.as_deref().map(fields::max_bits).transpose()?;
        request.time_limit = self.time_limit.as_deref().map(fields::time_limit).transpose()?;
        request.validate()?;
        Ok(request)
    }

    /// A request for a packet other than the box at rest.
    fn request(&self, packet: Box<dyn TailPacket>) -> Result<PacketTail, Error> {
        let mass = fields::exact("mass", &self.mass)?;
        let time = fields::required("time", self.time.as_deref(), "--time 1")?;
        let mut request = PacketTail::new(packet, mass, time);
        request.beyond = fields::beyond(Some(&self.beyond))?;
        request.side = self.side.side();
        request.route = self.route.clone();
        request.digits = fields::digits(&self.digits)?;
        request.max_bits = self.max_bits.as_deref().map(fields::max_bits).transpose()?;
        request.time_limit = self.time_limit.as_deref().map(fields::time_limit).transpose()?;
        request.validate()?;
        Ok(request)
    }

    /// The answer for a packet other than the box at rest.
    fn answer(&self, packet: Box<dyn TailPacket>) -> Result<Answer, Error> {
        if self.scout {
            let wanted = "the quick estimate knows the box at rest only; leave the option out";
            return Err(Error::bad_input("scout", packet.kind(), wanted));
        }
        self.certify(&self.request(packet)?)
    }

    /// The answer for a moving observer of the box.
    fn answer_for_observer(
        &self,
        half_width: ExactInput,
        boost: Boost,
        boost_read: (&'static str, String),
    ) -> Result<Answer, Error> {
        if self.scout {
            let wanted = "the quick estimate knows the box at rest only; leave the option out";
            return Err(Error::bad_input("scout", "box", wanted));
        }
        if !matches!(self.side, SideName::Both) {
            let wanted = "for a moving observer both sides count together; leave the option out";
            return Err(Error::bad_input("side", self.side.side().name(), wanted));
        }
        let request = BoostedTail {
            half_width,
            mass: fields::exact("mass", &self.mass)?,
            boost,
            boost_read,
            time: fields::required("time", self.time.as_deref(), "--time 0")?,
            region: fields::boosted_region(&self.beyond)?,
            digits: fields::digits(&self.digits)?,
            route: self.route.clone(),
            max_bits: self.max_bits.as_deref().map(fields::max_bits).transpose()?,
            time_limit: self.time_limit.as_deref().map(fields::time_limit).transpose()?,
        };
        request.validate()?;
        self.certify(&request)
    }

    /// Computes, reports, writes the certificate.
    fn certify(&self, request: &dyn Question) -> Result<Answer, Error> {
        if let Some(path) = &self.certificate {
            certificate::check_writable(path)?;
        }
        let result = request.certify()?;
        // A computation may have taken hours: it is printed even if its certificate fails.
        let trouble = self.write_certificate(request, &result).err();
        self.format.answer(request, &result, trouble)
    }

    fn write_certificate(&self, request: &dyn Question, result: &TailResult) -> Result<(), Error> {
        match &self.certificate {
            Some(path) => Certificate::new(request, result)?.write(path),
            None => Ok(()),
        }
    }

    fn estimate(&self, request: &TailRequest) -> Result<Answer, Error> {
        let scout = scout::estimate(request)?;
        let inputs = request.inputs();
        Ok(Answer::plain(match self.format {
            FormatName::Text => text::scout(&request.words(), &inputs, &scout),
            FormatName::Json => json::scout(&request.formula(), &inputs, &scout)?,
        }))
    }
}
