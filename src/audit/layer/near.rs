//! Which boxes come within a reach of each other, in both axes.
//!
//! Boxes are ranked by their lower sides. Of two that come within the reach along y, the one of higher rank starts
//! inside the other: ranks are points, and each box is an interval of the ranks that start within it. A balanced tree over
//! the ranks deals with them from above: intervals that hold all ranks of a node meet all its points along y, so that a
//! scan over x finds their pairs and no others; the remaining ones go on to the children. Both lists
//! stay sorted by x on their way down, and a node of few points is scanned as it is. n log n and the pairs found,
//! whatever is long, high or crowded.
//!
//! Labels name what need not be compared: where all intervals or all points of a scan have one label, those of
//! the same label on the other side are left out.
//!
//! Source: A. Zomorodian, H. Edelsbrunner, "Fast software for box intersections" (2000): a streamed segment tree. Departures:
//! ranks for coordinates, both lists at once in the scan, and [`touching`], which gives a spanning forest only.

use crate::geometry::Rect;
use rayon::prelude::*;

/// The most points that are scanned without dividing them further.
const FEW: u32 = 64;
/// The fewest points that are worth another thread.
const MANY: u32 = 1 << 13;

/// What `pick` makes of each two boxes of different labels that come within `reach` (at least 0) of each other along
/// both axes; sorted, each once. It gets the smaller number first.
pub(super) fn pairs<T: Ord + Send>(
    boxes: &[Rect],
    labels: &[u32],
    reach: i32,
    pick: impl Fn(u32, u32) -> Option<T> + Sync,
) -> Vec<T> {
    let search = Search {
        pick: |a: &Item, b: &Item| match a.label == b.label {
            true => None,
            false => pick(a.id.min(b.id), a.id.max(b.id)),
        },
        joins: false,
    };
    search.run(items(boxes, Some(labels), reach))
}

/// Pairs of boxes that share a point, as many as connect all boxes that hang together, and not many more.
pub(super) fn touching(boxes: &[Rect]) -> Vec<[u32; 2]> {
    let search = Search {
        pick: |a: &Item, b: &Item| Some([a.id, b.id]),
        joins: true,
    };
    search.run(items(boxes, None, 0))
}

/// A box, as the search needs it.
#[derive(Clone, Copy)]
struct Item {
    /// Its left side, and its right side with the reach.
    x: [i32; 2],
    /// Its rank by its lower side.
    rank: u32,
    /// The first rank of those that start beyond its upper side and the reach.
    end: u32,
    id: u32,
    label: u32,
}

impl Item {
    /// Whether the other one starts, along y, after this one and within its reach.
    fn holds(&self, point: &Item) -> bool {
        self.rank < point.rank && point.rank < self.end
    }
}

/// The boxes sorted by their left sides.
fn items(boxes: &[Rect], labels: Option<&[u32]>, reach: i32) -> Vec<Item> {
    let mut order: Vec<(i32, u32)> = boxes.iter().map(|b| b.min.y).zip(0..).collect();
    order.par_sort_unstable();
    let mut found: Vec<Item> = (order.par_iter().enumerate())
        .map(|(rank, &(_, id))| {
            let area = &boxes[id as usize];
            // No coordinate comes near the end of the range: to stop there changes no comparison.
            let top = area.max.y.saturating_add(reach);
            Item {
                x: [area.min.x, area.max.x.saturating_add(reach)],
                rank: rank as u32,
                end: order.partition_point(|&(y, _)| y <= top) as u32,
                id,
                label: labels.map_or(0, |labels| labels[id as usize]),
            }
        })
        .collect();
    found.par_sort_unstable_by_key(|item| (item.x[0], item.id));
    found
}

struct Search<P> {
    pick: P,
    /// Whether pairs only tell what hangs together, and any two boxes that meet are one.
    joins: bool,
}

impl<T: Ord + Send, P: Fn(&Item, &Item) -> Option<T> + Sync> Search<P> {
    fn run(&self, items: Vec<Item>) -> Vec<T> {
        let all = [0, items.len() as u32];
        let mut found = Found::default();
        self.node(all, items.clone(), items, &mut found);
        found.shrink();
        found.list
    }

    /// The pairs of an interval and a point, whose rank is in the range of the node.
    fn node(
        &self,
        [low, high]: [u32; 2],
        intervals: Vec<Item>,
        points: Vec<Item>,
        found: &mut Found<T>,
    ) {
        let alone = !self.joins && only(&intervals).is_some_and(|l| only(&points) == Some(l));
        if intervals.is_empty() || points.is_empty() || alone {
            return;
        }
        if high - low <= FEW {
            return self.scan(&intervals, &points, false, found);
        }
        let (across, rest): (Vec<Item>, Vec<Item>) = (intervals.into_iter())
            .partition(|interval| interval.rank < low && high <= interval.end);
        self.scan(&across, &points, self.joins, found);
        drop(across);
        let middle = low + (high - low) / 2;
        let below = |i: &&Item| i.rank + 1 < middle && low < i.end;
        let above = |i: &&Item| middle < i.end;
        let rests = [
            rest.iter().filter(below).copied().collect(),
            rest.iter().filter(above).copied().collect(),
        ];
        drop(rest);
        let points = points.into_iter().partition(|point| point.rank < middle);
        self.children([low, middle, high], rests, points, found);
    }

    fn children(
        &self,
        [low, middle, high]: [u32; 3],
        [below, above]: [Vec<Item>; 2],
        (left, right): (Vec<Item>, Vec<Item>),
        found: &mut Found<T>,
    ) {
        if high - low < MANY {
            self.node([low, middle], below, left, found);
            self.node([middle, high], above, right, found);
            return;
        }
        let mut later = Found::default();
        rayon::join(
            || self.node([low, middle], below, left, found),
            || self.node([middle, high], above, right, &mut later),
        );
        found.extend(later.list);
    }

    /// The pairs of an interval and a point, by a line that moves along x with those under it. Where each two that
    /// meet are joined (`merge`), the one that goes on farthest stands for all those met.
    fn scan(&self, intervals: &[Item], points: &[Item], merge: bool, found: &mut Found<T>) {
        let labels = match self.joins {
            true => [None, None],
            false => [only(intervals), only(points)],
        };
        let (mut i, mut p) = (0, 0);
        let mut under = [Vec::new(), Vec::new()];
        while i < intervals.len() || (p < points.len() && !under[0].is_empty()) {
            let key = |item: &Item| (item.x[0], item.id);
            let is_interval = match (intervals.get(i), points.get(p)) {
                (Some(interval), Some(point)) => key(interval) <= key(point),
                (interval, _) => interval.is_some(),
            };
            let (next, side) = match is_interval {
                true => (&intervals[i], 0),
                false => (&points[p], 1),
            };
            (i, p) = (i + usize::from(is_interval), p + usize::from(!is_interval));
            if labels[1 - side] == Some(next.label) {
                continue;
            }
            let others = &mut under[1 - side];
            others.retain(|other: &Item| other.x[1] >= next.x[0]);
            for other in others.iter() {
                let meet = match is_interval {
                    true => next.holds(other),
                    false => other.holds(next),
                };
                if meet {
                    found.extend((self.pick)(next, other));
                }
            }
            if merge && let Some(&farthest) = others.iter().max_by_key(|other| other.x[1]) {
                others.clear();
                others.push(farthest);
            }
            under[side].push(*next);
        }
    }
}

/// The label that all of them have.
fn only(items: &[Item]) -> Option<u32> {
    let label = items.first()?.label;
    items
        .iter()
        .all(|item| item.label == label)
        .then_some(label)
}

/// What was found, without what was found again and again.
struct Found<T> {
    list: Vec<T>,
    limit: usize,
}

impl<T> Default for Found<T> {
    fn default() -> Found<T> {
        Found {
            list: Vec::new(),
            limit: 1 << 12,
        }
    }
}

impl<T: Ord> Found<T> {
    fn extend(&mut self, more: impl IntoIterator<Item = T>) {
        self.list.extend(more);
        if self.list.len() > self.limit {
            self.shrink();
            self.limit = self.limit.max(2 * self.list.len());
        }
    }

    fn shrink(&mut self) {
        self.list.sort_unstable();
        self.list.dedup();
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    fn boxes(rng: &mut rand_pcg::Pcg64Mcg, count: i32) -> Vec<Rect> {
        let size = rng.random_range(10..2_000);
        let long = rng.random_range(2..size);
        let mut side = |far: i32| rng.random_range(0..far);
        (0..count)
            .map(|_| {
                let (x, y) = (side(size), side(size));
                let [w, h] = if side(2) == 0 { [long, 5] } else { [5, long] };
                Rect::new(x, y, x + side(w), y + side(h))
            })
            .collect()
    }

    #[test]
    fn pairs_are_those_of_all_pairs() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(31);
        for round in 0..60 {
            let count = if round % 2 == 0 { 40 } else { 700 };
            let boxes = boxes(&mut rng, count);
            let reach = rng.random_range(0..40);
            let few = rng.random_range(1..900);
            let labels: Vec<u32> = boxes.iter().map(|_| rng.random_range(0..few)).collect();
            let mut expected = Vec::new();
            for a in 0..count as u32 {
                for b in a + 1..count as u32 {
                    let near = boxes[a as usize].grown(reach).touches(&boxes[b as usize]);
                    if near && labels[a as usize] != labels[b as usize] {
                        expected.push([a, b]);
                    }
                }
            }
            assert_eq!(pairs(&boxes, &labels, reach, |a, b| Some([a, b])), expected);
        }
    }

    /// The smallest box of each set that hangs together, by joining until nothing changes.
    fn firsts(count: u32, pairs: &[[u32; 2]]) -> Vec<u32> {
        let mut first: Vec<u32> = (0..count).collect();
        let mut again = true;
        while std::mem::take(&mut again) {
            for &[a, b] in pairs {
                let least = first[a as usize].min(first[b as usize]);
                again |= first[a as usize] != first[b as usize];
                (first[a as usize], first[b as usize]) = (least, least);
            }
        }
        first
    }

    #[test]
    fn few_pairs_tell_what_hangs_together() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(32);
        for _ in 0..40 {
            let boxes = boxes(&mut rng, 700);
            let labels: Vec<u32> = (0..700).collect();
            let all = pairs(&boxes, &labels, 0, |a, b| Some([a, b]));
            let some = touching(&boxes);
            assert!(
                some.iter()
                    .all(|&[a, b]| all.binary_search(&[a.min(b), a.max(b)]).is_ok())
            );
            assert_eq!(firsts(700, &some), firsts(700, &all));
        }
    }

    #[test]
    fn crowds_give_few_pairs() {
        let pile: Vec<Rect> = (0..20_000)
            .map(|i| Rect::new(i, i, i + 40_000, i + 40_000))
            .collect();
        let pairs = touching(&pile);
        assert!(pairs.len() < 20_000 * 80, "{}", pairs.len());
    }
}
