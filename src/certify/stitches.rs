//! Bounds on stitches: a cluster of the search with the facts of the first level that it relies on.
//!
//! The search does not say which facts its cores used, so they are looked for anew, from the stitch edges
//! outwards: the units that are resolved and the conflict bounds that are met in a window of features. The
//! first window that refutes the cluster has enough of them, and of those a core is kept. With two masks
//! an odd cycle is looked for before that.

use rustc_hash::FxHashSet;

use super::conflicts;
use super::cores::{self, Needed};
use super::cycle;
use super::features::Features;
use super::formula::Part;
use super::order;
use super::statement::{Budget, Item, Statement, is_self_spacing};
use crate::certificate::{Edge, Unit};
use crate::solve::core_guided::relaxation::Cluster;
use crate::solve::places::Places;

/// A bound on stitches in the making.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Bound {
    /// The least total weight.
    pub limit: u64,
    /// The stitch edges.
    pub units: Vec<Edge>,
    /// Units outside all conflict bounds that it relies on.
    pub resolved: Vec<Unit>,
    /// Conflict bounds of the piece that it relies on, ascending.
    pub met: Vec<u32>,
}

/// How far around its stitch edges a cluster looks for facts, try by try; then in the whole piece.
const STEPS: [usize; 6] = [1, 2, 3, 5, 8, 13];

/// The most bytes of the solver's proof that one window may take.
const MOST_EFFORT: u64 = 1 << 24;

/// A piece whose first level is settled.
pub struct Settled<'a> {
    features: Features<'a>,
    places: Places<'a>,
    bounds: &'a [conflicts::Bound],
    /// For each unit of conflict the bound that it is in.
    bound_of: Vec<Option<u32>>,
}

/// What is known of the first level in a window.
struct Facts {
    resolved: Vec<Unit>,
    met: Vec<u32>,
}

impl<'a> Settled<'a> {
    /// A piece and its bounds on conflicts, which are met exactly.
    pub fn new(features: Features<'a>, bounds: &'a [conflicts::Bound]) -> Settled<'a> {
        let mut of_edge: Vec<(Edge, u32)> = Vec::new();
        for (i, bound) in (0..).zip(bounds) {
            of_edge.extend(bound.units.iter().flatten().map(|&edge| (edge, i)));
        }
        of_edge.sort_unstable();
        let find = |edge: &Edge| {
            let found = of_edge.binary_search_by_key(edge, |&(edge, _)| edge);
            found.ok().map(|at| of_edge[at].1)
        };
        let units = 0..features.instance.unit_count() as u32;
        let bound_of = units.map(|unit| conflicts::unit(&features, unit).iter().find_map(find));
        Settled {
            bound_of: bound_of.collect(),
            places: Places::new(features.instance),
            features,
            bounds,
        }
    }

    /// The bound of a cluster; `None` where the facts to prove it with are not found.
    pub fn bound(&self, cluster: &Cluster) -> Option<Bound> {
        let instance = self.features.instance;
        let stitch = |&i: &u32| instance.stitches()[i as usize];
        let start = cluster
            .units
            .iter()
            .map(|i| instance.feature_of(stitch(i).a));
        let start: Vec<u32> = start.collect();
        let own = Budget {
            items: cluster
                .units
                .iter()
                .map(stitch)
                .map(|stitch| Item::Stitch {
                    ends: [stitch.a, stitch.b],
                    weight: u64::from(stitch.weight),
                })
                .collect(),
            most: cluster.limit.saturating_sub(1),
        };
        let mut seen = 0;
        for steps in STEPS.into_iter().chain([usize::MAX]) {
            let window = self.window(&start, steps);
            if window.len() == seen {
                continue;
            }
            seen = window.len();
            let facts = self.facts(&window);
            if let Some(bound) = self.along_cycle(&own, &facts) {
                return Some(bound);
            }
            let statement = self.statement(&own, &facts);
            match cores::needed(&self.features, &statement, MOST_EFFORT) {
                Needed::Parts(parts) => {
                    let met = (0..).zip(&facts.met);
                    let met = met.filter(|&(i, _)| parts.contains(&Part::Budget(i)));
                    let met = met.map(|(_, &bound)| bound).collect();
                    return Some(bound_of(cores::reduced(&statement, &parts, false), met));
                }
                Needed::Satisfiable => {}
                Needed::Stopped => return None,
            }
        }
        None
    }

    fn window(&self, start: &[u32], steps: usize) -> Vec<u32> {
        match steps {
            usize::MAX => (0..self.features.instance.feature_count() as u32).collect(),
            _ => self.places.around(start, steps),
        }
    }

    /// The facts about units between features of a window, ascending: nearest last, as they come off a
    /// core first come, first gone.
    fn facts(&self, window: &[u32]) -> Facts {
        let inside = |feature: u32| window.binary_search(&feature).is_ok();
        let units = window
            .iter()
            .flat_map(|&f| self.places.units_of_conflict(f));
        let mut units: Vec<u32> = units
            .filter(|&unit| self.places.features_of_unit(unit).into_iter().all(inside))
            .collect();
        units.sort_unstable();
        units.dedup();
        let mut facts = Facts {
            resolved: Vec::new(),
            met: Vec::new(),
        };
        for unit in units {
            match self.bound_of[unit as usize] {
                Some(bound) => facts.met.push(bound),
                None => facts.resolved.push(conflicts::unit(&self.features, unit)),
            }
        }
        facts.met.sort_unstable();
        facts.met.dedup();
        facts
    }

    fn statement(&self, own: &Budget, facts: &Facts) -> Statement {
        let met = facts.met.iter().map(|&i| {
            let bound = &self.bounds[i as usize];
            met_budget(&bound.units, bound.limit)
        });
        let mut own = own.clone();
        let met: Vec<Budget> = met.collect();
        let items = met.iter().flat_map(|budget| &budget.items);
        let conflicts = items.filter_map(|item| match item {
            Item::Conflict(unit) => Some(unit),
            Item::Stitch { .. } => None,
        });
        let ties: Vec<&Unit> = facts.resolved.iter().chain(conflicts).collect();
        order::sort(&mut own.items, &ties);
        Statement {
            resolved: facts.resolved.clone(),
            budgets: met.into_iter().chain([own]).collect(),
            with: Vec::new(),
        }
        .with_ties(&self.features)
    }

    /// The stitch edges along a shortest odd cycle, with two masks, where each of them is worth the limit.
    fn along_cycle(&self, own: &Budget, facts: &Facts) -> Option<Bound> {
        let affordable = own.items.iter().any(|item| item.weight() <= own.most);
        if self.features.instance.masks() != 2 || affordable {
            return None;
        }
        let conflicts = facts.resolved.iter().flatten().copied();
        let conflicts = conflicts.filter(|&edge| !is_self_spacing(&self.features, edge));
        let conflicts: Vec<Edge> = conflicts.collect();
        let stitches = own.items.iter().flat_map(Item::edges).copied();
        let stitches: Vec<Edge> = stitches.collect();
        let walk = cycle::shortest(&conflicts, &stitches)?;
        let steps: FxHashSet<Edge> = cycle::steps(&walk).collect();
        let units: Vec<Edge> = stitches.into_iter().filter(|e| steps.contains(e)).collect();
        let on_it = |unit: &Unit| {
            let kept = unit.iter().copied().filter(|edge| steps.contains(edge));
            Some(kept.collect()).filter(|kept: &Unit| !kept.is_empty())
        };
        Some(Bound {
            limit: own.most + 1,
            units,
            resolved: facts.resolved.iter().filter_map(on_it).collect(),
            met: Vec::new(),
        })
    }
}

/// What a conflict bound that is met allows.
pub fn met_budget(units: &[Unit], limit: u64) -> Budget {
    Budget {
        items: units.iter().cloned().map(Item::Conflict).collect(),
        most: limit,
    }
}

fn bound_of(mut statement: Statement, met: Vec<u32>) -> Bound {
    let own = statement.budgets.pop();
    let items = own.iter().flat_map(|own| &own.items);
    Bound {
        limit: own.as_ref().map_or(0, |own| own.most + 1),
        units: items.flat_map(Item::edges).copied().collect(),
        resolved: statement.resolved,
        met,
    }
}
