//! What comes strictly closer than the spacing to a feature or fragment, an owner of parts: all that is close
//! where there is one spacing for everything, and the first part of what is close where there are several
//! ([`super::spacing`]). Features with slanted shapes have a spacing of their own then.
//!
//! Each part of the owner asks the packed tree for what lies within the spacing of its box. Nodes carry
//! the range of owners below them: those that hold only owners seen already, or of no interest, are
//! not entered, so that an owner of many parts next to another one is not compared part by part.

use super::owners::Owners;
use super::parts::Parts;
use super::spacing::{Faces, Relation};
use crate::geometry::rtree::Visitor;
use rustc_hash::FxHashSet;

/// Parts and owners with what a search for neighbours needs.
pub(super) struct Neighbourhood<'a> {
    pub(super) parts: &'a Parts,
    pub(super) owners: &'a Owners,
    /// For each node of the tree the smallest and the largest owner in it.
    range: Vec<[u32; 2]>,
    /// What is close.
    pub(super) relation: &'a Relation,
    /// The outlines of the owners, where distances do not say it all.
    pub(super) faces: Option<&'a Faces>,
    /// Whether each owner has a slanted part; empty where that makes no difference.
    slanted: Vec<bool>,
}

impl<'a> Neighbourhood<'a> {
    /// Prepares the search for what is close. `faces` are those of the same owners.
    pub(super) fn new(
        parts: &'a Parts,
        owners: &'a Owners,
        relation: &'a Relation,
        faces: Option<&'a Faces>,
    ) -> Self {
        let range = parts.tree().gather(
            |part| [owners.of(part); 2],
            |a, b| [a[0].min(b[0]), a[1].max(b[1])],
        );
        let mut slanted = Vec::new();
        if relation.plain != relation.least {
            slanted.resize(owners.len(), false);
            let parts = (0..parts.len() as u32).filter(|&part| parts.is_slanted(part));
            parts.for_each(|part| slanted[owners.of(part) as usize] = true);
        }
        Neighbourhood {
            parts,
            owners,
            range,
            relation,
            faces,
            slanted,
        }
    }

    /// Two owners closer than this are close by their distance alone.
    pub(super) fn spacing(&self, a: u32, b: u32) -> i32 {
        let is_slanted = |owner: u32| self.slanted.get(owner as usize) == Some(&true);
        if is_slanted(a) || is_slanted(b) {
            self.relation.plain
        } else {
            self.relation.least
        }
    }

    /// The farthest that anything close by its distance alone is along either axis: strictly closer than s
    /// means at most s - 1.
    pub(super) fn reach(&self) -> i32 {
        let Relation { plain, least, .. } = *self.relation;
        let most = if self.slanted.is_empty() {
            least
        } else {
            plain
        };
        most.max(least) - 1
    }

    /// Whether a node of the tree holds parts of `owner` only.
    pub(super) fn is_only(&self, node: usize, owner: u32) -> bool {
        self.range[node] == [owner; 2]
    }

    /// The owners of larger numbers that are close to `owner` by their distance alone, ascending.
    pub(super) fn above(&self, owner: u32) -> Vec<u32> {
        let mut search = Search {
            around: self,
            owner,
            part: 0,
            found: FxHashSet::default(),
        };
        for &part in self.owners.parts_of(owner) {
            search.part = part;
            let reach = self.parts.box_of(part).grown(self.reach());
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
            relation,
            ..
        } = *self.around;
        let other = owners.of(item);
        if other > self.owner && !self.found.contains(&other) {
            let spacing = self.around.spacing(self.owner, other);
            if parts.closer_than(self.part, item, spacing, relation.metric) {
                self.found.insert(other);
            }
        }
    }
}
