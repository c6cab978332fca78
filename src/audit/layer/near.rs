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

use crate::audit::{Rejection, Step};
use crate::geometry::Rect;
use rayon::prelude::*;
use std::sync::atomic::{AtomicUsize, Ordering::Relaxed};

/// The most points that are scanned without dividing them further.
const FEW: u32 = 64;
/// The fewest points that are worth another thread.
const MANY: u32 = 1 << 13;
/// The most that may be found: four times what the extraction allows, 4 GB.
const MOST: usize = 1 << 29;

/// What `pick` makes of each two boxes of different labels that come within `reach` (at least 0) of each other along
/// both axes; sorted, each once. It gets the smaller number first. A rejection where they are more than [`MOST`].
pub(super) fn pairs<T: Ord + Send>(
    boxes: &[Rect],
    labels: &[u32],
    reach: i32,
    pick: impl Fn(u32, u32) -> Option<T> + Sync,
) -> Result<Vec<T>, Rejection> {
    let search = Search {
        pick: |a: &Item, b: &Item| match a.label == b.label {
            true => None,
            false => pick(a.id.min(b.id), a.id.max(b.id)),
        },
        joins: false,
        most: MOST,
        held: AtomicUsize::new(0),
    };
    search.run(items(boxes, Some(labels), reach))
}

/// Pairs of boxes that share a point, as many as connect all boxes that hang together, and not many more.
pub(super) fn touching(boxes: &[Rect]) -> Result<Vec<[u32; 2]>, Rejection> {
    let search = Search {
        pick: |a: &Item, b: &Item| Some([a.id, b.id]),
        joins: true,
        most: MOST,
        held: AtomicUsize::new(0),
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
    /// How much may be held, and how much all lists hold, roughly.
    most: usize,
    held: AtomicUsize,
}

impl<T: Ord + Send, P: Fn(&Item, &Item) -> Option<T> + Sync> Search<P> {
    fn run(&self, items: Vec<Item>) -> Result<Vec<T>, Rejection> {
        let all = [0, items.len() as u32];
        let mut found = Found::new(&self.held);
        self.node(all, items.clone(), items, &mut found);
        if self.is_too_much() {
            let most = self.most;
            return Err(Rejection::new(
                Step::Rules,
                format!(
                    "more than {most} pairs of shapes are within the spacing: it is likely to be too large for this layer"
                ),
            ));
        }
        found.shrink();
        Ok(found.list)
    }

    fn is_too_much(&self) -> bool {
        self.held.load(Relaxed) > self.most
    }

    /// The pairs of an interval and a point, whose rank is in the range of the node.
    fn node(
        &self,
        [low, high]: [u32; 2],
        intervals: Vec<Item>,
        points: Vec<Item>,
        found: &mut Found<'_, T>,
    ) {
        let alone = !self.joins && only(&intervals).is_some_and(|l| only(&points) == Some(l));
        if intervals.is_empty() || points.is_empty() || alone || self.is_too_much() {
            return;
        }
        if high - low <= FEW {
            return self.scan(&intervals, &points, false, found);
        }
        let middle = low + (high - low) / 2;
        let [mut across, mut below, mut above] = [const { Vec::new() }; 3];
        for interval in intervals {
            if interval.rank < low && high <= interval.end {
                across.push(interval);
                continue;
            }
            if interval.rank + 1 < middle && low < interval.end {
                below.push(interval);
            }
            if middle < interval.end {
                above.push(interval);
            }
        }
        self.scan(&across, &points, self.joins, found);
        drop(across);
        let points = points.into_iter().partition(|point| point.rank < middle);
        self.children([low, middle, high], [below, above], points, found);
    }

    fn children(
        &self,
        [low, middle, high]: [u32; 3],
        [below, above]: [Vec<Item>; 2],
        (left, right): (Vec<Item>, Vec<Item>),
        found: &mut Found<'_, T>,
    ) {
        if high - low < MANY {
            self.node([low, middle], below, left, found);
            self.node([middle, high], above, right, found);
            return;
        }
        let mut later = Found::new(&self.held);
        rayon::join(
            || self.node([low, middle], below, left, found),
            || self.node([middle, high], above, right, &mut later),
        );
        found.take(later);
    }

    /// The pairs of an interval and a point, by a line that moves along x with those under it. Where each two that
    /// meet are joined (`merge`), the one that goes on farthest stands for all those met.
    fn scan(&self, intervals: &[Item], points: &[Item], merge: bool, found: &mut Found<'_, T>) {
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
            if self.is_too_much() {
                return;
            }
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

/// What was found. Now and then it is put in order, so that what is found again and again takes no memory.
struct Found<'a, T> {
    list: Vec<T>,
    /// The length at which it is put in order.
    limit: usize,
    /// What all lists hold, and how much of it is said to be in this one.
    held: &'a AtomicUsize,
    counted: usize,
}

impl<T: Ord + Send> Found<'_, T> {
    fn new(held: &AtomicUsize) -> Found<'_, T> {
        Found {
            list: Vec::new(),
            limit: 1 << 20,
            held,
            counted: 0,
        }
    }

    fn extend(&mut self, more: impl IntoIterator<Item = T>) {
        self.list.extend(more);
        if self.list.len() > self.limit {
            self.shrink();
            self.limit = self.limit.max(2 * self.list.len());
        }
        // Rarely, since it is all threads' business.
        let length = self.list.len();
        if length < self.counted || length > self.counted + 1000 {
            self.held
                .fetch_add(length.wrapping_sub(self.counted), Relaxed);
            self.counted = length;
        }
    }

    fn take(&mut self, other: Found<'_, T>) {
        self.counted += other.counted;
        self.extend(other.list);
    }

    fn shrink(&mut self) {
        self.list.par_sort_unstable();
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
            let found = pairs(&boxes, &labels, reach, |a, b| Some([a, b]));
            assert_eq!(found, Ok(expected));
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
            let all = pairs(&boxes, &labels, 0, |a, b| Some([a, b])).unwrap_or_default();
            let some = touching(&boxes).unwrap_or_default();
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
        let pairs = touching(&pile).unwrap_or_default();
        assert!(
            pairs.len() >= 19_999 && pairs.len() < 20_000 * 80,
            "{}",
            pairs.len()
        );
    }

    #[test]
    fn too_many_pairs_are_refused() {
        let pile = vec![Rect::new(0, 0, 9, 9); 2_000];
        let labels: Vec<u32> = (0..2_000).collect();
        let search = |most| Search {
            pick: |a: &Item, b: &Item| Some([a.id, b.id]),
            joins: false,
            most,
            held: AtomicUsize::new(0),
        };
        let run = |most| search(most).run(items(&pile, Some(&labels), 0));
        assert_eq!(run(2_000_000).map(|found| found.len()), Ok(1_999_000));
        assert!(run(1_900_000).is_err());
        // The same thing found again and again takes no memory.
        let same = Search {
            pick: |_: &Item, _: &Item| Some(0),
            joins: false,
            most: 1_900_000,
            held: AtomicUsize::new(0),
        };
        assert_eq!(same.run(items(&pile, Some(&labels), 0)), Ok(vec![0]));
    }
}
