//! The forms of cores, on graphs whose form is known from their definition (`common/graphs.rs`).

use maskproof::explain::shape::Shape;
use maskproof::explain::{Bound, Place};

use crate::common::graphs::{Graph, cycle, kneser, moser_spindle, myciel, wheel};
use crate::{places, whole};

/// Any colouring: cores do not depend on it.
fn place(graph: &Graph, masks: u8, limit: u64) -> Place {
    let instance = graph.instance(masks);
    let colouring = vec![0; instance.fragment_count()];
    let bound = Bound {
        limit,
        ..whole(&instance, limit)
    };
    places(&instance, None, &colouring, &[bound]).remove(0)
}

/// The complete graph: sets of one number are disjoint where they differ.
fn complete(n: u32) -> Graph {
    kneser(n, 1)
}

#[test]
fn cliques() {
    for (n, masks) in [(4, 3), (5, 4), (6, 5)] {
        let place = place(&complete(n), masks, 1);
        assert_eq!(place.shape, Shape::Clique);
        assert_eq!(place.features.len(), n as usize);
        assert_eq!(place.spacings.len(), (n * (n - 1) / 2) as usize);
    }
    // Seven features on three masks: groups of 3, 2 and 2, so 3 + 1 + 1 pairs (Turan).
    let large = place(&complete(7), 3, 5);
    assert_eq!((large.shape, large.core.units.len()), (Shape::Clique, 21));
}

#[test]
fn a_clique_is_found_in_a_larger_bound() {
    let mut graph = myciel(4);
    let n = graph.vertices;
    graph.vertices += 4;
    for a in n..n + 4 {
        graph.edges.extend((a + 1..n + 4).map(|b| [a, b]));
    }
    let place = place(&graph, 3, 1);
    assert_eq!(place.shape, Shape::Clique);
    let features: Vec<u32> = place.features.iter().map(|f| f.number).collect();
    assert_eq!(features, [n, n + 1, n + 2, n + 3]);
}

#[test]
fn odd_cycles_in_order() {
    for n in [3, 5, 7, 9] {
        let order: Vec<u32> = (0..n).collect();
        assert_eq!(place(&cycle(n), 2, 1).shape, Shape::OddCycle(order));
    }
    // Around 0 2 4 1 3.
    let mut star = cycle(5);
    star.edges = (0..5).map(|i| [i, (i + 2) % 5]).collect();
    assert_eq!(
        place(&star, 2, 1).shape,
        Shape::OddCycle(vec![0, 2, 4, 1, 3])
    );
}

#[test]
fn the_shortest_odd_cycle_is_found() {
    // An odd cycle of nine with a chord that closes one of five.
    let mut graph = cycle(9);
    graph.edges.push([0, 4]);
    assert_eq!(
        place(&graph, 2, 1).shape,
        Shape::OddCycle(vec![0, 1, 2, 3, 4])
    );
}

#[test]
fn wheels() {
    for rim in [5, 7] {
        let found = place(&wheel(rim), 3, 1);
        let expected = Shape::Wheel {
            rim: (0..rim).collect(),
            hubs: vec![rim],
        };
        assert_eq!(found.shape, expected);
    }
    // Two hubs, for four masks.
    let mut two = wheel(5);
    two.vertices += 1;
    two.edges.extend((0..6).map(|i| [i, 6]));
    let expected = Shape::Wheel {
        rim: (0..5).collect(),
        hubs: vec![5, 6],
    };
    assert_eq!(place(&two, 4, 1).shape, expected);
    // A wheel whose rim is a triangle is a clique.
    assert_eq!(place(&wheel(3), 3, 1).shape, Shape::Clique);
}

/// Both are 4-chromatic, the first without a triangle, the second without a wheel or a K4; the Groetzsch
/// graph is edge-critical (Chvatal, 1974), as is the spindle (Moser and Moser, 1961).
#[test]
fn other_cores_are_not_forced_into_a_form() {
    let grotzsch = place(&myciel(3), 3, 1);
    assert_eq!(
        (grotzsch.shape, grotzsch.core.units.len()),
        (Shape::Other, 20)
    );
    let spindle = place(&moser_spindle(), 3, 1);
    assert_eq!(
        (spindle.shape, spindle.core.units.len()),
        (Shape::Other, 11)
    );
}
