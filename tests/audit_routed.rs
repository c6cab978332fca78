//! The layers of the routed block, from the stream to the verdict: what `solve` writes is accepted, and the
//! bounds add up to the numbers that gdstk, shapely and RC2 give (`tests/crosscheck/check_layers.py` recomputes
//! them).

#![allow(clippy::unwrap_used)]

use std::path::PathBuf;
use std::time::Duration;

use maskproof::audit::{Theorem, Verdict};
use maskproof::formats::length::Length;
use maskproof::formats::rules::{Given, RawRules, parse_layer, parse_policy};
use maskproof::pipeline::{AuditJob, Control, Job, Unwatched, audit, run};

fn given<T>(value: T) -> Option<Given<T>> {
    Some(Given::on_command_line("--test", value))
}

/// Solves a layer, audits what was written, and returns what is proven.
fn proven(layer: &str, masks: u64, spacing: &str, stitches: bool) -> Theorem {
    let home = tempfile::tempdir().unwrap();
    let input = PathBuf::from("tests/data/routed_sky130.gds");
    let length = |nm: &str| given(Length::parse_or_nm(nm).unwrap());
    let mut rules = RawRules {
        layer: given(parse_layer(layer).unwrap()),
        masks: given(masks),
        spacing: length(spacing),
        ..RawRules::default()
    };
    if stitches {
        rules.policy = given(parse_policy("uncovered").unwrap());
        rules.overlap = length("40");
        rules.fragment_length = length("140");
        rules.corner = length("70");
    }
    let out = home.path().join("result");
    let job = Job {
        input: input.clone(),
        rules,
        out: Some(out.clone()),
        time_limit: Some(Duration::from_secs(600)),
        ..Job::default()
    };
    run(&job, &Control::default(), &Unwatched).unwrap();
    let job = AuditJob {
        directory: out,
        input,
        ..AuditJob::default()
    };
    match audit(&job).unwrap() {
        Verdict::Accepted(theorem) => *theorem,
        other => panic!("{layer}: {other:?}"),
    }
}

/// Layer, masks, spacing, features, least conflicts.
#[test]
fn the_table_is_proven() {
    for (layer, masks, spacing, features, conflicts) in [
        ("67/20", 3, "180", 739, 15),
        ("67/20", 3, "250", 739, 35),
        ("67/20", 3, "340", 739, 44),
        ("67/20", 2, "250", 739, 388),
        ("67/20", 4, "500", 739, 0),
        ("68/20", 2, "500", 471, 58),
        ("68/20", 3, "500", 471, 3),
        ("66/44", 3, "400", 11_946, 112),
        ("66/44", 3, "500", 11_946, 271),
        ("67/44", 2, "600", 13_987, 26),
    ] {
        let theorem = proven(layer, masks, spacing, false);
        assert_eq!(theorem.features, features, "{layer}");
        assert_eq!(theorem.conflicts.lower, conflicts, "{layer}, {masks} masks");
        assert!(theorem.is_optimal(), "{layer}: {theorem}");
    }
}

/// Conflicts and stitches with the stitch rules of the README: found by the search, and proven twice, here
/// and by a pseudo-Boolean checker in `.ci/run`.
#[test]
fn layers_with_stitches_are_proven() {
    for (layer, masks, spacing, cost) in [
        ("69/20", 2, "400", (0, 7)),
        ("68/20", 3, "500", (2, 1)),
        ("68/20", 2, "500", (50, 8)),
        ("67/20", 3, "250", (17, 24)),
        ("67/20", 2, "250", (338, 78)),
    ] {
        let theorem = proven(layer, masks, spacing, true);
        assert_eq!(
            (theorem.conflicts.lower, theorem.stitches.lower),
            cost,
            "{layer}"
        );
        assert!(
            theorem.is_optimal() && theorem.stitch_candidates > 0,
            "{layer}: {theorem}"
        );
    }
}
