//! Symmetry breaking, compared with plain enumeration: colour precedence keeps the least cost of every
//! small graph for every list of fragments, clique fixing keeps feasibility and nothing more, and both
//! refuse restricted masks.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::dpll::satisfiable;
use common::instances::{Shape, of_graph, random};
use common::plain::{allowed, colourings, cost, least};
use common::{Random, graphs, sequences, subsets, unrestricted, vertex_pairs};
use encodings::colour::{AtMostOne, Colours};
use encodings::literal::{Formula, Lit, VarAllocator};
use encodings::totalizer::Totalizer;
use encodings::{MaskSet, conflict, symmetry};

/// A graph whose every edge is paid for by a literal of its own.
struct Paid {
    formula: Formula,
    colours: Colours,
    units: Vec<Lit>,
}

fn paid(masks: u8, n: u32, edges: &[[u32; 2]]) -> Paid {
    let mut formula = Formula::default();
    let allowed = unrestricted(masks, n);
    let colours = Colours::encode(masks, allowed, AtMostOne::Open, &mut formula);
    let units = edges
        .iter()
        .map(|&edge| {
            let unit = formula.fresh();
            conflict::separate(&colours, edge, Some(unit), &mut formula);
            unit
        })
        .collect();
    Paid {
        formula,
        colours,
        units,
    }
}

impl Paid {
    /// The least number of units that must be paid for, by asking a totalizer.
    fn least(&self) -> u64 {
        let mut formula = self.formula.clone();
        let mut totalizer = Totalizer::new(&self.units);
        let possible = |formula: &mut Formula, totalizer: &mut Totalizer, count: u32| {
            let more = totalizer.at_least(count + 1, formula);
            satisfiable(
                formula,
                &more.map(|lit| !lit).into_iter().collect::<Vec<_>>(),
            )
        };
        let counts = 0..=self.units.len() as u32;
        let mut found = counts.filter(|&count| possible(&mut formula, &mut totalizer, count));
        u64::from(found.next().unwrap())
    }
}

/// Graphs of five vertices up to renumbering: the smallest edge set of each class.
fn classes(n: u32) -> Vec<Vec<[u32; 2]>> {
    let orders: Vec<Vec<u32>> = sequences(n)
        .into_iter()
        .filter(|order| order.len() == n as usize)
        .collect();
    let renumbered = |edges: &[[u32; 2]], order: &[u32]| {
        let mut image: Vec<[u32; 2]> = edges
            .iter()
            .map(|&[a, b]| {
                let (a, b) = (order[a as usize], order[b as usize]);
                [a.min(b), a.max(b)]
            })
            .collect();
        image.sort_unstable();
        image
    };
    graphs(n)
        .into_iter()
        .filter(|edges| {
            orders
                .iter()
                .all(|order| *edges <= renumbered(edges, order))
        })
        .collect()
}

fn precedence_keeps_the_least(masks: u8, n: u32, edges: &[[u32; 2]], lists: &[Vec<u32>]) {
    let plain = least(&of_graph(masks, &unrestricted(masks, n), edges)).conflicts;
    for list in lists {
        let mut broken = paid(masks, n, edges);
        assert!(symmetry::precedence(
            &broken.colours,
            list,
            &mut broken.formula
        ));
        assert_eq!(broken.least(), plain, "{masks} masks {edges:?} {list:?}");
    }
}

#[test]
fn precedence_keeps_the_least_number_of_conflicts_on_every_graph_and_list() {
    // OEIS A000088: graphs of n unlabelled vertices.
    assert_eq!(classes(5).len(), 34);
    for n in 1..=4 {
        let lists = sequences(n);
        for edges in graphs(n) {
            for masks in [2, 3, 4] {
                precedence_keeps_the_least(masks, n, &edges, &lists);
            }
        }
    }
    // Every list is tried, so that one graph of each class will do.
    for edges in classes(5) {
        for masks in [2, 3, 4] {
            precedence_keeps_the_least(masks, 5, &edges, &sequences(5));
        }
    }
}

/// With stitches, self-spacings and pairs of several edges: some colouring of least cost is among those
/// that the clauses of precedence leave, and those are the ones that [`symmetry::precedence_set`] says.
#[test]
fn precedence_keeps_the_least_cost_of_instances() {
    let mut rng = Random(3);
    for masks in [2, 3, 4] {
        for _ in 0..40 {
            let shape = Shape {
                masks,
                fragments: 4 + rng.below(2),
                restricted: 0,
            };
            let instance = random(shape, &mut rng);
            let sets = allowed(&instance);
            let mut list: Vec<u32> = (0..shape.fragments).collect();
            rng.shuffle(&mut list);
            list.truncate(1 + rng.below(shape.fragments) as usize);
            let mut formula = Formula::default();
            let form = AtMostOne::Stated;
            let colours = Colours::encode(masks, sets.iter().copied(), form, &mut formula);
            assert!(symmetry::precedence(&colours, &list, &mut formula));
            let mut kept = Vec::new();
            for colouring in colourings(&sets) {
                let lit = |(f, &mask): (usize, &u8)| colours.lit(f as u32, mask).unwrap();
                let fixed: Vec<Lit> = colouring.iter().enumerate().map(lit).collect();
                let may = |(i, &f): (usize, &u32)| {
                    symmetry::precedence_set(masks, i).contains(colouring[f as usize])
                };
                let stays = satisfiable(&formula, &fixed);
                assert_eq!(
                    stays,
                    list.iter().enumerate().all(may),
                    "{list:?} {colouring:?}"
                );
                if stays {
                    kept.push(cost(&instance, &colouring));
                }
            }
            assert_eq!(
                kept.into_iter().min(),
                Some(least(&instance)),
                "{instance:?}"
            );
        }
    }
}

#[test]
fn precedence_sets_grow_to_all_masks() {
    for masks in 1..=8 {
        for i in 0..300 {
            let all = MaskSet::all(masks);
            let expected = if i < 8 { (1u16 << (i + 1)) - 1 } else { 255 } as u8;
            let set = symmetry::precedence_set(masks, i);
            assert_eq!(set.bits(), expected & all.bits(), "{masks} masks, {i}");
        }
    }
}

/// The sequences of vertices, every two of them joined, with at most K members.
fn cliques(masks: u8, n: u32, edges: &[[u32; 2]]) -> Vec<Vec<u32>> {
    let joined = |members: &Vec<u32>| {
        vertex_pairs(n)
            .iter()
            .filter(|pair| pair.iter().all(|v| members.contains(v)))
            .all(|pair| edges.contains(pair))
    };
    sequences(n)
        .into_iter()
        .filter(|members| members.len() <= masks as usize && joined(members))
        .collect()
}

#[test]
fn fixing_a_clique_keeps_feasibility_on_every_graph() {
    let mut answers = [0, 0];
    for (masks, most) in [(2, 5), (3, 5), (4, 4)] {
        for n in 1..=most {
            for edges in graphs(n) {
                let instance = of_graph(masks, &unrestricted(masks, n), &edges);
                let feasible = least(&instance).conflicts == 0;
                for clique in cliques(masks, n, &edges) {
                    let mut formula = Formula::default();
                    let allowed = unrestricted(masks, n);
                    let colours = Colours::encode(masks, allowed, AtMostOne::Open, &mut formula);
                    for &edge in &edges {
                        conflict::separate(&colours, edge, None, &mut formula);
                    }
                    assert!(symmetry::fix_clique(&colours, &clique, &mut formula));
                    let found = satisfiable(&formula, &[]);
                    assert_eq!(found, feasible, "{masks} masks {edges:?} {clique:?}");
                    answers[usize::from(found)] += 1;
                }
            }
        }
    }
    assert!(answers[0] > 1000 && answers[1] > 1000, "{answers:?}");
}

/// The clique 0..K-1, and further vertices each joined to all of it: each makes a (K+1)-clique.
fn cliques_that_share(masks: u8, further: u32) -> Vec<[u32; 2]> {
    let shared = u32::from(masks);
    vertex_pairs(shared + further)
        .into_iter()
        .filter(|&[a, _]| a < shared)
        .collect()
}

/// Where conflicts can be paid for, fixing the members of a clique raises the least cost: two
/// (K+1)-cliques that share K vertices are both resolved by one conflict between two of the K.
#[test]
fn fixing_a_clique_is_not_sound_where_conflicts_are_paid_for() {
    for masks in [2, 3, 4] {
        let n = u32::from(masks) + 2;
        let edges = cliques_that_share(masks, 2);
        let plain = least(&of_graph(masks, &unrestricted(masks, n), &edges));
        assert_eq!(plain.conflicts, 1);
        let mut graph = paid(masks, n, &edges);
        assert_eq!(graph.least(), 1);
        let clique: Vec<u32> = (0..u32::from(masks)).collect();
        assert!(symmetry::fix_clique(
            &graph.colours,
            &clique,
            &mut graph.formula
        ));
        assert_eq!(graph.least(), 2, "{masks} masks");
    }
}

/// One (K+1)-clique: without fixing, all its edges together are the only core; with fixing, fewer edges
/// look like one, though they can be kept.
#[test]
fn fixing_a_clique_makes_false_cores_where_conflicts_are_paid_for() {
    for masks in [2, 3, 4] {
        let n = u32::from(masks) + 1;
        let edges = vertex_pairs(n);
        let plain = paid(masks, n, &edges);
        let mut fixed = paid(masks, n, &edges);
        let clique: Vec<u32> = (0..u32::from(masks)).collect();
        assert!(symmetry::fix_clique(
            &fixed.colours,
            &clique,
            &mut fixed.formula
        ));
        let mut false_cores = Vec::new();
        let all: Vec<usize> = (0..edges.len()).collect();
        for kept in subsets(&all) {
            let keep = |graph: &Paid| {
                let fixed: Vec<Lit> = kept.iter().map(|&i| !graph.units[i]).collect();
                satisfiable(&graph.formula, &fixed)
            };
            assert_eq!(keep(&plain), kept.len() < edges.len(), "{kept:?}");
            if kept.len() < edges.len() && !keep(&fixed) {
                false_cores.push(kept);
            }
        }
        // The edges of the last vertex are one: it finds every mask taken.
        let last: Vec<usize> = all
            .iter()
            .copied()
            .filter(|&i| edges[i][1] == n - 1)
            .collect();
        assert!(false_cores.contains(&last), "{masks} masks {false_cores:?}");
    }
}

#[test]
fn restricted_masks_are_refused() {
    for masks in [2, 3, 4] {
        for set in 1..(1u8 << masks) - 1 {
            for restricted in 0..2 {
                let mut allowed = unrestricted(masks, 3);
                allowed[restricted] = MaskSet::from_bits(set);
                let mut formula = Formula::default();
                let form = AtMostOne::Stated;
                let colours = Colours::encode(masks, allowed.iter().copied(), form, &mut formula);
                let before = (formula.variables, formula.clauses.clone());
                for list in [[0, 1], [1, 0]] {
                    assert!(!symmetry::precedence(&colours, &list, &mut formula));
                    assert!(!symmetry::fix_clique(&colours, &list, &mut formula));
                }
                assert_eq!((formula.variables, formula.clauses), before);
            }
        }
    }
}

#[test]
fn cliques_of_more_than_k_members_are_refused() {
    for masks in [2, 3, 4] {
        let n = u32::from(masks) + 1;
        let mut graph = paid(masks, n, &vertex_pairs(n));
        let before = graph.formula.clauses.len();
        let members: Vec<u32> = (0..n).collect();
        assert!(!symmetry::fix_clique(
            &graph.colours,
            &members,
            &mut graph.formula
        ));
        assert_eq!(graph.formula.clauses.len(), before);
    }
}

/// Why restricted masks are refused: with fragment 0 on the second mask alone, "fragment 0 is on the
/// first" would make a free colouring impossible.
#[test]
fn precedence_would_be_wrong_with_fixed_masks() {
    let sets = [MaskSet::only(1), MaskSet::all(2)];
    let instance = of_graph(2, &sets, &[[0, 1]]);
    assert_eq!(least(&instance).conflicts, 0);
    let may = symmetry::precedence_set(2, 0);
    assert!(
        !colourings(&sets)
            .iter()
            .any(|colouring| may.contains(colouring[0]))
    );
}
