//! What the argument parser refuses, said in the program's own style; and help.

use super::{Answer, CommandLine};
use crate::error::Error;
use clap::CommandFactory;
use clap::error::{ContextKind, ContextValue, ErrorKind};
use std::ffi::OsString;

/// Whether the arguments ask for JSON, even if they cannot be used otherwise.
pub(super) fn asks_for_json(args: &[OsString]) -> bool {
    let joined = args.iter().any(|arg| arg == "--format=json");
    joined || args.windows(2).any(|pair| pair[0] == "--format" && pair[1] == "json")
}

/// Help and version as answers, everything else as an error of one sentence.
pub(super) fn answer(refusal: clap::Error, args: &[OsString]) -> Result<Answer, Error> {
    match refusal.kind() {
        ErrorKind::DisplayHelp | ErrorKind::DisplayVersion => Ok(Answer::plain(refusal.render().to_string())),
        _ => Err(sentence(&refusal, args)),
    }
}

fn sentence(refusal: &clap::Error, args: &[OsString]) -> Error {
    let named = |kind| context(refusal, kind).unwrap_or_default();
    let argument = named(ContextKind::InvalidArg);
    match refusal.kind() {
        ErrorKind::InvalidSubcommand => unknown_word(&named(ContextKind::InvalidSubcommand), args),
        ErrorKind::MissingSubcommand | ErrorKind::DisplayHelpOnMissingArgumentOrSubcommand => missing_word(args),
        ErrorKind::UnknownArgument => unknown_argument(&argument, &named(ContextKind::SuggestedArg), args),
        ErrorKind::InvalidValue => {
            unknown_value(&argument, &named(ContextKind::InvalidValue), &named(ContextKind::ValidValue))
        }
        ErrorKind::TooManyValues => {
            Error::bad_input(&field(&argument), named(ContextKind::InvalidValue), "it takes no value")
        }
        ErrorKind::ArgumentConflict => conflict(&argument, &named(ContextKind::PriorArg)),
        ErrorKind::InvalidUtf8 => {
            Error::bad_input("arguments", "bytes that are not UTF-8", "write them as ordinary text")
        }
        _ => {
            let rendered = refusal.render().to_string();
            let first = rendered.lines().next().unwrap_or_default().trim_start_matches("error: ");
            Error::bad_input("arguments", first, HELP)
        }
    }
}

const HELP: &str = "coneproof tail box --help shows the options";

/// A quantity or packet that does not exist: the first word is the quantity.
fn unknown_word(word: &str, args: &[OsString]) -> Error {
    if args.get(1).is_some_and(|first| first == word) {
        return Error::bad_input("quantity", word, &format!("known are: {}", subcommands(&CommandLine::command())));
    }
    Error::bad_input("packet", word, &format!("known are: {}", packets()))
}

fn missing_word(args: &[OsString]) -> Error {
    let (field, known) = match args.len() {
        0 | 1 => ("quantity", subcommands(&CommandLine::command())),
        _ => ("packet", packets()),
    };
    Error::Missing { field: field.to_owned(), wanted: format!("name one of: {known}; {HELP}") }
}

fn unknown_argument(argument: &str, suggested: &str, args: &[OsString]) -> Error {
    if argument.starts_with('-') {
        let hint = if suggested.is_empty() { String::new() } else { format!("did you mean {suggested}? ") };
        return Error::bad_input("option", argument, &format!("{hint}{HELP}"));
    }
    // In `--time --digits 5` the word `--digits` was taken as the time, and 5 is left over.
    let is_option = |arg: &OsString| arg.as_encoded_bytes().starts_with(b"--");
    let robbed = args.windows(3).find(|w| is_option(&w[0]) && is_option(&w[1]) && w[2] == argument);
    match robbed.and_then(|window| window[0].to_str()) {
        Some(option) => Error::Missing { field: field(option), wanted: format!("give a value after {option}") },
        None => Error::bad_input("arguments", argument, "a value follows its option, such as --time 1"),
    }
}

fn unknown_value(argument: &str, was: &str, known: &str) -> Error {
    if !was.is_empty() {
        return Error::bad_input(&field(argument), was, &format!("give one of: {known}"));
    }
    let choice = if known.is_empty() { String::new() } else { format!(", one of: {known}") };
    Error::Missing { field: field(argument), wanted: format!("give a value: {argument}{choice}") }
}

fn conflict(argument: &str, prior: &str) -> Error {
    let field = field(argument);
    if argument == prior {
        return Error::bad_input(&field, format!("--{field} ... --{field}"), "give it only once");
    }
    Error::bad_input(&field, format!("--{field}"), &format!("it does not go together with {prior}"))
}

/// `--half-width <A>` is the field `half-width`.
fn field(argument: &str) -> String {
    argument.split_whitespace().next().unwrap_or_default().trim_start_matches('-').to_owned()
}

fn packets() -> String {
    CommandLine::command().find_subcommand("tail").map(subcommands).unwrap_or_default()
}

fn subcommands(command: &clap::Command) -> String {
    let names: Vec<&str> = command.get_subcommands().map(clap::Command::get_name).filter(|n| *n != "help").collect();
    names.join(", ")
}

fn context(refusal: &clap::Error, kind: ContextKind) -> Option<String> {
    match refusal.get(kind)? {
        ContextValue::String(text) => Some(text.clone()),
        ContextValue::Strings(texts) => Some(texts.join(", ")),
        _ => None,
    }
}
