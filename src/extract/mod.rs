//! Layout to instance: features, conflict pairs, stitch candidates.
//!
//! | module | what it does |
//! |---|---|
//! | `parts` | takes the shapes apart into rectangles and slanted outlines, in a packed tree |
//! | `connect` | merges touching and overlapping parts into features |
//! | [`hand`] | what was decided by hand, about features |
//! | `owners` | lists the parts of each feature or fragment |
//! | `neighbours` | finds what is closer to a feature or fragment than the spacing |
//! | [`runs`] | the straight runs of a feature |
//! | [`shadows`] | where on a run a neighbour is closer than the spacing |
//! | [`policy`] | places stitch candidates on runs |
//! | [`cutting`] | cuts a feature at its candidates |
//! | `stitching` | takes all features through the four above |
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
mod neighbours;
mod owners;
pub mod pairs;
mod parts;
pub mod policy;
pub mod runs;
pub mod shadows;
mod stitching;
pub mod survey;

pub use error::ExtractError;

use self::hand::HandMasks;
use crate::layout::{Features, Fragments, Layout, Rules};
use encodings::Instance;
use neighbours::Neighbourhood;
use owners::Owners;
use parts::Parts;

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
/// 50 a conflict pair at the peak, the layout not counted.
///
/// # Errors
/// Rules that are out of range, contradictions in what was decided by hand, coordinates beyond the limit, more than [`pairs::MAX_PAIRS`]
/// pairs of close fragments.
pub fn extract(
    layout: &Layout,
    rules: &Rules,
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
    let (fragments, unstitchable) = cut(&parts, &owners, rules, &hand, &report)?;
    let areas = area::of_fragments(&parts, &owners, &fragments);
    if !fragments.cuts().is_empty() {
        (parts, owners) = parts.of_fragments(&owners, &fragments)?;
    }
    let close = {
        let around = Neighbourhood::new(&parts, &owners, rules.spacing);
        let total = fragments.len();
        pairs::find(&around, &|done| report(Step::Pairs, done, total))?
    };
    drop((parts, owners));
    let weight = rules.stitch.weight;
    let instance = assemble::assemble(rules.masks, weight, &fragments, &areas, close, &hand)?;
    Ok(Extraction {
        features,
        fragments,
        instance,
        empty_shapes,
        unstitchable,
    })
}

fn cut(
    parts: &Parts,
    owners: &Owners,
    rules: &Rules,
    hand: &HandMasks,
    report: &dyn Fn(Step, usize, usize),
) -> Result<(Fragments, Vec<u32>), ExtractError> {
    let policy = policy::of(rules.stitch.policy);
    let total = owners.len();
    if !policy.places_any() {
        return Ok((Fragments::unsplit(total), Vec::new()));
    }
    let around = Neighbourhood::new(parts, owners, rules.spacing);
    let stitches = |done| report(Step::Stitches, done, total);
    stitching::stitch(&around, policy, &rules.stitch, hand, &stitches)
}
