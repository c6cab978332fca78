//! What a sweep has found: one row a combination of rules, and how it is told.
//!
//! | file | what it does |
//! |---|---|
//! | `table` | the table on the terminal |
//! | `answers` | the sentences below it: masks needed, what a stitch policy loses |
//! | `csv` | `sweep.csv` |
//! | `price` | the price of a mask, in decimals without rounding |

pub mod answers;
pub mod csv;
pub mod price;
pub mod table;

use std::time::Duration;

use super::{Counts, Stop, Verdict};
use crate::layout::length::Micrometres;
use crate::layout::{LayerId, Policy};
use crate::solve::Bounds;
pub use price::Price;

/// All combinations and what is known of them.
#[derive(Clone, Debug)]
pub struct Sweep {
    /// The name of the input file, without its directories.
    pub input: String,
    /// The layer; nothing for an abstract graph.
    pub layer: Option<SweptLayer>,
    /// The price of one more mask.
    pub mask_cost: Option<Price>,
    /// One row a combination. Rows of one setting lie together, their numbers of masks ascending.
    pub rows: Vec<Row>,
}

/// The layer that was swept.
#[derive(Clone, Debug)]
pub struct SweptLayer {
    /// The top cell.
    pub top: String,
    /// The layer.
    pub layer: LayerId,
    /// One database unit, in picometres.
    pub unit_pm: u64,
}

/// All of a combination but the number of masks, in database units.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Setting {
    /// The same-mask spacing.
    pub spacing: i32,
    /// The stitch policy.
    pub policy: Policy,
    /// The overlap of a stitch and the smallest fragment length; nothing where there are no stitches.
    pub stitch: Option<[i32; 2]>,
}

/// A combination.
#[derive(Clone, Copy, Debug)]
pub struct Row {
    /// K.
    pub masks: u8,
    /// The other rules; nothing for an abstract graph.
    pub setting: Option<Setting>,
    /// What is known; nothing where the sweep was stopped before.
    pub found: Option<Found>,
}

/// What is known of a combination.
#[derive(Clone, Copy, Debug)]
pub struct Found {
    /// Sizes of the instance.
    pub counts: Counts,
    /// Bounds on the least number of conflicts.
    pub conflicts: Bounds,
    /// Bounds on the least stitches; while `conflicts` is open, `upper` is what the colouring found has.
    pub stitches: Bounds,
    /// What stopped the search before everything was proven.
    pub stop: Option<Stop>,
    /// What the combination added to the run. The only part that differs from run to run.
    pub time: Duration,
}

impl Found {
    /// The verdict.
    pub fn verdict(&self) -> Verdict {
        Verdict::of(self.conflicts, self.stitches)
    }
}

/// What one more mask saves.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Saved {
    /// Conflicts fewer.
    pub conflicts: i64,
    /// Stitches fewer; negative where conflicts are resolved by more stitches.
    pub stitches: i64,
}

impl Row {
    /// The verdict; undecided where nothing is known.
    pub fn verdict(&self) -> Verdict {
        self.found
            .as_ref()
            .map_or(Verdict::Undecided, Found::verdict)
    }

    /// What stopped it, if anything did.
    pub fn stop(&self) -> Option<Stop> {
        match &self.found {
            Some(found) => found.stop,
            None => Some(Stop::Interrupt),
        }
    }
}

impl Sweep {
    /// Whether every combination has a proven verdict.
    pub fn is_decided(&self) -> bool {
        let mut rows = self.rows.iter();
        rows.all(|row| row.verdict() != Verdict::Undecided)
    }

    /// How many combinations were not begun.
    pub fn left_out(&self) -> usize {
        self.rows.iter().filter(|row| row.found.is_none()).count()
    }

    /// What the row saves against the one before it, where that has the same setting and one mask less, and
    /// all four numbers are proven.
    pub fn saved(&self, row: usize) -> Option<Saved> {
        let (one, other) = (self.rows.get(row.checked_sub(1)?)?, self.rows.get(row)?);
        if one.setting != other.setting || one.masks + 1 != other.masks {
            return None;
        }
        let (one, other) = (one.found?, other.found?);
        let fewer = |one: Bounds, other: Bounds| {
            let proven = one.is_tight() && other.is_tight();
            proven.then(|| one.upper as i64 - other.upper as i64)
        };
        Some(Saved {
            conflicts: fewer(one.conflicts, other.conflicts)?,
            stitches: fewer(one.stitches, other.stitches)?,
        })
    }

    /// The price of each conflict that the row saves, where it saves any and a price is given.
    pub fn price_per_conflict(&self, row: usize) -> Option<String> {
        let saved = u64::try_from(self.saved(row)?.conflicts).ok()?;
        self.mask_cost.as_ref()?.per(saved)
    }

    /// A length in micrometres.
    fn um(&self, units: i32) -> Micrometres {
        let unit_pm = self.layer.as_ref().map_or(0, |layer| layer.unit_pm);
        Micrometres::new(units, unit_pm)
    }

    /// The rows of each setting in turn, with the number of the first one.
    fn groups(&self) -> impl Iterator<Item = &[Row]> {
        self.rows
            .chunk_by(|one, other| one.setting == other.setting)
    }
}

#[cfg(test)]
mod samples;
