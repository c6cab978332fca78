//! The table on the terminal: what all rows share is said once above it.

use std::fmt::Write as _;
use std::path::Path;

use super::answers;
use super::{Row, Sweep};
use crate::report::Stop;
use crate::report::summary::{grouped, plural, seconds};
use crate::solve::Bounds;

/// Where a cell stands in its column.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Side {
    Left,
    Right,
}

/// A column: heading, side and cells.
type Column = (&'static str, Side, Vec<String>);

/// The table and the answers, the last line ended. `out` is where the file is.
pub fn text(sweep: &Sweep, out: Option<&Path>) -> String {
    let mut text = heading(sweep);
    text.push('\n');
    lay_out(&columns(sweep), &mut text);
    if let Some(stopped) = stopped(sweep) {
        let _ = writeln!(text, "\n{stopped}");
    }
    answers::add(sweep, &mut text);
    if let Some(out) = out {
        let _ = writeln!(text, "\nwritten to {}", out.display());
    }
    text
}

/// The input, how many combinations there are, and the rules that are the same in all of them.
fn heading(sweep: &Sweep) -> String {
    let what = match &sweep.layer {
        None => "graph".to_owned(),
        Some(layer) => format!("layer {} of {}", layer.layer, layer.top),
    };
    let combinations = plural(sweep.rows.len() as u64, "combination");
    let mut text = format!("{}: {what}, {combinations}\n", sweep.input);
    let mut shared = Vec::new();
    if let Some(found) = sweep.rows.iter().find_map(|row| row.found) {
        shared.push(plural(found.counts.features, "feature"));
    }
    for (i, name) in ["overlap", "fragment length"].into_iter().enumerate() {
        if let [length] = stitch_lengths(sweep, i)[..] {
            shared.push(format!("{name} {} um", sweep.um(length)));
        }
    }
    if let Some(cost) = &sweep.mask_cost {
        shared.push(format!("one more mask costs {cost}"));
    }
    let _ = writeln!(text, "{}", shared.join(", "));
    text
}

/// The different overlaps (0) or fragment lengths (1), in the order of the rows.
pub(super) fn stitch_lengths(sweep: &Sweep, which: usize) -> Vec<i32> {
    let mut lengths = Vec::new();
    for setting in sweep.rows.iter().filter_map(|row| row.setting) {
        if let Some(stitch) = setting.stitch
            && !lengths.contains(&stitch[which])
        {
            lengths.push(stitch[which]);
        }
    }
    lengths
}

fn columns(sweep: &Sweep) -> Vec<Column> {
    let rows = &sweep.rows;
    let each = |tell: &dyn Fn(&Row) -> String| rows.iter().map(tell).collect::<Vec<_>>();
    let count = |tell: &dyn Fn(&super::Found) -> u64| {
        each(&|row| {
            row.found
                .map_or(String::new(), |found| grouped(tell(&found)))
        })
    };
    let mut columns: Vec<Column> = Vec::new();
    let mut add = |name, side, cells| columns.push((name, side, cells));
    add("masks", Side::Right, each(&|row| row.masks.to_string()));
    if sweep.layer.is_some() {
        add("spacing um", Side::Right, each(&|row| spacing(sweep, row)));
        add("stitch policy", Side::Left, each(&policy));
        for (i, name) in ["overlap um", "fragment um"].into_iter().enumerate() {
            if stitch_lengths(sweep, i).len() > 1 {
                add(name, Side::Right, each(&|row| stitch_length(sweep, row, i)));
            }
        }
    }
    add(
        "fragments",
        Side::Right,
        count(&|found| found.counts.fragments),
    );
    let candidates = count(&|found| found.counts.stitch_candidates);
    add("candidates", Side::Right, candidates);
    let pairs = count(&|found| found.counts.conflict_pairs);
    add("conflict pairs", Side::Right, pairs);
    add(
        "conflicts",
        Side::Right,
        each(&|row| bounds(row, |found| found.conflicts)),
    );
    add(
        "stitches",
        Side::Right,
        each(&|row| bounds(row, |found| found.stitches)),
    );
    add("verdict", Side::Left, each(&verdict));
    let time = |row: &Row| row.found.map_or(String::new(), |found| seconds(found.time));
    add("time", Side::Right, each(&time));
    if sweep.mask_cost.is_some() {
        for (name, cells) in savings(sweep) {
            add(name, Side::Right, cells);
        }
    }
    columns
}

fn spacing(sweep: &Sweep, row: &Row) -> String {
    let setting = row.setting.as_ref();
    setting.map_or(String::new(), |setting| {
        sweep.um(setting.spacing).to_string()
    })
}

fn policy(row: &Row) -> String {
    row.setting
        .map_or("", |setting| setting.policy.name())
        .to_owned()
}

fn stitch_length(sweep: &Sweep, row: &Row, which: usize) -> String {
    let lengths = row.setting.and_then(|setting| setting.stitch);
    lengths.map_or(String::new(), |lengths| {
        sweep.um(lengths[which]).to_string()
    })
}

fn bounds(row: &Row, tell: impl Fn(&super::Found) -> Bounds) -> String {
    match row.found.as_ref().map(tell) {
        None => String::new(),
        Some(bounds) if bounds.is_tight() => grouped(bounds.upper),
        Some(bounds) => format!("{}..{}", grouped(bounds.lower), grouped(bounds.upper)),
    }
}

fn verdict(row: &Row) -> String {
    let verdict = row.verdict().as_str();
    match (row.found, row.stop()) {
        (None, _) => "not begun".to_owned(),
        (_, None) => verdict.to_owned(),
        (_, Some(stop)) => format!("{verdict}: {}", stop.as_str()),
    }
}

/// What each row saves against one mask less.
fn savings(sweep: &Sweep) -> [(&'static str, Vec<String>); 3] {
    let rows = || 0..sweep.rows.len();
    let saved = |tell: fn(super::Saved) -> i64| {
        let cell = |row| {
            sweep
                .saved(row)
                .map_or(String::new(), |saved| tell(saved).to_string())
        };
        rows().map(cell).collect()
    };
    let price = |row| sweep.price_per_conflict(row).unwrap_or_default();
    [
        ("conflicts saved", saved(|saved| saved.conflicts)),
        ("stitches saved", saved(|saved| saved.stitches)),
        ("cost per conflict", rows().map(price).collect()),
    ]
}

/// The columns side by side, two blanks between them.
fn lay_out(columns: &[Column], text: &mut String) {
    let rows = columns.first().map_or(0, |column| column.2.len());
    let width = |(name, _, cells): &Column| {
        let cells = cells.iter().map(String::len);
        cells.chain([name.len()]).max().unwrap_or(0)
    };
    let widths: Vec<usize> = columns.iter().map(width).collect();
    for row in 0..=rows {
        let mut line = String::new();
        for ((name, side, cells), &width) in columns.iter().zip(&widths) {
            let cell = match row.checked_sub(1) {
                None => name,
                Some(row) => cells[row].as_str(),
            };
            let _ = match side {
                Side::Left => write!(line, "  {cell:<width$}"),
                Side::Right => write!(line, "  {cell:>width$}"),
            };
        }
        let _ = writeln!(text, "{}", line.trim_end());
    }
}

/// That a signal came before the end.
fn stopped(sweep: &Sweep) -> Option<String> {
    let interrupted = |row: &Row| row.stop() == Some(Stop::Interrupt);
    if !sweep.rows.iter().any(interrupted) {
        return None;
    }
    let left = plural(sweep.left_out() as u64, "combination");
    Some(format!(
        "stopped by an interrupt: {left} of {} not begun",
        sweep.rows.len()
    ))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sweep::samples;

    #[test]
    fn the_table_is_as_drawn() {
        let text = text(&samples::layer(), Some(Path::new("out/sweep.csv")));
        let table = "\
block.gds: layer 68/20 of top, 7 combinations
1,000 features, overlap 0.04 um, fragment length 0.1 um, one more mask costs 1500000

  masks  spacing um  stitch policy   fragments  candidates  conflict pairs  conflicts  stitches  verdict                    time  conflicts saved  stitches saved  cost per conflict
      2         0.5  none                1,200         200             481         58         0  not decomposable         0.25 s
      3         0.5  none                1,200         200             481         10         0  not decomposable         0.25 s               48               0         31250
      2         0.5  uncovered           1,200         200             481         50         8  not decomposable         0.25 s
      3         0.5  uncovered           1,200         200             481          0        11  decomposable             0.25 s               50              -3         30000
      2         0.5  every-interval      1,200         200             481         48         9  not decomposable         0.25 s
      3         0.5  every-interval      1,200         200             481       0..2     0..12  undecided: time limit    0.25 s
      4         0.5  every-interval                                                               not begun

stopped by an interrupt: 1 combination of 7 not begun";
        let squeezed = |text: &str| text.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(squeezed(&text).starts_with(&squeezed(table)), "{text}");
        assert!(text.lines().all(|line| line == line.trim_end()));
        assert!(text.ends_with("\nwritten to out/sweep.csv\n"));
        // Right-aligned columns end where their headings end.
        let lines: Vec<&str> = text.lines().skip(3).take(8).collect();
        let end = lines[0]
            .find("conflict pairs")
            .map(|at| at + "conflict pairs".len());
        assert!(lines[1..7].iter().all(|line| {
            line.get(..end.unwrap_or(0))
                .is_some_and(|line| line.ends_with("  481"))
        }));
    }
}
