//! Layout to instance: features, conflict pairs, stitch candidates.
//!
//! | module | what it does |
//! |---|---|
//! | `parts` | takes the shapes apart into rectangles and slanted outlines, in a packed tree |
//! | `connect` | merges touching and overlapping parts into features |
//! | [`hand`] | what was decided by hand, about features |
//! | `owners` | lists the parts of each feature or fragment |
//! | `spacing` | says what is close, and finds what is close by its outline |
//! | `neighbours` | finds what is closer to a feature or fragment than the spacing |
//! | [`runs`] | the straight runs of a feature |
//! | [`shadows`] | where on a run a neighbour is close |
//! | [`policy`] | places stitch candidates on runs |
//! | [`cutting`] | cuts a feature at its candidates |
//! | `limits` | which cuts may not be stitches together |
//! | `stitching` | cuts all features |
//! | [`survey`] | runs and shadows of one feature, for explanations |
//! | [`pairs`] | lists the close features or fragments |
//! | [`drawn`] | what is drawn on masks, as a colouring |
//! | `area` | measures features and fragments |
//! | `assemble` | puts the instance together |
//! | [`error`] | what can go wrong |
//!
//! Every result is the same for any number of threads: work is split by feature and put together in the
//! order of features.

mod area;
mod assemble;
mod connect;
pub mod cutting;
pub mod drawn;
pub mod error;
pub mod hand;
mod limits;
mod neighbours;
mod owners;
pub mod pairs;
mod parts;
pub mod policy;
pub mod runs;
pub mod shadows;
mod spacing;
mod stitching;
pub mod survey;

pub use error::ExtractError;

use self::hand::HandMasks;
use crate::layout::{Features, Fragments, Layout, Rules, Spacings};
use encodings::Instance;
use neighbours::Neighbourhood;
use owners::Owners;
use parts::Parts;
use policy::{Beyond, Ground, Placement, StitchPolicy};
use spacing::{Faces, Outlines, Relation};
use stitching::Stitched;

/// What a layer and its rules give.
#[derive(Clone, Debug)]
pub struct Extraction {
    /// The features, numbered spatially: see [`crate::layout::features`].
    pub features: Features,
    /// The features cut at their stitch candidates; fragment i is fragment i of `instance`.
    pub fragments: Fragments,
    /// The abstract problem. Its feature i is feature i of `features`; its conflict pairs are in the
    /// order of their features.
    pub instance: Instance,
    /// Shapes that enclose no area, ascending: they print nothing and belong to no feature.
    pub empty_shapes: Vec<u32>,
    /// Features that the stitch policy cannot place candidates on, ascending: those with slanted edges, and
    /// those that hang together by a line of no width only. Empty where the policy places none at all.
    pub unstitchable: Vec<u32>,
    /// Pairs of different features that are closer than the rules allow on any masks, smaller one first,
    /// ascending: errors of the layout. Empty where there is no such rule.
    pub too_close: Vec<[u32; 2]>,
    /// How many stitch candidates there are.
    pub candidates: CandidateCounts,
    /// The features for which the policy `every-interval` does not prove that no legal stitch elsewhere
    /// would do better, ascending, with the reason; empty for other policies, which prove nothing.
    pub beyond_theorem: Vec<Beyond>,
}

/// How many stitch candidates there are.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct CandidateCounts {
    /// As the policy finds them.
    pub before: usize,
    /// The cuts of the fragments: those that cannot matter, or separate nothing, are dropped.
    pub after: usize,
}

/// A step of the extraction.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Step {
    /// Shapes are merged into features; counted in parts (rectangles and slanted outlines).
    Merging,
    /// Stitch candidates are placed; counted in features. Left out where the policy places none.
    Stitches,
    /// Conflict pairs are searched; counted in fragments.
    Pairs,
}

/// How far a step is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Progress {
    /// The step.
    pub step: Step,
    /// How much of it is done.
    pub done: usize,
    /// How much there is to do in all; the last report of a step has `done` equal to it.
    pub total: usize,
}

/// Extracts the features and the instance of a layer.
///
/// `progress` is called now and then, from the calling thread. Memory: about 100 bytes a rectangle and
/// 50 a conflict pair at the peak, the layout not counted; some 300 more a rectangle where the rules look at
/// outlines, as for several kinds of spacings.
///
/// # Errors
/// Rules that are out of range, contradictions in what was decided by hand, coordinates beyond the limit, more than [`pairs::MAX_PAIRS`]
/// pairs of close fragments.
pub fn extract(
    layout: &Layout,
    rules: &Rules,
    progress: &dyn Fn(Progress),
) -> Result<Extraction, ExtractError> {
    let policy = policy::of(rules.stitch.policy);
    extract_with(layout, rules, policy, progress)
}

/// The same with any stitch policy, whatever the rules name.
///
/// # Errors
/// As [`extract`].
pub fn extract_with(
    layout: &Layout,
    rules: &Rules,
    policy: &dyn StitchPolicy,
    progress: &dyn Fn(Progress),
) -> Result<Extraction, ExtractError> {
    error::check_rules(rules)?;
    let report = |step, done, total| progress(Progress { step, done, total });
    let mut parts = Parts::new(&layout.shapes)?;
    let total = parts.len();
    let merging = |done| report(Step::Merging, done, total);
    let (features, mut owners) = connect::connect(&parts, layout.shapes.len(), &merging);
    merging(total);
    let empty_shapes = std::mem::take(&mut parts.empty);
    let hand = hand::resolve(layout, rules, &parts, &owners)?;
    let too_close = too_close(&parts, &owners, rules)?;
    let relation = Relation::new(rules);
    let mut faces = match relation.needs_outlines() {
        true => Some(Outlines::new(&parts, &owners, &relation).map(Faces::of_features)?),
        false => None,
    };
    let (cut, placement) = {
        let around = || Neighbourhood::new(&parts, &owners, &relation, faces.as_ref());
        place(layout, around, rules, policy, &hand, &report)?
    };
    let fragments = cut.fragments;
    let areas = area::of_fragments(&parts, &owners, &fragments);
    if !fragments.cuts().is_empty() {
        (parts, owners) = parts.of_fragments(&owners, &fragments)?;
        faces = faces.map(|faces| faces.of_fragments(&parts, &owners, &fragments));
    }
    let close = {
        let around = Neighbourhood::new(&parts, &owners, &relation, faces.as_ref());
        let total = fragments.len();
        pairs::find(&around, &|done| report(Step::Pairs, done, total))?
    };
    drop((parts, owners, faces));
    let candidates = CandidateCounts {
        before: placement.before,
        after: fragments.cuts().len(),
    };
    let weight = rules.stitch.weight;
    let instance = assemble::assemble(rules.masks, weight, &fragments, &areas, close, &hand)?;
    Ok(Extraction {
        features,
        fragments,
        instance,
        empty_shapes,
        unstitchable: cut.unstitchable,
        too_close,
        candidates,
        beyond_theorem: placement.beyond,
    })
}

/// The features in fragments, and what the policy says of its candidates.
fn place<'a>(
    layout: &Layout,
    around: impl FnOnce() -> Neighbourhood<'a>,
    rules: &Rules,
    policy: &dyn StitchPolicy,
    hand: &HandMasks,
    report: &dyn Fn(Step, usize, usize),
) -> Result<(Stitched, Placement), ExtractError> {
    let around = around();
    let total = around.owners.len();
    if !policy.places_any() {
        let whole = Stitched {
            fragments: Fragments::unsplit(total),
            candidates: Vec::new(),
            unstitchable: Vec::new(),
        };
        return Ok((whole, Placement::default()));
    }
    let ground = Ground::new(layout, rules, &around, hand)?;
    let placement = policy.place(&ground, &|done| report(Step::Stitches, done, total))?;
    let cut = stitching::stitch(&ground, &placement.candidates)?;
    report(Step::Stitches, total, total);
    Ok((cut, placement))
}

/// The pairs of features that no masks allow.
fn too_close(parts: &Parts, owners: &Owners, rules: &Rules) -> Result<Vec<[u32; 2]>, ExtractError> {
    let Spacings {
        metric, any_mask, ..
    } = rules.spacings;
    if any_mask == 0 {
        return Ok(Vec::new());
    }
    let relation = Relation::uniform(metric, any_mask);
    pairs::find(&Neighbourhood::new(parts, owners, &relation, None), &|_| ())
}
