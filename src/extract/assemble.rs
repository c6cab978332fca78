//! Puts the instance together.

use super::ExtractError;
use encodings::{Instance, InstanceBuilder};

/// The instance in which each feature is one fragment. `pairs` are sorted.
pub(super) fn unsplit(
    masks: u8,
    areas: &[u64],
    pairs: Vec<[u32; 2]>,
) -> Result<Instance, ExtractError> {
    let mut builder = InstanceBuilder::new(masks);
    for &area in areas {
        let fragment = builder.feature(1);
        builder.area(fragment, area);
    }
    for pair in pairs {
        builder.pair([pair]);
    }
    Ok(builder.build()?)
}
