//! Shapes that touch or overlap become features.
//!
//! A flood fill over the packed tree: what a part touches joins its feature, leaves the tree, and is
//! looked around in turn. Each part is found once, however many others overlap it, so that the same contact drawn
//! a thousand times costs no more than a thousand contacts. Touching at a single point connects: the
//! distance is zero. The parts of one shape always hang together; where its outline joins them by nothing
//! but a line of no width, union-find does.

use super::owners::Owners;
use super::parts::Parts;
use crate::geometry::rtree::Remaining;
use crate::geometry::{Rect, hilbert};
use crate::layout::Features;
use rayon::prelude::*;

const NONE: u32 = u32::MAX;

/// Merges the parts into features. `progress` gets the number of parts done now and then.
pub(super) fn connect(
    parts: &Parts,
    shape_count: usize,
    progress: &dyn Fn(usize),
) -> (Features, Owners) {
    let (mut group_of, mut count) = flood(parts, progress);
    count = join_shapes(parts, shape_count, &mut group_of, count);
    number(parts, &mut group_of, count);
    let owners = Owners::new(group_of, count);
    (features(parts, &owners), owners)
}

/// Groups of parts that hang together by touching, numbered as they are found.
fn flood(parts: &Parts, progress: &dyn Fn(usize)) -> (Vec<u32>, usize) {
    let mut remaining = Remaining::new(parts.tree());
    let mut group_of = vec![NONE; parts.len()];
    let mut groups = 0;
    let (mut front, mut found) = (Vec::new(), Vec::new());
    for seed in 0..parts.len() as u32 {
        if seed % 65_536 == 0 {
            progress(seed as usize);
        }
        if !remaining.contains(seed) {
            continue;
        }
        remaining.remove(seed);
        group_of[seed as usize] = groups;
        front.push(seed);
        while let Some(part) = front.pop() {
            remaining.find(&parts.box_of(part), &mut found);
            for next in found.drain(..) {
                if parts.touch(part, next) {
                    remaining.remove(next);
                    group_of[next as usize] = groups;
                    front.push(next);
                }
            }
        }
        groups += 1;
    }
    (group_of, groups as usize)
}

/// Joins the groups that parts of one shape are in; returns how many are left.
fn join_shapes(parts: &Parts, shapes: usize, group_of: &mut [u32], groups: usize) -> usize {
    if parts.len() + parts.empty.len() == shapes {
        return groups;
    }
    let mut parent: Vec<u32> = (0..groups as u32).collect();
    let mut seen = vec![NONE; shapes];
    for (part, &group) in (0u32..).zip(group_of.iter()) {
        let first = &mut seen[parts.shape_of(part) as usize];
        if *first == NONE {
            *first = group;
        } else {
            let (a, b) = (find(&mut parent, *first), find(&mut parent, group));
            parent[a.max(b) as usize] = a.min(b);
        }
    }
    // Roots are the smallest of their sets, hence numbered before the others.
    let mut number = vec![NONE; groups];
    let mut left = 0;
    for group in 0..groups as u32 {
        let root = find(&mut parent, group);
        if root == group {
            number[group as usize] = left;
            left += 1;
        } else {
            number[group as usize] = number[root as usize];
        }
    }
    for group in group_of.iter_mut() {
        *group = number[*group as usize];
    }
    left as usize
}

fn find(parent: &mut [u32], mut at: u32) -> u32 {
    while parent[at as usize] != at {
        parent[at as usize] = parent[parent[at as usize] as usize];
        at = parent[at as usize];
    }
    at
}

/// Renumbers the groups along Hilbert's curve.
fn number(parts: &Parts, group_of: &mut [u32], groups: usize) {
    let mut outer: Vec<Option<(Rect, u32)>> = vec![None; groups];
    for (part, &group) in (0u32..).zip(group_of.iter()) {
        let (area, shape) = (parts.box_of(part), parts.shape_of(part));
        let outer = &mut outer[group as usize];
        *outer = Some(match *outer {
            None => (area, shape),
            Some((all, first)) => (all.union(&area), first.min(shape)),
        });
    }
    let place = |group: &u32| {
        let (area, shape) = outer[*group as usize].unwrap_or_default();
        (hilbert::centre(&area), area, shape)
    };
    let mut order: Vec<u32> = (0..groups as u32).collect();
    order.par_sort_unstable_by_key(place);
    let mut number = vec![0; groups];
    for (new, &old) in (0u32..).zip(&order) {
        number[old as usize] = new;
    }
    for group in group_of.iter_mut() {
        *group = number[*group as usize];
    }
}

/// Lists the shapes of each feature.
fn features(parts: &Parts, owners: &Owners) -> Features {
    let mut features = Features::with_capacity(owners.len(), parts.len());
    let mut shapes = Vec::new();
    for feature in 0..owners.len() as u32 {
        let members = owners.parts_of(feature);
        let mut boxes = members.iter().map(|&part| parts.box_of(part));
        let first = boxes.next().unwrap_or_default();
        let area = boxes.fold(first, |all, one| all.union(&one));
        shapes.extend(members.iter().map(|&part| parts.shape_of(part)));
        shapes.sort_unstable();
        shapes.dedup();
        features.push(shapes.drain(..), area);
    }
    features
}
