//! `coneproof tail PACKET`: the options that all packets share, and the answer.
//!
//! A further packet is one file beside [`box_packet`] and one line in [`PacketCommand`].

mod box_packet;

use super::{Answer, fields};
use crate::certificate::{self, Certificate};
use crate::error::{EXIT_CERTIFIED, EXIT_FEWER_DIGITS, Error};
use crate::quantities::question::Question;
use crate::quantities::tail::{RouteChoice, Side, Status, TailRequest, TailResult};
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
    /// Which of the two unrelated computations runs; with both, their intervals must meet
    #[arg(long, value_enum, value_name = "ROUTE", default_value = "both")]
    route: RouteName,
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

#[derive(Clone, Copy, ValueEnum)]
enum RouteName {
    Kernel,
    Spectral,
    Both,
}

#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
enum FormatName {
    Text,
    Json,
}

impl TailCommand {
    /// Reads the request, checks everything that can be checked, computes, reports.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let (arguments, request) = match &self.packet {
            PacketCommand::Box(arguments) => (&arguments.common, arguments.request()?),
        };
        if arguments.scout {
            return arguments.estimate(&request);
        }
        if let Some(path) = &arguments.certificate {
            certificate::check_writable(path)?;
        }
        arguments.certify(&request)
    }
}

impl TailArguments {
    /// Fills in the options that all packets share.
    fn complete(&self, mut request: TailRequest) -> Result<TailRequest, Error> {
        request.beyond = fields::beyond(Some(&self.beyond))?;
        request.side = match self.side {
            SideName::Left => Side::Left,
            SideName::Right => Side::Right,
            SideName::Both => Side::Both,
        };
        request.routes = match self.route {
            RouteName::Kernel => RouteChoice::Kernel,
            RouteName::Spectral => RouteChoice::Spectral,
            RouteName::Both => RouteChoice::Both,
        };
        request.digits = fields::digits(&self.digits)?;
        request.max_bits = self.max_bits.as_deref().map(fields::max_bits).transpose()?;
        request.time_limit = self.time_limit.as_deref().map(fields::time_limit).transpose()?;
        request.validate()?;
        Ok(request)
    }

    fn certify(&self, request: &TailRequest) -> Result<Answer, Error> {
        let result = request.certify()?;
        // A computation may have taken hours: it is printed even if its certificate fails.
        let trouble = self.write_certificate(request, &result).err();
        let mut report = TailReport::new(request, &result);
        report.notes.extend(trouble.as_ref().map(|error| format!("no certificate was written: {error}")));
        let text = match self.format {
            FormatName::Text => text::result(&report),
            FormatName::Json => json::result(&report)?,
        };
        let exit_code = match result.status {
            Status::Certified => EXIT_CERTIFIED,
            Status::FewerDigits => EXIT_FEWER_DIGITS,
        };
        Ok(Answer { text, exit_code, trouble })
    }

    fn write_certificate(&self, request: &TailRequest, result: &TailResult) -> Result<(), Error> {
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
