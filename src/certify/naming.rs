//! From the fragments of a piece to those of the instance; for a copy, by way of the piece that it equals.

use crate::certificate::{Edge, Unit};
use crate::reduce::Reduced;

/// For each fragment of the piece that was solved the fragment of the instance that it stands for.
pub struct Names(Vec<u32>);

impl Names {
    /// The names of `piece`, in the numbering of the piece that was solved in its stead.
    pub fn of(reduced: &Reduced, piece: usize) -> Names {
        let own = &reduced.pieces[piece].fragments;
        let same = &reduced.same_as[piece];
        if !same.is_copy() {
            return Names(own.clone());
        }
        let mut names = vec![0; own.len()];
        for (&theirs, &fragment) in same.fragment.iter().zip(own) {
            names[theirs as usize] = fragment;
        }
        Names(names)
    }

    /// An edge, the smaller fragment first.
    pub fn edge(&self, [a, b]: Edge) -> Edge {
        let [a, b] = [self.0[a as usize], self.0[b as usize]];
        [a.min(b), a.max(b)]
    }

    /// A unit, its edges ascending.
    pub fn unit(&self, unit: &Unit) -> Unit {
        let mut edges: Unit = unit.iter().map(|&edge| self.edge(edge)).collect();
        edges.sort_unstable();
        edges
    }

    /// Units in the order of their first edges.
    pub fn units(&self, units: &[Unit]) -> Vec<Unit> {
        let mut units: Vec<Unit> = units.iter().map(|unit| self.unit(unit)).collect();
        units.sort_unstable();
        units
    }
}
