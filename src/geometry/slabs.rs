//! Axis-parallel regions cut into disjoint rectangles of constant cross-section.
//!
//! A vertical line sweeps the region from left to right. What it meets is a set of maximal intervals, the
//! cross-sections; a cell is an interval over the longest stretch of x on which it does not change. The
//! cells (the vertical trapezoid decomposition of the region) have disjoint interiors, cover the region
//! exactly and do not depend on how it was drawn.
//!
//! The region is given by its rims, vertical edges that change the winding number to their right; it is
//! where that number is not zero. The sweep looks again only at the part of the line that a rim touches, and
//! at no more of it than changes: n log n in rims and cells, so that neither a comb of many teeth nor
//! a stack of many rectangles costs more. A mesh of n rails has n^2 / 4 cells, hence the caller's limit.
//!
//! Source: the plane sweep of J. L. Bentley and T. Ottmann (1979), which needs no crossings here.

use super::cover::Cover;
use super::winding::edges;
use super::{Point, Rect};
use std::collections::BTreeMap;

/// A vertical edge of a region: to its right, the winding number between `y0` and `y1` is larger by
/// `turn`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Rim {
    /// Abscissa of the edge.
    pub x: i32,
    /// Its lower end.
    pub y0: i32,
    /// Its upper end.
    pub y1: i32,
    /// The change of the winding number from left to right.
    pub turn: i32,
}

/// The two rims of a rectangle.
pub fn rims_of_rect(rect: &Rect) -> [Rim; 2] {
    [(rect.min.x, 1), (rect.max.x, -1)].map(|(x, turn)| Rim {
        x,
        y0: rect.min.y,
        y1: rect.max.y,
        turn,
    })
}

/// The rims of an outline whose edges all run along the axes.
pub fn rims_of_outline(outline: &[Point]) -> impl Iterator<Item = Rim> + '_ {
    edges(outline)
        .filter(|edge| edge.a.y != edge.b.y)
        .map(|edge| Rim {
            x: edge.a.x,
            y0: edge.a.y.min(edge.b.y),
            y1: edge.a.y.max(edge.b.y),
            turn: if edge.a.y < edge.b.y { -1 } else { 1 },
        })
}

/// The cells of the union of rectangles, sorted by their lower left corners, unless there are more than
/// `limit`.
pub fn cells_of_rects(rects: &[Rect], limit: usize) -> Option<Vec<Rect>> {
    match rects {
        [one] => Some(vec![*one]),
        _ => cells(rects.iter().flat_map(rims_of_rect).collect(), limit),
    }
}

/// The cells of the region that `rims` bound, sorted by their lower left corners, unless there are more
/// than `limit`.
pub fn cells(mut rims: Vec<Rim>, limit: usize) -> Option<Vec<Rect>> {
    rims.sort_unstable();
    let mut sweep = Sweep::new(&rims);
    for batch in rims.chunk_by(|a, b| a.x == b.x) {
        sweep.advance(batch);
        if sweep.cells.len() + sweep.open.len() > limit {
            return None;
        }
    }
    sweep.cells.sort_unstable();
    Some(sweep.cells)
}

struct Sweep {
    /// The ordinates of all rims, ascending, and the winding numbers between them.
    marks: Vec<i32>,
    winding: Cover,
    /// The intervals of the line that are inside: from the key to the first value, since the abscissa
    /// that is the second one. They are maximal: no two share a point.
    open: BTreeMap<i32, (i32, i32)>,
    cells: Vec<Rect>,
}

impl Sweep {
    fn new(rims: &[Rim]) -> Sweep {
        let mut marks: Vec<i32> = rims.iter().flat_map(|rim| [rim.y0, rim.y1]).collect();
        marks.sort_unstable();
        marks.dedup();
        Sweep {
            winding: Cover::new(marks.len()),
            marks,
            open: BTreeMap::new(),
            cells: Vec::new(),
        }
    }

    /// Moves the line over the rims of one abscissa, which are sorted by their lower ends.
    fn advance(&mut self, batch: &[Rim]) {
        for rim in batch {
            let [start, end] = [self.mark(rim.y0), self.mark(rim.y1)];
            self.winding.add(start, end, rim.turn);
        }
        let mut rest = batch;
        while let [first, ..] = rest {
            let mut window = self.widened([first.y0, first.y1]);
            rest = &rest[1..];
            while let Some(next) = rest.first().filter(|next| next.y0 <= window[1]) {
                window = self.widened([window[0], window[1].max(next.y1)]);
                rest = &rest[1..];
            }
            self.renew(first.x, window);
        }
    }

    /// The number of the mark at `y`.
    fn mark(&self, y: i32) -> usize {
        self.marks.partition_point(|&mark| mark < y)
    }

    /// The window with the open intervals that share a point with it.
    fn widened(&self, [low, high]: [i32; 2]) -> [i32; 2] {
        let below = self.open.range(..=low).next_back();
        let above = self.open.range(..=high).next_back();
        [
            below.map_or(low, |(&y0, &(y1, _))| if y1 >= low { y0 } else { low }),
            above.map_or(high, |(_, &(y1, _))| y1.max(high)),
        ]
    }

    /// Closes the open intervals of the window that are no more and opens the new ones. Nothing is
    /// inside directly below or above the window.
    fn renew(&mut self, x: i32, [low, high]: [i32; 2]) {
        let now = self.inside(low, high);
        let before: Vec<(i32, (i32, i32))> =
            self.open.range(low..=high).map(|(&k, &v)| (k, v)).collect();
        for (y0, (y1, since)) in before {
            if now.binary_search(&[y0, y1]).is_err() {
                self.open.remove(&y0);
                self.cells.push(Rect::new(since, y0, x, y1));
            }
        }
        for [y0, y1] in now {
            self.open.entry(y0).or_insert((y1, x));
        }
    }

    /// The maximal intervals of non-zero winding number in the window.
    fn inside(&self, low: i32, high: i32) -> Vec<[i32; 2]> {
        let mut found = Vec::new();
        let (mut at, last) = (self.mark(low), self.mark(high));
        while let Some(start) = self.winding.next(at, false).filter(|&start| start < last) {
            at = self.winding.next(start, true).unwrap_or(last);
            found.push([self.marks[start], self.marks[at]]);
        }
        found
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    const SIZE: usize = 24;

    fn raster(rects: &[Rect]) -> Vec<u32> {
        let mut count = vec![0; SIZE * SIZE];
        for r in rects {
            for y in r.min.y..r.max.y {
                for x in r.min.x..r.max.x {
                    count[y as usize * SIZE + x as usize] += 1;
                }
            }
        }
        count
    }

    /// The cells by definition: runs of equal cross-sections in the columns of a raster.
    fn cells_of_raster(inside: &[bool]) -> Vec<Rect> {
        let column = |x: usize| -> Vec<[i32; 2]> {
            let at = |y: usize| y < SIZE && x < SIZE && inside[y * SIZE + x];
            let starts = (0..SIZE).filter(|&y| at(y) && (y == 0 || !at(y - 1)));
            starts
                .map(|y0| [y0 as i32, (y0..).find(|&y| !at(y)).unwrap_or(SIZE) as i32])
                .collect()
        };
        let mut found = Vec::new();
        for x in 0..SIZE {
            for [y0, y1] in column(x) {
                if x > 0 && column(x - 1).contains(&[y0, y1]) {
                    continue;
                }
                let end = (x..)
                    .find(|&x| !column(x).contains(&[y0, y1]))
                    .unwrap_or(SIZE);
                found.push(Rect::new(x as i32, y0, end as i32, y1));
            }
        }
        found.sort();
        found
    }

    #[test]
    fn unions_of_rectangles_agree_with_a_raster() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(4);
        for round in 0..3_000 {
            let rects: Vec<Rect> = (0..rng.random_range(1..14))
                .map(|_| {
                    let (x, y) = (rng.random_range(0..20), rng.random_range(0..20));
                    let (w, h) = (rng.random_range(1..12), rng.random_range(1..12));
                    Rect::new(x, y, (x + w).min(23), (y + h).min(23))
                })
                .collect();
            let inside: Vec<bool> = raster(&rects).iter().map(|&n| n > 0).collect();
            assert_eq!(
                cells_of_rects(&rects, 1000).unwrap(),
                cells_of_raster(&inside),
                "{round} {rects:?}"
            );
        }
    }

    /// Random closed walks along the axes cross and retrace themselves; the winding number is the
    /// reference.
    #[test]
    fn outlines_agree_with_the_winding_number() {
        use crate::geometry::winding::encloses;
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(5);
        for _ in 0..2_000 {
            let steps = rng.random_range(2..9);
            let mut c = || rng.random_range(0..11) * 2;
            let mut at = Point::new(c(), c());
            let mut outline = Vec::new();
            for _ in 0..steps {
                outline.push(at);
                at.x = c();
                outline.push(at);
                at.y = c();
            }
            outline.push(at);
            outline.push(Point::new(outline[0].x, at.y));
            let cells = cells(rims_of_outline(&outline).collect(), 1000).unwrap();
            let covered = raster(&cells);
            for y in 0..11 {
                for x in 0..11 {
                    // Odd coordinates are off every edge.
                    let point = Point::new(2 * x + 1, 2 * y + 1);
                    let inside = u32::from(encloses(&outline, point));
                    let index = point.y as usize * SIZE + point.x as usize;
                    assert_eq!(covered[index], inside, "{outline:?} {point:?}");
                }
            }
        }
    }

    #[test]
    fn rectangles_that_share_a_corner_stay_two_cells() {
        let two = [Rect::new(0, 0, 5, 5), Rect::new(5, 5, 9, 9)];
        assert_eq!(cells_of_rects(&two, 2).unwrap(), two);
    }

    #[test]
    fn nothing_has_no_cells() {
        assert_eq!(cells_of_rects(&[], 0), Some(vec![]));
        let line = [(0, 0), (0, 5), (0, 2)].map(|(x, y)| Point::new(x, y));
        assert_eq!(cells(rims_of_outline(&line).collect(), 0), Some(vec![]));
    }

    #[test]
    fn too_many_cells_are_refused() {
        let rail = |i: i32| {
            [
                Rect::new(3 * i, 0, 3 * i + 1, 30),
                Rect::new(0, 3 * i, 30, 3 * i + 1),
            ]
        };
        let mesh: Vec<Rect> = (0..10).flat_map(rail).collect();
        let count = cells_of_rects(&mesh, 1000).unwrap().len();
        // Ten rails one way, and between them (or behind the last) ten pieces of each rail the other way.
        assert_eq!(count, 110);
        assert!(cells_of_rects(&mesh, count).is_some());
        assert_eq!(cells_of_rects(&mesh, count - 1), None);
    }
}
