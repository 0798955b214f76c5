//! `coneproof cite`: a certificate in the forms in which a text cites it.

use super::tail::FormatName;
use super::{Answer, fields};
use crate::certificate::Certificate;
use crate::error::Error;
use crate::report::citation::Citation;
use clap::Args;
use std::path::PathBuf;

const AFTER_HELP: &str = "\
The format and the hash of the certificate are checked; coneproof recheck computes its bounds again.

Example:
  coneproof cite tail.json --digits 6

Exit codes:
  0  cited
  2  the file cannot be read, or is no unchanged certificate
  4  internal fault";

/// `coneproof cite`.
#[derive(Args)]
#[command(after_help = AFTER_HELP)]
pub(super) struct CiteCommand {
    /// A certificate
    #[arg(value_name = "FILE")]
    file: Option<PathBuf>,
    /// Most digits of the number, 1 to 10000; never more than are certified [default: all that are certified]
    #[arg(long, value_name = "D", allow_hyphen_values = true)]
    digits: Option<String>,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
}

impl CiteCommand {
    /// Reads the certificate and cites it.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        let wanted = || "give a certificate, such as tail.json".to_owned();
        let missing = || Error::Missing { field: "file".to_owned(), wanted: wanted() };
        let path = self.file.as_deref().ok_or_else(missing)?;
        let digits = self.digits.as_deref().map(fields::digits).transpose()?;
        let citation = Citation::new(&Certificate::read(path)?, digits)?;
        Ok(Answer::plain(match self.format {
            FormatName::Text => citation.text(),
            FormatName::Json => citation.json()?,
        }))
    }
}
