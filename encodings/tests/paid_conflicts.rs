//! Conflict pairs and stitches paid for by a literal, compared with plain enumeration: with a colouring
//! fixed and some units assumed "not violated", the formula is satisfiable exactly when the colouring
//! violates none of those.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::dpll::Dpll;
use common::plain::{colourings, same};
use common::{allowed_combinations, fix, graphs, subsets, unrestricted, vertex_pairs, words};
use encodings::MaskSet;
use encodings::colour::{AtMostOne, Colours};
use encodings::conflict;
use encodings::literal::{Formula, Lit, VarAllocator};

/// What one literal pays for.
#[derive(Clone, Debug)]
enum Unit {
    /// A conflict pair: violated where any of its edges has one mask.
    Pair(Vec<[u32; 2]>),
    /// A stitch edge: violated where its ends differ.
    Stitch([u32; 2]),
}

impl Unit {
    fn violated(&self, colouring: &[u8]) -> bool {
        match self {
            Unit::Pair(edges) => edges.iter().any(|&edge| same(colouring, edge)),
            Unit::Stitch(ends) => !same(colouring, *ends),
        }
    }

    fn encode(&self, colours: &Colours, formula: &mut Formula) -> Lit {
        let unless = formula.fresh();
        match self {
            Unit::Pair(edges) => {
                for &edge in edges {
                    conflict::separate(colours, edge, Some(unless), formula);
                }
            }
            Unit::Stitch(ends) => conflict::join(colours, *ends, unless, formula),
        }
        unless
    }
}

fn compare(masks: u8, allowed: &[MaskSet], units: &[Unit]) {
    for form in [AtMostOne::Open, AtMostOne::Stated] {
        let mut formula = Formula::default();
        let colours = Colours::encode(masks, allowed.iter().copied(), form, &mut formula);
        let paid: Vec<(usize, Lit)> = units
            .iter()
            .map(|unit| unit.encode(&colours, &mut formula))
            .enumerate()
            .collect();
        let mut solver = Dpll::new(&formula);
        for colouring in colourings(allowed) {
            let exactly = fix(&colours, &colouring);
            let violated: Vec<bool> = units.iter().map(|u| u.violated(&colouring)).collect();
            for kept in subsets(&paid) {
                let mut fixed: Vec<Lit> = kept.iter().map(|&(_, unless)| !unless).collect();
                fixed.extend(&exactly);
                assert_eq!(
                    solver.satisfiable(&fixed),
                    !kept.iter().any(|&(unit, _)| violated[unit]),
                    "{form:?} {masks} masks {allowed:?} {units:?} {colouring:?} kept {kept:?}"
                );
            }
        }
    }
}

/// Every two of n fragments a conflict pair, a stitch edge or neither.
fn mixed(n: u32) -> impl Iterator<Item = Vec<Unit>> {
    let pairs = vertex_pairs(n);
    words(3, pairs.len()).map(move |word| {
        let unit = |(&pair, kind): (&[u32; 2], &usize)| match kind {
            0 => None,
            1 => Some(Unit::Pair(vec![pair])),
            _ => Some(Unit::Stitch(pair)),
        };
        pairs.iter().zip(&word).filter_map(unit).collect()
    })
}

#[test]
fn pairs_and_stitches_on_every_small_graph() {
    for masks in [2, 3] {
        for n in 1..=4 {
            for units in mixed(n) {
                compare(masks, &unrestricted(masks, n), &units);
            }
        }
    }
}

#[test]
fn every_graph_of_up_to_four_vertices_with_four_masks() {
    for n in 1..=4 {
        for edges in graphs(n) {
            let units: Vec<Unit> = edges.iter().map(|&edge| Unit::Pair(vec![edge])).collect();
            compare(4, &unrestricted(4, n), &units);
        }
    }
}

#[test]
fn pairs_and_stitches_with_every_allowed_mask() {
    for masks in [2, 3, 4] {
        for n in 2..=3 {
            for units in mixed(n) {
                for allowed in allowed_combinations(masks, n) {
                    compare(masks, &allowed, &units);
                }
            }
        }
    }
}

/// Fragments 0..n in features, each a path of stitch edges; every set of edges between features, those
/// between the same two paid for by one literal.
#[test]
fn one_literal_pays_for_all_edges_of_a_pair() {
    for sizes in [vec![2, 2], vec![3, 1], vec![1, 3], vec![2, 1, 1]] {
        let feature_of: Vec<usize> = (0..sizes.len())
            .flat_map(|feature| vec![feature; sizes[feature]])
            .collect();
        let features = |[a, b]: [u32; 2]| [feature_of[a as usize], feature_of[b as usize]];
        let (inside, cross): (Vec<_>, Vec<_>) = vertex_pairs(4)
            .into_iter()
            .partition(|&pair| features(pair)[0] == features(pair)[1]);
        let path = inside.iter().filter(|[a, b]| a + 1 == *b);
        let stitches: Vec<Unit> = path.map(|&ends| Unit::Stitch(ends)).collect();
        for edges in subsets(&cross) {
            let mut units = stitches.clone();
            for [f, g] in vertex_pairs(sizes.len() as u32) {
                let both = [f as usize, g as usize];
                let own = edges.iter().filter(|&&edge| features(edge) == both);
                let own: Vec<[u32; 2]> = own.copied().collect();
                if !own.is_empty() {
                    units.push(Unit::Pair(own));
                }
            }
            for masks in [2, 3, 4] {
                compare(masks, &unrestricted(masks, 4), &units);
            }
            for allowed in allowed_combinations(2, 4) {
                compare(2, &allowed, &units);
            }
        }
    }
}
