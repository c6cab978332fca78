//! What was decided by hand: the masks that features may take, and which of them share one or do not.
//!
//! A feature is named by a point in it or on its outline, or by a shape of a layer that stands for a mask. What is named takes no cut.

use super::distance::{Bodies, TOUCHING};
use crate::audit::problem::Tie;
use crate::audit::{Rejection, Step};
use crate::geometry::{Point, Rect};
use crate::layout::{Layout, Rules};
use encodings::Mask;

/// Decisions by features.
#[derive(Debug, Default)]
pub(super) struct ByHand {
    /// The features with their masks, ascending, each once.
    fixed: Vec<(u32, Mask)>,
    /// Sets of features that share a mask, each ascending; and such of which every two are on different ones.
    same: Vec<Vec<u32>>,
    different: Vec<Vec<u32>>,
}

/// The features at points, in the order of the points.
pub(super) fn features_at(
    points: &[Point],
    bodies: &Bodies,
    features: &[u32],
) -> Result<Vec<u32>, Rejection> {
    let rects: Vec<Rect> = (points.iter())
        .map(|&point| Rect {
            min: point,
            max: point,
        })
        .collect();
    let met = bodies.met(&rects, TOUCHING)?;
    let feature = |(number, point): (u32, &Point)| {
        let first = met.partition_point(|hit| hit[0] < number);
        let hit = met.get(first).filter(|hit| hit[0] == number);
        hit.map(|hit| features[hit[1] as usize]).ok_or_else(|| {
            let Point { x, y } = point;
            Rejection::new(
                Step::Rules,
                format!("the rules name a feature at ({x}, {y}): there is none"),
            )
        })
    };
    (0..).zip(points).map(feature).collect()
}

/// Reads what the rules and the layers of masks say. `part_of` gives a part of a shape, if it encloses anything.
pub(super) fn decided(
    layout: &Layout,
    rules: &Rules,
    bodies: &Bodies,
    features: &[u32],
    part_of: impl Fn(u32) -> Option<u32>,
) -> Result<ByHand, Rejection> {
    let hand = &rules.hand;
    let points: Vec<Point> = hand.fixed.iter().map(|&(point, _)| point).collect();
    let at = features_at(&points, bodies, features)?;
    let masks = hand.fixed.iter().map(|&(_, mask)| mask);
    let mut fixed: Vec<(u32, Mask)> = at.into_iter().zip(masks).collect();
    let drawn = layout.fixed.iter();
    fixed.extend(
        drawn.filter_map(|&(shape, mask)| Some((features[part_of(shape)? as usize], mask))),
    );
    fixed.sort_unstable();
    fixed.dedup();
    let sets = |sets: &[Vec<Point>]| -> Result<Vec<Vec<u32>>, Rejection> {
        let set = |points: &Vec<Point>| {
            let mut set = features_at(points, bodies, features)?;
            set.sort_unstable();
            Ok(set)
        };
        sets.iter().map(set).collect()
    };
    let (mut same, different) = (sets(&hand.same)?, sets(&hand.different)?);
    same.iter_mut().for_each(|set| set.dedup());
    let found = ByHand {
        fixed,
        same,
        different,
    };
    found.check(rules.masks, bodies, features)?;
    Ok(found)
}

impl ByHand {
    /// Refuses what cannot be on any masks.
    fn check(&self, masks: u8, bodies: &Bodies, features: &[u32]) -> Result<(), Rejection> {
        let reject = |feature: u32, what: String| {
            let own = (bodies.boxes.iter().zip(features)).filter(|(_, of)| **of == feature);
            let Point { x, y } = own.map(|(area, _)| area.min).min().unwrap_or_default();
            let reason = format!("the feature that begins at ({x}, {y}) {what}");
            Err(Rejection::new(Step::Rules, reason))
        };
        if let Some(&(feature, mask)) = self.fixed.iter().find(|fixed| fixed.1 >= masks) {
            let mask = u32::from(mask) + 1;
            return reject(feature, format!("is put on mask {mask} of {masks}"));
        }
        if let Some(two) = self.fixed.windows(2).find(|two| two[0].0 == two[1].0) {
            let [one, other] = [two[0].1 + 1, two[1].1 + 1];
            return reject(two[0].0, format!("is put on masks {one} and {other}"));
        }
        let twice = |set: &Vec<u32>| {
            set.windows(2)
                .find(|two| two[0] == two[1])
                .map(|two| two[0])
        };
        match self.different.iter().find_map(twice) {
            Some(feature) => reject(feature, "is to differ from itself".to_owned()),
            None => Ok(()),
        }
    }

    /// Which features are named.
    pub(super) fn named(&self, features: usize) -> Vec<bool> {
        let mut named = vec![false; features];
        let sets = self.same.iter().chain(&self.different).flatten();
        let fixed = self.fixed.iter().map(|(feature, _)| feature);
        sets.chain(fixed)
            .for_each(|&feature| named[feature as usize] = true);
        named
    }

    /// Takes the other masks from the fragments of features that are on one. `start` is the first fragment of each feature.
    pub(super) fn limit(&self, allowed: &mut [u8], start: &[u32]) {
        for &(feature, mask) in &self.fixed {
            allowed[start[feature as usize] as usize] &= 1 << mask;
        }
    }

    /// What ties features together: those that share a mask to the next of their set, those that differ each to each.
    pub(super) fn ties(&self, start: &[u32]) -> Vec<Tie> {
        let first = |&feature: &u32| start[feature as usize];
        let mut ties = Vec::new();
        for set in &self.same {
            let next = set.iter().zip(set.iter().skip(1));
            ties.extend(next.map(|(one, other)| Tie::Same([first(one), first(other)])));
        }
        for set in &self.different {
            for (number, one) in set.iter().enumerate() {
                let others = set[number + 1..].iter();
                ties.extend(others.map(|other| Tie::Different([first(one), first(other)])));
            }
        }
        ties
    }
}
