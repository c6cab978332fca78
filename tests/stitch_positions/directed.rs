//! Scenes made for one part of the theorem each, at every small setting of the rules, against every legal place.

use super::theorem::{everywhere, run};
use super::{candidates, layouts};
use maskproof::geometry::Rect;
use maskproof::layout::{Rules, StitchRules};

/// The least cost of a scene, and whether it is within the theorem: then it agrees with every legal place. With
/// and without dropping what cannot matter.
fn least(rects: &[Rect], rules: &Rules) -> ((u64, u64), bool) {
    let found = run(rects, &[], rules, true);
    let cost = candidates::least(&found, rules.masks);
    let all = candidates::least(&run(rects, &[], rules, false), rules.masks);
    assert_eq!(all, cost, "with and without dropping: {rects:?} {rules:?}");
    let within = found.beyond_theorem.is_empty();
    let best = everywhere(rects, &[], rules, cost).unwrap();
    assert!(
        !within || best == cost,
        "{cost:?} for {best:?}: {rects:?} {rules:?}"
    );
    (cost, within)
}

fn rules(masks: u8, spacing: i32, overlap: i32, fragment_length: i32, most: u32) -> Rules {
    Rules {
        stitch: StitchRules {
            policy: maskproof::layout::Policy::EveryInterval,
            overlap,
            fragment_length,
            most_per_feature: Some(most),
            ..StitchRules::default()
        },
        ..Rules::plain(layouts::LAYER, masks, spacing)
    }
}

/// Tries a scene, made for a spacing and a shift, with many settings; gives how many needed stitches, and how many
/// were within the theorem.
fn each(most: u32, scene: impl Fn(i32, i32) -> Vec<Rect>) -> [usize; 2] {
    let mut counts = [0; 2];
    for spacing in 2..=4 {
        for (overlap, length) in [(0, 0), (0, 2), (2, 1), (2, 3), (4, 2)] {
            for shift in 0..3 {
                let (cost, within) = least(
                    &scene(spacing, shift),
                    &rules(2, spacing, overlap, length, most),
                );
                counts[0] += usize::from(cost.1 > 0);
                counts[1] += usize::from(within);
            }
        }
    }
    counts
}

/// A wire along y = `y`, one unit wide.
fn wire(x: i32, end: i32, y: i32) -> Rect {
    Rect::new(x, y, end, y + 1)
}

/// Four features that make an odd cycle with the wire whose upper side is at `top`: the outer two come near it from
/// x to x + 2 and from `end` to `end` + 2, and these two parts of it have to differ.
fn twist(x: i32, end: i32, top: i32, spacing: i32) -> Vec<Rect> {
    let middle = x + (spacing + 1).max(4);
    assert!(end - middle >= spacing.max(3));
    let above = top + spacing;
    vec![
        Rect::new(x, above - 1, x + 2, above),
        Rect::new(x + 3, above, middle, above + 1),
        Rect::new(middle + 1, above, end - 1, above + 1),
        Rect::new(end, above - 1, end + 2, above),
    ]
}

/// The mirror image at the line y = `y`.
fn below(rects: Vec<Rect>, y: i32) -> Vec<Rect> {
    let turn = |r: &Rect| Rect::new(r.min.x, 2 * y - r.max.y, r.max.x, 2 * y - r.min.y);
    rects.iter().map(turn).collect()
}

#[test]
fn two_wires_that_face_each_other_both_need_a_stitch() {
    let counts = each(2, |s, shift| {
        let mut all = vec![wire(0, 18, 15), wire(0, 18, 17)];
        all.extend(twist(1, 13, 18, s));
        all.extend(below(twist(1 + shift, 13 + shift, 15, s), 15));
        all
    });
    assert_eq!(counts, [45, 45]);
}

#[test]
fn stitches_that_stop_each_other_along_three_wires() {
    let counts = each(1, |s, shift| {
        let mut all = vec![wire(0, 18, 13), wire(0, 18, 15), wire(0, 18, 17)];
        all.extend(twist(2, 14, 18, s));
        all.extend(below(twist(1 + shift, 13 + shift, 13, s), 13));
        all
    });
    assert!(counts[0] > 20 && counts[1] == 45, "{counts:?}");
}

#[test]
fn a_u_whose_arms_are_close() {
    let counts = each(2, |s, shift| {
        let mut all = vec![
            wire(0, 18, 13),
            wire(0, 18, 15 + shift),
            Rect::new(0, 13, 1, 16 + shift),
        ];
        all.extend(twist(2, 14, 16 + shift, s));
        all.extend(below(twist(2, 14, 13, s), 13));
        all
    });
    assert!(counts[0] > 20 && counts[1] > 20, "{counts:?}");
}

#[test]
fn a_mask_left_and_taken_up_again_on_one_run() {
    let counts = each(3, |s, shift| {
        let first = 2 * s + 3;
        let mut all = vec![wire(0, 30, 13)];
        all.extend(twist(1, 1 + first, 14, s));
        all.extend(below(twist(first + shift, 2 * first + shift, 13, s), 13));
        all
    });
    // With no fragment length to keep, a long wire has more steps than are kept: it is named then.
    assert!(counts[0] > 20 && counts[1] > 20, "{counts:?}");
}
