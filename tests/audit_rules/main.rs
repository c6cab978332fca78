//! What the audit makes of the rules of a layer: kinds of spacing, wide features, keep-outs, cuts that are listed or named, masks by hand, and what
//! they tie together. Cases worked out by hand, and random layouts against a raster of unit cells that restates the rules
//! cell by cell.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod cuts;
mod expected;
mod hand;
mod random;
mod raster;
mod raster_tests;
mod spacings;

use maskproof::audit::layer::derive;
use maskproof::audit::{Problem, Rejection, Step};
use maskproof::certificate::{Certificate, Claim, Cut, Digest, Rules as Subject, SplitFeature};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{LayerId, Layout, Policy, Rules, Shapes, StitchRules};

const LAYER: LayerId = LayerId {
    layer: 1,
    datatype: 0,
};
const VIA: LayerId = LayerId {
    layer: 2,
    datatype: 0,
};

fn rules(spacing: i32) -> Rules {
    Rules::plain(LAYER, 3, spacing)
}

fn stitch(policy: Policy, overlap: i32, fragment_length: i32, corner: i32) -> StitchRules {
    StitchRules {
        policy,
        overlap,
        fragment_length,
        corner,
        ..StitchRules::default()
    }
}

fn shapes(rects: &[[i32; 4]]) -> Shapes {
    let mut shapes = Shapes::default();
    for &[x0, y0, x1, y1] in rects {
        shapes.push_rect(Rect::new(x0, y0, x1, y1));
    }
    shapes
}

fn layout(shapes: Shapes) -> Layout {
    Layout {
        top: "top".into(),
        layer: LAYER,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    }
}

fn point([x, y]: [i32; 2]) -> Point {
    Point::new(x, y)
}

/// A cut of a feature: its line, and the fragments on its two sides.
type Named = (u32, [i32; 4], [u32; 2]);

/// A certificate of the features that begin at these points, with these cuts.
fn certificate(rules: &Rules, features: &[[i32; 2]], cuts: &[Named]) -> Certificate {
    let mut split: Vec<SplitFeature> = Vec::new();
    for &(feature, line, sides) in cuts {
        if split.last().is_none_or(|last| last.feature != feature) {
            split.push(SplitFeature {
                feature,
                fragments: 0,
                cuts: Vec::new(),
            });
        }
        let last = split.last_mut().unwrap();
        last.cuts.push(Cut { line, sides });
        last.fragments = last.fragments.max(sides[0].max(sides[1]) + 1);
    }
    Certificate {
        input: Digest {
            sha256: String::new(),
            bytes: 0,
        },
        rules: Subject::of_layer(rules, rules.stitch.policy.name(), "top", 1000),
        conflicts: Claim { lower: 0, upper: 0 },
        stitches: Claim { lower: 0, upper: 0 },
        features: features.to_vec(),
        split,
        colours: Vec::new(),
        conflict_bounds: Vec::new(),
        stitch_bounds: Vec::new(),
    }
}

fn derived(
    layout: &Layout,
    rules: &Rules,
    features: &[[i32; 2]],
    cuts: &[Named],
) -> Result<Problem, Rejection> {
    derive(layout, rules, &certificate(rules, features, cuts))
}

/// Whether two rectangles that are two features are close.
fn two_close(rules: &Rules, rects: [[i32; 4]; 2]) -> bool {
    let features = rects.map(|[x, y, ..]| [x, y]);
    let problem = derived(&layout(shapes(&rects)), rules, &features, &[]).unwrap();
    assert!(problem.close.is_empty() || problem.close == [[0, 1]]);
    !problem.close.is_empty()
}

#[track_caller]
fn assert_rejected(result: Result<Problem, Rejection>, step: Step, reason: &str) {
    let rejection = result.unwrap_err();
    assert_eq!(rejection.step, step, "{rejection}");
    assert!(
        rejection.reason.contains(reason),
        "{rejection}\nshould say {reason}"
    );
}
