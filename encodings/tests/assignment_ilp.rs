//! The integer model, compared with plain enumeration of colourings: its lexicographic optimum, found by
//! plain 0-1 enumeration, is the least cost, on every graph of up to four vertices and on random
//! instances with stitches, self-spacings and allowed masks; so is its optimum under a fixed colouring.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;

use common::instances::{Shape, of_graph, random};
use common::plain::{allowed, colourings, cost, least};
use common::zero_one::{self, Value};
use common::{Random, allowed_combinations, graphs, unrestricted};
use encodings::assignment_ilp::AssignmentModel;
use encodings::{Cost, Instance, Lit, Mask};

fn value(cost: Cost) -> Value {
    (cost.conflicts as i64, cost.stitches as i64)
}

/// Reads the masks off a point of the model.
fn decode(model: &AssignmentModel, point: &[bool]) -> Vec<Mask> {
    let holds = |lit: Lit| point[lit.variable() as usize - 1] == lit.is_positive();
    model.colours.decode(holds)
}

/// What the model says of itself: integer coefficients of the few kinds promised, known variables.
fn check_form(instance: &Instance, model: &AssignmentModel) {
    for row in &model.rows {
        assert!(row.terms.iter().all(|&(_, c)| c == 1 || c == -1), "{row:?}");
        let mut variables: Vec<u32> = row.terms.iter().map(|&(v, _)| v).collect();
        variables.sort_unstable();
        assert!(variables.windows(2).all(|two| two[0] < two[1]), "{row:?}");
        assert!(variables.iter().all(|&v| v < model.variables), "{row:?}");
    }
    assert_eq!(model.conflicts.len(), instance.unit_count());
    assert!(model.conflicts.iter().all(|&(_, c)| c == 1));
    let weights: Vec<i64> = model.stitches.iter().map(|&(_, c)| c).collect();
    let expected = instance.stitches().iter().map(|s| i64::from(s.weight));
    assert_eq!(weights, expected.collect::<Vec<_>>());
    let mut priced: Vec<u32> = model.conflicts.iter().map(|&(v, _)| v).collect();
    priced.extend(model.stitches.iter().map(|&(v, _)| v));
    priced.sort_unstable();
    assert!(
        priced.windows(2).all(|two| two[0] < two[1]),
        "one variable a price"
    );
    assert!(priced.iter().all(|&v| v < model.variables));
}

fn check_optimum(instance: &Instance, model: &AssignmentModel) {
    let (found, point) = zero_one::least(model, &[]).unwrap();
    assert_eq!(found, value(least(instance)), "{instance:?}");
    assert!(zero_one::feasible(model, &point), "{instance:?}");
    let colouring = decode(model, &point);
    assert_eq!(instance.check_legal(&colouring), Ok(()), "{instance:?}");
    assert_eq!(value(cost(instance, &colouring)), found, "{instance:?}");
}

/// The model with a colouring fixed: its optimum is the cost of that colouring, or no point is left
/// where precedence forbids it.
fn check_colouring(instance: &Instance, model: &AssignmentModel, colouring: &[Mask]) {
    let fixed: Vec<(u32, bool)> = colouring
        .iter()
        .enumerate()
        .map(|(f, &mask)| {
            let lit = model.colours.lit(f as u32, mask).unwrap();
            (lit.variable() - 1, lit.is_positive())
        })
        .collect();
    let found = zero_one::least(model, &fixed).map(|(value, _)| value);
    // Precedence along the fragments: fragment i is on one of the first i + 1 masks.
    let stays = |(i, &mask): (usize, &Mask)| usize::from(mask) <= i;
    let kept = !instance.is_unrestricted() || colouring.iter().enumerate().all(stays);
    let expected = kept.then(|| value(cost(instance, colouring)));
    assert_eq!(found, expected, "{colouring:?} of {instance:?}");
}

fn check(instance: &Instance) {
    let model = AssignmentModel::encode(instance);
    check_form(instance, &model);
    check_optimum(instance, &model);
}

#[test]
fn every_graph_of_up_to_four_vertices() {
    for n in 1..=4 {
        for edges in graphs(n) {
            for masks in [2, 3, 4] {
                let sets = unrestricted(masks, n);
                let instance = of_graph(masks, &sets, &edges);
                check(&instance);
                let model = AssignmentModel::encode(&instance);
                for colouring in colourings(&sets) {
                    check_colouring(&instance, &model, &colouring);
                }
            }
        }
    }
}

#[test]
fn every_allowed_mask_on_small_graphs() {
    for (masks, n) in [(2, 2), (3, 2), (2, 3), (3, 3), (2, 4)] {
        for edges in graphs(n) {
            for sets in allowed_combinations(masks, n) {
                check(&of_graph(masks, &sets, &edges));
            }
        }
    }
}

#[test]
fn random_instances_with_stitches_and_self_spacings() {
    let mut rng = Random(2006);
    let (mut rings, mut violated, mut stitched) = (0, 0, 0);
    for round in 0..1500 {
        let shape = Shape {
            masks: 2 + (round % 3) as u8,
            fragments: 3 + rng.below(4),
            restricted: [0, 30, 80][rng.below(3) as usize],
        };
        let instance = random(shape, &mut rng);
        check(&instance);
        let model = AssignmentModel::encode(&instance);
        let mut all = colourings(&allowed(&instance));
        rng.shuffle(&mut all);
        for colouring in all.iter().take(24) {
            check_colouring(&instance, &model, colouring);
        }
        let best = least(&instance);
        let parts = instance.fragment_count() - instance.feature_count();
        rings +=
            u32::from(instance.stitches().len() > parts && !instance.self_spacings().is_empty());
        violated += u32::from(best.conflicts > 0);
        stitched += u32::from(best.stitches > 0);
    }
    let seen = format!("{rings} rings, {violated} with conflicts, {stitched} with stitches");
    assert!(rings > 50 && violated > 50 && stitched > 50, "{seen}");
}
