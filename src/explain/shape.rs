//! What a core looks like: a clique, an odd cycle, a wheel, or none of these.
//!
//! * K masks, n > K features pairwise too close: a clique. One of K + 1 needs one conflict, larger ones more:
//!   the fewest pairs within K groups of nearly the same size (Turan, 1941).
//! * Two masks: features around an odd cycle, each too close to the next.
//! * K >= 3 masks: a wheel, an odd cycle of 5 features or more (its rim) and K - 2 features (its hubs), each too
//!   close to the whole rim and to the other hubs. The hubs take K - 2 masks, which leaves the rim two.
//!
//! These are told by the spacings between features, and only where each feature takes part with a
//! single fragment: then no stitch of it matters. Everything else is a core and no more; nothing is
//! forced into a form.

use std::collections::{BTreeMap, BTreeSet, VecDeque};

use encodings::{Instance, MaskSet};

use super::core::Core;
use super::units::{self, Bound};

/// The most steps of the search for a clique.
const MOST_STEPS: usize = 20_000;

/// The most features from which a shortest odd cycle is looked for.
const MOST_STARTS: usize = 256;

/// The form of a core.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Shape {
    /// All features pairwise too close.
    Clique,
    /// Features in order around an odd cycle.
    OddCycle(Vec<u32>),
    /// A wheel.
    Wheel {
        /// The features around the cycle, in order.
        rim: Vec<u32>,
        /// The features too close to all others, ascending.
        hubs: Vec<u32>,
    },
    /// None of these.
    Other,
}

/// The form of a core.
pub fn of(instance: &Instance, core: &Core) -> Shape {
    let features = units::features(instance, &core.units);
    let masks = usize::from(instance.masks());
    if !split_features(instance, core).is_empty() {
        return Shape::Other;
    }
    let graph = graph(instance, &core.units);
    let n = features.len();
    let is_odd_cycle = masks == 2 && core.limit == 1;
    if let Some(cycle) = cycle(&graph).filter(|cycle| is_odd_cycle && cycle.len() % 2 == 1) {
        return Shape::OddCycle(cycle);
    }
    if core.units.len() == n * (n - 1) / 2 && core.limit == least_pairs(n, masks) {
        return Shape::Clique;
    }
    wheel(&graph, masks)
        .filter(|_| core.limit == 1)
        .map_or(Shape::Other, |(rim, hubs)| Shape::Wheel { rim, hubs })
}

/// The features that take part in a core with several fragments, or with spacings of their own, ascending.
pub fn split_features(instance: &Instance, core: &Core) -> Vec<u32> {
    let mut used: BTreeMap<u32, BTreeSet<u32>> = BTreeMap::new();
    for fragment in core.edges.iter().flatten().flatten() {
        let feature = instance.feature_of(*fragment);
        used.entry(feature).or_default().insert(*fragment);
    }
    let several = used
        .into_iter()
        .filter(|(_, fragments)| fragments.len() > 1);
    several.map(|(feature, _)| feature).collect()
}

type Graph = BTreeMap<u32, BTreeSet<u32>>;

/// The features of some units, and which of them the units join; self-spacings join nothing.
fn graph(instance: &Instance, units: &[u32]) -> Graph {
    let mut graph = Graph::new();
    for &unit in units {
        let [a, b] = units::features_of(instance, unit);
        graph.entry(a).or_default().extend((a != b).then_some(b));
        graph.entry(b).or_default().extend((a != b).then_some(a));
    }
    graph
}

/// The features in order around the graph, if it is one cycle: from the smallest one towards the smaller
/// of its neighbours.
fn cycle(graph: &Graph) -> Option<Vec<u32>> {
    if graph.values().any(|near| near.len() != 2) {
        return None;
    }
    let (&first, near) = graph.iter().next()?;
    let mut order = vec![first];
    let mut next = *near.iter().next()?;
    while next != first {
        let before = *order.last()?;
        order.push(next);
        next = *graph.get(&next)?.iter().find(|&&other| other != before)?;
    }
    (order.len() == graph.len()).then_some(order)
}

/// Rim and hubs of a wheel for this many masks.
fn wheel(graph: &Graph, masks: usize) -> Option<(Vec<u32>, Vec<u32>)> {
    let is_hub = |feature: &&u32| graph[*feature].len() + 1 == graph.len();
    let hubs: Vec<u32> = graph.keys().filter(is_hub).copied().collect();
    let mut rest = graph.clone();
    for hub in &hubs {
        rest.remove(hub);
    }
    for near in rest.values_mut() {
        near.retain(|feature| !hubs.contains(feature));
    }
    let rim = cycle(&rest)?;
    (hubs.len() + 2 == masks && rim.len() % 2 == 1 && rim.len() >= 5).then_some((rim, hubs))
}

/// The fewest pairs within the groups when `n` things are put into `groups` groups.
fn least_pairs(n: usize, groups: usize) -> u64 {
    let (size, larger) = (n / groups.max(1), n % groups.max(1));
    let pairs = |n: usize| n as u64 * (n as u64).saturating_sub(1) / 2;
    larger as u64 * pairs(size + 1) + (groups - larger) as u64 * pairs(size)
}

/// Whether a bound is a clique of whole features with the limit that it has: then no unit can be left out, since
/// its two ends can be put into one group of a best division.
pub fn is_full_clique(instance: &Instance, bound: &Bound) -> bool {
    let fragments = units::fragments(instance, &bound.units);
    let features = units::features(instance, &bound.units);
    let (n, masks) = (features.len(), usize::from(instance.masks()));
    let all = MaskSet::all(instance.masks());
    n > masks
        && fragments.len() == n
        && fragments.iter().all(|&f| instance.allowed(f) == all)
        && bound.units.len() == n * (n - 1) / 2
        && bound.limit == least_pairs(n, masks)
}

/// The units of a smallest structure that needs a conflict, ascending: a shortest odd cycle for two
/// masks, a clique of K + 1 for more. None for bounds of several conflicts, and where it is not found.
pub fn smallest(instance: &Instance, bound: &Bound) -> Vec<u32> {
    if bound.limit > 1 {
        return Vec::new();
    }
    let graph = graph(instance, &bound.units);
    let features = if instance.masks() == 2 {
        shortest_odd_cycle(&graph)
    } else {
        let (mut chosen, mut steps) = (Vec::new(), 0);
        let all: Vec<u32> = graph.keys().copied().collect();
        let size = usize::from(instance.masks()) + 1;
        clique(&graph, size, &all, &mut chosen, &mut steps);
        chosen
    };
    let around = |[a, b]: [u32; 2]| {
        let place = |f: u32| features.iter().position(|&other| other == f);
        let (Some(i), Some(j)) = (place(a), place(b)) else {
            return false;
        };
        let step = i.abs_diff(j);
        instance.masks() > 2 || step == 1 || step + 1 == features.len()
    };
    let mut units: Vec<u32> = (bound.units.iter().copied())
        .filter(|&unit| around(units::features_of(instance, unit)))
        .filter(|&unit| !units::is_self_spacing(instance, unit))
        .collect();
    units.sort_unstable();
    units
}

/// Extends `chosen` to a clique of `size` by some of `common`, ascending; empty where there is none.
fn clique(
    graph: &Graph,
    size: usize,
    common: &[u32],
    chosen: &mut Vec<u32>,
    steps: &mut usize,
) -> bool {
    if chosen.len() == size {
        return true;
    }
    for (i, &feature) in common.iter().enumerate() {
        *steps += 1;
        if *steps > MOST_STEPS || chosen.len() + common.len() - i < size {
            break;
        }
        let near = &graph[&feature];
        let next = common[i + 1..].iter().copied();
        let next: Vec<u32> = next.filter(|other| near.contains(other)).collect();
        chosen.push(feature);
        if clique(graph, size, &next, chosen, steps) {
            return true;
        }
        chosen.pop();
    }
    false
}

/// The features around a shortest odd cycle, in order: breadth first over features and parities of steps.
fn shortest_odd_cycle(graph: &Graph) -> Vec<u32> {
    let mut best: Vec<u32> = Vec::new();
    for &start in graph.keys().take(MOST_STARTS) {
        let mut before: BTreeMap<(u32, bool), u32> = BTreeMap::new();
        let mut queue = VecDeque::from([(start, false)]);
        while let Some((feature, odd)) = queue.pop_front() {
            for &next in &graph[&feature] {
                let state = (next, !odd);
                if state != (start, false) && !before.contains_key(&state) {
                    before.insert(state, feature);
                    queue.push_back(state);
                }
            }
        }
        let mut cycle = Vec::new();
        let mut state = (start, true);
        while let Some(&from) = before.get(&state) {
            cycle.push(from);
            state = (from, !state.1);
        }
        let shorter = best.is_empty() || cycle.len() < best.len();
        if !cycle.is_empty() && shorter {
            best = cycle;
        }
    }
    best
}

/// A fragment each of up to K features that are pairwise too close, as far as a greedy choice finds them.
pub fn dense(instance: &Instance, bound: &Bound) -> Vec<u32> {
    let graph = graph(instance, &bound.units);
    let fragments = units::fragments(instance, &bound.units);
    let mut order: Vec<u32> = graph.keys().copied().collect();
    order.sort_by_key(|feature| (std::cmp::Reverse(graph[feature].len()), *feature));
    let mut chosen: Vec<u32> = Vec::new();
    for feature in order {
        if chosen.len() < usize::from(instance.masks())
            && chosen.iter().all(|other| graph[&feature].contains(other))
        {
            chosen.push(feature);
        }
    }
    let first = |&feature: &u32| {
        let start = instance.fragments_of(feature).start;
        fragments
            .get(fragments.partition_point(|&f| f < start))
            .copied()
    };
    chosen.iter().filter_map(first).collect()
}
