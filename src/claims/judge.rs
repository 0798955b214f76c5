//! Verdicts.
//!
//! A claim is judged with few digits first; as long as the certified interval overlaps an end of what the statement allows,
//! more digits are tried. `upheld` and `refuted` are proofs; `open` says that the effort ran out, `unclear` that the
//! statement can be read in more than one way and the readings are judged differently.

use super::file::Claim;
use super::question::{self, Asked};
use super::slips::{self, Slip};
use super::statement::{Reading, Standing, Statement};
use crate::certificate::Certificate;
use crate::error::Error;
use crate::quantities::tail::TailResult;
use crate::report::DecimalBounds;
use std::time::{Duration, Instant};

/// Digits tried one after the other.
const DIGITS: [u32; 5] = [6, 15, 30, 60, 120];

/// The answer to a claim.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Verdict {
    /// The certified interval lies inside what the statement allows.
    Upheld,
    /// The certified interval and what the statement allows have no number in common.
    Refuted,
    /// Neither could be proven with the effort allowed.
    Open,
    /// The statement's readings are judged differently.
    Unclear,
    /// The claim cannot be read or its physics makes no sense.
    Bad,
}

impl Verdict {
    /// The name in reports.
    pub fn name(self) -> &'static str {
        match self {
            Verdict::Upheld => "upheld",
            Verdict::Refuted => "refuted",
            Verdict::Open => "open",
            Verdict::Unclear => "unclear",
            Verdict::Bad => "bad",
        }
    }
}

/// A judged claim.
#[derive(Clone, Debug)]
pub struct Judgement {
    /// The claim's name.
    pub name: String,
    /// Where it stands in the work.
    pub place: Option<String>,
    /// What it says.
    pub says: String,
    /// The verdict.
    pub verdict: Verdict,
    /// Bounds of the quantity, if it was computed.
    pub bounds: Option<DecimalBounds>,
    /// Bounds of where it is taken, for an extremum.
    pub at: Option<DecimalBounds>,
    /// The verdict's reason in one line.
    pub reason: String,
    /// Usual slips under which the statement would be upheld.
    pub slips: Vec<Slip>,
    /// The certificate of the interval.
    pub certificate: Option<Certificate>,
}

/// Limits for one claim.
#[derive(Clone, Copy, Debug, Default)]
pub struct Limits {
    /// Most digits that are tried.
    pub digits: Option<u32>,
    /// Longest time for one claim.
    pub time: Option<Duration>,
}

/// Judges one claim; what is wrong with it becomes its verdict.
pub fn judge(claim: &Claim, limits: &Limits) -> Result<Judgement, Error> {
    match attempt(claim, limits) {
        Ok(judgement) => Ok(judgement),
        // A defect of the program must stay loud.
        Err(error @ (Error::RoutesDisagree { .. } | Error::Internal { .. })) => Err(error),
        Err(error) => Ok(blank(claim, Verdict::Bad, error.to_string())),
    }
}

fn blank(claim: &Claim, verdict: Verdict, reason: String) -> Judgement {
    Judgement {
        name: claim.name.clone(),
        place: claim.place.clone(),
        says: claim.says.0.clone(),
        verdict,
        bounds: None,
        at: None,
        reason,
        slips: Vec::new(),
        certificate: None,
    }
}

fn attempt(claim: &Claim, limits: &Limits) -> Result<Judgement, Error> {
    let statement = Statement::parse("says", &claim.says.0)?;
    let near = claim.near.as_ref().map(|text| Statement::parse("near", &text.0)).transpose()?;
    let deadline = limits.time.and_then(|time| Instant::now().checked_add(time));
    let most = limits.digits.unwrap_or(*DIGITS.last().unwrap_or(&60));
    let mut asked = question::read(claim)?;
    let mut last = None;
    for digits in DIGITS.iter().copied().filter(|d| *d <= most).chain([most]) {
        asked.set_effort(digits, deadline);
        let result = asked.certify()?;
        let standings = standings(&statement, near.as_ref(), &result);
        let decided = standings.iter().all(|standing| *standing != Standing::Overlapping);
        last = Some((asked.certificate(&result)?, result, standings));
        if decided || deadline.is_some_and(|deadline| Instant::now() >= deadline) {
            break;
        }
    }
    let Some((certificate, result, standings)) = last else {
        return Err(Error::Internal { found: "a claim without a computation".to_owned() });
    };
    let verdict = combined(&standings);
    let slips = if verdict == Verdict::Refuted { slips::find(claim, &statement, &asked, &result) } else { Vec::new() };
    let digits = result.digits.max(6);
    Ok(Judgement {
        bounds: Some(DecimalBounds::new(&result.interval, digits)),
        at: result.at.as_ref().map(|at| DecimalBounds::new(at, digits)),
        reason: reason(verdict, &statement, &standings, &result),
        slips,
        certificate: Some(certificate),
        ..blank(claim, verdict, String::new())
    })
}

/// How the result stands to each reading of the statement, or to all readings of both statements.
fn standings(statement: &Statement, near: Option<&Statement>, result: &TailResult) -> Vec<Standing> {
    let of_value = |reading: &Reading| reading.standing(&result.interval);
    let value: Vec<Standing> = statement.readings.iter().map(of_value).collect();
    match (near, &result.at) {
        (Some(near), Some(at)) => {
            let place: Vec<Standing> = near.readings.iter().map(|reading| reading.standing(at)).collect();
            value.iter().flat_map(|v| place.iter().map(move |p| both(*v, *p))).collect()
        }
        _ => value,
    }
}

/// Both statements have to hold.
fn both(first: Standing, second: Standing) -> Standing {
    match (first, second) {
        (Standing::Disjoint, _) | (_, Standing::Disjoint) => Standing::Disjoint,
        (Standing::Inside, Standing::Inside) => Standing::Inside,
        _ => Standing::Overlapping,
    }
}

fn combined(standings: &[Standing]) -> Verdict {
    let all = |wanted: Standing| standings.iter().all(|standing| *standing == wanted);
    if all(Standing::Inside) {
        Verdict::Upheld
    } else if all(Standing::Disjoint) {
        Verdict::Refuted
    } else if standings.len() > 1 && standings.iter().all(|standing| *standing != Standing::Overlapping) {
        Verdict::Unclear
    } else {
        Verdict::Open
    }
}

fn reason(verdict: Verdict, statement: &Statement, standings: &[Standing], result: &TailResult) -> String {
    let shown = DecimalBounds::new(&result.interval, result.digits.max(1));
    let interval = format!("the quantity lies in [{}, {}]", shown.lower, shown.upper);
    let meanings: Vec<&str> = statement.readings.iter().map(|reading| reading.meaning.as_str()).collect();
    match verdict {
        Verdict::Upheld => format!("{interval}, inside what \"{}\" allows ({})", statement.text, meanings.join("; ")),
        Verdict::Refuted => format!("{interval}, outside what \"{}\" allows ({})", statement.text, meanings.join("; ")),
        Verdict::Open => format!("{interval}, which overlaps an end of what \"{}\" allows", statement.text),
        Verdict::Unclear => {
            let each: Vec<String> = meanings
                .iter()
                .zip(standings)
                .map(|(meaning, s)| format!("{meaning}: {}", if *s == Standing::Inside { "upheld" } else { "refuted" }))
                .collect();
            format!("{interval}; \"{}\" can be read in more than one way: {}", statement.text, each.join("; "))
        }
        Verdict::Bad => interval,
    }
}

impl Asked {
    fn certificate(&self, result: &TailResult) -> Result<Certificate, Error> {
        Certificate::new(self.question(), result)
    }
}
