//! Corners that are turned to each other too closely: 3 of the relation in [`super`].
//!
//! An upper right corner asks the tree of the lower left ones for what lies above and to the right of it; upper left
//! and lower right ones do the same in a mirror image. No two of them are at one place: there a feature
//! would touch another one, or itself.

use super::Relation;
use super::faces::{Each, Quarter};
use crate::geometry::{Point, Rect};
use crate::layout::Metric;

/// The owner of a corner, and those of the corners that it is too close to.
pub(super) fn of_corner(quarter: &Quarter, relation: &Relation, seeker: usize) -> (u32, Vec<u32>) {
    let (at, owner) = quarter.seekers[seeker];
    let mut found = Vec::new();
    let mut each = Each(|item| {
        let (other, its) = quarter.targets[item as usize];
        if are_close(at, other, relation) {
            found.push(its);
        }
    });
    let area = Rect {
        min: at,
        max: beyond(at, [true, true], relation.corner),
    };
    quarter.tree.query(&area, &mut each);
    (owner, found)
}

/// The farthest place that a corner is turned to, along each axis less than the spacing of corners away.
pub(super) fn beyond(at: Point, towards_larger: [bool; 2], spacing: i32) -> Point {
    let go = |from: i32, is_up: bool| match is_up {
        true => from.saturating_add(spacing - 1),
        false => from.saturating_sub(spacing - 1),
    };
    Point::new(go(at.x, towards_larger[0]), go(at.y, towards_larger[1]))
}

/// Whether two corners that are turned to each other are too close.
pub(super) fn are_close(a: Point, b: Point, relation: &Relation) -> bool {
    let along = |a: i32, b: i32| (i64::from(a) - i64::from(b)).abs();
    let (dx, dy) = (along(a.x, b.x), along(a.y, b.y));
    let spacing = i64::from(relation.corner);
    match relation.metric {
        // Neither is as much as the spacing, so the squares fit.
        Metric::Euclidean => dx.max(dy) < spacing && dx * dx + dy * dy < spacing * spacing,
        Metric::Square => dx.max(dy) < spacing,
    }
}
