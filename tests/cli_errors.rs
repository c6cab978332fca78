//! Bad input and bad command lines: one clear line with the place, the right exit code, nothing
//! written.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;
use std::path::Path;

use cli_support::*;

const USAGE: i32 = 2;
const BAD_INPUT: i32 = 3;

/// Runs `solve ... --out out` in `dir` and checks the refusal: the code, a single line on stderr that
/// holds all of `said`, nothing on stdout, no new file.
fn refused(dir: &Path, args: &[&str], code: i32, said: &[&str]) {
    let before = names(dir);
    let run = run(dir, &[&["solve"], args, &["--out", "out"]].concat());
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

/// A directory with the small inputs that the tests use.
fn place() -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("row.gds"), row_of_squares()).unwrap();
    fs::write(
        dir.path().join("k3.col"),
        "p edge 3 3\ne 1 2\ne 1 3\ne 2 3\n",
    )
    .unwrap();
    dir
}

const RULES: [&str; 6] = ["--layer", "1/0", "--masks", "2", "--spacing", "150"];

fn with_rules<'a>(input: &'a str, more: &[&'a str]) -> Vec<&'a str> {
    [&[input], &RULES[..], more].concat()
}

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
        USAGE,
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
    refused(dir.path(), &args, USAGE, &["7/0", "1/0", "5", "2/0"]);
    fs::write(
        dir.path().join("rules.toml"),
        "layer = \"7/0\"\nmasks = 2\nspacing = \"150 nm\"\n",
    )
    .unwrap();
    let args = ["row.gds", "--rules", "rules.toml"];
    refused(dir.path(), &args, BAD_INPUT, &["7/0", "1/0", "5", "2/0"]);
}

#[test]
fn wrong_rules() {
    let dir = place();
    let dir = dir.path();
    let wrong = |text: &str, said: &[&str]| {
        fs::write(dir.join("rules.toml"), text).unwrap();
        refused(dir, &["row.gds", "--rules", "rules.toml"], BAD_INPUT, said);
    };
    wrong(
        "layer = \"1/0\"\nmaks = 2\nspacing = \"150 nm\"\n",
        &["rules.toml:2", "maks", "masks"],
    );
    wrong(
        "layer = \"1/0\"\nmasks = 9\nspacing = \"150 nm\"\n",
        &["rules.toml:2", "9", "2 to 8"],
    );
    wrong(
        "layer = \"1/0\"\nmasks = 2\nspacing = \"0 nm\"\n",
        &["rules.toml:3", "0"],
    );
    wrong("layer = \"1/0\"\nmasks = \n", &["rules.toml:2"]);
    wrong(
        "layer = 1\nmasks = 2\nspacing = \"150 nm\"\n",
        &["rules.toml:1"],
    );
    refused(
        dir,
        &["row.gds", "--rules", "none.toml"],
        BAD_INPUT,
        &["none.toml"],
    );
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
fn wrong_command_lines() {
    let dir = place();
    let dir = dir.path();
    let options = [
        ("--masks", "0", "2 to 8"),
        ("--masks", "1", "2 to 8"),
        ("--masks", "9", "2 to 8"),
        ("--masks", "two", "whole number"),
        ("--spacing", "0", ""),
        ("--spacing", "-5", ""),
        ("--spacing", "wide", ""),
        ("--spacing", "99999999999999999999", ""),
        ("--layer", "67", "67/20"),
        ("--layer", "70000/1", "65535"),
        ("--stitch", "sometimes", "uncovered"),
        ("--overlap", "x", ""),
        ("--fragment-length", "-1", ""),
        ("--corner", "1e9999", ""),
        ("--stitch-weight", "0", ""),
        ("--threads", "0", "1 to"),
        ("--time-limit", "-1", "0 or more"),
        ("--time-limit", "nan", "0 or more"),
        ("--piece-limit", "soon", "seconds"),
        ("--datatypes", "101", "2"),
        ("--datatypes", "101,101", "101"),
        ("--datatypes", "101,99999", "65535"),
    ];
    for (option, value, said) in options {
        let value = format!("{option}={value}");
        let args: Vec<&str> = with_rules("row.gds", &[])
            .chunks(1)
            .map(|chunk| chunk[0])
            .collect();
        let args = without(&args, option);
        let args = [&args[..], &[value.as_str()]].concat();
        refused(dir, &args, USAGE, &[option, said]);
    }
    refused(dir, &["row.gds", "--colour", "3"], USAGE, &["--colour"]);
    refused(
        dir,
        &["row.gds", "--mask", "3"],
        USAGE,
        &["--mask", "--masks"],
    );
    refused(dir, &["row.gds", "--masks"], USAGE, &["--masks"]);
    refused(
        dir,
        &with_rules("row.gds", &["--masks", "3"]),
        USAGE,
        &["--masks", "more than once"],
    );
    refused(dir, &[], USAGE, &["INPUT"]);
}

/// The arguments without an option and its value.
fn without<'a>(args: &[&'a str], option: &str) -> Vec<&'a str> {
    let at = args
        .iter()
        .position(|&arg| arg == option)
        .unwrap_or(args.len());
    [&args[..at], &args[(at + 2).min(args.len())..]].concat()
}

#[test]
fn rules_that_are_missing_or_do_not_apply() {
    let dir = place();
    let dir = dir.path();
    for option in ["--layer", "--masks", "--spacing"] {
        let args = without(&with_rules("row.gds", &[]), option);
        refused(dir, &args, USAGE, &[option]);
    }
    refused(dir, &["k3.col"], USAGE, &["--masks"]);
    for (option, value) in [
        ("--layer", "1/0"),
        ("--spacing", "150"),
        ("--stitch", "none"),
        ("--top", "t"),
        ("--datatypes", "1,2,3"),
    ] {
        refused(
            dir,
            &["k3.col", "--masks", "3", option, value],
            USAGE,
            &[option, "graph"],
        );
    }
}

#[test]
fn commands() {
    let dir = place();
    for args in [&[][..], &["slove"], &["--wrong"]] {
        let run = run(dir.path(), args);
        assert_eq!(run.code, USAGE, "{args:?}: {}", run.stderr);
        assert_eq!(run.stderr.lines().count(), 1, "{args:?}: {}", run.stderr);
    }
    for args in [&["--help"][..], &["--version"], &["solve", "--help"]] {
        let run = run(dir.path(), args);
        assert_eq!((run.code, run.stderr.as_str()), (0, ""));
        assert!(run.stdout.contains("maskproof"));
    }
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

#[test]
fn output_directories_that_cannot_be_used() {
    let dir = place();
    let dir = dir.path();
    fs::write(dir.join("file"), "mine").unwrap();
    fs::create_dir(dir.join("mine")).unwrap();
    fs::write(dir.join("mine/work.txt"), "mine").unwrap();
    for (out, said) in [
        ("file", "file"),
        ("mine", "work.txt"),
        (".", "."),
        ("file/below", "file"),
    ] {
        let before = names(dir);
        let run = run(
            dir,
            &[&["solve"], &with_rules("row.gds", &["--out", out])[..]].concat(),
        );
        assert_eq!(run.code, USAGE, "{out}: {}", run.stderr);
        assert!(run.stderr.contains(said), "{out}: {}", run.stderr);
        assert_eq!(run.stderr.lines().count(), 1);
        assert_eq!(names(dir), before);
    }
    assert_eq!(names(&dir.join("mine")), ["work.txt"]);
}

#[test]
fn occupied_datatypes_are_refused() {
    let dir = place();
    let args = with_rules("row.gds", &["--datatypes", "0,1"]);
    refused(dir.path(), &args, USAGE, &["1/0", "--datatypes"]);
}
