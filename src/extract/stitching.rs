//! Features to fragments: runs, shadows, candidates, cuts, feature by feature on all cores.
//!
//! Features named by hand get no candidates. Those with slanted edges get none either, and neither do those that hang together by a line of no
//! width only; both are named.

use super::ExtractError;
use super::cutting::{Candidate, Cutting, cut};
use super::error::{MAX_CELLS, too_many_cells};
use super::hand::HandMasks;
use super::neighbours::Neighbourhood;
use super::parts::Part;
use super::policy::StitchPolicy;
use super::runs::runs;
use super::shadows::on_run;
use crate::geometry::slabs::cells_of_rects;
use crate::layout::fragments::FragmentsBuilder;
use crate::layout::{Fragments, StitchRules};
use rayon::prelude::*;

/// How many features are cut between two reports of progress.
const BLOCK: usize = 1 << 14;

/// Cuts all features; gives the fragments and the features that cannot be stitched, ascending. `progress`
/// gets the number of features done. Refuses features of more than [`MAX_CELLS`] cells.
pub(super) fn stitch(
    around: &Neighbourhood<'_>,
    policy: &dyn StitchPolicy,
    rules: &StitchRules,
    hand: &HandMasks,
    progress: &dyn Fn(usize),
) -> Result<(Fragments, Vec<u32>), ExtractError> {
    let total = around.owners.len();
    let mut fragments = FragmentsBuilder::new(rules.overlap / 2);
    let mut unstitchable = Vec::new();
    for start in (0..total).step_by(BLOCK) {
        progress(start);
        let block = start as u32..total.min(start + BLOCK) as u32;
        let found: Vec<Result<Cutting, ExtractError>> = (block.clone().into_par_iter())
            .with_min_len(16)
            .map(|feature| match hand.names(feature) {
                true => Ok(Cutting::Whole),
                false => cut_feature(around, policy, rules, feature),
            })
            .collect();
        for (feature, cutting) in block.zip(found) {
            match cutting? {
                Cutting::Whole => fragments.unsplit(),
                Cutting::Split(split) => fragments.split(split.fragments, split.cuts),
                Cutting::Apart => {
                    fragments.unsplit();
                    unstitchable.push(feature);
                }
            }
        }
    }
    progress(total);
    Ok((fragments.build(), unstitchable))
}

fn cut_feature(
    around: &Neighbourhood<'_>,
    policy: &dyn StitchPolicy,
    rules: &StitchRules,
    feature: u32,
) -> Result<Cutting, ExtractError> {
    let mut rects = Vec::new();
    for &part in around.owners.parts_of(feature) {
        match around.parts.get(part) {
            Part::Rect(rect) => rects.push(rect),
            Part::Slanted(_) => return Ok(Cutting::Apart),
        }
    }
    let too_many = || {
        let area = rects.iter().copied().reduce(|all, one| all.union(&one));
        too_many_cells(area.unwrap_or_default())
    };
    let cells = cells_of_rects(&rects, MAX_CELLS).ok_or_else(too_many)?;
    let mut candidates = Vec::new();
    for run in runs(&cells, MAX_CELLS).ok_or_else(too_many)? {
        let shadows = on_run(around, feature, &run);
        let places = policy.candidates(&run, &shadows, rules);
        candidates.extend(places.into_iter().map(|place| Candidate { run, place }));
    }
    Ok(cut(&cells, &candidates))
}
