//! Which fragments name the masks: some that conflict with one another, as many as a greedy choice finds,
//! so that the names are settled early.

use rustc_hash::FxHashMap;

use super::features::Features;
use super::statement::{Item, Statement, is_self_spacing, is_unrestricted};

/// At most K - 1 fragments (a K-th one would be free to take any mask), none where masks are not
/// interchangeable. With two masks precedence was measured to cost more than it gives.
pub fn choose(features: &Features<'_>, fragments: &[u32], statement: &Statement) -> Vec<u32> {
    let most = usize::from(features.instance.masks()) - 1;
    if most < 2 || !is_unrestricted(features, fragments) {
        return Vec::new();
    }
    let near = neighbours(features, statement);
    let none = Vec::new();
    let of = |fragment: u32| near.get(&fragment).unwrap_or(&none);
    let mut candidates = fragments.to_vec();
    let mut chosen = Vec::new();
    while chosen.len() < most {
        let joined = |fragment: u32| {
            let inside = |other: &&u32| candidates.binary_search(other).is_ok();
            of(fragment).iter().filter(inside).count()
        };
        let best = candidates
            .iter()
            .copied()
            .max_by_key(|&f| (joined(f), std::cmp::Reverse(f)));
        let Some(next) = best else { break };
        chosen.push(next);
        candidates = of(next)
            .iter()
            .copied()
            .filter(|other| candidates.binary_search(other).is_ok())
            .collect();
    }
    chosen
}

/// For each fragment those that it conflicts with, ascending.
fn neighbours(features: &Features<'_>, statement: &Statement) -> FxHashMap<u32, Vec<u32>> {
    let mut near: FxHashMap<u32, Vec<u32>> = FxHashMap::default();
    let items = statement.budgets.iter().flat_map(|budget| &budget.items);
    let units = items.filter_map(|item| match item {
        Item::Conflict(unit) => Some(unit),
        Item::Stitch { .. } => None,
    });
    for &[a, b] in statement.resolved.iter().chain(units).flatten() {
        if !is_self_spacing(features, [a, b]) {
            near.entry(a).or_default().push(b);
            near.entry(b).or_default().push(a);
        }
    }
    for list in near.values_mut() {
        list.sort_unstable();
        list.dedup();
    }
    near
}
