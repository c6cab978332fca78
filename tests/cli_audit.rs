//! `maskproof audit` as users run it: verdicts, exit codes, and what it needs.
#![allow(clippy::unwrap_used)]

mod cli_support;

use std::fs;
use std::path::Path;

use cli_support::*;

const REJECTED: i32 = 5;

const STITCHED: [&str; 14] = [
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
    "140",
    "--corner",
    "70",
];

/// The same rules as a file.
const RULES_FILE: &str = "layer = \"68/20\"\nmasks = 2\nspacing = \"500 nm\"\n\n[stitch]\n\
    policy = \"uncovered\"\noverlap = \"40 nm\"\nfragment_length = \"140 nm\"\ncorner = \"70 nm\"\n";

/// Solves metal 1 of the routed block, copied to `block.gds`, into `out`.
fn solved(dir: &Path, more: &[&str]) {
    fs::copy(routed(), dir.join("block.gds")).unwrap();
    let line = [&["solve", "block.gds", "--out", "out"], &STITCHED[..], more].concat();
    let run = run(dir, &line);
    assert_eq!(run.code, 1, "{}", run.stderr);
}

fn audit(dir: &Path, more: &[&str]) -> Run {
    run(dir, &[&["audit", "out"], more].concat())
}

/// Replaces text in a file.
fn edit(file: &Path, old: &str, new: &str) {
    let text = fs::read_to_string(file).unwrap();
    assert!(text.contains(old), "{old:?} is not in {}", file.display());
    fs::write(file, text.replacen(old, new, 1)).unwrap();
}

#[test]
fn a_result_is_accepted_by_its_certificate_alone() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    solved(dir, &[]);
    for file in ["coloured.gds", "pieces.csv", "result.json", "timings.json"] {
        fs::remove_file(dir.join("out").join(file)).unwrap();
    }
    fs::write(dir.join("same.toml"), RULES_FILE).unwrap();
    for more in [&[][..], &["--rules", "same.toml"], &["--threads", "1"]] {
        let run = audit(dir, &[&["--input", "block.gds"], more].concat());
        assert_eq!((run.code, run.stderr.as_str()), (0, ""), "{}", run.stdout);
        let said = "out: accepted\nlayer 68/20 of register_block, 2 masks, 0.5 um apart, stitches where policy \
                    uncovered allows them: every colouring leaves at least 50 conflicts, and this one has no \
                    more; among those that leave as few, none has stitches of less weight than its 8\n";
        assert!(run.stdout.starts_with(said), "{}", run.stdout);
    }
    // The directory of the certificate itself will do.
    let line = ["audit", "out/certificate", "--input", "block.gds"];
    assert_eq!(run(dir, &line).code, 0);
}

#[test]
fn what_is_not_so_is_rejected_with_its_reason() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    solved(dir, &[]);
    let certificate = dir.join("out/certificate/certificate.json");
    let whole = fs::read(&certificate).unwrap();
    let rejected = |more: &[&str], said: &str| {
        let run = audit(dir, &[&["--input", "block.gds"], more].concat());
        assert_eq!(run.code, REJECTED, "{}{}", run.stdout, run.stderr);
        assert!(run.stdout.starts_with("out: rejected\n"), "{}", run.stdout);
        assert!(run.stdout.contains(said), "{said:?}: {}", run.stdout);
    };
    let other = RULES_FILE.replace("500 nm", "510 nm");
    fs::write(dir.join("other.toml"), other).unwrap();
    rejected(&["--rules", "other.toml"], "rules: ");
    edit(&certificate, "\"limit\":1", "\"limit\":2");
    rejected(
        &[],
        "sum: the limits of the conflict bounds add up to 51, and 50 is claimed",
    );
    fs::write(&certificate, &whole).unwrap();
    edit(&certificate, "\"spacing\":500", "\"spacing\":490");
    rejected(
        &[],
        "rules: the digest of the rules is not that of the rules that are listed",
    );
    fs::write(&certificate, &whole).unwrap();
    // Another input: a byte of the library's name.
    let mut bytes = fs::read(dir.join("block.gds")).unwrap();
    let last = bytes.len() - 1;
    bytes[last] ^= 1;
    fs::write(dir.join("block.gds"), bytes).unwrap();
    rejected(&[], "input: block.gds has ");
}

#[test]
fn what_cannot_be_read_is_named() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    solved(dir, &["--no-certificate"]);
    assert!(!dir.join("out/certificate").exists());
    let run = audit(dir, &["--input", "block.gds"]);
    assert_eq!(run.code, BAD_INPUT);
    assert!(
        run.stdout.starts_with("out: malformed\ncertificate.json: "),
        "{}",
        run.stdout
    );
    solved(dir, &[]);
    let run = audit(dir, &["--input", "absent.gds"]);
    assert_eq!(run.code, BAD_INPUT);
    assert!(
        run.stderr.starts_with("maskproof: absent.gds: "),
        "{}",
        run.stderr
    );
    fs::write(dir.join("wrong.toml"), "layers = 1\n").unwrap();
    let run = audit(dir, &["--input", "block.gds", "--rules", "wrong.toml"]);
    assert_eq!(run.code, BAD_INPUT);
    assert!(
        run.stderr.starts_with("maskproof: wrong.toml:1:1: "),
        "{}",
        run.stderr
    );
    let certificate = dir.join("out/certificate/certificate.json");
    edit(&certificate, "\"lower\":50", "\"lower\":x");
    let run = audit(dir, &["--input", "block.gds"]);
    assert_eq!(run.code, BAD_INPUT);
    assert!(
        run.stdout
            .starts_with("out: malformed\ncertificate.json:6: "),
        "{}",
        run.stdout
    );
    assert_eq!(audit(dir, &[]).code, USAGE);
}

#[test]
fn a_graph_is_audited_too() {
    let dir = place();
    let dir = dir.path();
    let solve = ["solve", "k3.col", "--masks", "2", "--out", "out"];
    assert_eq!(run(dir, &solve).code, 1);
    let run = audit(dir, &["--input", "k3.col"]);
    assert_eq!(run.code, 0, "{}", run.stdout);
    let said = "out: accepted\nthis graph, 2 masks: every colouring leaves at least 1 conflict, and this one has no more\n";
    assert!(run.stdout.starts_with(said), "{}", run.stdout);
}

#[test]
fn an_undecided_result_has_a_true_certificate() {
    let dir = tempfile::tempdir().unwrap();
    let dir = dir.path();
    fs::write(dir.join("hard.col"), random_col(120, 3)).unwrap();
    let solve = [
        "solve",
        "hard.col",
        "--masks",
        "4",
        "--time-limit",
        "0.5",
        "--out",
        "out",
    ];
    let solved = run(dir, &solve);
    assert_eq!(solved.code, 4, "{}", solved.stdout);
    let run = audit(dir, &["--input", "hard.col"]);
    assert_eq!(run.code, 0, "{}", run.stdout);
    let (lower, upper) = (
        &result(&dir.join("out"))["conflicts"]["lower"],
        &result(&dir.join("out"))["conflicts"]["upper"],
    );
    let said = format!("at least {lower} conflicts, and this one {upper}\n");
    assert!(run.stdout.contains(&said), "{said:?}: {}", run.stdout);
}
