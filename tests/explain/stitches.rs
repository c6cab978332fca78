//! Stitches that are said to help, tried out on layouts of rectangles.
//!
//! Compared with: the parts of each rectangle between its cuts, distances by the closed formula, conflicts by the
//! definitions of the design's section 1, all colourings enumerated.

use std::collections::BTreeSet;

use maskproof::explain::repair::{Block, Way};
use maskproof::geometry::Rect;
use maskproof::layout::{Policy, Shapes};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64;

use crate::layouts::{explained, layout, squared};
use crate::rules;

/// The rectangle of a feature, and its cuts: lines and overlaps.
type Wire = (Rect, Vec<(Rect, i32)>);

/// The parts of a wire, in order along it, each with half the overlap of its cuts.
fn parts((rect, cuts): &Wire) -> Vec<Rect> {
    let mut cuts = cuts.clone();
    cuts.sort();
    let mut parts = Vec::new();
    let mut rest = *rect;
    for (line, overlap) in cuts {
        let (mut low, half) = (rest, overlap / 2);
        if line.min.x == line.max.x {
            (low.max.x, rest.min.x) = (line.min.x + half, line.min.x - half);
        } else {
            (low.max.y, rest.min.y) = (line.min.y + half, line.min.y - half);
        }
        parts.push(low);
    }
    parts.push(rest);
    parts
}

/// The least number of conflicts on two masks.
fn least(wires: &[Wire], spacing: i64) -> u64 {
    let mut all: Vec<(usize, usize, Rect)> = Vec::new();
    for (feature, wire) in wires.iter().enumerate() {
        let own = parts(wire).into_iter().enumerate();
        all.extend(own.map(|(i, part)| (feature, i, part)));
    }
    let mut close = Vec::new();
    for (i, (f, m, a)) in all.iter().enumerate() {
        for (j, (g, n, b)) in all.iter().enumerate().skip(i + 1) {
            if (f != g || n - m > 1) && squared(a, b) < spacing * spacing {
                close.push((i, j, f == g));
            }
        }
    }
    let cost = |code: u32| {
        let mask = |i: usize| code >> i & 1;
        let mut pairs = BTreeSet::new();
        let mut own = 0;
        for &(i, j, is_own) in &close {
            if mask(i) != mask(j) {
                continue;
            }
            if !is_own {
                pairs.insert((all[i].0, all[j].0));
            } else if (i..j).any(|between| mask(between) != mask(i)) {
                own += 1;
            }
        }
        pairs.len() as u64 + own
    };
    assert!(all.len() <= 16, "{} parts", all.len());
    (0..1u32 << all.len()).map(cost).min().unwrap()
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
        // The wire goes on, with one more neighbour and room for a stitch before it.
        rects[0].max.x += 100;
        rects.push(Rect::new(length + 70, 15, length + 90, top));
    }
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

/// The cut lines at all places of the grid.
fn lines(area: Rect) -> Vec<Rect> {
    if area.width() > area.height() {
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
    }
}

/// A stitch that is said to help does, and where none is said to help, no cut at any place of the grid
/// does. Half of the layouts have stitch candidates already.
#[test]
fn stitches_help_where_they_are_said_to_and_nowhere_else() {
    let (mut help, mut no_help, mut beside, mut narrow) = (0, 0, 0, 0);
    for seed in 0..500 {
        let rects = ring(seed);
        if !are_apart(&rects) {
            continue;
        }
        let overlap = [0, 4, 30, 60][(seed % 4) as usize];
        let mut shapes = Shapes::default();
        for &rect in &rects {
            shapes.push_rect(rect);
        }
        let policy = [Policy::None, Policy::Uncovered][(seed / 4 % 2) as usize];
        let rules = rules(2, 12, [overlap, 20, 0], policy);
        let (extraction, places) = explained(&layout(shapes), &rules);
        let wires: Vec<Wire> = (0..rects.len() as u32)
            .map(|feature| {
                let own = extraction.fragments.of_feature(feature);
                let cuts = own.flat_map(|fragment| extraction.fragments.cuts_of(fragment));
                let cuts: BTreeSet<Rect> = cuts.map(|cut| cut.line).collect();
                let cuts = cuts.into_iter().map(|line| (line, overlap)).collect();
                (extraction.features.box_of(feature), cuts)
            })
            .collect();
        let with = |line: Rect, feature: usize, overlap: i32| {
            let mut wires = wires.clone();
            wires[feature].1.push((line, overlap));
            least(&wires, 12)
        };
        let before = least(&wires, 12);
        let limits: u64 = places.iter().map(|place| place.core.limit).sum();
        assert_eq!(limits, before);
        for place in &places {
            // The core is all there is: then places that are alike for it are alike for the layout.
            let is_whole = place.core.limit == before
                && place.core.units.len() == extraction.instance.unit_count();
            for feature in &place.features {
                let number = feature.number as usize;
                let said = place.repairs.iter().find_map(|repair| match &repair.way {
                    Way::Stitch(at) if at.feature == feature.number => Some(at),
                    _ => None,
                });
                if let Some(at) = said {
                    assert!(
                        with(at.line, number, at.overlap) < before,
                        "seed {seed}: {at:?}"
                    );
                    help += 1;
                    beside += u32::from(!wires[number].1.is_empty());
                    narrow +=
                        u32::from((at.blocks.iter()).any(|b| matches!(b, Block::Overlap { .. })));
                } else if is_whole {
                    for line in lines(wires[number].0) {
                        if wires[number].1.iter().any(|cut| cut.0 == line) {
                            continue;
                        }
                        for overlap in [overlap, 0] {
                            let after = with(line, number, overlap);
                            assert!(after >= before, "seed {seed}: {line:?} {overlap}");
                        }
                    }
                    no_help += 1;
                }
            }
        }
    }
    println!("{help} {no_help} {beside} {narrow}");
    assert!(help > 100 && no_help > 30, "{help} {no_help}");
    assert!(beside > 5 && narrow > 20, "{beside} {narrow}");
}
