//! The features that come strictly closer to a feature than the spacing.
//!
//! Each part of the feature asks the packed tree for what lies within the spacing of its box. Nodes carry
//! the range of features below them: those that hold only features seen already, or of no interest, are
//! not entered, so that a feature of many parts next to another one is not compared part by part.

use super::connect::Connected;
use super::parts::Parts;
use crate::geometry::rtree::Visitor;
use rustc_hash::FxHashSet;

/// Parts and features with what a search for neighbours needs.
pub(super) struct Neighbourhood<'a> {
    pub(super) parts: &'a Parts,
    pub(super) connected: &'a Connected,
    /// For each node of the tree the smallest and the largest feature in it.
    range: Vec<[u32; 2]>,
    spacing: i32,
}

impl<'a> Neighbourhood<'a> {
    /// Prepares the search for neighbours closer than `spacing`, which is at least 1.
    pub(super) fn new(parts: &'a Parts, connected: &'a Connected, spacing: i32) -> Self {
        let range = parts.tree().gather(
            |part| [connected.feature_of[part as usize]; 2],
            |a, b| [a[0].min(b[0]), a[1].max(b[1])],
        );
        Neighbourhood {
            parts,
            connected,
            range,
            spacing,
        }
    }

    /// The spacing.
    pub(super) fn spacing(&self) -> i32 {
        self.spacing
    }

    /// The features of larger numbers that are closer to `feature` than the spacing, ascending.
    pub(super) fn above(&self, feature: u32) -> Vec<u32> {
        let mut search = Search {
            around: self,
            feature,
            part: 0,
            found: FxHashSet::default(),
        };
        for &part in self.connected.parts_of(feature) {
            search.part = part;
            // Strictly closer than s means at most s - 1 along either axis.
            let reach = self.parts.box_of(part).grown(self.spacing - 1);
            self.parts.tree().query(&reach, &mut search);
        }
        let mut found: Vec<u32> = search.found.into_iter().collect();
        found.sort_unstable();
        found
    }
}

struct Search<'a> {
    around: &'a Neighbourhood<'a>,
    feature: u32,
    part: u32,
    found: FxHashSet<u32>,
}

impl Visitor for Search<'_> {
    fn enter(&mut self, node: usize) -> bool {
        let [low, high] = self.around.range[node];
        high > self.feature && !(low == high && self.found.contains(&low))
    }

    fn visit(&mut self, item: u32) {
        let Neighbourhood {
            parts,
            connected,
            spacing,
            ..
        } = *self.around;
        let other = connected.feature_of[item as usize];
        if other > self.feature
            && !self.found.contains(&other)
            && parts.closer_than(self.part, item, spacing)
        {
            self.found.insert(other);
        }
    }
}
