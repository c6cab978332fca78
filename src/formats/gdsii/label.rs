//! Labels: the texts of wanted layers, each a word at a point.
//!
//! Of a TEXT only its first point, its string and its layer and texttype count: how large, how turned
//! and how justified it is shown changes nothing of what it marks.

use super::element::Element;
use super::records::{Fault, shown};
use super::transform::{Transform, Vector};
use crate::geometry::{Point, Rect};
use crate::layout::LayerId;

/// A text of the layout, in the coordinates of the top cell.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Label {
    /// Its layer and texttype.
    pub layer: LayerId,
    /// What it says; bytes that are not UTF-8 are replaced.
    pub text: String,
    /// Where it is.
    pub at: Point,
}

/// A text in a cell, in the cell's coordinates.
#[derive(Clone, Copy, Debug)]
pub(super) struct RawLabel<'a> {
    layer: LayerId,
    text: &'a [u8],
    at: Point,
}

impl<'a> RawLabel<'a> {
    /// The label that a TEXT is.
    pub(super) fn read(element: &Element<'a>) -> Result<RawLabel<'a>, Fault> {
        let [at] = element.exactly::<1>("1")?;
        let on_grid = Vector::from(at).on_grid();
        Ok(RawLabel {
            layer: element.layer()?,
            text: element.string()?,
            at: on_grid.map_err(|problem| element.wrong(problem))?,
        })
    }

    /// How much memory it takes, flattened, in points of eight bytes.
    pub(super) fn size(&self) -> u64 {
        5 + self.text.len() as u64 / 8
    }

    pub(super) fn bounds(&self) -> Rect {
        Rect {
            min: self.at,
            max: self.at,
        }
    }

    /// The label where a placement of its cell puts it.
    pub(super) fn placed(&self, transform: &Transform) -> Label {
        Label {
            layer: self.layer,
            text: shown(self.text),
            at: transform.apply(self.at.into()).point(),
        }
    }
}
