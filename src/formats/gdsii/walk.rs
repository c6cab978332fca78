//! The grammar of a library: a header, cells of elements, ENDLIB; padding may follow.

use super::element::{Element, begins_element};
use super::problem::Problem;
use super::real8::Real8;
use super::records::{Fault, Record, Records, kind};
use std::ops::Range;

/// How many bytes are read between two reports of progress.
const REPORT_EVERY: usize = 1 << 20;

/// Whoever is told what a library holds, in the order of the file.
pub(super) trait Visitor<'a> {
    /// A cell begins, with its BGNSTR at `offset`.
    fn begin_cell(&mut self, name: &'a [u8], offset: usize) -> Result<(), Fault>;
    /// An element of the cell.
    fn element(&mut self, element: &Element<'a>) -> Result<(), Fault>;
    /// The cell ends, with its ENDSTR in these bytes.
    fn end_cell(&mut self, end: Range<usize>) -> Result<(), Fault>;
}

/// What the library says of itself.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Header {
    /// One database unit, in picometres.
    pub unit_pm: u64,
    /// The first byte behind ENDLIB.
    pub end: usize,
}

/// Walks a whole library. `progress` is told bytes done and bytes in all.
pub(super) fn walk<'a>(
    bytes: &'a [u8],
    visitor: &mut impl Visitor<'a>,
    progress: &dyn Fn(u64, u64),
) -> Result<Header, Fault> {
    let mut records = Records::at(bytes, 0);
    let unit_pm = header(&mut records, bytes)?;
    let mut report_at = REPORT_EVERY;
    loop {
        let record = records.next("outside a cell, before ENDLIB")?;
        match record.kind {
            kind::ENDLIB => {
                progress(bytes.len() as u64, bytes.len() as u64);
                let end = record.end();
                return Ok(Header { unit_pm, end });
            }
            kind::BGNSTR => {
                let start = record.offset;
                let mut inside = |offset: usize| {
                    if offset >= report_at {
                        progress(offset as u64, bytes.len() as u64);
                        report_at = offset + REPORT_EVERY;
                    }
                };
                cell(start, &mut records, visitor, &mut inside)?;
            }
            _ => return Err(unexpected(record, "between cells", "BGNSTR or ENDLIB")),
        }
    }
}

fn unexpected(record: Record<'_>, place: &'static str, expected: &'static str) -> Fault {
    let problem = Problem::Unexpected {
        record: record.name(),
        place,
        expected,
    };
    problem.at(record.offset)
}

/// Reads HEADER to UNITS and returns the database unit in picometres.
fn header(records: &mut Records<'_>, bytes: &[u8]) -> Result<u64, Fault> {
    if !bytes.starts_with(&super::SIGNATURE) {
        return Err(Problem::NoHeader.at(0));
    }
    records.next("in the library header")?.i16()?;
    let mut begun = false;
    loop {
        use kind::*;
        let record = records.next("in the library header")?;
        match record.kind {
            BGNLIB => begun = true,
            UNITS if begun => return unit(record),
            LIBNAME | LIBDIRSIZE | SRFNAME | LIBSECUR | REFLIBS | FONTS | ATTRTABLE | STYPTABLE
            | GENERATIONS | FORMAT | MASK | ENDMASKS | TAPENUM | TAPECODE | RESERVED => {}
            _ => {
                let expected = if begun { "UNITS" } else { "BGNLIB" };
                return Err(unexpected(record, "in the library header", expected));
            }
        }
    }
}

fn unit(record: Record<'_>) -> Result<u64, Fault> {
    let [_, metres] = record.reals::<2>()?;
    let metres = Real8::new(metres);
    metres
        .trillionths()
        .ok_or_else(|| Problem::Unit(metres.to_string()).at(record.offset))
}

/// Reads a cell from behind its BGNSTR to its ENDSTR.
fn cell<'a>(
    start: usize,
    records: &mut Records<'a>,
    visitor: &mut impl Visitor<'a>,
    inside: &mut impl FnMut(usize),
) -> Result<(), Fault> {
    let record = records.next("where a cell begins")?;
    if record.kind != kind::STRNAME {
        return Err(unexpected(record, "where a cell begins", "STRNAME"));
    }
    let name = record.cell_name()?;
    visitor.begin_cell(name, start)?;
    elements(records, visitor, inside).map_err(|fault| fault.in_cell(name))
}

fn elements<'a>(
    records: &mut Records<'a>,
    visitor: &mut impl Visitor<'a>,
    inside: &mut impl FnMut(usize),
) -> Result<(), Fault> {
    loop {
        let record = records.next("inside a cell")?;
        match record.kind {
            kind::ENDSTR => return visitor.end_cell(record.offset..record.end()),
            kind::STRCLASS | kind::STRTYPE => {}
            other if begins_element(other) => {
                inside(record.offset);
                visitor.element(&Element::read(record, records)?)?;
            }
            _ => return Err(unexpected(record, "inside a cell", "an element or ENDSTR")),
        }
    }
}
