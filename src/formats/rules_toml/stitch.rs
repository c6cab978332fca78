//! The table `[stitch]`.

use super::{File, Value};
use crate::formats::FormatError;
use crate::formats::rules::{Given, RawKeepOut, RawRules, parse_policy};
use crate::layout::Policy;
use std::path::PathBuf;
use toml::de::DeValue;

pub(super) const KEYS: [&str; 8] = [
    "policy",
    "overlap",
    "fragment_length",
    "corner",
    "weight",
    "keep_out",
    "most_per_feature",
    "list",
];
const KEEP_OUT_KEYS: [&str; 2] = ["layer", "distance"];

impl File<'_> {
    pub(super) fn stitch(
        &self,
        rules: &mut RawRules,
        value: &Value<'_>,
    ) -> Result<(), FormatError> {
        let expected = "a table: [stitch] with keys below it";
        for (key, value) in self.table("stitch", expected, value)? {
            match &**key.get_ref() {
                "policy" => rules.policy = Some(self.policy(value)?),
                "overlap" => rules.overlap = Some(self.length("overlap", value)?),
                "fragment_length" => {
                    rules.fragment_length = Some(self.length("fragment_length", value)?);
                }
                "corner" => rules.corner = Some(self.length("corner", value)?),
                "weight" => rules.weight = Some(self.count("weight", value)?),
                "keep_out" => rules.keep_outs = self.keep_outs(value)?,
                "most_per_feature" => {
                    rules.most_per_feature = Some(self.count("most_per_feature", value)?);
                }
                "list" => rules.list = Some(self.file_name(value)?),
                wrong => return Err(self.unknown_key(key.span().start, wrong, &KEYS)),
            }
        }
        Ok(())
    }

    fn policy(&self, value: &Value<'_>) -> Result<Given<Policy>, FormatError> {
        let policy = match value.get_ref() {
            DeValue::String(text) => parse_policy(text),
            _ => Err(self.kind(
                "policy",
                "the name of a policy, such as \"uncovered\"",
                value,
            )),
        };
        self.given(value, policy)
    }

    fn file_name(&self, value: &Value<'_>) -> Result<Given<PathBuf>, FormatError> {
        let text = self.text(
            "list",
            "the name of a file, such as \"stitches.csv\"",
            value,
        )?;
        Ok(Given {
            value: PathBuf::from(text.value),
            position: text.position,
        })
    }

    fn keep_outs(&self, value: &Value<'_>) -> Result<Vec<Given<RawKeepOut>>, FormatError> {
        let expected = "a list of tables: [[stitch.keep_out]] before each layer";
        let mut keep_outs = Vec::new();
        for entry in self.list("keep_out", expected, value)? {
            keep_outs.push(self.keep_out(entry)?);
        }
        Ok(keep_outs)
    }

    fn keep_out(&self, entry: &Value<'_>) -> Result<Given<RawKeepOut>, FormatError> {
        let expected = "a table with `layer` and `distance`";
        let (mut layer, mut distance) = (None, None);
        for (key, value) in self.table("keep_out", expected, entry)? {
            match &**key.get_ref() {
                "layer" => layer = Some(self.layer("layer", value)?),
                "distance" => distance = Some(self.length("distance", value)?),
                wrong => return Err(self.unknown_entry(key.span().start, wrong, &KEEP_OUT_KEYS)),
            }
        }
        let lacks = |key, remedy| self.lacks(entry, "[[stitch.keep_out]]", key, remedy);
        let layer = layer.ok_or_else(|| lacks("layer", "name the layer, as \"66/44\""))?;
        let distance = distance.ok_or_else(|| lacks("distance", "give a length; 0 is one"))?;
        Ok(Given {
            value: RawKeepOut {
                layer: layer.value,
                distance,
            },
            position: layer.position,
        })
    }
}
