//! The grammar of elements: the records between BOUNDARY, PATH, ... and ENDEL, in any order.
//!
//! Real files order the records of an element freely (WIDTH before PATHTYPE, DATATYPE before LAYER,
//! ANGLE without MAG), so each may stand anywhere, once; only what does not belong is refused.

use super::problem::Problem;
use super::records::{Fault, Record, Records, kind};
use crate::geometry::Point;
use crate::layout::LayerId;

/// The records of one element that matter.
#[derive(Clone, Debug)]
pub(super) struct Element<'a> {
    /// The record that begins it.
    pub start: Record<'a>,
    /// Where ENDEL is.
    pub end: usize,
    layer: Option<Record<'a>>,
    /// DATATYPE, BOXTYPE, NODETYPE or TEXTTYPE.
    datatype: Option<Record<'a>>,
    xy: Option<Record<'a>>,
    /// Further XY records of one long point list.
    more_xy: Vec<Record<'a>>,
    pub pathtype: Option<Record<'a>>,
    pub width: Option<Record<'a>>,
    pub begin_extension: Option<Record<'a>>,
    pub end_extension: Option<Record<'a>>,
    sname: Option<Record<'a>>,
    pub strans: Option<Record<'a>>,
    pub mag: Option<Record<'a>>,
    pub angle: Option<Record<'a>>,
    colrow: Option<Record<'a>>,
    string: Option<Record<'a>>,
}

/// Whether a record begins an element.
pub(super) fn begins_element(record_kind: u8) -> bool {
    use kind::*;
    matches!(
        record_kind,
        BOUNDARY | PATH | SREF | AREF | TEXT | NODE | BOX
    )
}

impl<'a> Element<'a> {
    /// Reads the element that `start` begins, up to its ENDEL.
    pub(super) fn read(start: Record<'a>, records: &mut Records<'a>) -> Result<Element<'a>, Fault> {
        let mut element = Element {
            start,
            end: 0,
            layer: None,
            datatype: None,
            xy: None,
            more_xy: Vec::new(),
            pathtype: None,
            width: None,
            begin_extension: None,
            end_extension: None,
            sname: None,
            strans: None,
            mag: None,
            angle: None,
            colrow: None,
            string: None,
        };
        loop {
            let record = records.next("inside an element")?;
            if record.kind == kind::ENDEL {
                element.end = record.offset;
                return Ok(element);
            }
            element.take(record)?;
        }
    }

    fn take(&mut self, record: Record<'a>) -> Result<(), Fault> {
        if !belongs(self.start.kind, record.kind) {
            let problem = Problem::Unexpected {
                record: record.name(),
                place: place(self.start.kind),
                expected: "a record of this element, or ENDEL,",
            };
            return Err(problem.at(record.offset));
        }
        let slot = match record.kind {
            kind::LAYER => &mut self.layer,
            kind::DATATYPE | kind::BOXTYPE | kind::NODETYPE | kind::TEXTTYPE => &mut self.datatype,
            kind::PATHTYPE => &mut self.pathtype,
            kind::WIDTH => &mut self.width,
            kind::BGNEXTN => &mut self.begin_extension,
            kind::ENDEXTN => &mut self.end_extension,
            kind::SNAME => &mut self.sname,
            kind::STRANS => &mut self.strans,
            kind::MAG => &mut self.mag,
            kind::ANGLE => &mut self.angle,
            kind::COLROW => &mut self.colrow,
            kind::STRING => &mut self.string,
            kind::XY if self.xy.is_some() && takes_many_points(self.start.kind) => {
                self.more_xy.push(record);
                return Ok(());
            }
            kind::XY => &mut self.xy,
            _ => return Ok(()),
        };
        if slot.replace(record).is_some() {
            let problem = Problem::Repeated {
                record: record.name(),
                element: self.start.name(),
            };
            return Err(problem.at(record.offset));
        }
        Ok(())
    }

    /// A fault at the element's first byte.
    pub(super) fn wrong(&self, problem: Problem) -> Fault {
        problem.at(self.start.offset)
    }

    fn required(
        &self,
        slot: &Option<Record<'a>>,
        record: &'static str,
    ) -> Result<Record<'a>, Fault> {
        slot.ok_or_else(|| {
            self.wrong(Problem::MissingRecord {
                record,
                element: self.start.name(),
            })
        })
    }

    /// The layer of a drawn element, of a node or a text.
    pub(super) fn layer(&self) -> Result<LayerId, Fault> {
        let datatype = match self.start.kind {
            kind::BOX => "BOXTYPE",
            kind::NODE => "NODETYPE",
            kind::TEXT => "TEXTTYPE",
            _ => "DATATYPE",
        };
        // Numbers beyond 32767 are written as negative ones.
        Ok(LayerId {
            layer: self.required(&self.layer, "LAYER")?.i16()? as u16,
            datatype: self.required(&self.datatype, datatype)?.i16()? as u16,
        })
    }

    /// Replaces `points` by the element's points; those of several XY records are joined.
    pub(super) fn points(&self, points: &mut Vec<Point>) -> Result<(), Fault> {
        points.clear();
        points.extend(self.required(&self.xy, "XY")?.points()?);
        for record in &self.more_xy {
            points.extend(record.points()?);
        }
        Ok(())
    }

    /// The points of a reference: exactly `N`.
    pub(super) fn exactly<const N: usize>(
        &self,
        expected: &'static str,
    ) -> Result<[Point; N], Fault> {
        let record = self.required(&self.xy, "XY")?;
        let points: Vec<Point> = record.points()?.collect();
        let found = points.len();
        points.try_into().map_err(|_| {
            let element = self.start.name();
            Problem::Points {
                element,
                found,
                expected,
            }
            .at(record.offset)
        })
    }

    /// The name of the cell that a reference places.
    pub(super) fn placed_cell(&self) -> Result<&'a [u8], Fault> {
        self.required(&self.sname, "SNAME")?.cell_name()
    }

    /// What a text says.
    pub(super) fn string(&self) -> Result<&'a [u8], Fault> {
        self.required(&self.string, "STRING")?.text()
    }

    /// Columns and rows of a reference: 1 and 1 for an SREF.
    pub(super) fn array_size(&self) -> Result<[u16; 2], Fault> {
        if self.start.kind == kind::SREF {
            return Ok([1, 1]);
        }
        let record = self.required(&self.colrow, "COLROW")?;
        let [columns, rows] = record.two_i16()?;
        if columns < 1 || rows < 1 {
            return Err(Problem::ArraySize { columns, rows }.at(record.offset));
        }
        Ok([columns as u16, rows as u16])
    }
}

fn takes_many_points(element: u8) -> bool {
    matches!(element, kind::BOUNDARY | kind::PATH | kind::NODE)
}

fn place(element: u8) -> &'static str {
    match element {
        kind::BOUNDARY => "in a BOUNDARY",
        kind::PATH => "in a PATH",
        kind::SREF => "in an SREF",
        kind::AREF => "in an AREF",
        kind::TEXT => "in a TEXT",
        kind::NODE => "in a NODE",
        _ => "in a BOX",
    }
}

/// Whether a record may stand in an element.
fn belongs(element: u8, record: u8) -> bool {
    use kind::*;
    match record {
        ELFLAGS | PLEX | PROPATTR | PROPVALUE | XY | ELKEY | LINKTYPE | LINKKEYS => true,
        LAYER => !matches!(element, SREF | AREF),
        DATATYPE => matches!(element, BOUNDARY | PATH),
        BOXTYPE => element == BOX,
        NODETYPE => element == NODE,
        TEXTTYPE | PRESENTATION | STRING => element == TEXT,
        PATHTYPE | WIDTH => matches!(element, PATH | TEXT),
        BGNEXTN | ENDEXTN => element == PATH,
        SNAME => matches!(element, SREF | AREF),
        STRANS | MAG | ANGLE => matches!(element, SREF | AREF | TEXT),
        COLROW => element == AREF,
        _ => false,
    }
}
