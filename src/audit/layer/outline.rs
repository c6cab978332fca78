//! The straight edges and the convex corners of features that are made of rectangles.
//!
//! The upper and lower sides of strips lie on the outline: a strip reaches as far up and down as the feature does. Sides at one height
//! of which one begins where another ends are one edge, which goes straight as far as that. The feature lies as deep behind each stretch
//! of it as its strip is high. An edge ends in a convex corner where no other strip has a point of it: where the feature takes one of the
//! four quarters around it. (Where it takes two opposite ones, it goes on.) Upright edges are found in the mirror image at the line x = y.

use super::cuts::rects_of_features;
use super::distance::Bodies;
use super::runs::mirrored;
use super::strips;
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use crate::layout::Spacings;
use rayon::prelude::*;

/// A straight edge, as long as it goes straight.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Edge {
    pub(super) feature: u32,
    /// Whether it is upright. Then "up" means to the right, and "along" is along y.
    pub(super) upright: bool,
    /// Whether the feature is below it, and its outside above.
    pub(super) faces_up: bool,
    /// Its height.
    pub(super) at: i32,
    /// From where to where it goes along.
    pub(super) ends: [i32; 2],
    /// Whether it is a line end: shorter than the rules say, between two convex corners.
    pub(super) is_end: bool,
    /// For each row of the table of wide features, the stretches behind which the feature is as deep as that, ascending.
    pub(super) wide: Vec<Vec<Stretch>>,
}

/// A stretch of an edge, and how long those before it are together.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Stretch {
    pub(super) ends: [i32; 2],
    before: i64,
}

/// A convex corner.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Corner {
    pub(super) feature: u32,
    pub(super) at: Point,
    /// Whether it is a right one, and an upper one.
    pub(super) is_right: bool,
    pub(super) is_upper: bool,
}

/// The outlines of all features that are made of rectangles.
#[derive(Debug, Default)]
pub(super) struct Outlines {
    pub(super) edges: Vec<Edge>,
    pub(super) corners: Vec<Corner>,
}

impl Edge {
    /// The part of it between two places along.
    pub(super) fn part(&self, [from, to]: [i32; 2]) -> Rect {
        mirrored(Rect::new(from, self.at, to, self.at), self.upright)
    }

    /// How much of it is wide, by a row of the table, between two places along.
    pub(super) fn wide_length(&self, row: usize, [from, to]: [i32; 2]) -> i64 {
        let up_to = |place: i32| {
            let stretches = &self.wide[row];
            let begun = &stretches[..stretches.partition_point(|s| s.ends[0] < place)];
            begun.last().map_or(0, |last| {
                last.before + length([last.ends[0], last.ends[1].min(place)])
            })
        };
        up_to(to) - up_to(from)
    }

    /// The first and the last wide place between two places along, if they are not one.
    pub(super) fn wide_places(&self, row: usize, [from, to]: [i32; 2]) -> Option<[i32; 2]> {
        let stretches = &self.wide[row];
        let first = stretches.get(stretches.partition_point(|s| s.ends[1] <= from))?;
        let begun = &stretches[..stretches.partition_point(|s| s.ends[0] < to)];
        let ends = [first.ends[0].max(from), begun.last()?.ends[1].min(to)];
        (ends[0] < ends[1]).then_some(ends)
    }
}

fn length([from, to]: [i32; 2]) -> i64 {
    i64::from(to) - i64::from(from)
}

/// The outlines of the features of the bodies, as far as they are made of rectangles.
pub(super) fn of_features(
    bodies: &Bodies,
    features: &[u32],
    spacings: &Spacings,
) -> Result<Outlines, Rejection> {
    let own: Vec<Outlines> = (rects_of_features(bodies, features).into_par_iter())
        .filter_map(|(feature, rects)| Some((feature, rects?)))
        .map(|(feature, rects)| {
            let mut found = Outlines::default();
            for upright in [false, true] {
                let turned: Vec<Rect> = rects.iter().map(|&r| mirrored(r, upright)).collect();
                let strips = strips::of_rects(&turned).ok_or_else(|| strips::too_many(&rects))?;
                found.add(feature, upright, &strips, spacings);
            }
            Ok(found)
        })
        .collect::<Result<_, Rejection>>()?;
    let mut all = Outlines::default();
    for outlines in own {
        all.edges.extend(outlines.edges);
        all.corners.extend(outlines.corners);
    }
    Ok(all)
}

impl Outlines {
    fn add(&mut self, feature: u32, upright: bool, strips: &[Rect], spacings: &Spacings) {
        // Left and right sides of strips: abscissa, lower and upper end.
        let sides = |x: fn(&Rect) -> i32| {
            let mut sides: Vec<_> = strips.iter().map(|s| (x(s), s.min.y, s.max.y)).collect();
            sides.sort_unstable();
            sides
        };
        let [left, right] = [sides(|strip| strip.min.x), sides(|strip| strip.max.x)];
        for faces_up in [false, true] {
            let height = |strip: &Rect| if faces_up { strip.max.y } else { strip.min.y };
            let mut parts: Vec<(i32, [i32; 2], i64)> = (strips.iter())
                .map(|strip| (height(strip), [strip.min.x, strip.max.x], strip.height()))
                .collect();
            parts.sort_unstable();
            let goes_on = |one: &(i32, [i32; 2], i64), next: &(i32, [i32; 2], i64)| {
                one.0 == next.0 && one.1[1] == next.1[0]
            };
            for parts in parts.chunk_by(goes_on) {
                let at = parts[0].0;
                let ends = [parts[0].1[0], parts[parts.len() - 1].1[1]];
                let is_convex = [
                    !has_point(&right, [ends[0], at]),
                    !has_point(&left, [ends[1], at]),
                ];
                let is_short = length(ends) < i64::from(spacings.end_length);
                self.edges.push(Edge {
                    feature,
                    upright,
                    faces_up,
                    at,
                    ends,
                    is_end: is_short && is_convex == [true, true],
                    wide: (spacings.wide.iter())
                        .map(|row| stretches(parts, row.width.into()))
                        .collect(),
                });
                let convex = (0..2).filter(|&end| !upright && is_convex[end]);
                self.corners.extend(convex.map(|end| Corner {
                    feature,
                    at: Point::new(ends[end], at),
                    is_right: end == 1,
                    is_upper: faces_up,
                }));
            }
        }
    }
}

/// Whether one of the sides, which have no points in common, has a point.
fn has_point(sides: &[(i32, i32, i32)], [x, y]: [i32; 2]) -> bool {
    let before = &sides[..sides.partition_point(|side| (side.0, side.1) <= (x, y))];
    before.last().is_some_and(|side| side.0 == x && y <= side.2)
}

/// The stretches of an edge that are at least so deep.
fn stretches(parts: &[(i32, [i32; 2], i64)], width: i64) -> Vec<Stretch> {
    let (mut found, mut before) = (Vec::new(), 0);
    for &(_, ends, depth) in parts {
        if depth >= width {
            found.push(Stretch { ends, before });
            before += length(ends);
        }
    }
    found
}
