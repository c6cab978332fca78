//! Touching and distances of closed regions: rectangles, and outlines of any angle.
//!
//! Two regions share a point when their outlines do, or when one lies inside the other; in the second
//! case any vertex of the inner one tells. Apart from that they are as far from each other as their
//! nearest edges. Everything is decided in integers; see [`super::segment`] for the bounds.

use super::rtree::{PackedTree, Visitor};
use super::segment::Segment;
use super::winding::{edges, encloses, winds_around};
use super::{Point, Rect};

/// The squared distance of two rectangles, 0 when they share a point. At most 2^63.
pub fn squared_gap(a: &Rect, b: &Rect) -> u64 {
    let [dx, dy] = gaps(a, b);
    dx * dx + dy * dy
}

/// How far two rectangles are apart along x and along y. At most 2^31 each.
fn gaps(a: &Rect, b: &Rect) -> [u64; 2] {
    let gap = |amin: i32, amax: i32, bmin: i32, bmax: i32| {
        let left = i64::from(amin) - i64::from(bmax);
        let right = i64::from(bmin) - i64::from(amax);
        left.max(right).max(0).unsigned_abs()
    };
    [
        gap(a.min.x, a.max.x, b.min.x, b.max.x),
        gap(a.min.y, a.max.y, b.min.y, b.max.y),
    ]
}

/// Whether two rectangles are strictly closer than `spacing`, which is at least 1.
pub fn rects_closer_than(a: &Rect, b: &Rect, spacing: i32) -> bool {
    let spacing = u64::from(spacing.unsigned_abs());
    squared_gap(a, b) < spacing * spacing
}

/// The same in the square metric, max(|dx|, |dy|).
pub fn rects_closer_than_square(a: &Rect, b: &Rect, spacing: i32) -> bool {
    let [dx, dy] = gaps(a, b);
    dx.max(dy) < u64::from(spacing.unsigned_abs())
}

/// An outline, with a tree over the boxes of its edges where it has many.
#[derive(Clone, Copy, Debug)]
pub struct Outline<'a> {
    points: &'a [Point],
    /// Item i is the box of the edge that ends at vertex i.
    index: Option<&'a PackedTree>,
}

impl<'a> Outline<'a> {
    /// An outline whose edges are looked at one by one.
    pub fn plain(points: &'a [Point]) -> Outline<'a> {
        Outline {
            points,
            index: None,
        }
    }

    /// An outline with its [`edge_index`].
    pub fn indexed(points: &'a [Point], index: &'a PackedTree) -> Outline<'a> {
        let index = Some(index);
        Outline { points, index }
    }

    /// Its vertices.
    pub fn points(&self) -> &'a [Point] {
        self.points
    }

    /// The edges whose boxes share a point with `area`.
    pub fn edges_near(&self, area: &Rect) -> Vec<Segment> {
        let Some(index) = self.index else {
            let near = |edge: &Segment| bounds(edge).touches(area);
            return edges(self.points).filter(near).collect();
        };
        let mut found = EdgesFound {
            points: self.points,
            edges: Vec::new(),
        };
        index.query(area, &mut found);
        found.edges
    }

    /// Whether `point` is in its region.
    fn encloses(&self, point: Point) -> bool {
        let Some(area) = self.index.and_then(PackedTree::bounds) else {
            return encloses(self.points, point);
        };
        if !area.touches(&Rect::around(&[point]).unwrap_or_default()) {
            return false;
        }
        let (ray, turn) = shortest_ray(&area, point);
        let met = self.edges_near(&ray).into_iter().map(|edge| Segment {
            a: turn(edge.a),
            b: turn(edge.b),
        });
        winds_around(met, turn(point))
    }

    fn bounds(&self) -> Option<Rect> {
        match self.index {
            None => Rect::around(self.points),
            Some(index) => index.bounds(),
        }
    }
}

/// A mirror image of the plane, quarter turns included.
type Mirror = fn(Point) -> Point;

/// The shortest ray along an axis from a point in `area` out of it, and the mirror image in which it runs
/// towards larger x. An image may turn the outline round, which leaves no winding number zero.
fn shortest_ray(area: &Rect, point: Point) -> (Rect, Mirror) {
    let Point { x, y } = point;
    let rays: [(Rect, Mirror); 4] = [
        (Rect::new(x, y, area.max.x, y), |p| p),
        (Rect::new(area.min.x, y, x, y), |p| Point::new(-p.x, p.y)),
        (Rect::new(x, y, x, area.max.y), |p| Point::new(p.y, p.x)),
        (Rect::new(x, area.min.y, x, y), |p| Point::new(-p.y, p.x)),
    ];
    let length = |ray: &Rect| ray.width() + ray.height();
    let [first, rest @ ..] = rays;
    rest.into_iter().fold(first, |best, other| {
        if length(&other.0) < length(&best.0) {
            other
        } else {
            best
        }
    })
}

/// A tree over the edges of an outline. They follow each other along it, which is spatial order enough.
pub fn edge_index(points: &[Point]) -> PackedTree {
    PackedTree::new(edges(points).map(|edge| bounds(&edge)).collect())
}

struct EdgesFound<'a> {
    points: &'a [Point],
    edges: Vec<Segment>,
}

impl Visitor for EdgesFound<'_> {
    fn enter(&mut self, _: usize) -> bool {
        true
    }

    fn visit(&mut self, item: u32) {
        let b = item as usize;
        let a = b.checked_sub(1).unwrap_or(self.points.len() - 1);
        self.edges.push(Segment {
            a: self.points[a],
            b: self.points[b],
        });
    }
}

/// Whether the regions of two outlines share a point.
pub fn outlines_touch(a: Outline<'_>, b: Outline<'_>) -> bool {
    any_edges(a, b, 0, Segment::touches) || one_inside(a, b)
}

/// Whether the regions of two outlines are strictly closer than `spacing`, which is at least 1.
pub fn outlines_closer_than(a: Outline<'_>, b: Outline<'_>, spacing: i32) -> bool {
    any_edges(a, b, spacing, |s, t| s.closer_than(t, spacing)) || one_inside(a, b)
}

/// The same in the square metric, max(|dx|, |dy|).
pub fn outlines_closer_than_square(a: Outline<'_>, b: Outline<'_>, spacing: i32) -> bool {
    any_edges(a, b, spacing, |s, t| s.closer_than_square(t, spacing)) || one_inside(a, b)
}

fn one_inside(a: Outline<'_>, b: Outline<'_>) -> bool {
    let starts_in = |inner: Outline<'_>, outer: Outline<'_>| {
        let first = inner.points.first();
        first.is_some_and(|&vertex| outer.encloses(vertex))
    };
    starts_in(a, b) || starts_in(b, a)
}

/// Whether `test` holds for an edge of `a` and one of `b`, of those whose boxes come within `margin`.
fn any_edges(
    a: Outline<'_>,
    b: Outline<'_>,
    margin: i32,
    test: impl Fn(&Segment, &Segment) -> bool,
) -> bool {
    // An index is best used by the edges of the other outline.
    let (a, b) = if a.index.is_some() { (a, b) } else { (b, a) };
    let (Some(box_a), Some(box_b)) = (a.bounds(), b.bounds()) else {
        return false;
    };
    let near_b = b.edges_near(&box_a.grown(margin));
    if a.index.is_some() {
        let meets = |edge: &Segment| {
            let near = a.edges_near(&bounds(edge).grown(margin));
            near.iter().any(|other| test(other, edge))
        };
        return near_b.iter().any(meets);
    }
    let near_a = a.edges_near(&box_b.grown(margin));
    near_b.iter().any(|edge| {
        let reach = bounds(edge).grown(margin);
        (near_a.iter()).any(|other| bounds(other).touches(&reach) && test(other, edge))
    })
}

fn bounds(edge: &Segment) -> Rect {
    let (a, b) = (edge.a, edge.b);
    Rect::new(a.x.min(b.x), a.y.min(b.y), a.x.max(b.x), a.y.max(b.y))
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    /// Both with and without indices, which must agree.
    fn both(a: &[Point], b: &[Point], test: impl Fn(Outline<'_>, Outline<'_>) -> bool) -> bool {
        let (index_a, index_b) = (edge_index(a), edge_index(b));
        let forms = |points, index| [Outline::plain(points), Outline::indexed(points, index)];
        let (forms_a, forms_b) = (forms(a, &index_a), forms(b, &index_b));
        let expected = test(forms_a[0], forms_b[0]);
        for (a, b) in [(0, 1), (1, 0), (1, 1)] {
            assert_eq!(test(forms_a[a], forms_b[b]), expected);
        }
        expected
    }

    fn touch(a: &[Point], b: &[Point]) -> bool {
        both(a, b, outlines_touch)
    }

    fn closer(a: &[Point], b: &[Point], spacing: i32) -> bool {
        both(a, b, |a, b| outlines_closer_than(a, b, spacing))
    }

    #[test]
    fn three_four_five() {
        let a = Rect::new(0, 0, 10, 10);
        let b = Rect::new(13, 14, 20, 20);
        assert!(!rects_closer_than(&a, &b, 5));
        assert!(rects_closer_than(&a, &b, 6));
        assert!(rects_closer_than(&a, &Rect::new(13, 13, 20, 20), 5));
        assert!(rects_closer_than(&a, &Rect::new(12, 14, 20, 20), 5));
        let (pa, pb) = (a.corners(), b.corners());
        assert!(!closer(&pa, &pb, 5));
        assert!(closer(&pa, &pb, 6));
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
        assert!(touch(&ring, &in_wall) && touch(&in_wall, &ring));
        assert!(!touch(&ring, &in_hole) && !touch(&in_hole, &ring));
        assert!(!closer(&ring, &in_hole, 4));
        assert!(closer(&ring, &in_hole, 5));
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
            assert_eq!(touch(&pa, &pb), a.touches(&b));
            assert_eq!(a.touches(&b), squared_gap(&a, &b) == 0);
            assert_eq!(
                closer(&pa, &pb, spacing),
                rects_closer_than(&a, &b, spacing)
            );
            assert_eq!(
                both(&pa, &pb, |a, b| outlines_closer_than_square(a, b, spacing)),
                rects_closer_than_square(&a, &b, spacing)
            );
        }
    }

    #[test]
    fn rays_to_all_sides_agree() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(9);
        for _ in 0..500 {
            let mut c = || rng.random_range(0..20);
            let outline: Vec<Point> = (0..12).map(|_| Point::new(c(), c())).collect();
            let index = edge_index(&outline);
            let indexed = Outline::indexed(&outline, &index);
            for point in (-1..=20).flat_map(|x| (-1..=20).map(move |y| Point::new(x, y))) {
                assert_eq!(indexed.encloses(point), encloses(&outline, point));
            }
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
                assert!(touch(&a, &b), "{a:?} {b:?}");
            }
            assert_eq!(
                touch(&a, &b),
                closer(&a, &b, 1) && {
                    // Closer than 1 without touching is possible: scale until 1 unit is a hair.
                    let scale = |t: &[Point]| -> Vec<Point> {
                        t.iter()
                            .map(|p| Point::new(p.x * 1000, p.y * 1000))
                            .collect()
                    };
                    closer(&scale(&a), &scale(&b), 1)
                }
            );
        }
        assert!(touching > 1000);
    }
}
