//! `coneproof check`: verdicts on the claims of files.

use super::{Answer, fields};
use crate::claims::file::{self, Entry};
use crate::claims::judge::{self, Judgement, Limits, Verdict};
use crate::error::{EXIT_BAD_INPUT, EXIT_CERTIFIED, EXIT_FEWER_DIGITS, EXIT_REFUTED, Error};
use crate::report::claims;
use clap::{Args, ValueEnum};
use rayon::prelude::*;
use std::path::PathBuf;

const AFTER_HELP: &str = "\
A claims file (TOML; JSON with the same members if its name ends in .json):
  [[claim]]
  name   = \"abstract\"
  where  = \"p. 1, line 9\"
  packet = { kind = \"box\", half-width = \"7/10\" }
  mass   = \"1\"
  time   = \"0.6984\"
  region = \"beyond cone\"
  says   = \"about 3%\"

Example:
  coneproof check claims.toml --format json

Exit codes:
  0  all claims are upheld
  1  at least one claim is refuted
  2  a file or a claim cannot be used
  3  at least one claim is open or unclear, none refuted
  4  internal fault: the program contradicted itself and gives no verdict";

/// `coneproof check`.
#[derive(Args)]
#[command(after_help = AFTER_HELP)]
pub(super) struct CheckCommand {
    /// Claims files
    #[arg(value_name = "FILE")]
    files: Vec<PathBuf>,
    /// Most relative digits that are tried for one claim, 1 to 10000 [default: 120]
    #[arg(long, value_name = "D", allow_hyphen_values = true)]
    digits: Option<String>,
    /// Longest time for one claim, in seconds
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    time_limit: Option<String>,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
}

#[derive(Clone, Copy, ValueEnum)]
enum FormatName {
    Text,
    Json,
    Junit,
}

impl CheckCommand {
    /// Reads all files, judges all claims side by side, reports.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        if self.files.is_empty() {
            let wanted = "give at least one claims file, such as claims.toml";
            return Err(Error::Missing { field: "file".to_owned(), wanted: wanted.to_owned() });
        }
        let limits = Limits {
            digits: self.digits.as_deref().map(fields::digits).transpose()?,
            time: self.time_limit.as_deref().map(fields::time_limit).transpose()?,
        };
        let mut entries: Vec<(String, Entry)> = Vec::new();
        for path in &self.files {
            let shown = path.display().to_string();
            entries.extend(file::read(path)?.into_iter().map(|entry| (shown.clone(), entry)));
        }
        let judged: Result<Vec<Judgement>, Error> =
            entries.par_iter().map(|(path, entry)| verdict(path, entry, &limits)).collect();
        let judgements = judged?;
        let text = match self.format {
            FormatName::Text => claims::text(&judgements),
            FormatName::Json => claims::json(&judgements)?,
            FormatName::Junit => claims::junit(&judgements),
        };
        Ok(Answer { text, exit_code: exit_code(&judgements), trouble: None })
    }
}

fn verdict(path: &str, entry: &Entry, limits: &Limits) -> Result<Judgement, Error> {
    let place = |line: Option<usize>| line.map_or(path.to_owned(), |line| format!("{path}, line {line}"));
    match entry {
        Ok(claim) => {
            let mut judgement = judge::judge(claim, limits)?;
            if judgement.verdict == Verdict::Bad {
                judgement.reason = format!("{}: {}", place(claim.line), judgement.reason);
            }
            Ok(judgement)
        }
        Err(bad) => Ok(Judgement {
            name: bad.name.clone(),
            place: None,
            says: String::new(),
            verdict: Verdict::Bad,
            bounds: None,
            at: None,
            reason: format!("{}: {}", place(bad.line), bad.reason),
            slips: Vec::new(),
            certificate: None,
        }),
    }
}

fn exit_code(judgements: &[Judgement]) -> u8 {
    let any = |verdict: Verdict| judgements.iter().any(|judgement| judgement.verdict == verdict);
    if any(Verdict::Bad) {
        EXIT_BAD_INPUT
    } else if any(Verdict::Refuted) {
        EXIT_REFUTED
    } else if any(Verdict::Open) || any(Verdict::Unclear) {
        EXIT_FEWER_DIGITS
    } else {
        EXIT_CERTIFIED
    }
}
