//! The least cost over every legal stitch place of the grid, from a raster of unit cells: nothing here knows of
//! candidates, shadows, rectangles or trees.

use super::search::{Cost, Problem, Way};
use maskproof::geometry::Rect;
use maskproof::layout::{Metric, Rules};
use std::collections::{BTreeMap, BTreeSet};

pub type Cell = (i32, i32);
pub type Cells = BTreeSet<Cell>;

pub fn cells_of(rects: &[Rect]) -> Cells {
    let mut cells = Cells::new();
    for r in rects {
        cells.extend((r.min.x..r.max.x).flat_map(|x| (r.min.y..r.max.y).map(move |y| (x, y))));
    }
    cells
}

/// How far two unit cells are apart along an axis.
fn gap(a: i32, b: i32) -> i32 {
    ((a - b).abs() - 1).max(0)
}

pub fn is_close(a: Cell, b: Cell, distance: i32, metric: Metric) -> bool {
    let (dx, dy) = (gap(a.0, b.0), gap(a.1, b.1));
    match metric {
        Metric::Euclidean => dx * dx + dy * dy < distance * distance,
        Metric::Square => dx.max(dy) < distance,
    }
}

/// Sets of cells that hang together at edges or corners, but where a cut line holds all that two cells share.
pub fn components(cells: &Cells, cuts: &[Rect]) -> Vec<Cells> {
    let apart = |a: Cell, b: Cell| {
        let low = (a.0.max(b.0), a.1.max(b.1));
        let high = (a.0.min(b.0) + 1, a.1.min(b.1) + 1);
        let shared = Rect::new(low.0, low.1, high.0, high.1);
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

/// A legal stitch: its run (one of the feature, by number), its place, its cut line and what it covers.
#[derive(Clone, Debug)]
pub struct Spot {
    pub run: usize,
    pub place: i32,
    pub line: Rect,
    cover: Cells,
}

fn turned(cells: &Cells) -> Cells {
    cells.iter().map(|&(x, y)| (y, x)).collect()
}

/// All legal stitches of a feature.
pub fn spots(cells: &Cells, keep_outs: &[(Cells, i32)], rules: &Rules) -> Vec<Spot> {
    let mut found = Vec::new();
    let mut runs = 0;
    for vertical in [false, true] {
        let cells = if vertical {
            turned(cells)
        } else {
            cells.clone()
        };
        for (from, to, low, high) in runs_along_x(&cells) {
            let legal = |t: &i32| is_legal(&cells, [from, to, low, high], *t, rules);
            for place in (from..=to).filter(legal) {
                let half = rules.stitch.overlap / 2;
                let mut cover = cells_of(&[Rect::new(place - half, low, place + half, high)]);
                let mut line = Rect::new(place, low, place, high);
                // A cover of no width is as close to a cell as the nearer one of the two cells beside it.
                let mut near = if half > 0 {
                    cover.clone()
                } else {
                    Cells::new()
                };
                if half == 0 {
                    near = cells_of(&[Rect::new(place, low, place, high)]);
                }
                if vertical {
                    cover = turned(&cover);
                    near = turned(&near);
                    line = line.transposed();
                }
                let off = |(out, distance): &(Cells, i32)| {
                    out.iter().all(|&cell| {
                        !line_or_cover_close(&line, &near, cell, *distance, rules.spacings.metric)
                    })
                };
                if keep_outs.iter().all(off) {
                    let run = runs;
                    found.push(Spot {
                        run,
                        place,
                        line,
                        cover,
                    });
                }
            }
            runs += 1;
        }
    }
    found
}

/// Whether a cell is closer than `distance` to a cut line or to the cells around it.
fn line_or_cover_close(
    line: &Rect,
    cover: &Cells,
    cell: Cell,
    distance: i32,
    metric: Metric,
) -> bool {
    let along = |low: i32, high: i32, at: i32| (at - high).max(low - at - 1).max(0);
    let dx = along(line.min.x, line.max.x, cell.0);
    let dy = along(line.min.y, line.max.y, cell.1);
    let to_line = match metric {
        Metric::Euclidean => dx * dx + dy * dy < distance * distance,
        Metric::Square => dx.max(dy) < distance,
    };
    to_line || cover.iter().any(|&c| is_close(c, cell, distance, metric))
}

/// The cross-sections of a column of cells.
fn sections(cells: &Cells, x: i32) -> Vec<(i32, i32)> {
    let column: Vec<i32> = cells.iter().filter(|c| c.0 == x).map(|c| c.1).collect();
    (column.chunk_by(|a, b| a + 1 == *b))
        .map(|run| (run[0], run[run.len() - 1] + 1))
        .collect()
}

/// from, to, low, high of each longest stretch of one cross-section that is longer than wide.
fn runs_along_x(cells: &Cells) -> Vec<(i32, i32, i32, i32)> {
    let columns: BTreeSet<i32> = cells.iter().map(|c| c.0).collect();
    let all: BTreeMap<i32, Vec<(i32, i32)>> =
        columns.iter().map(|&x| (x, sections(cells, x))).collect();
    let has = |x: i32, section: &(i32, i32)| all.get(&x).is_some_and(|s| s.contains(section));
    let mut found = Vec::new();
    for (&from, here) in &all {
        for section in here.iter().filter(|section| !has(from - 1, section)) {
            let mut to = from;
            while has(to, section) {
                to += 1;
            }
            if to - from > section.1 - section.0 {
                found.push((from, to, section.0, section.1));
            }
        }
    }
    found
}

fn is_legal(cells: &Cells, [from, to, low, high]: [i32; 4], t: i32, rules: &Rules) -> bool {
    let stitch = &rules.stitch;
    let half = stitch.overlap / 2;
    let goes_on = |x: i32| (low - 1..=high).any(|y| cells.contains(&(x, y)));
    let room = |open: bool| {
        if open {
            (half + stitch.corner).max(1)
        } else {
            stitch.fragment_length.max(half).max(1)
        }
    };
    t - from >= room(goes_on(from - 1)) && to - t >= room(goes_on(to))
}

/// A feature with everything it can be drawn as.
struct Drawn {
    ways: Vec<Way>,
    /// The different parts that occur in its ways, as grids.
    parts: Vec<Grid>,
    /// The same with all that is close to them.
    halos: Vec<Grid>,
}

/// Cells of the square from (-MARGIN, -MARGIN), as bits.
type Grid = Vec<u64>;
const MARGIN: i32 = 2;
const SIDE: i32 = 48;

fn grid(cells: &Cells) -> Grid {
    let mut grid = vec![0; SIDE as usize];
    for &(x, y) in cells {
        grid[(y + MARGIN) as usize] |= 1 << (x + MARGIN);
    }
    grid
}

fn halo(grid: &Grid, distance: i32, metric: Metric) -> Grid {
    let mut found = vec![0; grid.len()];
    for dy in -distance..=distance {
        let shifts =
            (-distance..=distance).filter(|&dx| is_close((0, 0), (dx, dy), distance, metric));
        let most = shifts.max();
        let Some(most) = most else { continue };
        for (y, &row) in grid.iter().enumerate() {
            let Some(to) = found.get_mut((y as i32 + dy) as usize) else {
                continue;
            };
            for dx in 0..=most {
                *to |= row << dx | row >> dx;
            }
        }
    }
    found
}

fn meets(a: &Grid, b: &Grid) -> bool {
    a.iter().zip(b).any(|(a, b)| a & b != 0)
}

/// Every set of stitches that keep the fragment length and the most of a feature.
fn sets(spots: &[Spot], rules: &Rules) -> Vec<Vec<usize>> {
    let mut all = vec![Vec::new()];
    let most = rules
        .stitch
        .most_per_feature
        .map_or(usize::MAX, |most| most as usize);
    let mut start = 0;
    while start < all.len() {
        let set: Vec<usize> = all[start].clone();
        start += 1;
        if set.len() >= most {
            continue;
        }
        let first = set.last().map_or(0, |last| last + 1);
        for next in first..spots.len() {
            let far = |&other: &usize| {
                let (a, b) = (&spots[other], &spots[next]);
                a.run != b.run || (a.place - b.place).abs() >= rules.stitch.fragment_length
            };
            if set.iter().all(far) {
                all.push(set.iter().copied().chain([next]).collect());
            }
        }
    }
    all
}

fn drawn(cells: &Cells, spots: &[Spot], rules: &Rules) -> Drawn {
    let metric = rules.spacings.metric;
    let mut made = Drawn {
        ways: Vec::new(),
        parts: Vec::new(),
        halos: Vec::new(),
    };
    let mut numbers: BTreeMap<Cells, usize> = BTreeMap::new();
    for set in sets(spots, rules) {
        let lines: Vec<Rect> = set.iter().map(|&spot| spots[spot].line).collect();
        let mut parts = components(cells, &lines);
        let mut ends = Vec::new();
        for &spot in &set {
            // Both sides reach over the line; without an overlap the cells at the line are its sides.
            let line = spots[spot].line;
            let (dx, dy) = if line.min.x == line.max.x {
                (1, 0)
            } else {
                (0, 1)
            };
            let after = (line.min.x, line.min.y);
            let before = (after.0 - dx, after.1 - dy);
            let side = |cell: Cell| parts.iter().position(|part| part.contains(&cell)).unwrap();
            ends.push((side(before), side(after), spot));
        }
        if ends.iter().any(|&(a, b, _)| a == b) {
            continue;
        }
        for &(a, b, spot) in &ends {
            parts[a].extend(spots[spot].cover.iter().copied());
            parts[b].extend(spots[spot].cover.iter().copied());
        }
        let parts: Vec<usize> = (parts.into_iter())
            .map(|part| {
                let next = numbers.len();
                *numbers.entry(part.clone()).or_insert_with(|| {
                    let bits = grid(&part);
                    made.halos.push(halo(&bits, rules.spacing, metric));
                    made.parts.push(bits);
                    next
                })
            })
            .collect();
        let stitches = u64::from(rules.stitch.weight) * set.len() as u64;
        for masks in colourings(parts.len(), rules.masks) {
            // Where both sides are on one mask there is no stitch: that is another set.
            if ends.iter().any(|&(a, b, _)| masks[a] == masks[b]) {
                continue;
            }
            let violated = (0..parts.len()).any(|i| {
                (0..i).any(|j| {
                    masks[i] == masks[j] && meets(&made.halos[parts[i]], &made.parts[parts[j]])
                })
            });
            made.ways.push(Way {
                cost: (u64::from(violated), stitches),
                parts: parts.iter().copied().zip(masks).collect(),
            });
        }
    }
    made
}

fn colourings(parts: usize, masks: u8) -> Vec<Vec<u8>> {
    let mut all = vec![Vec::new()];
    for _ in 0..parts {
        all = (all.into_iter())
            .flat_map(|c: Vec<u8>| (0..masks).map(move |m| c.iter().copied().chain([m]).collect()))
            .collect();
    }
    all
}

/// The features of a layer: sets of cells that touch.
pub fn features(rects: &[Rect]) -> Vec<Cells> {
    components(&cells_of(rects), &[])
}

/// The least cost below `limit` over all sets of legal stitches and all colourings.
pub fn least_below(
    features: &[Cells],
    keep_outs: &[(Cells, i32)],
    rules: &Rules,
    limit: Cost,
) -> Option<Cost> {
    let drawn: Vec<Drawn> = (features.iter())
        .map(|cells| drawn(cells, &spots(cells, keep_outs, rules), rules))
        .collect();
    let close =
        |f: usize, i: usize, g: usize, j: usize| meets(&drawn[f].halos[i], &drawn[g].parts[j]);
    let ways = drawn.iter().map(|d| d.ways.clone()).collect();
    Problem {
        ways,
        close: &close,
    }
    .least_below(limit)
}
