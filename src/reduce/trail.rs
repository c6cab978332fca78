//! The trail: what the reductions did, round by round, so that `merge` can replay it backwards.

use super::graph::Graph;

/// One deletion, in terms of the nodes and features of its round's graph.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Step {
    /// The feature is coloured last, on one free mask.
    Peeled {
        /// The feature.
        feature: u32,
    },
    /// Node `u` takes the mask of node `v`.
    Dominated {
        /// The deleted node.
        u: u32,
        /// The node it follows.
        v: u32,
    },
}

/// Where a block hangs on the blocks before it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Hinge {
    /// On nothing, or on fixed masks: its colouring is taken as it is.
    Free,
    /// On this node of the round's graph, which an earlier block has coloured: the masks of the block
    /// are permuted so that it agrees.
    Node(u32),
    /// On conflict edges of the round, these of [`Round::across`]: the masks of the block are permuted so that all
    /// of them are resolved.
    Cut {
        /// The first one.
        first: u32,
        /// The end of them.
        end: u32,
    },
}

/// One block: a range of the nodes of the next round's graph.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Block {
    /// The first node in the next graph; the block ends where the next one begins.
    pub start: u32,
    /// Where it hangs.
    pub hinge: Hinge,
}

/// A round: a graph, the deletions in order, and the split of what is left into the next graph.
#[derive(Clone, Debug)]
pub struct Round {
    /// The graph of the round, without the links between nodes that it left.
    pub graph: Graph,
    /// The deletions in order.
    pub steps: Vec<Step>,
    /// The blocks, each after the block that it hangs on.
    pub blocks: Vec<Block>,
    /// For each node of the next graph the node of this one that it copies.
    pub copies: Vec<u32>,
    /// Conflict edges that small cuts cross: their outer and their inner node.
    pub across: Vec<[u32; 2]>,
}
