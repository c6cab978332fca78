//! The conflict pairs: close features, or their fragments, each pair once.
//!
//! Features (fragments) are dealt to all cores; a pair is found from its smaller number. The list is sorted,
//! whatever the threads did. Pairs that are close by their outlines are found from these, and the two lists
//! become one.

use super::ExtractError;
use super::neighbours::Neighbourhood;
use rayon::prelude::*;
use std::sync::atomic::{AtomicUsize, Ordering};

/// The most pairs of close fragments: 134 million, some 6 GB of instance.
pub const MAX_PAIRS: usize = 1 << 27;

/// How many fragments are looked at between two reports of progress.
const BLOCK: usize = 1 << 14;

/// Lists the pairs of close owners, smaller one first, ascending. `progress` gets the number of owners done.
pub(super) fn find(
    around: &Neighbourhood<'_>,
    progress: &dyn Fn(usize),
) -> Result<Vec<[u32; 2]>, ExtractError> {
    let mut pairs = match around.faces {
        None => Vec::new(),
        Some(faces) => faces.pairs(around.relation)?,
    };
    let by_outlines = pairs.len();
    let total = around.owners.len();
    let budget = AtomicUsize::new(0);
    for start in (0..total).step_by(BLOCK) {
        progress(start);
        let block = start as u32..total.min(start + BLOCK) as u32;
        let found: Vec<Vec<u32>> = (block.clone().into_par_iter())
            .with_min_len(64)
            .map(|owner| within(&budget, || around.above(owner)))
            .collect();
        if budget.load(Ordering::Relaxed) > MAX_PAIRS {
            return Err(ExtractError::TooManyPairs {
                limit: MAX_PAIRS,
                spacing: around.relation.plain,
            });
        }
        for (owner, others) in block.zip(found) {
            pairs.extend(others.into_iter().map(|other| [owner, other]));
        }
    }
    if by_outlines > 0 {
        pairs.par_sort_unstable();
        pairs.dedup();
    }
    if pairs.len() > MAX_PAIRS {
        return Err(ExtractError::TooManyPairs {
            limit: MAX_PAIRS,
            spacing: around.relation.plain,
        });
    }
    progress(total);
    Ok(pairs)
}

/// Counts what `search` finds, and searches no more once there is too much in all. Whether there is
/// does not depend on the order.
fn within(budget: &AtomicUsize, search: impl Fn() -> Vec<u32>) -> Vec<u32> {
    if budget.load(Ordering::Relaxed) > MAX_PAIRS {
        return Vec::new();
    }
    let found = search();
    budget.fetch_add(found.len(), Ordering::Relaxed);
    found
}
