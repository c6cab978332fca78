//! The cost of a colouring, compared with a count from the definitions that uses none of its code: every
//! colouring of random small instances, unit by unit.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::instances::{Shape, random};
use common::plain::{allowed, colourings, cost, unresolved};
use common::{Random, unrestricted};
use encodings::{Cost, Mask, Violation};

#[test]
fn every_colouring_of_random_instances() {
    let mut rng = Random(5);
    let mut spacings = 0;
    for round in 0..400 {
        let shape = Shape {
            masks: 2 + (round % 3) as u8,
            fragments: 2 + rng.below(5),
            restricted: 20,
        };
        let instance = random(shape, &mut rng);
        for colouring in colourings(&allowed(&instance)) {
            let found = instance.cost(&colouring);
            assert_eq!(
                found,
                cost(&instance, &colouring),
                "{colouring:?} {instance:?}"
            );
            let units = unresolved(&instance, &colouring);
            let (pairs, self_spacings) = units.split_at(instance.pair_count());
            let numbers = |units: &[bool]| -> Vec<u32> {
                (0..units.len() as u32)
                    .filter(|&i| units[i as usize])
                    .collect()
            };
            let found: Vec<u32> = instance.unresolved_pairs(&colouring).collect();
            assert_eq!(found, numbers(pairs), "{colouring:?} {instance:?}");
            let found: Vec<u32> = instance.violated_self_units(&colouring).collect();
            assert_eq!(found, numbers(self_spacings), "{colouring:?} {instance:?}");
            spacings += found.len();
        }
    }
    assert!(spacings > 1000, "{spacings} violated self-spacings seen");
}

/// Of all words over one mask more than there are, exactly the colourings within the allowed masks are
/// legal.
#[test]
fn legal_colourings_are_those_within_the_allowed_masks() {
    let mut rng = Random(6);
    for _ in 0..60 {
        let shape = Shape {
            masks: 3,
            fragments: 4,
            restricted: 60,
        };
        let instance = random(shape, &mut rng);
        let legal = colourings(&allowed(&instance));
        for word in colourings(&unrestricted(4, 4)) {
            let first = (0..4).find(|&f| !allowed(&instance)[f].contains(word[f]));
            let expected = first.map_or(Ok(()), |f| {
                Err(Violation::Forbidden {
                    fragment: f as u32,
                    mask: word[f],
                })
            });
            assert_eq!(instance.check_legal(&word), expected);
            assert_eq!(legal.contains(&word), expected.is_ok());
        }
        let short: Vec<Mask> = vec![0; 3];
        let length = Violation::Length {
            found: 3,
            expected: 4,
        };
        assert_eq!(instance.check_legal(&short), Err(length));
    }
}

#[test]
fn conflicts_weigh_more_than_any_number_of_stitches() {
    let of = |conflicts, stitches| Cost {
        conflicts,
        stitches,
    };
    assert!(of(0, u64::MAX) < of(1, 0));
    assert!(of(1, 2) < of(1, 3));
    assert_eq!([of(1, 2), of(3, 4)].into_iter().sum::<Cost>(), of(4, 6));
}
