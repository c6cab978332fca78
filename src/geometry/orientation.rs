//! The side of a directed line on which a point lies: the sign of a cross product.
//!
//! For three points of the coordinate range the two products fit 63 bits each, and their difference is
//! twice the area of a triangle inside a square of side 2^31, so at most 2^62: `i64` is exact.

use super::Point;

/// Twice the signed area of the triangle `a`, `b`, `c`: positive when `c` lies to the left of the line
/// from `a` to `b`, zero on it.
pub fn cross(a: Point, b: Point, c: Point) -> i64 {
    let [abx, aby] = difference(a, b);
    let [acx, acy] = difference(a, c);
    abx * acy - aby * acx
}

/// The vector from `a` to `b`.
pub fn difference(a: Point, b: Point) -> [i64; 2] {
    [
        i64::from(b.x) - i64::from(a.x),
        i64::from(b.y) - i64::from(a.y),
    ]
}

/// Whether `c`, known to lie on the line through `a` and `b`, lies between them or at one of them.
pub fn is_between(a: Point, b: Point, c: Point) -> bool {
    a.x.min(b.x) <= c.x && c.x <= a.x.max(b.x) && a.y.min(b.y) <= c.y && c.y <= a.y.max(b.y)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::COORDINATE_LIMIT as L;

    #[test]
    fn the_sign_is_right_at_the_ends_of_the_range() {
        let (a, b) = (Point::new(-L, -L), Point::new(L, L));
        assert_eq!(cross(a, b, Point::new(0, 0)), 0);
        assert_eq!(cross(a, b, Point::new(-L, L)), 1 << 62);
        assert_eq!(cross(a, b, Point::new(L, -L)), -(1 << 62));
        assert!(cross(a, b, Point::new(L - 1, L)) > 0);
        assert!(cross(a, b, Point::new(L, L - 1)) < 0);
    }
}
