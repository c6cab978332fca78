//! The instance: K masks, fragments, conflict pairs with their fragment edges, stitch edges,
//! self-spacings and ties.
//!
//! Invariants, checked once by [`InstanceBuilder::build`](crate::build::InstanceBuilder::build) and relied on everywhere else:
//!
//! 1. `1 <= K <= MAX_MASKS`, and every fragment may take at least one of the K masks;
//! 2. features are numbered 0.. along the fragments, so that a feature is a contiguous, non-empty
//!    range of fragments, connected by its stitch edges;
//! 3. a stitch edge joins two different fragments of one feature, at most one between the same two,
//!    and has a weight of at least 1;
//! 4. a conflict pair has at least one fragment edge; all its edges join the same two features, and
//!    no two pairs join the same two features; no edge occurs twice;
//! 5. a self-spacing joins two different fragments of one feature that no stitch edge joins; none
//!    occurs twice;
//! 6. a tie between stitches names stitch edges of one feature, ascending, with weights of at least 1 that add up
//!    to more than it allows; one between two fragments names those of two features.
//!
//! A *unit of conflict* is a conflict pair, or all self-spacings of one feature together: a feature is to
//! itself what two features are to each other, so the number of unresolved units does not depend on how finely
//! features are cut. Units are numbered through: pairs first, then the features with self-spacings, ascending.
//!
//! Self-spacings are stored in ascending order. Edges, stitches and self-spacings are stored with the smaller fragment first. The order of
//! fragments and pairs is the caller's, and should be spatial: totalizers over units inherit it.

use crate::masks::MaskSet;
use crate::ties::Tie;

/// A stitch edge: the feature changes mask between `a` and `b`, at the price `weight`, when the two
/// fragments are on different masks.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Stitch {
    /// The smaller fragment.
    pub a: u32,
    /// The larger fragment.
    pub b: u32,
    /// The price of a mask change here, at least 1.
    pub weight: u32,
}

/// The abstract problem. See the module's head for its invariants.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Instance {
    pub(crate) masks: u8,
    pub(crate) feature_start: Vec<u32>,
    pub(crate) feature_of: Vec<u32>,
    pub(crate) allowed: Vec<MaskSet>,
    pub(crate) areas: Vec<u64>,
    pub(crate) pair_start: Vec<u32>,
    pub(crate) edges: Vec<[u32; 2]>,
    pub(crate) stitches: Vec<Stitch>,
    pub(crate) self_spacings: Vec<[u32; 2]>,
    /// Where the self-spacings of each feature that has any begin, and their number at the end.
    pub(crate) self_start: Vec<u32>,
    pub(crate) ties: Vec<Tie>,
}

impl Instance {
    /// K, the number of masks.
    pub fn masks(&self) -> u8 {
        self.masks
    }

    /// How many features there are.
    pub fn feature_count(&self) -> usize {
        self.feature_start.len() - 1
    }

    /// How many fragments there are.
    pub fn fragment_count(&self) -> usize {
        self.feature_of.len()
    }

    /// The fragments of a feature.
    pub fn fragments_of(&self, feature: u32) -> std::ops::Range<u32> {
        self.feature_start[feature as usize]..self.feature_start[feature as usize + 1]
    }

    /// The feature that a fragment is part of.
    pub fn feature_of(&self, fragment: u32) -> u32 {
        self.feature_of[fragment as usize]
    }

    /// The masks that a fragment may take.
    pub fn allowed(&self, fragment: u32) -> MaskSet {
        self.allowed[fragment as usize]
    }

    /// Whether every fragment may take every mask, so that masks are interchangeable.
    pub fn is_unrestricted(&self) -> bool {
        let all = MaskSet::all(self.masks);
        self.allowed.iter().all(|&set| set == all)
    }

    /// The area of a fragment, in square database units (1 for abstract graphs).
    pub fn area(&self, fragment: u32) -> u64 {
        self.areas[fragment as usize]
    }

    /// How many conflict pairs there are.
    pub fn pair_count(&self) -> usize {
        self.pair_start.len() - 1
    }

    /// The fragment edges of a conflict pair, smaller fragment first, ascending.
    pub fn pair(&self, pair: u32) -> &[[u32; 2]] {
        let start = self.pair_start[pair as usize] as usize;
        &self.edges[start..self.pair_start[pair as usize + 1] as usize]
    }

    /// The fragment edges of each pair in turn.
    pub fn pairs(&self) -> impl ExactSizeIterator<Item = &[[u32; 2]]> {
        self.pair_start
            .windows(2)
            .map(|ends| &self.edges[ends[0] as usize..ends[1] as usize])
    }

    /// All fragment edges, pair by pair.
    pub fn edges(&self) -> &[[u32; 2]] {
        &self.edges
    }

    /// The stitch edges.
    pub fn stitches(&self) -> &[Stitch] {
        &self.stitches
    }

    /// The self-spacings, smaller fragment first, ascending.
    pub fn self_spacings(&self) -> &[[u32; 2]] {
        &self.self_spacings
    }

    /// How many features have self-spacings.
    pub fn self_unit_count(&self) -> usize {
        self.self_start.len() - 1
    }

    /// The self-spacings of the i-th feature that has any.
    pub fn self_unit(&self, i: u32) -> &[[u32; 2]] {
        let start = self.self_start[i as usize] as usize;
        &self.self_spacings[start..self.self_start[i as usize + 1] as usize]
    }

    /// The self-spacings of each feature that has any.
    pub fn self_units(&self) -> impl ExactSizeIterator<Item = &[[u32; 2]]> {
        (self.self_start.windows(2))
            .map(|ends| &self.self_spacings[ends[0] as usize..ends[1] as usize])
    }

    /// The ties.
    pub fn ties(&self) -> &[Tie] {
        &self.ties
    }

    /// How many units of conflict there are: pairs first, then features with self-spacings.
    pub fn unit_count(&self) -> usize {
        self.pair_count() + self.self_unit_count()
    }

    /// The fragment edges of a unit of conflict.
    pub fn unit(&self, unit: u32) -> &[[u32; 2]] {
        match (unit as usize).checked_sub(self.pair_count()) {
            None => self.pair(unit),
            Some(i) => self.self_unit(i as u32),
        }
    }

    /// Whether a unit of conflict is the self-spacings of a feature.
    pub fn is_self_unit(&self, unit: u32) -> bool {
        unit as usize >= self.pair_count()
    }
}
