//! The one place where the integration tests call the program's solving.

use super::enumerate;
use encodings::{Instance, Mask};
use std::time::Duration;

/// A way to solve: with or without reductions, by one engine.
#[derive(Clone, Copy, Debug)]
pub struct Setting {
    /// Its name in messages.
    pub name: &'static str,
}

/// What came out: bounds and a colouring that meets the upper ones.
#[derive(Clone, Debug)]
pub struct Found {
    /// Lower and upper bound of the conflicts.
    pub conflicts: (u64, u64),
    /// Lower and upper bound of the stitches.
    pub stitches: (u64, u64),
    /// A colouring of cost (conflicts upper, stitches upper).
    pub colouring: Vec<Mask>,
}

/// Every setting that must give the least cost.
pub fn settings() -> Vec<Setting> {
    vec![Setting {
        name: "every colouring, priced by encodings",
    }]
}

/// Solves an instance; bounds may stay apart after `limit`.
pub fn solve(instance: &Instance, _setting: Setting, _limit: Duration) -> Found {
    // A stand-in until the engines are connected: it holds `Instance::cost` against the count of
    // the enumeration.
    let mut best = None;
    enumerate::each_colouring(instance, |colouring| {
        let cost = instance.cost(colouring);
        if best.as_ref().is_none_or(|(least, _)| cost < *least) {
            best = Some((cost, colouring.to_vec()));
        }
    });
    let (cost, colouring) = best.unwrap();
    Found {
        conflicts: (cost.conflicts, cost.conflicts),
        stitches: (cost.stitches, cost.stitches),
        colouring,
    }
}
