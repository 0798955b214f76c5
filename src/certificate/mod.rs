//! Certificates: documents with which another person can re-check a result.
//!
//! A certificate states the inputs exactly as read, the proven bounds as decimals rounded outward,
//! and for each route its method, its own bounds and the witness data (cut-offs, steps, error
//! bounds) with which an outsider can repeat the computation. It contains nothing that differs
//! between two runs of the same computation: no times, no dates, no names of machines.
//!
//! # Canonical content and hash
//!
//! `sha256` is the SHA-256 of the *canonical content*, in lower-case hexadecimal. The canonical
//! content is the document without its member `sha256`, written as JSON in UTF-8 with
//!
//! * the members of every object in the order of their names' bytes, arrays in their own order;
//! * no blanks or line breaks between tokens, and no line break at the end;
//! * whole numbers in decimal without sign, fraction or exponent (no other numbers occur);
//! * strings with `\"`, `\\`, `\b`, `\t`, `\n`, `\f`, `\r` and, for other characters below U+0020,
//!   `\u00xx` with lower-case digits; every other character as itself.
//!
//! For such documents this is the JSON Canonicalization Scheme of RFC 8785. The layout of the file
//! (indentation, order of members) is free. `references/certificate-format.md` describes every
//! member; `schemas/certificate.schema.json` is the same for programs.

mod file;
pub mod recheck;

pub use file::check_writable;

use crate::arithmetic::decimal;
use crate::error::Error;
use crate::quantities::question::{Inputs, Question};
use crate::quantities::tail::{RouteReport, TailResult};
use crate::report::{CAUTION, DecimalBounds, PROGRAM, TailReport, VERSION};
use serde::{Deserialize, Serialize};
use serde_json::Value;
use sha2::{Digest, Sha256};
use std::cmp::Ordering;

/// The name of the format.
pub const FORMAT: &str = "coneproof-certificate";
/// The version of the format; a reader refuses every other.
pub const FORMAT_VERSION: u32 = 1;

/// A certificate; see the module's documentation.
///
/// ```
/// use coneproof::certificate::Certificate;
/// use coneproof::packets::BoxPacket;
/// use coneproof::quantities::tail::TailRequest;
/// let packet = BoxPacket::new("1".parse()?)?;
/// let request = TailRequest::new(packet, "1".parse()?, "1".parse()?)?;
/// let certificate = Certificate::new(&request, &request.certify()?)?;
/// let read_back = Certificate::from_json(&certificate.to_json()?)?;
/// assert_eq!(read_back, certificate);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Certificate {
    /// Always [`FORMAT`].
    pub format: String,
    /// Always [`FORMAT_VERSION`].
    pub format_version: u32,
    /// The program that made the certificate.
    pub program: String,
    /// Its version.
    pub program_version: String,
    /// The quantity as a formula in the names of the inputs.
    pub quantity: String,
    /// The inputs, exactly as read.
    pub inputs: Inputs,
    /// Decimal not above the value.
    pub lower: String,
    /// Decimal not below the value.
    pub upper: String,
    /// The value with every digit guaranteed to one unit in the last place, if there is one.
    pub value: Option<String>,
    /// Relative digits reached: `upper - lower <= 10^-digits * lower`.
    pub digits: u32,
    /// Where the value is taken, for an extremum or a crossing.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub at: Option<Bounds>,
    /// `certified` or `fewer digits`.
    pub status: String,
    /// What each route found.
    pub routes: Vec<RouteCertificate>,
    /// Remarks for the reader.
    pub notes: Vec<String>,
    /// What the numbers must not be used for.
    pub caution: String,
    /// Hash of the canonical content.
    pub sha256: String,
}

/// The part of a certificate that one route contributed.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct RouteCertificate {
    /// Name of the route.
    pub name: String,
    /// One sentence on the method.
    pub method: String,
    /// Decimal not above the value, if the route has bounds.
    pub lower: Option<String>,
    /// Decimal not below the value, if the route has bounds.
    pub upper: Option<String>,
    /// Working precision in bits.
    pub bits: u32,
    /// Number of nodes.
    pub nodes: u64,
    /// Why there are no bounds, or fewer digits than asked.
    pub note: Option<String>,
    /// Named numbers that fix the computation.
    pub witness: Vec<Witness>,
}

/// A pair of decimals that bound a number.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Bounds {
    /// Decimal not above the number.
    pub lower: String,
    /// Decimal not below the number.
    pub upper: String,
}

/// One named number of a computation.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Witness {
    /// What it is.
    pub name: String,
    /// The number or word.
    pub value: String,
}

impl Certificate {
    /// The certificate of a result.
    ///
    /// # Errors
    /// [`Error::Internal`] if the content cannot be written as JSON, which its types exclude.
    pub fn new(question: &dyn Question, result: &TailResult) -> Result<Certificate, Error> {
        let report = TailReport::new(question, result);
        let mut certificate = Certificate {
            format: FORMAT.to_owned(),
            format_version: FORMAT_VERSION,
            program: PROGRAM.to_owned(),
            program_version: VERSION.to_owned(),
            quantity: report.quantity,
            inputs: report.inputs,
            lower: report.bounds.lower,
            upper: report.bounds.upper,
            value: report.value.map(|value: decimal::GuaranteedDecimal| value.text),
            digits: report.digits,
            at: report.at.map(|at| Bounds { lower: at.lower, upper: at.upper }),
            status: report.status.name().to_owned(),
            routes: result.routes.iter().map(|route| RouteCertificate::new(route, question.digits())).collect(),
            notes: report.notes,
            caution: CAUTION.to_owned(),
            sha256: String::new(),
        };
        certificate.sha256 = certificate.content_hash()?;
        Ok(certificate)
    }

    /// The canonical content, the text that the hash is taken over.
    ///
    /// # Errors
    /// As for [`Certificate::new`].
    pub fn canonical_content(&self) -> Result<String, Error> {
        canonical(serde_json::to_value(self).map_err(internal)?)
    }

    /// SHA-256 of the canonical content in lower-case hexadecimal.
    ///
    /// # Errors
    /// As for [`Certificate::new`].
    pub fn content_hash(&self) -> Result<String, Error> {
        Ok(hash(&self.canonical_content()?))
    }

    /// The document as indented JSON.
    ///
    /// # Errors
    /// As for [`Certificate::new`].
    pub fn to_json(&self) -> Result<String, Error> {
        serde_json::to_string_pretty(self).map(|text| text + "\n").map_err(internal)
    }

    /// Reads a document and checks format, version, hash and the order of its bounds. That the
    /// bounds are true is *not* checked: this takes a computation.
    ///
    /// # Errors
    /// [`Error::BadInput`] that says what is wrong with the document.
    pub fn from_json(text: &str) -> Result<Certificate, Error> {
        let certificate = Certificate::parse(text)?;
        certificate.check_hash()?;
        certificate.check_order()?;
        Ok(certificate)
    }

    /// Reads a document and checks its shape, format and version only.
    fn parse(text: &str) -> Result<Certificate, Error> {
        let refuse = |was: &str, wanted: &str| Err(Error::bad_input("certificate", was, wanted));
        let unreadable = |error: serde_json::Error| {
            Error::bad_input("certificate", error, "give one written by coneproof, unchanged")
        };
        let certificate: Certificate = serde_json::from_str(text).map_err(unreadable)?;
        // The document itself, since a member left out would be filled in above.
        let content = canonical(serde_json::from_str(text).map_err(unreadable)?)?;
        if content != certificate.canonical_content()? {
            return refuse("a document with a member too few", "every member must be there, even one that is null");
        }
        if certificate.format != FORMAT {
            return refuse(&certificate.format, "the format must be coneproof-certificate");
        }
        if certificate.format_version != FORMAT_VERSION {
            return refuse(&certificate.format_version.to_string(), "the format_version must be 1");
        }
        Ok(certificate)
    }

    /// The hash must be that of the content.
    fn check_hash(&self) -> Result<(), Error> {
        if self.content_hash()? == self.sha256 {
            return Ok(());
        }
        let wanted = "the hash must be that of the content, which has been changed";
        Err(Error::bad_input("certificate", &self.sha256, wanted))
    }

    /// Every pair of bounds must consist of decimals in the right order.
    fn check_order(&self) -> Result<(), Error> {
        let pairs = self.routes.iter().filter_map(|route| route.lower.as_ref().zip(route.upper.as_ref()));
        for (lower, upper) in std::iter::once((&self.lower, &self.upper)).chain(pairs) {
            let order = decimal::compare(lower, upper);
            if order.is_none_or(Ordering::is_gt) || lower.starts_with('-') {
                let was = format!("{lower} .. {upper}");
                return Err(Error::bad_input(
                    "certificate",
                    was,
                    "bounds must be decimals from 0 up, the lower one first",
                ));
            }
        }
        Ok(())
    }
}

impl RouteCertificate {
    fn new(route: &RouteReport, digits: u32) -> RouteCertificate {
        let bounds = route.interval.as_ref().map(|interval| DecimalBounds::new(interval, digits));
        let (lower, upper) = bounds.map(|bounds| (bounds.lower, bounds.upper)).unzip();
        RouteCertificate {
            name: route.name.to_owned(),
            method: route.method.to_owned(),
            lower,
            upper,
            bits: route.bits,
            nodes: route.nodes as u64,
            note: route.note.clone(),
            witness: route
                .witness
                .iter()
                .map(|(name, value)| Witness { name: name.clone(), value: value.clone() })
                .collect(),
        }
    }
}

/// The document without its hash, in the canonical form.
fn canonical(mut document: Value) -> Result<String, Error> {
    if let Some(members) = document.as_object_mut() {
        members.shift_remove("sha256");
    }
    document.sort_all_objects();
    serde_json::to_string(&document).map_err(internal)
}

fn hash(content: &str) -> String {
    Sha256::digest(content.as_bytes()).iter().map(|byte| format!("{byte:02x}")).collect()
}

fn internal(error: serde_json::Error) -> Error {
    Error::Internal { found: error.to_string() }
}
