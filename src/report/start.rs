//! A colouring that was given to begin with, beside the one that was found.

use std::collections::BTreeSet;

use encodings::{Cost, Instance, Mask};

use super::assemble::{self, Places};
use super::{Stitched, Unresolved};
use crate::solve::Bounds;
use crate::solve::keep::{Kept, KeptPlace};

/// What is told of a colouring that was given.
#[derive(Clone, Debug)]
pub struct StartFacts {
    /// The name of its file, without directories.
    pub file: String,
    /// What it costs.
    pub cost: Cost,
    /// Fragments on a mask that they may not take.
    pub forbidden: u64,
    /// Ties that it breaks.
    pub broken_ties: u64,
    /// Conflicts that it leaves and the colouring written does not.
    pub unresolved: Vec<Unresolved>,
    /// Stitches that it uses and the colouring written does not.
    pub stitched: Vec<Stitched>,
    /// What keeping it gave, where that was asked for.
    pub kept: Option<KeptFacts>,
}

/// What is told of a colouring that was kept where it does not fail.
#[derive(Clone, Debug)]
pub struct KeptFacts {
    /// What the colouring written costs.
    pub cost: Cost,
    /// The places where the start fails.
    pub places: Vec<KeptPlace>,
    /// How many features have other masks than in the start.
    pub changed: u64,
    /// Whether nothing that keeps the rest costs less, and nothing of that cost changes fewer features.
    pub proven: bool,
    /// The least conflicts where nothing is kept.
    pub free_conflicts: Bounds,
    /// The least stitches where nothing is kept, as far as `free_conflicts` is proven.
    pub free_stitches: Bounds,
}

impl KeptFacts {
    /// What is told of `kept`, which solving without it left with the bounds given.
    pub fn of(kept: &Kept, cost: Cost, [free_conflicts, free_stitches]: [Bounds; 2]) -> KeptFacts {
        KeptFacts {
            cost,
            changed: kept.changed_count(),
            proven: kept.is_proven(),
            places: kept.places.clone(),
            free_conflicts,
            free_stitches,
        }
    }

    /// How many places cost as much as before.
    pub fn no_better(&self) -> u64 {
        let same = self.places.iter().filter(|place| place.is_no_better());
        same.count() as u64
    }
}

/// Compares a colouring that was given with the one written. Both have a mask below K for each fragment.
pub fn compare(
    file: String,
    instance: &Instance,
    start: &[Mask],
    written: &[Mask],
    places: &dyn Places,
) -> StartFacts {
    let allowed = (0u32..).zip(start);
    let forbidden = allowed.filter(|&(fragment, &mask)| !instance.allowed(fragment).contains(mask));
    let left = assemble::unresolved(instance, written, places);
    let left: BTreeSet<[u32; 2]> = left.iter().map(|left| left.features).collect();
    let used = assemble::stitched(instance, written, places);
    let used: BTreeSet<[u32; 2]> = used.iter().map(|used| used.fragments).collect();
    let unresolved = assemble::unresolved(instance, start, places).into_iter();
    let stitched = assemble::stitched(instance, start, places).into_iter();
    StartFacts {
        file,
        cost: instance.cost(start),
        forbidden: forbidden.count() as u64,
        broken_ties: instance.broken_ties(start).count() as u64,
        unresolved: unresolved
            .filter(|own| !left.contains(&own.features))
            .collect(),
        stitched: stitched
            .filter(|own| !used.contains(&own.fragments))
            .collect(),
        kept: None,
    }
}

/// The lines of the summary.
pub fn lines(start: &StartFacts) -> Vec<String> {
    let mut lines = vec![format!("start {}: {}", start.file, said(start.cost))];
    if start.forbidden + start.broken_ties > 0 {
        lines.push(format!(
            "  it is not legal: {} on a mask not allowed, {} broken",
            plural(start.forbidden, "fragment"),
            plural(start.broken_ties, "tie")
        ));
    }
    let Some(kept) = &start.kept else {
        lines.push(format!(
            "  {} and {} only there, not in the colouring written",
            plural(start.unresolved.len() as u64, "conflict"),
            plural(start.stitched.len() as u64, "stitch place")
        ));
        return lines;
    };
    if kept.places.is_empty() {
        lines.push("kept: it fails nowhere, so nothing is changed".to_owned());
    } else {
        let fewest = if kept.proven {
            ", the fewest possible"
        } else {
            ""
        };
        lines.push(format!(
            "kept: {} in {} solved anew, {} changed{fewest}: {}",
            plural(
                kept.places
                    .iter()
                    .map(|place| place.features.len() as u64)
                    .sum(),
                "feature"
            ),
            plural(kept.places.len() as u64, "place"),
            plural(kept.changed, "feature"),
            said(kept.cost),
        ));
    }
    match kept.no_better() {
        0 => {}
        count => {
            let known = if kept.proven {
                "cannot be made better"
            } else {
                "was not made better"
            };
            lines.push(format!(
                "  {} {known} with all else fixed",
                plural(count, "place")
            ));
        }
    }
    lines.push(format!("keeping the rest fixed costs {}", more(kept)));
    lines
}

/// What keeping costs.
fn more(kept: &KeptFacts) -> String {
    let (conflicts, stitches) = (kept.free_conflicts, kept.free_stitches);
    let free = Cost {
        conflicts: conflicts.upper,
        stitches: stitches.upper,
    };
    let known = match conflicts.is_tight() && stitches.is_tight() {
        true => format!(
            "the least possible where nothing is fixed is {}",
            said(free)
        ),
        false => format!("the best found where nothing is fixed has {}", said(free)),
    };
    let apart = if kept.cost <= free {
        "nothing".to_owned()
    } else if kept.cost.conflicts > free.conflicts {
        let more = kept.cost.conflicts - free.conflicts;
        format!("{more} more {}", noun(more, "conflict"))
    } else {
        let more = kept.cost.stitches - free.stitches;
        format!("{more} more in stitches")
    };
    format!("{apart}: {known}")
}

fn said(cost: Cost) -> String {
    let stitches = noun(cost.stitches, "stitch");
    format!(
        "{}, {} {stitches}",
        plural(cost.conflicts, "conflict"),
        cost.stitches
    )
}

fn plural(count: u64, one: &str) -> String {
    format!("{count} {}", noun(count, one))
}

fn noun(count: u64, one: &str) -> String {
    match (count, one.ends_with("ch")) {
        (1, _) => one.to_owned(),
        (_, true) => format!("{one}es"),
        (_, false) => format!("{one}s"),
    }
}
