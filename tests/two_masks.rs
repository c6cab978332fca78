//! Two masks and no stitches, as of lines that a spacer defines: a component can be coloured exactly where it is
//! bipartite (common practice), which petgraph's breadth-first test decides in one pass. Compared component by
//! component: random graphs, some with masks fixed by hand, and layers of the routed block.
#![allow(clippy::unwrap_used, clippy::expect_used)]

use encodings::{Instance, InstanceBuilder, Mask, MaskSet};
use maskproof::extract::extract;
use maskproof::formats::gdsii::{Request, read};
use maskproof::layout::{LayerId, Rules};
use maskproof::merge::merge;
use maskproof::reduce::{Reductions, reduce};
use maskproof::solve::{Choice, Limits, solve_pieces};
use petgraph::algo::is_bipartite_undirected;
use petgraph::graph::{NodeIndex, UnGraph};
use petgraph::unionfind::UnionFind;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

/// Two more vertices, a pair of different ones, stand for the masks: a fragment that may not take a mask is joined to it.
fn graph(instance: &Instance) -> UnGraph<(), ()> {
    let count = instance.fragment_count();
    let mut graph = UnGraph::new_undirected();
    let nodes: Vec<NodeIndex> = (0..count + 2).map(|_| graph.add_node(())).collect();
    for &[a, b] in instance.edges() {
        graph.add_edge(nodes[a as usize], nodes[b as usize], ());
    }
    graph.add_edge(nodes[count], nodes[count + 1], ());
    for fragment in 0..count as u32 {
        for mask in 0..2 {
            if !instance.allowed(fragment).contains(mask) {
                let palette = nodes[count + usize::from(mask)];
                graph.add_edge(nodes[fragment as usize], palette, ());
            }
        }
    }
    graph
}

fn solved(instance: &Instance) -> Vec<Mask> {
    let reduced = reduce(instance, Reductions::ALL).unwrap();
    let outcomes = solve_pieces(&reduced, Choice::Auto, &Limits::default(), &|_| {});
    let colourings: Vec<&[Mask]> = outcomes.iter().map(|found| &*found.colouring).collect();
    merge(instance, &reduced, &colourings).unwrap().colouring
}

/// Compares each component; returns how many can be coloured and how many cannot.
fn compare(instance: &Instance) -> [usize; 2] {
    assert_eq!(
        instance.fragment_count(),
        instance.feature_count(),
        "no stitches"
    );
    let graph = graph(instance);
    let colouring = solved(instance);
    let mut sets = UnionFind::new(graph.node_count());
    for edge in graph.edge_indices() {
        let (a, b) = graph.edge_endpoints(edge).unwrap();
        sets.union(a.index(), b.index());
    }
    let labels = sets.into_labeling();
    let mut conflicts = vec![0; graph.node_count()];
    for pair in instance.unresolved_pairs(&colouring) {
        conflicts[labels[instance.pair(pair)[0][0] as usize]] += 1;
    }
    let mut seen = [0; 2];
    for start in 0..graph.node_count() {
        if labels[start] == start {
            let bipartite = is_bipartite_undirected(&graph, NodeIndex::new(start));
            assert_eq!(
                bipartite,
                conflicts[start] == 0,
                "component of vertex {start}"
            );
            seen[usize::from(!bipartite)] += 1;
        }
    }
    seen
}

#[test]
fn random_graphs() {
    let mut rng = Pcg64Mcg::seed_from_u64(2);
    let mut seen = [0; 2];
    for _ in 0..3_000 {
        let count = rng.random_range(2..40u32);
        let density = [0.03, 0.06, 0.1][rng.random_range(0..3)];
        let fixed = [0.0, 0.1][rng.random_range(0..2)];
        let mut builder = InstanceBuilder::new(2);
        for a in 0..count {
            builder.feature(1);
            if rng.random_bool(fixed) {
                builder.allow(a, MaskSet::only(rng.random_range(0..2)));
            }
            for b in 0..a {
                if rng.random_bool(density) {
                    builder.pair([[b, a]]);
                }
            }
        }
        let [can, cannot] = compare(&builder.build().unwrap());
        seen = [seen[0] + can, seen[1] + cannot];
    }
    assert!(seen[0] > 10_000 && seen[1] > 1_000, "{seen:?}");
}

/// Source of the block and its licence: `shared/data/README.md`.
#[test]
fn layers_of_the_routed_block() {
    let path = format!(
        "{}/../shared/data/routed_sky130.gds",
        env!("CARGO_MANIFEST_DIR")
    );
    let bytes = std::fs::read(path).unwrap();
    let mut seen = [0; 2];
    for (layer, datatype, spacing) in [
        (67, 20, 180),
        (67, 20, 250),
        (68, 20, 500),
        (69, 20, 400),
        (66, 44, 400),
    ] {
        let layer = LayerId { layer, datatype };
        let layout = read(&bytes, &Request::new("routed_sky130.gds", layer)).unwrap();
        let rules = Rules::plain(layer, 2, spacing);
        let [can, cannot] = compare(&extract(&layout, &rules, &|_| ()).unwrap().instance);
        seen = [seen[0] + can, seen[1] + cannot];
    }
    assert!(seen[0] > 1_000 && seen[1] > 100, "{seen:?}");
}
