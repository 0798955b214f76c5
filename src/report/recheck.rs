//! Verdicts on certificates, for people and for programs.

use super::text::{entry, one_line};
use super::{PROGRAM, VERSION};
use crate::certificate::recheck::{Recheck, Verdict};
use crate::error::Error;
use serde::Serialize;

#[derive(Serialize)]
struct Run<'a> {
    certificates: Vec<CertificateObject<'a>>,
    summary: serde_json::Map<String, serde_json::Value>,
    program: &'a str,
    version: &'a str,
}

#[derive(Serialize)]
struct CertificateObject<'a> {
    file: &'a str,
    verdict: &'a str,
    reasons: &'a [String],
}

const VERDICTS: [Verdict; 3] = [Verdict::Confirmed, Verdict::NotConfirmed, Verdict::Unreadable];

fn counted(list: &[Recheck]) -> Vec<(&'static str, usize)> {
    let count = |verdict: Verdict| list.iter().filter(|one| one.verdict == verdict).count();
    VERDICTS.iter().map(|verdict| (verdict.name(), count(*verdict))).collect()
}

/// One object for a whole run.
///
/// # Errors
/// [`Error::Internal`] if it cannot be written as JSON, which its types exclude.
pub fn json(list: &[Recheck]) -> Result<String, Error> {
    super::json::line(&Run {
        certificates: list.iter().map(object).collect(),
        summary: counted(list).into_iter().map(|(name, count)| (name.to_owned(), count.into())).collect(),
        program: PROGRAM,
        version: VERSION,
    })
}

fn object(one: &Recheck) -> CertificateObject<'_> {
    CertificateObject { file: &one.file, verdict: one.verdict.name(), reasons: &one.reasons }
}

/// A line for each certificate, its reasons below it, and a summary.
pub fn text(list: &[Recheck]) -> String {
    let mut text = String::new();
    for one in list {
        text += &entry(one.verdict.name(), &one_line(&one.file));
        for reason in &one.reasons {
            text += &entry("", &one_line(reason));
        }
    }
    let counts = counted(list).into_iter().filter(|(_, count)| *count > 0);
    let counts: Vec<String> = counts.map(|(name, count)| format!("{count} {name}")).collect();
    text + "\n" + &entry("certificates", &counts.join(", "))
}
