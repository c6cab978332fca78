//! Rows, sentences and savings.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use crate::cli_support::*;
use crate::{Rows, UNDECIDED, column, refused_sweep, sweep, without_seconds};

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
