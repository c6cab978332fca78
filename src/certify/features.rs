//! Features as graphs of stitch edges: what a self-spacing needs to know; and their ties.

use std::collections::VecDeque;

use encodings::Instance;

/// The stitch edges of an instance, by fragment.
pub struct Features<'a> {
    /// The instance.
    pub instance: &'a Instance,
    start: Vec<u32>,
    /// For each fragment its neighbours over stitch edges, ascending.
    neighbours: Vec<u32>,
    /// The weight of each of these edges.
    weights: Vec<u32>,
    /// Features with the ties that speak of them, sorted: feature, tie.
    ties: Vec<(u32, u32)>,
    tie: Vec<u32>,
}

impl<'a> Features<'a> {
    /// Sorts the stitch edges of an instance.
    pub fn new(instance: &'a Instance) -> Features<'a> {
        let mut start = vec![0u32; instance.fragment_count() + 1];
        for stitch in instance.stitches() {
            start[stitch.a as usize + 1] += 1;
            start[stitch.b as usize + 1] += 1;
        }
        for i in 1..start.len() {
            start[i] += start[i - 1];
        }
        let mut next = start.clone();
        let mut edges = vec![(0, 0); instance.stitches().len() * 2];
        for stitch in instance.stitches() {
            for (from, to) in [(stitch.a, stitch.b), (stitch.b, stitch.a)] {
                edges[next[from as usize] as usize] = (to, stitch.weight);
                next[from as usize] += 1;
            }
        }
        for ends in start.windows(2) {
            edges[ends[0] as usize..ends[1] as usize].sort_unstable();
        }
        let (neighbours, weights) = edges.into_iter().unzip();
        let mut ties: Vec<(u32, u32)> = (0u32..)
            .zip(instance.ties())
            .flat_map(|(i, tie)| tie.fragments().into_iter().map(move |f| (f, i)))
            .map(|(fragment, i)| (instance.feature_of(fragment), i))
            .collect();
        ties.sort_unstable();
        ties.dedup();
        Features {
            instance,
            start,
            neighbours,
            weights,
            tie: ties.iter().map(|&(_, tie)| tie).collect(),
            ties,
        }
    }

    /// The ties that speak of a feature, ascending.
    pub fn ties(&self, feature: u32) -> &[u32] {
        let place = |feature: u32| self.ties.partition_point(|&(of, _)| of < feature);
        &self.tie[place(feature)..place(feature + 1)]
    }

    /// The neighbours of a fragment over stitch edges, ascending.
    pub fn neighbours(&self, fragment: u32) -> &[u32] {
        let at = fragment as usize;
        &self.neighbours[self.start[at] as usize..self.start[at + 1] as usize]
    }

    /// The weight of the stitch edge between two fragments; 0 where there is none.
    pub fn weight(&self, [a, b]: [u32; 2]) -> u64 {
        let at = self.neighbours(a).binary_search(&b);
        at.map_or(0, |at| {
            u64::from(self.weights[self.start[a as usize] as usize + at])
        })
    }

    /// Whether the stitch edges of a feature, which connect it, form a tree.
    pub fn is_tree(&self, feature: u32) -> bool {
        let fragments = self.instance.fragments_of(feature);
        let ends = self.start[fragments.end as usize] - self.start[fragments.start as usize];
        ends as usize == 2 * (fragments.len() - 1)
    }

    /// How many stitch edges each fragment of a feature is from `a`, by its place in the feature.
    pub fn distances(&self, a: u32) -> Vec<u32> {
        self.search(a).into_iter().map(|(steps, _)| steps).collect()
    }

    /// The inner fragments of a shortest way over stitch edges, from `a` to `b`.
    pub fn path(&self, [a, b]: [u32; 2]) -> Vec<u32> {
        let first = self
            .instance
            .fragments_of(self.instance.feature_of(a))
            .start;
        let before = self.search(b);
        let mut inner = Vec::new();
        let mut at = before[(a - first) as usize].1;
        while at != b {
            inner.push(at);
            at = before[(at - first) as usize].1;
        }
        inner
    }

    /// For each fragment of the feature its distance from `from`, and the next fragment on the way there.
    fn search(&self, from: u32) -> Vec<(u32, u32)> {
        let fragments = self.instance.fragments_of(self.instance.feature_of(from));
        let first = fragments.start;
        let mut found = vec![(u32::MAX, from); fragments.len()];
        found[(from - first) as usize].0 = 0;
        let mut open = VecDeque::from([from]);
        while let Some(at) = open.pop_front() {
            let steps = found[(at - first) as usize].0;
            for &next in self.neighbours(at) {
                let place = &mut found[(next - first) as usize];
                if place.0 == u32::MAX {
                    *place = (steps + 1, at);
                    open.push_back(next);
                }
            }
        }
        found
    }
}
