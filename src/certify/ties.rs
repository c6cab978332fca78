//! The ties among the fragments of a bound, in the order of the format; and the further fragments that a bound
//! needs for its ties to count.
//!
//! A tie between two fragments says something where both are there. One between stitch edges says something of
//! those whose ends are there: fewer edges weigh less, so what is left of it is implied. With a single fragment
//! of a feature that is free of restrictions and other ties, ties between its stitches say nothing: the feature may be on one mask.

use encodings::{MaskSet, Stitch, Tie};

use super::features::Features;
use super::statement::{Budget, Item};
use crate::certificate::Edge;

/// What the ties among some fragments ask for.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Ties {
    /// These must share a mask, ascending.
    pub same: Vec<Edge>,
    /// These must not, ascending.
    pub different: Vec<Edge>,
    /// Of these stitch edges only so many are stitches.
    pub budgets: Vec<Budget>,
}

impl Ties {
    /// The fragments that they name, with repetition.
    pub fn fragments(&self) -> impl Iterator<Item = u32> + '_ {
        let counted = self.budgets.iter().flat_map(|budget| &budget.items);
        let counted = counted.flat_map(Item::edges);
        let both = self.same.iter().chain(&self.different);
        both.chain(counted).flatten().copied()
    }
}

/// The ties among some fragments, ascending.
pub fn among(features: &Features<'_>, fragments: &[u32]) -> Ties {
    let known = |fragment: u32| fragments.binary_search(&fragment).is_ok();
    let mut found = Ties::default();
    let mut counted: Vec<(Vec<(Edge, u64)>, u64)> = Vec::new();
    for tie in of_features(features, fragments) {
        match &features.instance.ties()[tie as usize] {
            Tie::Same(ends) if ends.iter().all(|&f| known(f)) => found.same.push(*ends),
            Tie::Different(ends) if ends.iter().all(|&f| known(f)) => found.different.push(*ends),
            Tie::Same(_) | Tie::Different(_) => {}
            Tie::AtMost { most, stitches } => {
                let inside = stitches.iter().filter(|s| known(s.a) && known(s.b));
                let edge = |s: &Stitch| ([s.a, s.b], u64::from(s.weight));
                let edges: Vec<(Edge, u64)> = inside.map(edge).collect();
                let sum: u64 = edges.iter().map(|&(_, weight)| weight).sum();
                if sum > u64::from(*most) {
                    counted.push((edges, u64::from(*most)));
                }
            }
        }
    }
    for list in [&mut found.same, &mut found.different] {
        list.sort_unstable();
        list.dedup();
    }
    counted.sort_unstable();
    counted.dedup();
    let item = |(ends, weight)| Item::Stitch { ends, weight };
    found.budgets = (counted.into_iter())
        .map(|(edges, most)| Budget {
            items: edges.into_iter().map(item).collect(),
            most,
        })
        .collect();
    found
}

/// The numbers of the ties at the features of some fragments, ascending.
fn of_features(features: &Features<'_>, fragments: &[u32]) -> Vec<u32> {
    let mut own: Vec<u32> = (fragments.iter())
        .map(|&fragment| features.instance.feature_of(fragment))
        .collect();
    own.dedup();
    let mut ties: Vec<u32> = own
        .iter()
        .flat_map(|&f| features.ties(f))
        .copied()
        .collect();
    ties.sort_unstable();
    ties.dedup();
    ties
}

/// Whether all fragments of a feature may be on any one mask together.
fn is_free(features: &Features<'_>, feature: u32) -> bool {
    let instance = features.instance;
    let between = |&tie: &u32| !matches!(instance.ties()[tie as usize], Tie::AtMost { .. });
    let mut fragments = instance.fragments_of(feature);
    let all = MaskSet::all(instance.masks());
    fragments.all(|fragment| instance.allowed(fragment) == all)
        && !features.ties(feature).iter().any(between)
}

/// The fragments beyond `fragments`, ascending, that ties bring along: what is tied to them, and the whole
/// feature where ties between its stitches can matter. Empty where they say nothing.
pub fn further(features: &Features<'_>, fragments: &[u32]) -> Vec<u32> {
    let instance = features.instance;
    let mut known = fragments.to_vec();
    loop {
        let mut more: Vec<u32> = Vec::new();
        for tie in of_features(features, &known) {
            match &instance.ties()[tie as usize] {
                Tie::Same(ends) | Tie::Different(ends) => {
                    if ends.iter().any(|f| known.binary_search(f).is_ok()) {
                        more.extend(ends);
                    }
                }
                Tie::AtMost { stitches, .. } => {
                    let feature = stitches.first().map(|s| instance.feature_of(s.a));
                    let own = feature.map_or(0..0, |feature| instance.fragments_of(feature));
                    let inside = known.iter().filter(|&f| own.contains(f)).take(2);
                    if inside.count() == 2 || feature.is_some_and(|f| !is_free(features, f)) {
                        more.extend(own);
                    }
                }
            }
        }
        more.sort_unstable();
        more.dedup();
        more.retain(|f| known.binary_search(f).is_err());
        if more.is_empty() {
            known.retain(|f| fragments.binary_search(f).is_err());
            return known;
        }
        known.extend(more);
        known.sort_unstable();
    }
}
