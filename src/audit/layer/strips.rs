//! A region along the axes as strips of constant cross-section.
//!
//! A line moves over the region from left to right. Along it, the places where the winding number changes are kept with the
//! change; the longest intervals where it is not 0 are the cross-sections. A strip is a cross-section over the longest
//! stretch of x on which it stays the same. Where upright edges of the region lie under the line, the
//! intervals that they touch are ended, and what is there now is counted up from below, where nothing is.
//!
//! Time: n log n, and for each edge the changes along the cross-section that it touches. Where many rectangles lie on each other
//! these are many: then the strips of either half of them are found first, of which no more than two lie on each other.

use crate::audit::{Rejection, Step};
use crate::geometry::{Point, Rect};
use std::collections::BTreeMap;

/// The most strips that one shape or feature may have: half a gigabyte.
pub(super) const MOST: usize = 1 << 25;

/// Says that a feature of these rectangles has too many.
pub(super) fn too_many(rects: &[Rect]) -> Rejection {
    let Point { x, y } = rects.iter().map(|rect| rect.min).min().unwrap_or_default();
    let reason =
        format!("the feature that begins at ({x}, {y}) has more than {MOST} cross-sections");
    Rejection::new(Step::Stitches, reason)
}

/// An upright edge: its abscissa, lower and upper end, and how much larger the winding number is to its right.
type Edge = (i32, i32, i32, i32);

/// The most changes that are gone through for each edge and strip before rectangles are taken in halves.
const DEEP: usize = 64;

/// Why there are no strips.
enum Trouble {
    TooMany,
    Deep,
}

/// The strips of a union of rectangles; none where they are more than [`MOST`].
pub(super) fn of_rects(rects: &[Rect]) -> Option<Vec<Rect>> {
    if rects.len() < 2 {
        return Some(rects.to_vec());
    }
    match strips(sides(rects), DEEP) {
        Ok(found) => Some(found),
        Err(Trouble::TooMany) => None,
        Err(Trouble::Deep) => {
            let (some, others) = rects.split_at(rects.len() / 2);
            let both = [of_rects(some)?, of_rects(others)?].concat();
            strips(sides(&both), usize::MAX).ok()
        }
    }
}

fn sides(rects: &[Rect]) -> Vec<Edge> {
    let both =
        |r: &Rect| [(r.min.x, 1), (r.max.x, -1)].map(|(x, turn)| (x, r.min.y, r.max.y, turn));
    rects.iter().flat_map(both).collect()
}

/// The strips of what an outline along the axes runs around; none where they are more than [`MOST`].
pub(super) fn of_outline(outline: &[Point]) -> Option<Vec<Rect>> {
    let next = outline.iter().cycle().skip(1);
    let edges = outline.iter().zip(next).filter(|(a, b)| a.y != b.y);
    let edge = |(a, b): (&Point, &Point)| match a.y > b.y {
        true => (a.x, b.y, a.y, 1),
        false => (a.x, a.y, b.y, -1),
    };
    strips(edges.map(edge).collect(), usize::MAX).ok()
}

fn strips(mut edges: Vec<Edge>, deep: usize) -> Result<Vec<Rect>, Trouble> {
    edges.sort_unstable();
    let mut line = Line::default();
    for here in edges.chunk_by(|one, other| one.0 == other.0) {
        line.cross(here);
        let found = line.done.len() + line.now.len();
        if found > MOST {
            return Err(Trouble::TooMany);
        }
        if line.steps / deep > edges.len() + found {
            return Err(Trouble::Deep);
        }
    }
    Ok(line.done)
}

#[derive(Default)]
struct Line {
    /// By how much the winding number changes at an ordinate, upwards.
    changes: BTreeMap<i32, i32>,
    /// The cross-sections: from the key to the first value, since the abscissa that is the second.
    now: BTreeMap<i32, (i32, i32)>,
    done: Vec<Rect>,
    /// How many changes were gone through.
    steps: usize,
}

impl Line {
    /// Moves over the edges of one abscissa.
    fn cross(&mut self, edges: &[Edge]) {
        let (mut ended, mut windows) = (BTreeMap::new(), Vec::new());
        for &(_, low, high, turn) in edges {
            for (y, by) in [(low, turn), (high, -turn)] {
                let change = self.changes.entry(y).or_default();
                *change += by;
                if *change == 0 {
                    self.changes.remove(&y);
                }
            }
            let mut window = [low, high];
            while let Some((&y0, &(y1, since))) = self
                .now
                .range(..=high)
                .next_back()
                .filter(|(_, end)| end.0 >= low)
            {
                self.now.remove(&y0);
                ended.insert([y0, y1], since);
                window = [window[0].min(y0), window[1].max(y1)];
            }
            windows.push(window);
        }
        windows.sort_unstable();
        let mut joined: Vec<[i32; 2]> = Vec::new();
        for window in windows {
            match joined.last_mut() {
                Some(last) if window[0] <= last[1] => last[1] = last[1].max(window[1]),
                _ => joined.push(window),
            }
        }
        let x = edges.first().map_or(0, |edge| edge.0);
        for window in joined {
            self.renew(x, window, &mut ended);
        }
        let strip = |([y0, y1], since): ([i32; 2], i32)| Rect::new(since, y0, x, y1);
        self.done.extend(ended.into_iter().map(strip));
    }

    /// Finds the cross-sections between two ordinates; those that were there before go on.
    fn renew(&mut self, x: i32, [low, high]: [i32; 2], ended: &mut BTreeMap<[i32; 2], i32>) {
        let (mut winding, mut start) = (0, low);
        for (&y, change) in self.changes.range(low..=high) {
            let before = winding;
            self.steps += 1;
            winding += change;
            if before == 0 {
                start = y;
            } else if winding == 0 {
                let since = ended.remove(&[start, y]).unwrap_or(x);
                self.now.insert(start, (y, since));
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};

    /// Piles, whose halves are taken first, against their rectangles, unit cell by unit cell.
    #[test]
    fn piles_are_their_rectangles() {
        let mut rng = rand_pcg::Pcg64Mcg::seed_from_u64(33);
        for _ in 0..10 {
            let mut side = |low, high| rng.random_range(low * 1000..high * 1000);
            let rects: Vec<Rect> = (0..1_500)
                .map(|_| Rect::new(side(0, 90), side(0, 150), side(110, 200), side(151, 300)))
                .collect();
            assert!(matches!(strips(sides(&rects), DEEP), Err(Trouble::Deep)));
            let found = of_rects(&rects).unwrap_or_default();
            let inside = |x: i32, y: i32, rects: &[Rect]| {
                rects
                    .iter()
                    .filter(|r| r.covers(&Rect::new(x, y, x + 1, y + 1)))
                    .count()
            };
            for x in (0..200_000).step_by(7_919) {
                for y in (0..300_000).step_by(1_201) {
                    let expected = inside(x, y, &rects).min(1);
                    assert_eq!(inside(x, y, &found), expected, "({x}, {y})");
                }
            }
            // Cross-sections of this pile are one interval each: strips are as long as they can be.
            for two in found.windows(2) {
                assert_eq!(two[0].max.x, two[1].min.x);
                assert_ne!([two[0].min.y, two[0].max.y], [two[1].min.y, two[1].max.y]);
            }
        }
    }
}
