//! Claims files: TOML or JSON with the same members.
//!
//! ```toml
//! [[claim]]
//! name   = "abstract"
//! where  = "p. 1, line 9"
//! packet = { kind = "box", half-width = "7/10" }
//! mass   = "1"
//! time   = "0.6984"
//! region = "beyond cone"
//! says   = "about 3%"
//! ```
//!
//! Numbers are texts, so that they are read exactly; whole numbers may stand without quotes.

use crate::error::Error;
use serde::Deserialize;
use serde::de::{Deserializer, Error as _};
use std::collections::BTreeMap;
use std::path::Path;
use toml::Spanned;

/// A number or word, kept as text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Text(pub String);

impl<'de> Deserialize<'de> for Text {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Text, D::Error> {
        #[derive(Deserialize)]
        #[serde(untagged)]
        enum Form {
            Whole(i64),
            Fraction(f64),
            Words(String),
        }
        match Form::deserialize(deserializer)? {
            Form::Whole(number) => Ok(Text(number.to_string())),
            Form::Words(text) => Ok(Text(text)),
            Form::Fraction(number) => Err(D::Error::custom(format!(
                "the number {number} without quotes is not read exactly; write it in quotes, such as \"{number}\""
            ))),
        }
    }
}

/// One claim as written.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields, rename_all = "kebab-case")]
pub struct Claim {
    /// A name, unique in the file.
    pub name: String,
    /// Where it stands in the work.
    #[serde(default, rename = "where")]
    pub place: Option<String>,
    /// `kind` and the parameters of the packet.
    pub packet: BTreeMap<String, Text>,
    /// Mass; `1` if left out.
    #[serde(default)]
    pub mass: Option<Text>,
    /// Time; left out for a claim about all times.
    #[serde(default)]
    pub time: Option<Text>,
    /// `beyond cone` (the default) or `beyond R`; with `left of`/`right of` for one side.
    #[serde(default)]
    pub region: Option<String>,
    /// `probability` (the default) or `largest over time`.
    #[serde(default)]
    pub quantity: Option<String>,
    /// What is claimed of the quantity.
    pub says: Text,
    /// For `largest over time`: what is claimed of the time at which it is reached.
    #[serde(default)]
    pub near: Option<Text>,
    /// Number of the line where the claim begins, if the file is TOML.
    #[serde(skip)]
    pub line: Option<usize>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct TomlFile {
    #[serde(default)]
    claim: Vec<Spanned<toml::Value>>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct JsonFile {
    claim: Vec<serde_json::Value>,
}

/// What became of one entry of a file: a claim, or the reason why it cannot be read (one bad claim stops no other).
pub type Entry = Result<Claim, BadClaim>;

/// An entry that cannot be used.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BadClaim {
    /// Its name, if it has one, or its number.
    pub name: String,
    /// Number of the line where it begins, if known.
    pub line: Option<usize>,
    /// What is wrong.
    pub reason: String,
}

/// Reads a claims file; the extension `.json` means JSON, everything else TOML.
///
/// # Errors
/// [`Error::File`] if it cannot be read, [`Error::BadInput`] if it is not TOML or JSON, has no claims, or uses a name twice.
pub fn read(path: &Path) -> Result<Vec<Entry>, Error> {
    let shown = path.display().to_string();
    let text = std::fs::read_to_string(path).map_err(|error| Error::file("read", &shown, error))?;
    let json = path.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("json"));
    let entries = if json { from_json(&text) } else { from_toml(&text) };
    let entries = entries.map_err(|reason| Error::file("read", &shown, reason))?;
    if entries.is_empty() {
        return Err(Error::file("use", &shown, "it has no claims; write at least one [[claim]]"));
    }
    let mut names: Vec<&str> =
        entries.iter().filter_map(|entry| entry.as_ref().ok()).map(|c| c.name.as_str()).collect();
    names.sort_unstable();
    if let Some(pair) = names.windows(2).find(|pair| pair[0] == pair[1]) {
        return Err(Error::file("use", &shown, format!("the name \"{}\" is used twice; names must differ", pair[0])));
    }
    Ok(entries)
}

fn from_toml(text: &str) -> Result<Vec<Entry>, String> {
    let file: TomlFile = toml::from_str(text).map_err(|error| error.to_string().trim_end().to_owned())?;
    Ok(file
        .claim
        .into_iter()
        .enumerate()
        .map(|(index, spanned)| {
            let line = Some(line_of(text, spanned.span().start));
            let value = spanned.into_inner();
            let name = value.get("name").and_then(toml::Value::as_str).map(str::to_owned);
            let read = value.try_into::<Claim>().map_err(|error| error.message().to_owned());
            finish(read, name, index, line)
        })
        .collect())
}

fn from_json(text: &str) -> Result<Vec<Entry>, String> {
    let file: JsonFile = serde_json::from_str(text).map_err(|error| error.to_string())?;
    Ok(file
        .claim
        .into_iter()
        .enumerate()
        .map(|(index, value)| {
            let name = value.get("name").and_then(serde_json::Value::as_str).map(str::to_owned);
            let read = serde_json::from_value::<Claim>(value).map_err(|error| error.to_string());
            finish(read, name, index, None)
        })
        .collect())
}

fn finish(read: Result<Claim, String>, name: Option<String>, index: usize, line: Option<usize>) -> Entry {
    match read {
        Ok(claim) => Ok(Claim { line, ..claim }),
        Err(reason) => {
            let name = name.unwrap_or_else(|| format!("claim {}", index + 1));
            Err(BadClaim { name, line, reason })
        }
    }
}

/// The number of the line that holds a byte, counted from one.
fn line_of(text: &str, byte: usize) -> usize {
    text.as_bytes().iter().take(byte).filter(|b| **b == b'\n').count() + 1
}

#[cfg(test)]
mod tests {
    use super::*;

    const GOOD: &str =
        "\n[[claim]]\nname = \"a\"\npacket = { kind = \"box\", half-width = \"1\" }\ntime = 1\nsays = \"2%\"\n";

    #[test]
    fn one_bad_claim_stops_no_other() {
        let text = format!("{GOOD}\n[[claim]]\nname = \"b\"\npacket = {{ kind = \"box\" }}\nspeed = 3\nsays = \"1\"\n");
        let entries = from_toml(&text).unwrap();
        assert_eq!(entries[0].as_ref().unwrap().time, Some(Text("1".to_owned())));
        let bad = entries[1].as_ref().unwrap_err();
        assert_eq!((bad.name.as_str(), bad.line), ("b", Some(8)));
        assert!(bad.reason.contains("speed"), "{}", bad.reason);
    }

    #[test]
    fn a_number_that_would_not_be_exact_is_refused() {
        let bad = from_toml(&GOOD.replace("time = 1", "time = 0.1")).unwrap().remove(0).unwrap_err();
        assert!(bad.reason.contains("in quotes"), "{}", bad.reason);
    }

    #[test]
    fn json_has_the_same_members() {
        let text =
            r#"{"claim": [{"name": "a", "packet": {"kind": "box", "half-width": "1"}, "time": 1, "says": "2%"}]}"#;
        assert_eq!(from_json(text).unwrap()[0].as_ref().unwrap().says, Text("2%".to_owned()));
        assert!(from_json("[1]").is_err() && from_toml("claim = 3").is_err());
    }
}
