//! Reports for programs: one JSON object on one line.
//!
//! Numbers that matter are strings, since a reader that goes through double precision would spoil
//! them. `status` tells the shapes apart: `certified` and `fewer digits` ([`result`]; fixed by
//! `schemas/tail-result.schema.json`), `not certified` ([`scout`]; `tail-estimate.schema.json`) and
//! `error` ([`error`]; `error.schema.json`).

use super::{CAUTION, PROGRAM, RouteLine, TailReport, VERSION};
use crate::error::Error;
use crate::quantities::question::Inputs;
use crate::scout::Scout;
use serde::Serialize;

#[derive(Serialize)]
struct ResultObject<'a> {
    quantity: &'a str,
    inputs: &'a Inputs,
    lower: &'a str,
    upper: &'a str,
    value: Option<&'a str>,
    digits: u32,
    #[serde(skip_serializing_if = "Option::is_none")]
    at: Option<BoundsObject<'a>>,
    routes: Vec<RouteObject<'a>>,
    status: &'a str,
    notes: &'a [String],
    caution: &'a str,
    seconds: f64,
    program: &'a str,
    version: &'a str,
}

#[derive(Serialize)]
struct BoundsObject<'a> {
    lower: &'a str,
    upper: &'a str,
}

#[derive(Serialize)]
struct RouteObject<'a> {
    name: &'a str,
    lower: Option<&'a str>,
    upper: Option<&'a str>,
    bits: u32,
    nodes: usize,
    seconds: f64,
    note: Option<&'a str>,
}

#[derive(Serialize)]
struct ScoutObject<'a> {
    quantity: &'a str,
    inputs: &'a Inputs,
    estimate: String,
    log10: Option<String>,
    status: &'a str,
    notes: [&'a str; 1],
    caution: &'a str,
    seconds: f64,
    program: &'a str,
    version: &'a str,
}

#[derive(Serialize)]
struct ErrorObject<'a> {
    status: &'a str,
    field: Option<&'a str>,
    was: Option<&'a str>,
    wanted: Option<&'a str>,
    message: String,
    routes: Vec<DisagreeingRoute<'a>>,
    exit_code: u8,
    program: &'a str,
    version: &'a str,
}

#[derive(Serialize)]
struct DisagreeingRoute<'a> {
    name: &'a str,
    lower: &'a str,
    upper: &'a str,
}

/// A certified result, or one with fewer digits than asked.
///
/// # Errors
/// [`Error::Internal`] if the object cannot be written as JSON, which its types exclude.
pub fn result(report: &TailReport) -> Result<String, Error> {
    line(&ResultObject {
        quantity: &report.quantity,
        inputs: &report.inputs,
        lower: &report.bounds.lower,
        upper: &report.bounds.upper,
        value: report.value.as_ref().map(|value| value.text.as_str()),
        digits: report.digits,
        at: report.at.as_ref().map(|at| BoundsObject { lower: &at.lower, upper: &at.upper }),
        routes: report.routes.iter().map(route).collect(),
        status: report.status.name(),
        notes: &report.notes,
        caution: CAUTION,
        seconds: microseconds(report.seconds),
        program: PROGRAM,
        version: VERSION,
    })
}

fn route(route: &RouteLine) -> RouteObject<'_> {
    RouteObject {
        name: route.name,
        lower: route.bounds.as_ref().map(|bounds| bounds.lower.as_str()),
        upper: route.bounds.as_ref().map(|bounds| bounds.upper.as_str()),
        bits: route.bits,
        nodes: route.nodes,
        seconds: microseconds(route.seconds),
        note: route.note.as_deref(),
    }
}

/// A quick estimate, marked as not certified and without bounds.
///
/// # Errors
/// As for [`result`].
pub fn scout(quantity: &str, inputs: &Inputs, scout: &Scout) -> Result<String, Error> {
    line(&ScoutObject {
        quantity,
        inputs,
        estimate: scout.decimal(),
        log10: scout.log10().map(|exponent| format!("{exponent:.6}")),
        status: "not certified",
        notes: [super::text::SCOUT_NOTE],
        caution: CAUTION,
        seconds: microseconds(scout.seconds),
        program: PROGRAM,
        version: VERSION,
    })
}

/// A refusal or a fault.
///
/// # Errors
/// As for [`result`].
pub fn error(error: &Error) -> Result<String, Error> {
    let (field, was, wanted) = match error {
        Error::BadInput { field, was, wanted } => (Some(field.as_str()), Some(was.as_str()), Some(wanted.as_str())),
        Error::Missing { field, wanted } => (Some(field.as_str()), None, Some(wanted.as_str())),
        _ => (None, None, None),
    };
    let routes = match error {
        Error::RoutesDisagree { intervals } => {
            intervals.iter().map(|(name, lower, upper)| DisagreeingRoute { name, lower, upper }).collect()
        }
        _ => Vec::new(),
    };
    let message = error.to_string();
    let message = message.lines().next().unwrap_or_default().to_owned();
    let exit_code = error.exit_code();
    let (status, program, version) = ("error", PROGRAM, VERSION);
    line(&ErrorObject { status, field, was, wanted, message, routes, exit_code, program, version })
}

pub(super) fn line(object: &impl Serialize) -> Result<String, Error> {
    let text = serde_json::to_string(object).map_err(|error| Error::Internal { found: error.to_string() })?;
    Ok(text + "\n")
}

/// Seconds without digits that mean nothing.
fn microseconds(seconds: f64) -> f64 {
    (seconds * 1e6).round() / 1e6
}
