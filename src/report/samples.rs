//! A small invented report for the tests of this room.

use std::time::Duration;

use super::*;
use crate::geometry::Point;
use crate::layout::{LayerId, Policy, StitchRules};

fn rect(x1: i32, y1: i32, x2: i32, y2: i32) -> Rect {
    Rect {
        min: Point { x: x1, y: y1 },
        max: Point { x: x2, y: y2 },
    }
}

/// Two equal pieces, one unresolved pair named, one stitch used, stopped by the time limit.
pub fn layer() -> Report {
    let counts = Counts {
        features: 4,
        fragments: 5,
        conflict_pairs: 6,
        self_spacings: 1,
        self_spacing_features: 1,
        stitch_candidates: 1,
    };
    let piece = PieceRow {
        counts,
        conflicts: Bounds { lower: 2, upper: 3 },
        stitches: Bounds { lower: 0, upper: 1 },
        engine: Engine::Enumeration,
        same_as: None,
        place: Some(rect(-170, 0, 340, 1000)),
    };
    let twin = PieceRow {
        same_as: Some(0),
        place: None,
        ..piece.clone()
    };
    Report {
        input: "block.gds".to_owned(),
        masks: 3,
        layer: Some(LayerFacts {
            top: "top".to_owned(),
            unit_pm: 1000,
            shapes: 9,
            rules: Rules {
                layer: LayerId {
                    layer: 67,
                    datatype: 20,
                },
                masks: 3,
                spacing: 250,
                stitch: StitchRules {
                    policy: Policy::Uncovered,
                    overlap: 40,
                    fragment_length: 100,
                    corner: 0,
                    weight: 1,
                    ..StitchRules::default()
                },
                spacings: Default::default(),
                hand: Default::default(),
            },
            empty_shapes: 0,
            unstitchable: vec![(3, rect(0, 0, 1, 1))],
            too_close: vec![([1, 2], rect(10, 0, 20, 0))],
            candidates_found: 5,
            beyond_theorem: vec![(2, "too many candidates", rect(0, 0, 4, 4))],
        }),
        counts,
        conflicts: Bounds { lower: 2, upper: 3 },
        stitches: Bounds { lower: 0, upper: 1 },
        stop: Some(Stop::TimeLimit),
        mask_use: vec![MaskUse::default(); 3],
        reductions: reduce::Counts {
            peeled: 3,
            dominated: 0,
            cut: 2,
            identical: 1,
        },
        pieces: vec![piece, twin],
        unresolved: vec![Unresolved {
            features: [0, 2],
            fragments: [1, 3],
            mask: 2,
            place: Some(rect(-170, 0, 0, 10)),
        }],
        stitched: vec![Stitched {
            feature: 1,
            fragments: [1, 2],
            masks: [0, 2],
            weight: 1,
            place: Some(rect(0, 0, 40, 170)),
        }],
        start: None,
        timings: Timings {
            threads: 2,
            stages: vec![("read", Duration::from_millis(120))],
            pieces: vec![Duration::from_millis(100), Duration::ZERO],
        },
    }
}
