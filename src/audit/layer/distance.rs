//! Whether two shapes come closer than a spacing, exactly.
//!
//! Rectangles by the gaps along the axes. An outline with slanted edges is as far from another shape as the
//! nearest two edges are, unless one lies within the other: then a vertex of it is enclosed. Two segments have a point in
//! common when their boxes have and each has its ends on both sides of the other's line, or on it; else an end of one is nearest. A
//! point whose foot is inside a segment is cross / length away from it.
//!
//! Coordinates are within 2^30 of zero: a cross product is at most 2^62, and both sides of each comparison fit 127 bits.

use crate::geometry::{Point, Rect};

/// Shapes: rectangles, and outlines that are known by their number besides.
#[derive(Debug, Default)]
pub(super) struct Bodies {
    /// The boxes around them.
    pub(super) boxes: Vec<Rect>,
    /// For each the number of its outline, or [`RECT`].
    pub(super) outline: Vec<u32>,
    /// Outlines with slanted edges, without spikes.
    pub(super) outlines: Vec<Vec<Point>>,
}

/// In place of the number of an outline: the shape is its box.
pub(super) const RECT: u32 = u32::MAX;

impl Bodies {
    /// Whether two of them are strictly closer than `spacing`; with 0, whether they share a point.
    pub(super) fn closer(&self, a: u32, b: u32, spacing: i32) -> bool {
        let limit = i128::from(spacing) * i128::from(spacing);
        let [first, second] = [a, b].map(|body| &self.boxes[body as usize]);
        if self.is_rect(a) && self.is_rect(b) {
            let gap = squared_gap(first, second);
            return gap < limit || gap == 0;
        }
        outlines_closer([&self.corners(a), &self.corners(b)], limit)
    }

    /// Whether one of them is its box.
    pub(super) fn is_rect(&self, body: u32) -> bool {
        self.outline[body as usize] == RECT
    }

    /// The vertices of one of them, in their order.
    pub(super) fn corners(&self, body: u32) -> std::borrow::Cow<'_, [Point]> {
        match self.outlines.get(self.outline[body as usize] as usize) {
            Some(outline) => outline.into(),
            None => self.boxes[body as usize].corners().to_vec().into(),
        }
    }
}

/// The squared distance of two rectangles.
fn squared_gap(a: &Rect, b: &Rect) -> i128 {
    let gap = |low: i32, high: i32| (i128::from(low) - i128::from(high)).max(0);
    let dx = gap(a.min.x, b.max.x).max(gap(b.min.x, a.max.x));
    let dy = gap(a.min.y, b.max.y).max(gap(b.min.y, a.max.y));
    dx * dx + dy * dy
}

/// An edge and its box.
pub(super) type Edge = [Point; 2];

/// The edges of a closed outline.
pub(super) fn edges(outline: &[Point]) -> impl Iterator<Item = Edge> + '_ {
    let next = outline.iter().cycle().skip(1);
    outline.iter().zip(next).map(|(&a, &b)| [a, b])
}

fn outlines_closer(outlines: [&[Point]; 2], limit: i128) -> bool {
    let area = |points: &[Point]| Rect::around(points).unwrap_or_default();
    let near = |edge: &Edge, other: &Rect| {
        let gap = squared_gap(&area(edge), other);
        gap < limit || gap == 0
    };
    let [a, b] = outlines.map(area);
    let mine: Vec<Edge> = edges(outlines[0]).filter(|edge| near(edge, &b)).collect();
    let others: Vec<Edge> = edges(outlines[1]).filter(|edge| near(edge, &a)).collect();
    let meet = |one: &Edge| {
        let around = area(one);
        let test = |other: &Edge| near(other, &around) && segments_closer(*one, *other, limit);
        others.iter().any(test)
    };
    mine.iter().any(meet)
        || encloses(outlines[0], outlines[1])
        || encloses(outlines[1], outlines[0])
}

/// Whether two segments are closer than the root of `limit`, or share a point.
pub(super) fn segments_closer(one: Edge, other: Edge, limit: i128) -> bool {
    let straddles =
        |[a, b]: Edge, [c, d]: Edge| cross(a, b, c).signum() * cross(a, b, d).signum() <= 0;
    let boxes = [one, other].map(|edge| Rect::around(&edge).unwrap_or_default());
    let share = boxes[0].touches(&boxes[1]) && straddles(one, other) && straddles(other, one);
    let ends_near = |from: Edge, to: Edge| from.iter().any(|&end| point_closer(end, to, limit));
    share || ends_near(one, other) || ends_near(other, one)
}

fn point_closer(point: Point, [a, b]: Edge, limit: i128) -> bool {
    let dot = |v: [i128; 2], w: [i128; 2]| v[0] * w[0] + v[1] * w[1];
    let [along, from_a, from_b] = [vector(a, b), vector(a, point), vector(b, point)];
    if dot(along, from_a) <= 0 {
        return dot(from_a, from_a) < limit;
    }
    if dot(along, from_b) >= 0 {
        return dot(from_b, from_b) < limit;
    }
    let height = cross(a, b, point);
    height * height < limit * dot(along, along)
}

fn vector(from: Point, to: Point) -> [i128; 2] {
    [
        i128::from(to.x) - i128::from(from.x),
        i128::from(to.y) - i128::from(from.y),
    ]
}

/// Twice the area of the triangle, positive when it is run around counter-clockwise.
pub(super) fn cross(a: Point, b: Point, c: Point) -> i128 {
    let [ab, ac] = [vector(a, b), vector(a, c)];
    ab[0] * ac[1] - ab[1] * ac[0]
}

/// Whether an outline that runs past the first vertex of another one runs around it: how often it crosses the upright
/// ray from there, one way less the other.
fn encloses(outline: &[Point], other: &[Point]) -> bool {
    let Some(&point) = other.first() else {
        return false;
    };
    let turns = edges(outline).map(|[a, b]| {
        let side = cross(a, b, point);
        match [a.x <= point.x, b.x <= point.x] {
            [true, false] if side < 0 => 1i64,
            [false, true] if side > 0 => -1,
            _ => 0,
        }
    });
    turns.sum::<i64>() != 0
}
