//! Building an instance: collecting its parts, checking every invariant ([`crate::instance`]), and saying
//! which one is broken, where.

use thiserror::Error;

use crate::instance::{Instance, Stitch};
use crate::masks::{MAX_MASKS, MaskSet};
use crate::ties::Tie;

/// What makes a list of fragments, pairs and edges no instance. Fragments, pairs and so on are
/// numbered from 0 in the order in which they were given.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
pub enum InstanceError {
    /// K is out of range.
    #[error("{0} masks: the number of masks must be 1 to {MAX_MASKS}")]
    MaskCount(u8),
    /// A feature has no fragment.
    #[error("feature {0} has no fragments: every feature needs at least one")]
    EmptyFeature(u32),
    /// More fragments, edges or stitches than 32-bit numbers can name.
    #[error("too many {0}: at most 4294967294 are possible")]
    TooMany(&'static str),
    /// A fragment may take no mask, or names a mask beyond K.
    #[error(
        "fragment {fragment} may take masks {masks:#010b}: a non-empty set of the K masks is needed"
    )]
    Allowed {
        /// The fragment.
        fragment: u32,
        /// Its masks, bit i for mask i.
        masks: u8,
    },
    /// An edge names a fragment that does not exist.
    #[error("{place} names fragment {fragment}, but there are only {count} (numbered from 0)")]
    NoSuchFragment {
        /// Where: a pair, stitch or self-spacing.
        place: Place,
        /// The number named.
        fragment: u32,
        /// How many fragments there are.
        count: u32,
    },
    /// The edge joins the wrong features.
    #[error("{place} joins fragments {a} and {b}, which must be {expected}")]
    WrongFeatures {
        /// Where: a pair, stitch or self-spacing.
        place: Place,
        /// One end.
        a: u32,
        /// The other end.
        b: u32,
        /// What would be right.
        expected: &'static str,
    },
    /// A pair without edges.
    #[error("conflict pair {0} has no fragment edges: every pair needs at least one")]
    EmptyPair(u32),
    /// The same thing twice.
    #[error("{place} repeats an earlier one ({a}, {b})")]
    Repeated {
        /// Where: a pair, stitch or self-spacing.
        place: Place,
        /// One end (a feature for pairs, else a fragment).
        a: u32,
        /// The other end.
        b: u32,
    },
    /// A pair names one of its fragment edges twice.
    #[error("conflict pair {pair} names the fragment edge ({a}, {b}) twice")]
    RepeatedEdge {
        /// The pair.
        pair: u32,
        /// One end, a fragment.
        a: u32,
        /// The other end.
        b: u32,
    },
    /// A stitch of weight 0.
    #[error("stitch {0} has weight 0: a weight of at least 1 is needed")]
    ZeroWeight(u32),
    /// A tie between stitches that names none, or that nothing can break.
    #[error(
        "tie {0} allows all its stitch edges at once: it must name ascending edges that weigh more than it allows"
    )]
    LooseTie(u32),
    /// A tie that no counter of reasonable size encodes.
    #[error(
        "tie {0} counts too much: its stitch edges, by weight, times what it allows may be at most {MAX_COUNTED}"
    )]
    HugeTie(u32),
    /// A feature whose fragments hang apart.
    #[error("the fragments of feature {0} are not connected by its stitch edges")]
    Disconnected(u32),
}

/// The list entry an [`InstanceError`] speaks of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    /// A conflict pair.
    Pair(u32),
    /// A stitch edge.
    Stitch(u32),
    /// A self-spacing.
    SelfSpacing(u32),
    /// A tie.
    Tie(u32),
}

impl std::fmt::Display for Place {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Place::Pair(i) => write!(f, "conflict pair {i}"),
            Place::Stitch(i) => write!(f, "stitch {i}"),
            Place::SelfSpacing(i) => write!(f, "self-spacing {i}"),
            Place::Tie(i) => write!(f, "tie {i}"),
        }
    }
}

/// Collects the parts of an [`Instance`]; [`InstanceBuilder::build`] checks them.
#[derive(Clone, Debug)]
pub struct InstanceBuilder {
    masks: u8,
    feature_start: Vec<u32>,
    allowed: Vec<MaskSet>,
    areas: Vec<u64>,
    pair_start: Vec<u32>,
    edges: Vec<[u32; 2]>,
    stitches: Vec<Stitch>,
    self_spacings: Vec<[u32; 2]>,
    ties: Vec<Tie>,
}

/// Numbers are 32 bits wide, with the largest one free for "none".
const MAX_COUNT: usize = u32::MAX as usize - 1;

/// The size of the counter of one tie ([`crate::ties`]): what is counted, times how far.
pub const MAX_COUNTED: u64 = 1 << 24;

fn check_count(count: usize, what: &'static str) -> Result<(), InstanceError> {
    if count > MAX_COUNT {
        return Err(InstanceError::TooMany(what));
    }
    Ok(())
}

fn ordered(a: u32, b: u32) -> [u32; 2] {
    [a.min(b), a.max(b)]
}

impl InstanceBuilder {
    /// An instance of K masks and nothing else.
    pub fn new(masks: u8) -> InstanceBuilder {
        InstanceBuilder {
            masks,
            feature_start: vec![0],
            allowed: Vec::new(),
            areas: Vec::new(),
            pair_start: vec![0],
            edges: Vec::new(),
            stitches: Vec::new(),
            self_spacings: Vec::new(),
            ties: Vec::new(),
        }
    }

    /// Adds a feature of `fragments` fragments of area 1 that may take every mask; returns its first
    /// fragment.
    pub fn feature(&mut self, fragments: u32) -> u32 {
        let first = self.allowed.len();
        let end = first + fragments as usize;
        self.allowed
            .resize(end, MaskSet::all(self.masks.min(MAX_MASKS)));
        self.areas.resize(end, 1);
        // A count too large for 32 bits is refused by `build`.
        self.feature_start.push(end.min(u32::MAX as usize) as u32);
        first.min(u32::MAX as usize) as u32
    }

    /// Says which masks a fragment, already added, may take.
    pub fn allow(&mut self, fragment: u32, masks: MaskSet) {
        self.allowed[fragment as usize] = masks;
    }

    /// Says the area of a fragment, already added, in square database units.
    pub fn area(&mut self, fragment: u32, area: u64) {
        self.areas[fragment as usize] = area;
    }

    /// How many fragments have been added.
    pub fn fragment_count(&self) -> usize {
        self.allowed.len()
    }

    /// Adds a conflict pair by its fragment edges.
    pub fn pair(&mut self, edges: impl IntoIterator<Item = [u32; 2]>) {
        let start = self.edges.len();
        self.edges
            .extend(edges.into_iter().map(|[a, b]| ordered(a, b)));
        self.edges[start..].sort_unstable();
        self.pair_start
            .push(self.edges.len().min(u32::MAX as usize) as u32);
    }

    /// Adds a stitch edge.
    pub fn stitch(&mut self, a: u32, b: u32, weight: u32) {
        let [a, b] = ordered(a, b);
        self.stitches.push(Stitch { a, b, weight });
    }

    /// Adds a self-spacing.
    pub fn self_spacing(&mut self, a: u32, b: u32) {
        self.self_spacings.push(ordered(a, b));
    }

    /// Adds a tie; the order of its fragments does not matter.
    pub fn tie(&mut self, tie: Tie) {
        // Every number is there.
        self.ties.extend(tie.renumbered(Some));
    }

    /// Checks every invariant and returns the instance.
    ///
    /// # Errors
    /// The first invariant broken, with its place. O(n log n) in the size of the lists.
    pub fn build(mut self) -> Result<Instance, InstanceError> {
        self.check_sizes()?;
        let feature_of = self.number_features()?;
        self.check_allowed()?;
        self.check_pairs(&feature_of)?;
        self.check_stitches(&feature_of)?;
        self.check_self_spacings(&feature_of)?;
        self.check_ties(&feature_of)?;
        self.check_connected()?;
        self.self_spacings.sort_unstable();
        let feature = |edge: &[u32; 2]| feature_of[edge[0] as usize];
        let units = (self.self_spacings).chunk_by(|one, other| feature(one) == feature(other));
        let mut self_start = vec![0];
        self_start.extend(units.scan(0, |end, unit| {
            *end += unit.len() as u32;
            Some(*end)
        }));
        Ok(Instance {
            masks: self.masks,
            feature_start: self.feature_start,
            feature_of,
            allowed: self.allowed,
            areas: self.areas,
            pair_start: self.pair_start,
            edges: self.edges,
            stitches: self.stitches,
            self_spacings: self.self_spacings,
            self_start,
            ties: self.ties,
        })
    }

    fn check_sizes(&self) -> Result<(), InstanceError> {
        if self.masks == 0 || self.masks > MAX_MASKS {
            return Err(InstanceError::MaskCount(self.masks));
        }
        for (count, what) in [
            (self.allowed.len(), "fragments"),
            (self.edges.len(), "fragment edges"),
            (self.stitches.len(), "stitches"),
            (self.self_spacings.len(), "self-spacings"),
            (self.ties.len(), "ties"),
        ] {
            check_count(count, what)?;
        }
        Ok(())
    }

    fn number_features(&self) -> Result<Vec<u32>, InstanceError> {
        let mut feature_of = Vec::with_capacity(self.allowed.len());
        for (feature, ends) in self.feature_start.windows(2).enumerate() {
            if ends[0] == ends[1] {
                return Err(InstanceError::EmptyFeature(feature as u32));
            }
            feature_of.resize(ends[1] as usize, feature as u32);
        }
        Ok(feature_of)
    }

    fn check_allowed(&self) -> Result<(), InstanceError> {
        let all = MaskSet::all(self.masks);
        match self
            .allowed
            .iter()
            .position(|set| set.is_empty() || !set.is_subset(all))
        {
            None => Ok(()),
            Some(fragment) => Err(InstanceError::Allowed {
                fragment: fragment as u32,
                masks: self.allowed[fragment].bits(),
            }),
        }
    }

    fn check_ends(&self, place: Place, ends: [u32; 2]) -> Result<(), InstanceError> {
        let count = self.allowed.len() as u32;
        match ends.into_iter().find(|&fragment| fragment >= count) {
            None => Ok(()),
            Some(fragment) => Err(InstanceError::NoSuchFragment {
                place,
                fragment,
                count,
            }),
        }
    }

    fn check_pairs(&self, feature_of: &[u32]) -> Result<(), InstanceError> {
        let mut joined: Vec<([u32; 2], u32)> = Vec::with_capacity(self.pair_start.len());
        for (pair, ends) in self.pair_start.windows(2).enumerate() {
            let pair = pair as u32;
            let place = Place::Pair(pair);
            let edges = &self.edges[ends[0] as usize..ends[1] as usize];
            let mut features = None;
            for (i, &[a, b]) in edges.iter().enumerate() {
                self.check_ends(place, [a, b])?;
                let both = ordered(feature_of[a as usize], feature_of[b as usize]);
                if both[0] == both[1] || features.is_some_and(|seen| seen != both) {
                    return Err(InstanceError::WrongFeatures {
                        place,
                        a,
                        b,
                        expected: "in two different features, the same two for all edges of a pair",
                    });
                }
                if i > 0 && edges[i - 1] == [a, b] {
                    return Err(InstanceError::RepeatedEdge { pair, a, b });
                }
                features = Some(both);
            }
            joined.push((features.ok_or(InstanceError::EmptyPair(pair))?, pair));
        }
        joined.sort_unstable();
        match joined.windows(2).find(|two| two[0].0 == two[1].0) {
            None => Ok(()),
            Some(two) => Err(InstanceError::Repeated {
                place: Place::Pair(two[1].1),
                a: two[1].0[0],
                b: two[1].0[1],
            }),
        }
    }

    fn check_stitches(&self, feature_of: &[u32]) -> Result<(), InstanceError> {
        let mut seen = Vec::with_capacity(self.stitches.len());
        for (i, stitch) in self.stitches.iter().enumerate() {
            let place = Place::Stitch(i as u32);
            self.check_same_feature(place, [stitch.a, stitch.b], feature_of)?;
            if stitch.weight == 0 {
                return Err(InstanceError::ZeroWeight(i as u32));
            }
            seen.push(([stitch.a, stitch.b], i as u32));
        }
        check_distinct(&mut seen, Place::Stitch)
    }

    fn check_self_spacings(&self, feature_of: &[u32]) -> Result<(), InstanceError> {
        if self.self_spacings.is_empty() {
            return Ok(());
        }
        let mut joined: Vec<[u32; 2]> = self.stitches.iter().map(|s| [s.a, s.b]).collect();
        joined.sort_unstable();
        let mut seen = Vec::with_capacity(self.self_spacings.len());
        for (i, &[a, b]) in self.self_spacings.iter().enumerate() {
            let place = Place::SelfSpacing(i as u32);
            self.check_same_feature(place, [a, b], feature_of)?;
            if joined.binary_search(&[a, b]).is_ok() {
                return Err(InstanceError::WrongFeatures {
                    place,
                    a,
                    b,
                    expected: "fragments that no stitch edge joins",
                });
            }
            seen.push(([a, b], i as u32));
        }
        check_distinct(&mut seen, Place::SelfSpacing)
    }

    fn check_ties(&self, feature_of: &[u32]) -> Result<(), InstanceError> {
        if self.ties.is_empty() {
            return Ok(());
        }
        let mut known: Vec<[u32; 2]> = self.stitches.iter().map(|s| [s.a, s.b]).collect();
        known.sort_unstable();
        for (i, tie) in (0u32..).zip(&self.ties) {
            let place = Place::Tie(i);
            let wrong = |[a, b]: [u32; 2], expected| InstanceError::WrongFeatures {
                place,
                a,
                b,
                expected,
            };
            match tie {
                Tie::Same(ends) | Tie::Different(ends) => {
                    self.check_ends(place, *ends)?;
                    let features = ends.map(|fragment| feature_of[fragment as usize]);
                    if features[0] == features[1] {
                        return Err(wrong(*ends, "in two different features"));
                    }
                }
                Tie::AtMost { most, stitches } => {
                    for stitch in stitches {
                        let ends = [stitch.a, stitch.b];
                        self.check_same_feature(place, ends, feature_of)?;
                        let first = feature_of[stitches[0].a as usize];
                        if known.binary_search(&ends).is_err()
                            || feature_of[stitch.a as usize] != first
                        {
                            return Err(wrong(
                                ends,
                                "a stitch edge of the same feature as the others",
                            ));
                        }
                    }
                    let ascend = stitches
                        .windows(2)
                        .all(|w| (w[0].a, w[0].b) < (w[1].a, w[1].b));
                    let sum: u64 = stitches.iter().map(|s| u64::from(s.weight)).sum();
                    if !ascend || sum <= u64::from(*most) || stitches.iter().any(|s| s.weight == 0)
                    {
                        return Err(InstanceError::LooseTie(i));
                    }
                    // Beyond one more than is allowed, an edge weighs no more.
                    let most = u64::from(*most);
                    let weights = stitches.iter().map(|s| u64::from(s.weight).min(most + 1));
                    let counted: u64 = weights.sum();
                    if counted.saturating_mul(most) > MAX_COUNTED {
                        return Err(InstanceError::HugeTie(i));
                    }
                }
            }
        }
        Ok(())
    }

    fn check_same_feature(
        &self,
        place: Place,
        [a, b]: [u32; 2],
        feature_of: &[u32],
    ) -> Result<(), InstanceError> {
        self.check_ends(place, [a, b])?;
        if a == b || feature_of[a as usize] != feature_of[b as usize] {
            return Err(InstanceError::WrongFeatures {
                place,
                a,
                b,
                expected: "two different fragments of one feature",
            });
        }
        Ok(())
    }

    /// A feature of n fragments is connected when its stitch edges join n - 1 times two parts.
    fn check_connected(&self) -> Result<(), InstanceError> {
        let mut parent: Vec<u32> = (0..self.allowed.len() as u32).collect();
        let mut parts = vec![0u32; self.feature_start.len() - 1];
        let mut owner = Vec::with_capacity(self.allowed.len());
        for (feature, ends) in self.feature_start.windows(2).enumerate() {
            parts[feature] = ends[1] - ends[0];
            owner.resize(ends[1] as usize, feature);
        }
        for stitch in &self.stitches {
            let (a, b) = (find(&mut parent, stitch.a), find(&mut parent, stitch.b));
            if a != b {
                parent[a.max(b) as usize] = a.min(b);
                parts[owner[a as usize]] -= 1;
            }
        }
        match parts.iter().position(|&count| count > 1) {
            None => Ok(()),
            Some(feature) => Err(InstanceError::Disconnected(feature as u32)),
        }
    }
}

/// The root of an element in a union-find forest, with path halving.
pub(crate) fn find(parent: &mut [u32], mut at: u32) -> u32 {
    while parent[at as usize] != at {
        parent[at as usize] = parent[parent[at as usize] as usize];
        at = parent[at as usize];
    }
    at
}

fn check_distinct(
    seen: &mut [([u32; 2], u32)],
    place: fn(u32) -> Place,
) -> Result<(), InstanceError> {
    seen.sort_unstable();
    match seen.windows(2).find(|two| two[0].0 == two[1].0) {
        None => Ok(()),
        Some(two) => Err(InstanceError::Repeated {
            place: place(two[1].1),
            a: two[1].0[0],
            b: two[1].0[1],
        }),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A list this long does not fit into a test's memory; the other checks are in `tests/instance.rs`.
    #[test]
    fn too_many() {
        assert_eq!(check_count(4_294_967_294, "stitches"), Ok(()));
        let found = check_count(4_294_967_295, "stitches");
        assert_eq!(found, Err(InstanceError::TooMany("stitches")));
    }
}
