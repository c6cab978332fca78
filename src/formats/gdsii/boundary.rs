//! BOUNDARY and BOX: closed outlines.
//!
//! Points that change nothing that is drawn are left out: repeated ones, those inside a straight side,
//! and the tips of spikes without area. What is left must enclose an area. Outlines that cross
//! themselves are kept as they are.

use super::canvas::Canvas;
use super::element::Element;
use super::problem::Problem;
use super::records::{Fault, kind};
use crate::geometry::Point;

/// Draws a BOUNDARY or BOX. `points` is working memory.
pub(super) fn draw(
    element: &Element<'_>,
    points: &mut Vec<Point>,
    canvas: &mut Canvas,
) -> Result<(), Fault> {
    element.points(points)?;
    open(element, points).map_err(|problem| element.wrong(problem))?;
    simplify(points);
    if points.len() < 3 || doubled_area(points) == 0 {
        return Err(element.wrong(Problem::NoArea(element.start.name())));
    }
    canvas
        .draw_points(points)
        .map_err(|problem| element.wrong(problem))
}

/// Checks the closing point and takes it off.
fn open(element: &Element<'_>, points: &mut Vec<Point>) -> Result<(), Problem> {
    let name = element.start.name();
    let found = points.len();
    let wrong = |expected| Problem::Points {
        element: name,
        found,
        expected,
    };
    if element.start.kind == kind::BOX && found != 5 {
        return Err(wrong("5, the last one equal to the first"));
    }
    let (Some(&first), Some(&last), true) = (points.first(), points.last(), found >= 4) else {
        return Err(wrong("at least 4, the last one equal to the first"));
    };
    if first != last {
        return Err(Problem::Unclosed {
            element: name,
            first: (first.x, first.y),
            last: (last.x, last.y),
        });
    }
    points.pop();
    Ok(())
}

/// Whether a closed outline through `a`, `b`, `c` draws the same without `b`.
fn redundant(a: Point, b: Point, c: Point) -> bool {
    let along = |p: i32, q: i32| i128::from(q) - i128::from(p);
    along(a.x, b.x) * along(b.y, c.y) == along(a.y, b.y) * along(b.x, c.x)
}

/// Leaves out the points of a closed outline that change nothing.
pub(super) fn simplify(points: &mut Vec<Point>) {
    let mut kept = 0;
    for i in 0..points.len() {
        let next = points[i];
        while kept >= 2 && redundant(points[kept - 2], points[kept - 1], next) {
            kept -= 1;
        }
        if kept == 0 || points[kept - 1] != next {
            points[kept] = next;
            kept += 1;
        }
    }
    // The same around the seam, where points go from both ends.
    let mut start = 0;
    while kept - start >= 3 {
        if redundant(points[kept - 2], points[kept - 1], points[start]) {
            kept -= 1;
        } else if redundant(points[kept - 1], points[start], points[start + 1]) {
            start += 1;
        } else {
            break;
        }
    }
    points.truncate(kept);
    points.drain(..start);
}

/// Twice the signed area (the shoelace formula).
pub(super) fn doubled_area(points: &[Point]) -> i128 {
    let Some(&last) = points.last() else { return 0 };
    let mut previous = last;
    let mut sum = 0;
    for &point in points {
        sum += i128::from(previous.x) * i128::from(point.y)
            - i128::from(point.x) * i128::from(previous.y);
        previous = point;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    fn simplified(list: &[(i32, i32)]) -> Vec<(i32, i32)> {
        let mut points: Vec<Point> = list.iter().map(|&(x, y)| Point { x, y }).collect();
        simplify(&mut points);
        points.iter().map(|p| (p.x, p.y)).collect()
    }

    #[test]
    fn needless_points_are_left_out() {
        let square = [(0, 0), (10, 0), (10, 10), (0, 10)];
        assert_eq!(simplified(&square), square);
        let middles = [(5, 0), (10, 0), (10, 10), (10, 10), (0, 10), (0, 5), (0, 0)];
        assert_eq!(simplified(&middles), [(10, 0), (10, 10), (0, 10), (0, 0)]);
        let spike = [(0, 0), (10, 0), (20, 0), (10, 0), (10, 10), (0, 10)];
        assert_eq!(simplified(&spike), square);
        let seam_spike = [(-5, 0), (0, 0), (10, 0), (10, 10), (0, 10), (0, 0), (-5, 0)];
        assert_eq!(simplified(&seam_spike).len(), 4);
        assert!(simplified(&[(0, 0), (5, 5), (9, 9)]).len() < 3);
        assert!(simplified(&[(0, 0), (0, 0), (0, 0)]).len() < 3);
        assert!(simplified(&[]).is_empty());
    }

    #[test]
    fn simplifying_keeps_the_area() {
        use rand::{Rng, SeedableRng};
        let mut random = rand_pcg::Pcg64::seed_from_u64(4);
        for _ in 0..5000 {
            let count = random.random_range(3..12);
            let mut points: Vec<Point> = (0..count)
                .map(|_| Point {
                    x: random.random_range(0..4),
                    y: random.random_range(0..4),
                })
                .collect();
            let area = doubled_area(&points);
            simplify(&mut points);
            assert_eq!(doubled_area(&points), area);
            let n = points.len();
            if n >= 3 {
                assert!((0..n).all(|i| !redundant(
                    points[i],
                    points[(i + 1) % n],
                    points[(i + 2) % n]
                )));
            }
        }
    }
}
