//! `coneproof peak PACKET --over time`: the largest value over all times.

use super::tail::FormatName;
use super::{Answer, fields};
use crate::certificate::{self, Certificate};
use crate::error::Error;
use crate::packets::BoxPacket;
use crate::quantities::peak::PeakRequest;
use crate::quantities::question::Question;
use clap::{Args, Subcommand, ValueEnum};
use std::path::PathBuf;

const AFTER_HELP: &str = concat!(
    "\
Example:
  coneproof peak box --half-width 1/2 --over time --digits 15

",
    exit_codes!()
);

/// `coneproof peak`.
#[derive(Args)]
#[command(arg_required_else_help = false, after_help = AFTER_HELP)]
pub(super) struct PeakCommand {
    #[command(subcommand)]
    packet: PacketCommand,
}

#[derive(Subcommand)]
enum PacketCommand {
    /// The box, beyond its light cone, both sides
    Box(BoxArguments),
}

#[derive(Clone, Copy, ValueEnum)]
enum Over {
    /// All times; the bracket of the maximum is certified too
    Time,
}

#[derive(Args)]
#[command(after_help = AFTER_HELP)]
struct BoxArguments {
    /// Half of the box's length, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    half_width: Option<String>,
    /// Mass, above 0
    #[arg(long, value_name = "M", default_value = "1", allow_hyphen_values = true)]
    mass: String,
    /// What the value is largest over
    #[arg(long, value_enum, value_name = "PARAMETER", default_value = "time")]
    over: Over,
    /// Relative digits of the largest value, 1 to 200
    #[arg(long, value_name = "D", default_value = "15", allow_hyphen_values = true)]
    digits: String,
    /// Longest time to spend, in seconds
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    time_limit: Option<String>,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
    /// Write the answer with everything that a re-check needs to this file
    #[arg(long, value_name = "FILE")]
    certificate: Option<PathBuf>,
}

impl PeakCommand {
    /// Finds, proves and reports the maximum.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let PacketCommand::Box(arguments) = &self.packet;
        arguments.answer()
    }
}

impl BoxArguments {
    fn answer(&self) -> Result<Answer, Error> {
        let Over::Time = self.over;
        let half_width = fields::required("half-width", self.half_width.as_deref(), "--half-width 1")?;
        let mut request = PeakRequest::new(BoxPacket::new(half_width)?, fields::exact("mass", &self.mass)?)?;
        request.digits = fields::digits(&self.digits)?;
        request.time_limit = self.time_limit.as_deref().map(fields::time_limit).transpose()?;
        request.validate()?;
        if let Some(path) = &self.certificate {
            certificate::check_writable(path)?;
        }
        let result = Question::certify(&request)?;
        let trouble = match &self.certificate {
            Some(path) => Certificate::new(&request, &result)?.write(path).err(),
            None => None,
        };
        self.format.answer(&request, &result, trouble)
    }
}
