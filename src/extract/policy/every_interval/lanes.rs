//! Lanes: runs that may take stitches, each in the direction in which its stitches are pushed.
//!
//! A stitch is pushed towards smaller places of its lane. Whether that is left or right (down or up) is
//! chosen once for a cluster of features whose stitches can meet, so that as few runs at right angles as
//! possible can trade places (see `right_angles`). A lane that is pushed the other way is the mirror image: its
//! place t is the place -t of the run.

use super::super::super::runs::{Direction, Run};
use super::super::Legal;
use crate::geometry::Rect;

/// A run of a feature, seen in the direction of its pushes.
#[derive(Clone, Debug)]
pub(super) struct Lane {
    /// The feature.
    pub(super) feature: u32,
    /// The run, in coordinates of the layout.
    pub(super) run: Run,
    /// Whether stitches are pushed towards larger coordinates.
    pub(super) mirrored: bool,
    /// The legal places, in lane coordinates.
    pub(super) legal: Legal,
}

impl Lane {
    /// The lane pushed the other way.
    pub(super) fn turned_round(&self) -> Lane {
        Lane {
            mirrored: !self.mirrored,
            legal: self.legal.mirrored(),
            ..self.clone()
        }
    }

    /// What is given in coordinates of the layout, in coordinates along and across the lane.
    pub(super) fn turn(&self, rect: &Rect) -> Rect {
        mirror(self.run.direction.turn(*rect), self.mirrored)
    }

    /// The run in lane coordinates.
    pub(super) fn along(&self) -> Rect {
        mirror(self.run.along(), self.mirrored)
    }

    /// The run in coordinates of the layout.
    pub(super) fn area(&self) -> Rect {
        self.run.direction.turn(self.run.along())
    }

    /// What both sides of a stitch at `place` cover, in coordinates of the layout.
    pub(super) fn overlap(&self, place: i32, half: i32) -> Rect {
        let at = self.place_on_run(place);
        let Run { low, high, .. } = self.run;
        let rect = Rect::new(at.saturating_sub(half), low, at.saturating_add(half), high);
        self.run.direction.turn(rect)
    }

    /// The place of the run that is `place` of the lane, or the other way round.
    pub(super) fn place_on_run(&self, place: i32) -> i32 {
        if self.mirrored { -place } else { place }
    }

    /// Whether it is horizontal.
    pub(super) fn is_horizontal(&self) -> bool {
        self.run.direction == Direction::Horizontal
    }
}

fn mirror(rect: Rect, mirrored: bool) -> Rect {
    if mirrored {
        Rect::new(-rect.max.x, rect.min.y, -rect.min.x, rect.max.y)
    } else {
        rect
    }
}
