//! Rules with several spacings: what is said is what is known.

use maskproof::explain::repair::{Obstacle, Way};
use maskproof::geometry::Rect;
use maskproof::layout::{Policy, Shapes, Spacings};

use crate::layouts::{explained, layout};
use crate::rules;

#[test]
fn neither_movements_nor_stitches_are_claimed() {
    // Three wires one above the other, 8 apart, where sides keep 30: pairwise too close for two masks. By the plain spacing
    // of 5 they are far enough apart, and a movement by it would be no repair.
    let mut shapes = Shapes::default();
    for y in [0, 12, 24] {
        shapes.push_rect(Rect::new(0, y, 90, y + 4));
    }
    let layout = layout(shapes);
    let mut rules = rules(2, 5, [0; 3], Policy::None);
    rules.spacings = Spacings {
        side_to_side: Some(30),
        ..Spacings::default()
    };
    let (_, places) = explained(&layout, &rules);
    assert_eq!(places.len(), 1);
    assert_eq!(places[0].spacings.len(), 3);
    let distances: Vec<i32> = (places[0].spacings.iter())
        .map(|spacing| spacing.gap.unwrap().distance)
        .collect();
    // 8 between neighbours, 24 - 4 = 20 between the outer ones.
    let mut sorted = distances.clone();
    sorted.sort_unstable();
    assert_eq!(sorted, [8, 8, 20]);
    let obstacle = Way::Release(Obstacle::SeveralSpacings);
    let repairs = &places[0].repairs;
    assert_eq!(repairs.len(), 3);
    assert!(repairs.iter().all(|repair| repair.way == obstacle));
}
