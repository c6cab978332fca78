//! Irreducible cores: units of conflict that need `limit` conflicts together, and no longer do once any
//! one of them is left out.
//!
//! Deletion-based shrinking (Bakker, Dikker, Tempelman and Wognum, "Diagnosing and solving
//! over-determined constraint satisfaction problems", IJCAI 1993): one unit after the other is left out as
//! long as the rest still needs the limit. What was needed once stays needed in every subset, so a
//! single pass is enough. Then the fragment edges of the units that are left are shrunk in the same
//! way, which tells the fragments that matter.
//!
//! Departures: "needs the limit" is asked of one incremental formula, in which each edge can be switched off by
//! an assumption; a core that the solver names is a hint, which counts only after it was refuted on its
//! own. Several orders are tried and the smallest core is taken, since cores of one bound differ in size; the
//! units of the smallest clique or odd cycle go last, so that it is found where there is one. The
//! effort is bounded in bytes of proof, the same on every run: a unit that could not be decided on
//! stays, and the core says so.

use encodings::colour::{AtMostOne, Colours};
use encodings::self_spacing::{self, FeatureGraph};
use encodings::totalizer::Totalizer;
use encodings::{ClauseSink, Instance, Lit, VarAllocator, conflict, symmetry, ties};

use super::shape;
use super::units::{self, Bound};
use crate::solve::Stop;
use crate::solve::backend::{Answer, SatBackend, Varisat};
use crate::solve::places::Places;

/// The effort for one order of one core, in bytes of proof.
const MOST_EFFORT: u64 = 1 << 23;

/// Bounds of more units than this are shrunk in one order only.
const FEW_UNITS: usize = 64;

/// Units of conflict that need `limit` conflicts.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Core {
    /// The least number of conflicts.
    pub limit: u64,
    /// The units, ascending.
    pub units: Vec<u32>,
    /// For each unit the fragment edges that the core needs, ascending; the others of the unit can go.
    pub edges: Vec<Vec<[u32; 2]>>,
    /// Whether no unit can be left out; where not, the effort did not suffice to tell.
    pub irreducible: bool,
}

/// What became of a bound.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Shrunk {
    /// A core within it.
    Core(Core),
    /// It can be coloured with fewer conflicts than its limit: it is no bound.
    NoBound,
    /// The stop sign went up.
    Stopped,
}

/// Shrinks a bound to an irreducible core.
pub fn shrink(places: &Places<'_>, bound: &Bound, stop: &Stop) -> Shrunk {
    let instance = places.instance;
    let all: Vec<usize> = (0..bound.units.len()).collect();
    let whole = |irreducible| {
        let mut units = bound.units.clone();
        units.sort_unstable();
        let edges = units.iter();
        let edges = edges.map(|&unit| units::edges(instance, unit).to_vec());
        Core {
            limit: bound.limit,
            edges: edges.collect(),
            units,
            irreducible,
        }
    };
    let named = units::features(instance, &bound.units);
    let is_tied = named
        .iter()
        .any(|&feature| !places.ties(feature).is_empty());
    if !is_tied && shape::is_full_clique(instance, bound) {
        return Shrunk::Core(whole(true));
    }
    let mut best: Option<(Vec<usize>, bool)> = None;
    for (turn, order) in orders(instance, bound).into_iter().enumerate() {
        let mut search = Search::new(places, bound, stop);
        if turn == 0 {
            match search.is_refuted(&all) {
                Verdict::Coloured => return Shrunk::NoBound,
                Verdict::Open if stop.now() => return Shrunk::Stopped,
                Verdict::Open => return Shrunk::Core(whole(false)),
                Verdict::Refuted(_) => {}
            }
        }
        let found = search.shrink(&all, &order, Search::is_refuted);
        let rank = |(kept, whole): &(Vec<usize>, bool)| (!whole, kept.len(), kept.clone());
        if best.as_ref().is_none_or(|best| rank(&found) < rank(best)) {
            best = Some(found);
        }
    }
    if stop.now() {
        return Shrunk::Stopped;
    }
    let (mut kept, irreducible) = best.unwrap_or((all, false));
    kept.sort_by_key(|&i| bound.units[i]);
    let core = Bound {
        limit: bound.limit,
        units: kept.iter().map(|&i| bound.units[i]).collect(),
    };
    let edges = needed_edges(places, &core, stop);
    Shrunk::Core(Core {
        limit: core.limit,
        units: core.units,
        edges,
        irreducible,
    })
}

/// The edges of each unit that the core needs.
fn needed_edges(places: &Places<'_>, core: &Bound, stop: &Stop) -> Vec<Vec<[u32; 2]>> {
    let mut search = Search::new(places, core, stop);
    let all: Vec<usize> = (0..search.edges.len()).collect();
    let (mut kept, _) = search.shrink(&all, &all, Search::is_refuted_by_edges);
    kept.sort_unstable();
    let mut edges = vec![Vec::new(); core.units.len()];
    for i in kept {
        let (unit, edge, _) = search.edges[i];
        edges[unit].push(edge);
    }
    edges
}

/// The orders in which units are left out, each with the units of a small named structure last.
fn orders(instance: &Instance, bound: &Bound) -> Vec<Vec<usize>> {
    let count = bound.units.len();
    let last = shape::smallest(instance, bound);
    let with_last = |order: Vec<usize>| -> Vec<usize> {
        let is_last = |i: &usize| last.binary_search(&bound.units[*i]).is_ok();
        let (late, soon): (Vec<usize>, Vec<usize>) = order.into_iter().partition(is_last);
        soon.into_iter().chain(late).collect()
    };
    let forward = with_last((0..count).collect());
    if !last.is_empty() || count > FEW_UNITS {
        return vec![forward];
    }
    let half = (count / 2..count).chain(0..count / 2).collect();
    vec![forward, (0..count).rev().collect(), half]
}

enum Verdict {
    /// The limit is needed; these members of what was assumed may suffice for that.
    Refuted(Vec<usize>),
    /// It is not.
    Coloured,
    /// Stopped.
    Open,
}

/// "A colouring violates fewer than `limit` units", with a switch for each fragment edge.
struct Search {
    solver: Varisat,
    /// Unit (its place in the bound), edge, and the literal that switches the edge off.
    edges: Vec<(usize, [u32; 2], Lit)>,
}

impl Search {
    fn new(places: &Places<'_>, bound: &Bound, stop: &Stop) -> Search {
        let instance = places.instance;
        let mut solver = Varisat::bounded(stop, MOST_EFFORT);
        let fragments = units::with_tied(places, units::fragments(instance, &bound.units));
        let has_self_spacing = (bound.units.iter()).any(|&u| units::is_self_spacing(instance, u));
        let form = if has_self_spacing {
            AtMostOne::Stated
        } else {
            AtMostOne::Open
        };
        let allowed = fragments.iter().map(|&f| instance.allowed(f));
        let colours = Colours::encode(instance.masks(), allowed, form, &mut solver);
        let local = |fragment: u32| fragments.partition_point(|&f| f < fragment) as u32;
        let mut search = Search {
            solver,
            edges: Vec::new(),
        };
        for tie in units::ties_among(places, &fragments) {
            ties::encode(&colours, &tie, &mut search.solver);
        }
        let mut prices = Vec::with_capacity(bound.units.len());
        for (i, &unit) in bound.units.iter().enumerate() {
            let price = (bound.limit > 1).then(|| search.solver.fresh());
            prices.extend(price);
            for &edge in units::edges(instance, unit) {
                search.edge(places, &colours, &local, (i, unit), edge, price);
            }
        }
        let mut counter = Totalizer::new(&prices);
        let too_many = u32::try_from(bound.limit).ok();
        if let Some(lit) = too_many.and_then(|n| counter.at_least(n, &mut search.solver)) {
            search.solver.clause(&[!lit]);
        }
        if (0..fragments.len() as u32).all(|f| may_take_all(&colours, f)) {
            let dense = shape::dense(instance, bound);
            let dense: Vec<u32> = dense.into_iter().map(local).collect();
            symmetry::precedence(&colours, &dense, &mut search.solver);
        }
        search
    }

    /// The edge is kept, or switched off, or its unit is paid for.
    fn edge(
        &mut self,
        places: &Places<'_>,
        colours: &Colours,
        local: &impl Fn(u32) -> u32,
        (i, unit): (usize, u32),
        edge: [u32; 2],
        price: Option<Lit>,
    ) {
        let off = self.solver.fresh();
        self.edges.push((i, edge, off));
        let unless = match price {
            None => off,
            Some(price) => {
                let unless = self.solver.fresh();
                self.solver.clause(&[!unless, off, price]);
                unless
            }
        };
        let ends = edge.map(local);
        if units::is_self_spacing(places.instance, unit) {
            let feature = places.instance.feature_of(edge[0]);
            let graph = feature_graph(places, feature, local);
            self_spacing::encode(colours, ends, &graph, Some(unless), &mut self.solver);
        } else {
            conflict::separate(colours, ends, Some(unless), &mut self.solver);
        }
    }

    /// Leaves out one of `all` after the other, in this order, while `refuted` holds; also says whether
    /// each one that is left was found to be needed.
    fn shrink(
        &mut self,
        all: &[usize],
        order: &[usize],
        refuted: impl Fn(&mut Search, &[usize]) -> Verdict,
    ) -> (Vec<usize>, bool) {
        let mut kept = all.to_vec();
        let mut sure = true;
        for &i in order {
            if !kept.contains(&i) {
                continue;
            }
            let without: Vec<usize> = kept.iter().copied().filter(|&k| k != i).collect();
            match refuted(self, &without) {
                Verdict::Coloured => {}
                Verdict::Open => sure = false,
                Verdict::Refuted(hint) => {
                    let hinted = without.len() > hint.len()
                        && matches!(refuted(self, &hint), Verdict::Refuted(_));
                    kept = if hinted { hint } else { without };
                }
            }
        }
        (kept, sure)
    }

    /// Whether the units at these places of the bound need the limit.
    fn is_refuted(&mut self, units: &[usize]) -> Verdict {
        let mut chosen = vec![false; self.edges.last().map_or(0, |edge| edge.0 + 1)];
        for &unit in units {
            chosen[unit] = true;
        }
        let edges: Vec<usize> = (0..self.edges.len())
            .filter(|&i| chosen[self.edges[i].0])
            .collect();
        match self.is_refuted_by_edges(&edges) {
            Verdict::Refuted(hint) => {
                let mut units: Vec<usize> = hint.iter().map(|&i| self.edges[i].0).collect();
                units.dedup();
                Verdict::Refuted(units)
            }
            other => other,
        }
    }

    /// Whether these edges alone need the limit.
    fn is_refuted_by_edges(&mut self, edges: &[usize]) -> Verdict {
        let assumptions: Vec<Lit> = edges.iter().map(|&i| !self.edges[i].2).collect();
        match self.solver.solve(&assumptions) {
            Answer::Satisfiable => Verdict::Coloured,
            Answer::Stopped => Verdict::Open,
            Answer::Unsatisfiable(mut core) => {
                core.sort_unstable();
                let named = |&&i: &&usize| core.binary_search(&!self.edges[i].2).is_ok();
                Verdict::Refuted(edges.iter().filter(named).copied().collect())
            }
        }
    }
}

fn may_take_all(colours: &Colours, fragment: u32) -> bool {
    (0..colours.masks()).all(|mask| colours.lit(fragment, mask).is_some())
}

/// The fragments of a feature and what joins them, under other numbers.
pub(super) fn feature_graph(
    places: &Places<'_>,
    feature: u32,
    local: &impl Fn(u32) -> u32,
) -> FeatureGraph {
    let instance = places.instance;
    let stitches = places.stitches(feature).iter();
    FeatureGraph {
        fragments: instance.fragments_of(feature).map(local).collect(),
        stitches: stitches
            .map(|&i| instance.stitches()[i as usize])
            .map(|stitch| [local(stitch.a), local(stitch.b)])
            .collect(),
    }
}
