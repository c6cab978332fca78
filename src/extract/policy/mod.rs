//! Stitch policies: where features may change mask.
//!
//! A policy sees the whole layer, as a [`Ground`]: each feature along the axes with its straight runs, the
//! shadows that neighbours cast on them, and the legal places, which the rules and keep-outs leave. It gives
//! candidates: a run and a legal place on it. Cutting, distances, overlaps and the constraint that stitches of a
//! run keep the smallest fragment length (see [`super::limits`]) are not its business.
//!
//! To add one: a file with a type that implements [`StitchPolicy`], an entry in [`crate::layout::Policy`], and
//! one in [`of`]. A policy that looks at one run at a time calls [`Ground::each_run`] and is done: see
//! `uncovered`. One that weighs all runs against each other looks at features itself: see `every_interval`.
//! To try one without naming it in the rules, hand it to [`super::extract_with`].

pub mod every_interval;
pub mod ground;
pub mod legal;
mod listed;
mod locate;
mod none;
mod uncovered;

use super::ExtractError;
use super::cutting::Candidate;
use crate::layout::Policy;
pub use ground::{Ground, Seen};
pub use legal::Legal;

/// Places stitch candidates.
pub trait StitchPolicy: Sync {
    /// Whether the policy ever places a candidate; where not, runs and shadows are not looked for.
    fn places_any(&self) -> bool {
        true
    }

    /// The candidates of a layer, each on a legal place of a run that `ground` gives. `progress` is called with
    /// the number of features done, now and then.
    ///
    /// # Errors
    /// What is wrong with the layer or with the rules of the policy.
    fn place(
        &self,
        ground: &Ground<'_>,
        progress: &dyn Fn(usize),
    ) -> Result<Placement, ExtractError>;
}

/// What a policy gives.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Placement {
    /// The candidates of each feature, in the order of its runs and ascending on each; empty where no
    /// feature has any.
    pub candidates: Vec<Vec<Candidate>>,
    /// How many candidates there were before those that cannot matter were dropped.
    pub before: usize,
    /// The features for which the policy does not prove that its candidates are enough, ascending; only a
    /// policy that proves it for the others names any.
    pub beyond: Vec<Beyond>,
}

/// A feature that a theorem about candidates does not cover.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Beyond {
    /// The feature.
    pub feature: u32,
    /// Why.
    pub reason: BeyondReason,
}

/// Why a feature is beyond the theorem of `every-interval`, which its head states.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum BeyondReason {
    /// More candidates would be needed on a run than are kept.
    TooMany,
    /// Two runs at right angles can trade places: one stitch gives way only as the other does not.
    RightAngle,
    /// Spacings of several kinds are in force, for which nothing is proven.
    KindsOfSpacing,
}

impl BeyondReason {
    /// Its name in results.
    pub fn name(self) -> &'static str {
        match self {
            BeyondReason::TooMany => "too many candidates",
            BeyondReason::RightAngle => "runs at right angles",
            BeyondReason::KindsOfSpacing => "kinds of spacing",
        }
    }
}

/// The policy of that name.
pub fn of(policy: Policy) -> &'static dyn StitchPolicy {
    match policy {
        Policy::None => &none::Nowhere,
        Policy::Uncovered => &uncovered::Uncovered,
        Policy::EveryInterval => &every_interval::EveryInterval::USUAL,
        Policy::Listed => &listed::Listed,
    }
}
