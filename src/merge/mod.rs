//! Outcomes and trail back to a colouring of the whole instance.
//!
//! The rounds of the reductions are replayed last to first: blocks are put together (each permuted to
//! agree on the node, or to resolve the conflict edges, that it hangs on), then the deletions are undone in reverse order. The cost is counted
//! again on the instance and compared with the sum over the pieces.

use thiserror::Error;

use encodings::{Cost, Instance, Mask, Violation};

use crate::reduce::Reduced;
use crate::reduce::graph::Graph;
use crate::reduce::trail::{Hinge, Round, Step};

/// A colouring of the instance and its cost.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Merged {
    /// The mask of each fragment.
    pub colouring: Vec<Mask>,
    /// What it costs, counted on the instance.
    pub cost: Cost,
}

/// Why outcomes do not merge. Each of these is an error of this program, never of the input.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
pub enum MergeError {
    /// Not one colouring for each piece, or one of another length than its piece.
    #[error("internal error: piece {piece} has no colouring of its length")]
    Missing {
        /// The piece.
        piece: usize,
    },
    /// A fragment that nothing coloured, or coloured with a mask it may not take.
    #[error("internal error: merged masks are not legal: {0:?}")]
    Illegal(Violation),
    /// The costs of the pieces do not add up to the cost of the whole.
    #[error("internal error: the pieces cost {expected:?} in all, merged they cost {found:?}")]
    Cost {
        /// The sum over the pieces.
        expected: Cost,
        /// The cost counted on the instance.
        found: Cost,
    },
}

/// No mask yet.
const OPEN: Mask = Mask::MAX;

/// Merges one colouring for each piece, in the order of the pieces.
///
/// # Errors
/// Colourings that do not fit their pieces, and costs that do not add up.
pub fn merge(
    instance: &Instance,
    reduced: &Reduced,
    colourings: &[&[Mask]],
) -> Result<Merged, MergeError> {
    let nodes = reduced.trail.last().map_or(0, |round| round.copies.len());
    let mut colours = vec![OPEN; nodes];
    let mut expected = Cost::default();
    for (i, piece) in reduced.pieces.iter().enumerate() {
        let count = piece.instance.fragment_count();
        let own = colourings
            .get(i)
            .filter(|own| own.len() == count)
            .ok_or(MergeError::Missing { piece: i })?;
        let first = piece.first_node as usize;
        colours[first..first + count].copy_from_slice(own);
        expected += piece.instance.cost(own);
    }
    for round in reduced.trail.iter().rev() {
        colours = join_blocks(round, &colours);
        undo_steps(round, &mut colours);
    }
    instance
        .check_legal(&colours)
        .map_err(MergeError::Illegal)?;
    let cost = instance.cost(&colours);
    if cost != expected {
        return Err(MergeError::Cost {
            expected,
            found: cost,
        });
    }
    Ok(Merged {
        colouring: colours,
        cost,
    })
}

/// Puts the blocks of a round together: the masks of the nodes that its deletions left.
fn join_blocks(round: &Round, copies: &[Mask]) -> Vec<Mask> {
    let masks = round.graph.masks;
    let mut colours = vec![OPEN; round.graph.node_count()];
    for (i, block) in round.blocks.iter().enumerate() {
        let end = round
            .blocks
            .get(i + 1)
            .map_or(round.copies.len(), |next| next.start as usize);
        let range = block.start as usize..end;
        for at in range.clone() {
            let node = round.copies[at];
            // The node that the block hangs on has its mask already.
            if block.hinge != Hinge::Node(node) || colours[node as usize] == OPEN {
                colours[node as usize] = copies[at];
            }
        }
        let renamed = match block.hinge {
            Hinge::Free => continue,
            Hinge::Node(hinge) => {
                let own = (range.clone()).find(|&at| round.copies[at] == hinge);
                own.map(|at| swapped(masks, copies[at], colours[hinge as usize]))
            }
            Hinge::Cut { first, end } => {
                let edges = &round.across[first as usize..end as usize];
                let ends = |&edge: &[u32; 2]| edge.map(|node: u32| colours[node as usize]);
                apart(masks, &edges.iter().map(ends).collect::<Vec<_>>())
            }
        };
        for at in range {
            let mask = copies[at];
            let renamed = renamed.as_ref().and_then(|r| r.get(usize::from(mask)));
            colours[round.copies[at] as usize] = renamed.copied().unwrap_or(mask);
        }
    }
    colours
}

/// The renaming that swaps two masks.
fn swapped(masks: u8, a: Mask, b: Mask) -> Vec<Mask> {
    let mut renamed: Vec<Mask> = (0..masks).collect();
    if a.max(b) < masks {
        renamed.swap(usize::from(a), usize::from(b));
    }
    renamed
}

/// A renaming of the masks inside that resolves some edges, given by their masks outside and inside; the first one
/// in lexicographic order. Fewer edges than masks always leave one ([`crate::reduce::cuts`]).
fn apart(masks: u8, edges: &[[Mask; 2]]) -> Option<Vec<Mask>> {
    let mut forbidden = vec![0u8; usize::from(masks)];
    for &[outer, inner] in edges {
        *forbidden.get_mut(usize::from(inner))? |= 1u8.checked_shl(outer.into())?;
    }
    let mut renamed = Vec::new();
    choose(&forbidden, 0, &mut renamed).then_some(renamed)
}

/// Renames the masks from `renamed.len()` on; `used` are those taken.
fn choose(forbidden: &[u8], used: u8, renamed: &mut Vec<Mask>) -> bool {
    let Some(&not) = forbidden.get(renamed.len()) else {
        return true;
    };
    for mask in 0..forbidden.len() as Mask {
        if (used | not) >> mask & 1 == 0 {
            renamed.push(mask);
            if choose(forbidden, used | 1 << mask, renamed) {
                return true;
            }
            renamed.pop();
        }
    }
    false
}

/// Undoes the deletions of a round, last to first.
fn undo_steps(round: &Round, colours: &mut [Mask]) {
    for step in round.steps.iter().rev() {
        match *step {
            Step::Dominated { u, v } => colours[u as usize] = colours[v as usize],
            Step::Peeled { feature } => {
                let mask = free_mask(&round.graph, feature, colours);
                for node in round.graph.nodes_of(feature) {
                    // Fragments of it that were deleted before take their own masks next.
                    colours[node as usize] = mask;
                }
            }
        }
    }
}

/// The first mask that all fragments of the feature which lived then may take, and no coloured neighbour
/// has.
fn free_mask(graph: &Graph, feature: u32, colours: &[Mask]) -> Mask {
    let mut free = encodings::MaskSet::all(graph.masks);
    for node in graph.nodes_of(feature) {
        free = free.intersection(graph.allowed[node as usize]);
        for other in graph.conflicting(node) {
            let mask = colours[other as usize];
            if mask != OPEN {
                free = free.without(mask);
            }
        }
    }
    free.first().unwrap_or(OPEN)
}
