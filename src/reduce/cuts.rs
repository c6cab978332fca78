//! Small edge cuts: a part that at most K - 1 conflict edges join to the rest is solved apart.
//!
//! Lemma. Let no stitch edge, self-spacing or hold cross from a part to the rest, at most K - 1 conflict edges,
//! and let every fragment of the part be free to take any mask. Take a least colouring of either side. Of the K!
//! ways to permute the masks of the part, an edge across is unresolved in (K - 1)! of them, since its inner end then takes one
//! given mask; K - 1 edges rule out fewer than K!. Some permutation resolves all of them, and changes no cost
//! within the part: least costs add up, as if the pairs across were not there. (A pair across has all its edges
//! across, as features are never divided.) Splitting off one part after the other and putting them back
//! in reverse order repeats the argument.
//!
//! Parts are found by contraction. In an ordering by maximum adjacency an edge that is scanned when its far end
//! has r edges to those before, itself included, joins two nodes that no cut of fewer than r edges separates; the
//! last node of an ordering is separated from the one before by a smallest cut (Nagamochi and Ibaraki,
//! "A linear-time algorithm for finding a sparse k-connected spanning subgraph of a k-connected graph",
//! Algorithmica 1992; Stoer and Wagner, "A simple min-cut algorithm", JACM 1997). So each ordering contracts what K edges
//! join, or ends at a node that can be split off. Where we differ: orderings are bounded in number, and what is not
//! split off then stays together, which costs time only. O(m log m) an ordering.

use std::cmp::{Ordering, Reverse};
use std::collections::{BTreeMap, BinaryHeap};

use encodings::MaskSet;
use petgraph::unionfind::UnionFind;

use super::blocks::{NextGraph, Split};
use super::graph::{Graph, Origin};
use super::planted::{self, Bug};
use super::trail::{Block, Hinge};

/// The most orderings.
const MOST_ORDERINGS: usize = 24;

/// Splits off what small cuts separate within the blocks of a graph, whose nodes all live; nothing where there is
/// no such part. Also gives the edges across, which [`Hinge::Cut`] names: their outer and their inner node.
pub fn split(graph: &Graph, blocks: &[Block]) -> Option<(Split, Vec<[u32; 2]>)> {
    let mut contraction = Contraction::new(graph);
    for _ in 0..MOST_ORDERINGS {
        if !contraction.order_once() {
            break;
        }
    }
    if contraction.removed.is_empty() {
        return None;
    }
    // A part that was split off earlier is put back later, after what is left of its block.
    let count = contraction.removed.len() as u32;
    let mut turn = vec![0; graph.feature_count()];
    for (i, removed) in (0..).zip(&contraction.removed) {
        for &feature in removed {
            turn[feature as usize] = count - i;
        }
    }
    Some(Parts::new(graph, blocks, &turn).assemble(graph))
}

/// The graph of features, some of them contracted.
struct Contraction {
    /// How many edges a cut must have at least to hold together: K.
    enough: u32,
    /// The features that a pair joins, for each of its edges once.
    edges: Vec<[u32; 2]>,
    sets: UnionFind<u32>,
    /// Whether a feature is restricted in its masks.
    restricted: Vec<bool>,
    gone: Vec<bool>,
    /// What was split off, in order: features, ascending.
    removed: Vec<Vec<u32>>,
}

impl Contraction {
    fn new(graph: &Graph) -> Contraction {
        let of = |node: u32| graph.feature[node as usize];
        let pairs = graph
            .links
            .iter()
            .filter(|link| matches!(link.origin, Origin::Pair(_)));
        let mut sets = UnionFind::new(graph.feature_count());
        for hold in &graph.holds {
            for two in hold.nodes.windows(2) {
                sets.union(of(two[0]), of(two[1]));
            }
        }
        let all = MaskSet::all(graph.masks);
        let features = 0..graph.feature_count() as u32;
        let is_restricted = |feature| {
            let mut nodes = graph.nodes_of(feature);
            nodes.any(|node| graph.allowed[node as usize] != all)
        };
        Contraction {
            enough: u32::from(graph.masks) + u32::from(planted::has(Bug::Cuts)),
            edges: pairs.map(|link| [of(link.a), of(link.b)]).collect(),
            sets,
            restricted: features.map(is_restricted).collect(),
            gone: vec![false; graph.feature_count()],
            removed: Vec::new(),
        }
    }

    /// One ordering; says whether it contracted or split off anything.
    fn order_once(&mut self) -> bool {
        let contracted = self.contracted();
        let mut joined = Vec::new();
        let mut seen = vec![false; contracted.count()];
        for root in 0..contracted.count() as u32 {
            if !seen[root as usize] {
                contracted.order_from(root, self.enough, &mut seen, &mut joined);
            }
        }
        let any = !joined.is_empty();
        for [a, b] in joined {
            let [a, b] = [a, b].map(|node| contracted.members[node as usize][0]);
            self.sets.union(a, b);
        }
        self.split_off() || any
    }

    /// The contracted graph without what is gone, its nodes by their first features.
    fn contracted(&self) -> Contracted {
        let mut number = vec![u32::MAX; self.gone.len()];
        let mut members: Vec<Vec<u32>> = Vec::new();
        for feature in (0..self.gone.len() as u32).filter(|&f| !self.gone[f as usize]) {
            let root = self.sets.find(feature) as usize;
            if number[root] == u32::MAX {
                number[root] = members.len() as u32;
                members.push(Vec::new());
            }
            members[number[root] as usize].push(feature);
        }
        let node = |feature: u32| number[self.sets.find(feature) as usize];
        let living = self
            .edges
            .iter()
            .filter(|ends| ends.iter().all(|&f| !self.gone[f as usize]));
        let across = living.map(|ends| ends.map(node)).filter(|[a, b]| a != b);
        let mut ends: Vec<[u32; 2]> = across.flat_map(|[a, b]| [[a, b], [b, a]]).collect();
        ends.sort_unstable();
        let mut near: Vec<Vec<(u32, u32)>> = vec![Vec::new(); members.len()];
        for same in ends.chunk_by(|one, other| one == other) {
            near[same[0][0] as usize].push((same[0][1], same.len() as u32));
        }
        Contracted { members, near }
    }

    /// Splits off free nodes of few edges, one after the other; says whether there was one.
    fn split_off(&mut self) -> bool {
        let contracted = self.contracted();
        let mut degree: Vec<u32> = (contracted.near.iter())
            .map(|near| near.iter().map(|&(_, edges)| edges).sum())
            .collect();
        let is_free = |node: usize| {
            let mut members = contracted.members[node].iter();
            !members.any(|&feature| self.restricted[feature as usize])
        };
        // A node without edges is a component of its own, or what is left of one.
        let can_go = |degree: u32| degree > 0 && degree < self.enough;
        let mut waiting: Vec<u32> = (0..contracted.count() as u32)
            .rev()
            .filter(|&node| can_go(degree[node as usize]) && is_free(node as usize))
            .collect();
        let before = self.removed.len();
        let mut taken = vec![false; contracted.count()];
        while let Some(node) = waiting.pop() {
            if taken[node as usize] || !can_go(degree[node as usize]) {
                continue;
            }
            taken[node as usize] = true;
            let members = &contracted.members[node as usize];
            for &feature in members {
                self.gone[feature as usize] = true;
            }
            self.removed.push(members.clone());
            for &(other, edges) in &contracted.near[node as usize] {
                if !taken[other as usize] {
                    degree[other as usize] -= edges;
                    if can_go(degree[other as usize]) && is_free(other as usize) {
                        waiting.push(other);
                    }
                }
            }
        }
        self.removed.len() > before
    }
}

/// A graph of contracted features.
struct Contracted {
    /// The features of each node, ascending.
    members: Vec<Vec<u32>>,
    /// For each node its neighbours, ascending, and how many edges join the two.
    near: Vec<Vec<(u32, u32)>>,
}

impl Contracted {
    fn count(&self) -> usize {
        self.members.len()
    }

    /// Orders a component by maximum adjacency; notes the edges whose ends `enough` edges hold together.
    fn order_from(&self, root: u32, enough: u32, seen: &mut [bool], joined: &mut Vec<[u32; 2]>) {
        let mut heap = BinaryHeap::from([(0u32, Reverse(root))]);
        let mut reached: BTreeMap<u32, u32> = [(root, 0)].into();
        while let Some((edges, Reverse(node))) = heap.pop() {
            if seen[node as usize] || reached.get(&node) != Some(&edges) {
                continue;
            }
            seen[node as usize] = true;
            for &(other, edges) in &self.near[node as usize] {
                if !seen[other as usize] {
                    let sum = reached.entry(other).or_default();
                    *sum += edges;
                    heap.push((*sum, Reverse(other)));
                    if *sum >= enough {
                        joined.push([node, other]);
                    }
                }
            }
        }
    }
}

/// The nodes and links of each part, the parts in the order in which they are put back: block by block, what was
/// not split off first, then what was split off last.
struct Parts {
    /// For each part whether it was split off.
    is_split_off: Vec<bool>,
    nodes: Vec<(u32, u32)>,
    links: Vec<(u32, u32)>,
    holds: Vec<(u32, u32)>,
    /// The edges across, each at the part that is put back later.
    across: Vec<(u32, [u32; 2])>,
}

impl Parts {
    fn new(graph: &Graph, blocks: &[Block], turn: &[u32]) -> Parts {
        let block = |node: u32| blocks.partition_point(|block| block.start <= node);
        let mut keyed: Vec<(usize, u32, u32)> = (0..graph.node_count() as u32)
            .map(|node| {
                (
                    block(node),
                    turn[graph.feature[node as usize] as usize],
                    node,
                )
            })
            .collect();
        keyed.sort_unstable();
        let mut part_of = vec![0; graph.node_count()];
        let (mut is_split_off, mut nodes) = (Vec::new(), Vec::with_capacity(keyed.len()));
        for own in keyed.chunk_by(|one, other| (one.0, one.1) == (other.0, other.1)) {
            let part = is_split_off.len() as u32;
            is_split_off.push(own[0].1 > 0);
            for &(.., node) in own {
                part_of[node as usize] = part;
                nodes.push((part, node));
            }
        }
        let part = |node: u32| part_of[node as usize];
        let (mut links, mut across) = (Vec::new(), Vec::new());
        for (i, link) in (0u32..).zip(&graph.links) {
            let [a, b] = [part(link.a), part(link.b)];
            match a.cmp(&b) {
                Ordering::Equal => links.push((a, i)),
                Ordering::Less => across.push((b, [link.a, link.b])),
                Ordering::Greater => across.push((a, [link.b, link.a])),
            }
        }
        let holds = (0u32..).zip(&graph.holds);
        let mut holds: Vec<(u32, u32)> = holds.map(|(i, hold)| (part(hold.nodes[0]), i)).collect();
        links.sort_unstable();
        across.sort_unstable();
        holds.sort_unstable();
        Parts {
            is_split_off,
            nodes,
            links,
            holds,
            across,
        }
    }

    fn assemble(self, graph: &Graph) -> (Split, Vec<[u32; 2]>) {
        let all_alive = vec![true; graph.node_count()];
        let mut next = NextGraph::new(graph);
        let mut edges = Vec::with_capacity(self.across.len());
        for (part, &is_split_off) in (0u32..).zip(&self.is_split_off) {
            let first = edges.len() as u32;
            edges.extend(of(&self.across, part));
            let end = edges.len() as u32;
            next.begin(match is_split_off {
                true => Hinge::Cut { first, end },
                false => Hinge::Free,
            });
            for node in of(&self.nodes, part) {
                next.node(node, graph.allowed[node as usize]);
            }
            of(&self.links, part).for_each(|link| next.link(link));
            of(&self.holds, part).for_each(|hold| next.hold(hold, &all_alive));
        }
        (next.finish(), edges)
    }
}

/// The items of a part, in a list sorted by parts.
fn of<T: Copy>(list: &[(u32, T)], part: u32) -> impl Iterator<Item = T> + '_ {
    let start = list.partition_point(|&(of, _)| of < part);
    let own = list[start..].iter().take_while(move |&&(of, _)| of == part);
    own.map(|&(_, item)| item)
}
