//! The graph that reductions work on: nodes are fragments (after a split at cut vertices, copies of
//! them), links are fragment edges, stitch edges and self-spacings of the instance.
//!
//! The nodes of a feature are contiguous, and nodes are in the order of their fragments within a block.
//! Reductions only delete nodes and links or copy nodes, so every link still names the unit or stitch of
//! the instance that it came from, and every piece is a sub-instance.

use encodings::{Instance, MaskSet};

/// What a link is, and its number in the instance.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Origin {
    /// A fragment edge of this conflict pair.
    Pair(u32),
    /// This self-spacing.
    SelfSpacing(u32),
    /// This stitch edge.
    Stitch(u32),
}

/// A link between two nodes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Link {
    /// One end.
    pub a: u32,
    /// The other end.
    pub b: u32,
    /// Where it comes from.
    pub origin: Origin,
}

impl Link {
    /// The end that is not `node`.
    pub fn other(&self, node: u32) -> u32 {
        if node == self.a { self.b } else { self.a }
    }
}

/// The graph. See the module's head. Links are in the order of their origins, block by block.
#[derive(Clone, Debug)]
pub struct Graph {
    /// K.
    pub masks: u8,
    /// For each node the fragment of the instance that it is (a copy of).
    pub fragment: Vec<u32>,
    /// The masks that a node may take.
    pub allowed: Vec<MaskSet>,
    /// For each node its feature, numbered in this graph.
    pub feature: Vec<u32>,
    /// The first node of each feature, and the number of nodes at the end.
    pub feature_start: Vec<u32>,
    /// The links.
    pub links: Vec<Link>,
    start: Vec<u32>,
    incident: Vec<u32>,
}

impl Graph {
    /// The graph of a whole instance.
    pub fn of(instance: &Instance) -> Graph {
        let count = instance.fragment_count() as u32;
        let mut links = Vec::with_capacity(
            instance.edges().len() + instance.stitches().len() + instance.self_spacings().len(),
        );
        for (pair, edges) in instance.pairs().enumerate() {
            let origin = Origin::Pair(pair as u32);
            links.extend(edges.iter().map(|&[a, b]| Link { a, b, origin }));
        }
        for (i, &[a, b]) in instance.self_spacings().iter().enumerate() {
            let origin = Origin::SelfSpacing(i as u32);
            links.push(Link { a, b, origin });
        }
        for (i, stitch) in instance.stitches().iter().enumerate() {
            let (a, b, origin) = (stitch.a, stitch.b, Origin::Stitch(i as u32));
            links.push(Link { a, b, origin });
        }
        let feature = (0..count).map(|f| instance.feature_of(f)).collect();
        let allowed = (0..count).map(|f| instance.allowed(f)).collect();
        Graph::new(
            instance.masks(),
            (0..count).collect(),
            allowed,
            feature,
            links,
        )
    }

    /// A graph from its nodes and links. `feature` ascends by at most one from node to node.
    pub fn new(
        masks: u8,
        fragment: Vec<u32>,
        allowed: Vec<MaskSet>,
        feature: Vec<u32>,
        links: Vec<Link>,
    ) -> Graph {
        let mut feature_start = Vec::new();
        for (node, &of) in feature.iter().enumerate() {
            if of as usize == feature_start.len() {
                feature_start.push(node as u32);
            }
        }
        feature_start.push(feature.len() as u32);
        let (start, incident) =
            incidence(fragment.len(), links.iter().map(|link| [link.a, link.b]));
        Graph {
            masks,
            fragment,
            allowed,
            feature,
            feature_start,
            links,
            start,
            incident,
        }
    }

    /// Forgets the links between nodes that live: to undo a deletion takes only those of what was deleted.
    pub fn forget_living(&mut self, alive: &[bool]) {
        self.links
            .retain(|link| !alive[link.a as usize] || !alive[link.b as usize]);
        self.links.shrink_to_fit();
        let ends = self.links.iter().map(|link| [link.a, link.b]);
        (self.start, self.incident) = incidence(self.fragment.len(), ends);
    }

    /// How many nodes there are.
    pub fn node_count(&self) -> usize {
        self.fragment.len()
    }

    /// How many features there are.
    pub fn feature_count(&self) -> usize {
        self.feature_start.len() - 1
    }

    /// The nodes of a feature.
    pub fn nodes_of(&self, feature: u32) -> std::ops::Range<u32> {
        self.feature_start[feature as usize]..self.feature_start[feature as usize + 1]
    }

    /// The numbers of the links at a node, ascending.
    pub fn links_at(&self, node: u32) -> &[u32] {
        let ends = [self.start[node as usize], self.start[node as usize + 1]];
        &self.incident[ends[0] as usize..ends[1] as usize]
    }

    /// The links at a node.
    pub fn links_of(&self, node: u32) -> impl Iterator<Item = &Link> {
        self.links_at(node)
            .iter()
            .map(|&link| &self.links[link as usize])
    }

    /// The nodes that conflict edges join to `node`.
    pub fn conflicting(&self, node: u32) -> impl Iterator<Item = u32> {
        self.links_of(node)
            .filter(|link| matches!(link.origin, Origin::Pair(_)))
            .map(move |link| link.other(node))
    }
}

/// The numbers of the links at each node, by counting sort: where each node's begin, and the list.
pub fn incidence(
    nodes: usize,
    ends: impl Iterator<Item = [u32; 2]> + Clone,
) -> (Vec<u32>, Vec<u32>) {
    let mut start = vec![0u32; nodes + 2];
    for node in ends.clone().flatten() {
        start[node as usize + 2] += 1;
    }
    for i in 2..start.len() {
        start[i] += start[i - 1];
    }
    let mut incident = vec![0u32; start.last().copied().unwrap_or(0) as usize];
    for (link, ends) in ends.enumerate() {
        for node in ends {
            let at = &mut start[node as usize + 1];
            incident[*at as usize] = link as u32;
            *at += 1;
        }
    }
    start.pop();
    (start, incident)
}
