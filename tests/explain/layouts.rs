//! Repairs tried out on whole layouts: movements on the shapes themselves, cuts by splitting the rectangle.
//!
//! Compared with: extraction and solving of the changed layout as a whole for movements; for cuts distances
//! of rectangles by the closed formula and plain enumeration of colourings.

use maskproof::explain::repair::{Movement, Way};
use maskproof::explain::{Layer, Place};
use maskproof::extract::Extraction;
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{Layout, Policy, Rules, Shape, Shapes};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

use crate::{bounds_of, extracted, places, rules, solved};

pub fn layout(shapes: Shapes) -> Layout {
    Layout {
        top: "top".to_owned(),
        layer: rules(2, 1, [0; 3], Policy::None).layer,
        unit_pm: 1000,
        shapes,
    }
}

/// The least number of conflicts.
pub fn conflicts(layout: &Layout, rules: &Rules) -> u64 {
    let outcomes = solved(&extracted(layout, rules).instance).1;
    let bounds = outcomes.iter().map(|outcome| outcome.conflicts);
    bounds
        .map(|bounds| {
            assert!(bounds.is_tight());
            bounds.lower
        })
        .sum()
}

/// Solves a layout and explains what the search found.
pub fn explained(layout: &Layout, rules: &Rules) -> (Extraction, Vec<Place>) {
    let extraction = extracted(layout, rules);
    let (reduced, outcomes) = solved(&extraction.instance);
    let bounds = bounds_of(&extraction.instance, &reduced, &outcomes);
    let colourings: Vec<&[u8]> = outcomes.iter().map(|found| &found.colouring[..]).collect();
    let merged = maskproof::merge::merge(&extraction.instance, &reduced, &colourings).unwrap();
    let layer = Layer {
        layout,
        rules,
        extraction: &extraction,
    };
    let places = places(
        &extraction.instance,
        Some(layer),
        &merged.colouring,
        &bounds,
    );
    (extraction, places)
}

/// The layout with features moved.
pub fn moved(layout: &Layout, extraction: &Extraction, moves: &[Movement]) -> Layout {
    let mut by = vec![[0, 0]; layout.shapes.len()];
    for movement in moves {
        for &shape in extraction.features.shapes_of(movement.feature) {
            by[shape as usize] = movement.by;
        }
    }
    let mut shapes = Shapes::default();
    for (shape, [dx, dy]) in layout.shapes.iter().zip(by) {
        match shape {
            Shape::Rect(Rect { min, max }) => {
                shapes.push_rect(Rect::new(min.x + dx, min.y + dy, max.x + dx, max.y + dy));
            }
            Shape::Polygon(points) => {
                let points: Vec<Point> = points
                    .iter()
                    .map(|p| Point::new(p.x + dx, p.y + dy))
                    .collect();
                shapes.push_polygon(&points);
            }
        }
    }
    Layout {
        shapes,
        ..layout.clone()
    }
}

/// All movements of the places, each with how many conflicts it saves.
pub fn movements(places: &[Place]) -> Vec<(Vec<Movement>, u64)> {
    let repairs = places.iter().flat_map(|place| &place.repairs);
    repairs
        .filter(|repair| repair.fewer > 0)
        .filter_map(|repair| match &repair.way {
            Way::Move(moves) => Some((moves.clone(), repair.fewer)),
            _ => None,
        })
        .collect()
}

/// Wires and contacts on a coarse grid, some of them joined, some with slanted corners.
fn random_layout(seed: u64) -> Layout {
    let rng = &mut Pcg64::seed_from_u64(seed);
    let mut shapes = Shapes::default();
    let side = rng.random_range(60..110);
    for _ in 0..rng.random_range(6..22) {
        let (x, y) = (rng.random_range(0..side), rng.random_range(0..side));
        let (mut w, mut h) = (rng.random_range(4..9), rng.random_range(4..9));
        match rng.random_range(0..3) {
            0 => w += rng.random_range(10..60),
            1 => h += rng.random_range(10..60),
            _ => {}
        }
        if rng.random_bool(0.1) {
            let corners = [(0, 0), (w, 0), (w, h - 2), (w - 2, h), (0, h)];
            let corners = corners.map(|(dx, dy)| Point::new(x + dx, y + dy));
            shapes.push_polygon(&corners);
        } else {
            shapes.push_rect(Rect::new(x, y, x + w, y + h));
        }
    }
    layout(shapes)
}

#[test]
fn movements_leave_fewer_conflicts_in_the_whole_layout() {
    let (mut tried, mut pairs, mut own) = (0, 0, 0);
    for seed in 0..240 {
        let layout = random_layout(seed);
        let masks = 2 + (seed % 2) as u8;
        let policy = [Policy::None, Policy::Uncovered][(seed / 2 % 2) as usize];
        let rules = rules(masks, 12 + 4 * i32::from(masks), [4, 8, 2], policy);
        let before = conflicts(&layout, &rules);
        let (extraction, places) = explained(&layout, &rules);
        let limits: u64 = places.iter().map(|place| place.core.limit).sum();
        assert!(limits <= before);
        for (moves, fewer) in movements(&places) {
            let after = moved(&layout, &extraction, &moves);
            assert!(
                conflicts(&after, &rules) + fewer <= before,
                "seed {seed}: {moves:?}"
            );
            let count = extracted(&after, &rules).features.len();
            assert_eq!(count, extraction.features.len(), "features stay apart");
            tried += 1;
            pairs += u32::from(moves.len() > 1);
        }
        own += places.iter().map(Place::self_spacings).sum::<usize>();
    }
    println!("{tried} {pairs} {own}");
    assert!(tried > 150 && pairs > 5, "{tried} {pairs}");
}

/// What a movement releases was too close, and is no more; nothing shorter along that axis would do.
#[test]
fn single_movements_are_the_shortest_of_their_direction() {
    let mut tried = 0;
    for seed in 500..620 {
        let layout = random_layout(seed);
        let rules = rules(2, 18, [0; 3], Policy::None);
        let (extraction, places) = explained(&layout, &rules);
        let slanted = |feature: u32| {
            let shapes = extraction.features.shapes_of(feature);
            shapes
                .iter()
                .any(|&s| matches!(layout.shapes.get(s), Shape::Polygon(_)))
        };
        for place in &places {
            for repair in &place.repairs {
                let Way::Move(moves) = &repair.way else {
                    continue;
                };
                let ([movement], [unit]) = (&moves[..], &repair.units[..]) else {
                    continue;
                };
                let spacing = place.spacings.iter().find(|s| s.unit == *unit).unwrap();
                if spacing.features.into_iter().any(slanted) {
                    continue;
                }
                let other = spacing
                    .features
                    .into_iter()
                    .find(|&f| f != movement.feature)
                    .unwrap();
                let rects = |feature: u32| -> Vec<Rect> {
                    let shapes = extraction.features.shapes_of(feature).iter();
                    shapes
                        .map(|&s| match layout.shapes.get(s) {
                            Shape::Rect(rect) => rect,
                            Shape::Polygon(_) => panic!("slanted"),
                        })
                        .collect()
                };
                let length = movement.by[0].abs() + movement.by[1].abs();
                let step = movement.by.map(i32::signum);
                let is_close = |d: i32| {
                    rects(movement.feature).iter().any(|a| {
                        let a = Rect::new(
                            a.min.x + step[0] * d,
                            a.min.y + step[1] * d,
                            a.max.x + step[0] * d,
                            a.max.y + step[1] * d,
                        );
                        rects(other).iter().any(|b| squared(&a, b) < 18 * 18)
                    })
                };
                assert!((0..length).all(is_close) && !is_close(length));
                tried += 1;
            }
        }
    }
    assert!(tried > 100, "{tried}");
}

/// The squared distance of two rectangles.
fn squared(a: &Rect, b: &Rect) -> i64 {
    let gap = |a0: i32, a1: i32, b0: i32, b1: i32| i64::from((b0 - a1).max(a0 - b1).max(0));
    gap(a.min.x, a.max.x, b.min.x, b.max.x).pow(2) + gap(a.min.y, a.max.y, b.min.y, b.max.y).pow(2)
}

/// The least number of pairs of rectangles, of different features, closer than the spacing on one mask.
fn least(rects: &[(usize, Rect)], features: usize, masks: u8, spacing: i64) -> u64 {
    let mut close = Vec::new();
    for (i, (f, a)) in rects.iter().enumerate() {
        for (j, (g, b)) in rects.iter().enumerate().take(i) {
            if f != g && squared(a, b) < spacing * spacing {
                close.push((i, j, f.min(g) * features + f.max(g)));
            }
        }
    }
    let mut best = u64::MAX;
    for code in 0..u64::from(masks).pow(rects.len() as u32) {
        let mask = |i: usize| code / u64::from(masks).pow(i as u32) % u64::from(masks);
        let same = close.iter().filter(|(i, j, _)| mask(*i) == mask(*j));
        let violated: std::collections::BTreeSet<usize> = same.map(|(.., pair)| *pair).collect();
        best = best.min(violated.len() as u64);
    }
    best
}

/// A wire and four around it that close an odd cycle over it, their places, lengths and gaps random; in half of
/// the layouts something more near the wire, in half of them mirrored at the line x = y.
fn ring(seed: u64) -> Vec<Rect> {
    let rng = &mut Pcg64::seed_from_u64(seed);
    let length = rng.random_range(60..200);
    let mut gap = || rng.random_range(4..11);
    let (b, c, d, e, between) = (10 + gap(), 10 + gap(), gap(), gap(), gap());
    let left = rng.random_range(0..length / 3);
    let right = rng.random_range(length / 2..length);
    let top = (b.max(c)) + 20;
    let middle = rng.random_range(left + 5..right + 5);
    let mut rects = vec![
        Rect::new(0, 0, length, 10),
        Rect::new(left, b, left + rng.random_range(8..20), top),
        Rect::new(right, c, right + 10, top),
        Rect::new(left, top + d, middle, top + d + 8),
        Rect::new(middle + between, top + e, right + 10, top + e + 8),
    ];
    if rng.random_bool(0.5) {
        let x = rng.random_range(0..length);
        rects.push(Rect::new(
            x,
            -20,
            x + rng.random_range(5..60),
            rng.random_range(-12..-4),
        ));
    }
    if rng.random_bool(0.5) {
        rects = rects.iter().map(Rect::transposed).collect();
    }
    rects
}

fn are_apart(rects: &[Rect]) -> bool {
    let touch = |(i, a): (usize, &Rect)| rects[..i].iter().any(|b| squared(a, b) == 0);
    let flat = |rect: &Rect| rect.width() <= 0 || rect.height() <= 0;
    !rects.iter().enumerate().any(touch) && !rects.iter().any(flat)
}

/// The two parts of a rectangle cut at a line, with half the overlap each.
fn parts(rect: Rect, line: Rect, half: i32) -> [Rect; 2] {
    let (mut low, mut high) = (rect, rect);
    if line.min.x == line.max.x {
        (low.max.x, high.min.x) = (line.min.x + half, line.min.x - half);
    } else {
        (low.max.y, high.min.y) = (line.min.y + half, line.min.y - half);
    }
    [low, high]
}

/// A stitch that is said to help does, and where none is said to help, no cut at any place of the grid
/// does.
#[test]
fn stitches_help_where_they_are_said_to_and_nowhere_else() {
    let (mut help, mut no_help) = (0, 0);
    for seed in 0..300 {
        let rects = ring(seed);
        if !are_apart(&rects) {
            continue;
        }
        let overlap = [0, 4, 30, 60][(seed % 4) as usize];
        let mut shapes = Shapes::default();
        for &rect in &rects {
            shapes.push_rect(rect);
        }
        let (masks, spacing) = (2, 12);
        let rules = rules(masks, spacing, [overlap, 0, 0], Policy::None);
        let (extraction, places) = explained(&layout(shapes), &rules);
        let boxes: Vec<(usize, Rect)> = (0..rects.len())
            .map(|f| (f, extraction.features.box_of(f as u32)))
            .collect();
        let cut = |line: Rect, feature: usize, overlap: i32| {
            let mut cut = boxes.clone();
            let [low, high] = parts(boxes[feature].1, line, overlap / 2);
            cut[feature].1 = low;
            cut.push((feature, high));
            least(&cut, boxes.len(), masks, i64::from(spacing))
        };
        let before = least(&boxes, boxes.len(), masks, i64::from(spacing));
        for place in &places {
            // The core is all there is: then places that are alike for it are alike for the layout.
            let is_whole = place.core.limit == before
                && place.core.units.len() == extraction.instance.unit_count();
            for feature in &place.features {
                let number = feature.number as usize;
                let said = place.repairs.iter().find_map(|repair| match &repair.way {
                    Way::Stitch(at) if at.feature == feature.number => Some((at.line, at.overlap)),
                    _ => None,
                });
                if let Some((line, overlap)) = said {
                    assert!(cut(line, number, overlap) < before, "seed {seed}: {line:?}");
                    help += 1;
                } else if is_whole {
                    let area = boxes[number].1;
                    let lines: Vec<Rect> = if area.width() > area.height() {
                        let places = area.min.x + 1..area.max.x;
                        places
                            .map(|x| Rect::new(x, area.min.y, x, area.max.y))
                            .collect()
                    } else if area.height() > area.width() {
                        let places = area.min.y + 1..area.max.y;
                        places
                            .map(|y| Rect::new(area.min.x, y, area.max.x, y))
                            .collect()
                    } else {
                        Vec::new()
                    };
                    for line in lines {
                        assert!(
                            cut(line, number, overlap) >= before,
                            "seed {seed}: {line:?}"
                        );
                        assert!(cut(line, number, 0) >= before, "seed {seed}: {line:?}");
                    }
                    no_help += 1;
                }
            }
        }
    }
    assert!(help > 40 && no_help > 20, "{help} {no_help}");
}
