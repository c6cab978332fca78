//! The direct encoding of colours with hard conflict edges and united fragments, compared with plain
//! enumeration: a formula in which a colouring is fixed is satisfiable exactly when that colouring
//! keeps every edge, on all labelled graphs of up to five vertices and all allowed masks of up to four.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::dpll::Dpll;
use common::plain::{colourings, same};
use common::{allowed_combinations, fix, graphs, unrestricted, vertex_pairs, words};
use encodings::MaskSet;
use encodings::colour::{AtMostOne, Colours};
use encodings::conflict;
use encodings::literal::{Formula, Lit};

const FORMS: [AtMostOne; 2] = [AtMostOne::Open, AtMostOne::Stated];

/// Compares one formula with enumeration, whatever the edges are.
fn compare(masks: u8, allowed: &[MaskSet], apart: &[[u32; 2]], united: &[[u32; 2]]) {
    for form in FORMS {
        let mut formula = Formula::default();
        let colours = Colours::encode(masks, allowed.iter().copied(), form, &mut formula);
        for &edge in apart {
            conflict::separate(&colours, edge, None, &mut formula);
        }
        for &edge in united {
            conflict::unite(&colours, edge, &mut formula);
        }
        let mut solver = Dpll::new(&formula);
        let mut count = 0;
        for colouring in colourings(allowed) {
            let right = !apart.iter().any(|&edge| same(&colouring, edge))
                && united.iter().all(|&edge| same(&colouring, edge));
            count += u64::from(right);
            let found = solver.satisfiable(&fix(&colours, &colouring));
            let what = || format!("{masks} masks {allowed:?} {apart:?} {united:?} {colouring:?}");
            assert_eq!(found, right, "{form:?} {}", what());
        }
        let what = || format!("{form:?} {masks} masks {allowed:?} {apart:?} {united:?}");
        assert_eq!(solver.satisfiable(&[]), count > 0, "{}", what());
        if form == AtMostOne::Stated {
            assert_eq!(solver.models(), count, "{}", what());
        }
    }
}

#[test]
fn every_graph_of_up_to_four_vertices_and_every_allowed_mask() {
    for (masks, most) in [(2, 4), (3, 4), (4, 3)] {
        for n in 1..=most {
            for edges in graphs(n) {
                for allowed in allowed_combinations(masks, n) {
                    compare(masks, &allowed, &edges, &[]);
                }
            }
        }
    }
}

#[test]
fn every_graph_of_four_vertices_with_four_masks() {
    for edges in graphs(4) {
        compare(4, &unrestricted(4, 4), &edges, &[]);
    }
}

#[test]
fn every_graph_of_five_vertices() {
    for masks in [2, 3] {
        for edges in graphs(5) {
            compare(masks, &unrestricted(masks, 5), &edges, &[]);
        }
    }
}

/// Every two vertices of a graph apart, united or neither.
fn mixed(n: u32) -> impl Iterator<Item = (Vec<[u32; 2]>, Vec<[u32; 2]>)> {
    let pairs = vertex_pairs(n);
    words(3, pairs.len()).map(move |word| {
        let of = |kind| {
            let chosen = pairs.iter().zip(&word).filter(move |(_, k)| **k == kind);
            chosen.map(|(&pair, _)| pair).collect()
        };
        (of(1), of(2))
    })
}

#[test]
fn united_and_separated_fragments_mix() {
    for masks in [2, 3, 4] {
        for (apart, united) in mixed(4) {
            compare(masks, &unrestricted(masks, 4), &apart, &united);
        }
        for n in 2..=3 {
            for (apart, united) in mixed(n) {
                for allowed in allowed_combinations(masks, n) {
                    compare(masks, &allowed, &apart, &united);
                }
            }
        }
    }
}

/// A literal stands for exactly the allowed masks, and its numbers are those of the variables.
#[test]
fn literals_are_those_of_the_allowed_masks() {
    for masks in 1..=4 {
        for allowed in allowed_combinations(masks, 2) {
            for form in FORMS {
                let mut formula = Formula::default();
                let colours = Colours::encode(masks, allowed.iter().copied(), form, &mut formula);
                assert_eq!(colours.masks(), masks);
                assert_eq!(colours.fragment_count(), 2);
                for (f, set) in allowed.iter().enumerate() {
                    for mask in 0..masks {
                        let lit = colours.lit(f as u32, mask);
                        assert_eq!(lit.is_some(), set.contains(mask));
                        assert!(lit.is_none_or(|lit| lit.variable() <= formula.variables));
                    }
                }
            }
        }
    }
}

/// Whatever model is found, the masks read off it keep every edge: with "at most one" left open too,
/// where a model may put a fragment on several masks. Returns how many models do that.
fn read_models(
    masks: u8,
    allowed: &[MaskSet],
    (apart, united): &(Vec<[u32; 2]>, Vec<[u32; 2]>),
) -> u32 {
    let mut formula = Formula::default();
    let form = AtMostOne::Open;
    let colours = Colours::encode(masks, allowed.iter().copied(), form, &mut formula);
    for &edge in apart {
        conflict::separate(&colours, edge, None, &mut formula);
    }
    for &edge in united {
        conflict::unite(&colours, edge, &mut formula);
    }
    let mut several = 0;
    for bits in 0..1u32 << formula.variables {
        let holds = |lit: Lit| (bits >> (lit.variable() - 1) & 1 == 1) == lit.is_positive();
        let clause_holds = |clause: &Vec<Lit>| clause.iter().any(|&lit| holds(lit));
        if !formula.clauses.iter().all(clause_holds) {
            continue;
        }
        let colouring = colours.decode(holds);
        let what = || format!("{masks} masks {allowed:?} {apart:?} {united:?} {colouring:?}");
        let legal = |(&mask, set): (&u8, &MaskSet)| set.contains(mask);
        assert!(colouring.iter().zip(allowed).all(legal), "{}", what());
        assert!(
            !apart.iter().any(|&edge| same(&colouring, edge)),
            "{}",
            what()
        );
        assert!(
            united.iter().all(|&edge| same(&colouring, edge)),
            "{}",
            what()
        );
        let several_masks = |f: u32| {
            let on = (0..masks).filter(|&mask| colours.lit(f, mask).is_some_and(holds));
            on.count() > 1
        };
        several += u32::from((0..allowed.len() as u32).any(several_masks));
    }
    several
}

#[test]
fn every_model_reads_as_a_colouring() {
    for (masks, n) in [(2, 4), (3, 4), (4, 3)] {
        let several = mixed(n).map(|edges| read_models(masks, &unrestricted(masks, n), &edges));
        assert_eq!(several.sum::<u32>() > 0, masks > 2, "{masks} masks");
    }
    for (masks, n) in [(2, 3), (3, 3), (4, 2)] {
        for edges in mixed(n) {
            for allowed in allowed_combinations(masks, n) {
                read_models(masks, &allowed, &edges);
            }
        }
    }
}
