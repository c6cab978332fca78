//! The coloured copy: the input's records as they are, and each mask's polygons on a layer of its own.
//!
//! The new BOUNDARY elements stand at the end of the top cell, so that they are in its coordinates.
//! Layers that anything in the file uses are refused beforehand. A polygon of more than 8,190 points,
//! its closing one counted, is written as several XY records, as such polygons are read. What follows
//! ENDLIB is padding and is not copied.

use super::element::Element;
use super::problem::Problem;
use super::records::{Fault, kind};
use super::walk::{Header, Visitor, walk};
use super::writer::boundary;
use crate::formats::{FormatError, Position};
use crate::geometry::Point;
use crate::layout::LayerId;
use gdsii::parser::GdsEvent;
use gdsii::writer::{GdsWriter, WriteError};
use std::io::{self, Write};
use std::ops::Range;

/// An input that may be coloured: the layers for the masks are free in it.
#[derive(Clone, Debug)]
pub struct Plan<'a> {
    bytes: &'a [u8],
    masks: &'a [LayerId],
    /// Where the top cell's ENDSTR is.
    end_of_top: Range<usize>,
    /// The first byte behind ENDLIB.
    end: usize,
}

impl<'a> Plan<'a> {
    /// Checks that no element of the unpacked stream `bytes` is on a layer of `masks`, texts and nodes
    /// included. To be called before the work whose outcome is to be written. `name` is the file's
    /// name, for errors; `top` the top cell as it was read.
    ///
    /// # Errors
    /// The first element on one of the layers, or the stream's first fault.
    pub fn new(
        bytes: &'a [u8],
        name: &str,
        top: &str,
        masks: &'a [LayerId],
    ) -> Result<Plan<'a>, FormatError> {
        let mut survey = Survey {
            top,
            masks,
            in_top: false,
            end_of_top: None,
        };
        let in_file = |fault: Fault| fault.in_file(name);
        let Header { end, .. } = walk(bytes, &mut survey, &|_, _| {}).map_err(in_file)?;
        let end_of_top = survey.end_of_top.ok_or_else(|| {
            let (asked, tops) = (top.to_owned(), "others".to_owned());
            FormatError::new(Position::file(name), Problem::NoSuchTop { asked, tops })
        })?;
        Ok(Plan {
            bytes,
            masks,
            end_of_top,
            end,
        })
    }

    /// Writes the copy with its polygons: the mask of each, 0 to K-1, and its outline without the
    /// closing point. The same calls give the same bytes. `out` should be buffered.
    ///
    /// # Errors
    /// Those of the writer; a mask without a layer is one of kind `InvalidInput`.
    pub fn write<P: AsRef<[Point]>>(
        &self,
        polygons: impl IntoIterator<Item = (u8, P)>,
        out: &mut impl Write,
    ) -> io::Result<()> {
        out.write_all(&self.bytes[..self.end_of_top.start])?;
        let mut writer = GdsWriter::new(&mut *out).with_multi_xy(true);
        for (mask, outline) in polygons {
            let layer = self.masks.get(usize::from(mask)).ok_or_else(|| {
                io::Error::new(
                    io::ErrorKind::InvalidInput,
                    "a mask without an output layer",
                )
            })?;
            let polygon = boundary(*layer, outline.as_ref());
            writer.write_event(&polygon).map_err(failed)?;
        }
        // The top cell's ENDSTR, which has no body, in place of the input's.
        writer
            .write_event(&GdsEvent::StructureEnd)
            .map_err(failed)?;
        out.write_all(&self.bytes[self.end_of_top.end..self.end])
    }
}

fn failed(error: WriteError) -> io::Error {
    match error {
        WriteError::Io(error) => error,
        other => io::Error::other(other),
    }
}

struct Survey<'s> {
    top: &'s str,
    masks: &'s [LayerId],
    in_top: bool,
    end_of_top: Option<Range<usize>>,
}

impl<'a> Visitor<'a> for Survey<'_> {
    fn begin_cell(&mut self, name: &'a [u8], _offset: usize) -> Result<(), Fault> {
        // Compared as shown, since that is how the name was given out.
        self.in_top = String::from_utf8_lossy(name) == self.top;
        Ok(())
    }

    fn element(&mut self, element: &Element<'a>) -> Result<(), Fault> {
        if matches!(element.start.kind, kind::SREF | kind::AREF) {
            return Ok(());
        }
        // A text without a layer is not read and occupies none.
        match element.layer() {
            Ok(layer) if self.masks.contains(&layer) => {
                Err(element.wrong(Problem::Occupied(layer)))
            }
            _ => Ok(()),
        }
    }

    fn end_cell(&mut self, end: Range<usize>) -> Result<(), Fault> {
        if self.in_top {
            self.end_of_top = Some(end);
        }
        Ok(())
    }
}
