//! The nouns of a chip layer: its shapes, its rules, its features and their fragments.

pub mod features;
pub mod fragments;
pub mod length;
pub mod rules;
pub mod shapes;

pub use features::Features;
pub use fragments::{Cut, Drawing, Fragments};
pub use rules::{Policy, Rules, StitchRules};
pub use shapes::{Shape, Shapes};

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
}
