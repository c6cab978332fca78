//! Pieces: the blocks of the last graph as instances of their own.

use encodings::{Instance, InstanceBuilder, InstanceError, Stitch, Tie};

use super::graph::{Graph, Hold, Link, Origin, Reason};
use super::trail::Block;

/// One piece: a sub-instance, and what its numbers stand for in the whole instance.
#[derive(Clone, Debug)]
pub struct Piece {
    /// The sub-instance.
    pub instance: Instance,
    /// The node of the last graph that its first fragment is; the others follow.
    pub first_node: u32,
    /// For each fragment of the piece the fragment of the instance.
    pub fragments: Vec<u32>,
    /// For each conflict pair of the piece the pair of the instance.
    pub pairs: Vec<u32>,
    /// For each self-spacing of the piece the one of the instance.
    pub self_spacings: Vec<u32>,
    /// For each stitch edge of the piece the one of the instance.
    pub stitches: Vec<u32>,
}

/// Cuts the last graph into pieces, one for each of its blocks.
///
/// # Errors
/// None for graphs that the reductions make: they keep the invariants of instances. Reported rather
/// than trusted.
pub fn pieces(
    graph: &Graph,
    blocks: &[Block],
    whole: &Instance,
) -> Result<Vec<Piece>, InstanceError> {
    // The links of a block lie together, in the order of what they come from ([`super::blocks`]).
    let mut links = graph.links.as_slice();
    let mut holds = graph.holds.as_slice();
    let mut found = Vec::with_capacity(blocks.len());
    for (i, block) in blocks.iter().enumerate() {
        let end = blocks
            .get(i + 1)
            .map_or(graph.node_count() as u32, |next| next.start);
        let (own, rest) = links.split_at(links.partition_point(|link| link.a < end));
        links = rest;
        let (held, later) = holds.split_at(holds.partition_point(|hold| hold.nodes[0] < end));
        holds = later;
        found.push(piece(graph, block.start..end, own, held, whole)?);
    }
    Ok(found)
}

fn piece(
    graph: &Graph,
    nodes: std::ops::Range<u32>,
    links: &[Link],
    holds: &[Hold],
    whole: &Instance,
) -> Result<Piece, InstanceError> {
    let mut builder = InstanceBuilder::new(graph.masks);
    let mut node = nodes.start;
    while node < nodes.end {
        let feature = graph.nodes_of(graph.feature[node as usize]);
        builder.feature(feature.len() as u32);
        node = feature.end;
    }
    for node in nodes.clone() {
        builder.allow(node - nodes.start, graph.allowed[node as usize]);
        builder.area(
            node - nodes.start,
            whole.area(graph.fragment[node as usize]),
        );
    }
    let ends = |link: &Link| [link.a - nodes.start, link.b - nodes.start];
    let (mut pairs, mut self_spacings, mut stitches) = (Vec::new(), Vec::new(), Vec::new());
    for group in links.chunk_by(|a, b| a.origin == b.origin) {
        let [a, b] = ends(&group[0]);
        match group[0].origin {
            Origin::Pair(pair) => {
                builder.pair(group.iter().map(ends));
                pairs.push(pair);
            }
            Origin::SelfSpacing(i) => {
                builder.self_spacing(a, b);
                self_spacings.push(i);
            }
            Origin::Stitch(i) => {
                builder.stitch(a, b, whole.stitches()[i as usize].weight);
                stitches.push(i);
            }
        }
    }
    for hold in holds {
        if let Reason::Tie(tie) = hold.reason {
            let tie = within(&whole.ties()[tie as usize], graph, &hold.nodes, nodes.start);
            tie.into_iter().for_each(|tie| builder.tie(tie));
        }
    }
    Ok(Piece {
        instance: builder.build()?,
        first_node: nodes.start,
        fragments: nodes.map(|node| graph.fragment[node as usize]).collect(),
        pairs,
        self_spacings,
        stitches,
    })
}

/// What is left of a tie between the nodes of a piece, which begins with node `first`; `None` where nothing
/// can break it any more. (Stitch edges of nodes that were deleted are no stitches.)
fn within(tie: &Tie, graph: &Graph, nodes: &[u32], first: u32) -> Option<Tie> {
    let number = |fragment: u32| {
        let of = |&&node: &&u32| graph.fragment[node as usize] == fragment;
        nodes.iter().find(of).map(|node| node - first)
    };
    let Tie::AtMost { most, stitches } = tie else {
        return tie.renumbered(number);
    };
    let living = |stitch: &&Stitch| number(stitch.a).is_some() && number(stitch.b).is_some();
    let stitches: Vec<Stitch> = stitches.iter().filter(living).copied().collect();
    let sum: u64 = stitches.iter().map(|s| u64::from(s.weight)).sum();
    let most = *most;
    (sum > u64::from(most))
        .then_some(Tie::AtMost { most, stitches })?
        .renumbered(number)
}
