//! The lanes of a layer, in clusters of features whose stitches can meet, each cluster with its directions.

use super::super::{ExtractError, Ground};
use super::closure::Found;
use super::lanes::Lane;
use super::pieces::pieces;
use super::right_angles::trade;
use crate::geometry::Rect;
use crate::geometry::rtree::PackedTree;
use crate::layout::rules::Metric;
use std::collections::BTreeSet;

/// All lanes with what is needed to find who is near whom.
pub(super) struct Layer {
    /// By feature, in the order of its runs.
    pub(super) lanes: Vec<Lane>,
    /// The boxes of the lanes, in their order.
    pub(super) tree: PackedTree,
    /// The pieces of the features that have lanes.
    pub(super) pieces: PackedTree,
    /// The features that have lanes, ascending, each with the first one of its cluster.
    cluster_of: Vec<(u32, u32)>,
    /// The clusters, by their first features, in which lanes at right angles are near each other.
    right_angles: Vec<u32>,
    /// Features one of which is in every trade of places, ascending.
    pub(super) trading: Vec<u32>,
}

impl Layer {
    /// Whether a feature has lanes.
    pub(super) fn is_cut(&self, feature: u32) -> bool {
        self.cluster_of
            .binary_search_by_key(&feature, |c| c.0)
            .is_ok()
    }

    fn cluster(&self, feature: u32) -> u32 {
        match self.cluster_of.binary_search_by_key(&feature, |c| c.0) {
            Ok(at) => self.cluster_of[at].1,
            Err(_) => feature,
        }
    }

    /// Whether the cluster of a feature has lanes at right angles near each other.
    pub(super) fn has_right_angles(&self, feature: u32) -> bool {
        let cluster = self.cluster(feature);
        self.right_angles.binary_search(&cluster).is_ok()
    }

    /// Finds the lanes of a layer and turns each in the direction of its pushes.
    ///
    /// # Errors
    /// A feature of too many cells.
    pub(super) fn new(
        ground: &Ground<'_>,
        progress: &dyn Fn(usize),
    ) -> Result<Layer, ExtractError> {
        let all = ground.each_feature(progress, &|feature| of_feature(ground, feature))?;
        let (mut lanes, mut parts) = (Vec::new(), Vec::new());
        for (own, own_parts) in all {
            lanes.extend(own);
            parts.extend(own_parts);
        }
        let rules = ground.rules();
        let (tree, near) = neighbours(&lanes, rules.spacing);
        let mut features: Vec<u32> = lanes.iter().map(|lane| lane.feature).collect();
        features.dedup();
        let cluster_of = clusters(&features, &lanes, &near);
        let mut layer = Layer {
            lanes,
            tree,
            pieces: PackedTree::new(parts),
            cluster_of,
            right_angles: Vec::new(),
            trading: Vec::new(),
        };
        let corners: Vec<[u32; 2]> = near
            .into_iter()
            .filter(|&[a, b]| {
                layer.lanes[a as usize].is_horizontal() && !layer.lanes[b as usize].is_horizontal()
            })
            .collect();
        let half = rules.stitch.overlap / 2;
        layer.choose_directions(&corners, half, rules.spacing, rules.spacings.metric);
        Ok(layer)
    }

    /// Chooses the directions of each cluster, and names a feature of each trade that is left.
    fn choose_directions(&mut self, corners: &[[u32; 2]], half: i32, spacing: i32, metric: Metric) {
        let other: Vec<Lane> = self.lanes.iter().map(Lane::turned_round).collect();
        let turned = |lane: u32, mirrored: bool| {
            let lanes = if mirrored { &other } else { &self.lanes };
            &lanes[lane as usize]
        };
        let trades = |&[a, b]: &[u32; 2], way: usize| {
            let (a, b) = (turned(a, way & 1 != 0), turned(b, way & 2 != 0));
            trade(a, b, half, spacing, metric)
        };
        let mut by_cluster: Vec<(u32, [u32; 2])> = (corners.iter())
            .map(|&pair| (self.cluster(self.lanes[pair[0] as usize].feature), pair))
            .collect();
        by_cluster.sort_unstable();
        let (mut ways, mut left) = (Vec::new(), Vec::new());
        for chunk in by_cluster.chunk_by(|a, b| a.0 == b.0) {
            let bad = |way: usize| {
                let pairs = chunk.iter().map(|(_, pair)| pair);
                pairs
                    .filter(|pair| trades(pair, way))
                    .copied()
                    .collect::<Vec<_>>()
            };
            let (mut best, mut fewest) = (0, bad(0));
            for way in 1..4 {
                let found = bad(way);
                if found.len() < fewest.len() {
                    (best, fewest) = (way, found);
                }
            }
            ways.push((chunk[0].0, best));
            left.extend(
                fewest
                    .into_iter()
                    .map(|pair| pair.map(|l| self.lanes[l as usize].feature)),
            );
        }
        self.right_angles = ways.iter().map(|&(cluster, _)| cluster).collect();
        for (index, turned) in other.into_iter().enumerate() {
            let cluster = self.cluster(turned.feature);
            let way = ways
                .binary_search_by_key(&cluster, |w| w.0)
                .map_or(0, |at| ways[at].1);
            let bit = if turned.is_horizontal() { 1 } else { 2 };
            if way & bit != 0 {
                self.lanes[index] = turned;
            }
        }
        self.trading = cover(left);
    }
}

/// The lanes of a feature, pushed towards smaller coordinates, and its pieces where it has any lane.
fn of_feature(ground: &Ground<'_>, feature: u32) -> Result<(Vec<Lane>, Vec<Rect>), ExtractError> {
    let Some(body) = ground.body(feature)? else {
        return Ok((Vec::new(), Vec::new()));
    };
    let open = body.runs.iter().filter(|(_, legal)| !legal.is_empty());
    let lanes: Vec<Lane> = open
        .map(|(run, legal)| Lane {
            feature,
            run: *run,
            mirrored: false,
            legal: legal.clone(),
        })
        .collect();
    let pieces = if lanes.is_empty() {
        Vec::new()
    } else {
        pieces(&body.cells, &body.runs)
    };
    Ok((lanes, pieces))
}

/// The tree of the lanes, and the pairs of lanes closer than the spacing, horizontal ones first and then by
/// number.
fn neighbours(lanes: &[Lane], spacing: i32) -> (PackedTree, Vec<[u32; 2]>) {
    let tree = PackedTree::new(lanes.iter().map(Lane::area).collect());
    let mut near = Vec::new();
    for (index, lane) in (0u32..).zip(lanes) {
        let mut found = Found(Vec::new());
        tree.query(&lane.area().grown(spacing - 1), &mut found);
        found.0.sort_unstable();
        for other in found.0.into_iter().filter(|&other| other > index) {
            let turned = !lane.is_horizontal() && lanes[other as usize].is_horizontal();
            near.push(if turned {
                [other, index]
            } else {
                [index, other]
            });
        }
    }
    (tree, near)
}

/// For each feature the first feature of its cluster.
fn clusters(features: &[u32], lanes: &[Lane], near: &[[u32; 2]]) -> Vec<(u32, u32)> {
    let index = |feature: u32| features.partition_point(|&f| f < feature);
    let mut parent: Vec<usize> = (0..features.len()).collect();
    let root = |parent: &mut Vec<usize>, mut at: usize| {
        while parent[at] != at {
            parent[at] = parent[parent[at]];
            at = parent[at];
        }
        at
    };
    for pair in near {
        let [a, b] = pair.map(|lane| index(lanes[lane as usize].feature));
        let (a, b) = (root(&mut parent, a), root(&mut parent, b));
        parent[a.max(b)] = a.min(b);
    }
    (0..features.len())
        .map(|at| (features[at], features[root(&mut parent, at)]))
        .collect()
}

/// A set of features with one of each pair, ascending.
fn cover(mut pairs: Vec<[u32; 2]>) -> Vec<u32> {
    pairs.sort_unstable();
    let mut found: BTreeSet<u32> = BTreeSet::new();
    for [a, b] in pairs {
        if !found.contains(&a) && !found.contains(&b) {
            found.insert(a);
        }
    }
    found.into_iter().collect()
}
