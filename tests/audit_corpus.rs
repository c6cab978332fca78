//! The corpus under `tests/audit`: certificates made by hand. Those under `correct` are accepted; each of
//! `incorrect` is rejected and each of `malformed` refused for the reason that stands in its file
//! `expected`.

#![allow(clippy::unwrap_used)]

use std::fs;
use std::path::{Path, PathBuf};

use maskproof::audit::Verdict;
use maskproof::pipeline::{AuditJob, audit};

/// The cases of a kind, by name.
fn cases(kind: &str) -> Vec<PathBuf> {
    let directory = Path::new("tests/audit").join(kind);
    let mut cases: Vec<PathBuf> = fs::read_dir(directory)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .collect();
    cases.sort();
    assert!(cases.len() >= 8, "{kind}: {} cases", cases.len());
    cases
}

fn verdict(case: &Path) -> Verdict {
    let names = ["input.col", "input.json", "input.gds"];
    let input = names
        .iter()
        .map(|name| case.join(name))
        .find(|path| path.exists());
    let job = AuditJob {
        directory: case.to_path_buf(),
        input: input.unwrap(),
        ..AuditJob::default()
    };
    audit(&job).unwrap()
}

/// Holds each case of a kind against its file `expected`; `shown` gives the reason of a verdict of the kind.
fn hold(kind: &str, shown: impl Fn(&Verdict) -> Option<String>) {
    let mut wrong = Vec::new();
    for case in cases(kind) {
        let expected = fs::read_to_string(case.join("expected")).unwrap();
        let verdict = verdict(&case);
        let found = shown(&verdict).map(|reason| format!("{reason}\n"));
        if found.as_ref() != Some(&expected) {
            wrong.push(format!(
                "{}:\n  expected {expected}  found    {verdict:?}",
                case.display()
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn the_correct_are_accepted() {
    for case in cases("correct") {
        let verdict = verdict(&case);
        assert!(
            matches!(verdict, Verdict::Accepted(_)),
            "{}: {verdict:?}",
            case.display()
        );
    }
}

#[test]
fn the_incorrect_are_rejected_for_their_reason() {
    hold("incorrect", |verdict| match verdict {
        Verdict::Rejected(rejection) => Some(rejection.to_string()),
        _ => None,
    });
}

#[test]
fn the_malformed_are_refused_with_their_place() {
    hold("malformed", |verdict| match verdict {
        Verdict::Malformed(malformed) => Some(malformed.to_string()),
        _ => None,
    });
}
