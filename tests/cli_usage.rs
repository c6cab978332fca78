//! Wrong command lines and rules: one clear line, the right exit code, nothing written.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod cli_support;

use std::fs;

use cli_support::*;

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
fn wrong_command_lines() {
    let dir = place();
    let dir = dir.path();
    let options = [
        ("--masks", "0", "2 to 8"),
        ("--masks", "1", "1 mask: a layer is split over 2 to 8 masks"),
        ("--masks", "-2", "whole number"),
        ("--time-limit", "-1", "0 or more"),
        ("--masks", "9", "2 to 8"),
        ("--masks", "two", "whole number"),
        ("--spacing", "0", ""),
        ("--spacing", "-5", "--spacing: \"-5\" is no length"),
        ("--spacing", "wide", ""),
        ("--spacing", "99999999999999999999", ""),
        ("--layer", "67", "67/20"),
        ("--layer", "70000/1", "65535"),
        ("--stitch", "covered", "\"uncovered\""),
        ("--stitch", "all", "policies are none, uncovered"),
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
    let bare = run(dir.path(), &[]);
    assert!(
        bare.stderr.contains("a command is missing"),
        "{}",
        bare.stderr
    );
    for args in [&["--help"][..], &["--version"], &["solve", "--help"]] {
        let run = run(dir.path(), args);
        assert_eq!((run.code, run.stderr.as_str()), (0, ""));
        assert!(run.stdout.contains("maskproof"));
    }
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
