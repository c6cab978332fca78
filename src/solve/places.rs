//! Places of a piece: features, what joins them, and compact groups of them.
//!
//! Cores are local: the search looks for them in tiles first (disjoint groups of features that hang
//! together) and around a core (the features it touches and a few steps more), and only last in the
//! whole piece. Everything here is linear in the piece.

use petgraph::unionfind::UnionFind;

use encodings::{Instance, Mask};

/// The instance of a piece with its features as a graph.
pub struct Places<'a> {
    /// The piece.
    pub instance: &'a Instance,
    start: Vec<u32>,
    /// Neighbour feature and conflict pair.
    neighbours: Vec<(u32, u32)>,
    /// For each feature where its self-spacings begin, and their numbers.
    self_spacing: Grouped,
    /// For each feature where its stitch edges begin, and their numbers.
    stitch: Grouped,
}

/// Numbers grouped by feature.
struct Grouped {
    start: Vec<u32>,
    items: Vec<u32>,
}

impl Grouped {
    fn new(features: usize, of: impl Iterator<Item = u32> + Clone) -> Grouped {
        let mut start = vec![0u32; features + 1];
        for feature in of.clone() {
            start[feature as usize + 1] += 1;
        }
        for i in 1..start.len() {
            start[i] += start[i - 1];
        }
        let mut next = start.clone();
        let mut items = vec![0; start[features] as usize];
        for (item, feature) in of.enumerate() {
            items[next[feature as usize] as usize] = item as u32;
            next[feature as usize] += 1;
        }
        Grouped { start, items }
    }

    fn of(&self, feature: u32) -> &[u32] {
        let ends = [
            self.start[feature as usize],
            self.start[feature as usize + 1],
        ];
        &self.items[ends[0] as usize..ends[1] as usize]
    }
}

impl<'a> Places<'a> {
    /// The features of a piece and what joins them.
    pub fn new(instance: &'a Instance) -> Places<'a> {
        let features = instance.feature_count();
        let mut ends: Vec<(u32, u32, u32)> = Vec::with_capacity(instance.pair_count() * 2);
        for (pair, edges) in instance.pairs().enumerate() {
            let [a, b] = edges[0].map(|fragment| instance.feature_of(fragment));
            ends.extend([(a, b, pair as u32), (b, a, pair as u32)]);
        }
        ends.sort_unstable();
        let mut start = vec![0u32; features + 1];
        for &(a, ..) in &ends {
            start[a as usize + 1] += 1;
        }
        for i in 1..start.len() {
            start[i] += start[i - 1];
        }
        let of = |fragment: u32| instance.feature_of(fragment);
        Places {
            instance,
            start,
            neighbours: ends.into_iter().map(|(_, b, pair)| (b, pair)).collect(),
            self_spacing: Grouped::new(
                features,
                instance.self_spacings().iter().map(|&[a, _]| of(a)),
            ),
            stitch: Grouped::new(features, instance.stitches().iter().map(|s| of(s.a))),
        }
    }

    /// The neighbours of a feature, each with the conflict pair that joins the two.
    pub fn neighbours(&self, feature: u32) -> &[(u32, u32)] {
        let ends = [
            self.start[feature as usize],
            self.start[feature as usize + 1],
        ];
        &self.neighbours[ends[0] as usize..ends[1] as usize]
    }

    /// The self-spacings of a feature.
    pub fn self_spacings(&self, feature: u32) -> &[u32] {
        self.self_spacing.of(feature)
    }

    /// The stitch edges of a feature.
    pub fn stitches(&self, feature: u32) -> &[u32] {
        self.stitch.of(feature)
    }

    /// The units of conflict at a feature: its pairs, and its self-spacings, which are numbered on.
    pub fn units_of_conflict(&self, feature: u32) -> impl Iterator<Item = u32> + '_ {
        let pairs = self.instance.pair_count() as u32;
        let own = self.neighbours(feature).iter().map(|&(_, pair)| pair);
        own.chain(self.self_spacings(feature).iter().map(move |&i| pairs + i))
    }

    /// Whether a colouring leaves a unit of conflict unresolved.
    pub fn is_unresolved(&self, unit: u32, colours: &[Mask]) -> bool {
        let same = |a: u32, b: u32| colours[a as usize] == colours[b as usize];
        match (unit as usize).checked_sub(self.instance.pair_count()) {
            None => self.instance.pair(unit).iter().any(|&[a, b]| same(a, b)),
            Some(i) => {
                let [a, b] = self.instance.self_spacings()[i];
                same(a, b) && !self.is_joined([a, b], colours)
            }
        }
    }

    /// How many units of conflict at a feature a colouring leaves unresolved.
    pub fn unresolved_at(&self, feature: u32, colours: &[Mask]) -> usize {
        let open = |&&(_, pair): &&(u32, u32)| self.is_unresolved(pair, colours);
        let pairs = self.neighbours(feature).iter().filter(open).count();
        if self.self_spacings(feature).is_empty() {
            return pairs;
        }
        let parts = self.same_mask_parts(feature, colours);
        let first = self.instance.fragments_of(feature).start;
        let violated = |&&i: &&u32| {
            let [a, b] = self.instance.self_spacings()[i as usize];
            colours[a as usize] == colours[b as usize]
                && !parts.equiv((a - first) as usize, (b - first) as usize)
        };
        pairs + self.self_spacings(feature).iter().filter(violated).count()
    }

    /// Which fragments of a feature, numbered from its first one, are joined without a mask change.
    fn same_mask_parts(&self, feature: u32, colours: &[Mask]) -> UnionFind<usize> {
        let fragments = self.instance.fragments_of(feature);
        let mut parts = UnionFind::new(fragments.len());
        for &i in self.stitches(feature) {
            let stitch = self.instance.stitches()[i as usize];
            if colours[stitch.a as usize] == colours[stitch.b as usize] {
                let ends = [stitch.a, stitch.b].map(|f| (f - fragments.start) as usize);
                parts.union(ends[0], ends[1]);
            }
        }
        parts
    }

    /// Whether two fragments of a feature are joined through stitch edges without a mask change.
    fn is_joined(&self, [a, b]: [u32; 2], colours: &[Mask]) -> bool {
        let feature = self.instance.feature_of(a);
        let first = self.instance.fragments_of(feature).start;
        self.same_mask_parts(feature, colours)
            .equiv((a - first) as usize, (b - first) as usize)
    }

    /// The features that a unit of conflict joins (a self-spacing: one, twice).
    pub fn features_of_unit(&self, unit: u32) -> [u32; 2] {
        let pairs = self.instance.pair_count();
        let ends = match (unit as usize).checked_sub(pairs) {
            None => self.instance.pair(unit)[0],
            Some(i) => self.instance.self_spacings()[i],
        };
        ends.map(|fragment| self.instance.feature_of(fragment))
    }

    /// Disjoint groups of about `size` fragments each that cover all features, grown breadth first.
    /// `turn` shifts where the groups begin, so that their borders differ from size to size.
    pub fn tiles(&self, size: usize, turn: u32) -> Vec<Vec<u32>> {
        let features = self.instance.feature_count() as u32;
        let shift = (size as u32 / 2).wrapping_mul(turn) % features.max(1);
        let mut taken = vec![false; features as usize];
        let mut tiles = Vec::new();
        for seed in (shift..features).chain(0..shift) {
            if taken[seed as usize] {
                continue;
            }
            taken[seed as usize] = true;
            let mut tile = vec![seed];
            let mut fragments = self.instance.fragments_of(seed).len();
            let mut next = 0;
            while let Some(&feature) = tile.get(next) {
                next += 1;
                for &(other, _) in self.neighbours(feature) {
                    if fragments >= size {
                        break;
                    }
                    if !taken[other as usize] {
                        taken[other as usize] = true;
                        fragments += self.instance.fragments_of(other).len();
                        tile.push(other);
                    }
                }
            }
            tile.sort_unstable();
            tiles.push(tile);
        }
        tiles
    }

    /// Up to K fragments among those of `features` that conflict with one another as much as a greedy
    /// choice finds, from the feature with the most neighbours on.
    pub fn dense(&self, features: &[u32]) -> Vec<u32> {
        let degree = |&feature: &u32| {
            let inside = |&&(other, _): &&(u32, u32)| features.binary_search(&other).is_ok();
            self.neighbours(feature).iter().filter(inside).count()
        };
        let seed = features
            .iter()
            .copied()
            .max_by_key(|f| (degree(f), std::cmp::Reverse(*f)));
        let mut chosen: Vec<u32> = seed.into_iter().collect();
        let mut common: Vec<u32> = chosen
            .iter()
            .flat_map(|&f| self.inside(f, features))
            .collect();
        while chosen.len() < self.instance.masks() as usize && !common.is_empty() {
            let within = |&f: &u32| {
                self.inside(f, features)
                    .filter(|other| common.binary_search(other).is_ok())
                    .count()
            };
            let Some(next) = common
                .iter()
                .copied()
                .max_by_key(|f| (within(f), std::cmp::Reverse(*f)))
            else {
                break;
            };
            common = self
                .inside(next, features)
                .filter(|other| common.binary_search(other).is_ok())
                .collect();
            chosen.push(next);
        }
        chosen
            .iter()
            .map(|&feature| self.instance.fragments_of(feature).start)
            .collect()
    }

    /// The neighbours of a feature among `features`, ascending.
    fn inside<'s>(&'s self, feature: u32, features: &'s [u32]) -> impl Iterator<Item = u32> + 's {
        let neighbours = self.neighbours(feature).iter().map(|&(other, _)| other);
        neighbours.filter(|other| features.binary_search(other).is_ok())
    }

    /// The features within `steps` steps of some of them, ascending.
    pub fn around(&self, features: &[u32], steps: usize) -> Vec<u32> {
        let mut found = features.to_vec();
        found.sort_unstable();
        found.dedup();
        let mut edge = found.clone();
        for _ in 0..steps {
            let mut next: Vec<u32> = edge
                .iter()
                .flat_map(|&feature| self.neighbours(feature).iter().map(|&(other, _)| other))
                .filter(|other| found.binary_search(other).is_err())
                .collect();
            next.sort_unstable();
            next.dedup();
            found.extend(&next);
            found.sort_unstable();
            edge = next;
        }
        found
    }
}
