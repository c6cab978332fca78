//! What is refused, and what the file replaces.

use std::fs;

use crate::cli_support::*;
use crate::{column, refused_sweep, rows, sweep};

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
    // A file stands where a directory would have to be made.
    let run_into_file = run(dir, &args("row.gds/new/sweep.csv"));
    assert_eq!(run_into_file.code, USAGE, "{}", run_into_file.stderr);
    assert_eq!(run_into_file.stdout, "");
    fs::write(dir.join("table.csv"), "a,b\n").unwrap();
    let run = run(dir, &args("table.csv"));
    assert_eq!(run.code, USAGE);
    assert_eq!(
        run.stderr,
        "maskproof: --out: table.csv: exists and is no earlier sweep: name a new file\n"
    );
    assert_eq!(fs::read_to_string(dir.join("table.csv")).unwrap(), "a,b\n");
}

/// Three squares that must all differ cannot on two masks, whatever three say.
#[test]
fn a_contradiction_names_its_number_of_masks() {
    let dir = place();
    let dir = dir.path();
    let set = "points = [[\"0 nm\", \"0 nm\"], [\"200 nm\", \"0 nm\"], [\"400 nm\", \"0 nm\"]]\n";
    let rules = format!("layer = \"1/0\"\nspacing = \"150 nm\"\n[[different_masks]]\n{set}");
    fs::write(dir.join("rules.toml"), rules).unwrap();
    let args = |masks| ["row.gds", "--rules", "rules.toml", "--masks", masks];
    let said = [
        "with 2 masks: ",
        "3 features",
        "must all be on different masks",
    ];
    refused_sweep(dir, &args("2,3"), BAD_INPUT, &said);
    let (_, rows) = sweep(dir, &args("3,4"), 0);
    // A path: no conflict, with or without the set.
    assert_eq!(column(&rows, "conflicts_upper"), ["0", "0"]);
}
