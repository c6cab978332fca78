//! `maskproof sweep` as users run it: its rows against runs of `solve`, its table, its file, its refusals.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use cli_support::*;

const UNDECIDED: i32 = 4;

/// The rows of a sweep's file, each by its columns' names.
type Rows = Vec<BTreeMap<String, String>>;

fn rows(file: &Path) -> Rows {
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

fn without_seconds(mut rows: Rows) -> Rows {
    for row in &mut rows {
        assert!(row.remove("seconds").is_some());
    }
    rows
}

/// Runs a sweep in `dir` that writes `sweep.csv` there.
fn sweep(dir: &Path, args: &[&str], code: i32) -> (String, Rows) {
    let run = run(dir, &[&["sweep"], args, &["--out", "sweep.csv"]].concat());
    assert_eq!(run.code, code, "{args:?}: {}", run.stderr);
    assert_eq!(run.stderr, "");
    assert!(run.stdout.ends_with("\nwritten to sweep.csv\n"));
    (run.stdout, rows(&dir.join("sweep.csv")))
}

/// What `solve` says of one combination: sizes, bounds, verdict.
fn solved(dir: &Path, input: &str, layer: &[&str], row: &BTreeMap<String, String>) -> Vec<String> {
    let mut args = vec!["solve", input, "--masks", &row["masks"]];
    let um = |name: &str| format!("{}um", row[name]);
    let lengths = ["spacing_um", "overlap_um", "fragment_length_um"].map(um);
    if !layer.is_empty() {
        args.extend(layer);
        args.extend(["--spacing", &lengths[0], "--stitch", &row["stitch"]]);
    }
    if !row["overlap_um"].is_empty() {
        args.extend(["--overlap", &lengths[1], "--fragment-length", &lengths[2]]);
    }
    args.extend(["--out", "solved", "--no-certificate"]);
    let run = run(dir, &args);
    assert!(run.code == 0 || run.code == 1, "{args:?}: {}", run.stderr);
    let result = result(&dir.join("solved"));
    let number = |value: &serde_json::Value| value.as_u64().unwrap().to_string();
    let mut cells: Vec<String> = SIZES.map(|name| number(&result[name])).to_vec();
    for bounds in ["conflicts", "stitches"] {
        cells.extend(["lower", "upper"].map(|end| number(&result[bounds][end])));
    }
    cells.push(result["verdict"].as_str().unwrap().to_owned());
    cells
}

const SIZES: [&str; 5] = [
    "features",
    "fragments",
    "stitch_candidates",
    "conflict_pairs",
    "self_spacings",
];

/// The same cells of a row.
fn cells(row: &BTreeMap<String, String>) -> Vec<String> {
    let bounds = [
        "conflicts_lower",
        "conflicts_upper",
        "stitches_lower",
        "stitches_upper",
        "verdict",
    ];
    let names = SIZES.iter().chain(&bounds);
    names.map(|&name| row[name].clone()).collect()
}

/// Each row is what a run of its own finds; the rows are all combinations in order.
fn agrees(dir: &Path, input: &str, layer: &[&str], rows: &Rows) {
    for row in rows {
        assert_eq!(cells(row), solved(dir, input, layer, row), "{row:?}");
        assert_eq!(row["stopped_by"], "");
        assert!(row["seconds"].parse::<f64>().unwrap() >= 0.0);
    }
}

fn column<'a>(rows: &'a Rows, name: &str) -> Vec<&'a str> {
    rows.iter().map(|row| row[name].as_str()).collect()
}

/// Five squares, 100 nm wide and apart: gaps of 100, 300, 500 and 700 nm, so 4 pairs at 150 nm, 4 + 3 at 350 nm and
/// 4 + 3 + 2 at 550 nm.
///
/// At 350 nm and two masks, each of the triangles 123, 234 and 345 needs a conflict; no pair is in all
/// three, so there are at least two, and masks 1-1-2-2-1 have two. At 550 nm all are close but 1 and 5: two masks
/// hold three and two squares, 3 + 1 pairs, less one where 1 and 5 share a mask; with three masks the four squares
/// 1234 need a conflict, and 2-3 is in 2345 as well; four masks do.
#[test]
fn a_row_of_squares_needs_one_mask_more_for_each_neighbour() {
    let dir = place();
    let dir = dir.path();
    let layer = ["--layer", "1/0"];
    let args = [
        "row.gds",
        "--layer",
        "1/0",
        "--masks",
        "4,2,3",
        "--spacing",
        "150,0.35um,550 nm",
    ];
    let (text, rows) = sweep(dir, &args, 0);
    assert_eq!(column(&rows, "masks"), ["2", "3", "4"].repeat(3));
    let spacings = ["0.15", "0.35", "0.55"].map(|spacing| [spacing; 3]);
    assert_eq!(column(&rows, "spacing_um"), spacings.concat());
    assert_eq!(
        column(&rows, "conflict_pairs"),
        [["4"; 3], ["7"; 3], ["9"; 3]].concat()
    );
    let conflicts = [["0", "0", "0"], ["2", "0", "0"], ["3", "1", "0"]].concat();
    assert_eq!(column(&rows, "conflicts_upper"), conflicts);
    assert_eq!(column(&rows, "overlap_um"), [""; 9]);
    agrees(dir, "row.gds", &layer, &rows);
    assert!(
        text.starts_with("row.gds: layer 1/0 of top, 9 combinations\n5 features\n"),
        "{text}"
    );
    for answer in [
        "  0.15 um, none: 2 masks are enough\n",
        "  0.35 um, none: 3 masks are needed: with 2, 2 conflicts cannot be avoided\n",
        "  0.55 um, none: 4 masks are needed: with 3, 1 conflict cannot be avoided\n",
    ] {
        assert!(text.contains(answer), "{answer}: {text}");
    }
}

#[test]
fn savings_are_priced_without_rounding() {
    let dir = place();
    // 0.05 for two conflicts saved; the fourth mask saves none.
    let args = [
        "row.gds",
        "--layer",
        "1/0",
        "--masks",
        "2,3,4",
        "--spacing",
        "350",
        "--mask-cost",
        "0.5e-1",
    ];
    let (text, rows) = sweep(dir.path(), &args, 0);
    assert_eq!(column(&rows, "conflicts_saved"), ["", "2", "0"]);
    assert_eq!(column(&rows, "stitches_saved"), ["", "0", "0"]);
    assert_eq!(column(&rows, "mask_cost"), ["", "0.05", "0.05"]);
    assert_eq!(column(&rows, "cost_per_conflict_saved"), ["", "0.025", ""]);
    assert!(text.contains("one more mask costs 0.05\n"), "{text}");
    assert!(text.contains("conflicts saved  stitches saved"), "{text}");
}

#[test]
fn rows_of_the_routed_block_are_those_of_single_runs() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::copy(routed(), dir.join("block.gds")).unwrap();
    let layer = ["--layer", "68/20", "--corner", "40"];
    let lists = [
        "--masks",
        "2,3",
        "--spacing",
        "480,500",
        "--stitch",
        "none,uncovered,every-interval",
        "--overlap",
        "40",
        "--fragment",
        "100,140",
    ];
    let args = [&["block.gds"], &layer[..], &lists[..]].concat();
    let (text, rows) = sweep(dir, &args, 0);
    // Two spacings, with one row for none and two fragment lengths for the other two policies, over two numbers.
    assert_eq!(rows.len(), 2 * (1 + 2 + 2) * 2);
    agrees(dir, "block.gds", &layer, &rows);
    assert!(text.contains("how many masks\n  0.48 um, none: "), "{text}");
    assert!(
        text.contains("what the stitch policy loses against every-interval\n"),
        "{text}"
    );
    // The least numbers of conflicts at 500 nm without stitches are known by RC2: `tests/audit_routed.rs`.
    let known: Vec<&str> = rows
        .iter()
        .filter(|row| row["spacing_um"] == "0.5" && row["stitch"] == "none")
        .map(|row| row["conflicts_upper"].as_str())
        .collect();
    assert_eq!(known, ["58", "3"]);
}

#[test]
fn a_graph_varies_in_its_masks_only() {
    let dir = place();
    let dir = dir.path();
    let (text, rows) = sweep(dir, &["k3.col", "--masks", "2,3"], 0);
    assert_eq!(column(&rows, "conflicts_upper"), ["1", "0"]);
    assert_eq!(column(&rows, "stitch"), ["", ""]);
    agrees(dir, "k3.col", &[], &rows);
    assert!(
        text.contains("\n  3 masks are needed: with 2, 1 conflict cannot be avoided\n"),
        "{text}"
    );
    let wrong = ["k3.col", "--masks", "2,3", "--spacing", "100"];
    refused_sweep(dir, &wrong, USAGE, &["--spacing: k3.col is a graph"]);
}

#[test]
fn rules_of_a_file_are_the_defaults() {
    let dir = place();
    let rules = "layer = \"1/0\"\nmasks = 2\nspacing = \"350 nm\"\n";
    fs::write(dir.path().join("rules.toml"), rules).unwrap();
    let (_, rows) = sweep(
        dir.path(),
        &["row.gds", "--rules", "rules.toml", "--masks", "3,2"],
        0,
    );
    assert_eq!(column(&rows, "spacing_um"), ["0.35"; 2]);
    assert_eq!(column(&rows, "conflicts_upper"), ["2", "0"]);
    let (_, rows) = sweep(
        dir.path(),
        &["row.gds", "--rules", "rules.toml", "--spacing", "150"],
        0,
    );
    assert_eq!(column(&rows, "masks"), ["2"]);
    assert_eq!(column(&rows, "conflicts_upper"), ["0"]);
}

/// What is fixed by hand is fixed under every number of masks, and looked at again for each.
#[test]
fn masks_by_hand_hold_in_every_row() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    // Two squares 50 nm apart, both fixed on mask 1 by their layer, and one 50 nm away on the layer itself.
    let fixed = [
        boundary(1, 1, [0, 0, 100, 100]),
        boundary(1, 1, [150, 0, 250, 100]),
    ]
    .concat();
    let top = [fixed, boundary(1, 0, [300, 0, 400, 100])].concat();
    fs::write(dir.join("fixed.gds"), gds(&[("top", top)])).unwrap();
    let rules = "layer = \"1/0\"\nspacing = \"100 nm\"\n[[fixed]]\nlayer = \"1/1\"\nmask = 1\n";
    fs::write(dir.join("rules.toml"), rules).unwrap();
    let layer = ["--rules", "rules.toml"];
    let args = ["fixed.gds", "--rules", "rules.toml", "--masks", "2,3"];
    let (text, rows) = sweep(dir, &args, 0);
    assert_eq!(column(&rows, "conflicts_upper"), ["1", "1"]);
    agrees(dir, "fixed.gds", &layer, &rows);
    assert!(
        text.contains("more than 3 masks are needed: with 3, 1 conflict"),
        "{text}"
    );
    let rules = rules.replace("mask = 1", "mask = 3");
    fs::write(dir.join("rules.toml"), rules).unwrap();
    refused_sweep(dir, &args, BAD_INPUT, &["rules.toml:5:", "mask 3"]);
}

#[test]
fn rows_do_not_depend_on_threads() {
    let dir = tempfile::tempdir().unwrap();
    let input = routed();
    let one_and_many = ["1", "2", "5"].map(|threads| {
        let args = [
            input.to_str().unwrap(),
            "--layer",
            "69/20",
            "--masks",
            "2,3",
            "--spacing",
            "400,600",
            "--stitch",
            "none,uncovered",
            "--overlap",
            "40",
            "--threads",
            threads,
        ];
        without_seconds(sweep(dir.path(), &args, 0).1)
    });
    assert_eq!(one_and_many[0].len(), 8);
    assert_eq!(one_and_many[0], one_and_many[1]);
    assert_eq!(one_and_many[0], one_and_many[2]);
}

#[test]
fn a_limit_of_zero_keeps_true_bounds() {
    let dir = tempfile::tempdir().unwrap();
    let input = routed();
    let args = [
        input.to_str().unwrap(),
        "--layer",
        "67/20",
        "--masks",
        "3,8",
        "--spacing",
        "250",
        "--time-limit",
        "0",
    ];
    let (text, rows) = sweep(dir.path(), &args, UNDECIDED);
    let bound = |name: &str| rows[0][name].parse::<u64>().unwrap();
    // 35 is the least number of conflicts (RC2 over CaDiCaL).
    assert!(bound("conflicts_lower") <= 35 && 35 <= bound("conflicts_upper"));
    assert_eq!(column(&rows, "verdict"), ["undecided", "decomposable"]);
    assert_eq!(column(&rows, "stopped_by"), ["time limit", ""]);
    assert_eq!(column(&rows, "conflicts_saved"), ["", ""]);
    assert!(text.contains("undecided: time limit"), "{text}");
}

/// Runs a sweep that is refused: one line, no file, an earlier one as it was.
fn refused_sweep(dir: &Path, args: &[&str], code: i32, said: &[&str]) {
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

#[test]
fn wrong_values_are_refused_with_their_option() {
    let dir = place();
    let dir = dir.path();
    let with = |more: &[&'static str]| [&["row.gds", "--layer", "1/0"], more].concat();
    let usage: [(&[&str], &[&str]); 14] = [
        (
            &["--masks", "2,x", "--spacing", "150"],
            &["--masks", "\"x\"", "whole number"],
        ),
        (
            &["--masks", "2,,3", "--spacing", "150"],
            &["--masks", "whole number"],
        ),
        (&["--masks", "2,9", "--spacing", "150"], &["--masks", "9"]),
        (&["--masks", "1,2", "--spacing", "150"], &["--masks", "1"]),
        (
            &["--masks", "2,3,2", "--spacing", "150"],
            &["--masks: 2 is listed twice"],
        ),
        (
            &["--masks", "2", "--spacing", "250,0.25um"],
            &["--spacing: 250 nm is listed twice"],
        ),
        (
            &["--masks", "2", "--spacing", "150,-1"],
            &["--spacing", "\"-1\"", "no length"],
        ),
        (
            &["--masks", "2", "--spacing", "150,0"],
            &["--spacing: spacing is 0"],
        ),
        (
            &["--masks", "2", "--spacing", "150,0.1"],
            &["--spacing", "0.1 nm", "database units"],
        ),
        (
            &[
                "--masks",
                "2",
                "--spacing",
                "150",
                "--stitch",
                "none,covered",
            ],
            &["--stitch", "did you mean \"uncovered\""],
        ),
        (
            &[
                "--masks",
                "2",
                "--spacing",
                "150",
                "--stitch",
                "uncovered",
                "--overlap",
                "40,25",
            ],
            &["--overlap", "25 nm"],
        ),
        (
            &["--masks", "2", "--spacing", "150", "--mask-cost", "-1"],
            &["--mask-cost", "price above 0"],
        ),
        (&["--masks", "2"], &["spacing", "--spacing"]),
        (&["--spacing", "150"], &["number of masks", "--masks"]),
    ];
    for (more, said) in usage {
        refused_sweep(dir, &with(more), USAGE, said);
    }
    let absent = [
        "row.gds",
        "--layer",
        "9/9",
        "--masks",
        "2",
        "--spacing",
        "150",
    ];
    refused_sweep(dir, &absent, BAD_INPUT, &["9/9", "1/0"]);
}

#[test]
fn the_file_replaces_an_earlier_sweep_and_nothing_else() {
    let dir = place();
    let dir = dir.path();
    let args = |out| {
        [
            "sweep",
            "row.gds",
            "--layer",
            "1/0",
            "--masks",
            "2",
            "--spacing",
            "150",
            "--out",
            out,
        ]
    };
    for out in ["new/place", "new/place", "table.csv", "table.csv", "."] {
        assert_eq!(run(dir, &args(out)).code, 0, "{out}");
    }
    assert_eq!(
        names(dir),
        ["k3.col", "new", "row.gds", "sweep.csv", "table.csv"]
    );
    assert_eq!(names(&dir.join("new/place")), ["sweep.csv"]);
    assert_eq!(rows(&dir.join("table.csv")).len(), 1);
    fs::write(dir.join("table.csv"), "a,b\n").unwrap();
    let run = run(dir, &args("table.csv"));
    assert_eq!(run.code, USAGE);
    assert_eq!(
        run.stderr,
        "maskproof: --out: table.csv: exists and is no earlier sweep: name a new file\n"
    );
    assert_eq!(fs::read_to_string(dir.join("table.csv")).unwrap(), "a,b\n");
}

/// The first signal ends the search that is under way; rows before it stand, those after it are not begun.
#[cfg(unix)]
#[test]
fn a_signal_keeps_the_rows_so_far() {
    use std::process::{Command, Stdio};
    use std::thread::sleep;
    use std::time::Duration;
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    // A graph that no exact method colours in the time of a test: the very first row is cut short.
    fs::write(dir.join("hard.col"), random_col(400, 3)).unwrap();
    let args = [
        "sweep",
        "hard.col",
        "--masks",
        "5,6,7",
        "--out",
        "out.csv",
        "--time-limit",
        "600",
    ];
    let mut command = program(dir, &args);
    let child = command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    sleep(Duration::from_millis(2500));
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
    let run = finished(child.wait_with_output().unwrap());
    assert_eq!(run.code, UNDECIDED, "{}", run.stderr);
    assert!(
        run.stdout
            .contains("stopped by an interrupt: 2 combinations of 3 not begun\n"),
        "{}",
        run.stdout
    );
    let rows = rows(&dir.join("out.csv"));
    assert_eq!(column(&rows, "masks"), ["5", "6", "7"]);
    assert_eq!(column(&rows, "verdict"), ["undecided"; 3]);
    assert_eq!(column(&rows, "stopped_by"), ["interrupt"; 3]);
    let bound = |name: &str| rows[0][name].parse::<u64>().unwrap();
    assert!(bound("conflicts_lower") < bound("conflicts_upper"));
    assert_eq!(column(&rows, "features"), ["400", "", ""]);
    assert_eq!(column(&rows, "conflicts_upper")[1..], ["", ""]);
}

/// A signal before there is a row leaves nothing.
#[cfg(unix)]
#[test]
fn a_signal_while_reading_ends_with_nothing() {
    use std::process::{Command, Stdio};
    use std::thread::sleep;
    use std::time::Duration;
    const STOPPED: i32 = 130;
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let made = Command::new("mkfifo").arg(dir.join("slow.col")).status();
    assert!(made.unwrap().success());
    // Nobody writes into the pipe: reading waits for ever.
    let mut command = program(
        dir,
        &["sweep", "slow.col", "--masks", "2,3", "--out", "out.csv"],
    );
    let child = command
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    sleep(Duration::from_millis(700));
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
    let run = finished(child.wait_with_output().unwrap());
    assert_eq!(run.code, STOPPED, "{}", run.stderr);
    assert_eq!(run.stderr, "maskproof: stopped; nothing was written\n");
    assert_eq!(names(dir), ["slow.col"]);
}
