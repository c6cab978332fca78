//! The shapes of a layer as rectangles and slanted outlines.
//!
//! Rectangles stay as they are, outlines along the axes become their strips: what they enclose, and no line that
//! they run to and fro. Outlines with slanted edges stay whole, without their spikes: vertices where three in a row
//! lie on one line are taken out until none is left. What is drawn twice is taken once.

use super::distance::{Bodies, RECT, cross, edges};
use super::strips;
use crate::audit::{Rejection, Step};
use crate::geometry::{COORDINATE_LIMIT, Point, Rect};
use crate::layout::{Shape, Shapes};
use rayon::prelude::*;
use rustc_hash::FxHashMap;

/// The parts of all shapes.
pub(super) struct Parts {
    /// What they are, sorted by their boxes.
    pub(super) bodies: Bodies,
    /// Pairs that belong to one shape, as many as connect all parts of it.
    pub(super) of_one_shape: Vec<[u32; 2]>,
    /// Of the shapes that were asked for: the shape and a part of it, ascending.
    of_shape: Vec<[u32; 2]>,
}

impl Parts {
    /// A part of a shape that was asked for, if it encloses anything.
    pub(super) fn of_shape(&self, shape: u32) -> Option<u32> {
        let place = self.of_shape.partition_point(|known| known[0] < shape);
        let known = self.of_shape.get(place).filter(|known| known[0] == shape);
        known.map(|known| known[1])
    }
}

/// Takes the shapes apart, and notes the parts of those that are `asked` for. Refuses coordinates out of range, and shapes of too
/// many strips.
pub(super) fn of_shapes(shapes: &Shapes, asked: impl Fn(u32) -> bool) -> Result<Parts, Rejection> {
    let mut outlines: Vec<Vec<Point>> = Vec::new();
    let mut known: FxHashMap<Vec<Point>, u32> = FxHashMap::default();
    // Box, outline, and shape.
    let mut found: Vec<(Rect, u32, u32)> = Vec::with_capacity(shapes.len());
    for (shape, drawn) in (0..).zip(shapes.iter()) {
        match drawn {
            Shape::Rect(rect) => {
                check(shape, &[rect.min, rect.max])?;
                found.push((rect, RECT, shape));
            }
            Shape::Polygon(vertices) => {
                check(shape, vertices)?;
                if edges(vertices).all(|[a, b]| a.x == b.x || a.y == b.y) {
                    let strips = strips::of_outline(vertices).ok_or_else(|| too_many(vertices))?;
                    found.extend(strips.into_iter().map(|strip| (strip, RECT, shape)));
                } else if let outline = without_spikes(vertices)
                    && let Some(area) = Rect::around(&outline)
                {
                    let number = *known.entry(outline).or_insert_with_key(|outline| {
                        outlines.push(outline.clone());
                        outlines.len() as u32 - 1
                    });
                    found.push((area, number, shape));
                }
            }
        }
    }
    if found.len() >= u32::MAX as usize / 4 {
        let count = found.len();
        let reason =
            format!("the shapes are made of {count} rectangles, fewer than 2^30 are possible");
        return Err(Rejection::new(Step::Features, reason));
    }
    Ok(sorted(found, outlines, asked))
}

fn sorted(
    mut found: Vec<(Rect, u32, u32)>,
    outlines: Vec<Vec<Point>>,
    asked: impl Fn(u32) -> bool,
) -> Parts {
    found.par_sort_unstable();
    let mut bodies = Bodies {
        outlines,
        ..Bodies::default()
    };
    let mut of_shape = Vec::with_capacity(found.len());
    for same in found.chunk_by(|one, other| (one.0, one.1) == (other.0, other.1)) {
        let part = bodies.boxes.len() as u32;
        of_shape.extend(same.iter().map(|&(_, _, shape)| [shape, part]));
        bodies.boxes.extend(same.first().map(|one| one.0));
        bodies.outline.extend(same.first().map(|one| one.1));
    }
    drop(found);
    of_shape.par_sort_unstable();
    let two = of_shape.windows(2).filter(|two| two[0][0] == two[1][0]);
    let of_one_shape = two.map(|two| [two[0][1], two[1][1]]).collect();
    of_shape.retain(|known| asked(known[0]));
    of_shape.shrink_to_fit();
    Parts {
        bodies,
        of_one_shape,
        of_shape,
    }
}

fn check(shape: u32, points: &[Point]) -> Result<(), Rejection> {
    let limit = COORDINATE_LIMIT.unsigned_abs();
    let beyond = |p: &&Point| p.x.unsigned_abs() > limit || p.y.unsigned_abs() > limit;
    match points.iter().find(beyond) {
        None => Ok(()),
        Some(Point { x, y }) => {
            let reason = format!("shape {shape} has a vertex at ({x}, {y}), beyond {limit}");
            Err(Rejection::new(Step::Features, reason))
        }
    }
}

fn too_many(vertices: &[Point]) -> Rejection {
    let Point { x, y } = vertices.iter().min().copied().unwrap_or_default();
    let most = strips::MOST;
    let reason = format!("what is drawn from ({x}, {y}) on has more than {most} cross-sections");
    Rejection::new(Step::Features, reason)
}

/// The outline without vertices that lie on one line with those before and after; nothing is left of one that
/// encloses nothing because it is run to and fro.
fn without_spikes(vertices: &[Point]) -> Vec<Point> {
    let count = vertices.len();
    let mut before: Vec<usize> = (0..count).map(|i| (i + count - 1) % count).collect();
    let mut after: Vec<usize> = (0..count).map(|i| (i + 1) % count).collect();
    let mut is_left = vec![true; count];
    let mut left = count;
    // Taking one out can only put its two neighbours on a line with theirs.
    let mut doubtful: Vec<usize> = (0..count).rev().collect();
    while let Some(i) = doubtful.pop().filter(|_| left >= 3) {
        let (b, a) = (before[i], after[i]);
        if is_left[i] && cross(vertices[b], vertices[i], vertices[a]) == 0 {
            (is_left[i], after[b], before[a]) = (false, a, b);
            left -= 1;
            doubtful.extend([b, a]);
        }
    }
    let kept = vertices.iter().zip(is_left).filter(|(_, is_left)| *is_left);
    match left >= 3 {
        true => kept.map(|(&vertex, _)| vertex).collect(),
        false => Vec::new(),
    }
}
