//! Dominated fragments: the last fragment of a feature that conflicts with nothing its neighbour in the
//! feature does not conflict with takes the neighbour's mask.
//!
//! Lemma. Let u have one stitch edge, to v, no self-spacing, no mask forbidden that v may take, and let
//! every conflict edge (u, w) have a sister (v, w). Take any colouring and give u the mask of v: the
//! stitch between them vanishes; a pair that the edge (u, w) now leaves unresolved is unresolved by
//! (v, w) already, and it is the same pair, since pairs are between features; u lies on no path between
//! two other fragments, so no self-spacing changes. Cost does not rise, so some least colouring has u
//! like v, and deleting u changes the least cost by nothing.

use super::graph::{Graph, Link, Origin};
use super::trail::Step;

/// Deletes dominated fragments to a fixed point; returns how many.
pub fn delete_dominated(graph: &Graph, alive: &mut [bool], steps: &mut Vec<Step>) -> usize {
    let before = steps.len();
    for feature in 0..graph.feature_count() as u32 {
        let nodes = graph.nodes_of(feature);
        if nodes.len() < 2 {
            continue;
        }
        // A deletion can only make the one fragment that it hung on dominated.
        let mut waiting: Vec<u32> = nodes.rev().filter(|&node| alive[node as usize]).collect();
        while let Some(u) = waiting.pop() {
            if let Some(v) = dominator(graph, alive, u) {
                alive[u as usize] = false;
                steps.push(Step::Dominated { u, v });
                waiting.push(v);
            }
        }
    }
    steps.len() - before
}

/// The neighbour in its feature that dominates `u`, if one does.
fn dominator(graph: &Graph, alive: &[bool], u: u32) -> Option<u32> {
    if !alive[u as usize] {
        return None;
    }
    let living = |link: &&Link| alive[link.other(u) as usize];
    let mut only = None;
    for link in graph.links_of(u).filter(living) {
        match link.origin {
            Origin::SelfSpacing(_) => return None,
            Origin::Stitch(_) if only.is_some() => return None,
            Origin::Stitch(_) => only = Some(link.other(u)),
            Origin::Pair(_) => {}
        }
    }
    let v = only?;
    if !graph.allowed[v as usize].is_subset(graph.allowed[u as usize]) {
        return None;
    }
    let mut of_v: Vec<u32> = graph.conflicting(v).collect();
    of_v.sort_unstable();
    graph
        .conflicting(u)
        .filter(|&w| alive[w as usize])
        .all(|w| of_v.binary_search(&w).is_ok())
        .then_some(v)
}
