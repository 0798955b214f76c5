//! `coneproof schema`: the JSON Schemas of what the program writes, the files of `schemas/`.

use super::Answer;
use clap::{Args, ValueEnum};

const AFTER_HELP: &str = "\
Example:
  coneproof schema certificate > certificate.schema.json";

/// `coneproof schema`.
#[derive(Args)]
#[command(after_help = AFTER_HELP)]
pub(super) struct SchemaCommand {
    /// Which schema (JSON Schema, draft 2020-12)
    #[arg(value_enum)]
    name: Option<SchemaName>,
}

#[derive(Clone, Copy, ValueEnum)]
enum SchemaName {
    /// What `tail PACKET --format json` prints
    TailResult,
    /// What `tail PACKET --scout --format json` prints
    TailEstimate,
    /// What `--certificate FILE` writes
    Certificate,
    /// What `--format json` prints when something is wrong
    Error,
}

impl SchemaCommand {
    /// The schema; without a name, the list of names.
    pub(super) fn answer(&self) -> Answer {
        Answer::plain(match self.name {
            Some(name) => name.text().to_owned(),
            None => SchemaName::value_variants().iter().map(SchemaName::line).collect(),
        })
    }
}

impl SchemaName {
    fn text(self) -> &'static str {
        match self {
            SchemaName::TailResult => include_str!("../../schemas/tail-result.schema.json"),
            SchemaName::TailEstimate => include_str!("../../schemas/tail-estimate.schema.json"),
            SchemaName::Certificate => include_str!("../../schemas/certificate.schema.json"),
            SchemaName::Error => include_str!("../../schemas/error.schema.json"),
        }
    }

    /// The name on a line.
    fn line(&self) -> String {
        self.to_possible_value().map_or(String::new(), |value| format!("{}\n", value.get_name()))
    }
}
