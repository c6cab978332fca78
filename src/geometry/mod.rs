//! Points, rectangles and outlines on the integer grid of database units, and what is decided about
//! them exactly: touching, distance, containment, area.
//!
//! Coordinates are limited to [`COORDINATE_LIMIT`] on either side of zero, which readers enforce.
//! Then a difference fits 32 bits, a cross product 64 bits and its square 127 bits: squared distances
//! between any two edges compare exactly in `i128`.
//!
//! | module | technique |
//! |---|---|
//! | [`orientation`] | the side of a line on which a point lies |
//! | [`segment`] | common points and distances of two segments |
//! | [`winding`] | whether an outline encloses a point (non-zero winding number) |
//! | [`outline`] | kinds of outlines, spikes, area |
//! | [`distance`] | touching and distances of rectangles and outlines |
//! | [`cover`] | how often each stretch of a line is covered |
//! | [`measure`] | the area of a union of rectangles |
//! | [`slabs`] | axis-parallel regions cut into disjoint rectangles of constant cross-section |
//! | [`hilbert`] | the order of points along Hilbert's curve |
//! | [`rtree`] | a packed tree of boxes in flat arrays |
//!
//! An outline is a closed list of vertices. The region it draws is closed: the outline itself and all
//! points of non-zero winding number, so that what is drawn twice stays drawn and the hole of a
//! keyhole outline (whose two rims run against each other) stays a hole.

pub mod cover;
pub mod distance;
pub mod hilbert;
pub mod measure;
pub mod orientation;
pub mod outline;
pub mod rtree;
pub mod segment;
pub mod slabs;
pub mod winding;

/// The largest absolute value of a coordinate, in database units.
pub const COORDINATE_LIMIT: i32 = 1 << 30;

/// A point of the grid.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Point {
    /// Abscissa in database units.
    pub x: i32,
    /// Ordinate in database units.
    pub y: i32,
}

impl Point {
    /// The point of the given coordinates.
    pub const fn new(x: i32, y: i32) -> Point {
        Point { x, y }
    }

    /// The mirror image at the line x = y.
    pub const fn transposed(self) -> Point {
        Point {
            x: self.y,
            y: self.x,
        }
    }

    /// Whether both coordinates keep to [`COORDINATE_LIMIT`].
    pub fn is_in_range(self) -> bool {
        let limit = COORDINATE_LIMIT as u32;
        self.x.unsigned_abs() <= limit && self.y.unsigned_abs() <= limit
    }
}

/// An axis-parallel rectangle, its border included.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Rect {
    /// The corner of smallest coordinates.
    pub min: Point,
    /// The corner of largest coordinates.
    pub max: Point,
}

impl Rect {
    /// The rectangle between two corners, smallest coordinates first.
    pub const fn new(x0: i32, y0: i32, x1: i32, y1: i32) -> Rect {
        Rect {
            min: Point { x: x0, y: y0 },
            max: Point { x: x1, y: y1 },
        }
    }

    /// The smallest rectangle around `points`, if there are any.
    pub fn around(points: &[Point]) -> Option<Rect> {
        let (&first, rest) = points.split_first()?;
        let start = Rect {
            min: first,
            max: first,
        };
        Some(
            rest.iter()
                .fold(start, |all, &p| all.union(&Rect { min: p, max: p })),
        )
    }

    /// The smallest rectangle around both.
    pub fn union(&self, other: &Rect) -> Rect {
        Rect {
            min: Point::new(self.min.x.min(other.min.x), self.min.y.min(other.min.y)),
            max: Point::new(self.max.x.max(other.max.x), self.max.y.max(other.max.y)),
        }
    }

    /// Whether the two share a point, be it on their borders.
    pub fn touches(&self, other: &Rect) -> bool {
        self.min.x <= other.max.x
            && other.min.x <= self.max.x
            && self.min.y <= other.max.y
            && other.min.y <= self.max.y
    }

    /// Whether every point of `other` is in this rectangle.
    pub fn covers(&self, other: &Rect) -> bool {
        self.min.x <= other.min.x
            && other.max.x <= self.max.x
            && self.min.y <= other.min.y
            && other.max.y <= self.max.y
    }

    /// The rectangle grown by `margin` on each side, at most to the ends of the 32-bit range.
    pub fn grown(&self, margin: i32) -> Rect {
        Rect {
            min: Point::new(
                self.min.x.saturating_sub(margin),
                self.min.y.saturating_sub(margin),
            ),
            max: Point::new(
                self.max.x.saturating_add(margin),
                self.max.y.saturating_add(margin),
            ),
        }
    }

    /// Its width, in database units.
    pub fn width(&self) -> i64 {
        i64::from(self.max.x) - i64::from(self.min.x)
    }

    /// Its height, in database units.
    pub fn height(&self) -> i64 {
        i64::from(self.max.y) - i64::from(self.min.y)
    }

    /// Its area, in square database units.
    pub fn area(&self) -> u64 {
        self.width().unsigned_abs() * self.height().unsigned_abs()
    }

    /// Its corners, counter-clockwise.
    pub fn corners(&self) -> [Point; 4] {
        [
            self.min,
            Point::new(self.max.x, self.min.y),
            self.max,
            Point::new(self.min.x, self.max.y),
        ]
    }

    /// The mirror image at the line x = y.
    pub const fn transposed(&self) -> Rect {
        Rect {
            min: self.min.transposed(),
            max: self.max.transposed(),
        }
    }
}
