//! Legal places, by hand and place by place.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::geometry::distance::outlines_closer_than;
use crate::layout::Shapes;
use rand::{Rng, SeedableRng};

/// A run along x from 0 to 100, y from 0 to 10, between two line ends.
fn run(direction: Direction) -> Run {
    Run {
        direction,
        from: 0,
        to: 100,
        low: 0,
        high: 10,
        ends: [End::Line; 2],
    }
}

fn rules(overlap: i32, fragment_length: i32, corner: i32) -> StitchRules {
    StitchRules {
        overlap,
        fragment_length,
        corner,
        ..StitchRules::default()
    }
}

fn kept(shapes: &Shapes, direction: Direction, half: i32, distance: i32, metric: Metric) -> Legal {
    let run = run(direction);
    let mut legal = Legal::between_ends(&run, &rules(2 * half, 0, 0));
    let parts = Parts::new(shapes).unwrap();
    legal.keep_off(&run, half, &parts, distance, metric);
    legal
}

#[test]
fn ends_leave_one_stretch() {
    let run = run(Direction::Horizontal);
    let at = |run: &Run, rules: &StitchRules| Legal::between_ends(run, rules).0;
    assert_eq!(at(&run, &rules(8, 20, 6)), [[20, 80]]);
    // Half the overlap stays on the run; the cut line is strictly inside.
    assert_eq!(at(&run, &rules(60, 20, 6)), [[30, 70]]);
    assert_eq!(at(&run, &rules(0, 0, 0)), [[1, 99]]);
    assert_eq!(at(&run, &rules(0, 51, 0)), [[0; 2]; 0]);
    let bent = Run {
        ends: [End::Junction, End::Line],
        ..run
    };
    assert_eq!(at(&bent, &rules(8, 20, 6)), [[10, 80]]);
}

#[test]
fn a_contact_takes_its_shadow_away() {
    // 3 across: 4 along is exactly 5, and half the overlap is 2: 40 - 3 - 2 to 50 + 3 + 2 are too close.
    let mut shapes = Shapes::default();
    shapes.push_rect(Rect::new(40, 13, 50, 20));
    let round = kept(&shapes, Direction::Horizontal, 2, 5, Metric::Euclidean);
    assert_eq!(round.0, [[2, 34], [56, 98]]);
    let square = kept(&shapes, Direction::Horizontal, 2, 5, Metric::Square);
    assert_eq!(square.0, [[2, 33], [57, 98]]);
    assert_eq!(
        kept(&shapes, Direction::Horizontal, 2, 3, Metric::Square).0,
        [[2, 98]]
    );
    // A slanted edge along x + y = 118: with y below 10 + 5, x is above 103, which the end of the overlap, t + 1,
    // comes within 5 of from 98 on; with 6, x is above 102, and t + 7 too from 96 on.
    let mut shapes = Shapes::default();
    shapes.push_polygon(&[Point::new(98, 20), Point::new(110, 8), Point::new(110, 20)]);
    let near = |distance| kept(&shapes, Direction::Horizontal, 1, distance, Metric::Square).0;
    assert_eq!(near(5), [[1, 97]]);
    assert_eq!(near(6), [[1, 95]]);
}

#[test]
fn questions_agree_with_the_stretches() {
    let legal = Legal(vec![[3, 5], [9, 9], [12, 20]]);
    let is_in = |t: i32| (3..=5).contains(&t) || t == 9 || (12..=20).contains(&t);
    for t in 0..25 {
        assert_eq!(legal.contains(t), is_in(t));
        assert_eq!(legal.first_from(t.into()), (t..25).find(|&t| is_in(t)));
        assert_eq!(
            legal.last_up_to(t.into()),
            (0..=t).rev().find(|&t| is_in(t))
        );
        assert_eq!(legal.mirrored().contains(-t), is_in(t));
    }
}

#[test]
fn triangles_and_rectangles_agree_with_every_place() {
    let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(5);
    for _ in 0..2_000 {
        let mut shapes = Shapes::default();
        let mut outlines = Vec::new();
        for _ in 0..rng.random_range(1..3) {
            let is_rect = rng.random();
            let mut point = || Point::new(rng.random_range(-60..160), rng.random_range(-60..70));
            let outline = if is_rect {
                let (a, b) = (point(), point());
                Rect::new(
                    a.x.min(b.x),
                    a.y.min(b.y),
                    a.x.max(b.x) + 1,
                    a.y.max(b.y) + 1,
                )
                .corners()
                .to_vec()
            } else {
                vec![point(), point(), point()]
            };
            if crate::geometry::outline::doubled_area(&outline) != 0 {
                shapes.push_polygon(&outline);
                outlines.push(outline);
            }
        }
        let (half, distance) = (rng.random_range(0..6), rng.random_range(1..30));
        for direction in [Direction::Horizontal, Direction::Vertical] {
            let legal = kept(&shapes, direction, half, distance, Metric::Euclidean);
            for t in 1.max(half)..=99.min(100 - half) {
                let overlap = direction
                    .turn(Rect::new(t - half, 0, t + half, 10))
                    .corners();
                let close = outlines.iter().any(|outline| {
                    outlines_closer_than(
                        Outline::plain(&overlap),
                        Outline::plain(outline),
                        distance,
                    )
                });
                assert_eq!(
                    legal.contains(t),
                    !close,
                    "{t} {half} {distance} {outlines:?}"
                );
            }
        }
    }
}
