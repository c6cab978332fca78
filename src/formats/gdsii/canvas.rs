//! Where elements are drawn: shapes with their counts, coordinates checked.

use super::problem::Problem;
use super::transform::Vector;
use crate::geometry::{COORDINATE_LIMIT, Point, Rect};
use crate::layout::{Shape, Shapes};

/// Shapes, with what must be known of them later.
#[derive(Debug, Default)]
pub(super) struct Canvas {
    shapes: Shapes,
    points: u64,
    bounds: Option<Rect>,
    buffer: Vec<Point>,
}

impl Canvas {
    /// How many shapes are drawn.
    pub(super) fn len(&self) -> usize {
        self.shapes.len()
    }

    /// How many points they have, two for a rectangle.
    pub(super) fn points(&self) -> u64 {
        self.points
    }

    /// The box of everything drawn since the last call.
    pub(super) fn take_bounds(&mut self) -> Option<Rect> {
        self.bounds.take()
    }

    /// The shapes.
    pub(super) fn shapes(&self) -> &Shapes {
        &self.shapes
    }

    /// The shapes.
    pub(super) fn into_shapes(self) -> Shapes {
        self.shapes
    }

    /// Draws an outline given by any integers.
    pub(super) fn draw(&mut self, outline: &[Vector]) -> Result<(), Problem> {
        let mut buffer = std::mem::take(&mut self.buffer);
        buffer.clear();
        for &corner in outline {
            buffer.push(corner.on_grid()?);
        }
        let drawn = self.draw_points(&buffer);
        self.buffer = buffer;
        drawn
    }

    /// Draws an outline of three points or more.
    pub(super) fn draw_points(&mut self, outline: &[Point]) -> Result<(), Problem> {
        for point in outline {
            check(*point)?;
            let at = Rect {
                min: *point,
                max: *point,
            };
            self.bounds = Some(self.bounds.map_or(at, |bounds| union(bounds, at)));
        }
        self.shapes.push_polygon(outline);
        self.points += match self.shapes.get(self.shapes.len() as u32 - 1) {
            Shape::Rect(_) => 2,
            Shape::Polygon(vertices) => vertices.len() as u64,
        };
        Ok(())
    }
}

fn check(point: Point) -> Result<(), Problem> {
    let limit = COORDINATE_LIMIT.unsigned_abs();
    if point.x.unsigned_abs() > limit || point.y.unsigned_abs() > limit {
        let (x, y) = (point.x.into(), point.y.into());
        return Err(Problem::Coordinate { x, y });
    }
    Ok(())
}

/// The smallest rectangle around two.
pub(super) fn union(a: Rect, b: Rect) -> Rect {
    Rect {
        min: Point {
            x: a.min.x.min(b.min.x),
            y: a.min.y.min(b.min.y),
        },
        max: Point {
            x: a.max.x.max(b.max.x),
            y: a.max.y.max(b.max.y),
        },
    }
}
