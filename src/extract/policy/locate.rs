//! Which feature lies at a point: at most one, since features do not touch.

use super::super::neighbours::Neighbourhood;
use super::super::parts::Part;
use crate::geometry::rtree::Visitor;
use crate::geometry::winding::encloses;
use crate::geometry::{Point, Rect};
use crate::layout::{Layout, Rules};

/// The feature that a point lies in or on.
pub(super) fn feature_at(around: &Neighbourhood<'_>, point: Point) -> Option<u32> {
    let mut search = Search {
        around,
        point,
        found: None,
    };
    let at = Rect {
        min: point,
        max: point,
    };
    around.parts.tree().query(&at, &mut search);
    search.found
}

struct Search<'a> {
    around: &'a Neighbourhood<'a>,
    point: Point,
    found: Option<u32>,
}

impl Visitor for Search<'_> {
    fn enter(&mut self, _: usize) -> bool {
        self.found.is_none()
    }

    fn visit(&mut self, item: u32) {
        let inside = match self.around.parts.get(item) {
            Part::Rect(_) => true,
            Part::Slanted(outline) => encloses(outline.points(), self.point),
        };
        if inside {
            self.found = Some(self.around.owners.of(item));
        }
    }
}

/// The features whose masks were decided by hand, ascending. A point outside all features names none: whoever
/// reads the masks reports it.
pub(super) fn by_hand(layout: &Layout, rules: &Rules, around: &Neighbourhood<'_>) -> Vec<u32> {
    let hand = &rules.hand;
    let lists = hand.same.iter().chain(&hand.different).flatten().copied();
    let points = hand.fixed.iter().map(|&(point, _)| point).chain(lists);
    let mut found: Vec<u32> = points.filter_map(|p| feature_at(around, p)).collect();
    if !layout.fixed.is_empty() {
        let shapes = 0..around.parts.len() as u32;
        let fixed = |shape: u32| layout.fixed.binary_search_by_key(&shape, |f| f.0).is_ok();
        let parts = shapes.filter(|&part| fixed(around.parts.shape_of(part)));
        found.extend(parts.map(|part| around.owners.of(part)));
    }
    found.sort_unstable();
    found.dedup();
    found
}
