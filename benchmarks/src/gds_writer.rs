//! Squares on one layer as a GDSII file: the few records that it takes, with fixed time stamps.
//!
//! Record numbers and layouts are those of the GDSII stream format manual, release 6.0 (Calma, 1987).

use crate::contact_array::Contact;
use std::io::{self, Write};

/// The name of the only cell.
pub const TOP: &str = "contact_array";

/// One nanometre in micrometres and in metres, as the format's real numbers: excess-64 exponent to
/// base 16, then 56 bits of mantissa.
const UNITS: [u64; 2] = [0x3E41_8937_4BC6_A7F0, 0x3944_B82F_A09B_5A54];

/// Writes squares of side `size` nanometres on `layer`, database unit 1 nm.
///
/// # Errors
/// Those of the writer.
pub fn write_squares(
    contacts: &[Contact],
    size: u32,
    layer: [u16; 2],
    out: &mut impl Write,
) -> io::Result<()> {
    let no_date = [0; 24];
    record(out, 0x0002, &600u16.to_be_bytes())?;
    record(out, 0x0102, &no_date)?;
    record(out, 0x0206, &padded(TOP))?;
    record(out, 0x0305, &UNITS.map(u64::to_be_bytes).concat())?;
    record(out, 0x0502, &no_date)?;
    record(out, 0x0606, &padded(TOP))?;
    for &Contact { x, y } in contacts {
        let (right, top) = (x + size as i32, y + size as i32);
        let corners = [x, y, right, y, right, top, x, top, x, y];
        record(out, 0x0800, &[])?;
        record(out, 0x0D02, &layer[0].to_be_bytes())?;
        record(out, 0x0E02, &layer[1].to_be_bytes())?;
        record(out, 0x1003, &corners.map(i32::to_be_bytes).concat())?;
        record(out, 0x1100, &[])?;
    }
    record(out, 0x0700, &[])?;
    record(out, 0x0400, &[])
}

fn record(out: &mut impl Write, kind: u16, data: &[u8]) -> io::Result<()> {
    out.write_all(&(data.len() as u16 + 4).to_be_bytes())?;
    out.write_all(&kind.to_be_bytes())?;
    out.write_all(data)
}

/// Strings have an even length, filled up with a NUL.
fn padded(text: &str) -> Vec<u8> {
    let mut bytes = text.as_bytes().to_vec();
    bytes.resize(bytes.len().next_multiple_of(2), 0);
    bytes
}
