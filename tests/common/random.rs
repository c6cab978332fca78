//! Random small instances with everything that an instance may hold: features of several fragments
//! with trees and cycles of stitches, weights, several edges to a pair, masks excluded, self-spacings.

use encodings::{Instance, InstanceBuilder, MaskSet, Stitch, Tie};
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
    let stitches = add_stitches_and_self_spacings(rng, &features, &mut builder);
    add_pairs(rng, &features, &mut builder);
    let allowed = exclude_masks(rng, masks, &mut builder);
    if rng.random_bool(0.4) {
        add_ties(rng, &features, &stitches, &allowed, &mut builder);
    }
    builder.build().expect("the generator keeps the invariants")
}

/// Ties that some colouring, drawn first, keeps: so there is one that keeps all of them.
fn add_ties(
    rng: &mut Pcg64,
    features: &[u32],
    stitches: &[Stitch],
    allowed: &[MaskSet],
    builder: &mut InstanceBuilder,
) {
    let lone = rng.random_bool(0.5);
    let mut kept: Vec<u8> = Vec::new();
    for range in ranges(features) {
        // Often one mask for the whole feature, so that ties between stitches can be tight.
        let common = range.clone().map(|f| allowed[f as usize]);
        let common = common
            .reduce(MaskSet::intersection)
            .unwrap_or(MaskSet::from_bits(0));
        let one = (lone || rng.random_bool(0.5)).then_some(common);
        let one = one.filter(|set| !set.is_empty()).map(|set| draw(rng, set));
        kept.extend(range.map(|f| one.unwrap_or_else(|| draw(rng, allowed[f as usize]))));
    }
    let ranges = ranges(features);
    for (i, first) in ranges.iter().enumerate() {
        for second in &ranges[..i] {
            if rng.random_bool(0.2) {
                let a = rng.random_range(first.clone());
                let b = rng.random_range(second.clone());
                builder.tie(match kept[a as usize] == kept[b as usize] {
                    true => Tie::Same([a, b]),
                    false => Tie::Different([a, b]),
                });
            }
        }
        let of_feature = |stitch: &&Stitch| first.contains(&stitch.a);
        let own: Vec<Stitch> = stitches.iter().filter(of_feature).copied().collect();
        for _ in 0..rng.random_range(0..3) {
            let mut some: Vec<Stitch> = own
                .iter()
                .filter(|_| rng.random_bool(0.7))
                .copied()
                .collect();
            some.iter_mut()
                .for_each(|stitch| stitch.weight = rng.random_range(1..=2));
            some.sort_unstable();
            let used = some
                .iter()
                .filter(|s| kept[s.a as usize] != kept[s.b as usize]);
            let most = used.map(|s| s.weight).sum::<u32>() + u32::from(rng.random_bool(0.2));
            if some.iter().map(|s| s.weight).sum::<u32>() > most {
                let stitches = some;
                builder.tie(Tie::AtMost { most, stitches });
            }
        }
    }
}

fn draw(rng: &mut Pcg64, set: MaskSet) -> u8 {
    let masks: Vec<u8> = set.iter().collect();
    masks[rng.random_range(0..masks.len())]
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
) -> Vec<Stitch> {
    let mut stitches = Vec::new();
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
                    let (a, b) = (order[i].min(order[j]), order[i].max(order[j]));
                    let weight = rng.random_range(1..=heaviest);
                    builder.stitch(a, b, weight);
                    stitches.push(Stitch { a, b, weight });
                } else if rng.random_bool(chance_of_spacing) {
                    builder.self_spacing(order[i], order[j]);
                }
            }
        }
    }
    stitches
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
fn exclude_masks(rng: &mut Pcg64, masks: u8, builder: &mut InstanceBuilder) -> Vec<MaskSet> {
    let mut allowed = vec![MaskSet::all(masks); builder.fragment_count()];
    if rng.random_bool([0.6, 0.5, 0.3, 0.3][usize::from(masks) - 2]) {
        return allowed;
    }
    let chance = [0.3, 0.9][rng.random_range(0..2)];
    for fragment in 0..builder.fragment_count() as u32 {
        if rng.random_bool(chance) {
            let mut bits = rng.random_range(1..1u8 << masks);
            if rng.random_bool(0.5) {
                bits = 1 << rng.random_range(0..masks) | 1 << rng.random_range(0..masks.min(3));
            }
            allowed[fragment as usize] = MaskSet::from_bits(bits);
            builder.allow(fragment, MaskSet::from_bits(bits));
        }
    }
    allowed
}
