//! The colouring: it is one, and costs what it costs.

use super::problem::Problem;
use super::statement::Item;
use super::verdict::{Rejection, Step};
use crate::certificate::Edge;
use encodings::Mask;
use petgraph::unionfind::UnionFind;

/// Units of conflict violated, and the weight of all stitches.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Count {
    /// Violated conflict pairs and self-spacings.
    pub conflicts: u64,
    /// The weight of the stitch edges that are cut.
    pub stitches: u64,
}

/// Counts what a colouring costs.
///
/// # Errors
/// It has another length than the problem has fragments, or a fragment on a mask that it may not take.
pub fn count(problem: &Problem, masks: &[Mask]) -> Result<Count, Rejection> {
    let reject = |reason| Rejection::new(Step::Colouring, reason);
    let fragments = problem.fragment_count();
    if masks.len() != fragments {
        return Err(reject(format!(
            "{} colours for {fragments} fragments",
            masks.len()
        )));
    }
    for (fragment, (&mask, &allowed)) in masks.iter().zip(&problem.allowed).enumerate() {
        if mask >= problem.masks || allowed >> mask & 1 == 0 {
            return Err(reject(format!(
                "fragment {fragment} may not take mask {}",
                mask + 1
            )));
        }
    }
    Ok(Count {
        conflicts: violated_pairs(problem, masks) + violated_self_spacings(problem, masks),
        stitches: cut_weight(problem, masks)
            .ok_or_else(|| reject("stitches beyond 64 bits".to_owned()))?,
    })
}

/// Pairs of features with close fragments on one mask, each once.
fn violated_pairs(problem: &Problem, masks: &[Mask]) -> u64 {
    let mut pairs: Vec<Edge> = Vec::new();
    for &[a, b] in &problem.close {
        let features = [problem.feature_of(a), problem.feature_of(b)];
        if masks[a as usize] == masks[b as usize] && features[0] != features[1] {
            pairs.push(features);
        }
    }
    pairs.sort_unstable();
    pairs.dedup();
    pairs.len() as u64
}

/// Close fragments of one feature on one mask that no stitch edges within that mask join.
fn violated_self_spacings(problem: &Problem, masks: &[Mask]) -> u64 {
    let same = |[a, b]: Edge| masks[a as usize] == masks[b as usize];
    let mut parts = UnionFind::new(problem.fragment_count());
    for stitch in problem.stitches.iter().filter(|stitch| same(stitch.ends)) {
        parts.union(stitch.ends[0], stitch.ends[1]);
    }
    let violated = problem.close.iter().filter(|&&[a, b]| {
        let one_feature = problem.feature_of(a) == problem.feature_of(b);
        one_feature && same([a, b]) && !parts.equiv(a, b)
    });
    violated.count() as u64
}

fn cut_weight(problem: &Problem, masks: &[Mask]) -> Option<u64> {
    let cut = problem
        .stitches
        .iter()
        .filter(|s| Item::Stitch(s.ends).is_violated(masks));
    cut.map(|stitch| u64::from(stitch.weight))
        .try_fold(0u64, u64::checked_add)
}
