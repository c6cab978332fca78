//! The straight runs of a feature.
//!
//! A horizontal run is a longest stretch of x over which the cross-section of the feature, an interval
//! [low, high] of y with outline at both ends, does not change, and which is longer than wide: a slab cell
//! of the feature. Vertical runs are the same in the mirror image at the line x = y. Runs of different
//! direction have no inner point in common: the cross-section of the one would have to be longer than the
//! other, and the other way round.
//!
//! A run ends at a line end, where the outline closes it, or at a junction, where other parts of the
//! feature touch its end, be it at one point.

use crate::geometry::Rect;
use crate::geometry::slabs::cells_of_rects;

/// The direction of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Direction {
    /// Along x.
    Horizontal,
    /// Along y.
    Vertical,
}

impl Direction {
    /// Turns what is given in coordinates along and across a run into coordinates of the layout, or back.
    pub fn turn(self, rect: Rect) -> Rect {
        match self {
            Direction::Horizontal => rect,
            Direction::Vertical => rect.transposed(),
        }
    }
}

/// What is at an end of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum End {
    /// The feature ends.
    Line,
    /// The feature goes on: a corner or a junction.
    Junction,
}

/// A straight run of a feature. "Along" is x for horizontal runs and y for vertical ones.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Run {
    /// Its direction.
    pub direction: Direction,
    /// Where it starts, along.
    pub from: i32,
    /// Where it ends, along.
    pub to: i32,
    /// The lower end of its cross-section, across.
    pub low: i32,
    /// The upper end of its cross-section, across.
    pub high: i32,
    /// What is at `from` and at `to`.
    pub ends: [End; 2],
}

impl Run {
    /// The run as a rectangle, x along and y across.
    pub fn along(&self) -> Rect {
        Rect::new(self.from, self.low, self.to, self.high)
    }

    /// The cross-section at `place` as a line of the layout.
    pub fn line(&self, place: i32) -> Rect {
        (self.direction).turn(Rect::new(place, self.low, place, self.high))
    }
}

/// The runs of a feature, whose slab cells are `cells`: the horizontal ones first. None when its mirror image
/// has more than `limit` cells.
pub fn runs(cells: &[Rect], limit: usize) -> Option<Vec<Run>> {
    let mirrored: Vec<Rect> = cells.iter().map(Rect::transposed).collect();
    let mut found = runs_along(cells, Direction::Horizontal);
    let mirrored = cells_of_rects(&mirrored, limit)?;
    found.extend(runs_along(&mirrored, Direction::Vertical));
    Some(found)
}

fn runs_along(cells: &[Rect], direction: Direction) -> Vec<Run> {
    let starts = Side::new(cells, |cell| cell.min.x);
    let ends = Side::new(cells, |cell| cell.max.x);
    let long = cells.iter().filter(|cell| cell.width() > cell.height());
    let end = |side: &Side, x: i32, cell: &Rect| {
        if side.touches(x, cell.min.y, cell.max.y) {
            End::Junction
        } else {
            End::Line
        }
    };
    long.map(|cell| Run {
        direction,
        from: cell.min.x,
        to: cell.max.x,
        low: cell.min.y,
        high: cell.max.y,
        ends: [end(&ends, cell.min.x, cell), end(&starts, cell.max.x, cell)],
    })
    .collect()
}

/// The left or right sides of cells, sorted; those of one abscissa share no point with each other.
struct Side(Vec<(i32, i32, i32)>);

impl Side {
    fn new(cells: &[Rect], x: impl Fn(&Rect) -> i32) -> Side {
        let mut sides: Vec<_> = (cells.iter())
            .map(|cell| (x(cell), cell.max.y, cell.min.y))
            .collect();
        sides.sort_unstable();
        Side(sides)
    }

    /// Whether a side at `x` shares a point with [low, high].
    fn touches(&self, x: i32, low: i32, high: i32) -> bool {
        let first = self.0.partition_point(|&(at, top, _)| (at, top) < (x, low));
        matches!(self.0.get(first), Some(&(at, _, bottom)) if at == x && bottom <= high)
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    fn found(rects: &[Rect]) -> Vec<(Direction, [i32; 4], [End; 2])> {
        runs(&cells_of_rects(rects, 99).unwrap(), 99)
            .unwrap()
            .into_iter()
            .map(|r| (r.direction, [r.from, r.to, r.low, r.high], r.ends))
            .collect()
    }

    use Direction::{Horizontal, Vertical};
    use End::{Junction, Line};

    #[test]
    fn a_wire_is_one_run_and_a_square_is_none() {
        assert_eq!(
            found(&[Rect::new(0, 0, 50, 10)]),
            [(Horizontal, [0, 50, 0, 10], [Line, Line])]
        );
        assert_eq!(
            found(&[Rect::new(0, 0, 10, 50)]),
            [(Vertical, [0, 50, 0, 10], [Line, Line])]
        );
        assert_eq!(found(&[Rect::new(0, 0, 10, 10)]), []);
    }

    #[test]
    fn an_l_has_two_runs_that_end_at_its_corner() {
        let l = [Rect::new(0, 0, 50, 10), Rect::new(0, 0, 10, 40)];
        assert_eq!(
            found(&l),
            [
                (Horizontal, [10, 50, 0, 10], [Junction, Line]),
                (Vertical, [10, 40, 0, 10], [Junction, Line]),
            ]
        );
    }

    #[test]
    fn a_t_has_a_bar_in_two_and_a_stem() {
        let t = [Rect::new(0, 30, 70, 40), Rect::new(30, 0, 40, 40)];
        assert_eq!(
            found(&t),
            [
                (Horizontal, [0, 30, 30, 40], [Line, Junction]),
                (Horizontal, [40, 70, 30, 40], [Junction, Line]),
                (Vertical, [0, 30, 30, 40], [Line, Junction]),
            ]
        );
    }

    #[test]
    fn a_ring_has_four_runs_between_its_corners() {
        let ring = [
            Rect::new(0, 0, 60, 10),
            Rect::new(0, 50, 60, 60),
            Rect::new(0, 0, 10, 60),
            Rect::new(50, 0, 60, 60),
        ];
        let all = [Junction, Junction];
        assert_eq!(
            found(&ring),
            [
                (Horizontal, [10, 50, 0, 10], all),
                (Horizontal, [10, 50, 50, 60], all),
                (Vertical, [10, 50, 0, 10], all),
                (Vertical, [10, 50, 50, 60], all),
            ]
        );
    }

    #[test]
    fn a_corner_that_touches_the_end_of_a_run_is_a_junction() {
        let two = [Rect::new(0, 0, 50, 10), Rect::new(50, 10, 60, 20)];
        assert_eq!(
            found(&two),
            [(Horizontal, [0, 50, 0, 10], [Line, Junction])]
        );
    }
}
