//! Masks given by hand, on features: against plain enumeration, and each contradiction with its text.
#![allow(clippy::unwrap_used, clippy::expect_used)]

use encodings::Mask;
use maskproof::extract::{ExtractError, Extraction, extract};
use maskproof::geometry::{Point, Rect};
use maskproof::layout::{Hand, LayerId, Layout, Policy, Rules, Shapes};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

const LAYER: LayerId = LayerId {
    layer: 1,
    datatype: 0,
};

fn p(x: i32, y: i32) -> Point {
    Point { x, y }
}

fn layout(rects: &[Rect], fixed: &[(u32, Mask)]) -> Layout {
    let mut shapes = Shapes::default();
    rects.iter().for_each(|&rect| shapes.push_rect(rect));
    Layout {
        top: "top".into(),
        layer: LAYER,
        unit_pm: 500,
        shapes,
        fixed: fixed.to_vec(),
        keep_outs: Vec::new(),
    }
}

fn rules(masks: u8, hand: Hand) -> Rules {
    Rules {
        hand,
        ..Rules::plain(LAYER, masks, 3)
    }
}

/// Squares of 10 at x = 0, 100, 200, ...
fn row(count: i32) -> Vec<Rect> {
    (0..count)
        .map(|i| Rect::new(100 * i, 0, 100 * i + 10, 10))
        .collect()
}

/// A point of square `i` of a row.
fn on(i: i32) -> Point {
    p(100 * i + 5, 5)
}

fn found(masks: u8, fixed: &[(u32, Mask)], hand: Hand) -> Result<Extraction, ExtractError> {
    extract(&layout(&row(8), fixed), &rules(masks, hand), &|_| ())
}

#[track_caller]
fn refused(masks: u8, fixed: &[(u32, Mask)], hand: Hand, said: &str) {
    match found(masks, fixed, hand) {
        Err(ExtractError::Hand(error)) => assert_eq!(error.to_string(), said),
        other => panic!("{other:?}"),
    }
}

// One unit is half a nanometre: square i is at 0.05 i um, its middle 2.5 nm further.

#[test]
fn points_of_no_feature_are_told_the_nearest_one() {
    let hand = |at| Hand {
        fixed: vec![(at, 0)],
        ..Hand::default()
    };
    refused(
        2,
        &[],
        hand(p(160, 20)),
        "the point (0.08 um, 0.01 um) given by hand is in no feature of the layer: the nearest one is at \
         (0.1 um, 0.005 um)",
    );
    // On a corner is in; one unit further is not.
    assert!(found(2, &[], hand(p(110, 10))).is_ok());
    refused(
        2,
        &[],
        hand(p(111, 10)),
        "the point (0.0555 um, 0.005 um) given by hand is in no feature of the layer: the nearest one is at \
         (0.055 um, 0.005 um)",
    );
}

#[test]
fn one_feature_is_on_one_mask() {
    let hand = Hand {
        fixed: vec![(on(3), 1), (p(300, 0), 0)],
        ..Hand::default()
    };
    refused(
        2,
        &[],
        hand.clone(),
        "the feature at (0.1525 um, 0.0025 um) is fixed on mask 2 there and on mask 1 at (0.15 um, 0 um): a \
         feature fixed by hand is on one mask",
    );
    // Shape 3 is drawn on a layer of mask 3.
    refused(
        3,
        &[(3, 2)],
        hand,
        "the feature at (0.15 um, 0 um) is fixed on mask 3 there and on mask 2 at (0.1525 um, 0.0025 um): a \
         feature fixed by hand is on one mask",
    );
}

#[test]
fn features_that_share_a_mask_are_not_fixed_on_two() {
    // 0 with 1, 1 with 2: so 0 with 2.
    let hand = Hand {
        fixed: vec![(on(2), 1), (on(0), 0)],
        same: vec![vec![on(1), on(0)], vec![on(2), on(1)]],
        ..Hand::default()
    };
    let error = found(2, &[], hand).unwrap_err().to_string();
    let said = "must share a mask, but are fixed on mask";
    assert!(error.contains(said), "{error}");
    assert!(error.contains("(0.0025 um, 0.0025 um)") && error.contains("(0.1025 um, 0.0025 um)"));
}

#[test]
fn features_that_differ_are_two_and_fixed_apart() {
    let different = |points: &[Point]| Hand {
        different: vec![points.to_vec()],
        ..Hand::default()
    };
    refused(
        4,
        &[],
        different(&[on(1), on(0), p(100, 0)]),
        "the points (0.0525 um, 0.0025 um) and (0.05 um, 0 um) are in one feature, and must be on different masks",
    );
    refused(
        2,
        &[],
        different(&[on(1), on(2), on(3)]),
        "3 features, the first at (0.0525 um, 0.0025 um), must all be on different masks, and there are 2 masks",
    );
    assert!(found(3, &[], different(&[on(1), on(2), on(3)])).is_ok());
    let hand = Hand {
        fixed: vec![(on(1), 1), (on(2), 1)],
        ..different(&[on(2), on(0), on(1)])
    };
    refused(
        3,
        &[],
        hand,
        "the features at (0.1025 um, 0.0025 um) and (0.0525 um, 0.0025 um) must be on different masks, but both \
         are fixed on mask 2",
    );
    let hand = Hand {
        same: vec![vec![on(0), on(5)], vec![on(5), on(7)]],
        ..different(&[on(7), on(3), on(0)])
    };
    refused(
        3,
        &[],
        hand,
        "the features at (0.3525 um, 0.0025 um) and (0.0025 um, 0.0025 um) must share a mask, and must be on \
         different ones",
    );
    // Fixed through others that share the mask.
    let hand = Hand {
        fixed: vec![(on(0), 0), (on(1), 0)],
        same: vec![vec![on(0), on(5)], vec![on(1), on(7)]],
        ..different(&[on(7), on(5)])
    };
    refused(
        3,
        &[],
        hand,
        "the features at (0.3525 um, 0.0025 um) and (0.2525 um, 0.0025 um) must be on different masks, but both \
         are fixed on mask 1",
    );
}

#[test]
fn features_named_by_hand_take_no_stitch() {
    // Two long wires, each with a neighbour at both ends: between them a stitch may be.
    let wires = [
        Rect::new(0, 0, 1000, 10),
        Rect::new(0, 100, 1000, 110),
        Rect::new(0, -12, 100, -2),
        Rect::new(900, -12, 1000, -2),
        Rect::new(0, 112, 100, 120),
        Rect::new(900, 112, 1000, 120),
    ];
    let fragments = |hand: Hand, fixed: &[(u32, Mask)]| {
        let mut rules = rules(2, hand);
        rules.stitch.policy = Policy::Uncovered;
        let found = extract(&layout(&wires, fixed), &rules, &|_| ()).unwrap();
        found.instance.fragment_count()
    };
    assert_eq!(fragments(Hand::default(), &[]), 8);
    let at = |hand: Hand| fragments(hand, &[]);
    let fixed = Hand {
        fixed: vec![(p(500, 5), 0)],
        ..Hand::default()
    };
    assert_eq!(at(fixed), 7);
    assert_eq!(fragments(Hand::default(), &[(1, 1)]), 7);
    let both = vec![vec![p(500, 5), p(500, 105)]];
    let same = Hand {
        same: both.clone(),
        ..Hand::default()
    };
    assert_eq!(at(same), 6);
    let different = Hand {
        different: both,
        ..Hand::default()
    };
    assert_eq!(at(different), 6);
}

/// The rectangles that hang together, by plain search: the feature of each rectangle.
fn features(rects: &[Rect]) -> Vec<usize> {
    let mut of: Vec<usize> = (0..rects.len()).collect();
    loop {
        let mut changed = false;
        for a in 0..rects.len() {
            for b in 0..rects.len() {
                if rects[a].touches(&rects[b]) && of[a] > of[b] {
                    of[a] = of[b];
                    changed = true;
                }
            }
        }
        if !changed {
            return of;
        }
    }
}

fn random_points(rng: &mut Pcg64Mcg, rects: &[Rect], count: usize) -> Vec<Point> {
    let mut point = || {
        let rect = rects[rng.random_range(0..rects.len())];
        let x = rng.random_range(rect.min.x..=rect.max.x);
        p(x, rng.random_range(rect.min.y..=rect.max.y))
    };
    (0..count).map(|_| point()).collect()
}

/// For every colouring of the features: it keeps what was said by hand exactly where the instance finds it legal.
/// What is refused as a contradiction has no such colouring.
#[test]
fn statements_mean_what_enumeration_says() {
    let mut rng = Pcg64Mcg::seed_from_u64(11);
    let (mut solved, mut contradictions) = (0, 0);
    for _ in 0..4000 {
        let masks = rng.random_range(2..=3u8);
        let rects: Vec<Rect> = (0..rng.random_range(2..6))
            .map(|_| {
                let (x, y) = (rng.random_range(0..30), rng.random_range(0..30));
                Rect::new(x, y, x + rng.random_range(1..8), y + rng.random_range(1..8))
            })
            .collect();
        let mut fixed: Vec<(u32, Mask)> = Vec::new();
        for shape in 0..rects.len() as u32 {
            if rng.random_range(0..6) == 0 {
                fixed.push((shape, rng.random_range(0..masks)));
            }
        }
        let sets = |rng: &mut Pcg64Mcg| -> Vec<Vec<Point>> {
            (0..rng.random_range(0..3))
                .map(|_| {
                    let count = rng.random_range(2..4);
                    random_points(rng, &rects, count)
                })
                .collect()
        };
        let (same, different) = (sets(&mut rng), sets(&mut rng));
        let count = rng.random_range(0..2);
        let points = random_points(&mut rng, &rects, count);
        let hand = Hand {
            fixed: points
                .into_iter()
                .map(|at| (at, rng.random_range(0..masks)))
                .collect(),
            same,
            different,
            ..Hand::default()
        };
        let of = features(&rects);
        let at = |point: &Point| {
            let holds = |rect: &Rect| rect.covers(&Rect::around(&[*point]).unwrap());
            of[rects.iter().position(holds).unwrap()]
        };
        // Masks by the smallest rectangle of a feature.
        let keeps = |mask: &dyn Fn(usize) -> Mask| {
            let shares = |set: &Vec<Point>| set.iter().all(|q| mask(at(q)) == mask(at(&set[0])));
            let differs = |set: &Vec<Point>| {
                (0..set.len()).all(|i| (0..i).all(|j| mask(at(&set[i])) != mask(at(&set[j]))))
            };
            fixed.iter().all(|&(s, m)| mask(of[s as usize]) == m)
                && hand.fixed.iter().all(|(q, m)| mask(at(q)) == *m)
                && hand.same.iter().all(shares)
                && hand.different.iter().all(differs)
        };
        let colourings = usize::from(masks).pow(rects.len() as u32);
        let digit = |colouring: usize, i: usize| -> Mask {
            (colouring / usize::from(masks).pow(i as u32) % usize::from(masks)) as Mask
        };
        match extract(
            &layout(&rects, &fixed),
            &rules(masks, hand.clone()),
            &|_| (),
        ) {
            Ok(found) => {
                solved += 1;
                let first = |f: u32| of[found.features.shapes_of(f)[0] as usize];
                for colouring in 0..colourings {
                    let by_feature: Vec<Mask> = (0..found.features.len() as u32)
                        .map(|f| digit(colouring, first(f)))
                        .collect();
                    let legal = found.instance.check_legal(&by_feature).is_ok();
                    assert_eq!(legal, keeps(&|f| digit(colouring, f)));
                }
            }
            Err(ExtractError::Hand(_)) => {
                contradictions += 1;
                assert!(!(0..colourings).any(|c| keeps(&|f| digit(c, f))));
            }
            Err(error) => panic!("{error}"),
        }
    }
    assert!(
        solved > 1000 && contradictions > 1000,
        "{solved} {contradictions}"
    );
}
