//! The library's errors and the exit codes of the program.

use std::fmt;

/// What can go wrong, apart from a result with fewer digits than asked (which is a result).
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Error {
    /// A field of the request cannot be used.
    BadInput {
        /// The field, as the user writes it, for example `half-width`.
        field: String,
        /// What was given.
        was: String,
        /// What would be right.
        wanted: String,
    },
    /// A field of the request is needed and was not given.
    Missing {
        /// The field, as the user writes it.
        field: String,
        /// What would be right.
        wanted: String,
    },
    /// A file could not be written or read.
    File {
        /// The path as given.
        path: String,
        /// What was attempted, for example `write`.
        action: String,
        /// The system's reason.
        reason: String,
    },
    /// Two independent routes exclude each other: a defect of this program, never an answer.
    RoutesDisagree {
        /// Each route's name with its lower and upper bound.
        intervals: Vec<(String, String, String)>,
    },
    /// Something that the proofs exclude has happened: a defect of this program.
    Internal {
        /// What was found.
        found: String,
    },
}

impl Error {
    /// A refusal of one field; what was given is shortened and made printable on one line.
    pub fn bad_input(field: &str, was: impl fmt::Display, wanted: &str) -> Error {
        Error::BadInput { field: field.to_owned(), was: printable(&was.to_string()), wanted: wanted.to_owned() }
    }

    /// A file that cannot be used; `action` completes "cannot ...".
    pub fn file(action: &str, path: impl fmt::Display, reason: impl fmt::Display) -> Error {
        Error::File { path: printable(&path.to_string()), action: action.to_owned(), reason: reason.to_string() }
    }

    /// The process exit code: 2 for bad input and files, 4 for internal faults.
    pub fn exit_code(&self) -> u8 {
        match self {
            Error::BadInput { .. } | Error::Missing { .. } | Error::File { .. } => EXIT_BAD_INPUT,
            Error::RoutesDisagree { .. } | Error::Internal { .. } => EXIT_INTERNAL_FAULT,
        }
    }
}

/// The text on one line without control characters, its end cut off if it is very long.
fn printable(text: &str) -> String {
    const SHOWN: usize = 60;
    let mut shown = String::new();
    for character in text.chars().take(SHOWN) {
        if character.is_control() { shown.extend(character.escape_default()) } else { shown.push(character) }
    }
    if text.chars().count() > SHOWN {
        shown.push('…');
    }
    shown
}

/// The answer is certified to the digits asked.
pub const EXIT_CERTIFIED: u8 = 0;
/// A claim is refuted (`check` only).
pub const EXIT_REFUTED: u8 = 1;
/// The request cannot be used, or a file cannot be written.
pub const EXIT_BAD_INPUT: u8 = 2;
/// The interval is certified, but narrower digits were asked than could be reached.
pub const EXIT_FEWER_DIGITS: u8 = 3;
/// The program contradicted itself; no answer is given.
pub const EXIT_INTERNAL_FAULT: u8 = 4;

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Error::BadInput { field, was, wanted } => write!(f, "{field}: \"{was}\" cannot be used; {wanted}"),
            Error::Missing { field, wanted } => write!(f, "{field} is missing; {wanted}"),
            Error::File { path, action, reason } => write!(f, "cannot {action} \"{path}\": {reason}"),
            Error::RoutesDisagree { intervals } => {
                write!(f, "internal fault: independent routes exclude each other, no answer is given")?;
                intervals.iter().try_for_each(|(name, low, high)| write!(f, "\n  {name:<9} [{low}, {high}]"))
            }
            Error::Internal { found } => write!(f, "internal fault: {found}; no answer is given"),
        }
    }
}

impl std::error::Error for Error {}
