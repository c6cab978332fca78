//! Whether an outline encloses a point: the winding number, counted along a ray.
//!
//! A ray runs from the point towards larger x. Each edge that crosses it upwards counts +1 when the
//! point lies to its left, each that crosses downwards -1 when it lies to its right; an edge owns its
//! lower end only, so that a ray through a vertex counts it once. The sum is the number of times that the
//! outline runs around the point; points of a non-zero number are inside.
//!
//! Source: D. Sunday, "Inclusion of a point in a polygon" (2001), with integer side tests.

use super::Point;
use super::orientation::cross;
use super::segment::Segment;

/// Whether `point` is in the closed region that `outline` draws: on it, or of non-zero winding number.
pub fn encloses(outline: &[Point], point: Point) -> bool {
    winds_around(edges(outline), point)
}

/// Whether `point` is enclosed by an outline of which `edges` are at least those that the ray from the point
/// towards larger x meets.
pub fn winds_around(edges: impl Iterator<Item = Segment>, point: Point) -> bool {
    let mut winding = 0i64;
    for edge in edges {
        if edge.contains(point) {
            return true;
        }
        winding += crossing(edge.a, edge.b, point);
    }
    winding != 0
}

/// The edges of a closed outline, the one from the last vertex to the first included.
pub fn edges(outline: &[Point]) -> impl Iterator<Item = Segment> + '_ {
    let last = outline.last().copied();
    last.into_iter()
        .chain(outline.iter().copied())
        .zip(outline.iter().copied())
        .map(|(a, b)| Segment { a, b })
}

fn crossing(a: Point, b: Point, point: Point) -> i64 {
    let up = a.y <= point.y && point.y < b.y;
    let down = b.y <= point.y && point.y < a.y;
    if up && cross(a, b, point) > 0 {
        1
    } else if down && cross(a, b, point) < 0 {
        -1
    } else {
        0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn outline(points: &[(i32, i32)]) -> Vec<Point> {
        points.iter().map(|&(x, y)| Point::new(x, y)).collect()
    }

    /// Draws the region of `outline` on a 12 x 12 grid, top line first.
    fn draw(points: &[(i32, i32)]) -> Vec<String> {
        let outline = outline(points);
        (0..=6)
            .rev()
            .map(|y| {
                let inside = |x| encloses(&outline, Point::new(x, y));
                (0..=6).map(|x| if inside(x) { '#' } else { '.' }).collect()
            })
            .collect()
    }

    #[test]
    fn a_keyhole_keeps_its_hole() {
        let hole = [
            (0, 0),
            (6, 0),
            (6, 6),
            (0, 6),
            (0, 0),
            (1, 1),
            (1, 5),
            (5, 5),
            (5, 1),
            (1, 1),
        ];
        let picture = draw(&hole);
        assert_eq!(picture[0], "#######");
        assert_eq!(picture[2], "##...##");
        assert_eq!(picture[4], "##...##");
        assert_eq!(picture[6], "#######");
    }

    #[test]
    fn an_area_drawn_twice_stays_drawn() {
        let twice = [
            (0, 0),
            (4, 0),
            (4, 4),
            (2, 4),
            (2, 1),
            (6, 1),
            (6, 3),
            (0, 3),
        ];
        let picture = draw(&twice);
        assert_eq!(picture[4], "#######");
    }

    #[test]
    fn a_slanted_notch_is_outside() {
        let notch = [(0, 0), (6, 0), (6, 6), (3, 3), (0, 6)];
        assert_eq!(
            draw(&notch),
            [
                "#.....#", "##...##", "###.###", "#######", "#######", "#######", "#######"
            ]
        );
    }
}
