//! The one place where the integration tests call the program's solving.

use std::time::{Duration, Instant};

use super::audited;
use encodings::{Instance, Mask};
use maskproof::merge::merge;
use maskproof::reduce::{Reductions, reduce};
use maskproof::solve::{Bounds, Choice, Limits, Scale, solve_pieces};

/// A way to solve: which reductions, which engine.
#[derive(Clone, Copy, Debug)]
pub struct Setting {
    /// Its name in messages.
    pub name: &'static str,
    /// Which reductions are on.
    pub reductions: Reductions,
    /// Which engine.
    pub choice: Choice,
}

impl Setting {
    /// Whether it tries all colourings of a piece, and so fits small ones only.
    pub fn enumerates(&self) -> bool {
        self.choice == Choice::Enumeration
    }
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

/// The program as it runs.
pub const USUAL: Setting = Setting {
    name: "usual",
    reductions: Reductions::ALL,
    choice: Choice::Auto,
};

/// Every setting that must give the least cost: the engines without reductions, each reduction alone,
/// all together, and the core-guided search in windows so small that all of its steps happen.
pub fn settings() -> Vec<Setting> {
    let none = Reductions::NONE;
    let (usual, tiny) = (
        Choice::CoreGuided(Scale::USUAL),
        Choice::CoreGuided(Scale::TINY),
    );
    let setting = |name, reductions, choice| Setting {
        name,
        reductions,
        choice,
    };
    vec![
        USUAL,
        setting("enumeration", none, Choice::Enumeration),
        setting("core-guided", none, usual),
        setting("core-guided in tiny windows", none, tiny),
        setting("automatic", none, Choice::Auto),
        setting(
            "peel",
            Reductions { peel: true, ..none },
            Choice::Enumeration,
        ),
        setting(
            "dominated",
            Reductions {
                dominated: true,
                ..none
            },
            Choice::Enumeration,
        ),
        setting(
            "blocks",
            Reductions {
                blocks: true,
                ..none
            },
            Choice::Enumeration,
        ),
        setting(
            "cuts",
            Reductions { cuts: true, ..none },
            Choice::Enumeration,
        ),
        setting(
            "blocks and cuts",
            Reductions {
                blocks: true,
                cuts: true,
                ..none
            },
            Choice::Enumeration,
        ),
        setting(
            "identical",
            Reductions {
                identical: true,
                ..none
            },
            Choice::Enumeration,
        ),
        setting("all, core-guided", Reductions::ALL, tiny),
    ]
}

/// Solves an instance; bounds may stay apart after `limit`.
pub fn solve(instance: &Instance, setting: Setting, limit: Duration) -> Found {
    let reduced = reduce(instance, setting.reductions).unwrap();
    let limits = Limits {
        deadline: Instant::now().checked_add(limit),
        ..Limits::default()
    };
    let outcomes = solve_pieces(&reduced, setting.choice, &limits, &|_| {});
    let colourings: Vec<&[Mask]> = outcomes
        .iter()
        .map(|outcome| &outcome.colouring[..])
        .collect();
    let merged = merge(instance, &reduced, &colourings).unwrap();
    let (mut conflicts, mut stitches) = (Bounds::default(), Bounds::default());
    for outcome in &outcomes {
        conflicts += outcome.conflicts;
        stitches += outcome.stitches;
    }
    assert_eq!(
        (conflicts.upper, stitches.upper),
        (merged.cost.conflicts, merged.cost.stitches)
    );
    if cfg!(feature = "self-check") {
        let made = audited::certificate(instance, &reduced, &outcomes, &merged.colouring);
        audited::audit(instance, &made).unwrap();
        let (certificate, _) = made;
        for (found, certified) in [
            (conflicts, certificate.conflicts),
            (stitches, certificate.stitches),
        ] {
            assert!(
                certified.lower <= found.lower,
                "{certified:?} was never claimed"
            );
            // What a limit left open may be proven less of.
            assert!(
                certified.is_tight() || !conflicts.is_tight() || !stitches.is_tight(),
                "{certified:?} of {found:?} for {instance:?} {certificate:?}"
            );
        }
    }
    Found {
        conflicts: (conflicts.lower, conflicts.upper),
        stitches: (stitches.lower, stitches.upper),
        colouring: merged.colouring,
    }
}
