//! Rules in TOML, documented in `rules.md`.
//!
//! The document is walked by hand over values that know their place, so that a wrong key or value is
//! reported with line and column, and a wrong key with the nearest right one.

use super::error::{FormatError, Position};
use super::nearest::{nearest, shown};
use super::rules::{Given, Output, Problem, RawRules, parse_layer, parse_policy};
use toml::Spanned;
use toml::de::{DeTable, DeValue};

const KEYS: [&str; 5] = ["layer", "masks", "spacing", "stitch", "output"];
const STITCH_KEYS: [&str; 5] = ["policy", "overlap", "fragment_length", "corner", "weight"];
const OUTPUT_KEYS: [&str; 2] = ["datatypes", "layers"];

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
            "spacing" => rules.spacing = Some(file.length("spacing", value)?),
            "stitch" => file.stitch(&mut rules, value)?,
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

struct File<'a> {
    name: &'a str,
    text: &'a str,
}

impl File<'_> {
    fn wrong(&self, at: usize, problem: Problem) -> FormatError {
        FormatError::new(place(self.name, self.text, at), problem)
    }

    fn unknown_key(&self, at: usize, wrong: &str, right: &[&'static str]) -> FormatError {
        // The name may be right and only its table wrong.
        let everywhere = || {
            let tables = [("stitch", &STITCH_KEYS[..]), ("output", &OUTPUT_KEYS[..])];
            let table = tables.iter().find(|(_, keys)| keys.contains(&wrong));
            table.map(|(table, _)| *table)
        };
        let problem = match everywhere() {
            Some(table) => Problem::Syntax(format!(
                "key {} belongs in the table [{table}]",
                shown(wrong)
            )),
            None => Problem::UnknownKey {
                wrong: shown(wrong),
                nearest: nearest(wrong, right).unwrap_or_default(),
            },
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

    fn layer(
        &self,
        key: &'static str,
        value: &Value<'_>,
    ) -> Result<Given<crate::layout::LayerId>, FormatError> {
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

    fn length(
        &self,
        key: &'static str,
        value: &Value<'_>,
    ) -> Result<Given<super::length::Length>, FormatError> {
        let length = match value.get_ref() {
            DeValue::String(text) => text.parse(),
            DeValue::Integer(integer) => Err(Problem::NoUnit(shown(integer.as_str()))),
            DeValue::Float(float) => Err(Problem::NoUnit(shown(float.as_str()))),
            _ => Err(self.kind(key, "a length such as \"250 nm\"", value)),
        };
        self.given(value, length)
    }

    fn stitch(&self, rules: &mut RawRules, value: &Value<'_>) -> Result<(), FormatError> {
        let DeValue::Table(table) = value.get_ref() else {
            let expected = "a table: [stitch] with keys below it";
            return Err(self.wrong_kind("stitch", expected, value));
        };
        for (key, value) in table {
            match &**key.get_ref() {
                "policy" => rules.policy = Some(self.policy(value)?),
                "overlap" => rules.overlap = Some(self.length("overlap", value)?),
                "fragment_length" => {
                    rules.fragment_length = Some(self.length("fragment_length", value)?);
                }
                "corner" => rules.corner = Some(self.length("corner", value)?),
                "weight" => rules.weight = Some(self.count("weight", value)?),
                wrong => return Err(self.unknown_key(key.span().start, wrong, &STITCH_KEYS)),
            }
        }
        Ok(())
    }

    fn policy(&self, value: &Value<'_>) -> Result<Given<crate::layout::Policy>, FormatError> {
        let policy = match value.get_ref() {
            DeValue::String(text) => parse_policy(text),
            _ => Err(self.kind("policy", "\"none\" or \"uncovered\"", value)),
        };
        self.given(value, policy)
    }

    fn output(&self, value: &Value<'_>) -> Result<Given<Output>, FormatError> {
        let expected = "a table: [output] with `datatypes` or `layers` below it";
        let DeValue::Table(table) = value.get_ref() else {
            return Err(self.wrong_kind("output", expected, value));
        };
        let mut output = None;
        for (key, value) in table {
            let next = match &**key.get_ref() {
                "datatypes" => self.datatypes(value)?,
                "layers" => self.layers(value)?,
                wrong => return Err(self.unknown_key(key.span().start, wrong, &OUTPUT_KEYS)),
            };
            if output.is_some() {
                let problem = "give either `datatypes` or `layers`, not both".to_owned();
                return Err(self.wrong(key.span().start, Problem::Syntax(problem)));
            }
            output = Some(next);
        }
        output.ok_or_else(|| self.wrong_kind("output", expected, value))
    }

    fn datatypes(&self, value: &Value<'_>) -> Result<Given<Output>, FormatError> {
        let list = self.list(
            "datatypes",
            "a list of datatypes such as [101, 102, 103]",
            value,
        )?;
        let mut datatypes = Vec::new();
        for entry in list {
            let number = self.count("datatypes", entry)?;
            let datatype = u16::try_from(number.value)
                .map_err(|_| self.wrong_kind("datatypes", "numbers from 0 to 65535", entry))?;
            datatypes.push(datatype);
        }
        self.given(value, Ok(Output::Datatypes(datatypes)))
    }

    fn layers(&self, value: &Value<'_>) -> Result<Given<Output>, FormatError> {
        let list = self.list(
            "layers",
            "a list of layers such as [\"67/101\", \"67/102\"]",
            value,
        )?;
        let mut layers = Vec::new();
        for entry in list {
            layers.push(self.layer("layers", entry)?.value);
        }
        self.given(value, Ok(Output::Layers(layers)))
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
