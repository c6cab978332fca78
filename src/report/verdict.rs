//! The verdict: what proven bounds say about a layer, in one pure function.

use crate::solve::Bounds;

/// What a run has shown.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// No conflict is left, and the number of stitches is proven to be the least.
    Decomposable,
    /// At least one conflict is unavoidable, and their least number is proven.
    NotDecomposable,
    /// A limit stopped the run before one of the two was proven; both bounds are true.
    Undecided,
}

impl Verdict {
    /// The verdict that proven bounds allow.
    ///
    /// The number of stitches matters only to a layer without conflicts: where conflicts are
    /// unavoidable and their least number is proven, open stitch bounds change nothing about the
    /// statement made, and stay visible beside it.
    pub fn of(conflicts: Bounds, stitches: Bounds) -> Verdict {
        match (conflicts.is_tight(), conflicts.upper) {
            (true, 1..) => Verdict::NotDecomposable,
            (true, 0) if stitches.is_tight() => Verdict::Decomposable,
            _ => Verdict::Undecided,
        }
    }

    /// The words used in every output.
    pub fn as_str(self) -> &'static str {
        match self {
            Verdict::Decomposable => "decomposable",
            Verdict::NotDecomposable => "not decomposable",
            Verdict::Undecided => "undecided",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(conflicts: [u64; 2], stitches: [u64; 2]) -> Verdict {
        let bounds = |[lower, upper]: [u64; 2]| Bounds { lower, upper };
        Verdict::of(bounds(conflicts), bounds(stitches))
    }

    #[test]
    fn proven_zero_conflicts_need_proven_stitches() {
        assert_eq!(of([0, 0], [0, 0]), Verdict::Decomposable);
        assert_eq!(of([0, 0], [7, 7]), Verdict::Decomposable);
        assert_eq!(of([0, 0], [0, 1]), Verdict::Undecided);
    }

    #[test]
    fn proven_conflicts_decide_whatever_the_stitches() {
        assert_eq!(of([1, 1], [0, 0]), Verdict::NotDecomposable);
        assert_eq!(of([35, 35], [2, 9]), Verdict::NotDecomposable);
    }

    #[test]
    fn open_conflicts_are_undecided_even_above_zero() {
        assert_eq!(of([0, 1], [0, 0]), Verdict::Undecided);
        assert_eq!(of([1, 2], [0, 0]), Verdict::Undecided);
        assert_eq!(of([34, 35], [3, 3]), Verdict::Undecided);
    }
}
