//! What the project's JSON formats share: their errors, and objects with known keys only.

use super::error::{FormatError, Position};
use super::nearest::{nearest, shown};
use serde::de::{DeserializeOwned, Error as _, MapAccess};
use std::io::{BufReader, Read};
use thiserror::Error;

/// What is wrong in a JSON file.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum Problem {
    /// It is no JSON, or not of the documented form.
    #[error("{0}")]
    Syntax(String),
    /// A list entry is wrong.
    #[error("{entry}: {message}")]
    Entry {
        /// The key and the entry's number from 0, such as `allowed[3]`.
        entry: String,
        /// What is wrong and what would be right.
        message: String,
    },
    /// The file fixes the masks that fragments may take, so that K cannot be changed.
    #[error(
        "the number of masks is {given} in the file, whose `allowed` list depends on it: {asked} \
         masks cannot be asked for"
    )]
    MasksFixed {
        /// K of the file.
        given: u8,
        /// K asked for.
        asked: u8,
    },
}

impl Problem {
    pub(super) fn entry(key: &str, index: usize, message: impl Into<String>) -> Problem {
        Problem::Entry {
            entry: format!("{key}[{index}]"),
            message: message.into(),
        }
    }
}

/// Reads one JSON value and nothing behind it.
pub(super) fn from_reader<T: DeserializeOwned>(
    reader: impl Read,
    name: &str,
) -> Result<T, FormatError> {
    let mut json = serde_json::Deserializer::from_reader(BufReader::new(reader));
    let value = T::deserialize(&mut json).and_then(|value| json.end().map(|()| value));
    value.map_err(|error| positioned(error, name))
}

fn positioned(error: serde_json::Error, name: &str) -> FormatError {
    if error.is_io() {
        return FormatError::new(Position::file(name), std::io::Error::from(error));
    }
    let (line, column) = (error.line() as u64, error.column() as u64);
    let text = error.to_string();
    let message = text
        .strip_suffix(&format!(" at line {line} column {column}"))
        .unwrap_or(&text);
    // The names of types are ours; people know numbers.
    let message = message.replace(
        "expected u32",
        "a whole number from 0 to 4294967295 is needed",
    );
    let position = match line {
        0 => Position::file(name),
        _ => Position::column(name, line, column),
    };
    FormatError::new(position, Problem::Syntax(message))
}

/// Stores the value of a key that may occur once.
pub(super) fn once<'de, M: MapAccess<'de>, T: serde::Deserialize<'de>>(
    map: &mut M,
    slot: &mut Option<T>,
    key: &str,
) -> Result<(), M::Error> {
    if slot.is_some() {
        return Err(M::Error::custom(format!("key `{key}` is given twice")));
    }
    *slot = Some(map.next_value()?);
    Ok(())
}

/// The error of a key that the format does not have.
pub(super) fn unknown_key<E: serde::de::Error>(key: &str, keys: &[&str]) -> E {
    let near = nearest(key, keys).unwrap_or_default();
    E::custom(format!(
        "unknown key {}: did you mean `{near}`?",
        shown(key)
    ))
}

/// Checks the keys `format` and `version` (1), which every format has.
pub(super) fn check_format<E: serde::de::Error>(
    format: Option<&str>,
    version: Option<u64>,
    right: &str,
) -> Result<(), E> {
    match (format, version) {
        (None, _) => Err(E::custom(format!(
            "key `format` is missing: it must be {right:?}"
        ))),
        (Some(format), _) if format != right => {
            let found = shown(format);
            Err(E::custom(format!(
                "format is {found}: it must be {right:?}"
            )))
        }
        (_, None) => Err(E::custom("key `version` is missing: it must be 1")),
        (_, Some(version)) if version != 1 => Err(E::custom(format!(
            "version is {version}: this program reads version 1"
        ))),
        _ => Ok(()),
    }
}

/// The value of a key that must be there.
pub(super) fn required<T, E: serde::de::Error>(slot: Option<T>, key: &str) -> Result<T, E> {
    slot.ok_or_else(|| E::custom(format!("key `{key}` is missing")))
}
