//! What comes strictly closer than the spacing to a feature or fragment, an owner of parts.
//!
//! Each part of the owner asks the packed tree for what lies within the spacing of its box. Nodes carry
//! the range of owners below them: those that hold only owners seen already, or of no interest, are
//! not entered, so that an owner of many parts next to another one is not compared part by part.

use super::owners::Owners;
use super::parts::Parts;
use crate::geometry::rtree::Visitor;
use rustc_hash::FxHashSet;

/// Parts and owners with what a search for neighbours needs.
pub(super) struct Neighbourhood<'a> {
    pub(super) parts: &'a Parts,
    pub(super) owners: &'a Owners,
    /// For each node of the tree the smallest and the largest owner in it.
    range: Vec<[u32; 2]>,
    spacing: i32,
}

impl<'a> Neighbourhood<'a> {
    /// Prepares the search for neighbours closer than `spacing`, which is at least 1.
    pub(super) fn new(parts: &'a Parts, owners: &'a Owners, spacing: i32) -> Self {
        let range = parts.tree().gather(
            |part| [owners.of(part); 2],
            |a, b| [a[0].min(b[0]), a[1].max(b[1])],
        );
        Neighbourhood {
            parts,
            owners,
            range,
            spacing,
        }
    }

    /// The spacing.
    pub(super) fn spacing(&self) -> i32 {
        self.spacing
    }

    /// Whether a node of the tree holds parts of `owner` only.
    pub(super) fn is_only(&self, node: usize, owner: u32) -> bool {
        self.range[node] == [owner; 2]
    }

    /// The owners of larger numbers that are closer to `owner` than the spacing, ascending.
    pub(super) fn above(&self, owner: u32) -> Vec<u32> {
        let mut search = Search {
            around: self,
            owner,
            part: 0,
            found: FxHashSet::default(),
        };
        for &part in self.owners.parts_of(owner) {
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
    owner: u32,
    part: u32,
    found: FxHashSet<u32>,
}

impl Visitor for Search<'_> {
    fn enter(&mut self, node: usize) -> bool {
        let [low, high] = self.around.range[node];
        high > self.owner && !(low == high && self.found.contains(&low))
    }

    fn visit(&mut self, item: u32) {
        let Neighbourhood {
            parts,
            owners,
            spacing,
            ..
        } = *self.around;
        let other = owners.of(item);
        if other > self.owner
            && !self.found.contains(&other)
            && parts.closer_than(self.part, item, spacing)
        {
            self.found.insert(other);
        }
    }
}
