//! The areas of features and fragments, in square database units.
//!
//! What is drawn twice counts once. Along the axes this is exact: the union is measured by a sweep. A slanted
//! outline has half its shoelace sum, rounded down; where slanted outlines overlap each other, themselves or
//! rectangles of their feature, the overlap counts as often as it is drawn. Areas only balance the masks.

use super::owners::Owners;
use super::parts::{Part, Parts};
use crate::geometry::Rect;
use crate::geometry::measure::area_of_union;
use crate::geometry::outline::doubled_area;
use crate::layout::Fragments;
use rayon::prelude::*;

/// The area of each fragment. `owners` are the features.
pub(super) fn of_fragments(parts: &Parts, owners: &Owners, fragments: &Fragments) -> Vec<u64> {
    if fragments.cuts().is_empty() {
        return (0..owners.len() as u32)
            .into_par_iter()
            .with_min_len(256)
            .map(|feature| of_feature(parts, owners.parts_of(feature)))
            .collect();
    }
    let mut areas = Vec::with_capacity(fragments.len());
    for feature in 0..owners.len() as u32 {
        for fragment in fragments.of_feature(feature) {
            areas.push(match fragments.cells_of(fragment) {
                [] => of_feature(parts, owners.parts_of(feature)),
                cells => cells.iter().map(Rect::area).sum(),
            });
        }
    }
    areas
}

fn of_feature(parts: &Parts, members: &[u32]) -> u64 {
    let mut rects = Vec::new();
    let mut slanted = 0;
    for &part in members {
        match parts.get(part) {
            Part::Rect(rect) => rects.push(rect),
            Part::Slanted(outline) => slanted += doubled_area(outline.points()).unsigned_abs() / 2,
        }
    }
    area_of_union(&rects).saturating_add(u64::try_from(slanted).unwrap_or(u64::MAX))
}
