//! Verdicts for people, for programs and for continuous integration (JUnit XML).

use super::text::entry;
use super::{CAUTION, PROGRAM, VERSION};
use crate::certificate::Certificate;
use crate::claims::judge::{Judgement, Verdict};
use crate::error::Error;
use serde::Serialize;
use std::fmt::Write;

#[derive(Serialize)]
struct Run<'a> {
    claims: Vec<ClaimObject<'a>>,
    summary: serde_json::Map<String, serde_json::Value>,
    caution: &'a str,
    program: &'a str,
    version: &'a str,
}

#[derive(Serialize)]
struct ClaimObject<'a> {
    name: &'a str,
    #[serde(rename = "where")]
    place: Option<&'a str>,
    says: &'a str,
    verdict: &'a str,
    lower: Option<&'a str>,
    upper: Option<&'a str>,
    at: Option<BoundsObject<'a>>,
    reason: &'a str,
    slips: Vec<SlipObject<'a>>,
    certificate: Option<&'a Certificate>,
}

#[derive(Serialize)]
struct BoundsObject<'a> {
    lower: &'a str,
    upper: &'a str,
}

#[derive(Serialize)]
struct SlipObject<'a> {
    slip: &'a str,
    lower: &'a str,
    upper: &'a str,
}

const VERDICTS: [Verdict; 5] = [Verdict::Upheld, Verdict::Refuted, Verdict::Open, Verdict::Unclear, Verdict::Bad];

fn counted(judgements: &[Judgement]) -> Vec<(&'static str, usize)> {
    let count = |verdict: Verdict| judgements.iter().filter(|judgement| judgement.verdict == verdict).count();
    VERDICTS.iter().map(|verdict| (verdict.name(), count(*verdict))).collect()
}

/// One object for a whole run.
///
/// # Errors
/// [`Error::Internal`] if it cannot be written as JSON, which its types exclude.
pub fn json(judgements: &[Judgement]) -> Result<String, Error> {
    let claims = judgements.iter().map(|judgement| ClaimObject {
        name: &judgement.name,
        place: judgement.place.as_deref(),
        says: &judgement.says,
        verdict: judgement.verdict.name(),
        lower: judgement.bounds.as_ref().map(|bounds| bounds.lower.as_str()),
        upper: judgement.bounds.as_ref().map(|bounds| bounds.upper.as_str()),
        at: judgement.at.as_ref().map(|at| BoundsObject { lower: &at.lower, upper: &at.upper }),
        reason: &judgement.reason,
        slips: judgement
            .slips
            .iter()
            .map(|slip| SlipObject { slip: &slip.slip, lower: &slip.bounds.lower, upper: &slip.bounds.upper })
            .collect(),
        certificate: judgement.certificate.as_ref(),
    });
    let run = Run {
        claims: claims.collect(),
        summary: counted(judgements).into_iter().map(|(name, count)| (name.to_owned(), count.into())).collect(),
        caution: CAUTION,
        program: PROGRAM,
        version: VERSION,
    };
    super::json::line(&run)
}

/// A block for each claim and a summary.
pub fn text(judgements: &[Judgement]) -> String {
    let mut text = String::new();
    for judgement in judgements {
        let place = judgement.place.as_ref().map_or(String::new(), |place| format!(" ({place})"));
        text += &entry(judgement.verdict.name(), &format!("{}{place}: {}", judgement.name, judgement.says));
        text += &entry("", &judgement.reason);
        for slip in &judgement.slips {
            let line = format!(
                "would be upheld if {}: then it lies in [{}, {}]",
                slip.slip, slip.bounds.lower, slip.bounds.upper
            );
            text += &entry("", &line);
        }
        text.push('\n');
    }
    let counts: Vec<String> = counted(judgements)
        .into_iter()
        .filter(|(_, count)| *count > 0)
        .map(|(name, count)| format!("{count} {name}"))
        .collect();
    text += &entry("claims", &counts.join(", "));
    text += &entry("caution", CAUTION);
    text
}

/// JUnit XML: refuted claims are failures, open, unclear and bad ones are errors.
pub fn junit(judgements: &[Judgement]) -> String {
    let failures = judgements.iter().filter(|j| j.verdict == Verdict::Refuted).count();
    let errors = judgements.iter().filter(|j| j.verdict > Verdict::Refuted).count();
    let mut xml = String::from("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n");
    let total = judgements.len();
    // Writing to a string cannot fail.
    let _ = writeln!(
        xml,
        "<testsuite name=\"coneproof claims\" tests=\"{total}\" failures=\"{failures}\" errors=\"{errors}\">"
    );
    for judgement in judgements {
        let place = judgement.place.as_deref().unwrap_or("claims");
        let _ = write!(xml, "  <testcase name=\"{}\" classname=\"{}\"", escaped(&judgement.name), escaped(place));
        let kind = match judgement.verdict {
            Verdict::Upheld => {
                xml += "/>\n";
                continue;
            }
            Verdict::Refuted => "failure",
            _ => "error",
        };
        let (verdict, reason) = (judgement.verdict.name(), escaped(&judgement.reason));
        let _ = writeln!(xml, ">\n    <{kind} type=\"{verdict}\" message=\"{reason}\"/>\n  </testcase>");
    }
    xml + "</testsuite>\n"
}

/// Text as the content of an XML attribute; characters that XML forbids are replaced.
fn escaped(text: &str) -> String {
    let mut shown = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '&' => shown += "&amp;",
            '<' => shown += "&lt;",
            '>' => shown += "&gt;",
            '"' => shown += "&quot;",
            '\n' => shown += "&#10;",
            '\t' => shown += "&#9;",
            c if c.is_control() => shown.push('\u{fffd}'),
            c => shown.push(c),
        }
    }
    shown
}
