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

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::build::InstanceBuilder;
    use crate::ties::Tie;

    /// Features 0-1, 2 and 3; the last one may take `allowed`.
    fn instance(masks: u8, allowed: MaskSet) -> Instance {
        let mut builder = InstanceBuilder::new(masks);
        for fragments in [2, 1, 1] {
            builder.feature(fragments);
        }
        builder.stitch(0, 1, 3);
        builder.pair([[0, 2], [1, 2]]);
        builder.pair([[2, 3]]);
        builder.tie(Tie::Different([1, 3]));
        builder.area(2, 70);
        builder.allow(3, allowed);
        builder.build().unwrap()
    }

    #[test]
    fn it_is_the_instance_built_with_that_number() {
        for (from, to) in [(2, 4), (4, 2), (3, 3), (1, 8), (8, 1)] {
            let built = |masks| instance(masks, MaskSet::all(masks));
            assert_eq!(built(from).with_masks(to).unwrap(), built(to));
        }
        let restricted = |masks| instance(masks, MaskSet::only(1));
        assert_eq!(restricted(2).with_masks(5).unwrap(), restricted(5));
        assert_eq!(restricted(5).with_masks(2).unwrap(), restricted(2));
    }

    #[test]
    fn masks_that_are_gone_are_refused() {
        let restricted = instance(3, MaskSet::only(2));
        let refused = InstanceError::Allowed {
            fragment: 3,
            masks: 0b100,
        };
        assert_eq!(restricted.clone().with_masks(2), Err(refused));
        for masks in [0, MAX_MASKS + 1] {
            let refused = InstanceError::MaskCount(masks);
            assert_eq!(restricted.clone().with_masks(masks), Err(refused));
        }
    }
}
