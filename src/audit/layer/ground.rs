//! A layer as it is before features are cut: what is drawn, which feature it is, and what the rules say about it.

use super::distance::{Bodies, Within};
use super::facing::{Facing, Values};
use super::keep_outs::KeepOuts;
use super::outline;
use super::runs::{Run, Runs, widened};
use crate::audit::Rejection;
use crate::geometry::Rect;
use crate::layout::Rules;

/// A layer before features are cut.
pub(super) struct Ground<'a> {
    pub(super) rules: &'a Rules,
    pub(super) values: Values,
    pub(super) bodies: Bodies,
    /// The feature of each body.
    pub(super) features: Vec<u32>,
    /// For each feature, whether it has slanted edges, and whether its mask was decided by hand.
    pub(super) slanted: Vec<bool>,
    pub(super) by_hand: Vec<bool>,
    pub(super) keep_outs: KeepOuts,
    /// Where more than a distance matters.
    pub(super) facing: Option<Facing>,
}

impl<'a> Ground<'a> {
    pub(super) fn new(
        rules: &'a Rules,
        bodies: Bodies,
        features: Vec<u32>,
        by_hand: Vec<bool>,
        keep_outs: KeepOuts,
    ) -> Result<Ground<'a>, Rejection> {
        let values = Values::new(rules);
        let mut slanted = vec![false; by_hand.len()];
        for (body, &feature) in (0..).zip(&features) {
            slanted[feature as usize] |= !bodies.is_rect(body);
        }
        let facing = match values.are_plain() {
            true => None,
            false => Some(Facing {
                outlines: outline::of_features(&bodies, &features, &rules.spacings)?,
                values: values.clone(),
            }),
        };
        Ok(Ground {
            rules,
            values,
            bodies,
            features,
            slanted,
            by_hand,
            keep_outs,
            facing,
        })
    }

    /// Closer than this, a feature and one without slanted edges conflict whatever faces what.
    pub(super) fn within_of(&self, feature: u32) -> Within {
        match self.slanted[feature as usize] {
            true => self.values.slanted,
            false => self.values.least,
        }
    }

    /// The larger one of the two such distances.
    pub(super) fn reach(&self) -> i32 {
        self.values.least.spacing.max(self.values.slanted.spacing)
    }

    /// The run that a line of a feature crosses, and where, if a cut may be there: keep-outs and what the policy says apart. Else why
    /// not.
    pub(super) fn site<'r>(
        &self,
        runs: &'r Runs,
        feature: u32,
        line: Rect,
    ) -> Result<(u32, &'r Run, i32), String> {
        if self.by_hand.get(feature as usize) == Some(&true) {
            return Err("the mask of the feature is decided by hand".to_owned());
        }
        if self.slanted.get(feature as usize) == Some(&true) {
            return Err("the feature has slanted edges".to_owned());
        }
        let site = runs.across(feature, line);
        let (number, run, place) = site.ok_or_else(|| {
            "it does not cross a straight run from one side to the other".to_owned()
        })?;
        match run.objection(place, &self.rules.stitch) {
            Some(reason) => Err(reason),
            None => Ok((number, run, place)),
        }
    }

    /// For each line what keeps a cut away from it.
    pub(super) fn kept_out(&self, lines: &[Rect]) -> Result<Vec<Option<String>>, Rejection> {
        let half = self.rules.stitch.overlap / 2;
        let overlaps: Vec<Rect> = lines.iter().map(|&line| widened(line, half)).collect();
        self.keep_outs.objections(&overlaps)
    }
}
