//! What is in the way of a stitch, one layout for each reason, worked out by hand.
//!
//! Five wires around a wire A, 12 apart: A under B (left) and C (right), D over B, E over C, D beside E. Each is
//! closer than 12 to the next one only: an odd cycle of five for two masks. On A, which runs from 0 to 200, B
//! covers 0 to 30 and C 170 to 200 (5 across, and 10 along: 10^2 + 5^2 < 12^2 < 11^2 + 5^2): the gap
//! is 31 to 169, and a stitch in it resolves everything.

use maskproof::explain::Place;
use maskproof::explain::repair::{Block, Position, Way};
use maskproof::explain::shape::Shape;
use maskproof::geometry::Rect;
use maskproof::layout::{Policy, Shapes};

use crate::layouts::{conflicts, explained, layout};
use crate::rules;

const B: Rect = Rect::new(0, 15, 20, 35);
const C: Rect = Rect::new(180, 15, 200, 35);
const D: Rect = Rect::new(0, 40, 95, 50);
const E: Rect = Rect::new(105, 40, 200, 50);

/// The one place of A with these rectangles, the others and the stitch rules, and where a stitch on A
/// is said to help.
fn scene(
    a: &[Rect],
    others: &[Rect],
    masks: u8,
    stitch: [i32; 3],
    policy: Policy,
) -> (Place, Option<Position>) {
    let mut shapes = Shapes::default();
    for &rect in a.iter().chain(others) {
        shapes.push_rect(rect);
    }
    let (extraction, mut places) = explained(&layout(shapes), &rules(masks, 12, stitch, policy));
    assert_eq!(places.len(), 1);
    let place = places.remove(0);
    let area = a
        .iter()
        .copied()
        .reduce(|all, one| all.union(&one))
        .unwrap();
    let stitches = place.repairs.iter().filter_map(|repair| match &repair.way {
        Way::Stitch(at) if extraction.features.box_of(at.feature) == area => Some(at.clone()),
        _ => None,
    });
    let found: Vec<Position> = stitches.collect();
    assert!(found.len() <= 1);
    (place, found.into_iter().next())
}

fn five(a: &[Rect], stitch: [i32; 3], policy: Policy) -> Position {
    let (place, found) = scene(a, &[B, C, D, E], 2, stitch, policy);
    assert!(matches!(&place.shape, Shape::OddCycle(order) if order.len() == 5));
    found.unwrap()
}

const WIRE: Rect = Rect::new(0, 0, 200, 10);

#[test]
fn with_a_candidate_there_is_nothing_to_explain() {
    let mut shapes = Shapes::default();
    for rect in [WIRE, B, C, D, E] {
        shapes.push_rect(rect);
    }
    let layout = layout(shapes);
    assert_eq!(
        conflicts(&layout, &rules(2, 12, [138, 0, 0], Policy::Uncovered)),
        0
    );
    assert_eq!(
        conflicts(&layout, &rules(2, 12, [140, 0, 0], Policy::Uncovered)),
        1
    );
}

#[test]
fn no_policy() {
    let at = five(&[WIRE], [40, 0, 0], Policy::None);
    assert_eq!(at.blocks, [Block::NoPolicy]);
    assert_eq!(at.overlap, 40);
    let x = at.line.min.x;
    assert_eq!(at.line, Rect::new(x, 0, x, 10));
    assert!((31 + 20..=169 - 20).contains(&x));
}

#[test]
fn the_overlap_does_not_fit() {
    let at = five(&[WIRE], [150, 0, 0], Policy::Uncovered);
    let expected = Block::Overlap {
        needed: 150,
        present: 138,
    };
    assert_eq!(at.blocks, [expected]);
    assert_eq!((at.line, at.overlap), (Rect::new(100, 0, 100, 10), 138));
}

#[test]
fn a_fragment_would_be_too_short() {
    let at = five(&[WIRE], [0, 110, 0], Policy::Uncovered);
    let expected = Block::FragmentLength {
        needed: 110,
        present: 90,
    };
    assert_eq!(
        (at.line, &at.blocks[..]),
        (Rect::new(90, 0, 90, 10), &[expected][..])
    );
}

/// A bends down at both ends: its run is 10 to 190.
#[test]
fn a_corner_is_too_near() {
    let bent = [
        WIRE,
        Rect::new(0, -50, 10, 10),
        Rect::new(190, -50, 200, 10),
    ];
    // No fragment of 60 fits on the others.
    let at = five(&bent, [10, 60, 90], Policy::Uncovered);
    let expected = Block::Corner {
        needed: 90,
        present: 80,
    };
    // 190 - 90 - 5 from the right corner; 95 - 10 - 5 are left to the left one.
    assert_eq!(
        (at.line, &at.blocks[..]),
        (Rect::new(95, 0, 95, 10), &[expected][..])
    );
}

/// A goes on to the right: the middle of the gap is too near to the left end, 110 to 169 would do.
#[test]
fn the_policy_takes_another_place() {
    let longer = Rect::new(0, 0, 300, 10);
    let at = five(&[longer], [0, 110, 0], Policy::Uncovered);
    assert_eq!(at.blocks, [Block::OtherPlace]);
    assert!((110..=169).contains(&at.line.min.x));
}

/// Three masks: B and C go up and around D, which lies over A between them: all four pairwise too close. A stitch in the
/// middle of A would do, its two sides on the masks of C and B, but D covers all of A there. (No fragment of 60 fits
/// on B and C.)
#[test]
fn a_neighbour_covers_the_place() {
    let b = [Rect::new(0, 15, 10, 60), Rect::new(0, 60, 95, 70)];
    let c = [Rect::new(190, 15, 200, 60), Rect::new(105, 60, 200, 70)];
    let d = Rect::new(20, 15, 180, 25);
    let others = [b[0], b[1], c[0], c[1], d];
    let (place, at) = scene(&[WIRE], &others, 3, [0, 60, 0], Policy::Uncovered);
    assert_eq!((place.shape, place.features.len()), (Shape::Clique, 4));
    let at = at.unwrap();
    let of_d = place
        .features
        .iter()
        .find(|f| f.area == Some(d))
        .unwrap()
        .number;
    assert_eq!(at.blocks, [Block::Neighbour { feature: of_d }]);
    // B covers 0 to 20 of A, C 180 to 200.
    assert!((60..=140).contains(&at.line.min.x));
}
