//! What the argument parser refuses, said in the program's own style; and help.

use super::{Answer, CommandLine};
use crate::error::Error;
use clap::error::{ContextKind, ContextValue, ErrorKind};
use clap::{Command, CommandFactory};
use std::ffi::OsString;

/// Whether the arguments ask for JSON, even if they cannot be used otherwise.
pub(super) fn asks_for_json(args: &[OsString]) -> bool {
    let joined = args.iter().any(|arg| arg == "--format=json");
    joined || args.windows(2).any(|pair| pair[0] == "--format" && pair[1] == "json")
}

/// Help and version as answers, everything else as an error of one sentence.
pub(super) fn answer(refusal: clap::Error, args: &[OsString]) -> Result<Answer, Error> {
    match refusal.kind() {
        ErrorKind::DisplayHelp | ErrorKind::DisplayVersion => {
            Ok(Answer::plain(format!("{}\n", refusal.render().to_string().trim_end())))
        }
        _ => Err(sentence(&refusal, args)),
    }
}

fn sentence(refusal: &clap::Error, args: &[OsString]) -> Error {
    let named = |kind| context(refusal, kind).unwrap_or_default();
    let argument = named(ContextKind::InvalidArg);
    let reached = Reached::by(args);
    match refusal.kind() {
        ErrorKind::InvalidSubcommand => {
            let wanted = format!("known are: {}", reached.choices());
            Error::bad_input(reached.field(), named(ContextKind::InvalidSubcommand), &wanted)
        }
        ErrorKind::MissingSubcommand | ErrorKind::DisplayHelpOnMissingArgumentOrSubcommand => {
            let wanted = format!("name one of: {}; {}", reached.choices(), reached.help());
            Error::Missing { field: reached.field().to_owned(), wanted }
        }
        ErrorKind::UnknownArgument => unknown_argument(&argument, &named(ContextKind::SuggestedArg), args, &reached),
        ErrorKind::InvalidValue => {
            unknown_value(&argument, &named(ContextKind::InvalidValue), &named(ContextKind::ValidValue))
        }
        ErrorKind::TooManyValues => {
            Error::bad_input(&field(&argument), named(ContextKind::InvalidValue), "it takes no value")
        }
        ErrorKind::ArgumentConflict => conflict(&argument, &named(ContextKind::PriorArg)),
        ErrorKind::InvalidUtf8 => not_text(args),
        _ => {
            let rendered = refusal.render().to_string();
            let first = rendered.lines().next().unwrap_or_default().trim_start_matches("error: ");
            Error::bad_input("arguments", first, &reached.help())
        }
    }
}

/// The command that the first words name, as far as they are known.
struct Reached {
    command: Command,
    words: Vec<String>,
}

impl Reached {
    fn by(args: &[OsString]) -> Reached {
        let mut reached = Reached { command: CommandLine::command(), words: vec!["coneproof".to_owned()] };
        for word in args.iter().skip(1).map_while(|arg| arg.to_str()) {
            let Some(next) = reached.command.find_subcommand(word).cloned() else { break };
            reached = Reached { command: next, words: reached.words };
            reached.words.push(word.to_owned());
        }
        reached
    }

    /// What the next word would name.
    fn field(&self) -> &'static str {
        if self.words.len() == 1 { "command" } else { "packet" }
    }

    fn choices(&self) -> String {
        let names = self.command.get_subcommands().map(Command::get_name).filter(|name| *name != "help");
        names.collect::<Vec<_>>().join(", ")
    }

    fn options(&self) -> String {
        let options = self.command.get_arguments().filter_map(|arg| arg.get_long()).filter(|name| *name != "help");
        options.map(|name| format!("--{name}")).collect::<Vec<_>>().join(", ")
    }

    fn help(&self) -> String {
        format!("{} --help shows what it takes", self.words.join(" "))
    }
}

fn unknown_argument(argument: &str, suggested: &str, args: &[OsString], reached: &Reached) -> Error {
    if argument.starts_with('-') {
        let (name, options) = (reached.words.join(" "), reached.options());
        // A suggestion is worth its words only for a slip of the keyboard.
        let close = argument.len() > 3 && suggested.starts_with(argument.get(..4).unwrap_or(argument));
        let hint = if close { format!("did you mean {suggested}? ") } else { String::new() };
        return Error::bad_input("option", argument, &format!("{hint}{name} takes {options}"));
    }
    // In `--time --digits 5` the word `--digits` was taken as the time, and 5 is left over.
    let is_option = |arg: &OsString| arg.as_encoded_bytes().starts_with(b"--");
    let robbed = args.windows(3).find(|w| is_option(&w[0]) && is_option(&w[1]) && w[2] == argument);
    match robbed.and_then(|window| window[0].to_str()) {
        Some(option) => Error::Missing { field: field(option), wanted: format!("give a value after {option}") },
        None if reached.options().is_empty() => Error::bad_input("arguments", argument, &reached.help()),
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

/// Bytes that are not UTF-8, with the option that they follow.
fn not_text(args: &[OsString]) -> Error {
    let mut option = "arguments".to_owned();
    for arg in args.iter().skip(1) {
        match arg.to_str() {
            Some(text) if text.starts_with("--") => option = field(text),
            Some(_) => {}
            // The path of a certificate may be any bytes.
            None if option == "certificate" => {}
            None => {
                let bytes = arg.to_string_lossy();
                let (name, value) = bytes.split_once('=').unwrap_or(("", &bytes));
                let option = if name.starts_with("--") { field(name) } else { option };
                return Error::bad_input(&option, value, "these bytes are not UTF-8: write it as ordinary text");
            }
        }
    }
    Error::bad_input("arguments", "bytes that are not UTF-8", "write them as ordinary text")
}

/// `--half-width <A>` is the field `half-width`, `[NAME]` the field `name`.
fn field(argument: &str) -> String {
    let word = argument.split_whitespace().next().unwrap_or_default();
    let word = word.split('=').next().unwrap_or_default();
    if word.starts_with('-') {
        return word.trim_start_matches('-').to_owned();
    }
    word.trim_matches(|character| "[]<>".contains(character)).to_lowercase()
}

fn context(refusal: &clap::Error, kind: ContextKind) -> Option<String> {
    match refusal.get(kind)? {
        ContextValue::String(text) => Some(text.clone()),
        ContextValue::Strings(texts) => Some(texts.join(", ")),
        _ => None,
    }
}
