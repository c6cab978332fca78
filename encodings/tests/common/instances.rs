//! Small instances: graphs with one fragment a vertex, and random ones with everything in them.

use super::{Random, vertex_pairs};
use encodings::{Instance, InstanceBuilder, MaskSet};

/// A graph as an instance: a feature of one fragment for each vertex, a pair for each edge.
pub fn of_graph(masks: u8, allowed: &[MaskSet], edges: &[[u32; 2]]) -> Instance {
    let mut builder = InstanceBuilder::new(masks);
    for (vertex, &set) in allowed.iter().enumerate() {
        builder.feature(1);
        builder.allow(vertex as u32, set);
    }
    for &edge in edges {
        builder.pair([edge]);
    }
    builder.build().unwrap()
}

/// How to draw a random instance.
#[derive(Clone, Copy)]
pub struct Shape {
    pub masks: u8,
    pub fragments: u32,
    /// Percent of fragments with restricted masks.
    pub restricted: u32,
}

/// A random instance: stitch trees and rings, pairs of several edges, self-spacings, weights 1 to 3.
pub fn random(shape: Shape, random: &mut Random) -> Instance {
    let mut builder = InstanceBuilder::new(shape.masks);
    let mut feature_of: Vec<u32> = Vec::new();
    let mut feature = 0;
    while (feature_of.len() as u32) < shape.fragments {
        let room = shape.fragments - feature_of.len() as u32;
        let size = 1 + random.below(room.min(5));
        let first = builder.feature(size);
        feature_of.resize(feature_of.len() + size as usize, feature);
        add_stitches(first, size, &mut builder, random);
        feature += 1;
    }
    for [f, g] in vertex_pairs(feature) {
        let cross: Vec<[u32; 2]> = vertex_pairs(shape.fragments)
            .into_iter()
            .filter(|&[a, b]| [feature_of[a as usize], feature_of[b as usize]] == [f, g])
            .filter(|_| random.chance(75))
            .collect();
        if !cross.is_empty() {
            builder.pair(cross);
        }
    }
    for fragment in 0..shape.fragments {
        if random.chance(shape.restricted) {
            let bits = 1 + random.below((1 << shape.masks) - 1);
            builder.allow(fragment, MaskSet::from_bits(bits as u8));
        }
    }
    builder.build().unwrap()
}

/// A random tree, often with further edges, and self-spacings between some that no edge joins.
fn add_stitches(first: u32, size: u32, builder: &mut InstanceBuilder, random: &mut Random) {
    let mut joined: Vec<[u32; 2]> = (1..size).map(|b| [random.below(b), b]).collect();
    let more = if random.chance(50) { 40 } else { 0 };
    for pair in vertex_pairs(size) {
        if !joined.contains(&pair) && random.chance(more) {
            joined.push(pair);
        }
    }
    for &[a, b] in &joined {
        builder.stitch(first + a, first + b, 1 + random.below(3));
    }
    for [a, b] in vertex_pairs(size) {
        if !joined.contains(&[a, b]) && random.chance(60) {
            builder.self_spacing(first + a, first + b);
        }
    }
}
