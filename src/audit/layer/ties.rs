//! What stitches may not be together: cuts of one run that are nearer to each other than the smallest fragment length, and more of one
//! feature than the rules allow.
//!
//! Cuts of a run that all lie within less than the smallest fragment length are a window; of a longest one, at most one is a stitch. Cuts
//! between the same two fragments are stitches together: such a stitch edge counts as many as it has cuts. What cannot be
//! broken is left out.

use super::cuts::Line;
use crate::audit::problem::{Stitch, Tie};
use crate::layout::StitchRules;

/// A cut: its run, its place along it, its feature, and the fragments it is between.
type Cut = (u32, i32, u32, [u32; 2]);

/// The ties of cuts. `sides` are the fragments on the sides of each line.
pub(super) fn of_cuts(lines: &[Line], sides: &[[u32; 2]], rules: &StitchRules) -> Vec<Tie> {
    let cut = |(line, &[a, b]): (&Line, &[u32; 2])| -> Cut {
        let Line { line: at, run, .. } = *line;
        let place = if at.min.x == at.max.x {
            at.min.x
        } else {
            at.min.y
        };
        (run, place, line.feature, [a.min(b), a.max(b)])
    };
    let mut cuts: Vec<Cut> = lines.iter().zip(sides).map(cut).collect();
    cuts.sort_unstable();
    let mut ties = Vec::new();
    for run in cuts.chunk_by(|one, other| one.0 == other.0) {
        ties.extend(windows(run, rules.fragment_length).filter_map(|window| at_most(1, window)));
    }
    if let Some(most) = rules.most_per_feature {
        cuts.sort_by_key(|cut| cut.2);
        let features = cuts.chunk_by(|one, other| one.2 == other.2);
        ties.extend(features.filter_map(|own| at_most(most.into(), own)));
    }
    ties
}

/// The longest rows of cuts of a run of which the last is less than a length from the first.
fn windows(run: &[Cut], length: i32) -> impl Iterator<Item = &[Cut]> {
    let near = move |first: i32, cut: &Cut| i64::from(cut.1) - i64::from(first) < length.into();
    let end = move |start: usize| {
        run.partition_point(|cut| near(run[start].1, cut))
            .max(start)
    };
    (0..run.len()).filter_map(move |start| {
        // One that ends where the window before ended is part of that.
        let is_new = start == 0 || end(start) > end(start - 1);
        is_new.then(|| &run[start..end(start)])
    })
}

fn at_most(most: u64, cuts: &[Cut]) -> Option<Tie> {
    let mut ends: Vec<[u32; 2]> = cuts.iter().map(|cut| cut.3).collect();
    ends.sort_unstable();
    let same = ends.chunk_by(|one, other| one == other);
    let stitches = same.map(|same| Stitch {
        ends: same[0],
        weight: same.len() as u32,
    });
    let stitches = stitches.collect();
    (cuts.len() as u64 > most).then_some(Tie::AtMost { most, stitches })
}
