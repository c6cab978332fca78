//! Features to fragments: each feature is cut at its candidates, on all cores.
//!
//! Features with slanted edges get no candidates, and neither do those that hang together by a line of no
//! width only; both are named.

use super::ExtractError;
use super::cutting::{Candidate, Cutting, cut};
use super::limits;
use super::policy::Ground;
use crate::layout::Fragments;
use crate::layout::fragments::FragmentsBuilder;

/// The features in fragments.
pub(super) struct Stitched {
    /// The fragments.
    pub(super) fragments: Fragments,
    /// The candidate of each cut.
    pub(super) candidates: Vec<Candidate>,
    /// The features that cannot be stitched, ascending.
    pub(super) unstitchable: Vec<u32>,
}

/// Cuts all features at their candidates, which may be given for none at all.
///
/// # Errors
/// A feature of too many cells.
pub(super) fn stitch(
    ground: &Ground<'_>,
    candidates: &[Vec<Candidate>],
) -> Result<Stitched, ExtractError> {
    let rules = &ground.rules().stitch;
    let cut_feature = |feature: u32| {
        let at = candidates.get(feature as usize);
        match at.filter(|at| !at.is_empty()) {
            _ if ground.is_slanted(feature) => Ok(Cutting::Apart),
            None => Ok(Cutting::Whole),
            Some(at) => {
                let cells = ground.cells(feature)?.unwrap_or_default();
                Ok(cut(&cells, at))
            }
        }
    };
    let mut fragments = FragmentsBuilder::new(rules.overlap / 2);
    let (mut of_cuts, mut unstitchable) = (Vec::new(), Vec::new());
    let all = ground.each_feature(&|_| (), &cut_feature)?;
    for (feature, cutting) in (0u32..).zip(all) {
        match cutting {
            Cutting::Whole => fragments.unsplit(),
            Cutting::Split(split) => {
                let limits = limits::of_feature(&split.candidates, rules);
                fragments.split(split.fragments, split.cuts);
                fragments.limit(limits);
                of_cuts.extend(split.candidates);
            }
            Cutting::Apart => {
                fragments.unsplit();
                unstitchable.push(feature);
            }
        }
    }
    Ok(Stitched {
        fragments: fragments.build(),
        candidates: of_cuts,
        unstitchable,
    })
}
