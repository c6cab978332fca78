//! Layout to instance: features, conflict pairs, stitch candidates.
//!
//! | module | what it does |
//! |---|---|
//! | [`parts`] | takes the shapes apart into rectangles and slanted outlines, in a packed tree |
//! | [`connect`] | merges touching and overlapping parts into features |
//! | [`neighbours`] | finds the features closer to a feature than the spacing |
//! | [`pairs`] | lists the conflict pairs |
//! | [`area`] | measures features |
//! | [`assemble`] | puts the instance together |
//! | [`error`] | what can go wrong |
//!
//! Every result is the same for any number of threads: work is split by feature and put together in the
//! order of features.

mod area;
mod assemble;
mod connect;
pub mod error;
mod neighbours;
mod pairs;
mod parts;

pub use error::ExtractError;

use crate::layout::{Features, Layout, Rules};
use encodings::Instance;

/// What a layer and its rules give.
#[derive(Clone, Debug)]
pub struct Extraction {
    /// The features, numbered spatially: see [`crate::layout::features`].
    pub features: Features,
    /// The abstract problem. Its feature i is feature i of `features`; its conflict pairs are in the
    /// order of their features.
    pub instance: Instance,
    /// Shapes that enclose no area, ascending: they print nothing and belong to no feature.
    pub empty_shapes: Vec<u32>,
}

/// A step of the extraction.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Step {
    /// Shapes are merged into features; counted in parts (rectangles and slanted outlines).
    Merging,
    /// Conflict pairs are searched; counted in features.
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
/// Rules that are out of range, coordinates beyond the limit, more than [`pairs::MAX_PAIRS`] conflict pairs.
pub fn extract(
    layout: &Layout,
    rules: &Rules,
    progress: &dyn Fn(Progress),
) -> Result<Extraction, ExtractError> {
    error::check_rules(rules)?;
    let report = |step, done, total| progress(Progress { step, done, total });
    let mut parts = parts::Parts::new(&layout.shapes)?;
    let total = parts.len();
    let connected = connect::connect(&parts, layout.shapes.len(), &|done| {
        report(Step::Merging, done, total)
    });
    report(Step::Merging, total, total);
    let total = connected.features.len();
    let around = neighbours::Neighbourhood::new(&parts, &connected, rules.spacing);
    let pairs = pairs::find(&around, &|done| report(Step::Pairs, done, total))?;
    let areas = area::of_features(&parts, &connected);
    drop(around);
    let features = connected.features;
    let empty_shapes = std::mem::take(&mut parts.empty);
    drop(parts);
    let instance = assemble::unsplit(rules.masks, &areas, pairs)?;
    Ok(Extraction {
        features,
        instance,
        empty_shapes,
    })
}
