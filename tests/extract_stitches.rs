//! Stitch candidates, fragments and their distances against a raster of unit cells, which knows nothing
//! of rectangles, sweeps or trees; and features worked out by hand.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use maskproof::extract::{Extraction, extract};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{Drawing, LayerId, Layout, Policy, Rules, Shapes, StitchRules};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;
use std::collections::{BTreeMap, BTreeSet};

fn rules(spacing: i32, overlap: i32, fragment_length: i32, corner: i32) -> Rules {
    Rules {
        layer: LayerId {
            layer: 1,
            datatype: 0,
        },
        masks: 2,
        spacing,
        stitch: StitchRules {
            policy: Policy::Uncovered,
            overlap,
            fragment_length,
            corner,
            weight: 3,
            ..StitchRules::default()
        },
        spacings: Default::default(),
        hand: Default::default(),
    }
}

fn run(rects: &[Rect], rules: &Rules) -> Extraction {
    let mut shapes = Shapes::default();
    rects.iter().for_each(|&rect| shapes.push_rect(rect));
    let layout = Layout {
        top: "top".into(),
        layer: rules.layer,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    };
    extract(&layout, rules, &|_| ()).unwrap()
}

/// A unit cell, by its lower left corner.
type Cell = (i32, i32);
type Cells = BTreeSet<Cell>;

fn cells_of(rects: impl IntoIterator<Item = Rect>) -> Cells {
    rects
        .into_iter()
        .flat_map(|r| (r.min.y..r.max.y).flat_map(move |y| (r.min.x..r.max.x).map(move |x| (x, y))))
        .collect()
}

fn closer(a: &Cells, b: &Cells, spacing: i32) -> bool {
    let axis = |p: i32, q: i32| ((p - q).abs() - 1).max(0).pow(2);
    let near =
        |&(x, y): &Cell| (b.iter()).any(|&(u, v)| axis(x, u) + axis(y, v) < spacing * spacing);
    a.iter().any(near)
}

/// Connected sets of cells, where cells that share an edge or corner hang together unless a line of `cuts`
/// holds all they share.
fn components(cells: &Cells, cuts: &[Rect]) -> Vec<Cells> {
    let apart = |a: Cell, b: Cell| {
        let shared = Rect::new(
            a.0.max(b.0),
            a.1.max(b.1),
            a.0.min(b.0) + 1,
            a.1.min(b.1) + 1,
        );
        cuts.iter().any(|cut| cut.covers(&shared))
    };
    let mut left = cells.clone();
    let mut found = Vec::new();
    while let Some(seed) = left.pop_first() {
        let (mut part, mut front) = (Cells::from([seed]), vec![seed]);
        while let Some(cell) = front.pop() {
            for (dx, dy) in (-1..=1).flat_map(|dx| (-1..=1).map(move |dy| (dx, dy))) {
                let next = (cell.0 + dx, cell.1 + dy);
                if left.contains(&next) && !apart(cell, next) {
                    left.remove(&next);
                    part.insert(next);
                    front.push(next);
                }
            }
        }
        found.push(part);
    }
    found
}

fn mirrored(cells: &Cells) -> Cells {
    cells.iter().map(|&(x, y)| (y, x)).collect()
}

/// The cross-sections of the column of cells at `x`.
fn sections(cells: &Cells, x: i32) -> Vec<(i32, i32)> {
    let column: Vec<i32> = (cells.range((x, i32::MIN)..(x + 1, i32::MIN)))
        .map(|c| c.1)
        .collect();
    column
        .chunk_by(|a, b| a + 1 == *b)
        .map(|run| (run[0], run[run.len() - 1] + 1))
        .collect()
}

/// The cut lines that the policy's definition gives along x, before any is dropped.
fn expected_lines(cells: &Cells, others: &Cells, rules: &Rules) -> Vec<Rect> {
    let stitch = &rules.stitch;
    let half = stitch.overlap / 2;
    let mut lines = Vec::new();
    for from in -2..100 {
        for (low, high) in sections(cells, from) {
            if sections(cells, from - 1).contains(&(low, high)) {
                continue;
            }
            let mut to = from;
            while sections(cells, to).contains(&(low, high)) {
                to += 1;
            }
            if to - from <= high - low {
                continue;
            }
            let open = |x: i32| (low - 1..=high).any(|y| cells.contains(&(x, y)));
            let (starts_open, ends_open) = (open(from - 1), open(to));
            let covered = |t: i32| {
                others.iter().any(|&(x, y)| {
                    let dx = (x - t).max(t - x - 1).max(0);
                    let dy = (y - high).max(low - y - 1).max(0);
                    dx * dx + dy * dy < rules.spacing * rules.spacing
                })
            };
            let free: Vec<i32> = (from..=to).filter(|&t| !covered(t)).collect();
            let mut last = None;
            for gap in free.chunk_by(|a, b| a + 1 == *b) {
                let (g0, g1) = (gap[0], gap[gap.len() - 1]);
                let middle = (g0 + g1).div_euclid(2);
                let dead = (g0 == from && !starts_open) || (g1 == to && !ends_open);
                let room = |distance: i32, open: bool| match open {
                    true => distance - half >= stitch.corner && distance > 0,
                    false => distance >= stitch.fragment_length && distance >= half && distance > 0,
                };
                let far = last.is_none_or(|l| middle - l >= stitch.fragment_length);
                if !dead
                    && g1 - g0 >= stitch.overlap
                    && room(middle - from, starts_open)
                    && room(to - middle, ends_open)
                    && far
                {
                    lines.push(Rect::new(middle, low, middle, high));
                    last = Some(middle);
                }
            }
        }
    }
    lines
}

/// Checks everything about an extraction whose features are `features` in cells; returns the number of cuts.
fn check(found: &Extraction, features: &[Cells], rules: &Rules) -> usize {
    let fragments = &found.fragments;
    let all: Cells = features.iter().flatten().copied().collect();
    let mut cut_lines: Vec<Vec<Rect>> = Vec::new();
    let mut regions: Vec<Cells> = Vec::new();
    for (feature, cells) in features.iter().enumerate() {
        let others: Cells = all.difference(cells).copied().collect();
        let mut lines = expected_lines(cells, &others, rules);
        let vertical = expected_lines(&mirrored(cells), &mirrored(&others), rules);
        lines.extend(vertical.iter().map(Rect::transposed));
        let parts = components(cells, &lines);
        let sides = |line: &Rect| -> [usize; 2] {
            let Point { x, y } = line.min;
            let below = if line.min.x == line.max.x {
                (x - 1, y)
            } else {
                (x, y - 1)
            };
            [below, (x, y)].map(|cell| parts.iter().position(|p| p.contains(&cell)).unwrap())
        };
        lines.retain(|line| sides(line)[0] != sides(line)[1]);
        lines.sort();
        let range = fragments.of_feature(feature as u32);
        assert_eq!(range, found.instance.fragments_of(feature as u32));
        assert_eq!(range.len(), parts.len());
        let mut mine: Vec<Rect> = range
            .clone()
            .flat_map(|f| fragments.cuts_of(f))
            .map(|c| c.line)
            .collect();
        mine.sort();
        mine.dedup();
        assert_eq!(mine, lines, "cuts of {cells:?}");
        let mut drawn: Vec<Cells> = Vec::new();
        for fragment in range {
            let rects = fragments.cells_of(fragment);
            let own = if rects.is_empty() {
                cells.clone()
            } else {
                cells_of(rects.iter().copied())
            };
            let area: u64 = rects.iter().map(Rect::area).sum();
            assert!(
                rects.is_empty() || area == own.len() as u64,
                "disjoint cells"
            );
            assert_eq!(found.instance.area(fragment), own.len() as u64);
            let mut region = own.clone();
            for cut in fragments.cuts_of(fragment) {
                let half = rules.stitch.overlap / 2;
                let line = cut.line;
                let wide = if line.min.x == line.max.x {
                    Rect::new(line.min.x - half, line.min.y, line.max.x + half, line.max.y)
                } else {
                    Rect::new(line.min.x, line.min.y - half, line.max.x, line.max.y + half)
                };
                region.extend(cells_of([wide]));
                let side = cut.sides.iter().position(|&s| s == fragment).unwrap();
                let Point { x, y } = line.min;
                let next_to = match (side, line.min.x == line.max.x) {
                    (1, _) => (x, y),
                    (_, true) => (x - 1, y),
                    (_, false) => (x, y - 1),
                };
                assert!(own.contains(&next_to), "sides are the right way round");
            }
            assert!(region.is_subset(cells), "overlaps stay on the feature");
            regions.push(region);
            drawn.push(own);
        }
        let (drawn, parts): (BTreeSet<_>, BTreeSet<_>) =
            (drawn.into_iter().collect(), parts.into_iter().collect());
        assert_eq!(drawn, parts);
        cut_lines.push(lines);
    }
    check_edges(found, &regions, rules);
    cut_lines.iter().map(Vec::len).sum()
}

fn check_edges(found: &Extraction, regions: &[Cells], rules: &Rules) {
    let instance = &found.instance;
    let mut stitches: BTreeMap<[u32; 2], u32> = BTreeMap::new();
    for cut in found.fragments.cuts() {
        let [a, b] = cut.sides;
        *stitches.entry([a.min(b), a.max(b)]).or_default() += rules.stitch.weight;
    }
    let listed: BTreeMap<[u32; 2], u32> = instance
        .stitches()
        .iter()
        .map(|s| ([s.a, s.b], s.weight))
        .collect();
    assert_eq!(listed, stitches);
    let (mut pairs, mut own) = (BTreeMap::<[u32; 2], Vec<[u32; 2]>>::new(), Vec::new());
    for a in 0..regions.len() as u32 {
        for b in a + 1..regions.len() as u32 {
            if !closer(&regions[a as usize], &regions[b as usize], rules.spacing) {
                continue;
            }
            let features = [a, b].map(|f| instance.feature_of(f));
            if features[0] != features[1] {
                pairs.entry(features).or_default().push([a, b]);
            } else if !stitches.contains_key(&[a, b]) {
                own.push([a, b]);
            }
        }
    }
    assert_eq!(instance.self_spacings(), own);
    let listed: Vec<Vec<[u32; 2]>> = instance.pairs().map(<[_]>::to_vec).collect();
    assert_eq!(listed, pairs.into_values().collect::<Vec<_>>());
}

fn features_in_cells(found: &Extraction, rects: &[Rect]) -> Vec<Cells> {
    (0..found.features.len() as u32)
        .map(|f| {
            cells_of(
                found
                    .features
                    .shapes_of(f)
                    .iter()
                    .map(|&s| rects[s as usize]),
            )
        })
        .collect()
}

#[test]
fn random_wires_agree_with_a_raster() {
    let mut rng = Pcg64Mcg::seed_from_u64(31);
    let (mut cuts, mut own, mut rounds) = (0, 0, 0);
    while rounds < 600 {
        rounds += 1;
        let rects: Vec<Rect> = (0..rng.random_range(3..14))
            .map(|_| {
                let (x, y) = (rng.random_range(0..50), rng.random_range(0..50));
                let (length, width) = (rng.random_range(6..45), rng.random_range(2..5));
                let (w, h) = if rng.random_bool(0.5) {
                    (length, width)
                } else {
                    (width, length)
                };
                Rect::new(x, y, (x + w).min(60), (y + h).min(60))
            })
            .collect();
        let rules = rules(
            rng.random_range(3..8),
            2 * rng.random_range(0..3),
            rng.random_range(0..7),
            rng.random_range(0..4),
        );
        let found = run(&rects, &rules);
        cuts += check(&found, &features_in_cells(&found, &rects), &rules);
        own += found.instance.self_spacings().len();
    }
    assert!(
        cuts > 1000 && own > 100,
        "{cuts} cuts and {own} self-spacings"
    );
}

/// A horizontal wire between neighbours above: the shadows of two blocks, with a gap.
fn wire_with_blocks() -> Vec<Rect> {
    vec![
        Rect::new(0, 0, 100, 10),
        Rect::new(0, 15, 30, 30),
        Rect::new(70, 15, 100, 30),
    ]
}

#[test]
fn a_wire_between_two_blocks() {
    let rects = wire_with_blocks();
    let rules = rules(10, 8, 20, 5);
    let found = run(&rects, &rules);
    // 5 across: shadows end 8 beyond the blocks (64 + 25 < 100): 39 to 61 is free.
    let cuts = found.fragments.cuts();
    assert_eq!(cuts.len(), 1);
    assert_eq!(cuts[0].line, Rect::new(50, 0, 50, 10));
    let stitched = found.instance.feature_of(cuts[0].sides[0]);
    assert_eq!(found.fragments.of_feature(stitched).len(), 2);
    assert_eq!(found.instance.pair_count(), 2);
    assert_eq!(found.instance.edges().len(), 2);
    assert_eq!(found.instance.stitches()[0].weight, 3);
    check(&found, &features_in_cells(&found, &rects), &rules);
}

#[test]
fn a_fragment_is_drawn_with_its_overlaps_only_where_it_is_stitched() {
    let rects = wire_with_blocks();
    let found = run(&rects, &rules(10, 8, 20, 5));
    let [left, right] = found.fragments.cuts()[0].sides;
    let draw = |fragment, colouring: &[u8]| {
        found
            .fragments
            .drawing(&found.features, fragment, colouring)
    };
    let together = vec![0; 4];
    let mut apart = together.clone();
    apart[right as usize] = 1;
    assert_eq!(
        draw(left, &together),
        Drawing::Rects(vec![Rect::new(0, 0, 50, 10)])
    );
    let overlap = Rect::new(46, 0, 54, 10);
    assert_eq!(
        draw(left, &apart),
        Drawing::Rects(vec![Rect::new(0, 0, 50, 10), overlap])
    );
    assert_eq!(
        draw(right, &apart),
        Drawing::Rects(vec![Rect::new(50, 0, 100, 10), overlap])
    );
    let block = (0..4).find(|f| !found.fragments.is_split(*f)).unwrap();
    let feature = found.fragments.feature_of(block);
    assert_eq!(
        draw(block, &apart),
        Drawing::Shapes(found.features.shapes_of(feature))
    );
}

fn ring() -> Vec<Rect> {
    vec![
        Rect::new(0, 0, 100, 10),
        Rect::new(0, 90, 100, 100),
        Rect::new(0, 0, 10, 100),
        Rect::new(90, 0, 100, 100),
    ]
}

/// Neighbours that cover all of a ring's four runs but those asked for.
fn covers(runs: &[usize]) -> Vec<Rect> {
    let walls = [
        Rect::new(0, -12, 100, -4),
        Rect::new(0, 104, 100, 112),
        Rect::new(-12, 0, -4, 100),
        Rect::new(104, 0, 112, 100),
    ];
    runs.iter().map(|&i| walls[i]).collect()
}

#[test]
fn a_ring_cut_once_is_whole_and_cut_twice_has_one_edge_of_twice_the_weight() {
    let rules = rules(6, 4, 10, 2);
    for (covered, fragments, weights) in [
        (&[0, 1, 2][..], 1, vec![]),
        (&[0, 1], 2, vec![6]),
        (&[0], 3, vec![3, 3, 3]),
        (&[], 4, vec![3, 3, 3, 3]),
    ] {
        let mut rects = ring();
        rects.extend(covers(covered));
        let found = run(&rects, &rules);
        let ring = (0..found.features.len() as u32)
            .find(|&f| found.features.shapes_of(f).len() == 4)
            .unwrap();
        assert_eq!(found.fragments.of_feature(ring).len(), fragments);
        let found_weights: Vec<u32> = found.instance.stitches().iter().map(|s| s.weight).collect();
        assert_eq!(found_weights, weights);
        check(&found, &features_in_cells(&found, &rects), &rules);
    }
}

/// Fragments of the only feature of `rects`, with the first cell's corner of each.
fn alone(rects: &[Rect]) -> Vec<Point> {
    let rules = rules(6, 4, 10, 2);
    let found = run(rects, &rules);
    assert_eq!(found.features.len(), 1);
    check(&found, &features_in_cells(&found, rects), &rules);
    let range = found.fragments.of_feature(0);
    range
        .map(|f| {
            found
                .fragments
                .cells_of(f)
                .first()
                .map_or(Point::new(0, 0), |c| c.min)
        })
        .collect()
}

#[test]
fn ends_are_not_cut_off_an_l_or_a_t_but_the_bottom_of_a_u_is_cut() {
    let l = [Rect::new(0, 0, 80, 10), Rect::new(0, 0, 10, 80)];
    assert_eq!(alone(&l).len(), 1);
    let t = [Rect::new(0, 70, 110, 80), Rect::new(50, 0, 60, 80)];
    assert_eq!(alone(&t).len(), 1);
    let u = [
        Rect::new(0, 0, 10, 80),
        Rect::new(0, 0, 60, 10),
        Rect::new(50, 0, 60, 80),
    ];
    assert_eq!(alone(&u), [Point::new(0, 0), Point::new(30, 0)]);
}

#[test]
fn a_comb_is_numbered_along_its_spine() {
    let mut comb = vec![Rect::new(0, 0, 130, 10)];
    comb.extend((0..4).map(|i| Rect::new(40 * i, 0, 40 * i + 10, 60)));
    let corners: Vec<i32> = alone(&comb).iter().map(|corner| corner.x).collect();
    assert_eq!(corners, [0, 25, 65, 105]);
}

#[test]
fn slanted_features_are_named_and_cast_shadows() {
    let mut shapes = Shapes::default();
    shapes.push_rect(Rect::new(0, 0, 100, 10));
    // Blocks with one corner cut off.
    let block = |x: i32| [(x, 15), (x + 30, 15), (x + 30, 30), (x + 2, 30), (x, 28)];
    for x in [0, 70] {
        shapes.push_polygon(&block(x).map(|(x, y)| Point::new(x, y)));
    }
    let rules = rules(10, 8, 20, 5);
    let layout = Layout {
        top: "top".into(),
        layer: rules.layer,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    };
    let found = extract(&layout, &rules, &|_| ()).unwrap();
    let slanted: Vec<u32> = (0..3)
        .filter(|&f| found.features.shapes_of(f) != [0])
        .collect();
    assert_eq!(found.unstitchable, slanted);
    assert_eq!(found.fragments.cuts().len(), 1);
    assert_eq!(found.fragments.cuts()[0].line, Rect::new(50, 0, 50, 10));
    assert_eq!(found.instance.edges().len(), 2);
}

#[test]
fn islands_on_a_line_of_no_width_are_not_cut() {
    // Two U-shaped islands of one outline; each alone would be cut.
    let island = |x: i32| {
        [
            (x, 0),
            (x + 60, 0),
            (x + 60, 80),
            (x + 50, 80),
            (x + 50, 10),
            (x + 10, 10),
            (x + 10, 80),
            (x, 80),
        ]
    };
    let mut outline: Vec<(i32, i32)> = island(0).to_vec();
    outline.splice(
        2..2,
        [(60, 5), (200, 5)]
            .into_iter()
            .chain(island(200).into_iter().cycle().skip(1).take(7))
            .chain([(200, 80), (200, 5), (60, 5)]),
    );
    let vertices: Vec<Point> = outline.iter().map(|&(x, y)| Point::new(x, y)).collect();
    let mut shapes = Shapes::default();
    shapes.push_polygon(&vertices);
    let rules = rules(6, 4, 10, 2);
    let layout = Layout {
        top: "top".into(),
        layer: rules.layer,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    };
    let found = extract(&layout, &rules, &|_| ()).unwrap();
    assert_eq!(found.features.len(), 1);
    assert_eq!(found.unstitchable, [0]);
    assert_eq!(found.instance.fragment_count(), 1);
}

#[test]
fn any_number_of_threads_gives_the_same() {
    let mut rng = Pcg64Mcg::seed_from_u64(32);
    let rects: Vec<Rect> = (0..800)
        .map(|_| {
            let (x, y) = (rng.random_range(0..4000), rng.random_range(0..4000));
            let (length, width) = (rng.random_range(50..600), rng.random_range(10..40));
            match rng.random_bool(0.5) {
                true => Rect::new(x, y, x + length, y + width),
                false => Rect::new(x, y, x + width, y + length),
            }
        })
        .collect();
    let in_pool = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads);
        pool.build()
            .unwrap()
            .install(|| run(&rects, &rules(30, 8, 20, 5)))
    };
    let (one, four) = (in_pool(1), in_pool(4));
    assert!(one.fragments.cuts().len() > 100);
    assert_eq!(one.instance, four.instance);
    assert_eq!(one.fragments, four.fragments);
}
