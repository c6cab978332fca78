//! Connected components: parts that no link joins share no cost, so they are solved apart and least
//! costs add up. Links are conflict edges, stitch edges, self-spacings and holds; restrictions of masks need no
//! care here, since no mask is ever permuted.
//!
//! Union-find (petgraph's) over the links: near linear.

use petgraph::unionfind::UnionFind;

use super::blocks::{NextGraph, Split};
use super::graph::Graph;
use super::planted::{self, Bug};
use super::trail::Hinge;

/// Splits the living part of a graph into its components, in the order of their first nodes.
pub fn split(graph: &Graph, alive: &[bool]) -> Split {
    let component = components(graph, alive);
    let mut nodes: Vec<(u32, u32)> = (0..graph.node_count() as u32)
        .filter(|&node| alive[node as usize])
        .map(|node| (component[node as usize], node))
        .collect();
    nodes.sort_unstable();
    let mut links: Vec<(u32, u32)> = graph
        .links
        .iter()
        .enumerate()
        .filter(|(_, link)| alive[link.a as usize] && alive[link.b as usize])
        .map(|(i, link)| (component[link.a as usize], i as u32))
        .collect();
    links.sort_unstable();
    let mut holds: Vec<(u32, u32)> = (0u32..)
        .zip(&graph.holds)
        .filter_map(|(i, hold)| {
            let first = hold.nodes.iter().find(|&&node| alive[node as usize])?;
            Some((component[*first as usize], i))
        })
        .collect();
    holds.sort_unstable();
    let mut holds = holds.into_iter().peekable();
    let mut links = links.into_iter().peekable();
    let mut next = NextGraph::new(graph);
    for own in nodes.chunk_by(|a, b| a.0 == b.0) {
        next.begin(Hinge::Free);
        for &(_, node) in own {
            next.node(node, graph.allowed[node as usize]);
        }
        while let Some((_, link)) = links.next_if(|&(of, _)| of == own[0].0) {
            if !planted::has(Bug::Components) || link % 3 > 0 {
                next.link(link);
            }
        }
        while let Some((_, hold)) = holds.next_if(|&(of, _)| of == own[0].0) {
            next.hold(hold, alive);
        }
    }
    next.finish()
}

/// The first node of each node's component.
fn components(graph: &Graph, alive: &[bool]) -> Vec<u32> {
    let mut sets = UnionFind::new(graph.node_count());
    for link in &graph.links {
        if alive[link.a as usize] && alive[link.b as usize] {
            sets.union(link.a as usize, link.b as usize);
        }
    }
    for [a, b] in graph.holds.iter().flat_map(|hold| hold.cycle(alive)) {
        sets.union(a as usize, b as usize);
    }
    let labels: Vec<usize> = sets.into_labeling();
    let mut first = vec![u32::MAX; labels.len()];
    for (node, &label) in labels.iter().enumerate().rev() {
        first[label] = node as u32;
    }
    labels.into_iter().map(|label| first[label]).collect()
}
