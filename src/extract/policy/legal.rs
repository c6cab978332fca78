//! The places of a run where a stitch is legal, whatever other stitches there are.
//!
//! The overlap of a stitch stays on the run, at least the corner rule from a junction; the cut line is at least the
//! smallest fragment length from a line end; and the overlap keeps its distance from the shapes of each
//! keep-out layer. What the first two leave is one stretch of places. A rectangle of a keep-out layer takes away one
//! interval of it: its shadow, with the keep-out distance in place of the spacing, grown by half the overlap.
//!
//! So does an edge of a slanted outline: the distance between two convex sets of which one moves along a line is a
//! convex function of the place. Its ends are found by bisection, from the place where the edge is nearest
//! to the cross-section (or, where it passes through, less than a unit off: that is too close for any
//! distance, which is at least 1). Between the intervals of the edges the overlap is either in the outline or
//! out of it, and one place of each stretch tells which: no edge gets from one side of it to the other between two
//! places of the grid, as it would be closer than a unit to one of them.

use super::super::parts::{Part, Parts};
use super::super::runs::{Direction, End, Run};
use crate::geometry::distance::Outline;
use crate::geometry::orientation::cross;
use crate::geometry::rtree::Visitor;
use crate::geometry::segment::Segment;
use crate::geometry::winding::{edges, encloses};
use crate::geometry::{Point, Rect};
use crate::layout::StitchRules;
use crate::layout::rules::Metric;

/// The legal places of a run: stretches [first, last], ascending, with at least one place between two of
/// them.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Legal(Vec<[i32; 2]>);

impl Legal {
    /// The places that the ends of a run leave.
    pub fn between_ends(run: &Run, rules: &StitchRules) -> Legal {
        let half = i64::from(rules.overlap / 2);
        let room = |end: End| match end {
            End::Line => i64::from(rules.fragment_length).max(half).max(1),
            End::Junction => (half + i64::from(rules.corner)).max(1),
        };
        let first = i64::from(run.from) + room(run.ends[0]);
        let last = i64::from(run.to) - room(run.ends[1]);
        if first > last {
            return Legal::default();
        }
        // Both are within the run.
        Legal(vec![[first as i32, last as i32]])
    }

    /// The stretches.
    pub fn stretches(&self) -> &[[i32; 2]] {
        &self.0
    }

    /// Whether there is no legal place.
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    /// Whether a place is legal.
    pub fn contains(&self, place: i32) -> bool {
        let stretch = self.0.get(self.0.partition_point(|s| s[1] < place));
        stretch.is_some_and(|s| s[0] <= place)
    }

    /// The first legal place that is not before `place`.
    pub fn first_from(&self, place: i64) -> Option<i32> {
        let after = self.0.partition_point(|s| i64::from(s[1]) < place);
        let [first, last] = *self.0.get(after)?;
        // At most `last`.
        Some(place.clamp(first.into(), last.into()) as i32)
    }

    /// The last legal place that is not after `place`.
    pub fn last_up_to(&self, place: i64) -> Option<i32> {
        let after = self.0.partition_point(|s| i64::from(s[0]) <= place);
        let [first, last] = *self.0.get(after.checked_sub(1)?)?;
        Some(place.clamp(first.into(), last.into()) as i32)
    }

    /// The same along the mirror image of the run, where place t is -t.
    pub fn mirrored(&self) -> Legal {
        let turned = |&[first, last]: &[i32; 2]| [-last, -first];
        Legal(self.0.iter().rev().map(turned).collect())
    }

    /// Takes the places of some intervals away.
    fn without(&mut self, mut taken: Vec<[i64; 2]>) {
        taken.sort_unstable();
        let mut left = Vec::new();
        for &[first, last] in &self.0 {
            let (mut from, last) = (i64::from(first), i64::from(last));
            for &[start, end] in taken.iter().filter(|t| t[0] <= t[1]) {
                if start > from && from <= last {
                    left.push([from, last.min(start - 1)]);
                }
                from = from.max(end.saturating_add(1));
            }
            if from <= last {
                left.push([from, last]);
            }
        }
        // What is left are parts of stretches.
        self.0 = left
            .into_iter()
            .map(|ends| ends.map(|end| end as i32))
            .collect();
    }

    /// Takes away what is closer to the shapes of a keep-out layer than `distance`, which is at least 1.
    pub(super) fn keep_off(
        &mut self,
        run: &Run,
        half: i32,
        parts: &Parts,
        distance: i32,
        metric: Metric,
    ) {
        let reach = run.direction.turn(run.along().grown(distance - 1));
        let mut near = Near(Vec::new());
        parts.tree().query(&reach, &mut near);
        let overlap = Overlap {
            run,
            half,
            distance,
            metric,
        };
        let mut taken = Vec::new();
        for part in near.0 {
            match parts.get(part) {
                Part::Rect(rect) => taken.extend(overlap.close_to_rect(&rect)),
                Part::Slanted(outline) => taken.extend(overlap.close_to_outline(outline, self)),
            }
        }
        self.without(taken);
    }
}

struct Near(Vec<u32>);

impl Visitor for Near {
    fn enter(&mut self, _: usize) -> bool {
        true
    }

    fn visit(&mut self, item: u32) {
        self.0.push(item);
    }
}

/// The farthest that a rectangle can be along and still be closer than `spacing`, when it is `across` away
/// across; nothing where it never is.
pub(super) fn beyond(across: i64, spacing: i32, metric: Metric) -> Option<i64> {
    let spacing = i64::from(spacing);
    if across >= spacing {
        return None;
    }
    Some(match metric {
        // The largest integer whose square is below s^2 - dy^2.
        Metric::Euclidean => (spacing * spacing - across * across - 1).isqrt(),
        Metric::Square => spacing - 1,
    })
}

/// The overlap of a stitch on a run, as it moves along.
struct Overlap<'a> {
    run: &'a Run,
    half: i32,
    distance: i32,
    metric: Metric,
}

impl Overlap<'_> {
    fn close_to_rect(&self, rect: &Rect) -> Option<[i64; 2]> {
        let rect = self.run.direction.turn(*rect);
        let above = i64::from(rect.min.y) - i64::from(self.run.high);
        let below = i64::from(self.run.low) - i64::from(rect.max.y);
        let reach = beyond(above.max(below).max(0), self.distance, self.metric)?;
        let reach = reach + i64::from(self.half);
        Some([i64::from(rect.min.x) - reach, i64::from(rect.max.x) + reach])
    }

    fn close_to_outline(&self, outline: Outline<'_>, legal: &Legal) -> Vec<[i64; 2]> {
        let along = edges(outline.points()).map(|edge| self.turned(edge));
        let mut taken: Vec<[i64; 2]> = along.filter_map(|edge| self.close_to_edge(&edge)).collect();
        let mut open = legal.clone();
        open.without(taken.clone());
        for &[first, last] in open.stretches() {
            if encloses(outline.points(), self.run.line(first).min) {
                taken.push([first.into(), last.into()]);
            }
        }
        taken
    }

    fn turned(&self, edge: Segment) -> Segment {
        match self.run.direction {
            Direction::Horizontal => edge,
            Direction::Vertical => Segment {
                a: edge.a.transposed(),
                b: edge.b.transposed(),
            },
        }
    }

    /// The places of the run, between its ends, where the overlap is too close to an edge.
    fn close_to_edge(&self, edge: &Segment) -> Option<[i64; 2]> {
        let nearest = self.nearest(edge).clamp(self.run.from, self.run.to);
        if !self.is_close(nearest, edge) {
            return None;
        }
        let end = |end: i32| self.last_close(nearest, end, edge).into();
        Some([end(self.run.from), end(self.run.to)])
    }

    /// A place within a unit of where the edge is nearest to the cross-section.
    fn nearest(&self, edge: &Segment) -> i32 {
        let Run { low, high, .. } = *self.run;
        let (a, b) = if edge.a.y <= edge.b.y {
            (edge.a, edge.b)
        } else {
            (edge.b, edge.a)
        };
        if a.y < low && b.y > high {
            let [dx, dy] = crate::geometry::orientation::difference(a, b);
            let along = (i64::from(low) - i64::from(a.y)) * dx;
            return (i64::from(a.x) + along.div_euclid(dy)) as i32;
        }
        let across = |y: i32| {
            let above = i64::from(y) - i64::from(high);
            above.max(i64::from(low) - i64::from(y)).max(0)
        };
        if across(a.y) <= across(b.y) { a.x } else { b.x }
    }

    /// The farthest place from `start`, which is close, towards `end` up to which all are.
    fn last_close(&self, start: i32, end: i32, edge: &Segment) -> i32 {
        if self.is_close(end, edge) {
            return end;
        }
        let (mut inside, mut outside) = (i64::from(start), i64::from(end));
        while (outside - inside).abs() > 1 {
            let middle = (inside + outside).div_euclid(2);
            if self.is_close(middle as i32, edge) {
                inside = middle;
            } else {
                outside = middle;
            }
        }
        inside as i32
    }

    /// Whether the overlap at `place` is closer to an edge than the distance.
    fn is_close(&self, place: i32, edge: &Segment) -> bool {
        let Run { low, high, .. } = *self.run;
        let left = place.saturating_sub(self.half);
        let right = place.saturating_add(self.half);
        let overlap = Rect::new(left, low, right, high);
        match self.metric {
            Metric::Euclidean => {
                let inside = |p: Point| overlap.touches(&Rect { min: p, max: p });
                let corners = overlap.corners();
                inside(edge.a) || edges(&corners).any(|side| side.closer_than(edge, self.distance))
            }
            Metric::Square => meets_inside(&overlap.grown(self.distance), edge),
        }
    }
}

/// Whether a segment meets the inside of a rectangle: no line along an edge of one of them separates them.
fn meets_inside(rect: &Rect, edge: &Segment) -> bool {
    let (a, b) = (edge.a, edge.b);
    if a.x.max(b.x) <= rect.min.x
        || a.x.min(b.x) >= rect.max.x
        || a.y.max(b.y) <= rect.min.y
        || a.y.min(b.y) >= rect.max.y
    {
        return false;
    }
    let sides = rect.corners().map(|corner| cross(a, b, corner));
    // A single point has no sides, and is inside as it is within the box.
    a == b || (sides.iter().any(|&side| side < 0) && sides.iter().any(|&side| side > 0))
}

#[cfg(test)]
#[path = "legal_tests.rs"]
mod tests;
