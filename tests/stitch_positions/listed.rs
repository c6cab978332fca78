//! The policy `listed`: candidates where the list says, or an error that names the entry.

use super::layouts;
use maskproof::extract::error::ListedFault;
use maskproof::extract::{ExtractError, Extraction, extract};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{Hand, KeepOut, Listed, Policy, Rules, StitchRules};

/// A wire of width 10 along x, an L that goes up from its right end, and a via on the wire.
const WIRE: Rect = Rect {
    min: Point::new(0, 0),
    max: Point::new(100, 10),
};
const L: [Rect; 2] = [
    Rect {
        min: Point::new(200, 0),
        max: Point::new(300, 10),
    },
    Rect {
        min: Point::new(290, 0),
        max: Point::new(300, 80),
    },
];
const VIA: Rect = Rect {
    min: Point::new(68, 2),
    max: Point::new(74, 8),
};

fn run(listed: &[[(i32, i32); 2]], hand: Hand) -> Result<Extraction, ExtractError> {
    let point = |(x, y)| Point::new(x, y);
    let entry = |&[feature, at]: &[(i32, i32); 2]| Listed {
        feature: point(feature),
        at: point(at),
    };
    let rules = Rules {
        stitch: StitchRules {
            policy: Policy::Listed,
            overlap: 8,
            fragment_length: 20,
            corner: 6,
            keep_outs: vec![KeepOut {
                layer: layouts::OUT,
                distance: 5,
            }],
            listed: listed.iter().map(entry).collect(),
            ..StitchRules::default()
        },
        hand,
        ..Rules::plain(layouts::LAYER, 2, 30)
    };
    let rects = [&[WIRE][..], &L].concat();
    extract(&layouts::layout(&rects, &[VIA]), &rules, &|_| ())
}

/// The cut lines of a list.
fn lines(listed: &[[(i32, i32); 2]]) -> Vec<Rect> {
    let found = run(listed, Hand::default()).unwrap();
    found.fragments.cuts().iter().map(|cut| cut.line).collect()
}

/// The entry and the fault that a list is refused for.
fn refused(listed: &[[(i32, i32); 2]]) -> (usize, ListedFault) {
    match run(listed, Hand::default()) {
        Err(ExtractError::Listed { entry, fault, .. }) => (entry, fault),
        other => panic!("{other:?}"),
    }
}

#[test]
fn cuts_are_where_the_list_says() {
    // The first legal place of the wire is 20 from its end; the L's upper arm starts at y = 10, and a stitch
    // half of whose overlap is 4 keeps 6 from the corner.
    let listed = [
        [(50, 5), (20, 3)],
        [(0, 0), (59, 10)],
        [(295, 70), (292, 20)],
    ];
    let expected = [
        Rect::new(20, 0, 20, 10),
        Rect::new(59, 0, 59, 10),
        Rect::new(290, 20, 300, 20),
    ];
    assert_eq!(lines(&listed), expected);
    assert_eq!(lines(&[]), []);
}

#[test]
fn an_entry_that_cannot_be_followed_is_named() {
    let good = [(50, 5), (40, 5)];
    assert_eq!(
        refused(&[good, [(150, 5), (40, 5)]]),
        (2, ListedFault::NoFeature)
    );
    // The corner of the L is no run, and neither is a place of another feature or beside the run.
    assert_eq!(refused(&[[(250, 5), (295, 5)]]), (1, ListedFault::NoRun));
    assert_eq!(refused(&[[(250, 5), (40, 5)]]), (1, ListedFault::NoRun));
    assert_eq!(refused(&[[(50, 5), (40, 11)]]), (1, ListedFault::NoRun));
    // 19 from the line end; 9 from the corner at y = 10; the via from 68 on leaves 59 and takes 60 (60 + 4
    // is 4 away), up to 82 (82 - 4 is 4 away from 74).
    assert_eq!(refused(&[[(50, 5), (19, 5)]]), (1, ListedFault::Illegal));
    assert_eq!(
        refused(&[good, [(295, 5), (295, 19)]]),
        (2, ListedFault::Illegal)
    );
    assert_eq!(refused(&[[(50, 5), (60, 5)]]), (1, ListedFault::Illegal));
    assert_eq!(
        refused(&[good, [(0, 0), (40, 9)]]),
        (2, ListedFault::Repeated)
    );
}

#[test]
fn what_was_decided_by_hand_takes_no_stitch() {
    let hand = Hand {
        fixed: vec![(Point::new(10, 10), 1)],
        ..Hand::default()
    };
    match run(&[[(50, 5), (40, 5)]], hand) {
        Err(ExtractError::Listed {
            entry: 1,
            fault: ListedFault::ByHand,
            x: 40,
            y: 5,
        }) => {}
        other => panic!("{other:?}"),
    }
}

#[test]
fn entries_nearer_than_the_fragment_length_are_not_both_stitches() {
    let found = run(
        &[[(5, 5), (30, 5)], [(5, 5), (50, 5)], [(5, 5), (49, 5)]],
        Hand::default(),
    )
    .unwrap();
    // 30 and 49 are too near, and 49 and 50; 30 and 50 are not.
    let limits: Vec<_> = found
        .fragments
        .limits()
        .iter()
        .map(|l| (l.most, &l.cuts[..]))
        .collect();
    assert_eq!(limits, [(1, &[0, 1][..]), (1, &[1, 2][..])]);
    let ties = found.instance.ties();
    let holds = |masks: &[u8]| ties.iter().all(|tie| tie.holds(masks));
    let l = 0; // The L is the feature of one fragment, and the last one.
    assert!(holds(&[0, 1, 1, 0, l]) && holds(&[0, 1, 1, 1, l]));
    assert!(!holds(&[0, 1, 0, 0, l]) && !holds(&[0, 0, 1, 0, l]));
}
