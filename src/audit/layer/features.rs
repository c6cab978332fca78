//! The features of a layer, in the numbering of the certificate.
//!
//! Parts that share a point, and parts of one shape, are one feature (union-find). It is told by its point of smallest x
//! and, among those, smallest y: the certificate must list the point of each feature once, and no others.

use super::distance::TOUCHING;
use super::near;
use super::parts::Parts;
use crate::audit::{Rejection, Step};
use crate::geometry::Point;

/// The feature of each part, by the place of its point in `listed`.
pub(super) fn of_parts(parts: &Parts, listed: &[[i32; 2]]) -> Result<Vec<u32>, Rejection> {
    let groups = groups(parts)?;
    let mut first: Vec<Option<Point>> = vec![None; groups.len()];
    for (part, &group) in (0..).zip(&groups) {
        let own = match parts.bodies.is_rect(part) {
            true => Some(parts.bodies.boxes[part as usize].min),
            false => parts.bodies.corners(part).iter().min().copied(),
        };
        let seen = &mut first[group as usize];
        *seen = (*seen).into_iter().chain(own).min();
    }
    let number = numbers(&first, listed)?;
    Ok(groups.iter().map(|&group| number[group as usize]).collect())
}

/// For each part the first one of its feature.
fn groups(parts: &Parts) -> Result<Vec<u32>, Rejection> {
    let bodies = &parts.bodies;
    let mut sets = Sets::new(bodies.boxes.len());
    let mut join_all = |pairs: &[[u32; 2]]| pairs.iter().for_each(|&[a, b]| sets.join(a, b));
    join_all(&parts.of_one_shape);
    let rects: Vec<u32> = (0..bodies.boxes.len() as u32)
        .filter(|&part| bodies.is_rect(part))
        .collect();
    let boxes: Vec<_> = rects
        .iter()
        .map(|&part| bodies.boxes[part as usize])
        .collect();
    let met = near::touching(&boxes)?.into_iter();
    let met: Vec<_> = met.map(|pair| pair.map(|i| rects[i as usize])).collect();
    join_all(&met);
    if !bodies.outlines.is_empty() {
        // All rectangles have one label: they were compared above.
        let label = |part: u32| if bodies.is_rect(part) { 0 } else { part + 1 };
        let labels: Vec<u32> = (0..bodies.boxes.len() as u32).map(label).collect();
        let touch = |a, b| bodies.closer(a, b, TOUCHING).then_some([a, b]);
        join_all(&near::pairs(&bodies.boxes, &labels, 0, touch)?);
    }
    Ok(sets.firsts())
}

/// The number of each feature, told by its first point.
fn numbers(first: &[Option<Point>], listed: &[[i32; 2]]) -> Result<Vec<u32>, Rejection> {
    let reject = |reason| Err(Rejection::new(Step::Features, reason));
    let mut own: Vec<(Point, usize)> = (first.iter().enumerate())
        .filter_map(|(group, point)| Some(((*point)?, group)))
        .collect();
    own.sort_unstable();
    let mut number: Vec<Option<u32>> = vec![None; first.len()];
    for (i, &[x, y]) in (0u32..).zip(listed) {
        let place = own.binary_search_by_key(&Point::new(x, y), |feature| feature.0);
        let Some(known) = place.ok().map(|place| &mut number[own[place].1]) else {
            return reject(format!(
                "feature {i} is said to begin at ({x}, {y}): no feature of the layer has its smallest point there"
            ));
        };
        if let Some(before) = known.replace(i) {
            return reject(format!(
                "features {before} and {i} are both said to begin at ({x}, {y}): each is listed once"
            ));
        }
    }
    let missing = own.iter().find(|feature| number[feature.1].is_none());
    if let Some((Point { x, y }, _)) = missing {
        let (count, listed) = (own.len(), listed.len());
        return reject(format!(
            "the feature that begins at ({x}, {y}) is not listed: the layer has {count} features, {listed} are listed"
        ));
    }
    Ok(number.into_iter().map(Option::unwrap_or_default).collect())
}

/// Disjoint sets of numbers, by trees of which each node points to a smaller one.
pub(super) struct Sets(Vec<u32>);

impl Sets {
    pub(super) fn new(count: usize) -> Sets {
        Sets((0..count as u32).collect())
    }

    fn first(&mut self, mut at: u32) -> u32 {
        while self.0[at as usize] != at {
            let next = self.0[at as usize];
            self.0[at as usize] = self.0[next as usize];
            at = next;
        }
        at
    }

    pub(super) fn join(&mut self, a: u32, b: u32) {
        let (a, b) = (self.first(a), self.first(b));
        self.0[a.max(b) as usize] = a.min(b);
    }

    /// For each number the smallest one of its set.
    pub(super) fn firsts(mut self) -> Vec<u32> {
        for at in 0..self.0.len() {
            self.0[at] = self.0[self.0[at] as usize];
        }
        self.0
    }
}
