//! The nouns of a chip layer: its shapes, its rules, its features and their fragments.

pub mod features;
pub mod fragments;
pub mod length;
pub mod rules;
pub mod shapes;

pub use features::Features;
pub use fragments::{Cut, Drawing, Fragments, Limit};
pub use rules::{Hand, KeepOut, Listed, Metric, Policy, Rules, Spacings, StitchRules, WideSpacing};
pub use shapes::{Shape, Shapes};

use encodings::Mask;

/// A layer of a layout: layer number and datatype (for a BOX, the boxtype).
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct LayerId {
    /// The layer number.
    pub layer: u16,
    /// The datatype.
    pub datatype: u16,
}

impl std::fmt::Display for LayerId {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}/{}", self.layer, self.datatype)
    }
}

/// The shapes of one layer, flattened into the coordinates of one top cell.
#[derive(Clone, Debug)]
pub struct Layout {
    /// The top cell.
    pub top: String,
    /// The layer.
    pub layer: LayerId,
    /// One database unit, in picometres.
    pub unit_pm: u64,
    /// The shapes as drawn: overlapping, touching and repeated ones included.
    pub shapes: Shapes,
    /// Shapes, ascending, that the layer they are drawn on puts on a mask.
    pub fixed: Vec<(u32, Mask)>,
    /// The shapes of other layers that stitches keep away from.
    pub keep_outs: Vec<(LayerId, Shapes)>,
}
