//! Bounds on conflicts: a cluster of the search, in the fragments of its piece, without what it does not
//! need.
//!
//! Dropping a unit makes the second level's facts stronger: units outside all bounds are resolved. Dropping
//! only some edges of a unit would make them weaker, so units are kept whole where stitches have to be
//! proven.

use rustc_hash::FxHashSet;

use super::cores::{self, Needed};
use super::features::Features;
use super::statement::{Budget, Item, Statement, is_self_spacing};
use super::{clique, cycle};
use crate::certificate::{Edge, Unit};
use crate::solve::core_guided::relaxation::Cluster;

/// A bound on conflicts in the making.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Bound {
    /// The least number of violated units.
    pub limit: u64,
    /// The units by their edges.
    pub units: Vec<Unit>,
}

/// The most bytes of the solver's proof that looking for what a bound does not need may take.
const MOST_EFFORT: u64 = 1 << 22;

/// The edges of a unit of conflict of an instance.
pub fn unit(features: &Features<'_>, unit: u32) -> Unit {
    features.instance.unit(unit).to_vec()
}

/// What a bound on `units` denies.
pub fn statement(units: &[Unit], limit: u64) -> Statement {
    Statement {
        resolved: Vec::new(),
        budgets: vec![Budget {
            items: units.iter().cloned().map(Item::Conflict).collect(),
            most: limit.saturating_sub(1),
        }],
        with: Vec::new(),
    }
}

/// The bound of a cluster. `whole` says that units must keep all their edges.
pub fn bound(features: &Features<'_>, cluster: &Cluster, whole: bool) -> Bound {
    let units = cluster.units.iter().map(|&number| unit(features, number));
    let bound = Bound {
        limit: cluster.limit,
        units: units.collect(),
    };
    let is_clique = clique::of(features, &statement(&bound.units, bound.limit)).is_some();
    let shrinks = bound.limit == 1 && bound.units.len() > 1 && !is_clique;
    let shorter = (features.instance.masks() == 2 && shrinks)
        .then(|| along_cycle(features, &bound, whole))
        .flatten();
    match shorter {
        Some(shorter) => shorter,
        None if shrinks => core(features, bound, whole),
        None => bound,
    }
}

/// The units along a shortest odd cycle.
fn along_cycle(features: &Features<'_>, bound: &Bound, whole: bool) -> Option<Bound> {
    let edges = bound.units.iter().flatten().copied();
    let edges: Vec<Edge> = edges.filter(|&e| !is_self_spacing(features, e)).collect();
    let walk = cycle::shortest(&edges, &[])?;
    let steps: FxHashSet<Edge> = cycle::steps(&walk).collect();
    let on_it = |unit: &Unit| {
        let kept: Unit = unit
            .iter()
            .copied()
            .filter(|edge| steps.contains(edge))
            .collect();
        match kept.is_empty() {
            true => None,
            false if whole => Some(unit.clone()),
            false => Some(kept),
        }
    };
    Some(Bound {
        limit: 1,
        units: bound.units.iter().filter_map(on_it).collect(),
    })
}

/// The units of a core.
fn core(features: &Features<'_>, bound: Bound, whole: bool) -> Bound {
    let all = statement(&bound.units, bound.limit).with_ties(features);
    let Needed::Parts(parts) = cores::needed(features, &all, MOST_EFFORT) else {
        return bound;
    };
    let mut reduced = cores::reduced(&all, &parts, whole);
    let items = reduced.budgets.pop().map(|budget| budget.items);
    let units = items.into_iter().flatten().filter_map(|item| match item {
        Item::Conflict(unit) => Some(unit),
        Item::Stitch { .. } => None,
    });
    Bound {
        limit: 1,
        units: units.collect(),
    }
}
