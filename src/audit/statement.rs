//! A bound as the audit reads it: what it says cannot be.
//!
//! Units of conflict and stitch edges are looked up in the problem, so that a bound speaks of what is
//! really there; then everything is put in the bound's own numbers, 0.. along its fragments. From here
//! on evidence is checked without the problem.

use encodings::Mask;
use petgraph::unionfind::UnionFind;

use super::problem::{Problem, Tie};
use crate::certificate::{ConflictBound, Edge, MOST_LITERALS, StitchBound, Unit};

/// "There is a colouring of these fragments that violates none of `resolved` and keeps to each budget."
/// The bound holds when there is none.
#[derive(Clone, Debug)]
pub struct Statement {
    /// K.
    pub masks: u8,
    /// The fragments, ascending: entry i is what number i stands for below.
    pub fragments: Vec<u32>,
    /// The masks that each may take, mask i as bit i.
    pub allowed: Vec<u8>,
    /// What ties between the fragments forbid: must not be violated.
    pub tied: Vec<Item>,
    /// Ties between stitch edges, each a budget.
    pub tie_budgets: Vec<Budget>,
    /// What must not be violated.
    pub resolved: Vec<Item>,
    /// What may be violated for a price; those of `met` bounds first, the bound's own last.
    pub budgets: Vec<Budget>,
}

/// Items that may be violated up to a total weight.
#[derive(Clone, Debug)]
pub struct Budget {
    /// Each item and its weight.
    pub items: Vec<(Item, u64)>,
    /// The largest weight allowed.
    pub most: u64,
}

/// What a colouring violates or not.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Item {
    /// A conflict pair by its fragment edges: violated when the ends of one share a mask.
    Pair(Vec<Edge>),
    /// A stitch edge: violated (cut) when its ends differ.
    Stitch(Edge),
    /// Self-spacings of one feature: violated when one of them is.
    Own(Vec<Item>),
    /// A self-spacing whose ends are joined by one path: violated when they share a mask that an inner
    /// fragment has not.
    Path {
        /// The two fragments.
        ends: Edge,
        /// Those between them.
        inner: Vec<u32>,
    },
    /// A self-spacing in a feature with rings: violated when its ends share a mask and no path of
    /// that mask joins them.
    Mesh {
        /// The two fragments.
        ends: Edge,
        /// All fragments of the feature, ascending.
        fragments: Vec<u32>,
        /// Its stitch edges.
        stitches: Vec<Edge>,
    },
}

/// Which unit of conflict is meant.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Key {
    /// The pair of two features, the smaller one first.
    Pair(Edge),
    /// The self-spacings of a feature.
    SelfSpacings(u32),
}

impl std::fmt::Display for Key {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Key::Pair([a, b]) => write!(f, "the conflict pair of features {a} and {b}"),
            Key::SelfSpacings(feature) => write!(f, "the self-spacings of feature {feature}"),
        }
    }
}

/// The unit of conflict that a list of fragment edges names.
///
/// # Errors
/// What is wrong with the list.
pub fn key(problem: &Problem, unit: &Unit) -> Result<Key, String> {
    let count = problem.fragment_count();
    let mut key = None;
    for &[a, b] in unit {
        if a >= b || b as usize >= count {
            return Err(format!(
                "edge [{a},{b}]: two of the fragments 0 to {}, the smaller one first",
                count.saturating_sub(1)
            ));
        }
        if !problem.are_close([a, b]) {
            return Err(format!(
                "fragments {a} and {b} are not closer than the spacing"
            ));
        }
        let features = [problem.feature_of(a), problem.feature_of(b)];
        let of_edge = if features[0] == features[1] {
            Key::SelfSpacings(features[0])
        } else {
            Key::Pair(features)
        };
        match key {
            None => key = Some(of_edge),
            Some(first) if first == of_edge => {}
            Some(first) => return Err(format!("edges of one unit name {first} and {of_edge}")),
        }
    }
    key.ok_or_else(|| "a unit without edges".to_owned())
}

/// What a bound on conflicts says cannot be.
///
/// # Errors
/// What is wrong with the bound.
pub fn of_conflict_bound(problem: &Problem, bound: &ConflictBound) -> Result<Statement, String> {
    let mut reader = Reader::new(problem);
    let budget = reader.conflicts(&bound.units, below(bound.limit)?)?;
    reader.finish(Vec::new(), vec![budget], &bound.with)
}

/// What a bound on stitches says cannot be, given all bounds on conflicts.
///
/// # Errors
/// What is wrong with the bound.
pub fn of_stitch_bound(
    problem: &Problem,
    conflict_bounds: &[ConflictBound],
    bound: &StitchBound,
) -> Result<Statement, String> {
    let mut reader = Reader::new(problem);
    let resolved = bound.resolved.iter().map(|unit| reader.unit(unit));
    let resolved = resolved.collect::<Result<Vec<Item>, String>>()?;
    let mut budgets = Vec::with_capacity(bound.met.len() + 1);
    for &i in &bound.met {
        let met = conflict_bounds.get(i as usize);
        let met = met.ok_or_else(|| format!("met: there is no conflict bound {i}"))?;
        budgets.push(reader.conflicts(&met.units, met.limit)?);
    }
    let mut items = Vec::with_capacity(bound.units.len());
    for &ends in &bound.units {
        let [a, b] = ends;
        let stitch = problem.stitch(ends);
        let stitch = stitch.ok_or_else(|| format!("no stitch edge [{a},{b}]"))?;
        items.push((Item::Stitch(ends), u64::from(stitch.weight)));
    }
    let most = below(bound.limit)?;
    budgets.push(Budget { items, most });
    reader.finish(resolved, budgets, &bound.with)
}

fn below(limit: u64) -> Result<u64, String> {
    limit
        .checked_sub(1)
        .ok_or_else(|| "limit 0: at least 1".to_owned())
}

/// Collects items, still in the numbers of the problem.
struct Reader<'a> {
    problem: &'a Problem,
    /// How much they hold, which must not outgrow what a formula may.
    size: usize,
}

impl<'a> Reader<'a> {
    fn new(problem: &'a Problem) -> Reader<'a> {
        Reader { problem, size: 0 }
    }

    fn grow(&mut self, by: usize) -> Result<(), String> {
        self.size = self.size.saturating_add(by);
        if self.size > MOST_LITERALS {
            return Err(format!("a formula of more than {MOST_LITERALS} literals"));
        }
        Ok(())
    }

    fn conflicts(&mut self, units: &[Unit], most: u64) -> Result<Budget, String> {
        let items = units.iter().map(|unit| Ok((self.unit(unit)?, 1)));
        Ok(Budget {
            items: items.collect::<Result<_, String>>()?,
            most,
        })
    }

    fn unit(&mut self, unit: &Unit) -> Result<Item, String> {
        self.grow(unit.len())?;
        match key(self.problem, unit)? {
            Key::Pair(_) => Ok(Item::Pair(unit.clone())),
            Key::SelfSpacings(_) => {
                let own = unit.iter().map(|&ends| self.self_spacing(ends));
                Ok(Item::Own(own.collect::<Result<_, String>>()?))
            }
        }
    }

    fn self_spacing(&mut self, ends: Edge) -> Result<Item, String> {
        let feature = self.problem.feature_of(ends[0]);
        let fragments = self.problem.fragments_of(feature);
        let stitches = self.problem.stitches_of(feature);
        self.grow(fragments.len() + stitches.len())?;
        if stitches.len() + 1 == fragments.len() {
            let edges = stitches.iter().map(|stitch| stitch.ends);
            return Ok(Item::Path {
                ends,
                inner: path(fragments, edges, ends),
            });
        }
        Ok(Item::Mesh {
            ends,
            fragments: fragments.collect(),
            stitches: stitches.iter().map(|stitch| stitch.ends).collect(),
        })
    }

    /// Adds the ties between fragments of the statement: "same" first, then "different", then those between stitch
    /// edges, cut down to the edges whose ends are there, each once.
    fn tie(&self, statement: &mut Statement) {
        let known = |fragment: &u32| statement.fragments.binary_search(fragment).is_ok();
        let mut features: Vec<u32> = (statement.fragments.iter())
            .map(|&fragment| self.problem.feature_of(fragment))
            .collect();
        features.dedup();
        let (mut same, mut different, mut counted) = (Vec::new(), Vec::new(), Vec::new());
        for tie in features.iter().flat_map(|&f| self.problem.ties_of(f)) {
            match tie {
                Tie::Same(ends) if ends.iter().all(known) => same.push(*ends),
                Tie::Different(ends) if ends.iter().all(known) => different.push(*ends),
                Tie::Same(_) | Tie::Different(_) => {}
                Tie::AtMost { most, stitches } => {
                    let inside = stitches.iter().filter(|s| s.ends.iter().all(known));
                    let edges: Vec<(Edge, u64)> =
                        inside.map(|s| (s.ends, u64::from(s.weight))).collect();
                    let sum: u128 = edges.iter().map(|&(_, weight)| u128::from(weight)).sum();
                    if sum > u128::from(*most) {
                        counted.push((edges, *most));
                    }
                }
            }
        }
        for list in [&mut same, &mut different] {
            list.sort_unstable();
            list.dedup();
        }
        counted.sort_unstable();
        counted.dedup();
        let same = same.into_iter().map(Item::Stitch);
        let different = different.into_iter().map(|edge| Item::Pair(vec![edge]));
        statement.tied = same.chain(different).collect();
        let budget = |(edges, most): (Vec<(Edge, u64)>, u64)| Budget {
            items: (edges.into_iter())
                .map(|(ends, weight)| (Item::Stitch(ends), weight))
                .collect(),
            most,
        };
        statement.tie_budgets = counted.into_iter().map(budget).collect();
    }

    /// Puts everything in the bound's own numbers.
    fn finish(
        self,
        resolved: Vec<Item>,
        budgets: Vec<Budget>,
        with: &[u32],
    ) -> Result<Statement, String> {
        let count = self.problem.fragment_count();
        if with.iter().any(|&f| f as usize >= count) || with.windows(2).any(|w| w[0] >= w[1]) {
            return Err(format!(
                "with: fragments 0 to {}, ascending",
                count.saturating_sub(1)
            ));
        }
        let mut fragments = with.to_vec();
        let priced = budgets
            .iter()
            .flat_map(|budget| budget.items.iter().map(|(item, _)| item));
        for item in resolved.iter().chain(priced) {
            item.each_fragment(&mut |fragment| fragments.push(fragment));
        }
        fragments.sort_unstable();
        fragments.dedup();
        let allowed = fragments
            .iter()
            .map(|&f| self.problem.allowed[f as usize])
            .collect();
        let mut statement = Statement {
            masks: self.problem.masks,
            fragments,
            allowed,
            tied: Vec::new(),
            tie_budgets: Vec::new(),
            resolved,
            budgets,
        };
        self.tie(&mut statement);
        let own = |fragment: u32| statement.fragments.partition_point(|&f| f < fragment) as u32;
        for item in statement.tied.iter_mut().chain(&mut statement.resolved) {
            item.renumber(&own);
        }
        let budgets = statement
            .tie_budgets
            .iter_mut()
            .chain(&mut statement.budgets);
        for (item, _) in budgets.flat_map(|budget| &mut budget.items) {
            item.renumber(&own);
        }
        Ok(statement)
    }
}

/// The inner fragments of the path between two fragments of a tree, from the first to the second.
fn path(
    fragments: std::ops::Range<u32>,
    stitches: impl Iterator<Item = Edge>,
    [a, b]: Edge,
) -> Vec<u32> {
    let first = fragments.start;
    let mut next: Vec<Vec<u32>> = vec![Vec::new(); fragments.len()];
    for [f, g] in stitches {
        next[(f - first) as usize].push(g);
        next[(g - first) as usize].push(f);
    }
    // From b outwards, each fragment knows the way back.
    let mut back: Vec<Option<u32>> = vec![None; fragments.len()];
    back[(b - first) as usize] = Some(b);
    let mut open = vec![b];
    while let Some(at) = open.pop() {
        for &other in &next[(at - first) as usize] {
            if back[(other - first) as usize].is_none() {
                back[(other - first) as usize] = Some(at);
                open.push(other);
            }
        }
    }
    let step = |at: &u32| back[(*at - first) as usize].filter(|&to| to != b);
    std::iter::successors(step(&a), step).collect()
}

impl Item {
    /// Calls `each` with every fragment that decides whether the item is violated.
    pub fn each_fragment(&self, each: &mut impl FnMut(u32)) {
        match self {
            Item::Pair(edges) => edges.iter().flatten().for_each(|&f| each(f)),
            Item::Stitch(ends) => ends.iter().for_each(|&f| each(f)),
            Item::Own(items) => items.iter().for_each(|item| item.each_fragment(each)),
            Item::Path { ends, inner } => ends.iter().chain(inner).for_each(|&f| each(f)),
            Item::Mesh { fragments, .. } => fragments.iter().for_each(|&f| each(f)),
        }
    }

    fn renumber(&mut self, own: &impl Fn(u32) -> u32) {
        let edge = |edge: &mut Edge| *edge = edge.map(own);
        match self {
            Item::Pair(edges) => edges.iter_mut().for_each(edge),
            Item::Stitch(ends) => edge(ends),
            Item::Own(items) => items.iter_mut().for_each(|item| item.renumber(own)),
            Item::Path { ends, inner } => {
                edge(ends);
                inner.iter_mut().for_each(|f| *f = own(*f));
            }
            Item::Mesh {
                ends,
                fragments,
                stitches,
            } => {
                edge(ends);
                fragments.iter_mut().for_each(|f| *f = own(*f));
                stitches.iter_mut().for_each(edge);
            }
        }
    }

    /// Whether a colouring violates the item.
    pub fn is_violated(&self, masks: &[Mask]) -> bool {
        let same = |&[a, b]: &Edge| masks[a as usize] == masks[b as usize];
        match self {
            Item::Pair(edges) => edges.iter().any(same),
            Item::Stitch(ends) => !same(ends),
            Item::Own(items) => items.iter().any(|item| item.is_violated(masks)),
            Item::Path { ends, inner } => {
                same(ends)
                    && inner
                        .iter()
                        .any(|&f| masks[f as usize] != masks[ends[0] as usize])
            }
            Item::Mesh {
                ends,
                fragments,
                stitches,
            } => {
                let uncut = stitches.iter().copied().filter(same);
                same(ends) && !are_joined(*ends, fragments, uncut)
            }
        }
    }
}

/// Whether edges among some fragments, which ascend, join two of them.
fn are_joined([a, b]: Edge, fragments: &[u32], edges: impl Iterator<Item = Edge>) -> bool {
    let place = |fragment: u32| fragments.partition_point(|&f| f < fragment);
    let mut parts = UnionFind::new(fragments.len());
    for [f, g] in edges {
        parts.union(place(f), place(g));
    }
    parts.equiv(place(a), place(b))
}
