//! Dominated fragments: the last fragment of a feature that conflicts with nothing its neighbour in the
//! feature does not conflict with takes the neighbour's mask.
//!
//! Lemma. Let u have one stitch edge, to v, no self-spacing, no mask forbidden that v may take, and let
//! every conflict edge (u, w) have a sister (v, w). Take any colouring and give u the mask of v: the
//! stitch between them vanishes; a pair that the edge (u, w) now leaves unresolved is unresolved by
//! (v, w) already, and it is the same pair, since pairs are between features; u lies on no path between
//! two other fragments, so no self-spacing changes; a tie between stitches has one stitch less to count (and
//! goes on without that stitch edge), and no other tie binds u. Cost does not rise, so some least colouring has u
//! like v, and deleting u changes the least cost by nothing.

use rustc_hash::FxHashSet;

use super::graph::{Graph, Origin};
use super::planted::{self, Bug};
use super::trail::Step;

/// Deletes dominated fragments; returns how many. O(links): an end fragment is looked at when it becomes
/// one, and each of its conflict edges is looked up once. (A deletion may make an end elsewhere dominated;
/// that one is found when the reductions come by again.)
pub fn delete_dominated(
    graph: &Graph,
    alive: &mut [bool],
    bound: &[bool],
    steps: &mut Vec<Step>,
) -> usize {
    let before = steps.len();
    let mut ends = Ends::new(graph, alive);
    let mut waiting: Vec<u32> = (0..graph.node_count() as u32)
        .rev()
        .filter(|&node| alive[node as usize] && ends.is_end(node))
        .collect();
    while let Some(u) = waiting.pop() {
        if bound[u as usize] {
            continue;
        }
        let Some(v) = ends.dominator(alive, u) else {
            continue;
        };
        alive[u as usize] = false;
        steps.push(Step::Dominated { u, v });
        ends.stitches[v as usize] -= 1;
        if ends.is_end(v) {
            waiting.push(v);
        }
    }
    steps.len() - before
}

/// The end fragments of features, and the conflict edges of features that have any.
struct Ends<'a> {
    graph: &'a Graph,
    /// How many living stitch edges each node has.
    stitches: Vec<u32>,
    /// The conflict edges at features of several nodes, by both ends.
    edges: FxHashSet<(u32, u32)>,
}

impl<'a> Ends<'a> {
    fn new(graph: &'a Graph, alive: &[bool]) -> Ends<'a> {
        let mut stitches = vec![0; graph.node_count()];
        let mut edges = FxHashSet::default();
        let several = |node: u32| graph.nodes_of(graph.feature[node as usize]).len() > 1;
        for link in &graph.links {
            if !alive[link.a as usize] || !alive[link.b as usize] {
                continue;
            }
            match link.origin {
                Origin::Stitch(_) => {
                    stitches[link.a as usize] += 1;
                    stitches[link.b as usize] += 1;
                }
                Origin::Pair(_) if several(link.a) || several(link.b) => {
                    edges.insert((link.a, link.b));
                    edges.insert((link.b, link.a));
                }
                _ => {}
            }
        }
        Ends {
            graph,
            stitches,
            edges,
        }
    }

    fn is_end(&self, node: u32) -> bool {
        self.stitches[node as usize] == 1
    }

    /// The neighbour in its feature that dominates the end fragment `u`, if it does.
    fn dominator(&self, alive: &[bool], u: u32) -> Option<u32> {
        if !alive[u as usize] || !self.is_end(u) {
            return None;
        }
        let living = || {
            self.graph
                .links_of(u)
                .filter(|link| alive[link.other(u) as usize])
        };
        let stitch = living().find(|link| matches!(link.origin, Origin::Stitch(_)))?;
        let v = stitch.other(u);
        let follows = self.graph.allowed[v as usize].is_subset(self.graph.allowed[u as usize])
            && living().all(|link| match link.origin {
                Origin::Pair(_) => {
                    self.edges.contains(&(v, link.other(u))) || planted::has(Bug::Dominated)
                }
                Origin::SelfSpacing(_) => false,
                Origin::Stitch(_) => true,
            });
        follows.then_some(v)
    }
}
