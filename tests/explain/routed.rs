//! The routed block: cores by enumeration, movements of metal 1 on all of the layer.

use std::collections::BTreeSet;

use maskproof::explain::Place;
use maskproof::explain::shape::Shape;
use maskproof::extract::Extraction;
use maskproof::formats::gdsii;
use maskproof::layout::{LayerId, Layout, Policy, Rules, StitchRules};

use crate::layouts::{conflicts, explained, moved, movements};

fn layer(layer: u16) -> Layout {
    let bytes = include_bytes!("../data/routed_sky130.gds");
    let id = LayerId {
        layer,
        datatype: 20,
    };
    gdsii::read(bytes, &gdsii::Request::new("routed_sky130.gds", id)).unwrap()
}

/// The stitch rules of the README.
fn readme_rules(layout: &Layout, masks: u8, spacing: i32) -> Rules {
    Rules {
        layer: layout.layer,
        masks,
        spacing,
        stitch: StitchRules {
            policy: Policy::Uncovered,
            overlap: 40,
            fragment_length: 140,
            corner: 70,
            weight: 1,
            ..StitchRules::default()
        },
        spacings: Default::default(),
        hand: Default::default(),
    }
}

/// The fewest units violated among some, stitches being free: fragments take masks on their own, since no
/// self-spacing is among them.
fn least(extraction: &Extraction, units: &[u32]) -> u64 {
    let instance = &extraction.instance;
    let masks = u64::from(instance.masks());
    let edges: Vec<&[[u32; 2]]> = units.iter().map(|&unit| instance.pair(unit)).collect();
    let fragments: BTreeSet<u32> = edges
        .iter()
        .flat_map(|own| own.iter().flatten())
        .copied()
        .collect();
    let fragments: Vec<u32> = fragments.into_iter().collect();
    assert!(
        masks.pow(fragments.len() as u32) < 10_000_000,
        "{fragments:?}"
    );
    let place = |f: u32| fragments.iter().position(|&other| other == f).unwrap() as u32;
    let local: Vec<Vec<[u32; 2]>> = (edges.iter())
        .map(|own| own.iter().map(|edge| edge.map(place)).collect())
        .collect();
    let codes = 0..masks.pow(fragments.len() as u32);
    let cost = |code: u64| {
        let mask = |i: u32| code / masks.pow(i) % masks;
        let violated = |own: &&Vec<[u32; 2]>| own.iter().any(|&[a, b]| mask(a) == mask(b));
        local.iter().filter(violated).count() as u64
    };
    codes.map(cost).min().unwrap()
}

fn check_cores(extraction: &Extraction, places: &[Place]) -> usize {
    let mut checked = 0;
    for place in places {
        let fragments: BTreeSet<u32> = (place.core.units.iter())
            .flat_map(|&unit| extraction.instance.pair(unit).iter().flatten())
            .copied()
            .collect();
        assert!(place.core.irreducible && place.self_spacings() == 0);
        if u64::from(extraction.instance.masks()).pow(fragments.len() as u32) > 2_000_000 {
            continue;
        }
        checked += 1;
        assert!(least(extraction, &place.core.units) >= place.core.limit);
        for left_out in &place.core.units {
            let rest = place.core.units.iter().filter(|unit| *unit != left_out);
            let rest: Vec<u32> = rest.copied().collect();
            assert!(least(extraction, &rest) < place.core.limit);
        }
    }
    checked
}

#[test]
fn metal_1() {
    let layout = layer(68);
    let rules = readme_rules(&layout, 3, 500);
    let (extraction, places) = explained(&layout, &rules);
    let limits: u64 = places.iter().map(|place| place.core.limit).sum();
    assert_eq!(limits, 2);
    assert_eq!(check_cores(&extraction, &places), places.len());
    let movements = movements(&places);
    assert!(movements.len() >= 2);
    for (moves, fewer) in movements {
        let after = conflicts(&moved(&layout, &extraction, &moves), &rules);
        assert!(after + fewer <= 2, "{moves:?}");
    }
}

#[test]
fn local_interconnect() {
    let layout = layer(67);
    let (extraction, places) = explained(&layout, &readme_rules(&layout, 3, 250));
    let limits: u64 = places.iter().map(|place| place.core.limit).sum();
    assert_eq!(limits, 17);
    assert!(check_cores(&extraction, &places) > 0);
    assert!(
        places
            .iter()
            .all(|place| place.shape == Shape::Clique || place.core.limit > 1)
    );
}
