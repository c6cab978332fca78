//! The table `[output]`.

use super::{File, Value};
use crate::formats::FormatError;
use crate::formats::rules::{Given, Output, Problem};
use toml::de::DeValue;

pub(super) const KEYS: [&str; 2] = ["datatypes", "layers"];

impl File<'_> {
    pub(super) fn output(&self, value: &Value<'_>) -> Result<Given<Output>, FormatError> {
        let expected = "a table: [output] with `datatypes` or `layers` below it";
        let DeValue::Table(table) = value.get_ref() else {
            return Err(self.wrong_kind("output", expected, value));
        };
        let mut output = None;
        for (key, value) in table {
            let next = match &**key.get_ref() {
                "datatypes" => self.datatypes(value)?,
                "layers" => self.layers(value)?,
                wrong => return Err(self.unknown_key(key.span().start, wrong, &KEYS)),
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
}
