//! Instance to pieces: reductions that only delete or separate, each with its lemma, and the trail back.
//!
//! | file | reduction |
//! |---|---|
//! | [`peel`] | features with too few conflicting neighbours are coloured last |
//! | [`dominated`] | end fragments that follow their neighbour in the feature |
//! | [`components`] | connected components |
//! | [`blocks`] | biconnected blocks, restricted masks as a palette |
//! | [`cuts`] | parts that fewer conflict edges than masks join to the rest |
//! | [`identical`] | equal pieces are solved once |
//! | [`planted`] | bugs on purpose, for tests |
//!
//! A round peels and deletes, then splits into blocks; one more splits these along small cuts. In a block a node has fewer links than in the
//! whole graph, so rounds repeat while they change something, at most [`MOST_ROUNDS`] times: each is
//! n log n, so all are.

pub mod blocks;
pub mod components;
pub mod cuts;
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
    /// Small edge cuts.
    pub cuts: bool,
    /// Identical pieces.
    pub identical: bool,
}

impl Reductions {
    /// All of them.
    pub const ALL: Reductions = Reductions {
        peel: true,
        dominated: true,
        blocks: true,
        cuts: true,
        identical: true,
    };
    /// None of them: connected components only.
    pub const NONE: Reductions = Reductions {
        peel: false,
        dominated: false,
        blocks: false,
        cuts: false,
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
    /// Parts split off along small edge cuts, over all rounds.
    pub cut: usize,
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
        let cut_before = trail.last().is_some_and(|round| !round.across.is_empty());
        let bound = graph.bound(instance);
        delete(&graph, &bound, &mut alive, on, &mut counts, &mut steps);
        if steps.is_empty() && !trail.is_empty() && !cut_before {
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
        let mut before = std::mem::replace(&mut graph, next);
        before.forget_living(&alive);
        trail.push(Round {
            graph: before,
            steps,
            blocks,
            copies,
            across: Vec::new(),
        });
        if on.cuts {
            graph = split_at_cuts(graph, &mut counts, &mut trail);
        }
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

/// The graph split along small cuts, as a round of its own.
fn split_at_cuts(mut graph: Graph, counts: &mut Counts, trail: &mut Vec<Round>) -> Graph {
    let blocks = trail.last().map_or(&[][..], |round| &round.blocks);
    let Some((split, across)) = cuts::split(&graph, blocks) else {
        return graph;
    };
    let is_cut = |block: &&trail::Block| matches!(block.hinge, trail::Hinge::Cut { .. });
    counts.cut += split.blocks.iter().filter(is_cut).count();
    graph.forget_living(&vec![true; graph.node_count()]);
    trail.push(Round {
        graph,
        steps: Vec::new(),
        blocks: split.blocks,
        copies: split.copies,
        across,
    });
    split.graph
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
