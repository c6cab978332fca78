//! The shadows that neighbours cast on a run: where a part of it is close to them.
//!
//! A shadow says of one neighbour and one reason, from `from` to `to`: a cut at the place t leaves the run up to t, which is close
//! to the neighbour for this reason exactly when t >= from, and the run from t on, which is exactly when t <= to. At the
//! places from `from` to `to`, which the shadow covers, both are. Of any part [x, y] of the run, a shadow says that it is
//! close when y >= from and x <= to: a part is close when one of the shadows of the neighbour says so, and only then, with one
//! exception. Where two edges are too close on several stretches, because one feature is wide behind these only, there is
//! a shadow of each, and one from the first to the last, which says nothing of a part between two of them.
//!
//! By distance: cross-section and neighbour are closed sets, so in the Euclidean metric a rectangle at the distance dy
//! across covers the places t with dx(t)^2 + dy^2 < s^2: beyond its ends the shadow goes on for the largest dx
//! that still holds. In the square metric that is s - 1, whatever dy is. A slanted outline covers what one of
//! its edges covers. The distance from an edge to the cross-section is a convex function of the place, since both
//! are convex and one only moves: an edge's shadow is one interval, whose ends a binary search finds. It
//! holds a place of the grid, if any of the run: the edge does not pass through the run, so that one of its
//! ends, a point of the grid, is nearest to it across, and the distance is least there or at an end of the run.
//!
//! By outlines, where the rules look at them ([`super::spacing`]): a reason is a stretch [u, v] of an edge that a
//! neighbour's edge faces too closely. A part of the run has to have more than a point of it, so the shadow goes from
//! u + 1 to v - 1. For a stretch of unit length `to` is `from` - 1: this shadow covers no place, and yet every
//! cut leaves a part that is close. What faces an end of the run too closely, or a corner there, covers the one
//! place at this end.
//!
//! Source of the projection: A. B. Kahng, C.-H. Park, X. Xu, H. Yao, "Layout decomposition for double
//! patterning lithography" (ICCAD 2008). They project within the spacing across the run only; here shadows are
//! what conflict pairs are.

use super::neighbours::Neighbourhood;
use super::parts::Part;
use super::runs::{Direction, Run};
use super::spacing::cast;
use crate::geometry::orientation::difference;
use crate::geometry::rtree::Visitor;
use crate::geometry::segment::Segment;
use crate::geometry::{Point, Rect};
use crate::layout::Metric;

/// The places of a run, on the grid and within it, that one neighbour covers for one reason; none where
/// `to` is `from` - 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Shadow {
    /// The first place covered: what ends there or later is close.
    pub from: i32,
    /// The last place covered: what starts there or earlier is close.
    pub to: i32,
    /// The feature that casts it.
    pub feature: u32,
}

/// The shadows on a run of `feature`, sorted by where they start.
pub(super) fn on_run(around: &Neighbourhood<'_>, feature: u32, run: &Run) -> Vec<Shadow> {
    let mut search = Search {
        around,
        feature,
        run,
        found: Vec::new(),
    };
    let reach = run.along().grown(around.reach());
    let tree = around.parts.tree();
    tree.query(&run.direction.turn(reach), &mut search);
    let mut found = search.found;
    if let Some(faces) = around.faces {
        cast::on_run(faces, around.relation, feature, run, &mut found);
    }
    found.sort_unstable();
    found.dedup();
    found
}

struct Search<'a> {
    around: &'a Neighbourhood<'a>,
    feature: u32,
    run: &'a Run,
    found: Vec<Shadow>,
}

impl Search<'_> {
    fn push(&mut self, places: Option<[i32; 2]>, feature: u32) {
        if let Some([from, to]) = places {
            self.found.push(Shadow { from, to, feature });
        }
    }
}

impl Visitor for Search<'_> {
    fn enter(&mut self, node: usize) -> bool {
        !self.around.is_only(node, self.feature)
    }

    fn visit(&mut self, item: u32) {
        let other = self.around.owners.of(item);
        if other == self.feature {
            return;
        }
        let run = self.run;
        let closer = (
            self.around.spacing(self.feature, other),
            self.around.relation.metric,
        );
        match self.around.parts.get(item) {
            Part::Rect(rect) => self.push(of_rect(run, &rect, closer), other),
            Part::Slanted(outline) => {
                let reach = run.direction.turn(run.along().grown(closer.0 - 1));
                for edge in outline.edges_near(&reach) {
                    self.push(of_edge(run, &edge, closer), other);
                }
            }
        }
    }
}

/// The places of `run` that a rectangle covers.
fn of_rect(run: &Run, rect: &Rect, (spacing, metric): (i32, Metric)) -> Option<[i32; 2]> {
    let rect = run.direction.turn(*rect);
    let above = i64::from(rect.min.y) - i64::from(run.high);
    let below = i64::from(run.low) - i64::from(rect.max.y);
    let across = above.max(below).max(0);
    let spacing = i64::from(spacing);
    if across >= spacing {
        return None;
    }
    let beyond = match metric {
        // The largest integer whose square is below s^2 - dy^2.
        Metric::Euclidean => (spacing * spacing - across * across - 1).isqrt(),
        Metric::Square => spacing - 1,
    };
    let from = (i64::from(rect.min.x) - beyond).max(i64::from(run.from));
    let to = (i64::from(rect.max.x) + beyond).min(i64::from(run.to));
    // Both are between ends of the run where they are not out of order.
    (from <= to).then_some([from as i32, to as i32])
}

/// The places of `run` that an edge covers.
fn of_edge(run: &Run, edge: &Segment, (spacing, metric): (i32, Metric)) -> Option<[i32; 2]> {
    let edge = match run.direction {
        Direction::Horizontal => *edge,
        Direction::Vertical => Segment {
            a: edge.a.transposed(),
            b: edge.b.transposed(),
        },
    };
    let covered = |place: i32| {
        let section = Segment {
            a: Point::new(place, run.low),
            b: Point::new(place, run.high),
        };
        match metric {
            Metric::Euclidean => section.closer_than(&edge, spacing),
            Metric::Square => section.closer_than_square(&edge, spacing),
        }
    };
    // The place of the shadow nearest to its middle is the nearest one of the run, or none is.
    let nearest = nearest_place(run, &edge).clamp(run.from, run.to);
    if !covered(nearest) {
        return None;
    }
    Some([
        last_that(nearest, run.from, covered),
        last_that(nearest, run.to, covered),
    ])
}

/// A place on the line of the run, within a unit of where the edge is nearest to the cross-section.
fn nearest_place(run: &Run, edge: &Segment) -> i32 {
    let across = |point: Point| {
        let above = i64::from(point.y) - i64::from(run.high);
        above.max(i64::from(run.low) - i64::from(point.y)).max(0)
    };
    let (a, b) = (edge.a, edge.b);
    let passes = (a.y < run.low && b.y > run.high) || (b.y < run.low && a.y > run.high);
    if passes {
        // Where the edge meets the lower long side, rounded down: less than a unit off.
        let [dx, dy] = difference(a, b);
        let along = (i64::from(run.low) - i64::from(a.y)) * dx;
        return (i64::from(a.x) + along.div_euclid(dy)) as i32;
    }
    if across(a) <= across(b) { a.x } else { b.x }
}

/// The farthest place from `start`, which is covered, towards `end` up to which all are.
fn last_that(start: i32, end: i32, covered: impl Fn(i32) -> bool) -> i32 {
    if covered(end) {
        return end;
    }
    let (mut inside, mut outside) = (i64::from(start), i64::from(end));
    while (outside - inside).abs() > 1 {
        let middle = (inside + outside).div_euclid(2);
        if covered(middle as i32) {
            inside = middle;
        } else {
            outside = middle;
        }
    }
    inside as i32
}

#[cfg(test)]
mod tests {
    use super::super::runs::End;
    use super::*;
    use rand::{Rng, SeedableRng};

    fn run(direction: Direction) -> Run {
        Run {
            direction,
            from: 0,
            to: 100,
            low: 0,
            high: 10,
            ends: [End::Line; 2],
        }
    }

    fn interval(covered: impl Fn(i32) -> bool) -> Option<[i32; 2]> {
        let places: Vec<i32> = (0..=100).filter(|&t| covered(t)).collect();
        let ends = [*places.first()?, *places.last()?];
        assert_eq!(places.len() as i32, ends[1] - ends[0] + 1, "one interval");
        Some(ends)
    }

    #[test]
    fn beyond_the_end_of_a_neighbour_the_shadow_shrinks() {
        let run = run(Direction::Horizontal);
        // 3 across, 4 along is exactly 5.
        let rect = Rect::new(40, 13, 60, 20);
        assert_eq!(of_rect(&run, &rect, (5, Metric::Euclidean)), Some([37, 63]));
        assert_eq!(of_rect(&run, &rect, (3, Metric::Euclidean)), None);
        assert_eq!(of_rect(&run, &rect, (4, Metric::Euclidean)), Some([38, 62]));
        assert_eq!(
            of_rect(&run, &Rect::new(103, 0, 110, 10), (5, Metric::Euclidean)),
            Some([99, 100])
        );
        assert_eq!(
            of_rect(&run, &Rect::new(105, 0, 110, 10), (5, Metric::Euclidean)),
            None
        );
    }

    #[test]
    fn rectangles_agree_with_every_place() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(21);
        for _ in 0..5_000 {
            let (x, y) = (rng.random_range(-40..130), rng.random_range(-40..50));
            let rect = Rect::new(
                x,
                y,
                x + rng.random_range(1..30),
                y + rng.random_range(1..30),
            );
            let spacing = rng.random_range(1..30);
            for direction in [Direction::Horizontal, Direction::Vertical] {
                let run = run(direction);
                let gap = |a0: i32, a1: i32, b0: i32, b1: i32| (b0 - a1).max(a0 - b1).max(0);
                let gaps = |t| {
                    [
                        gap(t, t, rect.min.x, rect.max.x),
                        gap(0, 10, rect.min.y, rect.max.y),
                    ]
                };
                let euclidean = |t| gaps(t)[0].pow(2) + gaps(t)[1].pow(2) < spacing * spacing;
                let square = |t| gaps(t)[0].max(gaps(t)[1]) < spacing;
                let found = |metric| of_rect(&run, &direction.turn(rect), (spacing, metric));
                assert_eq!(found(Metric::Euclidean), interval(euclidean));
                assert_eq!(found(Metric::Square), interval(square));
            }
        }
    }

    #[test]
    fn edges_agree_with_every_place() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(22);
        for _ in 0..5_000 {
            let mut point = || Point::new(rng.random_range(-60..160), rng.random_range(-60..70));
            let edge = Segment {
                a: point(),
                b: point(),
            };
            let spacing = rng.random_range(1..40);
            let section = |t| Segment {
                a: Point::new(t, 0),
                b: Point::new(t, 10),
            };
            let euclidean = |t| section(t).closer_than(&edge, spacing);
            let square = |t| section(t).closer_than_square(&edge, spacing);
            let run = run(Direction::Horizontal);
            let found = |metric| of_edge(&run, &edge, (spacing, metric));
            assert_eq!(
                [found(Metric::Euclidean), found(Metric::Square)],
                [interval(euclidean), interval(square)],
                "{edge:?} {spacing}"
            );
        }
    }
}
