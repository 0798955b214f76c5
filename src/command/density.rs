//! `coneproof density box`.

use super::{Answer, fields};
use crate::error::{EXIT_CERTIFIED, EXIT_FEWER_DIGITS, Error};
use crate::packets::BoxPacket;
use crate::quantities::density::DensityRequest;
use crate::quantities::tail::Status;
use crate::report::points;
use clap::{Args, Subcommand, ValueEnum};

/// `coneproof density`.
#[derive(Args)]
#[command(arg_required_else_help = false)]
pub(super) struct DensityCommand {
    #[command(subcommand)]
    packet: PacketCommand,
}

#[derive(Subcommand)]
enum PacketCommand {
    /// Constant amplitude for |x| <= half-width, zero elsewhere
    Box(BoxArguments),
}

#[derive(Args)]
#[command(after_help = AFTER_HELP)]
struct BoxArguments {
    /// Half of the box's length, above 0
    #[arg(long, value_name = "A", allow_hyphen_values = true)]
    half_width: Option<String>,
    /// Mass, not negative
    #[arg(long, value_name = "M", default_value = "1", allow_hyphen_values = true)]
    mass: String,
    /// Time since the packet was released, of either sign
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    time: Option<String>,
    /// A position; may be given many times
    #[arg(long, value_name = "X", allow_hyphen_values = true)]
    at: Vec<String>,
    /// Relative digits of the density (of both parts of the amplitude with --amplitude)
    #[arg(long, value_name = "D", default_value = "15", allow_hyphen_values = true)]
    digits: String,
    /// Show the complex amplitude psi(x, t) as well
    #[arg(long)]
    amplitude: bool,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
}

/// Form of the answer.
#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum FormatName {
    Text,
    Json,
}

const AFTER_HELP: &str = "\
Numbers are read exactly: 2, 0.1 (one tenth), 2.5e-9, 1/3. Units have hbar = c = 1.
At x = ±half-width ± time the density is unbounded: the answer says so instead of giving a number.

Examples:
  coneproof density box --half-width 1 --time 5 --at 9/2 --at 11/2
  coneproof density box --half-width 1 --mass 0 --time 1/2 --at 0 --amplitude --format json";

impl DensityCommand {
    /// Reads the request, computes, reports.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let PacketCommand::Box(arguments) = &self.packet;
        let half_width = fields::required("half-width", arguments.half_width.as_deref(), "--half-width 1")?;
        let packet = BoxPacket::new(half_width)?;
        let mass = fields::exact("mass", &arguments.mass)?;
        let time = fields::required("time", arguments.time.as_deref(), "--time 1")?;
        let at = arguments.at.iter().map(|text| fields::exact("at", text)).collect::<Result<_, _>>()?;
        let mut request = DensityRequest::new(packet, mass, time, at)?;
        request.digits = fields::digits(&arguments.digits)?;
        request.amplitude = arguments.amplitude;
        let result = request.certify()?;
        let text = match arguments.format {
            FormatName::Text => points::density_text(&request, &result),
            FormatName::Json => points::density_json(&request, &result)?,
        };
        Ok(Answer { text, exit_code: exit_code(result.status()), trouble: None })
    }
}

/// The exit code of a status.
pub(super) fn exit_code(status: Status) -> u8 {
    match status {
        Status::Certified => EXIT_CERTIFIED,
        Status::FewerDigits => EXIT_FEWER_DIGITS,
    }
}
