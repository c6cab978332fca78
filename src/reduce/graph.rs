//! The graph that reductions work on: nodes are fragments (after a split at cut vertices, copies of
//! them), links are fragment edges, stitch edges and self-spacings of the instance. What several nodes
//! are needed for at once, the self-spacings of a feature or a tie, is a hold: its nodes stay together.
//!
//! The nodes of a feature are contiguous, and nodes are in the order of their fragments within a block.
//! Reductions only delete nodes and links or copy nodes, so every link still names the unit or stitch of
//! the instance that it came from, and every piece is a sub-instance.

use encodings::{Instance, MaskSet, Tie};

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

/// Why nodes are held together.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reason {
    /// They are ends of self-spacings of one feature, which are one unit of conflict.
    SelfSpacings,
    /// They are the fragments of this tie.
    Tie(u32),
}

/// Nodes that stay in one piece.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Hold {
    /// Why.
    pub reason: Reason,
    /// The nodes, two or more, ascending.
    pub nodes: Vec<u32>,
}

impl Hold {
    /// A cycle through the nodes that live: in no split of a graph with it do they come apart.
    pub fn cycle(&self, alive: &[bool]) -> Vec<[u32; 2]> {
        let living = |node: &u32| alive[*node as usize];
        let nodes: Vec<u32> = self.nodes.iter().copied().filter(living).collect();
        let mut ends: Vec<[u32; 2]> = nodes.windows(2).map(|two| [two[0], two[1]]).collect();
        if let [first, _, .., last] = nodes[..] {
            ends.push([first, last]);
        }
        ends
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
    /// The holds, block by block.
    pub holds: Vec<Hold>,
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
            holds(instance),
        )
    }

    /// A graph from its nodes and links. `feature` ascends by at most one from node to node.
    pub fn new(
        masks: u8,
        fragment: Vec<u32>,
        allowed: Vec<MaskSet>,
        feature: Vec<u32>,
        links: Vec<Link>,
        holds: Vec<Hold>,
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
            holds,
            start,
            incident,
        }
    }

    /// For each node whether a tie binds it to another one, whatever the stitches of its feature do.
    pub fn bound(&self, instance: &Instance) -> Vec<bool> {
        let mut bound = vec![false; self.node_count()];
        for hold in &self.holds {
            if let Reason::Tie(tie) = hold.reason
                && !matches!(instance.ties()[tie as usize], Tie::AtMost { .. })
            {
                for &node in &hold.nodes {
                    bound[node as usize] = true;
                }
            }
        }
        bound
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

/// The holds of an instance: the nodes are its fragments.
fn holds(instance: &Instance) -> Vec<Hold> {
    let of_spacings = |edges: &[[u32; 2]]| {
        let mut nodes: Vec<u32> = edges.iter().flatten().copied().collect();
        nodes.sort_unstable();
        nodes.dedup();
        Hold {
            reason: Reason::SelfSpacings,
            nodes,
        }
    };
    // A single self-spacing is a link, which keeps its ends together already.
    let several = instance.self_units().filter(|edges| edges.len() > 1);
    let ties = (0u32..).zip(instance.ties()).map(|(i, tie)| Hold {
        reason: Reason::Tie(i),
        nodes: tie.fragments(),
    });
    several.map(of_spacings).chain(ties).collect()
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
