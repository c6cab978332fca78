//! Sweeps for the tests of the writers.

use std::time::Duration;

use super::{Found, Price, Row, Setting, Sweep, SweptLayer};
use crate::layout::{LayerId, Policy};
use crate::report::{Counts, Stop};
use crate::solve::Bounds;

/// Bounds.
pub fn bounds([lower, upper]: [u64; 2]) -> Bounds {
    Bounds { lower, upper }
}

/// What is known of a combination.
pub fn found(conflicts: [u64; 2], stitches: [u64; 2]) -> Found {
    let (conflicts, stitches) = (bounds(conflicts), bounds(stitches));
    let proven = conflicts.is_tight() && stitches.is_tight();
    Found {
        counts: Counts {
            features: 1000,
            fragments: 1200,
            conflict_pairs: 481,
            self_spacings: 3,
            self_spacing_features: 3,
            stitch_candidates: 200,
        },
        conflicts,
        stitches,
        stop: (!proven).then_some(Stop::TimeLimit),
        time: Duration::from_millis(250),
    }
}

/// A row at a spacing of 500 nm.
pub fn row(masks: u8, policy: Policy, found: Option<Found>) -> Row {
    let setting = Setting {
        spacing: 500,
        policy,
        stitch: (policy != Policy::None).then_some([40, 100]),
    };
    Row {
        masks,
        setting: Some(setting),
        found,
    }
}

/// Three policies, one row stopped and one not begun.
pub fn layer() -> Sweep {
    let proven = |conflicts, stitches| Some(found([conflicts; 2], [stitches; 2]));
    let layer = LayerId {
        layer: 68,
        datatype: 20,
    };
    Sweep {
        input: "block.gds".to_owned(),
        layer: Some(SweptLayer {
            top: "top".to_owned(),
            layer,
            unit_pm: 1000,
        }),
        mask_cost: Price::parse("1.5e6").ok(),
        rows: vec![
            row(2, Policy::None, proven(58, 0)),
            row(3, Policy::None, proven(10, 0)),
            row(2, Policy::Uncovered, proven(50, 8)),
            row(3, Policy::Uncovered, proven(0, 11)),
            row(2, Policy::EveryInterval, proven(48, 9)),
            row(3, Policy::EveryInterval, Some(found([0, 2], [0, 12]))),
            row(4, Policy::EveryInterval, None),
        ],
    }
}

/// A graph over two and three masks.
pub fn graph() -> Sweep {
    let row = |masks, conflicts| Row {
        masks,
        setting: None,
        found: Some(found([conflicts; 2], [0; 2])),
    };
    Sweep {
        input: "k3.col".to_owned(),
        layer: None,
        mask_cost: None,
        rows: vec![row(2, 1), row(3, 0)],
    }
}
