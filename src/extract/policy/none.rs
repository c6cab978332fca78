//! No stitches: every feature is one fragment.

use super::{ExtractError, Ground, Placement, StitchPolicy};

/// The policy that places no candidates.
pub(super) struct Nowhere;

impl StitchPolicy for Nowhere {
    fn places_any(&self) -> bool {
        false
    }

    fn place(&self, _: &Ground<'_>, _: &dyn Fn(usize)) -> Result<Placement, ExtractError> {
        Ok(Placement::default())
    }
}
