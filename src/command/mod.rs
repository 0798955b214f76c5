//! The command line, usable as a function: [`run`].
//!
//! Each command is a module. That of a quantity has the options shared by its packets ([`tail`]);
//! each packet is one file below it with the options of its own. Values are read as text and turned into numbers
//! in [`fields`], so that every refusal names the field, what it was and what would be right;
//! [`usage`] says the same of what `clap` refuses.

/// For the help of every command.
macro_rules! exit_codes {
    () => {
        "Exit codes:
  0  certified to the digits asked; or a scout's estimate, a schema, this help
  2  bad input, or a file that cannot be written: one sentence says what and why
  3  fewer digits than asked: the interval printed is proven, but wider
  4  internal fault: the program contradicted itself and gives no answer"
    };
}

mod check;
mod cite;
mod density;
mod fields;
mod peak;
mod propagator;
mod recheck;
mod schema;
mod tail;
mod usage;

use crate::error::{EXIT_CERTIFIED, Error};
use crate::report::json;
use clap::{Parser, Subcommand};
use std::any::Any;
use std::ffi::OsString;
use std::io::{self, Write};
use std::panic::{self, AssertUnwindSafe};

/// Certified probabilities of finding a free relativistic particle beyond its light cone.
#[derive(Parser)]
#[command(name = "coneproof", version, after_help = AFTER_HELP)]
struct CommandLine {
    #[command(subcommand)]
    task: Task,
}

#[derive(Subcommand)]
enum Task {
    /// The probability of finding a packet outside its light cone
    Tail(tail::TailCommand),
    /// The largest probability over all times, with a proof that none is larger
    Peak(peak::PeakCommand),
    /// The density of finding a packet at given points, inside and outside its light cones
    Density(density::DensityCommand),
    /// The Newton-Wigner propagator, inside and outside the light cone
    Propagator(propagator::PropagatorCommand),
    /// Judge the claims of files: upheld, refuted or open
    Check(check::CheckCommand),
    /// Compute certificates again, trusting nothing in them: confirmed or not
    Recheck(recheck::RecheckCommand),
    /// Cite a certificate: sentence, number, LaTeX, BibTeX, Markdown, interval
    Cite(cite::CiteCommand),
    /// Print the JSON Schema of something that this program writes
    Schema(schema::SchemaCommand),
}

const AFTER_HELP: &str = concat!(
    "\
Examples:
  coneproof tail box --half-width 1 --mass 1 --time 1 --digits 30
  coneproof tail box --help
  coneproof peak box --half-width 1/2 --over time
  coneproof check claims.toml
  coneproof recheck tail.json
  coneproof cite tail.json
  coneproof schema certificate

",
    exit_codes!()
);

/// What a command has to say.
struct Answer {
    /// The text for standard output.
    text: String,
    /// The exit code if it can be printed.
    exit_code: u8,
    /// What went wrong after the answer was found.
    trouble: Option<Error>,
}

/// Runs one command line, the program's name first, and returns the exit code.
///
/// Answers go to `out`; refusals go to `err` as one sentence, and to `out` as a JSON object as well
/// if `--format json` was given. A reader that closes `out` early is no error. A panic below, which
/// would be a defect, is reported as an internal fault.
///
/// ```
/// let (mut out, mut err) = (Vec::new(), Vec::new());
/// let code = coneproof::command::run(["coneproof", "tail", "box", "--digits", "0"], &mut out, &mut err);
/// assert_eq!(code, 2);
/// assert!(String::from_utf8_lossy(&err).contains("half-width is missing"));
/// ```
pub fn run<I>(args: I, out: &mut dyn Write, err: &mut dyn Write) -> u8
where
    I: IntoIterator,
    I::Item: Into<OsString>,
{
    let args: Vec<OsString> = args.into_iter().map(Into::into).collect();
    let answer = match CommandLine::try_parse_from(&args) {
        Ok(CommandLine { task }) => panic::catch_unwind(AssertUnwindSafe(|| task.answer()))
            .unwrap_or_else(|payload| Err(fault(payload.as_ref()))),
        Err(refusal) => usage::answer(refusal, &args),
    };
    match answer {
        Ok(answer) => deliver(&answer, out, err),
        Err(error) => {
            complain(&error, err);
            if usage::asks_for_json(&args) {
                let _ = json::error(&error).map(|object| print(out, &object));
            }
            error.exit_code()
        }
    }
}

impl Task {
    fn answer(&self) -> Result<Answer, Error> {
        match self {
            Task::Tail(tail) => tail.answer(),
            Task::Peak(peak) => peak.answer(),
            Task::Density(density) => density.answer(),
            Task::Propagator(propagator) => propagator.answer(),
            Task::Check(check) => check.answer(),
            Task::Recheck(recheck) => recheck.answer(),
            Task::Cite(cite) => cite.answer(),
            Task::Schema(schema) => Ok(schema.answer()),
        }
    }
}

/// A panic as an internal fault.
fn fault(payload: &(dyn Any + Send)) -> Error {
    let text = payload.downcast_ref::<&str>().map(|text| (*text).to_owned());
    let text = text.or_else(|| payload.downcast_ref::<String>().cloned());
    Error::Internal { found: text.unwrap_or_else(|| "a panic without a message".to_owned()) }
}

fn deliver(answer: &Answer, out: &mut dyn Write, err: &mut dyn Write) -> u8 {
    let printed = print(out, &answer.text);
    let trouble = answer.trouble.iter().chain(printed.as_ref().err());
    trouble.fold(answer.exit_code, |_, error| {
        complain(error, err);
        error.exit_code()
    })
}

/// Prints everything, or as much as the reader wants.
fn print(out: &mut dyn Write, text: &str) -> Result<(), Error> {
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => {
            Err(Error::file("write", "standard output", error.kind()))
        }
        _ => Ok(()),
    }
}

/// One sentence for the user. If even that cannot be written, the exit code still tells.
fn complain(error: &Error, err: &mut dyn Write) {
    let _ = writeln!(err, "coneproof: {error}").and_then(|()| err.flush());
}

impl Answer {
    /// Text asked for, such as help.
    fn plain(text: String) -> Answer {
        Answer { text, exit_code: EXIT_CERTIFIED, trouble: None }
    }
}

#[cfg(test)]
mod tests {
    #[test]
    fn the_options_are_consistent() {
        <super::CommandLine as clap::CommandFactory>::command().debug_assert();
    }
}
