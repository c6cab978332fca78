//! The eight orientations with an integer magnification and a shift, as an exact integer matrix.
//!
//! GDSII reflects about the x axis first, then magnifies, rotates counterclockwise and shifts.

use super::problem::Problem;
use crate::geometry::{COORDINATE_LIMIT, Point, Rect};

/// A point or difference wide enough for what happens on the way to the grid.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Vector {
    pub x: i64,
    pub y: i64,
}

impl From<Point> for Vector {
    fn from(point: Point) -> Vector {
        Vector {
            x: point.x.into(),
            y: point.y.into(),
        }
    }
}

impl Vector {
    /// The point of the grid.
    pub(super) fn on_grid(self) -> Result<Point, Problem> {
        let limit = i64::from(COORDINATE_LIMIT);
        if self.x.abs() > limit || self.y.abs() > limit {
            return Err(Problem::Coordinate {
                x: self.x,
                y: self.y,
            });
        }
        Ok(self.point())
    }

    /// The point, where the hierarchy's boxes have shown that it is on the grid.
    pub(super) fn point(self) -> Point {
        Point {
            x: self.x as i32,
            y: self.y as i32,
        }
    }

    pub(super) fn plus(self, other: Vector) -> Vector {
        Vector {
            x: self.x + other.x,
            y: self.y + other.y,
        }
    }

    pub(super) fn minus(self, other: Vector) -> Vector {
        Vector {
            x: self.x - other.x,
            y: self.y - other.y,
        }
    }

    pub(super) fn times(self, factor: i64) -> Vector {
        Vector {
            x: self.x * factor,
            y: self.y * factor,
        }
    }

    /// A quarter turn counterclockwise.
    pub(super) fn left(self) -> Vector {
        Vector {
            x: -self.y,
            y: self.x,
        }
    }
}

/// One of the eight orientations: a reflection about the x axis or none, then quarter turns.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Orientation {
    /// Whether y is negated first.
    pub reflected: bool,
    /// Counterclockwise turns by 90 degrees, 0 to 3.
    pub quarter_turns: u8,
}

/// A map of the plane: rows of the matrix, then the shift.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Transform {
    rows: [[i64; 2]; 2],
    shift: Vector,
}

impl Transform {
    /// The map that changes nothing.
    pub(super) const IDENTITY: Transform = Transform {
        rows: [[1, 0], [0, 1]],
        shift: Vector { x: 0, y: 0 },
    };

    pub(super) fn new(orientation: Orientation, magnification: i64, shift: Vector) -> Transform {
        let m = magnification;
        let [a, b] = match orientation.quarter_turns % 4 {
            0 => [m, 0],
            1 => [0, m],
            2 => [-m, 0],
            _ => [0, -m],
        };
        // Columns are the images of the axes: (a, b) and, turned left, (-b, a), negated if reflected.
        let sign = if orientation.reflected { -1 } else { 1 };
        Transform {
            rows: [[a, -b * sign], [b, a * sign]],
            shift,
        }
    }

    /// The map that first does `self`, then shifts.
    pub(super) fn shifted(mut self, by: Vector) -> Transform {
        self.shift = self.shift.plus(by);
        self
    }

    /// The map that first does `inner`, then `self`.
    pub(super) fn after(&self, inner: &Transform) -> Transform {
        let column = |i: usize| Vector {
            x: inner.rows[0][i],
            y: inner.rows[1][i],
        };
        let (first, second) = (self.turn(column(0)), self.turn(column(1)));
        Transform {
            rows: [[first.x, second.x], [first.y, second.y]],
            shift: self.apply(inner.shift),
        }
    }

    fn turn(&self, v: Vector) -> Vector {
        Vector {
            x: self.rows[0][0] * v.x + self.rows[0][1] * v.y,
            y: self.rows[1][0] * v.x + self.rows[1][1] * v.y,
        }
    }

    pub(super) fn apply(&self, point: Vector) -> Vector {
        self.turn(point).plus(self.shift)
    }

    /// The magnification.
    pub(super) fn magnification(&self) -> i64 {
        self.rows[0][0].abs().max(self.rows[0][1].abs())
    }

    /// The images of two opposite corners of a rectangle, smallest coordinates first.
    pub(super) fn corners(&self, rect: Rect) -> [Vector; 2] {
        let (a, b) = (self.apply(rect.min.into()), self.apply(rect.max.into()));
        [
            Vector {
                x: a.x.min(b.x),
                y: a.y.min(b.y),
            },
            Vector {
                x: a.x.max(b.x),
                y: a.y.max(b.y),
            },
        ]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The images of (3, 1), worked out by hand for each orientation.
    const TABLE: [(bool, u8, (i64, i64)); 8] = [
        (false, 0, (3, 1)),
        (false, 1, (-1, 3)),
        (false, 2, (-3, -1)),
        (false, 3, (1, -3)),
        (true, 0, (3, -1)),
        (true, 1, (1, 3)),
        (true, 2, (-3, 1)),
        (true, 3, (-1, -3)),
    ];

    fn all() -> impl Iterator<Item = (Transform, Vector)> {
        TABLE.into_iter().map(|(reflected, quarter_turns, (x, y))| {
            let orientation = Orientation {
                reflected,
                quarter_turns,
            };
            let transform = Transform::new(orientation, 5, Vector { x: 100, y: 200 });
            (
                transform,
                Vector {
                    x: 5 * x + 100,
                    y: 5 * y + 200,
                },
            )
        })
    }

    #[test]
    fn the_eight_orientations_match_the_table() {
        for (transform, image) in all() {
            assert_eq!(transform.apply(Vector { x: 3, y: 1 }), image);
            assert_eq!(transform.magnification(), 5);
        }
    }

    #[test]
    fn composition_is_doing_one_after_the_other() {
        let point = Vector { x: -7, y: 11 };
        for (outer, _) in all() {
            for (inner, _) in all() {
                let both = outer.after(&inner);
                assert_eq!(both.apply(point), outer.apply(inner.apply(point)));
                assert_eq!(both.magnification(), 25);
            }
            assert_eq!(outer.after(&Transform::IDENTITY), outer);
            assert_eq!(Transform::IDENTITY.after(&outer), outer);
        }
    }
}
