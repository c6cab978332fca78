//! The rules of a layer, resolved on its grid: all lengths in database units.

use super::LayerId;

/// Where stitch candidates are placed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Policy {
    /// Nowhere: every feature is one fragment.
    None,
    /// On each run of a feature that no neighbour within the spacing projects on.
    Uncovered,
}

/// What a stitch needs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct StitchRules {
    /// Where candidates are placed.
    pub policy: Policy,
    /// How far the two sides of a stitch overlap: even, in database units; each side is extended by
    /// half of it.
    pub overlap: i32,
    /// The smallest length of a fragment along its run, overlaps not counted.
    pub fragment_length: i32,
    /// The smallest distance of a stitch's overlap from a corner or junction of its feature.
    pub corner: i32,
    /// The price of one stitch, at least 1.
    pub weight: u32,
}

/// The rules of one layer.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Rules {
    /// The layer to split.
    pub layer: LayerId,
    /// K, the number of masks.
    pub masks: u8,
    /// Features closer than this (Euclidean) conflict on one mask; at least 1.
    pub spacing: i32,
    /// What a stitch needs.
    pub stitch: StitchRules,
}
