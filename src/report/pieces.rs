//! `pieces.csv`: one row a piece, numbered from 1.

use std::io::{self, Write};

use super::Report;
use crate::layout::length::Micrometres;

const HEADER: &str = "piece,features,fragments,conflict_pairs,self_spacings,stitch_candidates,\
                      conflicts_lower,conflicts_upper,stitches_lower,stitches_upper,engine,same_as,\
                      x1_um,y1_um,x2_um,y2_um";

/// Writes the header and all rows. Cells that do not apply are empty: `same_as` for a piece that
/// equals no earlier one, coordinates for graphs.
pub fn write(report: &Report, out: &mut impl Write) -> io::Result<()> {
    let unit_pm = report.layer.as_ref().map_or(0, |layer| layer.unit_pm);
    writeln!(out, "{HEADER}")?;
    for (i, piece) in report.pieces.iter().enumerate() {
        let size = piece.counts;
        write!(
            out,
            "{},{},{},{},{},{},{},{},{},{},{},",
            i + 1,
            size.features,
            size.fragments,
            size.conflict_pairs,
            size.self_spacings,
            size.stitch_candidates,
            piece.conflicts.lower,
            piece.conflicts.upper,
            piece.stitches.lower,
            piece.stitches.upper,
            piece.engine,
        )?;
        if let Some(same) = piece.same_as {
            write!(out, "{}", u64::from(same) + 1)?;
        }
        match piece.place {
            None => writeln!(out, ",,,,")?,
            Some(place) => {
                for length in [place.min.x, place.min.y, place.max.x, place.max.y] {
                    write!(out, ",{}", Micrometres::new(length, unit_pm))?;
                }
                writeln!(out)?;
            }
        }
    }
    Ok(())
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::report::samples;

    #[test]
    fn every_row_has_a_cell_for_every_column() {
        let mut out = Vec::new();
        write(&samples::layer(), &mut out).unwrap();
        let text = String::from_utf8(out).unwrap();
        let rows: Vec<Vec<&str>> = text.lines().map(|line| line.split(',').collect()).collect();
        assert!(rows.iter().all(|row| row.len() == rows[0].len()));
        let cell = |row: usize, name| {
            let column = rows[0].iter().position(|&column| column == name).unwrap();
            rows[row][column]
        };
        assert_eq!((cell(1, "same_as"), cell(2, "same_as")), ("", "1"));
        assert_eq!((cell(1, "x1_um"), cell(2, "x1_um")), ("-0.17", ""));
        assert_eq!(cell(2, "piece"), "2");
        assert_eq!(cell(1, "conflicts_upper"), "3");
    }
}
