//! Ties, compared with their definitions: every colouring of small instances satisfies the clauses of a tie
//! exactly when it keeps the tie, with one mask a fragment stated and with several left open.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::dpll::Dpll;
use common::plain::{colourings, keeps};
use common::{Random, allowed_combinations, fix, vertex_pairs};
use encodings::colour::{AtMostOne, Colours};
use encodings::literal::Formula;
use encodings::ties::encode;
use encodings::{InstanceBuilder, InstanceError, MaskSet, Stitch, Tie};

fn compare(masks: u8, allowed: &[MaskSet], tie: &Tie) -> [u32; 2] {
    let mut count = [0, 0];
    for form in [AtMostOne::Stated, AtMostOne::Open] {
        let mut formula = Formula::default();
        let colours = Colours::encode(masks, allowed.iter().copied(), form, &mut formula);
        encode(&colours, tie, &mut formula);
        let mut solver = Dpll::new(&formula);
        for colouring in colourings(allowed) {
            let kept = keeps(tie, &colouring);
            assert_eq!(tie.holds(&colouring), kept, "{tie:?} {colouring:?}");
            let fixed = fix(&colours, &colouring);
            if form == AtMostOne::Stated {
                assert_eq!(solver.satisfiable(&fixed), kept, "{tie:?} {colouring:?}");
            } else if kept {
                assert!(solver.satisfiable(&fixed), "{tie:?} {colouring:?}");
            }
            count[usize::from(kept)] += 1;
        }
    }
    count
}

#[test]
fn ties_between_two_fragments() {
    for masks in [2, 3] {
        for allowed in allowed_combinations(masks, 2) {
            for tie in [Tie::Same([0, 1]), Tie::Different([0, 1])] {
                compare(masks, &allowed, &tie);
            }
        }
    }
}

#[test]
fn ties_between_stitch_edges() {
    let mut random = Random(2005);
    let mut seen = [0, 0];
    for round in 0..400 {
        let n = 3 + random.below(2);
        let masks = 2 + (round % 3) as u8;
        let edges = vertex_pairs(n).into_iter().filter(|_| random.chance(60));
        let mut stitches: Vec<Stitch> = edges.map(|[a, b]| Stitch { a, b, weight: 1 }).collect();
        stitches
            .iter_mut()
            .for_each(|stitch| stitch.weight += random.below(3));
        let sum: u32 = stitches.iter().map(|stitch| stitch.weight).sum();
        let allowed: Vec<MaskSet> = (0..n)
            .map(|_| MaskSet::from_bits((1 + random.below((1 << masks) - 1)) as u8))
            .collect();
        for most in 0..sum.min(5) {
            let stitches = stitches.clone();
            let [broken, kept] = compare(masks, &allowed, &Tie::AtMost { most, stitches });
            seen = [seen[0] + broken, seen[1] + kept];
        }
    }
    assert!(seen[0] > 1000 && seen[1] > 1000, "{seen:?}");
}

/// A model that leaves a fragment on several masks is read off as a colouring that keeps the tie.
#[test]
fn what_is_read_off_an_open_model_keeps_the_tie() {
    let stitches: Vec<Stitch> = [[0, 1], [1, 2], [2, 3]]
        .map(|[a, b]| Stitch { a, b, weight: 1 })
        .to_vec();
    let ties = [
        Tie::Same([0, 3]),
        Tie::Different([0, 3]),
        Tie::AtMost { most: 1, stitches },
    ];
    for tie in ties {
        let mut formula = Formula::default();
        let all = [MaskSet::all(3); 4];
        let colours = Colours::encode(3, all, AtMostOne::Open, &mut formula);
        encode(&colours, &tie, &mut formula);
        let mut solver = Dpll::new(&formula);
        // Every set of masks for each fragment, one literal after the other.
        for sets in 0..8u32.pow(4) {
            let set = |f: u32| sets >> (3 * f) & 7;
            if (0..4).any(|f| set(f) == 0) {
                continue;
            }
            let fixed: Vec<_> = (0..4u32)
                .flat_map(|f| (0..3u8).map(move |mask| (f, mask)))
                .map(|(f, mask)| {
                    let lit = colours.lit(f, mask).unwrap();
                    if set(f) >> mask & 1 == 1 { lit } else { !lit }
                })
                .collect();
            if solver.satisfiable(&fixed) {
                let first: Vec<u8> = (0..4).map(|f| set(f).trailing_zeros() as u8).collect();
                assert!(keeps(&tie, &first), "{tie:?} {first:?}");
            }
        }
    }
}

#[test]
fn what_is_no_tie_is_refused() {
    let build = |tie: Tie| {
        let mut builder = InstanceBuilder::new(3);
        builder.feature(3);
        builder.feature(1);
        builder.stitch(0, 1, 1);
        builder.stitch(1, 2, 1);
        builder.tie(tie);
        builder.build().map(|instance| instance.ties().to_vec())
    };
    let edge = |a, b, weight| Stitch { a, b, weight };
    let at_most = |most, stitches| Tie::AtMost { most, stitches };
    let kept = at_most(1, vec![edge(0, 1, 1), edge(1, 2, 1)]);
    assert_eq!(build(kept.clone()), Ok(vec![kept]));
    assert_eq!(build(Tie::Same([3, 0])), Ok(vec![Tie::Same([0, 3])]));
    let wrong = |tie: Tie| build(tie).unwrap_err();
    assert!(matches!(
        wrong(Tie::Same([0, 1])),
        InstanceError::WrongFeatures { .. }
    ));
    assert!(matches!(
        wrong(Tie::Different([0, 4])),
        InstanceError::NoSuchFragment { .. }
    ));
    assert!(matches!(
        wrong(at_most(0, vec![edge(0, 2, 1)])),
        InstanceError::WrongFeatures { .. }
    ));
    assert_eq!(
        wrong(at_most(2, vec![edge(0, 1, 1), edge(1, 2, 1)])),
        InstanceError::LooseTie(0)
    );
    assert_eq!(wrong(at_most(0, vec![])), InstanceError::LooseTie(0));
    assert_eq!(
        wrong(at_most(1, vec![edge(0, 1, 1), edge(0, 1, 1)])),
        InstanceError::LooseTie(0)
    );
    // One edge that counts two thousand million times would be as many literals.
    let huge = at_most(2_000_000_000, vec![edge(0, 1, 2_000_000_001)]);
    assert_eq!(wrong(huge), InstanceError::HugeTie(0));
    let most = 4_000;
    assert!(build(at_most(most, vec![edge(0, 1, most), edge(1, 2, 1)])).is_ok());
}
