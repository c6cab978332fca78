//! A plain GDSII writer for tests and benchmarks: streaming, with fixed time stamps, so that the same
//! calls give the same bytes.

use super::transform::Orientation;
use crate::geometry::{Point, Rect};
use crate::layout::LayerId;
use gdsii::float::GdsEightByteReal;
use gdsii::parser::{
    Aref, Boundary, Element, GdsBox, GdsEvent, LibraryBegin, Path, Sref, Strans, StructureBegin,
    Text, XyCoords,
};
use gdsii::writer::{GdsWriter, WriteError};
use std::io::{self, Write};

/// Year, month, day, hour, minute, second; twice.
const STAMPS: [i16; 12] = [1970, 1, 1, 0, 0, 0, 1970, 1, 1, 0, 0, 0];

/// How a path is drawn; see `path` for what the types mean.
#[derive(Clone, Copy, Debug, Default)]
pub struct PathStyle {
    /// 0, 1, 2 or 4.
    pub kind: i16,
    /// The width; a negative one is absolute.
    pub width: i32,
    /// The extensions of type 4 at begin and end.
    pub extensions: Option<[i32; 2]>,
}

/// Writes a library cell by cell, element by element. It should get a buffered writer.
pub struct Writer<W: Write> {
    inner: GdsWriter<W>,
}

fn failed(error: WriteError) -> io::Error {
    match error {
        WriteError::Io(error) => error,
        other => io::Error::other(other),
    }
}

/// The coordinates of points, and of the first one again if `closed`.
pub(super) fn coordinates(points: &[Point], closed: bool) -> XyCoords<'static> {
    let again = points.first().filter(|_| closed);
    let both = points.iter().chain(again).flat_map(|p| [p.x, p.y]);
    XyCoords::from(both.map(Into::into).collect::<Vec<_>>())
}

/// A closed outline on a layer.
pub(super) fn boundary(layer: LayerId, outline: &[Point]) -> GdsEvent<'static> {
    GdsEvent::Element(Element::Boundary(Boundary {
        elflags: None,
        plex: None,
        layer: layer.layer as i16,
        datatype: layer.datatype as i16,
        xy: coordinates(outline, true),
    }))
}

fn strans(orientation: Orientation, magnification: u32) -> Option<Strans> {
    let real = |value: f64| GdsEightByteReal::try_from(value).ok();
    let angle = f64::from(orientation.quarter_turns % 4) * 90.0;
    Some(Strans {
        reflection: orientation.reflected,
        abs_mag: false,
        abs_angle: false,
        mag: real(magnification.into()).filter(|_| magnification != 1),
        angle: real(angle).filter(|_| !orientation.quarter_turns.is_multiple_of(4)),
    })
    .filter(|_| orientation != Orientation::default() || magnification != 1)
}

impl<W: Write> Writer<W> {
    /// Begins a library whose database unit is `unit_pm` picometres.
    ///
    /// # Errors
    /// Those of the writer; so for all other calls.
    pub fn new(out: W, unit_pm: u64) -> io::Result<Writer<W>> {
        let mut inner = GdsWriter::new(out).with_multi_xy(true);
        let stamps = STAMPS.map(Into::into);
        let library = GdsEvent::LibraryBegin(LibraryBegin {
            version: 600,
            timestamps: &stamps,
            lib_name: "LIB",
            db_in_user: unit_pm as f64 / 1e6,
            db_in_meters: unit_pm as f64 / 1e12,
            reflibs: None,
            fonts: None,
            attrtable: None,
            generations: None,
        });
        inner.write_event(&library).map_err(failed)?;
        Ok(Writer { inner })
    }

    fn event(&mut self, event: GdsEvent<'_>) -> io::Result<()> {
        self.inner.write_event(&event).map_err(failed)
    }

    /// Begins a cell.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn begin_cell(&mut self, name: &str) -> io::Result<()> {
        let timestamps = &STAMPS.map(Into::into);
        self.event(GdsEvent::StructureBegin(StructureBegin {
            timestamps,
            name,
        }))
    }

    /// Ends a cell.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn end_cell(&mut self) -> io::Result<()> {
        self.event(GdsEvent::StructureEnd)
    }

    /// Ends the library.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn finish(mut self) -> io::Result<W> {
        self.event(GdsEvent::LibraryEnd)?;
        Ok(self.inner.into_inner())
    }

    /// A polygon, given without the closing point.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn boundary(&mut self, layer: LayerId, outline: &[Point]) -> io::Result<()> {
        self.event(boundary(layer, outline))
    }

    /// A rectangle as a polygon.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn rect(&mut self, layer: LayerId, rect: Rect) -> io::Result<()> {
        self.boundary(layer, &corners(rect))
    }

    /// A rectangle as a BOX element; the datatype is its boxtype.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn box_element(&mut self, layer: LayerId, rect: Rect) -> io::Result<()> {
        self.event(GdsEvent::Element(Element::Box(GdsBox {
            elflags: None,
            plex: None,
            layer: layer.layer as i16,
            boxtype: layer.datatype as i16,
            xy: coordinates(&corners(rect), true),
        })))
    }

    /// A path.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn path(&mut self, layer: LayerId, style: PathStyle, line: &[Point]) -> io::Result<()> {
        self.event(GdsEvent::Element(Element::Path(Path {
            elflags: None,
            plex: None,
            layer: layer.layer as i16,
            datatype: layer.datatype as i16,
            pathtype: Some(style.kind),
            width: Some(style.width),
            bgn_extn: style.extensions.map(|[begin, _]| begin),
            end_extn: style.extensions.map(|[_, end]| end),
            xy: coordinates(line, false),
        })))
    }

    /// A reference to a cell.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn sref(
        &mut self,
        cell: &str,
        orientation: Orientation,
        magnification: u32,
        at: Point,
    ) -> io::Result<()> {
        self.event(GdsEvent::Element(Element::Sref(Sref {
            elflags: None,
            plex: None,
            sname: cell,
            strans: strans(orientation, magnification),
            xy: coordinates(&[at], false),
        })))
    }

    /// An array of references: origin, end of the columns, end of the rows.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn aref(
        &mut self,
        cell: &str,
        orientation: Orientation,
        [columns, rows]: [i16; 2],
        points: [Point; 3],
    ) -> io::Result<()> {
        self.event(GdsEvent::Element(Element::Aref(Aref {
            elflags: None,
            plex: None,
            sname: cell,
            strans: strans(orientation, 1),
            colrow: (columns, rows),
            xy: coordinates(&points, false),
        })))
    }

    /// A text; its layer's datatype is the texttype.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn text(&mut self, layer: LayerId, at: Point, string: &str) -> io::Result<()> {
        self.event(GdsEvent::Element(Element::Text(Text {
            elflags: None,
            plex: None,
            layer: layer.layer as i16,
            texttype: layer.datatype as i16,
            presentation: None,
            pathtype: None,
            width: None,
            strans: None,
            xy: coordinates(&[at], false),
            string,
        })))
    }
}

fn corners(rect: Rect) -> [Point; 4] {
    let at = |x, y| Point { x, y };
    [
        rect.min,
        at(rect.max.x, rect.min.y),
        rect.max,
        at(rect.min.x, rect.max.y),
    ]
}
