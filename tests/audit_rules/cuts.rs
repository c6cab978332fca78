//! Cuts by hand: what they keep away from, what the rules list, what a certificate names, and what ties them together.

use super::*;
use maskproof::audit::problem::{Stitch, Tie};
use maskproof::layout::{KeepOut, Listed, Metric};

/// A wire of 100 by 10. Overlaps of 4, fragments of 12.
fn wire(policy: Policy) -> (Layout, Rules) {
    let mut rules = rules(5);
    rules.stitch = stitch(policy, 4, 12, 0);
    (layout(shapes(&[[0, 0, 100, 10]])), rules)
}

/// Cuts of the wire at some places.
fn at(places: &[i32]) -> Vec<Named> {
    let cut = |(number, &x): (u32, &i32)| (0, [x, 0, x, 10], [number, number + 1]);
    (0..).zip(places).map(cut).collect()
}

fn named((layout, rules): &(Layout, Rules), places: &[i32]) -> Result<Problem, Rejection> {
    derived(layout, rules, &[[0, 0]], &at(places))
}

/// A via above the wire's right half: its overlap, which ends 2 beyond the cut and at y = 10, keeps 5 from (60, 13) on.
#[test]
fn keep_outs() {
    for (metric, far) in [
        // 3 up, so 4 along: 3-4-5. The overlap of a cut at 54 ends at 56.
        (Metric::Euclidean, 54),
        // 3 up is less than 5, so 5 along.
        (Metric::Square, 53),
    ] {
        let mut case = wire(Policy::EveryInterval);
        case.1.spacings.metric = metric;
        let distance = 5;
        case.1.stitch.keep_outs = vec![KeepOut {
            layer: VIA,
            distance,
        }];
        case.0.keep_outs = vec![(VIA, shapes(&[[60, 13, 62, 15]]))];
        assert!(named(&case, &[far]).is_ok());
        let reason = "its overlap is less than 5 from the shape at (60, 13) of layer 2/0";
        assert_rejected(named(&case, &[far + 1]), Step::Stitches, reason);
        assert_rejected(named(&case, &[61]), Step::Stitches, reason);
        // Beyond it: the via ends at 62.
        assert!(named(&case, &[62 + 60 - far]).is_ok());
        assert_rejected(named(&case, &[62 + 59 - far]), Step::Stitches, reason);
        // Another layer's, or at no distance.
        case.1.stitch.keep_outs[0].distance = 0;
        assert!(named(&case, &[61]).is_ok());
        case.1.stitch.keep_outs[0].distance = 5;
        case.0.keep_outs[0].0 = LAYER;
        assert!(named(&case, &[61]).is_ok());
    }
}

/// A large triangle that no edge of comes near the wire: it covers it.
#[test]
fn a_keep_out_that_covers_everything() {
    let mut case = wire(Policy::EveryInterval);
    case.1.stitch.keep_outs = vec![KeepOut {
        layer: VIA,
        distance: 1,
    }];
    let mut vias = Shapes::default();
    vias.push_polygon(&[[-1000, -1000], [2000, -1000], [0, 2000]].map(point));
    case.0.keep_outs = vec![(VIA, vias)];
    let reason = "its overlap is less than 1 from the shape at (-1000, -1000) of layer 2/0";
    assert_rejected(named(&case, &[50]), Step::Stitches, reason);
}

/// Under `uncovered`, a candidate in the middle is left out where it is kept out: none takes its place.
#[test]
fn uncovered_places_are_kept_out() {
    let mut case = wire(Policy::Uncovered);
    let neighbours = [[0, 0, 100, 10], [0, 12, 20, 20], [80, 12, 100, 20]];
    case.0.shapes = shapes(&neighbours);
    let features = neighbours.map(|[x, y, ..]| [x, y]);
    // Covered up to 24 and from 76 on (2 up, 5 by Pythagoras: 4.58 along): 25 to 75, whose middle is 50.
    let cut = |places: &[i32]| derived(&case.0, &case.1, &features, &at(places));
    assert!(cut(&[50]).is_ok());
    let missing = "the policy places a candidate at (50, 0) to (50, 10), which is not listed";
    assert_rejected(cut(&[]), Step::Stitches, missing);
    case.1.stitch.keep_outs = vec![KeepOut {
        layer: VIA,
        distance: 3,
    }];
    case.0.keep_outs = vec![(VIA, shapes(&[[54, 4, 56, 6]]))];
    let cut = |places: &[i32]| derived(&case.0, &case.1, &features, &at(places));
    assert!(cut(&[]).is_ok());
    let reason = "its overlap is less than 3 from the shape at (54, 4) of layer 2/0";
    assert_rejected(cut(&[50]), Step::Stitches, reason);
}

/// Sides keep more than the 5 of everything else. What a neighbour from 30 to 60, 7 above the wire, covers: the inner places of what faces it.
#[test]
fn what_faces_a_neighbour_is_covered() {
    let rects = [[0, 0, 100, 10], [30, 17, 60, 40], [70, 17, 90, 40]];
    let are_cuts = |count: usize, spacing: i32, places: &[i32]| {
        let mut rules = wire(Policy::Uncovered).1;
        rules.spacings.side_to_side = Some(spacing);
        let features = rects.map(|[x, y, ..]| [x, y]);
        let layout = layout(shapes(&rects[..count]));
        derived(&layout, &rules, &features[..count], &at(places)).is_ok()
    };
    // Rows 0 to 30 and 60 to 100 belong to line ends, and so does 0 to 100 where 7 is no less than the value.
    assert!([9, 8, 7].iter().all(|&spacing| are_cuts(2, spacing, &[])));
    // Two neighbours: 31 to 59 and 71 to 89 are covered, the middle of 60 to 70 is 65.
    assert!(are_cuts(3, 8, &[65]));
    assert!(
        ![&[64][..], &[66], &[]]
            .iter()
            .any(|places| are_cuts(3, 8, places))
    );
    assert!(are_cuts(3, 7, &[]));
}

#[test]
fn named_cuts_are_held_against_the_rules() {
    let case = wire(Policy::EveryInterval);
    assert_eq!(named(&case, &[12, 50, 88]).unwrap().stitches.len(), 3);
    assert!(named(&case, &[]).is_ok());
    for (places, reason) in [
        (
            &[11][..],
            "it is 11 from the line end at (0, 0), at least 12 is needed",
        ),
        (
            &[89],
            "it is 11 from the line end at (100, 0), at least 12 is needed",
        ),
        (
            &[0],
            "it is 0 from the line end at (0, 0), at least 12 is needed",
        ),
        (
            &[101],
            "it does not cross a straight run from one side to the other",
        ),
        (&[-1], "it does not cross a straight run"),
        (&[50, 50], "the cut at (50, 0) to (50, 10) is listed twice"),
    ] {
        assert_rejected(named(&case, places), Step::Stitches, reason);
    }
    let unseen = derived(&case.0, &case.1, &[[0, 0]], &[(7, [50, 0, 50, 10], [0, 1])]);
    assert_rejected(unseen, Step::Stitches, "feature 7 is cut: there are 1");
    let along = derived(&case.0, &case.1, &[[0, 0]], &[(0, [0, 5, 100, 5], [0, 1])]);
    assert_rejected(along, Step::Stitches, "it does not cross a straight run");
    // A ring cut once is still one.
    let ring = shapes(&[
        [0, 0, 60, 10],
        [0, 50, 60, 60],
        [0, 0, 10, 60],
        [50, 0, 60, 60],
    ]);
    let ring = |cuts: &[Named]| derived(&layout(ring.clone()), &case.1, &[[0, 0]], cuts);
    let (lower, upper) = ([30, 0, 30, 10], [30, 50, 30, 60]);
    let once = ring(&[(0, lower, [0, 1])]);
    let reason = "no cut is allowed at (30, 0) to (30, 10): on the run from (10, 0) to (50, 10), it separates nothing";
    assert_rejected(once, Step::Stitches, reason);
    let twice = ring(&[(0, lower, [0, 1]), (0, upper, [0, 1])]).unwrap();
    let both = Stitch {
        ends: [0, 1],
        weight: 2,
    };
    assert_eq!(twice.stitches, [both]);
    // Both are needed for one of them to count, and stand for one stitch edge.
    let mut few = case.1.clone();
    few.stitch.most_per_feature = Some(1);
    let ring = shapes(&[
        [0, 0, 60, 10],
        [0, 50, 60, 60],
        [0, 0, 10, 60],
        [50, 0, 60, 60],
    ]);
    let cuts = [(0, lower, [0, 1]), (0, upper, [0, 1])];
    let tied = derived(&layout(ring), &few, &[[0, 0]], &cuts).unwrap();
    let stitches = vec![both];
    assert_eq!(tied.ties, [Tie::AtMost { most: 1, stitches }]);
}

#[test]
fn listed_cuts_are_all_of_them() {
    let mut case = wire(Policy::Listed);
    case.0.shapes.push_rect(Rect::new(0, 50, 8, 58));
    let listed = |feature: [i32; 2], at: [i32; 2]| Listed {
        feature: point(feature),
        at: point(at),
    };
    let cut = |case: &(Layout, Rules), places: &[i32]| {
        derived(&case.0, &case.1, &[[0, 0], [0, 50]], &at(places))
    };
    // By a point in the feature and one on it; `at` may be on the side of the run. One is said twice.
    case.1.stitch.listed = vec![
        listed([1, 1], [30, 0]),
        listed([100, 10], [70, 5]),
        listed([100, 10], [70, 6]),
    ];
    assert_eq!(cut(&case, &[30, 70]).unwrap().stitches.len(), 2);
    let reason = "the policy places a candidate at (70, 0) to (70, 10), which is not listed";
    assert_rejected(cut(&case, &[30]), Step::Stitches, reason);
    let reason = "no cut is allowed at (50, 0) to (50, 10): the rules list none there";
    assert_rejected(cut(&case, &[30, 50, 70]), Step::Stitches, reason);
    for (one, step, reason) in [
        (
            listed([1, 1], [30, 11]),
            Step::Stitches,
            "at (30, 11): it is on no straight run of the feature",
        ),
        (
            listed([1, 51], [30, 5]),
            Step::Stitches,
            "at (30, 5): it is on no straight run of the feature",
        ),
        (
            listed([1, 1], [11, 5]),
            Step::Stitches,
            "at (11, 5): it is 11 from the line end at (0, 0)",
        ),
        (
            listed([1, 11], [30, 5]),
            Step::Rules,
            "the rules name a feature at (1, 11): there is none",
        ),
    ] {
        case.1.stitch.listed[1] = one;
        assert_rejected(cut(&case, &[30, 70]), step, reason);
    }
    case.1.stitch.listed = vec![listed([1, 1], [30, 5])];
    case.1.stitch.keep_outs = vec![KeepOut {
        layer: VIA,
        distance: 5,
    }];
    case.0.keep_outs = vec![(VIA, shapes(&[[36, 0, 38, 2]]))];
    // The overlap ends at 32.
    let reason = "the rules list a cut at (30, 5): its overlap is less than 5 from the shape at (36, 0) of layer 2/0";
    assert_rejected(cut(&case, &[30]), Step::Stitches, reason);
    case.1.stitch.keep_outs[0].distance = 4;
    assert!(cut(&case, &[30]).is_ok());
}

/// Fragments of at least 12: cuts at 20, 28, 31, 32 and 50. Less than 12 apart are 20 to 31, and 28 to 32.
#[test]
fn windows_of_cuts() {
    let case = wire(Policy::EveryInterval);
    let ties = named(&case, &[20, 28, 31, 32, 50]).unwrap().ties;
    let window = |edges: std::ops::Range<u32>| Tie::AtMost {
        most: 1,
        stitches: edges
            .map(|number| Stitch {
                ends: [number, number + 1],
                weight: 1,
            })
            .collect(),
    };
    assert_eq!(ties, [window(0..3), window(1..4)]);
    let far = named(&case, &[20, 32, 44]).unwrap().ties;
    assert!(far.is_empty());
    let mut few = wire(Policy::EveryInterval);
    for (most, count) in [(3, 0), (2, 1), (0, 1)] {
        few.1.stitch.most_per_feature = Some(most);
        let ties = named(&few, &[20, 32, 44]).unwrap().ties;
        assert_eq!(ties.len(), count);
        let Some(Tie::AtMost {
            most: found,
            stitches,
        }) = ties.first()
        else {
            continue;
        };
        assert_eq!((*found, stitches.len()), (most.into(), 3));
    }
}
