//! The colouring: it is one, and costs what it costs.

use super::problem::{Problem, Tie};
use super::statement::Item;
use super::verdict::{Rejection, Step};
use crate::certificate::Edge;
use encodings::Mask;
use petgraph::unionfind::UnionFind;

/// Units of conflict violated, and the weight of all stitches.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Count {
    /// Violated conflict pairs, and features with a violated self-spacing.
    pub conflicts: u64,
    /// The weight of the stitch edges that are cut.
    pub stitches: u64,
}

/// Counts what a colouring costs.
///
/// # Errors
/// It has another length than the problem has fragments, a fragment on a mask that it may not take, or breaks a
/// tie.
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
    if let Some(tie) = problem.ties.iter().find(|tie| !holds(tie, masks)) {
        return Err(reject(format!("{}, and that is not so", said(tie))));
    }
    Ok(Count {
        conflicts: violated_pairs(problem, masks) + violated_self_spacings(problem, masks),
        stitches: cut_weight(problem, masks)
            .ok_or_else(|| reject("stitches beyond 64 bits".to_owned()))?,
    })
}

fn holds(tie: &Tie, masks: &[Mask]) -> bool {
    let same = |[a, b]: Edge| masks[a as usize] == masks[b as usize];
    match tie {
        Tie::Same(ends) => same(*ends),
        Tie::Different(ends) => !same(*ends),
        Tie::AtMost { most, stitches } => {
            let cut = stitches.iter().filter(|stitch| !same(stitch.ends));
            cut.map(|stitch| u128::from(stitch.weight)).sum::<u128>() <= u128::from(*most)
        }
    }
}

fn said(tie: &Tie) -> String {
    match tie {
        Tie::Same([a, b]) => format!("fragments {a} and {b} must share a mask"),
        Tie::Different([a, b]) => format!("fragments {a} and {b} must be on different masks"),
        Tie::AtMost { most, stitches } => {
            let edges = stitches.iter().map(|stitch| format!("{:?}", stitch.ends));
            let edges: Vec<String> = edges.collect();
            format!(
                "at most {most} of the stitch edges {} may be cut",
                edges.join(", ")
            )
        }
    }
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

/// Features with close fragments on one mask that no stitch edges within that mask join.
fn violated_self_spacings(problem: &Problem, masks: &[Mask]) -> u64 {
    let same = |[a, b]: Edge| masks[a as usize] == masks[b as usize];
    let mut parts = UnionFind::new(problem.fragment_count());
    for stitch in problem.stitches.iter().filter(|stitch| same(stitch.ends)) {
        parts.union(stitch.ends[0], stitch.ends[1]);
    }
    let violated = problem.close.iter().filter_map(|&[a, b]| {
        let feature = problem.feature_of(a);
        let one_feature = feature == problem.feature_of(b);
        (one_feature && same([a, b]) && !parts.equiv(a, b)).then_some(feature)
    });
    // Close fragments are sorted, and so are the features that they are of.
    let mut features: Vec<u32> = violated.collect();
    features.dedup();
    features.len() as u64
}

fn cut_weight(problem: &Problem, masks: &[Mask]) -> Option<u64> {
    let cut = problem
        .stitches
        .iter()
        .filter(|s| Item::Stitch(s.ends).is_violated(masks));
    cut.map(|stitch| u64::from(stitch.weight))
        .try_fold(0u64, u64::checked_add)
}
