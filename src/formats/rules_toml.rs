//! Rules in TOML, documented in `rules.md`.
//!
//! The document is walked by hand over values that know their place, so that a wrong key or value is
//! reported with line and column, and a wrong key with the nearest right one. The tables have a file
//! each.

mod hand;
mod output;
mod spacings;
mod stitch;

use super::error::{FormatError, Position};
use super::length::Length;
use super::nearest::{nearest, shown};
use super::rules::{Given, Problem, RawRules, parse_layer};
use crate::layout::LayerId;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

const KEYS: [&str; 9] = [
    "layer",
    "masks",
    "spacing",
    "spacings",
    "stitch",
    "fixed",
    "same_mask",
    "different_masks",
    "output",
];

/// Tables whose keys may be looked for in a wrong place.
const TABLES: [(&str, &[&str]); 3] = [
    ("spacings", &spacings::KEYS),
    ("stitch", &stitch::KEYS),
    ("output", &output::KEYS),
];

/// Keys that people may try for what is not handled.
const MASK_PAIR_KEYS: [&str; 10] = [
    "mask_pairs",
    "mask_pair",
    "pairs",
    "pair",
    "between",
    "between_masks",
    "by_mask",
    "per_mask",
    "per_pair",
    "per_mask_pair",
];

type Value<'a> = Spanned<DeValue<'a>>;

/// Reads rules. `name` is the file's name, for errors.
///
/// # Errors
/// Line and column of the first thing that is wrong. Ranges are checked by [`RawRules::resolve`].
pub fn read(bytes: &[u8], name: &str) -> Result<RawRules, FormatError> {
    let text = std::str::from_utf8(bytes).map_err(|error| {
        let problem = Problem::Syntax("not UTF-8 text: rules are plain text".to_owned());
        let before = String::from_utf8_lossy(&bytes[..error.valid_up_to()]);
        FormatError::new(place(name, &before, before.len()), problem)
    })?;
    let file = File { name, text };
    let table = DeTable::parse(text).map_err(|error| {
        let at = error.span().map_or(text.len(), |span| span.start);
        file.wrong(at, Problem::Syntax(error.message().replace('\n', "; ")))
    })?;
    let mut rules = RawRules::default();
    for (key, value) in table.get_ref() {
        match &**key.get_ref() {
            "layer" => rules.layer = Some(file.layer("layer", value)?),
            "masks" => rules.masks = Some(file.count("masks", value)?),
            "spacing" => rules.spacing = Some(file.spacing("spacing", value)?),
            "spacings" => rules.spacings = file.spacings(value)?,
            "stitch" => file.stitch(&mut rules, value)?,
            "fixed" => rules.hand.fixed = file.fixed(value)?,
            "same_mask" => rules.hand.same = file.sets("same_mask", value)?,
            "different_masks" => rules.hand.different = file.sets("different_masks", value)?,
            "output" => rules.output = Some(file.output(value)?),
            wrong => return Err(file.unknown_key(key.span().start, wrong, &KEYS)),
        }
    }
    Ok(rules)
}

fn place(name: &str, text: &str, at: usize) -> Position {
    let before = text.get(..at).unwrap_or(text);
    let line = before.matches('\n').count() as u64 + 1;
    let column = before.chars().rev().take_while(|&c| c != '\n').count() as u64 + 1;
    Position::column(name, line, column)
}

/// Whether a key is made of mask numbers, as `1-2`.
fn names_masks(key: &str) -> bool {
    let masks = key.split(['-', '_', '/', ',', ':', ' ']);
    let mut masks = masks.filter(|part| !part.is_empty()).peekable();
    masks.peek().is_some() && masks.all(|part| part.bytes().all(|byte| byte.is_ascii_digit()))
}

struct File<'a> {
    name: &'a str,
    text: &'a str,
}

impl File<'_> {
    fn wrong(&self, at: usize, problem: Problem) -> FormatError {
        FormatError::new(place(self.name, self.text, at), problem)
    }

    /// The error of a key that a table does not have. The name may be right and only its table wrong.
    fn unknown_key(&self, at: usize, wrong: &str, right: &[&'static str]) -> FormatError {
        match TABLES.iter().find(|(_, keys)| keys.contains(&wrong)) {
            Some((table, _)) => {
                let problem = format!("key {} belongs in the table [{table}]", shown(wrong));
                self.wrong(at, Problem::Syntax(problem))
            }
            None => self.unknown_entry(at, wrong, right),
        }
    }

    /// The same for an entry of a list of tables, whose few keys have names that others have too.
    fn unknown_entry(&self, at: usize, wrong: &str, right: &[&'static str]) -> FormatError {
        let problem = if MASK_PAIR_KEYS.contains(&wrong) || names_masks(wrong) {
            Problem::MaskPairs
        } else {
            Problem::UnknownKey {
                wrong: shown(wrong),
                nearest: nearest(wrong, right).unwrap_or_default(),
            }
        };
        self.wrong(at, problem)
    }

    fn given<T>(&self, at: &Value<'_>, value: Result<T, Problem>) -> Result<Given<T>, FormatError> {
        let position = place(self.name, self.text, at.span().start);
        match value {
            Ok(value) => Ok(Given { value, position }),
            Err(problem) => Err(FormatError::new(position, problem)),
        }
    }

    fn kind(&self, key: &'static str, expected: &'static str, value: &Value<'_>) -> Problem {
        let found = shown(self.text.get(value.span()).unwrap_or_default());
        Problem::Kind {
            key,
            expected,
            found,
        }
    }

    fn wrong_kind(
        &self,
        key: &'static str,
        expected: &'static str,
        value: &Value<'_>,
    ) -> FormatError {
        self.wrong(value.span().start, self.kind(key, expected, value))
    }

    fn layer(&self, key: &'static str, value: &Value<'_>) -> Result<Given<LayerId>, FormatError> {
        let layer = match value.get_ref() {
            DeValue::String(text) => parse_layer(text),
            _ => Err(self.kind(key, "a layer such as \"67/20\"", value)),
        };
        self.given(value, layer)
    }

    fn count(&self, key: &'static str, value: &Value<'_>) -> Result<Given<u64>, FormatError> {
        let number = match value.get_ref() {
            DeValue::Integer(integer) => {
                u64::from_str_radix(integer.as_str(), integer.radix()).ok()
            }
            _ => None,
        };
        let number = number.ok_or_else(|| self.kind(key, "a whole number from 0", value));
        self.given(value, number)
    }

    fn length(&self, key: &'static str, value: &Value<'_>) -> Result<Given<Length>, FormatError> {
        let length = match value.get_ref() {
            DeValue::String(text) => text.parse(),
            DeValue::Integer(integer) => Err(Problem::NoUnit(shown(integer.as_str()))),
            DeValue::Float(float) => Err(Problem::NoUnit(shown(float.as_str()))),
            _ => Err(self.kind(key, "a length such as \"250 nm\"", value)),
        };
        self.given(value, length)
    }

    /// A length that must not depend on masks.
    fn spacing(&self, key: &'static str, value: &Value<'_>) -> Result<Given<Length>, FormatError> {
        match value.get_ref() {
            DeValue::Table(_) | DeValue::Array(_) => {
                Err(self.wrong(value.span().start, Problem::MaskPairs))
            }
            _ => self.length(key, value),
        }
    }

    fn text(
        &self,
        key: &'static str,
        expected: &'static str,
        value: &Value<'_>,
    ) -> Result<Given<String>, FormatError> {
        let text = match value.get_ref() {
            DeValue::String(text) => Ok(text.to_string()),
            _ => Err(self.kind(key, expected, value)),
        };
        self.given(value, text)
    }

    fn table<'v, 'a>(
        &self,
        key: &'static str,
        expected: &'static str,
        value: &'v Value<'a>,
    ) -> Result<&'v DeTable<'a>, FormatError> {
        match value.get_ref() {
            DeValue::Table(table) => Ok(table),
            _ => Err(self.wrong_kind(key, expected, value)),
        }
    }

    /// The error of a table without a key that it needs.
    fn lacks(
        &self,
        value: &Value<'_>,
        table: &'static str,
        key: &'static str,
        remedy: &'static str,
    ) -> FormatError {
        let problem = Problem::MissingKey { table, key, remedy };
        self.wrong(value.span().start, problem)
    }

    /// The error of two keys of which one must be given.
    fn either(&self, value: &Value<'_>, what: &str) -> FormatError {
        let problem = Problem::Syntax(format!("give either {what}"));
        self.wrong(value.span().start, problem)
    }

    fn list<'v, 'a>(
        &self,
        key: &'static str,
        expected: &'static str,
        value: &'v Value<'a>,
    ) -> Result<impl Iterator<Item = &'v Value<'a>>, FormatError> {
        match value.get_ref() {
            DeValue::Array(list) => Ok(list.iter()),
            _ => Err(self.wrong_kind(key, expected, value)),
        }
    }
}
