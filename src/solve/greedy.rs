//! Saturation-degree ordering on whole features: a first colouring without stitches.
//!
//! The next feature is the one with the fewest masks left that no neighbour has, ties by more conflict
//! pairs, then by number; it takes the allowed mask with the fewest new conflicts. Where the result costs
//! nothing it is optimal. Brelaz, "New methods to color the vertices of a graph", CACM 1979 (exact on
//! bipartite graphs); where we differ: masks may be forbidden, and it never gives up but pays.
//!
//! O(n log n) with a heap of stale entries.

use std::collections::BinaryHeap;

use encodings::{Instance, Mask, MaskSet};

/// Colours every feature with one mask that all its fragments may take; a feature without one gets for
/// each fragment the first mask that it may take.
pub fn colour(instance: &Instance) -> Vec<Mask> {
    let graph = FeatureGraph::of(instance);
    let count = graph.allowed.len();
    // How many coloured neighbours have each mask.
    let masks = instance.masks() as usize;
    let mut taken = vec![0u32; count * masks];
    let mut mask_of: Vec<Option<Mask>> = vec![None; count];
    let left = |taken: &[u32], f: usize| {
        let own = &taken[f * masks..(f + 1) * masks];
        graph.allowed[f]
            .iter()
            .filter(|&mask| own[mask as usize] == 0)
            .count()
    };
    let entry = |left: usize, f: usize| {
        (
            std::cmp::Reverse(left),
            graph.neighbours(f).len(),
            std::cmp::Reverse(f),
        )
    };
    let mut heap: BinaryHeap<_> = (0..count).map(|f| entry(left(&taken, f), f)).collect();
    while let Some((was, _, std::cmp::Reverse(f))) = heap.pop() {
        if mask_of[f].is_some() || was.0 != left(&taken, f) {
            continue;
        }
        let own = &taken[f * masks..(f + 1) * masks];
        let Some(mask) = graph.allowed[f]
            .iter()
            .min_by_key(|&mask| (own[mask as usize], mask))
        else {
            mask_of[f] = Some(0);
            continue;
        };
        mask_of[f] = Some(mask);
        for &other in graph.neighbours(f) {
            let other = other as usize;
            taken[other * masks + mask as usize] += 1;
            if mask_of[other].is_none() {
                heap.push(entry(left(&taken, other), other));
            }
        }
    }
    (0..instance.fragment_count() as u32)
        .map(|fragment| {
            let feature = instance.feature_of(fragment) as usize;
            let mask = mask_of[feature].filter(|&mask| instance.allowed(fragment).contains(mask));
            mask.or(instance.allowed(fragment).first()).unwrap_or(0)
        })
        .collect()
}

/// Features, the masks that all their fragments may take, and their neighbours by conflict pairs.
struct FeatureGraph {
    allowed: Vec<MaskSet>,
    start: Vec<u32>,
    neighbours: Vec<u32>,
}

impl FeatureGraph {
    fn of(instance: &Instance) -> FeatureGraph {
        let allowed: Vec<MaskSet> = (0..instance.feature_count() as u32)
            .map(|feature| {
                let fragments = instance.fragments_of(feature);
                fragments
                    .map(|fragment| instance.allowed(fragment))
                    .fold(MaskSet::all(instance.masks()), MaskSet::intersection)
            })
            .collect();
        let mut ends: Vec<[u32; 2]> = Vec::with_capacity(instance.pair_count() * 2);
        for edges in instance.pairs() {
            let [a, b] = edges[0].map(|fragment| instance.feature_of(fragment));
            ends.extend([[a, b], [b, a]]);
        }
        ends.sort_unstable();
        let mut start = vec![0u32; allowed.len() + 1];
        for &[a, _] in &ends {
            start[a as usize + 1] += 1;
        }
        for i in 1..start.len() {
            start[i] += start[i - 1];
        }
        let neighbours = ends.into_iter().map(|[_, b]| b).collect();
        FeatureGraph {
            allowed,
            start,
            neighbours,
        }
    }

    fn neighbours(&self, feature: usize) -> &[u32] {
        &self.neighbours[self.start[feature] as usize..self.start[feature + 1] as usize]
    }
}
