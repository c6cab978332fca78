//! The verdict of an audit as text.

use std::fmt::Write as _;

use crate::audit::{Theorem, Verdict};

/// What is printed of a verdict on the certificate in the directory `name`.
pub fn text(name: &str, verdict: &Verdict) -> String {
    match verdict {
        Verdict::Accepted(theorem) => accepted(name, theorem),
        Verdict::Rejected(rejection) => format!("{name}: rejected\n{rejection}\n"),
        Verdict::Malformed(malformed) => format!("{name}: malformed\n{malformed}\n"),
    }
}

fn accepted(name: &str, theorem: &Theorem) -> String {
    let mut text = format!("{name}: accepted\n{theorem}\n\n");
    let tally = theorem.tally;
    let rows = [
        ("features", theorem.features, "derived from the input again"),
        ("stitch candidates", theorem.stitch_candidates, ""),
        ("bounds", tally.enumerated, "by enumeration"),
        ("", tally.cliques, "by a clique"),
        ("", tally.cycles, "by an odd cycle"),
        ("", tally.proofs, "by a checked proof"),
    ];
    for (title, count, note) in rows {
        if count > 0 || title == "features" {
            let _ = writeln!(
                text,
                "{}",
                format!("{title:<18}{count:>12}  {note}").trim_end()
            );
        }
    }
    text
}
