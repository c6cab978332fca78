//! The areas of features, in square database units.
//!
//! What is drawn twice counts once. Along the axes this is exact: the cells of the union add up. A feature
//! that is one slanted outline has half its shoelace sum, rounded down.

use super::connect::Connected;
use super::parts::{Part, Parts};
use crate::geometry::Rect;
use crate::geometry::outline::doubled_area;
use crate::geometry::slabs::cells_of_rects;
use rayon::prelude::*;

/// The area of each feature.
pub(super) fn of_features(parts: &Parts, connected: &Connected) -> Vec<u64> {
    (0..connected.features.len() as u32)
        .into_par_iter()
        .with_min_len(256)
        .map(|feature| of_feature(parts, connected.parts_of(feature)))
        .collect()
}

fn of_feature(parts: &Parts, members: &[u32]) -> u64 {
    let mut rects = Vec::new();
    let mut slanted = 0;
    for &part in members {
        match parts.get(part) {
            Part::Rect(rect) => rects.push(rect),
            Part::Slanted(outline) => slanted += doubled_area(outline).unsigned_abs() / 2,
        }
    }
    let straight: u64 = cells_of_rects(&rects).iter().map(Rect::area).sum();
    straight + u64::try_from(slanted).unwrap_or(u64::MAX)
}
