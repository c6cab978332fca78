//! Candidates from a list, so that anyone can bring positions found by other means.
//!
//! Each entry names a point of a feature and a point on one of its runs; the cut line goes through that point,
//! across the run. An entry that cannot be followed to the letter is an error: a list that is repaired
//! silently is not the list that was given. Two entries of one run that are closer than the smallest fragment
//! length are fine: not both are stitches then ([`super::super::limits`]).

use super::super::cutting::Candidate;
use super::super::error::ListedFault;
use super::super::runs::Run;
use super::{ExtractError, Ground, Legal, Placement, StitchPolicy, locate};
use crate::geometry::Rect;
use crate::layout::rules;
use std::collections::BTreeMap;

/// The policy that follows the list of the rules.
pub(super) struct Listed;

impl StitchPolicy for Listed {
    fn place(&self, ground: &Ground<'_>, _: &dyn Fn(usize)) -> Result<Placement, ExtractError> {
        let list = &ground.rules().stitch.listed;
        let mut by_feature: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
        for (index, entry) in list.iter().enumerate() {
            let feature = locate::feature_at(ground.around, entry.feature);
            let feature = feature.ok_or_else(|| fault(index, entry, ListedFault::NoFeature))?;
            by_feature.entry(feature).or_default().push(index);
        }
        let mut candidates = vec![Vec::new(); ground.feature_count()];
        for (feature, entries) in by_feature {
            if let Some(found) = candidates.get_mut(feature as usize) {
                *found = of_feature(ground, feature, &entries)?;
            }
        }
        Ok(Placement {
            candidates,
            before: list.len(),
            beyond: Vec::new(),
        })
    }
}

/// The candidates of one feature, in the order of its runs.
fn of_feature(
    ground: &Ground<'_>,
    feature: u32,
    entries: &[usize],
) -> Result<Vec<Candidate>, ExtractError> {
    let body = ground.body(feature)?;
    let runs: &[(Run, Legal)] = body.as_ref().map_or(&[], |body| &body.runs);
    let mut found: Vec<(usize, i32)> = Vec::new();
    for &index in entries {
        let Some(entry) = ground.rules().stitch.listed.get(index) else {
            continue;
        };
        let on = |(run, _): &(Run, Legal)| place_on(run, entry).is_some();
        let run = runs.iter().position(on);
        let wrong = if ground.is_by_hand(feature) {
            ListedFault::ByHand
        } else {
            ListedFault::NoRun
        };
        let run = run.ok_or_else(|| fault(index, entry, wrong))?;
        let place = place_on(&runs[run].0, entry).unwrap_or_default();
        if !runs[run].1.contains(place) {
            return Err(fault(index, entry, ListedFault::Illegal));
        }
        if found.contains(&(run, place)) {
            return Err(fault(index, entry, ListedFault::Repeated));
        }
        found.push((run, place));
    }
    found.sort_unstable();
    let candidate = |(run, place): (usize, i32)| Candidate {
        run: runs[run].0,
        place,
    };
    Ok(found.into_iter().map(candidate).collect())
}

/// The place on a run that an entry means: strictly between its ends.
fn place_on(run: &Run, entry: &rules::Listed) -> Option<i32> {
    let at = Rect {
        min: entry.at,
        max: entry.at,
    };
    let at = run.direction.turn(at).min;
    let inside = run.from < at.x && at.x < run.to && run.low <= at.y && at.y <= run.high;
    inside.then_some(at.x)
}

fn fault(index: usize, entry: &rules::Listed, fault: ListedFault) -> ExtractError {
    ExtractError::Listed {
        entry: index + 1,
        x: entry.at.x,
        y: entry.at.y,
        fault,
    }
}
