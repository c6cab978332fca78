//! Common points and distances of two closed segments.
//!
//! Two segments without a common point are nearest to each other at an end of one of them, so the
//! distance is the least of four distances from a point to a segment. A point p whose foot falls inside
//! the segment a b lies at |cross(a, b, p)| / |ab| from it, hence closer than s exactly when
//! cross^2 < s^2 |ab|^2: at most 126 bits on either side for s below 2^31.

use super::Point;
use super::orientation::{cross, difference, is_between};

/// The closed segment between two points, which may coincide.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Segment {
    /// One end.
    pub a: Point,
    /// The other end.
    pub b: Point,
}

impl Segment {
    /// Whether `point` lies on the segment.
    pub fn contains(&self, point: Point) -> bool {
        is_between(self.a, self.b, point) && cross(self.a, self.b, point) == 0
    }

    /// Whether the two share a point.
    pub fn touches(&self, other: &Segment) -> bool {
        let sides = |s: &Segment, t: &Segment| {
            [cross(s.a, s.b, t.a).signum(), cross(s.a, s.b, t.b).signum()]
        };
        let [p, q] = sides(self, other);
        let [r, s] = sides(other, self);
        if p * q < 0 && r * s < 0 {
            return true;
        }
        self.contains(other.a)
            || self.contains(other.b)
            || other.contains(self.a)
            || other.contains(self.b)
    }

    /// Whether `point` is strictly closer to the segment than `spacing`.
    pub fn is_closer_to(&self, point: Point, spacing: i32) -> bool {
        let [dx, dy] = difference(self.a, self.b).map(i128::from);
        let [px, py] = difference(self.a, point).map(i128::from);
        let limit = i128::from(spacing) * i128::from(spacing);
        let length = dx * dx + dy * dy;
        let along = px * dx + py * dy;
        if along <= 0 {
            return px * px + py * py < limit;
        }
        if along >= length {
            let [qx, qy] = [px - dx, py - dy];
            return qx * qx + qy * qy < limit;
        }
        let height = dx * py - dy * px;
        height * height < limit * length
    }

    /// Whether the two are strictly closer to each other than `spacing`, which is at least 1.
    pub fn closer_than(&self, other: &Segment, spacing: i32) -> bool {
        self.is_closer_to(other.a, spacing)
            || self.is_closer_to(other.b, spacing)
            || other.is_closer_to(self.a, spacing)
            || other.is_closer_to(self.b, spacing)
            || self.touches(other)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    fn segment(x0: i32, y0: i32, x1: i32, y1: i32) -> Segment {
        Segment {
            a: Point::new(x0, y0),
            b: Point::new(x1, y1),
        }
    }

    /// The squared distance from `p` to `s` as a fraction, by clamping the foot's parameter.
    fn squared(s: &Segment, p: Point) -> (i128, i128) {
        let (ax, ay) = (i128::from(s.a.x), i128::from(s.a.y));
        let (dx, dy) = (i128::from(s.b.x) - ax, i128::from(s.b.y) - ay);
        let (px, py) = (i128::from(p.x), i128::from(p.y));
        let length = (dx * dx + dy * dy).max(1);
        let t = ((px - ax) * dx + (py - ay) * dy).clamp(0, length);
        let (ex, ey) = ((px - ax) * length - t * dx, (py - ay) * length - t * dy);
        (ex * ex + ey * ey, length * length)
    }

    /// Whether the segments cross, by solving for both parameters in fractions.
    fn cross_point(s: &Segment, t: &Segment) -> bool {
        let d = |s: &Segment| (s.b.x - s.a.x, s.b.y - s.a.y);
        let ((ux, uy), (vx, vy)) = (d(s), d(t));
        let (wx, wy) = (t.a.x - s.a.x, t.a.y - s.a.y);
        let det = ux * vy - uy * vx;
        if det == 0 {
            return false;
        }
        let (a, b) = (wx * vy - wy * vx, wx * uy - wy * ux);
        let (a, b, det) = if det < 0 { (-a, -b, -det) } else { (a, b, det) };
        (0..=det).contains(&a) && (0..=det).contains(&b)
    }

    #[test]
    fn agrees_with_rational_arithmetic_on_small_grids() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(1);
        for _ in 0..200_000 {
            let mut c = || rng.random_range(-7..=7);
            let (s, t) = (segment(c(), c(), c(), c()), segment(c(), c(), c(), c()));
            let ends = [
                squared(&s, t.a),
                squared(&s, t.b),
                squared(&t, s.a),
                squared(&t, s.b),
            ];
            let crosses = cross_point(&s, &t);
            let touches = crosses || ends.iter().any(|&(n, _)| n == 0);
            assert_eq!(s.touches(&t), touches, "{s:?} {t:?}");
            let spacing = rng.random_range(1..=12);
            let limit = i128::from(spacing * spacing);
            let closer = crosses || ends.iter().any(|&(n, d)| n < limit * d);
            assert_eq!(s.closer_than(&t, spacing), closer, "{s:?} {t:?} {spacing}");
        }
    }

    #[test]
    fn exactly_the_spacing_is_not_closer() {
        let (s, t) = (segment(0, 0, -5, 1), segment(3, 4, 9, 4));
        assert!(!s.closer_than(&t, 5));
        assert!(s.closer_than(&t, 6));
        assert!(s.closer_than(&segment(3, 3, 9, 4), 5));
        // A foot inside a slanted segment: distance 25 from (0, 0) to the line 3x + 4y = 125.
        let slanted = segment(35, 5, -5, 35);
        assert!(!slanted.is_closer_to(Point::new(0, 0), 25));
        assert!(slanted.is_closer_to(Point::new(0, 0), 26));
        assert!(slanted.is_closer_to(Point::new(1, 0), 25));
    }

    #[test]
    fn the_whole_coordinate_range_is_exact() {
        let l = crate::geometry::COORDINATE_LIMIT;
        let long = segment(-l, -l, l, l - 1);
        assert!(!long.is_closer_to(Point::new(-l, l), i32::MAX / 2));
        assert!(long.is_closer_to(Point::new(0, 0), 1));
        assert!(!long.contains(Point::new(0, 0)));
        assert!(!long.touches(&segment(-l + 1, -l + 1, 0, 0)));
    }
}
