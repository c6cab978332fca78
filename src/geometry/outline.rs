//! Kinds of outlines, their spikes and their area.

use super::Point;
use super::orientation::cross;
use super::winding::edges;

/// Whether all edges run along the axes.
pub fn is_manhattan(outline: &[Point]) -> bool {
    edges(outline).all(|edge| edge.a.x == edge.b.x || edge.a.y == edge.b.y)
}

/// The outline without spikes and repeated vertices: vertices at which it turns back on itself, which
/// enclose nothing, are taken out until none is left. Straight vertices go as well. An outline that
/// encloses nothing because it is one line, or a line run to and fro, comes back empty.
pub fn without_spikes(outline: &[Point]) -> Vec<Point> {
    let mut kept: Vec<Point> = Vec::with_capacity(outline.len());
    for &vertex in outline {
        kept.push(vertex);
        while let [.., a, b, c] = kept[..] {
            if cross(a, b, c) != 0 {
                break;
            }
            kept.truncate(kept.len() - 2);
            if a != c {
                kept.push(c);
            }
        }
    }
    close(&mut kept);
    kept
}

/// Takes out what is straight or turns back where the list closes.
fn close(kept: &mut Vec<Point>) {
    let mut first = 0;
    while let [head, second, .., before, last] = kept[first..] {
        if cross(before, last, head) == 0 {
            kept.pop();
        } else if cross(last, head, second) == 0 {
            first += 1;
        } else {
            break;
        }
    }
    kept.drain(..first);
    let straight = match kept[..] {
        [a, b, c] => cross(a, b, c) == 0,
        _ => kept.len() < 3,
    };
    if straight {
        kept.clear();
    }
}

/// Twice the signed area that the outline runs around, each part counted as often as it is run around,
/// counter-clockwise positive (the shoelace formula).
pub fn doubled_area(outline: &[Point]) -> i128 {
    edges(outline)
        .map(|edge| {
            let [ax, ay] = [i128::from(edge.a.x), i128::from(edge.a.y)];
            let [bx, by] = [i128::from(edge.b.x), i128::from(edge.b.y)];
            ax * by - ay * bx
        })
        .sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn outline(points: &[(i32, i32)]) -> Vec<Point> {
        points.iter().map(|&(x, y)| Point::new(x, y)).collect()
    }

    #[test]
    fn spikes_go_wherever_they_start() {
        let square = outline(&[(0, 0), (4, 0), (4, 4), (0, 4)]);
        let spiked = outline(&[
            (0, 0),
            (4, 0),
            (4, 2),
            (9, 2),
            (7, 2),
            (4, 2),
            (4, 4),
            (0, 4),
        ]);
        for turn in 0..spiked.len() {
            let mut start = spiked.clone();
            start.rotate_left(turn);
            let mut clean = without_spikes(&start);
            clean.sort();
            let mut expected = square.clone();
            expected.sort();
            assert_eq!(clean, expected, "turned by {turn}");
        }
    }

    #[test]
    fn lines_enclose_nothing() {
        for line in [
            &[(0, 0), (3, 3), (6, 6)][..],
            &[(0, 0), (3, 1), (5, 5), (3, 1)],
            &[(0, 0), (5, 2), (9, 9), (5, 2), (0, 0)],
            &[(2, 2), (2, 2), (2, 2)],
        ] {
            assert_eq!(without_spikes(&outline(line)), [], "{line:?}");
        }
    }

    #[test]
    fn area_of_a_slanted_outline() {
        assert_eq!(doubled_area(&outline(&[(0, 0), (4, 0), (0, 3)])), 12);
        assert_eq!(doubled_area(&outline(&[(0, 0), (0, 3), (4, 0)])), -12);
        let l = crate::geometry::COORDINATE_LIMIT;
        let all = outline(&[(-l, -l), (l, -l), (l, l), (-l, l)]);
        assert_eq!(doubled_area(&all), 1 << 63);
    }
}
