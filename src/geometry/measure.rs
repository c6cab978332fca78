//! The area of a union of rectangles, without building the union.
//!
//! A vertical line sweeps the rectangles; a segment tree over their ordinates holds how much of the line is
//! covered. Each node counts the rectangles that cover all of its stretch but not all of its parent's, so
//! that taking one out undoes exactly what putting it in did. O(n log n), also where the union has far more
//! corners than there are rectangles.
//!
//! Source: V. Klee's measure problem; J. L. Bentley, "Algorithms for Klee's rectangle problems" (1977).

use super::Rect;
use super::slabs::{Rim, rims_of_rect};

/// The area of the union of `rects`, in square database units.
pub fn area_of_union(rects: &[Rect]) -> u64 {
    match rects {
        [] => return 0,
        [one] => return one.area(),
        _ => {}
    }
    let mut rims: Vec<Rim> = rects.iter().flat_map(rims_of_rect).collect();
    rims.sort_unstable_by_key(|rim| rim.x);
    let mut marks: Vec<i32> = rims.iter().map(|rim| rim.y0).collect();
    marks.extend(rims.iter().map(|rim| rim.y1));
    marks.sort_unstable();
    marks.dedup();
    let nodes = 4 * marks.len();
    let mut line = Line {
        marks,
        count: vec![0; nodes],
        covered: vec![0; nodes],
    };
    let mut area = 0;
    let mut before = rims[0].x;
    for rim in &rims {
        let step = i64::from(rim.x) - i64::from(before);
        area += step.unsigned_abs() * line.covered[1];
        before = rim.x;
        let last = line.marks.len() - 1;
        line.turn(1, 0, last, rim);
    }
    area
}

struct Line {
    marks: Vec<i32>,
    count: Vec<i32>,
    covered: Vec<u64>,
}

impl Line {
    /// Applies a rim to the node of the stretch between two marks.
    fn turn(&mut self, node: usize, low: usize, high: usize, rim: &Rim) {
        let [from, to] = [self.marks[low], self.marks[high]];
        if rim.y1 <= from || to <= rim.y0 {
            return;
        }
        if rim.y0 <= from && to <= rim.y1 {
            self.count[node] += rim.turn;
        } else {
            let middle = (low + high) / 2;
            self.turn(2 * node, low, middle, rim);
            self.turn(2 * node + 1, middle, high, rim);
        }
        self.covered[node] = if self.count[node] > 0 {
            (i64::from(to) - i64::from(from)).unsigned_abs()
        } else if high - low == 1 {
            0
        } else {
            self.covered[2 * node] + self.covered[2 * node + 1]
        };
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    #[test]
    fn agrees_with_counting_cells() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(8);
        for _ in 0..2_000 {
            let rects: Vec<Rect> = (0..rng.random_range(0..12))
                .map(|_| {
                    let (x, y) = (rng.random_range(-9..9), rng.random_range(-9..9));
                    Rect::new(x, y, x + rng.random_range(1..9), y + rng.random_range(1..9))
                })
                .collect();
            let inside = |x: i32, y: i32| {
                let cell = Rect::new(x, y, x + 1, y + 1);
                rects.iter().any(|rect| rect.covers(&cell))
            };
            let cells = (-9..18).flat_map(|x| (-9..18).map(move |y| (x, y)));
            let expected = cells.filter(|&(x, y)| inside(x, y)).count() as u64;
            assert_eq!(area_of_union(&rects), expected, "{rects:?}");
        }
    }

    #[test]
    fn the_whole_plane_fits() {
        let l = crate::geometry::COORDINATE_LIMIT;
        let halves = [Rect::new(-l, -l, 0, l), Rect::new(-1, -l, l, l)];
        assert_eq!(area_of_union(&halves), 1 << 62);
    }
}
