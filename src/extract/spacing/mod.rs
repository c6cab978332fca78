//! When two regions are close: the spacings of a layer, resolved.
//!
//! | module | what it does |
//! |---|---|
//! | [`edges`] | the straight edges of one feature, with their ends and the depth behind them |
//! | [`wide`] | over how long a stretch a feature is wide behind an edge |
//! | [`outlines`] | the edges and corners of all features |
//! | [`faces`] | the same by who owns which part of them, in trees |
//! | [`facing`] | edges that face each other too closely |
//! | [`corners`] | corners that are turned to each other too closely |
//! | [`cast`] | the shadows that edges and corners cast on a run |
//!
//! With s the plain spacing, and m the smallest of the spacings between sides, side and end, ends, and
//! corners (each s where it is not given), regions A of a feature f and B of a feature g are close when
//!
//! 1. their distance is less than m; or
//! 2. an edge of f and an edge of g along the same axis face each other, their parts in A and in B have a
//!    stretch of the projection in common, and the gap is less than the spacing of their kinds; or
//! 3. a convex corner of f in A and one of g in B are turned to each other, and less than the spacing of
//!    corners apart; or
//! 4. edges face each other as in 2, one of the features is wide behind its edge over a run length in front
//!    of the other edge, the gap is less than the spacing of such features, and a stretch that both the parts
//!    in A and in B take, face to face, belongs to that length.
//!
//! An edge goes on as long as it goes straight. An edge shorter than the end length between two convex corners is a
//! line end, every other one a side. A corner is convex where the feature takes one of the four quarters around it; where it takes
//! two opposite ones, touching itself at a point, it has no convex corner there. Nothing blocks the view, not even the feature itself.
//!
//! f and g may be one feature: then its own edges face each other over its notches and, since nothing blocks
//! the view, its own bars. They are never at gap 0 over a stretch: such a line would be inside.
//!
//! Features with a slanted shape keep the plain spacing to everything: for them, closer than s is close.
//!
//! Where no kind of spacing is larger than m, 2 to 4 follow from 1, and no outline is looked at. With one
//! spacing for everything that is the case.

pub(super) mod cast;
pub(super) mod corners;
pub(super) mod edges;
pub(super) mod faces;
pub(super) mod facing;
pub(super) mod outlines;
#[cfg(test)]
mod tests;
pub(super) mod wide;

pub(super) use faces::Faces;
pub(super) use outlines::Outlines;

use crate::layout::{Metric, Rules, WideSpacing};

/// The spacings of a layer; all in database units.
pub(super) struct Relation {
    /// How distances are taken.
    pub(super) metric: Metric,
    /// The plain spacing s, that of features with slanted shapes.
    pub(super) plain: i32,
    /// The smallest spacing m: closer than this is close, whatever the outlines are.
    pub(super) least: i32,
    /// An edge shorter than this between convex corners is a line end.
    pub(super) end_length: i32,
    /// Between two sides, a side and an end, two ends.
    kinds: [i32; 3],
    /// Between corners.
    pub(super) corner: i32,
    /// Those of wide features that are larger than m.
    pub(super) wide: Vec<WideSpacing>,
}

impl Relation {
    /// Resolves the spacings of `rules`.
    pub(super) fn new(rules: &Rules) -> Relation {
        let (plain, spacings) = (rules.spacing, &rules.spacings);
        let kinds = [
            spacings.side_to_side,
            spacings.side_to_end,
            spacings.end_to_end,
        ];
        let kinds = kinds.map(|kind| kind.unwrap_or(plain));
        let corner = spacings.corner_to_corner.unwrap_or(plain);
        let least = kinds.into_iter().fold(corner, i32::min);
        let larger = |row: &&WideSpacing| row.spacing > least;
        Relation {
            metric: spacings.metric,
            plain,
            least,
            end_length: spacings.end_length,
            kinds,
            corner,
            wide: spacings.wide.iter().filter(larger).copied().collect(),
        }
    }

    /// One distance for everything, at least 1.
    pub(super) fn uniform(metric: Metric, distance: i32) -> Relation {
        Relation {
            metric,
            plain: distance,
            least: distance,
            end_length: 0,
            kinds: [distance; 3],
            corner: distance,
            wide: Vec::new(),
        }
    }

    /// Whether the distance of two regions does not say it all.
    pub(super) fn needs_outlines(&self) -> bool {
        self.facing_reach().max(self.corner) > self.least
    }

    /// The spacing of two edges by whether they are line ends.
    pub(super) fn of_kinds(&self, are_ends: [bool; 2]) -> i32 {
        self.kinds[usize::from(are_ends[0]) + usize::from(are_ends[1])]
    }

    /// The largest spacing of two edges: those that are as far from each other are never too close.
    pub(super) fn facing_reach(&self) -> i32 {
        let wide = self.wide.iter().map(|row| row.spacing);
        wide.chain(self.kinds).fold(0, i32::max)
    }
}
