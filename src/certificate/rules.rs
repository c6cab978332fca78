//! What a proof is about, besides the input: the member `rules` of a certificate.

use serde::{Deserialize, Serialize};

use super::digest::sha256;
use crate::layout;

/// The rules of a graph or of a layer.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Rules {
    /// A layer of a layout.
    Layer(LayerRules),
    /// A graph.
    Graph(GraphRules),
}

/// The rules of a graph.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct GraphRules {
    /// K, the number of masks.
    pub masks: u8,
}

/// The rules of a layer; lengths in database units.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LayerRules {
    /// K, the number of masks.
    pub masks: u8,
    /// The cell that is flattened.
    pub top: String,
    /// The layer, number/datatype.
    pub layer: String,
    /// One database unit in picometres.
    pub unit_pm: u64,
    /// Features closer than this conflict on one mask.
    pub spacing: i32,
    /// The policy that placed the stitch candidates.
    pub stitch: String,
    /// Overlap of the two masks at a stitch.
    pub overlap: i32,
    /// Smallest length of a fragment along its run.
    pub fragment_length: i32,
    /// Smallest distance of a stitch's overlap from a corner.
    pub corner: i32,
    /// The price of one stitch.
    pub stitch_weight: u32,
}

impl Rules {
    /// The rules of a graph.
    pub fn of_graph(masks: u8) -> Rules {
        Rules::Graph(GraphRules { masks })
    }

    /// The rules of a layer of `top`; `policy` is the name of the stitch policy.
    pub fn of_layer(rules: &layout::Rules, policy: &str, top: &str, unit_pm: u64) -> Rules {
        Rules::Layer(LayerRules {
            masks: rules.masks,
            top: top.to_owned(),
            layer: rules.layer.to_string(),
            unit_pm,
            spacing: rules.spacing,
            stitch: policy.to_owned(),
            overlap: rules.stitch.overlap,
            fragment_length: rules.stitch.fragment_length,
            corner: rules.stitch.corner,
            stitch_weight: rules.stitch.weight,
        })
    }

    /// K, the number of masks.
    pub fn masks(&self) -> u8 {
        match self {
            Rules::Layer(rules) => rules.masks,
            Rules::Graph(rules) => rules.masks,
        }
    }

    /// SHA-256 of the member as it is written.
    pub fn sha256(&self) -> String {
        // Strings and integers only: writing them to memory does not fail.
        sha256(&serde_json::to_vec(self).unwrap_or_default())
    }
}
