//! `solve --start` and `--keep`, as users run them: what is said of the start, what is changed, what is refused.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use cli_support::*;
use serde_json::{Value, json};
use std::fs;
use std::path::Path;

/// Squares of the row (100 wide, 100 apart) on the masks given, from the left; 0 leaves one out.
fn row_on(masks: &[u16]) -> Vec<u8> {
    let squares = masks.iter().zip(0i32..).filter(|&(&mask, _)| mask > 0);
    let squares =
        squares.map(|(mask, i)| boundary(1, 100 + mask, [i * 200, 0, i * 200 + 100, 100]));
    gds(&[("top", squares.collect::<Vec<_>>().concat())])
}

fn row_with(start: &[u8]) -> tempfile::TempDir {
    let dir = place();
    fs::write(dir.path().join("start.gds"), start).unwrap();
    dir
}

fn solve(dir: &Path, args: &[&str], code: i32) -> (Run, Value) {
    let run = run(dir, &[&["solve"], args, &["--out", "out"]].concat());
    assert_eq!(
        (run.code, run.stderr.as_str()),
        (code, ""),
        "{args:?}: {}",
        run.stdout
    );
    (run, result(&dir.join("out")))
}

fn solve_row(masks: &[u16], more: &[&str], code: i32) -> (tempfile::TempDir, Run, Value) {
    let dir = row_with(&row_on(masks));
    let args = with_rules("row.gds", &[&["--start", "start.gds"], more].concat());
    let (run, result) = solve(dir.path(), &args, code);
    (dir, run, result)
}

fn accepted(dir: &Path, input: &str) -> String {
    let run = run(dir, &["audit", "out", "--input", input]);
    assert_eq!(run.code, 0, "{}{}", run.stdout, run.stderr);
    run.stdout
}

fn cost(value: &Value) -> (u64, u64) {
    let number = |name: &str| value[name].as_u64().unwrap();
    (number("conflicts"), number("stitches"))
}

#[test]
fn an_optimal_start_is_the_answer() {
    for more in [&[][..], &["--keep"]] {
        for masks in [[1, 2, 1, 2, 1], [2, 1, 2, 1, 2]] {
            let (dir, run, result) = solve_row(&masks, more, 0);
            assert_eq!(cost(&result["start"]), (0, 0));
            assert_eq!(result["start_differences"], json!([]));
            assert!(
                run.stdout
                    .contains("start start.gds: 0 conflicts, 0 stitches\n")
            );
            // Each mask as in the start: three squares of 10,000 square nm and two.
            let first = result["mask_use"][0]["fragments"].as_u64().unwrap();
            assert_eq!(first, if masks[0] == 1 { 3 } else { 2 });
            if !more.is_empty() {
                assert_eq!(result["keep"]["changed_features"], 0);
                assert_eq!(result["keep"]["proven"], true);
                assert_eq!(result["keep_places"], json!([]));
                assert!(run.stdout.contains("it fails nowhere"));
            }
            accepted(dir.path(), "row.gds");
        }
    }
}

#[test]
fn a_worse_start_is_told_beside_the_answer() {
    let (dir, run, result) = solve_row(&[1, 1, 2, 1, 2], &[], 0);
    assert_eq!(cost(&result["start"]), (1, 0));
    assert_eq!(result["conflicts"], json!({"lower": 0, "upper": 0}));
    let differences = result["start_differences"].as_array().unwrap();
    assert_eq!(differences.len(), 1);
    assert_eq!(differences[0]["kind"], "conflict pair");
    // Between the first two squares: x from 0.1 to 0.2 um.
    assert_eq!(differences[0]["near_um"], json!([0.1, 0, 0.2, 0.1]));
    assert!(
        run.stdout
            .contains("start start.gds: 1 conflict, 0 stitches")
    );
    assert!(result.get("keep").is_none());
    accepted(dir.path(), "row.gds");
}

/// The third square is on mask 2, so of the first two only the first one can change.
#[test]
fn keeping_changes_one_feature_of_the_place() {
    let (dir, run, result) = solve_row(&[1, 1, 2, 1, 2], &["--keep"], 0);
    assert_eq!(cost(&result["start"]), (1, 0));
    assert_eq!(cost(&result["keep"]), (0, 0));
    assert_eq!(result["keep"]["changed_features"], 1);
    let place = &result["keep_places"][0];
    assert_eq!(place["features"].as_array().unwrap().len(), 2);
    assert_eq!(
        (cost(&place["start"]), cost(&place["kept"])),
        ((1, 0), (0, 0))
    );
    assert_eq!(place["changed"].as_array().unwrap().len(), 1);
    assert!(
        run.stdout
            .contains("1 feature changed, the fewest possible")
    );
    assert!(run.stdout.contains("keeping the rest fixed costs nothing"));
    // The last three squares are where they were: the whole drawing is masks 2, 1, 2, 1, 2.
    let again = with_rules(
        "row.gds",
        &[
            "--start",
            "out/coloured.gds",
            "--keep",
            "--datatypes",
            "201,202",
            "--start-datatypes",
            "102,101",
        ],
    );
    fs::copy(
        dir.path().join("out/coloured.gds"),
        dir.path().join("kept.gds"),
    )
    .unwrap();
    let again: Vec<&str> = again
        .iter()
        .map(|a| {
            if *a == "out/coloured.gds" {
                "kept.gds"
            } else {
                a
            }
        })
        .collect();
    let (_, other) = solve(dir.path(), &again, 0);
    assert_eq!(cost(&other["start"]), (0, 0));
    assert_eq!(other["mask_use"][0]["fragments"], 3);
    accepted(dir.path(), "row.gds");
}

/// Masks 1 2 2 1 2: both squares in the middle have a neighbour on mask 1.
#[test]
fn a_place_that_cannot_be_made_better_is_said_to_be_so() {
    let (dir, run, result) = solve_row(&[1, 2, 2, 1, 2], &["--keep"], 4);
    assert_eq!(result["verdict"], "undecided");
    assert_eq!(result["stopped_by"], "keep");
    assert_eq!(result["conflicts"], json!({"lower": 0, "upper": 1}));
    assert_eq!(cost(&result["keep"]), (1, 0));
    assert_eq!(result["keep"]["changed_features"], 0);
    assert_eq!(result["keep"]["proven"], true);
    assert_eq!(
        result["keep"]["free_conflicts"],
        json!({"lower": 0, "upper": 0})
    );
    assert_eq!(
        result["keep"]["free_stitches"],
        json!({"lower": 0, "upper": 0})
    );
    assert_eq!(result["unresolved"].as_array().unwrap().len(), 1);
    assert!(
        run.stdout
            .contains("1 place cannot be made better with all else fixed")
    );
    assert!(run.stdout.contains("keeping the rest fixed costs 1 more conflict: the least possible where nothing is fixed is 0 conflicts, 0 stitches"));
    accepted(dir.path(), "row.gds");
}

#[test]
fn starts_that_are_no_colouring_are_refused() {
    let squares = |more: Vec<u8>| {
        let row = [1, 2, 1, 2, 1].iter().zip(0i32..);
        let row =
            row.flat_map(|(mask, i)| boundary(1, 100 + mask, [i * 200, 0, i * 200 + 100, 100]));
        gds(&[("top", row.chain(more).collect())])
    };
    let half = |mask: u16, x: i32| boundary(1, 100 + mask, [x, 0, x + 50, 100]);
    let halves = [half(1, 0), half(2, 50)].concat();
    let rest =
        (1..5).flat_map(|i| boundary(1, 102 - (i as u16 & 1), [i * 200, 0, i * 200 + 100, 100]));
    let split = gds(&[("top", halves.into_iter().chain(rest).collect())]);
    let mut other_grid = row_on(&[1, 2, 1, 2, 1]);
    let nanometre = [0x39, 0x44, 0xb8, 0x2f, 0xa0, 0x9b, 0x5a, 0x54];
    let at = other_grid
        .windows(8)
        .position(|bytes| bytes == nanometre)
        .unwrap();
    // Twice the mantissa: 2 nm.
    other_grid[at + 1..at + 8].copy_from_slice(&[0x89, 0x70, 0x5f, 0x41, 0x36, 0xb4, 0xa8]);
    let other_top = gds(&[("other", boundary(1, 101, [0, 0, 100, 100]))]);
    let cases: [(Vec<u8>, &[&str]); 9] = [
        (
            row_on(&[1, 2, 0, 2, 1]),
            &["start.gds: feature 2 is on no mask from (0.4, 0) to (0.5, 0.1) um"],
        ),
        (
            squares(boundary(1, 102, [0, 0, 100, 100])),
            &["is on mask 1 and mask 2 from (0, 0) to (0.1, 0.1) um"],
        ),
        (
            squares(boundary(1, 102, [1000, 0, 1100, 100])),
            &["mask 2 is drawn from (1, 0) to (1.1, 0.1) um, where the layer has nothing"],
        ),
        (
            squares(boundary(1, 101, [50, 0, 160, 100])),
            &["mask 1 is drawn from (0.1, 0) to (0.16, 0.1) um"],
        ),
        (
            split,
            &[
                "changes between mask 1 and mask 2",
                "policy `none` has no candidate",
                "draw the feature on one mask",
            ],
        ),
        (
            other_grid,
            &["one database unit is 2000 pm, but row.gds has 1000 pm"],
        ),
        (other_top, &["start.gds", "no cell \"top\""]),
        (row_of_squares(), &["start.gds", "1/101"]),
        (b"no layout".to_vec(), &["start.gds", "byte 0"]),
    ];
    for (start, said) in cases {
        let dir = row_with(&start);
        refused(
            dir.path(),
            &with_rules("row.gds", &["--start", "start.gds"]),
            BAD_INPUT,
            said,
        );
    }
    let dir = place();
    refused(
        dir.path(),
        &with_rules("row.gds", &["--start", "none.gds"]),
        BAD_INPUT,
        &["none.gds"],
    );
    refused(
        dir.path(),
        &with_rules("row.gds", &["--keep"]),
        USAGE,
        &["--start"],
    );
    let with_start = ["--start", "row.gds", "--start-datatypes", "7"];
    refused(
        dir.path(),
        &with_rules("row.gds", &with_start),
        USAGE,
        &["--start-datatypes"],
    );
}

/// A bar with a neighbour above each of its ends, 100 nm away: at 150 nm their shadows on it end at
/// 300 + 111.8 and 700 - 111.8, so the only stitch is at 500.
fn bar() -> Vec<u8> {
    let shapes = [[0, 0, 1000, 100], [0, 200, 300, 300], [700, 200, 1000, 300]];
    gds(&[(
        "top",
        shapes
            .into_iter()
            .flat_map(|rect| boundary(1, 0, rect))
            .collect(),
    )])
}

const STITCHES: [&str; 8] = [
    "--stitch",
    "uncovered",
    "--overlap",
    "40",
    "--fragment-length",
    "100",
    "--corner",
    "40",
];

/// The left part of the bar on mask 1 up to `left`, the right one on mask 2 from `right`; each neighbour differs.
fn bar_on(left: i32, right: i32) -> tempfile::TempDir {
    let shapes = [
        boundary(1, 101, [0, 0, left, 100]),
        boundary(1, 102, [right, 0, 1000, 100]),
        boundary(1, 102, [0, 200, 300, 300]),
        boundary(1, 101, [700, 200, 1000, 300]),
    ];
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("bar.gds"), bar()).unwrap();
    fs::write(
        dir.path().join("start.gds"),
        gds(&[("top", shapes.concat())]),
    )
    .unwrap();
    dir
}

fn bar_args<'a>(more: &[&'a str]) -> Vec<&'a str> {
    with_rules(
        "bar.gds",
        &[&STITCHES[..], &["--start", "start.gds"], more].concat(),
    )
}

#[test]
fn stitches_of_a_start_are_read_and_counted() {
    let dir = bar_on(520, 480);
    let (_, found) = solve(dir.path(), &bar_args(&[]), 0);
    assert_eq!(cost(&found["start"]), (0, 1));
    assert_eq!(found["stitches"], json!({"lower": 0, "upper": 0}));
    let differences = found["start_differences"].as_array().unwrap();
    assert_eq!(differences.len(), 1);
    assert_eq!(differences[0]["kind"], "stitch");
    assert_eq!(differences[0]["at_um"], json!([0.48, 0, 0.52, 0.1]));
    // No conflict, so nothing fails: keeping it costs the stitch.
    let (run, kept) = solve(dir.path(), &bar_args(&["--keep"]), 4);
    assert_eq!(kept["stitches"], json!({"lower": 0, "upper": 1}));
    assert_eq!(kept["stopped_by"], "keep");
    assert_eq!(cost(&kept["keep"]), (0, 1));
    assert_eq!(kept["keep"]["changed_features"], 0);
    assert!(run.stdout.contains("costs 1 more in stitches"));
    accepted(dir.path(), "bar.gds");
}

#[test]
fn stitches_that_are_none_are_refused() {
    for (left, right, said) in [
        (
            470,
            430,
            "policy `uncovered` has no candidate: draw it on one mask there, or allow the stitch by policy `listed`",
        ),
        (
            500,
            500,
            "has a stitch that mask 1 lacks from (0.5, 0) to (0.52, 0.1) um",
        ),
        (
            560,
            480,
            "is on mask 2 and mask 1 from (0.52, 0) to (0.56, 0.1) um",
        ),
    ] {
        let dir = bar_on(left, right);
        refused(dir.path(), &bar_args(&[]), BAD_INPUT, &[said]);
    }
}

/// The whole bar is fixed on mask 2 by its layer, and drawn on mask 1 by the start.
#[test]
fn a_start_may_break_what_is_fixed() {
    let dir = tempfile::tempdir().unwrap();
    let layer = [
        boundary(1, 5, [0, 0, 100, 100]),
        boundary(1, 0, [200, 0, 300, 100]),
    ];
    let start = [
        boundary(1, 101, [0, 0, 100, 100]),
        boundary(1, 102, [200, 0, 300, 100]),
    ];
    fs::write(dir.path().join("two.gds"), gds(&[("top", layer.concat())])).unwrap();
    fs::write(
        dir.path().join("start.gds"),
        gds(&[("top", start.concat())]),
    )
    .unwrap();
    let args = with_rules("two.gds", &["--fixed", "1/5=2", "--start", "start.gds"]);
    let (run, found) = solve(dir.path(), &args, 0);
    assert_eq!(found["start"]["forbidden"], 1);
    assert_eq!(found["start"]["broken_ties"], 0);
    assert!(
        run.stdout
            .contains("it is not legal: 1 fragment on a mask not allowed")
    );
    // With the other square fixed on mask 2, the two conflict.
    let (_, kept) = solve(dir.path(), &[&args[..], &["--keep"]].concat(), 4);
    assert_eq!(cost(&kept["keep"]), (1, 0));
    assert_eq!(kept["keep"]["changed_features"], 1);
    accepted(dir.path(), "two.gds");
}

fn colouring(dir: &Path, masks: u8, colours: &[u8]) {
    let text =
        json!({"format": "maskproof-colouring", "version": 1, "masks": masks, "colours": colours});
    fs::write(dir.join("start.json"), text.to_string()).unwrap();
}

#[test]
fn graphs_begin_with_a_colouring() {
    let dir = place();
    let dir = dir.path();
    let args = ["k3.col", "--masks", "2", "--start", "start.json"];
    colouring(dir, 2, &[1, 1, 1]);
    // Two masks for a triangle: one conflict of three.
    let (_, found) = solve(dir, &args, 1);
    assert_eq!(cost(&found["start"]), (3, 0));
    assert_eq!(found["conflicts"], json!({"lower": 1, "upper": 1}));
    assert_eq!(found["start_differences"].as_array().unwrap().len(), 2);
    let (_, kept) = solve(dir, &[&args[..], &["--keep"]].concat(), 1);
    assert_eq!(cost(&kept["keep"]), (1, 0));
    assert_eq!(kept["keep"]["changed_features"], 1);
    accepted(dir, "k3.col");
    colouring(dir, 2, &[2, 1, 2]);
    solve(dir, &args, 1);
    let written: Value =
        serde_json::from_slice(&fs::read(dir.join("out/colouring.json")).unwrap()).unwrap();
    assert_eq!(written["colours"], json!([2, 1, 2]));
    fs::remove_dir_all(dir.join("out")).unwrap();
    colouring(dir, 2, &[1, 1]);
    refused(
        dir,
        &args,
        BAD_INPUT,
        &["--start start.json: masks for 2 fragments: k3.col has 3"],
    );
    colouring(dir, 3, &[1, 2, 3]);
    refused(
        dir,
        &args,
        BAD_INPUT,
        &["a colouring for 3 masks: one for 2 masks is needed"],
    );
    colouring(dir, 2, &[1, 2, 3]);
    refused(dir, &args, BAD_INPUT, &["colours[2]: no mask 3"]);
    colouring(dir, 2, &[1, 1, 1]);
    let layers = [&args[..], &["--start-datatypes", "1,2"]].concat();
    refused(dir, &layers, USAGE, &["--start-datatypes", "is a graph"]);
}

fn same_bytes(a: &Path, b: &Path) {
    assert_eq!(names(a), names(b));
    for name in names(a).iter().filter(|&name| name != "timings.json") {
        let (a, b) = (a.join(name), b.join(name));
        match a.is_dir() {
            true => same_bytes(&a, &b),
            false => assert!(
                fs::read(a).unwrap() == fs::read(b).unwrap(),
                "{name} differs"
            ),
        }
    }
}

/// Local interconnect of the routed block: the answer without stitches as a start for the one with them.
#[test]
fn a_routed_layer_begins_with_an_answer_of_fewer_means() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let input = routed();
    let rules = [
        input.to_str().unwrap(),
        "--layer",
        "67/20",
        "--masks",
        "3",
        "--spacing",
        "250",
    ];
    let stitches = [
        "--stitch",
        "uncovered",
        "--overlap",
        "40",
        "--fragment-length",
        "140",
        "--corner",
        "70",
    ];
    let (_, plain) = solve(dir, &rules, 1);
    fs::rename(dir.join("out"), dir.join("plain")).unwrap();
    let with = [&rules[..], &stitches, &["--start", "plain/coloured.gds"]].concat();
    let (_, found) = solve(dir, &with, 1);
    // Least conflicts by RC2, as the README has them: 35 without stitches, 17 with 24.
    assert_eq!(cost(&found["start"]), (35, 0));
    assert_eq!(plain["conflicts"]["upper"], 35);
    assert_eq!(found["conflicts"], json!({"lower": 17, "upper": 17}));
    assert_eq!(found["stitches"], json!({"lower": 24, "upper": 24}));
    fs::rename(dir.join("out"), dir.join("best")).unwrap();
    for (out, threads) in [("one", "1"), ("two", "2")] {
        let (_, kept) = solve(
            dir,
            &[&with[..], &["--keep", "--threads", threads]].concat(),
            4,
        );
        fs::rename(dir.join("out"), dir.join(out)).unwrap();
        let conflicts = cost(&kept["keep"]).0;
        assert!((17..=35).contains(&conflicts));
        assert_eq!(kept["keep"]["proven"], true);
        assert_eq!(
            kept["keep"]["free_conflicts"],
            json!({"lower": 17, "upper": 17})
        );
        assert_eq!(
            kept["keep"]["free_stitches"],
            json!({"lower": 24, "upper": 24})
        );
        assert_eq!(kept["conflicts"], json!({"lower": 17, "upper": conflicts}));
        let changed: usize = kept["keep_places"]
            .as_array()
            .unwrap()
            .iter()
            .map(|place| place["changed"].as_array().unwrap().len())
            .sum();
        assert_eq!(kept["keep"]["changed_features"], changed);
    }
    same_bytes(&dir.join("one"), &dir.join("two"));
    let audit = run(dir, &["audit", "one", "--input", input.to_str().unwrap()]);
    assert_eq!(audit.code, 0, "{}", audit.stdout);
    // The answer itself, as a start: nothing to change.
    let best = [
        &rules[..],
        &stitches,
        &["--start", "best/coloured.gds", "--keep"],
    ]
    .concat();
    let (_, again) = solve(dir, &best, 1);
    assert_eq!(cost(&again["start"]), (17, 24));
    assert_eq!(cost(&again["keep"]), (17, 24));
    assert_eq!(again["keep"]["changed_features"], 0);
    let drawn = |out: &str| fs::read(dir.join(out).join("coloured.gds")).unwrap();
    assert!(drawn("out") == drawn("best"));
}
