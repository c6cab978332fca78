//! The record walk: a stream is records of two bytes length, a type, a data type and a body.
//!
//! Bodies are viewed in place by the crate `gdsii`, whose record types name them. The walk itself is
//! ours: the crate's ends silently at a record type that it does not know (LIBDIRSIZE, STRCLASS and
//! others in real files), its errors carry no offset, and its grammar is narrower than real files.

use super::problem::Problem;
use crate::formats::error::{FormatError, Position};
use crate::geometry::Point;
use gdsii::reader::RecordBody;
use gdsii::types::{DataType, GdsPoint, RecordType};

/// A problem at a byte, on its way up to where the file's name is known.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Fault {
    pub offset: usize,
    pub cell: Option<String>,
    pub problem: Problem,
}

impl Fault {
    pub(super) fn in_cell(mut self, cell: &[u8]) -> Fault {
        self.cell.get_or_insert_with(|| shown(cell));
        self
    }

    pub(super) fn in_file(self, name: &str) -> FormatError {
        let position = Position::byte(name, self.offset as u64);
        let position = match &self.cell {
            Some(cell) => position.in_cell(cell),
            None => position,
        };
        FormatError::new(position, self.problem)
    }
}

/// A cell's name for people; bytes that are not UTF-8 are replaced.
pub(super) fn shown(name: &[u8]) -> String {
    String::from_utf8_lossy(name).into_owned()
}

/// Names the record types as constants, and for messages.
macro_rules! kinds {
    ($($constant:ident = $code:expr, $name:literal;)*) => {
        /// The record types.
        pub(super) mod kind {
            use super::RecordType;
            $(pub const $constant: u8 = $code;)*
        }
        /// The name of a record type.
        pub(super) fn kind_name(kind: u8) -> Option<&'static str> {
            $(if kind == kind::$constant { return Some($name); })*
            None
        }
    };
}

kinds! {
    HEADER = RecordType::Header as u8, "HEADER";
    BGNLIB = RecordType::BgnLib as u8, "BGNLIB";
    LIBNAME = RecordType::LibName as u8, "LIBNAME";
    UNITS = RecordType::Units as u8, "UNITS";
    ENDLIB = RecordType::EndLib as u8, "ENDLIB";
    BGNSTR = RecordType::BgnStr as u8, "BGNSTR";
    STRNAME = RecordType::StrName as u8, "STRNAME";
    ENDSTR = RecordType::EndStr as u8, "ENDSTR";
    BOUNDARY = RecordType::Boundary as u8, "BOUNDARY";
    PATH = RecordType::Path as u8, "PATH";
    SREF = RecordType::Sref as u8, "SREF";
    AREF = RecordType::Aref as u8, "AREF";
    TEXT = RecordType::Text as u8, "TEXT";
    LAYER = RecordType::Layer as u8, "LAYER";
    DATATYPE = RecordType::Datatype as u8, "DATATYPE";
    WIDTH = RecordType::Width as u8, "WIDTH";
    XY = RecordType::Xy as u8, "XY";
    ENDEL = RecordType::Endel as u8, "ENDEL";
    SNAME = RecordType::Sname as u8, "SNAME";
    COLROW = RecordType::Colrow as u8, "COLROW";
    TEXTNODE = 0x14, "TEXTNODE";
    NODE = RecordType::Node as u8, "NODE";
    TEXTTYPE = RecordType::TextType as u8, "TEXTTYPE";
    PRESENTATION = RecordType::Presentation as u8, "PRESENTATION";
    SPACING = 0x18, "SPACING";
    STRING = RecordType::String as u8, "STRING";
    STRANS = RecordType::Strans as u8, "STRANS";
    MAG = RecordType::Mag as u8, "MAG";
    ANGLE = RecordType::Angle as u8, "ANGLE";
    UINTEGER = 0x1d, "UINTEGER";
    USTRING = 0x1e, "USTRING";
    REFLIBS = RecordType::Reflibs as u8, "REFLIBS";
    FONTS = RecordType::Fonts as u8, "FONTS";
    PATHTYPE = RecordType::Pathtype as u8, "PATHTYPE";
    GENERATIONS = RecordType::Generations as u8, "GENERATIONS";
    ATTRTABLE = RecordType::Attrtable as u8, "ATTRTABLE";
    STYPTABLE = 0x24, "STYPTABLE";
    STRTYPE = 0x25, "STRTYPE";
    ELFLAGS = RecordType::Elflags as u8, "ELFLAGS";
    ELKEY = 0x27, "ELKEY";
    LINKTYPE = 0x28, "LINKTYPE";
    LINKKEYS = 0x29, "LINKKEYS";
    NODETYPE = RecordType::Nodetype as u8, "NODETYPE";
    PROPATTR = RecordType::Propattr as u8, "PROPATTR";
    PROPVALUE = RecordType::Propvalue as u8, "PROPVALUE";
    BOX = RecordType::Box as u8, "BOX";
    BOXTYPE = RecordType::BoxType as u8, "BOXTYPE";
    PLEX = RecordType::Plex as u8, "PLEX";
    BGNEXTN = RecordType::BgnExtn as u8, "BGNEXTN";
    ENDEXTN = RecordType::EndExtn as u8, "ENDEXTN";
    TAPENUM = RecordType::TapeNum as u8, "TAPENUM";
    TAPECODE = RecordType::TapeCode as u8, "TAPECODE";
    STRCLASS = 0x34, "STRCLASS";
    RESERVED = 0x35, "RESERVED";
    FORMAT = RecordType::Format as u8, "FORMAT";
    MASK = RecordType::Mask as u8, "MASK";
    ENDMASKS = RecordType::EndMasks as u8, "ENDMASKS";
    LIBDIRSIZE = 0x39, "LIBDIRSIZE";
    SRFNAME = 0x3a, "SRFNAME";
    LIBSECUR = 0x3b, "LIBSECUR";
}

/// One record, in place.
#[derive(Clone, Copy, Debug)]
pub(super) struct Record<'a> {
    /// Its first byte in the stream.
    pub offset: usize,
    /// Its type, one of [`kind`].
    pub kind: u8,
    data_type: u8,
    data: &'a [u8],
}

impl<'a> Record<'a> {
    /// The record's name.
    pub(super) fn name(&self) -> &'static str {
        kind_name(self.kind).unwrap_or("?")
    }

    /// The first byte behind the record.
    pub(super) fn end(&self) -> usize {
        self.offset + 4 + self.data.len()
    }

    fn wrong(&self, expected: &'static str) -> Fault {
        let problem = Problem::Body {
            record: self.name(),
            found: self.data.len(),
            data_type: self.data_type,
            expected,
        };
        problem.at(self.offset)
    }

    /// The body as the crate views it, if it is of this data type.
    fn body(&self, data_type: DataType) -> Option<RecordBody<'a>> {
        let same = self.data_type == data_type as u8;
        same.then(|| RecordBody::try_from((data_type, self.data)).ok())
            .flatten()
    }

    /// One two-byte integer.
    pub(super) fn i16(&self) -> Result<i16, Fault> {
        match self.body(DataType::TwoByteSignedInt) {
            Some(RecordBody::TwoByteSignedInt([value])) => Ok(value.get()),
            _ => Err(self.wrong("one two-byte integer (2 bytes of type 2)")),
        }
    }

    /// Two two-byte integers.
    pub(super) fn two_i16(&self) -> Result<[i16; 2], Fault> {
        match self.body(DataType::TwoByteSignedInt) {
            Some(RecordBody::TwoByteSignedInt([a, b])) => Ok([a.get(), b.get()]),
            _ => Err(self.wrong("two two-byte integers (4 bytes of type 2)")),
        }
    }

    /// One four-byte integer.
    pub(super) fn i32(&self) -> Result<i32, Fault> {
        match self.body(DataType::FourByteSignedInt) {
            Some(RecordBody::FourByteSignedInt([value])) => Ok(value.get()),
            _ => Err(self.wrong("one four-byte integer (4 bytes of type 3)")),
        }
    }

    /// Two bytes of flags.
    pub(super) fn flags(&self) -> Result<u16, Fault> {
        match self.body(DataType::BitArray) {
            Some(RecordBody::BitArray([value])) => Ok(value.get()),
            _ => Err(self.wrong("two bytes of flags (2 bytes of type 1)")),
        }
    }

    /// Points.
    pub(super) fn points(&self) -> Result<impl ExactSizeIterator<Item = Point> + use<'a>, Fault> {
        match self.body(DataType::FourByteSignedInt) {
            Some(RecordBody::FourByteSignedInt(numbers)) if numbers.len() % 2 == 0 => {
                Ok(GdsPoint::iter_xy(numbers).map(|p| Point { x: p.x, y: p.y }))
            }
            _ => Err(self.wrong("pairs of four-byte integers (8 bytes of type 3 each)")),
        }
    }

    /// The raw bytes of `N` eight-byte reals.
    pub(super) fn reals<const N: usize>(&self) -> Result<[[u8; 8]; N], Fault> {
        let right = match self.body(DataType::EightByteReal) {
            Some(RecordBody::EightByteReal(reals)) => {
                let raw: Vec<[u8; 8]> = reals.iter().map(|real| real.raw()).collect();
                raw.try_into().ok()
            }
            _ => None,
        };
        right.ok_or_else(|| {
            self.wrong(match N {
                1 => "one eight-byte real (8 bytes of type 5)",
                _ => "two eight-byte reals (16 bytes of type 5)",
            })
        })
    }

    /// A cell's name, padding stripped. Any bytes will do: real files are not always UTF-8.
    pub(super) fn cell_name(&self) -> Result<&'a [u8], Fault> {
        match self.text()? {
            [] => Err(Problem::EmptyName(self.name()).at(self.offset)),
            name => Ok(name),
        }
    }

    /// A text, padding stripped.
    pub(super) fn text(&self) -> Result<&'a [u8], Fault> {
        if self.data_type != DataType::AsciiString as u8 {
            return Err(self.wrong("text (type 6)"));
        }
        let padding = self
            .data
            .iter()
            .rev()
            .take_while(|&&byte| byte == 0)
            .count();
        Ok(&self.data[..self.data.len() - padding])
    }
}

/// The records of a stream from some byte on.
#[derive(Clone, Debug)]
pub(super) struct Records<'a> {
    bytes: &'a [u8],
    offset: usize,
}

impl<'a> Records<'a> {
    /// The records from the byte `offset` on.
    pub(super) fn at(bytes: &'a [u8], offset: usize) -> Records<'a> {
        Records { bytes, offset }
    }

    /// The next record. `place` says where the stream is, should it end here.
    pub(super) fn next(&mut self, place: &'static str) -> Result<Record<'a>, Fault> {
        let offset = self.offset;
        let rest = self.bytes.get(offset..).unwrap_or_default();
        let Some((&[high, low, kind, data_type], behind)) = rest.split_first_chunk::<4>() else {
            return Err(Problem::NoEnd(place).at(offset));
        };
        let length = u16::from_be_bytes([high, low]);
        if length < 4 || length % 2 != 0 {
            return Err(Problem::RecordLength(length).at(offset));
        }
        let length = usize::from(length);
        let Some(data) = behind.get(..length - 4) else {
            let available = rest.len();
            return Err(Problem::Truncated { length, available }.at(offset));
        };
        if kind_name(kind).is_none() {
            return Err(Problem::UnknownRecord(kind).at(offset));
        }
        self.offset += length;
        Ok(Record {
            offset,
            kind,
            data_type,
            data,
        })
    }
}
