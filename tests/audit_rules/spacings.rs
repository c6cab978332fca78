//! Spacings by hand, each at, one below and, where that tells something, beyond its value.

use super::*;
use maskproof::layout::{Metric, Spacings, WideSpacing};

/// Line ends are shorter than 10; side 6, side to end 8, end to end 12, corners 7; the plain spacing counts slanted edges only.
fn by_kind() -> Rules {
    let mut rules = rules(9);
    rules.spacings = Spacings {
        end_length: 10,
        side_to_side: Some(6),
        side_to_end: Some(8),
        end_to_end: Some(12),
        corner_to_corner: Some(7),
        ..Spacings::default()
    };
    rules
}

/// Two wires 4 wide and 20 long, one above the other: sides face each other, and the least spacing is 6 as well.
#[test]
fn sides() {
    for gap in [5, 6, 7] {
        let upper = 4 + gap;
        let close = two_close(&by_kind(), [[0, 0, 20, 4], [0, upper, 20, upper + 4]]);
        assert_eq!(close, gap < 6, "{gap}");
    }
    // With a larger value for sides, those count beyond the least spacing of 6, where they go along each other at all.
    let mut rules = by_kind();
    rules.spacings.side_to_side = Some(10);
    rules.spacings.corner_to_corner = Some(6);
    rules.spacings.side_to_end = Some(6);
    for (gap, shift, close) in [
        (9, 0, true),
        (10, 0, false),
        // Still over a length of 1, then over none: their corners are 9 apart then.
        (9, 19, true),
        (9, 20, false),
        (9, -19, true),
        (9, -20, false),
    ] {
        let other = [shift, 4 + gap, shift + 20, 8 + gap];
        assert_eq!(
            two_close(&rules, [[0, 0, 20, 4], other]),
            close,
            "{gap} {shift}"
        );
    }
}

/// The end of an upright wire, 4 wide, above a side: 8 counts.
#[test]
fn a_side_and_a_line_end() {
    for gap in [7, 8] {
        let upright = [8, 4 + gap, 12, 40];
        assert_eq!(two_close(&by_kind(), [[0, 0, 20, 4], upright]), gap < 8);
        // A wire 10 wide ends in a side: 6 counts.
        let wide = [5, 4 + gap - 2, 15, 40];
        assert_eq!(two_close(&by_kind(), [[0, 0, 20, 4], wide]), gap - 2 < 6);
        // One of 9 in a line end.
        let narrow = [5, 4 + gap, 14, 40];
        assert_eq!(two_close(&by_kind(), [[0, 0, 20, 4], narrow]), gap < 8);
    }
}

/// Two wires end to end: 12 counts, where their ends overlap in projection.
#[test]
fn line_ends() {
    for (gap, shift, close) in [
        (11, 0, true),
        (12, 0, false),
        (11, 3, true),
        // Shifted by their width the corners are (11, 0) apart, beyond 7.
        (11, 4, false),
        (6, 4, true),
        (7, 4, false),
    ] {
        let other = [20 + gap, shift, 40 + gap, shift + 4];
        let found = two_close(&by_kind(), [[0, 0, 20, 4], other]);
        assert_eq!(found, close, "{gap} {shift}");
    }
}

/// Corners that are (3, 6) apart are 6.708 apart, less than 7 (45 < 49), and (4, 6) are 7.211 (52).
#[test]
fn corners() {
    let block = [0, 0, 20, 20];
    for (dx, dy, close) in [
        (3, 6, true),
        (4, 6, false),
        (0, 6, true),
        // Sides that face each other over no length: the corners are 7 apart, not less.
        (0, 7, false),
        // 3-4-5.
        (3, 4, true),
    ] {
        let far = [20 + dx, 20 + dy, 40 + dx, 40 + dy];
        assert_eq!(two_close(&by_kind(), [block, far]), close, "{dx} {dy}");
        // The same from an upper left corner to a lower right one.
        let left = [-20 - dx, 20 + dy, -dx, 40 + dy];
        assert_eq!(two_close(&by_kind(), [left, block]), close, "{dx} {dy}");
    }
    // In the square metric (4, 6) is 6 apart, which is less than 7, and (4, 7) is 7.
    let mut rules = by_kind();
    rules.spacings.metric = Metric::Square;
    assert!(two_close(&rules, [block, [24, 26, 40, 40]]));
    assert!(!two_close(&rules, [block, [24, 27, 40, 40]]));
}

/// One spacing in the square metric: 5 along both axes is 5, though 7.07 by Pythagoras.
#[test]
fn the_square_metric() {
    let block = [0, 0, 20, 20];
    let diagonal = [25, 25, 40, 40];
    for (spacing, close) in [(5, false), (6, true)] {
        let mut rules = rules(spacing);
        assert!(!two_close(&rules, [block, diagonal]));
        rules.spacings.metric = Metric::Square;
        assert_eq!(two_close(&rules, [block, diagonal]), close);
    }
    assert!(!two_close(&rules(7), [block, diagonal]));
    assert!(two_close(&rules(8), [block, diagonal]));
}

/// A triangle below x + y = 10, and a rectangle from (8, 8) on. By Pythagoras it is 6 / sqrt 2 = 4.24 away; in the square metric 3, since (8 - 3) +
/// (8 - 3) = 10. The same from a triangle above x + y = 16, whose distance from (5, 5) is the same.
#[test]
fn slanted_edges() {
    let near = |rules: &Rules| {
        let both = [
            ([[0, 0], [10, 0], [0, 10]], [8, 8, 20, 20]),
            ([[16, 0], [16, 16], [0, 16]], [-9, -9, 5, 5]),
        ];
        both.map(|(corners, rect)| {
            let mut shapes = shapes(&[rect]);
            shapes.push_polygon(&corners.map(point));
            let first = *corners.iter().min().unwrap();
            let features = [[rect[0], rect[1]], first];
            let problem = derived(&layout(shapes), rules, &features, &[]).unwrap();
            !problem.close.is_empty()
        })
    };
    for (spacing, euclidean, square) in [(3, false, false), (4, false, true), (5, true, true)] {
        let mut rules = rules(spacing);
        assert_eq!(near(&rules), [euclidean; 2], "{spacing}");
        rules.spacings.metric = Metric::Square;
        assert_eq!(near(&rules), [square; 2], "{spacing}");
        // The plain spacing counts, whatever the special ones are.
        for special in [1, 9] {
            rules.spacings.corner_to_corner = Some(special);
            rules.spacings.side_to_side = Some(special);
            rules.spacings.end_length = 100;
            assert_eq!(near(&rules), [square; 2], "{spacing}");
        }
    }
}

/// A wide feature, 10 deep, and a wire, side by side along 15; wide from 10 on and along 15 needs a spacing of 9.
#[test]
fn wide_features() {
    let wide = |width, run_length, spacing| {
        let mut rules = rules(5);
        rules.spacings.wide = vec![WideSpacing {
            width,
            run_length,
            spacing,
        }];
        rules
    };
    let close = |rules: &Rules, gap: i32| {
        let wire = [5, 10 + gap, 40, 13 + gap];
        let upwards = two_close(rules, [[0, 0, 20, 10], wire]);
        // The wire named first, and all of it mirrored at the line x = y.
        let turned = |[x0, y0, x1, y1]: [i32; 4]| [y0, x0, y1, x1];
        assert_eq!(upwards, two_close(rules, [wire, [0, 0, 20, 10]]));
        assert_eq!(upwards, two_close(rules, [turned(wire), [0, 0, 10, 20]]));
        upwards
    };
    let row = wide(10, 15, 9);
    assert_eq!([8, 9].map(|gap| close(&row, gap)), [true, false]);
    assert!(!close(&wide(11, 15, 9), 8));
    assert!(!close(&wide(10, 16, 9), 8));
    assert_eq!(
        [4, 5].map(|gap| close(&wide(11, 15, 9), gap)),
        [true, false]
    );
    // The larger one applies, in whatever order.
    let mut both = wide(10, 15, 9);
    both.spacings.wide.insert(0, wide(5, 1, 7).spacings.wide[0]);
    assert!(close(&both, 8));
    both.spacings.wide.reverse();
    assert!(close(&both, 8) && !close(&both, 9));
}

/// A wire of depth 3 that two blocks make 10 deep, along 6 each, with 8 between them: 12 in all, though neither is 12 long. The wire
/// above is cut in the middle between them, and then over the left block: the wide places must be beside the fragment.
#[test]
fn wide_places_add_up_and_count_where_they_are() {
    let mut rules = rules(2);
    rules.stitch = stitch(Policy::EveryInterval, 0, 0, 0);
    let row = |run_length| WideSpacing {
        width: 10,
        run_length,
        spacing: 6,
    };
    let rects = [
        [0, 0, 20, 3],
        [0, -7, 6, 0],
        [14, -7, 20, 0],
        [-5, 8, 25, 10],
    ];
    let layout = layout(shapes(&rects));
    let features = [[0, -7], [-5, 8]];
    for (run_length, close) in [(12, true), (13, false)] {
        rules.spacings.wide = vec![row(run_length)];
        let problem = derived(&layout, &rules, &features, &[]).unwrap();
        assert_eq!(!problem.close.is_empty(), close, "{run_length}");
    }
    rules.spacings.wide = vec![row(12)];
    let cut_at = |places: &[i32]| {
        let cuts: Vec<Named> = (0..)
            .zip(places)
            .map(|(number, &x)| (1, [x, 8, x, 10], [number, number + 1]))
            .collect();
        derived(&layout, &rules, &features, &cuts).unwrap().close
    };
    // Fragments 1, 2, 3 go from -5 to 6, from 6 to 14, where nothing is wide, and on to 25.
    assert_eq!(cut_at(&[6, 14]), [[0, 1], [0, 3]]);
    // To 5, to 15: 5 to 6 is wide.
    assert_eq!(cut_at(&[5, 15]), [[0, 1], [0, 2], [0, 3]]);
    // To 0, where nothing begins, and on.
    assert_eq!(cut_at(&[0]), [[0, 2]]);
    // An overlap of 2 reaches one beyond.
    rules.stitch.overlap = 2;
    let cuts = [(1, [0, 8, 0, 10], [0, 1])];
    let close = derived(&layout, &rules, &features, &cuts).unwrap().close;
    assert_eq!(close, [[0, 1], [0, 2]]);
}

/// A U whose arms are 7 apart, 2 wide, and cut at half their height: the arms above keep what sides keep.
#[test]
fn sides_of_one_feature() {
    let mut rules = rules(3);
    rules.stitch = stitch(Policy::EveryInterval, 2, 0, 0);
    let arms = [[0, 0, 2, 30], [9, 0, 11, 30], [0, 0, 11, 2]];
    let cuts = [(0, [0, 15, 2, 15], [0, 1]), (0, [9, 15, 11, 15], [0, 2])];
    for (spacing, close) in [(8, true), (7, false)] {
        rules.spacings.side_to_side = Some(spacing);
        let problem = derived(&layout(shapes(&arms)), &rules, &[[0, 0]], &cuts).unwrap();
        let ends: Vec<[u32; 2]> = problem.stitches.iter().map(|s| s.ends).collect();
        // The overlaps, from 14 to 16, face the other arm's; but there the two are joined.
        assert_eq!(ends, [[0, 1], [0, 2]]);
        assert_eq!(!problem.close.is_empty(), close);
        assert!(problem.close.iter().all(|&edge| edge == [1, 2]));
    }
}

/// Two squares that touch at a point are one feature: where they do is no convex corner, so that none of their sides is a line end there.
#[test]
fn a_corner_that_goes_on() {
    let mut rules = rules(3);
    rules.spacings.end_length = 5;
    rules.spacings.end_to_end = Some(9);
    let pair = [[0, 0, 4, 4], [4, 4, 8, 8]];
    let close = |other: [i32; 4]| {
        let features = [[0, 0], [other[0], other[1]]];
        let problem = derived(
            &layout(shapes(&[pair[0], pair[1], other])),
            &rules,
            &features,
            &[],
        );
        !problem.unwrap().close.is_empty()
    };
    // Below the first square, whose lower edge is between two convex corners; and left of the second, whose left edge is not.
    assert!(close([0, -12, 4, -4]));
    // 7 from it, and (3, 1) from the first one's corner: 3.16.
    assert!(!close([-12, 5, -3, 7]));
}
