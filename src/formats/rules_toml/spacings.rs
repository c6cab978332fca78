//! The table `[spacings]`.

use super::{File, Value};
use crate::formats::FormatError;
use crate::formats::rules::{Given, RawSpacings, RawWide, parse_metric};
use crate::layout::Metric;
use toml::de::DeValue;

pub(super) const KEYS: [&str; 8] = [
    "metric",
    "end_length",
    "side_to_side",
    "side_to_end",
    "end_to_end",
    "corner_to_corner",
    "wide",
    "any_mask",
];
const WIDE_KEYS: [&str; 3] = ["width", "run_length", "spacing"];

impl File<'_> {
    pub(super) fn spacings(&self, value: &Value<'_>) -> Result<RawSpacings, FormatError> {
        let expected = "a table: [spacings] with keys below it";
        let mut spacings = RawSpacings::default();
        for (key, value) in self.table("spacings", expected, value)? {
            match &**key.get_ref() {
                "metric" => spacings.metric = Some(self.metric(value)?),
                "end_length" => spacings.end_length = Some(self.length("end_length", value)?),
                "side_to_side" => {
                    spacings.side_to_side = Some(self.spacing("side_to_side", value)?);
                }
                "side_to_end" => spacings.side_to_end = Some(self.spacing("side_to_end", value)?),
                "end_to_end" => spacings.end_to_end = Some(self.spacing("end_to_end", value)?),
                "corner_to_corner" => {
                    spacings.corner_to_corner = Some(self.spacing("corner_to_corner", value)?);
                }
                "wide" => spacings.wide = self.wide(value)?,
                "any_mask" => spacings.any_mask = Some(self.spacing("any_mask", value)?),
                wrong => return Err(self.unknown_key(key.span().start, wrong, &KEYS)),
            }
        }
        Ok(spacings)
    }

    fn metric(&self, value: &Value<'_>) -> Result<Given<Metric>, FormatError> {
        let metric = match value.get_ref() {
            DeValue::String(text) => parse_metric(text),
            _ => Err(self.kind("metric", "\"euclidean\" or \"square\"", value)),
        };
        self.given(value, metric)
    }

    fn wide(&self, value: &Value<'_>) -> Result<Vec<Given<RawWide>>, FormatError> {
        let expected = "a list of tables: [[spacings.wide]] before each row";
        let mut rows = Vec::new();
        for row in self.list("wide", expected, value)? {
            rows.push(self.wide_row(row)?);
        }
        Ok(rows)
    }

    fn wide_row(&self, row: &Value<'_>) -> Result<Given<RawWide>, FormatError> {
        let expected = "a table with `width`, `run_length` and `spacing`";
        let (mut width, mut run_length, mut spacing) = (None, None, None);
        for (key, value) in self.table("wide", expected, row)? {
            match &**key.get_ref() {
                "width" => width = Some(self.length("width", value)?),
                "run_length" => run_length = Some(self.length("run_length", value)?),
                "spacing" => spacing = Some(self.spacing("spacing", value)?),
                wrong => return Err(self.unknown_entry(key.span().start, wrong, &WIDE_KEYS)),
            }
        }
        let lacks = |key| {
            let remedy = "a row has `width`, `run_length` and `spacing`";
            self.lacks(row, "[[spacings.wide]]", key, remedy)
        };
        let wide = RawWide {
            width: width.ok_or_else(|| lacks("width"))?,
            run_length: run_length.ok_or_else(|| lacks("run_length"))?,
            spacing: spacing.ok_or_else(|| lacks("spacing"))?,
        };
        self.given(row, Ok(wide))
    }
}
