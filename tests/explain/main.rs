//! Explanations: cores by their definition, releases and movements by trying them out.
#![allow(clippy::unwrap_used, clippy::expect_used)]

#[path = "../common/mod.rs"]
mod common;

mod cores;
mod layouts;
mod releases;
mod routed;
mod scenes;
mod shapes;
mod spacings;
mod stitches;

use encodings::{Instance, InstanceBuilder, Mask};
use maskproof::explain::{Bound, Layer, Place, Subject, Wanted, explain};
use maskproof::extract::{Extraction, extract};
use maskproof::layout::{Layout, Policy, Rules, StitchRules};
use maskproof::reduce::{Reduced, Reductions, reduce};
use maskproof::solve::{Choice, Limits, PieceOutcome, solve_pieces};

/// The places of some bounds.
pub fn places(
    instance: &Instance,
    layer: Option<Layer<'_>>,
    colouring: &[Mask],
    bounds: &[Bound],
) -> Vec<Place> {
    let subject = Subject {
        instance,
        layer,
        colouring,
    };
    let wanted = Wanted {
        is_best: true,
        ..Wanted::default()
    };
    explain(&subject, bounds, &wanted, &|_, _| {}).unwrap()
}

/// All units of conflict as one bound.
pub fn whole(instance: &Instance, limit: u64) -> Bound {
    Bound {
        limit,
        units: (0..instance.unit_count() as u32).collect(),
    }
}

/// The instance with some of its units of conflict only.
pub fn with_units(instance: &Instance, units: &[u32]) -> Instance {
    let mut builder = InstanceBuilder::new(instance.masks());
    for feature in 0..instance.feature_count() as u32 {
        builder.feature(instance.fragments_of(feature).len() as u32);
    }
    for fragment in 0..instance.fragment_count() as u32 {
        builder.allow(fragment, instance.allowed(fragment));
    }
    for stitch in instance.stitches() {
        builder.stitch(stitch.a, stitch.b, stitch.weight);
    }
    for &unit in units {
        let edges = instance.unit(unit).iter();
        if instance.is_self_unit(unit) {
            edges.for_each(|&[a, b]| builder.self_spacing(a, b));
        } else {
            builder.pair(edges.copied());
        }
    }
    for tie in instance.ties() {
        builder.tie(tie.clone());
    }
    builder.build().unwrap()
}

/// A solved instance: its outcomes and what they are outcomes of.
pub fn solved(instance: &Instance) -> (Reduced, Vec<PieceOutcome>) {
    let reduced = reduce(instance, Reductions::ALL).unwrap();
    let outcomes = solve_pieces(&reduced, Choice::Auto, &Limits::default(), &|_| {});
    (reduced, outcomes)
}

/// The bounds that the search found, in the numbers of the instance: the packings of the pieces, and pieces
/// as a whole where they were enumerated.
pub fn bounds_of(instance: &Instance, reduced: &Reduced, outcomes: &[PieceOutcome]) -> Vec<Bound> {
    let mut bounds = Vec::new();
    for ((piece, same), outcome) in reduced.pieces.iter().zip(&reduced.same_as).zip(outcomes) {
        let own = |unit: u32| match (unit as usize).checked_sub(piece.pairs.len()) {
            None => piece.pairs[unit as usize],
            Some(i) => {
                let feature = |edge: &[u32; 2]| instance.feature_of(edge[0]);
                let first = piece.instance.self_unit(i as u32)[0][0];
                let feature_of = instance.feature_of(piece.fragments[first as usize]);
                let of = |edges: &[[u32; 2]]| feature(&edges[0]) == feature_of;
                let place = instance.self_units().position(of).unwrap();
                (instance.pair_count() + place) as u32
            }
        };
        if outcome.conflicts.lower == 0 {
            continue;
        }
        if outcome.conflict_packing.is_empty() || same.is_copy() {
            let all = 0..piece.instance.unit_count() as u32;
            bounds.push(Bound {
                limit: outcome.conflicts.lower,
                units: all.map(own).collect(),
            });
        }
        for cluster in &outcome.conflict_packing {
            bounds.push(Bound {
                limit: cluster.limit,
                units: cluster.units.iter().map(|&unit| own(unit)).collect(),
            });
        }
    }
    bounds
}

/// Rules of a test layer.
pub fn rules(masks: u8, spacing: i32, stitch: [i32; 3], policy: Policy) -> Rules {
    Rules {
        layer: maskproof::layout::LayerId {
            layer: 1,
            datatype: 0,
        },
        masks,
        spacing,
        stitch: StitchRules {
            policy,
            overlap: stitch[0],
            fragment_length: stitch[1],
            corner: stitch[2],
            weight: 1,
            ..StitchRules::default()
        },
        spacings: Default::default(),
        hand: Default::default(),
    }
}

/// What a layout gives.
pub fn extracted(layout: &Layout, rules: &Rules) -> Extraction {
    extract(layout, rules, &|_| ()).unwrap()
}
