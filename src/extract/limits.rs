//! The hard constraints of stitches: at most so many of some cuts are used.
//!
//! Two cuts of one run nearer to each other than the smallest fragment length are not both stitches, since
//! the fragment between them would be too short. Of any cuts that lie within less than that length, all
//! pairwise are too near, so at most one is a stitch; and two cuts that are too near lie in a common longest
//! window of consecutive cuts that does. The windows therefore say exactly the same as all pairs. Beside
//! them, the rules may limit the stitches of a feature.

use super::cutting::Candidate;
use super::runs::Run;
use crate::layout::{Limit, StitchRules};

/// The limits of one feature whose cut i is at `candidates[i]`; cuts are numbered from 0 in the feature.
pub(super) fn of_feature(candidates: &[Candidate], rules: &StitchRules) -> Vec<Limit> {
    let mut limits = windows(candidates, rules.fragment_length);
    if let Some(most) = rules.most_per_feature
        && candidates.len() > most as usize
    {
        let cuts = (0..candidates.len() as u32).collect();
        limits.push(Limit { most, cuts });
    }
    limits
}

/// The longest windows of two cuts of one run or more within less than `length`, run by run.
fn windows(candidates: &[Candidate], length: i32) -> Vec<Limit> {
    let key = |run: &Run| (run.direction, run.low, run.high, run.from);
    let mut along: Vec<_> = (0u32..)
        .zip(candidates)
        .map(|(cut, c)| (key(&c.run), c.place, cut))
        .collect();
    along.sort_unstable();
    let mut found = Vec::new();
    for run in along.chunk_by(|a, b| a.0 == b.0) {
        // The last window ended here: one that ends no later is part of it.
        let mut covered = 1;
        for (first, &(_, place, _)) in run.iter().enumerate() {
            let near = |other: i32| i64::from(other) - i64::from(place) < length.into();
            let end = run.partition_point(|&(_, other, _)| other <= place || near(other));
            if end > covered.max(first + 1) {
                let mut cuts: Vec<u32> = run[first..end].iter().map(|&(_, _, cut)| cut).collect();
                cuts.sort_unstable();
                found.push(Limit { most: 1, cuts });
                covered = end;
            }
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::super::runs::{Direction, End};
    use super::*;

    fn at(low: i32, place: i32) -> Candidate {
        let run = Run {
            direction: Direction::Horizontal,
            from: 0,
            to: 100,
            low,
            high: low + 10,
            ends: [End::Line; 2],
        };
        Candidate { run, place }
    }

    #[test]
    fn windows_are_as_long_as_they_can_be_and_keep_to_a_run() {
        // Length 10 on the run at 0: 10 to 19 and 15 to 24 are windows, 24 to 34 is not; 50 is alone.
        // On the run at 20 the same places are far from those of the other one.
        let cuts = [
            at(0, 34),
            at(0, 10),
            at(0, 15),
            at(20, 18),
            at(0, 19),
            at(0, 24),
            at(20, 50),
        ];
        let rules = StitchRules {
            fragment_length: 10,
            ..StitchRules::default()
        };
        let limits: Vec<_> = of_feature(&cuts, &rules)
            .into_iter()
            .map(|l| (l.most, l.cuts))
            .collect();
        assert_eq!(limits, [(1, vec![1, 2, 4]), (1, vec![2, 4, 5])]);
    }

    #[test]
    fn the_most_of_a_feature_counts_where_it_has_more_cuts() {
        let cuts = [at(0, 10), at(0, 50), at(20, 50)];
        let most = |most| StitchRules {
            most_per_feature: Some(most),
            ..StitchRules::default()
        };
        let all = Limit {
            most: 2,
            cuts: vec![0, 1, 2],
        };
        assert_eq!(of_feature(&cuts, &most(2)), [all]);
        assert_eq!(of_feature(&cuts, &most(3)), []);
    }
}
