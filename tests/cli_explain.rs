//! `explain` as users run it: what it says, what it writes, what it refuses.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;
use std::path::Path;

use cli_support::*;
use serde_json::Value;

/// Solves into `out` below `dir`.
fn solve(dir: &Path, args: &[&str]) {
    let run = run(dir, &[&["solve"], args, &["--out", "out"]].concat());
    assert!(run.code <= 1, "code {}: {}", run.code, run.stderr);
}

/// Five wires that close an odd cycle, on 1/0: `tests/explain/scenes.rs` works them out.
fn five_wires() -> Vec<u8> {
    let rects = [
        [0, 0, 200, 10],
        [0, 15, 20, 35],
        [180, 15, 200, 35],
        [0, 40, 95, 50],
        [105, 40, 200, 50],
    ];
    let shapes = rects.into_iter().flat_map(|rect| boundary(1, 0, rect));
    gds(&[("top", shapes.collect())])
}

const FIVE: [&str; 7] = [
    "five.gds",
    "--layer",
    "1/0",
    "--masks",
    "2",
    "--spacing",
    "12",
];

fn solved_five() -> tempfile::TempDir {
    let dir = place();
    fs::write(dir.path().join("five.gds"), five_wires()).unwrap();
    solve(dir.path(), &FIVE);
    dir
}

fn explanation(file: &Path) -> Value {
    serde_json::from_slice(&fs::read(file).unwrap()).unwrap()
}

#[test]
fn a_layout_is_explained_in_micrometres() {
    let dir = solved_five();
    let dir = dir.path();
    let run = run(dir, &["explain", "out", "--input", "five.gds"]);
    assert_eq!((run.code, run.stderr.as_str()), (0, ""));
    let lines: Vec<&str> = run.stdout.lines().collect();
    assert_eq!(
        lines[0],
        "five.gds: layer 1/0 of top, 2 masks, 0.012 um apart"
    );
    assert_eq!(lines[1], "1 conflict cannot be avoided, in 1 place");
    assert!(
        run.stdout
            .contains("place 1: an odd cycle of 5 features, in order ")
    );
    assert!(run.stdout.contains("(0, 0) to (0.2, 0.01) um"));
    assert!(run.stdout.contains("the policy none places no candidates"));
    assert!(run.stdout.ends_with("written to out/explanation.json\n"));
    assert!(
        lines
            .iter()
            .all(|line| line.len() <= 130 && line.trim_end() == *line)
    );

    let told = explanation(&dir.join("out/explanation.json"));
    assert_eq!(told["format"], "maskproof-explanation");
    assert_eq!(told["place_count"], 1);
    let place = &told["places"][0];
    assert_eq!(place["found"], "odd cycle");
    assert_eq!(place["cycle"].as_array().unwrap().len(), 5);
    assert_eq!(place["spacings"].as_array().unwrap().len(), 5);
    let short = |spacing: &Value| spacing["short_um"].as_f64().unwrap();
    assert!(
        place["spacings"]
            .as_array()
            .unwrap()
            .iter()
            .all(|s| short(s) > 0.0)
    );
    assert_eq!(place["repairs"][0]["kind"], "stitch");
    assert_eq!(
        place["repairs"][0]["stitch"]["in_the_way"][0]["what"],
        "no policy"
    );
    let movement = place["repairs"]
        .as_array()
        .unwrap()
        .iter()
        .find(|r| r["kind"] == "movement");
    assert_eq!(movement.unwrap()["verified"], true);
}

#[test]
fn a_graph_has_features_and_no_coordinates() {
    let dir = place();
    let dir = dir.path();
    let edges = (1..=5).flat_map(|a| (a + 1..=5).map(move |b| format!("e {a} {b}\n")));
    let text = format!("p edge 5 10\n{}", edges.collect::<String>());
    fs::write(dir.join("k5.col"), text).unwrap();
    solve(dir, &["k5.col", "--masks", "4"]);
    let run = run(dir, &["explain", "out", "--input", "k5.col"]);
    assert_eq!((run.code, run.stderr.as_str()), (0, ""));
    assert!(
        run.stdout
            .starts_with("k5.col: graph, 4 masks\n1 conflict cannot be avoided")
    );
    assert!(
        run.stdout
            .contains("5 features pairwise too close (a clique of 5)")
    );
    assert!(!run.stdout.contains(" um"));
    let place = explanation(&dir.join("out/explanation.json"))["places"][0].clone();
    assert_eq!(place["found"], "clique");
    assert!(place.get("at_um").is_none());
    assert_eq!(place["repairs"].as_array().unwrap().len(), 10);
    assert!(
        place["repairs"]
            .as_array()
            .unwrap()
            .iter()
            .all(|r| r["verified"] == true)
    );
}

#[test]
fn without_conflicts_there_is_nothing_to_explain() {
    let dir = place();
    let dir = dir.path();
    solve(dir, &with_rules("row.gds", &[]));
    let run = run(dir, &["explain", "out", "--input", "row.gds"]);
    assert_eq!((run.code, run.stderr.as_str()), (0, ""));
    assert!(
        run.stdout
            .contains("no conflict is left: there is nothing to explain")
    );
    let told = explanation(&dir.join("out/explanation.json"));
    assert_eq!(told["places"].as_array().unwrap().len(), 0);
}

#[test]
fn the_routed_block_is_explained_alike_on_any_number_of_threads() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let input = routed();
    let input = input.to_str().unwrap();
    solve(
        dir,
        &[
            input,
            "--layer",
            "68/20",
            "--masks",
            "2",
            "--spacing",
            "500",
        ],
    );
    let mut texts = Vec::new();
    for threads in ["1", "2"] {
        let file = format!("{threads}.json");
        let args = [
            "explain",
            "out",
            "--input",
            input,
            "--threads",
            threads,
            "--out",
            &file,
        ];
        let told = run(dir, &args);
        assert_eq!(told.code, 0, "{}", told.stderr);
        let (text, rest) = told
            .stdout
            .split_at(told.stdout.rfind("written to").unwrap());
        assert!(rest.contains(&file));
        texts.push((
            text.replace(&file, "FILE"),
            fs::read(dir.join(&file)).unwrap(),
        ));
    }
    assert!(texts[0] == texts[1]);
    // Five places on the screen, all of them in the file.
    let shown = texts[0]
        .0
        .lines()
        .filter(|line| line.starts_with("place "))
        .count();
    assert_eq!(shown, 5);
    let told = explanation(&dir.join("1.json"));
    let places = told["places"].as_array().unwrap();
    let limits: u64 = places
        .iter()
        .map(|place| place["limit"].as_u64().unwrap())
        .sum();
    assert_eq!(limits, told["conflicts"]["lower"].as_u64().unwrap());
    assert!(places.iter().all(|place| place["irreducible"] == true));

    let one = run(
        dir,
        &[
            "explain", "out", "--input", input, "--place", "7", "--out", "7.json",
        ],
    );
    assert_eq!(one.code, 0);
    let one = explanation(&dir.join("7.json"));
    assert_eq!(one["places"][0], told["places"][6]);
    assert_eq!(one["places"].as_array().unwrap().len(), 1);
    let all = run(
        dir,
        &[
            "explain", "out", "--input", input, "--all", "--out", "all.json",
        ],
    );
    let shown = all
        .stdout
        .lines()
        .filter(|line| line.starts_with("place "))
        .count();
    assert_eq!(shown, places.len());
}

/// Runs `explain` in `dir` and checks the refusal: one line that holds all of `said`, no new file.
fn refused_explain(dir: &Path, args: &[&str], code: i32, said: &[&str]) {
    let before = (names(dir), names(&dir.join("out")));
    let run = run(dir, &[&["explain"], args].concat());
    let shown = format!("{args:?}: code {}, stderr {}", run.code, run.stderr);
    assert_eq!((run.code, run.stdout.as_str()), (code, ""), "{shown}");
    assert!(run.stderr.starts_with("maskproof: "), "{shown}");
    assert_eq!(run.stderr.lines().count(), 1, "{shown}");
    for part in said {
        assert!(run.stderr.contains(part), "{part:?} is missing: {shown}");
    }
    assert_eq!((names(dir), names(&dir.join("out"))), before, "{shown}");
}

#[test]
fn what_does_not_belong_together_is_refused() {
    let dir = solved_five();
    let dir = dir.path();
    let with = |args: &[&str], code, said: &[&str]| refused_explain(dir, args, code, said);
    fs::create_dir(dir.join("empty")).unwrap();
    for none in ["none", "empty", "five.gds"] {
        with(
            &[none, "--input", "five.gds"],
            BAD_INPUT,
            &[none, "certificate"],
        );
    }
    with(&["out", "--input", "none.gds"], BAD_INPUT, &["none.gds"]);
    // Another file, and another kind of file.
    with(
        &["out", "--input", "row.gds"],
        BAD_INPUT,
        &["row.gds", "SHA-256", "out"],
    );
    with(
        &["out", "--input", "k3.col"],
        BAD_INPUT,
        &["k3.col", "SHA-256"],
    );
    with(
        &["out"],
        USAGE,
        &["--input is missing", "maskproof explain --help"],
    );
    with(
        &["out", "--inptu", "five.gds"],
        USAGE,
        &["--inptu", "--input"],
    );
    with(
        &["out", "--input", "five.gds", "--place", "2"],
        USAGE,
        &["place 2 of 1"],
    );
    with(
        &["out", "--input", "five.gds", "--place", "0"],
        USAGE,
        &["--place", "from 1 on"],
    );
    // Files that are no explanation are kept.
    let taken = ["out", "--input", "five.gds", "--out", "row.gds"];
    with(&taken, USAGE, &["row.gds", "no earlier explanation"]);
    let nowhere = ["out", "--input", "five.gds", "--out", "no/such/file.json"];
    with(&nowhere, USAGE, &["no/such/file.json"]);
}

#[test]
fn damaged_certificates_are_refused() {
    let dir = solved_five();
    let dir = dir.path();
    let file = dir.join("out/certificate/certificate.json");
    let whole = fs::read_to_string(&file).unwrap();
    let damaged = |old: &str, new: &str, said: &[&str]| {
        assert!(whole.contains(old), "{old}");
        fs::write(&file, whole.replacen(old, new, 1)).unwrap();
        refused_explain(dir, &["out", "--input", "five.gds"], BAD_INPUT, said);
    };
    damaged("\"version\":1", "\"version\":2", &["certificate.json:2:"]);
    damaged("\"spacing\":12", "\"spacing\":13", &["rules_sha256"]);
    damaged(
        "\"limit\":1",
        "\"limit\":2",
        &["conflict bound 0 does not hold"],
    );
    damaged(
        "\"limit\":1",
        "\"limit\":0",
        &["conflict bound 0", "limit is 0"],
    );
    damaged(
        "\"colours\":\"1",
        "\"colours\":\"",
        &["4 fragments", "has 5"],
    );
    damaged("\"upper\":1", "\"upper\":0", &["1 conflicts, not 0"]);
    fs::write(&file, &whole[..whole.len() / 2]).unwrap();
    refused_explain(
        dir,
        &["out", "--input", "five.gds"],
        BAD_INPUT,
        &["certificate.json:"],
    );
}

#[test]
fn a_result_with_its_explanation_is_replaced_and_explained_again() {
    let dir = solved_five();
    let dir = dir.path();
    let explain = || run(dir, &["explain", "out", "--input", "five.gds"]);
    let first = explain();
    assert_eq!(first.code, 0);
    let inside = names(&dir.join("out"));
    assert!(inside.contains(&"explanation.json".to_owned()));
    assert!(inside.iter().all(|name| !name.starts_with('.')));
    // A file that a kill left behind is no obstacle.
    fs::write(dir.join("out/.explanation.json.maskproof-partial-1"), "{").unwrap();
    assert_eq!(explain().stdout, first.stdout);
    solve(dir, &FIVE);
    assert!(!names(&dir.join("out")).contains(&"explanation.json".to_owned()));
    assert_eq!(explain().stdout, first.stdout);
}

#[test]
fn help_names_every_option() {
    let dir = place();
    let run = run(dir.path(), &["explain", "--help"]);
    assert_eq!(run.code, 0);
    for option in [
        "--input",
        "--out",
        "--place",
        "--all",
        "--threads",
        "Exit codes",
    ] {
        assert!(run.stdout.contains(option), "{option}");
    }
}
