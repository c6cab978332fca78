//! What can be wrong in a GDSII stream. Every message says what would be right.

use super::records::Fault;
use crate::geometry::COORDINATE_LIMIT;
use crate::layout::LayerId;
use thiserror::Error;

/// What is wrong at a byte of a GDSII stream.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum Problem {
    /// The stream does not begin with HEADER.
    #[error("no HEADER record: a GDSII stream starts with the bytes 00 06 00 02")]
    NoHeader,
    /// A record shorter than its own header.
    #[error("record length {0}: it must be even and at least 4, so the file is damaged here")]
    RecordLength(u16),
    /// A record that runs past the end.
    #[error("record of {length} bytes, but only {available} remain: the file is cut short")]
    Truncated {
        /// The length that the record says.
        length: usize,
        /// The bytes that remain.
        available: usize,
    },
    /// The stream ends before ENDLIB.
    #[error("the file ends {0}: an ENDLIB record must close it")]
    NoEnd(&'static str),
    /// A record type that GDSII does not have.
    #[error("unknown record type {0:#04x}: types are 0x00 to 0x3b, so the file is damaged here")]
    UnknownRecord(u8),
    /// A record in the wrong place.
    #[error("record {record} {place}: {expected} must stand here")]
    Unexpected {
        /// The record.
        record: &'static str,
        /// Where it stands.
        place: &'static str,
        /// What would be right.
        expected: &'static str,
    },
    /// A record that an element may have once.
    #[error("second {record} in one {element}: one is right")]
    Repeated {
        /// The record.
        record: &'static str,
        /// The element.
        element: &'static str,
    },
    /// A record that is not there.
    #[error("{element} without {record}: it must have one")]
    MissingRecord {
        /// The record.
        record: &'static str,
        /// The element.
        element: &'static str,
    },
    /// A record of the wrong data type or length.
    #[error("{record} holds {found} bytes of data type {data_type}: {expected} is right")]
    Body {
        /// The record.
        record: &'static str,
        /// How many bytes it holds.
        found: usize,
        /// Its data type.
        data_type: u8,
        /// What would be right.
        expected: &'static str,
    },
    /// An empty cell name.
    #[error("{0} is empty: a cell needs a name")]
    EmptyName(&'static str),
    /// The database unit is no whole number of picometres.
    #[error("database unit of {0} m: a whole number of picometres, 1 pm to 1 m, is needed")]
    Unit(String),
    /// Too few points.
    #[error("{element} has {found} points: it must have {expected}")]
    Points {
        /// The element.
        element: &'static str,
        /// How many it has.
        found: usize,
        /// How many are right.
        expected: &'static str,
    },
    /// An outline whose last point is not its first.
    #[error("{element} is not closed: it ends at ({}, {}) but must end where it starts, at ({}, {})",
        last.0, last.1, first.0, first.1)]
    Unclosed {
        /// The element.
        element: &'static str,
        /// Its first point.
        first: (i32, i32),
        /// Its last point.
        last: (i32, i32),
    },
    /// An outline without area.
    #[error(
        "{0} encloses no area, or as much clockwise as counterclockwise: it must be one outline around \
         an area"
    )]
    NoArea(&'static str),
    /// A coordinate too large.
    #[error(
        "coordinate ({x}, {y}) is out of range: at most {COORDINATE_LIMIT} database units from 0"
    )]
    Coordinate {
        /// Abscissa.
        x: i64,
        /// Ordinate.
        y: i64,
    },
    /// A path type that does not exist.
    #[error("path type {0}: 0, 1, 2 or 4 is right")]
    PathType(i16),
    /// A path whose outline would lie between grid points.
    #[error(
        "path width {0} is odd, so its outline lies between grid points: an even width is needed"
    )]
    OddWidth(u32),
    /// A path that is one point.
    #[error("path has no length: two different points are needed")]
    NoLength,
    /// Path extensions that leave nothing.
    #[error("path extensions {0} and {1} leave nothing of an end segment: shorter ones are needed")]
    Extensions(i32, i32),
    /// A reference at another angle.
    #[error("cell {cell:?} is placed at {angle} degrees: only multiples of 90 stay on the grid")]
    Angle {
        /// The cell placed.
        cell: String,
        /// The angle.
        angle: String,
    },
    /// A reference with another magnification.
    #[error(
        "cell {cell:?} is placed with magnification {magnification}: a whole number from 1 is needed"
    )]
    Magnification {
        /// The cell placed.
        cell: String,
        /// The magnification.
        magnification: String,
    },
    /// Absolute magnification or angle.
    #[error(
        "cell {0:?} is placed with absolute magnification or angle: relative ones are read only"
    )]
    Absolute(String),
    /// An array without columns or rows.
    #[error("array of {columns} columns and {rows} rows: each must be 1 to 32767")]
    ArraySize {
        /// COLROW's first number.
        columns: i16,
        /// COLROW's second number.
        rows: i16,
    },
    /// An array whose step is off the grid.
    #[error(
        "array of cell {cell:?} spans ({x}, {y}) in {count} steps: the span must divide evenly"
    )]
    ArrayStep {
        /// The cell placed.
        cell: String,
        /// The span along x.
        x: i64,
        /// The span along y.
        y: i64,
        /// Columns or rows.
        count: i64,
    },
    /// A cell that contains itself.
    #[error("cells contain each other: {0}; a hierarchy must not return to a cell")]
    Cycle(String),
    /// A cell that is placed and not defined.
    #[error("cell {0:?} is placed but not defined: the file must hold every cell it places")]
    MissingCell(String),
    /// Two cells of one name.
    #[error("second cell {name:?}, after the one at byte {first}: names must differ")]
    DuplicateCell {
        /// The name.
        name: String,
        /// Where the first one is.
        first: usize,
    },
    /// No cell at all.
    #[error("the library has no cells: at least one is needed")]
    NoCells,
    /// Several cells that could be meant.
    #[error("several top cells: {0}; choose one with --top")]
    SeveralTops(String),
    /// The cell asked for is not there.
    #[error("no cell {asked:?}: top cells are {tops}")]
    NoSuchTop {
        /// The name asked for.
        asked: String,
        /// The names that there are.
        tops: String,
    },
    /// Nothing is drawn on the layer.
    #[error(
        "nothing is drawn on layer {layer}: layers present, with their shape counts, are {present}"
    )]
    LayerAbsent {
        /// The layer asked for.
        layer: LayerId,
        /// The layers with their counts.
        present: String,
    },
    /// No text on the layer.
    #[error("no text on layer {layer}: layers with texts, with their counts, are {present}")]
    LabelsAbsent {
        /// The layer and texttype asked for.
        layer: LayerId,
        /// The layers of texts with their counts.
        present: String,
    },
    /// More shapes than memory should be used for.
    #[error(
        "{layers} {shapes} shapes with {points} points in {placements} placements: at most \
         {limit} points and placements are read"
    )]
    TooMany {
        /// The layers, and a verb.
        layers: String,
        /// Shapes after flattening.
        shapes: u64,
        /// Points after flattening.
        points: u64,
        /// Cells placed, directly or not.
        placements: u64,
        /// The limit.
        limit: u64,
    },
    /// An output layer that the input uses.
    #[error(
        "output layer {0} is already in use here: choose layers that are free in the whole file"
    )]
    Occupied(LayerId),
}

impl Problem {
    /// The problem at a byte, its cell not yet known.
    pub(super) fn at(self, offset: usize) -> Fault {
        Fault {
            offset,
            cell: None,
            problem: self,
        }
    }
}
