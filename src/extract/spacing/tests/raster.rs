//! What close means, word by word, on a raster of unit cells. It knows nothing of rectangles, sweeps, trees or sums:
//! an outline is the unit edges between a cell of the feature and one that is not.

use crate::geometry::Rect;
use crate::layout::{Metric, Rules};

/// The side of the raster.
pub const SIZE: i32 = 28;

/// A set of unit cells, by the coordinates of their lower left corners.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Cells(Vec<bool>);

impl Cells {
    pub fn of(rects: impl IntoIterator<Item = Rect>) -> Cells {
        let mut cells = Cells(vec![false; (SIZE * SIZE) as usize]);
        for r in rects {
            for y in r.min.y..r.max.y {
                for x in r.min.x..r.max.x {
                    cells.0[(y * SIZE + x) as usize] = true;
                }
            }
        }
        cells
    }

    pub fn has(&self, [x, y]: [i32; 2]) -> bool {
        let range = 0..SIZE;
        range.contains(&x) && range.contains(&y) && self.0[(y * SIZE + x) as usize]
    }

    fn list(&self) -> Vec<[i32; 2]> {
        let all = (0..SIZE).flat_map(|y| (0..SIZE).map(move |x| [x, y]));
        all.filter(|&cell| self.has(cell)).collect()
    }
}

/// The four outward normals: right, up, left, down.
const NORMALS: [[i32; 2]; 4] = [[1, 0], [0, 1], [-1, 0], [0, -1]];

/// A straight edge.
#[derive(Debug)]
struct Edge {
    normal: [i32; 2],
    /// Its coordinate along the normal's axis.
    at: i32,
    /// The cells behind it, in order.
    behind: Vec<[i32; 2]>,
    is_end: bool,
    /// How deep the feature is behind each of them.
    depth: Vec<i32>,
}

#[derive(Debug)]
struct Corner {
    at: [i32; 2],
    /// To where the outside is: +1 or -1 along x and along y.
    turn: [i32; 2],
}

/// A feature with its outline.
pub struct Outline {
    cells: Cells,
    edges: Vec<Edge>,
    corners: Vec<Corner>,
}

fn plus([x, y]: [i32; 2], [dx, dy]: [i32; 2], times: i32) -> [i32; 2] {
    [x + times * dx, y + times * dy]
}

impl Outline {
    pub fn new(cells: &Cells, end_length: i32) -> Outline {
        let mut edges = Vec::new();
        for normal in NORMALS {
            // Along an edge, with the larger coordinate.
            let along = [normal[1].abs(), normal[0].abs()];
            let is_edge = |cell| cells.has(cell) && !cells.has(plus(cell, normal, 1));
            for first in cells.list() {
                if !is_edge(first) || is_edge(plus(first, along, -1)) {
                    continue;
                }
                let steps = (0..).map(|i| plus(first, along, i));
                let behind: Vec<[i32; 2]> = steps.take_while(|&cell| is_edge(cell)).collect();
                let length = behind.len() as i32;
                let beyond = [plus(first, along, -1), plus(first, along, length)];
                let is_free = |&cell: &[i32; 2]| {
                    // Neither beyond the edge nor beyond it in front.
                    !cells.has(cell) && !cells.has(plus(cell, normal, 1))
                };
                let is_convex = beyond.iter().all(is_free);
                let deep = |&cell: &[i32; 2]| {
                    let inwards = (0..).map(|i| plus(cell, normal, -i));
                    inwards.take_while(|&cell| cells.has(cell)).count() as i32
                };
                let axis = usize::from(normal[1] != 0);
                edges.push(Edge {
                    normal,
                    at: first[axis] + i32::from(normal[axis] > 0),
                    depth: behind.iter().map(deep).collect(),
                    is_end: is_convex && length < end_length,
                    behind,
                });
            }
        }
        let mut corners = Vec::new();
        for cell in cells.list() {
            for turn in [[1, 1], [1, -1], [-1, 1], [-1, -1]] {
                let beside = [[turn[0], 0], [0, turn[1]], turn];
                if beside.iter().all(|&step| !cells.has(plus(cell, step, 1))) {
                    let at = [0, 1].map(|i| cell[i] + i32::from(turn[i] > 0));
                    corners.push(Corner { at, turn });
                }
            }
        }
        let cells = cells.clone();
        Outline {
            cells,
            edges,
            corners,
        }
    }

    pub fn cells(&self) -> &Cells {
        &self.cells
    }
}

fn is_less(d: [i32; 2], spacing: i32, metric: Metric) -> bool {
    match metric {
        Metric::Euclidean => d[0] * d[0] + d[1] * d[1] < spacing * spacing,
        Metric::Square => d[0].max(d[1]) < spacing,
    }
}

/// Whether two sets of cells are closer than a distance.
pub fn closer(a: &Cells, b: &Cells, spacing: i32, metric: Metric) -> bool {
    let others = b.list();
    let apart = |p: [i32; 2], q: [i32; 2]| [0, 1].map(|i| ((p[i] - q[i]).abs() - 1).max(0));
    let near = |p: &[i32; 2]| {
        others
            .iter()
            .any(|&q| is_less(apart(*p, q), spacing, metric))
    };
    a.list().iter().any(near)
}

/// Whether region `a` of feature `f` and region `b` of feature `g` are close, with the number of the first part of the
/// definition that says so.
pub fn close(a: &Cells, f: &Outline, b: &Cells, g: &Outline, rules: &Rules) -> Option<u8> {
    if closer(a, b, least(rules), rules.spacings.metric) {
        return Some(1);
    }
    let reasons = reasons(a, f, b, g, rules).into_iter();
    reasons.map(|(part, _)| part).min()
}

fn values(rules: &Rules) -> [i32; 4] {
    let spacings = &rules.spacings;
    [
        spacings.side_to_side,
        spacings.side_to_end,
        spacings.end_to_end,
        spacings.corner_to_corner,
    ]
    .map(|given| given.unwrap_or(rules.spacing))
}

/// The smallest spacing.
pub fn least(rules: &Rules) -> i32 {
    values(rules).into_iter().fold(i32::MAX, i32::min)
}

/// The edges and corners by which two regions are close: the number of the part of the definition, and the numbers
/// of the two edges or corners.
pub fn reasons(
    a: &Cells,
    f: &Outline,
    b: &Cells,
    g: &Outline,
    rules: &Rules,
) -> Vec<(u8, [usize; 2])> {
    let spacings = &rules.spacings;
    let [sides, mixed, ends, corner] = values(rules);
    let mut found = Vec::new();
    for (m, e) in f.edges.iter().enumerate() {
        for (n, d) in g.edges.iter().enumerate() {
            let Some((gap, shared)) = face(e, d) else {
                continue;
            };
            let spacing = match (e.is_end, d.is_end) {
                (false, false) => sides,
                (true, true) => ends,
                _ => mixed,
            };
            let owned = |&&[i, j]: &&[usize; 2]| a.has(e.behind[i]) && b.has(d.behind[j]);
            if gap < spacing && shared.iter().any(|pair| owned(&pair)) {
                found.push((2, [m, n]));
            }
            for row in &spacings.wide {
                for side in [0, 1] {
                    let depth = [&e.depth, &d.depth][side];
                    let wide = shared.iter().filter(|at| depth[at[side]] >= row.width);
                    let wide: Vec<&[usize; 2]> = wide.collect();
                    let is_long = wide.len() as i32 >= row.run_length;
                    if gap < row.spacing && is_long && wide.iter().any(owned) {
                        found.push((4, [m, n]));
                    }
                }
            }
        }
    }
    let touches = |cells: &Cells, at: [i32; 2]| {
        let around = [[0, 0], [-1, 0], [0, -1], [-1, -1]];
        around.iter().any(|&step| cells.has(plus(at, step, 1)))
    };
    for (m, p) in f.corners.iter().enumerate() {
        for (n, q) in g.corners.iter().enumerate() {
            let turned = p.turn == q.turn.map(|t| -t);
            let towards = [0, 1].map(|i| (q.at[i] - p.at[i]) * p.turn[i]);
            if turned
                && towards.iter().all(|&d| d >= 0)
                && towards != [0, 0]
                && is_less(towards, corner, spacings.metric)
                && touches(a, p.at)
                && touches(b, q.at)
            {
                found.push((3, [m, n]));
            }
        }
    }
    found
}

/// Whether a straight line, a rectangle of no width, is closer to a set of cells than a distance.
pub fn line_closer(line: Rect, b: &Cells, spacing: i32, metric: Metric) -> bool {
    let [low, high] = [[line.min.x, line.min.y], [line.max.x, line.max.y]];
    let apart = |q: [i32; 2]| [0, 1].map(|i| (q[i] - high[i]).max(low[i] - q[i] - 1).max(0));
    b.list().iter().any(|&q| is_less(apart(q), spacing, metric))
}

/// The gap between two edges that face each other, and the places that they share, by their cells.
fn face(e: &Edge, d: &Edge) -> Option<(i32, Vec<[usize; 2]>)> {
    let axis = usize::from(e.normal[1] != 0);
    let gap = (d.at - e.at) * e.normal[axis];
    if d.normal != e.normal.map(|n| -n) || gap < 0 {
        return None;
    }
    let along = |cell: &[i32; 2]| cell[1 - axis];
    let mut shared = Vec::new();
    for (i, p) in e.behind.iter().enumerate() {
        let same = d.behind.iter().position(|q| along(q) == along(p));
        shared.extend(same.map(|j| [i, j]));
    }
    Some((gap, shared))
}
