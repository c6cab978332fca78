//! Self-spacing: two fragments of one feature that share a mask must be joined through fragments of
//! that mask.
//!
//! Where the stitch edges of the feature form a tree there is one path between the two, and the
//! condition is a clause for each mask and inner fragment of the path: both ends on the mask and the
//! inner fragment off it costs the unit. Around a ring there are several paths, and every one may be
//! broken elsewhere; then the encoding asks for a witness: fragment f is reached within t steps of the
//! first one, over stitch edges whose ends agree (a bounded reachability encoding; it costs
//! |fragments| x |stitches| clauses a self-spacing, on ring-shaped features only).
//!
//! Both forms need [`AtMostOne::Stated`](crate::colour::AtMostOne): they compare the masks of three
//! fragments or more, which a model with several masks a fragment could satisfy each in its own way.

use crate::colour::Colours;
use crate::conflict;
use crate::literal::{ClauseSink, Lit, VarAllocator};

/// The stitch edges of one feature, over the fragment numbers of the colours.
#[derive(Clone, Debug, Default)]
pub struct FeatureGraph {
    /// The fragments of the feature.
    pub fragments: Vec<u32>,
    /// Its stitch edges.
    pub stitches: Vec<[u32; 2]>,
}

/// Encodes one self-spacing between `ends`, which costs `unless` where it is violated.
pub fn encode<S: ClauseSink + VarAllocator>(
    colours: &Colours,
    ends: [u32; 2],
    feature: &FeatureGraph,
    unless: Option<Lit>,
    sink: &mut S,
) {
    if feature.stitches.len() < feature.fragments.len() {
        along_path(colours, ends, &feature.path(ends), unless, sink);
    } else {
        by_reachability(colours, ends, feature, unless, sink);
    }
}

/// Both ends on a mask, an inner fragment off it: violated.
fn along_path(
    colours: &Colours,
    [a, b]: [u32; 2],
    inner: &[u32],
    unless: Option<Lit>,
    sink: &mut impl ClauseSink,
) {
    for mask in 0..colours.masks() {
        let (Some(a), Some(b)) = (colours.lit(a, mask), colours.lit(b, mask)) else {
            continue;
        };
        for &fragment in inner {
            let clause = [Some(!a), Some(!b), colours.lit(fragment, mask), unless];
            sink.clause(&clause.into_iter().flatten().collect::<Vec<_>>());
        }
    }
}

fn by_reachability<S: ClauseSink + VarAllocator>(
    colours: &Colours,
    [a, b]: [u32; 2],
    feature: &FeatureGraph,
    unless: Option<Lit>,
    sink: &mut S,
) {
    let place = |fragment: u32| feature.fragments.iter().position(|&f| f == fragment);
    let edges: Vec<(usize, usize, Lit)> = feature
        .stitches
        .iter()
        .filter_map(|&[f, g]| {
            let apart = sink.fresh();
            conflict::join(colours, [f, g], apart, sink);
            Some((place(f)?, place(g)?, !apart))
        })
        .collect();
    let start = place(a);
    // Reached within 0 steps: the start itself, a constant.
    let mut reached: Vec<Option<Lit>> = (0..feature.fragments.len())
        .map(|i| {
            (Some(i) == start).then(|| {
                let yes = sink.fresh();
                sink.clause(&[yes]);
                yes
            })
        })
        .collect();
    for _ in 1..feature.fragments.len() {
        reached = one_step(&reached, &edges, sink);
    }
    let end = place(b).and_then(|i| reached[i]);
    for mask in 0..colours.masks() {
        if let (Some(a), Some(b)) = (colours.lit(a, mask), colours.lit(b, mask)) {
            let clause = [Some(!a), Some(!b), end, unless];
            sink.clause(&clause.into_iter().flatten().collect::<Vec<_>>());
        }
    }
}

/// Reached within one step more: reached already, or over an edge whose ends agree. A fragment that no
/// walk of this length reaches has no literal.
fn one_step<S: ClauseSink + VarAllocator>(
    reached: &[Option<Lit>],
    edges: &[(usize, usize, Lit)],
    sink: &mut S,
) -> Vec<Option<Lit>> {
    let mut ways: Vec<Vec<Lit>> = reached
        .iter()
        .map(|lit| lit.iter().copied().collect())
        .collect();
    for &(f, g, agree) in edges {
        for (from, to) in [(f, g), (g, f)] {
            if let Some(before) = reached[from] {
                let over = sink.fresh();
                sink.clause(&[!over, before]);
                sink.clause(&[!over, agree]);
                ways[to].push(over);
            }
        }
    }
    ways.into_iter()
        .map(|mut clause| {
            (!clause.is_empty()).then(|| {
                let now = sink.fresh();
                clause.push(!now);
                sink.clause(&clause);
                now
            })
        })
        .collect()
}

impl FeatureGraph {
    /// The inner fragments of a shortest path over stitch edges; empty where there is none.
    fn path(&self, [a, b]: [u32; 2]) -> Vec<u32> {
        let mut from: Vec<(u32, u32)> = vec![(a, a)];
        let mut next = 0;
        while next < from.len() && !from.iter().any(|&(f, _)| f == b) {
            let at = from[next].0;
            next += 1;
            for &[f, g] in &self.stitches {
                let other = match at {
                    _ if at == f => g,
                    _ if at == g => f,
                    _ => continue,
                };
                if !from.iter().any(|&(seen, _)| seen == other) {
                    from.push((other, at));
                }
            }
        }
        let before = |fragment: u32| from.iter().find(|&&(f, _)| f == fragment).map(|&(_, p)| p);
        let mut inner = Vec::new();
        let mut at = before(b);
        while let Some(fragment) = at.filter(|&fragment| fragment != a) {
            inner.push(fragment);
            at = before(fragment);
        }
        inner
    }
}
