//! Self-spacings, compared with their definition (both ends on one mask, and no way between them over
//! fragments of that mask): every connected stitch graph of up to five fragments, trees in the path
//! form and the others in the reachability form, every two ends that no stitch edge joins.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::dpll::Dpll;
use common::plain::{colourings, joined, self_spacing_violated};
use common::{allowed_combinations, fix, graphs, unrestricted, vertex_pairs};
use encodings::MaskSet;
use encodings::colour::{AtMostOne, Colours};
use encodings::literal::{Formula, Lit, VarAllocator};
use encodings::self_spacing::{FeatureGraph, encode};

/// The connected labelled graphs of n vertices.
fn connected(n: u32) -> impl Iterator<Item = Vec<[u32; 2]>> {
    let one_mask = vec![0; n as usize];
    let all = move |stitches: &Vec<[u32; 2]>| (0..n).all(|f| joined(stitches, &one_mask, [0, f]));
    graphs(n).into_iter().filter(all)
}

/// Fragments `first`.. are the feature; those before it are others, which must not matter.
struct Case<'a> {
    masks: u8,
    allowed: &'a [MaskSet],
    first: u32,
    stitches: &'a [[u32; 2]],
    ends: [u32; 2],
}

impl Case<'_> {
    fn encode(&self, paid: bool) -> (Formula, Colours, Option<Lit>) {
        let mut formula = Formula::default();
        let others = (0..self.first).map(|_| MaskSet::only(0));
        let allowed = others.chain(self.allowed.iter().copied());
        let colours = Colours::encode(self.masks, allowed, AtMostOne::Stated, &mut formula);
        let shift = |[a, b]: [u32; 2]| [self.first + a, self.first + b];
        let feature = FeatureGraph {
            fragments: (self.first..self.first + self.allowed.len() as u32).collect(),
            stitches: self.stitches.iter().map(|&ends| shift(ends)).collect(),
        };
        let unless = paid.then(|| formula.fresh());
        encode(&colours, shift(self.ends), &feature, unless, &mut formula);
        (formula, colours, unless)
    }

    /// Returns how many colourings violate the self-spacing.
    fn compare(&self) -> u32 {
        let (hard, colours, _) = self.encode(false);
        let (paid, _, unless) = self.encode(true);
        let unless = unless.unwrap();
        let (mut hard, mut paid) = (Dpll::new(&hard), Dpll::new(&paid));
        let mut count = 0;
        for colouring in colourings(self.allowed) {
            let violated = self_spacing_violated(self.stitches, &colouring, self.ends);
            count += u32::from(violated);
            // The fragments before the feature are on the first mask.
            let mut all = vec![0; self.first as usize];
            all.extend(&colouring);
            let mut fixed = fix(&colours, &all);
            let what = || {
                format!(
                    "{} masks {:?} stitches {:?} ends {:?} {colouring:?}",
                    self.masks, self.allowed, self.stitches, self.ends
                )
            };
            assert_eq!(hard.satisfiable(&fixed), !violated, "hard, {}", what());
            fixed.push(!unless);
            assert_eq!(paid.satisfiable(&fixed), !violated, "not paid, {}", what());
            fixed.pop();
            fixed.push(unless);
            assert!(paid.satisfiable(&fixed), "paid, {}", what());
        }
        count
    }
}

fn compare_all(masks: u8, n: u32, allowed: &[MaskSet], first: u32) -> [u32; 2] {
    let mut violated = [0, 0];
    for stitches in connected(n) {
        for ends in vertex_pairs(n) {
            if !stitches.contains(&ends) {
                let case = Case {
                    masks,
                    allowed,
                    first,
                    stitches: &stitches,
                    ends,
                };
                let ring = stitches.len() >= n as usize;
                violated[usize::from(ring)] += case.compare();
            }
        }
    }
    violated
}

#[test]
fn connected_graphs_are_counted_right() {
    // OEIS A001187: connected labelled graphs of n vertices.
    for (n, count) in [(1, 1), (2, 1), (3, 4), (4, 38), (5, 728)] {
        assert_eq!(connected(n).count(), count);
    }
}

#[test]
fn every_stitch_graph_of_up_to_five_fragments() {
    for masks in [2, 3] {
        let mut violated = [0, 0];
        for n in 3..=5 {
            let [tree, ring] = compare_all(masks, n, &unrestricted(masks, n), 0);
            violated = [violated[0] + tree, violated[1] + ring];
        }
        assert!(violated[0] > 0 && violated[1] > 0, "{violated:?}");
    }
}

#[test]
fn every_allowed_mask_on_up_to_four_fragments() {
    for (masks, most) in [(2, 4), (3, 3), (4, 3)] {
        for n in 3..=most {
            for allowed in allowed_combinations(masks, n) {
                compare_all(masks, n, &allowed, 0);
            }
        }
    }
    // All of them with three masks on four fragments would take long: every 29th.
    for (i, allowed) in allowed_combinations(3, 4).enumerate() {
        if i % 29 == 0 {
            compare_all(3, 4, &allowed, 0);
        }
    }
}

#[test]
fn fragments_are_named_by_their_own_numbers() {
    compare_all(3, 4, &unrestricted(3, 4), 2);
}
