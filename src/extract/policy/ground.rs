//! What a stitch policy sees of a layer.

use super::super::cutting::Candidate;
use super::super::error::{MAX_CELLS, too_many_cells};
use super::super::hand::HandMasks;
use super::super::neighbours::Neighbourhood;
use super::super::parts::{Part, Parts};
use super::super::runs::{Run, runs};
use super::super::shadows::{Shadow, on_run};
use super::{ExtractError, Legal, Placement};
use crate::geometry::Rect;
use crate::geometry::slabs::cells_of_rects;
use crate::layout::{Layout, Rules};
use rayon::prelude::*;

/// How many features are looked at between two reports of progress.
const BLOCK: usize = 1 << 14;

/// A layer whose features are known, ready to be looked at.
pub struct Ground<'a> {
    pub(super) layout: &'a Layout,
    pub(super) rules: &'a Rules,
    pub(super) around: &'a Neighbourhood<'a>,
    /// The shapes of each keep-out rule with a distance, and the distance.
    keep_outs: Vec<(Parts, i32)>,
    hand: &'a HandMasks,
}

/// A run with all that a policy can know about it alone.
pub struct Seen<'a> {
    /// The run.
    pub run: &'a Run,
    /// The places that the rules allow.
    pub legal: &'a Legal,
    /// The shadows on it, sorted by where they start.
    pub shadows: &'a [Shadow],
}

/// A feature along the axes.
pub(super) struct Body {
    /// Its slab cells, sorted by their lower left corners.
    pub(super) cells: Vec<Rect>,
    /// Its runs, each with its legal places.
    pub(super) runs: Vec<(Run, Legal)>,
}

impl<'a> Ground<'a> {
    pub(in super::super) fn new(
        layout: &'a Layout,
        rules: &'a Rules,
        around: &'a Neighbourhood<'a>,
        hand: &'a HandMasks,
    ) -> Result<Ground<'a>, ExtractError> {
        let mut keep_outs = Vec::new();
        for rule in rules
            .stitch
            .keep_outs
            .iter()
            .filter(|rule| rule.distance > 0)
        {
            for (_, shapes) in layout.keep_outs.iter().filter(|l| l.0 == rule.layer) {
                keep_outs.push((Parts::new(shapes)?, rule.distance));
            }
        }
        Ok(Ground {
            layout,
            rules,
            around,
            keep_outs,
            hand,
        })
    }

    /// How many features there are.
    pub fn feature_count(&self) -> usize {
        self.around.owners.len()
    }

    /// The rules.
    pub fn rules(&self) -> &Rules {
        self.rules
    }

    /// Whether the mask of a feature was decided by hand: then it takes no stitch.
    pub fn is_by_hand(&self, feature: u32) -> bool {
        self.hand.names(feature)
    }

    /// Whether a feature has slanted edges: then it takes no stitch.
    pub(in super::super) fn is_slanted(&self, feature: u32) -> bool {
        let mut parts = self.around.owners.parts_of(feature).iter();
        parts.any(|&part| self.around.parts.is_slanted(part))
    }

    /// The cells of a feature; nothing where it has slanted edges.
    pub(in super::super) fn cells(&self, feature: u32) -> Result<Option<Vec<Rect>>, ExtractError> {
        let mut rects = Vec::new();
        for &part in self.around.owners.parts_of(feature) {
            match self.around.parts.get(part) {
                Part::Rect(rect) => rects.push(rect),
                Part::Slanted(_) => return Ok(None),
            }
        }
        let cells = cells_of_rects(&rects, MAX_CELLS);
        cells.map(Some).ok_or_else(|| too_large(&rects))
    }

    /// A feature that may take stitches, with its legal places: nothing where it has slanted edges or was
    /// decided by hand.
    pub(super) fn body(&self, feature: u32) -> Result<Option<Body>, ExtractError> {
        if self.is_by_hand(feature) {
            return Ok(None);
        }
        let Some(cells) = self.cells(feature)? else {
            return Ok(None);
        };
        let found = runs(&cells, MAX_CELLS).ok_or_else(|| too_large(&cells))?;
        let with_legal = |run: Run| (run, self.legal(&run));
        let runs = found.into_iter().map(with_legal).collect();
        Ok(Some(Body { cells, runs }))
    }

    /// The legal places of a run.
    pub fn legal(&self, run: &Run) -> Legal {
        let mut legal = Legal::between_ends(run, &self.rules.stitch);
        let half = self.rules.stitch.overlap / 2;
        for (parts, distance) in &self.keep_outs {
            if !legal.is_empty() {
                legal.keep_off(run, half, parts, *distance, self.rules.spacings.metric);
            }
        }
        legal
    }

    /// The candidates that `places` gives run by run, in ascending order: on all cores, in the order of features.
    ///
    /// # Errors
    /// A feature of too many cells.
    pub fn each_run(
        &self,
        progress: &dyn Fn(usize),
        places: &(dyn Fn(&Seen<'_>) -> Vec<i32> + Sync),
    ) -> Result<Placement, ExtractError> {
        let candidates = self.each_feature(progress, &|feature| {
            let mut found = Vec::new();
            let Some(body) = self.body(feature)? else {
                return Ok(found);
            };
            for (run, legal) in body.runs.iter().filter(|(_, legal)| !legal.is_empty()) {
                let shadows = on_run(self.around, feature, run);
                let seen = Seen {
                    run,
                    legal,
                    shadows: &shadows,
                };
                let at = |place| Candidate { run: *run, place };
                found.extend(places(&seen).into_iter().map(at));
            }
            Ok(found)
        })?;
        Ok(Placement {
            before: candidates.iter().map(Vec::len).sum(),
            candidates,
            beyond: Vec::new(),
        })
    }

    /// What `look` says of each feature, on all cores.
    pub(in super::super) fn each_feature<T: Send>(
        &self,
        progress: &dyn Fn(usize),
        look: &(dyn Fn(u32) -> Result<T, ExtractError> + Sync),
    ) -> Result<Vec<T>, ExtractError> {
        let total = self.feature_count();
        let mut all = Vec::with_capacity(total);
        for start in (0..total).step_by(BLOCK) {
            progress(start);
            let block = start as u32..total.min(start + BLOCK) as u32;
            let found: Vec<Result<T, ExtractError>> =
                block.into_par_iter().with_min_len(16).map(look).collect();
            for one in found {
                all.push(one?);
            }
        }
        Ok(all)
    }
}

fn too_large(rects: &[Rect]) -> ExtractError {
    let area = rects.iter().copied().reduce(|all, one| all.union(&one));
    too_many_cells(area.unwrap_or_default())
}
