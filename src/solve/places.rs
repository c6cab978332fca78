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
    /// For each feature the unit of its self-spacings among its kind; [`NONE`] where it has none.
    self_unit: Vec<u32>,
    /// For each feature where its ties begin, and their numbers.
    tie: Grouped,
    /// For each feature where its stitch edges begin, and their numbers.
    stitch: Grouped,
}

const NONE: u32 = u32::MAX;

/// Numbers grouped by feature.
struct Grouped {
    start: Vec<u32>,
    items: Vec<u32>,
}

impl Grouped {
    /// From features with their items; the items of a feature stay in order.
    fn new(features: usize, of: impl Iterator<Item = (u32, u32)> + Clone) -> Grouped {
        let mut start = vec![0u32; features + 1];
        for (feature, _) in of.clone() {
            start[feature as usize + 1] += 1;
        }
        for i in 1..start.len() {
            start[i] += start[i - 1];
        }
        let mut next = start.clone();
        let mut items = vec![0; start[features] as usize];
        for (feature, item) in of {
            items[next[feature as usize] as usize] = item;
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
        let mut self_unit = vec![NONE; features];
        for (i, edges) in (0u32..).zip(instance.self_units()) {
            self_unit[of(edges[0][0]) as usize] = i;
        }
        let mut tied: Vec<(u32, u32)> = (0u32..)
            .zip(instance.ties())
            .flat_map(|(i, tie)| tie.fragments().into_iter().map(move |f| (of(f), i)))
            .collect();
        tied.sort_unstable();
        tied.dedup();
        let stitches = (0u32..).zip(instance.stitches());
        Places {
            instance,
            start,
            neighbours: ends.into_iter().map(|(_, b, pair)| (b, pair)).collect(),
            self_unit,
            tie: Grouped::new(features, tied.into_iter()),
            stitch: Grouped::new(features, stitches.map(|(i, s)| (of(s.a), i))),
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
    pub fn self_spacings(&self, feature: u32) -> &[[u32; 2]] {
        match self.self_unit[feature as usize] {
            NONE => &[],
            unit => self.instance.self_unit(unit),
        }
    }

    /// The unit of conflict that the self-spacings of a feature are, if it has any.
    pub fn self_unit(&self, feature: u32) -> Option<u32> {
        let unit = self.self_unit[feature as usize];
        (unit != NONE).then(|| self.instance.pair_count() as u32 + unit)
    }

    /// The ties that speak of a feature, ascending.
    pub fn ties(&self, feature: u32) -> &[u32] {
        self.tie.of(feature)
    }

    /// Whether a colouring keeps the ties of a feature.
    pub fn keeps_ties(&self, feature: u32, colours: &[Mask]) -> bool {
        let ties = self.instance.ties();
        let broken = |&tie: &u32| !ties[tie as usize].holds(colours);
        !self.ties(feature).iter().any(broken)
    }

    /// The stitch edges of a feature.
    pub fn stitches(&self, feature: u32) -> &[u32] {
        self.stitch.of(feature)
    }

    /// The units of conflict at a feature: its pairs, and its self-spacings.
    pub fn units_of_conflict(&self, feature: u32) -> impl Iterator<Item = u32> + '_ {
        let own = self.neighbours(feature).iter().map(|&(_, pair)| pair);
        own.chain(self.self_unit(feature))
    }

    /// Whether a colouring leaves a unit of conflict unresolved.
    pub fn is_unresolved(&self, unit: u32, colours: &[Mask]) -> bool {
        let same = |a: u32, b: u32| colours[a as usize] == colours[b as usize];
        match (unit as usize).checked_sub(self.instance.pair_count()) {
            None => self.instance.pair(unit).iter().any(|&[a, b]| same(a, b)),
            Some(i) => {
                let feature = self
                    .instance
                    .feature_of(self.instance.self_unit(i as u32)[0][0]);
                self.violates_self_spacing(feature, colours)
            }
        }
    }

    /// How many units of conflict at a feature a colouring leaves unresolved.
    pub fn unresolved_at(&self, feature: u32, colours: &[Mask]) -> usize {
        let open = |&&(_, pair): &&(u32, u32)| self.is_unresolved(pair, colours);
        let pairs = self.neighbours(feature).iter().filter(open).count();
        pairs + usize::from(self.violates_self_spacing(feature, colours))
    }

    /// Whether a colouring violates a self-spacing of a feature.
    fn violates_self_spacing(&self, feature: u32, colours: &[Mask]) -> bool {
        let edges = self.self_spacings(feature);
        if edges.is_empty() {
            return false;
        }
        let parts = self.same_mask_parts(feature, colours);
        let first = self.instance.fragments_of(feature).start;
        edges.iter().any(|&[a, b]| {
            colours[a as usize] == colours[b as usize]
                && !parts.equiv((a - first) as usize, (b - first) as usize)
        })
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

    /// The features that a unit of conflict joins (self-spacings: one, twice).
    pub fn features_of_unit(&self, unit: u32) -> [u32; 2] {
        let ends = self.instance.unit(unit)[0];
        ends.map(|fragment| self.instance.feature_of(fragment))
    }

    /// The features in one tie with some of `features`.
    pub fn tied_to<'s>(&'s self, features: &'s [u32]) -> impl Iterator<Item = u32> + 's {
        let ties = features.iter().flat_map(|&feature| self.ties(feature));
        let fragments = ties.flat_map(|&tie| self.instance.ties()[tie as usize].fragments());
        fragments.map(|fragment| self.instance.feature_of(fragment))
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
