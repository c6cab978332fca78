//! Over how long a stretch of an edge a feature is at least as deep as a row of the table wants it wide.
//!
//! Behind an edge the depth is constant on stretches. For each row the lengths of the deep ones are summed
//! up from the first edge on, so that the deep length between any two places of an edge is the difference of
//! two sums, each found by a binary search: however many stretches a long rail has, a neighbour costs a logarithm.

use super::edges::Edges;
use crate::layout::WideSpacing;

/// The depths behind the edges of all features along one axis: 16 bytes a stretch, and 8 for each row of the table.
#[derive(Default)]
pub(in crate::extract) struct Deep {
    /// Where the stretches of each edge start.
    first: Vec<usize>,
    from: Vec<i32>,
    depth: Vec<i64>,
    /// For each row, the deep length of all stretches before each one.
    before: Vec<Vec<i64>>,
}

impl Deep {
    /// Adds the edges of a feature, in their order.
    pub(super) fn push(&mut self, edges: &Edges) {
        let base = self.from.len();
        let first = edges.first_depth.iter();
        self.first.extend(first.map(|&first| base + first as usize));
        self.from.extend(edges.depths.iter().map(|d| d.from));
        self.depth.extend(edges.depths.iter().map(|d| d.depth));
    }

    /// Sums up, with all edges added; `end` is where an edge ends.
    pub(super) fn sum_up(&mut self, rows: &[WideSpacing], end: impl Fn(usize) -> i32) {
        self.first.push(self.from.len());
        for row in rows {
            let mut before = Vec::with_capacity(self.from.len());
            let mut sum = 0;
            for edge in 0..self.first.len() - 1 {
                for stretch in self.first[edge]..self.first[edge + 1] {
                    before.push(sum);
                    if self.depth[stretch] >= row.width.into() {
                        let from = i64::from(self.from[stretch]);
                        sum += i64::from(self.end_of(edge, stretch, &end)) - from;
                    }
                }
            }
            self.before.push(before);
        }
    }

    fn end_of(&self, edge: usize, stretch: usize, end: impl Fn(usize) -> i32) -> i32 {
        match stretch + 1 < self.first[edge + 1] {
            true => self.from[stretch + 1],
            false => end(edge),
        }
    }

    /// The length between two places of an edge, in order, over which it is deep enough for a row.
    pub(super) fn length(&self, edge: u32, row: usize, depth: i32, [u, v]: [i32; 2]) -> i64 {
        let up_to = |place: i32| {
            let stretch = self.stretch(edge, place);
            let within = match self.depth[stretch] >= depth.into() {
                true => i64::from(place) - i64::from(self.from[stretch]),
                false => 0,
            };
            self.before[row][stretch] + within
        };
        up_to(v) - up_to(u)
    }

    /// The longest stretches between two places of an edge, in order, over which it is at least `depth` deep.
    pub(super) fn stretches(&self, edge: u32, depth: i32, [u, v]: [i32; 2]) -> Vec<[i32; 2]> {
        let mut found: Vec<[i32; 2]> = Vec::new();
        for stretch in self.stretch(edge, u)..self.first[edge as usize + 1] {
            let from = self.from[stretch].max(u);
            if from >= v {
                break;
            }
            let to = self.end_of(edge as usize, stretch, |_| v).min(v);
            if self.depth[stretch] < depth.into() || from >= to {
                continue;
            }
            match found.last_mut() {
                Some(last) if last[1] == from => last[1] = to,
                _ => found.push([from, to]),
            }
        }
        found
    }

    /// The stretch of an edge that a place is on; the later one where two meet.
    fn stretch(&self, edge: u32, place: i32) -> usize {
        let [first, end] = [edge as usize, edge as usize + 1].map(|edge| self.first[edge]);
        let after = self.from[first..end].partition_point(|&from| from <= place);
        first + after.saturating_sub(1)
    }
}
