//! Close features, close fragments and shadows on thousands of random layouts against [`raster`], which states
//! the definition cell by cell.
#![allow(clippy::unwrap_used)]

mod raster;

use self::raster::{Cells, Outline, SIZE, close, closer, least, line_closer, reasons};
use super::super::cutting::{Candidate, Cutting, cut};
use super::super::neighbours::Neighbourhood;
use super::super::owners::Owners;
use super::super::parts::Parts;
use super::super::runs::{Run, runs};
use super::super::shadows::{Shadow, on_run};
use super::super::{connect, pairs};
use super::{Faces, Outlines, Relation};
use crate::geometry::Rect;
use crate::geometry::slabs::cells_of_rects;
use crate::layout::fragments::FragmentsBuilder;
use crate::layout::{Fragments, LayerId, Metric, Rules, Shapes, Spacings, WideSpacing};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

/// A layer taken apart, with its features in cells.
struct Layer {
    parts: Parts,
    owners: Owners,
    outlines: Vec<Outline>,
}

fn layer(rects: &[Rect], rules: &Rules) -> Layer {
    let mut shapes = Shapes::default();
    rects.iter().for_each(|&rect| shapes.push_rect(rect));
    let parts = Parts::new(&shapes).unwrap();
    let owners = connect::connect(&parts, rects.len(), &|_| ()).1;
    let outlines = (0..owners.len() as u32).map(|feature| {
        let cells = Cells::of(rects_of(&parts, &owners, feature));
        Outline::new(&cells, rules.spacings.end_length)
    });
    Layer {
        outlines: outlines.collect(),
        parts,
        owners,
    }
}

fn rects_of(parts: &Parts, owners: &Owners, owner: u32) -> Vec<Rect> {
    let own = owners.parts_of(owner).iter();
    own.map(|&part| parts.box_of(part)).collect()
}

impl Layer {
    fn faces(&self, relation: &Relation) -> Option<Faces> {
        let outlines = || Outlines::new(&self.parts, &self.owners, relation).unwrap();
        relation
            .needs_outlines()
            .then(|| Faces::of_features(outlines()))
    }
}

fn random_rects(rng: &mut Pcg64Mcg) -> Vec<Rect> {
    let most = SIZE - 2;
    (0..rng.random_range(2..9))
        .map(|_| {
            let (x, y) = (rng.random_range(0..most), rng.random_range(0..most));
            let (w, h) = match rng.random_range(0..4) {
                0 => (rng.random_range(5..20), rng.random_range(1..3)),
                1 => (rng.random_range(1..3), rng.random_range(5..20)),
                _ => (rng.random_range(1..9), rng.random_range(1..9)),
            };
            Rect::new(x, y, (x + w).min(SIZE), (y + h).min(SIZE))
        })
        .collect()
}

fn random_rules(rng: &mut Pcg64Mcg) -> Rules {
    let layer = LayerId {
        layer: 1,
        datatype: 0,
    };
    let maybe = |rng: &mut Pcg64Mcg| rng.random_bool(0.7).then(|| rng.random_range(1..9));
    let rows = rng.random_range(0..3);
    Rules {
        spacings: Spacings {
            metric: match rng.random_bool(0.5) {
                true => Metric::Euclidean,
                false => Metric::Square,
            },
            end_length: rng.random_range(0..7),
            side_to_side: maybe(rng),
            side_to_end: maybe(rng),
            end_to_end: maybe(rng),
            corner_to_corner: maybe(rng),
            wide: (0..rows)
                .map(|_| WideSpacing {
                    width: rng.random_range(1..8),
                    run_length: rng.random_range(0..8),
                    spacing: rng.random_range(3..12),
                })
                .collect(),
            any_mask: 0,
        },
        ..Rules::plain(layer, 2, rng.random_range(1..7))
    }
}

/// Compares all pairs of regions; counts by which part of the definition they are close.
fn check_pairs(
    found: &[[u32; 2]],
    regions: &[Cells],
    outline: impl Fn(u32) -> usize,
    layer: &Layer,
    rules: &Rules,
) -> [usize; 5] {
    let mut counts = [0; 5];
    let mut expected = Vec::new();
    for a in 0..regions.len() as u32 {
        for b in a + 1..regions.len() as u32 {
            let [f, g] = [a, b].map(|r| &layer.outlines[outline(r)]);
            let [r, s] = [a, b].map(|r| &regions[r as usize]);
            let by = close(r, f, s, g, rules);
            counts[usize::from(by.unwrap_or(0))] += 1;
            if by.is_some() {
                expected.push([a, b]);
            }
        }
    }
    assert_eq!(found, expected, "{rules:?}");
    counts
}

#[test]
fn close_features_agree_with_the_definition() {
    let mut rng = Pcg64Mcg::seed_from_u64(51);
    let mut counts = [0; 5];
    for _ in 0..6_000 {
        let (rects, rules) = (random_rects(&mut rng), random_rules(&mut rng));
        let layer = layer(&rects, &rules);
        let relation = Relation::new(&rules);
        let faces = layer.faces(&relation);
        let around = Neighbourhood::new(&layer.parts, &layer.owners, &relation, faces.as_ref());
        let found = pairs::find(&around, &|_| ()).unwrap();
        let regions = layer.outlines.iter().map(|outline| outline.cells().clone());
        let regions: Vec<Cells> = regions.collect();
        let more = check_pairs(&found, &regions, |f| f as usize, &layer, &rules);
        (counts.iter_mut().zip(more)).for_each(|(sum, more)| *sum += more);
    }
    assert!(counts.iter().all(|&n| n > 400), "{counts:?}");
}

/// Cuts each run of each feature at some places at random.
fn random_cuts(layer: &Layer, half: i32, rng: &mut Pcg64Mcg) -> Fragments {
    let mut builder = FragmentsBuilder::new(half);
    for feature in 0..layer.owners.len() as u32 {
        let cells = cells_of_rects(&rects_of(&layer.parts, &layer.owners, feature), 999).unwrap();
        let mut candidates = Vec::new();
        for run in runs(&cells, 999).unwrap() {
            let room = half.max(1);
            let places = (run.from + room)..=(run.to - room);
            let places = places.filter(|_| rng.random_bool(0.15));
            candidates.extend(places.map(|place| Candidate { run, place }));
        }
        match cut(&cells, &candidates) {
            Cutting::Split(split) => builder.split(split.fragments, split.cuts),
            Cutting::Whole | Cutting::Apart => builder.unsplit(),
        }
    }
    builder.build()
}

#[test]
fn close_fragments_agree_with_the_definition() {
    let mut rng = Pcg64Mcg::seed_from_u64(52);
    let (mut counts, mut own) = ([0; 5], 0);
    let mut rounds = 0;
    while rounds < 3_000 {
        let (rects, rules) = (random_rects(&mut rng), random_rules(&mut rng));
        let mut layer = layer(&rects, &rules);
        let half = rng.random_range(0..3);
        let fragments = random_cuts(&layer, half, &mut rng);
        if fragments.cuts().is_empty() {
            continue;
        }
        rounds += 1;
        let relation = Relation::new(&rules);
        let faces = layer.faces(&relation);
        let none = Shapes::default();
        let whole = std::mem::replace(&mut layer.parts, Parts::new(&none).unwrap());
        let (parts, owners) = whole.of_fragments(&layer.owners, &fragments).unwrap();
        let faces = faces.map(|faces| faces.of_fragments(&parts, &owners, &fragments));
        let around = Neighbourhood::new(&parts, &owners, &relation, faces.as_ref());
        let found = pairs::find(&around, &|_| ()).unwrap();
        let regions: Vec<Cells> = (0..fragments.len() as u32)
            .map(|fragment| match fragments.is_split(fragment) {
                true => Cells::of(fragments.reach_of(fragment)),
                false => {
                    let feature = fragments.feature_of(fragment);
                    layer.outlines[feature as usize].cells().clone()
                }
            })
            .collect();
        let feature = |fragment| fragments.feature_of(fragment) as usize;
        let more = check_pairs(&found, &regions, feature, &layer, &rules);
        (counts.iter_mut().zip(more)).for_each(|(sum, more)| *sum += more);
        own += found
            .iter()
            .filter(|p| feature(p[0]) == feature(p[1]))
            .count();
    }
    assert!(counts.iter().all(|&n| n > 400), "{counts:?}");
    assert!(own > 1_000, "{own}");
}

/// Every part of every run against the definition, and every cut.
#[test]
fn shadows_agree_with_the_definition() {
    let mut rng = Pcg64Mcg::seed_from_u64(53);
    let (mut counts, mut empty, mut covered) = ([0; 5], 0, [0; 2]);
    for _ in 0..600 {
        let (rects, rules) = (random_rects(&mut rng), random_rules(&mut rng));
        let layer = layer(&rects, &rules);
        let relation = Relation::new(&rules);
        let faces = layer.faces(&relation);
        let around = Neighbourhood::new(&layer.parts, &layer.owners, &relation, faces.as_ref());
        for feature in 0..layer.owners.len() as u32 {
            let own = rects_of(&layer.parts, &layer.owners, feature);
            let cells = cells_of_rects(&own, 999).unwrap();
            for run in runs(&cells, 999).unwrap() {
                let shadows = on_run(&around, feature, &run);
                empty += shadows.iter().filter(|s| s.from > s.to).count();
                let fits = |s: &Shadow| run.from <= s.from && s.to <= run.to && s.from <= s.to + 1;
                assert!(shadows.iter().all(fits) && shadows.is_sorted());
                for other in (0..layer.owners.len() as u32).filter(|&other| other != feature) {
                    let own = shadows.iter().filter(|s| s.feature == other).copied();
                    let own: Vec<Shadow> = own.collect();
                    let pair = [feature, other];
                    check_parts(&layer, &rules, pair, &run, &own, &mut counts);
                    check_cuts(&layer, &rules, pair, &run, &own, &mut covered);
                }
            }
        }
    }
    assert!(counts.iter().all(|&n| n > 400), "{counts:?}");
    assert!(covered.iter().all(|&n| n > 3_000), "{covered:?}");
    assert!(empty > 100, "{empty}");
}

fn part(run: &Run, [x, y]: [i32; 2]) -> Cells {
    let area = Rect::new(x, run.low, y, run.high);
    Cells::of([run.direction.turn(area)])
}

/// Every part of a run: close exactly where a shadow of the neighbour says so; where there are wide features, only if it
/// does, and exactly for parts with an end of the run.
fn check_parts(
    layer: &Layer,
    rules: &Rules,
    pair: [u32; 2],
    run: &Run,
    shadows: &[Shadow],
    counts: &mut [usize; 5],
) {
    let [own, other] = pair.map(|feature| &layer.outlines[feature as usize]);
    for x in run.from..run.to {
        for y in x + 1..=run.to {
            let by = close(&part(run, [x, y]), own, other.cells(), other, rules);
            counts[usize::from(by.unwrap_or(0))] += 1;
            let says = shadows.iter().any(|s| y >= s.from && x <= s.to);
            let is_exact = rules.spacings.wide.is_empty() || x == run.from || y == run.to;
            if by.is_some() || is_exact {
                assert_eq!(by.is_some(), says, "{rules:?} {run:?} {x} {y} {shadows:?}");
            }
        }
    }
}

/// Every place inside a run: covered exactly where the line across is too close, or both what is before and what is
/// behind are close through the same two edges.
fn check_cuts(
    layer: &Layer,
    rules: &Rules,
    pair: [u32; 2],
    run: &Run,
    shadows: &[Shadow],
    counts: &mut [usize; 2],
) {
    let [own, other] = pair.map(|feature| &layer.outlines[feature as usize]);
    for place in run.from + 1..run.to {
        let sides = [[run.from, place], [place, run.to]].map(|ends| {
            let reasons = reasons(&part(run, ends), own, other.cells(), other, rules);
            let edges = reasons.into_iter().filter(|&(part, _)| part != 3);
            edges.map(|(_, edges)| edges).collect::<Vec<_>>()
        });
        let metric = rules.spacings.metric;
        let line = line_closer(run.line(place), other.cells(), least(rules), metric);
        let is_covered = line || sides[0].iter().any(|pair| sides[1].contains(pair));
        let says = shadows.iter().any(|s| (s.from..=s.to).contains(&place));
        counts[usize::from(is_covered)] += 1;
        assert_eq!(is_covered, says, "{rules:?} {run:?} {place} {shadows:?}");
    }
}

#[test]
fn features_too_close_for_any_mask_agree_with_distances() {
    let mut rng = Pcg64Mcg::seed_from_u64(54);
    let mut count = 0;
    for _ in 0..2_000 {
        let (rects, mut rules) = (random_rects(&mut rng), random_rules(&mut rng));
        rules.spacings.any_mask = rng.random_range(1..5);
        let layer = layer(&rects, &rules);
        let found = super::super::too_close(&layer.parts, &layer.owners, &rules).unwrap();
        let cells: Vec<&Cells> = layer.outlines.iter().map(Outline::cells).collect();
        let Spacings {
            any_mask, metric, ..
        } = rules.spacings;
        let mut expected = Vec::new();
        for a in 0..cells.len() {
            for b in a + 1..cells.len() {
                if closer(cells[a], cells[b], any_mask, metric) {
                    expected.push([a as u32, b as u32]);
                }
            }
        }
        assert_eq!(found, expected);
        count += found.len();
    }
    assert!(count > 500, "{count}");
}
