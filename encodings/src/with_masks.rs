//! The same problem with another number of masks.
//!
//! Features, conflict pairs, stitch edges, self-spacings and ties name no mask, so an instance holds for any K; only
//! the allowed masks do. A fragment that might take every mask may take every one of the new number, and what was
//! restricted stays as it was.

use crate::build::InstanceError;
use crate::instance::Instance;
use crate::masks::{MAX_MASKS, MaskSet};

impl Instance {
    /// The instance with K = `masks`, 1 to [`MAX_MASKS`].
    ///
    /// # Errors
    /// K out of range, or a fragment that is restricted to masks of which one is beyond K.
    pub fn with_masks(mut self, masks: u8) -> Result<Instance, InstanceError> {
        if !(1..=MAX_MASKS).contains(&masks) {
            return Err(InstanceError::MaskCount(masks));
        }
        let (before, after) = (MaskSet::all(self.masks), MaskSet::all(masks));
        for (fragment, set) in (0u32..).zip(&mut self.allowed) {
            if *set == before {
                *set = after;
            } else if !set.is_subset(after) {
                let masks = set.bits();
                return Err(InstanceError::Allowed { fragment, masks });
            }
        }
        self.masks = masks;
        Ok(self)
    }
}
