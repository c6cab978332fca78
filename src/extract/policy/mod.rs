//! Stitch policies: where on a run a feature may change mask.
//!
//! A policy looks at one run at a time, with the shadows of the neighbours on it. To add one: a file with
//! a type that implements [`StitchPolicy`], an entry in [`crate::layout::Policy`], and one in [`of`].

mod none;
mod uncovered;

use super::runs::{End, Run};
use super::shadows::Shadow;
use crate::layout::{Policy, StitchRules};

/// Places stitch candidates.
pub trait StitchPolicy: Sync {
    /// Whether the policy ever places a candidate; where not, runs and shadows are not looked for.
    fn places_any(&self) -> bool {
        true
    }

    /// The places of the candidates on a run, ascending, each allowed by [`is_legal`] and at least the
    /// smallest fragment length from the next. `shadows` are sorted by where they start.
    fn candidates(&self, run: &Run, shadows: &[Shadow], rules: &StitchRules) -> Vec<i32>;
}

/// The policy of that name.
pub fn of(policy: Policy) -> &'static dyn StitchPolicy {
    match policy {
        Policy::None => &none::Nowhere,
        Policy::Uncovered => &uncovered::Uncovered,
        // Until they are built, `formats::rules` does not read their names.
        Policy::EveryInterval | Policy::Listed => &none::Nowhere,
    }
}

/// Whether a stitch at `place` of `run` keeps to the rules, its neighbours on the run apart: its overlap
/// stays on the run, at least the corner rule from a junction, and it is at least the smallest fragment
/// length from a line end.
pub fn is_legal(run: &Run, place: i32, rules: &StitchRules) -> bool {
    let half = i64::from(rules.overlap / 2);
    let fits = |room: i64, end: End| match end {
        End::Line => room >= i64::from(rules.fragment_length).max(half).max(1),
        End::Junction => room >= (half + i64::from(rules.corner)).max(1),
    };
    let place = i64::from(place);
    fits(place - i64::from(run.from), run.ends[0]) && fits(i64::from(run.to) - place, run.ends[1])
}
