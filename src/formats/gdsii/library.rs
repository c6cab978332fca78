//! The index of a library: its cells, what they place, and the shapes and labels of the wanted layers in them.
//!
//! One walk through the file draws the wanted layers of every cell into one canvas, in the cell's own
//! coordinates, and notes references by their place in the file. Elements of other layers are held
//! against the grammar only.

use super::boundary;
use super::canvas::Canvas;
use super::element::Element;
use super::label::RawLabel;
use super::path::Path;
use super::problem::Problem;
use super::records::{Fault, kind, shown};
use super::transform::{Transform, Vector};
use super::walk::Visitor;
use crate::geometry::{Point, Rect};
use crate::layout::LayerId;
use rustc_hash::FxHashMap;
use std::ops::Range;

/// A cell's number.
pub(super) type CellId = u32;

/// A cell, in its own coordinates.
#[derive(Debug, Default)]
pub(super) struct Cell<'a> {
    pub name: &'a [u8],
    /// Where its BGNSTR is; `None` while it is only placed.
    pub defined: Option<usize>,
    /// Its own shapes on the canvas.
    pub shapes: Range<u32>,
    /// Its own labels in the library's list.
    pub labels: Range<u32>,
    /// The points of the shapes, with an estimate for `absolute`, and what labels count for.
    pub points: u64,
    /// The box of its own shapes, absolute paths and labels.
    pub bounds: Option<Rect>,
    /// What it places, in file order.
    pub references: Vec<Reference>,
    /// Its paths of absolute width, which each placement draws anew.
    pub absolute: Vec<AbsolutePath>,
}

/// A reference in the file.
#[derive(Clone, Copy, Debug)]
pub(super) struct Reference {
    /// Its SREF or AREF record.
    pub offset: usize,
    /// The cell placed.
    pub cell: CellId,
    /// How many times: columns by rows.
    pub count: u32,
}

/// A path of absolute width.
#[derive(Clone, Debug)]
pub(super) struct AbsolutePath {
    pub offset: usize,
    pub path: Path,
    /// The sheet that it is on.
    pub sheet: u16,
}

/// What is wanted of a library.
#[derive(Clone, Debug, Default)]
pub(super) struct Wanted {
    /// The layers whose shapes are drawn, all different; the shapes of one layer are a sheet.
    pub drawn: Vec<LayerId>,
    /// The layers whose texts are labels.
    pub labels: Vec<LayerId>,
}

/// All cells, in the order in which their names come up.
pub(super) struct Library<'a> {
    pub cells: Vec<Cell<'a>>,
    pub canvas: Canvas,
    pub labels: Vec<RawLabel<'a>>,
    pub wanted: Wanted,
    /// The sheet of each shape on the canvas; empty where there is but one.
    sheets: Vec<u16>,
    ids: FxHashMap<&'a [u8], CellId>,
    current: CellId,
    points_before: u64,
    working: Vec<Point>,
}

impl<'a> Library<'a> {
    pub(super) fn new(wanted: Wanted) -> Library<'a> {
        Library {
            cells: Vec::new(),
            canvas: Canvas::default(),
            labels: Vec::new(),
            wanted,
            sheets: Vec::new(),
            ids: FxHashMap::default(),
            current: 0,
            points_before: 0,
            working: Vec::new(),
        }
    }

    /// The number of a cell, new or known.
    fn id(&mut self, name: &'a [u8]) -> CellId {
        *self.ids.entry(name).or_insert_with(|| {
            self.cells.push(Cell {
                name,
                ..Cell::default()
            });
            self.cells.len() as CellId - 1
        })
    }

    /// The number of a cell that is defined.
    pub(super) fn find(&self, name: &[u8]) -> Option<CellId> {
        let id = self.ids.get(name).copied()?;
        self.cells[id as usize].defined.map(|_| id)
    }

    /// The same by a name as messages show it.
    pub(super) fn find_shown(&self, name: &str) -> Option<CellId> {
        self.find(name.as_bytes()).or_else(|| {
            let same = |cell: &Cell<'_>| cell.defined.is_some() && shown(cell.name) == name;
            self.cells.iter().position(same).map(|id| id as CellId)
        })
    }

    /// The sheet of a shape on the canvas.
    pub(super) fn sheet_of(&self, shape: u32) -> usize {
        self.sheets.get(shape as usize).copied().unwrap_or(0).into()
    }

    /// Draws an element where its layer is wanted.
    fn draw(&mut self, element: &Element<'a>) -> Result<(), Fault> {
        let layer = element.layer()?;
        let Some(sheet) = self.wanted.drawn.iter().position(|&drawn| drawn == layer) else {
            return Ok(());
        };
        let sheet = sheet as u16;
        if element.start.kind == kind::PATH {
            self.draw_path(element, sheet)?;
        } else {
            boundary::draw(element, &mut self.working, &mut self.canvas)?;
        }
        if self.wanted.drawn.len() > 1 {
            self.sheets.resize(self.canvas.len(), sheet);
        }
        Ok(())
    }

    /// Notes a text where its layer is one of labels.
    fn note_label(&mut self, element: &Element<'a>) -> Result<(), Fault> {
        if self.wanted.labels.is_empty() || !self.wanted.labels.contains(&element.layer()?) {
            return Ok(());
        }
        let label = RawLabel::read(element)?;
        let cell = self.cell();
        cell.points += label.size();
        cell.add_bounds(Some(label.bounds()));
        self.labels.push(label);
        Ok(())
    }

    fn cell(&mut self) -> &mut Cell<'a> {
        &mut self.cells[self.current as usize]
    }

    fn draw_path(&mut self, element: &Element<'a>, sheet: u16) -> Result<(), Fault> {
        let Some(path) = Path::read(element, &mut self.working)? else {
            return Ok(());
        };
        let wrong = |problem| element.wrong(problem);
        if !path.absolute {
            let canvas = &mut self.canvas;
            return path.draw(&mut |piece| canvas.draw(piece)).map_err(wrong);
        }
        // Its box at magnification 1 encloses, magnified, what any placement draws.
        let mut aside = Canvas::default();
        path.draw(&mut |piece| aside.draw(piece)).map_err(wrong)?;
        let bounds = aside.take_bounds();
        let offset = element.start.offset;
        let cell = self.cell();
        cell.absolute.push(AbsolutePath {
            offset,
            path,
            sheet,
        });
        cell.points += aside.points();
        cell.add_bounds(bounds);
        Ok(())
    }

    fn place(&mut self, element: &Element<'a>) -> Result<(), Fault> {
        let [columns, rows] = element.array_size()?;
        let cell = self.id(element.placed_cell()?);
        let _: Vector = super::hierarchy::origin(element)?;
        let offset = element.start.offset;
        let count = u32::from(columns) * u32::from(rows);
        self.cell().references.push(Reference {
            offset,
            cell,
            count,
        });
        Ok(())
    }
}

impl Cell<'_> {
    fn add_bounds(&mut self, more: Option<Rect>) {
        self.bounds = match (self.bounds, more) {
            (Some(a), Some(b)) => Some(super::canvas::union(a, b)),
            (a, b) => a.or(b),
        };
    }
}

impl<'a> Visitor<'a> for Library<'a> {
    fn begin_cell(&mut self, name: &'a [u8], offset: usize) -> Result<(), Fault> {
        self.current = self.id(name);
        if let Some(first) = self.cell().defined.replace(offset) {
            let name = shown(name);
            return Err(Problem::DuplicateCell { name, first }.at(offset));
        }
        let start = self.canvas.len() as u32;
        self.cell().shapes = start..start;
        let label = self.labels.len() as u32;
        self.cell().labels = label..label;
        self.points_before = self.canvas.points();
        Ok(())
    }

    fn element(&mut self, element: &Element<'a>) -> Result<(), Fault> {
        match element.start.kind {
            kind::SREF | kind::AREF => self.place(element),
            kind::TEXT => self.note_label(element),
            kind::NODE => Ok(()),
            _ => self.draw(element),
        }
    }

    fn end_cell(&mut self, _end: Range<usize>) -> Result<(), Fault> {
        let end = self.canvas.len() as u32;
        let last_label = self.labels.len() as u32;
        let points = self.canvas.points() - self.points_before;
        let bounds = self.canvas.take_bounds();
        let cell = self.cell();
        cell.shapes.end = end;
        cell.labels.end = last_label;
        cell.points += points;
        cell.add_bounds(bounds);
        Ok(())
    }
}

impl AbsolutePath {
    /// Draws the path where a placement of its cell puts it.
    pub(super) fn draw(&self, transform: &Transform, canvas: &mut Canvas) -> Result<(), Fault> {
        let drawn = self
            .path
            .placed(transform)
            .draw(&mut |piece| canvas.draw(piece));
        drawn.map_err(|problem| problem.at(self.offset))
    }
}
