//! Trying all colourings of a bound's fragments, as its reader will.
//!
//! Depth first, each fragment after those that it is tied to the most; a branch ends as soon as a resolved
//! unit is violated or a budget exceeded. Where masks are interchangeable, a fragment takes at most one
//! mask beyond those in use before it (value precedence; Law and Lee, CP 2004).

use rustc_hash::FxHashMap;

use encodings::Mask;

use super::features::Features;
use super::statement::{Item, Statement, is_self_spacing, is_unrestricted, needed};
use super::ties;
use crate::certificate::Edge;

/// How many colourings of the fragments there are to try, as the format counts them.
pub fn colourings(features: &Features<'_>, fragments: &[u32]) -> u64 {
    let masks = u64::from(features.instance.masks());
    let unrestricted = is_unrestricted(features, fragments);
    let choices = (1..).zip(fragments).map(|(i, &fragment)| {
        if unrestricted {
            masks.min(i)
        } else {
            u64::from(features.instance.allowed(fragment).len())
        }
    });
    choices.fold(1, |product: u64, choices| product.saturating_mul(choices))
}

/// Whether no colouring of the fragments makes the statement true.
pub fn refutes(features: &Features<'_>, fragments: &[u32], statement: &Statement) -> bool {
    let mut search = Search::new(features, fragments, statement);
    !search.find()
}

/// An edge that can be judged once its last fragment has a mask.
enum Event {
    /// The item is violated where this fragment, at an earlier depth, has the same mask.
    Same(u32, u32),
    /// Where it has another one.
    Differ(u32, u32),
    /// The item is violated where this self-spacing is.
    SelfSpacing(u32, Edge),
}

struct Search<'a> {
    features: &'a Features<'a>,
    interchangeable: bool,
    order: Vec<u32>,
    /// By depth.
    events: Vec<Vec<Event>>,
    depth_of: FxHashMap<u32, u32>,
    masks: Vec<Mask>,
    /// Budget and weight of each item; resolved units have the budget 0, in which there is nothing.
    items: Vec<(usize, u64)>,
    /// How many edges violate each item.
    violated: Vec<u32>,
    left: Vec<u64>,
    /// The items violated first at each depth.
    paid: Vec<Vec<u32>>,
    broken: Vec<Vec<u32>>,
}

impl<'a> Search<'a> {
    fn new(features: &'a Features<'a>, fragments: &[u32], statement: &Statement) -> Search<'a> {
        let resolved = statement
            .resolved
            .iter()
            .map(|u| (0, Item::Conflict(u.clone())));
        let budgets = (1..).zip(&statement.budgets);
        let priced = budgets.flat_map(|(i, b)| b.items.iter().map(move |item| (i, item.clone())));
        let ties = ties::among(features, fragments);
        let different = ties
            .different
            .iter()
            .map(|&edge| (0, Item::Conflict(vec![edge])));
        let same = ties
            .same
            .iter()
            .map(|&ends| (0, Item::Stitch { ends, weight: 1 }));
        let counted = (1 + statement.budgets.len()..).zip(&ties.budgets);
        let counted = counted.flat_map(|(i, b)| b.items.iter().map(move |item| (i, item.clone())));
        let tied = different.chain(same).chain(counted);
        let items: Vec<(usize, Item)> = resolved.chain(priced).chain(tied).collect();
        let order = order(fragments, &items);
        let depth_of: FxHashMap<u32, u32> = order.iter().copied().zip(0..).collect();
        let mut search = Search {
            features,
            interchangeable: is_unrestricted(features, fragments),
            events: order.iter().map(|_| Vec::new()).collect(),
            masks: vec![0; order.len()],
            violated: vec![0; items.len()],
            left: std::iter::once(0)
                .chain(
                    statement
                        .budgets
                        .iter()
                        .chain(&ties.budgets)
                        .map(|budget| budget.most),
                )
                .collect(),
            items: items.iter().map(|(b, item)| (*b, item.weight())).collect(),
            paid: vec![Vec::new(); order.len()],
            broken: vec![Vec::new(); order.len()],
            order,
            depth_of,
        };
        for (i, (_, item)) in (0..).zip(&items) {
            for &edge in item.edges() {
                search.place(i, edge, matches!(item, Item::Stitch { .. }));
            }
        }
        search
    }

    fn place(&mut self, item: u32, edge: Edge, is_stitch: bool) {
        let depth = |fragment: &u32| self.depth_of.get(fragment).copied().unwrap_or(0);
        let [a, b] = [depth(&edge[0]), depth(&edge[1])];
        let (first, last) = (a.min(b), a.max(b));
        let (at, event) = if is_stitch {
            (last, Event::Differ(item, first))
        } else if is_self_spacing(self.features, edge) {
            let inner = needed(self.features, edge);
            let at = inner.iter().map(depth).fold(last, u32::max);
            (at, Event::SelfSpacing(item, edge))
        } else {
            (last, Event::Same(item, first))
        };
        self.events[at as usize].push(event);
    }

    /// Looks for a colouring that makes the statement true.
    fn find(&mut self) -> bool {
        let end = self.order.len();
        // For each depth the next mask to try, and how many masks are in use before it.
        let mut next: Vec<Mask> = vec![0; end + 1];
        let mut used: Vec<Mask> = vec![0; end + 1];
        let mut depth = 0;
        loop {
            if depth == end {
                return true;
            }
            let mask = next[depth];
            let most = self.features.instance.masks();
            let most = if self.interchangeable {
                most.min(used[depth] + 1)
            } else {
                most
            };
            if mask >= most {
                let Some(before) = depth.checked_sub(1) else {
                    return false;
                };
                depth = before;
                self.take_back(depth);
                continue;
            }
            next[depth] += 1;
            if !self
                .features
                .instance
                .allowed(self.order[depth])
                .contains(mask)
            {
                continue;
            }
            self.masks[depth] = mask;
            if self.pay(depth) {
                used[depth + 1] = used[depth].max(mask + 1);
                depth += 1;
                if depth < end {
                    next[depth] = 0;
                }
            } else {
                self.take_back(depth);
            }
        }
    }

    /// Pays for what the fragment at a depth violates; says whether it could.
    fn pay(&mut self, depth: usize) -> bool {
        for event in 0..self.events[depth].len() {
            let (item, is_violated) = match self.events[depth][event] {
                Event::Same(item, other) => (item, self.masks[depth] == self.masks[other as usize]),
                Event::Differ(item, other) => {
                    (item, self.masks[depth] != self.masks[other as usize])
                }
                Event::SelfSpacing(item, edge) => (item, self.is_apart(edge)),
            };
            if !is_violated {
                continue;
            }
            self.broken[depth].push(item);
            self.violated[item as usize] += 1;
            if self.violated[item as usize] == 1 {
                let (budget, weight) = self.items[item as usize];
                let Some(left) = self.left[budget].checked_sub(weight) else {
                    return false;
                };
                self.left[budget] = left;
                self.paid[depth].push(item);
            }
        }
        true
    }

    fn take_back(&mut self, depth: usize) {
        for item in self.broken[depth].drain(..) {
            self.violated[item as usize] -= 1;
        }
        for item in self.paid[depth].drain(..) {
            let (budget, weight) = self.items[item as usize];
            self.left[budget] += weight;
        }
    }

    fn mask(&self, fragment: u32) -> Option<Mask> {
        let depth = *self.depth_of.get(&fragment)?;
        self.masks.get(depth as usize).copied()
    }

    /// Whether the ends of a self-spacing share a mask and are not joined through it.
    fn is_apart(&self, [a, b]: Edge) -> bool {
        let mask = self.mask(a);
        if mask != self.mask(b) {
            return false;
        }
        let feature = self.features.instance.feature_of(a);
        if self.features.is_tree(feature) {
            let path = self.features.path([a, b]);
            return path.iter().any(|&inner| self.mask(inner) != mask);
        }
        let mut reached = vec![a];
        let mut at = 0;
        while let Some(&fragment) = reached.get(at) {
            at += 1;
            for &next in self.features.neighbours(fragment) {
                if self.mask(next) == mask && !reached.contains(&next) {
                    reached.push(next);
                }
            }
        }
        !reached.contains(&b)
    }
}

/// Each fragment after those that it is tied to the most: an exchange of one for another changes the
/// time only.
fn order(fragments: &[u32], items: &[(usize, Item)]) -> Vec<u32> {
    let place = |fragment: u32| fragments.binary_search(&fragment).unwrap_or(0);
    let mut near: Vec<Vec<usize>> = vec![Vec::new(); fragments.len()];
    for &[a, b] in items.iter().flat_map(|(_, item)| item.edges()) {
        let (a, b) = (place(a), place(b));
        near[a].push(b);
        near[b].push(a);
    }
    let mut ties = vec![0usize; fragments.len()];
    let mut open: Vec<usize> = (0..fragments.len()).collect();
    let mut order = Vec::with_capacity(fragments.len());
    while let Some(best) = open
        .iter()
        .copied()
        .max_by_key(|&at| (ties[at], near[at].len(), std::cmp::Reverse(at)))
    {
        open.retain(|&at| at != best);
        order.push(fragments[best]);
        for &other in &near[best] {
            ties[other] += 1;
        }
    }
    order
}
