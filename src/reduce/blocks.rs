//! Biconnected blocks over conflict edges, stitch edges and self-spacings together.
//!
//! Lemma. Every cost lies in one block: an edge lies in one; the edges of a conflict pair lie on common
//! cycles, since the fragments of each of its two features are connected by stitch edges; and with the
//! self-spacing itself as an edge, all paths between its two fragments lie on common cycles with it. A cycle is laid through
//! the nodes of each hold, so the self-spacings of a feature, which are one unit, and the fragments of a tie lie
//! in one block too; no tie names a mask. Two
//! blocks share at most one node. Where masks are interchangeable, permuting the masks of a block
//! changes none of its costs, so block by block, outwards from a root, each can be permuted to agree on
//! the node it shares with the blocks before it: least costs add up.
//!
//! Restricted masks enter as a clique of K palette nodes, palette node m joined to every node that may
//! not take mask m. In that graph all masks are interchangeable again. The search starts at the palette,
//! so a block with palette nodes either holds the whole clique or hangs on the one palette node it has;
//! both keep their masks as they are. The masks of palette nodes are fixed, so what only they join in a block is independent:
//! such a block falls into the components of its own links and holds. The restrictions of a node then count in the blocks that hold
//! them only, and its copies in other blocks are unrestricted.
//!
//! Blocks by depth-first search with low points: Hopcroft and Tarjan, "Efficient algorithms for graph
//! manipulation", CACM 1973 (algorithm 447), made iterative. O(nodes + links).

use encodings::{Mask, MaskSet};

use super::graph::{Graph, Hold, Link};
use super::planted::{self, Bug};
use super::trail::{Block, Hinge};
use petgraph::unionfind::UnionFind;

/// A graph cut into parts that share at most single nodes, laid side by side as the next graph.
pub struct Split {
    /// The next graph.
    pub graph: Graph,
    /// Its blocks, each after the one that it hangs on.
    pub blocks: Vec<Block>,
    /// For each of its nodes the node that it copies.
    pub copies: Vec<u32>,
}

/// Splits the living part of a graph into its biconnected blocks.
pub fn split(graph: &Graph, alive: &[bool]) -> Split {
    let palette = Palette::new(graph, alive);
    let mut parts = Search::new(&palette).run(graph.node_count() as u32, alive);
    // The search completes a block after those that hang on it.
    parts.reverse();
    assemble(graph, alive, &palette, &parts)
}

const NONE: u32 = u32::MAX;

/// The living links of a graph, and those of the palette behind them.
struct Palette {
    /// How many links of the graph come first, and the number of each there.
    own: Vec<u32>,
    /// The ends of all links: the graph's, the restrictions, the clique.
    ends: Vec<[u32; 2]>,
    /// Node and forbidden mask of each restriction.
    restrictions: Vec<(u32, Mask)>,
    /// The number of the first link of a hold, and the hold of each.
    first_hold: usize,
    hold_of: Vec<u32>,
    /// Nodes of the graph and of the palette together.
    nodes: u32,
    start: Vec<u32>,
    incident: Vec<u32>,
}

impl Palette {
    fn new(graph: &Graph, alive: &[bool]) -> Palette {
        let count = graph.node_count() as u32;
        let living = |&link: &u32| {
            let Link { a, b, .. } = graph.links[link as usize];
            alive[a as usize] && alive[b as usize]
        };
        let own: Vec<u32> = (0..graph.links.len() as u32).filter(living).collect();
        let mut ends: Vec<[u32; 2]> = own
            .iter()
            .map(|&link| [graph.links[link as usize].a, graph.links[link as usize].b])
            .collect();
        let restrictions = restrictions(graph, alive);
        ends.extend(
            restrictions
                .iter()
                .map(|&(node, mask)| [node, count + u32::from(mask)]),
        );
        let mut nodes = count;
        if !restrictions.is_empty() {
            nodes += u32::from(graph.masks);
            for a in count..nodes {
                ends.extend((a + 1..nodes).map(|b| [a, b]));
            }
        }
        let first_hold = ends.len();
        let mut hold_of = Vec::new();
        for (i, hold) in (0u32..).zip(&graph.holds) {
            ends.extend(hold.cycle(alive));
            hold_of.resize(ends.len() - first_hold, i);
        }
        let (start, incident) = super::graph::incidence(nodes as usize, ends.iter().copied());
        Palette {
            own,
            ends,
            restrictions,
            first_hold,
            hold_of,
            nodes,
            start,
            incident,
        }
    }

    fn links_at(&self, node: u32) -> &[u32] {
        &self.incident[self.start[node as usize] as usize..self.start[node as usize + 1] as usize]
    }

    /// The number in the graph of a link, if it is one of the graph's.
    fn in_graph(&self, link: u32) -> Option<u32> {
        self.own.get(link as usize).copied()
    }

    /// The hold that a link is of.
    fn hold(&self, link: u32) -> Option<u32> {
        let behind = (link as usize).checked_sub(self.first_hold)?;
        self.hold_of.get(behind).copied()
    }

    fn restriction(&self, link: u32) -> Option<(u32, Mask)> {
        let behind = (link as usize).checked_sub(self.own.len())?;
        self.restrictions.get(behind).copied()
    }
}

impl Palette {
    /// A block with palette nodes, in the components of what is not the palette's; any other block as it is.
    fn components(&self, part: &Part, own_nodes: u32) -> Vec<Part> {
        let own = part.nodes.partition_point(|&node| node < own_nodes);
        if part.nodes.len() - own < 2 || own < 2 {
            return vec![part.clone()];
        }
        let place = |node: u32| part.nodes[..own].binary_search(&node).ok();
        let mut sets = UnionFind::<usize>::new(own);
        for &link in &part.links {
            if let [Some(a), Some(b)] = self.ends[link as usize].map(place) {
                sets.union(a, b);
            }
        }
        let labels = sets.into_labeling();
        let mut number = vec![usize::MAX; own];
        let mut found: Vec<Part> = Vec::new();
        for (&node, &label) in part.nodes.iter().zip(&labels) {
            if number[label] == usize::MAX {
                number[label] = found.len();
                found.push(Part {
                    nodes: Vec::new(),
                    links: Vec::new(),
                    hinge: part.hinge,
                });
            }
            found[number[label]].nodes.push(node);
        }
        for &link in &part.links {
            let mut ends = self.ends[link as usize].into_iter();
            if let Some(at) = ends.find_map(place) {
                found[number[labels[at]]].links.push(link);
            }
        }
        found
    }
}

/// The masks that living nodes may not take.
fn restrictions(graph: &Graph, alive: &[bool]) -> Vec<(u32, Mask)> {
    let all = MaskSet::all(graph.masks).bits();
    (0..graph.node_count() as u32)
        .filter(|&node| alive[node as usize])
        .flat_map(|node| {
            let forbidden = MaskSet::from_bits(all & !graph.allowed[node as usize].bits());
            forbidden.iter().map(move |mask| (node, mask))
        })
        .collect()
}

/// One block as the search finds it.
#[derive(Clone)]
struct Part {
    /// Its nodes, ascending: those of the palette last.
    nodes: Vec<u32>,
    /// Its links, ascending: the graph's own first.
    links: Vec<u32>,
    /// The node where the search entered it.
    hinge: u32,
}

/// Depth-first search with low points.
struct Search<'a> {
    palette: &'a Palette,
    /// When each node was first seen.
    seen: Vec<u32>,
    /// The earliest node that the subtree of each node reaches.
    low: Vec<u32>,
    clock: u32,
    open_links: Vec<u32>,
    /// The last block that each node was put in.
    stamp: Vec<u32>,
    parts: Vec<Part>,
}

/// One node on the path of the search.
struct Frame {
    node: u32,
    next: usize,
    entry: u32,
}

impl<'a> Search<'a> {
    fn new(palette: &'a Palette) -> Search<'a> {
        let count = palette.nodes as usize;
        Search {
            palette,
            seen: vec![NONE; count],
            low: vec![NONE; count],
            clock: 0,
            open_links: Vec::new(),
            stamp: vec![NONE; count],
            parts: Vec::new(),
        }
    }

    fn run(mut self, own_nodes: u32, alive: &[bool]) -> Vec<Part> {
        let palette_first = (own_nodes..self.palette.nodes).chain(0..own_nodes);
        for root in palette_first {
            let living = alive.get(root as usize).copied().unwrap_or(true);
            if living && self.seen[root as usize] == NONE {
                self.search_from(root);
            }
        }
        self.parts
    }

    fn search_from(&mut self, root: u32) {
        if self.palette.links_at(root).is_empty() {
            self.parts.push(Part {
                nodes: vec![root],
                links: Vec::new(),
                hinge: NONE,
            });
        }
        let mut path = vec![self.enter(root, NONE)];
        while let Some(frame) = path.last_mut() {
            let at = frame.node;
            match self.palette.links_at(at).get(frame.next) {
                Some(&link) => {
                    frame.next += 1;
                    if link != frame.entry
                        && let Some(onward) = self.follow(at, link)
                    {
                        path.push(onward);
                    }
                }
                None => {
                    let done = path.pop();
                    if let (Some(done), Some(above)) = (done, path.last()) {
                        self.leave(&done, above.node);
                    }
                }
            }
        }
    }

    fn enter(&mut self, node: u32, entry: u32) -> Frame {
        self.seen[node as usize] = self.clock;
        self.low[node as usize] = self.clock;
        self.clock += 1;
        Frame {
            node,
            next: 0,
            entry,
        }
    }

    /// Goes along a link: to a node not seen yet, or back to an earlier one.
    fn follow(&mut self, at: u32, link: u32) -> Option<Frame> {
        let [a, b] = self.palette.ends[link as usize];
        let other = if at == a { b } else { a };
        let before = self.seen[other as usize];
        if before == NONE {
            self.open_links.push(link);
            return Some(self.enter(other, link));
        }
        if before < self.seen[at as usize] {
            self.open_links.push(link);
            self.low[at as usize] = self.low[at as usize].min(before);
        }
        None
    }

    /// Goes back from a finished node; where its subtree reaches no further, a block is complete.
    fn leave(&mut self, done: &Frame, above: u32) {
        let low = self.low[done.node as usize];
        self.low[above as usize] = self.low[above as usize].min(low);
        if low >= self.seen[above as usize] {
            self.close(done.entry, above);
        }
    }

    /// The links from `entry` on make up a block.
    fn close(&mut self, entry: u32, hinge: u32) {
        let stamp = self.parts.len() as u32;
        let (mut nodes, mut links) = (Vec::new(), Vec::new());
        while let Some(link) = self.open_links.pop() {
            for node in self.palette.ends[link as usize] {
                if self.stamp[node as usize] != stamp {
                    self.stamp[node as usize] = stamp;
                    nodes.push(node);
                }
            }
            links.push(link);
            if link == entry {
                break;
            }
        }
        nodes.sort_unstable();
        links.sort_unstable();
        self.parts.push(Part {
            nodes,
            links,
            hinge,
        });
    }
}

/// Lays the blocks side by side as the next graph; blocks of palette nodes alone vanish.
fn assemble(graph: &Graph, alive: &[bool], palette: &Palette, parts: &[Part]) -> Split {
    let own_nodes = graph.node_count() as u32;
    let mut next = NextGraph::new(graph);
    let parts = parts
        .iter()
        .flat_map(|part| palette.components(part, own_nodes));
    for part in parts {
        let own = &part.nodes[..part.nodes.partition_point(|&node| node < own_nodes)];
        if own.is_empty() {
            continue;
        }
        let hinge = if part.hinge < own_nodes && !planted::has(Bug::Hinges) {
            Hinge::Node(part.hinge)
        } else {
            Hinge::Free
        };
        // The root of a component is a hinge only for the blocks after its first one; for the first
        // one, agreeing with a node that nothing has coloured yet is no condition.
        next.begin(hinge);
        for &node in own {
            next.node(node, MaskSet::all(graph.masks));
        }
        for &link in &part.links {
            if let Some(link) = palette.in_graph(link) {
                if !planted::has(Bug::Blocks) || link % 3 > 0 {
                    next.link(link);
                }
            } else if let Some((node, mask)) = palette.restriction(link)
                && !planted::has(Bug::Palette)
            {
                next.forbid(node, mask);
            }
        }
        let mut holds: Vec<u32> = part
            .links
            .iter()
            .filter_map(|&link| palette.hold(link))
            .collect();
        holds.dedup();
        for hold in holds {
            next.hold(hold, alive);
        }
    }
    next.finish()
}

/// Builds a graph from blocks of another one.
pub struct NextGraph<'a> {
    of: &'a Graph,
    place: Vec<u32>,
    blocks: Vec<Block>,
    copies: Vec<u32>,
    allowed: Vec<MaskSet>,
    feature: Vec<u32>,
    links: Vec<Link>,
    holds: Vec<Hold>,
}

impl<'a> NextGraph<'a> {
    /// Nothing yet.
    pub fn new(of: &'a Graph) -> NextGraph<'a> {
        NextGraph {
            of,
            place: vec![NONE; of.node_count()],
            blocks: Vec::new(),
            copies: Vec::new(),
            allowed: Vec::new(),
            feature: Vec::new(),
            links: Vec::new(),
            holds: Vec::new(),
        }
    }

    /// Begins a block.
    pub fn begin(&mut self, hinge: Hinge) {
        self.blocks.push(Block {
            start: self.copies.len() as u32,
            hinge,
        });
    }

    /// Adds a copy of a node to the block; the nodes of a block come in ascending order.
    pub fn node(&mut self, node: u32, allowed: MaskSet) {
        let first = self
            .blocks
            .last()
            .is_some_and(|block| block.start as usize == self.copies.len());
        let feature = match (self.copies.last(), self.feature.last()) {
            (Some(&before), Some(&feature)) => {
                let same = self.of.feature[before as usize] == self.of.feature[node as usize];
                if same && !first { feature } else { feature + 1 }
            }
            _ => 0,
        };
        self.place[node as usize] = self.copies.len() as u32;
        self.copies.push(node);
        self.allowed.push(allowed);
        self.feature.push(feature);
    }

    /// Takes a mask from the copy of a node in this block.
    pub fn forbid(&mut self, node: u32, mask: Mask) {
        let allowed = &mut self.allowed[self.place[node as usize] as usize];
        *allowed = allowed.without(mask);
    }

    /// Adds a link between two nodes of the block.
    pub fn link(&mut self, link: u32) {
        let Link { a, b, origin } = self.of.links[link as usize];
        let (a, b) = (self.place[a as usize], self.place[b as usize]);
        self.links.push(Link { a, b, origin });
    }

    /// Adds a hold, whose living nodes are in the block.
    pub fn hold(&mut self, hold: u32, alive: &[bool]) {
        let Hold { reason, nodes } = &self.of.holds[hold as usize];
        let living = nodes.iter().filter(|&&node| alive[node as usize]);
        let nodes: Vec<u32> = living.map(|&node| self.place[node as usize]).collect();
        if nodes.len() > 1 {
            let reason = *reason;
            self.holds.push(Hold { reason, nodes });
        }
    }

    /// The next graph with its blocks.
    pub fn finish(self) -> Split {
        let fragment = self
            .copies
            .iter()
            .map(|&node| self.of.fragment[node as usize])
            .collect();
        Split {
            graph: Graph::new(
                self.of.masks,
                fragment,
                self.allowed,
                self.feature,
                self.links,
                self.holds,
            ),
            blocks: self.blocks,
            copies: self.copies,
        }
    }
}
