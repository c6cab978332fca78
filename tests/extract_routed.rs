//! Features and conflict pairs of a placed and routed block.
//!
//! Source of the numbers: gdstk 1.0.2 (reading and merging) and shapely 2.2 (distances), general
//! geometry libraries, run once on `data/routed_sky130.gds`; its origin is in `data/README.md`.
#![allow(clippy::unwrap_used, clippy::expect_used)]

use maskproof::extract::{Extraction, extract};
use maskproof::formats::gdsii;
use maskproof::layout::{LayerId, Layout, Policy, Rules, StitchRules};

fn layer(layer: u16, datatype: u16) -> Layout {
    let bytes = include_bytes!("data/routed_sky130.gds");
    let id = LayerId { layer, datatype };
    gdsii::read(bytes, &gdsii::Request::new("routed_sky130.gds", id)).unwrap()
}

fn run(layout: &Layout, spacing: i32, masks: u8, policy: Policy) -> Extraction {
    let rules = Rules {
        layer: layout.layer,
        masks,
        spacing,
        stitch: StitchRules {
            policy,
            overlap: 40,
            fragment_length: 100,
            corner: 20,
            weight: 1,
            ..StitchRules::default()
        },
        spacings: Default::default(),
        hand: Default::default(),
    };
    extract(layout, &rules, &|_| ()).unwrap()
}

/// Layer, spacing, K, features, conflict pairs: all rows of the table.
const ROWS: [(LayerId, i32, u8, usize, usize); 10] = [
    (LI1, 180, 3, 739, 1295),
    (LI1, 250, 3, 739, 1618),
    (LI1, 340, 3, 739, 1752),
    (LI1, 250, 2, 739, 1618),
    (LI1, 500, 4, 739, 1806),
    (MET1, 500, 2, 471, 481),
    (MET1, 500, 3, 471, 481),
    (CONTACT, 400, 3, 11946, 7554),
    (CONTACT, 500, 3, 11946, 9514),
    (VIA, 600, 2, 13987, 13715),
];

const LI1: LayerId = id(67, 20);
const MET1: LayerId = id(68, 20);
const CONTACT: LayerId = id(66, 44);
const VIA: LayerId = id(67, 44);

const fn id(layer: u16, datatype: u16) -> LayerId {
    LayerId { layer, datatype }
}

#[test]
fn features_and_pairs_are_those_of_general_libraries() {
    for (id, spacing, masks, features, pairs) in ROWS {
        let layout = layer(id.layer, id.datatype);
        let found = run(&layout, spacing, masks, Policy::None);
        let counts = (found.features.len(), found.instance.pair_count());
        assert_eq!(counts, (features, pairs), "{id} at {spacing}");
        assert_eq!(found.instance.fragment_count(), features);
        assert_eq!(found.instance.masks(), masks);
        assert!(found.empty_shapes.is_empty());
        let shapes: usize = (0..features as u32)
            .map(|feature| found.features.shapes_of(feature).len())
            .sum();
        assert_eq!(shapes, layout.shapes.len(), "each shape is in one feature");
    }
}

/// Source: `gdstk.boolean(shapes, [], "or")` of gdstk 1.0.2, the areas of its polygons added up.
#[test]
fn areas_are_those_of_a_general_library() {
    for (id, area) in [
        (LI1, 8_486_018_850),
        (MET1, 3_280_514_000),
        (CONTACT, 345_239_400),
        (VIA, 404_224_300),
    ] {
        let found = run(&layer(id.layer, id.datatype), 100, 2, Policy::None);
        let fragments = 0..found.instance.fragment_count() as u32;
        let sum: u64 = fragments
            .map(|fragment| found.instance.area(fragment))
            .sum();
        assert_eq!(sum, area, "{id}");
    }
}

/// Cutting features changes neither their pairs nor their areas.
#[test]
fn stitch_candidates_leave_pairs_and_areas_as_they_are() {
    for (id, spacing, masks, features, pairs) in ROWS {
        let layout = layer(id.layer, id.datatype);
        let whole = run(&layout, spacing, masks, Policy::None);
        let cut = run(&layout, spacing, masks, Policy::Uncovered);
        assert_eq!(cut.features, whole.features);
        assert_eq!(cut.instance.feature_count(), features);
        assert_eq!(cut.instance.pair_count(), pairs);
        assert!(cut.unstitchable.is_empty());
        for feature in 0..features as u32 {
            let parts = cut.instance.fragments_of(feature);
            let sum: u64 = parts.map(|fragment| cut.instance.area(fragment)).sum();
            assert_eq!(sum, whole.instance.area(feature));
        }
        for pair in 0..pairs as u32 {
            let features = |found: &Extraction| {
                let [a, b] = found.instance.pair(pair)[0];
                [found.instance.feature_of(a), found.instance.feature_of(b)]
            };
            assert_eq!(features(&cut), features(&whole));
        }
        let is_metal = id == LI1 || id == MET1;
        assert_eq!(
            !cut.fragments.cuts().is_empty(),
            is_metal,
            "contacts are not cut"
        );
    }
}
