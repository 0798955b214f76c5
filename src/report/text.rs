//! Reports for people: a short block of aligned lines.
//!
//! The value stands alone on its line and is never broken, so that it can be copied at any length;
//! long bounds are broken into lines of [`CHUNK`] characters under each other. A route's bounds of
//! more than [`CHUNK`] characters are shortened in the middle, with the number of characters left
//! out; in full they are in the JSON report.

use super::{CAUTION, DecimalBounds, RouteLine, TailReport};
use crate::quantities::question::Inputs;
use crate::quantities::tail::Status;
use crate::scout::Scout;

/// Characters of a long number on one line.
pub const CHUNK: usize = 60;
/// Width of the column of names.
const COLUMN: usize = 14;
/// Width of sentences beside it.
const SENTENCE: usize = 74;
/// What an estimate is worth.
pub(super) const SCOUT_NOTE: &str = "a double-precision estimate: nothing is proven about its error";

/// A certified result, or one with fewer digits than asked.
pub fn result(report: &TailReport) -> String {
    let mut text = heading(&report.words, &report.inputs);
    text += &entry("digits", &format!("{} asked", report.digits_asked));
    text.push('\n');
    text += &value(report);
    text += &numbers(&report.bounds);
    if let Some(at) = &report.at {
        text += &entry("at time", &format!("from {} to {}", shortened(&at.lower), shortened(&at.upper)));
    }
    for route in &report.routes {
        text.push('\n');
        text += &route_lines(route);
    }
    text.push('\n');
    text += &entry("status", &status(report));
    for note in &report.notes {
        text += &entry("note", note);
    }
    text += &entry("time taken", &duration(report.seconds));
    text += &entry("caution", CAUTION);
    text
}

/// A quick estimate, marked as not certified.
pub fn scout(words: &str, inputs: &Inputs, scout: &Scout) -> String {
    let mut text = heading(words, inputs);
    text.push('\n');
    text += &entry("estimate", &format!("about {} (not certified)", scout.decimal()));
    text.push('\n');
    text += &entry("status", &format!("not certified: {SCOUT_NOTE}"));
    text += &entry("time taken", &duration(scout.seconds));
    text += &entry("caution", CAUTION);
    text
}

fn heading(words: &str, inputs: &Inputs) -> String {
    let mut text = format!("{words}\n");
    text += "Free particle released at time 0, Newton-Wigner position, units with hbar = c = 1\n\n";
    // How an answer is computed is said elsewhere.
    const ELSEWHERE: [&str; 4] = ["digits", "route", "max_bits", "time_limit"];
    for (name, read) in inputs.iter().filter(|(name, _)| !ELSEWHERE.contains(name)) {
        let at_rest = inputs.get("rapidity").or(inputs.get("boost_velocity")).is_none();
        let explained = match (name, read, inputs.get("half_width").filter(|_| at_rest)) {
            ("beyond", "cone", Some(_)) => "cone (a + |t|)",
            _ => read,
        };
        text += &entry(&label(name), &shortened(&one_line(explained)));
    }
    text
}

/// The name of an input with its symbol.
fn label(name: &str) -> String {
    let symbol = match name {
        "half_width" | "radius" => " a",
        "mass" => " m",
        "time" => " t",
        "beyond" => " R",
        "momentum" => " k",
        _ => "",
    };
    let words = if name == "half_width" { "half-width".to_owned() } else { name.replace('_', " ") };
    words + symbol
}

fn value(report: &TailReport) -> String {
    match &report.value {
        None => entry("value", "none: not one digit is certain"),
        // At 1000 digits the value gets a line of its own, ready to be copied.
        Some(value) if value.text.len() > CHUNK => {
            let asked = format!("{} digits, the last one within one unit:", value.digits);
            format!("{}{}\n", entry("value", &asked), value.text)
        }
        Some(value) => entry("value", &value.text),
    }
}

fn status(report: &TailReport) -> String {
    match report.status {
        Status::Certified if report.bounds.lower == report.bounds.upper => "certified: exact".to_owned(),
        Status::Certified => {
            format!("certified: {} relative digits; value within one unit of its last digit", report.digits)
        }
        Status::FewerDigits => format!(
            "fewer digits than asked: {} of {}; the interval is proven all the same",
            report.digits, report.digits_asked
        ),
    }
}

fn numbers(bounds: &DecimalBounds) -> String {
    entry("lower", &bounds.lower) + &entry("upper", &bounds.upper)
}

fn route_lines(route: &RouteLine) -> String {
    let mut text = String::new();
    let mut name = route.name;
    if let Some(bounds) = &route.bounds {
        text += &entry(name, &format!("lower {}", shortened(&bounds.lower)));
        text += &entry("", &format!("upper {}", shortened(&bounds.upper)));
        let effort = format!("{} bits, {} nodes, {}", route.bits, route.nodes, duration(route.seconds));
        text += &entry("", &effort);
        name = "";
    }
    match &route.note {
        Some(note) if route.bounds.is_some() => text += &entry(name, note),
        Some(note) => text += &entry(name, &format!("no bounds: {note}")),
        None => {}
    }
    text
}

/// One name with its content, continued under itself: a long number every [`CHUNK`] characters,
/// sentences at blanks.
pub(super) fn entry(name: &str, content: &str) -> String {
    let lines = if content.contains(' ') { sentence_lines(content) } else { number_lines(content) };
    let labels = std::iter::once(name).chain(std::iter::repeat(""));
    labels.zip(lines).map(|(label, line)| format!("{label:<COLUMN$}{line}\n")).collect()
}

fn number_lines(number: &str) -> Vec<String> {
    let characters: Vec<char> = number.chars().collect();
    characters.chunks(CHUNK).map(|chunk| chunk.iter().collect()).collect()
}

fn sentence_lines(content: &str) -> Vec<String> {
    let mut lines = vec![String::new()];
    for word in content.split(' ') {
        match lines.last_mut() {
            Some(line) if line.is_empty() => line.push_str(word),
            Some(line) if line.chars().count() + 1 + word.chars().count() <= SENTENCE => {
                line.push(' ');
                line.push_str(word);
            }
            _ => lines.push(word.to_owned()),
        }
    }
    lines
}

/// The text with its middle left out if it is longer than a line.
pub(super) fn shortened(text: &str) -> String {
    const HEAD: usize = 24;
    const TAIL: usize = 20;
    let characters: Vec<char> = text.chars().collect();
    if characters.len() <= CHUNK {
        return text.to_owned();
    }
    let (head, tail) = (&characters[..HEAD], &characters[characters.len() - TAIL..]);
    let left_out = characters.len() - HEAD - TAIL;
    format!("{} ({left_out} more) {}", head.iter().collect::<String>(), tail.iter().collect::<String>())
}

/// The text without control characters, which an input may contain as blanks.
pub(super) fn one_line(text: &str) -> String {
    text.chars().map(|character| if character.is_control() { ' ' } else { character }).collect()
}

/// Seconds in a unit that people read easily.
pub(super) fn duration(seconds: f64) -> String {
    if seconds < 1e-3 {
        format!("{:.0} µs", seconds * 1e6)
    } else if seconds < 1.0 {
        format!("{:.2} ms", seconds * 1e3)
    } else {
        format!("{seconds:.2} s")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn long_numbers_are_broken_without_loss() {
        let number: String = "0.".chars().chain(('1'..='9').cycle().take(150)).collect();
        let text = entry("lower", &number);
        assert!(text.lines().all(|line| line.chars().count() <= COLUMN + CHUNK));
        let joined: String = text.lines().map(|line| line[COLUMN..].to_owned()).collect();
        assert_eq!(joined, number);
    }

    #[test]
    fn shortening_counts_what_it_leaves_out() {
        let number = "7".repeat(100);
        assert!(shortened(&number).contains("(56 more)"));
        assert_eq!(shortened("0.5"), "0.5");
    }

    #[test]
    fn durations_have_fitting_units() {
        assert_eq!(duration(0.000_25), "250 µs");
        assert_eq!(duration(0.25), "250.00 ms");
        assert_eq!(duration(2.5), "2.50 s");
    }
}
