//! Movements tried out on the shapes of whole layouts.
//!
//! Compared with: extraction and solving of the changed layout as a whole; distances of rectangles by the
//! closed formula.

use maskproof::explain::repair::{Movement, Way};
use maskproof::explain::{Bound, Layer, Place};
use maskproof::extract::Extraction;
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{Layout, Policy, Rules, Shape, Shapes};
use rand::seq::SliceRandom;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

use crate::{bounds_of, extracted, places, rules, solved};

pub fn layout(shapes: Shapes) -> Layout {
    Layout {
        top: "top".to_owned(),
        layer: rules(2, 1, [0; 3], Policy::None).layer,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
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
pub fn squared(a: &Rect, b: &Rect) -> i64 {
    let gap = |a0: i32, a1: i32, b0: i32, b1: i32| i64::from((b0 - a1).max(a0 - b1).max(0));
    gap(a.min.x, a.max.x, b.min.x, b.max.x).pow(2) + gap(a.min.y, a.max.y, b.min.y, b.max.y).pow(2)
}

/// Certificates order units for the counter of the proof, not for explanations.
#[test]
fn the_order_of_the_units_of_a_bound_does_not_matter() {
    let mut compared = 0;
    for seed in 700..860 {
        let layout = random_layout(seed);
        let rules = rules(2 + (seed % 2) as u8, 18, [4, 8, 2], Policy::None);
        let extraction = extracted(&layout, &rules);
        let (reduced, outcomes) = solved(&extraction.instance);
        let colourings: Vec<&[u8]> = outcomes.iter().map(|found| &found.colouring[..]).collect();
        let merged = maskproof::merge::merge(&extraction.instance, &reduced, &colourings).unwrap();
        let layer = Layer {
            layout: &layout,
            rules: &rules,
            extraction: &extraction,
        };
        let bounds = bounds_of(&extraction.instance, &reduced, &outcomes);
        let mut shuffled = bounds.clone();
        for bound in &mut shuffled {
            bound.units.shuffle(&mut Pcg64::seed_from_u64(seed));
        }
        let explained = |bounds: &[Bound]| {
            let layer = Some(layer);
            places(&extraction.instance, layer, &merged.colouring, bounds)
        };
        for (one, other) in explained(&bounds).iter().zip(explained(&shuffled)) {
            assert!(one.core.units.is_sorted() && other.core.units.is_sorted());
            // In a larger bound another core may be found.
            if one.core.units == other.core.units {
                assert_eq!(one.repairs, other.repairs, "seed {seed}");
                compared += 1;
            }
        }
    }
    assert!(compared > 40, "{compared}");
}
