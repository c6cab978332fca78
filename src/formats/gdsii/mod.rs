//! GDSII streams: one layer read into a [`Layout`], the coloured copy written.
//!
//! Source of the format: "GDSII Stream Format Manual", Release 6.0, Calma, 1987. A contents page, in
//! the order of the data:
//!
//! | module | what it does |
//! |---|---|
//! | `records` | bytes to records; the views of their bodies come from the crate `gdsii` |
//! | `element`, `walk` | records to elements and cells: the grammar |
//! | `real8` | eight-byte reals as exact integers |
//! | `boundary`, `path`, `path_outline`, `canvas` | elements to shapes |
//! | `library` | the index: cells, references, shapes of the wanted layer |
//! | `transform`, `hierarchy`, `flatten` | cells to one flat list, counted before it is made |
//! | `census` | which layers there are, for the message that one is absent |
//! | [`coloured`], [`writer`] | the way out |
//!
//! The crate `gdsii` is named in this directory only.
//!
//! What is strict: every record up to ENDLIB must follow the grammar, every cell placed must be
//! defined once, and every element of the wanted layer must be sound, in cells that the top cell does
//! not reach too. What is lenient: the order of records inside an element, names that are not UTF-8,
//! and elements of other layers.

mod boundary;
mod canvas;
mod census;
pub mod coloured;
mod element;
mod flatten;
mod hierarchy;
mod library;
mod path;
mod path_outline;
mod problem;
mod real8;
mod records;
mod transform;
mod walk;
pub mod writer;

pub use problem::Problem;
pub use transform::Orientation;

use crate::formats::FormatError;
use crate::layout::{LayerId, Layout};
use hierarchy::Hierarchy;
use library::Library;
use records::{Fault, shown};

/// How a stream begins: a HEADER record of one two-byte integer.
pub const SIGNATURE: [u8; 4] = [0, 6, 0, 2];

/// The most points and placements that are flattened unless the caller says otherwise: 134 million
/// rectangles, 2.7 GB.
pub const MAX_POINTS: u64 = 1 << 28;

/// The most points that [`Request::max_points`] may allow.
const POINTS_LIMIT: u64 = 1 << 31;

/// What to read.
#[derive(Clone, Copy)]
pub struct Request<'a> {
    /// The file's name, for errors.
    pub name: &'a str,
    /// The layer.
    pub layer: LayerId,
    /// The top cell; needed where several cells are placed by no other.
    pub top: Option<&'a str>,
    /// The most points and placements to flatten, at most 2^31.
    pub max_points: u64,
    /// Told bytes read and bytes in all, about once a megabyte.
    pub progress: &'a dyn Fn(u64, u64),
}

impl<'a> Request<'a> {
    /// One layer of the only top cell, without reports of progress.
    pub fn new(name: &'a str, layer: LayerId) -> Request<'a> {
        Request {
            name,
            layer,
            top: None,
            max_points: MAX_POINTS,
            progress: &|_, _| {},
        }
    }
}

/// Reads one layer of an unpacked stream, flattened into the coordinates of the top cell.
///
/// Shapes are as drawn: one for each BOUNDARY and BOX, one or more for each PATH, in the order of the
/// file. Takes time in proportion to the file and to what is flattened; memory for the shapes twice
/// (once in their cells) and 16 bytes a reference, another 32 for those that matter.
///
/// # Errors
/// The first fault with its byte, its cell where there is one, what is wrong and what would be right.
pub fn read(bytes: &[u8], request: &Request<'_>) -> Result<Layout, FormatError> {
    read_layer(bytes, request).map_err(|fault| fault.in_file(request.name))
}

fn read_layer(bytes: &[u8], request: &Request<'_>) -> Result<Layout, Fault> {
    let layer = request.layer;
    let mut library = Library::new(layer);
    let header = walk::walk(bytes, &mut library, request.progress)?;
    let hierarchy = Hierarchy::new(&library, bytes, request.top)?;
    let top = &library.cells[hierarchy.top as usize];
    let content = &hierarchy.contents[hierarchy.top as usize];
    if content.bounds.is_none() {
        return Err(census::absent(bytes, &library, &hierarchy, layer));
    }
    let limit = request.max_points.min(POINTS_LIMIT);
    if content.points.saturating_add(content.placements) > limit {
        let problem = Problem::TooMany {
            layer,
            shapes: content.shapes,
            points: content.points,
            placements: content.placements,
            limit,
        };
        return Err(problem.at(top.defined.unwrap_or(0)).in_cell(top.name));
    }
    Ok(Layout {
        top: shown(top.name),
        layer,
        unit_pm: header.unit_pm,
        shapes: flatten::flatten(library, &hierarchy)?,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    })
}
