//! GDSII streams: a layer, and what the rules name beside it, read into a [`Layout`]; the coloured copy
//! written.
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
//! | `label` | texts to labels |
//! | `library` | the index: cells, references, shapes and labels of the wanted layers |
//! | `transform`, `hierarchy`, `flatten` | cells to one flat list, counted before it is made |
//! | `census` | which layers there are, for the message that one is absent |
//! | [`masks`] | masks that are drawn already |
//! | [`coloured`], [`writer`] | the way out |
//!
//! The crate `gdsii` is named in this directory only.
//!
//! What is strict: every record up to ENDLIB must follow the grammar, every cell placed must be
//! defined once, and every element of a wanted layer must be sound, in cells that the top cell does
//! not reach too. What is lenient: the order of records inside an element, names that are not UTF-8,
//! and elements of other layers.

mod boundary;
mod canvas;
mod census;
pub mod coloured;
mod element;
mod flatten;
mod hierarchy;
mod label;
mod library;
pub mod masks;
mod path;
mod path_outline;
mod problem;
mod real8;
mod records;
mod transform;
mod walk;
pub mod writer;

pub use label::Label;
pub use problem::Problem;
pub use transform::Orientation;

use crate::formats::FormatError;
use crate::layout::{LayerId, Layout, Shape, Shapes};
use census::{Counted, absent};
use encodings::Mask;
use flatten::Flattened;
use hierarchy::Hierarchy;
use library::{Library, Wanted};
use records::{Fault, shown};

/// How a stream begins: a HEADER record of one two-byte integer.
pub const SIGNATURE: [u8; 4] = [0, 6, 0, 2];

/// The most points and placements that are flattened unless the caller says otherwise: 134 million
/// rectangles, 2.7 GB.
pub const MAX_POINTS: u64 = 1 << 28;

/// The most points that [`Request::max_points`] may allow.
const POINTS_LIMIT: u64 = 1 << 31;

/// What to read. All layers that are drawn (`layer`, `fixed`, `keep_outs`) must be different; texts
/// have layers of their own.
#[derive(Clone, Copy)]
pub struct Request<'a> {
    /// The file's name, for errors.
    pub name: &'a str,
    /// The layer.
    pub layer: LayerId,
    /// Layers whose shapes are part of the layer, and on a mask.
    pub fixed: &'a [(LayerId, Mask)],
    /// Layers that stitches keep away from.
    pub keep_outs: &'a [LayerId],
    /// Layers and texttypes whose texts are labels.
    pub labels: &'a [LayerId],
    /// The top cell; needed where several cells are placed by no other.
    pub top: Option<&'a str>,
    /// The most points and placements to flatten, at most 2^31. A label counts for at least 5 points.
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
            fixed: &[],
            keep_outs: &[],
            labels: &[],
            top: None,
            max_points: MAX_POINTS,
            progress: &|_, _| {},
        }
    }

    fn wanted(&self) -> Wanted {
        let fixed = self.fixed.iter().map(|&(layer, _)| layer);
        let drawn = std::iter::once(self.layer).chain(fixed);
        Wanted {
            drawn: drawn.chain(self.keep_outs.iter().copied()).collect(),
            labels: self.labels.to_vec(),
        }
    }
}

/// Reads one layer of an unpacked stream, flattened into the coordinates of the top cell, with the shapes
/// of the request's other layers.
///
/// Shapes are as drawn: one for each BOUNDARY and BOX, one or more for each PATH, in the order of the
/// file; those of fixed layers follow those of the layer, in the order of the request. Takes time in
/// proportion to the file and to what is flattened; memory for the shapes twice
/// (once in their cells) and 16 bytes a reference, another 32 for those that matter.
///
/// # Errors
/// The first fault with its byte, its cell where there is one, what is wrong and what would be right. A
/// layer on which nothing is drawn is one; but the layer itself may be empty beside fixed ones.
pub fn read(bytes: &[u8], request: &Request<'_>) -> Result<Layout, FormatError> {
    read_with_labels(bytes, request).map(|(layout, _)| layout)
}

/// The same with the labels, in the order of the file.
///
/// # Errors
/// As for [`read`]; a layer of labels without texts is one too.
pub fn read_with_labels(
    bytes: &[u8],
    request: &Request<'_>,
) -> Result<(Layout, Vec<Label>), FormatError> {
    read_layers(bytes, request).map_err(|fault| fault.in_file(request.name))
}

fn read_layers(bytes: &[u8], request: &Request<'_>) -> Result<(Layout, Vec<Label>), Fault> {
    let mut library = Library::new(request.wanted());
    let header = walk::walk(bytes, &mut library, request.progress)?;
    let hierarchy = Hierarchy::new(&library, bytes, request.top)?;
    check_size(&library, &hierarchy, request)?;
    let flat = flatten::flatten(&mut library, &hierarchy)?;
    check_present(&flat, request, &library, &hierarchy, bytes)?;
    let top = shown(library.cells[hierarchy.top as usize].name);
    drop(library);
    let mut sheets = flat.sheets.into_iter();
    let mut shapes = sheets.next().unwrap_or_default();
    let mut fixed = Vec::new();
    for (&(_, mask), sheet) in request.fixed.iter().zip(&mut sheets) {
        let first = shapes.len() as u32;
        append(&mut shapes, &sheet);
        fixed.extend((first..shapes.len() as u32).map(|shape| (shape, mask)));
    }
    let layout = Layout {
        top,
        layer: request.layer,
        unit_pm: header.unit_pm,
        shapes,
        fixed,
        keep_outs: request.keep_outs.iter().copied().zip(sheets).collect(),
    };
    Ok((layout, flat.labels))
}

fn append(shapes: &mut Shapes, more: &Shapes) {
    for shape in more.iter() {
        match shape {
            Shape::Rect(rect) => shapes.push_rect(rect),
            Shape::Polygon(vertices) => shapes.push_polygon(vertices),
        }
    }
}

/// Refuses what would take too much memory when flattened.
fn check_size(
    library: &Library<'_>,
    hierarchy: &Hierarchy,
    request: &Request<'_>,
) -> Result<(), Fault> {
    let content = &hierarchy.contents[hierarchy.top as usize];
    let limit = request.max_points.min(POINTS_LIMIT);
    if content.points.saturating_add(content.placements) <= limit {
        return Ok(());
    }
    let wanted = &library.wanted;
    let names: Vec<String> = (wanted.drawn.iter().chain(&wanted.labels))
        .map(LayerId::to_string)
        .collect();
    let layers = match names.as_slice() {
        [layer] => format!("layer {layer} has"),
        _ => format!("layers {} together have", names.join(", ")),
    };
    let problem = Problem::TooMany {
        layers,
        shapes: content.shapes,
        points: content.points,
        placements: content.placements,
        limit,
    };
    let top = &library.cells[hierarchy.top as usize];
    Err(problem.at(top.defined.unwrap_or(0)).in_cell(top.name))
}

/// Refuses layers on which there is nothing.
fn check_present(
    flat: &Flattened,
    request: &Request<'_>,
    library: &Library<'_>,
    hierarchy: &Hierarchy,
    bytes: &[u8],
) -> Result<(), Fault> {
    let wanted = &library.wanted;
    let missing = |layer, counted| Err(absent(bytes, library, hierarchy, layer, counted));
    for (i, (&layer, sheet)) in wanted.drawn.iter().zip(&flat.sheets).enumerate() {
        let may_be_empty = i == 0 && !request.fixed.is_empty();
        if sheet.is_empty() && !may_be_empty {
            return missing(layer, Counted::Shapes);
        }
    }
    for &layer in &wanted.labels {
        if !flat.labels.iter().any(|label| label.layer == layer) {
            return missing(layer, Counted::Texts);
        }
    }
    Ok(())
}
