//! Pieces: the components of the last graph as instances of their own.

use encodings::{Instance, InstanceBuilder, InstanceError};

use super::graph::{Graph, Origin};
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
    let mut of_block: Vec<(u32, u32)> = Vec::with_capacity(graph.links.len());
    for (link, ends) in graph.links.iter().enumerate() {
        let block = blocks.partition_point(|block| block.start <= ends.a) as u32;
        of_block.push((block, link as u32));
    }
    of_block.sort_unstable();
    let mut links = of_block.as_slice();
    let mut found = Vec::with_capacity(blocks.len());
    for (i, block) in blocks.iter().enumerate() {
        let end = blocks
            .get(i + 1)
            .map_or(graph.node_count() as u32, |next| next.start);
        let own = links.partition_point(|&(of, _)| of == i as u32 + 1);
        let (own, rest) = links.split_at(own);
        links = rest;
        found.push(piece(graph, block.start..end, own, whole)?);
    }
    Ok(found)
}

fn piece(
    graph: &Graph,
    nodes: std::ops::Range<u32>,
    links: &[(u32, u32)],
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
    let mut own: Vec<(Origin, [u32; 2])> = links
        .iter()
        .map(|&(_, link)| {
            let link = graph.links[link as usize];
            (link.origin, [link.a - nodes.start, link.b - nodes.start])
        })
        .collect();
    own.sort_unstable();
    let (mut pairs, mut self_spacings, mut stitches) = (Vec::new(), Vec::new(), Vec::new());
    for group in own.chunk_by(|a, b| a.0 == b.0) {
        let [a, b] = group[0].1;
        match group[0].0 {
            Origin::Pair(pair) => {
                builder.pair(group.iter().map(|&(_, edge)| edge));
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
    Ok(Piece {
        instance: builder.build()?,
        first_node: nodes.start,
        fragments: nodes.map(|node| graph.fragment[node as usize]).collect(),
        pairs,
        self_spacings,
        stitches,
    })
}
