//! Graphs of known chromatic number, built from their definitions, and their text in the DIMACS
//! `.col` format.

use encodings::{Instance, InstanceBuilder};
use std::fmt::Write;

/// A simple graph on the vertices 0..`vertices`-1.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Graph {
    pub vertices: u32,
    /// Smaller vertex first, ascending.
    pub edges: Vec<[u32; 2]>,
}

impl Graph {
    fn new(vertices: u32, edges: impl IntoIterator<Item = [u32; 2]>) -> Graph {
        let mut edges: Vec<[u32; 2]> = edges
            .into_iter()
            .map(|[a, b]| [a.min(b), a.max(b)])
            .collect();
        edges.sort_unstable();
        edges.dedup();
        assert!(edges.iter().all(|&[a, b]| a < b && b < vertices));
        Graph { vertices, edges }
    }

    /// The edges between the vertices that `joined` joins.
    fn by_rule(vertices: u32, joined: impl Fn(u32, u32) -> bool) -> Graph {
        let joined = &joined;
        let edges =
            (0..vertices).flat_map(|b| (0..b).filter(move |&a| joined(a, b)).map(move |a| [a, b]));
        Graph::new(vertices, edges)
    }

    /// The instance in which every vertex is a feature of one fragment and every edge a pair.
    pub fn instance(&self, masks: u8) -> Instance {
        let mut builder = InstanceBuilder::new(masks);
        for _ in 0..self.vertices {
            builder.feature(1);
        }
        for &edge in &self.edges {
            builder.pair([edge]);
        }
        builder.build().expect("a simple graph is an instance")
    }

    /// The text of the graph in the DIMACS challenge format, vertices numbered from 1.
    pub fn col(&self, comment: &str) -> String {
        let mut text = String::new();
        for line in comment.lines() {
            writeln!(text, "c {line}").unwrap();
        }
        writeln!(text, "p edge {} {}", self.vertices, self.edges.len()).unwrap();
        for [a, b] in &self.edges {
            writeln!(text, "e {} {}", a + 1, b + 1).unwrap();
        }
        text
    }

    pub fn has_triangle(&self) -> bool {
        let joined = |a: u32, b: u32| self.edges.binary_search(&[a.min(b), a.max(b)]).is_ok();
        self.edges
            .iter()
            .any(|&[a, b]| (0..a).any(|c| joined(a, c) && joined(b, c)))
    }
}

pub fn cycle(length: u32) -> Graph {
    Graph::new(length, (0..length).map(|i| [i, (i + 1) % length]))
}

/// A hub joined to every vertex of a cycle.
pub fn wheel(rim: u32) -> Graph {
    let spokes = (0..rim).map(|i| [i, rim]);
    Graph::new(rim + 1, cycle(rim).edges.into_iter().chain(spokes))
}

/// Mycielski's construction: a copy u of each vertex v, joined to the neighbours of v, and one more
/// vertex joined to every copy. It adds one to the chromatic number, and no triangle.
pub fn mycielski(graph: &Graph) -> Graph {
    let n = graph.vertices;
    let edges = graph
        .edges
        .iter()
        .flat_map(|&[a, b]| [[a, b], [a + n, b], [a, b + n]]);
    Graph::new(2 * n + 1, edges.chain((0..n).map(|v| [v + n, 2 * n])))
}

/// The k-th graph of the challenge's `myciel` family, from one edge by `k - 1` constructions.
pub fn myciel(k: u32) -> Graph {
    (1..k).fold(Graph::new(2, [[0, 1]]), |graph, _| mycielski(&graph))
}

/// The sets of `k` out of `n` numbers, joined where they are disjoint.
pub fn kneser(n: u32, k: u32) -> Graph {
    let sets: Vec<u32> = (0..1u32 << n).filter(|set| set.count_ones() == k).collect();
    Graph::by_rule(sets.len() as u32, |a, b| {
        sets[a as usize] & sets[b as usize] == 0
    })
}

/// The squares of an n x n board, joined where a queen moves from one to the other.
pub fn queen(n: u32) -> Graph {
    Graph::by_rule(n * n, |a, b| {
        let (rows, columns) = ((a / n).abs_diff(b / n), (a % n).abs_diff(b % n));
        rows == 0 || columns == 0 || rows == columns
    })
}

/// Chvatal's 4-regular graph without triangles: an outer ring of four times two vertices and a core
/// of four.
pub fn chvatal() -> Graph {
    let neighbours: [&[u32]; 10] = [
        &[1, 4, 6, 9],
        &[2, 5, 7],
        &[3, 6, 8],
        &[4, 7, 9],
        &[5, 8],
        &[10, 11],
        &[10, 11],
        &[8, 11],
        &[10],
        &[10, 11],
    ];
    let edges = (0u32..)
        .zip(neighbours)
        .flat_map(|(a, bs)| bs.iter().map(move |&b| [a, b]));
    Graph::new(12, edges)
}

/// Two rhombi of two triangles each, hinged at vertex 0, their far ends joined.
pub fn moser_spindle() -> Graph {
    let rhombus = |[a, b, c]: [u32; 3]| [[0, a], [0, b], [a, b], [a, c], [b, c]];
    Graph::new(
        7,
        rhombus([1, 2, 3])
            .into_iter()
            .chain(rhombus([4, 5, 6]))
            .chain([[3, 6]]),
    )
}
