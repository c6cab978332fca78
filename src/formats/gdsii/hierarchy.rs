//! The hierarchy: its order, its top, and what flattening it would give, known before it is done.
//!
//! A cell is placed by a reference at one of eight orientations with an integer magnification, once or
//! in an array. From the cells without references upwards, each cell's box and its counts of shapes,
//! points and placements follow from those of the cells it places; so coordinates that leave the grid
//! and absurd counts are found, and named, without a shape being made. Only references to cells with
//! something wanted are judged: others (rotated texts, frames) draw nothing.

use super::canvas::union;
use super::element::Element;
use super::library::{Cell, CellId, Library, Reference};
use super::problem::Problem;
use super::real8::Real8;
use super::records::{Fault, Records, shown};
use super::transform::{Orientation, Transform, Vector};
use crate::geometry::{Point, Rect};

/// A cell placed, once or in an array.
#[derive(Clone, Copy, Debug)]
pub(super) struct Placement {
    pub cell: CellId,
    pub columns: u16,
    pub rows: u16,
    orientation: Orientation,
    magnification: i32,
    at: Point,
    /// From column to column and from row to row; 0 where there is one.
    steps: [Point; 2],
}

/// What a cell and all it places come to on the wanted layers.
#[derive(Clone, Debug, Default)]
pub(super) struct Content {
    pub bounds: Option<Rect>,
    pub shapes: u64,
    pub points: u64,
    /// Cells placed, directly or not.
    pub placements: u64,
    /// The placements of cells that have something wanted.
    pub children: Vec<Placement>,
}

/// The origin of a reference, its points counted.
pub(super) fn origin(element: &Element<'_>) -> Result<Vector, Fault> {
    Ok(points(element)?[0].into())
}

fn points(element: &Element<'_>) -> Result<[Point; 3], Fault> {
    if element.start.kind == super::records::kind::AREF {
        element.exactly::<3>("3: origin, end of columns, end of rows")
    } else {
        let [at] = element.exactly::<1>("1")?;
        Ok([at; 3])
    }
}

impl Placement {
    /// Reads a reference to the cell `cell` named `name`.
    fn read(element: &Element<'_>, cell: CellId, name: &[u8]) -> Result<Placement, Fault> {
        let [columns, rows] = element.array_size()?;
        let [at, column_end, row_end] = points(element)?;
        let flags = element
            .strans
            .as_ref()
            .map_or(Ok(0), |strans| strans.flags())?;
        if flags & 0x0006 != 0 {
            return Err(element.wrong(Problem::Absolute(shown(name))));
        }
        let step = |end: Point, count: u16| {
            step(Vector::from(end).minus(at.into()), count, name)
                .map_err(|problem| element.wrong(problem))
        };
        Ok(Placement {
            cell,
            columns,
            rows,
            orientation: Orientation {
                reflected: flags & 0x8000 != 0,
                quarter_turns: quarter_turns(element, name)?,
            },
            magnification: magnification(element, name)?,
            at,
            steps: [step(column_end, columns)?, step(row_end, rows)?],
        })
    }

    /// The map from the cell's coordinates to those of the cell that places it.
    pub(super) fn transform(&self, column: u16, row: u16) -> Transform {
        let [along_columns, along_rows] = self.steps.map(Vector::from);
        let shift = along_columns
            .times(column.into())
            .plus(along_rows.times(row.into()));
        Transform::new(self.orientation, self.magnification.into(), self.at.into()).shifted(shift)
    }

    /// The box of the whole array, given the cell's.
    fn bounds(&self, cell: Rect) -> Result<Rect, Problem> {
        let mut bounds: Option<Rect> = None;
        for column in [0, self.columns - 1] {
            for row in [0, self.rows - 1] {
                let [min, max] = self.transform(column, row).corners(cell);
                let one = Rect {
                    min: min.on_grid()?,
                    max: max.on_grid()?,
                };
                bounds = Some(bounds.map_or(one, |all| union(all, one)));
            }
        }
        Ok(bounds.unwrap_or(cell))
    }
}

/// One step of an array that spans `span` in `count` steps, 0 when there is one.
fn step(span: Vector, count: u16, name: &[u8]) -> Result<Point, Problem> {
    let count = i64::from(count);
    if span.x % count != 0 || span.y % count != 0 {
        let cell = shown(name);
        let Vector { x, y } = span;
        return Err(Problem::ArrayStep { cell, x, y, count });
    }
    let one = Vector {
        x: span.x / count,
        y: span.y / count,
    };
    Ok(if count == 1 {
        Point::default()
    } else {
        one.point()
    })
}

/// The rotation. An angle within 10^-9 degrees of a multiple of 90, as sloppy writers give, moves no
/// point of the grid by as much as 1/20 of a database unit.
fn quarter_turns(element: &Element<'_>, name: &[u8]) -> Result<u8, Fault> {
    let Some(record) = &element.angle else {
        return Ok(0);
    };
    let [raw] = record.reals::<1>()?;
    let angle = Real8::new(raw);
    match angle.near_integer(9) {
        Some(degrees) if degrees % 90 == 0 => Ok((degrees / 90).rem_euclid(4) as u8),
        _ => {
            let cell = shown(name);
            let angle = angle.to_string();
            Err(Problem::Angle { cell, angle }.at(record.offset))
        }
    }
}

/// The magnification, within 10^-10 of an integer (less than 1/8 of a database unit at most).
fn magnification(element: &Element<'_>, name: &[u8]) -> Result<i32, Fault> {
    let Some(record) = &element.mag else {
        return Ok(1);
    };
    let [raw] = record.reals::<1>()?;
    let magnification = Real8::new(raw);
    match magnification.near_integer(10).map(i32::try_from) {
        Some(Ok(times)) if times >= 1 => Ok(times),
        _ => {
            let cell = shown(name);
            let magnification = magnification.to_string();
            Err(Problem::Magnification {
                cell,
                magnification,
            }
            .at(record.offset))
        }
    }
}

/// The hierarchy below one top cell.
pub(super) struct Hierarchy {
    pub top: CellId,
    /// The top and the cells below it, each behind those that it places.
    pub order: Vec<CellId>,
    /// The content of each of them, by cell number; empty for other cells.
    pub contents: Vec<Content>,
}

impl Hierarchy {
    /// Finds top and order, and judges every reference below the top that matters.
    pub(super) fn new(
        library: &Library<'_>,
        bytes: &[u8],
        asked: Option<&str>,
    ) -> Result<Hierarchy, Fault> {
        check_defined(library)?;
        // The whole file must be free of cycles, also where the top cell does not reach.
        let mut order = Order::new(library);
        for cell in 0..library.cells.len() as CellId {
            order.visit(cell)?;
        }
        let top = top(library, asked)?;
        let mut order = Order::new(library);
        order.visit(top)?;
        let mut hierarchy = Hierarchy {
            top,
            order: order.done,
            contents: vec![Content::default(); library.cells.len()],
        };
        for i in 0..hierarchy.order.len() {
            let cell = hierarchy.order[i];
            let content = hierarchy
                .content(library, bytes, cell)
                .map_err(|fault| fault.in_cell(library.cells[cell as usize].name))?;
            hierarchy.contents[cell as usize] = content;
        }
        Ok(hierarchy)
    }

    fn content(&self, library: &Library<'_>, bytes: &[u8], id: CellId) -> Result<Content, Fault> {
        let cell = &library.cells[id as usize];
        let mut content = Content {
            bounds: cell.bounds,
            shapes: u64::from(cell.shapes.end - cell.shapes.start) + cell.absolute.len() as u64,
            points: cell.points,
            ..Content::default()
        };
        for reference in &cell.references {
            let child = &self.contents[reference.cell as usize];
            if let Some(bounds) = child.bounds {
                let placement = read_reference(library, bytes, reference)?;
                let placed = placement.bounds(bounds);
                let placed = placed.map_err(|problem| problem.at(reference.offset))?;
                content.add(child, placed, u64::from(reference.count));
                content.children.push(placement);
            }
        }
        Ok(content)
    }
}

impl Content {
    fn add(&mut self, child: &Content, placed: Rect, count: u64) {
        self.bounds = Some(self.bounds.map_or(placed, |bounds| union(bounds, placed)));
        let add = |sum: &mut u64, each: u64| *sum = sum.saturating_add(each.saturating_mul(count));
        add(&mut self.shapes, child.shapes);
        add(&mut self.points, child.points);
        add(&mut self.placements, child.placements.saturating_add(1));
    }
}

fn read_reference(
    library: &Library<'_>,
    bytes: &[u8],
    reference: &Reference,
) -> Result<Placement, Fault> {
    let mut records = Records::at(bytes, reference.offset);
    let start = records.next("inside a cell")?;
    let element = Element::read(start, &mut records)?;
    let name = library.cells[reference.cell as usize].name;
    Placement::read(&element, reference.cell, name)
}

fn check_defined(library: &Library<'_>) -> Result<(), Fault> {
    for cell in &library.cells {
        for reference in &cell.references {
            let placed: &Cell<'_> = &library.cells[reference.cell as usize];
            if placed.defined.is_none() {
                let problem = Problem::MissingCell(shown(placed.name));
                return Err(problem.at(reference.offset).in_cell(cell.name));
            }
        }
    }
    Ok(())
}

/// The cell asked for, or the only one that no other places.
fn top(library: &Library<'_>, asked: Option<&str>) -> Result<CellId, Fault> {
    let mut placed = vec![false; library.cells.len()];
    for reference in library.cells.iter().flat_map(|cell| &cell.references) {
        placed[reference.cell as usize] = true;
    }
    let tops: Vec<CellId> = (0..library.cells.len() as CellId)
        .filter(|&cell| !placed[cell as usize])
        .collect();
    let names = || {
        list(
            tops.iter()
                .map(|&cell| shown(library.cells[cell as usize].name)),
        )
    };
    match (asked, tops.as_slice()) {
        (_, []) => Err(Problem::NoCells.at(0)),
        (Some(asked), _) => library.find_shown(asked).ok_or_else(|| {
            let asked = asked.to_owned();
            Problem::NoSuchTop {
                asked,
                tops: names(),
            }
            .at(0)
        }),
        (None, &[top]) => Ok(top),
        (None, _) => Err(Problem::SeveralTops(names()).at(0)),
    }
}

/// Names with commas between them, cut where there are too many to read.
pub(super) fn list(names: impl ExactSizeIterator<Item = String>) -> String {
    const SHOWN: usize = 40;
    let count = names.len();
    let mut text = names.take(SHOWN).collect::<Vec<_>>().join(", ");
    if count > SHOWN {
        text.push_str(&format!(" and {} more", count - SHOWN));
    }
    text
}

/// A depth-first walk that lists each cell behind those it places. The path is a list of its own, not
/// the call stack: a hostile file may nest cells a million deep.
struct Order<'l, 'a> {
    library: &'l Library<'a>,
    done: Vec<CellId>,
    state: Vec<State>,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum State {
    New,
    OnPath,
    Done,
}

impl<'l, 'a> Order<'l, 'a> {
    fn new(library: &'l Library<'a>) -> Order<'l, 'a> {
        Order {
            library,
            done: Vec::new(),
            state: vec![State::New; library.cells.len()],
        }
    }

    fn visit(&mut self, root: CellId) -> Result<(), Fault> {
        if self.state[root as usize] != State::New {
            return Ok(());
        }
        let mut path = vec![(root, 0usize)];
        self.state[root as usize] = State::OnPath;
        while let Some((cell, next)) = path.last_mut() {
            let references = &self.library.cells[*cell as usize].references;
            let Some(reference) = references.get(*next) else {
                self.state[*cell as usize] = State::Done;
                self.done.push(*cell);
                path.pop();
                continue;
            };
            *next += 1;
            match self.state[reference.cell as usize] {
                State::Done => {}
                State::New => {
                    self.state[reference.cell as usize] = State::OnPath;
                    path.push((reference.cell, 0));
                }
                State::OnPath => return Err(self.cycle(&path, reference)),
            }
        }
        Ok(())
    }

    fn cycle(&self, path: &[(CellId, usize)], reference: &Reference) -> Fault {
        let name = |cell: CellId| self.library.cells[cell as usize].name;
        let start = path.iter().position(|&(cell, _)| cell == reference.cell);
        let around = &path[start.unwrap_or(0)..];
        let first = shown(name(reference.cell));
        let rest = around.iter().skip(1).map(|&(cell, _)| shown(name(cell)));
        let names: Vec<String> = std::iter::once(first.clone()).chain(rest).collect();
        let text = format!(
            "{} places {first}",
            list(names.into_iter()).replace(", ", " places ")
        );
        let fault = Problem::Cycle(text).at(reference.offset);
        match path.last() {
            Some(&(cell, _)) => fault.in_cell(name(cell)),
            None => fault,
        }
    }
}
