//! Outcomes of pieces, kept from one combination to the next.
//!
//! The same place of a layer often gives the same piece under several spacings, overlaps or policies: a cluster of
//! features far from everything else, say. Such pieces are equal as values, since features and fragments are numbered by place,
//! so they are looked up whole (K and the areas included), with no search for a renumbering; within a
//! combination the reductions have done that already. A piece's outcome depends on nothing but the piece unless a
//! limit stopped it, so what was proven is kept, and what was not is tried again.

use rustc_hash::FxHashMap;

use encodings::Instance;

use crate::reduce::Reduced;
use crate::solve::{self, Choice, Engine, Limits, PieceOutcome};

/// The most fragments that are kept in all: some hundred megabytes with their conflicts.
const MOST_FRAGMENTS: usize = 1 << 20;

/// Pieces that are proven, with their outcomes.
#[derive(Debug, Default)]
pub struct Known {
    outcomes: FxHashMap<Instance, PieceOutcome>,
    fragments: usize,
}

impl Known {
    /// The outcomes of all pieces, in their order; those that are not known are solved.
    pub fn solve(&mut self, reduced: &Reduced, limits: &Limits) -> Vec<PieceOutcome> {
        let pieces = reduced.pieces.iter();
        let known: Vec<Option<PieceOutcome>> = (pieces.zip(&reduced.same_as))
            .map(|(piece, same)| match same.is_copy() {
                true => None,
                false => self.outcomes.get(&piece.instance).cloned(),
            })
            .collect();
        let was_open: Vec<bool> = known.iter().map(Option::is_none).collect();
        let outcomes = solve::solve_open_pieces(reduced, known, Choice::Auto, limits, &|_| ());
        for ((piece, outcome), was_open) in reduced.pieces.iter().zip(&outcomes).zip(was_open) {
            if was_open && is_worth_keeping(outcome) {
                self.keep(&piece.instance, outcome);
            }
        }
        outcomes
    }

    fn keep(&mut self, piece: &Instance, outcome: &PieceOutcome) {
        let fragments = self.fragments + piece.fragment_count();
        if fragments <= MOST_FRAGMENTS {
            self.fragments = fragments;
            self.outcomes.insert(piece.clone(), outcome.clone());
        }
    }
}

/// What a greedy colouring or another piece gives is had again at no cost.
fn is_worth_keeping(outcome: &PieceOutcome) -> bool {
    let proven = outcome.conflicts.is_tight() && outcome.stitches.is_tight();
    proven && matches!(outcome.engine, Engine::Enumeration | Engine::CoreGuided)
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::reduce::{Reductions, reduce};
    use encodings::InstanceBuilder;

    /// A clique of `size` features.
    fn clique(size: u32, masks: u8) -> Instance {
        let mut builder = InstanceBuilder::new(masks);
        for _ in 0..size {
            builder.feature(1);
        }
        for a in 0..size {
            for b in a + 1..size {
                builder.pair([[a, b]]);
            }
        }
        builder.build().unwrap()
    }

    #[test]
    fn pieces_are_kept_by_value_and_number_of_masks() {
        let mut known = Known::default();
        let mut conflicts = |size, masks| {
            let reduced = reduce(&clique(size, masks), Reductions::ALL).unwrap();
            let outcomes = known.solve(&reduced, &Limits::default());
            let total: u64 = outcomes.iter().map(|found| found.conflicts.upper).sum();
            (total, known.outcomes.len())
        };
        // The least number of conflicts of a clique by Turan: features dealt evenly over the masks.
        assert_eq!(conflicts(5, 2), (4, 1));
        assert_eq!(conflicts(5, 2), (4, 1));
        assert_eq!(conflicts(5, 3), (2, 2));
        assert_eq!(conflicts(6, 2), (6, 3));
        assert_eq!(conflicts(5, 3), (2, 3));
        // Peeled away: no piece is left.
        assert_eq!(conflicts(3, 3), (0, 3));
    }
}
