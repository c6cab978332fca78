//! The two questions that a sweep is made for, answered in sentences: how many masks the layer needs, and what a
//! stitch policy loses against the one with every candidate that can matter. Only what is proven is said.

use std::fmt::Write as _;

use super::table::stitch_lengths;
use super::{Found, Row, Setting, Sweep};
use crate::layout::Policy;
use crate::report::summary::{grouped, plural};

/// Adds the answers.
pub fn add(sweep: &Sweep, text: &mut String) {
    text.push_str("\nhow many masks\n");
    for rows in sweep.groups() {
        let who = rows.first().and_then(|row| row.setting);
        let who = who.map_or(String::new(), |setting| {
            format!("{}: ", name(sweep, &setting))
        });
        let _ = writeln!(text, "  {who}{}", masks_needed(rows));
    }
    let losses: Vec<String> = losses(sweep).collect();
    if !losses.is_empty() {
        let best = Policy::EveryInterval.name();
        let _ = writeln!(text, "\nwhat the stitch policy loses against {best}");
        for loss in losses {
            let _ = writeln!(text, "  {loss}");
        }
    }
}

/// A setting, by what tells it from the others.
fn name(sweep: &Sweep, setting: &Setting) -> String {
    let mut name = format!(
        "{} um, {}",
        sweep.um(setting.spacing),
        setting.policy.name()
    );
    if let Some(lengths) = setting.stitch {
        for (i, what) in ["overlap", "fragments of"].into_iter().enumerate() {
            if stitch_lengths(sweep, i).len() > 1 {
                let _ = write!(name, ", {what} {} um", sweep.um(lengths[i]));
            }
        }
    }
    name
}

/// How many masks a setting needs. `rows` have ascending numbers of masks.
fn masks_needed(rows: &[Row]) -> String {
    let known: Vec<(u8, Found)> = rows
        .iter()
        .filter_map(|row| Some((row.masks, row.found?)))
        .collect();
    let enough = known
        .iter()
        .position(|(_, found)| found.conflicts.upper == 0);
    let (before, masks) = match enough {
        Some(at) => (at.checked_sub(1).map(|before| &known[before]), known[at].0),
        None => return not_enough(&known),
    };
    match before {
        None if masks == 2 => "2 masks are enough".to_owned(),
        None => format!("{masks} masks are enough; fewer were not tried"),
        Some((fewer, found)) if found.conflicts.lower == 0 => {
            format!("{masks} masks are enough; whether {fewer} are is undecided")
        }
        Some((fewer, found)) if fewer + 1 == masks => {
            format!("{masks} masks are needed: {}", left_with(*fewer, found))
        }
        Some((fewer, found)) => format!(
            "{masks} masks are enough: {}; numbers between were not tried",
            left_with(*fewer, found)
        ),
    }
}

/// The same where no number of masks that was solved is known to be enough.
fn not_enough(known: &[(u8, Found)]) -> String {
    // More masks never need more conflicts, so the last proven one says it of all before.
    let short = known
        .iter()
        .rposition(|(_, found)| found.conflicts.lower > 0);
    match (short, known.last()) {
        (_, None) => "not solved".to_owned(),
        (Some(at), _) if at + 1 == known.len() => {
            let (masks, found) = &known[at];
            format!(
                "more than {masks} masks are needed: {}",
                left_with(*masks, found)
            )
        }
        (_, Some((masks, _))) => format!("whether {masks} masks are enough is undecided"),
    }
}

fn left_with(masks: u8, found: &Found) -> String {
    let conflicts = found.conflicts;
    let least = if conflicts.is_tight() {
        ""
    } else {
        "at least "
    };
    let count = plural(conflicts.lower, "conflict");
    format!("with {masks}, {least}{count} cannot be avoided")
}

/// A sentence for each setting that has a counterpart with every candidate.
fn losses(sweep: &Sweep) -> impl Iterator<Item = String> {
    let of = |rows: &[Row]| rows.first().and_then(|row| row.setting);
    sweep.groups().flat_map(move |best| {
        let chosen = of(best).filter(|setting| setting.policy == Policy::EveryInterval);
        sweep.groups().filter_map(move |rows| {
            let (best_setting, setting) = (chosen?, of(rows)?);
            let same_spacing = setting.spacing == best_setting.spacing;
            let same_stitch = setting.stitch.is_none() || setting.stitch == best_setting.stitch;
            let other = setting.policy != Policy::EveryInterval;
            (same_spacing && same_stitch && other)
                .then(|| loss(sweep, (&setting, rows), (&best_setting, best)))
        })
    })
}

fn loss(
    sweep: &Sweep,
    (setting, rows): (&Setting, &[Row]),
    (best_setting, best): (&Setting, &[Row]),
) -> String {
    // Without stitches there are no lengths: those of the counterpart tell which one is meant.
    let shown = Setting {
        stitch: best_setting.stitch,
        ..*setting
    };
    let with = |row: &Row| {
        let counterpart = best.iter().find(|other| other.masks == row.masks)?;
        let lost = match (row.found, counterpart.found) {
            (Some(found), Some(least)) => lost(&found, &least),
            _ => "not solved".to_owned(),
        };
        Some((lost, row.masks))
    };
    let each: Vec<(String, u8)> = rows.iter().filter_map(with).collect();
    let name = name(sweep, &shown);
    if each.iter().all(|(lost, _)| lost == NOTHING) {
        return format!("{name}: {NOTHING}");
    }
    let each = each.iter();
    let each: Vec<String> = each
        .map(|(lost, masks)| format!("{lost} with {masks} masks"))
        .collect();
    format!("{name}: {}", each.join(", "))
}

/// A policy that loses nothing.
const NOTHING: &str = "nothing";

/// What the first one has more than the second one.
fn lost(found: &Found, least: &Found) -> String {
    let (one, other) = (found.conflicts, least.conflicts);
    if !one.is_tight() || !other.is_tight() {
        let most = one.upper.saturating_sub(other.lower);
        return match one.lower.saturating_sub(other.upper) {
            _ if one.upper < other.lower => "fewer conflicts".to_owned(),
            0 => format!("at most {}", plural(most, "conflict")),
            fewest => format!("{} to {}", grouped(fewest), plural(most, "conflict")),
        };
    }
    match more(one.upper, other.upper, "conflict") {
        Some(conflicts) => conflicts,
        None if !found.stitches.is_tight() || !least.stitches.is_tight() => {
            "no conflict, stitches undecided,".to_owned()
        }
        None => more(found.stitches.upper, least.stitches.upper, "stitch")
            .unwrap_or_else(|| NOTHING.to_owned()),
    }
}

/// How many more, or that they are fewer.
fn more(one: u64, other: u64, noun: &str) -> Option<String> {
    let count = |count: u64| match noun {
        "stitch" if count != 1 => format!("{} stitches", grouped(count)),
        _ => plural(count, noun),
    };
    match one.cmp(&other) {
        std::cmp::Ordering::Equal => None,
        std::cmp::Ordering::Greater => Some(count(one - other)),
        std::cmp::Ordering::Less => Some(format!("{} fewer", count(other - one))),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sweep::samples::{found, layer, row};

    fn needed(rows: &[(u8, [u64; 2])]) -> String {
        let of = |&(masks, conflicts)| row(masks, Policy::None, Some(found(conflicts, [0, 0])));
        masks_needed(&rows.iter().map(of).collect::<Vec<_>>())
    }

    #[test]
    fn only_what_is_proven_is_said_of_masks() {
        assert_eq!(
            needed(&[(2, [5, 5]), (3, [1, 1]), (4, [0, 0])]),
            "4 masks are needed: with 3, 1 conflict cannot be avoided"
        );
        assert_eq!(needed(&[(2, [0, 0]), (3, [0, 0])]), "2 masks are enough");
        assert_eq!(
            needed(&[(3, [0, 0])]),
            "3 masks are enough; fewer were not tried"
        );
        assert_eq!(
            needed(&[(2, [2, 7]), (3, [0, 0])]),
            "3 masks are needed: with 2, at least 2 conflicts cannot be avoided"
        );
        assert_eq!(
            needed(&[(2, [9, 9]), (3, [0, 1]), (4, [0, 0])]),
            "4 masks are enough; whether 3 are is undecided"
        );
        assert_eq!(
            needed(&[(2, [9, 9]), (4, [0, 0])]),
            "4 masks are enough: with 2, 9 conflicts cannot be avoided; numbers between were not tried"
        );
        assert_eq!(
            needed(&[(2, [9, 9]), (3, [4, 4])]),
            "more than 3 masks are needed: with 3, 4 conflicts cannot be avoided"
        );
        assert_eq!(
            needed(&[(2, [9, 9]), (3, [0, 4])]),
            "whether 3 masks are enough is undecided"
        );
        assert_eq!(masks_needed(&[row(2, Policy::None, None)]), "not solved");
    }

    #[test]
    fn losses_are_differences() {
        let of = |conflicts, stitches| found(conflicts, stitches);
        let lost = |one: [[u64; 2]; 2], other: [[u64; 2]; 2]| {
            lost(&of(one[0], one[1]), &of(other[0], other[1]))
        };
        assert_eq!(lost([[58; 2], [0; 2]], [[50; 2], [8; 2]]), "8 conflicts");
        assert_eq!(lost([[3; 2], [2; 2]], [[3; 2], [1; 2]]), "1 stitch");
        assert_eq!(lost([[0; 2], [7; 2]], [[0; 2], [5; 2]]), "2 stitches");
        assert_eq!(lost([[0; 2], [0; 2]], [[0; 2], [0; 2]]), "nothing");
        assert_eq!(lost([[2; 2], [0; 2]], [[3; 2], [0; 2]]), "1 conflict fewer");
        assert_eq!(lost([[5; 2], [0; 2]], [[1, 3], [0, 9]]), "2 to 4 conflicts");
        assert_eq!(
            lost([[2, 5], [0, 1]], [[3; 2], [0; 2]]),
            "at most 2 conflicts"
        );
        assert_eq!(
            lost([[3; 2], [0, 4]], [[3; 2], [0; 2]]),
            "no conflict, stitches undecided,"
        );
    }

    #[test]
    fn answers_are_as_written() {
        let mut text = String::new();
        add(&layer(), &mut text);
        assert_eq!(
            text,
            "
how many masks
  0.5 um, none: more than 3 masks are needed: with 3, 10 conflicts cannot be avoided
  0.5 um, uncovered: 3 masks are needed: with 2, 50 conflicts cannot be avoided
  0.5 um, every-interval: whether 3 masks are enough is undecided

what the stitch policy loses against every-interval
  0.5 um, none: 10 conflicts with 2 masks, 8 to 10 conflicts with 3 masks
  0.5 um, uncovered: 2 conflicts with 2 masks, at most 0 conflicts with 3 masks
"
        );
    }
}
