//! Points and rectangles on the integer grid of database units.
//!
//! Coordinates are limited to [`COORDINATE_LIMIT`] on either side of zero, which readers enforce.
//! Then a difference fits 32 bits, a cross product 64 bits and its square 127 bits: squared distances
//! between any two edges compare exactly in `i128`.

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

/// An axis-parallel rectangle, its border included.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Rect {
    /// The corner of smallest coordinates.
    pub min: Point,
    /// The corner of largest coordinates.
    pub max: Point,
}
