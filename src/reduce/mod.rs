//! Instance to pieces: reductions that only delete or separate, each with its lemma, and the trail back.
//!
//! | file | reduction |
//! |---|---|
//! | [`peel`] | features with too few conflicting neighbours are coloured last |
//! | [`dominated`] | end fragments that follow their neighbour in the feature |
//! | [`components`] | connected components |
//! | [`blocks`] | biconnected blocks, restricted masks as a palette |
//! | [`identical`] | equal pieces are solved once |
//! | [`planted`] | bugs on purpose, for tests |
//!
//! A round peels and deletes, then splits. In a block a node has fewer links than in the
//! whole graph, so rounds repeat while they change something, at most [`MOST_ROUNDS`] times: each is
//! n log n, so all are.

pub mod blocks;
pub mod components;
pub mod dominated;
pub mod graph;
pub mod identical;
pub mod peel;
pub mod pieces;
pub mod planted;
pub mod trail;

use encodings::{Instance, InstanceError};

use blocks::Split;
use graph::Graph;
pub use pieces::Piece;
use trail::Round;

/// A bound on the rounds, and on the passes within one, so that no chain makes the reductions quadratic.
pub const MOST_ROUNDS: usize = 6;

/// Which reductions are on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Reductions {
    /// Peeling.
    pub peel: bool,
    /// Dominated fragments.
    pub dominated: bool,
    /// Biconnected blocks; components where it is off.
    pub blocks: bool,
    /// Identical pieces.
    pub identical: bool,
}

impl Reductions {
    /// All of them.
    pub const ALL: Reductions = Reductions {
        peel: true,
        dominated: true,
        blocks: true,
        identical: true,
    };
    /// None of them: connected components only.
    pub const NONE: Reductions = Reductions {
        peel: false,
        dominated: false,
        blocks: false,
        identical: false,
    };
}

/// How much each reduction did.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Counts {
    /// Features peeled, over all rounds.
    pub peeled: usize,
    /// Fragments deleted as dominated, over all rounds.
    pub dominated: usize,
    /// Pieces that are equal to an earlier one.
    pub identical: usize,
}

/// The pieces of an instance and the trail back.
#[derive(Clone, Debug)]
pub struct Reduced {
    /// The pieces, in the order of the last round's blocks.
    pub pieces: Vec<Piece>,
    /// For each piece the one that stands for it, and how.
    pub same_as: Vec<identical::SameAs>,
    /// The rounds, first to last.
    pub trail: Vec<Round>,
    /// How much each reduction did.
    pub counts: Counts,
}

/// Reduces an instance to its pieces.
///
/// # Errors
/// None for valid instances; a broken invariant of a piece is reported rather than trusted.
pub fn reduce(instance: &Instance, on: Reductions) -> Result<Reduced, InstanceError> {
    let mut graph = Graph::of(instance);
    let mut counts = Counts::default();
    let mut trail: Vec<Round> = Vec::new();
    while trail.len() < MOST_ROUNDS {
        let mut alive = vec![true; graph.node_count()];
        let mut steps = Vec::new();
        let bound = graph.bound(instance);
        delete(&graph, &bound, &mut alive, on, &mut counts, &mut steps);
        if steps.is_empty() && !trail.is_empty() {
            // The blocks that the last round made are as they were.
            break;
        }
        let Split {
            graph: next,
            blocks,
            copies,
        } = if on.blocks {
            blocks::split(&graph, &alive)
        } else {
            components::split(&graph, &alive)
        };
        let mut graph = std::mem::replace(&mut graph, next);
        graph.forget_living(&alive);
        trail.push(Round {
            graph,
            steps,
            blocks,
            copies,
        });
    }
    let blocks = trail.last().map_or(&[][..], |round| &round.blocks);
    let pieces = pieces::pieces(&graph, blocks, instance)?;
    let same_as = identical::find(&pieces, on.identical);
    counts.identical = same_as.iter().filter(|same| same.is_copy()).count();
    Ok(Reduced {
        pieces,
        same_as,
        trail,
        counts,
    })
}

/// Peels and deletes until neither finds more, a bounded number of times.
fn delete(
    graph: &Graph,
    bound: &[bool],
    alive: &mut [bool],
    on: Reductions,
    counts: &mut Counts,
    steps: &mut Vec<trail::Step>,
) {
    for _ in 0..MOST_ROUNDS {
        let peeled = if on.peel {
            peel::peel(graph, alive, bound, steps)
        } else {
            0
        };
        let dominated = if on.dominated {
            dominated::delete_dominated(graph, alive, bound, steps)
        } else {
            0
        };
        counts.peeled += peeled;
        counts.dominated += dominated;
        if dominated == 0 {
            break;
        }
    }
}
