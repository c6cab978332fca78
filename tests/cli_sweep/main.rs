//! `maskproof sweep` as users run it: its rows against runs of `solve`, its table, its file, its refusals.
#![allow(clippy::unwrap_used, clippy::expect_used)]

#[path = "../cli_support/mod.rs"]
mod cli_support;
mod refusals;
mod rows;
#[cfg(unix)]
mod stop;

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use cli_support::*;

/// The exit code where a limit left something open.
pub const UNDECIDED: i32 = 4;

/// The rows of a sweep's file, each by its columns' names.
pub type Rows = Vec<BTreeMap<String, String>>;

/// Reads a sweep's file.
pub fn rows(file: &Path) -> Rows {
    let text = fs::read_to_string(file).unwrap();
    assert!(text.ends_with('\n'));
    let mut lines = text.lines().map(|line| line.split(',').map(str::to_owned));
    let names: Vec<String> = lines.next().unwrap().collect();
    lines
        .map(|cells| {
            let cells: Vec<String> = cells.collect();
            assert_eq!(cells.len(), names.len());
            names.iter().cloned().zip(cells).collect()
        })
        .collect()
}

/// What is the same from run to run.
pub fn without_seconds(mut rows: Rows) -> Rows {
    for row in &mut rows {
        assert!(row.remove("seconds").is_some());
    }
    rows
}

/// Runs a sweep in `dir` that writes `sweep.csv` there.
pub fn sweep(dir: &Path, args: &[&str], code: i32) -> (String, Rows) {
    let run = run(dir, &[&["sweep"], args, &["--out", "sweep.csv"]].concat());
    assert_eq!(run.code, code, "{args:?}: {}", run.stderr);
    assert_eq!(run.stderr, "");
    assert!(run.stdout.ends_with("\nwritten to sweep.csv\n"));
    (run.stdout, rows(&dir.join("sweep.csv")))
}

/// Runs a sweep that is refused: one line, no file, an earlier one as it was.
pub fn refused_sweep(dir: &Path, args: &[&str], code: i32, said: &[&str]) {
    let before = names(dir);
    let run = run(dir, &[&["sweep"], args, &["--out", "new.csv"]].concat());
    let shown = format!("{args:?}: code {}, stderr {}", run.code, run.stderr);
    assert_eq!(run.code, code, "{shown}");
    assert!(run.stderr.starts_with("maskproof: "), "{shown}");
    assert_eq!(run.stderr.lines().count(), 1, "{shown}");
    for part in said {
        assert!(run.stderr.contains(part), "{part:?} is missing: {shown}");
    }
    assert_eq!(run.stdout, "", "{shown}");
    assert_eq!(names(dir), before, "{shown}");
}

/// The cells of a column, top to bottom.
pub fn column<'a>(rows: &'a Rows, name: &str) -> Vec<&'a str> {
    rows.iter().map(|row| row[name].as_str()).collect()
}
