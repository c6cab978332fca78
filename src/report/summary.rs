//! The summary: what people read first, on a screen or in a log.

use std::fmt::Write as _;
use std::path::Path;
use std::time::Duration;

use super::{LayerFacts, Report, Stop, Verdict, start};
use crate::layout::Policy;
use crate::layout::length::Micrometres;
use crate::solve::Bounds;

/// How many unresolved conflicts are listed; the rest is in `result.json`.
const LISTED: usize = 5;

/// The summary, its last line ended. `out` is where the files are.
pub fn text(report: &Report, out: Option<&Path>) -> String {
    let mut text = format!("{}\n{}\n\n", heading(report), sentence(report));
    for (name, value, note) in rows(report) {
        let _ = writeln!(text, "{name:<18}{value:>12}  {note}").map(|()| trim_end(&mut text));
    }
    if let Some(start) = &report.start {
        let lines = start::lines(start);
        let _ = writeln!(text, "\n{}", lines.join("\n"));
    }
    list_unresolved(report, out.is_some(), &mut text);
    if let Some(out) = out {
        let _ = writeln!(text, "\nwritten to {}", out.display());
    }
    text
}

fn heading(report: &Report) -> String {
    match &report.layer {
        None => format!("{}: graph, {}", report.input, masks(report)),
        Some(layer) => format!(
            "{}: layer {} of {}, {}, {} um apart",
            report.input,
            layer.rules.layer,
            layer.top,
            masks(report),
            Micrometres::new(layer.rules.spacing, layer.unit_pm),
        ),
    }
}

fn masks(report: &Report) -> String {
    plural(u64::from(report.masks), "mask")
}

/// The verdict as a sentence.
fn sentence(report: &Report) -> String {
    let verdict = report.verdict();
    let (conflicts, stitches) = (report.conflicts, report.stitches);
    let reason = match verdict {
        Verdict::Decomposable if stitches.upper == 0 => {
            "no conflict is left, without a stitch".to_owned()
        }
        Verdict::Decomposable => format!(
            "no conflict is left, with the fewest stitches possible ({})",
            stitches.upper
        ),
        Verdict::NotDecomposable => format!(
            "{} cannot be avoided, and the colouring has no more",
            plural(conflicts.upper, "conflict")
        ),
        Verdict::Undecided => undecided(report),
    };
    format!("{}: {reason}", verdict.as_str())
}

fn undecided(report: &Report) -> String {
    let stop = report.stop.map_or("a limit", Stop::words);
    let open = if report.conflicts.is_tight() {
        format!(
            "no conflict is left; the least number of stitches is {}",
            between(report.stitches)
        )
    } else {
        format!(
            "the least number of conflicts is {}",
            between(report.conflicts)
        )
    };
    let did = match report.stop {
        Some(Stop::Keep) => "costs more than need be",
        _ => "ended the run",
    };
    format!("{stop} {did}; {open}")
}

fn between(bounds: Bounds) -> String {
    format!("{} to {}", bounds.lower, bounds.upper)
}

fn rows(report: &Report) -> Vec<(&'static str, String, String)> {
    let counts = report.counts;
    let mut rows = Vec::new();
    let mut row = |name, value: String, note: String| rows.push((name, value, note));
    let from = report
        .layer
        .as_ref()
        .map(|layer| format!("from {}", plural(layer.shapes, "shape")));
    row(
        "features",
        grouped(counts.features),
        from.unwrap_or_default(),
    );
    row("fragments", grouped(counts.fragments), String::new());
    row(
        "conflict pairs",
        grouped(counts.conflict_pairs),
        String::new(),
    );
    if counts.self_spacings > 0 {
        row(
            "self-spacings",
            grouped(counts.self_spacings),
            String::new(),
        );
    }
    row(
        "stitch candidates",
        grouped(counts.stitch_candidates),
        completeness(report),
    );
    row(
        "pieces",
        grouped(report.pieces.len() as u64),
        largest(report),
    );
    if let Some(layer) = report
        .layer
        .as_ref()
        .filter(|layer| !layer.too_close.is_empty())
    {
        row(
            "layout errors",
            grouped(layer.too_close.len() as u64),
            "closer than the any-mask spacing: no masks mend them".to_owned(),
        );
    }
    row(
        "conflicts",
        grouped(report.conflicts.upper),
        proven(report.conflicts),
    );
    row(
        "stitches",
        grouped(report.stitches.upper),
        if report.conflicts.is_tight() {
            proven(report.stitches)
        } else {
            "of the colouring found".to_owned()
        },
    );
    row("time", seconds(report.timings.total()), stages(report));
    rows
}

/// What the policy `every-interval` says of its candidates.
fn completeness(report: &Report) -> String {
    let complete = |layer: &&LayerFacts| layer.rules.stitch.policy == Policy::EveryInterval;
    let Some(layer) = report.layer.as_ref().filter(complete) else {
        return String::new();
    };
    let found = grouped(layer.candidates_found);
    let beyond = layer.beyond_theorem.len() as u64;
    match beyond {
        0 => format!("of {found} found; no other place would do better"),
        _ => format!(
            "of {found} found; no other place would do better, {} of {} features apart",
            grouped(beyond),
            grouped(report.counts.features)
        ),
    }
}

fn proven(bounds: Bounds) -> String {
    if bounds.is_tight() {
        "the least possible, proven".to_owned()
    } else {
        format!("at least {} proven", grouped(bounds.lower))
    }
}

fn largest(report: &Report) -> String {
    report
        .pieces
        .iter()
        .map(|piece| piece.counts.fragments)
        .max()
        .map(|fragments| format!("largest: {}", plural(fragments, "fragment")))
        .unwrap_or_default()
}

/// The stages that took at least a tenth of the time.
fn stages(report: &Report) -> String {
    let total = report.timings.total();
    report
        .timings
        .stages
        .iter()
        .filter(|(_, time)| *time * 10 >= total && !time.is_zero())
        .map(|(stage, time)| format!("{stage} {}", seconds(*time)))
        .collect::<Vec<_>>()
        .join(", ")
}

fn list_unresolved(report: &Report, written: bool, text: &mut String) {
    if report.unresolved.is_empty() {
        return;
    }
    let unit_pm = report.layer.as_ref().map_or(0, |layer| layer.unit_pm);
    text.push_str("\nunresolved conflicts\n");
    for left in report.unresolved.iter().take(LISTED) {
        let [a, b] = left.features;
        let who = if a == b {
            format!("feature {a} with itself")
        } else {
            format!("features {a} and {b}")
        };
        let place = left.place.map_or(String::new(), |place| {
            let at = |x| Micrometres::new(x, unit_pm);
            format!(", near ({}, {}) um", at(place.min.x), at(place.min.y))
        });
        let _ = writeln!(text, "  {who}, both on mask {}{place}", left.mask + 1);
    }
    if report.unresolved.len() > LISTED {
        let more = grouped((report.unresolved.len() - LISTED) as u64);
        let place = if written {
            "listed in result.json"
        } else {
            "with --out DIR all are listed"
        };
        let _ = writeln!(text, "  and {more} more, {place}");
    }
}

pub(super) fn seconds(time: Duration) -> String {
    format!("{:.2} s", time.as_secs_f64())
}

pub(super) fn plural(count: u64, noun: &str) -> String {
    let ending = if count == 1 { "" } else { "s" };
    format!("{} {noun}{ending}", grouped(count))
}

/// Digits in groups of three.
pub(super) fn grouped(number: u64) -> String {
    let digits = number.to_string();
    let mut text = String::with_capacity(digits.len() + digits.len() / 3);
    for (i, digit) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

fn trim_end(text: &mut String) {
    let kept = text.trim_end().len();
    text.truncate(kept);
    text.push('\n');
}

impl Stop {
    fn words(self) -> &'static str {
        match self {
            Stop::Interrupt => "an interrupt",
            Stop::TimeLimit => "the time limit",
            Stop::PieceLimit => "the limit of a piece",
            Stop::ProofLimit => "the limit of a proof",
            Stop::Keep => "what --keep leaves fixed",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::samples;

    #[test]
    fn the_sentence_says_what_is_proven() {
        let mut report = samples::layer();
        let mut said = |conflicts: [u64; 2], stitches: [u64; 2]| {
            report.conflicts = Bounds {
                lower: conflicts[0],
                upper: conflicts[1],
            };
            report.stitches = Bounds {
                lower: stitches[0],
                upper: stitches[1],
            };
            sentence(&report)
        };
        assert_eq!(
            said([2, 3], [0, 1]),
            "undecided: the time limit ended the run; the least number of conflicts is 2 to 3"
        );
        assert_eq!(
            said([0, 0], [4, 6]),
            "undecided: the time limit ended the run; no conflict is left; the least number of \
             stitches is 4 to 6"
        );
        assert_eq!(
            said([1, 1], [0, 0]),
            "not decomposable: 1 conflict cannot be avoided, and the colouring has no more"
        );
        assert_eq!(
            said([0, 0], [0, 0]),
            "decomposable: no conflict is left, without a stitch"
        );
        assert_eq!(
            said([0, 0], [7, 7]),
            "decomposable: no conflict is left, with the fewest stitches possible (7)"
        );
    }

    #[test]
    fn stitches_are_proven_only_where_conflicts_are() {
        let mut report = samples::layer();
        report.stitches = Bounds { lower: 0, upper: 0 };
        let row = |report: &Report| {
            let rows = rows(report);
            let row = rows.iter().find(|row| row.0 == "stitches");
            row.map(|row| row.2.clone()).unwrap_or_default()
        };
        assert_eq!(row(&report), "of the colouring found");
        report.conflicts = Bounds { lower: 3, upper: 3 };
        assert_eq!(row(&report), "the least possible, proven");
    }

    #[test]
    fn no_line_ends_in_blanks_and_lists_are_cut() {
        let mut report = samples::layer();
        report.unresolved = vec![report.unresolved[0]; 1005];
        let text = text(&report, Some(Path::new("out")));
        assert!(text.lines().all(|line| line == line.trim_end()));
        assert!(text.contains("features 0 and 2, both on mask 3, near (-0.17, 0) um"));
        assert!(text.contains("and 1,000 more"));
        assert!(text.ends_with("written to out\n"));
    }

    #[test]
    fn digits_come_in_threes() {
        assert_eq!(grouped(0), "0");
        assert_eq!(grouped(999), "999");
        assert_eq!(grouped(1000), "1,000");
        assert_eq!(grouped(12_345_678), "12,345,678");
    }
}
