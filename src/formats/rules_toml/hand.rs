//! The tables `[[fixed]]`, `[[same_mask]]` and `[[different_masks]]`.

use super::{File, Value};
use crate::formats::FormatError;
use crate::formats::length::Coordinate;
use crate::formats::rules::{FixedBy, Given, Problem, RawFixed, RawLabels, RawPoint, RawSet};
use toml::de::DeValue;

const FIXED_KEYS: [&str; 3] = ["mask", "layer", "points"];
const SET_KEYS: [&str; 3] = ["points", "labels", "text"];

impl File<'_> {
    pub(super) fn fixed(&self, value: &Value<'_>) -> Result<Vec<Given<RawFixed>>, FormatError> {
        let expected = "a list of tables: [[fixed]] before each of them";
        let mut all = Vec::new();
        for entry in self.list("fixed", expected, value)? {
            all.push(self.fixed_entry(entry)?);
        }
        Ok(all)
    }

    fn fixed_entry(&self, entry: &Value<'_>) -> Result<Given<RawFixed>, FormatError> {
        let expected = "a table with `mask`, and `layer` or `points`";
        let (mut mask, mut layer, mut points) = (None, None, None);
        for (key, value) in self.table("fixed", expected, entry)? {
            match &**key.get_ref() {
                "mask" => mask = Some(self.count("mask", value)?),
                "layer" => layer = Some(self.layer("layer", value)?),
                "points" => points = Some(self.points(value)?),
                wrong => return Err(self.unknown_entry(key.span().start, wrong, &FIXED_KEYS)),
            }
        }
        let remedy = "say which, from 1 on";
        let mask = mask.ok_or_else(|| self.lacks(entry, "[[fixed]]", "mask", remedy))?;
        let by = match (layer, points) {
            (Some(layer), None) => FixedBy::Layer(layer),
            (None, Some(points)) => FixedBy::Points(points),
            _ => return Err(self.either(entry, "`layer` or `points`")),
        };
        self.given(entry, Ok(RawFixed { mask, by }))
    }

    pub(super) fn sets(
        &self,
        table: &'static str,
        value: &Value<'_>,
    ) -> Result<Vec<Given<RawSet>>, FormatError> {
        let expected = "a list of tables, each a set: its name in [[ ]] before each of them";
        let mut all = Vec::new();
        for entry in self.list(table, expected, value)? {
            all.push(self.set(table, entry)?);
        }
        Ok(all)
    }

    fn set(&self, table: &'static str, entry: &Value<'_>) -> Result<Given<RawSet>, FormatError> {
        let expected = "a table with `points`, or `labels` and perhaps `text`";
        let (mut points, mut labels, mut text) = (None, None, None);
        for (key, value) in self.table(table, expected, entry)? {
            match &**key.get_ref() {
                "points" => points = Some(self.points(value)?),
                "labels" => labels = Some(self.layer("labels", value)?),
                "text" => text = Some(self.text("text", "the text of labels", value)?),
                wrong => return Err(self.unknown_entry(key.span().start, wrong, &SET_KEYS)),
            }
        }
        let set = match (points, labels, text) {
            (Some(points), None, None) => RawSet::Points(points),
            (None, Some(layer), text) => RawSet::Labels(Box::new(RawLabels { layer, text })),
            _ => return Err(self.either(entry, "`points`, or `labels` with or without `text`")),
        };
        self.given(entry, Ok(set))
    }

    fn points(&self, value: &Value<'_>) -> Result<Vec<RawPoint>, FormatError> {
        let expected = "a list of points such as [[\"1.2 um\", \"0.4 um\"]]";
        let mut points = Vec::new();
        for point in self.list("points", expected, value)? {
            let coordinates: Vec<&Value<'_>> = self
                .list("points", "points of two coordinates each", point)?
                .collect();
            let [x, y] = coordinates.as_slice() else {
                return Err(self.wrong_kind("points", "points of two coordinates each", point));
            };
            let both = [self.coordinate(x)?, self.coordinate(y)?];
            points.push(self.given(point, Ok(both))?);
        }
        Ok(points)
    }

    fn coordinate(&self, value: &Value<'_>) -> Result<Coordinate, FormatError> {
        let coordinate = match value.get_ref() {
            DeValue::String(text) => text.parse(),
            DeValue::Integer(number) => Err(Problem::NoUnit(super::shown(number.as_str()))),
            DeValue::Float(number) => Err(Problem::NoUnit(super::shown(number.as_str()))),
            _ => Err(self.kind("points", "coordinates such as \"-1.25 um\"", value)),
        };
        Ok(self.given(value, coordinate)?.value)
    }
}
