//! `sweep.csv`: one row a combination. Every number in it is a whole one or an exact decimal, but the seconds and
//! a quotient of the price.

use std::io::{self, Write};

use super::{Row, Sweep};

/// The name of the file.
pub const FILE: &str = "sweep.csv";

/// How the file begins: the mark by which an earlier one is known.
pub const MARK: &str = "masks,spacing_um,stitch,overlap_um,fragment_length_um,";

const COLUMNS: &str = "features,fragments,stitch_candidates,conflict_pairs,self_spacings,\
                       conflicts_lower,conflicts_upper,stitches_lower,stitches_upper,verdict,stopped_by,\
                       conflicts_saved,stitches_saved,mask_cost,cost_per_conflict_saved,seconds";

/// How many cells the sizes, the bounds and the verdict take.
const FOUND: usize = 11;

/// Writes the header and all rows. Cells that do not apply or are not known are empty.
pub fn write(sweep: &Sweep, out: &mut impl Write) -> io::Result<()> {
    writeln!(out, "{MARK}{COLUMNS}")?;
    for (i, row) in sweep.rows.iter().enumerate() {
        let mut cells = rules(sweep, row);
        cells.extend(found(row));
        cells.extend(saved(sweep, i));
        let seconds = row.found.map(|found| seconds(found.time));
        cells.push(seconds.unwrap_or_default());
        writeln!(out, "{}", cells.join(","))?;
    }
    Ok(())
}

fn rules(sweep: &Sweep, row: &Row) -> Vec<String> {
    let mut cells = vec![row.masks.to_string()];
    match row.setting {
        None => cells.resize(5, String::new()),
        Some(setting) => {
            cells.push(sweep.um(setting.spacing).to_string());
            cells.push(setting.policy.name().to_owned());
            match setting.stitch {
                None => cells.resize(5, String::new()),
                Some(lengths) => cells.extend(lengths.map(|length| sweep.um(length).to_string())),
            }
        }
    }
    cells
}

fn found(row: &Row) -> Vec<String> {
    let mut cells = Vec::new();
    match row.found {
        None => cells.resize(FOUND - 2, String::new()),
        Some(found) => {
            let counts = found.counts;
            let numbers = [
                counts.features,
                counts.fragments,
                counts.stitch_candidates,
                counts.conflict_pairs,
                counts.self_spacings,
                found.conflicts.lower,
                found.conflicts.upper,
                found.stitches.lower,
                found.stitches.upper,
            ];
            cells.extend(numbers.map(|number| number.to_string()));
        }
    }
    let stop = row.stop().map_or("", |stop| stop.as_str());
    cells.extend([row.verdict().as_str().to_owned(), stop.to_owned()]);
    cells
}

/// What the row saves against one mask less, and at what price.
fn saved(sweep: &Sweep, row: usize) -> [String; 4] {
    let Some(saved) = sweep.saved(row) else {
        return Default::default();
    };
    [
        saved.conflicts.to_string(),
        saved.stitches.to_string(),
        sweep
            .mask_cost
            .map(|cost| cost.to_string())
            .unwrap_or_default(),
        sweep.price_per_conflict(row).unwrap_or_default(),
    ]
}

/// Microseconds: a clock tells no more.
fn seconds(time: std::time::Duration) -> String {
    format!("{}.{:06}", time.as_secs(), time.subsec_micros())
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::report::sweep::samples;

    fn cells(sweep: &Sweep) -> Vec<Vec<String>> {
        let mut out = Vec::new();
        write(sweep, &mut out).unwrap();
        let text = String::from_utf8(out).unwrap();
        let row = |line: &str| line.split(',').map(str::to_owned).collect();
        text.lines().map(row).collect()
    }

    #[test]
    fn every_row_has_a_cell_for_every_column() {
        for sweep in [samples::layer(), samples::graph()] {
            let cells = cells(&sweep);
            assert_eq!(cells.len(), sweep.rows.len() + 1);
            assert!(cells.iter().all(|row| row.len() == cells[0].len()));
        }
    }

    #[test]
    fn cells_say_what_the_rows_hold() {
        let cells = cells(&samples::layer());
        let cell = |row: usize, name| {
            let column = cells[0].iter().position(|column| column == name).unwrap();
            cells[row][column].as_str()
        };
        assert_eq!((cell(1, "spacing_um"), cell(1, "stitch")), ("0.5", "none"));
        assert_eq!((cell(1, "overlap_um"), cell(3, "overlap_um")), ("", "0.04"));
        assert_eq!(
            (cell(1, "conflicts_saved"), cell(2, "conflicts_saved")),
            ("", "48")
        );
        assert_eq!(
            (cell(2, "mask_cost"), cell(2, "cost_per_conflict_saved")),
            ("1500000", "31250")
        );
        assert_eq!(
            (cell(4, "stitches_saved"), cell(4, "seconds")),
            ("-3", "0.250000")
        );
        // The row that was stopped proves nothing, so it saves nothing either.
        assert_eq!(
            (cell(6, "stopped_by"), cell(6, "conflicts_saved")),
            ("time limit", "")
        );
        // The one that was not begun.
        assert_eq!(
            (cell(7, "verdict"), cell(7, "stopped_by")),
            ("undecided", "interrupt")
        );
        assert_eq!((cell(7, "features"), cell(7, "seconds")), ("", ""));
    }
}
