//! Features and conflict pairs against plain methods: a raster for what runs along the axes, all
//! pairs of shapes for any angle.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use maskproof::extract::{ExtractError, Extraction, Progress, Step, extract};
use maskproof::geometry::distance::{Outline, outlines_closer_than, outlines_touch};
use maskproof::geometry::winding::encloses;
use maskproof::geometry::{COORDINATE_LIMIT, Point, Rect};
use maskproof::layout::{LayerId, Layout, Policy, Rules, Shape, Shapes, StitchRules};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;
use std::cell::RefCell;
use std::collections::BTreeSet;

fn rules(spacing: i32) -> Rules {
    Rules {
        layer: LayerId {
            layer: 1,
            datatype: 0,
        },
        masks: 3,
        spacing,
        stitch: StitchRules {
            policy: Policy::None,
            overlap: 0,
            fragment_length: 0,
            corner: 0,
            weight: 1,
            ..StitchRules::default()
        },
        spacings: Default::default(),
        hand: Default::default(),
    }
}

fn layout(shapes: Shapes) -> Layout {
    Layout {
        top: "top".into(),
        layer: LayerId {
            layer: 1,
            datatype: 0,
        },
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    }
}

fn run(shapes: &Shapes, spacing: i32) -> Extraction {
    extract(&layout(shapes.clone()), &rules(spacing), &|_| ()).unwrap()
}

fn outline(shape: Shape<'_>) -> Vec<Point> {
    match shape {
        Shape::Rect(rect) => rect.corners().to_vec(),
        Shape::Polygon(vertices) => vertices.to_vec(),
    }
}

/// Features as sets of shapes, from the answer "do these two hang together".
fn components(count: usize, joined: impl Fn(usize, usize) -> bool) -> BTreeSet<Vec<u32>> {
    let mut part: Vec<usize> = (0..count).collect();
    for a in 0..count {
        for b in 0..a {
            if part[a] != part[b] && joined(a, b) {
                let (old, new) = (part[a], part[b]);
                part.iter_mut()
                    .filter(|p| **p == old)
                    .for_each(|p| *p = new);
            }
        }
    }
    (0..count)
        .map(|p| {
            (0..count as u32)
                .filter(|&i| part[i as usize] == p)
                .collect()
        })
        .filter(|set: &Vec<u32>| !set.is_empty())
        .collect()
}

/// Checks an extraction against the truth about any two shapes.
fn check(
    found: &Extraction,
    count: usize,
    joined: impl Fn(usize, usize) -> bool,
    close: impl Fn(usize, usize) -> bool,
) {
    let features = &found.features;
    let sets: BTreeSet<Vec<u32>> = (0..features.len() as u32)
        .map(|f| features.shapes_of(f).to_vec())
        .collect();
    assert_eq!(sets, components(count, joined));
    let mut expected = Vec::new();
    for a in 0..features.len() as u32 {
        for b in a + 1..features.len() as u32 {
            let near = |&s: &u32| {
                features
                    .shapes_of(b)
                    .iter()
                    .any(|&t| close(s as usize, t as usize))
            };
            if features.shapes_of(a).iter().any(near) {
                expected.push([a, b]);
            }
        }
    }
    assert_eq!(found.instance.edges(), expected);
    assert_eq!(found.instance.pair_count(), expected.len());
}

const SIZE: i32 = 48;

/// The unit cells that a shape covers.
fn raster(outline: &[Point]) -> Vec<(i32, i32)> {
    let doubled: Vec<Point> = outline
        .iter()
        .map(|p| Point::new(2 * p.x, 2 * p.y))
        .collect();
    (0..SIZE)
        .flat_map(|y| (0..SIZE).map(move |x| (x, y)))
        .filter(|&(x, y)| encloses(&doubled, Point::new(2 * x + 1, 2 * y + 1)))
        .collect()
}

fn least_squared_gap(a: &[(i32, i32)], b: &[(i32, i32)]) -> i32 {
    let axis = |p: i32, q: i32| ((p - q).abs() - 1).max(0);
    a.iter()
        .flat_map(|&(ax, ay)| {
            b.iter()
                .map(move |&(bx, by)| axis(ax, bx).pow(2) + axis(ay, by).pow(2))
        })
        .min()
        .unwrap_or(i32::MAX)
}

/// A rectangle, an L or a ring.
fn push_random(shapes: &mut Shapes, rng: &mut Pcg64Mcg) {
    let (x, y) = (
        rng.random_range(0..SIZE - 12),
        rng.random_range(0..SIZE - 12),
    );
    let (w, h) = (rng.random_range(3..9), rng.random_range(3..9));
    let (x1, y1) = (x + w, y + h);
    let (xm, ym) = (rng.random_range(x + 1..x1), rng.random_range(y + 1..y1));
    let corners: &[(i32, i32)] = match rng.random_range(0..4) {
        0 | 1 => &[(x, y), (x1, y), (x1, y1), (x, y1)],
        2 => &[(x, y), (x1, y), (x1, ym), (xm, ym), (xm, y1), (x, y1)],
        _ => &[
            (x, y),
            (x1, y),
            (x1, y1),
            (x, y1),
            (x, y + 1),
            (x + 1, y + 1),
            (x + 1, y1 - 1),
            (x1 - 1, y1 - 1),
            (x1 - 1, y + 1),
            (x, y + 1),
        ],
    };
    let vertices: Vec<Point> = corners.iter().map(|&(x, y)| Point::new(x, y)).collect();
    shapes.push_polygon(&vertices);
}

#[test]
fn axis_parallel_layouts_agree_with_a_raster() {
    let mut rng = Pcg64Mcg::seed_from_u64(11);
    for round in 0..400 {
        let mut shapes = Shapes::default();
        for _ in 0..rng.random_range(1..20) {
            push_random(&mut shapes, &mut rng);
            if rng.random_bool(0.1) {
                let again = outline(shapes.get(shapes.len() as u32 - 1));
                shapes.push_polygon(&again);
            }
        }
        let cells: Vec<_> = shapes.iter().map(|s| raster(&outline(s))).collect();
        let count = shapes.len();
        let gap: Vec<Vec<i32>> = (0..count)
            .map(|a| {
                (0..count)
                    .map(|b| least_squared_gap(&cells[a], &cells[b]))
                    .collect()
            })
            .collect();
        let spacing = rng.random_range(1..9);
        let found = run(&shapes, spacing);
        check(
            &found,
            count,
            |a, b| gap[a][b] == 0,
            |a, b| gap[a][b] < spacing * spacing,
        );
        for feature in 0..found.features.len() as u32 {
            let covered: BTreeSet<(i32, i32)> = (found.features.shapes_of(feature).iter())
                .flat_map(|&shape| cells[shape as usize].iter().copied())
                .collect();
            assert_eq!(
                found.instance.area(feature),
                covered.len() as u64,
                "{round}"
            );
        }
    }
}

#[test]
fn slanted_layouts_agree_with_all_pairs_of_shapes() {
    let mut rng = Pcg64Mcg::seed_from_u64(12);
    for _ in 0..300 {
        let mut shapes = Shapes::default();
        for _ in 0..rng.random_range(1..30) {
            if rng.random_bool(0.3) {
                push_random(&mut shapes, &mut rng);
                continue;
            }
            let (x, y) = (rng.random_range(0..90), rng.random_range(0..90));
            let mut c = |from| from + rng.random_range(0..14);
            // Twice the area of a triangle of three such corners is zero for lines only.
            let triangle = [0; 3].map(|_| Point::new(c(x), c(y)));
            if outlines_area_is_positive(&triangle) {
                shapes.push_polygon(&triangle);
            }
        }
        let outlines: Vec<_> = shapes.iter().map(outline).collect();
        let plain = |shape: usize| Outline::plain(&outlines[shape]);
        let spacing = rng.random_range(1..12);
        check(
            &run(&shapes, spacing),
            shapes.len(),
            |a, b| outlines_touch(plain(a), plain(b)),
            |a, b| outlines_closer_than(plain(a), plain(b), spacing),
        );
    }
}

fn outlines_area_is_positive(t: &[Point; 3]) -> bool {
    (t[1].x - t[0].x) * (t[2].y - t[0].y) != (t[1].y - t[0].y) * (t[2].x - t[0].x)
}

/// Long rails across small squares: what uniform grids are bad at.
#[test]
fn random_rectangles_agree_with_all_pairs() {
    let mut rng = Pcg64Mcg::seed_from_u64(13);
    for _ in 0..20 {
        let mut shapes = Shapes::default();
        let rects: Vec<Rect> = (0..600)
            .map(|i| {
                let (x, y) = (rng.random_range(-3000..3000), rng.random_range(-3000..3000));
                let (w, h) = if i % 40 == 0 { (4000, 8) } else { (20, 20) };
                Rect::new(x, y, x + w, y + h)
            })
            .collect();
        rects.iter().for_each(|&rect| shapes.push_rect(rect));
        let gap = |a: usize, b: usize| {
            let (a, b) = (rects[a], rects[b]);
            let axis =
                |a0: i32, a1: i32, b0: i32, b1: i32| i64::from((b0 - a1).max(a0 - b1).max(0));
            let dx = axis(a.min.x, a.max.x, b.min.x, b.max.x);
            let dy = axis(a.min.y, a.max.y, b.min.y, b.max.y);
            dx * dx + dy * dy
        };
        let spacing = rng.random_range(1..300);
        let limit = i64::from(spacing) * i64::from(spacing);
        check(
            &run(&shapes, spacing),
            rects.len(),
            |a, b| gap(a, b) == 0,
            |a, b| gap(a, b) < limit,
        );
    }
}

/// A slanted star of many edges, which goes through an index: points on, in and around it.
#[test]
fn a_star_of_many_edges_agrees_with_all_pairs_of_shapes() {
    let mut rng = Pcg64Mcg::seed_from_u64(16);
    for _ in 0..20 {
        // Teeth along a slanted line, and back below it.
        let tooth = |i: i32| [(20 * i, 3 * i), (20 * i + 7, 3 * i + 30)];
        let back = [(1000, 100), (500, 20), (0, -20)];
        let corners = (0..50).flat_map(tooth).chain(back);
        let mut shapes = Shapes::default();
        shapes.push_polygon(&corners.map(|(x, y)| Point::new(x, y)).collect::<Vec<_>>());
        for _ in 0..60 {
            let (x, y) = (rng.random_range(0..1000), rng.random_range(-40..200));
            let (w, h) = (rng.random_range(1..6), rng.random_range(1..6));
            shapes.push_rect(Rect::new(x, y, x + w, y + h));
        }
        let outlines: Vec<_> = shapes.iter().map(outline).collect();
        let plain = |shape: usize| Outline::plain(&outlines[shape]);
        let spacing = rng.random_range(1..12);
        check(
            &run(&shapes, spacing),
            shapes.len(),
            |a, b| outlines_touch(plain(a), plain(b)),
            |a, b| outlines_closer_than(plain(a), plain(b), spacing),
        );
    }
}

/// Stacks of repeated, nested and barely separate shapes: minutes where each pair of shapes is looked at.
#[test]
fn stacks_of_shapes_stay_near_linear() {
    let mut shapes = Shapes::default();
    for i in 0..50_000 {
        shapes.push_rect(Rect::new(0, 0, 50, 50));
        shapes.push_rect(Rect::new(90, 0, 140, 50));
        shapes.push_rect(Rect::new(-i, 1000 - i, i + 10, 1000 + i + 10).transposed());
    }
    let found = run(&shapes, 41);
    assert_eq!(found.features.len(), 1, "the largest one covers all");
    let mut shapes = Shapes::default();
    for _ in 0..50_000 {
        shapes.push_rect(Rect::new(0, 0, 50, 50));
        shapes.push_rect(Rect::new(90, 0, 140, 50));
    }
    let found = run(&shapes, 41);
    assert_eq!(found.features.len(), 2);
    assert_eq!(found.instance.edges(), [[0, 1]]);
}

#[test]
fn corners_three_four_apart() {
    let mut shapes = Shapes::default();
    shapes.push_rect(Rect::new(0, 0, 10, 10));
    shapes.push_rect(Rect::new(13, 14, 20, 20));
    assert_eq!(run(&shapes, 5).instance.pair_count(), 0);
    assert_eq!(run(&shapes, 6).instance.pair_count(), 1);
}

#[test]
fn a_shared_corner_connects_and_a_unit_gap_does_not() {
    let mut shapes = Shapes::default();
    shapes.push_rect(Rect::new(0, 0, 10, 10));
    shapes.push_rect(Rect::new(10, 10, 20, 20));
    shapes.push_rect(Rect::new(21, 0, 30, 30));
    let found = run(&shapes, 1);
    assert_eq!(found.features.len(), 2);
    assert_eq!(
        found.instance.pair_count(),
        0,
        "a gap of exactly the spacing"
    );
}

#[test]
fn islands_of_one_shape_are_one_feature() {
    // Two squares joined by a line of no width.
    let vertices = [
        (0, 0),
        (4, 0),
        (4, 2),
        (9, 2),
        (9, 0),
        (13, 0),
        (13, 4),
        (9, 4),
        (9, 2),
        (4, 2),
        (4, 4),
        (0, 4),
    ];
    let vertices = vertices.map(|(x, y)| Point::new(x, y));
    let mut shapes = Shapes::default();
    shapes.push_polygon(&vertices);
    let found = run(&shapes, 3);
    assert_eq!(found.features.len(), 1);
    assert_eq!(found.instance.area(0), 32);
}

#[test]
fn shapes_without_area_are_named() {
    let mut shapes = Shapes::default();
    let line = |points: &[(i32, i32)]| -> Vec<Point> {
        points.iter().map(|&(x, y)| Point::new(x, y)).collect()
    };
    shapes.push_polygon(&line(&[(0, 0), (9, 0), (4, 0)]));
    shapes.push_rect(Rect::new(0, 0, 2, 2));
    shapes.push_polygon(&line(&[(0, 0), (9, 9), (4, 4)]));
    shapes.push_rect(Rect::new(8, 0, 9, 2));
    let found = run(&shapes, 2);
    assert_eq!(found.empty_shapes, [0, 2]);
    assert_eq!(found.features.len(), 2, "lines connect nothing");
}

#[test]
fn numbers_are_spatial_and_do_not_depend_on_the_order_of_shapes() {
    let mut rng = Pcg64Mcg::seed_from_u64(14);
    let mut rects: Vec<Rect> = (0..500)
        .map(|_| {
            let (x, y) = (rng.random_range(0..4000), rng.random_range(0..4000));
            Rect::new(x, y, x + 30, y + 30)
        })
        .collect();
    let build = |rects: &[Rect]| {
        let mut shapes = Shapes::default();
        rects.iter().for_each(|&rect| shapes.push_rect(rect));
        run(&shapes, 100)
    };
    let first = build(&rects);
    rects.reverse();
    let second = build(&rects);
    assert_eq!(first.instance, second.instance);
    for feature in 0..first.features.len() as u32 {
        assert_eq!(
            first.features.box_of(feature),
            second.features.box_of(feature)
        );
    }
}

#[test]
fn any_number_of_threads_gives_the_same() {
    let mut rng = Pcg64Mcg::seed_from_u64(15);
    let mut shapes = Shapes::default();
    for _ in 0..3000 {
        let (x, y) = (rng.random_range(0..9000), rng.random_range(0..9000));
        shapes.push_rect(Rect::new(x, y, x + 50, y + 50));
    }
    let in_pool = |threads| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| run(&shapes, 150))
    };
    let (one, four) = (in_pool(1), in_pool(4));
    assert_eq!(one.instance, four.instance);
    assert_eq!(one.features, four.features);
}

#[test]
fn bad_rules_and_coordinates_are_refused() {
    let mut shapes = Shapes::default();
    shapes.push_rect(Rect::new(0, 0, COORDINATE_LIMIT + 1, 5));
    let far = extract(&layout(shapes), &rules(5), &|_| ()).unwrap_err();
    assert_eq!(
        far,
        ExtractError::OutOfRange {
            shape: 0,
            x: COORDINATE_LIMIT + 1,
            y: 5
        }
    );
    let refused = |change: fn(&mut Rules)| {
        let mut rules = rules(5);
        change(&mut rules);
        match extract(&layout(Shapes::default()), &rules, &|_| ()) {
            Err(ExtractError::Rule { rule, .. }) => rule,
            other => panic!("{other:?}"),
        }
    };
    assert_eq!(refused(|r| r.spacing = 0), "spacing");
    assert_eq!(refused(|r| r.masks = 9), "masks");
    assert_eq!(refused(|r| r.stitch.overlap = 3), "overlap");
    assert_eq!(refused(|r| r.stitch.weight = 0), "weight");
}

#[test]
fn an_empty_layer_is_an_empty_instance() {
    let found = run(&Shapes::default(), 5);
    assert_eq!(found.features.len(), 0);
    assert_eq!(found.instance.fragment_count(), 0);
}

#[test]
fn the_whole_coordinate_range_works() {
    let l = COORDINATE_LIMIT;
    let mut shapes = Shapes::default();
    for (x, y) in [(-l, -l), (l - 1, -l), (-l, l - 1), (l - 1, l - 1)] {
        shapes.push_rect(Rect::new(x, y, x + 1, y + 1));
    }
    assert_eq!(
        run(&shapes, i32::MAX).instance.pair_count(),
        4,
        "the diagonals are farther"
    );
    assert_eq!(run(&shapes, 1).instance.pair_count(), 0);
}

#[test]
fn progress_ends_with_everything_done() {
    let mut shapes = Shapes::default();
    shapes.push_rect(Rect::new(0, 0, 2, 2));
    shapes.push_rect(Rect::new(0, 0, 2, 2));
    let seen = RefCell::new(Vec::new());
    extract(&layout(shapes), &rules(5), &|progress| {
        seen.borrow_mut().push(progress)
    })
    .unwrap();
    let seen = seen.into_inner();
    for (step, total) in [(Step::Merging, 2), (Step::Pairs, 1)] {
        let last = seen.iter().rev().find(|p| p.step == step);
        assert_eq!(
            last,
            Some(&Progress {
                step,
                done: total,
                total
            })
        );
    }
    assert!(seen.windows(2).all(|two| two[0].step <= two[1].step));
}
