//! Ties: what a colouring must keep to at any price.
//!
//! Conflicts and stitches are paid for; a tie is not. Masks decided by hand tie fragments together or
//! apart, and the smallest fragment length forbids that two stitches near to each other are both used.
//! No tie names a mask, so permuting the masks of a colouring keeps all ties, and a colouring with
//! one mask for each feature keeps every tie between stitches.
//!
//! The clauses of [`Tie::Same`] and [`Tie::Different`] are those of a stitch edge and a conflict edge without
//! a price. "At most n" puts a literal on each stitch edge that holds where its ends differ, and counts them:
//! with the sequential counter of Sinz ("Towards an optimal CNF encoding of Boolean cardinality
//! constraints", CP 2005), in which an edge of weight w counts w times. A fragment may be left on several masks: a stitch edge that is not
//! counted keeps the two sets of masks equal, as in [`crate::colour`].

use crate::colour::Colours;
use crate::conflict;
use crate::instance::Stitch;
use crate::literal::{ClauseSink, Lit, VarAllocator};
use crate::masks::Mask;

/// A condition on a colouring that nothing can be paid for.
#[derive(Clone, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Tie {
    /// The two fragments share a mask.
    Same([u32; 2]),
    /// The two fragments are on different masks.
    Different([u32; 2]),
    /// Of these stitch edges, ascending, at most so many are stitches; each counts by its weight.
    AtMost {
        /// How many.
        most: u32,
        /// The edges.
        stitches: Vec<Stitch>,
    },
}

impl Tie {
    /// The fragments that it speaks of, ascending, each once.
    pub fn fragments(&self) -> Vec<u32> {
        let mut found: Vec<u32> = match self {
            Tie::Same(ends) | Tie::Different(ends) => ends.to_vec(),
            Tie::AtMost { stitches, .. } => stitches.iter().flat_map(|s| [s.a, s.b]).collect(),
        };
        found.sort_unstable();
        found.dedup();
        found
    }

    /// The same tie over other numbers; `None` where a fragment has none. The order of numbers need not be kept.
    pub fn renumbered(&self, number: impl Fn(u32) -> Option<u32>) -> Option<Tie> {
        let both = |[a, b]: [u32; 2]| {
            let [a, b] = [number(a)?, number(b)?];
            Some([a.min(b), a.max(b)])
        };
        Some(match self {
            Tie::Same(ends) => Tie::Same(both(*ends)?),
            Tie::Different(ends) => Tie::Different(both(*ends)?),
            Tie::AtMost { most, stitches } => {
                let edge = |stitch: &Stitch| {
                    let [a, b] = both([stitch.a, stitch.b])?;
                    let weight = stitch.weight;
                    Some(Stitch { a, b, weight })
                };
                let mut stitches = stitches.iter().map(edge).collect::<Option<Vec<_>>>()?;
                stitches.sort_unstable();
                Tie::AtMost {
                    most: *most,
                    stitches,
                }
            }
        })
    }

    /// Whether a colouring keeps it.
    pub fn holds(&self, colouring: &[Mask]) -> bool {
        self.holds_with(|fragment| colouring[fragment as usize])
    }

    /// The same, with the mask of each fragment given.
    pub fn holds_with(&self, mask: impl Fn(u32) -> Mask) -> bool {
        match self {
            Tie::Same([a, b]) => mask(*a) == mask(*b),
            Tie::Different([a, b]) => mask(*a) != mask(*b),
            Tie::AtMost { most, stitches } => {
                let used = stitches.iter().filter(|s| mask(s.a) != mask(s.b));
                used.map(|s| u64::from(s.weight)).sum::<u64>() <= u64::from(*most)
            }
        }
    }
}

/// Encodes a tie over the fragment numbers of the colours.
pub fn encode<S: ClauseSink + VarAllocator>(colours: &Colours, tie: &Tie, sink: &mut S) {
    match tie {
        Tie::Same(ends) => conflict::unite(colours, *ends, sink),
        Tie::Different(ends) => conflict::separate(colours, *ends, None, sink),
        Tie::AtMost { most, stitches } => {
            let mut used = Vec::new();
            for stitch in stitches {
                let literal = sink.fresh();
                conflict::join(colours, [stitch.a, stitch.b], literal, sink);
                // More than `most` of the same literal cannot hold either.
                let times = stitch.weight.min(most.saturating_add(1));
                used.extend(std::iter::repeat_n(literal, times as usize));
            }
            at_most(&used, *most as usize, sink);
        }
    }
}

/// At most `most` of the literals hold.
fn at_most<S: ClauseSink + VarAllocator>(literals: &[Lit], most: usize, sink: &mut S) {
    if most == 0 {
        for &literal in literals {
            sink.clause(&[!literal]);
        }
        return;
    }
    // counted[j]: at least j + 1 of the literals so far hold.
    let mut counted: Vec<Lit> = Vec::new();
    for &literal in literals {
        let mut next = Vec::with_capacity(most);
        for j in 0..most.min(counted.len() + 1) {
            let output = sink.fresh();
            if let Some(&before) = counted.get(j) {
                sink.clause(&[!before, output]);
            }
            match j.checked_sub(1) {
                None => sink.clause(&[!literal, output]),
                Some(below) => sink.clause(&[!literal, !counted[below], output]),
            }
            next.push(output);
        }
        if let Some(&full) = counted.get(most - 1) {
            sink.clause(&[!literal, !full]);
        }
        counted = next;
    }
}
