//! `coneproof propagator`.

use super::density::{FormatName, exit_code};
use super::{Answer, fields};
use crate::error::Error;
use crate::quantities::propagator::{Dimension, PropagatorRequest};
use crate::report::points;
use clap::Args;

/// `coneproof propagator`.
#[derive(Args)]
#[command(after_help = AFTER_HELP)]
pub(super) struct PropagatorCommand {
    /// Dimension of space: 1, 2 or 3
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    dimension: Option<String>,
    /// Mass, not negative
    #[arg(long, value_name = "M", default_value = "1", allow_hyphen_values = true)]
    mass: String,
    /// Time since the particle was at the origin, of either sign
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    time: Option<String>,
    /// A position, or distance from the origin in two and three dimensions; may be given many times
    #[arg(long, value_name = "X", allow_hyphen_values = true)]
    at: Vec<String>,
    /// Relative digits of the real and of the imaginary part
    #[arg(long, value_name = "D", default_value = "15", allow_hyphen_values = true)]
    digits: String,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
}

const AFTER_HELP: &str = "\
Numbers are read exactly: 2, 0.1 (one tenth), 2.5e-9, 1/3. Units have hbar = c = 1.
On the light cone |x| = |time| the propagator is singular: such a position is refused.

Examples:
  coneproof propagator --dimension 3 --time 1 --at 2
  coneproof propagator --dimension 1 --time 5 --at 0 --at 9/2 --format json";

impl PropagatorCommand {
    /// Reads the request, computes, reports.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let dimension = dimension(self.dimension.as_deref())?;
        let mass = fields::exact("mass", &self.mass)?;
        let time = fields::required("time", self.time.as_deref(), "--time 1")?;
        let at = self.at.iter().map(|text| fields::exact("at", text)).collect::<Result<_, _>>()?;
        let mut request = PropagatorRequest::new(dimension, mass, time, at)?;
        request.digits = fields::digits(&self.digits)?;
        let result = request.certify()?;
        let text = match self.format {
            FormatName::Text => points::propagator_text(&request, &result),
            FormatName::Json => points::propagator_json(&request, &result)?,
        };
        Ok(Answer { text, exit_code: exit_code(result.status()), trouble: None })
    }
}

fn dimension(text: Option<&str>) -> Result<Dimension, Error> {
    match text.map(str::trim) {
        Some("1") => Ok(Dimension::One),
        Some("2") => Ok(Dimension::Two),
        Some("3") => Ok(Dimension::Three),
        Some(other) => Err(Error::bad_input("dimension", other, "give 1, 2 or 3")),
        None => Err(Error::Missing { field: "dimension".to_owned(), wanted: "give 1, 2 or 3".to_owned() }),
    }
}
