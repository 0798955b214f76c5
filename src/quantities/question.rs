//! What every question about one probability has in common for commands, reports and certificates.

use super::tail::TailResult;
use crate::error::Error;
use serde::de::{MapAccess, Visitor};
use serde::ser::SerializeMap;
use serde::{Deserialize, Deserializer, Serialize, Serializer};
use std::fmt;

/// A question about one probability.
pub trait Question {
    /// The inputs, exactly as read.
    fn inputs(&self) -> Inputs;

    /// The quantity as a formula in the names of the inputs.
    fn formula(&self) -> String;

    /// The quantity in words.
    fn words(&self) -> String;

    /// Relative digits asked.
    fn digits(&self) -> u32;

    /// Computes the certified enclosure.
    ///
    /// # Errors
    /// [`Error::BadInput`] for a request that cannot be used, [`Error::RoutesDisagree`] or
    /// [`Error::Internal`] for a defect of this program.
    fn certify(&self) -> Result<TailResult, Error>;
}

/// Inputs by name, in the order in which they are shown. As JSON: an object of strings.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Inputs {
    list: Vec<(String, String)>,
}

impl Inputs {
    /// Inputs that begin with the kind of packet.
    pub fn of_packet(kind: &str) -> Inputs {
        Inputs::default().with("packet", kind)
    }

    /// One more input.
    pub fn with(mut self, name: &str, text: impl Into<String>) -> Inputs {
        self.set(name, text);
        self
    }

    /// One more input, if it was given.
    pub fn with_optional(self, name: &str, text: Option<String>) -> Inputs {
        match text {
            Some(text) => self.with(name, text),
            None => self,
        }
    }

    /// Sets an input, replacing an earlier one of that name.
    pub fn set(&mut self, name: &str, text: impl Into<String>) {
        match self.list.iter_mut().find(|(known, _)| known == name) {
            Some((_, old)) => *old = text.into(),
            None => self.list.push((name.to_owned(), text.into())),
        }
    }

    /// The inputs without one of them.
    pub fn without(mut self, name: &str) -> Inputs {
        self.list.retain(|(known, _)| known != name);
        self
    }

    /// The text of one input.
    pub fn get(&self, name: &str) -> Option<&str> {
        self.list.iter().find(|(known, _)| known == name).map(|(_, text)| text.as_str())
    }

    /// Names and texts in order.
    pub fn iter(&self) -> impl Iterator<Item = (&str, &str)> {
        self.list.iter().map(|(name, text)| (name.as_str(), text.as_str()))
    }
}

impl Serialize for Inputs {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(Some(self.list.len()))?;
        for (name, text) in &self.list {
            map.serialize_entry(name, text)?;
        }
        map.end()
    }
}

impl<'de> Deserialize<'de> for Inputs {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Inputs, D::Error> {
        struct Reader;
        impl<'de> Visitor<'de> for Reader {
            type Value = Inputs;

            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                write!(f, "an object of strings")
            }

            fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Inputs, A::Error> {
                let mut inputs = Inputs::default();
                while let Some((name, text)) = map.next_entry::<String, String>()? {
                    if inputs.get(&name).is_some() {
                        return Err(serde::de::Error::custom(format!("duplicate field `{name}`")));
                    }
                    inputs.set(&name, text);
                }
                Ok(inputs)
            }
        }
        deserializer.deserialize_map(Reader)
    }
}
