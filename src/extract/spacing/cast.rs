//! The shadows that edges and corners of neighbours cast on a run: 2 to 4 of the relation in [`super`].
//!
//! The long sides of a run are outline over its whole length, each a part of one edge. A neighbour's edge in front
//! of one, over a stretch [u, v] of the run, is too close to what a cut leaves of the run exactly when that has more than a
//! point of [u, v]: to [x, t] from t = u + 1 on, and to [t, y] up to t = v - 1. A stretch of unit length casts
//! a shadow without a place, from u + 1 to u: a cut on either side of it, and none in it.
//!
//! Where two edges are too close on several stretches, because one feature is wide behind these only, a shadow from the
//! first to the last of them is cast besides: a cut in between leaves two parts that are both too close, through the
//! same two edges.
//!
//! Outline across the run is at its ends only, and so are convex corners: a vertex inside a long side would
//! end it. What faces them too closely is too close to whatever part has that end of the run, and casts a
//! shadow on this one place.

use super::super::runs::{Direction, Run};
use super::super::shadows::Shadow;
use super::Relation;
use super::corners::{are_close, beyond};
use super::faces::{Each, Faces};
use super::facing::{gap, reach, rows_that_hold, spacing};
use super::outlines::{Axis, Corner, Edge};
use crate::geometry::{Point, Rect};

/// A run of a feature with what a search for shadows needs.
struct Search<'a> {
    faces: &'a Faces,
    relation: &'a Relation,
    feature: u32,
    run: &'a Run,
    found: &'a mut Vec<Shadow>,
}

/// Adds the shadows on a run of `feature` that come from outlines. The owners of `faces` are features.
pub(in crate::extract) fn on_run(
    faces: &Faces,
    relation: &Relation,
    feature: u32,
    run: &Run,
    found: &mut Vec<Shadow>,
) {
    let mut search = Search {
        faces,
        relation,
        feature,
        run,
        found,
    };
    search.long_sides();
    search.ends();
    if relation.corner > relation.least {
        search.corners();
    }
}

impl Search<'_> {
    /// The axis along the run.
    fn axis(&self) -> usize {
        match self.run.direction {
            Direction::Horizontal => 0,
            Direction::Vertical => 1,
        }
    }

    fn long_sides(&mut self) {
        let Run {
            from,
            to,
            low,
            high,
            ..
        } = *self.run;
        let mut stretches = Vec::new();
        for (is_up, at) in [(false, low), (true, high)] {
            self.facing(self.axis(), is_up, at, [from, to], &mut stretches);
        }
        let shadows = stretches.into_iter().map(|([u, v], feature)| Shadow {
            from: u + 1,
            to: v - 1,
            feature,
        });
        self.found.extend(shadows);
    }

    fn ends(&mut self) {
        let Run {
            from,
            to,
            low,
            high,
            ..
        } = *self.run;
        for (is_up, place) in [(false, from), (true, to)] {
            let mut stretches = Vec::new();
            self.facing(1 - self.axis(), is_up, place, [low, high], &mut stretches);
            for (_, feature) in stretches {
                self.at_place(place, feature);
            }
        }
    }

    fn at_place(&mut self, place: i32, feature: u32) {
        let (from, to) = (place, place);
        self.found.push(Shadow { from, to, feature });
    }

    /// The stretches of the own edges on a line, between two places, that edges of neighbours face too
    /// closely, each with the neighbour.
    fn facing(
        &self,
        axis: usize,
        is_up: bool,
        at: i32,
        ends: [i32; 2],
        found: &mut Vec<([i32; 2], u32)>,
    ) {
        let edges = &self.faces.outlines.axes[axis];
        let opposite = &self.faces.sides[axis][usize::from(!is_up)];
        for own in edges.on_line(self.feature, is_up, at, ends) {
            let Edge { from, to, .. } = edges.edges[own as usize];
            let [from, to] = [from.max(ends[0]), to.min(ends[1])];
            let mut each = Each(|item| {
                let span = &opposite.spans[item as usize];
                let shared = [from.max(span.from), to.min(span.to)];
                if span.owner == self.feature || shared[0] >= shared[1] {
                    return;
                }
                let pair = [own, span.edge];
                if gap(edges, pair) < spacing(edges, self.relation, pair) {
                    found.push((shared, span.owner));
                } else {
                    let parts = self.wide_parts(edges, pair, shared);
                    found.extend(parts.into_iter().map(|part| (part, span.owner)));
                }
            });
            let area = reach([from, to], at, is_up, self.relation);
            opposite.tree.query(&area, &mut each);
        }
    }

    /// The stretches of what two edges share on which they are too close by a row of the table; and from the first
    /// to the last of them.
    fn wide_parts(&self, edges: &Axis, pair: [u32; 2], shared: [i32; 2]) -> Vec<[i32; 2]> {
        let mut parts = Vec::new();
        for (wide, row) in rows_that_hold(edges, self.relation, pair) {
            let width = self.relation.wide[row].width;
            parts.extend(edges.deep.stretches(wide, width, shared));
        }
        let all = (parts.iter().copied()).reduce(|all, part| {
            let [from, to] = part;
            [all[0].min(from), all[1].max(to)]
        });
        parts.extend(all);
        parts
    }

    /// The corners at the ends of the run.
    fn corners(&mut self) {
        let area = self.run.direction.turn(self.run.along());
        let [xs, ys] = [[area.min.x, area.max.x], [area.min.y, area.max.y]];
        let (faces, feature) = (self.faces, self.feature);
        let own = faces.outlines.corners_between(feature, xs).iter();
        for corner in own.filter(|corner| (ys[0]..=ys[1]).contains(&corner.at.y)) {
            let place = match self.run.direction {
                Direction::Horizontal => corner.at.x,
                Direction::Vertical => corner.at.y,
            };
            for other in self.turned_to(corner) {
                self.at_place(place, other);
            }
        }
    }

    /// The neighbours with a corner that a corner is turned to, too close to it.
    fn turned_to(&self, corner: &Corner) -> Vec<u32> {
        let is_mirrored = corner.is_right != corner.is_upper;
        let quarter = &self.faces.quarters[usize::from(is_mirrored)];
        let at = match is_mirrored {
            false => corner.at,
            true => Point::new(-corner.at.x, corner.at.y),
        };
        let mut found = Vec::new();
        let mut push = |(place, owner): (Point, u32)| {
            if owner != self.feature && are_close(at, place, self.relation) {
                found.push(owner);
            }
        };
        let far = beyond(at, [corner.is_upper; 2], self.relation.corner);
        let area = Rect::around(&[at, far]).unwrap_or_default();
        if corner.is_upper {
            let mut each = Each(|item| push(quarter.targets[item as usize]));
            quarter.tree.query(&area, &mut each);
        } else {
            let mut each = Each(|item| push(quarter.seekers[item as usize]));
            quarter.seeker_tree.query(&area, &mut each);
        }
        found
    }
}
