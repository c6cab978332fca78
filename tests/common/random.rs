//! Random small instances with everything that an instance may hold: features of several fragments
//! with trees and cycles of stitches, weights, several edges to a pair, masks excluded, self-spacings.

use encodings::{Instance, InstanceBuilder, MaskSet};
use rand::seq::SliceRandom;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

/// The instance of K masks that belongs to `seed`: the same on every machine.
pub fn instance(masks: u8, seed: u64) -> Instance {
    let rng = &mut Pcg64::seed_from_u64(seed * 8 + u64::from(masks));
    let most = [9, 7, 7, 6][usize::from(masks) - 2];
    let features = features(rng, most);
    let mut builder = InstanceBuilder::new(masks);
    for &size in &features {
        builder.feature(size);
    }
    add_stitches_and_self_spacings(rng, &features, &mut builder);
    add_pairs(rng, &features, &mut builder);
    exclude_masks(rng, masks, &mut builder);
    builder.build().expect("the generator keeps the invariants")
}

/// How many fragments each feature has: up to `most` in all, in few large or many small features.
fn features(rng: &mut Pcg64, most: u32) -> Vec<u32> {
    let mut left = if rng.random_bool(0.8) {
        rng.random_range(4..=most)
    } else {
        rng.random_range(1..=most)
    };
    let largest = rng.random_range(1..=4);
    let mut sizes = Vec::new();
    while left > 0 {
        let size = rng.random_range(1..=largest.min(left));
        sizes.push(size);
        left -= size;
    }
    sizes
}

/// The fragments of each feature.
fn ranges(features: &[u32]) -> Vec<std::ops::Range<u32>> {
    let mut start = 0;
    features
        .iter()
        .map(|size| {
            start += size;
            start - size..start
        })
        .collect()
}

fn add_stitches_and_self_spacings(
    rng: &mut Pcg64,
    features: &[u32],
    builder: &mut InstanceBuilder,
) {
    let heaviest = if rng.random_bool(0.5) { 1 } else { 3 };
    let chance_of_cycle = if rng.random_bool(0.5) { 0.5 } else { 0.0 };
    let chance_of_spacing = if rng.random_bool(0.5) { 0.5 } else { 0.0 };
    for range in ranges(features) {
        let mut order: Vec<u32> = range.collect();
        order.shuffle(rng);
        for i in 1..order.len() {
            // A random tree: each fragment after the first hangs on an earlier one.
            let parent = rng.random_range(0..i);
            for j in 0..i {
                if j == parent || rng.random_bool(chance_of_cycle) {
                    builder.stitch(order[i], order[j], rng.random_range(1..=heaviest));
                } else if rng.random_bool(chance_of_spacing) {
                    builder.self_spacing(order[i], order[j]);
                }
            }
        }
    }
}

fn add_pairs(rng: &mut Pcg64, features: &[u32], builder: &mut InstanceBuilder) {
    let chance_of_pair = [0.5, 0.8, 1.0][rng.random_range(0..3)];
    let chance_of_edge = [0.2, 0.6, 1.0][rng.random_range(0..3)];
    let ranges = ranges(features);
    let mut pairs = Vec::new();
    for (i, first) in ranges.iter().enumerate() {
        for second in &ranges[..i] {
            let all: Vec<[u32; 2]> = first
                .clone()
                .flat_map(|a| second.clone().map(move |b| [a, b]))
                .collect();
            let sure = rng.random_range(0..all.len());
            let mut index = 0..;
            let mut edges = all;
            edges.retain(|_| index.next() == Some(sure) || rng.random_bool(chance_of_edge));
            if rng.random_bool(chance_of_pair) {
                pairs.push(edges);
            }
        }
    }
    pairs.shuffle(rng);
    for edges in pairs {
        builder.pair(edges);
    }
}

/// Excludes masks from some fragments, in most instances of many masks: without, few fragments have
/// no need to conflict.
fn exclude_masks(rng: &mut Pcg64, masks: u8, builder: &mut InstanceBuilder) {
    if rng.random_bool([0.6, 0.5, 0.3, 0.3][usize::from(masks) - 2]) {
        return;
    }
    let chance = [0.3, 0.9][rng.random_range(0..2)];
    for fragment in 0..builder.fragment_count() as u32 {
        if rng.random_bool(chance) {
            let mut bits = rng.random_range(1..1u8 << masks);
            if rng.random_bool(0.5) {
                bits = 1 << rng.random_range(0..masks) | 1 << rng.random_range(0..masks.min(3));
            }
            builder.allow(fragment, MaskSet::from_bits(bits));
        }
    }
}
