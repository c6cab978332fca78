//! Touching and distances of closed regions: rectangles, and outlines of any angle.
//!
//! Two regions share a point when their outlines do, or when one lies inside the other; in the second
//! case any vertex of the inner one tells. Apart from that they are as far from each other as their
//! nearest edges. Everything is decided in integers; see [`super::segment`] for the bounds.

use super::segment::Segment;
use super::winding::{edges, encloses};
use super::{Point, Rect};

/// The squared distance of two rectangles, 0 when they share a point. At most 2^63.
pub fn squared_gap(a: &Rect, b: &Rect) -> u64 {
    let gap = |amin: i32, amax: i32, bmin: i32, bmax: i32| {
        let left = i64::from(amin) - i64::from(bmax);
        let right = i64::from(bmin) - i64::from(amax);
        left.max(right).max(0).unsigned_abs()
    };
    let dx = gap(a.min.x, a.max.x, b.min.x, b.max.x);
    let dy = gap(a.min.y, a.max.y, b.min.y, b.max.y);
    dx * dx + dy * dy
}

/// Whether two rectangles are strictly closer than `spacing`, which is at least 1.
pub fn rects_closer_than(a: &Rect, b: &Rect, spacing: i32) -> bool {
    let spacing = u64::from(spacing.unsigned_abs());
    squared_gap(a, b) < spacing * spacing
}

/// Whether the regions of two outlines share a point.
pub fn outlines_touch(a: &[Point], b: &[Point]) -> bool {
    any_edges(a, b, 0, Segment::touches) || one_inside(a, b)
}

/// Whether the regions of two outlines are strictly closer than `spacing`, which is at least 1.
pub fn outlines_closer_than(a: &[Point], b: &[Point], spacing: i32) -> bool {
    any_edges(a, b, spacing, |s, t| s.closer_than(t, spacing)) || one_inside(a, b)
}

fn one_inside(a: &[Point], b: &[Point]) -> bool {
    let starts_in = |inner: &[Point], outer: &[Point]| {
        inner.first().is_some_and(|&vertex| encloses(outer, vertex))
    };
    starts_in(a, b) || starts_in(b, a)
}

/// Whether `test` holds for an edge of `a` and one of `b`, of those whose boxes come within `margin`.
fn any_edges(
    a: &[Point],
    b: &[Point],
    margin: i32,
    test: impl Fn(&Segment, &Segment) -> bool,
) -> bool {
    let (Some(box_a), Some(box_b)) = (Rect::around(a), Rect::around(b)) else {
        return false;
    };
    let near_a: Vec<Segment> = edges(a).filter(|e| is_near(e, &box_b, margin)).collect();
    if near_a.is_empty() {
        return false;
    }
    edges(b)
        .filter(|e| is_near(e, &box_a, margin))
        .any(|edge_b| {
            let box_b = bounds(&edge_b);
            near_a
                .iter()
                .any(|edge_a| is_near(edge_a, &box_b, margin) && test(edge_a, &edge_b))
        })
}

fn bounds(edge: &Segment) -> Rect {
    let (a, b) = (edge.a, edge.b);
    Rect::new(a.x.min(b.x), a.y.min(b.y), a.x.max(b.x), a.y.max(b.y))
}

fn is_near(edge: &Segment, area: &Rect, margin: i32) -> bool {
    bounds(edge).grown(margin).touches(area)
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    #[test]
    fn three_four_five() {
        let a = Rect::new(0, 0, 10, 10);
        let b = Rect::new(13, 14, 20, 20);
        assert!(!rects_closer_than(&a, &b, 5));
        assert!(rects_closer_than(&a, &b, 6));
        assert!(rects_closer_than(&a, &Rect::new(13, 13, 20, 20), 5));
        assert!(rects_closer_than(&a, &Rect::new(12, 14, 20, 20), 5));
        let (pa, pb) = (a.corners(), b.corners());
        assert!(!outlines_closer_than(&pa, &pb, 5));
        assert!(outlines_closer_than(&pa, &pb, 6));
    }

    #[test]
    fn the_farthest_rectangles_do_not_overflow() {
        let l = crate::geometry::COORDINATE_LIMIT;
        let a = Rect::new(-l, -l, -l, -l);
        let b = Rect::new(l, l, l, l);
        assert_eq!(squared_gap(&a, &b), 1 << 63);
        assert!(!rects_closer_than(&a, &b, i32::MAX));
    }

    #[test]
    fn one_inside_the_other_touches_and_one_in_the_hole_does_not() {
        let points = |list: &[(i32, i32)]| -> Vec<Point> {
            list.iter().map(|&(x, y)| Point::new(x, y)).collect()
        };
        let ring = points(&[
            (0, 0),
            (20, 0),
            (20, 20),
            (0, 20),
            (0, 0),
            (5, 5),
            (5, 15),
            (15, 15),
            (15, 5),
            (5, 5),
        ]);
        let in_wall = points(&[(1, 1), (3, 1), (2, 3)]);
        let in_hole = points(&[(9, 9), (11, 9), (10, 11)]);
        assert!(outlines_touch(&ring, &in_wall) && outlines_touch(&in_wall, &ring));
        assert!(!outlines_touch(&ring, &in_hole) && !outlines_touch(&in_hole, &ring));
        assert!(!outlines_closer_than(&ring, &in_hole, 4));
        assert!(outlines_closer_than(&ring, &in_hole, 5));
    }

    /// Rectangles as outlines against the closed formula.
    #[test]
    fn outlines_agree_with_rectangles() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(2);
        for _ in 0..50_000 {
            let mut rect = || {
                let (x, y) = (rng.random_range(0..20), rng.random_range(0..20));
                Rect::new(x, y, x + rng.random_range(1..8), y + rng.random_range(1..8))
            };
            let (a, b) = (rect(), rect());
            let spacing = rng.random_range(1..12);
            let (pa, pb) = (a.corners(), b.corners());
            assert_eq!(outlines_touch(&pa, &pb), a.touches(&b));
            assert_eq!(a.touches(&b), squared_gap(&a, &b) == 0);
            assert_eq!(
                outlines_closer_than(&pa, &pb, spacing),
                rects_closer_than(&a, &b, spacing)
            );
        }
    }

    /// Triangles against the least distance over all pairs of points with coordinates in quarters.
    #[test]
    fn triangles_that_share_grid_points_touch() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(3);
        let mut touching = 0;
        for _ in 0..5_000 {
            let mut triangle = || -> Vec<Point> {
                (0..3)
                    .map(|_| Point::new(rng.random_range(0..12), rng.random_range(0..12)))
                    .collect()
            };
            let (a, b) = (triangle(), triangle());
            let shared = (0..12).any(|x| {
                (0..12).any(|y| encloses(&a, Point::new(x, y)) && encloses(&b, Point::new(x, y)))
            });
            if shared {
                touching += 1;
                assert!(outlines_touch(&a, &b), "{a:?} {b:?}");
            }
            assert_eq!(
                outlines_touch(&a, &b),
                outlines_closer_than(&a, &b, 1) && {
                    // Closer than 1 without touching is possible: scale until 1 unit is a hair.
                    let scale = |t: &[Point]| -> Vec<Point> {
                        t.iter()
                            .map(|p| Point::new(p.x * 1000, p.y * 1000))
                            .collect()
                    };
                    outlines_closer_than(&scale(&a), &scale(&b), 1)
                }
            );
        }
        assert!(touching > 1000);
    }
}
