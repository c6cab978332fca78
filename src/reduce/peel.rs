//! Peeling: a feature with too few conflicting neighbours is coloured last, without cost.
//!
//! Lemma. Let the feature have fewer distinct conflicting neighbour fragments than there are masks that
//! all its fragments may take. Then any colouring of the rest extends to it at no cost: its fragments
//! all take one such mask that no neighbour fragment has. No conflict arises, no stitch, and no
//! self-spacing (the fragments are joined on one mask); ties between its stitches hold where there is none. A feature
//! that a tie binds to another fragment is not peeled. So the least cost with and without the feature
//! are equal, and deleting it may make others fall below their number in turn (the degree argument for
//! graph colouring, folklore since Kempe 1879).
//!
//! The count of distinct neighbour fragments is a sum over the pairs of the feature, since two pairs
//! never share a neighbour feature: O(1) for each fragment edge in all.

use super::graph::{Graph, Origin};
use super::planted::{self, Bug};
use super::trail::Step;

/// Peels to a fixed point among the nodes that are `alive`; clears what it peels and records the
/// features in order.
pub fn peel(graph: &Graph, alive: &mut [bool], bound: &[bool], steps: &mut Vec<Step>) -> usize {
    let mut count: Vec<u32> = (0..graph.feature_count() as u32)
        .map(|feature| neighbour_fragments(graph, alive, feature).len() as u32)
        .collect();
    let mut gone: Vec<bool> = (0..graph.feature_count() as u32)
        .map(|feature| {
            let mut nodes = graph.nodes_of(feature);
            nodes.clone().all(|node| !alive[node as usize])
                || nodes.any(|node| bound[node as usize])
        })
        .collect();
    // No fragment of a feature that is not peeled dies here, so this holds to the end.
    let masks: Vec<u32> = (0..graph.feature_count() as u32)
        .map(|feature| common_masks(graph, alive, feature))
        .collect();
    let mut queue: Vec<u32> = Vec::new();
    for feature in 0..graph.feature_count() as u32 {
        if !gone[feature as usize] && is_free(count[feature as usize], masks[feature as usize]) {
            gone[feature as usize] = true;
            queue.push(feature);
        }
    }
    let mut next = 0;
    while let Some(&feature) = queue.get(next) {
        next += 1;
        steps.push(Step::Peeled { feature });
        for (node, by) in touched(graph, alive, feature) {
            let other = graph.feature[node as usize] as usize;
            count[other] -= by;
            if !gone[other] && is_free(count[other], masks[other]) {
                gone[other] = true;
                queue.push(other as u32);
            }
        }
        for node in graph.nodes_of(feature) {
            alive[node as usize] = false;
        }
    }
    queue.len()
}

/// Whether a mask is left over for a feature.
fn is_free(neighbours: u32, masks: u32) -> bool {
    neighbours < masks + u32::from(planted::has(Bug::Peel))
}

/// How many masks all living fragments of the feature may take.
fn common_masks(graph: &Graph, alive: &[bool], feature: u32) -> u32 {
    graph
        .nodes_of(feature)
        .filter(|&node| alive[node as usize])
        .map(|node| graph.allowed[node as usize])
        .reduce(|a, b| a.intersection(b))
        .map_or(0, |set| set.len())
}

/// The distinct living fragments in conflict with the feature, ascending.
fn neighbour_fragments(graph: &Graph, alive: &[bool], feature: u32) -> Vec<u32> {
    let mut found: Vec<u32> = graph
        .nodes_of(feature)
        .filter(|&node| alive[node as usize])
        .flat_map(|node| graph.conflicting(node))
        .filter(|&other| alive[other as usize])
        .collect();
    found.sort_unstable();
    found.dedup();
    found
}

/// For each pair of the feature that still lives: a node of the neighbour feature, and how many
/// fragments of `feature` the neighbour sees there, which it loses with the feature.
fn touched(graph: &Graph, alive: &[bool], feature: u32) -> Vec<(u32, u32)> {
    let mut seen: Vec<(u32, u32, u32)> = graph
        .nodes_of(feature)
        .filter(|&node| alive[node as usize])
        .flat_map(|node| graph.links_of(node).map(move |link| (node, link)))
        .filter_map(|(node, link)| match link.origin {
            Origin::Pair(pair) if alive[link.other(node) as usize] => {
                Some((pair, node, link.other(node)))
            }
            _ => None,
        })
        .collect();
    seen.sort_unstable();
    seen.dedup_by_key(|&mut (pair, node, _)| (pair, node));
    seen.chunk_by(|a, b| a.0 == b.0)
        .map(|pair| (pair[0].2, pair.len() as u32))
        .collect()
}
