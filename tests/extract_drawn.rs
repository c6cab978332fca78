//! Drawings as colourings, against a raster of unit cells and every colouring of the fragments.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use encodings::{InstanceBuilder, Mask};
use maskproof::extract::drawn::{colouring, error::DrawnError};
use maskproof::extract::{Extraction, extract};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::fragments::FragmentsBuilder;
use maskproof::layout::{Cut, Features, LayerId, Layout, Policy, Rules, Shapes, StitchRules};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;
use std::collections::BTreeSet;

const MASKS: u8 = 2;

fn rules(policy: Policy, overlap: i32) -> Rules {
    Rules {
        layer: LayerId {
            layer: 1,
            datatype: 0,
        },
        masks: MASKS,
        spacing: 4,
        stitch: StitchRules {
            policy,
            overlap,
            fragment_length: 1,
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
        layer: rules(Policy::None, 0).layer,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    }
}

fn sheet(rects: &[Rect]) -> Shapes {
    let mut shapes = Shapes::default();
    rects.iter().for_each(|&rect| shapes.push_rect(rect));
    shapes
}

type Cells = BTreeSet<(i32, i32)>;

fn raster(rects: &[Rect]) -> Cells {
    let cells = rects.iter().flat_map(|r| {
        (r.min.y..r.max.y).flat_map(move |y| (r.min.x..r.max.x).map(move |x| (x, y)))
    });
    cells.collect()
}

/// What a colouring draws on a mask, from the definition: fragments, and overlaps at stitches.
fn drawn(rects: &[Rect], found: &Extraction, colours: &[Mask], mask: Mask) -> Vec<Rect> {
    let fragments = &found.fragments;
    let mut on = Vec::new();
    for fragment in 0..fragments.len() as u32 {
        if colours[fragment as usize] != mask {
            continue;
        }
        let feature = found.instance.feature_of(fragment);
        if fragments.of_feature(feature).len() == 1 {
            let shapes = found.features.shapes_of(feature).iter();
            on.extend(shapes.map(|&shape| rects[shape as usize]));
        }
        on.extend(fragments.cells_of(fragment));
        for cut in fragments
            .cuts()
            .iter()
            .filter(|cut| cut.sides.contains(&fragment))
        {
            let [a, b] = cut.sides.map(|side| colours[side as usize]);
            if a != b {
                let (line, half) = (cut.line, fragments.half_overlap());
                let (dx, dy) = match line.min.x == line.max.x {
                    true => (half, 0),
                    false => (0, half),
                };
                let (min, max) = (line.min, line.max);
                on.push(Rect::new(min.x - dx, min.y - dy, max.x + dx, max.y + dy));
            }
        }
    }
    on
}

fn colourings(fragments: usize) -> impl Iterator<Item = Vec<Mask>> {
    (0u32..1 << fragments)
        .map(move |bits| (0..fragments).map(|i| (bits >> i & 1) as Mask).collect())
}

fn random_rects(rng: &mut Pcg64Mcg) -> Vec<Rect> {
    // A long bar under short ones has candidates between them.
    let long = Rect::new(0, 0, 36, rng.random_range(1..3));
    let others: Vec<Rect> = (0..rng.random_range(0..5))
        .map(|_| {
            let (x, y) = (rng.random_range(0..34), rng.random_range(0..12));
            match rng.random_bool(0.5) {
                true => Rect::new(x, y, x + rng.random_range(1..8), y + rng.random_range(1..3)),
                false => Rect::new(
                    x,
                    y,
                    x + rng.random_range(1..3),
                    y + rng.random_range(2..10),
                ),
            }
        })
        .collect();
    others.into_iter().chain([long]).collect()
}

/// Draws rectangles otherwise: in two, or with a part of them twice.
fn redrawn(rng: &mut Pcg64Mcg, rects: Vec<Rect>) -> Vec<Rect> {
    let mut drawn = Vec::new();
    // Overlaps of no length draw nothing.
    for rect in rects
        .into_iter()
        .filter(|rect| rect.width() > 0 && rect.height() > 0)
    {
        let middle = rng.random_range(rect.min.x..rect.max.x);
        let (left, right) = (rect.min.x, rect.max.x);
        let until = (middle + rng.random_range(1..3)).min(right);
        drawn.push(Rect::new(left, rect.min.y, until, rect.max.y));
        drawn.push(Rect::new(middle, rect.min.y, right, rect.max.y));
    }
    drawn
}

fn damage(rng: &mut Pcg64Mcg, sheets: &mut [Vec<Rect>]) {
    let mask = rng.random_range(0..sheets.len());
    let other = 1 - mask;
    let at = rng.random_range(0..sheets[mask].len().max(1));
    match rng.random_range(0..4) {
        0 if !sheets[mask].is_empty() => drop(sheets[mask].remove(at)),
        1 if !sheets[mask].is_empty() => {
            let rect = sheets[mask].remove(at);
            sheets[other].push(rect);
        }
        2 if !sheets[mask].is_empty() => {
            let rect = &mut sheets[mask][at];
            rect.max.x += rng.random_range(1..3);
        }
        _ => {
            let (x, y) = (rng.random_range(0..30), rng.random_range(0..16));
            sheets[mask].push(Rect::new(x, y, x + 1, y + rng.random_range(1..3)));
        }
    }
}

#[test]
fn a_drawing_is_read_exactly_where_a_colouring_gives_it() {
    let mut rng = Pcg64Mcg::seed_from_u64(11);
    let (mut read, mut refused, mut stitched) = (0, [0; 5], 0);
    for round in 0..30_000 {
        let rects = random_rects(&mut rng);
        let policy = match round % 8 {
            0 => Policy::None,
            1..4 => Policy::EveryInterval,
            _ => Policy::Uncovered,
        };
        // Overlaps up to 6 cover fragments of length 1 whole, and reach beyond.
        let overlap = 2 * rng.random_range(0..4);
        let rules = rules(policy, overlap);
        let layout = layout(sheet(&rects));
        let found = extract(&layout, &rules, &|_| ()).unwrap();
        let count = found.fragments.len();
        if count > 9 {
            continue;
        }
        let colours: Vec<Mask> = (0..count).map(|_| rng.random_range(0..MASKS)).collect();
        let sheets = (0..MASKS).map(|mask| drawn(&rects, &found, &colours, mask));
        let mut sheets: Vec<Vec<Rect>> = sheets.map(|on| redrawn(&mut rng, on)).collect();
        let damaged = rng.random_bool(0.5);
        if damaged {
            damage(&mut rng, &mut sheets);
        }
        let target: Vec<Cells> = sheets.iter().map(|rects| raster(rects)).collect();
        let gives = |colours: &[Mask]| {
            (0..MASKS).all(|m| raster(&drawn(&rects, &found, colours, m)) == target[usize::from(m)])
        };
        let shapes: Vec<Shapes> = sheets.iter().map(|rects| sheet(rects)).collect();
        match colouring(&layout, &found, policy, &shapes) {
            Ok(masks) => {
                assert!(gives(&masks), "{round} {rects:?} {sheets:?}");
                read += 1;
                let used = found.instance.stitches().iter();
                stitched += used
                    .filter(|s| masks[s.a as usize] != masks[s.b as usize])
                    .count();
            }
            Err(error) => {
                assert!(damaged, "{round} {error} {rects:?} {sheets:?}");
                assert!(
                    !colourings(count).any(|c| gives(&c)),
                    "{round} {error} {rects:?}"
                );
                let kind = match error {
                    DrawnError::Nothing { .. } => 0,
                    DrawnError::Missing { .. } => 1,
                    DrawnError::Twice { .. } => 2,
                    DrawnError::NoStitch { .. } => 3,
                    DrawnError::Overlap { .. } => 4,
                    other => panic!("{other}"),
                };
                refused[kind] += 1;
            }
        }
    }
    assert!(read > 1_000 && stitched > 500, "{read} {stitched}");
    assert!(refused.iter().all(|&times| times > 10), "{refused:?}");
}

/// A bar of length 24 cut at some places, with overlaps that may cover whole fragments and reach beyond.
fn cut_bar(rng: &mut Pcg64Mcg, rect: Rect) -> Extraction {
    let mut places: Vec<i32> = (0..rng.random_range(1..6))
        .map(|_| rng.random_range(4..21))
        .collect();
    places.sort_unstable();
    places.dedup();
    let half = rng.random_range(0..5);
    let mut builder = FragmentsBuilder::new(half);
    let ends: Vec<i32> = [0].into_iter().chain(places.clone()).chain([24]).collect();
    let cells = ends
        .windows(2)
        .map(|two| [Rect::new(two[0], 0, two[1], rect.max.y)]);
    let cuts = places.iter().zip(0u32..).map(|(&x, i)| Cut {
        line: Rect::new(x, 0, x, rect.max.y),
        sides: [i, i + 1],
    });
    builder.split(cells, cuts);
    let mut instance = InstanceBuilder::new(MASKS);
    instance.feature(places.len() as u32 + 1);
    (0..places.len() as u32).for_each(|i| instance.stitch(i, i + 1, 1));
    let mut features = Features::default();
    features.push([0], rect);
    Extraction {
        features,
        fragments: builder.build(),
        instance: instance.build().unwrap(),
        empty_shapes: Vec::new(),
        unstitchable: Vec::new(),
        too_close: Vec::new(),
        candidates: Default::default(),
        beyond_theorem: Vec::new(),
    }
}

#[test]
fn fragments_that_overlaps_cover_are_told_apart_by_the_others() {
    let mut rng = Pcg64Mcg::seed_from_u64(12);
    let rect = Rect::new(0, 0, 24, 2);
    let layout = layout(sheet(&[rect]));
    let (mut covered, mut refused) = (0, 0);
    for round in 0..5_000 {
        let found = cut_bar(&mut rng, rect);
        let count = found.fragments.len();
        let colours: Vec<Mask> = (0..count).map(|_| rng.random_range(0..MASKS)).collect();
        let sheets = (0..MASKS).map(|mask| drawn(&[rect], &found, &colours, mask));
        let mut sheets: Vec<Vec<Rect>> = sheets.map(|on| redrawn(&mut rng, on)).collect();
        let damaged = rng.random_bool(0.4);
        if damaged {
            damage(&mut rng, &mut sheets);
        }
        let target: Vec<Cells> = sheets.iter().map(|rects| raster(rects)).collect();
        let gives = |colours: &[Mask]| {
            (0..MASKS)
                .all(|m| raster(&drawn(&[rect], &found, colours, m)) == target[usize::from(m)])
        };
        let shapes: Vec<Shapes> = sheets.iter().map(|rects| sheet(rects)).collect();
        match colouring(&layout, &found, Policy::Listed, &shapes) {
            Ok(masks) => {
                assert!(gives(&masks), "{round} {sheets:?}");
                let own = (0..count as u32).map(|f| raster(found.fragments.cells_of(f)));
                let twice = own.filter(|own| target.iter().all(|on| own.is_subset(on)));
                covered += u32::from(twice.count() > 0);
            }
            Err(error) => {
                assert!(damaged, "{round} {error} {sheets:?}");
                assert!(
                    !colourings(count).any(|c| gives(&c)),
                    "{round} {error} {sheets:?}"
                );
                refused += 1;
            }
        }
    }
    assert!(covered > 500 && refused > 500, "{covered} {refused}");
}

fn triangle(x: i32) -> [Point; 3] {
    [(x, 0), (x + 6, 0), (x, 6)].map(|(x, y)| Point::new(x, y))
}

/// A triangle with a square at its foot, and a square far away.
fn slanted() -> (Layout, Extraction) {
    let mut shapes = sheet(&[Rect::new(-2, 0, 0, 2), Rect::new(100, 0, 102, 2)]);
    shapes.push_polygon(&triangle(0));
    let layout = layout(shapes);
    let found = extract(&layout, &rules(Policy::Uncovered, 2), &|_| ()).unwrap();
    assert_eq!(found.instance.fragment_count(), 2);
    (layout, found)
}

#[test]
fn slanted_features_are_read_shape_by_shape() {
    let (layout, found) = slanted();
    let read = |sheets: [Shapes; 2]| colouring(&layout, &found, Policy::Uncovered, &sheets);
    let feet = [Rect::new(-2, 0, 0, 2)];
    let far = [Rect::new(100, 0, 102, 2)];
    let with_triangle = |rects: &[Rect], points: &[Point]| {
        let mut shapes = sheet(rects);
        shapes.push_polygon(points);
        shapes
    };
    // Begun elsewhere, the other way round, with a straight vertex.
    let turned = [(0, 6), (3, 3), (6, 0), (0, 0)].map(|(x, y)| Point::new(x, y));
    let masks = read([with_triangle(&feet, &turned), sheet(&far)]).unwrap();
    let slanted = found.unstitchable[0];
    assert_eq!(masks[slanted as usize], 0);
    assert_eq!(masks[1 - slanted as usize], 1);
    let all = with_triangle(&[feet[0], far[0]], &triangle(0));
    assert_eq!(read([Shapes::default(), all.clone()]).unwrap(), [1, 1]);
    // Without its foot, on two masks, not at all, moved, and with more within it.
    let refused = [
        [with_triangle(&[], &triangle(0)), sheet(&far)],
        [all.clone(), with_triangle(&[], &triangle(0))],
        [sheet(&far), Shapes::default()],
        [
            with_triangle(&[feet[0], far[0]], &triangle(1)),
            Shapes::default(),
        ],
        [all, sheet(&[Rect::new(1, 1, 2, 2)])],
    ];
    let said: Vec<DrawnError> = refused
        .into_iter()
        .map(|sheets| read(sheets).unwrap_err())
        .collect();
    assert!(matches!(said[0], DrawnError::Slanted { feature, .. } if feature == slanted));
    assert!(matches!(said[1], DrawnError::Slanted { feature, .. } if feature == slanted));
    assert!(matches!(said[2], DrawnError::Missing { feature, .. } if feature == slanted));
    assert!(matches!(said[3], DrawnError::Outline { mask: 0, .. }));
    assert!(matches!(said[4], DrawnError::Slanted { feature, .. } if feature == slanted));
}

#[test]
fn errors_name_the_place_and_what_would_be_right() {
    let bar = [Rect::new(0, 0, 40, 2)];
    let layout = layout(sheet(&bar));
    let found = extract(&layout, &rules(Policy::None, 0), &|_| ()).unwrap();
    let said = |on: [&[Rect]; 2]| {
        let sheets = on.map(sheet);
        colouring(&layout, &found, Policy::None, &sheets)
            .unwrap_err()
            .to_string()
    };
    // 1 unit is 1,000 pm, 0.001 um.
    assert_eq!(
        said([&[Rect::new(0, 0, 30, 2)], &[Rect::new(30, 0, 40, 2)]]),
        "feature 0 changes between mask 1 and mask 2 at one end of (0.03, 0) to (0.04, 0.002) um, where stitch policy \
         `none` has no candidate: draw the feature on one mask, or choose a policy that allows the stitch"
    );
    assert!(said([&[Rect::new(0, 0, 30, 2)], &[]]).starts_with(
        "feature 0 is on no mask from (0.03, 0) to (0.04, 0.002) um: all of it must be drawn"
    ));
    assert!(said([&bar, &[Rect::new(50, 0, 60, 2)]]).starts_with(
        "mask 2 is drawn from (0.05, 0) to (0.06, 0.002) um, where the layer has nothing"
    ));
    assert!(
        said([&bar, &bar])
            .starts_with("feature 0 is on mask 1 and mask 2 from (0, 0) to (0.04, 0.002) um")
    );
}
