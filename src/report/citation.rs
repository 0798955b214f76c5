//! A certificate in the forms in which a text cites it.
//!
//! The number is computed from the stated interval, read back exactly, and never has more digits than are certified.
//! With fewer digits it is the correctly rounded value, provided that both ends of the interval round to the same
//! decimal. If the interval holds a point where rounding changes, no rounded value is certain; the number shown is then
//! within one unit of its last digit of everything in the interval, as for all digits.

use crate::arithmetic::{Interval, decimal, rounding};
use crate::certificate::Certificate;
use crate::error::Error;
use crate::quantities::question::Inputs;
use crate::quantities::restore;
use crate::quantities::tail::MAX_DIGITS;
use rug::Float;
use serde::Serialize;

/// All forms of a citation.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Citation {
    /// One sentence.
    pub sentence: String,
    /// The number with guaranteed digits; `None` if not one digit is certain.
    pub number: Option<String>,
    /// LaTeX for the package siunitx.
    pub latex: String,
    /// An entry for a bibliography.
    pub bibtex: String,
    /// Markdown.
    pub markdown: String,
    /// The interval, `[lower, upper]`.
    pub interval: String,
    /// Lower bound.
    pub lower: String,
    /// Upper bound.
    pub upper: String,
    /// Hash of the certificate.
    pub sha256: String,
}

impl Citation {
    /// The citation with all certified digits, or at most `digits`.
    ///
    /// # Errors
    /// [`Error::BadInput`] or [`Error::Missing`] if the inputs belong to no question or to another one than stated.
    pub fn new(certificate: &Certificate, digits: Option<u32>) -> Result<Citation, Error> {
        let question = restore::question(&certificate.inputs)?;
        if certificate.quantity != question.formula() {
            let wanted = format!("the inputs are those of {}", question.formula());
            return Err(Error::bad_input("quantity", &certificate.quantity, &wanted));
        }
        let (lower, upper, sha256) = (&certificate.lower, &certificate.upper, &certificate.sha256);
        // Who asks for more than is certified gets what is certified.
        let limit = digits.map_or(certificate.digits, |digits| digits.min(certificate.digits)).min(MAX_DIGITS);
        let number = number(lower, upper, limit);
        let inputs = described(&certificate.inputs);
        let (words, formula) = (question.words(), question.formula());
        let program = format!("{} {}", certificate.program, certificate.program_version);
        let interval = format!("[{lower}, {upper}]");
        let subject = subject(&words);
        let stated = number.as_ref().map_or(String::new(), |number| format!(" is {number} and"));
        Ok(Citation {
            sentence: format!(
                "The {subject}, for {inputs}, in units with hbar = c = 1,{stated} lies in {interval} \
                 (certified by {program}, certificate SHA-256 {sha256})."
            ),
            latex: latex(number.as_deref(), &formula, lower, upper, &inputs),
            bibtex: bibtex(&formula, &inputs, lower, upper, sha256, &program),
            markdown: markdown(number.as_deref(), &formula, &inputs, &interval, sha256),
            number,
            interval,
            lower: lower.clone(),
            upper: upper.clone(),
            sha256: sha256.clone(),
        })
    }

    /// All forms, each under its name.
    pub fn text(&self) -> String {
        let number = self.number.as_deref().unwrap_or("none: not one digit is certain");
        let forms = [
            ("Sentence", self.sentence.as_str()),
            ("Number", number),
            ("Interval", &self.interval),
            ("LaTeX (siunitx)", &self.latex),
            ("BibTeX", &self.bibtex),
            ("Markdown", &self.markdown),
        ];
        let blocks: Vec<String> = forms.iter().map(|(name, form)| format!("{name}:\n{form}\n")).collect();
        blocks.join("\n")
    }

    /// All forms as one object of strings.
    ///
    /// # Errors
    /// [`Error::Internal`] if it cannot be written as JSON, which its types exclude.
    pub fn json(&self) -> Result<String, Error> {
        super::json::line(self)
    }
}

/// The quantity in words as part of a sentence, its formula in brackets.
fn subject(words: &str) -> String {
    let mut characters = words.chars();
    let lower_case: String = characters.next().into_iter().flat_map(char::to_lowercase).chain(characters).collect();
    match lower_case.split_once(": ") {
        Some((words, formula)) => format!("{words} ({formula})"),
        None => lower_case,
    }
}

/// The number with at most `digits` digits.
fn number(lower: &str, upper: &str, digits: u32) -> Option<String> {
    let length = u32::try_from(lower.len().max(upper.len())).ok()?;
    let bits = length.saturating_mul(4).saturating_add(128);
    let low = rounding::down(bits, Float::parse(lower).ok()?);
    let high = rounding::up(bits, Float::parse(upper).ok()?);
    let interval = Interval::new(low, high);
    // What is stated is not taken on trust: the bounds themselves have to have the digits.
    let digits = interval.relative_digits(digits).max(1);
    decimal::rounded(&interval, digits)
        .or_else(|| decimal::guaranteed_decimal(&interval, digits).map(|found| found.text))
}

/// The inputs that matter for the value, in words.
fn described(inputs: &Inputs) -> String {
    const ELSEWHERE: [&str; 4] = ["digits", "route", "max_bits", "time_limit"];
    let shown = inputs.iter().filter(|(name, _)| !ELSEWHERE.contains(name));
    let list: Vec<String> =
        shown.map(|(name, text)| format!("{} {}", name.replace('_', " "), super::text::one_line(text))).collect();
    list.join(", ")
}

fn latex(number: Option<&str>, formula: &str, lower: &str, upper: &str, inputs: &str) -> String {
    let value = number.map_or(String::new(), |number| format!("\\num{{{number}}}, "));
    let (formula, inputs) = (escaped(formula), escaped(inputs));
    format!("{formula} for {inputs}: {value}certified to lie between \\num{{{lower}}} and \\num{{{upper}}}")
}

fn bibtex(formula: &str, inputs: &str, lower: &str, upper: &str, sha256: &str, program: &str) -> String {
    let key: String = sha256.chars().filter(char::is_ascii_alphanumeric).take(12).collect();
    let (formula, inputs) = (escaped(formula), escaped(inputs));
    format!(
        "@misc{{coneproof-{key},\n  title = {{{{Certificate of {formula} for {inputs}}}}},\n  \
         howpublished = {{Certificate written by {}}},\n  \
         note = {{Proven interval [{lower}, {upper}]; SHA-256 {}}}\n}}",
        escaped(program),
        escaped(sha256)
    )
}

fn markdown(number: Option<&str>, formula: &str, inputs: &str, interval: &str, sha256: &str) -> String {
    let code = |text: &str| format!("`{}`", text.replace('`', "'"));
    let value = number.map_or(String::new(), |number| format!(" = **{number}**"));
    let (formula, inputs, hash) = (code(formula), code(inputs), code(sha256));
    format!("{formula}{value}, certified to lie in `{interval}`, for {inputs} (certificate SHA-256 {hash})")
}

/// Text for LaTeX outside formulas.
fn escaped(text: &str) -> String {
    let mut shown = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '\\' => shown += "\\textbackslash{}",
            '|' => shown += "\\textbar{}",
            '<' => shown += "\\textless{}",
            '>' => shown += "\\textgreater{}",
            '^' => shown += "\\textasciicircum{}",
            '~' => shown += "\\textasciitilde{}",
            '_' | '%' | '&' | '#' | '$' | '{' | '}' => shown.extend(['\\', character]),
            c if c.is_control() => shown.push(' '),
            c => shown.push(c),
        }
    }
    shown
}
