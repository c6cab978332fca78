//! The documented example of `src/formats/rules.md`, from the files to the drawing: two masks, no stitches, lines
//! that a spacer process defines, and some of their roles fixed by hand.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use cli_support::*;
use maskproof::formats::gdsii::{Request, read};
use maskproof::layout::{LayerId, Shape};
use std::fs;
use std::path::Path;

fn example() -> &'static str {
    let page = include_str!("../src/formats/rules.md");
    let examples = page.split("```toml\n").skip(1);
    let mut texts = examples.map(|rest| rest.split("```").next().unwrap());
    texts.find(|text| text.contains("[[same_mask]]")).unwrap()
}

fn text(layer: u16, texttype: u16, [x, y]: [i32; 2], string: &str) -> Vec<u8> {
    let mut bytes = string.as_bytes().to_vec();
    bytes.resize(bytes.len().next_multiple_of(2), 0);
    [
        record(0x0c00, &[]),
        record(0x0d02, &layer.to_be_bytes()),
        record(0x1602, &texttype.to_be_bytes()),
        record(0x1003, &[x.to_be_bytes(), y.to_be_bytes()].concat()),
        record(0x1906, &bytes),
        record(0x1100, &[]),
    ]
    .concat()
}

/// Lines 20 nm wide and 30 nm apart: numbers 0 to 6, number 0 on the layer of mandrels; and a line far to the right.
fn lines() -> Vec<u8> {
    let line = |x: i32, datatype| boundary(40, datatype, [x, 0, x + 20, 1000]);
    let near = (1..7).flat_map(|i| line(50 * i, 0));
    let top = [
        line(0, 1),
        near.collect(),
        line(2000, 0),
        text(41, 0, [110, 100], "pair"),
        text(41, 0, [310, 900], "pair"),
        text(41, 0, [700, 100], "a remark"),
    ];
    gds(&[("top", top.concat())])
}

fn place_with(rules: &str) -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("lines.gds"), lines()).unwrap();
    fs::write(dir.path().join("rules.toml"), rules).unwrap();
    dir
}

const SOLVE: [&str; 6] = [
    "solve",
    "lines.gds",
    "--rules",
    "rules.toml",
    "--out",
    "out",
];

/// The left edges of what is drawn on 40 and a datatype of the coloured copy, ascending.
fn drawn(dir: &Path, datatype: u16) -> Vec<i32> {
    let bytes = fs::read(dir.join("out/coloured.gds")).unwrap();
    let layer = LayerId {
        layer: 40,
        datatype,
    };
    let layout = read(&bytes, &Request::new("coloured.gds", layer)).unwrap();
    let left = |shape| match shape {
        Shape::Rect(rect) => rect.min.x,
        Shape::Polygon(vertices) => panic!("{vertices:?}"),
    };
    let mut all: Vec<i32> = layout.shapes.iter().map(left).collect();
    all.sort_unstable();
    all
}

#[test]
fn the_example_is_solved_as_it_must_be() {
    let dir = place_with(example());
    let dir = dir.path();
    let solved = run(dir, &SOLVE);
    assert_eq!(solved.code, 0, "{}", solved.stderr);
    // Lines alternate from the mandrel on; the line apart is its opposite.
    assert_eq!(drawn(dir, 11), [0, 100, 200, 300]);
    assert_eq!(drawn(dir, 12), [50, 150, 250, 2000]);
    let layer = &result(&dir.join("out"))["layer"];
    assert_eq!(layer["fixed_layers"][0]["layer"], "40/1");
    assert_eq!(layer["fixed_layers"][0]["mask"], 1);
    assert_eq!(layer["fixed_points"], 1);
    assert_eq!(layer["same_mask"], 1);
    assert_eq!(layer["different_masks"], 1);
    assert_eq!(layer["side_to_end_um"], 0.06);
    assert_eq!(layer["any_mask_um"], 0.02);
    let certificate = fs::read(dir.join("out/certificate/certificate.json")).unwrap();
    let certificate: serde_json::Value = serde_json::from_slice(&certificate).unwrap();
    let rules = &certificate["rules"];
    // Labels are kept as their points.
    assert_eq!(rules["same"], serde_json::json!([[[110, 100], [310, 900]]]));
    assert_eq!(rules["fixed"], serde_json::json!([[260, 500, 2]]));
    assert_eq!(rules["fixed_layers"], serde_json::json!([["40/1", 1]]));
}

#[test]
fn the_audit_reads_the_same_layers_and_labels() {
    let dir = place_with(example());
    let dir = dir.path();
    run(dir, &SOLVE);
    let audit = [
        "audit",
        "out",
        "--input",
        "lines.gds",
        "--rules",
        "rules.toml",
    ];
    let accepted = run(dir, &audit);
    assert_eq!(accepted.code, 0, "{}{}", accepted.stdout, accepted.stderr);
    let other = example().replace("[[same_mask]]", "[[different_masks]]");
    fs::write(dir.join("rules.toml"), other).unwrap();
    let rejected = run(dir, &audit);
    assert_eq!(rejected.code, 5, "{}", rejected.stderr);
    let said = format!("{}{}", rejected.stdout, rejected.stderr);
    assert!(said.contains("the rules given say"), "{said}");
}

#[test]
fn a_line_fixed_against_the_order_costs_one_conflict() {
    // Line 4, an even number of lines away from the mandrel, must not be one.
    let rules = example().replace("260 nm", "210 nm");
    let dir = place_with(&rules);
    let dir = dir.path();
    let solved = run(dir, &SOLVE);
    assert_eq!(solved.code, 1, "{}", solved.stderr);
    assert_eq!(result(&dir.join("out"))["conflicts"]["upper"], 1);
    let other = drawn(dir, 12);
    assert!(other.contains(&200) && other.contains(&2000), "{other:?}");
    // The pair is still one: lines 2 and 6.
    assert_eq!(other.contains(&100), other.contains(&300));
}

#[test]
fn contradictions_and_what_is_missing_stop_before_anything_is_solved() {
    let with = |from: &str, to: &str, said: &[&str]| {
        let rules = example().replace(from, to);
        assert_ne!(rules, example());
        let dir = place_with(&rules);
        refused(
            dir.path(),
            &["lines.gds", "--rules", "rules.toml"],
            BAD_INPUT,
            said,
        );
    };
    with(
        "[[\"260 nm\", \"0.5 um\"]]",
        "[[\"10 nm\", \"0.5 um\"]]",
        &[
            "lines.gds: layer 40/0: the feature at (0 um, 0 um) is fixed on mask 1 there and on mask 2 at (0.01 um, 0.5 um)",
        ],
    );
    with(
        "\"2.01 um\"",
        "\"0.02 um\"",
        &["the points (0.01 um, 0.5 um) and (0.02 um, 0.5 um) are in one feature"],
    );
    with(
        "[[\"260 nm\", \"0.5 um\"]]",
        "[[\"-260 nm\", \"0.5 um\"]]",
        &[
            "the point (-0.26 um, 0.5 um) given by hand is in no feature",
            "(0 um, 0.5 um)",
        ],
    );
    with(
        "text = \"pair\"",
        "text = \"pairs\"",
        &[
            "rules.toml:",
            "no text \"pairs\" on layer 41/0: the texts there are \"a remark\", \"pair\"",
        ],
    );
    with(
        "\"40/1\"",
        "\"40/2\"",
        &["lines.gds: byte ", "nothing is drawn on layer 40/2"],
    );
    with("\"41/0\"", "\"41/1\"", &["no text on layer 41/1"]);
}

#[test]
fn lists_are_found_beside_the_rules() {
    let rules = "layer = \"40/0\"\nmasks = 2\nspacing = \"60 nm\"\n[stitch]\npolicy = \"listed\"\nlist = \"s.csv\"\n";
    let dir = place_with("");
    let dir = dir.path();
    fs::create_dir(dir.join("sub")).unwrap();
    fs::write(dir.join("sub/rules.toml"), rules).unwrap();
    let solve = ["lines.gds", "--rules", "sub/rules.toml"];
    refused(dir, &solve, BAD_INPUT, &["sub/s.csv: "]);
    let list = "feature_x,feature_y,x,y\n60,500,60,500\n60 nm,0.5 um,0.06 um,250.5 nm\n";
    fs::write(dir.join("sub/s.csv"), list).unwrap();
    let off = "sub/s.csv:3: coordinate 250.5 nm is no whole number of database units";
    refused(dir, &solve, BAD_INPUT, &[off]);
    fs::write(dir.join("sub/s.csv"), list.replace("250.5", "250")).unwrap();
    let solved = run(dir, &[&["solve"], &solve[..], &["--out", "out"]].concat());
    assert!(solved.code <= 1, "{}", solved.stderr);
    assert_eq!(result(&dir.join("out"))["layer"]["listed"], 2);
    // Another policy leaves the list unread, and --stitch-list takes the place of the file's.
    let none = [&["solve"], &solve[..], &["--stitch", "none"]].concat();
    assert!(run(dir, &none).code <= 1);
    let other = [&solve[..], &["--stitch-list", "t.csv"]].concat();
    refused(dir, &other, BAD_INPUT, &["maskproof: t.csv: "]);
    let idle = [&solve[..], &["--stitch", "none", "--stitch-list", "t.csv"]].concat();
    refused(
        dir,
        &idle,
        USAGE,
        &["--stitch-list: only the policy \"listed\" reads a list"],
    );
}

#[test]
fn options_give_layers_and_limits() {
    let dir = place_with(example());
    let dir = dir.path();
    let plain = [
        "lines.gds",
        "--layer",
        "40/0",
        "--masks",
        "2",
        "--spacing",
        "60",
    ];
    let more = [
        "--fixed",
        "40/1=2",
        "--keep-out",
        "41/7=30",
        "--most-stitches",
        "3",
    ];
    let all = [&plain[..], &more[..]].concat();
    refused(dir, &all, BAD_INPUT, &["nothing is drawn on layer 41/7"]);
    let fixed = [&plain[..], &["--fixed", "40/1=2", "--most-stitches", "3"]].concat();
    let solved = run(dir, &[&["solve"], &fixed[..], &["--out", "out"]].concat());
    assert_eq!(solved.code, 0, "{}", solved.stderr);
    assert!(drawn(dir, 102).contains(&0));
    assert_eq!(result(&dir.join("out"))["layer"]["most_stitches"], 3);
    let beyond = [&plain[..], &["--fixed", "40/1=3"]].concat();
    refused(
        dir,
        &beyond,
        USAGE,
        &["--fixed: mask 3: the masks are numbered 1 to 2"],
    );
    let twice = [&plain[..], &["--keep-out", "40/0=5"]].concat();
    refused(
        dir,
        &twice,
        USAGE,
        &["--keep-out: layer 40/0 is the layer to split and a keep-out"],
    );
    let no_layer = [&plain[..], &["--keep-out", "40=5"]].concat();
    refused(dir, &no_layer, USAGE, &["--keep-out", "is no layer"]);
    fs::write(dir.join("g.col"), "p edge 2 1\ne 1 2\n").unwrap();
    let graph = ["g.col", "--masks", "2", "--most-stitches", "3"];
    refused(dir, &graph, USAGE, &["--most-stitches: g.col is a graph"]);
}
