//! The members of `result.json` that speak of a colouring that was given.

use std::io::{self, Write};

use encodings::Cost;
use serde::Serialize;

use super::result::{Conflict, Limits, Stitch, conflict, limits, stitch};
use super::start::{KeptFacts, StartFacts};
use crate::formats::document::Document;
use crate::solve::keep::KeptPlace;

#[derive(Serialize)]
struct Start<'a> {
    input: &'a str,
    conflicts: u64,
    stitches: u64,
    forbidden: u64,
    broken_ties: u64,
}

#[derive(Serialize)]
#[serde(untagged)]
enum Difference {
    Unresolved(Conflict),
    Stitched(OnlyStitch),
}

#[derive(Serialize)]
struct OnlyStitch {
    kind: &'static str,
    #[serde(flatten)]
    stitch: Stitch,
}

#[derive(Serialize)]
struct Keep {
    conflicts: u64,
    stitches: u64,
    proven: bool,
    changed_features: u64,
    free_conflicts: Limits,
    free_stitches: Limits,
}

#[derive(Serialize)]
struct Place<'a> {
    features: &'a [u32],
    start: Sum,
    kept: Sum,
    changed: &'a [u32],
    proven: bool,
}

#[derive(Serialize)]
struct Sum {
    conflicts: u64,
    stitches: u64,
}

/// Writes the members.
pub fn write<W: Write>(
    start: &StartFacts,
    unit_pm: u64,
    document: &mut Document<'_, W>,
) -> io::Result<()> {
    document.member(
        "start",
        Start {
            input: &start.file,
            conflicts: start.cost.conflicts,
            stitches: start.cost.stitches,
            forbidden: start.forbidden,
            broken_ties: start.broken_ties,
        },
    )?;
    let unresolved = start.unresolved.iter();
    let unresolved = unresolved.map(|left| Difference::Unresolved(conflict(left, unit_pm)));
    let stitched = start.stitched.iter().map(|used| {
        let stitch = stitch(used, unit_pm);
        let kind = "stitch";
        Difference::Stitched(OnlyStitch { kind, stitch })
    });
    document.list("start_differences", unresolved.chain(stitched))?;
    if let Some(kept) = &start.kept {
        document.member("keep", keep(kept))?;
        document.list("keep_places", kept.places.iter().map(place))?;
    }
    Ok(())
}

fn keep(kept: &KeptFacts) -> Keep {
    Keep {
        conflicts: kept.cost.conflicts,
        stitches: kept.cost.stitches,
        proven: kept.proven,
        changed_features: kept.changed,
        free_conflicts: limits(kept.free_conflicts),
        free_stitches: limits(kept.free_stitches),
    }
}

fn place(place: &KeptPlace) -> Place<'_> {
    let sum = |cost: Cost| Sum {
        conflicts: cost.conflicts,
        stitches: cost.stitches,
    };
    Place {
        features: &place.features,
        start: sum(place.start),
        kept: sum(place.cost),
        changed: &place.changed,
        proven: place.least && place.fewest,
    }
}
