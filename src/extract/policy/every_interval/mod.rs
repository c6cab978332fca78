//! HEAD
mod closure;
mod clusters;
mod dominance;
mod lanes;
mod pieces;
mod right_angles;

use super::super::cutting::Candidate;
use super::super::neighbours::Neighbourhood;
use super::super::parts::Parts;
use super::super::{pairs, stitching};
use super::{Beyond, BeyondReason, ExtractError, Ground, Placement, StitchPolicy};
use crate::layout::Spacings;
use clusters::Layer;

/// The policy of all places that can matter.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct EveryInterval {
    /// Whether candidates that cannot matter are dropped.
    pub drops: bool,
}

impl EveryInterval {
    /// As the rules name it.
    pub const USUAL: EveryInterval = EveryInterval { drops: true };
}

impl StitchPolicy for EveryInterval {
    fn place(
        &self,
        ground: &Ground<'_>,
        progress: &dyn Fn(usize),
    ) -> Result<Placement, ExtractError> {
        let layer = Layer::new(ground, progress)?;
        let stops = closure::close(ground, &layer)?;
        let mut candidates = vec![Vec::new(); ground.feature_count()];
        let mut before = 0;
        for (lane, stops) in layer.lanes.iter().zip(&stops) {
            let mut places: Vec<i32> = stops.places.iter().map(|&t| lane.place_on_run(t)).collect();
            places.sort_unstable();
            before += places.len();
            if let Some(own) = candidates.get_mut(lane.feature as usize) {
                let run = lane.run;
                own.extend(places.into_iter().map(|place| Candidate { run, place }));
            }
        }
        let beyond = beyond(ground, &layer, &stops);
        drop(layer);
        if self.drops && before > 0 {
            candidates = without_dominated(ground, &candidates)?;
        }
        Ok(Placement {
            candidates,
            before,
            beyond,
        })
    }
}

/// The features for which the theorem does not hold.
fn beyond(ground: &Ground<'_>, layer: &Layer, stops: &[closure::Stops]) -> Vec<Beyond> {
    let mut found = Vec::new();
    let spacings = Spacings {
        metric: ground.rules().spacings.metric,
        any_mask: ground.rules().spacings.any_mask,
        ..Spacings::default()
    };
    let several = ground.rules().spacings != spacings;
    for (lane, stops) in layer.lanes.iter().zip(stops) {
        let feature = lane.feature;
        if several {
            let reason = BeyondReason::KindsOfSpacing;
            found.push(Beyond { feature, reason });
        } else if stops.full {
            let reason = BeyondReason::TooMany;
            found.push(Beyond { feature, reason });
        }
    }
    found.extend(layer.trading.iter().map(|&feature| Beyond {
        feature,
        reason: BeyondReason::RightAngle,
    }));
    found.sort_unstable();
    found.dedup_by_key(|one| one.feature);
    found
}

/// The candidates that are left when the layer is cut at all of them and those that cannot matter are dropped.
fn without_dominated(
    ground: &Ground<'_>,
    candidates: &[Vec<Candidate>],
) -> Result<Vec<Vec<Candidate>>, ExtractError> {
    let rules = ground.rules();
    let cut = stitching::stitch(ground, candidates)?;
    let close = {
        let parts = Parts::new(&ground.layout.shapes)?;
        let (parts, owners) = parts.of_fragments(ground.around.owners, &cut.fragments)?;
        let around = Neighbourhood::new(&parts, &owners, rules.spacing);
        pairs::find(&around, &|_| ())?
    };
    let length = rules.stitch.fragment_length;
    let left = dominance::left(&cut.fragments, &cut.candidates, &close, rules.masks, length);
    let mut kept = vec![Vec::new(); candidates.len()];
    for ((stitch, candidate), _) in cut
        .fragments
        .cuts()
        .iter()
        .zip(&cut.candidates)
        .zip(left)
        .filter(|(_, left)| *left)
    {
        let feature = cut.fragments.feature_of(stitch.sides[0]);
        if let Some(own) = kept.get_mut(feature as usize) {
            own.push(*candidate);
        }
    }
    Ok(kept)
}
