//! Candidates that cannot matter, dropped.
//!
//! The layer is cut at all candidates that are left; N(x) is the set of fragments close to fragment x, those of
//! its own feature included, at this granularity. Each rule drops candidates such that any colouring can be
//! changed into one that has no stitch there and costs no more. To drop a candidate joins the fragments at its
//! sides, and N of the two becomes their union. The rules are applied to what is left, in the order of features and
//! fragments, until none applies.
//!
//! **Few neighbours.** A feature, not decided by hand, whose fragments have fewer than K fragments of other features
//! close to them, all together: drop all of its candidates, and leave it out of all N. Proof: whatever the others
//! are coloured, one of the K masks is that of none of these fragments. The whole feature on that mask has no
//! conflict, no stitch and no self-spacing. So the least cost is that of the other features alone, and stays it while
//! theirs are joined.
//!
//! **Dead end.** All candidates of fragment b are shared with one fragment a, and N(b) is within N(a) and {a}: drop
//! them. **Move.** b has exactly two candidates, p shared with a and q shared with another fragment c; N(b) is
//! within N(a), {a} and {c}; and no candidate r of q's run is nearer to q than the smallest fragment length,
//! unless r is on p's run and as near to p: drop p. (The same with a and c exchanged.)
//!
//! Proof of both. Take a colouring in which a has mask A and b another one, and give b mask A too.
//! - Conflicts with another feature g: a fragment x of g that is close to b and has mask A is close to a as well,
//!   so the pair of the two features was unresolved before.
//! - Self-spacing: let y, of the same feature and of mask A, be close to b and not joined to it now. Then y is
//!   not a, and not c, which a candidate joins to b. So y is in N(a), no candidate joins it to a, and it is not
//!   joined to a now, since b is joined to a. It was not joined to a before either: b has joined nothing of mask
//!   A. So the feature was violated before. Fragments of b's old mask are joined as before, as far as they were
//!   joined without b; and b led from one of them to another one only if it lies between a and c, of which a has
//!   mask A. So no other violation begins.
//! - Stitches: those at b that were between a and b are gone. In a dead end there are no others. In a move, q may
//!   become one, in place of p: candidates cost the same, and the feature has no more of them. What is used near q
//!   would be used too near to p already, by the condition.
//!
//! This is the idea of dominated vertices of graph colouring, for vertices joined by stitch edges; the colourings
//! compared are legal, so that hard constraints have to be kept as well.

use super::super::super::cutting::Candidate;
use crate::layout::Fragments;

/// The most passes over a layer: each pass is sound alone.
const MOST_PASSES: usize = 64;

/// Which candidates are left: for each cut of `fragments`, which is at `candidates[cut]`. `close` are the close
/// fragments, a pair once; `masks` is K; `length` is the smallest fragment length; `by_hand` tells the features
/// that were decided by hand.
pub(super) fn left(
    fragments: &Fragments,
    candidates: &[Candidate],
    close: &[[u32; 2]],
    masks: u8,
    length: i32,
    by_hand: &dyn Fn(u32) -> bool,
) -> Vec<bool> {
    let mut graph = Graph::new(fragments, candidates, close, length);
    for _ in 0..MOST_PASSES {
        let mut changed = false;
        for feature in 0..fragments.feature_count() as u32 {
            let range = fragments.of_feature(feature);
            if range.is_empty() || graph.is_gone[range.start as usize] {
                continue;
            }
            if !by_hand(feature) && graph.has_few_neighbours(range.clone(), masks) {
                graph.leave_out(range);
                changed = true;
                continue;
            }
            for fragment in range {
                changed |= graph.is_root(fragment) && graph.look_at(fragment);
            }
        }
        if !changed {
            break;
        }
    }
    graph.alive
}

struct Graph<'a> {
    candidates: &'a [Candidate],
    length: i64,
    /// The fragments that each one was joined to, up to the one that stands for all of them.
    parent: Vec<u32>,
    /// The close fragments, of those that stand for themselves.
    near: Vec<Vec<u32>>,
    /// The candidates at each.
    cuts: Vec<Vec<u32>>,
    sides: Vec<[u32; 2]>,
    alive: Vec<bool>,
    /// The fragments of features that are left out.
    is_gone: Vec<bool>,
    /// The candidates on the run of each one, itself included, by place.
    on_run: Vec<std::ops::Range<u32>>,
    by_run: Vec<u32>,
}

impl<'a> Graph<'a> {
    fn new(
        fragments: &Fragments,
        candidates: &'a [Candidate],
        close: &[[u32; 2]],
        length: i32,
    ) -> Graph<'a> {
        let count = fragments.len();
        let (mut near, mut cuts) = (vec![Vec::new(); count], vec![Vec::new(); count]);
        for &[a, b] in close {
            near[a as usize].push(b);
            near[b as usize].push(a);
        }
        let sides: Vec<[u32; 2]> = fragments.cuts().iter().map(|cut| cut.sides).collect();
        for (cut, ends) in (0u32..).zip(&sides) {
            for &end in ends {
                cuts[end as usize].push(cut);
            }
        }
        let feature = |cut: u32| fragments.feature_of(sides[cut as usize][0]);
        let (by_run, on_run) = runs(candidates, &feature);
        Graph {
            candidates,
            length: length.into(),
            parent: (0..count as u32).collect(),
            near,
            cuts,
            alive: vec![true; sides.len()],
            is_gone: vec![false; count],
            sides,
            on_run,
            by_run,
        }
    }

    fn root(&mut self, mut at: u32) -> u32 {
        while self.parent[at as usize] != at {
            let above = self.parent[self.parent[at as usize] as usize];
            self.parent[at as usize] = above;
            at = above;
        }
        at
    }

    fn is_root(&self, fragment: u32) -> bool {
        self.parent[fragment as usize] == fragment
    }

    /// N of a fragment that stands for itself, sorted.
    fn near(&mut self, fragment: u32) -> Vec<u32> {
        let mut near = std::mem::take(&mut self.near[fragment as usize]);
        for other in &mut near {
            *other = self.root(*other);
        }
        near.sort_unstable();
        near.dedup();
        near.retain(|&other| other != fragment && !self.is_gone[other as usize]);
        self.near[fragment as usize].clone_from(&near);
        near
    }

    fn has_few_neighbours(&mut self, fragments: std::ops::Range<u32>, masks: u8) -> bool {
        let mut others: Vec<u32> = Vec::new();
        for fragment in fragments
            .clone()
            .filter(|&f| self.parent[f as usize] == f)
            .collect::<Vec<_>>()
        {
            let near = self.near(fragment);
            others.extend(near.into_iter().filter(|other| !fragments.contains(other)));
            others.sort_unstable();
            others.dedup();
            if others.len() >= usize::from(masks) {
                return false;
            }
        }
        true
    }

    /// Drops all candidates of a feature, and takes it out of all N.
    fn leave_out(&mut self, fragments: std::ops::Range<u32>) {
        for fragment in fragments {
            self.is_gone[fragment as usize] = true;
            for cut in self.cuts[fragment as usize].clone() {
                self.drop_cut(cut);
            }
        }
    }

    /// Applies the other rules to a fragment; whether one did.
    fn look_at(&mut self, fragment: u32) -> bool {
        let cuts = self.cuts[fragment as usize].clone();
        let Some(&first) = cuts.first() else {
            return false;
        };
        let across: Vec<u32> = cuts
            .iter()
            .map(|&cut| self.other_side(cut, fragment))
            .collect();
        if across.iter().all(|&other| other == across[0]) {
            let may = self.is_within(fragment, across[0], across[0]);
            if may {
                self.drop_cut(first);
            }
            return may;
        }
        let (&[p, q], &[a, c]) = (&cuts[..], &across[..]) else {
            return false;
        };
        let ways = [(p, q, a, c), (q, p, c, a)];
        let way = ways
            .into_iter()
            .find(|&(p, q, a, c)| self.may_move(p, q) && self.is_within(fragment, a, c));
        if let Some((p, ..)) = way {
            self.drop_cut(p);
        }
        way.is_some()
    }

    fn other_side(&mut self, cut: u32, fragment: u32) -> u32 {
        let [a, b] = self.sides[cut as usize];
        let [a, b] = [self.root(a), self.root(b)];
        if a == fragment { b } else { a }
    }

    /// Whether all that is close to `fragment`, but for `a` and `c`, is close to `a`.
    fn is_within(&mut self, fragment: u32, a: u32, c: u32) -> bool {
        let near = self.near(fragment);
        let around = self.near(a);
        near.into_iter()
            .all(|x| x == a || x == c || around.binary_search(&x).is_ok())
    }

    /// Whether a stitch at candidate p may move to q, as far as other stitches go.
    fn may_move(&self, p: u32, q: u32) -> bool {
        let [from, to] = [p, q].map(|cut| self.candidates[cut as usize]);
        let range = self.on_run[q as usize].clone();
        let of_run = &self.by_run[range.start as usize..range.end as usize];
        let place = |cut: u32| i64::from(self.candidates[cut as usize].place);
        // Those of the run within the length, without looking at all of it.
        let first = of_run.partition_point(|&r| place(r) <= i64::from(to.place) - self.length);
        let same_run = self.on_run[p as usize] == self.on_run[q as usize];
        (of_run[first..].iter())
            .take_while(|&&r| place(r) < i64::from(to.place) + self.length)
            .filter(|&&r| self.alive[r as usize] && r != p && r != q)
            .all(|&r| same_run && (place(r) - i64::from(from.place)).abs() < self.length)
    }

    /// Joins the two sides of a candidate, and drops all candidates between them.
    fn drop_cut(&mut self, cut: u32) {
        let [a, b] = self.sides[cut as usize];
        let [a, b] = [self.root(a), self.root(b)];
        let (keep, gone) = (a.min(b), a.max(b));
        if keep == gone {
            return;
        }
        self.parent[gone as usize] = keep;
        let near = std::mem::take(&mut self.near[gone as usize]);
        self.near[keep as usize].extend(near);
        let mut cuts = std::mem::take(&mut self.cuts[gone as usize]);
        cuts.append(&mut self.cuts[keep as usize]);
        for &cut in &cuts {
            let [a, b] = self.sides[cut as usize];
            if self.root(a) == self.root(b) {
                self.alive[cut as usize] = false;
            }
        }
        cuts.retain(|&cut| self.alive[cut as usize]);
        cuts.sort_unstable();
        self.cuts[keep as usize] = cuts;
    }
}

/// The candidates run by run, ascending on each, and for each candidate where those of its run are.
fn runs(
    candidates: &[Candidate],
    feature: &dyn Fn(u32) -> u32,
) -> (Vec<u32>, Vec<std::ops::Range<u32>>) {
    let key = |cut: u32| {
        let Candidate { run, place } = candidates[cut as usize];
        let run = (feature(cut), run.direction, run.low, run.high, run.from);
        (run, place)
    };
    let mut order: Vec<u32> = (0..candidates.len() as u32).collect();
    order.sort_by_cached_key(|&cut| key(cut));
    let mut on_run = vec![0..0; candidates.len()];
    let mut start = 0;
    for run in order.chunk_by(|&a, &b| key(a).0 == key(b).0) {
        let end = start + run.len() as u32;
        for &cut in run {
            on_run[cut as usize] = start..end;
        }
        start = end;
    }
    (order, on_run)
}
