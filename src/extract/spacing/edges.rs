//! The straight edges of a feature along one axis, from its slab cells.
//!
//! A slab cell is a longest interval of the cross-section, so its lower and its upper side are outline over
//! their whole length, and its height is how deep the feature is behind them, straight inwards. Sides of cells
//! next to each other on one line, with the inside on the same side, are one edge. An edge ends where the outline
//! turns: at a convex corner where nothing else of the feature has the point, so that the feature takes one of the four
//! quarters around it. Where it takes two opposite ones, touching itself, neither corner is convex. Edges along the
//! other axis are those of the mirror image at the line x = y.

use crate::geometry::Rect;

/// A straight edge. It runs along x; "up" is towards larger y.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Edge {
    /// Where it is, across.
    pub at: i32,
    /// Where it starts, along.
    pub from: i32,
    /// Where it ends, along.
    pub to: i32,
    /// Whether its outward normal points up.
    pub is_up: bool,
    /// Whether the corners at `from` and `to` are convex.
    pub is_convex: [bool; 2],
}

/// A stretch of an edge behind which the feature is equally deep, up to the next one.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Depth {
    /// Where it starts.
    pub from: i32,
    /// The depth, straight inwards.
    pub depth: i64,
}

/// The edges of a feature along x.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Edges {
    /// Those that face down first, then by `at` and `from`.
    pub edges: Vec<Edge>,
    /// For each edge, where its depths start in `depths`.
    pub first_depth: Vec<u32>,
    /// The depths behind all edges, edge by edge.
    pub depths: Vec<Depth>,
}

/// The edges along x of the feature whose slab cells are `cells`, sorted by their lower left corners.
pub fn edges_along(cells: &[Rect]) -> Edges {
    let mut sides: Vec<Side> = cells.iter().flat_map(sides_of).collect();
    sides.sort_unstable_by_key(|side| (side.is_up, side.at, side.from));
    let lefts = Ends::new(cells, |cell| cell.min.x);
    let rights = Ends::new(cells, |cell| cell.max.x);
    let mut found = Edges::default();
    let goes_on = |a: &Side, b: &Side| (a.is_up, a.at, a.to) == (b.is_up, b.at, b.from);
    for chain in sides.chunk_by(goes_on) {
        let [first, .., last] = [chain[0], chain[chain.len() - 1]];
        let Side {
            is_up, at, from, ..
        } = first;
        let goes_on = [rights.have(from, at), lefts.have(last.to, at)];
        found.edges.push(Edge {
            at,
            from,
            to: last.to,
            is_up,
            is_convex: goes_on.map(|goes_on| !goes_on),
        });
        found.first_depth.push(found.depths.len() as u32);
        found.depths.extend(chain.iter().map(|side| Depth {
            from: side.from,
            depth: side.depth,
        }));
    }
    found
}

/// The lower or the upper side of a cell.
#[derive(Clone, Copy)]
struct Side {
    is_up: bool,
    at: i32,
    from: i32,
    to: i32,
    depth: i64,
}

fn sides_of(cell: &Rect) -> [Side; 2] {
    [(false, cell.min.y), (true, cell.max.y)].map(|(is_up, at)| Side {
        is_up,
        at,
        from: cell.min.x,
        to: cell.max.x,
        depth: cell.height(),
    })
}

/// The left or the right sides of cells, sorted; those of one abscissa share no point with each other.
struct Ends(Vec<(i32, i32, i32)>);

impl Ends {
    fn new(cells: &[Rect], x: impl Fn(&Rect) -> i32) -> Ends {
        let ends = cells.iter().map(|cell| (x(cell), cell.max.y, cell.min.y));
        let mut ends: Vec<_> = ends.collect();
        ends.sort_unstable();
        Ends(ends)
    }

    /// Whether one of them has the point (x, y).
    fn have(&self, x: i32, y: i32) -> bool {
        let first = self.0.partition_point(|&(at, top, _)| (at, top) < (x, y));
        matches!(self.0.get(first), Some(&(at, _, bottom)) if at == x && bottom <= y)
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::geometry::slabs::cells_of_rects;

    type Plain = (bool, [i32; 3], [bool; 2]);

    fn found(rects: &[Rect]) -> (Vec<Plain>, Edges) {
        let edges = edges_along(&cells_of_rects(rects, 99).unwrap());
        let plain = edges.edges.iter();
        let plain = plain.map(|e| (e.is_up, [e.at, e.from, e.to], e.is_convex));
        (plain.collect(), edges)
    }

    #[test]
    fn an_l_has_one_concave_corner() {
        let l = [Rect::new(0, 0, 50, 10), Rect::new(0, 0, 10, 40)];
        let (plain, edges) = found(&l);
        assert_eq!(
            plain,
            [
                (false, [0, 0, 50], [true, true]),
                (true, [10, 10, 50], [false, true]),
                (true, [40, 0, 10], [true, true]),
            ]
        );
        // Behind the lower edge it is 40 deep up to 10, then 10.
        let depths: Vec<(i32, i64)> = edges.depths.iter().map(|d| (d.from, d.depth)).collect();
        assert_eq!(depths, [(0, 40), (10, 10), (10, 10), (0, 40)]);
        assert_eq!(edges.first_depth, [0, 2, 3]);
    }

    #[test]
    fn the_bar_of_a_t_is_one_edge_above_and_two_below() {
        let t = [Rect::new(0, 30, 70, 40), Rect::new(30, 0, 40, 40)];
        assert_eq!(
            found(&t).0,
            [
                (false, [0, 30, 40], [true, true]),
                (false, [30, 0, 30], [true, false]),
                (false, [30, 40, 70], [false, true]),
                (true, [40, 0, 70], [true, true]),
            ]
        );
    }

    #[test]
    fn corners_that_touch_are_not_convex() {
        let two = [Rect::new(0, 0, 5, 5), Rect::new(5, 5, 9, 9)];
        assert_eq!(
            found(&two).0,
            [
                (false, [0, 0, 5], [true, true]),
                (false, [5, 5, 9], [false, true]),
                (true, [5, 0, 5], [true, false]),
                (true, [9, 5, 9], [true, true]),
            ]
        );
    }
}
