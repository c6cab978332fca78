//! How often each stretch of a line is covered: range additions and searches for zero.
//!
//! A tree over the stretches between sorted marks holds the least and the largest count below each node,
//! additions to whole subtrees stay at their roots. Adding to a range and finding the next stretch of count
//! zero (or not zero) each take O(log n) steps while counts are not negative; where signs mix, a search may look
//! into a subtree in vain.
//!
//! Source: J. L. Bentley's segment tree (1977), with additions kept where they are made.

/// Counts of the stretches between marks.
#[derive(Clone, Debug)]
pub struct Cover {
    /// For each node, the least and largest count below it, without what its ancestors add.
    range: Vec<[i32; 2]>,
    /// For each node, what is added to all below.
    added: Vec<i32>,
    leaves: usize,
}

impl Cover {
    /// `stretches` stretches of count zero, numbered from 0.
    pub fn new(stretches: usize) -> Cover {
        let leaves = stretches.max(1).next_power_of_two();
        Cover {
            range: vec![[0, 0]; 2 * leaves],
            added: vec![0; 2 * leaves],
            leaves,
        }
    }

    /// Adds `by` to the counts of the stretches from `start` to before `end`.
    pub fn add(&mut self, start: usize, end: usize, by: i32) {
        self.add_below(1, 0, self.leaves, [start, end], by);
    }

    fn add_below(&mut self, node: usize, low: usize, high: usize, to: [usize; 2], by: i32) {
        if to[1] <= low || high <= to[0] {
            return;
        }
        if to[0] <= low && high <= to[1] {
            self.added[node] += by;
            self.range[node] = self.range[node].map(|count| count + by);
            return;
        }
        let middle = (low + high) / 2;
        self.add_below(2 * node, low, middle, to, by);
        self.add_below(2 * node + 1, middle, high, to, by);
        let [a, b] = [self.range[2 * node], self.range[2 * node + 1]];
        let added = self.added[node];
        self.range[node] = [a[0].min(b[0]) + added, a[1].max(b[1]) + added];
    }

    /// The first stretch from `start` on whose count is zero, or is not, as `zero` asks.
    pub fn next(&self, start: usize, zero: bool) -> Option<usize> {
        self.next_below(1, [0, self.leaves], start, zero, 0)
    }

    fn next_below(
        &self,
        node: usize,
        [low, high]: [usize; 2],
        start: usize,
        zero: bool,
        above: i32,
    ) -> Option<usize> {
        let [least, largest] = self.range[node].map(|count| count + above);
        let may_be = if zero {
            least <= 0 && 0 <= largest
        } else {
            least != 0 || largest != 0
        };
        if high <= start || !may_be {
            return None;
        }
        if high - low == 1 {
            return Some(low);
        }
        let middle = (low + high) / 2;
        let above = above + self.added[node];
        self.next_below(2 * node, [low, middle], start, zero, above)
            .or_else(|| self.next_below(2 * node + 1, [middle, high], start, zero, above))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    #[test]
    fn agrees_with_plain_counts() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(7);
        for size in [1usize, 2, 3, 7, 8, 33] {
            let mut cover = Cover::new(size);
            let mut plain = vec![0; size];
            for _ in 0..400 {
                let start = rng.random_range(0..size);
                let end = rng.random_range(start..=size);
                let by = rng.random_range(-1..=1);
                cover.add(start, end, by);
                plain[start..end].iter_mut().for_each(|count| *count += by);
                let from = rng.random_range(0..size);
                for zero in [false, true] {
                    let expected = (from..size).find(|&i| (plain[i] == 0) == zero);
                    let found = cover.next(from, zero).filter(|&i| i < size);
                    assert_eq!(found, expected, "{plain:?} {from} {zero}");
                }
            }
        }
    }
}
