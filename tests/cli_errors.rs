//! Wrong input files: one clear line with the place, the right exit code, nothing written.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;

use cli_support::*;

#[test]
fn the_small_inputs_are_good() {
    let dir = place();
    let good = run(
        dir.path(),
        &[&["solve"], &with_rules("row.gds", &[])[..]].concat(),
    );
    assert_eq!((good.code, good.stderr.as_str()), (0, ""));
    let good = run(dir.path(), &["solve", "k3.col", "--masks", "3"]);
    assert_eq!((good.code, good.stderr.as_str()), (0, ""));
}

#[test]
fn damaged_layouts() {
    let dir = place();
    let dir = dir.path();
    let whole = row_of_squares();
    for length in [
        1,
        3,
        4,
        7,
        40,
        whole.len() / 2,
        whole.len() - 4,
        whole.len() - 1,
    ] {
        fs::write(dir.join("cut.gds"), &whole[..length]).unwrap();
        refused(
            dir,
            &with_rules("cut.gds", &[]),
            BAD_INPUT,
            &["cut.gds: byte "],
        );
    }
    fs::write(dir.join("empty.gds"), b"").unwrap();
    refused(
        dir,
        &with_rules("empty.gds", &[]),
        BAD_INPUT,
        &["empty.gds"],
    );
    let noise: Vec<u8> = (0..5000u32)
        .map(|i| (i.wrapping_mul(2_654_435_761) >> 13) as u8)
        .collect();
    fs::write(dir.join("noise.gds"), noise).unwrap();
    refused(
        dir,
        &with_rules("noise.gds", &[]),
        BAD_INPUT,
        &["noise.gds"],
    );
    fs::write(dir.join("noise.gds.gz"), b"\x1f\x8b\x08rest").unwrap();
    refused(
        dir,
        &with_rules("noise.gds.gz", &[]),
        BAD_INPUT,
        &["noise.gds.gz"],
    );
}

#[test]
fn layouts_that_ask_for_too_much() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    // 32767 x 32767, four levels deep: 10^36 squares in a few hundred bytes.
    let mut cells = vec![("c0", boundary(1, 0, [0, 0, 10, 10]))];
    for (cell, inner) in [("c1", "c0"), ("c2", "c1"), ("c3", "c2"), ("c4", "c3")] {
        cells.push((cell, array(inner, 32767, 32767)));
    }
    fs::write(dir.join("huge.gds"), gds(&cells)).unwrap();
    refused(dir, &with_rules("huge.gds", &[]), BAD_INPUT, &["huge.gds"]);
    fs::write(dir.join("huge.col"), "p edge 4294967295 1\ne 1 2\n").unwrap();
    refused(
        dir,
        &["huge.col", "--masks", "2"],
        BAD_INPUT,
        &["huge.col:1"],
    );
    fs::write(
        dir.join("huge2.col"),
        "p edge 99999999999999999999 1\ne 1 2\n",
    )
    .unwrap();
    refused(
        dir,
        &["huge2.col", "--masks", "2"],
        BAD_INPUT,
        &["huge2.col:1"],
    );
}

#[test]
fn layouts_that_do_not_hang_together() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    let square = || boundary(1, 0, [0, 0, 100, 100]);
    fs::write(
        dir.join("two.gds"),
        gds(&[("left", square()), ("right", square())]),
    )
    .unwrap();
    refused(
        dir,
        &with_rules("two.gds", &[]),
        BAD_INPUT,
        &["two.gds", "left", "right", "--top"],
    );
    refused(
        dir,
        &with_rules("two.gds", &["--top", "lft"]),
        BAD_INPUT,
        &["lft"],
    );
    fs::write(dir.join("lost.gds"), gds(&[("top", reference("gone"))])).unwrap();
    refused(
        dir,
        &with_rules("lost.gds", &[]),
        BAD_INPUT,
        &["lost.gds", "top", "gone"],
    );
    let cycle = gds(&[
        ("a", [square(), reference("b")].concat()),
        ("b", reference("a")),
    ]);
    fs::write(dir.join("cycle.gds"), cycle).unwrap();
    refused(
        dir,
        &with_rules("cycle.gds", &["--top", "a"]),
        BAD_INPUT,
        &["cycle.gds"],
    );
}

#[test]
fn an_absent_layer_lists_those_present() {
    let dir = place();
    let args = [
        "row.gds",
        "--layer",
        "7/0",
        "--masks",
        "2",
        "--spacing",
        "150",
    ];
    refused(dir.path(), &args, BAD_INPUT, &["7/0", "1/0 (5)", "2/0 (1)"]);
    fs::write(
        dir.path().join("rules.toml"),
        "layer = \"7/0\"\nmasks = 2\nspacing = \"150 nm\"\n",
    )
    .unwrap();
    let args = ["row.gds", "--rules", "rules.toml"];
    refused(dir.path(), &args, BAD_INPUT, &["7/0", "1/0 (5)", "2/0 (1)"]);
}

#[test]
fn wrong_graphs() {
    let dir = place();
    let dir = dir.path();
    let wrong = |name: &str, text: &str, said: &[&str]| {
        fs::write(dir.join(name), text).unwrap();
        refused(dir, &[name, "--masks", "3"], BAD_INPUT, said);
    };
    wrong(
        "count.col",
        "p edge 3 2\ne 1 2\ne 1 3\ne 2 3\n",
        &["count.col", "2", "3"],
    );
    wrong(
        "loop.col",
        "c note\np edge 3 2\ne 1 2\ne 3 3\n",
        &["loop.col:4"],
    );
    wrong(
        "range.col",
        "p edge 3 1\ne 1 4\n",
        &["range.col:2", "4", "3"],
    );
    wrong("none.col", "", &["none.col"]);
    wrong("words.col", "p edge 3 1\ne one two\n", &["words.col:2"]);
    wrong(
        "cut.json",
        "{\"format\":\"maskproof-instance\",\n\"version\":1",
        &["cut.json:2"],
    );
    wrong(
        "other.json",
        "{\"format\":\"other\"}",
        &["other.json", "maskproof-instance"],
    );
    wrong("list.json", "[]", &["list.json:1"]);
}

#[test]
fn inputs_that_cannot_be_read() {
    let dir = place();
    let dir = dir.path();
    refused(
        dir,
        &with_rules("absent.gds", &[]),
        BAD_INPUT,
        &["absent.gds"],
    );
    fs::create_dir(dir.join("folder.gds")).unwrap();
    refused(
        dir,
        &with_rules("folder.gds", &[]),
        BAD_INPUT,
        &["folder.gds"],
    );
    fs::write(dir.join("notes.txt"), "hello").unwrap();
    refused(
        dir,
        &with_rules("notes.txt", &[]),
        BAD_INPUT,
        &["notes.txt", ".gds", ".col"],
    );
}
