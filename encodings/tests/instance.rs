//! The invariants of an instance, one test for each way to break one, against the list at the head of
//! `encodings::instance`; and what is built is what was said. (More items than 32-bit numbers can name
//! do not fit into a test's memory: that check is tested beside it.)
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use encodings::build::Place;
use encodings::{InstanceBuilder, InstanceError, MaskSet, Stitch};

/// Fragments 0, 1, 2 are feature 0, a path of stitches; 3 is feature 1; 4 and 5 are feature 2.
fn sound() -> InstanceBuilder {
    let mut builder = InstanceBuilder::new(3);
    assert_eq!(builder.feature(3), 0);
    assert_eq!(builder.feature(1), 3);
    assert_eq!(builder.feature(2), 4);
    builder.stitch(1, 0, 2);
    builder.stitch(1, 2, 1);
    builder.stitch(4, 5, 1);
    builder.pair([[3, 0]]);
    builder.self_spacing(2, 0);
    builder
}

/// The error of the sound instance with one thing more.
fn error(breaks: impl FnOnce(&mut InstanceBuilder)) -> InstanceError {
    let mut builder = sound();
    breaks(&mut builder);
    builder.build().unwrap_err()
}

#[test]
fn a_sound_instance_is_what_was_said() {
    let mut builder = sound();
    builder.pair([[5, 1], [0, 4]]);
    builder.allow(3, MaskSet::from_bits(0b101));
    builder.area(4, 77);
    assert_eq!(builder.fragment_count(), 6);
    let instance = builder.build().unwrap();
    assert_eq!(instance.masks(), 3);
    assert_eq!(instance.feature_count(), 3);
    assert_eq!(instance.fragment_count(), 6);
    let features: Vec<_> = (0..3).map(|f| instance.fragments_of(f)).collect();
    assert_eq!(features, [0..3, 3..4, 4..6]);
    let owners: Vec<u32> = (0..6).map(|f| instance.feature_of(f)).collect();
    assert_eq!(owners, [0, 0, 0, 1, 2, 2]);
    assert_eq!(instance.allowed(3), MaskSet::from_bits(0b101));
    assert_eq!(instance.allowed(0), MaskSet::all(3));
    assert!(!instance.is_unrestricted());
    assert_eq!([instance.area(3), instance.area(4)], [1, 77]);
    assert_eq!(instance.pair_count(), 2);
    assert_eq!(instance.pair(0), [[0, 3]]);
    assert_eq!(instance.pair(1), [[0, 4], [1, 5]]);
    assert_eq!(
        instance.pairs().collect::<Vec<_>>(),
        [instance.pair(0), instance.pair(1)]
    );
    assert_eq!(instance.edges(), [[0, 3], [0, 4], [1, 5]]);
    let (a, b, weight) = (0, 1, 2);
    assert_eq!(instance.stitches()[0], Stitch { a, b, weight });
    assert_eq!(instance.self_spacings(), [[0, 2]]);
    assert_eq!(instance.unit_count(), 3);
}

#[test]
fn nothing_is_an_instance() {
    let instance = InstanceBuilder::new(1).build().unwrap();
    assert_eq!(instance.feature_count(), 0);
    assert_eq!(instance.unit_count(), 0);
    assert!(instance.is_unrestricted());
}

#[test]
fn mask_count() {
    for masks in 0..=255 {
        let mut builder = InstanceBuilder::new(masks);
        builder.feature(1);
        let expected = (masks == 0 || masks > 8).then_some(InstanceError::MaskCount(masks));
        assert_eq!(builder.build().err(), expected);
    }
}

#[test]
fn empty_feature() {
    let found = error(|builder| {
        builder.feature(0);
    });
    assert_eq!(found, InstanceError::EmptyFeature(3));
}

#[test]
fn allowed() {
    for bits in 0..=255u8 {
        let mut builder = sound();
        builder.allow(4, MaskSet::from_bits(bits));
        let wrong = bits == 0 || bits > 0b111;
        let expected = wrong.then_some(InstanceError::Allowed {
            fragment: 4,
            masks: bits,
        });
        assert_eq!(builder.build().err(), expected, "{bits:#b}");
    }
}

#[test]
fn no_such_fragment() {
    let expected = |place| InstanceError::NoSuchFragment {
        place,
        fragment: 6,
        count: 6,
    };
    let found = error(|builder| builder.pair([[6, 0]]));
    assert_eq!(found, expected(Place::Pair(1)));
    let found = error(|builder| builder.stitch(0, 6, 1));
    assert_eq!(found, expected(Place::Stitch(3)));
    let found = error(|builder| builder.self_spacing(0, 6));
    assert_eq!(found, expected(Place::SelfSpacing(1)));
    let found = error(|builder| builder.pair([[u32::MAX, u32::MAX]]));
    assert!(matches!(
        found,
        InstanceError::NoSuchFragment {
            fragment: u32::MAX,
            ..
        }
    ));
}

/// The place and ends of a [`InstanceError::WrongFeatures`].
fn wrong_features(breaks: impl FnOnce(&mut InstanceBuilder)) -> (Place, u32, u32) {
    match error(breaks) {
        InstanceError::WrongFeatures { place, a, b, .. } => (place, a, b),
        other => panic!("{other:?}"),
    }
}

#[test]
fn wrong_features_of_a_pair() {
    let pair = Place::Pair(1);
    // Inside one feature, a loop, and a second edge between other features than the first.
    assert_eq!(wrong_features(|b| b.pair([[1, 2]])), (pair, 1, 2));
    assert_eq!(wrong_features(|b| b.pair([[3, 3]])), (pair, 3, 3));
    assert_eq!(wrong_features(|b| b.pair([[1, 4], [0, 3]])), (pair, 1, 4));
}

#[test]
fn wrong_features_of_a_stitch() {
    let stitch = Place::Stitch(3);
    assert_eq!(wrong_features(|b| b.stitch(3, 2, 1)), (stitch, 2, 3));
    assert_eq!(wrong_features(|b| b.stitch(3, 3, 1)), (stitch, 3, 3));
}

#[test]
fn wrong_features_of_a_self_spacing() {
    let spacing = Place::SelfSpacing(1);
    assert_eq!(wrong_features(|b| b.self_spacing(3, 2)), (spacing, 2, 3));
    assert_eq!(wrong_features(|b| b.self_spacing(1, 1)), (spacing, 1, 1));
    // A stitch edge joins them.
    assert_eq!(wrong_features(|b| b.self_spacing(2, 1)), (spacing, 1, 2));
}

#[test]
fn empty_pair() {
    let found = error(|builder| builder.pair([]));
    assert_eq!(found, InstanceError::EmptyPair(1));
}

#[test]
fn repeated_pair() {
    // Features 0 and 1 again, by another edge and from the other side.
    let (place, a, b) = (Place::Pair(2), 0, 1);
    let found = error(|builder| {
        builder.pair([[5, 3]]);
        builder.pair([[3, 2]]);
    });
    assert_eq!(found, InstanceError::Repeated { place, a, b });
}

#[test]
fn repeated_edge() {
    let (pair, a, b) = (1, 0, 4);
    let found = error(|builder| builder.pair([[4, 0], [1, 5], [0, 4]]));
    assert_eq!(found, InstanceError::RepeatedEdge { pair, a, b });
    let text = "conflict pair 1 names the fragment edge (0, 4) twice";
    assert_eq!(found.to_string(), text);
}

#[test]
fn repeated_stitch() {
    let (place, a, b) = (Place::Stitch(3), 0, 1);
    let found = error(|builder| builder.stitch(0, 1, 5));
    assert_eq!(found, InstanceError::Repeated { place, a, b });
}

#[test]
fn repeated_self_spacing() {
    let (place, a, b) = (Place::SelfSpacing(1), 0, 2);
    let found = error(|builder| builder.self_spacing(0, 2));
    assert_eq!(found, InstanceError::Repeated { place, a, b });
}

#[test]
fn zero_weight() {
    let found = error(|builder| builder.stitch(0, 2, 0));
    assert_eq!(found, InstanceError::ZeroWeight(3));
}

#[test]
fn disconnected() {
    let found = error(|builder| {
        builder.feature(2);
    });
    assert_eq!(found, InstanceError::Disconnected(3));
    // As many stitches as a tree of the feature has, but a ring and a fragment apart.
    let found = error(|builder| {
        let first = builder.feature(4);
        builder.stitch(first, first + 1, 1);
        builder.stitch(first + 1, first + 2, 1);
        builder.stitch(first, first + 2, 1);
    });
    assert_eq!(found, InstanceError::Disconnected(3));
}

/// Every error says where: the number of the thing is in its text.
#[test]
fn texts_name_the_place() {
    let found = error(|builder| builder.pair([[6, 0]])).to_string();
    assert_eq!(
        found,
        "conflict pair 1 names fragment 6, but there are only 6 (numbered from 0)"
    );
    let found = error(|builder| builder.stitch(0, 1, 5)).to_string();
    assert_eq!(found, "stitch 3 repeats an earlier one (0, 1)");
    let found = error(|builder| builder.stitch(0, 2, 0)).to_string();
    assert_eq!(
        found,
        "stitch 3 has weight 0: a weight of at least 1 is needed"
    );
}
