//! Connected components: parts that no link joins share no cost, so they are solved apart and least
//! costs add up. Links are conflict edges, stitch edges and self-spacings; restrictions of masks need no
//! care here, since no mask is ever permuted.
//!
//! Union-find with path halving over the links: O(nodes + links log nodes).

use super::blocks::{NextGraph, Split};
use super::graph::Graph;
use super::trail::Hinge;

/// Splits the living part of a graph into its components, in the order of their first nodes.
pub fn split(graph: &Graph, alive: &[bool]) -> Split {
    let mut parent: Vec<u32> = (0..graph.node_count() as u32).collect();
    let living = |a: u32, b: u32| alive[a as usize] && alive[b as usize];
    for link in graph.links.iter().filter(|link| living(link.a, link.b)) {
        let (a, b) = (root(&mut parent, link.a), root(&mut parent, link.b));
        parent[a.max(b) as usize] = a.min(b);
    }
    let mut nodes: Vec<(u32, u32)> = (0..graph.node_count() as u32)
        .filter(|&node| alive[node as usize])
        .map(|node| (root(&mut parent, node), node))
        .collect();
    nodes.sort_unstable();
    let mut links: Vec<(u32, u32)> = (0..graph.links.len() as u32)
        .filter(|&link| living(graph.links[link as usize].a, graph.links[link as usize].b))
        .map(|link| (root(&mut parent, graph.links[link as usize].a), link))
        .collect();
    links.sort_unstable();
    let mut links = links.into_iter().peekable();
    let mut next = NextGraph::new(graph);
    for component in nodes.chunk_by(|a, b| a.0 == b.0) {
        next.begin(Hinge::Free);
        for &(_, node) in component {
            next.node(node, graph.allowed[node as usize]);
        }
        while let Some((_, link)) = links.next_if(|&(root, _)| root == component[0].0) {
            next.link(link);
        }
    }
    next.finish()
}

fn root(parent: &mut [u32], mut at: u32) -> u32 {
    while parent[at as usize] != at {
        parent[at as usize] = parent[parent[at as usize] as usize];
        at = parent[at as usize];
    }
    at
}
