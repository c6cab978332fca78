//! A packed tree of boxes in flat arrays, and the same tree with items taken out one by one.
//!
//! The items come in a spatial order (along Hilbert's curve); each run of [`FANOUT`] of them becomes a
//! node, each run of nodes a node of the next level. There are no pointers: 16 bytes an item and one or two
//! more for all levels above. A long rail next to tiny contacts costs what any other item costs, unlike
//! in a uniform grid.
//!
//! Source: I. Kamel and C. Faloutsos, "On packing R-trees" (CIKM 1993).

use super::Rect;

/// How many children a node has at most.
pub const FANOUT: usize = 16;

/// Boxes in a spatial order, with the levels above them.
#[derive(Clone, Debug, Default)]
pub struct PackedTree {
    items: Vec<Rect>,
    nodes: Vec<Rect>,
    /// Where the nodes of each level start, the lowest level first; then the number of nodes.
    levels: Vec<usize>,
}

impl PackedTree {
    /// Builds the tree over `items`, which are best in the order of their [`super::hilbert::centre`]s.
    pub fn new(items: Vec<Rect>) -> PackedTree {
        let mut nodes: Vec<Rect> = Vec::with_capacity(items.len() / (FANOUT - 1) + 8);
        nodes.extend(items.chunks(FANOUT).map(around));
        let mut levels = vec![0, nodes.len()];
        let mut start = 0;
        while nodes.len() - start > 1 {
            let end = nodes.len();
            for first in (start..end).step_by(FANOUT) {
                nodes.push(around(&nodes[first..end.min(first + FANOUT)]));
            }
            start = end;
            levels.push(nodes.len());
        }
        PackedTree {
            items,
            nodes,
            levels,
        }
    }

    /// The items, in the order given.
    pub fn items(&self) -> &[Rect] {
        &self.items
    }

    /// The box around all items, if there are any.
    pub fn bounds(&self) -> Option<Rect> {
        self.nodes.last().copied()
    }

    /// For each node the values of its items put together: `of` gives an item's, `join` puts two
    /// together. The result is indexed like the nodes of [`PackedTree::query`].
    pub fn gather<T: Copy>(&self, of: impl Fn(u32) -> T, join: impl Fn(T, T) -> T) -> Vec<T> {
        let mut values: Vec<T> = Vec::with_capacity(self.nodes.len());
        for first in (0..self.items.len()).step_by(FANOUT) {
            let end = self.items.len().min(first + FANOUT);
            let rest = (first + 1..end).map(|item| of(item as u32));
            values.push(rest.fold(of(first as u32), &join));
        }
        for level in self
            .levels
            .windows(2)
            .take(self.levels.len().saturating_sub(2))
        {
            for first in (level[0]..level[1]).step_by(FANOUT) {
                let end = level[1].min(first + FANOUT);
                let rest = values[first + 1..end].iter().copied();
                values.push(rest.fold(values[first], &join));
            }
        }
        values
    }

    /// Shows `visitor` each item whose box shares a point with `area`, in order, leaving out the nodes
    /// that it does not enter.
    pub fn query(&self, area: &Rect, visitor: &mut impl Visitor) {
        if let Some(root) = self.nodes.len().checked_sub(1) {
            self.descend(self.levels.len() - 2, root, area, visitor);
        }
    }

    fn descend(&self, level: usize, node: usize, area: &Rect, visitor: &mut impl Visitor) {
        if !self.nodes[node].touches(area) || !visitor.enter(node) {
            return;
        }
        let first = (node - self.levels[level]) * FANOUT;
        if level == 0 {
            let end = self.items.len().min(first + FANOUT);
            for item in first..end {
                if self.items[item].touches(area) {
                    visitor.visit(item as u32);
                }
            }
            return;
        }
        let start = self.levels[level - 1] + first;
        for child in start..self.levels[level].min(start + FANOUT) {
            self.descend(level - 1, child, area, visitor);
        }
    }
}

/// What a query calls.
pub trait Visitor {
    /// Whether to look into a node whose box shares a point with the area asked for.
    fn enter(&mut self, node: usize) -> bool;
    /// An item whose box shares a point with the area asked for.
    fn visit(&mut self, item: u32);
}

fn around(boxes: &[Rect]) -> Rect {
    let rest = boxes.iter().skip(1);
    rest.fold(boxes.first().copied().unwrap_or_default(), |all, one| {
        all.union(one)
    })
}

/// The items of a tree that have not been taken out yet: a bit an item and a bit a node.
#[derive(Clone, Debug)]
pub struct Remaining<'a> {
    tree: &'a PackedTree,
    /// For each node which of its children hold something.
    children: Vec<u16>,
}

impl<'a> Remaining<'a> {
    /// All items of `tree`.
    pub fn new(tree: &'a PackedTree) -> Remaining<'a> {
        let mut children = Vec::with_capacity(tree.nodes.len());
        let mut below = tree.items.len();
        for level in tree.levels.windows(2) {
            for node in 0..level[1] - level[0] {
                let count = FANOUT.min(below - node * FANOUT);
                children.push(u16::MAX >> (FANOUT - count));
            }
            below = level[1] - level[0];
        }
        Remaining { tree, children }
    }

    /// Whether `item` is still there.
    pub fn contains(&self, item: u32) -> bool {
        let (node, child) = (item as usize / FANOUT, item as usize % FANOUT);
        self.children[node] >> child & 1 == 1
    }

    /// Takes `item` out.
    pub fn remove(&mut self, item: u32) {
        let mut place = item as usize;
        for &start in &self.tree.levels[..self.tree.levels.len() - 1] {
            let node = start + place / FANOUT;
            self.children[node] &= !(1 << (place % FANOUT));
            if self.children[node] != 0 {
                return;
            }
            place /= FANOUT;
        }
    }

    /// Puts the items still there whose boxes share a point with `area` into `found`, in order.
    pub fn find(&self, area: &Rect, found: &mut Vec<u32>) {
        self.tree.query(
            area,
            &mut Finder {
                remaining: self,
                found,
            },
        );
    }
}

struct Finder<'a> {
    remaining: &'a Remaining<'a>,
    found: &'a mut Vec<u32>,
}

impl Visitor for Finder<'_> {
    fn enter(&mut self, node: usize) -> bool {
        self.remaining.children[node] != 0
    }

    fn visit(&mut self, item: u32) {
        if self.remaining.contains(item) {
            self.found.push(item);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::hilbert;
    use rand::{Rng, SeedableRng};

    struct All(Vec<u32>);

    impl Visitor for All {
        fn enter(&mut self, _: usize) -> bool {
            true
        }
        fn visit(&mut self, item: u32) {
            self.0.push(item);
        }
    }

    #[test]
    fn queries_find_what_a_scan_finds_while_items_go() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(6);
        for count in [0usize, 1, 15, 16, 17, 255, 256, 257, 300, 4096, 4100] {
            let mut boxes: Vec<Rect> = (0..count)
                .map(|_| {
                    let (x, y) = (rng.random_range(-500..500), rng.random_range(-500..500));
                    let rail = rng.random_bool(0.02);
                    let width = if rail { 900 } else { 9 };
                    Rect::new(
                        x,
                        y,
                        x + rng.random_range(0..=width),
                        y + rng.random_range(0..9),
                    )
                })
                .collect();
            boxes.sort_by_key(hilbert::centre);
            let tree = PackedTree::new(boxes.clone());
            let mut remaining = Remaining::new(&tree);
            let mut there = vec![true; count];
            for _ in 0..200 {
                let (x, y) = (rng.random_range(-500..500), rng.random_range(-500..500));
                let area = Rect::new(x, y, x + rng.random_range(0..200), y + 50);
                let hits = (0..count as u32).filter(|&i| boxes[i as usize].touches(&area));
                let (all, left): (Vec<u32>, Vec<u32>) = (
                    hits.clone().collect(),
                    hits.filter(|&i| there[i as usize]).collect(),
                );
                let mut seen = All(Vec::new());
                tree.query(&area, &mut seen);
                assert_eq!(seen.0, all);
                let mut found = Vec::new();
                remaining.find(&area, &mut found);
                assert_eq!(found, left);
                for item in left.into_iter().take(20) {
                    remaining.remove(item);
                    there[item as usize] = false;
                    assert!(!remaining.contains(item));
                }
            }
        }
    }

    #[test]
    fn gathered_values_cover_the_items_of_each_node() {
        let boxes: Vec<Rect> = (0..1000).map(|i| Rect::new(i, 0, i + 1, 1)).collect();
        let tree = PackedTree::new(boxes);
        let largest = tree.gather(|item| item, u32::max);
        assert_eq!(largest.len(), 63 + 4 + 1);
        assert_eq!(largest[0], 15);
        assert_eq!(largest[62], 999);
        assert_eq!(largest[63], 255);
        assert_eq!(largest[67], 999);
    }
}
