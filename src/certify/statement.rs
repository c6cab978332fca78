//! What a bound denies: that a colouring exists which resolves some units and exceeds no budget.
//!
//! Both levels of bounds come to one statement. Its evidence, its formula and its enumeration speak of
//! nothing else, in the fragments of one instance: a piece, while bounds are looked for, and the whole
//! instance at the end.

use encodings::MaskSet;

use super::features::Features;
use super::ties;
use crate::certificate::{Edge, Unit};

/// Something that may be violated, at a price.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Item {
    /// A unit of conflict, by some of its edges: price 1.
    Conflict(Unit),
    /// A stitch edge.
    Stitch {
        /// Its two fragments, the smaller one first.
        ends: Edge,
        /// Its weight.
        weight: u64,
    },
}

impl Item {
    /// What violating it costs.
    pub fn weight(&self) -> u64 {
        match self {
            Item::Conflict(_) => 1,
            Item::Stitch { weight, .. } => *weight,
        }
    }

    /// The fragments that it speaks of, with repetition.
    pub fn fragments(&self, features: &Features<'_>) -> Vec<u32> {
        let mut fragments: Vec<u32> = self.edges().iter().flatten().copied().collect();
        if let Item::Conflict(unit) = self {
            for &edge in unit.iter().filter(|&&edge| is_self_spacing(features, edge)) {
                fragments.extend(needed(features, edge));
            }
        }
        fragments
    }

    /// Its edges.
    pub fn edges(&self) -> &[Edge] {
        match self {
            Item::Conflict(unit) => unit,
            Item::Stitch { ends, .. } => std::slice::from_ref(ends),
        }
    }
}

impl AsRef<[Edge]> for Item {
    fn as_ref(&self) -> &[Edge] {
        self.edges()
    }
}

/// Items of which a colouring may violate a total weight of at most `most`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Budget {
    /// In the order of the counter.
    pub items: Vec<Item>,
    /// The most that may be spent.
    pub most: u64,
}

/// "A colouring exists that keeps the ties, resolves all of `resolved` and keeps to all budgets."
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Statement {
    /// Units that are not violated.
    pub resolved: Vec<Unit>,
    /// Conflict bounds that are met, then the bound's own budget: its limit less one.
    pub budgets: Vec<Budget>,
    /// Further fragments, ascending, for the ties among all of them ([`super::ties`]).
    pub with: Vec<u32>,
}

impl Statement {
    /// The edges that it names, with repetition.
    fn edges(&self) -> impl Iterator<Item = Edge> + '_ {
        let items = self.budgets.iter().flat_map(|budget| &budget.items);
        let edges = items.flat_map(Item::edges);
        self.resolved.iter().flatten().chain(edges).copied()
    }

    /// The self-spacings that it names, with repetition.
    fn self_spacings<'s>(&'s self, features: &'s Features<'_>) -> impl Iterator<Item = Edge> + 's {
        let items = self.budgets.iter().flat_map(|budget| &budget.items);
        let units = items.filter_map(|item| match item {
            Item::Conflict(unit) => Some(unit),
            Item::Stitch { .. } => None,
        });
        self.resolved
            .iter()
            .chain(units)
            .flatten()
            .copied()
            .filter(|&edge| is_self_spacing(features, edge))
    }

    /// The same with all fragments that its ties may need.
    pub fn with_ties(mut self, features: &Features<'_>) -> Statement {
        if !features.instance.ties().is_empty() {
            self.with = ties::further(features, &self.fragments(features));
        }
        self
    }

    /// The fragments that it speaks of, ascending.
    pub fn fragments(&self, features: &Features<'_>) -> Vec<u32> {
        let mut fragments: Vec<u32> = self.edges().flatten().collect();
        fragments.extend(&self.with);
        for edge in self.self_spacings(features) {
            fragments.extend(needed(features, edge));
        }
        fragments.sort_unstable();
        fragments.dedup();
        fragments
    }
}

/// Whether an edge of a unit of conflict is a self-spacing.
pub fn is_self_spacing(features: &Features<'_>, [a, b]: Edge) -> bool {
    features.instance.feature_of(a) == features.instance.feature_of(b)
}

/// The fragments that tell whether a self-spacing is violated, besides its ends.
pub fn needed(features: &Features<'_>, edge: Edge) -> Vec<u32> {
    let feature = features.instance.feature_of(edge[0]);
    if features.is_tree(feature) {
        features.path(edge)
    } else {
        features.instance.fragments_of(feature).collect()
    }
}

/// Whether each of the fragments may take every mask.
pub fn is_unrestricted(features: &Features<'_>, fragments: &[u32]) -> bool {
    let all = MaskSet::all(features.instance.masks());
    fragments
        .iter()
        .all(|&fragment| features.instance.allowed(fragment) == all)
}
