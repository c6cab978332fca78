//! Spacings by what faces what, worked out by hand: each exactly at its value and one below.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use maskproof::extract::shadows::Shadow;
use maskproof::extract::survey::Survey;
use maskproof::extract::{ExtractError, Extraction, extract};
use maskproof::geometry::distance::{Outline, outlines_closer_than, outlines_closer_than_square};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{
    LayerId, Layout, Metric, Policy, Rules, Shape, Shapes, Spacings, WideSpacing,
};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

fn rules(spacing: i32, spacings: Spacings) -> Rules {
    let layer = LayerId {
        layer: 1,
        datatype: 0,
    };
    Rules {
        spacings,
        ..Rules::plain(layer, 2, spacing)
    }
}

fn layout(rects: &[Rect]) -> Layout {
    let mut shapes = Shapes::default();
    rects.iter().for_each(|&rect| shapes.push_rect(rect));
    of_shapes(shapes)
}

fn of_shapes(shapes: Shapes) -> Layout {
    Layout {
        top: "top".into(),
        layer: rules(1, Spacings::default()).layer,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    }
}

fn run(layout: &Layout, rules: &Rules) -> Extraction {
    extract(layout, rules, &|_| ()).unwrap()
}

/// Whether the two features that the rectangles make are close; in all four turns and both mirror images alike.
fn is_close(rects: &[Rect], rules: &Rules) -> bool {
    type Turn = fn(i32, i32) -> (i32, i32);
    let turns: [Turn; 8] = [
        |x, y| (x, y),
        |x, y| (-x, y),
        |x, y| (x, -y),
        |x, y| (-x, -y),
        |x, y| (y, x),
        |x, y| (-y, x),
        |x, y| (y, -x),
        |x, y| (-y, -x),
    ];
    let found = turns.map(|turn| {
        let turned = rects.iter().map(|r| {
            let ((x0, y0), (x1, y1)) = (turn(r.min.x, r.min.y), turn(r.max.x, r.max.y));
            Rect::new(x0.min(x1), y0.min(y1), x0.max(x1), y0.max(y1))
        });
        let found = run(&layout(&turned.collect::<Vec<_>>()), rules);
        assert_eq!(found.features.len(), 2);
        found.instance.pair_count() == 1
    });
    assert!(found.iter().all(|&one| one == found[0]), "{found:?}");
    found[0]
}

/// Whether rectangles are close at the least distance at which `value` says they are not, and one below.
fn is_exact(rects: impl Fn(i32) -> Vec<Rect>, value: i32, rules: &Rules) -> bool {
    [value - 1, value].map(|gap| is_close(&rects(gap), rules)) == [true, false]
}

#[test]
fn three_four_five_in_both_metrics() {
    // 3 and 4 apart: 5 by the straight line, 4 in the square metric.
    let rects = [Rect::new(0, 0, 10, 10), Rect::new(13, 14, 20, 20)];
    let square = || Spacings {
        metric: Metric::Square,
        ..Spacings::default()
    };
    let euclidean = Spacings::default;
    assert!(!is_close(&rects, &rules(5, euclidean())));
    assert!(is_close(&rects, &rules(6, euclidean())));
    assert!(!is_close(&rects, &rules(4, square())));
    assert!(is_close(&rects, &rules(5, square())));
    // Straight across there is no difference.
    let wires = |gap| {
        vec![
            Rect::new(0, 0, 50, 10),
            Rect::new(0, 10 + gap, 50, 20 + gap),
        ]
    };
    assert!(is_exact(wires, 5, &rules(5, euclidean())));
    assert!(is_exact(wires, 5, &rules(5, square())));
}

#[test]
fn corners_that_are_turned_to_each_other() {
    let corner = |metric, value| {
        let corner_to_corner = Some(value);
        rules(
            3,
            Spacings {
                metric,
                corner_to_corner,
                ..Spacings::default()
            },
        )
    };
    let at = |x, y| [Rect::new(0, 0, 10, 10), Rect::new(x, y, x + 9, y + 9)];
    use Metric::{Euclidean, Square};
    // 3 and 4 apart is 5; 2 and 4 apart is 20 < 25.
    assert!(!is_close(&at(13, 14), &corner(Euclidean, 5)));
    assert!(is_close(&at(13, 14), &corner(Euclidean, 6)));
    assert!(is_close(&at(12, 14), &corner(Euclidean, 5)));
    assert!(!is_close(&at(13, 14), &corner(Square, 4)));
    assert!(is_close(&at(13, 14), &corner(Square, 5)));
    // Straight above each other they are still turned to each other: 4 apart.
    assert!(!is_close(&at(10, 14), &corner(Euclidean, 4)));
    assert!(is_close(&at(10, 14), &corner(Euclidean, 5)));
    // One step further the edges face each other, and 4 is enough for those.
    assert!(!is_close(&at(9, 14), &corner(Euclidean, 9)));
}

/// Plain spacing 3, sides 6, side and end 7, ends 9; ends are shorter than 10.
fn kinds() -> Rules {
    rules(
        3,
        Spacings {
            end_length: 10,
            side_to_side: Some(6),
            side_to_end: Some(7),
            end_to_end: Some(9),
            ..Spacings::default()
        },
    )
}

#[test]
fn sides_and_line_ends() {
    let wire = Rect::new(0, 0, 50, 8);
    let beside = |gap| vec![wire, Rect::new(0, 8 + gap, 50, 16 + gap)];
    assert!(is_exact(beside, 6, &kinds()));
    let in_line = |gap| vec![wire, Rect::new(50 + gap, 0, 99, 8)];
    assert!(is_exact(in_line, 9, &kinds()));
    let towards = |gap| vec![wire, Rect::new(20, 8 + gap, 28, 60)];
    assert!(is_exact(towards, 7, &kinds()));
    // A square of 8 has four ends, one of 10 has none: an end is shorter than 10.
    let squares = |gap| vec![Rect::new(0, 0, 8, 8), Rect::new(8 + gap, 0, 16 + gap, 8)];
    assert!(is_exact(squares, 9, &kinds()));
    let larger = |gap| {
        vec![
            Rect::new(0, 0, 10, 10),
            Rect::new(10 + gap, 0, 20 + gap, 10),
        ]
    };
    assert!(is_exact(larger, 6, &kinds()));
    // Without an end length there are no ends.
    let mut sides_only = kinds();
    sides_only.spacings.end_length = 0;
    assert!(is_exact(in_line, 6, &sides_only));
}

#[test]
fn an_edge_at_a_concave_corner_is_no_end() {
    // The right edge of the block, from (50, 4) to (50, 20), is 16 long, but the foot makes (50, 4) concave: a
    // side. The wire to the right ends in front of it. The foot is 4 below the wire, which is enough.
    let block = |gap| {
        vec![
            Rect::new(0, 0, 50, 20),
            Rect::new(50, 0, 60, 4),
            Rect::new(50 + gap, 8, 99, 18),
        ]
    };
    let mut rules = kinds();
    rules.spacings = Spacings {
        end_length: 17,
        side_to_end: Some(12),
        end_to_end: Some(20),
        ..Spacings::default()
    };
    assert!(is_exact(block, 12, &rules));
    // Without the foot the edge is 20 long; with an end length of 21 it is an end.
    let bare = |gap| block(gap).into_iter().filter(|r| r.max.x != 60).collect();
    assert!(is_exact(bare, 12, &rules));
    rules.spacings.end_length = 21;
    assert!(is_exact(bare, 20, &rules));
    assert!(is_exact(block, 12, &rules));
}

#[test]
fn edges_that_share_a_point_of_the_projection_do_not_face_each_other() {
    let step = |x| [Rect::new(0, 0, 50, 10), Rect::new(x, 15, 99, 25)];
    assert!(!is_close(&step(50), &kinds()));
    assert!(is_close(&step(49), &kinds()));
}

#[test]
fn edges_go_on_as_long_as_they_go_straight() {
    // Drawn in two, the end of the wire is 12 long and no end.
    let drawn = [
        Rect::new(0, 0, 50, 6),
        Rect::new(20, 6, 50, 12),
        Rect::new(57, 0, 99, 12),
    ];
    assert!(!is_close(&drawn, &kinds()));
    // Less high it is one: 7 apart is less than 9.
    let low = [Rect::new(0, 0, 50, 9), Rect::new(57, 0, 99, 9)];
    assert!(is_close(&low, &kinds()));
}

/// Plain spacing 5; 12 where one is 20 wide over 30.
fn wide() -> Rules {
    let row = WideSpacing {
        width: 20,
        run_length: 30,
        spacing: 12,
    };
    rules(
        5,
        Spacings {
            wide: vec![row],
            ..Spacings::default()
        },
    )
}

#[test]
fn wide_features_exactly_at_width_and_run_length() {
    let beside = |width: i32, length: i32| {
        move |gap: i32| {
            vec![
                Rect::new(0, 0, 100, width),
                Rect::new(40, width + gap, 40 + length, width + gap + 8),
            ]
        }
    };
    assert!(is_exact(beside(20, 30), 12, &wide()));
    assert!(is_exact(beside(19, 30), 5, &wide()));
    assert!(is_exact(beside(20, 29), 5, &wide()));
}

#[test]
fn wide_only_where_it_is_deep_behind_the_edge() {
    // 20 deep from 0 to 40, and 10 from there on; the neighbour from x on.
    let partly = |x| {
        move |gap: i32| {
            vec![
                Rect::new(0, 0, 40, 20),
                Rect::new(40, 10, 100, 20),
                Rect::new(x, 20 + gap, 90, 28 + gap),
            ]
        }
    };
    assert!(is_exact(partly(10), 12, &wide()));
    assert!(is_exact(partly(11), 5, &wide()));
    // Two deep stretches of 15 add up to 30.
    let table = |x| {
        move |gap: i32| {
            vec![
                Rect::new(0, 10, 100, 20),
                Rect::new(0, 0, 15, 20),
                Rect::new(85, 0, 100, 20),
                Rect::new(x, 20 + gap, 100, 28 + gap),
            ]
        }
    };
    assert!(is_exact(table(0), 12, &wide()));
    assert!(is_exact(table(1), 5, &wide()));
}

#[test]
fn closer_than_any_masks_allow() {
    // 3 and 4 apart, and far from both a third one.
    let rects = [
        Rect::new(0, 0, 10, 10),
        Rect::new(13, 14, 20, 20),
        Rect::new(90, 90, 99, 99),
    ];
    let layout = layout(&rects);
    let found = |metric, any_mask| {
        let spacings = Spacings {
            metric,
            any_mask,
            ..Spacings::default()
        };
        let found = run(&layout, &rules(6, spacings));
        assert_eq!(found.instance.pair_count(), 1, "close as it is");
        found.too_close
    };
    assert!(found(Metric::Euclidean, 0).is_empty());
    assert!(found(Metric::Euclidean, 5).is_empty());
    assert_eq!(found(Metric::Euclidean, 6).len(), 1);
    assert!(found(Metric::Square, 4).is_empty());
    let [[a, b]] = found(Metric::Square, 5)[..] else {
        panic!("one pair");
    };
    let features = run(&layout, &rules(6, Spacings::default())).features;
    assert!(a < b);
    let shapes = [a, b].map(|feature| features.shapes_of(feature)[0]);
    assert!(!shapes.contains(&2), "the far one is in none");
}

#[test]
fn features_with_slanted_edges_keep_the_plain_spacing() {
    let triangle = |points: [(i32, i32); 3], rect: Rect| {
        let mut shapes = Shapes::default();
        shapes.push_polygon(&points.map(|(x, y)| Point::new(x, y)));
        shapes.push_rect(rect);
        of_shapes(shapes)
    };
    let is_close = |layout: &Layout, rules: &Rules| run(layout, rules).instance.pair_count() == 1;
    // Its upright edge at x = 10 faces the rectangle.
    let facing = |gap| {
        let rect = Rect::new(10 + gap, 0, 40, 10);
        triangle([(0, 0), (10, 0), (10, 10)], rect)
    };
    let mut several = rules(5, Spacings::default());
    several.spacings.side_to_side = Some(20);
    several.spacings.corner_to_corner = Some(2);
    assert!(is_close(&facing(4), &several));
    assert!(!is_close(&facing(5), &several));
    // The long edge x + y = 10 is 10 / sqrt 2 = 7.07 from (10, 10), and 5 in the square metric.
    let slanted = triangle([(0, 0), (10, 0), (0, 10)], Rect::new(10, 10, 20, 20));
    let metric = |metric, spacing| {
        let spacings = Spacings {
            metric,
            ..Spacings::default()
        };
        is_close(&slanted, &rules(spacing, spacings))
    };
    assert!(!metric(Metric::Euclidean, 7));
    assert!(metric(Metric::Euclidean, 8));
    assert!(!metric(Metric::Square, 5));
    assert!(metric(Metric::Square, 6));
}

/// Triangles and rectangles: each pair of features by all pairs of their shapes, with the plain spacing where one has
/// a slanted shape, and 4 for all kinds elsewhere.
#[test]
fn slanted_and_straight_features_at_random() {
    let mut rng = Pcg64Mcg::seed_from_u64(55);
    let mut counts = [0; 4];
    for round in 0..600 {
        let mut shapes = Shapes::default();
        let mut c = || rng.random_range(0..60);
        for i in 0..12 {
            let (x, y) = (c(), c());
            if i % 2 == 0 {
                shapes.push_rect(Rect::new(x, y, x + 1 + c() / 6, y + 1 + c() / 6));
            } else {
                let at = |dx: i32, dy: i32| Point::new(x + dx / 4, y + dy / 4);
                shapes.push_polygon(&[at(0, 0), at(c() + 4, c()), at(c(), c() + 9)]);
            }
        }
        let metric = [Metric::Euclidean, Metric::Square][round % 2];
        let plain = [2, 7][round / 2 % 2];
        let four = Some(4);
        let spacings = Spacings {
            metric,
            side_to_side: four,
            side_to_end: four,
            end_to_end: four,
            corner_to_corner: four,
            ..Spacings::default()
        };
        let layout = of_shapes(shapes);
        let found = run(&layout, &rules(plain, spacings));
        let outline = |shape: u32| match layout.shapes.get(shape) {
            Shape::Rect(rect) => rect.corners().to_vec(),
            Shape::Polygon(points) => points.to_vec(),
        };
        let mut expected = Vec::new();
        let count = found.features.len() as u32;
        for (a, b) in (0..count).flat_map(|a| (a + 1..count).map(move |b| (a, b))) {
            let [own, its] = [a, b].map(|f| found.features.shapes_of(f));
            let is_slanted = own.iter().chain(its).any(|shape| shape % 2 == 1);
            let spacing = if is_slanted { plain } else { 4 };
            let near = |&one: &u32| {
                its.iter().any(|&other| {
                    let (one, other) = (outline(one), outline(other));
                    let (one, other) = (Outline::plain(&one), Outline::plain(&other));
                    match metric {
                        Metric::Euclidean => outlines_closer_than(one, other, spacing),
                        Metric::Square => outlines_closer_than_square(one, other, spacing),
                    }
                })
            };
            let is_close = own.iter().any(near);
            counts[2 * usize::from(is_slanted) + usize::from(is_close)] += 1;
            if is_close {
                expected.push([a, b]);
            }
        }
        assert_eq!(found.instance.edges(), expected);
    }
    assert!(counts.iter().all(|&n| n > 100), "{counts:?}");
}

/// A wire with blocks 5 above it, from 0 to 30 and from 70 on; sides keep 10.
fn wire_with_blocks() -> (Vec<Rect>, Rules) {
    let rects = vec![
        Rect::new(0, 0, 100, 10),
        Rect::new(0, 15, 30, 30),
        Rect::new(70, 15, 100, 30),
    ];
    let mut rules = rules(
        3,
        Spacings {
            side_to_side: Some(10),
            ..Spacings::default()
        },
    );
    rules.stitch.policy = Policy::Uncovered;
    (rects, rules)
}

#[test]
fn fragments_by_the_parts_of_edges_that_they_have() {
    let (rects, mut rules) = wire_with_blocks();
    // The blocks face 0 to 30 and 70 to 100: uncovered from 30 to 70, where an overlap of 40 just fits. Then the
    // left fragment ends at 70, where the right block begins: they share a point and are not close.
    for overlap in [0, 20, 40] {
        rules.stitch.overlap = overlap;
        let found = run(&layout(&rects), &rules);
        let cuts = found.fragments.cuts();
        assert_eq!(cuts.len(), 1);
        assert_eq!(cuts[0].line, Rect::new(50, 0, 50, 10));
        let [left, right] = cuts[0].sides;
        let block = |shape| {
            let is_it = |&f: &u32| found.features.shapes_of(f) == [shape];
            let feature = (0..3).find(is_it).unwrap();
            found.fragments.of_feature(feature).start
        };
        let mut expected = [[left, block(1)], [right, block(2)]].map(|[a, b]| [a.min(b), a.max(b)]);
        expected.sort_unstable();
        let mut edges = found.instance.edges().to_vec();
        edges.sort_unstable();
        assert_eq!(edges, expected);
    }
    rules.stitch.overlap = 42;
    assert!(run(&layout(&rects), &rules).fragments.cuts().is_empty());
}

fn shadows(rects: &[Rect], rules: &Rules) -> Vec<Shadow> {
    let layout = layout(rects);
    let survey = Survey::new(&layout, rules).unwrap();
    let features = run(&layout, rules).features;
    let wire = (0..).find(|&f| features.shapes_of(f) == [0]).unwrap();
    let surveyed = survey.surveyor().look(wire).unwrap().unwrap();
    assert_eq!(surveyed.runs.len(), 1);
    surveyed.runs[0].1.clone()
}

#[test]
fn shadows_of_edges() {
    let (mut rects, rules) = wire_with_blocks();
    let places = |rects: &[Rect]| {
        let found = shadows(rects, &rules).into_iter();
        found.map(|s| [s.from, s.to]).collect::<Vec<_>>()
    };
    // What a cut leaves has to have more than a point of [0, 30] or [70, 100].
    assert_eq!(places(&rects), [[1, 29], [71, 99]]);
    // A pin of unit width covers no place, and takes no candidate away.
    rects.push(Rect::new(45, 15, 46, 30));
    assert_eq!(places(&rects), [[1, 29], [46, 45], [71, 99]]);
    let cuts = run(&layout(&rects), &rules).fragments;
    assert_eq!(cuts.cuts()[0].line, Rect::new(50, 0, 50, 10));
    // What faces the end of the wire, 9 from it, covers that end.
    rects.push(Rect::new(109, 0, 120, 10));
    assert_eq!(places(&rects), [[1, 29], [46, 45], [71, 99], [100, 100]]);
}

#[test]
fn spacings_out_of_range_are_refused() {
    let refused = |change: &dyn Fn(&mut Spacings)| {
        let mut rules = rules(5, Spacings::default());
        change(&mut rules.spacings);
        match extract(&layout(&[Rect::new(0, 0, 1, 1)]), &rules, &|_| ()) {
            Err(ExtractError::Rule { rule, .. }) => rule,
            other => panic!("{other:?}"),
        }
    };
    assert_eq!(refused(&|s| s.side_to_side = Some(0)), "side_to_side");
    assert_eq!(refused(&|s| s.end_to_end = Some(-1)), "end_to_end");
    assert_eq!(refused(&|s| s.end_length = -1), "end_length");
    assert_eq!(refused(&|s| s.any_mask = -1), "any_mask");
    let row = WideSpacing {
        width: 1,
        run_length: 1,
        spacing: 0,
    };
    assert_eq!(refused(&|s| s.wide = vec![row]), "wide spacing");
}
