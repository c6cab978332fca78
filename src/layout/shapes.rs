//! A flat arena of shapes: rectangles take two points, other polygons their vertices.

use crate::geometry::{Point, Rect};

/// One shape.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Shape<'a> {
    /// An axis-parallel rectangle of positive width and height.
    Rect(Rect),
    /// A polygon: three vertices or more, the first one not repeated at the end.
    Polygon(&'a [Point]),
}

/// Many shapes: 20 bytes a rectangle, 4 + 8 a vertex for other polygons.
#[derive(Clone, Debug)]
pub struct Shapes {
    points: Vec<Point>,
    start: Vec<u32>,
}

impl Default for Shapes {
    fn default() -> Shapes {
        Shapes {
            points: Vec::new(),
            start: vec![0],
        }
    }
}

impl Shapes {
    /// How many shapes there are.
    pub fn len(&self) -> usize {
        self.start.len() - 1
    }

    /// Whether there is no shape.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Adds a rectangle.
    pub fn push_rect(&mut self, rect: Rect) {
        self.points.extend([rect.min, rect.max]);
        self.start.push(self.points.len() as u32);
    }

    /// Adds a polygon of at least three vertices; four that are an axis-parallel rectangle are stored
    /// as one.
    pub fn push_polygon(&mut self, vertices: &[Point]) {
        match as_rect(vertices) {
            Some(rect) => self.push_rect(rect),
            None => {
                self.points.extend_from_slice(vertices);
                self.start.push(self.points.len() as u32);
            }
        }
    }

    /// One shape.
    pub fn get(&self, shape: u32) -> Shape<'_> {
        let ends = [self.start[shape as usize], self.start[shape as usize + 1]];
        match &self.points[ends[0] as usize..ends[1] as usize] {
            &[min, max] => Shape::Rect(Rect { min, max }),
            vertices => Shape::Polygon(vertices),
        }
    }

    /// All shapes in order.
    pub fn iter(&self) -> impl ExactSizeIterator<Item = Shape<'_>> {
        (0..self.len() as u32).map(|shape| self.get(shape))
    }
}

/// The rectangle that four vertices are, if they are one with sides along the axes.
fn as_rect(vertices: &[Point]) -> Option<Rect> {
    let &[a, b, c, d] = vertices else { return None };
    let across = a.y == b.y && b.x == c.x && c.y == d.y && d.x == a.x;
    let upright = a.x == b.x && b.y == c.y && c.x == d.x && d.y == a.y;
    let min = Point {
        x: a.x.min(c.x),
        y: a.y.min(c.y),
    };
    let max = Point {
        x: a.x.max(c.x),
        y: a.y.max(c.y),
    };
    ((across || upright) && min.x < max.x && min.y < max.y).then_some(Rect { min, max })
}
