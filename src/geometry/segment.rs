//! Common points and distances of two closed segments.
//!
//! Two segments without a common point are nearest to each other at an end of one of them, so the
//! distance is the least of four distances from a point to a segment. A point p whose foot falls inside
//! the segment a b lies at |cross(a, b, p)| / |ab| from it, hence closer than s exactly when
//! cross^2 < s^2 |ab|^2: at most 126 bits on either side for s below 2^31.
//!
//! In the square metric, max(|dx|, |dy|), two segments are closer than s exactly when the one, swept by an
//! open square of side 2 s, meets the other. The swept one and the other are convex, so they are apart
//! exactly when a line along a side of one of the three shapes separates them: an axis, or the direction of
//! one of the segments (the separating axis theorem; S. Gottschalk, M. C. Lin, D. Manocha, "OBBTree", 1996).
//! The square is open, so touching its border counts as apart. Products fit 96 bits.

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

    /// Whether the two are strictly closer to each other than `spacing`, at least 1, in the square metric.
    pub fn closer_than_square(&self, other: &Segment, spacing: i32) -> bool {
        let along = |s: &Segment| difference(s.a, s.b).map(i128::from);
        let across = |[dx, dy]: [i128; 2]| [-dy, dx];
        let normals = [[1, 0], [0, 1], across(along(self)), across(along(other))];
        !(normals.into_iter()).any(|normal| self.is_apart(other, normal, spacing.into()))
    }

    /// Whether a line across `normal` has the one on its one side, and the other, swept by the open square,
    /// on its other side. A normal of no length separates nothing.
    fn is_apart(&self, other: &Segment, [nx, ny]: [i128; 2], spacing: i128) -> bool {
        let at = |p: Point| nx * i128::from(p.x) + ny * i128::from(p.y);
        let span = |s: &Segment| {
            let [a, b] = [at(s.a), at(s.b)];
            [a.min(b), a.max(b)]
        };
        let ([low, high], [from, to]) = (span(self), span(other));
        let room = spacing * (nx.abs() + ny.abs());
        room > 0 && (from - high).max(low - to) >= room
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

    /// Whether a point of `s` is closer to `p` than `spacing` in the square metric, by looking where along `s`,
    /// as a fraction, the distance can be least: at an end, or where two of its linear pieces meet.
    fn is_square_closer(s: &Segment, p: Point, spacing: i32) -> bool {
        let (dx, dy) = (s.b.x - s.a.x, s.b.y - s.a.y);
        let (ex, ey) = (p.x - s.a.x, p.y - s.a.y);
        let meets = [(ex, dx), (ey, dy), (ex - ey, dx - dy), (ex + ey, dx + dy)];
        let places = meets.into_iter().chain([(0, 1), (1, 1)]);
        (places.filter(|m| m.1 != 0))
            .map(|(n, d)| if d < 0 { (-n, -d) } else { (n, d) })
            .filter(|&(n, d)| 0 <= n && n <= d)
            .any(|(n, d)| (n * dx - d * ex).abs().max((n * dy - d * ey).abs()) < spacing * d)
    }

    #[test]
    fn the_square_metric_agrees_with_fractions_on_small_grids() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(2);
        for _ in 0..200_000 {
            let mut c = || rng.random_range(-7..=7);
            let (s, t) = (segment(c(), c(), c(), c()), segment(c(), c(), c(), c()));
            let spacing = rng.random_range(1..=12);
            let ends = [(&s, t.a), (&s, t.b), (&t, s.a), (&t, s.b)];
            let mut ends = ends.into_iter();
            let closer = s.touches(&t) || ends.any(|(s, p)| is_square_closer(s, p, spacing));
            assert_eq!(
                s.closer_than_square(&t, spacing),
                closer,
                "{s:?} {t:?} {spacing}"
            );
        }
    }

    #[test]
    fn exactly_the_spacing_is_not_closer_in_the_square_metric() {
        // The line x + y = 10 comes to (0, 0) within 5 along both axes, at (5, 5).
        let slanted = segment(0, 10, 10, 0);
        let origin = segment(0, 0, 0, 0);
        assert!(!slanted.closer_than_square(&origin, 5));
        assert!(slanted.closer_than_square(&origin, 6));
        let l = crate::geometry::COORDINATE_LIMIT;
        let long = segment(-l, -l, l, l - 1);
        assert!(!long.closer_than_square(&segment(-l, l, -l, l), i32::MAX / 2));
        assert!(long.closer_than_square(&origin, 1));
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
