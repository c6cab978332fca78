//! Which feature lies at a point: at most one, since features do not touch.

use super::super::neighbours::Neighbourhood;
use super::super::parts::Part;
use crate::geometry::rtree::Visitor;
use crate::geometry::winding::encloses;
use crate::geometry::{Point, Rect};

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
