//! Whether two shapes come closer than a spacing, exactly, in either metric.
//!
//! Rectangles by the gaps along the axes. An outline with slanted edges is as far from another shape as the
//! nearest two edges are, unless one lies within the other: then a vertex of it is enclosed. Two segments have a point in
//! common when their boxes have and each has its ends on both sides of the other's line, or on it; else an end of one is nearest,
//! whatever the metric. A point whose foot is inside a segment is cross / length away from it. In the square metric, a
//! segment comes closer to a point than s where it meets the open square of half side s around it: where neither an upright nor a level line,
//! nor one along the segment, has the two on different sides.
//!
//! Coordinates are within 2^30 of zero: a cross product is at most 2^62, and both sides of each comparison fit 127 bits.

use super::near;
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use crate::layout::Metric;

/// Strictly closer than a spacing, or sharing a point: with a spacing of 0, the latter only.
#[derive(Clone, Copy, Debug)]
pub(super) struct Within {
    pub(super) spacing: i32,
    pub(super) metric: Metric,
}

/// Sharing a point.
pub(super) const TOUCHING: Within = Within {
    spacing: 0,
    metric: Metric::Euclidean,
};

impl Within {
    /// Whether what is so far away along x and along y is.
    pub(super) fn holds(self, [dx, dy]: [i128; 2]) -> bool {
        let spacing = i128::from(self.spacing);
        let is_closer = match self.metric {
            Metric::Euclidean => dx * dx + dy * dy < spacing * spacing,
            Metric::Square => dx.abs().max(dy.abs()) < spacing,
        };
        is_closer || [dx, dy] == [0, 0]
    }
}

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
    /// Whether two of them are.
    pub(super) fn closer(&self, a: u32, b: u32, within: Within) -> bool {
        let [first, second] = [a, b].map(|body| &self.boxes[body as usize]);
        if self.is_rect(a) && self.is_rect(b) {
            return within.holds(gaps(first, second));
        }
        outlines_closer([&self.corners(a), &self.corners(b)], within)
    }

    /// Which rectangles come close to which of them: the rectangle first, sorted.
    pub(super) fn met(&self, rects: &[Rect], within: Within) -> Result<Vec<[u32; 2]>, Rejection> {
        let count = self.boxes.len() as u32;
        let boxes: Vec<Rect> = self.boxes.iter().chain(rects).copied().collect();
        let labels: Vec<u32> = (0..boxes.len() as u32)
            .map(|i| u32::from(i < count))
            .collect();
        let close = |body: u32, rect: u32| {
            let area = &boxes[rect as usize];
            let is_close = match self.is_rect(body) {
                true => within.holds(gaps(&boxes[body as usize], area)),
                false => outlines_closer([&self.corners(body), &area.corners()], within),
            };
            is_close.then_some([rect - count, body])
        };
        near::pairs(&boxes, &labels, (within.spacing - 1).max(0), close)
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

/// How far two rectangles are from each other along x and along y.
fn gaps(a: &Rect, b: &Rect) -> [i128; 2] {
    let gap = |low: i32, high: i32| (i128::from(low) - i128::from(high)).max(0);
    [
        gap(a.min.x, b.max.x).max(gap(b.min.x, a.max.x)),
        gap(a.min.y, b.max.y).max(gap(b.min.y, a.max.y)),
    ]
}

/// An edge by its ends.
pub(super) type Edge = [Point; 2];

/// The edges of a closed outline.
pub(super) fn edges(outline: &[Point]) -> impl Iterator<Item = Edge> + '_ {
    let next = outline.iter().cycle().skip(1);
    outline.iter().zip(next).map(|(&a, &b)| [a, b])
}

fn outlines_closer(outlines: [&[Point]; 2], within: Within) -> bool {
    let area = |points: &[Point]| Rect::around(points).unwrap_or_default();
    let near = |edge: &Edge, other: &Rect| within.holds(gaps(&area(edge), other));
    let [a, b] = outlines.map(area);
    let mine: Vec<Edge> = edges(outlines[0]).filter(|edge| near(edge, &b)).collect();
    let others: Vec<Edge> = edges(outlines[1]).filter(|edge| near(edge, &a)).collect();
    let meet = |one: &Edge| {
        let around = area(one);
        let test = |other: &Edge| near(other, &around) && segments_closer(*one, *other, within);
        others.iter().any(test)
    };
    mine.iter().any(meet)
        || encloses(outlines[0], outlines[1])
        || encloses(outlines[1], outlines[0])
}

/// Whether two segments are.
pub(super) fn segments_closer(one: Edge, other: Edge, within: Within) -> bool {
    let straddles =
        |[a, b]: Edge, [c, d]: Edge| cross(a, b, c).signum() * cross(a, b, d).signum() <= 0;
    let boxes = [one, other].map(|edge| Rect::around(&edge).unwrap_or_default());
    let share = boxes[0].touches(&boxes[1]) && straddles(one, other) && straddles(other, one);
    let ends_near = |from: Edge, to: Edge| from.iter().any(|&end| point_closer(end, to, within));
    share || ends_near(one, other) || ends_near(other, one)
}

fn point_closer(point: Point, [a, b]: Edge, within: Within) -> bool {
    let [along, from_a, from_b] = [vector(a, b), vector(a, point), vector(b, point)];
    let spacing = i128::from(within.spacing);
    let height = cross(a, b, point);
    if within.metric == Metric::Square {
        let meets = |axis: usize| {
            from_a[axis].min(from_b[axis]) < spacing && -spacing < from_a[axis].max(from_b[axis])
        };
        let reach = spacing * (along[0].abs() + along[1].abs());
        return meets(0) && meets(1) && (a == b || height.abs() < reach);
    }
    let dot = |v: [i128; 2], w: [i128; 2]| v[0] * w[0] + v[1] * w[1];
    if dot(along, from_a) <= 0 {
        return dot(from_a, from_a) < spacing * spacing;
    }
    if dot(along, from_b) >= 0 {
        return dot(from_b, from_b) < spacing * spacing;
    }
    height * height < spacing * spacing * dot(along, along)
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
