//! The problem as the audit derives it: plain lists in the numbering of the certificate.

/// A stitch edge between two fragments of a feature, the smaller one first.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Stitch {
    /// The two fragments.
    pub ends: [u32; 2],
    /// The price of a mask change here.
    pub weight: u32,
}

/// What a colouring must keep to at any price.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Tie {
    /// The two fragments, smaller one first, share a mask.
    Same([u32; 2]),
    /// They are on different masks.
    Different([u32; 2]),
    /// Of these stitch edges of one feature, ascending, at most so many are cut; each counts by its weight.
    AtMost {
        /// How many.
        most: u64,
        /// The edges; the weight is how many cuts of the tie each stands for.
        stitches: Vec<Stitch>,
    },
}

impl Tie {
    /// The smallest fragment that it names.
    pub fn first(&self) -> u32 {
        match self {
            Tie::Same(ends) | Tie::Different(ends) => ends[0],
            Tie::AtMost { stitches, .. } => {
                let ends = stitches.iter().map(|stitch| stitch.ends[0]);
                ends.min().unwrap_or(0)
            }
        }
    }
}

/// What has to be coloured.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Problem {
    /// K.
    pub masks: u8,
    /// The fragments of feature f are `feature_start[f]..feature_start[f + 1]`.
    pub feature_start: Vec<u32>,
    /// For each fragment the masks that it may take, mask i as bit i.
    pub allowed: Vec<u8>,
    /// The close fragments, smaller one first, sorted, each once. Those of different features are the
    /// fragment edges of conflict pairs; those of one feature are self-spacings, and no stitch edge joins
    /// them.
    pub close: Vec<[u32; 2]>,
    /// The stitch edges, sorted, at most one between two fragments.
    pub stitches: Vec<Stitch>,
    /// The ties, by their first fragments.
    pub ties: Vec<Tie>,
}

impl Problem {
    /// How many fragments there are.
    pub fn fragment_count(&self) -> usize {
        self.allowed.len()
    }

    /// How many features there are.
    pub fn feature_count(&self) -> usize {
        self.feature_start.len().saturating_sub(1)
    }

    /// The feature that a fragment is part of.
    pub fn feature_of(&self, fragment: u32) -> u32 {
        self.feature_start
            .partition_point(|&start| start <= fragment) as u32
            - 1
    }

    /// The fragments of a feature.
    pub fn fragments_of(&self, feature: u32) -> std::ops::Range<u32> {
        self.feature_start[feature as usize]..self.feature_start[feature as usize + 1]
    }

    /// The stitch edges of a feature.
    pub fn stitches_of(&self, feature: u32) -> &[Stitch] {
        let fragments = self.fragments_of(feature);
        let place = |fragment: u32| self.stitches.partition_point(|s| s.ends[0] < fragment);
        &self.stitches[place(fragments.start)..place(fragments.end)]
    }

    /// The ties whose first fragment is one of a feature.
    pub fn ties_of(&self, feature: u32) -> &[Tie] {
        let fragments = self.fragments_of(feature);
        let place = |fragment: u32| self.ties.partition_point(|tie| tie.first() < fragment);
        &self.ties[place(fragments.start)..place(fragments.end)]
    }

    /// Whether the two fragments, smaller one first, are close.
    pub fn are_close(&self, edge: [u32; 2]) -> bool {
        self.close.binary_search(&edge).is_ok()
    }

    /// The stitch edge between two fragments, smaller one first.
    pub fn stitch(&self, ends: [u32; 2]) -> Option<Stitch> {
        let found = self
            .stitches
            .binary_search_by_key(&ends, |stitch| stitch.ends);
        found.ok().map(|at| self.stitches[at])
    }
}
