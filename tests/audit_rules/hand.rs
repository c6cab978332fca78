//! Masks by hand.

use super::*;
use maskproof::audit::problem::Tie;
use maskproof::layout::Hand;

/// Four wires of 100 by 10, 40 apart; the last one is a triangle.
fn four() -> Layout {
    let mut shapes = shapes(&[[0, 0, 100, 10], [0, 50, 100, 60], [0, 100, 100, 110]]);
    shapes.push_polygon(&[[0, 150], [100, 150], [0, 170]].map(point));
    layout(shapes)
}

const FEATURES: [[i32; 2]; 4] = [[0, 0], [0, 50], [0, 100], [0, 150]];

fn by_hand(hand: Hand) -> Rules {
    let mut rules = rules(5);
    rules.stitch = stitch(Policy::EveryInterval, 0, 0, 0);
    rules.hand = hand;
    rules
}

fn points(list: &[[i32; 2]]) -> Vec<Point> {
    list.iter().map(|&at| point(at)).collect()
}

#[test]
fn masks_sets_and_cuts() {
    let hand = Hand {
        // Inside, and on a corner; the second mask of three.
        fixed: vec![(point([50, 5]), 1), (point([100, 10]), 1)],
        // On the slanted edge, and within; one feature is named twice.
        same: vec![points(&[[50, 160], [0, 50], [100, 60]])],
        different: vec![points(&[[0, 151], [1, 1], [0, 55]])],
        ..Hand::default()
    };
    let (layout, rules) = (four(), by_hand(hand));
    // The third wire is free, and cut: fragments 2 and 3.
    let cut = (2, [50, 100, 50, 110], [0, 1]);
    let problem = derived(&layout, &rules, &FEATURES, &[cut]).unwrap();
    assert_eq!(problem.allowed, [0b010, 0b111, 0b111, 0b111, 0b111]);
    assert_eq!(
        problem.ties,
        [
            Tie::Different([0, 1]),
            Tie::Different([0, 4]),
            Tie::Same([1, 4]),
            Tie::Different([1, 4])
        ]
    );
    for (feature, y) in [(0, 0), (1, 50)] {
        let cut = (feature, [50, y, 50, y + 10], [0, 1]);
        let rejected = derived(&layout, &rules, &FEATURES, &[cut]);
        let reason = "the mask of the feature is decided by hand";
        assert_rejected(rejected, Step::Stitches, reason);
    }
    let slanted = (3, [50, 150, 50, 160], [0, 1]);
    let free = by_hand(Hand::default());
    let rejected = derived(&layout, &free, &FEATURES, &[slanted]);
    assert_rejected(rejected, Step::Stitches, "the feature has slanted edges");
}

#[test]
fn layers_of_masks() {
    let mut layout = four();
    layout.fixed = vec![(1, 0), (3, 2)];
    let rules = by_hand(Hand::default());
    let allowed = |layout: &Layout| derived(layout, &rules, &FEATURES, &[]).map(|p| p.allowed);
    assert_eq!(allowed(&layout), Ok(vec![0b111, 0b001, 0b111, 0b100]));
    // Two shapes of one feature: on one mask, then on two.
    layout.shapes.push_rect(Rect::new(90, 55, 120, 60));
    layout.fixed.push((4, 0));
    assert_eq!(allowed(&layout), Ok(vec![0b111, 0b001, 0b111, 0b100]));
    layout.fixed[2].1 = 1;
    let rejected = derived(&layout, &rules, &FEATURES, &[]);
    let reason = "the feature that begins at (0, 50) is put on masks 1 and 2";
    assert_rejected(rejected, Step::Rules, reason);
    // What encloses nothing is on no mask.
    let mut empty = four();
    empty
        .shapes
        .push_polygon(&[[0, 500], [9, 500], [4, 500]].map(point));
    empty.fixed = vec![(4, 0)];
    assert_eq!(allowed(&empty), Ok(vec![0b111; 4]));
    let mut cut = by_hand(Hand::default());
    cut.stitch.policy = Policy::Uncovered;
    // The policy has no place on the wires; a fixed one takes no cut that is named.
    cut.stitch.policy = Policy::EveryInterval;
    let named = (1, [50, 50, 50, 60], [0, 1]);
    let mut fixed = four();
    assert!(derived(&fixed, &cut, &FEATURES, &[named]).is_ok());
    fixed.fixed = vec![(1, 0)];
    let reason = "the mask of the feature is decided by hand";
    let rejected = derived(&fixed, &cut, &FEATURES, &[named]);
    assert_rejected(rejected, Step::Stitches, reason);
}

#[test]
fn decisions_that_cannot_be() {
    let rejected = |hand: Hand| derived(&four(), &by_hand(hand), &FEATURES, &[]);
    let beyond = rejected(Hand {
        fixed: vec![(point([0, 0]), 3)],
        ..Hand::default()
    });
    let reason = "the feature that begins at (0, 0) is put on mask 4 of 3";
    assert_rejected(beyond, Step::Rules, reason);
    let two = rejected(Hand {
        fixed: vec![(point([0, 0]), 2), (point([9, 9]), 0)],
        ..Hand::default()
    });
    let reason = "the feature that begins at (0, 0) is put on masks 1 and 3";
    assert_rejected(two, Step::Rules, reason);
    let itself = rejected(Hand {
        different: vec![points(&[[0, 100], [0, 0], [1, 100]])],
        ..Hand::default()
    });
    let reason = "the feature that begins at (0, 100) is to differ from itself";
    assert_rejected(itself, Step::Rules, reason);
    for at in [[0, 11], [101, 5], [51, 160], [0, 171]] {
        let nowhere = rejected(Hand {
            same: vec![points(&[[0, 0], at])],
            ..Hand::default()
        });
        let reason = format!(
            "the rules name a feature at ({}, {}): there is none",
            at[0], at[1]
        );
        assert_rejected(nowhere, Step::Rules, &reason);
    }
}
