//! `coneproof recheck`: certificates computed again.

use super::Answer;
use super::tail::FormatName;
use crate::certificate::recheck::{self, Recheck, Verdict};
use crate::error::{EXIT_BAD_INPUT, EXIT_CERTIFIED, EXIT_REFUTED, Error};
use crate::report;
use clap::Args;
use rayon::prelude::*;
use std::io::{IsTerminal, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicUsize, Ordering};

const AFTER_HELP: &str = "\
Nothing in a certificate is trusted: its hash is compared, its question is built anew from its inputs and computed by
every route to more digits than it states, and every bound is compared with what is found.

Examples:
  coneproof recheck tail.json
  coneproof recheck results --format json

Exit codes:
  0  all certificates are confirmed
  1  at least one certificate is not confirmed: the reasons name what is wrong
  2  a file cannot be read, or is no certificate
  4  internal fault: the program contradicted itself and gives no verdict";

/// `coneproof recheck`.
#[derive(Args)]
#[command(after_help = AFTER_HELP)]
pub(super) struct RecheckCommand {
    /// Certificates, or directories: every file in them whose name ends in .json
    #[arg(value_name = "FILE")]
    files: Vec<PathBuf>,
    /// Form of the answer
    #[arg(long, value_enum, value_name = "FORMAT", default_value = "text")]
    format: FormatName,
}

impl RecheckCommand {
    /// Checks all certificates side by side and reports in the order given.
    pub(super) fn answer(&self) -> Result<Answer, Error> {
        if self.files.is_empty() {
            let wanted = "give at least one certificate or directory, such as tail.json";
            return Err(Error::Missing { field: "file".to_owned(), wanted: wanted.to_owned() });
        }
        let mut files: Vec<PathBuf> = Vec::new();
        for path in &self.files {
            if path.is_dir() { files.extend(certificates_in(path)?) } else { files.push(path.clone()) }
        }
        let progress = Progress::new(files.len());
        let one = |path: &PathBuf| {
            let found = recheck::file(path);
            progress.step();
            found
        };
        let list: Vec<Recheck> = files.par_iter().map(one).collect();
        progress.end();
        let text = match self.format {
            FormatName::Text => report::recheck::text(&list),
            FormatName::Json => report::recheck::json(&list)?,
        };
        Ok(Answer { text, exit_code: exit_code(&list), trouble: None })
    }
}

/// The certificates of a directory in the order of their names.
fn certificates_in(directory: &Path) -> Result<Vec<PathBuf>, Error> {
    let failure = |error: std::io::Error| Error::file("read", directory.display(), error.kind());
    let mut files = Vec::new();
    for found in std::fs::read_dir(directory).map_err(failure)? {
        let path = found.map_err(failure)?.path();
        if path.extension().is_some_and(|extension| extension == "json") && !path.is_dir() {
            files.push(path);
        }
    }
    if files.is_empty() {
        let reason = "it has no files whose names end in .json; give a directory of certificates";
        return Err(Error::file("use", directory.display(), reason));
    }
    files.sort();
    Ok(files)
}

fn exit_code(list: &[Recheck]) -> u8 {
    let any = |verdict: Verdict| list.iter().any(|one| one.verdict == verdict);
    if any(Verdict::Unreadable) {
        EXIT_BAD_INPUT
    } else if any(Verdict::NotConfirmed) {
        EXIT_REFUTED
    } else {
        EXIT_CERTIFIED
    }
}

/// A line with counts for someone who waits at a terminal; nothing elsewhere.
struct Progress {
    total: usize,
    done: AtomicUsize,
    shown: bool,
}

impl Progress {
    fn new(total: usize) -> Progress {
        Progress { total, done: AtomicUsize::new(0), shown: total > 1 && std::io::stderr().is_terminal() }
    }

    fn step(&self) {
        let done = self.done.fetch_add(1, Ordering::Relaxed) + 1;
        if self.shown {
            // The verdicts do not depend on it.
            let _ = write!(std::io::stderr(), "\r{done} of {} certificates", self.total);
        }
    }

    fn end(&self) {
        if self.shown {
            let _ = writeln!(std::io::stderr());
        }
    }
}
