//! The rules of spacings and cuts on a raster of unit cells, restated cell by cell. Slow and plain: every definition is a loop over
//! all cells, all unit edges, all corners. Only features along the axes.

use maskproof::layout::{Metric, Rules};
use std::collections::{BTreeMap, BTreeSet};

/// A cell by its lower left corner.
pub type Cell = [i32; 2];
pub type Cells = BTreeSet<Cell>;

/// A unit edge: the cell behind it, and the way out.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct UnitEdge {
    pub cell: Cell,
    pub out: [i32; 2],
}

/// A straight edge: its unit edges in order.
#[derive(Clone, Debug)]
pub struct Edge {
    pub units: Vec<UnitEdge>,
    pub is_end: bool,
}

/// A convex corner: the point, and the only cell there.
pub type Corner = ([i32; 2], Cell);

/// A feature: its cells, edges and convex corners.
#[derive(Clone, Debug)]
pub struct Feature {
    pub cells: Cells,
    pub edges: Vec<Edge>,
    pub corners: Vec<Corner>,
}

/// The features of rectangles, by their first points.
pub fn features(rects: &[[i32; 4]], rules: &Rules) -> Vec<Feature> {
    let mut cells = Cells::new();
    for &[x0, y0, x1, y1] in rects {
        cells.extend((x0..x1).flat_map(|x| (y0..y1).map(move |y| [x, y])));
    }
    let around = |[x, y]: Cell| -> Vec<Cell> {
        let steps = -1..=1;
        steps
            .clone()
            .flat_map(|dx| steps.clone().map(move |dy| [x + dx, y + dy]))
            .collect()
    };
    parts(&cells, around)
        .into_iter()
        .map(|cells| feature(cells, rules))
        .collect()
}

/// What hangs together, each by its first cell.
pub fn parts(cells: &Cells, next: impl Fn(Cell) -> Vec<Cell>) -> Vec<Cells> {
    let (mut left, mut found) = (cells.clone(), Vec::new());
    while let Some(first) = left.pop_first() {
        let (mut part, mut open) = (Cells::from([first]), vec![first]);
        while let Some(cell) = open.pop() {
            for other in next(cell) {
                if left.remove(&other) {
                    part.insert(other);
                    open.push(other);
                }
            }
        }
        found.push(part);
    }
    found
}

fn feature(cells: Cells, rules: &Rules) -> Feature {
    let has = |cell: [i32; 2]| cells.contains(&cell);
    let mut corners = Vec::new();
    let points: BTreeSet<[i32; 2]> = cells
        .iter()
        .flat_map(|&[x, y]| [[x, y], [x + 1, y], [x, y + 1], [x + 1, y + 1]])
        .collect();
    for &[x, y] in &points {
        let own: Vec<Cell> = [[x - 1, y - 1], [x, y - 1], [x - 1, y], [x, y]]
            .into_iter()
            .filter(|&cell| has(cell))
            .collect();
        if let [only] = own[..] {
            corners.push(([x, y], only));
        }
    }
    let is_corner = |point: [i32; 2]| corners.iter().any(|corner| corner.0 == point);
    let mut edges = Vec::new();
    for out in [[0i32, 1], [0, -1], [1, 0], [-1, 0]] {
        let along = [out[1].abs(), out[0].abs()];
        let is_edge = |[x, y]: Cell| has([x, y]) && !has([x + out[0], y + out[1]]);
        for &[x, y] in &cells {
            if !is_edge([x, y]) || is_edge([x - along[0], y - along[1]]) {
                continue;
            }
            let row = (0..).map(|i| [x + i * along[0], y + i * along[1]]);
            let units: Vec<UnitEdge> = row
                .take_while(|&cell| is_edge(cell))
                .map(|cell| UnitEdge { cell, out })
                .collect();
            // The two ends of it on the grid.
            let base = [x + out[0].max(0), y + out[1].max(0)];
            let length = units.len() as i32;
            let far = [base[0] + length * along[0], base[1] + length * along[1]];
            let is_end = length < rules.spacings.end_length && is_corner(base) && is_corner(far);
            edges.push(Edge { units, is_end });
        }
    }
    Feature {
        cells,
        edges,
        corners,
    }
}

impl UnitEdge {
    /// The place along its edge, and its height.
    pub fn along(&self) -> i32 {
        if self.out[0] == 0 {
            self.cell[0]
        } else {
            self.cell[1]
        }
    }

    fn height(&self) -> i32 {
        let axis = usize::from(self.out[0] == 0);
        self.cell[axis] + self.out[axis].max(0)
    }

    /// How deep the feature is behind it.
    fn depth(&self, feature: &Feature) -> i32 {
        let behind = |i: i32| {
            [
                self.cell[0] - i * self.out[0],
                self.cell[1] - i * self.out[1],
            ]
        };
        (0..)
            .take_while(|&i| feature.cells.contains(&behind(i)))
            .count() as i32
    }
}

fn is_less([dx, dy]: [i32; 2], spacing: i32, metric: Metric) -> bool {
    match metric {
        Metric::Euclidean => dx * dx + dy * dy < spacing * spacing,
        Metric::Square => dx.abs().max(dy.abs()) < spacing,
    }
}

/// How far two rectangles are from each other along x and y.
pub fn gaps(a: [i32; 4], b: [i32; 4]) -> [i32; 2] {
    [0, 1].map(|axis| (a[axis] - b[axis + 2]).max(b[axis] - a[axis + 2]).max(0))
}

pub fn is_near(a: [i32; 4], b: [i32; 4], spacing: i32, metric: Metric) -> bool {
    is_less(gaps(a, b), spacing, metric)
}

fn values(rules: &Rules) -> ([i32; 3], i32, i32) {
    let s = &rules.spacings;
    let edges = [s.side_to_side, s.side_to_end, s.end_to_end].map(|v| v.unwrap_or(rules.spacing));
    let corner = s.corner_to_corner.unwrap_or(rules.spacing);
    let least = edges.into_iter().min().unwrap().min(corner);
    (edges, corner, least)
}

pub fn least(rules: &Rules) -> i32 {
    values(rules).2
}

/// The unit edges of the first edge along which it is too close to the second, each with the one across.
pub fn faced(
    [f, g]: [&Feature; 2],
    [e, h]: [&Edge; 2],
    rules: &Rules,
) -> Vec<(UnitEdge, UnitEdge)> {
    let (one, other) = (e.units[0], h.units[0]);
    if one.out != other.out.map(|step| -step) {
        return Vec::new();
    }
    let gap = (other.height() - one.height()) * (one.out[0] + one.out[1]);
    if gap < 0 {
        return Vec::new();
    }
    let across = |unit: &UnitEdge| h.units.iter().find(|u| u.along() == unit.along());
    let both: Vec<(UnitEdge, UnitEdge)> = e
        .units
        .iter()
        .filter_map(|unit| Some((*unit, *across(unit)?)))
        .collect();
    let kinds = usize::from(e.is_end) + usize::from(h.is_end);
    let all = gap < values(rules).0[kinds];
    let rows = rules.spacings.wide.iter().filter(|row| gap < row.spacing);
    let mut wide: BTreeSet<(UnitEdge, UnitEdge)> = BTreeSet::new();
    for row in rows {
        for first in [true, false] {
            let deep = |(a, b): &&(UnitEdge, UnitEdge)| match first {
                true => a.depth(f) >= row.width,
                false => b.depth(g) >= row.width,
            };
            if both.iter().filter(deep).count() as i32 >= row.run_length {
                wide.extend(both.iter().filter(deep).copied());
            }
        }
    }
    both.into_iter()
        .filter(|pair| all || wide.contains(pair))
        .collect()
}

/// The pairs of convex corners, of the first and of the second, that are too close.
pub fn turned([f, g]: [&Feature; 2], rules: &Rules) -> Vec<(Corner, Corner)> {
    // Which way a corner points: away from its cell.
    let way = |(point, cell): &Corner| [0, 1].map(|i| if point[i] > cell[i] { 1 } else { -1 });
    let mut found = Vec::new();
    for a in &f.corners {
        for b in &g.corners {
            let by = [b.0[0] - a.0[0], b.0[1] - a.0[1]];
            let (wa, wb) = (way(a), way(b));
            let opposite = wa == wb.map(|w| -w);
            let outwards = (0..2).all(|i| by[i] * wa[i] >= 0);
            let corner = values(rules).1;
            let close = is_less(by, corner, rules.spacings.metric);
            if opposite && outwards && by != [0, 0] && close {
                found.push((*a, *b));
            }
        }
    }
    found
}

pub fn square([x, y]: Cell) -> [i32; 4] {
    [x, y, x + 1, y + 1]
}

/// A run: from where to where along, its lower and upper side, and whether the feature goes on at its ends.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Run {
    pub upright: bool,
    pub along: [i32; 2],
    pub across: [i32; 2],
    pub goes_on: [bool; 2],
}

pub fn flipped(cells: &Cells, upright: bool) -> Cells {
    cells
        .iter()
        .map(|&[x, y]| if upright { [y, x] } else { [x, y] })
        .collect()
}

/// The runs of a feature: longest stretches on which the cross-section is one interval, longer than that.
pub fn runs(feature: &Feature) -> Vec<Run> {
    let mut found = Vec::new();
    for upright in [false, true] {
        let cells = flipped(&feature.cells, upright);
        // The intervals of each column.
        let mut columns: BTreeMap<i32, Vec<[i32; 2]>> = BTreeMap::new();
        for &[x, y] in &cells {
            let column = columns.entry(x).or_default();
            match column.last_mut() {
                Some(last) if last[1] == y => last[1] += 1,
                _ => column.push([y, y + 1]),
            }
        }
        let has =
            |x: i32, interval: &[i32; 2]| columns.get(&x).is_some_and(|c| c.contains(interval));
        let meets = |x: i32, [low, high]: [i32; 2]| {
            let column = columns.get(&x).into_iter().flatten();
            column
                .into_iter()
                .any(|other| other[0] <= high && low <= other[1])
        };
        for (&x, column) in &columns {
            for interval in column.iter().filter(|interval| !has(x - 1, interval)) {
                let end = (x..).find(|&x| !has(x, interval)).unwrap();
                if end - x > interval[1] - interval[0] {
                    found.push(Run {
                        upright,
                        along: [x, end],
                        across: *interval,
                        goes_on: [meets(x - 1, *interval), meets(end, *interval)],
                    });
                }
            }
        }
    }
    found
}

impl Run {
    fn turned(&self, [x0, y0, x1, y1]: [i32; 4]) -> [i32; 4] {
        if self.upright {
            [y0, x0, y1, x1]
        } else {
            [x0, y0, x1, y1]
        }
    }

    /// The rectangle from one place to another.
    pub fn rect(&self, from: i32, to: i32) -> [i32; 4] {
        self.turned([from, self.across[0], to, self.across[1]])
    }

    /// Whether a cut may be there, what is kept out included.
    pub fn is_legal(&self, place: i32, rules: &Rules, keep_outs: &[([i32; 4], i32)]) -> bool {
        let rule = &rules.stitch;
        let half = rule.overlap / 2;
        let room = [place - self.along[0], self.along[1] - place];
        let fits = (0..2).all(|end| match self.goes_on[end] {
            true => room[end] >= (half + rule.corner).max(1),
            false => room[end] >= rule.fragment_length.max(half).max(1),
        });
        let overlap = self.rect(place - half, place + half);
        let is_hit = |&(via, distance): &([i32; 4], i32)| {
            is_near(overlap, via, distance, rules.spacings.metric)
        };
        fits && !keep_outs.iter().any(is_hit)
    }
}
