//! Flattening: every placement of every cell, drawn in the coordinates of the top cell.
//!
//! The walk keeps its path in a list, not on the call stack. What it draws has been counted, and found
//! to be on the grid, by the hierarchy.

use super::canvas::Canvas;
use super::hierarchy::{Hierarchy, Placement};
use super::label::Label;
use super::library::{CellId, Library};
use super::records::Fault;
use super::transform::{Transform, Vector};
use crate::geometry::{Point, Rect};
use crate::layout::{Shape, Shapes};

/// What is below the top, in the order of the file: what is a cell's own, then its placements.
#[derive(Debug, Default)]
pub(super) struct Flattened {
    /// The shapes of each layer that is drawn.
    pub sheets: Vec<Shapes>,
    pub labels: Vec<Label>,
}

/// Draws everything below the top.
pub(super) fn flatten(
    library: &mut Library<'_>,
    hierarchy: &Hierarchy,
) -> Result<Flattened, Fault> {
    let top = &library.cells[hierarchy.top as usize];
    let content = &hierarchy.contents[hierarchy.top as usize];
    let alone = top.shapes == (0..library.canvas.len() as u32);
    let plain = library.wanted.drawn.len() == 1 && library.labels.is_empty();
    if alone && plain && content.children.is_empty() && top.absolute.is_empty() {
        return Ok(Flattened {
            sheets: vec![std::mem::take(&mut library.canvas).into_shapes()],
            labels: Vec::new(),
        });
    }
    let mut flat = Flat {
        library,
        out: Flattened {
            sheets: vec![Shapes::default(); library.wanted.drawn.len()],
            labels: Vec::new(),
        },
        working: Vec::new(),
    };
    flat.draw_cell(hierarchy.top, &Transform::IDENTITY)?;
    let mut path = vec![Frame::new(Transform::IDENTITY, &content.children)];
    while let Some(frame) = path.last_mut() {
        let Some((cell, transform)) = frame.next() else {
            path.pop();
            continue;
        };
        flat.draw_cell(cell, &transform)?;
        let children = &hierarchy.contents[cell as usize].children;
        if !children.is_empty() {
            path.push(Frame::new(transform, children));
        }
    }
    Ok(flat.out)
}

/// A cell under way: the next placement to draw, and its column and row.
struct Frame<'h> {
    transform: Transform,
    placements: &'h [Placement],
    next: usize,
    column: u16,
    row: u16,
}

impl<'h> Frame<'h> {
    fn new(transform: Transform, placements: &'h [Placement]) -> Frame<'h> {
        Frame {
            transform,
            placements,
            next: 0,
            column: 0,
            row: 0,
        }
    }
}

impl Iterator for Frame<'_> {
    type Item = (CellId, Transform);

    fn next(&mut self) -> Option<(CellId, Transform)> {
        let placement = self.placements.get(self.next)?;
        let inner = placement.transform(self.column, self.row);
        self.column += 1;
        if self.column == placement.columns {
            (self.column, self.row) = (0, self.row + 1);
        }
        if self.row == placement.rows {
            (self.row, self.next) = (0, self.next + 1);
        }
        Some((placement.cell, self.transform.after(&inner)))
    }
}

struct Flat<'l, 'a> {
    library: &'l Library<'a>,
    out: Flattened,
    working: Vec<Point>,
}

impl Flat<'_, '_> {
    fn draw_cell(&mut self, id: CellId, transform: &Transform) -> Result<(), Fault> {
        let cell = &self.library.cells[id as usize];
        let shapes = self.library.canvas.shapes();
        for shape in cell.shapes.clone() {
            let out = &mut self.out.sheets[self.library.sheet_of(shape)];
            match shapes.get(shape) {
                Shape::Rect(rect) => {
                    let [min, max] = transform.corners(rect).map(Vector::point);
                    out.push_rect(Rect { min, max });
                }
                Shape::Polygon(vertices) => {
                    let placed = vertices.iter().map(|&v| transform.apply(v.into()).point());
                    self.working.clear();
                    self.working.extend(placed);
                    out.push_polygon(&self.working);
                }
            }
        }
        for path in &cell.absolute {
            let mut aside = Canvas::default();
            let drawn = path.draw(transform, &mut aside);
            drawn.map_err(|fault| fault.in_cell(cell.name))?;
            let out = &mut self.out.sheets[usize::from(path.sheet)];
            for shape in aside.into_shapes().iter() {
                match shape {
                    Shape::Rect(rect) => out.push_rect(rect),
                    Shape::Polygon(vertices) => out.push_polygon(vertices),
                }
            }
        }
        let labels = cell.labels.start as usize..cell.labels.end as usize;
        let placed = self.library.labels[labels].iter();
        self.out
            .labels
            .extend(placed.map(|label| label.placed(transform)));
        Ok(())
    }
}
