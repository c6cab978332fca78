//! No stitches: every feature is one fragment.

use super::{Run, Shadow, StitchPolicy, StitchRules};

/// The policy that places no candidates.
pub(super) struct Nowhere;

impl StitchPolicy for Nowhere {
    fn places_any(&self) -> bool {
        false
    }

    fn candidates(&self, _: &Run, _: &[Shadow], _: &StitchRules) -> Vec<i32> {
        Vec::new()
    }
}
