//! Output directories: complete, the same for any number of threads, replaced only when they are ours.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;
use std::path::Path;

use cli_support::*;

const LAYOUT_FILES: [&str; 5] = [
    "certificate",
    "coloured.gds",
    "pieces.csv",
    "result.json",
    "timings.json",
];
const GRAPH_FILES: [&str; 5] = [
    "certificate",
    "colouring.json",
    "pieces.csv",
    "result.json",
    "timings.json",
];

/// Solves into `out` below `dir` and checks that only a whole `out` was added.
fn solve(dir: &Path, input: &str, out: &str, args: &[&str]) -> Run {
    let mut expected = names(dir);
    let run = run(dir, &[&["solve", input, "--out", out], args].concat());
    assert!(run.code <= 1, "code {}: {}", run.code, run.stderr);
    assert_eq!(run.stderr, "");
    if !expected.iter().any(|name| name == out) {
        expected.push(out.to_owned());
        expected.sort();
    }
    assert_eq!(names(dir), expected);
    run
}

fn assert_same_files(a: &Path, b: &Path, files: &[&str]) {
    assert_eq!(names(a), files);
    assert_eq!(names(b), files);
    assert_same_bytes(a, b);
}

/// Every file below, but for times.
fn assert_same_bytes(a: &Path, b: &Path) {
    assert_eq!(names(a), names(b));
    for name in names(a).iter().filter(|&name| name != "timings.json") {
        let (a, b) = (a.join(name), b.join(name));
        if a.is_dir() {
            assert_same_bytes(&a, &b);
        } else {
            assert!(
                fs::read(a).unwrap() == fs::read(b).unwrap(),
                "{name} differs"
            );
        }
    }
}

#[test]
fn a_routed_layer_gives_the_same_bytes_on_one_thread_and_two() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let input = routed();
    let input = input.to_str().unwrap();
    let rules = ["--layer", "67/20", "--masks", "3", "--spacing", "250"];
    for (out, threads) in [("one", "1"), ("two", "2")] {
        let run = solve(
            dir,
            input,
            out,
            &[&rules[..], &["--threads", threads]].concat(),
        );
        assert_eq!(run.code, 1);
        assert!(
            run.stdout
                .contains("not decomposable: 35 conflicts cannot be avoided")
        );
    }
    assert_same_files(&dir.join("one"), &dir.join("two"), &LAYOUT_FILES);
    // From the issue: gdstk 1.0.2, shapely 2.2 and RC2 over CaDiCaL (python-sat 1.9).
    let result = result(&dir.join("one"));
    assert_eq!(result["verdict"], "not decomposable");
    assert_eq!(result["features"], 739);
    assert_eq!(result["conflict_pairs"], 1618);
    assert_eq!(
        result["conflicts"],
        serde_json::json!({"lower": 35, "upper": 35})
    );
    assert_eq!(
        result["stitches"],
        serde_json::json!({"lower": 0, "upper": 0})
    );
    assert_eq!(result["unresolved"].as_array().unwrap().len(), 35);
    assert!(
        !fs::read_to_string(dir.join("one/result.json"))
            .unwrap()
            .contains("tests/data")
    );
}

#[test]
fn stitches_give_the_same_bytes_on_one_thread_and_two() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let input = routed();
    let rules = [
        "--layer",
        "68/20",
        "--masks",
        "2",
        "--spacing",
        "500",
        "--stitch",
        "uncovered",
        "--overlap",
        "40",
        "--fragment-length",
        "100",
    ];
    for (out, threads) in [("one", "1"), ("two", "2")] {
        solve(
            dir,
            input.to_str().unwrap(),
            out,
            &[&rules[..], &["--threads", threads]].concat(),
        );
    }
    assert_same_files(&dir.join("one"), &dir.join("two"), &LAYOUT_FILES);
    let result = result(&dir.join("one"));
    let used: u64 = result["stitched"]
        .as_array()
        .unwrap()
        .iter()
        .map(|stitch| stitch["weight"].as_u64().unwrap())
        .sum();
    assert_eq!(result["stitches"]["upper"], used);
    // Stitches can only help: the table has 58 conflicts without any.
    assert!(result["conflicts"]["upper"].as_u64().unwrap() <= 58);
}

#[test]
fn a_graph_gives_its_colouring() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::write(dir.join("graph.col"), random_col(14, 1)).unwrap();
    for (out, threads) in [("one", "1"), ("two", "2")] {
        solve(
            dir,
            "graph.col",
            out,
            &["--masks", "3", "--threads", threads],
        );
    }
    assert_same_files(&dir.join("one"), &dir.join("two"), &GRAPH_FILES);
    let text = fs::read(dir.join("one/colouring.json")).unwrap();
    let colouring: serde_json::Value = serde_json::from_slice(&text).unwrap();
    let masks: Vec<u64> = colouring["colours"]
        .as_array()
        .unwrap()
        .iter()
        .map(|mask| mask.as_u64().unwrap())
        .collect();
    assert_eq!(masks.len(), 14);
    assert!(masks.iter().all(|mask| (1..=3).contains(mask)));
    // The cost told is the cost of the colouring, counted from the file.
    let conflicts = random_col(14, 1)
        .lines()
        .filter_map(|line| line.strip_prefix("e "))
        .filter(|edge| {
            let (a, b) = edge.split_once(' ').unwrap();
            let mask = |v: &str| masks[v.parse::<usize>().unwrap() - 1];
            mask(a) == mask(b)
        })
        .count();
    let result = result(&dir.join("one"));
    assert_eq!(result["conflicts"]["upper"], conflicts);
    assert_eq!(result["conflicts"]["lower"], conflicts);
}

#[test]
fn pieces_add_up_to_the_result() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let input = routed();
    let rules = ["--layer", "67/20", "--masks", "3", "--spacing", "250"];
    solve(dir, input.to_str().unwrap(), "out", &rules);
    let table = fs::read_to_string(dir.join("out/pieces.csv")).unwrap();
    let rows: Vec<Vec<&str>> = table
        .lines()
        .map(|line| line.split(',').collect())
        .collect();
    let column = |name| rows[0].iter().position(|&column| column == name).unwrap();
    let sum = |name| -> u64 {
        rows[1..]
            .iter()
            .map(|row| row[column(name)].parse::<u64>().unwrap())
            .sum()
    };
    assert_eq!(sum("conflicts_lower"), 35);
    assert_eq!(sum("conflicts_upper"), 35);
    assert_eq!(result(&dir.join("out"))["pieces"], rows.len() - 1);
    let timings = fs::read(dir.join("out/timings.json")).unwrap();
    let timings: serde_json::Value = serde_json::from_slice(&timings).unwrap();
    assert_eq!(timings["pieces"].as_array().unwrap().len(), rows.len() - 1);
}

#[test]
fn an_earlier_result_is_replaced_as_a_whole() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::write(dir.join("row.gds"), row_of_squares()).unwrap();
    fs::write(dir.join("k3.col"), "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n").unwrap();
    let rules = ["--layer", "1/0", "--masks", "2", "--spacing", "150"];
    solve(dir, "row.gds", "out", &rules);
    assert_eq!(names(&dir.join("out")), LAYOUT_FILES);
    solve(dir, "k3.col", "out", &["--masks", "2"]);
    assert_eq!(names(&dir.join("out")), GRAPH_FILES);
    assert_eq!(result(&dir.join("out"))["verdict"], "not decomposable");
}

/// Fourteen vertices are too many to enumerate, so there is a proof.
#[test]
fn a_result_with_a_certificate_is_replaced_but_for_foreign_files() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::write(dir.join("graph.col"), random_col(14, 1)).unwrap();
    let args = ["--masks", "3"];
    solve(dir, "graph.col", "out", &args);
    assert!(!names(&dir.join("out/certificate/proofs")).is_empty());
    solve(dir, "graph.col", "out", &args);
    let command = ["solve", "graph.col", "--out", "out", "--masks", "3"];
    for place in ["notes", "proofs/notes.txt"] {
        let foreign = dir.join("out/certificate").join(place);
        fs::write(&foreign, "mine").unwrap();
        let refused = run(dir, &command);
        assert_eq!(refused.code, 2);
        let said = format!("exists and holds certificate/{place}, which no earlier run wrote");
        assert!(refused.stderr.contains(&said), "{}", refused.stderr);
        assert_eq!(fs::read_to_string(&foreign).unwrap(), "mine");
        fs::remove_file(foreign).unwrap();
    }
    solve(
        dir,
        "graph.col",
        "out",
        &["--masks", "3", "--no-certificate"],
    );
    let without: Vec<&str> = GRAPH_FILES
        .into_iter()
        .filter(|&f| f != "certificate")
        .collect();
    assert_eq!(names(&dir.join("out")), without);
}

#[test]
fn a_certificate_is_left_out_of_files_only() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::write(dir.join("k3.col"), "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n").unwrap();
    let refused = run(
        dir,
        &["solve", "k3.col", "--masks", "2", "--no-certificate"],
    );
    assert_eq!(refused.code, 2);
    assert!(refused.stderr.contains("--out"), "{}", refused.stderr);
}

#[test]
fn rules_come_from_the_file_and_the_command_line_overrides_them() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::write(dir.join("row.gds"), row_of_squares()).unwrap();
    let rules =
        "layer = \"1/0\"\nmasks = 2\nspacing = \"150 nm\"\n\n[output]\ndatatypes = [5, 6]\n";
    fs::write(dir.join("rules.toml"), rules).unwrap();
    solve(dir, "row.gds", "file", &["--rules", "rules.toml"]);
    assert_eq!(result(&dir.join("file"))["conflict_pairs"], 4);
    // Squares 100 nm wide in a pitch of 200: the one after the next is 300 nm away.
    let wider = [
        "--rules",
        "rules.toml",
        "--spacing",
        "0.301 um",
        "--stitch",
        "uncovered",
    ];
    let run = solve(dir, "row.gds", "wider", &wider);
    assert_eq!(run.code, 1);
    let result = result(&dir.join("wider"));
    assert_eq!(result["conflict_pairs"], 7);
    assert_eq!(result["conflicts"]["upper"], 2);
    assert_eq!(result["layer"]["spacing_um"], 0.301);
    assert_eq!(result["layer"]["stitch"], "uncovered");
}

#[test]
fn no_directory_is_written_unless_asked_for() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(
        dir.path().join("k3.col"),
        "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n",
    )
    .unwrap();
    let run = run(dir.path(), &["solve", "k3.col", "--masks", "3"]);
    assert_eq!(run.code, 0);
    assert!(run.stdout.contains("decomposable: no conflict is left"));
    assert!(!run.stdout.contains("written to"));
    assert_eq!(names(dir.path()), ["k3.col"]);
}
