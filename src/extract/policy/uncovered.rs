//! A candidate where no neighbour within the spacing projects on a run.
//!
//! Each longest gap between shadows gets one candidate, at its middle rounded down to the grid, when the
//! overlap fits the gap. A gap that reaches to a line end gets none: beyond it there is nothing that
//! conflicts. A candidate that breaks a rule, or is closer than the smallest fragment length to the one
//! before it, is left out.
//!
//! Source: A. B. Kahng, C.-H. Park, X. Xu, H. Yao, "Layout decomposition for double patterning
//! lithography" (ICCAD 2008). Departure: shadows are Euclidean, and the middle of a gap is not moved in
//! search of a legal place. The candidate set is not complete: least stitches are least for it only.

use super::super::runs::{End, Run};
use super::super::shadows::Shadow;
use super::{ExtractError, Ground, Placement, Seen, StitchPolicy};
use crate::layout::StitchRules;

/// The policy of uncovered gaps.
pub(super) struct Uncovered;

impl StitchPolicy for Uncovered {
    fn place(
        &self,
        ground: &Ground<'_>,
        progress: &dyn Fn(usize),
    ) -> Result<Placement, ExtractError> {
        let rules = &ground.rules().stitch;
        ground.each_run(progress, &|seen| middles(seen, rules))
    }
}

/// The legal middles of the gaps of a run.
fn middles(seen: &Seen<'_>, rules: &StitchRules) -> Vec<i32> {
    let run = seen.run;
    let mut places: Vec<i32> = Vec::new();
    for [from, to] in gaps(run, seen.shadows) {
        let closed = (from == run.from && run.ends[0] == End::Line)
            || (to == run.to && run.ends[1] == End::Line);
        // From one end of the range of coordinates to the other it is one too long for 32 bits.
        let length = i64::from(to) - i64::from(from);
        let middle = (i64::from(from) + length / 2) as i32;
        let far =
            |before: &i32| i64::from(middle) - i64::from(*before) >= rules.fragment_length.into();
        if !closed
            && length >= rules.overlap.into()
            && seen.legal.contains(middle)
            && places.last().is_none_or(far)
        {
            places.push(middle);
        }
    }
    places
}

/// The longest intervals of places that no shadow covers, ascending.
fn gaps(run: &Run, shadows: &[Shadow]) -> Vec<[i32; 2]> {
    let mut found = Vec::new();
    let mut from = run.from;
    // A shadow without a place covers nothing.
    let covering = shadows.iter().filter(|shadow| shadow.from <= shadow.to);
    for shadow in covering {
        if shadow.from > from {
            found.push([from, shadow.from - 1]);
        }
        from = from.max(shadow.to.saturating_add(1));
    }
    if from <= run.to {
        found.push([from, run.to]);
    }
    found
}

#[cfg(test)]
mod tests {
    use super::super::super::runs::Direction;
    use super::*;

    const RULES: StitchRules = StitchRules {
        policy: crate::layout::Policy::Uncovered,
        overlap: 8,
        fragment_length: 20,
        corner: 6,
        weight: 1,
        keep_outs: Vec::new(),
        most_per_feature: None,
        listed: Vec::new(),
    };

    fn places(ends: [End; 2], shadows: &[[i32; 2]], rules: &StitchRules) -> Vec<i32> {
        let run = Run {
            direction: Direction::Horizontal,
            from: 0,
            to: 100,
            low: 0,
            high: 10,
            ends,
        };
        let shadows: Vec<Shadow> = (shadows.iter())
            .map(|&[from, to]| Shadow {
                from,
                to,
                feature: 0,
            })
            .collect();
        let seen = Seen {
            run: &run,
            legal: &super::super::Legal::between_ends(&run, rules),
            shadows: &shadows,
        };
        middles(&seen, rules)
    }

    const LINE: [End; 2] = [End::Line; 2];
    const JUNCTION: [End; 2] = [End::Junction; 2];

    #[test]
    fn the_middle_of_each_gap_between_two_shadows() {
        assert_eq!(places(LINE, &[[0, 30], [61, 100]], &RULES), [45]);
        assert_eq!(places(LINE, &[[0, 30], [62, 100]], &RULES), [46]);
        assert_eq!(places(LINE, &[[0, 30], [20, 40], [51, 100]], &RULES), [45]);
        assert_eq!(places(LINE, &[[0, 50], [20, 30], [71, 100]], &RULES), [60]);
    }

    #[test]
    fn none_towards_a_line_end() {
        assert_eq!(places(LINE, &[], &RULES), [0; 0]);
        assert_eq!(places(LINE, &[[40, 60]], &RULES), [0; 0]);
        assert_eq!(places(JUNCTION, &[], &RULES), [50]);
        assert_eq!(places(JUNCTION, &[[40, 60]], &RULES), [19, 80]);
    }

    #[test]
    fn the_overlap_must_fit_the_gap() {
        assert_eq!(places(LINE, &[[0, 40], [50, 100]], &RULES), [45]);
        assert_eq!(places(LINE, &[[0, 40], [49, 100]], &RULES), [0; 0]);
    }

    #[test]
    fn line_ends_and_corners_keep_it_off() {
        // Gaps 9 to 30 and 10 to 30: the middles 19 and 20 from a line end.
        assert_eq!(places(LINE, &[[0, 8], [31, 100]], &RULES), [0; 0]);
        assert_eq!(places(LINE, &[[0, 9], [31, 100]], &RULES), [20]);
        // From a junction, half the overlap and the corner rule: 10.
        assert_eq!(places(JUNCTION, &[[20, 100]], &RULES), [0; 0]);
        assert_eq!(places(JUNCTION, &[[21, 100]], &RULES), [10]);
    }

    #[test]
    fn neighbours_on_a_run_keep_the_fragment_length() {
        let shadows = [[0, 29], [41, 44], [56, 100]];
        assert_eq!(places(LINE, &shadows, &RULES), [35]);
        let short = StitchRules {
            fragment_length: 15,
            ..RULES
        };
        assert_eq!(places(LINE, &shadows, &short), [35, 50]);
    }
}
